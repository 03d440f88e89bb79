//! Buffers and buffer views: only those that animation needs are opened.

#![deny(clippy::arithmetic_side_effects, clippy::indexing_slicing)]

use std::fmt;
use std::ops::Range;

use super::error::{GltfError, GltfErrorKind};
use super::json::At;
use super::uri::{self, Uri};

/// Extensions that store buffer views compressed.
const COMPRESSIONS: [&str; 2] = ["EXT_meshopt_compression", "KHR_meshopt_compression"];

/// Gives the bytes of a file beside the document, by its checked relative path.
pub(super) type Fetch<'a> = &'a dyn Fn(&str) -> Result<Vec<u8>, String>;

/// The bytes of a buffer, and where they are from.
#[derive(Clone, PartialEq, Eq)]
pub(super) enum Loaded {
    /// In the binary chunk: a range of the file.
    Chunk(Range<usize>),
    /// In the URI itself.
    Data(Vec<u8>),
    /// In a file beside the document.
    File {
        /// Its relative path.
        path: String,
        /// Its content.
        bytes: Vec<u8>,
    },
}

impl Loaded {
    /// The bytes.
    pub(super) fn bytes<'a>(&'a self, file: &'a [u8]) -> &'a [u8] {
        match self {
            Self::Chunk(range) => file.get(range.clone()).unwrap_or_default(),
            Self::Data(bytes) | Self::File { bytes, .. } => bytes,
        }
    }
}

impl fmt::Debug for Loaded {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Chunk(range) => write!(f, "Chunk({range:?})"),
            Self::Data(bytes) => write!(f, "Data({} bytes)", bytes.len()),
            Self::File { path, bytes } => write!(f, "File({path}, {} bytes)", bytes.len()),
        }
    }
}

/// The buffers of a document, opened as they are asked for.
pub(super) struct Buffers<'a> {
    root: At<'a>,
    file: &'a [u8],
    chunk: Option<Range<usize>>,
    fetch: Fetch<'a>,
    loaded: Vec<Option<Loaded>>,
    /// Bytes that were opened outside the file itself.
    pub opened_bytes: usize,
}

impl<'a> Buffers<'a> {
    /// None of them opened yet. `chunk` is where the binary chunk lies in `file`.
    pub(super) fn new(root: At<'a>, file: &'a [u8], chunk: Option<Range<usize>>, fetch: Fetch<'a>) -> Self {
        let loaded = vec![None; root.count("buffers")];
        Self { root, file, chunk, fetch, loaded, opened_bytes: 0 }
    }

    /// All that was opened.
    pub(super) fn into_loaded(self) -> Vec<Option<Loaded>> {
        self.loaded
    }

    /// The bytes of a buffer view, and its stride where it states one.
    pub(super) fn view(&mut self, index: usize) -> Result<(&[u8], Option<usize>), GltfError> {
        let view = self.root.element("bufferViews", index)?;
        if let Some(name) = COMPRESSIONS.iter().find(|name| self.is_compressed(&view, name)) {
            return Err(GltfError { place: view.path, kind: GltfErrorKind::Compressed((*name).to_owned()) });
        }
        let buffer = view.needed_index("buffer", "buffers", &self.root)?;
        let start = view.whole("byteOffset")?.unwrap_or(0);
        let length = view.needed_whole("byteLength")?;
        let stride = view.whole("byteStride")?;
        let bytes = self.buffer(buffer)?;
        let end = start.saturating_add(length);
        match bytes.get(start..end) {
            Some(part) => Ok((part, stride)),
            None => Err(GltfError::unlike(
                view.path,
                format!("a part of buffers[{buffer}], which has {} bytes", bytes.len()),
                format!("bytes {start} to {end}"),
            )),
        }
    }

    /// A compressed view has no plain bytes when the file can't be read without the extension.
    fn is_compressed(&self, view: &At<'_>, name: &str) -> bool {
        view.get("extensions").is_some_and(|extensions| extensions.get(name).is_some())
            && self.root.texts("extensionsRequired").any(|required| required == name)
    }

    /// The bytes of a buffer, as many as its `byteLength` says.
    fn buffer(&mut self, index: usize) -> Result<&[u8], GltfError> {
        let buffer = self.root.element("buffers", index)?;
        let length = buffer.needed_whole("byteLength")?;
        if !matches!(self.loaded.get(index), Some(Some(_))) {
            let opened = self.open(index, &buffer)?;
            if let Some(slot) = self.loaded.get_mut(index) {
                *slot = Some(opened);
            }
        }
        let bytes = match self.loaded.get(index) {
            Some(Some(loaded)) => loaded.bytes(self.file),
            _ => &[],
        };
        bytes.get(..length).ok_or_else(|| {
            let found = format!("{} bytes", bytes.len());
            GltfError::unlike(buffer.path, format!("{length} bytes as its byteLength says"), found)
        })
    }

    fn open(&mut self, index: usize, buffer: &At<'_>) -> Result<Loaded, GltfError> {
        let Some(text) = buffer.text("uri")? else {
            return match &self.chunk {
                Some(chunk) if index == 0 => Ok(Loaded::Chunk(chunk.clone())),
                _ => Err(buffer.missing("uri", "a uri, or to be the first buffer of a GLB with a BIN chunk")),
            };
        };
        let opened = match uri::parse(text, &buffer.path_of("uri"))? {
            Uri::Data(bytes) => Loaded::Data(bytes),
            Uri::File(path) => match (self.fetch)(&path) {
                Ok(bytes) => Loaded::File { path, bytes },
                Err(reason) => {
                    let kind = GltfErrorKind::File { path, reason };
                    return Err(GltfError { place: buffer.path_of("uri"), kind });
                }
            },
        };
        self.opened_bytes = self.opened_bytes.saturating_add(opened.bytes(self.file).len());
        Ok(opened)
    }
}
