//! From the bytes of a CSV file to a clip.

use std::borrow::Cow;
use std::fmt;
use std::sync::Arc;

use glam::DVec3;

use crate::clip::{Clip, FrameGrid, Times};
use crate::exchange::Note;
use crate::exchange::decimal::is_measure;
use crate::exchange::rows::{JointColumns, Rows, TurnColumns};
use crate::exchange::text_file::TextFile;
use crate::exchange::turns::Turns;
use crate::rotor::Axis;
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
    /// The file as it was, and its text.
    pub(super) file: TextFile,
    /// What the columns are for; joints as indices in the skeleton.
    pub(super) columns: Columns,
    /// First byte after the header.
    pub(super) rows_start: usize,
    /// Rows that are used.
    pub(super) rows: usize,
    /// Rows that are not, as the next has the very same time; counted among all, ascending.
    pub(super) repeated: Vec<u32>,
    /// What was taken from every time, in the unit of the file.
    pub(super) start: f64,
    /// What stands between cells and in numbers.
    pub(super) dialect: Dialect,
    /// It brings its skeleton along, in lines before its header.
    pub(super) has_skeleton: bool,
}

impl fmt::Debug for Document {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Document")
            .field("bytes", &self.file.bytes().len())
            .field("columns", &self.columns.roles.len())
            .field("rows", &self.rows)
            .finish_non_exhaustive()
    }
}

impl Document {
    /// The file as it was.
    pub fn bytes(&self) -> &[u8] {
        self.file.bytes()
    }

    /// Whether the table brings its skeleton along: then no other is used.
    pub fn has_skeleton(&self) -> bool {
        self.has_skeleton
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
/// become NaN. Of rows at the very same time the last is used. A file without rows gives a clip of no frames.
///
/// # Errors
/// When the header is not understood, a cell is no number, a row is short or long, or times go back; with line and
/// column.
pub fn read<'b>(
    bytes: impl Into<Cow<'b, [u8]>>,
    name: &str,
    options: &CsvOptions,
) -> Result<(Document, Clip, Vec<Note>), CsvError> {
    let file = TextFile::new(bytes.into().into_owned()).map_err(CsvError::from)?;
    let bytes = file.text();
    if u32::try_from(bytes.len()).is_err() {
        return Err(CsvError { line: 1, column: None, kind: CsvErrorKind::TooLarge(bytes.len()) });
    }
    let mut notes = Vec::new();
    notes.extend(file.note());
    let mut records = Records::new(bytes);
    let mut bones = Vec::new();
    while let Some(comment) = records.comment() {
        if let Some(found) = bone(&decoded(comment), records.line) {
            bones.push(found?);
        }
    }
    let has_skeleton = !bones.is_empty();
    if !has_skeleton && let Some(hierarchy) = &options.hierarchy {
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
    let (joints, indices) = assemble(&columns.joints, &bones, &mut notes)?;
    let mut places = Places::new(&columns);
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
    // A row's time is there twice when the list is shared at the end.
    let kept_bytes = 2 * size_of::<f64>();
    let mut rows =
        Rows::new(joint_columns(&columns, &skeleton), header.len(), file.bytes().len(), kept_bytes);
    let mut table = Table {
        bytes,
        header: &header,
        columns: &columns,
        times: Vec::new(),
        repeated: Vec::new(),
        first_repeated_line: 0,
        missing: 0,
        first_missing_line: 0,
        mark: None,
    };
    table.read(&mut records, &mut rows, &mut places)?;
    table.tell(&mut notes);
    records.dialect.decimal_comma = table.mark == Some(b',');
    let Table { times: stored_times, repeated, .. } = table;
    places.refuse(&columns.joints, header_line)?;
    let (times, start) = times(&columns, stored_times, &mut notes);
    let count = times.len();
    if count == 0 {
        notes.push(Note::new("end of file", "expected rows, found none: a skeleton without a clip"));
    }
    let duration_secs = times.last().copied().unwrap_or(0.0);
    let times = Times::Listed(times.into());
    let clip = Clip {
        name: name.to_owned(),
        joints: rows.finish(&times),
        skeleton: Arc::new(skeleton),
        grid: FrameGrid { rate: times.median_step().map_or(USUAL_RATE, |step| 1.0 / step), times },
        duration_secs,
    };
    let dialect = records.dialect;
    let document = Document {
        file: file.clone(),
        columns,
        rows_start,
        rows: count,
        repeated,
        start,
        dialect,
        has_skeleton,
    };
    Ok((document, clip, notes))
}

/// The names of a table's columns, whether or not they are understood.
///
/// # Errors
/// When a quote is not closed.
pub fn header(bytes: &[u8]) -> Result<Vec<String>, CsvError> {
    let text_bytes = TextFile::text_of(bytes)?;
    let bytes = &*text_bytes;
    let mut records = Records::new(bytes);
    while records.comment().is_some() {}
    records.header()?;
    Ok(records.cells.iter().map(|&cell| text(bytes, cell).into_owned()).collect())
}

/// What the columns say of each joint of the skeleton.
fn joint_columns(columns: &Columns, skeleton: &Skeleton) -> Vec<JointColumns> {
    let mut quaternions = vec![[None; 4]; skeleton.len()];
    let mut planes = vec![[None; 3]; skeleton.len()];
    let mut places = vec![[None; 3]; skeleton.len()];
    let mut angles: Vec<Vec<(usize, Axis)>> = vec![Vec::new(); skeleton.len()];
    for (column, role) in columns.roles.iter().enumerate() {
        match *role {
            Role::Quaternion(joint, part) => quaternions[joint][part] = Some(column),
            Role::Plane(joint, part) => planes[joint][part] = Some(column),
            Role::Place(joint, axis) => places[joint][axis.index()] = Some(column),
            Role::Angle(joint, axis) => angles[joint].push((column, axis)),
            Role::Time | Role::Unused => {}
        }
    }
    let of_joint = |(joint, angles): (usize, Vec<(usize, Axis)>)| {
        let turn = match (quaternions[joint], planes[joint]) {
            ([Some(x), Some(y), Some(z), Some(w)], _) => TurnColumns::Quaternion([x, y, z, w]),
            (_, [Some(yz), Some(zx), Some(xy)]) => TurnColumns::Planes([yz, zx, xy]),
            _ if angles.is_empty() => TurnColumns::None,
            _ => TurnColumns::Angles(Turns::new(angles)),
        };
        let rest = skeleton.joints()[joint].rest.translation.to_array();
        JointColumns { turn, place: places[joint], rest }
    };
    angles.into_iter().enumerate().map(of_joint).collect()
}

/// The rows of a table, one after the other.
struct Table<'a> {
    bytes: &'a [u8],
    header: &'a [String],
    columns: &'a Columns,
    /// The time of each row that is used, as it stands there.
    times: Vec<f64>,
    /// Rows that are passed over, since the next has the very same time.
    repeated: Vec<u32>,
    first_repeated_line: u32,
    missing: usize,
    first_missing_line: u32,
    /// The decimal mark that was found.
    mark: Option<u8>,
}

impl Table<'_> {
    /// The numbers of the record last given; NaN where a column is not used. And its time.
    fn row(&mut self, records: &Records<'_>, row: &mut Vec<f64>) -> Result<f64, CsvError> {
        let Self { bytes, header, columns, .. } = *self;
        let line = records.line;
        let cells = &records.cells;
        // Between commas a comma in quotes would be a thousands mark as likely as a decimal one.
        let may_have_commas = records.dialect.separator != b',';
        let surplus = cells.get(header.len()..).unwrap_or_default();
        if cells.len() < header.len() || surplus.iter().any(|cell| cell.start < cell.end) {
            let expected = format!("{} cells as in the header", header.len());
            let error = CsvError::unexpected(line, expected, cells.len().to_string());
            return Err(match header.get(cells.len()) {
                Some(name) => error.in_column(name),
                None => error,
            });
        }
        let mut time = f64::NAN;
        row.clear();
        for ((&cell, role), name) in cells.iter().zip(&columns.roles).zip(header) {
            if *role == Role::Unused {
                row.push(f64::NAN);
                continue;
            }
            let with_comma = || comma_number(bytes, cell).filter(|_| may_have_commas);
            let value = number(bytes, cell)
                .or_else(with_comma)
                .ok_or_else(|| CsvError::unexpected(line, "a number", shown(bytes, cell)).in_column(name))?;
            let found = bytes[cell.start..cell.end].iter().find(|byte| matches!(byte, b'.' | b','));
            if let Some(&found) = found.filter(|_| may_have_commas && value.is_finite())
                && *self.mark.get_or_insert(found) != found
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
                if let Some(before) = self.times.last().filter(|&&before| value < before) {
                    let expected = format!("a time of {before} or later");
                    return Err(CsvError::unexpected(line, expected, shown(bytes, cell)).in_column(name));
                }
                time = value;
            } else if value.is_nan() {
                self.missing += 1;
                if self.missing == 1 {
                    self.first_missing_line = line;
                }
            }
            row.push(value);
        }
        Ok(time)
    }

    /// Reads all rows into the tracks. Of rows at the very same time the last one counts.
    fn read(
        &mut self,
        records: &mut Records<'_>,
        rows: &mut Rows,
        places: &mut Places,
    ) -> Result<(), CsvError> {
        let start = records.pos();
        let whole = self.bytes.len().saturating_sub(start);
        // How many rows there will be if the rest is like what was read.
        let expected = |rows: usize, pos: usize| {
            let share = whole as f64 / pos.saturating_sub(start).max(1) as f64;
            (rows as f64 * share).ceil() as usize
        };
        let too_many = |line: u32, most_bytes: usize| {
            let kind = CsvErrorKind::TooManyNumbers { most_mb: most_bytes >> 20 };
            CsvError { line, column: None, kind }
        };
        let (mut row, mut before) = (Vec::with_capacity(self.header.len()), Vec::new());
        // A row has a byte at least, and the file fewer than 2³² of them.
        let mut count = 0_u32;
        while records.next()? {
            let time = self.row(records, &mut row)?;
            let line = records.line;
            if self.times.last() == Some(&time) {
                if self.repeated.is_empty() {
                    self.first_repeated_line = line;
                }
                self.repeated.push(count - 1);
            } else {
                self.times.push(time);
                // The row before is known to stay only now.
                if count > 0 {
                    places.add(&before);
                    rows.tile.extend_from_slice(&before);
                }
                if rows.tile.len() >= rows.tile_len {
                    let expected = expected(self.times.len(), records.pos());
                    if self.times.capacity() < expected {
                        self.times.reserve_exact((expected + expected / 16).saturating_sub(self.times.len()));
                    }
                    rows.hand_out(expected).map_err(|most| too_many(line, most))?;
                }
            }
            std::mem::swap(&mut row, &mut before);
            count += 1;
        }
        if count > 0 {
            places.add(&before);
            rows.tile.extend_from_slice(&before);
        }
        rows.hand_out(self.times.len()).map_err(|most| too_many(records.line, most))
    }

    /// Tells what was odd.
    fn tell(&self, notes: &mut Vec<Note>) {
        if self.mark == Some(b',') {
            notes.push(Note::new("rows", "expected decimal points, found decimal commas: read as points"));
        }
        if self.missing > 0 {
            let text = format!(
                "expected finite numbers, found {} cells that are not: those are missing",
                self.missing
            );
            notes.push(Note::new(format!("line {}", self.first_missing_line), text));
        }
        if !self.repeated.is_empty() {
            let text = format!(
                "expected rising times, found {} rows at the time of the row before: of each time the last row is used, the others are left as they are",
                self.repeated.len()
            );
            notes.push(Note::new(format!("line {}", self.first_repeated_line), text));
        }
    }
}

/// The times in seconds, and how much was taken from them in the unit of the file.
fn times(columns: &Columns, mut times: Vec<f64>, notes: &mut Vec<Note>) -> (Vec<f64>, f64) {
    let scale = columns.unit.in_a_second();
    let first = times.first().copied().unwrap_or(0.0);
    let is_clock = !(0.0..LATEST_START_SECS).contains(&(first / scale));
    // Taken away before the unit is changed: of a clock's microseconds the last would be rounded off.
    let start = if is_clock { first } else { 0.0 };
    for time in &mut times {
        *time = (*time - start) / scale;
    }
    if is_clock {
        let text =
            format!("expected times from 0 on, found {} s first: counted from the first row", first / scale);
        notes.push(Note::new("times", text));
    }
    (times, start)
}

/// Places of joints have the same headers as angles about x, y and z. They give themselves away: limbs keep their length
/// while both ends move. No two joints' angles do that.
struct Places {
    limbs: Vec<Limb>,
}

/// Two joints that follow each other in the header, as if their columns were places.
struct Limb {
    joints: [usize; 2],
    columns: [[usize; 3]; 2],
    /// The first joint's place in the first row, and the way from there to the second.
    first: Option<(DVec3, DVec3)>,
    moved: f64,
    stretched: f64,
    turned: f64,
}

impl Places {
    fn new(columns: &Columns) -> Self {
        let mut triples: Vec<[Option<usize>; 3]> = vec![[None; 3]; columns.joints.len()];
        for (column, role) in columns.roles.iter().enumerate() {
            if let Role::Angle(joint, axis) = role {
                triples[*joint][axis.index()] = Some(column);
            }
        }
        let whole = triples.iter().enumerate();
        let points: Vec<(usize, [usize; 3])> =
            whole.filter_map(|(joint, triple)| Some((joint, [triple[0]?, triple[1]?, triple[2]?]))).collect();
        let limbs = points.windows(2).map(|pair| Limb {
            joints: [pair[0].0, pair[1].0],
            columns: [pair[0].1, pair[1].1],
            first: None,
            moved: 0.0,
            stretched: 0.0,
            turned: 0.0,
        });
        Self { limbs: limbs.collect() }
    }

    fn add(&mut self, row: &[f64]) {
        for limb in &mut self.limbs {
            let [from, to] = limb.columns.map(|own| DVec3::from_array(own.map(|column| row[column])));
            let (start, way) = *limb.first.get_or_insert((from, to - from));
            limb.moved = limb.moved.max(from.distance(start));
            limb.stretched = limb.stretched.max((from.distance(to) - way.length()).abs());
            limb.turned = limb.turned.max(((to - from) - way).length());
        }
    }

    /// The complaint where the columns hold places.
    fn refuse(&self, names: &[String], line: u32) -> Result<(), CsvError> {
        let length = |limb: &Limb| limb.first.map_or(0.0, |(_, way)| way.length());
        let moves = |limb: &&Limb| {
            let length = length(limb);
            length > 0.0 && limb.moved > 0.01 * length && limb.turned > 0.01 * length
        };
        let moving: Vec<&Limb> = self.limbs.iter().filter(moves).collect();
        let mut stiff = moving.iter().filter(|limb| limb.stretched < 1e-3 * length(limb));
        let Some(first) = stiff.next() else { return Ok(()) };
        let n_stiff = 1 + stiff.count();
        if n_stiff < 2 || n_stiff * 3 < moving.len() {
            return Ok(());
        }
        let found = format!(
            "places: {} and {} stay {:.4} apart while they move",
            names[first.joints[0]],
            names[first.joints[1]],
            length(first)
        );
        Err(CsvError::unexpected(line, "turns in columns NAME.x NAME.y NAME.z", found))
    }
}
