//! The nearest known name to a misspelt one, by a bounded edit distance.
//!
//! Holds the search only; which names are known is the caller's business.

/// Longest name for which a suggestion is sought, in characters; bounds the work.
const LONGEST: usize = 64;

/// The candidate nearest to `wanted`, if one is near enough to be meant: at most one edit for short names,
/// two from six characters on, three from ten on. Case alone counts as nothing. Ties go to the first.
pub fn nearest<'a>(wanted: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let wanted: Vec<char> = wanted.chars().flat_map(char::to_lowercase).collect();
    if wanted.is_empty() || wanted.len() > LONGEST {
        return None;
    }
    let allowed = match wanted.len() {
        0..=1 => 0,
        2..=5 => 1,
        6..=9 => 2,
        _ => 3,
    };
    let mut best: Option<(usize, &str)> = None;
    for candidate in candidates {
        let letters: Vec<char> = candidate.chars().take(LONGEST + 1).flat_map(char::to_lowercase).collect();
        if letters.len().abs_diff(wanted.len()) > allowed {
            continue;
        }
        let distance = edit_distance(&wanted, &letters);
        if distance <= allowed && best.is_none_or(|(least, _)| distance < least) {
            best = Some((distance, candidate));
        }
    }
    best.map(|(_, candidate)| candidate)
}

/// Number of insertions, deletions, replacements and exchanges of neighbours (optimal string alignment).
fn edit_distance(left: &[char], right: &[char]) -> usize {
    let width = right.len() + 1;
    let mut rows: Vec<Vec<usize>> = vec![(0..width).collect()];
    for (i, &a) in left.iter().enumerate() {
        let mut row = vec![i + 1];
        for (j, &b) in right.iter().enumerate() {
            let replaced = rows[i][j] + usize::from(a != b);
            let mut least = replaced.min(rows[i][j + 1] + 1).min(row[j] + 1);
            if i > 0 && j > 0 && a == right[j - 1] && left[i - 1] == b {
                least = least.min(rows[i - 1][j - 1] + 1);
            }
            row.push(least);
        }
        rows.push(row);
    }
    rows[left.len()][width - 1]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn near_names_are_found_and_far_ones_are_not() {
        let words = ["axes", "constants", "conditions", "T_room"];
        assert_eq!(nearest("constnats", words), Some("constants"));
        assert_eq!(nearest("Axes", words), Some("axes"));
        assert_eq!(nearest("axis", words), Some("axes"));
        assert_eq!(nearest("t_rom", words), Some("T_room"));
        assert_eq!(nearest("velocity", words), None);
        assert_eq!(nearest("k", ["h", "c"]), None);
        assert_eq!(nearest(&"x".repeat(100), words), None);
    }

    #[test]
    fn an_exchange_of_neighbours_is_one_edit() {
        let letters = |text: &str| text.chars().collect::<Vec<_>>();
        assert_eq!(edit_distance(&letters("ab"), &letters("ba")), 1);
        assert_eq!(edit_distance(&letters("kitten"), &letters("sitting")), 3);
    }
}
