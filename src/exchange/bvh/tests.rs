//! Spellings that are read, inputs that are refused, and bytes at random.

use crate::clip::Clip;
use crate::exchange::Note;
use crate::rotor::{Axis, EulerOrder, Rotor};

use super::{Document, read, write};

const SMALL: &str = "HIERARCHY\nROOT Hips\n{\n\tOFFSET 0 90 0\n\tCHANNELS 6 Xposition Yposition Zposition Zrotation Xrotation Yrotation\n\
    \tJOINT Leg\n\t{\n\t\tOFFSET 10 -40 0\n\t\tCHANNELS 3 Zrotation Xrotation Yrotation\n\t\tEnd Site\n\t\t{\n\t\t\tOFFSET 0 -40 5\n\t\t}\n\t}\n}\n\
    MOTION\nFrames: 2\nFrame Time: 0.04\n1 2 3 10 20 30 -4 -5 -6\n1.5 2.5 3.5 11 21 31 -4.5 -5.5 -6.5\n";

#[track_caller]
fn opened(text: impl AsRef<[u8]>) -> (Document, Clip, Vec<String>) {
    let (document, clip, notes) = read(text.as_ref(), "small").unwrap_or_else(|error| panic!("{error}"));
    (document, clip, notes.iter().map(Note::to_string).collect())
}

#[track_caller]
fn degrees(clip: &Clip, joint: usize, frame: usize) -> [f64; 3] {
    clip.rotation(joint).unwrap().file_angles().unwrap().degrees[frame]
}

/// Reads as [`SMALL`] does, with exactly these notes.
#[track_caller]
fn reads_alike(text: impl AsRef<[u8]>, notes: &[&str]) {
    let (document, clip, found) = opened(text.as_ref());
    let (_, expected, _) = opened(SMALL);
    assert_eq!(found, notes);
    assert_eq!(clip, expected);
    assert_eq!(write(&document, &clip, &clip).0, text.as_ref());
}

#[test]
fn other_spellings_of_the_same_file_read_alike() {
    reads_alike(SMALL, &[]);
    reads_alike(SMALL.replace('\n', "\r\n"), &[]);
    reads_alike(SMALL.replace('\n', "\r"), &[]);
    reads_alike(format!("\u{feff}{SMALL}"), &[]);
    reads_alike(SMALL.replace('\t', "  ").replace(' ', "\t ").replace("Hips", "Hips \t"), &[]);
    reads_alike(SMALL.trim_end(), &[]);
    reads_alike(SMALL.replace("Hips\n{", "Hips {").replace("Leg\n\t{", "Leg{"), &[]);
    reads_alike(SMALL.replace("Frames:", "Frames :").replace("Frame Time:", "FRAME  TIME :"), &[]);
    reads_alike(SMALL.replace("Frames: 2\nFrame Time: 0.04", "Frame Time:0.04\nframes:2"), &[]);
    reads_alike(SMALL.to_uppercase().replace("HIPS", "Hips").replace("LEG", "Leg"), &[]);
    reads_alike(SMALL.replace("End Site", "End site Leg_tip"), &[]);
    reads_alike(SMALL.replace(" 10 20 30", " +1.e1 2e+01 .3E2").replace("0.04", ".04"), &[]);
    reads_alike(SMALL.replace("20 30 -4", "20\n30\n-4").replace("-6\n1.5", "-6 1.5"), &[]);
    reads_alike(SMALL.replace("\t\tEnd", "# the foot\n\t\tEnd"), &["line 10: found a comment: skipped"]);
    reads_alike(
        SMALL.replace("-4 -5 -6", "-4-5-6"),
        &["line 19: expected blanks between numbers, found 2 run together: split before the sign"],
    );
    reads_alike(
        SMALL.replace("0.04", "0,04").replace(".5", ",5"),
        &["line 18: expected decimal points, found 7 decimal commas: read as points"],
    );
    reads_alike(
        SMALL.replace("Frames: 2\n", ""),
        &["line 16: expected `Frames:`, found none: the numbers make 2 frames"],
    );
    reads_alike(
        SMALL.replace("Frames: 2", "Frames: 5"),
        &["line 17: expected 5 frames as `Frames:` says, found 2: those are used"],
    );
    reads_alike(
        format!("{SMALL}NOTES\nmade by hand\n"),
        &["line 21: expected the end of the file after 2 frames, found `NOTES`: left as it is"],
    );
    reads_alike(
        SMALL.replace("MOTION", "MATERIAL skin\nMOTION"),
        &["line 16: expected ROOT or MOTION, found `MATERIAL`: skipped"],
    );
    reads_alike(format!("{SMALL}1 2 3"), &["frame 2: expected 9 numbers, found 3: the frame is left out"]);
}

#[test]
fn utf_16_reads_alike_and_is_written_back_as_it_was() {
    let encoded = |text: &str| -> Vec<u8> {
        format!("\u{feff}{text}").encode_utf16().flat_map(u16::to_le_bytes).collect()
    };
    reads_alike(encoded(SMALL), &["line 1: expected UTF-8, found UTF-16: read so, and kept when writing"]);
    let (document, clip, _) = opened(encoded(SMALL));
    let track = clip.rotation(1).unwrap().with_angles(&[(1, [7.25, -5.5, -6.5])]);
    let (written, _) = write(&document, &clip, &clip.with_rotation(1, track));
    assert_eq!(written, encoded(&SMALL.replace("-4.5", "7.250000")));
    let half: Vec<u8> = encoded(SMALL).into_iter().take(99).collect();
    assert_eq!(
        refused(&half),
        "line 5, column 12: expected UTF-16 to the end, as the file's first two bytes say, found a single byte at the end of the file"
    );
}

#[test]
fn places_along_some_axes_and_turns_about_some_are_held_as_they_are() {
    let (document, clip, _) =
        opened(one_joint("4 Zposition Yrotation Xposition Zrotation", "3 10 -1.5 20\n4 11 -2.5 21\n"));
    let places = clip.joints[1].translation.as_ref().unwrap();
    assert_eq!(places.keys.vector(1).to_array(), [-2.5, 2.0, 4.0]);
    let changed: Vec<glam::DVec3> = places.keys.iter().map(|place| *place + glam::DVec3::X).collect();
    let mut edited = clip.clone();
    std::sync::Arc::make_mut(&mut edited.joints[1]).translation =
        Some(crate::clip::VectorTrack { keys: changed.into(), ..places.clone() });
    let (written, notes) = write(&document, &clip, &edited);
    assert_eq!(notes, []);
    assert!(String::from_utf8(written).unwrap().ends_with("3 10 -0.500000 20\n4 11 -1.500000 21\n\n"));
}

#[test]
fn a_frame_time_that_is_none_is_told() {
    for (written, found) in [("Frame Time: 0", "0"), ("Frame Time: -1", "-1"), ("Frame Time: nan", "NaN")] {
        let (_, clip, notes) = opened(SMALL.replace("Frame Time: 0.04", written));
        assert_eq!(
            notes,
            [format!("line 18: expected a `Frame Time:` above 0, found {found}: 1/30 s is taken")]
        );
        assert_eq!(clip.grid.time(1), 1.0 / 30.0);
    }
    let (_, clip, notes) = opened(SMALL.replace("Frame Time: 0.04\n", ""));
    assert_eq!(notes.len(), 1, "{notes:?}");
    assert_eq!(clip.grid.count(), 2);
}

#[test]
fn numbers_that_are_none_are_missing() {
    for text in ["nan", "-nan(ind)", "1.#QNAN", "-1.#IND00", "inf", "-Infinity", "NaN", "1e999"] {
        let (document, clip, notes) = opened(SMALL.replace("-4.5", text));
        assert!(degrees(&clip, 1, 1)[0].is_nan(), "{text}");
        assert!(!clip.rotation(1).unwrap().keys[1].is_finite());
        assert_eq!(
            notes,
            ["line 20: expected finite numbers, found 1 that are not: those are missing"],
            "{text}"
        );
        // Mended by hand: that number alone gets a text.
        let track = clip.rotation(1).unwrap().with_angles(&[(1, [7.25, -5.5, -6.5])]);
        let (written, _) = write(&document, &clip, &clip.with_rotation(1, track));
        assert_eq!(String::from_utf8(written).unwrap(), SMALL.replace("-4.5", "7.250000"));
    }
}

#[test]
fn names_are_kept_as_they_are() {
    let (_, clip, _) = opened(SMALL.replace("Leg\n", "left: upper|leg.L ü \n").replace("Hips", ""));
    assert_eq!(clip.skeleton.joints()[1].name, "left: upper|leg.L ü");
    assert_eq!(clip.skeleton.label(0), "#0");
    let latin: Vec<u8> =
        SMALL.replace("Leg", "H~fte").bytes().map(|b| if b == b'~' { 0xFC } else { b }).collect();
    assert_eq!(opened(latin).1.skeleton.joints()[1].name, "Hüfte");
    let (_, clip, _) = opened(SMALL.replace("Hips", "Leg"));
    assert_eq!((clip.skeleton.label(0), clip.skeleton.label(1)), ("Leg#0", "Leg#1"));
}

/// A joint under a root without channels, with one row of numbers.
fn one_joint(channels: &str, row: &str) -> String {
    format!(
        "HIERARCHY ROOT a {{ OFFSET 0 0 0 CHANNELS 0 JOINT b {{ OFFSET 1 2 3 CHANNELS {channels} }} }}\nMOTION\nFrames: 1\nFrame Time: 0.1\n{row}\n"
    )
}

#[test]
fn channels_of_every_number_and_order() {
    let x = |degrees: f64| Axis::X.rotor(degrees.to_radians());
    let z = |degrees: f64| Axis::Z.rotor(degrees.to_radians());
    let cases: [(&str, &str, Rotor, [f64; 3]); 6] = [
        ("1 Zrotation", "30", z(30.0), [1.0, 2.0, 3.0]),
        ("2 Zrotation Xrotation", "30 40", z(30.0) * x(40.0), [1.0, 2.0, 3.0]),
        ("3 Zrotation Xrotation Zrotation", "30 40 50", z(30.0) * x(40.0) * z(50.0), [1.0, 2.0, 3.0]),
        ("3 Zrotation Zrotation Xrotation", "30 40 50", z(70.0) * x(50.0), [1.0, 2.0, 3.0]),
        ("4 Xrotation Zposition Zrotation Yposition", "40 9 30 8", x(40.0) * z(30.0), [1.0, 8.0, 9.0]),
        (
            "4 Zrotation Xrotation Zrotation Xrotation",
            "30 40 50 60",
            z(30.0) * x(40.0) * z(50.0) * x(60.0),
            [1.0, 2.0, 3.0],
        ),
    ];
    for (channels, row, turn, place) in cases {
        let (_, clip, _) = opened(one_joint(channels, row));
        let pose = clip.local_at(0.0);
        assert!(pose[1].rotation.turn_to(turn) < 1e-12, "{channels}");
        assert_eq!(pose[1].translation.to_array(), place, "{channels}");
        assert_eq!(pose[0].rotation, Rotor::IDENTITY);
        assert!(clip.rotation(0).is_none());
    }
}

#[test]
fn several_roots_and_joints_without_content() {
    let (_, clip, notes) = opened(
        "HIERARCHY ROOT a { OFFSET 0 0 0 CHANNELS 3 Zrotation Xrotation Yrotation JOINT c { } }\nROOT b { OFFSET 1 0 0 CHANNELS 1 Xrotation }\n\
         MOTION\nFrames: 1\nFrame Time: 0.1\n1 2 3 4\n",
    );
    let parents: Vec<Option<usize>> = clip.skeleton.joints().iter().map(|joint| joint.parent).collect();
    assert_eq!(parents, [None, Some(0), None]);
    assert_eq!(degrees(&clip, 2, 0), [4.0, 0.0, 0.0]);
    assert_eq!(notes, ["line 1: expected OFFSET in every joint, found none: taken as 0 0 0"]);
}

#[test]
fn a_skeleton_alone_is_a_clip_without_frames() {
    let (document, clip, notes) = opened(SMALL.split("MOTION").next().unwrap());
    assert_eq!(notes, ["end of file: expected MOTION, found none: a skeleton without a clip"]);
    assert_eq!((clip.grid.count(), clip.skeleton.len(), clip.duration_secs), (0, 2, 0.0));
    assert_eq!(clip.local_at(1.0), clip.skeleton.rest_pose());
    assert_eq!(&write(&document, &clip, &clip).0[..], SMALL.split("MOTION").next().unwrap().as_bytes());
}

#[test]
fn a_turn_that_the_channels_lack_is_told_with_its_size() {
    let (document, clip, _) = opened(one_joint("1 Zrotation", "30"));
    let track = clip.rotation(1).unwrap();
    let wanted = Axis::Z.rotor(0.5) * Axis::X.rotor(0.1);
    let edited = clip.with_rotation(1, track.with_keys(&[(0, wanted)]));
    let (written, notes) = write(&document, &clip, &edited);
    let texts: Vec<String> = notes.iter().map(Note::to_string).collect();
    assert_eq!(
        texts,
        ["joint b: expected three turns to write any rotation, found Z: up to 5.730 degrees off, at frame 0"]
    );
    assert!(String::from_utf8(written).unwrap().ends_with("\n28.647890\n"));
}

#[test]
fn a_changed_number_stays_apart_from_its_neighbours_and_keeps_the_mark() {
    let (document, clip, _) = opened(SMALL.replace("-4 -5 -6", "-4-5-6"));
    let track = clip.rotation(1).unwrap().with_angles(&[(0, [4.0, 5.0, -6.0])]);
    let (written, _) = write(&document, &clip, &clip.with_rotation(1, track));
    assert!(String::from_utf8(written).unwrap().contains("30 4.000000 5.000000-6\n"));
    let (document, clip, _) = opened(SMALL.replace("0.04", "0,04").replace(".5", ",5"));
    let track = clip.rotation(1).unwrap().with_angles(&[(1, [4.25, -5.5, -6.5])]);
    let (written, _) = write(&document, &clip, &clip.with_rotation(1, track));
    assert!(String::from_utf8(written).unwrap().contains("31 4,250000 -5,5 -6,5\n"));
}

#[test]
fn four_turns_take_any_rotation_and_keep_the_fourth() {
    let (document, clip, _) = opened(one_joint("4 Zrotation Xrotation Zrotation Yrotation", "30 40 50 60"));
    let wanted = EulerOrder::ZXY.to_rotor([0.3, -0.8, 2.0]);
    let edited = clip.with_rotation(1, clip.rotation(1).unwrap().with_keys(&[(0, wanted)]));
    let (written, notes) = write(&document, &clip, &edited);
    assert_eq!(notes, []);
    let text = String::from_utf8(written.clone()).unwrap();
    assert!(text.ends_with(" 60\n"), "{text}");
    let (_, again, _) = opened(written);
    assert!(again.rotation(1).unwrap().keys[0].turn_to(wanted).to_degrees() < 2e-6);
}

/// The message for `text`.
#[track_caller]
fn refused(text: &[u8]) -> String {
    match read(text, "broken") {
        Err(error) => error.to_string(),
        Ok((_, clip, notes)) => panic!("read {} joints with {notes:?}", clip.skeleton.len()),
    }
}

#[test]
fn broken_files_are_refused_with_place_expected_and_found() {
    let with = |from: &str, to: &str| {
        assert!(SMALL.contains(from), "{from}");
        SMALL.replacen(from, to, 1).into_bytes()
    };
    let deep = format!("HIERARCHY {}", "ROOT a { ".repeat(600));
    let many = format!("HIERARCHY {}", "ROOT a { } ".repeat(10_001));
    let lost = format!(
        "{}{}",
        SMALL.replace("Frames: 2", "Frames: 6").replace(" -5 -6\n", " -5\n"),
        "1 2 3 4 5 6 7 8 9\n".repeat(4)
    );
    let cases: Vec<(Vec<u8>, &str)> = vec![
        (b"".to_vec(), "line 1, column 1: expected HIERARCHY, found the end of the file"),
        (b"   \n\n".to_vec(), "line 3, column 1: expected HIERARCHY, found the end of the file"),
        (b"\x00\xff\xfe".to_vec(), "line 1, column 2: expected HIERARCHY, found `ÿþ`"),
        (b"{\"asset\":{}}".to_vec(), "line 1, column 1: expected HIERARCHY, found `{\"asset\":{}}`"),
        (b"HIERARCHY".to_vec(), "line 1, column 10: expected ROOT, found the end of the file"),
        (b"HIERARCHY\nMOTION\n".to_vec(), "line 2, column 1: expected ROOT, found `MOTION`"),
        (b"HIERARCHY\nHips {".to_vec(), "line 2, column 1: expected ROOT, found `Hips`"),
        (with("ROOT Hips\n{", "ROOT Hips\n"), "line 4, column 2, joint Hips: expected `{`, found `OFFSET`"),
        (
            with("OFFSET 0 90 0", "OFFSET 0 90"),
            "line 5, column 2, joint Hips: expected a number for the z of OFFSET, found `CHANNELS`",
        ),
        (
            with("OFFSET 0 90 0", "OFFSET 0 ninety 0"),
            "line 4, column 11, joint Hips: expected a number for the y of OFFSET, found `ninety`",
        ),
        (
            with("OFFSET 0 90 0", "OFFSET 0 nan 0"),
            "line 4, column 11, joint Hips: expected a finite length for the y of OFFSET, found `nan`",
        ),
        (
            with("OFFSET 0 90 0", "OFSET 0 90 0"),
            "line 4, column 2, joint Hips: expected OFFSET, CHANNELS, JOINT, End Site or `}`, found `OFSET`",
        ),
        (
            with("CHANNELS 3 Zrotation", "CHANNELS 3"),
            "line 10, column 3, joint Leg: expected 3 channel names such as Zrotation or Xposition after 2, found `End`",
        ),
        (
            with("CHANNELS 3 Zrotation", "CHANNELS three Zrotation"),
            "line 9, column 12, joint Leg: expected the number of channels, found `three`",
        ),
        (
            with("CHANNELS 3 Zrotation", "CHANNELS -3 Zrotation"),
            "line 9, column 12, joint Leg: expected the number of channels, found `-3`",
        ),
        (
            with("CHANNELS 3 Zrotation", "CHANNELS 2.5 Zrotation"),
            "line 9, column 12, joint Leg: expected the number of channels, found `2.5`",
        ),
        (
            with("CHANNELS 3 Zrotation", "CHANNELS 3 Wrotation"),
            "line 9, column 14, joint Leg: expected 3 channel names such as Zrotation or Xposition after 0, found `Wrotation`",
        ),
        (
            with("Xposition Yposition", "Xposition Xposition"),
            "line 5, column 23, joint Hips: expected each position once, found `Xposition`",
        ),
        (
            with("\t\tEnd", "\t\tCHANNELS 1 Xrotation\n\t\tEnd"),
            "line 10, column 3, joint Leg: expected one CHANNELS line for each joint, found `CHANNELS`",
        ),
        (
            with("OFFSET 0 -40 5", "CHANNELS 1 Xrotation"),
            "line 12, column 4, joint Leg: expected OFFSET or `}`, found `CHANNELS`",
        ),
        (
            with("\t\t\tOFFSET 0 -40 5\n\t\t}\n", ""),
            "line 14, column 1, joint Hips: expected OFFSET, CHANNELS, JOINT, End Site or `}`, found `MOTION`",
        ),
        (
            with("\t}\n}\nMOTION", "\t}\nMOTION"),
            "line 15, column 1, joint Hips: expected OFFSET, CHANNELS, JOINT, End Site or `}`, found `MOTION`",
        ),
        (with("}\nMOTION", "}\n}\nMOTION"), "line 16, column 1: expected ROOT or MOTION, found `}`"),
        (
            SMALL.as_bytes()[..150].to_vec(),
            "line 9, column 3, joint Leg: expected OFFSET, CHANNELS, JOINT, End Site or `}`, found `CHANNEL`",
        ),
        (with("MOTION", "MOTON"), "line 21, column 1: expected ROOT or MOTION, found the end of the file"),
        (
            with("Frames: 2", "Frames: two"),
            "line 17, column 9: expected a whole number of frames, found `two`",
        ),
        (with("Frames: 2", "Frames: -2"), "line 17, column 9: expected a whole number of frames, found `-2`"),
        (
            with("Frames: 2", "Frames: 1.5"),
            "line 17, column 9: expected a whole number of frames, found `1.5`",
        ),
        (
            with("Frame Time: 0.04", "Frame Time: fast"),
            "line 18, column 13: expected a frame time in seconds, found `fast`",
        ),
        (
            with("Frame Time", "Frame Rate"),
            "line 18, column 1: expected `Frames:` or `Frame Time:`, found `Frame`",
        ),
        (
            with("20 30 -4", "20 x30 -4"),
            "line 19, column 13, frame 0, joint Hips: expected a number, found `x30`",
        ),
        (
            with("-4.5 -5.5", "-4.5 -5.5.5"),
            "line 20, column 27, frame 1, joint Leg: expected a number, found `-5.5.5`",
        ),
        (
            with("-4.5 -5.5", "-4.5, -5.5"),
            "line 20, column 22, frame 1, joint Leg: expected a number, found `-4.5,`",
        ),
        (
            with("-4.5 -5.5", "-4.5 1e"),
            "line 20, column 27, frame 1, joint Leg: expected a number, found `1e`",
        ),
        (
            with("-4.5 -5.5", "-4.5 --5"),
            "line 20, column 27, frame 1, joint Leg: expected a number, found `--5`",
        ),
        (
            with("-4.5 -5.5", "-4,5 -5.5"),
            "line 20, column 22: expected one decimal mark in the whole file, found points and the comma of `-4,5`",
        ),
        (
            with("-6\n1.5", "-6\nstop\n1.5"),
            "line 20, column 1, frame 1, joint Hips: expected a number, found `stop`",
        ),
        (
            lost.into_bytes(),
            "line 19, column 21, frame 0, joint Leg: expected 9 numbers on the line, one for each channel, found 8",
        ),
        (
            deep.into_bytes(),
            "line 1, column 4619: expected at most 512 joints one inside the other, found more",
        ),
        (many.into_bytes(), "line 1, column 110011: expected at most 10000 joints, found more"),
    ];
    assert!(cases.len() >= 30);
    let wrong: Vec<(String, &str)> = cases
        .iter()
        .map(|(text, message)| (refused(text), *message))
        .filter(|(found, expected)| found != expected)
        .collect();
    assert!(wrong.is_empty(), "found and expected: {wrong:#?}");
}

#[test]
fn counts_that_are_absurd_take_no_memory() {
    let (_, clip, notes) = opened(SMALL.replace("Frames: 2", "Frames: 99999999999999999999"));
    assert_eq!((clip.grid.count(), notes.len()), (2, 1));
    let none = SMALL
        .replace("CHANNELS 6 Xposition Yposition Zposition Zrotation Xrotation Yrotation", "CHANNELS 0")
        .replace("CHANNELS 3 Zrotation Xrotation Yrotation", "CHANNELS 0");
    let (_, clip, _) = opened(none.replace("Frames: 2", "Frames: 99999999999999"));
    assert_eq!(clip.grid.count(), 0);
    assert!(read(SMALL.replace("CHANNELS 3", "CHANNELS 4000000000").as_bytes(), "").is_err());
}

#[test]
fn a_million_oddities_of_one_kind_are_told_once_and_cost_no_time() {
    let offsets = format!("OFFSET 0 90 0{}", "\nOFFSET 0 90 0".repeat(100_000));
    let comments = "# none\n\n".repeat(100_000);
    let text =
        SMALL.replacen("OFFSET 0 90 0", &offsets, 1).replacen("MOTION", &format!("{comments}MOTION"), 1);
    let (_, clip, notes) = opened(text.replace("Frames: 2", &"Frames:\n".repeat(100_000)));
    assert_eq!(clip.grid.count(), 2);
    assert_eq!(notes.len(), 4, "{notes:?}");
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
    let mut random = Random(0x5EED_0B5E_55ED);
    let (mut read_well, mut refused) = (0, 0);
    for round in 0..6000 {
        let mut bytes = SMALL.as_bytes().to_vec();
        for _ in 0..=random.below(4) {
            let at = random.below(bytes.len());
            match random.below(5) {
                0 => bytes[at] = random.below(256) as u8,
                1 => bytes.truncate(at.max(1)),
                2 => {
                    let piece = bytes[at..(at + 1 + random.below(60)).min(bytes.len())].to_vec();
                    let to = random.below(bytes.len());
                    bytes.splice(to..to, piece);
                }
                3 => {
                    bytes.drain(at..(at + 1 + random.below(30)).min(bytes.len()));
                    if bytes.is_empty() {
                        bytes.push(b'H');
                    }
                }
                _ => bytes[at] = b"0123456789.-+,eE \n{}#nR"[random.below(23)],
            }
        }
        let Ok((document, clip, _)) = read(&bytes, "random") else {
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
            let (_, again, _) = read(&written, "again").unwrap_or_else(|error| {
                panic!("round {round}: {error}\n{}", String::from_utf8_lossy(&written))
            });
            assert_eq!(again.grid.count(), clip.grid.count(), "round {round}");
            super::from_clip(&edited);
        }
    }
    assert!(read_well > 300 && refused > 300, "{read_well} read, {refused} refused");
}
