//! Loops over rows of numbers, each in a portable copy and one for wider vectors; both give the same bits, because neither
//! contracts or reorders anything.

use super::scalar;
use crate::model::{Function, Relation};

/// What a loop reads: one number for all nodes, or one a node (then as many as the loop writes).
#[derive(Clone, Copy, Debug)]
pub(super) enum Argument<'a> {
    Number(f64),
    Row(&'a [f64]),
}

impl Argument<'_> {
    #[inline(always)]
    pub(super) fn at(self, index: usize) -> f64 {
        match self {
            Argument::Number(number) => number,
            Argument::Row(row) => row[index],
        }
    }
}

/// Which copy of a loop runs on this machine.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Vectors {
    Portable,
    #[cfg(target_arch = "x86_64")]
    Avx2,
}

impl Vectors {
    pub(super) fn of_this_machine() -> Vectors {
        #[cfg(target_arch = "x86_64")]
        if std::arch::is_x86_feature_detected!("avx2") {
            return Vectors::Avx2;
        }
        Vectors::Portable
    }
}

macro_rules! for_each_vector_width {
    ($($(#[$doc:meta])* $name:ident = $body:ident($($argument:ident: $type:ty),*);)*) => {$(
        $(#[$doc])*
        pub(super) fn $name(vectors: Vectors, $($argument: $type),*) {
            #[cfg(target_arch = "x86_64")]
            #[target_feature(enable = "avx2")]
            fn wide($($argument: $type),*) {
                $body($($argument),*);
            }
            match vectors {
                Vectors::Portable => $body($($argument),*),
                // SAFETY: this variant is made only where the machine was found to have these instructions.
                #[cfg(target_arch = "x86_64")]
                Vectors::Avx2 => unsafe { wide($($argument),*) },
            }
        }
    )*};
}

for_each_vector_width! {
    /// target = operation(a)
    unary = unary_loop(operation: Unary, target: &mut [f64], a: Argument<'_>);
    /// target = operation(a, b)
    binary = binary_loop(operation: Binary, target: &mut [f64], a: Argument<'_>, b: Argument<'_>);
    /// target = operation(a, b·c), the product rounded first
    with_product = with_product_loop(operation: WithProduct, target: &mut [f64], a: Argument<'_>, b: Argument<'_>, c: Argument<'_>);
    /// target = left RELATION right ? then : otherwise
    select = select_loop(relation: Relation, target: &mut [f64], left: Argument<'_>, right: Argument<'_>, then: Argument<'_>, otherwise: Argument<'_>);
    /// target = or += Σ weight·row, in order
    linear = linear_loop(begin: Begin, target: &mut [f64], terms: &[(f64, &[f64])]);
    /// target = or += Σ weight·(plus ± minus), in order
    paired = paired_loop(begin: Begin, pairing: Pairing, target: &mut [f64], terms: &[(f64, &[f64], &[f64])]);
    /// target = or += c·(a − b)
    scaled_difference = scaled_difference_loop(begin: Begin, target: &mut [f64], c: Argument<'_>, a: Argument<'_>, b: Argument<'_>);
}

/// Whether a sum starts with its first term or goes on from what is there.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Begin {
    Afresh,
    OnTop,
}

/// How two opposite nodes are joined.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Pairing {
    Difference,
    Sum,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Unary {
    Copy,
    Negate,
    Call(Function),
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Binary {
    Add,
    Subtract,
    Multiply,
    Divide,
    Power,
    Minimum,
    Maximum,
}

/// What is done with a product b·c that has no other use.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum WithProduct {
    /// a + b·c (which has the bits of b·c + a)
    Add,
    /// a − b·c
    Subtract,
    /// b·c − a
    SubtractFrom,
}

#[inline(always)]
fn map1(target: &mut [f64], a: Argument<'_>, f: impl Fn(f64) -> f64) {
    match a {
        Argument::Number(a) => target.fill(f(a)),
        Argument::Row(a) => {
            for (t, a) in target.iter_mut().zip(a) {
                *t = f(*a);
            }
        }
    }
}

#[inline(always)]
fn map2(target: &mut [f64], a: Argument<'_>, b: Argument<'_>, f: impl Fn(f64, f64) -> f64) {
    match (a, b) {
        (Argument::Number(a), b) => map1(target, b, |b| f(a, b)),
        (a, Argument::Number(b)) => map1(target, a, |a| f(a, b)),
        (Argument::Row(a), Argument::Row(b)) => {
            for ((t, a), b) in target.iter_mut().zip(a).zip(b) {
                *t = f(*a, *b);
            }
        }
    }
}

#[inline(always)]
fn map3(
    target: &mut [f64],
    a: Argument<'_>,
    b: Argument<'_>,
    c: Argument<'_>,
    f: impl Fn(f64, f64, f64) -> f64,
) {
    match (a, b, c) {
        (Argument::Number(a), b, c) => map2(target, b, c, |b, c| f(a, b, c)),
        (a, Argument::Number(b), c) => map2(target, a, c, |a, c| f(a, b, c)),
        (a, b, Argument::Number(c)) => map2(target, a, b, |a, b| f(a, b, c)),
        (Argument::Row(a), Argument::Row(b), Argument::Row(c)) => {
            for (((t, a), b), c) in target.iter_mut().zip(a).zip(b).zip(c) {
                *t = f(*a, *b, *c);
            }
        }
    }
}

#[inline(always)]
fn unary_loop(operation: Unary, target: &mut [f64], a: Argument<'_>) {
    match operation {
        Unary::Copy => map1(target, a, |a| a),
        Unary::Negate => map1(target, a, |a| -a),
        Unary::Call(Function::Sqrt) => map1(target, a, f64::sqrt),
        Unary::Call(Function::Abs) => map1(target, a, f64::abs),
        Unary::Call(Function::Sign) => map1(target, a, scalar::sign),
        Unary::Call(function) => map1(target, a, |a| scalar::call(function, a)),
    }
}

#[inline(always)]
fn binary_loop(operation: Binary, target: &mut [f64], a: Argument<'_>, b: Argument<'_>) {
    match operation {
        Binary::Add => map2(target, a, b, |a, b| a + b),
        Binary::Subtract => map2(target, a, b, |a, b| a - b),
        Binary::Multiply => map2(target, a, b, |a, b| a * b),
        Binary::Divide => map2(target, a, b, |a, b| a / b),
        Binary::Power => map2(target, a, b, f64::powf),
        Binary::Minimum => map2(target, a, b, scalar::minimum),
        Binary::Maximum => map2(target, a, b, scalar::maximum),
    }
}

#[inline(always)]
fn with_product_loop(
    operation: WithProduct,
    target: &mut [f64],
    a: Argument<'_>,
    b: Argument<'_>,
    c: Argument<'_>,
) {
    match operation {
        WithProduct::Add => map3(target, a, b, c, |a, b, c| a + b * c),
        WithProduct::Subtract => map3(target, a, b, c, |a, b, c| a - b * c),
        WithProduct::SubtractFrom => map3(target, a, b, c, |a, b, c| b * c - a),
    }
}

#[inline(always)]
fn select_loop(
    relation: Relation,
    target: &mut [f64],
    left: Argument<'_>,
    right: Argument<'_>,
    then: Argument<'_>,
    otherwise: Argument<'_>,
) {
    for (index, t) in target.iter_mut().enumerate() {
        let chosen = scalar::holds(left.at(index), relation, right.at(index));
        *t = if chosen { then.at(index) } else { otherwise.at(index) };
    }
}

/// Up to this many terms are summed in one loop.
const TOGETHER: usize = 6;

#[inline(always)]
fn linear_loop(begin: Begin, target: &mut [f64], terms: &[(f64, &[f64])]) {
    let mut begin = begin;
    if terms.is_empty() && begin == Begin::Afresh {
        target.fill(0.0);
    }
    for part in terms.chunks(TOGETHER) {
        match part.len() {
            1 => linear_of::<1>(begin, target, part),
            2 => linear_of::<2>(begin, target, part),
            3 => linear_of::<3>(begin, target, part),
            4 => linear_of::<4>(begin, target, part),
            5 => linear_of::<5>(begin, target, part),
            _ => linear_of::<TOGETHER>(begin, target, part),
        }
        begin = Begin::OnTop;
    }
}

#[inline(always)]
fn linear_of<const N: usize>(begin: Begin, target: &mut [f64], terms: &[(f64, &[f64])]) {
    let count = target.len();
    let weights: [f64; N] = std::array::from_fn(|k| terms[k].0);
    let rows: [&[f64]; N] = std::array::from_fn(|k| &terms[k].1[..count]);
    match begin {
        Begin::Afresh => {
            for (i, t) in target.iter_mut().enumerate() {
                let mut sum = weights[0] * rows[0][i];
                for k in 1..N {
                    sum += weights[k] * rows[k][i];
                }
                *t = sum;
            }
        }
        Begin::OnTop => {
            for (i, t) in target.iter_mut().enumerate() {
                let mut sum = *t;
                for k in 0..N {
                    sum += weights[k] * rows[k][i];
                }
                *t = sum;
            }
        }
    }
}

#[inline(always)]
fn paired_loop(begin: Begin, pairing: Pairing, target: &mut [f64], terms: &[(f64, &[f64], &[f64])]) {
    match pairing {
        Pairing::Difference => paired_with(begin, target, terms, |plus, minus| plus - minus),
        Pairing::Sum => paired_with(begin, target, terms, |plus, minus| plus + minus),
    }
}

#[inline(always)]
fn paired_with(
    begin: Begin,
    target: &mut [f64],
    terms: &[(f64, &[f64], &[f64])],
    join: impl Fn(f64, f64) -> f64 + Copy,
) {
    let mut begin = begin;
    if terms.is_empty() && begin == Begin::Afresh {
        target.fill(0.0);
    }
    for part in terms.chunks(4) {
        match part.len() {
            1 => paired_of::<1>(begin, target, part, join),
            2 => paired_of::<2>(begin, target, part, join),
            3 => paired_of::<3>(begin, target, part, join),
            _ => paired_of::<4>(begin, target, part, join),
        }
        begin = Begin::OnTop;
    }
}

#[inline(always)]
fn paired_of<const N: usize>(
    begin: Begin,
    target: &mut [f64],
    terms: &[(f64, &[f64], &[f64])],
    join: impl Fn(f64, f64) -> f64,
) {
    let count = target.len();
    let weights: [f64; N] = std::array::from_fn(|k| terms[k].0);
    let plus: [&[f64]; N] = std::array::from_fn(|k| &terms[k].1[..count]);
    let minus: [&[f64]; N] = std::array::from_fn(|k| &terms[k].2[..count]);
    match begin {
        Begin::Afresh => {
            for (i, t) in target.iter_mut().enumerate() {
                let mut sum = weights[0] * join(plus[0][i], minus[0][i]);
                for k in 1..N {
                    sum += weights[k] * join(plus[k][i], minus[k][i]);
                }
                *t = sum;
            }
        }
        Begin::OnTop => {
            for (i, t) in target.iter_mut().enumerate() {
                let mut sum = *t;
                for k in 0..N {
                    sum += weights[k] * join(plus[k][i], minus[k][i]);
                }
                *t = sum;
            }
        }
    }
}

#[inline(always)]
fn scaled_difference_loop(
    begin: Begin,
    target: &mut [f64],
    c: Argument<'_>,
    a: Argument<'_>,
    b: Argument<'_>,
) {
    match begin {
        Begin::Afresh => map3(target, c, a, b, |c, a, b| c * (a - b)),
        Begin::OnTop => on_top3(target, c, a, b, |t, c, a, b| t + c * (a - b)),
    }
}

#[inline(always)]
fn on_top3(
    target: &mut [f64],
    c: Argument<'_>,
    a: Argument<'_>,
    b: Argument<'_>,
    f: impl Fn(f64, f64, f64, f64) -> f64,
) {
    match (c, a, b) {
        (Argument::Row(c), Argument::Row(a), Argument::Row(b)) => {
            for (((t, c), a), b) in target.iter_mut().zip(c).zip(a).zip(b) {
                *t = f(*t, *c, *a, *b);
            }
        }
        (Argument::Number(c), Argument::Row(a), Argument::Row(b)) => {
            for ((t, a), b) in target.iter_mut().zip(a).zip(b) {
                *t = f(*t, c, *a, *b);
            }
        }
        _ => {
            for (index, t) in target.iter_mut().enumerate() {
                *t = f(*t, c.at(index), a.at(index), b.at(index));
            }
        }
    }
}
