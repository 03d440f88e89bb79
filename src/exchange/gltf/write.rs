//! Corrected clips back into their document: only what changed gets new data, everything else stays byte for byte.

use std::collections::{BTreeMap, BTreeSet, HashMap};
use std::ops::Range;

use serde_json::{Value, json};

use crate::clip::{Clip, JointTracks};
use crate::exchange::Note;

use super::accessor::Component;
use super::channels::Part;
use super::curve::{self, Curve};
use super::document::{Binding, Document, Form};
use super::error::GltfError;
use super::json::At;
use super::nodes;
use super::patch::Patch;
use super::tracks::Interpolation;

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
/// change at all the output is the input. Keys that changed get the sign of the key before them, where the short way is gone
/// between them. Paths that glTF has no word for become cubics, or short arcs where these need hardly more keys, that follow
/// them within 0.01°; meant turns get keys at most 120° apart. `stem` is the target's file name without
/// ending; it names the buffer that a `.gltf` writes beside itself.
///
/// # Errors
/// When a clip does not belong to the document, or the result is beyond what a GLB can hold.
pub fn write(document: &Document, clips: &[(usize, &Clip, &Clip)], stem: &str) -> Result<Output, GltfError> {
    write_as(document, clips, stem, document.form())
}

/// As [`write()`], as `.glb` or `.gltf` whatever the document was. Where the two differ buffers and images move into or
/// out of the binary chunk; nothing else changes for it.
///
/// # Errors
/// As [`write()`].
pub fn write_as(
    document: &Document,
    clips: &[(usize, &Clip, &Clip)],
    stem: &str,
    form: Form,
) -> Result<Output, GltfError> {
    let mut writer = Writer::new(document);
    for &(animation, before, after) in clips {
        writer.animation(animation, before, after)?;
    }
    writer.finish(stem, form)
}

/// The document with one more animation, named `name`, that plays the tracks of `clip`. All else stays as [`write()`] leaves it.
///
/// # Errors
/// When the clip does not belong to the document's skeleton, or the result is beyond what a GLB can hold.
pub fn write_added(
    document: &Document,
    clip: &Clip,
    name: &str,
    stem: &str,
    form: Form,
) -> Result<Output, GltfError> {
    let mut writer = Writer::new(document);
    writer.add(clip, name)?;
    writer.finish(stem, form)
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

/// Collects what changed.
pub(super) struct Writer<'a> {
    pub(super) document: &'a Document,
    pub(super) patch: Patch<'a>,
    /// Where each animation lies in the text.
    animations: Vec<Range<usize>>,
    /// The new bytes, and views and accessors on them as JSON; views start from 0 within the new bytes.
    pub(super) data: Vec<u8>,
    pub(super) views: Vec<[usize; 2]>,
    pub(super) accessors: Vec<Value>,
    /// New input accessors by the bits of their times.
    inputs: HashMap<Vec<u32>, usize>,
    n_old_accessors: usize,
    n_old_views: usize,
    /// The buffer of the first output that changed.
    pub(super) buffer: Option<usize>,
    pub(super) n_from_integers: usize,
    pub(super) notes: Vec<Note>,
}

impl<'a> Writer<'a> {
    fn new(document: &'a Document) -> Self {
        let root = At::root(&document.root);
        // The text was parsed, so it is UTF-8.
        let text = std::str::from_utf8(&document.original[document.container.json()]).unwrap_or_default();
        let patch = Patch::new(text);
        Self {
            document,
            animations: patch.elements_of(&patch.root(), "animations"),
            patch,
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
                let Some(mut curve) = new else {
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
                curve.unroll(old.as_ref());
                let keeps_times = old.is_some_and(|old| old.has_times_of(&curve))
                    && binding.is_some_and(|binding| !binding.is_trimmed);
                changes.push(Change { binding: binding.copied(), joint, part, curve, keeps_times });
            }
        }
        self.apply(index, changes);
        Ok(())
    }

    /// Adds an animation.
    fn add(&mut self, clip: &Clip, name: &str) -> Result<(), GltfError> {
        let n_joints = self.document.skeleton.len();
        if clip.joints.len() != n_joints {
            let found = format!("{} in the clip", clip.joints.len());
            return Err(GltfError::unlike("nodes", format!("{n_joints} joints"), found));
        }
        let place = self.document.animations.len();
        let mut samplers = Vec::new();
        let mut channels = Vec::new();
        for (joint, tracks) in clip.joints.iter().enumerate() {
            let mut is_cleared = false;
            for part in [Part::Translation, Part::Rotation, Part::Scale] {
                let Some(mut curve) = curve_of(tracks, part).filter(|curve| !curve.secs.is_empty()) else {
                    continue;
                };
                curve.unroll(None);
                if !std::mem::replace(&mut is_cleared, true) {
                    self.clear_matrix(joint);
                }
                let change = Change { binding: None, joint, part, curve, keeps_times: false };
                self.note_remarks(place, &change);
                samplers.push(self.sampler(json!({}), &change));
                let node = self.document.skeleton.joints()[joint].number;
                channels.push(json!({
                    "sampler": samplers.len() - 1,
                    "target": { "node": node, "path": part.path() },
                }));
            }
        }
        // An animation has at least one of each (section 3.11).
        if !channels.is_empty() {
            let animation = json!({ "name": name, "samplers": samplers, "channels": channels });
            self.patch.extend(&self.patch.root(), "animations", &[animation.to_string()]);
        }
        Ok(())
    }

    /// Writes the changes of one animation.
    fn apply(&mut self, index: usize, changes: Vec<Change>) {
        let root = At::root(&self.document.root);
        let Ok(animation) = root.element("animations", index) else { return };
        let Some(place) = self.animations.get(index).cloned() else { return };
        let [sampler_places, channel_places] =
            ["samplers", "channels"].map(|key| self.patch.elements_of(&place, key));
        let mut new_samplers = Vec::new();
        let mut new_channels = Vec::new();
        let n_old_samplers = animation.count("samplers");

        let mut uses = vec![0_usize; n_old_samplers];
        for channel in animation.list("channels").unwrap_or_default() {
            if let Ok(Some(sampler)) = channel.index("sampler", "samplers", &animation) {
                uses[sampler] += 1;
            }
        }
        let mut cleared = BTreeSet::new();
        let mut by_sampler: BTreeMap<usize, Vec<(Binding, Change)>> = BTreeMap::new();
        for change in changes {
            self.note_remarks(index, &change);
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
            // Channels that shared the sampler and now want the same go on sharing it.
            let mut groups: Vec<Vec<(Binding, Change)>> = Vec::new();
            let is_free = changes.len() == uses[sampler];
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
                    let at = sampler_places[sampler].clone();
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
                    let at = channel_places[binding.channel].clone();
                    self.patch.set(&at, "sampler", &number);
                }
            }
        }
        self.patch.extend(&place, "samplers", &texts(&new_samplers));
        self.patch.extend(&place, "channels", &texts(&new_channels));
    }

    fn note_remarks(&mut self, index: usize, change: &Change) {
        let label = self.document.skeleton.label(change.joint);
        for text in change.curve.remarks() {
            self.notes.push(Note::new(format!("animations[{index}], joint {label}"), text));
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
            let places = self.patch.elements_of(&self.patch.root(), "nodes");
            if let Some(place) = places.get(number) {
                self.patch.replace_member(place, "matrix", &members);
            }
        }
    }
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

/// JSON values as texts.
pub(super) fn texts(values: &[Value]) -> Vec<String> {
    values.iter().map(Value::to_string).collect()
}
