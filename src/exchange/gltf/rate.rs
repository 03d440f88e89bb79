//! The frame rate that a clip's key times speak of.

/// Rates that files are made at, in frames per second.
const USUAL_RATES: [f64; 11] = [24.0, 25.0, 30.0, 48.0, 50.0, 60.0, 72.0, 90.0, 100.0, 120.0, 240.0];
/// Writers work times out in 32 bits, by some steps each of which rounds.
const ROUNDINGS: f64 = 8.0;
/// The rate of a clip without two keys.
const RATE_OF_NOTHING: f64 = 30.0;
/// More frames than this come from damaged times, not from motion: four hours at 240 a second.
const MAX_FRAMES: f64 = 3_456_000.0;

/// A rate whose frames hold no such share of the keys is not that of the clip.
const MOST_KEYS: f64 = 0.9;
/// The same of a rate that files are made at: after a pause all keys may lie beside its frames.
const MOST_KEYS_OF_USUAL: f64 = 0.6;
/// And one that holds this share is, if it is the lowest.
const NEARLY_ALL_KEYS: f64 = 0.98;

/// Frames per second from the middle one of all steps from key to key; where keys lie beside its frames, the lowest usual rate whose frames
/// hold them. A usual rate (or 1000/1001 of it) is taken where
/// the step, over the whole length, is as near to it as times of 32 bits can tell; else a whole rate; else the step itself.
///
/// `tracks` are the key times of each sampler in seconds, strictly rising; `duration_secs` is the last of all keys.
pub(super) fn frame_rate(tracks: &[&[f64]], duration_secs: f64) -> f64 {
    let mut steps: Vec<f64> =
        tracks.iter().flat_map(|times| times.windows(2).map(|pair| pair[1] - pair[0])).collect();
    if steps.is_empty() {
        return RATE_OF_NOTHING;
    }
    let middle = steps.len() / 2;
    let median = *steps.select_nth_unstable_by(middle, f64::total_cmp).1;
    // Two rounded times: each off by half of the spacing of 32-bit floats at the last key.
    let blur = duration_secs.abs() * f64::from(f32::EPSILON) + f64::from(f32::MIN_POSITIVE);
    let (step, blur) = refined(median, blur, tracks).unwrap_or((median, blur));
    let rate = usual(step, blur).unwrap_or(1.0 / step);
    let slack = ROUNDINGS * duration_secs.abs() * f64::from(f32::EPSILON);
    let is_usual = rate >= USUAL_RATES[0] - 0.1;
    let rate = if on_grid(tracks, rate, slack) < if is_usual { MOST_KEYS_OF_USUAL } else { MOST_KEYS } {
        // Few keys, set by hand or left over: frames lie closer than keys.
        finer(tracks, rate, slack).unwrap_or(rate)
    } else {
        rate
    };
    rate.min(MAX_FRAMES / duration_secs.max(f64::MIN_POSITIVE))
}

/// The share of all keys that lie on frames of a rate, within `slack` seconds.
fn on_grid(tracks: &[&[f64]], rate: f64, slack: f64) -> f64 {
    let keys = || tracks.iter().flat_map(|times| times.iter());
    let is_on = |secs: &&f64| ((*secs * rate).round() / rate - *secs).abs() <= slack;
    keys().filter(is_on).count() as f64 / keys().count().max(1) as f64
}

/// The lowest usual rate above this one whose frames hold nearly all keys.
fn finer(tracks: &[&[f64]], rate: f64, slack: f64) -> Option<f64> {
    let mut rates: Vec<f64> = USUAL_RATES.iter().flat_map(|rate| [*rate, rate * 1000.0 / 1001.0]).collect();
    rates.sort_by(f64::total_cmp);
    // Frames so close that any time lies on one tell nothing.
    let told = |own: &f64| *own > rate && slack * own < 0.05;
    rates.into_iter().filter(told).find(|own| on_grid(tracks, *own, slack) >= NEARLY_ALL_KEYS)
}

/// The mean step of the even track with the most keys, and how far off it may be. The ends alone are rounded, so both
/// shrink with the number of keys: a step of 0.008333 s is not a 120th, since after thousands of keys it would be one key off.
/// Longer tracks may have keys put between, where a joint turns far from frame to frame.
fn refined(median: f64, blur: f64, tracks: &[&[f64]]) -> Option<(f64, f64)> {
    let even = tracks.iter().filter_map(|times| {
        let [first, .., last] = times else { return None };
        let n_steps = times.len() - 1;
        let mean = (last - first) / n_steps as f64;
        ((mean - median).abs() <= blur).then_some((n_steps, mean))
    });
    let (n_steps, mean) = even.max_by_key(|(n_steps, _)| *n_steps)?;
    Some((mean, blur.min(ROUNDINGS * blur / n_steps as f64)))
}

fn usual(step: f64, blur: f64) -> Option<f64> {
    let apart = |rate: &f64| (1.0 / rate - step).abs();
    let candidates = USUAL_RATES.iter().flat_map(|rate| [*rate, rate * 1000.0 / 1001.0]);
    let near = |rate: &f64| apart(rate) <= blur;
    candidates
        .filter(near)
        .min_by(|a, b| apart(a).total_cmp(&apart(b)))
        .or_else(|| Some((1.0 / step).round()).filter(|rate| *rate >= 1.0 && near(rate)))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[track_caller]
    fn check(rate: f64, n_keys: usize, expected: f64) {
        let times: Vec<f64> = (0..n_keys).map(|key| f64::from((key as f64 / rate) as f32)).collect();
        let found = frame_rate(&[&times], *times.last().unwrap());
        assert!((found - expected).abs() < 1e-9 * expected, "{rate}: expected {expected}, found {found}");
    }

    #[test]
    fn keys_put_between_the_frames_of_some_joints_leave_the_rate_alone() {
        let secs = |step: f64| f64::from((step * 0.008_333) as f32);
        let frames: Vec<f64> = (0..885).map(|frame| secs(f64::from(frame))).collect();
        let mut more = frames.clone();
        more.extend([40.5, 41.5, 300.5].map(secs));
        more.sort_by(f64::total_cmp);
        let found = frame_rate(&[&more, &frames], frames[884]);
        assert!((found * 0.008_333 - 1.0).abs() < 1e-6, "{found}");
    }

    #[test]
    fn a_few_keys_tell_the_frames_that_they_lie_on() {
        let keys = |rate: f64, frames: &[u32]| -> Vec<f64> {
            frames.iter().map(|frame| f64::from((f64::from(*frame) / rate) as f32)).collect()
        };
        for (rate, frames) in [
            (24.0, &[0, 10, 25, 41, 60][..]),
            (30.0, &[0, 7, 14, 15, 40, 61]),
            (60.0, &[0, 3, 6, 9, 13, 16, 20, 23, 26, 299]),
            (24_000.0 / 1001.0, &[0, 100, 250, 417, 1999]),
        ] {
            let times = keys(rate, frames);
            let found = frame_rate(&[&times], *times.last().unwrap());
            assert!((found - rate).abs() < 1e-9, "{rate}: found {found}");
        }
        // A pause of 0.2 s between frames at 24 a second.
        let mut paused: Vec<f64> = (0..17).map(|frame| f64::from(frame) / 24.0).collect();
        paused.extend((0..8).map(|frame| 16.0 / 24.0 + 0.2 + f64::from(frame) / 24.0));
        assert_eq!(frame_rate(&[&paused], paused[24]), 24.0);
        // At even steps nothing says that there are frames between, and times on no frame have their middle step.
        let even = keys(24.0, &[0, 10, 20, 30]);
        assert!((frame_rate(&[&even], 1.25) - 2.4).abs() < 1e-6);
        let loose = [0.0, 0.123_4, 0.251_7, 0.383_1, 0.502_9];
        assert!(frame_rate(&[&loose], 0.502_9) < 9.0);
    }

    #[test]
    fn usual_rates_are_known_again_in_rounded_times() {
        for rate in USUAL_RATES {
            for n_keys in [3, 50, 5000, 36000] {
                check(rate, n_keys, rate);
                check(rate * 1000.0 / 1001.0, n_keys, rate * 1000.0 / 1001.0);
            }
        }
        check(2.0, 12, 2.0);
        check(15.0, 100, 15.0);
    }

    #[test]
    fn other_rates_stay_what_they_are() {
        let times = [0.0, 1.25];
        assert_eq!(frame_rate(&[&times], 1.25), 0.8);
        assert_eq!(frame_rate(&[&[0.5]], 0.5), RATE_OF_NOTHING);
        assert_eq!(frame_rate(&[], 0.0), RATE_OF_NOTHING);
    }

    #[test]
    fn a_rate_that_would_drift_over_the_length_is_not_taken() {
        let times: Vec<f64> =
            (0..885_u16).map(|key| f64::from((f64::from(key) * 0.008_333) as f32)).collect();
        let found = frame_rate(&[&times], *times.last().unwrap());
        assert!((1.0 / found - 0.008_333).abs() < 1e-9, "found {found}");
    }

    #[test]
    fn damaged_times_do_not_ask_for_endless_frames() {
        let times = [0.0, 1e-38, 3e38];
        assert!(frame_rate(&[&times[..2], &times], 3e38) * 3e38 < 1e7);
    }
}
