//! [`Dissipation`]: damping of what the grid cannot resolve, certified never to give energy.
//!
//! Holds the rows of −H⁻¹M(b) for a sum of squares M(b) whose functionals vanish on polynomials, and the
//! check that they do. How strong and how smooth is chosen in [`crate::discretize::closure`].

use std::fmt;

use crate::exact::{Matrix, Rational};

use super::second_derivative::{assembly, total};
use super::{ClosedRow, FormRow, LinearForm, Norm, SumOfSquares};

/// A(b) = −H⁻¹M(b) on nodes 0, …, n − 1 at unit spacing, M(b) a sum of squares for every b ≥ 0.
///
/// A(b)u vanishes for every b where u is a polynomial of degree below [`Dissipation::annihilated`]. On a grid
/// of spacing h it is to be divided by h and b is a speed. Rows at the right end are those at the left end
/// with all indices i replaced by n − 1 − i.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Dissipation {
    norm: Norm,
    squares: SumOfSquares,
    annihilated: usize,
    strength: Rational,
    /// `interior[s − 1]`: −M_{i,i+s} as (offset from i, factor).
    interior: Vec<Vec<(i64, Rational)>>,
    closure: Vec<FormRow>,
    constant: ConstantRows,
}

/// Rows of a dissipation for the coefficient one. The interior is even.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct ConstantRows {
    /// The weights of offsets 0, 1, …; those of −1, −2, … are the same.
    pub interior: Vec<Rational>,
    /// The left closed rows; none on a periodic axis. The right ones are their mirror images.
    pub closure: Vec<ClosedRow>,
}

/// Why squares and norm are not a dissipation.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum DissipationFault {
    /// One of norm and squares is for a periodic axis and the other is not.
    EndsDiffer,
    /// The functional of a square (left ones first, then repeated ones) does not vanish on x^degree.
    NotAnnihilated { term: usize, degree: usize },
    /// A row does not vanish on u = x^degree for every b. Row nothing is the interior.
    Row { row: Option<usize>, degree: usize },
    /// The interior damps the sawtooth at another rate than the claimed one.
    Strength { found: Box<Rational> },
}

impl Dissipation {
    /// A dissipation on an axis with two ends. Checked: every functional, and with it every row for every b,
    /// vanishes on degrees below `annihilated`; for b = 1 the interior gives −`strength` times the sawtooth
    /// (−1)^i on it.
    pub fn bounded(
        norm: Norm,
        squares: SumOfSquares,
        annihilated: usize,
        strength: Rational,
    ) -> Result<Dissipation, DissipationFault> {
        if squares.is_periodic() || norm.left().is_empty() {
            return Err(DissipationFault::EndsDiffer);
        }
        Dissipation::checked(norm, squares, annihilated, strength)
    }

    /// A dissipation on a periodic axis, where "vanishes on polynomials" is said of the interior row.
    pub fn periodic(
        squares: SumOfSquares,
        annihilated: usize,
        strength: Rational,
    ) -> Result<Dissipation, DissipationFault> {
        if !squares.is_periodic() {
            return Err(DissipationFault::EndsDiffer);
        }
        Dissipation::checked(Norm::periodic(), squares, annihilated, strength)
    }

    fn checked(
        norm: Norm,
        squares: SumOfSquares,
        annihilated: usize,
        strength: Rational,
    ) -> Result<Dissipation, DissipationFault> {
        check_functionals(&squares, annihilated)?;
        let interior = assembly::interior_forms(&squares);
        let interior_row = assembly::interior_row(&interior);
        if let Some(degree) = not_annihilated(&interior_row, annihilated) {
            return Err(DissipationFault::Row { row: None, degree });
        }
        let closure = if squares.is_periodic() {
            Vec::new()
        } else {
            assembly::closed_rows(&squares, &norm, &interior)
        };
        for (index, row) in closure.iter().enumerate() {
            let columns = row.columns.iter().map(|(column, form)| {
                let form = form.iter().map(|(node, factor)| (*node as i64, factor.clone())).collect();
                (*column as i64, form)
            });
            if let Some(degree) = not_annihilated(&columns.collect::<Vec<_>>(), annihilated) {
                return Err(DissipationFault::Row { row: Some(index), degree });
            }
        }
        let weights = interior_row.iter().filter(|(offset, _)| *offset >= 0).map(|(_, form)| sum(form));
        let constant = ConstantRows {
            interior: weights.collect(),
            closure: closure.iter().map(FormRow::constant).collect(),
        };
        let found = constant.sawtooth_decay();
        if found != strength {
            return Err(DissipationFault::Strength { found: Box::new(found) });
        }
        Ok(Dissipation { norm, squares, annihilated, strength, interior, closure, constant })
    }

    /// The norm H.
    pub fn norm(&self) -> &Norm {
        &self.norm
    }

    /// The certificate: M(b) as a sum of squares.
    pub fn squares(&self) -> &SumOfSquares {
        &self.squares
    }

    /// Polynomials of degree below this are left alone, on every row.
    pub fn annihilated(&self) -> usize {
        self.annihilated
    }

    /// The rate at which the sawtooth decays for b = 1, in units of 1/spacing.
    pub fn strength(&self) -> &Rational {
        &self.strength
    }

    /// `forms[s − 1]` is W_s = −M_{i,i+s} as (offset from i, factor). The interior row is
    /// (A(b)u)_i = Σ_s W_s(i)(u_{i+s} − u_i) + W_s(i − s)(u_{i−s} − u_i).
    pub fn interior_forms(&self) -> &[Vec<(i64, Rational)>] {
        &self.interior
    }

    /// The left closed rows of A(b); none on a periodic axis.
    pub fn closure_rows(&self) -> &[FormRow] {
        &self.closure
    }

    /// The rows for the coefficient one.
    pub fn constant(&self) -> &ConstantRows {
        &self.constant
    }

    /// The least number of nodes: the closed rows of both ends are apart, a periodic row meets no node twice.
    pub fn minimum_nodes(&self) -> usize {
        let ends = 2 * self.closure.len();
        let row = if self.squares.is_periodic() { 2 * self.interior.len() + 1 } else { 1 };
        ends.max(self.squares.minimum_nodes()).max(row)
    }

    /// Row `index` on `nodes` nodes: (column, form in the nodal b), columns wrapped on a periodic axis.
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
        let wrap = |offset: i64| (index as i64 + offset).rem_euclid(nodes as i64).unsigned_abs() as usize;
        let place = |form: Vec<(i64, Rational)>| {
            form.into_iter().map(|(offset, factor)| (wrap(offset), factor)).collect()
        };
        let row = assembly::interior_row(&self.interior);
        Some(row.into_iter().map(|(offset, form)| (wrap(offset), place(form))).collect())
    }

    /// A(b) in full for nodal coefficients b; nothing for too few nodes.
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
}

impl ConstantRows {
    /// Minus the interior applied to (−1)^i, at an even node.
    fn sawtooth_decay(&self) -> Rational {
        let mut decay = Rational::zero();
        for (offset, weight) in self.interior.iter().enumerate() {
            let both = if offset == 0 { weight.clone() } else { weight * Rational::from(2) };
            decay += if offset % 2 == 0 { -both } else { both };
        }
        decay
    }
}

/// Every functional must vanish on the degrees below `annihilated`.
fn check_functionals(squares: &SumOfSquares, annihilated: usize) -> Result<(), DissipationFault> {
    let left = squares.left().iter().map(|square| {
        square.functional.iter().map(|(node, factor)| (*node as i64, factor)).collect::<Vec<_>>()
    });
    let repeated = squares
        .repeated()
        .iter()
        .map(|square| square.functional.iter().map(|(offset, factor)| (*offset, factor)).collect());
    for (term, functional) in left.chain(repeated).enumerate() {
        for degree in 0..annihilated {
            let moment: Rational = functional
                .iter()
                .map(|(node, factor)| Rational::from(*node).power(degree as u32) * *factor)
                .sum();
            if !moment.is_zero() {
                return Err(DissipationFault::NotAnnihilated { term, degree });
            }
        }
    }
    Ok(())
}

/// The least degree below `annihilated` on which a row does not vanish for every b.
fn not_annihilated(row: &[(i64, Vec<(i64, Rational)>)], annihilated: usize) -> Option<usize> {
    let mut nodes: Vec<i64> = row.iter().flat_map(|(_, form)| form.iter().map(|(node, _)| *node)).collect();
    nodes.sort_unstable();
    nodes.dedup();
    (0..annihilated).find(|&degree| {
        nodes.iter().any(|wanted| {
            let terms: Vec<Rational> = row
                .iter()
                .flat_map(|(column, form)| {
                    let value = Rational::from(*column).power(degree as u32);
                    let here = form.iter().filter(|(node, _)| node == wanted);
                    here.map(move |(_, factor)| factor * &value)
                })
                .collect();
            !total(terms.iter()).is_zero()
        })
    })
}

fn sum(form: &[(i64, Rational)]) -> Rational {
    total(form.iter().map(|(_, factor)| factor))
}

impl fmt::Display for DissipationFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            DissipationFault::EndsDiffer => {
                formatter.write_str("norm and squares differ in whether the axis is periodic")
            }
            DissipationFault::NotAnnihilated { term, degree } => {
                write!(formatter, "the functional of square {term} does not vanish on x^{degree}")
            }
            DissipationFault::Row { row, degree } => {
                match row {
                    Some(row) => write!(formatter, "closed row {row}")?,
                    None => formatter.write_str("the interior")?,
                }
                write!(formatter, " does not vanish on x^{degree}")
            }
            DissipationFault::Strength { found } => {
                write!(formatter, "the sawtooth decays at the rate {found}, not at the claimed one")
            }
        }
    }
}

impl std::error::Error for DissipationFault {}
