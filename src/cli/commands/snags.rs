//! `snags`: lists the faults of clips.

use std::sync::Arc;

use crate::cli::args::SnagsArgs;
use crate::cli::error::CliError;
use crate::cli::input::{self, Input};
use crate::cli::limits::LimitsSource;
use crate::cli::output::text::ClipReport;
use crate::cli::output::{Output, json, text};
use crate::cli::progress::ProgressLine;
use crate::cli::{DONE, FOUND};
use crate::limit::Limits;
use crate::mend::{self, SurveyOptions};
use crate::scene::SnagMark;
use crate::snag::{Snag, SnagKind};

/// Gives 1 when any snag was found. A file that can't be read does not keep the others from being looked through.
pub(crate) fn run(args: &SnagsArgs, output: &mut Output) -> Result<u8, CliError> {
    let kinds = chosen_kinds(args.kinds.as_deref(), args.is_loop);
    let options = args.csv.open_options();
    let limits = LimitsSource::open(args.limits.as_ref())?;
    let mut has_found = false;
    let mut failed = 0;
    for text in &args.clips {
        let listed = input::open(text, &options, output).and_then(|inputs| {
            for input in &inputs {
                let own = limits.fit(input, output)?;
                limits.check(args.kinds.as_deref(), &own)?;
                has_found |= list(input, &kinds, &own, args.json, output)?;
            }
            Ok(())
        });
        match listed {
            Ok(()) => {}
            Err(CliError::Output(error)) => return Err(CliError::Output(error)),
            Err(error) if args.clips.len() == 1 => return Err(error),
            Err(error) => {
                output.error(&error);
                failed += 1;
            }
        }
    }
    if failed > 0 {
        return Err(CliError::Some { failed, total: args.clips.len() });
    }
    Ok(if has_found { FOUND } else { DONE })
}

/// The kinds that are looked for: those that are named, or the default ones; with a loop its seam too.
pub(super) fn chosen_kinds(named: Option<&[SnagKind]>, is_loop: bool) -> Vec<SnagKind> {
    let mut kinds = named.map_or_else(SnagKind::defaults, <[SnagKind]>::to_vec);
    if is_loop && !kinds.contains(&SnagKind::Seam) {
        kinds.push(SnagKind::Seam);
    }
    kinds
}

fn list(
    input: &Input,
    kinds: &[SnagKind],
    limits: &[Option<Arc<Limits>>],
    is_json: bool,
    output: &mut Output,
) -> Result<bool, CliError> {
    let mut has_found = false;
    for &index in &input.chosen {
        let clip = &input.results[index];
        let mut snags = snags_of(input, index, kinds, limits[index].clone())?;
        if let Some(work) = &input.works[index] {
            let found = snags.len();
            snags.retain(|snag| !work.left.contains(&SnagMark::of(snag)));
            if snags.len() < found {
                let text = format!("leaves {} as meant; not listed", found - snags.len());
                output.note(&input.path, &text);
            }
        }
        has_found |= !snags.is_empty();
        let label = input.source.clip_label(index);
        let report =
            ClipReport { path: &input.source.path, label: &label, index, clip, snags: &snags, mends: None };
        if is_json {
            output.line(json::clip(&report))?;
        } else {
            text::clip(output, &report)?;
        }
    }
    Ok(has_found)
}

fn snags_of(
    input: &Input,
    index: usize,
    kinds: &[SnagKind],
    limits: Option<Arc<Limits>>,
) -> Result<Vec<Snag>, CliError> {
    input.source.check_search(index)?;
    let progress = ProgressLine::new(format!("{}: looking for snags", input.source.path.display()));
    let options = SurveyOptions { kinds: kinds.to_vec(), limits };
    let survey = mend::survey(&input.results[index], &options, &progress)?;
    Ok(survey.snags)
}
