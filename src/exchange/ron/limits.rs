//! Limits and their pass between the document and the file.

use std::sync::Arc;

use crate::limit::{Clamp, ClampTo, JointLimit, Limits};
use crate::rotor::Rotor;
use crate::scene::LimitsPass;

use super::super::limits::mirror::Defaults;
use super::mirror;
use super::steps::{amount_in_range, scope_from, scope_to};

/// Limits as the document holds them; joint numbers are those of the day the scene was saved.
pub(super) fn limits_from(limits: &mirror::Limits) -> Result<Limits, String> {
    let joints = limits.joints.iter().map(|(joint, label, limit)| Ok((*joint, limit_from(label, limit)?)));
    Ok(Limits { title: limits.title.clone(), joints: joints.collect::<Result<_, String>>()? })
}

/// Limits as the file holds them.
pub(super) fn limits_to(limits: &Limits, label: &dyn Fn(usize) -> String) -> mirror::Limits {
    let joints =
        limits.joints.iter().map(|(&joint, limit)| (joint, label(joint), mirror::JointLimit::of(limit)));
    mirror::Limits { title: limits.title.clone(), joints: joints.collect() }
}

/// In a scene zero and axes are always stated.
pub(super) fn limit_from(label: &str, limit: &mirror::JointLimit) -> Result<JointLimit, String> {
    let stated = Defaults { zero: Rotor::IDENTITY, limb: None };
    limit
        .limit(&stated)
        .map_err(|[expected, found]| format!("limit of `{label}`: expected {expected}, found {found}"))
}

/// The pass as the document holds it.
pub(super) fn limits_pass_from(pass: mirror::LimitsPass) -> Result<LimitsPass, String> {
    amount_in_range(pass.amount)?;
    Ok(LimitsPass {
        limits: Arc::new(limits_from(&pass.limits)?),
        clamp: match pass.clamp {
            mirror::Clamp::Soft => Clamp::Soft,
            mirror::Clamp::Hard => Clamp::Hard(ClampTo::SameDirection),
            mirror::Clamp::HardNearest => Clamp::Hard(ClampTo::Nearest),
        },
        amount: pass.amount,
        scope: scope_from(pass.scope),
    })
}

/// The pass as the file holds it.
pub(super) fn limits_pass_to(pass: &LimitsPass, label: &dyn Fn(usize) -> String) -> mirror::LimitsPass {
    mirror::LimitsPass {
        limits: limits_to(&pass.limits, label),
        clamp: match pass.clamp {
            Clamp::Soft => mirror::Clamp::Soft,
            Clamp::Hard(ClampTo::SameDirection) => mirror::Clamp::Hard,
            Clamp::Hard(ClampTo::Nearest) => mirror::Clamp::HardNearest,
        },
        amount: pass.amount,
        scope: scope_to(&pass.scope),
    }
}
