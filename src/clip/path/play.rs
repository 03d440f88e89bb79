//! Playing a track: orientation, rate and acceleration at any time.

use std::f64::consts::TAU;

use crate::rotor::{
    Bivector, EndRate, EndRates, Motion, Rotor, parabola_rate, slerp, slerp_motion, squad, squad_motion,
};

use super::super::rotation_track::RotationTrack;
use super::super::times::Place;
use super::kind::PathKind;

impl RotationTrack {
    /// The orientation at `time_secs` as the file's own format plays it, or as the path, spacing and meant turns of its
    /// segments say; unit. Before the first key and after the last that end is held. A key that is not finite is stepped over:
    /// its sound neighbour is held. No turn without keys.
    pub fn at(&self, time_secs: f64) -> Rotor {
        self.at_by(time_secs, None)
    }

    /// As [`RotationTrack::at`], with `path` in place of the track's own path kinds where it is given.
    pub fn at_by(&self, time_secs: f64, path: Option<PathKind>) -> Rotor {
        match self.times.place(time_secs) {
            None => Rotor::IDENTITY,
            Some(Place::At(key)) => self.at_key(key, path),
            Some(Place::Between(key, share)) => {
                let share = self.segments.of(key).spacing.pace(share).share;
                self.between(key, share, path)
            }
        }
    }

    /// The orientation at `time_secs`, the body rate in radians per second and its change in radians per second squared. Exact
    /// derivatives of what [`RotationTrack::at`] gives, by the chain rule through spacing too.
    ///
    /// At a key the segment that starts there speaks, at the last key the one that ends; before the first and after the last
    /// key nothing moves.
    ///
    /// ```
    /// use turnwright::clip::{MeantTurn, PathKind, RotationTrack, Spacing, Times};
    /// use turnwright::rotor::{Bivector, Rotor};
    ///
    /// // A wheel: a quarter turn from x to y in two seconds, and three whole turns besides.
    /// let quarter = Rotor::from_plane_angles(Bivector::from_degrees([0.0, 0.0, 90.0]));
    /// let wheel = RotationTrack::from_rotors(Times::Listed([0.0, 2.0].into()), [Rotor::IDENTITY, quarter]);
    /// let wheel = wheel.with_turn(0, MeantTurn::new(3)?)?;
    /// assert!((wheel.motion_at(1.0).rate.to_degrees()[2] - 585.0).abs() < 1e-9);
    ///
    /// // Spacing changes how fast and never which way: a standing start, and twice the rate at the end.
    /// let eased = wheel.with_spacing(0..1, Spacing::EaseIn)?;
    /// assert_eq!(eased.motion_at(0.0).rate, Bivector::ZERO);
    /// assert!((eased.highest_rate(0).rate_rad.to_degrees() - 1170.0).abs() < 1e-9);
    /// assert!(eased.at(1.0).turn_to(wheel.at(0.5)) < 1e-12);
    /// # Ok::<(), turnwright::clip::PathError>(())
    /// ```
    pub fn motion_at(&self, time_secs: f64) -> Motion {
        self.motion_at_by(time_secs, None)
    }

    /// As [`RotationTrack::motion_at`], with `path` in place of the track's own path kinds where it is given.
    pub fn motion_at_by(&self, time_secs: f64, path: Option<PathKind>) -> Motion {
        let orientation = self.at_by(time_secs, path);
        let still = Motion::still(orientation);
        let (Some(last), Some((start, end))) = (self.keys.len().checked_sub(2), self.times.span()) else {
            return still;
        };
        if !(start..=end).contains(&time_secs) {
            return still;
        }
        let (key, share) = match self.times.place(time_secs) {
            None => return still,
            Some(Place::At(key)) if key > last => (last, 1.0),
            Some(Place::At(key)) => (key, 0.0),
            Some(Place::Between(key, share)) => (key, share),
        };
        Motion { orientation, ..self.segment_motion(key, share, path) }
    }

    /// Orientation, rate and acceleration by seconds inside a segment, at a share of its time from 0 to 1: at 1 they are those
    /// with which it comes in, whatever starts there.
    ///
    /// # Panics
    /// When the segment does not exist.
    pub fn segment_motion(&self, segment: usize, share: f64, path: Option<PathKind>) -> Motion {
        let pace = self.segments.of(segment).spacing.pace(share);
        let secs = self.times.at(segment + 1) - self.times.at(segment);
        let by_way = self.path_motion(segment, pace.share, path);
        by_way.paced(pace.first / secs, pace.second / (secs * secs))
    }

    /// The path alone, without its spacing: by the share of the way.
    pub(super) fn path_motion(&self, key: usize, share: f64, path: Option<PathKind>) -> Motion {
        let kind = self.kind_of(key, path);
        if matches!(kind, PathKind::Spline | PathKind::BSpline) {
            let (start, end) = (self.times.at(key), self.times.at(key + 1));
            let secs = end - start;
            let solved = self.solved(path);
            // At the very end the curve would tell of its next segment, which is smooth there too.
            let at = if share == 1.0 { end } else { start + secs * share };
            if let Some(motion) = solved.run(key).and_then(|run| run.motion(at)) {
                return motion.paced(secs, 0.0);
            }
        }
        self.local_motion(key, share, kind, path, |key| self.sound_key(key))
    }

    /// The paths that hang on a segment and its neighbours alone. Spline kinds play as squad.
    pub(super) fn local_motion(
        &self,
        key: usize,
        share: f64,
        kind: PathKind,
        path: Option<PathKind>,
        sound: impl Fn(usize) -> Rotor + Copy,
    ) -> Motion {
        match kind {
            PathKind::Hold => Motion::still(sound(key)),
            PathKind::Slerp if self.segments.of(key).turn.is_short() => {
                let a = sound(key);
                slerp_motion(a, sound(key + 1).aligned_to(a), share)
            }
            PathKind::Slerp => self.lead(key, sound).motion(share),
            PathKind::Cubic => self.cubic_motion(key, share).unwrap_or_else(|| Motion::still(sound(key))),
            PathKind::Squad | PathKind::Spline | PathKind::BSpline => {
                let (points, local, pieces) = self.squad_place(key, share, path, sound);
                let [a, inner_a, inner_b, b] = points;
                squad_motion(a, inner_a, inner_b, b, local).paced(pieces as f64, 0.0)
            }
        }
    }

    /// The kind that a segment plays by.
    pub fn kind_of(&self, segment: usize, path: Option<PathKind>) -> PathKind {
        match path.unwrap_or_else(|| self.paths.of(segment)) {
            PathKind::Cubic if self.tangents.is_none() => PathKind::Slerp,
            kind => kind,
        }
    }

    /// A key as it is played.
    fn at_key(&self, key: usize, path: Option<PathKind>) -> Rotor {
        self.smoothed_key(key, path).unwrap_or_else(|| self.sound_key(key))
    }

    /// What is played at a key that a B-spline passes by; `None` for keys that are reached.
    pub(in super::super) fn smoothed_key(&self, key: usize, path: Option<PathKind>) -> Option<Rotor> {
        let is_smoothed = |segment: &usize| {
            *segment < self.segment_count() && self.kind_of(*segment, path) == PathKind::BSpline
        };
        let segment = [Some(key), key.checked_sub(1)].into_iter().flatten().find(is_smoothed)?;
        self.solved(path).run(segment)?.at(self.times.at(key))
    }

    /// At a share of the way from one key to the next.
    fn between(&self, key: usize, share: f64, path: Option<PathKind>) -> Rotor {
        let sound = |key: usize| self.sound_key(key);
        match self.kind_of(key, path) {
            PathKind::Hold => sound(key),
            PathKind::Slerp if self.segments.of(key).turn.is_short() => {
                slerp(sound(key), sound(key + 1), share).normalize()
            }
            PathKind::Slerp => self.lead(key, sound).at(share),
            PathKind::Squad => self.squad_at(key, share, path, sound),
            PathKind::Cubic => self.cubic_at(key, share).unwrap_or_else(|| sound(key)),
            PathKind::Spline | PathKind::BSpline => {
                let (start, end) = (self.times.at(key), self.times.at(key + 1));
                let solved = self.solved(path);
                let found = solved.run(key).and_then(|run| run.at(start + (end - start) * share));
                found.unwrap_or_else(|| self.squad_at(key, share, path, sound))
            }
        }
    }

    pub(in super::super) fn squad_at(
        &self,
        key: usize,
        share: f64,
        path: Option<PathKind>,
        sound: impl Fn(usize) -> Rotor + Copy,
    ) -> Rotor {
        let ([a, inner_a, inner_b, b], local, _) = self.squad_place(key, share, path, sound);
        squad(a, inner_a, inner_b, b, local).normalize()
    }

    /// glTF 2.0, appendix C.5: no sign is changed before the four numbers are made unit. `None` where they have no length.
    pub(in super::super) fn cubic_at(&self, key: usize, share: f64) -> Option<Rotor> {
        self.cubic_numbers(key, share)[0].try_normalize()
    }

    fn cubic_motion(&self, key: usize, share: f64) -> Option<Motion> {
        let [value, first, second] = self.cubic_numbers(key, share);
        Motion::of_four_numbers(value, first, second)
    }

    /// The cubic's four numbers, not yet unit, with their first and second derivative by the share. Zero without tangents.
    fn cubic_numbers(&self, key: usize, t: f64) -> [Rotor; 3] {
        const ZERO: Rotor = Rotor::new(0.0, 0.0, 0.0, 0.0);
        let Some(tangents) = &self.tangents else { return [ZERO; 3] };
        let secs = self.times.at(key + 1) - self.times.at(key);
        let parts = [self.keys[key], tangents[key][1], self.keys[key + 1], tangents[key + 1][0]];
        let (t2, t3) = (t * t, t * t * t);
        let weights = [
            [2.0 * t3 - 3.0 * t2 + 1.0, secs * (t3 - 2.0 * t2 + t), 3.0 * t2 - 2.0 * t3, secs * (t3 - t2)],
            [
                6.0 * t2 - 6.0 * t,
                secs * (3.0 * t2 - 4.0 * t + 1.0),
                6.0 * t - 6.0 * t2,
                secs * (3.0 * t2 - 2.0 * t),
            ],
            [12.0 * t - 6.0, secs * (6.0 * t - 4.0), 6.0 - 12.0 * t, secs * (6.0 * t - 2.0)],
        ];
        weights.map(|weights| {
            parts.into_iter().zip(weights).fold(ZERO, |sum, (rotor, weight)| {
                Rotor::new(
                    sum.s + rotor.s * weight,
                    sum.yz + rotor.yz * weight,
                    sum.zx + rotor.zx * weight,
                    sum.xy + rotor.xy * weight,
                )
            })
        })
    }

    /// The cubic's unit value at a share of a segment, and its rate per second in the four numbers, both by the same
    /// factor: with them as a key the two halves run as the whole did, but for the length of the four numbers.
    pub(in super::super) fn cubic_cut(&self, key: usize, t: f64) -> (Rotor, Rotor) {
        let secs = self.times.at(key + 1) - self.times.at(key);
        let [value, first, _] = self.cubic_numbers(key, t);
        let factor = 1.0 / value.norm();
        (value.scale(factor), first.scale(factor / secs))
    }

    /// The four points of squad around a share of the way, the share between the two of them, and into how many pieces the segment
    /// is led.
    pub(in super::super) fn squad_place(
        &self,
        key: usize,
        share: f64,
        path: Option<PathKind>,
        sound: impl Fn(usize) -> Rotor + Copy,
    ) -> ([Rotor; 4], f64, usize) {
        let pieces = self.lead(key, sound).pieces;
        let (piece, local) = piece_of(share, pieces);
        (self.squad_points(key, piece, path, sound), local, pieces)
    }

    /// The four points of squad between two keys, or in one piece of the way between them, with inner points from their four
    /// neighbours. At the track's ends and beside a held segment the key is its own inner point, unless the track's ends say
    /// otherwise.
    pub(in super::super) fn squad_points(
        &self,
        key: usize,
        piece: usize,
        path: Option<PathKind>,
        sound: impl Fn(usize) -> Rotor + Copy,
    ) -> [Rotor; 4] {
        let lead = self.lead(key, sound);
        let secs = (self.times.at(key + 1) - self.times.at(key)) / lead.pieces as f64;
        let a = lead.point(piece);
        let b = lead.point(piece + 1).aligned_to(a);
        let step = (a.reverse() * b).plane_angles_as_signed();
        let before = if piece > 0 {
            Neighbour::Step { pose: lead.point(piece - 1).aligned_to(a), secs, is_last: false }
        } else {
            self.before(key, a, path, sound)
        };
        let after = if piece + 1 < lead.pieces {
            Neighbour::Step { pose: lead.point(piece + 2).aligned_to(b), secs, is_last: false }
        } else {
            self.after(key, b, path, sound)
        };
        let is_free = [&before, &after].map(|side| matches!(side, Neighbour::None));
        // Half the difference of the wanted slope and that of slerp (Shoemake 1987, solved for the inner points).
        let inner_a = match before {
            Neighbour::None => a,
            Neighbour::Rate(rate) => a * Rotor::from_plane_angles((rate * secs - step) * 0.5),
            Neighbour::Step { pose, secs: before_secs, is_last } => {
                let rate = rate_at_key([pose, a, b], [before_secs, secs], [is_last, is_free[1]]);
                a * Rotor::from_plane_angles((rate * secs - step) * 0.5)
            }
        };
        let inner_b = match after {
            Neighbour::None => b,
            Neighbour::Rate(rate) => b * Rotor::from_plane_angles((step - rate * secs) * 0.5),
            Neighbour::Step { pose, secs: after_secs, is_last } => {
                let rate = rate_at_key([a, b, pose], [secs, after_secs], [is_free[0], is_last]);
                b * Rotor::from_plane_angles((step - rate * secs) * 0.5)
            }
        };
        [a, inner_a, inner_b, b]
    }

    /// What lies before the first key of a segment; `a` is that key.
    fn before(
        &self,
        key: usize,
        a: Rotor,
        path: Option<PathKind>,
        sound: impl Fn(usize) -> Rotor + Copy,
    ) -> Neighbour {
        let (segment, is_seam) = match key.checked_sub(1) {
            Some(before) => (before, false),
            None => match self.segments.ends() {
                EndRates::Loop => (self.keys.len() - 2, true),
                ends => return Neighbour::end(ends.sides().map(|sides| sides[0])),
            },
        };
        if self.kind_of(segment, path) == PathKind::Hold {
            return Neighbour::None;
        }
        let lead = self.lead(segment, sound);
        let secs = (self.times.at(segment + 1) - self.times.at(segment)) / lead.pieces as f64;
        let before = lead.point(lead.pieces - 1);
        // Across the seam the step counts, as the last key stands for the first.
        let before = if is_seam { a * (lead.point(lead.pieces).reverse() * before) } else { before };
        let is_last = lead.pieces == 1
            && match segment.checked_sub(1) {
                Some(other) => self.kind_of(other, path) == PathKind::Hold,
                None => self.is_free(0),
            };
        Neighbour::Step { pose: before.aligned_to(a), secs, is_last }
    }

    /// What lies behind the second key of a segment; `b` is that key.
    fn after(
        &self,
        key: usize,
        b: Rotor,
        path: Option<PathKind>,
        sound: impl Fn(usize) -> Rotor + Copy,
    ) -> Neighbour {
        let is_seam = key + 2 == self.keys.len();
        let segment = if is_seam {
            match self.segments.ends() {
                EndRates::Loop => 0,
                ends => return Neighbour::end(ends.sides().map(|sides| sides[1])),
            }
        } else {
            key + 1
        };
        if self.kind_of(segment, path) == PathKind::Hold {
            return Neighbour::None;
        }
        let lead = self.lead(segment, sound);
        let secs = (self.times.at(segment + 1) - self.times.at(segment)) / lead.pieces as f64;
        let after = lead.point(1);
        let after = if is_seam { b * (lead.point(0).reverse() * after) } else { after };
        let is_last = lead.pieces == 1
            && if segment + 1 < self.segment_count() {
                self.kind_of(segment + 1, path) == PathKind::Hold
            } else {
                self.is_free(1)
            };
        Neighbour::Step { pose: after.aligned_to(b), secs, is_last }
    }
}

impl RotationTrack {
    /// Whether squad follows no rate at the track's start, 0, or end, 1.
    fn is_free(&self, side: usize) -> bool {
        self.segments.ends().sides().is_some_and(|sides| !matches!(sides[side], EndRate::Given(_)))
    }
}

/// What lies beyond a key.
enum Neighbour {
    /// Nothing: no acceleration there.
    None,
    /// A rate that is given.
    Rate(Bivector),
    /// The next point, the seconds to it, and whether the curve follows no rate there.
    Step { pose: Rotor, secs: f64, is_last: bool },
}

impl Neighbour {
    fn end(side: Option<EndRate>) -> Self {
        match side {
            Some(EndRate::Given(rate)) => Self::Rate(rate),
            Some(EndRate::Secant | EndRate::Natural) | None => Self::None,
        }
    }
}

/// Which piece of several a share falls in, and the share of that piece.
pub(in super::super) fn piece_of(share: f64, pieces: usize) -> (usize, f64) {
    if pieces == 1 {
        return (0, share);
    }
    let along = share * pieces as f64;
    let piece = (along as usize).min(pieces - 1);
    (piece, along - piece as f64)
}

/// The parabola's rate at the middle one of three aligned keys, made smaller where squad could not carry it: with the pull
/// of both inner points beside the step itself it must stay below a whole turn, or the points are taken for others. Only
/// where a long segment follows a short and fast one does that happen. `is_alone`: whether the other end of the segment before,
/// and of the one after, pulls at nothing.
fn rate_at_key([before, key, after]: [Rotor; 3], secs: [f64; 2], is_alone: [bool; 2]) -> Bivector {
    /// A little below the whole turn.
    const MARGIN: f64 = 0.95;
    let rate = parabola_rate(before, key, after, secs[0], secs[1]);
    let steps = [(before.reverse() * key), (key.reverse() * after)].map(Rotor::plane_angles_as_signed);
    let sides = steps.into_iter().zip(secs).zip(is_alone);
    let share = sides.fold(1.0_f64, |share, ((step, secs), is_alone)| {
        // |share · rate · secs − step| ≤ most, where twice the pull stands on the left.
        let most = MARGIN * (TAU - step.length()) * if is_alone { 2.0 } else { 1.0 };
        let (a, b, c) = (rate.dot(rate) * secs * secs, rate.dot(step) * secs, step.dot(step) - most * most);
        if a == 0.0 {
            return share;
        }
        let root = (b * b - a * c).max(0.0).sqrt();
        share.min(((b + root) / a).max(0.0))
    });
    rate * share
}
