//! Passes between the document and the file: one pair of arms for each kind.

use crate::blend::{JoinPlace, MixAlong, Reference, RootFrom, Side};
use crate::clip::{Foot, JointPoint, Kernel, KeyEdit, Push, PushFrame, Round, Smoothing};
use crate::rotor::{Bivector, Rotor};
use crate::scene::{
    BlendForm, BlendPass, ClipRef, Closing, KeysPass, LoopPass, MendPass, PassStep, PushPass, ReducePass,
    ResamplePass, Scope, SmoothPass,
};
use crate::skeleton::TwoJointLimb;
use crate::snag::{LoopClose, LoopForm, Plant, Remedy, Snag, SnagKind};

use super::key_edits::{key_edit_from, key_edit_to};
use super::limits::{limit_from, limits_pass_from, limits_pass_to};
use super::mirror;
use super::retarget::{retarget_from, retarget_to};

/// A step as the document holds it.
pub(super) fn step_from(step: mirror::Step) -> Result<PassStep, String> {
    Ok(match step {
        mirror::Step::Mend { kind, amount, snags } => {
            let kind = kind_from(&kind)?;
            amount_in_range(amount)?;
            let snags: Result<Vec<Snag>, String> =
                snags.into_iter().map(|snag| snag_from(kind, snag)).collect();
            MendPass { kind, snags: snags?, amount }.into()
        }
        mirror::Step::Resample { rate } => ResamplePass { rate }.into(),
        mirror::Step::Blend(blend) => blend_from(blend).into(),
        mirror::Step::Retarget { onto, rows, plant_feet, rests, roots, feet, hands, limits } => {
            retarget_from(mirror::Retarget { onto, rows, plant_feet, rests, roots, feet, hands, limits })?
                .into()
        }
        mirror::Step::Smooth { scope, kernel, cutoff_hz, most_deg, amount, with_places, masks } => {
            amount_in_range(amount)?;
            let kernel = Kernel::named(&kernel)
                .ok_or_else(|| format!("expected the kernel gaussian, binomial or box, found `{kernel}`"))?;
            SmoothPass {
                scope: scope_from(scope),
                smoothing: Smoothing { kernel, cutoff_hz, most_rad: most_deg.map(f64::to_radians) },
                amount,
                with_places,
                masks: masks.into_iter().map(scope_from).collect(),
            }
            .into()
        }
        mirror::Step::Push { pushes } => {
            let pushes: Result<Vec<Push>, String> = pushes.iter().map(push_from).collect();
            PushPass { pushes: pushes? }.into()
        }
        mirror::Step::Keys { edits } => {
            let edits: Result<Vec<KeyEdit>, String> = edits.into_iter().map(key_edit_from).collect();
            KeysPass { edits: edits? }.into()
        }
        mirror::Step::Reduce { scope, bound_deg, tip_bound, keep_seconds } => ReducePass {
            scope: scope_from(scope),
            bound_rad: bound_deg.to_radians(),
            tip_bound,
            keep_secs: keep_seconds,
        }
        .into(),
        mirror::Step::Limits(pass) => limits_pass_from(pass)?.into(),
        mirror::Step::Loop { part, close, rounds } => LoopPass {
            part_secs: part.map(|(first, last)| [first, last]),
            close: close.map(|close| match close {
                mirror::Closing::BySize => Closing::BySize,
                mirror::Closing::Spread => Closing::Spread,
                mirror::Closing::Window => Closing::Window,
            }),
            rounds,
        }
        .into(),
    })
}

/// A step as the file holds it. `label` names a joint.
pub(super) fn step_to(step: &PassStep, label: &dyn Fn(usize) -> String) -> mirror::Step {
    match step {
        PassStep::Mend(mend) => mirror::Step::Mend {
            kind: mend.kind.to_string(),
            amount: mend.amount,
            snags: mend.snags.iter().map(|snag| snag_to(snag, label(snag.joint))).collect(),
        },
        PassStep::Resample(pass) => mirror::Step::Resample { rate: pass.rate },
        PassStep::Blend(pass) => mirror::Step::Blend(blend_to(pass)),
        PassStep::Retarget(pass) => {
            let mirror::Retarget { onto, rows, plant_feet, rests, roots, feet, hands, limits } =
                retarget_to(pass, label);
            mirror::Step::Retarget { onto, rows, plant_feet, rests, roots, feet, hands, limits }
        }
        PassStep::Smooth(pass) => mirror::Step::Smooth {
            scope: scope_to(&pass.scope),
            kernel: pass.smoothing.kernel.name().to_owned(),
            cutoff_hz: pass.smoothing.cutoff_hz,
            most_deg: pass.smoothing.most_rad.map(f64::to_degrees),
            amount: pass.amount,
            with_places: pass.with_places,
            masks: pass.masks.iter().map(scope_to).collect(),
        },
        PassStep::Push(pass) => mirror::Step::Push { pushes: pass.pushes.iter().map(push_to).collect() },
        PassStep::Keys(pass) => mirror::Step::Keys { edits: pass.edits.iter().map(key_edit_to).collect() },
        PassStep::Reduce(pass) => mirror::Step::Reduce {
            scope: scope_to(&pass.scope),
            bound_deg: pass.bound_rad.to_degrees(),
            tip_bound: pass.tip_bound,
            keep_seconds: pass.keep_secs.clone(),
        },
        PassStep::Limits(pass) => mirror::Step::Limits(limits_pass_to(pass, label)),
        PassStep::Loop(pass) => mirror::Step::Loop {
            part: pass.part_secs.map(|[first, last]| (first, last)),
            close: pass.close.map(|close| match close {
                Closing::BySize => mirror::Closing::BySize,
                Closing::Spread => mirror::Closing::Spread,
                Closing::Window => mirror::Closing::Window,
            }),
            rounds: pass.rounds,
        },
    }
}

fn blend_from(blend: mirror::Blend) -> BlendPass {
    let (source, clip) = blend.other;
    let form = match blend.form {
        mirror::BlendForm::Join { first, second, overlap } => {
            BlendForm::Join(JoinPlace { first_secs: first, second_secs: second, overlap_secs: overlap })
        }
        mirror::BlendForm::Mix { weight, aligned, root } => BlendForm::Mix {
            weight: MixAlong { knots: weight.into_iter().map(|(secs, weight)| [secs, weight]).collect() },
            is_aligned: aligned,
            root: match root {
                mirror::RootFrom::Both => RootFrom::Both,
                mirror::RootFrom::First => RootFrom::First,
                mirror::RootFrom::Second => RootFrom::Second,
            },
        },
        mirror::BlendForm::Add { weight, reference, side } => BlendForm::Add {
            weight,
            reference: match reference {
                mirror::Reference::First => Reference::First,
                mirror::Reference::Rest => Reference::Rest,
                mirror::Reference::Mean => Reference::Mean,
            },
            side: match side {
                mirror::Side::Body => Side::Body,
                mirror::Side::Parent => Side::Parent,
            },
        },
        mirror::BlendForm::Mean { weights: (own, other), more, aligned } => BlendForm::Mean {
            weights: [own, other],
            more: more.into_iter().map(|(source, clip, weight)| (ClipRef { source, clip }, weight)).collect(),
            is_aligned: aligned,
        },
    };
    BlendPass { other: ClipRef { source, clip }, form, joints: blend.joints, holds_feet: blend.holds_feet }
}

fn blend_to(pass: &BlendPass) -> mirror::Blend {
    let form = match &pass.form {
        BlendForm::Join(place) => mirror::BlendForm::Join {
            first: place.first_secs,
            second: place.second_secs,
            overlap: place.overlap_secs,
        },
        BlendForm::Mix { weight, is_aligned, root } => mirror::BlendForm::Mix {
            weight: weight.knots.iter().map(|&[secs, weight]| (secs, weight)).collect(),
            aligned: *is_aligned,
            root: match root {
                RootFrom::Both => mirror::RootFrom::Both,
                RootFrom::First => mirror::RootFrom::First,
                RootFrom::Second => mirror::RootFrom::Second,
            },
        },
        BlendForm::Add { weight, reference, side } => mirror::BlendForm::Add {
            weight: *weight,
            reference: match reference {
                Reference::First => mirror::Reference::First,
                Reference::Rest => mirror::Reference::Rest,
                Reference::Mean => mirror::Reference::Mean,
            },
            side: match side {
                Side::Body => mirror::Side::Body,
                Side::Parent => mirror::Side::Parent,
            },
        },
        BlendForm::Mean { weights: [own, other], more, is_aligned } => mirror::BlendForm::Mean {
            weights: (*own, *other),
            more: more.iter().map(|&(clip, weight)| (clip.source, clip.clip, weight)).collect(),
            aligned: *is_aligned,
        },
    };
    let other = (pass.other.source, pass.other.clip);
    mirror::Blend { other, form, joints: pass.joints.clone(), holds_feet: pass.holds_feet }
}

fn push_from(push: &mirror::Push) -> Result<Push, String> {
    let frame = PushFrame::named(&push.frame)
        .ok_or_else(|| format!("expected the frame own, rest, parent or world, found `{}`", push.frame))?;
    let (yz, zx, xy) = push.plane_angles;
    Ok(Push {
        joint: push.joint,
        center_secs: push.center,
        reach_secs: push.reach,
        turn: Bivector::from_degrees([yz, zx, xy]),
        frame,
    })
}

fn push_to(push: &Push) -> mirror::Push {
    mirror::Push {
        joint: push.joint,
        center: push.center_secs,
        reach: push.reach_secs,
        plane_angles: push.turn.to_degrees().into(),
        frame: push.frame.name().to_owned(),
    }
}

pub(super) fn scope_from(scope: mirror::Scope) -> Scope {
    let span_secs = scope.seconds.map(|(first, last)| [first, last]);
    Scope { joints: scope.joints, span_secs, fade_secs: scope.fade_seconds }
}

pub(super) fn scope_to(scope: &Scope) -> mirror::Scope {
    let seconds = scope.span_secs.map(|[first, last]| (first, last));
    mirror::Scope { joints: scope.joints.clone(), seconds, fade_seconds: scope.fade_secs }
}

pub(super) fn amount_in_range(amount: f64) -> Result<(), String> {
    if (0.0..=1.0).contains(&amount) {
        Ok(())
    } else {
        Err(format!("expected an amount from 0 to 1, found {amount}"))
    }
}

pub(super) fn kind_from(text: &str) -> Result<SnagKind, String> {
    text.parse().map_err(|error: crate::snag::NoSuchKind| error.to_string())
}

fn snag_from(kind: SnagKind, snag: mirror::Snag) -> Result<Snag, String> {
    Ok(Snag {
        kind,
        joint: snag.joint_index,
        first_key: snag.keys.0,
        last_key: snag.keys.1,
        first_frame: snag.frames.0,
        last_frame: snag.frames.1,
        first_secs: snag.seconds.0,
        last_secs: snag.seconds.1,
        size_rad: snag.size_deg.to_radians(),
        confidence: snag.confidence,
        remedy: match snag.remedy {
            mirror::Remedy::Normalise => Remedy::Normalise,
            mirror::Remedy::Negate => Remedy::Negate,
            mirror::Remedy::Unwrap(a, b, c) => Remedy::Unwrap([a, b, c]),
            mirror::Remedy::NearestAngles => Remedy::NearestAngles,
            mirror::Remedy::Redraw => Remedy::Redraw,
            mirror::Remedy::FromOthers => Remedy::FromOthers,
            mirror::Remedy::Smooth(noise_rad, quiet_rad, apart_keys) => {
                Remedy::Smooth { noise_rad, quiet_rad, apart_keys }
            }
            mirror::Remedy::ShortWay => Remedy::ShortWay,
            mirror::Remedy::TakeOut(s, yz, zx, xy) => Remedy::TakeOut(Rotor::new(s, yz, zx, xy)),
            mirror::Remedy::TakeOutAbove(s, yz, zx, xy) => Remedy::TakeOutAbove(Rotor::new(s, yz, zx, xy)),
            mirror::Remedy::Clamp(limit) => Remedy::Clamp(limit_from(&snag.joint, &limit)?),
            mirror::Remedy::Ask => Remedy::Ask,
            mirror::Remedy::CloseLoop { window, first, first_again, with_rate } => {
                Remedy::CloseLoop(LoopClose {
                    form: if window { LoopForm::Window } else { LoopForm::Spread },
                    round: Round { first, is_first_again: first_again },
                    with_rate,
                })
            }
            mirror::Remedy::Hold { limb, end_point, heel, ball, heel_frames, ball_frames, free } => {
                let point =
                    |(joint, offset): (usize, (f64, f64, f64))| JointPoint { joint, offset: offset.into() };
                let (upper, lower, end) = limb;
                Remedy::Hold(Plant {
                    foot: Foot {
                        limb: TwoJointLimb { upper, lower, end, end_point: end_point.into() },
                        heel: point(heel),
                        ball: point(ball),
                    },
                    heel: heel_frames,
                    ball: ball_frames,
                    free,
                })
            }
        },
        safe: snag.safe,
        text: snag.text,
    })
}

fn snag_to(snag: &Snag, joint: String) -> mirror::Snag {
    mirror::Snag {
        joint,
        joint_index: snag.joint,
        keys: (snag.first_key, snag.last_key),
        frames: (snag.first_frame, snag.last_frame),
        seconds: (snag.first_secs, snag.last_secs),
        size_deg: snag.size_rad.to_degrees(),
        confidence: snag.confidence,
        remedy: match snag.remedy {
            Remedy::Normalise => mirror::Remedy::Normalise,
            Remedy::Negate => mirror::Remedy::Negate,
            Remedy::Unwrap([a, b, c]) => mirror::Remedy::Unwrap(a, b, c),
            Remedy::NearestAngles => mirror::Remedy::NearestAngles,
            Remedy::Redraw => mirror::Remedy::Redraw,
            Remedy::FromOthers => mirror::Remedy::FromOthers,
            Remedy::Smooth { noise_rad, quiet_rad, apart_keys } => {
                mirror::Remedy::Smooth(noise_rad, quiet_rad, apart_keys)
            }
            Remedy::ShortWay => mirror::Remedy::ShortWay,
            Remedy::TakeOut(r) => mirror::Remedy::TakeOut(r.s, r.yz, r.zx, r.xy),
            Remedy::TakeOutAbove(r) => mirror::Remedy::TakeOutAbove(r.s, r.yz, r.zx, r.xy),
            Remedy::Clamp(limit) => mirror::Remedy::Clamp(mirror::JointLimit::of(&limit)),
            Remedy::Ask => mirror::Remedy::Ask,
            Remedy::CloseLoop(how) => mirror::Remedy::CloseLoop {
                window: how.form == LoopForm::Window,
                first: how.round.first,
                first_again: how.round.is_first_again,
                with_rate: how.with_rate,
            },
            Remedy::Hold(Plant { foot, heel, ball, free }) => mirror::Remedy::Hold {
                limb: (foot.limb.upper, foot.limb.lower, foot.limb.end),
                end_point: foot.limb.end_point.into(),
                heel: (foot.heel.joint, foot.heel.offset.into()),
                ball: (foot.ball.joint, foot.ball.offset.into()),
                heel_frames: heel,
                ball_frames: ball,
                free,
            },
        },
        safe: snag.safe,
        text: snag.text.clone(),
    }
}
