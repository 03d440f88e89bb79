//! The blend lane as plain data: where the two clips lie in time, how much of the second is taken when, and how far their poses
//! are apart.

use std::sync::Arc;

use super::FaintFigure;
use crate::blend::{self, DistancePicture, GroundMove, JoinPlace, MixAlong, Registration, RootFrom, Stop};
use crate::clip::Clip;
use crate::retarget;
use crate::scene::{BlendForm, BlendPass, ClipRef};

/// Rows and columns of a distance picture at most.
const PICTURE_CELLS: usize = 96;
/// Places that are proposed.
const PROPOSED: usize = 3;

/// The four forms without their parameters.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum BlendKind {
    /// One after the other.
    Join,
    /// Between both.
    Mix,
    /// A layer on top.
    Add,
    /// The mean of several.
    Mean,
}

impl BlendKind {
    /// All of them.
    pub const ALL: [Self; 4] = [Self::Join, Self::Mix, Self::Add, Self::Mean];

    /// Of a form.
    pub const fn of(form: &BlendForm) -> Self {
        match form {
            BlendForm::Join(_) => Self::Join,
            BlendForm::Mix { .. } => Self::Mix,
            BlendForm::Add { .. } => Self::Add,
            BlendForm::Mean { .. } => Self::Mean,
        }
    }

    /// Its word.
    pub const fn word(self) -> &'static str {
        match self {
            Self::Join => "Join",
            Self::Mix => "Mix",
            Self::Add => "Add",
            Self::Mean => "Mean",
        }
    }

    /// What it does.
    pub const fn explanation(self) -> &'static str {
        match self {
            Self::Join => "The second clip follows the first, overlapping it",
            Self::Mix => "Between both clips by a weight, or by a curve of weights over time",
            Self::Add => "What the second clip does beyond its reference, laid over the first",
            Self::Mean => "The mean of two clips or more, each by its weight",
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
            Self::Mean => BlendForm::Mean { weights: [1.0; 2], more: Vec::new(), is_aligned: false },
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
    /// Where each frame of a mix or mean in step comes from.
    pub stops: Option<Vec<Stop>>,
    /// The further clips of a mean.
    pub more: Vec<Further>,
}

/// A clip of a mean beyond the first two.
#[derive(Clone, Debug)]
pub struct Further {
    /// As it was given.
    given: Arc<Clip>,
    /// On the first one's skeleton.
    pub clip: Arc<Clip>,
    /// It was carried over from another body.
    pub is_carried: bool,
    /// Which of its times belong together with the first one's; of a mean in step.
    along: Option<Arc<Registration>>,
    /// Where it is at each frame of a mean in step.
    pub stops: Option<Vec<Stop>>,
}

/// Works out what the lane shows of the clips given: the other one, and the further ones of a mean. What an earlier answer on the same clips
/// has is taken over.
///
/// # Errors
/// Why they can't be blended.
pub fn blend_facts(
    first: &Arc<Clip>,
    given: &Arc<Clip>,
    more: &[Arc<Clip>],
    pass: &BlendPass,
    known: Option<&BlendFacts>,
) -> Result<BlendFacts, String> {
    let of_first = known.filter(|known| Arc::ptr_eq(&known.first, first));
    let known = of_first.filter(|known| Arc::ptr_eq(&known.given, given));
    let carried = |given: &Arc<Clip>| {
        let partner = retarget::partner(given, &first.skeleton).map_err(|error| error.to_string())?;
        Ok::<_, String>((partner.clip, partner.is_carried))
    };
    let (second, is_carried) = match known {
        Some(known) => (Arc::clone(&known.second), known.is_carried),
        None => carried(given)?,
    };
    let further = |given: &Arc<Clip>| {
        let of = |known: &&Further| Arc::ptr_eq(&known.given, given);
        if let Some(known) = of_first.and_then(|known| known.more.iter().find(of)) {
            return Ok(known.clone());
        }
        let (clip, is_carried) = carried(given)?;
        Ok::<_, String>(Further { given: Arc::clone(given), clip, is_carried, along: None, stops: None })
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
        more: more.iter().map(further).collect::<Result<_, _>>()?,
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
            let along = known_or_aligned(facts.along.take(), first, &facts.second)?;
            facts.stops = Some(along.stops(weight, first.grid.rate));
            facts.along = Some(along);
        }
        BlendForm::Mean { weights, more, is_aligned: true } => {
            let along = known_or_aligned(facts.along.take(), first, &facts.second)?;
            facts.along = Some(Arc::clone(&along));
            let mut all = vec![along];
            for further in &mut facts.more {
                let along = known_or_aligned(further.along.take(), first, &further.clip)?;
                further.along = Some(Arc::clone(&along));
                all.push(along);
            }
            let all: Vec<&Registration> = all.iter().map(|along| &**along).collect();
            let weights: Vec<f64> = weights.iter().copied().chain(more.iter().map(|own| own.1)).collect();
            let stops = blend::mean_stops(&weights, &all, first.grid.rate);
            let mut stops = stops.map_err(|error| error.to_string())?.into_iter();
            facts.stops = stops.next();
            for (further, stops) in facts.more.iter_mut().zip(stops) {
                further.stops = Some(stops);
            }
        }
        BlendForm::Mix { .. } | BlendForm::Add { .. } | BlendForm::Mean { .. } => {}
    }
    Ok(facts)
}

fn known_or_aligned(
    known: Option<Arc<Registration>>,
    first: &Clip,
    other: &Clip,
) -> Result<Arc<Registration>, String> {
    match known {
        Some(along) => Ok(along),
        None => blend::align(first, other).map(Arc::new).map_err(|error| error.to_string()),
    }
}

/// Where the clips lie along the result's time.
#[derive(Clone, Debug, PartialEq)]
pub struct LaneBars {
    /// First and last second of the first clip's bar.
    pub first: [f64; 2],
    /// Of the second clip's.
    pub second: [f64; 2],
    /// Of the overlap of a join.
    pub overlap: Option<[f64; 2]>,
    /// Of the further clips of a mean.
    pub more: Vec<[f64; 2]>,
}

/// The bars of a blend of clips of these lengths, `result_secs` long.
pub fn lane_bars(form: &BlendForm, [first, second]: [f64; 2], result_secs: f64) -> LaneBars {
    let both = |end: f64| LaneBars { first: [0.0, end], second: [0.0, end], overlap: None, more: Vec::new() };
    match form {
        BlendForm::Join(place) => {
            let end = place.first_secs + place.overlap_secs;
            LaneBars {
                first: [0.0, end],
                second: [place.first_secs, place.first_secs + second - place.second_secs],
                overlap: Some([place.first_secs, end]),
                more: Vec::new(),
            }
        }
        BlendForm::Mix { is_aligned: true, .. } => both(result_secs),
        BlendForm::Mix { .. } => both(first.min(second)),
        BlendForm::Add { .. } => LaneBars { first: [0.0, first], ..both(second.min(first)) },
        // Of each as much as the mean takes: all of it in step, else up to the shortest end.
        BlendForm::Mean { more, .. } => {
            LaneBars { more: vec![[0.0, result_secs]; more.len()], ..both(result_secs) }
        }
    }
}

/// The weights of all clips of a mean, the first one's first; none of other forms.
pub fn mean_weights(form: &BlendForm) -> Vec<f64> {
    match form {
        BlendForm::Mean { weights, more, .. } => {
            weights.iter().copied().chain(more.iter().map(|&(_, weight)| weight)).collect()
        }
        BlendForm::Join(_) | BlendForm::Mix { .. } | BlendForm::Add { .. } => Vec::new(),
    }
}

/// The same mean with another weight for one of its clips.
pub fn with_mean_weight(form: &BlendForm, clip: usize, weight: f64) -> BlendForm {
    let mut form = form.clone();
    if let BlendForm::Mean { weights, more, .. } = &mut form {
        let own = match clip {
            0 | 1 => Some(&mut weights[clip]),
            _ => more.get_mut(clip - 2).map(|(_, weight)| weight),
        };
        if let Some(own) = own {
            *own = weight.max(0.0);
        }
    }
    form
}

/// What each of these weights is of their sum.
pub fn mean_shares(weights: &[f64]) -> Vec<f64> {
    let sum: f64 = weights.iter().sum();
    weights.iter().map(|weight| if sum > 0.0 { weight / sum } else { 0.0 }).collect()
}

/// The letter of a blend's clip: A is the one that the pass gets.
pub fn clip_letter(clip: usize) -> char {
    u8::try_from(clip)
        .ok()
        .and_then(|clip| b'A'.checked_add(clip))
        .filter(u8::is_ascii_uppercase)
        .map_or('+', char::from)
}

/// The weights at knots, and the range they may have on screen.
pub fn knots_of(form: &BlendForm) -> (Vec<[f64; 2]>, [f64; 2]) {
    match form {
        BlendForm::Join(_) | BlendForm::Mean { .. } => (Vec::new(), [0.0, 1.0]),
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
        BlendForm::Mean { .. } => mean_shares(&mean_weights(form))[1],
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
        BlendForm::Join(_) | BlendForm::Mean { .. } => form.clone(),
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
    /// The result's time for one of the first clip: the same, but in step.
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
        self.stop_of(self.stops.as_ref()?, result_secs)
    }

    fn stop_of<'a>(&self, stops: &'a [Stop], result_secs: f64) -> Option<&'a Stop> {
        let frame = (result_secs * self.first.grid.rate).round().max(0.0) as usize;
        stops.get(frame.min(stops.len().saturating_sub(1)))
    }

    /// The clips at a time of the result, each set down where it is taken from, with its letter; a clip without a part is left out. In
    /// a blend that goes its own way they are set down on the result.
    pub fn figures(&self, form: &BlendForm, result: &Clip, secs: f64) -> Vec<FaintFigure> {
        let further =
            self.more.iter().map(|further| (&further.clip, self.further_pose(form, further, result, secs)));
        let both = [&self.first, &self.second].into_iter().zip(self.poses(form, result, secs));
        let all = both.chain(further).enumerate();
        all.filter_map(|(number, (clip, pose))| {
            let (time_secs, place) = pose?;
            Some(FaintFigure { clip: Arc::clone(clip), time_secs, place, letter: clip_letter(number) })
        })
        .collect()
    }

    fn further_pose(
        &self,
        form: &BlendForm,
        further: &Further,
        result: &Clip,
        secs: f64,
    ) -> Option<(f64, GroundMove)> {
        match (form, &further.stops) {
            (BlendForm::Mean { is_aligned: true, .. }, Some(stops)) => {
                let at = self.stop_of(stops, secs)?.second_secs;
                Some((at, onto_result(result, secs, &further.clip, at)))
            }
            (BlendForm::Mean { is_aligned: false, .. }, _) => Some((secs, GroundMove::default())),
            _ => None,
        }
    }

    fn poses(&self, form: &BlendForm, result: &Clip, secs: f64) -> [Option<(f64, GroundMove)>; 2] {
        let none = GroundMove::default();
        match form {
            BlendForm::Join(place) => {
                let own = (secs <= place.first_secs + place.overlap_secs).then_some((secs, none));
                let other = secs - place.first_secs + place.second_secs;
                [own, (secs >= place.first_secs).then_some((other, self.ground))]
            }
            BlendForm::Mix { is_aligned: true, .. } | BlendForm::Mean { is_aligned: true, .. } => {
                let Some(stop) = self.stop(secs) else { return [None, None] };
                let onto = |clip: &Clip, at: f64| (at, onto_result(result, secs, clip, at));
                [Some(onto(&self.first, stop.first_secs)), Some(onto(&self.second, stop.second_secs))]
            }
            // The way of the result is not the mean of both.
            BlendForm::Mix { weight, root, .. } if *root != RootFrom::Both || weight.only().is_none() => {
                [&self.first, &self.second].map(|clip| Some((secs, onto_result(result, secs, clip, secs))))
            }
            BlendForm::Mix { .. } | BlendForm::Add { .. } | BlendForm::Mean { .. } => {
                [Some((secs, none)), Some((secs, none))]
            }
        }
    }
}

/// The move on the ground that brings a pose nearest to the result's.
fn onto_result(result: &Clip, secs: f64, clip: &Clip, at: f64) -> GroundMove {
    if result.skeleton.len() != clip.skeleton.len() {
        return GroundMove::default();
    }
    blend::pose_onto(result, secs, clip, at)
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
