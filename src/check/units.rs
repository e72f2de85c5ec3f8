//! Units: spelled factors to an exact SI factor and a dimension.
//!
//! SI base and derived units with prefixes (BIPM 2019, prefixes of 2022), and min, h, d, °. Units with an offset (°C) were refused by the parser.

use crate::diagnostic::nearest::nearest;
use crate::diagnostic::{Diagnostic, Diagnostics, codes_check};
use crate::exact::Rational;
use crate::model::{Dimension, Expression};
use crate::syntax::tree::Unit;

/// What one unit is worth: `factor` SI base units of a dimension.
#[derive(Clone, Debug, PartialEq)]
pub struct Scale {
    pub factor: Expression,
    pub dimension: Dimension,
}

struct Entry {
    symbol: &'static str,
    /// Numerator and denominator of the SI factor; degrees carry π apart.
    factor: (i64, i64),
    /// Exponents of m, kg, s, A, K, mol, cd.
    exponents: [i64; 7],
    prefixed: bool,
}

const fn entry(symbol: &'static str, factor: (i64, i64), exponents: [i64; 7], prefixed: bool) -> Entry {
    Entry { symbol, factor, exponents, prefixed }
}

const UNITS: [Entry; 32] = [
    entry("m", (1, 1), [1, 0, 0, 0, 0, 0, 0], true),
    entry("g", (1, 1000), [0, 1, 0, 0, 0, 0, 0], true),
    entry("s", (1, 1), [0, 0, 1, 0, 0, 0, 0], true),
    entry("A", (1, 1), [0, 0, 0, 1, 0, 0, 0], true),
    entry("K", (1, 1), [0, 0, 0, 0, 1, 0, 0], true),
    entry("mol", (1, 1), [0, 0, 0, 0, 0, 1, 0], true),
    entry("cd", (1, 1), [0, 0, 0, 0, 0, 0, 1], true),
    entry("Hz", (1, 1), [0, 0, -1, 0, 0, 0, 0], true),
    entry("N", (1, 1), [1, 1, -2, 0, 0, 0, 0], true),
    entry("Pa", (1, 1), [-1, 1, -2, 0, 0, 0, 0], true),
    entry("J", (1, 1), [2, 1, -2, 0, 0, 0, 0], true),
    entry("W", (1, 1), [2, 1, -3, 0, 0, 0, 0], true),
    entry("C", (1, 1), [0, 0, 1, 1, 0, 0, 0], true),
    entry("V", (1, 1), [2, 1, -3, -1, 0, 0, 0], true),
    entry("F", (1, 1), [-2, -1, 4, 2, 0, 0, 0], true),
    entry("Ω", (1, 1), [2, 1, -3, -2, 0, 0, 0], true),
    entry("S", (1, 1), [-2, -1, 3, 2, 0, 0, 0], true),
    entry("Wb", (1, 1), [2, 1, -2, -1, 0, 0, 0], true),
    entry("T", (1, 1), [0, 1, -2, -1, 0, 0, 0], true),
    entry("H", (1, 1), [2, 1, -2, -2, 0, 0, 0], true),
    entry("lm", (1, 1), [0, 0, 0, 0, 0, 0, 1], true),
    entry("lx", (1, 1), [-2, 0, 0, 0, 0, 0, 1], true),
    entry("Bq", (1, 1), [0, 0, -1, 0, 0, 0, 0], true),
    entry("Gy", (1, 1), [2, 0, -2, 0, 0, 0, 0], true),
    entry("Sv", (1, 1), [2, 0, -2, 0, 0, 0, 0], true),
    entry("kat", (1, 1), [0, 0, -1, 0, 0, 1, 0], true),
    entry("rad", (1, 1), [0; 7], true),
    entry("sr", (1, 1), [0; 7], false),
    entry("L", (1, 1000), [3, 0, 0, 0, 0, 0, 0], true),
    entry("min", (60, 1), [0, 0, 1, 0, 0, 0, 0], false),
    entry("h", (3600, 1), [0, 0, 1, 0, 0, 0, 0], false),
    entry("d", (86400, 1), [0, 0, 1, 0, 0, 0, 0], false),
];

const PREFIXES: [(&str, i32); 25] = [
    ("da", 1),
    ("h", 2),
    ("k", 3),
    ("M", 6),
    ("G", 9),
    ("T", 12),
    ("P", 15),
    ("E", 18),
    ("Z", 21),
    ("Y", 24),
    ("R", 27),
    ("Q", 30),
    ("d", -1),
    ("c", -2),
    ("m", -3),
    ("μ", -6),
    ("µ", -6),
    ("n", -9),
    ("p", -12),
    ("f", -15),
    ("a", -18),
    ("z", -21),
    ("y", -24),
    ("r", -27),
    ("q", -30),
];

/// What people write for a unit of the list.
const MEANT: [(&str, &str); 14] = [
    ("sec", "s"),
    ("secs", "s"),
    ("hr", "h"),
    ("hrs", "h"),
    ("hour", "h"),
    ("day", "d"),
    ("days", "d"),
    ("deg", "°"),
    ("degree", "°"),
    ("metre", "m"),
    ("meter", "m"),
    ("kelvin", "K"),
    ("ohm", "Ω"),
    ("Ohm", "Ω"),
];

/// The scale of a unit; unknown symbols are reported, all of them, and give nothing.
pub fn resolve(unit: &Unit, diagnostics: &mut Diagnostics) -> Option<Scale> {
    let mut factor = Expression::one();
    let mut dimension = Dimension::one();
    let mut known = true;
    for part in &unit.factors {
        let Some((scale, exponents, degrees)) = symbol(&part.symbol) else {
            let mut diagnostic = Diagnostic::error(
                codes_check::UNKNOWN_UNIT,
                part.span,
                format!("`{}` is no unit that is known here", part.symbol),
            )
            .with_text("expected an SI unit, with or without a prefix, or min, h, d, °");
            let meant = MEANT.iter().find(|(written, _)| *written == part.symbol).map(|(_, unit)| *unit);
            if let Some(near) =
                meant.or_else(|| nearest(&part.symbol, UNITS.iter().map(|entry| entry.symbol)))
            {
                diagnostic = diagnostic.with_remedy(format!("did you mean `{near}`?"));
            }
            diagnostics.push(diagnostic);
            known = false;
            continue;
        };
        let own = Dimension(exponents.map(Rational::from));
        dimension = dimension.times(&own.power(&part.exponent));
        let mut value = Expression::Number(scale);
        if degrees {
            value = value.times(Expression::Pi);
        }
        factor = factor.times(value.power(part.exponent.clone()));
    }
    known.then_some(Scale { factor, dimension })
}

/// SI factor, exponents and whether π belongs to the factor.
fn symbol(text: &str) -> Option<(Rational, [i64; 7], bool)> {
    if text == "°" {
        return Some((Rational::ratio(1, 180), [0; 7], true));
    }
    // The sign of ohm is in Unicode twice; both are folded to the letter.
    let text = if text == "\u{2126}" { "Ω" } else { text };
    let plain = UNITS.iter().find(|entry| entry.symbol == text);
    if let Some(entry) = plain {
        return Some((Rational::ratio(entry.factor.0, entry.factor.1), entry.exponents, false));
    }
    for (prefix, power) in PREFIXES {
        let Some(rest) = text.strip_prefix(prefix) else { continue };
        if let Some(entry) = UNITS.iter().find(|entry| entry.prefixed && entry.symbol == rest) {
            let ten = Rational::from(10).pow(power)?;
            let factor = Rational::ratio(entry.factor.0, entry.factor.1) * ten;
            return Some((factor, entry.exponents, false));
        }
    }
    None
}

#[cfg(test)]
mod tests {
    use super::*;

    /// BIPM 2019 with the prefixes of 2022 (from memory).
    #[test]
    fn symbols_have_their_values() {
        let value = |text: &str| symbol(text).expect("a unit");
        assert_eq!(value("kg").0, Rational::from(1));
        assert_eq!(value("ms").0, Rational::ratio(1, 1000));
        assert_eq!(value("min").0, Rational::from(60));
        assert_eq!(value("kW").1, [2, 1, -3, 0, 0, 0, 0]);
        assert_eq!(value("hPa").0, Rational::from(100));
        assert_eq!(value("Pa").1, [-1, 1, -2, 0, 0, 0, 0]);
        assert_eq!(value("cd").1, [0, 0, 0, 0, 0, 0, 1]);
        assert_eq!(value("mm").0, Rational::ratio(1, 1000));
        assert_eq!(value("qs").0, Rational::from(10).pow(-30).expect("not zero"));
        assert_eq!(value("mg").0, Rational::ratio(1, 1_000_000));
        assert_eq!(value("°"), (Rational::ratio(1, 180), [0; 7], true));
        assert!(symbol("kkg").is_none() && symbol("mh").is_none() && symbol("dd").is_none());
        assert!(symbol("kmin").is_none() && symbol("furlong").is_none() && symbol("").is_none());
    }
    /// Definitions of derived units by others (BIPM 2019, from memory).
    #[test]
    fn derived_units_agree_with_their_definitions() {
        let dimension = |text: &str| Dimension(symbol(text).expect("a unit").1.map(Rational::from));
        let product = |factors: &[(&str, i64)]| {
            factors.iter().fold(Dimension::one(), |total, (text, power)| {
                total.times(&dimension(text).power(&Rational::from(*power)))
            })
        };
        let definitions: [(&str, &[(&str, i64)]); 15] = [
            ("N", &[("kg", 1), ("m", 1), ("s", -2)]),
            ("Pa", &[("N", 1), ("m", -2)]),
            ("J", &[("N", 1), ("m", 1)]),
            ("W", &[("J", 1), ("s", -1)]),
            ("C", &[("A", 1), ("s", 1)]),
            ("V", &[("W", 1), ("A", -1)]),
            ("F", &[("C", 1), ("V", -1)]),
            ("Ω", &[("V", 1), ("A", -1)]),
            ("S", &[("Ω", -1)]),
            ("Wb", &[("V", 1), ("s", 1)]),
            ("T", &[("Wb", 1), ("m", -2)]),
            ("H", &[("Wb", 1), ("A", -1)]),
            ("lx", &[("lm", 1), ("m", -2)]),
            ("Gy", &[("J", 1), ("kg", -1)]),
            ("kat", &[("mol", 1), ("s", -1)]),
        ];
        for (unit, factors) in definitions {
            assert_eq!(dimension(unit), product(factors), "{unit}");
        }
    }
}
