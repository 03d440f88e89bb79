//! Whose way over the ground a mix goes.

use glam::DVec3;

use crate::clip::Clip;

use super::cloud::{Cloud, Landmarks};
use super::ground::GroundMove;
use super::mix::{centre, ground_moves, path_of};
use super::registration::{Stop, unrolled};

/// Whose path and heading on the ground a mix follows.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum RootFrom {
    /// Both, by the weight.
    #[default]
    Both,
    /// The first clip's.
    First,
    /// The second clip's.
    Second,
}

/// Motion about a frame that tells its heading, seconds to both sides.
const HEADING_SECS: f64 = 0.16;

/// For each time the moves that set down both clips' poses where the way leads that is summed from the steps of both, by the second
/// clip's `weights`, each in its own heading. It begins as the first clip's, and is its very way up to the first weight above 0.
///
/// The mean of both places is no way to go while the weight changes: it drags the body from one place to the other, and with it the
/// feet that stand.
pub(super) fn summed_way(a: &Clip, b: &Clip, times: &[f64], weights: &[f64]) -> Vec<[GroundMove; 2]> {
    let turns = unrolled(headings(a, b, times).into_iter());
    let stop = |(&secs, turn_rad): (&f64, f64)| Stop { first_secs: secs, second_secs: secs, turn_rad };
    let stops: Vec<Stop> = times.iter().zip(turns).map(stop).collect();
    let centre = centre(a);
    let [own, other] = [a, b].map(|clip| path_of(clip, centre, times));
    let mut moves = ground_moves(&own, &other, &stops, &|frame| weights[frame]);
    let alone = weights.iter().take_while(|&&weight| weight == 0.0).count();
    for [first, _] in &mut moves[..alone] {
        *first = GroundMove::default();
    }
    moves
}

/// At each time the turn about the vertical that makes the second clip's pose face as the first's does.
fn headings(a: &Clip, b: &Clip, times: &[f64]) -> Vec<f64> {
    let landmarks = Landmarks::of(a);
    let [own, other] = [a, b].map(|clip| Cloud::of(clip, times, &landmarks));
    let reach = (HEADING_SECS * a.grid.rate).round() as usize;
    let last = times.len().saturating_sub(1);
    let about = |frame: usize| {
        let reach = reach.min(frame).min(last - frame);
        (frame - reach..=frame + reach).map(|near| (near, near))
    };
    (0..times.len()).map(|frame| own.facing(&other, about(frame))).collect()
}

/// The move that sets `b`'s pose at a time down on `a`'s at one of its own: facing alike, and where places are nearest.
pub fn pose_onto(a: &Clip, first_secs: f64, b: &Clip, second_secs: f64) -> GroundMove {
    let landmarks = Landmarks::of(a);
    let [own, other] =
        [(a, first_secs), (b, second_secs)].map(|(clip, secs)| Cloud::of(clip, &[secs], &landmarks));
    own.set_down(&other, std::iter::once((0, 0))).1
}

/// For each time the moves that bring both clips' poses there onto the path and heading of the one whose way is taken. `None` where
/// both go their own.
pub(super) fn onto_one_way(
    a: &Clip,
    b: &Clip,
    times: &[f64],
    root: RootFrom,
) -> Option<Vec<[GroundMove; 2]>> {
    if root == RootFrom::Both {
        return None;
    }
    let centre = centre(a);
    let [own_path, other_path] = [a, b].map(|clip| path_of(clip, centre, times));
    let onto = |turn_rad: f64, from: DVec3, to: DVec3| {
        let turned = GroundMove { turn_rad, x: 0.0, z: 0.0 }.apply(from);
        GroundMove { turn_rad, x: to.x - turned.x, z: to.z - turned.z }
    };
    let moves = headings(a, b, times).into_iter().enumerate().map(|(frame, turn_rad)| {
        let (first, second) = (own_path[frame], other_path[frame]);
        match root {
            RootFrom::Second => [onto(-turn_rad, first, second), GroundMove::default()],
            _ => [GroundMove::default(), onto(turn_rad, second, first)],
        }
    });
    Some(moves.collect())
}
