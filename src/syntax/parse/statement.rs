//! Statements → tree, section by section.

use pest::iterators::Pair;

use super::{Reader, Rule, nothing};
use crate::diagnostic::codes;
use crate::source::Span;
use crate::syntax::tree::{
    AccuracyKind, AccuracyLine, Axis, AxisProperty, AxisPropertyKind, Bounds, ClosureFamily, Coefficient,
    CoefficientValue, Condition, Constant, Coordinate, Count, Counted, Covering, End, Equation, Expression,
    Extent, Field, GaugeRange, Header, Name, Operator, OrderOf, OutputKind, OutputLine, Place, PlaceKind,
    TimeKind, TimeLine, VerificationKind, VerificationLine, Whole,
};

/// The parts of a statement by rule, so that optional ones can be asked for.
struct Parts<'a>(Vec<Pair<'a, Rule>>);

impl<'a> Parts<'a> {
    fn of(pair: Pair<'a, Rule>) -> Parts<'a> {
        Parts(pair.into_inner().collect())
    }

    fn all(&self, rule: Rule) -> impl Iterator<Item = Pair<'a, Rule>> + '_ {
        self.0.iter().filter(move |part| part.as_rule() == rule).cloned()
    }

    fn first(&self, rule: Rule) -> Option<Pair<'a, Rule>> {
        self.all(rule).next()
    }

    fn has(&self, rule: Rule) -> bool {
        self.first(rule).is_some()
    }
}

impl Reader<'_> {
    /// Adds the statement that an entry rule has read to the file.
    pub(super) fn entry(&mut self, rule: Rule, pair: Pair<'_, Rule>, span: Span) {
        let parts = Parts::of(pair);
        match rule {
            Rule::header => self.header(&parts, span),
            Rule::axis => self.axis(&parts, span),
            Rule::constant => self.constant(&parts, span),
            Rule::coefficient => self.coefficient(&parts, span),
            Rule::field => self.field(&parts, span),
            Rule::operator => self.operator(&parts, span),
            Rule::equation => self.equation(&parts, span),
            Rule::conditions => self.conditions(&parts),
            Rule::accuracy => {
                let lines =
                    parts.first(Rule::clauses).map(|clauses| self.clauses(clauses)).unwrap_or_default();
                self.file.accuracy.extend(lines);
            }
            Rule::time => self.time(&parts, span),
            Rule::output => self.output(&parts, span),
            _ => self.verification(&parts, span),
        }
    }

    fn part_name(&mut self, parts: &Parts<'_>, span: Span) -> Name {
        let name = parts.first(Rule::name).map(|name| self.name(&name));
        name.unwrap_or(Name { text: String::new(), span })
    }

    fn declares(&mut self, parts: &Parts<'_>, span: Span) -> Name {
        let name = parts.first(Rule::name).map(|name| self.declared_name(&name));
        name.unwrap_or(Name { text: String::new(), span })
    }

    fn part_formula(&mut self, parts: &Parts<'_>, span: Span) -> Expression {
        let formula = parts.first(Rule::formula).map(|formula| self.formula(formula));
        formula.unwrap_or_else(|| nothing(span))
    }

    fn part_formulas(&mut self, parts: &Parts<'_>) -> Vec<Expression> {
        let formulas: Vec<_> = parts.all(Rule::formula).collect();
        formulas.into_iter().map(|formula| self.formula(formula)).collect()
    }

    fn pair_of(&mut self, parts: &Parts<'_>, span: Span) -> (Expression, Expression) {
        let mut both = self.part_formulas(parts).into_iter();
        let first = both.next().unwrap_or_else(|| nothing(span));
        (first, both.next().unwrap_or_else(|| nothing(span)))
    }

    fn part_whole(&mut self, parts: &Parts<'_>, span: Span) -> Whole {
        let whole = parts.first(Rule::whole).map(|whole| self.whole(&whole));
        whole.unwrap_or(Whole { value: 0, span })
    }

    fn bounds(&mut self, pair: Pair<'_, Rule>) -> Bounds {
        let span = self.span(&pair);
        let (low, high) = self.pair_of(&Parts::of(pair), span);
        Bounds { low, high, span }
    }

    fn header(&mut self, parts: &Parts<'_>, span: Span) {
        let name = self.part_name(parts, span);
        let title = parts.first(Rule::text).map(|text| self.text(&text));
        self.file.header = Some(Header { name, title, span });
    }

    fn axis(&mut self, parts: &Parts<'_>, span: Span) {
        let name = self.declares(parts, span);
        let extent = match (parts.first(Rule::interval), parts.first(Rule::listed)) {
            (Some(interval), _) => self.interval(interval),
            (None, Some(listed)) => Extent::Listed(self.formulas(listed)),
            (None, None) => Extent::Listed(Vec::new()),
        };
        let mut properties = Vec::new();
        for property in parts.all(Rule::axis_property) {
            let span = self.span(&property);
            let inner = Parts::of(property);
            let kind = if let Some(graded) = inner.first(Rule::graded) {
                AxisPropertyKind::Graded(self.first_formula(graded))
            } else if inner.has(Rule::kw_periodic) {
                AxisPropertyKind::Periodic
            } else if inner.has(Rule::kw_radial) {
                AxisPropertyKind::Radial
            } else {
                AxisPropertyKind::Spherical
            };
            properties.push(AxisProperty { kind, span });
        }
        self.file.axes.push(Axis { name, extent, properties, span });
    }

    fn interval(&mut self, pair: Pair<'_, Rule>) -> Extent {
        let span = self.span(&pair);
        let parts = Parts::of(pair);
        let (low, high) = self.pair_of(&parts, span);
        let number = self.part_whole(&parts, span);
        let cells = parts.first(Rule::counted).is_some_and(|counted| counted.as_str().starts_with("cells"));
        let of = if cells { Counted::Cells } else { Counted::Nodes };
        Extent::Interval { low, high, count: Count { number, of } }
    }

    fn constant(&mut self, parts: &Parts<'_>, span: Span) {
        let name = self.declares(parts, span);
        let value = self.part_formula(parts, span);
        let free = parts.first(Rule::free);
        let free_span = free.as_ref().map(|free| self.span(free));
        let inner = free.and_then(|free| Parts::of(free).first(Rule::bounds));
        let bounds = inner.or_else(|| parts.first(Rule::bounds)).map(|bounds| self.bounds(bounds));
        let description = parts.first(Rule::text).map(|text| self.text(&text));
        self.file.constants.push(Constant { name, value, free: free_span, bounds, description, span });
    }

    fn coefficient(&mut self, parts: &Parts<'_>, span: Span) {
        let name = self.declares(parts, span);
        let arguments = parts.first(Rule::arguments).map(|names| self.names(names)).unwrap_or_default();
        let unit = parts.first(Rule::unit).map(|unit| self.unit(unit));
        let on = parts.first(Rule::names).map(|names| self.names(names)).unwrap_or_default();
        let value = match parts.first(Rule::data) {
            Some(data) => self.data(data),
            None => CoefficientValue::Formula(self.part_formula(parts, span)),
        };
        let description = parts.first(Rule::text).map(|text| self.text(&text));
        self.file.coefficients.push(Coefficient { name, arguments, unit, on, value, description, span });
    }

    fn data(&mut self, pair: Pair<'_, Rule>) -> CoefficientValue {
        let span = self.span(&pair);
        let parts = Parts::of(pair);
        let file = parts.first(Rule::text).map(|text| self.text(&text));
        let file = file.unwrap_or(crate::syntax::tree::Text { text: String::new(), span });
        let mut covering = Vec::new();
        for one in parts.all(Rule::coverings).flat_map(|all| Parts::of(all).0) {
            if one.as_rule() == Rule::covering {
                let span = self.span(&one);
                let inner = Parts::of(one);
                let axis = self.part_name(&inner, span);
                let (low, high) = self.pair_of(&inner, span);
                covering.push(Covering { axis, low, high, span });
            }
        }
        let interpolated =
            parts.first(Rule::interpolated).and_then(|word| self.names(word).into_iter().next());
        CoefficientValue::Data { file, covering, interpolated }
    }

    fn field(&mut self, parts: &Parts<'_>, span: Span) {
        let name = self.declares(parts, span);
        let unit = parts.first(Rule::unit).map(|unit| self.unit(unit));
        let axes = parts.first(Rule::names).map(|names| self.names(names)).unwrap_or_default();
        let mut staggered = Vec::new();
        for one in parts.all(Rule::staggered) {
            if let Some(names) = Parts::of(one).first(Rule::names) {
                staggered.extend(self.names(names));
            }
        }
        if let Some(second) = parts.all(Rule::bounds).nth(1) {
            let span = self.span(&second);
            self.report(
                codes::UNEXPECTED,
                span,
                "the bounds of a field are given twice",
                "again here",
                "remove one of them",
            );
        }
        let bounds = parts.first(Rule::bounds).map(|bounds| self.bounds(bounds));
        let description = parts.first(Rule::text).map(|text| self.text(&text));
        self.file.fields.push(Field { name, unit, axes, staggered, bounds, description, span });
    }

    fn operator(&mut self, parts: &Parts<'_>, span: Span) {
        let name = self.declares(parts, span);
        let parameters = parts.first(Rule::arguments).map(|names| self.names(names)).unwrap_or_default();
        let value = self.part_formula(parts, span);
        let accuracy = parts.first(Rule::clauses).map(|clauses| self.clauses(clauses)).unwrap_or_default();
        self.file.operators.push(Operator { name, parameters, value, accuracy, span });
    }

    /// Both sides of an equality.
    fn equality(&mut self, pair: Pair<'_, Rule>) -> (Expression, Expression) {
        let span = self.span(&pair);
        let parts = Parts::of(pair);
        if let Some(second) = parts.first(Rule::trap_equals) {
            let place = self.span(&second);
            let place = Span::new(place.start, place.start + 1);
            let continued = self.source.slice(Span::new(span.start, place.start)).contains('\n');
            let remedy = if continued {
                "a line that begins with an operator goes on from the line above; begin it with its operand"
            } else {
                "write one equality a line"
            };
            self.report(codes::SECOND_EQUALS, place, "a second `=` in one equality", "", remedy);
        }
        self.pair_of(&parts, span)
    }

    fn equation(&mut self, parts: &Parts<'_>, span: Span) {
        if let Some(equality) = parts.first(Rule::equality) {
            let (left, right) = self.equality(equality);
            self.file.equations.push(Equation { left, right, span });
        }
    }

    /// `at A; at B: e; f; at C: g`: e and f hold at A and at B, g at C.
    fn conditions(&mut self, parts: &Parts<'_>) {
        let mut places: Vec<Place> = Vec::new();
        let mut stated = true;
        for condition in parts.all(Rule::condition) {
            let span = self.span(&condition);
            let inner = Parts::of(condition);
            if let Some(placed) = inner.first(Rule::placed) {
                let placed = Parts::of(placed);
                if std::mem::take(&mut stated) {
                    places.clear();
                }
                places.extend(placed.first(Rule::place).map(|place| self.place(place)));
                if let Some(equality) = placed.first(Rule::equality) {
                    stated = true;
                    self.condition(equality, &places, span);
                }
            } else if let Some(equality) = inner.first(Rule::equality) {
                if places.is_empty() || !stated {
                    let remedy =
                        "write the place first: `at x = low: …`, `at every edge: …` or `at t = start: …`";
                    self.report(codes::NO_PLACE, span, "this condition says not where it holds", "", remedy);
                }
                stated = true;
                self.condition(equality, &places, span);
            }
        }
        if !stated && let Some(place) = places.last() {
            let span = place.span;
            let remedy = "write `:` and an equality after it";
            self.report(
                codes::UNEXPECTED,
                span,
                "nothing is said to hold at this place",
                "expected `:` after it",
                remedy,
            );
        }
    }

    fn condition(&mut self, equality: Pair<'_, Rule>, places: &[Place], span: Span) {
        let (left, right) = self.equality(equality);
        for place in places {
            self.file.conditions.push(Condition {
                place: place.clone(),
                left: left.clone(),
                right: right.clone(),
                span,
            });
        }
    }

    fn place(&mut self, pair: Pair<'_, Rule>) -> Place {
        let span = self.span(&pair);
        let parts = Parts::of(pair);
        let kind = if parts.has(Rule::at_start) {
            PlaceKind::Start
        } else if let Some(face) = parts.first(Rule::face) {
            let face = Parts::of(face);
            let axis = self.part_name(&face, span);
            let end = face.first(Rule::end).map(|end| self.end(end)).unwrap_or(End::Low(span));
            let comparisons: Vec<_> = face.all(Rule::comparison).collect();
            let patch = comparisons.into_iter().filter_map(|one| self.comparison(one)).collect();
            PlaceKind::Face { axis, end, patch }
        } else {
            PlaceKind::EveryEdge
        };
        Place { kind, span }
    }

    fn end(&mut self, pair: Pair<'_, Rule>) -> End {
        let span = self.span(&pair);
        let parts = Parts::of(pair);
        if parts.has(Rule::kw_low) {
            End::Low(span)
        } else if parts.has(Rule::kw_high) {
            End::High(span)
        } else {
            End::At(self.part_formula(&parts, span))
        }
    }

    fn clauses(&mut self, pair: Pair<'_, Rule>) -> Vec<AccuracyLine> {
        let clauses: Vec<_> = pair.into_inner().filter(|part| part.as_rule() == Rule::clause).collect();
        clauses.into_iter().map(|clause| self.clause(clause)).collect()
    }

    fn clause(&mut self, pair: Pair<'_, Rule>) -> AccuracyLine {
        let span = self.span(&pair);
        let parts = Parts::of(pair);
        let kind = if let Some(asked) = parts.first(Rule::asked_order) {
            let asked = Parts::of(asked);
            let order = self.part_whole(&asked, span);
            let of = if asked.has(Rule::kw_interior) { OrderOf::Interior } else { OrderOf::Solution };
            let axes = asked.first(Rule::names).map(|names| self.names(names)).unwrap_or_default();
            AccuracyKind::Order { order, of, axes }
        } else if let Some(dissipation) = parts.first(Rule::dissipation) {
            let dissipation = Parts::of(dissipation);
            let order = self.part_whole(&dissipation, span);
            let strength = dissipation.first(Rule::strength).map(|strength| self.first_formula(strength));
            AccuracyKind::Dissipation { order, strength }
        } else {
            let family =
                parts.first(Rule::closures).and_then(|closures| Parts::of(closures).first(Rule::family));
            AccuracyKind::Closures(match family.map(|family| family.as_str().trim()) {
                Some("one-sided") => ClosureFamily::OneSided,
                Some("mirrored") => ClosureFamily::Mirrored,
                _ => ClosureFamily::EnergyStable,
            })
        };
        AccuracyLine { kind, span }
    }

    fn time(&mut self, parts: &Parts<'_>, span: Span) {
        let kind = if let Some(method) = parts.first(Rule::method) {
            let word = Parts::of(method).first(Rule::method_name);
            let name = word.map(|word| Name { text: word.as_str().to_string(), span: self.span(&word) });
            TimeKind::Method(name.unwrap_or(Name { text: String::new(), span }))
        } else if let Some(step) = parts.first(Rule::step) {
            let step = Parts::of(step);
            let value = self.part_formula(&step, span);
            if step.has(Rule::of_limit) { TimeKind::StepOfLimit(value) } else { TimeKind::Step(value) }
        } else {
            let duration = parts.first(Rule::duration).map(Parts::of).unwrap_or(Parts(Vec::new()));
            let (start, end) = self.pair_of(&duration, span);
            TimeKind::Interval { start, end }
        };
        self.file.time.push(TimeLine { kind, span });
    }

    fn output(&mut self, parts: &Parts<'_>, span: Span) {
        let Some(what) = parts.0.first().cloned() else { return };
        let every = parts.first(Rule::every).map(|every| self.first_formula(every));
        let description = parts.first(Rule::text).map(|text| self.text(&text));
        let rule = what.as_rule();
        let inner = Parts::of(what);
        let name = self.part_name(&inner, span);
        let kind = match rule {
            Rule::output_field => OutputKind::Field(name),
            Rule::derived => OutputKind::Derived { name, value: self.part_formula(&inner, span) },
            Rule::maximum => OutputKind::Maximum { name, value: self.part_formula(&inner, span) },
            Rule::integral => {
                let value = self.part_formula(&inner, span);
                let over = inner.first(Rule::names).map(|names| self.names(names)).unwrap_or_default();
                OutputKind::Integral { name, value, over }
            }
            Rule::gauge => {
                let value = self.part_formula(&inner, span);
                let coordinates: Vec<_> = inner.all(Rule::coordinate).collect();
                let place = coordinates.into_iter().map(|one| self.coordinate(one)).collect();
                OutputKind::Gauge { name, value, place }
            }
            _ => {
                let value = self.part_formula(&inner, span);
                let ranges: Vec<_> = inner.all(Rule::gauge_range).collect();
                let place = ranges.into_iter().map(|one| self.gauge_range(one)).collect();
                OutputKind::Gauges { name, value, place }
            }
        };
        self.file.outputs.push(OutputLine { kind, every, description, span });
    }

    fn coordinate(&mut self, pair: Pair<'_, Rule>) -> Coordinate {
        let span = self.span(&pair);
        let parts = Parts::of(pair);
        Coordinate { axis: self.part_name(&parts, span), value: self.part_formula(&parts, span) }
    }

    fn gauge_range(&mut self, pair: Pair<'_, Rule>) -> GaugeRange {
        let span = self.span(&pair);
        let parts = Parts::of(pair);
        let axis = self.part_name(&parts, span);
        let mut values = self.part_formulas(&parts).into_iter();
        let first = values.next().unwrap_or_else(|| nothing(span));
        GaugeRange { axis, first, to: values.next().zip(values.next()) }
    }

    fn verification(&mut self, parts: &Parts<'_>, span: Span) {
        let kind = if let Some(grids) = parts.first(Rule::grids) {
            let sizes: Vec<_> = Parts::of(grids).all(Rule::whole).collect();
            VerificationKind::Grids(sizes.iter().map(|size| self.whole(size)).collect())
        } else {
            let solution = parts.first(Rule::solution).map(Parts::of).unwrap_or(Parts(Vec::new()));
            let field = self.part_name(&solution, span);
            let value = self.part_formula(&solution, span);
            if solution.has(Rule::kw_exact) {
                VerificationKind::Exact { field, value }
            } else {
                VerificationKind::Manufactured { field, value }
            }
        };
        self.file.verification.push(VerificationLine { kind, span });
    }
}
