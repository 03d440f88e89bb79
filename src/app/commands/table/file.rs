//! The menu *File*: files.

use egui::Key;

use super::super::Action as A;
use super::{ALWAYS, CLIP, DOCUMENT, Entry, ctrl, ctrl_shift, entry};

/// Its entries, from top to bottom.
pub(super) const ENTRIES: &[Entry] = &[
    entry(
        A::Open,
        "Open…",
        "Choose clips (.gltf .glb .bvh .csv) or a scene (.ron)",
        Some(ctrl(Key::O)),
        ALWAYS,
    ),
    entry(A::OpenPath, "Open path…", "Type the path of a clip or scene", Some(ctrl_shift(Key::O)), ALWAYS),
    entry(A::OpenDemo, "Open the demo", "The night ferry: a clip with planted snags", None, ALWAYS),
    entry(
        A::ChooseClip,
        "Choose clip…",
        "Work on another clip of the open files",
        Some(ctrl(Key::P)),
        |now| now.has_several_clips,
    ),
    entry(
        A::Save,
        "Save scene",
        "Write the passes and decisions to the scene file",
        Some(ctrl(Key::S)),
        DOCUMENT,
    )
    .group(),
    entry(A::SaveAs, "Save scene as…", "Write a new scene file", Some(ctrl_shift(Key::S)), DOCUMENT),
    entry(
        A::Export,
        "Export clip…",
        "Write the corrected curves, with a summary of what changed",
        Some(ctrl(Key::E)),
        CLIP,
    ),
    entry(
        A::Relocate,
        "Find source again…",
        "The source file is missing or is no longer the same: name the one to use",
        None,
        |now| now.has_trouble,
    ),
    entry(
        A::TableSkeleton,
        "Skeleton of the table…",
        "A CSV file says how joints turn, not how they hang together: take that from another clip or a table of joints",
        None,
        |now| now.has_table,
    ),
    entry(A::Quit, "Quit", "Close the window", Some(ctrl(Key::Q)), ALWAYS).group(),
];
