//! The pass that carries the clip to another skeleton.

use std::sync::Arc;

use crate::clip::Clip;
use crate::retarget::{self, Figure, JointMap, MapRow, Options};
use crate::skeleton::Skeleton;

use super::error::PassError;
use super::kind::{Outcome, PassKind};
use super::others::{Need, Others};

/// Carries the clip to the skeleton of another source.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct RetargetPass {
    /// Index of the source whose skeleton is meant.
    pub onto: usize,
    /// Corrections of the joint map, by labels: source and target; `None` as in [`MapRow`]. What names no joint is told and left out.
    pub rows: Vec<(Option<String>, Option<String>)>,
    /// Feet that are planted are held where they stand.
    pub plant_feet: bool,
}

impl PassKind for RetargetPass {
    fn title(&self) -> String {
        format!("Retarget onto file {}", self.onto + 1)
    }

    fn explanation(&self) -> &'static str {
        "Lets the figure of another file make the turns of this one. Rest poses are compared by where limbs point, paths are scaled by the legs."
    }

    fn apply(&self, clip: &Arc<Clip>, others: &dyn Others) -> Result<Outcome, PassError> {
        let missing = PassError::NoSuchSkeleton { file: self.onto + 1 };
        let skeleton = others.skeleton(self.onto).filter(|own| !own.is_empty()).ok_or(missing)?;
        let source = Figure::new(&clip.skeleton);
        let target = Figure::new(&skeleton);
        let mut map = JointMap::automatic(&source, &target);
        let mut notes = Vec::new();
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
        let options = Options { plant_feet: self.plant_feet, measure: false };
        let made = retarget::retarget(clip, &source, &target, &map, options)?;
        if self.rows.is_empty() {
            notes.extend(map.doubts);
        }
        notes.extend(made.report.notes.iter().cloned());
        notes.extend(made.report.missed.iter().map(|missed| {
            let label = skeleton.label(missed.joint);
            format!("not met: {} ({label}, frame {}, by {:.4})", missed.what, missed.frame, missed.by)
        }));
        Ok(Outcome { clip: made.clip, notes })
    }

    fn needs(&self) -> Vec<Need> {
        vec![Need::Skeleton(self.onto)]
    }

    fn skeleton_after(&self, others: &dyn Others) -> Option<Arc<Skeleton>> {
        others.skeleton(self.onto)
    }
}
