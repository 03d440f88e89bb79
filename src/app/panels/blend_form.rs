//! The parameters of a blend and of a loop, for the list of passes.

use egui::{Button, Checkbox, ComboBox, DragValue, Response, Role, Sense, Slider, Ui, WidgetInfo, vec2};

use super::super::bench::file_name;
use super::super::commands::{BlendCommand, Command};
use super::super::theme::Look;
use super::super::view_models::{BlendKind, held_place, knots_of, weight_at, with_knot, with_knot_at};
use super::Scope;
use super::blend_lane::Lane;
use super::blend_mean::mean_form_ui;
use crate::blend::{JoinPlace, Mask, Reference, RootFrom, Side};
use crate::scene::{BlendForm, BlendPass, ClipRef, Closing, Edit, LoopPass, PassId, PassStep};

/// How a clip is called: with its file where several are open.
pub(super) fn clip_title(scope: &Scope<'_>, clip: ClipRef) -> String {
    let Some(project) = &scope.bench.project else { return String::new() };
    let document = project.document();
    let name = document
        .work_on(clip)
        .map_or_else(|| format!("clip {}", clip.clip + 1), |work| document.works[work].name.clone());
    match document.sources.get(clip.source) {
        Some(source) if document.sources.len() > 1 => format!("{}: {name}", file_name(&source.path)),
        _ => name,
    }
}

/// One of the forms, underlined where it is the one. Gives whether it was clicked.
pub(super) fn kind_ui(ui: &mut Ui, kind: BlendKind, is_on: bool, look: &Look) -> bool {
    let font = egui::TextStyle::Button.resolve(ui.style());
    let color = if is_on { look.text } else { look.faint };
    let galley = ui.painter().layout_no_wrap(kind.word().to_owned(), font, color);
    let (bounds, response) = ui.allocate_exact_size(galley.size() + vec2(12.0, 6.0), Sense::click());
    response.widget_info(|| {
        WidgetInfo::selected(Role::RadioButton, true, is_on, format!("Blend form {}", kind.word()))
    });
    if response.hovered() || response.has_focus() {
        ui.painter().rect_filled(bounds, 4.0, look.hover);
    }
    ui.painter().galley(bounds.center() - galley.size() / 2.0, galley, color);
    super::super::widgets::focus_ring(ui, &response);
    if is_on {
        let bottom = bounds.bottom() - 1.0;
        ui.painter().hline(bounds.left() + 6.0..=bounds.right() - 6.0, bottom, (1.5, look.selection));
    }
    response.on_hover_text(kind.explanation()).clicked()
}

/// The parameters below the title of a pass, where it is a blend or a loop.
pub(crate) fn blend_form_ui(ui: &mut Ui, id: PassId, step: &PassStep, scope: &mut Scope<'_>) {
    let shown = match &scope.bench.preview {
        Some((pass, preview)) if *pass == id => preview.clone(),
        _ => step.clone(),
    };
    ui.indent(("blend form", id.0), |ui| match &shown {
        PassStep::Blend(blend) => blend_ui(ui, id, blend, scope),
        PassStep::Loop(own) => loop_ui(ui, id, own, scope),
        _ => {}
    });
}

/// Shows a step while its widget is dragged, and keeps it when it is let go or typed.
pub(super) fn settle(response: &Response, id: PassId, step: PassStep, scope: &mut Scope<'_>) {
    if response.drag_stopped() || (response.changed() && !response.dragged()) {
        keep(id, step, scope);
    } else if response.changed() {
        scope.out.push(Command::PreviewPass(id, Box::new(step)));
    }
}

pub(super) fn keep(id: PassId, step: PassStep, scope: &mut Scope<'_>) {
    let work = scope.bench.session.work;
    scope.out.push(Command::Edit(Edit::ChangePass { work, pass: id, step }));
}

pub(super) fn named(response: &Response, role: Role, words: &str) {
    response.widget_info(|| WidgetInfo::labeled(role, true, words));
}

/// Seconds to drag or type.
fn secs_ui(ui: &mut Ui, words: &str, value: &mut f64, range: [f64; 2], step: f64) -> Response {
    ui.horizontal(|ui| {
        ui.label(words);
        let field = DragValue::new(value)
            .range(range[0]..=range[1].max(range[0]))
            .speed(step)
            .max_decimals(4)
            .suffix(" s");
        let response = ui.add(field);
        response.widget_info(|| WidgetInfo::labeled(Role::SpinButton, true, words));
        response
    })
    .inner
}

fn blend_ui(ui: &mut Ui, id: PassId, pass: &BlendPass, scope: &mut Scope<'_>) {
    let lane = Lane::of(scope).filter(|lane| lane.id == id);
    if lane.is_none() && ui.button("Show in the lane").clicked() {
        scope.out.push(Command::Blend(BlendCommand::Show(id)));
    }
    let kind = BlendKind::of(&pass.form);
    if kind != BlendKind::Mean {
        other_ui(ui, id, pass, scope);
    }
    let (lengths, rate) = lane.as_ref().map_or(([1.0, 1.0], 30.0), |lane| (lane.lengths, lane.rate));
    ui.horizontal(|ui| {
        for other in BlendKind::ALL {
            if kind_ui(ui, other, kind == other, &scope.look) && kind != other {
                keep(
                    id,
                    BlendPass { form: other.form(lengths[0], lengths[1]), ..pass.clone() }.into(),
                    scope,
                );
            }
        }
    });
    match &pass.form {
        BlendForm::Join(place) => join_ui(ui, id, pass, *place, lane.as_ref(), scope),
        BlendForm::Mix { is_aligned, root, .. } => {
            weight_ui(ui, id, pass, lengths[0], rate, scope);
            let mut in_step = *is_aligned;
            let response = ui.add(Checkbox::new(&mut in_step, "In step"));
            let response =
                response.on_hover_text("Both clips are bent in time so that their steps fall together");
            if response.changed() {
                keep(id, with_mix(pass, Some(in_step), None), scope);
            }
            root_ui(ui, id, pass, *root, scope);
        }
        BlendForm::Add { weight, reference, side } => {
            weight_ui(ui, id, pass, lengths[0], rate, scope);
            let (mut reference, mut side) = (*reference, *side);
            let mut changed = false;
            ui.horizontal(|ui| {
                ui.label("beyond its");
                for (own, words) in [
                    (Reference::First, "first frame"),
                    (Reference::Rest, "rest pose"),
                    (Reference::Mean, "mean"),
                ] {
                    changed |= ui.radio_value(&mut reference, own, words).changed();
                }
            });
            ui.horizontal(|ui| {
                ui.label("composed in");
                for (own, words) in [(Side::Body, "the joint's frame"), (Side::Parent, "the parent's")] {
                    changed |= ui.radio_value(&mut side, own, words).changed();
                }
            });
            if changed {
                let form = BlendForm::Add { weight: *weight, reference, side };
                keep(id, BlendPass { form, ..pass.clone() }.into(), scope);
            }
        }
        BlendForm::Mean { .. } => mean_form_ui(ui, id, pass, scope),
    }
    if kind != BlendKind::Add {
        let mut holds = pass.holds_feet;
        let response = ui.add(Checkbox::new(&mut holds, "Keep planted feet"));
        if response
            .on_hover_text("A foot that stands in the clips stands at one place in the blend")
            .changed()
        {
            keep(id, BlendPass { holds_feet: holds, ..pass.clone() }.into(), scope);
        }
    }
    mask_ui(ui, id, pass, scope);
}

/// What was chosen in a box of clips.
pub(super) struct ClipChoice {
    /// The clip: the one that it was, or another.
    pub(super) clip: ClipRef,
    /// It is to come from a file that is not open yet.
    pub(super) wants_file: bool,
}

/// A box with all clips but the one on show.
pub(super) fn clip_choice_ui(
    ui: &mut Ui,
    salt: impl egui::AsIdSalt,
    words: &str,
    clip: ClipRef,
    width: f32,
    scope: &Scope<'_>,
) -> ClipChoice {
    let mut choice = ClipChoice { clip, wants_file: false };
    let Some(project) = &scope.bench.project else { return choice };
    let document = std::sync::Arc::clone(project.document());
    let combo = ComboBox::from_id_salt(salt).selected_text(clip_title(scope, clip)).width(width).truncate();
    let response = combo
        .show_ui(ui, |ui| {
            for (index, work) in document.works.iter().enumerate() {
                let clip = ClipRef { source: work.source, clip: work.clip };
                if index != scope.bench.session.work {
                    ui.selectable_value(&mut choice.clip, clip, clip_title(scope, clip));
                }
            }
            choice.wants_file = ui.button("Open a file…").clicked();
        })
        .response;
    named(&response, Role::ComboBox, words);
    choice
}

/// Which clip is the second.
fn other_ui(ui: &mut Ui, id: PassId, pass: &BlendPass, scope: &mut Scope<'_>) {
    let choice = ui.horizontal(|ui| {
        ui.label("with");
        let width = (ui.available_width() - 8.0).clamp(80.0, 260.0);
        clip_choice_ui(ui, ("second clip", id.0), "Second clip", pass.other, width, scope)
    });
    let ClipChoice { clip: chosen, wants_file } = choice.inner;
    if wants_file {
        scope.out.push(Command::Blend(BlendCommand::AskForFile(Some(id))));
    } else if chosen != pass.other {
        let mut step = BlendPass { other: chosen, ..pass.clone() };
        if let (BlendForm::Join(place), Some(lane)) = (&pass.form, Lane::of(scope)) {
            // The other clip may be too short for the place.
            let second = scope
                .bench
                .project
                .as_ref()
                .and_then(|project| project.result_clip(project.document().work_on(chosen)?));
            if let Some(second) = second {
                step.form = BlendForm::Join(held_place(*place, [lane.lengths[0], second.duration_secs]));
            }
        }
        keep(id, step.into(), scope);
    }
}

fn join_ui(
    ui: &mut Ui,
    id: PassId,
    pass: &BlendPass,
    place: JoinPlace,
    lane: Option<&Lane>,
    scope: &mut Scope<'_>,
) {
    let lengths = lane.map_or([f64::MAX; 2], |lane| lane.lengths);
    let step = lane.map_or(0.01, |lane| 1.0 / lane.rate);
    let shorter = lengths[0].min(lengths[1]);
    let mut to = place;
    let responses = [
        secs_ui(ui, "Overlap", &mut to.overlap_secs, [step, shorter], step),
        secs_ui(ui, "Begins in A at", &mut to.first_secs, [0.0, lengths[0]], step),
        secs_ui(ui, "Begins in B at", &mut to.second_secs, [0.0, lengths[1]], step),
    ];
    for response in &responses {
        let step = BlendPass { form: BlendForm::Join(held_place(to, lengths)), ..pass.clone() };
        settle(response, id, step.into(), scope);
    }
    let Some(facts) = lane.and_then(|lane| lane.facts.as_ref()) else { return };
    ui.horizontal_wrapped(|ui| {
        ui.label("Best places");
        for (number, (best, distance)) in facts.places.iter().enumerate() {
            let words = format!("{}", number + 1);
            let response = ui.add(Button::new(words).min_size(vec2(24.0, 20.0)));
            named(&response, Role::Button, &format!("Best place {}", number + 1));
            let tooltip = format!(
                "{:.2} s of A over {:.2} s of B; poses {distance:.4} apart",
                best.first_secs, best.second_secs
            );
            if response.on_hover_text(tooltip).clicked() {
                let form = BlendForm::Join(held_place(*best, facts_lengths(facts)));
                keep(id, BlendPass { form, ..pass.clone() }.into(), scope);
            }
        }
    });
}

fn facts_lengths(facts: &super::super::view_models::BlendFacts) -> [f64; 2] {
    [facts.first.duration_secs, facts.second.duration_secs]
}

/// One weight to drag, or what the curve is.
fn weight_ui(ui: &mut Ui, id: PassId, pass: &BlendPass, most_secs: f64, rate: f64, scope: &mut Scope<'_>) {
    let (knots, [least, most]) = knots_of(&pass.form);
    if let [[_, weight]] = knots.as_slice() {
        let mut percent = 100.0 * weight;
        ui.horizontal(|ui| {
            ui.label("Weight");
            ui.spacing_mut().slider_width = (ui.available_width() - 78.0).clamp(40.0, 200.0);
            let range = 100.0 * least..=100.0 * most;
            // A weight that is typed may be any that the blend takes.
            let clamping = match &pass.form {
                BlendForm::Add { .. } => egui::SliderClamping::Never,
                _ => egui::SliderClamping::Always,
            };
            let slider = Slider::new(&mut percent, range).suffix(" %").max_decimals(1).clamping(clamping);
            let response = ui.add(slider);
            response.widget_info(|| WidgetInfo::slider(true, percent, "Weight of the second clip"));
            let form = match &pass.form {
                BlendForm::Add { reference, side, .. } => {
                    BlendForm::Add { weight: percent / 100.0, reference: *reference, side: *side }
                }
                form => with_knot(form, 0, [0.0, percent / 100.0], most_secs),
            };
            settle(&response, id, BlendPass { form, ..pass.clone() }.into(), scope);
        });
    } else {
        ui.horizontal_wrapped(|ui| {
            ui.label(format!("Weight: a curve of {} knots", knots.len()));
            if ui.button("One weight").on_hover_text("The curve's mean all along").clicked() {
                let mean = knots.iter().map(|knot| knot[1]).sum::<f64>() / knots.len() as f64;
                let form = match &pass.form {
                    BlendForm::Mix { is_aligned, root, .. } => BlendForm::Mix {
                        weight: crate::blend::MixAlong::constant(mean),
                        is_aligned: *is_aligned,
                        root: *root,
                    },
                    form => form.clone(),
                };
                keep(id, BlendPass { form, ..pass.clone() }.into(), scope);
            }
        });
    }
    if matches!(pass.form, BlendForm::Mix { .. })
        && ui.button("Knot at playhead").on_hover_text("A weight of its own at this time").clicked()
    {
        let now = scope.bench.session.playback.playhead_secs;
        let now = scope.bench.blend_facts().map_or(now, |facts| facts.first_secs(now));
        let secs = ((now * rate).round() / rate).clamp(0.0, most_secs);
        let form = with_knot_at(&pass.form, secs, weight_at(&pass.form, secs));
        keep(id, BlendPass { form, ..pass.clone() }.into(), scope);
    }
}

fn with_mix(pass: &BlendPass, in_step: Option<bool>, from: Option<RootFrom>) -> PassStep {
    let form = match &pass.form {
        BlendForm::Mix { weight, is_aligned, root } => BlendForm::Mix {
            weight: weight.clone(),
            is_aligned: in_step.unwrap_or(*is_aligned),
            root: from.unwrap_or(*root),
        },
        form => form.clone(),
    };
    BlendPass { form, ..pass.clone() }.into()
}

fn root_ui(ui: &mut Ui, id: PassId, pass: &BlendPass, root: RootFrom, scope: &mut Scope<'_>) {
    let mut chosen = root;
    ui.horizontal(|ui| {
        ui.label("way on the ground");
        for (own, words) in [(RootFrom::Both, "both"), (RootFrom::First, "A"), (RootFrom::Second, "B")] {
            ui.radio_value(&mut chosen, own, words);
        }
    });
    if chosen != root {
        keep(id, with_mix(pass, None, Some(chosen)), scope);
    }
}

/// Which joints are reached, and how strongly.
fn mask_ui(ui: &mut Ui, id: PassId, pass: &BlendPass, scope: &mut Scope<'_>) {
    let Some(clip) = scope.bench.clip_before(id).or(scope.bench.source()).cloned() else { return };
    let skeleton = &clip.skeleton;
    let soft = scope.bench.session.blend.soft;
    let joint = scope.bench.session.joint.filter(|&joint| joint < skeleton.len());
    let as_list = |mask: &Mask| -> Vec<(usize, f64)> {
        mask.factors.iter().copied().enumerate().filter(|&(_, factor)| factor > 0.0).collect()
    };
    let mask_of = |joints: &[(usize, f64)]| {
        let mut factors = vec![0.0; skeleton.len()];
        for &(joint, factor) in joints {
            if let Some(own) = factors.get_mut(joint) {
                *own = factor;
            }
        }
        Mask { factors }
    };
    ui.horizontal_wrapped(|ui| {
        let words = match &pass.joints {
            None => "Mask: all joints".to_owned(),
            Some(joints) => format!("Mask: {} of {} joints", joints.len(), skeleton.listed().count()),
        };
        ui.label(words);
        if pass.joints.is_some() && ui.button("All joints").clicked() {
            keep(id, BlendPass { joints: None, ..pass.clone() }.into(), scope);
        }
    });
    let Some(joint) = joint else { return };
    let label = skeleton.label(joint).to_owned();
    ui.horizontal_wrapped(|ui| {
        let limb = || Mask::limb(skeleton, &label, soft).ok();
        let only =
            ui.button(format!("Only {label} and below")).on_hover_text("The chosen joint's limb alone");
        named(&only, Role::Button, "Mask: only the chosen limb");
        if only.clicked()
            && let Some(mask) = limb()
        {
            keep(id, BlendPass { joints: Some(as_list(&mask)), ..pass.clone() }.into(), scope);
        }
        if let Some(joints) = &pass.joints {
            let more = ui.button("Add it").on_hover_text("The chosen joint's limb as well");
            named(&more, Role::Button, "Mask: the chosen limb as well");
            if more.clicked()
                && let Some(mask) = limb()
            {
                let both = mask.or(&mask_of(joints));
                keep(id, BlendPass { joints: Some(as_list(&both)), ..pass.clone() }.into(), scope);
            }
        }
        let mut steps = soft;
        let response = ui.add(DragValue::new(&mut steps).range(0..=8).prefix("soft over ").suffix(" above"));
        named(&response, Role::SpinButton, "Joints above the limb that are taken along softly");
        if response.on_hover_text("How many joints above the limb are taken along, less and less").changed() {
            scope.out.push(Command::Blend(BlendCommand::SetSoft(steps)));
        }
    });
    if let Some(joints) = &pass.joints {
        let own = joints.iter().find(|&&(masked, _)| masked == joint).map_or(0.0, |&(_, factor)| factor);
        let mut percent = 100.0 * own;
        ui.horizontal(|ui| {
            ui.label(format!("{label}:"));
            ui.spacing_mut().slider_width = (ui.available_width() - 70.0).clamp(40.0, 160.0);
            let response = ui.add(Slider::new(&mut percent, 0.0..=100.0).suffix(" %").fixed_decimals(0));
            response.widget_info(|| WidgetInfo::slider(true, percent, "Factor of the chosen joint"));
            let mut mask = mask_of(joints);
            mask.factors[joint] = percent / 100.0;
            settle(&response, id, BlendPass { joints: Some(as_list(&mask)), ..pass.clone() }.into(), scope);
        });
    }
}

fn loop_ui(ui: &mut Ui, id: PassId, pass: &LoopPass, scope: &mut Scope<'_>) {
    let length = scope.bench.clip_before(id).map_or(f64::MAX, |clip| clip.duration_secs);
    let mut own = pass.clone();
    ui.horizontal(|ui| {
        ui.label("Rounds");
        let response = ui.add(DragValue::new(&mut own.rounds).range(1..=1000).speed(0.1));
        response.widget_info(|| WidgetInfo::labeled(Role::SpinButton, true, "Rounds"));
        settle(&response, id, own.clone().into(), scope);
    });
    ui.horizontal_wrapped(|ui| {
        ui.label("Seam");
        let mut close = pass.close;
        for (choice, words) in [
            (None, "open"),
            (Some(Closing::BySize), "by size"),
            (Some(Closing::Spread), "spread"),
            (Some(Closing::Window), "near it"),
        ] {
            ui.radio_value(&mut close, choice, words);
        }
        if close != pass.close {
            keep(id, LoopPass { close, ..pass.clone() }.into(), scope);
        }
    });
    if let Some([from, to]) = pass.part_secs {
        let mut part = [from, to];
        let responses = [
            secs_ui(ui, "Part from", &mut part[0], [0.0, to - 1e-3], 0.01),
            secs_ui(ui, "Part to", &mut part[1], [from + 1e-3, length], 0.01),
        ];
        for response in &responses {
            settle(response, id, LoopPass { part_secs: Some(part), ..pass.clone() }.into(), scope);
        }
    }
    ui.horizontal_wrapped(|ui| {
        let find = ui.button("Find the best part");
        let find = find.on_hover_text("The part that comes back to where it began best, in pose and rate");
        if find.clicked() {
            scope.out.push(Command::Blend(BlendCommand::FindLoop(id)));
        }
        if pass.part_secs.is_some() && ui.button("Whole clip").clicked() {
            keep(id, LoopPass { part_secs: None, ..pass.clone() }.into(), scope);
        }
    });
}
