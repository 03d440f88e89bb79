//! A whole clip on one page: the figure at some times, above the turn map with its snags.

use glam::{DVec3, Vec2};

use crate::clip::{Clip, Playing, turns_between};
use crate::raster::camera::Camera;
use crate::raster::canvas::Canvas;
use crate::raster::chart::{Area, SMALL, SnagMark, draw_letter};
use crate::raster::figure::{Figure, FigureStyle, Girth, limbs_of_skeleton};
use crate::raster::image::Image;
use crate::raster::palette::Theme;
use crate::raster::sheet::{Moment, StripStyle, contact_strip};
use crate::raster::text::{TextStyle, draw_text, draw_text_centered, elide, text_width};
use crate::raster::turn_map::{KEY_MIDDLE, MapRow, TurnMap, draw_turn_map, full_scale, turn_map_height};
use crate::snag::{Snag, SnagKind};

/// The pose of a clip at a time.
pub fn figure_of_clip(clip: &Clip, time_secs: f64, style: FigureStyle) -> Figure {
    let limbs = limbs_of_skeleton(&clip.skeleton, &clip.world_at(time_secs));
    Figure { girth: Girth::of_skeleton(&clip.skeleton), ..Figure::new(limbs, style) }
}

/// How fast each listed joint turns at each frame, degrees a second, with the snags of `snags` on their rows.
///
/// The rate at a frame is the turn from the frame before, by the short way; the first frame has the second one's. A
/// frame whose rotation is broken has none.
pub fn turn_rate_rows(clip: &Clip, snags: &[Snag]) -> Vec<MapRow> {
    let times: Vec<f64> = (0..clip.grid.count()).map(|frame| clip.grid.time(frame)).collect();
    let mut playing = clip.playing(&times, None);
    clip.skeleton
        .listed()
        .map(|joint| MapRow {
            name: clip.skeleton.label(joint).to_owned(),
            values: turn_rates(&mut playing, joint, &times),
            marks: marks_of_joint(snags, joint),
        })
        .collect()
}

/// How fast a joint turns at each of `times_secs`, degrees a second: the turn from the time before, by the short way; the first has
/// what the second has. What is broken has none, and a joint without keys stands still.
pub fn turn_rates(playing: &mut Playing<'_>, joint: usize, times_secs: &[f64]) -> Vec<f32> {
    if playing.clip().rotation(joint).is_none_or(|track| track.times.is_empty()) {
        return vec![0.0; times_secs.len()];
    }
    let turns = turns_between(&playing.rotations(joint));
    let mut rates = Vec::with_capacity(times_secs.len());
    for (turn, secs) in turns.into_iter().zip(times_secs.windows(2)) {
        let rate = (turn / (secs[1] - secs[0])).to_degrees();
        rates.push(if rate.is_finite() { rate as f32 } else { f32::NAN });
    }
    if !times_secs.is_empty() {
        rates.insert(0, rates.first().copied().unwrap_or(0.0));
    }
    rates
}

fn marks_of_joint(snags: &[Snag], joint: usize) -> Vec<SnagMark> {
    let own = snags.iter().filter(|snag| snag.joint == joint);
    let mut marks: Vec<SnagMark> = own
        .map(|snag| SnagMark {
            first_secs: snag.first_secs,
            last_secs: snag.last_secs,
            letter: snag.kind.letter(),
        })
        .collect();
    marks.sort_by(|a, b| a.first_secs.total_cmp(&b.first_secs));
    marks
}

/// `count` times spread evenly over a clip, each in the middle of its share, so that neither end is wasted on a rest
/// pose. Seconds.
pub fn spread_times(clip: &Clip, count: usize) -> Vec<f64> {
    let share = clip.duration_secs / count.max(1) as f64;
    (0..count).map(|i| clip.grid.time(clip.grid.frame((i as f64 + 0.5) * share))).collect()
}

/// What a page shows of a clip.
#[derive(Clone, Debug)]
pub struct ClipPage<'a> {
    /// Written at the top.
    pub title: String,
    /// The clip: the result where there is one.
    pub clip: &'a Clip,
    /// The source of the result. Its poses are drawn thin and grey, and the turn map is the source's: there one sees
    /// what was wrong.
    pub before: Option<&'a Clip>,
    /// Snags of the source, or of the clip where there is none.
    pub snags: &'a [Snag],
    /// Times of the figures, seconds.
    pub times_secs: Vec<f64>,
    /// Width of the page, pixels.
    pub width: usize,
    /// Height of the page, pixels.
    pub height: usize,
    /// Pixels per point.
    pub scale: f32,
    /// Colours.
    pub theme: Theme,
    /// From where.
    pub camera: Camera,
}

/// Below this height, points, a page has room for its figures alone.
const LEAST_HEIGHT_WITH_MAP: f32 = 330.0;

/// The page of a clip, exactly as large as asked for.
pub fn clip_page(page: &ClipPage<'_>) -> Image {
    let mut canvas = Canvas::new(page.width, page.height, page.theme.background);
    let scale = page.scale;
    let margin = 14.0 * scale;
    let mut area = Area::of(&canvas).inset(margin, margin, margin, margin);
    if !page.title.is_empty() {
        let style = TextStyle::words(20.0 * scale, page.theme.text);
        let title = elide(&page.title, &style, area.width);
        draw_text(&mut canvas.image, &title, Vec2::new(area.left, area.top - 3.0 * scale), &style);
        area = area.inset(0.0, 28.0 * scale, 0.0, 0.0);
    }
    let has_map =
        canvas.height() as f32 >= LEAST_HEIGHT_WITH_MAP * scale && page.clip.skeleton.listed().count() > 0;
    let map = has_map.then(|| page_map(page));
    let map_height = map.as_ref().map_or(0.0, |map| turn_map_height(map, scale).min(area.height * 0.52));
    let gap = if has_map { 12.0 * scale } else { 0.0 };
    draw_figures(&mut canvas, area.inset(0.0, 0.0, 0.0, map_height + gap), page);
    if let Some(map) = map {
        let below = area.inset(0.0, area.height - map_height, 0.0, 0.0);
        draw_turn_map(&mut canvas, below, &map, &page.theme, scale);
        draw_letters(&mut canvas, &below, page);
    }
    canvas.image
}

/// What the letters stand for, at the right end of the line of the colour key; as many as there is room for.
fn draw_letters(canvas: &mut Canvas, map: &Area, page: &ClipPage<'_>) {
    let scale = page.scale;
    let style = TextStyle::words(SMALL * scale, page.theme.text_faint);
    let (box_size, y) = (13.0 * scale, map.bottom() - KEY_MIDDLE * scale);
    let mut right = map.right() - 8.0 * scale;
    let kinds =
        SnagKind::ALL.into_iter().rev().filter(|kind| page.snags.iter().any(|snag| snag.kind == *kind));
    for kind in kinds {
        let left = right - text_width(kind.name(), &style) - 5.0 * scale - box_size;
        if left < map.left + map.width * 0.5 {
            break;
        }
        draw_letter(canvas, kind.letter(), Vec2::new(left + box_size / 2.0, y), box_size, page.theme.snag);
        let name_at = Vec2::new(left + box_size + 5.0 * scale, y);
        draw_text_centered(&mut canvas.image, kind.name(), name_at, &style);
        right = left - 14.0 * scale;
    }
}

fn page_map(page: &ClipPage<'_>) -> TurnMap {
    let clip = page.before.unwrap_or(page.clip);
    let rows = turn_rate_rows(clip, page.snags);
    let scale = full_scale(rows.iter().map(|row| &row.values[..]));
    TurnMap {
        title: match page.before {
            Some(_) => "Turn rate of each joint in the source, and its snags".to_owned(),
            None => "Turn rate of each joint".to_owned(),
        },
        rows,
        time_secs: [0.0, clip.grid.time(clip.grid.count().saturating_sub(1))],
        full_scale: scale,
        unit: "°/s".to_owned(),
        playhead_secs: None,
        chosen: None,
    }
}

/// The figures in equal pictures, each with its time, in as many rows as make them largest.
fn draw_figures(canvas: &mut Canvas, area: Area, page: &ClipPage<'_>) {
    let count = page.times_secs.len();
    if count == 0 {
        return;
    }
    let scale = page.scale;
    let layout = TileLayout { gap: 8.0 * scale, caption: 20.0 * scale };
    let (columns, [width, height]) = layout.fit(count, [area.width, area.height]);
    let girths = [page.clip, page.before.unwrap_or(page.clip)].map(|clip| Girth::of_skeleton(&clip.skeleton));
    let pose = |clip: &Clip, girth: Girth, secs: f64, style: FigureStyle| {
        let limbs = limbs_of_skeleton(&clip.skeleton, &clip.world_at(secs));
        Figure { girth, ..Figure::new(limbs, style) }
    };
    let moments: Vec<Moment> = page
        .times_secs
        .iter()
        .map(|&secs| {
            let after = pose(page.clip, girths[0], secs, FigureStyle::After);
            let before = page.before.map(|clip| pose(clip, girths[1], secs, FigureStyle::Before));
            let caption = format!("{secs:.2} s, frame {}", page.clip.grid.frame(secs));
            Moment { caption, figures: std::iter::once(after).chain(before).collect() }
        })
        .collect();
    let style = StripStyle {
        width: width as usize,
        height: height as usize,
        scale,
        camera: page.camera,
        theme: page.theme,
        heading: DVec3::ZERO,
        tip_paths: Vec::new(),
    };
    let words = TextStyle::words(13.0 * scale, page.theme.text);
    for (i, tile) in contact_strip(&moments, &style).iter().enumerate() {
        let left = area.left + (i % columns) as f32 * (width + layout.gap);
        let top = area.top + (i / columns) as f32 * (height + layout.caption + layout.gap);
        let caption = elide(&tile.caption, &words, width);
        draw_text(&mut canvas.image, &caption, Vec2::new(left, top), &words);
        canvas.image.blit(&tile.image, left as i32, (top + layout.caption) as i32);
    }
}

/// How pictures share an area, pixels.
#[derive(Clone, Copy, Debug)]
struct TileLayout {
    /// Between neighbours.
    gap: f32,
    /// Above each, for its words.
    caption: f32,
}

impl TileLayout {
    /// Columns and tile size with the largest figures for so many tiles: for each number of columns a tile is what is
    /// left, and a figure that stands upright needs the smaller of its height and five thirds of its width.
    fn fit(self, count: usize, [width, height]: [f32; 2]) -> (usize, [f32; 2]) {
        let tile = |columns: usize| {
            let rows = count.div_ceil(columns);
            let each = |room: f32, count: usize| (room - self.gap * (count - 1) as f32) / count as f32;
            [each(width, columns).floor().max(1.0), (each(height, rows) - self.caption).floor().max(1.0)]
        };
        let worth = |columns: usize| {
            let [width, height] = tile(columns);
            (width * 5.0 / 3.0).min(height)
        };
        // Of equal ones the fewest columns, whose tiles are the widest.
        let columns = (1..=count.max(1)).rev().max_by(|&a, &b| worth(a).total_cmp(&worth(b))).unwrap_or(1);
        (columns, tile(columns))
    }
}

#[cfg(test)]
mod tests {
    use std::sync::Arc;

    use super::*;
    use crate::clip::{FrameGrid, JointTracks, RotationTrack, Times};
    use crate::rotor::{Bivector, Rotor};
    use crate::skeleton::{Joint, JointKind, Skeleton, Transform};

    /// One joint that turns by 3° a frame in plane xy, 30 frames a second.
    fn clip() -> Clip {
        let joint = Joint {
            name: "boom".to_owned(),
            number: 0,
            parent: None,
            rest: Transform::IDENTITY,
            kind: JointKind::Joint,
            tips: vec![DVec3::X],
        };
        let turn = |i: i32| {
            Rotor::from_plane_angles(Bivector { yz: 0.0, zx: 0.0, xy: f64::from(3 * i).to_radians() })
        };
        let keys: Vec<Rotor> = (0..=30).map(turn).collect();
        let grid = FrameGrid::even(30.0, 1.0);
        let times: Times = grid.times.clone();
        let track = RotationTrack::from_rotors(times, keys);
        Clip {
            name: "swing".to_owned(),
            skeleton: Arc::new(Skeleton::new(vec![joint]).unwrap()),
            joints: vec![Arc::new(JointTracks { rotation: Some(track), ..JointTracks::default() })],
            grid,
            duration_secs: 1.0,
        }
    }

    #[test]
    fn rates_are_degrees_a_second() {
        let rows = turn_rate_rows(&clip(), &[]);
        assert_eq!((rows.len(), rows[0].name.as_str(), rows[0].values.len()), (1, "boom", 31));
        for rate in &rows[0].values {
            assert!((rate - 90.0).abs() < 1e-3, "{rate}");
        }
    }

    #[test]
    fn times_are_frames_in_the_middle_of_their_shares() {
        let found = spread_times(&clip(), 2);
        assert!((found[0] - 8.0 / 30.0).abs() < 1e-9 || (found[0] - 7.0 / 30.0).abs() < 1e-9, "{found:?}");
        assert!((0.7..0.8).contains(&found[1]), "{found:?}");
        assert!(spread_times(&clip(), 0).is_empty());
    }

    #[test]
    fn tiles_share_the_area_without_leaving_it() {
        let layout = TileLayout { gap: 8.0, caption: 20.0 };
        for (count, size, expected) in [
            (1, [800.0, 600.0], 1),
            (8, [1600.0, 450.0], 8),
            (3, [1600.0, 500.0], 3),
            (4, [400.0, 1200.0], 2),
            (9, [900.0, 900.0], 5),
        ] {
            let (columns, [width, height]) = layout.fit(count, size);
            assert_eq!(columns, expected, "{count} on {size:?}");
            let rows = count.div_ceil(columns) as f32;
            assert!(columns as f32 * (width + 8.0) - 8.0 <= size[0]);
            assert!(rows * (height + 28.0) - 8.0 <= size[1]);
        }
    }

    #[test]
    fn a_page_is_exactly_as_large_as_asked_for() {
        let clip = clip();
        for (width, height, count) in [(640, 480, 4), (200, 100, 1), (3, 2, 5), (400, 400, 0)] {
            let page = ClipPage {
                title: "swing".to_owned(),
                clip: &clip,
                before: Some(&clip),
                snags: &[],
                times_secs: spread_times(&clip, count),
                width,
                height,
                scale: 1.0,
                theme: Theme::LIGHT,
                camera: Camera::default(),
            };
            let image = clip_page(&page);
            assert_eq!((image.width(), image.height()), (width, height));
        }
    }
}
