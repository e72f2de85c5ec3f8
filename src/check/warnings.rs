//! Models that are well formed and still traps: what no answer can be right for is an error, the rest a warning with its numbers.
//!
//! Signs are decided exactly where they can be; sizes in messages are evaluated in double precision at the defaults and on the
//! model's own grid, and no refusal rests on them.

mod data;
mod stability;

use crate::diagnostic::{Diagnostic, Diagnostics, codes_conditions as codes};
use crate::exact::Rational;
use crate::model::{AskedOrder, Method, Model, Step};

/// Adds errors and warnings about a model whose conditions are classified.
pub fn warn(model: &Model, diagnostics: &mut Diagnostics) {
    stability::diffusion(model, diagnostics);
    stability::euler(model, diagnostics);
    stability::leapfrog(model, diagnostics);
    stability::films(model, diagnostics);
    stability::reflections(model, diagnostics);
    stability::cells(model, diagnostics);
    stability::jumps(model, diagnostics);
    data::starts(model, diagnostics);
    data::edges(model, diagnostics);
    data::ranges(model, diagnostics);
    data::without_rate(model, diagnostics);
    data::staggered_rates(model, diagnostics);
    data::signs_at_default(model, diagnostics);
    step(model, diagnostics);
    method_order(model, diagnostics);
}

fn step(model: &Model, diagnostics: &mut Diagnostics) {
    let Step::OfLimit(fraction) = &model.time.step else { return };
    if *fraction > Rational::one() {
        diagnostics.push(
            Diagnostic::warning(
                codes::STEP_ABOVE_LIMIT,
                model.time.span,
                format!(
                    "the step is {fraction} of the stability limit: the shortest waves grow at every step"
                ),
            )
            .with_remedy("take at most 1 of the limit, 0.9 say"),
        );
    } else if model.time.method == Method::Leapfrog && *fraction > Rational::ratio(98, 100) {
        diagnostics.push(
            Diagnostic::warning(
                codes::LEAPFROG_AT_LIMIT,
                model.time.span,
                format!("leapfrog at {fraction} of its limit: at the limit the shortest wave grows linearly in time"),
            )
            .with_remedy("take at most 0.98 of the limit"),
        );
    }
}

/// The order in time of a method, with the step tied to the spacing.
fn order_in_time(method: Method) -> usize {
    match method {
        Method::Euler => 1,
        Method::Leapfrog => 2,
        Method::Ssprk3 => 3,
        Method::Rk4 | Method::Lsrk4 => 4,
    }
}

fn method_order(model: &Model, diagnostics: &mut Diagnostics) {
    let asked = model.accuracy.per_axis.iter().filter_map(|asked| match asked {
        AskedOrder::Solution(order) => Some(*order),
        AskedOrder::Interior(_) => None,
    });
    let Some(asked) = asked.max() else { return };
    // The step of a purely diffusive model goes with the square of the spacing, so a method of order q gives 2q in the spacing.
    let own = order_in_time(model.time.method) * if stability::step_goes_with_square(model) { 2 } else { 1 };
    if own < asked {
        diagnostics.push(
            Diagnostic::warning(
                codes::METHOD_LIMITS_ORDER,
                model.time.span,
                format!(
                    "order {asked} is asked for, and {} limits the solution to order {own} in the spacing",
                    model.time.method.name()
                ),
            )
            .with_remedy("use a method of higher order (rk4 and lsrk4 have order 4), or ask for the order that it gives"),
        );
    }
}
