//! What names have in common, and what is left of one that is too long.

/// The share of what can stay that the beginning gets; the end gets the rest.
const HEAD_SHARE: f64 = 0.35;

/// What three of four of some names begin and end with, each up to a sign that parts words: it tells nothing about any of them.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Shared<'a> {
    /// The start, with its parting sign; empty where there is none.
    pub start: &'a str,
    /// The end, from its parting sign on; empty where there is none.
    pub end: &'a str,
}

const fn parts_words(sign: char) -> bool {
    matches!(sign, ':' | '|' | '/' | '.' | '_' | '-' | ' ')
}

impl<'a> Shared<'a> {
    /// What these names share. Of one name alone nothing.
    pub fn of(names: impl IntoIterator<Item = &'a str>) -> Self {
        let mut names: Vec<&str> = names.into_iter().collect();
        if names.len() < 2 {
            return Self::default();
        }
        // Three of four: sides and the like, which half of the names have, stay.
        let count = names.len();
        let most = |sharing: usize| 4 * sharing >= 3 * count;
        // In order they stand side by side: what most of them begin with, the middle one begins with.
        names.sort_unstable();
        let middle = names[names.len() / 2];
        let signs = middle.char_indices().rev().filter(|(_, sign)| parts_words(*sign));
        let mut starts = signs.map(|(at, sign)| &middle[..at + sign.len_utf8()]);
        let begin = |start: &str| names.iter().filter(|name| name.starts_with(start)).count();
        let start = starts.find(|start| most(begin(start))).unwrap_or("");
        // The same with names read from their end.
        names.sort_unstable_by(|a, b| a.bytes().rev().cmp(b.bytes().rev()));
        let middle = names[names.len() / 2];
        let signs = middle.char_indices().filter(|(_, sign)| parts_words(*sign));
        let mut ends = signs.map(|(at, _)| &middle[at..]);
        let close = |end: &str| names.iter().filter(|name| name.ends_with(end)).count();
        let end = ends.find(|end| most(close(end))).unwrap_or("");
        Self { start, end }
    }

    /// What is left of a name without what it shares: its own part, and whether something was left away before and behind it.
    pub fn own_part(self, name: &str) -> (&str, [bool; 2]) {
        let is_left = |own: &&str| !own.is_empty();
        let without = name.strip_prefix(self.start).filter(is_left).unwrap_or(name);
        let own = without.strip_suffix(self.end).filter(is_left).unwrap_or(without);
        (own, [without.len() < name.len(), own.len() < without.len()])
    }
}

/// So many letters of a name, with `…` for its middle: the end, which tells left from right and first from second, gets most of them.
pub fn shortened(name: &str, kept: usize) -> String {
    let count = name.chars().count();
    let head = (kept as f64 * HEAD_SHARE).floor() as usize;
    let tail = count.saturating_sub(kept - head);
    name.chars().take(head).chain(['…']).chain(name.chars().skip(tail)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[track_caller]
    fn check(names: &[&str], start: &str, end: &str) {
        assert_eq!(Shared::of(names.iter().copied()), Shared { start, end });
    }

    #[test]
    fn what_most_names_begin_and_end_with_tells_nothing() {
        check(&["Figure:Hips", "Figure:LeftFoot", "Figure:LeftToeBase", "Armature"], "Figure:", "");
        check(&["Actor_01_Hand_L", "Actor_01_Hand_R", "Actor_01_Foot_L"], "Actor_01_", "");
        check(&["hips_jnt", "leg_L_jnt", "leg_R_jnt", "root"], "", "_jnt");
        check(&["Hips", "Spine", "LeftArm", "LeftHand", "LeftFoot"], "", "");
        check(&["arm.L", "arm.R", "leg.L", "leg.R"], "", "");
        check(&["a:b", "Wurzel", "Ärmel_links"], "", "");
        check(&["Figure:Hips"], "", "");
        check(&[], "", "");
    }

    #[test]
    fn a_name_keeps_what_is_its_own() {
        let shared = Shared { start: "Figure:", end: "_jnt" };
        assert_eq!(shared.own_part("Figure:LeftFoot_jnt"), ("LeftFoot", [true, true]));
        assert_eq!(shared.own_part("Armature"), ("Armature", [false, false]));
        assert_eq!(shared.own_part("Figure:"), ("Figure:", [false, false]));
        assert_eq!(Shared::default().own_part("LeftFoot"), ("LeftFoot", [false, false]));
    }

    #[test]
    fn the_end_of_a_long_name_stays() {
        assert_eq!(shortened("Segment_007_TwistHelper_Left", 12), "Segm…per_Left");
        assert_eq!(shortened("Ärmel_links", 3), "Ä…ks");
        assert_eq!(shortened("Hand", 0), "…");
    }
}
