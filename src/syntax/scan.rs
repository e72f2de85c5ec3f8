//! A look at the tokens of one statement before it is parsed: bounds on its size and depth, and the slips in
//! numbers and operators that a grammar could only call "unexpected".
//!
//! Holds no grammar. What passes here is bounded in depth, so that parsing, dropping, cloning and printing the
//! tree need a bounded stack.

use super::cut::DEEPEST;
use super::fold::Folded;
use crate::diagnostic::{Code, Diagnostic, Diagnostics, codes, safe::safe};
use crate::exact::rational::{LARGEST_EXPONENT, LONGEST_LITERAL};

/// Most prefix operators in a row.
const LONGEST_PREFIX_RUN: usize = 64;
/// Most tokens in one statement.
const MOST_TOKENS: usize = 20_000;

/// Scans a statement (`text` begins at `offset` of the folded text); tells whether it may be parsed.
pub(super) fn scan(text: &str, offset: usize, folded: &Folded, diagnostics: &mut Diagnostics) -> bool {
    let before = diagnostics.len();
    let mut scanner = Scanner {
        text,
        offset,
        folded,
        diagnostics,
        at: 0,
        tokens: 0,
        depth: 0,
        run: 0,
        open: Vec::new(),
        operand: false,
    };
    while scanner.at < text.len() && scanner.step() {}
    scanner.diagnostics.len() == before
}

struct Scanner<'a> {
    text: &'a str,
    offset: usize,
    folded: &'a Folded,
    diagnostics: &'a mut Diagnostics,
    at: usize,
    tokens: usize,
    /// Open brackets and the prefix operators before them.
    depth: usize,
    /// Prefix operators just before the next token.
    run: usize,
    /// For each open bracket the depth outside of it.
    open: Vec<usize>,
    /// Whether the last token ends an operand, so that a sign after it stands between two.
    operand: bool,
}

impl Scanner<'_> {
    /// Reads a token; false to give up.
    fn step(&mut self) -> bool {
        let Some(letter) = self.text[self.at..].chars().next() else { return false };
        if letter == ' ' || letter == '\n' {
            self.at += 1;
            return true;
        }
        self.tokens += 1;
        if self.tokens > MOST_TOKENS {
            return self.give_up(
                codes::TOO_LONG,
                format!("this statement has more than {MOST_TOKENS} words and signs"),
                "divide it, for instance by naming parts as coefficients",
            );
        }
        match letter {
            '"' => self.skip_text(),
            '0'..='9' => self.number(),
            '.' if self.text[self.at + 1..].starts_with(|next: char| next.is_ascii_digit()) => self.number(),
            '(' => return self.open_bracket(),
            ')' => {
                self.depth = self.open.pop().unwrap_or(0);
                self.advance(1, true);
            }
            '+' | '-' if self.operand => self.operator(letter),
            '+' | '-' | 'Δ' | '∇' => return self.prefix(letter),
            '∂' => self.partial(),
            '°' => self.degree(),
            '_' => self.report(
                codes::BAD_NAME,
                0,
                1,
                "a name begins with a letter".into(),
                "write a letter before `_`",
            ),
            _ if letter.is_alphabetic() => self.word(),
            _ => self.operator(letter),
        }
        true
    }

    fn advance(&mut self, length: usize, operand: bool) {
        self.at += length;
        self.operand = operand;
        self.run = 0;
    }

    fn open_bracket(&mut self) -> bool {
        self.open.push(self.depth);
        self.depth += 1 + self.run;
        if self.depth > DEEPEST {
            return self.give_up(
                codes::TOO_DEEP,
                format!("formulas are nested deeper than {DEEPEST} brackets here"),
                "name a part as a coefficient",
            );
        }
        self.advance(1, false);
        true
    }

    fn prefix(&mut self, letter: char) -> bool {
        let run = self.run + 1;
        if run > LONGEST_PREFIX_RUN {
            return self.give_up(
                codes::TOO_DEEP,
                format!("more than {LONGEST_PREFIX_RUN} signs stand in a row before an operand"),
                "leave out signs that cancel",
            );
        }
        self.advance(letter.len_utf8(), false);
        self.run = run;
        if letter == '∇' {
            // `∇²`, `∇^2` and `∇·` are one operator each.
            let rest = &self.text[self.at..];
            let joined = rest.trim_start();
            if let Some(sign) = ["²", "·", "^2"].into_iter().find(|sign| joined.starts_with(sign)) {
                self.at += rest.len() - joined.len() + sign.len();
            }
        }
        true
    }

    fn partial(&mut self) {
        let length = '∂'.len_utf8();
        if self.text[self.at + length..].starts_with('_') {
            self.report(
                codes::UNEXPECTED,
                0,
                length + 1,
                "a derivative is a fraction, not an index".into(),
                "write `∂u/∂x`, or `∂/∂x(…)` before a bracket",
            );
        } else {
            self.advance(length, false);
        }
    }

    fn degree(&mut self) {
        let length = '°'.len_utf8();
        let scale = self.text[self.at + length..].chars().next();
        if let Some(scale @ ('C' | 'F')) = scale {
            self.report(
                codes::OFFSET_SCALE,
                0,
                length + 1,
                format!("`°{scale}` is not a unit: its zero is not where a quantity is nothing"),
                "give temperatures in kelvin (20 °C is 293.15 K); a difference of 1 °C is 1 K",
            );
        } else {
            self.advance(length, true);
        }
    }

    fn skip_text(&mut self) {
        let rest = &self.text[self.at + 1..];
        let length = rest.find('"').map_or(rest.len() + 1, |end| end + 2);
        self.advance(length, true);
    }

    fn word(&mut self) {
        let length = self.text[self.at..]
            .find(|letter: char| !(is_name_part(letter)))
            .unwrap_or(self.text.len() - self.at);
        self.advance(length.max(1), true);
    }

    fn operator(&mut self, letter: char) {
        let rest = &self.text[self.at..];
        let slips = [
            ("**", "a power is written with `^`", "write `x^2` or `x²`"),
            ("==", "an equality is written with one `=`", "write `=`"),
            ("=<", "this comparison is written `≤` or `<=`", "write `<=`"),
            ("=>", "this comparison is written `≥` or `>=`", "write `>=`"),
            (":=", "a definition is written with `=` alone", "write `=`"),
        ];
        if let Some((slip, message, remedy)) = slips.into_iter().find(|(slip, ..)| rest.starts_with(slip)) {
            self.report(codes::WRONG_OPERATOR, 0, slip.len(), message.into(), remedy);
        } else {
            let superscript = "⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺".contains(letter);
            self.advance(letter.len_utf8(), superscript);
        }
    }

    /// A number and what follows it without a space.
    fn number(&mut self) {
        let rest = &self.text[self.at..];
        let bytes = rest.as_bytes();
        let digits = |from: usize| bytes[from..].iter().take_while(|byte| byte.is_ascii_digit()).count();
        let byte = |at: usize| bytes.get(at).copied().unwrap_or(b' ');
        let whole = digits(0);
        let mut end = whole;
        if byte(end) == b'.' {
            let decimals = digits(end + 1);
            if decimals == 0 {
                let message = format!("`{}.` is not a number: digits follow the point", safe(&rest[..end]));
                let remedy = format!("write `{}` or `{}.0`", &rest[..end], &rest[..end]);
                return self.report(codes::NUMBER_FORM, 0, end + 1, message, &remedy);
            }
            end += 1 + decimals;
        }
        let mantissa = end;
        if matches!(byte(end), b'e' | b'E') {
            let sign = usize::from(matches!(byte(end + 1), b'+' | b'-'));
            let exponent = digits(end + 1 + sign);
            if exponent > 0 {
                end += 1 + sign + exponent;
                if end > LONGEST_LITERAL
                    || rest[mantissa + 1..end].parse::<i64>().is_ok_and(|e| e.abs() > LARGEST_EXPONENT)
                    || exponent > 6
                {
                    return self.too_large(end);
                }
            } else if sign == 1 || !rest[end + 1..].starts_with(is_name_part) {
                let message = "the exponent of this number has no digits".to_string();
                return self.report(codes::NUMBER_FORM, 0, end + 1 + sign, message, "write it as `1.5e-3`");
            }
        }
        if end > LONGEST_LITERAL {
            return self.too_large(end);
        }
        if byte(end) == b',' && byte(end + 1).is_ascii_digit() {
            return self.comma(end, whole);
        }
        let next = rest[end..].chars().next().unwrap_or(' ');
        if next == '.' {
            let message = "this number has a second decimal point".to_string();
            return self.report(codes::NUMBER_FORM, 0, end + 1, message, "write it with one point");
        }
        if is_name_part(next) || next == '°' {
            return self.joined(end);
        }
        self.advance(end, true);
    }

    fn too_large(&mut self, end: usize) {
        let message = format!(
            "this number cannot be kept exactly: exponents go to ±{LARGEST_EXPONENT}, digits to {LONGEST_LITERAL}"
        );
        self.report(
            codes::NUMBER_TOO_LARGE,
            0,
            end,
            message,
            "choose units in which the number is of ordinary size",
        );
    }

    fn comma(&mut self, end: usize, whole: usize) {
        let rest = &self.text[self.at..];
        let length = end + 1 + rest[end + 1..].bytes().take_while(u8::is_ascii_digit).count();
        let (left, right) = (&rest[..end], &rest[end + 1..length]);
        let remedy = if whole == end {
            format!("write `{left}.{right}` for a number, `{left}, {right}` for two")
        } else {
            format!("write `{left}, {right}`")
        };
        let message = format!("`{left},{right}` may be one number or two");
        self.report(codes::DECIMAL_COMMA, 0, length, message, &remedy);
    }

    fn joined(&mut self, end: usize) {
        let rest = &self.text[self.at..];
        let word = rest[end..]
            .find(|letter: char| !is_name_part(letter) && letter != '°')
            .map_or(rest.len(), |length| end + length);
        let (number, name) = (&rest[..end], &rest[end..word]);
        let remedy = if name.starts_with('_') {
            format!("digits are not grouped; write `{}`", rest[..word].replace('_', ""))
        } else {
            format!("write `{number} {name}` if `{name}` is a unit, `{number} * {name}` if it is a name")
        };
        let message = format!("`{}` runs a number and a word together", safe(&rest[..word]));
        self.report(codes::NUMBER_JOINED, 0, word, message, &remedy);
    }

    fn report(&mut self, code: Code, from: usize, length: usize, message: String, remedy: &str) {
        let start = self.offset + self.at + from;
        let span = self.folded.original(start, start + length);
        self.diagnostics.push(Diagnostic::error(code, span, message).with_remedy(remedy));
        self.advance(from + length, true);
    }

    fn give_up(&mut self, code: Code, message: String, remedy: &str) -> bool {
        let length = self.text[self.at..].chars().next().map_or(0, char::len_utf8);
        self.report(code, 0, length, message, remedy);
        false
    }
}

/// Whether a letter can stand in a name after its first.
fn is_name_part(letter: char) -> bool {
    letter == '_'
        || ('₀'..='₉').contains(&letter)
        || (letter != 'Δ' && letter != '·' && unicode_ident::is_xid_continue(letter))
}
