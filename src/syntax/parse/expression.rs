//! Formulas → tree: sums and products flat, signs and powers by the rules of the language, and the slips in
//! notation that the grammar lets through so that they can be named.

use pest::iterators::Pair;

use super::{Reader, Rule, nothing};
use crate::diagnostic::{Diagnostic, codes, safe::excerpt};
use crate::exact::Rational;
use crate::source::Span;
use crate::syntax::cut::Home;
use crate::syntax::names::{lowered, subscript_derivative};
use crate::syntax::tree::{
    Branch, Comparison, Expression, ExpressionKind, Factor, Function, Operation, Relation, Section, Sign,
    Term,
};

/// A product and whether a minus sign stands before it.
struct Signed {
    sign: Sign,
    value: Expression,
}

impl Signed {
    fn into_expression(self, span: Span) -> Expression {
        match self.sign {
            Sign::Plus => self.value,
            Sign::Minus => Expression { kind: ExpressionKind::Negate(Box::new(self.value)), span },
        }
    }
}

impl Reader<'_> {
    /// A whole formula.
    pub(super) fn formula(&mut self, pair: Pair<'_, Rule>) -> Expression {
        let span = self.span(&pair);
        let mut terms: Vec<Term> = Vec::new();
        let mut sign = None;
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::additive => sign = Some(sign_of(&part)),
                Rule::product => {
                    let part_span = self.span(&part);
                    let product = self.product(part);
                    terms.push(match sign.take() {
                        None => Term { sign: product.sign, value: product.value },
                        Some(sign) => Term { sign, value: product.into_expression(part_span) },
                    });
                }
                _ => {}
            }
        }
        if terms.len() == 1
            && let Some(Term { sign, value }) = terms.pop()
        {
            return Signed { sign, value }.into_expression(span);
        }
        Expression { kind: ExpressionKind::Sum(terms), span }
    }

    fn product(&mut self, pair: Pair<'_, Rule>) -> Signed {
        let span = self.span(&pair);
        let mut sign = Sign::Plus;
        let mut factors: Vec<Factor> = Vec::new();
        let mut operation = "*";
        let mut before = "";
        for part in pair.into_inner() {
            let written = part.as_str();
            match part.as_rule() {
                Rule::multiplicative => operation = written.trim(),
                Rule::trap_juxtaposed => {
                    let value = self.first_formula(part);
                    self.report_juxtaposed(factors.last().map(|factor| &factor.value), &value);
                    factors.push(Factor { operation: Operation::Times, value });
                    before = written;
                }
                Rule::prefixed => {
                    let part_span = self.span(&part);
                    let (minus, value) = self.prefixed(part);
                    if factors.is_empty() {
                        sign = minus;
                        factors.push(Factor { operation: Operation::Times, value });
                    } else {
                        let value = Signed { sign: minus, value }.into_expression(part_span);
                        self.factor(&mut factors, operation, before, written, value);
                    }
                    before = written;
                }
                _ => {}
            }
        }
        if factors.len() == 1
            && let Some(only) = factors.pop()
        {
            return Signed { sign, value: only.value };
        }
        let first = factors.first().map_or(span, |factor| factor.value.span);
        let span = Span::new(first.start, span.end);
        Signed { sign, value: Expression { kind: ExpressionKind::Product(factors), span } }
    }

    /// Adds a factor to a product; `before` and `written` are the texts of the last and of this one.
    fn factor(
        &mut self,
        factors: &mut Vec<Factor>,
        operation: &str,
        before: &str,
        written: &str,
        value: Expression,
    ) {
        if let Some(last) = factors.last() {
            self.refuse_unit_product(operation, last.value.span, &last.value.kind, &value);
        }
        if operation == "/" {
            self.refuse_quotient(before, written, factors, &value);
            factors.push(Factor { operation: Operation::Over, value });
            return;
        }
        if operation == "·"
            && is_vector(&value)
            && let Some(last) = factors.last_mut()
            && last.operation == Operation::Times
            && is_vector(&last.value)
        {
            let span = last.value.span.to(value.span);
            let left = std::mem::replace(&mut last.value, nothing(span));
            last.value = Expression { kind: ExpressionKind::Dot(Box::new(left), Box::new(value)), span };
            return;
        }
        factors.push(Factor { operation: Operation::Times, value });
    }

    /// `3 N*m`, `0.72 W/(m*K)`: units written with the sign of formulas. Told from products by the missing spaces
    /// and by names that are not declared.
    fn refuse_unit_product(
        &mut self,
        operation: &str,
        place: Span,
        last: &ExpressionKind,
        value: &Expression,
    ) {
        // Parameters of operators and the `s` of a graded axis are declared nowhere.
        let free_names = matches!(self.home, Home::Section(Section::Operators | Section::Axes));
        let tight = self.source.slice(Span::new(place.end, value.span.start)) == operation;
        let ExpressionKind::Quantity { unit, .. } = last else { return };
        if free_names || !tight || !self.is_unit_like(value) {
            return;
        }
        let written = self.excerpt(place.to(value.span));
        let meant = written.replace('*', "·");
        let span = unit.span.to(value.span);
        let fault = Diagnostic::error(
            codes::UNIT_PRODUCT,
            span,
            format!("`{written}` is read as a product with names"),
        )
        .with_text("none of these names is declared")
        .with_remedy(format!("products within a unit are written with `·`: `{meant}`"));
        self.diagnostics.push(fault);
    }

    /// Whether a factor is made of undeclared names only.
    fn is_unit_like(&self, value: &Expression) -> bool {
        match &value.kind {
            ExpressionKind::Name(name) => name != "t" && self.declared.section(name).is_none(),
            ExpressionKind::Power { base, .. } => self.is_unit_like(base),
            ExpressionKind::Product(factors) => factors.iter().all(|factor| self.is_unit_like(&factor.value)),
            _ => false,
        }
    }

    fn refuse_quotient(&mut self, before: &str, written: &str, factors: &[Factor], value: &Expression) {
        let Some(last) = factors.last() else { return };
        let plain = before.trim_start().starts_with(|letter: char| letter.is_ascii_digit() || letter == '.');
        let quantity =
            written.trim_start().starts_with(|letter: char| letter.is_ascii_digit() || letter == '.');
        if let (ExpressionKind::Number(above), ExpressionKind::Quantity { value: below, unit }) =
            (&last.value.kind, &value.kind)
            && plain
            && quantity
        {
            let unit = &unit.spelling;
            let number = written.trim().strip_suffix(unit.as_str()).unwrap_or(written).trim();
            let exact = above.checked_div(below).map(|quotient| quotient.to_string()).unwrap_or_default();
            let decimal = if exact.contains('/') { String::new() } else { format!(", or `{exact} {unit}`") };
            let span = last.value.span.to(value.span);
            let (over, above) = (before.trim(), before.trim());
            self.report(
                codes::QUOTIENT_OF_QUANTITY,
                span,
                format!("`{over}/{number} {unit}` can be read in two ways"),
                "is the unit above or below the line?",
                format!("write `{above} {unit} / {number}`{decimal}, or `{above} / ({number} {unit})`"),
            );
        } else if let (ExpressionKind::Name(above), ExpressionKind::Name(below)) =
            (&last.value.kind, &value.kind)
        {
            let (above, below) = (above.clone(), below.clone());
            self.refuse_plain_derivative(&above, &below, last.value.span.to(value.span));
        }
    }

    /// `du/dx` where neither is declared but `u` and `x` are.
    fn refuse_plain_derivative(&mut self, above: &str, below: &str, span: Span) {
        let (Some(field), Some(variable)) = (above.strip_prefix('d'), below.strip_prefix('d')) else {
            return;
        };
        let known = self.declared.section(field) == Some(Section::Fields)
            && (variable == "t" || self.declared.section(variable) == Some(Section::Axes))
            && self.declared.section(above).is_none()
            && self.declared.section(below).is_none();
        if known {
            let remedy = format!("write `∂{field}/∂{variable}` or `\\partial {field}/\\partial {variable}`");
            let message = format!("`{above}/{below}` is a quotient of two names, not a derivative");
            self.report(codes::INDEX_DERIVATIVE, span, message, "", remedy);
        }
    }

    fn report_juxtaposed(&mut self, before: Option<&Expression>, after: &Expression) {
        let Some(before) = before else { return };
        if is_bare_function(before) {
            return; // Reported where the function stands.
        }
        let (left, right) = (self.excerpt(before.span), self.excerpt(after.span));
        let message = format!("nothing stands between `{left}` and `{right}`");
        let remedy = match (&before.kind, &after.kind) {
            (ExpressionKind::Quantity { .. }, ExpressionKind::Name(_)) if !self.is_declared(after) => {
                format!(
                    "a unit has no space in it: write `{left}·{right}`; a product of names is `{left} * {right}`"
                )
            }
            (ExpressionKind::Quantity { .. }, ExpressionKind::Number(_))
                if before.span.end == after.span.start =>
            {
                format!("exponents in units are written `{left}^{right}` or with superscripts")
            }
            (_, ExpressionKind::Name(name)) if !self.is_declared(after) => {
                format!(
                    "write `{left} * {right}`; a unit follows a number literal only, as in `{left} * 1 {name}`"
                )
            }
            _ => format!("write `{left} * {right}`"),
        };
        let fault = Diagnostic::error(codes::JUXTAPOSITION, before.span.to(after.span), message)
            .with_text("expected an operator between them")
            .with_remedy(remedy);
        self.diagnostics.push(fault);
    }

    fn is_declared(&self, expression: &Expression) -> bool {
        matches!(&expression.kind, ExpressionKind::Name(name) if self.declared.section(name).is_some() || name == "t")
    }

    pub(super) fn excerpt(&self, span: Span) -> String {
        excerpt(self.source.slice(span), 30)
    }

    fn prefixed(&mut self, pair: Pair<'_, Rule>) -> (Sign, Expression) {
        let span = self.span(&pair);
        let mut minus = 0usize;
        let mut value = nothing(span);
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::additive => minus += usize::from(sign_of(&part) == Sign::Minus),
                Rule::power => value = self.power(part),
                _ => {}
            }
        }
        for _ in 1..minus {
            value = Expression { kind: ExpressionKind::Negate(Box::new(value)), span };
        }
        (if minus > 0 { Sign::Minus } else { Sign::Plus }, value)
    }

    pub(super) fn power(&mut self, pair: Pair<'_, Rule>) -> Expression {
        let span = self.span(&pair);
        let written = pair.as_str().trim().to_string();
        let mut base = nothing(span);
        let mut exponents = Vec::new();
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::operand => base = self.operand(part),
                Rule::exponent => {
                    let text = part.as_str().trim().to_string();
                    exponents.push((text, self.exponent(part)));
                }
                _ => {}
            }
        }
        if exponents.len() > 1 {
            self.report_chain(span, &written, &base, &exponents);
        }
        let Some((text, exponent)) = exponents.into_iter().next() else { return base };
        if matches!(base.kind, ExpressionKind::Quantity { .. })
            && !self.source.slice(base.span).starts_with('(')
        {
            let quantity = self.excerpt(base.span);
            let remedy = format!(
                "write `({quantity}){text}` for the power of the quantity, `{quantity}{text}` without a space for that of the unit"
            );
            self.report(
                codes::POWER_OF_QUANTITY,
                span,
                "is the number raised too, or the unit alone?",
                "",
                remedy,
            );
        }
        Expression {
            kind: ExpressionKind::Power { base: Box::new(base), exponent: Box::new(exponent) },
            span,
        }
    }

    fn report_chain(
        &mut self,
        span: Span,
        written: &str,
        base: &Expression,
        exponents: &[(String, Expression)],
    ) {
        let base = self.excerpt(base.span);
        let tail: String = exponents.iter().skip(1).map(|(text, _)| text.as_str()).collect();
        let first = &exponents[0].0;
        let inner = first.trim_start_matches('^').trim();
        let readings = if first.starts_with('^') && exponents.len() == 2 {
            format!("write `({base}{first}){tail}` or `{base}^({inner}{tail})`")
        } else {
            format!("write `({base}{first}){tail}`")
        };
        let message = format!("`{}` can be read in two ways", excerpt(written, 40));
        self.report(
            codes::POWER_CHAIN,
            span,
            message,
            "a power of a power needs a bracket",
            excerpt(&readings, 120),
        );
    }

    fn exponent(&mut self, pair: Pair<'_, Rule>) -> Expression {
        let span = self.span(&pair);
        let mut minus = false;
        let mut value = nothing(span);
        for part in pair.into_inner() {
            let span = self.span(&part);
            match part.as_rule() {
                Rule::superscript => {
                    let number = lowered(part.as_str()).unwrap_or_else(|| {
                        self.report(
                            codes::NUMBER_TOO_LARGE,
                            span,
                            "this exponent is too large",
                            "",
                            "write a smaller one",
                        );
                        1
                    });
                    let magnitude = Rational::from(number.saturating_abs());
                    minus = number < 0;
                    value = Expression { kind: ExpressionKind::Number(magnitude), span };
                }
                Rule::additive => minus ^= sign_of(&part) == Sign::Minus,
                Rule::number => {
                    let number = self.rational(&part);
                    value = Expression { kind: ExpressionKind::Number(number), span };
                }
                Rule::name => value = self.word(&part),
                Rule::bracket => value = self.bracket(part),
                _ => {}
            }
        }
        if minus { Expression { kind: ExpressionKind::Negate(Box::new(value)), span } } else { value }
    }

    fn operand(&mut self, pair: Pair<'_, Rule>) -> Expression {
        let span = self.span(&pair);
        let mut operations = Vec::new();
        let mut value = nothing(span);
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::vector_operation => {
                    let sign: String = part.as_str().split_whitespace().collect();
                    operations.push((sign, self.span(&part)));
                }
                _ => value = self.atom(part),
            }
        }
        for (sign, place) in operations.into_iter().rev() {
            self.refuse_delta_name(&sign, &value, place);
            let span = place.to(value.span);
            let inner = Box::new(value);
            let kind = match sign.as_str() {
                "∇·" => ExpressionKind::Divergence(inner),
                "∇" => ExpressionKind::Gradient(inner),
                _ => ExpressionKind::Laplacian(inner),
            };
            value = Expression { kind, span };
        }
        value
    }

    /// `Δt` and `Δx`: steps in other notations, here the Laplace operator on a coordinate.
    fn refuse_delta_name(&mut self, sign: &str, value: &Expression, place: Span) {
        let ExpressionKind::Name(name) = &value.kind else { return };
        let coordinate = name == "t" || self.declared.section(name) == Some(Section::Axes);
        if sign == "Δ" && coordinate {
            let remedy = format!(
                "`Δ` is the Laplace operator and stands in no name; call a step `d{name}` or the like"
            );
            let message = format!("`Δ{name}` is the Laplace operator applied to a coordinate");
            self.report(codes::DELTA_IN_NAME, place.to(value.span), message, "", remedy);
        }
    }

    fn atom(&mut self, pair: Pair<'_, Rule>) -> Expression {
        let span = self.span(&pair);
        match pair.as_rule() {
            Rule::quantity => self.quantity(pair),
            Rule::derivative => self.derivative(pair),
            Rule::bracket => self.bracket(pair),
            Rule::cases => self.cases(pair),
            Rule::noise => {
                let seed = pair.into_inner().find(|part| part.as_rule() == Rule::whole);
                match seed {
                    Some(seed) => Expression { kind: ExpressionKind::Noise(self.whole(&seed)), span },
                    None => nothing(span),
                }
            }
            Rule::call => self.call(pair),
            _ => self.word(&pair),
        }
    }

    /// A bracket; the span of what it holds is widened to the bracket.
    pub(super) fn bracket(&mut self, pair: Pair<'_, Rule>) -> Expression {
        let span = self.span(&pair);
        Expression { span, ..self.first_formula(pair) }
    }

    /// The first formula within a rule that holds one.
    pub(super) fn first_formula(&mut self, pair: Pair<'_, Rule>) -> Expression {
        let span = self.span(&pair);
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::formula => return self.formula(part),
                Rule::power => return self.power(part),
                _ => {}
            }
        }
        nothing(span)
    }

    /// All formulas directly within a rule.
    pub(super) fn formulas(&mut self, pair: Pair<'_, Rule>) -> Vec<Expression> {
        pair.into_inner()
            .filter(|part| part.as_rule() == Rule::formula)
            .map(|part| self.formula(part))
            .collect()
    }

    pub(super) fn word(&mut self, pair: &Pair<'_, Rule>) -> Expression {
        let name = self.name(pair);
        if name.text == "π" {
            return Expression { kind: ExpressionKind::Pi, span: name.span };
        }
        if let Some(function) = Function::from_name(&name.text) {
            let function = function.name();
            let remedy = format!("write `{function}(x)`; a power of it is `{function}(x)^2`");
            let message = format!("the function `{function}` stands without its argument");
            self.report(
                codes::FUNCTION_WITHOUT_BRACKET,
                name.span,
                message,
                "expected a bracket after it",
                remedy,
            );
        } else if self.declared.section(&name.text).is_none() {
            let declared = self.declared;
            let is = |section: Section| move |name: &str| declared.section(name) == Some(section);
            if let Some(derivative) = subscript_derivative(&name.text, is(Section::Fields), is(Section::Axes))
            {
                let message = format!(
                    "`{}` is a name that is not declared; a derivative is written as a fraction",
                    name.text
                );
                self.report(codes::INDEX_DERIVATIVE, name.span, message, "", format!("write `{derivative}`"));
            }
        }
        Expression { kind: ExpressionKind::Name(name.text), span: name.span }
    }

    fn call(&mut self, pair: Pair<'_, Rule>) -> Expression {
        let span = self.span(&pair);
        let name =
            pair.clone().into_inner().find(|part| part.as_rule() == Rule::name).map(|part| self.name(&part));
        let arguments = self.formulas(pair);
        let Some(name) = name else { return nothing(span) };
        if let Some(function) = Function::from_name(&name.text) {
            self.check_arity(function, arguments.len(), span);
            return Expression { kind: ExpressionKind::Call { function, arguments }, span };
        }
        if name.text == "δ" {
            if arguments.len() != 1 {
                self.report(codes::ARGUMENTS, span, "`δ` takes one argument", "", "write `δ(x - 0.2 m)`");
            }
            let argument = arguments.into_iter().next().unwrap_or_else(|| nothing(span));
            return Expression { kind: ExpressionKind::PointSource(Box::new(argument)), span };
        }
        self.refuse_call(&name.text, name.span, span);
        Expression { kind: ExpressionKind::Apply { operator: name, arguments }, span }
    }

    fn check_arity(&mut self, function: Function, given: usize, span: Span) {
        let several = matches!(function, Function::Min | Function::Max);
        if (several && given >= 2) || (!several && given == 1) {
            return;
        }
        let (wanted, example) =
            if several { ("two arguments or more", "(a, b)") } else { ("one argument", "(a)") };
        let message = format!("`{}` takes {wanted}, not {given}", function.name());
        self.report(codes::ARGUMENTS, span, message, "", format!("write `{}{example}`", function.name()));
    }

    /// A name before a bracket that is declared, but as no operator.
    fn refuse_call(&mut self, name: &str, place: Span, span: Span) {
        let section = self.declared.section(name);
        let written = self.excerpt(span);
        let remedy = match section {
            Some(Section::Operators) => return,
            Some(Section::Coefficients) => {
                format!(
                    "write `{name}` alone (its arguments are fixed where it is declared), or `{name} * (…)` for a product"
                )
            }
            None if name != "t" && name != "π" => return,
            _ => format!("write `{name} * (…)` if a product is meant"),
        };
        let message = format!("`{name}` is no function, so `{written}` means nothing");
        self.report(codes::NOT_A_FUNCTION, place, message, "stands before a bracket", remedy);
    }

    fn cases(&mut self, pair: Pair<'_, Rule>) -> Expression {
        let span = self.span(&pair);
        let mut branches = Vec::new();
        let mut otherwise = nothing(span);
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::branch => branches.extend(self.branch(part)),
                Rule::otherwise => otherwise = self.first_formula(part),
                _ => {}
            }
        }
        Expression { kind: ExpressionKind::Cases { branches, otherwise: Box::new(otherwise) }, span }
    }

    fn branch(&mut self, pair: Pair<'_, Rule>) -> Option<Branch> {
        let mut condition = None;
        let mut value = None;
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::comparison => condition = self.comparison(part),
                Rule::formula => value = Some(self.formula(part)),
                _ => {}
            }
        }
        Some(Branch { condition: condition?, value: value? })
    }

    pub(super) fn comparison(&mut self, pair: Pair<'_, Rule>) -> Option<Comparison> {
        let span = self.span(&pair);
        let mut sides = Vec::new();
        let mut relation = Relation::Less;
        for part in pair.into_inner() {
            match part.as_rule() {
                Rule::formula => sides.push(self.formula(part)),
                Rule::relation => {
                    relation = match part.as_str().trim() {
                        "<" => Relation::Less,
                        ">" => Relation::Greater,
                        "<=" | "≤" => Relation::LessOrEqual,
                        _ => Relation::GreaterOrEqual,
                    }
                }
                _ => {}
            }
        }
        let right = sides.pop()?;
        Some(Comparison { left: sides.pop()?, relation, right, span })
    }
}

/// Whether a formula is the name of a function, or a power of it.
fn is_bare_function(expression: &Expression) -> bool {
    match &expression.kind {
        ExpressionKind::Name(name) => Function::from_name(name).is_some(),
        ExpressionKind::Power { base, .. } => is_bare_function(base),
        _ => false,
    }
}

fn sign_of(pair: &Pair<'_, Rule>) -> Sign {
    if pair.as_str().starts_with('-') { Sign::Minus } else { Sign::Plus }
}

/// Whether a formula is a vector by its form: a gradient, perhaps with a sign or scalar factors.
fn is_vector(expression: &Expression) -> bool {
    match &expression.kind {
        ExpressionKind::Gradient(_) => true,
        ExpressionKind::Negate(inner) => is_vector(inner),
        ExpressionKind::Product(factors) => factors.iter().any(|factor| is_vector(&factor.value)),
        ExpressionKind::Sum(terms) => terms.iter().any(|term| is_vector(&term.value)),
        _ => false,
    }
}
