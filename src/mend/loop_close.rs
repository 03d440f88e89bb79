//! Makes a clip close on itself, so that it can be played round and round.

use glam::DVec3;

use crate::clip::{Clip, JointTracks, LoopSeam, PathKind, Times, VectorTrack, ends_on_first_pose};
use crate::rotor::Bivector;
use crate::snag::{LoopClose, LoopForm};

use super::draft::Draft;

/// Brought in near the seam, a difference takes at least so long on each side, and no joint is turned faster than this by it.
const WINDOW_SECS: f64 = 0.25;
const WINDOW_RATE: f64 = 60.0 / 180.0 * std::f64::consts::PI;

/// Rates are brought to meet within so long on each side.
const RATE_SECS: f64 = 0.2;

/// Spread over the whole clip, no more than this is hidden.
const SPREAD_RAD: f64 = 10.0 / 180.0 * std::f64::consts::PI;

/// How a loop is closed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LoopOptions {
    /// How the difference is spread; `None`: for each joint by its size.
    pub form: Option<LoopForm>,
    /// Whether rates are made to meet too.
    pub with_rate: bool,
    /// Whether the last frame stands for the first of the next round; `None`: told from the motion.
    pub is_first_again: Option<bool>,
    /// Which way is up in the scene; unit.
    pub up: DVec3,
}

impl Default for LoopOptions {
    fn default() -> Self {
        Self { form: None, with_rate: true, is_first_again: None, up: DVec3::Y }
    }
}

/// What closing a loop came to.
#[derive(Clone, Debug, PartialEq)]
pub struct LoopReport {
    /// Whether the last frame stands for the first of the next round.
    pub is_first_again: bool,
    /// The joints that did not meet, and by how much.
    pub seams: Vec<(usize, LoopSeam)>,
}

/// A clip whose end meets its start in pose and rate. The way of a root along the ground, and its turn on a curve, stay as the
/// stride of the loop. Joints that meet within 1e-9 rad and places within 1e-12 stay as they are.
///
/// Source of the two forms: the methods page, section 18.
pub fn close_loop(clip: &Clip, options: &LoopOptions) -> (Clip, LoopReport) {
    let is_first_again = options.is_first_again.unwrap_or_else(|| ends_on_first_pose(clip, options.up));
    let mut report = LoopReport { is_first_again, seams: Vec::new() };
    let mut closed = clip.clone();
    for joint in 0..clip.joints.len() {
        let seam = LoopSeam::of(clip, joint, is_first_again, options.up);
        let apart = seam.turn.length().max(seam.turn_rate.length());
        if apart > 1e-9 || seam.place.length() > 1e-12 {
            report.seams.push((joint, seam));
            let by_size = if seam.turn.length() > SPREAD_RAD { LoopForm::Window } else { LoopForm::Spread };
            let form = options.form.unwrap_or(by_size);
            let how = LoopClose { form, is_first_again, with_rate: options.with_rate };
            closed = close_joint(&closed, joint, how, options.up);
        }
    }
    (closed, report)
}

/// Rates are told from a few frames, which the change bends: so often they are told anew.
const ROUNDS: usize = 3;

/// The clip with the loop of one joint closed.
pub(super) fn close_joint(clip: &Clip, joint: usize, how: LoopClose, up: DVec3) -> Clip {
    let rounds = if how.with_rate || !how.is_first_again { ROUNDS } else { 1 };
    (0..rounds).fold(clip.clone(), |clip, _| closer(&clip, joint, how, up))
}

fn closer(clip: &Clip, joint: usize, how: LoopClose, up: DVec3) -> Clip {
    let seam = LoopSeam::of(clip, joint, how.is_first_again, up);
    let Some(last) = clip.grid.count().checked_sub(1).filter(|&last| last > 0) else { return clip.clone() };
    let (from, to) = (clip.grid.time(0), clip.grid.time(last));
    let step = (to - from) / last as f64;
    // glTF: the last key may lie a little before the frame nearest to it.
    let to = to.min(clip.duration_secs.max(from + 0.5 * step));
    // End keys are held outside: there the change is the end's too.
    let shape = |times: &Times| {
        let (first, last) = times.span().unwrap_or((from, to));
        let (from, to) = (from.max(first.min(to)), to.min(last.max(from)));
        Shape { from, secs: (to - from).max(step) + if how.is_first_again { 0.0 } else { step }, how }
    };
    let mut closed = clip.clone();
    if let Some(track) = clip.rotation(joint).filter(|track| !track.keys.is_empty()) {
        let angle = seam.turn.length();
        let mut draft = Draft::new(track);
        let shape = shape(&track.times);
        for key in 0..draft.len() {
            let secs = draft.secs(key);
            let [share, rate] = shape.at(secs, angle);
            let change =
                seam.turn * share + if how.with_rate { seam.turn_rate * rate } else { Bivector::ZERO };
            let was = track.sound_key(key);
            let by = crate::rotor::Rotor::from_plane_angles(change);
            if let (Some(tangents), PathKind::Cubic) =
                (&track.tangents, track.paths.of(key.min(draft.len().saturating_sub(2))))
            {
                // The rates of the four numbers turn along; what the change itself adds to them is left to the neighbours.
                let turned = tangents[key].map(|tangent| tangent * by);
                draft.set_pose(key, (was * by).normalize(), was);
                let sign = if draft.keys[key].dot(was * by) < 0.0 { -1.0 } else { 1.0 };
                draft.set_numbers(key, draft.keys[key], Some(turned.map(|tangent| tangent.scale(sign))));
            } else {
                draft.set_pose(key, (was * by).normalize(), was);
            }
        }
        if let Some(track) = draft.finish() {
            closed = closed.with_rotation(joint, track);
        }
    }
    let moves = seam.place.length() > 0.0 || (how.with_rate && seam.place_rate.length() > 0.0);
    if let Some(track) = clip.joints[joint].translation.as_ref().filter(|_| moves) {
        let shape = shape(&track.times);
        let keys: Vec<DVec3> = track
            .times
            .iter()
            .zip(track.keys.iter())
            .map(|(secs, place)| {
                let [share, rate] = shape.at(secs, 0.0);
                *place + seam.place * share + if how.with_rate { seam.place_rate * rate } else { DVec3::ZERO }
            })
            .collect();
        let track = VectorTrack { keys: keys.into(), ..track.clone() };
        let tracks = JointTracks { translation: Some(track), ..(*closed.joints[joint]).clone() };
        closed.joints[joint] = tracks.into();
    }
    closed
}

/// How much of a difference is put in where.
struct Shape {
    from: f64,
    /// How long a round is.
    secs: f64,
    how: LoopClose,
}

impl Shape {
    /// What share of the difference in pose is added at a time, −½ at the start to ½ at the end; and the seconds by which
    /// the difference in rate counts. `angle_rad` is the difference.
    fn at(&self, secs: f64, angle_rad: f64) -> [f64; 2] {
        let u = ((secs - self.from) / self.secs).clamp(0.0, 1.0);
        let (since, until) = (u * self.secs, (1.0 - u) * self.secs);
        let share = match self.how.form {
            LoopForm::Spread => u - 0.5,
            LoopForm::Window => {
                // A smooth step is 1.5 times as fast in its middle as it is on the whole.
                let window = WINDOW_SECS.max(0.75 * angle_rad / WINDOW_RATE).min(0.5 * self.secs);
                0.5 * (faded(until / window) - faded(since / window))
            }
        };
        let window = RATE_SECS.min(0.5 * self.secs);
        // A cubic that begins at 0 with slope 1 and ends flat.
        let lift = |t: f64| if t < 1.0 { window * t * (1.0 - t) * (1.0 - t) } else { 0.0 };
        // Half the gap is added to the end's rate, half taken from the start's.
        [share, -0.5 * lift(since / window) - 0.5 * lift(until / window)]
    }
}

/// A smooth step from 1 down to 0.
fn faded(t: f64) -> f64 {
    let t = t.min(1.0);
    2.0 * t * t * t - 3.0 * t * t + 1.0
}
