//! The pass that makes one clip of its own and another.

use std::sync::Arc;

use crate::blend::{self, AlignedMix, BlendError, JoinPlace, Mask, MixAlong, Reference, RootFrom, Side};
use crate::clip::Clip;
use crate::retarget::{self, Partner};

use super::error::PassError;
use super::kind::{Outcome, PassKind};
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
        /// Whose way over the ground is taken, when aligned.
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
        let missing = PassError::NoSuchClip { file: self.other.source + 1, clip: self.other.clip + 1 };
        let other = others.clip(self.other).ok_or(missing)?;
        let Partner { clip: other, notes, .. } = retarget::partner(&other, &clip.skeleton)?;
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
            BlendForm::Mix { weight, is_aligned: false, .. } if self.holds_feet => {
                blend::mix_on_feet(clip, &other, weight, &mask)?
            }
            BlendForm::Mix { weight, is_aligned: false, .. } => blend::mix(clip, &other, weight, &mask)?,
            BlendForm::Mix { weight, root, .. } => {
                let along = blend::align(clip, &other)?;
                let how =
                    AlignedMix { weight: weight.clone(), mask, root: *root, holds_feet: self.holds_feet };
                blend::mix_aligned(clip, &other, &along, &how)?
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
