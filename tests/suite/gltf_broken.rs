//! glTF and GLB, damaged: a small sound document is damaged in one place at a time, and the error says where, what was
//! expected and what was found. Then many random damages, which may give any error but no panic.

#![expect(clippy::unwrap_used, reason = "helpers of tests fail as tests do")]

use base64::Engine;
use serde_json::{Value, json};
use turnwright::exchange::gltf::{self, GltfError};

/// Three nodes, two of them joints; a rotation and a translation over three keys. All data in one data URI.
pub(crate) fn small() -> Value {
    let mut bytes: Vec<u8> = Vec::new();
    let numbers: [f32; 24] = [
        0.0, 0.5, 1.0, // key times
        0.0, 0.0, 0.0, 1.0, 0.6, 0.0, 0.0, 0.8, 0.0, 0.6, 0.0, 0.8, // rotations
        1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0, 9.0, // translations
    ];
    bytes.extend(numbers.iter().flat_map(|number| number.to_le_bytes()));
    // Sparse: indices 0 and 2, then two rotations.
    bytes.extend([0, 2, 0, 0]);
    bytes.extend([0.0_f32, 0.0, 1.0, 0.0, 1.0, 0.0, 0.0, 0.0].iter().flat_map(|number| number.to_le_bytes()));
    let uri = base64::engine::general_purpose::STANDARD.encode(&bytes);
    json!({
        "asset": { "version": "2.0" },
        "scene": 0,
        "scenes": [{ "nodes": [0] }],
        "nodes": [
            { "name": "above", "children": [1] },
            { "name": "root", "children": [2], "rotation": [0, 0, 0, 1] },
            { "name": "tip", "translation": [0, 1, 0] },
        ],
        "skins": [{ "joints": [1, 2] }],
        "buffers": [{ "byteLength": bytes.len(), "uri": format!("data:application/octet-stream;base64,{uri}") }],
        "bufferViews": [
            { "buffer": 0, "byteLength": 12 },
            { "buffer": 0, "byteOffset": 12, "byteLength": 48 },
            { "buffer": 0, "byteOffset": 60, "byteLength": 36 },
            { "buffer": 0, "byteOffset": 96, "byteLength": 2 },
            { "buffer": 0, "byteOffset": 100, "byteLength": 32 },
        ],
        "accessors": [
            { "bufferView": 0, "componentType": 5126, "count": 3, "type": "SCALAR", "min": [0], "max": [1] },
            { "bufferView": 1, "componentType": 5126, "count": 3, "type": "VEC4", "sparse": {
                "count": 2,
                "indices": { "bufferView": 3, "componentType": 5121 },
                "values": { "bufferView": 4 },
            }},
            { "bufferView": 2, "componentType": 5126, "count": 3, "type": "VEC3" },
        ],
        "animations": [{
            "channels": [
                { "sampler": 0, "target": { "node": 1, "path": "rotation" } },
                { "sampler": 1, "target": { "node": 2, "path": "translation" } },
            ],
            "samplers": [{ "input": 0, "output": 1 }, { "input": 0, "output": 2, "interpolation": "STEP" }],
        }],
    })
}

pub(crate) fn read(bytes: &[u8]) -> Result<(gltf::Document, Vec<turnwright::clip::Clip>), GltfError> {
    let fetch = |file: &str| match file {
        "short.bin" => Ok(vec![0; 8]),
        _ => Err(format!("there is no {file}")),
    };
    gltf::read(bytes, "small.glb", &fetch).map(|(document, clips, _)| (document, clips))
}

/// What is wrong with the error that a damage gives; `None` for nothing.
fn complaint(what: &str, bytes: &[u8], expected: &str) -> Option<String> {
    let Err(error) = read(bytes) else {
        return Some(format!("{what}: expected `{expected}`, found no error"));
    };
    let text = error.to_string();
    let is_told = text.contains(expected) && (text.contains("expected") || text.contains("cannot read"));
    (!is_told || error.place.is_empty()).then(|| format!("{what}: expected `{expected}`, found `{text}`"))
}

/// What to do to the document, and what the error must say.
type Damage = (&'static str, fn(&mut Value), &'static str);

const DAMAGES: &[Damage] = &[
    ("no asset", |d| remove(d, "asset"), "asset: expected an object with the version, found nothing"),
    ("no version", |d| d["asset"] = json!({}), "asset.version: expected \"2.0\", found nothing"),
    ("version 1", |d| d["asset"]["version"] = json!("1.0"), "asset.version: expected \"2.0\", found `1.0`"),
    ("version 3", |d| d["asset"]["version"] = json!("3.0"), "asset.version: expected \"2.0\", found `3.0`"),
    ("version a number", |d| d["asset"]["version"] = json!(2.0), "asset.version: expected a text, found 2"),
    (
        "minVersion",
        |d| d["asset"]["minVersion"] = json!("2.1"),
        "asset.minVersion: expected at most \"2.0\", found `2.1`",
    ),
    ("nodes no list", |d| d["nodes"] = json!({}), "nodes: expected a list, found an object"),
    (
        "child beyond",
        |d| d["nodes"][1]["children"] = json!([9]),
        "nodes[1].children[0]: expected an index into nodes, below 3, found 9",
    ),
    (
        "child negative",
        |d| d["nodes"][1]["children"] = json!([-1]),
        "nodes[1].children[0]: expected a whole number, found -1",
    ),
    (
        "child a fraction",
        |d| d["nodes"][1]["children"] = json!([1.5]),
        "nodes[1].children[0]: expected a whole number, found 1.5",
    ),
    (
        "own child",
        |d| d["nodes"][2]["children"] = json!([0]),
        "expected a tree, found a circle of nodes[0], nodes[2], nodes[1]",
    ),
    (
        "itself",
        |d| d["nodes"] = json!([{ "children": [0] }, {}, {}]),
        "nodes[0].children: expected a tree, found a circle of nodes[0]",
    ),
    (
        "two parents",
        |d| d["nodes"][0]["children"] = json!([1, 2]),
        "nodes[1].children[0]: expected one parent for each node, found nodes[2] under nodes[0] and nodes[1]",
    ),
    (
        "child twice",
        |d| d["nodes"][0]["children"] = json!([1, 1]),
        "found nodes[1] under nodes[0] and nodes[0]",
    ),
    (
        "deep tree",
        |d| d["nodes"] = deep_tree(600),
        "nodes[512]: expected at most 512 nodes below one another",
    ),
    ("name a number", |d| d["nodes"][1]["name"] = json!(7), "nodes[1].name: expected a text, found 7"),
    (
        "short rotation",
        |d| d["nodes"][1]["rotation"] = json!([0, 0, 1]),
        "nodes[1].rotation: expected 4 numbers, found a list of 3",
    ),
    (
        "rotation of texts",
        |d| d["nodes"][1]["rotation"] = json!(["0", 0, 0, 1]),
        "nodes[1].rotation: expected 4 numbers",
    ),
    (
        "short matrix",
        |d| d["nodes"][0]["matrix"] = json!([1, 0, 0]),
        "nodes[0].matrix: expected 16 numbers, found a list of 3",
    ),
    (
        "skin joint beyond",
        |d| d["skins"][0]["joints"] = json!([1, 7]),
        "skins[0].joints[1]: expected an index into nodes, below 3, found 7",
    ),
    (
        "skin joint a text",
        |d| d["skins"][0]["joints"] = json!(["1"]),
        "skins[0].joints[0]: expected a whole number, found `1`",
    ),
    (
        "sampler beyond",
        |d| d["animations"][0]["channels"][0]["sampler"] = json!(2),
        "animations[0].channels[0].sampler: expected an index into samplers, below 2, found 2",
    ),
    (
        "no sampler",
        |d| remove(&mut d["animations"][0]["channels"][0], "sampler"),
        "animations[0].channels[0].sampler: expected an index into samplers, found nothing",
    ),
    (
        "no samplers",
        |d| remove(&mut d["animations"][0], "samplers"),
        "expected an index into samplers, of which there are none",
    ),
    (
        "no target",
        |d| remove(&mut d["animations"][0]["channels"][1], "target"),
        "animations[0].channels[1].target: expected an object, found nothing",
    ),
    (
        "no path",
        |d| remove(&mut d["animations"][0]["channels"][1]["target"], "path"),
        "animations[0].channels[1].target.path: expected a text",
    ),
    (
        "target beyond",
        |d| d["animations"][0]["channels"][0]["target"]["node"] = json!(3),
        "animations[0].channels[0].target.node: expected an index into nodes, below 3, found 3",
    ),
    (
        "input beyond",
        |d| d["animations"][0]["samplers"][0]["input"] = json!(3),
        "animations[0].samplers[0].input: expected an index into accessors, below 3, found 3",
    ),
    (
        "no output",
        |d| remove(&mut d["animations"][0]["samplers"][0], "output"),
        "animations[0].samplers[0].output: expected an index into accessors, found nothing",
    ),
    (
        "interpolation",
        |d| d["animations"][0]["samplers"][0]["interpolation"] = json!("SMOOTH"),
        "animations[0].samplers[0].interpolation: expected LINEAR, STEP or CUBICSPLINE, found `SMOOTH`",
    ),
    (
        "too few values",
        |d| d["accessors"][2]["count"] = json!(2),
        "accessors[2].count: expected 3 values, one for each key time of accessors[0], found 2",
    ),
    (
        "cubic without tangents",
        |d| d["animations"][0]["samplers"][0]["interpolation"] = json!("CUBICSPLINE"),
        "accessors[1].count: expected 3 × 3 values",
    ),
    (
        "times of VEC3",
        |d| d["accessors"][0]["type"] = json!("VEC3"),
        "accessors[0].type: expected `SCALAR`, found `VEC3`",
    ),
    (
        "rotations of VEC3",
        |d| d["animations"][0]["samplers"][0]["output"] = json!(2),
        "accessors[2].type: expected `VEC4`, found `VEC3`",
    ),
    ("no type", |d| remove(&mut d["accessors"][0], "type"), "accessors[0].type: expected `SCALAR`, found ``"),
    (
        "component unknown",
        |d| d["accessors"][1]["componentType"] = json!(5130),
        "accessors[1].componentType: expected 5120 to 5123, 5125 or 5126, found 5130",
    ),
    (
        "times as integers",
        |d| d["accessors"][0]["componentType"] = json!(5123),
        "accessors[0].componentType: expected 5126 (float), found 5123",
    ),
    (
        "rotations as uint32",
        |d| d["accessors"][1]["componentType"] = json!(5125),
        "accessors[1].componentType: expected 5120 to 5123 or 5126, found 5125",
    ),
    (
        "not normalised",
        |d| d["accessors"][1]["componentType"] = json!(5122),
        "accessors[1].normalized: expected `normalized: true`",
    ),
    ("count 0", |d| d["accessors"][0]["count"] = json!(0), "accessors[0].count: expected 1 or more, found 0"),
    (
        "count huge",
        |d| d["accessors"][0]["count"] = json!(4_000_000_000_u32),
        "accessors[0]: expected to fit into bufferViews[0] of 12 bytes, found 4000000000 elements",
    ),
    (
        "count beyond counting",
        |d| d["accessors"][0]["count"] = json!(9.1e18),
        "accessors[0].count: expected a whole number",
    ),
    (
        "accessor beyond its view",
        |d| d["accessors"][0]["byteOffset"] = json!(4),
        "accessors[0]: expected to fit into bufferViews[0] of 12 bytes, found 3 elements up to byte 16",
    ),
    (
        "accessor offset huge",
        |d| d["accessors"][0]["byteOffset"] = json!(9_007_199_254_740_992_u64),
        "accessors[0]: expected to fit into bufferViews[0]",
    ),
    (
        "view beyond",
        |d| d["accessors"][0]["bufferView"] = json!(5),
        "accessors[0].bufferView: expected an index into bufferViews, below 5, found 5",
    ),
    (
        "view beyond its buffer",
        |d| d["bufferViews"][4]["byteLength"] = json!(33),
        "bufferViews[4]: expected a part of buffers[0], which has 132 bytes, found bytes 100 to 133",
    ),
    (
        "view offset huge",
        |d| d["bufferViews"][0]["byteOffset"] = json!(9e15),
        "bufferViews[0]: expected a part of buffers[0]",
    ),
    (
        "no view length",
        |d| remove(&mut d["bufferViews"][0], "byteLength"),
        "bufferViews[0].byteLength: expected a whole number, found nothing",
    ),
    (
        "small stride",
        |d| d["bufferViews"][1]["byteStride"] = json!(4),
        "bufferViews[1].byteStride: expected 16 or more, found 4",
    ),
    (
        "wide stride",
        |d| d["bufferViews"][1]["byteStride"] = json!(20),
        "accessors[1]: expected to fit into bufferViews[1] of 48 bytes, found 3 elements up to byte 56",
    ),
    (
        "buffer beyond",
        |d| d["bufferViews"][0]["buffer"] = json!(1),
        "bufferViews[0].buffer: expected an index into buffers, below 1, found 1",
    ),
    (
        "buffer too short",
        |d| d["buffers"][0]["byteLength"] = json!(133),
        "buffers[0]: expected 133 bytes as its byteLength says, found 132 bytes",
    ),
    ("no uri", |d| remove(&mut d["buffers"][0], "uri"), "buffers[0].uri: expected a uri"),
    (
        "no base64",
        |d| d["buffers"][0]["uri"] = json!("data:;base64,!!!!"),
        "buffers[0].uri: expected base64 in the data URI",
    ),
    (
        "absolute",
        |d| d["buffers"][0]["uri"] = json!("/etc/passwd"),
        "buffers[0].uri: expected a relative path inside the document's own folder, found the absolute path `/etc/passwd`",
    ),
    (
        "out of the folder",
        |d| d["buffers"][0]["uri"] = json!("a/%2E%2E/../b.bin"),
        "found a way out of the folder in `a/%2E%2E/../b.bin`",
    ),
    (
        "from the net",
        |d| d["buffers"][0]["uri"] = json!("https://example.org/a.bin"),
        "found a scheme or drive in `https://example.org/a.bin`",
    ),
    (
        "missing file",
        |d| d["buffers"][0]["uri"] = json!("gone.bin"),
        "buffers[0].uri: cannot read `gone.bin`: there is no gone.bin",
    ),
    (
        "short file",
        |d| d["buffers"][0]["uri"] = json!("short.bin"),
        "buffers[0]: expected 132 bytes as its byteLength says, found 8 bytes",
    ),
    (
        "NaN time",
        |d| set_float(d, 1, f32::NAN),
        "accessors[0]: expected finite key times, found NaN at key 1",
    ),
    (
        "endless time",
        |d| set_float(d, 2, f32::INFINITY),
        "accessors[0]: expected finite key times, found inf at key 2",
    ),
    (
        "falling times",
        |d| set_float(d, 1, 2.0),
        "accessors[0]: expected rising key times, found 1 after 2 at key 2",
    ),
    (
        "sparse out of order",
        |d| set_byte(d, 96, 2),
        "accessors[1].sparse.indices: expected strictly rising indices below 3, found 2 at 1",
    ),
    (
        "sparse index beyond",
        |d| set_byte(d, 97, 3),
        "accessors[1].sparse.indices: expected strictly rising indices below 3, found 3 at 1",
    ),
    (
        "sparse count 0",
        |d| d["accessors"][1]["sparse"]["count"] = json!(0),
        "accessors[1].sparse.count: expected 1 to 3, found 0",
    ),
    (
        "sparse count huge",
        |d| d["accessors"][1]["sparse"]["count"] = json!(1e9),
        "accessors[1].sparse.count: expected 1 to 3, found 1000000000",
    ),
    (
        "sparse indices as floats",
        |d| d["accessors"][1]["sparse"]["indices"]["componentType"] = json!(5126),
        "accessors[1].sparse.indices.componentType: expected 5121, 5123 or 5125, found 5126",
    ),
    (
        "no sparse values",
        |d| remove(&mut d["accessors"][1]["sparse"], "values"),
        "accessors[1].sparse.values: expected an object, found nothing",
    ),
    (
        "sparse values beyond",
        |d| d["accessors"][1]["sparse"]["values"]["byteOffset"] = json!(4),
        "accessors[1].sparse.values: expected to fit into bufferViews[4] of 32 bytes",
    ),
    ("zeros without end", zeros_without_end, "accessors[1].count: expected at most"),
    (
        "compressed",
        compressed,
        "bufferViews[1]: animation data compressed by EXT_meshopt_compression is not read; expected plain numbers",
    ),
    ("many clips of many joints", many_tracks, "animations: expected animations for at most"),
];

fn remove(object: &mut Value, key: &str) {
    object.as_object_mut().unwrap().remove(key).unwrap();
}

fn deep_tree(depth: usize) -> Value {
    let node = |index: usize| if index + 1 < depth { json!({ "children": [index + 1] }) } else { json!({}) };
    (0..depth).map(node).collect()
}

fn data(document: &Value) -> Vec<u8> {
    let uri = document["buffers"][0]["uri"].as_str().unwrap();
    base64::engine::general_purpose::STANDARD.decode(uri.split_once(',').unwrap().1).unwrap()
}

fn set_data(document: &mut Value, bytes: &[u8]) {
    let text = base64::engine::general_purpose::STANDARD.encode(bytes);
    document["buffers"][0]["uri"] = format!("data:;base64,{text}").into();
}

fn set_byte(document: &mut Value, at: usize, byte: u8) {
    let mut bytes = data(document);
    bytes[at] = byte;
    set_data(document, &bytes);
}

pub(crate) fn set_float(document: &mut Value, index: usize, number: f32) {
    let mut bytes = data(document);
    bytes[4 * index..4 * index + 4].copy_from_slice(&number.to_le_bytes());
    set_data(document, &bytes);
}

/// Sparse accessors over nothing: a few bytes of JSON that ask for gigabytes of zeros.
fn zeros_without_end(document: &mut Value) {
    for index in [0, 1] {
        remove(&mut document["accessors"][index], "bufferView");
        document["accessors"][index]["count"] = json!(1_000_000);
    }
}

fn compressed(document: &mut Value) {
    document["extensionsRequired"] = json!(["EXT_meshopt_compression"]);
    document["bufferViews"][1]["extensions"] = json!({ "EXT_meshopt_compression": { "buffer": 0 } });
}

fn many_tracks(document: &mut Value) {
    document["nodes"] = (0..5000).map(|_| json!({})).collect();
    document["skins"] = json!([{ "joints": (0..5000).collect::<Vec<u32>>() }]);
    document["animations"] = (0..1000).map(|_| json!({})).collect();
}

#[test]
fn every_damage_of_the_document_is_told_with_its_place() {
    assert!(read(small().to_string().as_bytes()).is_ok());
    let complaints = DAMAGES.iter().filter_map(|(what, damage, expected)| {
        let mut document = small();
        damage(&mut document);
        complaint(what, document.to_string().as_bytes(), expected)
    });
    assert_eq!(complaints.collect::<Vec<_>>().join("\n"), "");
    assert!(DAMAGES.len() > 60);
}

/// The small document as a GLB.
pub(crate) fn small_glb() -> Vec<u8> {
    let mut document = small();
    let mut bin = data(&document);
    remove(&mut document["buffers"][0], "uri");
    let mut text = document.to_string().into_bytes();
    text.resize(text.len().next_multiple_of(4), b' ');
    bin.resize(bin.len().next_multiple_of(4), 0);
    let mut bytes = b"glTF\x02\0\0\0".to_vec();
    bytes.extend((28 + text.len() as u32 + bin.len() as u32).to_le_bytes());
    for (kind, data) in [(b"JSON", &text), (b"BIN\0", &bin)] {
        bytes.extend((data.len() as u32).to_le_bytes());
        bytes.extend(kind);
        bytes.extend(data);
    }
    bytes
}

#[test]
fn every_damage_of_the_container_is_told_with_its_place() {
    let whole = small_glb();
    assert!(read(&whole).is_ok());
    let with = |at: usize, word: u32| {
        let mut bytes = whole.clone();
        bytes[at..at + 4].copy_from_slice(&word.to_le_bytes());
        bytes
    };
    let json_length = u32::from_le_bytes(whole[12..16].try_into().unwrap());
    let mut complaints = Vec::new();
    let mut fails =
        |what: &str, bytes: &[u8], expected: &str| complaints.extend(complaint(what, bytes, expected));
    fails("empty", b"", "expected the magic bytes `glTF`, found an empty file");
    fails(
        "other magic",
        &with(0, 0x4654_4C68),
        "GLB header: expected the magic bytes `glTF`, found the bytes [68, 4c, 54, 46]",
    );
    fails("cut in the magic", &whole[..3], "GLB header: expected the magic bytes");
    fails("cut in the header", &whole[..10], "GLB header: expected 12 bytes, found 10 bytes");
    fails("cut in a chunk", &whole[..200], "GLB header: expected");
    fails("version 1", &with(4, 1), "GLB header: expected version 2, found version 1");
    fails(
        "longer than it is",
        &with(8, 1_000_000),
        "GLB header: expected 1000000 bytes as its length says, found a file of",
    );
    fails("only a header", &with(8, 12), "GLB chunk 0: expected the JSON chunk, found the end of the file");
    fails(
        "cut in a chunk header",
        &with(8, 16),
        "GLB chunk 0: expected a chunk header of 8 bytes, found 4 bytes",
    );
    fails(
        "chunk beyond the end",
        &with(12, 1_000_000),
        "GLB chunk 0: expected 1000000 bytes as its header says, found",
    );
    fails("chunk of 4 GiB", &with(12, u32::MAX), "GLB chunk 0: expected 4294967295 bytes");
    fails(
        "no JSON first",
        &with(16, 0x004E_4942),
        "GLB chunk 0: expected the JSON chunk, found a chunk of type 0x004e4942",
    );
    fails("JSON chunk too short", &with(12, json_length - 8), "GLB chunk 1: expected");
    fails(
        "no BIN",
        &with(20 + json_length as usize + 4, 0x1111_1111),
        "buffers[0].uri: expected a uri, or to be the first buffer of a GLB with a BIN chunk",
    );
    let mut text = small().to_string().into_bytes();
    text.truncate(100);
    fails("cut JSON", &text, "JSON line 1 column 100: expected valid JSON, found EOF");
    fails("a list", b"  [1]", "expected the magic bytes");
    fails("no UTF-8", b"{\"asset\":\"\xFF\"}", "JSON line 1 column");
    let deep = format!("{{\"asset\":{}", "[".repeat(100_000));
    fails("deep JSON", deep.as_bytes(), "expected valid JSON, found recursion limit exceeded");
    fails(
        "an unknown member",
        br#"{"asset":{"version":"2.0"},"zzz":[1,}"#,
        "JSON line 1 column 37: expected valid JSON",
    );
    fails("two documents", b"{} {}", "JSON line 1 column 4: expected valid JSON, found trailing characters");
    fails(
        "a number beyond all",
        br#"{"asset":{"version":"2.0"},"nodes":[{"children":[1e999]}]}"#,
        "expected a whole number, found 1e+999",
    );
    assert_eq!(complaints.join("\n"), "");
}

/// Random numbers without a library: the low bits of xorshift64* (Vigna 2016) are not used.
pub(crate) struct Dice(u64);

impl Dice {
    /// Any number gives dice of its own.
    pub(crate) fn new(number: u64) -> Self {
        let mut dice = Self(number.wrapping_add(1).wrapping_mul(0x9E37_79B9_7F4A_7C15));
        dice.below(2);
        dice
    }

    pub(crate) fn below(&mut self, bound: usize) -> usize {
        self.0 ^= self.0 >> 12;
        self.0 ^= self.0 << 25;
        self.0 ^= self.0 >> 27;
        (self.0.wrapping_mul(0x2545_F491_4F6C_DD1D) >> 33) as usize % bound
    }
}

/// Changes, removes, doubles or moves a few bytes; half of the time digits alone, which keeps the JSON readable.
fn mutate(bytes: &mut Vec<u8>, dice: &mut Dice) {
    for _ in 0..=dice.below(4) {
        let at = dice.below(bytes.len());
        match dice.below(8) {
            0 => bytes[at] = dice.below(256) as u8,
            1 => {
                bytes.remove(at);
            }
            2 => bytes.insert(at, b"0123456789-.eE{}[],:\"n"[dice.below(22)]),
            3 => bytes.truncate(at.max(1)),
            4..=6 => {
                let digit = bytes[at..].iter().position(u8::is_ascii_digit).map(|offset| at + offset);
                if let Some(digit) = digit {
                    bytes[digit] = b"0123456789"[dice.below(10)];
                }
            }
            _ => {
                let other = dice.below(bytes.len());
                bytes.swap(at, other);
            }
        }
    }
}

#[test]
fn no_damage_of_bytes_makes_it_panic() {
    let text = small().to_string().into_bytes();
    let mut dice = Dice(0x7475_726E);
    let mut n_read = 0;
    for whole in [text, small_glb()] {
        for _ in 0..4000 {
            let mut bytes = whole.clone();
            mutate(&mut bytes, &mut dice);
            let Ok((document, clips)) = read(&bytes) else { continue };
            n_read += 1;
            let unedited: Vec<_> =
                clips.iter().enumerate().map(|(index, clip)| (index, clip, clip)).collect();
            assert!(gltf::write(&document, &unedited, "same").unwrap().bytes == bytes);
            for (index, clip) in clips.iter().enumerate() {
                // Playing, editing and writing what was read must hold too.
                let _ = clip.world_at(clip.duration_secs * 0.4);
                let Some(joint) = (0..clip.joints.len()).find(|&joint| clip.rotation(joint).is_some()) else {
                    continue;
                };
                let track = clip.rotation(joint).unwrap();
                let after =
                    clip.with_rotation(joint, track.with_keys(&[(0, turnwright::rotor::Rotor::IDENTITY)]));
                for form in [gltf::Form::Glb, gltf::Form::Text] {
                    let output = gltf::write_as(&document, &[(index, clip, &after)], "x", form).unwrap();
                    let fetch = |_: &str| output.bin.clone().map(|(_, bytes)| bytes).ok_or_else(String::new);
                    if let Ok((_, again, _)) = gltf::read(&output.bytes, "again", &fetch) {
                        assert_eq!(again.len(), clips.len());
                    }
                }
            }
        }
    }
    assert!(n_read > 500, "{n_read} of 8000 were still readable");
}
