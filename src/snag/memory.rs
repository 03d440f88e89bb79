//! What the finders of stored angles have in common, worked out once for a joint.

use std::cell::OnceCell;

use crate::clip::{Degrees, FileAngles};

use super::angle_steps::{SortedSteps, sorted_steps};
use super::branches::{Branches, follow, wide_steps};
use super::scan::Scan;

/// What was found about the stored angles of one joint. Good for as long as the angles are the very same; worked out anew when they are
/// others.
#[derive(Debug, Default)]
pub struct Memory(Option<Known>);

#[derive(Debug)]
struct Known {
    degrees: Degrees,
    wide: Vec<usize>,
    branches: OnceCell<Branches>,
    steps: OnceCell<SortedSteps>,
}

impl Memory {
    /// The keys into which the angles step widely: [`wide_steps`].
    pub(super) fn wide(&mut self, angles: &FileAngles) -> &[usize] {
        &self.known(angles).wide
    }

    pub(super) fn branches(&mut self, scan: &Scan<'_>, angles: &FileAngles) -> &Branches {
        self.known(angles).branches(scan, angles)
    }

    pub(super) fn steps(&mut self, scan: &Scan<'_>, angles: &FileAngles) -> &SortedSteps {
        let known = self.known(angles);
        known.steps.get_or_init(|| sorted_steps(scan, angles, known.branches(scan, angles)))
    }

    fn known(&mut self, angles: &FileAngles) -> &Known {
        if self.0.as_ref().is_some_and(|known| !known.degrees.is_same(&angles.degrees)) {
            self.0 = None;
        }
        self.0.get_or_insert_with(|| Known {
            degrees: angles.degrees.clone(),
            wide: wide_steps(&angles.degrees),
            branches: OnceCell::new(),
            steps: OnceCell::new(),
        })
    }
}

impl Known {
    fn branches(&self, scan: &Scan<'_>, angles: &FileAngles) -> &Branches {
        self.branches.get_or_init(|| follow(scan, angles, &self.wide))
    }
}
