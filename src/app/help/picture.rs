//! The picture of an explanation: grey is before, colour is after.

use glam::{DVec3, Vec2};

use super::super::view_models::{CurveKey, CurveView, curve_set};
use super::example::{Example, blended_in, example};
use super::topic::Subject;
use crate::clip::Clip;
use crate::raster::{
    Bounds, Camera, Canvas, Figure, FigureLimb, FigureStyle, Image, Lens, SceneView, StraightView, Stroke,
    TextStyle, Theme, draw_text, render,
};
use crate::snag::{SnagKind, Unwatched};

/// Draws the picture of a subject, `size_px` wide and high, with `scale` pixels to a point.
pub fn help_picture(subject: Subject, size_px: [usize; 2], theme: &Theme, scale: f32) -> Image {
    match subject {
        Subject::Snag(SnagKind::Slide) => figures(&slide(), size_px, theme, scale),
        Subject::Retarget => figures(&carried(), size_px, theme, scale),
        _ => curves(subject, &example(subject), size_px, theme, scale),
    }
}

/// One of a clip's numbers over time; a gap where it is none.
fn points(clip: &Clip, of_file: Option<usize>) -> Vec<[f64; 2]> {
    let (view, line) = of_file.map_or((CurveView::PlaneAngles, 2), |line| (CurveView::FileNumbers, line));
    let key = CurveKey { joint: 0, view, limit: None };
    let Ok(set) = curve_set(clip, clip, &key, &Unwatched) else { return Vec::new() };
    let Some(line) = set.lines.get(line) else { return Vec::new() };
    (0..set.times.len())
        .map(|place| [set.times.time(place), f64::from(line.before.values()[place])])
        .collect()
}

fn curves(
    subject: Subject,
    example: &Example,
    [width, height]: [usize; 2],
    theme: &Theme,
    scale: f32,
) -> Image {
    let mut canvas = Canvas::new(width, height, theme.panel);
    let mut rows = vec![(points(&example.before, example.of_file), theme.before, 1.5)];
    if subject == Subject::Blend {
        rows.push((points(&blended_in(), None), theme.before, 1.5));
    }
    rows.push((points(&example.after, example.of_file), theme.planes[2], 2.2));
    let values = || {
        rows.iter().flat_map(|(points, ..)| points.iter().map(|[_, value]| *value)).filter(|v| v.is_finite())
    };
    let (low, high) = (values().fold(f64::INFINITY, f64::min), values().fold(f64::NEG_INFINITY, f64::max));
    // A loop goes on where the clip before has ended.
    let duration = example.before.duration_secs.max(example.after.duration_secs).max(1e-9);
    let pad = 10.0 * scale;
    let (left, right) = (pad, width as f32 - pad);
    // Room for the words below.
    let (top, bottom) = (pad, height as f32 - pad - 14.0 * scale);
    let place = |secs: f64, value: f64| {
        let across = (secs / duration) as f32;
        let up = ((value - low) / (high - low).max(1e-9)) as f32;
        Vec2::new(left + across * (right - left), bottom - up * (bottom - top))
    };
    if low < 0.0 && high > 0.0 {
        let zero = [place(0.0, 0.0), place(duration, 0.0)];
        canvas.flat_polyline(&zero, &Stroke::over(theme.grid, scale));
    }
    for (row, ink, thickness) in &rows {
        let stroke = Stroke::over(*ink, thickness * scale);
        for run in row.split(|[_, value]| !value.is_finite()) {
            let run: Vec<Vec2> = run.iter().map(|[secs, value]| place(*secs, *value)).collect();
            canvas.flat_polyline(&run, &stroke);
        }
    }
    if example.shows_keys {
        for (clip, ink, radius) in
            [(&example.before, theme.before, 1.6), (&example.after, theme.planes[2], 3.2)]
        {
            let Some(track) = clip.rotation(0) else { continue };
            let row = points(clip, None);
            for key in 0..track.times.len() {
                let secs = track.times.at(key);
                let nearest = row.iter().min_by(|a, b| (a[0] - secs).abs().total_cmp(&(b[0] - secs).abs()));
                if let Some([secs, value]) = nearest {
                    canvas.flat_dot(place(*secs, *value), radius * scale, ink);
                }
            }
        }
    }
    legend(&mut canvas.image, [("before", theme.before), ("after", theme.planes[2])], theme, scale);
    canvas.image
}

fn legend(image: &mut Image, entries: [(&str, crate::raster::Color); 2], theme: &Theme, scale: f32) {
    let top = image.height() as f32 - 16.0 * scale;
    let mut left = 10.0 * scale;
    for (words, ink) in entries {
        let (line, thickness) = ((12.0 * scale) as i32, (2.0 * scale).max(1.0) as i32);
        image.fill_rect(left as i32, (top + 6.0 * scale) as i32, line, thickness, ink);
        let style = TextStyle::words(11.0 * scale, theme.text_faint);
        let width = draw_text(image, words, Vec2::new(left + 16.0 * scale, top), &style);
        left += width + 30.0 * scale;
    }
}

/// Limbs before and after.
type Poses = [Vec<Vec<FigureLimb>>; 2];

fn figures(poses: &Poses, [width, height]: [usize; 2], theme: &Theme, scale: f32) -> Image {
    let points = poses.iter().flatten().flatten().flat_map(|limb| [limb.from, limb.to]);
    let bounds = Bounds::of_points(points).unwrap_or(Bounds { min: DVec3::ZERO, max: DVec3::ONE });
    let mut camera = Camera { lens: Lens::Orthographic, ..Camera::default() };
    camera.look_straight(StraightView::Xy);
    camera.fit(&bounds, width, height, 0.16);
    let mut view = SceneView::new(width, height, camera, *theme);
    view.scale = scale;
    for (poses, style) in poses.iter().zip([FigureStyle::Before, FigureStyle::After]) {
        view.figures.extend(poses.iter().map(|limbs| Figure::new(limbs.clone(), style)));
    }
    let mut image = render(&view);
    legend(&mut image, [("before", theme.before), ("after", theme.after)], theme, scale);
    image
}

fn chain(points: &[DVec3]) -> Vec<FigureLimb> {
    let limbs = points.windows(2).enumerate();
    limbs.map(|(joint, pair)| FigureLimb { from: pair[0], to: pair[1], joint }).collect()
}

/// A leg whose hip goes on over a foot that should stand: the stiff leg takes the foot along, the bent one leaves it.
fn slide() -> Poses {
    const UPPER: f64 = 0.5;
    const LOWER: f64 = 0.48;
    let poses = (0..3).map(|step| {
        let hip = DVec3::new(0.16 * f64::from(step), 0.93, 0.0);
        let slid = DVec3::new(0.12 * f64::from(step), 0.0, 0.0);
        let stands = DVec3::new(0.12, 0.0, 0.0);
        [slid, stands].map(|ankle| {
            // The knee lies where the two circles meet, in front (law of cosines).
            let way = ankle - hip;
            let far = way.length().min(UPPER + LOWER - 1e-3);
            let along = (UPPER * UPPER - LOWER * LOWER + far * far) / (2.0 * far);
            let out = (UPPER * UPPER - along * along).max(0.0).sqrt();
            let down = way / way.length();
            let knee = hip + down * along + DVec3::new(-down.y, down.x, 0.0) * out;
            chain(&[hip, knee, ankle, ankle + DVec3::X * 0.16])
        })
    });
    let (mut before, mut after) = (Vec::new(), Vec::new());
    for [slid, stands] in poses {
        before.push(slid);
        after.push(stands);
    }
    [before, after]
}

/// The same turns on limbs of other lengths.
fn carried() -> Poses {
    let pose = |at: f64, scale: [f64; 4]| {
        let mut points = vec![DVec3::new(at, 0.0, 0.0)];
        for (length, turn) in scale.into_iter().zip([1.9_f64, 1.2, 0.4, -0.3]) {
            let last = points[points.len() - 1];
            points.push(last + DVec3::new(turn.cos(), turn.sin(), 0.0) * length);
        }
        chain(&points)
    };
    [vec![pose(0.0, [0.5, 0.5, 0.4, 0.2])], vec![pose(1.1, [0.3, 0.35, 0.7, 0.35])]]
}

#[cfg(test)]
mod tests {
    use super::super::topic::topics;
    use super::*;

    #[test]
    fn every_picture_has_ink_of_both_before_and_after() {
        for topic in topics("") {
            let image = help_picture(topic.subject, [240, 130], &Theme::DARK, 1.0);
            let paper = image.pixel(1, 1).unwrap();
            let inked = image.pixels().iter().filter(|pixel| **pixel != paper).count();
            assert!(inked > 300, "{}: {inked} pixels", topic.title);
            assert_eq!(
                image,
                help_picture(topic.subject, [240, 130], &Theme::DARK, 1.0),
                "the same each time"
            );
        }
    }
}
