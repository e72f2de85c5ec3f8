//! Accuracy and time.

use super::Checker;
use super::formula::Place;
use crate::diagnostic::nearest::nearest;
use crate::diagnostic::{Diagnostic, codes_check};
use crate::exact::Rational;
use crate::model::sign::Sign;
use crate::model::{Accuracy, AskedOrder, Dimension, Expression, Method, Step, TimePlan};
use crate::source::Span;
use crate::syntax::tree::{self, AccuracyKind, AccuracyLine, ClosureFamily, OrderOf, Section, TimeKind};

/// Steps and outputs of a run: at a million steps a second this takes eleven days.
const MOST_STEPS: i64 = 1_000_000_000_000;

/// Methods that the literature names and that come later.
const IMPLICIT: [&str; 6] = ["backward-euler", "crank-nicolson", "bdf2", "trapezoidal", "implicit", "sdirk"];

impl Checker<'_> {
    /// The interior order of a named operator's `with` clauses.
    pub(super) fn operator_order(&mut self, clauses: &[AccuracyLine]) -> Option<usize> {
        let mut order = None;
        let mut first: Option<Span> = None;
        for clause in clauses {
            match &clause.kind {
                AccuracyKind::Order { axes, .. } if !axes.is_empty() => self.not_yet(
                    clause.span,
                    "an operator's order along one axis",
                    "state the order for the operator as a whole, or make an operator for each axis",
                ),
                AccuracyKind::Order { order: own, .. } => {
                    if let Some(first) = first {
                        self.stated_twice(clause.span, first, "the order of the operator");
                    }
                    first.get_or_insert(clause.span);
                    order = self.order_in_range(own, own.span);
                }
                other => self.refuse_closures(other, clause.span),
            }
        }
        order
    }

    fn refuse_closures(&mut self, kind: &AccuracyKind, span: Span) {
        match kind {
            AccuracyKind::Closures(ClosureFamily::OneSided) => {
                self.not_yet(
                    span,
                    "one-sided closures",
                    "leave it out: closures are energy-stable by default",
                );
            }
            AccuracyKind::Closures(ClosureFamily::Mirrored) => {
                self.not_yet(span, "mirrored closures", "leave it out and give ∂/∂n = 0 at the face");
            }
            AccuracyKind::Dissipation { .. } => {
                self.not_yet(span, "dissipation", "leave it out, or resolve the steep parts with more nodes");
            }
            AccuracyKind::Closures(ClosureFamily::EnergyStable) | AccuracyKind::Order { .. } => {}
        }
    }

    fn order_in_range(&mut self, order: &tree::Whole, span: Span) -> Option<usize> {
        if (1..=16).contains(&order.value) {
            return Some(order.value as usize);
        }
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::ORDER_RANGE,
                span,
                format!("order {} is not offered", order.value),
            )
            .with_text("expected 1 to 16"),
        );
        None
    }

    pub(super) fn accuracy(&mut self) -> Option<Accuracy> {
        let file = self.file;
        let mut per_axis: Vec<Option<(AskedOrder, Span)>> = vec![None; file.axes.len()];
        let mut span = None;
        let mut sound = !self.has_faulty(Section::Accuracy);
        let mut general: Option<(AskedOrder, Span)> = None;
        let mut closures: Option<Span> = None;
        for line in &file.accuracy {
            let AccuracyKind::Order { order, of, axes } = &line.kind else {
                match closures {
                    Some(first) if matches!(line.kind, AccuracyKind::Closures(_)) => {
                        self.stated_twice(line.span, first, "the family of closures");
                        sound = false;
                    }
                    _ => self.refuse_closures(&line.kind, line.span),
                }
                if matches!(line.kind, AccuracyKind::Closures(_)) {
                    closures.get_or_insert(line.span);
                }
                continue;
            };
            span.get_or_insert(line.span);
            let Some(value) = self.order_in_range(order, order.span) else {
                sound = false;
                continue;
            };
            let asked = match of {
                OrderOf::Solution => AskedOrder::Solution(value),
                OrderOf::Interior => AskedOrder::Interior(value),
            };
            if axes.is_empty() {
                if let Some((_, first)) = general {
                    self.stated_twice(line.span, first, "the order");
                    sound = false;
                }
                general = Some((asked, line.span));
            }
            for axis in axes {
                let found = self.scope.axis(&axis.text);
                match self.scope.expect(axis, "an axis", found, &mut self.diagnostics) {
                    Some(id) => {
                        if let Some((_, first)) = per_axis[id.0] {
                            self.stated_twice(axis.span, first, &format!("the order along `{}`", axis.text));
                            sound = false;
                        }
                        per_axis[id.0] = Some((asked, axis.span));
                    }
                    None => sound = false,
                }
            }
        }
        if sound
            && file.section(Section::Accuracy).is_some()
            && general.is_none()
            && per_axis.iter().any(Option::is_none)
        {
            let at = self.section_span(Section::Accuracy);
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::SECTION_MISSING,
                    at,
                    "the order of accuracy is not stated for every axis",
                )
                .with_remedy("add `order 4`, say, to the section `accuracy`"),
            );
            return None;
        }
        let per_axis: Option<Vec<AskedOrder>> =
            per_axis.into_iter().map(|own| own.or(general).map(|(asked, _)| asked)).collect();
        sound.then_some(())?;
        Some(Accuracy {
            span: span.unwrap_or_else(|| self.section_span(Section::Accuracy)),
            per_axis: per_axis?,
        })
    }

    pub(super) fn time(&mut self) -> Option<TimePlan> {
        let file = self.file;
        let (mut interval, mut method, mut step) = (None, None, None);
        let mut first: [Option<Span>; 3] = [None; 3];
        let mut sound = !self.has_faulty(Section::Time);
        for line in &file.time {
            let (first, what) = match &line.kind {
                TimeKind::Interval { .. } => (&mut first[0], "the interval"),
                TimeKind::Method(_) => (&mut first[1], "the method"),
                TimeKind::Step(_) | TimeKind::StepOfLimit(_) => (&mut first[2], "the step"),
            };
            if let Some(first) = *first {
                self.stated_twice(line.span, first, what);
                sound = false;
                continue;
            }
            *first = Some(line.span);
            match &line.kind {
                TimeKind::Interval { start, end } => interval = Some(self.interval(start, end, line.span)),
                TimeKind::Method(name) => method = Some(self.method(name)),
                TimeKind::Step(duration) => {
                    step = Some(self.duration(duration, "the step").map(Step::Duration))
                }
                TimeKind::StepOfLimit(fraction) => step = Some(self.fraction(fraction)),
            }
        }
        if sound && file.section(Section::Time).is_some() {
            let span = self.section_span(Section::Time);
            for (missing, example) in [
                (interval.is_none(), "0 s to 60 s"),
                (method.is_none(), "method rk4"),
                (step.is_none(), "step 0.9 of limit"),
            ] {
                if missing {
                    self.diagnostics.push(
                        Diagnostic::error(
                            codes_check::SECTION_MISSING,
                            span,
                            "the section `time` is not complete",
                        )
                        .with_remedy(format!("add a line like `{example}`")),
                    );
                }
            }
        }
        let (start, end) = interval??;
        let (method, step) = (method??, step??);
        if let (Step::Duration(duration), Some(at)) = (&step, first[2]) {
            self.countable(duration, &end.clone().minus(start.clone()), at, "steps")?;
        }
        sound.then(|| TimePlan { start, end, method, step, span: self.section_span(Section::Time) })
    }

    fn interval(
        &mut self,
        start: &tree::Expression,
        end: &tree::Expression,
        span: Span,
    ) -> Option<(Expression, Expression)> {
        let (a, b) = (self.formula(start, Place::Constant), self.formula(end, Place::Constant));
        let (a, b) = (a?, b?);
        if let (Some(first), Some(second)) = (&a.dimension, &b.dimension)
            && first != second
        {
            let (first, second) = (first.clone(), second.clone());
            self.mismatch(end.span, &second, start.span, &first, "the ends of the time interval");
            return None;
        }
        if let Some(dimension) = self.time_dimension.clone()
            && !dimension.is_one()
            && dimension != Dimension::time()
        {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::NOT_A_TIME,
                    span,
                    format!("the time interval is in {dimension}"),
                )
                .with_text("expected times, like `0 s to 3 d`, or pure numbers"),
            );
            return None;
        }
        if !self.is_positive(&b.value.clone().minus(a.value.clone())) {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::TIME_DIRECTION,
                    span,
                    "the end of the time interval is not after its start",
                )
                .with_remedy("give the earlier time first, like `0 s to 60 s`"),
            );
            return None;
        }
        self.whole_time = Some(b.value.clone().minus(a.value.clone()));
        Some((a.value, b.value))
    }

    fn method(&mut self, name: &tree::Name) -> Option<Method> {
        if let Some((method, _)) = Method::ALL.iter().find(|(_, known)| *known == name.text) {
            return Some(*method);
        }
        if IMPLICIT.contains(&name.text.to_lowercase().as_str()) {
            self.not_yet(
                name.span,
                &format!("the implicit method `{}`", name.text),
                "use an explicit method, such as rk4 or lsrk4",
            );
            return None;
        }
        let names: Vec<&str> = Method::ALL.iter().map(|(_, known)| *known).collect();
        let remedy = match nearest(&name.text, names.iter().copied()) {
            Some(near) => format!("did you mean `{near}`?"),
            None => format!("the methods are {}", names.join(", ")),
        };
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::UNKNOWN_METHOD,
                name.span,
                format!("`{}` is no time method known here", name.text),
            )
            .with_text(format!("expected one of {}", names.join(", ")))
            .with_remedy(remedy),
        );
        None
    }

    /// A positive time.
    pub(super) fn duration(&mut self, tree: &tree::Expression, what: &str) -> Option<Expression> {
        let typed = self.formula(tree, Place::Constant)?;
        if let (Some(own), Some(time)) = (&typed.dimension, &self.time_dimension)
            && own != time
        {
            self.diagnostics.push(
                Diagnostic::error(codes_check::NOT_A_TIME, tree.span, format!("{what} is a time"))
                    .with_text(format!("this is in {own}, and the time interval in {time}")),
            );
            return None;
        }
        if !self.is_positive(&typed.value) {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::NOT_POSITIVE,
                    tree.span,
                    format!("{what} must be greater than zero"),
                )
                .with_text("expected a positive time"),
            );
            return None;
        }
        Some(typed.value)
    }

    /// Whether an interval holds a number of steps or outputs that anyone could wait for.
    pub(super) fn countable(
        &mut self,
        each: &Expression,
        whole: &Expression,
        at: Span,
        what: &str,
    ) -> Option<()> {
        let most = Expression::Number(Rational::from(MOST_STEPS));
        if self.sign(&whole.clone().minus(each.clone().times(most))) != Sign::Positive {
            return Some(());
        }
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::TOO_MANY_STEPS,
                at,
                format!("the time interval has more than {MOST_STEPS} of these {what}"),
            )
            .with_remedy("give a longer duration here, or a shorter interval"),
        );
        None
    }

    fn fraction(&mut self, tree: &tree::Expression) -> Option<Step> {
        let typed = self.formula(tree, Place::Constant)?;
        if let Expression::Number(fraction) = &typed.value
            && typed.dimension.as_ref().is_none_or(Dimension::is_one)
            && fraction.is_positive()
            && *fraction <= Rational::from(100)
        {
            return Some(Step::OfLimit(fraction.clone()));
        }
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::NOT_POSITIVE,
                tree.span,
                "the fraction of the limit is a number greater than zero",
            )
            .with_remedy("write a literal, like `step 0.9 of limit`"),
        );
        None
    }
}
