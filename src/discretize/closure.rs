//! Operators on whole axes: closed first and second derivatives that keep an energy, and periodic ones.
//!
//! Each order is derived once a process and kept. The derivations are in the submodules; nothing is
//! tabulated but which orders there are and how many rows they close.

mod biased;
mod dissipation;
mod first_derivative;
mod second_derivative;
mod stages;
mod staggered;

use std::fmt;
use std::sync::{Arc, OnceLock};

use crate::exact::{Inconsistent, Rational};
use crate::scheme::{
    BiasedFault, BiasedPair, DifferenceOperator, Dissipation, DissipationFault, FormFault, Norm, NormFault,
    OperatorFault, SecondDerivativeForm, SquaresFault, StaggeredFault, StaggeredPair, StencilFault,
    SummationByParts, SummationFault,
};

use super::WeightsFault;

/// How the first derivative of one order is derived.
struct Recipe {
    order: usize,
    /// How many rows are closed at each end. Twice the half order where that gives a positive norm, else
    /// the least number that does (found by trial: 10 at order 10 and 13, 14 at order 12 do not).
    closed_rows: usize,
    /// Free coordinates of the optimum are rounded to multiples of 1/this.
    tidy_denominator: Option<i64>,
}

/// The orders of staggered pairs with how many rows they close at nodes and at half points. At order 4
/// (4, 3) exists too, with a spectral radius above the interior's; other positive pairs of blocks are worse.
const STAGGERED_RECIPES: [staggered::Recipe; 4] = [
    staggered::Recipe { order: 2, at_nodes: 1, at_halves: 1 },
    staggered::Recipe { order: 4, at_nodes: 3, at_halves: 4 },
    staggered::Recipe { order: 6, at_nodes: 6, at_halves: 5 },
    staggered::Recipe { order: 8, at_nodes: 9, at_halves: 8 },
];

/// The central parts of biased pairs of even order: their interior is one node wider to each side than the
/// centred one. Tidied as coarsely as keeps the spectral radius (at order 8 multiples of 1/256 break it).
const BIASED_RECIPES: [Recipe; 4] = [
    Recipe { order: 2, closed_rows: 2, tidy_denominator: None },
    Recipe { order: 4, closed_rows: 4, tidy_denominator: None },
    Recipe { order: 6, closed_rows: 6, tidy_denominator: Some(256) },
    Recipe { order: 8, closed_rows: 8, tidy_denominator: Some(1 << 14) },
];

/// The orders of biased pairs.
const BIASED_ORDERS: [usize; 2 * BIASED_RECIPES.len()] = [1, 2, 3, 4, 5, 6, 7, 8];

/// The closed orders. Order 6 keeps the untidied optimum, which is a published operator (Del Rey Fernández
/// et al. 2014, Computers & Fluids); from order 8 on the optimum's fractions have 166 to 2300 characters and
/// are tidied, as coarsely as keeps the spectral radius.
const RECIPES: [Recipe; 6] = [
    Recipe { order: 2, closed_rows: 1, tidy_denominator: None },
    Recipe { order: 4, closed_rows: 4, tidy_denominator: None },
    Recipe { order: 6, closed_rows: 6, tidy_denominator: None },
    Recipe { order: 8, closed_rows: 8, tidy_denominator: Some(1024) },
    Recipe { order: 10, closed_rows: 11, tidy_denominator: Some(1 << 26) },
    Recipe { order: 12, closed_rows: 15, tidy_denominator: Some(1 << 32) },
];

/// The orders of [`periodic_first_derivative`].
const PERIODIC_FIRST_ORDERS: [usize; 8] = [2, 4, 6, 8, 10, 12, 14, 16];
/// The orders of [`periodic_second_derivative`]: those with non-negative averages, all of them checked.
const PERIODIC_SECOND_ORDERS: [usize; 6] = [2, 4, 6, 8, 10, 12];

/// Why there is no such operator.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum ClosureFault {
    /// This order is not offered.
    NotAvailable {
        /// The order that was asked for.
        order: usize,
        /// The orders that there are.
        available: Vec<usize>,
    },
    /// The derivation of an offered order failed: a fault of this program.
    Derivation(Impossible),
}

/// How a derivation can fail.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum Impossible {
    /// The exactness conditions contradict each other.
    Inconsistent,
    /// Neither the exactness conditions nor closeness to one determine the norm.
    NormNotUnique,
    /// The truncation stages left freedom.
    FreedomLeft { directions: usize },
    /// Narrow averages of the coefficient are not unique.
    AveragesNotUnique,
    /// The boundary weights do not settle to the interior's.
    BoundaryWeightsUnsettled,
    /// The interior weights were refused.
    Weights(WeightsFault),
    /// The operator was refused.
    Operator(OperatorFault),
    /// The norm was refused.
    Norm(NormFault),
    /// Summation by parts was refused.
    Summation(SummationFault),
    /// The certificate was refused.
    Squares(SquaresFault),
    /// The second derivative was refused.
    Form(FormFault),
    /// The dissipation was refused.
    Dissipation(DissipationFault),
    /// The biased pair was refused.
    Biased(BiasedFault),
    /// The central part of a biased interior was refused.
    Stencil(StencilFault),
    /// The staggered pair was refused.
    Staggered(StaggeredFault),
}

/// D = H⁻¹Q on an axis with two ends: interior order `order`, closed rows of half of it.
pub fn first_derivative(order: usize) -> Result<&'static SummationByParts, ClosureFault> {
    static KEPT: [OnceLock<Result<SummationByParts, ClosureFault>>; RECIPES.len()] =
        [const { OnceLock::new() }; RECIPES.len()];
    kept(&KEPT, &closed_orders(), order, derive_first_derivative)
}

/// −H⁻¹M(b) on an axis with two ends, in the norm of [`first_derivative`] of the same order.
pub fn second_derivative(order: usize) -> Result<&'static SecondDerivativeForm, ClosureFault> {
    static KEPT: [OnceLock<Result<SecondDerivativeForm, ClosureFault>>; RECIPES.len()] =
        [const { OnceLock::new() }; RECIPES.len()];
    kept(&KEPT, &closed_orders(), order, derive_second_derivative)
}

/// −H⁻¹M(1) on an axis with two ends: the rows of [`second_derivative`] for a coefficient of one.
pub fn constant_second_derivative(order: usize) -> Result<Arc<DifferenceOperator>, ClosureFault> {
    static KEPT: [OnceLock<Result<Arc<DifferenceOperator>, ClosureFault>>; RECIPES.len()] =
        [const { OnceLock::new() }; RECIPES.len()];
    let derive = |order| {
        let form = second_derivative(order)?;
        Ok(Arc::new(form.constant().clone()))
    };
    kept(&KEPT, &closed_orders(), order, derive).cloned()
}

/// The centred first derivative on a periodic axis.
pub fn periodic_first_derivative(order: usize) -> Result<&'static SummationByParts, ClosureFault> {
    static KEPT: [OnceLock<Result<SummationByParts, ClosureFault>>; PERIODIC_FIRST_ORDERS.len()] =
        [const { OnceLock::new() }; PERIODIC_FIRST_ORDERS.len()];
    kept(&KEPT, &PERIODIC_FIRST_ORDERS, order, |order| Ok(first_derivative::periodic(order)?))
}

/// −M(b) on a periodic axis.
pub fn periodic_second_derivative(order: usize) -> Result<&'static SecondDerivativeForm, ClosureFault> {
    static KEPT: [OnceLock<Result<SecondDerivativeForm, ClosureFault>>; PERIODIC_SECOND_ORDERS.len()] =
        [const { OnceLock::new() }; PERIODIC_SECOND_ORDERS.len()];
    kept(&KEPT, &PERIODIC_SECOND_ORDERS, order, |order| Ok(second_derivative::periodic(order / 2)?))
}

/// The dissipation that belongs to [`first_derivative`] of the same order 2p: differences of order p + 1, the
/// lowest that keeps the closure's order, strength one.
pub fn dissipation(order: usize) -> Result<&'static Dissipation, ClosureFault> {
    static KEPT: [OnceLock<Result<Dissipation, ClosureFault>>; RECIPES.len()] =
        [const { OnceLock::new() }; RECIPES.len()];
    let derive = |order| dissipation_with(first_derivative(order)?.norm(), order / 2 + 1, &Rational::one());
    kept(&KEPT, &closed_orders(), order, derive)
}

/// As [`dissipation`] on a periodic axis.
pub fn periodic_dissipation(order: usize) -> Result<&'static Dissipation, ClosureFault> {
    static KEPT: [OnceLock<Result<Dissipation, ClosureFault>>; PERIODIC_FIRST_ORDERS.len()] =
        [const { OnceLock::new() }; PERIODIC_FIRST_ORDERS.len()];
    let derive = |order| dissipation_with(&Norm::periodic(), order / 2 + 1, &Rational::one());
    kept(&KEPT, &PERIODIC_FIRST_ORDERS, order, derive)
}

/// −s 4⁻ᵏ H⁻¹ Δ_kᵀ diag(mean of b) Δ_k in a given norm H (of a periodic axis or of one with ends) with
/// k = `differences` and s = `strength`. Refused unless k ≥ 1, s ≥ 0.
pub fn dissipation_with(
    norm: &Norm,
    differences: usize,
    strength: &Rational,
) -> Result<Dissipation, ClosureFault> {
    if norm.left().is_empty() {
        Ok(dissipation::periodic(differences, strength)?)
    } else {
        Ok(dissipation::closed(norm, differences, strength)?)
    }
}

/// The staggered pair on an axis with two ends: interior order `order`, closed rows of half of it.
pub fn staggered_pair(order: usize) -> Result<&'static StaggeredPair, ClosureFault> {
    static KEPT: [OnceLock<Result<StaggeredPair, ClosureFault>>; STAGGERED_RECIPES.len()] =
        [const { OnceLock::new() }; STAGGERED_RECIPES.len()];
    kept(&KEPT, &staggered_orders(), order, derive_staggered_pair)
}

/// The staggered pair on a periodic axis.
pub fn periodic_staggered_pair(order: usize) -> Result<&'static StaggeredPair, ClosureFault> {
    static KEPT: [OnceLock<Result<StaggeredPair, ClosureFault>>; PERIODIC_FIRST_ORDERS.len()] =
        [const { OnceLock::new() }; PERIODIC_FIRST_ORDERS.len()];
    kept(&KEPT, &PERIODIC_FIRST_ORDERS, order, |order| Ok(staggered::periodic(order)?))
}

/// [`staggered_pair`], derived afresh.
pub fn derive_staggered_pair(order: usize) -> Result<StaggeredPair, ClosureFault> {
    let recipe = STAGGERED_RECIPES.iter().find(|recipe| recipe.order == order);
    let not_available = || ClosureFault::NotAvailable { order, available: staggered_orders().to_vec() };
    Ok(staggered::closed(recipe.ok_or_else(not_available)?)?)
}

/// The orders of staggered pairs.
pub fn staggered_orders() -> [usize; STAGGERED_RECIPES.len()] {
    STAGGERED_RECIPES.map(|recipe| recipe.order)
}

/// The biased pair D± on an axis with two ends. Even interior orders 2p keep the closure order p; odd ones
/// 2p − 1 cannot have more than p − 1.
pub fn biased_pair(order: usize) -> Result<&'static BiasedPair, ClosureFault> {
    static KEPT: [OnceLock<Result<BiasedPair, ClosureFault>>; BIASED_ORDERS.len()] =
        [const { OnceLock::new() }; BIASED_ORDERS.len()];
    kept(&KEPT, &BIASED_ORDERS, order, derive_biased_pair)
}

/// The biased pair on a periodic axis.
pub fn periodic_biased_pair(order: usize) -> Result<&'static BiasedPair, ClosureFault> {
    static KEPT: [OnceLock<Result<BiasedPair, ClosureFault>>; BIASED_ORDERS.len()] =
        [const { OnceLock::new() }; BIASED_ORDERS.len()];
    kept(&KEPT, &BIASED_ORDERS, order, |order| Ok(biased::periodic(order)?))
}

/// [`biased_pair`], derived afresh but for the first derivative that an odd order starts from.
pub fn derive_biased_pair(order: usize) -> Result<BiasedPair, ClosureFault> {
    if order % 2 == 1 && BIASED_ORDERS.contains(&order) {
        return Ok(biased::odd(first_derivative(order + 1)?, order)?);
    }
    let recipe = BIASED_RECIPES.iter().find(|recipe| recipe.order == order);
    let not_available = || ClosureFault::NotAvailable { order, available: BIASED_ORDERS.to_vec() };
    Ok(biased::even(recipe.ok_or_else(not_available)?)?)
}

/// The orders of biased pairs.
pub fn biased_orders() -> [usize; BIASED_ORDERS.len()] {
    BIASED_ORDERS
}

/// [`first_derivative`], derived afresh.
pub fn derive_first_derivative(order: usize) -> Result<SummationByParts, ClosureFault> {
    Ok(first_derivative::closed(recipe(order)?)?)
}

/// The optimum of the truncation rule before it is tidied: [`derive_first_derivative`] with its fractions
/// in full. Differs from it from order 8 on.
pub fn derive_untidied_first_derivative(order: usize) -> Result<SummationByParts, ClosureFault> {
    let recipe = recipe(order)?;
    let untidied = Recipe { tidy_denominator: None, ..*recipe };
    Ok(first_derivative::closed(&untidied)?)
}

/// [`second_derivative`], derived afresh but for the first derivative that it starts from.
pub fn derive_second_derivative(order: usize) -> Result<SecondDerivativeForm, ClosureFault> {
    compatible_second_derivative(first_derivative(order)?)
}

/// The second derivative that belongs to a given first derivative with centred interior.
pub fn compatible_second_derivative(first: &SummationByParts) -> Result<SecondDerivativeForm, ClosureFault> {
    Ok(second_derivative::closed(first)?)
}

/// The orders with closures.
pub fn closed_orders() -> [usize; RECIPES.len()] {
    RECIPES.map(|recipe| recipe.order)
}

fn recipe(order: usize) -> Result<&'static Recipe, ClosureFault> {
    RECIPES
        .iter()
        .find(|recipe| recipe.order == order)
        .ok_or_else(|| ClosureFault::NotAvailable { order, available: closed_orders().to_vec() })
}

/// The kept result of an order, derived at its first use.
fn kept<Fact>(
    places: &'static [OnceLock<Result<Fact, ClosureFault>>],
    orders: &[usize],
    order: usize,
    derive: impl FnOnce(usize) -> Result<Fact, ClosureFault>,
) -> Result<&'static Fact, ClosureFault> {
    let place = orders.iter().position(|&offered| offered == order).and_then(|index| places.get(index));
    let Some(place) = place else {
        return Err(ClosureFault::NotAvailable { order, available: orders.to_vec() });
    };
    place.get_or_init(|| derive(order)).as_ref().map_err(Clone::clone)
}

impl fmt::Display for ClosureFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            ClosureFault::NotAvailable { order, available } => {
                let listed: Vec<String> = available.iter().map(usize::to_string).collect();
                write!(formatter, "order {order} is not offered: there are {}", listed.join(", "))
            }
            ClosureFault::Derivation(fault) => write!(formatter, "the derivation failed: {fault}"),
        }
    }
}

impl fmt::Display for Impossible {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Impossible::Inconsistent => formatter.write_str("the exactness conditions contradict each other"),
            Impossible::NormNotUnique => formatter.write_str("the norm is not determined"),
            Impossible::FreedomLeft { directions } => {
                write!(formatter, "{directions} directions of freedom are left")
            }
            Impossible::AveragesNotUnique => formatter.write_str("narrow averages are not unique"),
            Impossible::BoundaryWeightsUnsettled => {
                formatter.write_str("the boundary weights do not settle to the interior's")
            }
            Impossible::Weights(fault) => fault.fmt(formatter),
            Impossible::Operator(fault) => fault.fmt(formatter),
            Impossible::Norm(fault) => fault.fmt(formatter),
            Impossible::Summation(fault) => fault.fmt(formatter),
            Impossible::Squares(fault) => fault.fmt(formatter),
            Impossible::Form(fault) => fault.fmt(formatter),
            Impossible::Dissipation(fault) => fault.fmt(formatter),
            Impossible::Staggered(fault) => fault.fmt(formatter),
            Impossible::Biased(fault) => fault.fmt(formatter),
            Impossible::Stencil(fault) => fault.fmt(formatter),
        }
    }
}

impl std::error::Error for ClosureFault {}

impl std::error::Error for Impossible {}

impl From<Impossible> for ClosureFault {
    fn from(fault: Impossible) -> ClosureFault {
        ClosureFault::Derivation(fault)
    }
}

/// Lets `?` carry a fact's refusal out of a derivation.
macro_rules! carried {
    ($($fault:ty => $variant:ident),* $(,)?) => {
        $(impl From<$fault> for Impossible {
            fn from(fault: $fault) -> Impossible {
                Impossible::$variant(fault)
            }
        })*
    };
}

carried! {
    WeightsFault => Weights,
    OperatorFault => Operator,
    NormFault => Norm,
    SummationFault => Summation,
    SquaresFault => Squares,
    FormFault => Form,
    DissipationFault => Dissipation,
    StaggeredFault => Staggered,
    BiasedFault => Biased,
    StencilFault => Stencil,
}

impl From<Inconsistent> for Impossible {
    fn from(_: Inconsistent) -> Impossible {
        Impossible::Inconsistent
    }
}
