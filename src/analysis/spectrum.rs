//! Eigenvalues of small dense real matrices: numbers that are computed, never proved.
//!
//! The matrix is split into the strongly connected parts of its graph first (a chain of one-way couplings has its diagonal as
//! eigenvalues, exactly), each part is scaled by powers of two (Parlett & Reinsch 1969), reduced to Hessenberg form, and worked
//! down by QR steps with Wilkinson's shift (Wilkinson 1965), in complex arithmetic. Iterations are bounded: not converging is an answer.

use nalgebra::{Complex, DMatrix, Hessenberg};

/// A complex number as (real, imaginary).
pub type Eigenvalue = (f64, f64);

/// The QR steps did not settle on a part of this many unknowns.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct NotConverged {
    pub size: usize,
}

/// QR steps allowed for each eigenvalue.
const STEPS_EACH: usize = 90;

/// All eigenvalues of a square matrix given by rows, in no particular order. Entries must be finite.
pub fn eigenvalues(rows: &[Vec<f64>]) -> Result<Vec<Eigenvalue>, NotConverged> {
    let mut found = Vec::with_capacity(rows.len());
    for part in strong_parts(rows) {
        if let [single] = part.as_slice() {
            found.push((rows[*single][*single], 0.0));
            continue;
        }
        let mut matrix = DMatrix::from_fn(part.len(), part.len(), |i, j| rows[part[i]][part[j]]);
        scale(&mut matrix);
        let hessenberg = Hessenberg::new(matrix).unpack_h();
        found.extend(qr(hessenberg.map(|entry| Complex::new(entry, 0.0)))?);
    }
    Ok(found)
}

/// The largest magnitude among eigenvalues.
pub fn radius(eigenvalues: &[Eigenvalue]) -> f64 {
    eigenvalues.iter().map(|(re, im)| re.hypot(*im)).fold(0.0, f64::max)
}

/// The largest real part.
pub fn abscissa(eigenvalues: &[Eigenvalue]) -> f64 {
    eigenvalues.iter().map(|(re, _)| *re).fold(f64::NEG_INFINITY, f64::max)
}

/// What rounding can do to an eigenvalue of a matrix of this size and norm: n ε ‖A‖ for well-conditioned ones; the square root of
/// that, relative, for double ones.
pub fn rounding(rows: &[Vec<f64>]) -> f64 {
    let norm = rows.iter().flatten().map(|entry| entry * entry).sum::<f64>().sqrt();
    rows.len() as f64 * f64::EPSILON * norm
}

/// Strongly connected parts of the graph i → j where entry (i, j) is not zero (Tarjan 1972, without recursion).
fn strong_parts(rows: &[Vec<f64>]) -> Vec<Vec<usize>> {
    let size = rows.len();
    let mut index = vec![usize::MAX; size];
    let mut low = vec![0; size];
    let mut on_stack = vec![false; size];
    let mut stack = Vec::new();
    let mut parts = Vec::new();
    let mut next = 0;
    for root in 0..size {
        if index[root] != usize::MAX {
            continue;
        }
        let mut calls = vec![(root, 0)];
        while let Some((node, from)) = calls.pop() {
            if from == 0 {
                index[node] = next;
                low[node] = next;
                next += 1;
                stack.push(node);
                on_stack[node] = true;
            }
            let mut descended = false;
            for target in from..size {
                if target == node || rows[node][target] == 0.0 {
                    continue;
                }
                if index[target] == usize::MAX {
                    calls.push((node, target));
                    calls.push((target, 0));
                    descended = true;
                    break;
                }
                if on_stack[target] {
                    low[node] = low[node].min(low[target]);
                }
            }
            if descended {
                continue;
            }
            if low[node] == index[node] {
                let mut part = Vec::new();
                while let Some(member) = stack.pop() {
                    on_stack[member] = false;
                    part.push(member);
                    if member == node {
                        break;
                    }
                }
                part.sort_unstable();
                parts.push(part);
            }
        }
    }
    parts
}

/// Rows and columns are scaled by powers of two until their norms agree within a factor of two.
fn scale(matrix: &mut DMatrix<f64>) {
    let size = matrix.nrows();
    for _ in 0..32 {
        let mut settled = true;
        for i in 0..size {
            let (mut row, mut column) = (0.0, 0.0);
            for j in (0..size).filter(|j| *j != i) {
                row += matrix[(i, j)].abs();
                column += matrix[(j, i)].abs();
            }
            if row == 0.0 || column == 0.0 {
                continue;
            }
            let total = row + column;
            let exponent = (0.5 * (row / column).log2()).round().clamp(-500.0, 500.0);
            let factor = exponent.exp2();
            if factor != 1.0 && column * factor + row / factor < 0.95 * total {
                settled = false;
                for j in 0..size {
                    matrix[(j, i)] *= factor;
                }
                for j in 0..size {
                    matrix[(i, j)] /= factor;
                }
            }
        }
        if settled {
            return;
        }
    }
}

/// Eigenvalues of an upper Hessenberg matrix by shifted QR steps.
fn qr(mut h: DMatrix<Complex<f64>>) -> Result<Vec<Eigenvalue>, NotConverged> {
    let size = h.nrows();
    let mut found = Vec::with_capacity(size);
    let mut high = size;
    let mut steps = 0;
    while high > 0 {
        let low = active_low(&mut h, high);
        if low + 1 == high {
            let value = h[(high - 1, high - 1)];
            found.push((value.re, value.im));
            high -= 1;
            steps = 0;
            continue;
        }
        steps += 1;
        if steps > STEPS_EACH {
            return Err(NotConverged { size });
        }
        let shift = if steps % 10 == 0 {
            // Exceptional: away from any symmetry that keeps Wilkinson's shift from moving.
            let below = h[(high - 1, high - 2)].norm();
            let above = if high >= 3 { h[(high - 2, high - 3)].norm() } else { 0.0 };
            h[(high - 1, high - 1)] + Complex::new(0.75 * below + above, 0.4 * below)
        } else {
            wilkinson(&h, high)
        };
        step(&mut h, low, high, shift);
    }
    Ok(found)
}

/// The first row of the unreduced part that ends before `high`; negligible subdiagonal entries are set to zero.
fn active_low(h: &mut DMatrix<Complex<f64>>, high: usize) -> usize {
    let mut row = high - 1;
    while row > 0 {
        let near = h[(row, row)].norm() + h[(row - 1, row - 1)].norm();
        let measure = if near == 0.0 { f64::MIN_POSITIVE } else { near * f64::EPSILON };
        if h[(row, row - 1)].norm() <= measure {
            h[(row, row - 1)] = Complex::new(0.0, 0.0);
            return row;
        }
        row -= 1;
    }
    0
}

/// The eigenvalue of the last 2 × 2 block that lies closer to its last entry.
fn wilkinson(h: &DMatrix<Complex<f64>>, high: usize) -> Complex<f64> {
    let (a, b) = (h[(high - 2, high - 2)], h[(high - 2, high - 1)]);
    let (c, d) = (h[(high - 1, high - 2)], h[(high - 1, high - 1)]);
    let half = (a - d) * 0.5;
    let root = (half * half + b * c).sqrt();
    let (first, second) = (d + half + root, d + half - root);
    if (first - d).norm() < (second - d).norm() { first } else { second }
}

/// One QR step on rows and columns low … high − 1.
fn step(h: &mut DMatrix<Complex<f64>>, low: usize, high: usize, shift: Complex<f64>) {
    for k in low..high {
        h[(k, k)] -= shift;
    }
    let mut rotations = Vec::with_capacity(high - low);
    for k in low..high - 1 {
        let (a, b) = (h[(k, k)], h[(k + 1, k)]);
        let norm = a.norm().hypot(b.norm());
        let (c, s) =
            if norm == 0.0 { (Complex::new(1.0, 0.0), Complex::new(0.0, 0.0)) } else { (a / norm, b / norm) };
        for column in k..high {
            let (x, y) = (h[(k, column)], h[(k + 1, column)]);
            h[(k, column)] = c.conj() * x + s.conj() * y;
            h[(k + 1, column)] = c * y - s * x;
        }
        rotations.push((c, s));
    }
    for (offset, (c, s)) in rotations.into_iter().enumerate() {
        let k = low + offset;
        for row in low..(k + 2).min(high) {
            let (x, y) = (h[(row, k)], h[(row, k + 1)]);
            h[(row, k)] = x * c + y * s;
            h[(row, k + 1)] = y * c.conj() - x * s.conj();
        }
    }
    for k in low..high {
        h[(k, k)] += shift;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn matrix(size: usize, entry: impl Fn(usize, usize) -> f64) -> Vec<Vec<f64>> {
        (0..size).map(|i| (0..size).map(|j| entry(i, j)).collect()).collect()
    }

    fn sorted(mut values: Vec<Eigenvalue>) -> Vec<Eigenvalue> {
        values.sort_by(|a, b| a.partial_cmp(b).expect("finite"));
        values
    }

    /// −4 sin²(kπ/2(n+1)) (second difference with given ends, common practice).
    #[test]
    fn second_difference() {
        let size = 40;
        let found = sorted(
            eigenvalues(&matrix(size, |i, j| match i.abs_diff(j) {
                0 => -2.0,
                1 => 1.0,
                _ => 0.0,
            }))
            .expect("converges"),
        );
        for (index, (re, im)) in found.iter().enumerate() {
            let k = (size - index) as f64;
            let known = -4.0 * (k * std::f64::consts::PI / (2.0 * (size as f64 + 1.0))).sin().powi(2);
            assert!((re - known).abs() < 1e-12 && im.abs() < 1e-12, "{re} {im} {known}");
        }
    }

    /// A cyclic shift has the roots of unity (common practice); unshifted steps never settle on it.
    #[test]
    fn cyclic_shifts() {
        for size in 2..60 {
            let found = eigenvalues(&matrix(size, |i, j| f64::from(u8::from((i + 1) % size == j))))
                .expect("converges");
            assert_eq!(found.len(), size);
            for (re, im) in &found {
                assert!((re.hypot(*im) - 1.0).abs() < 1e-11, "{size}: {re} {im}");
                let power = (im.atan2(*re) * size as f64 / std::f64::consts::TAU).round();
                let angle = power * std::f64::consts::TAU / size as f64;
                assert!((re - angle.cos()).abs() < 1e-10 && (im - angle.sin()).abs() < 1e-10);
            }
        }
    }

    /// A chain of one-way couplings has its diagonal as eigenvalues, exactly.
    #[test]
    fn triangular_matrices_are_exact() {
        let found = eigenvalues(&matrix(30, |i, j| match (i, j) {
            _ if i == j => -1000.0,
            _ if i == j + 1 => 1000.0,
            _ => 0.0,
        }))
        .expect("converges");
        assert!(found.iter().all(|value| *value == (-1000.0, 0.0)));
    }

    /// Sums of eigenvalues and of their squares are the traces of A and A² (common practice).
    #[test]
    fn traces_of_integer_matrices() {
        let mut seed: u64 = 7;
        let mut next = || {
            seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            ((seed >> 33) % 3) as f64 - 1.0
        };
        for size in 3..25 {
            for _ in 0..20 {
                let entries: Vec<f64> = (0..size * size).map(|_| next()).collect();
                let a = matrix(size, |i, j| entries[i * size + j]);
                let found = eigenvalues(&a).expect("converges");
                let trace: f64 = (0..size).map(|i| a[i][i]).sum();
                let square: f64 = (0..size)
                    .flat_map(|i| (0..size).map(move |j| (i, j)))
                    .map(|(i, j)| a[i][j] * a[j][i])
                    .sum();
                let sum: f64 = found.iter().map(|(re, _)| re).sum();
                let squares: f64 = found.iter().map(|(re, im)| re * re - im * im).sum();
                assert!(
                    (sum - trace).abs() < 1e-9 && (squares - square).abs() < 1e-8,
                    "{size}: {sum} {trace}"
                );
            }
        }
    }
}
