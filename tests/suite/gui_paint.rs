//! The painter of egui's meshes: known pixels, and the same pixels for any number of threads.

use egui::epaint::{ImageDelta, Primitive, Vertex, WHITE_UV};
use egui::{
    ClippedPrimitive, Color32, ColorImage, Mesh, Pos2, Rect, TextureId, TextureOptions, TexturesDelta, pos2,
};
use proptest::prelude::*;
use turnwright::app::Screen;
use turnwright::app::paint::{Canvas, Headless, Painter, picture_of};

const WIDTH: usize = 24;
const HEIGHT: usize = 70;
const BACKGROUND: Color32 = Color32::from_rgb(10, 20, 30);
/// The texture whose first texel is white, as in egui's font atlas.
const ATLAS: TextureId = TextureId::Managed(0);
const IMAGE: TextureId = TextureId::Managed(1);

/// A painter, and what it drew last.
struct Easel {
    painter: Painter,
    pixels: Vec<u32>,
    width: usize,
    holds_last: bool,
}

impl Easel {
    fn new() -> Self {
        Self::with_width(WIDTH)
    }

    fn with_width(width: usize) -> Self {
        let pixels = vec![0; width * HEIGHT];
        let mut easel = Self { painter: Painter::new(1), pixels, width, holds_last: false };
        easel
            .set(ATLAS, ImageDelta::full(ColorImage::filled([2, 2], Color32::WHITE), TextureOptions::LINEAR));
        easel
    }

    fn set(&mut self, id: TextureId, change: ImageDelta) {
        let mut delta = TexturesDelta::default();
        delta.push(id, change);
        self.painter.update_textures(&mut delta);
        assert!(delta.is_empty(), "egui asks for the changes to be drained");
    }

    fn draw(&mut self, meshes: &[Mesh]) {
        self.draw_clipped(meshes, Rect::EVERYTHING, 1.0);
    }

    fn draw_clipped(&mut self, meshes: &[Mesh], clip_rect: Rect, pixels_per_point: f32) {
        let primitives: Vec<_> = meshes
            .iter()
            .map(|mesh| ClippedPrimitive { clip_rect, primitive: Primitive::Mesh(mesh.clone()) })
            .collect();
        let canvas = Canvas {
            pixels: &mut self.pixels,
            width: self.width,
            height: HEIGHT,
            holds_last: self.holds_last,
        };
        self.painter.paint(canvas, pixels_per_point, &primitives, BACKGROUND);
    }

    fn pixel(&self, x: usize, y: usize) -> Color32 {
        let [alpha, red, green, blue] = self.pixels[y * self.width + x].to_be_bytes();
        assert_eq!(alpha, 255, "the window is opaque at {x}, {y}");
        Color32::from_rgb(red, green, blue)
    }

    /// The pixels that are not background: the box around them and how many they are.
    #[track_caller]
    fn check_covered(&self, expected: Rect, n_expected: usize) {
        let places = (0..HEIGHT).flat_map(|y| (0..WIDTH).map(move |x| (x, y)));
        let covered: Vec<_> = places.filter(|(x, y)| self.pixel(*x, *y) != BACKGROUND).collect();
        let bounds = covered.iter().fold(Rect::NOTHING, |bounds, (x, y)| {
            let (x, y) = (*x as f32, *y as f32);
            bounds.union(Rect::from_min_max(pos2(x, y), pos2(x + 1.0, y + 1.0)))
        });
        assert_eq!((bounds, covered.len()), (expected, n_expected));
    }
}

fn rect(left: f32, top: f32, right: f32, bottom: f32) -> Rect {
    Rect::from_min_max(pos2(left, top), pos2(right, bottom))
}

fn solid(rect: Rect, color: Color32) -> Mesh {
    let mut mesh = Mesh::with_texture(ATLAS);
    mesh.add_colored_rect(rect, color);
    mesh
}

/// Triangles through `corners`, a colour at each.
fn triangles(corners: &[(Pos2, Color32)], indices: &[u32]) -> Mesh {
    let vertices = corners.iter().map(|(pos, color)| Vertex { pos: *pos, uv: WHITE_UV, color: *color });
    Mesh { indices: indices.to_vec(), vertices: vertices.collect(), texture_id: ATLAS }
}

/// `source` over `below` in reals, rounded once.
fn blended(below: Color32, source: Color32) -> Color32 {
    let rest = 1.0 - f64::from(source.a()) / 255.0;
    let channel =
        |source: u8, below: u8| (f64::from(source) + f64::from(below) * rest).round().min(255.0) as u8;
    Color32::from_rgb(
        channel(source.r(), below.r()),
        channel(source.g(), below.g()),
        channel(source.b(), below.b()),
    )
}

#[test]
fn a_solid_rectangle_covers_the_pixels_whose_centres_it_holds() {
    let mut easel = Easel::new();
    easel.draw(&[solid(rect(3.0, 5.0, 10.0, 40.0), Color32::RED)]);
    easel.check_covered(rect(3.0, 5.0, 10.0, 40.0), 7 * 35);
    assert_eq!(easel.pixel(3, 5), Color32::RED);
    assert_eq!(easel.pixel(9, 39), Color32::RED);
    assert_eq!(easel.pixel(10, 39), BACKGROUND);
    // Centres at 3.5 and 8.5: the left and top edge belong to it, the right and lower do not.
    easel.draw(&[solid(rect(3.5, 3.5, 8.5, 8.5), Color32::RED)]);
    easel.check_covered(rect(3.0, 3.0, 8.0, 8.0), 25);
    easel.draw(&[solid(rect(3.6, 3.6, 4.4, 4.4), Color32::RED)]);
    easel.check_covered(Rect::NOTHING, 0);
}

#[test]
fn points_become_pixels_by_the_scale() {
    let mut easel = Easel::new();
    easel.draw_clipped(&[solid(rect(2.0, 4.0, 6.0, 8.0), Color32::RED)], rect(3.0, 0.0, 99.0, 7.5), 1.5);
    // The clip rectangle's edges are rounded: 4.5 and 11.25 pixels.
    easel.check_covered(rect(5.0, 6.0, 9.0, 11.0), 4 * 5);
}

#[test]
fn translucent_and_additive_colours_blend_by_the_formula() {
    let mut easel = Easel::new();
    for source in [
        Color32::from_rgba_premultiplied(100, 0, 50, 128),
        Color32::from_rgba_premultiplied(1, 1, 1, 1),
        Color32::from_rgba_premultiplied(250, 3, 90, 254),
        Color32::from_rgba_premultiplied(255, 100, 1, 0),
        Color32::TRANSPARENT,
    ] {
        easel.draw(&[solid(rect(0.0, 0.0, 8.0, 8.0), source), solid(rect(4.0, 0.0, 8.0, 8.0), source)]);
        let once = blended(BACKGROUND, source);
        assert_eq!(easel.pixel(1, 1), once, "{source:?}");
        assert_eq!(easel.pixel(5, 1), blended(once, source), "{source:?} twice");
    }
}

#[test]
fn meshes_are_drawn_in_order_and_clipped() {
    let mut easel = Easel::new();
    let below = solid(rect(0.0, 0.0, 20.0, 60.0), Color32::RED);
    let above = solid(rect(0.0, 0.0, 20.0, 60.0), Color32::GREEN);
    easel.draw_clipped(&[below, above], rect(2.0, 30.0, 7.0, 50.0), 1.0);
    easel.check_covered(rect(2.0, 30.0, 7.0, 50.0), 5 * 20);
    assert_eq!(easel.pixel(2, 30), Color32::GREEN);
}

#[test]
fn triangles_that_share_an_edge_leave_no_gap_and_overlap_nowhere() {
    let glass = Color32::from_rgba_premultiplied(60, 60, 60, 100);
    let once = blended(BACKGROUND, glass);
    let mut easel = Easel::new();
    // A fan around a point, at places off the grid, over three bands.
    for shift in [0.0, 0.125, 0.31, 0.5, 0.77] {
        let centre = pos2(11.0 + shift, 35.0 - shift);
        let mut corners = vec![(centre, glass)];
        corners.extend((0..7).map(|i| {
            let angle = i as f32 * std::f32::consts::TAU / 7.0 + shift;
            (centre + 10.0 * egui::vec2(angle.cos(), 3.0 * angle.sin()), glass)
        }));
        // Both directions, because egui sends both.
        let indices: Vec<u32> = (0..7)
            .flat_map(|i| if i % 2 == 0 { [0, 1 + i, 1 + (i + 1) % 7] } else { [0, 1 + (i + 1) % 7, 1 + i] })
            .collect();
        easel.draw(&[triangles(&corners, &indices)]);
        let n_covered = easel.pixels.iter().filter(|pixel| **pixel != 0xff0a_141e).count();
        assert!(n_covered > 500, "{n_covered} pixels");
        for y in 0..HEIGHT {
            for x in 0..WIDTH {
                let pixel = easel.pixel(x, y);
                assert!(pixel == BACKGROUND || pixel == once, "{pixel:?} at {x}, {y}, shift {shift}");
            }
        }
    }
}

#[test]
fn colours_run_straight_from_corner_to_corner() {
    let black_to_white = |t: f32| Color32::from_gray((t * 255.0).round() as u8);
    let corners = [
        (pos2(0.0, 0.0), Color32::BLACK),
        (pos2(20.0, 0.0), Color32::WHITE),
        (pos2(0.0, 60.0), Color32::BLACK),
        (pos2(20.0, 60.0), Color32::WHITE),
    ];
    let mut easel = Easel::new();
    easel.draw(&[triangles(&corners, &[0, 1, 2, 2, 1, 3])]);
    for y in [0, 31, 32, 59] {
        for x in 0..20 {
            let expected = black_to_white((x as f32 + 0.5) / 20.0);
            assert!(easel.pixel(x, y).r().abs_diff(expected.r()) <= 1, "{x}, {y}");
        }
    }
}

#[test]
fn images_are_copied_one_to_one_patched_and_stretched() {
    let gray = |value: usize| Color32::from_gray(value as u8);
    let mut easel = Easel::new();
    let image = ColorImage::new([4, 40], (0..160).map(gray).collect());
    easel.set(IMAGE, ImageDelta::full(image, TextureOptions::NEAREST));
    let place = |rect: Rect, tint: Color32| {
        let mut mesh = Mesh::with_texture(IMAGE);
        mesh.add_rect_with_uv(rect, Rect::from_min_max(Pos2::ZERO, pos2(1.0, 1.0)), tint);
        mesh
    };
    easel.draw(&[place(rect(5.0, 7.0, 9.0, 47.0), Color32::WHITE)]);
    for y in 0..40 {
        for x in 0..4 {
            assert_eq!(easel.pixel(5 + x, 7 + y), gray(y * 4 + x));
        }
    }
    // A patch in the middle, and a tint over all.
    let patch = ColorImage::filled([2, 2], Color32::WHITE);
    easel.set(IMAGE, ImageDelta::partial([1, 3], patch, TextureOptions::NEAREST));
    let tint = Color32::from_rgb(255, 128, 0);
    easel.draw(&[place(rect(5.0, 7.0, 9.0, 47.0), tint)]);
    assert_eq!(easel.pixel(6, 10), tint);
    assert_eq!(easel.pixel(7, 11), tint);
    assert_eq!(easel.pixel(8, 11), Color32::from_rgb(19, 10, 0));
    // Twice as wide: each column twice.
    easel.draw(&[place(rect(5.0, 7.0, 13.0, 47.0), Color32::WHITE)]);
    assert_eq!(easel.pixel(5, 7), gray(0));
    assert_eq!(easel.pixel(6, 7), gray(0));
    assert_eq!(easel.pixel(7, 7), gray(1));
    assert_eq!(easel.pixel(12, 46), gray(159));
}

#[test]
fn linear_images_mix_neighbours_when_stretched() {
    let mut easel = Easel::new();
    let image = ColorImage::new([2, 1], vec![Color32::BLACK, Color32::WHITE]);
    easel.set(IMAGE, ImageDelta::full(image, TextureOptions::LINEAR));
    let mut mesh = Mesh::with_texture(IMAGE);
    let uv = Rect::from_min_max(Pos2::ZERO, pos2(1.0, 1.0));
    mesh.add_rect_with_uv(rect(0.0, 0.0, 8.0, 8.0), uv, Color32::WHITE);
    easel.draw(&[mesh]);
    // Pixel centres in texels from the first texel's centre: -0.375, -0.125, 0.125, 0.375, ...
    let row: Vec<u8> = (0..8).map(|x| easel.pixel(x, 4).r()).collect();
    assert_eq!(row, [0, 0, 32, 96, 159, 223, 255, 255]);
}

#[test]
fn a_turned_image_and_an_upright_one_agree() {
    let mut easel = Easel::new();
    let image = ColorImage::new([8, 8], (0..64).map(|i| Color32::from_rgb(i * 4, 255 - i * 3, i)).collect());
    easel.set(IMAGE, ImageDelta::full(image, TextureOptions::LINEAR));
    let uv = Rect::from_min_max(Pos2::ZERO, pos2(1.0, 1.0));
    let mut upright = Mesh::with_texture(IMAGE);
    upright.add_rect_with_uv(rect(2.0, 20.0, 18.0, 44.0), uv, Color32::WHITE);
    easel.draw(&[upright.clone()]);
    let expected = easel.pixels.clone();
    // The same two triangles in an order that rectangles never have go the general way.
    upright.indices = vec![2, 0, 1, 1, 3, 2];
    easel.draw(&[upright]);
    for (i, (pixel, expected)) in easel.pixels.iter().zip(expected).enumerate() {
        for (a, b) in pixel.to_be_bytes().into_iter().zip(expected.to_be_bytes()) {
            assert!(a.abs_diff(b) <= 2, "{pixel:x} and {expected:x} at {}, {}", i % WIDTH, i / WIDTH);
        }
    }
}

#[test]
fn shapes_without_a_place_are_left_away_and_huge_ones_are_cut() {
    let mut easel = Easel::new();
    let at = |x: f32, y: f32| (pos2(x, y), Color32::RED);
    easel.draw(&[
        triangles(&[at(f32::NAN, 0.0), at(9.0, 0.0), at(0.0, 9.0)], &[0, 1, 2]),
        triangles(&[at(f32::INFINITY, 0.0), at(9.0, 0.0), at(0.0, 9.0)], &[0, 1, 2]),
        triangles(&[at(1.0, 1.0), at(5.0, 5.0), at(9.0, 9.0)], &[0, 1, 2]),
        triangles(&[at(1.0, 1.0)], &[0, 0, 7]),
        Mesh { texture_id: TextureId::Managed(99), ..solid(rect(0.0, 0.0, 9.0, 9.0), Color32::RED) },
    ]);
    easel.check_covered(Rect::NOTHING, 0);
    easel.draw(&[triangles(&[at(-1e9, -1e9), at(1e9, -1e9), at(0.0, 1e9)], &[0, 1, 2])]);
    easel.check_covered(rect(0.0, 0.0, WIDTH as f32, HEIGHT as f32), WIDTH * HEIGHT);
    let red_rect = solid(rect(-1e30, -1e30, 1e30, 4.0), Color32::RED);
    easel.draw(&[red_rect]);
    easel.check_covered(rect(0.0, 0.0, WIDTH as f32, 4.0), WIDTH * 4);
}

/// A bit of everything that a window draws.
struct Sampler;

impl Screen for Sampler {
    fn ui(&mut self, ui: &mut egui::Ui) {
        egui::CentralPanel::default().show(ui, |ui| {
            ui.heading("Spike at frame 12, 43.5°");
            ui.add(egui::Slider::new(&mut 0.3, 0.0..=1.0).text("Weight"));
            ui.add(egui::ProgressBar::new(0.4).desired_width(90.0));
            let (response, painter) = ui.allocate_painter(egui::vec2(200.0, 120.0), egui::Sense::hover());
            let rect = response.rect;
            painter.rect_filled(rect, 12.0, Color32::from_rgb(0x00, 0x72, 0xb2));
            painter.circle(rect.center(), 40.0, Color32::from_white_alpha(90), (3.0, Color32::YELLOW));
            let wave =
                (0..200).map(|i| rect.left_center() + egui::vec2(i as f32, 30.0 * (i as f32 * 0.1).sin()));
            painter.line(wave.collect(), (1.5, Color32::from_rgb(0xe6, 0x9f, 0x00)));
        });
    }

    fn title(&self) -> String {
        "Sampler".to_owned()
    }
}

#[test]
fn the_picture_is_the_same_for_one_two_and_four_threads() {
    let pictures = [1, 2, 4].map(|n_threads| {
        let mut headless = Headless::new(egui::vec2(300.0, 260.0), 1.25, n_threads);
        headless.settle(&mut Sampler);
        headless.picture()
    });
    assert_eq!((pictures[0].width(), pictures[0].height()), (375, 325));
    assert!(pictures[0] == pictures[1], "one thread and two differ");
    assert!(pictures[0] == pictures[2], "one thread and four differ");
}

#[test]
fn a_screen_can_be_drawn_without_a_display() {
    let picture = picture_of(|_| Box::new(Sampler), egui::vec2(300.0, 260.0), 1.0);
    crate::golden::check("gui_sampler", &picture);
}

/// Pixels across that make several tiles.
const WIDE: usize = 300;

#[test]
fn only_what_has_changed_is_drawn_again() {
    let (near, far) = (rect(2.0, 2.0, 30.0, 20.0), rect(200.0, 2.0, 220.0, 60.0));
    let mut easel = Easel::with_width(WIDE);
    easel.draw(&[solid(near, Color32::RED), solid(far, Color32::GREEN)]);
    // A trace on each, to see where the painter was.
    let (by_near, by_far) = (5 * WIDE + 5, 40 * WIDE + 210);
    let trace = |easel: &mut Easel| {
        easel.holds_last = true;
        (easel.pixels[by_near], easel.pixels[by_far]) = (7, 7);
    };
    trace(&mut easel);
    easel.draw(&[solid(near, Color32::BLUE), solid(far, Color32::GREEN)]);
    assert_eq!((easel.pixels[by_near], easel.pixels[by_far]), (0xff00_00ff, 7));
    // The same pixels in another order are hidden by one another in another way.
    trace(&mut easel);
    easel.draw(&[solid(far, Color32::GREEN), solid(near, Color32::BLUE)]);
    assert_eq!((easel.pixels[by_near], easel.pixels[by_far]), (7, 7), "they touch different tiles");
    // Another image, as of a letter that is new in the atlas.
    trace(&mut easel);
    easel.set(ATLAS, ImageDelta::full(ColorImage::filled([2, 2], Color32::WHITE), TextureOptions::LINEAR));
    easel.draw(&[solid(far, Color32::GREEN), solid(near, Color32::BLUE)]);
    assert_eq!((easel.pixels[by_near], easel.pixels[by_far]), (0xff00_00ff, 0xff00_ff00));
    // A canvas that does not hold the last frame is drawn whole.
    trace(&mut easel);
    easel.holds_last = false;
    easel.draw(&[solid(far, Color32::GREEN), solid(near, Color32::BLUE)]);
    assert_eq!((easel.pixels[by_near], easel.pixels[by_far]), (0xff00_00ff, 0xff00_ff00));
}

/// A rectangle, a triangle of three colours, or a tinted image, turned or not.
fn any_mesh() -> impl Strategy<Value = Mesh> {
    let place = || (-20.0..320.0_f32, -20.0..90.0_f32).prop_map(|(x, y)| pos2(x, y));
    let color =
        || any::<[u8; 4]>().prop_map(|[r, g, b, a]| Color32::from_rgba_unmultiplied(r, g, b, a.max(40)));
    let upright =
        (place(), place(), color()).prop_map(|(a, b, color)| solid(Rect::from_two_pos(a, b), color));
    let corners = prop::array::uniform3((place(), color()));
    let triangle = corners.prop_map(|corners| triangles(&corners, &[0, 1, 2]));
    let image = (place(), 1.0..80.0_f32, any::<bool>(), color());
    let image = image.prop_map(|(at, size, is_whole, tint)| {
        let at = if is_whole { at.round() } else { at };
        let mut mesh = Mesh::with_texture(IMAGE);
        let own = if is_whole { 3.0 } else { size };
        let uv = Rect::from_min_max(Pos2::ZERO, pos2(1.0, 1.0));
        mesh.add_rect_with_uv(Rect::from_min_size(at, egui::vec2(own, own)), uv, tint);
        mesh
    });
    prop_oneof![upright, triangle, image]
}

fn image(shift: u8) -> ImageDelta {
    let texels = (0..9).map(|i| Color32::from_rgb(i * 20 + shift, 200 - i * 9, shift)).collect();
    ImageDelta::full(ColorImage::new([3, 3], texels), TextureOptions::LINEAR)
}

proptest! {
    #![proptest_config(crate::strategies::same_cases(200))]

    /// Frames that differ in one mesh, in their order, or in an image: drawn over the one before, and drawn whole.
    #[test]
    fn what_was_drawn_before_leaves_no_trace(
        meshes in prop::collection::vec(any_mesh(), 1..12),
        changes in prop::collection::vec((any::<prop::sample::Index>(), any_mesh(), 0..4), 1..6),
    ) {
        let (mut over, mut whole) = (Easel::with_width(WIDE), Easel::with_width(WIDE));
        let mut meshes = meshes;
        for easel in [&mut over, &mut whole] {
            easel.set(IMAGE, image(0));
            easel.draw(&meshes);
        }
        over.holds_last = true;
        for (which, mesh, how) in changes {
            let which = which.index(meshes.len());
            match how {
                0 => meshes[which] = mesh,
                1 => meshes.push(mesh),
                2 => meshes.swap(which, 0),
                _ => {
                    let shift = mesh.vertices[0].color.r() / 8;
                    over.set(IMAGE, image(shift));
                    whole.set(IMAGE, image(shift));
                }
            }
            over.draw(&meshes);
            whole.draw(&meshes);
            prop_assert!(over.pixels == whole.pixels);
        }
    }
}

/// One letter, to see that glyphs land where they should.
struct Letter;

impl Screen for Letter {
    fn ui(&mut self, ui: &mut egui::Ui) {
        let font = egui::FontId::monospace(32.0);
        ui.painter().text(pos2(30.0, 30.0), egui::Align2::CENTER_CENTER, "I", font, Color32::WHITE);
    }

    fn title(&self) -> String {
        String::new()
    }
}

#[test]
fn a_letter_is_there_crisp_and_in_place() {
    let picture = picture_of(|_| Box::new(Letter), egui::vec2(60.0, 60.0), 1.0);
    let is_inked = |x: usize, y: usize| picture.pixel(x, y).is_some_and(|pixel| pixel[0] > 128);
    let inked: Vec<_> =
        (0..60).flat_map(|y| (0..60).map(move |x| (x, y))).filter(|(x, y)| is_inked(*x, *y)).collect();
    let (left, right) = (inked.iter().map(|p| p.0).min(), inked.iter().map(|p| p.0).max());
    let (top, bottom) = (inked.iter().map(|p| p.1).min(), inked.iter().map(|p| p.1).max());
    assert!(left >= Some(20) && right <= Some(40), "columns {left:?} to {right:?}");
    assert!(top >= Some(14) && bottom <= Some(46), "rows {top:?} to {bottom:?}");
    // The stem is one piece from top to bottom, in the middle.
    let stem = (top.unwrap()..=bottom.unwrap()).all(|y| is_inked(30, y) || is_inked(29, y));
    assert!(stem, "the stem has gaps");
    assert!(inked.iter().any(|(x, y)| picture.pixel(*x, *y) == Some([255; 4])), "no pixel is fully white");
}
