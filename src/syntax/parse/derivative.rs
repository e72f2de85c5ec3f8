//! Derivatives → tree: the orders above and below the line agree, and nothing is guessed where they do not.

use pest::iterators::Pair;

use super::{Reader, Rule, nothing};
use crate::diagnostic::{Diagnostic, codes};
use crate::source::Span;
use crate::syntax::names::{lowered, raised};
use crate::syntax::tree::{Derivative, Expression, ExpressionKind, Variable};

/// Highest order of a derivative.
const HIGHEST_ORDER: u32 = 4;

/// What stands below the line.
struct Below {
    variables: Vec<Variable>,
    /// Where it stands, for labels.
    span: Span,
}

impl Reader<'_> {
    /// `∂u/∂x`, `∂(…)/∂x` or `∂/∂x(…)`.
    pub(super) fn derivative(&mut self, pair: Pair<'_, Rule>) -> Expression {
        let span = self.span(&pair);
        let mut above = None;
        let mut read = None;
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::order => above = Some((self.order(&part), self.span(&part))),
                Rule::derivative_fraction | Rule::derivative_higher => read = self.fraction(part, above),
                Rule::derivative_operator => read = self.operator_form(part),
                _ => {}
            }
        }
        let Some((of, below)) = read else { return nothing(span) };
        let order = above.map_or(1, |(order, _)| order);
        self.check_orders(order, &of, &below, span);
        let derivative = Derivative { of: Box::new(of), order, by: below.variables };
        Expression { kind: ExpressionKind::Derivative(derivative), span }
    }

    fn fraction(&mut self, pair: Pair<'_, Rule>, above: Option<(u32, Span)>) -> Option<(Expression, Below)> {
        let whole = self.span(&pair);
        let mut of = None;
        let mut below = None;
        for part in pair.into_inner() {
            let span = self.span(&part);
            match part.as_rule() {
                Rule::name => of = Some(self.word(&part)),
                Rule::bracket => of = Some(self.bracket(part)),
                Rule::trap_power => {
                    self.report_power(part.as_str().trim(), span, of.as_ref(), whole, above.is_some())
                }
                Rule::variables | Rule::variables_higher => below = Some(self.variables(part)),
                Rule::trap_bracket => {
                    let bracket = self.excerpt(span);
                    let fault = Diagnostic::error(
                        codes::DERIVATIVE_APPLIED,
                        span,
                        "a derivative stands before a bracket",
                    )
                    .with_text("is this a factor, or what the derivative is taken of?")
                    .with_remedy(format!(
                        "write `∂u/∂x * {bracket}` for a product, `∂/∂x{bracket}` for the derivative of it"
                    ));
                    self.diagnostics.push(fault);
                }
                _ => {}
            }
        }
        Some((of?, below?))
    }

    /// `∂u²/∂x`: the derivative of the square, or a second derivative?
    fn report_power(&mut self, power: &str, span: Span, of: Option<&Expression>, whole: Span, ordered: bool) {
        let of = of.map_or_else(String::new, |of| self.excerpt(of.span));
        let below = self.excerpt(whole);
        let below = below.split_once('/').map_or("∂x", |(_, below)| below).to_string();
        let message = format!("`∂{of}{power}` can be read in two ways");
        let mut readings = format!("write `∂({of}{power})/{below}` for the derivative of the power");
        if !ordered {
            let order = power_order(power).map_or_else(String::new, raised_order);
            readings = format!("{readings}, `∂{order}{of}/{below}{order}` for a higher derivative");
        }
        self.report(codes::DERIVATIVE_POWER, span, message, "is this a power or an order?", readings);
    }

    fn operator_form(&mut self, pair: Pair<'_, Rule>) -> Option<(Expression, Below)> {
        let whole = self.span(&pair);
        let mut of = None;
        let mut below = None;
        for part in pair.into_inner() {
            let span = self.span(&part);
            match part.as_rule() {
                Rule::bracket => of = Some(self.bracket(part)),
                Rule::variables => below = Some(self.variables(part)),
                Rule::trap_bare => {
                    let operand = self.excerpt(span);
                    let operator = self.excerpt(Span::new(whole.start, span.start));
                    let remedy = format!("write `∂{operator}({operand})`");
                    let message = format!("what is derived by `∂{operator}` stands in a bracket");
                    self.report(codes::DERIVATIVE_BARE, span, message, "expected `(` before this", remedy);
                    of = Some(nothing(span));
                }
                _ => {}
            }
        }
        Some((of?, below?))
    }

    fn variables(&mut self, pair: Pair<'_, Rule>) -> Below {
        let span = self.span(&pair);
        let mut variables: Vec<Variable> = Vec::new();
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::name => variables.push(Variable { name: self.name(&part), power: 1 }),
                Rule::order => {
                    let power = self.order(&part);
                    if let Some(last) = variables.last_mut() {
                        last.power = power;
                    }
                }
                _ => {}
            }
        }
        Below { variables, span }
    }

    /// The order that superscripts or `^2` spell, at least 1.
    fn order(&mut self, pair: &Pair<'_, Rule>) -> u32 {
        let span = self.span(pair);
        match power_order(pair.as_str().trim()).filter(|order| *order >= 1) {
            Some(order) => order,
            None => {
                let message = format!("`{}` is no order of a derivative", pair.as_str().trim());
                self.report(
                    codes::DERIVATIVE_RANGE,
                    span,
                    message,
                    "",
                    format!("orders are 1 to {HIGHEST_ORDER}"),
                );
                1
            }
        }
    }

    fn check_orders(&mut self, above: u32, of: &Expression, below: &Below, span: Span) {
        let total = below.variables.iter().fold(0u32, |total, variable| total.saturating_add(variable.power));
        if above > HIGHEST_ORDER || total > HIGHEST_ORDER {
            let message = format!("derivatives have orders 1 to {HIGHEST_ORDER}, not {}", above.max(total));
            self.report(
                codes::DERIVATIVE_RANGE,
                span,
                message,
                "",
                "write it as derivatives of a further field",
            );
            return;
        }
        if above == total {
            return;
        }
        let of = self.excerpt(of.span);
        let remedy = match below.variables.as_slice() {
            [only] if above == 1 => {
                let (name, order) = (&only.name.text, raised_order(only.power));
                format!(
                    "write `∂{order}{of}/∂{name}{order}` for the derivative of order {total}, `(∂{of}/∂{name})^{total}` for the power"
                )
            }
            [only] => {
                let (name, order) = (&only.name.text, raised_order(above));
                format!("write `∂{order}{of}/∂{name}{order}`, or `∂{of}/∂{name}`")
            }
            _ => format!("write `∂{}{of}` above the line", raised_order(total)),
        };
        let fault = Diagnostic::error(
            codes::DERIVATIVE_ORDERS,
            span,
            format!("the orders disagree: {above} above the line, {total} below"),
        )
        .with_label(below.span, format!("these powers sum to {total}"))
        .with_remedy(remedy);
        self.diagnostics.push(fault);
    }
}

fn raised_order(order: u32) -> String {
    raised(order as usize)
}

/// `²` or `^2` as a number.
fn power_order(written: &str) -> Option<u32> {
    match written.strip_prefix('^') {
        Some(digits) => digits.trim().parse().ok(),
        None => u32::try_from(lowered(written)?).ok(),
    }
}
