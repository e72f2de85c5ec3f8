//! Bounds on what formulas grow to: coefficients, constants and named operators that build on each other can grow beyond all
//! measure from a page of text, and every later stage walks through what they stand for.

use super::Checker;
use super::scope::Typed;
use crate::diagnostic::{Diagnostic, codes, codes_check};
use crate::exact::Rational;
use crate::model::Expression;
use crate::source::Span;

/// The most parts of a formula, coefficients put in.
const LARGEST: u64 = 5_000;
/// How deep the parts of a formula may stand in each other, coefficients put in.
pub(super) const DEEPEST: u32 = 300;
/// How deep a formula may be read: brackets, constants, coefficients and operators in each other.
pub(super) const DEEPEST_READING: usize = 700;
/// The most parts that constants and operators may put into the formulas of a file.
const LARGEST_GROWTH: u64 = 2_000_000;
/// The most binary digits of an exact number, above and below the line together.
const MOST_DIGITS: u64 = 8_192;

/// Parts of an expression and how deep they stand in each other.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(super) struct Size {
    nodes: u64,
    depth: u32,
}

/// The size of an expression with every coefficient put in.
pub(super) fn size(value: &Expression, coefficients: &[Size]) -> Size {
    if let Expression::Coefficient(id) = value {
        return coefficients.get(id.0).copied().unwrap_or_default();
    }
    let mut whole = Size { nodes: 1, depth: 1 };
    for part in value.children() {
        let own = size(part, coefficients);
        whole.nodes = whole.nodes.saturating_add(own.nodes);
        whole.depth = whole.depth.max(own.depth + 1);
    }
    whole
}

/// Binary digits of the number that an expression is or has in front.
pub(super) fn digits(value: &Expression) -> u64 {
    match value {
        Expression::Number(number) => number.numerator().bits() + number.denominator().bits(),
        Expression::Product(items) => items.first().map_or(0, digits),
        Expression::Quotient(above, _) => digits(above),
        _ => 0,
    }
}

impl Checker<'_> {
    /// The formula, if it is of a size that can be worked with and its numbers are of a kind that doubles hold.
    pub(super) fn bounded(&mut self, typed: Typed, span: Span) -> Option<Typed> {
        let size = size(&typed.value, &self.sizes);
        if size.nodes > LARGEST || size.depth > DEEPEST {
            self.too_large(span);
            return None;
        }
        if typed.value.any(&|part| matches!(part, Expression::Number(number) if !held(number))) {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::NUMBER_OUT_OF_RANGE,
                    span,
                    "a number here is beyond what a run can hold",
                )
                .with_text("in SI base units, between 1e-307 and 1e308 or zero")
                .with_remedy("choose units in which the quantities of the model are of moderate size"),
            );
            return None;
        }
        Some(typed)
    }

    /// Counts what is put into a formula; nothing when the file's share is used up.
    pub(super) fn grow(&mut self, typed: Typed, span: Span) -> Option<Typed> {
        if self.growth > LARGEST_GROWTH {
            return None;
        }
        self.growth += size(&typed.value, &[]).nodes + 1;
        if self.growth > LARGEST_GROWTH {
            self.too_large(span);
            return None;
        }
        Some(typed)
    }

    pub(super) fn too_large(&mut self, span: Span) {
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::FORMULA_TOO_LARGE,
                span,
                "the formula grows too large when everything it uses is put in",
            )
            .with_text(format!("expected at most {LARGEST} parts, {DEEPEST} deep"))
            .with_remedy("use fewer named parts that build on each other"),
        );
    }

    /// Whether a number is short enough to be kept exactly; says so if not.
    pub(super) fn short(&mut self, digits: u64, span: Span) -> Option<()> {
        if digits <= MOST_DIGITS {
            return Some(());
        }
        self.diagnostics.push(
            Diagnostic::error(
                codes::NUMBER_TOO_LARGE,
                span,
                "the exact value of this has too many digits to be kept",
            )
            .with_text(format!("expected at most {MOST_DIGITS} binary digits"))
            .with_remedy("use numbers with fewer digits, or smaller exponents"),
        );
        None
    }
}

/// Whether a double is near the number: zero, or between about 1e-307 and 1e308.
fn held(number: &Rational) -> bool {
    let (above, below) = (number.numerator().bits() as i64, number.denominator().bits() as i64);
    number.is_zero() || (-1020..=1023).contains(&(above - below))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::model::CoefficientId;

    #[test]
    fn coefficients_are_looked_through() {
        let square =
            Expression::Coefficient(CoefficientId(0)).times(Expression::Coefficient(CoefficientId(0)));
        let mut known = vec![Size { nodes: 3, depth: 2 }];
        assert_eq!(size(&square, &known), Size { nodes: 7, depth: 3 });
        known[0].nodes = u64::MAX;
        assert_eq!(size(&square, &known).nodes, u64::MAX);
    }

    #[test]
    fn doubles_hold_what_they_hold() {
        let ten = Rational::from(10);
        let power = |exponent| ten.pow(exponent).expect("not zero");
        assert!(held(&power(300)) && held(&power(-300)) && held(&Rational::zero()));
        assert!(!held(&power(309)) && !held(&power(-309)));
    }
}
