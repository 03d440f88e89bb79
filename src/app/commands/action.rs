//! What a person can ask for without further words, and the menus that hold it.

use super::CurveAction;
use super::SpaceAction;

/// An action without parameters: an entry of the table.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
#[expect(missing_docs, reason = "each has its label and its tooltip in the table below")]
pub enum Action {
    Open,
    OpenPath,
    OpenDemo,
    ChooseClip,
    Save,
    SaveAs,
    Export,
    Relocate,
    TableSkeleton,
    Quit,
    Undo,
    Redo,
    History,
    AddResample,
    AddLimits,
    AddSmooth,
    AddReduce,
    Fit,
    Follow,
    Parallel,
    LookXy,
    LookZx,
    LookYz,
    LookXyBack,
    LookZxBack,
    LookYzBack,
    PlaneAngles,
    SwingTwist,
    FileNumbers,
    TurnRate,
    HeatTurnRate,
    HeatChange,
    WorstFirst,
    HeatLimitUse,
    FoldLimbs,
    UnfoldLimbs,
    WholeTime,
    NearerTime,
    FartherTime,
    ShowBefore,
    SourceAlone,
    Light,
    Larger,
    Smaller,
    UsualSize,
    UsualLayout,
    PreviousJoint,
    NextJoint,
    FindAgain,
    StopFinding,
    PreviousSnag,
    NextSnag,
    Mend,
    MendKind,
    MendSafe,
    Leave,
    TakeBack,
    LookAtMend,
    NoLimits,
    AdultLimits,
    LearnLimits,
    LimitsFile,
    IsLoop,
    FindSlides,
    Curve(CurveAction),
    Play,
    StepBack,
    StepForward,
    PreviousKey,
    NextKey,
    First,
    Last,
    Loop,
    LoopFrom,
    LoopTo,
    LoopAll,
    Slower,
    Faster,
    ChooseFrom,
    ChooseTo,
    ChooseLimb,
    ChooseAll,
    PlayChoice,
    ShowChoice,
    AddMarker,
    RenameMarker,
    RemoveMarker,
    PreviousMarker,
    NextMarker,
    Explain,
    ShowHints,
    Shortcuts,
    WhatsNew,
    About,
    BlendIn,
    MakeLoop,
    BlendLane,
    BlendClips,
    Retarget,
    Space(SpaceAction),
}

/// The menus, from left to right.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[expect(missing_docs, reason = "the names say it")]
pub enum Menu {
    File,
    Edit,
    View,
    Space,
    Snags,
    Keys,
    Time,
    Help,
}

impl Menu {
    /// All menus in order.
    pub const ALL: [Self; 8] =
        [Self::File, Self::Edit, Self::View, Self::Space, Self::Snags, Self::Keys, Self::Time, Self::Help];

    /// Its title.
    pub const fn title(self) -> &'static str {
        match self {
            Self::File => "File",
            Self::Edit => "Edit",
            Self::View => "View",
            Self::Space => "Space",
            Self::Snags => "Snags",
            Self::Keys => "Keys",
            Self::Time => "Time",
            Self::Help => "Help",
        }
    }
}
