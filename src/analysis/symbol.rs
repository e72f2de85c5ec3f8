//! Largest symbols of centred interior stencils, in units of the spacing.
//!
//! With the exact weights c_k of order 2p, the symbol of an odd derivative is i·2Σ c_k sin kθ, that of an even one c₀ + 2Σ c_k cos kθ.
//! Radii are rounded up, so that a limit made of them is on the safe side.

use crate::exact::{Rational, binomial, factorial, round};

/// The largest magnitude of the symbol of the centred stencil of that derivative (1 to 4) and even order.
pub fn radius(derivative: usize, order: usize) -> f64 {
    let weights: Vec<f64> = weights(derivative, order).iter().map(round::nearest).collect();
    let symbol = |angle: f64| {
        let wave = |k: usize| {
            let phase = angle * k as f64;
            if derivative % 2 == 1 { 2.0 * phase.sin() } else { 2.0 * phase.cos() }
        };
        let centre = if derivative % 2 == 1 { 0.0 } else { weights[0] };
        (1..weights.len()).fold(centre, |sum, k| sum + weights[k] * wave(k)).abs()
    };
    let samples = 512;
    let step = std::f64::consts::PI / f64::from(samples);
    let best = (0..=samples)
        .map(|index| f64::from(index) * step)
        .fold(0.0, |best, angle| if symbol(angle) > symbol(best) { angle } else { best });
    let (mut low, mut high) = ((best - step).max(0.0), (best + step).min(std::f64::consts::PI));
    for _ in 0..200 {
        let (a, b) = (low + (high - low) / 3.0, high - (high - low) / 3.0);
        if symbol(a) < symbol(b) { low = a } else { high = b }
    }
    let value = symbol(low).max(symbol(high)).max(symbol(best));
    value * (1.0 + 8.0 * f64::EPSILON)
}

/// Centred weights w₀, w₁, … of a derivative: the coefficient of xᵈ in d!·(series of the δ-operator), by Lagrange's formula
/// on the nodes −m … m with the least m that reaches the order.
fn weights(derivative: usize, order: usize) -> Vec<Rational> {
    let half = (derivative + order - 1) / 2;
    (0..=half).map(|node| weight(derivative, half, node as i64)).collect()
}

/// d! times the coefficient of xᵈ in Π_{j≠k} (x − j)/(k − j) over −m ≤ j ≤ m.
fn weight(derivative: usize, half: usize, node: i64) -> Rational {
    let reach = half as i64;
    let mut polynomial = vec![Rational::one()];
    for other in (-reach..=reach).filter(|other| *other != node) {
        let mut next = vec![Rational::zero(); polynomial.len() + 1];
        for (power, coefficient) in polynomial.iter().enumerate() {
            next[power + 1] = &next[power + 1] + coefficient;
            next[power] = &next[power] - &(coefficient * &Rational::from(other));
        }
        polynomial = next;
    }
    let sign = Rational::from(if (reach - node) % 2 == 0 { 1 } else { -1 });
    // Π_{j≠k} (k − j) = (−1)^(m−k) (m+k)! (m−k)!
    let scale = factorial((reach + node) as usize) * factorial((reach - node) as usize);
    let coefficient = polynomial.get(derivative).cloned().unwrap_or_else(Rational::zero);
    let result = &(&coefficient * &factorial(derivative)) * &sign;
    result.checked_div(&scale).unwrap_or_else(|| binomial(0, 1))
}

#[cfg(test)]
mod tests {
    use super::radius;

    /// Values of the table of interior weights and radii for orders 2 to 16 (computed independently; closed forms at θ = π for second derivatives).
    #[test]
    fn radii_meet_the_closed_forms() {
        let first = [1.0, 1.372222, 1.585978, 1.730598, 1.837438, 1.920847, 1.988481, 2.044869];
        let second = [
            4.0,
            16.0 / 3.0,
            272.0 / 45.0,
            2048.0 / 315.0,
            512.0 / 75.0,
            367_616.0 / 51_975.0,
            34_374_656.0 / 4_729_725.0,
            35_127_296.0 / 4_729_725.0,
        ];
        for index in 0..8 {
            let order = 2 * (index + 1);
            assert!((radius(1, order) - first[index]).abs() < 1e-6, "first derivative, order {order}");
            let value = radius(2, order);
            assert!(
                value >= second[index] && value < second[index] * (1.0 + 1e-12),
                "second derivative, order {order}"
            );
        }
        assert!((radius(4, 2) - 16.0).abs() < 1e-12);
    }
}
