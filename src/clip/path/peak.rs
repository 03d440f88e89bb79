//! Where a segment turns fastest.

use super::super::rotation_track::RotationTrack;
use super::kind::PathKind;

/// Rates looked at in each piece of a smooth segment.
const SAMPLES: usize = 64;

/// The fastest moment of a segment.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Peak {
    /// Turn rate in radians per second.
    pub rate_rad: f64,
    /// When, in seconds.
    pub time_secs: f64,
}

impl RotationTrack {
    /// The highest turn rate inside a segment, its spacing included. Slerp and hold: exact. Other paths: the highest of 64 moments
    /// in each step of at most 120°, refined to 1e-9 of its value; what is missed is a second peak narrower than two of them.
    ///
    /// # Panics
    /// When the segment does not exist.
    pub fn highest_rate(&self, segment: usize) -> Peak {
        let (start, end) = (self.times.at(segment), self.times.at(segment + 1));
        let rate = |share: f64| self.segment_motion(segment, share, None).rate.length();
        let peak = |share: f64, rate_rad: f64| Peak { rate_rad, time_secs: start + (end - start) * share };
        let own = self.segments.of(segment);
        match self.kind_of(segment, None) {
            PathKind::Hold => return peak(0.0, 0.0),
            PathKind::Slerp if own.turn.plane().is_none() => {
                let (steepest, share) = own.spacing.steepest();
                return peak(
                    share,
                    self.path_motion(segment, 0.0, None).rate.length() / (end - start) * steepest,
                );
            }
            _ => {}
        }
        let samples = SAMPLES * self.lead(segment, |key| self.sound_key(key)).pieces.min(SAMPLES);
        let share_of = |sample: usize| sample as f64 / samples as f64;
        let (best, _) = (0..=samples)
            .map(|sample| (sample, rate(share_of(sample))))
            .fold((0, f64::NEG_INFINITY), |best, own| if own.1 > best.1 { own } else { best });
        let (mut low, mut high) = (share_of(best.saturating_sub(1)), share_of((best + 1).min(samples)));
        // Golden section (Kiefer 1953).
        let golden = (5.0_f64.sqrt() - 1.0) / 2.0;
        for _ in 0..40 {
            let (left, right) = (high - golden * (high - low), low + golden * (high - low));
            if rate(left) < rate(right) {
                low = left;
            } else {
                high = right;
            }
        }
        let candidates = [share_of(best), f64::midpoint(low, high)].map(|share| peak(share, rate(share)));
        if candidates[1].rate_rad > candidates[0].rate_rad { candidates[1] } else { candidates[0] }
    }
}
