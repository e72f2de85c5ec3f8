//! Whole models against published limits and exact discrete solutions, through the executor.

use rimstone::kernel::interpret::Executor;
use rimstone::pipeline::{self, Overrides};
use rimstone::source::SourceFile;

fn executor(text: &str) -> Executor {
    let source = SourceFile::new("known.rim", text);
    let compiled = pipeline::compile(&source, &Overrides::default()).unwrap_or_else(|faults| {
        panic!("{:?}", faults.iter().map(|fault| fault.message.clone()).collect::<Vec<_>>())
    });
    let nodes: Vec<usize> = compiled.0.model.axes.iter().map(|axis| axis.nodes).collect();
    let parameters = vec![None; compiled.0.kernel.parameters.len()];
    let mut executor = Executor::new(compiled.0.kernel);
    executor.prepare(&nodes, &parameters, 1).expect("memory");
    executor
}

fn limit(text: &str) -> f64 {
    let mut executor = executor(text);
    executor.start(0.0);
    1.0 / executor.largest_rate(0.0)
}

fn periodic(axes: usize, order: usize, equation: &str, starts: &str, method: &str) -> String {
    let axes: String = ["x", "y", "z"][..axes]
        .iter()
        .map(|name| format!("  {name}: 0 to 1, 10 cells, periodic\n"))
        .collect();
    let names = ["x", "x, y", "x, y, z"][axes.lines().count() - 1];
    format!(
        "model known\naxes\n{axes}fields\n  u on {names}\nequations\n  {equation}\nconditions\n  at t = start: {starts}\naccuracy\n  order {order}\ntime\n  0 to 1\n  method {method}\n  step 0.5 of limit\n"
    )
}

fn near(value: f64, known: f64, relative: f64) {
    assert!((value - known).abs() <= relative * known.abs(), "{value} against {known}");
}

/// Forward Euler for u_t = D Δu, D dt/h² ≤ r: 1/2, 1/4, 1/6 at order 2 and 3/8, 3/16, 1/8 at order 4 (common practice).
#[test]
fn diffusion_by_forward_euler() {
    for (order, known) in [(2, [0.5, 0.25, 1.0 / 6.0]), (4, [0.375, 0.1875, 0.125])] {
        for (axes, r) in [1, 2, 3].into_iter().zip(known) {
            near(limit(&periodic(axes, order, "∂u/∂t = Δ u", "u = 0", "euler")), r * 0.01, 1e-9);
        }
    }
}

/// Leapfrog for u_tt = c² Δu, c dt/h ≤ C: 1, 1/√2, 1/√3 at order 2 and √3/2, √(3/8), 1/2 at order 4 (common practice).
#[test]
fn waves_by_leapfrog() {
    let known =
        [(2, [1.0, 0.5_f64.sqrt(), (1.0_f64 / 3.0).sqrt()]), (4, [0.75_f64.sqrt(), 0.375_f64.sqrt(), 0.5])];
    for (order, known) in known {
        for (axes, c) in [1, 2, 3].into_iter().zip(known) {
            let text = periodic(axes, order, "∂²u/∂t² = Δ u", "u = 0; ∂u/∂t = 0", "leapfrog");
            near(limit(&text), c * 0.1, 1e-9);
        }
    }
}

/// Transport and diffusion by forward Euler: dt ≤ min(h²/2D, 2D/a²) is necessary and sufficient (Hindmarsh, Gresho & Griffiths 1984, from
/// memory); the law here adds the two rates, so it stays below and within a factor of two.
#[test]
fn transport_carried_by_diffusion() {
    for (cells, known) in [(20, 0.02_f64), (100, 0.005)] {
        let text = periodic(1, 2, "∂u/∂t = -∂u/∂x + 0.01 * ∂²u/∂x²", "u = 0", "euler")
            .replace("10 cells", &format!("{cells} cells"));
        let found = limit(&text);
        assert!(found <= known * (1.0 + 1e-9) && found >= 0.5 * known, "{found} against {known}");
    }
}

/// The discrete solution of forward Euler on u_j = sin(πjh): amplitude (1 − 4r sin²(πh/2))ⁿ, N = 20, r = 1/4, n = 100.
#[test]
fn amplitude_of_a_discrete_diffusion() {
    let text = "model known\naxes\n  x: 0 to 1, 21 nodes\nfields\n  u on x\nequations\n  ∂u/∂t = ∂²u/∂x²\nconditions\n  at every edge: u = 0\n  at t = start: u = sin(π*x)\naccuracy\n  order 2\ntime\n  0 to 1\n  method euler\n  step 0.5 of limit\n";
    let mut solver = executor(text);
    let field = solver.kernel().fields[0].buffer;
    solver.start(0.0);
    let step = 0.25 / 400.0;
    for index in 0..100 {
        solver.advance(f64::from(index) * step, step, f64::from(index + 1) * step);
    }
    near(solver.buffer(field)[10], 0.539_298_804_195_115_2, 1e-12);
}

/// The discrete solution of leapfrog: cos(nω) sin(πx) with sin(ω/2) = C sin(πh/2), N = 20, C = 0.8, n = 37.
#[test]
fn amplitude_of_a_discrete_wave() {
    let text = "model known\naxes\n  x: 0 to 1, 21 nodes\nfields\n  u on x\nequations\n  ∂²u/∂t² = ∂²u/∂x²\nconditions\n  at every edge: u = 0\n  at t = start: u = sin(π*x); ∂u/∂t = 0\naccuracy\n  order 2\ntime\n  0 to 1\n  method leapfrog\n  step 0.5 of limit\n";
    let mut solver = executor(text);
    let field = solver.kernel().fields[0].buffer;
    solver.start(0.0);
    let step = 0.8 / 20.0;
    solver.first_step(0.0, step);
    for index in 0..37 {
        solver.advance(f64::from(index) * step, step, f64::from(index + 1) * step);
    }
    assert!((solver.buffer(field)[10] + 0.064_510_402_253_933_29).abs() < 1e-12);
}

/// Centre of a slab at u = 1 with both ends suddenly at zero: 0.474487460379749 at t = 0.1 (Carslaw & Jaeger 1959, §3.3, from memory).
/// The jump at the start costs accuracy early; by then it is gone.
#[test]
fn a_cooling_slab() {
    let text = "model known\naxes\n  x: 0 to 1, 81 nodes\nfields\n  u on x\nequations\n  ∂u/∂t = ∂²u/∂x²\nconditions\n  at every edge: u = 0\n  at t = start: u = cases(x < 1/100000: 0, x > 99999/100000: 0, otherwise: 1)\naccuracy\n  order 2\ntime\n  0 to 1\n  method rk4\n  step 0.5 of limit\n";
    let mut solver = executor(text);
    let field = solver.kernel().fields[0].buffer;
    solver.start(0.0);
    let steps = 4000;
    let step = 0.1 / f64::from(steps);
    for index in 0..steps {
        solver.advance(f64::from(index) * step, step, f64::from(index + 1) * step);
    }
    near(solver.buffer(field)[40], 0.474_487_460_379_749, 2e-4);
}
