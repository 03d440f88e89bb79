//! The desktop's own file dialog, asked on a thread so that the window never waits for it.

use std::future::Future;
use std::path::{Path, PathBuf};
use std::pin::pin;
use std::sync::Arc;
use std::sync::mpsc::{Receiver, Sender, channel};
use std::task::{Context, Poll, Wake, Waker};
use std::time::{Duration, Instant};

use super::commands::CarrySheet;

/// What a file is picked for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Purpose {
    /// To open.
    Open,
    /// To save the scene to.
    Save,
    /// To export to.
    Export,
    /// To use as a source that was not found.
    Relocate,
    /// To read limits from.
    Limits,
    /// To take the skeleton of a table from.
    Skeleton,
    /// To take the second clip of a blend from.
    Second,
    /// A file of a retarget.
    Carry(CarrySheet),
}

/// What came of it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(crate) struct Picked {
    /// What for.
    pub purpose: Purpose,
    /// The choice; empty when there was none.
    pub paths: Vec<PathBuf>,
    /// The answer came so fast that no dialog can have been seen: this desktop has none.
    pub is_missing: bool,
}

/// Faster than a person can look at a dialog and close it again.
const UNSEEN: Duration = Duration::from_millis(250);

/// Asks for files.
#[derive(Debug)]
pub(crate) struct FilePicker {
    sender: Sender<Picked>,
    answers: Receiver<Picked>,
    is_open: bool,
}

impl Default for FilePicker {
    fn default() -> Self {
        let (sender, answers) = channel();
        Self { sender, answers, is_open: false }
    }
}

impl FilePicker {
    /// Opens a dialog. `suggestion` is a folder or a file to start from. `wake` is called when the answer waits.
    pub(crate) fn ask(
        &mut self,
        purpose: Purpose,
        suggestion: PathBuf,
        wake: impl FnOnce() + Send + 'static,
    ) {
        if self.is_open {
            return;
        }
        let sender = self.sender.clone();
        let run = move || {
            let start = Instant::now();
            let paths = dialog(purpose, &suggestion);
            let is_missing = paths.is_empty() && start.elapsed() < UNSEEN;
            // The window may be gone by now.
            let _ = sender.send(Picked { purpose, paths, is_missing });
            wake();
        };
        self.is_open = std::thread::Builder::new().name("turnwright-files".to_owned()).spawn(run).is_ok();
        if !self.is_open {
            let _ = self.sender.send(Picked { purpose, paths: Vec::new(), is_missing: true });
        }
    }

    /// The answer, once it is there.
    pub(crate) fn answer(&mut self) -> Option<Picked> {
        let picked = self.answers.try_recv().ok()?;
        self.is_open = false;
        Some(picked)
    }
}

fn dialog(purpose: Purpose, suggestion: &Path) -> Vec<PathBuf> {
    let folder = if suggestion.is_dir() { Some(suggestion) } else { suggestion.parent() };
    let mut dialog = rfd::AsyncFileDialog::new();
    if let Some(folder) = folder.filter(|folder| folder.is_dir()) {
        dialog = dialog.set_directory(folder);
    }
    if let Some(name) = suggestion.file_name().filter(|_| !suggestion.is_dir()) {
        dialog = dialog.set_file_name(name.to_string_lossy());
    }
    let clips = ["gltf", "glb", "bvh", "csv"];
    let paths = |handle: rfd::FileHandle| handle.path().to_owned();
    match purpose {
        Purpose::Open => {
            let dialog = dialog
                .set_title("Open clips or a scene")
                .add_filter("Clips and scenes", &["gltf", "glb", "bvh", "csv", "ron"]);
            wait_for(dialog.pick_files()).into_iter().flatten().map(paths).collect()
        }
        Purpose::Relocate => {
            let dialog = dialog.set_title("Find the source").add_filter("Clips", &clips);
            wait_for(dialog.pick_file()).into_iter().map(paths).collect()
        }
        Purpose::Limits => {
            let dialog = dialog.set_title("Limits from a file").add_filter("Limits", &["csv", "ron"]);
            wait_for(dialog.pick_file()).into_iter().map(paths).collect()
        }
        Purpose::Skeleton => {
            let dialog = dialog.set_title("Skeleton of a table").add_filter("Files with joints", &clips);
            wait_for(dialog.pick_file()).into_iter().map(paths).collect()
        }
        Purpose::Second => {
            let dialog = dialog.set_title("Open the second clip").add_filter("Clips", &clips);
            wait_for(dialog.pick_file()).into_iter().map(paths).collect()
        }
        Purpose::Carry(sheet) => match sheet {
            CarrySheet::Onto => {
                let dialog = dialog.set_title("Retarget onto").add_filter("Files with joints", &clips);
                wait_for(dialog.pick_file()).into_iter().map(paths).collect()
            }
            CarrySheet::LoadMap => {
                let dialog = dialog.set_title("Load a joint map").add_filter("Joint maps", &["csv"]);
                wait_for(dialog.pick_file()).into_iter().map(paths).collect()
            }
            CarrySheet::SaveMap => {
                let dialog = dialog.set_title("Save the joint map").add_filter("Joint maps", &["csv"]);
                wait_for(dialog.save_file()).into_iter().map(paths).collect()
            }
            CarrySheet::Export => {
                let dialog = dialog.set_title("Export onto the target's file").add_filter("Clips", &clips);
                wait_for(dialog.save_file()).into_iter().map(paths).collect()
            }
        },
        Purpose::Save => {
            let dialog = dialog.set_title("Save the scene").add_filter("Scene", &["ron"]);
            wait_for(dialog.save_file()).into_iter().map(paths).collect()
        }
        Purpose::Export => {
            let dialog = dialog.set_title("Export the clip").add_filter("Clips", &clips);
            wait_for(dialog.save_file()).into_iter().map(paths).collect()
        }
    }
}

struct Unpark(std::thread::Thread);

impl Wake for Unpark {
    fn wake(self: Arc<Self>) {
        self.0.unpark();
    }
}

/// Runs a future on this thread until it is done.
fn wait_for<T>(future: impl Future<Output = T>) -> T {
    let waker = Waker::from(Arc::new(Unpark(std::thread::current())));
    let mut context = Context::from_waker(&waker);
    let mut future = pin!(future);
    loop {
        match future.as_mut().poll(&mut context) {
            Poll::Ready(value) => return value,
            Poll::Pending => std::thread::park(),
        }
    }
}
