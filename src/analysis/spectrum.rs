//! Eigenvalues of small dense real matrices: numbers that are computed, never proved.
//!
//! A matrix is split into the strongly connected parts of its graph first (a chain of one-way couplings has its diagonal as
//! eigenvalues, exactly), each part is scaled by powers of two, reduced to Hessenberg form, and worked down by QR steps with
//! two shifts at once. The work is bounded: not converging is an answer. What eigenvalues mean is said elsewhere.

mod double_shift;
mod parts;
mod scaling;
#[cfg(test)]
mod tests;

use nalgebra::{DMatrix, Hessenberg, SymmetricEigen};

/// A square matrix by rows.
pub type Rows = Vec<Vec<f64>>;

/// A complex number as (real, imaginary).
pub type Eigenvalue = (f64, f64);

/// The iteration did not settle on a part of this many unknowns (or the matrix is not square, or not finite).
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct NotConverged {
    /// Unknowns of the part.
    pub size: usize,
}

/// Sweeps allowed for each unknown of a symmetric matrix.
const SYMMETRIC_SWEEPS_EACH: usize = 60;

/// All eigenvalues of a square matrix given by rows, in no particular order; complex ones in conjugate pairs.
pub fn eigenvalues(rows: &[Vec<f64>]) -> Result<Vec<Eigenvalue>, NotConverged> {
    let whole = NotConverged { size: rows.len() };
    if !is_sound(rows) {
        return Err(whole);
    }
    let mut found = Vec::with_capacity(rows.len());
    for part in parts::strongly_connected(rows) {
        if let [single] = part.as_slice() {
            found.push((rows[*single][*single], 0.0));
            continue;
        }
        let mut matrix = DMatrix::from_fn(part.len(), part.len(), |i, j| rows[part[i]][part[j]]);
        scaling::scale(&mut matrix);
        found.extend(double_shift::eigenvalues(Hessenberg::new(matrix).unpack_h())?);
    }
    Ok(found)
}

/// All eigenvalues of a symmetric matrix, ascending. Only the lower triangle is read.
pub fn symmetric_eigenvalues(rows: &[Vec<f64>]) -> Result<Vec<f64>, NotConverged> {
    let size = rows.len();
    if !is_sound(rows) {
        return Err(NotConverged { size });
    }
    if size == 0 {
        return Ok(Vec::new());
    }
    let matrix = DMatrix::from_fn(size, size, |i, j| if i >= j { rows[i][j] } else { rows[j][i] });
    let decomposition = SymmetricEigen::try_new(matrix, f64::EPSILON, SYMMETRIC_SWEEPS_EACH * size)
        .ok_or(NotConverged { size })?;
    let mut values: Vec<f64> = decomposition.eigenvalues.iter().copied().collect();
    values.sort_by(f64::total_cmp);
    Ok(values)
}

/// The largest growth rate of uᵀHu/2 over uᵀHu under u_t = A u, H = diag(weights), all positive: an upper bound of every real
/// part, and unlike eigenvalues a bound of growth at every time (the numerical abscissa in that norm).
pub fn energy_growth(rows: &[Vec<f64>], weights: &[f64]) -> Result<f64, NotConverged> {
    let size = rows.len();
    if weights.len() != size || !is_sound(rows) || !weights.iter().all(|weight| *weight > 0.0) {
        return Err(NotConverged { size });
    }
    // H^{1/2} A H^{-1/2}, its symmetric part.
    let entry = |i: usize, j: usize| rows[i][j] * (weights[i] / weights[j]).sqrt();
    let symmetric: Rows =
        (0..size).map(|i| (0..size).map(|j| 0.5 * (entry(i, j) + entry(j, i))).collect()).collect();
    Ok(symmetric_eigenvalues(&symmetric)?.last().copied().unwrap_or(f64::NEG_INFINITY))
}

/// The largest magnitude among eigenvalues.
pub fn radius(eigenvalues: &[Eigenvalue]) -> f64 {
    eigenvalues.iter().map(|(re, im)| re.hypot(*im)).fold(0.0, f64::max)
}

/// The largest real part.
pub fn abscissa(eigenvalues: &[Eigenvalue]) -> f64 {
    eigenvalues.iter().map(|(re, _)| *re).fold(f64::NEG_INFINITY, f64::max)
}

/// What rounding can do to a well-conditioned eigenvalue: n ε ‖A‖_F. For a double eigenvalue it is the square root of that,
/// relative to the radius.
pub fn rounding(rows: &[Vec<f64>]) -> f64 {
    rows.len() as f64 * f64::EPSILON * rows.iter().flatten().map(|entry| entry * entry).sum::<f64>().sqrt()
}

/// factor · n ε ‖A‖_F: below it a real part has no sign.
pub fn tolerance(factor: f64, rows: &[Vec<f64>]) -> f64 {
    factor * rounding(rows)
}

fn is_sound(rows: &[Vec<f64>]) -> bool {
    rows.iter().all(|row| row.len() == rows.len() && row.iter().all(|entry| entry.is_finite()))
}
