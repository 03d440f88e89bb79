//! A track at many times at once.

use crate::rotor::Rotor;
use crate::rotor::batch::{self, Level, Parts, PartsMut, Streams};
use crate::skeleton::LocalPose;

use super::path::{PathKind, Paths, piece_of};
use super::places::{Places, TILE};
use super::rotation_track::RotationTrack;
use super::sampler::Sampler;
use super::take::Clip;
use super::times::Place;

impl RotationTrack {
    /// [`RotationTrack::at`] for each of `times_secs`, several times as fast for many: within 1e-15 rad of it, and at keys the
    /// same bits.
    pub fn at_all(&self, times_secs: &[f64]) -> Vec<Rotor> {
        self.at_all_by(times_secs, None)
    }

    /// As [`RotationTrack::at_all`], with `path` in place of the track's own path kinds where it is given.
    pub fn at_all_by(&self, times_secs: &[f64], path: Option<PathKind>) -> Vec<Rotor> {
        let keys = self.sound_for(times_secs.len());
        if let Some(keys) = keys
            && self.is_slerp_alone(path)
        {
            return self.plain_at(keys, times_secs);
        }
        let sound = |key: usize| match keys {
            Some(keys) => {
                let [s, yz, zx, xy] = keys.get(key);
                Rotor::new(s, yz, zx, xy)
            }
            None => self.sound_key(key),
        };
        let mut found = vec![Rotor::IDENTITY; times_secs.len()];
        let (mut slerps, mut squads) = (Queue::<2>::new(), Queue::<4>::new());
        // The inner points of a segment, or of a piece of one, are computed once for all times in it.
        let mut squad_points: Option<((usize, usize), [Rotor; 4])> = None;
        let mut solved = None;
        // The key before the last time.
        let mut near = 0;
        for (index, &secs) in times_secs.iter().enumerate() {
            let (key, share) = match self.times.place_near(secs, near) {
                None => continue,
                Some(Place::At(key)) => {
                    near = key;
                    found[index] = self.smoothed_key(key, path).unwrap_or_else(|| sound(key));
                    continue;
                }
                Some(Place::Between(key, share)) => (key, share),
            };
            near = key;
            let segment = self.segments.of(key);
            let share = segment.spacing.pace(share).share;
            let mut kind = self.kind_of(key, path);
            if matches!(kind, PathKind::Spline | PathKind::BSpline) {
                let solved = solved.get_or_insert_with(|| self.solved(path));
                let (start, end) = (self.times.at(key), self.times.at(key + 1));
                match solved.run(key).and_then(|run| run.at(start + (end - start) * share)) {
                    Some(rotor) => found[index] = rotor,
                    // No curve was found for the run.
                    None => kind = PathKind::Squad,
                }
            }
            match kind {
                PathKind::Hold => found[index] = sound(key),
                PathKind::Cubic => {
                    found[index] = self.cubic_at(key, share).unwrap_or_else(|| sound(key));
                }
                PathKind::Slerp if segment.turn.is_short() => {
                    if slerps.push(index, [sound(key), sound(key + 1)], share) {
                        slerps.flush(&mut found);
                    }
                }
                PathKind::Slerp => found[index] = self.lead(key, sound).at(share),
                PathKind::Squad => {
                    let pieces = if segment.turn.is_short() { 1 } else { self.lead(key, sound).pieces };
                    let (piece, local) = piece_of(share, pieces);
                    let points = match squad_points {
                        Some((place, points)) if place == (key, piece) => points,
                        _ => self.squad_points(key, piece, path, sound),
                    };
                    squad_points = Some(((key, piece), points));
                    if squads.push(index, points, local) {
                        squads.flush(&mut found);
                    }
                }
                PathKind::Spline | PathKind::BSpline => {}
            }
        }
        slerps.flush(&mut found);
        squads.flush(&mut found);
        found
    }

    /// The sound keys in streams, where so many times pay for looking at all keys or it is done already.
    pub(super) fn sound_for(&self, times: usize) -> Option<&Streams<f64, 4>> {
        /// Who asks for so many asks again.
        const MANY: usize = 128;
        if self.keys.is_lean() {
            self.keys.sound_if_made()
        } else if times >= MANY || 4 * times > self.keys.len() {
            Some(self.keys.sound())
        } else {
            self.keys.sound_if_made()
        }
    }

    /// Whether it has keys, and every segment goes the short way evenly by slerp.
    pub(super) fn is_slerp_alone(&self, path: Option<PathKind>) -> bool {
        let kind = match (path, &self.paths) {
            (Some(kind), _) => Some(kind),
            (None, Paths::Every(kind)) => Some(*kind),
            (None, Paths::Each(_)) => None,
        };
        let is_slerp = match kind {
            Some(PathKind::Slerp) => true,
            Some(PathKind::Cubic) => self.tangents.is_none(),
            _ => false,
        };
        is_slerp && self.segments.are_plain() && !self.times.is_empty()
    }

    fn plain_at(&self, keys: &Streams<f64, 4>, times_secs: &[f64]) -> Vec<Rotor> {
        let mut found = Vec::with_capacity(times_secs.len());
        let (mut sampler, mut places) = (Sampler::new(), Places::new());
        for times_secs in times_secs.chunks(TILE) {
            places.find(&self.times, times_secs);
            sampler.append(keys, &places, &mut found);
        }
        found
    }
}

impl Clip {
    /// A joint's turn relative to its parent at each of `times_secs`; its rest where nothing turns it.
    pub fn rotations_at(&self, joint: usize, times_secs: &[f64]) -> Vec<Rotor> {
        self.rotations_at_by(joint, times_secs, None)
    }

    /// As [`Clip::rotations_at`], with `path` in place of the track's own path kinds where it is given.
    pub fn rotations_at_by(&self, joint: usize, times_secs: &[f64], path: Option<PathKind>) -> Vec<Rotor> {
        match self.rotation(joint) {
            Some(track) if !track.times.is_empty() => track.at_all_by(times_secs, path),
            _ => vec![self.skeleton.joints()[joint].rest.rotation; times_secs.len()],
        }
    }

    /// [`Clip::local_at_by`] for each of `times_secs`.
    pub fn locals_at_by(&self, times_secs: &[f64], path: Option<PathKind>) -> Vec<LocalPose> {
        let mut poses = vec![self.skeleton.rest_pose(); times_secs.len()];
        let mut playing = self.playing(times_secs, path);
        for (joint, tracks) in self.joints.iter().enumerate().take(self.skeleton.len()) {
            if tracks.rotation.as_ref().is_some_and(|track| !track.times.is_empty()) {
                let turns = playing.rotations(joint);
                for (pose, turn) in poses.iter_mut().zip(turns) {
                    pose[joint].rotation = turn;
                }
            }
            for (pose, &secs) in poses.iter_mut().zip(times_secs) {
                if let Some(place) = tracks.translation.as_ref().and_then(|track| track.at(secs)) {
                    pose[joint].translation = place;
                }
                if let Some(size) = tracks.scale.as_ref().and_then(|track| track.at(secs)) {
                    pose[joint].scale = size;
                }
            }
        }
        poses
    }
}

/// Turns from each of `rotors` to the next, in radians: one less than there are. All unit.
pub fn turns_between(rotors: &[Rotor]) -> Vec<f64> {
    let rows = |rotors: &[Rotor]| Streams::from_rows(rotors.iter().map(|rotor| parts(*rotor)));
    let mut turns = vec![0.0; rotors.len().saturating_sub(1)];
    // Overlapping by one.
    for (start, turns) in turns.chunks_mut(TILE).enumerate().map(|(tile, turns)| (tile * TILE, turns)) {
        let rows = rows(&rotors[start..=start + turns.len()]);
        let all = rows.parts();
        let (from, to) = (all.map(|stream| &stream[..turns.len()]), all.map(|stream| &stream[1..]));
        batch::turns(Level::best(), from, to, turns);
    }
    turns
}

/// The parts of `TILE` rotors, in streams.
type Tile = [[f64; TILE]; 4];

/// Interpolations of `N` rotors each that wait to be computed together.
struct Queue<const N: usize> {
    rotors: Box<[Tile; N]>,
    shares: Box<[f64; TILE]>,
    results: Box<Tile>,
    /// Where each result goes.
    indices: Box<[usize; TILE]>,
    count: usize,
}

impl<const N: usize> Queue<N> {
    fn new() -> Self {
        Self {
            rotors: Box::new([[[0.0; TILE]; 4]; N]),
            shares: Box::new([0.0; TILE]),
            results: Box::new([[0.0; TILE]; 4]),
            indices: Box::new([0; TILE]),
            count: 0,
        }
    }

    /// Whether it is full now; it has to be flushed then.
    fn push(&mut self, index: usize, rotors: [Rotor; N], share: f64) -> bool {
        // It is below `TILE` anyway; this lets the compiler know.
        let row = self.count % TILE;
        for (streams, rotor) in self.rotors.iter_mut().zip(rotors) {
            for (stream, part) in streams.iter_mut().zip(parts(rotor)) {
                stream[row] = part;
            }
        }
        self.shares[row] = share;
        self.indices[row] = index;
        self.count = row + 1;
        self.count == TILE
    }

    fn ready(&mut self) -> ([Parts<'_, f64, 4>; N], &[f64], PartsMut<'_, f64, 4>) {
        let count = self.count;
        let rotors = self.rotors.each_ref().map(|tile| tile.each_ref().map(|stream| &stream[..count]));
        (rotors, &self.shares[..count], self.results.each_mut().map(|stream| &mut stream[..count]))
    }

    fn deliver(&mut self, found: &mut [Rotor]) {
        let [s, yz, zx, xy] = &*self.results;
        for (row, &index) in self.indices[..self.count].iter().enumerate() {
            found[index] = Rotor::new(s[row], yz[row], zx[row], xy[row]);
        }
        self.count = 0;
    }
}

impl Queue<2> {
    fn flush(&mut self, found: &mut [Rotor]) {
        let ([from, to], shares, results) = self.ready();
        batch::slerp(Level::best(), from, to, shares, results);
        self.deliver(found);
    }
}

impl Queue<4> {
    fn flush(&mut self, found: &mut [Rotor]) {
        let (points, shares, results) = self.ready();
        batch::squad(Level::best(), points, shares, results);
        self.deliver(found);
    }
}

fn parts(rotor: Rotor) -> [f64; 4] {
    [rotor.s, rotor.yz, rotor.zx, rotor.xy]
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::super::path::Paths;
    use super::super::times::Times;
    use super::super::{FrameGrid, JointTracks};
    use super::*;
    use crate::rotor::Bivector;
    use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

    /// Turns about changing planes, of changing sign, one of them not finite and one far off unit length.
    fn track(path: PathKind) -> RotationTrack {
        let keys: Vec<Rotor> = (0..40)
            .map(|i| {
                let i = f64::from(i);
                let turn = Bivector::new(i.sin(), 0.7 * (1.3 * i).cos(), 0.4 * i.cos());
                Rotor::from_plane_angles(turn).scale(if i as usize % 3 == 1 { -1.0 } else { 1.0 })
            })
            .collect();
        let mut keys = keys;
        keys[0] = Rotor::new(f64::NAN, 0.0, 0.0, 0.0);
        keys[7] = Rotor::new(0.0, f64::INFINITY, 0.0, 0.0);
        keys[9] = keys[9].scale(3.0);
        let times: Vec<f64> = (0..40).map(|i| 0.1 * f64::from(i) + 0.003 * f64::from(i % 5)).collect();
        let mut track = RotationTrack::from_rotors(Times::Listed(times.into()), keys);
        track.paths = Paths::Every(path);
        track
    }

    #[test]
    fn many_times_at_once_are_what_each_is_alone() {
        let times: Vec<f64> = (0..3000).map(|i| f64::from(i) * 0.0015 - 0.1).collect();
        for path in [PathKind::Hold, PathKind::Slerp, PathKind::Squad, PathKind::Cubic] {
            let mut track = track(path);
            if path == PathKind::Cubic {
                track.tangents = Some(vec![[Rotor::new(0.1, 0.2, -0.3, 0.1); 2]; 40].into());
            }
            let found = track.at_all(&times);
            assert_eq!(found.len(), times.len());
            for (rotor, &secs) in found.iter().zip(&times) {
                let alone = track.at(secs);
                assert!(rotor.turn_to(alone) < 4e-15, "{path:?} at {secs}: {rotor:?} and {alone:?}");
                assert!((rotor.norm() - 1.0).abs() < 2e-15, "{path:?} at {secs}: length {}", rotor.norm());
            }
        }
    }

    #[test]
    fn joints_one_after_the_other_are_what_each_is_alone() {
        let rig = |paths: &[PathKind]| {
            let tracks = paths.iter().map(|&path| {
                let rotation = Some(track(path));
                Arc::new(JointTracks { rotation, ..JointTracks::default() })
            });
            let joints = (0..paths.len()).map(|number| Joint {
                name: format!("J{number}"),
                number,
                parent: number.checked_sub(1),
                rest: Transform::default(),
                kind: JointKind::Joint,
                tips: vec![],
            });
            Clip {
                name: String::new(),
                skeleton: Arc::new(Skeleton::new(joints.collect()).unwrap()),
                joints: tracks.collect(),
                duration_secs: 4.0,
                grid: FrameGrid { times: track(PathKind::Slerp).times, rate: 10.0 },
            }
        };
        let mut clip = rig(&[PathKind::Slerp, PathKind::Slerp, PathKind::Squad, PathKind::Slerp]);
        // Keys at a tenth of a second beside those of the others, and a joint that nothing turns.
        let even = Times::Even { step_secs: 0.1, count: 40 };
        let keys = track(PathKind::Slerp).keys;
        let joint =
            JointTracks { rotation: Some(RotationTrack::from_rotors(even, keys)), ..JointTracks::default() };
        clip.joints[1] = Arc::new(joint);
        clip.joints[3] = Arc::default();
        // At any times, and at twice the rate of the keys from a key and from a middle on, an odd and an even number of them.
        let any: Vec<f64> = (0..777).map(|i| f64::from(i) * 0.005 - 0.1).collect();
        let double = |start: i32, end: i32| (start..end).map(|i| f64::from(i) * 0.05).collect::<Vec<f64>>();
        for times in [any, double(0, 79), double(1, 79), double(1, 78), double(3, 4), vec![]] {
            let mut playing = clip.playing(&times, None);
            for joint in [0, 1, 1, 0, 2, 3] {
                assert_eq!(playing.rotations(joint), clip.rotations_at(joint, &times), "joint {joint}");
                for (&secs, turn) in times.iter().zip(playing.rotations(joint)) {
                    assert!(
                        turn.turn_to(clip.local_at(secs)[joint].rotation) < 4e-15,
                        "joint {joint} at {secs}"
                    );
                }
            }
        }
    }

    #[test]
    fn keys_keep_their_bits() {
        let track = track(PathKind::Slerp);
        let times: Vec<f64> = track.times.iter().collect();
        let alone: Vec<Rotor> = (0..40).map(|key| track.sound_key(key)).collect();
        assert_eq!(track.at_all(&times), alone);
        let streams = track.keys.sound();
        let parts: Vec<[f64; 4]> = (0..40).map(|key| streams.get(key)).collect();
        assert_eq!(parts, alone.iter().map(|key| super::parts(*key)).collect::<Vec<_>>());
    }

    #[test]
    fn without_keys_nothing_turns() {
        let track = RotationTrack::from_rotors(Times::Listed([].into()), Vec::new());
        assert_eq!(track.at_all(&[0.0, 1.0]), [Rotor::IDENTITY; 2]);
        assert!(turns_between(&[]).is_empty());
    }

    #[test]
    fn turns_between_neighbours_span_tiles() {
        let rotors: Vec<Rotor> = (0..1000)
            .map(|i| Rotor::from_plane_angles(Bivector::new(0.0, 0.001 * f64::from(i * i % 977), 0.0)))
            .collect();
        let turns = turns_between(&rotors);
        assert_eq!(turns.len(), 999);
        for (pair, turn) in rotors.windows(2).zip(turns) {
            assert!((turn - pair[0].turn_to(pair[1])).abs() < 2e-15, "{turn}");
        }
    }
}
