//! Names of joints read: split into words, prefixes and running numbers taken off, sides told.

use std::collections::{HashMap, HashSet};

use super::dictionary::{KANA, WORDS, Word};
use super::name::Name;
use super::role::Side;

/// What a side is written out as, or begins with.
const SPELLED_SIDES: [&str; 14] = [
    "left", "right", "hidari", "migi", "lft", "rgt", "link", "recht", "gauche", "droit", "izquierd",
    "derech", "sinistr", "destr",
];

/// Reads the names of joints together: what most begin with, and a number that runs through all, say nothing.
pub(super) fn read(raw: &[&str]) -> Vec<Name> {
    let plain: Vec<String> = raw.iter().map(|name| plain(name)).collect();
    let cut = shared_prefix(&plain);
    let mut pieces: Vec<Vec<String>> = plain
        .iter()
        .map(|name| pieces(name.strip_prefix(cut.as_str()).filter(|rest| !rest.is_empty()).unwrap_or(name)))
        .collect();
    drop_running_number(&mut pieces);
    let mut names: Vec<Name> = pieces.iter().map(|pieces| name_of(pieces)).collect();
    // A lone letter is a side only where the other side exists too.
    let known: HashSet<(Side, &str)> =
        names.iter().filter_map(|name| Some((name.side?, name.key.as_str()))).collect();
    let lonely: Vec<bool> = names
        .iter()
        .map(|name| name.side.is_some_and(|side| !known.contains(&(side.other(), name.key.as_str()))))
        .collect();
    drop(known);
    for (index, name) in names.iter_mut().enumerate().filter(|&(index, _)| lonely[index]) {
        let spelled = pieces[index].iter().any(|piece| SPELLED_SIDES.iter().any(|word| piece.contains(word)));
        if !spelled {
            name.side = None;
        }
    }
    names
}

/// Full-width letters made plain, kana and kanji put into English, and all up to the last `:` or `|` cut.
fn plain(name: &str) -> String {
    let name = name.rsplit([':', '|']).next().unwrap_or(name).trim();
    let mut text: String = name
        .chars()
        .map(|letter| match letter {
            '\u{ff01}'..='\u{ff5e}' => char::from_u32(u32::from(letter) - 0xfee0).unwrap_or(letter),
            '\u{3000}' => ' ',
            other => other,
        })
        .collect();
    if !text.is_ascii() {
        for (from, to) in KANA {
            if text.contains(from) {
                text = text.replace(from, to);
            }
        }
    }
    text.trim().to_owned()
}

/// The longest beginning, up to a separator or a change of case, that at least 80 % of the names share and that is all
/// of none of them.
fn shared_prefix(names: &[String]) -> String {
    let mut uses: HashMap<&str, usize> = HashMap::new();
    for name in names {
        for (at, letter) in name.char_indices().skip(1) {
            let before = name[..at].chars().next_back().unwrap_or(' ');
            let splits = !before.is_alphanumeric()
                || (before.is_lowercase() && letter.is_uppercase())
                || (before.is_ascii_digit() && letter.is_alphabetic());
            if splits && at <= 40 {
                *uses.entry(&name[..at]).or_default() += 1;
            }
        }
    }
    let enough = |count: usize| names.len() >= 4 && count * 5 >= names.len() * 4;
    let mut best = "";
    let mut found: Vec<(&str, usize)> = uses.into_iter().filter(|&(_, count)| enough(count)).collect();
    found.sort_unstable();
    for (prefix, _) in found {
        // A side or a part that most joints share is still a word; only what means nothing goes.
        let said = name_of(&pieces(prefix));
        let whole = names.iter().any(|name| name == prefix);
        if !whole && said.side.is_none() && !said.names_a_part() && prefix.len() > best.len() {
            best = prefix;
        }
    }
    best.to_owned()
}

/// Runs of letters and runs of digits, lower case; split at separators, changes of case, and where letters meet digits.
fn pieces(name: &str) -> Vec<String> {
    let letters: Vec<char> = name.chars().collect();
    let mut pieces: Vec<String> = Vec::new();
    let mut current = String::new();
    for (at, &letter) in letters.iter().enumerate() {
        if !letter.is_alphanumeric() {
            if !current.is_empty() {
                pieces.push(std::mem::take(&mut current));
            }
            continue;
        }
        if let Some(&before) = at.checked_sub(1).and_then(|at| letters.get(at)) {
            let next_is_lower = letters.get(at + 1).is_some_and(|next| next.is_lowercase());
            let splits = (before.is_lowercase() && letter.is_uppercase())
                || (before.is_uppercase() && letter.is_uppercase() && next_is_lower)
                || (before.is_ascii_digit() != letter.is_ascii_digit());
            if splits && !current.is_empty() {
                pieces.push(std::mem::take(&mut current));
            }
        }
        current.extend(letter.to_lowercase());
    }
    if !current.is_empty() {
        pieces.push(current);
    }
    pieces
}

/// A number at the end of nearly all names that never repeats is the file's own counting and no part of the names.
fn drop_running_number(names: &mut [Vec<String>]) {
    let last =
        |name: &Vec<String>| name.last().filter(|_| name.len() > 1).and_then(|last| last.parse::<u32>().ok());
    let numbers: Vec<u32> = names.iter().filter_map(last).collect();
    let distinct: HashSet<u32> = numbers.iter().copied().collect();
    if names.len() >= 8 && numbers.len() * 5 >= names.len() * 4 && distinct.len() == numbers.len() {
        for name in names.iter_mut().filter(|name| last(name).is_some()) {
            name.pop();
        }
    }
}

fn name_of(pieces: &[String]) -> Name {
    let mut name = Name::default();
    let mut rest: Vec<String> = Vec::new();
    for (at, piece) in pieces.iter().enumerate() {
        if let Ok(number) = piece.parse::<u32>() {
            // The first number behind the words counts the joint; `thigh.L.001` is the second of its name.
            if name.number.is_none() && at > 0 {
                name.number = Some(number);
            }
            rest.push(number.to_string());
            continue;
        }
        let vertebra =
            pieces.get(at + 1).and_then(|next| next.parse::<u32>().ok()).and_then(|_| match piece.as_str() {
                "vl" => Some(&[Word::Spine][..]),
                "vt" => Some(&[Word::Chest][..]),
                "vc" => Some(&[Word::Neck][..]),
                _ => None,
            });
        if let Some(words) = vertebra {
            name.words.extend(words);
            rest.push(piece.clone());
            continue;
        }
        let is_edge = |word: usize, count: usize| {
            at + word == 0 || at + 1 + word == pieces.len() + count - 1 || count == 1
        };
        if let Some(found) = segments(piece) {
            let count = found.len();
            for (place, (text, word)) in found.into_iter().enumerate() {
                match word {
                    Word::Side(side) if text.len() > 1 || is_edge(place, count) || place + 1 == count => {
                        name.side = name.side.or(Some(side));
                    }
                    Word::Side(_) => {}
                    word => {
                        name.words.push(word);
                        rest.push(text.to_owned());
                    }
                }
            }
        } else {
            rest.push(piece.clone());
        }
    }
    name.key = rest.join(" ");
    name
}

/// A run of letters as the fewest known words, or none where it is not made of them.
fn segments(piece: &str) -> Option<Vec<(&str, Word)>> {
    let whole = |text: &str| WORDS.iter().find(|(word, _, _)| *word == text).map(|(_, word, _)| *word);
    if let Some(word) = whole(piece) {
        return Some(vec![(piece, word)]);
    }
    if piece.len() > 40 || !piece.is_ascii() {
        return None;
    }
    // best[i]: the fewest words that make up the first i letters.
    let n = piece.len();
    let mut best: Vec<Option<(usize, usize, Word)>> = vec![None; n + 1];
    let mut cost = vec![usize::MAX; n + 1];
    cost[0] = 0;
    for end in 1..=n {
        for start in 0..end {
            if cost[start] == usize::MAX {
                continue;
            }
            let text = &piece[start..end];
            let is_edge = start == 0 || end == n;
            let found = WORDS
                .iter()
                .find(|(word, _, inside)| *word == text && *inside && (text.len() > 1 || is_edge))
                .map(|(_, word, _)| *word)
                // A plural is the same word.
                .or_else(|| {
                    (end == n && text.len() > 3).then(|| text.strip_suffix('s').and_then(whole)).flatten()
                });
            if let Some(word) = found
                && cost[start] + 1 < cost[end]
            {
                cost[end] = cost[start] + 1;
                best[end] = Some((start, end, word));
            }
        }
    }
    let mut found = Vec::new();
    let mut end = n;
    while end > 0 {
        let (start, stop, word) = best[end]?;
        found.push((&piece[start..stop], word));
        end = start;
    }
    found.reverse();
    Some(found)
}

#[cfg(test)]
mod tests {
    use super::super::name::Part;
    use super::super::role::Finger;
    use super::*;

    #[track_caller]
    fn check(raw: &[&str], index: usize, part: Part, side: Option<Side>) {
        let names = read(raw);
        let name = &names[index];
        assert!(name.score(part) >= 0.65, "{}: {name:?} as {part:?} scores {}", raw[index], name.score(part));
        assert_eq!(name.side, side, "{}: {name:?}", raw[index]);
    }

    #[test]
    fn variants_of_a_thigh_are_one_word() {
        // reference/skeleton-names.md section 3.
        let pairs = [
            ["L_Thigh", "R_Thigh"],
            ["Thigh.L", "Thigh.R"],
            ["thigh_l", "thigh_r"],
            ["L Thigh", "R Thigh"],
            ["leg_upper_l", "leg_upper_r"],
            ["LeftLegUpper", "RightLegUpper"],
            ["Lthigh", "Rthigh"],
            ["left-upper-leg", "right-upper-leg"],
            ["LeftUpLeg", "RightUpLeg"],
            ["lfemur", "rfemur"],
            ["leftupleg", "rightupleg"],
            ["abc:LeftUpLeg", "abc:RightUpLeg"],
            ["Ｌ＿Ｔｈｉｇｈ", "Ｒ＿Ｔｈｉｇｈ"],
        ];
        for pair in pairs {
            check(&pair, 0, Part::UpperLeg, Some(Side::Left));
            check(&pair, 1, Part::UpperLeg, Some(Side::Right));
        }
        check(&["左ひざ", "右ひざ"], 0, Part::LowerLeg, Some(Side::Left));
        check(&["hidari_hiza", "migi_hiza"], 1, Part::LowerLeg, Some(Side::Right));
    }

    #[test]
    fn a_first_letter_that_belongs_to_the_word_is_no_side() {
        let names = read(&["lowerback", "lumbar", "leg", "ring", "root", "ribs", "radius"]);
        assert!(names.iter().all(|name| name.side.is_none()), "{names:?}");
        assert!(names[0].score(Part::Spine) > 0.8);
        assert_eq!(names[3].finger(), Some(Finger::Ring));
        assert!(names[6].score(Part::LowerArm) > 0.8);
    }

    #[test]
    fn what_all_names_share_says_nothing() {
        let raw = ["dummy_Hips", "dummy_Spine", "dummy_Head", "dummy_LeftArm", "dummy_RightArm"];
        let names = read(&raw);
        assert_eq!(names[0].key, "hips");
        let raw: Vec<String> = [
            "b_Hip",
            "b_Spine01",
            "b_Spine02",
            "b_LeftLeg01",
            "b_RightLeg01",
            "b_Tail01",
            "b_Neck",
            "b_Head",
        ]
        .iter()
        .enumerate()
        .map(|(index, name)| format!("{name}_{index:02}"))
        .collect();
        let raw: Vec<&str> = raw.iter().map(String::as_str).collect();
        let names = read(&raw);
        assert_eq!((names[3].number, names[3].side), (Some(1), Some(Side::Left)), "{:?}", names[3]);
        assert_eq!(names[2].number, Some(2));
    }

    #[test]
    fn helpers_are_told() {
        let names = read(&["Hand_L", "handslot.l", "IKFoot_L", "LeftArmRoll", "Head_end", "HandleBone"]);
        assert!(names[1].is_helper() && names[2].is_helper());
        assert!(names[3].is_twist() && names[4].is_end());
    }
}
