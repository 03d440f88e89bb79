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

/// The room of a number at moments across a stretch of time.
#[derive(Clone, Debug)]
pub struct Rooms {
    /// At each moment; empty in a view whose numbers can't be moved alone, and where swing and twist have levels of their own.
    pub rooms: Vec<Room>,
    /// What they hang on beside limit and line: how the joint is measured, and its numbers at each moment.
    measure: Measure,
    numbers: Vec<Option<[f64; 3]>>,
}

impl Rooms {
    /// The room at a moment, where nothing that it hangs on is another.
    fn known(&self, column: usize, numbers: Option<[f64; 3]>) -> Option<Room> {
        (*self.numbers.get(column)? == numbers).then(|| self.rooms.get(column).copied()).flatten()
    }
}

/// So far apart it is first looked where the joint is inside its limit, degrees: limits are wider.
const STEP_DEG: f64 = 5.0;
/// So far it is looked to either side: half a turn.
const FARTHEST_DEG: f64 = 180.0;
/// So often a step is halved: edges are right within 0.04°, less than a pixel.
const HALVINGS: u32 = 7;

/// The room of a number at each moment across a stretch of time. While a key is dragged most moments keep their numbers, and so the room
/// that they had `before`.
pub fn limit_room(key: &RoomKey, before: Option<(&RoomKey, &Rooms)>) -> Rooms {
    let measure = Measure::new(&key.clip, key.set.joint, key.set.view, Some(key.limit));
    let before = before
        .filter(|(last, rooms)| last.limit == key.limit && last.line == key.line && rooms.measure == measure)
        .map(|(_, rooms)| rooms);
    if measure.turn_of([0.0; 3]).is_none() {
        return Rooms { rooms: Vec::new(), measure, numbers: Vec::new() };
    }
    let line = key.line.min(2);
    let look_for = |numbers: [f64; 3]| {
        let is_inside = |value: f64| {
            let mut numbers = numbers;
            numbers[line] = value;
            let turn = measure.turn_of(numbers)?;
            Some(key.limit.limit.contains(&key.limit.read(turn, None)))
        };
        room_about(numbers[line], &is_inside)
    };
    let last = key.columns.max(2) - 1;
    let numbers: Vec<_> =
        (0..=last).map(|column| key.set.shown_at(key.window.time(column as f64 / last as f64))).collect();
    let room = |(column, &numbers): (usize, &Option<[f64; 3]>)| {
        let known = before.and_then(|before| before.known(column, numbers));
        known.unwrap_or_else(|| look_for(numbers?))
    };
    let rooms = numbers.iter().enumerate().map(room).collect();
    Rooms { rooms, measure, numbers }
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
