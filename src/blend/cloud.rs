//! Poses as clouds of points, and how far apart two are once one is moved along the ground to fit.

use glam::DVec3;

use crate::clip::Clip;
use crate::rotor::Rotor;

use super::frames;
use super::ground::{GroundMove, tops};

/// The joints whose places stand for a pose, with their weights, which sum to 1.
#[derive(Clone, Debug, PartialEq)]
pub struct Landmarks {
    /// Joint and weight.
    pub joints: Vec<(usize, f64)>,
}

/// More landmarks tell no more of a pose.
const MOST_LANDMARKS: usize = 24;

impl Landmarks {
    /// Of a clip's skeleton: each joint counts by the length of its limb, so fingers and faces count little, and ends of
    /// limbs twice, for feet and hands are what the eye follows.
    pub fn of(clip: &Clip) -> Self {
        let skeleton = &clip.skeleton;
        let rest = skeleton.world(&skeleton.rest_pose());
        let mut joints: Vec<(usize, f64)> = skeleton
            .listed()
            .map(|joint| {
                let length = skeleton
                    .parent_joint(joint)
                    .map_or(0.0, |parent| rest[joint].position().distance(rest[parent].position()));
                let is_end = skeleton.children(joint).is_empty();
                (joint, if is_end { 2.0 * length } else { length })
            })
            .collect();
        joints.sort_by(|a, b| b.1.total_cmp(&a.1).then(a.0.cmp(&b.0)));
        joints.truncate(MOST_LANDMARKS);
        joints.sort_by_key(|&(joint, _)| joint);
        let sum: f64 = joints.iter().map(|&(_, weight)| weight).sum();
        if sum > 0.0 {
            for (_, weight) in &mut joints {
                *weight /= sum;
            }
        } else {
            // Without any length there is a place and a turn of what carries the motion.
            let tops = tops(clip);
            let share = 1.0 / tops.len().max(1) as f64;
            joints = tops.into_iter().map(|top| (top, share)).collect();
        }
        Self { joints }
    }
}

/// The landmarks of a clip at evenly spaced frames.
#[derive(Clone, Debug)]
pub struct Cloud {
    weights: Vec<f64>,
    /// Places, landmark after landmark, frame after frame.
    points: Vec<DVec3>,
    /// Turns in the scene, alike; none where only places are known.
    turns: Vec<Rotor>,
    /// Whether any joint of the clip is turned.
    has_turns: bool,
    /// What each frame gives to every sum it takes part in.
    sums: Vec<Sums>,
    frames: usize,
}

#[derive(Clone, Copy, Debug, Default)]
struct Sums {
    x: f64,
    z: f64,
    /// Squares of x and z.
    square: f64,
}

impl Cloud {
    /// The places of `landmarks` in `clip` at each time.
    pub fn of(clip: &Clip, times_secs: &[f64], landmarks: &Landmarks) -> Self {
        // Few enough at once to stay small.
        const ROWS: usize = 256;
        let mut points = Vec::with_capacity(times_secs.len() * landmarks.joints.len());
        let mut turns = Vec::with_capacity(points.capacity());
        for part in times_secs.chunks(ROWS) {
            let worlds = clip.worlds_at(part);
            for time in 0..part.len() {
                points.extend(landmarks.joints.iter().map(|&(joint, _)| worlds.position(joint, time)));
                turns.extend(landmarks.joints.iter().map(|&(joint, _)| worlds.rotation(joint, time)));
            }
        }
        let has_turns = (0..clip.joints.len()).any(|joint| frames::says(clip, joint)[0]);
        let weights = landmarks.joints.iter().map(|&(_, weight)| weight).collect();
        Self { turns, has_turns, ..Self::from_points(weights, points) }
    }

    /// A cloud from points, frame after frame, with a weight for each point of a frame. It knows of no turns.
    ///
    /// # Panics
    /// When the points are not whole frames.
    pub fn from_points(weights: Vec<f64>, points: Vec<DVec3>) -> Self {
        let width = weights.len().max(1);
        assert_eq!(points.len() % width, 0, "whole frames of points");
        let frames = points.len() / width;
        let sums = points.chunks(width).map(|frame| {
            frame.iter().zip(&weights).fold(Sums::default(), |sum, (point, weight)| Sums {
                x: sum.x + weight * point.x,
                z: sum.z + weight * point.z,
                square: sum.square + weight * (point.x * point.x + point.z * point.z),
            })
        });
        Self { sums: sums.collect(), weights, points, turns: Vec::new(), has_turns: false, frames }
    }

    /// How many frames.
    pub fn len(&self) -> usize {
        self.frames
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.frames == 0
    }

    fn frame(&self, frame: usize) -> &[DVec3] {
        &self.points[frame * self.weights.len()..][..self.weights.len()]
    }

    /// The weighted mean of squared distances between `self` about `frame` and `other` about `other_frame`, over
    /// windows that reach `reach` frames to either side and so hold rates too, once `other` is moved along the ground to fit
    /// best; and that move. Windows shrink alike on both sides at the ends of either. Closed form: Kovar, Gleicher & Pighin 2002.
    pub fn fit(&self, frame: usize, other: &Self, other_frame: usize, reach: usize) -> (f64, GroundMove) {
        let reach = reach
            .min(frame)
            .min(other_frame)
            .min(self.frames - 1 - frame)
            .min(other.frames - 1 - other_frame);
        let pairs = (0..=2 * reach).map(|step| (frame + step - reach, other_frame + step - reach));
        self.fit_pairs(other, pairs)
    }

    /// As [`Cloud::fit`], over any pairs of frames.
    pub fn fit_pairs(&self, other: &Self, pairs: impl Iterator<Item = (usize, usize)>) -> (f64, GroundMove) {
        self.moved_pairs(other, pairs, f64::atan2)
    }

    /// The distance over pairs of frames once `other` is turned as `turn` says, of how far places go across and along each other, and shifted to
    /// fit best; and that move.
    fn moved_pairs(
        &self,
        other: &Self,
        pairs: impl Iterator<Item = (usize, usize)>,
        turn: impl Fn(f64, f64) -> f64,
    ) -> (f64, GroundMove) {
        let weight: f64 = self.weights.iter().sum();
        let (mut own, mut their) = (Sums::default(), Sums::default());
        let (mut total, mut along, mut across, mut heights) = (0.0, 0.0, 0.0, 0.0);
        for (a, b) in pairs {
            for (sum, part) in [(&mut own, self.sums[a]), (&mut their, other.sums[b])] {
                sum.x += part.x;
                sum.z += part.z;
                sum.square += part.square;
            }
            total += weight;
            for ((p, q), w) in self.frame(a).iter().zip(other.frame(b)).zip(&self.weights) {
                along += w * (p.x * q.x + p.z * q.z);
                across += w * (p.x * q.z - q.x * p.z);
                heights += w * (p.y - q.y) * (p.y - q.y);
            }
        }
        if total <= 0.0 {
            return (0.0, GroundMove::default());
        }
        let along = along - (own.x * their.x + own.z * their.z) / total;
        let across = across - (own.x * their.z - their.x * own.z) / total;
        let turn_rad = turn(across, along);
        let (sin, cos) = turn_rad.sin_cos();
        let place = GroundMove {
            turn_rad,
            x: (own.x - their.x * cos - their.z * sin) / total,
            z: (own.z + their.x * sin - their.z * cos) / total,
        };
        let spread = |sums: Sums| sums.square - (sums.x * sums.x + sums.z * sums.z) / total;
        let ground = spread(own) + spread(their) - 2.0 * (along * cos + across * sin);
        ((ground.max(0.0) + heights) / total, place)
    }
}

impl Cloud {
    /// The turn about the vertical that makes the poses of `other` face as those of `self` do, over pairs of frames: the one that brings
    /// the landmarks' own turns nearest together, by the weighted sum of the squared differences of their matrices.
    ///
    /// The fit of places can't tell this where legs are out of step: with the left foot in front in one and the right foot in the other, places
    /// are nearest with one body turned round. It is taken only where nothing in the clips turns.
    pub fn facing(&self, other: &Self, pairs: impl Iterator<Item = (usize, usize)> + Clone) -> f64 {
        let knows = self.turns.len() == self.points.len() && other.turns.len() == other.points.len();
        if !knows || !(self.has_turns || other.has_turns) {
            return self.fit_pairs(other, pairs).1.turn_rad;
        }
        let width = self.weights.len();
        let (mut along, mut across) = (0.0, 0.0);
        for (a, b) in pairs {
            let (own, their) = (&self.turns[a * width..][..width], &other.turns[b * width..][..width]);
            for ((own, their), weight) in own.iter().zip(their).zip(&self.weights) {
                let between = *own * their.reverse();
                // The matrix of a turn about +Y by θ has cos θ twice and ±sin θ once each: those of what is between sum to this.
                along += weight * (between.s * between.s - between.zx * between.zx);
                across -= weight * 2.0 * between.s * between.zx;
            }
        }
        across.atan2(along)
    }

    /// How the poses of `other` are set down on those of `self`, over pairs of frames: turned to face alike ([`Cloud::facing`]) and moved so that
    /// places are nearest; and the weighted mean of squared distances that are left.
    pub fn set_down(
        &self,
        other: &Self,
        pairs: impl Iterator<Item = (usize, usize)> + Clone,
    ) -> (f64, GroundMove) {
        let turn_rad = self.facing(other, pairs.clone());
        self.moved_pairs(other, pairs, |_, _| turn_rad)
    }
}

/// Distances between the poses of two clips, for looking at and choosing from.
#[derive(Clone, Debug, PartialEq)]
pub struct DistancePicture {
    /// The times of the rows in the first clip, seconds.
    pub first_secs: Vec<f64>,
    /// The times of the columns in the second clip, seconds.
    pub second_secs: Vec<f64>,
    /// Root of the mean squared distance of the landmarks in the clips' lengths, row after row.
    pub distances: Vec<f64>,
}

impl DistancePicture {
    /// The distance at a row and a column.
    pub fn at(&self, row: usize, column: usize) -> f64 {
        self.distances[row * self.second_secs.len() + column]
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn worked_example() {
        // reference/method_checks.json `pose_distance`; a numerical minimiser finds the same.
        let p = [[0.0, 1.0, 0.0], [0.2, 0.9, 0.1], [-0.2, 0.9, 0.1], [0.1, 0.0, 0.3], [-0.1, 0.0, -0.2]];
        let q = [
            [0.7, 1.0, -1.2],
            [0.806_472_765_222_694, 0.9, -1.003_369_508_300_89],
            [0.478_811_947_507_097, 0.9, -1.232_800_082_841_31],
            [0.659_842_273_523_585, 0.02, -0.926_896_743_078_198],
            [0.732_800_082_841_31, 0.0, -1.421_188_052_492_9],
        ];
        let weights = vec![1.0, 0.5, 0.5, 1.0, 1.0];
        let cloud = |points: [[f64; 3]; 5]| {
            Cloud::from_points(weights.clone(), points.into_iter().map(DVec3::from).collect())
        };
        let (mean, place) = cloud(p).fit(0, &cloud(q), 0, 2);
        assert!((place.turn_rad.to_degrees() - 31.400_857_584_200_8).abs() < 1e-9, "{place:?}");
        assert!((place.x - 0.024_123_949_359_449_6).abs() < 1e-11, "{place:?}");
        assert!((place.z - 1.401_980_253_047_13).abs() < 1e-11, "{place:?}");
        let sum = mean * weights.iter().sum::<f64>();
        assert!((sum - 0.002_242_265_982_169_26).abs() < 1e-12, "{sum}");
        // The move does what the closed form says it does.
        let moved: f64 = p
            .into_iter()
            .zip(q)
            .zip(&weights)
            .map(|((p, q), w)| w * DVec3::from(p).distance_squared(place.apply(q.into())))
            .sum();
        assert!((moved - sum).abs() < 1e-12, "{moved}");
    }
}
