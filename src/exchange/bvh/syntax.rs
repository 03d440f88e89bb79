//! The hierarchy of a BVH text, and the two lines that head its motion.

#![deny(clippy::arithmetic_side_effects, clippy::indexing_slicing)]

use crate::exchange::Note;
use crate::exchange::decimal::is_measure;
use crate::rotor::Axis;

use super::error::{BvhError, BvhErrorKind};
use super::scanner::{Scanner, decoded, is_line_end};

/// Joints one inside the other that are read.
pub(super) const MAX_DEPTH: usize = 512;
/// Joints of one file that are read.
pub(super) const MAX_JOINTS: usize = 10_000;

/// What one number of a row is for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Channel {
    /// Place along an axis.
    Position(Axis),
    /// Turn about an axis in degrees.
    Rotation(Axis),
    /// A size: counted, and not used.
    Size,
}

/// A joint as the hierarchy has it.
#[derive(Clone, Debug)]
pub(super) struct JointSyntax {
    pub(super) name: String,
    pub(super) parent: Option<usize>,
    pub(super) offset: [f64; 3],
    pub(super) channels: Vec<Channel>,
    pub(super) tips: Vec<[f64; 3]>,
}

/// A block that is open while its content is read.
#[derive(Clone, Copy)]
struct Block {
    kind: BlockKind,
    /// Where its name stands.
    start: usize,
    has_offset: bool,
    has_channels: bool,
}

#[derive(Clone, Copy, PartialEq)]
enum BlockKind {
    Joint(usize),
    /// The end point with this index of the joint around it.
    Tip,
}

/// All joints in order of appearance, parents first. The scanner then stands before `MOTION`, or at the end.
pub(super) fn hierarchy(
    scanner: &mut Scanner<'_>,
    notes: &mut Vec<Note>,
) -> Result<Vec<JointSyntax>, BvhError> {
    skip_comments(scanner, notes);
    let start = scanner.pos();
    if !scanner.word().eq_ignore_ascii_case(b"HIERARCHY") {
        scanner.go_to(start);
        return Err(scanner.unexpected("HIERARCHY"));
    }
    let mut joints: Vec<JointSyntax> = Vec::new();
    let mut open: Vec<Block> = Vec::new();
    let mut skipped = false;
    loop {
        skip_comments(scanner, notes);
        scanner.skip_blanks();
        let start = scanner.pos();
        let word = scanner.word();
        let keyword = word.to_ascii_uppercase();
        let owner = open_joint_of(&open);
        let Some(block) = open.last_mut() else {
            match keyword.as_slice() {
                b"ROOT" | b"JOINT" => open_joint(scanner, &mut joints, &mut open, start)?,
                b"MOTION" => {
                    scanner.go_to(start);
                    break;
                }
                b"" if !skipped => break,
                b"" | b"{" | b"}" => {
                    scanner.go_to(start);
                    return Err(scanner.unexpected("ROOT or MOTION"));
                }
                _ if joints.is_empty() => {
                    scanner.go_to(start);
                    return Err(scanner.unexpected("ROOT"));
                }
                // A section of its own between the two known ones.
                _ => {
                    if !skipped {
                        let text = format!(
                            "expected ROOT or MOTION, found {}: skipped",
                            super::scanner::quoted(word)
                        );
                        notes.push(Note::new(scanner.line_of(start), text));
                        skipped = true;
                    }
                    scanner.rest_of_line();
                }
            }
            continue;
        };
        let at_joint = |error: BvhError, joints: &[JointSyntax]| named(error, joints, owner);
        match (keyword.as_slice(), block.kind) {
            (b"OFFSET", kind) => {
                if std::mem::replace(&mut block.has_offset, true) {
                    scanner.tell_once(
                        notes,
                        start,
                        "expected one OFFSET in a block, found another: the last is used",
                    );
                    if kind == BlockKind::Tip
                        && let Some(joint) = owner.and_then(|joint| joints.get_mut(joint))
                    {
                        joint.tips.pop();
                    }
                }
                let offset = offset(scanner).map_err(|error| at_joint(error, &joints))?;
                if let Some(joint) = owner.and_then(|joint| joints.get_mut(joint)) {
                    match kind {
                        BlockKind::Joint(_) => joint.offset = offset,
                        BlockKind::Tip => joint.tips.push(offset),
                    }
                }
            }
            (b"CHANNELS", BlockKind::Joint(joint)) => {
                if std::mem::replace(&mut block.has_channels, true) {
                    scanner.go_to(start);
                    let error = scanner.unexpected("one CHANNELS line for each joint");
                    return Err(at_joint(error, &joints));
                }
                let channels = channels(scanner, notes).map_err(|error| at_joint(error, &joints))?;
                if let Some(joint) = joints.get_mut(joint) {
                    joint.channels = channels;
                }
            }
            (b"JOINT" | b"ROOT", BlockKind::Joint(_)) => open_joint(scanner, &mut joints, &mut open, start)?,
            (b"END" | b"ENDSITE", BlockKind::Joint(_)) => {
                // Whatever else stands before the brace is a name nobody needs.
                scanner.take_while(|byte| byte != b'{' && !is_line_end(byte));
                open_block(scanner).map_err(|error| at_joint(error, &joints))?;
                open.push(Block { kind: BlockKind::Tip, start, has_offset: false, has_channels: false });
            }
            (b"}", kind) => {
                if !block.has_offset {
                    let what = match kind {
                        BlockKind::Joint(_) => "expected OFFSET in every joint, found none: taken as 0 0 0",
                        BlockKind::Tip => "expected OFFSET in every End Site, found none: left out",
                    };
                    scanner.tell_once(notes, block.start, what);
                }
                open.pop();
            }
            (_, kind) => {
                scanner.go_to(start);
                let error = scanner.unexpected(match kind {
                    BlockKind::Joint(_) => "OFFSET, CHANNELS, JOINT, End Site or `}`",
                    BlockKind::Tip => "OFFSET or `}`",
                });
                return Err(at_joint(error, &joints));
            }
        }
    }
    if joints.is_empty() {
        return Err(scanner.unexpected("ROOT"));
    }
    Ok(joints)
}

fn open_joint_of(open: &[Block]) -> Option<usize> {
    open.iter().rev().find_map(|block| match block.kind {
        BlockKind::Joint(joint) => Some(joint),
        BlockKind::Tip => None,
    })
}

/// The error with the name of the joint it belongs to.
fn named(error: BvhError, joints: &[JointSyntax], joint: Option<usize>) -> BvhError {
    let name = joint.and_then(|joint| joints.get(joint)).map(|joint| joint.name.clone());
    BvhError { joint: name, ..error }
}

fn open_joint(
    scanner: &mut Scanner<'_>,
    joints: &mut Vec<JointSyntax>,
    open: &mut Vec<Block>,
    start: usize,
) -> Result<(), BvhError> {
    if open.len() >= MAX_DEPTH {
        return Err(scanner.error(start, BvhErrorKind::TooDeep { limit: MAX_DEPTH }));
    }
    if joints.len() >= MAX_JOINTS {
        return Err(scanner.error(start, BvhErrorKind::TooManyJoints { limit: MAX_JOINTS }));
    }
    // A name may hold blanks: it ends with its line, or at the brace.
    let name = scanner.take_while(|byte| byte != b'{' && !is_line_end(byte));
    let name = decoded(name).trim_matches(|c: char| c.is_whitespace() || c == '\0').to_owned();
    let index = joints.len();
    joints.push(JointSyntax {
        name,
        parent: open_joint_of(open),
        offset: [0.0; 3],
        channels: Vec::new(),
        tips: Vec::new(),
    });
    open_block(scanner).map_err(|error| named(error, joints, Some(index)))?;
    open.push(Block { kind: BlockKind::Joint(index), start, has_offset: false, has_channels: false });
    Ok(())
}

fn open_block(scanner: &mut Scanner<'_>) -> Result<(), BvhError> {
    scanner.skip_blanks();
    if scanner.skip(b'{') { Ok(()) } else { Err(scanner.unexpected("`{`")) }
}

fn offset(scanner: &mut Scanner<'_>) -> Result<[f64; 3], BvhError> {
    let mut offset = [0.0; 3];
    for (axis, value) in ["x", "y", "z"].into_iter().zip(&mut offset) {
        let expected = || format!("a number for the {axis} of OFFSET");
        let number = scanner.number().ok().flatten().ok_or_else(|| scanner.unexpected(expected()))?;
        if !is_measure(number.value) {
            scanner.go_to(number.start);
            return Err(scanner.unexpected(format!("a finite length for the {axis} of OFFSET")));
        }
        *value = number.value;
    }
    Ok(offset)
}

fn channels(scanner: &mut Scanner<'_>, notes: &mut Vec<Note>) -> Result<Vec<Channel>, BvhError> {
    let number = scanner.number().ok().flatten();
    let count = match number.map(|number| number.value) {
        // No more can be named than the file has bytes; the loop stops at the first that is missing.
        Some(value) if value >= 0.0 && value.fract() == 0.0 => value as usize,
        _ => {
            if let Some(number) = number {
                scanner.go_to(number.start);
            }
            return Err(scanner.unexpected("the number of channels"));
        }
    };
    let mut channels: Vec<Channel> = Vec::new();
    while channels.len() < count {
        scanner.skip_blanks();
        let start = scanner.pos();
        let channel = match scanner.word().to_ascii_lowercase().as_slice() {
            b"xposition" => Channel::Position(Axis::X),
            b"yposition" => Channel::Position(Axis::Y),
            b"zposition" => Channel::Position(Axis::Z),
            b"xrotation" => Channel::Rotation(Axis::X),
            b"yrotation" => Channel::Rotation(Axis::Y),
            b"zrotation" => Channel::Rotation(Axis::Z),
            b"xscale" | b"yscale" | b"zscale" => {
                scanner.tell_once(
                    notes,
                    start,
                    "expected positions and rotations as channels, found a scale: kept and not used",
                );
                Channel::Size
            }
            _ => {
                scanner.go_to(start);
                let named = channels.len();
                return Err(scanner.unexpected(format!(
                    "{count} channel names such as Zrotation or Xposition after {named}"
                )));
            }
        };
        if matches!(channel, Channel::Position(_)) && channels.contains(&channel) {
            scanner.go_to(start);
            return Err(scanner.unexpected("each position once"));
        }
        channels.push(channel);
    }
    Ok(channels)
}

/// Past lines that begin with `#` or `//`.
pub(super) fn skip_comments(scanner: &mut Scanner<'_>, notes: &mut Vec<Note>) {
    let mut first = None;
    loop {
        scanner.skip_blanks();
        let start = scanner.pos();
        if !scanner.is_at(b"#") && !scanner.is_at(b"//") {
            break;
        }
        scanner.rest_of_line();
        first.get_or_insert(start);
    }
    if let Some(start) = first {
        scanner.tell_once(notes, start, "found a comment: skipped");
    }
}

/// What stands between `MOTION` and the rows.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct MotionHead {
    /// Byte after the last letter of `MOTION`.
    pub(super) start: usize,
    /// Frames that the file says it has.
    pub(super) frames: Option<usize>,
    /// First and last-but-one byte of the count.
    pub(super) frames_text: Option<(usize, usize)>,
    /// Seconds from frame to frame as written; NaN for what is no number.
    pub(super) frame_secs: Option<f64>,
    /// First and last-but-one byte of the frame time.
    pub(super) frame_secs_text: Option<(usize, usize)>,
}

/// `MOTION`, `Frames:` and `Frame Time:`, in any order and spelling of the two; each may be missing.
/// `None` at the end of the file.
pub(super) fn motion_head(
    scanner: &mut Scanner<'_>,
    notes: &mut Vec<Note>,
) -> Result<Option<MotionHead>, BvhError> {
    if scanner.word().is_empty() {
        return Ok(None);
    }
    let mut head = MotionHead { start: scanner.pos(), ..MotionHead::default() };
    loop {
        skip_comments(scanner, notes);
        let start = scanner.pos();
        let is_count = match scanner.letters().to_ascii_lowercase().as_slice() {
            b"frames" => true,
            b"frametime" => false,
            b"frame" => {
                if !scanner.letters().eq_ignore_ascii_case(b"time") {
                    scanner.go_to(start);
                    return Err(scanner.unexpected("`Frames:` or `Frame Time:`"));
                }
                false
            }
            // `nan` and `inf` in the first row.
            _ => {
                scanner.go_to(start);
                break;
            }
        };
        scanner.skip_blanks_in_line();
        scanner.skip(b':');
        scanner.skip_blanks_in_line();
        if scanner.peek().is_none_or(is_line_end) {
            let text = if is_count {
                "expected a frame count, found the end of the line"
            } else {
                "expected a frame time, found the end of the line"
            };
            scanner.tell_once(notes, start, text);
            continue;
        }
        let expected = if is_count { "a whole number of frames" } else { "a frame time in seconds" };
        let number = scanner.number().ok().flatten().ok_or_else(|| scanner.unexpected(expected))?;
        let text = Some((number.start, number.end));
        if is_count {
            if !(number.value >= 0.0 && number.value.fract() == 0.0) {
                scanner.go_to(number.start);
                return Err(scanner.unexpected(expected));
            }
            (head.frames, head.frames_text) = (Some(number.value as usize), text);
        } else {
            (head.frame_secs, head.frame_secs_text) = (Some(number.value), text);
        }
    }
    Ok(Some(head))
}
