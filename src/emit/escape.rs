//! Foreign text made harmless: strings and comments of C and Rust.
//!
//! Model names, titles and the model itself may hold any characters. Nothing here decides about identifiers.

/// Whether a character may stand in emitted text as it is. Control characters and everything that reorders or hides
/// text (bidirectional marks, zero-width characters, separators, private use) may not.
fn plain(character: char) -> bool {
    match character {
        ' '..='~' => true,
        '\u{0}'..='\u{9f}' | '\u{ad}' | '\u{61c}' | '\u{180e}' => false,
        '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2060}'..='\u{206f}' => false,
        '\u{e000}'..='\u{f8ff}' | '\u{fe00}'..='\u{fe0f}' | '\u{feff}' | '\u{fff0}'.. => false,
        _ => true,
    }
}

/// The inside of a C string literal. Trigraphs are broken; what is not plain becomes octal bytes, which unlike
/// hexadecimal ones have a fixed length.
pub fn c_string(text: &str) -> String {
    let mut result = String::new();
    let mut previous = ' ';
    for character in text.chars() {
        match character {
            '"' => result.push_str("\\\""),
            '\\' => result.push_str("\\\\"),
            '\n' => result.push_str("\\n"),
            '?' if previous == '?' => result.push_str("\\?"),
            plain_one if plain(plain_one) => result.push(plain_one),
            other => {
                let mut bytes = [0; 4];
                for byte in other.encode_utf8(&mut bytes).bytes() {
                    result.push_str(&format!("\\{byte:03o}"));
                }
            }
        }
        previous = character;
    }
    result
}

/// The inside of a Rust string literal.
pub fn rust_string(text: &str) -> String {
    let mut result = String::new();
    for character in text.chars() {
        match character {
            '"' => result.push_str("\\\""),
            '\\' => result.push_str("\\\\"),
            '\n' => result.push_str("\\n"),
            plain_one if plain(plain_one) => result.push(plain_one),
            other => result.push_str(&format!("\\u{{{:x}}}", u32::from(other))),
        }
    }
    result
}

/// One line that is safe inside `/* … */` and after `//`: no end or beginning of a comment, no trigraph, no line splice.
pub fn comment(text: &str) -> String {
    let mut result = String::new();
    let mut previous = ' ';
    for character in text.chars() {
        let shown = if plain(character) { character } else { ' ' };
        if matches!((previous, shown), ('*', '/') | ('/', '*') | ('?', '?')) {
            result.push(' ');
        }
        result.push(shown);
        previous = shown;
    }
    if result.ends_with('\\') {
        result.push(' ');
        result.push('.');
    }
    result.trim_end().to_owned()
}

/// Text cut into pieces of at most `longest` bytes, after each line end where there is one.
pub fn pieces(text: &str, longest: usize) -> Vec<&str> {
    let mut result = Vec::new();
    for line in text.split_inclusive('\n') {
        let mut rest = line;
        while rest.len() > longest {
            let mut cut = longest;
            while !rest.is_char_boundary(cut) {
                cut -= 1;
            }
            result.push(&rest[..cut]);
            rest = &rest[cut..];
        }
        result.push(rest);
    }
    result
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn comments_cannot_be_left() {
        assert_eq!(comment("a */ b"), "a * / b");
        assert_eq!(comment("x /* y"), "x / * y");
        assert_eq!(comment("end\\"), "end\\ .");
        assert_eq!(comment("??/"), "? ?/");
        assert_eq!(comment("a\u{202e}b\nc"), "a b c");
    }

    #[test]
    fn strings_keep_their_bytes() {
        assert_eq!(c_string("a\"\\\n??="), "a\\\"\\\\\\n?\\?=");
        assert_eq!(c_string("\u{202e}1"), "\\342\\200\\2561");
        assert_eq!(rust_string("\u{202e}\""), "\\u{202e}\\\"");
        assert_eq!(c_string("κ"), "κ");
    }

    #[test]
    fn pieces_join_to_the_text() {
        let text = "αβγδ\nlonger line than six\n";
        let cut = pieces(text, 6);
        assert!(cut.iter().all(|piece| piece.len() <= 6));
        assert_eq!(cut.concat(), text);
    }
}
