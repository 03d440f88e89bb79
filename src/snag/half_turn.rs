//! Runs of keys in which a joint sits about half a turn off its neighbours.

mod flips;
mod sides;

use std::cell::RefCell;
use std::collections::{BTreeMap, BTreeSet};
use std::f64::consts::PI;

use glam::DVec3;

use crate::clip::PathKind;
use crate::limit::Limits;
use crate::rotor::{Bivector, Rotor};

use super::border::{Offset, Side, joined, offset_in_few, offsets_at};
use super::poses::Poses;
use super::roughness::angle_of_dot;
use super::scan::{Finding, Scan, View};
use super::{Remedy, Snag, SnagKind};
pub use flips::Flips;
use sides::{Evidence, Sides};

/// With fewer keys nothing can be said about what is usual.
const LEAST_KEYS: usize = 8;

/// A step from key to key of at least this is looked at.
const STEP_RAD: f64 = 100.0 / 180.0 * PI;

/// A dot product of neighbouring unit rotors of at least this is none: they turn by 51.7° at most.
pub(super) const LEAST_DOT: f64 = 0.9;

/// A smaller one is, when a joint above or below makes a step of [`STEP_RAD`] at the same time.
const LINKED_STEP_RAD: f64 = 60.0 / 180.0 * PI;

/// What is half a turn beyond doubt.
const FULL_RAD: f64 = 150.0 / 180.0 * PI;

/// What has a way in or out alone must be this near to half a turn.
const LONE_RAD: f64 = 170.0 / 180.0 * PI;

/// A step must be this many times the usual step near by, and the steps next to it.
const TIMES_USUAL: f64 = 4.0;
const TIMES_NEXT: f64 = 2.5;

/// Keys to both sides that tell the usual step.
const NEAR_KEYS: usize = 12;

/// Ways in and out that differ by more do not belong together.
const APART_RAD: f64 = 80.0 / 180.0 * PI;

/// Ways in and out that agree this well leave no doubt.
const AGREE_RAD: f64 = 20.0 / 180.0 * PI;

/// Runs of so few keys are told as half-turns only when the offset is half a turn beyond doubt; else they are spikes.
const FEW: usize = 4;

/// A run at the start of so few keys is a calibration pose.
const CALIBRATION_KEYS: usize = 2;

/// An offset is taken for exactly half a turn, or for one about the limb, within so many of its standard deviations, and
/// never beyond this.
const SNAP_SIGMAS: f64 = 3.0;
const SNAP_RAD: f64 = 3.0 / 180.0 * PI;

/// How much dearer, or cheaper, what witnesses speak for makes a key that is off, beside a price of 1 for the whole clip; and how
/// much of what they say counts. All together they outweigh all but a tenth of the clip, the least of them where both sides are about as long.
const WITNESS_COST: f64 = 2.0;
const MOST_EVIDENCE: f64 = 0.6;

/// The first pose is only given up where that is better by so much.
const FIRST_POSE_COST: f64 = 0.1;

/// From here on witnesses are clear.
const CLEAR_EVIDENCE: f64 = 0.4;
const CONTRARY_EVIDENCE: f64 = -0.15;

/// Finds half-turns of one joint of `clip`. Of the two sides of a jump the wrong one is told by the whole clip: by the motion at
/// both ends of a run, how long it is, what the joints above do, by `limits` where the joint has one there, by the joint on the other
/// side of the body, and by where the limb and its child point. `limits` is asked for only where the joint jumps. `flips` is what the
/// joints of this very clip have found out, with these limits.
pub fn find_half_turns<'a>(
    view: View<'_>,
    joint: usize,
    limits: &dyn Fn() -> Option<&'a Limits>,
    flips: &Flips,
) -> Vec<Snag> {
    let mut snags = find(view, joint, limits, flips);
    snags.sort_by_key(|snag| (snag.first_key, snag.last_key));
    snags
}

fn find<'a>(
    view: View<'_>,
    joint: usize,
    limits: &dyn Fn() -> Option<&'a Limits>,
    flips: &Flips,
) -> Vec<Snag> {
    let Some(scan) = Scan::new(view, joint).filter(|scan| scan.keys.len() >= LEAST_KEYS) else {
        return Vec::new();
    };
    let jumps = flips.jumps(&scan);
    if jumps.is_empty() {
        return Vec::new();
    }
    let limits = limits();
    let above = runs_above(&scan, jumps, limits, flips);
    let (motion, runs) = if above.is_empty() {
        let Alone { runs, known } = alone(&scan, limits, flips);
        let sides = Sides::new(scan, flips, limits, false);
        (Motion::new(scan, jumps, above, sides, known.clone()), runs.clone())
    } else {
        let sides = Sides::new(scan, flips, limits, true);
        let motion = Motion::new(scan, jumps, above, sides, BTreeMap::new());
        let runs = motion.runs();
        (motion, runs)
    };
    let lone = motion.lone_jumps(&runs);
    runs.into_iter().filter_map(|run| motion.snag(run)).chain(lone).collect()
}

/// The runs of a joint by itself, and what was worked out about them.
#[derive(Debug)]
struct Alone {
    runs: Vec<Run>,
    known: BTreeMap<Run, Known>,
}

fn alone<'f>(scan: &Scan<'_>, limits: Option<&Limits>, flips: &'f Flips) -> &'f Alone {
    flips.alone(scan, || {
        let sides = Sides::new(*scan, flips, limits, false);
        let motion = Motion::new(*scan, flips.jumps(scan), Vec::new(), sides, BTreeMap::new());
        let runs = motion.runs();
        Alone { runs, known: motion.known.into_inner() }
    })
}

/// The runs of the nearest joint above that jumps at the same times as this one, as keys of this joint; a joint that turns
/// along with another is off when that one is.
fn runs_above(scan: &Scan<'_>, own: &[usize], limits: Option<&Limits>, flips: &Flips) -> Vec<Run> {
    let skeleton = &scan.clip.skeleton;
    let above =
        std::iter::successors(skeleton.parent_joint(scan.joint), |&up| skeleton.parent_joint(up)).take(2);
    for other in above.filter_map(|joint| scan.other(joint)) {
        if other.track.times != scan.track.times {
            continue;
        }
        let jumps = flips.jumps(&other);
        let shared = own.iter().filter(|jump| jumps.binary_search(jump).is_ok()).count();
        if shared * 2 > own.len() {
            return alone(&other, limits, flips).runs.clone();
        }
    }
    Vec::new()
}

fn step(scan: &Scan<'_>, key: usize) -> f64 {
    match (key.checked_sub(1).and_then(|before| scan.unit(before)), scan.unit(key)) {
        (Some(a), Some(b)) => angle_of_dot(a.dot(b)),
        _ => 0.0,
    }
}

/// Keys into which the joint jumps.
fn jumps(scan: &Scan<'_>) -> Vec<usize> {
    let wide: Vec<usize> = scan
        .outline()
        .stepping()
        .filter(|&key| {
            // Unit or not, a small dot product is a wide step; the exact angle comes after.
            key > 0
                && scan.keys[key - 1].dot(scan.keys[key]).abs() < LEAST_DOT
                && step(scan, key) >= LINKED_STEP_RAD
                && scan.track.paths.of(key - 1) != PathKind::Hold
        })
        .collect();
    wide.iter()
        .copied()
        .filter(|&key| {
            let own = step(scan, key);
            is_sudden(scan, &wide, key, own) && (own >= STEP_RAD || is_linked(scan, key))
        })
        .collect()
}

/// Whether the step is far above what is usual near by.
fn is_sudden(scan: &Scan<'_>, wide: &[usize], key: usize, own: f64) -> bool {
    let count = scan.keys.len();
    let is_jump = |key: usize| wide.binary_search(&key).is_ok();
    let mut near: Vec<f64> = (key.saturating_sub(NEAR_KEYS).max(1)..(key + NEAR_KEYS + 1).min(count))
        .filter(|&other| other != key)
        .map(|other| step(scan, other))
        .collect();
    near.sort_by(f64::total_cmp);
    let usual = near.get(near.len() / 2).copied().unwrap_or(0.0);
    // Steps next to it count unless they too may be jumps: a flip of a key or two has its way in and out side by side.
    let next = [key.saturating_sub(2), key - 1, key + 1, key + 2]
        .into_iter()
        .filter(|&other| (1..count).contains(&other) && !(is_jump(other) && step(scan, other) >= 0.75 * own))
        .map(|other| step(scan, other))
        .fold(0.0, f64::max);
    own >= TIMES_USUAL * usual && own >= TIMES_NEXT * next
}

/// Whether a joint up to two above or below makes a jump at the same time.
fn is_linked(scan: &Scan<'_>, key: usize) -> bool {
    let skeleton = &scan.clip.skeleton;
    let above =
        std::iter::successors(skeleton.parent_joint(scan.joint), |&up| skeleton.parent_joint(up)).take(2);
    let below = skeleton.children(scan.joint).iter().copied();
    let below = below.clone().chain(below.flat_map(|child| skeleton.children(child).iter().copied()));
    above.chain(below).any(|other| {
        scan.other(other).is_some_and(|other| {
            let near = other.track.times.nearest(scan.secs(key));
            near > 0 && step(&other, near) >= STEP_RAD
        })
    })
}

/// How many joints of all make a wide step at this time: a cut moves them all.
fn is_cut(scan: &Scan<'_>, key: usize) -> bool {
    let (mut listed, mut wide) = (0, 0);
    for other in scan.clip.skeleton.listed().filter_map(|joint| scan.other(joint)) {
        let near = other.track.times.nearest(scan.secs(key));
        listed += 1;
        wide += usize::from(near > 0 && step(&other, near) >= LINKED_STEP_RAD / 2.0);
    }
    wide >= 4 && wide * 3 >= listed
}

/// A joint with jumps.
struct Motion<'a> {
    scan: Scan<'a>,
    poses: Poses<'a>,
    jumps: &'a [usize],
    /// Runs of a joint above that jumps along, in order.
    above: Vec<Run>,
    sides: Sides<'a>,
    /// What was worked out about a run; it is asked for more than once.
    known: RefCell<BTreeMap<Run, Known>>,
}

/// What is known about a run.
#[derive(Clone, Copy, Debug)]
struct Known {
    /// The offset at both ends, on the bone side and on the parent's.
    ends: [[Option<Offset>; 2]; 2],
    evidence: Option<Evidence>,
}

/// How far a run is off.
struct RunOffset {
    side: Side,
    offset: Offset,
    /// Ways in and out differ by so much.
    apart_rad: f64,
    /// It has both.
    is_inside: bool,
}

/// How the jumps from one on are best paired.
#[derive(Clone, Copy)]
struct Way {
    /// What that costs at least and at most.
    cost: [f64; 2],
    /// How many jumps it takes first.
    takes: usize,
    /// Whether the other way is dearer whatever the costs are.
    is_sure: bool,
}

/// Whether of two ranges of costs the one lies below the other; two that are known each have an order, ties too.
fn is_apart(a: [f64; 2], b: [f64; 2]) -> bool {
    /// What sums in another order may differ by, many times over.
    const ROUNDING: f64 = 1e-9;
    let (a_known, b_known) = (a[0].total_cmp(&a[1]).is_eq(), b[0].total_cmp(&b[1]).is_eq());
    (a_known && b_known) || a[1] + ROUNDING < b[0] || b[1] + ROUNDING < a[0]
}

/// A run of keys that are off: `first..=last`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
struct Run {
    first: usize,
    last: usize,
}

impl<'a> Motion<'a> {
    fn new(
        scan: Scan<'a>,
        jumps: &'a [usize],
        above: Vec<Run>,
        sides: Sides<'a>,
        known: BTreeMap<Run, Known>,
    ) -> Self {
        Self { scan, poses: Poses::new(scan), jumps, above, sides, known: RefCell::new(known) }
    }

    /// Whether a joint above is off over the very same keys.
    fn goes_along(&self, run: Run) -> bool {
        self.above.binary_search(&run).is_ok()
    }

    fn known(&self, run: Run) -> Known {
        *self.known.borrow_mut().entry(run).or_insert_with(|| Known { ends: self.ends(run), evidence: None })
    }

    /// Which keys are off: each jump is a way in or out. Of the ways to pair them the one is taken whose ways in and out
    /// agree and that leaves the fewest keys off.
    fn runs(&self) -> Vec<Run> {
        // Witnesses are asked only where they could decide.
        self.paired(&|run| [MOST_EVIDENCE, -MOST_EVIDENCE].map(|speaks| self.cost(run, &|| speaks)))
            .or_else(|| {
                self.paired(&|run| {
                    [self.cost(run, &|| self.evidence(run).sum().clamp(-MOST_EVIDENCE, MOST_EVIDENCE)); 2]
                })
            })
            .unwrap_or_default()
    }

    /// The cheapest pairing for costs of which the least and the most is known; `None` where that does not decide.
    fn paired(&self, cost: &dyn Fn(Run) -> [f64; 2]) -> Option<Vec<Run>> {
        let (jumps, count) = (self.jumps, self.poses.len());
        let key = |jump: usize| if jump < jumps.len() { jumps[jump] } else { count };
        let run_from = |jump: usize| Run { first: key(jump), last: key(jump + 1) - 1 };
        let sum = |a: [f64; 2], b: [f64; 2]| [a[0] + b[0], a[1] + b[1]];
        // `best[i]`: cheapest pairing of the jumps from `i` on, and how many jumps it takes first.
        let mut best: Vec<Way> = vec![Way { cost: [0.0; 2], takes: 0, is_sure: true }; jumps.len() + 1];
        for jump in (0..jumps.len()).rev() {
            // Left alone: a jump that is no half-turn.
            let alone = sum(best[jump + 1].cost, [1.2; 2]);
            // The last jump may be entered and never left.
            let then = best.get(jump + 2).map_or([0.0; 2], |way| way.cost);
            let run = sum(then, cost(run_from(jump)));
            best[jump] = Way {
                cost: [alone[0].min(run[0]), alone[1].min(run[1])],
                takes: if run[0] < alone[0] { 2 } else { 1 },
                is_sure: is_apart(run, alone),
            };
        }
        let walk = |mut jump: usize, runs: &mut Vec<Run>| {
            while jump < jumps.len() {
                if !best[jump].is_sure {
                    return None;
                }
                if best[jump].takes == 2 {
                    runs.push(run_from(jump));
                }
                jump += best[jump].takes;
            }
            Some(())
        };
        let mut runs = Vec::new();
        let from_start = Run { first: 0, last: key(0) - 1 };
        if key(0) > CALIBRATION_KEYS {
            // The first pose is believed where both ways are nearly as good.
            let given_up = sum(sum(cost(from_start), [FIRST_POSE_COST; 2]), best[1].cost);
            if !is_apart(given_up, best[0].cost) {
                return None;
            }
            if given_up[0] < best[0].cost[0] {
                runs.push(from_start);
                walk(1, &mut runs)?;
                return Some(runs);
            }
        }
        walk(0, &mut runs)?;
        Some(runs)
    }

    /// Near 0 for a short run that is entered and left by the same offset; above 1 for what is better left alone. What speaks for its
    /// being off makes it less.
    fn cost(&self, run: Run, speaks: &dyn Fn() -> f64) -> f64 {
        let share = || {
            let share = (run.last + 1 - run.first) as f64 / self.poses.len() as f64;
            share * (1.0 - WITNESS_COST * speaks())
        };
        let [bone, parent] = self.known(run).ends;
        match bone {
            [Some(a), Some(b)] => {
                let parent = match parent {
                    [Some(a), Some(b)] => a.turn.turn_to(b.turn),
                    _ => PI,
                };
                let apart = a.turn.turn_to(b.turn).min(parent) / APART_RAD;
                if self.above.is_empty() {
                    share() + apart
                } else if self.goes_along(run) {
                    0.3 * apart
                } else {
                    1.0 + share() + apart
                }
            }
            // Half the price of two jumps left alone: one end proves less.
            [Some(one), None] | [None, Some(one)] => {
                let seam = if run.first > 0 { run.first } else { run.last + 1 };
                let is_full = one.turn.turn() >= LONE_RAD && !is_cut(&self.scan, seam);
                if is_full { 0.2 + share() } else { 10.0 }
            }
            [None, None] => 10.0,
        }
    }

    /// The offset at both ends of a run, where it has them: on the bone side, and on the parent's.
    fn ends(&self, run: Run) -> [[Option<Offset>; 2]; 2] {
        let count = self.poses.len();
        let (before, after) = (self.sound_from(run.first), self.sound_to(run.last));
        if run.first > 0 && run.last + 1 < count && run.last - run.first < FEW {
            // Too few to have rates of their own: against the way across.
            return Side::BOTH.map(|side| {
                [run.first, run.last]
                    .map(|key| Some(offset_in_few(&self.scan, &self.poses, (run.first, run.last), key, side)))
            });
        }
        let entering = (run.first > 0).then(|| offsets_at(&self.poses, run.first, (before, run.last), false));
        let leaving =
            (run.last + 1 < count).then(|| offsets_at(&self.poses, run.last + 1, (run.first, after), true));
        [0, 1].map(|side| [entering, leaving].map(|both| both.map(|both| both[side])))
    }

    /// First key from which the motion runs to `key` without a jump.
    fn sound_from(&self, key: usize) -> usize {
        let behind = self.jumps.partition_point(|&jump| jump < key);
        behind.checked_sub(1).map_or(0, |last| self.jumps[last])
    }

    /// Last key to which the motion runs from `key + 1` without a jump.
    fn sound_to(&self, key: usize) -> usize {
        let behind = self.jumps.partition_point(|&jump| jump <= key + 1);
        self.jumps.get(behind).map_or(self.poses.len() - 1, |jump| jump - 1)
    }

    /// The offset of a run, on the side where it fits best.
    fn offset(&self, run: Run) -> Option<RunOffset> {
        let [bone, parent] = self.known(run).ends;
        let both = [(Side::Bone, bone), (Side::Parent, parent)];
        let apart = |ends: &[Option<Offset>; 2]| match ends {
            [Some(a), Some(b)] => a.turn.turn_to(b.turn),
            _ => 0.0,
        };
        // On the bone side unless the other fits clearly better.
        let (side, ends) = if apart(&both[1].1) + 0.01 < 0.7 * apart(&both[0].1) { both[1] } else { both[0] };
        let offset = match ends {
            [Some(a), Some(b)] => joined(a, b),
            [Some(one), None] | [None, Some(one)] => one,
            [None, None] => return None,
        };
        let is_inside = ends.iter().all(Option::is_some);
        Some(RunOffset { side, offset, apart_rad: apart(&ends), is_inside })
    }

    /// What speaks for a run's being the wrong side, besides how it is entered and left.
    fn evidence(&self, run: Run) -> Evidence {
        if let Some(evidence) = self.known(run).evidence {
            return evidence;
        }
        let evidence = self.asked(run);
        if let Some(known) = self.known.borrow_mut().get_mut(&run) {
            known.evidence = Some(evidence);
        }
        evidence
    }

    fn asked(&self, run: Run) -> Evidence {
        let Some(RunOffset { side, offset, .. }) = self.offset(run) else { return Evidence::default() };
        let back = offset.turn.reverse();
        self.sides.of((run.first, run.last), |pose| match side {
            Side::Bone => pose * back,
            Side::Parent => back * pose,
        })
    }

    fn snag(&self, run: Run) -> Option<Snag> {
        let RunOffset { side, offset, apart_rad, is_inside } = self.offset(run)?;
        let turn_rad = offset.turn.turn();
        let is_few = run.last - run.first < FEW;
        if is_few && turn_rad < FULL_RAD {
            return None;
        }
        let offset = self.snapped(offset, side);
        let evidence = self.evidence(run);
        let speaks = evidence.sum();
        // One end proves less, and so does a run that goes along with a joint above, whose witnesses count.
        let is_witnessed = if is_inside {
            speaks > CONTRARY_EVIDENCE || self.goes_along(run)
        } else {
            speaks >= CLEAR_EVIDENCE
        };
        let is_sure = turn_rad >= FULL_RAD && apart_rad <= AGREE_RAD && is_witnessed;
        let back = offset.reverse();
        let scan = &self.scan;
        let text = format!("{}; {}{}", self.what(run), self.why(run, speaks), evidence.words());
        Some(scan.snag(Finding {
            kind: SnagKind::HalfTurn,
            keys: (run.first, run.last),
            size_rad: turn_rad,
            confidence: match (is_sure, is_inside) {
                (true, true) => 0.95,
                (true, false) => 0.85,
                (false, _) => 0.6,
            },
            remedy: if side == Side::Bone { Remedy::TakeOut(back) } else { Remedy::TakeOutAbove(back) },
            safe: is_sure,
            text,
        }))
    }

    /// Jumps that belong to no run: which side of them is right, nothing shows. They are told and left to a person.
    fn lone_jumps(&self, runs: &[Run]) -> Vec<Snag> {
        let scan = &self.scan;
        let ends_of = |runs: &[Run]| -> BTreeSet<usize> {
            runs.iter().flat_map(|run| [run.first, run.last + 1]).collect()
        };
        let (ends, ends_above) = (ends_of(runs), ends_of(&self.above));
        self.jumps
            .iter()
            .copied()
            .filter(|&jump| jump > CALIBRATION_KEYS && !ends.contains(&jump) && !ends_above.contains(&jump))
            .filter(|&jump| step(scan, jump) >= STEP_RAD && !is_cut(scan, jump))
            .map(|jump| {
                scan.snag(Finding {
                    kind: SnagKind::HalfTurn,
                    keys: (jump, jump),
                    size_rad: step(scan, jump),
                    confidence: 0.4,
                    remedy: Remedy::Ask,
                    safe: false,
                    text: format!(
                        "{} jumps {:.0}° at frame {} and does not come back: which side is right can't be told",
                        scan.label(),
                        step(scan, jump).to_degrees(),
                        scan.frame(jump)
                    ),
                })
            })
            .collect()
    }

    /// Why this side of the jumps is taken for the wrong one, as far as the row of poses tells; `speaks` is what the witnesses say.
    fn why(&self, run: Run, speaks: f64) -> String {
        let (count, own) = (self.poses.len(), run.last + 1 - run.first);
        if self.goes_along(run) {
            return "it goes along with a joint above that flips at the same frames".to_owned();
        }
        match (run.first > 0, run.last + 1 < count) {
            (true, true) if own == 1 && count > 2 => {
                "the frame between is off, the motion before and after it agrees".to_owned()
            }
            (true, true) if own * 2 <= count => {
                format!("the {own} frames between are off, the motion before and after them agrees")
            }
            (true, true) => {
                format!(
                    "the {own} frames between are off, though most of the clip: they are entered and left by one turn"
                )
            }
            _ if own == 1 && count > 2 => {
                format!("of {count} frames this one alone is taken for the wrong side")
            }
            _ if own * 2 <= count => {
                format!("of {count} frames these {own} are taken for the wrong side, being fewer")
            }
            _ if speaks > 0.0 => {
                format!(
                    "of {count} frames these {own} are taken for the wrong side, though more: the pose itself tells"
                )
            }
            _ => format!(
                "of {count} frames these {own} are taken for the wrong side, since it flips more than once"
            ),
        }
    }

    fn what(&self, run: Run) -> String {
        let (scan, count) = (&self.scan, self.poses.len());
        let name = scan.label();
        let degrees = |key: usize| step(scan, key).to_degrees().round();
        match (run.first > 0, run.last + 1 < count) {
            (true, true) => format!(
                "{name} flips {}° at frame {} and back at {}",
                degrees(run.first),
                scan.frame(run.first),
                scan.frame(run.last + 1)
            ),
            (true, false) => format!(
                "{name} flips {}° at frame {} and stays so",
                degrees(run.first),
                scan.frame(run.first)
            ),
            _ => format!(
                "{name} starts flipped, and flips back by {}° at frame {}",
                degrees(run.last + 1),
                scan.frame(run.last + 1)
            ),
        }
    }

    /// The offset made exact where it is half a turn, or one about the limb, as far as can be told.
    fn snapped(&self, offset: Offset, side: Side) -> Rotor {
        let within = (SNAP_SIGMAS * offset.sigma_rad).min(SNAP_RAD);
        if PI - offset.turn.turn() > within {
            return offset.turn;
        }
        let axis = offset.turn.bivector().normalize_or_zero().axis();
        let near = self.axes(side).into_iter().find(|own| {
            // Half a turn about an axis that is off by α is off by 2α.
            2.0 * own.dot(axis).abs().min(1.0).acos() <= within
        });
        let axis = near.unwrap_or(axis);
        Rotor::from_parts(0.0, Bivector::from_axis(axis) * -1.0)
    }

    /// Directions a half-turn is likely about: along the limbs that hang on the joint, and its own axes.
    fn axes(&self, side: Side) -> Vec<DVec3> {
        let skeleton = &self.scan.clip.skeleton;
        let own = &skeleton.joints()[self.scan.joint];
        let mut axes: Vec<DVec3> = match side {
            Side::Bone => {
                let children = skeleton.children(self.scan.joint).iter();
                children
                    .map(|&child| skeleton.joints()[child].rest.translation)
                    .chain(own.tips.iter().copied())
                    .collect()
            }
            Side::Parent => vec![own.rest.translation],
        };
        axes.extend([DVec3::X, DVec3::Y, DVec3::Z]);
        axes.into_iter().filter_map(DVec3::try_normalize).collect()
    }
}
