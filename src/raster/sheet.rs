//! Several pictures on one page: charts below a view, or one figure at several times side by side.

use glam::{DVec3, Vec2};

use crate::raster::camera::{Bounds, Camera};
use crate::raster::canvas::Canvas;
use crate::raster::chart::Area;
use crate::raster::figure::Figure;
use crate::raster::floor::Floor;
use crate::raster::image::Image;
use crate::raster::palette::Theme;
use crate::raster::scene_view::{SceneView, TipPath, render_into};
use crate::raster::text::{TextStyle, draw_text, elide};

/// A picture with a line of words above it.
#[derive(Clone, Debug)]
pub struct Tile {
    /// Written above; no line for it when empty.
    pub caption: String,
    /// The picture.
    pub image: Image,
}

/// Lays tiles on a page, row by row with `columns` to a row, below a title. `scale` is pixels per point.
///
/// A column is as wide as its widest tile and a row as high as its highest; a page is never larger than
/// [`Image::MAX_SIDE`].
pub fn compose(title: &str, tiles: &[Tile], columns: usize, theme: &Theme, scale: f32) -> Image {
    let columns = columns.clamp(1, tiles.len().max(1));
    let (margin, gap) = ((16.0 * scale).round() as usize, (12.0 * scale).round() as usize);
    let caption_height = (22.0 * scale).round() as usize;
    let caption_room =
        |row: &[Tile]| if row.iter().any(|tile| !tile.caption.is_empty()) { caption_height } else { 0 };
    let column_width = |column: usize| {
        tiles.iter().skip(column).step_by(columns).map(|tile| tile.image.width()).max().unwrap_or(0)
    };
    let widths: Vec<usize> = (0..columns).map(column_width).collect();
    let heights: Vec<usize> = tiles
        .chunks(columns)
        .map(|row| caption_room(row) + row.iter().map(|tile| tile.image.height()).max().unwrap_or(0))
        .collect();
    let title_height = if title.is_empty() { 0 } else { (34.0 * scale).round() as usize };
    let page_width = 2 * margin + widths.iter().sum::<usize>() + gap * (columns - 1);
    let page_height =
        2 * margin + title_height + heights.iter().sum::<usize>() + gap * heights.len().saturating_sub(1);

    let mut page = Image::new(page_width, page_height, theme.background);
    let inner_width = (page_width - 2 * margin) as f32;
    let title_style = TextStyle::words(22.0 * scale, theme.text);
    let corner = Vec2::new(margin as f32, margin as f32 - 2.0 * scale);
    draw_text(&mut page, &elide(title, &title_style, inner_width), corner, &title_style);
    let mut top = margin + title_height;
    for (row, height) in tiles.chunks(columns).zip(heights) {
        let mut left = margin;
        for (tile, width) in row.iter().zip(&widths) {
            let style = TextStyle::words(14.0 * scale, theme.text);
            let caption = elide(&tile.caption, &style, *width as f32);
            draw_text(&mut page, &caption, Vec2::new(left as f32, top as f32), &style);
            page.blit(&tile.image, left as i32, (top + caption_room(row)) as i32);
            left += width + gap;
        }
        top += height + gap;
    }
    page
}

/// One picture of a contact strip.
#[derive(Clone, Debug, PartialEq)]
pub struct Moment {
    /// Written above it: the time.
    pub caption: String,
    /// The poses at that time.
    pub figures: Vec<Figure>,
}

/// How a contact strip is drawn.
#[derive(Clone, Debug, PartialEq)]
pub struct StripStyle {
    /// Width of each picture, pixels.
    pub width: usize,
    /// Height of each picture, pixels.
    pub height: usize,
    /// Pixels per point.
    pub scale: f32,
    /// From where; target and distance are found for the poses.
    pub camera: Camera,
    /// Colours.
    pub theme: Theme,
    /// Where the figure faces, for the floor's arrow; none for no arrow.
    pub heading: DVec3,
    /// Paths drawn in every picture.
    pub tip_paths: Vec<TipPath>,
}

/// The pictures of one figure at several times.
///
/// All are equally large and equally high, so that poses can be compared and a jump is seen as a jump; the camera goes
/// along sideways. The floor stays where it is in the world.
pub fn contact_strip(moments: &[Moment], style: &StripStyle) -> Vec<Tile> {
    let boxes: Vec<Option<Bounds>> = moments
        .iter()
        .map(|moment| moment.figures.iter().filter_map(Figure::bounds).reduce(|a, b| a.union(&b)))
        .collect();
    let Some(all) = boxes.iter().flatten().copied().reduce(|a, b| a.union(&b)) else {
        return Vec::new();
    };
    let floor = Floor { heading: style.heading, ..Floor::under(&tallest(&boxes, &all)) };
    let mut canvas = Canvas::default();
    let mut tiles = Vec::with_capacity(moments.len());
    // The same box around every pose: as wide and deep as the widest and deepest, as high as all of them.
    let half = boxes.iter().flatten().fold(DVec3::ZERO, |half, own| half.max((own.max - own.min) / 2.0));
    for (moment, own) in moments.iter().zip(&boxes) {
        let own = own.unwrap_or(all);
        let middle = own.center();
        let seen = Bounds {
            min: (middle - half).with_y(all.min.y.min(floor.center.y)),
            max: (middle + half).with_y(all.max.y),
        };
        let mut camera = style.camera;
        camera.fit(&seen, style.width, style.height, 0.08);
        let mut scene = SceneView::new(style.width, style.height, camera, style.theme);
        scene.scale = style.scale;
        scene.floor = Some(floor.moved_under(middle));
        scene.figures.clone_from(&moment.figures);
        scene.tip_paths.clone_from(&style.tip_paths);
        render_into(&scene, &mut canvas);
        // The floor runs on beyond the picture: a thin frame says where the picture ends.
        Area::of(&canvas).outline(&mut canvas, style.scale.round().max(1.0), style.theme.grid);
        tiles.push(Tile { caption: moment.caption.clone(), image: canvas.image.clone() });
    }
    tiles
}

/// A box of the figure's own size, standing as low as any pose: the floor's step goes with the figure and not with
/// the way it walks.
fn tallest(boxes: &[Option<Bounds>], all: &Bounds) -> Bounds {
    let largest =
        boxes.iter().flatten().max_by(|a, b| a.size().total_cmp(&b.size())).copied().unwrap_or(*all);
    Bounds { min: largest.min.with_y(all.min.y), max: largest.max }
}

/// A canvas for a chart of this size, with the theme's background.
pub fn chart_canvas(width: usize, height: usize, theme: &Theme) -> (Canvas, Area) {
    let canvas = Canvas::new(width, height, theme.background);
    let area = Area::of(&canvas);
    (canvas, area)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::raster::figure::{FigureLimb, FigureStyle};
    use crate::raster::palette::Color;

    fn tile(width: usize, height: usize, hex: u32) -> Tile {
        Tile { caption: String::new(), image: Image::new(width, height, Color::rgb(hex)) }
    }

    #[test]
    fn tiles_stand_in_columns_without_overlap() {
        let tiles = [tile(30, 20, 0xFF_00_00), tile(10, 40, 0x00_FF_00), tile(20, 5, 0x00_00_FF)];
        let page = compose("", &tiles, 2, &Theme::DARK, 1.0);
        assert_eq!((page.width(), page.height()), (16 + 30 + 12 + 10 + 16, 16 + 40 + 12 + 5 + 16));
        let count =
            |color: Color| page.pixels().iter().filter(|pixel| **pixel == color.premultiplied()).count();
        assert_eq!(count(Color::rgb(0xFF_00_00)), 600);
        assert_eq!(count(Color::rgb(0x00_FF_00)), 400);
        assert_eq!(count(Color::rgb(0x00_00_FF)), 100);
        assert_eq!(page.pixel(16, 16 + 40 + 12), Some([0, 0, 255, 255]));
        let bare = compose("", &[], 3, &Theme::DARK, 1.0);
        assert_eq!((bare.width(), bare.height()), (32, 32));
    }

    #[test]
    fn a_strip_follows_sideways_and_keeps_height() {
        let moment = |shift: DVec3| {
            let limb = FigureLimb { from: shift, to: shift + DVec3::Y, joint: 0 };
            Moment { caption: "t".to_owned(), figures: vec![Figure::new(vec![limb], FigureStyle::After)] }
        };
        let style = StripStyle {
            width: 80,
            height: 120,
            scale: 1.0,
            camera: Camera { yaw_rad: 0.0, pitch_rad: 0.0, ..Camera::default() },
            theme: Theme::LIGHT,
            heading: DVec3::ZERO,
            tip_paths: Vec::new(),
        };
        let moments = [DVec3::ZERO, DVec3::X * 50.0, DVec3::Y * 0.5].map(moment);
        let tiles = contact_strip(&moments, &style);
        let rows_of_figure = |tile: &Tile| -> Vec<usize> {
            let is_figure = |y: &usize| {
                tile.image.pixel(40, *y).is_some_and(|[r, g, b, _]| r.min(b) > g.saturating_add(20))
            };
            (0..120).filter(is_figure).collect()
        };
        let [ground, far, high] = [0, 1, 2].map(|i| rows_of_figure(&tiles[i]));
        assert!(ground.len() > 50, "{}", ground.len());
        assert_eq!(ground, far);
        assert!(high[0] + 20 < ground[0]);
        assert!(contact_strip(&[], &style).is_empty());
    }
}
