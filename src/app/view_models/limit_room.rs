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

/// Rooms as they were worked out last. Where the numbers of a moment have stayed to the last digit, so has the room: while a key is
/// dragged or a chart is played, few moments are worked out anew.
#[derive(Debug, Default)]
pub struct LimitRooms {
    last: Option<(RoomKey, Measure)>,
    /// The numbers at each moment; `None` in a gap.
    numbers: Vec<Option<[f64; 3]>>,
    rooms: Vec<Room>,
    /// So many of them were worked out for the last key.
    worked_out: usize,
}

impl LimitRooms {
    /// The room of a number at each moment across a stretch of time; empty in a view whose numbers can't be moved alone, and where
    /// swing and twist have levels of their own.
    pub fn of(&mut self, key: RoomKey) -> &[Room] {
        if self.last.as_ref().is_some_and(|(last, _)| *last == key) {
            return &self.rooms;
        }
        let measure = Measure::new(&key.clip, key.set.joint, key.set.view, Some(key.limit));
        let is_alike = self.last.as_ref().is_some_and(|(last, known)| {
            (last.limit, last.line.min(2)) == (key.limit, key.line.min(2)) && *known == measure
        });
        if !is_alike {
            self.numbers.clear();
            self.rooms.clear();
        }
        let can_move = measure.turn_of([0.0; 3]).is_some();
        let count = if can_move { key.columns.max(2) } else { 0 };
        self.numbers.resize(count, None);
        self.rooms.resize(count, None);
        self.worked_out = 0;
        for column in 0..count {
            let numbers = key.set.shown_at(key.window.time(column as f64 / (count - 1) as f64));
            if numbers != self.numbers[column] {
                self.rooms[column] = numbers.and_then(|numbers| room_at(&key, &measure, numbers));
                self.numbers[column] = numbers;
                self.worked_out += 1;
            }
        }
        self.last = Some((key, measure));
        &self.rooms
    }

    /// How many moments had to be worked out for the last key that was another than the one before: what it cost.
    pub fn worked_out(&self) -> usize {
        self.worked_out
    }
}

/// The room of a number beside the others of one moment.
fn room_at(key: &RoomKey, measure: &Measure, numbers: [f64; 3]) -> Room {
    let line = key.line.min(2);
    let is_inside = |value: f64| {
        let mut numbers = numbers;
        numbers[line] = value;
        Some(key.limit.limit.contains(&key.limit.read(measure.turn_of(numbers)?, None)))
    };
    room_about(numbers[line], &is_inside)
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
