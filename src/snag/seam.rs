//! A loop whose end does not meet its start.

use glam::DVec3;

use crate::clip::{Clip, LoopSeam, Round, key_at};
use crate::rotor::Bivector;
use crate::skeleton::JointKind;

use super::{LoopClose, LoopForm, Remedy, Snag, SnagKind};

/// A turn that misses by less than this, and a rate that differs by less than this from frame to frame, is a loop well closed.
const LEAST_RAD: f64 = 0.25 / 180.0 * std::f64::consts::PI;

/// So many times the least changes from step to step, which are noise, may be missing beside that.
const NOISES: f64 = 3.0;

/// So many times the usual change from step to step, where the pose that comes next is not in the clip.
const USUAL: f64 = 2.0;

/// Up to here the difference is spread over the whole clip; beyond, that would be seen, and it is brought in near the seam.
const SPREAD_RAD: f64 = 10.0 / 180.0 * std::f64::consts::PI;

/// A clip of which a joint ends so far from where it begins may be no loop at all: whether to close any of it is for a person to say.
const MEANT_RAD: f64 = 30.0 / 180.0 * std::f64::consts::PI;

/// A place that misses by less than this share of the figure is a loop well closed.
const LEAST_SHARE: f64 = 0.005;

/// Steps looked at for what is usual.
const LOOKED_AT: usize = 400;

/// Finds the joints of a clip whose loop does not close; of fewer than four frames none. They are closed together or not at all.
pub(super) fn find_all(clip: &Clip) -> Vec<Snag> {
    if clip.grid.count() < 4 {
        return Vec::new();
    }
    let round = Round::of(clip, DVec3::Y);
    let mut seams: Vec<Snag> = (0..clip.joints.len())
        .filter(|&joint| clip.skeleton.joints()[joint].kind == JointKind::Joint)
        .filter_map(|joint| of_joint(clip, joint, round))
        .collect();
    let is_loop = seams.iter().all(|seam| seam.size_rad <= MEANT_RAD);
    for seam in &mut seams {
        seam.safe = is_loop;
    }
    seams
}

fn of_joint(clip: &Clip, joint: usize, round: Round) -> Option<Snag> {
    let seam = LoopSeam::of(clip, joint, round, DVec3::Y);
    let step_secs = clip.grid.times.median_step()?;
    let [noise, usual] = usual_changes(clip, joint);
    let (turn, rate) = (seam.turn.length(), seam.turn_rate.length());
    let size = figure_size(clip).max(f64::MIN_POSITIVE);
    let place = seam.place.length() / size;
    // A pose that comes again does so but for noise; one that comes next is told from the steps on both sides.
    let doubt = if round.is_first_again { NOISES * noise } else { USUAL * usual };
    let misses_turn = turn > LEAST_RAD + doubt;
    // A rate is told from four steps on each side, each as uncertain as a step.
    let misses_rate = rate * step_secs > LEAST_RAD + 2.0 * USUAL * usual;
    let misses_place = place > LEAST_SHARE;
    if !(misses_turn || misses_rate || misses_place) {
        return None;
    }
    let label = clip.skeleton.label(joint);
    let mut said = Vec::new();
    if misses_turn {
        said.push(format!("ends {:.1}° away from where it begins", turn.to_degrees()));
    }
    if misses_rate {
        said.push(format!("turns there by {:.0}°/s otherwise than at the start", rate.to_degrees()));
    }
    if misses_place {
        said.push(format!("stands {:.1} % of the figure's size off", place * 100.0));
    }
    let form = if turn > SPREAD_RAD { LoopForm::Window } else { LoopForm::Spread };
    let keys = clip.rotation(joint).map_or(1, |track| track.keys.len().max(1));
    let last = clip.grid.count() - 1;
    let first_key = clip.rotation(joint).map_or(0, |track| key_at(&track.times, clip.grid.time(round.first)));
    let (from, start) = match round.first {
        0 => (String::new(), "the first".to_owned()),
        first => (format!(" from frame {first} on, after a calibration pose,"), format!("frame {first}")),
    };
    Some(Snag {
        kind: SnagKind::Seam,
        joint,
        first_key,
        last_key: keys - 1,
        first_frame: round.first,
        last_frame: last,
        first_secs: clip.grid.time(round.first),
        last_secs: clip.grid.time(last),
        size_rad: turn.max(rate * step_secs).max(place),
        confidence: 1.0,
        remedy: Remedy::CloseLoop(LoopClose { form, round, with_rate: misses_rate }),
        safe: true,
        text: format!(
            "In a loop{from} {label} {} ({})",
            said.join(" and "),
            if round.is_first_again {
                format!("the last frame is {start} again")
            } else {
                format!("{start} follows the last")
            }
        ),
    })
}

/// The changes from step to step that one in ten and nine in ten stay below, in radians: noise, and motion.
fn usual_changes(clip: &Clip, joint: usize) -> [f64; 2] {
    let Some(track) = clip.rotation(joint).filter(|track| !track.keys.is_empty()) else { return [0.0; 2] };
    let every = clip.grid.count().div_ceil(LOOKED_AT).max(1);
    let step = |frame: usize| -> Bivector {
        (track.at(clip.grid.time(frame)).reverse() * track.at(clip.grid.time(frame + 1))).plane_angles()
    };
    let mut changes: Vec<f64> = (0..clip.grid.count().saturating_sub(2))
        .step_by(every)
        .map(|frame| (step(frame + 1) - step(frame)).length())
        .collect();
    changes.sort_by(f64::total_cmp);
    [1, 9].map(|tenths| changes.get(changes.len() * tenths / 10).copied().unwrap_or(0.0))
}

/// The farthest two joints are apart from the first, at rest.
fn figure_size(clip: &Clip) -> f64 {
    let world = clip.skeleton.world(&clip.skeleton.rest_pose());
    let mut listed = clip.skeleton.listed().map(|joint| world[joint].position());
    let Some(first) = listed.next() else { return 0.0 };
    listed.map(|place| place.distance(first)).fold(0.0, f64::max)
}
