//! Biased pairs D± = D ∓ H⁻¹S with S = σ Δ_kᵀΔ_k: the even part of a biased stencil becomes S, its odd part
//! the interior of D.
//!
//! The stencil of order 2p has nodes −(p − 1) … p + 1 and k = p + 1; that of order 2p − 1 has nodes
//! −(p − 1) … p and k = p. A pair with S from Δ_k cannot have a closure of order k. Not here: the proof, which
//! the constructor of [`BiasedPair`] makes.

use crate::discretize::interior::{self, NodeFamily};
use crate::exact::Rational;
use crate::scheme::{BiasedPair, Stencil, SummationByParts};

use super::{Impossible, Recipe, dissipation, first_derivative};

/// The order 2p − 1, from the certified derivative of order 2p.
pub(super) fn odd(central: &SummationByParts, order: usize) -> Result<BiasedPair, Impossible> {
    let half = order.div_ceil(2);
    let parts = Parts::of(order)?;
    let damping = dissipation::closed(central.norm(), half, &parts.strength)?;
    Ok(BiasedPair::new(central.clone(), damping, order, half - 1)?)
}

/// The order 2p, whose central part has a closure of its own.
pub(super) fn even(recipe: &Recipe) -> Result<BiasedPair, Impossible> {
    let half = recipe.order / 2;
    let parts = Parts::of(recipe.order)?;
    let central = first_derivative::closed_around(parts.central, recipe)?;
    let damping = dissipation::closed(central.norm(), half + 1, &parts.strength)?;
    Ok(BiasedPair::new(central, damping, recipe.order, half)?)
}

pub(super) fn periodic(order: usize) -> Result<BiasedPair, Impossible> {
    let parts = Parts::of(order)?;
    let central = first_derivative::periodic_around(parts.central, order)?;
    let damping = dissipation::periodic(parts.reach, &parts.strength)?;
    Ok(BiasedPair::new(central, damping, order, order)?)
}

/// A biased stencil taken apart.
struct Parts {
    /// How far it reaches to its long side: k.
    reach: usize,
    /// Its odd part, on nodes −k … k.
    central: Stencil,
    /// The sawtooth's decay σ 4ᵏ.
    strength: Rational,
}

impl Parts {
    fn of(order: usize) -> Result<Parts, Impossible> {
        let reach = order / 2 + 1;
        let left = order.div_ceil(2) - 1;
        let biased = interior::smallest(NodeFamily::Biased { left }, &Rational::zero(), 1, order)?;
        let weight = |node: i64| {
            let place = usize::try_from(node + left as i64).ok();
            place.and_then(|place| biased.weights().get(place)).cloned().unwrap_or_else(Rational::zero)
        };
        let half = Rational::ratio(1, 2);
        let nodes = -(reach as i64)..=reach as i64;
        let odd_part = nodes.clone().map(|node| (weight(node) - weight(-node)) * &half).collect();
        let nodes = nodes.map(Rational::from).collect();
        let central = Stencil::new(nodes, Rational::zero(), 1, odd_part, order)?;
        // Δ_kᵀΔ_k has ±1 at distance k, and the even part half of the outermost weight.
        let sigma = weight(reach as i64).abs() * half;
        Ok(Parts { reach, central, strength: sigma * Rational::from(4).power(reach as u32) })
    }
}
