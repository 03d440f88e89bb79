//! `blend`: one clip of two, or of many.

use std::sync::Arc;

use crate::blend::{self, BlendError, JoinPlace, Mask, MeanHow, MixAlong, MixHow, Registration};
use crate::cli::DONE;
use crate::cli::args::BlendArgs;
use crate::cli::error::CliError;
use crate::cli::input::{self, Input};
use crate::cli::output::Output;
use crate::clip::Clip;
use crate::exchange::{self, Format, Guard};
use crate::retarget::{self, Partner};
use crate::skeleton::Skeleton;

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
        let carried = |source| CliError::Carry { path: path.clone(), source };
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
    if args.add.is_none() {
        let all: Vec<&Clip> = std::iter::once(first.clip()).chain(&clips).map(|clip| &**clip).collect();
        if let Some(jump) = blend::worst_jump(&blended, &all) {
            let advice =
                if args.align || args.join.is_some() { "" } else { "; --align turns both to one heading" };
            output.note(&first.source.path, &format!("{}{advice}", jump.words(&blended.skeleton)));
        }
    }
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
    let mask = mask(args, &a.skeleton)?;
    let made = if let Some(weights) = &args.mean {
        let clips = std::iter::once(a).chain(others).map(|clip| &**clip);
        let weighted: Vec<(&Clip, f64)> = clips.zip(weights.iter().copied()).collect();
        let along = others.iter().filter(|_| args.align).map(|other| blend::align(a, other));
        let along = along.collect::<Result<Vec<Registration>, BlendError>>()?;
        let along: Vec<&Registration> = along.iter().collect();
        let holds_feet = holds_feet(args);
        let along = args.align.then_some(&*along);
        blend::mix_many_by(&weighted, &MeanHow { mask: &mask, along, holds_feet })?
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
        let how = MixHow { weight, mask, root: args.root.root(), holds_feet: holds_feet(args) };
        if args.align {
            let along = blend::align(a, b)?;
            blend::mix_aligned(a, b, &along, &how)?
        } else {
            blend::mix_by(a, b, &how)?
        }
    };
    Ok(Arc::new(made))
}

/// Frame by frame is what it says; in step there are feet to speak of.
fn holds_feet(args: &BlendArgs) -> bool {
    if args.align { !args.no_plant_feet } else { args.plant_feet }
}

/// Limbs first, then joints, each with its factor behind a `=` where it has one.
fn mask(args: &BlendArgs, skeleton: &Skeleton) -> Result<Mask, BlendError> {
    if args.joints.is_none() && args.limbs.is_none() {
        return Ok(Mask::all(skeleton));
    }
    let factor_of = |text: &str| -> (String, f64) {
        // A joint may have such a sign in its name.
        let whole = || (text.to_owned(), 1.0);
        if skeleton.find(text).is_some() {
            return whole();
        }
        let split =
            text.rsplit_once('=').and_then(|(label, factor)| Some((label, factor.trim().parse().ok()?)));
        split.map_or_else(whole, |(label, factor)| (label.to_owned(), factor))
    };
    let mut mask = Mask::none(skeleton);
    for text in args.limbs.iter().flatten() {
        let (label, factor) = factor_of(text);
        mask = mask.or(&Mask::limb(skeleton, &label, args.soft)?.times(factor)?);
    }
    for text in args.joints.iter().flatten() {
        let (label, factor) = factor_of(text);
        mask = mask.with(skeleton, &label, factor)?;
    }
    Ok(mask)
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
