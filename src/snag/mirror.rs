//! The joint on the other side of the body, by name.

use crate::skeleton::Skeleton;

/// The joint that is named as `joint` is but for left and right; of several the one as deep in the skeleton, then the
/// first.
pub(super) fn mirror_of(skeleton: &Skeleton, joint: usize) -> Option<usize> {
    let own = words(skeleton.label(joint));
    let wanted: Vec<String> = own.iter().map(|word| other_side(word)).collect();
    if wanted == own {
        return None;
    }
    let depth = skeleton.depth(joint);
    let named = |other: &usize| *other != joint && words(skeleton.label(*other)) == wanted;
    skeleton.listed().filter(named).min_by_key(|other| (skeleton.depth(*other).abs_diff(depth), *other))
}

fn other_side(word: &str) -> String {
    match word {
        "left" => "right",
        "right" => "left",
        "l" => "r",
        "r" => "l",
        _ => word,
    }
    .to_owned()
}

/// The words of a name in small letters: parted at marks, at capitals and at digits. A number at the end that only counts
/// the file's nodes is left out.
fn words(name: &str) -> Vec<String> {
    let mut words: Vec<String> = Vec::new();
    let mut before = ' ';
    for sign in name.chars() {
        if !sign.is_alphanumeric() {
            before = ' ';
            continue;
        }
        let is_new = before == ' '
            || (sign.is_uppercase() && !before.is_uppercase())
            || sign.is_numeric() != before.is_numeric();
        let small = sign.to_lowercase();
        match words.last_mut() {
            Some(word) if !is_new => word.extend(small),
            _ => words.push(small.collect()),
        }
        before = sign;
    }
    let counts = |word: &String| word.len() >= 2 && word.chars().all(char::is_numeric);
    if words.len() > 1 && words.last().is_some_and(counts) {
        words.pop();
    }
    // One capital before a word in small letters: `LHipJoint` is the left one.
    words
        .into_iter()
        .enumerate()
        .flat_map(|(i, word)| {
            let side = word.chars().next().filter(|sign| matches!(sign, 'l' | 'r'));
            let is_led = i == 0
                && name.chars().nth(1).is_some_and(char::is_uppercase)
                && name.chars().next().is_some_and(|sign| matches!(sign, 'L' | 'R'));
            match side {
                Some(side) if is_led && word.len() > 1 => vec![side.to_string(), word[1..].to_owned()],
                _ => vec![word],
            }
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::skeleton::{Joint, JointKind, Transform};

    #[test]
    fn left_and_right_are_told_in_many_ways_of_naming() {
        let names = [
            "Hips",
            "LeftArm",
            "RightArm",
            "LHipJoint",
            "RHipJoint",
            "thigh.L",
            "thigh.R",
            "b_LeftLeg01_015",
            "b_RightLeg01_019",
            "Ear2.L",
            "Ear3.L",
            "Ear2.R",
            "Ear3.R",
            "upperleg.l",
            "upperleg.r",
        ];
        let joints = names.iter().enumerate().map(|(number, name)| Joint {
            name: (*name).to_owned(),
            number,
            parent: (number > 0).then_some(0),
            rest: Transform::IDENTITY,
            kind: JointKind::Joint,
            tips: vec![],
        });
        let skeleton = Skeleton::new(joints.collect()).unwrap();
        let found: Vec<Option<usize>> = (0..names.len()).map(|joint| mirror_of(&skeleton, joint)).collect();
        let pairs = [
            None,
            Some(2),
            Some(1),
            Some(4),
            Some(3),
            Some(6),
            Some(5),
            Some(8),
            Some(7),
            Some(11),
            Some(12),
            Some(9),
            Some(10),
            Some(14),
            Some(13),
        ];
        assert_eq!(found, pairs);
    }
}
