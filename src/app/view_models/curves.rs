//! The rotation curves of one joint, before and after.

use std::f64::consts::TAU;
use std::sync::Arc;

use crate::clip::{Clip, Place, Stored};
use crate::limit::{JointLimit, SwingLimit};
use crate::rotor::{Bivector, Rotor};
use crate::snag::{Cancelled, Progress, Unwatched};

use super::curve_measure::Measure;
use super::pyramid::Pyramid;
use super::sampled::{SampleTimes, rotation_at};
use super::time_window::TimeWindow;

/// What the curves show of a joint's turns.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum CurveView {
    /// The three plane angles, carried on over whole turns.
    PlaneAngles,
    /// How far the limb tilts, and how far it turns about itself; both from the rest pose.
    SwingTwist,
    /// The numbers as the file stores them.
    FileNumbers,
    /// Degrees a second.
    TurnRate,
}

impl CurveView {
    /// All four, in the order of the tabs.
    pub const ALL: [Self; 4] = [Self::PlaneAngles, Self::SwingTwist, Self::FileNumbers, Self::TurnRate];

    /// The tab's words.
    pub const fn label(self) -> &'static str {
        match self {
            Self::PlaneAngles => "Plane angles",
            Self::SwingTwist => "Swing and twist",
            Self::FileNumbers => "File's own",
            Self::TurnRate => "Turn rate",
        }
    }

    /// What it shows, in a sentence.
    pub const fn explanation(self) -> &'static str {
        match self {
            Self::PlaneAngles => "The turn against the parent, split over the planes yz, zx and xy",
            Self::SwingTwist => "How far the limb tilts from its rest, and how far it turns about itself",
            Self::FileNumbers => {
                "The numbers as the file stores them: angles in its own order, or the four parts of a rotor"
            }
            Self::TurnRate => "How fast the joint turns, in degrees a second",
        }
    }
}

/// One curve.
#[derive(Clone, Debug, PartialEq)]
pub struct CurveLine {
    /// Its name, beside its dash and colour.
    pub name: String,
    /// Which of the plane colours and dashes it takes: 0 yz, 1 zx, 2 xy, 3 neutral.
    pub color: usize,
    /// The source.
    pub before: Pyramid,
    /// The result, where it differs.
    pub after: Option<Pyramid>,
}

impl CurveLine {
    /// The result, or the source where they are the same.
    pub fn shown(&self) -> &Pyramid {
        self.after.as_ref().unwrap_or(&self.before)
    }
}

/// What a set of curves hangs on beside the clips.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CurveKey {
    /// Which joint.
    pub joint: usize,
    /// Which view.
    pub view: CurveView,
    /// What it is held against.
    pub limit: Option<JointLimit>,
}

/// How far one of the curves may go.
#[derive(Clone, Debug, PartialEq)]
pub struct LimitBand {
    /// Which curve.
    pub line: usize,
    /// The lowest value, where there is one.
    pub low: Option<f64>,
    /// The highest value.
    pub high: Ceiling,
}

/// The highest value that a curve may take.
#[derive(Clone, Debug, PartialEq)]
pub enum Ceiling {
    /// The same all the time.
    Level(f64),
    /// Another one from moment to moment: how far a limb may tilt hangs on the direction it tilts to.
    Moving(Pyramid),
}

/// All curves of one joint in one view.
#[derive(Clone, Debug, PartialEq)]
pub struct CurveSet {
    /// Which joint.
    pub joint: usize,
    /// Which view.
    pub view: CurveView,
    /// How far the joint may go.
    pub bands: Vec<LimitBand>,
    /// Where the samples lie in time.
    pub times: SampleTimes,
    /// The curves.
    pub lines: Vec<CurveLine>,
    /// Written behind numbers: `°`, `°/s`, or nothing for the parts of a rotor.
    pub unit: &'static str,
}

impl CurveSet {
    /// Smallest and largest value of all curves within a stretch of time.
    pub fn range(&self, start_secs: f64, end_secs: f64) -> Option<[f32; 2]> {
        let first = self.times.place(start_secs).floor() as usize;
        let last = self.times.place(end_secs).ceil() as usize + 1;
        let rows = self.lines.iter().flat_map(|line| [Some(&line.before), line.after.as_ref()]).flatten();
        rows.filter_map(|row| row.min_max(first..last))
            .reduce(|[low, high], [other_low, other_high]| [low.min(other_low), high.max(other_high)])
    }

    /// The first three numbers shown of the result at a time; what there are fewer of is 0.
    pub fn shown_at(&self, secs: f64) -> Option<[f64; 3]> {
        let mut numbers = [0.0; 3];
        for (number, line) in numbers.iter_mut().zip(&self.lines) {
            *number = self.times.value(line.shown().values(), secs).filter(|value| value.is_finite())?;
        }
        Some(numbers)
    }
}

/// The lowest and the highest value that show all curves within a stretch of time, with some air.
pub fn fitted_values(sets: &[Arc<CurveSet>], window: TimeWindow) -> Option<[f64; 2]> {
    let unit = sets.first()?.unit;
    let ranges = sets.iter().filter_map(|set| set.range(window.start_secs, window.end_secs));
    let both = |[low, high]: [f32; 2], [own_low, own_high]: [f32; 2]| [low.min(own_low), high.max(own_high)];
    let [low, high] = ranges.reduce(both).unwrap_or([-1.0, 1.0]).map(f64::from);
    // Noise on a joint that stands still must not look like motion.
    let least = if unit.is_empty() { 0.05 } else { 6.0 };
    if unit == "°/s" {
        // A rate is never below zero: its axis stands on the ground.
        let top = high.max(least);
        return Some([-0.05 * top, 1.1 * top]);
    }
    let (span, middle) = ((high - low).max(least), f64::midpoint(low, high));
    Some([middle - span * 0.56, middle + span * 0.56])
}

/// Rows of numbers with their names and colours.
type Rows = Vec<(String, usize, Vec<f32>)>;

/// Samples the curves of a joint in `source` and in `result`.
///
/// # Errors
/// When it is told to stop.
pub fn curve_set(
    source: &Clip,
    result: &Clip,
    key: &CurveKey,
    progress: &dyn Progress,
) -> Result<CurveSet, Cancelled> {
    // A blend goes on beyond the source, or ends before it.
    let longer = if result.duration_secs > source.duration_secs { result } else { source };
    let times = SampleTimes::new(&longer.grid);
    let all: Vec<f64> = (0..times.len()).map(|index| times.time(index)).collect();
    let (mut before, unit) = rows(source, key, &all, None, progress)?;
    let is_same = source.same_joint(result, key.joint);
    let mut after = if is_same { None } else { Some(rows(result, key, &all, None, progress)?.0) };
    if let Some(after) = &mut after {
        end(&mut before, &all, source);
        end(after, &all, result);
    }
    let mut after = after.map(Vec::into_iter);
    let lines = before
        .into_iter()
        .map(|(name, color, values)| {
            let own_after =
                after.as_mut().and_then(Iterator::next).map(|(_, _, values)| Pyramid::new(values));
            CurveLine { name, color, before: Pyramid::new(values), after: own_after }
        })
        .collect();
    let bands = bands(result, key, &all);
    Ok(CurveSet { joint: key.joint, view: key.view, bands, times, lines, unit })
}

/// Takes out what lies beyond a clip's end, where its last pose would be held.
fn end(rows: &mut Rows, times: &[f64], clip: &Clip) {
    let beyond = times.partition_point(|&secs| secs <= clip.duration_secs + 0.25 / clip.grid.rate.max(1.0));
    for (_, _, row) in rows {
        if let Some(beyond) = row.get_mut(beyond..) {
            beyond.fill(f32::NAN);
        }
    }
}

/// The rows of `clip` alone at some times, going on from the numbers `start` on the left.
pub(super) fn rows_between(
    clip: &Clip,
    key: &CurveKey,
    times: &[f64],
    start: Option<[f64; 3]>,
) -> Vec<Vec<f32>> {
    // Nobody tells it to stop.
    let found = rows(clip, key, times, start, &Unwatched);
    found.map(|(rows, _)| rows.into_iter().map(|(_, _, row)| row).collect()).unwrap_or_default()
}

fn rows(
    clip: &Clip,
    key: &CurveKey,
    times: &[f64],
    start: Option<[f64; 3]>,
    progress: &dyn Progress,
) -> Result<(Rows, &'static str), Cancelled> {
    let named = |names: [&str; 3], columns: [Vec<f32>; 3]| {
        names
            .into_iter()
            .zip(columns)
            .enumerate()
            .map(|(color, (name, row))| (name.to_owned(), color, row))
            .collect()
    };
    if key.view == CurveView::FileNumbers {
        return Ok(file_numbers(clip, key.joint, times));
    }
    let track = clip.rotation(key.joint).filter(|track| !track.times.is_empty());
    let mut rotors = Vec::with_capacity(times.len());
    for some in times.chunks(1 << 15) {
        if !progress.report(rotors.len(), times.len()) {
            return Err(Cancelled);
        }
        match track {
            Some(track) => rotors.extend(track.at_all(some)),
            None => rotors.extend(some.iter().map(|&secs| rotation_at(clip, key.joint, secs))),
        }
    }
    Ok(match key.view {
        CurveView::PlaneAngles | CurveView::FileNumbers => {
            (named(["yz", "zx", "xy"], columns(&unrolled_from(&rotors, start))), "°")
        }
        CurveView::SwingTwist => {
            let measure = Measure::new(clip, key.joint, key.view, key.limit);
            let (mut swing, mut twist) = (Vec::new(), Vec::new());
            let mut last_twist = start.map_or(0.0, |[_, twist, _]| twist.to_radians());
            for &rotor in &rotors {
                let split = measure.split(rotor);
                swing.push(split.swing_rad().to_degrees() as f32);
                last_twist = split.twist_rad + TAU * ((last_twist - split.twist_rad) / TAU).round();
                twist.push(last_twist.to_degrees() as f32);
            }
            (vec![("swing".to_owned(), 1, swing), ("twist".to_owned(), 0, twist)], "°")
        }
        CurveView::TurnRate => {
            let mut rates = vec![0.0; rotors.len()];
            for index in 1..rotors.len() {
                let secs = times[index] - times[index - 1];
                rates[index] = (rotors[index - 1].turn_to(rotors[index]) / secs).to_degrees() as f32;
            }
            if let [first, second, ..] = rates.as_mut_slice() {
                *first = *second;
            }
            (vec![("turn rate".to_owned(), 3, rates)], "°/s")
        }
    })
}

/// How far the joint may go: in swing and twist, which is what limits speak of.
fn bands(clip: &Clip, key: &CurveKey, times: &[f64]) -> Vec<LimitBand> {
    let (CurveView::SwingTwist, Some(limit)) = (key.view, key.limit) else { return Vec::new() };
    let mut bands = Vec::new();
    let measure = Measure::new(clip, key.joint, key.view, key.limit);
    let most = |secs: f64| {
        let split = measure.split(rotation_at(clip, key.joint, secs));
        measure.most_swing_rad(&split).map_or(f32::NAN, |rad| rad.to_degrees() as f32)
    };
    let ceiling = match limit.limit.swing {
        SwingLimit::Cone { half_rad } => Ceiling::Level(half_rad.to_degrees()),
        SwingLimit::Ellipse { .. } | SwingLimit::Hinge { .. } => {
            Ceiling::Moving(Pyramid::new(times.iter().map(|&secs| most(secs)).collect()))
        }
    };
    bands.push(LimitBand { line: 0, low: None, high: ceiling });
    if !limit.limit.twist.is_free() {
        let [low, high] = limit.limit.twist.to_degrees();
        bands.push(LimitBand { line: 1, low: Some(low), high: Ceiling::Level(high) });
    }
    bands
}

/// Plane angles in degrees that run on over any number of whole turns: of all triples that mean the turn, the one
/// nearest to that of the sample before.
fn unrolled_from(rotors: &[Rotor], start: Option<[f64; 3]>) -> Vec<[f64; 3]> {
    let mut last = start.map_or(Bivector::ZERO, Bivector::from_degrees);
    rotors
        .iter()
        .map(|rotor| {
            let short = rotor.plane_angles();
            let turn = short.length();
            // Near no turn at all any plane will do: the one of the sample before keeps the curve whole.
            let plane = if turn > 1e-6 { short / turn } else { last.normalize_or_zero() };
            let along = last.dot(plane);
            let turns = ((along - turn) / TAU).round();
            last = short + plane * (turns * TAU);
            last.to_degrees()
        })
        .collect()
}

fn columns(triples: &[[f64; 3]]) -> [Vec<f32>; 3] {
    [0, 1, 2].map(|part| triples.iter().map(|triple| triple[part] as f32).collect())
}

/// The stored numbers on straight lines between the keys, since the numbers, not the poses, are what is looked at.
fn file_numbers(clip: &Clip, joint: usize, times: &[f64]) -> (Rows, &'static str) {
    let Some(track) = clip.rotation(joint).filter(|track| !track.times.is_empty()) else {
        return (Vec::new(), "°");
    };
    let sample = |number: &dyn Fn(usize) -> f64| -> Vec<f32> {
        times
            .iter()
            .map(|&secs| match track.times.place(secs) {
                None => f32::NAN,
                Some(Place::At(key)) => number(key) as f32,
                Some(Place::Between(key, share)) => {
                    (number(key) + (number(key + 1) - number(key)) * share) as f32
                }
            })
            .collect()
    };
    match &track.stored {
        Stored::Angles(angles) => {
            let axes = angles.axes.iter().enumerate();
            let rows = axes.map(|(place, axis)| {
                let name = format!("{} ({})", axis.letter(), ["1st", "2nd", "3rd"][place.min(2)]);
                (name, axis.index(), sample(&|key| angles.degrees[key][place]))
            });
            (rows.collect(), "°")
        }
        Stored::PlaneAngles(degrees) => {
            let rows = ["yz", "zx", "xy"].into_iter().enumerate();
            let rows = rows.map(|(part, name)| (name.to_owned(), part, sample(&|key| degrees[key][part])));
            (rows.collect(), "°")
        }
        Stored::Rotors => {
            let part = |name: &str, color: usize, of: &dyn Fn(Rotor) -> f64| {
                (name.to_owned(), color, sample(&|key| of(track.keys[key])))
            };
            let rows = vec![
                part("s", 3, &|rotor| rotor.s),
                part("yz", 0, &|rotor| rotor.yz),
                part("zx", 1, &|rotor| rotor.zx),
                part("xy", 2, &|rotor| rotor.xy),
            ];
            (rows, "")
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn plane_angles_run_on_over_whole_turns() {
        let rotors: Vec<Rotor> = (0..=80)
            .map(|i| Rotor::from_plane_angles(Bivector::from_degrees([0.0, 0.0, f64::from(i) * 10.0])))
            .collect();
        let angles = unrolled_from(&rotors, None);
        for (i, triple) in angles.iter().enumerate() {
            assert!((triple[2] - i as f64 * 10.0).abs() < 1e-6, "{i}: {triple:?}");
        }
    }

    #[test]
    fn a_sign_change_of_the_rotor_leaves_the_plane_angles() {
        let rotor = Rotor::from_plane_angles(Bivector::from_degrees([10.0, 170.0, -20.0]));
        let angles = unrolled_from(&[rotor, -rotor], None);
        assert!((0..3).all(|part| (angles[0][part] - angles[1][part]).abs() < 1e-9), "{angles:?}");
    }
}
