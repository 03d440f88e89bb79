//! The demo scenes, kept inside the program: a night at the ferry landing. Uses everything below `proof`, is used by
//! `cli` and `app`.
//!
//! The files are those of the folder `demo-scenes`. They are made by `tests/suite/demo`, which knows the faults planted
//! in them: `UPDATE_DEMOS=1 cargo test demo_scenes_are_current` writes them anew.

/// One demo scene: a clip file with faults, and what it shows.
#[derive(Clone, Copy, Debug)]
pub struct DemoScene {
    /// A short name: the file name without its ending.
    pub name: &'static str,
    /// What it shows, in one sentence.
    pub about: &'static str,
    /// Name of the clip file.
    pub clip_file: &'static str,
    /// The bytes of the clip file.
    pub clip_bytes: &'static [u8],
    /// Name of the scene file, which refers to the clip file beside it.
    pub scene_file: &'static str,
    /// The bytes of the scene file.
    pub scene_bytes: &'static [u8],
}

/// All demo scenes; the first is the one the window opens with.
pub const SCENES: [DemoScene; 3] = [
    DemoScene {
        name: "deckhand",
        about: "A deckhand of the night ferry hauls in a mooring rope.",
        clip_file: "deckhand.bvh",
        clip_bytes: include_bytes!("../../demo-scenes/deckhand.bvh"),
        scene_file: "deckhand.ron",
        scene_bytes: include_bytes!("../../demo-scenes/deckhand.ron"),
    },
    DemoScene {
        name: "heron",
        about: "A heron on the quay takes off.",
        clip_file: "heron.glb",
        clip_bytes: include_bytes!("../../demo-scenes/heron.glb"),
        scene_file: "heron.ron",
        scene_bytes: include_bytes!("../../demo-scenes/heron.ron"),
    },
    DemoScene {
        name: "crane",
        about: "The ferry's deck crane slews a load from the quay to the hold.",
        clip_file: "crane.csv",
        clip_bytes: include_bytes!("../../demo-scenes/crane.csv"),
        scene_file: "crane.ron",
        scene_bytes: include_bytes!("../../demo-scenes/crane.ron"),
    },
];
