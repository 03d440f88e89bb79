//! The joint sheet: the tree of joints, and the numbers of the chosen one at the playhead.

use egui::{
    Align2, ComboBox, FontId, Rangef, Rect, Role, ScrollArea, Sense, Ui, UiBuilder, WidgetInfo, pos2, vec2,
};

use super::super::commands::Command;
use super::super::theme::INSET;
use super::super::view_models::{
    JointNumbers, RotationNumbers, Shared, SnagState, counted, degrees, degrees_fixed, joint_numbers,
    tree_rows,
};
use super::super::widgets::{Icon, bring_into_view, focus_ring, hint, name_ui, paint_icon, strip};
use super::{Scope, choose_joint};

const TREE_ROW: f32 = 20.0;

/// The panel.
pub(crate) fn joint_sheet_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let (Some(source), Some(result)) = (scope.bench.before().cloned(), scope.bench.result().cloned()) else {
        strip(ui, "Joints", |_| {});
        hint(ui, "No joints");
        return;
    };
    let count = source.skeleton.listed().count();
    strip(ui, &format!("Joints: {count}"), |_| {});
    let area = ui.available_rect_before_wrap();
    let tree_width = (area.width() * 0.42).clamp(110.0, 260.0);
    let tree = Rect::from_min_size(area.min, vec2(tree_width, area.height()));
    let sheet = Rect::from_min_max(pos2(tree.right(), area.top()), area.max);
    let mut tree_ui = ui.new_child(UiBuilder::new().max_rect(tree));
    tree_ui.shrink_clip_rect(tree);
    tree_panel(&mut tree_ui, scope, &source);
    ui.painter().vline(tree.right(), area.y_range(), (1.0, scope.look.line));
    let mut sheet_ui = ui.new_child(UiBuilder::new().max_rect(sheet));
    sheet_ui.shrink_clip_rect(sheet);
    match scope.bench.session.joint {
        Some(joint) => {
            let time = scope.bench.session.playback.playhead_secs;
            let numbers = joint_numbers(&source, &result, joint, time);
            sheet_panel(&mut sheet_ui, scope, &numbers);
        }
        None => hint(&mut sheet_ui, "Choose a joint to see its numbers"),
    }
    ui.allocate_rect(area, Sense::hover());
}

fn tree_panel(ui: &mut Ui, scope: &mut Scope<'_>, clip: &crate::clip::Clip) {
    let look = scope.look;
    let rows = tree_rows(&clip.skeleton, &scope.bench.session.folded);
    let shared = Shared::of(clip.skeleton.listed().map(|joint| clip.skeleton.label(joint)));
    let mut open = vec![0_usize; clip.skeleton.len()];
    for (snag, &state) in scope.bench.snags().iter().zip(scope.states.iter()) {
        if state == SnagState::Open
            && let Some(count) = open.get_mut(snag.joint)
        {
            *count += 1;
        }
    }
    ui.spacing_mut().item_spacing.y = 0.0;
    let area = ui.max_rect();
    // Deep trees must leave room for the names.
    let deepest = rows.iter().map(|row| row.depth).max().unwrap_or(0);
    let step = (area.width() * 0.3 / deepest.max(1) as f32).min(9.0);
    let asked = scope.pictures.scroll_to_joint;
    let seen_before = std::mem::replace(&mut scope.pictures.tree_height, area.height());
    let kept = scope.bench.session.joint.filter(|_| area.height() < seen_before);
    let salt = ("joint tree", scope.bench.document_serial());
    ScrollArea::vertical().id_salt(salt).auto_shrink(false).show_viewport(ui, |ui, viewport| {
        let top = ui.max_rect().top();
        ui.set_height(TREE_ROW * rows.len() as f32);
        if let Some(joint) = asked.or(kept)
            && let Some(place) = rows.iter().position(|row| row.joint == joint)
        {
            let row = Rangef::new(place as f32, place as f32 + 1.0) * TREE_ROW;
            bring_into_view(ui, top, row, [viewport.top(), seen_before], asked.is_some());
        }
        let first = (viewport.top() / TREE_ROW).floor().max(0.0) as usize;
        let last = ((viewport.bottom() / TREE_ROW).ceil() as usize).min(rows.len());
        for (place, row) in rows.iter().enumerate().take(last).skip(first) {
            let y = top + place as f32 * TREE_ROW;
            let bounds = Rect::from_min_size(pos2(area.left(), y), vec2(area.width(), TREE_ROW));
            let name = clip.skeleton.label(row.joint);
            let is_chosen = scope.bench.session.has_joint(row.joint);
            let response = ui.interact(bounds, ui.scope_id().with(("tree", row.joint)), Sense::click());
            response.widget_info(|| {
                WidgetInfo::selected(Role::TreeItem, true, is_chosen, format!("Joint {name}"))
            });
            if is_chosen {
                ui.painter().rect_filled(bounds, 0.0, look.chosen);
                let bar = Rect::from_min_size(bounds.min, vec2(3.0, bounds.height()));
                ui.painter().rect_filled(bar, 0.0, look.selection);
            } else if response.hovered() || scope.pictures.hovered == Some(row.joint) {
                ui.painter().rect_filled(bounds, 0.0, look.hover);
            }
            if response.hovered() {
                scope.out.push(Command::HoverJoint(row.joint));
            }
            let left = bounds.left() + 5.0 + row.depth as f32 * step;
            if row.has_children {
                let fold = Rect::from_min_size(pos2(left, bounds.top()), vec2(16.0, TREE_ROW));
                let response = ui.interact(fold, ui.scope_id().with(("fold", row.joint)), Sense::click());
                let verb = if row.is_open { "Fold" } else { "Unfold" };
                response.widget_info(|| WidgetInfo::labeled(Role::Button, true, format!("{verb} {name}")));
                let icon = if row.is_open { Icon::ChevronDown } else { Icon::ChevronRight };
                let ink = if response.hovered() { look.text } else { look.axis };
                paint_icon(ui.painter(), fold.shrink2(vec2(3.0, 5.0)), icon, ink);
                if response.clicked() {
                    scope.out.push(Command::Fold(row.joint));
                }
            }
            let mut right = bounds.right() - 12.0;
            if open[row.joint] > 0 {
                let words = open[row.joint].to_string();
                let font = FontId::proportional(11.0);
                let width =
                    ui.painter().layout_no_wrap(words.clone(), font.clone(), look.snag_ink).size().x + 8.0;
                let plate =
                    Rect::from_center_size(pos2(right - width / 2.0, bounds.center().y), vec2(width, 14.0));
                ui.painter().rect_filled(plate, 3.0, look.snag);
                ui.painter().text(plate.center(), Align2::CENTER_CENTER, words, font, look.snag_ink);
                right -= width + 6.0;
            }
            let ink = if is_chosen { look.text } else { look.text.gamma_multiply(0.88) };
            let words =
                Rect::from_x_y_ranges(Rangef::new(left + 18.0, right.max(left + 30.0)), bounds.y_range());
            let is_cut = name_ui(ui.painter(), words, name, shared, &FontId::proportional(13.0), ink);
            focus_ring(ui, &response);
            if response.clicked() {
                scope.out.push(choose_joint(ui, row.joint));
            }
            if response.double_clicked() && row.has_children {
                scope.out.push(Command::Fold(row.joint));
            }
            if is_cut {
                response.on_hover_text(name);
            }
        }
    });
}

fn sheet_panel(ui: &mut Ui, scope: &mut Scope<'_>, numbers: &JointNumbers) {
    let look = scope.look;
    let differs = numbers.differs();
    ScrollArea::vertical().id_salt("joint numbers").auto_shrink(false).show(ui, |ui| {
        egui::Frame::NONE.inner_margin(egui::Margin::symmetric(INSET as i8 + 2, 6)).show(ui, |ui| {
            ui.spacing_mut().item_spacing.y = 1.0;
            let (title, response) = ui.allocate_exact_size(vec2(ui.available_width(), 20.0), Sense::hover());
            response.widget_info(|| WidgetInfo::labeled(Role::Label, true, &numbers.label));
            if name_ui(
                ui.painter(),
                title,
                &numbers.label,
                Shared::default(),
                &FontId::proportional(15.0),
                look.text,
            ) {
                response.on_hover_text(&numbers.label);
            }
            let parent =
                numbers.parent.as_ref().map_or("no parent".to_owned(), |parent| format!("below {parent}"));
            let words = format!("{parent} · {} · {}", counted(numbers.keys, "key"), numbers.path);
            ui.add(egui::Label::new(egui::RichText::new(words).size(12.0).color(look.faint)).truncate());
            ui.add_space(5.0);
            head(ui, scope, differs);
            let (before, after) = (&numbers.before, &numbers.after);
            let three = |of: &RotationNumbers| of.plane_angles_deg;
            for (part, name) in ["yz", "zx", "xy"].into_iter().enumerate() {
                row(ui, scope, name, Some(part), three(after)[part], three(before)[part], differs, "°");
            }
            row(ui, scope, "turn", None, after.turn_deg, before.turn_deg, differs, "°");
            row(ui, scope, "swing", None, after.swing_deg, before.swing_deg, differs, "°");
            row(ui, scope, "twist", None, after.twist_deg, before.twist_deg, differs, "°");
            row(ui, scope, "turn rate", None, after.turn_rate_deg, before.turn_rate_deg, differs, "°/s");
            if !after.stored.is_empty() {
                ui.add_space(5.0);
                small_heading(ui, scope, "As the file stores it");
                let is_angle = after.stored.len() <= 3;
                for (place, (name, value)) in after.stored.iter().enumerate() {
                    let old = before.stored.get(place).map_or(*value, |(_, value)| *value);
                    let unit = if is_angle { "°" } else { "" };
                    row(ui, scope, name, None, *value, old, differs, unit);
                }
            }
            ui.add_space(5.0);
            small_heading(ui, scope, "Rest pose");
            rest_choice(ui, scope);
            let rest = numbers.rest_deg.map(degrees).join("  ");
            line(ui, scope, "yz zx xy", &rest);
            let place = numbers.rest_place.map(|length| format!("{length:.3}")).join("  ");
            line(ui, scope, "place", &place);
            if differs {
                ui.add_space(5.0);
                line(ui, scope, "changed by", &degrees(numbers.change_deg));
            }
        });
    });
}

/// Which pose the numbers are measured from.
fn rest_choice(ui: &mut Ui, scope: &mut Scope<'_>) {
    let work = scope.bench.session.work;
    let Some(source) = scope.bench.project.as_ref().and_then(|project| project.source_of(work)) else {
        return;
    };
    let mut chosen = source.rest;
    let shown = source.rest.title();
    let combo = ComboBox::from_id_salt("rest pose").selected_text(shown).truncate();
    let response = combo.show_ui(ui, |ui| {
        for &rest in &source.rests {
            ui.selectable_value(&mut chosen, rest, rest.title());
        }
    });
    response.response.widget_info(|| WidgetInfo {
        current_text_value: Some(shown.to_owned()),
        ..WidgetInfo::labeled(Role::ComboBox, true, "Rest pose")
    });
    if chosen != source.rest {
        scope.out.push(Command::ChooseRest(chosen));
    }
}

const NAME_WIDTH: f32 = 66.0;

fn head(ui: &mut Ui, scope: &Scope<'_>, differs: bool) {
    let look = &scope.look;
    let (bounds, _) = ui.allocate_exact_size(vec2(ui.available_width(), 16.0), Sense::hover());
    let [after, before] = columns(bounds);
    let font = FontId::proportional(11.5);
    let words = if differs { ["result", "source"] } else { ["now", ""] };
    ui.painter().text(
        pos2(after, bounds.center().y),
        Align2::RIGHT_CENTER,
        words[0],
        font.clone(),
        look.faint,
    );
    ui.painter().text(pos2(before, bounds.center().y), Align2::RIGHT_CENTER, words[1], font, look.faint);
}

/// Right edges of the two columns of numbers.
fn columns(bounds: Rect) -> [f32; 2] {
    let free = (bounds.width() - NAME_WIDTH).max(80.0);
    [bounds.left() + NAME_WIDTH + free * 0.5, bounds.left() + NAME_WIDTH + free]
}

#[expect(clippy::too_many_arguments, reason = "one row of a table, said in full at each of its few calls")]
fn row(
    ui: &mut Ui,
    scope: &Scope<'_>,
    name: &str,
    plane: Option<usize>,
    after: f64,
    before: f64,
    differs: bool,
    unit: &str,
) {
    let look = &scope.look;
    let (bounds, response) = ui.allocate_exact_size(vec2(ui.available_width(), 17.0), Sense::hover());
    let number = |value: f64| match unit {
        "°" => degrees_fixed(value),
        "°/s" => format!("{value:.0}°/s"),
        _ => format!("{value:.5}"),
    };
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, format!("{name} {}", number(after))));
    let y = bounds.center().y;
    let mut left = bounds.left();
    if let Some(plane) = plane {
        ui.painter().rect_filled(
            Rect::from_center_size(pos2(left + 4.0, y), vec2(8.0, 3.0)),
            1.0,
            look.curve(plane),
        );
        left += 13.0;
    }
    ui.painter().text(pos2(left, y), Align2::LEFT_CENTER, name, FontId::proportional(12.5), look.faint);
    let [after_x, before_x] = columns(bounds);
    let font = FontId::monospace(12.0);
    ui.painter().text(pos2(after_x, y), Align2::RIGHT_CENTER, number(after), font.clone(), look.text);
    if differs {
        ui.painter().text(pos2(before_x, y), Align2::RIGHT_CENTER, number(before), font, look.before);
    }
}

fn small_heading(ui: &mut Ui, scope: &Scope<'_>, words: &str) {
    ui.label(egui::RichText::new(words).size(11.5).color(scope.look.faint));
}

fn line(ui: &mut Ui, scope: &Scope<'_>, name: &str, value: &str) {
    let look = &scope.look;
    let (bounds, response) = ui.allocate_exact_size(vec2(ui.available_width(), 17.0), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, format!("{name} {value}")));
    let y = bounds.center().y;
    ui.painter().text(
        bounds.left_center(),
        Align2::LEFT_CENTER,
        name,
        FontId::proportional(12.5),
        look.faint,
    );
    let left = bounds.left() + NAME_WIDTH + 6.0;
    let mut job =
        egui::text::LayoutJob::simple_singleline(value.to_owned(), FontId::monospace(11.5), look.text);
    job.wrap = egui::text::TextWrapping::truncate_at_width((bounds.right() - left).max(20.0));
    let galley = ui.painter().layout_job(job);
    ui.painter().galley(pos2(left, y - galley.size().y / 2.0), galley, look.text);
}
