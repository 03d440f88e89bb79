//! The bar below the curves: numbers to type for what is chosen, and the tools for captured curves.

use egui::{Align, ComboBox, DragValue, Layout, Rect, RichText, Role, Ui, UiBuilder, WidgetInfo, vec2};

use super::super::super::commands::{Action, Command, CurveAction, CurveCommand};
use super::super::super::theme::INSET;
use super::super::super::view_models::{Grip, KeyDrag, counted, key_at, seconds};
use super::super::super::widgets::tooltip_text;
use super::super::Scope;
use super::chart::Chart;
use crate::clip::{PathKind, Spacing};

/// The bar.
pub(super) fn bar_ui(ui: &mut Ui, bounds: Rect, chart: &Chart<'_>, scope: &mut Scope<'_>) {
    let look = scope.look;
    ui.painter().rect_filled(bounds, 0.0, look.panel);
    ui.painter().hline(bounds.x_range(), bounds.top(), (1.0, look.line));
    let inside = bounds.shrink2(vec2(INSET, 3.0));
    let layout = Layout::left_to_right(Align::Center);
    let mut row = ui.new_child(UiBuilder::new().id_salt("curve bar").max_rect(inside).layout(layout));
    row.shrink_clip_rect(bounds);
    row.spacing_mut().item_spacing.x = 5.0;
    row.spacing_mut().interact_size.x = 44.0;
    let session = &scope.bench.session;
    if !session.curves.keys.is_empty() {
        keys_ui(&mut row, chart, scope);
    } else if session.curves.segment.is_some() {
        segment_ui(&mut row, chart, scope);
    } else {
        tools_ui(&mut row, scope);
    }
    let is_on = scope.bench.session.curves.snaps_to_frames;
    let free = row.available_rect_before_wrap();
    if free.width() > 74.0 {
        let mut end = row.new_child(
            UiBuilder::new().id_salt("snap").max_rect(free).layout(Layout::right_to_left(Align::Center)),
        );
        let mut on = is_on;
        let response = end.checkbox(&mut on, RichText::new("frames").size(12.5));
        response.widget_info(|| WidgetInfo::selected(Role::CheckBox, true, is_on, "Snap keys to frames"));
        let tip = tooltip_text(ui, Action::Curve(CurveAction::Snap));
        if response.on_hover_text(tip).changed() {
            scope.out.push(Command::Do(Action::Curve(CurveAction::Snap)));
        }
    }
}

/// A number that is typed or dragged: shown while it is dragged, done when it is let go or typed.
struct Field<'a> {
    label: &'a str,
    value: f64,
    speed: f64,
    decimals: usize,
    suffix: &'a str,
    tip: &'a str,
}

impl Field<'_> {
    fn show(&self, ui: &mut Ui, scope: &mut Scope<'_>, drag: impl Fn(f64) -> KeyDrag) {
        let mut typed = self.value;
        let response = ui.add(
            DragValue::new(&mut typed)
                .speed(self.speed)
                .fixed_decimals(self.decimals)
                .suffix(self.suffix)
                .update_while_editing(false),
        );
        let mut info = WidgetInfo::drag_value(true, self.value);
        info.label = Some(self.label.to_owned());
        response.widget_info(|| info.clone());
        let response = response.on_hover_text(self.tip);
        if response.drag_stopped() || (response.changed() && !response.dragged()) {
            scope.out.push(Command::Curve(CurveCommand::Settle(drag(typed))));
        } else if response.changed() {
            scope.out.push(Command::Curve(CurveCommand::Try(drag(typed))));
        }
    }
}

fn words(ui: &mut Ui, scope: &Scope<'_>, text: impl Into<String>) {
    ui.label(RichText::new(text).size(12.5).color(scope.look.faint));
}

fn keys_ui(ui: &mut Ui, chart: &Chart<'_>, scope: &mut Scope<'_>) {
    let choice = &scope.bench.session.curves.keys;
    let (count, span) = (choice.len(), choice.span());
    let Some((joint, secs)) = choice.rows().find_map(|(joint, times)| Some((joint, *times.first()?))) else {
        return;
    };
    let line = scope.bench.session.curves.line;
    let under_way = match scope.bench.curve_hand.drag() {
        Some(KeyDrag::Move { by_secs, by_deg, .. }) => [by_secs, by_deg],
        _ => [0.0; 2],
    };
    let set = chart.sets.iter().find(|set| set.joint == joint);
    let can_move = set.is_some_and(|set| set.unit == "°");
    let grip = |line: usize| Grip { joint, secs, line };
    if count == 1 {
        let frame = chart.clip.grid.frame(secs + under_way[0]);
        words(ui, scope, format!("Key at frame {frame}"));
        let field = Field {
            label: "Key time",
            value: secs + under_way[0],
            speed: 0.25 / chart.clip.grid.rate.max(1e-6),
            decimals: 4,
            suffix: " s",
            tip: "When the key stands; Shift while dragging: finely",
        };
        field.show(ui, scope, |to| KeyDrag::Move { grip: grip(0), by_secs: to - secs, by_deg: 0.0 });
        let Some(set) = set.filter(|_| can_move) else { return };
        for (index, own) in set.lines.iter().enumerate().take(3) {
            let Some(now) = chart.value(set, index, secs + under_way[0]) else { continue };
            // What is shown already holds what was dragged.
            let is_held = matches!(scope.bench.curve_hand.drag(), Some(KeyDrag::Move { grip, .. }) if grip.line == index);
            let before = if is_held { now - under_way[1] } else { now };
            words(ui, scope, own.name.clone());
            let label = format!("Key {}", own.name);
            let field = Field {
                label: &label,
                value: now,
                speed: 0.25,
                decimals: 2,
                suffix: "°",
                tip: "The number of the key; the others stay",
            };
            field.show(ui, scope, |to| KeyDrag::Move {
                grip: grip(index),
                by_secs: 0.0,
                by_deg: to - before,
            });
        }
        return;
    }
    words(ui, scope, counted(count, "key"));
    words(ui, scope, "shift");
    let field = Field {
        label: "Shift keys by",
        value: under_way[0],
        speed: 0.25 / chart.clip.grid.rate.max(1e-6),
        decimals: 3,
        suffix: " s",
        tip: "Moves the chosen keys in time",
    };
    field.show(ui, scope, |to| KeyDrag::Move { grip: grip(line), by_secs: to, by_deg: 0.0 });
    if let Some([first, last]) = span
        && last > first
    {
        words(ui, scope, "scale");
        let factor = match scope.bench.curve_hand.drag() {
            Some(KeyDrag::Scale { factor, .. }) => factor,
            _ => 1.0,
        };
        let field = Field {
            label: "Scale time of keys",
            value: factor * 100.0,
            speed: 0.5,
            decimals: 1,
            suffix: " %",
            tip: "Draws the chosen keys out or together in time; the first one stays",
        };
        field.show(ui, scope, |to| KeyDrag::Scale { about_secs: first, factor: (to / 100.0).max(0.0) });
    }
    if can_move && let Some(own) = set.and_then(|set| set.lines.get(line)) {
        words(ui, scope, format!("turn {}", own.name));
        let field = Field {
            label: "Turn keys by",
            value: under_way[1],
            speed: 0.25,
            decimals: 2,
            suffix: "°",
            tip: "Moves the chosen keys up or down on the curve with the dot",
        };
        field.show(ui, scope, |to| KeyDrag::Move { grip: grip(line), by_secs: 0.0, by_deg: to });
    }
    shape_ui(ui, scope);
}

/// The spacings that have a name, with the words of the bar.
const SPACINGS: [(Spacing, &str); 4] = [
    (Spacing::Even, "even"),
    (Spacing::EaseIn, "ease in"),
    (Spacing::EaseOut, "ease out"),
    (Spacing::EaseBoth, "ease both"),
];

/// Path and spacing for what lies between the chosen keys.
fn shape_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let path = ui.menu_button(RichText::new("path").size(12.5), |ui| {
        for kind in PathKind::ALL.into_iter().filter(|kind| *kind != PathKind::Cubic) {
            if ui.button(kind.name()).clicked() {
                scope.out.push(Command::Curve(CurveCommand::SetPath(kind)));
                ui.close();
            }
        }
    });
    let info = || WidgetInfo::labeled(Role::ComboBox, true, "Path between the chosen keys");
    path.response.widget_info(info);
    let tip = "From each chosen key to the next; all keys stay";
    path.response.on_hover_text(tip);
    let spacing = ui.menu_button(RichText::new("spacing").size(12.5), |ui| {
        for (spacing, name) in SPACINGS {
            if ui.button(name).clicked() {
                scope.out.push(Command::Curve(CurveCommand::SetSpacing(spacing)));
                ui.close();
            }
        }
    });
    let info = || WidgetInfo::labeled(Role::ComboBox, true, "Spacing between the chosen keys");
    spacing.response.widget_info(info);
    spacing
        .response
        .on_hover_text("How fast the way from key to key is gone, where there are frames between them");
    if scope.now.chosen_keys > 2 {
        let action = Action::Curve(CurveAction::OneSegment);
        let one = ui.button(RichText::new("one segment").size(12.5));
        one.widget_info(|| WidgetInfo::labeled(Role::Button, true, "Make one segment"));
        if one.on_hover_text(tooltip_text(ui, action)).clicked() {
            scope.out.push(Command::Do(action));
        }
    }
}

fn segment_ui(ui: &mut Ui, chart: &Chart<'_>, scope: &mut Scope<'_>) {
    let Some((joint, start)) = scope.bench.session.curves.segment else { return };
    let Some(track) = chart.track(joint) else { return };
    let Some(segment) = key_at(track, start).filter(|key| key + 1 < track.keys.len()) else {
        words(ui, scope, "The chosen segment is no longer there");
        return;
    };
    let kind = track.kind_of(segment, None);
    words(ui, scope, "path");
    let mut chosen = kind;
    let combo = ComboBox::from_id_salt("path kind").selected_text(kind.name()).width(74.0);
    let response = combo.show_ui(ui, |ui| {
        for own in PathKind::ALL.into_iter().filter(|own| *own != PathKind::Cubic || kind == PathKind::Cubic)
        {
            ui.selectable_value(&mut chosen, own, own.name());
        }
    });
    response.response.widget_info(|| WidgetInfo::labeled(Role::ComboBox, true, "Path of the segment"));
    if chosen != kind {
        scope.out.push(Command::Curve(CurveCommand::SetPath(chosen)));
    }
    words(ui, scope, "spacing");
    let own = track.segments.of(segment);
    let name = SPACINGS.iter().find(|(spacing, _)| *spacing == own.spacing).map_or("own", |(_, name)| name);
    let mut spacing = own.spacing;
    let combo = ComboBox::from_id_salt("spacing").selected_text(name).width(74.0);
    let response = combo.show_ui(ui, |ui| {
        for (each, name) in SPACINGS {
            ui.selectable_value(&mut spacing, each, name);
        }
    });
    response.response.widget_info(|| WidgetInfo::labeled(Role::ComboBox, true, "Spacing of the segment"));
    if spacing != own.spacing {
        scope.out.push(Command::Curve(CurveCommand::SetSpacing(spacing)));
    }
    ui.add_enabled_ui(kind.takes_turns(), |ui| {
        ui.spacing_mut().button_padding.x = 5.0;
        let buttons = [
            (CurveAction::OtherWay, "other way", "Go the other way round"),
            (CurveAction::TurnLess, "− turn", "One turn less"),
            (CurveAction::TurnMore, "+ turn", "One turn more"),
        ];
        for (action, short, name) in buttons {
            let action = Action::Curve(action);
            let response = ui.button(RichText::new(short).size(12.5));
            response.widget_info(|| WidgetInfo::labeled(Role::Button, kind.takes_turns(), name));
            if response.on_hover_text(tooltip_text(ui, action)).clicked() {
                scope.out.push(Command::Do(action));
            }
        }
    });
    let peak = track.highest_rate(segment);
    let turns = own.turn.whole();
    let turns = if turns == 0 {
        String::new()
    } else {
        format!("{turns:+} turn{} · ", if turns.abs() == 1 { "" } else { "s" })
    };
    let rate = peak.rate_rad.to_degrees();
    words(ui, scope, format!("{turns}at most {rate:.0}°/s at {}", seconds(peak.time_secs)));
}

fn tools_ui(ui: &mut Ui, scope: &mut Scope<'_>) {
    let session = &scope.bench.session;
    let (falloff, hertz, degrees) =
        (session.falloff_secs, session.curves.smooth_hz, session.curves.reduce_deg);
    let number = |ui: &mut Ui, value: f64, speed: f64, suffix: &str, label: &str, tip: &str| -> Option<f64> {
        let mut typed = value;
        let response = ui.add(DragValue::new(&mut typed).speed(speed).max_decimals(3).suffix(suffix));
        let mut info = WidgetInfo::drag_value(true, value);
        info.label = Some(label.to_owned());
        response.widget_info(|| info.clone());
        response.on_hover_text(tip).changed().then_some(typed)
    };
    words(ui, scope, "push reaches");
    let tip = "Seconds to either side over which a drag of a captured curve fades. Alt and the wheel set it as well";
    if let Some(secs) = number(ui, falloff, 0.01, " s", "Reach of a soft push", tip) {
        scope.out.push(Command::Curve(CurveCommand::SetFalloff(secs)));
    }
    ui.add_space(6.0);
    short_button(ui, CurveAction::Smooth, "Smooth", scope);
    let tip = "What is faster than this goes";
    if let Some(hertz) = number(ui, hertz, 0.05, " Hz", "Smooth below", tip) {
        scope.out.push(Command::Curve(CurveCommand::SetSmoothing(hertz)));
    }
    ui.add_space(6.0);
    short_button(ui, CurveAction::Reduce, "Reduce", scope);
    let tip = "The most that any turn may change";
    if let Some(degrees) = number(ui, degrees, 0.01, "°", "Reduce within", tip) {
        scope.out.push(Command::Curve(CurveCommand::SetReduction(degrees)));
    }
    let session = &scope.bench.session;
    let range = match (session.choice.span_secs, session.playback.range) {
        (Some([from, to]), _) => format!("over the choice, {} to {}", seconds(from), seconds(to)),
        (None, Some((from, to))) => format!("over the loop, {} to {}", seconds(from), seconds(to)),
        (None, None) => "over the whole clip".to_owned(),
    };
    words(ui, scope, range);
}

fn short_button(ui: &mut Ui, action: CurveAction, short: &str, scope: &mut Scope<'_>) {
    let action = Action::Curve(action);
    let response = ui.button(RichText::new(short).size(12.5));
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, action.entry().label));
    if response.on_hover_text(tooltip_text(ui, action)).clicked() {
        scope.out.push(Command::Do(action));
    }
}
