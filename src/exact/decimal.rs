//! Decimals for people: a rational with so many significant digits, rounded exactly.
//!
//! Nothing here passes through a double; program text uses [`super::round`] instead.

use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{Signed, Zero};

use super::Rational;

/// Decimal exponents outside this range are printed with `e`.
const PLAIN_EXPONENTS: std::ops::RangeInclusive<i64> = -5..=16;

/// `value` with `digits` significant digits (at least one), halves to even. Whole numbers that fit are
/// printed whole.
pub fn significant(value: &Rational, digits: usize) -> String {
    let digits = digits.max(1);
    if value.is_zero() {
        return "0".into();
    }
    let sign = if value.is_negative() { "-" } else { "" };
    let (figures, exponent) = scaled(&value.abs(), digits);
    if value.is_integer() && exponent >= 0 && exponent < digits as i64 {
        return value.to_string();
    }
    format!("{sign}{}", placed(&figures, exponent))
}

/// The `digits` leading figures of a positive value and the decimal exponent of the first of them.
fn scaled(value: &Rational, digits: usize) -> (String, i64) {
    // Start from the digit counts (off by at most one) and correct.
    let length = |integer: &BigInt| integer.magnitude().to_string().len() as i64;
    let mut exponent = length(value.numerator()) - length(value.denominator());
    loop {
        let shift = digits as i64 - 1 - exponent;
        let power = BigInt::from(10).pow(shift.unsigned_abs() as u32);
        let (numerator, denominator) = if shift >= 0 {
            (value.numerator() * power, value.denominator().clone())
        } else {
            (value.numerator().clone(), value.denominator() * power)
        };
        let figures = rounded_quotient(&numerator, &denominator).to_string();
        match figures.len().cmp(&digits) {
            std::cmp::Ordering::Equal => return (figures, exponent),
            std::cmp::Ordering::Less => exponent -= 1,
            std::cmp::Ordering::Greater => exponent += 1,
        }
    }
}

/// The integer nearest to a quotient of positive integers, halves to even.
fn rounded_quotient(numerator: &BigInt, denominator: &BigInt) -> BigInt {
    let (quotient, remainder) = numerator.div_rem(denominator);
    let excess: BigInt = remainder * 2 - denominator;
    if excess.is_positive() || (excess.is_zero() && quotient.is_odd()) { quotient + 1 } else { quotient }
}

/// Puts the decimal point into the figures.
fn placed(figures: &str, exponent: i64) -> String {
    if !PLAIN_EXPONENTS.contains(&exponent) {
        let (first, rest) = figures.split_at(1);
        let point = if rest.is_empty() { "" } else { "." };
        return format!("{first}{point}{rest}e{exponent}");
    }
    if exponent < 0 {
        return format!("0.{}{figures}", "0".repeat((-exponent - 1).unsigned_abs() as usize));
    }
    let whole = exponent.unsigned_abs() as usize + 1;
    if whole >= figures.len() {
        return format!("{figures}{}", "0".repeat(whole - figures.len()));
    }
    let (whole, fraction) = figures.split_at(whole);
    format!("{whole}.{fraction}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn seventeen_digits_of_common_weights() {
        let shown = |numerator, denominator| significant(&Rational::ratio(numerator, denominator), 17);
        assert_eq!(shown(-1, 12), "-0.083333333333333333");
        assert_eq!(shown(2, 3), "0.66666666666666667");
        assert_eq!(shown(-5, 2), "-2.5000000000000000");
        assert_eq!(shown(-24, 17), "-1.4117647058823529");
        assert_eq!(shown(7, 1), "7");
        assert_eq!(shown(0, 1), "0");
        assert_eq!(shown(1, 300_000_000), "3.3333333333333333e-9");
    }

    #[test]
    fn rounding_can_carry_into_a_new_digit() {
        assert_eq!(significant(&Rational::ratio(9999, 1000), 3), "10.0");
        assert_eq!(significant(&Rational::ratio(25, 10), 1), "2");
        assert_eq!(significant(&Rational::from(10).power(30), 4), "1.000e30");
    }
}
