//! Spectra and step limits of closed operators against an independent computation of the same quantities (exact rationals, LAPACK
//! eigenvalues, a prototype that shares no code with this crate), and against published limits.

use rimstone::analysis::spectrum::{Eigenvalue, abscissa, eigenvalues, radius, rounding};
use rimstone::analysis::stability::extents;
use rimstone::discretize::closure;
use rimstone::discretize::interior;
use rimstone::exact::{Rational, round};
use rimstone::model::Method;

type Matrix = Vec<Vec<f64>>;

/// D1 on n intervals of the unit interval.
fn first_derivative(order: usize, n: usize) -> Matrix {
    // The prototype's order 8 is the optimum before its fractions were tidied.
    let pair = closure::derive_untidied_first_derivative(order).expect("offered");
    dense(n, |row| pair.operator().row(row, n + 1).expect("on the grid"), n as f64)
}

/// −H⁻¹M(1).
fn second_derivative(order: usize, n: usize) -> Matrix {
    let operator = closure::second_derivative(order).expect("offered").constant();
    dense(n, |row| operator.row(row, n + 1).expect("on the grid"), (n * n) as f64)
}

fn dense(n: usize, row: impl Fn(usize) -> (i64, Vec<Rational>), scale: f64) -> Matrix {
    (0..=n)
        .map(|index| {
            let (first, weights) = row(index);
            let mut entries = vec![0.0; n + 1];
            for (offset, weight) in weights.iter().enumerate() {
                entries[(first + offset as i64) as usize] = round::nearest(weight) * scale;
            }
            entries
        })
        .collect()
}

fn face_weight(order: usize) -> f64 {
    round::nearest(&closure::first_derivative(order).expect("offered").norm().left()[0])
}

fn negative(matrix: Matrix) -> Matrix {
    matrix.into_iter().map(|row| row.into_iter().map(|entry| -entry).collect()).collect()
}

/// Drops a row and its column: a value that is set.
fn without(matrix: &Matrix, dropped: &[usize]) -> Matrix {
    let kept = |index: &usize| !dropped.contains(index);
    (0..matrix.len())
        .filter(kept)
        .map(|row| (0..matrix.len()).filter(kept).map(|column| matrix[row][column]).collect())
        .collect()
}

fn spectrum(matrix: &Matrix) -> Vec<Eigenvalue> {
    eigenvalues(matrix).expect("converges")
}

/// −D1 with the inflow flux replaced, strength times the stable one.
fn inflow_by_flux(order: usize, n: usize, strength: f64) -> Matrix {
    let mut matrix = negative(first_derivative(order, n));
    matrix[0][0] -= strength * n as f64 / face_weight(order);
    matrix
}

fn near(value: f64, known: f64, digits: f64) {
    assert!((value - known).abs() <= digits * known.abs(), "{value} against {known}");
}

#[test]
fn transport_with_flux_replacement() {
    // Rows: order, largest real parts at N = 40, 60, 80, radius at N = 60 in units of the spacing.
    let known = [
        (2, [-0.0123, -0.00547, -0.00308], 0.998634103174466),
        (4, [-0.00882, -0.00377, -0.00208], 1.3699449647211601),
        (6, [-0.00192, -0.000735, -0.000386], 1.5826301297119634),
        (8, [-0.00124, -0.00042, -0.000209], 1.72603),
    ];
    for (order, parts, size) in known {
        for (n, part) in [40, 60, 80].into_iter().zip(parts) {
            let found = spectrum(&inflow_by_flux(order, n, 1.0));
            near(abscissa(&found), part, 0.02);
            if n == 60 {
                near(radius(&found) / n as f64, size, 1e-5);
            }
        }
    }
}

#[test]
fn transport_with_a_set_value() {
    let known = [
        (2, [-0.00616, -0.00274, -0.00154]),
        (4, [-0.00444, -0.00189, -0.00105]),
        (6, [-0.000961, -0.000368, -0.000193]),
        (8, [-0.000619, -0.00021, -0.000104]),
    ];
    for (order, parts) in known {
        for (n, part) in [40, 60, 80].into_iter().zip(parts) {
            let found = spectrum(&without(&negative(first_derivative(order, n)), &[0]));
            near(abscissa(&found), part, 0.02);
        }
    }
}

#[test]
fn a_penalty_below_one_half_is_unstable() {
    let known = [(2, [0.234, 0.249, 0.265]), (4, [0.386, 0.405, 0.414]), (6, [1.71, 2.26, 2.84])];
    for (order, parts) in known {
        for (n, part) in [40, 60, 80].into_iter().zip(parts) {
            near(abscissa(&spectrum(&inflow_by_flux(order, n, 0.4))), part, 0.01);
        }
    }
}

#[test]
fn diffusion_with_given_values_fluxes_and_film() {
    // First Dirichlet eigenvalue −π²; with a film a = 3 at both ends −3.91 (to the digits printed by the prototype).
    let radii = [(2, 3.99726, 4.0), (4, 5.3278, 5.32781), (6, 6.03578, 6.03578), (8, 6.48904, 6.48905)];
    for (order, set, natural) in radii {
        let n = 60;
        let matrix = second_derivative(order, n);
        let found = spectrum(&without(&matrix, &[0, n]));
        near(abscissa(&found), -std::f64::consts::PI.powi(2), 1e-3);
        near(radius(&found) / (n * n) as f64, set, 2e-5);
        let free = spectrum(&matrix);
        assert!(abscissa(&free) <= 1e4 * rounding(&matrix), "{}", abscissa(&free));
        near(radius(&free) / (n * n) as f64, natural, 2e-5);
        assert!(free.iter().all(|(_, im)| im.abs() < 1e-6), "real spectrum");
        let mut film = matrix;
        let exchange = 3.0 * n as f64 / face_weight(order);
        film[0][0] -= exchange;
        film[n][n] -= exchange;
        near(abscissa(&spectrum(&film)), -3.91, 2e-3);
    }
}

#[test]
fn acoustics_with_open_and_closed_ends() {
    // p_t = −v_x, v_t = −p_x. Outward w = p + v_n leaves; open: the entering one is zero; closed: v_n = 0. Known: open ends at N = 80.
    for (order, open) in [(2, -0.00308), (4, -0.00208), (6, -0.000386), (8, -0.000209)] {
        let n = 80;
        let closed = spectrum(&acoustics(order, n, 0.0));
        assert!(abscissa(&closed).abs() < 1e-10, "order {order}: {}", abscissa(&closed));
        near(abscissa(&spectrum(&acoustics(order, n, 1.0))), open, 0.02);
        assert!(
            radius(&closed) <= extents_free_radius(order) * n as f64,
            "closed ends stay below the interior"
        );
    }
}

/// ends: 0 closed (v_n = 0), 1 open (no entering wave).
fn acoustics(order: usize, n: usize, ends: f64) -> Matrix {
    let derivative = first_derivative(order, n);
    let size = n + 1;
    let mut matrix = vec![vec![0.0; 2 * size]; 2 * size];
    for i in 0..size {
        for j in 0..size {
            matrix[i][size + j] = -derivative[i][j];
            matrix[size + i][j] = -derivative[i][j];
        }
    }
    let strength = n as f64 / face_weight(order);
    for (face, normal) in [(0, -1.0), (n, 1.0)] {
        // Upwind state: p* = w/2·(1 + R), v*_n = w/2·(1 − R) with R = 1 at a closed, R = 0 at an open end; w = p + v_n.
        let reflection = 1.0 - ends;
        let (p_star, v_star) = (0.5 * (1.0 + reflection), 0.5 * (1.0 - reflection));
        // p row: normal flux v_n replaced by v*; v row: p replaced by p* (times the normal).
        matrix[face][size + face] += strength * normal * (1.0 - v_star);
        matrix[face][face] -= strength * v_star;
        matrix[size + face][face] += strength * normal * (1.0 - p_star);
        matrix[size + face][size + face] -= strength * p_star;
    }
    matrix
}

fn extents_free_radius(order: usize) -> f64 {
    rimstone::analysis::symbol::radius(1, order)
}

/// Interior order 2p with one-sided rows of the same order, inflow set: the naive closure. Known growth rates at N = 80.
#[test]
fn one_sided_closures_of_full_order_are_flagged() {
    for (order, known) in [(4, 0.2827), (6, 15.71), (8, 33.4)] {
        let n = 80;
        let matrix = negative(one_sided(1, order, n));
        near(abscissa(&spectrum(&without(&matrix, &[0]))), known, 0.01);
    }
    let calm = spectrum(&without(&negative(one_sided(1, 2, 80)), &[0]));
    near(abscissa(&calm), -0.002355, 0.02);
}

/// The second-order wave equation with one-sided rows grows: √λ has a positive real part (known at N = 80, values set at both ends).
#[test]
fn waves_on_one_sided_closures_are_flagged() {
    for (order, known) in [(6, 23.45), (8, 42.57)] {
        let n = 80;
        let found = spectrum(&without(&one_sided(2, order, n), &[0, n]));
        let growth = found
            .iter()
            .map(|(re, im)| {
                let size = re.hypot(*im);
                ((size + re) / 2.0).max(0.0).sqrt()
            })
            .fold(0.0, f64::max);
        near(growth, known, 0.01);
    }
}

fn one_sided(derivative: usize, order: usize, n: usize) -> Matrix {
    let half = order / 2;
    let width = order + derivative;
    let scale = (n as f64).powi(derivative as i32);
    (0..=n)
        .map(|row| {
            let inside = row >= half && row + half <= n;
            let first = if inside {
                row - half
            } else if row < half {
                0
            } else {
                n + 1 - width
            };
            let count = if inside { order + 1 } else { width };
            let nodes: Vec<Rational> =
                (first..first + count).map(|node| Rational::from(node as i64)).collect();
            let stencil =
                interior::weights(&nodes, &Rational::from(row as i64), derivative).expect("weights");
            let mut entries = vec![0.0; n + 1];
            for (offset, weight) in stencil.weights().iter().enumerate() {
                entries[first + offset] = round::nearest(weight) * scale;
            }
            entries
        })
        .collect()
}

/// Largest a·dt/h and k·dt/h² from the interior symbol: Δt = extent/radius (the prototype bisected to 1e-6).
#[test]
fn interior_limits_of_the_methods() {
    let transport = [
        (2, [1.7320508097782783, 2.8284271251439375, 3.3407179867241794]),
        (4, [1.2622236584632707, 2.061202600544279, 2.4345320905414902]),
        (6, [1.0921026215534402, 1.7833961109141092, 2.1064086863760094]),
        (8, [1.0008395461390016, 1.6343641330101835, 1.930383713077329]),
    ];
    let diffusion = [
        (2, [0.50000000025, 0.6281863318066319, 0.6963233910171377, 1.1641892666888827]),
        (4, [0.37500000018750007, 0.47113974885497395, 0.5222425432628532, 0.8731419500166621]),
        (6, [0.3308823531066177, 0.41571154310732994, 0.4608022440554588, 0.7704193676617607]),
        (8, [0.30761718765380863, 0.3864818252325958, 0.42840208627030935, 0.7162492558730431]),
    ];
    for (order, known) in transport {
        for (method, limit) in [Method::Ssprk3, Method::Rk4, Method::Lsrk4].into_iter().zip(known) {
            let found = extents(method).imaginary / rimstone::analysis::symbol::radius(1, order);
            near(found, limit, 1e-6);
        }
    }
    for (order, known) in diffusion {
        for (method, limit) in
            [Method::Euler, Method::Ssprk3, Method::Rk4, Method::Lsrk4].into_iter().zip(known)
        {
            let found = extents(method).real / rimstone::analysis::symbol::radius(2, order);
            near(found, limit, 1e-6);
        }
    }
}

/// P-L04: RK4 with central differences of orders 2 and 4 (common practice, to 1e-10).
#[test]
fn published_limits_of_transport() {
    let rk4 = extents(Method::Rk4).imaginary;
    near(rk4 / rimstone::analysis::symbol::radius(1, 2), 2.82842712474619, 1e-10);
    near(rk4 / rimstone::analysis::symbol::radius(1, 4), 2.06120231739147, 1e-10);
}
