//! What the finders of stored angles have in common, worked out once for a joint.

use crate::clip::{Degrees, FileAngles};

use super::angle_steps::{SortedSteps, sorted_steps};
use super::branches::{Branches, follow};
use super::scan::Scan;

/// What was found about the stored angles of one joint. Good for as long as the angles are the very same; worked out anew when they are
/// others.
#[derive(Debug, Default)]
pub struct Memory(Option<Known>);

#[derive(Debug)]
struct Known {
    degrees: Degrees,
    branches: Branches,
    steps: SortedSteps,
}

impl Memory {
    pub(super) fn branches(&mut self, scan: &Scan<'_>, angles: &FileAngles) -> &Branches {
        &self.known(scan, angles).branches
    }

    pub(super) fn steps(&mut self, scan: &Scan<'_>, angles: &FileAngles) -> &SortedSteps {
        &self.known(scan, angles).steps
    }

    fn known(&mut self, scan: &Scan<'_>, angles: &FileAngles) -> &Known {
        if self.0.as_ref().is_some_and(|known| !known.degrees.is_same(&angles.degrees)) {
            self.0 = None;
        }
        self.0.get_or_insert_with(|| {
            let branches = follow(scan, angles);
            let steps = sorted_steps(scan, angles, &branches);
            Known { degrees: angles.degrees.clone(), branches, steps }
        })
    }
}
