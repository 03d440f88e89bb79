//! How far one number of a joint may go while its other numbers stay. Limits speak of swing and twist; plane angles and a file's own
//! angles are coupled, so in their views the room of a number is another one from moment to moment.

use std::sync::Arc;

use crate::clip::Clip;
use crate::limit::JointLimit;

use super::curve_measure::Measure;
use super::curves::CurveSet;
use super::time_window::TimeWindow;

/// What the room hangs on.
#[derive(Clone, Debug)]
pub struct RoomKey {
    /// The numbers of the joint.
    pub set: Arc<CurveSet>,
    /// The clip they are of.
    pub clip: Arc<Clip>,
    /// What the joint is held against.
    pub limit: JointLimit,
    /// Whose room.
    pub line: usize,
    /// The stretch of time.
    pub window: TimeWindow,
    /// So many moments from left to right, both ends among them; at least two.
    pub columns: usize,
}

impl PartialEq for RoomKey {
    fn eq(&self, other: &Self) -> bool {
        Arc::ptr_eq(&self.set, &other.set)
            && Arc::ptr_eq(&self.clip, &other.clip)
            && self.limit == other.limit
            && self.line == other.line
            && self.window == other.window
            && self.columns == other.columns
    }
}

/// The lowest and highest value of a number at one moment, degrees; not finite where it may go on for half a turn and more.
/// `None` where no value of it brings the joint inside its limit.
pub type Room = Option<[f64; 2]>;

/// So far apart it is first looked where the joint is inside its limit, degrees: limits are wider.
const STEP_DEG: f64 = 5.0;
/// So far it is looked to either side: half a turn.
const FARTHEST_DEG: f64 = 180.0;
/// So often a step is halved: edges are right within 0.04°, less than a pixel.
const HALVINGS: u32 = 7;

/// The room of a number at each moment across a stretch of time; empty in a view whose numbers can't be moved alone, and where swing and
/// twist have levels of their own.
pub fn limit_room(key: &RoomKey) -> Vec<Room> {
    let measure = Measure::new(&key.clip, key.set.joint, key.set.view, Some(key.limit));
    let last = key.columns.max(2) - 1;
    let moment = |column: usize| key.window.time(column as f64 / last as f64);
    let room = |column: usize| {
        let numbers = key.set.shown_at(moment(column))?;
        let is_inside = |value: f64| {
            let mut numbers = numbers;
            numbers[key.line.min(2)] = value;
            let turn = measure.turn_of(numbers)?;
            Some(key.limit.limit.contains(&key.limit.read(turn, None)))
        };
        room_about(numbers[key.line.min(2)], &is_inside)
    };
    if measure.turn_of([0.0; 3]).is_none() {
        return Vec::new();
    }
    (0..=last).map(room).collect()
}

/// The stretch of values inside that lies about `own`, or nearest to it.
fn room_about(own: f64, is_inside: &dyn Fn(f64) -> Option<bool>) -> Room {
    let steps = (FARTHEST_DEG / STEP_DEG) as i32;
    let at = |step: i32| own + STEP_DEG * f64::from(step);
    let start = (0..=steps).flat_map(|step| [step, -step]).find(|&step| is_inside(at(step)) == Some(true))?;
    let edge = |way: i32| {
        let outside =
            (1..=steps).map(|step| start + way * step).find(|&step| is_inside(at(step)) != Some(true));
        let Some(outside) = outside else { return f64::from(way) * f64::INFINITY };
        let (mut inside, mut outside) = (at(outside - way), at(outside));
        for _ in 0..HALVINGS {
            let middle = f64::midpoint(inside, outside);
            if is_inside(middle) == Some(true) {
                inside = middle;
            } else {
                outside = middle;
            }
        }
        f64::midpoint(inside, outside)
    };
    Some([edge(-1), edge(1)])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_room_is_that_about_the_value_or_the_nearest() {
        let inside = |value: f64| Some((-30.0..=20.0).contains(&value) || (100.0..=130.0).contains(&value));
        for (own, expected) in [(0.0, [-30.0, 20.0]), (40.0, [-30.0, 20.0]), (93.0, [100.0, 130.0])] {
            let [low, high] = room_about(own, &inside).unwrap();
            assert!(
                (low - expected[0]).abs() < 0.05 && (high - expected[1]).abs() < 0.05,
                "{own}: {low} {high}"
            );
        }
        assert_eq!(room_about(10.0, &|_| Some(false)), None);
        assert_eq!(room_about(10.0, &|_| Some(true)), Some([f64::NEG_INFINITY, f64::INFINITY]));
    }
}
