//! A file's angles to turns, many rows at a time.

use crate::rotor::batch::{self, Level, Parts, Streams};
use crate::rotor::{Axis, EulerOrder, Rotor};

use super::degrees::{Degrees, GrowingDegrees, give_back};
use super::keys::Keys;
use super::path::{PathKind, Paths, Segments};
use super::rotation_track::{FileAngles, RotationTrack, Stored};
use super::times::Times;

/// Rows that are turned together; few enough to stay in the first cache.
const TILE: usize = 64;

/// Room for a tile of rows on their way from angles to turns. One serves any number of joints in turn.
#[derive(Debug)]
pub struct AngleScratch {
    level: Level,
    degrees: Vec<[f64; 3]>,
    radians: Streams<f64, 3>,
    rotors: Streams<f64, 4>,
}

impl Default for AngleScratch {
    fn default() -> Self {
        Self {
            level: Level::best(),
            degrees: Vec::with_capacity(TILE),
            radians: Streams::zeros(TILE),
            rotors: Streams::zeros(TILE),
        }
    }
}

/// The angles of one joint as a reader comes by them, and the rotors made of them.
///
/// What is made is the same track, bit for bit, whether its rows come one by one or all at once.
#[derive(Clone, Debug)]
pub struct AngleRows {
    axes: Vec<Axis>,
    degrees: GrowingDegrees,
    rotors: RotorRows,
}

impl AngleRows {
    /// None yet; room for `capacity` rows. See [`FileAngles`] for `axes` and `order`.
    pub fn new(axes: Vec<Axis>, order: EulerOrder, capacity: usize) -> Self {
        let degrees = GrowingDegrees::new(axes.len(), capacity);
        let mut rows = Self { axes, degrees, rotors: RotorRows::new(order) };
        rows.reserve(capacity);
        rows
    }

    /// Makes room for `capacity` rows in all.
    pub fn reserve(&mut self, capacity: usize) {
        self.degrees.reserve(capacity);
        if self.makes_rotors() {
            self.rotors.reserve(capacity);
        }
    }

    /// Whether rotors are made at once. Those of a joint with one or two angles are so much larger than its numbers that they wait until
    /// they are asked for.
    fn makes_rotors(&self) -> bool {
        self.axes.len() > 2
    }

    /// Whether all numbers so far are held as whole ones.
    pub fn holds_whole(&self) -> bool {
        self.degrees.holds_whole()
    }

    /// Bytes that a row takes once rows are added that are, or are not, all whole numbers.
    pub fn row_bytes(&self, are_whole: bool) -> usize {
        let rotor = if self.makes_rotors() { size_of::<Rotor>() } else { 0 };
        rotor + self.degrees.row_bytes(are_whole)
    }

    /// Adds `count` rows: `row` gives the angles in degrees of each, in the order of the axes; beyond these they are 0.
    pub fn push(&mut self, count: usize, row: impl Fn(usize) -> [f64; 3], scratch: &mut AngleScratch) {
        let mut room = std::mem::take(&mut scratch.degrees);
        for start in (0..count).step_by(TILE) {
            let length = TILE.min(count - start);
            let tile = self.degrees.extend_with(length, |index| row(start + index), &mut room);
            if self.axes.len() > 2 {
                self.rotors.push(tile, scratch);
            }
        }
        scratch.degrees = room;
    }

    /// Bytes that a row takes more once the track is played at many times.
    pub fn playing_bytes(&self) -> usize {
        if self.makes_rotors() { size_of::<Rotor>() } else { 2 * size_of::<Rotor>() }
    }

    /// The track, with slerp between; `times` has as many keys as there are rows.
    pub fn finish(self, times: Times) -> RotationTrack {
        let makes_rotors = self.makes_rotors();
        let degrees = self.degrees.finish();
        let order = self.rotors.order;
        let keys =
            if makes_rotors { self.rotors.finish().into() } else { Keys::of_angles(order, degrees.clone()) };
        RotationTrack {
            times,
            keys,
            paths: Paths::Every(PathKind::Slerp),
            tangents: None,
            segments: Segments::default(),
            stored: Stored::Angles(FileAngles { axes: self.axes, order, degrees }),
        }
    }
}

/// The rotor of a triple in degrees, as [`rotors`] makes it but for its sign.
pub(super) fn rotor(order: EulerOrder, degrees: [f64; 3]) -> Rotor {
    let radians = degrees.map(f64::to_radians);
    let mut parts = [0.0; 4];
    let out = parts.each_mut().map(std::slice::from_mut);
    batch::euler_rotors(Level::best(), order, radians.each_ref().map(std::slice::from_ref), out);
    let [s, yz, zx, xy] = parts;
    Rotor::new(s, yz, zx, xy)
}

/// Which rotors of a file's angles take the other sign to be near the last finite one before: a bit for each.
#[derive(Debug)]
pub(super) struct Signs(Vec<u64>);

impl Signs {
    pub(super) fn of(order: EulerOrder, degrees: &Degrees) -> Self {
        let (mut before, mut scratch) = (NO_ROTOR, AngleScratch::default());
        let mut tile = Vec::with_capacity(TILE);
        let mut words = Vec::with_capacity(degrees.len().div_ceil(TILE));
        for start in (0..degrees.len()).step_by(TILE) {
            tile.clear();
            tile.extend((start..degrees.len().min(start + TILE)).map(|key| degrees.triple(key)));
            let mut word = 0_u64;
            let rotors = rotors_of(order, &tile, &mut scratch);
            for index in 0..tile.len() {
                word |= u64::from(sign_near(rotor_at(rotors, index), &mut before) < 0.0) << index;
            }
            words.push(word);
        }
        Self(words)
    }

    /// 1 or −1.
    pub(super) fn of_key(&self, key: usize) -> f64 {
        let word = self.0.get(key / TILE).copied().unwrap_or_default();
        if word >> (key % TILE) & 1 == 1 { -1.0 } else { 1.0 }
    }
}

/// The rotors of a file's angles, each with the sign that is near the last finite one before it.
pub(super) fn rotors(order: EulerOrder, degrees: &Degrees) -> Vec<Rotor> {
    let (mut rows, mut scratch) = (RotorRows::new(order), AngleScratch::default());
    rows.reserve(degrees.len());
    let mut tile = Vec::with_capacity(TILE);
    for start in (0..degrees.len()).step_by(TILE) {
        tile.clear();
        tile.extend((start..degrees.len().min(start + TILE)).map(|key| degrees.triple(key)));
        rows.push(&tile, &mut scratch);
    }
    rows.finish()
}

/// The rotors of at most [`TILE`] triples in degrees.
fn rotors_of<'s>(
    order: EulerOrder,
    degrees: &[[f64; 3]],
    scratch: &'s mut AngleScratch,
) -> Parts<'s, f64, 4> {
    let length = degrees.len();
    let [first, second, third] = scratch.radians.parts_mut().map(|stream| &mut stream[..length]);
    for (((first, second), third), angles) in first.iter_mut().zip(second).zip(third).zip(degrees) {
        [*first, *second, *third] = angles.map(f64::to_radians);
    }
    let radians = scratch.radians.parts().map(|stream| &stream[..length]);
    let rotors = scratch.rotors.parts_mut().map(|stream| &mut stream[..length]);
    batch::euler_rotors(scratch.level, order, radians, rotors);
    scratch.rotors.parts().map(|stream| &stream[..length])
}

fn rotor_at([s, yz, zx, xy]: Parts<'_, f64, 4>, index: usize) -> Rotor {
    Rotor::new(s[index], yz[index], zx[index], xy[index])
}

/// The last finite rotor as it was made, and the sign it took to be near the one before it.
type Before = (Rotor, f64);

const NO_ROTOR: Before = (Rotor::IDENTITY, 1.0);

/// Rotors made of angles have no sign of their own: each takes the one near the last finite one before it.
fn sign_near(rotor: Rotor, before: &mut Before) -> f64 {
    let (reference, sign) = *before;
    let own = if sign * rotor.dot(reference) < 0.0 { -1.0 } else { 1.0 };
    if rotor.is_finite() {
        *before = (rotor, own);
    }
    own
}

/// [`sign_near`] of at most [`TILE`] rotors in a row.
fn signs_near(level: Level, rotors: Parts<'_, f64, 4>, before: &mut Before, signs: &mut [f64]) {
    let count = signs.len();
    let (mut dots, mut are_finite) = ([0.0; TILE], true);
    level.run(
        #[inline(always)]
        || {
            let [s, yz, zx, xy] = rotors.map(|part| &part[..count]);
            for part in [s, yz, zx, xy] {
                are_finite &= part.iter().fold(true, |all, part| all & (part.abs() <= f64::MAX));
            }
            // As `Rotor::dot`.
            for (index, dot) in dots[..count].iter_mut().enumerate().skip(1) {
                *dot = s[index] * s[index - 1]
                    + yz[index] * yz[index - 1]
                    + zx[index] * zx[index - 1]
                    + xy[index] * xy[index - 1];
            }
        },
    );
    if !are_finite || count == 0 {
        for (index, sign) in signs.iter_mut().enumerate() {
            *sign = sign_near(rotor_at(rotors, index), before);
        }
        return;
    }
    dots[0] = rotor_at(rotors, 0).dot(before.0);
    let mut is_minus = before.1 < 0.0;
    for (sign, &dot) in signs.iter_mut().zip(&dots) {
        // A dot product of 0 gives a plus. A choice between two comparisons, which needs no branch: random signs could not be guessed.
        is_minus = if is_minus { dot > 0.0 } else { dot < 0.0 };
        *sign = if is_minus { -1.0 } else { 1.0 };
    }
    *before = (rotor_at(rotors, count - 1), signs[count - 1]);
}

#[derive(Clone, Debug)]
struct RotorRows {
    order: EulerOrder,
    keys: Vec<Rotor>,
    before: Before,
}

impl RotorRows {
    fn new(order: EulerOrder) -> Self {
        Self { order, keys: Vec::new(), before: NO_ROTOR }
    }

    fn reserve(&mut self, capacity: usize) {
        self.keys.reserve_exact(capacity.saturating_sub(self.keys.len()));
    }

    /// Adds at most [`TILE`] rows.
    fn push(&mut self, degrees: &[[f64; 3]], scratch: &mut AngleScratch) {
        let level = scratch.level;
        let rotors = rotors_of(self.order, degrees, scratch);
        let mut signs = [1.0; TILE];
        let signs = &mut signs[..degrees.len()];
        signs_near(level, rotors, &mut self.before, signs);
        let [s, yz, zx, xy] = rotors;
        let parts = s.iter().zip(yz).zip(zx.iter().zip(xy)).zip(&*signs);
        self.keys.extend(parts.map(|(((s, yz), (zx, xy)), sign)| Rotor::new(*s, *yz, *zx, *xy).scale(*sign)));
    }

    fn finish(mut self) -> Vec<Rotor> {
        give_back(&mut self.keys);
        self.keys
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rows_make_the_same_track_in_any_portions() {
        let rows: Vec<[f64; 3]> = (0..300)
            .map(|i| {
                let t = f64::from(i);
                if i % 71 == 5 { [t, f64::NAN, 0.0] } else { [3.0 * t, 170.0 * (0.1 * t).sin(), -2.5 * t] }
            })
            .collect();
        let times = Times::Even { step_secs: 0.01, count: rows.len() };
        let axes = || EulerOrder::ZXY.axes().to_vec();
        let mut scratch = AngleScratch::default();
        let mut whole = AngleRows::new(axes(), EulerOrder::ZXY, rows.len());
        whole.push(rows.len(), |row| rows[row], &mut scratch);
        let whole = whole.finish(times.clone());
        let mut parts = AngleRows::new(axes(), EulerOrder::ZXY, 1);
        let mut done = 0;
        for count in [1, 63, 2, 100, 134] {
            parts.push(count, |row| rows[done + row], &mut scratch);
            done += count;
        }
        let parts = parts.finish(times);
        assert!(parts.changed_keys(&whole).is_empty());
        let bits = |track: &RotationTrack| {
            // What is no number has no sign that would mean anything.
            let bits = |part: f64| if part.is_nan() { f64::NAN.to_bits() } else { part.to_bits() };
            let of = |key: &Rotor| [key.s, key.yz, key.zx, key.xy].map(bits);
            track.keys.iter().map(of).collect::<Vec<_>>()
        };
        assert_eq!(bits(&parts), bits(&whole));
        // As one by one, each near the last finite one before it.
        let mut before = Rotor::IDENTITY;
        for (row, key) in rows.iter().zip(whole.keys.iter()) {
            let alone = EulerOrder::ZXY.to_rotor(row.map(f64::to_radians)).aligned_to(before);
            assert_eq!(key.is_finite(), alone.is_finite());
            if alone.is_finite() {
                assert!(key.dot(alone) > 0.0 && key.turn_to(alone) < 1e-14, "{key:?} for {alone:?}");
                before = alone;
            }
        }
    }
}
