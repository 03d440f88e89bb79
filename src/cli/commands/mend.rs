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
use crate::proof::{self, PassFacts, passes_run};
use crate::scene::{Evaluator, MendPass, NoOthers, Pass, PassId, SnagMark};
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
            write_sheet(input, target, limits, &mended.told, &path, format, output)?;
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
    /// Each clip that was meant.
    told: Vec<MendedClip>,
}

/// What was found in one clip, and what was done about it.
pub(super) struct MendedClip {
    /// Its index in the source.
    pub(super) index: usize,
    /// The clip before.
    before: Arc<Clip>,
    /// The kinds that were looked for, and the usual ones: a sheet tells of all of them.
    pub(super) kinds: Vec<SnagKind>,
    snags: Vec<Snag>,
    mends: MendReport,
}

impl MendedClip {
    /// What was done, as a scene would do it: a pass for each kind, in mending order.
    pub(super) fn passes_run(&self) -> Vec<PassFacts> {
        mends_run(&self.before, &self.snags, &self.mends)
    }
}

/// The mends that were taken as passes that ran.
pub(super) fn mends_run(before: &Arc<Clip>, snags: &[Snag], mends: &MendReport) -> Vec<PassFacts> {
    let taken = taken(snags, &mends.mended);
    let passes: Vec<Pass> = taken
        .chunk_by(|a, b| a.kind == b.kind)
        .zip(0..)
        .map(|(own, id)| Pass {
            id: PassId(id),
            on: true,
            step: MendPass::new(own[0].kind, own.to_vec()).into(),
        })
        .collect();
    passes_run(&passes, &Evaluator::default().evaluate(before, &passes, &NoOthers))
}

/// Those that are mended, in mending order: each kind was found on what the kinds before it left.
fn taken(snags: &[Snag], mended: &[bool]) -> Vec<Snag> {
    let mut taken: Vec<Snag> =
        snags.iter().zip(mended).filter(|(_, taken)| **taken).map(|(snag, _)| snag.clone()).collect();
    taken.sort_by_key(|snag| (snag.kind, snag.joint, snag.first_key));
    taken
}

impl Mended {
    fn report(&self, input: &Input, is_json: bool, output: &mut Output) -> Result<(), CliError> {
        for own in &self.told {
            let label = input.source.clip_label(own.index);
            let report = ClipReport {
                path: &input.source.path,
                label: &label,
                index: own.index,
                clip: &input.results[own.index],
                snags: &own.snags,
                mends: Some(&own.mends),
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
        input.source.check_search(index)?;
        // What a scene leaves as meant stays.
        let left = input.works[index].as_ref().map_or(&[][..], |work| &work.left);
        let (result, snags, mends) =
            mend_clip(&input.source.path, &input.results[index], limits[index].as_ref(), choice, left)?;
        mended.results[index] = result;
        let kinds = SnagKind::ALL.into_iter().filter(|kind| kind.is_default() || choice.kinds.contains(kind));
        let before = input.results[index].clone();
        mended.told.push(MendedClip { index, before, kinds: kinds.collect(), snags, mends });
    }
    Ok(mended)
}

/// The mended clip, its snags, and what was done about them. Those in `left` are not mended.
pub(super) fn mend_clip(
    path: &Path,
    clip: &Arc<Clip>,
    limits: Option<&Arc<Limits>>,
    choice: &Choice,
    left: &[SnagMark],
) -> Result<(Arc<Clip>, Vec<Snag>, MendReport), CliError> {
    let progress = ProgressLine::new(format!("{}: mending", path.display()));
    let options = SurveyOptions { kinds: choice.kinds.clone(), limits: limits.cloned() };
    let survey = mend::survey(clip, &options, &progress)?;
    let takes = |snag: &Snag| choice.takes(snag) && !left.contains(&SnagMark::of(snag));
    let mended: Vec<bool> = survey.snags.iter().map(takes).collect();
    let takes_all =
        survey.snags.iter().zip(&mended).all(|(snag, &taken)| taken || snag.remedy == Remedy::Ask);
    let result = if survey.snags.is_empty() {
        clip.clone()
    } else if takes_all {
        Arc::new(survey.mended)
    } else {
        let result = mend::apply_all(clip, &taken(&survey.snags, &mended))
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
