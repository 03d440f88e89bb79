//! `sample`: where every joint stands and turns at some times.

use std::io;
use std::path::Path;

use serde_json::json;

use crate::cli::DONE;
use crate::cli::args::{PathName, SampleArgs, SampleFormat};
use crate::cli::error::CliError;
use crate::cli::input;
use crate::cli::numbers::shown;
use crate::cli::output::Output;
use crate::clip::{Clip, PathKind};
use crate::skeleton::LocalPose;

/// The most poses that are printed: joints times times.
const MOST_POSES: usize = 50_000_000;

/// Poses that are computed together.
const TIMES_AT_ONCE: usize = 256;

/// Plays the clip as its own format says, unless another path is named.
pub(crate) fn run(args: &SampleArgs, output: &mut Output) -> Result<u8, CliError> {
    let input = input::open_one(&args.clip, &args.csv.open_options(), output)?;
    let clip = input.clip();
    let joints: Vec<usize> = clip.skeleton.listed().collect();
    let times = times(args, clip, joints.len())?;
    let path = args.path.map(PathName::kind);
    tell_faults(args, clip, path, output);
    let is_outside = |secs: &&f64| !(0.0..=clip.duration_secs + 1e-6).contains(*secs);
    if let (Some(outside), Some(_)) = (times.iter().find(is_outside), &args.at) {
        let text = format!(
            "the clip goes from 0 to {} s: at {} s its pose at the nearer end is told",
            shown(clip.duration_secs),
            shown(*outside)
        );
        output.note(Path::new(&args.clip), &text);
    }
    let poses: Vec<Vec<Place>> =
        times.chunks(TIMES_AT_ONCE).flat_map(|times| poses(clip, args.world, path, &joints, times)).collect();
    match args.format {
        SampleFormat::Json => print_json(clip, &joints, &times, &poses, output)?,
        SampleFormat::Csv => print_csv(clip, &joints, &times, &poses, output)?,
    }
    Ok(DONE)
}

/// A joint's turn as x, y, z, w, and its place.
type Place = ([f64; 4], [f64; 3]);

fn times(args: &SampleArgs, clip: &Clip, joints: usize) -> Result<Vec<f64>, CliError> {
    let error = |place: &str, expected: String, found: f64, advice| CliError::Argument {
        place: place.to_owned(),
        expected,
        found: shown(found),
        advice,
    };
    if let Some(at) = &args.at {
        return match at.iter().find(|secs| !secs.is_finite()) {
            Some(&secs) => Err(error("--at", "seconds".to_owned(), secs, "name times such as 0,0.5,1")),
            None => Ok(at.clone()),
        };
    }
    // Clap lets nothing through that has neither.
    let rate = args.rate.unwrap_or(f64::NAN);
    if !(rate.is_finite() && rate > 0.0) {
        return Err(error("--rate", "frames per second above 0".to_owned(), rate, "name a rate such as 30"));
    }
    // A hair of slack: the last frame is meant where rounding, to 32 bits in some files, puts the end just before it.
    let frames = clip.duration_secs * rate;
    let last = (frames + frames * 2.0 * f64::from(f32::EPSILON) + 1e-9).floor();
    let most = (MOST_POSES / joints.max(1)) as f64;
    if last >= most {
        let expected = format!("a rate that gives at most {most} times for {joints} joints");
        return Err(error("--rate", expected, rate, "choose a lower rate"));
    }
    Ok((0..=last as usize).map(|frame| frame as f64 / rate).collect())
}

/// Tells where no spline was found and squad stands in.
fn tell_faults(args: &SampleArgs, clip: &Clip, path: Option<PathKind>, output: &mut Output) {
    if path != Some(PathKind::Spline) {
        return;
    }
    for joint in 0..clip.joints.len() {
        let Some(track) = clip.rotation(joint).filter(|track| track.keys.len() > 1) else { continue };
        for (key, fault) in track.spline_faults(path) {
            let label = clip.skeleton.label(joint);
            let text = format!("joint {label}: squad in place of the spline from key {key} on: {fault}");
            output.note(Path::new(&args.clip), &text);
        }
    }
}

fn poses(
    clip: &Clip,
    is_world: bool,
    path: Option<PathKind>,
    joints: &[usize],
    times: &[f64],
) -> Vec<Vec<Place>> {
    if is_world {
        let worlds = clip.worlds_at_by(times, path);
        let place = |joint: usize, time: usize| {
            (worlds.rotation(joint, time).to_xyzw(), worlds.position(joint, time).to_array())
        };
        return (0..times.len())
            .map(|time| joints.iter().map(|&joint| place(joint, time)).collect())
            .collect();
    }
    let places = |local: &LocalPose| -> Vec<Place> {
        let place = |&joint: &usize| (local[joint].rotation.to_xyzw(), local[joint].translation.to_array());
        joints.iter().map(place).collect()
    };
    clip.locals_at_by(times, path).iter().map(places).collect()
}

/// One object. Joint by joint, so that no second copy of all numbers is made.
fn print_json(
    clip: &Clip,
    joints: &[usize],
    times: &[f64],
    poses: &[Vec<Place>],
    output: &mut Output,
) -> io::Result<()> {
    output.text(&format!("{{\"times\":{},\"joints\":{{", json!(times)))?;
    for (column, &joint) in joints.iter().enumerate() {
        let rotations: Vec<[f64; 4]> = poses.iter().map(|pose| pose[column].0).collect();
        let positions: Vec<[f64; 3]> = poses.iter().map(|pose| pose[column].1).collect();
        let comma = if column == 0 { "" } else { "," };
        output.text(&format!(
            "{comma}{}:{{\"rotation\":{},\"position\":{}}}",
            json!(clip.skeleton.label(joint)),
            json!(rotations),
            json!(positions)
        ))?;
    }
    output.line("}}")
}

fn print_csv(
    clip: &Clip,
    joints: &[usize],
    times: &[f64],
    poses: &[Vec<Place>],
    output: &mut Output,
) -> io::Result<()> {
    let columns = joints.iter().flat_map(|&joint| {
        let label = clip.skeleton.label(joint).to_owned();
        ["qx", "qy", "qz", "qw", "tx", "ty", "tz"]
            .into_iter()
            .map(move |part| quoted(&format!("{label}.{part}")))
    });
    let header: Vec<String> = std::iter::once("time".to_owned()).chain(columns).collect();
    output.line(header.join(","))?;
    for (secs, pose) in times.iter().zip(poses) {
        let numbers = pose.iter().flat_map(|(turn, place)| turn.iter().chain(place));
        let row: Vec<String> = std::iter::once(secs).chain(numbers).map(f64::to_string).collect();
        output.line(row.join(","))?;
    }
    Ok(())
}

/// A CSV field, in quotes where it needs them (RFC 4180).
fn quoted(field: &str) -> String {
    if field.contains([',', '"', '\n', '\r']) {
        format!("\"{}\"", field.replace('"', "\"\""))
    } else {
        field.to_owned()
    }
}
