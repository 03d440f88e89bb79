//! `convert`: another format, another rate, or a part.

use std::sync::Arc;

use crate::blend;
use crate::cli::DONE;
use crate::cli::args::{CloseLoop, ConvertArgs};
use crate::cli::error::CliError;
use crate::cli::input::{self, Input};
use crate::cli::numbers::shown;
use crate::cli::output::Output;
use crate::clip::{self, Clip, ReduceOptions};
use crate::exchange::{self, Format, Guard, OpenOptions};
use crate::scene::{LoopPass, NoOthers, PassKind};

/// The most frames a clip is resampled to: an hour at 1000 a second.
const MOST_FRAMES: f64 = 3.6e6;
/// The lowest rate: beyond it a BVH's frame time is longer than readers take it for.
const LEAST_RATE: f64 = 0.001;

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
            let part = looped(&part, args, &input, index, output)?;
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
        Some(rate) if rate < LEAST_RATE => {
            let expected = format!("a rate of at least {LEAST_RATE} frames per second");
            return Err(argument("--rate", &expected, rate, "choose a higher rate"));
        }
        // A part of no length has one frame, but a frame time all the same.
        Some(rate) if (to - from).max(1.0) * rate > MOST_FRAMES => {
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

/// On more frames than this a seam is looked for on evenly spaced times instead.
const MOST_TIMES: usize = 1500;

/// The loop that is asked for. Untouched where none is.
fn looped(
    clip: &Arc<Clip>,
    args: &ConvertArgs,
    input: &Input,
    index: usize,
    output: &mut Output,
) -> Result<Arc<Clip>, CliError> {
    if args.repeat.is_none() && args.close_loop.is_none() && args.find_loop.is_none() {
        return Ok(clip.clone());
    }
    let label = input.source.clip_label(index);
    let mut pass = LoopPass {
        part_secs: None,
        close: args.close_loop.map(CloseLoop::closing),
        rounds: args.repeat.unwrap_or(1),
    };
    if let Some(least_secs) = args.find_loop {
        let parts = blend::best_loops(clip, least_secs, 1, MOST_TIMES)
            .map_err(|error| wrong_loop("--find-loop", &error, "choose another length"))?;
        if let Some(part) = parts.first() {
            let (from, to) = (part.from_secs, part.to_secs);
            output.say(&format!("{label}: from {from:.3} s to {to:.3} s, poses {:.4} apart", part.distance));
            pass.part_secs = Some([from, to]);
        }
    }
    let outcome = pass
        .apply(clip, &NoOthers)
        .map_err(|error| wrong_loop("--repeat", &error, "choose another number"))?;
    for note in &outcome.notes {
        output.say(&format!("{label}: {note}"));
    }
    Ok(Arc::new(outcome.clip))
}

/// An error that names what was expected and found itself.
fn wrong_loop(place: &str, error: &dyn std::fmt::Display, advice: &'static str) -> CliError {
    let text = error.to_string();
    let (expected, found) = text.split_once(", found ").unwrap_or((&text, "none"));
    let expected = expected.rsplit("expected ").next().unwrap_or(expected);
    CliError::Argument {
        place: place.to_owned(),
        expected: expected.to_owned(),
        found: found.to_owned(),
        advice,
    }
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
    CliError::Argument { place: place.to_owned(), expected: expected.to_owned(), found: shown(found), advice }
}
