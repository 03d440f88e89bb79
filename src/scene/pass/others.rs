//! What a pass may ask of the document's other clips.

use std::sync::Arc;

use crate::clip::Clip;
use crate::skeleton::Skeleton;

/// Names a clip of the document.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct ClipRef {
    /// Index of the source in the document.
    pub source: usize,
    /// Index of the clip in that source.
    pub clip: usize,
}

/// Something that a pass takes from outside its own clip.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Need {
    /// Another clip.
    Clip(ClipRef),
    /// The skeleton of a source.
    Skeleton(usize),
}

/// The other clips and skeletons that are open.
pub trait Others {
    /// A clip as its own passes leave it; as read where the document does nothing to it. `None` where it is not open, or
    /// where its passes would need the very clip that is being asked for.
    fn clip(&self, clip: ClipRef) -> Option<Arc<Clip>>;

    /// The skeleton of a source, which need not have a clip.
    fn skeleton(&self, source: usize) -> Option<Arc<Skeleton>>;
}

/// Nothing else is open.
#[derive(Clone, Copy, Debug, Default)]
pub struct NoOthers;

impl Others for NoOthers {
    fn clip(&self, _clip: ClipRef) -> Option<Arc<Clip>> {
        None
    }

    fn skeleton(&self, _source: usize) -> Option<Arc<Skeleton>> {
        None
    }
}
