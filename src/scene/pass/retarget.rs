//! The pass that carries the clip to another skeleton.

use std::sync::Arc;

use crate::clip::Clip;
use crate::retarget::{
    self, Figure, FootContact, HandHold, JointMap, KeptLimits, MapRow, Options, Report, RestPick,
};
use crate::skeleton::Skeleton;

use super::error::PassError;
use super::kind::{Outcome, PassKind};
use super::number::PassNumber;
use super::others::{ClipRef, Need, Others};

/// Carries the clip to the skeleton of another source.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct RetargetPass {
    /// Index of the source whose skeleton is meant.
    pub onto: usize,
    /// Corrections of the joint map, by labels: source and target; `None` as in [`MapRow`]. What names no joint is told and left out.
    pub rows: Vec<(Option<String>, Option<String>)>,
    /// Which pose of the source and of the target counts as rest; frames are those of the clip itself and of the target file's first
    /// clip.
    pub rests: [RestPick; 2],
    /// Labels of the joints that source and target figure hang on, where their files hold several.
    pub roots: [Option<String>; 2],
    /// Feet that are planted are held where they stand.
    pub plant_feet: bool,
    /// When they are planted; `None` where the clip is to be asked.
    pub feet: Option<Vec<FootContact>>,
    /// Hands that are held.
    pub hands: Vec<HandHold>,
    /// Limits that the result keeps to; [`KeptLimits::Given`] by the target's joints, [`KeptLimits::OfSource`] by the clip's.
    pub limits: Option<KeptLimits>,
}

/// Everything that a retarget works with, made ready.
#[derive(Clone, Debug)]
pub struct RetargetSetting {
    /// The figure that the clip is made on.
    pub source: Figure,
    /// The figure that it is carried to.
    pub target: Figure,
    /// The joint map, a person's corrections included.
    pub map: JointMap,
    /// What did not fit, a sentence each.
    pub notes: Vec<String>,
}

impl RetargetPass {
    /// Onto the skeleton of a source, with all that can be found by itself; planted feet held.
    pub fn new(onto: usize) -> Self {
        Self { onto, plant_feet: true, ..Self::default() }
    }

    /// The figures and the map for a clip.
    ///
    /// # Errors
    /// When the target's skeleton is not there.
    pub fn setting(&self, clip: &Arc<Clip>, others: &dyn Others) -> Result<RetargetSetting, PassError> {
        let missing = PassError::NoSuchSkeleton { file: self.onto + 1 };
        let skeleton = others.skeleton(self.onto).filter(|own| !own.is_empty()).ok_or(missing)?;
        let mut notes = Vec::new();
        let mut root = |skeleton: &Skeleton, label: &Option<String>| {
            let label = label.as_ref()?;
            let found = skeleton.find(label);
            if found.is_none() {
                notes.push(format!("expected a joint `{label}` that the figure hangs on, found none"));
            }
            found
        };
        let roots = [root(&clip.skeleton, &self.roots[0]), root(&skeleton, &self.roots[1])];
        let onto_clip = self.needs_clip().and_then(|need| others.clip(need));
        let source = self.rests[0].figure(&clip.skeleton, Some(clip), roots[0]);
        let target = self.rests[1].figure(&skeleton, onto_clip.as_deref(), roots[1]);
        let mut map = JointMap::automatic(&source, &target);
        let mut rows = Vec::with_capacity(self.rows.len());
        for (from, to) in &self.rows {
            let mut find = |skeleton: &Skeleton, label: &Option<String>| match label {
                None => Some(None),
                Some(label) => {
                    let found = skeleton.find(label);
                    if found.is_none() {
                        notes.push(format!(
                            "the joint map names `{label}`, which is not there; that row is left out"
                        ));
                    }
                    found.map(Some)
                }
            };
            if let (Some(source), Some(target)) = (find(&clip.skeleton, from), find(&skeleton, to)) {
                rows.push(MapRow { source, target });
            }
        }
        map.correct(&rows);
        Ok(RetargetSetting { source, target, map, notes })
    }

    /// What the pass makes of a clip, with all that is measured of it.
    ///
    /// # Errors
    /// As [`PassKind::apply`].
    pub fn carried(
        &self,
        clip: &Arc<Clip>,
        others: &dyn Others,
        measure: bool,
    ) -> Result<(Clip, Report, RetargetSetting), PassError> {
        let setting = self.setting(clip, others)?;
        let options = Options {
            plant_feet: self.plant_feet,
            feet: self.feet.clone(),
            hands: self.hands.clone(),
            limits: self.limits.clone(),
            measure,
        };
        let made = retarget::retarget(clip, &setting.source, &setting.target, &setting.map, &options)?;
        Ok((made.clip, made.report, setting))
    }

    /// The title where it is known what the target's file is called.
    pub fn title_with(&self, onto: &str) -> String {
        format!("Retarget onto {onto}")
    }

    /// The clip whose frame is the target's rest.
    fn needs_clip(&self) -> Option<ClipRef> {
        self.rests[1].frame_secs.map(|_| ClipRef { source: self.onto, clip: 0 })
    }
}

impl PassKind for RetargetPass {
    fn title(&self) -> String {
        self.title_with(&format!("file {}", self.onto + 1))
    }

    fn explanation(&self) -> &'static str {
        "Lets the figure of another file make the turns of this one. Rest poses are compared by where limbs point, paths are scaled by the legs."
    }

    fn numbers(&self) -> Vec<PassNumber> {
        let mut numbers = vec![PassNumber::count("rows of the map corrected", self.rows.len())];
        numbers.extend(self.feet.as_ref().map(|feet| PassNumber::count("feet held by hand", feet.len())));
        if !self.hands.is_empty() {
            numbers.push(PassNumber::count("hands held", self.hands.len()));
        }
        numbers
    }

    fn apply(&self, clip: &Arc<Clip>, others: &dyn Others) -> Result<Outcome, PassError> {
        let (carried, report, setting) = self.carried(clip, others, false)?;
        let mut notes = setting.notes;
        if self.rows.is_empty() {
            notes.extend(setting.map.doubts);
        }
        notes.extend(report.notes.iter().cloned());
        notes.extend(report.missed.iter().map(|missed| missed.sentence(&setting.target.skeleton)));
        Ok(Outcome { clip: carried, notes })
    }

    fn joints(&self) -> Vec<usize> {
        match &self.limits {
            Some(KeptLimits::OfSource(limits)) => limits.joints.keys().copied().collect(),
            _ => Vec::new(),
        }
    }

    fn renumber(&mut self, now: &dyn Fn(usize) -> Option<usize>) {
        if let Some(KeptLimits::OfSource(limits)) = &mut self.limits {
            *limits = Arc::new(limits.renumbered(now));
        }
    }

    fn needs(&self) -> Vec<Need> {
        std::iter::once(Need::Skeleton(self.onto)).chain(self.needs_clip().map(Need::Clip)).collect()
    }

    fn skeleton_after(&self, others: &dyn Others) -> Option<Arc<Skeleton>> {
        others.skeleton(self.onto)
    }
}
