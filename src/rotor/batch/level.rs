//! Which instructions a kernel may use.

use pulp::Arch;
#[cfg(any(target_arch = "x86", target_arch = "x86_64"))]
use pulp::x86::{V3, V4};

/// Which instructions a kernel may use. The results are the same bits.
#[derive(Clone, Copy, Debug)]
pub struct Level(Option<Arch>);

impl Level {
    /// The widest instructions of this machine that the kernels are built for: AVX-512 or AVX2 on x86-64.
    #[must_use]
    pub fn best() -> Self {
        Self(Some(Arch::new()))
    }

    /// Only what every machine of this kind has (SSE2 on x86-64); for comparing.
    #[must_use]
    pub const fn baseline() -> Self {
        Self(None)
    }

    /// All levels that this machine has, by name, the narrowest first; for comparing.
    #[must_use]
    pub fn all() -> Vec<(&'static str, Self)> {
        let mut levels = vec![("baseline", Self::baseline())];
        #[cfg(any(target_arch = "x86", target_arch = "x86_64"))]
        {
            levels.extend(V3::try_new().map(|wide| ("AVX2", Self(Some(Arch::V3(wide))))));
            levels.extend(V4::try_new().map(|wide| ("AVX-512", Self(Some(Arch::V4(wide))))));
        }
        #[cfg(not(any(target_arch = "x86", target_arch = "x86_64")))]
        levels.push(("widest", Self::best()));
        levels
    }

    /// Runs what is inlined into `kernel` with these instructions.
    #[inline]
    pub(crate) fn run(self, kernel: impl FnOnce()) {
        match self.0 {
            Some(arch) => arch.dispatch(kernel),
            None => kernel(),
        }
    }
}
