//! Keys that were copied, to be put down elsewhere.

use crate::rotor::Rotor;
use crate::skeleton::Mirror;

use super::key_edit::{KeyChange, KeyEdit, NewKey};
use super::take::Clip;

/// Copied keys of some joints, with times from the first of them.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct CopiedKeys {
    rows: Vec<CopiedRow>,
}

#[derive(Clone, Debug, PartialEq)]
struct CopiedRow {
    joint: usize,
    keys: Vec<(f64, Rotor)>,
}

impl CopiedKeys {
    /// Copies keys: for each joint the numbers of the keys chosen. What is not there is left out.
    pub fn of(clip: &Clip, chosen: &[(usize, Vec<usize>)]) -> Self {
        let mut rows: Vec<CopiedRow> = chosen
            .iter()
            .filter_map(|(joint, keys)| {
                let track = clip.rotation(*joint)?;
                let own = keys.iter().filter(|&&key| key < track.keys.len());
                let keys: Vec<(f64, Rotor)> =
                    own.map(|&key| (track.times.at(key), track.sound_key(key))).collect();
                (!keys.is_empty()).then_some(CopiedRow { joint: *joint, keys })
            })
            .collect();
        let first =
            rows.iter().flat_map(|row| &row.keys).map(|(secs, _)| *secs).fold(f64::INFINITY, f64::min);
        for (secs, _) in rows.iter_mut().flat_map(|row| &mut row.keys) {
            *secs -= first;
        }
        Self { rows }
    }

    /// The whole pose at a time, as a key for each joint that is animated or listed in `joints`.
    pub fn of_pose(clip: &Clip, time_secs: f64, joints: &[usize]) -> Self {
        let pose = clip.local_at(time_secs);
        let row =
            |&joint: &usize| pose.get(joint).map(|own| CopiedRow { joint, keys: vec![(0.0, own.rotation)] });
        Self { rows: joints.iter().filter_map(row).collect() }
    }

    /// Whether nothing was copied.
    pub fn is_empty(&self) -> bool {
        self.rows.is_empty()
    }

    /// The joints, in the order in which they were copied.
    pub fn joints(&self) -> Vec<usize> {
        self.rows.iter().map(|row| row.joint).collect()
    }

    /// The same for the other side: each joint's keys for its partner, turned as the mirror shows them.
    #[must_use]
    pub fn mirrored(&self, mirror: &Mirror) -> Self {
        let row = |row: &CopiedRow| CopiedRow {
            joint: mirror.partner(row.joint),
            keys: row.keys.iter().map(|&(secs, key)| (secs, mirror.mirrored(row.joint, key))).collect(),
        };
        Self { rows: self.rows.iter().map(row).collect() }
    }

    /// The edits that put the keys down with the first of them at `at_secs`.
    pub fn pasted_at(&self, at_secs: f64) -> Vec<KeyEdit> {
        let edit = |row: &CopiedRow| {
            let keys = row.keys.iter().map(|&(secs, key)| NewKey { secs: at_secs + secs, rotor: Some(key) });
            KeyEdit { joint: row.joint, change: KeyChange::Insert(keys.collect()) }
        };
        self.rows.iter().map(edit).collect()
    }
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use glam::DVec3;

    use super::super::key_edit::with_key_edits;
    use super::*;
    use crate::clip::{FrameGrid, JointTracks, RotationTrack, Times};
    use crate::rotor::Axis;
    use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

    #[test]
    fn keys_are_put_down_later_and_on_the_other_side() {
        let joint = |name: &str, number, parent, x| Joint {
            name: name.to_owned(),
            number,
            parent,
            rest: Transform::from_translation(DVec3::new(x, 1.0, 0.0)),
            kind: JointKind::Joint,
            tips: vec![],
        };
        let skeleton = Skeleton::new(vec![
            joint("Hips", 0, None, 0.0),
            joint("LeftArm", 1, Some(0), 1.0),
            joint("RightArm", 2, Some(0), -1.0),
        ]);
        let skeleton = Arc::new(skeleton.unwrap());
        let times = Times::Listed([0.5, 1.0, 1.5].into());
        let keys = vec![Axis::Z.rotor(0.2), Axis::X.rotor(0.3), Axis::Y.rotor(0.4)];
        let track = RotationTrack::from_rotors(times, keys);
        let turned = Arc::new(JointTracks { rotation: Some(track.clone()), ..JointTracks::default() });
        let clip = Clip {
            name: String::new(),
            skeleton: Arc::clone(&skeleton),
            joints: vec![Arc::default(), turned, Arc::default()],
            grid: FrameGrid::even(10.0, 4.0),
            duration_secs: 4.0,
        };
        let copied = CopiedKeys::of(&clip, &[(1, vec![1, 2, 9]), (2, vec![0])]);
        assert_eq!(copied.joints(), [1]);
        let (later, missed) = with_key_edits(&clip, &copied.pasted_at(3.0));
        assert_eq!(missed, 0);
        assert!(later.rotation(1).unwrap().at(3.5).turn_to(Axis::Y.rotor(0.4)) < 1e-12);
        assert_eq!(later.rotation(1).unwrap().keys[..3], track.keys[..3]);
        let mirror = Mirror::of(&skeleton).unwrap();
        let (other, _) = with_key_edits(&clip, &copied.mirrored(&mirror).pasted_at(1.0));
        let right = other.rotation(2).unwrap();
        // Across x a turn about x stays and one about y turns round.
        assert!(right.at(1.0).turn_to(Axis::X.rotor(0.3)) < 1e-12);
        assert!(right.at(1.5).turn_to(Axis::Y.rotor(-0.4)) < 1e-12);
        assert!(Arc::ptr_eq(&other.joints[1], &clip.joints[1]));
        assert_eq!(CopiedKeys::of_pose(&clip, 1.0, &[1, 2]).joints(), [1, 2]);
    }
}
