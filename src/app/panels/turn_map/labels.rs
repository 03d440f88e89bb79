//! The names on the left of the map, and folding.

use egui::{FontId, Rangef, Rect, Role, Sense, Ui, WidgetInfo, pos2, vec2};

use super::super::super::commands::{Command, TimeCommand};
use super::super::super::theme::INSET;
use super::super::super::view_models::Shared;
use super::super::super::widgets::{Icon, TimeAxis, focus_ring, name_ui, paint_icon};
use super::super::Scope;
use super::Rows;
use super::pointer::toggled;
use crate::clip::Clip;

/// The names on the left: a click chooses the joint, the chevron folds what hangs on it.
pub(super) fn labels_ui(
    ui: &Ui,
    body: Rect,
    axis: &TimeAxis,
    clip: &Clip,
    rows: &Rows<'_>,
    scope: &mut Scope<'_>,
) {
    let look = scope.look;
    let painter = ui.painter().clone();
    let chosen = scope.bench.session.joints();
    let choice = scope.bench.session.choice.clone();
    let labels = Rangef::new(body.left(), axis.span.min);
    // Deep hierarchies must leave room for the names.
    let step = (0.22 * labels.span() / rows.deepest.max(1) as f32).min(6.0);
    let shared = Shared::of(clip.skeleton.listed().map(|joint| clip.skeleton.label(joint)));
    for (place, row) in rows.visible.iter().enumerate() {
        let joint = row.joint;
        let cell = rows.bounds(place, labels);
        let stands_for = |joint: usize| row.members.iter().any(|&own| rows.heat.joints[own] == joint);
        let is_chosen = chosen.iter().any(|&joint| stands_for(joint));
        let response = ui.interact(cell, ui.scope_id().with(("map row", joint)), Sense::click());
        let name = clip.skeleton.label(joint);
        response.widget_info(|| WidgetInfo::selected(Role::Row, true, is_chosen, format!("Map row {name}")));
        if response.clicked() {
            let (adds, also) = ui.input(|input| (input.modifiers.command, input.modifiers.shift));
            scope.out.push(if adds {
                Command::Time(TimeCommand::Choose(toggled(&choice, row, rows)))
            } else if also {
                Command::ChooseAlso(joint)
            } else {
                Command::ChooseJoint(Some(joint))
            });
        }
        focus_ring(ui, &response);
        if is_chosen {
            painter.rect_filled(cell, 0.0, look.chosen);
            painter.rect_filled(Rect::from_min_size(cell.min, vec2(3.0, cell.height())), 0.0, look.selection);
        } else if response.hovered() || scope.pictures.hovered.is_some_and(stands_for) {
            painter.rect_filled(cell, 0.0, look.hover);
        }
        let ink = if is_chosen { look.text } else { look.faint };
        let left = cell.left() + 5.0 + row.depth as f32 * step;
        let chevron = Rect::from_min_size(pos2(left, cell.top()), vec2(14.0, cell.height()));
        if row.has_children {
            let response = ui.interact(chevron, ui.scope_id().with(("map fold", joint)), Sense::click());
            let verb = if row.is_open { "Fold" } else { "Unfold" };
            response
                .widget_info(|| WidgetInfo::labeled(Role::Button, true, format!("{verb} {name} in the map")));
            let icon = if row.is_open { Icon::ChevronDown } else { Icon::ChevronRight };
            let ink = if response.hovered() { look.text } else { look.axis };
            paint_icon(&painter, chevron.shrink2(vec2(2.0, 0.0)), icon, ink);
            focus_ring(ui, &response);
            if response.clicked() {
                scope.out.push(Command::Fold(joint));
            }
        }
        let mut words =
            Rect::from_min_max(pos2(chevron.right() + 2.0, cell.top()), cell.max - vec2(4.0, 0.0));
        let is_in_choice =
            choice.joints.is_some() && row.members.iter().any(|&own| choice.has_joint(rows.heat.joints[own]));
        if is_in_choice {
            // A dot besides the undimmed row.
            painter.circle_filled(pos2(cell.right() - INSET - 1.0, cell.center().y), 3.0, look.selection);
            words.max.x -= 10.0;
        }
        let font = FontId::proportional(12.5);
        let shown = if row.is_open || row.members.len() < 2 {
            name.to_owned()
        } else {
            format!("{name} +{}", row.members.len() - 1)
        };
        if name_ui(&painter, words, &shown, shared, &font, ink) {
            response.on_hover_text(shown);
        }
        if is_chosen {
            let across = rows.bounds(place, axis.span);
            painter.rect_stroke(across, 0.0, (1.0, look.selection), egui::StrokeKind::Outside);
        }
    }
}
