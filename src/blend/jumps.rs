//! Where a blend steps and none of its clips does.

use crate::clip::Clip;
use crate::skeleton::Skeleton;

/// A step of one joint from a frame to the next.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Jump {
    /// The joint.
    pub joint: usize,
    /// The time of the frame after it, seconds.
    pub secs: f64,
    /// How far it turns, radians.
    pub turn_rad: f64,
}

/// Smaller steps are no jumps, in radians (60°).
const LEAST_RAD: f64 = 1.05;
/// A jump is so many times what the joint does in any of the clips: paces differ up to threefold in step.
const MOST_TIMES: f64 = 3.0;

/// The largest step in `made` that none of its clips comes near. Where clips are half a turn apart in a joint there is no nearer side: it
/// changes from one frame to the next, and a mix with it. All clips have one skeleton.
pub fn worst_jump(made: &Clip, clips: &[&Clip]) -> Option<Jump> {
    let jumps = made.skeleton.listed().filter_map(|joint| {
        let found = largest_step(made, joint).filter(|jump| jump.turn_rad > LEAST_RAD)?;
        let own = clips.iter().filter_map(|clip| largest_step(clip, joint)).map(|jump| jump.turn_rad);
        (found.turn_rad > MOST_TIMES * own.fold(0.0, f64::max)).then_some(found)
    });
    jumps.max_by(|a, b| a.turn_rad.total_cmp(&b.turn_rad))
}

fn largest_step(clip: &Clip, joint: usize) -> Option<Jump> {
    clip.rotation(joint).filter(|track| track.keys.len() > 1)?;
    let times: Vec<f64> = clip.grid.times.iter().collect();
    let turns = clip.rotations_at(joint, &times);
    let steps = turns.windows(2).zip(&times[1..]);
    let steps = steps.map(|(pair, &secs)| Jump { joint, secs, turn_rad: pair[0].turn_to(pair[1]) });
    steps.filter(|jump| jump.turn_rad.is_finite()).max_by(|a, b| a.turn_rad.total_cmp(&b.turn_rad))
}

impl Jump {
    /// What happens, for people.
    pub fn words(&self, skeleton: &Skeleton) -> String {
        format!(
            "`{}` turns by {:.0}° within a frame at {:.3} s, as none of the clips does: they are half a turn apart there, so the nearer side \
             changes",
            skeleton.label(self.joint),
            self.turn_rad.to_degrees(),
            self.secs
        )
    }
}
