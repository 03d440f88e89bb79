//! The translations or scales of one joint over time.

use std::sync::Arc;

use glam::DVec3;

use super::times::{Place, Times};
use super::vector_keys::VectorKeys;

/// How a vector moves between keys, after glTF's three interpolations.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum VectorPath {
    /// Held until the next key.
    Hold,
    /// On a straight line.
    Straight,
    /// On a Hermite cubic with the file's tangents.
    Cubic,
}

/// Keys of one joint's translation or scale relative to its parent.
#[derive(Clone, Debug, PartialEq)]
pub struct VectorTrack {
    /// Key times in seconds.
    pub times: Times,
    /// A vector for each key.
    pub keys: VectorKeys,
    /// The path between keys.
    pub path: VectorPath,
    /// In- and out-tangent of each key, per second; for [`VectorPath::Cubic`] alone.
    pub tangents: Option<Arc<[[DVec3; 2]]>>,
}

impl VectorTrack {
    /// A track with straight lines between.
    pub fn straight(times: Times, keys: impl Into<VectorKeys>) -> Self {
        Self { times, keys: keys.into(), path: VectorPath::Straight, tangents: None }
    }

    /// The vector at `time_secs`; the end keys are held outside. A key that is not finite gives way to its neighbour.
    /// `None` without a sound key.
    pub fn at(&self, time_secs: f64) -> Option<DVec3> {
        let (key, share) = match self.times.place(time_secs)? {
            Place::At(key) => return self.sound_key(key),
            Place::Between(key, share) => (key, share),
        };
        let (a, b) = (self.sound_key(key)?, self.sound_key(key + 1)?);
        Some(match (self.path, &self.tangents) {
            (VectorPath::Hold, _) => a,
            (VectorPath::Cubic, Some(tangents)) => {
                let secs = self.times.at(key + 1) - self.times.at(key);
                let (t, t2, t3) = (share, share * share, share * share * share);
                a * (2.0 * t3 - 3.0 * t2 + 1.0)
                    + tangents[key][1] * (secs * (t3 - 2.0 * t2 + t))
                    + b * (3.0 * t2 - 2.0 * t3)
                    + tangents[key + 1][0] * (secs * (t3 - t2))
            }
            (VectorPath::Straight | VectorPath::Cubic, _) => a * (1.0 - share) + b * share,
        })
    }

    fn sound_key(&self, key: usize) -> Option<DVec3> {
        let sound = |key: usize| Some(self.keys.vector(key)).filter(|v| v.is_finite());
        let before = || (0..key).rev().find_map(sound);
        let after = || (key + 1..self.keys.len()).find_map(sound);
        sound(key).or_else(before).or_else(after)
    }
}
