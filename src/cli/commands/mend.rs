//! `mend`: writes clips with their faults mended.

use std::path::Path;
use std::sync::Arc;

use crate::cli::DONE;
use crate::cli::args::MendArgs;
use crate::cli::error::CliError;
use crate::cli::input::{self, Input};
use crate::cli::limits::LimitsSource;
use crate::cli::output::text::{ClipReport, MendReport};
use crate::cli::output::{Output, json, text};
use crate::cli::progress::ProgressLine;
use crate::cli::targets;
use crate::clip::Clip;
use crate::exchange::{self, Format, Guard};
use crate::limit::Limits;
use crate::mend::{self, SurveyOptions};
use crate::proof;
use crate::snag::{Remedy, Snag, SnagKind};

use super::proof::{SheetFormat, write_sheet};
use super::snags::chosen_kinds;

/// Gives 0, however much was mended. Files that can't be mended do not keep the others from it.
pub(crate) fn run(args: &MendArgs, output: &mut Output) -> Result<u8, CliError> {
    let sheet_format = args.proof.as_deref().map(SheetFormat::of).transpose()?;
    let kinds = chosen_kinds(args.kinds.as_deref(), args.is_loop);
    let choice = Choice {
        kinds: kinds.into_iter().filter(|kind| !args.skip.contains(kind)).collect(),
        has_named_kinds: args.kinds.is_some(),
    };

    let options = args.csv.open_options();
    let mut inputs = Vec::new();
    let mut failed = 0;
    for text in &args.clips {
        match input::open(text, &options, output) {
            Ok(opened) => inputs.extend(opened),
            Err(error) if args.clips.len() == 1 => return Err(error),
            Err(error) => {
                output.error(&error);
                failed += 1;
            }
        }
    }
    let source = LimitsSource::open(args.limits.as_ref())?;
    let mut limits = Vec::new();
    for input in &inputs {
        let own = source.fit(input, output)?;
        source.check(args.kinds.as_deref(), &own)?;
        limits.push(own);
    }
    let sources: Vec<&Path> = inputs.iter().map(|input| input.source.path.as_path()).collect();
    let targets = targets::targets(&args.output, &sources)?;
    let guard = Guard { inputs: inputs.iter().flat_map(Input::files).collect(), force: args.force };
    // Nothing is written when something is in the way.
    for target in &targets {
        guard.check(target)?;
    }
    for ((input, target), limits) in inputs.iter().zip(&targets).zip(&limits) {
        let mended = mend_input(input, limits, &choice)?;
        let of_many = input.is_named.then(|| input.first());
        let written = exchange::write(&input.source, &mended.results, of_many, target, &guard)?;
        // Told when it is true.
        mended.report(input, args.json, output)?;
        if input.chosen.len() > 1 && !Format::of(target).is_ok_and(Format::holds_many) {
            let label = input.source.clip_label(input.first());
            output.note(target, &format!("holds one clip: the first of {}, {label}", input.chosen.len()));
        }
        output.notes(target, &written.notes);
        output.say(&format!("wrote {}", target.display()));
        if let (Some(sheet), Some(format)) = (&args.proof, sheet_format) {
            let path = targets::beside(sheet, target, inputs.len());
            guard.check(&path)?;
            write_sheet(input, target, limits, &path, format, output)?;
        }
    }
    if failed > 0 {
        return Err(CliError::Some { failed, total: args.clips.len() });
    }
    Ok(DONE)
}

/// Which snags to mend.
pub(super) struct Choice {
    /// Of these kinds.
    pub(super) kinds: Vec<SnagKind>,
    /// Whether the user named the kinds: then also those that need judgement.
    pub(super) has_named_kinds: bool,
}

impl Choice {
    /// Every kind, safe mends only.
    pub(super) fn safe() -> Self {
        Self { kinds: SnagKind::defaults(), has_named_kinds: false }
    }

    fn takes(&self, snag: &Snag) -> bool {
        snag.remedy != Remedy::Ask && (snag.safe || self.has_named_kinds)
    }
}

/// The mended clips of an input.
struct Mended {
    /// One for each clip of the source: those meant mended, the others as they are.
    results: Vec<Arc<Clip>>,
    /// Index, snags, and what was done about them, of each clip that was meant.
    told: Vec<(usize, Vec<Snag>, MendReport)>,
}

impl Mended {
    fn report(&self, input: &Input, is_json: bool, output: &mut Output) -> Result<(), CliError> {
        for (index, snags, mends) in &self.told {
            let label = input.source.clip_label(*index);
            let report = ClipReport {
                path: &input.source.path,
                label: &label,
                index: *index,
                clip: &input.results[*index],
                snags,
                mends: Some(mends),
            };
            if is_json {
                output.line(json::clip(&report))?;
            } else {
                text::clip(output, &report)?;
            }
        }
        Ok(())
    }
}

fn mend_input(input: &Input, limits: &[Option<Arc<Limits>>], choice: &Choice) -> Result<Mended, CliError> {
    let mut mended = Mended { results: input.results.clone(), told: Vec::new() };
    for &index in &input.chosen {
        let (result, snags, mends) =
            mend_clip(&input.source.path, &input.results[index], limits[index].as_ref(), choice)?;
        mended.results[index] = result;
        mended.told.push((index, snags, mends));
    }
    Ok(mended)
}

/// The mended clip, its snags, and what was done about them.
pub(super) fn mend_clip(
    path: &Path,
    clip: &Arc<Clip>,
    limits: Option<&Arc<Limits>>,
    choice: &Choice,
) -> Result<(Arc<Clip>, Vec<Snag>, MendReport), CliError> {
    let progress = ProgressLine::new(format!("{}: mending", path.display()));
    let options = SurveyOptions { kinds: choice.kinds.clone(), limits: limits.cloned() };
    let survey = mend::survey(clip, &options, &progress)?;
    let mended: Vec<bool> = survey.snags.iter().map(|snag| choice.takes(snag)).collect();
    let takes_all =
        survey.snags.iter().zip(&mended).all(|(snag, &taken)| taken || snag.remedy == Remedy::Ask);
    let result = if survey.snags.is_empty() {
        clip.clone()
    } else if takes_all {
        Arc::new(survey.mended)
    } else {
        // In mending order: each kind was found on what the kinds before it left.
        let mut taken: Vec<Snag> = survey
            .snags
            .iter()
            .zip(&mended)
            .filter(|(_, taken)| **taken)
            .map(|(snag, _)| snag.clone())
            .collect();
        taken.sort_by_key(|snag| (snag.kind, snag.joint, snag.first_key));
        let result = mend::apply_all(clip, &taken)
            .map_err(|source| CliError::Mend { path: path.to_owned(), source })?;
        Arc::new(result)
    };
    let changes_rad: Vec<f64> = survey
        .changes_rad
        .iter()
        .zip(&mended)
        .map(|(&change, &taken)| if taken { change } else { 0.0 })
        .collect();
    let changes_length = survey
        .snags
        .iter()
        .zip(&changes_rad)
        .map(|(snag, &change)| if change > 0.0 { mend::change_at_tips(clip, &result, snag) } else { 0.0 })
        .collect();
    let max_change_rad = if mended.contains(&true) {
        let measured = proof::measure(clip, &result, &progress)
            .map_err(|source| CliError::Proof { path: path.to_owned(), source })?;
        measured.max_change_rad()
    } else {
        0.0
    };
    Ok((result, survey.snags, MendReport { mended, changes_rad, changes_length, max_change_rad }))
}
