//! The tiny clips behind the pictures: each with one fault or one wish, and what the real mend or pass makes of it.

use std::collections::BTreeMap;
use std::f64::consts::{PI, TAU};
use std::sync::Arc;

use glam::DVec3;

use super::topic::Subject;
use crate::blend::{Mask, MixAlong, mix};
use crate::clip::{
    Clip, FileAngles, FrameGrid, JointTracks, KeyChange, KeyEdit, PathKind, Paths, Push, PushFrame,
    RotationTrack, Smoothing, Times,
};
use crate::limit::{Interval, JointLimit, Limits, Range, SwingLimit};
use crate::mend::{SurveyOptions, apply_all, survey};
use crate::rotor::{Bivector, EulerOrder, Rotor};
use crate::scene::{
    KeysPass, LimitsPass, LoopPass, NoOthers, PassKind, PushPass, ReducePass, ResamplePass, SmoothPass,
};
use crate::skeleton::{Joint, JointKind, Skeleton, Transform};
use crate::snag::{SnagKind, Unwatched};

/// A clip before and after, and what of it is drawn.
#[derive(Clone, Debug)]
pub(super) struct Example {
    pub before: Arc<Clip>,
    pub after: Arc<Clip>,
    /// The number that is drawn: of the file's own, or the plane angle xy.
    pub of_file: Option<usize>,
    /// Whether keys are drawn as pips: where it is keys that change.
    pub shows_keys: bool,
}

const RATE: f64 = 30.0;
const FRAMES: usize = 121;

pub(super) fn pass_title(subject: Subject) -> &'static str {
    match subject {
        Subject::Snag(kind) => kind.name(),
        Subject::Smooth => "Smooth",
        Subject::Push => "Soft push",
        Subject::Keys => "Keys by hand",
        Subject::Reduce => "Fewer keys",
        Subject::Resample => "Another rate",
        Subject::Limits => "Joint limits",
        Subject::Blend => "Blend",
        Subject::Loop => "Loop",
        Subject::Retarget => "Retarget",
    }
}

pub(super) fn pass_words(subject: Subject) -> &'static str {
    match subject {
        Subject::Snag(kind) => kind.explanation(),
        Subject::Smooth => {
            "Takes out what is quicker than a frequency, at any spacing of keys and without delay. The first and the last \
             key stay."
        }
        Subject::Push => PushPass { pushes: Vec::new() }.explanation(),
        Subject::Keys => KeysPass { edits: Vec::new() }.explanation(),
        Subject::Reduce => ReducePass::within(0.0).explanation(),
        Subject::Resample => ResamplePass { rate: 0.0 }.explanation(),
        Subject::Limits => LimitsPass::new(Arc::new(limits())).explanation(),
        Subject::Blend => {
            "Joins another clip behind this one, goes between both by a weight, lays its difference over this one, or takes the mean of several. Steps \
             can be brought into time with each other."
        }
        Subject::Loop => LoopPass::default().explanation(),
        Subject::Retarget => {
            "Lets the figure of another file make the turns of this one. Rest poses are compared by where limbs point, paths \
             are scaled by the legs."
        }
    }
}

/// A joint that turns in plane xy, and one on it that turns on quietly.
pub(super) fn clip(turns: RotationTrack) -> Clip {
    let joint = |number: usize, place: DVec3| Joint {
        name: ["arm", "hand"][number].to_owned(),
        number,
        parent: number.checked_sub(1),
        rest: Transform::from_translation(place),
        kind: JointKind::Joint,
        tips: if number == 1 { vec![DVec3::X * 0.3] } else { Vec::new() },
    };
    let joints = vec![joint(0, DVec3::ZERO), joint(1, DVec3::X * 0.5)];
    let times = times();
    let hand =
        (0..FRAMES).map(|frame| turn(0.3 * wave(frame, 0.8), 0.2 * wave(frame, 0.5))).collect::<Vec<_>>();
    let track = |rotation| Arc::new(JointTracks { rotation: Some(rotation), ..JointTracks::default() });
    Clip {
        name: String::new(),
        skeleton: Arc::new(Skeleton::new(joints).expect("each hangs on the one before")),
        joints: vec![track(turns), track(RotationTrack::from_rotors(times.clone(), hand))],
        duration_secs: (FRAMES - 1) as f64 / RATE,
        grid: FrameGrid { times, rate: RATE },
    }
}

fn times() -> Times {
    Times::Even { step_secs: 1.0 / RATE, count: FRAMES }
}

fn wave(frame: usize, hz: f64) -> f64 {
    (TAU * hz * frame as f64 / RATE).sin()
}

/// A little unrest, as every capture has it: the same each time.
fn noise(frame: usize) -> f64 {
    let mixed = (frame as u64 + 1).wrapping_mul(0x9e37_79b9_7f4a_7c15);
    ((mixed >> 33) as f64 / f64::from(1_u32 << 31) - 0.5) * 0.004
}

fn turn(xy_rad: f64, yz_rad: f64) -> Rotor {
    Rotor::from_plane_angles(Bivector::new(yz_rad, 0.0, xy_rad))
}

/// The sound motion: plane angle xy in radians.
fn angle(frame: usize) -> f64 {
    0.7 * wave(frame, 0.4) + noise(frame)
}

fn of_angles(angle: impl Fn(usize) -> f64) -> Clip {
    clip(RotationTrack::from_rotors(
        times(),
        (0..FRAMES).map(|frame| turn(angle(frame), 0.0)).collect::<Vec<_>>(),
    ))
}

fn of_rows(row: impl Fn(usize) -> [f64; 3]) -> Clip {
    let order = EulerOrder::ZXY;
    let degrees: Vec<[f64; 3]> = (0..FRAMES).map(row).collect();
    clip(RotationTrack::from_angles(
        times(),
        FileAngles { axes: order.axes().to_vec(), order, degrees: degrees.into() },
    ))
}

fn limits() -> Limits {
    let range =
        Range { swing: SwingLimit::Cone { half_rad: 0.45 }, twist: Interval::from_degrees(-180.0, 180.0) };
    let limit = JointLimit::new(Rotor::IDENTITY, DVec3::X, DVec3::Z, range);
    Limits { title: "example".to_owned(), joints: BTreeMap::from([(0, limit)]) }
}

/// A clip with one snag of a kind.
fn faulty(kind: SnagKind) -> (Clip, Option<usize>) {
    let inside = |frame: usize| (48..66).contains(&frame);
    match kind {
        SnagKind::BrokenValue => {
            let keys = (0..FRAMES).map(|frame| match frame {
                54..=67 => Rotor::new(f64::NAN, 0.0, 0.0, 0.0),
                _ => turn(angle(frame), 0.0),
            });
            (clip(RotationTrack::from_rotors(times(), keys.collect::<Vec<_>>())), None)
        }
        SnagKind::SignFlip => {
            let keys = (0..FRAMES).map(|frame| {
                let key = turn(angle(frame), 0.0);
                if frame >= 60 { -key } else { key }
            });
            (clip(RotationTrack::from_rotors(times(), keys.collect::<Vec<_>>())), Some(0))
        }
        SnagKind::Wrap => {
            let heading = |frame: usize| 150.0 + 0.5 * frame as f64;
            (
                of_rows(|frame| {
                    [heading(frame) - if heading(frame) > 180.0 { 360.0 } else { 0.0 }, 10.0, 5.0]
                }),
                Some(0),
            )
        }
        SnagKind::MirroredAngles => {
            let row = |frame: usize| {
                let [z, x, y] =
                    [30.0 * wave(frame, 0.4), 60.0 + 15.0 * wave(frame, 0.3), 20.0 * wave(frame, 0.5)];
                if frame >= 60 { [z + 180.0, 180.0 - x, y + 180.0] } else { [z, x, y] }
            };
            (of_rows(row), Some(0))
        }
        SnagKind::LongWay => {
            // A cubic between opposite signs of nearly the same turn: the player goes all the way round.
            let keys = [0.0, 0.35, -0.7, -1.05, -1.4].map(|xy_rad: f64| {
                let key = turn(xy_rad.abs(), 0.0);
                if xy_rad < 0.0 { -key } else { key }
            });
            let step_secs = (FRAMES - 1) as f64 / RATE / (keys.len() - 1) as f64;
            let times = Times::Even { step_secs, count: keys.len() };
            let mut track = RotationTrack::from_rotors(times, keys.to_vec());
            track.paths = Paths::Every(PathKind::Cubic);
            track.tangents = Some(vec![[Rotor::new(0.0, 0.0, 0.0, 0.0); 2]; keys.len()].into());
            (clip(track), None)
        }
        SnagKind::HalfTurn => (of_angles(|frame| angle(frame) + if inside(frame) { PI } else { 0.0 }), None),
        SnagKind::Spike => (of_angles(|frame| angle(frame) + if frame == 60 { 0.9 } else { 0.0 }), None),
        SnagKind::Stuck => (of_angles(|frame| angle(if inside(frame) { 48 } else { frame })), None),
        SnagKind::Jitter => {
            let shake = |frame: usize| if frame.is_multiple_of(2) { 0.06 } else { -0.06 };
            (of_angles(|frame| angle(frame) + shake(frame) * (1.0 + 40.0 * noise(frame))), None)
        }
        SnagKind::PastLimit | SnagKind::Slide => (of_angles(angle), None),
        SnagKind::Seam => {
            (of_angles(|frame| 0.5 * wave(frame, 0.25) + 0.25 * frame as f64 / FRAMES as f64), None)
        }
    }
}

/// The clip of a subject, before and after.
pub(super) fn example(subject: Subject) -> Example {
    let plain = |before: Clip, pass: &dyn PassKind, shows_keys: bool| {
        let before = Arc::new(before);
        let after =
            pass.apply(&before, &NoOthers).map_or_else(|_| Arc::clone(&before), |done| Arc::new(done.clip));
        Example { before, after, of_file: None, shows_keys }
    };
    match subject {
        Subject::Snag(kind) => {
            let (before, of_file) = faulty(kind);
            let options = SurveyOptions { kinds: vec![kind], limits: Some(Arc::new(limits())) };
            let mended = survey(&before, &options, &Unwatched)
                .ok()
                .and_then(|found| apply_all(&before, &found.snags).ok())
                .unwrap_or_else(|| before.clone());
            Example { before: Arc::new(before), after: Arc::new(mended), of_file, shows_keys: false }
        }
        Subject::Smooth => {
            let shaky = of_angles(|frame| angle(frame) + 30.0 * noise(frame));
            plain(shaky, &SmoothPass::new(Smoothing::gaussian(2.0)), false)
        }
        Subject::Push => {
            let push = Push {
                joint: 0,
                center_secs: 2.0,
                reach_secs: 1.2,
                turn: Bivector::new(0.0, 0.0, 0.6),
                frame: PushFrame::Own,
            };
            plain(of_angles(angle), &PushPass { pushes: vec![push] }, false)
        }
        Subject::Keys => {
            let mut few = of_angles(angle);
            few = ResamplePass { rate: 2.0 }
                .apply(&Arc::new(few.clone()), &NoOthers)
                .map_or(few, |done| done.clip);
            let change = KeyChange::Set(vec![(2.0, turn(0.9, 0.0))]);
            plain(few, &KeysPass { edits: vec![KeyEdit { joint: 0, change }] }, true)
        }
        Subject::Reduce => plain(of_angles(angle), &ReducePass::within(0.04), true),
        Subject::Resample => plain(of_angles(angle), &ResamplePass { rate: 4.0 }, true),
        Subject::Limits => plain(of_angles(angle), &LimitsPass::new(Arc::new(limits())), false),
        Subject::Loop => {
            plain(faulty(SnagKind::Seam).0, &LoopPass { rounds: 2, ..LoopPass::default() }, false)
        }
        Subject::Blend | Subject::Retarget => {
            let (one, other) = (of_angles(angle), of_angles(|frame| 0.4 * wave(frame, 0.9) - 0.3));
            let mask = Mask::all(&one.skeleton);
            let half = MixAlong::constant(0.5);
            let mixed = mix(&one, &other, &half, &mask).unwrap_or_else(|_| one.clone());
            Example { before: Arc::new(one), after: Arc::new(mixed), of_file: None, shows_keys: false }
        }
    }
}

/// The other clip of the blend.
pub(super) fn blended_in() -> Clip {
    of_angles(|frame| 0.4 * wave(frame, 0.9) - 0.3)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_tiny_clip_shows_what_it_is_about() {
        let mut same = Vec::new();
        for kind in SnagKind::ALL.into_iter().filter(|kind| *kind != SnagKind::Slide) {
            let example = example(Subject::Snag(kind));
            if example.before.same_joint(&example.after, 0) {
                same.push(format!("{kind}"));
            }
        }
        for subject in Subject::PASSES {
            let example = example(subject);
            if example.before.same_joint(&example.after, 0) {
                same.push(format!("{subject:?}"));
            }
        }
        assert!(same.is_empty(), "nothing changes in the examples of {same:?}");
    }
}
