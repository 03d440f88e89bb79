//! The outermost layer: JSON text, or a GLB of chunks (glTF 2.0, section 4).

#![deny(clippy::arithmetic_side_effects, clippy::indexing_slicing)]

use std::ops::Range;

use super::error::GltfError;

/// `glTF`, little-endian.
const MAGIC: &[u8] = b"glTF";
/// The chunk type `JSON`.
pub(super) const JSON: u32 = 0x4E4F_534A;
/// The chunk type `BIN`.
pub(super) const BIN: u32 = 0x004E_4942;
const UTF8_BOM: &[u8] = b"\xEF\xBB\xBF";

/// Where the parts of a file lie in its bytes.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Container {
    /// A `.gltf`: JSON text.
    Text(Range<usize>),
    /// A `.glb`: its chunks in order, the first of them JSON.
    Glb(Vec<Chunk>),
}

/// One chunk of a GLB.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Chunk {
    /// [`JSON`], [`BIN`] or something unknown.
    pub kind: u32,
    /// Its data, padding included, without its header.
    pub data: Range<usize>,
}

impl Container {
    /// Splits `bytes`. `name` only decides what a file that is neither is taken for. Gives also how many bytes follow
    /// the end that the header names.
    pub(super) fn split(bytes: &[u8], name: &str) -> Result<(Self, usize), GltfError> {
        if bytes.starts_with(MAGIC) {
            return split_glb(bytes);
        }
        let start = if bytes.starts_with(UTF8_BOM) { UTF8_BOM.len() } else { 0 };
        let text = bytes.get(start..).unwrap_or_default();
        if text.iter().find(|byte| !byte.is_ascii_whitespace()) == Some(&b'{') {
            return Ok((Self::Text(start..bytes.len()), 0));
        }
        let found = match bytes.get(..bytes.len().min(4)) {
            None | Some([]) => "an empty file".to_owned(),
            Some(head) => format!("the bytes {head:02x?}"),
        };
        let is_glb = name.to_ascii_lowercase().ends_with(".glb");
        Err(if is_glb {
            GltfError::unlike("GLB header", "the magic bytes `glTF`", found)
        } else {
            GltfError::unlike("document", "glTF JSON or a GLB header", found)
        })
    }

    /// Where the JSON text lies.
    pub(super) fn json(&self) -> Range<usize> {
        match self {
            Self::Text(range) => range.clone(),
            Self::Glb(chunks) => chunks.first().map(|chunk| chunk.data.clone()).unwrap_or_default(),
        }
    }

    /// Where the binary chunk lies.
    pub(super) fn bin(&self) -> Option<Range<usize>> {
        match self {
            Self::Text(_) => None,
            Self::Glb(chunks) => {
                chunks.iter().find(|chunk| chunk.kind == BIN).map(|chunk| chunk.data.clone())
            }
        }
    }
}

fn split_glb(bytes: &[u8]) -> Result<(Container, usize), GltfError> {
    let header = "GLB header";
    let (Some(version), Some(length)) = (word(bytes, 4), word(bytes, 8)) else {
        return Err(GltfError::unlike(header, "12 bytes", format!("{} bytes", bytes.len())));
    };
    if version != 2 {
        return Err(GltfError::unlike(header, "version 2", format!("version {version}")));
    }
    let length = length as usize;
    let Some(extra) = bytes.len().checked_sub(length) else {
        let found = format!("a file of {} bytes", bytes.len());
        return Err(GltfError::unlike(header, format!("{length} bytes as its length says"), found));
    };
    let mut chunks = Vec::new();
    let mut at = 12_usize;
    while at < length {
        let place = || format!("GLB chunk {}", chunks.len());
        let left = length.saturating_sub(at);
        let header = bytes.get(at..length).unwrap_or_default();
        let (Some(size), Some(kind)) = (word(header, 0), word(header, 4)) else {
            return Err(GltfError::unlike(place(), "a chunk header of 8 bytes", format!("{left} bytes")));
        };
        let data_start = at.saturating_add(8);
        let data_end = data_start.saturating_add(size as usize);
        if data_end > length {
            let found = format!("{} bytes left", left.saturating_sub(8));
            return Err(GltfError::unlike(place(), format!("{size} bytes as its header says"), found));
        }
        if chunks.is_empty() && kind != JSON {
            return Err(GltfError::unlike(
                place(),
                "the JSON chunk",
                format!("a chunk of type {kind:#010x}"),
            ));
        }
        chunks.push(Chunk { kind, data: data_start..data_end });
        at = data_end;
    }
    if chunks.is_empty() {
        return Err(GltfError::unlike("GLB chunk 0", "the JSON chunk", "the end of the file"));
    }
    Ok((Container::Glb(chunks), extra))
}

fn word(bytes: &[u8], at: usize) -> Option<u32> {
    let four = bytes.get(at..at.checked_add(4)?)?;
    Some(u32::from_le_bytes(four.try_into().ok()?))
}

/// A GLB of chunks, kind and data, each already padded.
pub(super) fn assemble(chunks: &[(u32, Vec<u8>)]) -> Result<Vec<u8>, GltfError> {
    let length =
        chunks.iter().fold(12_usize, |sum, (_, data)| sum.saturating_add(data.len()).saturating_add(8));
    let Ok(length_field) = u32::try_from(length) else {
        return Err(GltfError::unlike("GLB header", "at most 4294967295 bytes", format!("{length} bytes")));
    };
    let mut bytes = Vec::with_capacity(length);
    bytes.extend_from_slice(b"glTF");
    bytes.extend_from_slice(&2_u32.to_le_bytes());
    bytes.extend_from_slice(&length_field.to_le_bytes());
    for (kind, data) in chunks {
        // No chunk is longer than the whole, which fits.
        bytes.extend_from_slice(&(data.len() as u32).to_le_bytes());
        bytes.extend_from_slice(&kind.to_le_bytes());
        bytes.extend_from_slice(data);
    }
    Ok(bytes)
}
