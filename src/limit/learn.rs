//! Limits learned from a take that is known to be clean.

use glam::{DMat2, DVec2, DVec3};

use crate::clip::Clip;
use crate::rotor::{Bivector, Rotor, SwingTwist, chordal_mean};

use super::interval::Interval;
use super::joint_limit::{JointLimit, Range};
use super::limits::{Limits, limb_direction};
use super::swing::SwingLimit;

/// How generous learned limits are.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LearnOptions {
    /// Added to the usual reach on each side, as a share of it.
    pub margin_share: f64,
    /// Added on each side, radians.
    pub margin_rad: f64,
    /// The share of frames that tells the usual reach; single frames beyond do not widen the margin.
    pub usual_share: f64,
}

impl Default for LearnOptions {
    fn default() -> Self {
        Self { margin_share: 0.1, margin_rad: 5.0 / 180.0 * std::f64::consts::PI, usual_share: 0.98 }
    }
}

/// The limits that the take itself keeps: for each joint that turns, an ellipse of swing and a range of twist about its mean pose.
///
/// Each side is the usual reach there with a margin, and never tighter than the farthest pose seen. Comfort ends at the usual reach.
/// A joint whose swing goes all around gets no limit of swing; one whose twist does, none of twist.
pub fn learned(clip: &Clip, options: &LearnOptions) -> Limits {
    let times: Vec<f64> = clip.grid.times.iter().collect();
    let mut limits = Limits { title: "learned".to_owned(), ..Limits::default() };
    for joint in clip.skeleton.listed() {
        let Some(track) = clip.rotation(joint).filter(|track| !track.keys.is_empty()) else { continue };
        // A root is carried about by its scene.
        let (Some(_), Some(axis)) =
            (clip.skeleton.parent_joint(joint), limb_direction(&clip.skeleton, joint))
        else {
            continue;
        };
        let poses = track.at_all(&times);
        if let Some(limit) = learned_joint(&poses, axis, options) {
            limits.joints.insert(joint, limit);
        }
    }
    limits
}

fn learned_joint(poses: &[Rotor], twist_axis: DVec3, options: &LearnOptions) -> Option<JointLimit> {
    let weighted: Vec<(Rotor, f64)> = poses.iter().map(|pose| (*pose, 1.0)).collect();
    let zero = chordal_mean(&weighted)?.rotor;
    let any = twist_axis.any_orthonormal_vector();
    let side = twist_axis.cross(any);
    let splits: Vec<SwingTwist> =
        poses.iter().map(|pose| SwingTwist::new(zero.reverse() * *pose, twist_axis)).collect();
    let swings: Vec<DVec2> = splits
        .iter()
        .map(|split| {
            let axis = split.swing.plane_angles().axis();
            DVec2::new(axis.dot(any), axis.dot(side))
        })
        .collect();
    // The bend axis is the one about which the joint swings most.
    let spread = swings.iter().fold(DMat2::ZERO, |sum, s| sum + DMat2::from_cols(*s * s.x, *s * s.y));
    let direction = 0.5 * (2.0 * spread.x_axis.y).atan2(spread.x_axis.x - spread.y_axis.y);
    let turn = DMat2::from_angle(-direction);
    let swings: Vec<DVec2> = swings.into_iter().map(|swing| turn * swing).collect();
    let bend_axis = Rotor::from_plane_angles(Bivector::from_axis(twist_axis * direction)).apply(any);
    let mut twists: Vec<f64> = splits.iter().map(|split| split.twist_rad).collect();
    let swing = learned_swing(&swings, options);
    let twist = learned_twist(&mut twists, options);
    let mut limit = JointLimit::new(zero, twist_axis, bend_axis, Range { swing: swing.1, twist: twist.1 });
    limit.comfort = Range { swing: swing.0, twist: twist.0 };
    Some(limit)
}

/// The value below which `share` of the sorted values lie.
fn quantile(sorted: &[f64], share: f64) -> f64 {
    let place = ((sorted.len() as f64 - 1.0) * share).round() as usize;
    sorted.get(place).copied().unwrap_or(0.0)
}

/// Comfort and limit of swing.
fn learned_swing(swings: &[DVec2], options: &LearnOptions) -> (SwingLimit, SwingLimit) {
    let reach = |axis: fn(&DVec2) -> f64| {
        let mut values: Vec<f64> = swings.iter().map(axis).filter(|value| *value > 0.0).collect();
        values.sort_by(f64::total_cmp);
        quantile(&values, options.usual_share)
    };
    let usual = [reach(|s| s.x), reach(|s| -s.x), reach(|s| s.y), reach(|s| -s.y)];
    let sides = usual.map(|side| side * (1.0 + options.margin_share) + options.margin_rad);
    let ellipse = SwingLimit::Ellipse { sides_rad: sides };
    // Never tighter than seen: grown as a whole, so that its form stays.
    let most = swings.iter().map(|swing| ellipse.level([swing.x, swing.y])).fold(1.0, f64::max);
    let grown = sides.map(|side| side * most);
    if grown.iter().any(|side| *side >= std::f64::consts::PI) {
        return (SwingLimit::FREE, SwingLimit::FREE);
    }
    let comfort = usual.map(|side| side.max(0.5 * options.margin_rad));
    let share =
        comfort.iter().zip(grown).map(|(inner, side)| inner / side).fold(0.0, f64::max).clamp(0.5, 0.95);
    (
        SwingLimit::Ellipse { sides_rad: grown.map(|side| side * share) },
        SwingLimit::Ellipse { sides_rad: grown },
    )
}

/// Comfort and limit of twist.
fn learned_twist(twists: &mut [f64], options: &LearnOptions) -> (Interval, Interval) {
    twists.sort_by(f64::total_cmp);
    let (first, last) = (twists.first().copied().unwrap_or(0.0), twists.last().copied().unwrap_or(0.0));
    let outside = 0.5 * (1.0 - options.usual_share);
    let (lo, hi) = (quantile(twists, outside), quantile(twists, 1.0 - outside));
    let margin = 0.5 * (hi - lo) * options.margin_share + options.margin_rad;
    let limit = Interval { lo_rad: (lo - margin).min(first), hi_rad: (hi + margin).max(last) };
    if limit.half_rad() > 0.9 * std::f64::consts::PI {
        return (Interval::FREE, Interval::FREE);
    }
    let inner = Interval { lo_rad: lo.max(limit.lo_rad), hi_rad: hi.min(limit.hi_rad) };
    (inner, limit)
}
