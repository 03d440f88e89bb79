//! `blend`: one clip of two.

use std::sync::Arc;

use crate::blend::{self, AlignedMix, BlendError, JoinPlace, Mask, MixAlong, RootFrom};
use crate::cli::DONE;
use crate::cli::args::BlendArgs;
use crate::cli::error::CliError;
use crate::cli::input;
use crate::cli::output::Output;
use crate::clip::Clip;
use crate::exchange::{self, Format, Guard};
use crate::retarget::{self, Partner};

/// The result takes the first clip's place in its file; the file's other clips stay.
pub(crate) fn run(args: &BlendArgs, output: &mut Output) -> Result<u8, CliError> {
    Format::of(&args.output)?;
    let options = args.csv.open_options();
    let first = input::open_one(&args.first, &options, output)?;
    let second = input::open_one(&args.second, &options, output)?;
    let guard = Guard { inputs: [first.files(), second.files()].concat(), force: args.force };
    guard.check(&args.output)?;
    for one in [&first, &second] {
        if one.chosen.len() > 1 {
            let label = one.source.clip_label(one.first());
            let text = format!("holds {} clips; took the first, {label}", one.chosen.len());
            output.note(&one.source.path, &text);
        }
    }
    let second_path = &second.source.path;
    let carried = |source| CliError::Retarget { path: second_path.clone(), source };
    let Partner { clip: other, is_carried, notes } =
        retarget::partner(second.clip(), &first.clip().skeleton).map_err(carried)?;
    for note in &notes {
        output.note(second_path, note);
    }
    if is_carried {
        output.note(second_path, "to say yourself which joint drives which, use retarget first");
    }
    let failed =
        |source| CliError::Blend { first: first.source.path.clone(), second: second_path.clone(), source };
    let blended = blended(args, first.clip(), &other).map_err(failed)?;
    output.say(&format!(
        "{:.3} s and {:.3} s became {:.3} s",
        first.clip().duration_secs,
        second.clip().duration_secs,
        blended.duration_secs
    ));
    let mut results = first.results.clone();
    results[first.first()] = blended;
    let written = exchange::write(&first.source, &results, Some(first.first()), &args.output, &guard)?;
    output.notes(&args.output, &written.notes);
    output.say(&format!("wrote {}", args.output.display()));
    Ok(DONE)
}

fn blended(args: &BlendArgs, a: &Arc<Clip>, b: &Arc<Clip>) -> Result<Arc<Clip>, BlendError> {
    let mask = match &args.joints {
        Some(labels) => Mask::joints(&a.skeleton, labels)?,
        None => Mask::all(&a.skeleton),
    };
    let made = if let Some(overlap_secs) = args.join {
        let place = if args.find_place {
            nearest_place(a, b, overlap_secs)?
        } else {
            JoinPlace::end_to_start(a, overlap_secs)
        };
        if args.no_plant_feet {
            blend::join(a, b, place, &mask)?
        } else {
            blend::join_on_feet(a, b, place, &mask)?
        }
    } else if let Some(weight) = args.add {
        blend::add(a, b, weight, args.reference.reference(), args.side.side(), &mask)?
    } else {
        let weight = args.mix.clone().unwrap_or(MixAlong::constant(0.0));
        if args.align {
            let along = blend::align(a, b)?;
            let holds_feet = !args.no_plant_feet;
            let how = AlignedMix { weight, mask, root: RootFrom::Both, holds_feet };
            blend::mix_aligned(a, b, &along, &how)?
        } else if args.plant_feet {
            blend::mix_on_feet(a, b, &weight, &mask)?
        } else {
            blend::mix(a, b, &weight, &mask)?
        }
    };
    Ok(Arc::new(made))
}

/// Where the poses of both clips are nearest over an overlap, of places that keep at least half of each clip.
fn nearest_place(a: &Clip, b: &Clip, overlap_secs: f64) -> Result<JoinPlace, BlendError> {
    /// Rows and columns that are looked at.
    const CELLS: usize = 200;
    let picture = blend::join_distances(a, b, overlap_secs, CELLS)?;
    let places = blend::best_places(&picture, overlap_secs, CELLS * CELLS);
    let keeps = |place: &JoinPlace| {
        place.first_secs >= 0.5 * (a.duration_secs - overlap_secs)
            && place.second_secs <= 0.5 * (b.duration_secs - overlap_secs)
    };
    let found = places.into_iter().map(|(place, _)| place).find(keeps);
    Ok(found.unwrap_or_else(|| JoinPlace::end_to_start(a, overlap_secs)))
}
