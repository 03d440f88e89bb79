//! The window. Nothing below this folder knows egui.

pub mod paint;
pub mod runners;
mod screen;

pub use runners::StartError;
pub use runners::run;
pub use screen::Screen;
