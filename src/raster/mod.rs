//! Pictures on the CPU: the skeleton view, plots, the turn map and sheets of several pictures.
//!
//! Opens no window and needs no graphics driver. The same input gives the same pixels, on every machine with IEEE
//! arithmetic. Pixels count from the top left, and the middle of the first one is (0.5, 0.5); lengths called *points*
//! are pixels divided by the picture's scale.

mod camera;
mod canvas;
mod chart;
mod clip_page;
mod disc;
mod figure;
mod floor;
mod image;
mod limb;
mod names;
pub mod palette;
mod plot;
mod scene_view;
mod shape;
mod sheet;
mod text;
mod turn_map;

pub use camera::{Bounds, Camera, Lens, Projection, Ray, StraightView, View};
pub use canvas::{Canvas, Dash, Hidden, Stroke};
pub use chart::{Area, Scale, SnagMark, decimal_step, degree_step, format_secs};
pub use clip_page::{ClipPage, clip_page, figure_of_clip, spread_times, turn_rate_rows, turn_rates};
pub use disc::{DiscState, Knob, PlaneDisc, ReachCone};
pub use figure::{Figure, FigureLimb, FigureStyle, Girth, limbs_of_skeleton};
pub use floor::Floor;
pub use image::{Image, ImageError};
pub use palette::{Color, Theme, cividis};
pub use plot::{Curve, Plot, ValueUnit, draw_plot};
pub use scene_view::{Label, SceneView, TipPath, render, render_into};
pub use sheet::{Moment, StripStyle, Tile, chart_canvas, compose, contact_strip};
pub use text::{Align, Face, TextStyle, draw_text, draw_text_centered, elide, format_degrees, text_width};
pub use turn_map::{MapRow, TurnMap, draw_turn_map, full_scale, heat_image, turn_map_height};
