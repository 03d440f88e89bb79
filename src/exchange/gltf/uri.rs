//! Where a buffer's bytes are: inside the URI itself, or in a file of the document's own folder (sections 2.8 and 3.6.1).

#![deny(clippy::arithmetic_side_effects, clippy::indexing_slicing)]

use base64::Engine;
use base64::alphabet;
use base64::engine::DecodePaddingMode;
use base64::engine::general_purpose::{GeneralPurpose, GeneralPurposeConfig};
use percent_encoding::{AsciiSet, NON_ALPHANUMERIC, percent_decode_str, utf8_percent_encode};

use super::error::GltfError;
use super::json::shortened;

/// With or without padding, as files in the wild have it.
const BASE64: GeneralPurpose = GeneralPurpose::new(
    &alphabet::STANDARD,
    GeneralPurposeConfig::new()
        .with_decode_padding_mode(DecodePaddingMode::Indifferent)
        .with_decode_allow_trailing_bits(true),
);

/// What stays as it is in a file name within a URI.
const KEPT: &AsciiSet = &NON_ALPHANUMERIC.remove(b'-').remove(b'_').remove(b'.').remove(b'~');

/// A URI taken apart.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) enum Uri {
    /// The bytes of a data URI.
    Data(Vec<u8>),
    /// A path relative to the document and inside its folder, percent-decoded, parts divided by `/`.
    File(String),
}

/// Takes the URI at `place` apart.
///
/// # Errors
/// When a data URI is no base64, or a path is absolute, has a scheme or leaves the document's folder.
pub(super) fn parse(uri: &str, place: &str) -> Result<Uri, GltfError> {
    match uri.get(..5) {
        Some(scheme) if scheme.eq_ignore_ascii_case("data:") => {
            data(uri.get(5..).unwrap_or_default(), place).map(Uri::Data)
        }
        _ => relative_path(uri, place).map(Uri::File),
    }
}

/// RFC 2397, after the scheme.
fn data(rest: &str, place: &str) -> Result<Vec<u8>, GltfError> {
    let Some((kind, content)) = rest.split_once(',') else {
        return Err(GltfError::unlike(
            place,
            "a comma in the data URI",
            format!("`data:{}`", shortened(rest)),
        ));
    };
    if !kind.to_ascii_lowercase().ends_with(";base64") {
        return Ok(percent_decode_str(content).collect());
    }
    let decoded = if content.contains('%') {
        BASE64.decode(percent_decode_str(content).collect::<Vec<u8>>())
    } else {
        BASE64.decode(content)
    };
    decoded.map_err(|error| {
        let found = error.to_string().to_lowercase();
        GltfError::unlike(place, "base64 in the data URI", found.trim_end_matches('.').to_owned())
    })
}

fn relative_path(uri: &str, place: &str) -> Result<String, GltfError> {
    let refused = |found: &str| {
        let expected = "a relative path inside the document's own folder";
        GltfError::unlike(place, expected, format!("{found} `{}`", shortened(uri)))
    };
    let Ok(path) = percent_decode_str(uri).decode_utf8() else { return Err(refused("no UTF-8 in")) };
    if path.contains(':') {
        return Err(refused("a scheme or drive in"));
    }
    if path.contains(['\\', '\0']) {
        return Err(refused("a forbidden character in"));
    }
    if path.starts_with('/') {
        return Err(refused("the absolute path"));
    }
    let mut parts: Vec<&str> = Vec::new();
    for part in path.split('/') {
        match part {
            "" | "." => {}
            ".." => {
                if parts.pop().is_none() {
                    return Err(refused("a way out of the folder in"));
                }
            }
            name => parts.push(name),
        }
    }
    if parts.is_empty() {
        return Err(refused("no file name in"));
    }
    Ok(parts.join("/"))
}

/// A data URI that holds `bytes`.
pub(super) fn write_data(bytes: &[u8]) -> String {
    format!("data:application/octet-stream;base64,{}", BASE64.encode(bytes))
}

/// A file name as a URI.
pub(super) fn write_file(name: &str) -> String {
    utf8_percent_encode(name, KEPT).to_string()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[track_caller]
    fn check(uri: &str, expected: &str) {
        let found = match parse(uri, "buffers[0].uri") {
            Ok(Uri::Data(bytes)) => format!("{bytes:?}"),
            Ok(Uri::File(path)) => path,
            Err(error) => error.to_string(),
        };
        assert!(found.contains(expected), "{uri}: expected {expected}, found {found}");
    }

    #[test]
    fn paths_stay_inside_the_folder() {
        check("a.bin", "a.bin");
        check("./b%20c/d.bin", "b c/d.bin");
        check("x/../a.bin", "a.bin");
        check("../a.bin", "a way out of the folder in `../a.bin`");
        check("x/%2e%2e/%2E%2E/a.bin", "a way out of the folder");
        check("/etc/passwd", "the absolute path `/etc/passwd`");
        check("%2Fetc/passwd", "the absolute path");
        check("..\\a.bin", "a forbidden character");
        check("C:a.bin", "a scheme or drive");
        check("http://a.b/c.bin", "a scheme or drive");
        check("file:a.bin", "a scheme or drive");
        check("a%00.bin", "a forbidden character");
        check("%ff.bin", "no UTF-8");
        check("", "no file name");
        check("x/..", "no file name");
    }

    #[test]
    fn data_uris_with_and_without_padding() {
        check("data:application/octet-stream;base64,AQI=", "[1, 2]");
        check("DATA:application/gltf-buffer;base64,AQI", "[1, 2]");
        check("data:;base64,AQI%3D", "[1, 2]");
        check("data:,%01b", "[1, 98]");
        check("data:;base64,A*I=", "expected base64 in the data URI");
        check("data:;base64", "expected a comma");
        let bytes: Vec<u8> = (0..=255).collect();
        assert_eq!(parse(&write_data(&bytes), ""), Ok(Uri::Data(bytes)));
        assert_eq!(parse(&write_file("ä b#1.bin"), ""), Ok(Uri::File("ä b#1.bin".to_owned())));
    }
}
