//! A file as opened: its clips, and what is needed to give it back with nothing lost.

use std::fmt;
use std::io;
use std::path::{Path, PathBuf};
use std::sync::{Arc, OnceLock};

use crate::clip::Clip;
use crate::scene::Reading;
use crate::skeleton::{RestChoice, Skeleton};

use super::{Note, bvh, csv, disk, gltf};

/// A clip format, told by the file's extension.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Format {
    /// glTF 2.0 as JSON text with its buffers beside it or inside.
    Gltf,
    /// glTF 2.0 in one binary file.
    Glb,
    /// BVH text.
    Bvh,
    /// Comma-separated values.
    Csv,
}

impl Format {
    /// All formats.
    pub const ALL: [Self; 4] = [Self::Gltf, Self::Glb, Self::Bvh, Self::Csv];

    /// The file extension, lower case, without a dot.
    pub const fn extension(self) -> &'static str {
        match self {
            Self::Gltf => "gltf",
            Self::Glb => "glb",
            Self::Bvh => "bvh",
            Self::Csv => "csv",
        }
    }

    /// By the extension of a file's name, in any case.
    ///
    /// # Errors
    /// When it is none of ours.
    pub fn of(path: &Path) -> Result<Self, OpenError> {
        let found = path.extension().map(|extension| extension.to_string_lossy().to_lowercase());
        let found = found.unwrap_or_default();
        Self::ALL.into_iter().find(|format| format.extension() == found).ok_or_else(|| OpenError::Extension {
            path: path.to_owned(),
            found: if found.is_empty() { "none".to_owned() } else { format!(".{found}") },
        })
    }

    /// By the first bytes, where these are surely of one format: told to whoever has given a file a wrong name.
    fn told_by(bytes: &[u8]) -> Option<Self> {
        if bytes.starts_with(b"glTF") {
            return Some(Self::Glb);
        }
        let text = bytes.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(bytes).trim_ascii_start();
        let words = |first: &[u8], second: &[u8]| {
            let rest = text.get(first.len()..).unwrap_or_default().trim_ascii_start();
            let begins = |text: &[u8], word: &[u8]| {
                text.get(..word.len()).is_some_and(|own| own.eq_ignore_ascii_case(word))
            };
            begins(text, first) && begins(rest, second)
        };
        if words(b"HIERARCHY", b"ROOT") {
            Some(Self::Bvh)
        } else if words(b"{", b"\"") {
            Some(Self::Gltf)
        } else {
            None
        }
    }

    /// Whether `self` and `other` are read alike: a `.gltf` may be a GLB and the other way round.
    const fn is_kin_of(self, other: Self) -> bool {
        self.holds_many() == other.holds_many() && (self.holds_many() || self as u8 == other as u8)
    }

    /// Whether a file of this format may hold several clips.
    pub const fn holds_many(self) -> bool {
        matches!(self, Self::Gltf | Self::Glb)
    }
}

impl fmt::Display for Format {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            Self::Gltf => "glTF",
            Self::Glb => "GLB",
            Self::Bvh => "BVH",
            Self::Csv => "CSV",
        })
    }
}

/// What a person may have to say about a file that does not say it itself.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct OpenOptions {
    /// Headers and time unit of a CSV file of another make.
    pub csv: csv::CsvOptions,
    /// The pose that turns are measured from; by rule where nothing is said (see [`Source::rest`]).
    pub rest: Option<RestChoice>,
}

impl OpenOptions {
    /// What a scene remembers of them.
    pub fn reading(&self) -> Reading {
        Reading {
            columns: self.csv.columns.as_ref().map(ToString::to_string),
            time_unit: self.csv.time_unit.map(|unit| unit.name().to_owned()),
            skeleton: self.csv.skeleton.clone(),
            rest: self.rest,
        }
    }

    /// Those that a scene remembers, and `self` where it remembers nothing. What can't be understood counts as nothing.
    #[must_use]
    pub fn or_as_remembered(&self, reading: &Reading) -> Self {
        let columns = reading.columns.as_deref().and_then(|text| text.parse().ok());
        let time_unit = reading.time_unit.as_deref().and_then(|text| text.parse().ok());
        Self {
            csv: csv::CsvOptions {
                columns: self.csv.columns.clone().or(columns),
                time_unit: self.csv.time_unit.or(time_unit),
                hierarchy: self.csv.hierarchy.clone(),
                skeleton: self.csv.skeleton.clone().or_else(|| reading.skeleton.clone()),
            },
            rest: self.rest.or(reading.rest),
        }
    }
}

/// A clip file that could not be opened.
#[derive(Debug, thiserror::Error)]
pub enum OpenError {
    /// The file itself.
    #[error(transparent)]
    Disk(#[from] disk::DiskError),
    /// No format of ours.
    #[error("{path}: extension: expected .gltf, .glb, .bvh, .csv or .ron, found {found}; rename or convert the file", path = path.display())]
    Extension {
        /// The file.
        path: PathBuf,
        /// Its extension.
        found: String,
    },
    /// The content is of another format than the name says.
    #[error("{path}: content: expected {expected}, as the name says, found {found}; rename it to end in .{}", .found.extension(), path = path.display())]
    Content {
        /// The file.
        path: PathBuf,
        /// The format of its name.
        expected: Format,
        /// The format of its first bytes.
        found: Format,
    },
    /// A file without joints where a skeleton was looked for.
    #[error("{path}: skeleton: expected a clip or table with joints, found none; name another file", path = .0.display())]
    NoSkeleton(PathBuf),
    /// A rest pose that the file does not have.
    #[error("{path}: rest pose: expected {known}, found {choice}; choose one of those", path = path.display())]
    Rest {
        /// The file.
        path: PathBuf,
        /// Those that it has.
        known: String,
        /// What was asked for.
        choice: RestChoice,
    },
    /// A BVH file that can't be read.
    #[error("{path}: {source}", path = path.display())]
    Bvh {
        /// The file.
        path: PathBuf,
        /// What and where.
        source: bvh::BvhError,
    },
    /// A CSV file that can't be read.
    #[error("{path}: {source}", path = path.display())]
    Csv {
        /// The file.
        path: PathBuf,
        /// What and where.
        source: csv::CsvError,
    },
    /// A glTF file that can't be read.
    #[error("{path}: {source}", path = path.display())]
    Gltf {
        /// The file.
        path: PathBuf,
        /// What and where.
        source: gltf::GltfError,
    },
}

/// A file as opened. Never changed.
#[derive(Clone, Debug)]
pub struct Source {
    /// Where it came from.
    pub path: PathBuf,
    /// Its format.
    pub format: Format,
    /// Its clips, in the file's order; a glTF file may have none.
    pub clips: Vec<Arc<Clip>>,
    /// What was odd.
    pub notes: Vec<Note>,
    /// The rest poses that it has.
    pub rests: Vec<RestChoice>,
    /// The one that its clips' skeletons are measured from. By rule the bind pose where a skin has inverse bind matrices,
    /// else the joints as the file has them.
    pub rest: RestChoice,
    /// What was said of how to read it.
    pub reading: Reading,
    /// What is needed to give it back.
    pub(super) origin: Origin,
    /// Its hash, once somebody asked.
    sha256: OnceLock<String>,
}

/// The file in its own format.
#[derive(Clone, Debug)]
pub(super) enum Origin {
    Gltf(Arc<gltf::Document>),
    Bvh(Arc<bvh::Document>),
    Csv(Arc<csv::Document>),
}

impl Source {
    /// SHA-256 of the file's bytes in hexadecimal. Computed when it is first asked for, which takes a while for a large file.
    pub fn sha256(&self) -> &str {
        self.sha256.get_or_init(|| disk::hash(self.bytes()))
    }

    /// The file's bytes as they were read.
    pub fn bytes(&self) -> &[u8] {
        match &self.origin {
            Origin::Gltf(document) => document.bytes(),
            Origin::Bvh(document) => document.bytes(),
            Origin::Csv(document) => document.bytes(),
        }
    }

    /// The rest pose that a source has where nobody chose one.
    pub fn usual_rest(&self) -> RestChoice {
        self.rests.first().copied().unwrap_or_default()
    }

    /// The same source, its clips' skeletons measured from another pose, or from the usual one by rule. `None` where it does
    /// not have that.
    #[must_use]
    pub fn with_rest(&self, asked: Option<RestChoice>) -> Option<Self> {
        let choice = asked.unwrap_or_else(|| self.usual_rest());
        if !self.rests.contains(&choice) {
            return None;
        }
        let bind = match &self.origin {
            Origin::Gltf(document) => document.bind_pose(),
            Origin::Bvh(_) | Origin::Csv(_) => None,
        };
        // Most clips of a file share one skeleton, and go on doing so.
        let mut shared: Option<(Arc<Skeleton>, Arc<Skeleton>)> = None;
        let clips = self.clips.iter().map(|clip| {
            let old = &clip.skeleton;
            let skeleton = match (choice, &shared) {
                (RestChoice::FirstFrame, _) => Arc::new(old.with_rest(choice, clip.local_at(0.0))),
                (_, Some((known, new))) if Arc::ptr_eq(known, old) => Arc::clone(new),
                _ => {
                    let pose = match (choice, bind) {
                        (RestChoice::Bind, Some(bind)) => bind.clone(),
                        _ => old.rest_pose(),
                    };
                    let new = Arc::new(match asked {
                        Some(choice) => old.with_rest(choice, pose),
                        None => old.with_rest_by_rule(choice, pose),
                    });
                    shared = Some((Arc::clone(old), Arc::clone(&new)));
                    new
                }
            };
            Arc::new(Clip { skeleton, ..(**clip).clone() })
        });
        let reading = Reading { rest: asked, ..self.reading.clone() };
        Some(Self { clips: clips.collect(), rest: choice, reading, ..self.clone() })
    }

    /// The skeleton of its first clip; a glTF file has one also without a clip.
    pub fn skeleton(&self) -> Option<Arc<Skeleton>> {
        let own = self.clips.first().map(|clip| clip.skeleton.clone());
        own.or_else(|| match &self.origin {
            Origin::Gltf(document) => Some(document.skeleton().clone()).filter(|own| !own.is_empty()),
            Origin::Bvh(_) | Origin::Csv(_) => None,
        })
    }

    /// Whether its skeleton can be taken from another file: it is a table that brings none along.
    pub fn takes_skeleton(&self) -> bool {
        matches!(&self.origin, Origin::Csv(document) if !document.has_skeleton())
    }

    /// What a clip is called in lists: its name, or `#INDEX` where it has none.
    pub fn clip_label(&self, index: usize) -> String {
        match self.clips.get(index).map(|clip| clip.name.as_str()) {
            None | Some("") => format!("#{index}"),
            Some(name) => name.to_owned(),
        }
    }

    /// The clip of that name, else of that index.
    pub fn find_clip(&self, text: &str) -> Option<usize> {
        let index =
            || text.trim_start_matches('#').parse().ok().filter(|&index: &usize| index < self.clips.len());
        self.clips.iter().position(|clip| clip.name == text).or_else(index)
    }
}

/// Opens a clip file.
///
/// # Errors
/// When it can't be read, has none of our extensions, or is not what its extension says.
pub fn open(path: &Path, options: &OpenOptions) -> Result<Source, OpenError> {
    // Told first: a wrong name is the likelier slip, and a large wrong file need not be read for it.
    Format::of(path)?;
    open_bytes(path, disk::read(path)?, options)
}

/// Opens a clip from bytes that are already here. `path` gives the format, the clip's name, and the folder in which
/// companions (glTF buffers, a CSV skeleton) are looked for.
///
/// # Errors
/// As [`open`].
pub fn open_bytes(path: &Path, bytes: Vec<u8>, options: &OpenOptions) -> Result<Source, OpenError> {
    let format = Format::of(path)?;
    if let Some(found) = Format::told_by(&bytes).filter(|found| !found.is_kin_of(format)) {
        return Err(OpenError::Content { path: path.to_owned(), expected: format, found });
    }
    let name = path.file_stem().map(|stem| stem.to_string_lossy().into_owned()).unwrap_or_default();
    let at = || path.to_owned();
    let (origin, clips, notes) = match format {
        Format::Gltf | Format::Glb => {
            let folder = path.parent().unwrap_or(Path::new(""));
            let fetch = |relative: &str| {
                disk::read(&folder.join(relative)).map_err(|error| match error {
                    disk::DiskError::Io { source, .. } if source.kind() == io::ErrorKind::NotFound => {
                        "it does not lie there; put it beside the document".to_owned()
                    }
                    error => error.to_string(),
                })
            };
            let (document, clips, notes) =
                gltf::read(bytes, &name, &fetch).map_err(|source| OpenError::Gltf { path: at(), source })?;
            (Origin::Gltf(Arc::new(document)), clips, notes)
        }
        Format::Bvh => {
            let (document, clip, notes) =
                bvh::read(bytes, &name).map_err(|source| OpenError::Bvh { path: at(), source })?;
            (Origin::Bvh(Arc::new(document)), vec![clip], notes)
        }
        Format::Csv => {
            let hierarchy = match (&options.csv.hierarchy, &options.csv.skeleton) {
                (Some(given), _) => Some(given.clone()),
                _ if csv::has_skeleton(&bytes) => None,
                (None, Some(named)) => Some(bones_in(named)?),
                (None, None) => companion_skeleton(path),
            };
            let csv_options = csv::CsvOptions { hierarchy, ..options.csv.clone() };
            let (document, clip, notes) = csv::read(bytes, &name, &csv_options)
                .map_err(|source| OpenError::Csv { path: at(), source })?;
            (Origin::Csv(Arc::new(document)), vec![clip], notes)
        }
    };
    let has_bind = matches!(&origin, Origin::Gltf(document) if document.bind_pose().is_some());
    let mut rests = vec![RestChoice::Defaults, RestChoice::FirstFrame];
    if has_bind {
        rests.insert(0, RestChoice::Bind);
    }
    let source = Source {
        path: at(),
        format,
        clips: clips.into_iter().map(Arc::new).collect(),
        notes,
        rests,
        rest: RestChoice::Defaults,
        reading: options.reading(),
        origin,
        sha256: OnceLock::new(),
    };
    let choice = options.rest.unwrap_or_else(|| source.usual_rest());
    if choice == RestChoice::Defaults {
        return Ok(source);
    }
    source.with_rest(options.rest).ok_or_else(|| {
        let known: Vec<&str> = source.rests.iter().map(|rest| rest.name()).collect();
        OpenError::Rest { path: at(), known: known.join(" or "), choice }
    })
}

/// The skeleton in a file: that of a clip, or a table of joints.
fn bones_in(path: &Path) -> Result<Vec<csv::Bone>, OpenError> {
    if Format::of(path)? == Format::Csv
        && let Ok(bones) = csv::hierarchy(&disk::read(path)?)
    {
        return Ok(bones);
    }
    let source = open(path, &OpenOptions::default())?;
    let skeleton = source.skeleton().filter(|skeleton| !skeleton.is_empty());
    skeleton.map(|skeleton| csv::bones_of(&skeleton)).ok_or_else(|| OpenError::NoSkeleton(path.to_owned()))
}

/// The skeleton of `NAME.csv` or `NAME_rot.csv` from a `NAME_hierarchy.csv` beside it. One that can't be read is no companion.
fn companion_skeleton(path: &Path) -> Option<Vec<csv::Bone>> {
    let stem = path.file_stem()?.to_str()?;
    let beside = |stem: &str| {
        let bytes = disk::read(&path.with_file_name(format!("{stem}_hierarchy.csv"))).ok()?;
        csv::hierarchy(&bytes).ok()
    };
    beside(stem).or_else(|| beside(stem.strip_suffix("_rot")?))
}
