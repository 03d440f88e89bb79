//! The blend lane as plain data: where the two clips lie in time, how much of the second is taken when, and how far their poses
//! are apart.

use std::sync::Arc;

use crate::blend::{
    self, Cloud, DistancePicture, GroundMove, JoinPlace, Landmarks, MixAlong, Registration, RootFrom, Stop,
};
use crate::clip::Clip;
use crate::retarget;
use crate::scene::{BlendForm, BlendPass, ClipRef};

/// Rows and columns of a distance picture at most.
const PICTURE_CELLS: usize = 96;
/// Places that are proposed.
const PROPOSED: usize = 3;

/// The three forms without their parameters.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum BlendKind {
    /// One after the other.
    Join,
    /// Between both.
    Mix,
    /// A layer on top.
    Add,
}

impl BlendKind {
    /// All of them.
    pub const ALL: [Self; 3] = [Self::Join, Self::Mix, Self::Add];

    /// Of a form.
    pub const fn of(form: &BlendForm) -> Self {
        match form {
            BlendForm::Join(_) => Self::Join,
            BlendForm::Mix { .. } => Self::Mix,
            BlendForm::Add { .. } => Self::Add,
        }
    }

    /// Its word.
    pub const fn word(self) -> &'static str {
        match self {
            Self::Join => "Join",
            Self::Mix => "Mix",
            Self::Add => "Add",
        }
    }

    /// What it does.
    pub const fn explanation(self) -> &'static str {
        match self {
            Self::Join => "The second clip follows the first, overlapping it",
            Self::Mix => "Between both clips by a weight, or by a curve of weights over time",
            Self::Add => "What the second clip does beyond its reference, laid over the first",
        }
    }

    /// Parameters to begin with, for clips of these lengths.
    pub fn form(self, first_secs: f64, second_secs: f64) -> BlendForm {
        match self {
            Self::Join => {
                let shorter = first_secs.min(second_secs);
                let overlap_secs = (0.4 * shorter).min(0.5);
                let first = (first_secs - overlap_secs).max(0.0);
                BlendForm::Join(JoinPlace { first_secs: first, second_secs: 0.0, overlap_secs })
            }
            Self::Mix => {
                BlendForm::Mix { weight: MixAlong::constant(0.5), is_aligned: false, root: RootFrom::Both }
            }
            Self::Add => {
                BlendForm::Add { weight: 1.0, reference: blend::Reference::First, side: blend::Side::Body }
            }
        }
    }
}

/// A new blend of another clip.
pub fn new_blend(other: ClipRef, kind: BlendKind, first_secs: f64, second_secs: f64) -> BlendPass {
    BlendPass { other, form: kind.form(first_secs, second_secs), joints: None, holds_feet: true }
}

/// What has been worked out about a blend.
#[derive(Clone, Debug)]
pub struct BlendFacts {
    /// The clip that the pass gets.
    pub first: Arc<Clip>,
    /// The other clip as it was given.
    given: Arc<Clip>,
    /// The other clip on the first one's skeleton.
    pub second: Arc<Clip>,
    /// It was carried over from another body.
    pub is_carried: bool,
    /// The poses' distances, and the overlap they are for; of a join alone.
    pub distances: Option<(f64, Arc<DistancePicture>)>,
    /// The best places for a join, best first, with their distances.
    pub places: Vec<(JoinPlace, f64)>,
    /// How the second clip is set down in a join.
    pub ground: GroundMove,
    /// Which times belong together; of a mix in step.
    along: Option<Arc<Registration>>,
    /// Where each frame of a mix in step comes from.
    pub stops: Option<Vec<Stop>>,
}

/// Works out what the lane shows. What an earlier answer on the same clips has is taken over.
///
/// # Errors
/// Why the two can't be blended.
pub fn blend_facts(
    first: &Arc<Clip>,
    given: &Arc<Clip>,
    pass: &BlendPass,
    known: Option<&BlendFacts>,
) -> Result<BlendFacts, String> {
    let known = known.filter(|known| Arc::ptr_eq(&known.first, first) && Arc::ptr_eq(&known.given, given));
    let (second, is_carried) = if let Some(known) = known {
        (Arc::clone(&known.second), known.is_carried)
    } else {
        let partner = retarget::partner(given, &first.skeleton).map_err(|error| error.to_string())?;
        (partner.clip, partner.is_carried)
    };
    let mut facts = BlendFacts {
        first: Arc::clone(first),
        given: Arc::clone(given),
        second,
        is_carried,
        distances: None,
        places: Vec::new(),
        ground: GroundMove::default(),
        along: known.and_then(|known| known.along.clone()),
        stops: None,
    };
    match &pass.form {
        BlendForm::Join(place) => {
            let overlap = place.overlap_secs;
            let old = known.and_then(|known| known.distances.clone()).filter(|(of, _)| *of == overlap);
            let picture = match old {
                Some((_, picture)) => picture,
                None => Arc::new(
                    blend::join_distances(first, &facts.second, overlap, PICTURE_CELLS)
                        .map_err(|error| error.to_string())?,
                ),
            };
            facts.places = blend::best_places(&picture, overlap, PROPOSED);
            facts.distances = Some((overlap, picture));
            facts.ground = blend::join_ground(first, &facts.second, *place);
        }
        BlendForm::Mix { weight, is_aligned: true, .. } => {
            let along = match facts.along.take() {
                Some(along) => along,
                None => Arc::new(blend::align(first, &facts.second).map_err(|error| error.to_string())?),
            };
            facts.stops = Some(along.stops(weight, first.grid.rate));
            facts.along = Some(along);
        }
        BlendForm::Mix { .. } | BlendForm::Add { .. } => {}
    }
    Ok(facts)
}

/// Where the two clips lie along the result's time.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LaneBars {
    /// First and last second of the first clip's bar.
    pub first: [f64; 2],
    /// Of the second clip's.
    pub second: [f64; 2],
    /// Of the overlap of a join.
    pub overlap: Option<[f64; 2]>,
}

/// The bars of a blend of clips of these lengths, `result_secs` long.
pub fn lane_bars(form: &BlendForm, lengths_secs: [f64; 2], result_secs: f64) -> LaneBars {
    let [first, second] = lengths_secs;
    match form {
        BlendForm::Join(place) => {
            let end = place.first_secs + place.overlap_secs;
            LaneBars {
                first: [0.0, end],
                second: [place.first_secs, place.first_secs + second - place.second_secs],
                overlap: Some([place.first_secs, end]),
            }
        }
        BlendForm::Mix { is_aligned: true, .. } => {
            LaneBars { first: [0.0, result_secs], second: [0.0, result_secs], overlap: None }
        }
        BlendForm::Mix { .. } => {
            let shorter = first.min(second);
            LaneBars { first: [0.0, shorter], second: [0.0, shorter], overlap: None }
        }
        BlendForm::Add { .. } => {
            LaneBars { first: [0.0, first], second: [0.0, second.min(first)], overlap: None }
        }
    }
}

/// The weights at knots, and the range they may have on screen.
pub fn knots_of(form: &BlendForm) -> (Vec<[f64; 2]>, [f64; 2]) {
    match form {
        BlendForm::Join(_) => (Vec::new(), [0.0, 1.0]),
        BlendForm::Mix { weight, .. } => (weight.knots.clone(), [0.0, 1.0]),
        BlendForm::Add { weight, .. } => (vec![[0.0, *weight]], [-1.0, 2.0]),
    }
}

/// The weight of the second clip at a time of the first.
pub fn weight_at(form: &BlendForm, first_secs: f64) -> f64 {
    match form {
        BlendForm::Join(place) => place.weight(first_secs),
        BlendForm::Mix { weight, .. } => weight.at(first_secs),
        BlendForm::Add { weight, .. } => *weight,
    }
}

/// The same form with a knot moved: its time held between its neighbours, its weight within the range. The only knot stands for all
/// time and keeps its own.
pub fn with_knot(form: &BlendForm, knot: usize, to: [f64; 2], most_secs: f64) -> BlendForm {
    let (mut knots, range) = knots_of(form);
    let gap = 1e-3;
    let Some(&old) = knots.get(knot) else { return form.clone() };
    let least = knot.checked_sub(1).map_or(0.0, |before| knots[before][0] + gap);
    let most = knots.get(knot + 1).map_or(most_secs, |after| after[0] - gap);
    let secs = if knots.len() == 1 { old[0] } else { to[0].clamp(least, most.max(least)) };
    knots[knot] = [secs, to[1].clamp(range[0], range[1])];
    with_knots(form, knots)
}

/// The same form with one knot more, on the curve as it is; a mix alone has such.
pub fn with_knot_at(form: &BlendForm, secs: f64, weight: f64) -> BlendForm {
    let (mut knots, range) = knots_of(form);
    if !matches!(form, BlendForm::Mix { .. }) || knots.iter().any(|knot| (knot[0] - secs).abs() < 1e-3) {
        return form.clone();
    }
    if let [only] = knots.as_mut_slice()
        && secs > 0.0
    {
        // Until now it stood for all time.
        only[0] = 0.0;
    }
    let place = knots.partition_point(|knot| knot[0] < secs);
    knots.insert(place, [secs, weight.clamp(range[0], range[1])]);
    with_knots(form, knots)
}

/// The same form without a knot; the last one stays.
pub fn without_knot(form: &BlendForm, knot: usize) -> BlendForm {
    let (mut knots, _) = knots_of(form);
    if knots.len() > 1 && knot < knots.len() {
        knots.remove(knot);
    }
    with_knots(form, knots)
}

fn with_knots(form: &BlendForm, knots: Vec<[f64; 2]>) -> BlendForm {
    match form {
        BlendForm::Mix { is_aligned, root, .. } => {
            BlendForm::Mix { weight: MixAlong { knots }, is_aligned: *is_aligned, root: *root }
        }
        BlendForm::Add { reference, side, .. } => {
            let weight = knots.first().map_or(0.0, |knot| knot[1]);
            BlendForm::Add { weight, reference: *reference, side: *side }
        }
        BlendForm::Join(_) => form.clone(),
    }
}

/// A place for a join held within both clips: first the overlap, then where it begins.
pub fn held_place(place: JoinPlace, lengths_secs: [f64; 2]) -> JoinPlace {
    let shorter = lengths_secs[0].min(lengths_secs[1]);
    let overlap_secs = place.overlap_secs.clamp(1e-3_f64.min(shorter), shorter.max(1e-3));
    let within = |secs: f64, length: f64| secs.clamp(0.0, (length - overlap_secs).max(0.0));
    JoinPlace {
        first_secs: within(place.first_secs, lengths_secs[0]),
        second_secs: within(place.second_secs, lengths_secs[1]),
        overlap_secs,
    }
}

impl BlendFacts {
    /// The result's time for one of the first clip: the same, but for mixes in step.
    pub fn result_secs(&self, first_secs: f64) -> f64 {
        let Some(stops) = &self.stops else { return first_secs };
        let frame = stops.partition_point(|stop| stop.first_secs < first_secs);
        frame as f64 / self.first.grid.rate.max(1e-9)
    }

    /// The first clip's time at one of the result.
    pub fn first_secs(&self, result_secs: f64) -> f64 {
        self.stop(result_secs).map_or(result_secs, |stop| stop.first_secs)
    }

    fn stop(&self, result_secs: f64) -> Option<&Stop> {
        let stops = self.stops.as_ref()?;
        let frame = (result_secs * self.first.grid.rate).round().max(0.0) as usize;
        stops.get(frame.min(stops.len().saturating_sub(1)))
    }

    /// The two clips at a time of the result: which time of each, and where it is set down. `None` where a clip has no part. In a mix
    /// that goes its own way both are set down on the result.
    pub fn poses(&self, form: &BlendForm, result: &Clip, secs: f64) -> [Option<(f64, GroundMove)>; 2] {
        let none = GroundMove::default();
        match form {
            BlendForm::Join(place) => {
                let own = (secs <= place.first_secs + place.overlap_secs).then_some((secs, none));
                let other = secs - place.first_secs + place.second_secs;
                [own, (secs >= place.first_secs).then_some((other, self.ground))]
            }
            BlendForm::Mix { is_aligned: true, .. } => {
                let Some(stop) = self.stop(secs) else { return [None, None] };
                let onto = |clip: &Clip, at: f64| (at, onto_result(result, secs, clip, at));
                [Some(onto(&self.first, stop.first_secs)), Some(onto(&self.second, stop.second_secs))]
            }
            // The way of the result is not the mean of both.
            BlendForm::Mix { weight, root, .. } if *root != RootFrom::Both || weight.only().is_none() => {
                [&self.first, &self.second].map(|clip| Some((secs, onto_result(result, secs, clip, secs))))
            }
            BlendForm::Mix { .. } | BlendForm::Add { .. } => [Some((secs, none)), Some((secs, none))],
        }
    }
}

/// The move on the ground that brings a pose nearest to the result's.
fn onto_result(result: &Clip, secs: f64, clip: &Clip, at: f64) -> GroundMove {
    if result.skeleton.len() != clip.skeleton.len() {
        return GroundMove::default();
    }
    let landmarks = Landmarks::of(result);
    Cloud::of(result, &[secs], &landmarks).fit(0, &Cloud::of(clip, &[at], &landmarks), 0, 0).1
}

#[cfg(test)]
mod tests {
    use super::*;

    fn mix(knots: &[[f64; 2]]) -> BlendForm {
        let weight = MixAlong { knots: knots.to_vec() };
        BlendForm::Mix { weight, is_aligned: false, root: RootFrom::Both }
    }

    #[test]
    fn knots_stay_in_order_and_in_range() {
        let form = mix(&[[0.0, 0.2], [1.0, 0.5], [2.0, 0.8]]);
        assert_eq!(knots_of(&with_knot(&form, 1, [5.0, 1.7], 2.0)).0[1], [1.999, 1.0]);
        assert_eq!(knots_of(&with_knot(&form, 0, [-3.0, -1.0], 2.0)).0[0], [0.0, 0.0]);
        // The only knot stands for all time.
        assert_eq!(with_knot(&mix(&[[0.0, 0.2]]), 0, [1.0, 0.6], 2.0), mix(&[[0.0, 0.6]]));
        let two = with_knot_at(&mix(&[[0.7, 0.2]]), 0.5, 0.9);
        assert_eq!(two, mix(&[[0.0, 0.2], [0.5, 0.9]]));
        assert_eq!(without_knot(&two, 1), mix(&[[0.0, 0.2]]));
        assert_eq!(without_knot(&mix(&[[0.0, 0.2]]), 0), mix(&[[0.0, 0.2]]));
        let add = BlendKind::Add.form(1.0, 1.0);
        assert!(matches!(with_knot(&add, 0, [0.3, -0.5], 1.0), BlendForm::Add { weight: -0.5, .. }));
    }

    #[test]
    fn a_place_stays_within_both_clips() {
        let place = JoinPlace { first_secs: 9.0, second_secs: -1.0, overlap_secs: 0.5 };
        let expected = JoinPlace { first_secs: 1.5, second_secs: 0.0, overlap_secs: 0.5 };
        assert_eq!(held_place(place, [2.0, 3.0]), expected);
        let wide = JoinPlace { overlap_secs: 8.0, ..place };
        assert_eq!(held_place(wide, [2.0, 3.0]).overlap_secs, 2.0);
        let bars = lane_bars(&BlendForm::Join(expected), [2.0, 3.0], 4.5);
        assert_eq!((bars.first, bars.second, bars.overlap), ([0.0, 2.0], [1.5, 4.5], Some([1.5, 2.0])));
    }
}
