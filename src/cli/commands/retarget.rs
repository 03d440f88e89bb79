//! `retarget`: a clip carried to another skeleton.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use crate::cli::DONE;
use crate::cli::args::RetargetArgs;
use crate::cli::error::CliError;
use crate::cli::input;
use crate::cli::output::Output;
use crate::exchange::{self, ClipAddress, Format, Guard, Source, disk};
use crate::proof;
use crate::retarget::{self, Figure, JointMap, Options};
use crate::skeleton::Skeleton;

/// The most doubts told; all are in the sheet.
const MOST_DOUBTS: usize = 12;

/// The first clip, or the one that is named, on the skeleton of another file.
pub(crate) fn run(args: &RetargetArgs, output: &mut Output) -> Result<u8, CliError> {
    Format::of(&args.output)?;
    let input = input::open_one(&args.clip, &args.csv.open_options(), output)?;
    let (onto, skeleton) = open_onto(args, output)?;
    let mut inputs: Vec<PathBuf> = input.files();
    inputs.push(onto.path.clone());
    inputs.extend(args.map.clone());
    let guard = Guard { inputs, force: args.force };
    for target in [Some(&args.output), args.save_map.as_ref(), args.proof.as_ref()].into_iter().flatten() {
        guard.check(target)?;
    }
    if input.chosen.len() > 1 {
        let label = input.source.clip_label(input.first());
        let text = format!("holds {} clips; took the first, {label}", input.chosen.len());
        output.note(&input.source.path, &text);
    }
    let clip = input.clip();
    let source = Figure::new(&clip.skeleton);
    let target = Figure::new(&skeleton);
    let mut map = JointMap::automatic(&source, &target);
    if let Some(path) = &args.map {
        let text = String::from_utf8_lossy(&disk::read(path)?).into_owned();
        let wrong = |source| CliError::Map { path: path.clone(), source };
        let rows = retarget::read_map(&text, &source.skeleton, &target.skeleton).map_err(wrong)?;
        for (who, figure) in [("source", &source), ("target", &target)] {
            let own = retarget::fingerprint(&figure.skeleton);
            let said = text.lines().find_map(|line| line.strip_prefix(&format!("# {who} skeleton ")));
            if said.is_some_and(|said| said.trim() != own) {
                output.note(path, &format!("was saved for another {who} skeleton; look whether it fits"));
            }
        }
        map.correct(&rows);
    }
    // A person's map answers the questions.
    if args.map.is_none() {
        for doubt in map.doubts.iter().take(MOST_DOUBTS) {
            output.note(&onto.path, &format!("{doubt}; say it with --map"));
        }
        if map.doubts.len() > MOST_DOUBTS {
            output.note(&onto.path, &format!("{} more doubts", map.doubts.len() - MOST_DOUBTS));
        }
    }
    if let Some(path) = &args.save_map {
        disk::write(path, retarget::write_map(&map, &source, &target).as_bytes())?;
        output.say(&format!("wrote {}", path.display()));
    }
    let options = Options { plant_feet: args.plant_feet, measure: true };
    let made = retarget::retarget(clip, &source, &target, &map, options)
        .map_err(|source| CliError::Retarget { path: onto.path.clone(), source })?;
    for note in &made.report.notes {
        output.note(&onto.path, note);
    }
    for line in summary(&made.report, &target.skeleton) {
        output.say(&line);
    }
    if let Some(path) = &args.proof {
        let names = [file_name(&input.source.path), file_name(&onto.path)];
        disk::write(
            path,
            proof::retarget_sheet(path, &made.report, &map, [&source, &target], &names).as_bytes(),
        )?;
        output.say(&format!("wrote {}", path.display()));
    }
    let written = exchange::write_onto(&onto, &made.clip, &args.output, &guard)?;
    output.notes(&args.output, &written.notes);
    output.say(&format!("wrote {}", args.output.display()));
    Ok(DONE)
}

fn file_name(path: &Path) -> String {
    path.file_name().unwrap_or_default().to_string_lossy().into_owned()
}

/// The file whose skeleton is meant; it need not have a clip.
fn open_onto(args: &RetargetArgs, output: &mut Output) -> Result<(Source, Arc<Skeleton>), CliError> {
    let address = ClipAddress::parse(&args.onto);
    let source = exchange::open(&address.path, &args.csv.open_options())?;
    output.notes(&source.path, &source.notes);
    let Some(skeleton) = source.skeleton() else {
        return Err(CliError::Argument {
            place: format!("--onto {}", address.path.display()),
            expected: "a file with joints: a skin, an animation or a hierarchy".to_owned(),
            found: "none".to_owned(),
            advice: "name a file with a skeleton",
        });
    };
    Ok((source, skeleton))
}

/// What it came to, in some lines.
fn summary(report: &retarget::Report, target: &Skeleton) -> Vec<String> {
    let mut lines = vec![format!(
        "{} of {} joints driven; lengths x{:.4}; arms and legs point within {:.3} degrees of the source's",
        report.driven[0],
        report.driven[1],
        report.scale,
        report.worst_direction_rad().to_degrees()
    )];
    if let (Some([before, after]), Some([far_before, far_after])) = (report.slide, report.drift) {
        lines.push(format!(
            "{} spans with a planted foot: slide {before:.4} before, {after:.4} after; farthest from its place {far_before:.4} before, {far_after:.4} after",
            report.n_plants
        ));
    }
    if let Some(largest) = &report.largest_correction {
        lines.push(format!(
            "largest correction {:.2} degrees: {} at frame {}",
            largest.by_rad.to_degrees(),
            target.label(largest.joint),
            largest.frame
        ));
    }
    for missed in report.missed.iter().take(8) {
        lines.push(format!(
            "not met: {} ({}, frame {}, by {:.4})",
            missed.what,
            target.label(missed.joint),
            missed.frame,
            missed.by
        ));
    }
    if report.missed.len() > 8 {
        lines.push(format!("not met: {} more", report.missed.len() - 8));
    }
    lines
}
