//! Draws a gap from what the joint on the other side of the body does so many keys sooner or later.
//!
//! A gait repeats itself mirrored after half a round, other moves at once or never. So the other joint's poses, mirrored, are laid beside
//! this one's with every shift; the one at which they go along best is tried on pretended gaps: does the way in which the other bulges off
//! the straight line across tell this one's? A loop goes on at its start. In a clip of one round there is nothing else to learn from.

use glam::DVec3;

use crate::clip::{Clip, LoopSeam, Round};
use crate::rotor::{Bivector, Rotor, chordal_mean, slerp};
use crate::skeleton::Mirror;

use super::draft::Draft;
use super::redraw::Hermite;

/// Longer clips have other times to learn from.
const MOST_KEYS: usize = 600;

/// Where a clip is no loop, the other joint is at most so much sooner or later.
const FARTHEST_SECS: f64 = 1.0;

/// A joint in the middle goes along with itself mirrored from this share of a round on.
const LEAST_SHARE: f64 = 1.0 / 6.0;

/// Fewer keys, or fewer pretended gaps, prove nothing.
const LEAST_KEYS: usize = 8;
const LEAST_GAPS: usize = 4;

/// The bulge is taken when it leaves so much of what slerp across leaves at most, and so much of what the cubic does.
const WORTH: f64 = 0.6;
const WORTH_BESIDE_CUBIC: f64 = 0.85;

/// Keys that the cubic's end rates are fitted over.
const FIT_KEYS: usize = 3;

/// A key is one of the clip's frames when it is off by no more than this share of a frame.
const EVEN: f64 = 0.05;

/// A loop closes when its end misses its start by no more than so many usual steps.
const SEAM_STEPS: f64 = 2.0;

/// The poses of `first..=last`; `None` where the other side does not tell them.
pub(super) fn poses(
    draft: &Draft,
    clip: &Clip,
    joint: usize,
    first: usize,
    last: usize,
) -> Option<Vec<Rotor>> {
    let (left, right) = (first.checked_sub(1)?, last + 1);
    if right >= draft.len() || draft.len() > MOST_KEYS || draft.is_held_after(left) {
        return None;
    }
    let pair = Pair::new(draft, clip, joint, (first, last))?;
    let beside =
        pair.shifts().filter_map(|shift| pair.beside(shift)).min_by(|a, b| a.off.total_cmp(&b.off))?;
    let weight = pair.weight(draft, &beside)?;
    let gap = Gap { start: left as isize, span: right - left };
    let [a, b] = [left, right].map(|key| pair.own[key]);
    (1..gap.span)
        .map(|place| {
            let bulge = beside.bulge(&pair, gap, place)? * weight;
            let straight = slerp(a, b, place as f64 / gap.span as f64);
            Some((straight * Rotor::from_plane_angles(bulge)).normalize())
        })
        .collect()
}

/// A joint's poses and those of the other side, mirrored.
struct Pair {
    own: Vec<Rotor>,
    other: Vec<Rotor>,
    gap: (usize, usize),
    /// Both are the same joint.
    is_middle: bool,
    /// Keys of a round, where the clip is a loop.
    round: Option<usize>,
    farthest: usize,
}

/// Keys `start ..= start + span`, which may go on over the end of a loop.
#[derive(Clone, Copy)]
struct Gap {
    start: isize,
    span: usize,
}

/// The other side's poses so many keys later, turned by one turn so that they go along with this joint's best.
struct Beside {
    shift: isize,
    turn: Rotor,
    /// The mean square of what they are off, in squared radians.
    off: f64,
}

impl Pair {
    fn new(draft: &Draft, clip: &Clip, joint: usize, gap: (usize, usize)) -> Option<Self> {
        let mirror = Mirror::of(&clip.skeleton)?;
        let partner = mirror.partner(joint);
        let track = clip.rotation(partner).filter(|track| !track.keys.is_empty())?;
        let own: Vec<Rotor> = (0..draft.len()).map(|key| draft.unit(key)).collect::<Option<_>>()?;
        let other: Vec<Rotor> = if partner == joint {
            own.iter().map(|pose| mirror.mirrored(joint, *pose)).collect()
        } else {
            (0..draft.len()).map(|key| mirror.mirrored(partner, track.at(draft.secs(key)))).collect()
        };
        let step_secs = draft.times.median_step()?;
        let grid = &clip.grid;
        let is_frame = |key: usize| (draft.secs(key) - grid.time(key)).abs() <= EVEN * step_secs;
        if draft.len() != grid.count() || !(0..draft.len()).all(is_frame) {
            return None;
        }
        let seam = Round::of(clip, DVec3::Y);
        let round = draft.len() - usize::from(seam.is_first_again);
        let mut steps: Vec<f64> = own.windows(2).map(|two| two[0].turn_to(two[1])).collect();
        let middle = steps.len() / 2;
        let usual = *steps.select_nth_unstable_by(middle, f64::total_cmp).1;
        let closes = |joint: usize| {
            LoopSeam::of(clip, joint, seam, DVec3::Y).turn.length() <= SEAM_STEPS * usual + 1e-3
        };
        let is_loop = seam.first == 0 && closes(joint) && closes(partner);
        Some(Self {
            own,
            other,
            gap,
            is_middle: partner == joint,
            round: is_loop.then_some(round),
            farthest: (FARTHEST_SECS / step_secs) as usize,
        })
    }

    fn key(&self, at: isize) -> Option<usize> {
        match self.round {
            Some(round) => Some(at.rem_euclid(isize::try_from(round).ok()?) as usize),
            None => usize::try_from(at).ok().filter(|key| *key < self.own.len()),
        }
    }

    fn keys(&self) -> std::ops::Range<isize> {
        0..self.round.unwrap_or(self.own.len()) as isize
    }

    fn is_sound(&self, key: usize) -> bool {
        !(self.gap.0..=self.gap.1).contains(&key)
    }

    fn own(&self, at: isize) -> Option<Rotor> {
        self.key(at).filter(|key| self.is_sound(*key)).map(|key| self.own[key])
    }

    fn other(&self, at: isize) -> Option<Rotor> {
        self.key(at).filter(|key| !self.is_middle || self.is_sound(*key)).map(|key| self.other[key])
    }

    /// The shifts at which the other side is known throughout the gap.
    fn shifts(&self) -> impl Iterator<Item = isize> + '_ {
        let count = self.keys().end;
        let farthest = (self.farthest as isize).min(count - 1);
        let all = if self.round.is_some() { 0..count } else { -farthest..farthest + 1 };
        let least = (LEAST_SHARE * count as f64) as isize;
        let is_apart = move |shift: isize| shift.abs().min((count - shift.abs()).abs()) >= least;
        all.filter(move |&shift| !self.is_middle || (self.round.is_some() && is_apart(shift))).filter(
            |&shift| {
                let mut gap = self.gap.0 as isize - 1..self.gap.1 as isize + 2;
                gap.all(|at| self.other(at + shift).is_some())
            },
        )
    }

    fn beside(&self, shift: isize) -> Option<Beside> {
        let turns: Vec<(Rotor, f64)> = self
            .keys()
            .filter_map(|at| Some((self.other(at + shift)?.reverse() * self.own(at)?, 1.0)))
            .collect();
        // Of fewer than half the keys any shift may look good.
        if turns.len() < LEAST_KEYS || turns.len() * 2 < self.own.len() {
            return None;
        }
        let turn = chordal_mean(&turns)?.rotor;
        let off = turns.iter().map(|(own, _)| own.turn_to(turn).powi(2)).sum::<f64>() / turns.len() as f64;
        Some(Beside { shift, turn, off })
    }

    fn bulge(&self, gap: Gap, place: usize) -> Option<Bivector> {
        bulge(gap, place, &|at| self.own(at))
    }

    /// How much of the other side's bulge to take: what does best on pretended gaps. `None` where that is not worth it.
    fn weight(&self, draft: &Draft, beside: &Beside) -> Option<f64> {
        let span = self.gap.1 + 2 - self.gap.0;
        let (mut rr, mut rc, mut cc, mut gaps) = (0.0, 0.0, 0.0, 0);
        // What slerp and the cubic leave where there is room for the cubic's rates.
        let (mut straight, mut cubic) = (0.0, 0.0);
        for start in self.keys() {
            let gap = Gap { start, span };
            let inside = (0..=span as isize)
                .all(|i| self.own(start + i).is_some() && self.other(start + i + beside.shift).is_some());
            if !inside {
                continue;
            }
            gaps += 1;
            let first = start as usize;
            let has_room = self.own(start - FIT_KEYS as isize + 1).is_some()
                && self.own(start + (span + FIT_KEYS) as isize - 1).is_some()
                && first + 1 >= FIT_KEYS
                && first + span + FIT_KEYS <= draft.len();
            let curve = if has_room { Hermite::new(draft, first, first + span, FIT_KEYS) } else { None };
            for place in 1..span {
                let (truth, told) = (self.bulge(gap, place)?, beside.bulge(self, gap, place)?);
                rr += truth.dot(truth);
                rc += truth.dot(told);
                cc += told.dot(told);
                if let Some(curve) = &curve {
                    let pose = self.own(start + place as isize)?;
                    straight += truth.dot(truth);
                    cubic += curve.at(place as f64 / span as f64).turn_to(pose).powi(2);
                }
            }
        }
        if gaps < LEAST_GAPS || cc <= 0.0 || rr <= 0.0 {
            return None;
        }
        let weight = (rc / cc).clamp(0.0, 1.0);
        let left_over = (rr - 2.0 * weight * rc + weight * weight * cc) / rr;
        let plain = if straight > 0.0 { (cubic / straight).min(1.0) } else { 1.0 };
        (left_over <= WORTH.min(WORTH_BESIDE_CUBIC * plain)).then_some(weight)
    }
}

impl Beside {
    fn bulge(&self, pair: &Pair, gap: Gap, place: usize) -> Option<Bivector> {
        bulge(gap, place, &|at| Some(pair.other(at + self.shift)? * self.turn))
    }
}

/// How a row of poses lies off the straight way across a gap.
fn bulge(gap: Gap, place: usize, pose: &dyn Fn(isize) -> Option<Rotor>) -> Option<Bivector> {
    let (a, b) = (pose(gap.start)?, pose(gap.start + gap.span as isize)?);
    let straight = slerp(a, b, place as f64 / gap.span as f64);
    Some((straight.reverse() * pose(gap.start + place as isize)?).plane_angles())
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::*;
    use crate::clip::{FrameGrid, JointTracks, RotationTrack, Times};
    use crate::skeleton::{Joint, Skeleton};

    const COUNT: usize = 30;
    const GAP: (usize, usize) = (8, 14);

    /// A leg that swings once in a round, this far along, with overtones.
    fn swing(round: f64) -> Rotor {
        let t = std::f64::consts::TAU * round;
        let angles =
            Bivector::new(0.6 * t.sin() + 0.3 * (2.0 * t + 1.0).sin(), 0.2 * t.cos(), 0.1 * (3.0 * t).sin());
        Rotor::from_plane_angles(angles)
    }

    /// Both legs; the right one does what the left does half a round later, `other` of that.
    fn clip(other: impl Fn(f64) -> Rotor) -> Clip {
        let joints = vec![
            Joint::placed("Hips", 0, None, DVec3::Y),
            Joint::placed("LeftLeg", 1, Some(0), DVec3::new(0.1, 0.0, 0.0)),
            Joint::placed("RightLeg", 2, Some(0), DVec3::new(-0.1, 0.0, 0.0)),
            Joint::placed("LeftFoot", 3, Some(1), DVec3::new(0.0, -0.5, 0.0)),
            Joint::placed("RightFoot", 4, Some(2), DVec3::new(0.0, -0.5, 0.0)),
        ];
        let skeleton = Skeleton::new(joints).unwrap();
        let mirror = Mirror::of(&skeleton).unwrap();
        assert_eq!(mirror.partner(1), 2);
        let times = Times::Even { step_secs: 1.0 / 30.0, count: COUNT };
        let round = |key: usize| key as f64 / COUNT as f64;
        let left: Vec<Rotor> = (0..COUNT).map(|key| swing(round(key))).collect();
        let right: Vec<Rotor> = (0..COUNT).map(|key| mirror.mirrored(1, other(round(key)))).collect();
        let tracks = [None, Some(left), Some(right), None, None].map(|keys| {
            let rotation = keys.map(|keys| RotationTrack::from_rotors(times.clone(), keys));
            Arc::new(JointTracks { rotation, ..JointTracks::default() })
        });
        Clip {
            name: String::new(),
            joints: tracks.to_vec(),
            skeleton: Arc::new(skeleton),
            grid: FrameGrid { times: times.clone(), rate: 30.0 },
            duration_secs: times.span().unwrap().1,
        }
    }

    fn drawn(clip: &Clip) -> Option<Vec<Rotor>> {
        let mut keys = clip.rotation(1).unwrap().keys.to_vec();
        let held = keys[GAP.0 - 1];
        keys[GAP.0..=GAP.1].fill(held);
        let times = clip.grid.times.clone();
        let stuck = clip.with_rotation(1, RotationTrack::from_rotors(times, keys));
        poses(&Draft::new(stuck.rotation(1).unwrap()), &stuck, 1, GAP.0, GAP.1)
    }

    #[test]
    fn the_other_leg_half_a_round_later_tells_what_this_one_did() {
        let clip = clip(|round| swing(round + 0.5));
        let drawn = drawn(&clip).unwrap();
        let track = clip.rotation(1).unwrap();
        let (left, right) = (track.keys[GAP.0 - 1], track.keys[GAP.1 + 1]);
        let mut straight = 0.0;
        for (i, pose) in drawn.iter().enumerate() {
            let truth = track.keys[GAP.0 + i];
            assert!(pose.turn_to(truth) < 1e-6, "{i}: {}", pose.turn_to(truth).to_degrees());
            straight += slerp(left, right, (i + 1) as f64 / 8.0).turn_to(truth);
        }
        assert!(straight > 0.5, "{straight}");
    }

    #[test]
    fn a_leg_that_does_something_else_is_not_believed() {
        assert!(
            drawn(&clip(|round| Rotor::from_plane_angles(Bivector::new(0.0, 0.0, (9.0 * round).sin()))))
                .is_none()
        );
        assert!(drawn(&clip(|_| Rotor::IDENTITY)).is_none());
    }
}
