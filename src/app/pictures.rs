//! Pictures that our own rasteriser makes: the skeleton view and the turn map. Kept until what they show changes.

use std::collections::BTreeSet;
use std::sync::Arc;

use egui::{ColorImage, Context, Rect, TextureHandle, TextureOptions, pos2};

use crate::clip::Clip;
use crate::limit::JointLimit;
use crate::raster::{Camera, Canvas, SceneView, render_into};
use crate::skeleton::LocalPose;

use super::panels::{Columns, CurvePress, DistanceKey};
use super::session::{Disc, SpaceHabits};
use super::view_models::{
    CarryEye, Drag, FaintFigure, FigureView, HandTurns, HeatMap, LimitRooms, MapRow, Memo, Stage, Swept,
    TimeWindow, Trail,
};

/// A texture and the key of what is on it.
pub(crate) struct Picture<K> {
    key: Option<K>,
    texture: Option<TextureHandle>,
}

impl<K> Default for Picture<K> {
    fn default() -> Self {
        Self { key: None, texture: None }
    }
}

impl<K> std::fmt::Debug for Picture<K> {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Picture").field("is_made", &self.texture.is_some()).finish_non_exhaustive()
    }
}

/// A piece of a picture that is drawn anew, and where its top left corner goes, pixels.
pub(crate) type Piece = ([usize; 2], ColorImage);

impl<K: PartialEq> Picture<K> {
    /// The texture for `key` as [`Self::show`] gives it. Of a picture that is there already only the pieces are drawn that `pieces` tells
    /// from the old key and the new one; `None` draws it whole.
    pub(crate) fn show_pieces(
        &mut self,
        ctx: &Context,
        name: &str,
        key: K,
        pieces: impl FnOnce(&K, &K) -> Option<Vec<Piece>>,
        draw: impl FnOnce(&K) -> ColorImage,
    ) -> egui::TextureId {
        if let (Some(texture), Some(old)) = (&mut self.texture, &self.key)
            && *old != key
            && let Some(pieces) = pieces(old, &key)
        {
            for (corner, image) in pieces {
                texture.set_partial(corner, image, TextureOptions::NEAREST);
            }
            self.key = Some(key);
            return texture.id();
        }
        self.show(ctx, name, key, draw)
    }

    /// The texture for `key`, drawn anew only if the last one was of another key.
    pub(crate) fn show(
        &mut self,
        ctx: &Context,
        name: &str,
        key: K,
        draw: impl FnOnce(&K) -> ColorImage,
    ) -> egui::TextureId {
        if let (Some(texture), true) = (&self.texture, self.key.as_ref() == Some(&key)) {
            return texture.id();
        }
        let image = draw(&key);
        self.key = Some(key);
        match &mut self.texture {
            Some(texture) => {
                texture.set(image, TextureOptions::NEAREST);
                texture.id()
            }
            None => self.texture.insert(ctx.load_texture(name, image, TextureOptions::NEAREST)).id(),
        }
    }
}

/// What the picture of the skeleton view hangs on.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct SkeletonKey {
    /// Pixels.
    pub size_px: [usize; 2],
    /// From where.
    pub camera: Camera,
    /// When, in bits: equal or not is all that counts.
    pub time_bits: u64,
    /// Source and result.
    pub clips: [ClipKey; 2],
    /// Faint figures.
    pub faint: Vec<FaintFigure>,
    /// Chosen joint and joint under the pointer.
    pub joints: [Option<usize>; 2],
    /// Dark, source as well, source alone, following, with handles, one of them held, with known limbs.
    pub switches: [bool; 7],
    /// How the view is set.
    pub space: SpaceHabits,
    /// What can be taken hold of.
    pub ready: Ready,
    /// What is being turned.
    pub swept: Option<Swept>,
    /// The limit of the chosen joint.
    pub limit: Option<JointLimit>,
    /// Pixels per point.
    pub scale: f32,
}

/// What the pointer, or the keyboard, could take hold of.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(crate) struct Ready {
    /// A disc.
    pub disc: Option<Disc>,
    /// The tip of the limb.
    pub tip: bool,
}

/// A handle that is held.
#[derive(Clone, Debug)]
pub(crate) struct Grip {
    /// What the way of the pointer comes to.
    pub drag: Drag,
    /// Where the pointer was last.
    pub pointer: egui::Pos2,
    /// The steps that it snaps to.
    pub snap_rad: Option<f64>,
    /// The turns that are shown.
    pub shown: Option<HandTurns>,
}

/// What the picture of the turn map hangs on.
#[derive(Clone, Debug)]
pub(crate) struct MapKey {
    /// The numbers.
    pub map: Arc<HeatMap>,
    /// The rows from top to bottom.
    pub rows: Vec<MapRow>,
    /// The stretch of time.
    pub window: TimeWindow,
    /// Pixels.
    pub size_px: [usize; 2],
    /// Whether the window is dark.
    pub is_dark: bool,
}

impl MapKey {
    /// The places of the rows whose colours are not those of the picture of another key; `None` if that has other rows, another size
    /// or another stretch of time.
    pub(crate) fn changed_since(&self, old: &Self) -> Option<Vec<usize>> {
        let is_alike = self.rows == old.rows
            && self.window == old.window
            && self.size_px == old.size_px
            && self.is_dark == old.is_dark;
        let is_same = |row: &MapRow| row.members.iter().all(|&own| self.map.has_row_of(&old.map, own));
        is_alike.then(|| (0..self.rows.len()).filter(|&place| !is_same(&self.rows[place])).collect())
    }
}

impl PartialEq for MapKey {
    fn eq(&self, other: &Self) -> bool {
        Arc::ptr_eq(&self.map, &other.map)
            && self.rows == other.rows
            && self.window == other.window
            && self.size_px == other.size_px
            && self.is_dark == other.is_dark
    }
}

/// What the rows of the turn map hang on.
#[derive(Clone, Debug)]
pub(crate) struct RowsKey {
    /// The numbers.
    pub map: Arc<HeatMap>,
    /// The clip they are of.
    pub clip: Arc<Clip>,
    /// Joints whose limbs are folded.
    pub folded: BTreeSet<usize>,
    /// Whether the hottest row is on top.
    pub worst_first: bool,
}

impl PartialEq for RowsKey {
    fn eq(&self, other: &Self) -> bool {
        Arc::ptr_eq(&self.map, &other.map)
            && Arc::ptr_eq(&self.clip, &other.clip)
            && self.folded == other.folded
            && self.worst_first == other.worst_first
    }
}

/// What a picture of the retarget sheet hangs on.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct CarryPictureKey {
    /// Pixels.
    pub size_px: [usize; 2],
    /// From where.
    pub eye: CarryEye,
    /// Pixels per point.
    pub scale: f32,
    /// Whether the window is dark.
    pub is_dark: bool,
    /// Whether both figures are in it.
    pub is_overlaid: bool,
    /// The poses of source and target.
    pub poses: [LocalPose; 2],
    /// The chosen target joint.
    pub row: Option<usize>,
    /// The joints under the pointer.
    pub hovered: [Option<usize>; 2],
    /// The address of figures and map, which stay in memory while the picture is of them.
    pub facts: usize,
}

/// All pictures of the window, and what is kept for making them.
#[derive(Debug, Default)]
pub(crate) struct Pictures {
    /// The skeleton view.
    pub skeleton: Picture<SkeletonKey>,
    /// The two figures of the retarget sheet.
    pub carry: [Picture<CarryPictureKey>; 2],
    /// What was drawn there last.
    pub carry_views: [Option<SceneView>; 2],
    /// The joint of source and target under the pointer there.
    pub carry_hovered: [Option<usize>; 2],
    /// What was drawn last in the skeleton view: for choosing a limb with the pointer.
    pub figure: Option<FigureView>,
    /// The handle that is held.
    pub grip: Option<Grip>,
    /// What could be taken hold of.
    pub ready: Ready,
    /// The way of the chosen joint's tip in the source and in the result.
    pub trails: [Trail; 2],
    /// The turn map.
    pub map: Picture<MapKey>,
    /// Its rows.
    pub map_rows: Memo<RowsKey, Arc<Vec<MapRow>>>,
    /// A choice that is being dragged over the turn map: time, joint and place of the press.
    pub choosing: Option<(f64, Option<usize>, egui::Pos2)>,
    /// The distance picture of a join.
    pub distances: Picture<DistanceKey>,
    /// The rasteriser's memory.
    pub canvas: Canvas,
    /// Floor and travel of the clip on show.
    pub stage: Memo<ClipKey, Arc<Stage>>,
    /// The clip whose figure the camera was fitted to last.
    pub fitted: Option<Arc<Clip>>,
    /// The joint under the pointer, in any panel.
    pub hovered: Option<usize>,
    /// A joint that lists are to bring into view.
    pub scroll_to_joint: Option<usize>,
    /// How high the rows of the turn map were in the last frame, points.
    pub map_height: f32,
    /// The same of the tree of joints.
    pub tree_height: f32,
    /// The press that is held in the turn map began on the mark of a snag.
    pub press_is_on_mark: bool,
    /// How far the curve with the dot may go.
    pub room: LimitRooms,
    /// The curves of the last frame, column by column.
    pub columns: Columns,
    /// What a press on the curves has taken hold of.
    pub curve_press: Option<CurvePress>,
    /// The snag table is to bring the chosen snag into view.
    pub scroll_to_snag: bool,
    /// The list of passes is to bring the open form into view.
    pub scroll_to_form: bool,
}

/// A clip by its identity.
#[derive(Clone, Debug)]
pub(crate) struct ClipKey(pub Arc<Clip>);

impl PartialEq for ClipKey {
    fn eq(&self, other: &Self) -> bool {
        Arc::ptr_eq(&self.0, &other.0)
    }
}

impl Pictures {
    /// Floor and travel of a clip.
    pub(crate) fn stage(&mut self, clip: &Arc<Clip>) -> Arc<Stage> {
        Arc::clone(self.stage.get_or_compute(ClipKey(Arc::clone(clip)), |key| Arc::new(Stage::new(&key.0))))
    }

    /// Draws a skeleton view on the kept canvas.
    pub(crate) fn draw_figure(canvas: &mut Canvas, view: &SceneView) -> ColorImage {
        render_into(view, canvas);
        let image = &canvas.image;
        ColorImage::from_rgba_premultiplied([image.width(), image.height()], image.as_bytes())
    }
}

/// A box moved onto whole pixels, so that a picture of its size is copied and not scaled; and its size in pixels.
pub(crate) fn on_pixels(bounds: Rect, pixels_per_point: f32) -> (Rect, [usize; 2]) {
    let round = |value: f32| (value * pixels_per_point).round();
    let (left, top) = (round(bounds.left()), round(bounds.top()));
    let (width, height) = ((round(bounds.right()) - left).max(1.0), (round(bounds.bottom()) - top).max(1.0));
    let min = pos2(left / pixels_per_point, top / pixels_per_point);
    let max = pos2((left + width) / pixels_per_point, (top + height) / pixels_per_point);
    (Rect::from_min_max(min, max), [width as usize, height as usize])
}
