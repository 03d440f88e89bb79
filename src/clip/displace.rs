//! Soft pushes: a turn added around one moment, fading to nothing on both sides.

use crate::rotor::{Bivector, Rotor};

use super::key_edit::{NewKey, with_new_keys, with_turned_keys};
use super::path::PathKind;
use super::rotation_track::{RotationTrack, Stored};
use super::take::Clip;
use super::times::Times;

/// In whose planes a push is given.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash)]
pub enum PushFrame {
    /// The joint's own planes as they lie at each moment: what hangs on it turns about its own limb.
    #[default]
    Own,
    /// The joint's planes at rest.
    Rest,
    /// The parent's planes.
    Parent,
    /// The scene's planes.
    World,
}

impl PushFrame {
    /// All, in the order of lists.
    pub const ALL: [Self; 4] = [Self::Own, Self::Rest, Self::Parent, Self::World];

    /// Its name in files and lists.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Own => "own",
            Self::Rest => "rest",
            Self::Parent => "parent",
            Self::World => "world",
        }
    }

    /// The frame of that name.
    pub fn named(name: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|frame| frame.name() == name)
    }
}

/// A turn added to one joint around one moment.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Push {
    /// Which joint.
    pub joint: usize,
    /// The moment of the whole turn, in seconds.
    pub center_secs: f64,
    /// Seconds from there to where nothing is left of it, to either side; above 0.
    pub reach_secs: f64,
    /// The turn at the moment itself, as plane angles in radians, of any size.
    pub turn: Bivector,
    /// In whose planes.
    pub frame: PushFrame,
}

impl Push {
    /// How much of the turn is added at a time, 0 to 1: a cubic B-spline over four equal knots, 0 from the reach on, with no
    /// jump in rate or acceleration (scaled to 1 in the middle).
    pub fn share(&self, time_secs: f64) -> f64 {
        let knots = 2.0 * ((time_secs - self.center_secs) / self.reach_secs).abs();
        if knots < 1.0 {
            1.0 + knots * knots * (0.75 * knots - 1.5)
        } else if knots < 2.0 {
            0.25 * (2.0 - knots).powi(3)
        } else {
            // Also for what is no number.
            0.0
        }
    }
}

/// `clip` with pushes, one after the other, each as `q'(t) = q(t) exp(d(t))` in its frame. Keys at times outside a push keep
/// their bits, and other joints stay shared.
///
/// Where a track has fewer keys within a push than the clip has frames there, keys are put at the frames first, so that the push
/// shows whole; a joint without keys gets some.
/// Tracks with smooth paths, which would run otherwise through more keys, are pushed at the keys they have. A push on a joint that is not there, or of a reach that is not
/// above 0, does nothing.
///
/// Source: Witkin & Popovic 1995, "Motion warping"; Bruderlin & Williams 1995, "Motion signal processing".
#[must_use]
pub fn pushed(clip: &Clip, pushes: &[Push]) -> Clip {
    pushes.iter().fold(clip.clone(), |clip, push| pushed_once(&clip, push).unwrap_or(clip))
}

fn pushed_once(clip: &Clip, push: &Push) -> Option<Clip> {
    let own = clip.skeleton.joints().get(push.joint)?;
    if !(push.reach_secs > 0.0 && push.turn.is_finite() && push.center_secs.is_finite()) {
        return None;
    }
    let track = with_frames(clip, push)?;
    let parent = own.parent;
    let changes: Vec<(usize, Rotor)> = (0..track.keys.len())
        .filter_map(|key| {
            let secs = track.times.at(key);
            let share = push.share(secs);
            if share == 0.0 {
                return None;
            }
            let now = track.sound_key(key);
            let turn = Rotor::from_plane_angles(push.turn * share);
            let above = |frame: Rotor| frame * turn * frame.reverse() * now;
            let pushed = match push.frame {
                PushFrame::Own => now * turn,
                PushFrame::Rest => above(own.rest.rotation),
                PushFrame::Parent => turn * now,
                PushFrame::World => match parent {
                    Some(parent) => above(clip.world_at(secs)[parent].rotation.reverse()),
                    None => turn * now,
                },
            };
            Some((key, pushed.normalize().aligned_to(track.keys[key])))
        })
        .collect();
    if changes.is_empty() {
        return None;
    }
    Some(clip.with_rotation(push.joint, with_turned_keys(&track, &changes)))
}

/// The joint's track with a key at each frame within the push.
fn with_frames(clip: &Clip, push: &Push) -> Option<RotationTrack> {
    let [start, end] = [push.center_secs - push.reach_secs, push.center_secs + push.reach_secs];
    let within = |secs: &f64| start <= *secs && *secs <= end;
    let frames: Vec<f64> = clip.grid.times.iter().filter(within).collect();
    let track = if let Some(track) = clip.rotation(push.joint).filter(|track| !track.keys.is_empty()) {
        track.clone()
    } else {
        let rest = clip.skeleton.joints()[push.joint].rest.rotation;
        let first = clip.grid.times.span()?.0;
        RotationTrack::from_rotors(Times::Listed([first].into()), [rest])
    };
    let own = track.times.iter().filter(within).count();
    let plays_on = |segment: usize| {
        matches!(track.kind_of(segment, None), PathKind::Hold | PathKind::Slerp | PathKind::Cubic)
    };
    if own >= frames.len() || track.stored != Stored::Rotors || !(0..track.segment_count()).all(plays_on) {
        return Some(track);
    }
    let near = 0.25 / clip.grid.rate.max(1e-6);
    let is_new = |secs: &f64| (track.times.at(track.times.nearest(*secs)) - secs).abs() > near;
    let new: Vec<NewKey> =
        frames.into_iter().filter(is_new).map(|secs| NewKey { secs, rotor: None }).collect();
    Some(with_new_keys(&track, &new, near))
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::*;
    use crate::clip::{FrameGrid, JointTracks};
    use crate::rotor::Axis;
    use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

    /// A parent that turns about x, and a child with a rest of its own, keyed at every tenth of a second.
    fn clip() -> Clip {
        let joint = |number, parent, rest| Joint {
            name: format!("j{number}"),
            number,
            parent,
            rest: Transform { rotation: rest, ..Transform::IDENTITY },
            kind: JointKind::Joint,
            tips: vec![],
        };
        let skeleton =
            Skeleton::new(vec![joint(0, None, Rotor::IDENTITY), joint(1, Some(0), Axis::Y.rotor(0.5))])
                .unwrap();
        let grid = FrameGrid::even(10.0, 2.0);
        let track = |axis: Axis| {
            let keys: Vec<Rotor> = (0..21).map(|key| axis.rotor(0.1 * f64::from(key))).collect();
            Arc::new(JointTracks {
                rotation: Some(RotationTrack::from_rotors(grid.times.clone(), keys)),
                ..JointTracks::default()
            })
        };
        Clip {
            name: String::new(),
            skeleton: Arc::new(skeleton),
            joints: vec![track(Axis::X), track(Axis::Z)],
            grid: grid.clone(),
            duration_secs: 2.0,
        }
    }

    fn push(frame: PushFrame) -> Push {
        let turn = Bivector::new(0.0, 0.3, 0.1);
        Push { joint: 1, center_secs: 1.0, reach_secs: 0.5, turn, frame }
    }

    #[test]
    fn the_bump_is_the_cubic_b_spline() {
        // scipy.interpolate.BSpline.basis_element([-2, -1, 0, 1, 2])(x) / its value at 0, at x = 0, 0.5, 1, 1.5, 2.
        let push = Push { reach_secs: 2.0, center_secs: 0.0, ..push(PushFrame::Own) };
        for (secs, share) in
            [(0.0, 1.0), (0.5, 0.718_75), (1.0, 0.25), (1.5, 0.031_25), (2.0, 0.0), (-0.5, 0.718_75)]
        {
            assert!((push.share(secs) - share).abs() < 1e-15, "{secs}");
        }
        assert_eq!(push.share(f64::NAN), 0.0);
    }

    #[test]
    fn each_frame_turns_in_its_own_planes() {
        let clip = clip();
        let turn = Rotor::from_plane_angles(push(PushFrame::Own).turn);
        let world = |clip: &Clip| clip.world_at(1.0)[1].rotation;
        let local = |clip: &Clip| clip.local_at(1.0)[1].rotation;
        let after = PushFrame::ALL.map(|frame| pushed(&clip, &[push(frame)]));
        assert!(local(&after[0]).turn_to(local(&clip) * turn) < 1e-12);
        let rest = Axis::Y.rotor(0.5);
        let at_rest = rest * turn * rest.reverse() * local(&clip);
        assert!(local(&after[1]).turn_to(at_rest) < 1e-12);
        assert!(local(&after[2]).turn_to(turn * local(&clip)) < 1e-12);
        assert!(world(&after[3]).turn_to(turn * world(&clip)) < 1e-12);
        for after in &after {
            assert!(Arc::ptr_eq(&after.joints[0], &clip.joints[0]));
            let (old, new) = (clip.rotation(1).unwrap(), after.rotation(1).unwrap());
            // The share is 0 from the reach on, at keys 5 and 15.
            assert_eq!(new.changed_keys(old), (6..15).collect::<Vec<_>>());
        }
    }

    #[test]
    fn sparse_and_missing_tracks_get_keys_where_they_are_pushed() {
        let mut clip = clip();
        let sparse = RotationTrack::from_rotors(
            Times::Listed([0.0, 2.0].into()),
            vec![Rotor::IDENTITY, Axis::Z.rotor(2.0)],
        );
        clip = clip.with_rotation(1, sparse.clone());
        let after = pushed(&clip, &[push(PushFrame::Own)]);
        let track = after.rotation(1).unwrap();
        assert_eq!(track.keys.len(), 13, "two ends and eleven frames");
        assert!(track.at(0.2).turn_to(sparse.at(0.2)) < 1e-12);
        assert!(track.at(1.0).turn_to(sparse.at(1.0)) > 0.3);
        clip.joints[1] = Arc::default();
        let after = pushed(&clip, &[push(PushFrame::Parent)]);
        assert!(after.local_at(0.3)[1].rotation.turn_to(Axis::Y.rotor(0.5)) < 1e-12);
        assert!(after.local_at(1.0)[1].rotation.turn_to(Axis::Y.rotor(0.5)) > 0.3);
        // Nothing to push.
        let none =
            [Push { joint: 9, ..push(PushFrame::Own) }, Push { reach_secs: 0.0, ..push(PushFrame::Own) }];
        assert_eq!(pushed(&clip, &none), clip);
    }
}
