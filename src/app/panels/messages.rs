//! The bar that tells what went wrong, and what was done.

use egui::{Role, Sense, Ui, WidgetInfo, vec2};

use super::super::commands::{Action, Command};
use super::super::theme::Look;
use super::super::widgets::{Icon, action_button, paint_icon};
use super::Scope;

/// How grave a message is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Level {
    /// Something could not be done.
    Error,
    /// Something was odd.
    Note,
    /// Something was done.
    Done,
}

/// One message.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Message {
    /// How grave it is.
    pub level: Level,
    /// What happened, with file and place.
    pub text: String,
    /// More, shown on demand.
    pub details: Vec<String>,
    /// Whether that is shown.
    pub is_unfolded: bool,
    /// An action that helps.
    pub offer: Option<Action>,
}

impl Message {
    /// Something could not be done.
    pub(crate) fn error(text: impl Into<String>) -> Self {
        Self { level: Level::Error, text: text.into(), details: Vec::new(), is_unfolded: false, offer: None }
    }

    /// Whether both tell the same, unfolded or not.
    pub(crate) fn tells_same(&self, other: &Self) -> bool {
        let Self { level, text, details, is_unfolded: _, offer } = self;
        (*level, text, details, *offer) == (other.level, &other.text, &other.details, other.offer)
    }

    /// Something was odd.
    pub(crate) fn note(text: impl Into<String>) -> Self {
        Self { level: Level::Note, ..Self::error(text) }
    }

    /// Something was done.
    pub(crate) fn done(text: impl Into<String>) -> Self {
        Self { level: Level::Done, ..Self::error(text) }
    }
}

/// The newest messages, each on a line of its own.
pub(crate) fn messages_ui(ui: &mut Ui, messages: &[Message], scope: &mut Scope<'_>) {
    let look = scope.look;
    for (index, message) in messages.iter().enumerate().rev().take(3) {
        let fill = look.palette.background.mix(look.palette.text, 0.09);
        let frame = egui::Frame::NONE.fill(super::super::theme::color32(fill)).inner_margin(egui::Margin {
            left: 10,
            right: 6,
            top: 5,
            bottom: 5,
        });
        let response = frame.show(ui, |ui| {
            ui.horizontal_top(|ui| {
                let (mark, _) = ui.allocate_exact_size(vec2(18.0, 20.0), Sense::hover());
                let (icon, ink) = match message.level {
                    Level::Error => (Icon::Warning, look.error),
                    Level::Note => (Icon::Info, look.faint),
                    Level::Done => (Icon::Check, look.text),
                };
                paint_icon(ui.painter(), mark, icon, ink);
                let buttons = [(message.offer.is_some(), 170.0), (!message.details.is_empty(), 90.0)];
                let buttons: f32 =
                    buttons.iter().filter(|(is_there, _)| *is_there).map(|(_, room)| room).sum();
                let room = ui.available_width() - 40.0 - buttons;
                ui.allocate_ui(vec2(room.max(80.0), 0.0), |ui| {
                    ui.vertical(|ui| {
                        ui.add_space(1.0);
                        let words = egui::RichText::new(&message.text).color(look.text);
                        ui.add(egui::Label::new(words).wrap().selectable(true));
                        if message.is_unfolded {
                            details_ui(ui, index, message, &look);
                        }
                    });
                });
                if !message.details.is_empty() {
                    let (verb, tip) = if message.is_unfolded {
                        ("Show less", "Hide them again")
                    } else {
                        ("Show all", "Each of them, in a list")
                    };
                    if ui.button(verb).on_hover_text(tip).clicked() {
                        scope.out.push(Command::UnfoldMessage(index));
                    }
                }
                if let Some(action) = message.offer {
                    action_button(ui, action, scope.now, scope.out);
                }
                ui.with_layout(egui::Layout::right_to_left(egui::Align::Min), |ui| {
                    let (bounds, response) = ui.allocate_exact_size(vec2(24.0, 22.0), Sense::click());
                    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, "Dismiss message"));
                    if response.hovered() {
                        ui.painter().rect_filled(bounds, 4.0, look.chosen);
                    }
                    paint_icon(ui.painter(), bounds.shrink(5.0), Icon::Close, look.text);
                    if response.clicked() {
                        scope.out.push(Command::Dismiss(index));
                    }
                });
            });
        });
        let bounds = response.response.rect;
        if message.level == Level::Error {
            let bar = egui::Rect::from_min_size(bounds.min, vec2(3.0, bounds.height()));
            ui.painter().rect_filled(bar, 0.0, look.snag);
        }
        ui.painter().hline(bounds.x_range(), bounds.bottom(), (1.0, look.line));
    }
}

/// All that a message has to tell, as a list.
fn details_ui(ui: &mut Ui, index: usize, message: &Message, look: &Look) {
    let list = egui::ScrollArea::vertical().id_salt(("details", index)).max_height(132.0);
    list.auto_shrink([false, true]).show(ui, |ui| {
        ui.spacing_mut().item_spacing.y = 3.0;
        for (place, detail) in message.details.iter().enumerate() {
            let words = egui::RichText::new(format!("{}. {detail}", place + 1)).color(look.faint);
            ui.add(egui::Label::new(words).wrap().selectable(true));
        }
    });
}
