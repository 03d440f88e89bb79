//! Which channels of an animation move joints (glTF 2.0, section 3.11).

use std::collections::{BTreeMap, BTreeSet};

use crate::exchange::Note;

use super::error::GltfError;
use super::json::At;

/// What of a node a channel moves.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Part {
    /// `translation`.
    Translation,
    /// `rotation`.
    Rotation,
    /// `scale`.
    Scale,
}

impl Part {
    /// As the standard spells it.
    pub(super) const fn path(self) -> &'static str {
        match self {
            Self::Translation => "translation",
            Self::Rotation => "rotation",
            Self::Scale => "scale",
        }
    }

    fn from_path(path: &str) -> Option<Self> {
        [Self::Translation, Self::Rotation, Self::Scale].into_iter().find(|part| part.path() == path)
    }
}

/// A channel that moves a node.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Channel {
    /// Its index in the animation.
    pub index: usize,
    /// The sampler it plays.
    pub sampler: usize,
    /// The node it moves.
    pub node: usize,
    /// What of the node.
    pub part: Part,
}

/// The channels of one animation.
#[derive(Clone, Debug, Default)]
pub(super) struct Channels {
    /// Those that move a node, in the order of the file.
    pub moving: Vec<Channel>,
    /// Samplers that any channel plays, of morph weights and unknown things too.
    pub played: BTreeSet<usize>,
}

/// Reads the channels of one animation. Channels that move no node are left alone, and told.
pub(super) fn channels(
    root: &At<'_>,
    animation: &At<'_>,
    notes: &mut Vec<Note>,
) -> Result<Channels, GltfError> {
    let mut channels = Channels::default();
    let mut moved = BTreeSet::new();
    let mut left_alone: BTreeMap<&str, usize> = BTreeMap::new();
    for (index, channel) in animation.list("channels")?.into_iter().enumerate() {
        let sampler = sampler_index(&channel, animation)?;
        channels.played.insert(sampler);
        let Some(target) = channel.get("target") else { return Err(channel.missing("target", "an object")) };
        let Some(path) = target.text("path")? else { return Err(target.missing("path", "a text")) };
        if path == "pointer" {
            *left_alone.entry("driven by KHR_animation_pointer").or_default() += 1;
            continue;
        }
        let Some(node) = target.index("node", "nodes", root)? else {
            *left_alone.entry("without a node").or_default() += 1;
            continue;
        };
        let Some(part) = Part::from_path(path) else {
            // Morph weights are no fault and nothing that is worked on here.
            if path != "weights" {
                *left_alone.entry("of an unknown path").or_default() += 1;
            }
            continue;
        };
        if moved.insert((node, part)) {
            channels.moving.push(Channel { index, sampler, node, part });
        } else {
            *left_alone.entry("that repeat the target of an earlier channel").or_default() += 1;
        }
    }
    for (what, count) in left_alone {
        let text = format!("{count} channel(s) {what} left alone, and kept when writing");
        notes.push(Note::new(animation.path_of("channels"), text));
    }
    Ok(channels)
}

fn sampler_index(channel: &At<'_>, animation: &At<'_>) -> Result<usize, GltfError> {
    channel.needed_index("sampler", "samplers", animation)
}
