//! Stability regions of the explicit methods: how far they reach along the axes, how much of the triangle between they hold, and the
//! longest step for a list of eigenvalues.
//!
//! Extents are proved: polynomials of rationals, roots counted by Sturm chains. Limits for eigenvalues are doubles, as those are.
//! Which eigenvalues a scheme has is said in [`super::closed`] and [`super::symbol`].

mod edges;
mod roots;
#[cfg(test)]
mod tests;

use std::sync::OnceLock;

use super::spectrum::{self, Eigenvalue};
use crate::exact::{Rational, factorial, round};
use crate::model::Method;
use crate::scheme::step_rule::{Accuracy, StepRule};

/// Extents of a region |R(z)| ≤ 1, rounded down to twelve digits.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Extents {
    /// The region holds [−real, 0].
    pub real: f64,
    /// The region holds [−i·imaginary, i·imaginary]; 0 where it holds nothing of the imaginary axis.
    pub imaginary: f64,
    /// The region holds the triangle with corners ±i·imaginary and −real, shrunk by this factor (at most one).
    pub combined: f64,
}

/// The extents of a method's region, proved once: roots of exact polynomials counted by Sturm chains, which takes some hundredths of a
/// second. Leapfrog has no region of its own here (its limit for u_tt is 2/√ρ): zero.
pub fn proved_extents(method: Method) -> Extents {
    static KNOWN: PerMethod<Extents> = [const { OnceLock::new() }; Method::ALL.len()];
    *KNOWN[place(method)].get_or_init(|| derive(method))
}

/// The extents of a method's region in double precision, rounded down by 10⁻¹¹: what every compilation uses. A test holds them to the
/// proved ones, from below. The factor of the triangle is one for every method here, and that is proved in the same test.
pub fn extents(method: Method) -> Extents {
    static KNOWN: PerMethod<Extents> = [const { OnceLock::new() }; Method::ALL.len()];
    *KNOWN[place(method)].get_or_init(|| estimate(method))
}

fn estimate(method: Method) -> Extents {
    let Some(region) = Region::of(method) else {
        return Extents { real: 0.0, imaginary: 0.0, combined: 1.0 };
    };
    let reach = |direction: (f64, f64)| {
        let inside = |length: f64| region.contains((direction.0 * length, direction.1 * length));
        let mut low = 0.0;
        while low < FARTHEST && inside(low + SCAN) {
            low += SCAN;
        }
        let mut high = low + SCAN;
        for _ in 0..60 {
            let middle = 0.5 * (low + high);
            if inside(middle) { low = middle } else { high = middle }
        }
        // The tolerance of `contains` lets a ray that leaves at once go a little way: that is no extent.
        if low < SCAN { 0.0 } else { low * (1.0 - 1e-11) }
    };
    Extents { real: reach((-1.0, 0.0)), imaginary: reach((0.0, 1.0)), combined: 1.0 }
}

/// What is derived once for each method.
type PerMethod<T> = [OnceLock<T>; Method::ALL.len()];

/// The place of a method in the list of all; were one missing from it, it would share the first place, which the test on the list
/// excludes.
fn place(method: Method) -> usize {
    Method::ALL.iter().position(|(known, _)| *known == method).unwrap_or(0)
}

/// The factor by which the triangle with corners ±iβᵢ and −βᵣ must be shrunk to lie in the region; 1 where it lies in it.
pub fn combined_factor(method: Method) -> f64 {
    extents(method).combined
}

fn derive(method: Method) -> Extents {
    let Some(polynomial) = nominal_polynomial(method) else {
        return Extents { real: 0.0, imaginary: 0.0, combined: 1.0 };
    };
    let real = roots::first_exit(&edges::along_negative_real(&polynomial));
    let imaginary = roots::first_exit(&edges::along_imaginary(&polynomial));
    let combined =
        if imaginary.is_zero() { Rational::one() } else { shrinking(&polynomial, &real, &imaginary) };
    Extents {
        real: round::nearest(&real),
        imaginary: round::nearest(&imaginary),
        combined: round::nearest(&combined),
    }
}

/// R(z) by ascending powers, exact from the method's coefficients; nothing for leapfrog.
pub fn polynomial(method: Method) -> Option<Vec<Rational>> {
    Some(StepRule::of(method)?.stability_polynomial())
}

/// R(z) as the method was meant: where published rationals meet 1/k! to their tolerance they are taken as 1/k!, the rest rounded to
/// 2⁻¹⁰⁰. Without that, an excess of 10⁻²⁶ would count as leaving the region at the origin.
fn nominal_polynomial(method: Method) -> Option<Vec<Rational>> {
    let rule = StepRule::of(method)?;
    let exact = rule.stability_polynomial();
    let Accuracy::Published { .. } = rule.accuracy() else { return Some(exact) };
    let grid = Rational::from(2).power(100);
    let nominal = exact.iter().enumerate().map(|(power, coefficient)| match factorial(power).recip() {
        Some(taylor) if power <= rule.order() => taylor,
        _ => (coefficient * &grid).rounded() / &grid,
    });
    Some(nominal.collect())
}

/// The largest factor, to six digits and rounded down, by which the triangle fits. |R| has its maximum over a triangle on the
/// triangle's edge (it is subharmonic), the part on the imaginary axis is inside, the two others mirror each other. A smaller
/// triangle lies within a larger one, so bisection finds the largest.
fn shrinking(polynomial: &[Rational], real: &Rational, imaginary: &Rational) -> Rational {
    let fits = |factor: &Rational| {
        let edge = edges::along_slanted(polynomial, &(factor * real), &(factor * imaginary));
        roots::never_positive_on_unit_interval(&edge)
    };
    if fits(&Rational::one()) {
        return Rational::one();
    }
    let million = 1_000_000;
    let (mut low, mut high) = (0, million);
    while high - low > 1 {
        let middle = i64::midpoint(low, high);
        if fits(&Rational::ratio(middle, million)) { low = middle } else { high = middle }
    }
    Rational::ratio(low, million)
}

/// Relative size below which real parts of computed eigenvalues are taken for nought, and whole eigenvalues for the zero of a mode
/// that stays.
const SPECTRAL_NOISE: f64 = 1e-10;
/// What |R| may exceed one by: rounding of the polynomial near the origin is not growth.
const ROUNDING: f64 = 1e-12;
/// Regions are scanned along rays in steps of this.
const SCAN: f64 = 1.0 / 64.0;
/// No region of a method here reaches this far.
const FARTHEST: f64 = 64.0;

/// |R(z)| for z = (real, imaginary).
pub fn amplification(method: Method, z: (f64, f64)) -> Option<f64> {
    Some(Region::of(method)?.amplification(z))
}

/// Whether |R(z)| ≤ 1, to rounding; nothing for leapfrog.
pub fn contains(method: Method, z: (f64, f64)) -> Option<bool> {
    Some(Region::of(method)?.contains(z))
}

/// The longest step dt for u' = A u with these eigenvalues: dt λ is in the region for every λ, and for all shorter steps too.
/// Zero where some mode grows or the region has nothing of the axis on which modes lie; infinite where all modes stay. Leapfrog is
/// no method for u' = A u: zero.
///
/// Real parts within 10⁻¹⁰ of the spectral radius count as nought. For a matrix far from normal (dissipation or one-sided weights
/// near a wall) eigenvalues alone are no step limit: take the least of this and the limit of the interior symbol.
pub fn one_step_limit(eigenvalues: &[Eigenvalue], method: Method) -> f64 {
    let Some(region) = Region::of(method) else { return 0.0 };
    let noise = SPECTRAL_NOISE * spectrum::radius(eigenvalues);
    let mut limit = f64::INFINITY;
    for (re, im) in eigenvalues {
        let re = if re.abs() <= noise { 0.0 } else { *re };
        let size = re.hypot(*im);
        if size <= noise {
            continue;
        }
        if re > 0.0 || !size.is_finite() {
            return 0.0;
        }
        // The conjugate has the same limit.
        let reach = region.reach(re / size, im.abs() / size);
        limit = limit.min(reach / size);
    }
    limit
}

/// The longest step for u_tt = L u with these eigenvalues of L: 2/√ρ for leapfrog, else that of the system (u, u_t) with
/// eigenvalues ±√λ. Zero where an eigenvalue of L is positive or complex, for then some mode grows.
pub fn second_order_limit(eigenvalues: &[Eigenvalue], method: Method) -> f64 {
    let radius = spectrum::radius(eigenvalues);
    if radius == 0.0 {
        return f64::INFINITY;
    }
    if second_order_growth(eigenvalues) > 0.0 || !radius.is_finite() {
        return 0.0;
    }
    match method {
        Method::Leapfrog => 2.0 / radius.sqrt(),
        _ => one_step_limit(&[(0.0, radius.sqrt())], method),
    }
}

/// Relative size of what rounding makes of a real, possibly double, eigenvalue of L.
const DOUBLE_NOISE: f64 = 1e-8;

/// The growth rate of u_tt = L u: the largest real part of ±√λ. Eigenvalues nought or negative and real within 10⁻⁸ of the spectral
/// radius do not grow.
pub fn second_order_growth(eigenvalues: &[Eigenvalue]) -> f64 {
    let noise = DOUBLE_NOISE * spectrum::radius(eigenvalues);
    eigenvalues
        .iter()
        .filter(|(re, im)| *re > noise || im.abs() > noise)
        .map(|(re, im)| {
            // Re √λ = √((|λ| + Re λ)/2), without cancellation where Re λ < 0.
            let size = re.hypot(*im);
            if *re > 0.0 { ((size + re) / 2.0).sqrt() } else { im.abs() / (2.0 * (size - re)).sqrt() }
        })
        .fold(0.0, f64::max)
}

/// A region |R(z)| ≤ 1 in doubles.
struct Region {
    coefficients: Vec<f64>,
}

impl Region {
    fn of(method: Method) -> Option<&'static Region> {
        static KNOWN: PerMethod<Option<Region>> = [const { OnceLock::new() }; Method::ALL.len()];
        let derive = || {
            let coefficients = nominal_polynomial(method)?.iter().map(round::nearest).collect();
            Some(Region { coefficients })
        };
        KNOWN[place(method)].get_or_init(derive).as_ref()
    }

    fn amplification(&self, (x, y): (f64, f64)) -> f64 {
        let (mut re, mut im) = (0.0, 0.0);
        for coefficient in self.coefficients.iter().rev() {
            (re, im) = (re * x - im * y + coefficient, re * y + im * x);
        }
        f64::hypot(re, im)
    }

    fn contains(&self, z: (f64, f64)) -> bool {
        self.amplification(z) <= 1.0 + ROUNDING
    }

    /// How far the ray from the origin in this direction (a unit vector, its real part not positive) stays inside, rounded down.
    fn reach(&self, x: f64, y: f64) -> f64 {
        let inside = |length: f64| self.contains((x * length, y * length));
        let mut low = 0.0;
        while low < FARTHEST && inside(low + SCAN) {
            low += SCAN;
        }
        let mut high = low + SCAN;
        while high - low > 1e-13 * high && high > 1e-9 {
            let middle = 0.5 * (low + high);
            if inside(middle) { low = middle } else { high = middle }
        }
        // Forward Euler along the imaginary axis: |R|² = 1 + y² is within rounding of one below 10⁻⁶.
        let least = 4.0 * ROUNDING.sqrt();
        if low <= least && self.amplification((x * least, y * least)) > 1.0 {
            0.0
        } else {
            low * (1.0 - 1e-12)
        }
    }
}
