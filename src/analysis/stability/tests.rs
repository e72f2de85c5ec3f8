//! Extents and limits against known values.

use super::*;

const ONE_STEP: [Method; 4] = [Method::Euler, Method::Ssprk3, Method::Rk4, Method::Lsrk4];

/// Extents of the classical methods (Hairer & Wanner 1996, IV.2, from memory; √3 and 2√2 are exact), to twelve digits and below.
#[test]
fn extents_meet_known_values() {
    let close = |value: f64, known: f64| {
        assert!(known - value < 1.01e-11 && value <= known, "{value} {known}");
    };
    assert_eq!((proved_extents(Method::Euler).real, proved_extents(Method::Euler).imaginary), (2.0, 0.0));
    close(proved_extents(Method::Ssprk3).imaginary, 3.0_f64.sqrt());
    close(proved_extents(Method::Ssprk3).real, 2.512_745_326_618_329);
    close(proved_extents(Method::Rk4).imaginary, 8.0_f64.sqrt());
    close(proved_extents(Method::Rk4).real, 2.785_293_563_405_282);
    assert_eq!(proved_extents(Method::Leapfrog).real, 0.0);
}

/// Limits of the low-storage method on advection and heat of second order, from an independent computation in doubles with a
/// tolerance of 1e-9 in |R|.
#[test]
fn low_storage_extents() {
    let found = proved_extents(Method::Lsrk4);
    assert!((found.imaginary - 3.340_717_986_724_18).abs() < 1e-8, "{}", found.imaginary);
    assert!((found.real - 4.0 * 1.164_189_266_688_828).abs() < 1e-8, "{}", found.real);
}

#[test]
fn every_method_has_its_own_place() {
    for method in [Method::Euler, Method::Ssprk3, Method::Rk4, Method::Lsrk4, Method::Leapfrog] {
        assert_eq!(Method::ALL[place(method)].0, method);
    }
}

/// The extents are sharp: inside up to them, outside a little beyond.
#[test]
fn extents_are_sharp() {
    for method in ONE_STEP {
        let Extents { real, imaginary, .. } = proved_extents(method);
        for share in 1..=400 {
            let share = f64::from(share) / 400.0;
            assert_eq!(contains(method, (-real * share, 0.0)), Some(true));
            assert_eq!(contains(method, (0.0, imaginary * share)), Some(true));
        }
        assert_eq!(contains(method, (-real - 1e-9, 0.0)), Some(false));
        assert_eq!(contains(method, (0.0, imaginary + 1e-4)), Some(false));
    }
    assert_eq!(contains(Method::Leapfrog, (0.0, 0.0)), None);
}

/// The triangle lies inside by sampling too, independently of the roots.
#[test]
fn the_triangle_lies_inside() {
    for method in [Method::Ssprk3, Method::Rk4, Method::Lsrk4] {
        let Extents { real, imaginary, combined } = proved_extents(method);
        assert_eq!(combined, 1.0, "{method:?}: proved by counting roots");
        let worst = |factor: f64| {
            let mut worst: f64 = 0.0;
            for depth in 1..=20 {
                for share in 0..=2000 {
                    let share = f64::from(share) / 2000.0;
                    let scale = factor * f64::from(depth) / 20.0;
                    let z = (-real * share * scale, imaginary * (1.0 - share) * scale);
                    worst = worst.max(amplification(method, z).expect("one step"));
                }
            }
            worst
        };
        assert!(worst(combined) <= 1.0 + 1e-12, "{method:?}: {}", worst(combined));
        assert!(worst(1.01) > 1.0, "{method:?}: corners beyond the region are outside");
        // A triangle that is too large is shrunk by as much as sampling says, and no more.
        let polynomial = nominal_polynomial(method).expect("one step");
        let twice = |value: f64| Rational::from(2) * round::from_f64(value).expect("finite");
        let shrunk = 2.0 * round::nearest(&shrinking(&polynomial, &twice(real), &twice(imaginary)));
        assert!(worst(shrunk) <= 1.0 + 1e-12 && worst(shrunk + 1e-4) > 1.0 && shrunk >= 1.0 - 1e-6);
    }
}

/// On the axes the limits for eigenvalues are the extents; forward Euler allows nothing of the imaginary axis.
#[test]
fn limits_on_the_axes() {
    for method in ONE_STEP {
        let Extents { real, imaginary, .. } = proved_extents(method);
        let decay = one_step_limit(&[(-4.0, 0.0), (-1.0, 0.0), (0.0, 0.0)], method);
        assert!((decay - real / 4.0).abs() < 1e-9, "{method:?}");
        let wave = one_step_limit(&[(0.0, 2.0), (0.0, -2.0), (1e-12, 1.0), (1e-12, -1.0)], method);
        assert!((wave - imaginary / 2.0).abs() < 1e-6, "{method:?}: {wave}");
        assert_eq!(one_step_limit(&[(0.1, 1.0), (0.1, -1.0)], method), 0.0);
        assert_eq!(one_step_limit(&[(f64::NAN, 1.0)], method), 0.0);
        assert_eq!(one_step_limit(&[(0.0, 0.0)], method), f64::INFINITY);
    }
    assert_eq!(one_step_limit(&[(0.0, 1.0)], Method::Euler), 0.0);
    // |1 + dt λ| ≤ 1 for dt ≤ −2 Re λ/|λ|² (common practice).
    let damped = one_step_limit(&[(-1.0, 3.0), (-1.0, -3.0)], Method::Euler);
    assert!((damped - 0.2).abs() < 1e-10, "{damped}");
}

/// A region need not be star-shaped along a ray; the limit holds for all shorter steps.
#[test]
fn all_shorter_steps_are_inside() {
    for method in ONE_STEP {
        for angle in 0..=90 {
            let angle = (90.0 + f64::from(angle)).to_radians();
            let limit = one_step_limit(&[(angle.cos(), angle.sin())], method);
            for part in 1..=200 {
                let length = limit * f64::from(part) / 200.0;
                let z = (angle.cos().min(0.0) * length, angle.sin() * length);
                assert_eq!(contains(method, z), Some(true), "{method:?} {angle} {length}");
            }
        }
    }
}

/// Leapfrog: 2/√ρ (common practice). A complex or positive eigenvalue of L grows.
#[test]
fn second_order_in_time() {
    let still = [(-4.0, 0.0), (-1.0, 0.0), (1e-12, 0.0)];
    assert!((second_order_limit(&still, Method::Leapfrog) - 1.0).abs() < 1e-15);
    assert!((second_order_limit(&still, Method::Rk4) - 2.0_f64.sqrt()).abs() < 1e-9);
    assert_eq!(second_order_limit(&still, Method::Euler), 0.0);
    assert_eq!(second_order_growth(&still), 0.0);
    for growing in [[(-3.0, 4.0), (-3.0, -4.0)], [(1.0, 0.0), (-9.0, 0.0)]] {
        assert!((second_order_growth(&growing) - 1.0).abs() < 1e-15);
        assert_eq!(second_order_limit(&growing, Method::Leapfrog), 0.0);
    }
    assert_eq!(second_order_limit(&[], Method::Leapfrog), f64::INFINITY);
}

/// What compilations use lies below what is proved, and no further than rounding.
#[test]
fn estimates_lie_just_below_what_is_proved() {
    for (method, name) in Method::ALL {
        let (estimated, proved) = (super::extents(method), proved_extents(method));
        for (quick, exact) in [(estimated.real, proved.real), (estimated.imaginary, proved.imaginary)] {
            assert!(
                quick <= exact * (1.0 + 1e-13) && quick >= exact * (1.0 - 1e-6),
                "{name}: {quick} against {exact}"
            );
        }
        assert!(estimated.combined <= proved.combined, "{name}");
    }
}
