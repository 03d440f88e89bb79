//! How the skeleton view is set, and how a turn by hand behaves there.

use crate::rotor::Bivector;

/// In whose planes the discs of the chosen joint lie.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum TurnPlanes {
    /// The joint's own, as they lie at rest.
    #[default]
    Rest,
    /// The parent's.
    Parent,
    /// The scene's.
    World,
}

impl TurnPlanes {
    /// All, in the order of lists.
    pub const ALL: [Self; 3] = [Self::Rest, Self::Parent, Self::World];

    /// Its word.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Rest => "rest",
            Self::Parent => "parent",
            Self::World => "world",
        }
    }
}

/// A disc that turns the chosen joint.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Disc {
    /// In plane yz.
    Yz,
    /// In plane zx.
    Zx,
    /// In plane xy.
    #[default]
    Xy,
    /// About the limb.
    Twist,
    /// Wherever the pointer leads.
    Free,
}

impl Disc {
    /// All, in the order of lists.
    pub const ALL: [Self; 5] = [Self::Yz, Self::Zx, Self::Xy, Self::Twist, Self::Free];

    /// What is written beside it.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Yz => "yz",
            Self::Zx => "zx",
            Self::Xy => "xy",
            Self::Twist => "twist",
            Self::Free => "free",
        }
    }

    /// The plane it lies in, of area 1, and its place in the palette of planes; `None` for twist and free.
    pub const fn plane(self) -> Option<(Bivector, usize)> {
        match self {
            Self::Yz => Some((Bivector::new(1.0, 0.0, 0.0), 0)),
            Self::Zx => Some((Bivector::new(0.0, 1.0, 0.0), 1)),
            Self::Xy => Some((Bivector::new(0.0, 0.0, 1.0), 2)),
            Self::Twist | Self::Free => None,
        }
    }

    /// What a turn with it is called, for people: `in plane yz`.
    pub const fn words(self) -> &'static str {
        match self {
            Self::Yz => "in plane yz",
            Self::Zx => "in plane zx",
            Self::Xy => "in plane xy",
            Self::Twist => "about the limb",
            Self::Free => "freely",
        }
    }
}

/// Habits of the skeleton view. They stay from clip to clip.
#[derive(Clone, Debug, PartialEq)]
#[expect(clippy::struct_excessive_bools, reason = "independent switches, each with its own menu entry")]
pub struct SpaceHabits {
    /// In whose planes the discs lie.
    pub planes: TurnPlanes,
    /// The disc that the keys turn.
    pub disc: Disc,
    /// How far the keys turn, and what a held Ctrl snaps a drag to. Degrees.
    pub step_deg: f64,
    /// The discs are shown.
    pub shows_discs: bool,
    /// The way of the chosen joint's tip is shown.
    pub shows_path: bool,
    /// Poses before and after are shown.
    pub shows_neighbours: bool,
    /// Frames from one of those to the next.
    pub neighbour_frames: usize,
    /// The reach that the chosen joint's limit allows is shown.
    pub shows_reach: bool,
    /// All joints are named.
    pub shows_names: bool,
    /// The floor is shown.
    pub shows_floor: bool,
}

impl SpaceHabits {
    /// The steps that keys choose from, degrees.
    pub const STEPS_DEG: [f64; 6] = [0.5, 1.0, 5.0, 15.0, 45.0, 90.0];
    /// The smallest and the largest number of frames between neighbouring poses.
    pub const NEIGHBOUR_FRAMES: [usize; 2] = [1, 600];

    /// The next smaller or larger of the steps.
    pub fn other_step(&self, larger: bool) -> f64 {
        let mut steps = Self::STEPS_DEG.into_iter();
        let found = if larger {
            steps.find(|step| *step > self.step_deg + 1e-9)
        } else {
            steps.rfind(|step| *step < self.step_deg - 1e-9)
        };
        found.unwrap_or(self.step_deg)
    }
}

impl Default for SpaceHabits {
    fn default() -> Self {
        Self {
            planes: TurnPlanes::Rest,
            disc: Disc::Xy,
            step_deg: 5.0,
            shows_discs: true,
            shows_path: true,
            shows_neighbours: false,
            neighbour_frames: 5,
            shows_reach: true,
            shows_names: false,
            shows_floor: true,
        }
    }
}

/// Seconds from a soft push to where nothing is left of it, unless a person says otherwise.
pub const USUAL_FALLOFF_SECS: f64 = 0.4;
/// The shortest and the longest such time.
pub const FALLOFF_SECS: [f64; 2] = [0.02, 30.0];

/// The next shorter or longer falloff: the roundest steps of about a quarter.
pub fn other_falloff(secs: f64, longer: bool) -> f64 {
    const STEPS: [f64; 17] =
        [0.02, 0.04, 0.06, 0.1, 0.15, 0.2, 0.3, 0.4, 0.6, 0.8, 1.0, 1.5, 2.0, 3.0, 5.0, 10.0, 30.0];
    let mut steps = STEPS.into_iter();
    let found = if longer {
        steps.find(|step| *step > secs * 1.001)
    } else {
        steps.rfind(|step| *step < secs * 0.999)
    };
    found.unwrap_or(secs)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn steps_and_falloffs_go_up_and_down_and_stop_at_the_ends() {
        let habits = SpaceHabits::default();
        assert_eq!((habits.other_step(false), habits.other_step(true)), (1.0, 15.0));
        let widest = SpaceHabits { step_deg: 90.0, ..habits };
        assert_eq!(widest.other_step(true), 90.0);
        assert_eq!((other_falloff(0.4, true), other_falloff(0.4, false)), (0.6, 0.3));
        assert_eq!((other_falloff(30.0, true), other_falloff(0.02, false)), (30.0, 0.02));
        assert_eq!(other_falloff(0.33, true), 0.4);
    }
}
