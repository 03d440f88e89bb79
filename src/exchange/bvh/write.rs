//! Writing a clip back into the BVH text it came from.

use std::io::Write as _;

use crate::clip::{Clip, RotationTrack};
use crate::exchange::Note;
use crate::exchange::decimal::push_six_decimals;
use crate::exchange::turns::Turns;
use crate::rotor::{Axis, Rotor};

use super::create::from_clip;
use super::read::{Document, turns_of};
use super::scanner::{Number, Scanner};
use super::syntax::Channel;

/// The file of `document` with the numbers that differ between `before`, the clip as read from it, and `after`.
///
/// What did not change keeps its very text: numbers, spacing, line ends, the whole hierarchy. Without a change the bytes
/// are those that were read. Changed angles have 6 decimals. A joint with fewer than three turns takes the nearest
/// rotation it can express, and a note says how far that is off. Where the frames differ in number or spacing the rows
/// are written anew under the same hierarchy, again with the text of every number that is the same; a clip with another
/// number of joints becomes a new file, as by [`from_clip`].
pub fn write(document: &Document, before: &Clip, after: &Clip) -> (Vec<u8>, Vec<Note>) {
    if after.skeleton.len() != document.channels.len() {
        return from_clip(after);
    }
    let same_joints = before.joints.len() == after.joints.len()
        && (0..before.joints.len()).all(|joint| before.same_joint(after, joint));
    if same_joints && before.grid == after.grid {
        return (document.bytes.to_vec(), Vec::new());
    }
    let numbers = numbers(document);
    let mut notes = Vec::new();
    let rows = rows(document, &numbers, before, after, &mut notes);
    let bytes = if before.grid == after.grid && rows.len() == document.frames * document.columns() {
        patched(document, &numbers, &rows)
    } else {
        rewritten(document, &numbers, before, after, &rows)
    };
    (bytes, notes)
}

/// Every number of the complete frames, and where it stands.
fn numbers(document: &Document) -> Vec<Number> {
    let mut scanner = Scanner::new(&document.bytes, document.rows_start);
    let count = document.frames * document.columns();
    let mut numbers = Vec::with_capacity(count);
    let mut notes = Vec::new();
    while numbers.len() < count {
        match scanner.number() {
            Ok(Some(number)) => numbers.push(number),
            Ok(None) => break,
            Err(()) => {
                let start = scanner.pos();
                super::syntax::skip_comments(&mut scanner, &mut notes);
                if scanner.pos() == start {
                    break;
                }
            }
        }
    }
    numbers
}

/// The numbers of `after`, frame by frame: bit for bit those of the document where nothing changed.
fn rows(
    document: &Document,
    numbers: &[Number],
    before: &Clip,
    after: &Clip,
    notes: &mut Vec<Note>,
) -> Vec<f64> {
    let columns = document.columns();
    let same_grid = before.grid == after.grid;
    let frames = if same_grid { document.frames } else { after.grid.count() };
    let mut values = vec![0.0; frames * columns];
    if same_grid {
        for (value, number) in values.iter_mut().zip(numbers) {
            *value = number.value;
        }
    }
    for (joint, first) in document.first_columns().into_iter().enumerate() {
        if same_grid && before.same_joint(after, joint) {
            continue;
        }
        let mut out =
            JointRows { document, before, after, joint, first, columns, same_grid, values: &mut values };
        out.turns(frames, notes);
        out.places(frames, notes);
    }
    values
}

/// The part of the rows that belongs to one joint.
struct JointRows<'a> {
    document: &'a Document,
    before: &'a Clip,
    after: &'a Clip,
    joint: usize,
    first: usize,
    columns: usize,
    /// The rows hold the document's numbers, and only changes are to be set.
    same_grid: bool,
    values: &'a mut [f64],
}

impl JointRows<'_> {
    fn channels(&self) -> &[Channel] {
        &self.document.channels[self.joint]
    }

    fn note(&self, text: String) -> Note {
        Note::new(format!("joint {}", self.after.skeleton.label(self.joint)), text)
    }

    fn row(&mut self, frame: usize) -> &mut [f64] {
        let start = frame * self.columns + self.first;
        &mut self.values[start..]
    }

    /// The angles of a frame, one for each group of channels.
    fn angles(&mut self, turns: &Turns, frame: usize) -> Vec<f64> {
        let row = self.row(frame);
        turns.groups.iter().map(|(_, columns)| columns.iter().map(|&column| row[column]).sum()).collect()
    }

    fn turns(&mut self, frames: usize, notes: &mut Vec<Note>) {
        let turns = turns_of(self.channels());
        let Some(track) = self.after.rotation(self.joint) else { return };
        let old = self.before.rotation(self.joint);
        let keyed = track.times == self.after.grid.times;
        let changed: Vec<usize> = match old {
            Some(old) if self.same_grid && keyed && old.keys.len() == frames => track.changed_keys(old),
            _ => (0..frames).collect(),
        };
        let (mut worst_rad, mut worst_frame, mut unsound) = (0.0_f64, 0, 0_usize);
        for frame in changed {
            let stored = track.file_angles().filter(|_| keyed);
            let own = stored.and_then(|angles| {
                let degrees = angles.degrees[frame];
                let fits = turns.groups.len() <= 3
                    && angles.axes.iter().copied().eq(turns.axes())
                    && degrees[turns.groups.len()..].iter().all(|&angle| angle == 0.0);
                fits.then(|| degrees[..turns.groups.len()].to_vec())
            });
            let wanted = wanted(track, self.after.grid.time(frame), keyed.then_some(frame));
            let angles = match own {
                // With the same frames, or rows made anew, the numbers go in as they are, missing ones too.
                Some(own) => own,
                None if !wanted.is_finite() => {
                    unsound += 1;
                    continue;
                }
                None => {
                    let reference = self.reference(&turns, frame);
                    turns.nearest(wanted.normalize(), &reference)
                }
            };
            if wanted.is_finite() {
                let off = turns.rotor(&angles).turn_to(wanted.normalize());
                if off > worst_rad {
                    (worst_rad, worst_frame) = (off, frame);
                }
            }
            self.set_angles(&turns, frame, &angles);
        }
        if unsound > 0 {
            notes.push(
                self.note(format!("expected finite turns, found {unsound} that are not: left as they were")),
            );
        }
        // Half a unit of the last decimal is what every number may be off.
        if worst_rad.to_degrees() > 1e-5 {
            let axes: String = turns.axes().map(Axis::letter).collect();
            let has = if axes.is_empty() { "none".to_owned() } else { axes };
            notes.push(self.note(format!(
                "expected three turns to write any rotation, found {has}: up to {:.3} degrees off, at frame {worst_frame}",
                worst_rad.to_degrees()
            )));
        }
    }

    /// Sound angles near those of a frame: the frame before, else the same as it was.
    fn reference(&mut self, turns: &Turns, frame: usize) -> Vec<f64> {
        let candidates = [frame.checked_sub(1), Some(frame)];
        for candidate in candidates.into_iter().flatten() {
            let angles = self.angles(turns, candidate);
            if angles.iter().all(|angle| angle.is_finite()) {
                return angles;
            }
        }
        vec![0.0; turns.groups.len()]
    }

    fn set_angles(&mut self, turns: &Turns, frame: usize, angles: &[f64]) {
        let old = self.angles(turns, frame);
        let row = self.row(frame);
        for ((angle, old), (_, columns)) in angles.iter().zip(old).zip(&turns.groups) {
            if same(*angle, old) {
                continue;
            }
            let Some((&leading, others)) = columns.split_first() else { continue };
            // Channels about the same axis add up: the first takes the change, unless the others are no numbers.
            let rest: f64 = others.iter().map(|&column| row[column]).sum();
            if rest.is_nan() {
                for &column in others {
                    row[column] = 0.0;
                }
                row[leading] = *angle;
            } else {
                row[leading] = angle - rest;
            }
        }
    }

    fn places(&mut self, frames: usize, notes: &mut Vec<Note>) {
        let Some(track) = &self.after.joints[self.joint].translation else { return };
        let old = self.before.joints.get(self.joint).and_then(|tracks| tracks.translation.as_ref());
        let keyed = track.times == self.after.grid.times && track.keys.len() == frames;
        let columns: Vec<Option<usize>> = (0..3)
            .map(|axis| {
                let is_axis =
                    |channel: &Channel| matches!(channel, Channel::Position(own) if own.index() == axis);
                self.channels().iter().position(is_axis)
            })
            .collect();
        let rest = self.after.skeleton.joints()[self.joint].rest.translation;
        let (mut worst, mut worst_frame) = (0.0_f64, 0);
        for frame in 0..frames {
            let place = if keyed { Some(track.keys[frame]) } else { track.at(self.after.grid.time(frame)) };
            let Some(place) = place else { continue };
            let same = self.same_grid && keyed && old.and_then(|old| old.keys.get(frame)) == Some(&place);
            if same {
                continue;
            }
            for (axis, column) in columns.iter().enumerate() {
                let off = (place[axis] - rest[axis]).abs();
                if let Some(column) = column {
                    if place[axis].is_finite() || !self.same_grid {
                        self.row(frame)[*column] = place[axis];
                    }
                } else if off > worst {
                    (worst, worst_frame) = (off, frame);
                }
            }
        }
        if worst > 1e-9 {
            notes.push(self.note(format!(
                "expected position channels for its place, found too few: up to {worst:.6} off, at frame {worst_frame}"
            )));
        }
    }
}

/// The turn that is to be written: the key as it is, or what the track plays at a time.
fn wanted(track: &RotationTrack, time_secs: f64, key: Option<usize>) -> Rotor {
    key.and_then(|key| track.keys.get(key)).copied().unwrap_or_else(|| track.at(time_secs))
}

/// The document with the numbers that differ from it.
fn patched(document: &Document, numbers: &[Number], values: &[f64]) -> Vec<u8> {
    let mut bytes = Vec::with_capacity(document.bytes.len() + 64);
    let mut copied = 0;
    for (number, value) in numbers.iter().zip(values) {
        if same(number.value, *value) {
            continue;
        }
        bytes.extend_from_slice(&document.bytes[copied..number.start]);
        // Numbers that were run together are told apart by their sign alone.
        let touches = bytes.last().is_some_and(|byte| !super::scanner::is_blank(*byte));
        let start = bytes.len();
        push_decimal(*value, document.decimal_comma, &mut bytes);
        if touches && bytes[start] != b'-' {
            bytes.insert(start, b' ');
        }
        copied = number.end;
    }
    bytes.extend_from_slice(&document.bytes[copied..]);
    bytes
}

/// The document's hierarchy with rows of its own.
fn rewritten(
    document: &Document,
    numbers: &[Number],
    before: &Clip,
    after: &Clip,
    values: &[f64],
) -> Vec<u8> {
    let source = &document.bytes[..];
    let line_end: &[u8] = match source.iter().position(|byte| matches!(byte, b'\r' | b'\n')) {
        Some(at) if source[at..].starts_with(b"\r\n") => b"\r\n",
        Some(at) if source[at] == b'\r' => b"\r",
        _ => b"\n",
    };
    let mut bytes = Vec::with_capacity(source.len());
    if let Some(head) = &document.head {
        bytes.extend_from_slice(&source[..head.start]);
    } else {
        bytes.extend_from_slice(source.trim_ascii_end());
        bytes.extend_from_slice(line_end);
        bytes.extend_from_slice(b"MOTION");
    }
    bytes.extend_from_slice(line_end);
    // Writing into a Vec can't fail.
    let _ = write!(bytes, "Frames: {}", after.grid.count());
    bytes.extend_from_slice(line_end);
    bytes.extend_from_slice(b"Frame Time: ");
    let step_secs = after.grid.times.median_step().unwrap_or(1.0 / after.grid.rate);
    let old_text = document
        .head
        .and_then(|head| head.frame_secs_text)
        .filter(|_| before.grid.rate.to_bits() == after.grid.rate.to_bits());
    if let Some((start, end)) = old_text {
        bytes.extend_from_slice(&source[start..end]);
    } else {
        let text = step_secs.to_string();
        bytes.extend_from_slice(with_mark(text, document.decimal_comma).as_bytes());
    }
    bytes.extend_from_slice(line_end);
    let columns = document.columns().max(1);
    // A stretch cut from the clip starts at one of its rows.
    let first_row = values.get(..columns).unwrap_or_default();
    let offset = numbers
        .chunks_exact(columns)
        .position(|row| row.iter().zip(first_row).all(|(number, value)| same(number.value, *value)))
        .map_or(usize::MAX, |row| row * columns);
    for (row, values) in values.chunks_exact(columns).enumerate() {
        for (column, value) in values.iter().enumerate() {
            if column > 0 {
                bytes.push(b' ');
            }
            let index = offset.saturating_add(row * columns + column);
            match numbers.get(index).filter(|number| same(number.value, *value)) {
                Some(number) => bytes.extend_from_slice(&source[number.start..number.end]),
                None => push_decimal(*value, document.decimal_comma, &mut bytes),
            }
        }
        bytes.extend_from_slice(line_end);
    }
    bytes
}

/// The same number, or both missing. A text that says 0 says −0 as well.
fn same(a: f64, b: f64) -> bool {
    a == b || (a.is_nan() && b.is_nan())
}

/// Fixed notation with 6 decimals.
fn push_decimal(value: f64, comma: bool, bytes: &mut Vec<u8>) {
    let start = bytes.len();
    push_six_decimals(value, bytes);
    if comma && let Some(point) = bytes[start..].iter_mut().find(|byte| **byte == b'.') {
        *point = b',';
    }
}

fn with_mark(text: String, comma: bool) -> String {
    if comma { text.replace('.', ",") } else { text }
}
