//! [`StaggeredPair`]: first derivatives between nodes and half points that integrate by parts without error.
//!
//! Holds the rows of both directions, their exactness and the identity that ties them. Conditions at the ends
//! are the scheme's task; the search is in [`crate::discretize::closure`].

use std::fmt;

use crate::exact::Rational;

use super::{ClosedRow, Norm, Stencil};

/// Q between half points j + 1/2, j = 0, …, n − 2, and nodes i = 0, …, n − 1 at unit spacing.
///
/// From nodes to half points: H_h D₋ = −Qᵀ. From half points to nodes: H_n D₊v = Qv − e₀v₀* + e_N v_N* where
/// v* is the value at the end node that a condition gives. So pᵀH_n D₊v + vᵀH_h D₋p = p_N v_N* − p₀v₀*.
/// Rows at the right end are the negative mirror images of those at the left end. On a periodic axis there
/// are as many half points as nodes and no end values.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct StaggeredPair {
    /// c₁ … c_p: (D u)(x) = Σ c_k (u(x + k − 1/2) − u(x − k + 1/2)).
    interior: Vec<Rational>,
    interior_order: usize,
    closure_order: usize,
    node_norm: Norm,
    half_norm: Norm,
    /// H_n⁻¹Q at the left nodes, on half points.
    node_rows: Vec<ClosedRow>,
    /// D₋ at the left half points, on nodes.
    half_rows: Vec<ClosedRow>,
}

/// Where a closed row stands.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub enum RowPlace {
    /// Row of D₊ at a node.
    Node(usize),
    /// Row of D₋ at a half point.
    Half(usize),
}

/// The numbers of a pair on an axis with two ends, before anything is known about them.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct StaggeredClosure {
    /// The order of every closed row.
    pub order: usize,
    /// The norm of the nodes.
    pub node_norm: Norm,
    /// The norm of the half points.
    pub half_norm: Norm,
    /// Rows of H_n⁻¹Q at nodes 0, 1, …, weights on half points.
    pub node_rows: Vec<ClosedRow>,
    /// Rows of D₋ at half points 0, 1, …, weights on nodes.
    pub half_rows: Vec<ClosedRow>,
}

/// Why numbers are not a staggered pair.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum StaggeredFault {
    /// The interior is not a first derivative on an even number of half-way nodes, symmetric about its point.
    NotHalfway,
    /// The interior's order is below the claimed one.
    InteriorOrder { found: usize, claimed: usize },
    /// A norm has another number of weights than there are closed rows.
    ClosuresDiffer { rows: usize, norm: usize },
    /// Fewer closed rows than the interior stencil leaves out.
    TooFewRows { given: usize, needed: usize },
    /// A closed row fails on the monomial of this degree about its point.
    Row { place: RowPlace, degree: usize, found: Box<Rational> },
    /// H_n D₊ (without end values) and −(H_h D₋)ᵀ differ at this node and half point.
    Entry { node: usize, half: usize },
}

impl StaggeredPair {
    /// A pair on an axis with two ends. Checked: the interior; every closed row on degrees up to the closure's
    /// order, row 0 of D₊ with its exact end value; H_h D₋ = −Qᵀ entry by entry.
    pub fn bounded(
        interior: &Stencil,
        interior_order: usize,
        closure: StaggeredClosure,
    ) -> Result<StaggeredPair, StaggeredFault> {
        let interior = checked_interior(interior, interior_order)?;
        let StaggeredClosure { order, node_norm, half_norm, node_rows, half_rows } = closure;
        for (rows, norm) in [(&node_rows, &node_norm), (&half_rows, &half_norm)] {
            if rows.len() != norm.left().len() {
                return Err(StaggeredFault::ClosuresDiffer { rows: rows.len(), norm: norm.left().len() });
            }
        }
        for (given, needed) in [(node_rows.len(), interior.len()), (half_rows.len(), interior.len() - 1)] {
            if given < needed {
                return Err(StaggeredFault::TooFewRows { given, needed });
            }
        }
        let pair = StaggeredPair {
            interior,
            interior_order,
            closure_order: order,
            node_norm,
            half_norm,
            node_rows,
            half_rows,
        };
        pair.check_rows()?;
        // Ends that touch, and ends with a whole interior stencil between them: as for one grid.
        let least = pair.minimum_nodes();
        pair.check_entries(least)?;
        pair.check_entries(least + 2 * pair.interior.len() + 1)?;
        Ok(pair)
    }

    /// A pair on a periodic axis.
    pub fn periodic(interior: &Stencil, interior_order: usize) -> Result<StaggeredPair, StaggeredFault> {
        let pair = StaggeredPair {
            interior: checked_interior(interior, interior_order)?,
            interior_order,
            closure_order: interior_order,
            node_norm: Norm::periodic(),
            half_norm: Norm::periodic(),
            node_rows: Vec::new(),
            half_rows: Vec::new(),
        };
        pair.check_entries(pair.minimum_nodes() + 1)?;
        Ok(pair)
    }

    fn check_rows(&self) -> Result<(), StaggeredFault> {
        let half = Rational::ratio(1, 2);
        for (index, row) in self.node_rows.iter().enumerate() {
            // Half points lie at first + 1/2, …; row 0 has −v*/h₀ besides, which degree nought alone sees.
            let shift = Rational::from(row.first as i64 - index as i64) + &half;
            let end_value = match (index, self.node_norm.left().first().and_then(Rational::recip)) {
                (0, Some(reciprocal)) => -reciprocal,
                _ => Rational::zero(),
            };
            self.check_row(RowPlace::Node(index), &row.weights, &shift, &end_value)?;
        }
        for (index, row) in self.half_rows.iter().enumerate() {
            let shift = Rational::from(row.first as i64 - index as i64) - &half;
            self.check_row(RowPlace::Half(index), &row.weights, &shift, &Rational::zero())?;
        }
        Ok(())
    }

    /// Checks Σ wⱼ (shift + j)ᵐ, and `end_value` for m = 0, against δ(m, 1).
    fn check_row(
        &self,
        place: RowPlace,
        weights: &[Rational],
        shift: &Rational,
        end_value: &Rational,
    ) -> Result<(), StaggeredFault> {
        for degree in 0..=self.closure_order {
            let points = (0..).map(|index: i64| shift + Rational::from(index));
            let mut found: Rational =
                points.zip(weights).map(|(point, weight)| point.power(degree as u32) * weight).sum();
            if degree == 0 {
                found += end_value;
            }
            if found != Rational::from(i64::from(degree == 1)) {
                return Err(StaggeredFault::Row { place, degree, found: Box::new(found) });
            }
        }
        Ok(())
    }

    fn check_entries(&self, nodes: usize) -> Result<(), StaggeredFault> {
        let halves = self.halves(nodes);
        let mut sums = vec![vec![Rational::zero(); halves]; nodes];
        for (node, sums) in sums.iter_mut().enumerate() {
            let height = self.node_norm.weight(node, nodes);
            let (first, weights) = self.node_row(node, nodes).unwrap_or_default();
            for (half, weight) in (first..).zip(&weights) {
                sums[half.rem_euclid(halves as i64).unsigned_abs() as usize] += &height * weight;
            }
        }
        let half_rows = (0..halves).map(|half| self.half_row(half, nodes).unwrap_or_default());
        for (half, (first, weights)) in half_rows.enumerate() {
            let height = self.half_norm.weight(half, halves);
            for (node, weight) in (first..).zip(&weights) {
                sums[node.rem_euclid(nodes as i64).unsigned_abs() as usize][half] += &height * weight;
            }
        }
        for (node, sums) in sums.iter().enumerate() {
            if let Some(half) = sums.iter().position(|sum| !sum.is_zero()) {
                return Err(StaggeredFault::Entry { node, half });
            }
        }
        Ok(())
    }

    /// c₁ … c_p: the weight of u(x + k − 1/2) is c_k, that of u(x − k + 1/2) is −c_k.
    pub fn interior(&self) -> &[Rational] {
        &self.interior
    }

    /// The order of accuracy away from the ends.
    pub fn interior_order(&self) -> usize {
        self.interior_order
    }

    /// The order of every closed row, end values being exact; on a periodic axis the interior's.
    pub fn closure_order(&self) -> usize {
        self.closure_order
    }

    /// Whether the axis is periodic.
    pub fn is_periodic(&self) -> bool {
        self.node_norm.left().is_empty()
    }

    /// H_n, the norm of the nodes.
    pub fn node_norm(&self) -> &Norm {
        &self.node_norm
    }

    /// H_h, the norm of the half points.
    pub fn half_norm(&self) -> &Norm {
        &self.half_norm
    }

    /// The left closed rows of H_n⁻¹Q: at nodes, weights on half points. −v₀*/h₀ is to be added in row 0.
    pub fn node_rows(&self) -> &[ClosedRow] {
        &self.node_rows
    }

    /// The left closed rows of D₋: at half points, weights on nodes.
    pub fn half_rows(&self) -> &[ClosedRow] {
        &self.half_rows
    }

    /// How many half points there are with `nodes` nodes.
    pub fn halves(&self, nodes: usize) -> usize {
        if self.is_periodic() { nodes } else { nodes.saturating_sub(1) }
    }

    /// The least number of nodes: closed rows of both ends are apart and fit, no row meets a point twice.
    pub fn minimum_nodes(&self) -> usize {
        if self.is_periodic() {
            return 2 * self.interior.len();
        }
        let widest = |rows: &[ClosedRow]| rows.iter().map(ClosedRow::end).max().unwrap_or(0);
        let at_halves = (2 * self.half_rows.len()).max(widest(&self.node_rows)) + 1;
        (2 * self.node_rows.len()).max(widest(&self.half_rows)).max(at_halves)
    }

    /// Row `node` of H_n⁻¹Q on `nodes` nodes: the first half point and the weights on consecutive ones. On a
    /// periodic axis half points are to be taken modulo their number. Nothing if there is no such row.
    pub fn node_row(&self, node: usize, nodes: usize) -> Option<(i64, Vec<Rational>)> {
        // The first half point of an interior row is at node − p + 1/2.
        let first = node as i64 - self.interior.len() as i64;
        self.placed(&self.node_rows, node, nodes, [nodes, self.halves(nodes)], first)
    }

    /// Row `half` of D₋ on `nodes` nodes: the first node and the weights on consecutive ones.
    pub fn half_row(&self, half: usize, nodes: usize) -> Option<(i64, Vec<Rational>)> {
        let first = half as i64 + 1 - self.interior.len() as i64;
        self.placed(&self.half_rows, half, nodes, [self.halves(nodes), nodes], first)
    }

    /// A row of a direction with `[rows, columns]` points: closed, mirrored, or the interior from `first` on.
    fn placed(
        &self,
        closed: &[ClosedRow],
        index: usize,
        nodes: usize,
        [rows, columns]: [usize; 2],
        first: i64,
    ) -> Option<(i64, Vec<Rational>)> {
        if index >= rows || nodes < self.minimum_nodes() {
            return None;
        }
        if let Some(row) = closed.get(index) {
            return Some((row.first as i64, row.weights.clone()));
        }
        if let Some(row) = closed.get(rows - 1 - index) {
            let weights = row.weights.iter().rev().map(|weight| -weight).collect();
            return Some(((columns - row.end()) as i64, weights));
        }
        let left = self.interior.iter().rev().map(|weight| -weight);
        Some((first, left.chain(self.interior.iter().cloned()).collect()))
    }
}

/// c₁ … c_p of a half-way first derivative.
fn checked_interior(interior: &Stencil, claimed: usize) -> Result<Vec<Rational>, StaggeredFault> {
    let weights = interior.weights();
    let half = weights.len() / 2;
    let first = interior.at() - Rational::from(half as i64) + Rational::ratio(1, 2);
    let halfway = interior
        .nodes()
        .iter()
        .enumerate()
        .all(|(index, node)| *node == &first + Rational::from(index as i64));
    let odd = weights.iter().zip(weights.iter().rev()).all(|(left, right)| *left == -right);
    if interior.derivative() != 1 || weights.len() % 2 == 1 || !halfway || !odd {
        return Err(StaggeredFault::NotHalfway);
    }
    if interior.order() < claimed {
        return Err(StaggeredFault::InteriorOrder { found: interior.order(), claimed });
    }
    Ok(weights[half..].to_vec())
}

impl fmt::Display for RowPlace {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            RowPlace::Node(index) => write!(formatter, "the row of node {index}"),
            RowPlace::Half(index) => write!(formatter, "the row of half point {index}"),
        }
    }
}

impl fmt::Display for StaggeredFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            StaggeredFault::NotHalfway => {
                formatter.write_str("the interior is not a symmetric half-way first derivative")
            }
            StaggeredFault::InteriorOrder { found, claimed } => {
                write!(formatter, "the interior has order {found}, not {claimed}")
            }
            StaggeredFault::ClosuresDiffer { rows, norm } => {
                write!(formatter, "{rows} rows are closed, but {norm} weights of the norm")
            }
            StaggeredFault::TooFewRows { given, needed } => {
                write!(formatter, "{given} closed rows, but the interior stencil leaves out {needed}")
            }
            StaggeredFault::Row { place, degree, found } => {
                write!(formatter, "{place} gives {found} on the monomial of degree {degree} about its point")
            }
            StaggeredFault::Entry { node, half } => write!(
                formatter,
                "the two directions do not integrate by parts at node {node}, half point {half}"
            ),
        }
    }
}

impl std::error::Error for StaggeredFault {}
