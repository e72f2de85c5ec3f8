//! Text from a model file made safe to show: control characters cannot steer a terminal.

/// `text` with control characters, line separators and characters that reorder text escaped.
pub fn safe(text: &str) -> String {
    text.chars().fold(String::with_capacity(text.len()), |mut safe, letter| {
        if is_unsafe(letter) {
            safe.extend(letter.escape_unicode())
        } else {
            safe.push(letter)
        }
        safe
    })
}

/// `text` on one line, shortened to at most `longest` characters, safe.
pub fn excerpt(text: &str, longest: usize) -> String {
    let joined = text.split_whitespace().collect::<Vec<_>>().join(" ");
    if joined.chars().count() <= longest {
        return safe(&joined);
    }
    let kept: String = joined.chars().take(longest.saturating_sub(1)).collect();
    safe(&kept) + "…"
}

/// Whether a character may not reach a terminal as it is.
pub fn is_unsafe(letter: char) -> bool {
    letter.is_control()
        || matches!(letter, '\u{2028}' | '\u{2029}' | '\u{200e}' | '\u{200f}' | '\u{061c}'
            | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' | '\u{feff}')
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nothing_steers_the_terminal() {
        assert_eq!(safe("a\u{1b}[31mρ"), "a\\u{1b}[31mρ");
        assert_eq!(safe("x\u{202e}y"), "x\\u{202e}y");
        assert_eq!(excerpt("a  b\n c", 10), "a b c");
        assert_eq!(excerpt("abcdef", 4), "abc…");
    }
}
