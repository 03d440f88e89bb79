//! A rotation track under mending: numbers that can be changed in place, in the file's own form too.

use std::f64::consts::{PI, TAU};
use std::ops::{Deref, DerefMut, Range};
use std::sync::Arc;

use crate::clip::{
    Degrees, FileAngles, Keys, PathKind, Paths, RotationTrack, Segments, Stored, Times, continuous_angles_to,
};
use crate::rotor::{Axis, Bivector, EulerOrder, Rotor};
use crate::snag::nearest_plane_angles;

/// The file's own form of the keys, beside their rotors.
#[derive(Clone, Debug)]
pub(super) enum Form {
    Rotors,
    Angles { axes: Vec<Axis>, order: EulerOrder, degrees: Degrees },
    PlaneAngles(Arc<[[f64; 3]]>),
}

/// The rotors of a track; copied when one is changed, and not even then where nobody else holds them.
#[derive(Clone, Debug)]
pub(super) enum Rotors {
    Lent(Keys),
    Own(Vec<Rotor>),
}

impl Deref for Rotors {
    type Target = [Rotor];

    fn deref(&self) -> &[Rotor] {
        match self {
            Self::Lent(keys) => keys,
            Self::Own(keys) => keys,
        }
    }
}

impl DerefMut for Rotors {
    fn deref_mut(&mut self) -> &mut [Rotor] {
        if let Self::Lent(keys) = self {
            let keys = std::mem::replace(keys, Vec::new().into());
            *self = Self::Own(keys.into_vec());
        }
        match self {
            Self::Own(keys) => keys,
            // Just made its own.
            Self::Lent(_) => &mut [],
        }
    }
}

/// A track whose keys are being changed. Many mends share one draft, so each costs no more than its own keys.
#[derive(Clone, Debug)]
pub(super) struct Draft {
    pub(super) times: Times,
    pub(super) keys: Rotors,
    pub(super) paths: Paths,
    pub(super) tangents: Option<Vec<[Rotor; 2]>>,
    segments: Segments,
    pub(super) form: Form,
    /// Largest change of orientation at a key since the last [`Draft::take_change`], in radians.
    change_rad: f64,
    is_changed: bool,
    /// Keys whose rotor was changed, as runs in the order of their mends.
    touched: Vec<Range<usize>>,
}

impl Draft {
    pub(super) fn new(track: &RotationTrack) -> Self {
        Self::of(track.clone())
    }

    /// Of a track that is no longer needed: what nobody else holds of it is not copied.
    pub(super) fn of(track: RotationTrack) -> Self {
        let form = match track.stored {
            Stored::Rotors => Form::Rotors,
            Stored::Angles(FileAngles { axes, order, degrees }) => Form::Angles { axes, order, degrees },
            Stored::PlaneAngles(degrees) => Form::PlaneAngles(degrees),
        };
        Self {
            times: track.times,
            keys: Rotors::Lent(track.keys),
            paths: track.paths,
            tangents: track.tangents.as_ref().map(|tangents| tangents.to_vec()),
            segments: track.segments,
            form,
            change_rad: 0.0,
            is_changed: false,
            touched: Vec::new(),
        }
    }

    /// The track as it is now; `None` when nothing was changed.
    pub(super) fn finish(self) -> Option<RotationTrack> {
        self.is_changed.then(|| self.into_track().0)
    }

    /// The track as it is now, and the keys whose rotors were changed, as runs in the order of the keys.
    pub(super) fn into_track(self) -> (RotationTrack, Vec<Range<usize>>) {
        let mut touched = self.touched;
        touched.sort_by_key(|run| run.start);
        let stored = match self.form {
            Form::Rotors => Stored::Rotors,
            Form::Angles { axes, order, degrees } => Stored::Angles(FileAngles { axes, order, degrees }),
            Form::PlaneAngles(degrees) => Stored::PlaneAngles(degrees),
        };
        let keys = match self.keys {
            Rotors::Lent(keys) => keys,
            Rotors::Own(keys) => keys.into(),
        };
        let track = RotationTrack {
            times: self.times,
            keys,
            paths: self.paths,
            tangents: self.tangents.map(Into::into),
            segments: self.segments,
            stored,
        };
        (track, touched)
    }

    fn touch(&mut self, key: usize) {
        self.is_changed = true;
        match self.touched.last_mut() {
            Some(run) if run.contains(&key) => {}
            Some(run) if run.end == key => run.end = key + 1,
            _ => self.touched.push(key..key + 1),
        }
    }

    pub(super) fn is_changed(&self) -> bool {
        self.is_changed
    }

    /// Largest change of orientation at a key since this was last asked, in radians.
    pub(super) fn take_change(&mut self) -> f64 {
        std::mem::take(&mut self.change_rad)
    }

    pub(super) fn len(&self) -> usize {
        self.keys.len()
    }

    pub(super) fn secs(&self, key: usize) -> f64 {
        self.times.at(key)
    }

    pub(super) fn unit(&self, key: usize) -> Option<Rotor> {
        self.keys[key].try_normalize()
    }

    /// The nearest sound key before `key`.
    pub(super) fn sound_before(&self, key: usize) -> Option<usize> {
        (0..key).rev().find(|&key| self.unit(key).is_some())
    }

    /// The nearest sound key after `key`.
    pub(super) fn sound_after(&self, key: usize) -> Option<usize> {
        (key + 1..self.len()).find(|&key| self.unit(key).is_some())
    }

    pub(super) fn is_held_after(&self, key: usize) -> bool {
        self.paths.of(key) == PathKind::Hold
    }

    /// Other numbers for the same orientation.
    pub(super) fn set_numbers(&mut self, key: usize, rotor: Rotor, tangents: Option<[Rotor; 2]>) {
        self.keys[key] = rotor;
        if let (Some(own), Some(tangents)) = (&mut self.tangents, tangents) {
            own[key] = tangents;
        }
        self.touch(key);
    }

    /// Other angles for the same orientation; the rotor stays as it is.
    pub(super) fn set_angles(&mut self, key: usize, triple: [f64; 3]) {
        match &mut self.form {
            Form::Rotors => return,
            Form::Angles { degrees, .. } => degrees.make_mut()[key] = triple,
            Form::PlaneAngles(degrees) => Arc::make_mut(degrees)[key] = triple,
        }
        self.is_changed = true;
    }

    /// Takes a key's numbers from another track of the same form.
    pub(super) fn copy_key(&mut self, key: usize, from: &RotationTrack) {
        self.keys[key] = from.keys[key];
        match (&mut self.form, &from.stored) {
            (Form::Angles { degrees, .. }, Stored::Angles(from)) => {
                degrees.make_mut()[key] = from.degrees[key];
            }
            (Form::PlaneAngles(degrees), Stored::PlaneAngles(from)) => {
                Arc::make_mut(degrees)[key] = from[key];
            }
            _ => {}
        }
        self.touch(key);
    }

    /// Adds `step` to one of the file angles of some keys, `times` times, as if each sum were rounded.
    ///
    /// A sum of whole turns is rounded where it comes to be so large that it has a digit less, and between two such places not at all.
    /// So steps that together no more than double what is there may be made in one.
    pub(super) fn add_to_angles(&mut self, keys: Range<usize>, channel: usize, step: f64, times: u32) {
        /// Keys that are gone over together.
        const TILE: usize = 64;
        let Form::Angles { degrees, .. } = &mut self.form else { return };
        let rows = &mut degrees.make_mut()[keys];
        let largest = rows.iter().map(|row| row[channel].abs()).fold(0.0, f64::max);
        let mut strides: Vec<f64> = Vec::new();
        let mut done = 0;
        while done < times {
            // From here on the sums are at least this large.
            let least = f64::from(done) * step.abs() - largest;
            let room = (0.9 * (least - 2.0 * largest) / step.abs()).clamp(1.0, f64::from(times - done));
            strides.push(step * room.floor());
            done += room as u32;
        }
        for rows in rows.chunks_mut(TILE) {
            let mut sums = [0.0; TILE];
            for (sum, row) in sums.iter_mut().zip(&*rows) {
                *sum = row[channel];
            }
            for stride in &strides {
                for sum in &mut sums {
                    *sum += stride;
                }
            }
            for (sum, row) in sums.iter().zip(rows) {
                row[channel] = *sum;
            }
        }
        self.is_changed = true;
    }

    /// A key's three angles as the file stores them, in degrees; `None` where it stores none, or fewer.
    pub(super) fn triple(&self, key: usize) -> Option<[f64; 3]> {
        match &self.form {
            Form::Angles { axes, degrees, .. } if axes.len() == 3 => degrees.get(key).copied(),
            _ => None,
        }
    }

    /// Chooses the angles of `first..=last` anew where, near a pole, they have come to end as the mirrored triple against the key after them,
    /// or whole turns off: of the equal triples those that step least, both sides counted. `was` is the triple of `last` before it was given
    /// another pose; where that was mirrored or turns off already, it is the file's own fault and stays.
    pub(super) fn meet_after(&mut self, first: usize, last: usize, was: [f64; 3]) {
        let (Some(own), Some(after)) = (self.triple(last), self.triple(last + 1)) else { return };
        let Form::Angles { order, degrees, .. } = &mut self.form else { return };
        let order = *order;
        let [own, after, was] = [own, after, was].map(|triple| triple.map(f64::to_radians));
        let is_astray = |triple: [f64; 3]| is_mirrored(order, triple, after) || is_turns_off(triple, after);
        if !is_astray(own) || is_astray(was) {
            return;
        }
        let near = degrees[first.saturating_sub(1)].map(f64::to_radians);
        let Some(found) = angles_between(order, &self.keys[first..=last], near, after) else { return };
        for (own, triple) in degrees.make_mut()[first..=last].iter_mut().zip(found) {
            *own = triple.map(f64::to_degrees);
        }
    }

    /// Another orientation; unit. Its numbers are the nearest to those of the key before (at the start, to those of the
    /// key after). `was` is how the key is played so far.
    pub(super) fn set_pose(&mut self, key: usize, rotor: Rotor, was: Rotor) {
        let near = key.checked_sub(1).or((key + 1 < self.len()).then_some(key + 1)).unwrap_or(key);
        let mut rotor = if self.keys[near].is_finite() { rotor.aligned_to(self.keys[near]) } else { rotor };
        match &mut self.form {
            Form::Rotors => {}
            Form::Angles { axes, order, degrees } => {
                let near = finite_or_zero(degrees[near]).map(f64::to_radians);
                let mut triple = order.nearest_equal(order.from_rotor(rotor, near[2]), near);
                if axes.len() < 3 {
                    // Angles the file has no channel for stay 0, so the triple nearest to that serves.
                    let mirrored = order.nearest_equal(order.mirrored(triple), order.mirrored(near));
                    let outside = |triple: &[f64; 3]| {
                        triple[axes.len()..].iter().map(|angle| angle.sin().abs()).sum::<f64>()
                    };
                    if outside(&mirrored) + 1e-9 < outside(&triple) {
                        triple = mirrored;
                    }
                    triple[axes.len()..].fill(0.0);
                    rotor = order.to_rotor(triple).aligned_to(rotor);
                }
                degrees.make_mut()[key] = triple.map(f64::to_degrees);
            }
            Form::PlaneAngles(degrees) => {
                let near = Bivector::from_degrees(finite_or_zero(degrees[near]));
                Arc::make_mut(degrees)[key] = nearest_plane_angles(rotor.plane_angles(), near).to_degrees();
            }
        }
        self.keys[key] = rotor;
        self.change_rad = self.change_rad.max(was.turn_to(rotor));
        self.touch(key);
    }
}

/// Angles in radians for `keys` between the triples `before` and `after`, which are their own and not the mirrored ones beside both. `None`
/// where there are no such.
fn angles_between(
    order: EulerOrder,
    keys: &[Rotor],
    before: [f64; 3],
    after: [f64; 3],
) -> Option<Vec<[f64; 3]>> {
    /// A step past a pole may be taken either way round, by so much at most.
    const MOST_STEP: f64 = 1.25 * PI;
    let turns = [0.0, -TAU, TAU];
    let shifts = (0..27_usize).map(|case| [turns[case % 3], turns[case / 3 % 3], turns[case / 9]]);
    let mut found = shifts
        .map(|shift| {
            let end: [f64; 3] = std::array::from_fn(|i| after[i] + shift[i]);
            continuous_angles_to(order, keys, before, Some(end))
        })
        .find(|found| found.last().is_some_and(|last| !is_mirrored(order, *last, after)))?;
    for channel in 0..3 {
        let last = found.last()?[channel];
        let missing = TAU * ((after[channel] - last) / TAU).round();
        if missing == 0.0 {
            continue;
        }
        // The other way round where that is hardly farther.
        let step = |key: usize| {
            let before = key.checked_sub(1).map_or(before[channel], |key| found[key][channel]);
            (found[key][channel] - before + missing).abs()
        };
        let key = (0..found.len()).min_by(|a, b| step(*a).total_cmp(&step(*b)))?;
        if step(key) > MOST_STEP {
            return None;
        }
        found[key..].iter_mut().for_each(|triple| triple[channel] += missing);
    }
    Some(found)
}

/// Whether the mirrored triple of `own`, in radians, lies nearer to `near` than itself, whole turns aside; both finite.
fn is_mirrored(order: EulerOrder, own: [f64; 3], near: [f64; 3]) -> bool {
    /// As the finder of mirrored angles: what noise near a pole gains is less.
    const SWITCH_COST: f64 = (15.0 / 180.0 * PI) * (15.0 / 180.0 * PI);
    let cost = |triple: [f64; 3]| -> f64 {
        let step = |(own, near): (f64, f64)| own - near - TAU * ((own - near) / TAU).round();
        triple.into_iter().zip(near).map(|both| step(both).powi(2)).sum()
    };
    cost(order.mirrored(own)) + SWITCH_COST < cost(own)
}

/// Whether one of the angles of `own`, in radians, is nearer to that of `near` with whole turns added.
fn is_turns_off(own: [f64; 3], near: [f64; 3]) -> bool {
    own.into_iter().zip(near).any(|(own, near)| (own - near).abs() > PI)
}

fn finite_or_zero(triple: [f64; 3]) -> [f64; 3] {
    if triple.iter().all(|angle| angle.is_finite()) { triple } else { [0.0; 3] }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Angles that pass a pole, `[z, x, y]` of ZXY: the middle one comes near 90° at key 20.
    fn triples() -> Vec<[f64; 3]> {
        (0..40)
            .map(|key| {
                let t = f64::from(key - 20) / 20.0;
                [40.0 * t, 86.0 - 60.0 * t * t, 10.0 + 5.0 * t]
            })
            .collect()
    }

    fn draft(degrees: Vec<[f64; 3]>) -> Draft {
        let axes = EulerOrder::ZXY.axes().to_vec();
        let angles = FileAngles { axes, order: EulerOrder::ZXY, degrees: degrees.into() };
        let times = Times::Even { step_secs: 0.01, count: angles.degrees.len() };
        Draft::new(&RotationTrack::from_angles(times, angles))
    }

    fn largest_step(draft: &Draft, channel: usize) -> f64 {
        let triple = |key: usize| draft.triple(key).unwrap()[channel];
        (1..draft.len()).map(|key| (triple(key) - triple(key - 1)).abs()).fold(0.0, f64::max)
    }

    #[test]
    fn angles_that_have_come_to_the_other_branch_are_brought_back() {
        let truth = triples();
        let mut draft = draft(truth.clone());
        // As a chain of nearest triples may come out on the other side of the pole.
        let Form::Angles { degrees, .. } = &mut draft.form else { unreachable!() };
        for own in &mut degrees.make_mut()[20..30] {
            *own = [own[0] + 180.0, 180.0 - own[1], own[2] - 180.0];
        }
        assert!(largest_step(&draft, 0) > 170.0);
        draft.meet_after(10, 29, truth[29]);
        for (key, truth) in truth.iter().enumerate() {
            let own = draft.triple(key).unwrap();
            assert!(own.iter().zip(truth).all(|(own, truth)| (own - truth).abs() < 1e-6), "{key}: {own:?}");
        }
    }

    #[test]
    fn a_mirrored_run_of_the_file_itself_stays_for_its_finder() {
        let mut degrees = triples();
        for own in &mut degrees[30..] {
            *own = [own[0] + 180.0, 180.0 - own[1], own[2] - 180.0];
        }
        let mut draft = draft(degrees.clone());
        draft.meet_after(10, 29, degrees[29]);
        assert!((0..40).all(|key| draft.triple(key) == Some(degrees[key])));
    }
}
