//! What the names of joints say: split into words, prefixes and running numbers taken off, sides told.

use std::collections::{HashMap, HashSet};

use super::role::{Finger, Side};

/// A word that is known, by what it means.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(super) enum Word {
    Side(Side),
    Upper,
    Lower,
    Fore,
    Root,
    Centre,
    Body,
    Hip,
    Pelvis,
    Spine,
    Waist,
    Back,
    Chest,
    Torso,
    Neck,
    Head,
    Face,
    Jaw,
    Eye,
    Clavicle,
    Shoulder,
    Arm,
    Humerus,
    Elbow,
    Hand,
    Wrist,
    Thigh,
    Leg,
    Shin,
    Foot,
    Ankle,
    Toe,
    Ball,
    Finger(Finger),
    AnyFinger,
    Metacarpal,
    Proximal,
    Intermediate,
    Distal,
    Tail,
    Wing,
    Ear,
    Strand,
    Twist,
    End,
    Helper,
    Front,
    Rear,
    Filler,
}

/// A part of the body without its side, as names can say it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub(super) enum Part {
    Hips,
    Spine,
    Chest,
    UpperChest,
    Neck,
    Head,
    Jaw,
    Eye,
    Shoulder,
    UpperArm,
    LowerArm,
    Hand,
    UpperLeg,
    LowerLeg,
    Foot,
    Toes,
    Finger(Finger),
    Tail,
    Wing,
    Ear,
}

/// What the name of one joint says.
#[derive(Clone, Debug, Default)]
pub(super) struct Name {
    /// The side it names; a lone letter counts only where the mirrored name exists too.
    pub side: Option<Side>,
    /// The known words but sides, in order.
    pub words: Vec<Word>,
    /// The number that counts it within its chain.
    pub number: Option<u32>,
    /// The name without its side, for finding the mirrored one and the same joint of another figure.
    pub key: String,
}

/// Written as one word, its meaning, and whether it may stand inside a longer run of letters.
const WORDS: &[(&str, Word, bool)] = &[
    ("left", Word::Side(Side::Left), true),
    ("right", Word::Side(Side::Right), true),
    ("lft", Word::Side(Side::Left), true),
    ("rgt", Word::Side(Side::Right), true),
    ("lf", Word::Side(Side::Left), false),
    ("rt", Word::Side(Side::Right), false),
    ("l", Word::Side(Side::Left), true),
    ("r", Word::Side(Side::Right), true),
    ("hidari", Word::Side(Side::Left), true),
    ("migi", Word::Side(Side::Right), true),
    ("upper", Word::Upper, true),
    ("up", Word::Upper, true),
    ("lower", Word::Lower, true),
    ("low", Word::Lower, true),
    ("fore", Word::Fore, true),
    ("root", Word::Root, true),
    ("reference", Word::Root, true),
    ("cog", Word::Centre, false),
    ("center", Word::Centre, true),
    ("centre", Word::Centre, true),
    ("mass", Word::Filler, false),
    ("of", Word::Filler, false),
    ("body", Word::Body, true),
    ("hips", Word::Hip, true),
    ("hip", Word::Hip, true),
    ("pelvis", Word::Pelvis, true),
    ("koshi", Word::Pelvis, true),
    ("sacroiliac", Word::Pelvis, true),
    ("spine", Word::Spine, true),
    ("spinal", Word::Spine, true),
    ("abdomen", Word::Waist, true),
    ("belly", Word::Waist, true),
    ("waist", Word::Waist, true),
    ("lumbar", Word::Waist, true),
    ("back", Word::Back, true),
    ("torso", Word::Torso, true),
    ("trunk", Word::Torso, true),
    ("chest", Word::Chest, true),
    ("ribs", Word::Chest, true),
    ("thorax", Word::Chest, true),
    ("sternum", Word::Chest, true),
    ("mune", Word::Chest, true),
    ("neck", Word::Neck, true),
    ("cervical", Word::Neck, true),
    ("kubi", Word::Neck, true),
    ("head", Word::Head, true),
    ("skull", Word::Head, true),
    ("skullbase", Word::Head, true),
    ("cranium", Word::Head, true),
    ("atama", Word::Head, true),
    ("face", Word::Face, true),
    ("jaw", Word::Jaw, true),
    ("mandible", Word::Jaw, true),
    ("chin", Word::Jaw, false),
    ("temporomandibular", Word::Jaw, true),
    ("eye", Word::Eye, true),
    ("eyeball", Word::Eye, true),
    ("eyelid", Word::Helper, true),
    ("eyebrow", Word::Helper, true),
    ("lid", Word::Helper, false),
    ("brow", Word::Helper, false),
    ("clavicle", Word::Clavicle, true),
    ("clav", Word::Clavicle, true),
    ("collar", Word::Clavicle, true),
    ("collarbone", Word::Clavicle, true),
    ("scapula", Word::Clavicle, true),
    ("sternoclavicular", Word::Clavicle, true),
    ("acromioclavicular", Word::Clavicle, true),
    ("inshoulder", Word::Clavicle, true),
    ("shoulder", Word::Shoulder, true),
    ("kata", Word::Shoulder, false),
    ("arm", Word::Arm, true),
    ("ude", Word::Arm, false),
    ("humerus", Word::Humerus, true),
    ("shldr", Word::Humerus, true),
    ("bicep", Word::Humerus, true),
    ("elbow", Word::Elbow, true),
    ("forearm", Word::Elbow, true),
    ("radius", Word::Elbow, true),
    ("ulna", Word::Elbow, true),
    ("hiji", Word::Elbow, true),
    ("hand", Word::Hand, true),
    ("palm", Word::Hand, true),
    ("te", Word::Hand, false),
    ("wrist", Word::Wrist, true),
    ("radiocarpal", Word::Wrist, true),
    ("tekubi", Word::Wrist, true),
    ("thigh", Word::Thigh, true),
    ("femur", Word::Thigh, true),
    ("leg", Word::Leg, true),
    ("ashi", Word::Leg, false),
    ("shin", Word::Shin, true),
    ("calf", Word::Shin, true),
    ("knee", Word::Shin, true),
    ("tibia", Word::Shin, true),
    ("shank", Word::Shin, true),
    ("crus", Word::Shin, true),
    ("hiza", Word::Shin, true),
    ("sune", Word::Shin, false),
    ("foot", Word::Foot, true),
    ("hindfoot", Word::Foot, true),
    ("ankle", Word::Ankle, true),
    ("talus", Word::Ankle, true),
    ("talocrural", Word::Ankle, true),
    ("subtalar", Word::Ankle, true),
    ("ashikubi", Word::Ankle, true),
    ("toe", Word::Toe, true),
    ("toes", Word::Toe, true),
    ("toebase", Word::Toe, true),
    ("forefoot", Word::Toe, true),
    ("midtarsal", Word::Toe, true),
    ("metatarsal", Word::Toe, true),
    ("tarsometatarsal", Word::Ball, true),
    ("metatarsophalangeal", Word::Toe, true),
    ("tsumasaki", Word::Toe, true),
    ("ball", Word::Ball, true),
    ("thumb", Word::Finger(Finger::Thumb), true),
    ("oyayubi", Word::Finger(Finger::Thumb), true),
    ("index", Word::Finger(Finger::Index), true),
    ("pointer", Word::Finger(Finger::Index), true),
    ("hitosashiyubi", Word::Finger(Finger::Index), true),
    ("middle", Word::Finger(Finger::Middle), true),
    ("mid", Word::Finger(Finger::Middle), false),
    ("nakayubi", Word::Finger(Finger::Middle), true),
    ("ring", Word::Finger(Finger::Ring), true),
    ("kusuriyubi", Word::Finger(Finger::Ring), true),
    ("little", Word::Finger(Finger::Little), true),
    ("pinky", Word::Finger(Finger::Little), true),
    ("pinkie", Word::Finger(Finger::Little), true),
    ("koyubi", Word::Finger(Finger::Little), true),
    ("finger", Word::AnyFinger, true),
    ("fingers", Word::AnyFinger, true),
    ("yubi", Word::AnyFinger, true),
    ("metacarpal", Word::Metacarpal, true),
    ("carpometacarpal", Word::Metacarpal, true),
    ("metacarpophalangeal", Word::Proximal, true),
    ("proximal", Word::Proximal, true),
    ("intermediate", Word::Intermediate, true),
    ("distal", Word::Distal, true),
    ("interphalangeal", Word::Filler, true),
    ("carpal", Word::Filler, true),
    ("tail", Word::Tail, true),
    ("wing", Word::Wing, true),
    ("ear", Word::Ear, false),
    ("ears", Word::Ear, false),
    ("antenna", Word::Strand, true),
    ("hair", Word::Strand, true),
    ("ponytail", Word::Strand, true),
    ("braid", Word::Strand, true),
    ("skirt", Word::Strand, true),
    ("cape", Word::Strand, true),
    ("cloak", Word::Strand, true),
    ("cloth", Word::Strand, true),
    ("scarf", Word::Strand, true),
    ("ribbon", Word::Strand, true),
    ("breast", Word::Strand, true),
    ("twist", Word::Twist, true),
    ("roll", Word::Twist, true),
    ("end", Word::End, true),
    ("nub", Word::End, true),
    ("site", Word::End, false),
    ("tip", Word::End, true),
    ("effector", Word::Helper, true),
    ("null", Word::Helper, false),
    ("ik", Word::Helper, false),
    ("fk", Word::Filler, false),
    ("pole", Word::Helper, true),
    ("target", Word::Helper, true),
    ("ctrl", Word::Helper, true),
    ("control", Word::Helper, true),
    ("cam", Word::Helper, false),
    ("camera", Word::Helper, true),
    ("prop", Word::Helper, false),
    ("weapon", Word::Helper, true),
    ("sword", Word::Helper, true),
    ("shield", Word::Helper, true),
    ("slot", Word::Helper, true),
    ("socket", Word::Helper, true),
    ("attach", Word::Helper, true),
    ("holder", Word::Helper, true),
    ("grip", Word::Helper, true),
    ("front", Word::Front, true),
    ("hind", Word::Rear, true),
    ("rear", Word::Rear, true),
    ("joint", Word::Filler, true),
    ("jnt", Word::Filler, true),
    ("bone", Word::Filler, true),
    ("base", Word::Filler, true),
    ("node", Word::Filler, true),
    ("humanoid", Word::Filler, true),
    ("b", Word::Filler, false),
    ("j", Word::Filler, false),
    ("c", Word::Filler, false),
    ("m", Word::Filler, false),
];

/// Dictionary words in kana and kanji, longest first where one begins with another.
const KANA: &[(&str, &str)] = &[
    ("上半身", " spine "),
    ("下半身", " pelvis "),
    ("センター", " centre "),
    ("つま先", " toe "),
    ("爪先", " toe "),
    ("足首", " ankle "),
    ("手首", " wrist "),
    ("ひざ", " knee "),
    ("ひじ", " elbow "),
    ("人差指", " index "),
    ("人指", " index "),
    ("親指", " thumb "),
    ("中指", " middle "),
    ("薬指", " ring "),
    ("小指", " little "),
    ("太もも", " thigh "),
    ("すね", " shin "),
    ("あたま", " head "),
    ("くび", " neck "),
    ("あし", " leg "),
    ("うで", " arm "),
    ("かた", " collar "),
    ("こし", " pelvis "),
    ("むね", " chest "),
    ("ひだり", " left "),
    ("みぎ", " right "),
    ("ヒザ", " knee "),
    ("ヒジ", " elbow "),
    ("左", " left "),
    ("右", " right "),
    ("膝", " knee "),
    ("肘", " elbow "),
    ("足", " leg "),
    ("脚", " leg "),
    ("腿", " thigh "),
    ("腕", " arm "),
    ("手", " hand "),
    ("首", " neck "),
    ("頭", " head "),
    ("头", " head "),
    ("颈", " neck "),
    ("腰", " pelvis "),
    ("骨盤", " pelvis "),
    ("胸", " chest "),
    ("背骨", " spine "),
    ("脊椎", " spine "),
    ("肩", " collar "),
    ("目", " eye "),
    ("顎", " jaw "),
    ("尾", " tail "),
    ("翼", " wing "),
    ("先", " end "),
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
        let spelled = pieces[index].iter().any(|piece| {
            ["left", "right", "hidari", "migi", "lft", "rgt"].iter().any(|word| piece.contains(word))
        });
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

impl Name {
    fn has(&self, word: Word) -> bool {
        self.words.contains(&word)
    }

    /// Whether it says that the joint is none of the body: a control, a prop, a target.
    pub(super) fn is_helper(&self) -> bool {
        self.has(Word::Helper)
    }

    /// Whether it says that the joint ends a limb and turns nothing.
    pub(super) fn is_end(&self) -> bool {
        self.has(Word::End)
    }

    /// Whether it says that the joint takes part of a limb's twist.
    pub(super) fn is_twist(&self) -> bool {
        self.has(Word::Twist)
    }

    /// Whether it names a front limb of an animal.
    pub(super) fn is_front(&self) -> bool {
        self.has(Word::Front)
    }

    /// Hair, skirts, capes: hangs on the body and is no limb.
    pub(super) fn is_strand(&self) -> bool {
        self.has(Word::Strand)
    }

    /// Whether any part of a body is named.
    pub(super) fn names_a_part(&self) -> bool {
        self.words.iter().any(|word| {
            !matches!(
                word,
                Word::Filler
                    | Word::Upper
                    | Word::Lower
                    | Word::Fore
                    | Word::Side(_)
                    | Word::Front
                    | Word::Rear
                    | Word::Helper
                    | Word::End
                    | Word::Twist
                    | Word::Strand
                    | Word::Root
                    | Word::Centre
                    | Word::Body
            )
        })
    }

    /// The finger it names.
    pub(super) fn finger(&self) -> Option<Finger> {
        if self.has(Word::Leg) {
            return None;
        }
        self.words.iter().find_map(|word| match word {
            Word::Finger(finger) => Some(*finger),
            _ => None,
        })
    }

    /// Whether it names the metacarpal bone of a finger, which the specification has for the thumb alone.
    pub(super) fn is_metacarpal(&self) -> bool {
        self.has(Word::Metacarpal)
    }

    /// How well it fits a part: 1 says so, 0.4 to 0.9 may mean it, 0 says nothing, −1 says something else.
    #[expect(clippy::match_same_arms, reason = "a table, part by part")]
    pub(super) fn score(&self, part: Part) -> f64 {
        if self.is_helper() || self.is_end() || self.is_strand() {
            return -1.0;
        }
        let upper = self.has(Word::Upper);
        let lower = self.has(Word::Lower) || self.has(Word::Fore);
        let by_height = |low: f64, high: f64, bare: f64| {
            if lower {
                low
            } else if upper {
                high
            } else {
                bare
            }
        };
        let by_side = |sided: f64, bare: f64| if self.side.is_some() { sided } else { bare };
        let mut best: Option<f64> = None;
        let mut knows = false;
        let of_limb = self.words.iter().any(|word| {
            matches!(
                word,
                Word::Leg
                    | Word::Arm
                    | Word::Thigh
                    | Word::Shin
                    | Word::Foot
                    | Word::Shoulder
                    | Word::Hand
                    | Word::Toe
            )
        });
        for word in &self.words {
            use Word as W;
            // The back leg is no back, and the mid leg no finger.
            if of_limb && (*word == W::Back || (matches!(word, W::Finger(_)) && self.has(W::Leg))) {
                continue;
            }
            let fit = match (part, word) {
                (Part::Hips, W::Hip) => by_side(-1.0, 1.0),
                (Part::Hips, W::Pelvis) => by_side(-0.5, 1.0),
                (Part::Hips, W::Root | W::Centre) => 0.5,
                (Part::Hips, W::Body) => by_height(1.0, 0.4, 0.4),
                (Part::Hips, W::Torso | W::Waist) => 0.3,
                (Part::Hips, W::Spine) => 0.0,
                (Part::Spine | Part::Chest | Part::UpperChest, W::Root | W::Centre) => -0.3,
                (Part::Spine, W::Spine) => 0.9,
                (Part::Spine, W::Waist) => 1.0,
                (Part::Spine, W::Back | W::Torso) => by_height(0.9, 0.2, 0.9),
                (Part::Spine, W::Chest) => 0.2,
                (Part::Spine, W::Body) => by_height(0.3, 0.8, 0.3),
                (Part::Chest, W::Chest) => by_height(0.9, 0.5, 0.9),
                (Part::Chest, W::Spine) => 0.7,
                (Part::Chest, W::Back | W::Torso) => by_height(0.2, 0.7, 0.7),
                (Part::Chest, W::Waist) => 0.0,
                (Part::UpperChest, W::Chest) => by_height(0.8, 1.0, 0.8),
                (Part::UpperChest, W::Spine | W::Torso) => 0.6,
                (Part::UpperChest, W::Back) => by_height(0.1, 0.7, 0.1),
                (Part::Neck, W::Neck) => by_height(1.0, 0.8, 1.0),
                (Part::Head, W::Head) => 1.0,
                (Part::Head, W::Face) => 0.5,
                (Part::Head, W::Neck) => by_height(0.0, 0.1, 0.0),
                (Part::Jaw, W::Jaw) | (Part::Eye, W::Eye) => 1.0,
                (Part::Tail, W::Tail) | (Part::Wing, W::Wing) | (Part::Ear, W::Ear) => 1.0,
                (Part::Shoulder, W::Clavicle) => 1.0,
                (Part::Shoulder, W::Shoulder) => 0.75,
                (Part::UpperArm, W::Shoulder) => 0.7,
                (Part::UpperArm, W::Humerus) => 1.0,
                (Part::UpperArm, W::Arm) => by_height(-1.0, 1.0, 0.8),
                (Part::LowerArm, W::Elbow) => 1.0,
                (Part::LowerArm, W::Arm) => by_height(1.0, -1.0, 0.4),
                (Part::Hand, W::Wrist) => 1.0,
                (Part::Hand, W::Hand) => 0.95,
                (Part::Hand | Part::Shoulder, W::Arm) => by_height(-1.0, -1.0, 0.2),
                (Part::UpperLeg, W::Thigh) => 1.0,
                (Part::UpperLeg, W::Hip) => by_side(0.8, -1.0),
                (Part::UpperLeg, W::Leg) => by_height(-1.0, 1.0, 0.7),
                (Part::LowerLeg, W::Shin) => 1.0,
                (Part::LowerLeg, W::Leg) => by_height(1.0, -1.0, 0.65),
                (Part::Foot, W::Ankle) => 1.0,
                (Part::Foot, W::Foot) => 0.9,
                (Part::Foot | Part::Toes, W::Leg) => by_height(-1.0, -1.0, 0.2),
                (Part::Toes, W::Toe | W::Ball) => 1.0,
                (Part::Toes, W::Foot) => 0.5,
                (Part::Finger(finger), W::Finger(named)) if finger == *named => 1.0,
                (Part::Finger(_), W::AnyFinger) => 0.3,
                // A hand that carries fingers names both; the finger decides.
                (Part::Finger(_), W::Hand) => continue,
                (_, W::Filler | W::Upper | W::Lower | W::Fore | W::Side(_) | W::Front | W::Rear) => continue,
                (_, W::Root | W::Body | W::Centre) => continue,
                _ => -1.0,
            };
            knows = true;
            best = Some(best.map_or(fit, |best| best.max(fit)));
        }
        if !knows {
            return 0.0;
        }
        // A finger of a hand is no hand, and a twist joint of an arm no arm.
        let clash = (self.finger().is_some()
            && !matches!(part, Part::Finger(_))
            && !(part == Part::Toes && self.has(Word::Toe)))
            || (self.is_twist());
        if clash { -1.0 } else { best.unwrap_or(0.0) }
    }
}

#[cfg(test)]
mod tests {
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
