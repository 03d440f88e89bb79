//! How the rotation curves are set, and what is chosen on them.

use super::super::view_models::KeyChoice;

/// The chosen keys, and the habits of the person who works on curves.
#[derive(Clone, Debug, PartialEq)]
pub struct CurveHabits {
    /// The chosen keys.
    pub keys: KeyChoice,
    /// The chosen segment: its joint, and the second at which its first key stands.
    pub segment: Option<(usize, f64)>,
    /// Which of the curves the keyboard moves, counted in the order of the view.
    pub line: usize,
    /// The lowest and the highest value on screen; `None`: as the curves on screen ask for.
    pub values: Option<[f64; 2]>,
    /// Whether moved keys come to stand on frames.
    pub snaps_to_frames: bool,
    /// The cut-off that a smoothing by hand begins with, hertz.
    pub smooth_hz: f64,
    /// The bound that a reduction by hand begins with, degrees.
    pub reduce_deg: f64,
}

impl Default for CurveHabits {
    fn default() -> Self {
        Self {
            keys: KeyChoice::default(),
            segment: None,
            line: 0,
            values: None,
            snaps_to_frames: true,
            smooth_hz: 6.0,
            reduce_deg: 0.5,
        }
    }
}

impl CurveHabits {
    /// The habits alone, for another clip or other joints.
    #[must_use]
    pub fn without_choice(&self) -> Self {
        Self { keys: KeyChoice::default(), segment: None, values: None, ..self.clone() }
    }
}
