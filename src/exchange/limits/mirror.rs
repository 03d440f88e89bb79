//! Limits as they stand in a file, degrees. Apart from the limits themselves, so that the program may change and old files still read.

use std::collections::BTreeMap;

use glam::DVec3;
use serde::{Deserialize, Serialize};

use crate::limit::{Interval, JointLimit, Range, SwingLimit};
use crate::rotor::Rotor;

/// The version this program writes.
pub(super) const VERSION: u32 = 1;

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Saved {
    pub(super) turnwright_limits: u32,
    #[serde(default)]
    pub(super) title: String,
    pub(super) joints: BTreeMap<String, Joint>,
}

/// One joint's limit. What is left out: zero is the rest pose, the twist axis the limb, comfort four fifths of the limit, and beyond
/// the limit itself is a fault.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(in crate::exchange) struct Joint {
    /// The local turn at which swing and twist are 0, as a quaternion x, y, z, w.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(in crate::exchange) zero: Option<(f64, f64, f64, f64)>,
    /// In the joint's own frame.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(in crate::exchange) twist_axis: Option<(f64, f64, f64)>,
    /// The axis of the first swing angle, in the joint's own frame.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(in crate::exchange) bend_axis: Option<(f64, f64, f64)>,
    #[serde(default)]
    pub(in crate::exchange) swing: Swing,
    /// Least and most, degrees.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(in crate::exchange) twist: Option<(f64, f64)>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(in crate::exchange) comfort: Option<Band>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(in crate::exchange) fault: Option<Band>,
    /// How sure zero and axes are, 0 to 1.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub(in crate::exchange) confidence: Option<f64>,
}

#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(in crate::exchange) struct Band {
    #[serde(default)]
    swing: Swing,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    twist: Option<(f64, f64)>,
}

/// Degrees.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
pub(in crate::exchange) enum Swing {
    /// No limit.
    #[default]
    Free,
    /// The same to every side.
    Cone(f64),
    /// About the bend axis forwards and backwards, about the side axis (twist axis × bend axis) forwards and backwards; each above 0.
    Ellipse { bend_plus: f64, bend_minus: f64, side_plus: f64, side_minus: f64 },
    /// Range of the bend, and how far it gives to either side.
    Hinge { bend: (f64, f64), give: f64 },
}

/// The quaternion of the rest pose, and the limb's direction, where a file leaves them out.
pub(in crate::exchange) struct Defaults {
    pub(in crate::exchange) zero: Rotor,
    pub(in crate::exchange) limb: Option<DVec3>,
}

fn wrong<T>(expected: &str, found: String) -> Result<T, [String; 2]> {
    Err([expected.to_owned(), found])
}

impl Joint {
    /// The limit it means; what is wrong with it as expected and found.
    pub(in crate::exchange) fn limit(&self, defaults: &Defaults) -> Result<JointLimit, [String; 2]> {
        let zero = match self.zero {
            None => defaults.zero,
            Some((x, y, z, w)) => match Rotor::from_xyzw([x, y, z, w]).try_normalize() {
                Some(zero) => zero,
                None => return wrong("a quaternion x, y, z, w as zero", format!("({x}, {y}, {z}, {w})")),
            },
        };
        let axis = |axis: Option<(f64, f64, f64)>| {
            axis.map(|(x, y, z)| match DVec3::new(x, y, z).try_normalize() {
                Some(axis) => Ok(axis),
                None => wrong("an axis that is not zero", format!("({x}, {y}, {z})")),
            })
            .transpose()
        };
        let Some(twist_axis) = axis(self.twist_axis)?.or(defaults.limb) else {
            return wrong("a twist_axis, as the joint has no limb to go by", "none".to_owned());
        };
        let bend_axis = axis(self.bend_axis)?.unwrap_or(twist_axis.any_orthonormal_vector());
        let limit = range(&self.swing, self.twist)?;
        let mut own = JointLimit::new(zero, twist_axis, bend_axis, limit);
        if let Some(band) = &self.comfort {
            own.comfort = range(&band.swing, band.twist)?;
        }
        if let Some(band) = &self.fault {
            own.fault = range(&band.swing, band.twist)?;
        }
        if let Some(confidence) = self.confidence {
            if !(0.0..=1.0).contains(&confidence) {
                return wrong("a confidence from 0 to 1", confidence.to_string());
            }
            own.confidence = confidence;
        }
        Ok(own)
    }

    /// The whole of a limit.
    pub(in crate::exchange) fn of(limit: &JointLimit) -> Self {
        let [x, y, z, w] = limit.zero.to_xyzw();
        let band = |range: &Range| Band { swing: Swing::of(&range.swing), twist: twist_of(range.twist) };
        Self {
            zero: Some((x, y, z, w)),
            twist_axis: Some(limit.twist_axis.into()),
            bend_axis: Some(limit.bend_axis.into()),
            swing: Swing::of(&limit.limit.swing),
            twist: twist_of(limit.limit.twist),
            comfort: Some(band(&limit.comfort)),
            fault: Some(band(&limit.fault)),
            confidence: Some(limit.confidence),
        }
    }
}

impl Swing {
    fn of(swing: &SwingLimit) -> Self {
        match *swing {
            SwingLimit::Cone { half_rad } if half_rad >= std::f64::consts::PI => Self::Free,
            SwingLimit::Cone { half_rad } => Self::Cone(half_rad.to_degrees()),
            SwingLimit::Ellipse { sides_rad } => {
                let [bend_plus, bend_minus, side_plus, side_minus] = sides_rad.map(f64::to_degrees);
                Self::Ellipse { bend_plus, bend_minus, side_plus, side_minus }
            }
            SwingLimit::Hinge { bend, give_rad } => {
                Self::Hinge { bend: bend.to_degrees().into(), give: give_rad.to_degrees() }
            }
        }
    }
}

fn twist_of(twist: Interval) -> Option<(f64, f64)> {
    (!twist.is_free()).then(|| twist.to_degrees().into())
}

/// A range from degrees.
fn range(swing: &Swing, twist: Option<(f64, f64)>) -> Result<Range, [String; 2]> {
    /// An ellipse needs some width on every side.
    const LEAST_SIDE_DEG: f64 = 0.01;
    /// Beyond a whole turn no range makes sense.
    const MOST_DEG: f64 = 360.0;
    let interval = |name: &str, (lo, hi): (f64, f64)| {
        if lo.abs() <= MOST_DEG && hi.abs() <= MOST_DEG && lo <= hi {
            Ok(Interval::from_degrees(lo, hi))
        } else {
            wrong(&format!("{name} as least and most, from -360 to 360"), format!("({lo}, {hi})"))
        }
    };
    let side = |name: &str, degrees: f64, least: f64| {
        if degrees >= least && degrees <= MOST_DEG {
            Ok(degrees.to_radians())
        } else {
            wrong(&format!("{name} from {least} to 360 degrees"), degrees.to_string())
        }
    };
    let swing = match *swing {
        Swing::Free => SwingLimit::FREE,
        Swing::Cone(half) => SwingLimit::Cone { half_rad: side("a cone", half, 0.0)? },
        Swing::Ellipse { bend_plus, bend_minus, side_plus, side_minus } => SwingLimit::Ellipse {
            sides_rad: [
                side("bend_plus", bend_plus, LEAST_SIDE_DEG)?,
                side("bend_minus", bend_minus, LEAST_SIDE_DEG)?,
                side("side_plus", side_plus, LEAST_SIDE_DEG)?,
                side("side_minus", side_minus, LEAST_SIDE_DEG)?,
            ],
        },
        Swing::Hinge { bend, give } => {
            SwingLimit::Hinge { bend: interval("bend", bend)?, give_rad: side("give", give, 0.0)? }
        }
    };
    Ok(Range { swing, twist: twist.map_or(Ok(Interval::FREE), |twist| interval("twist", twist))? })
}
