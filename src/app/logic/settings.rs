//! What is remembered from one run to the next: taken from its file, followed while the window is used, written back.

use std::sync::{Arc, Mutex, PoisonError};

use egui::Context;

use super::super::commands::{Action, SettingsCommand};
use super::super::jobs::Slot;
use super::super::panels::Message;
use super::super::settings::{self, Keymap, Settings, SettingsFile, UnreadSettings, ZOOM_PERCENT};
use super::super::view_models::CurveView;
use super::super::window::Window;
use super::answers::Answer;

/// The settings, and where they are kept.
#[derive(Debug)]
pub(crate) struct Memory {
    /// As they are now.
    pub settings: Settings,
    /// As they were written or read last.
    kept: Settings,
    /// Where; a window without a file forgets.
    file: Option<SettingsFile>,
    /// The number of the last order to write. A worker that comes late must not overwrite what is newer.
    written: Arc<Mutex<u64>>,
    orders: u64,
    /// Writing has failed: that is told once.
    has_failed: bool,
}

impl Default for Memory {
    fn default() -> Self {
        let settings = Settings::without_hints();
        Self {
            kept: settings.clone(),
            settings,
            file: None,
            written: Arc::default(),
            orders: 0,
            has_failed: false,
        }
    }
}

impl Window {
    /// Takes over settings that were read from `file`, and keeps them there from now on.
    pub fn remember(&mut self, ctx: &Context, file: SettingsFile, read: Result<Settings, UnreadSettings>) {
        let opened = std::mem::take(&mut self.memory.settings.recent);
        self.memory.settings = read.unwrap_or_else(|unread| {
            self.tell(Message::note(unread.message));
            Settings::default()
        });
        self.memory.kept = self.memory.settings.clone();
        self.memory.file = Some(file);
        // Without threads files are open by now.
        for path in opened.iter().rev() {
            self.memory.settings.remember_file(path);
        }
        if self.memory.settings.light != self.is_light {
            self.switch_light(ctx);
        }
        let label = &self.memory.settings.curve_view;
        if let Some(view) = CurveView::ALL.into_iter().find(|view| view.label() == label) {
            self.bench.session.curve_view = view;
        }
        ctx.set_zoom_factor(self.memory.settings.zoom);
        Keymap::with_changes(&self.memory.settings.keys).install(ctx);
    }

    /// What is remembered now.
    pub fn settings(&self) -> &Settings {
        &self.memory.settings
    }

    /// Follows what has changed in the window, and has it written when it has come to rest.
    pub(in super::super) fn keep_settings(&mut self, ctx: &Context) {
        let own = &mut self.memory.settings;
        own.light = self.is_light;
        self.bench.session.usual_view().label().clone_into(&mut own.curve_view);
        let Some(file) = &self.memory.file else { return };
        let is_busy = ctx.input(|input| {
            let viewport = input.viewport();
            let is_plain = viewport.maximized != Some(true)
                && viewport.fullscreen != Some(true)
                && viewport.minimized != Some(true);
            // egui counts in zoomed points.
            let whole = |at: egui::Vec2| (at * own.zoom).round().into();
            if let (Some(inner), true) = (viewport.inner_rect, is_plain) {
                own.window.size = Some(whole(inner.size()));
            }
            if let (Some(outer), true) = (viewport.outer_rect, is_plain) {
                own.window.position = Some(whole(outer.min.to_vec2()));
            }
            input.pointer.any_down()
        });
        if is_busy || self.memory.settings == self.memory.kept {
            return;
        }
        self.memory.kept = self.memory.settings.clone();
        self.memory.orders += 1;
        let (file, settings) = (file.clone(), self.memory.settings.clone());
        let (written, order) = (Arc::clone(&self.memory.written), self.memory.orders);
        self.jobs.submit(Slot::Settings, move |_| {
            let mut last = written.lock().unwrap_or_else(PoisonError::into_inner);
            if *last > order {
                return None;
            }
            *last = order;
            Some(Answer::SettingsKept(file.write(&settings)))
        });
    }

    /// Writes them at once: the window is about to close.
    pub(in super::super) fn write_settings(&mut self) {
        let Some(file) = &self.memory.file else { return };
        let mut last = self.memory.written.lock().unwrap_or_else(PoisonError::into_inner);
        *last = u64::MAX;
        // Nobody is left to be told.
        let _ = file.write(&self.memory.settings);
    }

    pub(super) fn take_settings_kept(&mut self, result: Result<(), String>) {
        if let Err(error) = result
            && !std::mem::replace(&mut self.memory.has_failed, true)
        {
            self.tell(Message::note(format!("settings are not kept: {error}")));
        }
    }

    pub(super) fn run_settings(&mut self, command: &SettingsCommand, ctx: &Context) {
        let own = &mut self.memory.settings;
        match *command {
            SettingsCommand::Divide(divider, share) => own.layout.set(divider, share),
            SettingsCommand::ReadHint(hint) => {
                own.hints_read.insert(hint);
            }
            SettingsCommand::SetKeys(action, keys) => {
                let map = Keymap::with_changes(&own.keys);
                let losing = super::super::commands::TABLE.iter().map(|entry| entry.action);
                for other in
                    losing.filter(|&other| other != action && keys.is_some() && map.keys_of(other) == keys)
                {
                    settings::change_keys(&mut own.keys, other, None);
                }
                settings::change_keys(&mut own.keys, action, keys);
                Keymap::with_changes(&own.keys).install(ctx);
            }
            SettingsCommand::UsualKeys => {
                own.keys.clear();
                Keymap::default().install(ctx);
            }
            SettingsCommand::ForgetRecent => own.recent.clear(),
        }
    }

    /// A step larger or smaller, or as the desktop asks.
    pub(super) fn zoom_window(&mut self, action: Action, ctx: &Context) {
        let zoom = &mut self.memory.settings.zoom;
        let steps = ZOOM_PERCENT.map(|percent| percent as f32 / 100.0);
        *zoom = match action {
            Action::Larger => steps.into_iter().find(|step| *step > *zoom + 0.01).unwrap_or(3.0),
            Action::Smaller => steps.into_iter().rev().find(|step| *step < *zoom - 0.01).unwrap_or(1.0),
            _ => 1.0,
        };
        ctx.set_zoom_factor(*zoom);
    }
}
