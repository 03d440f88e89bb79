//! Slerp between keys at many places, from streams to streams.

use crate::rotor::Rotor;
use crate::rotor::batch::{self, Level, Parts, PartsMut, Streams};

use super::places::{Column, Places, TILE};

/// Room for what is computed together.
pub(super) struct Sampler {
    /// The keys before and behind.
    ends: [[Column; 4]; 2],
    shares: Column,
    between: [Column; 4],
    own: [Column; 4],
    /// Which of the places are between two keys.
    indices: [usize; TILE],
}

impl Sampler {
    pub(super) fn new() -> Self {
        let zero = [0.0; TILE];
        Self { ends: [[zero; 4]; 2], shares: zero, between: [zero; 4], own: [zero; 4], indices: [0; TILE] }
    }

    /// The turns at all places, of which there are as many as `out` is long. `keys` are unit, and not none. On a key it is the key's
    /// own, bit for bit.
    pub(super) fn sample(&mut self, keys: &Streams<f64, 4>, places: &Places, out: PartsMut<'_, f64, 4>) {
        if places.are_double {
            self.sample_double(keys, places, out);
        } else {
            self.sample_any(keys, places, out);
        }
    }

    /// As [`Sampler::sample`], behind what was `found` so far.
    pub(super) fn append(&mut self, keys: &Streams<f64, 4>, places: &Places, found: &mut Vec<Rotor>) {
        let len = places.len;
        let rotor =
            |[s, yz, zx, xy]: Parts<'_, f64, 4>, row: usize| Rotor::new(s[row], yz[row], zx[row], xy[row]);
        if !places.are_double {
            let mut tile = [[0.0; TILE]; 4];
            self.sample_any(keys, places, tile.each_mut().map(|stream| &mut stream[..len]));
            let parts = tile.each_ref().map(|stream| &stream[..len]);
            found.extend((0..len).map(|row| rotor(parts, row)));
            return;
        }
        let (first, phase, middles) = self.middles(keys, places);
        let keys = keys.parts().map(|stream| &stream[first + phase..first + phase + len - middles]);
        let between = self.between.each_ref().map(|stream| &stream[..middles]);
        let (before, behind) = if phase == 0 { (keys, between) } else { (between, keys) };
        found.extend((0..len / 2).flat_map(|row| [rotor(before, row), rotor(behind, row)]));
        if len % 2 == 1 {
            found.push(rotor(before, len / 2));
        }
    }

    /// Computes what lies between the keys. Gives the key at or before the first place, 1 when that is between two keys, and how many
    /// are.
    fn middles(&mut self, keys: &Streams<f64, 4>, places: &Places) -> (usize, usize, usize) {
        let len = places.len;
        let (first, shares) = (places.keys[0], &places.shares[..len]);
        // 1 when it begins between two keys.
        let phase = usize::from(shares[0] != 0.0);
        let middles = usize::midpoint(len, phase);
        for (own, share) in self.shares.iter_mut().zip(shares[1 - phase..].iter().step_by(2)) {
            *own = *share;
        }
        let parts = keys.parts();
        batch::slerp_at_middle(
            Level::best(),
            parts.map(|stream| &stream[first..first + middles]),
            parts.map(|stream| &stream[first + 1..first + 1 + middles]),
            &self.shares[..middles],
            self.between.each_mut().map(|stream| &mut stream[..middles]),
        );
        (first, phase, middles)
    }

    /// Where keys and the middles between them take turns nothing has to be looked up.
    fn sample_double(&mut self, keys: &Streams<f64, 4>, places: &Places, out: PartsMut<'_, f64, 4>) {
        let len = places.len;
        let (first, phase, middles) = self.middles(keys, places);
        for ((out, keys), between) in out.into_iter().zip(keys.parts()).zip(&self.between) {
            let keys = &keys[first + phase..first + phase + len - middles];
            let between = &between[..middles];
            let (before, behind) = if phase == 0 { (keys, between) } else { (between, keys) };
            let (pairs, last) = out.as_chunks_mut::<2>();
            for ((pair, before), behind) in pairs.iter_mut().zip(before).zip(behind) {
                *pair = [*before, *behind];
            }
            if let [last] = last {
                *last = before[len / 2];
            }
        }
    }

    fn sample_any(&mut self, keys: &Streams<f64, 4>, places: &Places, out: PartsMut<'_, f64, 4>) {
        let len = places.len;
        let count = keys.len();
        let parts = keys.parts().map(|stream| &stream[..count]);
        let last = count - 1;
        let rows = places.keys[..len].iter().zip(&places.shares);
        let (own, [from, to]) = (&mut self.own, &mut self.ends);
        let mut count = 0;
        for (index, (&key, &share)) in rows.enumerate() {
            // Both are below `TILE` anyway; this lets the compiler know.
            let (index, row) = (index % TILE, count % TILE);
            let next = (key + 1).min(last);
            for part in 0..4 {
                let at = parts[part][key];
                own[part][index] = at;
                from[part][row] = at;
                to[part][row] = parts[part][next];
            }
            self.shares[row] = share;
            self.indices[row] = index;
            // On a key the row is written over by the next.
            count += usize::from(share != 0.0);
        }
        let [from, to] = self.ends.each_ref().map(|tile| tile.each_ref().map(|stream| &stream[..count]));
        let between = self.between.each_mut().map(|stream| &mut stream[..count]);
        batch::slerp(Level::best(), from, to, &self.shares[..count], between);
        for ((out, own), between) in out.into_iter().zip(&mut self.own).zip(&self.between) {
            if count == len {
                out.copy_from_slice(&between[..len]);
                continue;
            }
            for (&index, part) in self.indices[..count].iter().zip(between) {
                own[index % TILE] = *part;
            }
            out.copy_from_slice(&own[..len]);
        }
    }
}
