//! Mixing: between two clips by a weight, frame by frame or with their steps in time.

use std::borrow::Cow;
use std::cmp::Ordering;
use std::collections::BTreeSet;
use std::sync::Arc;

use glam::DVec3;

use crate::clip::{self, Clip, Times};
use crate::rotor::Rotor;
use crate::rotor::batch::{self, Level, Streams};
use crate::skeleton::smooth_step;

use super::feet;
use super::frames::{self, Kept, Row, SLACK};
use super::ground::{GroundMove, frame_above, tops};
use super::registration::Registration;
use super::root::{RootFrom, onto_one_way, summed_way};
use super::{BlendError, Mask};

/// A weight over time: knots `[secs, weight]` of the first clip, in order, with smooth monotone pieces between
/// and the end values held outside. One knot is a constant.
#[derive(Clone, Debug, PartialEq)]
pub struct MixAlong {
    /// The knots.
    pub knots: Vec<[f64; 2]>,
}

impl MixAlong {
    /// The same weight all along.
    pub fn constant(weight: f64) -> Self {
        Self { knots: vec![[0.0, weight]] }
    }

    /// The weight at a time.
    pub fn at(&self, secs: f64) -> f64 {
        let after = self.knots.partition_point(|knot| knot[0] <= secs);
        match (after.checked_sub(1).map(|before| self.knots[before]), self.knots.get(after)) {
            (Some([from, a]), Some(&[to, b])) => {
                let share = smooth_step((secs - from) / (to - from));
                if a == b { a } else { a * (1.0 - share) + b * share }
            }
            (Some([_, only]), None) => only,
            (None, Some(&[_, first])) => first,
            (None, None) => 0.0,
        }
    }

    /// The one weight, where it is the same all along.
    pub fn only(&self) -> Option<f64> {
        let first = self.knots.first().map_or(0.0, |knot| knot[1]);
        self.knots.iter().all(|knot| knot[1] == first).then_some(first)
    }

    fn check(&self) -> Result<(), BlendError> {
        let is_late = |pair: &[[f64; 2]]| pair[1][0].partial_cmp(&pair[0][0]).is_none_or(Ordering::is_le);
        if let Some(pair) = self.knots.windows(2).find(|pair| is_late(pair)) {
            return Err(BlendError::Knots { found: format!("{} after {}", pair[1][0], pair[0][0]) });
        }
        if self.knots.is_empty() {
            return Err(BlendError::Knots { found: "none".to_owned() });
        }
        match self.knots.iter().find(|knot| !(0.0..=1.0).contains(&knot[1])) {
            Some(knot) => Err(BlendError::Weight { expected: "from 0 to 1", found: knot[1] }),
            None => Ok(()),
        }
    }
}

/// `a` and `b` mixed frame by frame at `a`'s frames up to the shorter end: each joint turns to the slerp on the near
/// side, `slerp(a, b, weight · factor)`, places and sizes move on straight lines, the root included.
///
/// Where the weight is 0 the numbers are `a`'s, bit for bit; where it is 1 the turns are `b`'s as its format plays
/// them. Both clips have the same skeleton.
///
/// # Errors
/// When a weight is not within 0 and 1 or a clip has no frames.
pub fn mix(a: &Clip, b: &Clip, weight: &MixAlong, mask: &Mask) -> Result<Clip, BlendError> {
    mix_on_ground(a, b, weight, mask, &|_, _, _| None)
}

/// As [`mix()`], with more said of how: whose way over the ground is taken, and whether feet are held.
///
/// Where the first clip's way is taken the second is set down at its place and turned to its heading at each frame, and the other way
/// round, whatever the mask says of the root. With a weight of 0 all along the result is `a`, whoever's way was asked for.
///
/// Where feet are held and the weight changes, the way of both is summed from the steps of both, as in [`mix_aligned`]: the mean of
/// two places would drag the body from one to the other over feet that stand.
///
/// # Errors
/// As for [`mix()`].
pub fn mix_by(a: &Clip, b: &Clip, how: &MixHow) -> Result<Clip, BlendError> {
    let MixHow { weight, mask, root, holds_feet } = how;
    let is_summed = *holds_feet && *root == RootFrom::Both && weight.only().is_none();
    let mixed = mix_on_ground(a, b, weight, mask, &|base, times, weights| {
        if !is_summed {
            return onto_one_way(base, b, times, *root);
        }
        let factor = tops_of(a, b).first().map_or(1.0, |&top| mask.of(top));
        let shares: Vec<f64> = weights.iter().map(|weight| weight * factor).collect();
        Some(summed_way(base, b, times, &shares))
    })?;
    if !holds_feet {
        return Ok(mixed);
    }
    let secs: Vec<f64> = mixed.grid.times.iter().collect();
    let weights: Vec<f64> = secs.iter().map(|&secs| weight.at(secs)).collect();
    Ok(feet::held_of_two(mixed, [a, b], [&secs, &secs], &weights, mask))
}

/// The moves that set down both clips' poses at some times, for the second one's weights there; `None` where they stay.
type Ground<'a> = &'a dyn Fn(&Clip, &[f64], &[f64]) -> Option<Vec<[GroundMove; 2]>>;

fn mix_on_ground(
    a: &Clip,
    b: &Clip,
    weight: &MixAlong,
    mask: &Mask,
    ground: Ground<'_>,
) -> Result<Clip, BlendError> {
    weight.check()?;
    frames::check_frames(a)?;
    frames::check_frames(b)?;
    let end = a.duration_secs.min(b.duration_secs);
    let is_shorter = end < a.duration_secs - SLACK / a.grid.rate;
    let base = if is_shorter { clip::cut(a, 0.0, end) } else { a.clone() };
    let times: Vec<f64> = base.grid.times.iter().collect();
    let weights: Vec<f64> = times.iter().map(|&secs| weight.at(secs)).collect();
    if weights.iter().all(|&weight| weight == 0.0) {
        return Ok(base);
    }
    let ground = ground(&base, &times, &weights);
    let tops = if ground.is_some() { tops_of(a, b) } else { BTreeSet::new() };
    let joints = (0..base.joints.len()).map(|joint| {
        let factor = mask.of(joint);
        let [turns, moves, sizes] = said(&base, b, joint);
        let is_same = Arc::ptr_eq(&a.joints[joint], &b.joints[joint]);
        let onto = ground.as_ref().filter(|_| tops.contains(&joint));
        // Whether the first clip's own numbers go elsewhere at a frame, or at any.
        let is_moved = |frame: usize| onto.is_some_and(|moves| moves[frame][0] != GroundMove::default());
        let is_led = (0..times.len()).any(is_moved);
        if (factor == 0.0 && !is_led) || is_same || !(turns || moves || sizes || is_led) {
            return base.joints[joint].clone();
        }
        let shares = shares(&weights, factor);
        let is_set_down = onto.is_some();
        let mut both_turns =
            (turns || is_set_down).then(|| [&base, b].map(|clip| clip.rotations_at(joint, &times)));
        let mut both_places =
            (moves || is_set_down).then(|| [&base, b].map(|clip| frames::places(clip, joint, &times)));
        if let (Some(onto), Some(turns), Some(places)) = (onto, &mut both_turns, &mut both_places) {
            let (above, still) = (frame_above(a, joint), GroundMove::default());
            for (clip, (turns, places)) in turns.iter_mut().zip(places).enumerate() {
                for (frame, moves) in onto.iter().enumerate().filter(|(_, moves)| moves[clip] != still) {
                    (turns[frame], places[frame]) = set_down(moves[clip], above, turns[frame], places[frame]);
                }
            }
        }
        let row = Row {
            rotations: both_turns.map(|[own, other]| between(&own, &other, &shares)),
            translations: both_places.map(|[own, other]| lines(&own, &other, &shares)),
            scales: sizes.then(|| {
                lines(&frames::sizes(&base, joint, &times), &frames::sizes(b, joint, &times), &shares)
            }),
        };
        // Where keys stand on frames, the ones that nothing is mixed into keep their numbers.
        let on_frames = base.rotation(joint).is_none_or(|track| track.times == base.grid.times);
        let kept = |frame: usize| (shares[frame] == 0.0 && !is_moved(frame)).then_some(frame);
        let kept: Kept<'_> = if on_frames && shares.contains(&0.0) { Some(&kept) } else { None };
        Arc::new(frames::tracks(&base.joints[joint], &base.grid.times, row, kept))
    });
    let joints = joints.collect();
    Ok(frames::clip_of(&base, base.grid.times.clone(), joints))
}

/// What either clip says of a joint.
pub(super) fn said(a: &Clip, b: &Clip, joint: usize) -> [bool; 3] {
    let (own, other) = (frames::says(a, joint), frames::says(b, joint));
    let (rest, their_rest) = (a.skeleton.joints()[joint].rest, b.skeleton.joints()[joint].rest);
    [
        own[0] || other[0] || rest.rotation != their_rest.rotation,
        own[1] || other[1] || rest.translation != their_rest.translation,
        own[2] || other[2] || rest.scale != their_rest.scale,
    ]
}

/// So much of each weight.
pub(super) fn shares(weights: &[f64], factor: f64) -> Cow<'_, [f64]> {
    if factor == 1.0 {
        return Cow::Borrowed(weights);
    }
    Cow::Owned(weights.iter().map(|weight| weight * factor).collect())
}

/// The short way between turns; the ends are exact, and so is what is equal.
pub(super) fn between(a: &[Rotor], b: &[Rotor], shares: &[f64]) -> Vec<Rotor> {
    /// Rows of a round: what is in work stays in the first cache.
    const TILE: usize = 256;
    let [mut from, mut to, mut out]: [Streams<f64, 4>; 3] = std::array::from_fn(|_| Streams::zeros(TILE));
    let mut found = Vec::with_capacity(a.len());
    for ((a, b), shares) in a.chunks(TILE).zip(b.chunks(TILE)).zip(shares.chunks(TILE)) {
        let count = a.len().min(b.len()).min(shares.len());
        for (streams, rotors) in [(&mut from, a), (&mut to, b)] {
            let [s, yz, zx, xy] = streams.parts_mut().map(|part| &mut part[..count]);
            let parts = s.iter_mut().zip(yz).zip(zx.iter_mut().zip(xy));
            for (rotor, ((s, yz), (zx, xy))) in rotors.iter().zip(parts) {
                (*s, *yz, *zx, *xy) = (rotor.s, rotor.yz, rotor.zx, rotor.xy);
            }
        }
        batch::slerp(
            Level::best(),
            from.parts().map(|part| &part[..count]),
            to.parts().map(|part| &part[..count]),
            &shares[..count],
            out.parts_mut().map(|part| &mut part[..count]),
        );
        let [s, yz, zx, xy] = out.parts().map(|part| &part[..count]);
        let made = s.iter().zip(yz).zip(zx.iter().zip(xy)).zip(shares).zip(a.iter().zip(b));
        found.extend(made.map(|((((&s, &yz), (&zx, &xy)), &share), (&a, &b))| {
            if share == 0.0 || a == b {
                a
            } else if share == 1.0 {
                b
            } else {
                Rotor::new(s, yz, zx, xy)
            }
        }));
    }
    found
}

pub(super) fn lines(a: &[DVec3], b: &[DVec3], shares: &[f64]) -> Vec<DVec3> {
    let one = |((&a, &b), &share): ((&DVec3, &DVec3), &f64)| {
        if share == 0.0 {
            a
        } else if share == 1.0 {
            b
        } else {
            // What is equal stays so to the last bit.
            a + (b - a) * share
        }
    };
    a.iter().zip(b).zip(shares).map(one).collect()
}

/// How two clips are mixed, frame by frame or in step.
#[derive(Clone, Debug, PartialEq)]
pub struct MixHow {
    /// The second clip's weight over the first's time.
    pub weight: MixAlong,
    /// Factors for joints.
    pub mask: Mask,
    /// Whose way over the ground is taken.
    pub root: RootFrom,
    /// Whether feet that stand in both clips, or in the weightier one, are held where they stand in the mix: from where the clips that have
    /// a foot on the ground weigh more than half together. Frames that are one clip's alone change only where a foot stands on from
    /// them into mixed ones, and for 0.15 s beside such a stand.
    pub holds_feet: bool,
}

/// `a` and `b` mixed with their steps in time: both are sampled where `along` says that they belong together, `b` is turned to
/// `a`'s heading there, and the paces blend too, so the mix of a walk and a run of different lengths has a length between.
///
/// The path on the ground goes on from `a`'s first place: at each frame it moves by what both move, by the weight, each in
/// its own heading (Kovar & Gleicher 2003). Weight 0 is `a`, bit for bit; weight 1 is `b` set down at `a`'s place.
///
/// # Errors
/// When a weight is not within 0 and 1 or a clip has no frames.
pub fn mix_aligned(a: &Clip, b: &Clip, along: &Registration, how: &MixHow) -> Result<Clip, BlendError> {
    frames::check_frames(a)?;
    frames::check_frames(b)?;
    let MixHow { weight, mask, root, holds_feet } = how;
    weight.check()?;
    if weight.only() == Some(0.0) {
        return Ok(a.clone());
    }
    let stops = along.stops(weight, a.grid.rate);
    let times = Times::Even { step_secs: 1.0 / a.grid.rate, count: stops.len() };
    let [own_secs, other_secs]: [Vec<f64>; 2] = [
        stops.iter().map(|stop| stop.first_secs).collect(),
        stops.iter().map(|stop| stop.second_secs).collect(),
    ];
    let weights: Vec<f64> = own_secs.iter().map(|&secs| weight.at(secs)).collect();
    let tops = tops_of(a, b);
    let centre = centre(a);
    let ground_weight = |frame: usize| match root {
        RootFrom::Both => weights[frame] * tops.first().map_or(1.0, |&top| mask.of(top)),
        RootFrom::First => 0.0,
        RootFrom::Second => 1.0,
    };
    let [own_path, other_path] =
        [(a, &own_secs), (b, &other_secs)].map(|(clip, secs)| path_of(clip, centre, secs));
    let moves = ground_moves(&own_path, &other_path, &stops, &ground_weight);
    let joints = (0..a.joints.len()).map(|joint| {
        let factor = mask.of(joint);
        let shares = shares(&weights, factor);
        let [turns, places, sizes] = said(a, b, joint);
        let is_top = tops.contains(&joint);
        if !(turns || places || sizes || is_top) {
            return a.joints[joint].clone();
        }
        let mut own_turns = a.rotations_at(joint, &own_secs);
        let mut other_turns = b.rotations_at(joint, &other_secs);
        let mut own_places = frames::places(a, joint, &own_secs);
        let mut other_places = frames::places(b, joint, &other_secs);
        if is_top {
            let above = frame_above(a, joint);
            for (frame, [own, other]) in moves.iter().enumerate() {
                (own_turns[frame], own_places[frame]) =
                    set_down(*own, above, own_turns[frame], own_places[frame]);
                (other_turns[frame], other_places[frame]) =
                    set_down(*other, above, other_turns[frame], other_places[frame]);
            }
        }
        let row = Row {
            rotations: (turns || is_top).then(|| between(&own_turns, &other_turns, &shares)),
            translations: (places || is_top).then(|| lines(&own_places, &other_places, &shares)),
            scales: sizes.then(|| {
                lines(&frames::sizes(a, joint, &own_secs), &frames::sizes(b, joint, &other_secs), &shares)
            }),
        };
        Arc::new(frames::tracks(&a.joints[joint], &times, row, None))
    });
    let joints = joints.collect();
    let mixed = frames::clip_of(a, times.clone(), joints);
    if !holds_feet {
        return Ok(mixed);
    }
    Ok(feet::held_of_two(mixed, [a, b], [&own_secs, &other_secs], &weights, mask))
}

/// The joints that carry the whole motion of either clip.
fn tops_of(a: &Clip, b: &Clip) -> BTreeSet<usize> {
    tops(a).into_iter().chain(tops(b)).collect()
}

/// A top joint's local turn and place after a move of the scene.
pub(super) fn set_down(
    place: GroundMove,
    (turn_above, scene_from_above): (Rotor, glam::DAffine3),
    turn: Rotor,
    at: DVec3,
) -> (Rotor, DVec3) {
    let turned = turn_above.reverse() * place.rotor() * turn_above * turn;
    let moved = place.apply(scene_from_above.transform_point3(at));
    (turned, scene_from_above.inverse().transform_point3(moved))
}

/// The joint whose place counts as the body's: the first with more than one joint below it, else the first top.
pub(super) fn centre(clip: &Clip) -> usize {
    let skeleton = &clip.skeleton;
    let below = |joint: usize| {
        let mut count = 0;
        let mut open = vec![joint];
        while let Some(next) = open.pop() {
            count += 1;
            open.extend(skeleton.children(next));
        }
        count
    };
    let Some(top) = tops(clip).into_iter().max_by_key(|&top| (below(top), usize::MAX - top)) else {
        return 0;
    };
    let mut at = top;
    while let [only] = skeleton.children(at) {
        at = *only;
    }
    if skeleton.children(at).is_empty() { top } else { at }
}

/// Where the body's centre stands at each time.
pub(super) fn path_of(clip: &Clip, centre: usize, secs: &[f64]) -> Vec<DVec3> {
    const ROWS: usize = 256;
    let chunk = |part: &[f64]| {
        let worlds = clip.worlds_at(part);
        (0..part.len()).map(|time| worlds.position(centre, time)).collect::<Vec<DVec3>>()
    };
    secs.chunks(ROWS).flat_map(chunk).collect()
}

/// For each frame the moves that set down the first clip's pose and the second's.
pub(super) fn ground_moves(
    own: &[DVec3],
    other: &[DVec3],
    stops: &[super::registration::Stop],
    weight: &dyn Fn(usize) -> f64,
) -> Vec<[GroundMove; 2]> {
    let mut at = own.first().copied().unwrap_or_default();
    // How far the result's heading has left the first clip's.
    let mut drift = 0.0;
    let mut moves = Vec::with_capacity(stops.len());
    for frame in 0..stops.len() {
        if frame > 0 {
            let share = weight(frame - 1);
            let turned = |turn_rad: f64, step: DVec3| GroundMove { turn_rad, x: 0.0, z: 0.0 }.apply(step);
            let theirs = turned(stops[frame - 1].turn_rad, other[frame] - other[frame - 1]);
            at += turned(drift, (own[frame] - own[frame - 1]) * (1.0 - share) + theirs * share);
            drift -= share * (stops[frame].turn_rad - stops[frame - 1].turn_rad);
        }
        let place = |turn_rad: f64, from: DVec3| {
            let turned = GroundMove { turn_rad, x: 0.0, z: 0.0 }.apply(from);
            GroundMove { turn_rad, x: at.x - turned.x, z: at.z - turned.z }
        };
        moves.push([place(drift, own[frame]), place(drift + stops[frame].turn_rad, other[frame])]);
    }
    moves
}
