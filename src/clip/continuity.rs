//! Euler angles for a row of turns, without jumps where there is a way round them.

use std::f64::consts::{PI, TAU};

use crate::rotor::{EulerOrder, Rotor};

/// Angles in radians for each of `rotors`, chosen as a whole so that the sum of squared steps from frame to frame is
/// the least: of the two triples that mean a turn, each shifted by the whole turns nearest to the frame before.
///
/// The first triple is the one nearer to `near`. Rotors that are not finite give NaN and are stepped over. At a pole the
/// last angle stays what it was.
///
/// Each step depends on the one before alone, so two states a frame hold the best way so far to either triple
/// (Viterbi 1967, "Error bounds for convolutional codes and an asymptotically optimum decoding algorithm"); whole turns
/// shift all that follows alike and so cost nothing later.
pub fn continuous_angles(order: EulerOrder, rotors: &[Rotor], near: [f64; 3]) -> Vec<[f64; 3]> {
    continuous_angles_to(order, rotors, near, None)
}

/// As [`continuous_angles`], for a stretch that is followed by the angles `end`: the step to them counts as well.
pub fn continuous_angles_to(
    order: EulerOrder,
    rotors: &[Rotor],
    near: [f64; 3],
    end: Option<[f64; 3]>,
) -> Vec<[f64; 3]> {
    let mut states: Vec<[State; 2]> = Vec::with_capacity(rotors.len());
    // Index of the last sound frame.
    let mut sound: Option<usize> = None;
    for rotor in rotors {
        let Some(rotor) = rotor.try_normalize() else {
            states.push([State { angles: [f64::NAN; 3], cost: 0.0, from: None }; 2]);
            continue;
        };
        let reached = match sound {
            None => {
                [false, true].map(|is_mirrored| State::reached(order, rotor, is_mirrored, near, 0.0, None))
            }
            Some(frame) => [false, true].map(|is_mirrored| {
                let [a, b] = [0, 1].map(|state| {
                    let before = &states[frame][state];
                    let from = Some((frame, state));
                    State::reached(order, rotor, is_mirrored, before.angles, before.cost, from)
                });
                if b.cost < a.cost { b } else { a }
            }),
        };
        sound = Some(states.len());
        states.push(reached);
    }
    let mut angles = vec![[f64::NAN; 3]; rotors.len()];
    let last = sound.map(|frame| {
        let cost = |state: &State| {
            let step = |end: [f64; 3]| (0..3).map(|i| (end[i] - state.angles[i]).powi(2)).sum::<f64>();
            state.cost + end.map_or(0.0, step)
        };
        (frame, usize::from(cost(&states[frame][1]) < cost(&states[frame][0])))
    });
    let steps = std::iter::successors(last, |&(frame, state)| states[frame][state].from);
    for (frame, state) in steps {
        angles[frame] = states[frame][state].angles;
    }
    angles
}

/// Gives `degrees`, a file's angles, the turns of `changes`, `(key, rotor)`: of the equal triples those that make the
/// steps least, over each run of neighbouring keys as a whole and with the sound keys on either side of it.
///
/// # Panics
/// When a key does not exist.
pub(super) fn refit(order: EulerOrder, degrees: &mut [[f64; 3]], changes: &[(usize, Rotor)]) {
    let mut changes = changes.to_vec();
    // Of changes to one key the last holds.
    changes.reverse();
    changes.sort_by_key(|&(key, _)| key);
    changes.dedup_by_key(|&mut (key, _)| key);
    for run in changes.chunk_by(|a, b| b.0 == a.0 + 1) {
        let (first, end) = (run[0].0, run[0].0 + run.len());
        let is_sound = |triple: &&[f64; 3]| triple.iter().all(|angle| angle.is_finite());
        let radians = |triple: &[f64; 3]| triple.map(f64::to_radians);
        let before = degrees[..first].iter().rev().find(is_sound).map(radians);
        let after = degrees[end..].iter().find(is_sound).map(radians);
        let own = degrees[first..end].iter().find(is_sound).map(radians);
        let near = before.or(own).or(after).unwrap_or_default();
        let rotors: Vec<Rotor> = run.iter().map(|&(_, rotor)| rotor).collect();
        let found = continuous_angles_to(order, &rotors, near, after);
        for (own, triple) in degrees[first..end].iter_mut().zip(found) {
            *own = triple.map(f64::to_degrees);
        }
    }
}

/// The best way so far to one of the two triples of a frame.
#[derive(Clone, Copy)]
struct State {
    angles: [f64; 3],
    cost: f64,
    from: Option<(usize, usize)>,
}

impl State {
    fn reached(
        order: EulerOrder,
        rotor: Rotor,
        is_mirrored: bool,
        before: [f64; 3],
        cost: f64,
        from: Option<(usize, usize)>,
    ) -> Self {
        let triple = if is_mirrored {
            // The mirrored triple has half a turn more in the last angle: at a pole that has to be the free choice too.
            order.mirrored(order.from_rotor(rotor, before[2] - PI))
        } else {
            order.from_rotor(rotor, before[2])
        };
        let angles: [f64; 3] =
            std::array::from_fn(|i| triple[i] - TAU * ((triple[i] - before[i]) / TAU).round());
        let step: f64 = (0..3).map(|i| (angles[i] - before[i]).powi(2)).sum();
        Self { angles, cost: cost + step, from }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn largest_step(angles: &[[f64; 3]]) -> f64 {
        let step = |pair: &[[f64; 3]]| (0..3).map(|i| (pair[1][i] - pair[0][i]).abs()).fold(0.0, f64::max);
        angles.windows(2).map(step).fold(0.0, f64::max)
    }

    #[test]
    fn many_turns_and_the_far_side_of_the_middle_angle_come_back_as_they_were() {
        let made: Vec<[f64; 3]> = (0..400)
            .map(|i| f64::from(i) * 0.05)
            .map(|t| [t, 1.4 * (0.9 * t).sin() + 0.6 * t, -0.7 * t])
            .collect();
        for order in EulerOrder::ALL {
            // At a pole of proper orders the whole clip may start in either triple; `near` decides.
            let rotors: Vec<Rotor> = made.iter().map(|&angles| order.to_rotor(angles)).collect();
            let found = continuous_angles(order, &rotors, made[0]);
            assert!(largest_step(&found) < 0.5, "{order}: {}", largest_step(&found));
            for (angles, rotor) in found.iter().zip(&rotors) {
                assert!(order.to_rotor(*angles).turn_to(*rotor) < 1e-7, "{order}");
            }
        }
    }

    #[test]
    fn the_whole_row_is_weighed_and_not_one_step_after_the_other() {
        // The second turn is near the pole: the step to either triple is about alike, and the third decides.
        let order = EulerOrder::ZXY;
        let rows = [[0.0, 1.5, 0.0], [1.6, 1.58, 1.5], [3.0, 1.75, 3.0], [3.1, 1.9, 3.1]];
        let rotors = rows.map(|angles| order.to_rotor(angles));
        let found = continuous_angles(order, &rotors, [0.0, 1.5, 0.0]);
        let cost = |rows: &[[f64; 3]]| -> f64 {
            rows.windows(2).map(|p| (0..3).map(|i| (p[1][i] - p[0][i]).powi(2)).sum::<f64>()).sum()
        };
        let mut greedy = vec![[0.0, 1.5, 0.0]];
        for rotor in &rotors[1..] {
            let before = greedy[greedy.len() - 1];
            greedy.push(order.nearest_equal(order.from_rotor(*rotor, before[2]), before));
        }
        assert!(cost(&found) <= cost(&greedy) + 1e-12, "{} above {}", cost(&found), cost(&greedy));
    }

    #[test]
    fn a_run_of_changes_meets_the_keys_on_both_sides() {
        // From one side of the middle angle's right angle to the other and back: one step after the other would come out
        // in the mirrored triples.
        let order = EulerOrder::ZXY;
        let made: Vec<[f64; 3]> = (0..40)
            .map(|i| f64::from(i) * 0.2)
            .map(|t| [20.0 * t, 100.0 * (0.4 * t).sin(), 370.0 - 15.0 * t])
            .collect();
        let mut degrees = made.clone();
        let rotor = |key: usize| order.to_rotor(made[key].map(f64::to_radians));
        let changes: Vec<(usize, Rotor)> = (5..30).chain(33..35).map(|key| (key, rotor(key))).collect();
        for (key, _) in &changes {
            degrees[*key] = [f64::NAN; 3];
        }
        refit(order, &mut degrees, &changes);
        for (found, expected) in degrees.iter().zip(&made) {
            assert!((0..3).all(|i| (found[i] - expected[i]).abs() < 1e-9), "{found:?} for {expected:?}");
        }
    }

    #[test]
    fn turns_that_are_missing_are_stepped_over() {
        let order = EulerOrder::ZXY;
        let rotors = [
            order.to_rotor([3.1, 0.0, 0.0]),
            Rotor::new(f64::NAN, 0.0, 0.0, 0.0),
            order.to_rotor([3.2, 0.0, 0.0]),
        ];
        let found = continuous_angles(order, &rotors, [0.0; 3]);
        assert!(found[1][0].is_nan());
        assert!((found[2][0] - 3.2).abs() < 1e-12, "{found:?}");
    }
}
