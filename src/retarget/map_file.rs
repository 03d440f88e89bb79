//! Maps as text: CSV rows `source,target`.

use crate::skeleton::Skeleton;

use super::figure::Figure;
use super::fingerprint::fingerprint;
use super::joint_map::JointMap;

/// One row of a map.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct MapRow {
    /// The source joint; `None` keeps the target at rest.
    pub source: Option<usize>,
    /// The target joint; `None` lets the source drive nothing.
    pub target: Option<usize>,
}

/// A map that does not fit.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum MapError {
    /// The first row is no heading.
    #[error("line 1: expected the heading `source,target`, found `{found}`")]
    Heading {
        /// What stands there.
        found: String,
    },
    /// A row has not two cells.
    #[error("line {line}: expected two joint names with a comma between, found `{found}`")]
    Cells {
        /// From 1.
        line: usize,
        /// What stands there.
        found: String,
    },
    /// No such joint.
    #[error(
        "line {line}: expected a joint of the {who}, found `{found}`; {who} joints are called as in `turnwright sample`"
    )]
    NoSuchJoint {
        /// From 1.
        line: usize,
        /// `source` or `target`.
        who: &'static str,
        /// What stands there.
        found: String,
    },
    /// A target joint twice.
    #[error("line {line}: expected each target joint once, found `{found}` again")]
    Twice {
        /// From 1.
        line: usize,
        /// The joint.
        found: String,
    },
}

/// Reads a map: a heading `source,target` (further columns are passed over), then a row for each pair. An empty cell means none; lines that
/// begin with `#` are passed over.
///
/// # Errors
/// With the line, what was expected and what was found.
pub fn read_map(text: &str, source: &Skeleton, target: &Skeleton) -> Result<Vec<MapRow>, MapError> {
    let mut rows: Vec<MapRow> = Vec::new();
    let mut has_heading = false;
    for (index, line) in text.trim_start_matches('\u{feff}').lines().enumerate() {
        let line_number = index + 1;
        if line.trim().is_empty() || line.trim_start().starts_with("# ") {
            continue;
        }
        let cells = cells(line);
        if !has_heading {
            let is_heading = cells.len() >= 2
                && cells[0].eq_ignore_ascii_case("source")
                && cells[1].eq_ignore_ascii_case("target");
            if !is_heading {
                return Err(MapError::Heading { found: line.trim().to_owned() });
            }
            has_heading = true;
            continue;
        }
        if cells.len() < 2 {
            return Err(MapError::Cells { line: line_number, found: line.trim().to_owned() });
        }
        let joint = |who: &'static str, skeleton: &Skeleton, name: &str| {
            if name.is_empty() {
                return Ok(None);
            }
            let found = skeleton.find(name);
            found.map(Some).ok_or_else(|| MapError::NoSuchJoint {
                line: line_number,
                who,
                found: name.to_owned(),
            })
        };
        let row = MapRow {
            source: joint("source", source, &cells[0])?,
            target: joint("target", target, &cells[1])?,
        };
        if row.target.is_some() && rows.iter().any(|other| other.target == row.target) {
            return Err(MapError::Twice { line: line_number, found: cells[1].clone() });
        }
        rows.push(row);
    }
    if has_heading { Ok(rows) } else { Err(MapError::Heading { found: "nothing".to_owned() }) }
}

/// Cells of a line, trimmed; a quoted one may hold commas, and two quotes for one.
fn cells(line: &str) -> Vec<String> {
    let mut cells = vec![String::new()];
    let mut is_quoted = false;
    let mut letters = line.chars().peekable();
    while let Some(letter) = letters.next() {
        let last = cells.len() - 1;
        match letter {
            '"' if is_quoted && letters.peek() == Some(&'"') => {
                letters.next();
                cells[last].push('"');
            }
            '"' if is_quoted || cells[last].trim().is_empty() => is_quoted = !is_quoted,
            ',' if !is_quoted => cells.push(String::new()),
            other => cells[last].push(other),
        }
    }
    cells.into_iter().map(|cell| cell.trim().to_owned()).collect()
}

/// The map as text that [`read_map`] reads: fingerprints of both skeletons, all links with how sure they are, and the target joints that nothing drives.
pub fn write_map(map: &JointMap, source: &Figure, target: &Figure) -> String {
    let cell = |text: &str| {
        if text.contains([',', '"', '#']) || text.trim() != text {
            format!("\"{}\"", text.replace('"', "\"\""))
        } else {
            text.to_owned()
        }
    };
    let mut lines = vec![format!(
        "# source skeleton {}\n# target skeleton {}\nsource,target,confidence,reason\n",
        fingerprint(&source.skeleton),
        fingerprint(&target.skeleton)
    )];
    for to in target.skeleton.listed() {
        let (from, confidence, reason) = match map.of_target(to) {
            Some(link) => (cell(source.skeleton.label(link.source)), link.confidence, cell(&link.reason)),
            // Chains of unequal length are spread; a row that keeps a joint at rest would end that.
            None if map.at_rest.contains(&to) => (String::new(), 1.0, "kept at rest".to_owned()),
            None => continue,
        };
        lines.push(format!("{from},{},{confidence:.2},{reason}\n", cell(target.skeleton.label(to))));
    }
    lines.concat()
}
