//! A file's angles to turns, many rows at a time.

use std::sync::Arc;

use crate::rotor::batch::{self, Level, Streams};
use crate::rotor::{Axis, EulerOrder, Rotor};

use super::path::{PathKind, Paths, Segments};
use super::rotation_track::{FileAngles, RotationTrack, Stored};
use super::times::Times;

/// Rows that are turned together; few enough to stay in the first cache.
const TILE: usize = 64;

/// Room for a tile of rows on their way from angles to turns. One serves any number of joints in turn.
#[derive(Debug)]
pub struct AngleScratch {
    level: Level,
    radians: Streams<f64, 3>,
    rotors: Streams<f64, 4>,
}

impl Default for AngleScratch {
    fn default() -> Self {
        Self { level: Level::best(), radians: Streams::zeros(TILE), rotors: Streams::zeros(TILE) }
    }
}

/// The angles of one joint as a reader comes by them, and the rotors made of them.
///
/// What is made is the same track, bit for bit, whether its rows come one by one or all at once.
#[derive(Clone, Debug)]
pub struct AngleRows {
    axes: Vec<Axis>,
    order: EulerOrder,
    degrees: Growing<[f64; 3]>,
    keys: Vec<Rotor>,
    /// The last finite rotor as it was made, and the sign it took to be near the one before it.
    before: (Rotor, f64),
}

impl AngleRows {
    /// None yet; room for `capacity` rows. See [`FileAngles`] for `axes` and `order`.
    pub fn new(axes: Vec<Axis>, order: EulerOrder, capacity: usize) -> Self {
        Self {
            axes,
            order,
            degrees: Growing::new([0.0; 3], capacity),
            keys: Vec::with_capacity(capacity),
            before: (Rotor::IDENTITY, 1.0),
        }
    }

    /// Makes room for `capacity` rows in all.
    pub fn reserve(&mut self, capacity: usize) {
        self.degrees.reserve(capacity);
        self.keys.reserve_exact(capacity.saturating_sub(self.keys.len()));
    }

    /// Adds `count` rows: `row` gives the angles in degrees of each, in the order of the axes.
    pub fn push(&mut self, count: usize, row: impl Fn(usize) -> [f64; 3], scratch: &mut AngleScratch) {
        for start in (0..count).step_by(TILE) {
            let length = TILE.min(count - start);
            let degrees = self.degrees.next(length);
            let [first, second, third] = scratch.radians.parts_mut().map(|stream| &mut stream[..length]);
            for (index, own) in degrees.iter_mut().enumerate() {
                let angles = row(start + index);
                *own = angles;
                first[index] = angles[0].to_radians();
                second[index] = angles[1].to_radians();
                third[index] = angles[2].to_radians();
            }
            let radians = scratch.radians.parts().map(|stream| &stream[..length]);
            let rotors = scratch.rotors.parts_mut().map(|stream| &mut stream[..length]);
            batch::euler_rotors(scratch.level, self.order, radians, rotors);
            let [s, yz, zx, xy] = scratch.rotors.parts().map(|stream| &stream[..length]);
            let (mut reference, mut sign) = self.before;
            self.keys.extend((0..length).map(|index| {
                let rotor = Rotor::new(s[index], yz[index], zx[index], xy[index]);
                // Rotors made of angles have no sign of their own: each takes the one near the last finite one before it.
                let own_sign = if sign * rotor.dot(reference) < 0.0 { -1.0 } else { 1.0 };
                if rotor.is_finite() {
                    (reference, sign) = (rotor, own_sign);
                }
                rotor.scale(own_sign)
            }));
            self.before = (reference, sign);
        }
    }

    /// The track, with slerp between; `times` has as many keys as there are rows.
    pub fn finish(mut self, times: Times) -> RotationTrack {
        if self.keys.capacity() - self.keys.len() > self.keys.len() / 8 {
            self.keys.shrink_to_fit();
        }
        let degrees = self.degrees.finish();
        RotationTrack {
            times,
            keys: self.keys.into(),
            paths: Paths::Every(PathKind::Slerp),
            tangents: None,
            segments: Segments::default(),
            stored: Stored::Angles(FileAngles { axes: self.axes, order: self.order, degrees }),
        }
    }
}

/// A shared slice that is written where it will stay: a list that is copied into one at the end would for a time be there
/// twice.
#[derive(Clone, Debug)]
pub struct Growing<T> {
    items: Arc<[T]>,
    len: usize,
    fill: T,
}

impl<T: Copy> Growing<T> {
    /// Nothing yet, with room for `capacity` items. `fill` may be any item; it stands in what is not used yet.
    pub fn new(fill: T, capacity: usize) -> Self {
        Self { items: std::iter::repeat_n(fill, capacity).collect(), len: 0, fill }
    }

    /// Makes room for `capacity` items in all.
    pub fn reserve(&mut self, capacity: usize) {
        if capacity > self.items.len() {
            let rest = std::iter::repeat_n(self.fill, capacity - self.len);
            self.items = self.items[..self.len].iter().copied().chain(rest).collect();
        }
    }

    /// The next `count` items, to be written.
    pub fn next(&mut self, count: usize) -> &mut [T] {
        let (start, end) = (self.len, self.len + count);
        if end > self.items.len() {
            self.reserve(end.max(self.items.len() + self.items.len() / 2));
        }
        self.len = end;
        // Nobody else has it before it is finished; a copy of this list, if there is one, keeps its own.
        if Arc::get_mut(&mut self.items).is_none() {
            self.items = self.items.iter().copied().collect();
        }
        Arc::get_mut(&mut self.items).map_or(&mut [], |items| &mut items[start..end])
    }

    /// All items.
    pub fn finish(self) -> Arc<[T]> {
        if self.len == self.items.len() { self.items } else { self.items[..self.len].into() }
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
