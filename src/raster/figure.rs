//! A pose as limbs: how thick they are, how they are drawn, and which joint is under the pointer.

use glam::{DVec2, DVec3};

use crate::raster::camera::{Bounds, View};
use crate::raster::canvas::{Canvas, Dash, Hidden, Spot, Stroke};
use crate::raster::limb::{SolidCone, SolidStyle};
use crate::raster::palette::{Color, Theme};
use crate::raster::shape::RoundCone;
use crate::skeleton::{Skeleton, WorldJoint};

/// One limb of a pose.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FigureLimb {
    /// Where the limb's joint stands, world.
    pub from: DVec3,
    /// Where it ends: at a child joint or a tip. The same place as `from` makes a small ball.
    pub to: DVec3,
    /// The joint that turns this limb.
    pub joint: usize,
}

/// The limbs of a posed skeleton: from each joint to each of its children and tips, and a small ball for a joint with
/// neither.
///
/// `world` has one entry for each joint, carriers included, as [`Skeleton::world`] gives it. Carriers are not drawn:
/// limbs run from joint to joint across them.
pub fn limbs_of_skeleton(skeleton: &Skeleton, world: &[WorldJoint]) -> Vec<FigureLimb> {
    let mut has_limb = vec![false; skeleton.len()];
    let mut limbs = Vec::with_capacity(skeleton.len() * 2);
    let place = |joint: usize| world.get(joint).map(WorldJoint::position);
    for joint in skeleton.listed() {
        let Some(at) = place(joint) else { continue };
        if let Some(parent) = skeleton.parent_joint(joint)
            && let Some(from) = place(parent)
        {
            has_limb[parent] = true;
            limbs.push(FigureLimb { from, to: at, joint: parent });
        }
        for &tip in &skeleton.joints()[joint].tips {
            has_limb[joint] = true;
            limbs.push(FigureLimb {
                from: at,
                to: world[joint].scene_from_joint.transform_point3(tip),
                joint,
            });
        }
    }
    for joint in skeleton.listed().filter(|&joint| !has_limb[joint]) {
        limbs.extend(place(joint).map(|at| FigureLimb { from: at, to: at, joint }));
    }
    limbs
}

/// How thick the limbs of one skeleton are, whatever its unit.
///
/// Made once from a pose, or best from the rest pose, and kept, so that limbs do not swell and shrink while they move.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Girth {
    /// The length of a long limb of this skeleton, world units.
    long_limb: f64,
    /// Whether there are enough limbs to tell which of them are far too long to be one.
    has_ties: bool,
}

impl Girth {
    /// From the limbs of a pose. Works for a skeleton one unit or two hundred units high.
    pub fn of_limbs(limbs: &[FigureLimb]) -> Self {
        let mut lengths: Vec<f64> = limbs
            .iter()
            .map(|limb| limb.from.distance(limb.to))
            .filter(|length| length.is_finite() && *length > 0.0)
            .collect();
        lengths.sort_by(f64::total_cmp);
        // Not the longest: one limb may reach from the world's origin to the hips.
        let place = lengths.len().saturating_sub(1) * 9 / 10;
        // Joints that hang on nothing have no limbs: their balls go by how far apart they are.
        let spread =
            || Bounds::of_points(limbs.iter().map(|limb| limb.from)).map(|bounds| bounds.size() / 4.0);
        let long_limb = lengths.get(place).copied().or_else(spread).filter(|length| *length > 0.0);
        Self { long_limb: long_limb.unwrap_or(1.0), has_ties: lengths.len() >= 8 }
    }

    /// From the rest pose, which no clip changes.
    pub fn of_skeleton(skeleton: &Skeleton) -> Self {
        Self::of_limbs(&limbs_of_skeleton(skeleton, &skeleton.world(&skeleton.rest_pose())))
    }

    /// Whether a limb of this length is only a tie: from the world's origin to the hips, or from the body to a handle
    /// that steers a foot. Such ties are drawn thin, or they would hide the figure.
    fn is_tie(self, length: f64) -> bool {
        self.has_ties && length > 2.0 * self.long_limb
    }

    /// Radius at the joint and at the end of a limb of this length.
    fn radii(self, length: f64) -> [f64; 2] {
        if self.is_tie(length) {
            return [0.02 * self.long_limb; 2];
        }
        if length <= 1e-9 * self.long_limb {
            return [0.055 * self.long_limb; 2];
        }
        // Between "all alike" and "as thick as long": short spine joints keep a body, fingers stay fingers.
        let at_joint = 0.115 * (length * self.long_limb).sqrt();
        let at_joint = at_joint.clamp(0.025 * self.long_limb, 0.15 * self.long_limb);
        [at_joint, 0.62 * at_joint]
    }
}

/// What a figure stands for, and with it its looks.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum FigureStyle {
    /// The result: solid limbs in colour.
    After,
    /// The source: thin and grey.
    Before,
    /// A neighbouring pose: faint, grey, dashed.
    Ghost,
}

impl FigureStyle {
    /// Whether the floor shows its shadow: one is enough.
    pub fn casts_shadow(self) -> bool {
        self == Self::After
    }
}

/// A pose to draw.
#[derive(Clone, Debug, PartialEq)]
pub struct Figure {
    /// Its limbs.
    pub limbs: Vec<FigureLimb>,
    /// How thick they are.
    pub girth: Girth,
    /// How they look.
    pub style: FigureStyle,
    /// Joint whose limbs stand out.
    pub chosen: Option<usize>,
    /// Joint under the pointer.
    pub hovered: Option<usize>,
}

impl Figure {
    /// A figure with nothing chosen, as thick as its own limbs suggest.
    pub fn new(limbs: Vec<FigureLimb>, style: FigureStyle) -> Self {
        let girth = Girth::of_limbs(&limbs);
        Self { limbs, girth, style, chosen: None, hovered: None }
    }

    /// Whether a limb is only a tie: see [`Girth`].
    pub(super) fn is_tie(&self, limb: &FigureLimb) -> bool {
        self.girth.is_tie(limb.from.distance(limb.to))
    }

    /// The box around all limb ends; nothing when none is finite.
    pub fn bounds(&self) -> Option<Bounds> {
        Bounds::of_points(self.limbs.iter().flat_map(|limb| [limb.from, limb.to]))
    }

    /// The joint whose limb is under `pixel`: the nearest to the eye of those hit, else the closest within
    /// `slack_px` pixels.
    pub fn pick(&self, view: &View, pixel: DVec2, slack_px: f32) -> Option<usize> {
        self.pick_all(view, pixel, slack_px).first().copied()
    }

    /// All joints whose limbs are under `pixel`, the nearest to the eye first; where none is hit, the closest within `slack_px`
    /// pixels. Each joint once.
    pub fn pick_all(&self, view: &View, pixel: DVec2, slack_px: f32) -> Vec<usize> {
        let mut hits: Vec<(f32, usize)> = Vec::new();
        let mut beside: Option<(f32, usize)> = None;
        for limb in &self.limbs {
            let Some(cone) = solid_cone(view, limb, self.girth, 1.0, 1.0) else { continue };
            let sample = cone.shape.frame().sample(pixel.as_vec2() - cone.shape.frame().origin());
            let key = cone.key_a + (cone.key_b - cone.key_a) * sample.t;
            if sample.distance <= 0.0 {
                let surface = key + cone.bulge_a + (cone.bulge_b - cone.bulge_a) * sample.t;
                hits.push((surface, limb.joint));
            } else if sample.distance <= slack_px && beside.is_none_or(|(least, _)| sample.distance < least) {
                beside = Some((sample.distance, limb.joint));
            }
        }
        if hits.is_empty() {
            return beside.into_iter().map(|(_, joint)| joint).collect();
        }
        hits.sort_by(|a, b| b.0.total_cmp(&a.0));
        let mut joints: Vec<usize> = Vec::new();
        for (_, joint) in hits {
            if !joints.contains(&joint) {
                joints.push(joint);
            }
        }
        joints
    }
}

/// The limb in the picture; nothing when it is behind the eye or not finite. Radii are multiplied by `thickness` and
/// are at least `least_px` pixels.
pub(super) fn solid_cone(
    view: &View,
    limb: &FigureLimb,
    girth: Girth,
    thickness: f64,
    least_px: f32,
) -> Option<SolidCone> {
    let [radius_from, radius_to] = girth.radii(limb.from.distance(limb.to)).map(|radius| radius * thickness);
    let [(a, part_a), (b, part_b)] = view.project_line(limb.from, limb.to)?;
    let radius = |part: f64| radius_from + (radius_to - radius_from) * part;
    let px = |part: f64, px_per_unit: f64| ((radius(part) * px_per_unit) as f32).max(least_px);
    Some(SolidCone {
        shape: RoundCone {
            a: a.pixel.as_vec2(),
            b: b.pixel.as_vec2(),
            radius_a: px(part_a, a.px_per_unit),
            radius_b: px(part_b, b.px_per_unit),
        },
        key_a: view.key(a.depth),
        key_b: view.key(b.depth),
        bulge_a: view.key_slope(a.depth) * radius(part_a) as f32,
        bulge_b: view.key_slope(b.depth) * radius(part_b) as f32,
    })
}

/// Draws figures together, so that their limbs hide each other. `scale` is pixels per point.
pub(super) fn draw_figures(canvas: &mut Canvas, view: &View, figures: &[&Figure], theme: &Theme, scale: f32) {
    let mut solids: Vec<(f32, SolidCone, SolidStyle)> = Vec::new();
    for figure in figures {
        let depth_of = |limb: &FigureLimb| view.to_view(limb.from.midpoint(limb.to)).z;
        let depths = figure.limbs.iter().map(depth_of).filter(|depth| depth.is_finite());
        let nearest_depth = depths.fold(f64::INFINITY, f64::min);
        for limb in &figure.limbs {
            let cone = match figure.style {
                FigureStyle::After => solid_cone(view, limb, figure.girth, 1.0, 0.75 * scale),
                FigureStyle::Before => solid_cone(view, limb, figure.girth, 0.28, 1.1 * scale),
                FigureStyle::Ghost => None,
            };
            if let Some(cone) = cone {
                let mut style = limb_style(figure, limb, theme, scale);
                let behind = (depth_of(limb) - nearest_depth) / figure.girth.long_limb;
                style.color = style.color.mix(theme.background, fade(behind));
                solids.push((cone.key_a.midpoint(cone.key_b), cone, style));
            }
        }
    }
    solids.sort_by(|a, b| a.0.total_cmp(&b.0));
    for (_, cone, style) in &solids {
        canvas.solid(cone, style);
    }
    for figure in figures.iter().filter(|figure| figure.style == FigureStyle::Ghost) {
        draw_ghost(canvas, view, figure, theme, scale);
    }
}

/// How much of the background a limb takes on that is so many long limbs behind the figure's nearest one: the far arm
/// is a little paler than the near one.
fn fade(behind: f64) -> f32 {
    (0.11 * behind).clamp(0.0, 0.32) as f32
}

fn limb_style(figure: &Figure, limb: &FigureLimb, theme: &Theme, scale: f32) -> SolidStyle {
    let length = limb.from.distance(limb.to);
    let is_plain = length == 0.0 || figure.girth.is_tie(length);
    let is_chosen = figure.chosen == Some(limb.joint);
    let is_hovered = figure.hovered == Some(limb.joint);
    let base = match figure.style {
        FigureStyle::After => theme.after,
        FigureStyle::Before | FigureStyle::Ghost => theme.before,
    };
    let color = if is_chosen { theme.selection } else { base };
    let color = if is_hovered { color.mix(Color::rgb(0xFF_FF_FF), 0.3) } else { color };
    let color = if figure.girth.is_tie(length) { color.mix(theme.background, 0.45) } else { color };
    let is_solid = figure.style == FigureStyle::After;
    SolidStyle {
        color,
        has_mark: is_solid && !is_plain,
        ring: is_chosen.then_some((1.25 * scale, theme.text)),
        halo: if is_solid { 3.0 * scale } else { 0.5 },
    }
}

fn draw_ghost(canvas: &mut Canvas, view: &View, figure: &Figure, theme: &Theme, scale: f32) {
    let stroke = Stroke {
        color: theme.ghost.with_alpha(0.75),
        width: 1.2 * scale,
        dash: Some(Dash { on: 5.0 * scale, off: 4.0 * scale }),
        hidden: Hidden::Cut,
    };
    for limb in &figure.limbs {
        if limb.from == limb.to {
            canvas.dot(view, limb.from, 1.5 * scale, stroke.color, Hidden::Cut);
        } else if let Some([(a, _), (b, _)]) = view.project_line(limb.from, limb.to) {
            canvas.line_with(Spot::new(view, &a), Spot::new(view, &b), &stroke, 0.0, |_| 1.0);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::raster::camera::Camera;
    use crate::skeleton::{Joint, JointKind, Transform};

    fn joint(parent: Option<usize>, offset: DVec3, tips: &[DVec3]) -> Joint {
        Joint {
            name: String::new(),
            number: 0,
            parent,
            rest: Transform::from_translation(offset),
            kind: JointKind::Joint,
            tips: tips.to_vec(),
        }
    }

    fn limbs_at_rest(joints: Vec<Joint>) -> Vec<FigureLimb> {
        let skeleton = Skeleton::new(joints).unwrap();
        limbs_of_skeleton(&skeleton, &skeleton.world(&skeleton.rest_pose()))
    }

    fn arm(scale: f64) -> Figure {
        let limbs = limbs_at_rest(vec![
            joint(None, DVec3::ZERO, &[]),
            joint(Some(0), DVec3::X * scale, &[]),
            joint(Some(1), DVec3::X * 0.6 * scale, &[DVec3::X * 0.2 * scale]),
        ]);
        Figure::new(limbs, FigureStyle::After)
    }

    #[test]
    fn limbs_reach_to_children_and_tips_over_carriers_and_lone_joints_get_balls() {
        let carrier = Joint { kind: JointKind::Carrier, ..joint(Some(0), DVec3::Y, &[]) };
        let limbs = limbs_at_rest(vec![
            joint(None, DVec3::ZERO, &[]),
            carrier,
            joint(Some(1), DVec3::X, &[DVec3::Z]),
            joint(Some(0), DVec3::X, &[]),
            joint(None, DVec3::Z, &[]),
        ]);
        let found: Vec<(usize, DVec3, DVec3)> =
            limbs.iter().map(|limb| (limb.joint, limb.from, limb.to)).collect();
        let far = DVec3::new(1.0, 1.0, 0.0);
        let expected = [
            (0, DVec3::ZERO, far),
            (2, far, DVec3::ONE),
            (0, DVec3::ZERO, DVec3::X),
            (3, DVec3::X, DVec3::X),
            (4, DVec3::Z, DVec3::Z),
        ];
        assert_eq!(found, expected);
    }

    #[test]
    fn limbs_are_as_thick_at_any_unit_and_ignore_broken_ones() {
        let (small, large) = (arm(1.0), arm(200.0));
        for (a, b) in small.limbs.iter().zip(&large.limbs) {
            let [from_a, to_a] = small.girth.radii(a.from.distance(a.to));
            let [from_b, to_b] = large.girth.radii(b.from.distance(b.to));
            assert!((from_a * 200.0 - from_b).abs() < 1e-9 && (to_a * 200.0 - to_b).abs() < 1e-9);
            assert!(from_a > to_a && from_a < 0.2);
        }
        let broken = FigureLimb { from: DVec3::NAN, to: DVec3::ZERO, joint: 0 };
        assert_eq!(Girth::of_limbs(&[broken]), Girth { long_limb: 1.0, has_ties: false });
        assert_eq!(Figure::new(vec![broken], FigureStyle::After).bounds().unwrap().size(), 0.0);
    }

    #[test]
    fn a_tie_to_the_worlds_origin_is_thin_but_a_long_boom_is_not() {
        let chain = |count: usize, last: f64| {
            let place = |i: usize| DVec3::X * (i as f64 + if i == count { last - 1.0 } else { 0.0 });
            (0..count).map(|i| FigureLimb { from: place(i), to: place(i + 1), joint: i }).collect::<Vec<_>>()
        };
        let many = Girth::of_limbs(&chain(12, 6.0));
        assert!(many.is_tie(6.0) && !many.is_tie(1.9));
        assert!(many.radii(6.0)[0] < many.radii(1.0)[0] / 3.0);
        let few = Girth::of_limbs(&chain(4, 6.0));
        assert!(!few.is_tie(6.0));
    }

    #[test]
    fn picking_takes_the_limb_under_the_pixel_and_the_nearest_of_two() {
        let mut figure = arm(1.0);
        let mut camera = Camera { yaw_rad: 0.0, pitch_rad: 0.0, ..Camera::default() };
        camera.fit(&figure.bounds().unwrap(), 200, 100, 0.2);
        let view = camera.view(200, 100);
        let pixel_of = |point| view.project(point).unwrap().pixel;
        assert_eq!(figure.pick(&view, pixel_of(DVec3::new(0.5, 0.0, 0.0)), 0.0), Some(0));
        assert_eq!(figure.pick(&view, pixel_of(DVec3::new(1.3, 0.0, 0.0)), 0.0), Some(1));
        let above = pixel_of(DVec3::new(1.3, 0.2, 0.0));
        assert_eq!(figure.pick(&view, above, 0.0), None);
        assert_eq!(figure.pick(&view, above, 30.0), Some(1));
        figure.limbs.push(FigureLimb {
            from: DVec3::new(0.5, -1.0, 0.3),
            to: DVec3::new(0.5, 1.0, 0.3),
            joint: 9,
        });
        assert_eq!(figure.pick(&view, pixel_of(DVec3::new(0.5, 0.0, 0.0)), 0.0), Some(9));
        assert_eq!(figure.pick_all(&view, pixel_of(DVec3::new(0.5, 0.0, 0.0)), 0.0), [9, 0]);
    }
}
