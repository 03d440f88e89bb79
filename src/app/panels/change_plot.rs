//! How far the result is from its source over the clip, for the export sheet.

use egui::{RichText, Role, Ui, Vec2b, WidgetInfo};
use egui_plot::{Line, Plot, PlotPoints};

use super::super::theme::Look;
use super::super::view_models::{Changes, degrees};

/// A low plot of the largest change of any joint over time. Nothing is drawn where no pose moves.
pub(super) fn change_plot_ui(ui: &mut Ui, changes: &Changes, look: &Look) {
    if changes.over_time.is_empty() {
        return;
    }
    ui.add_space(2.0);
    let words = format!("Largest change of any joint over time, up to {}", degrees(changes.largest_deg));
    ui.label(RichText::new(&words).size(12.5).color(look.faint));
    let line = Line::new("largest change", PlotPoints::from(changes.over_time.clone()))
        .color(look.after)
        .fill(0.0)
        .width(1.2);
    let shown = Plot::new("change over time")
        .height(84.0)
        .include_y(0.0)
        .y_axis_formatter(|mark, _| degrees(mark.value))
        .x_axis_formatter(|mark, _| format!("{} s", mark.value))
        .show_grid(Vec2b::new(true, true))
        .show_crosshair(false)
        .allow_drag(false)
        .allow_zoom(false)
        .allow_scroll(false)
        .allow_boxed_zoom(false)
        .allow_double_click_reset(false)
        .show(ui, |plot| plot.line(line));
    shown.response.widget_info(|| WidgetInfo::labeled(Role::Canvas, true, &words));
}
