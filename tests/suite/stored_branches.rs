//! The numbers of a real capture once all is mended that may be mended unasked: they are the file's own where the pose is and no fault was told.

use turnwright::exchange::{OpenOptions, open};
use turnwright::mend::{SurveyOptions, apply_all, survey};
use turnwright::snag::{Remedy, Snag, SnagKind, Unwatched, find};

use crate::support::shared;

/// An arm that passes a pole as it trembles came out of the mends on the mirrored triples for all that follows. A leg's whole turn shows only where a flip is
/// mended that is left to a person: unasked, both stay.
#[test]
fn mended_angles_stay_on_the_side_where_the_file_has_most() {
    let Some(path) = shared("data/bvh/cmu_05_06_dance.bvh") else { return };
    let clip = open(&path, &OpenOptions::default()).expect("a sound file").clips.remove(0);
    let found = survey(&clip, &SurveyOptions::default(), &Unwatched).expect("nobody stops it");
    let is_safe = |snag: &&Snag| snag.safe && snag.remedy != Remedy::Ask;
    let asked: Vec<&str> = (found.snags.iter())
        .filter(|snag| snag.kind == SnagKind::Wrap && !snag.safe)
        .map(|snag| clip.skeleton.label(snag.joint))
        .collect();
    assert_eq!(asked, ["RightUpLeg", "RightFoot"]);
    let mut safe: Vec<Snag> = found.snags.iter().filter(is_safe).cloned().collect();
    safe.sort_by_key(|snag| (snag.kind, snag.joint, snag.first_key, snag.last_key));
    let mended = apply_all(&clip, &safe).expect("they fit the clip");

    for joint in clip.skeleton.listed() {
        let label = clip.skeleton.label(joint);
        let left = find(&mended, joint, SnagKind::Wrap);
        assert!(left.is_empty(), "{label}: {left:#?}");
        let (Some(before), Some(after)) = (clip.rotation(joint), mended.rotation(joint)) else { continue };
        let (Some(old), Some(new)) = (before.file_angles(), after.file_angles()) else { continue };
        let is_renumbered =
            |key: &usize| before.keys[*key] == after.keys[*key] && old.degrees[*key] != new.degrees[*key];
        let renumbered: Vec<usize> = (0..before.keys.len()).filter(is_renumbered).collect();
        if ["RightArm", "RightUpLeg"].contains(&label) {
            assert!(renumbered.is_empty(), "{label}: {renumbered:?}");
        }
    }
}
