//! Which pose of a skeleton counts as its rest.

use std::sync::Arc;

use crate::clip::Clip;
use crate::skeleton::Skeleton;

use super::figure::Figure;

/// Which pose counts as rest: by default the one that the skeleton is read with.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct RestPick {
    /// The pose of a clip at this time in seconds, in place of the skeleton's own.
    pub frame_secs: Option<f64>,
    /// Arms are turned level and legs down: a T-pose made of that pose. See [`Figure::straightened`].
    pub is_straightened: bool,
}

impl RestPick {
    /// The figure in that pose. `clip` is one of the skeleton's, for a frame of it; without, and where it is of other joints, the skeleton's
    /// own pose counts. With `root` only what hangs on that joint is looked at: one figure of several in a file.
    pub fn figure(self, skeleton: &Arc<Skeleton>, clip: Option<&Clip>, root: Option<usize>) -> Figure {
        let at_frame = self.frame_secs.filter(|secs| secs.is_finite()).zip(clip);
        let rest = match at_frame.filter(|(_, clip)| clip.joints.len() == skeleton.len()) {
            Some((secs, clip)) => clip.local_at(secs),
            None => skeleton.zero_pose(),
        };
        let figure = Figure::below(skeleton, rest, root);
        if self.is_straightened { figure.straightened() } else { figure }
    }
}
