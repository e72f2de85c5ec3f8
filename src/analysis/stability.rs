//! Stability regions of the explicit one-step methods: how far they reach along the axes, and how much of the triangle between they hold.

use crate::exact::{Rational, factorial, round};
use crate::model::Method;
use crate::scheme::step_rule;

/// Extents of a region |R(z)| ≤ 1, rounded to the safe side.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Extents {
    /// The region holds [−real, 0].
    pub real: f64,
    /// The region holds [−i·imaginary, i·imaginary]; 0 where it holds nothing of the imaginary axis.
    pub imaginary: f64,
    /// The region holds the triangle with corners ±i·imaginary and −real, shrunk by this factor (at most one).
    pub combined: f64,
}

/// The extents of a method's region. Leapfrog has none of its own here (its limit for u_tt is 2/√ρ): all zero.
pub fn extents(method: Method) -> Extents {
    let Some(polynomial) = polynomial(method) else {
        return Extents { real: 0.0, imaginary: 0.0, combined: 1.0 };
    };
    let coefficients: Vec<f64> = polynomial.iter().map(round::nearest).collect();
    let real = reach(&coefficients, (-1.0, 0.0));
    let imaginary = reach(&coefficients, (0.0, 1.0));
    Extents { real, imaginary, combined: combined(&coefficients, real, imaginary) }
}

/// R(z) by ascending powers, exact from the method's coefficients.
pub fn polynomial(method: Method) -> Option<Vec<Rational>> {
    let taylor = |degree: usize| {
        (0..=degree).map(|power| factorial(power).recip().unwrap_or_else(Rational::zero)).collect::<Vec<_>>()
    };
    match method {
        Method::Euler => Some(taylor(1)),
        Method::Ssprk3 => Some(taylor(3)),
        Method::Rk4 => Some(taylor(4)),
        Method::Lsrk4 => Some(low_storage_polynomial()),
        Method::Leapfrog => None,
    }
}

/// k ← a k + z u, u ← u + b k on polynomials in z.
fn low_storage_polynomial() -> Vec<Rational> {
    let rule = step_rule::carpenter_kennedy();
    let stages = rule.a.len();
    let mut u = vec![Rational::zero(); stages + 1];
    u[0] = Rational::one();
    let mut k = vec![Rational::zero(); stages + 1];
    for stage in 0..stages {
        let mut next: Vec<Rational> = k.iter().map(|value| value * &rule.a[stage]).collect();
        for power in 0..stages {
            next[power + 1] = &next[power + 1] + &u[power];
        }
        k = next;
        for power in 0..=stages {
            u[power] = &u[power] + &(&rule.b[stage] * &k[power]);
        }
    }
    u
}

fn magnitude(coefficients: &[f64], z: (f64, f64)) -> f64 {
    let mut value = (0.0, 0.0);
    for coefficient in coefficients.iter().rev() {
        value = (value.0 * z.0 - value.1 * z.1 + coefficient, value.0 * z.1 + value.1 * z.0);
    }
    value.0.hypot(value.1)
}

/// Rounding of the polynomial near the origin is not growth.
const ROUNDING: f64 = 1e-13;

fn inside(coefficients: &[f64], z: (f64, f64)) -> bool {
    magnitude(coefficients, z) <= 1.0 + ROUNDING
}

/// How far the ray from the origin stays inside, scanned and then bisected; rounded down.
fn reach(coefficients: &[f64], direction: (f64, f64)) -> f64 {
    let at = |length: f64| (direction.0 * length, direction.1 * length);
    let step = 1.0 / 256.0;
    let mut low = 0.0;
    while low < 64.0 && inside(coefficients, at(low + step)) {
        low += step;
    }
    // Forward Euler leaves the region at once along the imaginary axis: |1 + iy|² = 1 + y².
    if low == 0.0 && !inside(coefficients, at(1e-3)) {
        return 0.0;
    }
    let mut high = low + step;
    for _ in 0..80 {
        let middle = 0.5 * (low + high);
        if inside(coefficients, at(middle)) { low = middle } else { high = middle }
    }
    low * (1.0 - 1e-12)
}

/// The largest factor by which the triangle fits, by scanning its upper edge (the region is symmetric).
fn combined(coefficients: &[f64], real: f64, imaginary: f64) -> f64 {
    if imaginary <= 0.0 {
        return 1.0;
    }
    let samples = 2000;
    let edge = (0..=samples).map(|index| {
        let share = f64::from(index) / f64::from(samples);
        (-real * share, imaginary * (1.0 - share))
    });
    let fits = |factor: f64| {
        edge.clone().all(|(x, y)| {
            // Every point between the origin and the edge, not only the edge.
            (1..=20).all(|part| {
                let scale = factor * f64::from(part) / 20.0;
                inside(coefficients, (x * scale, y * scale))
            })
        })
    };
    if fits(1.0) {
        return 1.0;
    }
    let (mut low, mut high) = (0.0, 1.0);
    for _ in 0..40 {
        let middle = 0.5 * (low + high);
        if fits(middle) { low = middle } else { high = middle }
    }
    low
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Extents of the classical methods (Hairer & Wanner 1996, IV.2, from memory; 2√2 and √3 are exact).
    #[test]
    fn extents_meet_known_values() {
        let close = |value: f64, known: f64| {
            assert!((value - known).abs() < 1e-9 && value <= known, "{value} {known}")
        };
        close(extents(Method::Euler).real, 2.0);
        assert!(extents(Method::Euler).imaginary == 0.0);
        close(extents(Method::Ssprk3).imaginary, 3.0_f64.sqrt());
        close(extents(Method::Ssprk3).real, 2.512_745_326_618_33);
        close(extents(Method::Rk4).imaginary, 8.0_f64.sqrt());
        close(extents(Method::Rk4).real, 2.785_293_563_405_29);
    }

    /// 1 + z + z²/2 + z³/6 + z⁴/24 + 0.005 z⁵ to the digits of the published coefficients; limits of the table of step limits.
    #[test]
    fn low_storage_polynomial_is_of_fourth_order() {
        let polynomial = polynomial(Method::Lsrk4).expect("explicit");
        for (power, coefficient) in polynomial.iter().enumerate().take(5) {
            let wanted = factorial(power).recip().expect("not zero");
            assert!(round::nearest(&(coefficient - &wanted)).abs() < 1e-12, "power {power}");
        }
        assert!((round::nearest(&polynomial[5]) - 0.005).abs() < 1e-4);
        assert!((extents(Method::Lsrk4).imaginary - 3.340_717_986_724_18).abs() < 1e-6);
        assert!((extents(Method::Lsrk4).real - 4.0 * 1.164_189_266_688_828).abs() < 1e-5);
    }
}
