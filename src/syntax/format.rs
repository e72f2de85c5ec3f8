//! The formatter: whole files in canonical layout, comments kept.
//!
//! Works on the words and signs of each line, so that what the user wrote (brackets, spellings of names, the
//! order of everything) stays. Symbols take the place of control words and look-alikes. Formatting twice is
//! formatting once, and the tree stays the same.

use super::cut::{Home, Line, cut, lines};
use super::fold::fold;
use super::tree::Section;
use crate::diagnostic::Diagnostics;
use crate::source::SourceFile;

/// Columns before a statement, and before a line on which it goes on.
const INDENT: &str = "  ";
const CONTINUED: &str = "      ";
/// Longest left part that is padded so that a column lines up.
const LONGEST_ALIGNED: usize = 40;

/// What a line of the formatted file is.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Role {
    Blank,
    /// A comment alone, or a line at the top or a section word.
    Loose,
    /// The first line of a statement that has no other.
    Single(Section),
    Begun,
    Continued,
}

/// A formatted line before its columns are lined up.
struct Row {
    role: Role,
    /// Parts that are padded to common widths: name, value, description, …
    cells: Vec<String>,
    comment: String,
}

/// Formats a model file.
///
/// # Errors
/// The faults of a file that cannot be read: it is left as it is.
pub fn format(source: &SourceFile) -> Result<String, Diagnostics> {
    let (_, diagnostics) = super::parse(source);
    if diagnostics.has_errors() {
        return Err(diagnostics);
    }
    let mut none = Diagnostics::new();
    let folded = fold(source.text(), &mut none);
    let statements = cut(&folded, &mut none).statements;
    let text = &folded.text;
    let mut rows: Vec<Row> = Vec::new();
    let mut spacing = Spacing::default();
    let mut next = statements.iter().peekable();
    for line in lines(text) {
        while next.next_if(|statement| statement.end < line.start).is_some() {}
        let statement = next.peek().filter(|statement| statement.start < line.end.max(line.first + 1));
        let role = match statement {
            _ if line.is_blank() && line.comment == line.end => Role::Blank,
            _ if line.is_blank() => Role::Loose,
            Some(statement) if statement.start == line.first => {
                spacing = Spacing::default();
                match statement.home {
                    Home::Section(section) if statement.end <= line.end => Role::Single(section),
                    Home::Section(_) => Role::Begun,
                    _ => Role::Loose,
                }
            }
            Some(statement) if statement.start < line.first && line.first < statement.end => Role::Continued,
            _ => Role::Loose,
        };
        rows.push(row(text, line, role, &mut spacing));
    }
    Ok(assemble(rows))
}

fn row(text: &str, line: Line, role: Role, spacing: &mut Spacing) -> Row {
    let mut comment = text[line.comment..line.end].trim_end().to_string();
    if line.is_blank() && line.comment > line.start && !comment.is_empty() {
        comment.insert_str(0, INDENT);
    }
    let code = spacing.line(&text[line.first..line.last]);
    let cells = match role {
        Role::Single(section) => cells(section, &code),
        _ => vec![code],
    };
    Row { role, cells, comment }
}

/// Divides a statement into the parts that are lined up with those of its neighbours.
fn cells(section: Section, code: &str) -> Vec<String> {
    match section {
        Section::Constants => {
            let (definition, description) = split_outside_text(code, '"');
            let Some((name, value)) = definition.split_once(" = ") else { return vec![code.into()] };
            let mut cells = vec![name.to_string(), format!("= {}", value.trim_end())];
            cells.extend(description);
            cells
        }
        Section::Conditions => match code.find(": ") {
            Some(colon) if code.starts_with("at ") => vec![code[..=colon].into(), code[colon + 2..].into()],
            _ => vec![code.into()],
        },
        _ => vec![code.into()],
    }
}

fn split_outside_text(code: &str, quote: char) -> (&str, Option<String>) {
    match code.find(quote) {
        Some(at) => (&code[..at], Some(code[at..].to_string())),
        None => (code, None),
    }
}

/// Rows → text: blank lines single, columns of neighbouring statements lined up.
fn assemble(rows: Vec<Row>) -> String {
    let mut out = String::new();
    let mut at = 0;
    let mut blank = false;
    while at < rows.len() {
        let role = rows[at].role;
        if role == Role::Blank {
            blank = !out.is_empty();
            at += 1;
            continue;
        }
        if std::mem::take(&mut blank) {
            out.push('\n');
        }
        let block = match role {
            Role::Single(_) => rows[at..].iter().take_while(|row| row.role == role).count(),
            _ => 1,
        };
        write_block(&mut out, &rows[at..at + block]);
        at += block;
    }
    out
}

fn write_block(out: &mut String, rows: &[Row]) {
    let codes: Vec<String> = aligned(rows);
    let widest = codes.iter().map(|code| width(code)).max().unwrap_or(0);
    for (row, code) in rows.iter().zip(&codes) {
        let indent = match row.role {
            Role::Single(_) | Role::Begun => INDENT,
            Role::Continued => CONTINUED,
            Role::Blank | Role::Loose => "",
        };
        let mut line = format!("{indent}{code}");
        if !row.comment.is_empty() {
            if !code.is_empty() {
                let padding = if rows.len() > 1 { widest - width(code) } else { 0 };
                line.push_str(&" ".repeat(padding + 2));
            }
            line.push_str(&row.comment);
        }
        out.push_str(line.trim_end());
        out.push('\n');
    }
}

/// The cells of each row, all but the last padded to the widest of the block.
fn aligned(rows: &[Row]) -> Vec<String> {
    let mut codes: Vec<String> = vec![String::new(); rows.len()];
    let most = rows.iter().map(|row| row.cells.len()).max().unwrap_or(0);
    for column in 0..most {
        let widths =
            rows.iter().filter(|row| row.cells.len() > column + 1).map(|row| width(&row.cells[column]));
        let widest = widths.filter(|width| *width <= LONGEST_ALIGNED).max().unwrap_or(0);
        for (row, code) in rows.iter().zip(&mut codes) {
            let Some(cell) = row.cells.get(column) else { continue };
            code.push_str(cell);
            if row.cells.len() > column + 1 {
                // A description stands apart from the value.
                let gap = if row.cells[column + 1].starts_with('"') { 3 } else { 1 };
                code.push_str(&" ".repeat(widest.saturating_sub(width(cell)) + gap));
            }
        }
    }
    codes
}

fn width(text: &str) -> usize {
    text.chars().count()
}

/// What stands before the next word or sign, for the spaces around it.
#[derive(Clone, Copy, Default, PartialEq, Eq)]
enum Before {
    /// The beginning of a statement.
    #[default]
    Nothing,
    /// A word, a number, a text or a closing bracket.
    Operand,
    /// An operator that stands between two operands.
    Operator,
    /// A sign before an operand, an opening bracket, `∂` or `∇`: nothing is put after it.
    Tight,
    /// `,`, `;` or `:`.
    Separator,
}

/// Puts the spaces of a statement, line by line.
#[derive(Default)]
struct Spacing {
    before: Before,
}

impl Spacing {
    fn line(&mut self, code: &str) -> String {
        if code.starts_with("method ") && !code.contains('=') {
            // Names of methods may have a hyphen.
            return code.split_whitespace().collect::<Vec<_>>().join(" ");
        }
        let mut out = String::with_capacity(code.len() + 16);
        let mut rest = code;
        while let Some(token) = next_token(rest.trim_start()) {
            let spaced = rest.starts_with([' ', '\t']);
            rest = &rest.trim_start()[token.len()..];
            self.token(&mut out, token, spaced, rest);
        }
        out.trim_end().to_string()
    }

    fn token(&mut self, out: &mut String, token: &str, spaced: bool, rest: &str) {
        let begins = out.is_empty();
        let (gap, before) = match token {
            "+" | "-" => match self.before {
                Before::Operand => (true, Before::Operator),
                before => (before != Before::Tight && spaced || wants_gap(before), Before::Tight),
            },
            "=" | "<" | ">" | "≤" | "≥" | "<=" | ">=" => (true, Before::Operator),
            "*" | "/" | "·" => {
                let wide = spaced || rest.starts_with(' ') || rest.is_empty() || begins;
                let tight = self.before == Before::Tight;
                (wide && !tight, if wide && !tight { Before::Operator } else { Before::Tight })
            }
            "^" => (false, Before::Tight),
            "," | ";" | ":" => (false, Before::Separator),
            "(" => (spaced && self.before == Before::Operand || wants_gap(self.before), Before::Tight),
            ")" => (false, Before::Operand),
            "∂" | "∇" => {
                (spaced && self.before == Before::Operand || wants_gap(self.before), Before::Tight)
            }
            _ => (spaced && self.before == Before::Operand || wants_gap(self.before), Before::Operand),
        };
        if gap && !begins {
            out.push(' ');
        }
        out.push_str(token);
        self.before = before;
    }
}

/// Whether a space is put after what stands before, whatever was written.
fn wants_gap(before: Before) -> bool {
    matches!(before, Before::Operator | Before::Separator)
}

/// Words with a hyphen in them.
const HYPHENATED: [&str; 2] = ["energy-stable", "one-sided"];

/// The next word, number, text or sign; nothing at the end.
fn next_token(text: &str) -> Option<&str> {
    let first = text.chars().next()?;
    let length = match first {
        '"' => text[1..].find('"').map_or(text.len(), |end| end + 2),
        '0'..='9' | '.' => number_length(text),
        '<' | '>' if text[1..].starts_with('=') => 2,
        _ if is_sign(first) => first.len_utf8(),
        _ => HYPHENATED.iter().find(|word| text.starts_with(**word)).map_or_else(
            || {
                text.find(|letter: char| letter == ' ' || letter == '"' || is_sign(letter))
                    .unwrap_or(text.len())
            },
            |word| word.len(),
        ),
    };
    Some(&text[..length])
}

fn is_sign(letter: char) -> bool {
    "+-*/·^=<>≤≥,;:()∂∇".contains(letter)
}

/// The length of a number with its exponent; what follows without a space belongs to the same token.
fn number_length(text: &str) -> usize {
    let bytes = text.as_bytes();
    let mut at = 0;
    while at < bytes.len() {
        let exponent_sign = matches!(bytes[at], b'+' | b'-')
            && at > 0
            && matches!(bytes[at - 1], b'e' | b'E')
            && bytes.get(at + 1).is_some_and(u8::is_ascii_digit);
        if !(bytes[at].is_ascii_alphanumeric() || bytes[at] == b'.' || exponent_sign) {
            break;
        }
        at += 1;
    }
    at
}
