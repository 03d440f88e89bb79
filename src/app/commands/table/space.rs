//! The menu *Space*: turning joints in the skeleton view, and what it shows.

use egui::Key;

use super::super::super::session::{Disc, TurnPlanes};
use super::super::{Action as A, SpaceAction as O};
use super::{CLIP, Entry, JOINT, TURNS, alt, alt_shift, ctrl_alt, entry};

/// Its entries, from top to bottom.
pub(super) const ENTRIES: &[Entry] = &[
    entry(
        A::Space(O::Arm(Disc::Yz)),
        "Turn in plane yz",
        "The keys that turn take the disc in plane yz: y goes towards z",
        Some(ctrl_alt(Key::Num1)),
        JOINT,
    )
    .switch(|now| matches!(now.space.disc, Disc::Yz)),
    entry(
        A::Space(O::Arm(Disc::Zx)),
        "Turn in plane zx",
        "The keys that turn take the disc in plane zx: z goes towards x",
        Some(ctrl_alt(Key::Num2)),
        JOINT,
    )
    .switch(|now| matches!(now.space.disc, Disc::Zx)),
    entry(
        A::Space(O::Arm(Disc::Xy)),
        "Turn in plane xy",
        "The keys that turn take the disc in plane xy: x goes towards y",
        Some(ctrl_alt(Key::Num3)),
        JOINT,
    )
    .switch(|now| matches!(now.space.disc, Disc::Xy)),
    entry(
        A::Space(O::Arm(Disc::Twist)),
        "Twist about the limb",
        "The keys that turn twist the joint about its own limb",
        Some(ctrl_alt(Key::Num4)),
        JOINT,
    )
    .switch(|now| matches!(now.space.disc, Disc::Twist)),
    entry(
        A::Space(O::TurnBack),
        "Turn back a step",
        "The chosen joint turns a step the negative way, with the disc chosen above",
        Some(ctrl_alt(Key::Num9)),
        TURNS,
    )
    .group(),
    entry(
        A::Space(O::TurnOn),
        "Turn on a step",
        "The chosen joint turns a step the positive way, with the disc chosen above",
        Some(ctrl_alt(Key::Num0)),
        TURNS,
    ),
    entry(
        A::Space(O::SmallerStep),
        "Smaller turn step",
        "Keys turn by less, and a drag with Ctrl held snaps to less",
        Some(alt(Key::Comma)),
        CLIP,
    ),
    entry(
        A::Space(O::LargerStep),
        "Larger turn step",
        "Keys turn by more, and a drag with Ctrl held snaps to more",
        Some(alt(Key::Period)),
        CLIP,
    ),
    entry(
        A::Space(O::ShorterFalloff),
        "Shorter falloff",
        "A soft push on captured motion reaches less far in time",
        Some(ctrl_alt(Key::OpenBracket)),
        CLIP,
    ),
    entry(
        A::Space(O::LongerFalloff),
        "Longer falloff",
        "A soft push on captured motion reaches farther in time",
        Some(ctrl_alt(Key::CloseBracket)),
        CLIP,
    ),
    entry(
        A::Space(O::Planes(TurnPlanes::Rest)),
        "Planes of the joint at rest",
        "The discs lie in the joint's own planes as they are at rest",
        Some(ctrl_alt(Key::Num6)),
        CLIP,
    )
    .switch(|now| matches!(now.space.planes, TurnPlanes::Rest))
    .group(),
    entry(
        A::Space(O::Planes(TurnPlanes::Parent)),
        "Planes of the parent",
        "The discs lie in the parent's planes",
        Some(ctrl_alt(Key::Num7)),
        CLIP,
    )
    .switch(|now| matches!(now.space.planes, TurnPlanes::Parent)),
    entry(
        A::Space(O::Planes(TurnPlanes::World)),
        "Planes of the scene",
        "The discs lie in the scene's planes",
        Some(ctrl_alt(Key::Num8)),
        CLIP,
    )
    .switch(|now| matches!(now.space.planes, TurnPlanes::World)),
    entry(
        A::Space(O::FitJoint),
        "Fit chosen joint",
        "Bring the chosen joint and its limbs into view",
        Some(alt(Key::C)),
        JOINT,
    )
    .group(),
    entry(
        A::Space(O::Mirror),
        "Mirror view",
        "Left and right exchanged, as in a mirror: a pose looks new",
        Some(alt(Key::M)),
        CLIP,
    )
    .switch(|now| now.is_mirrored),
    entry(
        A::Space(O::Discs),
        "Show turn discs",
        "Discs around the chosen joint that turn it when dragged",
        Some(alt(Key::D)),
        CLIP,
    )
    .switch(|now| now.space.shows_discs)
    .group(),
    entry(
        A::Space(O::Path),
        "Show tip path",
        "The way of the chosen limb's tip, a dot for each frame, grey in the source",
        Some(alt(Key::P)),
        CLIP,
    )
    .switch(|now| now.space.shows_path),
    entry(
        A::Space(O::Neighbours),
        "Show neighbouring poses",
        "Faint dashed poses before and after the playhead",
        Some(alt(Key::N)),
        CLIP,
    )
    .switch(|now| now.space.shows_neighbours),
    entry(
        A::Space(O::Reach),
        "Show limit of the joint",
        "The cone that the chosen joint may point into, and how much of it is used",
        Some(alt_shift(Key::R)),
        CLIP,
    )
    .switch(|now| now.space.shows_reach),
    entry(
        A::Space(O::Names),
        "Show joint names",
        "A name at each joint, as far as there is room",
        Some(alt_shift(Key::K)),
        CLIP,
    )
    .switch(|now| now.space.shows_names),
    entry(A::Space(O::Floor), "Show floor", "The grid below the figure", Some(alt(Key::G)), CLIP)
        .switch(|now| now.space.shows_floor),
];
