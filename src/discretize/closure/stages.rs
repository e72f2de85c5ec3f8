//! Searching a family of candidates stage by stage: each stage makes one sum of squares least and leaves the
//! next what freedom it can. Everything is exact.

use crate::exact::{AffineSolution, Matrix, Rational, Residual};

use super::Impossible;

/// A search among the members of a family. It runs in the family's coordinates, which are far fewer and have
/// far shorter fractions than the unknowns at an optimum.
pub(super) struct Search<'a> {
    family: &'a AffineSolution,
    /// The coordinates that are still in question.
    best: AffineSolution,
}

impl<'a> Search<'a> {
    /// All members.
    pub(super) fn new(family: &'a AffineSolution) -> Search<'a> {
        let size = family.directions.len();
        let identity = Matrix::identity(size);
        let best = AffineSolution {
            particular: vec![Rational::zero(); size],
            directions: (0..size).map(|index| identity.row(index).to_vec()).collect(),
            free: (0..size).collect(),
        };
        Search { family, best }
    }

    /// Whether one of the first `count` unknowns differs between members that are left.
    pub(super) fn leaves_free(&self, count: usize) -> bool {
        let slopes = |unknown: usize| -> Vec<Rational> {
            self.family.directions.iter().map(|direction| direction[unknown].clone()).collect()
        };
        (0..count).map(slopes).any(|slopes| {
            self.best.directions.iter().any(|direction| !Rational::dot(&slopes, direction).is_zero())
        })
    }

    /// Whether one member is left.
    pub(super) fn is_decided(&self) -> bool {
        self.best.directions.is_empty()
    }

    /// Keeps the members for which the sum of the residuals' squares is least.
    pub(super) fn narrow(&mut self, residuals: Vec<Residual>) {
        let residuals: Vec<Residual> =
            residuals.into_iter().map(|residual| self.in_coordinates(residual)).collect();
        self.best = self.best.least_squares(&residuals);
    }

    fn in_coordinates(&self, residual: Residual) -> Residual {
        let Residual { row, constant, weight } = residual;
        Residual {
            row: self.family.directions.iter().map(|direction| Rational::dot(&row, direction)).collect(),
            constant: Rational::dot(&row, &self.family.particular) + constant,
            weight,
        }
    }

    /// One of the members that are left.
    pub(super) fn member(&self) -> Vec<Rational> {
        self.family.at(&self.best.particular)
    }

    /// The coordinates of the one member that is left.
    pub(super) fn coordinates(self) -> Result<Vec<Rational>, Impossible> {
        match self.best.directions.len() {
            0 => Ok(self.best.particular),
            directions => Err(Impossible::FreedomLeft { directions }),
        }
    }
}

/// (xᵢ − 1)² of the first `count` of `unknowns` unknowns.
pub(super) fn distances_from_one(count: usize, unknowns: usize) -> Vec<Residual> {
    (0..count)
        .map(|index| {
            let mut row = vec![Rational::zero(); unknowns];
            row[index] = Rational::one();
            Residual { row, constant: Rational::from(-1), weight: Rational::one() }
        })
        .collect()
}
