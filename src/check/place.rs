//! Conditions: where they hold, initial conditions, and the two sides of face conditions.

use super::Checker;
use super::formula::{Bound, Place};
use super::raw::RawCondition;
use crate::diagnostic::{Diagnostic, codes_check};
use crate::model::sign::Sign;
use crate::model::{self, AxisId, Equation, Expression, Face, FieldId, InitialCondition, Side, TimeOrder};
use crate::syntax::tree::{self, End, PlaceKind, Section};

impl Checker<'_> {
    /// The state at the start: every field, and the rates of fields that are second order in time.
    pub(super) fn initial_conditions(
        &mut self,
        equations: &Option<Vec<Equation>>,
    ) -> Option<Vec<InitialCondition>> {
        let file = self.file;
        let mut found: Vec<InitialCondition> = Vec::new();
        let mut sound = !self.has_faulty(Section::Conditions);
        for condition in file.conditions.iter().filter(|condition| condition.place.kind == PlaceKind::Start) {
            match self.initial(condition) {
                Some(initial) => {
                    let twin = found
                        .iter()
                        .find(|known| known.field == initial.field && known.derivative == initial.derivative);
                    if let Some(twin) = twin {
                        self.diagnostics.push(
                            Diagnostic::error(
                                codes_check::SECOND_INITIAL,
                                condition.span,
                                "the start is given twice",
                            )
                            .with_text("given again here")
                            .with_label(twin.span, "first given here")
                            .with_remedy("leave one of them out"),
                        );
                        sound = false;
                        continue;
                    }
                    found.push(initial);
                }
                None => sound = false,
            }
        }
        let Some(equations) = equations else { return sound.then_some(found) };
        if sound && file.section(Section::Conditions).is_some() {
            for equation in equations {
                let name = &file.fields[equation.field.0].name;
                let has = |derivative: usize| {
                    found.iter().any(|known| known.field == equation.field && known.derivative == derivative)
                };
                let second = equation.order == TimeOrder::Second;
                if !has(0) || second && !has(1) {
                    let what = if has(0) { format!("∂{}/∂t", name.text) } else { name.text.clone() };
                    let why = if second {
                        " (its equation is second order in time: value and rate are needed)"
                    } else {
                        ""
                    };
                    self.diagnostics.push(
                        Diagnostic::error(
                            codes_check::NO_INITIAL,
                            name.span,
                            format!("the start of {what} is not given{why}"),
                        )
                        .with_remedy(format!("add `at t = start: {what} = …` to the section `conditions`")),
                    );
                    sound = false;
                }
                if !second && has(1) {
                    let span = found
                        .iter()
                        .find(|known| known.field == equation.field && known.derivative == 1)
                        .map_or(name.span, |known| known.span);
                    self.diagnostics.push(
                        Diagnostic::error(
                            codes_check::SECOND_INITIAL,
                            span,
                            format!(
                                "`{}` is first order in time: its rate at the start follows from its equation",
                                name.text
                            ),
                        )
                        .with_remedy("leave this start out"),
                    );
                    sound = false;
                }
            }
        }
        sound.then_some(found)
    }

    fn initial(&mut self, condition: &tree::Condition) -> Option<InitialCondition> {
        let left = self.formula(&condition.left, Place::Condition);
        let right = self.formula(&condition.right, Place::Data);
        let (left, right) = (left?, right?);
        let (field, derivative) = match &left.value {
            Expression::Field(field) => (*field, 0),
            Expression::Rate(field) => (*field, 1),
            _ => {
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::INITIAL_FORM,
                        condition.left.span,
                        "the left side of a start is a field or its rate",
                    )
                    .with_text("expected a field, or ∂/∂t of one")
                    .with_remedy("solve for the field: write `at t = start: T = …`"),
                );
                return None;
            }
        };
        if let (Some(a), Some(b)) = (&left.dimension, &right.dimension)
            && a != b
        {
            let (a, b) = (a.clone(), b.clone());
            self.mismatch(condition.right.span, &b, condition.left.span, &a, "the sides of a condition");
            return None;
        }
        Some(InitialCondition { field, derivative, value: right.value, span: condition.span })
    }

    /// Conditions on faces, both sides converted.
    pub(super) fn face_conditions(&mut self) -> Option<Vec<RawCondition>> {
        let file = self.file;
        let mut found = Vec::new();
        let mut sound = !self.has_faulty(Section::Conditions);
        for condition in &file.conditions {
            let faces = match &condition.place.kind {
                PlaceKind::Start => continue,
                PlaceKind::EveryEdge => {
                    let faces = self.every_edge();
                    if faces.is_empty() && !file.axes.is_empty() {
                        self.diagnostics.push(
                            Diagnostic::error(
                                codes_check::NOT_A_FACE,
                                condition.place.span,
                                "this grid has no edge: every axis is periodic",
                            )
                            .with_remedy("leave out the condition, or `periodic` at an axis"),
                        );
                        sound = false;
                    }
                    faces
                }
                PlaceKind::Face { axis, end, patch } => match self.face(axis, end, patch) {
                    Some(face) => vec![face],
                    None => {
                        sound = false;
                        continue;
                    }
                },
            };
            for (face, patch) in faces {
                match self.raw(condition, face, patch) {
                    Some(raw) => found.push(raw),
                    None => {
                        sound = false;
                        break;
                    }
                }
            }
        }
        sound.then_some(found)
    }

    fn every_edge(&self) -> Vec<(Face, Vec<model::Comparison>)> {
        let periodic = |axis: &tree::Axis| {
            axis.properties.iter().any(|property| property.kind == tree::AxisPropertyKind::Periodic)
        };
        let bounded = (0..self.file.axes.len()).filter(|index| !periodic(&self.file.axes[*index]));
        bounded
            .flat_map(|index| {
                [Side::Low, Side::High].map(|side| (Face { axis: AxisId(index), side }, Vec::new()))
            })
            .collect()
    }

    fn face(
        &mut self,
        axis: &tree::Name,
        end: &End,
        patch: &[tree::Comparison],
    ) -> Option<(Face, Vec<model::Comparison>)> {
        let found = self.scope.axis(&axis.text);
        let id = self.scope.expect(axis, "an axis (or `t = start`)", found, &mut self.diagnostics)?;
        let side = match end {
            End::Low(_) => Side::Low,
            End::High(_) => Side::High,
            End::At(place) => self.side(id, place)?,
        };
        let mut comparisons = Vec::new();
        let mut sound = true;
        for comparison in patch {
            match self.comparison(comparison, Place::Data, &Bound::default()) {
                Some(comparison) => comparisons.push(comparison),
                None => sound = false,
            }
        }
        sound.then_some((Face { axis: id, side }, comparisons))
    }

    /// `x = 0.36 m`: one of the two ends, exactly.
    fn side(&mut self, axis: AxisId, place: &tree::Expression) -> Option<Side> {
        let typed = self.formula(place, Place::Constant)?;
        let tree::Extent::Interval { low, high, .. } = &self.file.axes[axis.0].extent else { return None };
        let quiet = self.diagnostics.clone();
        let (low, high) = (self.formula(low, Place::Constant), self.formula(high, Place::Constant));
        self.diagnostics = quiet;
        let (low, high) = (low?, high?);
        let equal = |this: &Self, a: &Expression, b: &Expression| {
            a == b || this.sign(&a.clone().minus(b.clone())) == Sign::Zero
        };
        if equal(self, &typed.value, &low.value) {
            return Some(Side::Low);
        }
        if equal(self, &typed.value, &high.value) {
            return Some(Side::High);
        }
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::NOT_A_FACE,
                place.span,
                "only faces carry conditions, and this is inside or outside the axis",
            )
            .with_text("expected one of the axis's two ends")
            .with_remedy(format!("write `{0} = low` or `{0} = high`", self.file.axes[axis.0].name.text)),
        );
        None
    }

    fn raw(
        &mut self,
        condition: &tree::Condition,
        face: Face,
        patch: Vec<model::Comparison>,
    ) -> Option<RawCondition> {
        self.normal = Some((face.axis, self.scope.length(face.axis)));
        let left = self.formula(&condition.left, Place::Condition);
        let right = self.formula(&condition.right, Place::Condition);
        self.normal = None;
        let (left, right) = (left?, right?);
        if let (Some(a), Some(b)) = (&left.dimension, &right.dimension)
            && a != b
        {
            let (a, b) = (a.clone(), b.clone());
            self.mismatch(condition.right.span, &b, condition.left.span, &a, "the sides of a condition");
            return None;
        }
        let text = self.source.slice(condition.span).trim().to_owned();
        Some(RawCondition { face, patch, left: left.value, right: right.value, text, span: condition.span })
    }

    /// Fields in a list of expressions that are fields alone.
    pub(super) fn plain_field(value: &Expression) -> Option<FieldId> {
        match value {
            Expression::Field(field) => Some(*field),
            _ => None,
        }
    }
}
