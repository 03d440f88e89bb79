//! The pass that makes one clip of its own and another.

use std::sync::Arc;

use crate::blend::{
    self, BlendError, JoinPlace, Mask, MixAlong, MixHow, Reference, Registration, RootFrom, Side,
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

/// Two clips as a blend has met them: the second brought to the first's skeleton, and which of their times belong together.
#[derive(Clone, Debug)]
pub(super) struct Pair {
    first: Arc<Clip>,
    given: Arc<Clip>,
    partner: Partner,
    along: Option<Registration>,
}

impl PassMemory {
    /// The pair of these very clips, from before or new.
    fn pair(&mut self, first: &Arc<Clip>, given: &Arc<Clip>) -> Result<&mut Pair, PassError> {
        let is_of = |pair: &Pair| Arc::ptr_eq(&pair.first, first) && Arc::ptr_eq(&pair.given, given);
        let pair = match self.pair.take().filter(is_of) {
            Some(pair) => pair,
            None => Pair {
                first: Arc::clone(first),
                given: Arc::clone(given),
                partner: retarget::partner(given, &first.skeleton)?,
                along: None,
            },
        };
        Ok(self.pair.insert(pair))
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
        let with = format!("clip {} of file {}", self.other.clip + 1, self.other.source + 1);
        match &self.form {
            BlendForm::Join(_) => format!("Join {with}"),
            BlendForm::Mix { weight, .. } => match weight.only() {
                Some(only) => format!("Mix in {:.0} % of {with}", 100.0 * only),
                None => format!("Mix in {with}"),
            },
            BlendForm::Add { weight, .. } => format!("Add {:.0} % of {with}", 100.0 * weight),
        }
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
        let missing = PassError::NoSuchClip { file: self.other.source + 1, clip: self.other.clip + 1 };
        let other = others.clip(self.other).ok_or(missing)?;
        let pair = memory.pair(clip, &other)?;
        let Partner { clip: other, notes, .. } = pair.partner.clone();
        let mask = match &self.joints {
            None => Mask::all(&clip.skeleton),
            Some(list) => {
                let mut factors = vec![0.0; clip.skeleton.len()];
                for &(joint, factor) in list {
                    let count = factors.len();
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
                    blend::mix_aligned(clip, &other, pair.along()?, &how)?
                } else {
                    blend::mix_by(clip, &other, &how)?
                }
            }
            BlendForm::Add { weight, reference, side } => {
                blend::add(clip, &other, *weight, *reference, *side, &mask)?
            }
        };
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
        vec![Need::Clip(self.other)]
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
    use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

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

    struct One(Arc<Clip>);

    impl Others for One {
        fn clip(&self, _clip: ClipRef) -> Option<Arc<Clip>> {
            Some(Arc::clone(&self.0))
        }

        fn skeleton(&self, _source: usize) -> Option<Arc<Skeleton>> {
            None
        }
    }

    #[test]
    fn what_was_aligned_is_kept_while_the_weight_changes() {
        let joint = |name: &str, number, parent, place| Joint {
            name: name.to_owned(),
            number,
            parent,
            rest: Transform::from_translation(place),
            kind: JointKind::Joint,
            tips: vec![],
        };
        let joints =
            vec![joint("hip", 0, None, DVec3::Y), joint("foot", 1, Some(0), DVec3::new(0.2, -1.0, 0.1))];
        let skeleton = Arc::new(Skeleton::new(joints).unwrap());
        let (first, given) = (swing(&skeleton, 0.0), swing(&skeleton, 0.06));
        let others = One(Arc::clone(&given));
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
        memory.pair.as_mut().unwrap().along = Some(Registration::straight(&first, &given));
        assert_ne!(again(&first, 0.6, &mut memory).unwrap(), alone(&first, 0.6));
        // For another clip nothing is taken over.
        let other = swing(&skeleton, -0.03);
        assert_eq!(again(&other, 0.6, &mut memory).unwrap(), alone(&other, 0.6));
    }
}
