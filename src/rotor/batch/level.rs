//! Which instructions a kernel may use.

use pulp::Arch;

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

    /// Runs what is inlined into `kernel` with these instructions.
    #[inline]
    pub(crate) fn run(self, kernel: impl FnOnce()) {
        match self.0 {
            Some(arch) => arch.dispatch(kernel),
            None => kernel(),
        }
    }
}
