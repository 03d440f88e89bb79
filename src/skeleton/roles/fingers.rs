//! Fingers: chains under a hand, told by name, else by how they lie.

use glam::DVec3;

use super::figure::Figure;
use super::role::Finger;

/// A finger with its joints from the palm outwards, the metacarpal of all but the thumb left out.
pub(super) struct Digit {
    pub finger: Finger,
    pub joints: Vec<usize>,
    pub is_named: bool,
}

/// The fingers under a hand.
pub(super) fn fingers(figure: &Figure<'_>, hand: usize) -> Vec<Digit> {
    let below: Vec<usize> = figure.subtree(hand).into_iter().skip(1).collect();
    let mut named: Vec<Digit> = Vec::new();
    for finger in Finger::ALL {
        let joints: Vec<usize> =
            below.iter().copied().filter(|&joint| figure.names[joint].finger() == Some(finger)).collect();
        // One chain: each below the one before.
        let Some(&first) = joints.first() else { continue };
        let chain: Vec<usize> = joints.into_iter().filter(|&joint| figure.is_below(joint, first)).collect();
        named.push(Digit { finger, joints: trimmed(figure, hand, finger, chain), is_named: true });
    }
    if !named.is_empty() {
        return named;
    }
    by_shape(figure, hand)
}

/// Three joints: a metacarpal is left out at the palm (not of the thumb), an end point at the tip.
fn trimmed(figure: &Figure<'_>, hand: usize, finger: Finger, mut chain: Vec<usize>) -> Vec<usize> {
    if finger != Finger::Thumb && chain.len() > 1 {
        let [first, second] = [chain[0], chain[1]];
        let starts_at_zero = figure.names[first].number == Some(0);
        let palm = figure.position[first].distance(figure.position[hand]);
        let bone = figure.position[first].distance(figure.position[second]);
        if figure.names[first].is_metacarpal() || starts_at_zero || (chain.len() >= 4 && palm < 0.5 * bone) {
            chain.remove(0);
        }
    }
    chain.truncate(3);
    chain
}

/// Two to five chains side by side: the thumb is the one that turns away most and starts nearest the wrist; the others follow
/// in order across the palm, the index next to it.
fn by_shape(figure: &Figure<'_>, hand: usize) -> Vec<Digit> {
    // A connector may stand between.
    let mut on = hand;
    while let [only] = figure.kids[on][..] {
        if figure.position[only].distance(figure.position[on]) > 1e-6 * figure.extent
            || figure.kids[only].len() < 2
        {
            break;
        }
        on = only;
    }
    let mut chains: Vec<Vec<usize>> = figure.kids[on]
        .iter()
        .map(|&kid| figure.path_down(kid))
        .filter(|chain| chain.len() >= 2 && !figure.names[chain[0]].is_strand())
        .collect();
    // Fewer than four can't be told from each other without names.
    if !(4..=5).contains(&chains.len()) {
        return Vec::new();
    }
    let direction = |chain: &[usize]| (figure.far[chain[0]] - figure.position[chain[0]]).normalize_or_zero();
    let mean = chains.iter().fold(DVec3::ZERO, |sum, chain| sum + direction(chain)).normalize_or_zero();
    let wrist = figure.position[hand];
    let size = figure.reach[hand].max(f64::MIN_POSITIVE);
    let apart = |chain: &[usize]| {
        direction(chain).angle_between(mean) - figure.position[chain[0]].distance(wrist) / size
    };
    let thumb = (0..chains.len()).max_by(|&a, &b| apart(&chains[a]).total_cmp(&apart(&chains[b])));
    let Some(thumb) = thumb else { return Vec::new() };
    let thumb = chains.remove(thumb);
    let base = figure.position[thumb[0]];
    // Across the palm: from the knuckle nearest the thumb's base outwards.
    chains.sort_by(|a, b| {
        figure.position[a[0]]
            .distance(base)
            .total_cmp(&figure.position[b[0]].distance(base))
            .then(a[0].cmp(&b[0]))
    });
    let order = [Finger::Index, Finger::Middle, Finger::Ring, Finger::Little];
    // Three fingers beside a thumb: which one is missing nobody can tell; the outermost is taken for that.
    let mut digits = vec![Digit {
        finger: Finger::Thumb,
        joints: trimmed(figure, hand, Finger::Thumb, thumb),
        is_named: false,
    }];
    digits.extend(chains.into_iter().zip(order).map(|(chain, finger)| Digit {
        finger,
        joints: trimmed(figure, hand, finger, chain),
        is_named: false,
    }));
    digits
}
