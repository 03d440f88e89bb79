//! The way of a limb's tip around the playhead, a place for each frame. What was worked out for one frame serves the next.

use std::collections::BTreeMap;
use std::sync::Arc;

use glam::DVec3;

use crate::clip::Clip;

use super::figure::{scene_from_joint, tip_of};

/// Seconds of a tip's way that are drawn before and after the playhead: more would be a ball of wool.
const AROUND_SECS: f64 = 0.7;
/// At most so many places to either side: at higher rates every second, third … frame is shown.
const MOST: usize = 120;
/// At least so many frames to either side, where frames are long.
const LEAST: usize = 8;

/// Places of one joint's tip by frame.
#[derive(Clone, Debug, Default)]
pub struct Trail {
    of: Option<(Arc<Clip>, usize)>,
    places: BTreeMap<usize, DVec3>,
}

impl Trail {
    /// The places at the frames around a time, and which of them is the one shown there.
    pub fn around(&mut self, clip: &Arc<Clip>, joint: usize, time_secs: f64) -> (Vec<DVec3>, usize) {
        let is_known = self.of.as_ref().is_some_and(|(known, of)| Arc::ptr_eq(known, clip) && *of == joint);
        if !is_known {
            self.of = Some((Arc::clone(clip), joint));
            self.places.clear();
        }
        let frames = frames_around(clip, time_secs);
        let tip = tip_of(&clip.skeleton, joint);
        let (first, last) = (frames.first().copied().unwrap_or(0), frames.last().copied().unwrap_or(0));
        self.places.retain(|frame, _| (first..=last).contains(frame));
        let place = |&frame: &usize| {
            *self
                .places
                .entry(frame)
                .or_insert_with(|| scene_from_joint(clip, joint, clip.grid.time(frame)).transform_point3(tip))
        };
        let points: Vec<DVec3> = frames.iter().map(place).collect();
        let now = clip.grid.frame(time_secs);
        let current = frames.partition_point(|&frame| frame < now).min(frames.len().saturating_sub(1));
        (points, current)
    }
}

/// The frames whose places are shown: rising, all of them near the time unless the rate is high, and then always the same ones
/// besides that of the time itself.
fn frames_around(clip: &Clip, time_secs: f64) -> Vec<usize> {
    let count = clip.grid.count();
    if count == 0 {
        return Vec::new();
    }
    let now = clip.grid.frame(time_secs).min(count - 1);
    let wide = ((AROUND_SECS * clip.grid.rate).ceil() as usize).max(LEAST);
    let stride = wide.div_ceil(MOST).max(1);
    let (first, last) = (now.saturating_sub(wide), (now + wide).min(count - 1));
    (first..=last).filter(|&frame| frame % stride == 0 || frame == now).collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::clip::{FrameGrid, JointTracks, RotationTrack};
    use crate::rotor::Axis;
    use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

    fn turning(rate: f64) -> Arc<Clip> {
        let joint = Joint {
            name: "arm".to_owned(),
            number: 0,
            parent: None,
            rest: Transform::IDENTITY,
            kind: JointKind::Joint,
            tips: vec![DVec3::X],
        };
        let grid = FrameGrid::even(rate, 4.0);
        let keys: Vec<_> = grid.times.iter().map(|secs| Axis::Z.rotor(secs)).collect();
        let track = RotationTrack::from_rotors(grid.times.clone(), keys);
        Arc::new(Clip {
            name: String::new(),
            skeleton: Arc::new(Skeleton::new(vec![joint]).unwrap()),
            joints: vec![Arc::new(JointTracks { rotation: Some(track), ..JointTracks::default() })],
            grid,
            duration_secs: 4.0,
        })
    }

    #[test]
    fn a_place_for_each_frame_around_the_time() {
        let clip = turning(30.0);
        let mut trail = Trail::default();
        let (points, current) = trail.around(&clip, 0, 2.0);
        assert_eq!((points.len(), current), (43, 21));
        for (i, point) in points.iter().enumerate() {
            let secs = f64::from(60 - 21 + i as u32) / 30.0;
            assert!(point.distance(DVec3::new(secs.cos(), secs.sin(), 0.0)) < 1e-9, "{i}");
        }
        // A step on keeps what is known, and starts anew for another joint's clip.
        let (next, current) = trail.around(&clip, 0, 2.0 + 1.0 / 30.0);
        assert_eq!((next[..42].to_vec(), current), (points[1..].to_vec(), 21));
        let (start, current) = trail.around(&clip, 0, 0.0);
        assert_eq!((start.len(), current), (22, 0));
    }

    #[test]
    fn at_high_rates_frames_are_left_out_evenly() {
        let clip = turning(1000.0);
        let (points, current) = Trail::default().around(&clip, 0, 2.0);
        assert!(points.len() <= 2 * MOST + 2, "{}", points.len());
        assert!(points[current].distance(DVec3::new(2_f64.cos(), 2_f64.sin(), 0.0)) < 1e-9);
    }
}
