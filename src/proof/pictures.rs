//! The pictures of a proof sheet: turn maps before and after, and the skeleton where it changed most.

use crate::clip::Clip;
use crate::raster::{
    Camera, Canvas, Figure, FigureStyle, Girth, Image, ImageError, MapRow, Moment, SnagMark, StripStyle,
    Theme, TurnMap, chart_canvas, compose, contact_strip, draw_turn_map, full_scale, limbs_of_skeleton,
    turn_map_height, turn_rates,
};

use super::measure::Measurement;
use super::sheet::{FoundSnag, SheetPicture};

/// The most rows of a turn map on a sheet; of larger skeletons the joints that change most are shown.
const MOST_ROWS: usize = 40;
/// The most moments of the contact strip.
const MOST_MOMENTS: usize = 5;
/// Moments closer than this show the same, seconds.
const LEAST_GAP_SECS: f64 = 0.15;
/// Changes below this are rounding of files, radians.
const ROUNDING_RAD: f64 = 1.75e-5;
/// Width of the pictures in pixels: twice the width of the page's column at its half size.
const WIDTH: usize = 1120;

/// The pictures of one clip.
///
/// # Errors
/// When a picture cannot be encoded.
pub(super) fn pictures(
    clips: [&Clip; 2],
    measurement: &Measurement,
    snags: [&[FoundSnag]; 2],
) -> Result<Vec<SheetPicture>, ImageError> {
    let mut pictures = Vec::new();
    let maps = turn_maps(clips, measurement, snags);
    pictures.push(SheetPicture {
        title: "Turn maps".to_owned(),
        caption: format!(
            "A row for each joint, time across, colour for the turn rate on one scale up to {:.0}° a second; the letters mark snags.",
            maps[0].full_scale
        ),
        light_png: draw_maps(&maps, &Theme::LIGHT).encode_png()?,
        dark_png: draw_maps(&maps, &Theme::DARK).encode_png()?,
    });
    let moments = moments(clips, measurement);
    if !moments.is_empty() {
        pictures.push(SheetPicture {
            title: "Where it changed most".to_owned(),
            caption: "Thin and grey before, solid after.".to_owned(),
            light_png: draw_moments(&moments, Theme::LIGHT).encode_png()?,
            dark_png: draw_moments(&moments, Theme::DARK).encode_png()?,
        });
    }
    Ok(pictures)
}

/// Before and after, rows and scale alike.
fn turn_maps(clips: [&Clip; 2], measurement: &Measurement, snags: [&[FoundSnag]; 2]) -> [TurnMap; 2] {
    let turning = |joint: &&super::JointMeasure| {
        clips[0].rotation(joint.before_joint).is_some() || clips[1].rotation(joint.after_joint).is_some()
    };
    let mut joints: Vec<_> = measurement.joints.iter().filter(turning).collect();
    if joints.len() > MOST_ROWS {
        joints.sort_by(|a, b| b.change.value.total_cmp(&a.change.value));
        joints.truncate(MOST_ROWS);
        joints.sort_by_key(|joint| joint.before_joint);
    }
    let times: Vec<f64> = (0..clips[0].grid.count()).map(|frame| clips[0].grid.time(frame)).collect();
    let rows = [0, 1].map(|side: usize| -> Vec<MapRow> {
        let mut playing = clips[side].playing(&times, None);
        joints
            .iter()
            .map(|joint| MapRow {
                name: joint.label.clone(),
                values: turn_rates(&mut playing, [joint.before_joint, joint.after_joint][side], &times),
                marks: snags[side]
                    .iter()
                    .filter(|snag| snag.joint == joint.label)
                    .map(|snag| SnagMark {
                        first_secs: snag.secs[0],
                        last_secs: snag.secs[1],
                        letter: snag.kind.letter(),
                    })
                    .collect(),
            })
            .collect()
    });
    let scale = full_scale(rows.iter().flatten().map(|row| &row.values[..]));
    let last = clips[0].grid.time(clips[0].grid.count().saturating_sub(1));
    let mut titles = ["Before", "After"].into_iter();
    rows.map(|rows| TurnMap {
        title: titles.next().unwrap_or_default().to_owned(),
        rows,
        time_secs: [0.0, last],
        full_scale: scale,
        unit: "°/s".to_owned(),
        playhead_secs: None,
        chosen: None,
    })
}

fn draw_maps(maps: &[TurnMap; 2], theme: &Theme) -> Image {
    const GAP: f32 = 12.0;
    let height = turn_map_height(&maps[0], 1.0);
    let (mut canvas, area): (Canvas, _) = chart_canvas(WIDTH, (2.0 * height + GAP) as usize, theme);
    let upper = area.inset(8.0, 6.0, 8.0, height + GAP);
    let lower = area.inset(8.0, height + GAP, 8.0, 6.0);
    draw_turn_map(&mut canvas, upper, &maps[0], theme, 1.0);
    draw_turn_map(&mut canvas, lower, &maps[1], theme, 1.0);
    canvas.image
}

/// The times at which joints changed most, each with both poses.
fn moments(clips: [&Clip; 2], measurement: &Measurement) -> Vec<Moment> {
    let mut worst: Vec<_> =
        measurement.joints.iter().filter(|joint| joint.change.value > ROUNDING_RAD).collect();
    worst.sort_by(|a, b| b.change.value.total_cmp(&a.change.value));
    let mut chosen: Vec<(f64, &super::JointMeasure)> = Vec::new();
    for joint in worst {
        let is_new = chosen.iter().all(|(secs, _)| (secs - joint.change.at_secs).abs() >= LEAST_GAP_SECS);
        if is_new && chosen.len() < MOST_MOMENTS {
            chosen.push((joint.change.at_secs, joint));
        }
    }
    chosen.sort_by(|a, b| a.0.total_cmp(&b.0));
    let girths = clips.map(|clip| Girth::of_skeleton(&clip.skeleton));
    let figure = |side: usize, secs: f64, style| {
        let clip = clips[side];
        let limbs = limbs_of_skeleton(&clip.skeleton, &clip.world_at(secs));
        Figure { girth: girths[side], ..Figure::new(limbs, style) }
    };
    chosen
        .into_iter()
        .map(|(secs, joint)| Moment {
            caption: format!("{secs:.2} s, frame {}  {}", clips[0].grid.frame(secs), joint.label),
            figures: vec![figure(1, secs, FigureStyle::After), figure(0, secs, FigureStyle::Before)],
        })
        .collect()
}

fn draw_moments(moments: &[Moment], theme: Theme) -> Image {
    let width = (WIDTH - 32 - 12 * (moments.len() - 1)) / moments.len();
    let style = StripStyle {
        width: width.min(340),
        height: 340,
        scale: 1.0,
        camera: Camera::default(),
        theme,
        heading: glam::DVec3::ZERO,
        tip_paths: Vec::new(),
    };
    compose("", &contact_strip(moments, &style), moments.len(), &theme, 1.0)
}
