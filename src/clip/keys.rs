//! The rotors of a track's keys.

use std::fmt;
use std::ops::Deref;
use std::sync::{Arc, OnceLock};

use crate::rotor::batch::Streams;
use crate::rotor::{EulerOrder, Rotor};

use super::angle_rows::rotors;
use super::degrees::Degrees;

/// The rotors of a track's keys as stored; to be read like a slice, shared when cloned.
///
/// Beside them lies what playing at many times needs of them, made when it is first asked for and shared with all clones:
/// [`Keys::sound`]. Keys never change in place, so that it can't grow stale.
#[derive(Clone)]
pub struct Keys(Arc<Inner>);

struct Inner {
    stored: OnceLock<Vec<Rotor>>,
    /// What they are made of when they are first asked for.
    angles: Option<(EulerOrder, Degrees)>,
    sound: OnceLock<Streams<f64, 4>>,
}

impl Keys {
    /// The rotors of a file's angles, to be made when they are first asked for.
    pub(super) fn of_angles(order: EulerOrder, degrees: Degrees) -> Self {
        let angles = Some((order, degrees));
        Self(Arc::new(Inner { stored: OnceLock::new(), angles, sound: OnceLock::new() }))
    }

    /// How many. They need not be made for it.
    pub fn len(&self) -> usize {
        let angles = || self.0.angles.as_ref().map_or(0, |(_, degrees)| degrees.len());
        self.0.stored.get().map_or_else(angles, Vec::len)
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// [`super::RotationTrack::sound_key`] of every key, in streams: unit, and what is not finite is its nearest sound
    /// neighbour before, else behind. It takes as much memory as the keys themselves.
    pub fn sound(&self) -> &Streams<f64, 4> {
        self.0.sound.get_or_init(|| {
            // Before the first sound key there is none to hold: that one serves.
            let mut last = self.iter().find_map(|key| key.try_normalize()).unwrap_or(Rotor::IDENTITY);
            Streams::from_rows(self.iter().map(|key| {
                last = key.try_normalize().unwrap_or(last);
                [last.s, last.yz, last.zx, last.xy]
            }))
        })
    }

    /// The rotors as a list of one's own: without a copy where nobody else holds them.
    pub fn into_vec(self) -> Vec<Rotor> {
        match Arc::try_unwrap(self.0) {
            Ok(Inner { stored, angles, .. }) => stored
                .into_inner()
                .unwrap_or_else(|| angles.map_or(Vec::new(), |(order, degrees)| rotors(order, &degrees))),
            Err(shared) => Self(shared).to_vec(),
        }
    }

    /// [`Keys::sound`] if it is there already.
    pub(super) fn sound_if_made(&self) -> Option<&Streams<f64, 4>> {
        self.0.sound.get()
    }
}

impl Deref for Keys {
    type Target = [Rotor];

    fn deref(&self) -> &[Rotor] {
        self.0.stored.get_or_init(|| {
            self.0.angles.as_ref().map_or(Vec::new(), |(order, degrees)| rotors(*order, degrees))
        })
    }
}

/// The list stays where it is.
impl From<Vec<Rotor>> for Keys {
    fn from(stored: Vec<Rotor>) -> Self {
        Self(Arc::new(Inner { stored: stored.into(), angles: None, sound: OnceLock::new() }))
    }
}

impl From<Arc<[Rotor]>> for Keys {
    fn from(stored: Arc<[Rotor]>) -> Self {
        stored.to_vec().into()
    }
}

impl<const N: usize> From<[Rotor; N]> for Keys {
    fn from(stored: [Rotor; N]) -> Self {
        stored.to_vec().into()
    }
}

impl From<&[Rotor]> for Keys {
    fn from(stored: &[Rotor]) -> Self {
        stored.to_vec().into()
    }
}

impl FromIterator<Rotor> for Keys {
    fn from_iter<I: IntoIterator<Item = Rotor>>(rotors: I) -> Self {
        rotors.into_iter().collect::<Vec<Rotor>>().into()
    }
}

impl PartialEq for Keys {
    fn eq(&self, other: &Self) -> bool {
        self[..] == other[..]
    }
}

impl fmt::Debug for Keys {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        self[..].fmt(formatter)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_change_never_meets_the_old_streams() {
        let keys = Keys::from([Rotor::new(0.0, 2.0, 0.0, 0.0), Rotor::new(f64::NAN, 0.0, 0.0, 0.0)]);
        assert_eq!(keys.sound().get(0), [0.0, 1.0, 0.0, 0.0]);
        assert_eq!(keys.sound().get(1), [0.0, 1.0, 0.0, 0.0]);
        assert!(keys.clone().sound_if_made().is_some(), "clones share what was made");
        let mut changed = keys.to_vec();
        changed[1] = Rotor::new(0.0, 0.0, 0.0, -3.0);
        let changed = Keys::from(changed);
        assert!(changed.sound_if_made().is_none());
        assert_eq!(changed.sound().get(1), [0.0, 0.0, 0.0, -1.0]);
    }

    #[test]
    fn a_list_of_its_own_is_the_same_list_or_a_copy() {
        let rotors = vec![Rotor::IDENTITY, Rotor::new(0.0, 1.0, 0.0, 0.0)];
        let place = rotors.as_ptr();
        let keys = Keys::from(rotors);
        let shared = keys.clone();
        let copy = keys.into_vec();
        assert_ne!(copy.as_ptr(), place);
        assert_eq!(shared, Keys::from(copy));
        assert_eq!(shared.into_vec().as_ptr(), place);
    }

    #[test]
    fn before_the_first_sound_key_that_one_serves() {
        let broken = Rotor::new(f64::NAN, 0.0, 0.0, 0.0);
        let keys: Keys = [broken, Rotor::new(0.0, 0.0, 0.5, 0.0)].into_iter().collect();
        assert_eq!(keys.sound().get(0), [0.0, 0.0, 1.0, 0.0]);
        assert_eq!(Keys::from([broken]).sound().get(0), [1.0, 0.0, 0.0, 0.0]);
        assert!(Keys::from(Vec::new()).sound().is_empty());
    }
}
