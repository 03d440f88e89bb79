//! A clip's part of the sheet, from the two clips alone.

use crate::clip::Clip;
use crate::mend;
use crate::mend::SurveyOptions;
use crate::snag::{Progress, Snag};

use super::curves::joint_curves;
use super::error::ProofError;
use super::measure::measure;
use super::pictures::pictures;
use super::sheet::{ClipProof, FoundSnag};

/// Measures `after` against `before`, and looks for snags in both. Without pictures: see [`ClipProof::draw`].
///
/// `label` and `index` name the clip in its file.
///
/// # Errors
/// When the two have no joint in common, or `progress` stops the work.
pub fn compare(
    before: &Clip,
    after: &Clip,
    label: String,
    index: usize,
    progress: &dyn Progress,
) -> Result<ClipProof, ProofError> {
    let measurement = measure(before, after, progress)?;
    let found = |clip: &Clip| -> Result<Vec<FoundSnag>, ProofError> {
        let survey = mend::survey(clip, &SurveyOptions::default(), progress)?;
        let label = |snag: &Snag| clip.skeleton.label(snag.joint);
        Ok(survey.snags.iter().map(|snag| FoundSnag::new(snag, label(snag), false)).collect())
    };
    Ok(ClipProof::new(label, index, measurement, found(before)?, found(after)?))
}

impl ClipProof {
    /// Adds the curves and pictures that a page for people shows, if anything was found or has changed.
    ///
    /// # Errors
    /// When a picture cannot be made.
    pub fn draw(&mut self, before: &Clip, after: &Clip) -> Result<(), ProofError> {
        let is_still = self.measurement.joints_untouched() == self.measurement.joints.len();
        if is_still && self.found.is_empty() && self.new.is_empty() {
            return Ok(());
        }
        self.curves = joint_curves(before, after, &self.measurement);
        let still_there = self.found.iter().filter(|snag| !snag.gone).chain(&self.new).cloned();
        let snags_after: Vec<FoundSnag> = still_there.collect();
        self.pictures = pictures([before, after], &self.measurement, [&self.found, &snags_after])?;
        Ok(())
    }
}
