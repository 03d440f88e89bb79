//! What does not fit together once roles are given.

use std::collections::BTreeMap;

use super::body::Plan;
use super::find::Finder;
use super::role::{Role, Side};

impl Finder<'_, '_> {
    /// What does not fit together.
    pub(super) fn cross_checks(&mut self, plan: &Plan) {
        let by_role: BTreeMap<Role, usize> =
            self.candidates.iter().map(|one| (one.role, one.joint)).collect();
        if plan.front_legs.is_none() && (plan.legs.is_some() || plan.arms.is_some()) {
            let missing: Vec<String> = Role::all()
                .into_iter()
                .filter(|role| role.is_required() && !by_role.contains_key(role))
                .map(Role::words)
                .collect();
            if !missing.is_empty() {
                self.doubt(None, None, format!("not found: {}", missing.join(", ")));
            }
        }
        for (role, joint) in &by_role {
            let Some(Side::Left) = role.side() else { continue };
            let Some(other) = by_role.get(&role.mirror()) else { continue };
            let [own, its] = [*joint, *other].map(|joint| self.shape.limb_length(joint));
            let matters =
                matches!(role, Role::UpperArm(_) | Role::LowerArm(_) | Role::UpperLeg(_) | Role::LowerLeg(_));
            if matters && (own - its).abs() > 0.05 * own.max(its) {
                let text = format!(
                    "the {} is {:.0} % {} than the right one",
                    role.words(),
                    100.0 * (own / its - 1.0).abs(),
                    if own > its { "longer" } else { "shorter" }
                );
                self.doubt(Some(*joint), Some(*role), text);
            }
        }
    }
}
