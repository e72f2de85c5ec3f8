//! Names: their canonical spelling and which of them cannot be declared.
//!
//! Nothing here knows which names a model declares.

use super::tree::{Function, Section};

/// Why a name cannot be declared.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Reserved {
    SectionWord,
    Function,
    /// `t`.
    Time,
    /// `π`.
    Pi,
    /// `δ`, the point source.
    PointSource,
}

impl Reserved {
    /// What the name means already, to be used after "`t` is".
    pub fn meaning(self) -> &'static str {
        match self {
            Reserved::SectionWord => "a section word",
            Reserved::Function => "a function",
            Reserved::Time => "the time",
            Reserved::Pi => "the circle number",
            Reserved::PointSource => "the point source",
        }
    }
}

/// Functions that are not in the list of elementary ones.
const SPECIAL_FUNCTIONS: [&str; 2] = ["cases", "noise"];

/// Why a name (in canonical spelling) cannot be declared, if so.
pub fn reserved(name: &str) -> Option<Reserved> {
    match name {
        "t" => Some(Reserved::Time),
        "π" => Some(Reserved::Pi),
        "δ" => Some(Reserved::PointSource),
        _ if Section::from_word(name).is_some() => Some(Reserved::SectionWord),
        _ if Function::from_name(name).is_some() || SPECIAL_FUNCTIONS.contains(&name) => {
            Some(Reserved::Function)
        }
        _ => None,
    }
}

/// The canonical spelling of a name: subscript digits are written `_0`, so that `u₀` and `u_0` are one name.
pub fn canonical(name: &str) -> String {
    let mut spelled = String::with_capacity(name.len());
    for letter in name.chars() {
        match subscript_digit(letter) {
            None => spelled.push(letter),
            Some(digit) => {
                let opens = !spelled.ends_with('_') && !spelled.ends_with(LOWERED);
                if opens {
                    spelled.push('_');
                }
                // Marks that the digit was lowered, until the name is complete.
                spelled.push(digit);
                spelled.push(LOWERED);
            }
        }
    }
    spelled.replace(LOWERED, "")
}

/// A character that no name holds.
const LOWERED: char = '\u{0}';

fn subscript_digit(letter: char) -> Option<char> {
    let offset = u32::from(letter).checked_sub(u32::from('₀'))?;
    char::from_digit(offset, 10)
}

/// What `u_xx`, `u_t` or `du` over `dx` likely meant: a derivative of a declared field by axes or time.
///
/// The result is `∂²u/∂x²`, or nothing if the name is not made so.
pub fn subscript_derivative(
    name: &str,
    is_field: impl Fn(&str) -> bool,
    is_axis: impl Fn(&str) -> bool,
) -> Option<String> {
    let (field, index) = name.rsplit_once('_')?;
    if index.is_empty() || !is_field(field) {
        return None;
    }
    let mut variables: Vec<(String, usize)> = Vec::new();
    for letter in index.chars() {
        let variable = letter.to_string();
        if variable != "t" && !is_axis(&variable) {
            return None;
        }
        match variables.last_mut() {
            Some((last, power)) if *last == variable => *power += 1,
            _ => variables.push((variable, 1)),
        }
    }
    let order: usize = variables.iter().map(|(_, power)| power).sum();
    let below: String =
        variables.iter().map(|(variable, power)| format!("∂{variable}{}", raised(*power))).collect();
    Some(format!("∂{}{field}/{below}", raised(order)))
}

/// A whole number as superscripts; nothing for 1.
pub(super) fn raised(number: usize) -> String {
    if number == 1 {
        return String::new();
    }
    number.to_string().chars().map(raised_digit).collect()
}

/// A digit as a superscript.
pub(super) fn raised_digit(digit: char) -> char {
    match digit {
        '1' => '¹',
        '2' => '²',
        '3' => '³',
        '0' => '⁰',
        _ => char::from_u32(u32::from('⁰') + u32::from(digit) - u32::from('0')).unwrap_or(digit),
    }
}

/// The whole number that superscripts spell; nothing if there are none or too many.
pub(super) fn lowered(superscripts: &str) -> Option<i64> {
    let plain: String = superscripts
        .chars()
        .filter_map(|letter| {
            Some(match letter {
                '⁻' => '-',
                '⁺' => return None,
                '¹' => '1',
                '²' => '2',
                '³' => '3',
                '⁰' => '0',
                _ => char::from_digit(u32::from(letter).checked_sub(u32::from('⁰'))?, 10)?,
            })
        })
        .collect();
    plain.parse().ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn subscript_digits_have_one_spelling() {
        for (written, name) in [
            ("u₀", "u_0"),
            ("u_0", "u_0"),
            ("u₁₂", "u_12"),
            ("T_room", "T_room"),
            ("u_₀", "u_0"),
            ("a₁b₂", "a_1b_2"),
        ] {
            assert_eq!(canonical(written), name);
        }
    }

    #[test]
    fn what_means_something_cannot_be_declared() {
        assert_eq!(reserved("t"), Some(Reserved::Time));
        assert_eq!(reserved("axes"), Some(Reserved::SectionWord));
        assert_eq!(reserved("cases"), Some(Reserved::Function));
        for free in ["order", "step", "at", "low", "s", "x", "tt"] {
            assert_eq!(reserved(free), None, "{free}");
        }
    }

    #[test]
    fn index_notation_is_recognised() {
        let read = |name| {
            subscript_derivative(
                name,
                |field| ["u", "T_a"].contains(&field),
                |axis| ["x", "y"].contains(&axis),
            )
        };
        assert_eq!(read("u_xx").as_deref(), Some("∂²u/∂x²"));
        assert_eq!(read("u_xy").as_deref(), Some("∂²u/∂x∂y"));
        assert_eq!(read("T_a_t").as_deref(), Some("∂T_a/∂t"));
        assert_eq!(read("u_0"), None);
        assert_eq!(read("v_x"), None);
    }

    #[test]
    fn superscripts_are_read_and_written() {
        assert_eq!(raised(12), "¹²");
        assert_eq!(lowered("⁻²"), Some(-2));
        assert_eq!(lowered("⁴⁰"), Some(40));
    }
}
