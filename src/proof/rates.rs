//! How fast and how jerkily a joint turns, from its orientations at the frames.

use crate::clip::{Clip, RotationTrack};
use crate::rotor::Bivector;

/// A largest value and when it is reached.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Peak {
    /// The value, in the unit of the measure; 0 where nothing moves.
    pub value: f64,
    /// When, in seconds.
    pub at_secs: f64,
}

impl Peak {
    fn take(&mut self, value: f64, at_secs: f64) {
        if value > self.value {
            *self = Self { value, at_secs };
        }
    }
}

/// Turn rate and jerk of one joint.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct RateMeasure {
    /// Fastest turn, radians per second.
    pub fastest: Peak,
    /// Largest jerk, radians per second cubed.
    pub jerk: Peak,
    /// Root of the mean squared jerk, radians per second cubed.
    pub rms_jerk: f64,
}

/// Rates of a joint's turn relative to its parent, by differences between the frames of `clip`.
///
/// Rate: `Log(q₀⁻¹ q₁)/dt` in the middle of a step; acceleration and jerk are differences of these. Noise grows with
/// each of them: compare only clips at the same rate.
pub fn rates(track: &RotationTrack, clip: &Clip) -> RateMeasure {
    let mut measure = RateMeasure::default();
    let count = clip.grid.count();
    let (mut squares, mut jerks) = (0.0, 0_usize);
    let times: Vec<f64> = (0..count).map(|frame| clip.grid.time(frame)).collect();
    let rotors = track.at_all(&times);
    // Time of the middle of the last step, and the rate there; then the same for accelerations.
    let mut last_rate: Option<(f64, Bivector)> = None;
    let mut last_acceleration: Option<(f64, Bivector)> = None;
    for frame in 1..count {
        let (start, end) = (times[frame - 1], times[frame]);
        let rate = (rotors[frame - 1].reverse() * rotors[frame]).plane_angles() / (end - start);
        let middle = 0.5 * (start + end);
        measure.fastest.take(rate.length(), middle);
        if let Some((before, earlier)) = last_rate {
            let acceleration = (rate - earlier) / (middle - before);
            if let Some((before, earlier)) = last_acceleration {
                let jerk = ((acceleration - earlier) / (start - before)).length();
                measure.jerk.take(jerk, 0.5 * (start + before));
                squares += jerk * jerk;
                jerks += 1;
            }
            last_acceleration = Some((start, acceleration));
        }
        last_rate = Some((middle, rate));
    }
    measure.rms_jerk = if jerks == 0 { 0.0 } else { (squares / jerks as f64).sqrt() };
    measure
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::*;
    use crate::clip::{FrameGrid, JointTracks, Times};
    use crate::rotor::{Axis, Rotor};
    use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

    fn clip_of(keys: Vec<Rotor>, rate: f64) -> Clip {
        let joint = Joint {
            name: "Boom".to_owned(),
            number: 0,
            parent: None,
            rest: Transform::IDENTITY,
            kind: JointKind::Joint,
            tips: vec![],
        };
        let times = Times::Even { step_secs: 1.0 / rate, count: keys.len() };
        let duration_secs = times.at(keys.len() - 1);
        let track = RotationTrack::from_rotors(times.clone(), keys);
        Clip {
            name: String::new(),
            skeleton: Arc::new(Skeleton::new(vec![joint]).unwrap()),
            joints: vec![Arc::new(JointTracks { rotation: Some(track), ..JointTracks::default() })],
            grid: FrameGrid { times, rate },
            duration_secs,
        }
    }

    #[test]
    fn an_even_turn_has_its_rate_and_no_jerk() {
        // 90 degrees a second about z at 30 frames a second.
        let keys = (0..20).map(|frame| Axis::Z.rotor((3.0 * f64::from(frame)).to_radians())).collect();
        let clip = clip_of(keys, 30.0);
        let found = rates(clip.rotation(0).unwrap(), &clip);
        assert!((found.fastest.value.to_degrees() - 90.0).abs() < 1e-9, "{found:?}");
        assert!(found.jerk.value < 1e-6, "{found:?}");
    }

    #[test]
    fn a_cubic_turn_has_six_times_its_factor_as_jerk() {
        // The angle is t³ radians, so the jerk is 6 rad/s³ everywhere, and differences of a cubic are exact.
        let keys = (0..20).map(|frame| Axis::X.rotor((f64::from(frame) / 20.0).powi(3))).collect();
        let clip = clip_of(keys, 20.0);
        let found = rates(clip.rotation(0).unwrap(), &clip);
        assert!((found.jerk.value - 6.0).abs() < 1e-6 && (found.rms_jerk - 6.0).abs() < 1e-6, "{found:?}");
    }

    #[test]
    fn one_frame_neither_turns_nor_jerks() {
        let clip = clip_of(vec![Rotor::IDENTITY], 30.0);
        assert_eq!(rates(clip.rotation(0).unwrap(), &clip), RateMeasure::default());
    }
}
