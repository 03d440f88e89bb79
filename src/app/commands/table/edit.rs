//! The menu *Edit*: undo and the passes that are added by hand.

use egui::Key;

use super::super::Action as A;
use super::super::time::Offer;
use super::{CLIP, DOCUMENT, Entry, ctrl, ctrl_shift, entry};

/// Its entries, from top to bottom.
pub(super) const ENTRIES: &[Entry] = &[
    entry(A::Undo, "Undo", "Take back the last change", Some(ctrl(Key::Z)), |now| now.undo.is_some()),
    entry(A::Redo, "Redo", "Bring back what was undone", Some(ctrl_shift(Key::Z)), |now| now.redo.is_some()),
    entry(A::History, "History…", "All changes since the file was opened", Some(ctrl(Key::H)), DOCUMENT)
        .group(),
    entry(
        A::BlendIn,
        "Blend in a clip…",
        "Join, mix or layer another clip with this one",
        Some(ctrl(Key::U)),
        CLIP,
    )
    .group(),
    entry(
        A::MakeLoop,
        "Loop and repeat",
        "A pass that lets the end meet the start and plays the clip several times over",
        Some(ctrl(Key::R)),
        CLIP,
    ),
    entry(
        A::Retarget,
        "Retarget…",
        "Carry the clip to another skeleton: joint map, rest poses, contacts. Again: back to the bench",
        Some(ctrl(Key::T)),
        CLIP,
    )
    .switch(|now| now.carries),
    entry(A::AddResample, "Add pass: resample", Offer::Resample.tooltip(), None, CLIP).group(),
    entry(A::AddLimits, "Add pass: limits", Offer::Limits.tooltip(), None, CLIP),
    entry(A::AddSmooth, "Add pass: smooth", Offer::Smooth.tooltip(), None, CLIP),
    entry(A::AddReduce, "Add pass: reduce keys", Offer::Reduce.tooltip(), None, CLIP),
];
