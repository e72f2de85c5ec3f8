//! The only door between rationals and doubles: the nearest double of a rational, and the rational that a
//! double is.
//!
//! Doubles here are IEEE 754 binary64. No decision of the compiler is taken on the far side of this door.

use num_bigint::{BigInt, BigUint, Sign};
use num_integer::Integer;
use num_traits::{ToPrimitive, Zero};

use super::Rational;

/// Binary digits of a double's significand.
const SIGNIFICAND_BITS: i64 = 53;
/// Exponent of the least positive double, 2⁻¹⁰⁷⁴.
const LEAST_EXPONENT: i64 = -1074;
/// What is added to the exponent of the last significand digit to get the stored exponent.
const EXPONENT_BIAS: i64 = 1075;

/// The double nearest to `value`; of two equally near ones that with the even significand.
///
/// Values beyond the largest double by half a unit or more become infinite, values below half of the least
/// positive double become zero of the same sign. Numerator and denominator may each be far outside the range
/// of doubles: the quotient is formed from integers.
pub fn nearest(value: &Rational) -> f64 {
    let negative = value.is_negative();
    let magnitude = nearest_magnitude(value.numerator().magnitude(), value.denominator().magnitude());
    if negative { -magnitude } else { magnitude }
}

fn nearest_magnitude(numerator: &BigUint, denominator: &BigUint) -> f64 {
    if numerator.is_zero() {
        return 0.0;
    }
    let numerator_bits = i64::try_from(numerator.bits()).unwrap_or(i64::MAX / 4);
    let denominator_bits = i64::try_from(denominator.bits()).unwrap_or(i64::MAX / 4);
    let magnitude_bits = numerator_bits - denominator_bits;
    if magnitude_bits > 1026 {
        return f64::INFINITY;
    }
    if magnitude_bits < LEAST_EXPONENT - 2 {
        return 0.0;
    }
    // The quotient below gets 55 or 56 digits: two more than are kept, so that rounding sees a half exactly.
    let shift = SIGNIFICAND_BITS + 2 - magnitude_bits;
    let (quotient, remainder) = if shift >= 0 {
        (numerator << shift.unsigned_abs()).div_rem(denominator)
    } else {
        numerator.div_rem(&(denominator << shift.unsigned_abs()))
    };
    let quotient_bits = i64::try_from(quotient.bits()).unwrap_or(0);
    let quotient = quotient.to_u64().expect("the shift leaves a quotient of at most 56 bits");
    let dropped = (quotient_bits - SIGNIFICAND_BITS).max(LEAST_EXPONENT + shift);
    assemble(round_half_even(quotient, dropped, !remainder.is_zero()), dropped - shift)
}

/// `quotient / 2^dropped` rounded to an integer; `inexact` tells that the true quotient is a little larger.
fn round_half_even(quotient: u64, dropped: i64, inexact: bool) -> u64 {
    if dropped >= 64 {
        return 0;
    }
    let kept = quotient >> dropped;
    let rest = quotient & ((1_u64 << dropped) - 1);
    let half = 1_u64 << (dropped - 1);
    let up = rest > half || (rest == half && (inexact || kept % 2 == 1));
    kept + u64::from(up)
}

/// The double `significand · 2^exponent`, infinite beyond the range. `significand ≤ 2⁵³`.
fn assemble(significand: u64, exponent: i64) -> f64 {
    let hidden = 1_u64 << (SIGNIFICAND_BITS - 1);
    let (significand, exponent) =
        if significand == hidden << 1 { (hidden, exponent + 1) } else { (significand, exponent) };
    if significand < hidden {
        // Only the least exponent leaves a short significand: a subnormal double or zero.
        return f64::from_bits(significand);
    }
    let stored = exponent + EXPONENT_BIAS;
    if stored >= 2047 {
        return f64::INFINITY;
    }
    f64::from_bits((stored.unsigned_abs() << (SIGNIFICAND_BITS - 1)) | (significand - hidden))
}

/// The rational that `value` is, exactly; nothing for infinities and not-a-number.
pub fn from_f64(value: f64) -> Option<Rational> {
    if !value.is_finite() {
        return None;
    }
    let bits = value.to_bits();
    let stored = (bits >> (SIGNIFICAND_BITS - 1)) & 0x7ff;
    let fraction = bits & ((1_u64 << (SIGNIFICAND_BITS - 1)) - 1);
    let (significand, exponent) = if stored == 0 {
        (fraction, LEAST_EXPONENT)
    } else {
        (fraction | 1 << (SIGNIFICAND_BITS - 1), stored as i64 - EXPONENT_BIAS)
    };
    let sign = if value.is_sign_negative() { Sign::Minus } else { Sign::Plus };
    let numerator = BigInt::from_biguint(sign, BigUint::from(significand));
    let power = BigInt::from(1) << exponent.unsigned_abs();
    if exponent < 0 { Rational::new(numerator, power) } else { Some(Rational::from(numerator * power)) }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn read(text: &str) -> Rational {
        text.parse().expect("the test's own literal")
    }

    /// The standard library's correctly rounded decimal reading is the independent judge here.
    fn agrees_with_decimal_reading(text: &str) {
        let judged: f64 = text.parse().expect("the test's own literal");
        let ours = nearest(&read(text));
        assert_eq!(ours.to_bits(), judged.to_bits(), "{text}: {ours:e} against {judged:e}");
    }

    #[test]
    fn the_edges_of_the_range() {
        for text in [
            "0.1",
            "1",
            "-3",
            "1e23",
            "9007199254740993",
            "9007199254740995",
            "9007199254740992.5",
            "1.7976931348623157e308",
            "1.7976931348623158e308",
            "1.7976931348623159e308",
            "1e309",
            "-1e400",
            "4.9e-324",
            "2.4703282292062327e-324",
            "2.4703282292062328e-324",
            "7.4109846876186981e-324",
            "2.2250738585072014e-308",
            "2.2250738585072011e-308",
            "2.225073858507201136057409796709131975934819546351645648023426109724822222021076945516529523908135087914149158913039621106870086438694594645527657207407820621743379988141063267329253552286881372149012981122451451889849057222307285255133155755015914397476397983411801999323962548289017107081850690630666655994938275772572015763062690663332647565300009245888316433037779791869612049497390377829704905051080609940730262937128958950003583799967207254304360284078895771796150945516748243471030702609144621572289880258182545180325707018860872113128079512233426288368622321503775666622503982534335974568884423900265498198385487948292206894721689831099698365846814022854243330660339850886445804001034933970427567186443383770486037861622771738545623065874679014086723327636718751234567890123456789012345678901e-308",
            "1e-400",
            "0.3333333333333333148296162562473909929394721984863281250000001",
        ] {
            agrees_with_decimal_reading(text);
        }
        assert_eq!(nearest(&Rational::ratio(-1, 3)), -1.0 / 3.0);
    }

    #[test]
    fn huge_numerators_and_denominators_do_not_overflow() {
        let huge = Rational::from(7).power(2000);
        let ratio = (&huge + Rational::one()) / (&huge * Rational::from(4));
        assert_eq!(nearest(&ratio), 0.25);
        assert_eq!(nearest(&huge), f64::INFINITY);
        assert_eq!(nearest(&-&huge), f64::NEG_INFINITY);
        assert_eq!(nearest(&huge.recip().expect("not zero")), 0.0);
    }

    #[test]
    fn ties_go_to_even_at_both_ends_of_the_range() {
        let least = from_f64(f64::from_bits(1)).expect("finite");
        assert_eq!(nearest(&(&least * Rational::ratio(1, 2))), 0.0);
        assert_eq!(nearest(&(&least * Rational::ratio(3, 2))).to_bits(), 2);
        let largest = from_f64(f64::MAX).expect("finite");
        let half_unit = Rational::from(2).power(970);
        assert_eq!(nearest(&(&largest + &half_unit)), f64::INFINITY);
        assert_eq!(nearest(&(&largest + &half_unit - Rational::one())), f64::MAX);
    }

    #[test]
    fn what_is_not_finite_is_no_rational() {
        assert_eq!(from_f64(f64::NAN), None);
        assert_eq!(from_f64(f64::INFINITY), None);
        assert_eq!(from_f64(-0.0), Some(Rational::zero()));
    }

    proptest! {
        #[test]
        fn every_finite_double_comes_back(bits: u64) {
            let value = f64::from_bits(bits);
            if let Some(exact) = from_f64(value) {
                prop_assert_eq!(nearest(&exact), value);
            } else {
                prop_assert!(!value.is_finite());
            }
        }

        #[test]
        fn decimals_round_as_the_standard_library_rounds(mantissa: i64, digits: u64, exponent in -345_i32..310) {
            agrees_with_decimal_reading(&format!("{mantissa}{digits}e{exponent}"));
        }

        #[test]
        fn a_nudged_midpoint_goes_to_its_side(bits in 1_u64..0x7fef_ffff_ffff_ffff, up: bool) {
            let (low, high) = (f64::from_bits(bits), f64::from_bits(bits + 1));
            let exact = |value| from_f64(value).expect("finite");
            let middle = (exact(low) + exact(high)) * Rational::ratio(1, 2);
            let nudge = Rational::from(2).power(1200).recip().expect("not zero");
            let even = if bits % 2 == 0 { low } else { high };
            prop_assert_eq!(nearest(&middle), even);
            let (nudged, expected) = if up { (middle + nudge, high) } else { (middle - nudge, low) };
            prop_assert_eq!(nearest(&nudged), expected);
        }
    }
}
