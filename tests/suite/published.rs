//! Published weights and operators, and values of an independent derivation, against this program's.
//!
//! Each table names its source. "Reference derivation" is an independent exact prototype in another
//! language; its values are quoted as fractions. Not here: properties that hold for any grid, see `exactness`.

use rimstone::discretize::closure;
use rimstone::discretize::interior;
use rimstone::exact::Rational;
use rimstone::scheme::{SecondDerivativeForm, SquareTerm, SummationByParts};

/// (nodes, at, derivative, weights, order, coefficient of the leading error).
type PublishedStencil = (&'static str, &'static str, usize, &'static str, usize, &'static str);

/// B. Fornberg, Math. Comp. 51 (1988) 699-706, tables 1 to 3: centred, half-way and one-sided weights, and
/// one biased row (from memory; error terms from an independent symbolic computation).
const FORNBERG_1988: [PublishedStencil; 24] = [
    ("-1 0 1", "0", 1, "-1/2 0 1/2", 2, "1/6"),
    ("-2 -1 0 1 2", "0", 1, "1/12 -2/3 0 2/3 -1/12", 4, "-1/30"),
    ("-3 -2 -1 0 1 2 3", "0", 1, "-1/60 3/20 -3/4 0 3/4 -3/20 1/60", 6, "1/140"),
    ("-4 -3 -2 -1 0 1 2 3 4", "0", 1, "1/280 -4/105 1/5 -4/5 0 4/5 -1/5 4/105 -1/280", 8, "-1/630"),
    ("-1 0 1", "0", 2, "1 -2 1", 2, "1/12"),
    ("-2 -1 0 1 2", "0", 2, "-1/12 4/3 -5/2 4/3 -1/12", 4, "-1/90"),
    ("-3 -2 -1 0 1 2 3", "0", 2, "1/90 -3/20 3/2 -49/18 3/2 -3/20 1/90", 6, "1/560"),
    ("-4 -3 -2 -1 0 1 2 3 4", "0", 2, "-1/560 8/315 -1/5 8/5 -205/72 8/5 -1/5 8/315 -1/560", 8, "-1/3150"),
    ("-2 -1 0 1 2", "0", 3, "-1/2 1 0 -1 1/2", 2, "1/4"),
    ("-3 -2 -1 0 1 2 3", "0", 3, "1/8 -1 13/8 0 -13/8 1 -1/8", 4, "-7/120"),
    ("-2 -1 0 1 2", "0", 4, "1 -4 6 -4 1", 2, "1/6"),
    ("-3 -2 -1 0 1 2 3", "0", 4, "-1/6 2 -13/2 28/3 -13/2 2 -1/6", 4, "-7/240"),
    ("0 1", "0", 1, "-1 1", 1, "1/2"),
    ("0 1 2", "0", 1, "-3/2 2 -1/2", 2, "-1/3"),
    ("0 1 2 3", "0", 1, "-11/6 3 -3/2 1/3", 3, "1/4"),
    ("0 1 2 3 4", "0", 1, "-25/12 4 -3 4/3 -1/4", 4, "-1/5"),
    ("0 1 2", "0", 2, "1 -2 1", 1, "1"),
    ("0 1 2 3", "0", 2, "2 -5 4 -1", 2, "-11/12"),
    ("0 1 2 3 4", "0", 2, "35/12 -26/3 19/2 -14/3 11/12", 3, "5/6"),
    ("-1/2 1/2", "0", 0, "1/2 1/2", 2, "1/8"),
    ("-3/2 -1/2 1/2 3/2", "0", 0, "-1/16 9/16 9/16 -1/16", 4, "-3/128"),
    ("-1/2 1/2", "0", 1, "-1 1", 2, "1/24"),
    ("-3/2 -1/2 1/2 3/2", "0", 1, "1/24 -9/8 9/8 -1/24", 4, "-3/640"),
    ("-1 0 1 2 3", "0", 1, "-1/4 -5/6 3/2 -1/2 1/12", 4, "1/20"),
];

/// NIST Digital Library of Mathematical Functions, 3.4 (differentiated Lagrange coefficients at t = 0, 1/2,
/// -1).
const LAGRANGE_THREE_POINTS: [PublishedStencil; 3] = [
    ("-1 0 1", "0", 1, "-1/2 0 1/2", 2, "1/6"),
    ("-1 0 1", "1/2", 1, "0 -1 1", 2, "1/24"),
    ("-1 0 1", "-1", 1, "-3/2 2 -1/2", 2, "-1/3"),
];

fn read(text: &str) -> Rational {
    text.parse().expect("a published number")
}

fn list(text: &str) -> Vec<Rational> {
    text.split_whitespace().map(read).collect()
}

fn reproduces(published: &[PublishedStencil]) {
    for (nodes, at, derivative, weights, order, error) in published {
        let stencil = interior::weights(&list(nodes), &read(at), *derivative).expect("enough nodes");
        assert_eq!(stencil.weights(), list(weights), "derivative {derivative} on {nodes} at {at}");
        assert_eq!(stencil.order(), *order, "derivative {derivative} on {nodes} at {at}");
        let found = stencil.error().expect("not an exact value");
        assert_eq!(found.coefficient, read(error), "derivative {derivative} on {nodes} at {at}");
        assert_eq!((found.derivative, found.power), (derivative + order, *order));
    }
}

#[test]
fn tables_of_weights() {
    reproduces(&FORNBERG_1988);
    reproduces(&LAGRANGE_THREE_POINTS);
}

/// B. Fornberg, SIAM Review 40 (1998) 685-691 (from memory): nodes −h₁, 0, h₂; the second derivative loses an
/// order, with leading error (h₂ − h₁)/3 times the third derivative.
#[test]
fn three_points_of_unequal_spacing() {
    for (left, right) in [("1", "3/2"), ("2/7", "5"), ("0.01", "100")] {
        let (h1, h2) = (read(left), read(right));
        let nodes = [-&h1, Rational::zero(), h2.clone()];
        let both = &h1 + &h2;
        let first = interior::weights(&nodes, &Rational::zero(), 1).expect("enough nodes");
        let product = &h1 * &h2;
        let expected = [-(&h2 / (&h1 * &both)), (&h2 - &h1) / &product, &h1 / (&h2 * &both)];
        assert_eq!(first.weights(), expected);
        let second = interior::weights(&nodes, &Rational::zero(), 2).expect("enough nodes");
        let two = Rational::from(2);
        let expected = [&two / (&h1 * &both), -(&two / &product), &two / (&h2 * &both)];
        assert_eq!(second.weights(), expected);
        assert_eq!(second.order(), 1);
        let error = second.error().expect("not an exact value");
        assert_eq!(error.coefficient, (h2 - h1) * Rational::ratio(1, 3));
    }
}

fn closed(order: usize) -> &'static SummationByParts {
    closure::first_derivative(order).expect("offered")
}

fn second(order: usize) -> &'static SecondDerivativeForm {
    closure::second_derivative(order).expect("offered")
}

/// K. Mattsson, J. Nordström, J. Comput. Phys. 199 (2004) 503-540, and B. Strand, J. Comput. Phys. 110 (1994)
/// 47-67 (from memory): the diagonal-norm first derivatives of orders 2 and 4.
#[test]
fn first_derivatives_of_orders_two_and_four() {
    let expected = [
        "-24/17 59/34 -4/17 -3/34 0 0",
        "-1/2 0 1/2 0 0 0",
        "4/43 -59/86 0 59/86 -4/43 0",
        "3/98 0 -59/98 0 32/49 -4/49",
    ];
    for (row, weights) in expected.iter().enumerate() {
        assert_eq!(full_row(closed(4), row, 6), list(weights), "row {row}");
    }
    assert_eq!(full_row(closed(2), 0, 2), list("-1 1"));
}

/// The same authors (from memory): the norms of orders 2 to 8.
#[test]
fn norms() {
    for (order, weights) in [
        (2, "1/2"),
        (4, "17/48 59/48 43/48 49/48"),
        (6, "13649/43200 12013/8640 2711/4320 5359/4320 7877/8640 43801/43200"),
        (
            8,
            "1498139/5080320 1107307/725760 20761/80640 1304999/725760 299527/725760 103097/80640 \
             670091/725760 5127739/5080320",
        ),
    ] {
        assert_eq!(closed(order).norm().left(), list(weights), "order {order}");
    }
}

/// Row `row` on the first `columns` nodes.
fn full_row(operator: &SummationByParts, row: usize, columns: usize) -> Vec<Rational> {
    let closed_row = &operator.operator().closure()[row];
    let mut full = vec![Rational::zero(); columns];
    full[closed_row.first..closed_row.end()].clone_from_slice(&closed_row.weights);
    full
}

/// Q = H D on the closed rows against quoted rows.
fn assert_quadratic(operator: &SummationByParts, expected: &[&str]) {
    assert_eq!(operator.norm().left().len(), expected.len());
    for (row, (weights, height)) in expected.iter().zip(operator.norm().left()).enumerate() {
        let expected = list(weights);
        let found: Vec<Rational> =
            full_row(operator, row, expected.len()).iter().map(|weight| weight * height).collect();
        assert_eq!(found, expected, "row {row}");
    }
}

/// Reference derivation, order 6, least truncation error. The entry of row 4, column 5 is the constant of the
/// optimised operator of D. C. Del Rey Fernández et al., Computers & Fluids (2014).
const QUADRATIC_SIX: [&str; 6] = [
    "-1/2 5124475092222703052468879/7931626489314500743872000 -14688227387107654735453/247863327791078148246000 -159267246833799759813661/1321937748219083457312000 18306575045382041159483/991453311164312592984000 120512309461734500607719/7931626489314500743872000 0 0 0",
    "-5124475092222703052468879/7931626489314500743872000 0 345639531999877949576339/793162648931450074387200 28465971813079192963909/99145331116431259298400 -21963203401877827569241/528775099287633382924800 -34968740224280558358577/991453311164312592984000 0 0 0",
    "14688227387107654735453/247863327791078148246000 -345639531999877949576339/793162648931450074387200 0 179724104434047613799819/396581324465725037193600 -8637026328486517498841/99145331116431259298400 13808676868217278023299/1321937748219083457312000 0 0 0",
    "159267246833799759813661/1321937748219083457312000 -28465971813079192963909/99145331116431259298400 -179724104434047613799819/396581324465725037193600 0 540747751505546378368499/793162648931450074387200 -9742420893013796487329/123931663895539074123000 1/60 0 0",
    "-18306575045382041159483/991453311164312592984000 21963203401877827569241/528775099287633382924800 8637026328486517498841/99145331116431259298400 -540747751505546378368499/793162648931450074387200 0 5591070156686698065364559/7931626489314500743872000 -3/20 1/60 0",
    "-120512309461734500607719/7931626489314500743872000 34968740224280558358577/991453311164312592984000 -13808676868217278023299/1321937748219083457312000 9742420893013796487329/123931663895539074123000 -5591070156686698065364559/7931626489314500743872000 0 3/4 -3/20 1/60",
];

/// Reference derivation, order 8, least truncation error with its free coordinates rounded to 1/1024:
/// 765/1024 (row 5, column 6), −141/1024 (row 5, column 7), 781/1024 (row 6, column 7).
const QUADRATIC_EIGHT: [&str; 8] = [
    "-1/2 1504187/2257920 -164713/6773760 -12822791/60963840 13/6615 17369/193536 -17983/1244160 -59533/6773760 0 0 0 0",
    "-1504187/2257920 0 175481/967680 646567/967680 16301/1244160 -7963/30240 8815/193536 1301959/60963840 0 0 0 0",
    "164713/6773760 -175481/967680 0 210053/967680 -105691/967680 2731/35840 -877/26880 2531/451584 0 0 0 0",
    "12822791/60963840 -646567/967680 -210053/967680 0 122701/322560 330467/967680 -2963/8709120 -15805/338688 0 0 0 0",
    "-13/6615 -16301/1244160 105691/967680 -122701/322560 0 11053/27648 -28639/193536 2317661/60963840 -1/280 0 0 0",
    "-17369/193536 7963/30240 -2731/35840 -330467/967680 -11053/27648 0 765/1024 -141/1024 4/105 -1/280 0 0",
    "17983/1244160 -8815/193536 877/26880 2963/8709120 28639/193536 -765/1024 0 781/1024 -1/5 4/105 -1/280 0",
    "59533/6773760 -1301959/60963840 -2531/451584 15805/338688 -2317661/60963840 141/1024 -781/1024 0 4/5 -1/5 4/105 -1/280",
];

/// Reference derivation, order 8 before rounding: the first row of Q.
const UNTIDIED_EIGHT_FIRST_ROW: &str = "-1/2 1171927835779641979838721962797001392880165397013204445691953665284836039229327023/1756297307607946269696123981288194693631842691772674579997543996217110277161512960 -2089882016354395471868286621643268352318805162404781314188905689165674326623017/73179054483664427904005165887008112234660112157194774166564333175712928215063040 -40094946608083038614450972495462552045901240668044022236409679756477415529418901/195144145289771807744013775698688299292426965752519397777504888468567808573501440 342037613696222406634014884679447558599432321463849079845065570762252605031027/109768581725496641856007748830512168351990168235792161249846499763569392322594560 9735542301907327769975933109822670118205895846655152239509702628344321898005195/117086487173863084646408265419212979575456179451511638666502933081140685144100864 -5161201642301373261576752174761582638500941662845239297818915890041678251311/542067070249366132622260488051911942478963793756998327159735801301577246037504 -17550937137109031824036898530286322157417865072386497570194113901633809661174743/1756297307607946269696123981288194693631842691772674579997543996217110277161512960 0 0 0 0";

#[test]
fn quadratic_forms_of_the_optimised_operators() {
    assert_quadratic(closed(6), &QUADRATIC_SIX);
    assert_quadratic(closed(8), &QUADRATIC_EIGHT);
    let untidied = closure::derive_untidied_first_derivative(8).expect("offered");
    let expected = list(UNTIDIED_EIGHT_FIRST_ROW);
    let height = &untidied.norm().left()[0];
    let found: Vec<Rational> =
        full_row(&untidied, 0, expected.len()).iter().map(|weight| weight * height).collect();
    assert_eq!(found, expected);
}

/// Reference derivation, order 4: the closed rows of M(1).
const CONSTANT_FOUR: [&str; 6] = [
    "84560633/76158864 -89845091/76158864 136671/4231048 1825939/76158864 1703951/76158864 -39195/4231048 0 0",
    "-89845091/76158864 173996143/76158864 -78369473/76158864 -2014733/38079432 -1795883/38079432 1839653/76158864 0 0",
    "136671/4231048 -78369473/76158864 76212907/38079432 -8876337/8462096 1837063/38079432 -37939/9519858 0 0",
    "1825939/76158864 -2014733/38079432 -8876337/8462096 83916499/38079432 -11127091/9519858 181905/4231048 0 0",
    "1703951/76158864 -1795883/38079432 1837063/38079432 -11127091/9519858 179204959/76158864 -49160557/38079432 1/12 0",
    "-39195/4231048 1839653/76158864 -37939/9519858 181905/4231048 -49160557/38079432 189414773/76158864 -4/3 1/12",
];

#[test]
fn the_constant_coefficient_form_of_order_four() {
    let operator = second(4).constant();
    for (row, expected) in CONSTANT_FOUR.iter().enumerate() {
        let height = second(4).norm().weight(row, 100);
        let expected = list(expected);
        let mut found = vec![Rational::zero(); expected.len()];
        let closed_row = &operator.closure()[row];
        for (column, weight) in (closed_row.first..).zip(&closed_row.weights) {
            found[column] = -(weight * &height);
        }
        assert_eq!(found, expected, "row {row}");
    }
}

/// (order k of the difference, weight w_k, average A_k).
type PublishedDifference = (usize, &'static str, &'static str);

/// Reference derivation: the differences of the interior, for orders 2, 4, 6 and 8.
const DIFFERENCES: [(usize, &[PublishedDifference]); 4] = [
    (2, &[(2, "1/4", "0 1 0")]),
    (4, &[(3, "1/18", "0 1/2 1/2 0"), (4, "1/144", "0 0 1 0 0")]),
    (6, &[(4, "1/80", "0 1/3 1/3 1/3 0"), (5, "1/600", "0 0 1/2 1/2 0 0"), (6, "1/3600", "0 0 0 1 0 0 0")]),
    (
        8,
        &[
            (5, "1/350", "0 1/4 1/4 1/4 1/4 0"),
            (6, "1/2520", "0 0 3/10 2/5 3/10 0 0"),
            (7, "1/14700", "0 0 0 1/2 1/2 0 0 0"),
            (8, "1/78400", "0 0 0 0 1 0 0 0 0"),
        ],
    ),
];

#[test]
fn weights_and_averages_of_the_differences() {
    for (order, differences) in DIFFERENCES {
        // The first repeated square is the first derivative's.
        let repeated = &second(order).squares().repeated()[1..];
        assert_eq!(repeated.len(), differences.len());
        for (square, (k, weight, average)) in repeated.iter().zip(differences) {
            assert_eq!(square.functional.len(), k + 1, "order {order}");
            let mut found = vec![Rational::zero(); k + 1];
            for (offset, factor) in &square.weight {
                found[usize::try_from(*offset).expect("offsets run from the first node")] = factor.clone();
            }
            let weight = read(weight);
            let expected: Vec<Rational> = list(average).iter().map(|share| share * &weight).collect();
            assert_eq!(found, expected, "order {order}, difference {k}");
        }
    }
}

/// Reference derivation, order 4: the one square that holds the excess at the left end.
#[test]
fn the_excess_square_of_order_four() {
    let square = second(4).squares().left().last().expect("there is one");
    let functional: Vec<Rational> = square.functional.iter().map(|(_, factor)| factor.clone()).collect();
    assert_eq!(
        functional,
        list("-329607/528881 845103/528881 -613223/528881 65121/528881 -22950/528881 55556/528881")
    );
    let weight = [(1, "36623/1146208"), (2, "157775/3438624"), (3, "5861/303408"), (4, "19/3528")];
    let expected: Vec<(usize, Rational)> =
        weight.iter().map(|(node, factor)| (*node, read(factor))).collect();
    assert_eq!(square.weight, expected);
}

/// Reference derivation: the boundary weights v of the lowest difference, orders 4 and (tidied) 8.
#[test]
fn boundary_weights_of_the_lowest_difference() {
    assert_eq!(boundary_weights(4), list("181507/1719312 293/4214 185/3528"));
    assert_eq!(boundary_weights(8), list(BOUNDARY_WEIGHTS_EIGHT));
}

const BOUNDARY_WEIGHTS_EIGHT: &str = "7989831534730892658862753571198957383939156372141561/96910618155144557803431237740632441885797186963624960 846798728976346594744095548603001791386814255665849/5383923230841364322412846541146246771433177053534720 1861868382137200090311423411706708064118714831639349/19382123631028911560686247548126488377159437392724992 115119126550425633490621/19099157338338651390713580 2884941957581292079/1487835836372798442600 1260812936527/343605175424900 38345159/14357669200";

/// v from the squares: what single differences keep, and the share of each difference in the excess square.
fn boundary_weights(order: usize) -> Vec<Rational> {
    let form = second(order);
    let family = &form.squares().repeated()[1];
    let factors: Vec<&Rational> = family.functional.iter().map(|(_, factor)| factor).collect();
    let corrected = usize::try_from(family.first).expect("differences start on the grid");
    let total = |square: &SquareTerm| square.weight.iter().map(|(_, factor)| factor).sum::<Rational>();
    let (excess, singles) = form.squares().left().split_last().expect("there is an excess square");
    let mut weights = vec![Rational::zero(); corrected];
    for square in &singles[form.norm().left().len()..] {
        weights[square.functional[0].0] += total(square);
    }
    let mut functional = vec![Rational::zero(); corrected + factors.len() - 1];
    for (node, factor) in &excess.functional {
        functional[*node] = factor.clone();
    }
    let scale = total(excess);
    for first in 0..corrected {
        let share = &functional[first] / factors[0];
        for (offset, factor) in factors.iter().enumerate() {
            functional[first + offset] -= &share * *factor;
        }
        weights[first] += share * &scale;
    }
    assert!(functional.iter().all(Rational::is_zero), "the excess is a mean of differences");
    weights
}

/// Reference derivation, orders 4, 6 and 8: M_{i,i+s} for s = 1, 2, … on b_{i+s−p} … b_{i+p}; order 4 agrees with
/// K. Mattsson, J. Sci. Comput. 51 (2012) 650-682 (from memory).
const INTERIOR_FORMS: [(usize, &[&str]); 4] = [
    (2, &["-1/2 -1/2"]),
    (4, &["-1/6 -1/2 -1/2 -1/6", "1/8 -1/6 1/8"]),
    (6, &["-1/40 -3/10 -17/40 -17/40 -3/10 -1/40", "1/20 7/40 -3/10 7/40 1/20", "-11/360 1/40 1/40 -11/360"]),
    (
        8,
        &[
            "-1/210 -1/15 -13/35 -5/14 -5/14 -13/35 -1/15 -1/210",
            "3/280 11/105 31/168 -2/5 31/168 11/105 3/280",
            "-1/70 -1/18 2/35 2/35 -1/18 -1/70",
            "5/672 -1/210 -1/280 -1/210 5/672",
        ],
    ),
];

#[test]
fn interior_forms_are_narrow() {
    for (order, forms) in INTERIOR_FORMS {
        for form in [second(order), closure::periodic_second_derivative(order).expect("offered")] {
            assert_eq!(form.half_width(), forms.len());
            for ((distance, expected), found) in (1_i64..).zip(forms).zip(form.interior_forms()) {
                let first = distance - order as i64 / 2;
                let expected: Vec<(i64, Rational)> =
                    (first..).zip(list(expected)).map(|(offset, factor)| (offset, -factor)).collect();
                assert_eq!(*found, expected, "order {order}, distance {distance}");
            }
        }
    }
}
