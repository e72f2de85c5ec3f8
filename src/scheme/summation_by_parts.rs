//! [`SummationByParts`]: a first derivative and a norm that integrate by parts without error.
//!
//! Holds the identity Q + Qᵀ = B. The search for such operators is in [`crate::discretize::closure`].

use std::fmt;

use crate::exact::Rational;

use super::{DifferenceOperator, Norm};

/// D = H⁻¹Q with Q + Qᵀ = B = diag(−1, 0, …, 0, 1); B is nought on a periodic axis.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct SummationByParts {
    operator: DifferenceOperator,
    norm: Norm,
}

/// Why operator and norm do not integrate by parts.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum SummationFault {
    /// Not a first derivative.
    NotFirstDerivative { derivative: usize },
    /// One is for a periodic axis and the other is not, or they close differently many rows.
    ClosuresDiffer { operator: usize, norm: usize },
    /// Q + Qᵀ differs from B in this entry.
    Entry { row: usize, column: usize, found: Box<Rational> },
}

impl SummationByParts {
    /// Checks Q + Qᵀ = B entry by entry.
    pub fn new(operator: DifferenceOperator, norm: Norm) -> Result<SummationByParts, SummationFault> {
        if operator.derivative() != 1 {
            return Err(SummationFault::NotFirstDerivative { derivative: operator.derivative() });
        }
        let closed = operator.closure().len();
        if closed != norm.left().len() {
            return Err(SummationFault::ClosuresDiffer { operator: closed, norm: norm.left().len() });
        }
        let candidate = SummationByParts { operator, norm };
        // Away from the ends rows repeat, so these two sizes show every pair of rows that can meet: ends
        // that touch, and ends with a whole interior stencil between them.
        let least = candidate.minimum_nodes();
        candidate.check_entries(least)?;
        candidate.check_entries(least + candidate.operator.taps().len() + 1)?;
        Ok(candidate)
    }

    fn check_entries(&self, nodes: usize) -> Result<(), SummationFault> {
        let rows = self.quadratic_rows(nodes);
        for (row, entries) in rows.iter().enumerate() {
            for (column, entry) in entries.iter().enumerate().skip(row) {
                let found = entry + &rows[column][row];
                let needed = match (row == column, row, self.operator.is_periodic()) {
                    (true, 0, false) => Rational::from(-1),
                    (true, _, false) if row + 1 == nodes => Rational::one(),
                    _ => Rational::zero(),
                };
                if found != needed {
                    return Err(SummationFault::Entry { row, column, found: Box::new(found) });
                }
            }
        }
        Ok(())
    }

    /// Q = H D on `nodes` nodes, in full.
    fn quadratic_rows(&self, nodes: usize) -> Vec<Vec<Rational>> {
        (0..nodes)
            .map(|index| {
                let mut entries = vec![Rational::zero(); nodes];
                let height = self.norm.weight(index, nodes);
                let (first, weights) = self.operator.row(index, nodes).unwrap_or_default();
                for (column, weight) in (first..).zip(&weights) {
                    entries[column.rem_euclid(nodes as i64).unsigned_abs() as usize] += &height * weight;
                }
                entries
            })
            .collect()
    }

    /// The first derivative D.
    pub fn operator(&self) -> &DifferenceOperator {
        &self.operator
    }

    /// The norm H.
    pub fn norm(&self) -> &Norm {
        &self.norm
    }

    /// The least number of nodes.
    pub fn minimum_nodes(&self) -> usize {
        self.operator.minimum_nodes()
    }
}

impl fmt::Display for SummationFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            SummationFault::NotFirstDerivative { derivative } => {
                write!(formatter, "summation by parts is for first derivatives, not derivative {derivative}")
            }
            SummationFault::ClosuresDiffer { operator, norm } => {
                write!(formatter, "the operator closes {operator} rows, the norm {norm}")
            }
            SummationFault::Entry { row, column, found } => {
                write!(formatter, "Q + Qᵀ has {found} in row {row}, column {column}")
            }
        }
    }
}

impl std::error::Error for SummationFault {}
