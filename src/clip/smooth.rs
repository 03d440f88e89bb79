//! Smoothing without delay: turns and places over keys at even or uneven times.

use std::sync::Arc;

use crate::rotor::{Bivector, Rotor, slerp};

use super::key_edit::with_turned_keys;
use super::rotation_track::RotationTrack;
use super::times::Times;
use super::vector_track::VectorTrack;

/// The shape of a smoothing kernel. All are symmetric, so nothing is delayed, and none overshoots.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Kernel {
    /// A bell: the gentlest fall beyond the cut-off.
    Gaussian,
    /// Rows of Pascal's triangle, nearly a bell; for even times exactly `(¼, ½, ¼)` applied over and over.
    Binomial,
    /// A moving average.
    Box,
}

impl Kernel {
    /// All, in the order of lists.
    pub const ALL: [Self; 3] = [Self::Gaussian, Self::Binomial, Self::Box];

    /// Its name in files and lists.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Gaussian => "gaussian",
            Self::Binomial => "binomial",
            Self::Box => "box",
        }
    }

    /// The kernel of that name.
    pub fn named(name: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|kernel| kernel.name() == name)
    }
}

/// How a curve is smoothed.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Smoothing {
    /// The kernel's shape.
    pub kernel: Kernel,
    /// The frequency, above 0, that keeps `1/√2` of its size (−3 dB); slower motion keeps more, faster less.
    pub cutoff_hz: f64,
    /// The most that a turn may change, in radians. Small changes are taken as they are, larger ones approach it smoothly.
    pub most_rad: Option<f64>,
}

/// The widest reach of a kernel to either side, in keys: beyond it a clip's whole motion would be averaged.
const MOST_REACH: usize = 1024;

impl Smoothing {
    /// A Gaussian without a bound.
    pub const fn gaussian(cutoff_hz: f64) -> Self {
        Self { kernel: Kernel::Gaussian, cutoff_hz, most_rad: None }
    }

    /// Weight of a key `secs` away, not normalised; `step_secs` is the usual time between keys.
    fn weight(&self, secs: f64, step_secs: f64) -> f64 {
        let away = secs.abs();
        match self.kernel {
            Kernel::Gaussian => (-0.5 * (away / self.sigma_secs()).powi(2)).exp(),
            Kernel::Box => {
                // A key at the border counts as far as its own step lies inside.
                let inside = (self.reach_secs(step_secs) - away) / step_secs + 0.5;
                inside.clamp(0.0, 1.0)
            }
            Kernel::Binomial => {
                let rounds = self.rounds(step_secs);
                let at = rounds + away / step_secs;
                // C(2n, n + k) / C(2n, n), also between whole k.
                if away / step_secs >= rounds + 1.0 {
                    return 0.0;
                }
                (2.0 * ln_factorial(rounds) - ln_factorial(at) - ln_factorial(2.0 * rounds - at)).exp()
            }
        }
    }

    /// Standard deviation of the Gaussian: its response `exp(−2π²σ²f²)` is `1/√2` at the cut-off.
    fn sigma_secs(&self) -> f64 {
        std::f64::consts::LN_2.sqrt() / (std::f64::consts::TAU * self.cutoff_hz)
    }

    /// Rounds of `(¼, ½, ¼)`, whose response is `cos²ⁿ(π f step)`.
    fn rounds(&self, step_secs: f64) -> f64 {
        let phase = (std::f64::consts::PI * self.cutoff_hz * step_secs).min(0.49 * std::f64::consts::PI);
        (-0.25 * std::f64::consts::LN_2 / phase.cos().ln()).round().clamp(1.0, MOST_REACH as f64)
    }

    /// How far the kernel reaches to either side.
    fn reach_secs(&self, step_secs: f64) -> f64 {
        let reach = match self.kernel {
            Kernel::Gaussian => 4.5 * self.sigma_secs(),
            Kernel::Binomial => self.rounds(step_secs) * step_secs,
            // sin x / x is 1/√2 at 1.3916.
            Kernel::Box => 1.391_557_378 / (std::f64::consts::TAU * self.cutoff_hz),
        };
        reach.min(MOST_REACH as f64 * step_secs)
    }

    /// A change of `turn_rad` held within the bound: the same for small ones, never beyond.
    fn bounded(&self, turn_rad: f64) -> f64 {
        match self.most_rad {
            Some(most) if most > 0.0 => {
                let share = turn_rad / most;
                turn_rad / (1.0 + share.powi(4)).powf(0.25)
            }
            Some(_) => 0.0,
            None => turn_rad,
        }
    }
}

/// `ln Γ(x + 1)` for x from 0 up, to a few digits more than a weight needs (Stirling's series, after stepping up from small x).
fn ln_factorial(x: f64) -> f64 {
    if x <= -1.0 {
        return f64::INFINITY;
    }
    let (mut x, mut steps) = (x, 0.0);
    while x < 12.0 {
        x += 1.0;
        steps += x.ln();
    }
    let inverse = 1.0 / x;
    let series = inverse * (1.0 / 12.0 - inverse * inverse * (1.0 / 360.0 - inverse * inverse / 1260.0));
    x * x.ln() - x + 0.5 * (std::f64::consts::TAU * x).ln() + series - steps
}

/// Weights of keys around each key: those of the kernel, made to add up to 1 and to leave even motion alone.
struct Weights<'a> {
    smoothing: &'a Smoothing,
    times: Vec<f64>,
    step_secs: f64,
    reach_secs: f64,
    /// At even times, the same for all keys: the first key relative to the one in the middle, and the weights.
    even: Option<(isize, Vec<f64>)>,
}

impl<'a> Weights<'a> {
    /// `None` where there is nothing to smooth.
    fn new(smoothing: &'a Smoothing, times: &Times) -> Option<Self> {
        let step_secs = times.median_step().filter(|step| *step > 0.0)?;
        let sound = smoothing.cutoff_hz.is_finite() && smoothing.cutoff_hz > 0.0;
        let reach_secs = smoothing.reach_secs(step_secs);
        let times_secs = times.iter().collect();
        let mut weights = Self { smoothing, times: times_secs, step_secs, reach_secs, even: None };
        if sound && matches!(times, Times::Even { .. }) {
            weights.even = Some(weights.around(0));
        }
        sound.then_some(weights)
    }

    /// The first key and the weights from it on, around `key`.
    fn at(&self, key: usize) -> (isize, std::borrow::Cow<'_, [f64]>) {
        if let Some((first, weights)) = &self.even {
            return (first + key as isize, weights.as_slice().into());
        }
        let (first, weights) = self.around(key);
        (first, weights.into())
    }

    /// Weights of the keys `first..`, where keys before 0 and behind the last are those mirrored at the ends.
    ///
    /// At even times these are the kernel's own. At uneven times each weight is multiplied with the time its key stands
    /// for, and with a straight line that makes the weighted mean of the times the key's own (the equivalent kernel of
    /// a local straight line: Cleveland 1979, "Robust locally weighted regression"): motion at even speed stays as it is.
    fn around(&self, key: usize) -> (isize, Vec<f64>) {
        let now = self.times[key];
        let key = key as isize;
        let mut first = key;
        while now - self.time(first - 1) <= self.reach_secs + 0.5 * self.step_secs
            && key - first < MOST_REACH as isize
        {
            first -= 1;
        }
        let mut last = key;
        while self.time(last + 1) - now <= self.reach_secs + 0.5 * self.step_secs
            && last - key < MOST_REACH as isize
        {
            last += 1;
        }
        let away = |at: isize| self.time(at) - now;
        let mut weights: Vec<f64> = (first..=last)
            .map(|at| {
                let stands_for = 0.5 * (self.time(at + 1) - self.time(at - 1));
                self.smoothing.weight(away(at), self.step_secs) * stands_for
            })
            .collect();
        let moments = (first..=last).zip(&weights).fold([0.0; 3], |[m0, m1, m2], (at, weight)| {
            let away = away(at);
            [m0 + weight, m1 + weight * away, m2 + weight * away * away]
        });
        let [m0, m1, m2] = moments;
        let determinant = m0 * m2 - m1 * m1;
        for (at, weight) in (first..=last).zip(&mut weights) {
            *weight *=
                if determinant > 1e-12 * m0 * m2 { (m2 - m1 * away(at)) / determinant } else { 1.0 / m0 };
        }
        (first, weights)
    }

    /// The time of a key; beyond an end the steps repeat backwards.
    fn time(&self, key: isize) -> f64 {
        let last = self.times.len() as isize - 1;
        let mirrored = |at: isize| self.times[at.clamp(0, last) as usize];
        if key < 0 {
            2.0 * self.times[0] - self.folded(-key, mirrored)
        } else if key > last {
            let end = self.times[last as usize];
            2.0 * end - self.folded_down(key - last, mirrored)
        } else {
            self.times[key as usize]
        }
    }

    /// Time of the key `steps` after the first; beyond the last the steps go on as the last one.
    fn folded(&self, steps: isize, at: impl Fn(isize) -> f64) -> f64 {
        let last = self.times.len() as isize - 1;
        at(steps) + (steps - last).max(0) as f64 * self.step_secs
    }

    fn folded_down(&self, steps: isize, at: impl Fn(isize) -> f64) -> f64 {
        let last = self.times.len() as isize - 1;
        at(last - steps) - (steps - last).max(0) as f64 * self.step_secs
    }
}

impl RotationTrack {
    /// This track with its keys smoothed; `share` tells for a key's time how much of the change is taken, 0 to 1. Keys of
    /// share 0, and keys that do not move, keep their numbers.
    ///
    /// The filter is that of Lee & Shin 2002: steps from key to key as plane angles, weighted and added up. It depends on
    /// neither frame and not on the direction of time, and the first and last key stay where they are, since beyond the ends
    /// the steps are taken as mirrored there. Keys are taken to be near each other, as captured ones are; what is between
    /// them is not looked at.
    ///
    /// Source: Lee & Shin 2002, "General construction of time-domain filters for orientation data", IEEE TVCG 8(2).
    #[must_use]
    pub fn smoothed(&self, smoothing: &Smoothing, share: &dyn Fn(f64) -> f64) -> Self {
        let count = self.keys.len();
        if count < 3 {
            return self.clone();
        }
        let Some(weights) = Weights::new(smoothing, &self.times) else { return self.clone() };
        let [s, yz, zx, xy] = self.keys.sound().parts();
        let keys: Vec<Rotor> = (0..count).map(|key| Rotor::new(s[key], yz[key], zx[key], xy[key])).collect();
        let steps: Vec<Bivector> =
            keys.windows(2).map(|pair| (pair[0].reverse() * pair[1]).plane_angles()).collect();
        let mut changes = Vec::new();
        for (key, &own) in keys.iter().enumerate() {
            let share = share(self.times.at(key)).clamp(0.0, 1.0);
            let is_end = key == 0 || key + 1 == count;
            if is_end || share == 0.0 || share.is_nan() {
                continue;
            }
            let (first, weights) = weights.at(key);
            let turn = weighted_way(&weights, first, key, |step| mirrored(&steps, step));
            let length = turn.length();
            if length < 1e-15 {
                continue;
            }
            let turn = turn * (smoothing.bounded(length) / length * share);
            changes
                .push((key, (own * Rotor::from_plane_angles(turn)).normalize().aligned_to(self.keys[key])));
        }
        if changes.is_empty() { self.clone() } else { with_turned_keys(self, &changes) }
    }
}

/// The weighted sum of the ways from a key to its neighbours: a step counts with the weight of all keys beyond it.
fn weighted_way(weights: &[f64], first: isize, key: usize, step: impl Fn(isize) -> Bivector) -> Bivector {
    let key = key as isize;
    let last = first + weights.len() as isize - 1;
    let mut way = Bivector::ZERO;
    let mut beyond = 0.0;
    for at in (key + 1..=last).rev() {
        beyond += weights[(at - first) as usize];
        way = way + step(at - 1) * beyond;
    }
    beyond = 0.0;
    for at in first..key {
        beyond += weights[(at - first) as usize];
        way = way - step(at) * beyond;
    }
    way
}

/// The step behind key `at`; before the first and after the last those as far inside.
fn mirrored(steps: &[Bivector], at: isize) -> Bivector {
    let count = steps.len() as isize;
    let place = at.rem_euclid(2 * count);
    steps[if place < count { place } else { 2 * count - 1 - place } as usize]
}

impl VectorTrack {
    /// This track with its keys smoothed as turns are in [`RotationTrack::smoothed`]; a bound on turns is not looked at.
    #[must_use]
    pub fn smoothed(&self, smoothing: &Smoothing, share: &dyn Fn(f64) -> f64) -> Self {
        let count = self.keys.len();
        let is_sound = self.keys.iter().all(|key| key.is_finite());
        let (true, Some(weights)) = (count >= 3 && is_sound, Weights::new(smoothing, &self.times)) else {
            return self.clone();
        };
        let steps: Vec<Bivector> =
            self.keys.windows(2).map(|pair| Bivector::from_axis(pair[1] - pair[0])).collect();
        let keys: Arc<[glam::DVec3]> = (0..count)
            .map(|key| {
                let share = share(self.times.at(key)).clamp(0.0, 1.0);
                let is_end = key == 0 || key + 1 == count;
                if is_end || share == 0.0 || share.is_nan() {
                    return self.keys[key];
                }
                let (first, weights) = weights.at(key);
                let way = weighted_way(&weights, first, key, |step| mirrored(&steps, step));
                self.keys[key] + way.axis() * share
            })
            .collect();
        Self { keys: keys.into(), ..self.clone() }
    }
}

/// A track partly on its way to another with the same keys: `share` of the change at each key's time.
#[must_use]
pub fn partly(before: &RotationTrack, after: &RotationTrack, share: &dyn Fn(f64) -> f64) -> RotationTrack {
    let changes: Vec<(usize, Rotor)> = after
        .changed_keys(before)
        .into_iter()
        .filter(|&key| key < before.keys.len())
        .map(|key| (key, share(before.times.at(key)).clamp(0.0, 1.0)))
        .filter(|(_, share)| *share > 0.0)
        .map(|(key, share)| (key, slerp(before.sound_key(key), after.sound_key(key), share)))
        .collect();
    before.with_keys(&changes)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::rotor::{Axis, convolve};

    fn even(count: usize) -> Times {
        Times::Even { step_secs: 0.01, count }
    }

    fn always(_: f64) -> f64 {
        1.0
    }

    #[test]
    fn at_even_times_it_is_the_filter_for_orientations() {
        // Against `rotor::convolve`, which the outside checks hold to the figures of Lee & Shin 2002.
        let keys: Vec<Rotor> = (0..80)
            .map(|i| {
                let i = f64::from(i);
                Rotor::from_plane_angles(Bivector::new((0.2 * i).sin(), 0.4 * (0.31 * i).cos(), 0.01 * i))
            })
            .collect();
        let track = RotationTrack::from_rotors(even(80), keys.clone());
        // cos²ⁿ(π f step) = 1/√2 for n = 2 at this frequency.
        let cutoff_hz = (2.0_f64.powf(-0.125)).acos() / (std::f64::consts::PI * 0.01);
        let smoothing = Smoothing { kernel: Kernel::Binomial, cutoff_hz, most_rad: None };
        let ours = track.smoothed(&smoothing, &always);
        let expected = convolve(&keys, &[1.0, 4.0, 6.0, 4.0, 1.0].map(|w| w / 16.0)).unwrap();
        for (key, wanted) in expected.iter().enumerate() {
            assert!(ours.keys[key].turn_to(*wanted) < 1e-9, "key {key}");
        }
    }

    #[test]
    fn the_cut_off_is_where_a_wave_keeps_seven_tenths() {
        for kernel in Kernel::ALL {
            for cutoff_hz in [3.0_f64, 8.0] {
                let angle = |key: usize| 0.1 * (std::f64::consts::TAU * cutoff_hz * 0.01 * key as f64).sin();
                let keys: Vec<Rotor> = (0..400).map(|key| Axis::X.rotor(angle(key))).collect();
                let track = RotationTrack::from_rotors(even(400), keys);
                let smoothing = Smoothing { kernel, cutoff_hz, most_rad: None };
                let smooth = track.smoothed(&smoothing, &always);
                let size = (150..250).map(|key| smooth.keys[key].plane_angles().yz.abs()).fold(0.0, f64::max);
                assert!((size / 0.1 - 0.5_f64.sqrt()).abs() < 0.03, "{kernel:?} {cutoff_hz}: {size}");
                // No delay: the zeros stay where they are.
                let period = (100.0 / cutoff_hz).round() as usize;
                if (100.0 / cutoff_hz).fract() == 0.0 {
                    assert!(smooth.keys[period * 8].plane_angles().yz.abs() < 1e-3);
                }
            }
        }
    }

    #[test]
    fn even_motion_stays_at_uneven_times_and_at_the_ends() {
        let times: Vec<f64> = (0..60).map(|i| 0.02 * f64::from(i) + 0.007 * f64::from(i * i % 3)).collect();
        let plane = Bivector::new(0.6, -1.1, 0.3);
        let keys: Vec<Rotor> = times.iter().map(|&secs| Rotor::from_plane_angles(plane * secs)).collect();
        let places: Vec<glam::DVec3> =
            times.iter().map(|&secs| glam::DVec3::new(secs, 2.0, -3.0 * secs)).collect();
        let times = Times::Listed(times.into());
        let track = RotationTrack::from_rotors(times.clone(), keys.clone());
        let smooth = track.smoothed(&Smoothing::gaussian(4.0), &always);
        for (key, wanted) in keys.iter().enumerate() {
            assert!(smooth.keys[key].turn_to(*wanted) < 1e-6, "key {key}");
        }
        let moved = VectorTrack::straight(times, places.clone()).smoothed(&Smoothing::gaussian(4.0), &always);
        for (key, wanted) in places.iter().enumerate() {
            assert!(moved.keys[key].distance(*wanted) < 1e-6, "key {key}");
        }
    }

    #[test]
    fn masked_keys_keep_their_bits_and_the_bound_holds() {
        let mut noise = 7_u64;
        let mut small = || {
            noise = noise.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
            ((noise >> 40) as f64 / f64::from(1 << 24) - 0.5) * 0.2
        };
        let keys: Vec<Rotor> = (0..200)
            .map(|_| Rotor::from_plane_angles(Bivector::new(small(), small(), small())).scale(-1.0))
            .collect();
        let track = RotationTrack::from_rotors(even(200), keys);
        let share = |secs: f64| if (0.5..1.0).contains(&secs) { 0.0 } else { 1.0 };
        let smoothing = Smoothing { most_rad: Some(0.05), ..Smoothing::gaussian(2.0) };
        let smooth = track.smoothed(&smoothing, &share);
        for key in 0..200 {
            let is_masked = (50..100).contains(&key);
            let is_end = key == 0 || key == 199;
            assert_eq!(smooth.keys[key] == track.keys[key], is_masked || is_end, "key {key}");
            assert!(smooth.keys[key].turn_to(track.keys[key]) < 0.05);
            assert!(smooth.keys[key].dot(track.keys[key]) > 0.0, "the stored sign stays");
        }
    }
}
