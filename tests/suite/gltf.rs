//! glTF and GLB: every outside file opens with the counts of its sources page.

use std::path::Path;

use turnwright::clip::Clip;
use turnwright::exchange::{Note, disk, gltf};

use crate::support::shared;

/// Opens a file with the files beside it at hand.
#[track_caller]
fn open(path: &Path) -> (gltf::Document, Vec<Clip>, Vec<Note>) {
    let folder = path.parent().unwrap().to_owned();
    let fetch = |file: &str| disk::read(&folder.join(file)).map_err(|error| error.to_string());
    let bytes = disk::read(path).unwrap();
    let name = path.file_name().unwrap().to_string_lossy();
    gltf::read(bytes, &name, &fetch).unwrap_or_else(|error| panic!("{}: {error}", path.display()))
}

/// File, joints, rate, and for each clip its name and its frames.
type Counts = (&'static str, usize, f64, &'static [(&'static str, usize)]);

/// The joints and clips are those of `data/SOURCES.md`; biped23 has one more, since its clips also move the node above
/// the root joint.
const COUNTS: [Counts; 19] = [
    ("SimpleSkin.gltf", 2, 2.0, &[("", 12)]),
    ("AnimatedTriangle.gltf", 1, 4.0, &[("", 5)]),
    ("RiggedSimple.glb", 2, 24.0, &[("", 51)]),
    ("RiggedFigure.glb", 19, 0.8, &[("", 2)]),
    ("Fox.glb", 24, 24.0, &[("Survey", 83), ("Walk", 18), ("Run", 29)]),
    ("Fox_gltfpack.glb", 24, 30.0, &[("Survey", 104), ("Walk", 23), ("Run", 36)]),
    (
        "biped23_movement_clips.glb",
        24,
        30.0,
        &[
            ("Rig_Medium|Jump_Full_Long", 72),
            ("Rig_Medium|Jump_Full_Short", 37),
            ("Rig_Medium|Jump_Idle", 34),
            ("Rig_Medium|Jump_Land", 22),
            ("Rig_Medium|Jump_Start", 20),
            ("Rig_Medium|Running_A", 26),
            ("Rig_Medium|Running_B", 26),
            ("Rig_Medium|T-Pose", 3),
            ("Rig_Medium|Walking_A", 34),
            ("Rig_Medium|Walking_B", 34),
            ("Rig_Medium|Walking_C", 50),
        ],
    ),
    (
        "wolf.glb",
        51,
        24.0,
        &[
            ("AnimalArmature|Attack", 33),
            ("AnimalArmature|Death", 26),
            ("AnimalArmature|Eating", 61),
            ("AnimalArmature|Gallop", 14),
            ("AnimalArmature|Gallop_Jump", 23),
            ("AnimalArmature|Idle", 81),
            ("AnimalArmature|Idle_2", 81),
            ("AnimalArmature|Idle_2_HeadLow", 97),
            ("AnimalArmature|Idle_HitReact_Left", 17),
            ("AnimalArmature|Idle_HitReact_Right", 17),
            ("AnimalArmature|Jump_ToIdle", 33),
            ("AnimalArmature|Walk", 26),
        ],
    ),
    (
        "wasp.glb",
        29,
        24.0,
        &[
            ("WaspArmature|Wasp_Attack", 19),
            ("WaspArmature|Wasp_Death", 19),
            ("WaspArmature|Wasp_Flying", 37),
        ],
    ),
    ("node_character.glb", 7, 30.0, &[("static", 2), ("idle", 21), ("walk", 14), ("jump", 16)]),
    (
        "InterpolationTest.glb",
        9,
        2.4,
        &[
            ("Step Scale", 5),
            ("Linear Scale", 5),
            ("CubicSpline Scale", 5),
            ("Step Rotation", 5),
            ("CubicSpline Rotation", 5),
            ("Linear Rotation", 5),
            ("Step Translation", 5),
            ("CubicSpline Translation", 5),
            ("Linear Translation", 5),
        ],
    ),
    ("assetgen/Animation_SamplerType_00.gltf", 1, 1.0, &[("", 5)]),
    ("assetgen/Animation_SamplerType_01.gltf", 1, 1.0, &[("", 5)]),
    ("assetgen/Animation_Skin_01.gltf", 2, 1.0, &[("", 3)]),
    ("assetgen/Animation_Skin_03.gltf", 2, 0.0, &[]),
    ("assetgen/Animation_Skin_07.gltf", 2, 1.0, &[("", 3)]),
    ("assetgen/Animation_NodeMisc_01.gltf", 1, 1.0, &[("", 6)]),
    ("assetgen/Animation_NodeMisc_05.gltf", 1, 1.0 / 6.0, &[("", 2)]),
    ("assetgen/Animation_Node_05.gltf", 1, 1.0, &[("", 5)]),
];

#[test]
fn every_outside_file_opens_with_the_counts_of_its_sources_page() {
    let Some(folder) = shared("data/gltf") else { return };
    for (file, joints, rate, clips) in COUNTS {
        let (document, found, notes) = open(&folder.join(file));
        assert_eq!(notes, [], "{file}");
        assert_eq!(document.skeleton().listed().count(), joints, "{file}: joints");
        let counts: Vec<(&str, usize)> =
            found.iter().map(|clip| (clip.name.as_str(), clip.grid.count())).collect();
        assert_eq!(counts, clips, "{file}: clips");
        // Two files have a clip with a rate of its own.
        let odd = ["static", "Step Rotation", "CubicSpline Rotation", "Linear Rotation", "Step Translation"];
        for clip in found.iter().filter(|clip| !odd.contains(&clip.name.as_str())) {
            assert!((clip.grid.rate - rate).abs() < 1e-6, "{file} {}: {}", clip.name, clip.grid.rate);
        }
    }
}
