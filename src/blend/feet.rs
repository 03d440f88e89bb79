//! Feet that both clips, or the weightier one, have on the ground stay where they are in the blend.

use crate::clip::{Clip, ContactOptions, Foot, FootPart, PlantedSpan, contacts, standing_feet};
use crate::mend::{PlantOptions, PlantReport, plant_feet};

/// A foot is held where the clips that plant it weigh more than this together.
const HELD: f64 = 0.55;
/// Where one clip weighs less than this the result is the other one and is left alone.
const LEAST_WEIGHT: f64 = 1e-3;
/// A shorter contact is none, in frames.
const LEAST_FRAMES: usize = 3;

/// Where a result takes each of its frames from.
pub(super) struct Origins<'a> {
    /// Time in the first clip of each frame, seconds.
    pub(super) first_secs: &'a [f64],
    /// Time in the second clip.
    pub(super) second_secs: &'a [f64],
    /// Weight of the second clip.
    pub(super) weights: &'a [f64],
}

/// `blended` with its feet held in the frames that are mixed of both clips, where one of them, or both, has them planted and
/// weighs enough. `None` where no foot stands.
pub(super) fn held(blended: &Clip, a: &Clip, b: &Clip, origins: &Origins<'_>) -> Option<(Clip, PlantReport)> {
    let options = ContactOptions::default();
    let feet = standing_feet(a, options.up);
    if feet.is_empty() {
        return None;
    }
    let (own, other) = (planted(a, &feet, &options), planted(b, &feet, &options));
    let mut spans = Vec::new();
    for (foot, limb) in feet.iter().enumerate() {
        for &part in limb.parts() {
            let is_held = |frame: usize| {
                let weight = origins.weights[frame];
                if !(LEAST_WEIGHT..=1.0 - LEAST_WEIGHT).contains(&weight) {
                    return false;
                }
                let on = |clip: &Clip, rows: &Planted, secs: f64| {
                    f64::from(u8::from(rows.of(foot, part)[clip.grid.frame(secs)]))
                };
                let first = on(a, &own, origins.first_secs[frame]);
                let second = on(b, &other, origins.second_secs[frame]);
                (1.0 - weight) * first + weight * second > HELD
            };
            let mut frame = 0;
            while frame < origins.weights.len() {
                let run = (frame..origins.weights.len()).take_while(|&frame| is_held(frame)).count();
                if run >= LEAST_FRAMES {
                    spans.push(PlantedSpan { foot, part, first_frame: frame, last_frame: frame + run - 1 });
                }
                frame += run + 1;
            }
        }
    }
    if spans.is_empty() {
        return None;
    }
    Some(plant_feet(blended, &feet, &spans, &PlantOptions::default()))
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
