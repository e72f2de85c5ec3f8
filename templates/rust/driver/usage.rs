//! The page of `--help`.

use super::number::general;
use super::options::prepare_smallest;
use super::{Failure, Solver};

const OPTIONS: &str = "\nOptions
  --out DIR          folder of results; must be new or empty, unless --resume
  --set NAME=VALUE   sets a constant, in the unit below
  --nodes AXIS=N     number of nodes along an axis
  --until T          last time, in seconds
  --steps N          exactly N steps; only the first and the last state are written
  --threads N        threads of the computation
  --resume           goes on from the checkpoint in the folder, to the same last bit
  --quiet            no progress on standard error
  --help             this page\n";

/// The page for a program of that name.
pub fn page(solver: &mut dyn Solver, program: &str) -> Result<String, Failure> {
    let none = vec![None; solver.description().parameters.len()];
    prepare_smallest(solver, &none)?;
    let about = solver.description();
    let number = |value: f64| general(value, 9);
    let mut page = format!(
        "{}: {}\n\nSolves the model (method: {}) and writes a folder of results.\n\nExamples\n",
        about.name, about.title, about.method
    );
    let mut example = |arguments: String, what: String| {
        page.push_str(&format!("  {:<44}{what}\n", format!("{program} {arguments}")));
    };
    example(String::new(), format!("the model as written, into {}.run", about.name));
    if let Some(axis) = about.axes.first() {
        let finer = format!("--out fine --nodes {}={}", axis.name, 2 * axis.nodes - 1);
        example(finer, "a finer grid".to_owned());
    }
    if let Some(constant) = about.parameters.first() {
        let value = general(solver.parameter(0) / solver.parameter_scale(0), 6);
        example(format!("--out other --set {}={value}", constant.name), "another constant".to_owned());
    }
    example("--out fine --resume".to_owned(), "go on after an interruption".to_owned());
    page.push_str(OPTIONS);
    page.push_str("\nAxes\n");
    for (index, axis) in about.axes.iter().enumerate() {
        let (low, high, _) = solver.axis(index);
        let periodic = if axis.periodic { " (periodic)" } else { "" };
        page.push_str(&format!(
            "  {}: {} nodes from {} to {} {}{periodic}, at least {}\n",
            axis.name,
            axis.nodes,
            number(low),
            number(high),
            axis.unit,
            axis.least_nodes
        ));
    }
    page.push_str(if about.parameters.is_empty() {
        "\nThis model has no constants that can be set.\n"
    } else {
        "\nConstants\n"
    });
    for (index, constant) in about.parameters.iter().enumerate() {
        let scale = solver.parameter_scale(index);
        let mut line =
            format!("  {} = {} {}", constant.name, number(solver.parameter(index) / scale), constant.unit);
        if let Some((low, high)) = solver.parameter_bounds(index) {
            line.push_str(&format!(", between {} and {}", number(low / scale), number(high / scale)));
        }
        if !constant.description.is_empty() {
            line.push_str(&format!("  ({})", constant.description));
        }
        page.push_str(&line);
        page.push('\n');
    }
    page.push_str(
        "\nExit status: 0 done, 1 faulty arguments, 2 the environment failed, 3 blew up, 130 interrupted.\n",
    );
    Ok(page)
}
