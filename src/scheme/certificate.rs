//! [`Certificate`]: what a fact's constructor checked, line by line, each line checkable by hand.
//!
//! A certificate can only be made from a fact. Its lines spell out the numbers of the fact, so whoever reads
//! them need not trust this program: [`Line::holds`] only does the sums again. Which lines a fact has is in
//! the submodules. Not here: what a model's conditions add to the proof.

mod differences;
mod pairs;
mod squares;

use std::fmt;

use crate::exact::Rational;

use super::{BiasedPair, Dissipation, SecondDerivativeForm, StaggeredPair, SummationByParts};

/// The evidence of one fact. All lines are for unit spacing; the right end mirrors the left one and adds none.
#[derive(Clone, Copy, Debug)]
pub struct Certificate<'a> {
    fact: Fact<'a>,
}

#[derive(Clone, Copy, Debug)]
enum Fact<'a> {
    Summation(&'a SummationByParts),
    Form(&'a SecondDerivativeForm),
    Dissipation(&'a Dissipation),
    Staggered(&'a StaggeredPair),
    Biased(&'a BiasedPair),
}

/// One statement about exact numbers.
#[derive(Clone, PartialEq, Eq, Debug)]
pub struct Line {
    subject: Subject,
    claim: Claim,
}

/// What a line is about, for readers.
#[derive(Clone, PartialEq, Eq, Debug)]
struct Subject {
    text: String,
    latex: String,
}

#[derive(Clone, PartialEq, Eq, Debug)]
enum Claim {
    /// The products sum to the value.
    Sum { products: Vec<Product>, value: Rational },
    /// The number is positive.
    Positive(Rational),
    /// The number is not negative.
    NotNegative(Rational),
}

/// Powers to be multiplied.
#[derive(Clone, PartialEq, Eq, Debug)]
struct Product(Vec<(Rational, usize)>);

impl<'a> Certificate<'a> {
    /// What is certified, in words.
    pub fn title(&self) -> String {
        match self.fact {
            Fact::Summation(fact) => format!(
                "first derivative of interior order {} that integrates by parts: Q + Qᵀ = B, H > 0",
                fact.operator().interior_order()
            ),
            Fact::Form(fact) => format!(
                "second derivative of interior order {} whose M(b) is a sum of squares for every b ≥ 0",
                fact.interior_order()
            ),
            Fact::Dissipation(fact) => format!(
                "dissipation that vanishes on polynomials of degree below {} and gives no energy for any b ≥ 0",
                fact.annihilated()
            ),
            Fact::Staggered(fact) => format!(
                "staggered pair of interior order {} that integrates by parts: H_h D₋ = −Qᵀ, H > 0",
                fact.interior_order()
            ),
            Fact::Biased(fact) => format!(
                "biased pair of interior order {}: H D₊ + (H D₋)ᵀ = B, half the difference a sum of squares",
                fact.interior_order()
            ),
        }
    }

    /// The lines, one after the other. They are made when asked for: a second derivative of high order has
    /// tens of thousands of terms.
    pub fn lines(&self) -> Box<dyn Iterator<Item = Line> + 'a> {
        match self.fact {
            Fact::Summation(fact) => differences::summation(fact),
            Fact::Form(fact) => squares::form(fact),
            Fact::Dissipation(fact) => squares::dissipation(fact),
            Fact::Staggered(fact) => pairs::staggered(fact),
            Fact::Biased(fact) => pairs::biased(fact),
        }
    }
}

impl Line {
    /// Whether the statement is true, by doing its sums.
    pub fn holds(&self) -> bool {
        match &self.claim {
            Claim::Sum { products, value } => products.iter().map(Product::value).sum::<Rational>() == *value,
            Claim::Positive(number) => number.is_positive(),
            Claim::NotNegative(number) => !number.is_negative(),
        }
    }

    /// The line in LaTeX's mathematical mode.
    pub fn latex(&self) -> String {
        let subject = &self.subject.latex;
        match &self.claim {
            Claim::Sum { products, value } => {
                format!("{subject}:\\quad {} = {}", sum(products, Product::latex), latex_number(value))
            }
            Claim::Positive(number) => format!("{subject} = {} > 0", latex_number(number)),
            Claim::NotNegative(number) => format!("{subject} = {} \\ge 0", latex_number(number)),
        }
    }

    fn sum(subject: Subject, products: Vec<Product>, value: Rational) -> Line {
        Line { subject, claim: Claim::Sum { products, value } }
    }

    fn positive(subject: Subject, number: &Rational) -> Line {
        Line { subject, claim: Claim::Positive(number.clone()) }
    }

    fn not_negative(subject: Subject, number: &Rational) -> Line {
        Line { subject, claim: Claim::NotNegative(number.clone()) }
    }
}

impl fmt::Display for Line {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        let subject = &self.subject.text;
        match &self.claim {
            Claim::Sum { products, value } => {
                write!(formatter, "{subject}: {} = {value}", sum(products, Product::text))
            }
            Claim::Positive(number) => write!(formatter, "{subject} = {number} > 0"),
            Claim::NotNegative(number) => write!(formatter, "{subject} = {number} ≥ 0"),
        }
    }
}

impl Subject {
    fn new(text: impl Into<String>, latex: impl Into<String>) -> Subject {
        Subject { text: text.into(), latex: latex.into() }
    }
}

impl Product {
    /// The product of a weight and powers.
    fn new(weight: &Rational, powers: &[(i64, usize)]) -> Product {
        let powers = powers.iter().map(|(base, exponent)| (Rational::from(*base), *exponent));
        Product(std::iter::once((weight.clone(), 1)).chain(powers).collect())
    }

    /// The product of two numbers.
    fn pair(left: &Rational, right: &Rational) -> Product {
        Product(vec![(left.clone(), 1), (right.clone(), 1)])
    }

    fn value(&self) -> Rational {
        self.0
            .iter()
            .fold(Rational::one(), |product, (base, exponent)| product * base.power(*exponent as u32))
    }

    /// Factors to the power nought are one, 0⁰ included, and are not written.
    fn written(&self) -> impl Iterator<Item = &(Rational, usize)> {
        self.0.iter().filter(|(_, exponent)| *exponent > 0)
    }

    fn text(&self) -> String {
        let factor = |(base, exponent): &(Rational, usize)| {
            let base = if base.is_negative() || (*exponent > 1 && !base.is_integer()) {
                format!("({base})")
            } else {
                base.to_string()
            };
            if *exponent == 1 { base } else { format!("{base}^{exponent}") }
        };
        self.written().map(factor).collect::<Vec<_>>().join("·")
    }

    fn latex(&self) -> String {
        let factor = |(base, exponent): &(Rational, usize)| {
            let number = latex_number(base);
            let base = if base.is_negative() || (*exponent > 1 && !base.is_integer()) {
                format!("\\left({number}\\right)")
            } else {
                number
            };
            if *exponent == 1 { base } else { format!("{base}^{{{exponent}}}") }
        };
        self.written().map(factor).collect::<Vec<_>>().join("\\cdot ")
    }
}

fn sum(products: &[Product], written: impl Fn(&Product) -> String) -> String {
    if products.is_empty() {
        return "0".to_owned();
    }
    products.iter().map(written).collect::<Vec<_>>().join(" + ")
}

fn latex_number(number: &Rational) -> String {
    if number.is_integer() {
        return number.to_string();
    }
    let sign = if number.is_negative() { "-" } else { "" };
    format!("{sign}\\tfrac{{{}}}{{{}}}", number.numerator().magnitude(), number.denominator())
}

/// Lets a certificate be made from a fact, and from nothing else.
macro_rules! certified {
    ($($fact:ty => $variant:ident),* $(,)?) => {
        $(impl<'a> From<&'a $fact> for Certificate<'a> {
            fn from(fact: &'a $fact) -> Certificate<'a> {
                Certificate { fact: Fact::$variant(fact) }
            }
        })*
    };
}

certified! {
    SummationByParts => Summation,
    SecondDerivativeForm => Form,
    Dissipation => Dissipation,
    StaggeredPair => Staggered,
    BiasedPair => Biased,
}

#[cfg(test)]
mod tests {
    use super::*;

    fn subject() -> Subject {
        Subject::new("this", "x")
    }

    #[test]
    fn a_line_says_no_to_what_is_false() {
        let half = Rational::ratio(1, 2);
        let products = vec![Product::new(&half, &[(3, 2)]), Product::pair(&Rational::from(-1), &half)];
        let line = |value| Line::sum(subject(), products.clone(), Rational::from(value));
        assert!(line(4).holds());
        assert!(!line(5).holds());
        assert!(!Line::positive(subject(), &Rational::zero()).holds());
        assert!(Line::not_negative(subject(), &Rational::zero()).holds());
        assert!(!Line::not_negative(subject(), &Rational::from(-1)).holds());
    }

    #[test]
    fn lines_are_written_out() {
        let products = vec![
            Product::new(&Rational::ratio(-1, 2), &[(0, 0), (-3, 2)]),
            Product(vec![(Rational::one(), 1), (Rational::ratio(3, 2), 2)]),
        ];
        let line = Line::sum(subject(), products, Rational::ratio(-9, 4));
        assert_eq!(line.to_string(), "this: (-1/2)·(-3)^2 + 1·(3/2)^2 = -9/4");
        let expected = concat!(
            "x:\\quad \\left(-\\tfrac{1}{2}\\right)\\cdot \\left(-3\\right)^{2}",
            " + 1\\cdot \\left(\\tfrac{3}{2}\\right)^{2} = -\\tfrac{9}{4}"
        );
        assert_eq!(line.latex(), expected);
        assert!(line.holds());
    }
}
