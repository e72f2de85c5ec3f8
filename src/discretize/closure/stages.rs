//! Searching a family of candidates stage by stage: each stage makes one sum of squares least and leaves the
//! next what freedom it can. Everything is exact.

use num_bigint::BigInt;
use num_traits::One;

use crate::exact::matrix::{common_denominator, scaled};
use crate::exact::{AffineSolution, Matrix, Rational, Residual};

use super::Impossible;

/// A search among the members of a family. It runs in the family's coordinates, which are far fewer and have
/// far shorter fractions than the unknowns at an optimum.
pub(super) struct Search<'a> {
    family: &'a AffineSolution,
    /// One of the best members so far. Its fractions have hundreds of digits: they are kept over one
    /// denominator and reduced once at the end, as greatest common factors would take nearly all the time.
    best: LongVector,
    /// What can be added to it without a loss. Short fractions.
    directions: Vec<Vec<Rational>>,
}

/// Fractions over one denominator, not reduced.
struct LongVector {
    numerators: Vec<BigInt>,
    denominator: BigInt,
}

impl<'a> Search<'a> {
    /// All members.
    pub(super) fn new(family: &'a AffineSolution) -> Search<'a> {
        let size = family.directions.len();
        let identity = Matrix::identity(size);
        let best = LongVector { numerators: vec![BigInt::default(); size], denominator: BigInt::one() };
        let directions = (0..size).map(|index| identity.row(index).to_vec()).collect();
        Search { family, best, directions }
    }

    /// Whether one of the first `count` unknowns differs between members that are left.
    pub(super) fn leaves_free(&self, count: usize) -> bool {
        let slopes = |unknown: usize| -> Vec<Rational> {
            self.family.directions.iter().map(|direction| direction[unknown].clone()).collect()
        };
        (0..count).map(slopes).any(|slopes| {
            self.directions.iter().any(|direction| !Rational::dot(&slopes, direction).is_zero())
        })
    }

    /// Whether one member is left.
    pub(super) fn is_decided(&self) -> bool {
        self.directions.is_empty()
    }

    /// Keeps the members for which the sum of the residuals' squares is least.
    pub(super) fn narrow(&mut self, residuals: Vec<Residual>) {
        let residuals: Vec<Residual> =
            residuals.into_iter().map(|residual| self.in_coordinates(residual)).collect();
        // How the residuals change along the directions.
        let slopes: Vec<Vec<Rational>> = residuals
            .iter()
            .map(|residual| {
                let along = self.directions.iter();
                along.map(|direction| Rational::dot(&residual.row, direction)).collect()
            })
            .collect();
        let system = Matrix::from_rows(slopes).expect("every residual has one slope a direction");
        let unseen = system
            .solve_affine(&vec![Rational::zero(); residuals.len()])
            .expect("a system without right side has the solution nought");
        let seen: Vec<usize> =
            (0..self.directions.len()).filter(|index| !unseen.free.contains(index)).collect();
        self.step(&residuals, &system, &seen);
        let origin = vec![Rational::zero(); self.best.numerators.len()];
        self.directions = unseen
            .directions
            .iter()
            .map(|coordinates| {
                let mut sum = origin.clone();
                for (coordinate, direction) in coordinates.iter().zip(&self.directions) {
                    if !coordinate.is_zero() {
                        for (entry, slope) in sum.iter_mut().zip(direction) {
                            *entry += coordinate * slope;
                        }
                    }
                }
                sum
            })
            .collect();
    }

    /// Moves the best member along the directions that the residuals see, to the least sum of squares: with
    /// G the slopes along these, W the weights and v the residuals' values, by −(GᵀWG)⁻¹GᵀWv.
    fn step(&mut self, residuals: &[Residual], slopes: &Matrix, seen: &[usize]) {
        let weighted: Vec<Vec<Rational>> = seen
            .iter()
            .map(|&column| {
                let rows = residuals.iter().enumerate();
                rows.map(|(row, residual)| &residual.weight * &slopes[(row, column)]).collect()
            })
            .collect();
        let normal = weighted
            .iter()
            .map(|weighted| {
                let product = |&column: &usize| {
                    let terms = weighted.iter().enumerate();
                    total(terms.map(|(row, weight)| weight * &slopes[(row, column)]).collect())
                };
                seen.iter().map(product).collect()
            })
            .collect();
        let values = self.best.residuals(residuals);
        let right_side: Vec<Rational> =
            weighted.iter().map(|weighted| -whole_dot(weighted, &values.numerators)).collect();
        let normal = Matrix::from_rows(normal).expect("a square matrix");
        let lengths = normal.solve(&right_side).expect("the directions that are seen are independent");
        let directions: Vec<&Vec<Rational>> = seen.iter().map(|&index| &self.directions[index]).collect();
        self.best.add(&directions, &lengths, &values.denominator);
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
        self.family.at(&self.best.reduced())
    }

    /// The coordinates of the one member that is left.
    pub(super) fn coordinates(self) -> Result<Vec<Rational>, Impossible> {
        match self.directions.len() {
            0 => Ok(self.best.reduced()),
            directions => Err(Impossible::FreedomLeft { directions }),
        }
    }
}

impl LongVector {
    /// The residuals' values at this vector.
    fn residuals(&self, residuals: &[Residual]) -> LongVector {
        let short = residuals.iter().flat_map(|residual| residual.row.iter().chain([&residual.constant]));
        let scale = common_denominator(short);
        let value = |residual: &Residual| {
            let terms = residual.row.iter().zip(&self.numerators);
            let sum: BigInt = terms.map(|(slope, entry)| scaled(slope, &scale) * entry).sum();
            sum + scaled(&residual.constant, &scale) * &self.denominator
        };
        let numerators = residuals.iter().map(value).collect();
        LongVector { numerators, denominator: scale * &self.denominator }
    }

    /// Adds Σ lengthₖ / `over` · directionₖ; `over` is a multiple of the denominator.
    fn add(&mut self, directions: &[&Vec<Rational>], lengths: &[Rational], over: &BigInt) {
        let length_scale = common_denominator(lengths);
        let direction_scale = common_denominator(directions.iter().flat_map(|direction| direction.iter()));
        let lengths: Vec<BigInt> = lengths.iter().map(|length| scaled(length, &length_scale)).collect();
        let finer = over / &self.denominator * &length_scale * &direction_scale;
        for (index, entry) in self.numerators.iter_mut().enumerate() {
            let terms = directions.iter().zip(&lengths);
            let change: BigInt =
                terms.map(|(direction, length)| scaled(&direction[index], &direction_scale) * length).sum();
            *entry = &*entry * &finer + change;
        }
        self.denominator = over * length_scale * direction_scale;
    }

    fn reduced(&self) -> Vec<Rational> {
        let entry = |numerator: &BigInt| {
            Rational::new(numerator.clone(), self.denominator.clone()).expect("denominators are positive")
        };
        self.numerators.iter().map(entry).collect()
    }
}

/// Σ shortₖ longₖ, reduced once.
fn whole_dot(short: &[Rational], long: &[BigInt]) -> Rational {
    let scale = common_denominator(short);
    let sum: BigInt = short.iter().zip(long).map(|(factor, entry)| scaled(factor, &scale) * entry).sum();
    Rational::new(sum, scale).expect("common denominators are positive")
}

/// The sum over one common denominator, reduced once.
fn total(terms: Vec<Rational>) -> Rational {
    whole_dot(&terms, &vec![BigInt::one(); terms.len()])
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
