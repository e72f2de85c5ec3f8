//! [`BiasedPair`]: two first derivatives, biased forward and backward, that integrate by parts with each
//! other and lose energy by themselves.
//!
//! D± = D ± A with a summation-by-parts D and a dissipation A = −H⁻¹S in the same norm. Holds the rows of both
//! and their exactness. For u_t + a u_x = 0, D₋ is to be used where a > 0.

use std::fmt;

use num_bigint::BigInt;

use crate::exact::Rational;
use crate::exact::matrix::{common_denominator, scaled};

use super::{ClosedRow, Dissipation, Stencil, StencilFault, SummationByParts};

/// To which side a derivative of a pair leans.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum Direction {
    /// D₊: more nodes to the right.
    Forward,
    /// D₋: more nodes to the left.
    Backward,
}

/// D₊ and D₋ with H D₊ + (H D₋)ᵀ = B and H(D₊ − D₋)/2 = −S, S a sum of squares.
///
/// Rows of D₋ are the negative mirror images of those of D₊ at the other end.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct BiasedPair {
    central: SummationByParts,
    damping: Dissipation,
    interior: Stencil,
    closure_order: usize,
    forward: Vec<ClosedRow>,
    backward: Vec<ClosedRow>,
}

/// Why derivative and dissipation are not a biased pair.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum BiasedFault {
    /// They do not share the norm.
    NormsDiffer,
    /// The interior of D₊ is not of the claimed order.
    Interior(StencilFault),
    /// A closed row fails on the monomial (x − row)^degree.
    Row { direction: Direction, row: usize, degree: usize, found: Box<Rational> },
    /// H D₊ + (H D₋)ᵀ differs from B in this entry.
    Entry { row: usize, column: usize, found: Box<Rational> },
}

impl BiasedPair {
    /// The pair D ± A, A for the coefficient one. Checked: the norms are the same; the interior of D₊ has
    /// `interior_order`; every closed row of both is exact on degrees up to `closure_order` (on a periodic
    /// axis there is none); H D₊ + (H D₋)ᵀ = B entry by entry.
    pub fn new(
        central: SummationByParts,
        damping: Dissipation,
        interior_order: usize,
        closure_order: usize,
    ) -> Result<BiasedPair, BiasedFault> {
        if central.norm() != damping.norm() {
            return Err(BiasedFault::NormsDiffer);
        }
        let interior = forward_interior(&central, &damping, interior_order)?;
        let forward = closed_rows(&central, &damping, Direction::Forward);
        let backward = closed_rows(&central, &damping, Direction::Backward);
        for (direction, rows) in [(Direction::Forward, &forward), (Direction::Backward, &backward)] {
            for (index, row) in rows.iter().enumerate() {
                check_row(direction, index, row, closure_order)?;
            }
        }
        let pair = BiasedPair { central, damping, interior, closure_order, forward, backward };
        let least = pair.minimum_nodes();
        pair.check_entries(least)?;
        pair.check_entries(least + pair.interior.nodes().len() + 1)?;
        Ok(pair)
    }

    fn check_entries(&self, nodes: usize) -> Result<(), BiasedFault> {
        let mut sums = vec![vec![Rational::zero(); nodes]; nodes];
        let placed = |direction: Direction, index: usize| {
            let height = self.central.norm().weight(index, nodes);
            let (first, weights) = self.row(direction, index, nodes).unwrap_or_default();
            let column = |column: i64| column.rem_euclid(nodes as i64).unsigned_abs() as usize;
            (first..).map(column).zip(weights).map(move |(column, weight)| (column, weight * &height))
        };
        for (index, sums) in sums.iter_mut().enumerate() {
            for (column, entry) in placed(Direction::Forward, index) {
                sums[column] += entry;
            }
        }
        for (index, entries) in (0..nodes).map(|index| placed(Direction::Backward, index)).enumerate() {
            for (column, entry) in entries {
                sums[column][index] += entry;
            }
        }
        for (row, entries) in sums.iter().enumerate() {
            for (column, found) in entries.iter().enumerate() {
                let needed = match (row == column, row, self.is_periodic()) {
                    (true, 0, false) => Rational::from(-1),
                    (true, _, false) if row + 1 == nodes => Rational::one(),
                    _ => Rational::zero(),
                };
                if *found != needed {
                    return Err(BiasedFault::Entry { row, column, found: Box::new(found.clone()) });
                }
            }
        }
        Ok(())
    }

    /// D, the mean of both.
    pub fn central(&self) -> &SummationByParts {
        &self.central
    }

    /// A, half of the difference of both for the coefficient one.
    pub fn damping(&self) -> &Dissipation {
        &self.damping
    }

    /// The interior of D₊ on the nodes that it needs; that of D₋ is its negative mirror image.
    pub fn interior(&self) -> &Stencil {
        &self.interior
    }

    /// The exact order of the interior.
    pub fn interior_order(&self) -> usize {
        self.interior.order()
    }

    /// Every closed row is exact on degrees up to this.
    pub fn closure_order(&self) -> usize {
        self.closure_order
    }

    /// Whether the axis is periodic.
    pub fn is_periodic(&self) -> bool {
        self.central.operator().is_periodic()
    }

    /// The left closed rows of one direction. The right ones are the negative mirror images of the other's.
    pub fn closure_rows(&self, direction: Direction) -> &[ClosedRow] {
        match direction {
            Direction::Forward => &self.forward,
            Direction::Backward => &self.backward,
        }
    }

    /// The least number of nodes.
    pub fn minimum_nodes(&self) -> usize {
        let widest = self.forward.iter().chain(&self.backward).map(ClosedRow::end).max().unwrap_or(0);
        let ends = 2 * self.forward.len().max(self.backward.len());
        self.central.minimum_nodes().max(self.damping.minimum_nodes()).max(widest).max(ends)
    }

    /// Row `index` of one direction on `nodes` nodes: the first column and the weights on consecutive ones,
    /// to be taken modulo `nodes` on a periodic axis. Nothing if there is no such row or too few nodes.
    pub fn row(&self, direction: Direction, index: usize, nodes: usize) -> Option<(i64, Vec<Rational>)> {
        if index >= nodes || nodes < self.minimum_nodes() {
            return None;
        }
        let negated = |weights: &[Rational]| weights.iter().rev().map(|weight| -weight).collect();
        if let Some(row) = self.closure_rows(direction).get(index) {
            return Some((row.first as i64, row.weights.clone()));
        }
        if let Some(row) = self.closure_rows(direction.other()).get(nodes - 1 - index) {
            return Some(((nodes - row.end()) as i64, negated(&row.weights)));
        }
        let offsets = self.interior.integer_offsets()?;
        let (lowest, highest) = (offsets.first()?, offsets.last()?);
        let at = index as i64;
        Some(match direction {
            Direction::Forward => (at + lowest, self.interior.weights().to_vec()),
            Direction::Backward => (at - highest, negated(self.interior.weights())),
        })
    }
}

impl Direction {
    fn other(self) -> Direction {
        match self {
            Direction::Forward => Direction::Backward,
            Direction::Backward => Direction::Forward,
        }
    }

    fn sign(self) -> Rational {
        match self {
            Direction::Forward => Rational::one(),
            Direction::Backward => Rational::from(-1),
        }
    }
}

/// The interior of D₊, through its own check, without the noughts at its ends.
fn forward_interior(
    central: &SummationByParts,
    damping: &Dissipation,
    order: usize,
) -> Result<Stencil, BiasedFault> {
    let (mut nodes, mut weights) = (Vec::new(), Vec::new());
    let taps = central.operator().taps();
    let left = central.operator().left_reach() as i64;
    let even = &damping.constant().interior;
    let reach = left.max(even.len() as i64 - 1);
    for offset in -reach..=reach {
        let place = usize::try_from(offset + left).ok();
        let slope = place.and_then(|place| taps.get(place)).cloned().unwrap_or_else(Rational::zero);
        let damped = even.get(offset.unsigned_abs() as usize).cloned().unwrap_or_else(Rational::zero);
        nodes.push(Rational::from(offset));
        weights.push(slope + damped);
    }
    let first = weights.iter().take_while(|weight| weight.is_zero()).count();
    let end = weights.iter().rposition(|weight| !weight.is_zero()).map_or(first, |last| last + 1);
    let (nodes, weights) = (nodes[first..end].to_vec(), weights[first..end].to_vec());
    Stencil::new(nodes, Rational::zero(), 1, weights, order).map_err(BiasedFault::Interior)
}

/// D ± A at the left end, as many rows as either closes.
fn closed_rows(central: &SummationByParts, damping: &Dissipation, direction: Direction) -> Vec<ClosedRow> {
    let operator = central.operator();
    let count = operator.closure().len().max(damping.constant().closure.len());
    let nodes = central.minimum_nodes().max(damping.minimum_nodes()).max(2 * count)
        + operator.taps().len()
        + damping.constant().interior.len();
    (0..count)
        .map(|index| {
            let mut weights = vec![Rational::zero(); nodes];
            let (first, slopes) = operator.row(index, nodes).unwrap_or_default();
            for (column, weight) in (first.unsigned_abs() as usize..).zip(&slopes) {
                weights[column] += weight;
            }
            for (column, form) in damping.row(index, nodes).unwrap_or_default() {
                let sum: Rational = form.iter().map(|(_, factor)| factor).sum();
                weights[column] += sum * direction.sign();
            }
            // D₋ of order one has no way to look beyond the left end: its row there is nought.
            let last = weights.iter().rposition(|weight| !weight.is_zero()).unwrap_or(0);
            weights.truncate(last + 1);
            let first = weights.iter().take_while(|weight| weight.is_zero()).count().min(last);
            ClosedRow { first, weights: weights.split_off(first) }
        })
        .collect()
}

/// Checks Σ wⱼ (j − row)ᵐ = δ(m, 1) for all m up to the order.
fn check_row(direction: Direction, row: usize, closed: &ClosedRow, order: usize) -> Result<(), BiasedFault> {
    let scale = common_denominator(&closed.weights);
    let mut terms: Vec<BigInt> = closed.weights.iter().map(|weight| scaled(weight, &scale)).collect();
    for degree in 0..=order {
        let found = Rational::new(terms.iter().sum::<BigInt>(), scale.clone())
            .expect("common denominators are positive");
        if found != Rational::from(i64::from(degree == 1)) {
            return Err(BiasedFault::Row { direction, row, degree, found: Box::new(found) });
        }
        for (position, term) in terms.iter_mut().enumerate() {
            *term *= (closed.first + position) as i64 - row as i64;
        }
    }
    Ok(())
}

impl fmt::Display for Direction {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str(match self {
            Direction::Forward => "forward",
            Direction::Backward => "backward",
        })
    }
}

impl fmt::Display for BiasedFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            BiasedFault::NormsDiffer => {
                formatter.write_str("derivative and dissipation do not share the norm")
            }
            BiasedFault::Interior(fault) => write!(formatter, "biased interior: {fault}"),
            BiasedFault::Row { direction, row, degree, found } => write!(
                formatter,
                "closed row {row} of the {direction} derivative gives {found} on the monomial of degree {degree} about its node"
            ),
            BiasedFault::Entry { row, column, found } => {
                write!(formatter, "H D₊ + (H D₋)ᵀ has {found} in row {row}, column {column}")
            }
        }
    }
}

impl std::error::Error for BiasedFault {}
