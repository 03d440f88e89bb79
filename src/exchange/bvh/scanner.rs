//! Words and numbers of a BVH text, byte by byte.

#![deny(clippy::arithmetic_side_effects, clippy::indexing_slicing)]

use crate::exchange::Note;
use crate::exchange::decimal::{short, shorts};

use super::error::{BvhError, BvhErrorKind};

/// Walks through the text. Never leaves it, whatever is asked.
#[derive(Debug)]
pub(super) struct Scanner<'a> {
    bytes: &'a [u8],
    pos: usize,
    /// What was odd about the numbers so far.
    pub(super) oddities: Oddities,
}

/// What was odd about the numbers of a text, each with the place of the first.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Oddities {
    /// Numbers that begin where the one before ends.
    pub(super) run_together: Tally,
    /// Numbers that are no finite number.
    pub(super) missing: Tally,
    /// Numbers with a decimal comma.
    pub(super) commas: Tally,
    /// Numbers with a decimal point.
    pub(super) points: Tally,
}

/// How often, and where first.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Tally {
    /// How often.
    pub(super) count: usize,
    /// Byte of the first.
    pub(super) first: usize,
}

impl Tally {
    fn add(&mut self, at: usize) {
        if self.count == 0 {
            self.first = at;
        }
        self.count = self.count.saturating_add(1);
    }
}

/// A number and the bytes it fills.
#[derive(Clone, Copy, Debug)]
pub(super) struct Number {
    /// First byte.
    pub(super) start: usize,
    /// Byte after the last.
    pub(super) end: usize,
    /// Its value; NaN for what is no finite number.
    pub(super) value: f64,
}

impl<'a> Scanner<'a> {
    pub(super) fn new(bytes: &'a [u8], pos: usize) -> Self {
        Self { bytes, pos, oddities: Oddities::default() }
    }

    pub(super) fn pos(&self) -> usize {
        self.pos
    }

    pub(super) fn peek(&self) -> Option<u8> {
        self.bytes.get(self.pos).copied()
    }

    /// Whether this text comes next.
    pub(super) fn is_at(&self, text: &[u8]) -> bool {
        self.bytes.get(self.pos..).is_some_and(|rest| rest.starts_with(text))
    }

    pub(super) fn advance(&mut self, count: usize) {
        self.pos = self.pos.saturating_add(count).min(self.bytes.len());
    }

    pub(super) fn go_to(&mut self, pos: usize) {
        self.pos = pos.min(self.bytes.len());
    }

    /// Past blanks and line ends.
    pub(super) fn skip_blanks(&mut self) {
        self.take_while(is_blank);
    }

    /// Past blanks on this line.
    pub(super) fn skip_blanks_in_line(&mut self) {
        while self.peek().is_some_and(|byte| is_blank(byte) && !is_line_end(byte)) {
            self.advance(1);
        }
    }

    /// Past `byte` where it is the next.
    pub(super) fn skip(&mut self, byte: u8) -> bool {
        let found = self.peek() == Some(byte);
        if found {
            self.advance(1);
        }
        found
    }

    /// Past the rest of this line, and gives it without its end.
    pub(super) fn rest_of_line(&mut self) -> &'a [u8] {
        self.take_while(|byte| !is_line_end(byte))
    }

    /// Past whatever `belongs`, and gives it.
    pub(super) fn take_while(&mut self, belongs: impl Fn(u8) -> bool) -> &'a [u8] {
        let rest = self.bytes.get(self.pos..).unwrap_or_default();
        let length = rest.iter().position(|&byte| !belongs(byte)).unwrap_or(rest.len());
        self.advance(length);
        rest.get(..length).unwrap_or_default()
    }

    /// Past the next word, and gives it: braces are words of their own; empty at the end.
    pub(super) fn word(&mut self) -> &'a [u8] {
        self.skip_blanks();
        let start = self.pos;
        if matches!(self.peek(), Some(b'{' | b'}')) {
            self.advance(1);
            return self.bytes.get(start..self.pos).unwrap_or_default();
        }
        self.take_while(|byte| !is_blank(byte) && !matches!(byte, b'{' | b'}'))
    }

    /// Past the letters that come next, and gives them: a keyword up to its colon.
    pub(super) fn letters(&mut self) -> &'a [u8] {
        self.skip_blanks();
        self.take_while(|byte| byte.is_ascii_alphabetic())
    }

    /// Past the plain numbers that come next, each behind a blank, until there are `most`: nearly the whole of a motion part.
    pub(super) fn plain_numbers(&mut self, most: usize, values: &mut Vec<f64>) {
        let stretch = shorts(self.bytes, self.pos, most, values);
        if stretch.has_point {
            self.oddities.points.add(self.pos);
        }
        self.pos = stretch.end;
    }

    /// Past the next number. `Ok(None)` at the end of the text; `Err(())`, and no step forward, where no number stands.
    pub(super) fn number(&mut self) -> Result<Option<Number>, ()> {
        self.skip_blanks();
        let start = self.pos;
        if self.peek().is_none() {
            return Ok(None);
        }
        // Right after another number: only a sign can tell the two apart, and only where a digit stands before it.
        let joined = start
            .checked_sub(1)
            .and_then(|before| self.bytes.get(before))
            .is_some_and(|&byte| byte.is_ascii_digit() || byte == b'.');
        let found = self.plain_number().or_else(|| {
            self.pos = start;
            self.missing_number()
        });
        let Some(value) = found else {
            self.pos = start;
            return Err(());
        };
        if joined {
            self.oddities.run_together.add(start);
        }
        if !value.is_finite() {
            self.oddities.missing.add(start);
        }
        let value = if value.is_finite() { value } else { f64::NAN };
        Ok(Some(Number { start, end: self.pos, value }))
    }

    /// Sign, digits, mark, digits, exponent.
    fn plain_number(&mut self) -> Option<f64> {
        let start = self.pos;
        if let Some(found) = short(self.bytes.get(start..)?) {
            self.advance(found.length);
            if found.has_point {
                self.oddities.points.add(start);
            }
            return Some(found.value);
        }
        if matches!(self.peek(), Some(b'+' | b'-')) {
            self.advance(1);
        }
        let whole = self.take_while(|byte| byte.is_ascii_digit()).len();
        let mark = self.pos;
        let comma = match self.peek() {
            Some(b'.') => Some(false),
            Some(b',') => Some(true),
            _ => None,
        };
        let mut part = 0;
        if comma.is_some() {
            self.advance(1);
            part = self.take_while(|byte| byte.is_ascii_digit()).len();
        }
        // A comma without a digit after it is a separator, and those are not read.
        if part == 0 && (whole == 0 || comma == Some(true)) {
            return None;
        }
        if matches!(self.peek(), Some(b'e' | b'E')) {
            self.advance(1);
            if matches!(self.peek(), Some(b'+' | b'-')) {
                self.advance(1);
            }
            if self.take_while(|byte| byte.is_ascii_digit()).is_empty() {
                return None;
            }
        }
        if !self.peek().is_none_or(|byte| is_blank(byte) || matches!(byte, b'+' | b'-' | b'{' | b'}')) {
            return None;
        }
        let text = std::str::from_utf8(self.bytes.get(start..self.pos)?).ok()?;
        match comma {
            Some(true) => {
                self.oddities.commas.add(start);
                text.replace(',', ".").parse().ok()
            }
            Some(false) => {
                self.oddities.points.add(mark);
                text.parse().ok()
            }
            None => text.parse().ok(),
        }
    }

    /// The ways programs print what is no number: `nan`, `-nan(ind)`, `inf`, `1.#QNAN`.
    fn missing_number(&mut self) -> Option<f64> {
        let word = self.take_while(|byte| !is_blank(byte)).to_ascii_lowercase();
        let unsigned = word.strip_prefix(b"-").or(word.strip_prefix(b"+")).unwrap_or(&word);
        let is_missing = match unsigned {
            b"nan" | b"inf" | b"infinity" => true,
            _ => {
                let printed = unsigned.strip_prefix(b"1.#").or(unsigned.strip_prefix(b"1,#"));
                let named = |rest: &[u8]| {
                    [&b"qnan"[..], b"snan", b"ind", b"inf"].iter().any(|name| rest.starts_with(name))
                };
                printed.is_some_and(named) || (unsigned.starts_with(b"nan(") && unsigned.ends_with(b")"))
            }
        };
        is_missing.then_some(f64::NAN)
    }

    /// The text at the scanner's place for a message: up to a blank, shortened where it is long.
    pub(super) fn found(&self) -> String {
        let rest = self.bytes.get(self.pos..).unwrap_or_default();
        let start = rest.iter().position(|&byte| !is_blank(byte)).unwrap_or(rest.len());
        let rest = rest.get(start..).unwrap_or_default();
        let length = rest.iter().position(|&byte| is_blank(byte)).unwrap_or(rest.len());
        quoted(rest.get(..length).unwrap_or_default())
    }

    /// An error at byte `at`.
    pub(super) fn error(&self, at: usize, kind: BvhErrorKind) -> BvhError {
        let (line, column) = self.place(at);
        BvhError { line, column, frame: None, joint: None, kind }
    }

    /// An error at the next word, which is not what was `expected`.
    pub(super) fn unexpected(&self, expected: impl Into<String>) -> BvhError {
        let rest = self.bytes.get(self.pos..).unwrap_or_default();
        let blanks = rest.iter().take_while(|&&byte| is_blank(byte)).count();
        let at = self.pos.saturating_add(blanks);
        self.error(at, BvhErrorKind::Unexpected { expected: expected.into(), found: self.found() })
    }

    /// 1-based line and column, in characters, of a byte.
    pub(super) fn place(&self, at: usize) -> (u32, u32) {
        let before = self.bytes.get(..at).unwrap_or(self.bytes);
        let (mut line, mut column, mut last) = (1_u32, 1_u32, 0_u8);
        for &byte in before {
            match (last, byte) {
                // The second half of CRLF, and the later bytes of a character in UTF-8, are no columns.
                (b'\r', b'\n') | (_, 0x80..=0xBF) => {}
                (_, b'\r' | b'\n') => (line, column) = (line.saturating_add(1), 1),
                _ => column = column.saturating_add(1),
            }
            last = byte;
        }
        (line, column)
    }

    /// Notes a text at its first place alone: a file may have a million of them, and lines are counted for each.
    pub(super) fn tell_once(&self, notes: &mut Vec<Note>, at: usize, text: &str) {
        if !notes.iter().any(|note| note.text == text) {
            notes.push(Note::new(self.line_of(at), text));
        }
    }

    /// `line 12` of a byte, for a note.
    pub(super) fn line_of(&self, at: usize) -> String {
        format!("line {}", self.place(at).0)
    }
}

/// White space between words; a zero byte counts, as some writers end lines with it.
pub(super) fn is_blank(byte: u8) -> bool {
    matches!(byte, b' ' | b'\t' | b'\r' | b'\n' | 0x0B | 0x0C | 0)
}

/// One of the two bytes that end lines.
pub(super) fn is_line_end(byte: u8) -> bool {
    matches!(byte, b'\r' | b'\n')
}

/// Bytes of a file in a message.
pub(super) fn quoted(bytes: &[u8]) -> String {
    const LONGEST: usize = 40;
    if bytes.is_empty() {
        return "the end of the file".to_owned();
    }
    let text = decoded(bytes);
    let shown: String = text
        .chars()
        .take(LONGEST)
        .map(|c| if c.is_control() { c.escape_default().to_string() } else { c.to_string() })
        .collect();
    if text.chars().count() > LONGEST { format!("`{shown}…`") } else { format!("`{shown}`") }
}

/// UTF-8; failing that every byte as the Latin-1 character it is.
pub(super) fn decoded(bytes: &[u8]) -> String {
    std::str::from_utf8(bytes)
        .map_or_else(|_not_utf8| bytes.iter().map(|&byte| char::from(byte)).collect(), str::to_owned)
}
