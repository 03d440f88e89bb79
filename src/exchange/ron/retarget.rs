//! The retarget pass between the document and the file.

use std::sync::Arc;

use crate::clip::FootPart;
use crate::retarget::{FootContact, HandHold, HoldAt, KeptLimits, RestPick};
use crate::scene::RetargetPass;
use crate::skeleton::roles::Side;

use super::limits::{limits_from, limits_to};
use super::mirror;

/// The pass as the document holds it.
pub(super) fn retarget_from(pass: mirror::Retarget) -> Result<RetargetPass, String> {
    let feet = pass.feet.map(|feet| feet.into_iter().map(|own| foot_from(&own)).collect()).transpose()?;
    let limits = match pass.limits {
        None => None,
        Some(mirror::KeptLimits::Adult) => Some(KeptLimits::Adult),
        Some(mirror::KeptLimits::Given(limits)) => Some(KeptLimits::Given(Arc::new(limits_from(&limits)?))),
        Some(mirror::KeptLimits::OfSource(limits)) => {
            Some(KeptLimits::OfSource(Arc::new(limits_from(&limits)?)))
        }
    };
    let rest =
        |own: mirror::RestPick| RestPick { frame_secs: own.frame_seconds, is_straightened: own.straightened };
    Ok(RetargetPass {
        onto: pass.onto,
        rows: pass.rows,
        rests: [rest(pass.rests.0), rest(pass.rests.1)],
        roots: [pass.roots.0, pass.roots.1],
        plant_feet: pass.plant_feet,
        feet,
        hands: pass.hands.iter().map(hand_from).collect::<Result<_, String>>()?,
        limits,
    })
}

/// The pass as the file holds it.
pub(super) fn retarget_to(pass: &RetargetPass, labels: &dyn Fn(usize) -> String) -> mirror::Retarget {
    let foot = |own: &FootContact| mirror::FootContact {
        side: own.side.name().to_owned(),
        part: own.part.name().to_owned(),
        seconds: own.span_secs.into(),
    };
    let hand = |own: &HandHold| mirror::HandHold {
        side: own.side.name().to_owned(),
        seconds: own.span_secs.into(),
        at: match own.at {
            HoldAt::Still => mirror::HoldAt::Still,
            HoldAt::Place(place) => mirror::HoldAt::Place(place.x, place.y, place.z),
            HoldAt::OtherHand => mirror::HoldAt::OtherHand,
        },
    };
    let rest = |own: &RestPick| mirror::RestPick {
        frame_seconds: own.frame_secs,
        straightened: own.is_straightened,
    };
    mirror::Retarget {
        onto: pass.onto,
        rows: pass.rows.clone(),
        plant_feet: pass.plant_feet,
        rests: (rest(&pass.rests[0]), rest(&pass.rests[1])),
        roots: (pass.roots[0].clone(), pass.roots[1].clone()),
        feet: pass.feet.as_ref().map(|feet| feet.iter().map(foot).collect()),
        hands: pass.hands.iter().map(hand).collect(),
        limits: pass.limits.as_ref().map(|limits| match limits {
            KeptLimits::Adult => mirror::KeptLimits::Adult,
            // They are of the other skeleton, whose names nobody has here.
            KeptLimits::Given(limits) => {
                mirror::KeptLimits::Given(limits_to(limits, &|joint| format!("target joint {joint}")))
            }
            KeptLimits::OfSource(limits) => mirror::KeptLimits::OfSource(limits_to(limits, labels)),
        }),
    }
}

fn side_from(text: &str) -> Result<Side, String> {
    Side::BOTH
        .into_iter()
        .find(|side| side.name() == text)
        .ok_or_else(|| format!("expected the side left or right, found `{text}`"))
}

fn foot_from(own: &mirror::FootContact) -> Result<FootContact, String> {
    let part = FootPart::BOTH.into_iter().find(|part| part.name() == own.part);
    let part = part.ok_or_else(|| format!("expected the part heel or ball, found `{}`", own.part))?;
    Ok(FootContact { side: side_from(&own.side)?, part, span_secs: own.seconds.into() })
}

fn hand_from(own: &mirror::HandHold) -> Result<HandHold, String> {
    Ok(HandHold {
        side: side_from(&own.side)?,
        span_secs: own.seconds.into(),
        at: match own.at {
            mirror::HoldAt::Still => HoldAt::Still,
            mirror::HoldAt::Place(x, y, z) => HoldAt::Place(glam::DVec3::new(x, y, z)),
            mirror::HoldAt::OtherHand => HoldAt::OtherHand,
        },
    })
}

#[cfg(test)]
mod tests {
    use super::super::steps::{step_from, step_to};
    use super::*;
    use crate::limit::{Interval, JointLimit, Limits, Range, SwingLimit};
    use crate::rotor::Rotor;
    use crate::scene::PassStep;
    use glam::DVec3;

    #[test]
    fn all_that_a_retarget_holds_comes_back() {
        let cone = Range { swing: SwingLimit::Cone { half_rad: 0.5 }, twist: Interval::FREE };
        let limit = JointLimit::new(Rotor::IDENTITY, DVec3::Y, DVec3::X, cone);
        let limits = Limits { title: "stiff".to_owned(), joints: [(3, limit)].into() };
        let contact = FootContact { side: Side::Right, part: FootPart::Ball, span_secs: [0.25, 1.5] };
        let hold = |at| HandHold { side: Side::Left, span_secs: [0.5, 0.75], at };
        let places = [HoldAt::Still, HoldAt::Place(DVec3::new(0.1, -2.0, 3.0)), HoldAt::OtherHand];
        let pass = RetargetPass {
            onto: 2,
            rows: vec![(None, Some("head".to_owned())), (Some("Hips".to_owned()), None)],
            rests: [
                RestPick { frame_secs: Some(0.5), is_straightened: false },
                RestPick { frame_secs: None, is_straightened: true },
            ],
            roots: [None, Some("hips_b".to_owned())],
            plant_feet: true,
            feet: Some(vec![contact]),
            hands: places.into_iter().map(hold).collect(),
            limits: Some(KeptLimits::Given(Arc::new(limits.clone()))),
        };
        let carried = RetargetPass { limits: Some(KeptLimits::OfSource(Arc::new(limits))), ..pass.clone() };
        let adult = RetargetPass { limits: Some(KeptLimits::Adult), feet: Some(vec![]), ..pass.clone() };
        let plain = RetargetPass::new(1);
        for (pass, version) in [(pass, 3), (carried, 3), (adult, 3), (plain, 2)] {
            let saved = step_to(&PassStep::from(pass.clone()), &|joint| format!("joint {joint}"));
            assert_eq!(saved.version(), version);
            let text = ::ron::to_string(&saved).unwrap();
            let back: mirror::Step = ::ron::from_str(&text).unwrap();
            let PassStep::Retarget(mut back) = step_from(back).unwrap() else { panic!("{text}") };
            // Angles of limits go through degrees.
            if let (Some(KeptLimits::Given(own)), Some(KeptLimits::Given(its)))
            | (Some(KeptLimits::OfSource(own)), Some(KeptLimits::OfSource(its))) =
                (&pass.limits, &back.limits)
            {
                assert_eq!((own.title.as_str(), own.joints.len()), (its.title.as_str(), its.joints.len()));
                back.limits.clone_from(&pass.limits);
            }
            assert_eq!(back, pass, "{text}");
        }
    }
}
