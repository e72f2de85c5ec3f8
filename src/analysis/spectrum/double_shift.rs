//! Eigenvalues of an upper Hessenberg matrix by QR steps with two shifts at once, in real arithmetic.
//!
//! The method of Francis (1961) as described by Martin, Peters & Wilkinson in the Handbook (Wilkinson & Reinsch 1971, II/14):
//! written from the description. Shifts are the eigenvalues of the last two by two block; every tenth step takes others.

use nalgebra::DMatrix;

use super::{Eigenvalue, NotConverged};

/// QR steps allowed between one eigenvalue found and the next.
const MOST_STEPS: usize = 90;
/// After so many steps without success the shifts are replaced once.
const PATIENCE: usize = 10;

/// Two shifts as the roots of (z − first)(z − second) = product.
#[derive(Clone, Copy)]
struct Shifts {
    first: f64,
    second: f64,
    product: f64,
}

/// I − scale · v vᵀ with v = (1, second, third).
struct Reflection {
    scale: f64,
    second: f64,
    third: f64,
    /// What the reflected vector has left in its first entry.
    image: f64,
}

/// All eigenvalues; entries below the subdiagonal are never read.
pub(super) fn eigenvalues(mut matrix: DMatrix<f64>) -> Result<Vec<Eigenvalue>, NotConverged> {
    let size = matrix.nrows();
    // What counts as nought where the diagonal entries nearby are nought themselves.
    let floor = matrix.norm();
    let mut found = Vec::with_capacity(size);
    let mut end = size;
    let mut steps = 0;
    while end > 0 {
        let start = unreduced_start(&mut matrix, end, floor);
        match end - start {
            1 => found.push((matrix[(start, start)], 0.0)),
            2 => found.extend(pair(last_block(&matrix, end))),
            _ => {
                steps += 1;
                if steps > MOST_STEPS {
                    return Err(NotConverged { size });
                }
                let shifts = if steps % PATIENCE == 0 {
                    unusual_shifts(&matrix, end)
                } else {
                    last_block(&matrix, end)
                };
                sweep(&mut matrix, start, end, shifts);
                continue;
            }
        }
        end = start;
        steps = 0;
    }
    Ok(found)
}

/// The first row of the last unreduced block among rows before `end`; the negligible entry above it is cleared.
fn unreduced_start(matrix: &mut DMatrix<f64>, end: usize, floor: f64) -> usize {
    for row in (1..end).rev() {
        let near = matrix[(row, row)].abs() + matrix[(row - 1, row - 1)].abs();
        let near = if near == 0.0 { floor } else { near };
        if matrix[(row, row - 1)].abs() <= f64::EPSILON * near {
            matrix[(row, row - 1)] = 0.0;
            return row;
        }
    }
    0
}

/// The eigenvalues of the last two by two block before `end`, as shifts.
fn last_block(matrix: &DMatrix<f64>, end: usize) -> Shifts {
    Shifts {
        first: matrix[(end - 1, end - 1)],
        second: matrix[(end - 2, end - 2)],
        product: matrix[(end - 1, end - 2)] * matrix[(end - 2, end - 1)],
    }
}

/// Shifts that break the symmetry on which the usual ones stand still: sum 3s/2 and product s² about the last diagonal entry.
fn unusual_shifts(matrix: &DMatrix<f64>, end: usize) -> Shifts {
    let size = matrix[(end - 1, end - 2)].abs() + matrix[(end - 2, end - 3)].abs();
    let centre = matrix[(end - 1, end - 1)] + 0.75 * size;
    Shifts { first: centre, second: centre, product: -0.4375 * size * size }
}

/// Both roots of (z − first)(z − second) = product; the smaller real one without cancellation.
fn pair(block: Shifts) -> [Eigenvalue; 2] {
    let half = 0.5 * (block.second - block.first);
    let discriminant = half * half + block.product;
    let root = discriminant.abs().sqrt();
    if discriminant < 0.0 {
        let middle = block.first + half;
        return [(middle, root), (middle, -root)];
    }
    let step = if half < 0.0 { half - root } else { half + root };
    let near = if step == 0.0 { block.first } else { block.first - block.product / step };
    [(block.first + step, 0.0), (near, 0.0)]
}

/// One step on the unreduced block of rows start … end − 1 (three rows or more): the first column of (A − z₁)(A − z₂) sets off a
/// bulge of three, which is chased down.
fn sweep(matrix: &mut DMatrix<f64>, start: usize, end: usize, shifts: Shifts) {
    let (top, mut vector) = bulge(matrix, start, end, shifts);
    for row in top..end - 1 {
        let height = 3.min(end - row);
        if row > top {
            vector = std::array::from_fn(|k| if k < height { matrix[(row + k, row - 1)] } else { 0.0 });
        }
        let Some(reflection) = Reflection::of(vector) else { continue };
        if row > top {
            matrix[(row, row - 1)] = reflection.image;
            for below in 1..height {
                matrix[(row + below, row - 1)] = 0.0;
            }
        } else if top > start {
            // The entries below are negligible products here; only the sign of the kept one changes.
            matrix[(row, row - 1)] = -matrix[(row, row - 1)];
        }
        reflection.on_rows(matrix, row, height, end);
        reflection.on_columns(matrix, row, height, start..(row + 4).min(end));
    }
}

/// Where the step may begin, and the first column of (A − z₁)(A − z₂) there up to a factor. It begins below two small subdiagonal
/// entries in a row, if the bulge would not notice what is above.
fn bulge(matrix: &DMatrix<f64>, start: usize, end: usize, shifts: Shifts) -> (usize, [f64; 3]) {
    let mut row = end - 3;
    loop {
        let here = matrix[(row, row)];
        let next = matrix[(row + 1, row + 1)];
        let below = matrix[(row + 1, row)];
        let vector = [
            ((shifts.first - here) * (shifts.second - here) - shifts.product) / below
                + matrix[(row, row + 1)],
            here + next - shifts.first - shifts.second,
            matrix[(row + 2, row + 1)],
        ];
        let size = vector.iter().map(|entry| entry.abs()).sum::<f64>();
        let vector = if size > 0.0 { vector.map(|entry| entry / size) } else { vector };
        if row == start {
            return (row, vector);
        }
        let lost = matrix[(row, row - 1)].abs() * (vector[1].abs() + vector[2].abs());
        let kept = vector[0].abs() * (matrix[(row - 1, row - 1)].abs() + here.abs() + next.abs());
        if lost <= f64::EPSILON * kept {
            return (row, vector);
        }
        row -= 1;
    }
}

impl Reflection {
    /// The reflection of the vector onto the first axis; nothing for nought.
    fn of(vector: [f64; 3]) -> Option<Reflection> {
        let size = vector.iter().map(|entry| entry.abs()).sum::<f64>();
        if size == 0.0 {
            return None;
        }
        let [a, b, c] = vector.map(|entry| entry / size);
        let length = (a * a + b * b + c * c).sqrt().copysign(a);
        let first = a + length;
        Some(Reflection { scale: first / length, second: b / first, third: c / first, image: -length * size })
    }

    /// On rows row … row + height − 1, columns from `row` to `end`.
    fn on_rows(&self, matrix: &mut DMatrix<f64>, row: usize, height: usize, end: usize) {
        for column in row..end {
            let mut entries = matrix.column_mut(column);
            if height == 3 {
                let total = self.scale
                    * (entries[row] + self.second * entries[row + 1] + self.third * entries[row + 2]);
                entries[row] -= total;
                entries[row + 1] -= total * self.second;
                entries[row + 2] -= total * self.third;
            } else {
                let total = self.scale * (entries[row] + self.second * entries[row + 1]);
                entries[row] -= total;
                entries[row + 1] -= total * self.second;
            }
        }
    }

    /// On columns column … column + width − 1, the given rows.
    fn on_columns(
        &self,
        matrix: &mut DMatrix<f64>,
        column: usize,
        width: usize,
        rows: std::ops::Range<usize>,
    ) {
        for row in rows {
            let third = if width == 3 { self.third * matrix[(row, column + 2)] } else { 0.0 };
            let total =
                self.scale * (matrix[(row, column)] + self.second * matrix[(row, column + 1)] + third);
            matrix[(row, column)] -= total;
            matrix[(row, column + 1)] -= total * self.second;
            if width == 3 {
                matrix[(row, column + 2)] -= total * self.third;
            }
        }
    }
}
