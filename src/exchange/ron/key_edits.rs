//! Edits of keys between the document and the file.

use crate::clip::{KeyChange, KeyEdit, MeantTurn, NewKey, PathKind, Spacing};
use crate::rotor::{Bivector, Rotor};

use super::mirror;

/// An edit as the document holds it.
pub(super) fn key_edit_from(edit: mirror::KeyEdit) -> Result<KeyEdit, String> {
    let rotor = |(s, yz, zx, xy): mirror::Parts| Rotor::new(s, yz, zx, xy);
    let change = match edit.change {
        mirror::KeyChange::Insert(keys) => KeyChange::Insert(
            keys.into_iter().map(|(secs, own)| NewKey { secs, rotor: own.map(rotor) }).collect(),
        ),
        mirror::KeyChange::Set(keys) => {
            KeyChange::Set(keys.into_iter().map(|(secs, own)| (secs, rotor(own))).collect())
        }
        mirror::KeyChange::Move(moves) => {
            KeyChange::Move(moves.into_iter().map(|(from, to)| [from, to]).collect())
        }
        mirror::KeyChange::Delete(secs) => KeyChange::Delete(secs),
        mirror::KeyChange::Path(secs, name) => {
            let kind = PathKind::named(&name).ok_or_else(|| {
                let known = PathKind::ALL.map(PathKind::name).join(", ");
                format!("expected one of the paths {known}, found `{name}`")
            })?;
            KeyChange::Path(secs, kind)
        }
        mirror::KeyChange::Space(secs, spacing) => KeyChange::Space(
            secs,
            match spacing {
                mirror::Spacing::Even => Spacing::Even,
                mirror::Spacing::EaseIn => Spacing::EaseIn,
                mirror::Spacing::EaseOut => Spacing::EaseOut,
                mirror::Spacing::EaseBoth => Spacing::EaseBoth,
                mirror::Spacing::Own(first, second) => {
                    Spacing::handles([first.into(), second.into()]).map_err(|error| error.to_string())?
                }
            },
        ),
        mirror::KeyChange::Turn(secs, whole, plane) => {
            let turn = match plane {
                None => MeantTurn::new(whole),
                Some((yz, zx, xy)) => MeantTurn::in_plane(whole, Bivector::new(yz, zx, xy)),
            };
            KeyChange::Turn(secs, turn.map_err(|error| error.to_string())?)
        }
    };
    Ok(KeyEdit { joint: edit.joint, change })
}

/// An edit as the file holds it.
pub(super) fn key_edit_to(edit: &KeyEdit) -> mirror::KeyEdit {
    let parts = |own: Rotor| (own.s, own.yz, own.zx, own.xy);
    let change = match &edit.change {
        KeyChange::Insert(keys) => {
            mirror::KeyChange::Insert(keys.iter().map(|key| (key.secs, key.rotor.map(parts))).collect())
        }
        KeyChange::Set(keys) => {
            mirror::KeyChange::Set(keys.iter().map(|&(secs, own)| (secs, parts(own))).collect())
        }
        KeyChange::Move(moves) => {
            mirror::KeyChange::Move(moves.iter().map(|&[from, to]| (from, to)).collect())
        }
        KeyChange::Delete(secs) => mirror::KeyChange::Delete(secs.clone()),
        KeyChange::Path(secs, kind) => mirror::KeyChange::Path(secs.clone(), kind.name().to_owned()),
        KeyChange::Space(secs, spacing) => mirror::KeyChange::Space(
            secs.clone(),
            match spacing {
                Spacing::Even => mirror::Spacing::Even,
                Spacing::EaseIn => mirror::Spacing::EaseIn,
                Spacing::EaseOut => mirror::Spacing::EaseOut,
                Spacing::EaseBoth => mirror::Spacing::EaseBoth,
                Spacing::Own(handles) => {
                    let [first, second] = handles.points();
                    mirror::Spacing::Own(first.into(), second.into())
                }
            },
        ),
        KeyChange::Turn(secs, turn) => {
            let plane = turn.plane().map(|plane| (plane.yz, plane.zx, plane.xy));
            mirror::KeyChange::Turn(secs.clone(), turn.whole(), plane)
        }
    };
    mirror::KeyEdit { joint: edit.joint, change }
}
