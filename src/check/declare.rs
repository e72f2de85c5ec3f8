//! Axes, constants, coefficients and fields.

use super::Checker;
use super::bounds::Extent as Size;
use super::formula::{Bound, Place};
use super::scope::{Kind, Typed};
use super::units::Scale;
use crate::diagnostic::{Diagnostic, codes_check};
use crate::model::numeric::{Point, evaluate};
use crate::model::sign::Sign;
use crate::model::{self, Dimension, Expression, FoldedConstant, FreeConstant};
use crate::source::Span;
use crate::syntax::tree::{
    self, AxisPropertyKind, CoefficientValue, Counted, ExpressionKind, Extent, Section,
};

/// The most nodes that an axis may have, and a grid.
const MOST_NODES: u64 = 1 << 34;

impl Checker<'_> {
    /// The unit of `t` is that of the time section.
    pub(super) fn find_time_dimension(&mut self) {
        for line in &self.file.time {
            if let tree::TimeKind::Interval { start, end } = &line.kind {
                let quiet = self.diagnostics.clone();
                let sides = [start, end].map(|side| self.formula(side, Place::Constant));
                // Faults are reported when the section itself is read.
                self.diagnostics = quiet;
                let [Some(start), Some(end)] = sides else { return };
                let dimension = end.dimension.or(start.dimension).unwrap_or_else(Dimension::one);
                self.time_dimension = Some(dimension).filter(|own| own.is_one() || *own == Dimension::time());
                return;
            }
        }
    }

    /// Axes in order. Their dimensions are in the scope even where something else is wrong with them.
    pub(super) fn axes(&mut self) -> Option<Vec<model::Axis>> {
        let file = self.file;
        if !(1..=3).contains(&file.axes.len())
            && file.section(Section::Axes).is_some()
            && !self.has_faulty(Section::Axes)
        {
            let span = file.axes.get(3).map_or_else(|| self.section_span(Section::Axes), |axis| axis.span);
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::AXES_COUNT,
                    span,
                    format!("a model has 1 to 3 axes, this one has {}", file.axes.len()),
                )
                .with_text("expected one, two or three axes"),
            );
        }
        let mut axes = Vec::new();
        for axis in &file.axes {
            axes.push(self.axis(axis));
        }
        let axes: Vec<model::Axis> = axes.into_iter().collect::<Option<_>>()?;
        let total = axes.iter().fold(1u64, |total, axis| total.saturating_mul(axis.nodes as u64));
        if total > MOST_NODES {
            let span = self.section_span(Section::Axes);
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::GRID_SIZE,
                    span,
                    format!("the grid has {total} nodes; at most {MOST_NODES} are possible"),
                )
                .with_remedy("use fewer nodes along the axes"),
            );
            return None;
        }
        (1..=3).contains(&axes.len()).then_some(axes)
    }

    fn axis(&mut self, axis: &tree::Axis) -> Option<model::Axis> {
        let mut periodic = false;
        let mut sound = true;
        for (index, property) in axis.properties.iter().enumerate() {
            if axis.properties[..index].iter().any(|other| other.kind == property.kind) {
                self.twice(property.span, "this property of the axis");
                sound = false;
            }
            match &property.kind {
                AxisPropertyKind::Periodic => periodic = true,
                AxisPropertyKind::Graded(_) => {
                    self.not_yet(property.span, "a graded axis", "use a uniform axis with more nodes");
                    sound = false;
                }
                AxisPropertyKind::Radial | AxisPropertyKind::Spherical => {
                    self.not_yet(property.span, "a radial or spherical axis", "use a Cartesian axis");
                    sound = false;
                }
            }
        }
        let (low, high, count) = match &axis.extent {
            Extent::Interval { low, high, count } => (low, high, count),
            Extent::Listed(_) => {
                self.scope.axes.push(None);
                self.not_yet(axis.span, "an axis with listed nodes", "use `A to B, N nodes`");
                return None;
            }
        };
        let (a, b) = (self.formula(low, Place::Constant), self.formula(high, Place::Constant));
        let dimension = match (&a, &b) {
            (Some(a), Some(b)) => b.dimension.clone().or_else(|| a.dimension.clone()),
            _ => None,
        };
        self.scope.axes.push(dimension.clone());
        let (a, b) = (a?, b?);
        let dimension = dimension.unwrap_or_else(Dimension::one);
        if let (Some(first), Some(second)) = (&a.dimension, &b.dimension)
            && first != second
        {
            self.mismatch(high.span, second, low.span, first, "the ends of an axis");
            sound = false;
        } else if !self.is_positive(&b.value.clone().minus(a.value.clone())) {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::AXIS_DIRECTION,
                    axis.span,
                    format!("axis `{}` does not run upwards", axis.name.text),
                )
                .with_text("the first end must be less than the second"),
            );
            sound = false;
        }
        let number = count.number.value;
        let nodes = if count.of == Counted::Cells && !periodic { number.saturating_add(1) } else { number };
        if !(2..=MOST_NODES).contains(&nodes) {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::GRID_SIZE,
                    count.number.span,
                    format!("axis `{}` has {nodes} nodes", axis.name.text),
                )
                .with_text(format!("expected 2 to {MOST_NODES} nodes")),
            );
            sound = false;
        }
        sound.then(|| model::Axis {
            name: axis.name.text.clone(),
            dimension,
            low: a.value,
            high: b.value,
            nodes: nodes as usize,
            periodic,
            span: axis.span,
        })
    }

    /// Says that something is stated a second time.
    pub(super) fn twice(&mut self, span: Span, what: &str) {
        self.diagnostics.push(
            Diagnostic::error(codes_check::STATED_TWICE, span, format!("{what} is stated twice"))
                .with_text("stated again here")
                .with_remedy("leave one of them out"),
        );
    }

    /// Whether an expression of constants is greater than zero: for the whole range of free constants where that can be
    /// told exactly, else at their defaults.
    pub(super) fn is_positive(&self, value: &Expression) -> bool {
        match self.sign(value) {
            Sign::Positive => true,
            Sign::Negative | Sign::Zero | Sign::NonPositive => false,
            Sign::NonNegative | Sign::Unknown => evaluate(value, &self.probe(), &Point::default())
                .is_some_and(|number| number.is_finite() && number > 0.0),
        }
    }

    /// The sign of an expression of constants, free constants at their stated range.
    pub(super) fn sign(&self, value: &Expression) -> Sign {
        if let Expression::Number(number) = value {
            return match number.sign() {
                0 => Sign::Zero,
                1 => Sign::Positive,
                _ => Sign::Negative,
            };
        }
        model::sign::sign(value, &self.probe())
    }

    /// A model of constants alone, for questions about them.
    fn probe(&self) -> model::Model {
        model::Model {
            name: String::new(),
            title: String::new(),
            axes: Vec::new(),
            free_constants: self.free.clone(),
            folded_constants: Vec::new(),
            coefficients: self.coefficients.clone(),
            fields: Vec::new(),
            equations: Vec::new(),
            conditions: Vec::new(),
            initial: Vec::new(),
            accuracy: model::Accuracy { span: Span::default(), per_axis: Vec::new() },
            time: model::TimePlan {
                start: Expression::zero(),
                end: Expression::zero(),
                method: model::Method::Euler,
                step: model::Step::OfLimit(crate::exact::Rational::one()),
                span: Span::default(),
            },
            outputs: Vec::new(),
            verification: None,
        }
    }

    /// Fields in order; their dimensions go to the scope.
    pub(super) fn fields(&mut self) -> Option<Vec<model::Field>> {
        let file = self.file;
        if file.fields.is_empty()
            && file.section(Section::Fields).is_some()
            && !self.has_faulty(Section::Fields)
        {
            let span = self.section_span(Section::Fields);
            self.diagnostics.push(Diagnostic::error(
                codes_check::SECTION_MISSING,
                span,
                "the model has no field",
            ));
        }
        let mut fields = Vec::new();
        for field in &file.fields {
            let scale = match &field.unit {
                Some(unit) => self.unit(unit),
                None => Some(Scale { factor: Expression::one(), dimension: Dimension::one() }),
            };
            self.scope.fields.push(scale.as_ref().map(|scale| scale.dimension.clone()));
            fields.push((field, scale));
        }
        let mut result = Vec::new();
        for (field, scale) in fields {
            result.push(self.field(field, scale));
        }
        result.into_iter().collect()
    }

    fn field(&mut self, field: &tree::Field, scale: Option<Scale>) -> Option<model::Field> {
        let mut sound = true;
        let mut named = Vec::new();
        for axis in &field.axes {
            let found = self.scope.axis(&axis.text);
            match self.scope.expect(axis, "an axis", found, &mut self.diagnostics) {
                Some(id) if named.contains(&id) => {
                    self.twice(axis.span, "this axis");
                    sound = false;
                }
                Some(id) => named.push(id),
                None => sound = false,
            }
        }
        if sound && named.len() < self.file.axes.len() {
            self.not_yet(
                field.span,
                &format!("a field on some of the axes only (`{}`)", field.name.text),
                "let every field live on all axes of the model",
            );
            sound = false;
        }
        if let Some(axis) = field.staggered.first() {
            self.not_yet(
                axis.span,
                "a staggered field",
                "leave out `staggered`: all fields live at the nodes",
            );
            sound = false;
        }
        let bounds = match &field.bounds {
            None => Some(None),
            Some(bounds) => {
                self.bounds(bounds, scale.as_ref().map(|scale| scale.dimension.clone())).map(Some)
            }
        };
        let (scale, bounds) = (scale?, bounds?);
        sound.then(|| model::Field {
            name: field.name.text.clone(),
            dimension: scale.dimension,
            unit: field.unit.as_ref().map_or_else(|| "1".to_owned(), |unit| unit.spelling.clone()),
            scale: scale.factor,
            bounds,
            span: field.span,
        })
    }

    /// `between A and B`, of a dimension.
    fn bounds(
        &mut self,
        bounds: &tree::Bounds,
        dimension: Option<Dimension>,
    ) -> Option<(Expression, Expression)> {
        let (low, high) =
            (self.formula(&bounds.low, Place::Constant), self.formula(&bounds.high, Place::Constant));
        let (low, high) = (low?, high?);
        let dimension = dimension?;
        for (side, typed) in [(&bounds.low, &low), (&bounds.high, &high)] {
            if let Some(own) = typed.dimension.as_ref().filter(|own| **own != dimension) {
                let own = own.clone();
                self.mismatch(side.span, &own, bounds.span, &dimension, "a bound and what it bounds");
                return None;
            }
        }
        if matches!(self.sign(&high.value.clone().minus(low.value.clone())), Sign::Negative) {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::BOUNDS_ORDER,
                    bounds.span,
                    "the lower bound lies above the upper one",
                )
                .with_remedy("exchange the two"),
            );
            return None;
        }
        Some((low.value, high.value))
    }

    /// Resolves every constant, used or not, so that every fault is found.
    pub(super) fn constants(&mut self) {
        for index in 0..self.file.constants.len() {
            let span = self.file.constants[index].name.span;
            self.constant(index, span);
        }
    }

    /// Resolves every coefficient, used or not.
    pub(super) fn coefficients(&mut self) {
        // Places first, so that indices of the file and of the model agree whatever is wrong.
        self.coefficient_extents = vec![Size::default(); self.file.coefficients.len()];
        for coefficient in &self.file.coefficients {
            self.coefficients.push(model::Coefficient {
                name: coefficient.name.text.clone(),
                dimension: Dimension::one(),
                value: Expression::zero(),
            });
        }
        for index in 0..self.file.coefficients.len() {
            let span = self.file.coefficients[index].name.span;
            self.coefficient(index, span);
        }
    }

    /// Reads the body of every operator once with parameters of any unit, so that one that nobody uses is checked too.
    pub(super) fn operators(&mut self) {
        let file = self.file;
        for (index, operator) in file.operators.iter().enumerate() {
            let any = Typed { value: Expression::Field(model::FieldId(0)), dimension: None };
            let parameters =
                operator.parameters.iter().map(|name| (name.text.clone(), any.clone())).collect();
            let order = self.operator_order(&operator.accuracy);
            let Some(()) = self.enter(Kind::Operator(index), operator.name.span) else { continue };
            self.convert(&operator.value, Place::Operator, &Bound { parameters, order });
            self.resolving.pop();
        }
    }

    /// Begins to resolve something; refused where it is being resolved already.
    pub(super) fn enter(&mut self, kind: Kind, span: Span) -> Option<()> {
        if self.circular.contains(&kind) {
            return None;
        }
        if let Some(place) = self.resolving.iter().position(|known| *known == kind) {
            let names: Vec<&str> =
                self.resolving[place..].iter().chain([&kind]).map(|kind| self.declared_name(*kind)).collect();
            let (name, way) = (names[0], names.join(" → "));
            self.diagnostics.push(
                Diagnostic::error(codes_check::CYCLE, span, format!("`{name}` is defined by itself"))
                    .with_text(format!("the circle is {way}"))
                    .with_remedy("break the circle: one of them must be given without the others"),
            );
            self.circular.extend_from_slice(&self.resolving[place..]);
            return None;
        }
        self.resolving.push(kind);
        Some(())
    }

    fn declared_name(&self, kind: Kind) -> &str {
        match kind {
            Kind::Constant(index) => &self.file.constants[index].name.text,
            Kind::Coefficient(index) => &self.file.coefficients[index].name.text,
            Kind::Operator(index) => &self.file.operators[index].name.text,
            Kind::Axis(_) | Kind::Field(_) | Kind::Faulty => "",
        }
    }

    /// A constant, resolved when it is first used.
    pub(super) fn constant(&mut self, index: usize, span: Span) -> Option<Typed> {
        if let Some(known) = &self.scope.constants[index] {
            return known.clone();
        }
        self.enter(Kind::Constant(index), span)?;
        let typed = self.constant_value(index);
        self.resolving.pop();
        self.scope.constants[index] = Some(typed.clone());
        typed
    }

    fn constant_value(&mut self, index: usize) -> Option<Typed> {
        let file = self.file;
        let constant = &file.constants[index];
        let typed = self.formula(&constant.value, Place::Constant)?;
        let extent = self.measured(&typed.value, constant.value.span)?;
        let unit = match leading_unit(&constant.value) {
            Some(unit) => self.unit(unit).map(|scale| (unit.spelling.clone(), scale)),
            None => None,
        };
        let dimension = typed.dimension.clone().unwrap_or_else(Dimension::one);
        let description = constant.description.as_ref().map(|text| text.text.clone());
        let typed = if constant.free.is_some() {
            let bounds = match &constant.bounds {
                Some(bounds) => Some(self.bounds(bounds, Some(dimension.clone()))?),
                None => None,
            };
            if let (Some((low, high)), Some(written)) = (&bounds, &constant.bounds) {
                self.default_within(constant, &typed.value, low, high, written.span)?;
            }
            let (unit, scale) = match &unit {
                Some((spelling, scale)) if scale.dimension == dimension => {
                    (spelling.clone(), scale.factor.clone())
                }
                _ => (dimension.to_string(), Expression::one()),
            };
            self.free_extents.push(extent);
            self.free.push(FreeConstant {
                name: constant.name.text.clone(),
                description,
                dimension,
                value: typed.value,
                bounds,
                unit,
                scale,
            });
            let id = model::ConstantId(self.free.len() - 1);
            Typed { value: Expression::Constant(id), dimension: typed.dimension }
        } else {
            self.folded.push(FoldedConstant {
                name: constant.name.text.clone(),
                description,
                dimension,
                value: typed.value.clone(),
            });
            typed
        };
        Some(typed)
    }

    /// The default of a free constant lies in its own range.
    fn default_within(
        &mut self,
        constant: &tree::Constant,
        value: &Expression,
        low: &Expression,
        high: &Expression,
        range: Span,
    ) -> Option<()> {
        let outside = [value.clone().minus(low.clone()), high.clone().minus(value.clone())]
            .iter()
            .any(|room| self.sign(room) == Sign::Negative);
        if !outside {
            return Some(());
        }
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::BOUNDS_ORDER,
                constant.value.span,
                format!("`{}` lies outside its own range", constant.name.text),
            )
            .with_text("the value that holds unless another is given")
            .with_label(range, "its range")
            .with_remedy("widen the range, or correct the value"),
        );
        None
    }

    /// A coefficient, resolved when it is first used.
    pub(super) fn coefficient(&mut self, index: usize, span: Span) -> Option<Typed> {
        if let Some(known) = &self.scope.coefficients[index] {
            return known.clone();
        }
        let file = self.file;
        let coefficient = &file.coefficients[index];
        self.enter(Kind::Coefficient(index), span)?;
        let typed = self.coefficient_value(coefficient);
        self.resolving.pop();
        let extent = typed.as_ref().and_then(|typed| self.measured(&typed.value, coefficient.span));
        let typed = typed.filter(|_| extent.is_some());
        self.scope.coefficients[index] = Some(typed.clone());
        let (typed, extent) = (typed?, extent?);
        self.coefficient_extents[index] = extent;
        self.coefficients[index] = model::Coefficient {
            name: coefficient.name.text.clone(),
            dimension: typed.dimension.clone().unwrap_or_else(Dimension::one),
            value: typed.value.clone(),
        };
        Some(typed)
    }

    fn coefficient_value(&mut self, coefficient: &tree::Coefficient) -> Option<Typed> {
        let value = match &coefficient.value {
            CoefficientValue::Formula(value) => value,
            CoefficientValue::Data { .. } => {
                let what = if coefficient.arguments.iter().any(|name| name.text == "t") {
                    "a signal from a file"
                } else {
                    "a coefficient from a data file"
                };
                self.not_yet(coefficient.span, what, "give the coefficient as a formula");
                return None;
            }
        };
        let unit = match &coefficient.unit {
            Some(unit) => Some(self.unit(unit)?.dimension),
            None => None,
        };
        for (index, argument) in coefficient.arguments.iter().enumerate() {
            if coefficient.arguments[..index].iter().any(|other| other.text == argument.text) {
                self.twice(argument.span, "this argument");
                return None;
            }
            let known = argument.text == "t"
                || matches!(self.scope.kind(&argument.text), Some(Kind::Axis(_) | Kind::Field(_)));
            self.scope.expect(
                argument,
                "an axis, `t` or a field",
                known.then_some(()),
                &mut self.diagnostics,
            )?;
        }
        let typed = self.formula(value, Place::Pointwise)?;
        if let (Some(wanted), Some(found)) = (&unit, &typed.dimension)
            && wanted != found
        {
            let (wanted, found) = (wanted.clone(), found.clone());
            let span = coefficient.unit.as_ref().map_or(coefficient.span, |unit| unit.span);
            self.mismatch(value.span, &found, span, &wanted, "the formula and the stated unit");
            return None;
        }
        self.hidden_dependence(coefficient, &typed.value)?;
        Some(Typed { dimension: typed.dimension.or(unit), value: typed.value })
    }

    /// The arguments name all that the coefficient depends on.
    fn hidden_dependence(&mut self, coefficient: &tree::Coefficient, value: &Expression) -> Option<()> {
        let found = model::calculus::dependence(value, &self.coefficients);
        let named = |name: &str| coefficient.arguments.iter().any(|argument| argument.text == name);
        let mut missing: Vec<&str> = Vec::new();
        missing.extend(
            found
                .coordinates
                .iter()
                .map(|axis| self.file.axes[axis.0].name.text.as_str())
                .filter(|name| !named(name)),
        );
        missing.extend(
            found
                .fields
                .iter()
                .map(|field| self.file.fields[field.0].name.text.as_str())
                .filter(|name| !named(name)),
        );
        if found.time && !named("t") {
            missing.push("t");
        }
        if missing.is_empty() {
            return Some(());
        }
        let list = missing.join("`, `");
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::HIDDEN_ARGUMENT,
                coefficient.name.span,
                format!("`{}` depends on `{list}`, which its arguments do not name", coefficient.name.text),
            )
            .with_remedy(format!("write `{}({})`", coefficient.name.text, {
                let mut all: Vec<&str> =
                    coefficient.arguments.iter().map(|name| name.text.as_str()).collect();
                all.extend(&missing);
                all.join(", ")
            })),
        );
        None
    }
}

/// The unit that a value is written in, where it is one quantity.
fn leading_unit(value: &tree::Expression) -> Option<&tree::Unit> {
    match &value.kind {
        ExpressionKind::Quantity { unit, .. } => Some(unit),
        ExpressionKind::Negate(inner) => leading_unit(inner),
        _ => None,
    }
}
