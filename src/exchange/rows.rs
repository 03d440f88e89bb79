//! The rows of a table of motion to the tracks of its joints: a few rows at a time, so that the numbers are nowhere but in
//! the text and in the tracks.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::{
    AngleRows, AngleScratch, FewAxesRows, Growing, JointTracks, RotationTrack, Times, VectorKeys,
    VectorTrack, is_whole,
};
use crate::rotor::Rotor;

use super::turns::Turns;

/// Numbers that are read before they are handed out to the joints: they stay in the second cache.
const TILE_NUMBERS: usize = 16_384;
/// Rows are turned in blocks of so many.
const BLOCK: usize = 64;
/// However wide a table is, no more numbers than this are read at once.
const MOST_NUMBERS: usize = 1 << 20;

/// What tracks may take beside the text: with it no file takes more than 8 times its size and 64 MB. Only a long file of numbers of a
/// digit or two each asks for more.
const MOST_TIMES: usize = 7;
const SPARE_BYTES: usize = 48 << 20;

/// What they may take once they are played as well: less, as whoever plays a clip also changes and writes it.
const MOST_TIMES_PLAYED: usize = 6;
const SPARE_BYTES_PLAYED: usize = 32 << 20;

/// Turns of at most this many degrees look like radians.
const MOST_RADIANS: f64 = 7.0;

/// What the columns of a table say of one joint.
pub(super) struct JointColumns {
    /// Its turn.
    pub(super) turn: TurnColumns,
    /// Its place: for each axis its column. With none at all it stays at its rest place.
    pub(super) place: [Option<usize>; 3],
    /// The rest place, for axes without a column.
    pub(super) rest: [f64; 3],
}

/// In which form columns say a turn.
pub(super) enum TurnColumns {
    /// Not at all.
    None,
    /// As angles in degrees.
    Angles(Turns),
    /// As x, y, z and w.
    Quaternion([usize; 4]),
    /// As plane angles in degrees: yz, zx, xy.
    Planes([usize; 3]),
}

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
    /// Bytes that the tracks may take, and once they are played.
    most_bytes: usize,
    most_bytes_played: usize,
    /// Bytes that the reader itself keeps of a row.
    kept_bytes: usize,
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
        before: Rotor,
    },
    Quaternion {
        keys: Vec<Rotor>,
        columns: [usize; 4],
    },
    Planes {
        degrees: Growing<[f64; 3]>,
        columns: [usize; 3],
    },
}

enum Place {
    /// Along all axes.
    Whole { keys: Growing<DVec3>, columns: [usize; 3] },
    /// Along one or two.
    Few { keys: FewAxesRows, columns: Vec<usize> },
}

impl Rows {
    /// No rows yet, of `columns` numbers each, of a file of `file_bytes` bytes. The reader keeps `kept_bytes` of each row
    /// itself.
    pub(super) fn new(
        joints: Vec<JointColumns>,
        columns: usize,
        file_bytes: usize,
        kept_bytes: usize,
    ) -> Self {
        let rows = (TILE_NUMBERS / columns.max(1)).max(BLOCK);
        let most = (MOST_NUMBERS / columns.max(1)).max(1);
        Self {
            columns,
            joints: joints.into_iter().map(JointRows::new).collect(),
            tile: Vec::new(),
            tile_len: (rows - rows % BLOCK).min(most) * columns,
            done: 0,
            capacity: 0,
            most_bytes: MOST_TIMES.saturating_mul(file_bytes).saturating_add(SPARE_BYTES),
            most_bytes_played: MOST_TIMES_PLAYED
                .saturating_mul(file_bytes)
                .saturating_add(SPARE_BYTES_PLAYED),
            kept_bytes,
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
        let tracks: usize = self.joints.iter().map(|joint| joint.row_bytes(rows, self.columns)).sum();
        let row_bytes = tracks + self.kept_bytes;
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

    /// The tracks, with a key at each of `times`. Where playing them would take more memory than the file may ask for they
    /// are lean.
    pub(super) fn finish(self, times: &Times) -> Vec<Arc<JointTracks>> {
        let row_bytes = |joint: &JointRows| joint.row_bytes(&[], self.columns) + joint.playing_bytes();
        let row_bytes: usize = self.joints.iter().map(row_bytes).sum();
        let is_lean = row_bytes.saturating_mul(self.done) > self.most_bytes_played;
        self.joints.into_iter().map(|joint| Arc::new(joint.finish(times, is_lean))).collect()
    }
}

impl JointRows {
    fn new(joint: JointColumns) -> Self {
        let turn = match joint.turn {
            TurnColumns::None => Turn::None,
            TurnColumns::Quaternion(columns) => Turn::Quaternion { keys: Vec::new(), columns },
            TurnColumns::Planes(columns) => Turn::Planes { degrees: Growing::new([0.0; 3], 0), columns },
            TurnColumns::Angles(turns) => match turns.order() {
                None => Turn::None,
                Some(order) if turns.groups.len() <= 3 => {
                    let columns =
                        |group: usize| turns.groups.get(group).map_or(Vec::new(), |(_, own)| own.clone());
                    let rows = AngleRows::new(turns.axes().collect(), order, 0);
                    Turn::Angles { rows, groups: [columns(0), columns(1), columns(2)] }
                }
                Some(_) => Turn::Many { keys: Vec::new(), turns, before: Rotor::IDENTITY },
            },
        };
        let place = match joint.place {
            [None, None, None] => None,
            [Some(x), Some(y), Some(z)] => {
                Some(Place::Whole { keys: Growing::new(DVec3::ZERO, 0), columns: [x, y, z] })
            }
            columns => {
                let keys = FewAxesRows::new(columns.map(|column| column.is_some()), joint.rest);
                Some(Place::Few { keys, columns: columns.into_iter().flatten().collect() })
            }
        };
        Self { turn, place }
    }

    /// Bytes that a row takes once these rows are added.
    fn row_bytes(&self, tile: &[f64], columns: usize) -> usize {
        let is_whole_column = |&column: &usize| tile.chunks_exact(columns).all(|row| is_whole(row[column]));
        let turn = match &self.turn {
            Turn::None => 0,
            Turn::Many { .. } | Turn::Quaternion { .. } => size_of::<Rotor>(),
            // The rotors are made of them at the end.
            Turn::Planes { .. } => size_of::<[f64; 3]>() + size_of::<Rotor>(),
            Turn::Angles { rows, groups } => {
                rows.row_bytes(rows.holds_whole() && groups.iter().flatten().all(is_whole_column))
            }
        };
        let place = match &self.place {
            None => 0,
            Some(Place::Whole { .. }) => size_of::<DVec3>(),
            Some(Place::Few { keys, columns }) => {
                keys.row_bytes(keys.holds_whole() && columns.iter().all(is_whole_column))
            }
        };
        turn + place
    }

    /// Bytes that a row takes more once the track is played at many times.
    fn playing_bytes(&self) -> usize {
        match &self.turn {
            Turn::None => 0,
            Turn::Angles { rows, .. } => rows.playing_bytes(),
            Turn::Many { .. } | Turn::Quaternion { .. } | Turn::Planes { .. } => size_of::<Rotor>(),
        }
    }

    fn reserve(&mut self, capacity: usize) {
        match &mut self.turn {
            Turn::None => {}
            Turn::Angles { rows, .. } => rows.reserve(capacity),
            Turn::Many { keys, .. } | Turn::Quaternion { keys, .. } => {
                keys.reserve_exact(capacity.saturating_sub(keys.len()));
            }
            Turn::Planes { degrees, .. } => degrees.reserve(capacity),
        }
        match &mut self.place {
            None => {}
            Some(Place::Whole { keys, .. }) => keys.reserve(capacity),
            Some(Place::Few { keys, .. }) => keys.reserve(capacity),
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
            Turn::Many { keys, turns, before } => {
                for index in 0..count {
                    let own = row(index);
                    let sum = |columns: &Vec<usize>| columns.iter().map(|&column| own[column]).sum();
                    let degrees: Vec<f64> = turns.groups.iter().map(|(_, columns)| sum(columns)).collect();
                    let rotor = turns.rotor(&degrees).aligned_to(*before);
                    if rotor.is_finite() {
                        *before = rotor;
                    }
                    keys.push(rotor);
                }
            }
            Turn::Quaternion { keys, columns } => {
                keys.extend(
                    (0..count).map(|index| Rotor::from_xyzw(columns.map(|column| row(index)[column]))),
                );
            }
            Turn::Planes { degrees, columns } => {
                for (index, triple) in degrees.next(count).iter_mut().enumerate() {
                    *triple = columns.map(|column| row(index)[column]);
                }
            }
        }
        match &mut self.place {
            None => {}
            Some(Place::Whole { keys, columns }) => {
                for (index, key) in keys.next(count).iter_mut().enumerate() {
                    *key = DVec3::from_array(columns.map(|column| row(index)[column]));
                }
            }
            Some(Place::Few { keys, columns }) => {
                for index in 0..count {
                    keys.push(columns.iter().map(|&column| row(index)[column]));
                }
            }
        }
    }

    fn angle_columns(&self) -> Vec<usize> {
        match &self.turn {
            Turn::None | Turn::Quaternion { .. } => Vec::new(),
            Turn::Angles { groups, .. } => groups.concat(),
            Turn::Many { turns, .. } => {
                turns.groups.iter().flat_map(|(_, columns)| columns).copied().collect()
            }
            Turn::Planes { columns, .. } => columns.to_vec(),
        }
    }

    fn finish(self, times: &Times, is_lean: bool) -> JointTracks {
        if times.is_empty() {
            return JointTracks::default();
        }
        let rotation = match self.turn {
            Turn::None => None,
            Turn::Angles { rows, .. } => Some(rows.finish(times.clone())),
            Turn::Many { keys, .. } | Turn::Quaternion { keys, .. } => {
                Some(RotationTrack::from_rotors(times.clone(), keys))
            }
            Turn::Planes { degrees, .. } => {
                Some(RotationTrack::from_plane_angles(times.clone(), degrees.finish()))
            }
        };
        let places: Option<VectorKeys> = self.place.map(|place| match place {
            Place::Whole { keys, .. } => keys.finish().into(),
            Place::Few { keys, .. } => keys.finish(),
        });
        let translation = places.map(|keys| VectorTrack::straight(times.clone(), keys));
        let rotation = if is_lean { rotation.map(RotationTrack::lean) } else { rotation };
        JointTracks { rotation, translation, scale: None }
    }
}
