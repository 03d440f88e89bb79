//! Finding rotation faults. One file a kind; reads clips, never changes them.

mod angle_steps;
mod border;
mod branches;
mod broken_value;
mod find;
mod finding;
mod half_turn;
mod jitter;
mod kind;
mod long_way;
mod memory;
mod mirror;
mod mirrored_angles;
mod outline;
mod past_limit;
mod plane_turns;
mod poses;
mod progress;
mod roughness;
mod scan;
mod seam;
mod sign_flip;
mod slide;
mod spike;
mod stuck;
mod wrap;

pub use find::{find, find_in_clip, find_with, preset_limits};
pub use finding::{LoopClose, LoopForm, Plant, Remedy, Snag};
pub use half_turn::{Flips, find_half_turns};
pub use kind::{NoSuchKind, SnagKind};
pub use memory::Memory;
pub use outline::{Outline, Outlines};
pub use past_limit::find_past_limit;
pub(crate) use plane_turns::nearest_plane_angles;
pub use progress::{Cancelled, Progress, Unwatched};
pub use scan::View;

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use glam::DVec3;

    use crate::clip::{Clip, FrameGrid, JointTracks, RotationTrack, Times};
    use crate::rotor::Rotor;
    use crate::skeleton::{Joint, Skeleton};

    /// A clip of a joint by itself.
    pub(super) fn of_one_joint(times: Times, rate: f64, keys: Vec<Rotor>) -> Clip {
        let joint = Joint::placed("arm", 0, None, DVec3::ZERO);
        let rotation = Some(RotationTrack::from_rotors(times.clone(), keys));
        Clip {
            name: String::new(),
            skeleton: Arc::new(Skeleton::new(vec![joint]).unwrap()),
            joints: vec![Arc::new(JointTracks { rotation, ..JointTracks::default() })],
            duration_secs: times.at(times.len() - 1),
            grid: FrameGrid { times, rate },
        }
    }
}
