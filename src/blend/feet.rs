//! Feet that both clips, or the weightier one, have on the ground stay where they are in the blend.

use crate::clip::{Clip, ContactOptions, Foot, FootPart, PlantedSpan, contacts, standing_feet};
use crate::mend::{PlantOptions, PlantReport, plant_feet};

use super::{BlendError, JoinPlace, Mask, join};

/// A foot is held where the clips that plant it weigh more than this together.
const HELD: f64 = 0.55;
/// Where one clip weighs less than this the result is the other one and is left alone.
const LEAST_WEIGHT: f64 = 1e-3;
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
    let origins = Origins { first_secs: &first_secs, second_secs: &second_secs, weights: &weights };
    Ok(held(&joined, a, b, &origins, mask).map_or(joined, |(held, _)| held))
}

/// Where a result takes each of its frames from.
pub(super) struct Origins<'a> {
    /// Time in the first clip of each frame, seconds.
    pub(super) first_secs: &'a [f64],
    /// Time in the second clip.
    pub(super) second_secs: &'a [f64],
    /// Weight of the second clip.
    pub(super) weights: &'a [f64],
}

/// `blended` with its feet held where they stand in frames that are mixed of both clips: where one of them, or both, has them
/// planted and weighs enough. `None` where no foot stands there.
pub(super) fn held(
    blended: &Clip,
    a: &Clip,
    b: &Clip,
    origins: &Origins<'_>,
    mask: &Mask,
) -> Option<(Clip, PlantReport)> {
    let is_mixed = |weight: f64| (LEAST_WEIGHT..=1.0 - LEAST_WEIGHT).contains(&weight);
    if !origins.weights.iter().any(|&weight| is_mixed(weight)) {
        return None;
    }
    let contact = ContactOptions::default();
    let feet = standing_feet(a, contact.up);
    if feet.is_empty() {
        return None;
    }
    let options = PlantOptions::default();
    let reach = (options.fade_secs * blended.grid.rate).ceil() as usize;
    let (own, other) = (planted(a, &feet, &contact), planted(b, &feet, &contact));
    let mut spans = Vec::new();
    for (foot, limb) in feet.iter().enumerate() {
        let factor = reaching(a, limb, mask);
        let weight = |frame: usize| origins.weights[frame] * factor;
        for &part in limb.parts() {
            let is_down = |frame: usize| {
                let on = |clip: &Clip, rows: &Planted, secs: f64| {
                    f64::from(u8::from(rows.of(foot, part)[clip.grid.frame(secs)]))
                };
                let first = on(a, &own, origins.first_secs[frame]);
                let second = on(b, &other, origins.second_secs[frame]);
                (1.0 - weight(frame)) * first + weight(frame) * second > HELD
            };
            let mut stands: Vec<PlantedSpan> = Vec::new();
            let mut frame = 0;
            while frame < origins.weights.len() {
                let run = (frame..origins.weights.len()).take_while(|&frame| is_down(frame)).count();
                if run >= LEAST_FRAMES {
                    stands.push(PlantedSpan { foot, part, first_frame: frame, last_frame: frame + run - 1 });
                }
                frame += run + 1;
            }
            let is_touched = |span: &&PlantedSpan| span.frames().any(|frame| is_mixed(weight(frame)));
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
