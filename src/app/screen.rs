//! What a window shows, apart from how it gets onto the display.

/// All of a window's content. Both runners, pictures without a display, and tests drive it.
///
/// Dropped files, the clipboard, and scaling come through egui's input and commands and need nothing here. While
/// something moves, ask for the next frame with `ctx.request_repaint_after`; when nothing asks, nothing is drawn.
pub trait Screen {
    /// Called before every [`Self::ui`], and also while the window is hidden and `ui` is not called. The place to
    /// collect the answers of background work.
    fn logic(&mut self, _ctx: &egui::Context) {}

    /// One frame. egui may call it twice for a frame when the layout needs it.
    fn ui(&mut self, ui: &mut egui::Ui);

    /// The person asks to close the window. `true`: it may close now. `false`: the screen shows its own question first
    /// and says yes later through [`Self::should_close`].
    fn close_requested(&mut self) -> bool {
        true
    }

    /// Whether the screen itself wants the window closed; looked at after every frame.
    fn should_close(&self) -> bool {
        false
    }

    /// The text in the title bar.
    fn title(&self) -> String;
}
