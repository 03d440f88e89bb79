//! Feet that both clips, or the weightier one, have on the ground stay where they are in the blend.

use crate::clip::{Clip, ContactOptions, Foot, FootPart, PlantedSpan, contacts, standing_feet};
use crate::mend::{PlantOptions, PlantReport, plant_feet};

use super::{BlendError, JoinPlace, Mask, join};

/// A foot is held where the clips that plant it weigh more than this together.
const HELD: f64 = 0.55;
/// Where one clip weighs less than this the result is the other one and is left alone.
const LEAST_WEIGHT: f64 = 1e-3;
/// Times nearer than this are the same, in seconds.
const SAME_SECS: f64 = 1e-9;
/// A shorter contact is none, in frames.
const LEAST_FRAMES: usize = 3;

/// As [`join()`], with feet held where they stand in the overlap: a foot that is down in both clips there stands at one place, from
/// where it is set down in `a` to where it is lifted in `b`. So frames outside the overlap change where a foot stands on beyond its
/// ends, and for 0.15 s beside such a stand; all others are as `join` has them.
///
/// # Errors
/// As for [`join()`].
pub fn join_on_feet(a: &Clip, b: &Clip, place: JoinPlace, mask: &Mask) -> Result<Clip, BlendError> {
    let joined = join(a, b, place, mask)?;
    let first_secs: Vec<f64> = joined.grid.times.iter().collect();
    let second_secs: Vec<f64> =
        first_secs.iter().map(|secs| secs - place.first_secs + place.second_secs).collect();
    let weights: Vec<f64> = first_secs.iter().map(|&secs| place.weight(secs)).collect();
    Ok(held_of_two(joined, [a, b], [&first_secs, &second_secs], &weights, mask))
}

/// Where a result takes its frames from: one of its clips.
pub(super) struct Origin<'a> {
    /// The clip.
    pub(super) clip: &'a Clip,
    /// Its time at each frame, seconds.
    pub(super) secs: &'a [f64],
    /// Its weight at each frame; those of all clips sum to 1.
    pub(super) weights: &'a [f64],
}

/// As [`held`], of two clips by the weights of the second.
pub(super) fn held_of_two(
    blended: Clip,
    [a, b]: [&Clip; 2],
    [first_secs, second_secs]: [&[f64]; 2],
    weights: &[f64],
    mask: &Mask,
) -> Clip {
    let left: Vec<f64> = weights.iter().map(|weight| 1.0 - weight).collect();
    let origins = [
        Origin { clip: a, secs: first_secs, weights: &left },
        Origin { clip: b, secs: second_secs, weights },
    ];
    held(&blended, &origins, mask).map_or(blended, |(held, _)| held)
}

/// `blended` with its feet held where they stand in frames that are mixed of several clips: where those that have them planted weigh
/// enough together. `None` where no foot stands there. The first clip's share is what the mask leaves of the others'.
pub(super) fn held(blended: &Clip, origins: &[Origin<'_>], mask: &Mask) -> Option<(Clip, PlantReport)> {
    let (first, others) = origins.split_first()?;
    let count = first.weights.len();
    // The weight of the others is counted, so that a mask can take from it.
    let weights = |frame: usize, factor: f64| {
        let given = others.iter().map(move |origin| origin.weights[frame] * factor);
        let own = 1.0 - given.clone().sum::<f64>();
        std::iter::once(own).chain(given)
    };
    let is_mixed =
        |frame: usize, factor: f64| weights(frame, factor).all(|weight| weight <= 1.0 - LEAST_WEIGHT);
    // A clip with itself is itself, with whatever its feet do.
    let is_same = |other: &Origin<'_>| {
        let is_near = |(own, their): (&f64, &f64)| (own - their).abs() < SAME_SECS;
        first.secs.iter().zip(other.secs).all(is_near)
            && (0..first.clip.joints.len()).all(|joint| first.clip.same_joint(other.clip, joint))
    };
    if !(0..count).any(|frame| is_mixed(frame, 1.0)) || others.iter().all(is_same) {
        return None;
    }
    let contact = ContactOptions::default();
    let feet = standing_feet(first.clip, contact.up);
    if feet.is_empty() {
        return None;
    }
    let options = PlantOptions::default();
    let reach = (options.fade_secs * blended.grid.rate).ceil() as usize;
    let rows: Vec<Planted> = origins.iter().map(|origin| planted(origin.clip, &feet, &contact)).collect();
    let mut spans = Vec::new();
    for (foot, limb) in feet.iter().enumerate() {
        let factor = reaching(first.clip, limb, mask);
        for &part in limb.parts() {
            let is_down = |frame: usize| {
                let down =
                    origins.iter().zip(&rows).zip(weights(frame, factor)).map(|((origin, rows), weight)| {
                        let is_on = rows.of(foot, part)[origin.clip.grid.frame(origin.secs[frame])];
                        if is_on { weight } else { 0.0 }
                    });
                down.sum::<f64>() > HELD
            };
            let mut stands: Vec<PlantedSpan> = Vec::new();
            let mut frame = 0;
            while frame < count {
                let run = (frame..count).take_while(|&frame| is_down(frame)).count();
                if run >= LEAST_FRAMES {
                    stands.push(PlantedSpan { foot, part, first_frame: frame, last_frame: frame + run - 1 });
                }
                frame += run + 1;
            }
            let is_touched = |span: &&PlantedSpan| span.frames().any(|frame| is_mixed(frame, factor));
            let touched: Vec<PlantedSpan> = stands.iter().filter(is_touched).copied().collect();
            // What fades out beside a stand must not move the stand next to it.
            let is_beside = |span: &&PlantedSpan| {
                touched.iter().any(|near| {
                    span.first_frame <= near.last_frame + reach && near.first_frame <= span.last_frame + reach
                })
            };
            spans.extend(stands.iter().filter(is_beside).copied());
        }
    }
    if spans.is_empty() {
        return None;
    }
    Some(plant_feet(blended, &feet, &spans, &options))
}

/// The largest factor of a mask on the way from a foot to the root: how much of the second clip may be seen in where it stands.
fn reaching(clip: &Clip, foot: &Foot, mask: &Mask) -> f64 {
    let mut at = Some(foot.limb.end);
    let mut most: f64 = 0.0;
    while let Some(joint) = at {
        most = most.max(mask.of(joint));
        at = clip.skeleton.joints()[joint].parent;
    }
    most
}

/// For each foot and part whether it is planted at each frame.
struct Planted(Vec<[Vec<bool>; 2]>);

impl Planted {
    fn of(&self, foot: usize, part: FootPart) -> &[bool] {
        &self.0[foot][usize::from(part == FootPart::Ball)]
    }
}

fn planted(clip: &Clip, feet: &[Foot], options: &ContactOptions) -> Planted {
    let none = vec![false; clip.grid.count()];
    let mut rows = vec![[none.clone(), none]; feet.len()];
    for span in contacts(clip, feet, options).spans {
        let row = &mut rows[span.foot][usize::from(span.part == FootPart::Ball)];
        row[span.frames()].fill(true);
    }
    Planted(rows)
}
