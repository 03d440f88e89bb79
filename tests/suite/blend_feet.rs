//! Feet in blends: what slides after a blend against what slides in its two clips, on pairs that do stand on the ground.

#![expect(clippy::unwrap_used, reason = "the helpers of a test fail as the test does")]

use std::sync::Arc;

use glam::DVec3;
use turnwright::blend::{
    self, JoinPlace, Mask, MixAlong, MixHow, RootFrom, Stop, align, join_distances, join_on_feet,
    mix_aligned, mix_by,
};
use turnwright::clip::{
    Clip, ContactOptions, FootPart, PlantedSpan, VectorTrack, contacts, cut, resampled, slides, standing_feet,
};
use turnwright::exchange::{self, OpenOptions};
use turnwright::retarget;

use crate::support::{largest, shared};

pub(crate) fn clips(path: &str) -> Option<Vec<Arc<Clip>>> {
    Some(exchange::open(&shared(path)?, &OpenOptions::default()).unwrap().clips)
}

pub(crate) fn clip(path: &str, name: &str) -> Option<Arc<Clip>> {
    let found = clips(path)?.into_iter().find(|clip| clip.name == name);
    // A file that is there has the clip, or nothing would be tested.
    assert!(found.is_some(), "no clip `{name}` in {path}");
    found
}

pub(crate) fn part(clip: &Clip, from_secs: f64, to_secs: f64) -> Arc<Clip> {
    Arc::new(cut(clip, from_secs, to_secs))
}

/// A clip that walks on the spot, as on a belt, walking over the ground: what its feet do while they are lowest, taken back.
pub(crate) fn travelling(clip: &Clip) -> Clip {
    let up = DVec3::Y;
    let feet = standing_feet(clip, up);
    let secs: Vec<f64> = clip.grid.times.iter().collect();
    let worlds = clip.worlds_at(&secs);
    let mut steps: Vec<DVec3> = Vec::new();
    for foot in &feet {
        let place = |frame: usize| worlds.point(foot.ball.joint, frame, foot.ball.offset);
        let mut frames: Vec<usize> = (1..secs.len()).collect();
        frames.sort_by(|&a, &b| place(a).y.total_cmp(&place(b).y));
        let lowest = &frames[..frames.len() / 4];
        steps.extend(
            lowest.iter().map(|&frame| (place(frame) - place(frame - 1)) / (secs[frame] - secs[frame - 1])),
        );
    }
    let median = |axis: usize| {
        let mut all: Vec<f64> = steps.iter().map(|step| step[axis]).collect();
        all.sort_by(f64::total_cmp);
        all[all.len() / 2]
    };
    let belt = DVec3::new(median(0), 0.0, median(2));
    let mut joints = clip.joints.clone();
    for (joint, tracks) in joints.iter_mut().enumerate() {
        if clip.skeleton.joints()[joint].parent.is_some() {
            continue;
        }
        let rest = clip.skeleton.joints()[joint].rest.translation;
        let place = |secs: f64| {
            let own = tracks.translation.as_ref().and_then(|track| track.at(secs)).unwrap_or(rest);
            own - belt * secs
        };
        let track = VectorTrack::straight(
            clip.grid.times.clone(),
            secs.iter().map(|&secs| place(secs)).collect::<Vec<DVec3>>(),
        );
        *tracks = Arc::new(turnwright::clip::JointTracks { translation: Some(track), ..(**tracks).clone() });
    }
    Clip { joints, ..clip.clone() }
}

/// Pairs whose feet stand: people's takes, a person's take carried to another, and game and animal loops that get the way over the ground
/// that their feet speak of.
pub(crate) fn pairs() -> Vec<(&'static str, Arc<Clip>, Arc<Clip>)> {
    let bvh = |name: &str| clips(&format!("data/bvh/{name}.bvh")).map(|clips| clips[0].clone());
    let mut pairs = Vec::new();
    if let (Some(walk), Some(dance)) = (bvh("cmu_02_01_walk"), bvh("cmu_05_06_dance")) {
        pairs.push(("two parts of a walk", part(&walk, 0.02, 1.67), part(&walk, 1.17, 2.85)));
        pairs.push(("a walk and a dance", part(&walk, 0.02, 2.85), part(&dance, 0.0, 3.5)));
    }
    if let Some(walk) = bvh("xyz_affective_walk") {
        pairs.push(("two parts of a long walk", part(&walk, 0.5, 3.5), part(&walk, 4.2, 8.0)));
        if let Some(other) = bvh("walk01") {
            pairs.push(("a walk and another body's", part(&walk, 0.5, 4.5), other));
        }
    }
    if let Some(take) = bvh("mixed_order_6ch") {
        pairs.push(("two parts of a take in metres", part(&take, 2.0, 14.0), part(&take, 40.0, 50.0)));
    }
    // Its runs and the second of its walks have no step that stands for three frames.
    let biped = |name| clip("data/gltf/biped23_movement_clips.glb", name);
    if let (Some(walk), Some(other)) = (biped("Rig_Medium|Walking_A"), biped("Rig_Medium|Walking_C")) {
        pairs.push(("a biped's two walks", Arc::new(travelling(&walk)), Arc::new(travelling(&other))));
    }
    // The fox's walk and run would prove nothing: the speed of a foot on the ground changes there by several legs a second within one
    // step, so at no pace of the belt does one stand. It does stand while it looks about.
    if let Some(survey) = clip("data/gltf/Fox.glb", "Survey") {
        pairs.push(("a fox looking about", part(&survey, 0.0, 1.9), part(&survey, 1.4, 3.3)));
    }
    pairs
        .into_iter()
        .map(|(name, a, b)| {
            let b = retarget::partner(&b, &a.skeleton).unwrap().clip;
            (name, a, b)
        })
        .collect()
}

/// How feet slide while they are planted, in lengths of the leg.
#[derive(Clone, Copy, Debug, Default)]
struct Slid {
    spans: usize,
    /// How long feet are planted, all together, seconds.
    secs: f64,
    /// The largest speed.
    fastest: f64,
    /// The path of the plant with the longest.
    path: f64,
    /// The path of all plants a second.
    pace: f64,
    /// How far a planted point gets from its place.
    drift: f64,
}

impl Slid {
    fn of(clip: &Clip, spans: &[PlantedSpan]) -> Self {
        let up = DVec3::Y;
        let feet = standing_feet(clip, up);
        let leg = contacts(clip, &feet, &ContactOptions::default()).leg;
        let rows = slides(clip, &feet, spans, up);
        let secs: f64 =
            spans.iter().map(|span| clip.grid.time(span.last_frame) - clip.grid.time(span.first_frame)).sum();
        Self {
            spans: spans.len(),
            secs,
            fastest: largest(rows.iter().map(|slide| slide.fastest / leg)),
            path: largest(rows.iter().map(|slide| slide.path / leg)),
            pace: rows.iter().map(|slide| slide.path / leg).sum::<f64>() / secs.max(1e-9),
            drift: largest(rows.iter().map(|slide| slide.farthest / leg)),
        }
    }

    fn or(self, other: Self) -> Self {
        Self {
            spans: self.spans.min(other.spans),
            secs: self.secs.min(other.secs),
            fastest: self.fastest.max(other.fastest),
            path: self.path.max(other.path),
            pace: self.pace.max(other.pace),
            drift: self.drift.max(other.drift),
        }
    }
}

fn told(clip: &Clip) -> Vec<PlantedSpan> {
    contacts(clip, &standing_feet(clip, DVec3::Y), &ContactOptions::default()).spans
}

/// Where each frame of a blend comes from: times in both clips and the second's weight.
type Origin = (f64, f64, f64);

/// The plants that a blend has by its clips: a foot that is down in both, or in the one that is shown alone. It is down in a clip where
/// the clip as it was read and as it plays at the blend's rate both say so: between two frames of a coarse clip nobody knows better.
fn meant([a, b]: [[&Clip; 2]; 2], origins: &[Origin]) -> Vec<PlantedSpan> {
    let feet = standing_feet(a[0], DVec3::Y);
    let options = ContactOptions::default();
    let [own, other] = [a, b].map(|both| both.map(|clip| (clip, contacts(clip, &feet, &options).spans)));
    let is_down = |both: &[(&Clip, Vec<PlantedSpan>); 2], foot: usize, part: FootPart, secs: f64| {
        both.iter().all(|(clip, spans)| {
            let frame = clip.grid.frame(secs);
            spans.iter().any(|span| span.foot == foot && span.part == part && span.frames().contains(&frame))
        })
    };
    let mut found = Vec::new();
    for (foot, limb) in feet.iter().enumerate() {
        for &part in limb.parts() {
            let down: Vec<bool> = origins
                .iter()
                .map(|&(first, second, weight)| {
                    let [a, b] = [
                        weight > 0.999 || is_down(&own, foot, part, first),
                        weight < 0.001 || is_down(&other, foot, part, second),
                    ];
                    a && b
                })
                .collect();
            let mut from = 0;
            while let Some(first) = (from..down.len()).find(|&frame| down[frame]) {
                let last = (first..down.len()).take_while(|&frame| down[frame]).last().unwrap();
                if last >= first + 2 {
                    found.push(PlantedSpan { foot, part, first_frame: first, last_frame: last });
                }
                from = last + 1;
            }
        }
    }
    found
}

/// All forms of blend of a pair, with what each frame is made of.
fn blends(a: &Clip, b: &Clip) -> Vec<(String, Clip, Vec<Origin>)> {
    let mask = Mask::all(&a.skeleton);
    let mut made = Vec::new();
    let overlap = (0.4 * a.duration_secs.min(b.duration_secs)).min(0.5);
    let picture = join_distances(a, b, overlap, 60).unwrap();
    let best = blend::best_places(&picture, overlap, 1).into_iter().map(|(place, _)| place);
    for place in best.chain([JoinPlace::end_to_start(a, overlap)]) {
        let joined = join_on_feet(a, b, place, &mask).unwrap();
        let second = |secs: f64| secs - place.first_secs + place.second_secs;
        let origins = joined.grid.times.iter().map(|secs| (secs, second(secs), place.weight(secs))).collect();
        made.push((format!("join at {:.2} s", place.first_secs), joined, origins));
    }
    let along = align(a, b).unwrap();
    let curve = MixAlong { knots: vec![[0.0, 0.0], [a.duration_secs, 1.0]] };
    for weight in [MixAlong::constant(0.5), MixAlong::constant(0.25), curve] {
        let name = weight.only().map_or("by a curve".to_owned(), |weight| weight.to_string());
        let how =
            MixHow { weight: weight.clone(), mask: mask.clone(), root: RootFrom::Both, holds_feet: true };
        let mixed = mix_by(a, b, &how).unwrap();
        let origins = mixed.grid.times.iter().map(|secs| (secs, secs, weight.at(secs))).collect();
        made.push((format!("mix {name}"), mixed, origins));
        let mixed = mix_aligned(a, b, &along, &how).unwrap();
        let stops = along.stops(&weight, a.grid.rate);
        let origin = |stop: &Stop| (stop.first_secs, stop.second_secs, weight.at(stop.first_secs));
        made.push((format!("mix in step {name}"), mixed, stops.iter().map(origin).collect()));
    }
    made
}

#[test]
fn planted_feet_slide_no_more_than_in_the_clips() {
    let mut failures = Vec::new();
    for (name, a, b) in pairs() {
        // Both as they play at the blend's rate: at a coarser one a foot that leaves its place between frames would not show, nor when
        // it does.
        let played = [&a, &b].map(|clip| resampled(clip, a.grid.rate, 0.0, clip.duration_secs));
        let [own, other] = [&played[0], &played[1]].map(|clip| Slid::of(clip, &told(clip)));
        println!("{name}: A {own:.3?}, B {other:.3?}");
        // Pairs that do stand, or nothing would be proved.
        if own.spans == 0 || other.spans == 0 {
            failures.push(format!("{name} has no plants: {own:?} {other:?}"));
        }
        let most = own.or(other);
        let both = [[&*a, &played[0]], [&*b, &played[1]]];
        for (what, made, origins) in blends(&a, &b) {
            let slid = Slid::of(&made, &meant(both, &origins));
            println!("    {what}: {slid:.3?}");
            for (measure, found, most) in [
                ("speed", slid.fastest, most.fastest),
                ("longest path", slid.path, most.path),
                ("path a second", slid.pace, most.pace),
                ("drift", slid.drift, most.drift),
            ] {
                if found > most * (1.0 + 1e-6) + 1e-6 {
                    failures
                        .push(format!("{name}, {what}: {measure} {found:.4} legs, in the clips {most:.4}"));
                }
            }
        }
    }
    assert!(failures.is_empty(), "{}", failures.join("\n"));
}
