//! Small pieces that several panels are made of.

mod button;
mod elide;
mod focus;
mod icon;
mod plate;
mod scroll;
mod strip;
mod time_axis;

pub(crate) use button::{action_button, icon_button, segment, segments, tooltip_text, wide_action_button};
pub(crate) use elide::{name_galley, name_ui};
pub(crate) use focus::focus_ring;
pub(crate) use icon::{Icon, paint_icon};
pub(crate) use plate::{letter_plate, read_out, spoken};
pub(crate) use scroll::bring_into_view;
pub(crate) use strip::{hint, strip};
pub(crate) use time_axis::{
    TimeAxis, is_quick_click, playhead, scrub_and_zoom, scrub_or_pan, vertical_grid, zoom_time,
};
