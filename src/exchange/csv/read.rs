//! From the bytes of a CSV file to a clip.

use std::borrow::Cow;
use std::fmt;
use std::sync::Arc;

use glam::DVec3;

use crate::clip::{Clip, FileAngles, FrameGrid, JointTracks, RotationTrack, Times, VectorTrack};
use crate::exchange::Note;
use crate::exchange::decimal::is_measure;
use crate::exchange::turns::Turns;
use crate::rotor::{Axis, Rotor};
use crate::skeleton::{Skeleton, SkeletonError};

use super::bones::{assemble, bone};
use super::cells::{Dialect, Records, comma_number, decoded, number, quoted, shown, text};
use super::columns::{Columns, CsvOptions, Role, columns};
use super::error::{CsvError, CsvErrorKind};

/// Rate of a clip of fewer than two rows.
const USUAL_RATE: f64 = 30.0;

/// Times from here on are counted from the first row: nobody waits a day for a clip to begin.
const LATEST_START_SECS: f64 = 86_400.0;

/// What is kept of a file so that it can be written again without touching what did not change.
#[derive(Clone)]
pub struct Document {
    /// The file as it was.
    pub(super) bytes: Arc<Vec<u8>>,
    /// What the columns are for; joints as indices in the skeleton.
    pub(super) columns: Columns,
    /// First byte after the header.
    pub(super) rows_start: usize,
    /// Rows that were read.
    pub(super) rows: usize,
    /// Seconds that were taken from every time.
    pub(super) start_secs: f64,
    /// What stands between cells and in numbers.
    pub(super) dialect: Dialect,
}

impl fmt::Debug for Document {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Document")
            .field("bytes", &self.bytes.len())
            .field("columns", &self.columns.roles.len())
            .field("rows", &self.rows)
            .finish_non_exhaustive()
    }
}

impl Document {
    /// The file as it was.
    pub fn bytes(&self) -> &[u8] {
        &self.bytes
    }

    /// The columns of a joint's angles in their order.
    pub(super) fn turns(&self, joint: usize) -> Turns {
        turns_of(&self.columns.roles, joint)
    }
}

fn turns_of(roles: &[Role], joint: usize) -> Turns {
    Turns::new(roles.iter().enumerate().filter_map(|(column, role)| match *role {
        Role::Angle(own, axis) if own == joint => Some((column, axis)),
        _ => None,
    }))
}

/// Reads a CSV text; see the module for its columns. `name` becomes the clip's name. Cells that are empty or not finite
/// become NaN. A file without rows gives a clip of no frames.
///
/// # Errors
/// When the header is not understood, a cell is no number, a row is short or long, or times do not rise; with line and
/// column.
pub fn read<'b>(
    bytes: impl Into<Cow<'b, [u8]>>,
    name: &str,
    options: &CsvOptions,
) -> Result<(Document, Clip, Vec<Note>), CsvError> {
    let owned = Arc::new(bytes.into().into_owned());
    let bytes = owned.as_slice();
    if u32::try_from(bytes.len()).is_err() {
        return Err(CsvError { line: 1, column: None, kind: CsvErrorKind::TooLarge(bytes.len()) });
    }
    let mut notes = Vec::new();
    let mut records = Records::new(bytes);
    let mut bones = Vec::new();
    while let Some(comment) = records.comment() {
        if let Some(found) = bone(&decoded(comment), records.line) {
            bones.push(found?);
        }
    }
    if bones.is_empty()
        && let Some(hierarchy) = &options.hierarchy
    {
        bones.clone_from(hierarchy);
    }
    if !records.header()? {
        let expected = "a header such as time,NAME.qx,NAME.qy,NAME.qz,NAME.qw";
        return Err(CsvError::unexpected(records.line, expected, "the end of the file"));
    }
    let header_line = records.line;
    if records.dialect != Dialect::RFC {
        let found = records.dialect.separator_name();
        let text = format!("expected commas between cells, found {found}: read so, and kept when writing");
        notes.push(Note::new(format!("line {header_line}"), text));
    }
    let header: Vec<String> = records.cells.iter().map(|&cell| text(bytes, cell).into_owned()).collect();
    let mut columns = columns(&header, header_line, options, &mut notes)?;
    let rows_start = records.pos();
    let values = rows(bytes, &mut records, &header, &columns, &mut notes)?;
    let width = header.len();
    refuse_places(&columns, &values, header_line)?;

    let (joints, indices) = assemble(&columns.joints, &bones, &mut notes)?;
    for role in &mut columns.roles {
        match role {
            Role::Quaternion(joint, _)
            | Role::Plane(joint, _)
            | Role::Angle(joint, _)
            | Role::Place(joint, _) => {
                *joint = indices[*joint];
            }
            Role::Time | Role::Unused => {}
        }
    }
    let skeleton = Skeleton::new(joints).map_err(|SkeletonError::ParentNotBefore { name, .. }| {
        CsvError::unexpected(header_line, "parents before children", quoted(&name))
    })?;
    let (times, start_secs) = times(&columns, &values, width, &mut notes);
    let rows = times.len();
    if rows == 0 {
        notes.push(Note::new("end of file", "expected rows, found none: a skeleton without a clip"));
    }
    let dialect = records.dialect;
    let document = Document { bytes: Arc::clone(&owned), columns, rows_start, rows, start_secs, dialect };
    let clip = clip(&document, skeleton, &values, width, times, name);
    Ok((document, clip, notes))
}

/// The names of a table's columns, whether or not they are understood.
///
/// # Errors
/// When a quote is not closed.
pub fn header(bytes: &[u8]) -> Result<Vec<String>, CsvError> {
    let mut records = Records::new(bytes);
    while records.comment().is_some() {}
    records.header()?;
    Ok(records.cells.iter().map(|&cell| text(bytes, cell).into_owned()).collect())
}

/// All cells, row by row; NaN where a column is not used.
fn rows(
    bytes: &[u8],
    records: &mut Records<'_>,
    header: &[String],
    columns: &Columns,
    notes: &mut Vec<Note>,
) -> Result<Vec<f64>, CsvError> {
    let mut values: Vec<f64> = Vec::new();
    let (mut missing, mut first_missing) = (0_usize, 0);
    let mut before = f64::NEG_INFINITY;
    // Between commas a comma in quotes would be a thousands mark as likely as a decimal one.
    let may_have_commas = records.dialect.separator != b',';
    let mut mark: Option<u8> = None;
    while records.next()? {
        let line = records.line;
        let cells = &records.cells;
        let surplus = cells.get(header.len()..).unwrap_or_default();
        if cells.len() < header.len() || surplus.iter().any(|cell| cell.start < cell.end) {
            let expected = format!("{} cells as in the header", header.len());
            let error = CsvError::unexpected(line, expected, cells.len().to_string());
            return Err(match header.get(cells.len()) {
                Some(name) => error.in_column(name),
                None => error,
            });
        }
        for ((&cell, role), name) in cells.iter().zip(&columns.roles).zip(header) {
            if *role == Role::Unused {
                values.push(f64::NAN);
                continue;
            }
            let with_comma = || comma_number(bytes, cell).filter(|_| may_have_commas);
            let value = number(bytes, cell)
                .or_else(with_comma)
                .ok_or_else(|| CsvError::unexpected(line, "a number", shown(bytes, cell)).in_column(name))?;
            let found = bytes[cell.start..cell.end].iter().find(|byte| matches!(byte, b'.' | b','));
            if let Some(&found) = found.filter(|_| may_have_commas && value.is_finite())
                && *mark.get_or_insert(found) != found
            {
                let expected = "one decimal mark in the whole file";
                let found = format!("points and commas, the other one in {}", shown(bytes, cell));
                return Err(CsvError::unexpected(line, expected, found).in_column(name));
            }
            if *role == Role::Time {
                if !is_measure(value) {
                    let expected = "a finite time";
                    return Err(CsvError::unexpected(line, expected, shown(bytes, cell)).in_column(name));
                }
                if value <= before {
                    let expected = format!("a time after {before}");
                    return Err(CsvError::unexpected(line, expected, shown(bytes, cell)).in_column(name));
                }
                before = value;
            } else if value.is_nan() {
                missing += 1;
                if missing == 1 {
                    first_missing = line;
                }
            }
            values.push(value);
        }
    }
    if mark == Some(b',') {
        records.dialect.decimal_comma = true;
        notes.push(Note::new("rows", "expected decimal points, found decimal commas: read as points"));
    }
    if missing > 0 {
        let text = format!("expected finite numbers, found {missing} cells that are not: those are missing");
        notes.push(Note::new(format!("line {first_missing}"), text));
    }
    Ok(values)
}

/// The times in seconds, and how much was taken from them.
fn times(columns: &Columns, values: &[f64], width: usize, notes: &mut Vec<Note>) -> (Vec<f64>, f64) {
    let Some(column) = columns.roles.iter().position(|role| *role == Role::Time) else {
        return (Vec::new(), 0.0);
    };
    let scale = columns.unit.in_a_second();
    let mut times: Vec<f64> = values.chunks_exact(width).map(|row| row[column] / scale).collect();
    let first = times.first().copied().unwrap_or(0.0);
    let start_secs = if (0.0..LATEST_START_SECS).contains(&first) { 0.0 } else { first };
    if start_secs != 0.0 {
        for time in &mut times {
            *time -= start_secs;
        }
        let text = format!("expected times from 0 on, found {first} s first: counted from the first row");
        notes.push(Note::new("times", text));
    }
    (times, start_secs)
}

fn clip(
    document: &Document,
    skeleton: Skeleton,
    values: &[f64],
    width: usize,
    times: Vec<f64>,
    name: &str,
) -> Clip {
    let duration_secs = times.last().copied().unwrap_or(0.0);
    let times = Times::Listed(times.into());
    let rows = || values.chunks_exact(width);
    let roles = &document.columns.roles;
    let mut quaternions = vec![[None; 4]; skeleton.len()];
    let mut planes = vec![[None; 3]; skeleton.len()];
    let mut places = vec![[None; 3]; skeleton.len()];
    let mut has_angles = vec![false; skeleton.len()];
    for (column, role) in roles.iter().enumerate() {
        match *role {
            Role::Quaternion(joint, part) => quaternions[joint][part] = Some(column),
            Role::Plane(joint, part) => planes[joint][part] = Some(column),
            Role::Place(joint, axis) => places[joint][axis.index()] = Some(column),
            Role::Angle(joint, _) => has_angles[joint] = true,
            Role::Time | Role::Unused => {}
        }
    }
    let cell = |row: &[f64], column: Option<usize>| column.map_or(0.0, |column| row[column]);
    let tracks = |joint: usize| {
        let turns = if has_angles[joint] { document.turns(joint) } else { Turns { groups: Vec::new() } };
        let rotation = if document.rows == 0 {
            None
        } else if quaternions[joint][0].is_some() {
            let key = |row: &[f64]| Rotor::from_xyzw(quaternions[joint].map(|column| cell(row, column)));
            let keys: Arc<[Rotor]> = rows().map(key).collect();
            Some(RotationTrack::from_rotors(times.clone(), keys))
        } else if planes[joint][0].is_some() {
            let degrees = rows().map(|row| planes[joint].map(|column| cell(row, column))).collect();
            Some(RotationTrack::from_plane_angles(times.clone(), degrees))
        } else {
            turns.order().map(|order| {
                let columns: [Option<usize>; 3] =
                    std::array::from_fn(|i| turns.groups.get(i).and_then(|group| group.1.first().copied()));
                let degrees = rows().map(|row| columns.map(|column| cell(row, column))).collect();
                let axes: Vec<Axis> = turns.axes().collect();
                RotationTrack::from_angles(times.clone(), FileAngles { axes, order, degrees })
            })
        };
        let rest = skeleton.joints()[joint].rest.translation;
        let is_placed = document.rows > 0 && places[joint].iter().any(Option::is_some);
        let translation = is_placed.then(|| {
            let place = |row: &[f64]| {
                let part = |axis: usize| places[joint][axis].map_or(rest[axis], |column| row[column]);
                DVec3::new(part(0), part(1), part(2))
            };
            let keys: Arc<[DVec3]> = rows().map(place).collect();
            VectorTrack::straight(times.clone(), keys)
        });
        Arc::new(JointTracks { rotation, translation, scale: None })
    };
    let joints = (0..skeleton.len()).map(tracks).collect();
    let rate = times.median_step().map_or(USUAL_RATE, |step| 1.0 / step);
    Clip {
        name: name.to_owned(),
        joints,
        skeleton: Arc::new(skeleton),
        grid: FrameGrid { times, rate },
        duration_secs,
    }
}

/// Places of joints have the same headers as angles about x, y and z. They give themselves away: limbs keep their length
/// while both ends move. No two joints' angles do that.
fn refuse_places(columns: &Columns, values: &[f64], line: u32) -> Result<(), CsvError> {
    let width = columns.roles.len();
    let mut triples: Vec<[Option<usize>; 3]> = vec![[None; 3]; columns.joints.len()];
    for (column, role) in columns.roles.iter().enumerate() {
        if let Role::Angle(joint, axis) = role {
            triples[*joint][axis.index()] = Some(column);
        }
    }
    let points: Vec<(usize, [usize; 3])> = triples
        .iter()
        .enumerate()
        .filter_map(|(joint, triple)| Some((joint, [triple[0]?, triple[1]?, triple[2]?])))
        .collect();
    let place = |row: &[f64], columns: [usize; 3]| DVec3::from_array(columns.map(|column| row[column]));
    let mut stiff = None;
    let (mut stiff_count, mut moving_count) = (0, 0);
    for pair in points.windows(2) {
        let [(joint, from), (next, to)] = [pair[0], pair[1]];
        let mut rows = values.chunks_exact(width);
        let Some(first) = rows.next() else { return Ok(()) };
        let (start, length) = (place(first, from), place(first, from).distance(place(first, to)));
        let (mut moved, mut stretched, mut turned) = (0.0_f64, 0.0_f64, 0.0_f64);
        for row in rows {
            let (a, b) = (place(row, from), place(row, to));
            moved = moved.max(a.distance(start));
            stretched = stretched.max((a.distance(b) - length).abs());
            turned = turned.max(((b - a) - (place(first, to) - start)).length());
        }
        if length > 0.0 && moved > 0.01 * length && turned > 0.01 * length {
            moving_count += 1;
            if stretched < 1e-3 * length {
                stiff_count += 1;
                stiff.get_or_insert((joint, next, length));
            }
        }
    }
    match stiff {
        Some((joint, next, length)) if stiff_count >= 2 && stiff_count * 3 >= moving_count => {
            let found = format!(
                "places: {} and {} stay {length:.4} apart while they move",
                columns.joints[joint], columns.joints[next]
            );
            Err(CsvError::unexpected(line, "turns in columns NAME.x NAME.y NAME.z", found))
        }
        _ => Ok(()),
    }
}
