//! Tracks that no interpolation of glTF says by itself, as keys of one that follow them.

use std::borrow::Cow;

use crate::clip::{PathKind, Paths, RotationTrack, Segment, Segments, Stored, Times};
use crate::rotor::{Bivector, Rotor, slerp};

/// How far what a file plays may be from the track: 0.01 degrees.
pub(super) const TOLERANCE_RAD: f64 = 1.745_329_251_994_33e-4;

/// A stretch between keys is halved at most this often, and as much more as its meant turns need.
const MOST_HALVINGS: u32 = 8;

/// Shares of a stretch where the difference is measured. A Hermite cubic with right ends strays most around a quarter and
/// three quarters, or in the middle.
const MEASURED_AT: [f64; 7] = [0.1, 0.23, 0.36, 0.5, 0.64, 0.77, 0.9];

/// A track that one interpolation says all of.
pub(super) struct Followed<'a> {
    pub(super) track: Cow<'a, RotationTrack>,
    /// The largest difference that was measured, in radians; 0 where it is the track itself.
    pub(super) off_rad: f64,
}

/// The track itself where one interpolation says all of it. Else, for smooth paths and spacings, a cubic whose keys have
/// the track's own values and rates and that is measured as the standard plays it from 32 bits, with keys put in until it is
/// within [`TOLERANCE_RAD`]; or short arcs, for slerp with meant turns, and where they need hardly more keys: a track with a
/// key for each frame stays one.
pub(super) fn playable(track: &RotationTrack) -> Followed<'_> {
    if says_all(track) {
        return Followed { track: Cow::Borrowed(track), off_rad: 0.0 };
    }
    let straight = Straight::follow(track);
    let is_smooth = |segment: usize| match track.kind_of(segment, None) {
        PathKind::Hold => false,
        PathKind::Slerp => !track.segments.of(segment).spacing.is_even(),
        PathKind::Squad | PathKind::Cubic | PathKind::Spline | PathKind::BSpline => true,
    };
    if (0..track.segment_count()).any(is_smooth) {
        let smooth = Smooth::follow(track);
        // Where arcs need hardly more keys than a cubic, the track was sampled, and is again.
        if 4 * straight.keys.len() > 5 * smooth.knots.len() || straight.off_rad > TOLERANCE_RAD {
            return smooth.finish();
        }
    }
    straight.finish()
}

fn says_all(track: &RotationTrack) -> bool {
    let mut kinds = (0..track.segment_count()).map(|segment| track.kind_of(segment, None));
    let Some(first) = kinds.next() else { return true };
    kinds.all(|kind| kind == first)
        && match first {
            PathKind::Hold => true,
            PathKind::Slerp => track.segments.are_plain(),
            PathKind::Cubic => (0..track.segment_count()).all(|own| track.segments.of(own).spacing.is_even()),
            PathKind::Squad | PathKind::Spline | PathKind::BSpline => false,
        }
}

/// A stretch of a segment, and how to cut it.
#[derive(Clone, Copy)]
struct Stretch<'a> {
    track: &'a RotationTrack,
    segment: usize,
    ends: [f64; 2],
    halvings: u32,
}

impl<'a> Stretch<'a> {
    fn whole(track: &'a RotationTrack, segment: usize) -> Self {
        let pieces = track.pieces(segment);
        let halvings = MOST_HALVINGS + pieces.next_power_of_two().ilog2();
        Self { track, segment, ends: [track.times.at(segment), track.times.at(segment + 1)], halvings }
    }

    /// Its two halves, where it may be cut at a time that 32 bits can hold.
    fn halves(self) -> Option<[Self; 2]> {
        let middle = f64::from(f64::midpoint(self.ends[0], self.ends[1]) as f32);
        let is_inside = self.ends[0] < middle && middle < self.ends[1];
        if self.halvings == 0 || !is_inside {
            return None;
        }
        let half = |ends| Self { ends, halvings: self.halvings - 1, ..self };
        Some([half([self.ends[0], middle]), half([middle, self.ends[1]])])
    }

    fn secs(&self, share: f64) -> f64 {
        self.ends[0] + (self.ends[1] - self.ends[0]) * share
    }

    /// Whether it goes at most 120° round, so that the short way between its ends is its own.
    fn is_short(&self) -> bool {
        let track = self.track;
        let (start, end) = (track.times.at(self.segment), track.times.at(self.segment + 1));
        let spacing = track.segments.of(self.segment).spacing;
        let way = self.ends.map(|secs| spacing.pace((secs - start) / (end - start)).share);
        (way[1] - way[0]) * track.pieces(self.segment) as f64 <= 1.0 + 1e-9
    }

    /// The rates per second at its two ends, from inside.
    fn rates(&self) -> [Bivector; 2] {
        let track = self.track;
        let (start, end) = (track.times.at(self.segment), track.times.at(self.segment + 1));
        self.ends.map(|secs| track.segment_motion(self.segment, (secs - start) / (end - start), None).rate)
    }
}

/// The last time before `secs` that 32 bits can tell from it.
fn just_before(secs: f64) -> f64 {
    f64::from((secs as f32).next_down())
}

/// Short arcs.
struct Straight {
    secs: Vec<f64>,
    keys: Vec<Rotor>,
    off_rad: f64,
}

impl Straight {
    fn follow(track: &RotationTrack) -> Self {
        let mut own = Self { secs: Vec::new(), keys: Vec::new(), off_rad: 0.0 };
        let n_segments = track.segment_count();
        for segment in 0..n_segments {
            let (start, end) = (track.times.at(segment), track.times.at(segment + 1));
            let key = own_key(track, segment);
            own.push(start, key);
            match track.kind_of(segment, None) {
                PathKind::Hold if just_before(end) > start => own.push(just_before(end), key),
                PathKind::Hold => {}
                PathKind::Slerp if track.segments.of(segment) == Segment::PLAIN => {}
                _ => own.cut(Stretch::whole(track, segment), [track.at(start), track.at(end)]),
            }
        }
        own.push(track.times.at(n_segments), own_key(track, n_segments));
        own
    }

    fn push(&mut self, secs: f64, key: Rotor) {
        self.secs.push(secs);
        self.keys.push(key);
    }

    /// Adds the keys that a stretch between two poses needs.
    fn cut(&mut self, stretch: Stretch<'_>, [a, b]: [Rotor; 2]) {
        let off = MEASURED_AT
            .into_iter()
            .map(|share| stretch.track.at(stretch.secs(share)).turn_to(slerp(a, b, share)))
            .fold(0.0, f64::max);
        let is_near = off <= TOLERANCE_RAD && stretch.is_short();
        match stretch.halves() {
            Some([first, second]) if !is_near => {
                let secs = first.ends[1];
                let pose = stretch.track.at(secs);
                self.cut(first, [a, pose]);
                self.push(secs, pose);
                self.cut(second, [pose, b]);
            }
            _ => self.off_rad = self.off_rad.max(off),
        }
    }

    fn finish<'a>(self) -> Followed<'a> {
        let track = RotationTrack::from_rotors(Times::Listed(self.secs.into()), self.keys);
        Followed { track: Cow::Owned(track), off_rad: self.off_rad }
    }
}

/// A key's own numbers, but where a B-spline passes it by.
fn own_key(track: &RotationTrack, key: usize) -> Rotor {
    let sound = track.sound_key(key);
    let played = track.at(track.times.at(key));
    if played == sound { track.keys.rotor(key) } else { played }
}

/// A cubic's key, rounded to 32 bits as it is written.
struct Knot {
    secs: f64,
    pose: Rotor,
    tangents: [Rotor; 2],
}

/// A cubic with tangents.
struct Smooth {
    knots: Vec<Knot>,
    off_rad: f64,
}

const ZERO: Rotor = Rotor::new(0.0, 0.0, 0.0, 0.0);

impl Smooth {
    fn follow(track: &RotationTrack) -> Self {
        let mut own = Self { knots: Vec::new(), off_rad: 0.0 };
        let n_segments = track.segment_count();
        own.push(track.times.at(0), track.at(track.times.at(0)), ZERO);
        for segment in 0..n_segments {
            let (start, end) = (track.times.at(segment), track.times.at(segment + 1));
            let next = track.at(end);
            if track.kind_of(segment, None) == PathKind::Hold {
                if just_before(end) > start {
                    own.push(just_before(end), track.at(start), ZERO);
                }
                own.push(end, next, ZERO);
            } else {
                let stretch = Stretch::whole(track, segment);
                own.cut(stretch, next, stretch.rates());
            }
        }
        own
    }

    /// A key with the sign of the one before, whose tangent on the way in is given.
    fn push(&mut self, secs: f64, pose: Rotor, tangent_in: Rotor) {
        let pose = self.knots.last().map_or(pose, |before| pose.aligned_to(before.pose));
        self.knots.push(Knot { secs, pose: rounded(pose), tangents: [rounded(tangent_in), ZERO] });
    }

    /// Adds the keys from the last one on to the end of a stretch, where `pose` is reached; `rates` are those at both ends.
    fn cut(&mut self, stretch: Stretch<'_>, pose: Rotor, rates: [Bivector; 2]) {
        let Some(last) = self.knots.last() else { return };
        let start = Knot {
            secs: last.secs,
            pose: last.pose,
            tangents: [ZERO, rounded(tangent(last.pose, rates[0]))],
        };
        let aligned = rounded(pose.aligned_to(last.pose));
        let end = Knot {
            secs: stretch.ends[1],
            pose: aligned,
            tangents: [rounded(tangent(aligned, rates[1])), ZERO],
        };
        let off = MEASURED_AT
            .into_iter()
            .map(|share| stretch.track.at(stretch.secs(share)).turn_to(between(&start, &end, share)))
            .fold(0.0, f64::max);
        // A little is left for the rounding of times.
        let is_near = off <= 0.9 * TOLERANCE_RAD && stretch.is_short();
        match stretch.halves() {
            Some([first, second]) if !is_near => {
                let middle = stretch.track.at(first.ends[1]);
                self.cut(first, middle, first.rates());
                self.cut(second, pose, second.rates());
            }
            _ => {
                self.off_rad = self.off_rad.max(off);
                if let Some(last) = self.knots.last_mut() {
                    last.tangents[1] = start.tangents[1];
                }
                self.knots.push(end);
            }
        }
    }

    fn finish<'a>(self) -> Followed<'a> {
        let track = RotationTrack {
            times: Times::Listed(self.knots.iter().map(|knot| knot.secs).collect()),
            keys: self.knots.iter().map(|knot| knot.pose).collect(),
            paths: Paths::Every(PathKind::Cubic),
            tangents: Some(self.knots.iter().map(|knot| knot.tangents).collect()),
            segments: Segments::default(),
            stored: Stored::Rotors,
        };
        Followed { track: Cow::Owned(track), off_rad: self.off_rad }
    }
}

/// The slope of the four numbers at a body rate: `dR/dt = −½ R rate`.
fn tangent(pose: Rotor, rate: Bivector) -> Rotor {
    pose * Rotor::from_parts(0.0, rate * -0.5)
}

/// As the numbers come back from the file.
fn rounded(rotor: Rotor) -> Rotor {
    let part = |number: f64| f64::from(number as f32);
    Rotor::new(part(rotor.s), part(rotor.yz), part(rotor.zx), part(rotor.xy))
}

/// Appendix C.5 of the standard, made unit.
fn between(start: &Knot, end: &Knot, t: f64) -> Rotor {
    let secs = end.secs - start.secs;
    let (t2, t3) = (t * t, t * t * t);
    let weighted = [
        (start.pose, 2.0 * t3 - 3.0 * t2 + 1.0),
        (start.tangents[1], secs * (t3 - 2.0 * t2 + t)),
        (end.pose, 3.0 * t2 - 2.0 * t3),
        (end.tangents[0], secs * (t3 - t2)),
    ];
    let sum = weighted.into_iter().fold(ZERO, |sum, (rotor, weight)| {
        Rotor::new(
            sum.s + rotor.s * weight,
            sum.yz + rotor.yz * weight,
            sum.zx + rotor.zx * weight,
            sum.xy + rotor.xy * weight,
        )
    });
    sum.normalize()
}
