//! Writing a clip back into the CSV text it came from.

use crate::clip::{Clip, RotationTrack, Stored};
use crate::exchange::Note;
use crate::rotor::Rotor;

use super::cells::{Cell, Records, comma_number, number};
use super::columns::Role;
use super::create::{from_clip, number_text};
use super::read::Document;

/// The file of `document` with the cells that differ between `before`, the clip as read from it, and `after`.
///
/// A cell whose number did not change keeps its very text, with the blanks and quotes around it; without a change the
/// bytes are those that were read. Where the rows differ in number or times they are written anew under the same header;
/// a clip with another number of joints becomes a new file, as by [`from_clip`]. Changed numbers have as many digits as
/// it takes to read the same number again.
pub fn write(document: &Document, before: &Clip, after: &Clip) -> (Vec<u8>, Vec<Note>) {
    if after.skeleton.len() != before.skeleton.len() {
        return from_clip(after);
    }
    let same_grid = before.grid == after.grid;
    let same_joints = (0..before.joints.len()).all(|joint| before.same_joint(after, joint));
    if same_grid && same_joints {
        return (document.bytes.to_vec(), Vec::new());
    }
    let cells = cells(document);
    let mut notes = Vec::new();
    let values = values(document, &cells, before, after, &mut notes);
    let bytes = if same_grid {
        patched(document, &cells, &values)
    } else {
        rewritten(document, &cells, &values, after.grid.count())
    };
    (bytes, notes)
}

/// Every cell of the rows, and its number; NaN for columns that are not used.
fn cells(document: &Document) -> Vec<(Cell, f64)> {
    let bytes = &document.bytes[..];
    let mut records = Records::at(bytes, document.dialect, document.rows_start);
    let width = document.columns.roles.len();
    let mut cells = Vec::with_capacity(document.rows * width);
    while records.next().unwrap_or(false) {
        cells.extend(records.cells.iter().take(width).zip(&document.columns.roles).map(|(&cell, role)| {
            let with_comma = || comma_number(bytes, cell).filter(|_| document.dialect.decimal_comma);
            let value = if *role == Role::Unused { None } else { number(bytes, cell).or_else(with_comma) };
            (cell, value.unwrap_or(f64::NAN))
        }));
    }
    cells
}

/// The numbers of `after`, row by row: bit for bit those of the document where nothing changed.
fn values(
    document: &Document,
    cells: &[(Cell, f64)],
    before: &Clip,
    after: &Clip,
    notes: &mut Vec<Note>,
) -> Vec<f64> {
    let roles = &document.columns.roles;
    let width = roles.len();
    let same_grid = before.grid == after.grid;
    let rows = if same_grid { document.rows } else { after.grid.count() };
    let mut values = vec![f64::NAN; rows * width];
    if same_grid {
        for (value, (_, number)) in values.iter_mut().zip(cells) {
            *value = *number;
        }
    } else if let Some(column) = roles.iter().position(|role| *role == Role::Time) {
        let scale = document.columns.unit.in_a_second();
        for row in 0..rows {
            values[row * width + column] = (after.grid.time(row) + document.start_secs) * scale;
        }
    }
    let mut of_joint: Vec<Vec<usize>> = vec![Vec::new(); after.skeleton.len()];
    for (column, role) in roles.iter().enumerate() {
        match *role {
            Role::Quaternion(joint, _)
            | Role::Plane(joint, _)
            | Role::Angle(joint, _)
            | Role::Place(joint, _) => of_joint[joint].push(column),
            Role::Time | Role::Unused => {}
        }
    }
    for (joint, columns) in of_joint.iter().enumerate() {
        if same_grid && before.same_joint(after, joint) {
            continue;
        }
        let mut out = JointCells { document, before, after, joint, columns, same_grid, values: &mut values };
        out.turns(rows, notes);
        out.places(rows, notes);
    }
    values
}

/// The cells that belong to one joint.
struct JointCells<'a> {
    document: &'a Document,
    before: &'a Clip,
    after: &'a Clip,
    joint: usize,
    columns: &'a [usize],
    /// The values are the document's, and only changes are to be set.
    same_grid: bool,
    values: &'a mut [f64],
}

impl JointCells<'_> {
    fn note(&self, text: String) -> Note {
        Note::new(format!("joint {}", self.after.skeleton.label(self.joint)), text)
    }

    fn row(&mut self, row: usize) -> &mut [f64] {
        let width = self.document.columns.roles.len();
        &mut self.values[row * width..(row + 1) * width]
    }

    fn turns(&mut self, rows: usize, notes: &mut Vec<Note>) {
        let Some(track) = self.after.rotation(self.joint) else { return };
        let keyed = track.times == self.after.grid.times && track.keys.len() == rows;
        let changed: Vec<usize> = match self.before.rotation(self.joint) {
            Some(old) if self.same_grid && keyed => track.changed_keys(old),
            _ => (0..rows).collect(),
        };
        let Some(first) = changed.first().copied() else { return };
        let roles = &self.document.columns.roles;
        let kind =
            self.columns.iter().map(|&column| roles[column]).find(|role| !matches!(role, Role::Place(..)));
        match kind {
            Some(Role::Quaternion(..)) => {
                for row in changed {
                    let parts = key(track, self.after.grid.time(row), keyed.then_some(row)).to_xyzw();
                    self.set(row, |role| match role {
                        Role::Quaternion(_, part) => Some(parts[part]),
                        _ => None,
                    });
                }
            }
            Some(Role::Plane(..)) => {
                for row in changed {
                    let degrees = match &track.stored {
                        Stored::PlaneAngles(degrees) if keyed => degrees[row],
                        _ => key(track, self.after.grid.time(row), keyed.then_some(row))
                            .normalize()
                            .plane_angles()
                            .to_degrees(),
                    };
                    self.set(row, |role| match role {
                        Role::Plane(_, part) => Some(degrees[part]),
                        _ => None,
                    });
                }
            }
            Some(Role::Angle(..)) => self.angles(track, &changed, keyed, notes),
            _ => notes.push(self.note(format!(
                "expected columns for its turn, found none: {} rows from row {first} on are not written",
                changed.len()
            ))),
        }
    }

    fn angles(&mut self, track: &RotationTrack, changed: &[usize], keyed: bool, notes: &mut Vec<Note>) {
        let turns = self.document.turns(self.joint);
        let count = turns.groups.len();
        let columns: Vec<usize> = turns.groups.iter().filter_map(|group| group.1.first().copied()).collect();
        let (mut worst_rad, mut worst_row) = (0.0_f64, 0);
        for &row in changed {
            let wanted = key(track, self.after.grid.time(row), keyed.then_some(row));
            let stored = track.file_angles().filter(|angles| {
                keyed
                    && angles.axes.iter().copied().eq(turns.axes())
                    && angles.degrees[row][count..].iter().all(|&angle| angle == 0.0)
            });
            let angles = match stored {
                Some(angles) => angles.degrees[row][..count].to_vec(),
                None if !wanted.is_finite() => continue,
                None => {
                    let before = self.row(row.saturating_sub(1));
                    let reference: Vec<f64> = columns
                        .iter()
                        .map(|&column| if before[column].is_finite() { before[column] } else { 0.0 })
                        .collect();
                    turns.nearest(wanted.normalize(), &reference)
                }
            };
            if wanted.is_finite() {
                let off = turns.rotor(&angles).turn_to(wanted.normalize());
                if off > worst_rad {
                    (worst_rad, worst_row) = (off, row);
                }
            }
            let cells = self.row(row);
            for (&column, angle) in columns.iter().zip(angles) {
                cells[column] = angle;
            }
        }
        if worst_rad.to_degrees() > 1e-5 {
            notes.push(self.note(format!(
                "expected three angles to write any rotation, found {count}: up to {:.3} degrees off, at row {worst_row}",
                worst_rad.to_degrees()
            )));
        }
    }

    fn places(&mut self, rows: usize, notes: &mut Vec<Note>) {
        let Some(track) = &self.after.joints[self.joint].translation else { return };
        let old = self.before.joints[self.joint].translation.as_ref();
        let keyed = track.times == self.after.grid.times && track.keys.len() == rows;
        let roles = &self.document.columns.roles;
        let has = |axis: usize| {
            self.columns
                .iter()
                .any(|&column| matches!(roles[column], Role::Place(_, own) if own.index() == axis))
        };
        let has = [has(0), has(1), has(2)];
        let rest = self.after.skeleton.joints()[self.joint].rest.translation;
        let (mut worst, mut worst_row) = (0.0_f64, 0);
        for row in 0..rows {
            let place = if keyed { Some(track.keys[row]) } else { track.at(self.after.grid.time(row)) };
            let Some(place) = place else { continue };
            if self.same_grid && keyed && old.and_then(|old| old.keys.get(row)) == Some(&place) {
                continue;
            }
            self.set(row, |role| match role {
                Role::Place(_, axis) => Some(place[axis.index()]),
                _ => None,
            });
            for axis in (0..3).filter(|&axis| !has[axis]) {
                let off = (place[axis] - rest[axis]).abs();
                if off > worst {
                    (worst, worst_row) = (off, row);
                }
            }
        }
        if worst > 1e-9 {
            notes.push(self.note(format!(
                "expected columns for its place, found too few: up to {worst:.6} off, at row {worst_row}"
            )));
        }
    }

    /// Sets what `value` gives for the roles of this joint's columns.
    fn set(&mut self, row: usize, value: impl Fn(Role) -> Option<f64>) {
        let (document, columns) = (self.document, self.columns);
        let cells = self.row(row);
        for &column in columns {
            if let Some(value) = value(document.columns.roles[column]) {
                cells[column] = value;
            }
        }
    }
}

/// The key as it is, or what the track plays at a time.
fn key(track: &RotationTrack, time_secs: f64, key: Option<usize>) -> Rotor {
    key.and_then(|key| track.keys.get(key)).copied().unwrap_or_else(|| track.at(time_secs))
}

/// The document with the numbers that differ from it.
fn patched(document: &Document, cells: &[(Cell, f64)], values: &[f64]) -> Vec<u8> {
    let mut bytes = Vec::with_capacity(document.bytes.len() + 64);
    let mut copied = 0;
    for ((cell, number), value) in cells.iter().zip(values) {
        if !same(*number, *value) {
            bytes.extend_from_slice(&document.bytes[copied..cell.start]);
            bytes.extend_from_slice(cell_text(document, *value).as_bytes());
            copied = cell.end;
        }
    }
    bytes.extend_from_slice(&document.bytes[copied..]);
    bytes
}

/// The document's header with rows of its own.
fn rewritten(document: &Document, cells: &[(Cell, f64)], values: &[f64], rows: usize) -> Vec<u8> {
    let source = &document.bytes[..];
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
    let width = document.columns.roles.len();
    let is_time = |column: usize| document.columns.roles[column] == Role::Time;
    // A stretch cut from the clip starts at one of its rows, though at another time.
    let first_row = values.get(..width).unwrap_or_default();
    let offset = cells
        .chunks_exact(width)
        .position(|row| {
            row.iter()
                .zip(first_row)
                .enumerate()
                .all(|(column, ((_, number), value))| is_time(column) || same(*number, *value))
        })
        .map_or(usize::MAX, |row| row * width);
    for row in 0..rows {
        for column in 0..width {
            if column > 0 {
                bytes.push(document.dialect.separator);
            }
            let value = values[row * width + column];
            let index = offset.saturating_add(row * width + column);
            match cells.get(index).filter(|(_, number)| same(*number, value)) {
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
