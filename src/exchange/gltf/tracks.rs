//! Samplers to tracks: key times, key values, interpolation (glTF 2.0, section 3.11 and appendix C).

use std::collections::HashMap;
use std::rc::Rc;
use std::sync::Arc;

use glam::DVec3;

use crate::clip::{
    Keys as TrackKeys, PathKind, Paths, RotationTrack, Segments, Stored, Times, VectorPath, VectorTrack,
};
use crate::exchange::Note;
use crate::rotor::Rotor;

use super::accessor::{Accessors, Component, Wanted};
use super::channels::Part;
use super::error::GltfError;
use super::json::At;

/// Key times of an accessor.
#[derive(Debug)]
pub(super) struct KeyTimes {
    /// Seconds, strictly rising.
    pub secs: Arc<[f64]>,
    /// Which elements of the accessor were kept, where some repeat the time before them.
    pub kept: Option<Vec<usize>>,
}

/// The three interpolations.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(super) enum Interpolation {
    /// Held.
    Step,
    /// Straight, or the short arc.
    Linear,
    /// With tangents.
    CubicSpline,
}

impl Interpolation {
    /// As the standard spells it.
    pub(super) const fn name(self) -> &'static str {
        match self {
            Self::Step => "STEP",
            Self::Linear => "LINEAR",
            Self::CubicSpline => "CUBICSPLINE",
        }
    }
}

/// A decoded sampler.
#[derive(Clone, Debug)]
pub(super) enum Track {
    /// Of a rotation.
    Rotation(RotationTrack),
    /// Of a translation or scale.
    Vector(VectorTrack),
}

/// A track, and what the writer has to know of where it is from.
#[derive(Clone, Debug)]
pub(super) struct Decoded {
    /// The track.
    pub track: Track,
    /// How its values were stored.
    pub component: Component,
    /// Whether repeated times were dropped, so that its input holds more keys than the track.
    pub is_trimmed: bool,
}

/// What makes a track: input, output, interpolation, rotation or not.
type Recipe = (usize, usize, Interpolation, bool);

/// Decodes samplers. What several of them share is decoded once and shared.
pub(super) struct Tracks<'a> {
    root: At<'a>,
    accessors: Accessors<'a>,
    times: HashMap<usize, Rc<KeyTimes>>,
    decoded: HashMap<Recipe, Decoded>,
}

impl<'a> Tracks<'a> {
    /// Nothing decoded yet.
    pub(super) fn new(root: At<'a>, accessors: Accessors<'a>) -> Self {
        Self { root, accessors, times: HashMap::new(), decoded: HashMap::new() }
    }

    /// The accessors, with the buffers that were opened.
    pub(super) fn into_accessors(self) -> Accessors<'a> {
        self.accessors
    }

    /// The key times of a sampler.
    pub(super) fn times(
        &mut self,
        sampler: &At<'_>,
        notes: &mut Vec<Note>,
    ) -> Result<Rc<KeyTimes>, GltfError> {
        let input = sampler.needed_index("input", "accessors", &self.root)?;
        if let Some(times) = self.times.get(&input) {
            return Ok(Rc::clone(times));
        }
        let wanted = Wanted { kind: "SCALAR", components: 1, integers: false };
        let numbers = self.accessors.decode(input, wanted, 2 * size_of::<f64>())?.numbers;
        let times = Rc::new(rising(&numbers, &format!("accessors[{input}]"), notes)?);
        self.times.insert(input, Rc::clone(&times));
        Ok(times)
    }

    /// The track of a sampler that moves `part` of a node.
    pub(super) fn track(
        &mut self,
        sampler: &At<'_>,
        part: Part,
        notes: &mut Vec<Note>,
    ) -> Result<Decoded, GltfError> {
        let interpolation = interpolation(sampler)?;
        let input = sampler.needed_index("input", "accessors", &self.root)?;
        let output = sampler.needed_index("output", "accessors", &self.root)?;
        let recipe = (input, output, interpolation, part == Part::Rotation);
        if let Some(decoded) = self.decoded.get(&recipe) {
            return Ok(decoded.clone());
        }
        let times = self.times(sampler, notes)?;
        let n_inputs = self.accessors.count(input)?;
        let per_key = if interpolation == Interpolation::CubicSpline { 3 } else { 1 };
        let found = self.accessors.count(output)?;
        if Some(found) != n_inputs.checked_mul(per_key) {
            let expected = match per_key {
                1 => format!("{n_inputs} values, one for each key time of accessors[{input}]"),
                _ => format!(
                    "3 × {n_inputs} values, as CUBICSPLINE has for the key times of accessors[{input}]"
                ),
            };
            return Err(GltfError::unlike(format!("accessors[{output}].count"), expected, found.to_string()));
        }
        let wanted = match part {
            Part::Rotation => Wanted { kind: "VEC4", components: 4, integers: true },
            Part::Translation | Part::Scale => Wanted { kind: "VEC3", components: 3, integers: true },
        };
        // Small integers that turn a joint stay what they are: as rotors they would take up to eight times the room.
        let is_plain = per_key == 1 && times.kept.is_none();
        if part == Part::Rotation
            && is_plain
            && let Some(whole) = self.accessors.decode_whole(output, wanted)?
        {
            tell_zeros(whole.all_zero, output, notes);
            let keys = TrackKeys::of_whole(whole.numbers.as_chunks::<4>().0.into(), whole.one);
            let track = plain_track(&times, keys, interpolation);
            let is_lean = whole.one < i16::MAX && self.accessors.are_large();
            let track = Track::Rotation(if is_lean { track.lean() } else { track });
            let decoded = Decoded { track, component: whole.component, is_trimmed: false };
            self.decoded.insert(recipe, decoded.clone());
            return Ok(decoded);
        }
        // Those of cubics are there twice while keys and tangents are put apart.
        let number_bytes = if is_plain { size_of::<f64>() } else { 3 * size_of::<f64>() };
        let values = self.accessors.decode(output, wanted, number_bytes)?;
        tell_zeros(values.all_zero, output, notes);
        let keys = Keys { times: &times, per_key, components: wanted.components, numbers: &values.numbers };
        let track = match part {
            Part::Rotation if is_plain => {
                let quadruples = values.numbers.as_chunks::<4>().0;
                let keys = quadruples.iter().map(|own| Rotor::from_xyzw(*own)).collect();
                Track::Rotation(plain_track(&times, keys, interpolation))
            }
            Part::Rotation => Track::Rotation(rotation_track(&keys, interpolation)),
            Part::Translation | Part::Scale => Track::Vector(vector_track(&keys, interpolation)),
        };
        let decoded = Decoded { track, component: values.component, is_trimmed: times.kept.is_some() };
        self.decoded.insert(recipe, decoded.clone());
        Ok(decoded)
    }
}

fn tell_zeros(are_zeros: bool, output: usize, notes: &mut Vec<Note>) {
    if are_zeros {
        let text = "expected values, found an accessor without any, which stands for zeros";
        notes.push(Note::new(format!("accessors[{output}]"), text));
    }
}

fn interpolation(sampler: &At<'_>) -> Result<Interpolation, GltfError> {
    match sampler.text("interpolation")? {
        None | Some("LINEAR") => Ok(Interpolation::Linear),
        Some("STEP") => Ok(Interpolation::Step),
        Some("CUBICSPLINE") => Ok(Interpolation::CubicSpline),
        Some(other) => {
            let place = sampler.path_of("interpolation");
            Err(GltfError::unlike(place, "LINEAR, STEP or CUBICSPLINE", format!("`{other}`")))
        }
    }
}

/// Times that rise strictly. Of keys at the very same time the last is kept; a time that goes back is an error, since
/// no order of the keys can be told from it.
fn rising(numbers: &[f64], place: &str, notes: &mut Vec<Note>) -> Result<KeyTimes, GltfError> {
    for (key, &time) in numbers.iter().enumerate() {
        if !time.is_finite() {
            return Err(GltfError::unlike(place, "finite key times", format!("{time} at key {key}")));
        }
        if let Some(before) = key.checked_sub(1).map(|before| numbers[before])
            && time < before
        {
            let found = format!("{time} after {before} at key {key}");
            return Err(GltfError::unlike(place, "rising key times", found));
        }
    }
    if let Some(first) = numbers.first().filter(|first| **first < 0.0) {
        let text =
            format!("expected key times of 0 or more, found {first} first; play starts at 0 all the same");
        notes.push(Note::new(place, text));
    }
    let is_last_of_its_time = |key: &usize| numbers.get(key + 1) != Some(&numbers[*key]);
    let kept: Vec<usize> = (0..numbers.len()).filter(is_last_of_its_time).collect();
    if kept.len() == numbers.len() {
        return Ok(KeyTimes { secs: numbers.into(), kept: None });
    }
    let n_dropped = numbers.len() - kept.len();
    let text = format!(
        "expected strictly rising key times, found {n_dropped} repeated; the last key of each time is used"
    );
    notes.push(Note::new(place, text));
    Ok(KeyTimes { secs: kept.iter().map(|&key| numbers[key]).collect(), kept: Some(kept) })
}

/// The values of keys, as an output accessor has them.
struct Keys<'a> {
    times: &'a KeyTimes,
    per_key: usize,
    components: usize,
    numbers: &'a [f64],
}

impl Keys<'_> {
    /// For each key that was kept its values: one, or in-tangent, value and out-tangent.
    fn iter(&self) -> impl Iterator<Item = Vec<&[f64]>> {
        let size = self.per_key * self.components;
        (0..self.times.secs.len()).map(move |key| {
            let stored = self.times.kept.as_ref().map_or(key, |kept| kept[key]);
            self.numbers[stored * size..(stored + 1) * size].chunks_exact(self.components).collect()
        })
    }

    fn times(&self) -> Times {
        Times::Listed(Arc::clone(&self.times.secs))
    }
}

/// A track of keys without tangents.
fn plain_track(times: &KeyTimes, keys: TrackKeys, interpolation: Interpolation) -> RotationTrack {
    let path = if interpolation == Interpolation::Step { PathKind::Hold } else { PathKind::Slerp };
    RotationTrack {
        paths: Paths::Every(path),
        ..RotationTrack::from_rotors(Times::Listed(Arc::clone(&times.secs)), keys)
    }
}

fn rotation_track(keys: &Keys<'_>, interpolation: Interpolation) -> RotationTrack {
    let rotor = |xyzw: &[f64]| Rotor::from_xyzw([xyzw[0], xyzw[1], xyzw[2], xyzw[3]]);
    let path = match interpolation {
        Interpolation::Step => PathKind::Hold,
        Interpolation::Linear => PathKind::Slerp,
        Interpolation::CubicSpline => PathKind::Cubic,
    };
    let is_cubic = interpolation == Interpolation::CubicSpline;
    let middle = usize::from(is_cubic);
    RotationTrack {
        times: keys.times(),
        keys: keys.iter().map(|values| rotor(values[middle])).collect(),
        paths: Paths::Every(path),
        tangents: is_cubic.then(|| keys.iter().map(|values| [rotor(values[0]), rotor(values[2])]).collect()),
        segments: Segments::default(),
        stored: Stored::Rotors,
    }
}

fn vector_track(keys: &Keys<'_>, interpolation: Interpolation) -> VectorTrack {
    let vector = |xyz: &[f64]| DVec3::new(xyz[0], xyz[1], xyz[2]);
    let path = match interpolation {
        Interpolation::Step => VectorPath::Hold,
        Interpolation::Linear => VectorPath::Straight,
        Interpolation::CubicSpline => VectorPath::Cubic,
    };
    let is_cubic = interpolation == Interpolation::CubicSpline;
    let middle = usize::from(is_cubic);
    VectorTrack {
        times: keys.times(),
        keys: keys.iter().map(|values| vector(values[middle])).collect(),
        path,
        tangents: is_cubic
            .then(|| keys.iter().map(|values| [vector(values[0]), vector(values[2])]).collect()),
    }
}
