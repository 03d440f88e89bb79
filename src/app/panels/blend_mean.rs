//! The mean of several clips: its rows in the blend lane, and its form in the list of passes.

use egui::{
    Align2, Button, Checkbox, ComboBox, DragValue, FontId, Grid, Painter, Rangef, Rect, Response, Role, Ui,
    UiBuilder, WidgetInfo, pos2, vec2,
};

use super::super::commands::{BlendCommand, Command};
use super::super::view_models::{LaneBars, clip_letter, mean_shares, mean_weights, with_mean_weight};
use super::super::widgets::TimeAxis;
use super::Scope;
use super::blend_form::{clip_choice_ui, clip_title, keep, named, settle};
use super::blend_lane::{Lane, clip_bar};
use crate::scene::{BlendForm, BlendPass, ClipRef, PassId};

/// Rows are never higher, and never lower than what a line of text needs; what has no room is not shown.
const ROW: Rangef = Rangef { min: 16.0, max: 27.0 };
/// Width of a weight's field.
const FIELD: f32 = 48.0;

/// The clips of a mean in the lane, one below the other, each with its weight and its share beside it.
pub(super) fn mean_lane_ui(
    ui: &mut Ui,
    lane: &Lane,
    bars: &LaneBars,
    area: Rect,
    axis: &TimeAxis,
    painter: &Painter,
    scope: &mut Scope<'_>,
) {
    let weights = mean_weights(&lane.pass.form);
    let shares = mean_shares(&weights);
    let secs: Vec<[f64; 2]> =
        [bars.first, bars.second].into_iter().chain(bars.more.iter().copied()).collect();
    let height = ((area.height() - 8.0) / weights.len() as f32).clamp(ROW.min, ROW.max);
    let carried = |clip: usize| {
        lane.facts.as_ref().is_some_and(|facts| match clip {
            0 => false,
            1 => facts.is_carried,
            _ => facts.more.get(clip - 2).is_some_and(|further| further.is_carried),
        })
    };
    let more = lane.pass.form.more().iter().map(|&(clip, _)| clip);
    let others: Vec<ClipRef> = std::iter::once(lane.pass.other).chain(more).collect();
    for (clip, secs) in secs.iter().enumerate() {
        let top = area.top() + 4.0 + height * clip as f32;
        let row = Rangef::new(top, top + height - 3.0);
        if row.max > area.bottom() {
            break;
        }
        let name = match clip.checked_sub(1) {
            None => scope.bench.work().map_or_else(String::new, |work| work.name.clone()),
            Some(other) => clip_title(scope, others[other]),
        };
        let name = if carried(clip) { name + ", carried over" } else { name };
        let fill = if clip == 0 { scope.look.before } else { scope.look.after };
        clip_bar(painter, (clip_letter(clip), &name), *secs, row, fill, axis, &scope.look);
        let field = Rect::from_x_y_ranges(Rangef::new(axis.span.min - 8.0 - FIELD, axis.span.min - 8.0), row);
        let mut weight = weights[clip];
        let mut inner = ui.new_child(UiBuilder::new().max_rect(field).id_salt(("mean weight", clip)));
        // A row of the lane is lower than a button.
        inner.spacing_mut().interact_size.y = field.height();
        inner.spacing_mut().button_padding.y = 0.0;
        let response = weight_ui(&mut inner, &mut weight, clip, field.size());
        let form = with_mean_weight(&lane.pass.form, clip, weight);
        settle(&response, lane.id, BlendPass { form, ..lane.pass.clone() }.into(), scope);
        let at = pos2(field.left() - 6.0, field.center().y);
        let words = format!("{} {:.0} %", clip_letter(clip), 100.0 * shares[clip]);
        let font = FontId::proportional(11.5);
        ui.painter().text(at, Align2::RIGHT_CENTER, words, font, scope.look.faint);
    }
}

fn weight_ui(ui: &mut Ui, weight: &mut f64, clip: usize, size: egui::Vec2) -> Response {
    let field = DragValue::new(weight).range(0.0..=1000.0).speed(0.02).max_decimals(3);
    let response = ui.add_sized(size, field);
    response.widget_info(|| {
        WidgetInfo::labeled(Role::SpinButton, true, format!("Weight of {} in the mean", clip_letter(clip)))
    });
    response.on_hover_text("Its weight; only the ratio to the others matters. Drag, or click and type")
}

/// The parameters of a mean.
pub(super) fn mean_form_ui(ui: &mut Ui, id: PassId, pass: &BlendPass, scope: &mut Scope<'_>) {
    let weights = mean_weights(&pass.form);
    let shares = mean_shares(&weights);
    Grid::new(("mean of clips", id.0)).num_columns(4).spacing(vec2(6.0, 4.0)).show(ui, |ui| {
        for clip in 0..weights.len() {
            ui.label(clip_letter(clip).to_string());
            let mut weight = weights[clip];
            let response = weight_ui(ui, &mut weight, clip, vec2(FIELD, 20.0));
            let form = with_mean_weight(&pass.form, clip, weight);
            settle(&response, id, BlendPass { form, ..pass.clone() }.into(), scope);
            ui.label(format!("{:.0} %", 100.0 * shares[clip]));
            ui.horizontal(|ui| member_ui(ui, id, pass, clip, scope));
            ui.end_row();
        }
    });
    more_ui(ui, id, pass, scope);
    let BlendForm::Mean { is_aligned, .. } = pass.form else { return };
    let mut in_step = is_aligned;
    let response = ui.add(Checkbox::new(&mut in_step, "In step"));
    let response =
        response.on_hover_text("All clips are bent in time so that their steps fall together with A's");
    if response.changed() {
        keep(id, with_step(pass, in_step).into(), scope);
    }
}

/// Which clip a row is of, and what takes it out.
fn member_ui(ui: &mut Ui, id: PassId, pass: &BlendPass, clip: usize, scope: &mut Scope<'_>) {
    let Some(other) = clip.checked_sub(1) else {
        let name = scope.bench.work().map_or_else(String::new, |work| work.name.clone());
        ui.add(egui::Label::new(name).truncate());
        return;
    };
    let members = members(pass);
    let words =
        if clip == 1 { "Second clip".to_owned() } else { format!("Clip {} of the mean", clip_letter(clip)) };
    let width = (ui.available_width() - 32.0).clamp(60.0, 220.0);
    let choice = clip_choice_ui(ui, ("mean clip", id.0, clip), &words, members[other].0, width, scope);
    if choice.wants_file {
        scope.out.push(Command::Blend(BlendCommand::AskForMember(id, other)));
    } else if choice.clip != members[other].0 {
        let mut changed = members.clone();
        changed[other].0 = choice.clip;
        keep(id, with_members(pass, &changed).into(), scope);
    }
    if members.len() < 2 {
        return;
    }
    let response = ui.add(Button::new("×").min_size(vec2(20.0, 20.0)));
    named(&response, Role::Button, &format!("Take clip {} out of the mean", clip_letter(clip)));
    if response.on_hover_text("Take it out of the mean").clicked() {
        let mut changed = members;
        changed.remove(other);
        keep(id, with_members(pass, &changed).into(), scope);
    }
}

/// One clip more, and equal weights.
fn more_ui(ui: &mut Ui, id: PassId, pass: &BlendPass, scope: &mut Scope<'_>) {
    let weights = mean_weights(&pass.form);
    ui.horizontal_wrapped(|ui| {
        let Some(project) = &scope.bench.project else { return };
        let document = std::sync::Arc::clone(project.document());
        let mut chosen: Option<ClipRef> = None;
        let mut wants_file = false;
        let combo = ComboBox::from_id_salt(("one clip more", id.0)).selected_text("Add a clip…").width(110.0);
        let response = combo
            .show_ui(ui, |ui| {
                for (index, work) in document.works.iter().enumerate() {
                    let clip = ClipRef { source: work.source, clip: work.clip };
                    if index != scope.bench.session.work {
                        ui.selectable_value(&mut chosen, Some(clip), clip_title(scope, clip));
                    }
                }
                wants_file = ui.button("Open a file…").clicked();
            })
            .response;
        named(&response, Role::ComboBox, "Add a clip to the mean");
        if wants_file {
            scope.out.push(Command::Blend(BlendCommand::AskForMember(id, members(pass).len())));
        } else if let Some(clip) = chosen {
            let mut changed = members(pass);
            changed.push((clip, 1.0));
            keep(id, with_members(pass, &changed).into(), scope);
        }
        let are_equal = weights.iter().all(|weight| *weight == weights[0]);
        if !are_equal && ui.button("Equal weights").clicked() {
            let form =
                (0..weights.len()).fold(pass.form.clone(), |form, clip| with_mean_weight(&form, clip, 1.0));
            keep(id, BlendPass { form, ..pass.clone() }.into(), scope);
        }
    });
}

/// The clips beside the first one, with their weights.
fn members(pass: &BlendPass) -> Vec<(ClipRef, f64)> {
    let second = mean_weights(&pass.form).get(1).copied().unwrap_or(1.0);
    std::iter::once((pass.other, second)).chain(pass.form.more().iter().copied()).collect()
}

/// The same mean of other clips beside the first one.
fn with_members(pass: &BlendPass, members: &[(ClipRef, f64)]) -> BlendPass {
    match (&pass.form, members) {
        (BlendForm::Mean { weights: [own, _], is_aligned, .. }, &[(other, weight), ref more @ ..]) => {
            let form =
                BlendForm::Mean { weights: [*own, weight], more: more.to_vec(), is_aligned: *is_aligned };
            BlendPass { other, form, ..pass.clone() }
        }
        _ => pass.clone(),
    }
}

fn with_step(pass: &BlendPass, in_step: bool) -> BlendPass {
    let mut changed = pass.clone();
    if let BlendForm::Mean { is_aligned, .. } = &mut changed.form {
        *is_aligned = in_step;
    }
    changed
}
