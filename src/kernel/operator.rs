//! Line operators as a kernel sees them: plain weights in units of the spacing, still exact.
//!
//! That the weights are right is the business of `scheme`; here only their shape matters (how far a row reaches).

use crate::exact::Rational;

/// An operator along one grid line.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum LineOperator {
    Constant(ConstantOperator),
    Varying(VaryingOperator),
}

/// How interior weights are paired.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Parity {
    /// w₋ₖ = −wₖ, w₀ = 0: weights are listed for k = 1, 2, …
    Odd,
    /// w₋ₖ = wₖ: weights are listed for k = 0, 1, …
    Even,
}

/// Weights that are the same for every line.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ConstantOperator {
    pub parity: Parity,
    /// k = 1, 2, … for odd parity, k = 0, 1, … for even parity.
    pub interior: Vec<Rational>,
    /// Closure rows 0, 1, … at the low end; empty on periodic axes. The high end is their mirror image, negated for odd parity.
    pub closure: Vec<ClosureRow>,
}

/// Σ weightsⱼ·f_{first + j}.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct ClosureRow {
    pub first: usize,
    pub weights: Vec<Rational>,
}

/// −H⁻¹M(b), linear in the coefficient b; even under reflection.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct VaryingOperator {
    /// forms[s − 1]: the weight of (f_{i+s} − f_i) is Σ weight·b_{i + offset}; that of (f_{i−s} − f_i) is the same form at i − s.
    pub forms: Vec<Vec<(i64, Rational)>>,
    /// Closure rows 0, 1, … at the low end: the weight of f_column is Σ weight·b_m. Empty on periodic axes.
    pub closure: Vec<Vec<VaryingEntry>>,
}

/// One column of a closure row.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct VaryingEntry {
    pub column: usize,
    /// (m, weight), m increasing.
    pub weights: Vec<(usize, Rational)>,
}

impl LineOperator {
    /// How far interior rows reach to either side.
    pub fn reach(&self) -> usize {
        match self {
            LineOperator::Constant(operator) => match operator.parity {
                Parity::Odd => operator.interior.len(),
                Parity::Even => operator.interior.len().saturating_sub(1),
            },
            LineOperator::Varying(operator) => operator.forms.len(),
        }
    }

    /// How far interior rows reach to either side, in the field or the coefficient.
    pub fn interior_reach(&self) -> usize {
        match self {
            LineOperator::Constant(_) => self.reach(),
            LineOperator::Varying(operator) => {
                let forms = operator.forms.iter().zip(1i64..);
                let offsets = forms.flat_map(|(form, shift)| {
                    form.iter().flat_map(move |(offset, _)| [*offset, *offset - shift])
                });
                let farthest = offsets.map(i64::unsigned_abs).max().unwrap_or(0) as usize;
                farthest.max(self.reach())
            }
        }
    }

    /// Number of closure rows at each end.
    pub fn closure_rows(&self) -> usize {
        match self {
            LineOperator::Constant(operator) => operator.closure.len(),
            LineOperator::Varying(operator) => operator.closure.len(),
        }
    }

    /// One past the last node that any closure row reads, of the field or the coefficient.
    pub fn closure_width(&self) -> usize {
        match self {
            LineOperator::Constant(operator) => {
                operator.closure.iter().map(|row| row.first + row.weights.len()).max().unwrap_or(0)
            }
            LineOperator::Varying(operator) => operator
                .closure
                .iter()
                .flatten()
                .map(|entry| {
                    entry.weights.iter().map(|(node, _)| node + 1).max().unwrap_or(0).max(entry.column + 1)
                })
                .max()
                .unwrap_or(0),
        }
    }

    /// The least number of nodes on a line so that closure rows of the two ends do not overlap and every load is in bounds.
    pub fn least_nodes(&self) -> usize {
        let rows = self.closure_rows();
        if rows == 0 {
            2 * self.interior_reach() + 1
        } else {
            (2 * rows).max(self.closure_width()).max(rows + self.interior_reach())
        }
    }
}
