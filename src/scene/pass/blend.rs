//! The pass that makes one clip of its own and another.

use std::sync::Arc;

use crate::blend::{
    self, BlendError, JoinPlace, Mask, MeanHow, MixAlong, MixHow, Reference, Registration, RootFrom, Side,
};
use crate::clip::Clip;
use crate::retarget::{self, Partner};

use super::error::PassError;
use super::kind::{Outcome, PassKind, PassMemory};
use super::number::PassNumber;
use super::others::{ClipRef, Need, Others};

/// How a blend takes its other clip.
#[derive(Clone, Debug, PartialEq)]
pub enum BlendForm {
    /// The other clip after this one.
    Join(JoinPlace),
    /// Between both, frame by frame or in step.
    Mix {
        /// The weight of the other clip over this one's time.
        weight: MixAlong,
        /// Bring steps into time with each other.
        is_aligned: bool,
        /// Whose way over the ground is taken.
        root: RootFrom,
    },
    /// The other clip's difference from its reference, laid over this one.
    Add {
        /// How many times.
        weight: f64,
        /// What the difference is measured from.
        reference: Reference,
        /// On which side it is composed.
        side: Side,
    },
    /// The mean of this clip, the other and further ones.
    Mean {
        /// Weights of this clip and of the other, 0 and more. Only their ratio, and that to the further ones' weights, matters.
        weights: [f64; 2],
        /// Further clips and their weights.
        more: Vec<(ClipRef, f64)>,
        /// Bring the steps of all into time with this clip's.
        is_aligned: bool,
    },
}

/// Blends another clip in.
#[derive(Clone, Debug, PartialEq)]
pub struct BlendPass {
    /// The other clip.
    pub other: ClipRef,
    /// How it is taken.
    pub form: BlendForm,
    /// Factors for joints by number; `None` for all in full.
    pub joints: Option<Vec<(usize, f64)>>,
    /// Whether feet that stand in the clips are held in what is mixed or joined of both.
    pub holds_feet: bool,
}

impl BlendForm {
    /// The clips beyond the other one, with their weights; of a mean alone.
    pub fn more(&self) -> &[(ClipRef, f64)] {
        match self {
            Self::Mean { more, .. } => more,
            Self::Join(_) | Self::Mix { .. } | Self::Add { .. } => &[],
        }
    }
}

impl BlendPass {
    /// The title where it is known what the other clip is called.
    pub fn title_with(&self, other: &str) -> String {
        match &self.form {
            BlendForm::Join(_) => format!("Join {other}"),
            BlendForm::Mix { weight, .. } => match weight.only() {
                Some(only) => format!("Mix in {:.0} % of {other}", 100.0 * only),
                None => format!("Mix in {other}"),
            },
            BlendForm::Add { weight, .. } => format!("Add {:.0} % of {other}", 100.0 * weight),
            BlendForm::Mean { more, .. } if more.is_empty() => format!("Mean with {other}"),
            BlendForm::Mean { more, .. } => format!("Mean of {} clips", more.len() + 2),
        }
    }
}

/// Two clips as a blend has met them: the second brought to the first's skeleton, and which of their times belong together.
#[derive(Clone, Debug)]
pub(super) struct Pair {
    first: Arc<Clip>,
    given: Arc<Clip>,
    partner: Partner,
    along: Option<Registration>,
}

impl PassMemory {
    /// A clip with each of these, as pairs from before or new; others are forgotten.
    fn pairs(&mut self, first: &Arc<Clip>, all: &[Arc<Clip>]) -> Result<&mut [Pair], PassError> {
        let mut known = std::mem::take(&mut self.pairs);
        for given in all {
            let is_of = |pair: &Pair| Arc::ptr_eq(&pair.first, first) && Arc::ptr_eq(&pair.given, given);
            let pair = match known.iter().position(is_of) {
                Some(place) => known.swap_remove(place),
                None => Pair {
                    first: Arc::clone(first),
                    given: Arc::clone(given),
                    partner: retarget::partner(given, &first.skeleton)?,
                    along: None,
                },
            };
            self.pairs.push(pair);
        }
        Ok(&mut self.pairs)
    }
}

impl Pair {
    fn along(&mut self) -> Result<&Registration, BlendError> {
        let along = match self.along.take() {
            Some(along) => along,
            None => blend::align(&self.first, &self.partner.clip)?,
        };
        Ok(self.along.insert(along))
    }
}

impl PassKind for BlendPass {
    fn title(&self) -> String {
        self.title_with(&format!("clip {} of file {}", self.other.clip + 1, self.other.source + 1))
    }

    fn explanation(&self) -> &'static str {
        match &self.form {
            BlendForm::Join(_) => {
                "Lets another clip follow this one, overlapping it, set down where this one is and as it heads."
            }
            BlendForm::Mix { .. } => {
                "Goes between this clip and another by a weight. In step, both are bent in time so that their steps fall together."
            }
            BlendForm::Add { .. } => {
                "Lays what another clip does beyond its reference over this one. The weight may be negative or above one."
            }
            BlendForm::Mean { .. } => {
                "The mean of this clip and any number of others, each by its weight. In step, all are bent in time so that their steps fall together."
            }
        }
    }

    fn numbers(&self) -> Vec<PassNumber> {
        let mut numbers = match &self.form {
            BlendForm::Join(place) => vec![
                PassNumber::new("from", place.first_secs, "s"),
                PassNumber::new("other clip from", place.second_secs, "s"),
                PassNumber::new("overlap", place.overlap_secs, "s"),
            ],
            BlendForm::Mix { weight, .. } => {
                let only = weight.only().map(|only| PassNumber::new("weight", 100.0 * only, "%"));
                only.into_iter().collect()
            }
            BlendForm::Add { weight, .. } => vec![PassNumber::new("weight", 100.0 * weight, "%")],
            BlendForm::Mean { weights: [own, other], more, .. } => {
                let mut numbers = vec![
                    PassNumber::new("weight of A", *own, ""),
                    PassNumber::new("weight of B", *other, ""),
                ];
                numbers.extend(more.iter().map(|&(_, weight)| PassNumber::new("weight", weight, "")));
                numbers
            }
        };
        numbers.extend(self.joints.as_ref().map(|joints| PassNumber::count("joints", joints.len())));
        numbers
    }

    fn apply(&self, clip: &Arc<Clip>, others: &dyn Others) -> Result<Outcome, PassError> {
        self.apply_again(clip, others, &mut PassMemory::default())
    }

    fn apply_again(
        &self,
        clip: &Arc<Clip>,
        others: &dyn Others,
        memory: &mut PassMemory,
    ) -> Result<Outcome, PassError> {
        let given = |wanted: ClipRef| {
            let missing = PassError::NoSuchClip { file: wanted.source + 1, clip: wanted.clip + 1 };
            others.clip(wanted).ok_or(missing)
        };
        let more = self.form.more();
        let all = std::iter::once(self.other).chain(more.iter().map(|&(clip, _)| clip)).map(given);
        let pairs = memory.pairs(clip, &all.collect::<Result<Vec<_>, _>>()?)?;
        let Partner { clip: other, notes, .. } = pairs[0].partner.clone();
        let further = pairs[1..].iter().flat_map(|pair| pair.partner.notes.clone());
        let mut notes: Vec<String> = notes.into_iter().chain(further).collect();
        let mask = match &self.joints {
            None => Mask::all(&clip.skeleton),
            Some(list) => {
                let mut factors = vec![0.0; clip.skeleton.len()];
                for &(joint, factor) in list {
                    let count = factors.len();
                    if !(0.0..=1.0).contains(&factor) {
                        let expected = "factors from 0 to 1 for its joints";
                        return Err(PassError::Parameter { name: "mask", expected, found: factor });
                    }
                    *factors.get_mut(joint).ok_or(PassError::NoSuchJoint { joint, count })? = factor;
                }
                Mask { factors }
            }
        };
        let made = match &self.form {
            BlendForm::Join(place) if self.holds_feet => blend::join_on_feet(clip, &other, *place, &mask)?,
            BlendForm::Join(place) => blend::join(clip, &other, *place, &mask)?,
            BlendForm::Mix { weight, is_aligned, root } => {
                let how = MixHow { weight: weight.clone(), mask, root: *root, holds_feet: self.holds_feet };
                if *is_aligned {
                    blend::mix_aligned(clip, &other, pairs[0].along()?, &how)?
                } else {
                    blend::mix_by(clip, &other, &how)?
                }
            }
            BlendForm::Add { weight, reference, side } => {
                blend::add(clip, &other, *weight, *reference, *side, &mask)?
            }
            BlendForm::Mean { weights: [own, second], is_aligned, .. } => {
                let weights = std::iter::once(*second).chain(more.iter().map(|&(_, weight)| weight));
                if *is_aligned {
                    for pair in &mut *pairs {
                        pair.along()?;
                    }
                }
                let clips = pairs.iter().zip(weights).map(|(pair, weight)| (&*pair.partner.clip, weight));
                let clips: Vec<(&Clip, f64)> = std::iter::once((&**clip, *own)).chain(clips).collect();
                let along: Vec<&Registration> = pairs.iter().filter_map(|pair| pair.along.as_ref()).collect();
                let along = is_aligned.then_some(&*along);
                blend::mix_many_by(&clips, &MeanHow { mask: &mask, along, holds_feet: self.holds_feet })?
            }
        };
        if !matches!(self.form, BlendForm::Add { .. }) {
            let clips: Vec<&Clip> =
                std::iter::once(&**clip).chain(pairs.iter().map(|pair| &*pair.partner.clip)).collect();
            notes.extend(blend::worst_jump(&made, &clips).map(|jump| jump.words(&made.skeleton)));
        }
        Ok(Outcome { clip: made, notes })
    }

    fn joints(&self) -> Vec<usize> {
        self.joints.iter().flatten().map(|&(joint, _)| joint).collect()
    }

    fn renumber(&mut self, now: &dyn Fn(usize) -> Option<usize>) {
        if let Some(joints) = &mut self.joints {
            *joints = joints.iter().filter_map(|&(joint, factor)| Some((now(joint)?, factor))).collect();
        }
    }

    fn needs(&self) -> Vec<Need> {
        let more = self.form.more().iter().map(|&(clip, _)| clip);
        std::iter::once(self.other).chain(more).map(Need::Clip).collect()
    }
}

impl From<BlendError> for PassError {
    fn from(error: BlendError) -> Self {
        Self::Blend(error)
    }
}

#[cfg(test)]
mod tests {
    use glam::DVec3;

    use super::*;
    use crate::clip::{FrameGrid, JointTracks, RotationTrack, Times};
    use crate::rotor::Axis;
    use crate::skeleton::{Joint, Skeleton};

    /// A limb that swings at an even pace, or at an uneven one.
    fn swing(skeleton: &Arc<Skeleton>, unevenness: f64) -> Arc<Clip> {
        let count = 60;
        let times = Times::Even { step_secs: 1.0 / 30.0, count };
        let angle = |frame: usize| {
            let share = frame as f64 / (count - 1) as f64;
            (9.0 * (share + unevenness * (std::f64::consts::TAU * share).sin())).sin()
        };
        let turns = (0..count).map(|frame| Axis::X.rotor(angle(frame))).collect::<Vec<_>>();
        let rotation = Some(RotationTrack::from_rotors(times.clone(), turns));
        Arc::new(Clip {
            name: String::new(),
            skeleton: Arc::clone(skeleton),
            joints: vec![Arc::new(JointTracks { rotation, ..JointTracks::default() }), Arc::default()],
            duration_secs: times.at(count - 1),
            grid: FrameGrid { times, rate: 30.0 },
        })
    }

    /// The clips of file 0 from number 1 on.
    struct Given(Vec<Arc<Clip>>);

    impl Others for Given {
        fn clip(&self, clip: ClipRef) -> Option<Arc<Clip>> {
            self.0.get(clip.clip.checked_sub(1)?).cloned()
        }

        fn skeleton(&self, _source: usize) -> Option<Arc<Skeleton>> {
            None
        }
    }

    fn figure() -> Arc<Skeleton> {
        let joints = vec![
            Joint::placed("hip", 0, None, DVec3::Y),
            Joint::placed("foot", 1, Some(0), DVec3::new(0.2, -1.0, 0.1)),
        ];
        Arc::new(Skeleton::new(joints).unwrap())
    }

    #[test]
    fn a_mean_takes_all_its_clips_and_forgets_those_that_left() {
        let skeleton = figure();
        let [first, second, third] = [0.0, 0.06, -0.05].map(|unevenness| swing(&skeleton, unevenness));
        let others = Given(vec![Arc::clone(&second), Arc::clone(&third)]);
        let further = |clip: usize| (ClipRef { source: 0, clip }, 3.0);
        let pass = |more: Vec<(ClipRef, f64)>, is_aligned| BlendPass {
            other: ClipRef { source: 0, clip: 1 },
            form: BlendForm::Mean { weights: [1.0, 2.0], more, is_aligned },
            joints: None,
            holds_feet: false,
        };
        let all = [(&*first, 1.0), (&*second, 2.0), (&*third, 3.0)];
        let mask = Mask::all(&skeleton);
        let mut memory = PassMemory::default();
        for is_aligned in [false, true] {
            let pass = pass(vec![further(2)], is_aligned);
            let made = pass.apply_again(&first, &others, &mut memory).unwrap().clip;
            let along = [&second, &third].map(|clip| blend::align(&first, clip).unwrap());
            let along: Vec<&Registration> = along.iter().collect();
            let along = is_aligned.then_some(&*along);
            let how = MeanHow { mask: &mask, along, holds_feet: false };
            assert_eq!(made, blend::mix_many_by(&all, &how).unwrap(), "in step: {is_aligned}");
            assert_eq!(pass.needs().len(), 2);
            assert_eq!(memory.pairs.len(), 2);
        }
        assert_eq!(pass(vec![further(2)], false).title(), "Mean of 3 clips");
        pass(vec![], false).apply_again(&first, &others, &mut memory).unwrap();
        assert_eq!(memory.pairs.len(), 1);
        let error = pass(vec![further(7)], false).apply(&first, &others).unwrap_err().to_string();
        assert!(error.contains("expected clip 8 of file 1"), "{error}");
    }

    #[test]
    fn what_was_aligned_is_kept_while_the_weight_changes() {
        let skeleton = figure();
        let (first, given) = (swing(&skeleton, 0.0), swing(&skeleton, 0.06));
        let others = Given(vec![Arc::clone(&given)]);
        let pass = |weight| BlendPass {
            other: ClipRef { source: 0, clip: 1 },
            form: BlendForm::Mix {
                weight: MixAlong::constant(weight),
                is_aligned: true,
                root: RootFrom::Both,
            },
            joints: None,
            holds_feet: true,
        };
        let alone = |clip: &Arc<Clip>, weight| pass(weight).apply(clip, &others).unwrap();
        let mut memory = PassMemory::default();
        let again = |clip: &Arc<Clip>, weight, memory: &mut PassMemory| {
            pass(weight).apply_again(clip, &others, memory)
        };
        assert_eq!(again(&first, 0.3, &mut memory).unwrap(), alone(&first, 0.3));
        assert_eq!(again(&first, 0.6, &mut memory).unwrap(), alone(&first, 0.6));
        // Another way through both, put there by hand, is the one that the next weight goes: nothing is aligned anew.
        memory.pairs[0].along = Some(Registration::straight(&first, &given));
        assert_ne!(again(&first, 0.6, &mut memory).unwrap(), alone(&first, 0.6));
        // For another clip nothing is taken over.
        let other = swing(&skeleton, -0.03);
        assert_eq!(again(&other, 0.6, &mut memory).unwrap(), alone(&other, 0.6));
    }
}
