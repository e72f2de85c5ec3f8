//! Spectra and step limits of closed operators against an independent computation, and counter-examples that must be caught.
//!
//! "Reference computation" is an independent prototype in another language (exact operators, eigenvalues by a standard dense
//! library); its values are quoted to the digits given. It tells growth from rounding at 10⁻⁹ in |R|, this program at 10⁻¹².

use std::sync::OnceLock;

use rimstone::analysis::closed::{
    ClosedFault, FaceCondition, Inflow, WaveFace, acoustics, advection, closed_limit, closed_wave_limit,
    dense, diffusion, examine, injected_advection, interior_symbol, varying_diffusion, wave,
};
use rimstone::analysis::spectrum::{self, Rows, eigenvalues, energy_growth};
use rimstone::analysis::stability::{
    one_step_limit, proved_extents as extents, second_order_growth, second_order_limit,
};
use rimstone::analysis::symbol;
use rimstone::discretize::{closure, interior};
use rimstone::exact::{Rational, binomial, round};
use rimstone::model::Method;
use rimstone::scheme::{ClosedRow, DifferenceOperator, SecondDerivativeForm, SummationByParts};

const ORDERS: [usize; 4] = [2, 4, 6, 8];
/// What the limits of both computations may differ by, for their different tolerances.
const PARTS: f64 = 1e-7;
const RUNGE_KUTTA: [Method; 3] = [Method::Ssprk3, Method::Rk4, Method::Lsrk4];

fn first(order: usize) -> &'static SummationByParts {
    closure::first_derivative(order).expect("an offered order")
}

fn second(order: usize) -> &'static SecondDerivativeForm {
    closure::second_derivative(order).expect("an offered order")
}

/// The operator as the reference computation has it: its fractions of order 8 are not tidied.
fn reference_first(order: usize) -> &'static SummationByParts {
    static EIGHT: OnceLock<SummationByParts> = OnceLock::new();
    match order {
        8 => EIGHT.get_or_init(|| closure::derive_untidied_first_derivative(8).expect("an offered order")),
        _ => first(order),
    }
}

fn reference_second(order: usize) -> &'static SecondDerivativeForm {
    static EIGHT: OnceLock<SecondDerivativeForm> = OnceLock::new();
    match order {
        8 => EIGHT.get_or_init(|| {
            closure::compatible_second_derivative(reference_first(8)).expect("an offered order")
        }),
        _ => second(order),
    }
}

fn abscissa(rows: &Rows) -> f64 {
    examine(rows).expect("converges").abscissa
}

fn radius(rows: &Rows) -> f64 {
    examine(rows).expect("converges").radius
}

/// Agreement to within `parts` of the known value.
#[track_caller]
fn agree(found: f64, known: f64, parts: f64, what: &str) {
    assert!((found - known).abs() <= parts * known.abs(), "{what}: {found} instead of {known}");
}

/// A unit in the last of `digits` significant digits, relative.
fn unit_in_digit(digits: i32, known: f64) -> f64 {
    let unit = 10.0_f64.powi(known.abs().log10().floor() as i32 - digits + 1);
    unit / known.abs()
}

fn face_pair<T: Copy>(face: T) -> [T; 2] {
    [face, face]
}

/// Table of limits, 60 intervals: c dt/h of (flux replacement, injection) for each order and Runge–Kutta method; the radius with
/// replacement; reference computation.
#[test]
fn limits_of_advection() {
    let known = [
        (
            2,
            0.998634103174466,
            [
                (1.735059333302, 1.734746209366),
                (2.832489945740, 2.832402747188),
                (3.345432275481, 3.345371407271),
            ],
        ),
        (
            4,
            1.36994496472116,
            [
                (1.264555873766, 1.264446577496),
                (2.064699462077, 2.064676001202),
                (2.438631382218, 2.438619060289),
            ],
        ),
        (
            6,
            1.582630129711963,
            [
                (1.094447114958, 1.094432131465),
                (1.787179149999, 1.787177401180),
                (2.110872402939, 2.110872591630),
            ],
        ),
        (
            8,
            1.726017105665011,
            [
                (1.003512181815, 1.003505142274),
                (1.638706668584, 1.638706095606),
                (1.935510609211, 1.935511016176),
            ],
        ),
    ];
    for (order, rho, limits) in known {
        let replaced = advection(reference_first(order), 60, Inflow::Flux { strength: 1.0 }).expect("fits");
        let injected = advection(reference_first(order), 60, Inflow::Injected).expect("fits");
        agree(radius(&replaced) / 60.0, rho, PARTS, "radius");
        for (method, (with_flux, with_value)) in RUNGE_KUTTA.into_iter().zip(limits) {
            let found = |rows: &Rows| 60.0 * closed_limit(method, rows).expect("converges");
            agree(found(&replaced), with_flux, PARTS, &format!("replaced, {order}, {method:?}"));
            agree(found(&injected), with_value, PARTS, &format!("injected, {order}, {method:?}"));
            // The rule: interior limits are the smaller ones, so they are those of the closed operator too.
            let within = extents(method).imaginary / symbol::radius(1, order);
            assert!(found(&replaced) >= within && found(&injected) >= within, "{order} {method:?}");
        }
        // Forward Euler has no limit that would be of use.
        assert!(60.0 * closed_limit(Method::Euler, &replaced).expect("converges") < 3e-4);
    }
}

/// As above for heat: radius, then limits of Euler and the three others; given values at both ends, given fluxes at both ends.
#[test]
fn limits_of_diffusion() {
    let known = [
        (
            2,
            FaceCondition::Value,
            3.997259069509148,
            [0.5003428514944, 0.6286170807375, 0.6968008616991, 1.1649875541661],
        ),
        (2, FaceCondition::Flux, 4.0, [0.50000000025, 0.6281863318066, 0.6963233910171, 1.1641892666889]),
        (
            4,
            FaceCondition::Value,
            5.327798331061092,
            [0.3753895843504, 0.4716292117472, 0.5227850963934, 0.8740490494181],
        ),
        (
            4,
            FaceCondition::Flux,
            5.327811762281097,
            [0.3753886380069, 0.4716280227871, 0.5227837784712, 0.8740468459722],
        ),
        (
            6,
            FaceCondition::Value,
            6.035776909092808,
            [0.3313575089210, 0.4163085158832, 0.4614639682710, 0.7715257102595],
        ),
        (
            6,
            FaceCondition::Flux,
            6.035779700923287,
            [0.3313573556527, 0.4163083233210, 0.4614637548223, 0.7715253533927],
        ),
        (
            8,
            FaceCondition::Value,
            6.489042570639247,
            [0.3082118785981, 0.3872289786780, 0.4292302806998, 0.7176339215011],
        ),
        (
            8,
            FaceCondition::Flux,
            6.489050832537042,
            [0.3082114861810, 0.3872284856558, 0.4292297342013, 0.7176330078054],
        ),
    ];
    for (order, face, rho, limits) in known {
        let rows = diffusion(reference_second(order).constant(), 60, face_pair(face)).expect("fits");
        let per_area = 3600.0;
        agree(radius(&rows) / per_area, rho, PARTS, "radius");
        let methods = [Method::Euler, Method::Ssprk3, Method::Rk4, Method::Lsrk4];
        for (method, limit) in methods.into_iter().zip(limits) {
            let found = per_area * closed_limit(method, &rows).expect("converges");
            agree(found, limit, PARTS, &format!("{order} {face:?} {method:?}"));
            let within = extents(method).real / symbol::radius(2, order);
            assert!(found >= within * (1.0 - 1e-11), "{order} {face:?} {method:?}: {found} {within}");
        }
    }
}

/// The operators in use, tidied ones among them: stable, and never a shorter step than the interior alone allows.
#[test]
fn closed_limits_are_not_below_interior_limits() {
    for order in ORDERS {
        for intervals in [40, 60, 80] {
            let length = intervals as f64;
            for inflow in [Inflow::Flux { strength: 1.0 }, Inflow::Injected] {
                let found =
                    examine(&advection(first(order), intervals, inflow).expect("fits")).expect("converges");
                assert!(found.is_stable() && found.abscissa < 0.0, "{order} {intervals} {inflow:?}");
                for method in RUNGE_KUTTA {
                    let within = extents(method).imaginary / symbol::radius(1, order);
                    assert!(
                        length * one_step_limit(&found.eigenvalues, method) >= within,
                        "{order} {method:?}"
                    );
                }
            }
            let operator = second(order).constant();
            for faces in [
                [FaceCondition::Value, FaceCondition::Value],
                [FaceCondition::Flux, FaceCondition::Flux],
                [FaceCondition::Value, FaceCondition::Flux],
            ] {
                let found =
                    examine(&diffusion(operator, intervals, faces).expect("fits")).expect("converges");
                let bound = length * length * symbol::radius(2, order);
                assert!(found.is_stable() && found.radius <= bound * (1.0 + 1e-11), "{order} {faces:?}");
            }
        }
    }
}

/// u_tt = u_xx: leapfrog with values, with fluxes; the fourth-order Runge–Kutta method with fluxes and absorbing; the radius of the
/// absorbing system.
#[test]
fn limits_of_waves() {
    let known = [
        (2, 1.000342792491, 1.0, 1.414213562572, 1.414710078155, 1.999315221083),
        (4, 0.866475140050, 0.866474047874, 1.225379350119, 1.225381044820, 2.308202487233),
        (6, 0.814073103296, 0.814072915023, 1.151272957348, 1.151273251132, 2.456781839674),
        (8, 0.785126586538, 0.785126086723, 1.110335960173, 1.110336738081, 2.547359974087),
    ];
    let impedance = 1.0;
    for (order, value, flux, rk4_flux, rk4_absorbing, rho) in known {
        let operator = reference_second(order).constant();
        let limit = |method, face| {
            let problem = wave(operator, 60, face_pair(face)).expect("fits");
            60.0 * closed_wave_limit(method, &problem).expect("converges")
        };
        agree(limit(Method::Leapfrog, WaveFace::Value), value, PARTS, "leapfrog, values");
        agree(limit(Method::Leapfrog, WaveFace::Flux), flux, PARTS, "leapfrog, fluxes");
        agree(limit(Method::Leapfrog, WaveFace::Absorbing { impedance }), flux, PARTS, "leapfrog, absorbing");
        agree(limit(Method::Rk4, WaveFace::Flux), rk4_flux, PARTS, "rk4, fluxes");
        agree(limit(Method::Rk4, WaveFace::Absorbing { impedance }), rk4_absorbing, PARTS, "rk4, absorbing");
        let absorbing = wave(operator, 60, face_pair(WaveFace::Absorbing { impedance })).expect("fits");
        agree(radius(&absorbing.system()) / 60.0, rho, PARTS, "radius of the absorbing system");
    }
}

/// Damping that is centred in time does not shorten leapfrog's step: the matrix of one step says so just below the limit and
/// just above it.
#[test]
fn leapfrog_with_absorbing_ends_keeps_its_limit() {
    for order in ORDERS {
        let ends = face_pair(WaveFace::Absorbing { impedance: 1.0 });
        let problem = wave(second(order).constant(), 40, ends).expect("fits");
        let limit = closed_wave_limit(Method::Leapfrog, &problem).expect("converges");
        let largest = |step: f64| radius(&problem.leapfrog_step(step));
        // The constant mode is a double eigenvalue one, which rounding splits by √ε.
        assert!(largest(0.99 * limit) <= 1.0 + 1e-6, "{order}: {}", largest(0.99 * limit));
        assert!(largest(1.02 * limit) > 1.01, "{order}: {}", largest(1.02 * limit));
    }
}

/// Largest real parts at 40, 60 and 80 intervals, advection with replacement, with injection, and with replacement of strength 0.4,
/// which must be caught; to a unit in the third digit of the reference
/// computation, which rounds three of these up (inverse iteration gave -0.00189546 and 0.404484 for two of them).
#[test]
fn real_parts_of_advection() {
    let known = [
        (2, 3, [-0.0123, -0.00547, -0.00308], [-0.00616, -0.00274, -0.00154], [0.234, 0.249, 0.265]),
        (4, 3, [-0.00882, -0.00377, -0.00208], [-0.00444, -0.00189, -0.00105], [0.386, 0.405, 0.414]),
        (6, 3, [-0.00192, -0.000735, -0.000386], [-0.000961, -0.000368, -0.000193], [1.71, 2.26, 2.84]),
        (8, 3, [-0.00124, -0.00042, -0.000209], [-0.000619, -0.00021, -0.000104], [3.11, 4.63, 6.18]),
    ];
    for (order, digits, replaced, injected, weak) in known {
        for (column, intervals) in [40, 60, 80].into_iter().enumerate() {
            let with = |inflow| {
                examine(&advection(reference_first(order), intervals, inflow).expect("fits"))
                    .expect("converges")
            };
            let cases = [
                (Inflow::Flux { strength: 1.0 }, replaced[column], true),
                (Inflow::Injected, injected[column], true),
                (Inflow::Flux { strength: 0.4 }, weak[column], false),
            ];
            for (inflow, real_part, stable) in cases {
                let found = with(inflow);
                let what = format!("order {order}, {intervals} intervals, {inflow:?}");
                agree(found.abscissa, real_part, unit_in_digit(digits, real_part), &what);
                assert_eq!(found.is_stable(), stable, "{what}");
            }
        }
    }
}

/// The energy of advection does not grow in the norm of the operator: no eigenvalue needed, and too weak a replacement is caught.
#[test]
fn energy_of_advection_does_not_grow() {
    for order in ORDERS {
        let weights: Vec<f64> =
            (0..=40).map(|node| round::nearest(&first(order).norm().weight(node, 41))).collect();
        let growth = |strength| {
            let rows = advection(first(order), 40, Inflow::Flux { strength }).expect("fits");
            energy_growth(&rows, &weights).expect("converges")
        };
        assert!(growth(1.0) < 1e-10, "{order}: {}", growth(1.0));
        // d/dt uᵀHu = (1 − 2 strength) u₀² − u_N².
        let known = 0.1 * 40.0 / weights[0];
        agree(growth(0.4), known, 1e-10, "growth with strength 0.4");
    }
}

/// Largest real parts of heat: −π² with values at both ends, nought with fluxes, −ζ² with Robin ends (factor 3):
/// ζ tan(ζ/2) = 3 for the even mode (separation of variables, common practice).
#[test]
fn real_parts_of_diffusion() {
    let root = {
        let (mut low, mut high) = (0.0_f64, std::f64::consts::PI - 1e-9);
        for _ in 0..100 {
            let middle = 0.5 * (low + high);
            if middle * (middle / 2.0).tan() < 3.0 { low = middle } else { high = middle }
        }
        low
    };
    for order in ORDERS {
        for intervals in [40, 60, 80] {
            let with = |face| {
                let rows = diffusion(second(order).constant(), intervals, face_pair(face)).expect("fits");
                examine(&rows).expect("converges")
            };
            let error = if order == 2 { 2.0 / (intervals * intervals) as f64 } else { 1e-4 };
            let values = with(FaceCondition::Value);
            agree(values.abscissa, -std::f64::consts::PI.powi(2), error, "values at both ends");
            let robin = with(FaceCondition::Robin { factor: 3.0 });
            agree(robin.abscissa, -root * root, error, "Robin at both ends");
            let fluxes = with(FaceCondition::Flux);
            assert!(fluxes.abscissa.abs() < fluxes.tolerance, "order {order}: {}", fluxes.abscissa);
            assert!(fluxes.is_stable() && robin.is_stable() && values.is_stable());
            // A negative factor feeds energy in: a true property of the problem, seen as such.
            assert!(!with(FaceCondition::Robin { factor: -3.0 }).is_stable());
        }
    }
}

/// Heat with b from 0.1 to 1.9 that oscillates: within b_max times the radius of b = 1 (M(b) ≤ b_max M(1)), and self-adjoint.
#[test]
fn varying_coefficients_stay_within_their_bound() {
    for order in ORDERS {
        let coefficient: Vec<f64> = (0..=40).map(|node| 1.0 + 0.9 * (f64::from(node) * 0.7).sin()).collect();
        let largest = coefficient.iter().copied().fold(0.0, f64::max);
        for face in [FaceCondition::Value, FaceCondition::Flux] {
            let varying =
                examine(&varying_diffusion(second(order), &coefficient, face_pair(face)).expect("fits"))
                    .expect("converges");
            let constant = diffusion(second(order).constant(), 40, face_pair(face)).expect("fits");
            assert!(varying.is_stable(), "{order} {face:?}: {}", varying.abscissa);
            assert!(varying.radius <= largest * radius(&constant) * (1.0 + 1e-12), "{order} {face:?}");
            assert!(varying.eigenvalues.iter().all(|(_, im)| im.abs() < 1e-8 * varying.radius));
            let flat = varying_diffusion(second(order), &[2.0; 41], face_pair(face)).expect("fits");
            for (row, other) in flat.iter().zip(&constant) {
                assert!(row.iter().zip(other).all(|(a, b)| (a - 2.0 * b).abs() < 1e-10 * varying.radius));
            }
        }
    }
}

/// Acoustics at 80 intervals: open ends as advection with replacement; full reflection keeps the energy; a reflection of 3/2 grows
/// at ln(1.5)/2 at one end after the other, which is true of the problem (characteristics, common practice).
#[test]
fn real_parts_of_acoustics() {
    let open_ends = [-0.00308, -0.00208, -0.000386, -0.000209];
    for (order, known) in ORDERS.into_iter().zip(open_ends) {
        let with = |reflection| {
            examine(&acoustics(reference_first(order), 80, reflection).expect("fits")).expect("converges")
        };
        let open = with([0.0, 0.0]);
        agree(open.abscissa, known, unit_in_digit(3, known), &format!("open, order {order}"));
        for wall in [[1.0, 1.0], [-1.0, -1.0], [1.0, -1.0]] {
            let closed = with(wall);
            assert!(closed.is_stable() && closed.abscissa.abs() < closed.tolerance, "{wall:?}");
        }
        let over = with([1.5, 1.0]);
        agree(over.abscissa, 1.5_f64.ln() / 2.0, 1e-3, &format!("reflection 3/2, order {order}"));
        assert!(!over.is_stable());
        // The step limit of open ends is that of advection.
        let rows = acoustics(reference_first(order), 60, [0.0, 0.0]).expect("fits");
        let scalar = advection(reference_first(order), 60, Inflow::Flux { strength: 1.0 }).expect("fits");
        for method in RUNGE_KUTTA {
            let limit = |rows: &Rows| closed_limit(method, rows).expect("converges");
            agree(limit(&rows), limit(&scalar), 1e-6, &format!("{order} {method:?}"));
        }
    }
}

/// Waves do not grow whatever holds at the ends; absorbing ends drain.
#[test]
fn real_parts_of_waves() {
    for order in ORDERS {
        for faces in [
            face_pair(WaveFace::Value),
            face_pair(WaveFace::Flux),
            [WaveFace::Value, WaveFace::Absorbing { impedance: 1.0 }],
            face_pair(WaveFace::Absorbing { impedance: 1.0 }),
        ] {
            let problem = wave(second(order).constant(), 40, faces).expect("fits");
            assert_eq!(second_order_growth(&eigenvalues(&problem.stiffness).expect("converges")), 0.0);
            let system = examine(&problem.system()).expect("converges");
            // The double nought of the constant mode is split by √ε.
            assert!(system.abscissa < 1e-7 * system.radius, "{order} {faces:?}: {}", system.abscissa);
        }
        let mixed = [WaveFace::Value, WaveFace::Absorbing { impedance: 1.0 }];
        let negative = [WaveFace::Value, WaveFace::Absorbing { impedance: -0.5 }];
        let part = |faces| abscissa(&wave(second(order).constant(), 40, faces).expect("fits").system());
        assert!(part(mixed) < 1e-6);
        // Smooth modes then grow at ½ ln 3: tanh s = 2 (separation of variables, common practice).
        assert!(part(negative) > 0.5 * 3.0_f64.ln() * 0.999, "energy fed in is seen: {}", part(negative));
    }
}

/// A derivative with one-sided rows of the given order where the interior does not fit.
fn one_sided(derivative: usize, order: usize, closure_order: usize) -> DifferenceOperator {
    let stencil = interior::centred(derivative, order).expect("centred weights exist");
    let rows = (0..order / 2)
        .map(|row| {
            let nodes: Vec<Rational> = (0..(derivative + closure_order) as i64).map(Rational::from).collect();
            let weights = interior::weights(&nodes, &Rational::from(row as i64), derivative);
            ClosedRow { first: 0, weights: weights.expect("weights exist").weights().to_vec() }
        })
        .collect();
    DifferenceOperator::bounded(stencil, order, rows, closure_order).expect("exact to its orders")
}

/// One-sided closures of the interior's order, injected inflow: the largest real part (reference computation). From order 4 on
/// they grow, and each is caught; order 2 does not.
#[test]
fn one_sided_advection_is_caught() {
    let known = [
        (2, 2, 20, -0.03945376530078093),
        (2, 2, 80, -0.002355429257625996),
        (4, 4, 20, 0.24925980656243163),
        (4, 4, 40, 0.2582973278079632),
        (4, 4, 80, 0.2827364002525794),
        (6, 6, 20, 3.927719741830506),
        (6, 6, 40, 7.853158573489506),
        (6, 6, 80, 15.706311806405871),
        (8, 8, 20, 8.349013264278913),
        (8, 8, 40, 16.698163059773872),
        (8, 8, 80, 33.39632612016277),
        (10, 10, 40, 24.221405778990604),
        (2, 1, 80, -0.0015416433483768088),
        (4, 3, 80, -0.0005525368508472184),
        (4, 2, 80, -0.0014449279363972778),
        (6, 5, 80, 4.667255242044887),
        // The subtle one: interior 6 with closures of order 4.
        (6, 4, 80, 0.010353967335746006),
        (6, 3, 80, -0.0009048345018367598),
        (8, 7, 80, 24.64443290405912),
        (8, 6, 80, 12.369309418252918),
        (8, 4, 80, -0.0003668061651858068),
        (10, 9, 80, 41.15109889050049),
        (10, 8, 80, 31.98337485592299),
        (10, 5, 80, 2.2977974196306192),
    ];
    for (order, closure_order, intervals, real_part) in known {
        let operator = one_sided(1, order, closure_order);
        let found = examine(&injected_advection(&operator, intervals).expect("fits")).expect("converges");
        let what = format!("order {order}, closure {closure_order}, {intervals} intervals");
        agree(found.abscissa, real_part, 1e-6, &what);
        assert_eq!(found.is_stable(), real_part < 0.0, "{what}");
        assert_eq!(one_step_limit(&found.eigenvalues, Method::Rk4) > 0.0, real_part < 0.0, "{what}");
    }
}

/// One-sided second derivatives, values at both ends: heat decays and hides the fault, the wave grows from order 6 on
/// (reference computation at 80 intervals: largest imaginary part of heat, growth of the wave).
#[test]
fn one_sided_waves_are_caught() {
    let known = [
        (2, 0.0, 0.0),
        (4, 0.0, 0.0),
        (6, 6127.211674552816, 23.44632866797473),
        (8, 11349.144180550218, 42.57289670561063),
        (10, 15624.413640255776, 57.76676335648772),
    ];
    for (order, imaginary, growth) in known {
        let operator = one_sided(2, order, order);
        let rows = diffusion(&operator, 80, face_pair(FaceCondition::Value)).expect("fits");
        let heat = examine(&rows).expect("converges");
        assert!(heat.is_stable());
        agree(heat.abscissa, -9.8696, 2e-4, "heat");
        let largest = heat.eigenvalues.iter().map(|(_, im)| im.abs()).fold(0.0, f64::max);
        assert!((largest - imaginary).abs() <= 1e-6 * imaginary + 1e-3, "order {order}: {largest}");
        let found = second_order_growth(&heat.eigenvalues);
        assert!((found - growth).abs() <= 1e-6 * growth, "order {order}: {found}");
        assert_eq!(
            second_order_limit(&heat.eigenvalues, Method::Leapfrog) > 0.0,
            growth == 0.0,
            "order {order}"
        );
    }
}

/// The same with the flux eliminated by a one-sided first derivative at each end.
#[test]
fn one_sided_flux_elimination_is_caught() {
    let known = [(4, 0.0), (6, 6.162175216699359), (8, 28.65884403598248)];
    for (order, growth) in known {
        let intervals = 80;
        let mut rows = dense(&one_sided(2, order, order), intervals + 1).expect("fits");
        let per_area = (intervals * intervals) as f64;
        rows.iter_mut().flatten().for_each(|entry| *entry *= per_area);
        let nodes: Vec<Rational> = (0..=order as i64).map(Rational::from).collect();
        let slope = interior::weights(&nodes, &Rational::zero(), 1).expect("weights exist");
        let slope: Vec<f64> = slope.weights().iter().map(round::nearest).collect();
        for row in &mut rows {
            for offset in 1..slope.len() {
                row[offset] -= row[0] * slope[offset] / slope[0];
                row[intervals - offset] -= row[intervals] * slope[offset] / slope[0];
            }
        }
        let inner: Rows = rows[1..intervals].iter().map(|row| row[1..intervals].to_vec()).collect();
        let found = second_order_growth(&eigenvalues(&inner).expect("converges"));
        assert!((found - growth).abs() <= 1e-5 * growth, "order {order}: {found}");
        assert!(examine(&inner).expect("converges").is_stable(), "heat decays all the same");
    }
}

/// Advection with values injected at both ends is ill posed, and its eigenvalues do not show it: the count of conditions must.
#[test]
fn eigenvalues_do_not_count_conditions() {
    let rows = injected_advection(first(4).operator(), 40).expect("fits");
    let both: Rows = rows[..39].iter().map(|row| row[..39].to_vec()).collect();
    assert!(examine(&both).expect("converges").is_stable());
}

/// Periodic operators: the eigenvalues are the symbol at the grid's angles; with angles that hit the maximum, its radius.
#[test]
fn periodic_radii_are_those_of_the_symbol() {
    for order in [2, 4, 6, 8, 10, 12, 14, 16] {
        let one = closure::periodic_first_derivative(order).expect("an offered order");
        let rows = dense(one.operator(), 120).expect("fits");
        let found = examine(&rows).expect("converges");
        assert!(found.is_stable() && found.abscissa.abs() < found.tolerance, "order {order}");
        let bound = symbol::radius(1, order);
        assert!(found.radius <= bound * (1.0 + 1e-12) && found.radius > 0.998 * bound, "order {order}");
        if let Ok(two) = closure::periodic_second_derivative(order) {
            let radius =
                spectrum::radius(&eigenvalues(&dense(two.constant(), 40).expect("fits")).expect("converges"));
            agree(radius, symbol::radius(2, order), 1e-12, &format!("second derivative, order {order}"));
        }
    }
}

#[test]
fn what_cannot_be_built_is_said() {
    let flux = Inflow::Flux { strength: 1.0 };
    assert!(matches!(advection(first(4), 5, flux), Err(ClosedFault::TooFewNodes { .. })));
    assert!(matches!(advection(first(2), 0, flux), Err(ClosedFault::TooFewNodes { .. })));
    let periodic = closure::periodic_first_derivative(4).expect("an offered order");
    assert_eq!(advection(periodic, 40, flux), Err(ClosedFault::Periodic));
    let fluxless = one_sided(2, 4, 4);
    let refused = diffusion(&fluxless, 40, face_pair(FaceCondition::Flux));
    assert_eq!(refused, Err(ClosedFault::NoNaturalFlux));
    let wrong = injected_advection(second(4).constant(), 40);
    assert_eq!(wrong, Err(ClosedFault::Degree { found: 2 }));
    let short = varying_diffusion(second(8), &[1.0; 4], face_pair(FaceCondition::Flux));
    assert!(matches!(short, Err(ClosedFault::TooFewNodes { .. })));
    assert!(varying_diffusion(second(2), &[], face_pair(FaceCondition::Flux)).is_err());
}

/// Limits of the interior alone, c dt/h and dt/h² on periodic axes (reference computation), and those published for the classical
/// method of four stages with central differences of orders 2 and 4 (Strikwerda 2004, from memory).
#[test]
fn limits_of_interiors() {
    let advection = [
        (2, [1.7320508098783, 2.8284271251439, 3.3407179867242]),
        (4, [1.2622236584633, 2.0612026005443, 2.4345320905415]),
        (6, [1.0921026215534, 1.7833961109141, 2.1064086863760]),
        (8, [1.0008395461390, 1.6343641330102, 1.9303837130773]),
    ];
    for (order, limits) in advection {
        for (method, limit) in RUNGE_KUTTA.into_iter().zip(limits) {
            let found = extents(method).imaginary / symbol::radius(1, order);
            // The reference samples angles, which misses the largest symbol by a little.
            agree(found, limit, 1e-6, &format!("advection, {order}, {method:?}"));
            assert!(found <= limit, "rounded to the safe side: {order}, {method:?}");
        }
    }
    let diffusion = [
        (2, [0.5000000002500, 0.6281863318066, 0.6963233910171, 1.1641892666889]),
        (4, [0.3750000001875, 0.4711397488550, 0.5222425432629, 0.8731419500167]),
        (6, [0.3308823531066, 0.4157115431073, 0.4608022440555, 0.7704193676618]),
        (8, [0.3076171876539, 0.3864818252326, 0.4284020862703, 0.7162492558730]),
    ];
    for (order, limits) in diffusion {
        let methods = [Method::Euler, Method::Ssprk3, Method::Rk4, Method::Lsrk4];
        for (method, limit) in methods.into_iter().zip(limits) {
            let found = extents(method).real / symbol::radius(2, order);
            agree(found, limit, PARTS, &format!("diffusion, {order}, {method:?}"));
        }
    }
    let classical = |order| extents(Method::Rk4).imaginary / symbol::radius(1, order);
    agree(classical(2), 2.82842712474619, 1e-11, "order 2");
    agree(classical(4), 2.06120231739147, 1e-11, "order 4");
}

/// Advection with dissipation sin²ᵏ(θ/2), k = order/2 + 1: limits of the interior symbol (reference computation, four digits), on
/// both sides of the limits without.
#[test]
fn limits_of_dissipative_symbols() {
    let known = [
        (2, [2.313, 2.529, 3.036]),
        (4, [1.590, 2.043, 2.355]),
        (6, [1.330, 1.847, 2.098]),
        (8, [1.191, 1.697, 1.947]),
    ];
    for (order, limits) in known {
        let half = order / 2;
        // −4⁻ᵏ Δᵏ against its mirror image: weights −4⁻ᵏ (−1)ʲ C(2k, k + j).
        let reach = half + 1;
        let damping = |offset: usize| {
            let sign = if offset.is_multiple_of(2) { -1.0 } else { 1.0 };
            sign * round::nearest(&binomial(2 * reach, reach + offset)) / 4.0_f64.powi(reach as i32)
        };
        let centred = interior::centred(1, order).expect("centred weights exist");
        let weights: Vec<f64> = (0..=2 * reach)
            .map(|index| {
                let transport = index.checked_sub(1).and_then(|inner| centred.weights().get(inner));
                damping(index.abs_diff(reach)) - transport.map_or(0.0, round::nearest)
            })
            .collect();
        let symbol = interior_symbol(-(reach as i64), &weights);
        for (method, limit) in RUNGE_KUTTA.into_iter().zip(limits) {
            let found = one_step_limit(&symbol, method);
            assert!((found - limit).abs() < 1.1e-3, "{order} {method:?}: {found} instead of {limit}");
        }
    }
}
