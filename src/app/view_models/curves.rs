//! The rotation curves of one joint, before and after.

use std::f64::consts::TAU;

use crate::clip::{Clip, Place, Stored};
use crate::rotor::{Bivector, Rotor, SwingTwist};
use crate::snag::{Cancelled, Progress};

use super::pyramid::Pyramid;
use super::sampled::{SampleTimes, limb_direction, rotation_at};

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

/// All curves of one joint in one view.
#[derive(Clone, Debug, PartialEq)]
pub struct CurveSet {
    /// Which joint.
    pub joint: usize,
    /// Which view.
    pub view: CurveView,
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
    joint: usize,
    view: CurveView,
    progress: &dyn Progress,
) -> Result<CurveSet, Cancelled> {
    let times = SampleTimes::new(&source.grid);
    let (before, unit) = rows(source, joint, view, &times, progress)?;
    let after = if source.same_joint(result, joint) {
        None
    } else {
        Some(rows(result, joint, view, &times, progress)?.0)
    };
    let mut after = after.map(Vec::into_iter);
    let lines = before
        .into_iter()
        .map(|(name, color, values)| {
            let own_after =
                after.as_mut().and_then(Iterator::next).map(|(_, _, values)| Pyramid::new(values));
            CurveLine { name, color, before: Pyramid::new(values), after: own_after }
        })
        .collect();
    Ok(CurveSet { joint, view, times, lines, unit })
}

fn rows(
    clip: &Clip,
    joint: usize,
    view: CurveView,
    times: &SampleTimes,
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
    if view == CurveView::FileNumbers {
        return Ok(file_numbers(clip, joint, times));
    }
    let mut rotors = Vec::with_capacity(times.len());
    for index in 0..times.len() {
        if index % 4096 == 0 && !progress.report(index, times.len()) {
            return Err(Cancelled);
        }
        rotors.push(rotation_at(clip, joint, times.time(index)));
    }
    Ok(match view {
        CurveView::PlaneAngles | CurveView::FileNumbers => {
            (named(["yz", "zx", "xy"], columns(&unrolled(&rotors))), "°")
        }
        CurveView::SwingTwist => {
            let axis = limb_direction(clip, joint);
            let rest = clip.skeleton.chosen_rest(joint).rotation.reverse();
            let (mut swing, mut twist) = (Vec::new(), Vec::new());
            let mut last_twist = 0.0;
            for &rotor in &rotors {
                let split = SwingTwist::new(rest * rotor, axis);
                swing.push(split.swing_rad().to_degrees() as f32);
                last_twist = split.twist_rad + TAU * ((last_twist - split.twist_rad) / TAU).round();
                twist.push(last_twist.to_degrees() as f32);
            }
            (vec![("swing".to_owned(), 1, swing), ("twist".to_owned(), 0, twist)], "°")
        }
        CurveView::TurnRate => {
            let mut rates = vec![0.0; rotors.len()];
            for index in 1..rotors.len() {
                let secs = times.time(index) - times.time(index - 1);
                rates[index] = (rotors[index - 1].turn_to(rotors[index]) / secs).to_degrees() as f32;
            }
            if let [first, second, ..] = rates.as_mut_slice() {
                *first = *second;
            }
            (vec![("turn rate".to_owned(), 3, rates)], "°/s")
        }
    })
}

/// Plane angles in degrees that run on over any number of whole turns: of all triples that mean the turn, the one
/// nearest to that of the sample before.
fn unrolled(rotors: &[Rotor]) -> Vec<[f64; 3]> {
    let mut last = Bivector::ZERO;
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
fn file_numbers(clip: &Clip, joint: usize, times: &SampleTimes) -> (Rows, &'static str) {
    let Some(track) = clip.rotation(joint).filter(|track| !track.times.is_empty()) else {
        return (Vec::new(), "°");
    };
    let sample = |number: &dyn Fn(usize) -> f64| -> Vec<f32> {
        (0..times.len())
            .map(|index| match track.times.place(times.time(index)) {
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
        let angles = unrolled(&rotors);
        for (i, triple) in angles.iter().enumerate() {
            assert!((triple[2] - i as f64 * 10.0).abs() < 1e-6, "{i}: {triple:?}");
        }
    }

    #[test]
    fn a_sign_change_of_the_rotor_leaves_the_plane_angles() {
        let rotor = Rotor::from_plane_angles(Bivector::from_degrees([10.0, 170.0, -20.0]));
        let angles = unrolled(&[rotor, -rotor]);
        assert!((0..3).all(|part| (angles[0][part] - angles[1][part]).abs() < 1e-9), "{angles:?}");
    }
}
