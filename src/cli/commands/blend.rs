//! `blend`: one clip of two, or of many.

use std::sync::Arc;

use crate::blend::{self, BlendError, JoinPlace, Mask, MixAlong, MixHow};
use crate::cli::DONE;
use crate::cli::args::BlendArgs;
use crate::cli::error::CliError;
use crate::cli::input::{self, Input};
use crate::cli::output::Output;
use crate::clip::Clip;
use crate::exchange::{self, Format, Guard};
use crate::retarget::{self, Partner};

/// The result takes the first clip's place in its file; the file's other clips stay.
pub(crate) fn run(args: &BlendArgs, output: &mut Output) -> Result<u8, CliError> {
    Format::of(&args.output)?;
    let options = args.csv.open_options();
    let first = input::open_one(&args.first, &options, output)?;
    check_counts(args)?;
    let others = args
        .others
        .iter()
        .map(|other| input::open_one(other, &options, output))
        .collect::<Result<Vec<Input>, CliError>>()?;
    let files = std::iter::once(&first).chain(&others).flat_map(Input::files);
    let guard = Guard { inputs: files.collect(), force: args.force };
    guard.check(&args.output)?;
    for one in std::iter::once(&first).chain(&others) {
        if one.chosen.len() > 1 {
            let label = one.source.clip_label(one.first());
            let text = format!("holds {} clips; took the first, {label}", one.chosen.len());
            output.note(&one.source.path, &text);
        }
    }
    let mut clips = Vec::with_capacity(others.len());
    for other in &others {
        let path = &other.source.path;
        let carried = |source| CliError::Retarget { path: path.clone(), source };
        let Partner { clip, is_carried, notes } =
            retarget::partner(other.clip(), &first.clip().skeleton).map_err(carried)?;
        for note in &notes {
            output.note(path, note);
        }
        if is_carried {
            output.note(path, "to say yourself which joint drives which, use retarget first");
        }
        clips.push(clip);
    }
    let second = others[0].source.path.clone();
    let failed = |source| CliError::Blend { first: first.source.path.clone(), second, source };
    let blended = blended(args, first.clip(), &clips).map_err(failed)?;
    let lengths: Vec<String> = std::iter::once(&first)
        .chain(&others)
        .map(|one| format!("{:.3} s", one.clip().duration_secs))
        .collect();
    output.say(&format!("{} became {:.3} s", lengths.join(" and "), blended.duration_secs));
    let mut results = first.results.clone();
    results[first.first()] = blended;
    let written = exchange::write(&first.source, &results, Some(first.first()), &args.output, &guard)?;
    output.notes(&args.output, &written.notes);
    output.say(&format!("wrote {}", args.output.display()));
    Ok(DONE)
}

/// Whether there are as many clips and weights as the form takes.
fn check_counts(args: &BlendArgs) -> Result<(), CliError> {
    let count = args.others.len();
    match &args.mean {
        None if count > 1 => Err(CliError::Argument {
            place: "B".to_owned(),
            expected: "one clip with --join, --mix and --add".to_owned(),
            found: format!("{count}"),
            advice: "use --mean for the mean of many",
        }),
        Some(weights) if weights.len() != count + 1 => Err(CliError::Argument {
            place: "--mean".to_owned(),
            expected: format!("{} weights, one for A and one for each B", count + 1),
            found: format!("{}", weights.len()),
            advice: "give them in the order of the clips, such as 1,1,2",
        }),
        _ => Ok(()),
    }
}

fn blended(args: &BlendArgs, a: &Arc<Clip>, others: &[Arc<Clip>]) -> Result<Arc<Clip>, BlendError> {
    let b = &others[0];
    let mask = match &args.joints {
        Some(labels) => Mask::joints(&a.skeleton, labels)?,
        None => Mask::all(&a.skeleton),
    };
    let made = if let Some(weights) = &args.mean {
        let clips = std::iter::once(a).chain(others).map(|clip| &**clip);
        let weighted: Vec<(&Clip, f64)> = clips.zip(weights.iter().copied()).collect();
        blend::mix_many(&weighted, &mask)?
    } else if let Some(overlap_secs) = args.join {
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
        let holds_feet = if args.align { !args.no_plant_feet } else { args.plant_feet };
        let how = MixHow { weight, mask, root: args.root.root(), holds_feet };
        if args.align {
            let along = blend::align(a, b)?;
            blend::mix_aligned(a, b, &along, &how)?
        } else {
            blend::mix_by(a, b, &how)?
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
