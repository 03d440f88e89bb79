//! The file that settings are kept in.

use std::path::{Path, PathBuf};

use super::Settings;
use crate::exchange::disk;

/// Where settings are kept.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SettingsFile {
    path: PathBuf,
}

/// A settings file that could not be used.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct UnreadSettings {
    /// What was wrong, where the file was put, and what happens now.
    pub message: String,
}

/// The environment variable that names another file.
const VARIABLE: &str = "TURNWRIGHT_SETTINGS";
const NAME: &str = "settings.ron";

impl SettingsFile {
    /// This very file.
    pub fn at(path: impl Into<PathBuf>) -> Self {
        Self { path: path.into() }
    }

    /// The user's own: the file that `TURNWRIGHT_SETTINGS` names, else the one in the system's usual folder for configuration
    /// (on Linux `$XDG_CONFIG_HOME/turnwright`, else `~/.config/turnwright`). `None` where the system tells no such
    /// folder, or the variable is set to nothing.
    pub fn of_user() -> Option<Self> {
        let variable = |name: &str| std::env::var_os(name).map(PathBuf::from);
        Self::of(&variable)
    }

    fn of(variable: &dyn Fn(&str) -> Option<PathBuf>) -> Option<Self> {
        if let Some(path) = variable(VARIABLE) {
            return (!path.as_os_str().is_empty()).then(|| Self::at(path));
        }
        // A relative path in these is to be ignored (XDG base directory specification).
        let folder = |name: &str| variable(name).filter(|path| path.is_absolute());
        let config = if cfg!(windows) {
            folder("APPDATA")
        } else if cfg!(target_os = "macos") {
            folder("HOME").map(|home| home.join("Library/Application Support"))
        } else {
            folder("XDG_CONFIG_HOME").or_else(|| folder("HOME").map(|home| home.join(".config")))
        };
        Some(Self::at(config?.join("turnwright").join(NAME)))
    }

    /// Where it is.
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// What it says; where there is none, what a first run begins with.
    ///
    /// # Errors
    /// When it can't be understood: it is then renamed, so that nothing in it is lost, and the run begins as a first one.
    pub fn read(&self) -> Result<Settings, UnreadSettings> {
        if !self.path.exists() {
            return Ok(Settings::default());
        }
        let shown = self.path.display();
        let bytes = disk::read(&self.path).map_err(|error| UnreadSettings {
            message: format!("{error}; this run begins with the usual settings"),
        })?;
        let parsed = std::str::from_utf8(&bytes)
            .map_err(|error| error.to_string())
            .and_then(|text| ron::from_str::<Settings>(text).map_err(|error| error.to_string()));
        parsed.map(Settings::sound).map_err(|error| {
            let aside = self.path.with_added_extension("damaged");
            let kept = match std::fs::rename(&self.path, &aside) {
                Ok(()) => format!("it was renamed to {}", aside.display()),
                Err(_) => "it stays as it is until settings change".to_owned(),
            };
            UnreadSettings {
                message: format!("{shown}: settings that can't be understood ({error}); {kept}, and the usual ones are used"),
            }
        })
    }

    /// Writes settings in place of what is there, at one stroke.
    ///
    /// # Errors
    /// When the system refuses; what is there then stays.
    pub fn write(&self, settings: &Settings) -> Result<(), String> {
        let pretty = ron::ser::PrettyConfig::default();
        let text = ron::ser::to_string_pretty(settings, pretty).map_err(|error| error.to_string())?;
        disk::write(&self.path, text.as_bytes()).map_err(|error| error.to_string())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_file_lies_where_the_system_keeps_configuration() {
        let find = |known: &[(&str, &str)]| {
            let known: Vec<(String, PathBuf)> =
                known.iter().map(|(name, path)| ((*name).to_owned(), PathBuf::from(path))).collect();
            let variable =
                |name: &str| known.iter().find(|(own, _)| own == name).map(|(_, path)| path.clone());
            SettingsFile::of(&variable).map(|file| file.path)
        };
        assert_eq!(find(&[(VARIABLE, "/a/b.ron"), ("HOME", "/h")]), Some(PathBuf::from("/a/b.ron")));
        assert_eq!(find(&[(VARIABLE, ""), ("HOME", "/h")]), None);
        if cfg!(all(unix, not(target_os = "macos"))) {
            let own = |path: &str| Some(PathBuf::from(path));
            assert_eq!(find(&[("HOME", "/h")]), own("/h/.config/turnwright/settings.ron"));
            assert_eq!(find(&[("XDG_CONFIG_HOME", "/x"), ("HOME", "/h")]), own("/x/turnwright/settings.ron"));
            assert_eq!(
                find(&[("XDG_CONFIG_HOME", "x"), ("HOME", "/h")]),
                own("/h/.config/turnwright/settings.ron")
            );
            assert_eq!(find(&[]), None);
        }
    }

    #[test]
    fn what_is_written_is_read_and_a_damaged_file_is_kept_aside() {
        let folder = tempfile::tempdir().unwrap();
        let file = SettingsFile::at(folder.path().join("deep/settings.ron"));
        assert_eq!(file.read(), Ok(Settings::default()), "a first run");
        let mut settings = Settings { light: true, zoom: 1.5, ..Settings::without_hints() };
        settings.keys.insert("Play".to_owned(), Some("Ctrl+K".to_owned()));
        settings.layout.space = Some(0.4);
        settings.window.size = Some([1200.0, 700.0]);
        file.write(&settings).unwrap();
        assert_eq!(file.read(), Ok(settings));
        // A newer version's fields are passed over.
        disk::write(file.path(), b"(light: true, of_tomorrow: [1, 2])").unwrap();
        assert_eq!(file.read().map(|settings| settings.light), Ok(true));
        disk::write(file.path(), b"(light: true, zoo").unwrap();
        let error = file.read().unwrap_err().message;
        assert!(error.contains("settings.ron.damaged"), "{error}");
        assert_eq!(disk::read(&file.path().with_added_extension("damaged")).unwrap(), b"(light: true, zoo");
        assert_eq!(file.read(), Ok(Settings::default()));
    }
}
