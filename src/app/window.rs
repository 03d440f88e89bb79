//! The window as one screen: its state, and one frame of it.

use std::path::PathBuf;
use std::sync::Arc;
use std::time::Duration;

use egui::{Context, Event, Key, KeyboardShortcut, Ui};

use crate::exchange::{ClipAddress, Source};
use crate::scene::Revision;

use super::Screen;
use super::bench::{Bench, Project};
use super::commands::{Action, Command, CurveAction, HOLD_FOR_SOURCE};
use super::file_picker::FilePicker;
use super::jobs::{Jobs, Slot};
use super::logic::{Answer, Asked, Memory};
use super::panels::{self, Dialog, Form, Message, Scope, Then};
use super::pictures::Pictures;
use super::settings::Keymap;
use super::theme::{self, Look};

/// What the window opens with.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Start {
    /// Nothing.
    Empty,
    /// The demo scene.
    Demo,
    /// Files: clips, perhaps one by name, or a scene.
    Files(Vec<ClipAddress>),
}

impl Start {
    /// What stands on the command line: clips or a scene, and without any the demo.
    pub fn of_arguments(arguments: &[PathBuf]) -> Self {
        if arguments.is_empty() {
            return Self::Demo;
        }
        // What is no text can name a file, but no clip in it.
        let address = |path: &PathBuf| match path.to_str() {
            Some(text) => ClipAddress::parse(text),
            None => ClipAddress { path: path.clone(), clip: None },
        };
        Self::Files(arguments.iter().map(address).collect())
    }
}

/// The whole program as a person sees it.
#[derive(Debug)]
pub struct Window {
    pub(super) bench: Bench,
    pub(super) jobs: Jobs<Answer>,
    pub(super) asked: Asked,
    pub(super) pictures: Pictures,
    pub(super) dialog: Option<Dialog>,
    pub(super) form: Form,
    pub(super) messages: Vec<Message>,
    pub(super) commands: Vec<Command>,
    pub(super) picker: FilePicker,
    /// What waits for the scene to be saved.
    pub(super) after_save: Option<Then>,
    /// The document that may be lost: it was discarded, and what takes its place is still being asked for.
    pub(super) discarded: Option<(u64, Revision)>,
    pub(super) next_serial: u64,
    pub(super) is_light: bool,
    pub(super) memory: Memory,
    pub(super) should_close: bool,
    last_time: Option<f64>,
}

/// The pause between two frames while the clip plays.
const FRAME: Duration = Duration::from_micros(16_600);

impl Window {
    /// With threads of its own for long work.
    pub fn new(ctx: &Context, start: Start) -> Self {
        let wake = ctx.clone();
        Self::with_jobs(ctx, Jobs::threaded(move || wake.request_repaint()), start)
    }

    /// With all work done at once: for tests and pictures, which must come out the same every time.
    pub fn unthreaded(ctx: &Context, start: Start) -> Self {
        Self::with_jobs(ctx, Jobs::inline(), start)
    }

    fn with_jobs(ctx: &Context, jobs: Jobs<Answer>, start: Start) -> Self {
        theme::install(ctx);
        Keymap::default().install(ctx);
        // The menu has entries for it, with a range of its own.
        ctx.options_mut(|options| options.zoom_with_keyboard = false);
        ctx.set_theme(egui::ThemePreference::Dark);
        let mut window = Self {
            bench: Bench::default(),
            jobs,
            asked: Asked::default(),
            pictures: Pictures::default(),
            dialog: None,
            form: Form::default(),
            messages: Vec::new(),
            commands: Vec::new(),
            picker: FilePicker::default(),
            after_save: None,
            discarded: None,
            next_serial: 1,
            is_light: false,
            memory: Memory::default(),
            should_close: false,
            last_time: None,
        };
        match start {
            Start::Empty => {}
            Start::Demo => window.open_demo(),
            Start::Files(addresses) => window.open_addresses(addresses),
        }
        window
    }

    /// Shows files that are open already, as if they had been read: a new document with work on each of their clips.
    pub fn show_sources(&mut self, sources: Vec<Arc<Source>>) {
        let project = Project::of_sources(self.take_serial(), sources);
        self.show_project(project, 0);
        self.order_work();
    }

    /// What is open and looked at.
    pub fn bench(&self) -> &Bench {
        &self.bench
    }

    /// The messages on show, oldest first.
    pub fn messages(&self) -> impl Iterator<Item = &str> {
        self.messages.iter().map(|message| message.text.as_str())
    }

    /// Asks for something, as a panel would.
    pub fn ask(&mut self, command: Command) {
        self.commands.push(command);
    }

    /// Whether a search, an evaluation or another job is on its way.
    pub fn is_busy(&self) -> bool {
        self.jobs.running().any(|(slot, _)| slot != Slot::Settings)
    }

    /// Files dropped onto the window.
    fn take_drops(&mut self, ui: &Ui) {
        let paths: Vec<PathBuf> =
            ui.input(|input| input.raw.dropped_files.iter().map(|file| file.path().to_owned()).collect());
        if !paths.is_empty() {
            self.commands.push(Command::OpenFiles(paths));
        }
    }

    /// Keys of the command table. A field that is typed in, or a button that has the keyboard, comes first for keys
    /// without a modifier.
    fn take_keys(&mut self, ui: &Ui) {
        let held = ui.input(|input| {
            let keys = HOLD_FOR_SOURCE;
            input.key_down(keys.logical_key) && input.modifiers.command && !input.modifiers.shift
        });
        if held != self.bench.session.source_held {
            self.bench.session.source_held = held;
            ui.ctx().request_repaint();
        }
        if self.dialog.is_some() {
            return;
        }
        let is_typing = ui.ctx().text_edit_focused();
        let has_focus = ui.ctx().memory(|memory| memory.focused().is_some());
        if !is_typing {
            self.take_clipboard_keys(ui);
        }
        let keymap = Keymap::of(ui.ctx()).all();
        let is_ours = |keys: &KeyboardShortcut| {
            let is_function = is_function_key(keys.logical_key);
            is_function || !(is_typing || (keys.modifiers.is_none() && has_focus))
        };
        // In the order in which they were pressed, and each as often: a slow frame may bring many.
        let mut pressed = Vec::new();
        ui.input_mut(|input| {
            input.events.retain(|event| {
                let Event::Key { key, modifiers, pressed: true, .. } = event else { return true };
                let means = |(keys, _): &&(KeyboardShortcut, Action)| {
                    keys.logical_key == *key && modifiers.matches_logically(keys.modifiers) && is_ours(keys)
                };
                let found = keymap.iter().find(means);
                pressed.extend(found.map(|(_, action)| Command::Do(*action)));
                found.is_none()
            });
        });
        self.commands.extend(pressed);
    }

    /// The desktop's keys for copying and pasting come as events of their own.
    fn take_clipboard_keys(&mut self, ui: &Ui) {
        let actions = ui.input(|input| {
            let action = |event: &Event| match event {
                Event::Copy => Some(CurveAction::Copy),
                Event::Cut => Some(CurveAction::Cut),
                Event::Paste(_) if input.modifiers.shift => Some(CurveAction::PasteMirrored),
                Event::Paste(_) => Some(CurveAction::Paste),
                _ => None,
            };
            input.events.iter().filter_map(action).collect::<Vec<_>>()
        });
        self.commands.extend(actions.into_iter().map(|action| Command::Do(Action::Curve(action))));
    }

    fn advance_play(&mut self, ui: &Ui) {
        let now = ui.input(|input| input.time);
        let passed = self.last_time.map_or(0.0, |last| (now - last).clamp(0.0, 0.25));
        self.last_time = Some(now);
        let Some(duration) = self.bench.result().map(|clip| clip.duration_secs) else { return };
        let session = &mut self.bench.session;
        if session.playback.is_playing {
            session.playback.advance(passed, duration);
            session.window = session.window.showing(session.playback.playhead_secs, duration);
            ui.ctx().request_repaint_after(FRAME);
        }
    }
}

fn is_function_key(key: Key) -> bool {
    key.name().len() > 1 && key.name().starts_with('F') && key.name()[1..].chars().all(|c| c.is_ascii_digit())
}

impl Screen for Window {
    fn logic(&mut self, ctx: &Context) {
        self.take_answers(ctx);
        self.run_commands(ctx);
        self.stay_in_time();
        self.order_work();
        self.settle_curves();
        self.keep_settings(ctx);
    }

    fn ui(&mut self, ui: &mut Ui) {
        self.take_drops(ui);
        self.take_keys(ui);
        self.advance_play(ui);
        let hovered_before = self.pictures.hovered;
        let running: Vec<_> = self.jobs.running().filter(|(slot, _)| *slot != Slot::Settings).collect();
        let is_finding = self.jobs.is_running(Slot::Survey);
        let now = self.bench.situation(is_finding, self.is_light);
        let (states, rows) = (self.bench.snag_states(), self.bench.snag_rows());
        let mut out = std::mem::take(&mut self.commands);
        let mut scope = Scope {
            bench: &self.bench,
            settings: &self.memory.settings,
            now: &now,
            rows,
            states,
            running: &running,
            pictures: &mut self.pictures,
            out: &mut out,
            look: Look::of(ui),
        };
        let bare = egui::Frame::NONE;
        egui::Panel::top("menus").frame(bare).show(ui, |ui| panels::menus_ui(ui, &mut scope));
        if !self.messages.is_empty() {
            let messages = &self.messages;
            egui::Panel::top("messages")
                .frame(bare)
                .show_separator_line(false)
                .show(ui, |ui| panels::messages_ui(ui, messages, &mut scope));
        }
        if scope.bench.project.is_some() {
            egui::Panel::bottom("transport")
                .frame(bare)
                .exact_size(66.0)
                .show(ui, |ui| panels::transport_ui(ui, &mut scope));
            panels::transport_hint_ui(ui, &mut scope);
            egui::CentralPanel::no_frame().show(ui, |ui| panels::bench_ui(ui, &mut scope));
        } else {
            egui::CentralPanel::no_frame().show(ui, |ui| panels::welcome_ui(ui, &mut scope));
        }
        drop_hint(ui, &scope.look);
        // Wishes of this frame scroll in the next.
        scope.pictures.scroll_to_joint = None;
        scope.pictures.scroll_to_snag = false;
        scope.pictures.scroll_to_form = false;
        scope.pictures.hovered = None;
        scope.pictures.carry_hovered = [None; 2];
        if let Some(dialog) = &self.dialog {
            panels::dialogs_ui(ui.ctx(), dialog, &mut self.form, &mut scope);
        }
        self.commands = out;
        if !self.commands.is_empty() {
            self.run_commands(ui.ctx());
            self.order_work();
        }
        if self.pictures.hovered != hovered_before {
            ui.ctx().request_repaint();
        }
        if !running.is_empty() {
            // The progress bar moves on though nobody touches anything.
            ui.ctx().request_repaint_after(Duration::from_millis(100));
        }
    }

    fn close_requested(&mut self) -> bool {
        let is_unsaved = self.bench.project.as_ref().is_some_and(|project| project.history.is_unsaved());
        if is_unsaved && !self.should_close {
            self.dialog = Some(Dialog::Unsaved(Then::Quit));
            return false;
        }
        self.write_settings();
        true
    }

    fn should_close(&self) -> bool {
        self.should_close
    }

    fn title(&self) -> String {
        match &self.bench.project {
            None => "Turnwright".to_owned(),
            Some(project) => {
                let mark = if project.history.is_unsaved() { "* " } else { "" };
                format!("{mark}{} - Turnwright", project.name())
            }
        }
    }
}

/// While files are held over the window.
fn drop_hint(ui: &Ui, look: &Look) {
    let count = ui.input(|input| input.raw.hovered_files.len());
    if count == 0 {
        return;
    }
    let layer = egui::LayerId::new(egui::Order::Foreground, egui::Id::unique("drop"));
    let painter = ui.ctx().layer_painter(layer);
    let bounds = ui.ctx().content_rect();
    painter.rect_filled(bounds, 0.0, look.background.gamma_multiply(0.85));
    painter.rect_stroke(bounds.shrink(12.0), 8.0, (2.0, look.selection), egui::StrokeKind::Inside);
    let words = if count == 1 { "Drop to open".to_owned() } else { format!("Drop to open {count} files") };
    let font = egui::FontId::proportional(22.0);
    painter.text(bounds.center(), egui::Align2::CENTER_CENTER, words, font, look.text);
}
