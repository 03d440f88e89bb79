//! Which side of a flip is taken for the wrong one, where its length says the contrary: the truth is the capture itself.
#![expect(clippy::unwrap_used, reason = "a helper fails its test")]

use std::ops::RangeInclusive;

use glam::DVec3;
use turnwright::clip::{Clip, RotationTrack};
use turnwright::exchange::{OpenOptions, open};
use turnwright::mend::{self, SurveyOptions};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::skeleton::roles::{Role, Roles, Side};
use turnwright::snag::{Snag, SnagKind, Unwatched};

use crate::support::shared;

/// `clip` with a joint turned half round about `axis`, in its own frame, at these keys.
fn flipped(clip: &Clip, joint: usize, axis: DVec3, runs: &[RangeInclusive<usize>]) -> Clip {
    let track = clip.rotation(joint).unwrap();
    let half = Rotor::from_plane_angles(Bivector::from_axis(axis * std::f64::consts::PI));
    let changes: Vec<(usize, Rotor)> =
        runs.iter().cloned().flatten().map(|key| (key, track.sound_key(key) * half)).collect();
    clip.with_rotation(joint, RotationTrack::with_keys(track, &changes))
}

fn limb(clip: &Clip, joint: usize) -> DVec3 {
    let child = clip.skeleton.children(joint)[0];
    clip.skeleton.joints()[child].rest.translation.normalize()
}

fn half_turns(clip: &Clip, joint: usize) -> Vec<Snag> {
    let options = SurveyOptions { kinds: vec![SnagKind::HalfTurn], limits: None };
    let snags = mend::survey(clip, &options, &Unwatched).unwrap().snags;
    snags.into_iter().filter(|snag| snag.joint == joint).collect()
}

fn first_clip(file: &str) -> Option<Clip> {
    let path = shared(&format!("data/{file}"))?;
    Some((*open(&path, &OpenOptions::default()).unwrap().clips[0]).clone())
}

/// Whether exactly these keys are told.
fn are_told(snags: &[Snag], runs: &[RangeInclusive<usize>]) -> bool {
    snags.len() == runs.len()
        && snags.iter().zip(runs).all(|(snag, run)| (snag.first_key..=snag.last_key) == *run)
}

#[test]
fn a_thigh_that_flips_early_and_stays_so_is_wrong_behind_the_jump() {
    let Some(clip) = first_clip("bvh/cmu_02_01_walk.bvh") else { return };
    let joint = clip.skeleton.find("RightUpLeg").unwrap();
    let last = clip.rotation(joint).unwrap().keys.len() - 1;
    let broken = flipped(&clip, joint, limb(&clip, joint), &[110..=last]);
    let snags = half_turns(&broken, joint);
    assert!(are_told(&snags, &[110..=last]), "{:?}", snags.iter().map(|snag| &snag.text).collect::<Vec<_>>());
    let text = &snags[0].text;
    assert!(text.contains("beyond its limit") && text.contains("the other side"), "{text}");
    assert!(snags[0].safe, "{text}");
}

#[test]
fn a_shin_that_is_right_in_the_middle_alone_is_wrong_on_both_sides_of_it() {
    let Some(clip) = first_clip("bvh/cmu_02_01_walk.bvh") else { return };
    let joint = clip.skeleton.find("RightLeg").unwrap();
    let last = clip.rotation(joint).unwrap().keys.len() - 1;
    let runs = [0..=119, 240..=last];
    let broken = flipped(&clip, joint, limb(&clip, joint), &runs);
    let snags = half_turns(&broken, joint);
    assert!(are_told(&snags, &runs), "{:?}", snags.iter().map(|snag| &snag.text).collect::<Vec<_>>());
}

#[test]
fn the_longer_side_is_found_wrong_in_arms_and_legs_of_people_and_beasts() {
    let people = [
        "bvh/cmu_02_01_walk.bvh",
        "bvh/zxy_19joints_30fps.bvh",
        "bvh/xyz_affective_walk.bvh",
        "bvh/mixed_order_6ch.bvh",
        "bvh/yxz_23joints_120fps.bvh",
        "gltf/biped23_movement_clips.glb",
        "gltf/wolf.glb",
        "gltf/Fox.glb",
    ];
    let roles = [Role::UpperArm, Role::LowerArm, Role::UpperLeg, Role::LowerLeg];
    let (mut tried, mut right) = (0, 0);
    for file in people {
        let Some(clip) = first_clip(file) else { return };
        let found = Roles::find(&clip.skeleton);
        let joints = Side::BOTH.into_iter().flat_map(|side| roles.map(|role| role(side)));
        for (number, joint) in joints.filter_map(|role| found.joint(role)).enumerate() {
            let Some(track) = clip.rotation(joint).filter(|track| track.keys.len() >= 40) else { continue };
            let count = track.keys.len();
            if clip.skeleton.children(joint).is_empty() || !half_turns(&clip, joint).is_empty() {
                continue;
            }
            // A flip about the limb, and one about an axis square to it; 55 to 75 of 100 frames are wrong.
            let along = limb(&clip, joint);
            for axis in [along, along.any_orthonormal_vector()] {
                let from = count * (25 + 4 * (number % 6)) / 100;
                for run in [from..=count - 1, 0..=count - 1 - from] {
                    let broken = flipped(&clip, joint, axis, std::slice::from_ref(&run));
                    let snags = half_turns(&broken, joint);
                    tried += 1;
                    if are_told(&snags, std::slice::from_ref(&run)) {
                        right += 1;
                    } else {
                        println!(
                            "{file} {run:?}: {:?}",
                            snags.iter().map(|snag| &snag.text).collect::<Vec<_>>()
                        );
                    }
                }
            }
        }
    }
    println!("{right} of {tried} flips longer than what is right are told on the right side");
    assert!(tried >= 100 && right * 10 >= tried * 9, "{right} of {tried}");
}
