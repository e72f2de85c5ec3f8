//! Rational matrices: linear systems with their free directions, exact least squares, and LDLᵀ of
//! semidefinite matrices.
//!
//! Elimination runs without fractions on integers (Bareiss 1968): rows are scaled to integers first and
//! every division that occurs is exact. Gauss on reduced fractions is hundreds of times slower at the sizes
//! met here. Indices out of range are mistakes of the program and panic, as for slices.

use std::fmt;
use std::ops::{Index, IndexMut};

use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::{One, Signed, Zero};

use super::Rational;

/// A dense matrix of rationals, stored row after row.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Matrix {
    rows: usize,
    columns: usize,
    entries: Vec<Rational>,
}

/// All solutions of a linear system: `particular` plus any combination of `directions`.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct AffineSolution {
    /// One solution: the one whose free unknowns are nought.
    pub particular: Vec<Rational>,
    /// A basis of the null space; direction `k` has a one at unknown `free[k]` and noughts at the other
    /// free ones.
    pub directions: Vec<Vec<Rational>>,
    /// The free unknowns, ascending.
    pub free: Vec<usize>,
}

/// The system has no solution.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Inconsistent;

/// The system has no solution, or more than one.
#[derive(Clone, Copy, PartialEq, Eq, Debug)]
pub struct Singular;

/// The matrix is not symmetric positive semidefinite.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct NotSemidefinite {
    /// The step of the elimination at which it shows.
    pub index: usize,
    /// The negative pivot, or nought where a nought pivot has a row that is not nought.
    pub pivot: Rational,
}

/// `A = L D Lᵀ` with a unit lower triangle `L` and a diagonal `D ≥ 0`.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct SemidefiniteFactors {
    /// The unit lower triangle.
    pub lower: Matrix,
    /// The diagonal of `D`; every entry is nought or positive.
    pub diagonal: Vec<Rational>,
}

/// One term of a least-squares problem: `weight · (row · x + constant)²`.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Residual {
    /// Coefficients of the unknowns.
    pub row: Vec<Rational>,
    /// What is added.
    pub constant: Rational,
    /// A positive weight.
    pub weight: Rational,
}

/// A reduced row echelon form over a common denominator.
struct Echelon {
    rows: Vec<Vec<BigInt>>,
    pivots: Vec<usize>,
    denominator: BigInt,
}

impl Matrix {
    /// A matrix of noughts.
    pub fn zeros(rows: usize, columns: usize) -> Matrix {
        Matrix { rows, columns, entries: vec![Rational::zero(); rows * columns] }
    }

    /// The identity of size `n`.
    pub fn identity(n: usize) -> Matrix {
        let mut matrix = Matrix::zeros(n, n);
        for index in 0..n {
            matrix[(index, index)] = Rational::one();
        }
        matrix
    }

    /// A matrix from its rows, or nothing if they differ in length.
    pub fn from_rows(rows: Vec<Vec<Rational>>) -> Option<Matrix> {
        let columns = rows.first().map_or(0, Vec::len);
        if rows.iter().any(|row| row.len() != columns) {
            return None;
        }
        Some(Matrix { rows: rows.len(), columns, entries: rows.into_iter().flatten().collect() })
    }

    /// How many rows.
    pub fn rows(&self) -> usize {
        self.rows
    }

    /// How many columns.
    pub fn columns(&self) -> usize {
        self.columns
    }

    /// Row `index`.
    pub fn row(&self, index: usize) -> &[Rational] {
        &self.entries[index * self.columns..(index + 1) * self.columns]
    }

    /// The transpose.
    pub fn transposed(&self) -> Matrix {
        let mut result = Matrix::zeros(self.columns, self.rows);
        for row in 0..self.rows {
            for column in 0..self.columns {
                result[(column, row)] = self[(row, column)].clone();
            }
        }
        result
    }

    /// `self · vector`.
    pub fn times_vector(&self, vector: &[Rational]) -> Vec<Rational> {
        (0..self.rows).map(|row| Rational::dot(self.row(row), vector)).collect()
    }

    /// `self · other`, or nothing if the sizes do not meet.
    pub fn times(&self, other: &Matrix) -> Option<Matrix> {
        if self.columns != other.rows {
            return None;
        }
        let columns = other.transposed();
        let mut result = Matrix::zeros(self.rows, other.columns);
        for row in 0..self.rows {
            for column in 0..other.columns {
                result[(row, column)] = Rational::dot(self.row(row), columns.row(column));
            }
        }
        Some(result)
    }

    /// Whether the matrix equals its transpose.
    pub fn is_symmetric(&self) -> bool {
        self.rows == self.columns
            && (0..self.rows).all(|row| (0..row).all(|column| self[(row, column)] == self[(column, row)]))
    }

    /// The rank.
    pub fn rank(&self) -> usize {
        self.echelon(None).pivots.len()
    }

    /// All `x` with `self · x = right_side`.
    pub fn solve_affine(&self, right_side: &[Rational]) -> Result<AffineSolution, Inconsistent> {
        assert_eq!(right_side.len(), self.rows, "a right side has one entry a row");
        let echelon = self.echelon(Some(right_side));
        if echelon.pivots.last() == Some(&self.columns) {
            return Err(Inconsistent);
        }
        let entry = |row: usize, column: usize| {
            Rational::new(echelon.rows[row][column].clone(), echelon.denominator.clone())
                .expect("the pivot of an echelon form is not zero")
        };
        let mut particular = vec![Rational::zero(); self.columns];
        for (row, &pivot) in echelon.pivots.iter().enumerate() {
            particular[pivot] = entry(row, self.columns);
        }
        let free: Vec<usize> = (0..self.columns).filter(|column| !echelon.pivots.contains(column)).collect();
        let mut directions = Vec::with_capacity(free.len());
        for &unknown in &free {
            let mut direction = vec![Rational::zero(); self.columns];
            direction[unknown] = Rational::one();
            for (row, &pivot) in echelon.pivots.iter().enumerate() {
                direction[pivot] = -entry(row, unknown);
            }
            directions.push(direction);
        }
        Ok(AffineSolution { particular, directions, free })
    }

    /// The one `x` with `self · x = right_side`.
    pub fn solve(&self, right_side: &[Rational]) -> Result<Vec<Rational>, Singular> {
        match self.solve_affine(right_side) {
            Ok(solution) if solution.directions.is_empty() => Ok(solution.particular),
            _ => Err(Singular),
        }
    }

    /// The reduced row echelon form of `self`, extended by a right side if there is one.
    fn echelon(&self, right_side: Option<&[Rational]>) -> Echelon {
        let width = self.columns + usize::from(right_side.is_some());
        let mut rows: Vec<Vec<BigInt>> = (0..self.rows)
            .map(|row| {
                let extra = right_side.map(|side| &side[row]);
                integer_row(self.row(row).iter().chain(extra))
            })
            .collect();
        let mut pivots = Vec::new();
        let mut previous = BigInt::one();
        for column in 0..width {
            let next = pivots.len();
            let Some(found) = (next..rows.len()).find(|&row| !rows[row][column].is_zero()) else {
                continue;
            };
            rows.swap(next, found);
            eliminate_column(&mut rows, next, column, &previous);
            previous = rows[next][column].clone();
            pivots.push(column);
        }
        Echelon { rows, pivots, denominator: previous }
    }

    /// Factors a symmetric positive semidefinite matrix, or says where it fails to be one. The proof is
    /// exact in both directions.
    pub fn semidefinite_factors(&self) -> Result<SemidefiniteFactors, NotSemidefinite> {
        if !self.is_symmetric() {
            return Err(NotSemidefinite { index: 0, pivot: Rational::zero() });
        }
        let size = self.rows;
        let scale = common_denominator(&self.entries);
        let mut work: Vec<Vec<BigInt>> =
            (0..size).map(|row| self.row(row).iter().map(|entry| scaled(entry, &scale)).collect()).collect();
        let mut lower = Matrix::identity(size);
        let mut diagonal = Vec::with_capacity(size);
        let mut previous = BigInt::one();
        for step in 0..size {
            let pivot = work[step][step].clone();
            let over = &previous * &scale;
            let value = Rational::new(pivot.clone(), over).expect("pivots and scales are not zero");
            let row_is_zero = work[step][step + 1..].iter().all(Zero::is_zero);
            if pivot.is_negative() || (pivot.is_zero() && !row_is_zero) {
                return Err(NotSemidefinite { index: step, pivot: value });
            }
            diagonal.push(value);
            if pivot.is_zero() {
                continue;
            }
            for row in step + 1..size {
                lower[(row, step)] = Rational::new(work[row][step].clone(), pivot.clone())
                    .expect("the pivot was just seen to be positive");
            }
            let (done, rest) = work.split_at_mut(step + 1);
            for row in rest {
                reduce_row(row, &done[step], step, &pivot, &previous);
            }
            previous = pivot;
        }
        Ok(SemidefiniteFactors { lower, diagonal })
    }
}

/// Clears `column` in every row but the `pivot_row`, all rows staying integer.
fn eliminate_column(rows: &mut [Vec<BigInt>], pivot_row: usize, column: usize, previous: &BigInt) {
    let source = rows[pivot_row].clone();
    let pivot = source[column].clone();
    for (index, row) in rows.iter_mut().enumerate() {
        if index != pivot_row {
            reduce_row(row, &source, column, &pivot, previous);
        }
    }
}

/// `row ← (pivot · row − row[column] · source) / previous`; Sylvester's identity makes the division exact.
fn reduce_row(row: &mut [BigInt], source: &[BigInt], column: usize, pivot: &BigInt, previous: &BigInt) {
    let factor = row[column].clone();
    for (entry, above) in row.iter_mut().zip(source) {
        if factor.is_zero() || above.is_zero() {
            if !entry.is_zero() {
                *entry = &*entry * pivot / previous;
            }
        } else {
            *entry = (&*entry * pivot - &factor * above) / previous;
        }
    }
}

/// The row times the least common denominator, divided by the greatest common factor.
fn integer_row<'a>(entries: impl Iterator<Item = &'a Rational>) -> Vec<BigInt> {
    let entries: Vec<&Rational> = entries.collect();
    let scale = common_denominator(entries.iter().copied());
    let mut row: Vec<BigInt> = entries.iter().map(|entry| scaled(entry, &scale)).collect();
    let common = row.iter().fold(BigInt::zero(), |common, entry| common.gcd(entry));
    if !common.is_zero() && !common.is_one() {
        for entry in &mut row {
            *entry /= &common;
        }
    }
    row
}

/// The least common denominator of the entries; one for none.
pub fn common_denominator<'a>(entries: impl IntoIterator<Item = &'a Rational>) -> BigInt {
    entries.into_iter().fold(BigInt::one(), |scale, entry| {
        if (&scale % entry.denominator()).is_zero() { scale } else { scale.lcm(entry.denominator()) }
    })
}

/// `entry · scale` as an integer; `scale` is a multiple of the denominator.
pub fn scaled(entry: &Rational, scale: &BigInt) -> BigInt {
    entry.numerator() * (scale / entry.denominator())
}

impl AffineSolution {
    /// The member of the family with these coordinates along the directions.
    pub fn at(&self, coordinates: &[Rational]) -> Vec<Rational> {
        combination(&self.particular, &self.directions, coordinates)
    }

    /// The members that make `Σ weight · (row · x + constant)²` least, exactly. Weights must be positive.
    pub fn least_squares(&self, residuals: &[Residual]) -> AffineSolution {
        let size = self.directions.len();
        let mut normal = Matrix::zeros(size, size);
        let mut right_side = vec![Rational::zero(); size];
        for residual in residuals {
            let value = Rational::dot(&residual.row, &self.particular) + &residual.constant;
            let slopes: Vec<Rational> =
                self.directions.iter().map(|direction| Rational::dot(&residual.row, direction)).collect();
            for row in 0..size {
                let weighted = &slopes[row] * &residual.weight;
                right_side[row] -= &weighted * &value;
                for column in 0..size {
                    normal[(row, column)] += &weighted * &slopes[column];
                }
            }
        }
        let coordinates = normal.solve_affine(&right_side).expect("normal equations always have a solution");
        let origin = vec![Rational::zero(); self.particular.len()];
        AffineSolution {
            particular: self.at(&coordinates.particular),
            directions: coordinates
                .directions
                .iter()
                .map(|direction| combination(&origin, &self.directions, direction))
                .collect(),
            free: coordinates.free.iter().map(|&index| self.free[index]).collect(),
        }
    }
}

/// `origin + Σ coordinateₖ directionₖ`.
fn combination(origin: &[Rational], directions: &[Vec<Rational>], coordinates: &[Rational]) -> Vec<Rational> {
    let mut sum = origin.to_vec();
    for (direction, coordinate) in directions.iter().zip(coordinates) {
        for (entry, slope) in sum.iter_mut().zip(direction) {
            if !slope.is_zero() && !coordinate.is_zero() {
                *entry += slope * coordinate;
            }
        }
    }
    sum
}

impl Index<(usize, usize)> for Matrix {
    type Output = Rational;
    fn index(&self, (row, column): (usize, usize)) -> &Rational {
        assert!(column < self.columns, "column {column} of a matrix with {}", self.columns);
        &self.entries[row * self.columns + column]
    }
}

impl IndexMut<(usize, usize)> for Matrix {
    fn index_mut(&mut self, (row, column): (usize, usize)) -> &mut Rational {
        assert!(column < self.columns, "column {column} of a matrix with {}", self.columns);
        &mut self.entries[row * self.columns + column]
    }
}

impl fmt::Display for Inconsistent {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str("the linear system has no solution")
    }
}

impl std::error::Error for Inconsistent {}

impl fmt::Display for Singular {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str("the linear system has no single solution")
    }
}

impl std::error::Error for Singular {}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn matrix(rows: &[&[i64]]) -> Matrix {
        Matrix::from_rows(rows.iter().map(|row| row.iter().map(|&entry| entry.into()).collect()).collect())
            .expect("the test's rows have one length")
    }

    fn vector(entries: &[i64]) -> Vec<Rational> {
        entries.iter().map(|&entry| entry.into()).collect()
    }

    #[test]
    fn a_regular_system_has_one_solution() {
        let system = matrix(&[&[2, 1, 0], &[1, 3, 1], &[0, 1, 4]]);
        let solution = system.solve(&vector(&[1, 2, 3])).expect("regular");
        assert_eq!(system.times_vector(&solution), vector(&[1, 2, 3]));
        assert_eq!(system.rank(), 3);
    }

    #[test]
    fn free_directions_and_contradictions_are_found() {
        let system = matrix(&[&[1, 2, 3], &[2, 4, 6]]);
        let solution = system.solve_affine(&vector(&[1, 2])).expect("consistent");
        assert_eq!(solution.free, [1, 2]);
        assert_eq!(solution.particular, vector(&[1, 0, 0]));
        assert_eq!(solution.directions[0], vector(&[-2, 1, 0]));
        assert_eq!(system.solve_affine(&vector(&[1, 3])), Err(Inconsistent));
        assert_eq!(system.solve(&vector(&[1, 2])), Err(Singular));
    }

    #[test]
    fn least_squares_is_the_projection() {
        // The point of the plane x + y + z = 3 that is nearest to (1, 2, 6) under unit weights.
        let plane = matrix(&[&[1, 1, 1]]).solve_affine(&vector(&[3])).expect("consistent");
        let residuals: Vec<Residual> = [1, 2, 6]
            .iter()
            .enumerate()
            .map(|(index, &target)| Residual {
                row: Matrix::identity(3).row(index).to_vec(),
                constant: Rational::from(-target),
                weight: Rational::one(),
            })
            .collect();
        let nearest = plane.least_squares(&residuals);
        assert!(nearest.directions.is_empty());
        assert_eq!(nearest.particular, vector(&[-1, 0, 4]));
    }

    #[test]
    fn semidefinite_matrices_factor_and_others_do_not() {
        let chain = matrix(&[&[1, -1, 0], &[-1, 2, -1], &[0, -1, 1]]);
        let factors = chain.semidefinite_factors().expect("semidefinite");
        assert_eq!(factors.diagonal, vector(&[1, 1, 0]));
        let indefinite = matrix(&[&[1, 2], &[2, 1]]);
        let fault = indefinite.semidefinite_factors().expect_err("indefinite");
        assert_eq!((fault.index, fault.pivot), (1, Rational::from(-3)));
        assert!(matrix(&[&[0, 1], &[1, 0]]).semidefinite_factors().is_err());
        assert!(matrix(&[&[1, 2], &[0, 1]]).semidefinite_factors().is_err());
        assert!(matrix(&[&[0, 0], &[0, 1]]).semidefinite_factors().is_ok());
    }

    proptest! {
        #[test]
        fn solutions_solve(entries in prop::collection::vec(-9_i64..10, 20), known in prop::collection::vec(-9_i64..10, 5)) {
            let system = Matrix::from_rows(entries.chunks(5).map(vector).collect()).expect("rows of five");
            let right_side = system.times_vector(&vector(&known));
            let solution = system.solve_affine(&right_side).expect("made to be consistent");
            prop_assert_eq!(system.times_vector(&solution.particular), right_side);
            prop_assert_eq!(solution.directions.len() + system.rank(), 5);
            for direction in &solution.directions {
                prop_assert!(system.times_vector(direction).iter().all(Rational::is_zero));
            }
        }

        #[test]
        fn gram_matrices_are_semidefinite_and_factors_multiply_back(entries in prop::collection::vec(-5_i64..6, 12)) {
            let factor = Matrix::from_rows(entries.chunks(4).map(vector).collect()).expect("rows of four");
            let gram = factor.transposed().times(&factor).expect("sizes meet");
            let factors = gram.semidefinite_factors().expect("a Gram matrix");
            let mut scaled = factors.lower.transposed();
            for row in 0..4 {
                for column in 0..4 {
                    scaled[(row, column)] = &factors.diagonal[row] * &scaled[(row, column)];
                }
            }
            prop_assert_eq!(factors.lower.times(&scaled).expect("sizes meet"), gram);
        }
    }
}
