//! Corrected clips back into their document: only what changed gets new data, everything else stays byte for byte.

use std::collections::{BTreeMap, BTreeSet, HashMap};

use serde_json::{Value, json};

use crate::clip::{Clip, JointTracks};
use crate::exchange::Note;

use super::accessor::Component;
use super::buffers::Loaded;
use super::channels::Part;
use super::container::{self, Chunk, Container};
use super::curve::{self, Curve};
use super::document::{Binding, Document, external_files};
use super::error::GltfError;
use super::json::At;
use super::nodes;
use super::patch::{Patch, Step};
use super::tracks::Interpolation;
use super::uri;

/// A file ready to be put on disk.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Output {
    /// The `.glb` or `.gltf` itself.
    pub bytes: Vec<u8>,
    /// A buffer to be put beside it: file name and content.
    pub bin: Option<(String, Vec<u8>)>,
    /// Files beside the source that the output still refers to, as paths relative to the document. Where the output
    /// goes to another folder, they have to go along.
    pub external: Vec<String>,
    /// What was done that a person may want to know.
    pub notes: Vec<Note>,
}

/// The document with corrected clips: for each `(animation index, clip as it was read, clip as it shall be)`.
///
/// Tracks that did not change keep their samplers. For those that did, new accessors and views are added behind the
/// old data, which stays. Numbers of unchanged keys stay bit for bit, and so do all other members and bytes: with no
/// change at all the output is the input. Key signs are written as they are. `stem` is the target's file name without
/// ending; it names the buffer that a `.gltf` writes beside itself.
///
/// # Errors
/// When a clip does not belong to the document, or the result is beyond what a GLB can hold.
pub fn write(document: &Document, clips: &[(usize, &Clip, &Clip)], stem: &str) -> Result<Output, GltfError> {
    let mut writer = Writer::new(document);
    for &(animation, before, after) in clips {
        writer.animation(animation, before, after)?;
    }
    writer.finish(stem)
}

/// A track that changed.
struct Change {
    /// Its channel and sampler; `None` where there was no track before.
    binding: Option<Binding>,
    joint: usize,
    part: Part,
    curve: Curve,
    /// Whether the old input accessor still serves.
    keeps_times: bool,
}

struct Writer<'a> {
    document: &'a Document,
    patch: Patch<'a>,
    /// The new bytes, and views and accessors on them as JSON; views start from 0 within the new bytes.
    data: Vec<u8>,
    views: Vec<[usize; 2]>,
    accessors: Vec<Value>,
    /// New input accessors by the bits of their times.
    inputs: HashMap<Vec<u32>, usize>,
    n_old_accessors: usize,
    n_old_views: usize,
    /// The buffer of the first output that changed.
    buffer: Option<usize>,
    n_from_integers: usize,
    notes: Vec<Note>,
}

impl<'a> Writer<'a> {
    fn new(document: &'a Document) -> Self {
        let root = At::root(&document.root);
        // The text was parsed, so it is UTF-8.
        let text = std::str::from_utf8(&document.original[document.container.json()]).unwrap_or_default();
        Self {
            document,
            patch: Patch::new(text),
            data: Vec::new(),
            views: Vec::new(),
            accessors: Vec::new(),
            inputs: HashMap::new(),
            n_old_accessors: root.count("accessors"),
            n_old_views: root.count("bufferViews"),
            buffer: None,
            n_from_integers: 0,
            notes: Vec::new(),
        }
    }

    fn animation(&mut self, index: usize, before: &Clip, after: &Clip) -> Result<(), GltfError> {
        let place = format!("animations[{index}]");
        let Some(animation) = self.document.animations.get(index) else {
            let expected = format!("an animation below {}", self.document.animations.len());
            return Err(GltfError::unlike("animations", expected, index.to_string()));
        };
        let n_joints = self.document.skeleton.len();
        for clip in [before, after] {
            if clip.joints.len() != n_joints {
                let found = format!("{} in the clip", clip.joints.len());
                return Err(GltfError::unlike(place, format!("{n_joints} joints"), found));
            }
        }
        let mut changes = Vec::new();
        for joint in (0..n_joints).filter(|&joint| !before.same_joint(after, joint)) {
            for part in [Part::Translation, Part::Rotation, Part::Scale] {
                let [old, new] = [before, after].map(|clip| curve_of(&clip.joints[joint], part));
                let binding = animation.bindings.iter().find(|own| own.joint == joint && own.part == part);
                let Some(curve) = new else {
                    if old.is_some() {
                        let label = self.document.skeleton.label(joint);
                        let text = format!(
                            "expected keys for the {} of `{label}`, found none; it keeps the old ones",
                            part.path()
                        );
                        self.notes.push(Note::new(place.clone(), text));
                    }
                    continue;
                };
                if curve.secs.is_empty() || old.as_ref().is_some_and(|old| old.is_same(&curve)) {
                    continue;
                }
                let keeps_times = old.is_some_and(|old| old.has_times_of(&curve))
                    && binding.is_some_and(|binding| !binding.is_trimmed);
                changes.push(Change { binding: binding.copied(), joint, part, curve, keeps_times });
            }
        }
        self.apply(index, changes);
        Ok(())
    }

    /// Writes the changes of one animation.
    fn apply(&mut self, index: usize, changes: Vec<Change>) {
        let root = At::root(&self.document.root);
        let Ok(animation) = root.element("animations", index) else { return };
        let path = [Step::Key("animations"), Step::At(index)];
        let mut new_samplers = Vec::new();
        let mut new_channels = Vec::new();
        let n_old_samplers = animation.count("samplers");

        let mut cleared = BTreeSet::new();
        let mut by_sampler: BTreeMap<usize, Vec<(Binding, Change)>> = BTreeMap::new();
        for change in changes {
            self.note_merged(index, &change);
            if let Some(binding) = change.binding {
                by_sampler.entry(binding.sampler).or_default().push((binding, change));
                continue;
            }
            if cleared.insert(change.joint) {
                self.clear_matrix(change.joint);
            }
            new_samplers.push(self.sampler(json!({}), &change));
            let node = self.document.skeleton.joints()[change.joint].number;
            new_channels.push(json!({
                "sampler": n_old_samplers + new_samplers.len() - 1,
                "target": { "node": node, "path": change.part.path() },
            }));
        }
        for (sampler, changes) in by_sampler {
            let Ok(old) = animation.element("samplers", sampler) else { continue };
            if self.buffer.is_none() {
                self.buffer = buffer_of(&root, &old);
            }
            let uses = animation
                .list("channels")
                .unwrap_or_default()
                .iter()
                .filter(|channel| channel.whole("sampler").ok().flatten() == Some(sampler))
                .count();
            // Channels that shared the sampler and now want the same go on sharing it.
            let mut groups: Vec<Vec<(Binding, Change)>> = Vec::new();
            let is_free = changes.len() == uses;
            for change in changes {
                match groups.iter_mut().find(|group| group[0].1.curve.is_same(&change.1.curve)) {
                    Some(group) => group.push(change),
                    None => groups.push(vec![change]),
                }
            }
            for (number, group) in groups.iter().enumerate() {
                let (binding, change) = &group[0];
                if !matches!(binding.component, Component::F32) {
                    self.n_from_integers += 1;
                }
                let new = self.sampler(old.value.clone(), change);
                if number == 0 && is_free {
                    let at = [path[0], path[1], Step::Key("samplers"), Step::At(sampler)];
                    for key in ["input", "output", "interpolation"] {
                        if new.get(key) != old.value.get(key)
                            && let Some(value) = new.get(key)
                        {
                            self.patch.set(&at, key, &value.to_string());
                        }
                    }
                    continue;
                }
                new_samplers.push(new);
                let number = (n_old_samplers + new_samplers.len() - 1).to_string();
                for (binding, _) in group {
                    let at = [path[0], path[1], Step::Key("channels"), Step::At(binding.channel)];
                    self.patch.set(&at, "sampler", &number);
                }
            }
        }
        self.patch.extend(&path, "samplers", &texts(&new_samplers));
        self.patch.extend(&path, "channels", &texts(&new_channels));
    }

    fn note_merged(&mut self, index: usize, change: &Change) {
        if change.curve.n_merged > 0 {
            let label = self.document.skeleton.label(change.joint);
            let text = format!(
                "{} key(s) of `{label}` fell together with the next when times were rounded to 32 bits",
                change.curve.n_merged
            );
            self.notes.push(Note::new(format!("animations[{index}]"), text));
        }
    }

    /// A sampler, all other members as they were, that plays the changed curve.
    fn sampler(&mut self, mut sampler: Value, change: &Change) -> Value {
        let curve = &change.curve;
        if !change.keeps_times {
            sampler["input"] = self.input(&curve.secs).into();
        }
        sampler["output"] = self.accessor(&curve.values, curve.kind, curve.count, None).into();
        let old = sampler.get("interpolation").and_then(Value::as_str);
        if old.unwrap_or(Interpolation::Linear.name()) != curve.interpolation.name() {
            sampler["interpolation"] = curve.interpolation.name().into();
        }
        sampler
    }

    /// The new input accessor with these times.
    fn input(&mut self, secs: &[f32]) -> usize {
        let key: Vec<u32> = curve::bits(secs).collect();
        if let Some(&index) = self.inputs.get(&key) {
            return index;
        }
        let span = secs.first().copied().zip(secs.last().copied());
        let index = self.accessor(secs, "SCALAR", secs.len(), span);
        self.inputs.insert(key, index);
        index
    }

    /// Adds floats, a view on them and an accessor; gives its index.
    fn accessor(&mut self, floats: &[f32], kind: &str, count: usize, span: Option<(f32, f32)>) -> usize {
        let start = self.data.len();
        self.data.extend(floats.iter().flat_map(|float| float.to_le_bytes()));
        self.views.push([start, self.data.len() - start]);
        let mut accessor = json!({
            "bufferView": self.n_old_views + self.views.len() - 1,
            "componentType": 5126,
            "count": count,
            "type": kind,
        });
        if let Some((least, most)) = span {
            accessor["min"] = json!([f64::from(least)]);
            accessor["max"] = json!([f64::from(most)]);
        }
        self.accessors.push(accessor);
        self.n_old_accessors + self.accessors.len() - 1
    }

    /// An animated node must not have a matrix (section 3.5.3).
    fn clear_matrix(&mut self, joint: usize) {
        let root = At::root(&self.document.root);
        let number = self.document.skeleton.joints()[joint].number;
        let Ok(node) = root.element("nodes", number) else { return };
        if node.get("matrix").is_none() {
            return;
        }
        if let Ok(rest) = nodes::transform(&node, &mut Vec::new()) {
            let members = format!(
                "\"translation\":{},\"rotation\":{},\"scale\":{}",
                json!(rest.translation.to_array()),
                json!(rest.rotation.to_xyzw()),
                json!(rest.scale.to_array())
            );
            self.patch.replace_member(&[Step::Key("nodes"), Step::At(number)], "matrix", &members);
        }
    }

    fn finish(mut self, stem: &str) -> Result<Output, GltfError> {
        let document = self.document;
        if self.data.is_empty() {
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
        let place = self.place();
        let old: &[u8] = match &place {
            Place::Chunk => document.container.bin().map_or(&[], |range| &document.original[range]),
            Place::Buffer(_, loaded) => loaded.bytes(&document.original),
            Place::New => &[],
        };
        let mut grown = padded(old, 0);
        let start = grown.len();
        grown.append(&mut self.data);

        let n_buffers = At::root(&document.root).count("buffers");
        let index = match &place {
            Place::Chunk => 0,
            Place::Buffer(index, _) => *index,
            Place::New => n_buffers,
        };
        let views: Vec<Value> = self
            .views
            .iter()
            .map(|[at, length]| json!({ "buffer": index, "byteOffset": start + at, "byteLength": length }))
            .collect();
        let mut bin = None;
        let at = [Step::Key("buffers"), Step::At(index)];
        let new_uri = match &place {
            Place::Chunk => None,
            Place::New | Place::Buffer(_, Loaded::Data(_) | Loaded::Chunk(_)) => {
                Some(uri::write_data(&grown))
            }
            Place::Buffer(_, Loaded::File { .. }) => {
                let name = self.free_name(stem, index);
                let text = uri::write_file(&name);
                bin = Some((name, grown.clone()));
                Some(text)
            }
        };
        if index < n_buffers {
            self.patch.set(&at, "byteLength", &grown.len().to_string());
            if let Some(uri) = &new_uri {
                self.patch.set(&at, "uri", &Value::from(uri.as_str()).to_string());
            }
        } else {
            let mut buffer = json!({ "byteLength": grown.len() });
            if let Some(uri) = &new_uri {
                buffer["uri"] = uri.as_str().into();
            }
            self.patch.extend(&[], "buffers", &[buffer.to_string()]);
        }
        self.patch.extend(&[], "bufferViews", &texts(&views));
        self.patch.extend(&[], "accessors", &texts(&self.accessors));
        let text = self.patch.finish();
        let mut external = document.external_files();
        if let Some((name, _)) = &bin {
            // What the buffer referred to may now be referred to by nobody.
            let patched: Value = serde_json::from_str(&text).unwrap_or_default();
            external = external_files(&patched);
            external.retain(|file| file != name);
        }
        let bytes = match &document.container {
            Container::Text(_) => text.into_bytes(),
            Container::Glb(chunks) => {
                let new_bin = matches!(place, Place::Chunk).then_some(grown);
                rebuild_glb(&document.original, chunks, &text, new_bin)?
            }
        };
        Ok(Output { bytes, bin, external, notes: self.notes })
    }

    /// Where new data goes: behind the binary chunk of a GLB; in a text behind the data that changed.
    fn place(&self) -> Place<'a> {
        let document: &'a Document = self.document;
        let root = At::root(&document.root);
        if document.is_glb() {
            let first = root.element("buffers", 0);
            return if first.is_ok_and(|first| first.get("uri").is_some()) {
                Place::New
            } else {
                Place::Chunk
            };
        }
        let loaded = self.buffer.and_then(|index| Some((index, document.loaded.get(index)?.as_ref()?)));
        loaded.map_or(Place::New, |(index, loaded)| Place::Buffer(index, loaded))
    }

    /// A name for the new buffer file that no other reference of the document has.
    fn free_name(&self, stem: &str, index: usize) -> String {
        let root = At::root(&self.document.root);
        let own = root.element("buffers", index).ok().and_then(|buffer| buffer.text("uri").ok().flatten());
        let is_taken = |name: &str| {
            let files = external_files(&self.document.root);
            let is_own = own.is_some_and(|own| {
                uri::parse(own, "").is_ok_and(|own| own == uri::Uri::File(name.to_owned()))
            });
            files.iter().any(|file| file == name) && !is_own
        };
        let plain = format!("{stem}.bin");
        if is_taken(&plain) { format!("{stem}-animation.bin") } else { plain }
    }
}

/// Where new data goes.
enum Place<'a> {
    /// The binary chunk.
    Chunk,
    /// A buffer with a URI.
    Buffer(usize, &'a Loaded),
    /// A buffer of its own.
    New,
}

fn curve_of(tracks: &JointTracks, part: Part) -> Option<Curve> {
    match part {
        Part::Rotation => tracks.rotation.as_ref().map(Curve::of_rotation),
        Part::Translation => tracks.translation.as_ref().map(Curve::of_vector),
        Part::Scale => tracks.scale.as_ref().map(Curve::of_vector),
    }
}

/// The buffer that a sampler's values, else its times, lie in.
fn buffer_of(root: &At<'_>, sampler: &At<'_>) -> Option<usize> {
    ["output", "input"].into_iter().find_map(|key| {
        let accessor = root.element("accessors", sampler.whole(key).ok()??).ok()?;
        let view = root.element("bufferViews", accessor.whole("bufferView").ok()??).ok()?;
        view.whole("buffer").ok()?
    })
}

fn texts(values: &[Value]) -> Vec<String> {
    values.iter().map(Value::to_string).collect()
}

/// A copy that ends on four bytes.
fn padded(bytes: &[u8], with: u8) -> Vec<u8> {
    let mut copy = bytes.to_vec();
    copy.resize(bytes.len().next_multiple_of(4), with);
    copy
}

/// A GLB of the old chunks with another JSON text and, where given, another binary chunk.
fn rebuild_glb(
    original: &[u8],
    chunks: &[Chunk],
    json: &str,
    bin: Option<Vec<u8>>,
) -> Result<Vec<u8>, GltfError> {
    let has_bin = chunks.iter().any(|chunk| chunk.kind == container::BIN);
    let mut bin = bin.map(|bin| padded(&bin, 0));
    let mut parts = vec![(container::JSON, padded(json.as_bytes(), b' '))];
    if !has_bin && let Some(bin) = bin.take() {
        parts.push((container::BIN, bin));
    }
    for chunk in chunks.iter().skip(1) {
        match bin.take_if(|_| chunk.kind == container::BIN) {
            Some(bin) => parts.push((container::BIN, bin)),
            None => parts.push((chunk.kind, original[chunk.data.clone()].to_vec())),
        }
    }
    let mut bytes = assemble_glb(&parts)?;
    // What follows the end that the header names belongs to no chunk, and is kept all the same.
    let end = chunks.last().map_or(original.len(), |chunk| chunk.data.end);
    bytes.extend_from_slice(&original[end..]);
    Ok(bytes)
}

/// A GLB of chunks, each already padded.
pub(super) fn assemble_glb(chunks: &[(u32, Vec<u8>)]) -> Result<Vec<u8>, GltfError> {
    let length = 12 + chunks.iter().map(|(_, data)| 8 + data.len()).sum::<usize>();
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
