//! Bulk kernels: the same operation on many rotations at once, several times as fast as one after the other.
//!
//! The parts lie in *streams*: all scalar parts in a row, all parts in the plane yz in a row, and so on ([`Streams`]). Every
//! kernel is one branch-free formula made of sums, products and polynomials, so that the compiler computes it for several
//! rotations in one instruction. A [`Level`] says which instructions: AVX-512 or AVX2 where the machine has them, else
//! those that every x86-64 has. All give the same bits, since no product is fused with a sum.
//!
//! The rare argument that a formula does not cover (a turn of many rounds, say) goes through the functions of
//! [`crate::rotor`] instead; so every kernel takes whatever they take, unit rotors provided.
//!
//! ```
//! use turnwright::rotor::batch::{self, Level, Streams};
//!
//! // 1000 steps from no turn to 90° in the plane xy.
//! let half = std::f64::consts::FRAC_1_SQRT_2;
//! let from = Streams::repeated([1.0, 0.0, 0.0, 0.0], 1000);
//! let to = Streams::repeated([half, 0.0, 0.0, -half], 1000);
//! let shares: Vec<f64> = (0..1000).map(|i| f64::from(i) / 999.0).collect();
//! let mut steps = Streams::zeros(1000);
//! batch::slerp(Level::best(), from.parts(), to.parts(), &shares, steps.parts_mut());
//! assert!((steps.get(333)[0] - (15.0_f64).to_radians().cos()).abs() < 1e-15);
//! ```

#![expect(
    clippy::needless_pass_by_value,
    reason = "a row of borrowed columns is handed on as one, and seen through once it is inlined"
)]
#![expect(
    clippy::inline_always,
    reason = "a part that stays a function of its own is built for the baseline, and keeps the loop around it from being widened"
)]

mod blocks;
mod coefficients;
mod euler;
mod exp_log;
mod level;
mod product;
mod real;
mod slerp;
mod slope;
mod streams;
mod tree;
mod turn;

pub use euler::{euler_angles, euler_rotors};
pub use exp_log::{exp, log};
pub use level::Level;
pub use product::{apply, compose};
pub use real::Real;
pub use slerp::{slerp, slerp_at_middle, squad};
pub(super) use slope::turns_with_rests;
pub use streams::{Parts, PartsMut, Streams};
pub use tree::{Bone, Place, TREE_ROWS, TREE_TILES, Turns, World, place_tree};
pub use turn::turns;
