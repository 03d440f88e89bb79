//! Writing results: back into their own file with nothing else touched, or into another format.

use std::borrow::Cow;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use crate::clip::{self, Clip, RotationTrack, Times, VectorTrack};

use super::source::{Format, OpenError, Origin, Source};
use super::{Note, bvh, csv, disk, gltf};

/// What keeps inputs from being overwritten.
#[derive(Clone, Debug, Default)]
pub struct Guard {
    /// Files that the result was made from.
    pub inputs: Vec<PathBuf>,
    /// The user said that an input may be replaced.
    pub force: bool,
}

impl Guard {
    /// Guards one input.
    pub fn of(input: &Path) -> Self {
        Self { inputs: vec![input.to_owned()], force: false }
    }

    /// Fails when `target` is one of the inputs, by whatever path or link, and may not be replaced.
    ///
    /// # Errors
    /// [`WriteError::WouldReplaceInput`].
    pub fn check(&self, target: &Path) -> Result<(), WriteError> {
        let same = |input: &PathBuf| disk::is_same_file(input, target);
        if !self.force && self.inputs.iter().any(same) {
            return Err(WriteError::WouldReplaceInput { path: target.to_owned() });
        }
        Ok(())
    }
}

/// A result that could not be written.
#[derive(Debug, thiserror::Error)]
pub enum WriteError {
    /// The file itself.
    #[error(transparent)]
    Disk(#[from] disk::DiskError),
    /// No format of ours.
    #[error(transparent)]
    Format(#[from] OpenError),
    /// The target is an input.
    #[error("{path}: expected another file than the input, found the input itself; choose another name or say --force", path = path.display())]
    WouldReplaceInput {
        /// The target.
        path: PathBuf,
    },
    /// There is no clip to write.
    #[error("{path}: expected a clip to write, found none", path = path.display())]
    NoClip {
        /// The source.
        path: PathBuf,
    },
    /// A clip without joints for a format that is nothing without them.
    #[error(
        "{path}: skeleton: expected joints to write, found none, as the clip turns and moves none; only .gltf and .glb can hold it",
        path = path.display()
    )]
    NoJoints {
        /// The target.
        path: PathBuf,
    },
    /// The results do not belong to the source.
    #[error("{path}: expected a result for each of {expected} clips, found {found}", path = path.display())]
    Count {
        /// The source.
        path: PathBuf,
        /// Clips of the source.
        expected: usize,
        /// Results given.
        found: usize,
    },
    /// The glTF document can't take the result.
    #[error("{path}: {source}", path = path.display())]
    Gltf {
        /// The target.
        path: PathBuf,
        /// What and where.
        source: gltf::GltfError,
    },
}

/// A result as bytes, with the file that has to lie beside it.
#[derive(Clone, Debug)]
pub struct Encoded {
    /// The file itself.
    pub bytes: Vec<u8>,
    /// A buffer beside it: its file name and bytes.
    pub beside: Option<(String, Vec<u8>)>,
    /// Files beside the source that the result still refers to, relative to it.
    pub along: Vec<String>,
    /// What is worth telling: what the format could not hold, and how much it differs.
    pub notes: Vec<Note>,
}

impl Encoded {
    fn alone((bytes, notes): (Vec<u8>, Vec<Note>)) -> Self {
        Self { bytes, beside: None, along: Vec::new(), notes }
    }
}

impl From<gltf::Output> for Encoded {
    fn from(output: gltf::Output) -> Self {
        Self { bytes: output.bytes, beside: output.bin, along: output.external, notes: output.notes }
    }
}

/// What was written where.
#[derive(Clone, Debug)]
pub struct Written {
    /// The file.
    pub path: PathBuf,
    /// A buffer beside it.
    pub beside: Option<PathBuf>,
    /// What is worth telling.
    pub notes: Vec<Note>,
}

/// Writes results to `target`, whose extension gives the format. See [`encode`].
///
/// # Errors
/// When the target is an input and not to be replaced, the format is none of ours, or the system refuses.
pub fn write(
    source: &Source,
    results: &[Arc<Clip>],
    choice: Option<usize>,
    target: &Path,
    guard: &Guard,
) -> Result<Written, WriteError> {
    guard.check(target)?;
    let format = Format::of(target)?;
    let is_patched = matches!((&source.origin, format), (Origin::Csv(_), Format::Csv));
    if format == Format::Bvh || (format == Format::Csv && !is_patched) {
        // The text of a long clip is large, and goes out piece by piece.
        let clip = one_of(source, results, choice)?;
        check_joints(clip, target)?;
        let is_own = source.clips.first().is_some_and(|own| own.has_skeleton_of(clip));
        let rows = Rows::of(clip, format);
        let mut notes = disk::write_with(target, |out| match &source.origin {
            _ if format == Format::Csv => csv::from_clip_to(&rows.clip, out),
            Origin::Bvh(document) if is_own && has_same_joints(source, &rows.clip) => {
                bvh::write_to(document, &source.clips[0], &rows.clip, out)
            }
            _ => bvh::from_clip_to(&rows.clip, out),
        })?;
        notes.extend(rows.note);
        return Ok(Written { path: target.to_owned(), beside: None, notes });
    }
    let encoded = encode(source, results, choice, target)?;
    put(source, target, guard, encoded)
}

/// Puts a result on the disk, with what it refers to.
fn put(source: &Source, target: &Path, guard: &Guard, mut encoded: Encoded) -> Result<Written, WriteError> {
    take_along(source, target, &mut encoded);
    let beside = match &encoded.beside {
        Some((name, bytes)) => {
            let path = target.with_file_name(name);
            guard.check(&path)?;
            disk::write(&path, bytes)?;
            Some(path)
        }
        None => None,
    };
    disk::write(target, &encoded.bytes)?;
    Ok(Written { path: target.to_owned(), beside, notes: encoded.notes })
}

/// Writes a clip of the source's skeleton, made elsewhere, to `target`. See [`encode_onto`].
///
/// # Errors
/// As [`write()`].
pub fn write_onto(source: &Source, clip: &Clip, target: &Path, guard: &Guard) -> Result<Written, WriteError> {
    guard.check(target)?;
    let encoded = encode_onto(source, clip, target)?;
    put(source, target, guard, encoded)
}

/// The bytes that [`write_onto`] would write.
///
/// Into glTF the clip goes as one more animation; its name is the clip's, with a number behind it where that is taken, and everything else
/// stays. A BVH text keeps its hierarchy and channels and gets new rows, a CSV file its columns. Into another format a new file
/// is made.
///
/// # Errors
/// As [`write_onto`], but for the disk.
pub fn encode_onto(source: &Source, clip: &Clip, target: &Path) -> Result<Encoded, WriteError> {
    let format = Format::of(target)?;
    let stem = target.file_stem().map(|stem| stem.to_string_lossy().into_owned()).unwrap_or_default();
    match (&source.origin, format) {
        (Origin::Gltf(document), Format::Gltf | Format::Glb) => {
            let base = if clip.name.is_empty() { "retargeted" } else { &clip.name };
            let is_taken = |name: &str| source.clips.iter().any(|own| own.name == name);
            let numbered = (2..).map(|number| format!("{base} {number}"));
            let name = std::iter::once(base.to_owned()).chain(numbered).find(|name| !is_taken(name));
            let name = name.unwrap_or_default();
            let output = gltf::write_added(document, clip, &name, &stem, form(format))
                .map_err(|source| WriteError::Gltf { path: target.to_owned(), source })?;
            Ok(Encoded::from(output))
        }
        (Origin::Bvh(document), Format::Bvh) => {
            Ok(Encoded::alone(bvh::write(document, &source.clips[0], &whole(clip))))
        }
        (Origin::Csv(document), Format::Csv) if has_same_joints(source, clip) => {
            Ok(Encoded::alone(csv::write(document, &source.clips[0], &whole(clip))))
        }
        _ => new_file(clip, format, &stem, target),
    }
}

/// The clip with the rest pose said for every joint: formats with a column for each would keep other numbers there.
fn whole(clip: &Clip) -> Clip {
    let mut all = clip.clone();
    let once = || Times::Listed([0.0].into());
    for (tracks, joint) in all.joints.iter_mut().zip(clip.skeleton.joints()) {
        let own = Arc::make_mut(tracks);
        own.rotation.get_or_insert_with(|| RotationTrack::from_rotors(once(), [joint.rest.rotation]));
        own.translation.get_or_insert_with(|| VectorTrack::straight(once(), [joint.rest.translation]));
    }
    all
}

/// The bytes that [`write()`] would write.
///
/// `results` has one clip for each clip of the source. Within a format (glTF and GLB count as one) the source's own
/// file is patched: what did not change keeps its bytes or text; rows of other times are written anew under the file's own
/// head. Into another format a new file is made; where that holds one clip only, it is the one of index `choice`, else the
/// first.
///
/// # Errors
/// As [`write()`], but for the disk.
pub fn encode(
    source: &Source,
    results: &[Arc<Clip>],
    choice: Option<usize>,
    target: &Path,
) -> Result<Encoded, WriteError> {
    check_count(source, results)?;
    let format = Format::of(target)?;
    let stem = target.file_stem().map(|stem| stem.to_string_lossy().into_owned()).unwrap_or_default();
    let gltf_error = |source| WriteError::Gltf { path: target.to_owned(), source };
    // A result on another skeleton has no place in the file of its source.
    let is_own = source.clips.iter().zip(results).all(|(own, result)| own.has_skeleton_of(result));
    match (&source.origin, format) {
        (Origin::Gltf(document), Format::Gltf | Format::Glb) if is_own => {
            let pairs: Vec<(usize, &Clip, &Clip)> =
                source.clips.iter().zip(results).enumerate().map(|(i, (a, b))| (i, &**a, &**b)).collect();
            let output = gltf::write_as(document, &pairs, &stem, form(format)).map_err(gltf_error)?;
            Ok(Encoded::from(output))
        }
        (Origin::Bvh(document), Format::Bvh) if is_own && has_same_joints(source, &results[0]) => {
            let rows = Rows::of(&results[0], format);
            let encoded = Encoded::alone(bvh::write(document, &source.clips[0], &rows.clip));
            Ok(rows.tell(encoded))
        }
        (Origin::Csv(document), Format::Csv) if is_own && has_same_joints(source, &results[0]) => {
            let rows = Rows::of(&results[0], format);
            let encoded = Encoded::alone(csv::write(document, &source.clips[0], &rows.clip));
            Ok(rows.tell(encoded))
        }
        _ => new_file(one_of(source, results, choice)?, format, &stem, target),
    }
}

fn check_count(source: &Source, results: &[Arc<Clip>]) -> Result<(), WriteError> {
    let (expected, found) = (source.clips.len(), results.len());
    if expected == found {
        return Ok(());
    }
    Err(WriteError::Count { path: source.path.clone(), expected, found })
}

/// A BVH text begins with a joint, and a table of none has nothing but times.
fn check_joints(clip: &Clip, target: &Path) -> Result<(), WriteError> {
    let has_any = clip.skeleton.listed().next().is_some();
    has_any.then_some(()).ok_or_else(|| WriteError::NoJoints { path: target.to_owned() })
}

/// The clip of a file that holds one only.
fn one_of<'r>(
    source: &Source,
    results: &'r [Arc<Clip>],
    choice: Option<usize>,
) -> Result<&'r Arc<Clip>, WriteError> {
    check_count(source, results)?;
    results.get(choice.unwrap_or(0)).ok_or_else(|| WriteError::NoClip { path: source.path.clone() })
}

/// A clip for a format of rows, in which from row to row the short way is meant.
struct Rows<'a> {
    clip: Cow<'a, Clip>,
    note: Option<Note>,
}

impl<'a> Rows<'a> {
    /// With rows put between where a meant turn needs them: in CSV there alone, in BVH at a multiple of the rate.
    fn of(clip: &'a Clip, format: Format) -> Self {
        let Some(steps) = clip::with_short_steps(clip, format == Format::Bvh) else {
            return Self { clip: Cow::Borrowed(clip), note: None };
        };
        let (joint, step_rad) = steps.longest;
        let text = format!(
            "expected at most 120 degrees from row to row, found a meant turn of {:.0}: written as {} rows in place of {}",
            step_rad.to_degrees(),
            steps.frames[1],
            steps.frames[0]
        );
        let note = Note::new(format!("joint {}", clip.skeleton.label(joint)), text);
        Self { clip: Cow::Owned(steps.clip), note: Some(note) }
    }

    fn tell(self, mut encoded: Encoded) -> Encoded {
        encoded.notes.extend(self.note);
        encoded
    }
}

/// Copies what the result still refers to into the target's folder, where it is another one and does not have it yet:
/// a figure should not lose its pictures for having been mended.
fn take_along(source: &Source, target: &Path, encoded: &mut Encoded) {
    for relative in &encoded.along {
        let (from, to) = (source.path.with_file_name(relative), target.with_file_name(relative));
        if to.exists() {
            continue;
        }
        let text = match disk::read(&from).and_then(|bytes| disk::write(&to, &bytes)) {
            Ok(()) => "the file refers to it, so it was copied along".to_owned(),
            Err(error) => format!("the file refers to it, expected to copy it along, found: {error}"),
        };
        encoded.notes.push(Note::new(relative.as_str(), text));
    }
}

fn form(format: Format) -> gltf::Form {
    if format == Format::Glb { gltf::Form::Glb } else { gltf::Form::Text }
}

/// A new file of one clip.
fn new_file(clip: &Clip, format: Format, stem: &str, target: &Path) -> Result<Encoded, WriteError> {
    match format {
        Format::Bvh | Format::Csv => {
            check_joints(clip, target)?;
            let rows = Rows::of(clip, format);
            let made =
                if format == Format::Bvh { bvh::from_clip(&rows.clip) } else { csv::from_clip(&rows.clip) };
            Ok(rows.tell(Encoded::alone(made)))
        }
        Format::Gltf | Format::Glb => {
            let failed = |source| WriteError::Gltf { path: target.to_owned(), source };
            let glb = gltf::from_clip(clip, stem).map_err(failed)?;
            if format == Format::Glb {
                return Ok(Encoded::from(glb));
            }
            let (document, _, _) =
                gltf::read(glb.bytes, stem, &|_| Err("nothing lies beside it".to_owned())).map_err(failed)?;
            let text = gltf::write_as(&document, &[], stem, gltf::Form::Text).map_err(failed)?;
            Ok(Encoded { notes: [glb.notes, text.notes.clone()].concat(), ..Encoded::from(text) })
        }
    }
}

/// Whether a result has the joints of its source's only clip, so that the file's own layout can hold it.
fn has_same_joints(source: &Source, result: &Clip) -> bool {
    source.clips.first().is_some_and(|clip| clip.joints.len() == result.joints.len())
}
