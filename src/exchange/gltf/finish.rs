//! The last step of writing: where new data goes, and the file around it.

use std::borrow::Cow;

use serde_json::{Value, json};

use crate::exchange::Note;

use super::buffers::Loaded;
use super::container::{self, Chunk, Container};
use super::document::{Document, Form, external_files};
use super::error::GltfError;
use super::json::{self, At};
use super::uri::{self, Uri};
use super::write::{Output, Writer, texts};

impl<'a> Writer<'a> {
    /// The file, with everything that was collected.
    pub(super) fn finish(mut self, stem: &str, form: Form) -> Result<Output, GltfError> {
        let document = self.document;
        if self.data.is_empty() && form == document.form() {
            let external = document.external_files();
            return Ok(Output { bytes: document.original.clone(), bin: None, external, notes: self.notes });
        }
        if self.n_from_integers > 0 {
            let text = format!(
                "{} sampler(s) of normalised integers changed and are written as floats",
                self.n_from_integers
            );
            self.notes.push(Note::new("animations", text));
        }
        if form == Form::Glb && self.needs_packing() {
            return self.finish_packed();
        }
        let n_buffers = At::root(&document.root).count("buffers");
        let home = self.home(form, n_buffers);
        let mut grown = padded(&home.old, 0);
        let start = grown.len();
        grown.append(&mut self.data);
        let new_uri = match home.keep {
            Keep::Chunk => None,
            Keep::DataUri => Some(uri::write_data(&grown)),
            Keep::File => Some(uri::write_file(&self.free_name(stem, home.index))),
        };
        if home.index < n_buffers || !grown.is_empty() {
            self.set_buffer(&home, n_buffers, grown.len(), new_uri.as_deref());
        }
        let views: Vec<Value> = self
            .views
            .iter()
            .map(|[at, length]| json!({ "buffer": home.index, "byteOffset": start + at, "byteLength": length }))
            .collect();
        let bin_name = matches!(home.keep, Keep::File).then(|| self.free_name(stem, home.index));
        self.patch.extend(&self.patch.root(), "bufferViews", &texts(&views));
        self.patch.extend(&self.patch.root(), "accessors", &texts(&self.accessors));
        let text = self.patch.finish();
        // What a moved buffer referred to may now be referred to by nobody.
        let patched = json::parse(text.as_bytes()).unwrap_or_default();
        let mut external = external_files(&patched);
        external.retain(|file| Some(file) != bin_name.as_ref());
        let (bytes, bin) = match form {
            Form::Text => {
                if let Container::Glb(chunks) = &document.container
                    && chunks.len() > 2
                {
                    let text = format!(
                        "{} unknown chunk(s) have no place in a .gltf and are left out",
                        chunks.len() - 2
                    );
                    self.notes.push(Note::new("GLB chunk 2", text));
                }
                (text.into_bytes(), bin_name.map(|name| (name, grown)))
            }
            Form::Glb => {
                let new_bin = (matches!(home.keep, Keep::Chunk) && !grown.is_empty()).then_some(grown);
                (rebuild_glb(document, &text, new_bin)?, None)
            }
        };
        Ok(Output { bytes, bin, external, notes: self.notes })
    }

    /// Puts the length and place of the grown buffer into the document.
    fn set_buffer(&mut self, home: &Home<'_>, n_buffers: usize, length: usize, uri: Option<&str>) {
        let buffers = self.patch.elements_of(&self.patch.root(), "buffers");
        if let Some(at) = buffers.get(home.index) {
            self.patch.set(at, "byteLength", &length.to_string());
            if let Some(uri) = uri {
                self.patch.set(at, "uri", &Value::from(uri).to_string());
            }
            return;
        }
        debug_assert_eq!(home.index, n_buffers, "a new buffer comes last");
        let mut buffer = json!({ "byteLength": length });
        if let Some(uri) = uri {
            buffer["uri"] = uri.into();
        }
        self.patch.extend(&self.patch.root(), "buffers", &[buffer.to_string()]);
    }

    /// Where new data goes: behind the binary chunk of a GLB; in a text behind the data that changed.
    fn home(&self, form: Form, n_buffers: usize) -> Home<'a> {
        let document: &'a Document = self.document;
        let root = At::root(&document.root);
        let first_uri = root.element("buffers", 0).ok().and_then(|first| first.text("uri").ok().flatten());
        let chunk = document.container.bin().map(|range| Cow::Borrowed(&document.original[range]));
        let in_chunk = |old| Home { index: 0, old, keep: Keep::Chunk };
        let new = Home { index: n_buffers, old: Cow::Borrowed(&[]), keep: Keep::DataUri };
        if form == Form::Glb {
            let is_free = first_uri.is_none() && (n_buffers == 0 || document.form() == Form::Glb);
            return if is_free { in_chunk(chunk.unwrap_or_default()) } else { new };
        }
        if first_uri.is_none()
            && n_buffers > 0
            && let Some(old) = chunk
        {
            return Home { index: 0, old, keep: Keep::File };
        }
        let loaded = self.buffer.and_then(|index| Some((index, document.loaded.get(index)?.as_ref()?)));
        loaded.map_or(new, |(index, loaded)| Home {
            index,
            old: Cow::Borrowed(loaded.bytes(&document.original)),
            keep: if matches!(loaded, Loaded::File { .. }) { Keep::File } else { Keep::DataUri },
        })
    }

    /// Whether buffers have to move so that a GLB has its first one in the binary chunk.
    fn needs_packing(&self) -> bool {
        let root = At::root(&self.document.root);
        let has_uri = |buffer: &At<'_>| buffer.get("uri").is_some();
        // Views stored compressed name buffers where this code does not look for them.
        let is_plain = |view: &At<'_>| view.get("extensions").is_none();
        root.list("buffers").is_ok_and(|buffers| buffers.first().is_some_and(has_uri))
            && root.list("bufferViews").is_ok_and(|views| views.iter().all(is_plain))
    }

    /// A GLB in which all data that is at hand has moved into the binary chunk: buffers and images inside the document,
    /// and the buffers beside it that were read. Other files stay where they are.
    fn finish_packed(mut self) -> Result<Output, GltfError> {
        let document = self.document;
        let root = At::root(&document.root);
        let mut data: Vec<u8> = Vec::new();
        let mut kept: Vec<Value> = Vec::new();
        // For each old buffer the new one and how far its bytes have moved in it.
        let mut moved: Vec<(usize, usize)> = Vec::new();
        for (index, buffer) in root.list("buffers")?.iter().enumerate() {
            let bytes = match document.loaded.get(index) {
                Some(Some(loaded)) => Some(Cow::Borrowed(loaded.bytes(&document.original))),
                _ => buffer.text("uri")?.and_then(data_of).map(Cow::Owned),
            };
            if let Some(bytes) = bytes {
                moved.push((0, append(&mut data, &bytes)));
            } else {
                kept.push(buffer.value.clone());
                moved.push((kept.len(), 0));
            }
        }
        let mut views: Vec<Value> = Vec::new();
        for view in root.list("bufferViews")? {
            let (buffer, shift) = moved[view.needed_index("buffer", "buffers", &root)?];
            let start = view.whole("byteOffset")?.unwrap_or(0) + shift;
            let mut view = view.value.clone();
            view["buffer"] = buffer.into();
            if start > 0 {
                view["byteOffset"] = start.into();
            }
            views.push(view);
        }
        let start = append(&mut data, &self.data);
        for [at, length] in &self.views {
            views.push(json!({ "buffer": 0, "byteOffset": start + at, "byteLength": length }));
        }
        let mut images: Vec<Value> = Vec::new();
        let mut has_moved_images = false;
        for image in root.list("images")? {
            let mut value = image.value.clone();
            if let Some(text) = image.text("uri")?
                && let Some(bytes) = data_of(text)
                && let Some(members) = value.as_object_mut()
            {
                let kind = text[5..].split([';', ',']).next().unwrap_or_default();
                let start = append(&mut data, &bytes);
                members.shift_remove("uri");
                members.insert("mimeType".to_owned(), kind.into());
                members.insert("bufferView".to_owned(), views.len().into());
                views.push(json!({ "buffer": 0, "byteOffset": start, "byteLength": bytes.len() }));
                has_moved_images = true;
            }
            images.push(value);
        }
        if data.is_empty() {
            // Nothing is at hand that could move.
            let bytes = rebuild_glb(document, &self.patch.finish(), None)?;
            return Ok(Output { bytes, bin: None, external: document.external_files(), notes: self.notes });
        }
        let mut buffers = vec![json!({ "byteLength": data.len() })];
        buffers.append(&mut kept);
        self.patch.set(&self.patch.root(), "buffers", &Value::from(buffers).to_string());
        self.patch.set(&self.patch.root(), "bufferViews", &Value::from(views).to_string());
        if has_moved_images {
            self.patch.set(&self.patch.root(), "images", &Value::from(images).to_string());
        }
        self.patch.extend(&self.patch.root(), "accessors", &texts(&self.accessors));
        let text = self.patch.finish();
        let external = external_files(&json::parse(text.as_bytes()).unwrap_or_default());
        let bytes = rebuild_glb(document, &text, Some(data))?;
        Ok(Output { bytes, bin: None, external, notes: self.notes })
    }

    /// A name for the new buffer file that no other reference of the document has.
    fn free_name(&self, stem: &str, index: usize) -> String {
        let root = At::root(&self.document.root);
        let own = root.element("buffers", index).ok().and_then(|buffer| buffer.text("uri").ok().flatten());
        let is_taken = |name: &str| {
            let files = external_files(&self.document.root);
            let is_own =
                own.is_some_and(|own| uri::parse(own, "").is_ok_and(|own| own == Uri::File(name.to_owned())));
            files.iter().any(|file| file == name) && !is_own
        };
        let plain = format!("{stem}.bin");
        if is_taken(&plain) { format!("{stem}-animation.bin") } else { plain }
    }
}

/// The buffer that new data goes to.
struct Home<'a> {
    /// Its index; one past the last for a buffer of its own.
    index: usize,
    /// What it holds already.
    old: Cow<'a, [u8]>,
    /// Where its bytes are kept in the result.
    keep: Keep,
}

#[derive(Clone, Copy)]
enum Keep {
    Chunk,
    DataUri,
    File,
}

/// The bytes of a data URI.
fn data_of(text: &str) -> Option<Vec<u8>> {
    match uri::parse(text, "") {
        Ok(Uri::Data(bytes)) => Some(bytes),
        Ok(Uri::File(_)) | Err(_) => None,
    }
}

/// Adds bytes on the next four-byte boundary; gives where they start.
fn append(data: &mut Vec<u8>, bytes: &[u8]) -> usize {
    data.resize(data.len().next_multiple_of(4), 0);
    let start = data.len();
    data.extend_from_slice(bytes);
    start
}

/// A copy that ends on four bytes.
fn padded(bytes: &[u8], with: u8) -> Vec<u8> {
    let mut copy = bytes.to_vec();
    copy.resize(bytes.len().next_multiple_of(4), with);
    copy
}

/// A GLB of the document's chunks with another JSON text and, where given, another binary chunk.
fn rebuild_glb(document: &Document, json: &str, bin: Option<Vec<u8>>) -> Result<Vec<u8>, GltfError> {
    let chunks: &[Chunk] = match &document.container {
        Container::Glb(chunks) => chunks,
        Container::Text(_) => &[],
    };
    let has_bin = chunks.iter().any(|chunk| chunk.kind == container::BIN);
    let mut bin = bin.map(|bin| padded(&bin, 0));
    let mut parts = vec![(container::JSON, padded(json.as_bytes(), b' '))];
    if !has_bin && let Some(bin) = bin.take() {
        parts.push((container::BIN, bin));
    }
    for chunk in chunks.iter().skip(1) {
        match bin.take_if(|_| chunk.kind == container::BIN) {
            Some(bin) => parts.push((container::BIN, bin)),
            None => parts.push((chunk.kind, document.original[chunk.data.clone()].to_vec())),
        }
    }
    let mut bytes = container::assemble(&parts)?;
    // What follows the end that the header names belongs to no chunk, and is kept all the same.
    if let Some(last) = chunks.last() {
        bytes.extend_from_slice(&document.original[last.data.end..]);
    }
    Ok(bytes)
}
