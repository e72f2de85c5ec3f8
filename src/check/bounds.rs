//! Bounds on what a model may ask of the compiler: the size and depth of formulas, and the size of exact numbers.
//!
//! A page of text can name its parts and use them twice, again and again; written out, that grows without bound. Every
//! copy is therefore paid for from one account for the whole model, so that checking ends soon whatever the text.

use super::Checker;
use crate::diagnostic::{Diagnostic, codes_check};
use crate::exact::Rational;
use crate::model::{CoefficientId, ConstantId, Expression};
use crate::source::Span;

/// Nodes that all formulas of a model may have together, names and operators written out.
const MOST_NODES: usize = 200_000;

/// How deep conversion goes: brackets within named operators within brackets.
const DEEPEST: usize = 600;

/// How deep a formula may be when the names in it are written out.
const TALLEST: usize = 600;

/// Bits of an exact number, numerator and denominator together.
const MOST_BITS: u64 = 16_384;

/// Powers of two that a double can hold with room to spare.
const RANGE: i64 = 1_000;

/// The account of a model.
#[derive(Clone, Debug)]
pub(super) struct Budget {
    left: usize,
    depth: usize,
    /// Where the account first was too small, or something too deep.
    exceeded: Option<Span>,
}

impl Default for Budget {
    fn default() -> Budget {
        Budget { left: MOST_NODES, depth: 0, exceeded: None }
    }
}

/// Size and height of a formula with the names in it written out.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(super) struct Extent {
    pub(super) nodes: usize,
    pub(super) height: usize,
}

impl Checker<'_> {
    /// Pays for so many nodes.
    pub(super) fn spend(&mut self, nodes: usize, span: Span) -> Option<()> {
        match self.budget.left.checked_sub(nodes) {
            Some(left) => {
                self.budget.left = left;
                Some(())
            }
            None => {
                self.budget.exceeded.get_or_insert(span);
                None
            }
        }
    }

    /// One step down into a formula; each is followed by [`Checker::ascend`].
    pub(super) fn descend(&mut self, span: Span) -> Option<()> {
        // Once the account is overdrawn, nothing more is worked out.
        if self.budget.exceeded.is_some() {
            return None;
        }
        self.spend(1, span)?;
        if self.budget.depth >= DEEPEST {
            self.budget.exceeded.get_or_insert(span);
            return None;
        }
        self.budget.depth += 1;
        Some(())
    }

    pub(super) fn ascend(&mut self) {
        self.budget.depth = self.budget.depth.saturating_sub(1);
    }

    /// The extent of a formula that others will use; too tall a one is refused.
    pub(super) fn measured(&mut self, value: &Expression, span: Span) -> Option<Extent> {
        let extent = self.extent(value);
        if extent.height > TALLEST {
            self.budget.exceeded.get_or_insert(span);
            return None;
        }
        Some(extent)
    }

    /// Size and height, coefficients looked through.
    pub(super) fn extent(&self, value: &Expression) -> Extent {
        let mut total = Extent { nodes: 1, height: 0 };
        if let Expression::Coefficient(CoefficientId(index)) = value {
            total = self.coefficient_extents.get(*index).copied().unwrap_or_default();
        }
        if let Expression::Constant(ConstantId(index)) = value {
            total = self.free_extents.get(*index).copied().unwrap_or_default();
        }
        for child in value.children() {
            let own = self.extent(child);
            total.nodes = total.nodes.saturating_add(own.nodes);
            total.height = total.height.max(own.height);
        }
        Extent { nodes: total.nodes.max(1), height: total.height + 1 }
    }

    /// Says, once for the whole model, that it asks for too much.
    pub(super) fn close_account(&mut self) {
        if let Some(span) = self.budget.exceeded {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::TOO_MUCH,
                    span,
                    "the formulas of this model are too large when the names in them are written out",
                )
                .with_text(format!("here more than {MOST_NODES} parts are reached, or {DEEPEST} levels"))
                .with_remedy(
                    "use fewer names that are made of names, or make them a field or a free constant",
                ),
            );
        }
    }

    /// Numbers that are about to be added: exact work on them must stay small.
    pub(super) fn small_enough<'n>(
        &mut self,
        numbers: impl Iterator<Item = &'n Expression>,
        span: Span,
    ) -> Option<()> {
        let bits = numbers.flat_map(leading).map(growth).fold(0u64, u64::saturating_add);
        if bits <= MOST_BITS {
            return Some(());
        }
        self.out_of_range(span)
    }

    /// The power of a number: its bits times the exponent.
    pub(super) fn small_power(&mut self, base: &Expression, exponent: &Rational, span: Span) -> Option<()> {
        let times = exponent.abs().floor().to_i64().unwrap_or(i64::MAX).unsigned_abs();
        let bits = leading(base).map(bits).fold(0u64, u64::saturating_add);
        if bits.saturating_mul(times) <= MOST_BITS {
            return Some(());
        }
        self.out_of_range(span)
    }

    /// The numbers at the top of a formula as a program could hold them.
    pub(super) fn in_range(&mut self, value: &Expression, span: Span) -> Option<()> {
        let fits = leading(value).all(|number| {
            let (above, below) = (number.numerator().bits() as i64, number.denominator().bits() as i64);
            number.is_zero() || (above - below).abs() <= RANGE && bits(number) <= MOST_BITS
        });
        if fits { Some(()) } else { self.out_of_range(span) }
    }

    fn out_of_range(&mut self, span: Span) -> Option<()> {
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::NUMBER_RANGE,
                span,
                "this number is too large, too small or too long to compute with",
            )
            .with_text("programs hold numbers from about 1e-300 to 1e300")
            .with_remedy("choose units in which the numbers of the model are moderate"),
        );
        None
    }
}

/// The exact numbers at the top of a formula: those that sums and products gather.
fn leading(value: &Expression) -> impl Iterator<Item = &Rational> {
    let items = match value {
        Expression::Sum(items) | Expression::Product(items) => items.as_slice(),
        other => std::slice::from_ref(other),
    };
    items.iter().filter_map(|item| match item {
        Expression::Number(number) => Some(number),
        _ => None,
    })
}

fn bits(number: &Rational) -> u64 {
    number.numerator().bits() + number.denominator().bits()
}

/// Bits that a number can add to a sum: small whole numbers add without growing.
fn growth(number: &Rational) -> u64 {
    if number.is_integer() && number.numerator().bits() <= 64 { 0 } else { bits(number) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_seen_where_they_are_gathered() {
        let two = Expression::Number(Rational::from(2));
        let sum = Expression::Sum(vec![two.clone(), Expression::Pi]);
        assert_eq!(leading(&sum).count(), 1);
        assert_eq!(leading(&two).count(), 1);
        assert_eq!(leading(&Expression::Pi).count(), 0);
    }

    #[test]
    fn fractions_count_with_both_their_parts() {
        assert_eq!(growth(&Rational::from(1000)), 0);
        assert_eq!(bits(&Rational::ratio(1, 8)), 1 + 4);
        assert_eq!(bits(&Rational::from(2).power(100)), 101 + 1);
    }
}
