//! The parser's own errors → diagnostics in words of the language.

use pest::error::{Error, ErrorVariant, InputLocation};

use super::Rule;
use crate::diagnostic::{Diagnostic, codes, safe::excerpt};
use crate::syntax::fold::Folded;

/// Most expectations that a message lists.
const MOST_LISTED: usize = 6;

/// The diagnostic for a statement (at `offset` of the folded text) that an entry rule does not match.
pub(super) fn diagnostic(
    error: &Error<Rule>,
    rule: Rule,
    text: &str,
    offset: usize,
    folded: &Folded,
) -> Diagnostic {
    let place = match error.location {
        InputLocation::Pos(place) => place,
        InputLocation::Span((place, _)) => place,
    };
    let place = skip_blanks(text, place);
    let ErrorVariant::ParsingError { positives, .. } = &error.variant else {
        let span = folded.original(offset, offset + text.len());
        return Diagnostic::error(codes::TOO_DEEP, span, "this statement is too intricate to be read")
            .with_remedy("name parts of it as coefficients");
    };
    if let Some(known) = known_slip(rule, text, place, offset, folded) {
        return known;
    }
    let found = next_word(&text[place..]);
    let (start, end) = (offset + place, offset + place + found.len());
    let message = if found.is_empty() {
        "the statement ends too early".to_string()
    } else {
        format!("`{}` cannot stand here", excerpt(found, 30))
    };
    let fault = Diagnostic::error(codes::UNEXPECTED, folded.original(start, end), message);
    let fault = fault.with_text(expectation(positives)).with_note(form(rule));
    match hint(rule, text, place) {
        Some(remedy) => fault.with_remedy(remedy),
        None => fault,
    }
}

fn skip_blanks(text: &str, place: usize) -> usize {
    let rest = text.get(place..).unwrap_or("");
    text.len() - rest.trim_start().len()
}

/// The word, number or sign with which a text begins.
fn next_word(text: &str) -> &str {
    let part = |letter: char| letter.is_alphanumeric() || letter == '_';
    let end = match text.chars().next() {
        None => 0,
        Some(first) if part(first) => text.find(|letter| !part(letter)).unwrap_or(text.len()),
        Some(first) => first.len_utf8(),
    };
    &text[..end]
}

/// Slips that are recognised by where the parser stopped.
fn known_slip(rule: Rule, text: &str, place: usize, offset: usize, folded: &Folded) -> Option<Diagnostic> {
    let rest = &text[place..];
    let declares =
        matches!(rule, Rule::constant | Rule::coefficient | Rule::field | Rule::axis | Rule::operator);
    if declares && text.starts_with('Δ') {
        let length = "Δ".len() + next_word(&text["Δ".len()..]).len();
        let name = &text["Δ".len()..length];
        let message =
            format!("`{}` cannot be a name: `Δ` is the Laplace operator", excerpt(&text[..length], 30));
        return Some(
            Diagnostic::error(codes::DELTA_IN_NAME, folded.original(offset, offset + length), message)
                .with_remedy(format!("choose another name, such as `d{name}`")),
        );
    }
    if rest.starts_with('=')
        && matches!(rule, Rule::constant | Rule::coefficient | Rule::operator | Rule::output)
    {
        let before = text[..place].contains('=');
        return before.then(|| {
            let remedy = if text[..place].contains('\n') || text.contains("  ") {
                "write one definition a line; a line that begins with an operator goes on from the line above"
            } else {
                "write one definition a line"
            };
            let span = folded.original(offset + place, offset + place + 1);
            Diagnostic::error(codes::SECOND_EQUALS, span, "a second `=` in one definition")
                .with_remedy(remedy)
        });
    }
    None
}

/// A remedy for what often goes wrong at such a place.
fn hint(rule: Rule, text: &str, place: usize) -> Option<String> {
    let before = text[..place].trim_end();
    let rest = &text[place..];
    if rule == Rule::equation && !text.contains('=') {
        return Some(
            "an equation is an equality; a single word that opens a section stands at the start of its line"
                .into(),
        );
    }
    if let Some(at) = before.rfind('∂') {
        let above = &before[at + '∂'.len_utf8()..];
        if !above.is_empty() && !above.contains(['/', ' ']) && !rest.starts_with('/') {
            return Some(format!("derive a formula as `∂({above} …)/∂x` or `∂/∂x({above} …)`"));
        }
    }
    if rule == Rule::conditions {
        if before.ends_with("start") && !before.ends_with("= start") {
            return Some("the time is named too: `at t = start: …`".into());
        }
        if ["low", "high"].iter().any(|end| before.ends_with(end) && !before.contains('=')) {
            return Some("the axis is named too: `at x = low: …`, `at x = high: …`".into());
        }
        if !text.starts_with("at") && rest.starts_with(':') {
            return Some("a place begins with `at`: `at x = low: …`".into());
        }
    }
    let counted = rest.starts_with("nodes") || rest.starts_with("cells");
    if rule == Rule::axis && (counted || rest.starts_with(|letter: char| letter.is_ascii_digit())) {
        return Some("write a comma before the number of nodes: `0 m to 1 m, 101 nodes`".into());
    }
    if rest.starts_with("°") {
        return Some("an angle is written with a space, `30 °`".into());
    }
    None
}

/// "expected a, b or c".
fn expectation(positives: &[Rule]) -> String {
    let mut words: Vec<String> = Vec::new();
    for rule in positives {
        let word = rule_words(*rule);
        if !word.is_empty() && !words.contains(&word) {
            words.push(word);
        }
    }
    // Where an operator can stand, a formula is only let in to say that the operator is missing.
    if words.iter().any(|word| word == "an operator") {
        words.retain(|word| word != "a formula" && word != "`(`");
    }
    if words.len() > MOST_LISTED {
        words.truncate(MOST_LISTED);
        words.push("another".into());
    }
    match words.split_last() {
        None => "expected something else".into(),
        Some((only, [])) => format!("expected {only}"),
        Some((last, others)) => format!("expected {} or {last}", others.join(", ")),
    }
}

/// What a rule is called in messages; nothing for rules that only help.
fn rule_words(rule: Rule) -> String {
    let words = match rule {
        Rule::name | Rule::names | Rule::word => "a name",
        Rule::number => "a number",
        Rule::whole => "a whole number",
        Rule::text => "a text in quotes",
        Rule::unit | Rule::unit_factor | Rule::unit_symbol | Rule::unit_one => "a unit",
        Rule::EOI => "the end of the statement",
        Rule::additive | Rule::multiplicative | Rule::exponent | Rule::superscript | Rule::unit_operation => {
            "an operator"
        }
        Rule::relation => "a comparison such as `<`",
        Rule::formula
        | Rule::product
        | Rule::prefixed
        | Rule::power
        | Rule::operand
        | Rule::quantity
        | Rule::bracket
        | Rule::call
        | Rule::cases
        | Rule::noise
        | Rule::derivative
        | Rule::vector_operation => "a formula",
        Rule::equality => "an equality",
        Rule::comparison => "a comparison",
        Rule::variables | Rule::variables_higher => "`∂x`",
        Rule::comma => "`,`",
        Rule::colon => "`:`",
        Rule::semicolon => "`;`",
        Rule::equals => "`=`",
        Rule::open | Rule::arguments => "`(`",
        Rule::close => "`)`",
        Rule::slash => "`/`",
        Rule::partial => "`∂`",
        Rule::interval => "an interval",
        Rule::counted => "`nodes` or `cells`",
        Rule::axis_property => "`periodic`, `graded by`, `radial` or `spherical`",
        Rule::bounds => "`between`",
        Rule::free => "`free`",
        Rule::data => "`from`",
        Rule::coverings => "`covering`",
        Rule::interpolated => "`interpolated`",
        Rule::staggered => "`staggered in`",
        Rule::place => "a place",
        Rule::clauses | Rule::clause | Rule::asked_order => "`order`",
        Rule::closures | Rule::family => "`closures`",
        Rule::dissipation => "`dissipation`",
        Rule::method => "`method`",
        Rule::step => "`step`",
        Rule::duration => "an interval",
        Rule::every => "`every`",
        Rule::gauge => "`gauge`",
        Rule::gauges => "`gauges`",
        Rule::integral => "`integral`",
        Rule::maximum => "`maximum`",
        Rule::grids => "`grids`",
        Rule::placed => "`at`",
        _ => return keyword(rule),
    };
    words.to_string()
}

/// `kw_one_sided` is the word `one-sided`.
fn keyword(rule: Rule) -> String {
    let name = format!("{rule:?}");
    name.strip_prefix("kw_").map_or_else(String::new, |word| format!("`{}`", word.replace('_', "-")))
}

/// The form that statements of a section have.
fn form(rule: Rule) -> &'static str {
    match rule {
        Rule::header => "the first line is `model NAME \"TITLE\"`",
        Rule::axis => "an axis is `x: A to B, N nodes`, then perhaps `periodic`",
        Rule::constant => {
            "a constant is `NAME = VALUE UNIT`, then perhaps `, free` and a description in quotes"
        }
        Rule::coefficient => {
            "a coefficient is `k(x, y) in UNIT = FORMULA`, or `k in UNIT on x from \"FILE\"`"
        }
        Rule::field => "a field is `NAME in UNIT on x, y`, then perhaps `between A and B`",
        Rule::operator => "an operator is `NAME(f) = FORMULA`, then perhaps `with order N`",
        Rule::equation => "an equation is `FORMULA = FORMULA`",
        Rule::conditions => {
            "a condition is `at x = low: FORMULA = FORMULA`; places are also `every edge` and `t = start`"
        }
        Rule::accuracy => "an accuracy is `order N`, `interior order N`, `order N in x` or `closures FAMILY`",
        Rule::time => "a line on time is `A to B`, `method NAME`, `step DURATION` or `step F of limit`",
        Rule::output => {
            "an output is `FIELD every DURATION`, `NAME = FORMULA every …`, `gauge NAME: FORMULA at x = A`, `integral NAME: FORMULA over x` or `maximum NAME: FORMULA over time`"
        }
        _ => "a verification is `exact FIELD = FORMULA`, `manufactured FIELD = FORMULA` or `grids N, N, N`",
    }
}
