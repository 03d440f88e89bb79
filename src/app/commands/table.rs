//! The table of everything that has a menu entry: words, keys, and when it can be done.

use egui::{Key, KeyboardShortcut, Modifiers};

use super::super::session::{Disc, TurnPlanes};
use super::super::view_models::{CurveView, HeatKind};
use super::time::{LEARNED, Offer};
use super::{Action, CurveAction, Menu, Situation, SpaceAction};

/// One entry of the table.
#[derive(Clone, Copy, Debug)]
pub struct Entry {
    /// What it does.
    pub action: Action,
    /// Where it stands.
    pub menu: Menu,
    /// A line is drawn above it.
    pub starts_group: bool,
    /// Its words.
    pub label: &'static str,
    /// What it does, in a sentence.
    pub tooltip: &'static str,
    /// Its keys.
    pub shortcut: Option<KeyboardShortcut>,
    /// Whether it can be done.
    pub is_available: fn(&Situation) -> bool,
    /// Whether it is on, for entries that are switches.
    pub is_on: Option<fn(&Situation) -> bool>,
}

const fn plain(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::NONE, key)
}

const fn ctrl(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::COMMAND, key)
}

const fn ctrl_shift(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::COMMAND.plus(Modifiers::SHIFT), key)
}

const fn shift(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::SHIFT, key)
}

const fn ctrl_alt(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::COMMAND.plus(Modifiers::ALT), key)
}

const fn alt(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::ALT, key)
}

const fn entry(
    menu: Menu,
    action: Action,
    label: &'static str,
    tooltip: &'static str,
    shortcut: Option<KeyboardShortcut>,
    is_available: fn(&Situation) -> bool,
) -> Entry {
    Entry { action, menu, starts_group: false, label, tooltip, shortcut, is_available, is_on: None }
}

impl Entry {
    const fn group(self) -> Self {
        Self { starts_group: true, ..self }
    }

    const fn switch(self, is_on: fn(&Situation) -> bool) -> Self {
        Self { is_on: Some(is_on), ..self }
    }
}

const fn alt_shift(key: Key) -> KeyboardShortcut {
    KeyboardShortcut::new(Modifiers::ALT.plus(Modifiers::SHIFT), key)
}

const ALWAYS: fn(&Situation) -> bool = |_| true;
const DOCUMENT: fn(&Situation) -> bool = |now| now.has_document;
const CLIP: fn(&Situation) -> bool = |now| now.has_clip;
const JOINT: fn(&Situation) -> bool = |now| now.has_clip && now.has_joint;
const BLEND: fn(&Situation) -> bool = |now| now.has_clip && now.has_blend;
const KEYS: fn(&Situation) -> bool = |now| now.has_joint && now.chosen_keys > 0;
const TURNS: fn(&Situation) -> bool =
    |now| now.has_clip && now.has_joint && !matches!(now.space.disc, Disc::Free);
const SNAG: fn(&Situation) -> bool = |now| now.has_snag;
const MARKERS: fn(&Situation) -> bool = |now| now.markers > 0;
const SNAGS: fn(&Situation) -> bool = |now| now.snags > 0;

/// The table.
pub const TABLE: &[Entry] = &{
    use Action as A;
    use CurveAction as C;
    use Menu::{Edit as E, File as F, Help as H, Keys as K, Snags as S, Space as R, Time as P, View as V};
    use SpaceAction as O;
    [
        entry(
            F,
            A::Open,
            "Open…",
            "Choose clips (.gltf .glb .bvh .csv) or a scene (.ron)",
            Some(ctrl(Key::O)),
            ALWAYS,
        ),
        entry(
            F,
            A::OpenPath,
            "Open path…",
            "Type the path of a clip or scene",
            Some(ctrl_shift(Key::O)),
            ALWAYS,
        ),
        entry(F, A::OpenDemo, "Open the demo", "The night ferry: a clip with planted snags", None, ALWAYS),
        entry(
            F,
            A::ChooseClip,
            "Choose clip…",
            "Work on another clip of the open files",
            Some(ctrl(Key::P)),
            |now| now.has_several_clips,
        ),
        entry(
            F,
            A::Save,
            "Save scene",
            "Write the passes and decisions to the scene file",
            Some(ctrl(Key::S)),
            DOCUMENT,
        )
        .group(),
        entry(F, A::SaveAs, "Save scene as…", "Write a new scene file", Some(ctrl_shift(Key::S)), DOCUMENT),
        entry(
            F,
            A::Export,
            "Export clip…",
            "Write the corrected curves, with a summary of what changed",
            Some(ctrl(Key::E)),
            CLIP,
        ),
        entry(
            F,
            A::Relocate,
            "Find source again…",
            "The source file is missing or is no longer the same: name the one to use",
            None,
            |now| now.has_trouble,
        ),
        entry(F, A::Quit, "Quit", "Close the window", Some(ctrl(Key::Q)), ALWAYS).group(),
        entry(E, A::Undo, "Undo", "Take back the last change", Some(ctrl(Key::Z)), |now| now.undo.is_some()),
        entry(E, A::Redo, "Redo", "Bring back what was undone", Some(ctrl_shift(Key::Z)), |now| {
            now.redo.is_some()
        }),
        entry(
            E,
            A::History,
            "History…",
            "All changes since the file was opened",
            Some(ctrl(Key::H)),
            DOCUMENT,
        )
        .group(),
        entry(
            E,
            A::BlendIn,
            "Blend in a clip…",
            "Join, mix or layer another clip with this one",
            Some(ctrl(Key::U)),
            CLIP,
        )
        .group(),
        entry(
            E,
            A::MakeLoop,
            "Loop and repeat",
            "A pass that lets the end meet the start and plays the clip several times over",
            Some(ctrl(Key::R)),
            CLIP,
        ),
        entry(
            E,
            A::Retarget,
            "Retarget…",
            "Carry the clip to another skeleton: joint map, rest poses, contacts. Again: back to the bench",
            Some(ctrl(Key::T)),
            CLIP,
        )
        .switch(|now| now.carries),
        entry(E, A::AddResample, "Add pass: resample", Offer::Resample.tooltip(), None, CLIP).group(),
        entry(E, A::AddLimits, "Add pass: limits", Offer::Limits.tooltip(), None, CLIP),
        entry(E, A::AddSmooth, "Add pass: smooth", Offer::Smooth.tooltip(), None, CLIP),
        entry(E, A::AddReduce, "Add pass: reduce keys", Offer::Reduce.tooltip(), None, CLIP),
        entry(V, A::Fit, "Fit figure", "Bring the whole figure into view", Some(ctrl(Key::Num7)), CLIP),
        entry(
            V,
            A::Follow,
            "Follow figure",
            "The view goes along when the figure walks",
            Some(ctrl(Key::Num8)),
            CLIP,
        )
        .switch(|now| now.follows),
        entry(
            V,
            A::Parallel,
            "Parallel view",
            "No perspective: lengths can be compared",
            Some(ctrl(Key::Num9)),
            CLIP,
        )
        .switch(|now| now.is_parallel),
        entry(V, A::LookXy, "Look at plane xy", "Straight view of plane xy", Some(ctrl(Key::Num1)), CLIP)
            .group(),
        entry(
            V,
            A::LookZx,
            "Look at plane zx",
            "Straight view of plane zx, from above",
            Some(ctrl(Key::Num2)),
            CLIP,
        ),
        entry(V, A::LookYz, "Look at plane yz", "Straight view of plane yz", Some(ctrl(Key::Num3)), CLIP),
        entry(
            V,
            A::LookXyBack,
            "Look at xy from behind",
            "The other side of plane xy",
            Some(ctrl(Key::Num4)),
            CLIP,
        ),
        entry(
            V,
            A::LookZxBack,
            "Look at zx from below",
            "The other side of plane zx",
            Some(ctrl(Key::Num5)),
            CLIP,
        ),
        entry(
            V,
            A::LookYzBack,
            "Look at yz from behind",
            "The other side of plane yz",
            Some(ctrl(Key::Num6)),
            CLIP,
        ),
        entry(
            V,
            A::PlaneAngles,
            "Curves of plane angles",
            CurveView::PlaneAngles.explanation(),
            Some(alt(Key::Num1)),
            CLIP,
        )
        .switch(|now| matches!(now.curve_view, Some(CurveView::PlaneAngles)))
        .group(),
        entry(
            V,
            A::SwingTwist,
            "Curves of swing and twist",
            CurveView::SwingTwist.explanation(),
            Some(alt(Key::Num2)),
            CLIP,
        )
        .switch(|now| matches!(now.curve_view, Some(CurveView::SwingTwist))),
        entry(
            V,
            A::FileNumbers,
            "Curves of the file's own numbers",
            CurveView::FileNumbers.explanation(),
            Some(alt(Key::Num3)),
            CLIP,
        )
        .switch(|now| matches!(now.curve_view, Some(CurveView::FileNumbers))),
        entry(
            V,
            A::TurnRate,
            "Curve of turn rate",
            CurveView::TurnRate.explanation(),
            Some(alt(Key::Num4)),
            CLIP,
        )
        .switch(|now| matches!(now.curve_view, Some(CurveView::TurnRate))),
        entry(
            V,
            A::HeatTurnRate,
            "Map turn rate",
            "Colour = how fast a joint turns",
            Some(alt(Key::Num5)),
            CLIP,
        )
        .switch(|now| matches!(now.heat_kind, Some(HeatKind::TurnRate)))
        .group(),
        entry(
            V,
            A::HeatChange,
            "Map change",
            "Colour = how far the result is from the source",
            Some(alt(Key::Num6)),
            CLIP,
        )
        .switch(|now| matches!(now.heat_kind, Some(HeatKind::Change))),
        entry(
            V,
            A::WorstFirst,
            "Worst joint first",
            "Order the turn map by its hottest rows",
            Some(alt(Key::Num7)),
            CLIP,
        )
        .switch(|now| now.worst_first),
        entry(
            V,
            A::HeatLimitUse,
            "Map use of limits",
            "Colour = how much of its limit a joint uses",
            Some(alt(Key::Num8)),
            CLIP,
        )
        .switch(|now| matches!(now.heat_kind, Some(HeatKind::LimitUse))),
        entry(
            V,
            A::FoldLimbs,
            "Fold limbs",
            "One row for each limb, in the turn map and the list of joints",
            Some(alt(Key::Minus)),
            CLIP,
        ),
        entry(
            V,
            A::UnfoldLimbs,
            "Unfold all",
            "A row for each joint, in the turn map and the list of joints",
            Some(alt(Key::Equals)),
            CLIP,
        ),
        entry(
            V,
            A::WholeTime,
            "Show all time",
            "The whole clip from left to right",
            Some(alt(Key::Num0)),
            CLIP,
        )
        .group(),
        entry(
            V,
            A::NearerTime,
            "Zoom in on time",
            "Half as long a stretch, around the playhead",
            Some(alt(Key::ArrowUp)),
            CLIP,
        ),
        entry(
            V,
            A::FartherTime,
            "Zoom out of time",
            "Twice as long a stretch, around the playhead",
            Some(alt(Key::ArrowDown)),
            CLIP,
        ),
        entry(
            V,
            A::ShowBefore,
            "Show source as well",
            "The source in thin grey beside the result",
            Some(ctrl(Key::G)),
            CLIP,
        )
        .switch(|now| now.shows_before)
        .group(),
        entry(
            V,
            A::SourceAlone,
            "Show source alone",
            "The source in place of the result. Hold Ctrl+B to look for a moment",
            Some(ctrl_shift(Key::B)),
            CLIP,
        )
        .switch(|now| now.shows_source_alone),
        entry(
            V,
            A::PreviousJoint,
            "Previous joint",
            "Choose the joint above",
            Some(ctrl(Key::ArrowUp)),
            CLIP,
        )
        .group(),
        entry(V, A::NextJoint, "Next joint", "Choose the joint below", Some(ctrl(Key::ArrowDown)), CLIP),
        entry(
            V,
            A::BlendLane,
            "Blend lane",
            "The two clips of a blend over time, and how much of each is taken",
            Some(ctrl_shift(Key::U)),
            BLEND,
        )
        .switch(|now| now.shows_blend_lane)
        .group(),
        entry(
            V,
            A::BlendClips,
            "Show blended clips",
            "The two clips of a blend as faint figures beside the result",
            Some(ctrl_shift(Key::G)),
            BLEND,
        )
        .switch(|now| now.shows_blend_clips),
        entry(V, A::Light, "Light window", "Dark on light", Some(ctrl(Key::D)), ALWAYS)
            .switch(|now| now.is_light)
            .group(),
        entry(
            R,
            A::Space(O::Arm(Disc::Yz)),
            "Turn in plane yz",
            "The keys that turn take the disc in plane yz: y goes towards z",
            Some(ctrl_alt(Key::Num1)),
            JOINT,
        )
        .switch(|now| matches!(now.space.disc, Disc::Yz)),
        entry(
            R,
            A::Space(O::Arm(Disc::Zx)),
            "Turn in plane zx",
            "The keys that turn take the disc in plane zx: z goes towards x",
            Some(ctrl_alt(Key::Num2)),
            JOINT,
        )
        .switch(|now| matches!(now.space.disc, Disc::Zx)),
        entry(
            R,
            A::Space(O::Arm(Disc::Xy)),
            "Turn in plane xy",
            "The keys that turn take the disc in plane xy: x goes towards y",
            Some(ctrl_alt(Key::Num3)),
            JOINT,
        )
        .switch(|now| matches!(now.space.disc, Disc::Xy)),
        entry(
            R,
            A::Space(O::Arm(Disc::Twist)),
            "Twist about the limb",
            "The keys that turn twist the joint about its own limb",
            Some(ctrl_alt(Key::Num4)),
            JOINT,
        )
        .switch(|now| matches!(now.space.disc, Disc::Twist)),
        entry(
            R,
            A::Space(O::TurnBack),
            "Turn back a step",
            "The chosen joint turns a step the negative way, with the disc chosen above",
            Some(ctrl_alt(Key::Num9)),
            TURNS,
        )
        .group(),
        entry(
            R,
            A::Space(O::TurnOn),
            "Turn on a step",
            "The chosen joint turns a step the positive way, with the disc chosen above",
            Some(ctrl_alt(Key::Num0)),
            TURNS,
        ),
        entry(
            R,
            A::Space(O::SmallerStep),
            "Smaller turn step",
            "Keys turn by less, and a drag with Ctrl held snaps to less",
            Some(alt(Key::Comma)),
            CLIP,
        ),
        entry(
            R,
            A::Space(O::LargerStep),
            "Larger turn step",
            "Keys turn by more, and a drag with Ctrl held snaps to more",
            Some(alt(Key::Period)),
            CLIP,
        ),
        entry(
            R,
            A::Space(O::ShorterFalloff),
            "Shorter falloff",
            "A soft push on captured motion reaches less far in time",
            Some(ctrl_alt(Key::OpenBracket)),
            CLIP,
        ),
        entry(
            R,
            A::Space(O::LongerFalloff),
            "Longer falloff",
            "A soft push on captured motion reaches farther in time",
            Some(ctrl_alt(Key::CloseBracket)),
            CLIP,
        ),
        entry(
            R,
            A::Space(O::Planes(TurnPlanes::Rest)),
            "Planes of the joint at rest",
            "The discs lie in the joint's own planes as they are at rest",
            Some(ctrl_alt(Key::Num6)),
            CLIP,
        )
        .switch(|now| matches!(now.space.planes, TurnPlanes::Rest))
        .group(),
        entry(
            R,
            A::Space(O::Planes(TurnPlanes::Parent)),
            "Planes of the parent",
            "The discs lie in the parent's planes",
            Some(ctrl_alt(Key::Num7)),
            CLIP,
        )
        .switch(|now| matches!(now.space.planes, TurnPlanes::Parent)),
        entry(
            R,
            A::Space(O::Planes(TurnPlanes::World)),
            "Planes of the scene",
            "The discs lie in the scene's planes",
            Some(ctrl_alt(Key::Num8)),
            CLIP,
        )
        .switch(|now| matches!(now.space.planes, TurnPlanes::World)),
        entry(
            R,
            A::Space(O::FitJoint),
            "Fit chosen joint",
            "Bring the chosen joint and its limbs into view",
            Some(alt(Key::C)),
            JOINT,
        )
        .group(),
        entry(
            R,
            A::Space(O::Mirror),
            "Mirror view",
            "Left and right exchanged, as in a mirror: a pose looks new",
            Some(alt(Key::M)),
            CLIP,
        )
        .switch(|now| now.is_mirrored),
        entry(
            R,
            A::Space(O::Discs),
            "Show turn discs",
            "Discs around the chosen joint that turn it when dragged",
            Some(alt(Key::D)),
            CLIP,
        )
        .switch(|now| now.space.shows_discs)
        .group(),
        entry(
            R,
            A::Space(O::Path),
            "Show tip path",
            "The way of the chosen limb's tip, a dot for each frame, grey in the source",
            Some(alt(Key::P)),
            CLIP,
        )
        .switch(|now| now.space.shows_path),
        entry(
            R,
            A::Space(O::Neighbours),
            "Show neighbouring poses",
            "Faint dashed poses before and after the playhead",
            Some(alt(Key::N)),
            CLIP,
        )
        .switch(|now| now.space.shows_neighbours),
        entry(
            R,
            A::Space(O::Reach),
            "Show limit of the joint",
            "The cone that the chosen joint may point into, and how much of it is used",
            Some(alt_shift(Key::R)),
            CLIP,
        )
        .switch(|now| now.space.shows_reach),
        entry(
            R,
            A::Space(O::Names),
            "Show joint names",
            "A name at each joint, as far as there is room",
            Some(alt_shift(Key::K)),
            CLIP,
        )
        .switch(|now| now.space.shows_names),
        entry(R, A::Space(O::Floor), "Show floor", "The grid below the figure", Some(alt(Key::G)), CLIP)
            .switch(|now| now.space.shows_floor),
        entry(
            V,
            A::Larger,
            "Larger",
            "All words and marks a step larger, up to 300 %",
            Some(ctrl(Key::Plus)),
            ALWAYS,
        )
        .group(),
        entry(
            V,
            A::Smaller,
            "Smaller",
            "All words and marks a step smaller, down to 100 %",
            Some(ctrl(Key::Minus)),
            ALWAYS,
        ),
        entry(
            V,
            A::UsualSize,
            "Usual size",
            "100 % of what the desktop asks for",
            Some(ctrl(Key::Num0)),
            ALWAYS,
        ),
        entry(V, A::UsualLayout, "Usual areas", "All areas as large as on the first day", None, ALWAYS),
        entry(S, A::FindAgain, "Find again", "Look for snags in the source anew", Some(plain(Key::F5)), CLIP),
        entry(S, A::StopFinding, "Stop finding", "Stop looking for snags", Some(shift(Key::F5)), |now| {
            now.is_finding
        }),
        entry(S, A::PreviousSnag, "Previous snag", "Jump to the snag above", Some(shift(Key::F8)), SNAGS)
            .group(),
        entry(S, A::NextSnag, "Next snag", "Jump to the snag below", Some(plain(Key::F8)), SNAGS),
        entry(S, A::Mend, "Mend", "Mend the chosen snag", Some(ctrl(Key::Enter)), |now| {
            now.has_snag && !now.snag_is_mended
        })
        .group(),
        entry(
            S,
            A::MendKind,
            "Mend all of this kind",
            "Mend every open snag of the chosen one's kind",
            Some(ctrl_shift(Key::Enter)),
            SNAG,
        ),
        entry(
            S,
            A::MendSafe,
            "Mend all safe",
            "Mend every open snag whose mend needs no judgement",
            Some(ctrl(Key::M)),
            |now| now.safe_snags > 0,
        ),
        entry(
            S,
            A::TakeBack,
            "Take mend back",
            "The chosen snag is open again",
            Some(ctrl(Key::Backspace)),
            |now| now.snag_is_mended,
        ),
        entry(
            S,
            A::Leave,
            "Leave",
            "The chosen snag is meant, or not worth it",
            Some(ctrl(Key::Delete)),
            SNAG,
        )
        .switch(|now| now.snag_is_left),
        entry(
            S,
            A::LookAtMend,
            "Look at mend",
            "Show the chosen snag mended, in figure and curves, before it is accepted",
            Some(ctrl(Key::K)),
            CLIP,
        )
        .switch(|now| now.looks)
        .group(),
        entry(S, A::NoLimits, "Hold against no limits", "Joints may turn as they like", None, CLIP)
            .switch(|now| now.limits.is_none())
            .group(),
        entry(
            S,
            A::AdultLimits,
            "Hold against adult limits",
            "Population norms for human figures, put on by what each joint is",
            None,
            CLIP,
        )
        .switch(|now| now.limits.as_deref() == Some("adult")),
        entry(
            S,
            A::LearnLimits,
            "Learn limits from this clip",
            "What each joint does in the clip with its snags mended, and some margin",
            None,
            CLIP,
        )
        .switch(|now| now.limits.as_deref() == Some(LEARNED)),
        entry(S, A::LimitsFile, "Limits from a file…", "A table (.csv) or file (.ron) of limits", None, CLIP),
        entry(S, A::IsLoop, "Treat clip as a loop", "Also look whether the end meets the start", None, CLIP)
            .switch(|now| now.search.is_loop),
        entry(S, A::FindSlides, "Look for sliding feet", "Also look for planted feet that move", None, CLIP)
            .switch(|now| now.search.finds_slides),
        entry(K, A::Curve(C::Add), "Add key", "A key at the playhead for each chosen joint; the curve stays as it is", Some(plain(Key::Insert)), JOINT),
        entry(K, A::Curve(C::Delete), "Delete keys", "Take the chosen keys away", Some(plain(Key::Delete)), KEYS),
        entry(K, A::Curve(C::Cut), "Cut keys", "Copy the chosen keys and take them away", Some(ctrl(Key::X)), KEYS).group(),
        entry(K, A::Curve(C::Copy), "Copy keys", "Copy the chosen keys; without any, the pose of the chosen joints at the playhead", Some(ctrl(Key::C)), JOINT),
        entry(K, A::Curve(C::Paste), "Paste keys", "Put the copied keys down, the first of them at the playhead", Some(ctrl(Key::V)), |now| now.can_paste),
        entry(K, A::Curve(C::PasteMirrored), "Paste keys mirrored", "Put the copied keys down on the other side of the body, the first of them at the playhead", Some(ctrl_shift(Key::V)), |now| now.can_paste),
        entry(K, A::Curve(C::ChooseAll), "Choose all keys", "Choose every key of the chosen joints", Some(ctrl(Key::A)), JOINT).group(),
        entry(K, A::Curve(C::ChooseNone), "Choose no keys", "Let go of the chosen keys and of the chosen segment", Some(ctrl_shift(Key::A)), |now| now.chosen_keys > 0 || now.has_segment),
        entry(K, A::Curve(C::ChooseHere), "Choose key here", "Choose the chosen joints' keys at the playhead besides the chosen ones, or let go of them", Some(alt(Key::Insert)), JOINT),
        entry(K, A::Curve(C::ChooseRange), "Choose keys of the range", "Choose the chosen joints' keys inside the chosen stretch of time, else inside the loop", Some(ctrl_alt(Key::A)), |now| (now.has_loop_range || now.has_chosen_span) && now.has_joint),
        entry(K, A::Curve(C::ChooseSegment), "Choose segment here", "Choose the segment between two keys that the playhead is in", Some(alt_shift(Key::Insert)), JOINT),
        entry(K, A::Curve(C::MoreAbove), "Add joint above", "Show the curves of the joint above as well", Some(ctrl_shift(Key::ArrowUp)), JOINT),
        entry(K, A::Curve(C::MoreBelow), "Add joint below", "Show the curves of the joint below as well", Some(ctrl_shift(Key::ArrowDown)), JOINT),
        entry(K, A::Curve(C::NextLine), "Next curve", "Let the keys below move the next of the joint's curves", Some(alt(Key::K)), JOINT).group(),
        entry(K, A::Curve(C::Up), "Turn keys up", "The chosen keys a degree up on the chosen curve; without any, a soft push at the playhead", Some(ctrl_alt(Key::ArrowUp)), JOINT),
        entry(K, A::Curve(C::Down), "Turn keys down", "The chosen keys a degree down on the chosen curve; without any, a soft push at the playhead", Some(ctrl_alt(Key::ArrowDown)), JOINT),
        entry(K, A::Curve(C::Earlier), "Keys earlier", "The chosen keys a frame earlier", Some(ctrl_alt(Key::ArrowLeft)), KEYS),
        entry(K, A::Curve(C::Later), "Keys later", "The chosen keys a frame later", Some(ctrl_alt(Key::ArrowRight)), KEYS),
        entry(K, A::Curve(C::Tighter), "Draw keys together", "The last chosen key a frame earlier, those between in step, the first stays", Some(alt_shift(Key::ArrowLeft)), |now| now.chosen_keys > 1),
        entry(K, A::Curve(C::Looser), "Draw keys out", "The last chosen key a frame later, those between in step, the first stays", Some(alt_shift(Key::ArrowRight)), |now| now.chosen_keys > 1),
        entry(K, A::Curve(C::Hold), "Path: hold", "The chosen segments keep their first key until the next one", Some(alt_shift(Key::H)), JOINT).group(),
        entry(K, A::Curve(C::Slerp), "Path: slerp", "The chosen segments take the short arc at an even rate", Some(alt_shift(Key::S)), JOINT),
        entry(K, A::Curve(C::Squad), "Path: squad", "The chosen segments run smoothly through the keys", Some(alt_shift(Key::Q)), JOINT),
        entry(K, A::Curve(C::Spline), "Path: spline", "The chosen segments run smoothly through the keys, with no jump in acceleration", Some(alt_shift(Key::P)), JOINT),
        entry(K, A::Curve(C::BSpline), "Path: B-spline", "The chosen segments run smoothly near the keys", Some(alt_shift(Key::B)), JOINT),
        entry(K, A::Curve(C::Even), "Spacing: even", "The chosen segments move at an even pace along their path", Some(alt_shift(Key::E)), JOINT).group(),
        entry(K, A::Curve(C::EaseIn), "Spacing: ease in", "The chosen segments start from a standstill", Some(alt_shift(Key::I)), JOINT),
        entry(K, A::Curve(C::EaseOut), "Spacing: ease out", "The chosen segments come to a standstill", Some(alt_shift(Key::O)), JOINT),
        entry(K, A::Curve(C::EaseBoth), "Spacing: ease in and out", "The chosen segments start and end at a standstill", Some(alt_shift(Key::U)), JOINT),
        entry(K, A::Curve(C::OtherWay), "Go the other way round", "The chosen segments reach their next key from the other side", Some(alt_shift(Key::T)), JOINT).group(),
        entry(K, A::Curve(C::TurnMore), "One turn more", "The chosen segments turn once more on their way", Some(alt_shift(Key::Period)), JOINT),
        entry(K, A::Curve(C::TurnLess), "One turn less", "The chosen segments turn once less, or once the other way", Some(alt_shift(Key::Comma)), JOINT),
        entry(K, A::Curve(C::Smooth), "Smooth range", "A pass that smooths the chosen joints over the chosen keys, else over the chosen stretch of time or the loop", Some(alt(Key::S)), JOINT).group(),
        entry(K, A::Curve(C::Reduce), "Reduce keys of range", "A pass that leaves as few keys as its bound allows, over the chosen keys, else over the chosen stretch of time or the loop", Some(alt(Key::R)), JOINT),
        entry(K, A::Curve(C::Snap), "Snap keys to frames", "Moved keys come to stand on frames", Some(alt(Key::F)), CLIP).switch(|now| now.snaps_to_frames).group(),
        entry(K, A::Curve(C::FitValues), "Fit values", "The curves on screen from bottom to top", Some(alt(Key::V)), CLIP).group(),
        entry(K, A::Curve(C::NearerValues), "Zoom in on values", "Half as large a range of values", Some(alt(Key::PageUp)), CLIP),
        entry(K, A::Curve(C::FartherValues), "Zoom out of values", "Twice as large a range of values", Some(alt(Key::PageDown)), CLIP),
        entry(K, A::Curve(C::ValuesUp), "Look at higher values", "Move the range of values up", Some(ctrl(Key::PageUp)), CLIP),
        entry(K, A::Curve(C::ValuesDown), "Look at lower values", "Move the range of values down", Some(ctrl(Key::PageDown)), CLIP),
        entry(P, A::Play, "Play", "Play or pause", Some(plain(Key::Space)), CLIP)
            .switch(|now| now.is_playing),
        entry(P, A::StepBack, "Frame back", "One frame back", Some(plain(Key::ArrowLeft)), CLIP).group(),
        entry(P, A::StepForward, "Frame forward", "One frame forward", Some(plain(Key::ArrowRight)), CLIP),
        entry(
            P,
            A::PreviousKey,
            "Previous key",
            "To the chosen joint's key before",
            Some(ctrl(Key::ArrowLeft)),
            JOINT,
        ),
        entry(
            P,
            A::NextKey,
            "Next key",
            "To the chosen joint's key after",
            Some(ctrl(Key::ArrowRight)),
            JOINT,
        ),
        entry(P, A::First, "To the start", "To the first frame", Some(plain(Key::Home)), CLIP),
        entry(P, A::Last, "To the end", "To the last frame", Some(plain(Key::End)), CLIP),
        entry(P, A::Loop, "Loop", "Start over at the end", Some(ctrl(Key::L)), CLIP)
            .switch(|now| now.is_looping)
            .group(),
        entry(
            P,
            A::LoopFrom,
            "Loop from here",
            "The loop starts at the playhead",
            Some(ctrl(Key::OpenBracket)),
            CLIP,
        ),
        entry(
            P,
            A::LoopTo,
            "Loop to here",
            "The loop ends at the playhead",
            Some(ctrl(Key::CloseBracket)),
            CLIP,
        ),
        entry(P, A::LoopAll, "Loop whole clip", "Forget the loop range", Some(ctrl(Key::Backslash)), |now| {
            now.has_loop_range
        }),
        entry(P, A::Slower, "Slower", "Play at the next slower speed", Some(ctrl(Key::Comma)), CLIP).group(),
        entry(P, A::Faster, "Faster", "Play at the next faster speed", Some(ctrl(Key::Period)), CLIP),
        entry(
            P,
            A::ChooseFrom,
            "Choose from here",
            "The stretch that tools and new passes act on starts at the playhead",
            Some(alt(Key::OpenBracket)),
            CLIP,
        )
        .group(),
        entry(
            P,
            A::ChooseTo,
            "Choose to here",
            "The stretch that tools and new passes act on ends at the playhead",
            Some(alt(Key::CloseBracket)),
            CLIP,
        ),
        entry(
            P,
            A::ChooseLimb,
            "Choose this limb",
            "Tools and new passes act on the chosen joint and all that hangs on it",
            Some(alt(Key::L)),
            JOINT,
        ),
        entry(
            P,
            A::ChooseAll,
            "Forget the choice",
            "Tools and new passes act on all joints and the whole clip again",
            Some(alt(Key::Backslash)),
            |now| now.has_choice,
        ),
        entry(
            P,
            A::PlayChoice,
            "Play the choice only",
            "The loop goes with the chosen stretch of time",
            Some(alt(Key::Space)),
            |now| now.has_chosen_span || now.plays_choice,
        )
        .switch(|now| now.plays_choice),
        entry(
            P,
            A::ShowChoice,
            "Show the choice",
            "The chosen stretch of time from left to right",
            Some(alt(Key::Num9)),
            |now| now.has_chosen_span,
        ),
        entry(P, A::AddMarker, "Add marker", "A named moment at the playhead", Some(ctrl(Key::J)), CLIP)
            .group(),
        entry(
            P,
            A::RenameMarker,
            "Rename marker…",
            "Another name for the marker at the playhead, or the last before it",
            Some(ctrl_shift(Key::J)),
            MARKERS,
        ),
        entry(
            P,
            A::RemoveMarker,
            "Remove marker",
            "Take away the marker at the playhead, or the last before it",
            Some(alt(Key::J)),
            MARKERS,
        ),
        entry(
            P,
            A::PreviousMarker,
            "Previous marker",
            "Jump to the marker before",
            Some(alt(Key::ArrowLeft)),
            MARKERS,
        ),
        entry(
            P,
            A::NextMarker,
            "Next marker",
            "Jump to the marker after",
            Some(alt(Key::ArrowRight)),
            MARKERS,
        ),
        entry(
            H,
            A::Explain,
            "Snags and passes",
            "What each kind of snag and each pass is, with a picture",
            Some(shift(Key::F1)),
            ALWAYS,
        ),
        entry(
            H,
            A::ShowHints,
            "Show hints again",
            "The hint in each area, as on the first day",
            None,
            ALWAYS,
        ),
        entry(
            H,
            A::Shortcuts,
            "Shortcuts",
            "All actions and their keys, which can be changed",
            Some(plain(Key::F1)),
            ALWAYS,
        ),
        entry(H, A::WhatsNew, "What's new", "What has changed from version to version", None, ALWAYS),
        entry(H, A::About, "About Turnwright", "Version, licences and cautions", None, ALWAYS),
    ]
};

/// Keys that do the same as an entry's own shortcut.
pub const MORE_KEYS: &[(KeyboardShortcut, Action)] = &[
    (KeyboardShortcut::new(Modifiers::COMMAND, Key::Y), Action::Redo),
    // On most keyboards + is the shifted =.
    (KeyboardShortcut::new(Modifiers::COMMAND, Key::Equals), Action::Larger),
];

/// Held down, these show the source in place of the result.
pub const HOLD_FOR_SOURCE: KeyboardShortcut = KeyboardShortcut::new(Modifiers::COMMAND, Key::B);

impl Action {
    /// Its entry.
    ///
    /// # Panics
    /// Never: a test sees to it that every action has one.
    pub fn entry(self) -> &'static Entry {
        TABLE.iter().find(|entry| entry.action == self).unwrap_or(&TABLE[0])
    }
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use super::*;

    #[test]
    fn every_action_has_one_entry_with_words() {
        let mut seen = BTreeSet::new();
        for entry in TABLE {
            assert!(seen.insert(entry.action), "{:?} stands twice", entry.action);
            assert_eq!(entry.action.entry().label, entry.label);
            assert!(!entry.label.is_empty() && entry.tooltip.len() > 3, "{:?}", entry.action);
            assert!(!entry.tooltip.ends_with('.') && !entry.label.ends_with('.'), "{}", entry.tooltip);
        }
    }

    #[test]
    fn no_two_entries_share_keys() {
        let own = TABLE.iter().filter_map(|entry| entry.shortcut.map(|shortcut| (shortcut, entry.action)));
        let mut seen: Vec<(KeyboardShortcut, Action)> = Vec::new();
        for (shortcut, action) in own.chain(MORE_KEYS.iter().copied()) {
            let twin = seen.iter().find(|(other, _)| *other == shortcut);
            assert!(twin.is_none(), "{action:?} and {twin:?}");
            assert_ne!(shortcut, HOLD_FOR_SOURCE);
            seen.push((shortcut, action));
        }
    }

    #[test]
    fn letters_and_digits_come_with_a_modifier() {
        for entry in TABLE {
            let Some(KeyboardShortcut { modifiers, logical_key }) = entry.shortcut else { continue };
            let is_letter = logical_key.name().chars().count() == 1;
            assert!(!is_letter || modifiers.any(), "{:?}", entry.action);
        }
    }

    #[test]
    fn without_a_document_only_what_needs_none_is_on_offer() {
        use Action as A;
        let nothing = Situation::default();
        let offered: Vec<Action> =
            TABLE.iter().filter(|entry| (entry.is_available)(&nothing)).map(|entry| entry.action).collect();
        let expected = [
            A::Open,
            A::OpenPath,
            A::OpenDemo,
            A::Quit,
            A::Light,
            A::Larger,
            A::Smaller,
            A::UsualSize,
            A::UsualLayout,
            A::Explain,
            A::ShowHints,
            A::Shortcuts,
            A::WhatsNew,
            A::About,
        ];
        assert_eq!(offered, expected);
    }
}
