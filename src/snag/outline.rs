//! Where in a joint's keys anything is to be seen at all: one look at every key, so that the finders of steps, spikes, rests and
//! noise need not look at the calm rest.
//!
//! Each of them has a bound below which it finds nothing, whatever else is so. What is below a bound of a block of keys is proved
//! from sums and products of the stored numbers alone; where that fails, for whatever reason, the finder looks for itself. So the
//! outline changes nothing in what is found.

#![expect(
    clippy::inline_always,
    reason = "a part that stays a function of its own is built for the baseline, and keeps the loop around it from being widened"
)]

use std::ops::Range;
use std::sync::OnceLock;

use crate::clip::{Clip, RotationTrack, Times};
use crate::rotor::Rotor;
use crate::rotor::batch::Level;

use super::{half_turn, jitter, spike, stuck};

/// Keys of a block.
pub(super) const BLOCK: usize = 64;

/// Keys beside a block that its bounds look at.
const BESIDE: usize = 2 * jitter::LAGS[2];

/// Bounds are missed by this share where a key is off unit length, or an angle is told from its sine.
const MARGIN: f64 = 0.99;

/// Keys whose squared length is off 1 by more are not judged here.
const OFF_UNIT: f64 = 4e-5;

/// What is known about a block of keys.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
struct Block {
    /// A key may be no rotation, or a step may change the sign of the stored numbers or be as wide as that of a half-turn.
    has_steps: bool,
    /// A key may lie as far off its neighbours as a spike.
    is_rough: bool,
    /// A key may repeat the pose of the key before.
    has_repeats: bool,
    /// How many keys at most tremble enough to be seen, with poses so far apart as [`jitter::LAGS`] says.
    trembling: [u8; 3],
}

impl Block {
    const UNKNOWN: Self =
        Self { has_steps: true, is_rough: true, has_repeats: true, trembling: [BLOCK as u8; 3] };
}

/// What is known about the keys of a joint, block by block.
#[derive(Debug)]
pub struct Outline {
    blocks: Vec<Block>,
    /// The time from key to key that counts, in seconds.
    step_secs: Option<f64>,
    count: usize,
}

/// Outlines of the joints of one clip, each worked out when it is first asked for.
#[derive(Debug)]
pub struct Outlines(Vec<OnceLock<Outline>>);

impl Outlines {
    /// Of a clip with so many joints; nothing is known yet.
    pub fn new(joints: usize) -> Self {
        Self((0..joints).map(|_| OnceLock::new()).collect())
    }

    pub(super) fn of(&self, clip: &Clip, joint: usize) -> &Outline {
        // A joint without keys has an empty one.
        self.0[joint].get_or_init(|| clip.rotation(joint).map_or_else(Outline::empty, Outline::new))
    }

    /// Those of one joint each that are known, for the joints in order: to be told what changes ([`Outline::look_again`]).
    pub fn each_mut(&mut self) -> Vec<Option<&mut Outline>> {
        self.0.iter_mut().map(OnceLock::get_mut).collect()
    }

    /// A joint is no longer what it was.
    pub fn forget(&mut self, joint: usize) {
        self.0[joint] = OnceLock::new();
    }
}

impl Outline {
    fn empty() -> Self {
        Self { blocks: Vec::new(), step_secs: None, count: 0 }
    }

    fn new(track: &RotationTrack) -> Self {
        let count = track.keys.len();
        let blocks = vec![Block::default(); count.div_ceil(BLOCK)];
        let mut outline = Self { blocks, step_secs: track.times.median_step(), count };
        outline.look_again(track, std::slice::from_ref(&(0..count)));
        outline
    }

    /// Looks once more where keys have changed, which must be as many as before, at the same times.
    pub fn look_again(&mut self, track: &RotationTrack, changed: &[Range<usize>]) {
        let keys: &[Rotor] = &track.keys;
        let mut looker = Looker::new(self.step_secs);
        let mut next = 0;
        for keys_changed in changed {
            let first = (keys_changed.start.saturating_sub(BESIDE) / BLOCK).max(next);
            next = ((keys_changed.end + BESIDE).div_ceil(BLOCK)).min(self.blocks.len()).max(first);
            for index in first..next {
                self.blocks[index] = looker.block(keys, &track.times, index * BLOCK);
            }
        }
    }

    /// The time from key to key that counts, in seconds: [`Times::median_step`].
    pub(super) fn step_secs(&self) -> Option<f64> {
        self.step_secs
    }

    /// Keys among which are all that are no rotation and all into which the stored numbers step widely.
    pub(super) fn stepping(&self) -> impl Iterator<Item = usize> + '_ {
        self.keys_of(|block| block.has_steps)
    }

    /// Keys among which are all that repeat the one before.
    pub(super) fn repeating(&self) -> impl Iterator<Item = usize> + '_ {
        self.keys_of(|block| block.has_repeats)
    }

    /// The first key from `key` on that may be rough; without any the number of keys.
    pub(super) fn next_rough(&self, key: usize) -> usize {
        let first = key / BLOCK;
        let rough = self.blocks.iter().skip(first).position(|block| block.is_rough);
        rough.map_or(self.count, |index| ((first + index) * BLOCK).max(key))
    }

    /// How many keys of `keys` and its blocks tremble at most, with poses [`jitter::LAGS`]`[lag]` keys apart.
    pub(super) fn trembling(&self, keys: &Range<usize>, lag: usize) -> usize {
        let blocks = keys.start / BLOCK..keys.end.div_ceil(BLOCK).min(self.blocks.len());
        self.blocks[blocks].iter().map(|block| usize::from(block.trembling[lag])).sum()
    }

    fn keys_of(&self, is_wanted: impl Fn(&Block) -> bool) -> impl Iterator<Item = usize> {
        let wanted = self.blocks.iter().enumerate().filter(move |(_, block)| is_wanted(block));
        wanted.flat_map(|(index, _)| index * BLOCK..((index + 1) * BLOCK).min(self.count))
    }
}

/// Room for the keys of a block and those beside it, in streams.
const ROOM: usize = BLOCK + 2 * BESIDE;

struct Looker {
    level: Level,
    step_secs: Option<f64>,
    parts: Box<[[f64; ROOM]; 4]>,
    /// For each key of the block how far it lies on the time from the key before to the one after.
    shares: [f64; BLOCK],
}

impl Looker {
    fn new(step_secs: Option<f64>) -> Self {
        Self { level: Level::best(), step_secs, parts: Box::new([[0.0; ROOM]; 4]), shares: [0.5; BLOCK] }
    }

    /// What is known about the keys from `start` on, as many as a block has.
    fn block(&mut self, keys: &[Rotor], times: &Times, start: usize) -> Block {
        let end = (start + BLOCK).min(keys.len());
        if start < BESIDE || start + BLOCK + BESIDE > keys.len() {
            // At the ends nothing is worth a proof.
            return Block::UNKNOWN;
        }
        for (row, key) in keys[start - BESIDE..end + BESIDE].iter().enumerate() {
            let parts = [key.s, key.yz, key.zx, key.xy];
            for (stream, part) in self.parts.iter_mut().zip(parts) {
                stream[row] = part;
            }
        }
        if let Times::Listed(secs) = times {
            for (share, secs) in self.shares.iter_mut().zip(secs[start - 1..=end].windows(3)) {
                *share = (secs[1] - secs[0]) / (secs[2] - secs[0]);
            }
        }
        let lags = jitter::LAGS.map(|lag| {
            lag == 1
                || self.step_secs.is_some_and(|step_secs| lag as f64 * step_secs <= jitter::FARTHEST_SECS)
        });
        let mut block = Block::default();
        let (parts, shares) = (&*self.parts, &self.shares);
        self.level.run(
            #[inline(always)]
            || block = looked_over(parts, shares, lags),
        );
        block
    }
}

/// Squared bounds. Rotors turn by half the angle.
const ROUGH: f64 = (0.5 * spike::LEAST_LOOKED_AT_RAD) * (0.5 * spike::LEAST_LOOKED_AT_RAD) * MARGIN * MARGIN;
const STILL: f64 = stuck::STILL_RAD * stuck::STILL_RAD / 4.0 / (MARGIN * MARGIN);
const TREMBLING: f64 = (0.5 * jitter::LEAST_RAD * jitter::FOURTH * jitter::MIDDLE)
    * (0.5 * jitter::LEAST_RAD * jitter::FOURTH * jitter::MIDDLE)
    * MARGIN
    * MARGIN;

/// What is no number is below no bound.
#[expect(clippy::neg_cmp_op_on_partial_ord, reason = "what is no number must not pass")]
#[inline(always)]
fn looked_over(parts: &[[f64; ROOM]; 4], shares: &[f64; BLOCK], lags: [bool; 3]) -> Block {
    let mut stepping = 0_u64;
    for row in 1..ROOM {
        let (mut length, mut dot) = (0.0, 0.0);
        for part in parts {
            length += part[row] * part[row];
            dot += part[row] * part[row - 1];
        }
        stepping += u64::from(!((length - 1.0).abs() <= OFF_UNIT));
        stepping += u64::from(!(dot >= half_turn::LEAST_DOT));
    }
    if stepping > 0 {
        // Beside such keys nothing is proved.
        return Block::UNKNOWN;
    }
    let (mut rough, mut repeats) = (0_u64, 0_u64);
    for row in 0..BLOCK {
        let (mut apart, mut off) = (0.0, 0.0);
        for part in parts {
            let [before, own, after] = [part[row + BESIDE - 1], part[row + BESIDE], part[row + BESIDE + 1]];
            let step = own - before;
            let missed = step - (after - before) * shares[row];
            apart += step * step;
            off += missed * missed;
        }
        rough += u64::from(!(off < ROUGH));
        repeats += u64::from(!(apart > STILL));
    }
    let unasked = BLOCK as u8;
    let [first, second, third] = lags;
    Block {
        has_steps: false,
        is_rough: rough > 0,
        has_repeats: repeats > 0,
        trembling: [
            if first { trembling::<{ jitter::LAGS[0] }>(parts) } else { unasked },
            if second { trembling::<{ jitter::LAGS[1] }>(parts) } else { unasked },
            if third { trembling::<{ jitter::LAGS[2] }>(parts) } else { unasked },
        ],
    }
}

/// How many keys of a block tremble, with poses so many keys apart.
#[expect(clippy::neg_cmp_op_on_partial_ord, reason = "what is no number must not pass")]
#[inline(always)]
fn trembling<const LAG: usize>(parts: &[[f64; ROOM]; 4]) -> u8 {
    let mut count = 0_u64;
    for row in BESIDE..BESIDE + BLOCK {
        let mut square = 0.0;
        for part in parts {
            let sides = part[row - 2 * LAG] + part[row + 2 * LAG] - 4.0 * (part[row - LAG] + part[row + LAG]);
            let own = sides + 6.0 * part[row];
            square += own * own;
        }
        count += u64::from(!(square < TREMBLING));
    }
    count as u8
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use super::super::tests::of_one_joint;
    use super::super::{Memory, SnagKind, View, find_with};
    use super::*;
    use crate::rotor::Bivector;

    /// A calm swing with one key changed by `change`.
    fn outline(times: Times, change: impl Fn(usize, Rotor) -> Rotor) -> Outline {
        let swing = |key: usize| Rotor::from_plane_angles(Bivector::new((0.01 * key as f64).sin(), 0.3, 0.0));
        let keys: Vec<Rotor> = (0..times.len()).map(|key| change(key, swing(key))).collect();
        Outline::new(&RotationTrack::from_rotors(times, keys))
    }

    fn even(count: usize) -> Times {
        Times::Even { step_secs: 1.0 / 120.0, count }
    }

    /// Where the inner blocks of six have something to be looked at.
    fn seen(outline: &Outline) -> Vec<(usize, Block)> {
        let calm = Block::default();
        outline.blocks.iter().copied().enumerate().skip(1).take(4).filter(|(_, own)| *own != calm).collect()
    }

    #[test]
    fn a_calm_motion_has_nothing_and_each_fault_shows_in_its_block() {
        assert_eq!(seen(&outline(even(6 * BLOCK), |_, own| own)), []);
        let at = 2 * BLOCK + 30;
        let only = |change: &dyn Fn(Rotor) -> Rotor| {
            let found = seen(&outline(even(6 * BLOCK), |key, own| if key == at { change(own) } else { own }));
            assert_eq!(found.len(), 1, "{found:?}");
            assert_eq!(found[0].0, 2);
            found[0].1
        };
        assert!(only(&|own| -own).has_steps);
        assert!(only(&|own| own.scale(f64::NAN)).has_steps);
        let turned = |degrees: f64| {
            move |own: Rotor| own * Rotor::from_plane_angles(Bivector::new(0.0, degrees.to_radians(), 0.0))
        };
        assert!(only(&turned(100.0)).has_steps);
        let spike = only(&turned(2.0));
        assert!(spike.is_rough && !spike.has_steps);
        let small = only(&turned(1.2));
        assert!(!small.is_rough && small.trembling == [3, 3, 3], "{small:?}");
    }

    #[test]
    fn a_repeat_is_seen_and_uneven_times_are_no_fault() {
        let at = 3 * BLOCK + 9;
        let still = outline(even(6 * BLOCK), |key, own| {
            let before = Rotor::from_plane_angles(Bivector::new((0.01 * (at - 1) as f64).sin(), 0.3, 0.0));
            if key == at { before } else { own }
        });
        assert!(still.repeating().any(|key| key == at));
        let secs: Vec<f64> =
            (0..6 * BLOCK).map(|key| (key as f64 + if key % 2 == 0 { 0.2 } else { 0.0 }) / 120.0).collect();
        let swing = |secs: f64| Rotor::from_plane_angles(Bivector::new((1.2 * secs).sin(), 0.3, 0.0));
        let keys: Vec<Rotor> = secs.iter().map(|secs| swing(*secs)).collect();
        let uneven = Outline::new(&RotationTrack::from_rotors(Times::Listed(secs.into()), keys));
        assert!(seen(&uneven).iter().all(|(_, own)| !own.is_rough && !own.has_steps));
    }

    #[test]
    fn looking_again_is_as_looking_anew() {
        let mut keys: Vec<Rotor> = (0..700)
            .map(|key| Rotor::from_plane_angles(Bivector::new((0.01 * f64::from(key)).sin(), 0.3, 0.0)))
            .collect();
        let track = |keys: &[Rotor]| RotationTrack::from_rotors(even(keys.len()), keys);
        let mut outline = Outline::new(&track(&keys));
        for key in [190, 191, 450] {
            keys[key] = -keys[key];
        }
        let changed = track(&keys);
        outline.look_again(&changed, &[190..192, 450..451]);
        assert_eq!(outline.blocks, Outline::new(&changed).blocks);
    }

    /// A joint that swings and shakes, stands, is flipped and off for a key or two, at 24 and at 120 poses a second.
    fn faulty(rate: f64, shake_rad: f64) -> Clip {
        let times = Times::Even { step_secs: 1.0 / rate, count: 1500 };
        let mut state = 3_u64;
        let mut noise = || {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
            (state >> 40) as f64 / f64::from(1 << 23) - 1.0
        };
        let mut keys: Vec<Rotor> = (0..1500)
            .map(|key| {
                let secs = f64::from(key) / rate;
                let shake = if (600..700).contains(&key) { shake_rad } else { 0.001 };
                let swing = Bivector::new((2.1 * secs).sin(), 0.4 * (3.3 * secs).cos(), shake * noise());
                Rotor::from_plane_angles(swing + Bivector::new(shake * noise(), shake * noise(), 0.0))
            })
            .collect();
        let flip = Rotor::new(0.0, 0.0, 1.0, 0.0);
        keys[200..260].iter_mut().for_each(|own| *own = *own * flip);
        keys[301..330].iter_mut().for_each(|own| *own = -*own);
        let held = keys[400];
        keys[401..440].fill(held);
        keys[900] = Rotor::new(f64::NAN, 0.0, 0.0, 0.0);
        for (key, degrees) in [(5, 30.0), (500, 12.0), (501, 11.0), (777, 4.0), (1100, 60.0), (1498, 50.0)] {
            keys[key] =
                keys[key] * Rotor::from_plane_angles(Bivector::new(0.0, f64::to_radians(degrees), 0.0));
        }
        of_one_joint(times, rate, keys)
    }

    #[test]
    fn what_is_found_does_not_depend_on_what_is_known() {
        let mut told = BTreeSet::new();
        for (rate, shake_rad) in [(120.0, 0.03), (24.0, 0.08), (60.0, 0.01)] {
            let clip = faulty(rate, shake_rad);
            let mut blind = Outlines::new(1);
            let _ = blind.of(&clip, 0);
            blind.each_mut().into_iter().flatten().for_each(|own| own.blocks.fill(Block::UNKNOWN));
            for kind in SnagKind::ALL {
                let found = |outlines: &Outlines| {
                    find_with(View { clip: &clip, outlines }, 0, kind, &mut Memory::default())
                };
                let own = found(&Outlines::new(1));
                assert_eq!(own, found(&blind), "{kind} at {rate} a second");
                told.extend(own.iter().map(|snag| snag.kind));
            }
        }
        let wanted = [SnagKind::HalfTurn, SnagKind::Spike, SnagKind::Stuck, SnagKind::Jitter];
        assert!(wanted.iter().all(|kind| told.contains(kind)), "{told:?}");
    }
}
