//! Roles of hips, trunk, neck, head and face.

use super::body::Plan;
use super::figure::Figure;
use super::find::{Case, Finder, place_among};
use super::found::{Chain, ChainKind};
use super::name::Part;
use super::role::Role;

impl Finder<'_, '_> {
    pub(super) fn trunk_roles(&mut self, plan: &Plan) {
        let figure = self.figure;
        let name = |joint: usize, part: Part| figure.names[joint].score(part);
        let whole =
            [plan.legs.is_some(), plan.arms.is_some() || plan.front_legs.is_some(), !plan.neck.is_empty()];
        let shape = 0.4 + 0.2 * whole.iter().filter(|&&is| is).count() as f64;
        if let Some(hips) = plan.hips {
            let named = name(hips, Part::Hips);
            let case = Case {
                // Where the legs and the spine meet nothing else can be meant, whatever it is called.
                name: if named < 0.0 && plan.legs.is_some() { 0.0 } else { named },
                shape,
                side: 1.0,
                margin: 1.0,
                place: if plan.legs.is_some() { "legs and spine meet here" } else { "the trunk begins here" }
                    .to_owned(),
            };
            self.add(hips, Role::Hips, &case);
        }
        let n = plan.trunk.len();
        if n > 0 {
            self.chains.push(Chain { kind: ChainKind::Trunk, side: None, joints: plan.trunk.clone() });
        }
        let places = trunk_places(figure, plan);
        for (part, role, place) in [
            (Part::Spine, Role::Spine, places[0]),
            (Part::Chest, Role::Chest, places[1]),
            (Part::UpperChest, Role::UpperChest, places[2]),
        ] {
            let Some(place) = place else { continue };
            let joint = plan.trunk[place];
            // Trunk joints are told by their order; each trunk word fits each of them.
            let named = [Part::Spine, Part::Chest, Part::UpperChest, Part::Hips]
                .map(|part| name(joint, part))
                .into_iter()
                .fold(name(joint, part), f64::max);
            let case = Case {
                name: named,
                shape,
                side: 1.0,
                margin: if n <= 3 { 1.0 } else { 0.1 },
                place: format!(
                    "{} between hips and {}",
                    place_among(place, n),
                    if plan.arms.is_some() { "arms" } else { "neck" }
                ),
            };
            self.add(joint, role, &case);
        }
    }

    pub(super) fn neck_roles(&mut self, plan: &Plan) {
        let figure = self.figure;
        let chain = &plan.neck;
        let Some(&last) = chain.last() else { return };
        let score = |joint: usize, part: Part| figure.names[joint].score(part);
        self.chains.push(Chain { kind: ChainKind::Neck, side: None, joints: chain.clone() });
        let high = (figure.far[last].dot(plan.up) - plan.span[0])
            / (plan.span[1] - plan.span[0]).max(f64::MIN_POSITIVE);
        let shape = if plan.front_legs.is_some() { 0.8 } else { (0.4 + 0.6 * high).min(1.0) };
        let only_neck = chain.len() == 1 && score(last, Part::Neck) > 0.7;
        if !only_neck {
            let place = "the last joint of the chain above the shoulders".to_owned();
            let case = Case { name: score(last, Part::Head), shape, side: 1.0, margin: 1.0, place };
            self.add(last, Role::Head, &case);
        }
        if chain.len() > 1 || only_neck {
            let place = "the first joint above the shoulders".to_owned();
            let case = Case { name: score(chain[0], Part::Neck), shape, side: 1.0, margin: 1.0, place };
            self.add(chain[0], Role::Neck, &case);
        }
        // The face is told by names alone.
        for joint in figure.subtree(last).into_iter().skip(1) {
            let name = &figure.names[joint];
            let case = |named: f64| Case {
                name: named,
                shape: 0.7,
                side: 1.0,
                margin: 1.0,
                place: "it hangs on the head".to_owned(),
            };
            let first = |role: Role| self.candidates.iter().all(|other| other.role != role);
            if name.score(Part::Jaw) > 0.9 && first(Role::Jaw) {
                self.add(joint, Role::Jaw, &case(1.0));
            } else if name.score(Part::Eye) > 0.9
                && let Some(side) = name.side
                && first(Role::Eye(side))
            {
                self.add(joint, Role::Eye(side), &case(1.0));
            }
        }
    }
}

/// Which joints of the trunk are spine, chest and upper chest: up to three in order, of more by names and by their share of the
/// way (`skeleton-names` section 4.3).
fn trunk_places(figure: &Figure<'_>, plan: &Plan) -> [Option<usize>; 3] {
    let n = plan.trunk.len();
    match n {
        0 => return [None; 3],
        1 => return [Some(0), None, None],
        2 => return [Some(0), Some(1), None],
        3 => return [Some(0), Some(1), Some(2)],
        _ => {}
    }
    let mut along = vec![0.0];
    let mut before = plan.hips.map_or(figure.position[plan.trunk[0]], |hips| figure.position[hips]);
    for &joint in &plan.trunk {
        along.push(along[along.len() - 1] + figure.position[joint].distance(before));
        before = figure.position[joint];
    }
    let total = along[n].max(f64::MIN_POSITIVE);
    let share = |place: usize| along[place + 1] / total;
    let name = |place: usize, part: Part| {
        if figure.is_named { figure.names[plan.trunk[place]].score(part) } else { 0.0 }
    };
    let fit = |place: usize, part: Part, middle: f64| name(place, part) - (share(place) - middle).abs();
    let mut best: Option<(f64, [usize; 3])> = None;
    for spine in 0..n {
        for chest in spine + 1..n {
            for upper in chest + 1..n {
                let score = fit(spine, Part::Spine, 0.15)
                    + fit(chest, Part::Chest, 0.575)
                    + fit(upper, Part::UpperChest, 0.95);
                if best.is_none_or(|(most, _)| score > most + 1e-9) {
                    best = Some((score, [spine, chest, upper]));
                }
            }
        }
    }
    best.map_or([None; 3], |(_, places)| places.map(Some))
}
