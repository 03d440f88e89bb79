//! The pass that makes a loop and plays it several times over.

use std::sync::Arc;

use crate::blend;
use crate::clip::{self, Clip, Round};
use crate::mend::{LoopOptions, close_loop};
use crate::snag::LoopForm;

use super::error::PassError;
use super::kind::{Outcome, PassKind};
use super::number::PassNumber;
use super::others::Others;

/// Makes a clip close on itself, and repeats it.
#[derive(Clone, Debug, PartialEq)]
pub struct LoopPass {
    /// The part that is the loop, from where it begins to where it is to be in that pose again, seconds; `None` for the whole clip.
    pub part_secs: Option<[f64; 2]>,
    /// How what is missing at the seam is put in; `None` where the clip is left open.
    pub close: Option<Closing>,
    /// How often it is played, 1 or more; each round is set down where the one before has ended.
    pub rounds: usize,
}

/// How a seam is closed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Closing {
    /// For each joint by the size of what is missing.
    #[default]
    BySize,
    /// Over the whole length.
    Spread,
    /// Near the seam alone.
    Window,
}

impl Closing {
    /// The form for the mend; `None` by size.
    pub const fn form(self) -> Option<LoopForm> {
        match self {
            Self::BySize => None,
            Self::Spread => Some(LoopForm::Spread),
            Self::Window => Some(LoopForm::Window),
        }
    }
}

/// Joints that are apart by less at a seam do meet there for whoever reads of it, in radians (0.005°).
const MET_RAD: f64 = 9e-5;
/// More rounds than this, or more frames, are a slip of the hand.
const MOST_ROUNDS: usize = 1000;
const MOST_FRAMES: usize = 3_600_000;

/// What lies before the first frame of the motion.
fn calibration(first: usize) -> String {
    match first {
        1 => "the calibration pose of frame 0".to_owned(),
        first => format!("the calibration pose of frames 0 to {}", first - 1),
    }
}

impl Default for LoopPass {
    fn default() -> Self {
        Self { part_secs: None, close: Some(Closing::BySize), rounds: 1 }
    }
}

impl PassKind for LoopPass {
    fn title(&self) -> String {
        match (self.close, self.rounds) {
            (Some(_), 1) => "Close the loop".to_owned(),
            (Some(_), rounds) => format!("Close the loop, {rounds} rounds"),
            (None, rounds) => format!("Repeat, {rounds} rounds"),
        }
    }

    fn explanation(&self) -> &'static str {
        "Lets the end meet the start in pose and rate, the root's stride kept, and plays the clip several times over. Each \
         round walks on from where the one before has ended."
    }

    fn numbers(&self) -> Vec<PassNumber> {
        let mut numbers = vec![PassNumber::count("rounds", self.rounds)];
        if let Some([first, last]) = self.part_secs {
            numbers.extend([PassNumber::new("from", first, "s"), PassNumber::new("to", last, "s")]);
        }
        numbers
    }

    fn apply(&self, clip: &Arc<Clip>, _others: &dyn Others) -> Result<Outcome, PassError> {
        if !(1..=MOST_ROUNDS).contains(&self.rounds) {
            let found = self.rounds as f64;
            return Err(PassError::Parameter { name: "rounds", expected: "1 to 1000", found });
        }
        let mut notes = Vec::new();
        let mut made = match self.part_secs {
            None => (**clip).clone(),
            Some([from, to]) => {
                let end = clip.duration_secs;
                if !(0.0 <= from && from < to && from < end) {
                    let expected = "a part within the clip, its start before its end";
                    return Err(PassError::Parameter { name: "part", expected, found: from });
                }
                clip::cut(clip, from, to.min(end))
            }
        };
        if let Some(close) = self.close {
            let options = LoopOptions {
                form: close.form(),
                // A part ends in the pose it begins with; of a whole clip the motion tells.
                is_first_again: self.part_secs.map(|_| true),
                ..LoopOptions::default()
            };
            let first = Round::of(&made, options.up).first;
            if first > 0 && self.rounds > 1 {
                notes.push(format!("{} left out of the rounds", calibration(first)));
                made = clip::cut(&made, made.grid.time(first), made.duration_secs);
            } else if first > 0 {
                notes
                    .push(format!("the loop begins at frame {first}: {} stays as it is", calibration(first)));
            }
            let (closed, report) = close_loop(&made, &options);
            made = closed;
            let open: Vec<_> = report.seams.iter().filter(|(_, seam)| seam.turn.length() > MET_RAD).collect();
            let worst = open.iter().max_by(|a, b| a.1.turn.length().total_cmp(&b.1.turn.length()));
            if let Some((joint, seam)) = worst {
                notes.push(format!(
                    "{} joints did not meet at the seam, {} by {:.2} degrees",
                    open.len(),
                    made.skeleton.label(*joint),
                    seam.turn.length().to_degrees()
                ));
            }
            // A round takes its last frame for the next one's first.
            if !report.round.is_first_again && self.rounds > 1 {
                made = blend::with_first_again(&made)?;
            }
        }
        if made.grid.count().saturating_mul(self.rounds) > MOST_FRAMES {
            let found = self.rounds as f64;
            let expected = "so many that at most 3.6 million frames come of it";
            return Err(PassError::Parameter { name: "rounds", expected, found });
        }
        Ok(Outcome { clip: blend::repeat(&made, self.rounds)?, notes })
    }
}
