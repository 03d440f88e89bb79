//! Spellings that are read, inputs that are refused, and bytes at random.

use std::sync::Arc;

use glam::DVec3;

use crate::clip::{Clip, FrameGrid, JointTracks, RotationTrack, Stored, Times};
use crate::exchange::Note;
use crate::rotor::{Axis, Bivector, EulerOrder, Rotor};
use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

use super::{CsvOptions, Document, TimeUnit, from_clip, hierarchy, read, write};

const SMALL: &str = "time,hip.tx,hip.ty,hip.tz,hip.qw,hip.qx,hip.qy,hip.qz,leg.z,leg.x,leg.y,head.yz,head.zx,head.xy\n\
    0,1,2,3,1,0,0,0,10,20,30,0,0,90\n\
    0.25,1.5,2,3,0.6,0,0.8,0,11,21,31,0,45,0\n\
    1,2,2,3,0,-1,0,0,12,22,32,30,0,0\n";

#[track_caller]
fn opened_with(text: impl AsRef<[u8]>, options: &CsvOptions) -> (Document, Clip, Vec<String>) {
    let (document, clip, notes) =
        read(text.as_ref(), "small", options).unwrap_or_else(|error| panic!("{error}"));
    (document, clip, notes.iter().map(Note::to_string).collect())
}

#[track_caller]
fn opened(text: impl AsRef<[u8]>) -> (Document, Clip, Vec<String>) {
    opened_with(text, &CsvOptions::default())
}

#[test]
fn the_three_kinds_of_turns_and_places_are_read() {
    let (_, clip, notes) = opened(SMALL);
    assert_eq!(notes, [] as [&str; 0]);
    assert_eq!((clip.skeleton.len(), clip.grid.count(), clip.duration_secs), (3, 3, 1.0));
    assert!(clip.skeleton.joints().iter().all(|joint| joint.parent.is_none()));
    let pose = clip.local_at(0.25);
    assert_eq!(pose[0].translation.to_array(), [1.5, 2.0, 3.0]);
    assert_eq!(clip.rotation(0).unwrap().keys[1], Rotor::from_xyzw([0.0, 0.8, 0.0, 0.6]));
    let leg = EulerOrder::new([Axis::Z, Axis::X, Axis::Y]).unwrap();
    let expected = leg.to_rotor([11.0, 21.0, 31.0].map(f64::to_radians));
    assert!(pose[1].rotation.turn_to(expected) < 1e-12);
    let head = Rotor::from_plane_angles(Bivector::from_degrees([0.0, 45.0, 0.0]));
    assert!(pose[2].rotation.turn_to(head) < 1e-12);
    // Rows are frames, at their own times; between them the short way in time.
    assert_eq!(clip.grid.time(1), 0.25);
    assert!(clip.local_at(0.625)[2].rotation.turn() > 0.1);
}

/// Reads as [`SMALL`] does, and is written back byte for byte.
#[track_caller]
fn reads_alike(text: impl AsRef<[u8]>, notes: &[&str]) {
    let (document, clip, found) = opened(text.as_ref());
    assert_eq!(found, notes);
    assert_eq!(clip, opened(SMALL).1);
    assert_eq!(write(&document, &clip, &clip).0, text.as_ref());
}

#[test]
fn other_spellings_of_the_same_file_read_alike() {
    reads_alike(SMALL, &[]);
    reads_alike(SMALL.replace('\n', "\r\n"), &[]);
    reads_alike(SMALL.replace('\n', "\r"), &[]);
    reads_alike(format!("\u{feff}{SMALL}\n\n"), &[]);
    reads_alike(SMALL.trim_end(), &[]);
    reads_alike(SMALL.replace(',', " ,  "), &[]);
    reads_alike(SMALL.replace("time,", "\"time_s\","), &[]);
    reads_alike(SMALL.replace("0.25,", "\" 2.5e-1 \",").replace("31,0,45", "+31.,.0,45"), &[]);
    reads_alike(SMALL.replace("hip.qw", "hip.QW"), &[]);
    reads_alike(format!("# made by hand\n\n#\n{SMALL}"), &[]);
    reads_alike(SMALL.replace("30,0,0,90", "30,0,0,90,"), &[]);
    let extra: Vec<String> =
        SMALL.lines().zip(["phase", "a", "b", "c"]).map(|(line, cell)| format!("{line},{cell}\n")).collect();
    reads_alike(
        extra.concat(),
        &["line 1, column phase: expected a part of a joint such as NAME.qx, found none: not used"],
    );
}

#[test]
fn semicolons_tabs_and_decimal_commas_read_alike_and_stay_when_cells_change() {
    let between = |name: &str| {
        format!("line 1: expected commas between cells, found {name}: read so, and kept when writing")
    };
    let commas = "rows: expected decimal points, found decimal commas: read as points";
    let with_commas = SMALL.replace(',', ";").replace("0.", "0,").replace("1.5", "1,5");
    reads_alike(SMALL.replace(',', ";"), &[&between("semicolons")]);
    reads_alike(SMALL.replace(',', "\t"), &[&between("tabs")]);
    reads_alike(SMALL.replace(',', " \t ").replace('\n', "\r\n"), &[&between("tabs")]);
    reads_alike(&with_commas, &[&between("semicolons"), commas]);
    reads_alike(with_commas.replace(';', "\t").replace("0,25", "\"2,5e-1\""), &[&between("tabs"), commas]);
    // An empty first cell, and one between tabs, are cells.
    let (_, clip, _) = opened("a.qx\ta.qy\ta.qz\ta.qw\ttime\n\t0\t0\t1\t0\n0\t\t0\t1\t1\n");
    assert!(clip.rotation(0).unwrap().keys.iter().all(|key| !key.is_finite()));
    // A changed cell has the file's own mark, a stretch its own separators.
    let (document, clip, _) = opened(&with_commas);
    let track = clip.rotation(0).unwrap();
    let edited = clip.with_rotation(0, track.with_keys(&[(2, Rotor::from_xyzw([0.28, 0.0, 0.96, 0.0]))]));
    let text = String::from_utf8(write(&document, &clip, &edited).0).unwrap();
    assert_eq!(text, with_commas.replace("2;2;3;0;-1;0;0;", "2;2;3;0;0,28;0;0,96;"));
    let part = crate::clip::cut(&clip, 0.25, 1.0);
    let text = String::from_utf8(write(&document, &clip, &part).0).unwrap();
    let lines: Vec<&str> = with_commas.lines().collect();
    let rest = |line: &str| line.split_once(';').unwrap().1.to_owned();
    assert_eq!(text, format!("{}\n0;{}\n0,75;{}\n", lines[0], rest(lines[2]), rest(lines[3])));
    let bones = hierarchy(b"joint;parent;offset.x;offset.y;offset.z\nhip;;0,5;1;-2,25\n").unwrap();
    assert_eq!(bones[0].rest.translation.to_array(), [0.5, 1.0, -2.25]);
}

#[test]
fn a_skeleton_stands_in_lines_before_the_header() {
    let lines = "# joint leg of mine parent hip offset 0 -1 0.5\n# joint hip parent - offset 0 1e2 0\n# tip toe parent leg of mine offset 0 0 2\n\
        # joint eye parent hip offset 0 5 0 turn 0 0 0.6 0.8 size 1 2 3\n";
    let (_, clip, notes) = opened(format!("{lines}{}", SMALL.replace("leg.", "leg of mine.")));
    let names: Vec<&str> = clip.skeleton.joints().iter().map(|joint| joint.name.as_str()).collect();
    assert_eq!(names, ["hip", "leg of mine", "eye", "head"]);
    let leg = &clip.skeleton.joints()[1];
    assert_eq!((leg.parent, leg.rest.translation.to_array()), (Some(0), [0.0, -1.0, 0.5]));
    assert_eq!(leg.tips[0].to_array(), [0.0, 0.0, 2.0]);
    assert_eq!(clip.skeleton.joints()[2].rest.scale.to_array(), [1.0, 2.0, 3.0]);
    assert_eq!(
        notes,
        ["joint head: expected a line of the skeleton for it, found none: taken as a root at 0 0 0"]
    );
    assert!(clip.rotation(2).is_none() && clip.rotation(3).is_some());
}

#[test]
fn a_skeleton_file_of_its_own_gives_parents_and_tips() {
    let bones = hierarchy(
        b"joint,parent,offset.x,offset.y,offset.z\nhip,, 0.0, 90.5, 0\nleg,hip,1,-40,0\nleg_End,leg,0,-5,0\n",
    )
    .unwrap();
    let options = CsvOptions { hierarchy: Some(bones), ..CsvOptions::default() };
    let (_, clip, notes) = opened_with("time,leg.z,leg.x,leg.y,hip.z,hip.x,hip.y\n0,1,2,3,4,5,6\n", &options);
    assert_eq!(notes, [] as [&str; 0]);
    assert_eq!(clip.skeleton.len(), 2);
    assert_eq!(clip.skeleton.joints()[1].tips[0].to_array(), [0.0, -5.0, 0.0]);
    assert_eq!(clip.rotation(0).unwrap().file_angles().unwrap().degrees[0], [4.0, 5.0, 6.0]);
}

#[test]
fn a_sensor_and_named_columns_are_one_joint() {
    for (header, times) in [("Time (s)", "0,0.5"), ("time_ms", "0,500"), ("Timestamp [us]", "0,500000")] {
        let times: Vec<&str> = times.split(',').collect();
        let text = format!("{header},W,X,Y,Z\n{},1,0,0,0\n{},0.6,0,0,0.8\n", times[0], times[1]);
        let (_, clip, notes) = opened(&text);
        assert_eq!(notes, [] as [&str; 0]);
        assert_eq!((clip.skeleton.label(0), clip.grid.time(1)), ("sensor", 0.5), "{header}");
        assert_eq!(clip.rotation(0).unwrap().keys[1], Rotor::from_xyzw([0.0, 0.0, 0.8, 0.6]));
    }
    let options = CsvOptions {
        columns: Some("time=t,w=q0,x=q1,y=q2,z=q3".parse().unwrap()),
        time_unit: Some(TimeUnit::Milliseconds),
        ..CsvOptions::default()
    };
    let (document, clip, _) = opened_with("q0,q1,q2,q3,t\n1,0,0,0,0\n0.6,0,0,0.8,250\n", &options);
    assert_eq!(clip.grid.time(1), 0.25);
    let track = clip.rotation(0).unwrap();
    let edited = clip.with_rotation(0, track.with_keys(&[(0, -track.keys[0])]));
    let (written, _) = write(&document, &clip, &edited);
    assert_eq!(String::from_utf8(written).unwrap(), "q0,q1,q2,q3,t\n-1,0,0,0,0\n0.6,0,0,0.8,250\n");
}

#[test]
fn an_edit_changes_its_cells_alone() {
    let spaced = SMALL.replace(',', " , ").replace("0.6 ", "\"0.6\" ");
    let (document, clip, _) = opened(&spaced);
    let hip = clip.rotation(0).unwrap().with_keys(&[(1, Rotor::from_xyzw([0.0, 0.6, 0.0, 0.8]))]);
    let leg = clip.rotation(1).unwrap().with_angles(&[(2, [12.0, -7.125, 32.0])]);
    let head = clip.rotation(2).unwrap();
    let turned = Rotor::from_plane_angles(Bivector::from_degrees([10.0, 0.0, 0.0]));
    let head = head.with_keys(&[(0, turned)]);
    let edited = clip.with_rotation(0, hip).with_rotation(1, leg).with_rotation(2, head);
    let (written, notes) = write(&document, &clip, &edited);
    assert_eq!(notes, []);
    let (_, again, _) = opened(&written);
    assert!(again.rotation(2).unwrap().keys[0].turn_to(turned) < 1e-14);
    let Stored::PlaneAngles(degrees) = &again.rotation(2).unwrap().stored else { panic!("other form") };
    let expected = spaced
        .replace("\"0.6\" , 0 , 0.8 ", "\"0.8\" , 0 , 0.6 ")
        .replace("22 ", "-7.125 ")
        .replace("0 , 0 , 90", &format!("{} , 0 , 0", degrees[0][0]));
    assert_eq!(String::from_utf8(written).unwrap(), expected);
}

#[test]
fn missing_cells_are_told_and_can_be_filled() {
    let (document, clip, notes) = opened(SMALL.replace("0.6,0,0.8,0", "nan,0,,0"));
    assert_eq!(notes, ["line 3: expected finite numbers, found 2 cells that are not: those are missing"]);
    assert!(!clip.rotation(0).unwrap().keys[1].is_finite());
    let track = clip.rotation(0).unwrap().with_keys(&[(1, Rotor::from_xyzw([0.0, 0.8, 0.0, 0.6]))]);
    let (written, _) = write(&document, &clip, &clip.with_rotation(0, track));
    assert_eq!(String::from_utf8(written).unwrap(), SMALL);
}

/// A sensor that logs some moments twice, as it was and with other numbers.
const REPEATED: &str = "time,s.qw,s.qx,s.qy,s.qz,volts\n\
    0,1,0,0,0,3.3\n\
    0.01,0.8,0.6,0,0,3.2\n\
    0.01,0.8,0.6,0,0,3.1\n\
    0.02,0.6,0,0.8,0,3.0\n\
    0.02,0.6,0,0,0.8,2.9\n\
    0.02,0.0,0,0,1.0,2.8\n\
    0.03,1,0,0,0,2.7\n";

#[test]
fn of_rows_at_one_time_the_last_counts_and_the_others_stay() {
    let (document, clip, notes) = opened(REPEATED);
    assert_eq!(
        notes[1..],
        [
            "line 4: expected rising times, found 3 rows at the time of the row before: of each time the last row is used, the others are left as they are"
        ]
    );
    assert_eq!(clip.grid.times, Times::Listed([0.0, 0.01, 0.02, 0.03].into()));
    assert_eq!(clip.rotation(0).unwrap().keys[2], Rotor::from_xyzw([0.0, 0.0, 1.0, 0.0]));
    assert_eq!(write(&document, &clip, &clip).0, REPEATED.as_bytes());
    // What said the same as the row that is used changes along with it; what said something else stays.
    let edit = [(1, Rotor::from_xyzw([0.0, 0.0, 0.6, 0.8])), (2, Rotor::from_xyzw([0.0, 0.28, 0.0, 0.96]))];
    let changed = clip.with_rotation(0, clip.rotation(0).unwrap().with_keys(&edit));
    let (written, notes) = write(&document, &clip, &changed);
    assert_eq!(notes, []);
    let expected = REPEATED
        .replace("0.01,0.8,0.6,0,0,", "0.01,0.8,0,0,0.6,")
        .replace("0.02,0.0,0,0,1.0,2.8", "0.02,0.96,0,0.28,0,2.8");
    assert_eq!(String::from_utf8(written.clone()).unwrap(), expected);
    assert_eq!(opened(&written).1.rotation(0).unwrap().keys, changed.rotation(0).unwrap().keys);
    // Cut, the rows that are not used are gone, and the others keep their text.
    let part = crate::clip::cut(&clip, 0.01, 0.03);
    let (written, _) = write(&document, &clip, &part);
    let rows = "0,0.8,0.6,0,0,3.1\n0.01,0.0,0,0,1.0,2.8\n";
    let text = String::from_utf8(written).unwrap();
    assert!(text.contains(rows), "{text}");
    // All at one time are one row.
    let (_, clip, _) = opened("time,a.qx,a.qy,a.qz,a.qw\n5,0,0,0,1\n5,1,0,0,0\n5,0,1,0,0\n");
    assert_eq!((clip.grid.count(), clip.rotation(0).unwrap().keys.len()), (1, 1));
}

#[test]
fn utf_16_reads_alike_and_is_written_back_in_its_own_order() {
    let encoded = |text: &str, is_big: bool| -> Vec<u8> {
        let units = format!("\u{feff}{text}").encode_utf16().collect::<Vec<u16>>();
        units
            .into_iter()
            .flat_map(|unit| if is_big { unit.to_be_bytes() } else { unit.to_le_bytes() })
            .collect()
    };
    // A name that UTF-8 has two bytes for.
    let text = SMALL.replace("hip.", "Hüfte.").replace('\n', "\r\n");
    let (_, plain, _) = opened(&text);
    for is_big in [false, true] {
        let bytes = encoded(&text, is_big);
        let (document, clip, notes) = opened(&bytes);
        assert_eq!(notes, ["line 1: expected UTF-8, found UTF-16: read so, and kept when writing"]);
        assert_eq!(clip, plain);
        assert_eq!((document.bytes(), &write(&document, &clip, &clip).0), (&bytes[..], &bytes));
        let track = clip.rotation(1).unwrap().with_angles(&[(1, [11.0, 21.5, 31.0])]);
        let (written, _) = write(&document, &clip, &clip.with_rotation(1, track));
        assert_eq!(written, encoded(&text.replace("11,21,31", "11,21.5,31"), is_big));
    }
    let bones = encoded("joint,parent,offset.x,offset.y,offset.z\nHüfte,,0,1,0\n", false);
    assert_eq!(hierarchy(&bones).unwrap()[0].name, "Hüfte");
    let mut odd = encoded(&text, false);
    odd.pop();
    let error = read(&odd[..], "odd", &CsvOptions::default()).unwrap_err().to_string();
    assert_eq!(
        error,
        "line 4: expected UTF-16 to the end, as the file's first two bytes say, found a single byte at the end of the file"
    );
}

#[test]
fn the_time_of_a_table_of_joints_may_have_its_unit_in_its_name() {
    for (header, times) in [("Time (s)", "0,0.5"), ("time_ms", "0,500"), ("Timestamp [us]", "0,500000")] {
        let times: Vec<&str> = times.split(',').collect();
        let text = format!("hip.z,{header},knee.x\n10,{},20\n30,{},40\n", times[0], times[1]);
        let (document, clip, notes) = opened(&text);
        assert_eq!(notes, [] as [&str; 0]);
        assert_eq!((clip.joints.len(), clip.grid.time(1)), (2, 0.5), "{header}");
        let degrees = &clip.rotation(1).unwrap().file_angles().unwrap().degrees;
        assert_eq!(degrees[1], [40.0, 0.0, 0.0]);
        let (written, _) =
            write(&document, &clip, &crate::clip::cut(&clip, clip.grid.time(1), clip.grid.time(1)));
        assert!(String::from_utf8(written).unwrap().ends_with(",40\n"), "{header}");
    }
}

#[test]
fn a_clock_of_microseconds_keeps_its_last_digit() {
    let text = "timestamp_us,qw,qx,qy,qz\n1700000000000001,1,0,0,0\n1700000000000002,1,0,0,0\n1700000000000004,1,0,0,0\n";
    let (document, clip, _) = opened(text);
    let times: Vec<f64> = clip.grid.times.iter().collect();
    assert_eq!(times, [0.0, 1e-6, 3e-6]);
    let (written, _) = write(&document, &clip, &crate::clip::cut(&clip, 1e-6, 3e-6));
    let text = String::from_utf8(written).unwrap();
    assert!(text.ends_with("1700000000000001,1,0,0,0\n1700000000000003,1,0,0,0\n"), "{text}");
}

#[test]
fn clock_times_count_from_the_first_row() {
    let text = "time,a.qx,a.qy,a.qz,a.qw\n1700000000.5,0,0,0,1\n1700000000.75,0,0,0,1\n";
    let (document, clip, notes) = opened(text);
    assert_eq!((clip.grid.time(0), clip.grid.time(1)), (0.0, 0.25));
    assert_eq!(notes.len(), 1);
    let track = clip.rotation(0).unwrap().with_keys(&[(1, Rotor::from_xyzw([0.0, 0.0, 0.6, 0.8]))]);
    let (written, _) = write(&document, &clip, &clip.with_rotation(0, track));
    assert_eq!(String::from_utf8(written).unwrap(), text.replace("75,0,0,0,1", "75,0,0,0.6,0.8"));
}

#[test]
fn a_stretch_keeps_the_text_of_its_cells() {
    let (document, clip, _) = opened(SMALL.replace("0.8", "0.80").replace("31,", "31.00,"));
    let mut short = clip.clone();
    let times = Times::Listed([0.0, 0.75].into());
    short.grid.times = times.clone();
    for joint in &mut short.joints {
        let mut tracks = (**joint).clone();
        if let Some(track) = &mut tracks.rotation {
            track.times = times.clone();
            track.keys = track.keys[1..].into();
            match &mut track.stored {
                Stored::Angles(angles) => angles.degrees = angles.degrees[1..].into(),
                Stored::PlaneAngles(degrees) => *degrees = degrees[1..].into(),
                Stored::Rotors => {}
            }
        }
        if let Some(track) = &mut tracks.translation {
            track.times = times.clone();
            track.keys = track.keys[1..].into();
        }
        *joint = Arc::new(tracks);
    }
    let (written, _) = write(&document, &clip, &short);
    let header = SMALL.lines().next().unwrap();
    assert_eq!(
        String::from_utf8(written).unwrap(),
        format!("{header}\n0,1.5,2,3,0.6,0,0.80,0,11,21,31.00,0,45,0\n0.75,2,2,3,0,-1,0,0,12,22,32,30,0,0\n")
    );
}

#[test]
fn a_new_file_keeps_names_of_any_kind_and_who_hangs_on_whom() {
    let names = [
        "a b",
        "a.qx",
        "#x",
        "# joint y parent z",
        "q\"uo,te",
        "{",
        "  lead",
        "trail  ",
        "tab\there",
        "",
        "-",
        "none",
        "a;b",
        "\"quoted\"",
        "x parent \"y",
        "z offset 1 2 3",
        "parent",
        "a=1+1",
        "\"",
        "\"\"",
        "\" parent -",
        "ünï/code:|",
        "x",
    ];
    let joints: Vec<Joint> = (0..names.len())
        .map(|number| {
            let parent = number.checked_sub(1);
            let rest = Transform::from_translation(DVec3::new(0.0, 1.0, number as f64));
            let tips = vec![DVec3::new(0.5, 0.0, 0.0); usize::from(number % 3 == 0)];
            Joint { name: names[number].to_owned(), number, parent, rest, kind: JointKind::Joint, tips }
        })
        .collect();
    let skeleton = Arc::new(Skeleton::new(joints).unwrap());
    let times = Times::Even { step_secs: 0.5, count: 2 };
    let track = |number: usize| {
        let turn = |secs: f64| EulerOrder::ZXY.to_rotor([0.1 * number as f64, secs, 0.2]);
        RotationTrack::from_rotors(times.clone(), [turn(0.0), turn(0.5)])
    };
    let tracks = |number| JointTracks { rotation: Some(track(number)), ..JointTracks::default() };
    let clip = Clip {
        name: "names".to_owned(),
        joints: (0..names.len()).map(|number| Arc::new(tracks(number))).collect(),
        skeleton,
        duration_secs: 0.5,
        grid: FrameGrid { times: times.clone(), rate: 2.0 },
    };
    let (written, notes) = from_clip(&clip);
    assert_eq!(notes, []);
    let (_, again, notes) = opened(&written);
    assert_eq!(notes, [] as [&str; 0], "{}", String::from_utf8_lossy(&written));
    for joint in 0..names.len() {
        // The blanks around a cell are none of its own.
        assert_eq!(again.skeleton.label(joint), clip.skeleton.label(joint).trim());
        let (new, old) = (&again.skeleton.joints()[joint], &clip.skeleton.joints()[joint]);
        assert_eq!((new.parent, new.rest, &new.tips), (old.parent, old.rest, &old.tips), "{:?}", old.name);
        assert_eq!(again.rotation(joint).unwrap().keys, clip.rotation(joint).unwrap().keys, "{:?}", old.name);
    }
}

#[test]
fn a_new_file_reads_as_the_same_clip() {
    let lines = "# joint hip parent - offset 0 1 0 turn 0 0 0.6 0.8\n# joint leg parent hip offset 0.1 -1 1e-7\n# tip t parent leg offset 0 -1 0\n# joint head parent hip offset 0 1 0\n";
    let (_, clip, _) = opened(format!("{lines}{SMALL}"));
    let (written, notes) = from_clip(&clip);
    assert_eq!(notes, []);
    let (document, again, notes) = opened(&written);
    assert_eq!(notes, [] as [&str; 0]);
    assert_eq!(again.skeleton, clip.skeleton);
    assert_eq!(again.grid, clip.grid);
    for joint in 0..3 {
        assert_eq!(again.rotation(joint).unwrap().keys, clip.rotation(joint).unwrap().keys);
        assert_eq!(again.joints[joint].translation, clip.joints[joint].translation);
    }
    assert_eq!(from_clip(&again).0, written);
    assert_eq!(write(&document, &again, &again).0, written);
}

#[test]
fn broken_files_are_refused_with_line_column_expected_and_found() {
    let with = |from: &str, to: &str| {
        assert!(SMALL.contains(from), "{from}");
        SMALL.replacen(from, to, 1)
    };
    let semicolons = |from: &str, to: &str| SMALL.replace(',', ";").replacen(from, to, 1);
    let head = "time,a.qx,a.qy,a.qz,a.qw\n";
    let cases: Vec<(String, &str)> = vec![
        (
            String::new(),
            "line 1: expected a header such as time,NAME.qx,NAME.qy,NAME.qz,NAME.qw, found the end of the file",
        ),
        (
            "# only a comment\n".to_owned(),
            "line 2: expected a header such as time,NAME.qx,NAME.qy,NAME.qz,NAME.qw, found the end of the file",
        ),
        (
            "a;b;c\n1;2;3\n".to_owned(),
            "line 1: expected one column time, time_s, time_ms or time_us, or --columns time=NAME,w=NAME,x=NAME,y=NAME,z=NAME, found `a,b,c`",
        ),
        (
            semicolons("0.25;", "0,25;"),
            "line 3, column hip.tx: expected one decimal mark in the whole file, found points and commas, the other one in `1.5`",
        ),
        (semicolons("0.25;", "1.000,25;"), "line 3, column time: expected a number, found `1.000,25`"),
        (semicolons("0.25;", ",25e;"), "line 3, column time: expected a number, found `,25e`"),
        (
            semicolons("0.25;", "\"0.25\",5;"),
            "line 3: expected a semicolon or the end of the line after a quote, found `,`",
        ),
        (with("0.25,1.5", "\"0,25\",1.5"), "line 3, column time: expected a number, found `0,25`"),
        (
            "frame,a.qx,a.qy,a.qz,a.qw\n".to_owned(),
            "line 1: expected one column time, time_s, time_ms or time_us, or --columns time=NAME,w=NAME,x=NAME,y=NAME,z=NAME, found `frame,a.qx,a.qy,a.qz,a.qw`",
        ),
        (
            "time,speed\n0,1\n".to_owned(),
            "line 1: expected columns such as NAME.qx, NAME.yz or NAME.z for each joint, or --columns time=NAME,w=NAME,x=NAME,y=NAME,z=NAME, found `time,speed`",
        ),
        (
            "timestamp,w,x,y,z\n".to_owned(),
            "line 1: expected a time with its unit, or --time-unit s, ms or us, found `timestamp`",
        ),
        (
            "joint,parent,offset.x,offset.y,offset.z\na,,0,0,0\n".to_owned(),
            "line 1: expected a time column and turns, found a skeleton (joint,parent,offset.x,offset.y,offset.z), which belongs beside the NAME_rot.csv it is for",
        ),
        (with("hip.qy", "hip.qx"), "line 1, column hip.qx: expected each column once, found `hip.qx`"),
        (with("hip.qw", "hip_qw"), "line 1: expected all of hip.qx .qy .qz .qw, found 3 of them"),
        (with("head.zx", "head.tx"), "line 1: expected all of head.yz .zx .xy, found 2 of them"),
        (
            with("leg.z", "hip.z"),
            "line 1: expected turns of one kind for each joint, found 4 of a quaternion, 0 plane angles and 1 angles for joint hip",
        ),
        (
            with("0.25,1.5,2,3,0.6", "0.25,1.5,2,3,O.6"),
            "line 3, column hip.qw: expected a number, found `O.6`",
        ),
        (with("0.25,1.5", "0.25,1 500"), "line 3, column hip.tx: expected a number, found `1 500`"),
        (with("0.25,1.5", "0.25,0x15"), "line 3, column hip.tx: expected a number, found `0x15`"),
        (
            with("31,0,45,0", "31,0,45"),
            "line 3, column head.xy: expected 14 cells as in the header, found 13",
        ),
        (with("31,0,45,0", "31,0,45,0,7"), "line 3: expected 14 cells as in the header, found 15"),
        (with("0.25,1.5", "0.25,1,5"), "line 3: expected 14 cells as in the header, found 15"),
        (with("\n1,", "\n-1,"), "line 4, column time: expected a time of 0.25 or later, found `-1`"),
        (
            with("hip.qy", "hip.QX"),
            "line 1, column hip.QX: expected each part of a joint once, found `hip.QX`",
        ),
        (with("0.25,", "nan,"), "line 3, column time: expected a finite time, found `nan`"),
        (with("0.25,", ","), "line 3, column time: expected a finite time, found an empty cell"),
        (with("0.25,", "inf,"), "line 3, column time: expected a finite time, found `inf`"),
        (with("0.25,", "soon,"), "line 3, column time: expected a number, found `soon`"),
        (with("0.25,", "\"0.25,"), "line 3: expected a closing quote, found the end of the file"),
        (
            with("0.25,", "\"0.25\"s,"),
            "line 3: expected a comma or the end of the line after a quote, found `s`",
        ),
        (
            format!("# joint a parent b offset 0 0 0\n{head}"),
            "line 1: expected the parent of a among the joints, found `b`",
        ),
        (
            format!("# joint a parent - offset 0 zero 0\n{head}"),
            "line 1: expected `# joint NAME parent NAME offset X Y Z`, found `a parent - offset 0 zero 0`",
        ),
        (
            format!("# joint a parent - offset 0 0\n{head}"),
            "line 1: expected `# joint NAME parent NAME offset X Y Z`, found `a parent - offset 0 0`",
        ),
        (
            format!("# joint a parent -\n{head}"),
            "line 1: expected `# joint NAME parent NAME offset X Y Z`, found `a parent -`",
        ),
        (
            format!("# joint a parent - offset 0 0 0 turn 0 0 0 0\n{head}"),
            "line 1: expected `# joint NAME parent NAME offset X Y Z`, found `a parent - offset 0 0 0 turn 0 0 0 0`",
        ),
        (
            format!("# joint a parent - offset 0 0 0\n# joint a parent - offset 1 0 0\n{head}"),
            "line 2: expected each joint once, found `a`",
        ),
        (
            format!(
                "# joint b parent - offset 0 0 0\n# joint a parent c offset 0 0 0\n# joint c parent a offset 1 0 0\n{head}"
            ),
            "line 2: expected parents that end in a root, found `a`, which hangs on itself",
        ),
    ];
    let wrong: Vec<(String, &str)> = cases
        .iter()
        .map(|(text, message)| {
            let found = match read(text.as_bytes(), "broken", &CsvOptions::default()) {
                Err(error) => error.to_string(),
                Ok((_, _, notes)) => format!("read with {notes:?}"),
            };
            (found, *message)
        })
        .filter(|(found, expected)| found != expected)
        .collect();
    assert!(wrong.is_empty(), "found and expected: {wrong:#?}");
    let skeletons = [
        ("", "line 1: expected joint,parent,offset.x,offset.y,offset.z, found the end of the file"),
        (
            "joint,parent,offset.x,offset.y\n",
            "line 1: expected a column offset.z, found `joint,parent,offset.x,offset.y`",
        ),
        (
            "joint,parent,offset.x,offset.y,offset.z\na,,0,0,far\n",
            "line 2, column offset.z: expected a finite number, found `far`",
        ),
        (
            "joint,parent,offset.x,offset.y,offset.z\na,,0,0\n",
            "line 2, column offset.z: expected 5 cells, found 4",
        ),
    ];
    for (text, message) in skeletons {
        assert_eq!(hierarchy(text.as_bytes()).unwrap_err().to_string(), message);
    }
    for text in ["time=t", "time=t,w=a,x=b,y=c,z=", "time=t,w=a,x=b,y=c,z=d,w=e", "w"] {
        let error = text.parse::<super::NamedColumns>().unwrap_err().to_string();
        let expected = format!("expected columns as time=NAME,w=NAME,x=NAME,y=NAME,z=NAME, found `{text}`");
        assert_eq!(error, expected);
    }
    assert_eq!("h".parse::<TimeUnit>().unwrap_err().to_string(), "expected s, ms or us, found `h`");
}

/// Small and good enough here: Marsaglia 2003, "Xorshift RNGs".
struct Random(u64);

impl Random {
    fn below(&mut self, limit: usize) -> usize {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 % limit.max(1) as u64) as usize
    }
}

#[test]
fn bytes_at_random_are_read_or_refused_and_never_panic() {
    let mut random = Random(0xC5_5EED);
    let (mut read_well, mut refused) = (0, 0);
    let start = format!("# joint leg parent hip offset 0 -1 0\n# joint hip parent - offset 0 1 0\n{SMALL}");
    for round in 0..6000 {
        let mut bytes = start.clone().into_bytes();
        for _ in 0..=random.below(4) {
            let at = random.below(bytes.len());
            match random.below(5) {
                0 => bytes[at] = random.below(256) as u8,
                1 if random.below(3) == 0 => bytes.truncate(at.max(1)),
                2 => {
                    let piece = bytes[at..(at + 1 + random.below(60)).min(bytes.len())].to_vec();
                    let to = random.below(bytes.len());
                    bytes.splice(to..to, piece);
                }
                3 => {
                    bytes.drain(at..(at + 1 + random.below(20)).min(bytes.len()));
                    if bytes.is_empty() {
                        bytes.push(b't');
                    }
                }
                _ => bytes[at] = b"0123456789.-+,eE \n\"#tqw"[random.below(23)],
            }
        }
        hierarchy(&bytes).ok();
        let Ok((document, clip, _)) = read(&bytes, "random", &CsvOptions::default()) else {
            refused += 1;
            continue;
        };
        read_well += 1;
        assert!(write(&document, &clip, &clip).0 == bytes, "round {round}");
        if let Some(joint) = (0..clip.skeleton.len()).find(|&joint| clip.rotation(joint).is_some()) {
            let track = clip.rotation(joint).unwrap();
            let key = random.below(track.keys.len());
            let edited = clip
                .with_rotation(joint, track.with_keys(&[(key, EulerOrder::ZXY.to_rotor([0.1, 0.2, 0.3]))]));
            let (written, _) = write(&document, &clip, &edited);
            let (_, again, _) = read(&written, "again", &CsvOptions::default()).unwrap_or_else(|error| {
                panic!("round {round}: {error}\n{}", String::from_utf8_lossy(&written))
            });
            assert_eq!(again.grid, clip.grid, "round {round}");
            let (made, _) = from_clip(&edited);
            read(&made, "made", &CsvOptions::default())
                .unwrap_or_else(|error| panic!("round {round}: {error}\n{}", String::from_utf8_lossy(&made)));
        }
    }
    assert!(read_well > 300 && refused > 300, "{read_well} read, {refused} refused");
}
