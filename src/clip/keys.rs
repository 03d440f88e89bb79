//! The rotors of a track's keys.

use std::fmt;
use std::ops::Deref;
use std::sync::{Arc, OnceLock};

use crate::rotor::batch::Streams;
use crate::rotor::{EulerOrder, Rotor};

use super::angle_rows::{Signs, rotor, rotors};
use super::degrees::Degrees;

/// The rotors of a track's keys as stored; to be read like a slice, shared when cloned.
///
/// Beside them lies what playing at many times needs of them, made when it is first asked for and shared with all clones:
/// [`Keys::sound`]. Keys never change in place, so that it can't grow stale.
///
/// A number of one digit takes two bytes of a file, a rotor thirty-two in memory. So keys may hold what their file holds alone; the
/// rotors are made when they are first read as a slice. [`Keys::rotor`] makes a single one and keeps nothing.
#[derive(Clone)]
pub struct Keys(Arc<Inner>);

struct Inner {
    stored: OnceLock<Vec<Rotor>>,
    /// What they are made of when they are first asked for.
    made_of: MadeOf,
    /// Whether playing at many times is to leave [`Keys::sound`] alone.
    is_lean: bool,
    sound: OnceLock<Streams<f64, 4>>,
}

enum MadeOf {
    /// They are stored.
    Nothing,
    /// A file's angles, and which of their rotors take the other sign.
    Angles(EulerOrder, Degrees, OnceLock<Signs>),
    /// A file's whole numbers x, y, z, w, and the one that stands for 1.
    Whole(Arc<[[i16; 4]]>, i16),
}

impl MadeOf {
    fn len(&self) -> usize {
        match self {
            Self::Nothing => 0,
            Self::Angles(_, degrees, _) => degrees.len(),
            Self::Whole(numbers, _) => numbers.len(),
        }
    }

    fn all(&self) -> Vec<Rotor> {
        match self {
            Self::Nothing => Vec::new(),
            Self::Angles(order, degrees, _) => rotors(*order, degrees),
            Self::Whole(numbers, one) => numbers.iter().map(|own| of_whole(*own, *one)).collect(),
        }
    }

    /// # Panics
    /// When the key does not exist.
    fn rotor(&self, key: usize) -> Rotor {
        match self {
            Self::Nothing => panic!("there is no key {key}"),
            Self::Angles(order, degrees, signs) => {
                let signs = signs.get_or_init(|| Signs::of(*order, degrees));
                rotor(*order, degrees.triple(key)).scale(signs.of_key(key))
            }
            Self::Whole(numbers, one) => of_whole(numbers[key], *one),
        }
    }
}

/// As the table of glTF 2.0 section 3.11 has it; the quotient is rounded to 32 bits, so that a key written back as floats is the
/// key that was read.
fn of_whole(xyzw: [i16; 4], one: i16) -> Rotor {
    Rotor::from_xyzw(xyzw.map(|number| f64::from((f64::from(number) / f64::from(one)) as f32).max(-1.0)))
}

impl Keys {
    /// The rotors of a file's angles, to be made when they are first asked for.
    pub(super) fn of_angles(order: EulerOrder, degrees: Degrees) -> Self {
        Self::made_of(MadeOf::Angles(order, degrees, OnceLock::new()))
    }

    /// The rotors of a file's whole numbers x, y, z, w, of which `one` stands for 1, to be made when they are first asked for.
    pub fn of_whole(xyzw: Arc<[[i16; 4]]>, one: i16) -> Self {
        Self::made_of(MadeOf::Whole(xyzw, one))
    }

    fn made_of(made_of: MadeOf) -> Self {
        Self(Arc::new(Inner { stored: OnceLock::new(), made_of, is_lean: false, sound: OnceLock::new() }))
    }

    fn of_stored(stored: Vec<Rotor>) -> Self {
        let stored = OnceLock::from(stored);
        Self(Arc::new(Inner { stored, made_of: MadeOf::Nothing, is_lean: false, sound: OnceLock::new() }))
    }

    /// These keys, of which playing keeps nothing: several times as slow, for clips that would take many times their file.
    #[must_use]
    pub(super) fn lean(self) -> Self {
        match Arc::try_unwrap(self.0) {
            Ok(inner) => Self(Arc::new(Inner { is_lean: true, ..inner })),
            Err(shared) => Self(shared),
        }
    }

    /// How many. They need not be made for it.
    pub fn len(&self) -> usize {
        self.0.stored.get().map_or_else(|| self.0.made_of.len(), Vec::len)
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The rotor of a key, bit for bit as in the slice, without making all the others.
    ///
    /// # Panics
    /// When the key does not exist.
    pub fn rotor(&self, key: usize) -> Rotor {
        self.0.stored.get().map_or_else(|| self.0.made_of.rotor(key), |stored| stored[key])
    }

    /// [`super::RotationTrack::sound_key`] of every key, in streams: unit, and what is not finite is its nearest sound
    /// neighbour before, else behind. It takes as much memory as the keys themselves.
    pub fn sound(&self) -> &Streams<f64, 4> {
        self.0.sound.get_or_init(|| {
            let made;
            let keys: &[Rotor] = if let Some(stored) = self.0.stored.get() {
                stored
            } else {
                made = self.0.made_of.all();
                &made
            };
            // Before the first sound key there is none to hold: that one serves.
            let mut last = keys.iter().find_map(|key| key.try_normalize()).unwrap_or(Rotor::IDENTITY);
            Streams::from_rows(keys.iter().map(|key| {
                last = key.try_normalize().unwrap_or(last);
                [last.s, last.yz, last.zx, last.xy]
            }))
        })
    }

    /// The rotors as a list of one's own: without a copy where nobody else holds them.
    pub fn into_vec(self) -> Vec<Rotor> {
        match Arc::try_unwrap(self.0) {
            Ok(Inner { stored, made_of, .. }) => stored.into_inner().unwrap_or_else(|| made_of.all()),
            Err(shared) => Self(shared).to_vec(),
        }
    }

    /// [`Keys::sound`] if it is there already.
    pub(super) fn sound_if_made(&self) -> Option<&Streams<f64, 4>> {
        self.0.sound.get()
    }

    /// Whether [`Keys::sound`] is better left alone.
    pub(super) fn is_lean(&self) -> bool {
        self.0.is_lean
    }
}

impl Deref for Keys {
    type Target = [Rotor];

    fn deref(&self) -> &[Rotor] {
        self.0.stored.get_or_init(|| self.0.made_of.all())
    }
}

/// The list stays where it is.
impl From<Vec<Rotor>> for Keys {
    fn from(stored: Vec<Rotor>) -> Self {
        Self::of_stored(stored)
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
        let own = shared.into_vec();
        assert_eq!(own.as_ptr(), place);
    }

    #[test]
    fn a_single_key_is_that_of_the_slice_to_the_bit() {
        let bits = |key: Rotor| [key.s, key.yz, key.zx, key.xy].map(f64::to_bits);
        let check = |alone: Keys, listed: Keys| {
            let singles: Vec<_> = (0..alone.len()).map(|key| bits(alone.rotor(key))).collect();
            assert!(alone.0.stored.get().is_none(), "nothing was made for it");
            assert_eq!(singles, listed.iter().map(|key| bits(*key)).collect::<Vec<_>>());
        };
        // Steps of more than half a turn, so that signs change; more keys than a word has bits.
        let degrees: Vec<[f64; 3]> = (0..200).map(|i| [f64::from(i) * 77.0, f64::from(i % 7), 0.0]).collect();
        let of = || Keys::of_angles(EulerOrder::ZXY, degrees.clone().into());
        check(of(), of());
        let whole: Arc<[[i16; 4]]> = [[127, 0, -1, -128], [3, 4, 5, 6]].into();
        check(Keys::of_whole(Arc::clone(&whole), 127), Keys::of_whole(whole, 127));
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
