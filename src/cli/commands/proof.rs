//! `proof`: what changed between two clips, as a sheet.

use std::path::Path;
use std::sync::Arc;

use crate::cli::DONE;
use crate::cli::args::ProofArgs;
use crate::cli::error::CliError;
use crate::cli::input::{self, Input};
use crate::cli::output::Output;
use crate::cli::progress::ProgressLine;
use crate::exchange::{Guard, OpenOptions, disk};
use crate::limit::Limits;
use crate::proof::{self, FileFacts, ProofError, Sheet, sheet_html, sheet_json};

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
    let clips = [(before.first(), after.first())];
    let sheet = sheet_of(&before, &after, &clips, &before.limits, format)?;
    write(&sheet, &args.output, format, output)?;
    Ok(DONE)
}

/// The sheet of a file just written, read back from the disk, against the input it was made from.
pub(super) fn write_sheet(
    before: &Input,
    written: &Path,
    limits: &[Option<Arc<Limits>>],
    path: &Path,
    format: SheetFormat,
    output: &mut Output,
) -> Result<(), CliError> {
    let options = OpenOptions::default().or_as_remembered(&before.source.reading);
    let after = input::read_back(written, &options, output)?;
    // Where the new format holds one clip, it is the first of those chosen.
    let clips: Vec<(usize, usize)> = if after.source.clips.len() == before.source.clips.len() {
        before.chosen.iter().map(|&index| (index, index)).collect()
    } else {
        before.chosen.iter().take(1).map(|&index| (index, 0)).collect()
    };
    let sheet = sheet_of(before, &after, &clips, limits, format)?;
    write(&sheet, path, format, output)
}

/// Measures pairs of clips, each the index of one before and of one after; with pictures where the form has them.
pub(super) fn sheet_of(
    before: &Input,
    after: &Input,
    clips: &[(usize, usize)],
    limits: &[Option<Arc<Limits>>],
    format: SheetFormat,
) -> Result<Sheet, CliError> {
    let facts = |input: &Input| FileFacts {
        file: input.source.path.display().to_string(),
        sha256: input.source.sha256().to_owned(),
    };
    let progress = ProgressLine::new(format!("{}: measuring", after.source.path.display()));
    let clips = clips
        .iter()
        .map(|&(b, a)| {
            let label = before.source.clip_label(b);
            let (before, after) = (&before.results[b], &after.results[a]);
            let mut clip = proof::compare_with(before, after, label, b, limits[b].as_ref(), &progress)?;
            if format == SheetFormat::Html {
                clip.draw(before, after)?;
            }
            Ok(clip)
        })
        .collect::<Result<Vec<_>, ProofError>>()
        .map_err(|source| CliError::Proof { path: after.path.clone(), source })?;
    let notes = [before, after]
        .into_iter()
        .flat_map(|input| {
            let file = input.source.path.display().to_string();
            input.source.notes.iter().map(move |note| format!("{file}: {note}"))
        })
        .collect();
    Ok(Sheet { before: facts(before), after: facts(after), clips, notes })
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
