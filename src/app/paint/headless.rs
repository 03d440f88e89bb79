//! Frames of a screen without a display.

use super::offscreen::Offscreen;
use crate::app::Screen;
use crate::raster::Image;
use egui::Color32;
use egui::Vec2;

/// Time from one frame to the next.
const FRAME_SECS: f64 = 1.0 / 60.0;

/// Frames after which a screen that never comes to rest is taken as it is.
const MAX_FRAMES: usize = 60;

/// A window without a display: runs a screen frame by frame on a clock of its own and draws the last frame.
pub struct Headless {
    ctx: egui::Context,
    offscreen: Offscreen,
    size_points: Vec2,
    pixels_per_point: f32,
    time_secs: f64,
    shapes: Vec<egui::epaint::ClippedShape>,
    repaint_delay: std::time::Duration,
}

impl std::fmt::Debug for Headless {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Headless")
            .field("size_points", &self.size_points)
            .field("pixels_per_point", &self.pixels_per_point)
            .field("time_secs", &self.time_secs)
            .finish_non_exhaustive()
    }
}

impl Headless {
    /// A window of the given size in points, with `pixels_per_point` pixels to each, drawn on `n_threads` threads.
    pub fn new(size_points: Vec2, pixels_per_point: f32, n_threads: usize) -> Self {
        Self {
            ctx: egui::Context::default(),
            offscreen: Offscreen::new(n_threads),
            size_points,
            pixels_per_point,
            time_secs: 0.0,
            shapes: Vec::new(),
            repaint_delay: std::time::Duration::ZERO,
        }
    }

    /// The context to make the screen with.
    pub fn context(&self) -> &egui::Context {
        &self.ctx
    }

    /// Runs one frame with the given input.
    pub fn frame(&mut self, screen: &mut dyn Screen, events: Vec<egui::Event>) {
        let mut input = egui::RawInput {
            screen_rect: Some(egui::Rect::from_min_size(egui::Pos2::ZERO, self.size_points)),
            time: Some(self.time_secs),
            events,
            ..Default::default()
        };
        let viewport = input.viewports.entry(egui::ViewportId::ROOT).or_default();
        viewport.native_pixels_per_point = Some(self.pixels_per_point);
        self.time_secs += FRAME_SECS;
        let mut output = self.ctx.run_ui(input, |ui| {
            screen.logic(ui.ctx());
            screen.ui(ui);
        });
        self.offscreen.painter.update_textures(&mut output.textures_delta);
        self.shapes = output.shapes;
        let root = output.viewport_output.get(&egui::ViewportId::ROOT);
        self.repaint_delay = root.map_or(std::time::Duration::MAX, |root| root.repaint_delay);
    }

    /// Runs frames until the screen asks for no further one (a second of its time at most).
    pub fn settle(&mut self, screen: &mut dyn Screen) {
        for _ in 0..MAX_FRAMES {
            self.frame(screen, Vec::new());
            if !self.wants_more() {
                break;
            }
        }
    }

    /// Whether the screen asks for a further frame at once, as while it plays.
    pub fn wants_more(&self) -> bool {
        self.repaint_delay.as_secs_f64() < FRAME_SECS
    }

    /// How long after the last frame the screen wants the next one, if nothing happens before: for ever while it rests.
    pub fn repaint_delay(&self) -> std::time::Duration {
        self.repaint_delay
    }

    /// Makes meshes of the last frame, as the window does before it draws it. Gives none when called again for the
    /// same frame.
    pub fn tessellate(&mut self) -> Vec<egui::ClippedPrimitive> {
        self.ctx.tessellate(std::mem::take(&mut self.shapes), self.pixels_per_point)
    }

    /// Draws meshes in the size of the window, as the window does: only what is not as in the frame drawn before. Gives
    /// the pixels (`0xAARRGGBB`, row by row).
    pub fn paint(&mut self, primitives: &[egui::ClippedPrimitive]) -> &[u32] {
        self.offscreen.paint(self.size_points, self.pixels_per_point, primitives, background(&self.ctx))
    }

    /// How many triangles the last frame is made of: what a frame costs, whatever else the machine does.
    pub fn n_triangles(&self) -> usize {
        let count = |primitive: &egui::ClippedPrimitive| match &primitive.primitive {
            egui::epaint::Primitive::Mesh(mesh) => mesh.indices.len() / 3,
            egui::epaint::Primitive::Callback(_) => 0,
        };
        self.ctx.tessellate(self.shapes.clone(), self.pixels_per_point).iter().map(count).sum()
    }

    /// Draws the last frame.
    pub fn picture(&mut self) -> Image {
        let primitives = self.ctx.tessellate(self.shapes.clone(), self.pixels_per_point);
        self.paint(&primitives);
        self.offscreen.image()
    }
}

/// A picture of the window at rest: what a person sees who opens it and waits.
pub fn picture_of(
    screen: impl FnOnce(&egui::Context) -> Box<dyn Screen>,
    size_points: Vec2,
    pixels_per_point: f32,
) -> Image {
    let mut headless = Headless::new(size_points, pixels_per_point, super::default_threads());
    let mut screen = screen(headless.context());
    headless.settle(&mut *screen);
    headless.picture()
}

/// What shows where the screen draws nothing.
pub(crate) fn background(ctx: &egui::Context) -> Color32 {
    ctx.global_style().visuals.panel_fill
}
