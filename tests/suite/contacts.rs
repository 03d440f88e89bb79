//! Feet: which limbs stand, when they are planted, and what holding them there comes to, in the real clips.
#![expect(clippy::unwrap_used, reason = "a helper fails its test")]

use std::sync::Arc;

use glam::DVec3;
use turnwright::clip::{Clip, ContactOptions, FootPart, Slide, contacts, standing_feet};
use turnwright::exchange::{OpenOptions, open};
use turnwright::mend::{PlantOptions, plant_feet};

use crate::support::shared;

fn clips(file: &str) -> Vec<Arc<Clip>> {
    let Some(path) = shared(&format!("data/{file}")) else { return Vec::new() };
    open(&path, &OpenOptions::default()).unwrap().clips
}

/// The walks and stands of people, with the joints of their legs.
const PEOPLE: [(&str, [&str; 6]); 6] = [
    ("bvh/cmu_02_01_walk.bvh", ["LeftUpLeg", "LeftLeg", "LeftFoot", "RightUpLeg", "RightLeg", "RightFoot"]),
    ("bvh/cmu_05_06_dance.bvh", ["LeftUpLeg", "LeftLeg", "LeftFoot", "RightUpLeg", "RightLeg", "RightFoot"]),
    ("bvh/walk01.bvh", ["RightUpLeg", "RightLeg", "RightFoot", "LeftUpLeg", "LeftLeg", "LeftFoot"]),
    (
        "bvh/xyz_affective_walk.bvh",
        ["LeftUpLeg", "LeftLeg", "LeftFoot", "RightUpLeg", "RightLeg", "RightFoot"],
    ),
    ("bvh/mixed_order_6ch.bvh", ["thigh.L", "shin.L", "foot.L", "thigh.R", "shin.R", "foot.R"]),
    (
        "bvh/yxz_23joints_120fps.bvh",
        ["RightHip", "RightKnee", "RightAnkle", "LeftHip", "LeftKnee", "LeftAnkle"],
    ),
];

fn path(slides: &[Slide]) -> f64 {
    slides.iter().map(|slide| slide.path).sum()
}

fn fastest(slides: &[Slide]) -> f64 {
    slides.iter().map(|slide| slide.fastest).fold(0.0, f64::max)
}

#[test]
fn the_feet_of_people_are_found_by_shape_and_held() {
    for (file, legs) in PEOPLE {
        for clip in clips(file) {
            let feet = standing_feet(&clip, DVec3::Y);
            let label = |joint: usize| clip.skeleton.label(joint);
            let found: Vec<&str> = feet
                .iter()
                .flat_map(|foot| [foot.limb.upper, foot.limb.lower, foot.limb.end].map(label))
                .collect();
            assert_eq!(found, legs, "{file}");
            let contacts = contacts(&clip, &feet, &ContactOptions::default());
            for part in [FootPart::Heel, FootPart::Ball] {
                let has =
                    |foot: usize| contacts.spans.iter().any(|span| (span.foot, span.part) == (foot, part));
                assert!(has(0) && has(1), "{file}: {part:?}");
            }
            let (held, report) = plant_feet(&clip, &feet, &contacts.spans, &PlantOptions::default());
            let worst = report.misses.iter().map(|miss| miss.by).fold(0.0, f64::max);
            println!(
                "{file}: {} spans, slide {:.4} -> {:.4} legs, fastest {:.3} -> {:.3} legs a second, worst miss {:.4}",
                contacts.spans.len(),
                path(&report.before) / contacts.leg,
                path(&report.after) / contacts.leg,
                fastest(&report.before) / contacts.leg,
                fastest(&report.after) / contacts.leg,
                worst / contacts.leg,
            );
            assert!(path(&report.after) <= 0.2 * path(&report.before), "{file}");
            assert!(worst <= 0.05 * contacts.leg, "{file}: {worst}");
            // Joints that hold no foot are the same to the bit; the legs keep the numbers of free frames.
            for joint in 0..clip.joints.len() {
                if !report.changes.contains_key(&joint) {
                    assert!(
                        Arc::ptr_eq(&clip.joints[joint], &held.joints[joint]),
                        "{file}: {}",
                        label(joint)
                    );
                }
            }
            // Nothing pops: a joint turns from frame to frame little more than it did.
            for (&joint, &(change, _)) in &report.changes {
                let (before, after) = (clip.rotation(joint).unwrap(), held.rotation(joint).unwrap());
                let steps = |keys: &[turnwright::rotor::Rotor]| -> Vec<f64> {
                    keys.windows(2).map(|pair| pair[0].turn_to(pair[1])).collect()
                };
                let most = steps(&before.keys)
                    .iter()
                    .zip(steps(&after.keys))
                    .map(|(before, after)| after - before)
                    .fold(0.0, f64::max);
                // Radians a second: the correction may come and go within the fade, and no faster.
                let rate = most * clip.grid.rate;
                assert!(rate < 8.0 + 25.0 * change, "{file}: {} turns {rate} rad/s faster", label(joint));
            }
        }
    }
}

#[test]
fn a_foot_that_is_made_to_slide_is_brought_back() {
    // A stand, its root pushed along by a slow wave: both feet slide with it.
    for clip in clips("bvh/yxz_23joints_120fps.bvh") {
        let feet = standing_feet(&clip, DVec3::Y);
        let truth = contacts(&clip, &feet, &ContactOptions::default());
        let root = (0..clip.joints.len()).find(|&joint| clip.joints[joint].translation.is_some()).unwrap();
        let mut sliding = (*clip).clone();
        let mut tracks = (*clip.joints[root]).clone();
        let places = tracks.translation.as_mut().unwrap();
        let shift = |frame: usize| DVec3::new(0.02 * truth.leg * (frame as f64 * 0.05).sin(), 0.0, 0.0);
        places.keys = places.keys.iter().enumerate().map(|(frame, place)| *place + shift(frame)).collect();
        sliding.joints[root] = Arc::new(tracks);
        let found = contacts(&sliding, &feet, &ContactOptions::default());
        let (_, report) = plant_feet(&sliding, &feet, &found.spans, &PlantOptions::default());
        assert!(path(&report.before) > 0.05 * truth.leg, "{}", path(&report.before));
        assert!(path(&report.after) < 0.05 * path(&report.before), "{}", path(&report.after));
    }
}

#[test]
fn paws_and_the_feet_of_game_figures_stand_too() {
    for (file, name, least) in [
        ("gltf/Fox.glb", "Survey", 2),
        ("gltf/biped23_movement_clips.glb", "Rig_Medium|Jump_Land", 2),
        ("gltf/wolf.glb", "AnimalArmature|Eating", 2),
    ] {
        for clip in clips(file).iter().filter(|clip| clip.name == name) {
            let feet = standing_feet(clip, DVec3::Y);
            let found = contacts(clip, &feet, &ContactOptions::default());
            let (_, report) = plant_feet(clip, &feet, &found.spans, &PlantOptions::default());
            println!("{file} {name}: {} feet, {} spans", feet.len(), found.spans.len());
            assert!(feet.len() >= least && !found.spans.is_empty(), "{file}: {}", feet.len());
            assert!(path(&report.after) <= 0.1 * path(&report.before) + 1e-9 * found.leg, "{file}");
        }
    }
}
