//! What every module of the suite needs: the folder of outside files, and comparing with a tolerance.

use std::fs::File;
use std::io::BufReader;
use std::path::{Path, PathBuf};

use glam::{DMat3, DVec3};
use serde_json::Value;
use turnwright::rotor::{Bivector, Rotor};

/// The file or folder `path` of the outside test material, which lies beside the crate and is no part of it.
///
/// On a machine that has none of it, prints `skipped: …` and gives `None`, and the test is to return. Where the
/// environment variable `CI` is set a missing file is a failure.
#[expect(clippy::print_stdout, reason = "the runner shows it beside the test that was skipped")]
#[track_caller]
pub(crate) fn shared(path: &str) -> Option<PathBuf> {
    let full = Path::new(env!("CARGO_MANIFEST_DIR")).join("../shared").join(path);
    if full.exists() {
        return Some(full);
    }
    assert!(std::env::var_os("CI").is_none(), "CI needs {}", full.display());
    println!("skipped: {} is not on this machine", full.display());
    None
}

/// The JSON file `path` of the outside test material; `None` as with [`shared`].
#[track_caller]
pub(crate) fn shared_json(path: &str) -> Option<Value> {
    let full = shared(path)?;
    let file = File::open(&full).expect("an existing file opens");
    Some(serde_json::from_reader(BufReader::new(file)).expect("the outside file is JSON"))
}

/// How far two values are apart, in the unit that suits them.
pub(crate) trait Distance {
    /// 0 for equal; NaN, and so never close, when either is NaN.
    fn distance_to(&self, other: &Self) -> f64;
}

impl Distance for f64 {
    fn distance_to(&self, other: &Self) -> f64 {
        (self - other).abs()
    }
}

impl Distance for DVec3 {
    fn distance_to(&self, other: &Self) -> f64 {
        let d = *self - *other;
        d.x.hypot(d.y).hypot(d.z)
    }
}

impl Distance for Bivector {
    fn distance_to(&self, other: &Self) -> f64 {
        (*self - *other).length()
    }
}

impl<const N: usize> Distance for [f64; N] {
    /// The largest difference of two entries.
    fn distance_to(&self, other: &Self) -> f64 {
        largest(self.iter().zip(other).map(|(a, b)| (a - b).abs()))
    }
}

impl Distance for DMat3 {
    /// The largest difference of two entries.
    fn distance_to(&self, other: &Self) -> f64 {
        largest(self.to_cols_array().iter().zip(other.to_cols_array()).map(|(a, b)| (a - b).abs()))
    }
}

impl Distance for Rotor {
    /// The turn between two rotations in radians; `R` and `−R` are one rotation. Unlike an arc cosine it is accurate
    /// near 0, and unlike the code under test it needs no product: `4 atan2(|p − q|, |p + q|)`.
    fn distance_to(&self, other: &Self) -> f64 {
        let (p, q) = (self.to_xyzw(), other.to_xyzw());
        let length = |sign: f64| (0..4).fold(0.0_f64, |sum, i| sum.hypot(p[i] + sign * q[i]));
        let (difference, sum) = (length(-1.0), length(1.0));
        // The smaller of the two belongs to the sign with which they are near. `min` and `max` lose a NaN, the sum keeps it.
        4.0 * difference.min(sum).atan2(difference.max(sum)) + 0.0 * (difference + sum)
    }
}

/// The largest of all, or NaN if there is one.
pub(crate) fn largest(values: impl Iterator<Item = f64>) -> f64 {
    values.fold(0.0, |largest, value| if value > largest || value.is_nan() { value } else { largest })
}

/// `assert_close!(found, expected, tolerance)`: fails with both values and their [`Distance`].
/// More arguments are a message, as in `assert!`.
macro_rules! assert_close {
    ($found:expr, $expected:expr, $tolerance:expr $(,)?) => {
        $crate::support::assert_close!($found, $expected, $tolerance, "{}", stringify!($found))
    };
    ($found:expr, $expected:expr, $tolerance:expr, $($message:tt)+) => {{
        let (found, expected, tolerance): (_, _, f64) = ($found, $expected, $tolerance);
        let distance = $crate::support::Distance::distance_to(&found, &expected);
        assert!(
            distance <= tolerance,
            "{}\n   found {found:?}\nexpected {expected:?}\n   apart {distance:e}, allowed {tolerance:e}",
            format_args!($($message)+),
        );
    }};
}
pub(crate) use assert_close;

/// Counts the cases of one kind and keeps the worst, so that a table that has run empty fails, and so that the report
/// says how much of each tolerance is used.
pub(crate) struct Tally {
    kind: &'static str,
    cases: usize,
    worst: f64,
    worst_case: String,
}

impl Tally {
    pub(crate) fn new(kind: &'static str) -> Self {
        Self { kind, cases: 0, worst: 0.0, worst_case: "none".to_owned() }
    }

    /// One case: fails when `error` is above `tolerance`, or NaN.
    #[track_caller]
    pub(crate) fn check(&mut self, case: &str, error: f64, tolerance: f64) {
        assert!(error <= tolerance, "{} {case}: error {error:e}, allowed {tolerance:e}", self.kind);
        let used = if tolerance > 0.0 { error / tolerance } else { 0.0 };
        if used > self.worst {
            self.worst = used;
            case.clone_into(&mut self.worst_case);
        }
        self.cases += 1;
    }

    /// Prints the count and the worst case; fails when the number of checks is not the one expected, or 0.
    #[expect(clippy::print_stdout, reason = "the measured accuracy is what the test is for")]
    #[track_caller]
    pub(crate) fn finish(self, expected_cases: usize) {
        println!(
            "{}: {} cases, at worst {:.3} of the tolerance ({})",
            self.kind, self.cases, self.worst, self.worst_case
        );
        assert!(self.cases > 0, "{}: no case ran", self.kind);
        assert_eq!(self.cases, expected_cases, "{}: number of cases", self.kind);
    }
}

/// A JSON number; the file is ours to trust, so anything else is a failure.
#[track_caller]
pub(crate) fn number(value: &Value) -> f64 {
    value.as_f64().unwrap_or_else(|| panic!("expected a number, found {value}"))
}

/// A JSON list of exactly `N` numbers.
#[track_caller]
pub(crate) fn numbers<const N: usize>(value: &Value) -> [f64; N] {
    let list: Vec<f64> = list(value).iter().map(number).collect();
    list.try_into().unwrap_or_else(|_| panic!("expected {N} numbers, found {value}"))
}

/// A JSON list.
#[track_caller]
pub(crate) fn list(value: &Value) -> &[Value] {
    value.as_array().unwrap_or_else(|| panic!("expected a list, found {value}"))
}

/// A quaternion `[x, y, z, w]` as a unit rotor: the outside files ask for normalising first.
#[track_caller]
pub(crate) fn unit_rotor(value: &Value) -> Rotor {
    Rotor::from_xyzw(numbers(value)).try_normalize().unwrap_or_else(|| panic!("no rotation: {value}"))
}

#[test]
fn a_missing_file_is_skipped_here_and_a_failure_in_ci() {
    let asked = std::panic::catch_unwind(|| shared("checks/no such file"));
    match std::env::var_os("CI") {
        Some(_) => assert!(asked.is_err(), "CI has to fail: {asked:?}"),
        None => assert_eq!(asked.expect("no failure on a newcomer's machine"), None),
    }
}

#[test]
fn a_value_that_is_no_number_is_never_close() {
    assert!(f64::NAN.distance_to(&1.0).is_nan());
    assert!([1.0, f64::NAN, 2.0].distance_to(&[1.0, 1.0, 2.0]).is_nan());
    assert!(Rotor::new(1.0, f64::NAN, 0.0, 0.0).distance_to(&Rotor::IDENTITY).is_nan());
}

#[test]
fn the_turn_between_two_rotors_is_told_without_a_product() {
    // Common practice: the angle is twice that between the two points on the sphere of four dimensions.
    for turn in [0.0, 1e-300, 1e-9, 1.0, 3.0] {
        let rotor = Rotor::from_plane_angles(Bivector::new(0.0, turn, 0.0));
        for sign in [1.0, -1.0] {
            let found = rotor.scale(sign).distance_to(&Rotor::IDENTITY);
            assert!((found - turn).abs() <= 1e-15 * turn, "{found} for {turn}");
        }
    }
}
