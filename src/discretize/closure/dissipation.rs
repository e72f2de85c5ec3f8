//! Dissipation from undivided differences: A(b) = −s 4⁻ᵏ H⁻¹ Δ_kᵀ diag(mean of b) Δ_k.
//!
//! All Δ_k are whole stencils inside the axis, so nothing is to be searched. Not here: the proof, which the
//! constructor of [`Dissipation`] makes.

use crate::exact::Rational;
use crate::scheme::{Dissipation, Norm, RepeatedSquare, SumOfSquares};

use super::{Impossible, second_derivative::difference};

/// On an axis with two ends, in its norm.
pub(super) fn closed(
    norm: &Norm,
    differences: usize,
    strength: &Rational,
) -> Result<Dissipation, Impossible> {
    let squares = SumOfSquares::bounded(Vec::new(), vec![square(differences, strength)])?;
    Ok(Dissipation::bounded(norm.clone(), squares, differences, strength.clone())?)
}

pub(super) fn periodic(differences: usize, strength: &Rational) -> Result<Dissipation, Impossible> {
    let squares = SumOfSquares::periodic(vec![square(differences, strength)])?;
    Ok(Dissipation::periodic(squares, differences, strength.clone())?)
}

/// s 4⁻ᵏ · (mean of b over the stencil) · (Δ_k u)²; Δ_k takes the sawtooth to 2ᵏ, whence the factor.
fn square(order: usize, strength: &Rational) -> RepeatedSquare {
    let nodes = Rational::from(order as i64 + 1);
    let share = strength / (Rational::from(4).power(order as u32) * nodes);
    RepeatedSquare {
        functional: (0..).zip(difference(order)).collect(),
        weight: (0..=order as i64).map(|node| (node, share.clone())).collect(),
        first: 0,
    }
}
