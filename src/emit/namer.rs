//! Legal, unique identifiers from names that may hold any characters.

use std::collections::BTreeSet;

/// Words that no emitted identifier may be: keywords of C, C++ and Rust, names of the C library's mathematics and of
/// what its headers define, and names that emitted code uses itself.
const RESERVED: &str = "
auto break case char const continue default do double else enum extern float for goto if inline int long register
restrict return short signed sizeof static struct switch typedef union unsigned void volatile while alignas alignof
bool catch class constexpr delete explicit export false friend mutable namespace new noexcept nullptr operator private
protected public template this throw true try typeid typename using virtual and or not xor bitand bitor compl
asm typeof linux unix i386
as async await become box crate dyn final fn impl in let loop macro match mod move mut override priv pub ref self
super trait type union unsized use where yield gen abstract
f32 f64 i8 i16 i32 i64 isize u8 u16 u32 u64 usize str string vec option some none ok err result
acos asin atan atan2 cos sin tan acosh asinh atanh cosh sinh tanh exp exp2 expm1 frexp ilogb ldexp log log10 log1p
log2 logb modf scalbn cbrt fabs hypot pow sqrt erf erfc lgamma tgamma ceil floor nearbyint rint lrint round lround
trunc fmod remainder remquo copysign nan nextafter fdim fmax fmin fma j0 j1 jn y0 y1 yn gamma signgam powf abs
null eof errno nan infinity huge_val assert stdin stdout stderr main exit malloc calloc free memcpy memset
size_t ptrdiff_t int64_t uint64_t int32_t uint32_t uint8_t va_list file time clock signal rename remove index
minimum maximum sign select opaque noise coordinate wrap at share part parts crew row rows first last end count scratch
thread thread_number team step next dt t s edge_row here inline_function rows_in_parallel along_the_row driver solver
array parameter parameters low high spacing inverse_spacing nodes points given values memory
last_step parameter_low parameter_high parameter_scale start_time end_time step_duration every place scale field_scale
";

/// Gives out identifiers. Uniqueness ignores case, because Rust constants are written in capitals.
#[derive(Clone, Debug)]
pub struct Namer {
    taken: BTreeSet<String>,
}

impl Default for Namer {
    fn default() -> Namer {
        Namer { taken: RESERVED.split_whitespace().map(str::to_owned).collect() }
    }
}

impl Namer {
    /// A new identifier that resembles `wish`.
    pub fn name(&mut self, wish: &str) -> String {
        let base = legal(wish);
        let mut name = base.clone();
        let mut count = 1;
        while !self.taken.insert(name.to_lowercase()) {
            count += 1;
            name = format!("{base}_{count}");
        }
        name
    }

    /// Takes these words.
    pub fn reserve(&mut self, words: &str) {
        self.taken.extend(words.split_whitespace().map(str::to_lowercase));
    }

    /// Takes everything that another one has taken.
    pub fn absorb(&mut self, other: &Namer) {
        self.taken.extend(other.taken.iter().cloned());
    }

    /// A new identifier `base` such that `base` followed by each of `endings` is free as well; all are taken.
    pub fn family(&mut self, wish: &str, endings: &[&str]) -> String {
        let base = legal(wish);
        let mut name = base.clone();
        let mut count = 1;
        let free = |name: &str, taken: &BTreeSet<String>| {
            !taken.contains(&name.to_lowercase())
                && endings.iter().all(|ending| !taken.contains(&format!("{name}{ending}").to_lowercase()))
        };
        while !free(&name, &self.taken) {
            count += 1;
            name = format!("{base}_{count}");
        }
        self.taken.insert(name.to_lowercase());
        self.taken.extend(endings.iter().map(|ending| format!("{name}{ending}").to_lowercase()));
        name
    }
}

/// An identifier of C and Rust: ASCII letters, digits and single underscores, led by a letter, of at most 40 characters.
pub fn legal(wish: &str) -> String {
    let mut result = String::new();
    for character in wish.chars() {
        match character {
            'a'..='z' | 'A'..='Z' | '0'..='9' => result.push(character),
            other => match greek(other) {
                Some(letter) => {
                    separate(&mut result);
                    result.push_str(letter);
                }
                None => separate(&mut result),
            },
        }
        if result.len() >= 40 {
            break;
        }
    }
    let trimmed = result.trim_matches('_');
    match trimmed.chars().next() {
        None => "x".to_owned(),
        Some(first) if first.is_ascii_digit() => format!("n{trimmed}"),
        Some(_) => trimmed.to_owned(),
    }
}

fn separate(result: &mut String) {
    if !result.is_empty() && !result.ends_with('_') {
        result.push('_');
    }
}

fn greek(letter: char) -> Option<&'static str> {
    let names = [
        "alpha", "beta", "gamma", "delta", "epsilon", "zeta", "eta", "theta", "iota", "kappa", "lambda",
        "mu", "nu", "xi", "omicron", "pi", "rho", "sigma", "sigma", "tau", "upsilon", "phi", "chi", "psi",
        "omega",
    ];
    let capitals = [
        "Alpha", "Beta", "Gamma", "Delta", "Epsilon", "Zeta", "Eta", "Theta", "Iota", "Kappa", "Lambda",
        "Mu", "Nu", "Xi", "Omicron", "Pi", "Rho", "Sigma", "Sigma", "Tau", "Upsilon", "Phi", "Chi", "Psi",
        "Omega",
    ];
    let small = u32::from(letter).checked_sub(0x3b1).and_then(|place| names.get(place as usize));
    let capital = u32::from(letter).checked_sub(0x391).and_then(|place| capitals.get(place as usize));
    small.or(capital).copied()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn hostile_names_become_legal_and_distinct() {
        let mut namer = Namer::default();
        let wishes =
            ["double", "u", "U", "u ", "κ", "2nd", "", "*/", "fn", "a-b", "a_b", "ice\n\"x", "__x__"];
        let names: Vec<String> = wishes.iter().map(|wish| namer.name(wish)).collect();
        let distinct: BTreeSet<String> = names.iter().map(|name| name.to_lowercase()).collect();
        assert_eq!(distinct.len(), wishes.len(), "{names:?}");
        for name in &names {
            assert!(name.starts_with(|first: char| first.is_ascii_alphabetic()), "{name}");
            assert!(name.chars().all(|c| c.is_ascii_alphanumeric() || c == '_'), "{name}");
            assert!(!RESERVED.split_whitespace().any(|word| word == name), "{name}");
        }
        assert_eq!(names[4], "kappa");
    }

    #[test]
    fn a_family_reserves_its_endings() {
        let mut namer = Namer::default();
        namer.name("d2_row");
        assert_eq!(namer.family("d2", &["_row", "_at"]), "d2_2");
        assert_eq!(namer.name("d2_2_at"), "d2_2_at_2");
    }
}
