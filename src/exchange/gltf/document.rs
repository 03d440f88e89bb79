//! A glTF document as it was read: what the writer patches.

use std::fmt;
use std::sync::Arc;

use serde_json::Value;

use crate::skeleton::LocalPose;
use crate::skeleton::Skeleton;

use super::accessor::Component;
use super::buffers::Loaded;
use super::channels::Part;
use super::container::Container;
use super::json::At;
use super::uri::{self, Uri};

/// The two forms of a document.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Form {
    /// `.glb`: one binary file.
    Glb,
    /// `.gltf`: JSON text, with buffers inside it or beside it.
    Text,
}

/// A document, every byte of it, with what its clips were made of.
#[derive(Clone)]
pub struct Document {
    pub(super) original: Vec<u8>,
    pub(super) container: Container,
    pub(super) root: Value,
    /// For each buffer its bytes, where animation needed them.
    pub(super) loaded: Vec<Option<Loaded>>,
    pub(super) skeleton: Arc<Skeleton>,
    pub(super) animations: Vec<Animation>,
    /// Where a skin says it.
    pub(super) bind_pose: Option<LocalPose>,
}

/// What ties a clip to its animation.
#[derive(Clone, Debug)]
pub(super) struct Animation {
    /// A binding for each channel that moves a joint.
    pub bindings: Vec<Binding>,
}

/// Ties one part of a joint's tracks to a channel and its sampler.
#[derive(Clone, Copy, Debug)]
pub(super) struct Binding {
    /// Index in the animation's channels.
    pub channel: usize,
    /// Index in the animation's samplers.
    pub sampler: usize,
    /// Index in the skeleton.
    pub joint: usize,
    /// Translation, rotation or scale.
    pub part: Part,
    /// How the values were stored.
    pub component: Component,
    /// Whether the track has fewer keys than the sampler, which repeats some times.
    pub is_trimmed: bool,
}

impl Document {
    /// The file as it was.
    pub fn bytes(&self) -> &[u8] {
        &self.original
    }

    /// The skeleton that all clips of the document share.
    pub fn skeleton(&self) -> &Arc<Skeleton> {
        &self.skeleton
    }

    /// The pose that its skins were bound in, each joint relative to its parent; `None` where no skin says it.
    pub fn bind_pose(&self) -> Option<&LocalPose> {
        self.bind_pose.as_ref()
    }

    /// How many animations it has.
    pub fn n_animations(&self) -> usize {
        self.animations.len()
    }

    /// Binary or text.
    pub fn form(&self) -> Form {
        match self.container {
            Container::Glb(_) => Form::Glb,
            Container::Text(_) => Form::Text,
        }
    }

    /// The files beside it that it refers to (buffers and images), as paths relative to its folder, sorted. References
    /// that leave the folder are not among them.
    pub fn external_files(&self) -> Vec<String> {
        external_files(&self.root)
    }
}

/// The files that a document refers to.
pub(super) fn external_files(root: &Value) -> Vec<String> {
    let root = At::root(root);
    let lists = ["buffers", "images"].map(|key| root.list(key).unwrap_or_default());
    let mut files: Vec<String> = lists
        .iter()
        .flatten()
        .filter_map(|item| item.text("uri").ok().flatten())
        .filter(|text| !text.get(..5).is_some_and(|scheme| scheme.eq_ignore_ascii_case("data:")))
        .filter_map(|text| match uri::parse(text, "") {
            Ok(Uri::File(path)) => Some(path),
            Ok(Uri::Data(_)) | Err(_) => None,
        })
        .collect();
    files.sort();
    files.dedup();
    files
}

impl fmt::Debug for Document {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Document")
            .field("bytes", &self.original.len())
            .field("joints", &self.skeleton.len())
            .field("animations", &self.animations.len())
            .field("loaded", &self.loaded)
            .finish_non_exhaustive()
    }
}
