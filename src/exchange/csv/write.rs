//! Writing a clip back into the CSV text it came from, row by row.

use crate::clip::{Clip, RotationTrack, Stored, VectorTrack};
use crate::exchange::Note;
use crate::exchange::turns::Turns;
use crate::rotor::Rotor;

use super::cells::{Cell, Records, comma_number, number};
use super::columns::Role;
use super::create::{from_clip, number_text};
use super::read::Document;

/// The file of `document` with the cells that differ between `before`, the clip as read from it, and `after`.
///
/// A cell whose number did not change keeps its very text, with the blanks and quotes around it; without a change the
/// bytes are those that were read. Rows that were passed over, as the next has the very same time, change along where they
/// said the same, all numbers alike. Where the rows differ in number or times they are written anew under the same header;
/// a clip with another number of joints becomes a new file, as by [`from_clip`]. Changed numbers have as many digits as
/// it takes to read the same number again.
pub fn write(document: &Document, before: &Clip, after: &Clip) -> (Vec<u8>, Vec<Note>) {
    if after.skeleton.len() != before.skeleton.len() {
        return from_clip(after);
    }
    let same_grid = before.grid == after.grid;
    let same_joints = (0..before.joints.len()).all(|joint| before.same_joint(after, joint));
    if same_grid && same_joints {
        return (document.file.bytes().to_vec(), Vec::new());
    }
    let mut of_joint: Vec<Vec<usize>> = vec![Vec::new(); after.skeleton.len()];
    for (column, role) in document.columns.roles.iter().enumerate() {
        match *role {
            Role::Quaternion(joint, _)
            | Role::Plane(joint, _)
            | Role::Angle(joint, _)
            | Role::Place(joint, _) => of_joint[joint].push(column),
            Role::Time | Role::Unused => {}
        }
    }
    let mut joints: Vec<JointCells<'_>> = of_joint
        .into_iter()
        .enumerate()
        .filter(|&(joint, _)| !(same_grid && before.same_joint(after, joint)))
        .map(|(joint, columns)| JointCells::new(document, [before, after], joint, columns, same_grid))
        .collect();
    let text =
        if same_grid { patched(document, &mut joints) } else { rewritten(document, after, &mut joints) };
    (document.file.encoded(text), joints.iter().flat_map(JointCells::notes).collect())
}

/// The rows of the document that are used, and where each stands.
struct OldRows<'a> {
    document: &'a Document,
    records: Records<'a>,
    /// Rows so far, those that are passed over too.
    count: u32,
    /// How many of the passed-over ones are behind.
    repeated: usize,
    /// Where the row last given begins, or the first of those that were passed over for it.
    start: usize,
    /// How many were.
    passed_over: usize,
    /// The cells of the row last given with their numbers; NaN for columns that are not used.
    cells: Vec<(Cell, f64)>,
}

impl<'a> OldRows<'a> {
    fn new(document: &'a Document) -> Self {
        let records = Records::at(document.file.text(), document.dialect, document.rows_start);
        Self { document, records, count: 0, repeated: 0, start: 0, passed_over: 0, cells: Vec::new() }
    }

    /// Goes to the next row; `false` at the end.
    fn next(&mut self) -> bool {
        self.start = self.records.pos();
        self.passed_over = 0;
        while self.document.repeated.get(self.repeated) == Some(&self.count) {
            if !self.records.next().unwrap_or(false) {
                return false;
            }
            self.repeated += 1;
            self.passed_over += 1;
            self.count += 1;
        }
        self.count += 1;
        let is_there = self.records.next().unwrap_or(false);
        numbers(self.document, &self.records, &mut self.cells);
        is_there
    }
}

/// The cells of a record and their numbers.
fn numbers(document: &Document, records: &Records<'_>, cells: &mut Vec<(Cell, f64)>) {
    let bytes = document.file.text();
    cells.clear();
    cells.extend(records.cells.iter().zip(&document.columns.roles).map(|(&cell, role)| {
        let with_comma = || comma_number(bytes, cell).filter(|_| document.dialect.decimal_comma);
        let value = if *role == Role::Unused { None } else { number(bytes, cell).or_else(with_comma) };
        (cell, value.unwrap_or(f64::NAN))
    }));
}

/// The cells that belong to one joint that changed.
struct JointCells<'a> {
    label: &'a str,
    roles: &'a [Role],
    columns: Vec<usize>,
    after: &'a Clip,
    /// The values are the document's, and only changes are to be set.
    same_grid: bool,
    track: Option<&'a RotationTrack>,
    /// Whether the track has a key at each row.
    keyed: bool,
    /// One of the columns that say its turn.
    turn: Option<Role>,
    turns: Turns,
    /// Rows whose turn is written; ascending.
    changed: Vec<usize>,
    /// How many of them are done.
    next: usize,
    /// The angles of the row before, sound ones.
    reference: Vec<f64>,
    worst_rad: f64,
    worst_row: usize,
    place: Option<PlaceCells<'a>>,
}

struct PlaceCells<'a> {
    track: &'a VectorTrack,
    keyed: bool,
    old: Option<&'a VectorTrack>,
    has: [bool; 3],
    rest: [f64; 3],
    worst: f64,
    worst_row: usize,
}

impl<'a> JointCells<'a> {
    fn new(
        document: &'a Document,
        [before, after]: [&'a Clip; 2],
        joint: usize,
        columns: Vec<usize>,
        same_grid: bool,
    ) -> Self {
        let roles = &document.columns.roles[..];
        let rows = after.grid.count();
        let track = after.rotation(joint);
        let keyed = track.is_some_and(|track| track.times == after.grid.times && track.keys.len() == rows);
        let changed = match (track, before.rotation(joint)) {
            (None, _) => Vec::new(),
            (Some(track), Some(old)) if same_grid && keyed => track.changed_keys(old),
            _ => (0..rows).collect(),
        };
        let own = || columns.iter().map(|&column| roles[column]);
        let has = |axis: usize| own().any(|role| matches!(role, Role::Place(_, own) if own.index() == axis));
        let turns = document.turns(joint);
        let place = after.joints[joint].translation.as_ref().map(|track| PlaceCells {
            track,
            keyed: track.times == after.grid.times && track.keys.len() == rows,
            old: before.joints[joint].translation.as_ref(),
            has: [has(0), has(1), has(2)],
            rest: after.skeleton.joints()[joint].rest.translation.to_array(),
            worst: 0.0,
            worst_row: 0,
        });
        Self {
            label: after.skeleton.label(joint),
            roles,
            after,
            same_grid,
            track,
            keyed,
            turn: own().find(|role| !matches!(role, Role::Place(..))),
            columns,
            reference: vec![0.0; turns.groups.len()],
            turns,
            changed,
            next: 0,
            worst_rad: 0.0,
            worst_row: 0,
            place,
        }
    }

    /// Puts what changed in a row into its values. To be called for the rows in order.
    fn put(&mut self, row: usize, values: &mut [f64]) {
        if row == 0 {
            // Nothing stands before it but itself as it was.
            self.keep(values);
        }
        if self.changed.get(self.next) == Some(&row) {
            self.next += 1;
            self.put_turn(row, values);
        }
        self.keep(values);
        self.put_place(row, values);
    }

    /// Remembers the sound angles of a row.
    fn keep(&mut self, values: &[f64]) {
        for (reference, (_, columns)) in self.reference.iter_mut().zip(&self.turns.groups) {
            if let Some(&angle) = columns.first().map(|&column| &values[column]).filter(|own| own.is_finite())
            {
                *reference = angle;
            }
        }
    }

    fn put_turn(&mut self, row: usize, values: &mut [f64]) {
        let Some(track) = self.track else { return };
        let key = if self.keyed { track.keys.rotor(row) } else { track.at(self.after.grid.time(row)) };
        match self.turn {
            Some(Role::Quaternion(..)) => {
                let parts = key.to_xyzw();
                self.set(values, |role| match role {
                    Role::Quaternion(_, part) => Some(parts[part]),
                    _ => None,
                });
            }
            Some(Role::Plane(..)) => {
                let degrees = match &track.stored {
                    Stored::PlaneAngles(degrees) if self.keyed => degrees[row],
                    _ => key.normalize().plane_angles().to_degrees(),
                };
                self.set(values, |role| match role {
                    Role::Plane(_, part) => Some(degrees[part]),
                    _ => None,
                });
            }
            Some(Role::Angle(..)) => self.put_angles(track, row, key, values),
            _ => {}
        }
    }

    fn put_angles(&mut self, track: &RotationTrack, row: usize, wanted: Rotor, values: &mut [f64]) {
        let count = self.turns.groups.len();
        let stored = track
            .file_angles()
            .filter(|angles| self.keyed && angles.axes.iter().copied().eq(self.turns.axes()))
            .map(|angles| angles.degrees.triple(row))
            .filter(|own| own[count.min(3)..].iter().all(|&angle| angle == 0.0));
        let angles = match stored {
            Some(own) => own[..count].to_vec(),
            None if !wanted.is_finite() => return,
            None => self.turns.nearest(wanted.normalize(), &self.reference),
        };
        if wanted.is_finite() {
            let off = self.turns.rotor(&angles).turn_to(wanted.normalize());
            if off > self.worst_rad {
                (self.worst_rad, self.worst_row) = (off, row);
            }
        }
        for ((_, columns), angle) in self.turns.groups.iter().zip(angles) {
            if let Some(&column) = columns.first() {
                values[column] = angle;
            }
        }
    }

    fn put_place(&mut self, row: usize, values: &mut [f64]) {
        let Some(own) = &mut self.place else { return };
        let keys = &own.track.keys;
        let key = if own.keyed { Some(keys.vector(row)) } else { own.track.at(self.after.grid.time(row)) };
        let Some(place) = key else { return };
        let is_old = |old: &VectorTrack| row < old.keys.len() && old.keys.vector(row) == place;
        if self.same_grid && own.keyed && own.old.is_some_and(is_old) {
            return;
        }
        for axis in (0..3).filter(|&axis| !own.has[axis]) {
            let off = (place[axis] - own.rest[axis]).abs();
            if off > own.worst {
                (own.worst, own.worst_row) = (off, row);
            }
        }
        self.set(values, |role| match role {
            Role::Place(_, axis) => Some(place[axis.index()]),
            _ => None,
        });
    }

    /// Sets what `value` gives for the roles of this joint's columns.
    fn set(&self, values: &mut [f64], value: impl Fn(Role) -> Option<f64>) {
        for &column in &self.columns {
            if let Some(value) = value(self.roles[column]) {
                values[column] = value;
            }
        }
    }

    fn notes(&self) -> Vec<Note> {
        let note = |text: String| Note::new(format!("joint {}", self.label), text);
        let mut notes = Vec::new();
        if let (None, Some(first)) = (self.turn, self.changed.first()) {
            notes.push(note(format!(
                "expected columns for its turn, found none: {} rows from row {first} on are not written",
                self.changed.len()
            )));
        }
        if self.worst_rad.to_degrees() > 1e-5 {
            notes.push(note(format!(
                "expected three angles to write any rotation, found {}: up to {:.3} degrees off, at row {}",
                self.turns.groups.len(),
                self.worst_rad.to_degrees(),
                self.worst_row
            )));
        }
        if let Some(PlaceCells { worst, worst_row, .. }) = self.place.as_ref().filter(|own| own.worst > 1e-9)
        {
            notes.push(note(format!(
                "expected columns for its place, found too few: up to {worst:.6} off, at row {worst_row}"
            )));
        }
        notes
    }
}

/// The document with the numbers that differ from it.
fn patched(document: &Document, joints: &mut [JointCells<'_>]) -> Vec<u8> {
    let source = document.file.text();
    let mut bytes = Vec::with_capacity(source.len() + 64);
    let mut copied = 0;
    let mut rows = OldRows::new(document);
    let (mut values, mut cells) = (Vec::new(), Vec::new());
    for row in 0..document.rows {
        if !rows.next() {
            break;
        }
        values.clear();
        values.extend(rows.cells.iter().map(|(_, number)| *number));
        if values.len() < document.columns.roles.len() {
            break;
        }
        for joint in joints.iter_mut() {
            joint.put(row, &mut values);
        }
        // Rows that were passed over and said the same say the same again; they stand before it.
        let mut records = Records::at(source, document.dialect, rows.start);
        for _ in 0..rows.passed_over {
            if !records.next().unwrap_or(false) {
                break;
            }
            numbers(document, &records, &mut cells);
            let mut pairs = cells.iter().zip(&rows.cells);
            if pairs.all(|((_, number), (_, old))| same(*number, *old)) {
                copied = put_changes(document, &cells, &values, copied, &mut bytes);
            }
        }
        copied = put_changes(document, &rows.cells, &values, copied, &mut bytes);
    }
    bytes.extend_from_slice(&source[copied..]);
    bytes
}

/// The text from byte `copied` on to the last cell of a row that changed, with its changes; gives the byte after it.
fn put_changes(
    document: &Document,
    cells: &[(Cell, f64)],
    values: &[f64],
    mut copied: usize,
    bytes: &mut Vec<u8>,
) -> usize {
    let source = document.file.text();
    for ((cell, number), value) in cells.iter().zip(values) {
        if !same(*number, *value) {
            bytes.extend_from_slice(&source[copied..cell.start]);
            bytes.extend_from_slice(cell_text(document, *value).as_bytes());
            copied = cell.end;
        }
    }
    copied
}

/// The document's header with rows of its own.
fn rewritten(document: &Document, after: &Clip, joints: &mut [JointCells<'_>]) -> Vec<u8> {
    let source = document.file.text();
    let head = &source[..document.rows_start];
    let line_end: &[u8] = if head.ends_with(b"\r\n") {
        b"\r\n"
    } else if head.ends_with(b"\r") {
        b"\r"
    } else {
        b"\n"
    };
    let mut bytes = head.to_vec();
    if !head.ends_with(line_end) {
        bytes.extend_from_slice(line_end);
    }
    let roles = &document.columns.roles;
    let time_column = roles.iter().position(|role| *role == Role::Time);
    let scale = document.columns.unit.in_a_second();
    let mut rows = OldRows::new(document);
    // A stretch cut from the clip starts at one of its rows, though at another time, and goes on with them.
    let mut is_along = false;
    let mut values = vec![f64::NAN; roles.len()];
    for row in 0..after.grid.count() {
        values.fill(f64::NAN);
        if let Some(column) = time_column {
            values[column] = after.grid.time(row) * scale + document.start;
        }
        for joint in joints.iter_mut() {
            joint.put(row, &mut values);
        }
        let is_it = |cells: &[(Cell, f64)]| {
            let pairs = cells.iter().zip(&values).enumerate();
            cells.len() == roles.len()
                && pairs
                    .filter(|(column, _)| Some(*column) != time_column)
                    .all(|(_, ((_, number), value))| same(*number, *value))
        };
        if row == 0 {
            while !is_along && rows.next() {
                is_along = is_it(&rows.cells);
            }
        } else if is_along {
            is_along = rows.next();
        }
        let old = if is_along { &rows.cells[..] } else { &[] };
        for (column, &value) in values.iter().enumerate() {
            if column > 0 {
                bytes.push(document.dialect.separator);
            }
            match old.get(column).filter(|(_, number)| same(*number, value)) {
                Some((cell, _)) => {
                    let text = &source[cell.start..cell.end];
                    bytes.extend_from_slice(&quoted_again(text, document.dialect.separator));
                }
                None if value.is_nan() => {}
                None => bytes.extend_from_slice(cell_text(document, value).as_bytes()),
            }
        }
        bytes.extend_from_slice(line_end);
    }
    bytes
}

/// A number as the document has its own.
fn cell_text(document: &Document, value: f64) -> String {
    let text = number_text(value);
    if document.dialect.decimal_comma { text.replace('.', ",") } else { text }
}

/// A cell's text with quotes round it where it needs them. Doubled quotes inside it are still doubled.
fn quoted_again(text: &[u8], separator: u8) -> Vec<u8> {
    if text.iter().any(|&byte| byte == separator || matches!(byte, b'"' | b'\r' | b'\n')) {
        [b"\"", text, b"\""].concat()
    } else {
        text.to_vec()
    }
}

/// The same number, or both missing. A text that says 0 says −0 as well.
fn same(a: f64, b: f64) -> bool {
    a == b || (a.is_nan() && b.is_nan())
}
