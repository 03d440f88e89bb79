//! From the bytes of a BVH file to a clip.

use std::borrow::Cow;
use std::fmt;
use std::sync::Arc;

use glam::DVec3;

use crate::clip::{Clip, FrameGrid, JointTracks, Times};
use crate::exchange::Note;
use crate::exchange::rows::{JointColumns, Rows, TurnColumns};
use crate::exchange::text_file::{NotUtf16, TextFile};
use crate::exchange::turns::Turns;
use crate::rotor::Axis;
use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

use super::error::{BvhError, BvhErrorKind};
use super::scanner::{Scanner, Tally, is_line_end, quoted};
use super::syntax::{Channel, JointSyntax, MotionHead, hierarchy, motion_head, skip_comments};

/// Seconds from frame to frame where a file does not say.
const USUAL_FRAME_SECS: f64 = 1.0 / 30.0;

/// What is kept of a file so that it can be written again without touching what did not change.
#[derive(Clone)]
pub struct Document {
    /// The file as it was, and its text.
    pub(super) file: TextFile,
    /// The channels of each joint, in the order of a row's numbers.
    pub(super) channels: Vec<Vec<Channel>>,
    /// Where the motion part stands.
    pub(super) head: Option<MotionHead>,
    /// First byte after its head.
    pub(super) rows_start: usize,
    /// Complete frames that were read.
    pub(super) frames: usize,
    /// Numbers have a comma where others have a point.
    pub(super) decimal_comma: bool,
}

impl fmt::Debug for Document {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Document")
            .field("bytes", &self.file.bytes().len())
            .field("joints", &self.channels.len())
            .field("frames", &self.frames)
            .finish_non_exhaustive()
    }
}

impl Document {
    /// The file as it was.
    pub fn bytes(&self) -> &[u8] {
        self.file.bytes()
    }

    /// Numbers of one frame.
    pub(super) fn columns(&self) -> usize {
        self.channels.iter().map(Vec::len).sum()
    }

    /// First column of each joint.
    pub(super) fn first_columns(&self) -> Vec<usize> {
        let mut next = 0;
        let start = |channels: &Vec<Channel>| {
            let start = next;
            next += channels.len();
            start
        };
        self.channels.iter().map(start).collect()
    }
}

/// Reads a BVH text. `name` becomes the clip's name. Bytes that are handed over are kept, others are copied.
///
/// Angles are degrees, applied in the order of the channels; frame `i` is at `i` × `Frame Time` as written. Positions
/// stand in place of `OFFSET`; of a joint that lacks some of the three, the others stay those of `OFFSET`. Numbers that
/// are not finite become NaN. A file whose hierarchy is followed by no motion gives a clip of no frames.
///
/// # Errors
/// When the text is no BVH or can't be understood in one way only; with line and column, and in the motion part with
/// frame and joint.
pub fn read<'b>(
    bytes: impl Into<Cow<'b, [u8]>>,
    name: &str,
) -> Result<(Document, Clip, Vec<Note>), BvhError> {
    let file = TextFile::new(bytes.into().into_owned()).map_err(|NotUtf16 { line, column, found }| {
        let kind = BvhErrorKind::Unexpected { expected: NotUtf16::EXPECTED.to_owned(), found };
        BvhError { line, column, frame: None, joint: None, kind }
    })?;
    let bytes = file.text();
    let mut notes = Vec::new();
    notes.extend(file.note());
    let body_start = if bytes.starts_with(b"\xEF\xBB\xBF") { 3 } else { 0 };
    let mut scanner = Scanner::new(bytes, body_start);
    if u32::try_from(bytes.len()).is_err() {
        return Err(scanner.error(0, BvhErrorKind::TooLarge(bytes.len())));
    }
    let joints = hierarchy(&mut scanner, &mut notes)?;
    let head = motion_head(&mut scanner, &mut notes)?;
    let rows_start = scanner.pos();
    let mut document = Document {
        file: file.clone(),
        channels: joints.iter().map(|joint| joint.channels.clone()).collect(),
        head,
        rows_start,
        frames: 0,
        decimal_comma: false,
    };
    let mut rows = Rows::new(joint_columns(&joints), document.columns(), file.bytes().len(), 0);
    if let Some(head) = &head {
        read_rows(&mut scanner, &document, &joints, head, &mut rows, &mut notes)?;
    } else {
        notes.push(Note::new("end of file", "expected MOTION, found none: a skeleton without a clip"));
    }
    document.frames = rows.done();
    decimal_marks(&scanner, &mut document, &mut notes)?;
    let step_secs = frame_secs(&scanner, head.as_ref(), &mut notes);
    about_numbers(&scanner, &document, &joints, rows.largest_deg, &mut notes);
    let clip = clip(rows, &joints, step_secs, name, &mut notes);
    Ok((document, clip, notes))
}

/// What the channels of each joint say of it.
fn joint_columns(joints: &[JointSyntax]) -> Vec<JointColumns> {
    let mut first = 0;
    let mut all = Vec::with_capacity(joints.len());
    for joint in joints {
        let turns = turns_of(&joint.channels);
        let groups = turns.groups.into_iter();
        let absolute = |own: Vec<usize>| own.into_iter().map(|column| first + column).collect();
        let turns = Turns { groups: groups.map(|(axis, own)| (axis, absolute(own))).collect() };
        let mut place = [None; 3];
        for (column, channel) in joint.channels.iter().enumerate() {
            if let Channel::Position(axis) = channel {
                place[axis.index()] = Some(first + column);
            }
        }
        all.push(JointColumns { turn: TurnColumns::Angles(turns), place, rest: joint.offset });
        first += joint.channels.len();
    }
    all
}

/// Reads the numbers of all complete frames into the tracks of the joints.
fn read_rows(
    scanner: &mut Scanner<'_>,
    document: &Document,
    joints: &[JointSyntax],
    head: &MotionHead,
    rows: &mut Rows,
    notes: &mut Vec<Note>,
) -> Result<(), BvhError> {
    let columns = document.columns();
    let announced = head.frames.unwrap_or(0);
    // A frame time that is no number is told as such.
    scanner.oddities.missing = Tally::default();
    // How many frames there will be: as many as the file says where its length bears that out, else as many as it has room
    // for if the rest is like what was read.
    let expected = |rows: &Rows, pos: usize| {
        let read = (pos - document.rows_start).max(1) as f64;
        let whole = (document.file.text().len() - document.rows_start) as f64;
        let likely = ((rows.len() / columns.max(1)) as f64 * (whole / read)).ceil() as usize;
        if announced.abs_diff(likely) <= likely / 8 { announced } else { likely }
    };
    let too_many = |scanner: &Scanner<'_>, most_bytes: usize| {
        scanner.error(document.rows_start, BvhErrorKind::TooManyNumbers { most_mb: most_bytes >> 20 })
    };
    loop {
        if columns > 0 {
            scanner.plain_numbers(rows.tile_len, &mut rows.tile);
            if rows.tile.len() >= rows.tile_len {
                let expected = expected(rows, scanner.pos());
                rows.hand_out(expected).map_err(|most| too_many(scanner, most))?;
                continue;
            }
        }
        match scanner.number() {
            Ok(Some(number)) if columns > 0 => rows.tile.push(number.value),
            Ok(Some(number)) => {
                let text = "expected no numbers, as no joint has channels, found some: left out";
                notes.push(Note::new(scanner.line_of(number.start), text));
                break;
            }
            Ok(None) => break,
            Err(()) => {
                let start = scanner.pos();
                skip_comments(scanner, notes);
                if scanner.pos() != start {
                    continue;
                }
                let frames = rows.len().checked_div(columns).unwrap_or(announced);
                let is_between_frames = columns == 0 || rows.len().is_multiple_of(columns);
                if is_between_frames && frames >= announced && frames > 0 {
                    let text = format!(
                        "expected the end of the file after {frames} frames, found {}: left as it is",
                        scanner.found()
                    );
                    notes.push(Note::new(scanner.line_of(start), text));
                    break;
                }
                let error = scanner.unexpected("a number");
                return Err(in_motion(error, rows.len(), document, joints));
            }
        }
    }
    let complete = rows.len().checked_div(columns).unwrap_or(0);
    rows.hand_out(complete).map_err(|most| too_many(scanner, most))?;
    let left_over = rows.tile.len();
    if left_over > 0 {
        uneven_line(document, joints, scanner.pos())?;
        let text = format!("expected {columns} numbers, found {left_over}: the frame is left out");
        notes.push(Note::new(format!("frame {complete}"), text));
    }
    match head.frames {
        None => notes.push(Note::new(
            scanner.line_of(head.start),
            format!("expected `Frames:`, found none: the numbers make {complete} frames"),
        )),
        Some(count) if count != complete && columns > 0 => notes.push(Note::new(
            scanner.line_of(head.frames_text.unwrap_or_default().0),
            format!("expected {count} frames as `Frames:` says, found {complete}: those are used"),
        )),
        Some(_) => {}
    }
    Ok(())
}

/// The error with the frame and the joint that number `index` of the motion belongs to.
fn in_motion(error: BvhError, index: usize, document: &Document, joints: &[JointSyntax]) -> BvhError {
    let columns = document.columns();
    let Some(frame) = index.checked_div(columns) else { return error };
    let column = index % columns;
    let owner = document.first_columns().iter().rposition(|&first| first <= column);
    // Joints without channels begin at the same column as the one after them, which is the one found.
    let joint = owner.and_then(|joint| joints.get(joint)).map(|joint| joint.name.clone());
    BvhError { frame: Some(frame), joint, ..error }
}

/// Numbers are counted, not lines. But where nearly every line holds one frame, a line that does not has lost or gained
/// a number, and all that follows would go to the wrong joints.
///
/// # Errors
/// At the first such line, unless it is the last.
fn uneven_line(document: &Document, joints: &[JointSyntax], end: usize) -> Result<(), BvhError> {
    let columns = document.columns();
    let text = document.file.text();
    let mut scanner = Scanner::new(text.get(..end).unwrap_or_default(), document.rows_start);
    let (mut lines, mut even, mut first_uneven) = (0_usize, 0_usize, None);
    let (mut in_line, mut before, mut last_end) = (0_usize, 0_usize, document.rows_start);
    let mut is_last_uneven = false;
    loop {
        let number = scanner.number().ok().flatten();
        let gap = number.map(|number| &text[last_end..number.start]);
        if gap.is_none_or(|gap| gap.iter().copied().any(is_line_end)) && in_line > 0 {
            lines += 1;
            is_last_uneven = false;
            if in_line == columns {
                even += 1;
            } else if first_uneven.is_none() {
                first_uneven = Some((last_end, in_line, before));
                is_last_uneven = true;
            }
            before += in_line;
            in_line = 0;
        }
        let Some(number) = number else { break };
        in_line += 1;
        last_end = number.end;
    }
    match first_uneven {
        Some((at, found, before)) if even * 2 > lines && !is_last_uneven => {
            let kind = BvhErrorKind::Unexpected {
                expected: format!("{columns} numbers on the line, one for each channel"),
                found: found.to_string(),
            };
            let index = before + found.min(columns - 1);
            Err(in_motion(scanner.error(at, kind), index, document, joints))
        }
        _ => Ok(()),
    }
}

/// A comma is a decimal mark only in a file that has no other.
fn decimal_marks(
    scanner: &Scanner<'_>,
    document: &mut Document,
    notes: &mut Vec<Note>,
) -> Result<(), BvhError> {
    let commas = scanner.oddities.commas;
    if commas.count == 0 {
        return Ok(());
    }
    if scanner.oddities.points.count > 0 {
        let rest = document.file.text().get(commas.first..).unwrap_or_default();
        let length = rest.iter().position(|&byte| super::scanner::is_blank(byte)).unwrap_or(rest.len());
        let kind = BvhErrorKind::TwoDecimalMarks(quoted(&rest[..length]).trim_matches('`').to_owned());
        return Err(scanner.error(commas.first, kind));
    }
    document.decimal_comma = true;
    let text = format!("expected decimal points, found {} decimal commas: read as points", commas.count);
    notes.push(Note::new(scanner.line_of(commas.first), text));
    Ok(())
}

/// Seconds from frame to frame.
fn frame_secs(scanner: &Scanner<'_>, head: Option<&MotionHead>, notes: &mut Vec<Note>) -> f64 {
    let Some(head) = head else { return USUAL_FRAME_SECS };
    match head.frame_secs {
        Some(secs) if (1e-6..=3600.0).contains(&secs) => secs,
        found => {
            let place = scanner.line_of(head.frame_secs_text.map_or(head.start, |(start, _)| start));
            let found = found.map_or("none".to_owned(), |secs| format!("{secs}"));
            let text = format!("expected a `Frame Time:` above 0, found {found}: 1/30 s is taken");
            notes.push(Note::new(place, text));
            USUAL_FRAME_SECS
        }
    }
}

fn about_numbers(
    scanner: &Scanner<'_>,
    document: &Document,
    joints: &[JointSyntax],
    largest_deg: f64,
    notes: &mut Vec<Note>,
) {
    let run_together = scanner.oddities.run_together;
    if run_together.count > 0 {
        let text = format!(
            "expected blanks between numbers, found {} run together: split before the sign",
            run_together.count
        );
        notes.push(Note::new(scanner.line_of(run_together.first), text));
    }
    let missing = scanner.oddities.missing;
    if missing.count > 0 {
        let text =
            format!("expected finite numbers, found {} that are not: those are missing", missing.count);
        notes.push(Note::new(scanner.line_of(missing.first), text));
    }
    let is_angle = |channel: &&Channel| matches!(channel, Channel::Rotation(_));
    let n_angles = document.channels.iter().flatten().filter(is_angle).count();
    if n_angles >= 9 && document.frames >= 8 && largest_deg > 0.1 && largest_deg < 7.0 {
        let text = format!("expected degrees, found no angle above {largest_deg:.2}: these may be radians");
        notes.push(Note::new("motion", text));
    }
    if joints.len() > 2 && joints[1..].iter().all(|joint| joint.offset == [0.0; 3]) {
        let places = |joint: &JointSyntax| joint.channels.iter().any(|c| matches!(c, Channel::Position(_)));
        if !joints[1..].iter().any(places) {
            notes.push(Note::new("hierarchy", "expected limbs with a length, found every OFFSET 0"));
        }
    }
}

fn clip(rows: Rows, joints: &[JointSyntax], step_secs: f64, name: &str, notes: &mut Vec<Note>) -> Clip {
    let times = Times::Even { step_secs, count: rows.done() };
    let tracks = rows.finish(&times);
    for joint in joints {
        let turns = turns_of(&joint.channels);
        if turns.groups.len() > 3 {
            let axes: String = turns.axes().map(Axis::letter).collect();
            let text = format!("expected at most three turns, found {axes}: put together in this order");
            notes.push(Note::new(format!("joint {}", joint.name), text));
        }
    }
    let skeleton_joints = joints
        .iter()
        .enumerate()
        .map(|(number, joint)| Joint {
            name: joint.name.clone(),
            number,
            parent: joint.parent,
            rest: Transform::from_translation(DVec3::from_array(joint.offset)),
            kind: JointKind::Joint,
            tips: joint.tips.iter().copied().map(DVec3::from_array).collect(),
        })
        .collect();
    let skeleton = Skeleton::new(skeleton_joints).expect("the reader lists parents before their children");
    added_places(&skeleton, &tracks, notes);
    Clip {
        name: name.to_owned(),
        skeleton: Arc::new(skeleton),
        joints: tracks,
        duration_secs: times.span().map_or(0.0, |(_, last)| last),
        grid: FrameGrid { times, rate: 1.0 / step_secs },
    }
}

/// The turns that a joint's channels make; columns count from its first channel.
pub(super) fn turns_of(channels: &[Channel]) -> Turns {
    Turns::new(channels.iter().enumerate().filter_map(|(column, channel)| match channel {
        Channel::Rotation(axis) => Some((column, *axis)),
        Channel::Position(_) | Channel::Size => None,
    }))
}

/// A few programs mean positions as an addition to `OFFSET`: it shows where an inner joint's stay near 0 and its OFFSET
/// does not.
fn added_places(skeleton: &Skeleton, tracks: &[Arc<JointTracks>], notes: &mut Vec<Note>) {
    for (index, (joint, tracks)) in skeleton.joints().iter().zip(tracks).enumerate() {
        let (Some(_), Some(track)) = (joint.parent, &tracks.translation) else { continue };
        let offset = joint.rest.translation.length();
        let mut lengths: Vec<f64> =
            (0..track.keys.len()).map(|key| track.keys.vector(key).length()).collect();
        let middle = lengths.len() / 2;
        let median = *lengths.select_nth_unstable_by(middle, f64::total_cmp).1;
        if offset > 0.0 && median < 0.05 * offset {
            let text = format!(
                "expected positions in place of OFFSET, found them near 0 beside an OFFSET of length {offset:.4}: they may be meant as an addition"
            );
            notes.push(Note::new(format!("joint {}", skeleton.label(index)), text));
        }
    }
}
