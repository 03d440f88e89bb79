//! `retarget`: a clip carried to another skeleton.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use crate::cli::DONE;
use crate::cli::args::{RetargetArgs, Straighten};
use crate::cli::error::CliError;
use crate::cli::input::{self, Input};
use crate::cli::limits::LimitsSource;
use crate::cli::numbers::shown;
use crate::cli::output::Output;
use crate::clip::Clip;
use crate::exchange::{self, ClipAddress, Format, Guard, Source, disk, joint_maps};
use crate::proof;
use crate::retarget::{
    self, Contacts, Figure, JointMap, KeptLimits, Options, RestPick, find_contacts, read_contacts,
    write_contacts,
};
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
    inputs.extend([&args.map, &args.contacts].into_iter().flatten().cloned());
    let guard = Guard { inputs, force: args.force };
    let more = [&args.save_map, &args.save_contacts, &args.proof];
    for target in std::iter::once(&args.output).chain(more.into_iter().flatten()) {
        guard.check(target)?;
    }
    if input.chosen.len() > 1 {
        let label = input.source.clip_label(input.first());
        let text = format!("holds {} clips; took the first, {label}", input.chosen.len());
        output.note(&input.source.path, &text);
    }
    let clip = input.clip();
    let [source, target] = figures(args, clip, [&input.source.path, &onto.path], &onto, &skeleton)?;
    let map = joint_map(args, [&source, &target], &onto.path, output)?;
    let limits = kept_limits(args, &input, &skeleton, output)?;
    let contacts = contacts(args, clip, &source, output)?;
    let options = Options {
        plant_feet: args.plant_feet || contacts.feet.is_some(),
        feet: contacts.feet,
        hands: contacts.hands,
        limits,
        measure: true,
    };
    let made = retarget::retarget(clip, &source, &target, &map, &options)
        .map_err(|source| CliError::Retarget { path: onto.path.clone(), source })?;
    for note in &made.report.notes {
        output.note(&onto.path, note);
    }
    for line in summary(&made.report, &target.skeleton, options.limits.is_some()) {
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

/// The limits that are asked for: of the target's joints, or of the clip's own, to be carried over.
fn kept_limits(
    args: &RetargetArgs,
    input: &Input,
    skeleton: &Skeleton,
    output: &mut Output,
) -> Result<Option<KeptLimits>, CliError> {
    if let Some(names) = &args.carry_limits {
        let limits = LimitsSource::open(names.first())?.fit(input, output)?;
        let own = limits.into_iter().nth(input.first()).flatten();
        return own.map(|own| Some(KeptLimits::OfSource(own))).ok_or_else(|| CliError::Argument {
            place: "--carry-limits".to_owned(),
            expected: "limits of the clip's joints".to_owned(),
            found: "none".to_owned(),
            advice: "name a file of limits, or a scene whose clip has some",
        });
    }
    let limits = LimitsSource::open(args.limits.as_ref())?;
    Ok(match limits.for_skeleton(skeleton, output)? {
        Some(limits) => Some(KeptLimits::Given(limits)),
        None => args.limits.is_some().then_some(KeptLimits::Adult),
    })
}

/// Both figures, each in the pose that counts as its rest.
fn figures(
    args: &RetargetArgs,
    clip: &Clip,
    [own_path, onto_path]: [&Path; 2],
    onto: &Source,
    skeleton: &Arc<Skeleton>,
) -> Result<[Figure; 2], CliError> {
    let root = |option: &str, path: &Path, skeleton: &Skeleton, label: Option<&String>| {
        let Some(label) = label else { return Ok(None) };
        skeleton.find(label).map(Some).ok_or_else(|| CliError::Argument {
            place: format!("{option} {label}"),
            expected: format!("a joint of {}", path.display()),
            found: "none of that name".to_owned(),
            advice: "see `turnwright sample` for the names",
        })
    };
    let roots = [
        root("--root", own_path, &clip.skeleton, args.root.as_ref())?,
        root("--onto-root", onto_path, skeleton, args.onto_root.as_ref())?,
    ];
    let onto_clip = onto.clips.first();
    if args.onto_rest_at.is_some() && onto_clip.is_none() {
        return Err(CliError::Argument {
            place: "--onto-rest-at".to_owned(),
            expected: format!("a clip in {}", onto_path.display()),
            found: "none".to_owned(),
            advice: "leave the option out",
        });
    }
    for (option, secs, clip) in [
        ("--rest-at", args.rest_at, Some(clip)),
        ("--onto-rest-at", args.onto_rest_at, onto_clip.map(|own| &**own)),
    ] {
        let last = clip.map_or(0.0, |clip| clip.duration_secs);
        if let Some(found) = secs.filter(|secs| !(0.0..=last).contains(secs)) {
            return Err(CliError::Argument {
                place: option.to_owned(),
                expected: format!("a second within the clip, from 0 to {last:.3}"),
                found: shown(found),
                advice: "choose one",
            });
        }
    }
    let is_straightened =
        |own: Straighten| args.straighten.is_some_and(|wanted| wanted == own || wanted == Straighten::Both);
    let rests = [
        RestPick { frame_secs: args.rest_at, is_straightened: is_straightened(Straighten::Source) },
        RestPick { frame_secs: args.onto_rest_at, is_straightened: is_straightened(Straighten::Target) },
    ];
    Ok([
        rests[0].figure(&clip.skeleton, Some(clip), roots[0]),
        rests[1].figure(skeleton, onto_clip.map(|clip| &**clip), roots[1]),
    ])
}

/// The map: found, with the corrections of a file or those kept for these two skeletons.
fn joint_map(
    args: &RetargetArgs,
    [source, target]: [&Figure; 2],
    onto: &Path,
    output: &mut Output,
) -> Result<JointMap, CliError> {
    let mut map = JointMap::automatic(source, target);
    let folder = joint_maps::folder();
    let mut is_corrected = false;
    if let Some(path) = &args.map {
        let text = String::from_utf8_lossy(&disk::read(path)?).into_owned();
        let wrong = |source| CliError::Map { path: path.clone(), source };
        let rows = retarget::read_map(&text, &source.skeleton, &target.skeleton).map_err(wrong)?;
        for (who, figure) in [("source", source), ("target", target)] {
            let own = retarget::fingerprint(&figure.skeleton);
            let said = text.lines().find_map(|line| line.strip_prefix(&format!("# {who} skeleton ")));
            if said.is_some_and(|said| said.trim() != own) {
                output.note(path, &format!("was saved for another {who} skeleton; look whether it fits"));
            }
        }
        map.correct(&rows);
        is_corrected = true;
    } else if let Some(folder) = folder.as_ref().filter(|_| !args.no_kept_map)
        && let Some((path, rows)) = joint_maps::kept(folder, source, target)?
    {
        output.note(
            &path,
            "this joint map was kept for these two skeletons and is used; --no-kept-map goes without",
        );
        map.correct(&rows);
        is_corrected = true;
    }
    // A person's map answers the questions.
    if !is_corrected {
        for doubt in map.doubts.iter().take(MOST_DOUBTS) {
            output.note(onto, &format!("{doubt}; say it with --map"));
        }
        if map.doubts.len() > MOST_DOUBTS {
            output.note(onto, &format!("{} more doubts", map.doubts.len() - MOST_DOUBTS));
        }
    }
    for (option, figure) in [("--root", source), ("--onto-root", target)] {
        let others = &figure.roles.other_figures;
        if !others.is_empty() {
            let names: Vec<String> =
                others.iter().map(|&joint| format!("`{}`", figure.skeleton.label(joint))).collect();
            output.note(onto, &format!("further figures hang on {}; choose with {option}", names.join(", ")));
        }
    }
    if let Some(path) = &args.save_map {
        disk::write(path, retarget::write_map(&map, source, target).as_bytes())?;
        output.say(&format!("wrote {}", path.display()));
    }
    if args.keep_map {
        let Some(folder) = &folder else {
            return Err(CliError::Argument {
                place: "--keep-map".to_owned(),
                expected: "a folder for settings".to_owned(),
                found: "none".to_owned(),
                advice: "name one in TURNWRIGHT_MAPS",
            });
        };
        let path = joint_maps::keep(folder, &map, source, target)?;
        output.say(&format!("kept the joint map as {}", path.display()));
    }
    Ok(map)
}

/// When feet stand and which hands are held: what a file says, and written where that was asked for.
fn contacts(
    args: &RetargetArgs,
    clip: &Clip,
    source: &Figure,
    output: &mut Output,
) -> Result<Contacts, CliError> {
    let contacts = match &args.contacts {
        Some(path) => {
            let text = String::from_utf8_lossy(&disk::read(path)?).into_owned();
            read_contacts(&text).map_err(|source| CliError::Contacts { path: path.clone(), source })?
        }
        None => Contacts::default(),
    };
    if let Some(path) = &args.save_contacts {
        let feet = contacts.feet.clone().unwrap_or_else(|| find_contacts(clip, source));
        let all = Contacts { feet: Some(feet), hands: contacts.hands.clone() };
        disk::write(path, write_contacts(&all).as_bytes())?;
        output.say(&format!("wrote {}", path.display()));
    }
    Ok(contacts)
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

/// What it came to, in some lines; `is_kept` tells that limits were asked for.
fn summary(report: &retarget::Report, target: &Skeleton, is_kept: bool) -> Vec<String> {
    let [unheld, worst] = [report.unheld_direction_rad, report.worst_direction_rad()].map(f64::to_degrees);
    let before = if report.unheld_direction_rad < report.worst_direction_rad() {
        format!(", {unheld:.3} before anything was held")
    } else {
        String::new()
    };
    let mut lines = vec![format!(
        "{} of {} joints driven; lengths x{:.4}; arms and legs point within {worst:.3} degrees of the source's{before}",
        report.driven[0], report.driven[1], report.scale,
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
    if !report.limits.is_empty() {
        let count = |of: &dyn Fn(&retarget::LimitUse) -> usize| report.limits.iter().map(of).sum::<usize>();
        let (before, after) = (count(&|own| own.beyond_before), count(&|own| own.beyond));
        let worst = report.limits.iter().max_by(|a, b| a.most_use.total_cmp(&b.most_use));
        let worst = worst.map_or(String::new(), |own| {
            format!("; most used {:.0} %: {}", own.most_use * 100.0, target.label(own.joint))
        });
        let told = if is_kept {
            format!("{before} joint frames beyond before, {after} after")
        } else {
            format!("{after} joint frames beyond, which is measured only (--limits keeps within)")
        };
        lines.push(format!(
            "limits {} of {} joints: {told}{worst}",
            report.limits_title,
            report.limits.len()
        ));
    }
    if let Some(largest) = &report.largest_clamp {
        lines.push(format!(
            "largest change by limits {:.2} degrees: {} at frame {}",
            largest.by_rad.to_degrees(),
            target.label(largest.joint),
            largest.frame
        ));
    }
    lines.extend(report.missed.iter().take(8).map(|missed| missed.sentence(target)));
    if report.missed.len() > 8 {
        lines.push(format!("not met: {} more", report.missed.len() - 8));
    }
    lines
}
