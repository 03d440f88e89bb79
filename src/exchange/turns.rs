//! How the angles that a file has for a joint make one turn, and which angles come nearest to a turn.

use crate::rotor::{Axis, EulerOrder, Rotor};

/// The angle columns of a joint, neighbours about the same axis taken together: they add up.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Turns {
    /// For each axis in a row of different ones: the columns that add up to its angle.
    pub(super) groups: Vec<(Axis, Vec<usize>)>,
}

impl Turns {
    /// Of columns and their axes in the order in which they apply.
    pub(super) fn new(columns: impl IntoIterator<Item = (usize, Axis)>) -> Self {
        let mut groups: Vec<(Axis, Vec<usize>)> = Vec::new();
        for (column, axis) in columns {
            match groups.last_mut() {
                Some((last, columns)) if *last == axis => columns.push(column),
                _ => groups.push((axis, vec![column])),
            }
        }
        Self { groups }
    }

    /// The axes, neighbours different.
    pub(super) fn axes(&self) -> impl Iterator<Item = Axis> + '_ {
        self.groups.iter().map(|(axis, _)| *axis)
    }

    /// The order of the first three axes, filled up where there are fewer. `None` without rotation channels.
    pub(super) fn order(&self) -> Option<EulerOrder> {
        let first = self.axes().next()?;
        let other = |taken: [Axis; 2]| {
            [Axis::X, Axis::Y, Axis::Z].into_iter().find(|axis| !taken.contains(axis)).unwrap_or(Axis::X)
        };
        let second = self.axes().nth(1).unwrap_or_else(|| other([first, first]));
        let third = self.axes().nth(2).unwrap_or_else(|| other([first, second]));
        EulerOrder::new([first, second, third])
    }

    /// The turn of an angle in degrees for each group.
    pub(super) fn rotor(&self, degrees: &[f64]) -> Rotor {
        self.axes()
            .zip(degrees)
            .fold(Rotor::IDENTITY, |turn, (axis, angle)| turn * axis.rotor(angle.to_radians()))
    }

    /// The angles in degrees, one for each group, that come nearest to `wanted`, a unit rotor. Of equal ones those near
    /// `reference`, the angles of the frame before. Groups after the third keep their reference.
    pub(super) fn nearest(&self, wanted: Rotor, reference: &[f64]) -> Vec<f64> {
        let rad: Vec<f64> = reference.iter().map(|angle| angle.to_radians()).collect();
        let axes: Vec<Axis> = self.axes().collect();
        let near = |angle: f64, to: f64| {
            angle - std::f64::consts::TAU * ((angle - to) / std::f64::consts::TAU).round()
        };
        let found: Vec<f64> = match axes.as_slice() {
            [] => Vec::new(),
            [axis] => vec![near(one_axis(*axis, wanted), rad[0])],
            [first, second] => {
                let [a, b] = two_axes(*first, *second, wanted);
                // The same turn again, as half a turn more of both is the opposite rotor.
                vec![near(a, rad[0]), near(b, rad[1])]
            }
            _ => {
                let rest = axes[3..].iter().zip(&rad[3..]);
                let rest = rest.fold(Rotor::IDENTITY, |turn, (axis, angle)| turn * axis.rotor(*angle));
                let first_three = [rad[0], rad[1], rad[2]];
                let Some(order) = self.order() else { return reference.to_vec() };
                let triple = order.from_rotor(wanted * rest.reverse(), rad[2]);
                order.nearest_equal(triple, first_three).to_vec()
            }
        };
        let rest = reference.iter().skip(found.len()).copied();
        found.into_iter().map(f64::to_degrees).chain(rest).collect()
    }
}

/// The angle about `axis` whose turn is nearest to `wanted`: its twist.
fn one_axis(axis: Axis, wanted: Rotor) -> f64 {
    let q = wanted.to_xyzw();
    2.0 * q[axis.index()].atan2(q[3])
}

/// The angles a, b for which `R_i(a) R_j(b)` is nearest to `wanted`.
///
/// The dot product of the two quaternions is, with half angles α and β and the quaternion's parts along i, j and i × j,
/// `w cosα cosβ + q_i sinα cosβ + q_j cosα sinβ + q_k sinα sinβ`: a sum of one term in α + β and one in α − β,
/// and each is largest by itself.
fn two_axes(first: Axis, second: Axis, wanted: Rotor) -> [f64; 2] {
    let q = wanted.to_xyzw();
    let (i, j) = (first.index(), second.index());
    let parity = if (j + 3 - i) % 3 == 1 { 1.0 } else { -1.0 };
    let (w, qi, qj, qk) = (q[3], q[i], q[j], parity * q[3 - i - j]);
    let sum = (qi + qj).atan2(w - qk);
    let difference = (qi - qj).atan2(w + qk);
    [sum + difference, sum - difference]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn fewer_than_three_channels_take_the_nearest_turn_they_can() {
        let turns = Turns::new([(0, Axis::Y), (1, Axis::X)]);
        let wanted = EulerOrder::new([Axis::Y, Axis::X, Axis::Z]).unwrap().to_rotor([0.7, -0.4, 0.2]);
        let best = turns.nearest(wanted, &[0.0, 0.0]);
        let far = |angles: &[f64]| turns.rotor(angles).turn_to(wanted);
        for step in [[0.01, 0.0], [-0.01, 0.0], [0.0, 0.01], [0.0, -0.01]] {
            assert!(far(&[best[0] + step[0], best[1] + step[1]]) > far(&best), "{best:?} is not the nearest");
        }
        let exact = turns.rotor(&[33.0, -71.0]);
        let back = turns.nearest(exact, &[400.0, 0.0]);
        assert!((back[0] - 393.0).abs() < 1e-9 && (back[1] + 71.0).abs() < 1e-9, "{back:?}");
    }

    #[test]
    fn neighbours_about_one_axis_add_up_and_a_fourth_turn_stays() {
        let turns = Turns::new([(0, Axis::Z), (2, Axis::Z), (3, Axis::X), (4, Axis::Y), (5, Axis::Z)]);
        assert_eq!(turns.groups[0], (Axis::Z, vec![0, 2]));
        let angles = turns.nearest(turns.rotor(&[10.0, 20.0, 30.0, 40.0]), &[0.0, 0.0, 0.0, 40.0]);
        assert!(angles.iter().zip([10.0, 20.0, 30.0, 40.0]).all(|(a, b)| (a - b).abs() < 1e-9), "{angles:?}");
    }
}
