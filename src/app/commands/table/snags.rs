//! The menu *Snags*: what is looked for, and what is done with what was found.

use egui::Key;

use super::super::Action as A;
use super::super::time::LEARNED;
use super::{CLIP, Entry, SNAG, SNAGS, ctrl, ctrl_shift, entry, plain, shift};

/// Its entries, from top to bottom.
pub(super) const ENTRIES: &[Entry] = &[
    entry(A::FindAgain, "Find again", "Look for snags in the source anew", Some(plain(Key::F5)), CLIP),
    entry(A::StopFinding, "Stop finding", "Stop looking for snags", Some(shift(Key::F5)), |now| {
        now.is_finding
    }),
    entry(A::PreviousSnag, "Previous snag", "Jump to the snag above", Some(shift(Key::F8)), SNAGS).group(),
    entry(A::NextSnag, "Next snag", "Jump to the snag below", Some(plain(Key::F8)), SNAGS),
    entry(A::Mend, "Mend", "Mend the chosen snag", Some(ctrl(Key::Enter)), |now| {
        now.has_snag && !now.snag_is_mended
    })
    .group(),
    entry(
        A::MendKind,
        "Mend all of this kind",
        "Mend every open snag of the chosen one's kind",
        Some(ctrl_shift(Key::Enter)),
        SNAG,
    ),
    entry(
        A::MendSafe,
        "Mend all safe",
        "Mend every open snag whose mend needs no judgement",
        Some(ctrl(Key::M)),
        |now| now.safe_snags > 0,
    ),
    entry(
        A::TakeBack,
        "Take mend back",
        "The chosen snag is open again",
        Some(ctrl(Key::Backspace)),
        |now| now.snag_is_mended,
    ),
    entry(A::Leave, "Leave", "The chosen snag is meant, or not worth it", Some(ctrl(Key::Delete)), SNAG)
        .switch(|now| now.snag_is_left),
    entry(
        A::LookAtMend,
        "Look at mend",
        "Show the chosen snag mended, in figure and curves, before it is accepted",
        Some(ctrl(Key::K)),
        CLIP,
    )
    .switch(|now| now.looks)
    .group(),
    entry(A::NoLimits, "Hold against no limits", "Joints may turn as they like", None, CLIP)
        .switch(|now| now.limits.is_none())
        .group(),
    entry(
        A::AdultLimits,
        "Hold against adult limits",
        "Population norms for human figures, put on by what each joint is",
        None,
        CLIP,
    )
    .switch(|now| now.limits.as_deref() == Some("adult")),
    entry(
        A::LearnLimits,
        "Learn limits from this clip",
        "What each joint does in the clip with its snags mended, and some margin",
        None,
        CLIP,
    )
    .switch(|now| now.limits.as_deref() == Some(LEARNED)),
    entry(A::LimitsFile, "Limits from a file…", "A table (.csv) or file (.ron) of limits", None, CLIP),
    entry(A::IsLoop, "Treat clip as a loop", "Also look whether the end meets the start", None, CLIP)
        .switch(|now| now.search.is_loop),
    entry(A::FindSlides, "Look for sliding feet", "Also look for planted feet that move", None, CLIP)
        .switch(|now| now.search.finds_slides),
];
