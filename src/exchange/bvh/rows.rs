//! The rows of a motion part to the tracks of its joints: a few rows at a time, so that the numbers are nowhere but in the
//! text and in the tracks.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::{
    AngleRows, AngleScratch, Growing, JointTracks, RotationTrack, Times, VectorTrack, is_whole,
};
use crate::exchange::turns::Turns;
use crate::rotor::Rotor;

use super::read::turns_of;
use super::syntax::{Channel, JointSyntax};

/// Numbers that are read before they are handed out to the joints: they stay in the second cache.
const TILE_NUMBERS: usize = 16_384;
/// Rows are turned in blocks of so many.
const BLOCK: usize = 64;

/// What tracks may take beside the text: with it no file takes more than 8 times its size and 64 MB. Only a long file that is
/// nearly all places along one axis, of a digit or two each, asks for more.
const MOST_TIMES: usize = 7;
const SPARE_BYTES: usize = 48 << 20;

/// Turns of at most this many degrees look like radians.
const MOST_RADIANS: f64 = 7.0;

/// The tracks of all joints as they grow.
pub(super) struct Rows {
    columns: usize,
    joints: Vec<JointRows>,
    /// Numbers that no joint has yet.
    pub(super) tile: Vec<f64>,
    /// Numbers that are read before they are handed out.
    pub(super) tile_len: usize,
    /// Rows that the joints have.
    done: usize,
    /// Rows that they have room for.
    capacity: usize,
    /// Bytes that the tracks may take.
    most_bytes: usize,
    /// The largest angle in degrees, or one beyond what radians would be.
    pub(super) largest_deg: f64,
    scratch: AngleScratch,
}

/// What the rows say of one joint.
struct JointRows {
    turn: Turn,
    place: Option<Place>,
}

enum Turn {
    None,
    /// At most three turns: their columns in a row, and what adds up to each.
    Angles {
        rows: AngleRows,
        groups: [Vec<usize>; 3],
    },
    /// More than three.
    Many {
        keys: Vec<Rotor>,
        turns: Turns,
        first: usize,
        before: Rotor,
    },
}

struct Place {
    keys: Growing<DVec3>,
    /// For each axis its column; its `OFFSET` where it has none.
    columns: [Option<usize>; 3],
    offset: [f64; 3],
}

impl Rows {
    /// No rows yet, of a file of `file_bytes` bytes.
    pub(super) fn new(joints: &[JointSyntax], file_bytes: usize) -> Self {
        let mut next = 0;
        let mut joint_rows = Vec::with_capacity(joints.len());
        for joint in joints {
            joint_rows.push(JointRows::new(joint, next));
            next += joint.channels.len();
        }
        let rows = (TILE_NUMBERS / next.max(1)).max(BLOCK);
        Self {
            columns: next,
            joints: joint_rows,
            tile: Vec::new(),
            tile_len: (rows - rows % BLOCK) * next,
            done: 0,
            capacity: 0,
            most_bytes: MOST_TIMES.saturating_mul(file_bytes).saturating_add(SPARE_BYTES),
            largest_deg: 0.0,
            scratch: AngleScratch::default(),
        }
    }

    /// Numbers so far.
    pub(super) fn len(&self) -> usize {
        self.done * self.columns + self.tile.len()
    }

    /// Hands the complete rows of the tile out to the joints; `expected` is how many rows there will be in all, as far as
    /// can be told.
    ///
    /// # Errors
    /// When the tracks would take more memory than a file of this size may ask for: how many bytes that is.
    pub(super) fn hand_out(&mut self, expected: usize) -> Result<(), usize> {
        let Some(count) = self.tile.len().checked_div(self.columns).filter(|&count| count > 0) else {
            return Ok(());
        };
        let used = count * self.columns;
        let needed = self.done + count;
        let rows = &self.tile[..used];
        let row_bytes: usize = self.joints.iter().map(|joint| joint.row_bytes(rows, self.columns)).sum();
        if row_bytes.saturating_mul(needed) > self.most_bytes {
            return Err(self.most_bytes);
        }
        if needed > self.capacity {
            // Room that grows by a few rows at a time would be copied over and over.
            let more = if self.capacity == 0 { 0 } else { self.capacity + self.capacity / 4 };
            let most = self.most_bytes.checked_div(row_bytes).unwrap_or(usize::MAX);
            self.capacity = expected.max(more).min(most).max(needed);
            for joint in &mut self.joints {
                joint.reserve(self.capacity);
            }
        }
        for joint in &mut self.joints {
            joint.push(&self.tile[..used], self.columns, &mut self.scratch);
        }
        if self.largest_deg < MOST_RADIANS {
            let angles = self.joints.iter().flat_map(JointRows::angle_columns);
            let columns: Vec<usize> = angles.collect();
            for row in self.tile[..used].chunks_exact(self.columns) {
                let largest = columns.iter().fold(0.0_f64, |largest, &column| largest.max(row[column].abs()));
                self.largest_deg = self.largest_deg.max(largest);
            }
        }
        self.tile.drain(..used);
        self.done += count;
        Ok(())
    }

    /// Rows that the joints have.
    pub(super) fn done(&self) -> usize {
        self.done
    }

    /// The tracks, with a key at each of `times`.
    pub(super) fn finish(self, times: &Times) -> Vec<Arc<JointTracks>> {
        self.joints.into_iter().map(|joint| Arc::new(joint.finish(times))).collect()
    }
}

impl JointRows {
    fn new(joint: &JointSyntax, first: usize) -> Self {
        let turns = turns_of(&joint.channels);
        let turn = match turns.order() {
            None => Turn::None,
            Some(order) if turns.groups.len() <= 3 => {
                let columns = |group: usize| -> Vec<usize> {
                    let own = turns.groups.get(group).map_or(&[][..], |(_, columns)| columns);
                    own.iter().map(|column| first + column).collect()
                };
                let rows = AngleRows::new(turns.axes().collect(), order, 0);
                Turn::Angles { rows, groups: [columns(0), columns(1), columns(2)] }
            }
            Some(_) => Turn::Many { keys: Vec::new(), turns, first, before: Rotor::IDENTITY },
        };
        let mut columns = [None; 3];
        for (column, channel) in joint.channels.iter().enumerate() {
            if let Channel::Position(axis) = channel {
                columns[axis.index()] = Some(first + column);
            }
        }
        let is_placed = columns.iter().any(Option::is_some);
        let place =
            is_placed.then(|| Place { keys: Growing::new(DVec3::ZERO, 0), columns, offset: joint.offset });
        Self { turn, place }
    }

    /// Bytes that a row takes once these rows are added.
    fn row_bytes(&self, tile: &[f64], columns: usize) -> usize {
        let turn = match &self.turn {
            Turn::None => 0,
            Turn::Many { .. } => size_of::<Rotor>(),
            Turn::Angles { rows, groups } => {
                let whole_row = |row: &[f64]| groups.iter().flatten().all(|&column| is_whole(row[column]));
                rows.row_bytes(rows.holds_whole() && tile.chunks_exact(columns).all(whole_row))
            }
        };
        turn + self.place.as_ref().map_or(0, |_| size_of::<DVec3>())
    }

    fn reserve(&mut self, capacity: usize) {
        match &mut self.turn {
            Turn::None => {}
            Turn::Angles { rows, .. } => rows.reserve(capacity),
            Turn::Many { keys, .. } => keys.reserve_exact(capacity.saturating_sub(keys.len())),
        }
        if let Some(place) = &mut self.place {
            place.keys.reserve(capacity);
        }
    }

    /// Adds complete rows of `columns` numbers each.
    fn push(&mut self, tile: &[f64], columns: usize, scratch: &mut AngleScratch) {
        let count = tile.len() / columns;
        let row = |index: usize| &tile[index * columns..(index + 1) * columns];
        match &mut self.turn {
            Turn::None => {}
            Turn::Angles { rows, groups } => match groups.each_ref().map(Vec::as_slice) {
                [&[a], &[b], &[c]] => rows.push(
                    count,
                    |index| {
                        let row = row(index);
                        [row[a], row[b], row[c]]
                    },
                    scratch,
                ),
                groups => {
                    let angle = |row: &[f64], columns: &[usize]| match columns {
                        [] => 0.0,
                        [one] => row[*one],
                        several => several.iter().map(|&column| row[column]).sum(),
                    };
                    rows.push(count, |index| groups.map(|columns| angle(row(index), columns)), scratch);
                }
            },
            Turn::Many { keys, turns, first, before } => {
                for index in 0..count {
                    let own = &row(index)[*first..];
                    let sum = |columns: &Vec<usize>| columns.iter().map(|&column| own[column]).sum();
                    let degrees: Vec<f64> = turns.groups.iter().map(|(_, columns)| sum(columns)).collect();
                    let rotor = turns.rotor(&degrees).aligned_to(*before);
                    if rotor.is_finite() {
                        *before = rotor;
                    }
                    keys.push(rotor);
                }
            }
        }
        if let Some(Place { keys, columns, offset }) = &mut self.place {
            for (index, key) in keys.next(count).iter_mut().enumerate() {
                let row = row(index);
                let part = |axis: usize| columns[axis].map_or(offset[axis], |column| row[column]);
                *key = DVec3::new(part(0), part(1), part(2));
            }
        }
    }

    fn angle_columns(&self) -> Vec<usize> {
        match &self.turn {
            Turn::None => Vec::new(),
            Turn::Angles { groups, .. } => groups.concat(),
            Turn::Many { turns, first, .. } => turns
                .groups
                .iter()
                .flat_map(|(_, columns)| columns.iter().map(|column| first + column))
                .collect(),
        }
    }

    fn finish(self, times: &Times) -> JointTracks {
        if times.is_empty() {
            return JointTracks::default();
        }
        let rotation = match self.turn {
            Turn::None => None,
            Turn::Angles { rows, .. } => Some(rows.finish(times.clone())),
            Turn::Many { keys, .. } => Some(RotationTrack::from_rotors(times.clone(), keys)),
        };
        let translation = self.place.map(|place| VectorTrack::straight(times.clone(), place.keys.finish()));
        JointTracks { rotation, translation, scale: None }
    }
}
