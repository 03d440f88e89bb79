//! How far each key lies off the way between its neighbours, and what is usual for that near by.

use std::ops::Range;

use crate::rotor::Rotor;

use super::scan::Scan;

/// Keys to both sides that tell what is usual: this long, within these counts.
const WINDOW_SECS: f64 = 0.2;
const WINDOW_KEYS: (usize, usize) = (7, 30);

/// The standard deviation of normal noise is this many times its median absolute deviation: 1/Φ⁻¹(3/4).
const SIGMA_PER_MAD: f64 = 1.4826;

/// A joint's sound poses and their roughness.
#[derive(Debug)]
pub(super) struct Roughness {
    /// Unit poses; where the file has none, the one before.
    pub(super) poses: Vec<Rotor>,
    /// Key times in seconds.
    pub(super) secs: Vec<f64>,
    /// The angle in radians between each key and the way from its neighbour before to the one after; 0 at the ends.
    pub(super) residual: Vec<f64>,
    usual: Vec<Usual>,
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

impl Roughness {
    /// `None` with fewer than `least` keys.
    pub(super) fn new(scan: &Scan<'_>, least: usize) -> Option<Self> {
        let count = scan.track.keys.len();
        if count < least {
            return None;
        }
        let mut poses = Vec::with_capacity(count);
        let mut before = scan.track.sound_key(0);
        for key in 0..count {
            let own = scan.unit(key).unwrap_or(before).aligned_to(before);
            poses.push(own);
            before = own;
        }
        let secs: Vec<f64> = scan.track.times.iter().collect();
        let residual: Vec<f64> = (0..count)
            .map(|key| {
                if key == 0 || key + 1 == count {
                    0.0
                } else {
                    residual(&poses, &secs, key, key - 1, key + 1)
                }
            })
            .collect();
        let step_secs = scan.track.times.median_step().unwrap_or(1.0);
        let reach = ((WINDOW_SECS / step_secs) as usize).clamp(WINDOW_KEYS.0, WINDOW_KEYS.1);
        let block = (reach / 2).max(1);
        let usual = (0..count)
            .step_by(block)
            .map(|start| {
                let middle = start + block / 2;
                usual(&residual, middle.saturating_sub(reach)..(middle + reach + 1).min(count), 0..0)
            })
            .collect();
        Some(Self { poses, secs, residual, usual, block, reach })
    }

    pub(super) fn len(&self) -> usize {
        self.poses.len()
    }

    /// What is usual around a run of keys, those next to its ends left out with it.
    pub(super) fn usual_without(&self, first: usize, last: usize) -> Usual {
        let near = first.saturating_sub(self.reach)..(last + self.reach + 1).min(self.len());
        usual(&self.residual, near, first.saturating_sub(1)..last + 2)
    }

    /// The median step from key to key around a run, in radians.
    pub(super) fn usual_step_without(&self, first: usize, last: usize) -> f64 {
        let near = first.saturating_sub(self.reach).max(1)..(last + self.reach + 1).min(self.len());
        let mut steps: Vec<f64> = near
            .filter(|key| !(first.saturating_sub(1)..last + 3).contains(key))
            .map(|key| angle_of_dot(self.poses[key - 1].dot(self.poses[key])))
            .collect();
        if steps.is_empty() { 0.0 } else { take(&mut steps, 0.5) }
    }

    /// What is usual around a key.
    pub(super) fn usual(&self, key: usize) -> Usual {
        self.usual[key / self.block]
    }
}

/// The angle in radians between a key and the way from `before` to `after`.
///
/// The way is taken on the chord: for steps under 60° it is within 0.1° of slerp, at a fraction of the cost.
pub(super) fn residual(poses: &[Rotor], secs: &[f64], key: usize, before: usize, after: usize) -> f64 {
    let span = secs[after] - secs[before];
    let share = if span > 0.0 { (secs[key] - secs[before]) / span } else { 0.5 };
    angle_to_way(poses[before], poses[after], share, poses[key])
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

fn usual(residual: &[f64], near: Range<usize>, without: Range<usize>) -> Usual {
    // The ends have no residual of their own.
    let near = near.start.max(1)..near.end.min(residual.len() - 1);
    let keys = near.filter(|key| !without.contains(key));
    let mut own: Vec<f64> = keys.map(|key| residual[key]).collect();
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
        // reference/method_checks.json `mad`, computed with numpy; an end has no residual of its own.
        let data = [0.0, 12.1, 11.8, 12.4, 12.0, 55.0, 11.9, 12.2, 0.0];
        let usual = usual(&data, 0..data.len(), 0..0);
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
        let secs: Vec<f64> = (0..9).map(f64::from).collect();
        let expected = [0.0, 0.0, 17.565_143, 35.0, 17.564_463, 0.0, 0.0];
        for (key, expected) in (1..8).zip(expected) {
            let found = residual(&poses, &secs, key, key - 1, key + 1).to_degrees();
            assert!((found - expected).abs() < 2e-6, "frame {key}: {found}");
        }
    }
}
