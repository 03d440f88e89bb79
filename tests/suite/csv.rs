//! CSV against the outside files: the same walk as BVH, quaternions of whole figures, a sensor.

use std::path::Path;

use turnwright::clip::Clip;
use turnwright::exchange::{bvh, csv, disk};
use turnwright::rotor::{Bivector, Rotor};

use crate::support::{Tally, shared, shared_json};

fn bytes_of(name: &str) -> Option<Vec<u8>> {
    shared(&format!("data/csv/{name}")).map(|path| disk::read(&path).expect("an existing file is read"))
}

/// File, joints, rows: from the outside files' own list; the figures' rows are counted in their sources.
const FILES: [(&str, usize, usize); 5] = [
    ("humanoid3d_backflip_quat.csv", 13, 0),
    ("humanoid3d_cartwheel_quat.csv", 13, 0),
    ("humanoid3d_spinkick_quat.csv", 13, 0),
    ("imu_a_quaternion_wxyz.csv", 1, 499),
    ("walk01_rot.csv", 19, 101),
];

fn read(name: &str, bytes: &[u8]) -> (csv::Document, Clip) {
    let (document, clip, notes) =
        csv::read(bytes, name, &csv::CsvOptions::default()).unwrap_or_else(|error| panic!("{name}: {error}"));
    assert_eq!(notes, [], "{name}");
    (document, clip)
}

#[test]
fn every_outside_clip_opens_and_comes_back_as_the_same_bytes() {
    for (name, joints, rows) in FILES {
        let Some(bytes) = bytes_of(name) else { return };
        let (document, clip) = read(name, &bytes);
        assert_eq!(clip.skeleton.len(), joints, "{name}");
        let lines = bytes.split(|&byte| byte == b'\n').count() - 1;
        if rows > 0 {
            assert_eq!(clip.grid.count(), rows, "{name}");
        }
        assert!(clip.grid.count().abs_diff(lines) <= 1, "{name}: {lines} lines");
        assert!(csv::write(&document, &clip, &clip.clone()).0 == bytes, "{name}");
    }
}

#[test]
fn an_edit_changes_its_row_and_no_other_byte() {
    for (name, joints, _) in FILES {
        let Some(bytes) = bytes_of(name) else { return };
        let (document, clip) = read(name, &bytes);
        let (joint, row) = (joints / 2, clip.grid.count() / 3);
        let track = clip.rotation(joint).unwrap();
        let turned = (Rotor::from_plane_angles(Bivector::new(0.2, 0.1, -0.3)) * track.keys[row]).normalize();
        let edited = clip.with_rotation(joint, track.with_keys(&[(row, turned)]));
        let (written, notes) = csv::write(&document, &clip, &edited);
        assert_eq!(notes, [], "{name}");
        let old: Vec<&[u8]> = bytes.split(|&byte| byte == b'\n').collect();
        let new: Vec<&[u8]> = written.split(|&byte| byte == b'\n').collect();
        assert_eq!(old.len(), new.len());
        let changed: Vec<usize> = (0..old.len()).filter(|&line| old[line] != new[line]).collect();
        assert_eq!(changed, [row + 1], "{name}");
        let cells =
            |line: &[u8]| -> Vec<Vec<u8>> { line.split(|&b| b == b',').map(<[u8]>::to_vec).collect() };
        let (old, new) = (cells(old[row + 1]), cells(new[row + 1]));
        let changed = (0..old.len()).filter(|&cell| old[cell] != new[cell]).count();
        assert!((1..=4).contains(&changed), "{name}: {changed} cells");
        let (_, again) = read(name, &written);
        assert!(again.rotation(joint).unwrap().keys[row].turn_to(turned) < 1e-12, "{name}");
    }
}

#[test]
fn a_walk_in_two_formats_is_one_walk() {
    let (Some(rot), Some(hierarchy)) = (bytes_of("walk01_rot.csv"), bytes_of("walk01_hierarchy.csv")) else {
        return;
    };
    let Some(path) = shared("data/bvh/walk01.bvh") else { return };
    let (_, walk, _) = bvh::read(disk::read(&path).expect("an existing file is read"), "walk01").unwrap();
    let options = csv::CsvOptions {
        hierarchy: Some(csv::hierarchy(&hierarchy).unwrap()),
        ..csv::CsvOptions::default()
    };
    let (_, clip, notes) = csv::read(&rot, "walk01_rot", &options).unwrap();
    assert_eq!(notes, []);
    assert_eq!(clip.skeleton.len(), walk.skeleton.len());
    assert_eq!(clip.skeleton.joints().iter().map(|joint| joint.tips.len()).sum::<usize>(), 5);
    let mut tally = Tally::new("turns of walk01 in CSV and BVH, radians");
    for frame in [0, 1, 50, 100] {
        let (own, others) = (clip.world_at(clip.grid.time(frame)), walk.world_at(walk.grid.time(frame)));
        for (joint, world) in own.iter().enumerate() {
            let name = clip.skeleton.label(joint);
            let other = walk.skeleton.find(name).unwrap();
            assert_eq!(
                clip.skeleton.joints()[joint].parent.map(|parent| clip.skeleton.label(parent)),
                walk.skeleton.joints()[other].parent.map(|parent| walk.skeleton.label(parent))
            );
            // The CSV has fewer decimals.
            tally.check(name, world.rotation.turn_to(others[other].rotation), 2e-5);
        }
    }
    tally.finish(4 * 19);
}

#[test]
fn figures_are_what_their_sources_say() {
    for name in ["backflip", "cartwheel", "spinkick"] {
        let Some(bytes) = bytes_of(&format!("humanoid3d_{name}_quat.csv")) else { return };
        let Some(source) = shared_json(&format!("data/quatjson/humanoid3d_{name}.json")) else { return };
        let (_, clip) = read(name, &bytes);
        let rows = source["Frames"].as_array().unwrap();
        assert_eq!(clip.grid.count(), rows.len(), "{name}");
        let row: Vec<f64> = rows[3].as_array().unwrap().iter().map(|value| value.as_f64().unwrap()).collect();
        let root = clip.skeleton.find("root").unwrap();
        let place = clip.joints[root].translation.as_ref().unwrap().keys[3].to_array();
        assert_eq!(place, [row[1], row[2], row[3]], "{name}");
        let turn = Rotor::from_xyzw([row[5], row[6], row[7], row[4]]);
        assert_eq!(clip.rotation(root).unwrap().keys[3], turn, "{name}");
        let chest = clip.skeleton.find("chest").unwrap();
        let turn = Rotor::from_xyzw([row[9], row[10], row[11], row[8]]);
        assert_eq!(clip.rotation(chest).unwrap().keys[3], turn, "{name}");
    }
}

#[test]
fn places_and_skeletons_are_no_clips_and_say_so() {
    let refused = |name: &str| {
        bytes_of(name)
            .map(|bytes| csv::read(&bytes, name, &csv::CsvOptions::default()).unwrap_err().to_string())
    };
    if let Some(text) = refused("walk01_pos.csv") {
        let start = "line 1: expected turns in columns NAME.x NAME.y NAME.z, found places: ";
        assert!(text.starts_with(start) && text.ends_with("apart while they move"), "{text}");
    }
    if let Some(text) = refused("walk01_hierarchy.csv") {
        assert_eq!(
            text,
            "line 1: expected a time column and turns, found a skeleton (joint,parent,offset.x,offset.y,offset.z), which belongs beside the NAME_rot.csv it is for"
        );
    }
}

#[test]
fn a_sensor_of_uneven_times_becomes_even_frames_in_bvh() {
    let Some(bytes) = bytes_of("imu_a_quaternion_wxyz.csv") else { return };
    let (_, clip) = read("imu", &bytes);
    assert_eq!(clip.grid.time(1), 0.022_779_942);
    assert!((45.0..55.0).contains(&clip.grid.rate), "{}", clip.grid.rate);
    let (made, notes) = bvh::from_clip(&clip);
    let (_, again, _) = bvh::read(&made, "imu").unwrap();
    assert!(again.grid.count().abs_diff(499) < 20, "{}", again.grid.count());
    let texts: Vec<String> = notes.iter().map(ToString::to_string).collect();
    assert!(texts.iter().any(|text| text.contains("found 499 uneven ones")), "{texts:?}");
    assert!(texts.iter().any(|text| text.contains("degrees off, at ")), "{texts:?}");
    let start = clip.grid.time(0);
    for frame in 0..again.grid.count() {
        let time = (start + again.grid.time(frame)).min(clip.duration_secs);
        let off = again.local_at(again.grid.time(frame))[0].rotation.turn_to(clip.local_at(time)[0].rotation);
        assert!(off.to_degrees() < 2e-6, "frame {frame}: {off}");
    }
}

#[test]
fn every_bvh_clip_reads_back_from_a_new_csv_with_the_same_numbers() {
    let Some(folder) = shared("data/bvh") else { return };
    for name in ["rotation_first_root.bvh", "walk01.bvh", "yxz_23joints_120fps.bvh"] {
        let bytes = disk::read(&Path::new(&folder).join(name)).expect("an existing file is read");
        let (_, clip, _) = bvh::read(&bytes, name).unwrap();
        let (made, notes) = csv::from_clip(&clip);
        assert_eq!(notes, [], "{name}");
        let (_, again) = read(name, &made);
        assert_eq!(again.grid.count(), clip.grid.count());
        assert_eq!(again.skeleton.joints(), clip.skeleton.joints());
        for joint in 0..clip.skeleton.len() {
            let (own, others) = (again.rotation(joint).unwrap(), clip.rotation(joint).unwrap());
            assert_eq!(own.keys, others.keys, "{name}");
        }
    }
}

#[test]
fn every_gltf_clip_becomes_csv_with_every_joint_where_it_was() {
    let mut clips_seen = 0;
    for path in crate::gltf::outside_files() {
        for clip in crate::gltf::open(&path).1 {
            let place = format!("{} {}", path.display(), clip.name);
            let (made, notes) = csv::from_clip(&clip);
            // What is below a joint whose size changes is drawn out by it; that is lost, and said to be.
            if notes.iter().any(|note| note.text.contains("sizes that change")) {
                assert!(clip.joints.iter().any(|tracks| tracks.scale.is_some()), "{place}");
                continue;
            }
            clips_seen += 1;
            let (_, again, notes) = csv::read(&made, "made", &csv::CsvOptions::default())
                .unwrap_or_else(|error| panic!("{place}: {error}"));
            assert_eq!(notes, [], "{place}");
            assert_eq!(again.skeleton.len(), clip.skeleton.len(), "{place}");
            for frame in 0..clip.grid.count() {
                let (own, others) =
                    (clip.world_at(clip.grid.time(frame)), again.world_at(again.grid.time(frame)));
                for joint in clip.skeleton.listed() {
                    let other = again.skeleton.find(clip.skeleton.label(joint)).unwrap();
                    let far = own[joint].position().distance(others[other].position());
                    // Sizes that only tremble about their rest are left out.
                    assert!(far < 1e-3 * (1.0 + own[joint].position().length()), "{place} {frame}: {far}");
                    assert!(own[joint].rotation.turn_to(others[other].rotation) < 1e-7, "{place} {frame}");
                }
            }
        }
    }
    assert!(clips_seen == 0 || clips_seen > 30, "{clips_seen} clips");
}
