//! A new `.glb` from a clip of another format: joints as nodes, a figure that follows them, one animation.

use std::collections::HashMap;

use glam::{DAffine3, DMat4};
use serde_json::{Map, Value, json};

use crate::clip::{Clip, JointTracks, VectorTrack};
use crate::exchange::Note;
use crate::skeleton::{Joint, WorldJoint};

use super::container;
use super::curve::{self, Curve};
use super::error::GltfError;
use super::limbs;
use super::write::Output;

/// Neighbouring keys are kept at most this far apart: players that measure a little differently must not come to
/// different short ways.
const LARGEST_ARC_RAD: f64 = 2.0 * std::f64::consts::FRAC_PI_3;
/// A figure taller than this was hardly measured in metres.
const TALLEST_METRES: f64 = 3.0;

/// A new `.glb` that holds a clip: a node for each joint, a plain skinned figure so that any viewer shows it, and the
/// motion as floats. Rotors are written unit and with signs that follow one another; where neighbouring keys are more
/// than 120° apart, keys are put between. Smooth paths are written as cubics that follow them within 0.01°. Lengths stay as they are. `stem` is the file's name without ending and names
/// what the clip does not.
///
/// # Errors
/// When the result is beyond what a GLB can hold.
pub fn from_clip(clip: &Clip, stem: &str) -> Result<Output, GltfError> {
    let mut notes = Vec::new();
    let skeleton = &clip.skeleton;
    let world = skeleton.world(&skeleton.rest_pose());
    let mut maker = Maker::default();

    let mut nodes: Vec<Value> = (0..skeleton.len()).map(|joint| node(clip, joint)).collect();
    let mut roots: Vec<usize> =
        (0..skeleton.len()).filter(|&joint| skeleton.joints()[joint].parent.is_none()).collect();
    if roots.len() > 1 {
        // All joints of a skin need a common root (section 3.7.3).
        nodes.push(json!({ "name": "roots", "children": roots }));
        roots = vec![nodes.len() - 1];
    }
    let mut root = json!({
        "asset": { "version": "2.0", "generator": "Turnwright" },
        "scene": 0,
    });
    if let Some((mesh, skin)) = maker.figure(clip, &world) {
        root["meshes"] = json!([mesh]);
        root["skins"] = json!([skin]);
        root["materials"] = json!([{
            "name": "figure",
            "pbrMetallicRoughness": {
                "baseColorFactor": [0.55, 0.6, 0.65, 1.0], "metallicFactor": 0.0, "roughnessFactor": 0.8,
            },
        }]);
        roots.push(nodes.len());
        nodes.push(json!({ "name": "figure", "mesh": 0, "skin": 0 }));
        let height = limbs::extent(&world);
        if height > TALLEST_METRES {
            let text = format!(
                "glTF expects metres, found a figure {height:.1} long; lengths are kept, so scale it where metres matter"
            );
            notes.push(Note::new("nodes", text));
        }
    }
    if nodes.is_empty() {
        root["scenes"] = json!([{}]);
    } else {
        root["scenes"] = json!([{ "nodes": roots }]);
        root["nodes"] = nodes.into();
    }
    if let Some(animation) = maker.animation(clip, stem, &mut notes) {
        root["animations"] = json!([animation]);
    }
    let bin = maker.finish(&mut root);
    let mut text = root.to_string().into_bytes();
    text.resize(text.len().next_multiple_of(4), b' ');
    let mut chunks = vec![(container::JSON, text)];
    if !bin.is_empty() {
        chunks.push((container::BIN, bin));
    }
    Ok(Output { bytes: container::assemble(&chunks)?, bin: None, external: Vec::new(), notes })
}

/// The node of a joint at rest. What glTF takes for granted is left out.
fn node(clip: &Clip, joint: usize) -> Value {
    let Joint { name, rest, .. } = &clip.skeleton.joints()[joint];
    let mut node = Map::new();
    if !name.is_empty() {
        node.insert("name".into(), name.as_str().into());
    }
    let children = clip.skeleton.children(joint);
    if !children.is_empty() {
        node.insert("children".into(), json!(children));
    }
    let mut numbers = |key: &str, numbers: &[f64], usual: &[f64]| {
        if numbers != usual && numbers.iter().all(|number| number.is_finite()) {
            node.insert(key.into(), numbers.iter().map(|&number| f64::from(number as f32)).collect());
        }
    };
    numbers("translation", &rest.translation.to_array(), &[0.0; 3]);
    numbers("rotation", &rest.rotation.normalize().to_xyzw(), &[0.0, 0.0, 0.0, 1.0]);
    numbers("scale", &rest.scale.to_array(), &[1.0; 3]);
    Value::Object(node)
}

/// Collects the binary data with its views and accessors.
#[derive(Default)]
struct Maker {
    data: Vec<u8>,
    views: Vec<Value>,
    accessors: Vec<Value>,
    inputs: HashMap<Vec<u32>, usize>,
}

impl Maker {
    /// Adds a view on `bytes` and an accessor with the members given; gives its index.
    fn accessor(
        &mut self,
        bytes: impl IntoIterator<Item = u8>,
        target: Option<u32>,
        mut accessor: Value,
    ) -> usize {
        self.data.resize(self.data.len().next_multiple_of(4), 0);
        let start = self.data.len();
        self.data.extend(bytes);
        let mut view = json!({ "buffer": 0, "byteOffset": start, "byteLength": self.data.len() - start });
        if let Some(target) = target {
            view["target"] = target.into();
        }
        accessor["bufferView"] = self.views.len().into();
        self.views.push(view);
        self.accessors.push(accessor);
        self.accessors.len() - 1
    }

    /// The figure's mesh and skin; `None` for a skeleton without joints.
    fn figure(&mut self, clip: &Clip, world: &[WorldJoint]) -> Option<(Value, Value)> {
        /// Targets of vertex and of index data (section 3.6.1.1).
        const ARRAY: Option<u32> = Some(34962);
        const ELEMENTS: Option<u32> = Some(34963);
        let listed: Vec<usize> = clip.skeleton.listed().collect();
        let figure = limbs::limbs(&clip.skeleton, world);
        if figure.corners.is_empty() || listed.len() > usize::from(u16::MAX) {
            return None;
        }
        let count = figure.corners.len();
        let bound = |start: f32, pick: fn(f32, f32) -> f32| -> Vec<f64> {
            let pick_all =
                |axis: usize| figure.corners.iter().fold(start, |so_far, corner| pick(so_far, corner[axis]));
            (0..3).map(|axis| f64::from(pick_all(axis))).collect()
        };
        let positions = self.accessor(
            figure.corners.iter().flatten().flat_map(|number| number.to_le_bytes()),
            ARRAY,
            json!({
                "componentType": 5126, "count": count, "type": "VEC3",
                "min": bound(f32::INFINITY, f32::min), "max": bound(f32::NEG_INFINITY, f32::max),
            }),
        );
        // The place of a joint in the skin.
        let place = |joint: &usize| listed.binary_search(joint).unwrap_or(0) as u16;
        let joints = self.accessor(
            figure.joints.iter().flat_map(|joint| [place(joint), 0, 0, 0]).flat_map(u16::to_le_bytes),
            ARRAY,
            json!({ "componentType": 5123, "count": count, "type": "VEC4" }),
        );
        let weights = self.accessor(
            (0..count).flat_map(|_| [1.0_f32, 0.0, 0.0, 0.0]).flat_map(f32::to_le_bytes),
            ARRAY,
            json!({ "componentType": 5126, "count": count, "type": "VEC4" }),
        );
        let corners = figure.triangles.iter().flatten();
        let indices = self.accessor(
            corners.flat_map(|&corner| (corner as u32).to_le_bytes()),
            ELEMENTS,
            json!({ "componentType": 5125, "count": 3 * figure.triangles.len(), "type": "SCALAR" }),
        );
        let inverses = listed.iter().flat_map(|&joint| inverse(&world[joint].scene_from_joint));
        let binds = self.accessor(
            inverses.flat_map(f32::to_le_bytes),
            None,
            json!({ "componentType": 5126, "count": listed.len(), "type": "MAT4" }),
        );
        let mesh = json!({ "name": "figure", "primitives": [{
            "attributes": { "POSITION": positions, "JOINTS_0": joints, "WEIGHTS_0": weights },
            "indices": indices, "material": 0,
        }]});
        Some((mesh, json!({ "joints": listed, "inverseBindMatrices": binds })))
    }

    /// The clip's tracks; `None` where nothing moves.
    fn animation(&mut self, clip: &Clip, stem: &str, notes: &mut Vec<Note>) -> Option<Value> {
        let name = if clip.name.is_empty() { stem } else { &clip.name };
        let (mut samplers, mut channels) = (Vec::new(), Vec::new());
        for (joint, tracks) in clip.joints.iter().enumerate() {
            for (path, curve) in curves(tracks) {
                if curve.secs.is_empty() {
                    continue;
                }
                let place = || format!("joint {}", clip.skeleton.label(joint));
                notes.extend(curve.remarks().into_iter().map(|text| Note::new(place(), text)));
                let input = self.input(&curve.secs);
                let output = self.accessor(
                    curve.values.iter().flat_map(|number| number.to_le_bytes()),
                    None,
                    json!({ "componentType": 5126, "count": curve.count, "type": curve.kind }),
                );
                channels
                    .push(json!({ "sampler": samplers.len(), "target": { "node": joint, "path": path } }));
                samplers.push(json!({
                    "input": input, "output": output, "interpolation": curve.interpolation.name(),
                }));
            }
        }
        (!samplers.is_empty()).then(|| json!({ "name": name, "channels": channels, "samplers": samplers }))
    }

    fn input(&mut self, secs: &[f32]) -> usize {
        let key: Vec<u32> = curve::bits(secs).collect();
        if let Some(&index) = self.inputs.get(&key) {
            return index;
        }
        let bound = |end: Option<&f32>| vec![f64::from(end.copied().unwrap_or_default())];
        let index = self.accessor(
            secs.iter().flat_map(|time| time.to_le_bytes()),
            None,
            json!({
                "componentType": 5126, "count": secs.len(), "type": "SCALAR",
                "min": bound(secs.first()), "max": bound(secs.last()),
            }),
        );
        self.inputs.insert(key, index);
        index
    }

    /// Puts views, accessors and the buffer into the document; gives the buffer's bytes.
    fn finish(mut self, root: &mut Value) -> Vec<u8> {
        if self.data.is_empty() {
            return self.data;
        }
        root["accessors"] = self.accessors.into();
        root["bufferViews"] = self.views.into();
        self.data.resize(self.data.len().next_multiple_of(4), 0);
        root["buffers"] = json!([{ "byteLength": self.data.len() }]);
        self.data
    }
}

/// The curves of one joint, by path. Only sound, finite values: a file of our own making shall have no fault.
fn curves(tracks: &JointTracks) -> Vec<(&'static str, Curve)> {
    let mut curves = Vec::new();
    let vectors = [("translation", &tracks.translation), ("scale", &tracks.scale)];
    for (path, track) in vectors {
        let Some(track) = track else { continue };
        let sound: Option<Vec<_>> = (0..track.keys.len()).map(|key| track.at(track.times.at(key))).collect();
        if let Some(keys) = sound {
            let track = VectorTrack { keys: keys.into(), ..track.clone() };
            curves.push((path, Curve::of_vector(&track)));
        }
    }
    if let Some(track) = &tracks.rotation {
        curves.push(("rotation", Curve::of_followed(&curve::unrolled(track, LARGEST_ARC_RAD))));
    }
    curves
}

/// The inverse of a joint's place at rest, column after column; no change where it has none.
fn inverse(scene_from_joint: &DAffine3) -> [f32; 16] {
    let inverse = scene_from_joint.inverse();
    let sound = if inverse.is_finite() { inverse } else { DAffine3::IDENTITY };
    DMat4::from(sound).to_cols_array().map(|number| number as f32)
}
