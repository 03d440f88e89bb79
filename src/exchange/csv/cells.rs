//! Records and cells of a CSV text (RFC 4180), byte by byte.

#![deny(clippy::arithmetic_side_effects, clippy::indexing_slicing)]

use std::borrow::Cow;

use crate::exchange::decimal::short;

use super::error::CsvError;

/// Cells of a row that are read: some thousand joints with all that a row can say of each.
const MAX_CELLS: usize = 100_000;

/// The content of a cell: without the quotes and blanks around it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Cell {
    /// First byte.
    pub(super) start: usize,
    /// Byte after the last.
    pub(super) end: usize,
}

/// What stands between cells, and in numbers. RFC 4180 has commas and points; where a comma is the decimal mark, tables have
/// semicolons, and sensors like tabs.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Dialect {
    /// The byte between two cells.
    pub(super) separator: u8,
    /// Whether numbers have a comma where others have a point.
    pub(super) decimal_comma: bool,
}

impl Dialect {
    /// That of the RFC.
    pub(super) const RFC: Self = Self { separator: b',', decimal_comma: false };

    /// That of a header line: what of comma, semicolon and tab it has most of outside quotes. Of decimal marks it says nothing.
    fn of_header(line: &[u8]) -> Self {
        let mut is_quoted = false;
        let mut counts = [(b',', 0_usize), (b';', 0), (b'\t', 0)];
        for &byte in line {
            is_quoted ^= byte == b'"';
            for (separator, count) in &mut counts {
                *count = count.saturating_add(usize::from(byte == *separator && !is_quoted));
            }
        }
        // Of equal ones the first.
        let most = counts.into_iter().rev().max_by_key(|(_, count)| *count);
        Self { separator: most.map_or(b',', |(separator, _)| separator), ..Self::RFC }
    }

    /// What it is called in a message.
    pub(super) const fn separator_name(self) -> &'static str {
        match self.separator {
            b';' => "semicolons",
            b'\t' => "tabs",
            _ => "commas",
        }
    }

    fn is_blank(self, byte: u8) -> bool {
        is_blank(byte) && byte != self.separator
    }
}

/// Walks through the records of a text.
#[derive(Debug)]
pub(super) struct Records<'a> {
    bytes: &'a [u8],
    /// What stands between the cells.
    pub(super) dialect: Dialect,
    pos: usize,
    /// 1-based line of the record last given.
    pub(super) line: u32,
    next_line: u32,
    /// The cells of the record last given.
    pub(super) cells: Vec<Cell>,
}

impl<'a> Records<'a> {
    /// From the start, past a byte-order mark.
    pub(super) fn new(bytes: &'a [u8]) -> Self {
        let pos = if bytes.starts_with(b"\xEF\xBB\xBF") { 3 } else { 0 };
        Self { bytes, dialect: Dialect::RFC, pos, line: 1, next_line: 1, cells: Vec::new() }
    }

    /// From byte `pos`, where a record begins. Lines count from there.
    pub(super) fn at(bytes: &'a [u8], dialect: Dialect, pos: usize) -> Self {
        Self { dialect, pos: pos.min(bytes.len()), ..Self::new(bytes) }
    }

    /// The next record as the header, which shows what stands between cells; `false` at the end.
    ///
    /// # Errors
    /// As [`Records::next`].
    pub(super) fn header(&mut self) -> Result<bool, CsvError> {
        self.skip_empty_lines();
        let rest = self.rest();
        let length = rest.iter().position(|&byte| is_line_end(byte)).unwrap_or(rest.len());
        self.dialect = Dialect::of_header(rest.get(..length).unwrap_or_default());
        self.next()
    }

    /// Where the next record begins.
    pub(super) fn pos(&self) -> usize {
        self.pos
    }

    /// The next line, if it is a comment; past it then.
    pub(super) fn comment(&mut self) -> Option<&'a [u8]> {
        self.skip_empty_lines();
        let rest = self.rest();
        let blanks = rest.iter().take_while(|&&byte| is_blank(byte)).count();
        if rest.get(blanks) != Some(&b'#') {
            return None;
        }
        self.line = self.next_line;
        let length = rest.iter().position(|&byte| is_line_end(byte)).unwrap_or(rest.len());
        self.pos = self.pos.saturating_add(length);
        self.line_end();
        rest.get(..length)
    }

    /// Goes to the next record; `false` at the end. Empty lines are passed over.
    ///
    /// # Errors
    /// When a quote is not closed, or something stands after a closing quote.
    pub(super) fn next(&mut self) -> Result<bool, CsvError> {
        self.skip_empty_lines();
        self.line = self.next_line;
        self.cells.clear();
        if self.rest().is_empty() {
            return Ok(false);
        }
        loop {
            self.cell()?;
            match self.peek() {
                Some(byte) if byte == self.dialect.separator => {
                    if self.cells.len() >= MAX_CELLS {
                        let expected = format!("at most {MAX_CELLS} cells in a row");
                        return Err(CsvError::unexpected(self.line, expected, "more"));
                    }
                    self.advance(1);
                }
                _ => break,
            }
        }
        self.line_end();
        Ok(true)
    }

    fn cell(&mut self) -> Result<(), CsvError> {
        let dialect = self.dialect;
        while self.peek().is_some_and(|byte| dialect.is_blank(byte)) {
            self.advance(1);
        }
        if self.peek() != Some(b'"') {
            let rest = self.rest();
            let is_end = |&byte: &u8| byte == dialect.separator || is_line_end(byte);
            let length = rest.iter().position(is_end).unwrap_or(rest.len());
            self.push_trimmed(self.pos, self.pos.saturating_add(length));
            self.advance(length);
            return Ok(());
        }
        self.advance(1);
        let start = self.pos;
        loop {
            match self.peek() {
                None => {
                    let expected = "a closing quote";
                    return Err(CsvError::unexpected(self.line, expected, "the end of the file"));
                }
                Some(b'"') => {
                    self.advance(1);
                    if self.peek() == Some(b'"') {
                        self.advance(1);
                        continue;
                    }
                    break;
                }
                Some(byte) if is_line_end(byte) => self.line_end(),
                Some(_) => self.advance(1),
            }
        }
        self.push_trimmed(start, self.pos.saturating_sub(1));
        while self.peek().is_some_and(|byte| dialect.is_blank(byte)) {
            self.advance(1);
        }
        match self.peek() {
            None | Some(b'\r' | b'\n') => Ok(()),
            Some(byte) if byte == dialect.separator => Ok(()),
            Some(byte) => {
                let separator = match dialect.separator {
                    b';' => "a semicolon",
                    b'\t' => "a tab",
                    _ => "a comma",
                };
                let expected = format!("{separator} or the end of the line after a quote");
                let found = format!("`{}`", char::from(byte).escape_default());
                Err(CsvError::unexpected(self.next_line, expected, found))
            }
        }
    }

    fn push_trimmed(&mut self, start: usize, end: usize) {
        let bytes = self.bytes.get(start..end).unwrap_or_default();
        let is_blank = |byte: &&u8| self.dialect.is_blank(**byte);
        let before = bytes.iter().take_while(is_blank).count();
        let after = bytes.iter().rev().take_while(is_blank).count();
        let start = start.saturating_add(before);
        self.cells.push(Cell { start, end: end.saturating_sub(after).max(start) });
    }

    fn rest(&self) -> &'a [u8] {
        self.bytes.get(self.pos..).unwrap_or_default()
    }

    fn peek(&self) -> Option<u8> {
        self.bytes.get(self.pos).copied()
    }

    fn advance(&mut self, count: usize) {
        self.pos = self.pos.saturating_add(count).min(self.bytes.len());
    }

    /// Past one line end: CRLF, LF or CR.
    fn line_end(&mut self) {
        let carriage = self.peek() == Some(b'\r');
        if carriage {
            self.advance(1);
        }
        let feed = self.peek() == Some(b'\n');
        if feed {
            self.advance(1);
        }
        if carriage || feed {
            self.next_line = self.next_line.saturating_add(1);
        }
    }

    fn skip_empty_lines(&mut self) {
        loop {
            let rest = self.rest();
            let blanks = rest.iter().take_while(|&&byte| is_blank(byte)).count();
            match rest.get(blanks) {
                Some(&byte) if is_line_end(byte) => {
                    self.advance(blanks);
                    self.line_end();
                }
                Some(_) => return,
                None => {
                    self.advance(blanks);
                    return;
                }
            }
        }
    }
}

/// The text of a cell, doubled quotes made single.
pub(super) fn text(bytes: &[u8], cell: Cell) -> Cow<'_, str> {
    let raw = bytes.get(cell.start..cell.end).unwrap_or_default();
    let quoted = cell.start.checked_sub(1).and_then(|before| bytes.get(before)) == Some(&b'"');
    let text = decoded(raw);
    if quoted && text.contains("\"\"") { text.replace("\"\"", "\"").into() } else { text }
}

/// UTF-8; failing that every byte as the Latin-1 character it is.
pub(super) fn decoded(bytes: &[u8]) -> Cow<'_, str> {
    std::str::from_utf8(bytes)
        .map_or_else(|_not_utf8| bytes.iter().map(|&byte| char::from(byte)).collect(), Cow::Borrowed)
}

/// A cell's text in a message.
pub(super) fn shown(bytes: &[u8], cell: Cell) -> String {
    quoted(&text(bytes, cell))
}

/// A text in a message: shortened where it is long.
pub(super) fn quoted(text: &str) -> String {
    const LONGEST: usize = 60;
    if text.is_empty() {
        return "an empty cell".to_owned();
    }
    let shown: String = text
        .chars()
        .take(LONGEST)
        .map(|c| if c.is_control() { c.escape_default().to_string() } else { c.to_string() })
        .collect();
    if text.chars().count() > LONGEST { format!("`{shown}…`") } else { format!("`{shown}`") }
}

/// The number in a cell with a decimal comma, if that is what it is: digits on both sides of one comma.
pub(super) fn comma_number(bytes: &[u8], cell: Cell) -> Option<f64> {
    let text = std::str::from_utf8(bytes.get(cell.start..cell.end)?).ok()?;
    let (whole, part) = text.split_once(',')?;
    let is_part = part.starts_with(|c: char| c.is_ascii_digit()) && !part.contains(['.', ',']);
    if !is_part
        || whole.contains('.')
        || !whole.trim_start_matches(['-', '+']).bytes().all(|b| b.is_ascii_digit())
    {
        return None;
    }
    text.replace(',', ".").parse().ok().filter(|value: &f64| value.is_finite())
}

/// The number in a cell; NaN for an empty one and for what is not finite, `None` where none stands.
pub(super) fn number(bytes: &[u8], cell: Cell) -> Option<f64> {
    let raw = bytes.get(cell.start..cell.end)?;
    if raw.is_empty() {
        return Some(f64::NAN);
    }
    if let Some(found) = short(raw).filter(|found| found.length == raw.len()) {
        return Some(found.value);
    }
    let value: f64 = std::str::from_utf8(raw).ok()?.parse().ok()?;
    Some(if value.is_finite() { value } else { f64::NAN })
}

fn is_blank(byte: u8) -> bool {
    matches!(byte, b' ' | b'\t')
}

fn is_line_end(byte: u8) -> bool {
    matches!(byte, b'\r' | b'\n')
}
