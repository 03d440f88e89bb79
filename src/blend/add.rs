//! Layers: what one clip does beyond its reference, laid over another.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::Clip;
use crate::rotor::{Rotor, geodesic_mean};

use super::frames::{self, Row};
use super::mix::said;
use super::{BlendError, Mask};

/// What a layer is measured from.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Reference {
    /// The layer's first frame.
    #[default]
    First,
    /// The rest pose that the layer's turns are measured from ([`Skeleton::chosen_rest`](crate::skeleton::Skeleton::chosen_rest)).
    Rest,
    /// The layer's mean over time: geodesic for turns.
    Mean,
}

/// On which side the difference is composed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Side {
    /// In the joint's own frame: `A · (B₀⁻¹ B)^W`.
    #[default]
    Body,
    /// In the parent's frame: `(B B₀⁻¹)^W · A`.
    Parent,
}

/// `layer`'s difference from its reference laid over `a` at `a`'s frames: composed to the power `weight`, never
/// interpolated towards, so the weight may exceed 1 or be negative. Places add `weight` times their difference; sizes
/// stay `a`'s. After the layer's end its last difference stands. Weight 0 is `a`, bit for bit.
///
/// # Errors
/// When the weight is not finite or a clip has no frames.
pub fn add(
    a: &Clip,
    layer: &Clip,
    weight: f64,
    reference: Reference,
    side: Side,
    mask: &Mask,
) -> Result<Clip, BlendError> {
    if !weight.is_finite() {
        return Err(BlendError::Weight { expected: "that is a finite number", found: weight });
    }
    frames::check_frames(a)?;
    frames::check_frames(layer)?;
    let times: Vec<f64> = a.grid.times.iter().collect();
    let joints = (0..a.joints.len()).map(|joint| {
        let share = weight * mask.of(joint);
        let [turns, moves, _] = frames::says(layer, joint);
        if share == 0.0 || !(turns || moves) {
            return a.joints[joint].clone();
        }
        let rest = layer.skeleton.chosen_rest(joint);
        let mut row = Row::default();
        // Where the layer is at its reference `a` keeps its numbers.
        let mut is_still = vec![true; times.len()];
        if turns {
            let own = a.rotations_at(joint, &times);
            let other = layer.rotations_at(joint, &times);
            let from = match reference {
                Reference::First => layer.rotations_at(joint, &[0.0])[0],
                Reference::Rest => rest.rotation,
                Reference::Mean => {
                    let all = layer.rotations_at(joint, &layer.grid.times.iter().collect::<Vec<f64>>());
                    let weighted: Vec<(Rotor, f64)> = all.iter().map(|&turn| (turn, 1.0)).collect();
                    geodesic_mean(&weighted).unwrap_or(all[0])
                }
            };
            let laid = own.iter().zip(&other).enumerate().map(|(frame, (&own, &other))| {
                if other == from {
                    return own;
                }
                is_still[frame] = false;
                match side {
                    Side::Body => (own * (from.reverse() * other).pow(share)).normalize(),
                    Side::Parent => ((other * from.reverse()).pow(share) * own).normalize(),
                }
            });
            row.rotations = Some(laid.collect());
        } else if said(a, a, joint)[0] {
            row.rotations = Some(a.rotations_at(joint, &times));
        }
        if moves {
            let own = frames::places(a, joint, &times);
            let other = frames::places(layer, joint, &times);
            let from = match reference {
                Reference::First => frames::places(layer, joint, &[0.0])[0],
                Reference::Rest => rest.translation,
                Reference::Mean => {
                    let all = frames::places(layer, joint, &layer.grid.times.iter().collect::<Vec<f64>>());
                    all.iter().sum::<DVec3>() / all.len() as f64
                }
            };
            let laid = own.iter().zip(&other).enumerate().map(|(frame, (&own, &other))| {
                is_still[frame] &= other == from;
                own + (other - from) * share
            });
            row.translations = Some(laid.collect());
        }
        let first = &a.joints[joint];
        let made_places = row.translations.is_some();
        let on_frames = first.rotation.as_ref().is_none_or(|track| track.times == a.grid.times);
        let kept = |frame: usize| (on_frames && is_still[frame]).then_some(frame);
        let mut tracks = frames::tracks(first, &a.grid.times, row, Some(&kept));
        if !turns {
            tracks.rotation.clone_from(&first.rotation);
        }
        if !made_places {
            tracks.translation.clone_from(&first.translation);
        }
        tracks.scale.clone_from(&first.scale);
        Arc::new(tracks)
    });
    let joints = joints.collect();
    Ok(frames::clip_of(a, a.grid.times.clone(), joints))
}
