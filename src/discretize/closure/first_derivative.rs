//! The search for closed first derivatives D = H⁻¹Q with Q + Qᵀ = B.
//!
//! Unknown are the norm weights h₀ … h_{b−1} and the upper triangle of Q's b × b corner; the rest of the
//! corner follows by antisymmetry, everything else from the interior. Exactness of the rows is linear in
//! them. What freedom is left goes first into norm weights close to one (orders 10 and 12, whose exactness
//! leaves the norm some), then into the least truncation error in the norm, degree after degree.
//! Not here: the proof, which the constructors in [`crate::scheme`] make.

use crate::discretize::interior;
use crate::exact::{AffineSolution, Matrix, Rational, Residual};
use crate::scheme::{ClosedRow, DifferenceOperator, Norm, Stencil, SummationByParts};

use super::stages::{Search, distances_from_one};
use super::{Impossible, Recipe};

/// The truncation stages end at the degree 2p + this; beyond it a direction that no error sees would be
/// followed to an absurd spectral radius.
const LAST_DEGREE_BEYOND_ORDER: usize = 6;

/// Where the unknowns are, and the interior weights.
struct Layout {
    /// p: closed rows are exact up to this degree.
    half: usize,
    closed: usize,
    /// c₁, c₂, …
    interior: Vec<Rational>,
}

/// (D xᵈ)ᵢ hᵢ − hᵢ d i^(d−1) as a linear form in the unknowns plus a constant.
struct RowCondition {
    coefficients: Vec<Rational>,
    constant: Rational,
}

pub(super) fn periodic(order: usize) -> Result<SummationByParts, Impossible> {
    periodic_around(interior::centred(1, order)?, order)
}

/// Any odd interior on a periodic axis.
pub(super) fn periodic_around(stencil: Stencil, order: usize) -> Result<SummationByParts, Impossible> {
    let operator = DifferenceOperator::periodic(stencil, order)?;
    Ok(SummationByParts::new(operator, Norm::periodic())?)
}

pub(super) fn closed(recipe: &Recipe) -> Result<SummationByParts, Impossible> {
    closed_around(interior::centred(1, recipe.order)?, recipe)
}

/// The closure of any odd interior on nodes −r, …, r of at least the recipe's order.
pub(super) fn closed_around(stencil: Stencil, recipe: &Recipe) -> Result<SummationByParts, Impossible> {
    let centre = stencil.weights().len() / 2;
    let layout = Layout {
        half: recipe.order / 2,
        closed: recipe.closed_rows,
        interior: stencil.weights()[centre + 1..].to_vec(),
    };
    let family = layout.exact_family()?;
    let mut coordinates = layout.optimum(&family)?;
    if let Some(denominator) = recipe.tidy_denominator {
        let scale = Rational::from(denominator);
        for coordinate in &mut coordinates {
            *coordinate = (&*coordinate * &scale).rounded() / &scale;
        }
    }
    let unknowns = family.at(&coordinates);
    layout.operator(stencil, recipe.order, &unknowns)
}

impl Layout {
    /// How many columns the closed rows reach.
    fn width(&self) -> usize {
        self.closed + self.interior.len()
    }

    fn unknowns(&self) -> usize {
        self.closed + self.closed * (self.closed - 1) / 2
    }

    /// The place of q_ij, i < j < b, among the unknowns: row after row behind the norm.
    fn place(&self, row: usize, column: usize) -> usize {
        self.closed + row * (2 * self.closed - row - 1) / 2 + (column - row - 1)
    }

    /// The interior's weight in Q for a distance to the right.
    fn beyond(&self, distance: usize) -> Rational {
        self.interior.get(distance - 1).cloned().unwrap_or_else(Rational::zero)
    }

    fn condition(&self, row: usize, degree: usize) -> RowCondition {
        let mut coefficients = vec![Rational::zero(); self.unknowns()];
        let mut constant = Rational::zero();
        for column in 0..self.width() {
            let value = Rational::from(column as i64).power(degree as u32);
            if column >= self.closed {
                constant += self.beyond(column - row) * value;
            } else if row < column {
                coefficients[self.place(row, column)] += value;
            } else if row > column {
                coefficients[self.place(column, row)] -= value;
            } else if row == 0 {
                constant -= value * Rational::ratio(1, 2);
            }
        }
        if let Some(lower) = degree.checked_sub(1) {
            let slope = Rational::from(degree as i64) * Rational::from(row as i64).power(lower as u32);
            coefficients[row] -= slope;
        }
        RowCondition { coefficients, constant }
    }

    /// All unknowns for which every closed row is exact up to the degree p.
    fn exact_family(&self) -> Result<AffineSolution, Impossible> {
        let conditions: Vec<RowCondition> = (0..self.closed)
            .flat_map(|row| (0..=self.half).map(move |degree| (row, degree)))
            .map(|(row, degree)| self.condition(row, degree))
            .collect();
        let right_side: Vec<Rational> = conditions.iter().map(|condition| -&condition.constant).collect();
        let rows = conditions.into_iter().map(|condition| condition.coefficients).collect();
        let system = Matrix::from_rows(rows).expect("all conditions have one entry an unknown");
        Ok(system.solve_affine(&right_side)?)
    }

    /// The coordinates of the family's best member.
    fn optimum(&self, family: &AffineSolution) -> Result<Vec<Rational>, Impossible> {
        let mut search = Search::new(family);
        if search.leaves_free(self.closed) {
            search.narrow(distances_from_one(self.closed, self.unknowns()));
        }
        if search.leaves_free(self.closed) {
            return Err(Impossible::NormNotUnique);
        }
        let norm = search.member()[..self.closed].to_vec();
        for degree in self.half + 1..=2 * self.half + LAST_DEGREE_BEYOND_ORDER {
            if search.is_decided() {
                break;
            }
            search.narrow(self.truncation_errors(degree, &norm)?);
        }
        search.coordinates()
    }

    /// hᵢ eᵢ² of every closed row at one degree.
    fn truncation_errors(&self, degree: usize, norm: &[Rational]) -> Result<Vec<Residual>, Impossible> {
        (0..self.closed)
            .map(|row| {
                let RowCondition { coefficients, constant } = self.condition(row, degree);
                // hᵢ eᵢ is the condition's value, so hᵢ eᵢ² is its square over hᵢ.
                let weight =
                    norm[row].recip().filter(Rational::is_positive).ok_or(Impossible::NormNotUnique)?;
                Ok(Residual { row: coefficients, constant, weight })
            })
            .collect()
    }

    /// Passes the found numbers through the constructors of the facts.
    fn operator(
        &self,
        stencil: Stencil,
        order: usize,
        unknowns: &[Rational],
    ) -> Result<SummationByParts, Impossible> {
        let norm = Norm::bounded(unknowns[..self.closed].to_vec())?;
        let rows = (0..self.closed).map(|row| self.closed_row(row, unknowns)).collect();
        let operator = DifferenceOperator::bounded(stencil, order, rows, self.half)?;
        Ok(SummationByParts::new(operator, norm)?)
    }

    /// Row `row` of D = H⁻¹Q without the noughts at its ends.
    fn closed_row(&self, row: usize, unknowns: &[Rational]) -> ClosedRow {
        let entry = |column: usize| {
            if column >= self.closed {
                self.beyond(column - row)
            } else if row < column {
                unknowns[self.place(row, column)].clone()
            } else if row > column {
                -&unknowns[self.place(column, row)]
            } else if row == 0 {
                Rational::ratio(-1, 2)
            } else {
                Rational::zero()
            }
        };
        let weights: Vec<Rational> = (0..self.width()).map(|column| entry(column) / &unknowns[row]).collect();
        let first = weights.iter().take_while(|weight| weight.is_zero()).count();
        let end = weights.iter().rposition(|weight| !weight.is_zero()).map_or(first, |last| last + 1);
        ClosedRow { first, weights: weights[first..end].to_vec() }
    }
}
