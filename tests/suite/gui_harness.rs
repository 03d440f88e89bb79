//! The whole window without a display, for tests that drive it. No tests of its own.

use std::path::Path;

use egui::{Event, Key, Modifiers, Pos2};
use egui_kittest::Harness;
use egui_kittest::kittest::Queryable as _;
use turnwright::app::commands::{Action, Command};
use turnwright::app::paint::CpuRenderer;
use turnwright::app::{Screen as _, Start, Window};
use turnwright::exchange::ClipAddress;
use turnwright::scene::PassStep;

/// A window of this size in points, opened on `start`: all its work is done at once, our own painter draws it.
pub(crate) fn window_harness<'a>(size: [f32; 2], start: Start) -> Harness<'a, Option<Window>> {
    Harness::builder().with_size(size).renderer(CpuRenderer::new(2)).build_ui_state(
        move |ui, window: &mut Option<Window>| {
            let window = window.get_or_insert_with(|| Window::unthreaded(ui.ctx(), start.clone()));
            window.logic(ui.ctx());
            window.ui(ui);
        },
        None,
    )
}

/// A window that a test drives, and what most tests do with it. What only one subject needs stands beside its tests.
pub(crate) struct Bench<'a>(pub(crate) Harness<'a, Option<Window>>);

impl Bench<'_> {
    pub(crate) fn open(start: Start) -> Self {
        Self::of_size(start, [1440.0, 900.0])
    }

    pub(crate) fn of_file(path: &Path) -> Self {
        Self::open(Start::Files(vec![ClipAddress { path: path.to_owned(), clip: None }]))
    }

    pub(crate) fn of_size(start: Start, size: [f32; 2]) -> Self {
        let mut bench = Self(window_harness(size, start));
        bench.run();
        bench
    }

    /// Frames enough for whatever was asked to be done and drawn.
    pub(crate) fn run(&mut self) {
        self.0.run_steps(4);
    }

    pub(crate) fn window(&self) -> &Window {
        self.0.state().as_ref().expect("the window is made in the first frame")
    }

    pub(crate) fn ask(&mut self, command: Command) {
        self.0.state_mut().as_mut().expect("a window").ask(command);
        self.run();
    }

    pub(crate) fn act(&mut self, action: Action) {
        self.ask(Command::Do(action));
    }

    #[track_caller]
    pub(crate) fn click(&mut self, label: &str) {
        // What lies below in a list comes into view first.
        self.0.get_by_label(label).scroll_to_me();
        self.run();
        self.0.get_by_label(label).click();
        self.run();
    }

    /// Clicks the first whose label holds these words.
    #[track_caller]
    pub(crate) fn click_beginning(&mut self, beginning: &str) {
        let node = self.0.get_all_by_label_contains(beginning).next().expect("a widget with that label");
        node.click();
        self.run();
    }

    pub(crate) fn press(&mut self, modifiers: Modifiers, key: Key) {
        self.0.key_press_modifiers(modifiers, key);
        self.run();
    }

    /// Holds these keys from now on.
    pub(crate) fn hold(&mut self, modifiers: Modifiers) {
        self.0.event(Event::ModifiersChanged(modifiers));
        self.0.step();
    }

    /// Presses at the first place, goes through all others, and lets go at the last; gives in how many frames a pass was shown with
    /// parameters that were not recorded yet.
    pub(crate) fn drag(&mut self, way: &[Pos2], modifiers: Modifiers) -> usize {
        self.hold(modifiers);
        let previews = self.press_and_move(way);
        self.0.drop_at(way[way.len() - 1]);
        self.0.step();
        self.hold(Modifiers::NONE);
        self.run();
        previews
    }

    /// As [`Bench::drag`], and does not let go.
    pub(crate) fn press_and_move(&mut self, way: &[Pos2]) -> usize {
        self.0.hover_at(way[0]);
        self.0.step();
        self.0.drag_at(way[0]);
        self.0.step();
        let mut previews = 0;
        for pair in way.windows(2) {
            for share in [0.25, 0.5, 0.75, 1.0] {
                self.0.hover_at(pair[0].lerp(pair[1], share));
                self.0.step();
                previews += usize::from(self.window().bench().preview.is_some());
            }
        }
        // What is dragged shows one frame later.
        self.0.step();
        previews
    }

    pub(crate) fn passes(&self) -> Vec<PassStep> {
        let work = self.window().bench().work().expect("a clip");
        work.passes.iter().map(|pass| pass.step.clone()).collect()
    }

    /// Steps that undo can take back.
    pub(crate) fn steps(&self) -> usize {
        self.window().bench().project.as_ref().map_or(0, |project| project.history.steps().1)
    }

    pub(crate) fn undo(&mut self) {
        self.press(Modifiers::COMMAND, Key::Z);
    }

    pub(crate) fn messages(&self) -> String {
        self.window().messages().collect::<Vec<_>>().join("\n")
    }
}
