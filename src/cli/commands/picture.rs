//! `picture`: the skeleton at some times, as a PNG file.

use std::path::Path;
use std::sync::Arc;

use crate::cli::DONE;
use crate::cli::args::PictureArgs;
use crate::cli::error::CliError;
use crate::cli::input::{self, Input};
use crate::cli::output::Output;
use crate::cli::progress::ProgressLine;
use crate::clip::Clip;
use crate::exchange::{Guard, disk};
use crate::mend::{self, SurveyOptions};
use crate::raster::{Camera, ClipPage, Image, Theme, clip_page};
use crate::snag::SnagKind;

/// How many moments are shown when none are named.
const USUAL_MOMENTS: usize = 8;
/// The most moments of one picture.
const MOST_MOMENTS: usize = 400;

/// Draws a clip, and of a scene the result over its source.
pub(crate) fn run(args: &PictureArgs, output: &mut Output) -> Result<u8, CliError> {
    if !args.output.extension().is_some_and(|extension| extension.eq_ignore_ascii_case("png")) {
        return Err(CliError::Argument {
            place: args.output.display().to_string(),
            expected: "a picture that ends in .png".to_owned(),
            found: args
                .output
                .extension()
                .map_or_else(|| "no ending".to_owned(), |e| format!(".{}", e.to_string_lossy())),
            advice: "choose another name",
        });
    }
    let input = input::open_one(&args.clip, output)?;
    Guard { inputs: input.files(), force: args.force }.check(&args.output)?;
    let times = times(args, input.clip())?;
    write(&input, &times, args.size, &args.output, output)?;
    Ok(DONE)
}

/// Draws the first clip that is meant, at these seconds, into a file.
pub(super) fn write(
    input: &Input,
    times: &[f64],
    size: [usize; 2],
    path: &Path,
    output: &mut Output,
) -> Result<(), CliError> {
    let image = draw(input, times, size)?;
    let bytes = image.encode_png().map_err(|source| CliError::Picture { path: path.to_owned(), source })?;
    disk::write(path, &bytes)?;
    output.say(&format!("wrote {}", path.display()));
    Ok(())
}

fn times(args: &PictureArgs, clip: &Clip) -> Result<Vec<f64>, CliError> {
    let Some(at) = &args.at else { return Ok(spread(clip, USUAL_MOMENTS)) };
    let wrong = |found: String| CliError::Argument {
        place: "--at".to_owned(),
        expected: format!("up to {MOST_MOMENTS} seconds"),
        found,
        advice: "name times such as 0,0.5,1",
    };
    if let Some(secs) = at.iter().find(|secs| !secs.is_finite()) {
        return Err(wrong(secs.to_string()));
    }
    if at.len() > MOST_MOMENTS { Err(wrong(format!("{} of them", at.len()))) } else { Ok(at.clone()) }
}

/// Times spread evenly from the first frame to the last; one for a clip of one pose.
pub(super) fn spread(clip: &Clip, count: usize) -> Vec<f64> {
    if clip.duration_secs <= 0.0 {
        return vec![0.0];
    }
    (0..count).map(|moment| clip.duration_secs * moment as f64 / (count - 1) as f64).collect()
}

/// The page of the first clip that is meant: the poses of the result over those of the source, and the turn map of the
/// source with its snags.
fn draw(input: &Input, times: &[f64], [width, height]: [usize; 2]) -> Result<Image, CliError> {
    let index = input.first();
    let (before, after) = (&input.source.clips[index], &input.results[index]);
    let progress = ProgressLine::new(format!("{}: looking for snags", input.source.path.display()));
    let survey = mend::survey(before, &SurveyOptions { kinds: SnagKind::ALL.to_vec() }, &progress)?;
    let file = input.source.path.file_name().unwrap_or_default().to_string_lossy().into_owned();
    Ok(clip_page(&ClipPage {
        title: format!("{file}  {}", input.source.clip_label(index)),
        clip: after,
        before: (!Arc::ptr_eq(before, after)).then_some(&**before),
        snags: &survey.snags,
        times_secs: times.to_vec(),
        width,
        height,
        scale: 1.0,
        theme: Theme::LIGHT,
        camera: Camera::default(),
    }))
}
