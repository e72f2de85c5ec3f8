//! Numbers as text: the nearest double, printed so that it reads back the same, and its exact fraction for readers.

use super::Language;
use crate::exact::Rational;
use crate::exact::round::nearest;

/// Longest numerator or denominator that a comment shows in full, in digits.
const LONGEST_SHOWN: usize = 60;

/// A double in program text. The shortest decimal that reads back the same is a literal of C and of Rust.
pub fn double(value: f64, language: Language) -> String {
    if value.is_finite() {
        return format!("{value:?}");
    }
    let infinity = match language {
        Language::C => "INFINITY",
        Language::Rust => "f64::INFINITY",
    };
    if value > 0.0 { infinity.to_owned() } else { format!("-{infinity}") }
}

/// The nearest double of an exact number in program text.
pub fn rational(value: &Rational, language: Language) -> String {
    double(nearest(value), language)
}

/// The exact fraction for a comment; parts of more than sixty digits are shortened and their digits counted.
pub fn fraction(value: &Rational) -> String {
    let numerator = shortened(&value.numerator().to_string());
    if value.is_integer() {
        return numerator;
    }
    format!("{numerator}/{}", shortened(&value.denominator().to_string()))
}

fn shortened(digits: &str) -> String {
    let count = digits.trim_start_matches('-').len();
    if count <= LONGEST_SHOWN {
        return digits.to_owned();
    }
    format!("{}…{} ({count} digits)", &digits[..20], &digits[digits.len() - 10..])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn doubles_read_back() {
        for value in [0.1, -2.5, 1e300, 5e-324, 1.0 / 3.0, 0.0] {
            let text = double(value, Language::C);
            assert_eq!(text.parse::<f64>().map(f64::to_bits), Ok(value.to_bits()), "{text}");
            assert!(text.contains(['.', 'e']), "{text} would be an integer");
        }
    }

    #[test]
    fn long_fractions_are_shortened() {
        assert_eq!(fraction(&Rational::ratio(-4, 3)), "-4/3");
        let long = Rational::from(7).power(200);
        assert!(fraction(&long).ends_with("(170 digits)"), "{}", fraction(&long));
    }
}
