//! Tracks with fewer keys.

use std::collections::BTreeSet;
use std::ops::RangeInclusive;
use std::sync::Arc;

use glam::DVec3;

use crate::rotor::{Rotor, slerp};

use super::super::path::{PathKind, Paths, Segment, Segments};
use super::super::rotation_track::{FileAngles, RotationTrack, Stored};
use super::super::times::Times;
use super::super::vector_track::{VectorPath, VectorTrack};
use super::places::PlaceRow;
use super::spans::{MOST_ENDS, Row, fewest};
use super::turns::{HeldRow, LARGEST_STEP_RAD, TurnRow};

/// Share of the bound that is set aside for drawing curved segments with slerps.
const FOR_CURVES: f64 = 0.125;
/// The most slerps that one curved segment is drawn with.
const MOST_PIECES: usize = 256;

impl RotationTrack {
    /// This track with as few keys as keep it within `bound_rad` (0 to 45°) of what it plays now, at every time between its
    /// first key and its last, and slerp between them. Both of these are kept, and the keys of `keep` (rising).
    ///
    /// Keys that are kept keep their numbers. No step is larger than 120°: where one of the track's own is, a key is put
    /// in its middle. A track that is held from key to key stays so. The track itself comes back when that would not save
    /// a key, and when it mixes held segments with others.
    ///
    /// The fewest keys are meant among those that the track has (curved segments, which are first drawn with slerps, have
    /// more to choose from). What is guaranteed for slerps is measured at four times a slerp for curved segments, with half
    /// of what is set aside for them in hand.
    ///
    /// Source: the shortest path over admissible spans of Imai & Iri 1988, "Polygonal approximations of a curve", for slerps;
    /// see also Lim & Thalmann 2001, "Key-posture extraction out of human motion data by curve simplification".
    #[must_use]
    pub fn reduced(&self, bound_rad: f64, keep: &[usize]) -> Self {
        self.reduced_within(bound_rad, keep, 0..=self.keys.len().saturating_sub(1))
    }

    /// As [`RotationTrack::reduced`], with all keys outside of `span` kept.
    ///
    /// # Panics
    /// When the span reaches behind the last key.
    #[must_use]
    pub fn reduced_within(&self, bound_rad: f64, keep: &[usize], span: RangeInclusive<usize>) -> Self {
        let (first, last) = (*span.start(), *span.end());
        if last < first + 1 {
            return self.clone();
        }
        let segments = first..last;
        let is_of = |segment: usize, kind: PathKind| self.kind_of(segment, None) == kind;
        let held = segments.clone().filter(|&segment| is_of(segment, PathKind::Hold)).count();
        // A smooth path outside would run otherwise without the keys beside it.
        let smooth = [PathKind::Squad, PathKind::Spline, PathKind::BSpline];
        let outside = (0..self.segment_count()).filter(|segment| !segments.contains(segment));
        let is_bound = outside.into_iter().any(|segment| smooth.iter().any(|&kind| is_of(segment, kind)));
        if is_bound || held > 0 && held < segments.len() {
            return self.clone();
        }
        let Some(mut drawn) = Drawn::new(self, span, bound_rad) else { return self.clone() };
        let kept_own: Vec<usize> = drawn.places_of(keep);
        let mut row: Box<dyn Row> = if held > 0 {
            Box::new(HeldRow::new(drawn.keys.clone(), bound_rad))
        } else {
            Box::new(TurnRow::new(drawn.times.clone(), drawn.keys.clone(), drawn.bound_rad))
        };
        let chosen = fewest(&mut *row, &kept_own, MOST_ENDS);
        let are_halved = drawn.keep(&chosen, held == 0);
        if drawn.times.len() > last - first && !are_halved {
            // Not one key less.
            return self.clone();
        }
        self.with_stretch(first..=last, &drawn, if held > 0 { PathKind::Hold } else { PathKind::Slerp })
    }

    /// The row that the search for fewest keys looks at, of a track that plays slerps alone; `None` for others.
    pub(super) fn slerp_row(&self, bound_rad: f64) -> Option<TurnRow> {
        let is_plain = (0..self.segment_count()).all(|segment| self.is_plain(segment));
        is_plain.then(|| TurnRow::new(self.times.iter().collect(), sound_keys(self), bound_rad))
    }

    /// Whether a segment is a slerp at even speed.
    fn is_plain(&self, segment: usize) -> bool {
        self.kind_of(segment, None) == PathKind::Slerp && self.segments.of(segment) == Segment::PLAIN
    }

    /// This track with the keys of `span` replaced by other keys, the ends among them.
    fn with_stretch(&self, span: RangeInclusive<usize>, drawn: &Drawn, path: PathKind) -> Self {
        let (first, last) = (*span.start(), *span.end());
        let mut times: Vec<f64> = (0..first).map(|key| self.times.at(key)).collect();
        let mut keys: Vec<Rotor> = self.keys[..first].to_vec();
        let mut kinds: Vec<PathKind> = (0..first).map(|segment| self.paths.of(segment)).collect();
        let mut each: Vec<Segment> = (0..first).map(|segment| self.segments.of(segment)).collect();
        let mut own: Vec<Option<usize>> = (0..first).map(Some).collect();
        times.extend(&drawn.times);
        own.extend(&drawn.own);
        keys.extend(
            drawn.keys.iter().zip(&drawn.own).map(|(&key, own)| own.map_or(key, |own| self.keys[own])),
        );
        kinds.resize(times.len() - 1, path);
        each.resize(times.len() - 1, Segment::PLAIN);
        for key in last + 1..self.keys.len() {
            kinds.push(self.paths.of(key - 1));
            each.push(self.segments.of(key - 1));
            times.push(self.times.at(key));
            keys.push(self.keys[key]);
            own.push(Some(key));
        }
        let is_cubic = kinds.contains(&PathKind::Cubic);
        let none = [Rotor::new(0.0, 0.0, 0.0, 0.0); 2];
        let tangents = self.tangents.as_ref().filter(|_| is_cubic);
        let tangents =
            tangents.map(|all| own.iter().map(|own| own.map_or(none, |own| all[own])).collect::<Arc<[_]>>());
        let paths = if kinds.is_empty() { Paths::Every(path) } else { Paths::from_kinds(&kinds) };
        // A key between two of the file's has no triple of its own.
        let all_own: Option<Vec<usize>> = own.into_iter().collect();
        let chosen = |all: &[[f64; 3]]| {
            all_own.as_ref().map(|own| own.iter().map(|&key| all[key]).collect::<Vec<_>>())
        };
        let stored = match &self.stored {
            Stored::Rotors => None,
            Stored::Angles(angles) => chosen(&angles.degrees)
                .map(|degrees| Stored::Angles(FileAngles { degrees: degrees.into(), ..angles.clone() })),
            Stored::PlaneAngles(degrees) => {
                chosen(degrees).map(|degrees| Stored::PlaneAngles(degrees.into()))
            }
        };
        Self {
            times: Times::Listed(times.into()),
            keys: keys.into(),
            paths,
            tangents,
            // No more turns than there were.
            segments: Segments::new(&each, self.segments.ends()).unwrap_or_default(),
            stored: stored.unwrap_or(Stored::Rotors),
        }
    }
}

/// A stretch of a track as slerps.
struct Drawn {
    times: Vec<f64>,
    keys: Vec<Rotor>,
    /// Which key of the track each is, if any.
    own: Vec<Option<usize>>,
    /// What of the bound is left for dropping keys.
    bound_rad: f64,
}

impl Drawn {
    /// `None` where a curve can't be drawn with slerps finely enough.
    fn new(track: &RotationTrack, span: RangeInclusive<usize>, bound_rad: f64) -> Option<Self> {
        let mut sound = sound_keys(track);
        let mut is_own = vec![true; sound.len()];
        if (0..track.segment_count()).any(|segment| track.kind_of(segment, None) == PathKind::BSpline) {
            // It need not pass through its keys.
            let played = track.at_all(&track.times.iter().collect::<Vec<_>>());
            for ((own, played), is_own) in sound.iter_mut().zip(played).zip(&mut is_own) {
                *is_own = own.turn_to(played) < 1e-12;
                *own = if *is_own { *own } else { played };
            }
        }
        let mut drawn = Self { times: Vec::new(), keys: Vec::new(), own: Vec::new(), bound_rad };
        for key in span.clone() {
            let start = track.times.at(key);
            drawn.times.push(start);
            drawn.keys.push(sound[key]);
            drawn.own.push(is_own[key].then_some(key));
            if key == *span.end() || track.is_plain(key) || track.kind_of(key, None) == PathKind::Hold {
                continue;
            }
            drawn.bound_rad = bound_rad * (1.0 - FOR_CURVES);
            let ends = [start, track.times.at(key + 1)];
            for (secs, rotor) in
                pieces(track, ends, [sound[key], sound[key + 1]], 0.5 * FOR_CURVES * bound_rad)?
            {
                drawn.times.push(secs);
                drawn.keys.push(rotor);
                drawn.own.push(None);
            }
        }
        Some(drawn)
    }

    /// Where the track's keys `keep` stand.
    fn places_of(&self, keep: &[usize]) -> Vec<usize> {
        let wanted: BTreeSet<usize> = keep.iter().copied().collect();
        let is_wanted = |place: &usize| self.own[*place].is_some_and(|own| wanted.contains(&own));
        (0..self.own.len()).filter(is_wanted).collect()
    }

    /// Leaves those keys alone, and puts keys into the middle of steps that are too large; gives whether there were such.
    fn keep(&mut self, chosen: &[usize], halves: bool) -> bool {
        let mut are_halved = false;
        let mut kept =
            Self { times: Vec::new(), keys: Vec::new(), own: Vec::new(), bound_rad: self.bound_rad };
        for &key in chosen {
            if let (Some(&secs), Some(&before)) = (kept.times.last(), kept.keys.last())
                && halves
                && before.turn_to(self.keys[key]) > LARGEST_STEP_RAD
            {
                kept.times.push(0.5 * (secs + self.times[key]));
                kept.keys.push(slerp(before, self.keys[key], 0.5).normalize());
                kept.own.push(None);
                are_halved = true;
            }
            kept.times.push(self.times[key]);
            kept.keys.push(self.keys[key]);
            kept.own.push(self.own[key]);
        }
        *self = kept;
        are_halved
    }
}

/// Every key as it is played.
fn sound_keys(track: &RotationTrack) -> Vec<Rotor> {
    let [s, yz, zx, xy] = track.keys.sound().parts();
    (0..track.keys.len()).map(|key| Rotor::new(s[key], yz[key], zx[key], xy[key])).collect()
}

/// Points between the ends of a curved segment so that slerps between them stay within `bound_rad`.
fn pieces(
    track: &RotationTrack,
    [start, end]: [f64; 2],
    [a, b]: [Rotor; 2],
    bound_rad: f64,
) -> Option<Vec<(f64, Rotor)>> {
    let mut count = 1;
    while count <= MOST_PIECES {
        // Four times within each slerp, and its end.
        let fine: Vec<f64> =
            (0..=5 * count).map(|i| start + (end - start) * (i as f64 / (5 * count) as f64)).collect();
        let mut played = track.at_all(&fine);
        // Near its end a segment may jump to the other sign, never to another turn.
        (played[0], played[5 * count]) = (a, b);
        let is_near = played.chunks_exact(5).zip(played.iter().skip(5).step_by(5)).all(|(piece, &next)| {
            let is_short = piece[0].turn_to(next) <= LARGEST_STEP_RAD;
            let on_slerp = |place: usize| slerp(piece[0], next, place as f64 / 5.0).normalize();
            is_short && (1..5).all(|place| on_slerp(place).turn_to(piece[place]) <= bound_rad)
        });
        if is_near {
            let inner = (1..count).map(|piece| (fine[5 * piece], played[5 * piece]));
            return Some(inner.collect());
        }
        count *= 2;
    }
    None
}

impl VectorTrack {
    /// This track with as few keys as keep it within `bound` (its own unit) of what it plays now, at every time between
    /// its first key and its last; both of these are kept, and those of `keep` (rising). The track itself comes back when that
    /// would not save a key, and where it follows a cubic.
    #[must_use]
    pub fn reduced(&self, bound: f64, keep: &[usize]) -> Self {
        let Some(mut row) = self.row(bound) else { return self.clone() };
        let chosen = fewest(&mut row, keep, MOST_ENDS);
        if chosen.len() >= self.keys.len() { self.clone() } else { self.with_only(&chosen) }
    }

    /// The row that the search for fewest keys looks at; `None` for cubics and where a key is not finite.
    pub(super) fn row(&self, bound: f64) -> Option<PlaceRow> {
        let is_sound = self.keys.iter().all(|key| key.is_finite());
        let keys: Vec<DVec3> = self.keys.to_vec();
        let is_curved = self.path == VectorPath::Cubic && self.tangents.is_some();
        let is_held = self.path == VectorPath::Hold;
        (is_sound && !is_curved).then(|| PlaceRow::new(self.times.iter().collect(), keys, bound, is_held))
    }

    /// This track with some of its keys alone.
    pub(super) fn with_only(&self, chosen: &[usize]) -> Self {
        Self {
            times: Times::Listed(chosen.iter().map(|&key| self.times.at(key)).collect()),
            keys: chosen.iter().map(|&key| self.keys[key]).collect(),
            tangents: self.tangents.as_ref().map(|all| chosen.iter().map(|&key| all[key]).collect()),
            ..self.clone()
        }
    }
}

impl RotationTrack {
    /// This track with some of its keys alone, and slerp between.
    pub(super) fn with_only(&self, chosen: &[usize]) -> Self {
        let keys = chosen.iter().map(|&key| self.keys[key]).collect();
        let times = chosen.iter().map(|&key| self.times.at(key)).collect();
        let own = chosen.iter().map(|&key| Some(key)).collect();
        let drawn = Drawn { times, keys, own, bound_rad: 0.0 };
        self.with_stretch(0..=self.keys.len() - 1, &drawn, PathKind::Slerp)
    }
}
