//! Interior stencils: weights for any nodes, and the centred, biased and half-way families.
//!
//! Weights are derivatives of the nodes' Lagrange polynomials, in exact rationals. Closures at walls are in [`super::closure`].

use std::fmt;

use num_bigint::BigInt;

use crate::exact::matrix::{common_denominator, scaled};
use crate::exact::{Rational, factorial};
use crate::scheme::{Stencil, StencilFault};

/// What one request may ask for, so that an answer always comes within a second.
pub struct LargestRequest;

impl LargestRequest {
    /// Most nodes of one stencil.
    pub const NODES: usize = 64;
    /// Highest derivative.
    pub const DERIVATIVE: usize = 32;
    /// Highest order of a family.
    pub const ORDER: usize = 32;
    /// Highest order of the centred family for unbounded use in operators.
    pub const CENTRED_ORDER: usize = 16;
}

/// Why there are no such weights.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum WeightsFault {
    /// Fewer nodes than the derivative needs.
    TooFewNodes { given: usize, needed: usize },
    /// More nodes than [`LargestRequest::NODES`].
    TooManyNodes { given: usize, most: usize },
    /// A derivative beyond [`LargestRequest::DERIVATIVE`].
    DerivativeTooHigh { given: usize, highest: usize },
    /// An order that the family does not have.
    OrderNotAvailable { given: usize, available: Vec<usize> },
    /// A node given twice.
    RepeatedNode { node: Rational },
    /// The derived weights failed their check: a fault of this program.
    Refused(StencilFault),
}

/// The weights of the best approximation of a derivative at `at` on the given nodes (any sequence; they are
/// put into ascending order).
pub fn weights(nodes: &[Rational], at: &Rational, derivative: usize) -> Result<Stencil, WeightsFault> {
    if nodes.len() > LargestRequest::NODES {
        return Err(WeightsFault::TooManyNodes { given: nodes.len(), most: LargestRequest::NODES });
    }
    if derivative > LargestRequest::DERIVATIVE {
        let highest = LargestRequest::DERIVATIVE;
        return Err(WeightsFault::DerivativeTooHigh { given: derivative, highest });
    }
    if nodes.len() < derivative + 1 {
        return Err(WeightsFault::TooFewNodes { given: nodes.len(), needed: derivative + 1 });
    }
    let mut nodes = nodes.to_vec();
    nodes.sort();
    if let Some(pair) = nodes.windows(2).find(|pair| pair[0] == pair[1]) {
        return Err(WeightsFault::RepeatedNode { node: pair[0].clone() });
    }
    let weights = lagrange_derivative(&nodes, at, derivative);
    let order = nodes.len() - derivative;
    Stencil::new(nodes, at.clone(), derivative, weights, order).map_err(WeightsFault::Refused)
}

/// The derivative at `at` of each Lagrange polynomial Π_{k≠j} (x − x_k)/(x_j − x_k) of the nodes.
///
/// With distances from `at` as integers X over a common denominator, the derivative is d! times a
/// coefficient of the numerator, which is Π (X − X_k) divided by one of its factors: integers all through.
fn lagrange_derivative(nodes: &[Rational], at: &Rational, derivative: usize) -> Vec<Rational> {
    let distances: Vec<Rational> = nodes.iter().map(|node| node - at).collect();
    let scale = common_denominator(&distances);
    let places: Vec<BigInt> = distances.iter().map(|distance| scaled(distance, &scale)).collect();
    // Coefficients of Π (X − X_k), the highest first.
    let mut product = vec![BigInt::from(1)];
    for place in &places {
        product.push(BigInt::from(0));
        for index in (1..product.len()).rev() {
            let lowered = &product[index - 1] * place;
            product[index] -= lowered;
        }
    }
    let factor = factorial(derivative).numerator() * scale.pow(derivative as u32);
    let weight = |place: &BigInt| {
        // Horner's scheme divides by (X − X_j); the quotient's coefficient of X^derivative is wanted.
        let wanted = nodes.len() - 1 - derivative;
        let coefficient = product[1..=wanted]
            .iter()
            .fold(product[0].clone(), |above, coefficient| above * place + coefficient);
        let gaps = places.iter().filter(|other| *other != place).map(|other| place - other);
        let denominator: BigInt = gaps.product();
        Rational::new(coefficient * &factor, denominator).expect("the nodes differ")
    };
    places.iter().map(weight).collect()
}

/// The centred stencil on integer nodes for derivatives 1 to 4 and even orders up to 16.
pub fn centred(derivative: usize, order: usize) -> Result<Stencil, WeightsFault> {
    let available: Vec<usize> = (2..=LargestRequest::CENTRED_ORDER).step_by(2).collect();
    if !available.contains(&order) {
        return Err(WeightsFault::OrderNotAvailable { given: order, available });
    }
    if !(1..=4).contains(&derivative) {
        return Err(WeightsFault::DerivativeTooHigh { given: derivative, highest: 4 });
    }
    let radius = derivative.div_ceil(2) - 1 + order / 2;
    weights(&consecutive(Rational::from(-(radius as i64)), 2 * radius + 1), &Rational::zero(), derivative)
}

/// A family of ever larger node sets around the origin.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum NodeFamily {
    /// −r, …, r.
    Centred,
    /// ±1/2, …, ±(r − 1/2).
    Halfway,
    /// −left, …, −left + n − 1 with `left` nodes left of the origin.
    Biased { left: usize },
    /// −left + 1/2, … with `left` half-way nodes left of the origin.
    BiasedHalfway { left: usize },
}

impl NodeFamily {
    /// The family's node set number `size` (from nought), the smallest first.
    fn nodes(self, size: usize) -> Vec<Rational> {
        let half = Rational::ratio(1, 2);
        let leftmost = |count: usize| -Rational::from(count as i64);
        match self {
            NodeFamily::Centred => consecutive(leftmost(size), 2 * size + 1),
            NodeFamily::Halfway => consecutive(leftmost(size + 1) + half, 2 * size + 2),
            NodeFamily::Biased { left } => consecutive(leftmost(left), left + 1 + size),
            NodeFamily::BiasedHalfway { left } => consecutive(leftmost(left) + half, left.max(1) + size),
        }
    }
}

/// The smallest member of a family whose weights reach the order at `at`.
pub fn smallest(
    family: NodeFamily,
    at: &Rational,
    derivative: usize,
    order: usize,
) -> Result<Stencil, WeightsFault> {
    if order == 0 || order > LargestRequest::ORDER {
        let available = (1..=LargestRequest::ORDER).collect();
        return Err(WeightsFault::OrderNotAvailable { given: order, available });
    }
    if derivative > LargestRequest::DERIVATIVE {
        let highest = LargestRequest::DERIVATIVE;
        return Err(WeightsFault::DerivativeTooHigh { given: derivative, highest });
    }
    if let NodeFamily::Biased { left } | NodeFamily::BiasedHalfway { left } = family
        && left >= LargestRequest::NODES
    {
        return Err(WeightsFault::TooManyNodes { given: left, most: LargestRequest::NODES });
    }
    // One or two orders can come free of charge by symmetry or by the choice of the point; a set with
    // `derivative + order` nodes always suffices.
    let mut size = 0;
    loop {
        let nodes = family.nodes(size);
        if nodes.len() + 2 > derivative + order || nodes.len() > LargestRequest::NODES {
            match weights(&nodes, at, derivative) {
                Ok(stencil) if stencil.order() >= order => return Ok(stencil),
                Ok(_) | Err(WeightsFault::TooFewNodes { .. }) => {}
                Err(fault) => return Err(fault),
            }
        }
        size += 1;
    }
}

/// `count` nodes at unit distance from `first` on.
fn consecutive(first: Rational, count: usize) -> Vec<Rational> {
    (0..count).map(|index| &first + Rational::from(index as i64)).collect()
}

impl fmt::Display for WeightsFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            WeightsFault::TooFewNodes { given, needed } => {
                write!(formatter, "{given} nodes are too few: this derivative needs at least {needed}")
            }
            WeightsFault::TooManyNodes { given, most } => {
                write!(formatter, "{given} nodes are too many: one stencil has at most {most}")
            }
            WeightsFault::DerivativeTooHigh { given, highest } => {
                write!(formatter, "derivative {given} is not offered: the highest is {highest}")
            }
            WeightsFault::OrderNotAvailable { given, available } => {
                let listed: Vec<String> = available.iter().map(usize::to_string).collect();
                write!(formatter, "order {given} is not offered: there are {}", listed.join(", "))
            }
            WeightsFault::RepeatedNode { node } => write!(formatter, "node {node} is given twice"),
            WeightsFault::Refused(fault) => {
                write!(formatter, "the derived weights failed their check: {fault}")
            }
        }
    }
}

impl std::error::Error for WeightsFault {}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn centred_weights_equal_the_closed_forms() {
        // c1_k = (−1)^(k+1) p!² / (k (p−k)! (p+k)!), c2_k = 2 c1_k / k: common practice.
        for half in 1..=8_usize {
            let first = centred(1, 2 * half).expect("offered");
            let second = centred(2, 2 * half).expect("offered");
            for k in 1..=half {
                let sign = if k % 2 == 1 { 1 } else { -1 };
                let closed = Rational::from(sign) * factorial(half).power(2)
                    / (Rational::from(k as i64) * factorial(half - k) * factorial(half + k));
                assert_eq!(first.weights()[half + k], closed);
                assert_eq!(second.weights()[half + k], closed * Rational::ratio(2, k as i64));
            }
            assert_eq!((first.order(), second.order()), (2 * half, 2 * half));
        }
    }

    #[test]
    fn families_use_no_node_in_vain() {
        let count = |family, derivative, order| {
            let stencil = smallest(family, &Rational::zero(), derivative, order).expect("offered");
            assert!(stencil.order() >= order);
            stencil.nodes().len()
        };
        assert_eq!(count(NodeFamily::Centred, 2, 2), 3);
        assert_eq!(count(NodeFamily::Centred, 3, 4), 7);
        assert_eq!(count(NodeFamily::Centred, 1, 3), 5);
        assert_eq!(count(NodeFamily::Biased { left: 1 }, 2, 2), 3);
        assert_eq!(count(NodeFamily::Biased { left: 0 }, 2, 2), 4);
        assert_eq!(count(NodeFamily::Biased { left: 4 }, 1, 1), 5);
        assert_eq!(count(NodeFamily::Halfway, 1, 4), 4);
        assert_eq!(count(NodeFamily::BiasedHalfway { left: 1 }, 1, 3), 4);
        let between = smallest(NodeFamily::Centred, &Rational::ratio(1, 3), 1, 4).expect("offered");
        assert_eq!((between.nodes().len(), between.order()), (5, 4));
    }

    #[test]
    fn requests_beyond_the_bounds_are_refused() {
        let line = |count| consecutive(Rational::zero(), count);
        assert!(matches!(weights(&line(65), &Rational::zero(), 1), Err(WeightsFault::TooManyNodes { .. })));
        assert!(matches!(weights(&line(2), &Rational::zero(), 2), Err(WeightsFault::TooFewNodes { .. })));
        assert!(matches!(centred(1, 3), Err(WeightsFault::OrderNotAvailable { .. })));
        assert!(matches!(centred(5, 2), Err(WeightsFault::DerivativeTooHigh { .. })));
        let far = NodeFamily::Biased { left: usize::MAX };
        assert!(matches!(smallest(far, &Rational::zero(), 1, 2), Err(WeightsFault::TooManyNodes { .. })));
        let twice = [Rational::one(), Rational::zero(), Rational::one()];
        assert!(matches!(weights(&twice, &Rational::zero(), 1), Err(WeightsFault::RepeatedNode { .. })));
    }
}
