//! The two figures of the retarget sheet as the rasteriser takes them: set upright, facing the eye, each filling its picture.

use glam::{DMat3, DVec3};

use crate::raster::{
    Bounds, Camera, Figure, FigureLimb, FigureStyle, Floor, SceneView, Theme, limbs_of_skeleton,
};
use crate::retarget::{self, Transfer};
use crate::rotor::Rotor;
use crate::skeleton::LocalPose;
use crate::skeleton::roles::Role;

/// From where both figures are seen.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CarryEye {
    /// Around up, radians.
    pub yaw_rad: f64,
    /// Above the floor, radians.
    pub pitch_rad: f64,
    /// Distance as a multiple of the one at which a figure fills its picture.
    pub zoom: f64,
}

impl Default for CarryEye {
    fn default() -> Self {
        Self { yaw_rad: 0.45, pitch_rad: 0.12, zoom: 1.0 }
    }
}

/// How a picture is made.
#[derive(Clone, Copy, Debug)]
pub struct CarryPicture {
    /// Pixels.
    pub size_px: [usize; 2],
    /// Pixels per point.
    pub scale: f32,
    /// From where.
    pub eye: CarryEye,
    /// Colours.
    pub theme: Theme,
}

/// A pose and the joints that stand out in it.
#[derive(Clone, Copy, Debug)]
pub struct CarryPose<'a> {
    /// Whose.
    pub figure: &'a retarget::Figure,
    /// The pose.
    pub local: &'a LocalPose,
    /// The chosen joint.
    pub chosen: Option<usize>,
    /// The joint under the pointer.
    pub hovered: Option<usize>,
    /// How it looks.
    pub style: FigureStyle,
}

/// The turn that sets a figure upright, facing +z.
fn upright(figure: &retarget::Figure) -> Rotor {
    let shape = &figure.roles.shape;
    let left = shape.up.cross(shape.forward);
    Rotor::from_matrix(&DMat3::from_cols(left, shape.up, shape.forward)).reverse()
}

/// What stands above the hips is a ball: a line from there to the hips would look like a third leg.
fn limbs(figure: &retarget::Figure, local: &LocalPose, map: impl Fn(DVec3) -> DVec3) -> Vec<FigureLimb> {
    let skeleton = &figure.skeleton;
    let mut limbs = limbs_of_skeleton(skeleton, &skeleton.world(local));
    let above = |joint: &usize| skeleton.parent_joint(*joint);
    let carriers: Vec<usize> =
        std::iter::successors(figure.roles.joint(Role::Hips).as_ref().and_then(above), above).collect();
    for limb in &mut limbs {
        if carriers.contains(&limb.joint) {
            limb.to = limb.from;
        }
        (limb.from, limb.to) = (map(limb.from), map(limb.to));
    }
    limbs
}

/// The box around limbs. What carries a figure may stay behind where the clip began: the picture is of the figure itself, so balls count
/// only where there is nothing else.
fn extent<'a>(limbs: impl IntoIterator<Item = &'a FigureLimb> + Clone) -> Option<Bounds> {
    let own = limbs.clone().into_iter().filter(|limb| limb.from != limb.to);
    let own = Bounds::of_points(own.flat_map(|limb| [limb.from, limb.to]));
    own.or_else(|| Bounds::of_points(limbs.into_iter().map(|limb| limb.from)))
}

/// One figure alone.
pub fn carry_view(picture: &CarryPicture, pose: CarryPose<'_>) -> SceneView {
    let turn = upright(pose.figure);
    let own = limbs(pose.figure, pose.local, |place| turn.apply(place));
    let rest = limbs(pose.figure, &pose.figure.rest, |place| turn.apply(place));
    let size = extent(&rest).map_or(1.0, |all| (all.max - all.min).max_element());
    view_of(picture, vec![(own, pose)], size)
}

/// Both in one picture: the source in the target's size, its hips on the target's; where either has none, its middle.
pub fn carry_overlay(
    picture: &CarryPicture,
    [source, target]: [CarryPose<'_>; 2],
    transfer: Option<&Transfer>,
) -> SceneView {
    let turns = [upright(source.figure), upright(target.figure)];
    let scale = transfer.map_or(1.0, Transfer::scale);
    let its = limbs(target.figure, target.local, |place| turns[1].apply(place));
    let own = limbs(source.figure, source.local, |place| turns[0].apply(place) * scale);
    let middle = |limbs: &[FigureLimb]| {
        extent(limbs).map_or((DVec3::ZERO, 1.0), |all| (all.center(), (all.max - all.min).max_element()))
    };
    let size = middle(&its).1.max(middle(&own).1);
    let hips = |pose: &CarryPose<'_>| {
        let joint = pose.figure.roles.joint(Role::Hips)?;
        Some(pose.figure.skeleton.world(pose.local).get(joint)?.position())
    };
    let [at, its_at] = match (hips(&source), hips(&target)) {
        (Some(own), Some(its)) => [turns[0].apply(own) * scale, turns[1].apply(its)],
        _ => [middle(&own).0, middle(&its).0],
    };
    let own = own
        .into_iter()
        .map(|limb| FigureLimb { from: limb.from - at + its_at, to: limb.to - at + its_at, ..limb })
        .collect();
    view_of(picture, vec![(own, source), (its, target)], size * 1.05)
}

fn view_of(picture: &CarryPicture, figures: Vec<(Vec<FigureLimb>, CarryPose<'_>)>, size: f64) -> SceneView {
    let all = extent(figures.iter().flat_map(|(limbs, _)| limbs));
    let all = all.unwrap_or(Bounds { min: DVec3::ZERO, max: DVec3::ONE });
    let half = DVec3::new(0.36, 0.5, 0.36) * size.max(1e-9);
    let around = Bounds { min: all.center() - half, max: all.center() + half };
    let eye = picture.eye;
    let mut camera = Camera { yaw_rad: eye.yaw_rad, pitch_rad: eye.pitch_rad, ..Camera::default() };
    camera.fit(&around, picture.size_px[0], picture.size_px[1], 0.08);
    camera.zoom(eye.zoom);
    let mut view = SceneView::new(picture.size_px[0], picture.size_px[1], camera, picture.theme);
    view.scale = picture.scale;
    let ground = figures.last().map_or(0.0, |(_, pose)| pose.figure.roles.shape.ground);
    let lowest = all.min.y.min(ground.max(all.min.y - size));
    let mut floor =
        Floor::under(&Bounds { min: DVec3::new(around.min.x, lowest, around.min.z), max: around.max });
    floor.center.x = (all.center().x / floor.step).round() * floor.step;
    floor.center.z = (all.center().z / floor.step).round() * floor.step;
    view.floor = Some(floor);
    view.figures.extend(figures.into_iter().map(|(limbs, pose)| Figure {
        chosen: pose.chosen,
        hovered: pose.hovered,
        ..Figure::new(limbs, pose.style)
    }));
    view
}
