//! The menu *Keys*: keys, segments and values on the rotation curves.

use egui::Key;

use super::super::{Action as A, CurveAction as C};
use super::{CLIP, Entry, JOINT, KEYS, alt, alt_shift, ctrl, ctrl_alt, ctrl_shift, entry, plain};

/// Its entries, from top to bottom.
pub(super) const ENTRIES: &[Entry] = &[
    entry(
        A::Curve(C::Add),
        "Add key",
        "A key at the playhead for each chosen joint; the curve stays as it is",
        Some(plain(Key::Insert)),
        JOINT,
    ),
    entry(A::Curve(C::Delete), "Delete keys", "Take the chosen keys away", Some(plain(Key::Delete)), KEYS),
    entry(A::Curve(C::Cut), "Cut keys", "Copy the chosen keys and take them away", Some(ctrl(Key::X)), KEYS)
        .group(),
    entry(
        A::Curve(C::Copy),
        "Copy keys",
        "Copy the chosen keys; without any, the pose of the chosen joints at the playhead",
        Some(ctrl(Key::C)),
        JOINT,
    ),
    entry(
        A::Curve(C::Paste),
        "Paste keys",
        "Put the copied keys down, the first of them at the playhead",
        Some(ctrl(Key::V)),
        |now| now.can_paste,
    ),
    entry(
        A::Curve(C::PasteMirrored),
        "Paste keys mirrored",
        "Put the copied keys down on the other side of the body, the first of them at the playhead",
        Some(ctrl_shift(Key::V)),
        |now| now.can_paste,
    ),
    entry(
        A::Curve(C::ChooseAll),
        "Choose all keys",
        "Choose every key of the chosen joints",
        Some(ctrl(Key::A)),
        JOINT,
    )
    .group(),
    entry(
        A::Curve(C::ChooseNone),
        "Choose no keys",
        "Let go of the chosen keys and of the chosen segment",
        Some(ctrl_shift(Key::A)),
        |now| now.chosen_keys > 0 || now.has_segment,
    ),
    entry(
        A::Curve(C::ChooseHere),
        "Choose key here",
        "Choose the chosen joints' keys at the playhead besides the chosen ones, or let go of them",
        Some(alt(Key::Insert)),
        JOINT,
    ),
    entry(
        A::Curve(C::ChooseRange),
        "Choose keys of the range",
        "Choose the chosen joints' keys inside the chosen stretch of time, else inside the loop",
        Some(ctrl_alt(Key::A)),
        |now| (now.has_loop_range || now.has_chosen_span) && now.has_joint,
    ),
    entry(
        A::Curve(C::ChooseSegment),
        "Choose segment here",
        "Choose the segment between two keys that the playhead is in, or in captured motion the stretch that was made one there",
        Some(alt_shift(Key::Insert)),
        JOINT,
    ),
    entry(
        A::Curve(C::MoreAbove),
        "Add joint above",
        "Show the curves of the joint above as well",
        Some(ctrl_shift(Key::ArrowUp)),
        JOINT,
    ),
    entry(
        A::Curve(C::MoreBelow),
        "Add joint below",
        "Show the curves of the joint below as well",
        Some(ctrl_shift(Key::ArrowDown)),
        JOINT,
    ),
    entry(
        A::Curve(C::NextLine),
        "Next curve",
        "Let the keys below move the next of the joint's curves",
        Some(alt(Key::K)),
        JOINT,
    )
    .group(),
    entry(
        A::Curve(C::Up),
        "Turn keys up",
        "The chosen keys a degree up on the chosen curve; without any, a soft push at the playhead",
        Some(ctrl_alt(Key::ArrowUp)),
        JOINT,
    ),
    entry(
        A::Curve(C::Down),
        "Turn keys down",
        "The chosen keys a degree down on the chosen curve; without any, a soft push at the playhead",
        Some(ctrl_alt(Key::ArrowDown)),
        JOINT,
    ),
    entry(
        A::Curve(C::Earlier),
        "Keys earlier",
        "The chosen keys a frame earlier",
        Some(ctrl_alt(Key::ArrowLeft)),
        KEYS,
    ),
    entry(
        A::Curve(C::Later),
        "Keys later",
        "The chosen keys a frame later",
        Some(ctrl_alt(Key::ArrowRight)),
        KEYS,
    ),
    entry(
        A::Curve(C::Tighter),
        "Draw keys together",
        "The last chosen key a frame earlier, those between in step, the first stays",
        Some(alt_shift(Key::ArrowLeft)),
        |now| now.chosen_keys > 1,
    ),
    entry(
        A::Curve(C::Looser),
        "Draw keys out",
        "The last chosen key a frame later, those between in step, the first stays",
        Some(alt_shift(Key::ArrowRight)),
        |now| now.chosen_keys > 1,
    ),
    entry(
        A::Curve(C::OneSegment),
        "Make one segment",
        "One segment leads from the first to the last chosen key; the keys between give way",
        Some(alt_shift(Key::M)),
        |now| now.chosen_keys > 2,
    )
    .group(),
    entry(
        A::Curve(C::Hold),
        "Path: hold",
        "The chosen segments keep their first key until the next one; all keys stay",
        Some(alt_shift(Key::H)),
        JOINT,
    )
    .group(),
    entry(
        A::Curve(C::Slerp),
        "Path: slerp",
        "The chosen segments take the short arc at an even rate",
        Some(alt_shift(Key::S)),
        JOINT,
    ),
    entry(
        A::Curve(C::Squad),
        "Path: squad",
        "The chosen segments run smoothly through the keys",
        Some(alt_shift(Key::Q)),
        JOINT,
    ),
    entry(
        A::Curve(C::Spline),
        "Path: spline",
        "The chosen segments run smoothly through the keys, with no jump in acceleration",
        Some(alt_shift(Key::P)),
        JOINT,
    ),
    entry(
        A::Curve(C::BSpline),
        "Path: B-spline",
        "The chosen segments run smoothly near the keys",
        Some(alt_shift(Key::B)),
        JOINT,
    ),
    entry(
        A::Curve(C::Even),
        "Spacing: even",
        "The chosen segments move at an even pace along their path",
        Some(alt_shift(Key::E)),
        JOINT,
    )
    .group(),
    entry(
        A::Curve(C::EaseIn),
        "Spacing: ease in",
        "The chosen segments start from a standstill",
        Some(alt_shift(Key::I)),
        JOINT,
    ),
    entry(
        A::Curve(C::EaseOut),
        "Spacing: ease out",
        "The chosen segments come to a standstill",
        Some(alt_shift(Key::O)),
        JOINT,
    ),
    entry(
        A::Curve(C::EaseBoth),
        "Spacing: ease in and out",
        "The chosen segments start and end at a standstill",
        Some(alt_shift(Key::U)),
        JOINT,
    ),
    entry(
        A::Curve(C::OtherWay),
        "Go the other way round",
        "The chosen segments reach their next key from the other side",
        Some(alt_shift(Key::T)),
        JOINT,
    )
    .group(),
    entry(
        A::Curve(C::TurnMore),
        "One turn more",
        "The chosen segments turn once more on their way",
        Some(alt_shift(Key::Period)),
        JOINT,
    ),
    entry(
        A::Curve(C::TurnLess),
        "One turn less",
        "The chosen segments turn once less, or once the other way",
        Some(alt_shift(Key::Comma)),
        JOINT,
    ),
    entry(
        A::Curve(C::Smooth),
        "Smooth range",
        "A pass that smooths the chosen joints over the chosen keys, else over the chosen stretch \
         of time or the loop",
        Some(alt(Key::S)),
        JOINT,
    )
    .group(),
    entry(
        A::Curve(C::Reduce),
        "Reduce keys of range",
        "A pass that leaves as few keys as its bound allows, over the chosen keys, else over the \
         chosen stretch of time or the loop",
        Some(alt(Key::R)),
        JOINT,
    ),
    entry(
        A::Curve(C::Snap),
        "Snap keys to frames",
        "Moved keys come to stand on frames",
        Some(alt(Key::F)),
        CLIP,
    )
    .switch(|now| now.snaps_to_frames)
    .group(),
    entry(
        A::Curve(C::FitValues),
        "Fit values",
        "The curves on screen from bottom to top",
        Some(alt(Key::V)),
        CLIP,
    )
    .group(),
    entry(
        A::Curve(C::NearerValues),
        "Zoom in on values",
        "Half as large a range of values",
        Some(alt(Key::PageUp)),
        CLIP,
    ),
    entry(
        A::Curve(C::FartherValues),
        "Zoom out of values",
        "Twice as large a range of values",
        Some(alt(Key::PageDown)),
        CLIP,
    ),
    entry(
        A::Curve(C::ValuesUp),
        "Look at higher values",
        "Move the range of values up",
        Some(ctrl(Key::PageUp)),
        CLIP,
    ),
    entry(
        A::Curve(C::ValuesDown),
        "Look at lower values",
        "Move the range of values down",
        Some(ctrl(Key::PageDown)),
        CLIP,
    ),
];
