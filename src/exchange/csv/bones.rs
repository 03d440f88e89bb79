//! The skeleton of a CSV clip: comment lines before the header, or a file of its own beside it.

use std::collections::{HashMap, HashSet};

use glam::DVec3;

use crate::exchange::Note;
use crate::exchange::decimal::is_measure;
use crate::exchange::text_file::TextFile;
use crate::rotor::Rotor;
use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

use super::cells::{Dialect, Records, comma_number, decoded, number, quoted, shown, text};
use super::error::{CsvError, CsvErrorKind};

/// Joints of one file that are read.
pub(super) const MAX_JOINTS: usize = 10_000;

/// One line of a skeleton.
#[derive(Clone, Debug, PartialEq)]
pub struct Bone {
    /// The joint's name.
    pub name: String,
    /// The name of its parent; `None` for a root.
    pub parent: Option<String>,
    /// Where it stands relative to its parent when nothing is animated.
    pub rest: Transform,
    /// Joint or carrier.
    pub kind: JointKind,
    /// Whether it is an end point of its parent where no column names it.
    pub may_be_tip: bool,
    /// 1-based line that it stands on.
    pub line: u32,
}

/// Reads a skeleton of its own: columns `joint`, `parent`, `offset.x`, `offset.y`, `offset.z` in any order. An empty
/// parent makes a root.
///
/// # Errors
/// When a column is missing or a cell is no number.
pub fn hierarchy(bytes: &[u8]) -> Result<Vec<Bone>, CsvError> {
    const COLUMNS: [&str; 5] = ["joint", "parent", "offset.x", "offset.y", "offset.z"];
    let text_bytes = TextFile::text_of(bytes)?;
    let bytes = &*text_bytes;
    let mut records = Records::new(bytes);
    while records.comment().is_some() {}
    if !records.header()? {
        return Err(CsvError::unexpected(records.line, COLUMNS.join(","), "the end of the file"));
    }
    let header: Vec<String> = records.cells.iter().map(|&cell| text(bytes, cell).to_lowercase()).collect();
    let mut places = [0; 5];
    for (place, name) in places.iter_mut().zip(COLUMNS) {
        *place = header.iter().position(|own| own == name).ok_or_else(|| {
            CsvError::unexpected(records.line, format!("a column {name}"), quoted(&header.join(",")))
        })?;
    }
    let is_comma_separated = records.dialect == Dialect::RFC;
    let mut bones = Vec::new();
    while records.next()? {
        let line = records.line;
        let cell = |column: usize| {
            records.cells.get(places[column]).copied().ok_or_else(|| {
                let expected = format!("{} cells", header.len());
                CsvError::unexpected(line, expected, records.cells.len().to_string())
                    .in_column(COLUMNS[column])
            })
        };
        let offset = |column: usize| {
            let cell = cell(column)?;
            let comma = || comma_number(bytes, cell).filter(|_| !is_comma_separated);
            number(bytes, cell).or_else(comma).filter(|&value| is_measure(value)).ok_or_else(|| {
                CsvError::unexpected(line, "a finite number", shown(bytes, cell)).in_column(COLUMNS[column])
            })
        };
        let name = text(bytes, cell(0)?).into_owned();
        let parent = text(bytes, cell(1)?).into_owned();
        let place = DVec3::new(offset(2)?, offset(3)?, offset(4)?);
        if bones.len() == MAX_JOINTS {
            return Err(CsvError {
                line,
                column: None,
                kind: CsvErrorKind::TooManyJoints { limit: MAX_JOINTS },
            });
        }
        bones.push(Bone {
            name,
            parent: (!parent.is_empty()).then_some(parent),
            rest: Transform::from_translation(place),
            kind: JointKind::Joint,
            may_be_tip: true,
            line,
        });
    }
    Ok(bones)
}

/// Whether a table brings its skeleton along, in lines before its header.
pub fn has_skeleton(bytes: &[u8]) -> bool {
    let Ok(text) = TextFile::text_of(bytes) else { return false };
    let mut records = Records::new(&text);
    while let Some(comment) = records.comment() {
        if bone(&decoded(comment), records.line).is_some() {
            return true;
        }
    }
    false
}

/// The skeleton of another clip, for a table whose columns bear the names of its joints.
pub fn bones_of(skeleton: &Skeleton) -> Vec<Bone> {
    let label = |joint: usize| skeleton.label(joint).to_owned();
    let mut bones = Vec::with_capacity(skeleton.len());
    for (index, joint) in skeleton.joints().iter().enumerate() {
        let bone = |name: String, parent: Option<String>, rest: Transform| Bone {
            name,
            parent,
            rest,
            kind: joint.kind,
            may_be_tip: false,
            line: 1,
        };
        bones.push(bone(label(index), joint.parent.map(label), joint.rest));
        for (tip, place) in joint.tips.iter().enumerate() {
            let rest = Transform::from_translation(*place);
            let own = bone(format!("{}_tip{tip}", label(index)), Some(label(index)), rest);
            bones.push(Bone { may_be_tip: true, kind: JointKind::Joint, ..own });
        }
    }
    // A tip whose made-up name is a joint's is left out: it would be taken for that one.
    let mut seen: HashSet<String> = skeleton.joints().iter().enumerate().map(|(own, _)| label(own)).collect();
    bones.retain(|bone| !bone.may_be_tip || seen.insert(bone.name.clone()));
    bones
}

/// Reads `# joint NAME parent NAME offset X Y Z`; after it may stand `turn X Y Z W` (the rest rotation as a quaternion)
/// and `size X Y Z`. `carrier` or `tip` in place of `joint` make those. A root has `parent -`, or none. `None` for any
/// other comment.
pub(super) fn bone(comment: &str, line: u32) -> Option<Result<Bone, CsvError>> {
    let content = comment.trim_start().strip_prefix('#')?.trim();
    let (word, rest) = content.split_once(char::is_whitespace)?;
    let (kind, may_be_tip) = match word {
        "joint" => (JointKind::Joint, false),
        "carrier" => (JointKind::Carrier, false),
        "tip" => (JointKind::Joint, true),
        _ => return None,
    };
    Some(bone_after(rest.trim(), kind, may_be_tip, line))
}

fn bone_after(rest: &str, kind: JointKind, may_be_tip: bool, line: u32) -> Result<Bone, CsvError> {
    let expected = "`# joint NAME parent NAME offset X Y Z`";
    let wrong = || CsvError::unexpected(line, expected, quoted(rest));
    // Names may hold blanks, so the words are looked for from the end.
    let (names, values) = rest.rsplit_once(" offset ").ok_or_else(wrong)?;
    let (name, parent) = names_in_quotes(names).unwrap_or_else(|| plain_names(names));
    let mut words = values.split_whitespace();
    let offset = numbers(&mut words, 3).ok_or_else(wrong)?;
    let mut rest_pose = Transform::from_translation(DVec3::new(offset[0], offset[1], offset[2]));
    while let Some(word) = words.next() {
        match word {
            "turn" => {
                let n = numbers(&mut words, 4).ok_or_else(wrong)?;
                let turn = Rotor::from_xyzw([n[0], n[1], n[2], n[3]]);
                rest_pose.rotation = turn.try_normalize().ok_or_else(wrong)?;
            }
            "size" => {
                let n = numbers(&mut words, 3).ok_or_else(wrong)?;
                rest_pose.scale = DVec3::new(n[0], n[1], n[2]);
            }
            _ => return Err(wrong()),
        }
    }
    Ok(Bone { name, parent, rest: rest_pose, kind, may_be_tip, line })
}

/// `NAME parent NAME`, or a name alone for a root, or one with the parent `-`.
fn plain_names(names: &str) -> (String, Option<String>) {
    let (name, parent) = match names.rsplit_once(" parent") {
        Some((name, parent)) if parent.is_empty() || parent.starts_with(char::is_whitespace) => {
            (name.trim(), parent.trim())
        }
        _ => (names.trim(), ""),
    };
    let unquoted = |text: &str| {
        text.strip_prefix('"').and_then(|text| text.strip_suffix('"')).unwrap_or(text).to_owned()
    };
    let parent = unquoted(parent);
    let is_root = matches!(parent.as_str(), "" | "-" | "none");
    (unquoted(name), (!is_root).then_some(parent))
}

/// As [`plain_names`], of names in quotes as [`names_text`] writes them.
fn names_in_quotes(names: &str) -> Option<(String, Option<String>)> {
    let (name, rest) = in_quotes(names)?;
    let parent = rest.strip_prefix("parent ")?.trim();
    if parent == "-" {
        return Some((name, None));
    }
    let (parent, rest) = in_quotes(parent)?;
    rest.is_empty().then_some((name, Some(parent)))
}

/// The name in quotes at the start, in which a quote stands twice (as in RFC 4180), and what follows after blanks.
fn in_quotes(text: &str) -> Option<(String, &str)> {
    let mut rest = text.strip_prefix('"')?;
    let mut name = String::new();
    loop {
        let (part, after) = rest.split_once('"')?;
        name.push_str(part);
        match after.strip_prefix('"') {
            Some(more) => {
                name.push('"');
                rest = more;
            }
            None => return Some((name, after.trim_start())),
        }
    }
}

/// The names of a joint and its parent for its line: in quotes where they would be read as others.
pub(super) fn names_text(name: &str, parent: Option<&str>) -> String {
    let plain = format!("{name} parent {}", parent.unwrap_or("-"));
    let is_read = names_in_quotes(&plain).is_none()
        && plain_names(&plain) == (name.to_owned(), parent.map(str::to_owned));
    if is_read {
        return plain;
    }
    let quoted = |name: &str| format!("\"{}\"", name.replace('"', "\"\""));
    format!("{} parent {}", quoted(name), parent.map_or("-".to_owned(), quoted))
}

/// The next `count` words as finite numbers.
fn numbers<'a>(words: &mut impl Iterator<Item = &'a str>, count: usize) -> Option<Vec<f64>> {
    let numbers: Vec<f64> = words.take(count).map_while(|word| word.parse().ok()).collect();
    (numbers.len() == count && numbers.iter().all(|&value| is_measure(value))).then_some(numbers)
}

/// The joints of a clip whose columns name `columns`, in the skeleton `bones`: parents first, and the index of each
/// column's joint. A joint that the skeleton lacks becomes a root.
///
/// # Errors
/// When a name repeats, a parent is missing, or a joint hangs on itself.
pub(super) fn assemble(
    columns: &[String],
    bones: &[Bone],
    notes: &mut Vec<Note>,
) -> Result<(Vec<Joint>, Vec<usize>), CsvError> {
    let mut by_name: HashMap<&str, usize> = HashMap::new();
    for (index, bone) in bones.iter().enumerate() {
        if by_name.insert(&bone.name, index).is_some() {
            return Err(CsvError::unexpected(bone.line, "each joint once", quoted(&bone.name)));
        }
    }
    let has_column: HashSet<&str> = columns.iter().map(String::as_str).collect();
    let mut children: Vec<Vec<usize>> = vec![Vec::new(); bones.len()];
    let mut roots = Vec::new();
    for (index, bone) in bones.iter().enumerate() {
        let Some(name) = &bone.parent else {
            roots.push(index);
            continue;
        };
        let &parent = by_name.get(name.as_str()).ok_or_else(|| {
            let expected = format!("the parent of {} among the joints", bone.name);
            CsvError::unexpected(bone.line, expected, quoted(name))
        })?;
        children[parent].push(index);
    }
    let is_tip = |index: usize| {
        let bone = &bones[index];
        bone.may_be_tip
            && bone.parent.is_some()
            && children[index].is_empty()
            && !has_column.contains(bone.name.as_str())
    };
    let mut joints: Vec<Joint> = Vec::new();
    let mut places: HashMap<&str, usize> = HashMap::new();
    let mut reached = vec![false; bones.len()];
    let mut open: Vec<(usize, Option<usize>)> = roots.iter().rev().map(|&root| (root, None)).collect();
    while let Some((index, parent)) = open.pop() {
        reached[index] = true;
        let bone = &bones[index];
        if let Some(parent) = parent.filter(|_| is_tip(index)) {
            joints[parent].tips.push(bone.rest.translation);
            continue;
        }
        let own = joints.len();
        places.insert(&bone.name, own);
        joints.push(Joint {
            name: bone.name.clone(),
            number: own,
            parent,
            rest: bone.rest,
            kind: bone.kind,
            tips: Vec::new(),
        });
        open.extend(children[index].iter().rev().map(|&child| (child, Some(own))));
    }
    // What no root reaches hangs on itself.
    if let Some(bone) = bones.iter().zip(&reached).find_map(|(bone, reached)| (!reached).then_some(bone)) {
        let found = format!("{}, which hangs on itself", quoted(&bone.name));
        return Err(CsvError::unexpected(bone.line, "parents that end in a root", found));
    }
    let mut indices = Vec::with_capacity(columns.len());
    for name in columns {
        let index = places.get(name.as_str()).copied().unwrap_or_else(|| {
            if !bones.is_empty() {
                let text = "expected a line of the skeleton for it, found none: taken as a root at 0 0 0";
                notes.push(Note::new(format!("joint {name}"), text));
            }
            joints.push(Joint {
                name: name.clone(),
                number: joints.len(),
                parent: None,
                rest: Transform::IDENTITY,
                kind: JointKind::Joint,
                tips: Vec::new(),
            });
            joints.len() - 1
        });
        indices.push(index);
    }
    Ok((joints, indices))
}
