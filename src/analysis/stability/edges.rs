//! |R(z)|² − 1 along lines of the complex plane, as polynomials with rational coefficients.

use crate::exact::Rational;

/// By ascending powers.
pub(super) type Polynomial = Vec<Rational>;

/// |R(−x)|² − 1 in x.
pub(super) fn along_negative_real(polynomial: &[Rational]) -> Polynomial {
    along(polynomial, [&[Rational::zero(), Rational::from(-1)], &[]])
}

/// |R(iy)|² − 1 in y.
pub(super) fn along_imaginary(polynomial: &[Rational]) -> Polynomial {
    along(polynomial, [&[], &[Rational::zero(), Rational::one()]])
}

/// |R|² − 1 from i·imaginary at 0 to −real at 1.
pub(super) fn along_slanted(polynomial: &[Rational], real: &Rational, imaginary: &Rational) -> Polynomial {
    along(polynomial, [&[Rational::zero(), -real], &[imaginary.clone(), -imaginary]])
}

/// |R(x(s) + i y(s))|² − 1, by Horner's rule on pairs of polynomials.
fn along(polynomial: &[Rational], [x, y]: [&[Rational]; 2]) -> Polynomial {
    let (mut re, mut im) = (Polynomial::new(), Polynomial::new());
    for coefficient in polynomial.iter().rev() {
        let next = sum(&product(&re, x), &product(&im, y), &Rational::from(-1));
        im = sum(&product(&re, y), &product(&im, x), &Rational::one());
        re = sum(&next, std::slice::from_ref(coefficient), &Rational::one());
    }
    let square = sum(&product(&re, &re), &product(&im, &im), &Rational::one());
    sum(&square, &[Rational::one()], &Rational::from(-1))
}

fn product(left: &[Rational], right: &[Rational]) -> Polynomial {
    if left.is_empty() || right.is_empty() {
        return Polynomial::new();
    }
    let mut result = vec![Rational::zero(); left.len() + right.len() - 1];
    for (i, a) in left.iter().enumerate() {
        for (j, b) in right.iter().enumerate() {
            result[i + j] += a * b;
        }
    }
    result
}

/// left + factor · right.
fn sum(left: &[Rational], right: &[Rational], factor: &Rational) -> Polynomial {
    let mut result = left.to_vec();
    result.resize(left.len().max(right.len()), Rational::zero());
    for (total, part) in result.iter_mut().zip(right) {
        *total += factor * part;
    }
    result
}
