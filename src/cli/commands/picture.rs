//! `picture`: the skeleton at some times, as a PNG file.

use std::path::Path;

use glam::DVec3;

use crate::cli::DONE;
use crate::cli::args::PictureArgs;
use crate::cli::error::CliError;
use crate::cli::input::{self, Input};
use crate::cli::output::Output;
use crate::clip::Clip;
use crate::exchange::{Guard, disk};
use crate::raster::{
    Camera, Figure, FigureStyle, Girth, Image, Moment, StripStyle, Theme, compose, contact_strip,
    limbs_of_skeleton,
};

/// How many moments are shown when none are named.
const USUAL_MOMENTS: usize = 8;
/// The most moments of one picture.
const MOST_MOMENTS: usize = 400;
/// What [`compose`] leaves around tiles, between them, and above them for words and the title, pixels.
const MARGIN: usize = 16;
const GAP: usize = 12;
const CAPTION: usize = 22;
const TITLE: usize = 34;

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
    let image = draw(input, times, size);
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

fn draw(input: &Input, times: &[f64], [width, height]: [usize; 2]) -> Image {
    let theme = Theme::LIGHT;
    let index = input.first();
    let (before, after) = (&input.source.clips[index], &input.results[index]);
    let girth = Girth::of_skeleton(&after.skeleton);
    let figure = |clip: &Clip, secs: f64, style| Figure {
        girth,
        ..Figure::new(limbs_of_skeleton(&clip.skeleton, &clip.world_at(secs)), style)
    };
    let moments: Vec<Moment> = times
        .iter()
        .map(|&secs| {
            let mut figures = vec![figure(after, secs, FigureStyle::After)];
            if !std::sync::Arc::ptr_eq(before, after) {
                figures.push(figure(before, secs, FigureStyle::Before));
            }
            let frame = after.grid.frame(secs);
            Moment { caption: format!("{secs:.2} s  frame {frame}"), figures }
        })
        .collect();
    let (columns, tile) = layout(moments.len(), [width, height]);
    let style = StripStyle {
        width: tile[0],
        height: tile[1],
        scale: 1.0,
        camera: Camera::default(),
        theme,
        heading: DVec3::ZERO,
        tip_paths: Vec::new(),
    };
    let file = input.source.path.file_name().unwrap_or_default().to_string_lossy().into_owned();
    let title = format!("{file}  {}", input.source.clip_label(index));
    let page = compose(&title, &contact_strip(&moments, &style), columns, &theme, 1.0);
    // Whole tiles rarely fill a page to the pixel.
    let mut picture = Image::new(width, height, theme.background);
    picture.blit(&page, (width as i32 - page.width() as i32) / 2, 0);
    picture
}

/// Columns and tile size with the largest tiles for so many moments on a page: for each number of columns the tile is
/// what is left, and a figure that stands upright needs the smaller of its height and four thirds of its width.
fn layout(moments: usize, [width, height]: [usize; 2]) -> (usize, [usize; 2]) {
    let tile = |columns: usize| {
        let rows = moments.div_ceil(columns);
        let inner = [width.saturating_sub(2 * MARGIN), height.saturating_sub(2 * MARGIN + TITLE)];
        [
            (inner[0].saturating_sub(GAP * (columns - 1)) / columns).max(1),
            (inner[1].saturating_sub(GAP * (rows - 1)) / rows).saturating_sub(CAPTION).max(1),
        ]
    };
    let worth = |columns: usize| {
        let [width, height] = tile(columns);
        (4 * width / 3).min(height)
    };
    // Of equal ones the fewest columns, whose tiles are the widest.
    let columns = (1..=moments.max(1)).rev().max_by_key(|&columns| worth(columns)).unwrap_or(1);
    (columns, tile(columns))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn moments_share_the_page_without_leaving_it() {
        for (moments, size, columns) in
            [(1, [800, 600], 1), (8, [1600, 900], 4), (3, [1600, 500], 3), (4, [400, 1200], 2)]
        {
            let (found, [width, height]) = layout(moments, size);
            assert_eq!(found, columns, "{moments} moments on {size:?}");
            let rows = moments.div_ceil(columns);
            assert!(2 * MARGIN + columns * width + (columns - 1) * GAP <= size[0]);
            assert!(2 * MARGIN + TITLE + rows * (height + CAPTION) + (rows - 1) * GAP <= size[1]);
        }
    }
}
