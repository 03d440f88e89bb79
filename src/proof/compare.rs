//! A clip's part of the sheet, from the two clips alone.

use crate::clip::Clip;
use crate::mend;
use crate::mend::SurveyOptions;
use crate::snag::Progress;

use super::curves::joint_curves;
use super::error::ProofError;
use super::measure::measure;
use super::pictures::pictures;
use super::sheet::{ClipProof, FoundSnag};

/// Measures `after` against `before`, looks for snags in both, and draws what changed.
///
/// `label` and `index` name the clip in its file.
///
/// # Errors
/// When the two have no joint in common, a picture cannot be made, or `progress` stops the work.
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
        Ok(survey
            .snags
            .iter()
            .map(|snag| FoundSnag::new(snag, clip.skeleton.label(snag.joint), false))
            .collect())
    };
    let (snags_before, snags_after) = (found(before)?, found(after)?);
    let pictures = pictures([before, after], &measurement, [&snags_before, &snags_after])?;
    let curves = joint_curves(before, after, &measurement);
    Ok(ClipProof { curves, pictures, ..ClipProof::new(label, index, measurement, snags_before, snags_after) })
}
