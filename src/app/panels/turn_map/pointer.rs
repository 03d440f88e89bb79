//! What the pointer does on the map, and what it is told there.

use egui::{Color32, Rect, Response, Role, Sense, Ui, WidgetInfo};

use super::super::super::commands::{Command, TimeCommand};
use super::super::super::view_models::{
    HeatKind, MapRow, SnagState, TimeChoice, degrees, rotation_at, seconds,
};
use super::super::super::widgets::{TimeAxis, read_out, scrub_and_zoom, spoken};
use super::super::Scope;
use super::Rows;
use super::marks::mark_at;
use crate::clip::Clip;

/// Chooses joints and snags, scrubs, chooses stretches, and reads out.
pub(super) fn pointer_ui(
    ui: &Ui,
    body: Rect,
    axis: &TimeAxis,
    clip: &Clip,
    rows: &Rows<'_>,
    scope: &mut Scope<'_>,
) {
    let over_time = Rect::from_x_y_ranges(axis.span, body.y_range()).intersect(ui.clip_rect());
    let response = ui.interact(over_time, ui.scope_id().with("turn map"), Sense::click_and_drag());
    let hovered = response.hover_pos().and_then(|pointer| hover_lines(pointer, axis, clip, rows, scope));
    response.widget_info(|| {
        let mut info = WidgetInfo::labeled(Role::Canvas, true, "Turn map rows");
        info.current_text_value = hovered.as_ref().map(|(_, lines)| spoken(lines));
        info
    });
    let is_choosing = choosing(ui, &response, axis, Some(rows), scope);
    let pressed = !is_choosing && ui.input(|input| input.pointer.primary_pressed());
    // Also a click whose press and release came in one frame.
    let is_press = response.is_pointer_button_down_on() || response.clicked();
    if is_press
        && pressed
        && let Some(pointer) = response.interact_pointer_pos()
    {
        let mark = mark_at(pointer, axis, rows, scope);
        scope.pictures.press_is_on_mark = mark.is_some();
        if let Some(index) = mark {
            scope.out.push(Command::ChooseSnag(index));
        } else {
            let joint = rows.at(pointer.y).map(|place| rows.visible[place].joint);
            scope.out.extend(joint.map(|joint| Command::ChooseJoint(Some(joint))));
        }
    }
    // Going to a snag moves time under the pointer: the press that chose it must not scrub as well.
    let chose_mark = scope.pictures.press_is_on_mark && is_press;
    if !is_choosing && !chose_mark {
        scrub_and_zoom(ui, &response, over_time, axis, clip, false, scope.out);
    }
    if let (Some(pointer), Some((joint, lines))) = (response.hover_pos(), hovered) {
        scope.out.push(Command::HoverJoint(joint));
        let layer =
            ui.ctx().layer_painter(egui::LayerId::new(egui::Order::Tooltip, ui.scope_id().with("read-out")));
        read_out(&layer, &scope.look, pointer, ui.ctx().content_rect(), &lines);
    }
}

/// The choice with a row taken in, or out where it was in.
pub(super) fn toggled(choice: &TimeChoice, row: &MapRow, rows: &Rows<'_>) -> TimeChoice {
    let own: Vec<usize> = row.members.iter().map(|&member| rows.heat.joints[member]).collect();
    let was_in = choice.joints.is_some() && own.iter().all(|&joint| choice.has_joint(joint));
    let mut joints = choice.joints.clone().unwrap_or_default();
    joints.retain(|joint| !own.contains(joint));
    if !was_in {
        joints.extend(own);
    }
    TimeChoice { span_secs: choice.span_secs, ..TimeChoice::of_joints(joints) }
}

/// Dragging with the command key held chooses a stretch of time, on rows their joints too; a mere click there takes a row in
/// or out. Gives whether that is what the pointer does.
pub(super) fn choosing(
    ui: &Ui,
    response: &Response,
    axis: &TimeAxis,
    rows: Option<&Rows<'_>>,
    scope: &mut Scope<'_>,
) -> bool {
    let (has_key, pressed, released) = ui.input(|input| {
        (input.modifiers.command, input.pointer.primary_pressed(), input.pointer.primary_released())
    });
    let Some(pointer) = response.interact_pointer_pos() else { return false };
    let joint_at = |y: f32| {
        rows.and_then(|rows| rows.at(y)).map(|place| rows.map_or(0, |rows| rows.visible[place].joint))
    };
    let is_own = response.is_pointer_button_down_on() || response.clicked();
    if pressed && has_key && is_own {
        scope.pictures.choosing = Some((axis.time(pointer.x), joint_at(pointer.y), pointer));
    } else if pressed && is_own {
        // The release of an older one was not seen.
        scope.pictures.choosing = None;
    }
    let Some((secs, joint, start)) = scope.pictures.choosing else { return false };
    let is_drag = start.distance(pointer) > 4.0;
    let choice = scope.bench.session.choice.clone();
    if is_drag && (is_own || response.drag_stopped()) {
        let mut joints = choice.joints.clone();
        if let (Some(rows), Some(first)) = (rows, joint) {
            let from = rows.visible.iter().position(|row| row.joint == first);
            let to =
                ((pointer.y - rows.top) / rows.height).floor().clamp(0.0, rows.visible.len() as f32 - 1.0);
            // The row of the press may have been scrolled away.
            let from = from.unwrap_or(to as usize);
            let span = from.min(to as usize)..=from.max(to as usize);
            let members = rows.visible[span].iter().flat_map(|row| &row.members);
            joints = TimeChoice::of_joints(members.map(|&own| rows.heat.joints[own])).joints;
        }
        let next = TimeChoice { joints, span_secs: None }.between(secs, axis.time(pointer.x));
        scope.out.push(Command::Time(TimeCommand::Choose(next)));
    } else if released && is_own {
        let row = rows.and_then(|rows| rows.at(start.y).map(|place| (rows, &rows.visible[place])));
        scope.out.push(Command::Time(TimeCommand::Choose(match row {
            Some((rows, row)) => toggled(&choice, row, rows),
            None => TimeChoice { span_secs: None, ..choice },
        })));
    }
    if released {
        scope.pictures.choosing = None;
    }
    true
}

/// What the pointer is on: the joint, and what is told about it there.
fn hover_lines(
    pointer: egui::Pos2,
    axis: &TimeAxis,
    clip: &Clip,
    rows: &Rows<'_>,
    scope: &Scope<'_>,
) -> Option<(usize, Vec<(String, Color32)>)> {
    let place = rows.at(pointer.y)?;
    let look = scope.look;
    let row = &rows.visible[place];
    let time = axis.time(pointer.x).clamp(0.0, clip.duration_secs);
    let frame = clip.grid.frame(time);
    let at = clip.grid.time(frame);
    // Of a folded limb the hottest joint is told.
    let joint = row.hottest(rows.heat, &(frame..frame + 1));
    let value = match rows.heat.kind {
        HeatKind::TurnRate => {
            let before = clip.grid.time(frame.saturating_sub(1));
            let secs = at - before;
            let turn = rotation_at(clip, joint, before).turn_to(rotation_at(clip, joint, at)).to_degrees();
            format!("{:.0} °/s", if secs > 0.0 { turn / secs } else { 0.0 })
        }
        HeatKind::Change => {
            let change = scope.bench.before().map_or(0.0, |source| {
                rotation_at(source, joint, at).turn_to(rotation_at(clip, joint, at)).to_degrees()
            });
            format!("{} from the source", degrees(change))
        }
        HeatKind::LimitUse => match &rows.heat.limits {
            Some((limits, _)) if limits.get(joint).is_some() => {
                let own = rows.heat.joints.iter().position(|&own| own == joint).unwrap_or(0);
                format!("{:.0} % of its limit", rows.heat.value(own, frame))
            }
            _ => "no limit".to_owned(),
        },
    };
    let mut name = clip.skeleton.label(joint).to_owned();
    if row.members.len() > 1 {
        name = format!("{name} (hottest of {})", row.members.len());
    }
    let mut lines =
        vec![(name, look.text), (format!("{}  frame {frame}", seconds(at)), look.faint), (value, look.text)];
    if let Some(index) = mark_at(pointer, axis, rows, scope) {
        let (snag, state) = (&scope.bench.snags()[index], scope.states[index]);
        let words = format!("{} {}, {}", snag.kind.letter(), snag.kind, state.word());
        lines.push((words, if state == SnagState::Open { look.error } else { look.faint }));
    }
    Some((joint, lines))
}
