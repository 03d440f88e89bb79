//! `proof`: what changed between two clips, as a sheet.

use std::path::Path;
use std::sync::Arc;

use crate::cli::DONE;
use crate::cli::args::ProofArgs;
use crate::cli::error::CliError;
use crate::cli::input::{self, Input, Work};
use crate::cli::output::Output;
use crate::cli::progress::ProgressLine;
use crate::exchange::{Guard, OpenOptions, Source, disk};
use crate::limit::Limits;
use crate::proof::{self, Pair, Sheet, sheet_html, sheet_json};
use crate::snag::SnagKind;

use super::mend::MendedClip;

/// The form of a sheet, told by the file's extension.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum SheetFormat {
    /// A page for people.
    Html,
    /// An object for machines.
    Json,
}

impl SheetFormat {
    /// By the extension of a file's name, in any case.
    pub(crate) fn of(path: &Path) -> Result<Self, CliError> {
        let extension = path.extension().map(|extension| extension.to_string_lossy().to_lowercase());
        match extension.as_deref() {
            Some("html" | "htm") => Ok(Self::Html),
            Some("json") => Ok(Self::Json),
            other => Err(CliError::Argument {
                place: path.display().to_string(),
                expected: "a sheet that ends in .html or .json".to_owned(),
                found: other.map_or_else(|| "no ending".to_owned(), |other| format!(".{other}")),
                advice: "choose another name",
            }),
        }
    }
}

/// Compares the first or named clip of each file.
pub(crate) fn run(args: &ProofArgs, output: &mut Output) -> Result<u8, CliError> {
    let format = SheetFormat::of(&args.output)?;
    let before = input::open_one(&args.before, &args.csv.open_options(), output)?;
    let after = input::open_one(&args.after, &args.csv.open_options(), output)?;
    let mut inputs = before.files();
    inputs.extend(after.files());
    Guard { inputs, force: args.force }.check(&args.output)?;
    let (b, a) = (before.first(), after.first());
    before.source.check_search(b)?;
    after.source.check_search(a)?;
    // What a scene keeps within limits is held against them, where they are for these joints.
    let held = after.works[a].as_ref().and_then(|work| work.limits_held.clone());
    let held = held.filter(|_| before.results[b].has_skeleton_of(&after.results[a]));
    let pair = Pair {
        label: before.source.clip_label(b),
        index: b,
        before: before.results[b].clone(),
        after: after.results[a].clone(),
        kinds: SnagKind::defaults(),
        limits: before.limits[b].clone().or(held),
        passes: after.works[a].as_ref().map(Work::passes_run).unwrap_or_default(),
        meant: after.works[a].as_ref().map(|work| work.left.clone()).unwrap_or_default(),
    };
    let mut sheet = sheet_of(&before.source, &after.source, vec![pair], format)?;
    sheet.is_computed = input::is_scene(&after.path);
    write(&sheet, &args.output, format, output)?;
    Ok(DONE)
}

/// The sheet of a file just written, read back from the disk, against the source it was made from.
pub(super) fn write_sheet(
    before: &Input,
    written: &Path,
    limits: &[Option<Arc<Limits>>],
    mended: &[MendedClip],
    path: &Path,
    format: SheetFormat,
    output: &mut Output,
) -> Result<(), CliError> {
    let options = OpenOptions::default().or_as_remembered(&before.source.reading);
    let after = input::read_back(written, &options, output)?;
    let holds_all = after.source.clips.len() == before.source.clips.len();
    // Where the new format holds one clip, it is the first of those chosen.
    let shown = if holds_all { mended } else { &mended[..1.min(mended.len())] };
    let pairs = shown.iter().map(|own| {
        let (index, work) = (own.index, before.works[own.index].as_ref());
        let mut passes = work.map(Work::passes_run).unwrap_or_default();
        passes.extend(own.passes_run());
        Pair {
            label: before.source.clip_label(index),
            index,
            // As it came in, not as a scene's passes had made it.
            before: before.source.clips[index].clone(),
            after: after.results[if holds_all { index } else { 0 }].clone(),
            kinds: own.kinds.clone(),
            limits: limits[index].clone(),
            passes,
            meant: work.map(|work| work.left.clone()).unwrap_or_default(),
        }
    });
    let sheet = sheet_of(&before.source, &after.source, pairs.collect(), format)?;
    write(&sheet, path, format, output)
}

/// Measures pairs of clips; with pictures where the form has them.
pub(super) fn sheet_of(
    before: &Source,
    after: &Source,
    pairs: Vec<Pair>,
    format: SheetFormat,
) -> Result<Sheet, CliError> {
    let progress = ProgressLine::new(format!("{}: measuring", after.path.display()));
    proof::sheet([before, after], pairs, format == SheetFormat::Html, &progress)
        .map_err(|source| CliError::Proof { path: after.path.clone(), source })
}

/// Writes a sheet at one stroke.
pub(super) fn write(
    sheet: &Sheet,
    path: &Path,
    format: SheetFormat,
    output: &mut Output,
) -> Result<(), CliError> {
    let text = match format {
        SheetFormat::Html => sheet_html(sheet),
        SheetFormat::Json => sheet_json(sheet),
    };
    disk::write(path, text.as_bytes())?;
    output.say(&format!("wrote {}", path.display()));
    Ok(())
}
