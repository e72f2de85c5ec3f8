//! Control words (`\partial`, `\rho`, …) and what they stand for: a closed table.
//!
//! Holds the table and the remedies for words that are not in it. Reading them from a text is
//! [`super::fold`]'s business.

/// Control words and what they stand for.
pub const TABLE: &[(&str, &str)] = &[
    ("partial", "∂"),
    ("nabla", "∇"),
    ("Delta", "Δ"),
    ("pi", "π"),
    ("cdot", "·"),
    ("times", "*"),
    ("le", "≤"),
    ("leq", "≤"),
    ("ge", "≥"),
    ("geq", "≥"),
    ("degree", "°"),
    ("alpha", "α"),
    ("beta", "β"),
    ("gamma", "γ"),
    ("delta", "δ"),
    ("epsilon", "ε"),
    ("varepsilon", "ε"),
    ("zeta", "ζ"),
    ("eta", "η"),
    ("theta", "θ"),
    ("vartheta", "ϑ"),
    ("iota", "ι"),
    ("kappa", "κ"),
    ("lambda", "λ"),
    ("mu", "μ"),
    ("nu", "ν"),
    ("xi", "ξ"),
    ("omicron", "ο"),
    ("rho", "ρ"),
    ("varrho", "ϱ"),
    ("sigma", "σ"),
    ("tau", "τ"),
    ("upsilon", "υ"),
    ("phi", "φ"),
    ("varphi", "φ"),
    ("chi", "χ"),
    ("psi", "ψ"),
    ("omega", "ω"),
    ("Gamma", "Γ"),
    ("Theta", "Θ"),
    ("Lambda", "Λ"),
    ("Xi", "Ξ"),
    ("Pi", "Π"),
    ("Sigma", "Σ"),
    ("Upsilon", "Υ"),
    ("Phi", "Φ"),
    ("Psi", "Ψ"),
    ("Omega", "Ω"),
    ("sin", "sin"),
    ("cos", "cos"),
    ("tan", "tan"),
    ("exp", "exp"),
    ("log", "log"),
    ("sqrt", "sqrt"),
    ("min", "min"),
    ("max", "max"),
    ("tanh", "tanh"),
    ("sinh", "sinh"),
    ("cosh", "cosh"),
];

/// What a control word stands for.
pub fn symbol(word: &str) -> Option<&'static str> {
    TABLE.iter().find(|(known, _)| *known == word).map(|(_, symbol)| *symbol)
}

/// What to write instead of a control word that is not in the table.
pub fn remedy(word: &str) -> String {
    match word {
        "" => return "a control word is a backslash and letters, such as \\partial".into(),
        "frac" | "dfrac" | "tfrac" => {
            return "write a fraction as `(a) / (b)`, a derivative as `∂u/∂x`".into();
        }
        "left" | "right" | "big" | "Big" => {
            return "write the bracket alone, without \\left and \\right".into();
        }
        "dot" | "ddot" | "prime" => return "write a time derivative as `∂u/∂t` or `∂²u/∂t²`".into(),
        "ln" => return "the natural logarithm is `log(…)`".into(),
        "mathrm" | "text" | "mathbf" | "vec" | "hat" | "bar" | "tilde" => {
            return "there are no accents and no typefaces; write the name alone".into();
        }
        "quad" | "qquad" => return "leave a space instead".into(),
        "div" => return "write a divergence as `∇·(…)`, a division as `/`".into(),
        "grad" => return "write a gradient as `∇u`".into(),
        "infty" => return "no value is infinite; give a number".into(),
        _ => {}
    }
    let prefix = TABLE.iter().filter(|(known, _)| known.len() > 1 && word.starts_with(known));
    if let Some((known, _)) = prefix.max_by_key(|(known, _)| known.len()) {
        let rest = &word[known.len()..];
        return format!(
            "a control word is the longest run of letters: put a space after it, `\\{known} {rest}`"
        );
    }
    match crate::diagnostic::nearest::nearest(word, TABLE.iter().map(|(known, _)| *known)) {
        Some(near) => format!("did you mean `\\{near}`?"),
        None => "known are the Greek letters, \\partial, \\nabla, \\Delta, \\cdot, \\times, \\le, \\ge and function names".into(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_word_run_together_is_taken_apart() {
        assert!(remedy("partialu").contains("\\partial u"));
        assert!(remedy("varepsilonx").contains("\\varepsilon x"));
        assert!(remedy("nabla2").contains("\\nabla"));
        assert!(remedy("frac").contains("(a) / (b)"));
        assert!(remedy("gama").contains("\\gamma"));
    }

    #[test]
    fn no_word_stands_twice() {
        for (at, (word, _)) in TABLE.iter().enumerate() {
            assert!(TABLE[at + 1..].iter().all(|(other, _)| other != word), "{word}");
        }
    }
}
