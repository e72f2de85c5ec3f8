//! Units and quantities → tree.

use pest::iterators::Pair;

use super::{Reader, Rule};
use crate::diagnostic::{Diagnostic, codes};
use crate::exact::Rational;
use crate::syntax::names::lowered;
use crate::syntax::tree::{Expression, ExpressionKind, Unit, UnitFactor};

/// Largest exponent in a unit, in absolute value.
const LARGEST_UNIT_EXPONENT: i64 = 100;

impl Reader<'_> {
    /// A number, with a unit or without.
    pub(super) fn quantity(&mut self, pair: Pair<'_, Rule>) -> Expression {
        let span = self.span(&pair);
        let mut value = Rational::zero();
        let mut unit = None;
        let mut spelling = "";
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::number => {
                    spelling = part.as_str();
                    value = self.rational(&part);
                }
                Rule::unit => unit = Some(self.unit(part)),
                _ => {}
            }
        }
        let Some(unit) = unit else { return Expression { kind: ExpressionKind::Number(value), span } };
        self.refuse_declared(spelling, &unit);
        Expression { kind: ExpressionKind::Quantity { value, unit }, span }
    }

    /// A word after a number can only be a unit; where it is also a declared name there are two readings.
    fn refuse_declared(&mut self, number: &str, unit: &Unit) {
        for factor in &unit.factors {
            let Some(section) = self.declared.section(&crate::syntax::names::canonical(&factor.symbol))
            else {
                continue;
            };
            let symbol = &factor.symbol;
            let product = match unit.spelling.strip_prefix(symbol.as_str()) {
                Some(rest) => format!(
                    "write `{number} * {symbol}{rest}` if the name is meant; for the unit rename `{symbol}`"
                ),
                None => format!("put signs and spaces around the name, or rename `{symbol}`"),
            };
            let fault = Diagnostic::error(
                codes::UNIT_OR_NAME,
                factor.span,
                format!("`{symbol}` after a number is a unit, but it is also a name of this model"),
            );
            let fault = fault.with_text(format!("declared under `{}`", section.word())).with_remedy(product);
            self.diagnostics.push(fault);
            return;
        }
    }

    /// A unit as spelled.
    pub(super) fn unit(&mut self, pair: Pair<'_, Rule>) -> Unit {
        let span = self.span(&pair);
        let spelling = pair.as_str().to_string();
        let mut factors = Vec::new();
        let mut sign = 1;
        let mut divided = None;
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::unit_operation => {
                    if divided.is_some() {
                        self.report_division(&spelling, span);
                        break;
                    }
                    if part.as_str() == "/" {
                        sign = -1;
                        divided = Some(());
                    }
                }
                Rule::unit_factor => factors.extend(self.unit_factor(part, sign)),
                Rule::unit_bracket => self.unit_bracket(part, sign, &mut factors),
                _ => {}
            }
        }
        Unit { factors, spelling, span }
    }

    fn unit_bracket(&mut self, pair: Pair<'_, Rule>, outer: i64, factors: &mut Vec<UnitFactor>) {
        let span = self.span(&pair);
        let mut sign = outer;
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::unit_operation if part.as_str() == "/" => {
                    sign = -outer;
                    let remedy = "give the factor after this `/` a negative exponent, as in `m·s^-1`";
                    self.report(
                        codes::UNIT_DIVISION,
                        span,
                        "a bracket in a unit holds products only",
                        "",
                        remedy,
                    );
                }
                Rule::unit_factor => factors.extend(self.unit_factor(part, sign)),
                _ => {}
            }
        }
    }

    fn report_division(&mut self, spelling: &str, span: crate::source::Span) {
        let (above, below) = spelling.split_once('/').unwrap_or((spelling, ""));
        let joined = below.replace('/', "·");
        let first = below.split(['·', '/']).next().unwrap_or(below);
        let mut readings = format!("write `{above}/({joined})`");
        if let Some(rest) = below[first.len()..].strip_prefix('·') {
            readings = format!("{readings} or `{above}·{rest}/{first}`");
        }
        self.report(
            codes::UNIT_DIVISION,
            span,
            format!("`{spelling}` can be read in two ways"),
            "after a `/` there is one factor or a bracket",
            readings,
        );
    }

    fn unit_factor(&mut self, pair: Pair<'_, Rule>, sign: i64) -> Option<UnitFactor> {
        let mut parts = pair.into_inner();
        let symbol = parts.next()?;
        let span = self.span(&symbol);
        let exponent = match parts.next() {
            None => Rational::from(1),
            Some(part) => self.unit_exponent(&part),
        };
        Some(UnitFactor {
            symbol: symbol.as_str().to_string(),
            exponent: exponent * Rational::from(sign),
            span,
        })
    }

    fn unit_exponent(&mut self, pair: &Pair<'_, Rule>) -> Rational {
        let written = pair.as_str();
        let exponent = match written.strip_prefix('^') {
            None => lowered(written).map(Rational::from),
            Some(plain) => plain.trim_matches(['(', ')']).parse::<Rational>().ok(),
        };
        match exponent {
            Some(exponent) if exponent.abs() <= Rational::from(LARGEST_UNIT_EXPONENT) => exponent,
            _ => {
                let span = self.span(pair);
                let message = format!("`{written}` is no exponent of a unit");
                let remedy = format!("exponents of units go to ±{LARGEST_UNIT_EXPONENT}");
                self.report(codes::NUMBER_TOO_LARGE, span, message, "", remedy);
                Rational::from(1)
            }
        }
    }
}
