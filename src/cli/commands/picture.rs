//! `picture`: the skeleton at some times above its turn map, as a PNG file.

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
use crate::raster::{Camera, ClipPage, Image, Theme, clip_page, spread_times};

/// How many moments are shown when none are named.
const USUAL_MOMENTS: usize = 8;
/// The most moments of one picture.
const MOST_MOMENTS: usize = 400;

/// Draws a clip, and of a scene the result over its source.
pub(crate) fn run(args: &PictureArgs, output: &mut Output) -> Result<u8, CliError> {
    let input = checked(args, output)?;
    let times = times(args, input.clip())?;
    write(&input, &times, args.size, &args.output, output)?;
    Ok(DONE)
}

/// Opens what is to be drawn, once it is sure that the picture may be written.
pub(crate) fn checked(args: &PictureArgs, output: &mut Output) -> Result<Input, CliError> {
    let ending = args.output.extension().map(|ending| ending.to_string_lossy().into_owned());
    if !ending.as_ref().is_some_and(|ending| ending.eq_ignore_ascii_case("png")) {
        return Err(CliError::Argument {
            place: args.output.display().to_string(),
            expected: "a picture that ends in .png".to_owned(),
            found: ending.map_or_else(|| "no ending".to_owned(), |ending| format!(".{ending}")),
            advice: "choose another name",
        });
    }
    let input = input::open_one(&args.clip, &args.csv.open_options(), output)?;
    Guard { inputs: input.files(), force: args.force }.check(&args.output)?;
    times(args, input.clip())?;
    Ok(input)
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
    write_image(&image, path, output)
}

/// Writes a picture at one stroke.
pub(crate) fn write_image(image: &Image, path: &Path, output: &mut Output) -> Result<(), CliError> {
    let bytes = image.encode_png().map_err(|source| CliError::Picture { path: path.to_owned(), source })?;
    disk::write(path, &bytes)?;
    output.say(&format!("wrote {}", path.display()));
    Ok(())
}

fn times(args: &PictureArgs, clip: &Clip) -> Result<Vec<f64>, CliError> {
    let Some(at) = &args.at else { return Ok(spread_times(clip, USUAL_MOMENTS)) };
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

/// The page of the first clip that is meant: the poses of the result over those of the source, and the turn map of the
/// source with its snags.
fn draw(input: &Input, times: &[f64], [width, height]: [usize; 2]) -> Result<Image, CliError> {
    let index = input.first();
    input.source.check_search(index)?;
    let (before, after) = (&input.source.clips[index], &input.results[index]);
    let progress = ProgressLine::new(format!("{}: looking for snags", input.source.path.display()));
    let survey = mend::survey(before, &SurveyOptions::default(), &progress)?;
    let file = input.source.path.file_name().unwrap_or_default().to_string_lossy().into_owned();
    let label = input.source.clip_label(index);
    Ok(clip_page(&ClipPage {
        title: if file.starts_with(&label) { file } else { format!("{file}  {label}") },
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
