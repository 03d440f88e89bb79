//! Every control of the window has a name for a screen reader and is reached with the Tab key, in every state and at every scale.

use std::collections::BTreeSet;

use egui::accesskit;
use egui::{Key, Modifiers};
use egui_kittest::Harness;
use egui_kittest::kittest::{NodeT as _, Queryable as _};
use turnwright::app::commands::{Action, Command, Menu};
use turnwright::app::paint::CpuRenderer;
use turnwright::app::{Screen as _, Start, Window};

struct Desk(Harness<'static, Option<Window>>);

impl Desk {
    /// `size` in pixels, so many of them to a point.
    fn open(start: Start, size: [f32; 2], scale: f32) -> Self {
        let points = size.map(|side| side / scale);
        let harness = Harness::builder()
            .with_size(points)
            .with_pixels_per_point(scale)
            .renderer(CpuRenderer::new(2))
            .build_ui_state(
                move |ui, window: &mut Option<Window>| {
                    let window = window.get_or_insert_with(|| Window::unthreaded(ui.ctx(), start.clone()));
                    window.logic(ui.ctx());
                    window.ui(ui);
                },
                None,
            );
        let mut desk = Self(harness);
        desk.0.run_steps(4);
        desk
    }

    fn act(&mut self, action: Action) {
        self.0.state_mut().as_mut().expect("a window").ask(Command::Do(action));
        self.0.run_steps(3);
    }

    /// Everything that can have the keyboard: its number, its name, its role.
    fn focusable(&self) -> Vec<(u64, String, accesskit::Role)> {
        let mut found = Vec::new();
        for node in self.0.root().children_recursive() {
            let own = node.accesskit_node();
            if own.data().supports_action(accesskit::Action::Focus) && !own.is_disabled() {
                let name = own.label().or_else(|| own.value()).unwrap_or_default();
                found.push((own.locate().0.0, name, own.role()));
            }
        }
        found
    }

    #[track_caller]
    fn check_names(&self, state: &str) {
        let all = self.focusable();
        assert!(!all.is_empty(), "{state}: nothing can have the keyboard");
        let nameless: Vec<_> = all.iter().filter(|(_, name, _)| name.trim().is_empty()).collect();
        assert!(nameless.is_empty(), "{state}: without a name: {nameless:?}");
    }

    /// Goes on with Tab until it comes round, and fails when something was passed over.
    #[track_caller]
    fn check_tab(&mut self, state: &str) {
        let mut reached = BTreeSet::new();
        let count = self.focusable().len();
        for _ in 0..count + count / 4 + 10 {
            self.0.key_press(Key::Tab);
            self.0.step();
            self.0.step();
            reached.extend(self.0.ctx.memory(egui::Memory::focused).map(|id| id.value()));
        }
        let missed: Vec<_> = self.focusable().into_iter().filter(|(id, ..)| !reached.contains(id)).collect();
        assert!(
            missed.is_empty(),
            "{state}: Tab passes over {missed:?}; it reached {} of {count}",
            reached.len()
        );
    }
}

#[test]
fn everything_that_takes_the_keyboard_has_a_name() {
    let sheets = [
        Action::OpenPath,
        Action::SaveAs,
        Action::Export,
        Action::History,
        Action::Shortcuts,
        Action::WhatsNew,
        Action::About,
    ];
    for (size, scale) in [([1440.0, 900.0], 1.0), ([1280.0, 720.0], 2.0), ([2560.0, 1440.0], 3.0)] {
        let state = |what: &str| format!("{what} at {size:?}, {scale} pixels a point");
        Desk::open(Start::Empty, size, scale).check_names(&state("nothing open"));
        let mut desk = Desk::open(Start::Demo, size, scale);
        desk.check_names(&state("the demo"));
        for action in
            [Action::ShowHints, Action::NextSnag, Action::MendSafe, Action::SwingTwist, Action::Light]
        {
            desk.act(action);
            desk.check_names(&state(&format!("after {action:?}")));
        }
        for action in sheets {
            desk.act(action);
            desk.check_names(&state(&format!("sheet {action:?}")));
            desk.0.key_press(Key::Escape);
            desk.0.run_steps(3);
        }
        for menu in Menu::ALL {
            desk.0.get_by_label(menu.title()).click();
            desk.0.run_steps(3);
            desk.check_names(&state(&format!("menu {}", menu.title())));
            desk.0.key_press(Key::Escape);
            desk.0.run_steps(3);
        }
    }
}

#[test]
fn tab_reaches_everything() {
    let mut desk = Desk::open(Start::Empty, [1280.0, 720.0], 1.0);
    desk.check_tab("nothing open");
    let mut desk = Desk::open(Start::Demo, [1280.0, 720.0], 1.0);
    desk.act(Action::NextSnag);
    desk.act(Action::Mend);
    desk.check_tab("a mended snag");
}

#[test]
fn no_control_lies_outside_the_window_or_under_another_area() {
    for (size, scale) in [([1280.0, 720.0], 1.0), ([1280.0, 720.0], 2.0), ([2560.0, 1440.0], 3.0)] {
        let mut desk = Desk::open(Start::Demo, size, scale);
        desk.act(Action::NextSnag);
        let window =
            egui::Rect::from_min_size(egui::Pos2::ZERO, egui::Vec2::from(size.map(|side| side / scale)));
        // Buttons and switches of strips and bars; rows of lists scroll.
        for node in desk.0.root().children_recursive() {
            let own = node.accesskit_node();
            let is_control = matches!(
                own.role(),
                accesskit::Role::Button
                    | accesskit::Role::RadioButton
                    | accesskit::Role::ComboBox
                    | accesskit::Role::Slider
            );
            if !is_control || !own.data().supports_action(accesskit::Action::Focus) {
                continue;
            }
            let bounds = node.rect();
            let label = own.label().unwrap_or_default();
            let scrolls =
                ["Fold", "Unfold", "Remove", "Pass", "Rest pose"].iter().any(|word| label.starts_with(word));
            assert!(
                scrolls || window.expand(0.5).contains_rect(bounds),
                "{size:?} at {scale}: `{label}` at {bounds:?} is cut by the window"
            );
        }
    }
}

#[test]
fn zoom_goes_from_100_to_300_percent() {
    let mut desk = Desk::open(Start::Demo, [1440.0, 900.0], 1.0);
    let zoom = |desk: &Desk| (desk.0.ctx.zoom_factor() * 100.0).round();
    desk.0.key_press_modifiers(Modifiers::COMMAND, Key::Minus);
    desk.0.run_steps(2);
    assert_eq!(zoom(&desk), 100.0);
    for _ in 0..9 {
        desk.0.key_press_modifiers(Modifiers::COMMAND, Key::Plus);
        desk.0.run_steps(2);
    }
    assert_eq!(zoom(&desk), 300.0);
    desk.0.key_press_modifiers(Modifiers::COMMAND, Key::Num0);
    desk.0.run_steps(2);
    assert_eq!(zoom(&desk), 100.0);
}
