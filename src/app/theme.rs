//! The look of the window: every colour, size and distance it uses.

use std::sync::Arc;

use egui::{Color32, CornerRadius, FontFamily, FontId, Margin, Stroke, TextStyle, Vec2};

use crate::raster::{Color, Theme as Palette, cividis};

/// Height of a panel's title strip, points.
pub(crate) const STRIP_HEIGHT: f32 = 28.0;
/// Height of a row of a table or list, points.
pub(crate) const ROW_HEIGHT: f32 = 22.0;
/// Width of what stands left of the turn map and of the curves, so that both have one time axis.
pub(crate) const GUTTER_WIDTH: f32 = 132.0;
/// Height of the ruler above the turn map.
pub(crate) const RULER_HEIGHT: f32 = 30.0;
/// Free space at the right end of the time axis.
pub(crate) const TIME_MARGIN: f32 = 14.0;
/// Space around the content of a panel.
pub(crate) const INSET: f32 = 8.0;

/// Colours in egui's form.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Look {
    /// The palette that pictures are drawn with, for the same background.
    pub palette: Palette,
    /// Behind panels.
    pub background: Color32,
    /// Title strips, plates behind words.
    pub panel: Color32,
    /// A row under the pointer.
    pub hover: Color32,
    /// The chosen row.
    pub chosen: Color32,
    /// Lines between panels.
    pub line: Color32,
    /// Grid lines of charts.
    pub grid: Color32,
    /// The zero line, axes.
    pub axis: Color32,
    /// Words.
    pub text: Color32,
    /// Less important words.
    pub faint: Color32,
    /// The source.
    pub before: Color32,
    /// The result.
    pub after: Color32,
    /// The chosen joint, key or row.
    pub selection: Color32,
    /// Snags.
    pub snag: Color32,
    /// Ink on a plate of the snag colour.
    pub snag_ink: Color32,
    /// Errors: the snag colour, lifted where the background asks for it.
    pub error: Color32,
}

/// The same colour for egui.
pub(crate) fn color32(color: Color) -> Color32 {
    Color32::from_rgba_unmultiplied(color.r, color.g, color.b, color.a)
}

impl Look {
    /// For a dark or a light background.
    pub(crate) fn new(is_dark: bool) -> Self {
        let palette = if is_dark { Palette::DARK } else { Palette::LIGHT };
        let mixed = |weight| color32(palette.background.mix(palette.text, weight));
        Self {
            palette,
            background: color32(palette.background),
            panel: color32(palette.panel),
            hover: mixed(0.06),
            chosen: mixed(0.13),
            line: mixed(if is_dark { 0.13 } else { 0.16 }),
            grid: mixed(0.10),
            axis: mixed(0.34),
            text: color32(palette.text),
            faint: color32(palette.text_faint),
            before: color32(palette.before),
            after: color32(palette.after),
            selection: color32(palette.selection),
            snag: color32(palette.snag),
            snag_ink: color32(palette.snag.readable_ink()),
            error: if is_dark {
                color32(palette.snag.mix(palette.text, 0.35))
            } else {
                color32(palette.snag)
            },
        }
    }

    /// The look of the window this is drawn in.
    pub(crate) fn of(ui: &egui::Ui) -> Self {
        Self::new(ui.visuals().dark_mode)
    }

    /// The colour of a curve: 0 yz, 1 zx, 2 xy, else neutral. Darker on a light background, where the palette's own
    /// are too pale for thin lines.
    pub(crate) fn curve(&self, index: usize) -> Color32 {
        match self.palette.planes.get(index) {
            Some(&plane) if self.palette.is_dark() => color32(plane),
            Some(&plane) => color32(plane.mix(self.palette.text, 0.22)),
            None => self.after,
        }
    }

    /// A colour of the heat scale, `share` 0 to 1.
    pub(crate) fn heat(share: f32) -> Color32 {
        color32(cividis(share))
    }
}

/// Makes egui look like this program, in both themes.
pub(crate) fn install(ctx: &egui::Context) {
    for theme in [egui::Theme::Dark, egui::Theme::Light] {
        ctx.set_style_of(theme, Arc::new(style(theme)));
    }
}

fn style(theme: egui::Theme) -> egui::Style {
    let is_dark = theme == egui::Theme::Dark;
    let look = Look::new(is_dark);
    let mut style = theme.default_style();
    style.text_styles = [
        (TextStyle::Small, FontId::new(11.5, FontFamily::Proportional)),
        (TextStyle::Body, FontId::new(13.5, FontFamily::Proportional)),
        (TextStyle::Button, FontId::new(13.5, FontFamily::Proportional)),
        (TextStyle::Heading, FontId::new(18.0, FontFamily::Proportional)),
        (TextStyle::Monospace, FontId::new(12.0, FontFamily::Monospace)),
    ]
    .into();
    let spacing = &mut style.spacing;
    spacing.item_spacing = Vec2::new(6.0, 4.0);
    spacing.button_padding = Vec2::new(8.0, 3.0);
    spacing.interact_size = Vec2::new(28.0, 22.0);
    spacing.menu_margin = Margin::same(5);
    spacing.window_margin = Margin::same(16);
    spacing.indent = 14.0;
    spacing.combo_width = 60.0;
    spacing.tooltip_width = 380.0;
    spacing.scroll = egui::style::ScrollStyle { bar_width: 8.0, ..egui::style::ScrollStyle::floating() };
    style.interaction.tooltip_delay = 0.4;
    style.interaction.selectable_labels = false;
    style.animation_time = 0.08;

    let mixed = |weight| color32(look.palette.background.mix(look.palette.text, weight));
    let visuals = &mut style.visuals;
    visuals.panel_fill = look.background;
    visuals.window_fill = color32(look.palette.panel);
    visuals.extreme_bg_color =
        if is_dark { color32(look.palette.background.mix(Color::rgb(0), 0.35)) } else { Color32::WHITE };
    visuals.faint_bg_color = look.hover;
    visuals.window_stroke = Stroke::new(1.0, look.line);
    visuals.window_corner_radius = CornerRadius::same(8);
    visuals.menu_corner_radius = CornerRadius::same(6);
    visuals.window_shadow.color = Color32::from_black_alpha(if is_dark { 110 } else { 50 });
    visuals.popup_shadow.color = Color32::from_black_alpha(if is_dark { 90 } else { 40 });
    visuals.override_text_color = None;
    visuals.weak_text_color = Some(look.faint);
    visuals.hyperlink_color = color32(if is_dark { look.palette.planes[1] } else { look.palette.selection });
    visuals.error_fg_color = look.error;
    visuals.warn_fg_color = look.error;
    visuals.selection.bg_fill =
        color32(look.palette.background.mix(look.palette.selection, if is_dark { 0.28 } else { 0.22 }));
    visuals.selection.stroke = Stroke::new(1.0, look.text);
    visuals.slider_trailing_fill = true;
    visuals.striped = false;
    visuals.disabled_alpha = 0.45;
    let radius = CornerRadius::same(4);
    let widgets = &mut visuals.widgets;
    for widget in [
        &mut widgets.noninteractive,
        &mut widgets.inactive,
        &mut widgets.hovered,
        &mut widgets.active,
        &mut widgets.open,
    ] {
        widget.corner_radius = radius;
        widget.expansion = 0.0;
        widget.fg_stroke = Stroke::new(1.0, look.text);
        widget.bg_stroke = Stroke::NONE;
    }
    widgets.noninteractive.bg_stroke = Stroke::new(1.0, look.line);
    widgets.noninteractive.bg_fill = look.background;
    for (widget, weight) in [
        (&mut widgets.inactive, 0.10),
        (&mut widgets.hovered, 0.18),
        (&mut widgets.active, 0.26),
        (&mut widgets.open, 0.18),
    ] {
        widget.bg_fill = mixed(weight);
        widget.weak_bg_fill = mixed(weight);
    }
    widgets.hovered.bg_stroke = Stroke::new(1.0, mixed(0.3));
    widgets.active.bg_stroke = Stroke::new(1.0, mixed(0.4));
    style
}
