//! What the joints of a clip have found out about their jumps, each kept for the others to ask.

use std::sync::OnceLock;

use crate::skeleton::{Mirror, Skeleton};

use super::super::scan::Scan;
use super::{Alone, jumps};

/// The jumps of the joints of one clip, worked out when they are first asked for. Good for as long as no joint changes.
#[derive(Debug)]
pub struct Flips {
    jumps: Vec<OnceLock<Vec<usize>>>,
    alone: Vec<OnceLock<Alone>>,
    mirror: OnceLock<Option<Mirror>>,
}

impl Flips {
    /// Of a clip with so many joints; nothing is known yet.
    pub fn new(joints: usize) -> Self {
        Self {
            jumps: (0..joints).map(|_| OnceLock::new()).collect(),
            alone: (0..joints).map(|_| OnceLock::new()).collect(),
            mirror: OnceLock::new(),
        }
    }

    /// Keys into which a joint jumps.
    pub(super) fn jumps(&self, scan: &Scan<'_>) -> &[usize] {
        self.jumps[scan.joint].get_or_init(|| jumps(scan))
    }

    /// What is known about a joint's runs as long as nothing is asked of those above it.
    pub(super) fn alone(&self, scan: &Scan<'_>, make: impl FnOnce() -> Alone) -> &Alone {
        self.alone[scan.joint].get_or_init(make)
    }

    pub(super) fn mirror(&self, skeleton: &Skeleton) -> Option<&Mirror> {
        self.mirror.get_or_init(|| Mirror::of(skeleton)).as_ref()
    }
}
