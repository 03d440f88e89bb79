//! A place, a turn and a size: what carries a joint from its parent.

use glam::{DAffine3, DMat3, DVec3};

use crate::rotor::Rotor;

/// Translation, rotation and scale, applied to a point in the order scale, rotation, translation.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Transform {
    /// Where the origin goes, in the parent's lengths.
    pub translation: DVec3,
    /// The turn; unit.
    pub rotation: Rotor,
    /// Factors along the own axes, before the turn.
    pub scale: DVec3,
}

impl Default for Transform {
    fn default() -> Self {
        Self::IDENTITY
    }
}

impl Transform {
    /// Changes nothing.
    pub const IDENTITY: Self =
        Self { translation: DVec3::ZERO, rotation: Rotor::IDENTITY, scale: DVec3::ONE };

    /// A shift alone.
    pub const fn from_translation(translation: DVec3) -> Self {
        Self { translation, ..Self::IDENTITY }
    }

    /// Splits an affine matrix without shear; a reflection goes into the sign of the x scale.
    pub fn from_affine(affine: &DAffine3) -> Self {
        let m = affine.matrix3;
        let mut scale = DVec3::new(m.x_axis.length(), m.y_axis.length(), m.z_axis.length());
        if m.determinant() < 0.0 {
            scale.x = -scale.x;
        }
        let unit = |axis: DVec3, length: f64| if length == 0.0 { axis } else { axis / length };
        let turn =
            DMat3::from_cols(unit(m.x_axis, scale.x), unit(m.y_axis, scale.y), unit(m.z_axis, scale.z));
        Self { translation: affine.translation, rotation: Rotor::from_matrix(&turn), scale }
    }

    /// As an affine matrix.
    pub fn to_affine(&self) -> DAffine3 {
        let m = self.rotation.to_matrix();
        DAffine3 {
            matrix3: DMat3::from_cols(
                m.x_axis * self.scale.x,
                m.y_axis * self.scale.y,
                m.z_axis * self.scale.z,
            ),
            translation: self.translation,
        }
    }
}
