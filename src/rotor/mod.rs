//! Rotations as rotors: products, exp and log, slerp and squad, splines, means, swing and twist, Euler angles.
//!
//! Knows nothing of skeletons, files or screens. Angles are radians. The conventions and their map to quaternions
//! are on [`Rotor`].

pub mod batch;
mod bivector;
mod cumulative;
mod euler;
mod filter;
mod interpolate;
mod linear;
mod matrix;
mod mean;
mod motion;
#[expect(clippy::module_inception, reason = "the noun of the file is the noun of the layer")]
mod rotor;
mod slope;
mod spline;
mod spline_rates;
mod swing_twist;

pub use bivector::Bivector;
pub use cumulative::{BSplineEnds, RotationBSpline, b_spline, hermite, hermite_motion};
pub use euler::{Axis, EulerOrder, NoEulerOrder};
pub use filter::{KernelError, convolve};
pub use interpolate::{
    mean_rate, nlerp, parabola_rate, slerp, slerp_as_signed, slerp_motion, squad, squad_inner,
    squad_inner_uneven, squad_motion,
};
pub use mean::{Mean, chordal_mean, geodesic_mean};
pub use motion::Motion;
pub use rotor::Rotor;
pub use spline::{EndRate, EndRates, RotationSpline, SplineError};
pub use swing_twist::SwingTwist;
