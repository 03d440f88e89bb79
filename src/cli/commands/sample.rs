//! `sample`: where every joint stands and turns at some times.

use std::io;

use serde_json::json;

use crate::cli::DONE;
use crate::cli::args::{PathName, SampleArgs, SampleFormat};
use crate::cli::error::CliError;
use crate::cli::input;
use crate::cli::output::Output;
use crate::clip::{Clip, RotationTrack};
use crate::rotor::{EndRates, RotationSpline, Rotor, SplineError};
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
    let splines = match args.path {
        Some(PathName::Spline) => Some(splines(clip).map_err(|(joint, source)| CliError::Argument {
            place: format!("{}: joint {}: --path spline", args.clip, clip.skeleton.label(joint)),
            expected: "keys that a smooth curve can run through".to_owned(),
            found: source.to_string(),
            advice: "mend the clip first, or use --path squad",
        })?),
        _ => None,
    };
    let poses: Vec<Vec<Place>> = times
        .chunks(TIMES_AT_ONCE)
        .flat_map(|times| poses(clip, args, splines.as_deref(), &joints, times))
        .collect();
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
        found: found.to_string(),
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
    // A hair of slack: the last frame is meant where rounding puts the end just before it.
    let last = (clip.duration_secs * rate + 1e-9).floor();
    let most = (MOST_POSES / joints.max(1)) as f64;
    if last >= most {
        let expected = format!("a rate that gives at most {most} times for {joints} joints");
        return Err(error("--rate", expected, rate, "choose a lower rate"));
    }
    Ok((0..=last as usize).map(|frame| frame as f64 / rate).collect())
}

/// A spline through the keys of each joint that has at least two.
fn splines(clip: &Clip) -> Result<Vec<Option<RotationSpline>>, (usize, SplineError)> {
    let of = |track: &RotationTrack| {
        let times: Vec<f64> = track.times.iter().collect();
        let keys: Vec<Rotor> = (0..track.keys.len()).map(|key| track.sound_key(key)).collect();
        RotationSpline::new(&times, &keys, EndRates::Secant)
    };
    (0..clip.joints.len())
        .map(|joint| match clip.rotation(joint).filter(|track| track.keys.len() > 1) {
            Some(track) => of(track).map(Some).map_err(|error| (joint, error)),
            None => Ok(None),
        })
        .collect()
}

fn poses(
    clip: &Clip,
    args: &SampleArgs,
    splines: Option<&[Option<RotationSpline>]>,
    joints: &[usize],
    times: &[f64],
) -> Vec<Vec<Place>> {
    if args.world && splines.is_none() {
        let worlds = clip.worlds_at_by(times, args.path.and_then(PathName::kind));
        let place = |joint: usize, time: usize| {
            (worlds.rotation(joint, time).to_xyzw(), worlds.position(joint, time).to_array())
        };
        return (0..times.len())
            .map(|time| joints.iter().map(|&joint| place(joint, time)).collect())
            .collect();
    }
    let mut locals = clip.locals_at_by(times, args.path.and_then(PathName::kind));
    for (local, &secs) in locals.iter_mut().zip(times) {
        for (own, spline) in local.iter_mut().zip(splines.unwrap_or_default()) {
            if let Some(spline) = spline {
                own.rotation = spline.at(secs);
            }
        }
    }
    let places = |local: &LocalPose| -> Vec<Place> {
        if args.world {
            let world = clip.skeleton.world(local);
            let place =
                |&joint: &usize| (world[joint].rotation.to_xyzw(), world[joint].position().to_array());
            return joints.iter().map(place).collect();
        }
        let place = |&joint: &usize| (local[joint].rotation.to_xyzw(), local[joint].translation.to_array());
        joints.iter().map(place).collect()
    };
    locals.iter().map(places).collect()
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
