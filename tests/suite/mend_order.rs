//! The order in which faults are mended and passes run: that of the methods page (section 13), whatever the order in which a person accepts them.
#![expect(clippy::unwrap_used, reason = "a helper fails its test")]

use std::sync::Arc;

use turnwright::clip::{Clip, RotationTrack, Smoothing};
use turnwright::exchange::{OpenOptions, open};
use turnwright::limit::{Clamp, ClampTo, LearnOptions, Limits, learned};
use turnwright::mend::{SurveyOptions, survey};
use turnwright::rotor::{Axis, Rotor};
use turnwright::scene::{
    ClipWork, Document, Edit, Evaluator, KeysPass, LimitsPass, MendPass, NoOthers, PassStep, PushPass, Scope,
    SmoothPass,
};
use turnwright::snag::{SnagKind, Unwatched};

use crate::planter::Random;
use crate::support::shared;

fn walk() -> Option<Arc<Clip>> {
    let source = open(&shared("data/bvh/cmu_02_01_walk.bvh")?, &OpenOptions::default()).unwrap();
    Some(source.clips[0].clone())
}

/// `reference/methods.md`, section 13: "units/finite, times, sign, wrap, twist flips, spikes, jumps, gaps, limits, filter, reduce". Times are put
/// in order when a file is read; a jump is what is left of a flip without a way back, and told with it; jitter goes before limits, since what
/// trembles across a limit is no joint bent too far, and the filter of the list is the smoothing pass.
#[test]
fn kinds_are_mended_in_the_order_of_the_methods_page() {
    let place = |kind: SnagKind| SnagKind::ALL.iter().position(|own| *own == kind).unwrap();
    let page = [
        SnagKind::BrokenValue,
        SnagKind::SignFlip,
        SnagKind::Wrap,
        SnagKind::HalfTurn,
        SnagKind::Spike,
        SnagKind::Stuck,
        SnagKind::PastLimit,
    ];
    assert!(page.map(place).is_sorted());
    assert!(place(SnagKind::Jitter) < place(SnagKind::PastLimit));
}

/// The walk with a broken value, a wrap, a flip, a spike and a bend beyond the limit, all in one joint.
fn broken(clip: &Clip, joint: usize) -> (Clip, Limits) {
    let mut limits = learned(clip, &LearnOptions::default());
    limits.joints.retain(|own, _| *own == joint);
    let track = clip.rotation(joint).unwrap();
    let turned = |key: usize, by: Rotor| (key, track.sound_key(key) * by);
    let flip = (60..90).map(|key| turned(key, Axis::Y.rotor(std::f64::consts::PI)));
    let spike = std::iter::once(turned(120, Axis::X.rotor(0.8)));
    let bump = |key: usize| (std::f64::consts::PI * (key - 160) as f64 / 60.0).sin().powi(2);
    let bend = (161..220).map(|key| turned(key, Axis::Z.rotor(0.9 * bump(key))));
    let changes: Vec<(usize, Rotor)> = flip.chain(spike).chain(bend).collect();
    let track: RotationTrack = track.with_keys(&changes);
    let angles = track.file_angles().unwrap();
    let mut triples = vec![(30, [f64::NAN; 3])];
    triples.extend((240..260).map(|key| (key, angles.degrees[key].map(|angle| angle + 360.0))));
    (clip.with_rotation(joint, track.with_angles(&triples)), limits)
}

#[test]
fn mends_run_in_mending_order_however_they_were_accepted() {
    let Some(clip) = walk() else { return };
    let joint = clip.skeleton.find("LeftForeArm").or_else(|| clip.skeleton.find("LeftArm")).unwrap();
    let (broken, limits) = broken(&clip, joint);
    let broken = Arc::new(broken);
    let options = SurveyOptions { limits: Some(Arc::new(limits.clone())), ..SurveyOptions::default() };
    let found = survey(&broken, &options, &Unwatched).unwrap();
    let kinds: Vec<SnagKind> = SnagKind::ALL
        .into_iter()
        .filter(|kind| found.snags.iter().any(|snag| snag.kind == *kind && snag.joint == joint))
        .collect();
    for kind in
        [SnagKind::BrokenValue, SnagKind::Wrap, SnagKind::HalfTurn, SnagKind::Spike, SnagKind::PastLimit]
    {
        assert!(kinds.contains(&kind), "{kind} is not among {kinds:?}");
    }
    let mut random = Random::new(20_261_201);
    for _ in 0..6 {
        // A limits pass is there already; mends come before it, one after the other, in any order.
        let mut document = Document { sources: vec![], works: vec![ClipWork::new(0, 0, "walk")] };
        let none = LimitsPass::new(Arc::new(Limits::default()));
        document = Edit::AddPass { work: 0, at: 0, step: none.into() }.apply(&document).unwrap();
        let mut left = found.snags.clone();
        while !left.is_empty() {
            let snag = left.swap_remove(random.whole(0, left.len() - 1));
            document = Edit::Mend { work: 0, snags: vec![snag] }.apply(&document).unwrap();
        }
        let passes = &document.works[0].passes;
        let order: Vec<SnagKind> =
            passes.iter().filter_map(|pass| pass.step.as_mend()).map(|mend| mend.kind).collect();
        assert!(order.is_sorted() && order.len() >= kinds.len(), "{order:?}");
        assert!(matches!(passes.last().unwrap().step, PassStep::Limits(_)));
        let result = Evaluator::default().evaluate(&broken, passes, &NoOthers).result;
        // The very numbers that the search arrived at, whoever accepted what first.
        assert!(result.same_joint(&found.mended, joint));
        let (own, wanted) = (result.rotation(joint).unwrap(), found.mended.rotation(joint).unwrap());
        assert!(own.changed_keys(wanted).is_empty());
    }
}

/// A pass that has nothing to do gives the clip it got, bit for bit.
#[test]
fn passes_with_nothing_to_do_change_no_bit() {
    let Some(clip) = walk() else { return };
    let wide = {
        let options = LearnOptions { margin_rad: 0.6, ..LearnOptions::default() };
        Arc::new(learned(&clip, &options))
    };
    let nowhere = Scope { span_secs: Some([1e6, 2e6]), ..Scope::default() };
    let sound = survey(&clip, &SurveyOptions::default(), &Unwatched).unwrap();
    let mut steps: Vec<PassStep> = vec![
        LimitsPass { clamp: Clamp::Hard(ClampTo::SameDirection), ..LimitsPass::new(wide) }.into(),
        SmoothPass { scope: nowhere, ..SmoothPass::new(Smoothing::gaussian(6.0)) }.into(),
        PushPass::default().into(),
        KeysPass::default().into(),
    ];
    steps.extend(SnagKind::ALL.map(|kind| MendPass::new(kind, Vec::new()).into()));
    for step in steps {
        let after = step.kind().apply(&clip, &NoOthers).unwrap().clip;
        for joint in 0..clip.joints.len() {
            let (Some(old), Some(new)) = (clip.rotation(joint), after.rotation(joint)) else { continue };
            assert!(new.changed_keys(old).is_empty(), "{}: {}", step.title(), clip.skeleton.label(joint));
        }
    }
    // What is sound is shared with what was searched.
    for joint in 0..clip.joints.len() {
        if !sound.snags.iter().any(|snag| snag.joint == joint) {
            assert!(clip.same_joint(&sound.mended, joint), "{}", clip.skeleton.label(joint));
        }
    }
}
