//! Clips by name: `FILE#NAME` and `FILE#INDEX`.

use std::path::{Path, PathBuf};

/// A file, and perhaps one clip of it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ClipAddress {
    /// The file.
    pub path: PathBuf,
    /// The clip's name or index, as typed.
    pub clip: Option<String>,
}

impl ClipAddress {
    /// Splits at the last `#`, unless the whole text is the name of a file that exists.
    pub fn parse(text: &str) -> Self {
        let whole = Self { path: PathBuf::from(text), clip: None };
        match text.rsplit_once('#') {
            Some((path, clip)) if !path.is_empty() && !Path::new(text).exists() => {
                // Names of clips may hold a `#` as well: the file is the longest beginning that exists.
                let longest =
                    text.match_indices('#').map(|(at, _)| at).find(|&at| Path::new(&text[..at]).exists());
                let (path, clip) = longest.map_or((path, clip), |at| (&text[..at], &text[at + 1..]));
                Self { path: PathBuf::from(path), clip: (!clip.is_empty()).then(|| clip.to_owned()) }
            }
            _ => whole,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_number_sign_splits_file_and_clip() {
        let check = |text: &str, path: &str, clip: Option<&str>| {
            let expected = ClipAddress { path: PathBuf::from(path), clip: clip.map(str::to_owned) };
            assert_eq!(ClipAddress::parse(text), expected, "{text}");
        };
        check("fox.glb", "fox.glb", None);
        check("fox.glb#Walk", "fox.glb", Some("Walk"));
        check("fox.glb#2", "fox.glb", Some("2"));
        check("fox.glb#", "fox.glb", None);
        let folder = tempfile::tempdir().unwrap();
        let odd = folder.path().join("take#3.bvh");
        super::super::disk::write(&odd, b"").unwrap();
        let odd = odd.to_str().unwrap();
        check(odd, odd, None);
        check(&format!("{odd}#a#b"), odd, Some("a#b"));
    }
}
