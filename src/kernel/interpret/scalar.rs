//! Single numbers: functions of the mathematical library, choices, noise. The rows use the same definitions.

use crate::model::{Function, Relation};
use std::f64::consts::PI;

pub(super) const NEAREST_PI: f64 = PI;

mod library {
    unsafe extern "C" {
        pub(super) safe fn erf(x: f64) -> f64;
        pub(super) safe fn erfc(x: f64) -> f64;
    }
}

/// a < b ? a : b
#[inline(always)]
pub(super) fn minimum(a: f64, b: f64) -> f64 {
    if a < b { a } else { b }
}

/// a > b ? a : b
#[inline(always)]
pub(super) fn maximum(a: f64, b: f64) -> f64 {
    if a > b { a } else { b }
}

/// (x > 0) − (x < 0)
#[inline(always)]
pub(super) fn sign(x: f64) -> f64 {
    f64::from(i8::from(x > 0.0) - i8::from(x < 0.0))
}

#[inline(always)]
pub(super) fn holds(left: f64, relation: Relation, right: f64) -> bool {
    match relation {
        Relation::Less => left < right,
        Relation::LessOrEqual => left <= right,
        Relation::Greater => left > right,
        Relation::GreaterOrEqual => left >= right,
    }
}

/// A function of one argument; those of two never occur in a kernel as calls.
#[inline(always)]
pub(super) fn call(function: Function, x: f64) -> f64 {
    match function {
        Function::Sin => x.sin(),
        Function::Cos => x.cos(),
        Function::Tan => x.tan(),
        Function::Exp => x.exp(),
        Function::Log => x.ln(),
        Function::Sqrt => x.sqrt(),
        Function::Abs => x.abs(),
        Function::Tanh => x.tanh(),
        Function::Sinh => x.sinh(),
        Function::Cosh => x.cosh(),
        Function::Erf => library::erf(x),
        Function::Erfc => library::erfc(x),
        Function::Sign => sign(x),
        Function::Minimum | Function::Maximum => f64::NAN,
    }
}

/// A number in [0, 1) from a seed and the row-major index of a node: the finaliser of the splitmix64 generator
/// (Steele, Lea, Flood 2014; constants from memory) on a weighted sum.
pub(super) fn noise(seed: u64, index: u64) -> f64 {
    const STRIDE: u64 = 0x9E37_79B9_7F4A_7C15;
    let mut z = seed.wrapping_mul(STRIDE).wrapping_add(index).wrapping_add(STRIDE);
    z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    z ^= z >> 31;
    (z >> 11) as f64 * (1.0 / (1u64 << 53) as f64)
}
