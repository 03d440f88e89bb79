//! From bytes to a document and its clips.

use std::borrow::Cow;
use std::collections::BTreeSet;
use std::sync::Arc;

use serde::de::IgnoredAny;
use serde_json::Value;

use crate::clip::{Clip, FrameGrid, JointTracks};
use crate::exchange::Note;

use super::accessor::Accessors;
use super::bind;
use super::buffers::{Buffers, Fetch};
use super::channels::{self, Channels, Part};
use super::container::Container;
use super::document::{Animation, Binding, Document};
use super::error::GltfError;
use super::json::{self, At};
use super::nodes;
use super::patch::Patch;
use super::rate;
use super::tracks::{Track, Tracks};

/// Extensions that change nothing about how nodes are animated, so that requiring them needs no word.
const HARMLESS: [&str; 12] = [
    "EXT_texture_webp",
    "KHR_draco_mesh_compression",
    "KHR_materials_clearcoat",
    "KHR_materials_pbrSpecularGlossiness",
    "KHR_materials_specular",
    "KHR_materials_transmission",
    "KHR_materials_unlit",
    "KHR_materials_variants",
    "KHR_mesh_quantization",
    "KHR_texture_basisu",
    "KHR_texture_transform",
    "KHR_lights_punctual",
];

/// Joint tracks of all clips together, beyond which a document is taken for hostile unless it is itself that large.
const SPARE_TRACKS: usize = 2 << 20;

/// JSON values that a small document may have, whatever its size.
const SPARE_VALUES: usize = 400_000;

/// Reads a `.glb` or `.gltf`: the document, a clip for each of its animations in order (so that a clip's place in the
/// list is its animation's index), and what was odd. A document without animation gives no clip.
///
/// All clips share one skeleton: every joint of a skin and every animated node, and what stands above them. Key values
/// are as stored: neither made unit nor of one sign.
///
/// `name` is the file's name and only serves messages. `fetch` gives the bytes of a file beside the document, by a
/// relative path that is checked to stay inside the document's folder; only buffers that animation needs are fetched.
///
/// # Errors
/// With the place, what the standard expects there and what was found.
pub fn read<'b>(
    bytes: impl Into<Cow<'b, [u8]>>,
    name: &str,
    fetch: Fetch<'_>,
) -> Result<(Document, Vec<Clip>, Vec<Note>), GltfError> {
    let bytes = bytes.into().into_owned();
    let mut notes = Vec::new();
    let (container, extra) = Container::split(&bytes, name)?;
    if extra > 0 {
        let text = format!("expected the end of the file, found {extra} more bytes; they are passed over");
        notes.push(Note::new("GLB header", text));
    }
    let value = parse(&bytes[container.json()])?;
    let root = At::root(&value);
    check_asset(&root, &mut notes)?;

    let animations = root.list("animations")?;
    let mut all_channels = Vec::with_capacity(animations.len());
    let mut wanted = nodes::skin_joints(&root, &mut notes)?;
    for animation in &animations {
        let channels = channels::channels(&root, animation, &mut notes)?;
        wanted.extend(channels.moving.iter().map(|channel| channel.node));
        all_channels.push(channels);
    }
    let figure = nodes::figure(&root, &wanted, &mut notes)?;
    note_matrices(&root, &all_channels, &mut notes);
    let skeleton = Arc::new(figure.skeleton);
    let n_tracks = animations.len().saturating_mul(skeleton.len());
    let most_tracks = bytes.len().saturating_add(SPARE_TRACKS);
    if n_tracks > most_tracks {
        let found = format!("{} for {} joints", animations.len(), skeleton.len());
        let expected = format!("animations for at most {most_tracks} joint tracks in a file of this size");
        return Err(GltfError::unlike("animations", expected, found));
    }

    let buffers = Buffers::new(root.clone(), &bytes, container.bin(), fetch);
    let mut tracks = Tracks::new(root.clone(), Accessors::new(root.clone(), buffers, bytes.len()));
    let mut clips = Vec::with_capacity(animations.len());
    let mut bound = Vec::with_capacity(animations.len());
    let nothing = Arc::new(JointTracks::default());
    for (animation, channels) in animations.iter().zip(&all_channels) {
        let samplers = animation.list("samplers")?;
        let mut joints = vec![Arc::clone(&nothing); skeleton.len()];
        let mut bindings = Vec::new();
        for channel in &channels.moving {
            let Some(joint) = figure.joint_of_node[channel.node] else { continue };
            let decoded = tracks.track(&samplers[channel.sampler], channel.part, &mut notes)?;
            let own = Arc::make_mut(&mut joints[joint]);
            match (channel.part, decoded.track) {
                (Part::Rotation, Track::Rotation(track)) => own.rotation = Some(track),
                (Part::Scale, Track::Vector(track)) => own.scale = Some(track),
                (_, Track::Vector(track)) => own.translation = Some(track),
                (_, Track::Rotation(_)) => {}
            }
            bindings.push(Binding {
                channel: channel.index,
                sampler: channel.sampler,
                joint,
                part: channel.part,
                component: decoded.component,
                is_trimmed: decoded.is_trimmed,
            });
        }
        let (grid, duration_secs) = timing(&mut tracks, &samplers, channels);
        clips.push(Clip {
            name: animation.text("name")?.unwrap_or_default().to_owned(),
            skeleton: Arc::clone(&skeleton),
            joints,
            grid,
            duration_secs,
        });
        bound.push(Animation { bindings });
    }
    let mut accessors = tracks.into_accessors();
    // Last, so that a file that asks for too much still gets its motion.
    let bind_pose = bind::bind_pose(&root, &skeleton, &figure.joint_of_node, &mut accessors, &mut notes);
    let loaded = accessors.buffers.into_loaded();
    let document =
        Document { original: bytes, container, root: value, loaded, skeleton, animations: bound, bind_pose };
    Ok((document, clips, notes))
}

/// The frames of an animation and its length: the last key of all samplers that are played, those of morph weights too.
fn timing(tracks: &mut Tracks<'_>, samplers: &[At<'_>], channels: &Channels) -> (FrameGrid, f64) {
    // Key times that move a joint were read before and their faults are known; others are not ours to refuse.
    let readable = |&sampler: &usize| tracks.times(&samplers[sampler], &mut Vec::new()).ok();
    let all: Vec<_> = channels.played.iter().filter_map(readable).collect();
    let times: Vec<&[f64]> = all.iter().map(|times| &*times.secs).collect();
    let last = times.iter().filter_map(|times| times.last()).copied().fold(0.0, f64::max);
    (FrameGrid::even(rate::frame_rate(&times, last), last), last)
}

fn parse(json: &[u8]) -> Result<Value, GltfError> {
    // Some writers pad the chunk with zeros in place of blanks.
    let padding = json.iter().rev().take_while(|byte| **byte == 0).count();
    let text = &json[..json.len() - padding];
    // The parser does not look into what it passes over; the writer does.
    match std::str::from_utf8(text) {
        Ok(text) => refuse_dust(text)?,
        Err(error) => {
            let before = &text[..error.valid_up_to()];
            let line = before.split(|&byte| byte == b'\n').count();
            let column = before.rsplit(|&byte| byte == b'\n').next().map_or(0, <[u8]>::len) + 1;
            let found = format!("the byte {:#04x}", text[before.len()]);
            return Err(GltfError::unlike(format!("JSON line {line} column {column}"), "UTF-8 text", found));
        }
    }
    json::parse(text).map_err(|error| {
        let place = format!("JSON line {} column {}", error.line(), error.column());
        let full = error.to_string();
        let found = full.rsplit_once(" at line ").map_or(full.as_str(), |(message, _)| message);
        GltfError::unlike(place, "valid JSON", found)
    })
}

/// A value of two bytes takes a hundred once it is read: a document may not be made of such dust. Only what is kept
/// counts, and honest values have names.
fn refuse_dust(text: &str) -> Result<(), GltfError> {
    let n_values = |text: &str| memchr::memchr_iter(b',', text.as_bytes()).count();
    let most = (text.len() / 16).saturating_add(SPARE_VALUES);
    // What is no JSON is told with its place by the parser.
    if n_values(text) <= most || serde_json::from_str::<IgnoredAny>(text).is_err() {
        return Ok(());
    }
    let patch = Patch::new(text);
    let root = patch.root();
    let kept = json::READ_MEMBERS.iter().filter_map(|member| patch.member(&root, member));
    let found: usize = kept.map(|range| n_values(&text[range])).sum();
    if found <= most {
        return Ok(());
    }
    let expected = format!("at most {most} values about nodes and animation in a document of this size");
    Err(GltfError::unlike("JSON", expected, found.to_string()))
}

fn check_asset(root: &At<'_>, notes: &mut Vec<Note>) -> Result<(), GltfError> {
    let Some(asset) = root.get("asset") else {
        return Err(root.missing("asset", "an object with the version"));
    };
    let Some(version) = asset.text("version")? else { return Err(asset.missing("version", "\"2.0\"")) };
    if version.split('.').next() != Some("2") {
        return Err(GltfError::unlike(asset.path_of("version"), "\"2.0\"", format!("`{version}`")));
    }
    if let Some(least) = asset.text("minVersion")?
        && least != "2.0"
    {
        let found = format!("`{least}`");
        return Err(GltfError::unlike(asset.path_of("minVersion"), "at most \"2.0\"", found));
    }
    let unknown: BTreeSet<&str> =
        root.texts("extensionsRequired").filter(|extension| !HARMLESS.contains(extension)).collect();
    for extension in unknown {
        let text = format!(
            "`{extension}` is not known here; it is kept, and what it may do to the figure is not seen"
        );
        notes.push(Note::new("extensionsRequired", text));
    }
    Ok(())
}

/// An animated node must not have a matrix (section 3.5.3).
fn note_matrices(root: &At<'_>, all_channels: &[Channels], notes: &mut Vec<Note>) {
    let animated: BTreeSet<usize> =
        all_channels.iter().flat_map(|channels| &channels.moving).map(|channel| channel.node).collect();
    for node in animated {
        if root.element("nodes", node).is_ok_and(|node| node.get("matrix").is_some()) {
            let text =
                "expected translation, rotation and scale in an animated node, found a matrix; it was split";
            notes.push(Note::new(format!("nodes[{node}].matrix"), text));
        }
    }
}
