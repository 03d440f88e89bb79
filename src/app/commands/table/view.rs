//! The menu *View*: what is looked at and how.

use egui::Key;

use super::super::super::view_models::{CurveView, HeatKind};
use super::super::Action as A;
use super::{ALWAYS, BLEND, CLIP, Entry, alt, ctrl, ctrl_shift, entry};

/// Its entries, from top to bottom.
pub(super) const ENTRIES: &[Entry] = &[
    entry(A::Fit, "Fit figure", "Bring the whole figure into view", Some(ctrl(Key::Num7)), CLIP),
    entry(
        A::Follow,
        "Follow figure",
        "The view goes along when the figure walks",
        Some(ctrl(Key::Num8)),
        CLIP,
    )
    .switch(|now| now.follows),
    entry(
        A::Parallel,
        "Parallel view",
        "No perspective: lengths can be compared",
        Some(ctrl(Key::Num9)),
        CLIP,
    )
    .switch(|now| now.is_parallel),
    entry(A::LookXy, "Look at plane xy", "Straight view of plane xy", Some(ctrl(Key::Num1)), CLIP).group(),
    entry(
        A::LookZx,
        "Look at plane zx",
        "Straight view of plane zx, from above",
        Some(ctrl(Key::Num2)),
        CLIP,
    ),
    entry(A::LookYz, "Look at plane yz", "Straight view of plane yz", Some(ctrl(Key::Num3)), CLIP),
    entry(A::LookXyBack, "Look at xy from behind", "The other side of plane xy", Some(ctrl(Key::Num4)), CLIP),
    entry(A::LookZxBack, "Look at zx from below", "The other side of plane zx", Some(ctrl(Key::Num5)), CLIP),
    entry(A::LookYzBack, "Look at yz from behind", "The other side of plane yz", Some(ctrl(Key::Num6)), CLIP),
    entry(
        A::PlaneAngles,
        "Curves of plane angles",
        CurveView::PlaneAngles.explanation(),
        Some(alt(Key::Num1)),
        CLIP,
    )
    .switch(|now| matches!(now.curve_view, Some(CurveView::PlaneAngles)))
    .group(),
    entry(
        A::SwingTwist,
        "Curves of swing and twist",
        CurveView::SwingTwist.explanation(),
        Some(alt(Key::Num2)),
        CLIP,
    )
    .switch(|now| matches!(now.curve_view, Some(CurveView::SwingTwist))),
    entry(
        A::FileNumbers,
        "Curves of the file's own numbers",
        CurveView::FileNumbers.explanation(),
        Some(alt(Key::Num3)),
        CLIP,
    )
    .switch(|now| matches!(now.curve_view, Some(CurveView::FileNumbers))),
    entry(A::TurnRate, "Curve of turn rate", CurveView::TurnRate.explanation(), Some(alt(Key::Num4)), CLIP)
        .switch(|now| matches!(now.curve_view, Some(CurveView::TurnRate))),
    entry(A::HeatTurnRate, "Map turn rate", "Colour = how fast a joint turns", Some(alt(Key::Num5)), CLIP)
        .switch(|now| matches!(now.heat_kind, Some(HeatKind::TurnRate)))
        .group(),
    entry(
        A::HeatChange,
        "Map change",
        "Colour = how far the result is from the source",
        Some(alt(Key::Num6)),
        CLIP,
    )
    .switch(|now| matches!(now.heat_kind, Some(HeatKind::Change))),
    entry(
        A::WorstFirst,
        "Worst joint first",
        "Order the turn map by its hottest rows",
        Some(alt(Key::Num7)),
        CLIP,
    )
    .switch(|now| now.worst_first),
    entry(
        A::HeatLimitUse,
        "Map use of limits",
        "Colour = how much of its limit a joint uses",
        Some(alt(Key::Num8)),
        CLIP,
    )
    .switch(|now| matches!(now.heat_kind, Some(HeatKind::LimitUse))),
    entry(
        A::FoldLimbs,
        "Fold limbs",
        "One row for each limb, in the turn map and the list of joints",
        Some(alt(Key::Minus)),
        CLIP,
    ),
    entry(
        A::UnfoldLimbs,
        "Unfold all",
        "A row for each joint, in the turn map and the list of joints",
        Some(alt(Key::Equals)),
        CLIP,
    ),
    entry(A::WholeTime, "Show all time", "The whole clip from left to right", Some(alt(Key::Num0)), CLIP)
        .group(),
    entry(
        A::NearerTime,
        "Zoom in on time",
        "Half as long a stretch, around the playhead",
        Some(alt(Key::ArrowUp)),
        CLIP,
    ),
    entry(
        A::FartherTime,
        "Zoom out of time",
        "Twice as long a stretch, around the playhead",
        Some(alt(Key::ArrowDown)),
        CLIP,
    ),
    entry(
        A::ShowBefore,
        "Show source as well",
        "The source in thin grey beside the result",
        Some(ctrl(Key::G)),
        CLIP,
    )
    .switch(|now| now.shows_before)
    .group(),
    entry(
        A::SourceAlone,
        "Show source alone",
        "The source in place of the result. Hold Ctrl+B to look for a moment",
        Some(ctrl_shift(Key::B)),
        CLIP,
    )
    .switch(|now| now.shows_source_alone),
    entry(A::PreviousJoint, "Previous joint", "Choose the joint above", Some(ctrl(Key::ArrowUp)), CLIP)
        .group(),
    entry(A::NextJoint, "Next joint", "Choose the joint below", Some(ctrl(Key::ArrowDown)), CLIP),
    entry(
        A::BlendLane,
        "Blend lane",
        "The two clips of a blend over time, and how much of each is taken",
        Some(ctrl_shift(Key::U)),
        BLEND,
    )
    .switch(|now| now.shows_blend_lane)
    .group(),
    entry(
        A::BlendClips,
        "Show blended clips",
        "The two clips of a blend as faint figures beside the result",
        Some(ctrl_shift(Key::G)),
        BLEND,
    )
    .switch(|now| now.shows_blend_clips),
    entry(A::Light, "Light window", "Dark on light", Some(ctrl(Key::D)), ALWAYS)
        .switch(|now| now.is_light)
        .group(),
    entry(
        A::Larger,
        "Larger",
        "All words and marks a step larger, up to 300 %",
        Some(ctrl(Key::Plus)),
        ALWAYS,
    )
    .group(),
    entry(
        A::Smaller,
        "Smaller",
        "All words and marks a step smaller, down to 100 %",
        Some(ctrl(Key::Minus)),
        ALWAYS,
    ),
    entry(A::UsualSize, "Usual size", "100 % of what the desktop asks for", Some(ctrl(Key::Num0)), ALWAYS),
    entry(A::UsualLayout, "Usual areas", "All areas as large as on the first day", None, ALWAYS),
];
