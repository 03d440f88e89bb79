//! Feet that stand in the source stand in the result.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::{
    Clip, ContactOptions, Foot, FootPart, JointPoint, JointTracks, PlantedSpan, Trails, VectorTrack,
    contacts, leg_lengths, median_place,
};
use crate::mend::{PlantOptions, plant_feet_at};
use crate::skeleton::roles::{Role, Side};

use super::figure::Figure;
use super::plan::{Plan, Root};
use super::report::{LargestCorrection, Missed, Report};
use super::smooth::SmoothCurve;

/// A planted point that lies higher than this above its usual height stands on something; in leg lengths.
const STEP: f64 = 0.06;

/// Finds where feet are planted in the source and holds them in the result: at one place each, as high above the ground as they stand in the
/// target's rest pose.
pub(super) fn hold_feet(
    clip: &Clip,
    source: &Figure,
    target: &Figure,
    plan: &Plan,
    result: Clip,
    report: &mut Report,
) -> Clip {
    let both: Vec<[Foot; 2]> =
        Side::BOTH.iter().filter_map(|&side| Some([foot(source, side)?, foot(target, side)?])).collect();
    if both.is_empty() {
        report.notes.push("no feet were found in both skeletons, so none were held".to_owned());
        return result;
    }
    let sources: Vec<Foot> = both.iter().map(|[own, _]| *own).collect();
    let targets: Vec<Foot> = both.iter().map(|[_, own]| *own).collect();
    let shapes = [&source.roles.shape, &target.roles.shape];
    let options = ContactOptions { up: shapes[0].up, ..ContactOptions::default() };
    let found = contacts(clip, &sources, &options);
    let mut spans = Vec::with_capacity(found.spans.len());
    let mut heights = Vec::with_capacity(found.spans.len());
    let points: Vec<_> = sources.iter().flat_map(|foot| [foot.heel, foot.ball]).collect();
    let trails = Trails::of(clip, &points);
    for span in &found.spans {
        let foot = &targets[span.foot];
        // A foot that is one point stands on that.
        let part = if foot.parts().contains(&span.part) { span.part } else { FootPart::Heel };
        let row = &trails.rows[2 * span.foot + usize::from(span.part == FootPart::Ball)];
        let standing = standing_height(row, shapes[0].up);
        let above = median_place(row, span.frames()).dot(shapes[0].up) - standing;
        let above = if above > STEP * found.leg { above * plan.scale } else { 0.0 };
        heights.push(rest_height(target, foot, part, plan).map(|height| height + above));
        spans.push(PlantedSpan { part, ..*span });
    }
    report.n_plants = spans.len();
    let result = match &plan.root {
        Some(root) => within_reach(result, target, root, &targets, &spans, &heights, report),
        None => result,
    };
    let options = PlantOptions { up: shapes[1].up, ..PlantOptions::default() };
    let (held, plants) = plant_feet_at(&result, &targets, &spans, &heights, &options);
    let sum = |slides: &[crate::clip::Slide]| slides.iter().map(|slide| slide.path).sum::<f64>();
    let most = |slides: &[crate::clip::Slide]| slides.iter().map(|slide| slide.farthest).fold(0.0, f64::max);
    report.slide = Some([sum(&plants.before), sum(&plants.after)]);
    report.drift = Some([most(&plants.before), most(&plants.after)]);
    report.largest_correction = plants
        .changes
        .iter()
        .map(|(&joint, &(by_rad, frame))| LargestCorrection { joint, by_rad, frame })
        .max_by(|a, b| a.by_rad.total_cmp(&b.by_rad));
    report.missed.extend(plants.misses.iter().map(|miss| Missed {
        what: "the leg does not reach the place where the foot is planted".to_owned(),
        joint: targets[miss.foot].limb.end,
        frame: miss.frame,
        by: miss.by,
    }));
    held
}

/// Moves the hips smoothly down so that planted feet come into reach.
fn within_reach(
    result: Clip,
    target: &Figure,
    root: &Root,
    feet: &[Foot],
    spans: &[PlantedSpan],
    heights: &[Option<f64>],
    report: &mut Report,
) -> Clip {
    /// The share of a leg's length that it is stretched to at most.
    const STRETCH: f64 = 0.98;
    let up = target.roles.shape.up;
    let points: Vec<JointPoint> = feet
        .iter()
        .flat_map(|foot| {
            let end = JointPoint { joint: foot.limb.end, offset: foot.limb.end_point };
            [JointPoint::of(foot.limb.upper), end, foot.heel, foot.ball]
        })
        .collect();
    let trails = Trails::of(&result, &points);
    let legs = leg_lengths(&result, feet);
    let count = result.grid.count();
    // How far down the hips should be in frames with a planted foot.
    let mut needed: Vec<Option<f64>> = vec![None; count];
    for (span, height) in spans.iter().zip(heights) {
        let row = |which: usize| &trails.rows[4 * span.foot + which];
        let point = row(if span.part == FootPart::Ball { 3 } else { 2 });
        let mut place = median_place(point, span.frames());
        if let Some(height) = height {
            place += up * (height - place.dot(up));
        }
        for frame in span.frames() {
            let end = row(1)[frame] + place - point[frame];
            let away = row(0)[frame] - end;
            let above = away.dot(up);
            let aside = (away - up * above).length();
            let reach = STRETCH * legs[span.foot];
            let most = if aside < reach { (reach * reach - aside * aside).sqrt() } else { 0.0 };
            let lower = (above - most).max(0.0);
            let own = needed[frame].get_or_insert(0.0);
            *own = own.max(lower);
        }
    }
    let known: Vec<(f64, f64)> = needed
        .iter()
        .enumerate()
        .filter_map(|(frame, own)| Some((result.grid.time(frame), (*own)?)))
        .collect();
    let largest = known.iter().map(|(_, lower)| *lower).fold(0.0, f64::max);
    let is_worth = largest > 1e-6 * target.roles.shape.leg_length && largest.is_finite();
    let Some(track) = result.joints[root.target].translation.as_ref().filter(|_| is_worth) else {
        return result;
    };
    let curve = SmoothCurve::through(&known, result.duration_secs);
    report.hips_shift = (0..count).map(|frame| curve.at(result.grid.time(frame)).abs()).fold(0.0, f64::max);
    let down = root.parent_from_scene.transform_vector3(-up);
    let keys: Vec<DVec3> =
        track.times.iter().zip(track.keys.iter()).map(|(secs, key)| *key + down * curve.at(secs)).collect();
    let translation = Some(VectorTrack::straight(track.times.clone(), keys));
    let mut moved = result.clone();
    let tracks = (*moved.joints[root.target]).clone();
    moved.joints[root.target] = Arc::new(JointTracks { translation, ..tracks });
    moved
}

/// A leg with its foot.
fn foot(figure: &Figure, side: Side) -> Option<Foot> {
    let joint = |role| figure.roles.joint(role);
    Foot::new(
        &figure.skeleton,
        joint(Role::UpperLeg(side))?,
        joint(Role::LowerLeg(side))?,
        joint(Role::Foot(side))?,
        joint(Role::Toes(side)),
    )
}

/// The height along up below which a point lies in a twentieth of the frames.
fn standing_height(row: &[DVec3], up: DVec3) -> f64 {
    let mut heights: Vec<f64> =
        row.iter().map(|place| place.dot(up)).filter(|height| height.is_finite()).collect();
    heights.sort_by(f64::total_cmp);
    heights.get(heights.len() / 20).copied().unwrap_or(0.0)
}

/// How high a point of a foot stands in the scene when the foot is flat, as the rest pose has it. `None` where feet do not stand at rest.
fn rest_height(target: &Figure, foot: &Foot, part: FootPart, plan: &Plan) -> Option<f64> {
    let shape = &target.roles.shape;
    let ground = plan.root.as_ref().map(|root| root.ground)?;
    let stands = shape.ankle_height > 0.01 * shape.leg_length && shape.ankle_height < 0.4 * shape.leg_length;
    if !stands {
        return None;
    }
    let point = foot.point(part);
    let world = target.skeleton.world(&target.rest)[point.joint];
    Some(ground + world.scene_from_joint.transform_point3(point.offset).dot(shape.up) - shape.ground)
}
