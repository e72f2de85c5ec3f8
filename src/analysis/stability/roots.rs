//! Signs of polynomials with rational coefficients on intervals, by Sturm chains: exact counts of distinct roots.

use crate::exact::{Rational, round};

/// The largest twelve-digit number d with p ≤ 0 on (0, d], for a polynomial with p(0) = 0 that is positive somewhere beyond;
/// nought if p is positive at once.
pub(super) fn first_exit(polynomial: &[Rational]) -> Rational {
    let reduced = without_roots_at_zero(polynomial);
    match (reduced.first(), reduced.last()) {
        (Some(low), Some(high)) if low.is_negative() && high.is_positive() => {}
        _ => return Rational::zero(),
    }
    let chain = Chain::new(&reduced);
    let (mut low, mut high) = (Rational::zero(), bound(&reduced));
    let half = Rational::ratio(1, 2);
    let width = Rational::ratio(1, 1 << 50);
    while &(&high - &low) - &width > Rational::zero() {
        let middle = &(&low + &high) * &half;
        if chain.roots_between(&Rational::zero(), &middle) > 0 { high = middle } else { low = middle }
    }
    // The root lies in (low, high]. A decimal just above `low` may be the root itself, as for forward Euler.
    let grid = grid_below(&low);
    let below = (&low * &grid).floor();
    let above = &(&below + &Rational::one()) / &grid;
    let open_roots =
        chain.roots_between(&Rational::zero(), &above) - usize::from(value(&reduced, &above).is_zero());
    if open_roots == 0 { above } else { &below / &grid }
}

/// Whether p ≤ 0 on all of [0, 1]: no root within and a negative value, or nothing but touching from below is not told apart
/// from crossing and counts as no.
pub(super) fn never_positive_on_unit_interval(polynomial: &[Rational]) -> bool {
    let trimmed = trimmed(polynomial);
    let (zero, one) = (Rational::zero(), Rational::one());
    let at_ends = [value(&trimmed, &zero), value(&trimmed, &one)];
    if at_ends.iter().any(Rational::is_positive) || trimmed.is_empty() {
        return trimmed.is_empty();
    }
    // A root at an end is where an edge meets the region's boundary; it is counted out.
    let at_one = usize::from(at_ends[1].is_zero());
    Chain::new(&trimmed).roots_between(&zero, &one) == at_one
        && value(&trimmed, &Rational::ratio(1, 2)).is_negative()
}

fn trimmed(polynomial: &[Rational]) -> Vec<Rational> {
    let length = polynomial.iter().rposition(|entry| !entry.is_zero()).map_or(0, |last| last + 1);
    polynomial[..length].to_vec()
}

fn without_roots_at_zero(polynomial: &[Rational]) -> Vec<Rational> {
    let trimmed = trimmed(polynomial);
    let first = trimmed.iter().position(|entry| !entry.is_zero()).unwrap_or(0);
    trimmed[first..].to_vec()
}

/// All roots are below this (Cauchy).
fn bound(polynomial: &[Rational]) -> Rational {
    let Some(leading) = polynomial.last() else { return Rational::one() };
    let ratios = polynomial.iter().filter_map(|entry| entry.abs().checked_div(&leading.abs()));
    let largest = ratios.fold(Rational::zero(), |most, ratio| if ratio > most { ratio } else { most });
    (largest + Rational::one()).floor() + Rational::one()
}

/// 10^k such that `value` times it has twelve digits before the point.
fn grid_below(value: &Rational) -> Rational {
    let digits = round::nearest(value).log10().floor();
    let exponent = (11.0 - digits).clamp(0.0, 30.0) as u32;
    Rational::from(10).power(exponent)
}

fn value(polynomial: &[Rational], at: &Rational) -> Rational {
    polynomial.iter().rev().fold(Rational::zero(), |sum, coefficient| &(&sum * at) + coefficient)
}

/// p, p' and the negated remainders of dividing each by the next, each up to a positive factor.
struct Chain {
    members: Vec<Vec<Rational>>,
}

impl Chain {
    fn new(polynomial: &[Rational]) -> Chain {
        let derivative: Vec<Rational> = polynomial
            .iter()
            .enumerate()
            .skip(1)
            .map(|(power, coefficient)| coefficient * &Rational::from(power as i64))
            .collect();
        let mut members = vec![polynomial.to_vec()];
        let mut next = trimmed(&derivative);
        while !next.is_empty() {
            let remainder = remainder(&members[members.len() - 1], &next);
            members.push(next);
            next = normalized(remainder.iter().map(|entry| -entry).collect());
        }
        Chain { members }
    }

    /// Distinct roots in (low, high].
    fn roots_between(&self, low: &Rational, high: &Rational) -> usize {
        self.changes(low).saturating_sub(self.changes(high))
    }

    fn changes(&self, at: &Rational) -> usize {
        let signs: Vec<i32> =
            self.members.iter().map(|member| value(member, at).sign()).filter(|sign| *sign != 0).collect();
        signs.windows(2).filter(|pair| pair[0] != pair[1]).count()
    }
}

/// Divided by the magnitude of its leading coefficient, which keeps fractions short and signs as they are.
fn normalized(polynomial: Vec<Rational>) -> Vec<Rational> {
    let Some(scale) = polynomial.last().and_then(|leading| leading.abs().recip()) else { return polynomial };
    polynomial.iter().map(|entry| entry * &scale).collect()
}

/// The remainder of dividing by a divisor that is not nought.
fn remainder(dividend: &[Rational], divisor: &[Rational]) -> Vec<Rational> {
    let mut rest = trimmed(dividend);
    let Some(scale) = divisor.last().and_then(Rational::recip) else { return rest };
    while rest.len() >= divisor.len() {
        let shift = rest.len() - divisor.len();
        let factor = &rest[rest.len() - 1] * &scale;
        for (power, coefficient) in divisor.iter().enumerate() {
            rest[shift + power] -= &factor * coefficient;
        }
        rest = trimmed(&rest);
    }
    rest
}

#[cfg(test)]
mod tests {
    use super::*;

    fn whole(coefficients: &[i64]) -> Vec<Rational> {
        coefficients.iter().map(|entry| Rational::from(*entry)).collect()
    }

    /// (x − 1)(x − 2)(x − 4)² has three distinct roots.
    #[test]
    fn distinct_roots_are_counted() {
        let polynomial = whole(&[32, -64, 42, -11, 1]);
        let chain = Chain::new(&polynomial);
        let count = |low, high| chain.roots_between(&Rational::ratio(low, 2), &Rational::ratio(high, 2));
        assert_eq!([count(0, 1), count(0, 2), count(2, 4), count(0, 10), count(5, 10)], [0, 1, 1, 3, 1]);
    }

    #[test]
    fn exits_are_rounded_down_to_twelve_digits() {
        // x² − 2x leaves at 2, x³ − 2x at √2, x² + x at once.
        assert_eq!(first_exit(&whole(&[0, -2, 1])), Rational::from(2));
        assert_eq!(first_exit(&whole(&[0, -2, 0, 1])), Rational::ratio(141_421_356_237, 100_000_000_000));
        assert!(first_exit(&whole(&[0, 1, 1])).is_zero());
    }

    #[test]
    fn signs_on_the_unit_interval() {
        // x² − x vanishes at both ends; (2x − 1)² − 1/9 is positive near them; (x − 1/2)(x − 2) changes sign.
        assert!(never_positive_on_unit_interval(&whole(&[0, -1, 1])));
        assert!(!never_positive_on_unit_interval(&whole(&[8, -36, 36])));
        assert!(!never_positive_on_unit_interval(&whole(&[2, -5, 2])));
        assert!(never_positive_on_unit_interval(&whole(&[-1])));
        assert!(!never_positive_on_unit_interval(&whole(&[1])));
    }
}
