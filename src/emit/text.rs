//! Lines of a program under construction: indentation, comments and line breaks.

use super::escape;

/// Columns after which a line is broken where a blank allows it.
const WIDTH: usize = 110;

/// Indented lines.
#[derive(Clone, Debug, Default)]
pub struct Text {
    lines: String,
    depth: usize,
}

impl Text {
    /// Empty text whose lines are indented by `depth` steps.
    pub fn indented(depth: usize) -> Text {
        Text { lines: String::new(), depth }
    }

    /// One line, broken at blanks if it is too long. Comment lines are left whole.
    pub fn line(&mut self, line: &str) {
        let indent = "    ".repeat(self.depth);
        if line.is_empty() {
            self.lines.push('\n');
            return;
        }
        let mut rest = line;
        let mut first = true;
        loop {
            let lead = if first { indent.clone() } else { format!("{indent}    ") };
            let whole =
                lead.len() + rest.chars().count() <= WIDTH || rest.contains(['"', '/']) && is_comment(rest);
            let cut = if whole { None } else { break_at(rest, WIDTH - lead.len()) };
            self.lines.push_str(&lead);
            match cut {
                None => {
                    self.lines.push_str(rest);
                    self.lines.push('\n');
                    return;
                }
                Some(place) => {
                    self.lines.push_str(&rest[..place]);
                    self.lines.push('\n');
                    rest = rest[place..].trim_start();
                    first = false;
                }
            }
        }
    }

    /// One line that is never broken.
    pub fn verbatim(&mut self, line: &str) {
        self.lines.push_str(&"    ".repeat(self.depth));
        self.lines.push_str(line);
        self.lines.push('\n');
    }

    pub fn lines<'a>(&mut self, lines: impl IntoIterator<Item = &'a String>) {
        for line in lines {
            self.line(line);
        }
    }

    /// A line that ends with an opening bracket.
    pub fn open(&mut self, line: &str) {
        self.line(line);
        self.depth += 1;
    }

    /// A line that closes what the last `open` opened.
    pub fn close(&mut self, line: &str) {
        self.depth = self.depth.saturating_sub(1);
        self.line(line);
    }

    /// Indents what follows; the opening bracket stands already.
    pub fn open_only(&mut self) {
        self.depth += 1;
    }

    /// A comment of one line, made harmless.
    pub fn comment(&mut self, comment: &str) {
        self.line(&format!("/* {} */", escape::comment(comment)));
    }

    /// Another text with its own indentation.
    pub fn append(&mut self, other: &Text) {
        self.lines.push_str(&other.lines);
    }

    pub fn blank(&mut self) {
        self.lines.push('\n');
    }

    pub fn as_str(&self) -> &str {
        &self.lines
    }

    pub fn into_string(self) -> String {
        self.lines
    }

    pub fn depth(&self) -> usize {
        self.depth
    }

    /// Whether the identifier occurs.
    pub fn mentions(&self, name: &str) -> bool {
        mentions(&self.lines, name)
    }
}

/// Whether the identifier occurs in the text as a whole word, outside of comment lines.
pub fn mentions(text: &str, name: &str) -> bool {
    text.lines().any(|line| !is_comment(line.trim_start()) && occurs(line, name, |_| true))
}

/// Whether a function of that name is called, outside of comment lines.
pub fn calls(text: &str, name: &str) -> bool {
    text.lines()
        .any(|line| !is_comment(line.trim_start()) && occurs(line, name, |rest| rest.starts_with('(')))
}

fn occurs(line: &str, name: &str, follows: impl Fn(&str) -> bool) -> bool {
    let word = |byte: u8| byte.is_ascii_alphanumeric() || byte == b'_';
    line.match_indices(name).any(|(place, _)| {
        let rest = &line[place + name.len()..];
        let before = line.as_bytes()[..place].last().is_some_and(|byte| word(*byte));
        let after = rest.as_bytes().first().is_some_and(|byte| word(*byte));
        !before && !after && follows(rest)
    })
}

fn is_comment(line: &str) -> bool {
    line.starts_with("/*") || line.starts_with("//")
}

/// Where a line is best broken: at a blank in the right half of the width where the fewest brackets are open, rather
/// after a comma or a sum's sign than after a product's, and rather later; else at the first blank after the width.
fn break_at(line: &str, width: usize) -> Option<usize> {
    let mut depth = 0u32;
    let mut best: Option<(u32, usize)> = None;
    let mut previous = ' ';
    let mut text_seen = false;
    for (column, (place, character)) in line.char_indices().enumerate() {
        match character {
            '(' | '[' => depth += 1,
            ')' | ']' => depth = depth.saturating_sub(1),
            ' ' if text_seen && column > width => return best.map(|(_, place)| place).or(Some(place)),
            ' ' if text_seen && column * 2 > width => {
                let kind = match previous {
                    ',' => 0,
                    '+' | '-' | '=' | '&' | '|' | '?' | ':' | '{' => 1,
                    '*' | '/' => 2,
                    _ => 6,
                };
                let rank = 4 * depth + kind;
                if best.is_none_or(|(least, _)| rank <= least) {
                    best = Some((rank, place));
                }
            }
            _ => {}
        }
        text_seen |= character != ' ';
        previous = character;
    }
    best.map(|(_, place)| place)
}

/// At most one blank line in a row, none at the end.
pub fn tidy(text: &str) -> String {
    let mut result = String::new();
    let mut blank = false;
    for line in text.lines() {
        if line.is_empty() {
            blank = !result.is_empty();
            continue;
        }
        if blank {
            result.push('\n');
            blank = false;
        }
        result.push_str(line);
        result.push('\n');
    }
    result
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn long_lines_break_at_blanks() {
        let mut text = Text::indented(1);
        text.line(&format!("a = {};", vec!["term"; 60].join(" + ")));
        assert!(text.as_str().lines().all(|line| line.len() <= WIDTH + 4), "{}", text.as_str());
        assert_eq!(text.as_str().split_whitespace().filter(|word| word.starts_with("term")).count(), 60);
    }

    #[test]
    fn words_are_found_whole() {
        assert!(mentions("u_x + u", "u"));
        assert!(!mentions("u_x + v", "u"));
        assert!(!mentions("    /* u */", "u"));
        assert!(calls("x = sign(y);", "sign") && !calls("x = sign * y;", "sign"));
    }
}
