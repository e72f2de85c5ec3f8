//! Dimensions: exponents of the SI base quantities, exact rationals.

use crate::exact::Rational;
use std::fmt;

/// Symbols of the SI base units, in the order of the exponents.
pub const BASE_UNITS: [&str; 7] = ["m", "kg", "s", "A", "K", "mol", "cd"];

/// Exponents of m, kg, s, A, K, mol, cd. Angles are numbers.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Dimension(pub [Rational; 7]);

impl Dimension {
    /// The dimension of a pure number.
    pub fn one() -> Dimension {
        Dimension(std::array::from_fn(|_| Rational::from(0)))
    }

    /// A base quantity, by its place in `BASE_UNITS`.
    pub fn base(place: usize) -> Dimension {
        Dimension(std::array::from_fn(|index| Rational::from(i64::from(index == place))))
    }

    pub fn time() -> Dimension {
        Dimension::base(2)
    }

    pub fn is_one(&self) -> bool {
        self.0.iter().all(Rational::is_zero)
    }

    pub fn times(&self, other: &Dimension) -> Dimension {
        Dimension(std::array::from_fn(|index| &self.0[index] + &other.0[index]))
    }

    pub fn over(&self, other: &Dimension) -> Dimension {
        Dimension(std::array::from_fn(|index| &self.0[index] - &other.0[index]))
    }

    pub fn power(&self, exponent: &Rational) -> Dimension {
        Dimension(std::array::from_fn(|index| &self.0[index] * exponent))
    }
}

impl fmt::Display for Dimension {
    /// Base units with `·` and superscripts where exponents are whole, `1` for a pure number.
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.is_one() {
            return out.write_str("1");
        }
        let mut first = true;
        for (symbol, exponent) in BASE_UNITS.iter().zip(&self.0) {
            if exponent.is_zero() {
                continue;
            }
            if !first {
                out.write_str("·")?;
            }
            first = false;
            out.write_str(symbol)?;
            if *exponent != Rational::from(1) {
                let text = exponent.to_string();
                if text.contains('/') {
                    write!(out, "^({text})")?;
                } else {
                    out.write_str(&superscript(&text))?;
                }
            }
        }
        Ok(())
    }
}

fn superscript(text: &str) -> String {
    const DIGITS: [char; 10] = ['⁰', '¹', '²', '³', '⁴', '⁵', '⁶', '⁷', '⁸', '⁹'];
    text.chars()
        .map(|letter| match letter.to_digit(10) {
            Some(digit) => DIGITS[digit as usize],
            None => '⁻',
        })
        .collect()
}
