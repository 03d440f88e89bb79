//! Feet that stand in the source stand in the result.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::{
    Clip, ContactOptions, Foot, FootPart, JointPoint, JointTracks, PlantedSpan, Slide, Trails, VectorTrack,
    contacts, leg_lengths, median_place, slide_of,
};
use crate::mend::{PlantOptions, faded, move_end, plant_feet_at};
use crate::skeleton::roles::{Role, Side};

use super::figure::Figure;
use super::keep::{Goal, WEIGHT_SECS, hips_by, weight};
use super::options::{FootContact, frames_of};
use super::plan::{Plan, Root};
use super::report::{Missed, Report};
use super::smooth::SmoothCurve;

/// A planted point that lies higher than this above its usual height stands on something; in leg lengths.
const STEP: f64 = 0.06;

/// What is off by less than this share of the limb is met.
pub(super) const LEAST_MISS: f64 = 1e-3;

/// What holds a foot of another build is large: so long it takes to fade, in seconds. From one plant to the next of a walk it changes over the whole
/// step.
const FADE_SECS: f64 = 0.4;

/// A foot that wanders this far while it is down, in leg lengths, has been set anew meanwhile.
const WANDER: f64 = 0.15;

/// Seconds around the moment at which a foot is set anew in which it counts as free, to both sides.
const RESET_SECS: f64 = 0.1;

/// Feet that were held, for measuring what became of them.
pub(super) struct Held {
    feet: Vec<Foot>,
    spans: Vec<PlantedSpan>,
    legs: Vec<f64>,
    hinges: [Option<DVec3>; 2],
    up: DVec3,
}

/// Where the feet of a clip stand by themselves: the contacts that [`retarget`](super::retarget()) holds when nobody says which.
pub fn find_contacts(clip: &Clip, figure: &Figure) -> Vec<FootContact> {
    let feet: Vec<(Side, Foot)> =
        Side::BOTH.iter().filter_map(|&side| Some((side, foot(figure, side)?))).collect();
    let own: Vec<Foot> = feet.iter().map(|(_, foot)| *foot).collect();
    let options = ContactOptions { up: figure.roles.shape.up, ..ContactOptions::default() };
    steady_contacts(clip, &own, &options)
        .iter()
        .map(|span| FootContact {
            side: feet[span.foot].0,
            part: span.part,
            span_secs: [clip.grid.time(span.first_frame), clip.grid.time(span.last_frame)],
        })
        .collect()
}

/// The spans in which feet are planted and stay at one place. One that shuffles along the ground for long, slowly as it may, has no one place: its span
/// is parted where it moves fastest, until each part has one.
fn steady_contacts(clip: &Clip, feet: &[Foot], options: &ContactOptions) -> Vec<PlantedSpan> {
    let step_secs = clip.grid.times.median_step().unwrap_or(1.0);
    let reset = ((RESET_SECS / step_secs).round() as usize).max(1);
    let points: Vec<JointPoint> = feet.iter().flat_map(|foot| [foot.heel, foot.ball]).collect();
    let rows = Trails::of(clip, &points).rows;
    let legs = leg_lengths(clip, feet);
    let level = |v: DVec3| v - options.up * v.dot(options.up);
    let mut open = contacts(clip, feet, options).spans;
    open.reverse();
    let mut steady = Vec::with_capacity(open.len());
    while let Some(span) = open.pop() {
        let row = &rows[2 * span.foot + usize::from(span.part == FootPart::Ball)];
        let (first, last) = (span.first_frame, span.last_frame);
        let own = || row[first..=last].iter().map(|place| level(*place));
        let low = own().fold(DVec3::INFINITY, DVec3::min);
        let high = own().fold(DVec3::NEG_INFINITY, DVec3::max);
        // Each part is to last as long as its ends are cut away, and longer.
        let inner = first + 3 * reset..(last + 1).saturating_sub(3 * reset);
        if (high - low).length() <= WANDER * legs[span.foot] || inner.is_empty() {
            steady.push(span);
            continue;
        }
        let speed = |frame: usize| level(row[frame + reset] - row[frame - reset]).length();
        let Some(at) = inner.max_by(|&a, &b| speed(a).total_cmp(&speed(b))) else { continue };
        open.push(PlantedSpan { first_frame: at + reset, ..span });
        open.push(PlantedSpan { last_frame: at - reset, ..span });
    }
    steady.sort_unstable();
    steady
}

/// Holds feet in the result where they are planted in the source, or where `said` says: at one place each, as high above the ground as
/// they stand in the target's rest pose.
pub(super) fn hold_feet(
    clip: &Clip,
    [source, target]: [&Figure; 2],
    plan: &Plan,
    said: Option<&[FootContact]>,
    result: Clip,
    report: &mut Report,
) -> (Clip, Option<Held>) {
    let both: Vec<(Side, [Foot; 2])> = Side::BOTH
        .iter()
        .filter_map(|&side| Some((side, [foot(source, side)?, foot(target, side)?])))
        .collect();
    if both.is_empty() {
        report.notes.push("no feet were found in both skeletons, so none were held".to_owned());
        return (result, None);
    }
    let sources: Vec<Foot> = both.iter().map(|(_, [own, _])| *own).collect();
    let targets: Vec<Foot> = both.iter().map(|(_, [_, own])| *own).collect();
    let shapes = [&source.roles.shape, &target.roles.shape];
    let source_spans = match said {
        None => {
            let options = ContactOptions { up: shapes[0].up, ..ContactOptions::default() };
            steady_contacts(clip, &sources, &options)
        }
        Some(said) => said_spans(clip, said, &both, report),
    };
    let mut spans = Vec::with_capacity(source_spans.len());
    let mut heights = Vec::with_capacity(source_spans.len());
    let points: Vec<_> = sources.iter().flat_map(|foot| [foot.heel, foot.ball]).collect();
    let trails = Trails::of(clip, &points);
    let source_legs = leg_lengths(clip, &sources);
    let standing: Vec<f64> = trails.rows.iter().map(|row| standing_height(row, shapes[0].up)).collect();
    for span in &source_spans {
        let foot = &targets[span.foot];
        // A foot that is one point stands on that.
        let part = if foot.parts().contains(&span.part) { span.part } else { FootPart::Heel };
        let row = 2 * span.foot + usize::from(span.part == FootPart::Ball);
        let above = median_place(&trails.rows[row], span.frames()).dot(shapes[0].up) - standing[row];
        let above = if above > STEP * source_legs[span.foot] { above * plan.scale } else { 0.0 };
        heights.push(rest_height(target, foot.point(part), plan).map(|height| height + above));
        spans.push(PlantedSpan { part, ..*span });
    }
    report.n_plants = spans.len();
    let result = match &plan.root {
        Some(root) => {
            let reaching = within_reach(result, target, root, &targets, &spans, &heights, report);
            steadied(&reaching, root, &targets, &spans)
        }
        None => result,
    };
    // A person's knees bend where the figure says, whether or not the clip ever bends them.
    let mut hinges = [None; 2];
    for (hinge, foot) in hinges.iter_mut().zip(&targets) {
        let knee = foot.limb.lower;
        *hinge = shapes[1].hinge(knee).map(|axis| shapes[1].rotations[knee].reverse().apply(axis));
    }
    let options = PlantOptions {
        up: shapes[1].up,
        fade_secs: FADE_SECS,
        keeps_rates: true,
        hinges,
        ..PlantOptions::default()
    };
    let (held, plants) = plant_feet_at(&result, &targets, &spans, &heights, &options);
    report.slide = Some([sum(&plants.before), sum(&plants.after)]);
    report.drift = Some([most(&plants.before), most(&plants.after)]);
    report.note_changes(&plants.changes);
    let legs = leg_lengths(&held, &targets);
    report.missed.extend(plants.misses.iter().filter(|miss| miss.by > LEAST_MISS * legs[miss.foot]).map(
        |miss| Missed {
            what: "the leg does not reach the place where the foot is planted".to_owned(),
            joint: targets[miss.foot].limb.end,
            frame: miss.frame,
            by: miss.by,
        },
    ));
    let held = above_ground(held, target, plan, &targets, &spans, &legs, report);
    (held, Some(Held { feet: targets, spans, legs, hinges, up: shapes[1].up }))
}

/// What somebody said of feet, as spans of frames. What lies outside the clip, or speaks of a foot that is not there, is told.
fn said_spans(
    clip: &Clip,
    said: &[FootContact],
    both: &[(Side, [Foot; 2])],
    report: &mut Report,
) -> Vec<PlantedSpan> {
    let mut spans = Vec::with_capacity(said.len());
    for own in said {
        let foot = both.iter().position(|(side, _)| *side == own.side);
        let frames = frames_of(clip, own.span_secs);
        if let (Some(foot), Some((first_frame, last_frame))) = (foot, frames) {
            spans.push(PlantedSpan { foot, part: own.part, first_frame, last_frame });
        } else {
            let why = if foot.is_none() {
                "there is no such foot in both figures"
            } else {
                "it lies outside the clip"
            };
            let [first, last] = own.span_secs;
            report.notes.push(format!(
                "the {} foot's contact from {first:.3} to {last:.3} s is left out: {why}",
                own.side.name()
            ));
        }
    }
    spans.sort_unstable();
    spans
}

fn sum(slides: &[Slide]) -> f64 {
    slides.iter().map(|slide| slide.path).sum()
}

fn most(slides: &[Slide]) -> f64 {
    slides.iter().map(|slide| slide.farthest).fold(0.0, f64::max)
}

impl Held {
    /// What is held, a goal for each foot: the places to which its points came in `clip`.
    pub(super) fn goals(&self, clip: &Clip) -> Vec<Goal> {
        let count = clip.grid.count();
        let goal = |(index, foot): (usize, &Foot)| {
            let spans: Vec<&PlantedSpan> = self.spans.iter().filter(|span| span.foot == index).collect();
            let rows = Trails::of(clip, &[foot.heel, foot.ball]).rows;
            let points = [(FootPart::Heel, foot.heel), (FootPart::Ball, foot.ball)];
            let points = points.into_iter().zip(rows).filter_map(|((part, point), row)| {
                let mut places = vec![None; count];
                for span in spans.iter().filter(|span| span.part == part) {
                    for frame in span.frames() {
                        places[frame] = Some(row[frame]);
                    }
                }
                places.iter().any(Option::is_some).then_some((point, places))
            });
            Goal {
                limb: foot.limb,
                points: points.collect(),
                spans: spans.iter().map(|span| (span.first_frame, span.last_frame)).collect(),
                size: self.legs[index],
                is_foot: true,
                hinge: self.hinges[index],
                what: "limits pull the foot off the place where it is planted",
            }
        };
        self.feet.iter().enumerate().map(goal).filter(|goal| !goal.points.is_empty()).collect()
    }

    /// Measures slide anew after something else has changed the clip.
    pub(super) fn measure_again(&self, after: &Clip, report: &mut Report) {
        let points: Vec<JointPoint> = self.feet.iter().flat_map(|foot| [foot.heel, foot.ball]).collect();
        let rows = Trails::of(after, &points).rows;
        let slide = |span: &PlantedSpan| {
            let row = 2 * span.foot + usize::from(span.part == FootPart::Ball);
            slide_of(after, &rows[row], span.frames(), self.up)
        };
        let slides: Vec<Slide> = self.spans.iter().map(slide).collect();
        if let (Some(slide), Some(drift)) = (&mut report.slide, &mut report.drift) {
            slide[1] = sum(&slides);
            drift[1] = most(&slides);
        }
    }
}

/// Lifts feet that dip below the ground between their plants: a foot longer than the source's does. The lift sets in and fades smoothly and
/// leaves planted frames as they are.
fn above_ground(
    clip: Clip,
    target: &Figure,
    plan: &Plan,
    feet: &[Foot],
    spans: &[PlantedSpan],
    legs: &[f64],
    report: &mut Report,
) -> Clip {
    /// Seconds over which a lift sets in.
    const EASE_SECS: f64 = 0.1;
    let up = target.roles.shape.up;
    let count = clip.grid.count();
    let step_secs = clip.grid.times.median_step().unwrap_or(1.0);
    let reach = ((EASE_SECS / step_secs).round() as usize).clamp(2, count.max(2));
    let mut result = clip;
    let mut deepest: Option<[f64; 2]> = None;
    for (index, foot) in feet.iter().enumerate() {
        let soles = sole_points(target, foot, plan);
        if soles.is_empty() {
            continue;
        }
        let points: Vec<JointPoint> = soles.iter().map(|(point, _)| *point).collect();
        let mut free = vec![true; count];
        for span in spans.iter().filter(|span| span.foot == index) {
            free[span.first_frame..=span.last_frame.min(count - 1)].fill(false);
        }
        let dips = |clip: &Clip| -> Vec<f64> {
            let trails = Trails::of(clip, &points);
            let depth = |frame: usize| {
                let below = |(row, sole): (&Vec<DVec3>, &(JointPoint, f64))| sole.1 - row[frame].dot(up);
                trails.rows.iter().zip(&soles).map(below).fold(0.0, f64::max)
            };
            (0..count).map(|frame| if free[frame] { depth(frame) } else { 0.0 }).collect()
        };
        let mut found = dips(&result);
        let before = found.iter().copied().fold(0.0, f64::max);
        let worst =
            |dips: &[f64]| (0..count).max_by(|&a, &b| dips[a].total_cmp(&dips[b])).map(|at| (at, dips[at]));
        let least = LEAST_MISS * legs[index];
        // A lift bends the limb and so leaves a little; twice is enough.
        for _ in 0..2 {
            if worst(&found).is_none_or(|(_, dip)| dip <= least) {
                break;
            }
            let lifts = lifts(&found, &free, reach);
            let shifts: Vec<DVec3> = lifts.into_iter().map(|lift| up * lift).collect();
            let options = PlantOptions { up, ..PlantOptions::default() };
            let (lifted, report_of_lift) = move_end(&result, &foot.limb, &shifts, &options);
            report.note_changes(&report_of_lift.changes);
            result = lifted;
            found = dips(&result);
        }
        if let Some((frame, dip)) = worst(&found) {
            let [most, left] = deepest.unwrap_or_default();
            deepest = Some([most.max(before), left.max(dip)]);
            if dip > least {
                report.missed.push(Missed {
                    what: "the foot dips below the ground between plants".to_owned(),
                    joint: foot.limb.end,
                    frame,
                    by: dip,
                });
            }
        }
    }
    report.deepest_dip = deepest;
    result
}

/// How far to lift at each frame: at least the dip there where the foot is free and no plant is near, without a corner in time.
fn lifts(dips: &[f64], free: &[bool], reach: usize) -> Vec<f64> {
    let last = dips.len() - 1;
    let window = |frame: usize| frame.saturating_sub(reach)..=(frame + reach).min(last);
    // The largest within reach, then twice a mean as wide: never less than the dip, and smooth.
    let widest: Vec<f64> =
        (0..=last).map(|frame| dips[window(frame)].iter().copied().fold(0.0, f64::max)).collect();
    let half = (reach / 2).max(1);
    let mean = |row: &[f64]| -> Vec<f64> {
        (0..=last)
            .map(|frame| {
                let own = &row[frame.saturating_sub(half)..=(frame + half).min(last)];
                own.iter().sum::<f64>() / own.len() as f64
            })
            .collect()
    };
    let smooth = mean(&mean(&widest));
    // Nothing where the foot is planted, all from a few frames beside it on.
    let away = frames_from(free);
    let near = (reach / 4).max(1) as f64;
    smooth
        .into_iter()
        .zip(away)
        .map(|(lift, away)| {
            let t = (away as f64 / near).min(1.0);
            lift * (t * t * (3.0 - 2.0 * t))
        })
        .collect()
}

/// For each frame how many frames it is from the nearest one that is not free; large where there is none.
fn frames_from(free: &[bool]) -> Vec<usize> {
    let mut away = vec![usize::MAX / 2; free.len()];
    let mut since = usize::MAX / 2;
    for (frame, &is_free) in free.iter().enumerate() {
        since = if is_free { since + 1 } else { 0 };
        away[frame] = since;
    }
    since = usize::MAX / 2;
    for (frame, &is_free) in free.iter().enumerate().rev() {
        since = if is_free { since + 1 } else { 0 };
        away[frame] = away[frame].min(since);
    }
    away
}

/// The points of a foot that a floor stops, and how high each is along up when the foot stands: the ball, and the tip of the toes.
fn sole_points(target: &Figure, foot: &Foot, plan: &Plan) -> Vec<(JointPoint, f64)> {
    let worlds = target.skeleton.world(&target.rest);
    let mut points = vec![foot.ball];
    if let Some(end) = target.roles.shape.limb_end(foot.ball.joint) {
        let offset = worlds[foot.ball.joint].scene_from_joint.inverse().transform_point3(end);
        let tip = JointPoint { joint: foot.ball.joint, offset };
        if offset.is_finite() && tip != foot.ball {
            points.push(tip);
        }
    }
    points.into_iter().filter_map(|point| Some((point, rest_height(target, point, plan)?))).collect()
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

/// The hips without what trembles under feet that stand. Captured hips tremble by a millimetre or two; in the source the feet tremble along, but
/// feet that are held would hand it on to the knees, which near full stretch make degrees of it.
fn steadied(result: &Clip, root: &Root, feet: &[Foot], spans: &[PlantedSpan]) -> Clip {
    /// What is taken for trembling at most, in leg lengths.
    const MOST: f64 = 0.01;
    let count = result.grid.count();
    let step_secs = result.grid.times.median_step().unwrap_or(1.0);
    let reach = ((WEIGHT_SECS / step_secs).round() as usize).max(2);
    let points: Vec<JointPoint> = feet.iter().flat_map(|foot| [foot.heel, foot.ball]).collect();
    let rows = Trails::of(result, &points).rows;
    let legs = leg_lengths(result, feet);
    let mut sums = vec![(DVec3::ZERO, 0.0); count];
    let mut most = f64::INFINITY;
    for span in spans {
        let row = &rows[2 * span.foot + usize::from(span.part == FootPart::Ball)];
        let middle = median_place(row, span.frames());
        for frame in span.frames() {
            let weight = weight(frame, (span.first_frame, span.last_frame), count, reach);
            sums[frame].0 += (middle - row[frame]) * weight;
            sums[frame].1 += weight;
        }
        most = most.min(MOST * legs[span.foot]);
    }
    let off: Vec<Option<DVec3>> =
        sums.iter().map(|(sum, weight)| (*weight > 0.0).then(|| *sum / *weight)).collect();
    let times: Vec<f64> = result.grid.times.iter().collect();
    // What is slower than a few hertz is how the figure moves, and left to the legs.
    let slow = [0, 1, 2].map(|axis| {
        let known: Vec<(f64, f64)> =
            off.iter().zip(&times).filter_map(|(off, secs)| Some((*secs, (*off)?[axis]))).collect();
        SmoothCurve::through(&known, result.duration_secs)
    });
    let tremble: Vec<Option<DVec3>> = off
        .iter()
        .zip(&times)
        .map(|(off, &secs)| {
            let fast = (*off)? - DVec3::from_array([0, 1, 2].map(|axis| slow[axis].at(secs)));
            Some(fast.clamp_length_max(most))
        })
        .collect();
    hips_by(result, root, faded(&tremble, reach))
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
fn rest_height(target: &Figure, point: JointPoint, plan: &Plan) -> Option<f64> {
    let shape = &target.roles.shape;
    let ground = plan.root.as_ref().map(|root| root.ground)?;
    let stands = shape.ankle_height > 0.01 * shape.leg_length && shape.ankle_height < 0.4 * shape.leg_length;
    if !stands {
        return None;
    }
    let world = target.skeleton.world(&target.rest)[point.joint];
    Some(ground + world.scene_from_joint.transform_point3(point.offset).dot(shape.up) - shape.ground)
}
