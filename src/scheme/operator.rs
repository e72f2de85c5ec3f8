//! [`DifferenceOperator`]: a constant-weight operator on a whole axis, interior and ends.
//!
//! Holds which rows there are and that each is exact to its order. Norms and energy are in
//! [`super::summation_by_parts`]; coefficients that vary are in [`super::second_derivative`].

mod mirrored;

use std::fmt;

use num_bigint::BigInt;

use crate::exact::matrix::{common_denominator, scaled};
use crate::exact::{Rational, factorial};

use super::Stencil;

/// Whether the interior weights are odd or even about their centre.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Parity {
    /// w(−k) = −w(k), as in centred odd derivatives.
    Odd,
    /// w(−k) = w(k), as in centred even derivatives.
    Even,
    /// Neither, as in upwind weights.
    None,
}

/// One row near the left end: weights on nodes `first`, `first + 1`, …
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct ClosedRow {
    /// The node of the first weight, counted from the left end.
    pub first: usize,
    /// The weights, on consecutive nodes.
    pub weights: Vec<Rational>,
}

/// What the rows at the very ends approximate.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum EndRows {
    /// The derivative, like every other row.
    Derivative,
    /// The second derivative less (outward normal derivative) / `norm_weight`: the natural flux of the end
    /// is contained in the row, and a condition replaces it. Not by itself a second derivative.
    NaturalFlux {
        /// The norm's weight of the end node.
        norm_weight: Rational,
    },
    /// The derivative of functions that go on beyond each end as their own mirror image, and of no others.
    Mirrored(Extension),
}

/// How a function goes on beyond an end node, reflected at it.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Extension {
    /// u(−x) = u(x): the slope vanishes at the end.
    Even,
    /// u(−x) = −u(x): the value vanishes at the end.
    Odd,
}

/// An operator of constant weights on nodes 0, …, n − 1 at unit spacing.
///
/// The rows at the right end mirror those at the left end, with the sign (−1)^derivative.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct DifferenceOperator {
    interior: Stencil,
    /// Interior weights on consecutive offsets from `-left_reach` on.
    taps: Vec<Rational>,
    left_reach: usize,
    right_reach: usize,
    parity: Parity,
    closure: Option<Closure>,
}

#[derive(Clone, PartialEq, Eq, Debug)]
struct Closure {
    rows: Vec<ClosedRow>,
    order: usize,
    ends: EndRows,
}

/// Why rows are not the operator that they are said to be.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum OperatorFault {
    /// The interior stencil's nodes are not at whole distances from its point.
    InteriorOffNodes,
    /// The interior's order is below the claimed one.
    InteriorOrder { found: usize, claimed: usize },
    /// The interior weights are neither odd nor even as the derivative is, so the right end cannot mirror
    /// the left one.
    NotMirrorable,
    /// Natural fluxes belong to second derivatives with a positive norm weight.
    NoNaturalFlux,
    /// Fewer closed rows than nodes that the interior stencil cannot reach around.
    TooFewRows { given: usize, needed: usize },
    /// A closed row without weights.
    EmptyRow { row: usize },
    /// A closed row fails on the monomial (x − row)^degree; a mirrored one on x^degree.
    Row { row: usize, degree: usize, found: Box<Rational> },
}

impl DifferenceOperator {
    /// An operator on a periodic axis.
    pub fn periodic(interior: Stencil, interior_order: usize) -> Result<DifferenceOperator, OperatorFault> {
        DifferenceOperator::interior_only(interior, interior_order)
    }

    /// An operator on an axis with two ends. `closure` holds the left rows 0, 1, …; each must be exact on
    /// polynomials of degree below derivative + `closure_order`.
    pub fn bounded(
        interior: Stencil,
        interior_order: usize,
        closure: Vec<ClosedRow>,
        closure_order: usize,
    ) -> Result<DifferenceOperator, OperatorFault> {
        DifferenceOperator::closed(interior, interior_order, closure, closure_order, EndRows::Derivative)
    }

    /// As [`DifferenceOperator::bounded`] for a second derivative whose end rows contain the natural flux:
    /// checked is that adding (outward normal derivative) / `norm_weight` to them gives the derivative.
    pub fn bounded_with_natural_flux(
        interior: Stencil,
        interior_order: usize,
        closure: Vec<ClosedRow>,
        closure_order: usize,
        norm_weight: Rational,
    ) -> Result<DifferenceOperator, OperatorFault> {
        if interior.derivative() != 2 || !norm_weight.is_positive() {
            return Err(OperatorFault::NoNaturalFlux);
        }
        let ends = EndRows::NaturalFlux { norm_weight };
        DifferenceOperator::closed(interior, interior_order, closure, closure_order, ends)
    }

    fn closed(
        interior: Stencil,
        interior_order: usize,
        rows: Vec<ClosedRow>,
        order: usize,
        ends: EndRows,
    ) -> Result<DifferenceOperator, OperatorFault> {
        let mut operator = DifferenceOperator::interior_only(interior, interior_order)?;
        let expected = if operator.derivative() % 2 == 1 { Parity::Odd } else { Parity::Even };
        if operator.parity != expected {
            return Err(OperatorFault::NotMirrorable);
        }
        if rows.len() < operator.left_reach {
            return Err(OperatorFault::TooFewRows { given: rows.len(), needed: operator.left_reach });
        }
        let closure = Closure { rows, order, ends };
        for row in 0..closure.rows.len() {
            closure.check_row(row, operator.derivative())?;
        }
        operator.closure = Some(closure);
        Ok(operator)
    }

    fn interior_only(interior: Stencil, claimed: usize) -> Result<DifferenceOperator, OperatorFault> {
        let offsets = interior.integer_offsets().ok_or(OperatorFault::InteriorOffNodes)?;
        if interior.order() < claimed {
            return Err(OperatorFault::InteriorOrder { found: interior.order(), claimed });
        }
        let leftmost = offsets.iter().copied().fold(0, i64::min);
        let rightmost = offsets.iter().copied().fold(0, i64::max);
        let position = |offset: i64| (offset - leftmost).unsigned_abs() as usize;
        let mut taps = vec![Rational::zero(); position(rightmost) + 1];
        for (&offset, weight) in offsets.iter().zip(interior.weights()) {
            taps[position(offset)] = weight.clone();
        }
        let (left_reach, right_reach) = (position(0), position(rightmost) - position(0));
        let parity = parity(&taps, left_reach == right_reach);
        Ok(DifferenceOperator { interior, taps, left_reach, right_reach, parity, closure: None })
    }

    /// Which derivative.
    pub fn derivative(&self) -> usize {
        self.interior.derivative()
    }

    /// The interior stencil; its nodes are whole offsets.
    pub fn interior(&self) -> &Stencil {
        &self.interior
    }

    /// Interior weights on consecutive offsets from −[`DifferenceOperator::left_reach`] on.
    pub fn taps(&self) -> &[Rational] {
        &self.taps
    }

    /// How many nodes the interior stencil reaches to the left.
    pub fn left_reach(&self) -> usize {
        self.left_reach
    }

    /// How many nodes the interior stencil reaches to the right.
    pub fn right_reach(&self) -> usize {
        self.right_reach
    }

    /// The symmetry of the interior weights.
    pub fn parity(&self) -> Parity {
        self.parity
    }

    /// The order of accuracy away from the ends.
    pub fn interior_order(&self) -> usize {
        self.interior.order()
    }

    /// Whether the axis is periodic.
    pub fn is_periodic(&self) -> bool {
        self.closure.is_none()
    }

    /// The left closed rows; none on a periodic axis.
    pub fn closure(&self) -> &[ClosedRow] {
        self.closure.as_ref().map_or(&[], |closure| &closure.rows)
    }

    /// The order that every closed row reaches; nothing on a periodic axis.
    pub fn closure_order(&self) -> Option<usize> {
        self.closure.as_ref().map(|closure| closure.order)
    }

    /// What the end rows approximate; nothing on a periodic axis.
    pub fn end_rows(&self) -> Option<&EndRows> {
        self.closure.as_ref().map(|closure| &closure.ends)
    }

    /// The least number of nodes for which rows do not collide: closed rows of both ends are apart and fit,
    /// a periodic stencil meets no node twice.
    pub fn minimum_nodes(&self) -> usize {
        match &self.closure {
            None => self.taps.len(),
            Some(closure) => {
                let widest = closure.rows.iter().map(ClosedRow::end).max().unwrap_or(0);
                (2 * closure.rows.len()).max(widest).max(1)
            }
        }
    }

    /// Row `index` on `nodes` nodes: the first column and the weights on consecutive columns. On a periodic
    /// axis columns are to be taken modulo `nodes` and the first may be negative. Nothing if there is no
    /// such row or too few nodes.
    pub fn row(&self, index: usize, nodes: usize) -> Option<(i64, Vec<Rational>)> {
        if index >= nodes || nodes < self.minimum_nodes() {
            return None;
        }
        let from_right = nodes - 1 - index;
        if let Some(row) = self.closure().get(index) {
            return Some((row.first as i64, row.weights.clone()));
        }
        if let Some(row) = self.closure().get(from_right) {
            let mirrored = row.weights.iter().rev();
            let weights = if self.derivative() % 2 == 1 {
                mirrored.map(|weight| -weight).collect()
            } else {
                mirrored.cloned().collect()
            };
            return Some(((nodes - row.end()) as i64, weights));
        }
        Some((index as i64 - self.left_reach as i64, self.taps.clone()))
    }

    /// The operator applied to values at all nodes; nothing if there are too few.
    pub fn apply(&self, values: &[Rational]) -> Option<Vec<Rational>> {
        let nodes = values.len();
        (0..nodes)
            .map(|index| {
                let (first, weights) = self.row(index, nodes)?;
                let columns = (first..).map(|column| column.rem_euclid(nodes as i64).unsigned_abs() as usize);
                Some(weights.iter().zip(columns).map(|(weight, column)| weight * &values[column]).sum())
            })
            .collect()
    }
}

impl ClosedRow {
    /// The node behind the last one.
    pub fn end(&self) -> usize {
        self.first + self.weights.len()
    }
}

impl Closure {
    /// Checks Σ wⱼ (j − row)ᵐ for all m < derivative + order.
    fn check_row(&self, row: usize, derivative: usize) -> Result<(), OperatorFault> {
        let ClosedRow { first, weights } = &self.rows[row];
        if weights.is_empty() {
            return Err(OperatorFault::EmptyRow { row });
        }
        if let EndRows::Mirrored(extension) = self.ends {
            return mirrored::check_row(&self.rows[row], row, derivative, self.order, extension);
        }
        // In integers: reducing a fraction at every step would cost more than the whole derivation.
        let scale = common_denominator(weights);
        let mut terms: Vec<BigInt> = weights.iter().map(|weight| scaled(weight, &scale)).collect();
        for degree in 0..derivative + self.order {
            let mut found = Rational::new(terms.iter().sum::<BigInt>(), scale.clone())
                .expect("common denominators are positive");
            if let EndRows::NaturalFlux { norm_weight } = &self.ends
                && (row, degree) == (0, 1)
            {
                // The outward normal derivative of x at the left end is −1.
                found -= Rational::one() / norm_weight;
            }
            let needed = if degree == derivative { factorial(degree) } else { Rational::zero() };
            if found != needed {
                return Err(OperatorFault::Row { row, degree, found: Box::new(found) });
            }
            for (position, term) in terms.iter_mut().enumerate() {
                *term *= (first + position) as i64 - row as i64;
            }
        }
        Ok(())
    }
}

fn parity(taps: &[Rational], centred: bool) -> Parity {
    let pairs = || taps.iter().zip(taps.iter().rev());
    if centred && pairs().all(|(left, right)| left == right) {
        Parity::Even
    } else if centred && pairs().all(|(left, right)| *left == -right) {
        Parity::Odd
    } else {
        Parity::None
    }
}

impl fmt::Display for OperatorFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            OperatorFault::InteriorOffNodes => formatter.write_str("the interior stencil is off the nodes"),
            OperatorFault::InteriorOrder { found, claimed } => {
                write!(formatter, "the interior has order {found}, not {claimed}")
            }
            OperatorFault::NotMirrorable => formatter
                .write_str("the interior weights have no symmetry, so the ends cannot mirror each other"),
            OperatorFault::NoNaturalFlux => {
                formatter.write_str("natural fluxes belong to second derivatives with a positive norm")
            }
            OperatorFault::TooFewRows { given, needed } => {
                write!(formatter, "{given} closed rows, but the interior stencil leaves out {needed}")
            }
            OperatorFault::EmptyRow { row } => write!(formatter, "closed row {row} has no weights"),
            OperatorFault::Row { row, degree, found } => {
                write!(formatter, "closed row {row} gives {found} on the monomial of degree {degree}")
            }
        }
    }
}

impl std::error::Error for OperatorFault {}
