//! When feet stand on the ground: spans of frames in which a point of a limb is planted, and how far it slides in them.

use std::ops::RangeInclusive;

use glam::DVec3;

use crate::skeleton::TwoJointLimb;

use super::{Branch, Clip, Worlds};

/// The leg that the thresholds below are meant for, in metres: hip to ankle of an adult.
const ADULT_LEG: f64 = 0.9;

/// Below this height above its own standing height a point may be planted, and above the second it is lifted; metres for an adult.
const LOW: f64 = 0.03;
const LIFTED: f64 = 0.05;

/// Below this speed a point may be planted, and above the second it moves; metres a second for an adult.
const SLOW: f64 = 0.15;
const MOVING: f64 = 0.40;

/// Speeds are means over this long to both sides, and at least from the frame before to the frame after.
const SPEED_SECS: f64 = 0.02;

/// A shorter contact is none: so many frames, and so long.
const LEAST_FRAMES: usize = 3;
const LEAST_SECS: f64 = 0.06;

/// The standing height of a point is the height below which it lies in this share of the frames.
const STANDING_SHARE: f64 = 0.05;

/// A point that never comes nearer to the ground than this, in leg lengths, does not stand. An ankle stands so high.
const STANDING_HEIGHT: f64 = 0.3;

/// Frames whose places are computed together.
const CHUNK: usize = 512;

/// A point of a joint: where it stands in that joint's own frame.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct JointPoint {
    /// The joint.
    pub joint: usize,
    /// The point in its frame; zero for the joint itself.
    pub offset: DVec3,
}

impl JointPoint {
    /// The joint itself.
    pub const fn of(joint: usize) -> Self {
        Self { joint, offset: DVec3::ZERO }
    }

    fn place(&self, worlds: &Worlds, time: usize) -> DVec3 {
        if self.offset == DVec3::ZERO {
            worlds.position(self.joint, time)
        } else {
            worlds.point(self.joint, time, self.offset)
        }
    }
}

/// A limb that can stand, with the points that touch the ground. `heel` and `ball` are one and the same where the foot is one point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Foot {
    /// The limb that is bent to hold the foot: hip, knee, ankle.
    pub limb: TwoJointLimb,
    /// The hind point, carried by the limb's end without a further joint between: the ankle itself will do, since only its changes of height count.
    pub heel: JointPoint,
    /// The front point: the joint of the toes, or their tip.
    pub ball: JointPoint,
}

/// Which point of a foot.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum FootPart {
    /// The hind point.
    Heel,
    /// The front point.
    Ball,
}

impl FootPart {
    /// Heel, then ball.
    pub const BOTH: [Self; 2] = [Self::Heel, Self::Ball];

    /// `heel` or `ball`.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Heel => "heel",
            Self::Ball => "ball",
        }
    }
}

impl Foot {
    /// The point that stands for a part.
    pub fn point(&self, part: FootPart) -> JointPoint {
        match part {
            FootPart::Heel => self.heel,
            FootPart::Ball => self.ball,
        }
    }

    /// All joints that it names.
    pub fn joints(&self) -> [usize; 5] {
        [self.limb.upper, self.limb.lower, self.limb.end, self.heel.joint, self.ball.joint]
    }

    /// The same foot where joints are numbered otherwise; `None` when one is missing.
    #[must_use]
    pub fn renumbered(&self, now: &dyn Fn(usize) -> Option<usize>) -> Option<Self> {
        let limb = TwoJointLimb {
            upper: now(self.limb.upper)?,
            lower: now(self.limb.lower)?,
            end: now(self.limb.end)?,
            ..self.limb
        };
        let point = |point: JointPoint| Some(JointPoint { joint: now(point.joint)?, ..point });
        Some(Self { limb, heel: point(self.heel)?, ball: point(self.ball)? })
    }

    /// The parts that are points of their own.
    pub fn parts(&self) -> &'static [FootPart] {
        if self.heel == self.ball { &[FootPart::Ball] } else { &[FootPart::Heel, FootPart::Ball] }
    }
}

/// A run of frames in which a point of a foot is planted.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct PlantedSpan {
    /// Which foot of the list that was asked about.
    pub foot: usize,
    /// Which point of it.
    pub part: FootPart,
    /// First planted frame of the clip.
    pub first_frame: usize,
    /// Last planted frame.
    pub last_frame: usize,
}

impl PlantedSpan {
    /// Its frames.
    pub fn frames(&self) -> RangeInclusive<usize> {
        self.first_frame..=self.last_frame
    }
}

/// How contacts are told. The numbers are for an adult with a leg of 0.9 m and scale with the clip's own legs, whatever the unit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ContactOptions {
    /// Which way is up in the scene; unit. The ground is level.
    pub up: DVec3,
    /// Factor on the heights and speeds below which a foot is planted: above 1 finds more and longer contacts.
    pub tolerance: f64,
}

impl Default for ContactOptions {
    fn default() -> Self {
        Self { up: DVec3::Y, tolerance: 1.0 }
    }
}

/// The places of some points at every frame of a clip.
#[derive(Clone, Debug)]
pub struct Trails {
    /// A row of places for each point asked about, in the scene.
    pub rows: Vec<Vec<DVec3>>,
}

impl Trails {
    /// Follows points through a clip.
    pub fn of(clip: &Clip, points: &[JointPoint]) -> Self {
        let mut rows = vec![Vec::with_capacity(clip.grid.count()); points.len()];
        let times: Vec<f64> = clip.grid.times.iter().collect();
        let branch = Branch::of(clip, points.iter().map(|point| point.joint));
        let points: Vec<JointPoint> = points.iter().map(|&point| branch.point(point)).collect();
        for chunk in times.chunks(CHUNK) {
            let worlds = branch.clip.worlds_at(chunk);
            for (row, point) in rows.iter_mut().zip(&points) {
                row.extend((0..chunk.len()).map(|time| point.place(&worlds, time)));
            }
        }
        Self { rows }
    }
}

/// Where and how feet stand in a clip.
#[derive(Clone, Debug)]
pub struct Contacts {
    /// Spans by foot, part and frame.
    pub spans: Vec<PlantedSpan>,
    /// The height of the ground along `up`, in the scene: the 5th percentile of the lowest point. 0 without feet.
    pub ground: f64,
    /// Length of the longest leg, hip to ankle along the limb, in the scene; 0 without feet.
    pub leg: f64,
}

/// Finds the spans in which the feet of a clip are planted.
///
/// A point is planted when it is low and slow, and stays so until it is lifted or moves (hysteresis). Heights are measured from the
/// point's own standing height, its 5th percentile over the clip; speeds are of all three directions. Lengths are scaled with
/// the leg, speeds are means over a span of time and not of frames, and runs too short are dropped.
///
/// Source: Kovar, Schreiner & Gleicher 2002, "Footskate cleanup for motion capture editing"; Ikemoto, Arikan & Forsyth
/// 2006, "Knowing when to put your foot down". The numbers are this project's own.
pub fn contacts(clip: &Clip, feet: &[Foot], options: &ContactOptions) -> Contacts {
    let points: Vec<JointPoint> = feet.iter().flat_map(|foot| [foot.heel, foot.ball]).collect();
    let trails = Trails::of(clip, &points);
    let legs = leg_lengths(clip, feet);
    let leg = legs.iter().copied().fold(0.0, f64::max);
    let heights: Vec<Vec<f64>> =
        trails.rows.iter().map(|row| row.iter().map(|place| place.dot(options.up)).collect()).collect();
    let standing: Vec<f64> = heights.iter().map(|row| percentile(row, STANDING_SHARE)).collect();
    let ground = standing.iter().copied().fold(f64::INFINITY, f64::min);
    let ground = if ground.is_finite() { ground } else { 0.0 };
    let secs = clip.grid.times.median_step().unwrap_or(1.0);
    let mut spans = Vec::new();
    for (foot, own) in feet.iter().enumerate() {
        for &part in own.parts() {
            let row = 2 * foot + usize::from(part == FootPart::Ball);
            let stands = standing[row] <= ground + STANDING_HEIGHT * legs[foot];
            if !stands {
                continue;
            }
            let scale = options.tolerance * legs[foot] / ADULT_LEG;
            let speeds = speeds(clip, &trails.rows[row]);
            let planted = hysteresis(&heights[row], &speeds, standing[row], scale);
            let least = LEAST_FRAMES.max((LEAST_SECS / secs).ceil() as usize);
            spans.extend(
                runs(&planted)
                    .filter(|&(first, last)| last + 1 - first >= least)
                    .map(|(first_frame, last_frame)| PlantedSpan { foot, part, first_frame, last_frame }),
            );
        }
    }
    Contacts { spans, ground, leg }
}

/// The length of each limb along its two parts, in the scene, in the clip's first frame.
pub fn leg_lengths(clip: &Clip, feet: &[Foot]) -> Vec<f64> {
    let local = clip.local_at(clip.grid.time(0));
    let length = |foot: &Foot| {
        let [hip, knee, ankle] = foot.limb.points(&clip.skeleton, &local);
        hip.distance(knee) + knee.distance(ankle)
    };
    feet.iter().map(length).collect()
}

/// The speed at each frame, in the scene's lengths a second.
fn speeds(clip: &Clip, row: &[DVec3]) -> Vec<f64> {
    let Some(step) = clip.grid.times.median_step().filter(|_| row.len() > 1) else {
        return vec![0.0; row.len()];
    };
    let reach = ((SPEED_SECS / step).round() as usize).max(1);
    let last = row.len() - 1;
    (0..row.len())
        .map(|frame| {
            let (a, b) = (frame.saturating_sub(reach), (frame + reach).min(last));
            row[a].distance(row[b]) / (clip.grid.time(b) - clip.grid.time(a)).max(f64::MIN_POSITIVE)
        })
        .collect()
}

fn hysteresis(heights: &[f64], speeds: &[f64], standing: f64, scale: f64) -> Vec<bool> {
    // Both ways through the clip, so that a contact is the same played backwards: it begins where it would end.
    let held = |frame: usize| heights[frame] - standing < LIFTED * scale && speeds[frame] < MOVING * scale;
    let sure = |frame: usize| heights[frame] - standing < LOW * scale && speeds[frame] < SLOW * scale;
    let mut planted = vec![false; heights.len()];
    for (first, last) in runs(&(0..heights.len()).map(held).collect::<Vec<bool>>()) {
        let sure_frames = || (first..=last).filter(|&frame| sure(frame));
        if let (Some(from), Some(to)) = (sure_frames().next(), sure_frames().next_back()) {
            // At both ends it rolls: there it counts up to half way to moving.
            let half = |frame: &usize| speeds[*frame] < 0.5 * (SLOW + MOVING) * scale;
            let from = (first..from).rev().take_while(half).last().unwrap_or(from);
            let to = (to + 1..=last).take_while(half).last().unwrap_or(to);
            planted[from..=to].fill(true);
        }
    }
    planted
}

/// Runs of `true`, first and last.
fn runs(states: &[bool]) -> impl Iterator<Item = (usize, usize)> + '_ {
    let mut from = 0;
    std::iter::from_fn(move || {
        let first = from + states[from..].iter().position(|state| *state)?;
        let last = states[first..].iter().position(|state| !*state).map_or(states.len(), |n| first + n) - 1;
        from = last + 1;
        Some((first, last))
    })
}

/// The value below which `share` of the finite values lie; not a number without any.
fn percentile(values: &[f64], share: f64) -> f64 {
    let mut sound: Vec<f64> = values.iter().copied().filter(|value| value.is_finite()).collect();
    if sound.is_empty() {
        return f64::NAN;
    }
    let index = ((sound.len() - 1) as f64 * share).round() as usize;
    *sound.select_nth_unstable_by(index, f64::total_cmp).1
}

/// How a planted point moves.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Slide {
    /// The sum of its movements from frame to frame along the ground, in the scene's lengths.
    pub path: f64,
    /// Its largest speed along the ground, in the scene's lengths a second.
    pub fastest: f64,
    /// How far it gets from the middle of its places (their median along each direction) along the ground.
    pub farthest: f64,
}

/// How far each planted point slides, one for each span.
pub fn slides(clip: &Clip, feet: &[Foot], spans: &[PlantedSpan], up: DVec3) -> Vec<Slide> {
    let points: Vec<JointPoint> = feet.iter().flat_map(|foot| [foot.heel, foot.ball]).collect();
    let trails = Trails::of(clip, &points);
    spans
        .iter()
        .map(|span| {
            let row = &trails.rows[2 * span.foot + usize::from(span.part == FootPart::Ball)];
            slide_of(clip, row, span.frames(), up)
        })
        .collect()
}

/// How far a point slides in some frames.
pub fn slide_of(clip: &Clip, row: &[DVec3], frames: RangeInclusive<usize>, up: DVec3) -> Slide {
    let level = |v: DVec3| v - up * v.dot(up);
    let middle = median_place(row, frames.clone());
    let mut slide = Slide::default();
    let (first, last) = (*frames.start(), (*frames.end()).min(row.len().saturating_sub(1)));
    for frame in first..=last {
        slide.farthest = slide.farthest.max(level(row[frame] - middle).length());
        if frame > first {
            let step = level(row[frame] - row[frame - 1]).length();
            slide.path += step;
            let secs = clip.grid.time(frame) - clip.grid.time(frame - 1);
            if secs > 0.0 {
                slide.fastest = slide.fastest.max(step / secs);
            }
        }
    }
    slide
}

/// The median of some places along each of the scene's axes.
pub fn median_place(row: &[DVec3], frames: RangeInclusive<usize>) -> DVec3 {
    let last = (*frames.end()).min(row.len().saturating_sub(1));
    let own = row.get(*frames.start()..=last).unwrap_or_default();
    let along = |axis: usize| {
        let values: Vec<f64> = own.iter().map(|place| place[axis]).collect();
        percentile(&values, 0.5)
    };
    DVec3::new(along(0), along(1), along(2))
}
