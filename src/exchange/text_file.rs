//! The bytes of a text file and the text in them: the same, but for UTF-16, which is read as UTF-8 and written back as it was.

#![deny(clippy::arithmetic_side_effects, clippy::indexing_slicing)]

use std::borrow::Cow;
use std::sync::Arc;

use super::Note;

/// A text file as it was read.
#[derive(Clone, Debug)]
pub(super) struct TextFile {
    bytes: Arc<Vec<u8>>,
    /// The text in UTF-8, its byte-order mark included, where the bytes are UTF-16.
    utf8: Option<(Arc<Vec<u8>>, ByteOrder)>,
}

/// Which byte of a unit of UTF-16 comes first.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum ByteOrder {
    Little,
    Big,
}

/// Why bytes that begin as UTF-16 are none.
#[derive(Debug, PartialEq, Eq)]
pub(super) struct NotUtf16 {
    /// 1-based line.
    pub line: u32,
    /// 1-based column in characters.
    pub column: u32,
    /// What stands there.
    pub found: String,
}

impl NotUtf16 {
    /// What should stand there.
    pub(super) const EXPECTED: &'static str = "UTF-16 to the end, as the file's first two bytes say";

    fn after(text: &str, found: String) -> Self {
        let last = text.rsplit('\n').next().unwrap_or_default();
        let lines = text.matches('\n').count();
        let place = |count: usize| u32::try_from(count.saturating_add(1)).unwrap_or(u32::MAX);
        Self { line: place(lines), column: place(last.chars().count()), found }
    }
}

impl TextFile {
    /// Looks at the first bytes: with a byte-order mark of UTF-16 it is that, else it is text as it is.
    ///
    /// # Errors
    /// When it begins as UTF-16 and is none.
    pub(super) fn new(bytes: Vec<u8>) -> Result<Self, NotUtf16> {
        let utf8 = match ByteOrder::of(&bytes) {
            None => None,
            Some(order) => Some((Arc::new(order.decode(&bytes)?), order)),
        };
        Ok(Self { bytes: Arc::new(bytes), utf8 })
    }

    /// The text of a file that is read once and not written.
    ///
    /// # Errors
    /// As [`TextFile::new`].
    pub(super) fn text_of(bytes: &[u8]) -> Result<Cow<'_, [u8]>, NotUtf16> {
        match ByteOrder::of(bytes) {
            None => Ok(Cow::Borrowed(bytes)),
            Some(order) => order.decode(bytes).map(Cow::Owned),
        }
    }

    /// The file as it was.
    pub(super) fn bytes(&self) -> &[u8] {
        &self.bytes
    }

    /// What is to be read.
    pub(super) fn text(&self) -> &[u8] {
        self.utf8.as_ref().map_or(&self.bytes, |(text, _)| text)
    }

    /// Whether the bytes are the text.
    pub(super) fn is_plain(&self) -> bool {
        self.utf8.is_none()
    }

    /// What is odd about its encoding.
    pub(super) fn note(&self) -> Option<Note> {
        let text = "expected UTF-8, found UTF-16: read so, and kept when writing";
        (!self.is_plain()).then(|| Note::new("line 1", text))
    }

    /// A changed text as the file's own encoding has it.
    pub(super) fn encoded(&self, text: Vec<u8>) -> Vec<u8> {
        match &self.utf8 {
            None => text,
            Some((_, order)) => order.encode(&String::from_utf8_lossy(&text)),
        }
    }
}

impl ByteOrder {
    fn of(bytes: &[u8]) -> Option<Self> {
        match bytes {
            [0xFF, 0xFE, ..] => Some(Self::Little),
            [0xFE, 0xFF, ..] => Some(Self::Big),
            _ => None,
        }
    }

    fn decode(self, bytes: &[u8]) -> Result<Vec<u8>, NotUtf16> {
        let (pairs, rest) = bytes.as_chunks::<2>();
        let unit = |pair: &[u8; 2]| match self {
            Self::Little => u16::from_le_bytes(*pair),
            Self::Big => u16::from_be_bytes(*pair),
        };
        let mut text = String::with_capacity(pairs.len());
        for decoded in char::decode_utf16(pairs.iter().map(unit)) {
            match decoded {
                Ok(own) => text.push(own),
                Err(error) => {
                    let found = format!("half of a character, {:#06x}", error.unpaired_surrogate());
                    return Err(NotUtf16::after(&text, found));
                }
            }
        }
        if !rest.is_empty() {
            return Err(NotUtf16::after(&text, "a single byte at the end of the file".to_owned()));
        }
        Ok(text.into_bytes())
    }

    fn encode(self, text: &str) -> Vec<u8> {
        let mut bytes = Vec::with_capacity(text.len().saturating_mul(2));
        for unit in text.encode_utf16() {
            bytes.extend_from_slice(&match self {
                Self::Little => unit.to_le_bytes(),
                Self::Big => unit.to_be_bytes(),
            });
        }
        bytes
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn utf16(text: &str, order: ByteOrder) -> Vec<u8> {
        order.encode(&format!("\u{feff}{text}"))
    }

    #[test]
    fn utf_16_is_read_and_comes_back_in_its_own_order() {
        for order in [ByteOrder::Little, ByteOrder::Big] {
            let bytes = utf16("zeit\tß\n骨\t𝄞\r\n", order);
            let file = TextFile::new(bytes.clone()).unwrap();
            assert_eq!(file.text(), "\u{feff}zeit\tß\n骨\t𝄞\r\n".as_bytes());
            assert_eq!(file.bytes(), bytes);
            assert!(!file.is_plain());
            assert_eq!(file.encoded(file.text().to_vec()), bytes);
        }
        let plain = TextFile::new(b"\xEF\xBB\xBFt\xE4".to_vec()).unwrap();
        assert!(plain.is_plain() && plain.text() == plain.bytes());
        assert_eq!(plain.encoded(vec![0xE4]), [0xE4]);
    }

    #[test]
    fn what_is_no_utf_16_is_told_with_its_place() {
        let place = |bytes: Vec<u8>| TextFile::new(bytes).unwrap_err();
        let mut odd = utf16("a\nbc", ByteOrder::Little);
        odd.push(b'x');
        let found = "a single byte at the end of the file".to_owned();
        assert_eq!(place(odd), NotUtf16 { line: 2, column: 3, found });
        let mut alone = utf16("a", ByteOrder::Big);
        alone.extend([0xD8, 0x01, 0, b'b']);
        let found = "half of a character, 0xd801".to_owned();
        assert_eq!(place(alone), NotUtf16 { line: 1, column: 3, found });
    }
}
