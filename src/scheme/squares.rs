//! [`SumOfSquares`]: a quadratic form written as a sum of squares with non-negative weights, the certificate
//! that it is positive semidefinite for every non-negative coefficient.
//!
//! M(b) = Σ_r (Σ_m β_{r,m} b_m) f_r f_rᵀ with every β_{r,m} ≥ 0. Holds the terms and their signs; what M
//! approximates is in [`super::second_derivative`].

use std::fmt;

use crate::exact::Rational;

/// One square: weight(b) · (functional · u)². Entries are (node, factor), nodes ascending.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct SquareTerm {
    /// The functional f on the nodal values u.
    pub functional: Vec<(usize, Rational)>,
    /// The weight as a combination of the nodal coefficients b, no factor negative.
    pub weight: Vec<(usize, Rational)>,
}

/// A square repeated along the axis: at each anchor a, the offsets are taken from a.
///
/// Anchors run from `first` on; the last one is such that the family is its own mirror image.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct RepeatedSquare {
    /// The functional f as (offset, factor), offsets ascending.
    pub functional: Vec<(i64, Rational)>,
    /// The weight as (offset, factor), no factor negative.
    pub weight: Vec<(i64, Rational)>,
    /// The first anchor from the left end. Of no meaning on a periodic axis.
    pub first: i64,
}

/// A sum of squares on an axis: terms at the left end, their mirror images, and repeated terms between.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct SumOfSquares {
    left: Vec<SquareTerm>,
    repeated: Vec<RepeatedSquare>,
    bounded: bool,
}

/// Why terms are not a certificate.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum SquaresFault {
    /// A weight has a negative factor: the form could be negative for some b ≥ 0.
    NegativeWeight { term: usize, factor: Box<Rational> },
    /// A functional or a weight is empty or its nodes are not ascending.
    Malformed { term: usize },
    /// A functional does not vanish on constants.
    ConstantNotAnnihilated { term: usize },
    /// A repeated term is not its own mirror image (up to the sign of its functional).
    NotMirrorSymmetric { term: usize },
    /// A repeated term reaches over the left end.
    OverTheEnd { term: usize },
}

impl SumOfSquares {
    /// A certificate on an axis with two ends. In faults, terms are counted through `left`, then `repeated`.
    pub fn bounded(
        left: Vec<SquareTerm>,
        repeated: Vec<RepeatedSquare>,
    ) -> Result<SumOfSquares, SquaresFault> {
        for (term, square) in left.iter().enumerate() {
            check_entries(term, &square.functional, &square.weight)?;
        }
        for (index, square) in repeated.iter().enumerate() {
            let term = left.len() + index;
            check_repeated(term, square)?;
            if square.first + square.lowest() < 0 {
                return Err(SquaresFault::OverTheEnd { term });
            }
        }
        Ok(SumOfSquares { left, repeated, bounded: true })
    }

    /// A certificate on a periodic axis.
    pub fn periodic(repeated: Vec<RepeatedSquare>) -> Result<SumOfSquares, SquaresFault> {
        for (term, square) in repeated.iter().enumerate() {
            check_repeated(term, square)?;
        }
        Ok(SumOfSquares { left: Vec::new(), repeated, bounded: false })
    }

    /// The terms at the left end.
    pub fn left(&self) -> &[SquareTerm] {
        &self.left
    }

    /// The repeated terms.
    pub fn repeated(&self) -> &[RepeatedSquare] {
        &self.repeated
    }

    /// Whether the axis is periodic.
    pub fn is_periodic(&self) -> bool {
        !self.bounded
    }

    /// The least number of nodes on which the terms exist and both ends leave the same repeated terms out.
    pub fn minimum_nodes(&self) -> usize {
        let widest = self.left.iter().map(SquareTerm::end);
        let families = self.repeated.iter().map(|square| {
            let least = if self.bounded {
                2 * square.first + square.lowest() + square.highest()
            } else {
                square.highest() - square.lowest() + 1
            };
            least.max(1).unsigned_abs() as usize
        });
        widest.chain(families).max().unwrap_or(1)
    }

    /// How many nodes from the left end on are touched by a left term or miss a repeated one.
    pub fn affected_nodes(&self) -> usize {
        if !self.bounded {
            return 0;
        }
        let missing = self
            .repeated
            .iter()
            .map(|square| (square.first + square.highest()).max(0).unsigned_abs() as usize);
        self.left.iter().map(SquareTerm::end).chain(missing).max().unwrap_or(0)
    }

    /// All terms on `nodes` nodes, or nothing if there are too few. On a periodic axis nodes are wrapped and
    /// may be out of order.
    pub fn terms(&self, nodes: usize) -> Option<Vec<SquareTerm>> {
        if nodes < self.minimum_nodes() {
            return None;
        }
        let last_node = nodes as i64 - 1;
        let mut terms = self.left.clone();
        terms.extend(self.left.iter().map(|term| term.mirrored(nodes)));
        for square in &self.repeated {
            let anchors = if self.bounded {
                square.first..=last_node - square.first - square.lowest() - square.highest()
            } else {
                0..=last_node
            };
            terms.extend(anchors.map(|anchor| square.placed(anchor, nodes)));
        }
        Some(terms)
    }
}

impl SquareTerm {
    /// The node behind the last one of functional and weight.
    fn end(&self) -> usize {
        let last = |entries: &[(usize, Rational)]| entries.last().map_or(0, |(node, _)| node + 1);
        last(&self.functional).max(last(&self.weight))
    }

    /// The term at the other end of `nodes` nodes.
    fn mirrored(&self, nodes: usize) -> SquareTerm {
        let mirror = |entries: &[(usize, Rational)]| {
            entries.iter().rev().map(|(node, factor)| (nodes - 1 - node, factor.clone())).collect()
        };
        SquareTerm { functional: mirror(&self.functional), weight: mirror(&self.weight) }
    }
}

impl RepeatedSquare {
    /// The leftmost offset of functional and weight.
    pub fn lowest(&self) -> i64 {
        self.functional.iter().chain(&self.weight).map(|(offset, _)| *offset).min().unwrap_or(0)
    }

    /// The rightmost offset of functional and weight.
    pub fn highest(&self) -> i64 {
        self.functional.iter().chain(&self.weight).map(|(offset, _)| *offset).max().unwrap_or(0)
    }

    /// The term at one anchor, nodes taken modulo `nodes`.
    fn placed(&self, anchor: i64, nodes: usize) -> SquareTerm {
        let place = |entries: &[(i64, Rational)]| {
            let wrapped = |offset: i64| (anchor + offset).rem_euclid(nodes as i64).unsigned_abs() as usize;
            entries.iter().map(|(offset, factor)| (wrapped(*offset), factor.clone())).collect()
        };
        SquareTerm { functional: place(&self.functional), weight: place(&self.weight) }
    }
}

fn check_repeated(term: usize, square: &RepeatedSquare) -> Result<(), SquaresFault> {
    check_entries(term, &square.functional, &square.weight)?;
    let turn = square.lowest() + square.highest();
    let mirrors = |entries: &[(i64, Rational)], sign: i64| {
        let sign = Rational::from(sign);
        entries.iter().zip(entries.iter().rev()).all(|((offset, factor), (mirrored, counterpart))| {
            offset + mirrored == turn && *factor == counterpart * &sign
        })
    };
    let functional = mirrors(&square.functional, 1) || mirrors(&square.functional, -1);
    if functional && mirrors(&square.weight, 1) {
        Ok(())
    } else {
        Err(SquaresFault::NotMirrorSymmetric { term })
    }
}

fn check_entries<Node: Ord>(
    term: usize,
    functional: &[(Node, Rational)],
    weight: &[(Node, Rational)],
) -> Result<(), SquaresFault> {
    let ascending = |entries: &[(Node, Rational)]| {
        !entries.is_empty() && entries.windows(2).all(|pair| pair[0].0 < pair[1].0)
    };
    if !ascending(functional) || !ascending(weight) {
        return Err(SquaresFault::Malformed { term });
    }
    if let Some((_, factor)) = weight.iter().find(|(_, factor)| factor.is_negative()) {
        return Err(SquaresFault::NegativeWeight { term, factor: Box::new(factor.clone()) });
    }
    let total: Rational = functional.iter().map(|(_, factor)| factor).sum();
    if !total.is_zero() {
        return Err(SquaresFault::ConstantNotAnnihilated { term });
    }
    Ok(())
}

impl fmt::Display for SquaresFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            SquaresFault::NegativeWeight { term, factor } => {
                write!(formatter, "square {term} has the negative weight {factor}")
            }
            SquaresFault::Malformed { term } => {
                write!(formatter, "square {term} is empty or its nodes are not ascending")
            }
            SquaresFault::ConstantNotAnnihilated { term } => {
                write!(formatter, "the functional of square {term} does not vanish on constants")
            }
            SquaresFault::NotMirrorSymmetric { term } => {
                write!(formatter, "repeated square {term} is not its own mirror image")
            }
            SquaresFault::OverTheEnd { term } => {
                write!(formatter, "repeated square {term} reaches over the left end")
            }
        }
    }
}

impl std::error::Error for SquaresFault {}

#[cfg(test)]
mod tests {
    use super::*;

    fn difference(weight: &[(i64, Rational)]) -> RepeatedSquare {
        let functional = vec![(0, Rational::from(-1)), (1, Rational::one())];
        RepeatedSquare { functional, weight: weight.to_vec(), first: 0 }
    }

    #[test]
    fn repeated_terms_fill_the_axis() {
        let half = Rational::ratio(1, 2);
        let square = difference(&[(0, half.clone()), (1, half)]);
        let bounded = SumOfSquares::bounded(Vec::new(), vec![square.clone()]).expect("a certificate");
        assert_eq!(bounded.terms(5).expect("enough nodes").len(), 4);
        let periodic = SumOfSquares::periodic(vec![square]).expect("a certificate");
        assert_eq!(periodic.terms(5).expect("enough nodes").len(), 5);
        assert_eq!(periodic.terms(1), None);
    }

    #[test]
    fn what_is_no_certificate_is_refused() {
        let negative = difference(&[(0, Rational::ratio(-1, 2)), (1, Rational::ratio(-1, 2))]);
        assert!(matches!(SumOfSquares::periodic(vec![negative]), Err(SquaresFault::NegativeWeight { .. })));
        let skew = difference(&[(0, Rational::one())]);
        assert!(matches!(SumOfSquares::periodic(vec![skew]), Err(SquaresFault::NotMirrorSymmetric { .. })));
        let value = SquareTerm { functional: vec![(0, Rational::one())], weight: vec![(0, Rational::one())] };
        let fault = SumOfSquares::bounded(vec![value], Vec::new());
        assert_eq!(fault, Err(SquaresFault::ConstantNotAnnihilated { term: 0 }));
    }
}
