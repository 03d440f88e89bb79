//! Tracks with other paths, spacings and turns, and with more or fewer keys.

use std::f64::consts::TAU;
use std::ops::Range;

use crate::rotor::{Bivector, EndRates, Rotor, parabola_rate};

use super::super::rotation_track::{FileAngles, RotationTrack, Stored};
use super::super::times::{Place, Times};
use super::kind::{PathKind, Paths};
use super::segments::{MeantTurn, Segment, Segments};
use super::spacing::Spacing;

/// What can't be done to a path.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum PathError {
    /// The track has fewer segments.
    #[error("expected segments below {count}, found {found}")]
    NoSuchSegment {
        /// Number of the segment, or of the one behind a range.
        found: usize,
        /// How many there are.
        count: usize,
    },
    /// The track has fewer keys, or would have none.
    #[error("expected keys below {count}, and one to be left, found {found}")]
    NoSuchKey {
        /// Number of the key.
        found: usize,
        /// How many there are.
        count: usize,
    },
    /// Whole turns cost keys when they are exported.
    #[error("expected at most {most} whole turns, found {found}")]
    TooManyTurns {
        /// Whole turns asked for.
        found: i64,
        /// Whole turns allowed.
        most: i64,
    },
    /// A plane to turn in needs an area.
    #[error("expected a plane to turn in, found plane angles {found:?}")]
    NoPlane {
        /// The plane as it was given, in degrees.
        found: [f64; 3],
    },
    /// The file's own numbers say how far round it turns, or nothing turns at all.
    #[error("expected a path that can go round otherwise, found {found} in segment {segment}")]
    TakesNoTurns {
        /// The segment.
        segment: usize,
        /// Its path.
        found: &'static str,
    },
    /// A new key lies between two others.
    #[error("expected a time between two keys, found {found_secs} s")]
    NoTimeBetween {
        /// The time, in seconds.
        found_secs: f64,
    },
}

impl RotationTrack {
    /// How many segments: one less than keys.
    pub fn segment_count(&self) -> usize {
        self.keys.len().saturating_sub(1)
    }

    /// Into how many steps of at most 120° the way of a segment is cut, with its meant turns; 1 for the short way.
    ///
    /// # Panics
    /// When the segment does not exist.
    pub fn pieces(&self, segment: usize) -> usize {
        let is_short =
            self.segments.of(segment).turn.is_short() || !self.kind_of(segment, None).takes_turns();
        if is_short { 1 } else { self.lead(segment, |key| self.sound_key(key)).pieces }
    }

    /// This track with another path in some segments. For [`PathKind::Cubic`] a track without tangents gets those of a
    /// smooth curve through its keys, whose signs then follow one another.
    ///
    /// # Errors
    /// For a segment that does not exist.
    pub fn with_path(&self, segments: Range<usize>, kind: PathKind) -> Result<Self, PathError> {
        self.check_segments(&segments)?;
        let mut kinds: Vec<PathKind> = (0..self.segment_count()).map(|own| self.kind_of(own, None)).collect();
        kinds[segments].fill(kind);
        let mut track = Self { paths: Paths::from_kinds(&kinds), ..self.clone() };
        if kind == PathKind::Cubic && track.tangents.is_none() {
            let keys = track.unrolled_keys();
            track.tangents = Some((0..keys.len()).map(|key| [track.smooth_tangent(&keys, key); 2]).collect());
            track.keys = keys.into();
        }
        Ok(track)
    }

    /// This track with another spacing in some segments.
    ///
    /// # Errors
    /// For a segment that does not exist.
    pub fn with_spacing(&self, segments: Range<usize>, spacing: Spacing) -> Result<Self, PathError> {
        self.with_segments(segments, |own| Segment { spacing, ..own })
    }

    /// This track with a segment that goes the other way round, or adds whole turns.
    ///
    /// # Errors
    /// For a segment that does not exist or takes no turns, and beyond [`Segments::MOST_TURNS`] in all.
    pub fn with_turn(&self, segment: usize, turn: MeantTurn) -> Result<Self, PathError> {
        self.check_segments(&(segment..segment + 1))?;
        let kind = self.kind_of(segment, None);
        if !kind.takes_turns() && !turn.is_short() {
            return Err(PathError::TakesNoTurns { segment, found: kind.name() });
        }
        self.with_segments(segment..segment + 1, |own| Segment { turn, ..own })
    }

    /// This track with other rules for what its smooth paths do at its ends.
    #[must_use]
    pub fn with_ends(&self, ends: EndRates) -> Self {
        // The turns are no more than they were.
        let segments = Segments::new(&self.listed_segments(), ends);
        Self { segments: segments.unwrap_or_default(), ..self.clone() }
    }

    /// This track with one more key at a time between two others, on its way there. The two parts keep path, spacing and turns:
    /// hold, slerp and cubic play as before, to rounding; smooth paths through the new key differ a little.
    ///
    /// # Errors
    /// Where there is a key at that time, and before the first or after the last.
    pub fn with_key_at(&self, time_secs: f64) -> Result<Self, PathError> {
        let Some(Place::Between(key, share)) = self.times.place(time_secs) else {
            return Err(PathError::NoTimeBetween { found_secs: time_secs });
        };
        let is_cubic = self.kind_of(key, None) == PathKind::Cubic;
        let (rotor, tangent) = if is_cubic {
            self.cubic_cut(key, self.segments.of(key).spacing.pace(share).share)
        } else {
            let rotor = self.at(time_secs).aligned_to(self.sound_key(key));
            (rotor, rotor * Rotor::from_parts(0.0, self.motion_at(time_secs).rate * -0.5))
        };
        let mut keys = self.keys.to_vec();
        keys.insert(key + 1, rotor);
        let mut secs: Vec<f64> = self.times.iter().collect();
        secs.insert(key + 1, time_secs);
        let mut kinds: Vec<PathKind> = (0..self.segment_count()).map(|own| self.paths.of(own)).collect();
        kinds.insert(key + 1, kinds[key]);
        let tangents = self.tangents.as_ref().map(|tangents| {
            let mut tangents = tangents.to_vec();
            tangents.insert(key + 1, [tangent; 2]);
            tangents
        });
        let mut each = self.listed_segments();
        let own = each[key];
        let [first, second] = own.spacing.split(share);
        let turns = self.parts_of_turn(key, time_secs, rotor);
        each[key] = Segment { spacing: first, turn: turns[0] };
        each.insert(key + 1, Segment { spacing: second, turn: turns[1] });
        let stored = self.stored.with_inserted(key + 1, rotor);
        Ok(Self {
            times: Times::Listed(secs.into()),
            keys: keys.into(),
            paths: Paths::from_kinds(&kinds),
            tangents: tangents.map(Into::into),
            segments: Segments::new(&each, self.segments.ends())?,
            stored,
        })
    }

    /// This track without some keys. A segment that grows so keeps the path of its first part and, where that is the only part
    /// that is left whole, its spacing; where one of its parts had meant turns it goes as far round as they did together.
    ///
    /// # Errors
    /// For a key that does not exist, and when none would be left.
    pub fn without_keys(&self, gone: &[usize]) -> Result<Self, PathError> {
        let count = self.keys.len();
        if let Some(&found) = gone.iter().find(|&&key| key >= count) {
            return Err(PathError::NoSuchKey { found, count });
        }
        let left: Vec<usize> = (0..count).filter(|key| !gone.contains(key)).collect();
        if left.is_empty() {
            return Err(PathError::NoSuchKey { found: count, count: 0 });
        }
        let mut kinds = Vec::new();
        let mut each = Vec::new();
        for pair in left.windows(2) {
            kinds.push(self.paths.of(pair[0]));
            let parts = pair[0]..pair[1];
            if parts.len() == 1 {
                each.push(self.segments.of(pair[0]));
                continue;
            }
            let has_turns = parts.clone().any(|part| !self.segments.of(part).turn.is_short());
            let turn = if has_turns {
                let travel =
                    parts.map(|part| self.travel_of_segment(part)).fold(Bivector::ZERO, |sum, own| sum + own);
                turn_of_travel(travel, self.sound_key(pair[0]), self.sound_key(pair[1]))
            } else {
                MeantTurn::SHORT
            };
            each.push(Segment { turn, ..Segment::PLAIN });
        }
        Ok(Self {
            times: Times::Listed(left.iter().map(|&key| self.times.at(key)).collect()),
            keys: left.iter().map(|&key| self.keys[key]).collect(),
            paths: Paths::from_kinds(&kinds),
            tangents: self.tangents.as_ref().map(|all| left.iter().map(|&key| all[key]).collect()),
            segments: Segments::new(&each, self.segments.ends())?,
            stored: self.stored.only(&left),
        })
    }

    fn check_segments(&self, segments: &Range<usize>) -> Result<(), PathError> {
        let count = self.segment_count();
        if segments.start >= segments.end || segments.end > count {
            return Err(PathError::NoSuchSegment { found: segments.end.saturating_sub(1), count });
        }
        Ok(())
    }

    fn with_segments(
        &self,
        segments: Range<usize>,
        change: impl Fn(Segment) -> Segment,
    ) -> Result<Self, PathError> {
        self.check_segments(&segments)?;
        let mut each = self.listed_segments();
        for own in &mut each[segments] {
            *own = change(*own);
        }
        Ok(Self { segments: Segments::new(&each, self.segments.ends())?, ..self.clone() })
    }

    pub(in super::super) fn listed_segments(&self) -> Vec<Segment> {
        (0..self.segment_count()).map(|own| self.segments.of(own)).collect()
    }

    /// [`RotationTrack::sound_key`] of every key.
    pub(super) fn sound_keys(&self) -> Vec<Rotor> {
        let sound = self.keys.sound();
        (0..sound.len())
            .map(|key| {
                let [s, yz, zx, xy] = sound.get(key);
                Rotor::new(s, yz, zx, xy)
            })
            .collect()
    }

    /// The keys with signs that follow one another.
    fn unrolled_keys(&self) -> Vec<Rotor> {
        let mut last = Rotor::IDENTITY;
        let follow = |(number, key): (usize, Rotor)| {
            last = if number == 0 { key } else { key.aligned_to(last) };
            last
        };
        self.sound_keys().into_iter().enumerate().map(follow).collect()
    }

    /// Slope of the four numbers at a key: that of the parabola through it and its neighbours, at the ends the mean one.
    fn smooth_tangent(&self, keys: &[Rotor], key: usize) -> Rotor {
        let last = keys.len() - 1;
        let secs = |from: usize| self.times.at(from + 1) - self.times.at(from);
        let mean = |from: usize| (keys[from].reverse() * keys[from + 1]).plane_angles() / secs(from);
        let rate = match key {
            _ if last == 0 => Bivector::ZERO,
            0 => mean(0),
            key if key == last => mean(last - 1),
            key => parabola_rate(keys[key - 1], keys[key], keys[key + 1], secs(key - 1), secs(key)),
        };
        keys[key] * Rotor::from_parts(0.0, rate * -0.5)
    }

    /// How a segment's turn is shared by its two parts, cut at a time where it stands at `rotor`.
    fn parts_of_turn(&self, key: usize, time_secs: f64, rotor: Rotor) -> [MeantTurn; 2] {
        if self.segments.of(key).turn.is_short() {
            return [MeantTurn::SHORT; 2];
        }
        let (start, end) = (self.times.at(key), self.times.at(key + 1));
        [
            turn_of_travel(self.travel(start, time_secs), self.sound_key(key), rotor),
            turn_of_travel(self.travel(time_secs, end), rotor, self.sound_key(key + 1)),
        ]
    }

    fn travel_of_segment(&self, segment: usize) -> Bivector {
        self.travel(self.times.at(segment), self.times.at(segment + 1))
    }

    /// How far round the track turns from one time to another: the sum of small turns on the way, as plane angles of the joint's
    /// own frame. For turns about one plane that is the whole angle, any number of turns.
    pub(in super::super) fn travel(&self, from_secs: f64, to_secs: f64) -> Bivector {
        let mut travel = Bivector::ZERO;
        let mut secs = from_secs;
        let mut pose = self.at(secs);
        while secs < to_secs {
            let (key, _) = match self.times.place(secs) {
                Some(Place::At(key)) => (key, 0.0),
                Some(Place::Between(key, share)) => (key, share),
                None => break,
            };
            if key + 1 >= self.keys.len() {
                break;
            }
            let (start, end) = (self.times.at(key), self.times.at(key + 1));
            // Steps of at most a sixth of a turn along an even way, and finer where it is not even.
            let pieces = 4 * self.lead(key, |key| self.sound_key(key)).pieces;
            let steepest = self.segments.of(key).spacing.steepest().0.clamp(1.0, 16.0).ceil();
            let piece_secs = (end - start) / (pieces as f64 * steepest);
            let number = ((secs - start) / piece_secs + 1e-6).floor() + 1.0;
            let grid = start + number * piece_secs;
            let next = if grid >= end - 1e-6 * piece_secs { end } else { grid };
            let next = if next > secs { next.min(to_secs) } else { to_secs };
            let next_pose = self.at(next);
            travel = travel + (pose.reverse() * next_pose).plane_angles();
            (secs, pose) = (next, next_pose);
        }
        travel
    }
}

/// The meant turn of a segment from `a` to `b` that goes as far round as `travel`.
pub(in super::super) fn turn_of_travel(travel: Bivector, a: Rotor, b: Rotor) -> MeantTurn {
    let short = (a.reverse() * b).plane_angles();
    let plane = travel.normalize_or_zero();
    let whole = ((travel - short).dot(plane) / TAU).round().clamp(-1000.0, 1000.0) as i32;
    if whole == 0 {
        return MeantTurn::SHORT;
    }
    MeantTurn::in_plane(whole, plane).unwrap_or(MeantTurn::SHORT)
}

impl Stored {
    /// With one more key in the file's own form, near the key before it.
    fn with_inserted(&self, at: usize, rotor: Rotor) -> Self {
        match self {
            Self::Rotors => Self::Rotors,
            Self::Angles(angles) => {
                let mut degrees = angles.degrees.to_vec();
                let before =
                    degrees[at - 1].map(|angle| if angle.is_finite() { angle.to_radians() } else { 0.0 });
                let triple = angles.order.from_rotor(rotor.normalize(), before[2]);
                degrees.insert(at, angles.order.nearest_equal(triple, before).map(f64::to_degrees));
                Self::Angles(FileAngles { degrees: degrees.into(), ..angles.clone() })
            }
            Self::PlaneAngles(degrees) => {
                let mut degrees = degrees.to_vec();
                degrees.insert(at, rotor.plane_angles().to_degrees());
                Self::PlaneAngles(degrees.into())
            }
        }
    }

    /// Of some keys alone.
    pub(in super::super) fn only(&self, keys: &[usize]) -> Self {
        let only = |degrees: &[[f64; 3]]| keys.iter().map(|&key| degrees[key]).collect::<Vec<_>>();
        match self {
            Self::Rotors => Self::Rotors,
            Self::Angles(angles) => {
                Self::Angles(FileAngles { degrees: only(&angles.degrees).into(), ..angles.clone() })
            }
            Self::PlaneAngles(degrees) => Self::PlaneAngles(only(degrees).into()),
        }
    }
}
