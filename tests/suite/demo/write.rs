//! Plain writers for the demo clips. The program's own writers would put right what is planted here.

use std::fmt::Write as _;

use glam::DVec3;
use serde_json::{Value, json};
use turnwright::rotor::{EulerOrder, Rotor};

use super::body::Motion;

/// Angle triples in degrees, order z x y, one list for each bone.
pub(super) type Angles = Vec<Vec<[f64; 3]>>;

/// The angles of a motion, each triple the one nearest to the triple before it.
pub(super) fn angles(motion: &Motion) -> Angles {
    let order = EulerOrder::ZXY;
    (0..motion.bones.len())
        .map(|bone| {
            let mut last = [0.0; 3];
            motion
                .poses
                .iter()
                .map(|pose| {
                    let triple = order.from_rotor(pose.turns[bone].normalize(), last[2]);
                    last = order.nearest_equal(triple, last);
                    last.map(f64::to_degrees)
                })
                .collect()
        })
        .collect()
}

/// BVH text: the root with six channels, all others with three.
pub(super) fn bvh(motion: &Motion, angles: &Angles) -> Vec<u8> {
    let mut text = "HIERARCHY\n".to_owned();
    bvh_joint(motion, 0, 0, &mut text);
    let frames = motion.poses.len();
    let step_secs = 1.0 / motion.rate;
    let _ = write!(text, "MOTION\nFrames: {frames}\nFrame Time: {step_secs:.10}\n");
    for (frame, pose) in motion.poses.iter().enumerate() {
        let places = pose.root.to_array();
        let turns = angles.iter().flat_map(|triples| triples[frame]);
        let row: Vec<String> = places.into_iter().chain(turns).map(six_decimals).collect();
        text.push_str(&row.join(" "));
        text.push('\n');
    }
    text.into_bytes()
}

fn bvh_joint(motion: &Motion, bone: usize, depth: usize, text: &mut String) {
    let own = &motion.bones[bone];
    let pad = "  ".repeat(depth);
    let offset = |v: DVec3| v.to_array().map(six_decimals).join(" ");
    let (keyword, channels) = match own.parent {
        None => ("ROOT", "6 Xposition Yposition Zposition Zrotation Xrotation Yrotation"),
        Some(_) => ("JOINT", "3 Zrotation Xrotation Yrotation"),
    };
    let _ = write!(text, "{pad}{keyword} {}\n{pad}{{\n{pad}  OFFSET {}\n", own.name, offset(own.offset));
    let _ = writeln!(text, "{pad}  CHANNELS {channels}");
    if let Some(tip) = own.tip {
        let _ = write!(text, "{pad}  End Site\n{pad}  {{\n{pad}    OFFSET {}\n{pad}  }}\n", offset(tip));
    }
    for child in (0..motion.bones.len()).filter(|&child| motion.bones[child].parent == Some(bone)) {
        bvh_joint(motion, child, depth + 1, text);
    }
    let _ = writeln!(text, "{pad}}}");
}

fn six_decimals(value: f64) -> String {
    fixed(value, 6)
}

/// Fixed notation; what is no number is written as captures write it.
fn fixed(value: f64, decimals: usize) -> String {
    if value.is_nan() {
        return "nan".to_owned();
    }
    let text = format!("{value:.decimals$}");
    // Rounding may leave a minus before zeros.
    match text.strip_prefix('-') {
        Some(zeros) if zeros.chars().all(|c| c == '0' || c == '.') => zeros.to_owned(),
        _ => text,
    }
}

/// One rotation channel of a glTF file: key times, values as stored, and for a cubic one in- and out-tangents.
pub(super) struct Channel {
    pub(super) bone: usize,
    pub(super) times: Vec<f64>,
    pub(super) keys: Vec<Rotor>,
    pub(super) tangents: Option<Vec<[Rotor; 2]>>,
}

/// Buffer views and accessors as they grow.
#[derive(Default)]
struct Buffer {
    bytes: Vec<u8>,
    views: Vec<Value>,
    accessors: Vec<Value>,
}

impl Buffer {
    fn add(&mut self, kind: &str, width: usize, numbers: &[f32]) -> usize {
        let bytes = numbers.len() * 4;
        self.views.push(json!({"buffer": 0, "byteOffset": self.bytes.len(), "byteLength": bytes}));
        self.bytes.extend(numbers.iter().flat_map(|number| number.to_le_bytes()));
        let mut accessor = json!({
            "bufferView": self.views.len() - 1, "componentType": 5126, "count": numbers.len() / width, "type": kind
        });
        if kind == "SCALAR" {
            accessor["min"] = json!([numbers[0]]);
            accessor["max"] = json!([numbers[numbers.len() - 1]]);
        }
        self.accessors.push(accessor);
        self.accessors.len() - 1
    }
}

/// A binary glTF file with one skin and one animation of the channels and of the root's place.
pub(super) fn glb(motion: &Motion, name: &str, channels: &[Channel]) -> Vec<u8> {
    let mut buffer = Buffer::default();
    let (mut samplers, mut targets) = (Vec::new(), Vec::new());
    let frame_times: Vec<f64> = (0..motion.poses.len()).map(|frame| frame as f64 / motion.rate).collect();
    let mut inputs: Vec<(Vec<f64>, usize)> = Vec::new();
    let mut input_of = |times: &[f64], buffer: &mut Buffer| {
        if let Some((_, known)) = inputs.iter().find(|(own, _)| own == times) {
            return *known;
        }
        let numbers: Vec<f32> = times.iter().map(|&time| time as f32).collect();
        inputs.push((times.to_vec(), buffer.add("SCALAR", 1, &numbers)));
        inputs[inputs.len() - 1].1
    };

    let places: Vec<f32> =
        motion.poses.iter().flat_map(|pose| pose.root.to_array()).map(|number| number as f32).collect();
    let input = input_of(&frame_times, &mut buffer);
    samplers
        .push(json!({"input": input, "output": buffer.add("VEC3", 3, &places), "interpolation": "LINEAR"}));
    targets.push(json!({"sampler": 0, "target": {"node": 0, "path": "translation"}}));
    for channel in channels {
        let rotors: Vec<Rotor> = match &channel.tangents {
            None => channel.keys.clone(),
            Some(tangents) => {
                let with_tangents = |(key, [into, out]): (&Rotor, &[Rotor; 2])| [*into, *key, *out];
                channel.keys.iter().zip(tangents).flat_map(with_tangents).collect()
            }
        };
        let numbers: Vec<f32> =
            rotors.iter().flat_map(|rotor| rotor.to_xyzw()).map(|number| number as f32).collect();
        let input = input_of(&channel.times, &mut buffer);
        let interpolation = if channel.tangents.is_some() { "CUBICSPLINE" } else { "LINEAR" };
        let output = buffer.add("VEC4", 4, &numbers);
        targets
            .push(json!({"sampler": samplers.len(), "target": {"node": channel.bone, "path": "rotation"}}));
        samplers.push(json!({"input": input, "output": output, "interpolation": interpolation}));
    }

    let nodes: Vec<Value> = motion
        .bones
        .iter()
        .enumerate()
        .map(|(index, bone)| {
            let mut node = json!({"name": bone.name, "translation": bone.offset.to_array()});
            let children: Vec<usize> =
                (0..motion.bones.len()).filter(|&child| motion.bones[child].parent == Some(index)).collect();
            if !children.is_empty() {
                node["children"] = json!(children);
            }
            node
        })
        .collect();
    let document = json!({
        "asset": {"version": "2.0", "generator": "turnwright demo scenes"},
        "scene": 0,
        "scenes": [{"name": "quay", "nodes": [0]}],
        "nodes": nodes,
        "skins": [{"name": name, "joints": (0..motion.bones.len()).collect::<Vec<_>>()}],
        "animations": [{"name": name, "channels": targets, "samplers": samplers}],
        "accessors": buffer.accessors,
        "bufferViews": buffer.views,
        "buffers": [{"byteLength": buffer.bytes.len()}],
    });
    let mut text = document.to_string().into_bytes();
    text.resize(text.len().next_multiple_of(4), b' ');
    let whole = 12 + 8 + text.len() + 8 + buffer.bytes.len();
    let word = |number: usize| (number as u32).to_le_bytes();
    [
        b"glTF".as_slice(),
        &word(2),
        &word(whole),
        &word(text.len()),
        b"JSON",
        &text,
        &word(buffer.bytes.len()),
        b"BIN\0",
        &buffer.bytes,
    ]
    .concat()
}

/// How a joint stands in a CSV file.
pub(super) enum Columns {
    /// `NAME.z NAME.x NAME.y`, degrees.
    Angles(Vec<[f64; 3]>),
    /// `NAME.yz NAME.zx NAME.xy`, degrees.
    PlaneAngles(Vec<[f64; 3]>),
    /// `NAME.qx NAME.qy NAME.qz NAME.qw`.
    Rotors(Vec<Rotor>),
}

/// CSV text with the skeleton above the header.
pub(super) fn csv(motion: &Motion, joints: &[(usize, Columns)]) -> Vec<u8> {
    let mut text = String::new();
    for bone in motion.bones {
        let parent = bone.parent.map(|parent| format!(" parent {}", motion.bones[parent].name));
        let [x, y, z] = bone.offset.to_array();
        let _ = writeln!(text, "# joint {}{} offset {x} {y} {z}", bone.name, parent.unwrap_or_default());
    }
    text.push_str("time");
    for (bone, columns) in joints {
        let parts: &[&str] = match columns {
            Columns::Angles(_) => &["z", "x", "y"],
            Columns::PlaneAngles(_) => &["yz", "zx", "xy"],
            Columns::Rotors(_) => &["qx", "qy", "qz", "qw"],
        };
        for part in parts {
            let _ = write!(text, ",{}.{part}", motion.bones[*bone].name);
        }
    }
    for frame in 0..motion.poses.len() {
        let _ = write!(text, "\n{}", frame as f64 / motion.rate);
        for (_, columns) in joints {
            match columns {
                Columns::Angles(rows) | Columns::PlaneAngles(rows) => {
                    rows[frame]
                        .iter()
                        .for_each(|&degrees| text.push_str(&(",".to_owned() + &six_decimals(degrees))));
                }
                Columns::Rotors(rows) => rows[frame].to_xyzw().iter().for_each(|number| {
                    let _ = write!(text, ",{}", fixed(*number, 9));
                }),
            }
        }
    }
    text.push('\n');
    text.into_bytes()
}
