//! Every joint in the scene at many times at once.

use glam::DVec3;

use crate::rotor::Rotor;
use crate::rotor::batch::{self, Bone, Level, Place, Streams, TREE_ROWS, TREE_TILES, Turns, World};
use crate::skeleton::WorldJoint;

use super::path::PathKind;
use super::take::Clip;

/// Where each joint stands and how it is turned in the scene, at some times.
#[derive(Clone, Debug)]
pub struct Worlds(Form);

#[derive(Clone, Debug)]
enum Form {
    /// Without scales a joint is a turn and a place.
    Rigid(Rigid),
    /// With scales: the joints at each time.
    Scaled(Vec<Vec<WorldJoint>>),
}

/// The times in groups as [`batch::place_tree`] takes them: for each group all joints.
#[derive(Clone, Debug)]
struct Rigid {
    worlds: Vec<World<f64>>,
    joints: usize,
    times: usize,
}

impl Rigid {
    /// Turn and place of a joint, part by part.
    ///
    /// # Panics
    /// When there is no such joint or time.
    fn parts(&self, joint: usize, time: usize) -> [f64; 7] {
        let Self { worlds, joints, times } = self;
        assert!(joint < *joints && time < *times, "expected {joints} joints and {times} times");
        let (tile, row) = (time / TREE_ROWS % TREE_TILES, time % TREE_ROWS);
        worlds[time / GROUP * joints + joint][tile].map(|column| column[row])
    }
}

/// Times of a group.
const GROUP: usize = TREE_ROWS * TREE_TILES;

/// Times that are sampled together, in whole groups; their turns stay in the cache of a core.
const SAMPLED: usize = 4 * GROUP;

impl Worlds {
    /// The product of all turns down to a joint, at the time with this index. Of scales only mirroring ones enter.
    ///
    /// # Panics
    /// When there is no such joint or time.
    pub fn rotation(&self, joint: usize, time: usize) -> Rotor {
        match &self.0 {
            Form::Rigid(rigid) => {
                let [s, yz, zx, xy, ..] = rigid.parts(joint, time);
                Rotor::new(s, yz, zx, xy)
            }
            Form::Scaled(times) => times[time][joint].rotation,
        }
    }

    /// Where a joint stands in the scene.
    ///
    /// # Panics
    /// When there is no such joint or time.
    pub fn position(&self, joint: usize, time: usize) -> DVec3 {
        match &self.0 {
            Form::Rigid(rigid) => {
                let [.., x, y, z] = rigid.parts(joint, time);
                DVec3::new(x, y, z)
            }
            Form::Scaled(times) => times[time][joint].position(),
        }
    }

    /// Where a point of a joint's own frame stands in the scene.
    ///
    /// # Panics
    /// When there is no such joint or time.
    pub fn point(&self, joint: usize, time: usize, point: DVec3) -> DVec3 {
        match &self.0 {
            Form::Rigid(_) => self.position(joint, time) + self.rotation(joint, time).apply(point),
            Form::Scaled(times) => times[time][joint].scene_from_joint.transform_point3(point),
        }
    }
}

impl Clip {
    /// [`Clip::world_at`] for each of `times_secs`, several times as fast for many. It takes 56 bytes for each joint and time:
    /// ask for some hundred times after the other.
    pub fn worlds_at(&self, times_secs: &[f64]) -> Worlds {
        self.worlds_at_by(times_secs, None)
    }

    /// As [`Clip::worlds_at`], with `path` in place of the tracks' own path kinds where it is given.
    pub fn worlds_at_by(&self, times_secs: &[f64], path: Option<PathKind>) -> Worlds {
        let joints = self.skeleton.joints();
        let is_scaled = |joint: usize| {
            let moves = self.joints.get(joint).and_then(|tracks| tracks.scale.as_ref());
            joints[joint].rest.scale != DVec3::ONE || moves.is_some_and(|track| !track.times.is_empty())
        };
        if (0..joints.len()).any(is_scaled) {
            let locals = self.locals_at_by(times_secs, path);
            return Worlds(Form::Scaled(locals.iter().map(|local| self.skeleton.world(local)).collect()));
        }
        let count = times_secs.len();
        let mut worlds = Vec::with_capacity(joints.len() * count.div_ceil(GROUP));
        let mut desk = Desk::new(joints.len(), count.min(SAMPLED));
        for times_secs in times_secs.chunks(SAMPLED) {
            self.place_sampled(times_secs, path, &mut desk, &mut worlds);
        }
        Worlds(Form::Rigid(Rigid { worlds, joints: joints.len(), times: count }))
    }

    /// The joints in the scene at up to [`SAMPLED`] times, behind those in `worlds`.
    fn place_sampled(
        &self,
        times_secs: &[f64],
        path: Option<PathKind>,
        desk: &mut Desk,
        worlds: &mut Vec<World<f64>>,
    ) {
        let joints = self.skeleton.joints();
        let Desk { turns, group, sampled } = desk;
        // Of the last group of a clip some rows may have no time; they keep what they were filled with before.
        let mut playing = self.playing(times_secs, path);
        for joint in 0..joints.len() {
            playing.turns(joint, sampled.parts_mut().map(|stream| &mut stream[..times_secs.len()]));
            for (part, stream) in sampled.parts().into_iter().enumerate() {
                for (tile, column) in turns.iter_mut().zip(stream.as_chunks().0) {
                    tile[joint][part] = *column;
                }
            }
        }
        for (group_index, times_secs) in times_secs.chunks(GROUP).enumerate() {
            let places: Vec<Option<Places>> =
                (0..joints.len()).map(|joint| self.places_of(joint, times_secs)).collect();
            let bones: Vec<Bone<'_, f64>> = joints
                .iter()
                .zip(&places)
                .map(|(joint, places)| {
                    let fixed = || Place::Fixed(joint.rest.translation.to_array());
                    Bone { parent: joint.parent, place: places.as_ref().map_or_else(fixed, Place::Each) }
                })
                .collect();
            let tile = |tile: usize| turns[group_index * TREE_TILES + tile].as_slice();
            batch::place_tree(Level::best(), &bones, std::array::from_fn(tile), group);
            worlds.extend_from_slice(group);
        }
    }

    /// Where a joint is in its parent's frame at the times of a group, if it moves there.
    fn places_of(&self, joint: usize, times_secs: &[f64]) -> Option<Places> {
        let tracks = self.joints.get(joint)?;
        let track = tracks.translation.as_ref().filter(|track| !track.times.is_empty())?;
        let rest = self.skeleton.joints()[joint].rest.translation;
        let mut places = [[[0.0; TREE_ROWS]; 3]; TREE_TILES];
        for (time, &secs) in times_secs.iter().enumerate() {
            let place = track.at(secs).unwrap_or(rest).to_array();
            for (column, part) in places[time / TREE_ROWS].iter_mut().zip(place) {
                column[time % TREE_ROWS] = part;
            }
        }
        Some(places)
    }
}

/// Where a joint is in its parent's frame at the times of a group.
type Places = [[[f64; TREE_ROWS]; 3]; TREE_TILES];

/// Room for what is worked out together.
struct Desk {
    /// For each tile that is sampled together all joints.
    turns: Vec<Vec<Turns<f64>>>,
    /// All joints of a group.
    group: Vec<World<f64>>,
    /// The turns of one joint.
    sampled: Streams<f64, 4>,
}

impl Desk {
    /// For up to `times` at once.
    fn new(joints: usize, times: usize) -> Self {
        let tiles = times.div_ceil(GROUP) * TREE_TILES;
        Self {
            turns: vec![vec![[[0.0; TREE_ROWS]; 4]; joints]; tiles],
            group: vec![[[[0.0; TREE_ROWS]; 7]; TREE_TILES]; joints],
            sampled: Streams::zeros(SAMPLED),
        }
    }
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::super::{FrameGrid, JointTracks, RotationTrack, Times, VectorTrack};
    use super::*;
    use crate::rotor::Bivector;
    use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

    /// A root that walks, and a chain of three that turn; the last of them has a size of its own or not.
    fn clip(scale: DVec3) -> Clip {
        let joint = |number: usize| Joint {
            name: format!("J{number}"),
            number,
            parent: number.checked_sub(1),
            rest: Transform {
                scale: if number == 2 { scale } else { DVec3::ONE },
                ..Transform::from_translation(DVec3::new(0.1, 1.0, -0.3))
            },
            kind: JointKind::Joint,
            tips: vec![],
        };
        let times = Times::Even { step_secs: 0.1, count: 30 };
        let tracks = (0..4).map(|joint| {
            let turn = |i: i32| {
                let i = f64::from(i + joint);
                Rotor::from_plane_angles(Bivector::new(i.sin(), 0.5 * i.cos(), 0.3 * i.sin()))
            };
            let keys: Vec<Rotor> = (0..30).map(turn).collect();
            let places: Vec<DVec3> = (0..30).map(|i| DVec3::new(f64::from(i), 0.5, 0.0)).collect();
            Arc::new(JointTracks {
                rotation: (joint != 1).then(|| RotationTrack::from_rotors(times.clone(), keys)),
                translation: (joint == 0).then(|| VectorTrack::straight(times.clone(), places)),
                scale: None,
            })
        });
        Clip {
            name: String::new(),
            skeleton: Arc::new(Skeleton::new((0..4).map(joint).collect()).unwrap()),
            joints: tracks.collect(),
            duration_secs: 2.9,
            grid: FrameGrid { times, rate: 10.0 },
        }
    }

    #[test]
    fn many_times_at_once_stand_where_each_stands_alone() {
        let times: Vec<f64> = (0..333).map(|i| 0.01 * f64::from(i) - 0.1).collect();
        for scale in [DVec3::ONE, DVec3::new(1.0, 2.0, 0.5)] {
            let clip = clip(scale);
            let worlds = clip.worlds_at(&times);
            let point = DVec3::new(0.2, -0.4, 0.7);
            for (index, &secs) in times.iter().enumerate() {
                for (joint, alone) in clip.world_at(secs).iter().enumerate() {
                    let [turn, place] = [worlds.rotation(joint, index), alone.rotation];
                    assert!(turn.turn_to(place) < 1e-14, "joint {joint} at {secs}");
                    let apart = worlds.position(joint, index).distance(alone.position());
                    assert!(apart < 1e-13, "joint {joint} at {secs}: {apart:e}");
                    let own = alone.scene_from_joint.transform_point3(point);
                    assert!(
                        worlds.point(joint, index, point).distance(own) < 1e-13,
                        "joint {joint} at {secs}"
                    );
                }
            }
        }
    }
}
