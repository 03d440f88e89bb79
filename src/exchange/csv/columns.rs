//! What each column of a CSV clip is for.

use std::collections::{HashMap, HashSet};
use std::fmt;
use std::path::PathBuf;
use std::str::FromStr;

use crate::exchange::Note;
use crate::rotor::Axis;

use super::bones::{Bone, MAX_JOINTS};
use super::cells::quoted;
use super::error::{CsvError, CsvErrorKind};

/// How a header that is not ours is to be read.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct CsvOptions {
    /// The columns of one joint's quaternion.
    pub columns: Option<NamedColumns>,
    /// The unit of the time column; seconds, or what its header says, where not given.
    pub time_unit: Option<TimeUnit>,
    /// A skeleton from a file of its own ([`super::hierarchy`]) or of another clip ([`super::bones_of`]); the text's own lines
    /// come first.
    pub hierarchy: Option<Vec<Bone>>,
    /// The file that it is to be taken from, where it is not at hand.
    pub skeleton: Option<PathBuf>,
}

/// The names of the columns that hold the time and the quaternion of one joint: `time=…,w=…,x=…,y=…,z=…`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct NamedColumns {
    /// The time.
    pub time: String,
    /// x, y, z, w.
    pub xyzw: [String; 4],
}

/// As it is typed.
impl fmt::Display for NamedColumns {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let [x, y, z, w] = &self.xyzw;
        write!(f, "time={},w={w},x={x},y={y},z={z}", self.time)
    }
}

/// Why a text names no columns.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("expected columns as time=NAME,w=NAME,x=NAME,y=NAME,z=NAME, found `{0}`")]
pub struct NoColumns(String);

impl FromStr for NamedColumns {
    type Err = NoColumns;

    fn from_str(text: &str) -> Result<Self, NoColumns> {
        const KEYS: [&str; 5] = ["time", "x", "y", "z", "w"];
        let wrong = || NoColumns(text.to_owned());
        let mut names: [Option<String>; 5] = Default::default();
        for part in text.split(',') {
            let (key, name) = part.split_once('=').ok_or_else(wrong)?;
            let key = KEYS.iter().position(|own| *own == key.trim()).ok_or_else(wrong)?;
            if name.trim().is_empty() || names[key].replace(name.trim().to_owned()).is_some() {
                return Err(wrong());
            }
        }
        let [Some(time), Some(x), Some(y), Some(z), Some(w)] = names else { return Err(wrong()) };
        Ok(Self { time, xyzw: [x, y, z, w] })
    }
}

/// The unit of a time column.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TimeUnit {
    /// Seconds.
    Seconds,
    /// Thousandths.
    Milliseconds,
    /// Millionths.
    Microseconds,
}

impl TimeUnit {
    /// As it is typed.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Seconds => "s",
            Self::Milliseconds => "ms",
            Self::Microseconds => "us",
        }
    }

    /// How many make a second. Dividing by it keeps more than multiplying by a thousandth, which no binary number is.
    pub const fn in_a_second(self) -> f64 {
        match self {
            Self::Seconds => 1.0,
            Self::Milliseconds => 1e3,
            Self::Microseconds => 1e6,
        }
    }
}

/// Why a text is no time unit.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[error("expected s, ms or us, found `{0}`")]
pub struct NoTimeUnit(String);

impl FromStr for TimeUnit {
    type Err = NoTimeUnit;

    fn from_str(text: &str) -> Result<Self, NoTimeUnit> {
        match text {
            "s" | "sec" => Ok(Self::Seconds),
            "ms" => Ok(Self::Milliseconds),
            "us" | "µs" | "μs" => Ok(Self::Microseconds),
            _ => Err(NoTimeUnit(text.to_owned())),
        }
    }
}

/// What one column holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(super) enum Role {
    /// The time of the row.
    Time,
    /// Part x, y, z or w (0 to 3) of a joint's quaternion.
    Quaternion(usize, usize),
    /// The plane angle yz, zx or xy (0 to 2) of a joint in degrees.
    Plane(usize, usize),
    /// A turn about an axis in degrees, applied in the order of the columns.
    Angle(usize, Axis),
    /// A place along an axis.
    Place(usize, Axis),
    /// Nothing that is used.
    Unused,
}

/// The columns of a header; joints are numbered in the order of their first column.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Columns {
    /// One for each column.
    pub(super) roles: Vec<Role>,
    /// The names of the joints.
    pub(super) joints: Vec<String>,
    /// The unit of the time.
    pub(super) unit: TimeUnit,
}

/// Sorts out the names of a header.
pub(super) fn columns(
    header: &[String],
    line: u32,
    options: &CsvOptions,
    notes: &mut Vec<Note>,
) -> Result<Columns, CsvError> {
    let mut seen: HashMap<&str, usize> = HashMap::new();
    for name in header.iter().filter(|name| !name.is_empty()) {
        if seen.insert(name, 0).is_some() {
            return Err(CsvError::unexpected(line, "each column once", quoted(name)).in_column(name));
        }
    }
    if let Some(named) = &options.columns {
        return one_joint(header, line, named, options.time_unit.unwrap_or(TimeUnit::Seconds), notes);
    }
    let lower: Vec<String> = header.iter().map(|name| name.to_lowercase()).collect();
    refuse_a_hierarchy(&lower, header, line)?;
    if let Some(found) = sensor_columns(&lower, header, line, options, notes) {
        return found;
    }
    let (time, unit) = time_column(&lower, header, line, options)?;
    let mut joints: Vec<String> = Vec::new();
    let mut numbers: HashMap<&str, usize> = HashMap::new();
    let mut roles = Vec::with_capacity(header.len());
    let mut said: HashSet<Role> = HashSet::new();
    for (column, name) in header.iter().enumerate() {
        let role = |joint: usize, part: &str| {
            Some(match part.to_ascii_lowercase().as_str() {
                "qx" => Role::Quaternion(joint, 0),
                "qy" => Role::Quaternion(joint, 1),
                "qz" => Role::Quaternion(joint, 2),
                "qw" => Role::Quaternion(joint, 3),
                "yz" => Role::Plane(joint, 0),
                "zx" => Role::Plane(joint, 1),
                "xy" => Role::Plane(joint, 2),
                "x" => Role::Angle(joint, Axis::X),
                "y" => Role::Angle(joint, Axis::Y),
                "z" => Role::Angle(joint, Axis::Z),
                "tx" => Role::Place(joint, Axis::X),
                "ty" => Role::Place(joint, Axis::Y),
                "tz" => Role::Place(joint, Axis::Z),
                _ => return None,
            })
        };
        let found = name.rsplit_once('.').and_then(|(joint, part)| {
            let number = numbers.get(joint).copied().unwrap_or(joints.len());
            let role = role(number, part)?;
            if number == joints.len() {
                joints.push(joint.to_owned());
                numbers.insert(joint, number);
            }
            Some(role)
        });
        roles.push(match found {
            _ if column == time => Role::Time,
            Some(role) => role,
            None => {
                tell_unused(notes, line, name);
                Role::Unused
            }
        });
        // `a.qx` and `a.QX` are two names of one thing.
        if let Some(role) = roles.last().filter(|role| !matches!(role, Role::Time | Role::Unused))
            && !said.insert(*role)
        {
            return Err(CsvError::unexpected(line, "each part of a joint once", quoted(name)).in_column(name));
        }
        if joints.len() > MAX_JOINTS {
            let kind = CsvErrorKind::TooManyJoints { limit: MAX_JOINTS };
            return Err(CsvError { line, column: Some(name.clone()), kind });
        }
    }
    if joints.is_empty() {
        let expected = "columns such as NAME.qx, NAME.yz or NAME.z for each joint, or --columns time=NAME,w=NAME,x=NAME,y=NAME,z=NAME";
        return Err(CsvError::unexpected(line, expected, quoted(&header.join(","))));
    }
    let found = Columns { roles, joints, unit };
    complete(&found, line)?;
    Ok(found)
}

/// The time column of a table of joints, and its unit: that of our own files, else the only one that is called a time.
fn time_column(
    lower: &[String],
    header: &[String],
    line: u32,
    options: &CsvOptions,
) -> Result<(usize, TimeUnit), CsvError> {
    if let Some(own) = lower.iter().position(|name| name == "time" || name == "time_s") {
        return Ok((own, options.time_unit.unwrap_or(TimeUnit::Seconds)));
    }
    let mut times = lower.iter().enumerate().filter_map(|(column, name)| Some((column, unit_text(name)?)));
    let (Some((time, unit)), None) = (times.next(), times.next()) else {
        let expected =
            "one column time, time_s, time_ms or time_us, or --columns time=NAME,w=NAME,x=NAME,y=NAME,z=NAME";
        return Err(CsvError::unexpected(line, expected, quoted(&header.join(","))));
    };
    let unit = options.time_unit.or_else(|| unit_of(&lower[time], unit));
    unit.map(|unit| (time, unit)).ok_or_else(|| no_unit(&header[time], line))
}

fn no_unit(name: &str, line: u32) -> CsvError {
    CsvError::unexpected(line, "a time with its unit, or --time-unit s, ms or us", quoted(name))
}

/// Of a table with hundreds of other columns the first few are enough.
fn tell_unused(notes: &mut Vec<Note>, line: u32, name: &str) {
    const MOST: usize = 12;
    if !name.is_empty() && notes.len() < MOST {
        let text = "expected a part of a joint such as NAME.qx, found none: not used";
        notes.push(Note::new(format!("line {line}, column {name}"), text));
    }
}

/// A joint turns in one way, and a quaternion and plane angles are there in full.
fn complete(columns: &Columns, line: u32) -> Result<(), CsvError> {
    let mut parts = vec![[0_u8; 3]; columns.joints.len()];
    for role in &columns.roles {
        match *role {
            Role::Quaternion(joint, _) => parts[joint][0] += 1,
            Role::Plane(joint, _) => parts[joint][1] += 1,
            Role::Angle(joint, _) => parts[joint][2] += 1,
            Role::Time | Role::Place(..) | Role::Unused => {}
        }
    }
    for (name, [quaternion, plane, angles]) in columns.joints.iter().zip(parts) {
        let found = format!(
            "{quaternion} of a quaternion, {plane} plane angles and {angles} angles for joint {name}"
        );
        let kinds = [quaternion, plane, angles].into_iter().filter(|&count| count > 0).count();
        if kinds > 1 {
            return Err(CsvError::unexpected(line, "turns of one kind for each joint", found));
        }
        if !matches!(quaternion, 0 | 4) {
            let expected = format!("all of {name}.qx .qy .qz .qw");
            return Err(CsvError::unexpected(line, expected, format!("{quaternion} of them")));
        }
        if !matches!(plane, 0 | 3) {
            let expected = format!("all of {name}.yz .zx .xy");
            return Err(CsvError::unexpected(line, expected, format!("{plane} of them")));
        }
    }
    Ok(())
}

fn refuse_a_hierarchy(lower: &[String], header: &[String], line: u32) -> Result<(), CsvError> {
    let has = |name: &str| lower.iter().any(|own| own == name);
    if has("joint") && has("parent") {
        let found =
            format!("a skeleton ({}), which belongs beside the NAME_rot.csv it is for", header.join(","));
        return Err(CsvError::unexpected(line, "a time column and turns", found));
    }
    Ok(())
}

/// `Time (s),W,X,Y,Z` and its like: one joint, called `sensor`.
fn sensor_columns(
    lower: &[String],
    header: &[String],
    line: u32,
    options: &CsvOptions,
    notes: &mut Vec<Note>,
) -> Option<Result<Columns, CsvError>> {
    let spellings = [["x", "y", "z", "w"], ["qx", "qy", "qz", "qw"]];
    let place = |name: &str| lower.iter().position(|own| own == name);
    let found = spellings.iter().find_map(|names| {
        let places: Vec<usize> = names.iter().filter_map(|name| place(name)).collect();
        <[usize; 4]>::try_from(places).ok()
    })?;
    let mut times = lower.iter().enumerate().filter_map(|(column, name)| Some((column, unit_text(name)?)));
    let (Some((time, unit)), None) = (times.next(), times.next()) else { return None };
    let Some(unit) = options.time_unit.or_else(|| unit_of(&lower[time], unit)) else {
        return Some(Err(no_unit(&header[time], line)));
    };
    let named = NamedColumns { time: header[time].clone(), xyzw: found.map(|column| header[column].clone()) };
    Some(one_joint(header, line, &named, unit, notes))
}

/// What a name (in lower case) of a time column says of its unit, nothing perhaps; `None` for any other name.
fn unit_text(name: &str) -> Option<&str> {
    let rest = name.strip_prefix("timestamp").or(name.strip_prefix("time"))?;
    let unit = rest.trim_matches(|c: char| c.is_whitespace() || "()[]_".contains(c));
    (unit.is_empty() || unit_of(name, unit).is_some()).then_some(unit)
}

/// Plain `time` is in seconds, as in our own files; a clock's `timestamp` may be in anything.
fn unit_of(name: &str, unit: &str) -> Option<TimeUnit> {
    match unit {
        "" => (name == "time").then_some(TimeUnit::Seconds),
        "seconds" => Some(TimeUnit::Seconds),
        _ => unit.parse().ok(),
    }
}

fn one_joint(
    header: &[String],
    line: u32,
    named: &NamedColumns,
    unit: TimeUnit,
    notes: &mut Vec<Note>,
) -> Result<Columns, CsvError> {
    let place = |name: &str| {
        let exact = header.iter().position(|own| own == name);
        exact
            .or_else(|| header.iter().position(|own| own.eq_ignore_ascii_case(name)))
            .ok_or_else(|| CsvError::unexpected(line, format!("a column {name}"), quoted(&header.join(","))))
    };
    let mut roles = vec![Role::Unused; header.len()];
    roles[place(&named.time)?] = Role::Time;
    for (part, name) in named.xyzw.iter().enumerate() {
        let column = place(name)?;
        if roles[column] != Role::Unused {
            return Err(CsvError::unexpected(line, "five different columns", format!("{name} twice")));
        }
        roles[column] = Role::Quaternion(0, part);
    }
    for (role, name) in roles.iter().zip(header) {
        if *role == Role::Unused {
            tell_unused(notes, line, name);
        }
    }
    Ok(Columns { roles, joints: vec!["sensor".to_owned()], unit })
}
