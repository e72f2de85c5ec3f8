//! Scaling of a matrix by a diagonal similarity, so that rounding is measured against rows and columns of like size.

use nalgebra::DMatrix;

/// Enough for any matrix met; each round only lowers the sum of magnitudes, so stopping early is harmless.
const MOST_ROUNDS: usize = 40;

/// A ← D⁻¹AD with D of powers of two (exact), until each row and column off the diagonal have sums within about a factor of two
/// (after Parlett & Reinsch 1969).
pub(super) fn scale(matrix: &mut DMatrix<f64>) {
    for _ in 0..MOST_ROUNDS {
        let mut settled = true;
        for index in 0..matrix.nrows() {
            if let Some(factor) = factor(matrix, index) {
                settled = false;
                matrix.column_mut(index).iter_mut().for_each(|entry| *entry *= factor);
                matrix.row_mut(index).iter_mut().for_each(|entry| *entry /= factor);
            }
        }
        if settled {
            return;
        }
    }
}

/// The power of two by which the column is to be multiplied and the row divided, where that lowers their sum by a twentieth.
fn factor(matrix: &DMatrix<f64>, index: usize) -> Option<f64> {
    let own = matrix[(index, index)].abs();
    let row = matrix.row(index).iter().map(|entry| entry.abs()).sum::<f64>() - own;
    let column = matrix.column(index).iter().map(|entry| entry.abs()).sum::<f64>() - own;
    if !(row > 0.0 && column > 0.0) {
        return None;
    }
    let factor = (0.5 * (row / column).log2()).round().clamp(-500.0, 500.0).exp2();
    (factor != 1.0 && column * factor + row / factor < 0.95 * (row + column)).then_some(factor)
}
