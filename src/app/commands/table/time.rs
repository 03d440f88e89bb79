//! The menu *Time*: play, the choice and markers.

use egui::Key;

use super::super::Action as A;
use super::{CLIP, Entry, JOINT, MARKERS, alt, ctrl, ctrl_shift, entry, plain};

/// Its entries, from top to bottom.
pub(super) const ENTRIES: &[Entry] = &[
    entry(A::Play, "Play", "Play or pause", Some(plain(Key::Space)), CLIP).switch(|now| now.is_playing),
    entry(A::StepBack, "Frame back", "One frame back", Some(plain(Key::ArrowLeft)), CLIP).group(),
    entry(A::StepForward, "Frame forward", "One frame forward", Some(plain(Key::ArrowRight)), CLIP),
    entry(
        A::PreviousKey,
        "Previous key",
        "To the chosen joint's key before",
        Some(ctrl(Key::ArrowLeft)),
        JOINT,
    ),
    entry(A::NextKey, "Next key", "To the chosen joint's key after", Some(ctrl(Key::ArrowRight)), JOINT),
    entry(A::First, "To the start", "To the first frame", Some(plain(Key::Home)), CLIP),
    entry(A::Last, "To the end", "To the last frame", Some(plain(Key::End)), CLIP),
    entry(A::Loop, "Loop", "Start over at the end", Some(ctrl(Key::L)), CLIP)
        .switch(|now| now.is_looping)
        .group(),
    entry(
        A::LoopFrom,
        "Loop from here",
        "The loop starts at the playhead",
        Some(ctrl(Key::OpenBracket)),
        CLIP,
    ),
    entry(A::LoopTo, "Loop to here", "The loop ends at the playhead", Some(ctrl(Key::CloseBracket)), CLIP),
    entry(A::LoopAll, "Loop whole clip", "Forget the loop range", Some(ctrl(Key::Backslash)), |now| {
        now.has_loop_range
    }),
    entry(A::Slower, "Slower", "Play at the next slower speed", Some(ctrl(Key::Comma)), CLIP).group(),
    entry(A::Faster, "Faster", "Play at the next faster speed", Some(ctrl(Key::Period)), CLIP),
    entry(
        A::ChooseFrom,
        "Choose from here",
        "The stretch that tools and new passes act on starts at the playhead",
        Some(alt(Key::OpenBracket)),
        CLIP,
    )
    .group(),
    entry(
        A::ChooseTo,
        "Choose to here",
        "The stretch that tools and new passes act on ends at the playhead",
        Some(alt(Key::CloseBracket)),
        CLIP,
    ),
    entry(
        A::ChooseLimb,
        "Choose this limb",
        "Tools and new passes act on the chosen joint and all that hangs on it",
        Some(alt(Key::L)),
        JOINT,
    ),
    entry(
        A::ChooseAll,
        "Forget the choice",
        "Tools and new passes act on all joints and the whole clip again",
        Some(alt(Key::Backslash)),
        |now| now.has_choice,
    ),
    entry(
        A::PlayChoice,
        "Play the choice only",
        "The loop goes with the chosen stretch of time",
        Some(alt(Key::Space)),
        |now| now.has_chosen_span || now.plays_choice,
    )
    .switch(|now| now.plays_choice),
    entry(
        A::ShowChoice,
        "Show the choice",
        "The chosen stretch of time from left to right",
        Some(alt(Key::Num9)),
        |now| now.has_chosen_span,
    ),
    entry(A::AddMarker, "Add marker", "A named moment at the playhead", Some(ctrl(Key::J)), CLIP).group(),
    entry(
        A::RenameMarker,
        "Rename marker…",
        "Another name for the marker at the playhead, or the last before it",
        Some(ctrl_shift(Key::J)),
        MARKERS,
    ),
    entry(
        A::RemoveMarker,
        "Remove marker",
        "Take away the marker at the playhead, or the last before it",
        Some(alt(Key::J)),
        MARKERS,
    ),
    entry(
        A::PreviousMarker,
        "Previous marker",
        "Jump to the marker before",
        Some(alt(Key::ArrowLeft)),
        MARKERS,
    ),
    entry(A::NextMarker, "Next marker", "Jump to the marker after", Some(alt(Key::ArrowRight)), MARKERS),
];
