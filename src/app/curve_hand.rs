//! What is being done to the curves by hand, and what was copied from them.

use std::sync::Arc;

use crate::clip::{Clip, CopiedKeys};
use crate::skeleton::Skeleton;

use super::view_models::{KeyBase, KeyChoice, KeyDrag, LocalCurves, Stroke};

/// A gesture as far as it has gone, or one that is done and whose result is on its way.
#[derive(Clone, Debug)]
pub struct ShownStroke {
    /// What it does.
    pub stroke: Stroke,
    /// How far it has gone.
    pub drag: Option<KeyDrag>,
    /// The keys that are chosen when it is done.
    pub choice: KeyChoice,
    /// The curves around it, for as long as the worker has not drawn them all.
    pub locals: Vec<LocalCurves>,
}

/// What is being done to the curves by hand.
#[derive(Clone, Debug, Default)]
pub struct CurveHand {
    /// What the gesture under way began with.
    pub base: Option<KeyBase>,
    /// What is to be seen of it.
    pub shown: Option<ShownStroke>,
    copied: Option<(Arc<Skeleton>, CopiedKeys)>,
    /// Tells apart what the keyboard does to one choice from what it does to the next.
    pub serial: u64,
}

impl CurveHand {
    /// Ends what is under way. What was copied stays.
    pub fn let_go(&mut self) {
        self.base = None;
        self.shown = None;
        self.serial += 1;
    }

    /// Keeps keys to be put down elsewhere.
    pub fn copy(&mut self, clip: &Clip, keys: CopiedKeys) {
        self.copied = Some((Arc::clone(&clip.skeleton), keys));
    }

    /// The copied keys, where they are of this clip's joints.
    pub fn copied_for(&self, clip: &Clip) -> Option<&CopiedKeys> {
        let (skeleton, keys) = self.copied.as_ref()?;
        let fits = Arc::ptr_eq(skeleton, &clip.skeleton) || **skeleton == *clip.skeleton;
        Some(keys).filter(|keys| fits && !keys.is_empty())
    }

    /// Whether keys were copied that fit a clip.
    pub fn can_paste(&self, clip: Option<&Arc<Clip>>) -> bool {
        clip.is_some_and(|clip| self.copied_for(clip).is_some())
    }

    /// How far the gesture under way has gone.
    pub fn drag(&self) -> Option<KeyDrag> {
        self.base.as_ref()?;
        self.shown.as_ref()?.drag
    }
}
