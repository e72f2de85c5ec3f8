//! [`Stencil`]: weights on nodes that approximate a derivative at a point, with their exact order.
//!
//! Holds the moment conditions and the leading error. It does not derive weights (see
//! [`crate::discretize::interior`]).

use std::fmt;

use num_bigint::BigInt;
use num_traits::Zero;

use crate::exact::matrix::{common_denominator, scaled};
use crate::exact::{Rational, factorial};

/// Σ wⱼ f(xⱼ) ≈ f⁽ᵈ⁾(at) at unit spacing, proved exact on polynomials up to the stated degree.
///
/// With spacing `h`: Σ wⱼ f(xⱼ h) / hᵈ ≈ f⁽ᵈ⁾(at · h).
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Stencil {
    nodes: Vec<Rational>,
    at: Rational,
    derivative: usize,
    weights: Vec<Rational>,
    order: usize,
    error: Option<LeadingError>,
}

/// The leading term of approximation minus exact value: `coefficient · f^(derivative) · h^power`.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct LeadingError {
    /// The exact factor.
    pub coefficient: Rational,
    /// Which derivative of the function it multiplies.
    pub derivative: usize,
    /// The power of the spacing.
    pub power: usize,
}

/// Why weights are not the stencil that they are said to be.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum StencilFault {
    /// No nodes at all.
    NoNodes,
    /// The number of weights is not the number of nodes.
    UnequalLengths { nodes: usize, weights: usize },
    /// Nodes are not strictly increasing at this index.
    NotIncreasing { index: usize },
    /// Σ wⱼ (xⱼ − at)ᵐ at this degree m is neither m! for the derivative itself nor nought below the order.
    Moment { degree: usize, found: Box<Rational> },
}

impl Stencil {
    /// Checks that the weights approximate the derivative to at least the claimed order, and finds the exact
    /// order and leading error.
    ///
    /// The moment conditions are Σ wⱼ (xⱼ − at)ᵐ = m! δ(m, derivative) for all m < derivative + order.
    pub fn new(
        nodes: Vec<Rational>,
        at: Rational,
        derivative: usize,
        weights: Vec<Rational>,
        claimed_order: usize,
    ) -> Result<Stencil, StencilFault> {
        if nodes.is_empty() {
            return Err(StencilFault::NoNodes);
        }
        if nodes.len() != weights.len() {
            return Err(StencilFault::UnequalLengths { nodes: nodes.len(), weights: weights.len() });
        }
        if let Some(index) = (1..nodes.len()).find(|&index| nodes[index - 1] >= nodes[index]) {
            return Err(StencilFault::NotIncreasing { index });
        }
        let mut moments = Moments::new(&nodes, &at, &weights);
        // n nodes away from the point cannot satisfy n further homogeneous conditions unless all weights
        // are nought (Vandermonde), so a stencil that passes them all is the function value itself.
        let certainly_decided = derivative + nodes.len().max(claimed_order) + 1;
        let mut first_failing = None;
        for degree in 0..=certainly_decided {
            let found = moments.next_moment();
            let needed = if degree == derivative { factorial(degree) } else { Rational::zero() };
            if found != needed {
                if degree < derivative + claimed_order.max(1) {
                    return Err(StencilFault::Moment { degree, found: Box::new(found) });
                }
                first_failing = Some((degree, found));
                break;
            }
        }
        let error = first_failing.map(|(degree, moment)| LeadingError {
            coefficient: moment / factorial(degree),
            derivative: degree,
            power: degree - derivative,
        });
        let order = error.as_ref().map_or(nodes.len(), |error| error.power);
        Ok(Stencil { nodes, at, derivative, weights, order, error })
    }

    /// The nodes, strictly increasing.
    pub fn nodes(&self) -> &[Rational] {
        &self.nodes
    }

    /// The point at which the derivative is taken.
    pub fn at(&self) -> &Rational {
        &self.at
    }

    /// Which derivative; nought is interpolation.
    pub fn derivative(&self) -> usize {
        self.derivative
    }

    /// The weights, one a node, for unit spacing.
    pub fn weights(&self) -> &[Rational] {
        &self.weights
    }

    /// The exact order of accuracy. For a stencil without error (see [`Stencil::error`]) the number of nodes.
    pub fn order(&self) -> usize {
        self.order
    }

    /// The leading error; nothing where the stencil is the function value at one of its nodes.
    pub fn error(&self) -> Option<&LeadingError> {
        self.error.as_ref()
    }

    /// Offsets of the nodes from the point as integers, if they are all integers.
    pub fn integer_offsets(&self) -> Option<Vec<i64>> {
        self.nodes.iter().map(|node| (node - &self.at).to_i64()).collect()
    }
}

/// The moments Σ wⱼ (xⱼ − at)ᵐ for m = 0, 1, 2, …, summed in integers and reduced once each.
struct Moments {
    offsets: Vec<BigInt>,
    offset_scale: BigInt,
    terms: Vec<BigInt>,
    term_scale: BigInt,
}

impl Moments {
    fn new(nodes: &[Rational], at: &Rational, weights: &[Rational]) -> Moments {
        let offsets: Vec<Rational> = nodes.iter().map(|node| node - at).collect();
        let offset_scale = common_denominator(&offsets);
        let term_scale = common_denominator(weights);
        Moments {
            offsets: offsets.iter().map(|offset| scaled(offset, &offset_scale)).collect(),
            terms: weights.iter().map(|weight| scaled(weight, &term_scale)).collect(),
            offset_scale,
            term_scale,
        }
    }

    /// The moment of the next degree, from nought on.
    fn next_moment(&mut self) -> Rational {
        let sum: BigInt = self.terms.iter().sum();
        let moment = if sum.is_zero() {
            Rational::zero()
        } else {
            Rational::new(sum, self.term_scale.clone()).expect("common denominators are positive")
        };
        for (term, offset) in self.terms.iter_mut().zip(&self.offsets) {
            *term *= offset;
        }
        self.term_scale *= &self.offset_scale;
        moment
    }
}

impl fmt::Display for StencilFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            StencilFault::NoNodes => formatter.write_str("a stencil needs at least one node"),
            StencilFault::UnequalLengths { nodes, weights } => {
                write!(formatter, "{nodes} nodes but {weights} weights")
            }
            StencilFault::NotIncreasing { index } => {
                write!(formatter, "node {} is not to the right of the one before it", index + 1)
            }
            StencilFault::Moment { degree, found } => write!(
                formatter,
                "the weights applied to the monomial of degree {degree} give {found}, which the claimed order rules out"
            ),
        }
    }
}

impl std::error::Error for StencilFault {}

#[cfg(test)]
mod tests {
    use super::*;

    fn rationals(values: &[i64]) -> Vec<Rational> {
        values.iter().map(|&value| value.into()).collect()
    }

    #[test]
    fn the_order_and_the_error_are_found_not_believed() {
        let stencil = Stencil::new(rationals(&[-1, 0, 1]), Rational::zero(), 2, rationals(&[1, -2, 1]), 1)
            .expect("true");
        assert_eq!(stencil.order(), 2);
        let error = stencil.error().expect("not exact");
        assert_eq!((error.coefficient.to_string().as_str(), error.derivative, error.power), ("1/12", 4, 2));
    }

    #[test]
    fn wrong_weights_and_wrong_claims_are_refused() {
        let nodes = rationals(&[-1, 0, 1]);
        let tampered = Stencil::new(nodes.clone(), Rational::zero(), 2, rationals(&[1, -2, 2]), 1);
        assert!(matches!(tampered, Err(StencilFault::Moment { degree: 0, .. })));
        let overstated = Stencil::new(nodes.clone(), Rational::zero(), 2, rationals(&[1, -2, 1]), 3);
        assert!(matches!(overstated, Err(StencilFault::Moment { degree: 4, .. })));
        let wrong_scale = Stencil::new(nodes, Rational::zero(), 2, rationals(&[2, -4, 2]), 0);
        assert!(matches!(wrong_scale, Err(StencilFault::Moment { degree: 2, .. })));
    }

    #[test]
    fn shapes_are_checked() {
        let zero = Rational::zero;
        assert_eq!(Stencil::new(vec![], zero(), 1, vec![], 1), Err(StencilFault::NoNodes));
        let repeated = Stencil::new(rationals(&[0, 0]), zero(), 1, rationals(&[-1, 1]), 1);
        assert_eq!(repeated, Err(StencilFault::NotIncreasing { index: 1 }));
        let short = Stencil::new(rationals(&[0, 1]), zero(), 1, rationals(&[-1]), 1);
        assert_eq!(short, Err(StencilFault::UnequalLengths { nodes: 2, weights: 1 }));
    }

    #[test]
    fn the_value_at_a_node_has_no_error() {
        let stencil =
            Stencil::new(rationals(&[0, 1]), Rational::zero(), 0, rationals(&[1, 0]), 2).expect("true");
        assert_eq!(stencil.error(), None);
        assert_eq!(stencil.order(), 2);
    }
}
