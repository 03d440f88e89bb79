//! How a joint gets from key to key: which orientations (path), how fast along them (spacing), and how far round (meant turns).
//!
//! | kind | acts on | reaches the keys | no jump at keys in |
//! |---|---|---|---|
//! | hold | one segment | its first | – |
//! | slerp | one segment | yes | pose |
//! | squad | one segment and its neighbours' keys | yes | rate |
//! | cubic | one segment and its tangents | yes | as its tangents say |
//! | spline | a run of neighbouring segments of this kind | yes | rate, acceleration |
//! | B-spline | a run of neighbouring segments of this kind | the run's ends | rate, acceleration |
//!
//! Where a spline run gives way to another kind inside the track it has that neighbour's rate there. At the track's own ends,
//! and beside a held segment, it does what [`Segments::ends`] says; a held segment ends squad and B-spline runs in the same
//! way. A B-spline run reaches its end keys without acceleration.
//!
//! Spacing warps time inside a segment and nothing else, so it changes rates, also at keys, and never an orientation on the
//! way. A segment with meant turns is led through points on its arc, at most 120° apart: they are keys to squad, spline and
//! B-spline. Hold and cubic have none: nothing turns, or the file's own numbers say how.

mod edit;
mod kind;
mod lead;
mod peak;
mod play;
mod runs;
mod segments;
mod spacing;

pub use edit::PathError;
pub use kind::{PathKind, Paths};
pub use peak::Peak;
pub use segments::{MeantTurn, Segment, Segments};
pub use spacing::{Handles, Pace, Spacing, SpacingError};

pub(super) use edit::turn_of_travel;
pub(super) use play::piece_of;
