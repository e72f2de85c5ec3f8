//! Axes, constants, coefficients and fields.

use super::Checker;
use super::formula::{Bound, Place};
use super::scope::{Kind, Typed};
use super::size::{Size, size};
use super::units::{self, Scale};
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
                let found =
                    [end, start].into_iter().find_map(|side| self.formula(side, Place::Constant)?.dimension);
                // Faults are reported when the section itself is read.
                self.diagnostics = quiet;
                self.time_dimension = self.time_dimension.take().or(found);
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
                .with_text("expected 1 to 3 axes in all"),
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
                .with_remedy("take fewer nodes along each axis"),
            );
            return None;
        }
        (1..=3).contains(&axes.len()).then_some(axes)
    }

    fn axis(&mut self, axis: &tree::Axis) -> Option<model::Axis> {
        let mut periodic = false;
        let mut sound = true;
        for (index, property) in axis.properties.iter().enumerate() {
            let same = |known: &&tree::AxisProperty| {
                std::mem::discriminant(&known.kind) == std::mem::discriminant(&property.kind)
            };
            if let Some(first) = axis.properties[..index].iter().find(same) {
                self.stated_twice(property.span, first.span, "this property of the axis");
                sound = false;
                continue;
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
        let dimension = [&b, &a].into_iter().find_map(|side| side.as_ref()?.dimension.clone());
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
                .with_text("the first end must be less than the second")
                .with_remedy("exchange the two ends"),
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
            self.diagnostics.push(
                Diagnostic::error(codes_check::SECTION_MISSING, span, "the model has no field")
                    .with_remedy("add a line like `T in K on x`"),
            );
        }
        let mut fields = Vec::new();
        for field in &file.fields {
            let scale = match &field.unit {
                Some(unit) => units::resolve(unit, &mut self.diagnostics),
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
                    let first = field.axes.iter().find(|name| name.text == axis.text).unwrap_or(axis);
                    self.stated_twice(axis.span, first.span, &format!("the axis `{}`", axis.text));
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
            if typed.value.any(&|part| matches!(part, Expression::Constant(_))) {
                self.diagnostics.push(
                    Diagnostic::error(codes_check::MISPLACED, side.span, "a free constant cannot stand here")
                        .with_text("bounds are known before the run")
                        .with_remedy("give the bound by a number or by a constant that is not free"),
                );
                return None;
            }
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
                .with_remedy("exchange the two bounds"),
            );
            return None;
        }
        Some((low.value, high.value))
    }

    /// Resolves every constant, coefficient and operator, used or not, so that every fault is found.
    pub(super) fn resolve_all(&mut self) {
        for index in 0..self.file.constants.len() {
            let span = self.file.constants[index].name.span;
            self.constant(index, span);
        }
        // Places first, so that indices of the file and of the model agree whatever is wrong.
        for coefficient in &self.file.coefficients {
            self.coefficients.push(model::Coefficient {
                name: coefficient.name.text.clone(),
                dimension: Dimension::one(),
                value: Expression::zero(),
            });
        }
        self.sizes = vec![Size::default(); self.file.coefficients.len()];
        for index in 0..self.file.coefficients.len() {
            let span = self.file.coefficients[index].name.span;
            self.coefficient(index, span);
        }
        let accuracy: Vec<_> = self.file.operators.iter().map(|operator| &operator.accuracy).collect();
        for clauses in accuracy {
            self.operator_order(clauses);
        }
    }

    /// Marks what is being resolved; nothing, and one diagnostic, where it leads back to itself.
    pub(super) fn enter(&mut self, kind: Kind, span: Span) -> Option<()> {
        if self.failed.contains(&kind) {
            return None;
        }
        let Some(first) = self.resolving.iter().position(|known| *known == kind) else {
            self.resolving.push(kind);
            return Some(());
        };
        let circle: Vec<Kind> = self.resolving[first..].to_vec();
        self.failed.extend(&circle);
        let names: Vec<String> =
            circle.iter().chain([&kind]).map(|kind| self.declared(*kind).0.text.clone()).collect();
        let (name, declared) = self.declared(kind);
        let mut diagnostic =
            Diagnostic::error(codes_check::CYCLE, span, format!("`{}` is defined by itself", name.text))
                .with_text(names.join(" → "))
                .with_remedy("break the circle: one of them must be given without the others");
        if declared != span {
            diagnostic = diagnostic.with_label(declared, "declared here");
        }
        self.diagnostics.push(diagnostic);
        None
    }

    /// The name of something that can be resolved, and where it is declared.
    fn declared(&self, kind: Kind) -> (&tree::Name, Span) {
        let name = match kind {
            Kind::Constant(index) => &self.file.constants[index].name,
            Kind::Coefficient(index) => &self.file.coefficients[index].name,
            Kind::Operator(index) => &self.file.operators[index].name,
            Kind::Axis(_) | Kind::Field(_) | Kind::Faulty => panic!("only definitions are resolved"),
        };
        (name, name.span)
    }

    /// Reads operators that nothing uses, so that their faults are found too.
    pub(super) fn unused_operators(&mut self) {
        let file = self.file;
        for (index, operator) in file.operators.iter().enumerate() {
            if self.applied.contains(&index) || file.fields.is_empty() {
                continue;
            }
            let stand_in = Typed { value: Expression::Field(model::FieldId(0)), dimension: None };
            let parameters =
                operator.parameters.iter().map(|name| (name.text.clone(), stand_in.clone())).collect();
            let bound = Bound { parameters, ..Bound::default() };
            self.body(index, operator.name.span, Place::Operator, bound);
        }
    }

    /// A constant, resolved when it is first used.
    pub(super) fn constant(&mut self, index: usize, span: Span) -> Option<Typed> {
        if let Some(known) = &self.scope.constants[index] {
            return Some(known.clone());
        }
        self.enter(Kind::Constant(index), span)?;
        let typed = self.constant_value(index);
        self.resolving.pop();
        if typed.is_none() {
            self.failed.insert(Kind::Constant(index));
        }
        self.scope.constants[index] = typed.clone();
        typed
    }

    fn constant_value(&mut self, index: usize) -> Option<Typed> {
        let file = self.file;
        let constant = &file.constants[index];
        let typed = self.formula(&constant.value, Place::Constant)?;
        let unit = match &constant.value.kind {
            ExpressionKind::Quantity { unit, .. } => {
                units::resolve(unit, &mut self.diagnostics).map(|scale| (unit.spelling.clone(), scale))
            }
            _ => None,
        };
        let dimension = typed.dimension.clone().unwrap_or_else(Dimension::one);
        let description = constant.description.as_ref().map(|text| text.text.clone());
        let typed = if constant.free.is_some() {
            let bounds = match &constant.bounds {
                Some(bounds) => {
                    let (low, high) = self.bounds(bounds, Some(dimension.clone()))?;
                    self.default_inside(constant, &typed.value, bounds.span, (&low, &high))?;
                    Some((low, high))
                }
                None => None,
            };
            let (unit, scale) = match &unit {
                Some((spelling, scale)) => (spelling.clone(), scale.factor.clone()),
                None => (dimension.to_string(), Expression::one()),
            };
            self.free_sizes.push(size(&typed.value, &self.sizes, &self.free_sizes));
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

    /// A free constant begins inside its range.
    fn default_inside(
        &mut self,
        constant: &tree::Constant,
        value: &Expression,
        range: Span,
        (low, high): (&Expression, &Expression),
    ) -> Option<()> {
        let below = self.sign(&value.clone().minus(low.clone())) == Sign::Negative;
        let above = self.sign(&high.clone().minus(value.clone())) == Sign::Negative;
        if !below && !above {
            return Some(());
        }
        let side = if below { "below" } else { "above" };
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::DEFAULT_OUTSIDE,
                constant.value.span,
                format!("the value of `{}` lies {side} its range", constant.name.text),
            )
            .with_text("the value when nothing else is given")
            .with_label(range, "the range")
            .with_remedy("widen the range, or give a value inside it"),
        );
        None
    }

    /// A coefficient, resolved when it is first used.
    pub(super) fn coefficient(&mut self, index: usize, span: Span) -> Option<Typed> {
        if let Some(known) = &self.scope.coefficients[index] {
            return Some(known.clone());
        }
        let file = self.file;
        let coefficient = &file.coefficients[index];
        self.enter(Kind::Coefficient(index), span)?;
        let typed = self.coefficient_value(coefficient);
        self.resolving.pop();
        let Some(typed) = typed else {
            self.failed.insert(Kind::Coefficient(index));
            return None;
        };
        self.sizes[index] = size(&typed.value, &self.sizes, &self.free_sizes);
        self.coefficients[index] = model::Coefficient {
            name: coefficient.name.text.clone(),
            dimension: typed.dimension.clone().unwrap_or_else(Dimension::one),
            value: typed.value.clone(),
        };
        self.scope.coefficients[index] = Some(typed.clone());
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
            Some(unit) => Some(units::resolve(unit, &mut self.diagnostics)?.dimension),
            None => None,
        };
        self.arguments(coefficient)?;
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

    /// An argument that the formula does not use may be a slip.
    fn unused_arguments(&mut self, coefficient: &tree::Coefficient, found: &model::calculus::Dependence) {
        for argument in &coefficient.arguments {
            let used = match self.scope.kind(&argument.text) {
                Some(Kind::Axis(index)) => found.noise || found.coordinates.contains(&model::AxisId(index)),
                Some(Kind::Field(index)) => found.fields.contains(&model::FieldId(index)),
                _ => found.time,
            };
            if !used {
                self.diagnostics.push(
                    Diagnostic::warning(
                        codes_check::UNUSED_ARGUMENT,
                        argument.span,
                        format!("`{}` does not depend on `{}`", coefficient.name.text, argument.text),
                    )
                    .with_text("named here, and not used in the formula")
                    .with_remedy("leave it out, or put it into the formula"),
                );
            }
        }
    }

    /// Arguments are axes, `t` and fields, each once.
    fn arguments(&mut self, coefficient: &tree::Coefficient) -> Option<()> {
        let mut sound = Some(());
        for (index, argument) in coefficient.arguments.iter().enumerate() {
            let known = argument.text == "t"
                || matches!(self.scope.kind(&argument.text), Some(Kind::Axis(_) | Kind::Field(_)));
            let found = known.then_some(());
            let what = "an axis, `t` or a field";
            if self.scope.expect(argument, what, found, &mut self.diagnostics).is_none() {
                sound = None;
            }
            let twin = coefficient.arguments[..index].iter().find(|known| known.text == argument.text);
            if let Some(twin) = twin {
                self.stated_twice(argument.span, twin.span, &format!("the argument `{}`", argument.text));
                sound = None;
            }
        }
        sound
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
            self.unused_arguments(coefficient, &found);
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
