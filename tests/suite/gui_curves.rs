//! Editing on the rotation curves, by pointer and by keyboard; what is asserted is the document and what it plays.

#![expect(clippy::unwrap_used, reason = "helpers of tests fail as tests do")]

use std::ops::{Deref, DerefMut};
use std::path::PathBuf;
use std::sync::Arc;

use egui::{Event, Key, Modifiers, PointerButton, Pos2, Vec2, vec2};
use egui_kittest::kittest::{NodeT as _, Queryable as _};
use glam::DVec3;
use turnwright::app::Start;
use turnwright::app::commands::{Action, Command, CurveAction, CurveCommand, SpaceAction};
use turnwright::app::view_models::{CurveView, KeyChoice, LimitRooms, RoomKey, Stroke, TimeWindow, seconds};
use turnwright::clip::{
    Clip, FrameGrid, JointTracks, KeyChange, KeyEdit, PathKind, RotationTrack, Spacing, Times,
};
use turnwright::exchange::{ClipAddress, disk, gltf};
use turnwright::limit::{Interval, JointLimit, Limits, Range, SwingLimit};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::scene::{Edit, KeysPass, PassStep};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};

use crate::gui_harness::Bench;
use crate::support::shared;

/// A window on one clip of its own.
struct Desk<'a> {
    bench: Bench<'a>,
    _folder: tempfile::TempDir,
}

impl<'a> Deref for Desk<'a> {
    type Target = Bench<'a>;

    fn deref(&self) -> &Bench<'a> {
        &self.bench
    }
}

impl DerefMut for Desk<'_> {
    fn deref_mut(&mut self) -> &mut Self::Target {
        &mut self.bench
    }
}

const ARM: &str = "LeftArm";

/// A trunk with a key each frame (30 a second) and two arms with a key each half second: the left one rises in plane yz to 40° and
/// comes down, the right one hangs.
fn figure() -> Clip {
    let joint = |name: &str, number, parent, place: [f64; 3]| Joint {
        name: name.to_owned(),
        number,
        parent,
        rest: Transform::from_translation(DVec3::from_array(place)),
        kind: JointKind::Joint,
        tips: vec![],
    };
    let joints = vec![
        joint("Trunk", 0, None, [0.0, 1.0, 0.0]),
        joint(ARM, 1, Some(0), [0.3, 0.4, 0.0]),
        joint("LeftHand", 2, Some(1), [0.5, 0.0, 0.0]),
        joint("RightArm", 3, Some(0), [-0.3, 0.4, 0.0]),
        joint("RightHand", 4, Some(3), [-0.5, 0.0, 0.0]),
    ];
    let turn = |degrees: [f64; 3]| Rotor::from_plane_angles(Bivector::from_degrees(degrees));
    let track = |times: Vec<f64>, turns: Vec<[f64; 3]>| JointTracks {
        rotation: Some(RotationTrack::from_rotors(
            Times::Listed(times.into()),
            turns.into_iter().map(turn).collect::<Vec<_>>(),
        )),
        ..JointTracks::default()
    };
    let frames: Vec<f64> = (0..=60).map(|frame| f64::from(frame) / 30.0).collect();
    let sway = frames.iter().map(|secs| [0.0, 10.0 * (secs * 3.0).sin(), 0.0]).collect();
    let halves: Vec<f64> = (0..=4).map(|half| f64::from(half) / 2.0).collect();
    let rise = [0.0, 20.0, 40.0, 20.0, 0.0].map(|degrees| [degrees, 0.0, 0.0]).to_vec();
    let joints_tracks = vec![
        track(frames, sway),
        track(halves.clone(), rise),
        JointTracks::default(),
        track(halves, vec![[0.0; 3]; 5]),
        JointTracks::default(),
    ];
    Clip {
        name: "rise".to_owned(),
        skeleton: Arc::new(Skeleton::new(joints).unwrap()),
        joints: joints_tracks.into_iter().map(Arc::new).collect(),
        grid: FrameGrid::even(30.0, 2.0),
        duration_secs: 2.0,
    }
}

impl Desk<'_> {
    /// The figure, its left arm chosen.
    fn new() -> Self {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("rise.glb");
        disk::write(&path, &gltf::from_clip(&figure(), "rise").unwrap().bytes).unwrap();
        let mut desk = Self::open(path, folder);
        desk.choose(ARM);
        desk
    }

    fn open(path: PathBuf, folder: tempfile::TempDir) -> Self {
        Self::of_size(path, folder, [1440.0, 900.0])
    }

    fn of_size(path: PathBuf, folder: tempfile::TempDir, size: [f32; 2]) -> Self {
        let start = Start::Files(vec![ClipAddress { path, clip: None }]);
        Self { bench: Bench::of_size(start, size), _folder: folder }
    }

    fn act(&mut self, action: CurveAction) {
        self.ask(Command::Do(Action::Curve(action)));
    }

    fn joint(&self, name: &str) -> usize {
        let clip = self.window().bench().result().unwrap();
        clip.skeleton.find(name).unwrap_or_else(|| panic!("a joint {name}"))
    }

    fn choose(&mut self, name: &str) {
        let joint = self.joint(name);
        self.ask(Command::ChooseJoint(Some(joint)));
    }

    fn track(&self, name: &str) -> RotationTrack {
        let joint = self.joint(name);
        self.window().bench().result().unwrap().rotation(joint).unwrap().clone()
    }

    fn times(&self, name: &str) -> Vec<f64> {
        self.track(name).times.iter().map(|secs| (secs * 1e4).round() / 1e4).collect()
    }

    /// Plane angles in degrees.
    fn degrees(&self, name: &str, secs: f64) -> [f64; 3] {
        self.track(name).at(secs).plane_angles().to_degrees()
    }

    fn chosen(&self) -> usize {
        self.window().bench().session.curves.keys.len()
    }

    /// Where a key's pip is.
    #[track_caller]
    fn pip(&self, joint: &str, secs: f64, line: &str) -> Pos2 {
        let label = format!("Key of {joint} at {}, {line}", seconds(secs));
        self.bench.0.get_by_label(&label).rect().center()
    }

    /// A drag with stops on the way, so that it is seen while it lasts; `midway` looks at the window before it is let go.
    fn drag(&mut self, from: Pos2, by: Vec2, modifiers: Modifiers, midway: impl FnOnce(&mut Self)) {
        self.hold(modifiers);
        let button =
            |pos, pressed| Event::PointerButton { pos, button: PointerButton::Primary, pressed, modifiers };
        self.bench.0.hover_at(from);
        self.bench.0.step();
        self.bench.0.event(button(from, true));
        self.bench.0.step();
        for share in [0.25, 0.5, 1.0] {
            self.bench.0.hover_at(from + by * share);
            self.bench.0.step();
        }
        self.bench.0.run_steps(2);
        midway(self);
        self.bench.0.event(button(from + by, false));
        self.bench.0.step();
        self.hold(Modifiers::NONE);
        self.run();
    }

    /// Points on screen for a degree, and for a second.
    fn scale(&self) -> Vec2 {
        let [low, high] = [self.pip(ARM, 0.0, "yz"), self.pip(ARM, 1.0, "yz")];
        vec2(high.x - low.x, (high.y - low.y) / 40.0)
    }

    fn click_at(&mut self, at: Pos2, modifiers: Modifiers) {
        self.drag(at, Vec2::ZERO, modifiers, |_| {});
    }
}

#[track_caller]
fn assert_near(found: f64, expected: f64, within: f64) {
    assert!((found - expected).abs() <= within, "expected {expected} within {within}, found {found}");
}

#[test]
fn a_key_is_dragged_in_value_as_one_step_and_shows_while_it_goes() {
    let mut desk = Desk::new();
    let (at, up) = (desk.pip(ARM, 1.0, "yz"), desk.scale().y * 10.0);
    let before = desk.steps();
    desk.drag(at, vec2(0.0, up), Modifiers::NONE, |desk| {
        assert!(desk.passes().is_empty() && desk.steps() == before, "nothing is recorded yet");
        assert_near(desk.degrees(ARM, 1.0)[0], 50.0, 0.3);
        let shown = desk.window().bench().curve_hand.shown.as_ref().expect("drawn at once");
        assert_eq!(shown.locals.len(), 1);
        assert_near(shown.locals[0].value(0, 1.0).unwrap(), 50.0, 0.3);
    });
    assert_eq!(desk.steps(), before + 1);
    assert!(
        matches!(desk.passes().as_slice(), [PassStep::Keys(keys)] if keys.edits.len() == 1),
        "{:?}",
        desk.passes()
    );
    let [yz, zx, xy] = desk.degrees(ARM, 1.0);
    assert_near(yz, 50.0, 0.3);
    assert!(zx.abs() < 1e-6 && xy.abs() < 1e-6, "one number moves alone: {zx} {xy}");
    assert_near(desk.degrees(ARM, 0.5)[0], 20.0, 1e-4);
    desk.press(Modifiers::COMMAND, Key::Z);
    assert_near(desk.degrees(ARM, 1.0)[0], 40.0, 1e-4);
    let label = desk.window().bench().project.as_ref().unwrap().history.redo_label().unwrap().to_owned();
    assert!(label.starts_with("Turn 1 key by +"), "{label}");
}

#[test]
fn keys_are_dragged_in_time_onto_frames_and_finely_with_shift() {
    let mut desk = Desk::new();
    let (at, second) = (desk.pip(ARM, 1.0, "yz"), desk.scale().x);
    desk.drag(at, vec2(second * 0.21, 0.0), Modifiers::NONE, |_| {});
    assert_eq!(desk.times(ARM), [0.0, 0.5, 1.2, 1.5, 2.0], "six frames of a thirtieth");
    assert_near(desk.degrees(ARM, 1.2)[0], 40.0, 1e-4);
    // Without snapping, and a tenth of the way.
    desk.act(CurveAction::Snap);
    let at = desk.pip(ARM, 1.2, "yz");
    desk.drag(at, vec2(second * 0.5, 0.0), Modifiers::SHIFT, |_| {});
    assert_near(desk.times(ARM)[2], 1.25, 0.004);
    // Both are one edit of one pass: the key that was moved goes on.
    let passes = desk.passes();
    let [PassStep::Keys(keys)] = passes.as_slice() else { panic!("one pass of keys") };
    assert_eq!(keys.edits.len(), 1, "{keys:?}");
}

#[test]
fn escape_gives_a_drag_up() {
    let mut desk = Desk::new();
    let (at, steps) = (desk.pip(ARM, 1.0, "yz"), desk.steps());
    desk.drag(at, vec2(0.0, -60.0), Modifiers::NONE, |desk| desk.press(Modifiers::NONE, Key::Escape));
    assert_eq!((desk.steps(), desk.passes().len()), (steps, 0));
    assert_near(desk.degrees(ARM, 1.0)[0], 40.0, 1e-4);
}

#[test]
fn keys_are_chosen_by_click_shift_box_lane_and_keyboard() {
    let mut desk = Desk::new();
    desk.click_at(desk.pip(ARM, 0.5, "yz"), Modifiers::NONE);
    assert_eq!(desk.chosen(), 1);
    desk.click_at(desk.pip(ARM, 1.5, "yz"), Modifiers::SHIFT);
    assert_eq!(desk.chosen(), 2);
    desk.click_at(desk.pip(ARM, 0.5, "yz"), Modifiers::SHIFT);
    let choice = desk.window().bench().session.curves.keys.clone();
    assert_eq!(choice.times(desk.joint(ARM)), [1.5]);
    // A box over the two keys in the middle of the rise.
    let (from, to) = (desk.pip(ARM, 0.5, "yz"), desk.pip(ARM, 1.0, "yz"));
    let corner = from + vec2(-20.0, 12.0);
    desk.drag(corner, to + vec2(20.0, -12.0) - corner, Modifiers::COMMAND, |_| {});
    let choice = desk.window().bench().session.curves.keys.clone();
    assert_eq!(choice.times(desk.joint(ARM)), [0.5, 1.0]);
    // Along the lane below: all keys of a stretch of time.
    let chart = desk.bench.0.get_by_label("Rotation curves chart").rect();
    let lane = Pos2::new(to.x - 20.0, chart.bottom() - 6.0);
    desk.act(CurveAction::ChooseNone);
    desk.drag(lane, vec2(desk.scale().x * 0.7, 0.0), Modifiers::NONE, |_| {});
    let choice = desk.window().bench().session.curves.keys.clone();
    assert_eq!(choice.times(desk.joint(ARM)), [1.0, 1.5]);
    desk.press(Modifiers::COMMAND, Key::A);
    assert_eq!(desk.chosen(), 5);
    desk.press(Modifiers::COMMAND | Modifiers::SHIFT, Key::A);
    assert_eq!(desk.chosen(), 0);
    desk.ask(Command::Scrub(1.0));
    desk.press(Modifiers::ALT, Key::Insert);
    assert_eq!(desk.chosen(), 1);
}

#[test]
fn keys_are_added_and_deleted_by_the_keyboard() {
    let mut desk = Desk::new();
    desk.ask(Command::Scrub(0.8));
    let before: Vec<Rotor> = (0..=40).map(|i| desk.track(ARM).at(f64::from(i) / 20.0)).collect();
    desk.press(Modifiers::NONE, Key::Insert);
    assert_eq!(desk.times(ARM), [0.0, 0.5, 0.8, 1.0, 1.5, 2.0]);
    for (i, before) in before.iter().enumerate() {
        let after = desk.track(ARM).at(i as f64 / 20.0);
        assert!(before.turn_to(after) < 1e-6, "a new key keeps the curve at {i}");
    }
    assert_eq!(desk.chosen(), 1, "the new key is chosen");
    desk.press(Modifiers::NONE, Key::Delete);
    assert_eq!(desk.times(ARM), [0.0, 0.5, 1.0, 1.5, 2.0]);
    assert_eq!(desk.steps(), 2);
}

#[test]
fn keys_are_copied_pasted_and_pasted_mirrored() {
    let mut desk = Desk::new();
    let joint = desk.joint(ARM);
    let mut keys = KeyChoice::default();
    keys.add(joint, [0.5, 1.0]);
    desk.ask(Command::Curve(CurveCommand::Choose(keys)));
    desk.press(Modifiers::COMMAND, Key::C);
    desk.ask(Command::Scrub(1.6));
    desk.press(Modifiers::COMMAND, Key::V);
    assert_eq!(desk.times(ARM), [0.0, 0.5, 1.0, 1.5, 1.6, 2.0, 2.1]);
    assert_near(desk.degrees(ARM, 1.6)[0], 20.0, 1e-4);
    assert_near(desk.degrees(ARM, 2.1)[0], 40.0, 1e-4);
    desk.press(Modifiers::COMMAND, Key::Z);
    // The desktop's own event for pasting, as a real window sends it, with Shift held: the other side.
    desk.ask(Command::Scrub(0.5));
    desk.hold(Modifiers::COMMAND | Modifiers::SHIFT);
    desk.bench.0.event(Event::Paste(String::new()));
    desk.bench.0.step();
    desk.hold(Modifiers::NONE);
    desk.run();
    // A turn within plane yz, square to the way across, is its own mirror image.
    assert_near(desk.degrees("RightArm", 1.0)[0], 40.0, 1e-4);
    assert_near(desk.degrees(ARM, 1.0)[0], 40.0, 1e-4);
    assert_eq!(desk.window().bench().session.joint, Some(desk.joint("RightArm")), "what was pasted is shown");
}

#[test]
fn keys_of_the_loop_are_chosen_cut_and_put_down_elsewhere() {
    let mut desk = Desk::new();
    for (secs, key) in [(0.4, Key::OpenBracket), (1.1, Key::CloseBracket)] {
        desk.ask(Command::Scrub(secs));
        desk.press(Modifiers::COMMAND, key);
    }
    desk.press(Modifiers::COMMAND | Modifiers::ALT, Key::A);
    let joint = desk.joint(ARM);
    assert_eq!(desk.window().bench().session.curves.keys.times(joint).len(), 2, "those at 0.5 and 1 s");
    let steps = desk.steps();
    // The desktop's own event for cutting.
    desk.hold(Modifiers::COMMAND);
    desk.bench.0.event(Event::Cut);
    desk.bench.0.step();
    desk.hold(Modifiers::NONE);
    desk.run();
    assert_eq!((desk.times(ARM), desk.steps()), (vec![0.0, 1.5, 2.0], steps + 1));
    desk.ask(Command::Scrub(0.8));
    desk.press(Modifiers::COMMAND, Key::V);
    assert_eq!(desk.times(ARM), [0.0, 0.8, 1.3, 1.5, 2.0]);
    assert_near(desk.degrees(ARM, 0.8)[0], 20.0, 1e-4);
    assert_near(desk.degrees(ARM, 1.3)[0], 40.0, 1e-4);
    desk.undo();
    desk.undo();
    assert_eq!(desk.times(ARM), [0.0, 0.5, 1.0, 1.5, 2.0]);
}

#[test]
fn a_turn_out_of_its_plane_is_mirrored_the_other_way_round() {
    let mut desk = Desk::new();
    desk.ask(Command::Scrub(1.0));
    desk.act(CurveAction::NextLine);
    for _ in 0..9 {
        desk.press(Modifiers::COMMAND | Modifiers::ALT, Key::ArrowUp);
    }
    // Nothing was chosen: the keys pushed softly. Undone, with the key chosen they turn it.
    assert!(matches!(desk.passes().as_slice(), [PassStep::Push(pass)] if pass.pushes.len() == 1));
    assert_near(desk.degrees(ARM, 1.0)[1], 9.0, 1e-3);
    assert_eq!(desk.steps(), 1, "one run of the same key is one step");
    desk.press(Modifiers::COMMAND, Key::Z);
    desk.act(CurveAction::ChooseHere);
    for _ in 0..9 {
        desk.press(Modifiers::COMMAND | Modifiers::ALT, Key::ArrowUp);
    }
    assert_eq!(desk.steps(), 1);
    assert_near(desk.degrees(ARM, 1.0)[1], 9.0, 1e-4);
    desk.press(Modifiers::COMMAND, Key::C);
    desk.act(CurveAction::PasteMirrored);
    let [yz, zx, _] = desk.degrees("RightArm", 1.0);
    assert_near(yz, 40.0, 1e-3);
    assert_near(zx, -9.0, 1e-3);
}

#[test]
fn keys_are_shifted_and_scaled_in_time_by_bracket_keyboard_and_number() {
    let mut desk = Desk::new();
    let joint = desk.joint(ARM);
    let mut keys = KeyChoice::default();
    keys.add(joint, [0.5, 1.0]);
    desk.ask(Command::Curve(CurveCommand::Choose(keys)));
    let bracket = desk.bench.0.get_by_label_contains("Last chosen key").rect().center();
    desk.drag(bracket, vec2(desk.scale().x * 0.3, 0.0), Modifiers::NONE, |_| {});
    assert_eq!(desk.times(ARM), [0.0, 0.5, 1.3, 1.5, 2.0]);
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::ArrowLeft);
    assert_near(desk.times(ARM)[2], 1.3 - 1.0 / 30.0, 1e-3);
    desk.press(Modifiers::COMMAND | Modifiers::ALT, Key::ArrowLeft);
    desk.press(Modifiers::COMMAND | Modifiers::ALT, Key::ArrowLeft);
    assert_near(desk.times(ARM)[1], 0.5 - 2.0 / 30.0, 1e-3);
    let steps = desk.steps();
    // Typed: a tenth of a second later.
    desk.bench.0.get_by_label("Shift keys by").click();
    desk.run();
    let field = desk.bench.0.get_by_label("Shift keys by");
    field.type_text("0.1");
    desk.run();
    desk.press(Modifiers::NONE, Key::Enter);
    assert_eq!(desk.steps(), steps + 1);
    assert_near(desk.times(ARM)[1], 0.6 - 2.0 / 30.0, 1e-3);
}

#[test]
fn the_numbers_of_a_key_are_typed() {
    let mut desk = Desk::new();
    desk.click_at(desk.pip(ARM, 1.0, "yz"), Modifiers::NONE);
    for (label, text) in [("Key zx", "12.5"), ("Key time", "1.1")] {
        desk.bench.0.get_by_label(label).click();
        desk.run();
        desk.press(Modifiers::COMMAND, Key::A);
        desk.bench.0.get_by_label(label).type_text(text);
        desk.run();
        desk.press(Modifiers::NONE, Key::Enter);
    }
    assert_eq!(desk.times(ARM), [0.0, 0.5, 1.1, 1.5, 2.0]);
    let [yz, zx, xy] = desk.degrees(ARM, 1.1);
    assert_near(yz, 40.0, 1e-3);
    assert_near(zx, 12.5, 1e-3);
    assert_near(xy, 0.0, 1e-3);
}

#[test]
fn several_joints_are_edited_at_once() {
    let mut desk = Desk::new();
    let node = desk.bench.0.get_by_label("Map row RightArm");
    node.click_modifiers(Modifiers::SHIFT);
    desk.run();
    let (left, right) = (desk.joint(ARM), desk.joint("RightArm"));
    assert_eq!(desk.window().bench().session.joints(), [left, right]);
    assert_eq!(desk.window().bench().curve_sets().len(), 2);
    let mut keys = KeyChoice::default();
    keys.add(left, [0.5]);
    keys.add(right, [0.5]);
    desk.ask(Command::Curve(CurveCommand::Choose(keys)));
    let (at, up) = (desk.pip(ARM, 0.5, "yz"), desk.scale().y * 15.0);
    desk.drag(at, vec2(0.0, up), Modifiers::NONE, |_| {});
    assert_eq!(desk.steps(), 1);
    assert_near(desk.degrees(ARM, 0.5)[0], 35.0, 0.4);
    assert_near(desk.degrees("RightArm", 0.5)[0], 15.0, 0.4);
    // A plain click chooses one alone again.
    desk.bench.0.get_by_label("Map row RightArm").click();
    desk.run();
    assert_eq!(desk.window().bench().session.joints(), [right]);
    desk.press(Modifiers::COMMAND | Modifiers::SHIFT, Key::ArrowUp);
    assert_eq!(desk.window().bench().session.joints().len(), 2);
}

#[test]
fn a_segment_gets_path_spacing_and_turns() {
    let mut desk = Desk::new();
    // A click on the curve between two keys.
    let middle = desk.pip(ARM, 0.5, "yz").lerp(desk.pip(ARM, 1.0, "yz"), 0.4);
    desk.click_at(middle, Modifiers::NONE);
    let joint = desk.joint(ARM);
    assert_eq!(desk.window().bench().session.curves.segment, Some((joint, 0.5)));
    let segment = |desk: &Desk<'_>| {
        let track = desk.track(ARM);
        (track.kind_of(1, None), track.segments.of(1).spacing, track.segments.of(1).turn.whole())
    };
    for (key, kind) in [
        (Key::H, PathKind::Hold),
        (Key::Q, PathKind::Squad),
        (Key::P, PathKind::Spline),
        (Key::B, PathKind::BSpline),
        (Key::S, PathKind::Slerp),
    ] {
        desk.press(Modifiers::ALT | Modifiers::SHIFT, key);
        assert_eq!(segment(&desk).0, kind);
        assert_eq!(desk.track(ARM).kind_of(0, None), PathKind::Slerp, "the others stay");
    }
    for (key, spacing) in [
        (Key::I, Spacing::EaseIn),
        (Key::O, Spacing::EaseOut),
        (Key::U, Spacing::EaseBoth),
        (Key::E, Spacing::Even),
    ] {
        desk.press(Modifiers::ALT | Modifiers::SHIFT, key);
        assert_eq!(segment(&desk).1, spacing);
    }
    desk.bench.0.get_by_label("One turn more").click();
    desk.run();
    assert_eq!(segment(&desk).2, 1);
    // 380° in half a second; the bar says so.
    assert_near(desk.track(ARM).highest_rate(1).rate_rad.to_degrees(), 760.0, 0.1);
    desk.bench.0.get_by_label_contains("at most 760°/s");
    desk.bench.0.get_by_label("Go the other way round").click();
    desk.run();
    assert_eq!(segment(&desk).2, -2, "as many whole turns and one, less the short way, the other way");
    assert_near(desk.track(ARM).highest_rate(1).rate_rad.to_degrees(), 2.0 * 700.0, 0.1);
    desk.bench.0.get_by_label("Go the other way round").click();
    desk.run();
    desk.bench.0.get_by_label("One turn less").click();
    desk.run();
    assert_eq!(segment(&desk).2, 0);
}

#[test]
fn own_handles_of_a_spacing_are_dragged_and_moved_by_arrows() {
    let mut desk = Desk::new();
    desk.ask(Command::Scrub(0.7));
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::Insert);
    let steps = desk.steps();
    let handle = desk.bench.0.get_by_label_contains("Spacing handle 1").rect().center();
    desk.drag(handle, vec2(25.0, 12.0), Modifiers::NONE, |desk| assert_eq!(desk.steps(), steps));
    assert_eq!(desk.steps(), steps + 1);
    let spacing = |desk: &Desk<'_>| desk.track(ARM).segments.of(1).spacing;
    let Spacing::Own(handles) = spacing(&desk) else { panic!("{:?}", spacing(&desk)) };
    assert!(handles.points()[0][0] > 0.4 && handles.points()[0][1] < 0.3, "{handles:?}");
    // The orientations are the same, only their moments differ.
    let (start, end) = (desk.track(ARM).at(0.5), desk.track(ARM).at(1.0));
    let early = desk.track(ARM).at(0.6);
    assert!(start.turn_to(early) < 0.2 * start.turn_to(end) && start.turn_to(early) > 0.0);
    desk.bench.0.get_by_label_contains("Spacing handle 2").focus();
    desk.run();
    desk.press(Modifiers::NONE, Key::ArrowDown);
    let Spacing::Own(moved) = spacing(&desk) else { panic!("{:?}", spacing(&desk)) };
    assert!(moved.points()[1][1] < handles.points()[1][1], "{moved:?}");
}

#[test]
fn a_captured_curve_is_pushed_softly_and_the_source_stays() {
    let mut desk = Desk::new();
    desk.choose("Trunk");
    desk.ask(Command::Curve(CurveCommand::SetFalloff(0.3)));
    let source = desk.window().bench().source().unwrap().clone();
    let window = TimeWindow { start_secs: 0.0, end_secs: 2.0 };
    desk.ask(Command::ShowTime(window));
    desk.ask(Command::Curve(CurveCommand::ShowValues(Some([-40.0, 40.0]))));
    let chart = desk.bench.0.get_by_label("Rotation curves chart").rect();
    let set = desk.window().bench().curve_sets()[0].clone();
    // The plot: left the gutter, below the lane and a little air.
    let (left, right, top, bottom) =
        (chart.left() + 132.0, chart.right() - 14.0, chart.top() + 8.0, chart.bottom() - 20.0);
    let (secs, before) = (1.0, set.shown_at(1.0).unwrap()[1]);
    let at =
        Pos2::new(left + (right - left) * 0.5, bottom - (bottom - top) * ((before + 40.0) / 80.0) as f32);
    let up = (bottom - top) * 12.0 / 80.0;
    let steps = desk.steps();
    desk.drag(at, vec2(1.0, -up), Modifiers::NONE, |desk| {
        assert_eq!(desk.steps(), steps);
        assert_near(desk.degrees("Trunk", secs)[1], before + 12.0, 0.3);
        // Wider while it is held.
        desk.ask(Command::Curve(CurveCommand::SetFalloff(0.5)));
    });
    assert_eq!(desk.steps(), steps + 1);
    let passes = desk.passes();
    let [PassStep::Push(pass)] = passes.as_slice() else { panic!("one pass of pushes") };
    let push = pass.pushes[0];
    assert_near(push.center_secs, secs, 1.0 / 60.0);
    assert_near(push.reach_secs, 0.5, 1e-9);
    assert_near(desk.degrees("Trunk", secs)[1], before + 12.0, 0.3);
    let at_first = |secs: f64| source.rotation(desk.joint("Trunk")).unwrap().at(secs);
    for secs in [0.0, 0.4, 1.6, 2.0] {
        assert!(at_first(secs).turn_to(desk.track("Trunk").at(secs)) < 1e-9, "outside its reach at {secs}");
    }
    // Halfway to its end a cubic B-spline has a quarter of its height (de Boor 1978).
    let half = at_first(1.25).turn_to(desk.track("Trunk").at(1.25)).to_degrees();
    assert_near(half, 12.0 / 4.0, 0.25);
    assert!(Arc::ptr_eq(&source, desk.window().bench().source().unwrap()));
}

/// What lies under the hand stays there, however many frames the way takes, and while it is held still.
#[test]
fn values_are_panned_by_as_much_as_the_hand_moves() {
    let mut desk = Desk::new();
    desk.choose("Trunk");
    let shown = [-40.0, 40.0];
    desk.ask(Command::Curve(CurveCommand::ShowValues(Some(shown))));
    let chart = desk.bench.0.get_by_label("Rotation curves chart").rect();
    let per_point = (shown[1] - shown[0]) / f64::from(chart.height() - 28.0);
    let from = Pos2::new(chart.left() + 100.0, chart.center().y);
    desk.drag(from, vec2(0.0, 20.0), Modifiers::NONE, |_| ());
    let panned = desk.window().bench().session.curves.values.expect("values that were set by hand");
    for (before, after) in shown.iter().zip(panned) {
        assert_near(after, before + 20.0 * per_point, 0.1 * 20.0 * per_point);
    }
}

#[test]
fn the_reach_of_a_push_is_set_by_wheel_and_menu() {
    let mut desk = Desk::new();
    desk.choose("Trunk");
    let reach = |desk: &Desk<'_>| desk.window().bench().session.falloff_secs;
    desk.ask(Command::Curve(CurveCommand::SetFalloff(0.3)));
    let window = desk.window().bench().session.window;
    let chart = desk.bench.0.get_by_label("Rotation curves chart").rect();
    desk.bench.0.hover_at(chart.center());
    desk.hold(Modifiers::ALT);
    desk.bench.0.event(Event::MouseWheel {
        unit: egui::MouseWheelUnit::Point,
        delta: vec2(0.0, 60.0),
        phase: egui::TouchPhase::Move,
        source: egui::MouseWheelSource::Wheel,
        modifiers: Modifiers::ALT,
    });
    desk.bench.0.run_steps(20);
    desk.hold(Modifiers::NONE);
    assert!(reach(&desk) > 0.33, "{}", reach(&desk));
    assert_eq!(desk.window().bench().session.window, window, "time is not zoomed");
    let before = reach(&desk);
    desk.ask(Command::Do(Action::Space(SpaceAction::LongerFalloff)));
    let longer = reach(&desk);
    assert!(longer > before, "{longer}");
    desk.ask(Command::Do(Action::Space(SpaceAction::ShorterFalloff)));
    assert!(reach(&desk) < longer, "{}", reach(&desk));
    // A push by the keyboard takes it.
    desk.ask(Command::Scrub(1.0));
    desk.press(Modifiers::COMMAND | Modifiers::ALT, Key::ArrowUp);
    let passes = desk.passes();
    let [PassStep::Push(pass)] = passes.as_slice() else { panic!("{passes:?}") };
    assert_near(pass.pushes[0].reach_secs, reach(&desk), 1e-9);
}

#[test]
fn a_range_is_smoothed_and_reduced_as_passes_on_the_chosen_joints() {
    let mut desk = Desk::new();
    desk.choose("Trunk");
    let joint = desk.joint("Trunk");
    desk.ask(Command::SetLoopRange(Some((0.5, 1.5))));
    desk.press(Modifiers::ALT, Key::S);
    desk.bench.0.get_by_label("Reduce keys of range").click();
    desk.run();
    let passes = desk.passes();
    let [PassStep::Smooth(smooth), PassStep::Reduce(reduce)] = passes.as_slice() else {
        panic!("two passes")
    };
    for scope in [&smooth.scope, &reduce.scope] {
        assert_eq!((scope.joints.as_deref(), scope.span_secs), (Some(&[joint][..]), Some([0.5, 1.5])));
    }
    let times = desk.times("Trunk");
    let inside = times.iter().filter(|secs| (0.5..=1.5).contains(*secs)).count();
    assert!(inside < 20 && times.len() - inside >= 30, "{inside} of {}", times.len());
    // With keys chosen these say where.
    let mut keys = KeyChoice::default();
    keys.add(joint, [0.1, 0.2, 0.4]);
    desk.ask(Command::Curve(CurveCommand::Choose(keys)));
    desk.act(CurveAction::Smooth);
    let passes = desk.passes();
    // It goes where it belongs: before the pass that takes keys out.
    let Some(PassStep::Smooth(third)) = passes.get(1) else { panic!("{passes:?}") };
    assert_eq!(third.scope.span_secs, Some([0.1, 0.4]));
}

#[test]
fn twist_is_moved_alone_and_limits_are_bands() {
    let mut desk = Desk::new();
    let joint = desk.joint(ARM);
    let range =
        Range { swing: SwingLimit::Cone { half_rad: 0.5 }, twist: Interval::from_degrees(-30.0, 20.0) };
    let limit = JointLimit::new(Rotor::IDENTITY, DVec3::X, DVec3::Z, range);
    let limits = Limits { title: "test".to_owned(), joints: [(joint, limit)].into() };
    desk.ask(Command::Edit(Edit::SetLimits { work: 0, limits: Some(Arc::new(limits)) }));
    desk.ask(Command::Do(Action::SwingTwist));
    let sets = desk.window().bench().curve_sets();
    assert_eq!(sets[0].view, CurveView::SwingTwist);
    assert_eq!(sets[0].bands.len(), 2);
    assert_eq!(sets[0].bands[1].low.map(f64::round), Some(-30.0));
    // The arm points along x, so a turn in yz is all twist.
    assert_near(sets[0].shown_at(1.0).unwrap()[1], 40.0, 1e-3);
    let pip = desk.pip(ARM, 1.0, "twist");
    desk.drag(pip, vec2(0.0, 30.0), Modifiers::NONE, |_| {});
    let after = desk.window().bench().curve_sets()[0].shown_at(1.0).unwrap();
    assert!(after[1] < 39.0 && after[0].abs() < 1e-3, "{after:?}");
    let [_, zx, xy] = desk.degrees(ARM, 1.0);
    assert!(zx.abs() < 1e-6 && xy.abs() < 1e-6);
}

#[test]
fn values_are_zoomed_moved_and_fitted() {
    let mut desk = Desk::new();
    let values = |desk: &Desk<'_>| desk.window().bench().session.curves.values;
    assert_eq!(values(&desk), None);
    desk.press(Modifiers::ALT, Key::PageUp);
    let [low, high] = values(&desk).unwrap();
    assert_near(high - low, 40.0 * 1.12 / 2.0, 0.5);
    desk.press(Modifiers::COMMAND, Key::PageUp);
    assert!(values(&desk).unwrap()[0] > low);
    desk.press(Modifiers::ALT, Key::V);
    assert_eq!(values(&desk), None);
    let chart = desk.bench.0.get_by_label("Rotation curves chart").rect();
    desk.drag(chart.left_center() + vec2(60.0, 0.0), vec2(0.0, 20.0), Modifiers::NONE, |_| {});
    assert!(values(&desk).unwrap()[1] > 42.4, "{:?}", values(&desk));
}

#[test]
fn keys_of_a_file_with_rows_stay_rows_and_can_be_edited_again() {
    let Some(path) = shared("data/bvh/cmu_02_01_walk.bvh") else { return };
    let mut desk = Desk::open(path, tempfile::tempdir().unwrap());
    let clip = desk.window().bench().source().unwrap().clone();
    let joint = clip.skeleton.listed().find(|&joint| clip.rotation(joint).is_some()).unwrap();
    let name = clip.skeleton.label(joint).to_owned();
    desk.choose(&name);
    let (grid, count) = (clip.grid.clone(), clip.grid.count());
    let mut keys = KeyChoice::default();
    keys.add(joint, (100..110).map(|frame| grid.time(frame)));
    desk.ask(Command::Curve(CurveCommand::Choose(keys.clone())));
    desk.act(CurveAction::Delete);
    assert_eq!(desk.times(&name).len(), count, "rows stay");
    let (from, to) = (grid.time(99), grid.time(110));
    let middle = desk.track(&name).at(f64::midpoint(from, to));
    let straight = turnwright::rotor::slerp(desk.track(&name).at(from), desk.track(&name).at(to), 0.5);
    assert!(middle.turn_to(straight) < 1e-3, "the way between is straight");
    // The rows are there again, and can be turned: by a pass of their own.
    desk.ask(Command::Curve(CurveCommand::Choose(keys)));
    let before = desk.track(&name).at(grid.time(105));
    desk.act(CurveAction::Up);
    assert_eq!(desk.passes().len(), 2);
    let turned = before.turn_to(desk.track(&name).at(grid.time(105))).to_degrees();
    assert!(turned > 0.2, "turned by {turned}°");
    assert!(desk.bench.0.get_by_label("Rotation curves chart").accesskit_node().label().is_some());
}

#[test]
fn the_chart_tells_the_numbers_under_the_pointer() {
    let mut desk = Desk::new();
    let told = |desk: &mut Desk<'_>| -> Vec<String> {
        let at = desk.pip(ARM, 1.0, "yz");
        desk.bench.0.hover_at(at);
        desk.run();
        let value = desk.bench.0.get_by_label("Rotation curves chart").accesskit_node().value();
        let lines = value.expect("it has a value while the pointer is there");
        lines.split(", ").map(|line| line.split_whitespace().collect::<Vec<_>>().join(" ")).collect()
    };
    assert_eq!(told(&mut desk), ["1.000 s frame 30", "yz 40.00°", "zx 0.00°", "xy 0.00°"]);
    let mut keys = KeyChoice::default();
    keys.add(desk.joint(ARM), [1.0]);
    desk.ask(Command::Curve(CurveCommand::Choose(keys)));
    desk.press(Modifiers::COMMAND | Modifiers::ALT, Key::ArrowUp);
    assert_eq!(told(&mut desk)[1], "yz 41.00° was 40.00°");
}

#[test]
fn the_four_views_show_what_they_say() {
    let mut desk = Desk::new();
    let shown = |desk: &Desk<'_>, secs: f64| {
        let set = desk.window().bench().curve_sets()[0].clone();
        (
            set.view,
            set.shown_at(secs).unwrap(),
            set.lines.iter().map(|line| line.name.clone()).collect::<Vec<_>>(),
        )
    };
    desk.press(Modifiers::ALT, Key::Num2);
    let (view, [swing, twist, _], _) = shown(&desk, 1.0);
    // The arm points along x, and turns in plane yz.
    assert_eq!(view, CurveView::SwingTwist);
    assert!(swing.abs() < 1e-3 && (twist - 40.0).abs() < 1e-3, "{swing} {twist}");
    desk.press(Modifiers::ALT, Key::Num3);
    let (view, [s, yz, _], names) = shown(&desk, 1.0);
    assert_eq!((view, names.join(" ").as_str()), (CurveView::FileNumbers, "s yz zx xy"));
    let half = 20.0_f64.to_radians();
    assert!((s - half.cos()).abs() < 1e-6 && (yz.abs() - half.sin()).abs() < 1e-6, "{s} {yz}");
    desk.press(Modifiers::ALT, Key::Num4);
    let (view, [rate, ..], _) = shown(&desk, 0.25);
    assert_eq!(view, CurveView::TurnRate);
    assert_near(rate, 40.0, 0.1);
    desk.press(Modifiers::ALT, Key::Num1);
    let (view, [yz, zx, xy], names) = shown(&desk, 1.0);
    assert_eq!((view, names.join(" ").as_str()), (CurveView::PlaneAngles, "yz zx xy"));
    assert!((yz - 40.0).abs() < 1e-3 && zx.abs() < 1e-3 && xy.abs() < 1e-3);
}

/// The choice of all keys of a joint between two times.
fn keys_between(desk: &Desk<'_>, name: &str, from: f64, to: f64) -> KeyChoice {
    let mut keys = KeyChoice::default();
    let within = |secs: &f64| (from - 1e-6..=to + 1e-6).contains(secs);
    keys.add(desk.joint(name), desk.track(name).times.iter().filter(within).collect::<Vec<f64>>());
    keys
}

#[test]
fn a_stretch_of_captured_keys_gets_a_path_and_a_spacing() {
    let mut desk = Desk::new();
    desk.choose("Trunk");
    let before = desk.track("Trunk");
    // Between two frames there is nothing to shape: it is said, and nothing is done.
    desk.ask(Command::Scrub(1.0));
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::Q);
    assert_eq!(desk.steps(), 0);
    let told = desk.window().messages().collect::<Vec<_>>().join(" ");
    assert!(told.contains("choose a stretch of keys") && told.contains("make one segment"), "{told}");

    let keys = keys_between(&desk, "Trunk", 0.5, 1.5);
    assert_eq!(keys.len(), 31);
    desk.ask(Command::Curve(CurveCommand::Choose(keys)));
    // A pace would not be seen between two frames, a turn would spin.
    for key in [Key::U, Key::Period] {
        desk.press(Modifiers::ALT | Modifiers::SHIFT, key);
        assert_eq!(desk.steps(), 0);
    }
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::M);
    assert_eq!((desk.steps(), desk.times("Trunk").len()), (1, 61 - 29));
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::S);
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::U);
    assert_eq!((desk.steps(), desk.passes().len()), (3, 1));
    // The bar has gone over to the segment that is left, whose handles can be dragged.
    assert_eq!(
        desk.window().bench().session.curves.segment.map(|(joint, _)| joint),
        Some(desk.joint("Trunk"))
    );
    desk.bench.0.get_by_label("Path of the segment");
    desk.bench.0.get_by_label_contains("Spacing handle 1");
    let after = desk.track("Trunk");
    let (from, to) = (before.at(0.5), before.at(1.5));
    for share in [0.1, 0.25, 0.5, 0.8] {
        let expected = turnwright::rotor::slerp(from, to, Spacing::EaseBoth.pace(share).share);
        assert!(after.at(0.5 + share).turn_to(expected) < 1e-6, "at {share} of the stretch");
    }
    for secs in [0.0, 0.3, 0.5, 1.5, 1.8] {
        assert!(after.at(secs).turn_to(before.at(secs)) < 1e-9, "beside the stretch at {secs}");
    }
    for _ in 0..3 {
        desk.press(Modifiers::COMMAND, Key::Z);
    }
    assert!(desk.passes().is_empty());
}

#[test]
fn a_path_on_chosen_keys_keeps_them_all() {
    let mut desk = Desk::new();
    for name in ["Trunk", ARM] {
        desk.choose(name);
        let before = desk.track(name);
        let count = before.keys.len();
        desk.act(CurveAction::ChooseAll);
        let steps = desk.steps();
        for (key, kind) in [(Key::H, PathKind::Hold), (Key::Q, PathKind::Squad)] {
            desk.press(Modifiers::ALT | Modifiers::SHIFT, key);
            let after = desk.track(name);
            assert_eq!((after.keys.len(), desk.chosen()), (count, count), "{name}, {kind:?}");
            for place in 0..count {
                let secs = before.times.at(place);
                assert!(after.at(secs).turn_to(before.at(secs)) < 1e-9, "{name} at {secs}");
                assert!(place + 1 == count || after.kind_of(place, None) == kind, "{name}, segment {place}");
            }
        }
        assert_eq!(desk.steps(), steps + 2, "one step each");
    }
}

#[test]
fn keys_that_are_chosen_let_go_of_the_segment_before() {
    let mut desk = Desk::new();
    desk.choose("Trunk");
    let count = desk.times("Trunk").len();
    desk.act(CurveAction::ChooseAll);
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::M);
    assert_eq!(desk.times("Trunk").len(), 2);
    assert!(desk.window().bench().session.curves.segment.is_some(), "the one that is left");
    desk.press(Modifiers::COMMAND, Key::Z);
    desk.press(Modifiers::COMMAND, Key::A);
    assert_eq!((desk.chosen(), desk.window().bench().session.curves.segment), (count, None));
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::Q);
    assert_eq!(desk.messages(), "");
    let track = desk.track("Trunk");
    assert!((0..count - 1).all(|segment| track.kind_of(segment, None) == PathKind::Squad));
    // And a segment lets go of keys.
    desk.choose(ARM);
    desk.act(CurveAction::ChooseAll);
    desk.ask(Command::Scrub(0.7));
    desk.act(CurveAction::ChooseSegment);
    assert_eq!(desk.chosen(), 0);
}

#[test]
fn a_stretch_of_rows_is_shaped_on_in_its_own_pass() {
    let Some(path) = shared("data/bvh/cmu_02_01_walk.bvh") else { return };
    let mut desk = Desk::open(path, tempfile::tempdir().unwrap());
    desk.choose("LeftArm");
    let before = desk.track("LeftArm");
    let grid = desk.window().bench().source().unwrap().grid.clone();
    let (from, to) = (grid.time(100), grid.time(140));
    let keys = keys_between(&desk, "LeftArm", from, to);
    desk.ask(Command::Curve(CurveCommand::Choose(keys)));
    // Between two rows nothing is kept.
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::Q);
    assert_eq!(desk.steps(), 0);
    desk.bench.0.get_by_label("Make one segment").click();
    desk.run();
    desk.bench.0.get_by_label("Path between the chosen keys").click();
    desk.run();
    desk.bench.0.get_by_label("slerp").click();
    desk.run();
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::I);
    let check = |desk: &Desk<'_>, spacing: Spacing| {
        let after = desk.track("LeftArm");
        assert_eq!(after.times.len(), before.times.len(), "rows stay");
        for frame in 100..=140 {
            let share = spacing.pace((frame - 100) as f64 / 40.0).share;
            let expected = turnwright::rotor::slerp(before.at(from), before.at(to), share);
            let off = after.at(grid.time(frame)).turn_to(expected).to_degrees();
            assert!(off < 1e-3, "frame {frame} is {off}° off");
        }
    };
    check(&desk, Spacing::EaseIn);
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::O);
    check(&desk, Spacing::EaseOut);
    assert_eq!((desk.steps(), desk.passes().len()), (4, 1), "{:?}", desk.passes());
    // Turns are counted on from those that the stretch has.
    for _ in 0..2 {
        desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::Period);
    }
    let passes = desk.passes();
    let [PassStep::Keys(pass)] = passes.as_slice() else { panic!("{passes:?}") };
    let mut turns = pass.edits.iter().filter_map(|edit| match &edit.change {
        KeyChange::Turn(_, turn) => Some(turn.whole()),
        _ => None,
    });
    assert_eq!(turns.next_back(), Some(2));
    let changed = desk.track("LeftArm").changed_keys(&before);
    assert!(changed.iter().all(|key| (101..140).contains(key)), "{changed:?}");
}

/// The share of the way at a share of the time, by halving along the cubic Bezier curve that the handles make: its definition.
fn share_by_halving([[x1, y1], [x2, y2]]: [[f64; 2]; 2], time: f64) -> f64 {
    let at =
        |a: f64, b: f64, s: f64| 3.0 * (1.0 - s).powi(2) * s * a + 3.0 * (1.0 - s) * s * s * b + s.powi(3);
    let (mut low, mut high) = (0.0, 1.0);
    for _ in 0..60 {
        let middle = f64::midpoint(low, high);
        if at(x1, x2, middle) < time {
            low = middle;
        } else {
            high = middle;
        }
    }
    at(y1, y2, low)
}

/// What is played is compared with a slerp, the curve of the handles worked out here.
#[test]
fn handles_shape_the_spacing_of_a_stretch_of_rows() {
    let Some(path) = shared("data/bvh/cmu_02_01_walk.bvh") else { return };
    let mut desk = Desk::open(path, tempfile::tempdir().unwrap());
    desk.choose("LeftArm");
    let (before, name) = (desk.track("LeftArm"), "Spacing handle 1");
    let grid = desk.window().bench().source().unwrap().grid.clone();
    let (from, to) = (grid.time(100), grid.time(140));
    let keys = keys_between(&desk, "LeftArm", from, to);
    desk.ask(Command::Curve(CurveCommand::Choose(keys.clone())));
    assert!(
        desk.bench.0.query_by_label_contains(name).is_none(),
        "captured motion has no spacing of its own"
    );
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::M);
    let steps = desk.steps();
    let handle = desk.bench.0.get_by_label_contains(name).rect().center();
    let check = |desk: &Desk<'_>, shown: Option<&turnwright::app::view_models::LocalCurves>, points| {
        let after = desk.track("LeftArm");
        for frame in 101..140 {
            let share = share_by_halving(points, (frame - 100) as f64 / 40.0);
            let expected = turnwright::rotor::slerp(before.at(from), before.at(to), share);
            let off = after.at(grid.time(frame)).turn_to(expected).to_degrees();
            assert!(off < 1e-3, "frame {frame} is {off}° off");
            if let Some(shown) = shown {
                let yz = expected.plane_angles().to_degrees()[0];
                assert_near(shown.value(0, grid.time(frame)).unwrap(), yz, 0.05);
            }
        }
        assert_eq!(after.times.len(), before.times.len(), "rows stay");
    };
    let given = |desk: &Desk<'_>| {
        let passes = desk.passes();
        let [PassStep::Keys(pass)] = passes.as_slice() else { panic!("one pass: {passes:?}") };
        let spaces: Vec<Spacing> = pass
            .edits
            .iter()
            .filter_map(|edit| match edit.change {
                KeyChange::Space(_, spacing) => Some(spacing),
                _ => None,
            })
            .collect();
        let [Spacing::Own(handles)] = spaces.as_slice() else { panic!("one spacing: {spaces:?}") };
        handles.points()
    };
    desk.drag(handle, vec2(25.0, 12.0), Modifiers::NONE, |desk| {
        assert_eq!(desk.steps(), steps, "nothing is recorded yet");
        // What is drawn while it is dragged is what letting go will give.
        let shown = desk.window().bench().curve_hand.shown.clone().expect("drawn at once");
        let Stroke::Keys(edits) = &shown.stroke else { panic!("{:?}", shown.stroke) };
        let KeyChange::Space(_, spacing) = edits[0].change else { panic!("{edits:?}") };
        let [local] = shown.locals.as_slice() else { panic!("{:?}", shown.locals.len()) };
        check(desk, Some(local), spacing.points());
    });
    assert_eq!(desk.steps(), steps + 1);
    let first = given(&desk);
    assert!(first[0][0] > 0.4 && first[0][1] < 0.3, "{first:?}");
    check(&desk, None, first);
    desk.bench.0.get_by_label_contains("Spacing handle 2").focus();
    desk.run();
    for _ in 0..3 {
        desk.press(Modifiers::NONE, Key::ArrowDown);
    }
    let second = given(&desk);
    assert!(second[1][1] < first[1][1] - 0.05, "{second:?}");
    check(&desk, None, second);
    // The stretch is found again by the playhead, as a segment is.
    desk.act(CurveAction::ChooseNone);
    assert!(desk.bench.0.query_by_label_contains(name).is_none());
    desk.ask(Command::Scrub(grid.time(120)));
    desk.press(Modifiers::ALT | Modifiers::SHIFT, Key::Insert);
    assert_eq!(desk.window().bench().session.curves.keys, keys);
    desk.bench.0.get_by_label_contains(name);
    let changed = desk.track("LeftArm").changed_keys(&before);
    assert!(changed.iter().all(|key| (101..140).contains(key)), "{changed:?}");
}

#[test]
fn limits_shade_what_a_number_may_not_reach_while_the_others_stay() {
    let mut desk = Desk::new();
    let joint = desk.joint(ARM);
    let range =
        Range { swing: SwingLimit::Cone { half_rad: 0.5 }, twist: Interval::from_degrees(-30.0, 25.0) };
    let limit = JointLimit::new(Rotor::IDENTITY, DVec3::X, DVec3::Z, range);
    let limits = Limits { title: "test".to_owned(), joints: [(joint, limit)].into() };
    let plain = desk.bench.0.render().unwrap();
    desk.ask(Command::Edit(Edit::SetLimits { work: 0, limits: Some(Arc::new(limits)) }));
    assert!(desk.bench.0.render().unwrap() != plain, "the bands are drawn");
    let key = |desk: &Desk<'_>, line: usize, columns: usize| {
        let bench = desk.window().bench();
        let (set, clip) = (bench.curve_sets()[0].clone(), bench.result().unwrap().clone());
        let window = TimeWindow { start_secs: 0.0, end_secs: 2.0 };
        RoomKey { set, clip, limit, line, window, columns }
    };
    let room = |desk: &Desk<'_>, line: usize| LimitRooms::default().of(key(desk, line, 5)).to_vec();
    let check = |found: Option<[f64; 2]>, expected: [f64; 2]| {
        let found = found.expect("some of its values are inside");
        assert!(
            found.iter().zip(expected).all(|(a, b)| (a - b).abs() < 0.06),
            "{found:?}, expected {expected:?}"
        );
    };
    // The arm points along x: what it turns in yz alone is twist, and what it turns in zx alone is swing.
    for column in 0..5 {
        check(room(&desk, 0)[column], [-30.0, 25.0]);
    }
    let half = 0.5_f64.to_degrees();
    for line in [1, 2] {
        check(room(&desk, line)[0], [-half, half]);
    }
    // What was worked out serves again where the numbers have stayed, and nowhere else: here before the last key but one.
    let mut rooms = LimitRooms::default();
    rooms.of(key(&desk, 1, 201));
    assert_eq!(rooms.worked_out(), 201);
    let turn = Rotor::from_plane_angles(Bivector::from_degrees([10.0, 5.0, 15.0]));
    let edits = vec![KeyEdit { joint, change: KeyChange::Set(vec![(2.0, turn)]) }];
    desk.ask(Command::Edit(Edit::AddPass { work: 0, step: KeysPass { edits }.into(), at: 0 }));
    desk.run();
    let again = rooms.of(key(&desk, 1, 201)).to_vec();
    assert!((45..=55).contains(&rooms.worked_out()), "{}", rooms.worked_out());
    assert_eq!(again, LimitRooms::default().of(key(&desk, 1, 201)));
    rooms.of(key(&desk, 2, 201));
    assert_eq!(rooms.worked_out(), 201, "another number has another room");
    // In numbers that mean no angle, and in rates, there is no band to draw.
    for view in [Action::FileNumbers, Action::TurnRate] {
        desk.ask(Command::Do(view));
        assert!(room(&desk, 0).is_empty());
    }
}

/// Pictures of the editor at work for people to look at, under `target/tmp/curves`: what is chosen and what is pushed is to be seen.
#[test]
fn what_is_chosen_and_what_is_pushed_is_to_be_seen() {
    let folder = std::path::Path::new(env!("CARGO_TARGET_TMPDIR")).join("curves");
    std::fs::create_dir_all(&folder).unwrap();
    let shoot = |desk: &mut Desk<'_>, name: &str| {
        desk.run();
        let image = desk.bench.0.render().unwrap();
        image.save(folder.join(name)).unwrap();
        image
    };
    for (size, sparse) in [([1280.0, 720.0], true), ([2560.0, 1440.0], false)] {
        let (own, path) = (tempfile::tempdir().unwrap(), shared("data/bvh/cmu_02_01_walk.bvh"));
        let rise = own.path().join("rise.glb");
        disk::write(&rise, &gltf::from_clip(&figure(), "rise").unwrap().bytes).unwrap();
        let Some(captured) = path else { return };
        for (is_captured, path) in [(false, rise.clone()), (true, captured)] {
            let mut desk = Desk::of_size(path, tempfile::tempdir().unwrap(), size);
            let kind = format!("{}_{}", if is_captured { "captured" } else { "rise" }, size[0]);
            if sparse {
                desk.ask(Command::Do(Action::Light));
            }
            if is_captured {
                let clip = desk.window().bench().source().unwrap().clone();
                let joint = clip.skeleton.find("LeftArm").unwrap_or(3);
                desk.ask(Command::ChooseJoint(Some(joint)));
                let at = clip.grid.time(clip.grid.count() / 2);
                desk.ask(Command::ShowTime(TimeWindow { start_secs: at - 2.0, end_secs: at + 2.0 }));
                desk.ask(Command::Scrub(at));
                let plain = shoot(&mut desk, &format!("{kind}_plain.png"));
                for _ in 0..12 {
                    desk.press(Modifiers::COMMAND | Modifiers::ALT, Key::ArrowUp);
                }
                let pushed = shoot(&mut desk, &format!("{kind}_pushed.png"));
                assert_ne!(plain, pushed);
                let mut keys = KeyChoice::default();
                keys.add(joint, (0..60).map(|frame| clip.grid.time(clip.grid.count() / 2 + frame)));
                desk.ask(Command::Curve(CurveCommand::Choose(keys)));
                assert_ne!(pushed, shoot(&mut desk, &format!("{kind}_chosen.png")));
            } else {
                desk.choose(ARM);
                let plain = shoot(&mut desk, &format!("{kind}_plain.png"));
                let right = desk.joint("RightArm");
                desk.ask(Command::ChooseAlso(right));
                desk.act(CurveAction::ChooseAll);
                let chosen = shoot(&mut desk, &format!("{kind}_chosen.png"));
                assert_ne!(plain, chosen);
                desk.act(CurveAction::ChooseNone);
                desk.ask(Command::Scrub(0.7));
                desk.act(CurveAction::ChooseSegment);
                desk.act(CurveAction::EaseBoth);
                assert_ne!(chosen, shoot(&mut desk, &format!("{kind}_segment.png")));
            }
        }
    }
}
