//! Writing a clip back into the BVH text it came from, frame by frame.

use std::io::{self, Write};

use crate::clip::{Clip, FileAngles, RotationTrack, VectorTrack, continuous_angles_to};
use crate::exchange::Note;
use crate::exchange::decimal::push_six_decimals;
use crate::exchange::turns::Turns;
use crate::rotor::{Axis, Rotor};

use super::create::{self, PORTION};
use super::read::{Document, turns_of};
use super::scanner::{Number, Scanner};
use super::syntax::Channel;

/// The file of `document` with the numbers that differ between `before`, the clip as read from it, and `after`.
///
/// What did not change keeps its very text: numbers, spacing, line ends, the whole hierarchy. Without a change the bytes
/// are those that were read. Changed angles have 6 decimals. A joint with fewer than three turns takes the nearest
/// rotation it can express, and a note says how far that is off. Where the frames differ in number or spacing the rows
/// are written anew under the same hierarchy, again with the text of every number that is the same; a clip with another
/// number of joints becomes a new file, as by [`from_clip`](super::from_clip).
pub fn write(document: &Document, before: &Clip, after: &Clip) -> (Vec<u8>, Vec<Note>) {
    let mut bytes = Vec::with_capacity(document.file.bytes().len() + 64);
    let notes = write_to(document, before, after, &mut bytes).unwrap_or_default();
    (bytes, notes)
}

/// As [`write()`], into `out`: of the text never more than a portion is at hand.
///
/// # Errors
/// When `out` fails.
pub fn write_to(
    document: &Document,
    before: &Clip,
    after: &Clip,
    out: &mut dyn Write,
) -> io::Result<Vec<Note>> {
    if after.skeleton.len() != document.channels.len() {
        return create::from_clip_to(after, out);
    }
    let same_joints = before.joints.len() == after.joints.len()
        && (0..before.joints.len()).all(|joint| before.same_joint(after, joint));
    let same_grid = before.grid == after.grid && after.grid.count() == document.frames;
    if same_joints && same_grid {
        out.write_all(document.file.bytes())?;
        return Ok(Vec::new());
    }
    if document.file.is_plain() {
        return write_text(document, before, after, same_grid, out);
    }
    let mut text = Vec::with_capacity(document.file.text().len() + 64);
    let notes = write_text(document, before, after, same_grid, &mut text)?;
    out.write_all(&document.file.encoded(text))?;
    Ok(notes)
}

/// The changed text.
fn write_text(
    document: &Document,
    before: &Clip,
    after: &Clip,
    same_grid: bool,
    out: &mut dyn Write,
) -> io::Result<Vec<Note>> {
    let joints = document.first_columns().into_iter().enumerate();
    let mut joints: Vec<JointRows<'_>> = joints
        .filter(|&(joint, _)| !(same_grid && before.same_joint(after, joint)))
        .map(|(joint, first)| JointRows::new(document, before, after, joint, first, same_grid))
        .collect();
    if same_grid {
        patch(document, &mut joints, out)?;
    } else {
        rewrite(document, before, after, &mut joints, out)?;
    }
    Ok(joints.iter().flat_map(JointRows::notes).collect())
}

/// Reads the numbers of the complete frames once more, and where each stands.
struct Numbers<'a> {
    scanner: Scanner<'a>,
    columns: usize,
    row: Vec<Number>,
}

impl<'a> Numbers<'a> {
    fn new(document: &'a Document) -> Self {
        let scanner = Scanner::new(document.file.text(), document.rows_start);
        Self { scanner, columns: document.columns(), row: Vec::new() }
    }

    /// The numbers of the next frame; fewer at the end of the text.
    fn next(&mut self) -> &[Number] {
        self.row.clear();
        while self.row.len() < self.columns {
            match self.scanner.number() {
                Ok(Some(number)) => self.row.push(number),
                Ok(None) => break,
                Err(()) => {
                    let start = self.scanner.pos();
                    super::syntax::skip_comments(&mut self.scanner, &mut Vec::new());
                    if self.scanner.pos() == start {
                        break;
                    }
                }
            }
        }
        &self.row
    }
}

/// The part of the rows that belongs to one joint that changed.
struct JointRows<'a> {
    label: &'a str,
    channels: &'a [Channel],
    first: usize,
    turns: Turns,
    track: Option<&'a RotationTrack>,
    /// Whether the track has a key at each frame.
    keyed: bool,
    /// The file's own angles, where they stand in the channels as they are.
    stored: Option<&'a FileAngles>,
    /// Frames whose turn is written; ascending.
    changed: Vec<usize>,
    /// How many of them are done.
    next: usize,
    /// Angles that were found for those of the changed frames that have none of their own, chosen as a whole.
    found: Vec<(usize, [f64; 3])>,
    next_found: usize,
    /// The angles of the frame before, sound ones.
    reference: Vec<f64>,
    place: Option<PlaceRows<'a>>,
    after: &'a Clip,
    same_grid: bool,
    worst_rad: f64,
    worst_frame: usize,
    unsound: usize,
}

struct PlaceRows<'a> {
    track: &'a VectorTrack,
    keyed: bool,
    old: Option<&'a VectorTrack>,
    columns: [Option<usize>; 3],
    rest: [f64; 3],
    worst: f64,
    worst_frame: usize,
}

impl<'a> JointRows<'a> {
    fn new(
        document: &'a Document,
        before: &'a Clip,
        after: &'a Clip,
        joint: usize,
        first: usize,
        same_grid: bool,
    ) -> Self {
        let channels = &document.channels[joint][..];
        let turns = turns_of(channels);
        let frames = after.grid.count();
        let track = after.rotation(joint);
        let keyed = track.is_some_and(|track| track.times == after.grid.times && track.keys.len() == frames);
        let stored = track
            .filter(|_| keyed)
            .and_then(RotationTrack::file_angles)
            .filter(|angles| turns.groups.len() <= 3 && angles.axes.iter().copied().eq(turns.axes()));
        let changed = match (track, before.rotation(joint)) {
            (None, _) => Vec::new(),
            (Some(track), Some(old)) if same_grid && keyed && old.keys.len() == frames => {
                track.changed_keys(old)
            }
            _ => (0..frames).collect(),
        };
        let mut columns = [None; 3];
        for (column, channel) in channels.iter().enumerate() {
            if let Channel::Position(axis) = channel {
                columns[axis.index()] = Some(column);
            }
        }
        let place = after.joints[joint].translation.as_ref().map(|track| PlaceRows {
            track,
            keyed: track.times == after.grid.times && track.keys.len() == frames,
            old: before.joints.get(joint).and_then(|tracks| tracks.translation.as_ref()),
            columns,
            rest: after.skeleton.joints()[joint].rest.translation.to_array(),
            worst: 0.0,
            worst_frame: 0,
        });
        let mut rows = Self {
            label: after.skeleton.label(joint),
            channels,
            first,
            reference: vec![0.0; turns.groups.len()],
            turns,
            track,
            keyed,
            stored,
            changed,
            next: 0,
            found: Vec::new(),
            next_found: 0,
            place,
            after,
            same_grid,
            worst_rad: 0.0,
            worst_frame: 0,
            unsound: 0,
        };
        rows.found = rows.find_angles();
        rows
    }

    /// Continuous angles for the changed frames that have none of their own, run by run.
    fn find_angles(&self) -> Vec<(usize, [f64; 3])> {
        let (Some(order), 3) = (self.turns.order(), self.turns.groups.len()) else { return Vec::new() };
        let open: Vec<usize> =
            self.changed.iter().copied().filter(|&frame| self.own(frame).is_none()).collect();
        let sound = |frame: usize| {
            let degrees = &self.stored?.degrees;
            let triple = (frame < degrees.len()).then(|| degrees.triple(frame))?;
            triple.iter().all(|angle| angle.is_finite()).then(|| triple.map(f64::to_radians))
        };
        let mut found: Vec<(usize, [f64; 3])> = Vec::with_capacity(open.len());
        for run in open.chunk_by(|a, b| *b == a + 1) {
            let rotors: Vec<Rotor> = run.iter().map(|&frame| self.wanted(frame)).collect();
            let before = run[0].checked_sub(1).and_then(sound).unwrap_or_default();
            let after = sound(run[0] + run.len());
            let angles = continuous_angles_to(order, &rotors, before, after);
            let degrees = angles.into_iter().map(|triple| triple.map(f64::to_degrees));
            found.extend(run.iter().copied().zip(degrees));
        }
        found
    }

    /// The turn that is to be written at a frame.
    fn wanted(&self, frame: usize) -> Rotor {
        let Some(track) = self.track else { return Rotor::IDENTITY };
        if self.keyed { track.keys.rotor(frame) } else { track.at(self.after.grid.time(frame)) }
    }

    /// The file's own angles at a frame, where the channels can say them.
    fn own(&self, frame: usize) -> Option<[f64; 3]> {
        let degrees = &self.stored?.degrees;
        let triple = (frame < degrees.len()).then(|| degrees.triple(frame))?;
        let beyond = self.turns.groups.len().min(3);
        triple[beyond..].iter().all(|&angle| angle == 0.0).then_some(triple)
    }

    /// Puts what changed at a frame into its row. To be called for the frames in order.
    fn put(&mut self, frame: usize, row: &mut [f64]) {
        let first = self.first;
        let row = &mut row[first..first + self.channels.len()];
        if frame == 0 {
            // Nothing stands before it but itself as it was.
            self.keep(row);
        }
        if self.changed.get(self.next) == Some(&frame) {
            self.next += 1;
            self.put_turn(frame, row);
        }
        self.keep(row);
        if let Some(place) = &mut self.place {
            place.put(frame, row, self.after, self.same_grid);
        }
    }

    /// Remembers the sound angles of a row.
    fn keep(&mut self, row: &[f64]) {
        let angles = self.turns.groups.iter().map(|(_, columns)| sum(row, columns));
        for (reference, angle) in self.reference.iter_mut().zip(angles) {
            if angle.is_finite() {
                *reference = angle;
            }
        }
    }

    fn put_turn(&mut self, frame: usize, row: &mut [f64]) {
        let wanted = self.wanted(frame);
        let found =
            self.found.get(self.next_found).filter(|(own, _)| *own == frame).map(|(_, angles)| *angles);
        self.next_found += usize::from(found.is_some());
        let angles: Vec<f64> = match (self.own(frame), found) {
            // The numbers go in as they are, missing ones too.
            (Some(own), _) => own[..self.turns.groups.len().min(3)].to_vec(),
            _ if !wanted.is_finite() => {
                self.unsound += 1;
                return;
            }
            (None, Some(found)) => found.to_vec(),
            (None, None) => self.turns.nearest(wanted.normalize(), &self.reference),
        };
        if wanted.is_finite() {
            let off = self.turns.rotor(&angles).turn_to(wanted.normalize());
            if off > self.worst_rad {
                (self.worst_rad, self.worst_frame) = (off, frame);
            }
        }
        for (angle, (_, columns)) in angles.into_iter().zip(&self.turns.groups) {
            let Some((&leading, others)) = columns.split_first() else { continue };
            if same(angle, sum(row, columns)) {
                continue;
            }
            // Channels about the same axis add up: the first takes the change, unless the others are no numbers.
            let rest = sum(row, others);
            if rest.is_nan() {
                for &column in others {
                    row[column] = 0.0;
                }
                row[leading] = angle;
            } else {
                row[leading] = angle - rest;
            }
        }
    }

    fn notes(&self) -> Vec<Note> {
        let note = |text: String| Note::new(format!("joint {}", self.label), text);
        let mut notes = Vec::new();
        if self.unsound > 0 {
            let text =
                format!("expected finite turns, found {} that are not: left as they were", self.unsound);
            notes.push(note(text));
        }
        // Half a unit of the last decimal is what every number may be off.
        if self.worst_rad.to_degrees() > 1e-5 {
            let axes: String = self.turns.axes().map(Axis::letter).collect();
            let has = if axes.is_empty() { "none".to_owned() } else { axes };
            notes.push(note(format!(
                "expected three turns to write any rotation, found {has}: up to {:.3} degrees off, at frame {}",
                self.worst_rad.to_degrees(),
                self.worst_frame
            )));
        }
        if let Some(PlaceRows { worst, worst_frame, .. }) =
            self.place.as_ref().filter(|place| place.worst > 1e-9)
        {
            notes.push(note(format!(
                "expected position channels for its place, found too few: up to {worst:.6} off, at frame {worst_frame}"
            )));
        }
        notes
    }
}

impl PlaceRows<'_> {
    fn put(&mut self, frame: usize, row: &mut [f64], after: &Clip, same_grid: bool) {
        let place = if self.keyed {
            Some(self.track.keys.vector(frame))
        } else {
            self.track.at(after.grid.time(frame))
        };
        let Some(place) = place else { return };
        let is_old = |old: &VectorTrack| frame < old.keys.len() && old.keys.vector(frame) == place;
        if same_grid && self.keyed && self.old.is_some_and(is_old) {
            return;
        }
        for axis in 0..3 {
            let off = (place[axis] - self.rest[axis]).abs();
            if let Some(column) = self.columns[axis] {
                if place[axis].is_finite() || !same_grid {
                    row[column] = place[axis];
                }
            } else if off > self.worst {
                (self.worst, self.worst_frame) = (off, frame);
            }
        }
    }
}

fn sum(row: &[f64], columns: &[usize]) -> f64 {
    columns.iter().map(|&column| row[column]).sum()
}

/// The document with the numbers that differ from it.
fn patch(document: &Document, joints: &mut [JointRows<'_>], out: &mut dyn Write) -> io::Result<()> {
    let source = document.file.text();
    let mut numbers = Numbers::new(document);
    let mut bytes = Vec::with_capacity(PORTION + PORTION / 4);
    let mut values: Vec<f64> = Vec::with_capacity(document.columns());
    let mut copied = 0;
    for frame in 0..document.frames {
        let row = numbers.next();
        values.clear();
        values.extend(row.iter().map(|number| number.value));
        if values.len() < document.columns() {
            break;
        }
        for joint in joints.iter_mut() {
            joint.put(frame, &mut values);
        }
        for (number, value) in row.iter().zip(&values) {
            if same(number.value, *value) {
                continue;
            }
            bytes.extend_from_slice(&source[copied..number.start]);
            // Numbers that were run together are told apart by their sign alone.
            let before = number.start.checked_sub(1).and_then(|before| source.get(before));
            let touches = before.is_some_and(|byte| !super::scanner::is_blank(*byte));
            let start = bytes.len();
            push_decimal(*value, document.decimal_comma, &mut bytes);
            if touches && bytes[start] != b'-' {
                bytes.insert(start, b' ');
            }
            copied = number.end;
        }
        if bytes.len() >= PORTION {
            out.write_all(&bytes)?;
            bytes.clear();
        }
    }
    out.write_all(&bytes)?;
    out.write_all(&source[copied..])
}

/// The document's hierarchy with rows of its own.
fn rewrite(
    document: &Document,
    before: &Clip,
    after: &Clip,
    joints: &mut [JointRows<'_>],
    out: &mut dyn Write,
) -> io::Result<()> {
    let source = document.file.text();
    let line_end: &[u8] = match source.iter().position(|byte| matches!(byte, b'\r' | b'\n')) {
        Some(at) if source[at..].starts_with(b"\r\n") => b"\r\n",
        Some(at) if source[at] == b'\r' => b"\r",
        _ => b"\n",
    };
    let mut bytes = Vec::with_capacity(PORTION + PORTION / 4);
    if let Some(head) = &document.head {
        bytes.extend_from_slice(&source[..head.start]);
    } else {
        bytes.extend_from_slice(source.trim_ascii_end());
        bytes.extend_from_slice(line_end);
        bytes.extend_from_slice(b"MOTION");
    }
    bytes.extend_from_slice(line_end);
    write!(bytes, "Frames: {}", after.grid.count())?;
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
        let text = create::frame_time_text(step_secs);
        bytes.extend_from_slice(with_mark(text, document.decimal_comma).as_bytes());
    }
    bytes.extend_from_slice(line_end);
    let mut numbers = Numbers::new(document);
    // A stretch cut from the clip starts at one of its rows, and goes on with them.
    let mut is_along = false;
    let mut values = vec![0.0; document.columns()];
    for frame in 0..after.grid.count() {
        values.fill(0.0);
        for joint in joints.iter_mut() {
            joint.put(frame, &mut values);
        }
        let is_it =
            |row: &[Number]| row.iter().zip(&values).all(|(number, value)| same(number.value, *value));
        let mut old: &[Number] = &[];
        if frame == 0 {
            for _ in 0..document.frames {
                is_along = is_it(numbers.next());
                if is_along {
                    break;
                }
            }
            if is_along {
                old = &numbers.row;
            }
        } else if is_along {
            old = numbers.next();
        }
        for (column, value) in values.iter().enumerate() {
            if column > 0 {
                bytes.push(b' ');
            }
            match old.get(column).filter(|number| same(number.value, *value)) {
                Some(number) => bytes.extend_from_slice(&source[number.start..number.end]),
                None => push_decimal(*value, document.decimal_comma, &mut bytes),
            }
        }
        bytes.extend_from_slice(line_end);
        if bytes.len() >= PORTION {
            out.write_all(&bytes)?;
            bytes.clear();
        }
    }
    out.write_all(&bytes)
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
