//! How far each key lies off the way between its neighbours, and what is usual for that near by.

use std::cell::OnceCell;
use std::ops::Range;

use crate::rotor::Rotor;

use super::poses::{Lazy, Poses};
use super::scan::Scan;

/// Keys to both sides that tell what is usual: this long, within these counts.
const WINDOW_SECS: f64 = 0.2;
const WINDOW_KEYS: (usize, usize) = (7, 30);

/// The standard deviation of normal noise is this many times its median absolute deviation: 1/Φ⁻¹(3/4).
const SIGMA_PER_MAD: f64 = 1.4826;

/// A joint's sound poses and their roughness, made as they are looked at.
#[derive(Debug)]
pub(super) struct Roughness<'a> {
    scan: Scan<'a>,
    poses: Poses<'a>,
    residuals: Lazy<f64>,
    /// What is usual in blocks of keys.
    usual: Vec<OnceCell<Usual>>,
    block: usize,
    reach: usize,
}

/// What is usual near a key, in radians.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Usual {
    /// Median residual.
    pub(super) median: f64,
    /// Its robust spread.
    pub(super) spread: f64,
}

impl<'a> Roughness<'a> {
    /// `None` with fewer than `least` keys.
    pub(super) fn new(scan: Scan<'a>, least: usize) -> Option<Self> {
        let count = scan.keys.len();
        if count < least {
            return None;
        }
        let step_secs = scan.outline().step_secs().unwrap_or(1.0);
        let reach = ((WINDOW_SECS / step_secs) as usize).clamp(WINDOW_KEYS.0, WINDOW_KEYS.1);
        let block = (reach / 2).max(1);
        let usual = (0..count.div_ceil(block)).map(|_| OnceCell::new()).collect();
        let (poses, residuals) = (Poses::new(scan), Lazy::new(count));
        Some(Self { scan, poses, residuals, usual, block, reach })
    }

    pub(super) fn len(&self) -> usize {
        self.poses.len()
    }

    /// The unit pose of a key; where the file has none, the one before.
    pub(super) fn pose(&self, key: usize) -> Rotor {
        self.poses.at(key)
    }

    /// The time of a key in seconds.
    pub(super) fn secs(&self, key: usize) -> f64 {
        self.scan.secs(key)
    }

    /// The first key from `key` on that may be rougher than anything that is not looked at.
    pub(super) fn next_rough(&self, key: usize) -> usize {
        self.scan.outline().next_rough(key)
    }

    /// The angle in radians between a key and the way from its neighbour before to the one after; 0 at the ends.
    ///
    /// The way is taken on the chord: for steps under 60° it is within 0.1° of slerp, at a fraction of the cost.
    #[inline]
    pub(super) fn residual(&self, key: usize) -> f64 {
        self.residuals.get(key, |keys| keys.map(|key| self.angle_off(key)).collect())
    }

    fn angle_off(&self, key: usize) -> f64 {
        if key == 0 || key + 1 == self.len() {
            return 0.0;
        }
        let [before, own, after] = [key - 1, key, key + 1].map(|key| self.secs(key));
        let span = after - before;
        let share = if span > 0.0 { (own - before) / span } else { 0.5 };
        angle_to_way(self.pose(key - 1), self.pose(key + 1), share, self.pose(key))
    }

    /// What is usual around a run of keys, those next to its ends left out with it.
    pub(super) fn usual_without(&self, first: usize, last: usize) -> Usual {
        let near = first.saturating_sub(self.reach)..(last + self.reach + 1).min(self.len());
        self.usual_in(near, first.saturating_sub(1)..last + 2)
    }

    /// The median step from key to key around a run, in radians.
    pub(super) fn usual_step_without(&self, first: usize, last: usize) -> f64 {
        let near = first.saturating_sub(self.reach).max(1)..(last + self.reach + 1).min(self.len());
        let mut steps: Vec<f64> = near
            .filter(|key| !(first.saturating_sub(1)..last + 3).contains(key))
            .map(|key| angle_of_dot(self.pose(key - 1).dot(self.pose(key))))
            .collect();
        if steps.is_empty() { 0.0 } else { take(&mut steps, 0.5) }
    }

    /// What is usual around a key.
    pub(super) fn usual(&self, key: usize) -> Usual {
        let index = key / self.block;
        *self.usual[index].get_or_init(|| {
            let middle = index * self.block + self.block / 2;
            let near = middle.saturating_sub(self.reach)..(middle + self.reach + 1).min(self.len());
            self.usual_in(near, 0..0)
        })
    }

    fn usual_in(&self, near: Range<usize>, without: Range<usize>) -> Usual {
        // The ends have no residual of their own.
        let near = near.start.max(1)..near.end.min(self.len() - 1);
        let keys = near.filter(|key| !without.contains(key));
        usual_of(keys.map(|key| self.residual(key)).collect())
    }
}

/// The angle in radians between a pose and the way from `a` to `b`.
pub(super) fn angle_to_way(a: Rotor, b: Rotor, share: f64, own: Rotor) -> f64 {
    let b = b.aligned_to(a).scale(share);
    let a = a.scale(1.0 - share);
    let way = Rotor::new(a.s + b.s, a.yz + b.yz, a.zx + b.zx, a.xy + b.xy);
    let length = way.norm();
    if length < 1e-9 {
        return std::f64::consts::PI;
    }
    let dot = way.dot(own) / length;
    angle_of_dot(dot)
}

/// The turn in radians between unit rotors of this dot product; exact near 0 to about 1e-8.
pub(super) fn angle_of_dot(dot: f64) -> f64 {
    2.0 * dot.abs().min(1.0).acos()
}

/// The middle of some residuals and their spread about it.
fn usual_of(mut own: Vec<f64>) -> Usual {
    if own.is_empty() {
        return Usual::default();
    }
    let median = take(&mut own, 0.5);
    for value in &mut own {
        *value = (*value - median).abs();
    }
    let spread = SIGMA_PER_MAD * take(&mut own, 0.5);
    Usual { median, spread }
}

/// The value at a share of the sorted list.
fn take(values: &mut [f64], share: f64) -> f64 {
    let index = ((values.len() - 1) as f64 * share).round() as usize;
    *values.select_nth_unstable_by(index, f64::total_cmp).1
}

#[cfg(test)]
mod tests {
    use glam::DVec3;

    use super::*;
    use crate::rotor::Bivector;

    fn turn(degrees: f64, axis: DVec3) -> Rotor {
        Rotor::from_plane_angles(Bivector::from_axis(axis.normalize() * degrees.to_radians()))
    }

    #[test]
    fn median_and_spread_are_those_of_the_methods_page() {
        // reference/method_checks.json `mad`, computed with numpy.
        let usual = usual_of(vec![12.1, 11.8, 12.4, 12.0, 55.0, 11.9, 12.2]);
        assert!((usual.median - 12.1).abs() < 1e-9, "{usual:?}");
        // Theirs has more digits of 1/Φ⁻¹(3/4) than ours.
        assert!((usual.spread - 0.296_520_443_701).abs() < 1e-6, "{usual:?}");
        let score = (55.0 - usual.median) / usual.spread;
        assert!((score - 144.678).abs() < 1e-3, "{score}");
    }

    #[test]
    fn the_residual_points_at_the_frame_that_is_off_as_on_the_methods_page() {
        // reference/method_checks.json `spike_residual`, computed with scipy: 10° a frame, frame 4 off by 35°.
        let axis = DVec3::new(0.2, 1.0, 0.1);
        let poses: Vec<Rotor> = (0..9)
            .map(|frame| {
                let even = turn(10.0 * f64::from(frame), axis);
                if frame == 4 { even * turn(35.0, DVec3::X) } else { even }
            })
            .collect();
        let expected = [0.0, 0.0, 17.565_143, 35.0, 17.564_463, 0.0, 0.0];
        for (key, expected) in (1..8).zip(expected) {
            let found = angle_to_way(poses[key - 1], poses[key + 1], 0.5, poses[key]).to_degrees();
            assert!((found - expected).abs() < 2e-6, "frame {key}: {found}");
        }
    }
}
