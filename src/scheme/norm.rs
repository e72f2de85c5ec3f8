//! [`Norm`]: the diagonal norm (quadrature weights) in which an operator keeps an energy.
//!
//! Holds positivity and consistency. What the norm does for an operator is said by
//! [`super::summation_by_parts`] and [`super::second_derivative`].

use std::fmt;

use crate::exact::Rational;

/// Diagonal weights on nodes 0, …, n − 1 at unit spacing: `left` at the left end, its mirror image at the
/// right end, one between. All are positive and they sum to the length n − 1 (to n on a periodic axis and for
/// half points).
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Norm {
    left: Vec<Rational>,
}

/// Why weights are not a norm.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum NormFault {
    /// A weight is nought or negative.
    NotPositive { index: usize },
    /// The weights of one end do not sum to the length they stand for: their number less one half for
    /// nodes, their number for half points.
    WrongTotal { found: Box<Rational> },
}

impl Norm {
    /// The norm of an axis with two ends, from its left weights.
    pub fn bounded(left: Vec<Rational>) -> Result<Norm, NormFault> {
        let total = Rational::from(left.len() as i64) - Rational::ratio(1, 2);
        Norm::checked(left, &total)
    }

    fn checked(left: Vec<Rational>, needed: &Rational) -> Result<Norm, NormFault> {
        if let Some(index) = left.iter().position(|weight| !weight.is_positive()) {
            return Err(NormFault::NotPositive { index });
        }
        let total: Rational = left.iter().sum();
        if total != *needed {
            return Err(NormFault::WrongTotal { found: Box::new(total) });
        }
        Ok(Norm { left })
    }

    /// The norm of the half points 1/2, 3/2, … of an axis with two ends, from its left weights: they sum to
    /// their number.
    pub fn halfway(left: Vec<Rational>) -> Result<Norm, NormFault> {
        let total = Rational::from(left.len() as i64);
        Norm::checked(left, &total)
    }

    /// The norm of a periodic axis: one everywhere.
    pub fn periodic() -> Norm {
        Norm { left: Vec::new() }
    }

    /// The weights at the left end that may differ from one; empty on a periodic axis.
    pub fn left(&self) -> &[Rational] {
        &self.left
    }

    /// The weight of node `index` of `nodes`.
    pub fn weight(&self, index: usize, nodes: usize) -> Rational {
        let from_right = nodes.saturating_sub(1).saturating_sub(index);
        self.left.get(index.min(from_right)).cloned().unwrap_or_else(Rational::one)
    }
}

impl fmt::Display for NormFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            NormFault::NotPositive { index } => write!(formatter, "norm weight {index} is not positive"),
            NormFault::WrongTotal { found } => {
                write!(formatter, "the norm weights of one end sum to {found}: lengths are not kept")
            }
        }
    }
}

impl std::error::Error for NormFault {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_positive_weights_of_the_right_sum_are_a_norm() {
        let trapezium = Norm::bounded(vec![Rational::ratio(1, 2)]).expect("a norm");
        assert_eq!(trapezium.weight(0, 5), Rational::ratio(1, 2));
        assert_eq!(trapezium.weight(4, 5), Rational::ratio(1, 2));
        assert_eq!(trapezium.weight(2, 5), Rational::one());
        assert!(matches!(Norm::bounded(vec![Rational::ratio(1, 3)]), Err(NormFault::WrongTotal { .. })));
        let negative = vec![Rational::ratio(-1, 2), Rational::from(2)];
        assert_eq!(Norm::bounded(negative), Err(NormFault::NotPositive { index: 0 }));
        assert!(Norm::bounded(Vec::new()).is_err());
    }
}
