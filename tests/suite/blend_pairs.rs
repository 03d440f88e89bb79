//! What a blend promises of clips that differ: in rate, length, unit, rest pose and body; whose way is taken; means of many.

#![expect(clippy::unwrap_used, reason = "the helpers of a test fail as the test does")]

use std::sync::Arc;

use glam::DVec3;
use turnwright::blend::{
    self, GroundMove, Mask, MeanHow, MixAlong, MixHow, Reference, Registration, RootFrom, Side, add, align,
    join_on_feet, mix, mix_aligned, mix_by, mix_many, mix_many_by, moved,
};
use turnwright::clip::{Clip, JointTracks, VectorTrack, Worlds, resampled};
use turnwright::retarget;
use turnwright::rotor::{Axis, Rotor};
use turnwright::scene::{Closing, LoopPass, NoOthers, PassKind as _};
use turnwright::skeleton::{RestChoice, Skeleton, Transform};

use crate::blend_feet::{clip, clips, pairs, part, travelling};
use crate::support::{assert_close, largest};

fn how(weight: f64, root: RootFrom, mask: &Mask) -> MixHow {
    MixHow { weight: MixAlong::constant(weight), mask: mask.clone(), root, holds_feet: false }
}

fn worlds(clip: &Clip) -> (Vec<f64>, Worlds) {
    let secs: Vec<f64> = clip.grid.times.iter().collect();
    let worlds = clip.worlds_at(&secs);
    (secs, worlds)
}

/// The first joint with more than one below it, which stands for the body.
fn body(clip: &Clip) -> usize {
    let skeleton = &clip.skeleton;
    skeleton.listed().find(|&joint| skeleton.children(joint).len() > 1).unwrap()
}

fn captured_walk() -> Option<Arc<Clip>> {
    Some(part(&clips("data/bvh/cmu_02_01_walk.bvh")?[0], 0.02, 2.85))
}

#[test]
fn the_way_on_the_ground_is_the_one_that_was_asked_for() {
    for (name, a, b) in pairs() {
        let mask = Mask::all(&a.skeleton);
        let centre = body(&a);
        for (root, whose) in [(RootFrom::First, &a), (RootFrom::Second, &b)] {
            let made = mix_by(&a, &b, &how(0.4, root, &mask)).unwrap();
            let (secs, own) = worlds(&made);
            let their = whose.worlds_at(&secs);
            let size = largest(their.position(centre, 0).to_array().into_iter().map(f64::abs)).max(1.0);
            for frame in 0..secs.len() {
                let level = |p: DVec3| DVec3::new(p.x, 0.0, p.z);
                let [own, their] = [&own, &their].map(|worlds| level(worlds.position(centre, frame)));
                // A body that is more than one joint from the top swings about it as both clips do.
                assert_close!(own, their, 0.02 * size, "{name} {root:?} {frame}");
            }
        }
        // Whoever's way: no weight is the first clip, and the whole weight with its own way the second.
        for root in [RootFrom::First, RootFrom::Second] {
            assert_eq!(mix_by(&a, &b, &how(0.0, root, &mask)).unwrap().joints, {
                mix(&a, &b, &MixAlong::constant(0.0), &mask).unwrap().joints
            });
        }
        let [full, plain] =
            [RootFrom::Second, RootFrom::Both].map(|root| mix_by(&a, &b, &how(1.0, root, &mask)).unwrap());
        let (own, other) = (worlds(&full).1, worlds(&plain).1);
        for joint in a.skeleton.listed() {
            for frame in 0..full.grid.count() {
                assert_close!(own.rotation(joint, frame), other.rotation(joint, frame), 1e-11, "{name}");
            }
        }
    }
}

#[test]
fn a_clip_and_itself_elsewhere_mix_to_the_one_whose_way_is_taken() {
    let Some(walk) = captured_walk() else { return };
    let mask = Mask::all(&walk.skeleton);
    let away = moved(&walk, GroundMove { turn_rad: 1.9, x: 31.0, z: -12.0 });
    for (root, whose) in [(RootFrom::First, &*walk), (RootFrom::Second, &away)] {
        let made = mix_by(&walk, &away, &how(0.35, root, &mask)).unwrap();
        let ((_, own), (_, their)) = (worlds(&made), worlds(whose));
        for joint in walk.skeleton.listed() {
            for frame in 0..made.grid.count() {
                assert_close!(
                    own.position(joint, frame),
                    their.position(joint, frame),
                    1e-9,
                    "{root:?} {joint}"
                );
            }
        }
        // In step too, but for where it begins: at the first clip's place, heading as it does.
        let along = align(&walk, &away).unwrap();
        let made = mix_aligned(&walk, &away, &along, &how(0.35, root, &mask)).unwrap();
        let (_, own) = worlds(&made);
        let (_, first) = worlds(&walk);
        for joint in walk.skeleton.listed() {
            for frame in 0..made.grid.count() {
                let apart = own.position(joint, frame).distance(first.position(joint, frame));
                assert!(apart < 1e-6, "{root:?} {joint} {frame}: {apart}");
            }
        }
    }
    // A mask without the root takes the other's way all the same where that was asked for.
    let arm = Mask::limb(&walk.skeleton, "LeftArm", 0).unwrap();
    let made = mix_by(&walk, &away, &how(0.5, RootFrom::Second, &arm)).unwrap();
    let ((_, own), (_, their)) = (worlds(&made), worlds(&away));
    let hips = walk.skeleton.find("Hips").unwrap();
    for frame in 0..made.grid.count() {
        assert_close!(own.position(hips, frame), their.position(hips, frame), 1e-9, "{frame}");
    }
}

#[test]
fn means_of_many_keep_to_their_clips() {
    // Parts of one take, whose frames are of one length: then the order can't matter for the rate either.
    let Some(take) = clips("data/bvh/cmu_05_06_dance.bvh").map(|clips| clips[0].clone()) else { return };
    let [walk, dance, later] = [(0.0, 2.0), (2.0, 4.2), (4.5, 6.9)].map(|(from, to)| part(&take, from, to));
    let mask = Mask::all(&walk.skeleton);
    let mean = |clips: &[(&Clip, f64)]| mix_many(clips, &mask).unwrap();
    // Of two it is the mix.
    let two = mean(&[(&*walk, 3.0), (&*dance, 1.0)]);
    let mixed = mix(&walk, &dance, &MixAlong::constant(0.25), &mask).unwrap();
    // The order does not matter.
    let three = mean(&[(&*walk, 2.0), (&*dance, 1.0), (&*later, 3.0)]);
    let turned = mean(&[(&*later, 0.3), (&*walk, 0.2), (&*dance, 0.1)]);
    assert_eq!(two.grid.count(), mixed.grid.count());
    for joint in walk.skeleton.listed() {
        for secs in three.grid.times.iter().step_by(9) {
            let at = |clip: &Clip| clip.rotations_at(joint, &[secs])[0];
            assert_close!(at(&two), at(&mixed), 1e-11, "{joint} at {secs}");
            // Far apart turns have a flat sum of squares, so the last digits go.
            assert_close!(at(&three), at(&turned), 1e-9, "{joint} at {secs}");
        }
    }
    // Alone, and with itself, it is the first clip bit for bit; joints outside a mask are.
    for same in [
        mean(&[(&*walk, 1.0)]),
        mean(&[(&*walk, 1.0), (&*walk, 2.0)]),
        mean(&[(&*walk, 1.0), (&*dance, 0.0)]),
    ] {
        assert_eq!(same.joints, walk.joints);
    }
    let arm = Mask::limb(&walk.skeleton, "LeftArm", 1).unwrap();
    let masked = mix_many(&[(&*walk, 1.0), (&*dance, 1.0), (&*later, 1.0)], &arm).unwrap();
    for joint in walk.skeleton.listed() {
        assert_eq!(arm.of(joint) == 0.0, masked.same_joint(&walk, joint), "{joint}");
    }
    // A soft factor takes that share of the others alone.
    let shoulder = walk.skeleton.find("LeftShoulder").unwrap();
    let factor = arm.of(shoulder);
    assert!(factor > 0.0 && factor < 1.0);
    let mixed = mix(&walk, &dance, &MixAlong::constant(0.5), &arm).unwrap();
    let masked = mix_many(&[(&*walk, 1.0), (&*dance, 1.0)], &arm).unwrap();
    let at = |clip: &Clip| clip.rotations_at(shoulder, &[1.0])[0];
    assert_close!(at(&masked), at(&mixed), 1e-11);
    for (clips, words) in [
        (vec![], "with frames"),
        (vec![(&*walk, -1.0), (&*dance, 2.0)], "of at least 0"),
        (vec![(&*walk, 0.0), (&*dance, 0.0)], "above 0"),
        (vec![(&*walk, f64::NAN)], "of at least 0"),
    ] {
        let error = mix_many(&clips, &mask).unwrap_err().to_string();
        assert!(error.contains(words), "{error}");
    }
}

#[test]
fn mixes_in_step_do_not_ask_which_clip_is_the_first() {
    for (name, a, b) in pairs() {
        if (a.grid.rate - b.grid.rate).abs() > 1e-3 {
            continue;
        }
        let mask = Mask::all(&a.skeleton);
        let half = |a: &Clip, b: &Clip, weight: f64| {
            let along = align(a, b).unwrap();
            mix_aligned(a, b, &along, &how(weight, RootFrom::Both, &mask)).unwrap()
        };
        let (one, other) = (half(&a, &b, 0.4), half(&b, &a, 0.6));
        assert!(one.grid.count().abs_diff(other.grid.count()) <= 1, "{name}");
        let count = one.grid.count().min(other.grid.count());
        let worst = largest(
            a.skeleton.listed().filter(|&joint| a.skeleton.parent_joint(joint).is_some()).flat_map(|joint| {
                let (one, other) = (&one, &other);
                (0..count).map(move |frame| {
                    let at = |clip: &Clip| clip.rotations_at(joint, &[clip.grid.time(frame)])[0];
                    at(one).turn_to(at(other)).to_degrees()
                })
            }),
        );
        println!("{name}: {worst} degrees apart");
        assert!(worst < 1e-6, "{name}: {worst} degrees apart");
    }
}

#[test]
fn means_in_step_are_mixes_of_two_and_know_no_order_beyond_the_first() {
    let (Some(walk), Some(long)) = (captured_walk(), clips("data/bvh/cmu_05_06_dance.bvh")) else { return };
    let [dance, later] = [(0.0, 2.2), (2.0, 4.4)].map(|(from, to)| part(&long[0], from, to));
    let [dance, later] = [dance, later].map(|clip| retarget::partner(&clip, &walk.skeleton).unwrap().clip);
    let mask = Mask::all(&walk.skeleton);
    let registrations = [&dance, &later].map(|clip| align(&walk, clip).unwrap());
    let mean = |others: &[(usize, f64)], own: f64, holds_feet: bool| {
        let clips = [&dance, &later];
        let along: Vec<&Registration> = others.iter().map(|&(other, _)| &registrations[other]).collect();
        let others = others.iter().map(|&(other, weight)| (&**clips[other], weight));
        let all: Vec<(&Clip, f64)> = std::iter::once((&*walk, own)).chain(others).collect();
        mix_many_by(&all, &MeanHow { mask: &mask, along: Some(&along), holds_feet }).unwrap()
    };
    let apart = |one: &Clip, other: &Clip| {
        assert_eq!(one.grid.count(), other.grid.count());
        let secs: Vec<f64> = one.grid.times.iter().collect();
        let (own, their) = (one.worlds_at(&secs), other.worlds_at(&secs));
        let all = walk.skeleton.listed().flat_map(|joint| (0..secs.len()).map(move |frame| (joint, frame)));
        largest(all.map(|(joint, frame)| own.position(joint, frame).distance(their.position(joint, frame))))
    };
    // A figure is 25 to 30 units high.
    for holds_feet in [false, true] {
        let two = mean(&[(0, 1.0)], 3.0, holds_feet);
        let how =
            MixHow { weight: MixAlong::constant(0.25), mask: mask.clone(), root: RootFrom::Both, holds_feet };
        let mixed = mix_aligned(&walk, &dance, &registrations[0], &how).unwrap();
        let worst = apart(&two, &mixed);
        assert!(worst < 1e-6, "{worst} from the mix of two");
    }
    let three = mean(&[(0, 1.0), (1, 2.0)], 3.0, false);
    let worst = apart(&three, &mean(&[(1, 4.0), (0, 2.0)], 6.0, false));
    assert!(worst < 1e-6, "{worst} from the other order");
    // Its length is the mean of all, and with weight for the first alone it is the first.
    let lengths = (3.0 * walk.duration_secs + dance.duration_secs + 2.0 * later.duration_secs) / 6.0;
    assert!((three.duration_secs - lengths).abs() <= 1.0 / walk.grid.rate, "{}", three.duration_secs);
    assert_eq!(mean(&[(0, 0.0), (1, 0.0)], 1.0, true), *walk);
    // A clip with itself is itself, frame for frame.
    let own = align(&walk, &walk).unwrap();
    let all = [(&*walk, 1.0), (&*walk, 1.0), (&*walk, 2.0)];
    let how = MeanHow { mask: &mask, along: Some(&[&own, &own]), holds_feet: true };
    let worst = apart(&mix_many_by(&all, &how).unwrap(), &walk);
    assert!(worst < 1e-9, "{worst} from itself");
}

/// The same clip in another length unit.
fn in_unit(clip: &Clip, factor: f64) -> Clip {
    let joints = clip.skeleton.joints().iter().map(|joint| {
        let mut joint = joint.clone();
        joint.rest.translation *= factor;
        joint.tips.iter_mut().for_each(|tip| *tip *= factor);
        joint
    });
    let skeleton = Arc::new(Skeleton::new(joints.collect()).unwrap());
    let scaled = |tracks: &Arc<JointTracks>| {
        let mut tracks = (**tracks).clone();
        if let Some(track) = &mut tracks.translation {
            *track =
                VectorTrack { keys: track.keys.iter().map(|&key| key * factor).collect(), ..track.clone() };
        }
        Arc::new(tracks)
    };
    Clip { skeleton, joints: clip.joints.iter().map(scaled).collect(), ..clip.clone() }
}

#[test]
fn another_person_in_another_unit_makes_no_other_blend() {
    // Two people: one's limbs are 2 % longer in the median, some much more. How large a body is must not be taken for a part of its unit.
    let (Some(walk), Some(dance)) = (captured_walk(), clips("data/bvh/cmu_05_06_dance.bvh")) else { return };
    let mask = Mask::all(&walk.skeleton);
    let mixed = |second: Clip| {
        let second = retarget::partner(&Arc::new(second), &walk.skeleton).unwrap();
        assert!(!second.is_carried);
        mix(&walk, &second.clip, &MixAlong::constant(0.6), &mask).unwrap()
    };
    let plain = mixed((*dance[0]).clone());
    let own = worlds(&plain).1;
    let size = largest((0..plain.grid.count()).map(|frame| own.position(body(&walk), frame).length()));
    // Centimetres to metres, to millimetres, to inches, and between the captures' own unit and metres or centimetres.
    for factor in [0.01, 10.0, 1.0 / 2.54, 0.0254 / 0.45, 2.54 / 0.45, 1000.0] {
        let other = worlds(&mixed(in_unit(&dance[0], factor))).1;
        for joint in walk.skeleton.listed() {
            for frame in (0..plain.grid.count()).step_by(7) {
                let place = own.position(joint, frame);
                assert_close!(other.position(joint, frame), place, 1e-9 * size, "{factor}: {joint} {frame}");
            }
        }
    }
}

#[test]
fn another_unit_and_another_rate_make_no_other_blend() {
    let Some(take) = clips("data/bvh/cmu_05_06_dance.bvh") else { return };
    let [first, second] = [(0.0, 2.0), (2.0, 4.2)].map(|(from, to)| part(&take[0], from, to));
    let mask = Mask::all(&first.skeleton);
    let mixed = |second: Clip| {
        let second = retarget::partner(&Arc::new(second), &first.skeleton).unwrap();
        assert!(!second.is_carried);
        mix(&first, &second.clip, &MixAlong::constant(0.6), &mask).unwrap()
    };
    let plain = mixed((*second).clone());
    let metres = mixed(in_unit(&second, 0.0254));
    // Twice as many frames of the second: between its own it is played as its format says, so nothing changes.
    let quick = mixed(resampled(&second, 2.0 * second.grid.rate, 0.0, second.duration_secs));
    assert_eq!(metres.grid.count(), plain.grid.count());
    assert!(quick.grid.count().abs_diff(plain.grid.count()) <= 1);
    let rest = first.skeleton.world(&first.skeleton.rest_pose());
    let size = largest(rest.iter().map(|joint| joint.position().length()));
    let (own, unit, rate) = (worlds(&plain).1, worlds(&metres).1, worlds(&quick).1);
    for joint in first.skeleton.listed() {
        for frame in 0..plain.grid.count().min(quick.grid.count()) {
            let place = own.position(joint, frame);
            assert_close!(unit.position(joint, frame), place, 1e-6 * size, "{joint} {frame}");
            assert_close!(unit.rotation(joint, frame), own.rotation(joint, frame), 1e-9, "{joint} {frame}");
            assert_close!(rate.position(joint, frame), place, 1e-3 * size, "{joint} {frame}");
        }
    }
}

#[test]
fn another_rest_pose_of_the_same_body_is_seen_through() {
    let (Some(walk), Some(run)) = (
        clip("data/gltf/biped23_movement_clips.glb", "Rig_Medium|Walking_A"),
        clip("data/gltf/biped23_movement_clips.glb", "Rig_Medium|Running_A"),
    ) else {
        return;
    };
    // The same body that rests with its arms elsewhere: every joint that is turned at rest has keys.
    let mut joints = run.skeleton.joints().to_vec();
    for (index, joint) in joints.iter_mut().enumerate() {
        let is_arm = joint.name.contains("upperarm");
        if is_arm && run.rotation(index).is_some() {
            let rest = joint.rest;
            joint.rest = Transform { rotation: rest.rotation * Axis::X.rotor(0.6), ..rest };
        }
    }
    let rested = Clip { skeleton: Arc::new(Skeleton::new(joints).unwrap()), ..(*run).clone() };
    assert_ne!(rested.skeleton.joints(), run.skeleton.joints());
    let partner = retarget::partner(&Arc::new(rested.clone()), &walk.skeleton).unwrap();
    let (secs, own) = worlds(&partner.clip);
    let their = rested.worlds_at(&secs);
    // The arms go where they went, though what their joints' numbers say is another turn from another rest.
    let rest = walk.skeleton.world(&walk.skeleton.rest_pose());
    let size = largest(rest.iter().map(|at| at.position().length()));
    for side in ["l", "r"] {
        let joint = |name: &str| walk.skeleton.find(&format!("{name}.{side}")).unwrap();
        let [shoulder, elbow, wrist] = ["upperarm", "lowerarm", "wrist"].map(joint);
        for frame in 0..secs.len() {
            for point in [elbow, wrist] {
                let reach =
                    |worlds: &Worlds| worlds.position(point, frame) - worlds.position(shoulder, frame);
                assert_close!(reach(&own), reach(&their), 2e-3 * size, "{point} {frame}");
            }
        }
    }
    let mask = Mask::all(&walk.skeleton);
    let joined =
        join_on_feet(&walk, &partner.clip, blend::JoinPlace::end_to_start(&walk, 0.2), &mask).unwrap();
    assert!(joined.duration_secs > walk.duration_secs);
}

#[test]
fn a_layer_beyond_rest_is_measured_from_the_rest_pose_that_was_chosen() {
    let (Some(walk), Some(run)) = (clip("data/gltf/Fox.glb", "Walk"), clip("data/gltf/Fox.glb", "Run"))
    else {
        return;
    };
    // Its first frame chosen for the rest pose: beyond rest is then beyond the first frame.
    let pose = run.local_at(0.0);
    let skeleton = Arc::new(run.skeleton.with_rest(RestChoice::FirstFrame, pose));
    let rested = Arc::new(Clip { skeleton, ..(*run).clone() });
    let partner = retarget::partner(&rested, &walk.skeleton).unwrap();
    assert!(!partner.is_carried);
    let mask = Mask::all(&walk.skeleton);
    let laid = |layer: &Clip, reference| add(&walk, layer, 0.8, reference, Side::Body, &mask).unwrap();
    let (rest, first) = (laid(&partner.clip, Reference::Rest), laid(&run, Reference::First));
    let plain = laid(&run, Reference::Rest);
    let mut differs = false;
    for joint in walk.skeleton.listed() {
        for secs in [0.0, 0.2, 0.5] {
            let at = |clip: &Clip| clip.rotations_at(joint, &[secs])[0];
            assert_close!(at(&rest), at(&first), 1e-9, "{joint} at {secs}");
            differs |= at(&plain).turn_to(at(&first)) > 0.1;
        }
    }
    assert!(differs, "the fox's nodes stand in another pose than its run begins in");
}

/// The largest step of each joint's rate, and of the body's speed, from one frame to the next: at seams and at all other frames.
fn jolts(clip: &Clip, round: usize) -> [[f64; 2]; 2] {
    let (secs, worlds) = worlds(clip);
    let mut worst = [[0.0; 2]; 2];
    let mut put = |frame: usize, kind: usize, step: f64| {
        let own: &mut f64 = &mut worst[kind][usize::from(!frame.is_multiple_of(round))];
        *own = own.max(step);
    };
    for joint in clip.skeleton.listed() {
        let turns: Vec<Rotor> = clip.rotations_at(joint, &secs);
        let rate = |frame: usize| (turns[frame].reverse() * turns[frame + 1]).plane_angles();
        for frame in 1..secs.len() - 1 {
            put(frame, 0, (rate(frame) - rate(frame - 1)).length());
        }
    }
    let body = body(clip);
    for frame in 1..secs.len() - 1 {
        let [before, now, after] = [frame - 1, frame, frame + 1].map(|frame| worlds.position(body, frame));
        put(frame, 1, (after - now - (now - before)).length());
    }
    worst
}

#[test]
fn a_loop_repeated_has_no_jolt_at_its_seams() {
    let mut loops = Vec::new();
    if let Some(walk) = captured_walk() {
        let found = blend::best_loops(&walk, 0.9, 1, 400).unwrap()[0];
        loops.push(("a captured walk", walk, Some([found.from_secs, found.to_secs])));
    }
    for name in ["Rig_Medium|Walking_A", "Rig_Medium|Running_A"] {
        loops.extend(
            clip("data/gltf/biped23_movement_clips.glb", name)
                .map(|clip| ("a biped", Arc::new(travelling(&clip)), None)),
        );
    }
    loops.extend(clip("data/gltf/Fox.glb", "Run").map(|clip| ("a fox", clip, None)));
    for (name, clip, part_secs) in loops {
        for close in [Closing::BySize, Closing::Spread, Closing::Window] {
            let of = |rounds| LoopPass { part_secs, close: Some(close), rounds };
            let made = |rounds| of(rounds).apply(&clip, &NoOthers).unwrap().clip;
            let five = made(5);
            let round = (five.grid.count() - 1) / 5;
            assert_eq!(five.grid.count(), 5 * round + 1);
            let [[seam, within], [body_seam, body_within]] = jolts(&five, round);
            println!(
                "{name} {close:?}: {seam:.4} rad at seams, {within:.4} within; body {body_seam:.4}, {body_within:.4}"
            );
            assert!(seam <= within, "{name} {close:?}: {seam} at seams, {within} within");
            assert!(body_seam <= body_within, "{name} {close:?}: {body_seam} at seams, {body_within} within");
        }
    }
}
