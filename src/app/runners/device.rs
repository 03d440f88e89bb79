//! Whether drawing through OpenGL would use a graphics device or only the processor.

use std::sync::Mutex;
use std::sync::PoisonError;

/// Names that drivers without a device give themselves, in small letters.
const SOFTWARE_NAMES: [&str; 8] = [
    "llvmpipe",
    "softpipe",
    "swrast",
    "swiftshader",
    "software rasterizer",
    "lavapipe",
    "gdi generic",
    "basic render driver",
];

/// Whether the machine may have a graphics device. On Linux every driver has a node under `/dev`; elsewhere only a try
/// can tell.
pub(super) fn is_present() -> bool {
    if !cfg!(target_os = "linux") {
        return true;
    }
    let is_switched_off =
        std::env::var_os("LIBGL_ALWAYS_SOFTWARE").is_some_and(|value| value == "1" || value == "true");
    let has_render_node = std::fs::read_dir("/dev/dri").is_ok_and(|nodes| {
        nodes.flatten().any(|node| node.file_name().to_string_lossy().starts_with("renderD"))
    });
    let other_nodes = ["/dev/nvidiactl", "/dev/dxg", "/dev/mali0", "/dev/kgsl-3d0", "/dev/nvhost-ctrl-gpu"];
    !is_switched_off
        && (has_render_node || other_nodes.iter().any(|node| std::path::Path::new(node).exists()))
}

/// Whether a driver's name says that it runs on the processor.
fn is_software(renderer: &str) -> bool {
    let renderer = renderer.to_lowercase();
    SOFTWARE_NAMES.iter().any(|name| renderer.contains(name))
}

/// Finds out the name of the OpenGL driver.
///
/// Asking the driver takes an unsafe call, which this crate does without. `egui_glow` asks while it starts and logs the
/// answer, so this listens to the log. If nothing is heard, the driver counts as a device.
pub(super) struct DriverName {
    renderer: Mutex<Option<String>>,
}

static DRIVER_NAME: DriverName = DriverName { renderer: Mutex::new(None) };

impl DriverName {
    /// Begins to listen. Somebody else's logger stays, and then nothing is heard.
    pub(super) fn listen() {
        if log::set_logger(&DRIVER_NAME).is_ok() {
            log::set_max_level(log::LevelFilter::Debug);
        }
    }

    /// Stops listening, and says whether the name heard is that of a driver without a device.
    pub(super) fn is_software() -> bool {
        log::set_max_level(log::LevelFilter::Off);
        let renderer = DRIVER_NAME.renderer.lock().unwrap_or_else(PoisonError::into_inner);
        renderer.as_deref().is_some_and(is_software)
    }
}

impl log::Log for DriverName {
    fn enabled(&self, metadata: &log::Metadata<'_>) -> bool {
        metadata.target().starts_with("egui_glow")
    }

    fn log(&self, record: &log::Record<'_>) {
        if !self.enabled(record.metadata()) {
            return;
        }
        if let Some(renderer) = renderer_in(&record.args().to_string()) {
            *self.renderer.lock().unwrap_or_else(PoisonError::into_inner) = Some(renderer);
        }
    }

    fn flush(&self) {}
}

/// The name in `egui_glow`'s message about the driver.
fn renderer_in(message: &str) -> Option<String> {
    message.lines().find_map(|line| line.strip_prefix("opengl renderer: ")).map(str::to_owned)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn drivers_on_the_processor_are_known_by_name() {
        assert!(is_software("llvmpipe (LLVM 15.0.6, 256 bits)"));
        assert!(is_software("Google SwiftShader"));
        assert!(!is_software("Some Graphics 6000 (TGL GT2)"));
    }

    #[test]
    fn the_name_is_found_in_the_message() {
        let message = "\nopengl version: 4.5\nopengl renderer: llvmpipe (LLVM)\nopengl vendor: Someone";
        assert_eq!(renderer_in(message).as_deref(), Some("llvmpipe (LLVM)"));
        assert_eq!(renderer_in("Shader header: \"\""), None);
    }
}
