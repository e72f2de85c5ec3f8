//! [`Rational`]: fractions of integers of any size, always in lowest terms.
//!
//! Holds arithmetic, reading and printing. It does not hold rounding (see [`super::round`]) or decimals
//! for people (see [`super::decimal`]).

use std::fmt;
use std::iter::Sum;
use std::ops::{Add, AddAssign, Div, Mul, MulAssign, Neg, Sub, SubAssign};
use std::str::FromStr;

use num_bigint::BigInt;
use num_rational::BigRational;
use num_traits::{One, Signed, ToPrimitive, Zero};

/// A fraction of integers of any size, in lowest terms with a positive denominator.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Rational(BigRational);

/// Longest text that [`Rational::from_str`] reads; bounds the work that a hostile input can ask for.
pub const LONGEST_LITERAL: usize = 2_000;
/// Largest decimal exponent in absolute value that [`Rational::from_str`] reads.
pub const LARGEST_EXPONENT: i64 = 1_000;
/// Largest size in bits of a numerator or denominator that [`Rational::pow`] makes.
const LARGEST_POWER_BITS: u64 = 1 << 20;

impl Rational {
    /// Nought.
    pub fn zero() -> Rational {
        Rational(BigRational::zero())
    }

    /// One.
    pub fn one() -> Rational {
        Rational(BigRational::one())
    }

    /// `numerator / denominator`, or nothing if the denominator is zero.
    pub fn new(numerator: impl Into<BigInt>, denominator: impl Into<BigInt>) -> Option<Rational> {
        let denominator = denominator.into();
        if denominator.is_zero() {
            return None;
        }
        Some(Rational(BigRational::new(numerator.into(), denominator)))
    }

    /// `numerator / denominator` for fractions written in this program's own text.
    ///
    /// # Panics
    /// If the denominator is zero: a mistake of the program, never of its input.
    pub fn ratio(numerator: i64, denominator: i64) -> Rational {
        assert!(denominator != 0, "a fraction written in the program has denominator zero");
        Rational(BigRational::new(numerator.into(), denominator.into()))
    }

    /// The numerator in lowest terms; it carries the sign.
    pub fn numerator(&self) -> &BigInt {
        self.0.numer()
    }

    /// The denominator in lowest terms; always positive.
    pub fn denominator(&self) -> &BigInt {
        self.0.denom()
    }

    /// Whether this is nought.
    pub fn is_zero(&self) -> bool {
        self.0.is_zero()
    }

    /// Whether this is one.
    pub fn is_one(&self) -> bool {
        self.0.is_one()
    }

    /// Whether this is above nought.
    pub fn is_positive(&self) -> bool {
        self.0.is_positive()
    }

    /// Whether this is below nought.
    pub fn is_negative(&self) -> bool {
        self.0.is_negative()
    }

    /// Whether the denominator is one.
    pub fn is_integer(&self) -> bool {
        self.0.is_integer()
    }

    /// −1, 0 or 1.
    pub fn sign(&self) -> i32 {
        i32::from(self.is_positive()) - i32::from(self.is_negative())
    }

    /// The absolute value.
    pub fn abs(&self) -> Rational {
        Rational(self.0.abs())
    }

    /// `1 / self`, or nothing for nought.
    pub fn recip(&self) -> Option<Rational> {
        (!self.is_zero()).then(|| Rational(self.0.recip()))
    }

    /// `self / divisor`, or nothing if the divisor is nought.
    pub fn checked_div(&self, divisor: &Rational) -> Option<Rational> {
        (!divisor.is_zero()).then(|| Rational(&self.0 / &divisor.0))
    }

    /// `self` to a whole power. Nothing for a negative power of nought, and nothing where the result would
    /// have more than a million binary digits. `0⁰` is one.
    pub fn pow(&self, exponent: i32) -> Option<Rational> {
        let magnitude = exponent.unsigned_abs();
        let bits = self.numerator().bits().max(self.denominator().bits());
        if (self.is_zero() && exponent < 0) || (bits > 1 && bits * u64::from(magnitude) > LARGEST_POWER_BITS)
        {
            return None;
        }
        let power = self.power(magnitude);
        if exponent < 0 { power.recip() } else { Some(power) }
    }

    /// `self` to a natural power, for small powers within the program. `0⁰` is one.
    pub fn power(&self, exponent: u32) -> Rational {
        // Powers of coprime numbers are coprime, so no reduction is needed.
        Rational(BigRational::new_raw(self.numerator().pow(exponent), self.denominator().pow(exponent)))
    }

    /// The largest integer not above this.
    pub fn floor(&self) -> Rational {
        Rational(self.0.floor())
    }

    /// The nearest integer, halves away from nought.
    pub fn rounded(&self) -> Rational {
        Rational(self.0.round())
    }

    /// The value as an `i64` if it is an integer that fits.
    pub fn to_i64(&self) -> Option<i64> {
        if self.is_integer() { self.numerator().to_i64() } else { None }
    }

    /// Σ aⱼ bⱼ over the common length of both lists.
    pub fn dot<'a>(
        left: impl IntoIterator<Item = &'a Rational>,
        right: impl IntoIterator<Item = &'a Rational>,
    ) -> Rational {
        left.into_iter().zip(right).filter(|(a, b)| !a.is_zero() && !b.is_zero()).map(|(a, b)| a * b).sum()
    }
}

/// `n!`, exactly.
pub fn factorial(n: usize) -> Rational {
    Rational::from((1..=n).fold(BigInt::one(), |product, factor| product * factor))
}

/// The binomial coefficient `n` over `k`, exactly; nought for `k > n`.
pub fn binomial(n: usize, k: usize) -> Rational {
    if k > n {
        return Rational::zero();
    }
    let value = (0..k).fold(BigInt::one(), |product, step| product * (n - step) / (step + 1));
    Rational::from(value)
}

impl From<i64> for Rational {
    fn from(value: i64) -> Rational {
        Rational(BigRational::from_integer(value.into()))
    }
}

impl From<BigInt> for Rational {
    fn from(value: BigInt) -> Rational {
        Rational(BigRational::from_integer(value))
    }
}

impl fmt::Display for Rational {
    /// `p` for an integer, else `p/q`.
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        let text = if self.is_integer() {
            self.numerator().to_string()
        } else {
            format!("{}/{}", self.numerator(), self.denominator())
        };
        formatter.pad(&text)
    }
}

impl fmt::Debug for Rational {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        fmt::Display::fmt(self, formatter)
    }
}

/// Why a text is not a rational number.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum ParseRationalError {
    /// Nothing but blanks.
    Empty,
    /// Not of the form `12`, `-0.5`, `3e-4` or `3/4`.
    NotANumber,
    /// A fraction over nought.
    ZeroDenominator,
    /// Longer than [`LONGEST_LITERAL`] or with an exponent beyond [`LARGEST_EXPONENT`].
    TooLarge,
}

impl fmt::Display for ParseRationalError {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            ParseRationalError::Empty => formatter.write_str("a number is missing"),
            ParseRationalError::NotANumber => {
                formatter.write_str("not a number; write it as 2, -0.5, 1e-3 or 3/4")
            }
            ParseRationalError::ZeroDenominator => formatter.write_str("the denominator is zero"),
            ParseRationalError::TooLarge => write!(
                formatter,
                "too large to be read exactly; exponents go to ±{LARGEST_EXPONENT} and a number has at most {LONGEST_LITERAL} characters"
            ),
        }
    }
}

impl std::error::Error for ParseRationalError {}

impl FromStr for Rational {
    type Err = ParseRationalError;

    /// Reads `12`, `-0.5`, `1e-3` and `3/4` (each part of a fraction may be a decimal), exactly.
    fn from_str(text: &str) -> Result<Rational, ParseRationalError> {
        let text = text.trim();
        if text.is_empty() {
            return Err(ParseRationalError::Empty);
        }
        if text.len() > LONGEST_LITERAL {
            return Err(ParseRationalError::TooLarge);
        }
        match text.split_once('/') {
            None => parse_decimal(text),
            Some((numerator, denominator)) => {
                let numerator = parse_decimal(numerator.trim())?;
                let denominator = parse_decimal(denominator.trim())?;
                numerator.checked_div(&denominator).ok_or(ParseRationalError::ZeroDenominator)
            }
        }
    }
}

/// Reads an optionally signed decimal with an optional exponent.
fn parse_decimal(text: &str) -> Result<Rational, ParseRationalError> {
    let (negative, unsigned) = match text.as_bytes().first() {
        Some(b'-') => (true, &text[1..]),
        Some(b'+') => (false, &text[1..]),
        _ => (false, text),
    };
    let (mantissa, exponent) = match unsigned.split_once(['e', 'E']) {
        None => (unsigned, 0),
        Some((mantissa, exponent)) => (mantissa, parse_exponent(exponent)?),
    };
    let (whole, fraction) = mantissa.split_once('.').unwrap_or((mantissa, ""));
    let digits = format!("{whole}{fraction}");
    if digits.is_empty() || !digits.bytes().all(|byte| byte.is_ascii_digit()) {
        return Err(ParseRationalError::NotANumber);
    }
    let magnitude = BigInt::from_str(&digits).map_err(|_| ParseRationalError::NotANumber)?;
    let scale = exponent - i64::try_from(fraction.len()).map_err(|_| ParseRationalError::TooLarge)?;
    let power_of_ten = BigInt::from(10).pow(scale.unsigned_abs() as u32);
    let value = if scale < 0 {
        Rational(BigRational::new(magnitude, power_of_ten))
    } else {
        Rational::from(magnitude * power_of_ten)
    };
    Ok(if negative { -value } else { value })
}

/// Reads the exponent after `e`, bounded so that `1e999999999` costs nothing.
fn parse_exponent(text: &str) -> Result<i64, ParseRationalError> {
    let digits = text.strip_prefix(['-', '+']).unwrap_or(text);
    if digits.is_empty() || !digits.bytes().all(|byte| byte.is_ascii_digit()) {
        return Err(ParseRationalError::NotANumber);
    }
    match text.parse::<i64>() {
        Ok(exponent) if exponent.abs() <= LARGEST_EXPONENT => Ok(exponent),
        _ => Err(ParseRationalError::TooLarge),
    }
}

/// The four forms (by value and by reference) of one binary operation.
macro_rules! binary_operation {
    ($trait:ident, $method:ident, $operator:tt) => {
        impl $trait<&Rational> for &Rational {
            type Output = Rational;
            fn $method(self, other: &Rational) -> Rational {
                Rational(&self.0 $operator &other.0)
            }
        }
        impl $trait<Rational> for &Rational {
            type Output = Rational;
            fn $method(self, other: Rational) -> Rational {
                Rational(&self.0 $operator other.0)
            }
        }
        impl $trait<&Rational> for Rational {
            type Output = Rational;
            fn $method(self, other: &Rational) -> Rational {
                Rational(self.0 $operator &other.0)
            }
        }
        impl $trait<Rational> for Rational {
            type Output = Rational;
            fn $method(self, other: Rational) -> Rational {
                Rational(self.0 $operator other.0)
            }
        }
    };
}

binary_operation!(Add, add, +);
binary_operation!(Sub, sub, -);
binary_operation!(Mul, mul, *);
// Division by nought panics, as for integers: `checked_div` and `recip` are for values that may be nought.
binary_operation!(Div, div, /);

impl Neg for Rational {
    type Output = Rational;
    fn neg(self) -> Rational {
        Rational(-self.0)
    }
}

impl Neg for &Rational {
    type Output = Rational;
    fn neg(self) -> Rational {
        Rational(-&self.0)
    }
}

impl AddAssign<&Rational> for Rational {
    fn add_assign(&mut self, other: &Rational) {
        self.0 += &other.0;
    }
}

impl AddAssign for Rational {
    fn add_assign(&mut self, other: Rational) {
        self.0 += other.0;
    }
}

impl SubAssign<&Rational> for Rational {
    fn sub_assign(&mut self, other: &Rational) {
        self.0 -= &other.0;
    }
}

impl SubAssign for Rational {
    fn sub_assign(&mut self, other: Rational) {
        self.0 -= other.0;
    }
}

impl MulAssign<&Rational> for Rational {
    fn mul_assign(&mut self, other: &Rational) {
        self.0 *= &other.0;
    }
}

impl Sum for Rational {
    fn sum<I: Iterator<Item = Rational>>(terms: I) -> Rational {
        terms.fold(Rational::zero(), |total, term| total + term)
    }
}

impl<'a> Sum<&'a Rational> for Rational {
    fn sum<I: Iterator<Item = &'a Rational>>(terms: I) -> Rational {
        terms.fold(Rational::zero(), |total, term| total + term)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str) -> Rational {
        text.parse().expect("the test's own literal")
    }

    #[test]
    fn decimals_and_fractions_are_read_exactly() {
        assert_eq!(read("0.1"), Rational::ratio(1, 10));
        assert_eq!(read("1e-3"), Rational::ratio(1, 1000));
        assert_eq!(read("-2.50E2"), Rational::from(-250));
        assert_eq!(read(" 3/4 "), Rational::ratio(3, 4));
        assert_eq!(read("-0.5/1.5"), Rational::ratio(-1, 3));
        assert_eq!(read("+.5"), Rational::ratio(1, 2));
        assert_eq!(read("7."), Rational::from(7));
    }

    #[test]
    fn faults_are_told_apart() {
        use ParseRationalError::{Empty, NotANumber, TooLarge, ZeroDenominator};
        for (text, fault) in [
            ("", Empty),
            ("  ", Empty),
            (".", NotANumber),
            ("x", NotANumber),
            ("1e", NotANumber),
            ("--1", NotANumber),
            ("1/2/3", NotANumber),
            ("1_000", NotANumber),
            ("٣", NotANumber),
            ("1/0", ZeroDenominator),
            ("1e999999999", TooLarge),
            ("1e-99999999999999999999999", TooLarge),
        ] {
            assert_eq!(text.parse::<Rational>(), Err(fault), "{text}");
        }
        assert_eq!("9".repeat(3000).parse::<Rational>(), Err(TooLarge));
    }

    #[test]
    fn arithmetic_reduces_to_lowest_terms() {
        let sum = Rational::ratio(1, 6) + Rational::ratio(1, 3);
        assert_eq!(sum.to_string(), "1/2");
        assert_eq!((Rational::ratio(2, 4) * Rational::ratio(-4, 2)).to_string(), "-1");
        assert_eq!(Rational::ratio(2, -4), Rational::ratio(-1, 2));
        assert_eq!(&Rational::from(3) / &Rational::from(6), Rational::ratio(1, 2));
        assert!(Rational::new(1, 0).is_none());
        assert!(Rational::zero().recip().is_none());
        assert!(Rational::ratio(1, 3) < Rational::ratio(1, 2));
        assert_eq!(Rational::ratio(-1, 3).sign(), -1);
    }

    #[test]
    fn powers_are_bounded_and_defined() {
        assert_eq!(Rational::ratio(2, 3).pow(-2), Some(Rational::ratio(9, 4)));
        assert_eq!(Rational::zero().pow(0), Some(Rational::one()));
        assert_eq!(Rational::zero().pow(-1), None);
        assert_eq!(Rational::from(2).pow(i32::MAX), None);
        assert_eq!(Rational::from(-1).pow(i32::MIN), Some(Rational::one()));
        assert_eq!(Rational::ratio(-1, 2).pow(-3), Some(Rational::from(-8)));
    }

    #[test]
    fn factorials_and_binomials() {
        assert_eq!(factorial(0), Rational::one());
        assert_eq!(factorial(6), Rational::from(720));
        assert_eq!(binomial(8, 3), Rational::from(56));
        assert_eq!(binomial(3, 4), Rational::zero());
    }
}
