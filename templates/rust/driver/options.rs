//! Options of a runnable program: reading them, and holding them to the model. All faults are told at once.

use super::number::general;
use super::{Description, Failure, Solver};
use std::path::PathBuf;

/// What a run is asked for; constants in SI.
#[derive(Clone, Debug, Default)]
pub struct Options {
    /// Folder of results; `None`: nothing is written.
    pub out: Option<PathBuf>,
    /// For each axis; `None`: as in the model.
    pub nodes: Vec<Option<usize>>,
    /// For each constant, SI; `None`: as in the model.
    pub parameters: Vec<Option<f64>>,
    /// Last time in seconds.
    pub until: Option<f64>,
    /// Exactly that many steps; only the first and the last state are written.
    pub steps: Option<u64>,
    /// `None`: as many as the machine has.
    pub threads: Option<usize>,
    /// Goes on from the checkpoint in `out`.
    pub resume: bool,
    /// No progress on standard error.
    pub quiet: bool,
}

/// The arguments as read: constants in the units of the model.
#[derive(Clone, Debug, Default)]
pub struct Request {
    pub out: Option<PathBuf>,
    pub nodes: Vec<Option<usize>>,
    pub numbers: Vec<Option<f64>>,
    pub until: Option<f64>,
    pub steps: Option<u64>,
    pub threads: Option<usize>,
    pub resume: bool,
    pub quiet: bool,
    pub help: bool,
}

impl Options {
    /// The model as written, nothing to files.
    pub fn of(about: &Description) -> Options {
        Options {
            nodes: vec![None; about.axes.len()],
            parameters: vec![None; about.parameters.len()],
            quiet: true,
            ..Options::default()
        }
    }
}

/// A decimal number without spaces, hexadecimals, infinities.
fn read_number(text: &str) -> Option<f64> {
    let plain = !text.is_empty() && text.bytes().all(|byte| b"+-.0123456789eE".contains(&byte));
    text.parse().ok().filter(|number: &f64| plain && number.is_finite())
}

fn read_count(text: &str) -> Option<u64> {
    let plain = !text.is_empty() && text.len() <= 18 && text.bytes().all(|byte| byte.is_ascii_digit());
    if plain { text.parse().ok() } else { None }
}

fn listed<'a>(names: impl Iterator<Item = &'a str>) -> String {
    names.collect::<Vec<_>>().join(", ")
}

impl Request {
    /// Reads all arguments (without the program's name); faults are gathered, what could be read is kept.
    pub fn read(about: &Description, arguments: &[String]) -> (Request, Vec<String>) {
        let mut request = Request {
            nodes: vec![None; about.axes.len()],
            numbers: vec![None; about.parameters.len()],
            ..Request::default()
        };
        let mut faults = Vec::new();
        let mut rest = arguments.iter();
        while let Some(argument) = rest.next() {
            match argument.as_str() {
                "--resume" => request.resume = true,
                "--quiet" => request.quiet = true,
                "--help" | "-h" => request.help = true,
                other => {
                    let (option, value) = match other.split_once('=') {
                        Some((option, value)) => (option, Some(value)),
                        None => (other, None),
                    };
                    if !matches!(option, "--out" | "--set" | "--nodes" | "--until" | "--steps" | "--threads")
                    {
                        faults.push(format!("unknown argument '{argument}'; --help lists what there is"));
                        continue;
                    }
                    match value.or_else(|| rest.next().map(String::as_str)) {
                        Some(value) => request.read_valued(about, option, value, &mut faults),
                        None => faults.push(format!("{option} wants a value")),
                    }
                }
            }
        }
        if request.steps.is_some() && request.until.is_some() {
            faults.push("--steps and --until exclude each other: both say where to stop".to_owned());
        }
        (request, faults)
    }

    fn read_valued(&mut self, about: &Description, option: &str, value: &str, faults: &mut Vec<String>) {
        match option {
            "--out" if value.is_empty() => faults.push("--out wants the name of a folder".to_owned()),
            "--out" => self.out = Some(PathBuf::from(value)),
            "--set" => self.read_setting(about, value, faults),
            "--nodes" => self.read_size(about, value, faults),
            "--until" => match read_number(value) {
                Some(until) => self.until = Some(until),
                None => faults.push(format!("--until wants a time in seconds, not '{value}'")),
            },
            "--steps" => match read_count(value) {
                Some(steps) => self.steps = Some(steps),
                None => faults.push(format!("--steps wants a whole number, not '{value}'")),
            },
            _ => match read_count(value) {
                Some(threads @ 1..=4096) => self.threads = Some(threads as usize),
                _ => faults.push(format!("--threads wants a whole number from 1 to 4096, not '{value}'")),
            },
        }
    }

    fn read_setting(&mut self, about: &Description, setting: &str, faults: &mut Vec<String>) {
        let Some((name, value)) = setting.split_once('=').filter(|(name, _)| !name.is_empty()) else {
            faults.push(format!("--set wants NAME=VALUE, not '{setting}'"));
            return;
        };
        let Some(index) = about.parameters.iter().position(|parameter| parameter.name == name) else {
            faults.push(if about.parameters.is_empty() {
                format!("--set {name}: this model has no constants that can be set")
            } else {
                let known = listed(about.parameters.iter().map(|parameter| parameter.name.as_str()));
                format!("--set {name}: no such constant; there are: {known}")
            });
            return;
        };
        match read_number(value) {
            Some(number) => self.numbers[index] = Some(number),
            None => faults.push(format!(
                "--set {name}: '{value}' is not a number (its unit is {}; write the number alone)",
                about.parameters[index].unit
            )),
        }
    }

    fn read_size(&mut self, about: &Description, setting: &str, faults: &mut Vec<String>) {
        let Some((name, value)) = setting.split_once('=').filter(|(name, _)| !name.is_empty()) else {
            faults.push(format!("--nodes wants AXIS=N, not '{setting}'"));
            return;
        };
        let Some(index) = about.axes.iter().position(|axis| axis.name == name) else {
            let known = listed(about.axes.iter().map(|axis| axis.name.as_str()));
            faults.push(format!("--nodes {name}: no such axis; there are: {known}"));
            return;
        };
        match read_count(value) {
            None => faults.push(format!("--nodes {name}: '{value}' is not a whole number")),
            Some(count) => self.nodes[index] = Some(count as usize),
        }
    }
}

/// Sizes that the operators cannot serve.
pub(super) fn size_faults(about: &Description, nodes: &[Option<usize>]) -> Vec<String> {
    let few = |(axis, nodes): (&super::AxisInfo, &Option<usize>)| {
        let nodes = nodes.filter(|nodes| *nodes < axis.least_nodes)?;
        let (name, least) = (&axis.name, axis.least_nodes);
        Some(format!(
            "--nodes {name}={nodes}: too few nodes; the difference operators need at least {least} along {name}"
        ))
    };
    about.axes.iter().zip(nodes).filter_map(few).collect()
}

/// Prepares the smallest grid: what constants, scales and times are, before the real one is allocated.
pub(super) fn prepare_smallest(solver: &mut dyn Solver, parameters: &[Option<f64>]) -> Result<(), Failure> {
    let least: Vec<usize> = solver.description().axes.iter().map(|axis| axis.least_nodes).collect();
    solver.prepare(&least, parameters, 1).map_err(Failure::Environment)
}

/// Turns given numbers into SI, and holds sizes and constants to what the model allows.
///
/// # Errors
/// The faults passed in together with those found here, or a lack of memory.
pub fn settle(
    solver: &mut dyn Solver,
    request: Request,
    mut faults: Vec<String>,
) -> Result<Options, Failure> {
    faults.extend(size_faults(solver.description(), &request.nodes));
    let none = vec![None; request.numbers.len()];
    prepare_smallest(solver, &none)?;
    let in_si =
        |(index, number): (usize, &Option<f64>)| number.map(|number| number * solver.parameter_scale(index));
    let parameters: Vec<Option<f64>> = request.numbers.iter().enumerate().map(in_si).collect();
    prepare_smallest(solver, &parameters)?;
    faults.extend(bound_faults(solver));
    if !faults.is_empty() {
        return Err(Failure::Refused(faults));
    }
    let default = || PathBuf::from(format!("{}.run", solver.description().name));
    Ok(Options {
        out: Some(request.out.unwrap_or_else(default)),
        nodes: request.nodes,
        parameters,
        until: request.until,
        steps: request.steps,
        threads: request.threads,
        resume: request.resume,
        quiet: request.quiet,
    })
}

/// Constants outside their bounds, of a prepared solver.
pub(super) fn bound_faults(solver: &dyn Solver) -> Vec<String> {
    let mut faults = Vec::new();
    for (index, constant) in solver.description().parameters.iter().enumerate() {
        let Some((low, high)) = solver.parameter_bounds(index) else { continue };
        let (value, scale) = (solver.parameter(index), solver.parameter_scale(index));
        // A bound written in another unit may differ from the same number typed here in the last bit.
        let inside = value >= low - 1e-14 * low.abs() && value <= high + 1e-14 * high.abs();
        if !inside {
            let show = |number: f64| general(number / scale, 15);
            faults.push(format!(
                "{} = {} {unit} is outside its bounds, {} to {} {unit}: the model's statements hold only there",
                constant.name,
                show(value),
                show(low),
                show(high),
                unit = constant.unit,
            ));
        }
    }
    faults
}
