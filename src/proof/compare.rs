//! A clip's part of the sheet, from the two clips alone.

use std::sync::{Arc, LazyLock};

use crate::clip::Clip;
use crate::limit::{Keeping, Limits};
use crate::mend;
use crate::mend::SurveyOptions;
use crate::scene::SnagMark;
use crate::snag::{Progress, SnagKind};

use super::curves::joint_curves;
use super::error::ProofError;
use super::measure::measure;
use super::pictures::pictures;
use super::sheet::{ClipProof, FoundSnag, LimitRow, LimitsProof};

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
    compare_with(before, after, label, index, &Looked::default(), progress)
}

/// What snags are looked for with, and which of them are meant.
#[derive(Clone, Copy, Debug)]
pub struct Looked<'a> {
    /// The kinds.
    pub kinds: &'a [SnagKind],
    /// The limits of the clip before, against which both are held.
    pub limits: Option<&'a Arc<Limits>>,
    /// Snags of the clip before that a person said are meant.
    pub meant: &'a [SnagMark],
}

impl Default for Looked<'_> {
    fn default() -> Self {
        Self { kinds: &USUAL, limits: None, meant: &[] }
    }
}

/// The kinds that are looked for when none are named.
static USUAL: LazyLock<Vec<SnagKind>> = LazyLock::new(SnagKind::defaults);

/// As [`compare`], with other kinds than the usual, and limits against which both clips are held too.
///
/// # Errors
/// As [`compare`].
pub fn compare_with(
    before: &Clip,
    after: &Clip,
    label: String,
    index: usize,
    looked: &Looked<'_>,
    progress: &dyn Progress,
) -> Result<ClipProof, ProofError> {
    let measurement = measure(before, after, progress)?;
    let limits = looked.limits;
    let limits_after = limits.and_then(|limits| carried_over(limits, before, after)).map(Arc::new);
    let found = |clip: &Clip, limits: Option<Arc<Limits>>, meant: &[SnagMark]| {
        let survey = mend::survey(clip, &SurveyOptions { kinds: looked.kinds.to_vec(), limits }, progress)?;
        let facts = survey.snags.iter().map(|snag| {
            FoundSnag::new(snag, clip.skeleton.label(snag.joint), meant.contains(&SnagMark::of(snag)))
        });
        Ok::<Vec<FoundSnag>, ProofError>(facts.collect())
    };
    let kept = limits.map(|limits| limits_kept(limits, limits_after.as_deref(), before, after));
    let found_before = found(before, limits.cloned(), looked.meant)?;
    let found_after = found(after, limits_after, &[])?;
    let mut proof = ClipProof::new(label, index, measurement, found_before, found_after);
    proof.limits = kept;
    Ok(proof)
}

/// The limits for the joints of the clip after, found by their labels; `None` where any of them rests otherwise, so that the
/// limit's zero would mean another pose.
fn carried_over(limits: &Limits, before: &Clip, after: &Clip) -> Option<Limits> {
    /// Rests are told apart from here on, radians: 32 bits in a file round less.
    const SAME_RAD: f64 = 1e-4;
    let (own, others) = (&before.skeleton, &after.skeleton);
    let now = |joint: usize| others.find(own.label(joint));
    let rests_alike = |joint: usize| {
        now(joint).is_none_or(|other| {
            own.joints()[joint].rest.rotation.turn_to(others.joints()[other].rest.rotation) < SAME_RAD
        })
    };
    limits.joints.keys().all(|joint| rests_alike(*joint)).then(|| limits.renumbered(&now))
}

fn limits_kept(limits: &Limits, limits_after: Option<&Limits>, before: &Clip, after: &Clip) -> LimitsProof {
    let kept_after: Vec<(String, Keeping)> = limits_after.map_or_else(Vec::new, |limits| {
        let kept = limits.keeping(after).into_iter();
        kept.map(|kept| (after.skeleton.label(kept.joint).to_owned(), kept)).collect()
    });
    let rows = limits.keeping(before).into_iter().map(|kept| {
        let joint = before.skeleton.label(kept.joint).to_owned();
        let after = kept_after.iter().find(|(label, _)| *label == joint).map(|(_, kept)| kept.clone());
        LimitRow { joint, before: kept, after }
    });
    LimitsProof { title: limits.title.clone(), rows: rows.collect() }
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
