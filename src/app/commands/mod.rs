//! Everything a person can ask for: the actions of menus and keys, and the commands with what they are about.

use std::path::PathBuf;

use crate::exchange::csv::{NamedColumns, TimeUnit};
use crate::raster::Camera;
use crate::scene::{Edit, PassId, PassStep};
use crate::skeleton::RestChoice;

use super::file_picker::Purpose;
use super::jobs::Slot;
use super::view_models::{SnagFilter, SnagOrder, TimeWindow};

mod action;
mod blend;
mod carry;
mod curves;
mod settings;
mod situation;
mod space;
mod table;
mod time;

pub use action::{Action, Menu};
pub use blend::BlendCommand;
pub use carry::{CarryCommand, CarrySheet};
pub use curves::{CurveAction, CurveCommand};
pub use settings::SettingsCommand;
pub use situation::Situation;
pub use space::{SpaceAction, SpaceCommand};
pub use table::{Entry, HOLD_FOR_SOURCE, MORE_KEYS, TABLE};
pub(crate) use time::LEARNED;
pub use time::{Offer, TimeCommand};

/// What panels ask for. It is done between frames, so that no panel sees a half-changed world.
#[derive(Clone, Debug)]
pub enum Command {
    /// An entry of the table.
    Do(Action),
    /// Change the document.
    Edit(Edit),
    /// Work on another clip.
    ShowClip(usize),
    /// Choose a joint, or none.
    ChooseJoint(Option<usize>),
    /// Add a joint to the chosen ones, or take it out.
    ChooseAlso(usize),
    /// What the rotation curves ask for.
    Curve(CurveCommand),
    /// Choose a snag and go there.
    ChooseSnag(usize),
    /// Move the playhead, seconds; onto the nearest frame.
    Scrub(f64),
    /// Show another stretch of time.
    ShowTime(TimeWindow),
    /// Play between these times only.
    SetLoopRange(Option<(f64, f64)>),
    /// Play at this many times the true speed.
    SetSpeed(f64),
    /// Which snags are listed.
    SetFilter(SnagFilter),
    /// How they are ordered.
    SetOrder(SnagOrder),
    /// Hide or show what hangs below a joint.
    Fold(usize),
    /// Show a pass with other parameters while one is dragged; nothing is recorded until it is let go.
    PreviewPass(PassId, Box<PassStep>),
    /// Go to a step of the history.
    GoToStep(usize),
    /// Take away the message on top.
    Dismiss(usize),
    /// Show or hide all that a message has to tell.
    UnfoldMessage(usize),
    /// Set the camera.
    SetCamera(Camera),
    /// The camera has been brought to the figure.
    FigureIsFitted {
        /// The camera.
        camera: Camera,
        /// Whether it goes along.
        follows: bool,
    },
    /// The pointer is over a joint.
    HoverJoint(usize),
    /// Open files.
    OpenFiles(Vec<PathBuf>),
    /// Open a CSV file with these columns, in this unit of time.
    OpenTable(PathBuf, NamedColumns, Option<TimeUnit>),
    /// Save the scene there.
    SaveTo(PathBuf),
    /// Export the clip there.
    ExportTo {
        /// The file.
        path: PathBuf,
        /// Whether a proof sheet is written beside it.
        has_proof: bool,
    },
    /// Use this file as a source.
    RelocateTo(usize, PathBuf),
    /// Take the skeleton of the table on show from this file; without one as it is by itself.
    UseSkeleton(Option<PathBuf>),
    /// Measure the turns of the clip on show, and of all others of its file, from this pose.
    ChooseRest(RestChoice),
    /// Ask with the desktop's own dialog.
    Browse(Purpose),
    /// Take away the dialog.
    CloseDialog,
    /// Save, then do what was asked for.
    SaveAndGoOn,
    /// Do what was asked for without saving.
    DiscardAndGoOn,
    /// Stop a job.
    Cancel(Slot),
    /// Change what is remembered from one run to the next.
    Settings(SettingsCommand),
    /// Choices of time and joints, the turn map, the snag list.
    Time(TimeCommand),
    /// About blends and loops.
    Blend(BlendCommand),
    /// About carrying the clip to another skeleton.
    Carry(CarryCommand),
    /// What the skeleton view asks for.
    Space(SpaceCommand),
}
