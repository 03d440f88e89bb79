//! Turns by hand at one moment, and the edit of the document that they come to: a key where keys are sparse, a soft push
//! where a track has a key for each frame.

use crate::clip::{Clip, KeyChange, KeyEdit, NewKey, Push, PushFrame, Times};
use crate::rotor::{Bivector, Rotor};
use crate::scene::{ClipWork, Edit, KeysPass, Pass, PassStep, PushPass};

use super::sampled::rotation_at;

/// One joint turned by hand.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct HandTurn {
    /// Which joint.
    pub joint: usize,
    /// How it turned before relative to its parent, unit.
    pub before: Rotor,
    /// How it is to turn, unit.
    pub after: Rotor,
    /// In whose planes the turn between the two is given.
    pub frame: PushFrame,
    /// That turn, plane angles in radians, of any size.
    pub turn: Bivector,
}

impl HandTurn {
    /// A turn in a frame. `parent_in_world` is how the parent turns in the scene; it counts for turns in the scene's planes.
    pub fn new(
        joint: usize,
        before: Rotor,
        frame: PushFrame,
        turn: Bivector,
        parent_in_world: Rotor,
    ) -> Self {
        let rotor = Rotor::from_plane_angles(turn);
        let after = match frame {
            PushFrame::Own => before * rotor,
            // Turns at rest are given in the parent's planes: a rest stands still there.
            PushFrame::Parent | PushFrame::Rest => rotor * before,
            PushFrame::World => parent_in_world.reverse() * rotor * parent_in_world * before,
        };
        let frame = if frame == PushFrame::Rest { PushFrame::Parent } else { frame };
        Self { joint, before, after: after.normalize(), frame, turn }
    }

    /// From one turn to another, the short way, in the parent's planes.
    pub fn between(joint: usize, before: Rotor, after: Rotor) -> Self {
        let turn = (after * before.reverse()).plane_angles();
        Self { joint, before, after, frame: PushFrame::Parent, turn }
    }
}

/// What is turned by hand at one moment; all of it is one step of the history.
#[derive(Clone, Debug, PartialEq)]
pub struct HandTurns {
    /// What the history calls it.
    pub label: String,
    /// When, seconds.
    pub at_secs: f64,
    /// The joints.
    pub turns: Vec<HandTurn>,
}

/// More seconds than this from key to key are no capture.
const CAPTURED_STEP_SECS: f64 = 0.11;

/// Whether a joint has a key for (nearly) each frame around a time, so that a single new key would be a spike.
pub fn is_dense(clip: &Clip, joint: usize, at_secs: f64) -> bool {
    /// Frames looked at to either side.
    const AROUND: f64 = 6.0;
    let Some(track) = clip.rotation(joint).filter(|track| track.times.len() > 2) else { return false };
    let frame_secs = 1.0 / clip.grid.rate.max(1e-6);
    let (start, end) = (at_secs - AROUND * frame_secs, at_secs + AROUND * frame_secs);
    let within = |secs: &f64| (start..=end).contains(secs);
    let count = |times: &Times| {
        let from_first = (times.nearest(start.max(0.0))..times.len()).map(|key| times.at(key));
        from_first.skip_while(|secs| *secs < start).take_while(within).count()
    };
    let (frames, keys) = (count(&clip.grid.times), count(&track.times));
    frame_secs <= CAPTURED_STEP_SECS && frames > 2 && 4 * keys >= 3 * frames
}

/// The edit that turns come to. `base` is the result they were made on.
///
/// New keys and pushes go behind all passes, so that what was done is what is seen. Those that are there already at the end are
/// carried on as long as order does not matter.
pub fn hand_edit(
    work_index: usize,
    work: &ClipWork,
    base: &Clip,
    hand: &HandTurns,
    falloff_secs: f64,
) -> Edit {
    let (dense, sparse): (Vec<&HandTurn>, Vec<&HandTurn>) =
        hand.turns.iter().partition(|turn| is_dense(base, turn.joint, hand.at_secs));
    let mut passes = work.passes.clone();
    let mut edits = Vec::new();
    if !sparse.is_empty() {
        let place = carried_on(&passes, base, &sparse, |step| matches!(step, PassStep::Keys(_)));
        let mut pass = match place.map(|place| &passes[place].step) {
            Some(PassStep::Keys(pass)) => pass.clone(),
            _ => KeysPass::default(),
        };
        for turn in sparse {
            set_key(&mut pass, base, turn, hand.at_secs);
        }
        put(&mut passes, &mut edits, work_index, place, pass.into());
    }
    if !dense.is_empty() {
        let place = carried_on(&passes, base, &dense, |step| matches!(step, PassStep::Push(_)));
        let mut pass = match place.map(|place| &passes[place].step) {
            Some(PassStep::Push(pass)) => pass.clone(),
            _ => PushPass::default(),
        };
        for turn in dense {
            add_push(&mut pass, turn, hand.at_secs, falloff_secs);
        }
        put(&mut passes, &mut edits, work_index, place, pass.into());
    }
    Edit::Together { label: hand.label.clone(), edits }
}

fn put(passes: &mut Vec<Pass>, edits: &mut Vec<Edit>, work: usize, place: Option<usize>, step: PassStep) {
    if let Some(place) = place.filter(|_| step.kind().joints().is_empty()) {
        edits.push(Edit::RemovePass { work, pass: passes.remove(place).id });
    } else if let Some(place) = place {
        passes[place].step = step.clone();
        edits.push(Edit::ChangePass { work, pass: passes[place].id, step });
    } else {
        let mut all = ClipWork::new(0, 0, "");
        all.passes = std::mem::take(passes);
        let pass = Pass { id: all.next_pass_id(), on: true, step: step.clone() };
        *passes = all.passes;
        passes.push(pass);
        edits.push(Edit::AddPass { work, step, at: usize::MAX });
    }
}

/// The pass that can take on further turns: one at the end, or with nothing but hand work on other joints behind it.
fn carried_on(
    passes: &[Pass],
    base: &Clip,
    turns: &[&HandTurn],
    is_wanted: impl Fn(&PassStep) -> bool,
) -> Option<usize> {
    let is_above_or_same = |joint: usize, of: usize| {
        std::iter::successors(Some(of), |&at| base.skeleton.joints().get(at)?.parent).any(|at| at == joint)
    };
    for (place, pass) in passes.iter().enumerate().rev() {
        let is_by_hand = matches!(pass.step, PassStep::Keys(_) | PassStep::Push(_));
        if !pass.on || !is_by_hand {
            return None;
        }
        if is_wanted(&pass.step) {
            return Some(place);
        }
        // A push in the scene's planes hangs on all joints above it as well, whichever of the two comes first.
        let touched = pass.step.kind().joints();
        let pushes = match &pass.step {
            PassStep::Push(own) => own.pushes.as_slice(),
            _ => &[],
        };
        let matters = |turn: &&HandTurn| {
            let is_in_scene = turn.frame == PushFrame::World;
            touched.iter().any(|&own| own == turn.joint || (is_in_scene && is_above_or_same(own, turn.joint)))
                || pushes
                    .iter()
                    .any(|push| push.frame == PushFrame::World && is_above_or_same(turn.joint, push.joint))
        };
        if turns.iter().any(matters) {
            return None;
        }
    }
    None
}

/// Two times within a quarter of a frame are one.
fn is_same_time(base: &Clip, a_secs: f64, b_secs: f64) -> bool {
    (a_secs - b_secs).abs() <= 0.25 / base.grid.rate.max(1e-6)
}

/// The turn that the last edit of a pass set for a joint at a time: what a next one is to go on from, also while the result
/// is still being worked out.
fn last_set(pass: &KeysPass, base: &Clip, joint: usize, at_secs: f64) -> Option<Rotor> {
    let last = pass.edits.last().filter(|edit| edit.joint == joint)?;
    match &last.change {
        KeyChange::Insert(keys) => {
            let [key] = keys.as_slice() else { return None };
            is_same_time(base, key.secs, at_secs).then_some(key.rotor)?
        }
        _ => None,
    }
}

fn set_key(pass: &mut KeysPass, base: &Clip, turn: &HandTurn, at_secs: f64) {
    if last_set(pass, base, turn.joint, at_secs).is_some() {
        pass.edits.pop();
    }
    let key = NewKey { secs: at_secs, rotor: Some(turn.after) };
    pass.edits.push(KeyEdit { joint: turn.joint, change: KeyChange::Insert(vec![key]) });
}

/// Adds a push, or lets the last one go on where it is of the same plane at the same moment.
fn add_push(pass: &mut PushPass, turn: &HandTurn, at_secs: f64, reach_secs: f64) {
    let push =
        Push { joint: turn.joint, center_secs: at_secs, reach_secs, turn: turn.turn, frame: turn.frame };
    if let Some(last) = pass.pushes.last_mut()
        && (last.joint, last.frame) == (push.joint, push.frame)
        && (last.center_secs - at_secs).abs() < 1e-9
        && (last.reach_secs - reach_secs).abs() < 1e-9
        && is_parallel(last.turn, push.turn)
    {
        last.turn = last.turn + push.turn;
        if last.turn.length() < 1e-12 {
            pass.pushes.pop();
        }
        return;
    }
    pass.pushes.push(push);
}

fn is_parallel(a: Bivector, b: Bivector) -> bool {
    a.axis().cross(b.axis()).length() <= 1e-9 * a.length() * b.length()
}

/// How a joint turns now: as the last edit at this moment left it, though its result may still be on its way.
pub fn turn_now(work: &ClipWork, result: &Clip, joint: usize, at_secs: f64) -> Rotor {
    let last = work.passes.last().filter(|pass| pass.on);
    let set = match last.map(|pass| &pass.step) {
        Some(PassStep::Keys(pass)) => last_set(pass, result, joint, at_secs),
        _ => None,
    };
    set.unwrap_or_else(|| rotation_at(result, joint, at_secs))
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use glam::DVec3;

    use super::*;
    use crate::clip::{FrameGrid, JointTracks, RotationTrack};
    use crate::rotor::Axis;
    use crate::scene::{Document, NoOthers, PassId};
    use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

    /// A joint with a key for each frame, one below it with three keys, one below that without any.
    fn clip() -> Clip {
        let joint = |number: usize| Joint {
            name: format!("j{number}"),
            number,
            parent: number.checked_sub(1),
            rest: Transform::from_translation(DVec3::Y),
            kind: JointKind::Joint,
            tips: vec![],
        };
        let grid = FrameGrid::even(30.0, 4.0);
        let dense = RotationTrack::from_rotors(grid.times.clone(), vec![Axis::X.rotor(0.3); grid.count()]);
        let sparse =
            RotationTrack::from_rotors(Times::Listed([0.0, 2.0, 4.0].into()), vec![Rotor::IDENTITY; 3]);
        let tracks = |rotation| Arc::new(JointTracks { rotation, ..JointTracks::default() });
        Clip {
            name: String::new(),
            skeleton: Arc::new(Skeleton::new((0..3).map(joint).collect()).unwrap()),
            joints: vec![tracks(Some(dense)), tracks(Some(sparse)), tracks(None)],
            grid,
            duration_secs: 4.0,
        }
    }

    fn turn(clip: &Clip, joint: usize, turn: Bivector) -> HandTurn {
        HandTurn::new(joint, rotation_at(clip, joint, 1.0), PushFrame::Parent, turn, Rotor::IDENTITY)
    }

    fn hand(turns: Vec<HandTurn>) -> HandTurns {
        HandTurns { label: "Turn".to_owned(), at_secs: 1.0, turns }
    }

    /// The document after turns by hand, one after the other, and their result.
    fn after(all: &[HandTurns], falloff_secs: f64) -> (ClipWork, Clip) {
        let clip = clip();
        let mut document = Document { works: vec![ClipWork::new(0, 0, "")], ..Document::default() };
        for turns in all {
            let edit = hand_edit(0, &document.works[0], &clip, turns, falloff_secs);
            document = edit.apply(&document).unwrap();
        }
        let mut result = Arc::new(clip);
        for pass in &document.works[0].passes {
            result = pass.step.kind().apply(&result, &NoOthers).unwrap().clip.into();
        }
        (document.works.remove(0), (*result).clone())
    }

    const PLANE: Bivector = Bivector::new(0.0, 0.0, 0.2);

    #[test]
    fn a_key_for_each_frame_is_dense_and_few_keys_are_not() {
        let clip = clip();
        assert!(is_dense(&clip, 0, 1.0) && is_dense(&clip, 0, 0.0) && is_dense(&clip, 0, 4.0));
        assert!(!is_dense(&clip, 1, 1.0) && !is_dense(&clip, 2, 1.0) && !is_dense(&clip, 9, 1.0));
    }

    #[test]
    fn a_dense_track_is_pushed_and_a_sparse_one_gets_a_key_in_one_step() {
        let base = clip();
        let both = hand(vec![turn(&base, 0, PLANE), turn(&base, 1, PLANE)]);
        let (work, result) = after(std::slice::from_ref(&both), 0.5);
        assert_eq!(work.passes.len(), 2);
        for own in &both.turns {
            assert!(rotation_at(&result, own.joint, 1.0).turn_to(own.after) < 1e-9);
        }
        let [dense, sparse] = [0, 1].map(|joint| result.rotation(joint).unwrap());
        // Beyond the falloff no key of the capture has changed; 14 frames to either side and the one in the middle have.
        assert_eq!(dense.changed_keys(base.rotation(0).unwrap()).len(), 29);
        assert_eq!(sparse.times.iter().collect::<Vec<_>>(), [0.0, 1.0, 2.0, 4.0]);
    }

    #[test]
    fn steps_at_one_moment_and_in_one_plane_stay_one_push_or_one_key() {
        let base = clip();
        let first = hand(vec![turn(&base, 0, PLANE), turn(&base, 1, PLANE)]);
        let twice =
            |joint| HandTurn::between(joint, base.rotation(joint).unwrap().at(1.0), Axis::Z.rotor(0.4));
        let second = hand(vec![turn(&base, 0, PLANE), twice(1)]);
        let (work, result) = after(&[first.clone(), second], 0.5);
        let PassStep::Push(pushes) = &work.passes[1].step else { panic!("a push") };
        assert_eq!(pushes.pushes.len(), 1);
        assert!((pushes.pushes[0].turn.xy - 0.4).abs() < 1e-12);
        let PassStep::Keys(keys) = &work.passes[0].step else { panic!("keys") };
        assert_eq!(keys.edits.len(), 1);
        assert!(rotation_at(&result, 1, 1.0).turn_to(Axis::Z.rotor(0.4)) < 1e-9);
        // There and back again is nothing at all.
        let back = hand(vec![turn(&base, 0, -PLANE)]);
        let only = hand(vec![turn(&base, 0, PLANE)]);
        assert!(after(&[only, back], 0.5).0.passes.is_empty());
    }

    #[test]
    fn a_pass_is_carried_on_unless_something_behind_it_matters() {
        let base = clip();
        let dense = hand(vec![turn(&base, 0, PLANE)]);
        let sparse = hand(vec![turn(&base, 1, PLANE)]);
        let kinds = |all: &[HandTurns]| {
            let name = |step: &PassStep| if matches!(step, PassStep::Push(_)) { "push" } else { "keys" };
            after(all, 0.5).0.passes.iter().map(|pass| name(&pass.step)).collect::<Vec<_>>()
        };
        // Keys and pushes of other joints do not disturb each other.
        assert_eq!(kinds(&[sparse.clone(), dense.clone(), sparse.clone()]), ["keys", "push"]);
        assert_eq!(kinds(&[dense.clone(), sparse.clone(), dense.clone()]), ["push", "keys"]);
        // A push in the scene's planes hangs on how the joints above turn.
        let in_scene = |joint| {
            let before = rotation_at(&base, joint, 1.0);
            hand(vec![HandTurn::new(joint, before, PushFrame::World, PLANE, Rotor::IDENTITY)])
        };
        let all = [hand(vec![turn(&base, 2, PLANE)]), in_scene(0), hand(vec![turn(&base, 2, PLANE)])];
        assert_eq!(kinds(&all), ["keys", "push"]);
        let mut below = base.clone();
        below.joints[2] = Arc::clone(&base.joints[0]);
        let work = |passes: Vec<PassStep>| {
            let passes =
                passes.into_iter().zip(0..).map(|(step, id)| Pass { id: PassId(id), on: true, step });
            passes.collect::<Vec<_>>()
        };
        let push = Push { joint: 2, center_secs: 1.0, reach_secs: 0.5, turn: PLANE, frame: PushFrame::World };
        let passes = work(vec![KeysPass::default().into(), PushPass { pushes: vec![push] }.into()]);
        let keys = |step: &PassStep| matches!(step, PassStep::Keys(_));
        assert_eq!(carried_on(&passes, &below, &[&turn(&below, 1, PLANE)], keys), None);
        let own = Push { frame: PushFrame::Parent, ..push };
        let passes = work(vec![KeysPass::default().into(), PushPass { pushes: vec![own] }.into()]);
        assert_eq!(carried_on(&passes, &below, &[&turn(&below, 1, PLANE)], keys), Some(0));
    }

    #[test]
    fn a_pass_that_is_switched_off_is_left_alone() {
        let base = clip();
        let mut work = ClipWork::new(0, 0, "");
        work.passes.push(Pass { id: PassId(4), on: false, step: PushPass::default().into() });
        let edit = hand_edit(0, &work, &base, &hand(vec![turn(&base, 0, PLANE)]), 0.3);
        let Edit::Together { edits, .. } = edit else { panic!("one step") };
        assert!(matches!(&edits[..], [Edit::AddPass { step: PassStep::Push(_), .. }]));
    }
}
