//! Spectra against closed forms and invariants.

use std::f64::consts::{PI, TAU};

use super::*;

fn matrix(size: usize, entry: impl Fn(usize, usize) -> f64) -> Rows {
    (0..size).map(|i| (0..size).map(|j| entry(i, j)).collect()).collect()
}

fn found(rows: &Rows) -> Vec<Eigenvalue> {
    let values = eigenvalues(rows).expect("converges");
    assert_eq!(values.len(), rows.len());
    values
}

/// The largest distance of a known eigenvalue to the computed one that is matched with it, each used once.
fn distance(rows: &Rows, known: &[Eigenvalue]) -> f64 {
    let mut open = found(rows);
    assert_eq!(open.len(), known.len());
    let mut worst: f64 = 0.0;
    for (re, im) in known {
        let away = |value: &Eigenvalue| (value.0 - re).hypot(value.1 - im);
        let nearest = (0..open.len())
            .min_by(|a, b| away(&open[*a]).total_cmp(&away(&open[*b])))
            .expect("as many as known");
        worst = worst.max(away(&open[nearest]));
        open.swap_remove(nearest);
    }
    worst
}

/// Tridiagonal Toeplitz: a + 2 √(bc) cos(kπ/(n+1)), real for bc > 0, on a vertical line for bc < 0 (common practice). The condition
/// of the eigenvectors is (b/c)^(n/2), so b and c are kept alike.
#[test]
fn tridiagonal_toeplitz() {
    for (below, above) in [(1.0, 1.0), (1.1, 1.0 / 1.1), (-1.0, 1.0), (-0.9, 1.1)] {
        for size in [2, 3, 5, 10, 31, 60] {
            let rows = matrix(size, |i, j| match (i + 1, j + 1) {
                (a, b) if a == b => -2.0,
                (a, b) if a == b + 1 => below,
                (a, b) if a + 1 == b => above,
                _ => 0.0,
            });
            let product: f64 = below * above;
            let known: Vec<Eigenvalue> = (1..=size)
                .map(|k| {
                    let part = 2.0 * product.abs().sqrt() * (k as f64 * PI / (size as f64 + 1.0)).cos();
                    if product > 0.0 { (-2.0 + part, 0.0) } else { (-2.0, part) }
                })
                .collect();
            assert!(distance(&rows, &known) < 1e-11, "{below} {above} {size}: {}", distance(&rows, &known));
        }
    }
}

/// Circulants: Σ c_k ω^{kj} (common practice). The fourth-order first derivative on a periodic axis.
#[test]
fn circulants() {
    for size in [5, 8, 13, 40, 61, 120] {
        let weights = [(1, 2.0 / 3.0), (2, -1.0 / 12.0)];
        let rows = matrix(size, |i, j| {
            weights
                .iter()
                .map(|(k, weight)| {
                    let up = f64::from(u8::from((i + k) % size == j));
                    let down = f64::from(u8::from((j + k) % size == i));
                    weight * (up - down)
                })
                .sum()
        });
        let known: Vec<Eigenvalue> = (0..size)
            .map(|j| {
                let angle = TAU * j as f64 / size as f64;
                (
                    0.0,
                    weights
                        .iter()
                        .map(|(k, weight)| 2.0 * weight * (f64::from(*k as u8) * angle).sin())
                        .sum(),
                )
            })
            .collect();
        assert!(distance(&rows, &known) < 1e-11, "{size}: {}", distance(&rows, &known));
    }
}

/// A cyclic shift has the roots of unity; steps with the usual shifts alone never settle on it.
#[test]
fn cyclic_shifts() {
    for size in 2..=60 {
        let rows = matrix(size, |i, j| f64::from(u8::from((i + 1) % size == j)));
        let known: Vec<Eigenvalue> =
            (0..size).map(|k| TAU * k as f64 / size as f64).map(|angle| (angle.cos(), angle.sin())).collect();
        assert!(distance(&rows, &known) < 1e-11, "{size}: {}", distance(&rows, &known));
    }
}

/// A chain of one-way couplings (a Jordan block) has its diagonal as eigenvalues, exactly, whatever the order of the unknowns.
#[test]
fn jordan_blocks_are_exact() {
    for stride in [1, 7, 11] {
        let place = |i: usize| i * stride % 30;
        let mut rows = matrix(30, |_, _| 0.0);
        for i in 0..30 {
            rows[place(i)][place(i)] = -1000.0;
            if i > 0 {
                rows[place(i)][place(i - 1)] = 1000.0;
            }
        }
        assert!(found(&rows).iter().all(|value| *value == (-1000.0, 0.0)));
    }
}

/// Companion matrices of Π(z − r): a 2 × 2 with complex roots, one with a wide range of roots, and Chebyshev roots.
#[test]
fn companion_matrices() {
    let companion = |roots: &[f64]| {
        let mut polynomial = vec![1.0];
        for root in roots {
            let mut next = vec![0.0; polynomial.len() + 1];
            for (power, coefficient) in polynomial.iter().enumerate() {
                next[power + 1] += coefficient;
                next[power] -= coefficient * root;
            }
            polynomial = next;
        }
        let size = roots.len();
        matrix(size, |i, j| match () {
            () if i == 0 => -polynomial[size - 1 - j],
            () if i == j + 1 => 1.0,
            () => 0.0,
        })
    };
    for roots in [vec![1.0, -1.0, 2.0, -2.0, 3.0], vec![1e-3, 1.0, 1e3, -1e4], vec![0.5; 2]] {
        let known: Vec<Eigenvalue> = roots.iter().map(|root| (*root, 0.0)).collect();
        let scale = roots.iter().fold(0.0_f64, |largest, root| largest.max(root.abs()));
        assert!(distance(&companion(&roots), &known) < 1e-7 * scale, "{roots:?}");
    }
    let chebyshev: Vec<f64> = (0..11).map(|k| ((2 * k + 1) as f64 * PI / 22.0).cos()).collect();
    let known: Vec<Eigenvalue> = chebyshev.iter().map(|root| (*root, 0.0)).collect();
    assert!(distance(&companion(&chebyshev), &known) < 1e-9);
    assert!(distance(&vec![vec![1.0, -5.0], vec![1.0, -1.0]], &[(0.0, 2.0), (0.0, -2.0)]) < 1e-14);
}

/// Sums of eigenvalues, of their squares and of their cubes are the traces of A, A² and A³ (common practice).
#[test]
fn traces_of_integer_matrices() {
    let mut seed: u64 = 20;
    let mut draw = |below: u64| {
        seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (seed >> 33) % below
    };
    for size in 3..=24 {
        for sample in 0..60 {
            // Full, sparse, and of noughts and ones by turns.
            let entries: Vec<f64> = (0..size * size)
                .map(|_| match sample % 3 {
                    0 => draw(3) as f64 - 1.0,
                    1 => [0.0, 0.0, 0.0, 1.0, -1.0][draw(5) as usize],
                    _ => draw(2) as f64,
                })
                .collect();
            let rows = matrix(size, |i, j| entries[i * size + j]);
            let product =
                |a: &Rows, b: &Rows| matrix(size, |i, j| (0..size).map(|k| a[i][k] * b[k][j]).sum());
            let square = product(&rows, &rows);
            let cube = product(&square, &rows);
            let trace = |a: &Rows| (0..size).map(|i| a[i][i]).sum::<f64>();
            let values = found(&rows);
            let total =
                |of: &dyn Fn(f64, f64) -> f64| values.iter().map(|(re, im)| of(*re, *im)).sum::<f64>();
            let scale = 1.0 + radius(&values).powi(3) * size as f64;
            assert!((total(&|re, _| re) - trace(&rows)).abs() < 1e-11 * scale, "{size}");
            assert!((total(&|re, im| re * re - im * im) - trace(&square)).abs() < 1e-11 * scale, "{size}");
            assert!(
                (total(&|re, im| re * re * re - 3.0 * re * im * im) - trace(&cube)).abs() < 1e-11 * scale,
                "{size}"
            );
            assert!(total(&|_, im| im).abs() < 1e-12 * scale, "conjugate pairs, {size}");
        }
    }
}

/// −4 sin²(kπ/2N) (Smith 1985, common practice): both solvers on the second difference.
#[test]
fn symmetric_matrices() {
    let size = 39;
    let rows = matrix(size, |i, j| match i.abs_diff(j) {
        0 => -2.0,
        1 => 1.0,
        _ => 0.0,
    });
    let known: Vec<f64> = (1..=size)
        .rev()
        .map(|k| -4.0 * (k as f64 * PI / (2.0 * (size as f64 + 1.0))).sin().powi(2))
        .collect();
    let values = symmetric_eigenvalues(&rows).expect("converges");
    assert!(values.iter().zip(&known).all(|(value, known)| (value - known).abs() < 1e-12));
    let as_pairs: Vec<Eigenvalue> = known.iter().map(|value| (*value, 0.0)).collect();
    assert!(distance(&rows, &as_pairs) < 1e-12);
    let flat = vec![1.0; size];
    let growth = energy_growth(&rows, &flat).expect("converges");
    assert!((growth - known[size - 1]).abs() < 1e-12);
}

/// A nilpotent coupling has eigenvalues 0 but grows at rate 5 in the flat norm; a weight that tells the unknowns apart shows less.
#[test]
fn energy_growth_sees_what_eigenvalues_do_not() {
    let rows = vec![vec![0.0, 10.0], vec![0.0, 0.0]];
    assert_eq!(abscissa(&found(&rows)), 0.0);
    assert!((energy_growth(&rows, &[1.0, 1.0]).expect("converges") - 5.0).abs() < 1e-14);
    assert!((energy_growth(&rows, &[1.0, 100.0]).expect("converges") - 0.5).abs() < 1e-14);
}

#[test]
fn what_is_no_matrix_is_a_finding() {
    let endless = vec![vec![1.0, f64::NAN], vec![0.0, 1.0]];
    assert_eq!(eigenvalues(&endless), Err(NotConverged { size: 2 }));
    assert_eq!(symmetric_eigenvalues(&endless), Err(NotConverged { size: 2 }));
    assert_eq!(eigenvalues(&[vec![1.0, 2.0]]), Err(NotConverged { size: 1 }));
    assert!(energy_growth(&[vec![1.0]], &[-1.0]).is_err());
    assert_eq!(eigenvalues(&[]), Ok(Vec::new()));
    let overflowing = vec![vec![1e308, 1e308], vec![-1e308, 1e308]];
    // Either answer is honest; what matters is that it ends and is not called a finite spectrum of something else.
    assert!(eigenvalues(&overflowing).map_or(true, |values| values.len() == 2));
}

#[test]
fn tolerance_scales_with_size_and_norm() {
    let rows = matrix(4, |i, j| if i == j { 3.0 } else { 0.0 });
    assert!((rounding(&rows) - 4.0 * f64::EPSILON * 6.0).abs() < 1e-28);
    assert!((tolerance(10.0, &rows) - 10.0 * rounding(&rows)).abs() < 1e-28);
}
