//! Draws keys anew from the sound motion on both sides.

use crate::rotor::{Bivector, Rotor, slerp};

use super::draft::Draft;

/// How many keys beside the gap its end rates are fitted over; each is tried on the sound motion around.
const FITS: [usize; 3] = [3, 5, 8];

/// Keys to both sides in which pretended gaps are tried.
const TRIAL_KEYS: usize = 40;

/// A fitted bridge is taken when it leaves at most this share of slerp's squared error on pretended gaps.
const WORTH: f64 = 0.9;

/// Fewer pretended gaps prove nothing.
const TRIALS: usize = 6;

/// Above this turn across the gap the bridge has no sure side: slerp.
const WIDE_RAD: f64 = 2.6;

/// With sound keys on one side only, so few keys go on at the rate beside them, fitted over so many; more hold the nearest.
const LEAD_KEYS: usize = 2;
const LEAD_FIT: usize = 4;

/// Draws `first..=last` anew. Where only one side has sound keys the motion beside leads on, or is held; without any there is no turn.
pub(super) fn redraw(draft: &mut Draft, first: usize, last: usize) {
    let (left, right) = (draft.sound_before(first), draft.sound_after(last));
    let poses: Vec<Rotor> = match (left, right) {
        (Some(left), Some(right)) if !draft.is_held_after(left) => {
            bridge(draft, left, right).skip(first - left - 1).take(last + 1 - first).collect()
        }
        (Some(held), None) | (None, Some(held)) if last - first < LEAD_KEYS => led(draft, held, first..=last),
        (Some(held), _) | (None, Some(held)) => {
            vec![draft.unit(held).unwrap_or(Rotor::IDENTITY); last + 1 - first]
        }
        (None, None) => vec![Rotor::IDENTITY; last + 1 - first],
    };
    write(draft, first, &poses);
}

/// Poses of a few keys at an end: where the sound motion beside them leads to.
fn led(draft: &Draft, held: usize, keys: std::ops::RangeInclusive<usize>) -> Vec<Rotor> {
    let pose = draft.unit(held).unwrap_or(Rotor::IDENTITY);
    let beside = if *keys.start() > held {
        held.saturating_sub(LEAD_FIT)..held
    } else {
        held + 1..(held + 1 + LEAD_FIT).min(draft.len())
    };
    let is_moving = beside.len() >= LEAD_FIT && !draft.is_held_after(held);
    let rate = rate_of(&offsets(draft, held, beside)).filter(|_| is_moving).unwrap_or(Bivector::ZERO);
    keys.map(|key| (pose * Rotor::from_plane_angles(rate * (draft.secs(key) - draft.secs(held)))).normalize())
        .collect()
}

/// Writes other poses from key `first` on, with the tangents that follow from them where the track has such.
pub(super) fn write(draft: &mut Draft, first: usize, poses: &[Rotor]) {
    let near = draft.sound_before(first).or_else(|| draft.sound_after(first));
    let mut played = near.and_then(|key| draft.unit(key)).unwrap_or(Rotor::IDENTITY);
    let last = first + poses.len().max(1) - 1;
    let was = draft.triple(last);
    for (key, pose) in (first..).zip(poses) {
        played = draft.unit(key).unwrap_or(played);
        draft.set_pose(key, *pose, played);
    }
    if let Some(was) = was.filter(|_| !poses.is_empty()) {
        draft.meet_after(first, last, was);
    }
    if draft.tangents.is_some() {
        for key in first..first + poses.len() {
            let tangent = tangent(draft, key);
            draft.set_numbers(key, draft.keys[key], Some([tangent; 2]));
        }
    }
}

/// Poses of the keys between two sound ones.
fn bridge(draft: &Draft, left: usize, right: usize) -> impl Iterator<Item = Rotor> {
    let (fit, weight) = best_fit(draft, left, right);
    let curve = (weight > 0.0).then(|| Hermite::new(draft, left, right, fit)).flatten();
    let ends = [left, right].map(|key| draft.unit(key).unwrap_or(Rotor::IDENTITY));
    let (start, end) = (draft.secs(left), draft.secs(right));
    let shares: Vec<f64> = (left + 1..right).map(|key| (draft.secs(key) - start) / (end - start)).collect();
    shares.into_iter().map(move |share| {
        let straight = slerp(ends[0], ends[1], share);
        match &curve {
            Some(curve) => slerp(straight, curve.at(share), weight).normalize(),
            None => straight.normalize(),
        }
    })
}

/// Over how many keys to fit end rates, and how much of the fitted bridge to take beside slerp: tried on gaps of the same
/// length in the sound motion around, so that noise, which makes rates worthless, tells against it by itself.
fn best_fit(draft: &Draft, left: usize, right: usize) -> (usize, f64) {
    let gap = right - left;
    let before = left.saturating_sub(TRIAL_KEYS.max(2 * gap))..=left;
    let after = right..=(right + TRIAL_KEYS.max(2 * gap)).min(draft.len() - 1);
    let stride = (gap / 4).max(1);
    let mut tried = FITS.map(|_| Tried::default());
    for side in [before, after] {
        let (low, high) = (*side.start(), *side.end());
        for start in low..=high.saturating_sub(gap) {
            let is_asked = FITS.map(|fit| {
                start >= low + fit - 1
                    && (start - (low + fit - 1)).is_multiple_of(stride)
                    && start + gap + fit - 1 <= high
            });
            if is_asked.contains(&true) {
                try_gap(draft, start, gap, is_asked, &mut tried);
            }
        }
    }
    let mut best = (0, 0.0);
    let mut least_left = WORTH;
    for (fit, Tried { rr, rc, cc, trials }) in FITS.into_iter().zip(tried) {
        if trials >= TRIALS && cc > 0.0 {
            let weight = (rc / cc).clamp(0.0, 1.0);
            let left_over = (rr - 2.0 * weight * rc + weight * weight * cc) / rr.max(f64::MIN_POSITIVE);
            if left_over < least_left {
                least_left = left_over;
                best = (fit, weight);
            }
        }
    }
    best
}

/// What pretended gaps have shown: sums of products of what slerp misses and what the bridge offers.
#[derive(Clone, Copy, Default)]
struct Tried {
    rr: f64,
    rc: f64,
    cc: f64,
    trials: usize,
}

/// Tries one pretended gap with the fits that are asked for.
fn try_gap(
    draft: &Draft,
    start: usize,
    gap: usize,
    is_asked: [bool; FITS.len()],
    tried: &mut [Tried; FITS.len()],
) {
    let middle = start + gap / 2;
    let (Some(a), Some(truth), Some(b)) = (draft.unit(start), draft.unit(middle), draft.unit(start + gap))
    else {
        return;
    };
    let Some(way) = Way::new(draft, start, start + gap) else { return };
    let share = (draft.secs(middle) - draft.secs(start)) / (draft.secs(start + gap) - draft.secs(start));
    let straight = slerp(a, b, share);
    let missed = (straight.reverse() * truth).plane_angles();
    // The poses of the widest fit serve the narrower ones too.
    let farthest =
        FITS.iter().zip(is_asked).filter(|(_, asked)| *asked).map(|(fit, _)| *fit).max().unwrap_or(0);
    let before = offsets(draft, start, (start + 1).saturating_sub(farthest)..start);
    let after = offsets(draft, start + gap, start + gap + 1..(start + gap + farthest).min(draft.len()));
    for ((fit, asked), tried) in FITS.into_iter().zip(is_asked).zip(tried) {
        if !asked {
            continue;
        }
        let first = before.partition_point(|(key, ..)| *key < start + 1 - fit);
        let last = after.partition_point(|(key, ..)| *key < start + gap + fit);
        let rates = (rate_of(&before[first..]), rate_of(&after[..last]));
        let (Some(rate_left), Some(rate_right)) = rates else { continue };
        let curve = way.with_rates(rate_left, rate_right);
        let offered = (straight.reverse() * curve.at(share)).plane_angles();
        tried.rr += missed.dot(missed);
        tried.rc += missed.dot(offered);
        tried.cc += offered.dot(offered);
        tried.trials += 1;
    }
}

/// A cubic in the plane angles against the left end, with fitted rates at both ends.
pub(super) struct Hermite {
    from: Rotor,
    to: Bivector,
    slopes: [Bivector; 2],
}

impl Hermite {
    /// Rates are fitted over `fit` keys on each side. `None` where there are none, or the way across has no sure side.
    pub(super) fn new(draft: &Draft, left: usize, right: usize, fit: usize) -> Option<Self> {
        let way = Way::new(draft, left, right)?;
        let rate_left = rate_of(&offsets(draft, left, (left + 1).saturating_sub(fit)..left))?;
        let rate_right = rate_of(&offsets(draft, right, right + 1..(right + fit).min(draft.len())))?;
        Some(way.with_rates(rate_left, rate_right))
    }

    /// At a share of the way, 0 to 1.
    pub(super) fn at(&self, t: f64) -> Rotor {
        let (t2, t3) = (t * t, t * t * t);
        let angles = self.slopes[0] * (t3 - 2.0 * t2 + t)
            + self.to * (3.0 * t2 - 2.0 * t3)
            + self.slopes[1] * (t3 - t2);
        self.from * Rotor::from_plane_angles(angles)
    }
}

/// The way across a gap.
#[derive(Clone, Copy)]
struct Way {
    from: Rotor,
    /// The turn across, and its plane angles.
    across: Rotor,
    to: Bivector,
    secs: f64,
}

impl Way {
    /// `None` where an end is no rotation or the way has no sure side.
    fn new(draft: &Draft, left: usize, right: usize) -> Option<Self> {
        let (a, b) = (draft.unit(left)?, draft.unit(right)?);
        let secs = draft.secs(right) - draft.secs(left);
        let across = a.reverse() * b;
        let to = across.plane_angles();
        (to.length() <= WIDE_RAD && secs > 0.0).then_some(Self { from: a, across, to, secs })
    }

    /// The curve with these body rates at its ends, in radians per second.
    fn with_rates(self, left: Bivector, right: Bivector) -> Hermite {
        // The slope of the plane angles at the right end, by a small step along its rate.
        let small = 1e-4 / right.length().max(1e-9);
        let near =
            |sign: f64| (self.across * Rotor::from_plane_angles(right * (sign * small))).plane_angles();
        let slope_right = (near(1.0) - near(-1.0)) * (0.5 / small);
        Hermite { from: self.from, to: self.to, slopes: [left * self.secs, slope_right * self.secs] }
    }
}

/// Keys on one side of `key` in their order, each with its turn from there as plane angles and its time from there in seconds.
fn offsets(draft: &Draft, key: usize, others: std::ops::Range<usize>) -> Vec<(usize, Bivector, f64)> {
    let Some(here) = draft.unit(key) else { return Vec::new() };
    let here = here.reverse();
    others
        .filter_map(|other| {
            let pose = draft.unit(other)?;
            Some((other, (here * pose).plane_angles(), draft.secs(other) - draft.secs(key)))
        })
        .collect()
}

/// The body rate at a key from [`offsets`] on one side of it, in radians per second: least squares of a parabola
/// through the key (of a line, with two keys or fewer).
fn rate_of(offsets: &[(usize, Bivector, f64)]) -> Option<Bivector> {
    let (mut t2, mut t3, mut t4) = (0.0, 0.0, 0.0);
    let (mut ty, mut tty) = (Bivector::ZERO, Bivector::ZERO);
    for &(_, y, t) in offsets {
        t2 += t * t;
        t3 += t * t * t;
        t4 += t * t * t * t;
        ty = ty + y * t;
        tty = tty + y * (t * t);
    }
    let count = offsets.len();
    if count == 0 || t2 <= 0.0 {
        return None;
    }
    let det = t2 * t4 - t3 * t3;
    if count <= 2 || det <= 1e-9 * t2 * t4 {
        return Some(ty * (1.0 / t2));
    }
    Some((ty * t4 - tty * t3) * (1.0 / det))
}

/// The derivative of the four numbers at a redrawn key, per second, by its neighbours.
pub(super) fn tangent(draft: &Draft, key: usize) -> Rotor {
    let own = draft.keys[key];
    let (before, after) = (key.saturating_sub(1), (key + 1).min(draft.len() - 1));
    let secs = draft.secs(after) - draft.secs(before);
    let (Some(a), Some(b)) = (draft.unit(before), draft.unit(after)) else { return own.scale(0.0) };
    if secs <= 0.0 {
        return own.scale(0.0);
    }
    let rate = (a.reverse() * b).plane_angles() * (1.0 / secs);
    // d/dt of q·exp(angles) is q times half the rate, with the minus of the rotor's exponent.
    own * Rotor::from_parts(0.0, rate * -0.5)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::clip::{RotationTrack, Times};
    use crate::rotor::Axis;

    fn smooth(count: usize) -> Vec<Rotor> {
        let turn = |i: usize| {
            let t = i as f64 / 20.0;
            Axis::Z.rotor((t * 2.0).sin()) * Axis::X.rotor(0.6 * (t * 3.0).cos())
        };
        (0..count).map(turn).collect()
    }

    #[test]
    fn a_smooth_motion_is_bridged_far_better_than_by_slerp() {
        let truth = smooth(120);
        let track = RotationTrack::from_rotors(Times::Even { step_secs: 0.05, count: 120 }, truth.clone());
        let mut draft = Draft::new(&track);
        (60..66).for_each(|key| draft.keys[key] = Rotor::new(f64::NAN, 0.0, 0.0, 0.0));
        redraw(&mut draft, 60, 65);
        for key in 60..66 {
            let share = (key - 59) as f64 / 7.0;
            let straight = slerp(truth[59], truth[66], share).turn_to(truth[key]);
            assert!(draft.keys[key].turn_to(truth[key]) < 0.2 * straight, "key {key}");
        }
    }

    #[test]
    fn without_two_sides_a_key_is_held_and_without_any_there_is_no_turn() {
        let nan = Rotor::new(f64::NAN, 0.0, 0.0, 0.0);
        let sound = Axis::Y.rotor(0.4);
        let mut draft = Draft::new(&RotationTrack::from_rotors(
            Times::Even { step_secs: 0.1, count: 3 },
            vec![nan, sound, nan],
        ));
        redraw(&mut draft, 0, 0);
        redraw(&mut draft, 2, 2);
        assert_eq!(draft.keys[..], [sound, sound, sound]);
        let lone = RotationTrack::from_rotors(Times::Even { step_secs: 0.1, count: 1 }, vec![nan]);
        let mut draft = Draft::new(&lone);
        redraw(&mut draft, 0, 0);
        assert_eq!(draft.keys[..], [Rotor::IDENTITY]);
    }
}
