//! The skeleton view driven by pointer and keyboard; what is asserted is the document and the turns it gives.

use egui::{Key, Modifiers, Pos2, vec2};
use egui_kittest::kittest::Queryable as _;
use glam::{DVec2, DVec3};
use turnwright::app::Start;
use turnwright::app::commands::{Action, Command, SpaceAction, SpaceCommand};
use turnwright::app::session::{Disc, TurnPlanes};
use turnwright::app::view_models::Stage;
use turnwright::clip::{Clip, PushFrame};
use turnwright::exchange::ClipAddress;
use turnwright::limit::{Interval, JointLimit, Limits, Range, SwingLimit};
use turnwright::raster::View;
use turnwright::rotor::Rotor;
use turnwright::scene::{Edit, PassStep};

use crate::gui_harness::Bench;
use crate::support::shared;

impl Bench<'_> {
    fn space(&mut self, action: SpaceAction) {
        self.act(Action::Space(action));
    }

    fn result(&self) -> Clip {
        Clip::clone(self.window().bench().result().expect("a clip"))
    }

    fn undo_label(&self) -> String {
        let history = &self.window().bench().project.as_ref().expect("a document").history;
        history.undo_label().unwrap_or_default().to_owned()
    }

    fn pushes(&self) -> Vec<turnwright::clip::Push> {
        let passes = &self.window().bench().work().expect("a clip").passes;
        let pushes = passes.iter().filter_map(|pass| match &pass.step {
            PassStep::Push(own) => Some(own.pushes.clone()),
            _ => None,
        });
        pushes.flatten().collect()
    }

    fn middle_of(&self, label: &str) -> Pos2 {
        self.0.get_by_label(label).rect().center()
    }

    /// Chooses a joint and looks squarely and in parallel at plane xy, with discs in the scene's planes.
    fn look_at(&mut self, joint: usize, secs: f64) {
        self.ask(Command::Scrub(secs));
        self.ask(Command::ChooseJoint(Some(joint)));
        self.ask(Command::Do(Action::Parallel));
        self.ask(Command::Do(Action::LookXy));
        self.space(SpaceAction::FitJoint);
        self.space(SpaceAction::Planes(TurnPlanes::World));
    }

    /// Middle and radius of the plane discs in the window: seen squarely, the grip of disc xy lies at 45° and that of the free disc
    /// at −45° on a rim 1.26 times as large.
    fn disc_in_window(&self) -> (Pos2, f32) {
        let (xy, free) = (self.middle_of("Turn disc xy"), self.middle_of("Turn disc free"));
        let diagonal = std::f32::consts::FRAC_1_SQRT_2;
        let radius = (free.x - xy.x) / (0.26 * diagonal);
        (xy + vec2(-radius * diagonal, radius * diagonal), radius)
    }

    /// The view of the skeleton picture and its corner in the window.
    fn view(&self) -> (View, Pos2) {
        let bounds = self.0.get_by_label("Skeleton view").rect();
        let bench = self.window().bench();
        let mut camera = bench.session.camera;
        if bench.session.follows {
            let stage = Stage::new(bench.source().expect("a source"));
            camera.target += stage.gone(&self.result(), bench.session.playback.playhead_secs);
        }
        (camera.view(bounds.width() as usize, bounds.height() as usize), bounds.min)
    }
}

/// Places on a circle, angles in degrees counter-clockwise from the right.
fn arc((middle, radius): (Pos2, f32), from: f32, to: f32) -> Vec<Pos2> {
    (0..=8)
        .map(|i| {
            let (sin, cos) = (from + (to - from) * i as f32 / 8.0).to_radians().sin_cos();
            middle + vec2(cos, -sin) * radius
        })
        .collect()
}

/// How a joint turned in the scene from one clip to the other, as plane angles in degrees.
fn turned(before: &Clip, after: &Clip, joint: usize, secs: f64) -> [f64; 3] {
    let world = |clip: &Clip| clip.world_at(secs)[joint].rotation;
    (world(after) * world(before).reverse()).plane_angles().to_degrees()
}

#[track_caller]
fn check_angles(found: [f64; 3], expected: [f64; 3], within: f64) {
    let is_close = found.iter().zip(expected).all(|(found, expected)| (found - expected).abs() < within);
    assert!(is_close, "found {found:?}, expected {expected:?}");
}

/// The demo's deckhand with a forearm: a capture with a key for each frame.
fn deckhand() -> (Bench<'static>, usize) {
    let bench = Bench::open(Start::Demo);
    let clip = bench.result();
    let roles = turnwright::skeleton::roles::Roles::find(&clip.skeleton);
    let forearm = turnwright::skeleton::roles::Role::LowerArm(turnwright::skeleton::roles::Side::Left);
    let joint = roles.joint(forearm).expect("the deckhand has a left forearm");
    (bench, joint)
}

#[test]
fn a_disc_that_is_dragged_by_30_degrees_turns_the_joint_by_30_degrees_in_its_plane() {
    let (mut bench, joint) = deckhand();
    let secs = bench.result().grid.time(40);
    bench.look_at(joint, secs);
    let before = bench.result();
    let way = arc(bench.disc_in_window(), 45.0, 75.0);
    bench.press_and_move(&way);
    check_angles(turned(&before, &bench.result(), joint, secs), [0.0, 0.0, 30.0], 0.3);
    assert_eq!((bench.steps(), bench.pushes().len()), (0, 0), "nothing is recorded before it is let go");
    bench.0.drop_at(way[8]);
    bench.run();
    check_angles(turned(&before, &bench.result(), joint, secs), [0.0, 0.0, 30.0], 0.3);
    assert_eq!(bench.steps(), 1, "a drag is one step");
    assert!(
        bench.undo_label().starts_with("Turn ") && bench.undo_label().ends_with("in plane xy"),
        "{}",
        bench.undo_label()
    );

    // On a capture it is a soft push that fades over the set time, and no other joint changes.
    let pushes = bench.pushes();
    assert_eq!(pushes.len(), 1);
    let falloff = bench.window().bench().session.falloff_secs;
    assert_eq!((pushes[0].joint, pushes[0].frame, pushes[0].reach_secs), (joint, PushFrame::World, falloff));
    assert!((pushes[0].center_secs - secs).abs() < 1e-9);
    let after = bench.result();
    let changed = after.rotation(joint).unwrap().changed_keys(before.rotation(joint).unwrap());
    for key in changed {
        assert!((after.rotation(joint).unwrap().times.at(key) - secs).abs() < falloff);
    }
    let others = (0..before.skeleton.len()).filter(|&other| other != joint);
    assert!(others.into_iter().all(|other| before.same_joint(&after, other)));

    bench.0.key_press_modifiers(Modifiers::COMMAND, Key::Z);
    bench.run();
    assert!(before.same_joint(&bench.result(), joint));
}

#[test]
fn a_rim_is_as_good_as_its_grip_and_the_other_way_round_is_negative() {
    let (mut bench, joint) = deckhand();
    let secs = bench.result().grid.time(12);
    bench.look_at(joint, secs);
    let before = bench.result();
    // At 160° no grip is near.
    let way = arc(bench.disc_in_window(), 160.0, 110.0);
    let camera = bench.window().bench().session.camera;
    bench.drag(&way, Modifiers::NONE);
    check_angles(turned(&before, &bench.result(), joint, secs), [0.0, 0.0, -50.0], 0.3);
    assert_eq!(bench.window().bench().session.camera, camera, "the view stays");
}

#[test]
fn a_held_ctrl_snaps_and_a_held_shift_goes_finely_and_escape_gives_up() {
    let (mut bench, joint) = deckhand();
    let secs = bench.result().grid.time(40);
    bench.look_at(joint, secs);
    let before = bench.result();
    let disc = bench.disc_in_window();
    bench.ask(Command::Space(SpaceCommand::SetStep(15.0)));
    for (modifiers, expected) in [(Modifiers::COMMAND, 30.0), (Modifiers::SHIFT, 6.8)] {
        bench.hold(modifiers);
        bench.press_and_move(&arc(disc, 45.0, 79.0));
        let found = turned(&before, &bench.result(), joint, secs);
        let within = if expected == 30.0 { 1e-6 } else { 0.5 };
        check_angles(found, [0.0, 0.0, expected], within);
        bench.hold(Modifiers::NONE);
        bench.0.key_press(Key::Escape);
        bench.run();
        bench.0.drop_at(disc.0);
        bench.run();
        assert!(before.same_joint(&bench.result(), joint));
        assert_eq!(bench.steps(), 0);
    }
}

#[test]
fn keys_choose_a_disc_and_turn_by_set_steps() {
    let (mut bench, joint) = deckhand();
    let secs = bench.result().grid.time(40);
    bench.look_at(joint, secs);
    let before = bench.result();
    let both = Modifiers::COMMAND | Modifiers::ALT;
    bench.0.key_press_modifiers(both, Key::Num1);
    bench.run();
    assert_eq!(bench.window().bench().session.space.disc, Disc::Yz);
    for _ in 0..3 {
        bench.0.key_press_modifiers(both, Key::Num0);
        bench.run();
    }
    check_angles(turned(&before, &bench.result(), joint, secs), [15.0, 0.0, 0.0], 1e-6);
    assert_eq!(bench.steps(), 1, "steps that follow each other are one");
    bench.0.key_press_modifiers(Modifiers::ALT, Key::Period);
    bench.0.key_press_modifiers(both, Key::Num2);
    bench.run();
    let before = bench.result();
    bench.0.key_press_modifiers(both, Key::Num9);
    bench.run();
    check_angles(turned(&before, &bench.result(), joint, secs), [0.0, -15.0, 0.0], 1e-6);
    assert_eq!(bench.steps(), 2);

    // The grip of a disc takes the arrows while it has the keyboard; the playhead stays.
    let before = bench.result();
    bench.0.get_by_label("Turn disc twist").focus();
    bench.run();
    bench.0.key_press(Key::ArrowUp);
    bench.run();
    let limb = turnwright::app::view_models::limb_direction(&before, joint);
    let in_scene = before.world_at(secs)[joint].rotation.apply(limb) * 15.0;
    check_angles(turned(&before, &bench.result(), joint, secs), in_scene.to_array(), 1e-6);
    assert!((bench.window().bench().session.playback.playhead_secs - secs).abs() < 1e-9);
}

#[test]
fn a_tip_is_drawn_to_where_the_pointer_lets_go_and_the_limb_keeps_its_plane() {
    let (mut bench, forearm) = deckhand();
    let secs = bench.result().grid.time(40);
    bench.look_at(forearm, secs);
    let before = bench.result();
    let hand = before.skeleton.children(forearm)[0];
    let upper = before.skeleton.parent_joint(forearm).unwrap();
    let places = |clip: &Clip| [upper, forearm, hand].map(|joint| clip.world_at(secs)[joint].position());
    let from = bench.middle_of("Limb tip");
    // Towards the shoulder, where the limb can reach.
    let (view, corner) = bench.view();
    let in_window = |point: DVec3| {
        let pixel = view.project(point).unwrap().pixel;
        corner + vec2(pixel.x as f32, pixel.y as f32)
    };
    assert!(in_window(places(&before)[2]).distance(from) < 0.6, "the grip is at the wrist");
    let to = from + (in_window(places(&before)[0]) - from) * 0.3;
    bench.drag(&[from, from + (to - from) * 0.5, to], Modifiers::NONE);
    let after = bench.result();
    assert!(in_window(places(&after)[2]).distance(to) < 1.0, "{:?} {to:?}", in_window(places(&after)[2]));
    assert_eq!(bench.steps(), 1);
    let joints: Vec<usize> = bench.pushes().iter().map(|push| push.joint).collect();
    assert_eq!(joints, [upper, forearm], "the hand goes along");
    // Bones keep their lengths, and the elbow its plane: turned as the line from shoulder to wrist turned.
    let (old, new) = (places(&before), places(&after));
    for part in 0..2 {
        let length = |p: [DVec3; 3]| p[part].distance(p[part + 1]);
        assert!((length(old) - length(new)).abs() < 1e-6 * length(old));
    }
    let normal = |p: [DVec3; 3]| (p[1] - p[0]).cross(p[2] - p[1]).normalize();
    let line = |p: [DVec3; 3]| (p[2] - p[0]).normalize();
    let carried = Rotor::between(line(old), line(new)).apply(normal(old));
    assert!(carried.distance(normal(new)) < 1e-3, "{carried} {}", normal(new));
}

#[test]
fn where_keys_are_sparse_a_turn_sets_a_key_at_the_playhead() {
    let Some(path) = shared("data/gltf/node_character.glb") else { return };
    let address = ClipAddress { path, clip: Some("idle".to_owned()) };
    let mut bench = Bench::open(Start::Files(vec![address]));
    bench.ask(Command::CloseDialog);
    let clip = bench.result();
    let sparse = |joint: &usize| clip.rotation(*joint).is_some_and(|track| track.times.len() < 8);
    let joint = clip.skeleton.listed().find(sparse).expect("a joint with few keys");
    let keys = clip.rotation(joint).unwrap().times.clone();
    let (first, last) = keys.span().unwrap();
    let secs = clip.grid.time(clip.grid.frame(first + (last - first) * 0.37));
    bench.look_at(joint, secs);
    let secs = bench.window().bench().session.playback.playhead_secs;
    let before = bench.result();
    bench.space(SpaceAction::Arm(Disc::Xy));
    for _ in 0..2 {
        bench.space(SpaceAction::TurnOn);
    }
    let after = bench.result();
    check_angles(turned(&before, &after, joint, secs), [0.0, 0.0, 10.0], 1e-6);
    let added = after.rotation(joint).unwrap().times.len() - keys.len();
    assert_eq!(added, 1);
    assert_eq!(bench.steps(), 1);
    let passes = &bench.window().bench().work().unwrap().passes;
    assert!(
        matches!(&passes[..], [pass] if matches!(&pass.step, PassStep::Keys(keys) if keys.edits.len() == 1))
    );
}

#[test]
fn a_click_chooses_the_nearest_limb_and_with_alt_the_one_behind_it() {
    let (mut bench, _) = deckhand();
    bench.space(SpaceAction::Discs);
    bench.ask(Command::Do(Action::LookYz));
    bench.ask(Command::Do(Action::Fit));
    let clip = bench.result();
    // From the side one arm or leg stands before the other somewhere: look for a pixel with two joints.
    let (view, corner) = bench.view();
    let world = clip.world_at(0.0);
    let limbs = turnwright::raster::limbs_of_skeleton(&clip.skeleton, &world);
    let figure = turnwright::raster::Figure::new(limbs, turnwright::raster::FigureStyle::After);
    let bounds = bench.0.get_by_label("Skeleton view").rect();
    let places = (0..bounds.height() as usize / 4).flat_map(|y| {
        (0..bounds.width() as usize / 4).map(move |x| DVec2::new(x as f64 * 4.0, y as f64 * 4.0))
    });
    let found = places.into_iter().find_map(|pixel| match figure.pick_all(&view, pixel, 0.0)[..] {
        [near, far, ..] => Some((pixel, near, far)),
        _ => None,
    });
    let (pixel, near, far) = found.expect("two limbs over each other");
    let at = corner + vec2(pixel.x as f32, pixel.y as f32);
    for (modifiers, expected) in [(Modifiers::NONE, near), (Modifiers::ALT, far)] {
        bench.hold(modifiers);
        bench.0.hover_at(at);
        bench.0.step();
        bench.0.drag_at(at);
        bench.0.step();
        bench.0.drop_at(at);
        bench.run();
        bench.hold(Modifiers::NONE);
        assert_eq!(bench.window().bench().session.joint, Some(expected));
    }
}

#[test]
fn a_joint_beyond_its_limit_is_told_in_words() {
    let (mut bench, joint) = deckhand();
    let clip = bench.result();
    let limit = |half_rad: f64| {
        let local = clip.local_at(0.0)[joint].rotation;
        let along = turnwright::app::view_models::limb_direction(&clip, joint);
        let range =
            Range { swing: SwingLimit::Cone { half_rad }, twist: Interval { lo_rad: -3.0, hi_rad: 3.0 } };
        let tilted = Rotor::from_plane_angles(turnwright::rotor::Bivector::from_axis(
            along.any_orthonormal_vector() * 0.5,
        ));
        let mut limits = Limits { title: "test".to_owned(), ..Limits::default() };
        // Half a radian (28.65°) from the middle of the range.
        limits
            .joints
            .insert(joint, JointLimit::new(local * tilted, along, along.any_orthonormal_vector(), range));
        Edit::SetLimits { work: 0, limits: Some(limits.into()) }
    };
    bench.ask(Command::ChooseJoint(Some(joint)));
    bench.ask(Command::Edit(limit(1.0)));
    let name = clip.skeleton.label(joint).to_owned();
    assert!(bench.0.query_by_label_contains(&format!("{name}: 50 % of its limit")).is_some());
    bench.ask(Command::Edit(limit(0.25)));
    // 28.65° − 14.32° = 14.3°.
    assert!(bench.0.query_by_label_contains(&format!("{name}: 14.3° beyond its limit")).is_some());
}

#[test]
fn the_view_is_set_by_menu_and_keys_and_stays_with_the_next_clip() {
    let (mut bench, joint) = deckhand();
    bench.ask(Command::ChooseJoint(Some(joint)));
    let picture = |bench: &mut Bench<'_>| bench.0.render().expect("a picture").into_raw();
    let mut last = picture(&mut bench);
    let (alt, alt_shift) = (Modifiers::ALT, Modifiers::ALT.plus(Modifiers::SHIFT));
    let keys =
        [(alt, Key::M), (alt, Key::N), (alt_shift, Key::K), (alt, Key::G), (alt, Key::D), (alt, Key::P)];
    for (held, key) in keys {
        bench.0.key_press_modifiers(held, key);
        bench.run();
        let next = picture(&mut bench);
        assert!(next != last, "{held:?} {} changes the picture", key.name());
        last = next;
    }
    let session = &bench.window().bench().session;
    assert!(session.camera.is_mirrored && session.space.shows_neighbours && session.space.shows_names);
    assert!(!session.space.shows_floor && !session.space.shows_discs && !session.space.shows_path);
    assert!(bench.0.query_by_label("Turn disc xy").is_none());
    bench.space(SpaceAction::LongerFalloff);
    let falloff = bench.window().bench().session.falloff_secs;
    let habits = bench.window().bench().session.space.clone();
    bench.ask(Command::Do(Action::OpenDemo));
    let session = &bench.window().bench().session;
    assert_eq!((session.falloff_secs, &session.space), (falloff, &habits));
    assert!(session.camera.is_mirrored);
}

#[test]
fn discs_turn_in_the_planes_of_rest_and_parent_and_the_free_one_turns_freely() {
    let (mut bench, joint) = deckhand();
    let secs = bench.result().grid.time(40);
    bench.look_at(joint, secs);
    let rest = bench.result().skeleton.chosen_rest(joint).rotation;
    for (key, frame) in [(Key::Num7, Rotor::IDENTITY), (Key::Num6, rest)] {
        bench.0.key_press_modifiers(Modifiers::COMMAND | Modifiers::ALT, key);
        bench.run();
        let before = bench.result();
        bench.space(SpaceAction::Arm(Disc::Zx));
        bench.space(SpaceAction::TurnOn);
        let local = |clip: &Clip| clip.local_at(secs)[joint].rotation;
        let by = local(&bench.result()) * local(&before).reverse();
        check_angles((frame.reverse() * by * frame).plane_angles().to_degrees(), [0.0, 5.0, 0.0], 1e-6);
    }
    let (before, steps) = (bench.result(), bench.steps());
    let from = bench.middle_of("Turn disc free");
    bench.drag(&[from, from + vec2(-20.0, 8.0), from + vec2(-40.0, 16.0)], Modifiers::NONE);
    let by: f64 = turned(&before, &bench.result(), joint, secs).iter().map(|part| part * part).sum();
    assert!(by.sqrt() > 5.0, "turned by {}°", by.sqrt());
    assert_eq!(bench.steps(), steps + 1);
}

#[test]
fn the_view_is_circled_moved_zoomed_and_set_straight() {
    let (mut bench, _) = deckhand();
    bench.ask(Command::ChooseJoint(None));
    bench.ask(Command::Do(Action::Fit));
    let camera = |bench: &Bench<'_>| bench.window().bench().session.camera;
    let ground = bench.0.get_by_label("Skeleton view").rect().left_top() + vec2(30.0, 60.0);
    let before = camera(&bench);
    bench.drag(&[ground, ground + vec2(30.0, 0.0), ground + vec2(60.0, 20.0)], Modifiers::NONE);
    let circled = camera(&bench);
    assert!((circled.yaw_rad - before.yaw_rad).abs() > 0.1 && circled.pitch_rad > before.pitch_rad);
    assert_eq!((circled.target, circled.distance), (before.target, before.distance));
    bench.drag(&[ground, ground + vec2(30.0, 0.0), ground + vec2(60.0, 20.0)], Modifiers::SHIFT);
    let moved = camera(&bench);
    assert!(moved.target.distance(circled.target) > 0.01 * moved.distance);
    assert_eq!((moved.yaw_rad, moved.pitch_rad), (circled.yaw_rad, circled.pitch_rad));
    bench.0.hover_at(ground);
    bench.0.event(egui::Event::MouseWheel {
        unit: egui::MouseWheelUnit::Point,
        delta: vec2(0.0, 60.0),
        phase: egui::TouchPhase::Move,
        source: egui::MouseWheelSource::Wheel,
        modifiers: Modifiers::NONE,
    });
    bench.0.run_steps(20);
    assert!(camera(&bench).distance < 0.9 * moved.distance, "{} {}", camera(&bench).distance, moved.distance);
    // Ctrl+1 to 6: from +z, +y, +x and from behind.
    for (key, from) in [
        (Key::Num1, DVec3::Z),
        (Key::Num2, DVec3::Y),
        (Key::Num3, DVec3::X),
        (Key::Num4, DVec3::NEG_Z),
        (Key::Num5, DVec3::NEG_Y),
        (Key::Num6, DVec3::NEG_X),
    ] {
        bench.0.key_press_modifiers(Modifiers::COMMAND, key);
        bench.run();
        let own = camera(&bench);
        let (sin, cos) = (own.yaw_rad.sin(), own.yaw_rad.cos());
        let at = DVec3::new(sin * own.pitch_rad.cos(), own.pitch_rad.sin(), cos * own.pitch_rad.cos());
        assert!(at.distance(from) < 1e-9, "{} looks from {at}", key.name());
    }
    bench.0.key_press_modifiers(Modifiers::COMMAND, Key::Num9);
    bench.run();
    assert_eq!(camera(&bench).lens, turnwright::raster::Lens::Orthographic);
}

#[test]
fn in_a_mirrored_view_a_drag_goes_the_other_way_round() {
    let (mut bench, joint) = deckhand();
    let secs = bench.result().grid.time(40);
    bench.look_at(joint, secs);
    bench.space(SpaceAction::Mirror);
    let before = bench.result();
    // The grip of disc xy now lies at 135°; a way counter-clockwise on the screen is clockwise in the scene.
    let grip = bench.middle_of("Turn disc xy");
    let (view, corner) = bench.view();
    let center = view.project(before.world_at(secs)[joint].position()).unwrap().pixel;
    let middle = corner + vec2(center.x as f32, center.y as f32);
    let radius = grip.distance(middle);
    assert!(grip.x < middle.x && grip.y < middle.y);
    bench.drag(&arc((middle, radius), 135.0, 155.0), Modifiers::NONE);
    check_angles(turned(&before, &bench.result(), joint, secs), [0.0, 0.0, -20.0], 0.5);
}

#[test]
fn handles_are_out_of_the_way_where_they_would_lie() {
    let (mut bench, joint) = deckhand();
    bench.ask(Command::ChooseJoint(Some(joint)));
    assert!(bench.0.query_by_label("Turn disc free").is_some());
    bench.ask(Command::Do(Action::SourceAlone));
    assert!(bench.0.query_by_label("Turn disc free").is_none(), "the source can't be turned");
    bench.ask(Command::Do(Action::SourceAlone));
    bench.ask(Command::Do(Action::Play));
    assert!(bench.0.query_by_label("Turn disc free").is_none(), "nor what runs away");
    bench.ask(Command::Do(Action::Play));
    bench.ask(Command::ChooseJoint(None));
    assert!(bench.0.query_by_label("Turn disc free").is_none());
}

/// Files whose figures stand on a root at the floor, hold their arms up, or have joints far out.
#[test]
fn all_grips_of_every_joint_lie_within_the_picture() {
    for name in ["gltf/Fox.glb", "gltf/biped23_movement_clips.glb", "bvh/cmu_05_06_dance.bvh"] {
        let Some(path) = shared(&format!("data/{name}")) else { return };
        let mut bench = Bench::of_file(&path);
        bench.ask(Command::CloseDialog);
        let picture = bench.0.get_by_label("Skeleton view").rect();
        let joints: Vec<usize> = bench.result().skeleton.listed().collect();
        for joint in joints {
            bench.ask(Command::ChooseJoint(Some(joint)));
            for disc in ["yz", "zx", "xy", "twist", "free"] {
                let grip = bench.0.get_by_label(&format!("Turn disc {disc}")).rect().center();
                let own = bench.result().skeleton.label(joint).to_owned();
                assert!(picture.contains(grip), "{name}: {disc} of {own} at {grip} in {picture}");
            }
        }
    }
}
