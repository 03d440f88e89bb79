//! Pictures of one subject each, small, in the theme where they are harder to read.

use std::f64::consts::{FRAC_PI_2, PI};
use std::sync::Arc;

use glam::{DVec3, Vec2};
use turnwright::clip::{Clip, FrameGrid, JointTracks, RotationTrack};
use turnwright::raster::{
    Align, Area, Bounds, Camera, Canvas, ClipPage, Curve, DiscState, Figure, FigureLimb, FigureStyle, Floor,
    Girth, Image, Knob, Label, Lens, MapRow, Moment, PlaneDisc, Plot, ReachCone, SceneView, SnagMark,
    StraightView, StripStyle, TextStyle, Theme, Tile, TipPath, TurnMap, ValueUnit, chart_canvas, clip_page,
    compose, contact_strip, draw_plot, draw_text, draw_turn_map, limbs_of_skeleton, render,
};
use turnwright::rotor::{Bivector, Rotor};
use turnwright::skeleton::{Joint, JointKind, Skeleton, Transform};
use turnwright::snag::{Remedy, Snag, SnagKind};

use crate::golden;

const SIZE: (usize, usize) = (160, 120);

fn front() -> Camera {
    Camera { target: DVec3::ZERO, distance: 3.0, yaw_rad: 0.0, pitch_rad: 0.0, ..Camera::default() }
}

fn scene(camera: Camera, theme: Theme) -> SceneView {
    SceneView::new(SIZE.0, SIZE.1, camera, theme)
}

/// A figure of single limbs, each with its own joint.
fn figure(limbs: &[[[f64; 3]; 2]], style: FigureStyle) -> Figure {
    let limbs = limbs.iter().enumerate();
    let limbs = limbs.map(|(joint, [from, to])| FigureLimb { from: (*from).into(), to: (*to).into(), joint });
    Figure::new(limbs.collect(), style)
}

/// A plain figure of two legs, two arms, a back and a head, `height` units high, its right arm lifted by `lift_rad`.
fn biped(height: f64, lift_rad: f64) -> Skeleton {
    let mut joints: Vec<Joint> = Vec::new();
    let mut add = |parent: Option<usize>, offset: [f64; 3], tip: Option<[f64; 3]>| {
        joints.push(Joint {
            name: format!("joint{}", joints.len()),
            number: joints.len(),
            parent,
            rest: Transform::from_translation(DVec3::from(offset) * height),
            kind: JointKind::Joint,
            tips: tip.map(|tip| DVec3::from(tip) * height).into_iter().collect(),
        });
        joints.len() - 1
    };
    let hips = add(None, [0.0, 0.52, 0.0], None);
    let chest = add(Some(hips), [0.0, 0.14, 0.0], None);
    let neck = add(Some(chest), [0.0, 0.17, 0.0], None);
    add(Some(neck), [0.0, 0.05, 0.01], Some([0.0, 0.11, 0.01]));
    let (sin, cos) = lift_rad.sin_cos();
    for (side, [arm_x, arm_y]) in [(1.0, [0.04, -0.16]), (-1.0, [-0.16 * cos, 0.16 * sin])] {
        let shoulder = add(Some(chest), [0.1 * side, 0.14, 0.0], None);
        let elbow = add(Some(shoulder), [arm_x, arm_y, 0.0], None);
        let hand = add(Some(elbow), [0.0, -0.04, 0.13], Some([0.0, 0.0, 0.08]));
        assert!(hand > elbow);
        let hip = add(Some(hips), [0.06 * side, -0.03, 0.0], None);
        let knee = add(Some(hip), [0.01 * side, -0.23, 0.05 * side], None);
        let foot = add(Some(knee), [0.0, -0.23, -0.04], Some([0.0, -0.03, 0.09]));
        assert!(foot > knee);
    }
    Skeleton::new(joints).expect("parents stand before their children")
}

fn pose(skeleton: &Skeleton, style: FigureStyle) -> Figure {
    let limbs = limbs_of_skeleton(skeleton, &skeleton.world(&skeleton.rest_pose()));
    Figure { girth: Girth::of_skeleton(skeleton), ..Figure::new(limbs, style) }
}

#[test]
fn a_limb_tapers_and_has_a_flat_mark_near_its_end() {
    let mut scene = scene(front(), Theme::DARK);
    scene.figures.push(figure(&[[[-0.6, -0.35, 0.0], [0.6, 0.4, 0.0]]], FigureStyle::After));
    golden::check("limb", &render(&scene));
}

#[test]
fn of_two_crossing_limbs_one_sees_which_is_in_front() {
    let mut scene = scene(front(), Theme::LIGHT);
    let limbs = [[[-0.7, 0.35, 0.2], [0.7, -0.3, 0.2]], [[-0.7, -0.3, -0.2], [0.7, 0.35, -0.2]]];
    scene.figures.push(figure(&limbs, FigureStyle::After));
    golden::check("crossing", &render(&scene));
}

#[test]
fn limbs_that_pass_through_each_other_meet_on_a_line() {
    let mut scene = scene(front(), Theme::DARK);
    let limbs = [[[-0.7, 0.1, -0.3], [0.7, -0.05, 0.3]], [[-0.7, -0.1, 0.3], [0.7, 0.05, -0.3]]];
    let mut both = figure(&limbs, FigureStyle::After);
    both.chosen = Some(1);
    scene.figures.push(both);
    golden::check("piercing", &render(&scene));
}

#[test]
fn a_limb_that_points_at_the_eye_is_a_ball() {
    let mut scene = scene(front(), Theme::DARK);
    scene.figures.push(figure(&[[[0.0, 0.0, -0.5], [0.02, 0.0, 0.9]]], FigureStyle::After));
    golden::check("end_on", &render(&scene));
}

#[test]
fn source_result_and_neighbour_differ_in_more_than_colour() {
    for (name, theme) in [("figures_dark", Theme::DARK), ("figures_light", Theme::LIGHT)] {
        let mut camera = Camera::default();
        let result = pose(&biped(1.8, 0.6), FigureStyle::After);
        camera.fit(&result.bounds().unwrap(), SIZE.0, SIZE.1, 0.05);
        let mut scene = scene(camera, theme);
        scene.figures.push(Figure { chosen: Some(7), ..result });
        scene.figures.push(pose(&biped(1.8, -0.5), FigureStyle::Before));
        scene.figures.push(pose(&biped(1.8, 1.5), FigureStyle::Ghost));
        golden::check(name, &render(&scene));
    }
}

#[test]
fn a_figure_stands_on_its_floor_at_any_unit() {
    let mut pictures: Vec<Image> = Vec::new();
    for height in [1.0, 200.0] {
        let body = pose(&biped(height, 0.2), FigureStyle::After);
        let bounds = body.bounds().unwrap();
        let mut camera = Camera { pitch_rad: 0.35, ..Camera::default() };
        camera.fit(&bounds, SIZE.0, SIZE.1, 0.05);
        let mut scene = scene(camera, Theme::LIGHT);
        // The step is a round number of the file's unit, so it is no part of the likeness.
        scene.floor = Some(Floor { step: height / 2.0, center: DVec3::ZERO, ..Floor::under(&bounds) });
        scene.figures.push(body);
        pictures.push(render(&scene));
    }
    golden::check("floor", &pictures[0]);
    golden::check("floor", &pictures[1]);
}

#[test]
fn a_parallel_view_from_above_shows_the_floor_square() {
    let mut camera = Camera { lens: Lens::Orthographic, ..Camera::default() };
    camera.look_straight(StraightView::Zx);
    let body = pose(&biped(1.8, 0.2), FigureStyle::After);
    camera.fit(&Bounds { min: DVec3::splat(-1.2), max: DVec3::splat(1.2) }, SIZE.0, SIZE.1, 0.0);
    let mut scene = scene(camera, Theme::DARK);
    scene.floor = Some(Floor { center: DVec3::ZERO, step: 0.5, cells: 6, heading: DVec3::X });
    scene.figures.push(body);
    golden::check("from_above", &render(&scene));
}

#[test]
fn a_tip_path_shows_its_speed_and_goes_pale_behind_things() {
    let mut scene = scene(front(), Theme::DARK);
    scene.figures.push(figure(&[[[0.0, -0.7, 0.0], [0.0, 0.7, 0.0]]], FigureStyle::After));
    let place = |i: i32| {
        let turn = f64::from(i) / 40.0 * 2.0 * PI;
        DVec3::new(0.7 * turn.cos(), 0.25 * turn.sin() + 0.1, 0.7 * turn.sin())
    };
    let color = Theme::DARK.planes[1];
    scene.tip_paths.push(TipPath { points: (0..=34).map(place).collect(), current: Some(9), color });
    golden::check("tip_path", &render(&scene));
}

#[test]
fn a_plane_disc_lies_in_its_plane_and_says_its_angle() {
    for (name, theme) in [("disc_dark", Theme::DARK), ("disc_light", Theme::LIGHT)] {
        let mut scene = scene(Camera { yaw_rad: 0.5, pitch_rad: 0.4, ..front() }, theme);
        scene.figures.push(figure(&[[[0.0, 0.0, 0.0], [0.5, 0.28, 0.0]]], FigureStyle::After));
        scene.discs.push(PlaneDisc {
            center: DVec3::ZERO,
            u: DVec3::X,
            v: DVec3::Y,
            radius: 0.62,
            from_rad: -0.4,
            to_rad: 1.2,
            color: theme.planes[2],
            name: "xy".to_owned(),
            angle_text: "92°".to_owned(),
            state: DiscState::Held,
        });
        golden::check(name, &render(&scene));
    }
}

#[test]
fn a_reach_is_a_pale_cone_with_a_firm_rim() {
    let mut scene = scene(Camera { yaw_rad: 0.5, pitch_rad: 0.3, ..front() }, Theme::LIGHT);
    scene.figures.push(figure(&[[[0.0, -0.6, 0.0], [0.1, 0.2, 0.1]]], FigureStyle::After));
    let rim = |i: i32| {
        let turn = f64::from(i) / 24.0 * 2.0 * PI;
        DVec3::new(0.45 * turn.cos(), 0.3, 0.3 * turn.sin())
    };
    let color = Theme::LIGHT.planes[0];
    scene.reaches.push(ReachCone {
        apex: DVec3::new(0.0, -0.6, 0.0),
        rim: (0..24).map(rim).collect(),
        now: None,
        color,
    });
    golden::check("reach", &render(&scene));
}

#[test]
fn waiting_discs_read_as_rings_in_space_and_their_grips_say_which_is_which() {
    for (name, theme) in [("discs_waiting_dark", Theme::DARK), ("discs_waiting_light", Theme::LIGHT)] {
        let mut scene = scene(Camera { yaw_rad: 0.5, pitch_rad: 0.4, ..front() }, theme);
        scene.figures.push(figure(&[[[-0.1, -0.2, 0.0], [0.5, 0.28, 0.0]]], FigureStyle::After));
        let axes = [(DVec3::Y, DVec3::Z), (DVec3::Z, DVec3::X), (DVec3::X, DVec3::Y)];
        for (plane, (u, v)) in axes.into_iter().enumerate() {
            let disc = PlaneDisc {
                center: DVec3::ZERO,
                u,
                v,
                radius: 0.5,
                from_rad: 0.0,
                to_rad: 0.0,
                color: theme.planes[plane],
                name: String::new(),
                angle_text: String::new(),
                state: if plane == 1 { DiscState::Ready } else { DiscState::Idle },
            };
            scene.knobs.push(Knob {
                at: disc.rim(PI / 4.0),
                color: disc.color,
                is_ready: plane == 1,
                letters: ["yz", "zx", "xy"][plane].to_owned(),
                away_from: DVec3::ZERO,
            });
            scene.discs.push(disc);
        }
        golden::check(name, &render(&scene));
    }
}

#[test]
fn a_limb_beyond_its_reach_is_seen_outside_the_cone() {
    let mut scene = scene(Camera { yaw_rad: 0.5, pitch_rad: 0.3, ..front() }, Theme::DARK);
    let apex = DVec3::new(0.0, -0.6, 0.0);
    let now = DVec3::new(0.75, 0.1, 0.2);
    scene.figures.push(figure(&[[apex.to_array(), now.to_array()]], FigureStyle::After));
    let rim = |i: i32| {
        let turn = f64::from(i) / 24.0 * 2.0 * PI;
        DVec3::new(0.3 * turn.cos(), 0.35, 0.3 * turn.sin())
    };
    let color = Theme::DARK.snag;
    scene.reaches.push(ReachCone { apex, rim: (0..24).map(rim).collect(), now: Some(now), color });
    golden::check("reach_beyond", &render(&scene));
}

#[test]
fn names_find_room_beside_their_joints() {
    let mut scene = scene(front(), Theme::LIGHT);
    let skeleton = biped(1.9, 0.4);
    let world = skeleton.world(&skeleton.rest_pose());
    let figure = pose(&skeleton, FigureStyle::After);
    scene.camera.fit(&figure.bounds().unwrap(), SIZE.0, SIZE.1, 0.1);
    scene.figures.push(figure);
    for (joint, own) in world.iter().enumerate() {
        scene.names.push(Label { at: own.position(), text: format!("joint {joint}") });
    }
    golden::check("names", &render(&scene));
}

#[test]
fn a_mirrored_view_is_the_picture_of_the_mirrored_scene() {
    let limbs = [[[-0.6, -0.5, 0.2], [0.1, 0.0, 0.0]], [[0.1, 0.0, 0.0], [0.8, 0.4, -0.3]]];
    let camera = Camera { yaw_rad: 0.4, pitch_rad: 0.2, is_mirrored: true, ..front() };
    let mut mirrored = scene(camera, Theme::DARK);
    mirrored.figures.push(figure(&limbs, FigureStyle::After));
    // Exchanging left and right of the scene and looking from the other side gives the same picture.
    let flip = |p: [f64; 3]| [-p[0], p[1], p[2]];
    let flipped = limbs.map(|limb| limb.map(flip));
    let mut twin = scene(Camera { yaw_rad: -0.4, is_mirrored: false, ..camera }, Theme::DARK);
    twin.figures.push(figure(&flipped, FigureStyle::After));
    let (a, b) = (render(&mirrored), render(&twin));
    let differing =
        a.pixels().iter().zip(b.pixels()).filter(|(a, b)| (0..4).any(|i| a[i].abs_diff(b[i]) > 2)).count();
    assert!(differing < 5, "{differing} pixels differ");
}

#[test]
fn labels_stay_legible_and_inside() {
    let mut scene = scene(front(), Theme::DARK);
    let tip = [0.95, 0.62, 0.0];
    scene
        .figures
        .push(figure(&[[[-0.7, -0.1, 0.0], [0.2, 0.0, 0.0]], [[0.2, 0.0, 0.0], tip]], FigureStyle::After));
    scene.labels.push(Label { at: DVec3::new(-0.2, -0.05, 0.0), text: "left elbow".to_owned() });
    scene.labels.push(Label { at: tip.into(), text: "left hand".to_owned() });
    golden::check("labels", &render(&scene));
}

#[test]
fn lines_of_text_at_the_sizes_we_use() {
    let mut image = Image::new(SIZE.0, SIZE.1, Theme::LIGHT.background);
    let ink = Theme::LIGHT.text;
    let mut top = 4.0;
    for size in [12.0, 14.0, 15.0, 22.0] {
        draw_text(&mut image, "Turn rate 48°/s", Vec2::new(6.0, top), &TextStyle::words(size, ink));
        top += size + 3.0;
    }
    let numbers = TextStyle::numbers(13.0, Theme::LIGHT.text_faint).aligned(Align::Right);
    draw_text(&mut image, "-7.25° frame 318", Vec2::new(154.0, top + 4.0), &numbers);
    golden::check("text", &image);
}

/// Two curves; the source has a peak of one frame and a run that is half a turn off.
fn plot(theme: &Theme) -> Plot {
    let curve = |value: &dyn Fn(i32, f64) -> f64| {
        (0..=90).map(|i| [f64::from(i) / 30.0, value(i, f64::from(i) / 30.0)]).collect::<Vec<_>>()
    };
    let bend = |t: f64| 35.0 * (2.0 * t).sin();
    let sway = |t: f64| 20.0 * (1.3 * t).cos() - 25.0;
    let faulty = curve(&|i, t| if i == 24 { 130.0 } else { bend(t) });
    let half_turn = curve(&|i, t| if (55..70).contains(&i) { sway(t) + 180.0 } else { sway(t) });
    Plot {
        title: "Left elbow".to_owned(),
        time_secs: [0.0, 3.0],
        unit: ValueUnit::Degrees,
        curves: vec![
            Curve::before(faulty, theme),
            Curve::before(half_turn, theme),
            Curve::after(curve(&|_, t| bend(t)), theme.planes[0], "yz"),
            Curve::after(curve(&|_, t| sway(t)), theme.planes[1], "zx"),
        ],
        marks: vec![
            SnagMark { first_secs: 0.8, last_secs: 0.8, letter: 'S' },
            SnagMark { first_secs: 55.0 / 30.0, last_secs: 69.0 / 30.0, letter: 'H' },
        ],
        playhead_secs: Some(1.4),
    }
}

#[test]
fn a_plot_shows_source_result_and_snags() {
    for (name, theme) in [("plot_dark", Theme::DARK), ("plot_light", Theme::LIGHT)] {
        let (mut canvas, area) = chart_canvas(300, 190, &theme);
        draw_plot(&mut canvas, area.inset(8.0, 6.0, 8.0, 4.0), &plot(&theme), &theme, 1.0);
        golden::check(name, &canvas.image);
    }
}

#[test]
fn a_plot_without_anything_in_it_is_an_empty_plot() {
    let theme = Theme::LIGHT;
    let empty = Plot { curves: vec![], marks: vec![], title: String::new(), ..plot(&theme) };
    let (mut canvas, area) = chart_canvas(200, 100, &theme);
    draw_plot(&mut canvas, area, &empty, &theme, 1.0);
    // Far too small an area must not harm either.
    let tiny = Area { left: 190.0, top: 95.0, width: 3.0, height: 2.0 };
    draw_plot(&mut canvas, tiny, &plot(&theme), &theme, 1.0);
    let (mut canvas, area) = chart_canvas(200, 100, &theme);
    draw_plot(&mut canvas, area, &empty, &theme, 1.0);
    golden::check("plot_empty", &canvas.image);
}

fn turn_map() -> TurnMap {
    let names = ["Hips", "Chest", "LeftUpperArmTwistHelper", "LeftElbow", "LeftHand"];
    let rows = names.iter().enumerate().map(|(j, name)| {
        let speed = |i: usize| {
            (0.5 + 0.5 * (i as f32 * 0.09 * (1.0 + j as f32 * 0.4)).sin()) * 60.0 * (1.0 + j as f32)
        };
        let mut values: Vec<f32> = (0..=90).map(speed).collect();
        let mut marks = Vec::new();
        if j == 3 {
            values[24] = 4000.0;
            marks.push(SnagMark { first_secs: 0.8, last_secs: 0.8, letter: 'S' });
            marks.push(SnagMark { first_secs: 1.8, last_secs: 2.6, letter: 'H' });
        }
        if j == 1 {
            values[60..70].fill(f32::NAN);
            marks.push(SnagMark { first_secs: 2.0, last_secs: 2.3, letter: 'B' });
        }
        MapRow { name: (*name).to_owned(), values, marks }
    });
    TurnMap {
        title: "Turn rate of every joint".to_owned(),
        rows: rows.collect(),
        time_secs: [0.0, 3.0],
        full_scale: 300.0,
        unit: "°/s".to_owned(),
        playhead_secs: Some(1.4),
        chosen: Some(3),
    }
}

#[test]
fn a_turn_map_shows_rates_snags_and_its_key() {
    for (name, theme) in [("map_dark", Theme::DARK), ("map_light", Theme::LIGHT)] {
        let (mut canvas, area) = chart_canvas(320, 180, &theme);
        draw_turn_map(&mut canvas, area.inset(8.0, 6.0, 8.0, 4.0), &turn_map(), &theme, 1.0);
        golden::check(name, &canvas.image);
    }
}

#[test]
fn a_contact_strip_sets_times_side_by_side() {
    let theme = Theme::DARK;
    let moments: Vec<Moment> = [(-0.9, 0.0), (0.2, 0.0), (1.3, 0.25)]
        .into_iter()
        .enumerate()
        .map(|(i, (lift, rise))| {
            let mut body = pose(&biped(1.8, lift), FigureStyle::After);
            for limb in &mut body.limbs {
                let shift = DVec3::new(0.0, rise, i as f64);
                (limb.from, limb.to) = (limb.from + shift, limb.to + shift);
            }
            Moment { caption: format!("0.{} s", i * 3), figures: vec![body] }
        })
        .collect();
    let style = StripStyle {
        width: 90,
        height: 130,
        scale: 1.0,
        camera: Camera::default(),
        theme,
        heading: DVec3::Z,
        tip_paths: Vec::new(),
    };
    let tiles: Vec<Tile> = contact_strip(&moments, &style);
    golden::check("strip", &compose("Deckhand", &tiles, 3, &theme, 1.0));
}

/// The biped's right arm swings from the shoulder; with `fault`, three frames of the elbow are half a turn off.
fn swinging_clip(fault: bool) -> Clip {
    let skeleton = Arc::new(biped(1.8, 0.2));
    let grid = FrameGrid::even(30.0, 2.0);
    let mut joints = vec![JointTracks::default(); skeleton.len()];
    let [shoulder, elbow] = [10, 11];
    for (joint, reach_rad) in [(shoulder, 0.9), (elbow, 0.5)] {
        let key = |frame: usize| {
            let swing = reach_rad * (frame as f64 / 60.0 * 2.0 * PI).sin();
            let is_off = fault && joint == elbow && (40..43).contains(&frame);
            let off = if is_off { PI } else { 0.0 };
            Rotor::from_plane_angles(Bivector { yz: 0.0, zx: off, xy: 0.0 })
                * Rotor::from_plane_angles(Bivector { yz: 0.0, zx: 0.0, xy: -swing })
        };
        let keys: Vec<Rotor> = (0..grid.count()).map(key).collect();
        let track = RotationTrack::from_rotors(grid.times.clone(), keys);
        joints[joint].rotation = Some(track);
    }
    let joints = joints.into_iter().map(Arc::new).collect();
    Clip { name: "swing".to_owned(), skeleton, joints, grid, duration_secs: 2.0 }
}

#[test]
fn a_clip_on_one_page_shows_poses_rates_and_snags() {
    let (before, after) = (swinging_clip(true), swinging_clip(false));
    let snag = Snag {
        kind: SnagKind::HalfTurn,
        joint: 11,
        first_key: 40,
        last_key: 42,
        first_frame: 40,
        last_frame: 42,
        first_secs: 40.0 / 30.0,
        last_secs: 42.0 / 30.0,
        size_rad: PI,
        confidence: 1.0,
        remedy: Remedy::Ask,
        safe: true,
        text: String::new(),
    };
    let page = ClipPage {
        title: "swing, mended".to_owned(),
        clip: &after,
        before: Some(&before),
        snags: &[snag],
        times_secs: vec![0.5, 41.0 / 30.0, 1.8],
        width: 400,
        height: 420,
        scale: 1.0,
        theme: Theme::DARK,
        camera: Camera::default(),
    };
    golden::check("page", &clip_page(&page));
}

#[test]
fn the_same_scene_gives_the_same_pixels_on_a_used_canvas() {
    let mut camera = Camera::default();
    let body = pose(&biped(1.8, 0.6), FigureStyle::After);
    camera.fit(&body.bounds().unwrap(), SIZE.0, SIZE.1, 0.05);
    let mut first = scene(camera, Theme::DARK);
    first.floor = Some(Floor::under(&body.bounds().unwrap()));
    let points = (0..200).map(|i| DVec3::new(f64::from(i) * 0.01 - 1.0, 1.0, 0.3)).collect();
    first.tip_paths.push(TipPath { points, current: None, color: Theme::DARK.planes[0] });
    first.figures.push(body);
    let mut other = SceneView { width: 200, height: 90, ..first.clone() };
    other.camera.orbit(1.0, FRAC_PI_2);
    let fresh = render(&first);
    let mut canvas = Canvas::default();
    for scene in [&first, &other, &first] {
        turnwright::raster::render_into(scene, &mut canvas);
    }
    assert_eq!(canvas.image, fresh);
}

#[test]
fn broken_poses_draw_what_is_sound() {
    let mut scene = scene(front(), Theme::DARK);
    let sound = [[-0.6, -0.35, 0.0], [0.6, 0.4, 0.0]];
    scene.figures.push(figure(&[sound], FigureStyle::After));
    let expected = render(&scene);
    let nan = [f64::NAN, 0.0, 0.0];
    scene.figures[0].limbs.push(FigureLimb { from: nan.into(), to: DVec3::ZERO, joint: 1 });
    scene.figures[0].limbs.push(FigureLimb {
        from: DVec3::splat(1e300),
        to: DVec3::splat(f64::INFINITY),
        joint: 2,
    });
    scene.tip_paths.push(TipPath {
        points: vec![nan.into(); 3],
        current: Some(1),
        color: Theme::DARK.planes[0],
    });
    scene.labels.push(Label { at: nan.into(), text: "nowhere".to_owned() });
    assert_eq!(render(&scene), expected);
}
