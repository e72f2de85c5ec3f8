//! Time methods as stages: which arrays they need and what each stage writes.
//!
//! Updates are fused into the sweep that evaluates the rates wherever the stage does not overwrite the array it reads:
//! - `euler`: two arrays, exchanged after the step;
//! - `ssprk3` in Shu–Osher form (Shu & Osher 1988): three arrays, the last stage in place;
//! - `rk4` (Kutta 1901): four arrays, the sum of the rates is accumulated as the stages go;
//! - `lsrk4` (Carpenter & Kennedy 1994, 2N storage): two arrays, the update of the state is a sweep of its own;
//! - `leapfrog` for second order in time: two arrays, damping is taken centred and solved for at each node.

use super::stage::Lowering;
use super::tableau::{StageRow, rows};
use super::translate::Binding;
use crate::exact::Rational;
use crate::kernel::{Action, BufferId, FaceTerm, FaceWrite, Operation, Pass, Stage, Sweep, ValueId, Write};
use crate::model::calculus::{Variable, partial};
use crate::model::{Expression, FieldId, Method, TimeOrder};
use crate::scheme::Injection;

/// One array of the state: a field, or the velocity of a field that is second order in time.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Component {
    pub(super) field: FieldId,
    pub(super) velocity: bool,
}

/// What a method makes of the model.
pub(super) struct Marching {
    /// Where fields and velocities stand between steps.
    pub(super) present: Binding,
    pub(super) start: Vec<Stage>,
    pub(super) first_step: Vec<Stage>,
    pub(super) step: Vec<Stage>,
    pub(super) rotation: Vec<(BufferId, BufferId)>,
    pub(super) state: Vec<BufferId>,
}

/// A set of arrays, one a component.
type Level = Vec<BufferId>;

impl Lowering<'_> {
    /// All stages of the model's method.
    pub(super) fn march(&mut self) -> Marching {
        match self.model.time.method {
            Method::Leapfrog => self.leapfrog(),
            method => self.runge_kutta(method),
        }
    }

    fn components(&self) -> Vec<Component> {
        let mut components = Vec::new();
        for equation in &self.model.equations {
            components.push(Component { field: equation.field, velocity: false });
            if equation.order == TimeOrder::Second {
                components.push(Component { field: equation.field, velocity: true });
            }
        }
        components
    }

    fn level(&mut self, components: &[Component], what: &str) -> Level {
        let names: Vec<String> = components
            .iter()
            .map(|component| {
                let field = &self.model.fields[component.field.0].name;
                let rate = if component.velocity { " rate" } else { "" };
                if what.is_empty() { format!("{field}{rate}") } else { format!("{field}{rate} {what}") }
            })
            .collect();
        names.into_iter().map(|name| self.buffer(name)).collect()
    }

    fn bind(&mut self, components: &[Component], level: &Level) -> Binding {
        let count = self.model.fields.len();
        let mut field = vec![BufferId(0); count];
        let mut rate = vec![None; count];
        for (component, buffer) in components.iter().zip(level) {
            if component.velocity {
                rate[component.field.0] = Some(self.builder.load(*buffer));
            } else {
                field[component.field.0] = *buffer;
            }
        }
        Binding { field, rate, applied: Vec::new(), shift: Rational::zero() }
    }

    /// Rates of all components under a binding, with face terms; auxiliary sweeps first, the main sweep last (without writes).
    /// Data of flux conditions are taken at the stage as the method itself would have advanced them (`row`).
    fn evaluate(
        &mut self,
        components: &[Component],
        binding: &mut Binding,
        label: &str,
        row: Option<&StageRow>,
    ) -> Vec<Sweep> {
        let scheme = self.scheme;
        let needed: Vec<&Expression> = scheme.rates.iter().collect();
        let mut sweeps = self.apply(&needed, binding);
        let mut main = Sweep { label: label.to_owned(), ..Sweep::default() };
        for component in components {
            let has_velocity =
                components.iter().any(|other| other.field == component.field && other.velocity);
            let rate = if has_velocity && !component.velocity {
                self.stored(&Expression::Rate(component.field), binding)
            } else {
                self.stored(&scheme.rates[component.field.0], binding)
            };
            main.rates.push(rate);
        }
        for correction in &scheme.corrections {
            let rate = rate_index(components, correction.field);
            let on = self.face_set(correction.face, &correction.patch, binding);
            let value = self.correction_value(&correction.value, binding, row);
            main.face_terms.push(FaceTerm { on, rate, action: Action::Add, value });
        }
        for injection in &scheme.injections {
            for (rate, component) in components.iter().enumerate() {
                if component.field != injection.field {
                    continue;
                }
                let slope = if component.velocity { &injection.second_rate } else { &injection.rate };
                let zero = Expression::zero();
                let slope = slope.as_ref().unwrap_or(&zero);
                let term =
                    self.face_term(injection.face, &injection.patch, rate, Action::Replace, slope, binding);
                main.face_terms.push(term);
            }
        }
        sweeps.push(main);
        sweeps
    }

    /// Sets the given values in a level; `only_stiff`: those whose data cannot be differentiated.
    fn inject(&mut self, components: &[Component], level: &Level, which: Which) -> Vec<Pass> {
        let binding = self.bind(components, level);
        let scheme = self.scheme;
        let mut passes = Vec::new();
        for injection in &scheme.injections {
            if which == Which::WithoutRate && injection.rate.is_some() {
                continue;
            }
            let on = self.face_set(injection.face, &injection.patch, &binding);
            let mut writes = Vec::new();
            for (component, buffer) in components.iter().zip(level) {
                if component.field != injection.field {
                    continue;
                }
                if let Some(value) = given(injection, component.velocity) {
                    let value = self.stored(value, &binding);
                    writes.push(Write { buffer: *buffer, value });
                }
            }
            passes.push(Pass::Face(FaceWrite { on, writes }));
        }
        passes
    }

    fn initial(&mut self, components: &[Component], level: &Level) -> Stage {
        let mut binding = self.bind(components, level);
        binding.applied = vec![None; self.scheme.applications.len()];
        let mut sweep = Sweep { label: "initial state".to_owned(), ..Sweep::default() };
        let model = self.model;
        for (component, buffer) in components.iter().zip(level) {
            let value = initial_value(model, component.field, usize::from(component.velocity));
            let value = self.stored(&value, &binding);
            sweep.writes.push(Write { buffer: *buffer, value });
        }
        let mut passes = vec![Pass::Sweep(sweep)];
        passes.extend(self.inject(components, level, Which::All));
        Stage { fraction: Rational::from(0), passes }
    }

    fn runge_kutta(&mut self, method: Method) -> Marching {
        let components = self.components();
        let present = self.level(&components, "");
        let start = vec![self.initial(&components, &present)];
        let mut step = Vec::new();
        let mut rotation = Vec::new();
        match method {
            Method::Euler => {
                let next = self.level(&components, "next");
                let from = vec![(present.clone(), Rational::one())];
                let update = Update { target: next.clone(), from, rate: Rational::one() };
                let row = &rows(Method::Euler)[0];
                self.fused_at(&mut step, &components, "forward Euler", row, &present, vec![update]);
                self.close(&mut step, &components, &next);
                rotation = present.iter().copied().zip(next).collect();
            }
            Method::Ssprk3 => self.ssprk3(&mut step, &components, &present),
            Method::Lsrk4 => self.low_storage(&mut step, &components, &present),
            _ => self.rk4(&mut step, &components, &present),
        }
        let state = present.clone();
        let present = self.bind(&components, &present);
        Marching { present, start, first_step: Vec::new(), step, rotation, state }
    }

    fn ssprk3(&mut self, step: &mut Vec<Stage>, components: &[Component], present: &Level) {
        let first = self.level(components, "stage 1");
        let second = self.level(components, "stage 2");
        let r = Rational::ratio;
        let one = Rational::from(1);
        let plan = [
            (present, &first, vec![(present.clone(), one.clone())], one.clone()),
            (&first, &second, vec![(present.clone(), r(3, 4)), (first.clone(), r(1, 4))], r(1, 4)),
            (&second, present, vec![(present.clone(), r(1, 3)), (second.clone(), r(2, 3))], r(2, 3)),
        ];
        let rows = rows(Method::Ssprk3);
        for (index, (source, target, from, rate)) in plan.into_iter().enumerate() {
            let update = Update { target: target.clone(), from, rate };
            let label = format!("stage {} of 3", index + 1);
            self.fused_at(step, components, &label, &rows[index], source, vec![update]);
            let end = rows.get(index + 1).map_or_else(Rational::one, |row| row.fraction.clone());
            self.settle(step, components, target, end);
        }
        self.close(step, components, present);
    }

    fn rk4(&mut self, step: &mut Vec<Stage>, components: &[Component], present: &Level) {
        let total = self.level(components, "sum");
        let odd = self.level(components, "stage a");
        let even = self.level(components, "stage b");
        let r = Rational::ratio;
        let one = || Rational::from(1);
        let from = |level: &Level| vec![(level.clone(), one())];
        let update = |target: &Level, source: &Level, rate: Rational| Update {
            target: target.clone(),
            from: from(source),
            rate,
        };
        let plan = [
            (present, vec![update(&total, present, r(1, 6)), update(&odd, present, r(1, 2))]),
            (&odd, vec![update(&total, &total, r(1, 3)), update(&even, present, r(1, 2))]),
            (&even, vec![update(&total, &total, r(1, 3)), update(&odd, present, one())]),
            (&odd, vec![update(present, &total, r(1, 6))]),
        ];
        let rows = rows(Method::Rk4);
        let reads_next = [Some(&odd), Some(&even), Some(&odd), None];
        for (index, ((source, updates), next)) in plan.into_iter().zip(reads_next).enumerate() {
            self.fused_at(
                step,
                components,
                &format!("stage {} of 4", index + 1),
                &rows[index],
                source,
                updates,
            );
            if let Some(level) = next {
                self.settle(step, components, level, rows[index + 1].fraction.clone());
            }
        }
        self.close(step, components, present);
    }

    fn low_storage(&mut self, step: &mut Vec<Stage>, components: &[Component], present: &Level) {
        let residual = self.level(components, "residual");
        let rule = crate::scheme::step_rule::carpenter_kennedy();
        let count = rule.a.len();
        let rows = rows(Method::Lsrk4);
        for (index, row) in rows.iter().enumerate() {
            let keep = &rule.a[index];
            let from = if keep.is_zero() { Vec::new() } else { vec![(residual.clone(), keep.clone())] };
            let update = Update { target: residual.clone(), from, rate: Rational::from(1) };
            let label = format!("stage {} of {count}", index + 1);
            self.fused_at(step, components, &label, row, present, vec![update]);
            let mut sweep = Sweep { label: format!("update of {label}"), ..Sweep::default() };
            for (target, source) in present.iter().zip(&residual) {
                let (old, change) = (self.builder.load(*target), self.builder.load(*source));
                let weight = self.builder.literal(rule.b[index].clone());
                let scaled = self.builder.multiply(weight, change);
                let value = self.builder.add(old, scaled);
                sweep.writes.push(Write { buffer: *target, value });
            }
            step.push(Stage { fraction: rule.c[index].clone(), passes: vec![Pass::Sweep(sweep)] });
            let end = rule.c.get(index + 1).cloned().unwrap_or_else(|| Rational::from(1));
            self.settle(step, components, present, end);
        }
        self.close(step, components, present);
    }

    /// A stage: rates at `source`, then target ← Σ weight·level + dt·rate·(rate of the component).
    fn fused_at(
        &mut self,
        step: &mut Vec<Stage>,
        components: &[Component],
        label: &str,
        row: &StageRow,
        source: &Level,
        updates: Vec<Update>,
    ) {
        let mut binding = self.bind(components, source);
        let mut sweeps = self.evaluate(components, &mut binding, label, Some(row));
        if let Some(main) = sweeps.last_mut() {
            for update in &updates {
                for index in 0..components.len() {
                    let value = self.combination(update, index);
                    main.writes.push(Write { buffer: update.target[index], value });
                }
            }
        }
        step.push(Stage {
            fraction: row.fraction.clone(),
            passes: sweeps.into_iter().map(Pass::Sweep).collect(),
        });
    }

    fn combination(&mut self, update: &Update, index: usize) -> ValueId {
        let mut total: Option<ValueId> = None;
        for (level, weight) in &update.from {
            let old = self.builder.load(level[index]);
            let weight = self.builder.literal(weight.clone());
            let part = self.builder.multiply(weight, old);
            total = Some(match total {
                None => part,
                Some(sum) => self.builder.add(sum, part),
            });
        }
        let step = self.builder.value(Operation::Step);
        let weight = self.builder.literal(update.rate.clone());
        let length = self.builder.multiply(weight, step);
        let rate = self.builder.value(Operation::Rate(index));
        let change = self.builder.multiply(length, rate);
        match total {
            None => change,
            Some(sum) => self.builder.add(sum, change),
        }
    }

    /// Data that cannot be differentiated are set in the stage's own array.
    fn settle(&mut self, step: &mut Vec<Stage>, components: &[Component], level: &Level, fraction: Rational) {
        let passes = self.inject(components, level, Which::WithoutRate);
        if !passes.is_empty() {
            step.push(Stage { fraction, passes });
        }
    }

    /// At the end of a step the given values are exact again.
    fn close(&mut self, step: &mut Vec<Stage>, components: &[Component], level: &Level) {
        let passes = self.inject(components, level, Which::All);
        if !passes.is_empty() {
            step.push(Stage { fraction: Rational::from(1), passes });
        }
    }

    fn leapfrog(&mut self) -> Marching {
        let components: Vec<Component> = self
            .model
            .equations
            .iter()
            .map(|equation| Component { field: equation.field, velocity: false })
            .collect();
        let present = self.level(&components, "");
        let past = self.level(&components, "before");
        let start = vec![self.initial(&components, &present)];
        let first_step = vec![self.level_before(&components, &present, &past)];
        let mut step = Vec::new();
        let mut binding = self.bind(&components, &present);
        let (mut sweeps, damping) = self.undamped(&components, &mut binding, "leapfrog");
        if let Some(main) = sweeps.last_mut() {
            for index in 0..components.len() {
                let value = self.leap(present[index], past[index], index, damping[index]);
                main.writes.push(Write { buffer: past[index], value });
            }
        }
        step.push(Stage {
            fraction: Rational::from(0),
            passes: sweeps.into_iter().map(Pass::Sweep).collect(),
        });
        self.close(&mut step, &components, &past);
        let rotation: Vec<_> = present.iter().copied().zip(past.iter().copied()).collect();
        let state = present.iter().chain(&past).copied().collect();
        // Between steps ∂u/∂t is known half a step back: (u − u before)/dt.
        let mut shown = self.bind(&components, &present);
        for (index, component) in components.iter().enumerate() {
            let (new, old) = (self.builder.load(present[index]), self.builder.load(past[index]));
            let difference = self.builder.subtract(new, old);
            let step_length = self.builder.value(Operation::Step);
            shown.rate[component.field.0] = Some(self.builder.divide(difference, step_length));
        }
        Marching { present: shown, start, first_step, step, rotation, state }
    }

    /// Rates with ∂u/∂t taken as zero, and for each component the rate slot of its damping, if it has any:
    /// rate = r − d·∂u/∂t with d in slot `damping`.
    fn undamped(
        &mut self,
        components: &[Component],
        binding: &mut Binding,
        label: &str,
    ) -> (Vec<Sweep>, Vec<Option<usize>>) {
        let mut sweeps = self.evaluate(components, binding, label, None);
        let scheme = self.scheme;
        let mut damping = vec![None; components.len()];
        let Some(main) = sweeps.last_mut() else { return (sweeps, damping) };
        let mut added: Vec<(usize, FaceTerm)> = Vec::new();
        for (index, component) in components.iter().enumerate() {
            let slope = |expression: &Expression| {
                partial(expression, Variable::Rate(component.field), &self.model.coefficients)
                    .map(Expression::negative)
                    .unwrap_or_else(Expression::zero)
            };
            let inside = slope(&scheme.rates[component.field.0]);
            let faces: Vec<_> = scheme
                .corrections
                .iter()
                .filter(|correction| correction.field == component.field)
                .map(|correction| (correction, slope(&correction.value)))
                .filter(|(_, slope)| !slope.is_zero())
                .collect();
            if inside.is_zero() && faces.is_empty() {
                continue;
            }
            let slot = components.len() + damping.iter().flatten().count();
            damping[index] = Some(slot);
            let inside = self.stored(&inside, binding);
            main.rates.push(inside);
            for (correction, slope) in faces {
                let term =
                    self.face_term(correction.face, &correction.patch, slot, Action::Add, &slope, binding);
                added.push((slot, term));
            }
        }
        main.face_terms.extend(added.into_iter().map(|(_, term)| term));
        (sweeps, damping)
    }

    /// (2u − (1 − ½dt·d)·u₋ + dt²·r) / (1 + ½dt·d), or 2u − u₋ + dt²·r without damping.
    fn leap(&mut self, present: BufferId, past: BufferId, rate: usize, damping: Option<usize>) -> ValueId {
        let (u, old) = (self.builder.load(present), self.builder.load(past));
        let two = self.builder.whole(2);
        let doubled = self.builder.multiply(two, u);
        let step = self.builder.value(Operation::Step);
        let square = self.builder.multiply(step, step);
        let rate = self.builder.value(Operation::Rate(rate));
        let force = self.builder.multiply(square, rate);
        let Some(slot) = damping else {
            let inertia = self.builder.subtract(doubled, old);
            return self.builder.add(inertia, force);
        };
        let half = self.builder.literal(Rational::ratio(1, 2));
        let half_step = self.builder.multiply(half, step);
        let strength = self.builder.value(Operation::Rate(slot));
        let loss = self.builder.multiply(half_step, strength);
        let one = self.builder.whole(1);
        let kept = self.builder.subtract(one, loss);
        let back = self.builder.multiply(kept, old);
        let inertia = self.builder.subtract(doubled, back);
        let numerator = self.builder.add(inertia, force);
        let divisor = self.builder.add(one, loss);
        self.builder.divide(numerator, divisor)
    }

    /// u₋ = u − dt·v + ½dt²·(rate at the start, with ∂u/∂t = v).
    fn level_before(&mut self, components: &[Component], present: &Level, past: &Level) -> Stage {
        let mut binding = self.bind(components, present);
        binding.applied = vec![None; self.scheme.applications.len()];
        let model = self.model;
        for component in components {
            let velocity = initial_value(model, component.field, 1);
            binding.rate[component.field.0] = Some(self.stored(&velocity, &binding));
        }
        let velocities = binding.rate.clone();
        let mut sweeps = self.evaluate(components, &mut binding, "the level before the start", None);
        if let Some(main) = sweeps.last_mut() {
            for (index, component) in components.iter().enumerate() {
                let u = self.builder.load(present[index]);
                let step = self.builder.value(Operation::Step);
                let velocity = velocities[component.field.0].unwrap_or_else(|| self.builder.whole(0));
                let drift = self.builder.multiply(step, velocity);
                let half = self.builder.literal(Rational::ratio(1, 2));
                let half_step = self.builder.multiply(half, step);
                let half_square = self.builder.multiply(half_step, step);
                let rate = self.builder.value(Operation::Rate(index));
                let bend = self.builder.multiply(half_square, rate);
                let straight = self.builder.subtract(u, drift);
                let value = self.builder.add(straight, bend);
                main.writes.push(Write { buffer: past[index], value });
            }
        }
        Stage { fraction: Rational::from(0), passes: sweeps.into_iter().map(Pass::Sweep).collect() }
    }
}

/// target ← Σ weight·level + dt·rate·(rate).
struct Update {
    target: Level,
    from: Vec<(Level, Rational)>,
    rate: Rational,
}

/// Which given values are set.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Which {
    All,
    WithoutRate,
}

fn given(injection: &Injection, velocity: bool) -> Option<&Expression> {
    if velocity { injection.rate.as_ref() } else { Some(&injection.value) }
}

fn rate_index(components: &[Component], field: FieldId) -> usize {
    let velocity = components.iter().position(|component| component.field == field && component.velocity);
    velocity.or_else(|| components.iter().position(|component| component.field == field)).unwrap_or(0)
}

fn initial_value(model: &crate::model::Model, field: FieldId, derivative: usize) -> Expression {
    model
        .initial
        .iter()
        .find(|initial| initial.field == field && initial.derivative == derivative)
        .map_or_else(Expression::zero, |initial| initial.value.clone())
}
