//! `convert`: another format, another rate, or a part.

use std::sync::Arc;

use crate::cli::DONE;
use crate::cli::args::ConvertArgs;
use crate::cli::error::CliError;
use crate::cli::input::{self, Input};
use crate::cli::output::Output;
use crate::clip::{self, Clip, ReduceOptions};
use crate::exchange::{self, Format, Guard, OpenOptions};

/// The most frames a clip is resampled to: an hour at 1000 a second.
const MOST_FRAMES: f64 = 3.6e6;

/// Within glTF every clip is converted, else the first or the one that is named.
pub(crate) fn run(args: &ConvertArgs, output: &mut Output) -> Result<u8, CliError> {
    if let Some(rate) = args.rate.filter(|rate| !(rate.is_finite() && *rate > 0.0)) {
        return Err(argument("--rate", "frames per second above 0", rate, "name a rate such as 30"));
    }
    let format = Format::of(&args.output)?;
    if let Some(degrees) = args.reduce {
        check_reduce(degrees, format)?;
    }
    let options = OpenOptions { rest: args.rest, ..args.csv.open_options() };
    let input = input::open_one(&args.clip, &options, output)?;
    let guard = Guard { inputs: input.files(), force: args.force };
    guard.check(&args.output)?;
    let all = input.source.format.holds_many() && format.holds_many() && !input.is_named;
    let first = input.first();
    let meant = |index: usize| if all { input.chosen.contains(&index) } else { index == first };
    let mut results: Vec<Arc<Clip>> = Vec::with_capacity(input.results.len());
    for (index, clip) in input.results.iter().enumerate() {
        results.push(if meant(index) {
            let part = part_of(clip, args, &input, all)?;
            match args.reduce {
                Some(degrees) => reduced(&part, degrees, format, &input, index, output),
                None => part,
            }
        } else {
            clip.clone()
        });
    }
    if !all && input.chosen.len() > 1 {
        let label = input.source.clip_label(first);
        output.note(
            &input.source.path,
            &format!("holds {} clips; took the first, {label}", input.chosen.len()),
        );
    }
    let choice = (!all).then_some(first);
    let written = exchange::write(&input.source, &results, choice, &args.output, &guard)?;
    output.notes(&args.output, &written.notes);
    output.say(&format!("wrote {}", args.output.display()));
    Ok(DONE)
}

/// The part of the clip that is asked for, at the rate that is asked for. Untouched when nothing is.
fn part_of(
    clip: &Arc<Clip>,
    args: &ConvertArgs,
    input: &Input,
    is_one_of_all: bool,
) -> Result<Arc<Clip>, CliError> {
    if args.rate.is_none() && args.from.is_none() && args.to.is_none() {
        return Ok(clip.clone());
    }
    let end = clip.duration_secs;
    let from = args.from.unwrap_or(0.0);
    if !(0.0..=end).contains(&from) {
        // Of several clips the shorter ones may have nothing there.
        if is_one_of_all && input.chosen.len() > 1 && from.is_finite() {
            return Ok(clip.clone());
        }
        let expected = format!("a second within the clip, from 0 to {end:.3}");
        return Err(argument("--from", &expected, from, "choose one"));
    }
    let to = args.to.unwrap_or(end);
    if to.is_nan() || to < from {
        return Err(argument("--to", &format!("a second from {from} on"), to, "choose one"));
    }
    let to = to.min(end);
    Ok(Arc::new(match args.rate {
        None => clip::cut(clip, from, to),
        Some(rate) if (to - from) * rate > MOST_FRAMES => {
            let expected = format!("a rate that gives at most {MOST_FRAMES:.0} frames");
            return Err(argument(
                "--rate",
                &expected,
                rate,
                "choose a lower rate or a part with --from and --to",
            ));
        }
        Some(rate) => clip::resampled(clip, rate, from, to),
    }))
}

/// Whether keys can be reduced so.
fn check_reduce(degrees: f64, format: Format) -> Result<(), CliError> {
    if !(degrees > 0.0 && degrees <= 45.0) {
        let expected = "degrees above 0 and up to 45";
        return Err(argument(
            "--reduce",
            expected,
            degrees,
            "name the largest change that is allowed, such as 0.1",
        ));
    }
    if format == Format::Bvh {
        return Err(CliError::Argument {
            place: "--reduce".to_owned(),
            expected: "a format whose keys may be apart (.gltf, .glb, .csv)".to_owned(),
            found: ".bvh, which has a row for each frame".to_owned(),
            advice: "write another format, or leave --reduce out",
        });
    }
    Ok(())
}

/// With as few keys as the bound allows; a table of rows has the same for all joints.
fn reduced(
    clip: &Arc<Clip>,
    degrees: f64,
    format: Format,
    input: &Input,
    index: usize,
    output: &mut Output,
) -> Arc<Clip> {
    let options = ReduceOptions::within(degrees.to_radians());
    let is_table = format == Format::Csv;
    let reduce = if is_table { clip::reduced_together } else { clip::reduced };
    let (clip, count) = reduce(clip, &options);
    let what = if is_table { "rows" } else { "keys" };
    let label = input.source.clip_label(index);
    output.say(&format!("{label}: {} of {} {what} left", count.after, count.before));
    Arc::new(clip)
}

fn argument(place: &str, expected: &str, found: f64, advice: &'static str) -> CliError {
    CliError::Argument {
        place: place.to_owned(),
        expected: expected.to_owned(),
        found: found.to_string(),
        advice,
    }
}
