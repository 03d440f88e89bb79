//! Makes a clip close on itself, so that it can be played round and round.

use glam::DVec3;

use crate::clip::{
    Clip, FileAngles, JointTracks, LoopSeam, PathKind, Paths, RotationTrack, Round, Segments, Stored, Times,
    VectorTrack, key_at,
};
use crate::rotor::{Bivector, Rotor};
use crate::snag::{LoopClose, LoopForm};

use super::draft::Draft;

/// Brought in near the seam, a difference takes at least so long on each side, and no joint is turned faster than this by it.
const WINDOW_SECS: f64 = 0.25;
const WINDOW_RATE: f64 = 60.0 / 180.0 * std::f64::consts::PI;

/// Rates are brought to meet within so long on each side, and over so many keys: with fewer there is none that could be moved.
const RATE_SECS: f64 = 0.2;
const RATE_KEYS: f64 = 4.0;

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
    /// What is played round and round; frames before it are left as they are.
    pub round: Round,
    /// The joints that did not meet, and by how much.
    pub seams: Vec<(usize, LoopSeam)>,
}

/// A clip whose end meets its start in pose and rate. The way of a root along the ground, and its turn on a curve, stay as the
/// stride of the loop. Joints that meet within 1e-9 rad and places within 1e-12 stay as they are.
///
/// Source of the two forms: the methods page, section 18.
pub fn close_loop(clip: &Clip, options: &LoopOptions) -> (Clip, LoopReport) {
    let round = match options.is_first_again {
        Some(is_first_again) => Round { is_first_again, ..Round::closed(clip) },
        None => Round::of(clip, options.up),
    };
    let mut report = LoopReport { round, seams: Vec::new() };
    let mut closed = clip.clone();
    for joint in 0..clip.joints.len() {
        let seam = LoopSeam::of(clip, joint, round, options.up);
        let apart = seam.turn.length().max(seam.turn_rate.length());
        if apart > 1e-9 || seam.place.length() > 1e-12 {
            report.seams.push((joint, seam));
            let by_size = if seam.turn.length() > SPREAD_RAD { LoopForm::Window } else { LoopForm::Spread };
            let form = options.form.unwrap_or(by_size);
            let how = LoopClose { form, round, with_rate: options.with_rate };
            closed = close_joint(&closed, joint, how, options.up);
        }
    }
    (closed, report)
}

/// Rates are told from a few frames, which the change bends: so often they are told anew.
const ROUNDS: usize = 3;

/// The clip with the loop of one joint closed. Keys to which nothing is added keep their numbers.
pub(super) fn close_joint(clip: &Clip, joint: usize, how: LoopClose, up: DVec3) -> Clip {
    if how.round.is_first_again && !how.with_rate {
        return round(clip, joint, how, up);
    }
    closed_by_its_ends(clip, joint, how, up)
        .unwrap_or_else(|| (0..ROUNDS).fold(clip.clone(), |clip, _| round(&clip, joint, how, up)))
}

fn round(clip: &Clip, joint: usize, how: LoopClose, up: DVec3) -> Clip {
    match Change::new(clip, joint, how, up) {
        Some(change) => changed(clip, joint, &change),
        None => clip.clone(),
    }
}

/// Frames at each end that a seam is told from, and one more.
const END_FRAMES: usize = 6;

/// The same as round after round, with each key written once: what a round changes is told from the keys at both ends alone. `None` where
/// the poses of frames are not the keys', each for itself.
fn closed_by_its_ends(clip: &Clip, joint: usize, how: LoopClose, up: DVec3) -> Option<Clip> {
    let track = clip.rotation(joint)?;
    let count = track.keys.len();
    let is_whole = track.file_angles().is_none_or(|angles| angles.axes.len() == 3);
    let first_key = key_at(&track.times, clip.grid.time(how.round.first));
    let is_curve = how.round.is_first_again && LoopSeam::own_turn_rate(track, first_key).is_some();
    if track.tangents.is_some() || is_curve || !is_whole || count < 4 * END_FRAMES {
        return None;
    }
    let [low, high] = end_keys(track, clip, how.round.first)?;
    let ends: Vec<usize> = (first_key..low).chain(high..count).collect();
    if ends.iter().any(|&key| track.keys[key].try_normalize().is_none()) {
        return None;
    }
    let mut before_last = clip.clone();
    let mut rounded = clip.with_rotation(joint, of_keys(track, &ends));
    let mut changes = Vec::with_capacity(ROUNDS);
    for _ in 0..ROUNDS {
        let change = Change::new(&rounded, joint, how, up)?;
        let next = changed(&rounded, joint, &change);
        before_last = std::mem::replace(&mut rounded, next);
        changes.push(change);
    }
    let mut draft = Draft::new(track);
    if first_key == 0 {
        // The first key is aligned to the second as the round before the last has left that.
        draft.copy_key(1, before_last.rotation(joint)?);
    }
    let shapes: Vec<(Shape, &Change)> =
        changes.iter().map(|change| (change.shape(&track.times), change)).collect();
    for key in 0..count {
        let secs = draft.secs(key);
        if shapes.iter().all(|(shape, change)| shape.is_calm(secs, change)) {
            continue;
        }
        let was = track.sound_key(key);
        let pose = shapes.iter().fold(was, |pose, (shape, change)| {
            (pose.normalize() * Rotor::from_plane_angles(change.turn(shape, secs))).normalize()
        });
        draft.set_pose(key, pose, was);
    }
    let rotation = Some(draft.finish().unwrap_or_else(|| track.clone()));
    let mut closed = clip.clone();
    closed.joints[joint] = JointTracks { rotation, ..(*rounded.joints[joint]).clone() }.into();
    Some(closed)
}

/// Up to which key, and from which one on, they tell the poses at the frames at both ends of a round that begins at frame `first`;
/// `None` where they do not tell them, or where little lies between.
fn end_keys(track: &RotationTrack, clip: &Clip, first: usize) -> Option<[usize; 2]> {
    let count = track.keys.len();
    let passes_keys = matches!(track.paths, Paths::Every(kind) if kind != PathKind::BSpline);
    if passes_keys && track.times == clip.grid.times {
        return Some([first + END_FRAMES, count - END_FRAMES]);
    }
    // As in glTF, where each track has times of its own: between keys a pose is told by those beside it.
    let is_straight = matches!(track.paths, Paths::Every(PathKind::Slerp | PathKind::Hold))
        && track.segments == Segments::default();
    let last = clip.grid.count().checked_sub(END_FRAMES)?;
    let (since, until) = (clip.grid.time(first + END_FRAMES - 1), clip.grid.time(last));
    let low = (0..count).find(|&key| track.times.at(key) >= since)? + 1;
    let high = (0..count).rev().find(|&key| track.times.at(key) <= until)?;
    (is_straight && low >= 2 && low + 2 * END_FRAMES <= high).then_some([low, high])
}

/// Some keys of a track by themselves.
fn of_keys(track: &RotationTrack, keys: &[usize]) -> RotationTrack {
    let stored = match &track.stored {
        Stored::Rotors => Stored::Rotors,
        Stored::Angles(angles) => {
            let degrees: Vec<[f64; 3]> = keys.iter().map(|&key| angles.degrees[key]).collect();
            Stored::Angles(FileAngles { degrees: degrees.into(), ..angles.clone() })
        }
        Stored::PlaneAngles(degrees) => Stored::PlaneAngles(keys.iter().map(|&key| degrees[key]).collect()),
    };
    let times: Vec<f64> = keys.iter().map(|&key| track.times.at(key)).collect();
    let rotors: Vec<Rotor> = keys.iter().map(|&key| track.keys[key]).collect();
    // At keys all other kinds are where the short way is.
    let is_held = track.paths == Paths::Every(PathKind::Hold);
    let paths = Paths::Every(if is_held { PathKind::Hold } else { PathKind::Slerp });
    RotationTrack { paths, stored, ..RotationTrack::from_rotors(Times::Listed(times.into()), rotors) }
}

/// What closes the loop of a joint.
struct Change {
    seam: LoopSeam,
    /// The times of the round's first frame and of the last one.
    from: f64,
    to: f64,
    step: f64,
    how: LoopClose,
}

impl Change {
    /// `None` for a clip without a step.
    fn new(clip: &Clip, joint: usize, how: LoopClose, up: DVec3) -> Option<Self> {
        let first = how.round.first;
        let seam = if how.round.is_first_again {
            LoopSeam::in_own_rates(clip, joint, first, up)
        } else {
            LoopSeam::of(clip, joint, how.round, up)
        };
        let last = clip.grid.count().checked_sub(1).filter(|&last| last > first)?;
        let (from, to) = (clip.grid.time(first), clip.grid.time(last));
        let step = (to - from) / (last - first) as f64;
        // glTF: the last key may lie a little before the frame nearest to it.
        let to = to.min(clip.duration_secs.max(from + 0.5 * step));
        Some(Self { seam, from, to, step, how })
    }

    /// End keys are held outside: there the change is the end's too.
    fn shape(&self, times: &Times) -> Shape {
        let (first, last) = times.span().unwrap_or((self.from, self.to));
        let (from, to) = (self.from.max(first.min(self.to)), self.to.min(last.max(self.from)));
        let beyond = if self.how.round.is_first_again { 0.0 } else { self.step };
        let key_secs = times.median_step().unwrap_or(self.step);
        let before = if self.how.round.first == 0 { f64::INFINITY } else { 1e-3 * self.step };
        let secs = (to - from).max(self.step) + beyond;
        Shape { opens: from - before, from, secs, how: self.how, key_secs }
    }

    /// By what a pose is turned on the bone side.
    fn turn(&self, shape: &Shape, secs: f64) -> Bivector {
        self.turn_of(shape.at(secs, self.seam.turn.length()))
    }

    /// Of a share of what is missing, and seconds of the difference in rate; as well of how fast both change.
    fn turn_of(&self, [share, rate]: [f64; 2]) -> Bivector {
        let lift = if self.how.with_rate { self.seam.turn_rate * rate } else { Bivector::ZERO };
        self.seam.turn * share + lift
    }

    /// The derivative of the four numbers of that turn by time, per second.
    fn turn_rate(&self, shape: &Shape, secs: f64) -> Rotor {
        /// Radians to each side between which the exponential's slope is told: its square is lost.
        const SMALL: f64 = 1e-5;
        let slope = self.turn_of(shape.slopes_at(secs, self.seam.turn.length()));
        let small = SMALL / slope.length().max(SMALL);
        let near = |sign: f64| Rotor::from_plane_angles(self.turn(shape, secs) + slope * (sign * small));
        sum(near(1.0), -near(-1.0)).scale(0.5 / small)
    }

    /// By what a place is moved.
    fn way(&self, shape: &Shape, secs: f64) -> DVec3 {
        self.way_of(shape.at(secs, 0.0))
    }

    /// How fast that changes, a second.
    fn way_rate(&self, shape: &Shape, secs: f64) -> DVec3 {
        self.way_of(shape.slopes_at(secs, 0.0))
    }

    /// As [`Self::turn_of`].
    fn way_of(&self, [share, rate]: [f64; 2]) -> DVec3 {
        let lift = if self.how.with_rate { self.seam.place_rate * rate } else { DVec3::ZERO };
        self.seam.place * share + lift
    }
}

/// Of the four numbers each.
fn sum(a: Rotor, b: Rotor) -> Rotor {
    Rotor::new(a.s + b.s, a.yz + b.yz, a.zx + b.zx, a.xy + b.xy)
}

fn changed(clip: &Clip, joint: usize, change: &Change) -> Clip {
    let mut closed = clip.clone();
    if let Some(track) = clip.rotation(joint).filter(|track| !track.keys.is_empty()) {
        let mut draft = Draft::new(track);
        let shape = change.shape(&track.times);
        for key in 0..draft.len() {
            let secs = draft.secs(key);
            if shape.is_calm(secs, change) {
                continue;
            }
            let was = track.sound_key(key);
            let by = Rotor::from_plane_angles(change.turn(&shape, secs));
            if let (Some(tangents), PathKind::Cubic) =
                (&track.tangents, track.paths.of(key.min(draft.len().saturating_sub(2))))
            {
                // The rates of the four numbers turn along, and the change adds its own.
                let own = track.keys[key] * change.turn_rate(&shape, secs);
                let turned = tangents[key].map(|tangent| sum(tangent * by, own));
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
    let seam = &change.seam;
    let moves = seam.place.length() > 0.0 || (change.how.with_rate && seam.place_rate.length() > 0.0);
    if let Some(track) = clip.joints[joint].translation.as_ref().filter(|_| moves) {
        let shape = change.shape(&track.times);
        let keys: Vec<DVec3> = track
            .times
            .iter()
            .zip(track.keys.iter())
            .map(|(secs, place)| if secs < shape.opens { *place } else { *place + change.way(&shape, secs) })
            .collect();
        let tangents =
            track.tangents.as_ref().map(|tangents| {
                let each = track.times.iter().zip(tangents.iter());
                let is_open = |secs: f64| secs >= shape.opens;
                each.map(|(secs, both)| {
                    if is_open(secs) { both.map(|own| own + change.way_rate(&shape, secs)) } else { *both }
                })
                .collect()
            });
        let track = VectorTrack { keys: keys.into(), tangents, ..track.clone() };
        let tracks = JointTracks { translation: Some(track), ..(*closed.joints[joint]).clone() };
        closed.joints[joint] = tracks.into();
    }
    closed
}

/// How much of a difference is put in where.
struct Shape {
    /// What lies before is not of the round.
    opens: f64,
    from: f64,
    /// How long a round is.
    secs: f64,
    how: LoopClose,
    /// The usual time from key to key.
    key_secs: f64,
}

impl Shape {
    /// Whether nothing is added to the turn at a time.
    fn is_calm(&self, secs: f64, change: &Change) -> bool {
        if secs < self.opens {
            return true;
        }
        let (since, until) = self.since_and_until(secs);
        let reach = match self.how.form {
            LoopForm::Spread if change.seam.turn != Bivector::ZERO => return false,
            LoopForm::Spread => self.rate_window(),
            LoopForm::Window => self.window(change.seam.turn.length()).max(self.rate_window()),
        };
        since >= reach && until >= reach
    }

    /// Seconds since the start of the round and until its end.
    fn since_and_until(&self, secs: f64) -> (f64, f64) {
        let u = ((secs - self.from) / self.secs).clamp(0.0, 1.0);
        (u * self.secs, (1.0 - u) * self.secs)
    }

    /// How far from the seam a difference is brought in. A smooth step is 1.5 times as fast in its middle as it is on the whole.
    fn window(&self, angle_rad: f64) -> f64 {
        WINDOW_SECS.max(0.75 * angle_rad / WINDOW_RATE).min(0.5 * self.secs)
    }

    fn rate_window(&self) -> f64 {
        RATE_SECS.max(RATE_KEYS * self.key_secs).min(0.5 * self.secs)
    }

    /// What share of the difference in pose is added at a time, −½ at the start to ½ at the end; and the seconds by which
    /// the difference in rate counts. `angle_rad` is the difference.
    fn at(&self, secs: f64, angle_rad: f64) -> [f64; 2] {
        let (since, until) = self.since_and_until(secs);
        let share = match self.how.form {
            LoopForm::Spread => ((secs - self.from) / self.secs).clamp(0.0, 1.0) - 0.5,
            LoopForm::Window => {
                let window = self.window(angle_rad);
                0.5 * (faded(until / window) - faded(since / window))
            }
        };
        let window = self.rate_window();
        // A cubic that begins at 0 with slope 1 and ends flat.
        let lift = |t: f64| if t < 1.0 { window * t * (1.0 - t) * (1.0 - t) } else { 0.0 };
        // Half the gap is added to the end's rate, half taken from the start's.
        [share, -0.5 * lift(since / window) - 0.5 * lift(until / window)]
    }

    /// The derivatives of both by time.
    fn slopes_at(&self, secs: f64, angle_rad: f64) -> [f64; 2] {
        let (since, until) = self.since_and_until(secs);
        let share = match self.how.form {
            LoopForm::Spread => 1.0 / self.secs,
            LoopForm::Window => {
                let window = self.window(angle_rad);
                let slope = |t: f64| if t < 1.0 { 6.0 * t * (t - 1.0) } else { 0.0 };
                -0.5 * (slope(until / window) + slope(since / window)) / window
            }
        };
        let window = self.rate_window();
        let lift = |t: f64| if t < 1.0 { (1.0 - t) * (1.0 - 3.0 * t) } else { 0.0 };
        [share, 0.5 * lift(until / window) - 0.5 * lift(since / window)]
    }
}

/// A smooth step from 1 down to 0.
fn faded(t: f64) -> f64 {
    let t = t.min(1.0);
    2.0 * t * t * t - 3.0 * t * t + 1.0
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::*;
    use crate::clip::FrameGrid;
    use crate::rotor::EulerOrder;
    use crate::skeleton::{Joint, Skeleton};

    /// Two joints that swing on, so that neither pose nor rate meets; the lower one's heading wraps.
    fn clip(frames: usize, wide_deg: f64) -> Clip {
        let times = Times::Even { step_secs: 1.0 / 60.0, count: frames };
        let track = |joint: usize| {
            let degrees: Vec<[f64; 3]> = (0..frames)
                .map(|frame| {
                    let t = frame as f64 / 60.0 + joint as f64;
                    [wide_deg * (1.3 * t).sin(), 20.0 * (2.1 * t).cos(), 170.0 + 30.0 * (0.7 * t).sin()]
                })
                .collect();
            let angles = FileAngles {
                axes: EulerOrder::ZXY.axes().to_vec(),
                order: EulerOrder::ZXY,
                degrees: degrees.into(),
            };
            RotationTrack::from_angles(times.clone(), angles)
        };
        let joints = [Joint::placed("hip", 0, None, DVec3::Y), Joint::placed("knee", 1, Some(0), DVec3::Y)];
        let tracks = [0, 1]
            .map(|joint| Arc::new(JointTracks { rotation: Some(track(joint)), ..JointTracks::default() }));
        Clip {
            name: String::new(),
            joints: tracks.to_vec(),
            skeleton: Arc::new(Skeleton::new(joints.to_vec()).unwrap()),
            grid: FrameGrid { times: times.clone(), rate: 60.0 },
            duration_secs: times.span().unwrap().1,
        }
    }

    /// The same with the file's own form of glTF: rotors, each track with times of its own, beside the frames.
    fn with_own_times(clip: &Clip) -> Clip {
        (0..clip.joints.len()).fold(clip.clone(), |clip, joint| {
            let track = clip.rotation(joint).unwrap();
            let count = track.times.len();
            let secs = |key: usize| match key {
                0 => track.times.at(0),
                key if key + 1 == count => track.times.at(key),
                key => track.times.at(key) + 0.002 * ((key % 3) as f64 - 1.0),
            };
            let times: Vec<f64> = (0..count).filter(|key| key % 5 != 3).map(secs).collect();
            let keys: Vec<Rotor> = times.iter().map(|secs| track.at(*secs)).collect();
            clip.with_rotation(joint, RotationTrack::from_rotors(Times::Listed(times.into()), keys))
        })
    }

    /// A loop whose second joint is closed round after round, and the same closed by its ends, which has to meet.
    fn closed_both_ways(clip: &Clip, how: LoopClose) -> [Clip; 2] {
        let rounds = (0..ROUNDS).fold(clip.clone(), |clip, _| round(&clip, 1, how, DVec3::Y));
        let at_once = closed_by_its_ends(clip, 1, how, DVec3::Y).unwrap();
        let left = LoopSeam::of(&at_once, 1, how.round, DVec3::Y);
        let missed = LoopSeam::of(clip, 1, how.round, DVec3::Y);
        assert!(left.turn.length() < 1e-3 * missed.turn.length());
        assert!(left.turn_rate.length() < 0.1 * missed.turn_rate.length());
        [rounds, at_once]
    }

    #[test]
    fn keys_at_times_of_their_own_are_closed_by_the_ends_as_round_after_round() {
        for (wide_deg, form) in [(4.0, LoopForm::Spread), (50.0, LoopForm::Window)] {
            for is_first_again in [false, true] {
                let how = LoopClose { form, round: Round { first: 0, is_first_again }, with_rate: true };
                let clip = with_own_times(&clip(400, wide_deg));
                let [rounds, at_once] = closed_both_ways(&clip, how);
                let [old, new, was] = [&rounds, &at_once, &clip].map(|clip| clip.rotation(1).unwrap());
                let mut untouched = 0;
                for (key, old) in old.keys.iter().enumerate() {
                    assert!(old.turn_to(new.keys[key]) < 1e-14, "{form:?}, key {key}");
                    untouched += usize::from(new.keys[key] == was.keys[key]);
                }
                assert!(untouched > 80 || form == LoopForm::Spread, "{form:?}: {untouched} untouched");
            }
        }
    }

    /// A file's cubics, with few keys: the curve itself has to go on at the seam as fast as it comes in, and so have places.
    #[test]
    fn cubics_meet_in_their_own_rates() {
        for (wide_deg, form) in [(4.0, LoopForm::Spread), (50.0, LoopForm::Window)] {
            for (kind, every) in [(PathKind::Cubic, 15), (PathKind::Cubic, 1), (PathKind::Squad, 2)] {
                let whole = clip(241, wide_deg);
                let track = whole.rotation(1).unwrap();
                let kept: Vec<usize> = (0..241).step_by(every).collect();
                let times: Vec<f64> = kept.iter().map(|&key| track.times.at(key)).collect();
                let keys: Vec<Rotor> = kept.iter().map(|&key| track.keys[key]).collect();
                let sparse = RotationTrack::from_rotors(Times::Listed(times.clone().into()), keys);
                let sparse = sparse.with_path(0..kept.len() - 1, kind).unwrap();
                let step = times[1] - times[0];
                let grid =
                    FrameGrid { times: Times::Even { step_secs: step, count: kept.len() }, rate: 1.0 / step };
                let mut clip = Clip { grid, ..whole.with_rotation(1, sparse) };
                let place = |secs: &f64| DVec3::new(*secs, secs * secs, 0.0);
                let slope = |secs: &f64| [DVec3::new(1.0, 2.0 * secs, 0.0); 2];
                let places = VectorTrack {
                    path: crate::clip::VectorPath::Cubic,
                    tangents: Some(times.iter().map(slope).collect()),
                    ..VectorTrack::straight(
                        Times::Listed(times.clone().into()),
                        times.iter().map(place).collect::<Vec<_>>(),
                    )
                };
                clip.joints[1] =
                    JointTracks { translation: Some(places), ..(*clip.joints[1]).clone() }.into();
                let how =
                    LoopClose { form, round: Round { first: 0, is_first_again: true }, with_rate: true };
                let closed = close_joint(&clip, 1, how, DVec3::Y);
                let rates = |clip: &Clip| {
                    let track = clip.rotation(1).unwrap();
                    let end = track.segment_motion(track.keys.len() - 2, 1.0, None);
                    let start = track.segment_motion(0, 0.0, None);
                    let apart = end.orientation.turn_to(start.orientation);
                    (apart, (end.rate - start.rate).length())
                };
                let ((was_apart, was), (apart, is)) = (rates(&clip), rates(&closed));
                assert!(was_apart > 0.05 && was > 0.1, "{was_apart} {was}");
                let most = if kind == PathKind::Cubic { 1e-6 } else { 0.1 * was };
                assert!(apart < 1e-9 && is < most, "{form:?} {kind:?} every {every}: {apart}, {is} of {was}");
                if kind == PathKind::Cubic {
                    let places = closed.joints[1].translation.as_ref().unwrap();
                    let tangents = places.tangents.as_ref().unwrap();
                    let last = places.keys.len() - 1;
                    assert!((places.keys[0] - places.keys[last]).length() < 1e-9);
                    let missed = (tangents[0][1] - tangents[last][0]).length();
                    assert!(missed < 1e-9, "{missed}");
                }
            }
        }
    }

    #[test]
    fn told_by_the_ends_a_loop_is_closed_as_round_after_round() {
        for (wide_deg, form) in [(4.0, LoopForm::Spread), (50.0, LoopForm::Window)] {
            for is_first_again in [false, true] {
                let how = LoopClose { form, round: Round { first: 0, is_first_again }, with_rate: true };
                let clip = clip(400, wide_deg);
                let [rounds, at_once] = closed_both_ways(&clip, how);
                let [old, new, was] = [&rounds, &at_once, &clip].map(|clip| clip.rotation(1).unwrap());
                let mut untouched = 0;
                for key in 0..400 {
                    let apart = old.keys[key].turn_to(new.keys[key]);
                    assert!(apart < 1e-14, "{form:?}, key {key}: {apart}");
                    let [a, b] = [old, new].map(|track| track.file_angles().unwrap().degrees[key]);
                    assert!(
                        a.iter().zip(b).all(|(a, b)| (a - b).abs() < 1e-11),
                        "{form:?}, key {key}: {a:?} {b:?}"
                    );
                    untouched += usize::from(new.keys[key] == was.keys[key]);
                }
                assert!(untouched > 100 || form == LoopForm::Spread, "{form:?}: {untouched} untouched");
            }
        }
    }
}
