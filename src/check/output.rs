//! Outputs: fields, derived fields, largest values, integrals and gauges with their places.

use super::Checker;
use super::formula::Place;
use super::scope::Typed;
use crate::diagnostic::{Diagnostic, codes_check};
use crate::exact::Rational;
use crate::model::sign::Sign;
use crate::model::{self, Dimension, Expression, Output, OutputKind};
use crate::source::Span;
use crate::syntax::tree::{self, Section};

/// Gauges that one line may make.
const MOST_GAUGES: i64 = 10_000;

impl Checker<'_> {
    /// The time between outputs; how many that makes is known where the interval is sound.
    fn every(&mut self, tree: &tree::Expression) -> Option<Expression> {
        let every = self.duration(tree, "the time between outputs")?;
        if let Some(whole) = self.whole_time.clone() {
            self.countable(&every, &whole, tree.span, "outputs")?;
        }
        Some(every)
    }

    pub(super) fn outputs(
        &mut self,
        axes: &Option<Vec<model::Axis>>,
        fields: &Option<Vec<model::Field>>,
    ) -> Option<Vec<Output>> {
        let file = self.file;
        let mut sound = !self.has_faulty(Section::Output);
        let mut outputs: Vec<Output> = Vec::new();
        for line in &file.outputs {
            let every = match &line.every {
                Some(duration) => self.every(duration).map(Some),
                None => Some(None),
            };
            let made = self.output(line, axes, fields);
            let (Some(every), Some(made)) = (every, made) else {
                sound = false;
                continue;
            };
            for mut output in made {
                output.every = every.clone();
                if let Some(twin) = outputs.iter().find(|known| known.name == output.name) {
                    self.diagnostics.push(
                        Diagnostic::error(
                            codes_check::DUPLICATE_NAME,
                            line.span,
                            format!("the output `{}` is named twice", output.name),
                        )
                        .with_text("named again here")
                        .with_label(twin.span, "first here")
                        .with_remedy("give each output a name of its own"),
                    );
                    sound = false;
                    continue;
                }
                let lower = output.name.to_lowercase();
                let twin = outputs.iter().find(|known| {
                    is_folder(known) && is_folder(&output) && known.name.to_lowercase() == lower
                });
                if let Some(twin) = twin {
                    self.diagnostics.push(
                        Diagnostic::error(
                            codes_check::CASE_TWINS,
                            line.span,
                            format!("the outputs `{}` and `{}` differ only in case", twin.name, output.name),
                        )
                        .with_text("its folder would be mistaken for the other's")
                        .with_label(twin.span, "the other")
                        .with_remedy("rename one of them"),
                    );
                    sound = false;
                    continue;
                }
                outputs.push(output);
            }
        }
        sound.then_some(outputs)
    }

    fn output(
        &mut self,
        line: &tree::OutputLine,
        axes: &Option<Vec<model::Axis>>,
        fields: &Option<Vec<model::Field>>,
    ) -> Option<Vec<Output>> {
        let span = line.span;
        match &line.kind {
            tree::OutputKind::Field(name) => {
                let found = self.scope.field(&name.text);
                let id = self.scope.expect(name, "a field", found, &mut self.diagnostics)?;
                let dimension = self.scope.fields.get(id.0).cloned().flatten();
                let typed = Typed { value: Expression::Field(id), dimension };
                Some(vec![finish(&name.text, typed, OutputKind::Snapshot, fields, span)])
            }
            tree::OutputKind::Derived { name, value } => {
                let typed = self.formula(value, Place::Output)?;
                self.output_name(name)?;
                Some(vec![finish(&name.text, typed, OutputKind::Snapshot, fields, span)])
            }
            tree::OutputKind::Maximum { name, value } => {
                let typed = self.formula(value, Place::Output)?;
                if let Some(every) = &line.every {
                    self.diagnostics.push(
                        Diagnostic::error(
                            codes_check::MISPLACED,
                            every.span,
                            "a maximum over time is written once, at the end",
                        )
                        .with_text("`every` cannot stand here")
                        .with_remedy("leave it out"),
                    );
                    return None;
                }
                self.output_name(name)?;
                Some(vec![finish(&name.text, typed, OutputKind::Maximum, fields, span)])
            }
            tree::OutputKind::Integral { name, value, over } => {
                let typed = self.formula(value, Place::Output)?;
                self.output_name(name)?;
                for (index, axis) in over.iter().enumerate() {
                    let found = self.scope.axis(&axis.text);
                    self.scope.expect(axis, "an axis", found, &mut self.diagnostics)?;
                    if let Some(first) = over[..index].iter().find(|other| other.text == axis.text) {
                        self.stated_twice(axis.span, first.span, &format!("the axis `{}`", axis.text));
                        return None;
                    }
                }
                if over.len() != self.file.axes.len() {
                    self.not_yet(
                        span,
                        "an integral over some of the axes only",
                        "integrate over all axes of the model",
                    );
                    return None;
                }
                let volume =
                    self.scope.axes.iter().flatten().fold(Dimension::one(), |total, axis| total.times(axis));
                let typed =
                    Typed { dimension: typed.dimension.map(|own| own.times(&volume)), value: typed.value };
                let mut output = finish(&name.text, typed, OutputKind::Integral, &None, span);
                output.unit = output.dimension.to_string();
                Some(vec![output])
            }
            tree::OutputKind::Gauge { name, value, place } => {
                let typed = self.formula(value, Place::Output)?;
                self.output_name(name)?;
                let places: Vec<(tree::Name, Vec<Expression>)> = place
                    .iter()
                    .map(|coordinate| {
                        Some((
                            coordinate.axis.clone(),
                            vec![self.coordinate(&coordinate.axis, &coordinate.value)?],
                        ))
                    })
                    .collect::<Option<_>>()?;
                let place = self.place(places, axes, span)?;
                Some(
                    place
                        .into_iter()
                        .map(|place| {
                            finish(&name.text, typed.clone(), OutputKind::Gauge { place }, fields, span)
                        })
                        .collect(),
                )
            }
            tree::OutputKind::Gauges { name, value, place } => {
                let typed = self.formula(value, Place::Output)?;
                self.output_name(name)?;
                let mut places = Vec::new();
                for range in place {
                    places.push((range.axis.clone(), self.range(range)?));
                }
                let all = self.place(places, axes, span)?;
                let many = all.len();
                Some(
                    all.into_iter()
                        .enumerate()
                        .map(|(index, place)| {
                            let label = if many == 1 {
                                name.text.clone()
                            } else {
                                format!("{}_{}", name.text, index + 1)
                            };
                            finish(&label, typed.clone(), OutputKind::Gauge { place }, fields, span)
                        })
                        .collect(),
                )
            }
        }
    }

    /// An output may be named as anything but a field, which has a folder of that name already.
    fn output_name(&mut self, name: &tree::Name) -> Option<()> {
        if self.scope.field(&name.text).is_none() {
            return Some(());
        }
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::DUPLICATE_NAME,
                name.span,
                format!("`{}` is a field already", name.text),
            )
            .with_remedy("give the output a name of its own"),
        );
        None
    }

    fn coordinate(&mut self, axis: &tree::Name, value: &tree::Expression) -> Option<Expression> {
        let found = self.scope.axis(&axis.text);
        let id = self.scope.expect(axis, "an axis", found, &mut self.diagnostics)?;
        let typed = self.formula(value, Place::Constant)?;
        if let (Some(own), Some(wanted)) = (typed.dimension.clone(), self.scope.length(id))
            && own != wanted
        {
            self.mismatch(value.span, &own, axis.span, &wanted, "a place and its axis");
            return None;
        }
        let tree::Extent::Interval { low, high, .. } = &self.file.axes[id.0].extent else { return None };
        let quiet = self.diagnostics.clone();
        let (low, high) = (self.formula(low, Place::Constant), self.formula(high, Place::Constant));
        self.diagnostics = quiet;
        let (low, high) = (low?, high?);
        let below = self.sign(&typed.value.clone().minus(low.value)) == Sign::Negative;
        let above = self.sign(&high.value.minus(typed.value.clone())) == Sign::Negative;
        if below || above {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::OUTSIDE,
                    value.span,
                    format!("this lies outside the axis `{}`", axis.text),
                )
                .with_text("expected a place on the axis")
                .with_label(self.file.axes[id.0].span, "the axis"),
            );
            return None;
        }
        Some(typed.value)
    }

    /// `A to B by C`: A, A + C, … up to B.
    fn range(&mut self, range: &tree::GaugeRange) -> Option<Vec<Expression>> {
        let first = self.coordinate(&range.axis, &range.first)?;
        let Some((last, by)) = &range.to else { return Some(vec![first]) };
        let last = self.coordinate(&range.axis, last)?;
        let distance = self.formula(by, Place::Constant)?;
        let wanted = self.scope.axis(&range.axis.text).and_then(|id| self.scope.length(id));
        if let Some((own, wanted)) = distance.dimension.clone().zip(wanted)
            && own != wanted
        {
            self.mismatch(by.span, &own, range.axis.span, &wanted, "the distance of gauges and their axis");
            return None;
        }
        let step = distance.value;
        let (Expression::Number(a), Expression::Number(b), Expression::Number(c)) = (&first, &last, &step)
        else {
            self.not_yet(
                by.span,
                "a range of gauges that is not given by plain numbers",
                "give the places as numbers with units",
            );
            return None;
        };
        let count = (b - a).checked_div(c).map(|count| count.floor()).and_then(|count| count.to_i64());
        let Some(count) = count.filter(|count| (0..MOST_GAUGES).contains(count)) else {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::NOT_POSITIVE,
                    by.span,
                    "this distance does not lead from the first place to the last",
                )
                .with_text(format!("at most {MOST_GAUGES} gauges in a line")),
            );
            return None;
        };
        Some((0..=count).map(|index| Expression::Number(a + &(c * &Rational::from(index)))).collect())
    }

    /// All combinations of coordinates, one for each axis.
    fn place(
        &mut self,
        given: Vec<(tree::Name, Vec<Expression>)>,
        axes: &Option<Vec<model::Axis>>,
        span: Span,
    ) -> Option<Vec<Vec<Expression>>> {
        let mut places: Vec<Vec<Expression>> = vec![Vec::new()];
        for axis in axes.as_ref()? {
            let mut of_axis = given.iter().filter(|(name, _)| name.text == axis.name);
            let (Some((_, values)), None) = (of_axis.next(), of_axis.next()) else {
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::PLACE_INCOMPLETE,
                        span,
                        format!("a place needs one coordinate along `{}`", axis.name),
                    )
                    .with_remedy(format!("write `at {} = …`, one for each axis", axis.name)),
                );
                return None;
            };
            places = places
                .into_iter()
                .flat_map(|place| {
                    values
                        .iter()
                        .map(move |value| place.iter().cloned().chain([value.clone()]).collect::<Vec<_>>())
                })
                .collect();
            if places.len() as i64 > MOST_GAUGES {
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::NOT_POSITIVE,
                        span,
                        format!("more than {MOST_GAUGES} gauges in a line"),
                    )
                    .with_remedy("write a field instead, and read the places from its file"),
                );
                return None;
            }
        }
        Some(places)
    }
}

/// Whether an output has a folder of its own.
fn is_folder(output: &Output) -> bool {
    matches!(output.kind, OutputKind::Snapshot | OutputKind::Maximum)
}

/// An output in the unit of a field of the same dimension, or in SI.
fn finish(
    name: &str,
    typed: Typed,
    kind: OutputKind,
    fields: &Option<Vec<model::Field>>,
    span: Span,
) -> Output {
    let dimension = typed.dimension.unwrap_or_else(Dimension::one);
    let like = match Checker::plain_field(&typed.value) {
        Some(id) => fields.as_ref().and_then(|fields| fields.get(id.0)),
        None => fields.iter().flatten().find(|field| field.dimension == dimension),
    };
    let (unit, scale) = match like {
        Some(field) => (field.unit.clone(), field.scale.clone()),
        None => (dimension.to_string(), Expression::one()),
    };
    Output { name: name.to_owned(), dimension, unit, scale, value: typed.value, kind, every: None, span }
}
