//! Left and right: which subtrees mirror each other, and across which plane.

use std::collections::HashMap;

use glam::DVec3;

use super::figure::{Figure, ROUNDING};
use super::role::Side;

/// Two subtrees that mirror each other, on one centre joint.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Pair {
    /// The centre joint they hang on.
    pub on: usize,
    /// The first joints. Where names tell sides, left and right.
    pub first: [usize; 2],
    /// Whether names say which is left.
    pub is_named: bool,
}

/// The mirror plane and the pairs found with it.
pub(super) struct Pairs {
    /// Across the mirror plane, of unit length. Where names tell sides it points to the left.
    pub across: DVec3,
    /// Whether names say that it points to the left.
    pub is_left: bool,
    /// In the order of their joints.
    pub list: Vec<Pair>,
}

impl Pairs {
    pub(super) fn new(figure: &Figure<'_>, root: usize) -> Self {
        let mut pairs = Vec::new();
        let mut loose: Vec<Vec<usize>> = Vec::new();
        // Named pairs, and the siblings that names leave over, of every centre joint.
        let mut stack = vec![root];
        let mut centres = Vec::new();
        while let Some(on) = stack.pop() {
            centres.push(on);
            let mut by_key: HashMap<&str, [Option<usize>; 2]> = HashMap::new();
            for &kid in &figure.kids[on] {
                if let Some(side) = figure.names[kid].side {
                    by_key.entry(&figure.names[kid].key).or_default()[side.index()] = Some(kid);
                }
            }
            let mut rest = Vec::new();
            for &kid in &figure.kids[on] {
                match by_key.get(figure.names[kid].key.as_str()) {
                    Some([Some(left), Some(right)]) if figure.names[kid].side.is_some() => {
                        if figure.names[kid].side == Some(Side::Left) && kid == *left {
                            pairs.push(Pair { on, first: [*left, *right], is_named: true });
                        }
                    }
                    _ => rest.push(kid),
                }
            }
            stack.extend(rest.iter().copied());
            loose.push(rest);
        }
        let named = pairs.iter().fold(DVec3::ZERO, |sum, pair: &Pair| {
            let [left, right] = pair.first;
            sum + along_subtrees(figure, left, right)
        });
        let is_left = named.length() > 1e-3 * figure.extent;
        let across = if is_left { named.normalize() } else { vote(figure, &loose) };
        let mut in_pair = vec![false; figure.names.len()];
        for (on, rest) in centres.iter().zip(&loose) {
            let mut free = rest.clone();
            free.retain(|&kid| !in_pair[kid]);
            while let Some((a, b)) = best_match(figure, *on, &free, across) {
                let ahead = (figure.far[a] - figure.far[b]).dot(across) >= 0.0;
                let first = if ahead { [a, b] } else { [b, a] };
                pairs.push(Pair { on: *on, first, is_named: false });
                in_pair[a] = true;
                in_pair[b] = true;
                free.retain(|&kid| kid != a && kid != b);
            }
        }
        // What hangs inside a limb is no pair of the body.
        let inside = |pair: &Pair| figure.ancestors(pair.on).iter().any(|&up| in_pair[up]);
        let mut pairs: Vec<Pair> = pairs.into_iter().filter(|pair| !inside(pair)).collect();
        pairs.sort_by_key(|pair| (pair.on, pair.first));
        Self { across, is_left, list: pairs }
    }
}

/// From right to left, summed along the main chains of two subtrees.
fn along_subtrees(figure: &Figure<'_>, left: usize, right: usize) -> DVec3 {
    let (left, right) = (figure.path_down(left), figure.path_down(right));
    left.iter().zip(&right).fold(DVec3::ZERO, |sum, (&l, &r)| sum + figure.position[l] - figure.position[r])
}

/// Siblings with as many joints and as long a reach.
fn are_alike(figure: &Figure<'_>, a: usize, b: usize) -> bool {
    let (long, short) = (figure.reach[a].max(figure.reach[b]), figure.reach[a].min(figure.reach[b]));
    let own = |joint: usize| {
        figure.parent[joint].map_or(0.0, |up| figure.position[joint].distance(figure.position[up]))
    };
    figure.size[a].abs_diff(figure.size[b]) <= 1
        && short >= 0.85 * long
        && (long > 0.0 || own(a) > 0.0)
        && (own(a) - own(b)).abs() <= 0.15 * own(a).max(own(b)).max(long)
}

/// The direction in which most alike siblings lie apart.
fn vote(figure: &Figure<'_>, loose: &[Vec<usize>]) -> DVec3 {
    let mut apart: Vec<DVec3> = Vec::new();
    for rest in loose {
        // Crowded nodes are no body; a bound on work too.
        for (at, &a) in rest.iter().enumerate().take(32) {
            for &b in rest[at + 1..].iter().take(32) {
                let difference = figure.far[a] - figure.far[b];
                if are_alike(figure, a, b) && difference.length() > 1e-3 * figure.extent {
                    apart.push(difference);
                }
            }
        }
    }
    // The one that agrees best with all, signs aside.
    let score = |d: &DVec3| apart.iter().map(|other| other.dot(d.normalize()).abs()).sum::<f64>();
    let best = apart
        .iter()
        .copied()
        .reduce(|best, d| if score(&d) > score(&best) * (1.0 + ROUNDING) { d } else { best });
    let Some(best) = best else { return DVec3::X };
    let sum = apart.iter().fold(DVec3::ZERO, |sum, d| {
        let signed = if d.dot(best) < 0.0 { -*d } else { *d };
        let near = signed.normalize().dot(best.normalize()) > 0.9;
        if near { sum + signed } else { sum }
    });
    sum.normalize_or(DVec3::X)
}

/// The two of `free` that mirror each other best across the plane through the joint they hang on.
fn best_match(figure: &Figure<'_>, on: usize, free: &[usize], across: DVec3) -> Option<(usize, usize)> {
    let mirrored = |place: DVec3| place - across * (2.0 * (place - figure.position[on]).dot(across));
    let mut best: Option<(f64, usize, usize)> = None;
    for (at, &a) in free.iter().enumerate().take(32) {
        for &b in free[at + 1..].iter().take(32) {
            let size = figure.reach[a].max(figure.position[a].distance(figure.position[on]));
            let apart = (figure.far[a] - figure.far[b]).dot(across).abs();
            if !are_alike(figure, a, b) || apart < 0.04 * size {
                continue;
            }
            let error = mirrored(figure.far[a]).distance(figure.far[b])
                + mirrored(figure.position[a]).distance(figure.position[b]);
            if error <= 0.4 * size && best.is_none_or(|(least, _, _)| error < least - ROUNDING * size) {
                best = Some((error, a, b));
            }
        }
    }
    best.map(|(_, a, b)| (a, b))
}
