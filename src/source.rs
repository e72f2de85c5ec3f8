//! Source files, spans, lines and columns.
//!
//! Holds the text of one model file exactly as it was read, and where its lines are. It does not fold
//! look-alikes or normalise anything: that is the front end's business, and its spans point into this text.

use std::fmt;

/// Byte offsets into the text of a [`SourceFile`], start included, end not.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, Default, PartialOrd, Ord)]
pub struct Span {
    pub start: u32,
    pub end: u32,
}

impl Span {
    /// From `start` (included) to `end` (not).
    pub fn new(start: u32, end: u32) -> Span {
        Span { start, end: end.max(start) }
    }

    /// The smallest span that holds both.
    pub fn to(self, other: Span) -> Span {
        Span { start: self.start.min(other.start), end: self.end.max(other.end) }
    }

    /// Number of bytes.
    pub fn len(self) -> usize {
        (self.end - self.start) as usize
    }

    /// Whether it holds no byte.
    pub fn is_empty(self) -> bool {
        self.start == self.end
    }

    /// The empty span at the end of this one.
    pub fn after(self) -> Span {
        Span { start: self.end, end: self.end }
    }
}

/// Largest model file in bytes.
pub const LARGEST_FILE: usize = 1 << 20;

/// A line and a column, both from 1; columns count characters, not bytes.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct Position {
    pub line: u32,
    pub column: u32,
}

/// Why bytes are not the text of a model.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum SourceFault {
    /// More than [`LARGEST_FILE`] bytes; holds how many.
    TooLarge(usize),
    /// Not UTF-8: holds the offset of the first byte that is not, and its line.
    NotUtf8 { offset: usize, line: u32 },
}

impl fmt::Display for SourceFault {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            SourceFault::TooLarge(size) => {
                write!(out, "the file has {size} bytes; a model file has at most {LARGEST_FILE}")
            }
            SourceFault::NotUtf8 { offset, line } => {
                write!(out, "the file is not UTF-8 text: byte {offset}, in line {line}")
            }
        }
    }
}

/// A model file: its name (for messages) and its text.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct SourceFile {
    name: String,
    text: String,
    /// Offsets at which lines begin.
    line_starts: Vec<u32>,
    fault: Option<SourceFault>,
}

impl SourceFile {
    /// A file from text that is known to be UTF-8. A text that is too large is kept as a fault: see
    /// [`SourceFile::fault`].
    pub fn new(name: impl Into<String>, text: impl Into<String>) -> SourceFile {
        let text = text.into();
        if text.len() > LARGEST_FILE {
            return SourceFile::faulty(name.into(), SourceFault::TooLarge(text.len()));
        }
        let line_starts = line_starts(&text);
        SourceFile { name: name.into(), text, line_starts, fault: None }
    }

    /// A file from the bytes on disk. Bytes that are no text leave an empty text and a fault, which the front
    /// end turns into a diagnostic.
    pub fn from_bytes(name: impl Into<String>, bytes: Vec<u8>) -> SourceFile {
        if bytes.len() > LARGEST_FILE {
            return SourceFile::faulty(name.into(), SourceFault::TooLarge(bytes.len()));
        }
        match String::from_utf8(bytes) {
            Ok(text) => SourceFile::new(name, text),
            Err(error) => {
                let offset = error.utf8_error().valid_up_to();
                let before = &error.as_bytes()[..offset];
                let line = 1 + before.iter().filter(|&&byte| byte == b'\n').count() as u32;
                SourceFile::faulty(name.into(), SourceFault::NotUtf8 { offset, line })
            }
        }
    }

    fn faulty(name: String, fault: SourceFault) -> SourceFile {
        SourceFile { name, text: String::new(), line_starts: vec![0], fault: Some(fault) }
    }

    /// The name as given on the command line.
    pub fn name(&self) -> &str {
        &self.name
    }

    /// The text as it was read.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// Why there is no text, if so.
    pub fn fault(&self) -> Option<&SourceFault> {
        self.fault.as_ref()
    }

    /// The text of a span; empty if the span is not one of this file's.
    pub fn slice(&self, span: Span) -> &str {
        self.text.get(span.start as usize..span.end as usize).unwrap_or("")
    }

    /// The whole text.
    pub fn whole(&self) -> Span {
        Span::new(0, self.text.len() as u32)
    }

    /// Line and column of an offset. A byte order mark at the start is not counted as a column.
    pub fn position(&self, offset: u32) -> Position {
        let offset = (offset as usize).min(self.text.len());
        let line = self.line_starts.partition_point(|&start| start as usize <= offset).max(1);
        let start = self.line_starts[line - 1] as usize;
        let before = self.text.as_bytes()[start..offset].iter();
        // Every character has exactly one byte that is not a continuation byte.
        let mut columns = before.filter(|&&byte| byte & 0xC0 != 0x80).count();
        if start == 0 && self.text.starts_with('\u{feff}') && columns > 0 {
            columns -= 1;
        }
        Position { line: line as u32, column: columns as u32 + 1 }
    }
}

fn line_starts(text: &str) -> Vec<u32> {
    let ends = text.bytes().enumerate().filter(|(_, byte)| *byte == b'\n').map(|(at, _)| at as u32 + 1);
    std::iter::once(0).chain(ends).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_count_characters() {
        let file = SourceFile::new("m.rim", "∂T\r\nρ = 1\n");
        assert_eq!(file.position(3), Position { line: 1, column: 2 });
        assert_eq!(file.position(6), Position { line: 2, column: 1 });
        assert_eq!(file.position(8), Position { line: 2, column: 2 });
        assert_eq!(file.position(999), Position { line: 3, column: 1 });
    }

    #[test]
    fn a_byte_order_mark_has_no_column() {
        let file = SourceFile::new("m.rim", "\u{feff}model a \"b\"");
        assert_eq!(file.position(3), Position { line: 1, column: 1 });
        assert_eq!(file.position(0), Position { line: 1, column: 1 });
    }

    #[test]
    fn bytes_that_are_no_text_are_a_fault() {
        let file = SourceFile::from_bytes("m.rim", b"model\n\xff".to_vec());
        assert_eq!(file.fault(), Some(&SourceFault::NotUtf8 { offset: 6, line: 2 }));
        assert_eq!(file.text(), "");
        let file = SourceFile::from_bytes("m.rim", vec![b' '; LARGEST_FILE + 1]);
        assert_eq!(file.fault(), Some(&SourceFault::TooLarge(LARGEST_FILE + 1)));
    }
}
