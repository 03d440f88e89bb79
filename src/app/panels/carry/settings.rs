//! The settings of a retarget: onto which file and figure, which poses count as rest, what is held, and the joint map as a file.

use egui::{DragValue, RichText, Role, ScrollArea, Ui, WidgetInfo, vec2};

use super::super::super::bench::file_name;
use super::super::super::commands::{CarryCommand, CarrySheet, Command};
use super::super::super::theme::INSET;
use super::super::super::widgets::strip;
use super::super::Scope;
use super::{Sheet, change};
use crate::retarget::KeptLimits;
use crate::scene::RetargetPass;
use crate::skeleton::Skeleton;

/// Height in which all of it shows, its strip included: at 1280 by 720 none of it needs scrolling.
pub(super) const HEIGHT: f32 = 328.0;
/// Width of the words at the head of a row.
const WHO: f32 = 46.0;

pub(super) fn settings_ui(ui: &mut Ui, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    strip(ui, "Settings", |_| {});
    ui.painter().vline(ui.max_rect().left(), ui.max_rect().y_range(), (1.0, scope.look.line));
    ScrollArea::vertical().id_salt("carry settings").auto_shrink(false).show(ui, |ui| {
        egui::Frame::NONE.inner_margin(egui::Margin::symmetric(INSET as i8 + 2, 6)).show(ui, |ui| {
            ui.spacing_mut().item_spacing = vec2(6.0, 4.0);
            target_ui(ui, sheet, scope);
            heading(ui, "What counts as rest");
            rest_ui(ui, 0, "Source", sheet, scope);
            rest_ui(ui, 1, "Target", sheet, scope);
            heading(ui, "Hold");
            hold_ui(ui, sheet, scope);
            heading(ui, "Joint map");
            map_ui(ui, sheet, scope);
            ui.add_space(6.0);
            let is_ready = scope.bench.result().is_some_and(|result| {
                sheet.facts.is_some_and(|facts| result.skeleton.len() == facts.setting.target.skeleton.len())
            });
            let button = ui.add_enabled(is_ready, egui::Button::new("Export onto the target's file…"));
            let tip = "A copy of the target's file with this motion: its mesh and skin stay as they are";
            if button.on_hover_text(tip).clicked() {
                scope.out.push(Command::Carry(CarryCommand::Ask(CarrySheet::Export)));
            }
        });
    });
}

fn heading(ui: &mut Ui, words: &str) {
    ui.add_space(3.0);
    ui.label(RichText::new(words).strong());
}

fn target_ui(ui: &mut Ui, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let pass = sheet.pass.1;
    let names: Vec<String> = scope.bench.project.as_ref().map_or_else(Vec::new, |project| {
        project.document().sources.iter().map(|source| file_name(&source.path)).collect()
    });
    ui.horizontal(|ui| {
        ui.label(RichText::new("Target").strong());
        ui.with_layout(egui::Layout::right_to_left(egui::Align::Center), |ui| {
            let other = ui.button("Another file…").on_hover_text("Open the file whose skeleton is meant");
            if other.clicked() {
                scope.out.push(Command::Carry(CarryCommand::Ask(CarrySheet::Onto)));
            }
        });
    });
    let shown = names.get(pass.onto).cloned().unwrap_or_else(|| "not open".to_owned());
    let mut wanted = None;
    let width = (ui.available_width() - 8.0).max(80.0);
    let combo = egui::ComboBox::from_id_salt("carry target").selected_text(&shown).width(width).truncate();
    let response = combo.show_ui(ui, |ui| {
        for (index, name) in names.iter().enumerate() {
            if ui.selectable_label(index == pass.onto, name).clicked() {
                wanted = Some(index);
            }
        }
    });
    response.response.widget_info(|| WidgetInfo::labeled(Role::ComboBox, true, "Target file"));
    if let Some(onto) = wanted.filter(|&onto| onto != pass.onto) {
        scope.out.push(Command::Carry(CarryCommand::Onto(onto)));
    }
    if let Some(facts) = sheet.facts {
        let figures = [&facts.setting.source, &facts.setting.target];
        for (which, figure) in figures.into_iter().enumerate() {
            let roots =
                figure_roots(&figure.skeleton, &figure.roles.other_figures, pass.roots[which].as_ref());
            if !roots.is_empty() {
                root_ui(ui, which, &roots, sheet, scope);
            }
        }
    }
}

/// The joints that figures of a file hang on, where it holds several or somebody chose one.
fn figure_roots(skeleton: &Skeleton, others: &[usize], chosen: Option<&String>) -> Vec<String> {
    if others.is_empty() && chosen.is_none() {
        return Vec::new();
    }
    let tops = skeleton.listed().filter(|&joint| skeleton.parent_joint(joint).is_none());
    tops.map(|joint| skeleton.label(joint).to_owned()).collect()
}

fn root_ui(ui: &mut Ui, which: usize, roots: &[String], sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let pass = sheet.pass.1;
    let who = ["source", "target"][which];
    ui.horizontal(|ui| {
        ui.label(format!("Figure of the {who}"));
        let chosen = pass.roots[which].as_ref();
        // The first choice is to leave it to the program.
        let mut wanted: Option<usize> = None;
        let combo = egui::ComboBox::from_id_salt(("carry root", which))
            .selected_text(chosen.map_or("by itself", String::as_str))
            .width((ui.available_width() - 8.0).max(60.0));
        let response = combo.show_ui(ui, |ui| {
            if ui.selectable_label(chosen.is_none(), "by itself").clicked() {
                wanted = Some(0);
            }
            for (index, root) in roots.iter().enumerate() {
                if ui.selectable_label(chosen == Some(root), root).clicked() {
                    wanted = Some(index + 1);
                }
            }
        });
        let label = format!("Figure of the {who}");
        response.response.widget_info(|| WidgetInfo::labeled(Role::ComboBox, true, &label));
        if let Some(index) = wanted {
            let mut pass = pass.clone();
            pass.roots[which] = index.checked_sub(1).and_then(|index| roots.get(index)).cloned();
            change(scope, sheet, pass);
        }
    });
}

fn rest_ui(ui: &mut Ui, which: usize, who: &str, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let pass = sheet.pass.1;
    let rest = pass.rests[which];
    let changed = |change_it: &dyn Fn(&mut RetargetPass)| {
        let mut pass = pass.clone();
        change_it(&mut pass);
        pass
    };
    ui.horizontal_wrapped(|ui| {
        // One under the other, whatever the word's width.
        let start = ui.cursor().left();
        ui.label(who);
        ui.add_space((start + WHO - ui.cursor().left()).max(0.0));
        straight_ui(ui, which, who, sheet, scope);
        let mut is_frame = rest.frame_secs.is_some();
        let playhead = scope.bench.session.playback.playhead_secs;
        // The target's times are those of its own clip.
        let secs = if which == 0 { playhead } else { 0.0 };
        let tip = if which == 0 {
            "The pose of the clip at the playhead counts as rest"
        } else {
            "A pose of the target file's first clip counts as rest"
        };
        let label = format!("{who} rests as in a frame");
        let has_clip = which == 0 || has_target_clip(scope, pass.onto);
        let words = if is_frame { "frame at" } else { "of a frame" };
        let checkbox = ui.add_enabled(has_clip, egui::Checkbox::new(&mut is_frame, words));
        checkbox.widget_info(|| WidgetInfo::selected(Role::CheckBox, has_clip, is_frame, &label));
        if checkbox.on_hover_text(tip).changed() {
            let frame_secs = is_frame.then_some(secs);
            change(scope, sheet, changed(&|pass| pass.rests[which].frame_secs = frame_secs));
        }
        if let Some(mut secs) = rest.frame_secs {
            let value = DragValue::new(&mut secs).speed(0.01).suffix(" s").range(0.0..=1e6).max_decimals(3);
            let value = ui.add(value.update_while_editing(false));
            value.widget_info(|| WidgetInfo::labeled(Role::SpinButton, true, format!("{who} rest time")));
            if value.changed() {
                let pass = changed(&|pass| pass.rests[which].frame_secs = Some(secs));
                scope.out.push(if value.dragged() {
                    Command::Carry(CarryCommand::Preview(sheet.pass.0, Box::new(pass)))
                } else {
                    Command::Carry(CarryCommand::Change(sheet.pass.0, Box::new(pass)))
                });
            } else if value.drag_stopped() {
                change(scope, sheet, changed(&|pass| pass.rests[which].frame_secs = Some(secs)));
            }
        }
    });
}

fn straight_ui(ui: &mut Ui, which: usize, who: &str, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let mut pass = sheet.pass.1.clone();
    let is_straight = &mut pass.rests[which].is_straightened;
    let checkbox = ui.checkbox(is_straight, "straight");
    let label = format!("{who} rest straightened");
    checkbox.widget_info(|| WidgetInfo::selected(Role::CheckBox, true, *is_straight, &label));
    if checkbox.on_hover_text("Arms level and legs down, made of that pose").changed() {
        change(scope, sheet, pass);
    }
}

fn has_target_clip(scope: &Scope<'_>, onto: usize) -> bool {
    let source = scope.bench.project.as_ref().and_then(|project| project.sources.get(onto)?.source());
    source.is_some_and(|source| !source.clips.is_empty())
}

fn hold_ui(ui: &mut Ui, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    ui.horizontal_wrapped(|ui| held_ui(ui, sheet, scope));
}

fn held_ui(ui: &mut Ui, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let pass = sheet.pass.1;
    let mut plant = pass.plant_feet;
    let feet = ui.checkbox(&mut plant, "Planted feet");
    if feet.on_hover_text("Feet that stand in the source stand in the result: see the bars below").changed() {
        change(scope, sheet, RetargetPass { plant_feet: plant, ..pass.clone() });
    }
    let is_own = matches!(pass.limits, Some(KeptLimits::OfSource(_)));
    let mut within = pass.limits.is_some() && !is_own;
    let words = match &pass.limits {
        Some(KeptLimits::Given(limits)) => format!("Within limits {}", limits.title),
        _ => "Within adult limits".to_owned(),
    };
    let limits = ui.checkbox(&mut within, words);
    let tip = "Joints are brought softly within their limits after all else. Population norms for plausible animation";
    if limits.on_hover_text(tip).changed() {
        change(scope, sheet, RetargetPass { limits: within.then_some(KeptLimits::Adult), ..pass.clone() });
    }
    // The clip's own limits, where it has some, or had when they were chosen.
    let own = match &pass.limits {
        Some(KeptLimits::OfSource(limits)) => Some(limits.clone()),
        _ => scope.bench.work().and_then(|work| work.limits.clone()),
    };
    if let Some(own) = own {
        let mut within = is_own;
        let limits = ui.checkbox(&mut within, "Within this clip's limits");
        let tip = format!("The limits {} of the clip's joints are carried over by the joint map", own.title);
        if limits.on_hover_text(tip).changed() {
            let limits = within.then_some(KeptLimits::OfSource(own));
            change(scope, sheet, RetargetPass { limits, ..pass.clone() });
        }
    }
}

fn map_ui(ui: &mut Ui, sheet: &Sheet<'_>, scope: &mut Scope<'_>) {
    let pass = sheet.pass.1;
    ui.horizontal_wrapped(|ui| {
        ui.spacing_mut().item_spacing.x = 6.0;
        let mut button = |words: &str, is_on: bool, tip: &str, command: CarryCommand| {
            if ui.add_enabled(is_on, egui::Button::new(words)).on_hover_text(tip).clicked() {
                scope.out.push(Command::Carry(command));
            }
        };
        let has_map = sheet.facts.is_some();
        button("Load map…", has_map, "Take corrections from a file", CarryCommand::Ask(CarrySheet::LoadMap));
        button(
            "Save map…",
            has_map,
            "Write the joint map as a table",
            CarryCommand::Ask(CarrySheet::SaveMap),
        );
        button(
            "Keep for this pair",
            has_map,
            "The next clip of these two skeletons gets this map at once",
            CarryCommand::KeepMap,
        );
        button(
            "Forget corrections",
            !pass.rows.is_empty(),
            "All rows as they were found",
            CarryCommand::Change(sheet.pass.0, Box::new(RetargetPass { rows: Vec::new(), ..pass.clone() })),
        );
    });
}
