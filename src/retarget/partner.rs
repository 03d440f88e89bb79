//! A clip of whatever body, brought to a skeleton: as it is where the bodies are one, carried over where not.

use std::sync::Arc;

use crate::blend;
use crate::clip::Clip;
use crate::skeleton::Skeleton;

use super::{Figure, JointMap, Options, RetargetError, retarget};

/// A clip on a skeleton, for blending with another of it.
#[derive(Clone, Debug, PartialEq)]
pub struct Partner {
    /// The clip; the very one where it has that skeleton already.
    pub clip: Arc<Clip>,
    /// It was carried over from another body.
    pub is_carried: bool,
    /// What is worth telling of that, a sentence each.
    pub notes: Vec<String>,
}

/// `clip` on `skeleton`: fitted where it is of the same body ([`blend::fit()`]), else carried over by the automatic joint map with
/// planted feet held.
///
/// # Errors
/// When the bodies differ and no joint of the one drives any of the other.
pub fn partner(clip: &Arc<Clip>, skeleton: &Arc<Skeleton>) -> Result<Partner, RetargetError> {
    if let Ok(clip) = blend::fit(clip, skeleton) {
        return Ok(Partner { clip, is_carried: false, notes: Vec::new() });
    }
    let (source, target) = (Figure::new(&clip.skeleton), Figure::new(skeleton));
    let map = JointMap::automatic(&source, &target);
    let options = Options { plant_feet: true, ..Options::bare() };
    let made = retarget(clip, &source, &target, &map, &options)?;
    let [driven, all] = made.report.driven;
    let mut notes =
        vec![format!("carried over to the first clip's skeleton: {driven} of {all} joints driven")];
    notes.extend(map.doubts);
    notes.extend(made.report.notes);
    Ok(Partner { clip: Arc::new(made.clip), is_carried: true, notes })
}
