//! Which pose of a skeleton counts as its rest.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::Clip;
use crate::skeleton::Skeleton;
use crate::skeleton::roles::Role;

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
        let own = Figure::below(skeleton, skeleton.zero_pose(), root);
        let at_frame = self.frame_secs.filter(|secs| secs.is_finite()).zip(clip);
        let figure = match at_frame.filter(|(_, clip)| clip.joints.len() == skeleton.len()) {
            Some((secs, clip)) => own.posed(clip.local_at(secs), up_in(clip, &own)),
            None => own,
        };
        if self.is_straightened { figure.straightened() } else { figure }
    }
}

/// Where up is in a clip: as in the figure's own rest, unless the figure is on the whole turned otherwise all through; then the axis that it
/// keeps to most.
fn up_in(clip: &Clip, figure: &Figure) -> DVec3 {
    /// Poses that are looked at.
    const POSES: usize = 200;
    /// The cosine of the angle (45°) to which up is taken for the same.
    const SAME: f64 = 0.707;
    let shape = &figure.roles.shape;
    let Some(top) = figure.roles.joint(Role::Hips).or_else(|| figure.skeleton.listed().next()) else {
        return shape.up;
    };
    let every = clip.grid.count().div_ceil(POSES).max(1);
    let times: Vec<f64> = (0..clip.grid.count()).step_by(every).map(|frame| clip.grid.time(frame)).collect();
    let worlds = clip.worlds_at(&times);
    let mean: DVec3 = (0..times.len())
        .map(|time| worlds.rotation(top, time).apply(shape.rotations[top].reverse().apply(shape.up)))
        .sum();
    let Some(mean) = mean.try_normalize().filter(|mean| mean.dot(shape.up) < SAME) else { return shape.up };
    let axes = DVec3::AXES.into_iter().flat_map(|axis| [axis, -axis]);
    axes.fold(shape.up, |best, axis| if axis.dot(mean) > best.dot(mean) + 1e-9 { axis } else { best })
}
