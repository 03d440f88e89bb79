//! A planted foot that moves.

use glam::DVec3;

use crate::clip::{
    Clip, ContactOptions, FootPart, PlantedSpan, Trails, contacts, leg_lengths, slide_of, standing_feet,
};
use crate::skeleton::JointKind;

use super::{Plant, Remedy, Snag, SnagKind};

/// A planted point that gets no further than this from the middle of its places, in leg lengths, stands: so much a heel or a ball rolls.
const LEAST_LEGS: f64 = 0.03;

/// So long at both ends of a plant the foot rolls, and is not looked at.
const ROLL_SECS: f64 = 0.06;

/// Finds the plants of a clip whose foot slides: one snag each, for the joint at the limb's end.
pub(super) fn find_all(clip: &Clip) -> Vec<Snag> {
    let up = DVec3::Y;
    let feet = standing_feet(clip, up);
    let spans = contacts(clip, &feet, &ContactOptions { up, ..ContactOptions::default() }).spans;
    let legs = leg_lengths(clip, &feet);
    let points: Vec<_> = feet.iter().flat_map(|foot| [foot.heel, foot.ball]).collect();
    let trails = Trails::of(clip, &points);
    let step_secs = clip.grid.times.median_step().unwrap_or(ROLL_SECS);
    let roll = (ROLL_SECS / step_secs).round() as usize;
    let mut snags = Vec::new();
    for (index, foot) in feet.iter().enumerate() {
        let own: Vec<PlantedSpan> = spans.iter().filter(|span| span.foot == index).copied().collect();
        let plants = plants(&own);
        for (place, plant) in plants.iter().enumerate() {
            let (first, last) = (plant.first_frame(), plant.last_frame());
            let slides = own.iter().filter(|span| (first..=last).contains(&span.first_frame)).map(|span| {
                let row = 2 * index + usize::from(span.part == FootPart::Ball);
                // While it is set down and lifted a foot rolls.
                let (mut from, mut to) = (span.first_frame, span.last_frame);
                if from > 0 && from + 2 * roll < to {
                    from += roll;
                }
                if to + 1 < clip.grid.count() && from + roll < to {
                    to -= roll;
                }
                slide_of(clip, &trails.rows[row], from..=to, up)
            });
            let worst = slides.fold((0.0_f64, 0.0_f64), |worst, slide| {
                (worst.0.max(slide.farthest), worst.1.max(slide.fastest))
            });
            let share = worst.0 / legs[index];
            let listed = [foot.limb.end, foot.limb.lower, foot.limb.upper]
                .into_iter()
                .find(|&joint| clip.skeleton.joints()[joint].kind == JointKind::Joint);
            let (Some(joint), true) = (listed, share > LEAST_LEGS) else { continue };
            let before = place.checked_sub(1).map_or(first, |near| first - plants[near].last_frame() - 1);
            let after = match plants.get(place + 1) {
                Some(next) => next.first_frame() - last - 1,
                None => clip.grid.count() - 1 - last,
            };
            let key = |frame: usize| {
                clip.rotation(joint).map_or(0, |track| track.times.nearest(clip.grid.time(frame)))
            };
            snags.push(Snag {
                kind: SnagKind::Slide,
                joint,
                first_key: key(first),
                last_key: key(last),
                first_frame: first,
                last_frame: last,
                first_secs: clip.grid.time(first),
                last_secs: clip.grid.time(last),
                size_rad: share,
                confidence: 1.0 - 0.5 * LEAST_LEGS / share,
                remedy: Remedy::Hold(Plant {
                    foot: *foot,
                    heel: plant.heel,
                    ball: plant.ball,
                    free: (before, after),
                }),
                safe: true,
                text: format!(
                    "{} slides by {:.1} % of the leg's length while it stands at frames {first} to {last}, by {:.4} in the scene's lengths",
                    clip.skeleton.label(joint),
                    share * 100.0,
                    worst.0,
                ),
            });
        }
    }
    snags
}

/// Heel and ball spans that overlap are one plant.
struct Frames {
    heel: Option<(usize, usize)>,
    ball: Option<(usize, usize)>,
}

impl Frames {
    fn first_frame(&self) -> usize {
        self.heel.iter().chain(&self.ball).map(|span| span.0).min().unwrap_or(0)
    }

    fn last_frame(&self) -> usize {
        self.heel.iter().chain(&self.ball).map(|span| span.1).max().unwrap_or(0)
    }
}

fn plants(spans: &[PlantedSpan]) -> Vec<Frames> {
    let mut sorted = spans.to_vec();
    sorted.sort_by_key(|span| (span.first_frame, span.part));
    let mut found: Vec<Frames> = Vec::new();
    for span in sorted {
        let frames = (span.first_frame, span.last_frame);
        let joins = found.last().is_some_and(|plant| span.first_frame <= plant.last_frame() + 1);
        if !joins {
            found.push(Frames { heel: None, ball: None });
        }
        let Some(plant) = found.last_mut() else { continue };
        let own = match span.part {
            FootPart::Heel => &mut plant.heel,
            FootPart::Ball => &mut plant.ball,
        };
        // A point that lifts for a moment inside a plant of the other is held throughout.
        *own = Some(own.map_or(frames, |(first, last)| (first, last.max(frames.1))));
    }
    found
}
