//! Folding: look-alikes, control words, line ends and Unicode forms are brought to one spelling before anything
//! is read, and characters that are none of the language are reported.
//!
//! The folded text keeps a map back to the original, so that every span of the tree points into the file as it
//! is. Texts in quotes and comments are passed through; the cut into statements is [`super::cut`]'s business.

use unicode_ident::{is_xid_continue, is_xid_start};
use unicode_normalization::char::canonical_combining_class;
use unicode_normalization::{IsNormalized, UnicodeNormalization, is_nfc_quick};

use super::control;
use super::cut::MOST_FAULTS;
use super::names::raised_digit;
use crate::diagnostic::{Diagnostic, Diagnostics, codes, safe::safe};
use crate::source::Span;

/// Longest text in the braces of a subscript, in characters.
const LONGEST_SUBSCRIPT: usize = 64;

/// A text in one spelling, with its way back.
#[derive(Debug)]
pub(super) struct Folded {
    pub text: String,
    map: OffsetMap,
    /// Places (in the folded text) at which a character or a text was refused.
    pub refused: Vec<u32>,
}

impl Folded {
    /// The place in the original file of a stretch of the folded text.
    pub fn original(&self, start: usize, end: usize) -> Span {
        Span::new(self.map.start(start as u32), self.map.end(end as u32))
    }
}

/// Stretches of the folded text and where they come from, in order and without gaps.
#[derive(Debug, Default)]
struct OffsetMap {
    pieces: Vec<Piece>,
}

#[derive(Clone, Copy, Debug)]
struct Piece {
    folded: u32,
    original: u32,
    original_end: u32,
    /// Whether bytes correspond one to one.
    copied: bool,
}

impl OffsetMap {
    fn add(&mut self, piece: Piece) {
        if let Some(last) = self.pieces.last_mut()
            && last.copied
            && piece.copied
            && last.original_end == piece.original
        {
            last.original_end = piece.original_end;
        } else {
            self.pieces.push(piece);
        }
    }

    fn start(&self, folded: u32) -> u32 {
        let after = self.pieces.partition_point(|piece| piece.folded <= folded);
        self.pieces.get(after.wrapping_sub(1)).map_or(0, |piece| {
            if piece.copied {
                (piece.original + (folded - piece.folded)).min(piece.original_end)
            } else {
                piece.original
            }
        })
    }

    fn end(&self, folded: u32) -> u32 {
        let after = self.pieces.partition_point(|piece| piece.folded < folded);
        self.pieces.get(after.wrapping_sub(1)).map_or(0, |piece| {
            if piece.copied {
                (piece.original + (folded - piece.folded)).min(piece.original_end)
            } else {
                piece.original_end
            }
        })
    }
}

/// Where the folder is.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Mode {
    Formula,
    Text,
    Comment,
}

/// Folds a text; what is refused is reported.
pub(super) fn fold(text: &str, diagnostics: &mut Diagnostics) -> Folded {
    let normal = is_nfc_quick(text.chars()) == IsNormalized::Yes;
    let mut folder = Folder {
        text,
        normal,
        at: 0,
        mode: Mode::Formula,
        text_start: 0,
        folded: Folded {
            text: String::with_capacity(text.len()),
            map: OffsetMap::default(),
            refused: Vec::new(),
        },
        diagnostics,
    };
    if text.starts_with('\u{feff}') {
        folder.at = '\u{feff}'.len_utf8();
    }
    while let Some(letter) = folder.text[folder.at..].chars().next() {
        folder.step(letter);
    }
    if folder.mode == Mode::Text {
        folder.report_open_text();
    }
    folder.folded
}

struct Folder<'a> {
    text: &'a str,
    normal: bool,
    at: usize,
    mode: Mode,
    text_start: usize,
    folded: Folded,
    diagnostics: &'a mut Diagnostics,
}

impl Folder<'_> {
    fn step(&mut self, letter: char) {
        let rest = &self.text[self.at..];
        match self.mode {
            _ if rest.starts_with("\r\n") => self.replace(1, ""),
            _ if letter == '\n' => {
                if self.mode == Mode::Text {
                    self.report_open_text();
                }
                self.mode = Mode::Formula;
                self.copy(letter);
            }
            Mode::Comment => self.copy(letter),
            Mode::Text => self.step_in_text(letter),
            Mode::Formula => self.step_in_formula(letter),
        }
    }

    fn step_in_text(&mut self, letter: char) {
        if letter == '"' {
            self.mode = Mode::Formula;
        } else if letter.is_control() && letter != '\t' {
            self.refuse(
                letter.len_utf8(),
                &format!("the control character `{}` in a text", safe(&letter.to_string())),
                "remove it",
            );
        }
        self.copy(letter);
    }

    fn step_in_formula(&mut self, letter: char) {
        match letter {
            '#' => self.mode = Mode::Comment,
            '"' => {
                self.mode = Mode::Text;
                self.text_start = self.at;
            }
            '\\' => return self.control_word(),
            '_' if self.braced_subscript() => return,
            '^' if self.order_after_sign() => return,
            _ => {}
        }
        if !self.normal && self.compose(letter) {
            return;
        }
        if letter.is_ascii() {
            match letter {
                '\t' => self.replace(1, " "),
                _ if is_allowed_ascii(letter) => self.copy(letter),
                _ => self.refuse_and_copy(letter),
            }
        } else if let Some(plain) = look_alike(letter) {
            self.replace(letter.len_utf8(), plain);
        } else if is_allowed(letter) {
            self.copy(letter);
        } else {
            self.refuse_and_copy(letter);
        }
    }

    /// Replaces a letter and its combining marks by their composed form; tells whether that changed anything.
    fn compose(&mut self, letter: char) -> bool {
        if canonical_combining_class(letter) != 0 {
            return false; // Looked at with the letter before it; again for each mark would take quadratic time.
        }
        let rest = &self.text[self.at + letter.len_utf8()..];
        let marks: usize =
            rest.chars().take_while(|&mark| canonical_combining_class(mark) != 0).map(char::len_utf8).sum();
        let cluster = &self.text[self.at..self.at + letter.len_utf8() + marks];
        let composed: String = cluster.nfc().collect();
        if composed == cluster || !composed.chars().all(|part| is_allowed(part) || part.is_ascii()) {
            return false;
        }
        let length = cluster.len();
        self.replace(length, &composed);
        true
    }

    /// `_{…}` after a name: the braces of TeX.
    fn braced_subscript(&mut self) -> bool {
        let Some(rest) = self.text[self.at..].strip_prefix("_{") else { return false };
        let letters = rest.chars().take(LONGEST_SUBSCRIPT);
        let inner =
            letters.take_while(|&letter| is_xid_continue(letter) && is_allowed(letter)).collect::<String>();
        if inner.is_empty() || !rest[inner.len()..].starts_with('}') {
            return false;
        }
        self.replace(inner.len() + 3, &format!("_{inner}"));
        true
    }

    /// `∂^2` and `∇^2`: the order stands where TeX puts it, and a name may follow without a space.
    fn order_after_sign(&mut self) -> bool {
        let rest = &self.text[self.at + 1..];
        let digits = rest.bytes().take_while(u8::is_ascii_digit).count();
        if digits == 0 || digits > 3 || !self.folded.text.ends_with(['∂', '∇']) {
            return false;
        }
        let order = rest[..digits].chars().map(raised_digit).collect::<String>();
        self.replace(digits + 1, &order);
        true
    }

    fn control_word(&mut self) {
        let rest = &self.text[self.at + 1..];
        let length = rest.bytes().take_while(u8::is_ascii_alphabetic).count();
        let word = &rest[..length];
        match control::symbol(word) {
            Some(symbol) => {
                // TeX would multiply `k\rho`; here a name must not swallow the control word.
                let joins =
                    self.folded.text.chars().next_back().is_some_and(|last| {
                        is_xid_continue(last) && last != '_' && last != '·' && last != 'Δ'
                    }) && symbol.starts_with(is_xid_start);
                if joins {
                    self.replace(0, " ");
                }
                let blanks = self.swallowed_blanks(symbol, length + 1);
                self.replace(length + 1 + blanks, symbol);
            }
            None => {
                let span = Span::new(self.at as u32, (self.at + 1 + length) as u32);
                let message = format!("`\\{}` is no control word of the language", safe(word));
                self.folded.refused.push(self.folded.text.len() as u32);
                self.report(
                    Diagnostic::error(codes::UNKNOWN_CONTROL_WORD, span, message)
                        .with_text("not in the table")
                        .with_remedy(control::remedy(word)),
                );
                self.replace(length + 1, "?");
            }
        }
    }

    /// Blanks after a control word that end it only, as in TeX: in units, which have no space in them, `m\cdot K`
    /// and `5 \mu m` would fall apart.
    fn swallowed_blanks(&self, symbol: &str, length: usize) -> usize {
        let before = self.folded.text.as_bytes();
        let joins = match symbol {
            "·" => before.last().is_some_and(|last| *last != b' '),
            "μ" => matches!(before, [.., digit, b' '] if digit.is_ascii_digit()),
            _ => false,
        };
        let rest = &self.text[self.at + length..];
        if joins { rest.len() - rest.trim_start_matches(' ').len() } else { 0 }
    }

    fn refuse_and_copy(&mut self, letter: char) {
        let (what, remedy) = named(letter);
        let what = if what.is_empty() { "this character".to_string() } else { what.to_string() };
        self.refuse(
            letter.len_utf8(),
            &format!("`{}`, {what}, has no place here", safe(&letter.to_string())),
            remedy,
        );
        self.replace(letter.len_utf8(), "?");
    }

    fn refuse(&mut self, length: usize, message: &str, remedy: &str) {
        let span = Span::new(self.at as u32, (self.at + length) as u32);
        self.folded.refused.push(self.folded.text.len() as u32);
        let code = if matches!(self.text[self.at..].chars().next(), Some('\'' | '′' | '’' | '‘' | '´'))
        {
            codes::PRIME
        } else {
            codes::STRAY_CHARACTER
        };
        self.report(Diagnostic::error(code, span, message).with_remedy(remedy));
    }

    fn report_open_text(&mut self) {
        let end = self.text[self.at..].find('\n').map_or(self.text.len(), |_| self.at);
        let end = if self.text[..end].ends_with('\r') { end - 1 } else { end };
        self.folded.refused.push((self.folded.text.len() as u32).saturating_sub(1));
        self.report(
            Diagnostic::error(
                codes::OPEN_TEXT,
                Span::new(self.text_start as u32, end as u32),
                "the text in quotes is not closed on its line",
            )
            .with_text("begins here")
            .with_remedy("close it with `\"`; a text cannot go on over a line end and knows no escapes"),
        );
    }

    /// Reports a fault; after so many they are only counted as refused places.
    fn report(&mut self, fault: Diagnostic) {
        if self.diagnostics.len() < MOST_FAULTS {
            self.diagnostics.push(fault);
        }
    }

    fn copy(&mut self, letter: char) {
        let (folded, original) = (self.folded.text.len() as u32, self.at as u32);
        self.folded.text.push(letter);
        self.at += letter.len_utf8();
        self.folded.map.add(Piece { folded, original, original_end: self.at as u32, copied: true });
    }

    fn replace(&mut self, length: usize, by: &str) {
        let (folded, original) = (self.folded.text.len() as u32, self.at as u32);
        self.folded.text.push_str(by);
        self.at += length;
        self.folded.map.add(Piece { folded, original, original_end: self.at as u32, copied: false });
    }
}

fn is_allowed_ascii(letter: char) -> bool {
    letter.is_ascii_alphanumeric() || " \n_+-*/^=<>,:;().\"#".contains(letter)
}

/// Whether a character beyond ASCII has a place in names, units or formulas.
fn is_allowed(letter: char) -> bool {
    "∂∇Δ·≤≥°⁻⁺".contains(letter)
        || ('₀'..='₉').contains(&letter)
        || "⁰¹²³⁴⁵⁶⁷⁸⁹".contains(letter)
        || (is_xid_continue(letter) && !letter.is_numeric() && !is_raised_or_lowered(letter))
        || letter.is_ascii() && is_allowed_ascii(letter)
}

/// Letters that stand raised or lowered: `ⁿ` reads as an exponent, but names could swallow it.
fn is_raised_or_lowered(letter: char) -> bool {
    matches!(letter, 'ⁱ' | 'ⁿ' | 'ₐ'..='ₜ' | 'ᴬ'..='ᶿ' | 'ʰ'..='ʸ')
}

/// Characters that look like one of the language and can mean nothing else.
fn look_alike(letter: char) -> Option<&'static str> {
    Some(match letter {
        '−' | '–' => "-",
        '×' => "*",
        '⋅' | '∙' => "·",
        '∆' => "Δ",
        'µ' => "μ",
        '\u{a0}' | '\u{202f}' | '\u{2009}' => " ",
        _ => return None,
    })
}

/// What a character is called and what to write instead.
fn named(letter: char) -> (&'static str, &'static str) {
    match letter {
        '—' | '‐' | '‑' | '―' => ("a dash", "write `-`"),
        '÷' | '∕' | '⁄' | '／' => ("a division sign", "write `/`"),
        '∗' | '•' | '∘' => ("a sign that looks like a multiplication", "write `*`"),
        '“' | '”' | '„' | '«' | '»' => ("a typographic quote", "write `\"`"),
        '\'' | '′' | '’' | '‘' | '´' => (
            "a prime",
            "a derivative is written `∂u/∂x` or `∂u/∂t`; a second variable needs a name of its own",
        ),
        '[' | ']' | '{' | '}' => ("a bracket of another kind", "use round brackets `( )`"),
        '!' | '≠' | '&' | '|' | '∧' | '∨' => (
            "a logical sign",
            "comparisons are `<`, `≤`, `>`, `≥`; several are joined by further cases or by `and`",
        ),
        '%' | '‰' => ("a percent sign", "write the number, `0.05` for 5 %"),
        '$' => ("a dollar sign", "formulas need no `$`"),
        '~' | '≈' | '≡' => ("a sign of likeness", "an equality is written `=`"),
        '√' => ("a root sign", "write `sqrt(…)`"),
        '∫' => ("an integral sign", "integrals are outputs: `integral NAME: EXPR over x`"),
        '∞' => ("an infinity", "give a number"),
        '℃' | '℉' => ("a temperature scale with an offset", "give temperatures in kelvin, `293.15 K`"),
        'ⁿ' | 'ⁱ' => ("a raised letter", "write the exponent after `^`, as in `x^n`"),
        _ if is_raised_or_lowered(letter) => {
            ("a raised or lowered letter", "write an index after `_`, an exponent after `^`")
        }
        _ if letter.is_numeric() => ("a digit that is not 0 to 9", "write the digits 0 to 9"),
        _ if letter.is_whitespace() => ("a space of an unusual kind", "write an ordinary space"),
        '?' | '@' | '`' => ("", "remove it"),
        _ => ("", "remove it, or write it as text in quotes or as a comment after `#`"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn folded(text: &str) -> (String, Diagnostics) {
        let mut diagnostics = Diagnostics::new();
        let folded = fold(text, &mut diagnostics);
        (folded.text, diagnostics)
    }

    #[test]
    fn look_alikes_and_control_words_become_one_spelling() {
        let (text, faults) = folded("\u{feff}\\partial T−\\rho_{0}×a⋅∆ u\u{a0}µ\tk\r\n");
        assert_eq!(text, "∂ T-ρ_0*a·Δ u μ k\n");
        assert!(faults.is_empty(), "{faults:?}");
    }

    #[test]
    fn texts_and_comments_are_left_alone() {
        let (text, faults) = folded("a \"5 – 10 \\x\" # \\frac − '\n");
        assert_eq!(text, "a \"5 – 10 \\x\" # \\frac − '\n");
        assert!(faults.is_empty());
    }

    #[test]
    fn decomposed_letters_are_composed_and_spans_lead_back() {
        let mut faults = Diagnostics::new();
        let original = "e\u{301}x = \\rho";
        let folded = fold(original, &mut faults);
        assert_eq!(folded.text, "éx = ρ");
        assert_eq!(folded.original(0, 2), Span::new(0, 3));
        assert_eq!(folded.original(6, 8), Span::new(7, 11));
        assert_eq!(folded.original(2, 3), Span::new(3, 4));
    }

    #[test]
    fn a_name_does_not_swallow_a_control_word() {
        assert_eq!(folded("k\\rho T_\\alpha").0, "k ρ T_α");
    }

    #[test]
    fn strangers_are_named() {
        for (text, code) in [
            ("T'", codes::PRIME),
            ("xⁿ", codes::STRAY_CHARACTER),
            ("\\partialu", codes::UNKNOWN_CONTROL_WORD),
            ("\\frac", codes::UNKNOWN_CONTROL_WORD),
            ("\"open", codes::OPEN_TEXT),
            ("a[1]", codes::STRAY_CHARACTER),
            ("٣", codes::STRAY_CHARACTER),
        ] {
            assert!(folded(text).1.has(code), "{text}");
        }
    }
}
