//! [`SecondDerivativeForm`]: (b u_x)_x with a coefficient that varies, certified as minus a sum of squares.
//!
//! Holds the rows of −H⁻¹M(b) as linear forms in the nodal coefficients, and the check that they are exact.
//! The squares themselves are in [`super::squares`]; how they are found is in [`crate::discretize::closure`].

pub(super) mod assembly;
mod exactness;

use std::fmt;

use num_bigint::BigInt;

use crate::exact::matrix::{common_denominator, scaled};
use crate::exact::{Matrix, Rational};

use super::{ClosedRow, DifferenceOperator, Norm, OperatorFault, Stencil, StencilFault, SumOfSquares};

/// A linear form in the nodal coefficients: Σ factor · b at that node.
pub type LinearForm = Vec<(usize, Rational)>;

/// One closed row at the left end, the norm already divided out: (−H⁻¹M(b)u)_i = Σ_l form_l(b) u_l.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct FormRow {
    /// (column l, form_l), columns ascending; forms that vanish are left out.
    pub columns: Vec<(usize, LinearForm)>,
}

/// −H⁻¹M(b) on nodes 0, …, n − 1 at unit spacing, M(b) a sum of squares for every b ≥ 0.
///
/// Adding the boundary flux H⁻¹B(b u_x) gives (b u_x)_x: at each end (outward flux)/(norm weight) is added.
/// Rows at the right end are those at the left end with all indices i replaced by n − 1 − i.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct SecondDerivativeForm {
    norm: Norm,
    squares: SumOfSquares,
    /// `interior[s − 1]`: −M_{i,i+s} as (offset from i, factor), s = 1, …, order/2.
    interior: Vec<Vec<(i64, Rational)>>,
    closure: Vec<FormRow>,
    interior_order: usize,
    closure_order: usize,
    constant: DifferenceOperator,
}

/// Why squares and norm are not a second derivative of the claimed orders.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum FormFault {
    /// The interior order is not an even number from two on.
    OddOrder { order: usize },
    /// One of norm and squares is for a periodic axis and the other is not.
    EndsDiffer,
    /// The interior reaches further than order/2 nodes.
    NotNarrow { distance: usize },
    /// A row fails on b = x^coefficient_degree, u = x^degree. Row nothing is the interior.
    NotExact { row: Option<usize>, coefficient_degree: usize, degree: usize },
    /// The rows for a constant coefficient failed their check.
    Constant(OperatorFault),
    /// The interior for a constant coefficient failed its check.
    ConstantInterior(StencilFault),
}

impl SecondDerivativeForm {
    /// The form on an axis with two ends. Checked: the interior is narrow and exact of `interior_order`
    /// (for all b and u of total degree up to one more), every closed row with its flux is exact for total
    /// degrees up to `closure_order` + 1.
    pub fn bounded(
        norm: Norm,
        squares: SumOfSquares,
        interior_order: usize,
        closure_order: usize,
    ) -> Result<SecondDerivativeForm, FormFault> {
        if squares.is_periodic() || norm.left().is_empty() {
            return Err(FormFault::EndsDiffer);
        }
        let interior = checked_interior(&squares, interior_order)?;
        let closure = assembly::closed_rows(&squares, &norm, &interior);
        exactness::check_closure(&closure, &norm, closure_order)?;
        let constant = constant(&interior, interior_order, &closure, closure_order, &norm)?;
        Ok(SecondDerivativeForm { norm, squares, interior, closure, interior_order, closure_order, constant })
    }

    /// The form on a periodic axis.
    pub fn periodic(squares: SumOfSquares, interior_order: usize) -> Result<SecondDerivativeForm, FormFault> {
        if !squares.is_periodic() {
            return Err(FormFault::EndsDiffer);
        }
        let interior = checked_interior(&squares, interior_order)?;
        let norm = Norm::periodic();
        let constant = constant(&interior, interior_order, &[], interior_order, &norm)?;
        Ok(SecondDerivativeForm {
            norm,
            squares,
            interior,
            closure: Vec::new(),
            interior_order,
            closure_order: interior_order,
            constant,
        })
    }

    /// The norm H.
    pub fn norm(&self) -> &Norm {
        &self.norm
    }

    /// The certificate: M(b) as a sum of squares.
    pub fn squares(&self) -> &SumOfSquares {
        &self.squares
    }

    /// `forms[s − 1]` is W_s = −M_{i,i+s} as (offset from i, factor), s = 1, …, half width. The interior row
    /// is (−M(b)u)_i = Σ_s W_s(i)(u_{i+s} − u_i) + W_s(i − s)(u_{i−s} − u_i).
    pub fn interior_forms(&self) -> &[Vec<(i64, Rational)>] {
        &self.interior
    }

    /// How far an interior row reaches to each side: half the interior order.
    pub fn half_width(&self) -> usize {
        self.interior.len()
    }

    /// The left closed rows of −H⁻¹M(b); none on a periodic axis.
    pub fn closure_rows(&self) -> &[FormRow] {
        &self.closure
    }

    /// The order of accuracy away from the ends.
    pub fn interior_order(&self) -> usize {
        self.interior_order
    }

    /// The order of every closed row, its boundary flux being exact; on a periodic axis the interior's.
    pub fn closure_order(&self) -> usize {
        self.closure_order
    }

    /// Whether the axis is periodic.
    pub fn is_periodic(&self) -> bool {
        self.squares.is_periodic()
    }

    /// The least number of nodes: the closed rows of both ends are apart, a periodic row meets no node twice.
    pub fn minimum_nodes(&self) -> usize {
        (2 * self.closure.len()).max(self.squares.minimum_nodes()).max(if self.is_periodic() {
            2 * self.half_width() + 1
        } else {
            1
        })
    }

    /// Row `index` of −H⁻¹M(b) on `nodes` nodes: (column, form), columns wrapped on a periodic axis.
    /// Nothing if there is no such row or too few nodes.
    pub fn row(&self, index: usize, nodes: usize) -> Option<Vec<(usize, LinearForm)>> {
        if index >= nodes || nodes < self.minimum_nodes() {
            return None;
        }
        let from_right = nodes - 1 - index;
        if let Some(row) = self.closure.get(index) {
            return Some(row.columns.clone());
        }
        if let Some(row) = self.closure.get(from_right) {
            return Some(row.mirrored(nodes));
        }
        Some(
            assembly::interior_row(&self.interior)
                .into_iter()
                .map(|(offset, form)| {
                    let wrap = |offset: i64| {
                        (index as i64 + offset).rem_euclid(nodes as i64).unsigned_abs() as usize
                    };
                    (wrap(offset), form.into_iter().map(|(node, factor)| (wrap(node), factor)).collect())
                })
                .collect(),
        )
    }

    /// −H⁻¹M(b) as a full matrix for nodal coefficients b; nothing for too few nodes.
    pub fn matrix(&self, coefficient: &[Rational]) -> Option<Matrix> {
        let nodes = coefficient.len();
        let mut matrix = Matrix::zeros(nodes, nodes);
        for index in 0..nodes {
            for (column, form) in self.row(index, nodes)? {
                matrix[(index, column)] =
                    form.iter().map(|(node, factor)| factor * &coefficient[*node]).sum();
            }
        }
        Some(matrix)
    }

    /// The rows for the constant coefficient one. On an axis with two ends the end rows contain the natural
    /// flux, see [`super::EndRows::NaturalFlux`].
    pub fn constant(&self) -> &DifferenceOperator {
        &self.constant
    }
}

/// The operator for the constant coefficient one, through its own check.
fn constant(
    interior: &[Vec<(i64, Rational)>],
    interior_order: usize,
    closure: &[FormRow],
    closure_order: usize,
    norm: &Norm,
) -> Result<DifferenceOperator, FormFault> {
    let half_width = interior.len() as i64;
    let nodes = (-half_width..=half_width).map(Rational::from).collect();
    let weights = assembly::interior_row(interior)
        .iter()
        .map(|(_, form)| total(form.iter().map(|(_, factor)| factor)))
        .collect();
    let stencil = Stencil::new(nodes, Rational::zero(), 2, weights, interior_order)
        .map_err(FormFault::ConstantInterior)?;
    let operator = match norm.left().first() {
        None => DifferenceOperator::periodic(stencil, interior_order),
        Some(norm_weight) => DifferenceOperator::bounded_with_natural_flux(
            stencil,
            interior_order,
            closure.iter().map(FormRow::constant).collect(),
            closure_order,
            norm_weight.clone(),
        ),
    };
    operator.map_err(FormFault::Constant)
}

impl FormRow {
    /// The row at the other end of `nodes` nodes.
    pub(super) fn mirrored(&self, nodes: usize) -> Vec<(usize, LinearForm)> {
        let mirror = |node: usize| nodes - 1 - node;
        let mirrored = self.columns.iter().rev().map(|(column, form)| {
            let form = form.iter().rev().map(|(node, factor)| (mirror(*node), factor.clone()));
            (mirror(*column), form.collect())
        });
        mirrored.collect()
    }

    /// The weights of this row for the constant coefficient one.
    pub(super) fn constant(&self) -> ClosedRow {
        let end = self.columns.last().map_or(0, |(column, _)| column + 1);
        let mut weights = vec![Rational::zero(); end];
        for (column, form) in &self.columns {
            weights[*column] = total(form.iter().map(|(_, factor)| factor));
        }
        while weights.last().is_some_and(Rational::is_zero) {
            weights.pop();
        }
        let first = weights.iter().take_while(|weight| weight.is_zero()).count();
        ClosedRow { first, weights: weights.split_off(first) }
    }
}

/// The sum over one common denominator, reduced once.
pub(super) fn total<'a>(terms: impl Iterator<Item = &'a Rational> + Clone) -> Rational {
    let scale = common_denominator(terms.clone());
    let sum: BigInt = terms.map(|term| scaled(term, &scale)).sum();
    Rational::new(sum, scale).expect("common denominators are positive")
}

fn checked_interior(
    squares: &SumOfSquares,
    interior_order: usize,
) -> Result<Vec<Vec<(i64, Rational)>>, FormFault> {
    if interior_order < 2 || interior_order % 2 == 1 {
        return Err(FormFault::OddOrder { order: interior_order });
    }
    let half_width = interior_order / 2;
    let interior = assembly::interior_forms(squares);
    if interior.len() > half_width {
        return Err(FormFault::NotNarrow { distance: interior.len() });
    }
    exactness::check_interior(&assembly::interior_row(&interior), interior_order)?;
    Ok(interior)
}

impl fmt::Display for FormFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            FormFault::OddOrder { order } => write!(formatter, "interior order {order} is not even"),
            FormFault::EndsDiffer => {
                formatter.write_str("norm and squares differ in whether the axis is periodic")
            }
            FormFault::NotNarrow { distance } => {
                write!(formatter, "an interior row reaches {distance} nodes to each side: too wide")
            }
            FormFault::NotExact { row, coefficient_degree, degree } => {
                match row {
                    Some(row) => write!(formatter, "closed row {row}")?,
                    None => formatter.write_str("the interior")?,
                }
                write!(formatter, " fails on b = x^{coefficient_degree}, u = x^{degree}")
            }
            FormFault::Constant(fault) => write!(formatter, "for a constant coefficient: {fault}"),
            FormFault::ConstantInterior(fault) => {
                write!(formatter, "for a constant coefficient, interior: {fault}")
            }
        }
    }
}

impl std::error::Error for FormFault {}
