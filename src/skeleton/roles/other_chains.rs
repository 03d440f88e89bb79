//! Chains that are no limb of a person: further legs, wings, tails, ears, strands.

use super::body::Plan;
use super::find::Finder;
use super::found::{Chain, ChainKind};
use super::name::Part;
use super::pairs::Pair;

impl Finder<'_, '_> {
    /// All that is in no chain yet: further legs, wings, tails, ears, hair.
    pub(super) fn other_chains(&mut self, plan: &Plan) {
        let figure = self.figure;
        let mut taken = vec![false; figure.names.len()];
        for joint in self.chains.iter().flat_map(|chain| &chain.joints).chain(plan.hips.iter()) {
            taken[*joint] = true;
        }
        for helper in &self.twist {
            taken[helper.joint] = true;
        }
        let used = |first: usize| {
            [&plan.legs, &plan.arms, &plan.front_legs]
                .into_iter()
                .flatten()
                .any(|limbs| limbs.pair.first.contains(&first))
        };
        for pair in plan.pairs.iter().filter(|pair| !used(pair.first[0])) {
            let kind = self.kind_of_pair(plan, pair);
            for (side, first) in self.sides(pair).into_iter().zip(pair.first) {
                let joints: Vec<usize> =
                    figure.path_down(first).into_iter().filter(|&joint| !taken[joint]).collect();
                if joints.is_empty() {
                    continue;
                }
                for &joint in &joints {
                    taken[joint] = true;
                }
                self.chains.push(Chain { kind, side: Some(side), joints });
            }
        }
        for start in (0..figure.names.len()).filter(|&joint| figure.is_active[joint]) {
            if taken[start] {
                continue;
            }
            let mut joints = vec![start];
            taken[start] = true;
            let mut at = start;
            while let Some(next) = figure.main_kid(at).filter(|&next| !taken[next]) {
                taken[next] = true;
                joints.push(next);
                at = next;
            }
            let named_tail = joints.iter().any(|&joint| figure.names[joint].score(Part::Tail) > 0.9);
            let on = figure.parent[start];
            let behind = on.is_some_and(|on| {
                let way = figure.far[start] - figure.position[on];
                way.dot(self.shape.forward) < -0.3 * way.length() && way.length() > 0.1 * self.shape.height
            });
            let on_hips = on.is_some() && on == plan.hips && !figure.names[start].is_strand();
            let kind = if named_tail || (on_hips && behind) { ChainKind::Tail } else { ChainKind::Other };
            let side = figure.names[start].side;
            self.chains.push(Chain { kind, side, joints });
        }
    }

    pub(super) fn kind_of_pair(&self, plan: &Plan, pair: &Pair) -> ChainKind {
        let figure = self.figure;
        let path = figure.path_down(pair.first[0]);
        let says = |part: Part| path.iter().any(|&joint| figure.names[joint].score(part) > 0.6);
        if says(Part::Wing) {
            return ChainKind::Wing;
        }
        if says(Part::Ear) {
            return ChainKind::Ear;
        }
        if path.iter().any(|&joint| figure.names[joint].is_strand()) {
            return ChainKind::Other;
        }
        let height = self.shape.height.max(f64::MIN_POSITIVE);
        let fall = |first: usize| (figure.position[pair.on] - figure.far[first]).dot(plan.up);
        let low = |first: usize| figure.far[first].dot(plan.up) - plan.span[0] < 0.2 * height;
        if says(Part::UpperLeg)
            || says(Part::LowerLeg)
            || (pair.first.iter().all(|&first| low(first) && fall(first) > 0.15 * height))
        {
            return ChainKind::Leg;
        }
        let on_trunk = Some(pair.on) == plan.hips || plan.trunk.contains(&pair.on);
        let wide = pair.first.iter().all(|&first| figure.reach[first] > 0.25 * height);
        if on_trunk && wide { ChainKind::Wing } else { ChainKind::Other }
    }
}
