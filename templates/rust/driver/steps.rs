//! How long the next step is, and whether the numbers are still finite.

use super::Failure;
use super::number::general;
use super::state::Run;

/// Why the run does not go on.
#[derive(Debug)]
pub enum Halt {
    /// The run's message says what happened.
    BlewUp,
    Failed(Failure),
}

impl From<Failure> for Halt {
    fn from(failure: Failure) -> Halt {
        Halt::Failed(failure)
    }
}

/// A run of more steps, or of more output times, is refused.
pub const MOST_STEPS: f64 = 1e8;

/// Whether all are finite: the products of finite numbers with zero are zero.
fn all_finite(values: &[f64]) -> bool {
    let mut sums = [0.0f64; 8];
    let mut chunks = values.chunks_exact(8);
    for chunk in &mut chunks {
        for (sum, value) in sums.iter_mut().zip(chunk) {
            *sum += value * 0.0;
        }
    }
    chunks.remainder().iter().all(|value| value.is_finite()) && sums.iter().all(|sum| *sum == 0.0)
}

/// Equal steps that divide an interval, none longer than `longest`.
fn parts_of(interval: f64, longest: f64) -> f64 {
    let parts = (interval / longest * (1.0 - 1e-12)).ceil();
    if parts > 1.0 { parts } else { 1.0 }
}

/// The greatest interval that divides both, to one part in 10⁹ (Euclid).
fn common_interval(mut a: f64, mut b: f64) -> f64 {
    let tolerance = 1e-9 * a.max(b);
    while b > tolerance {
        let mut rest = a % b;
        if b - rest <= tolerance {
            rest = 0.0;
        }
        a = b;
        b = rest;
    }
    a
}

impl Run<'_> {
    /// Looks at every value of every field.
    pub fn check_fields(&mut self) -> Result<(), Halt> {
        for field in 0..self.about.fields.len() {
            let values = self.solver.field(field);
            if all_finite(values) {
                continue;
            }
            let node = values.iter().position(|value| !value.is_finite()).unwrap_or(0);
            self.message = self.describe_blow_up(&self.about.fields[field].name, node);
            return Err(Halt::BlewUp);
        }
        Ok(())
    }

    fn describe_blow_up(&self, field: &str, node: usize) -> String {
        let mut rest = node;
        let mut places = Vec::new();
        for (axis, info) in self.about.axes.iter().enumerate().rev() {
            let index = rest % self.nodes[axis];
            rest /= self.nodes[axis];
            let coordinate = general(self.coordinate(axis, index), 9);
            places.insert(0, format!("{} = {coordinate} {} (node {index})", info.name, info.unit));
        }
        let position = &self.position;
        let mut message = format!(
            "{field} is not finite any more at {}, after step {}, t = {} s",
            places.join(", "),
            position.step,
            general(position.time, 9)
        );
        if let Some(good) = self.records.last() {
            let (folder, time) = (&self.series[good.series].folder, general(good.time, 9));
            message.push_str(&format!(
                "; the last good output is {folder}/{:06}.npy, t = {time} s",
                good.number
            ));
        }
        if position.above_limit {
            message.push_str("; the step is above the limit of stability");
        }
        message
    }

    /// The longest step allowed now, for at most `interval`.
    fn longest_step(&mut self, interval: f64) -> Result<f64, Halt> {
        let rate = self.solver.largest_rate(self.position.time);
        let limit = if rate > 0.0 { 1.0 / rate } else { f64::INFINITY };
        if rate.is_nan() || limit <= 0.0 {
            self.check_fields()?;
            self.message = format!(
                "the step limit is not finite after step {}, t = {} s",
                self.position.step,
                general(self.position.time, 9)
            );
            return Err(Halt::BlewUp);
        }
        if self.position.step == 0 {
            self.position.limit = limit;
        }
        if let Some(given) = self.given_step.filter(|given| *given > limit && !self.position.above_limit) {
            self.position.above_limit = true;
            if self.folder.is_some() || !self.quiet {
                eprintln!(
                    "{}: the model's step, {} s, is above the limit of stability, {} s: the results may be worthless",
                    self.about.name,
                    general(given, 9),
                    general(limit, 9)
                );
            }
        }
        Ok(self.allowed(limit, interval))
    }

    fn allowed(&self, limit: f64, interval: f64) -> f64 {
        match self.given_step {
            Some(given) => given,
            None if limit.is_finite() => self.about.fraction * limit,
            None => interval,
        }
    }

    /// One step length for the whole run.
    fn settle_constant_step(&mut self, longest: f64) -> Result<f64, Failure> {
        let interval = self.position.end - self.begin;
        if self.position.steps.is_some() || interval <= 0.0 {
            return Ok(longest);
        }
        let distances = self.repeated().into_iter().map(|(_, every)| every).filter(|every| *every < interval);
        let base = distances.fold(interval, common_interval);
        let parts = parts_of(base, longest);
        let steps = parts * (interval / base);
        if steps > MOST_STEPS {
            return Err(Failure::refused(format!(
                "the method '{}' needs one step length for the whole run; with outputs at these times it would take \
                 {} steps. Choose output times with a common multiple, or another method",
                self.about.method,
                general(steps, 3)
            )));
        }
        Ok(base / parts)
    }

    /// What has to be known before the first step.
    pub fn settle_steps(&mut self) -> Result<(), Halt> {
        let interval = self.position.end - self.begin;
        let longest = self.longest_step(interval)?;
        if let Some(steps) = self.position.steps {
            if longest.is_nan() || longest <= 0.0 {
                let reason = "--steps needs a step, and this model has none: its limit is infinite and its interval empty";
                return Err(Failure::refused(reason).into());
            }
            self.position.end = self.begin + steps as f64 * longest;
        } else if interval / longest > 9e15 {
            let (step, end) = (general(longest, 3), general(self.position.end, 9));
            return Err(
                Failure::refused(format!("a step of {step} s would never reach the end, {end} s")).into()
            );
        }
        self.position.last_step = longest;
        self.position.from = self.begin;
        self.position.to = self.begin;
        if self.about.constant_step {
            self.position.constant_step = self.settle_constant_step(longest)?;
            self.position.last_step = self.position.constant_step;
        }
        Ok(())
    }

    /// The length of the step that starts now, and its end.
    pub fn choose_step(&mut self) -> Result<(f64, f64), Halt> {
        let counted = self.position.steps.is_some();
        let reached = (self.position.step + 1) as f64;
        if self.position.constant_step > 0.0 {
            let step = self.position.constant_step;
            let mut next = self.begin + reached * step;
            if !counted {
                self.position.to = self.next_event();
                if reached >= ((self.position.to - self.begin) / step + 0.5).floor() {
                    next = self.position.to;
                }
            }
            return Ok((step, next));
        }
        if counted {
            if self.about.state_dependent {
                let step = self.longest_step(self.position.end - self.begin)?;
                return Ok((step, self.position.time + step));
            }
            let step = self.position.last_step;
            return Ok((step, self.begin + reached * step));
        }
        if self.about.state_dependent || self.position.part == self.position.parts {
            self.divide()?;
        }
        let position = &mut self.position;
        let step = (position.to - position.from) / position.parts as f64;
        position.part += 1;
        let last = position.part == position.parts;
        Ok((step, if last { position.to } else { position.from + position.part as f64 * step }))
    }

    /// Divides the interval to the next event.
    fn divide(&mut self) -> Result<(), Halt> {
        self.position.from = self.position.time;
        self.position.to = self.next_event();
        self.position.part = 0;
        let interval = self.position.to - self.position.from;
        let longest = if self.about.state_dependent {
            self.longest_step(interval)?
        } else {
            self.allowed(self.position.limit, interval)
        };
        self.position.parts = parts_of(interval, longest) as u64;
        Ok(())
    }

    pub fn at_end(&self) -> bool {
        match self.position.steps {
            Some(steps) => self.position.step >= steps,
            None => self.position.time >= self.position.end,
        }
    }
}
