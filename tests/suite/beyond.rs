//! Operators beyond the core: high orders, dissipation, one-sided and biased weights, staggered pairs, and the
//! certificates of all of them. Each kind has its submodule; here is what they share.

mod biased;
mod certificates;
mod dissipation;
mod high_orders;
mod one_sided;
mod staggered;
mod tables;

use num_bigint::BigInt;
use rimstone::exact::Rational;
use rimstone::exact::matrix::{common_denominator, scaled};

fn read(text: &str) -> Rational {
    text.parse().expect("a quoted number")
}

fn list(text: &str) -> Vec<Rational> {
    text.split_whitespace().map(read).collect()
}

/// Σ_j wⱼ (first + j)ᵐ for m = 0, …, count − 1.
fn moments(weights: &[Rational], first: i64, count: usize) -> Vec<Rational> {
    let scale = common_denominator(weights);
    let mut terms: Vec<BigInt> = weights.iter().map(|weight| scaled(weight, &scale)).collect();
    (0..count)
        .map(|_| {
            let sum: BigInt = terms.iter().sum();
            for (place, term) in terms.iter_mut().enumerate() {
                *term *= first + place as i64;
            }
            Rational::new(sum, scale.clone()).expect("common denominators are positive")
        })
        .collect()
}

/// (x − origin)ᵐ at nodes 0, …, n − 1.
fn monomial(nodes: usize, origin: usize, degree: usize) -> Vec<Rational> {
    (0..nodes as i64).map(|node| Rational::from(node - origin as i64).power(degree as u32)).collect()
}

/// A reproducible sequence of small integers, none negative, some of them nought.
fn coefficients(count: usize, seed: usize) -> Vec<Rational> {
    let mixed = |index: usize| ((index + 1) * (index + 3) * (seed + 3) * 7919 + index * index * index) % 11;
    (0..count).map(|index| Rational::from(mixed(index) as i64)).collect()
}
