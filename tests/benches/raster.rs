//! How long is one frame of the skeleton view? `cargo bench --no-default-features --bench raster` prints the median
//! of many; with `--test` each picture is drawn once, so that the bench keeps working.
#![expect(clippy::print_stdout, reason = "the numbers are what a bench is for")]

use std::hint::black_box;
use std::time::Instant;

use glam::DVec3;
use turnwright::raster::{Bounds, Camera, Canvas, Figure, FigureLimb, FigureStyle, Floor, SceneView, Theme};
use turnwright::raster::{TipPath, render_into};

/// A bush of 64 limbs that fills the picture and crosses itself.
fn limbs() -> Vec<FigureLimb> {
    (0..64_usize)
        .map(|i| {
            let at = |k: usize| {
                let turn = k as f64 * 2.4;
                DVec3::new(turn.cos() * 0.8, 0.1 + k as f64 * 0.028, turn.sin() * 0.8)
            };
            FigureLimb { from: at(i), to: at(i).lerp(at(i + 1), 0.35), joint: i }
        })
        .collect()
}

fn scene(width: usize, height: usize) -> SceneView {
    let bounds = Bounds { min: DVec3::new(-0.8, 0.0, -0.8), max: DVec3::new(0.8, 1.9, 0.8) };
    let mut camera = Camera::default();
    camera.fit(&bounds, width, height, 0.05);
    let mut scene = SceneView::new(width, height, camera, Theme::DARK);
    scene.figures.push(Figure::new(limbs(), FigureStyle::After));
    scene
}

/// A figure of 65 joints that fills the height of the picture: a trunk, and limbs that end in five fingers or toes each.
fn person() -> Vec<FigureLimb> {
    let mut limbs = Vec::new();
    let mut chain = |from: DVec3, step: DVec3, count: usize| -> DVec3 {
        let mut at = from;
        for _ in 0..count {
            limbs.push(FigureLimb { from: at, to: at + step, joint: limbs.len() });
            at += step;
        }
        at
    };
    let hips = DVec3::new(0.0, 0.95, 0.0);
    let neck = chain(hips, DVec3::Y * 0.11, 5);
    chain(neck, DVec3::Y * 0.1, 3);
    for side in [-1.0, 1.0] {
        let hand = chain(neck, DVec3::new(0.16 * side, -0.05, 0.06), 4);
        let foot = chain(hips, DVec3::new(0.05 * side, -0.3, 0.02), 3);
        for finger in 0..5 {
            let spread = f64::from(finger) * 0.02 - 0.04;
            chain(hand, DVec3::new(0.03 * side, spread, 0.01), 3);
            chain(foot, DVec3::new(spread, -0.005, 0.03), if finger < 3 { 2 } else { 1 });
        }
    }
    limbs.truncate(65);
    limbs
}

fn main() {
    let runs = if std::env::args().any(|argument| argument == "--test") { 1 } else { 300 };
    for (width, height) in [(900, 600), (1920, 1080)] {
        let bare = scene(width, height);
        measure(
            &format!("nothing, {width} × {height}"),
            &SceneView { figures: Vec::new(), ..bare.clone() },
            runs,
        );
        measure(&format!("64 limbs, {width} × {height}"), &bare, runs);
        let mut full = bare;
        full.floor = Some(Floor::under(&Bounds { min: DVec3::NEG_ONE, max: DVec3::ONE }));
        measure(&format!("64 limbs, floor and shadows, {width} × {height}"), &full, runs);
        full.figures.push(Figure::new(limbs(), FigureStyle::Before));
        let points = (0..300).map(|i| DVec3::new(f64::from(i) * 0.005 - 0.7, 1.5, 0.9)).collect();
        full.tip_paths.push(TipPath { points, current: Some(150), color: Theme::DARK.planes[0] });
        measure(&format!("the same with the source and a tip path, {width} × {height}"), &full, runs);
        full.figures = vec![Figure::new(person(), FigureStyle::After)];
        full.tip_paths.clear();
        measure(&format!("a person of 65 joints, floor and shadows, {width} × {height}"), &full, runs);
    }
}

fn measure(name: &str, scene: &SceneView, runs: usize) {
    let mut canvas = Canvas::default();
    render_into(scene, &mut canvas);
    let mut millis: Vec<f64> = (0..runs)
        .map(|_| {
            let start = Instant::now();
            render_into(black_box(scene), black_box(&mut canvas));
            start.elapsed().as_secs_f64() * 1e3
        })
        .collect();
    millis.sort_by(f64::total_cmp);
    let paper = scene.theme.background.premultiplied();
    let inked = canvas.image.pixels().iter().filter(|pixel| **pixel != paper).count();
    println!("{name}, {inked} pixels drawn: median {:.2} ms, best {:.2} ms", millis[runs / 2], millis[0]);
}
