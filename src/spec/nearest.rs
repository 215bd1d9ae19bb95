//! The word that was probably meant.

/// Words of the trade that people use for a key, and the key.
const SAME_MEANING: &[(&str, &str)] = &[
    ("significance-level", "alpha"),
    ("significance", "alpha"),
    ("type-1-error", "alpha"),
    ("attrition", "losses"),
    ("dropout", "losses"),
    ("drop-out", "losses"),
    ("dropouts", "losses"),
    ("endpoint", "outcome"),
    ("primary-outcome", "outcome"),
    ("experimental-unit", "unit"),
    ("standard-deviation", "sd"),
    ("std", "sd"),
    ("stdev", "sd"),
    ("std-dev", "sd"),
    ("degrees-of-freedom", "df"),
    ("tails", "sides"),
    ("sided", "sides"),
    ("delta", "difference"),
    ("mean-difference", "difference"),
    ("rationale", "why"),
    ("reason", "why"),
    ("justification", "why"),
    ("because", "why"),
    ("citation", "cite"),
    ("reference", "cite"),
    ("bibliography", "references"),
    ("filter", "where"),
    ("csv", "file"),
    ("maximum", "ceiling"),
    ("limit", "ceiling"),
    ("name", "id"),
    ("filename", "file"),
    ("randomization", "randomisation"),
    ("stopping-rule", "stopping"),
    ("multiple-testing", "multiplicity"),
    ("correction", "multiplicity"),
    ("test", "analysis"),
    ("objective", "aim"),
    ("hypothesis", "question"),
    ("version", "sufficit"),
];

/// The word in the spelling of the language: small letters, hyphens between.
fn spelt(word: &str) -> String {
    word.trim()
        .chars()
        .map(|c| if c == '_' || c.is_whitespace() { '-' } else { c })
        .flat_map(char::to_lowercase)
        .collect()
}

/// The one of `known` that `given` was probably meant to be.
pub(super) fn nearest<'k>(given: &str, known: &[&'k str]) -> Option<&'k str> {
    let given = spelt(given);
    if given.is_empty() {
        return None;
    }
    if let Some(same) = known.iter().find(|word| spelt(word) == given) {
        return Some(same);
    }
    let distance = |word: &&&'k str| strsim::osa_distance(&given, &spelt(word));
    let close = known.iter().min_by_key(distance).filter(|word| {
        let longer = given.chars().count().max(word.chars().count());
        distance(word) <= (longer / 3).max(1) && longer > 2
    });
    close.copied().or_else(|| extended(&given, known))
}

/// The only one of `known` that begins as `given` does, as `parallel` begins `parallel-groups`.
fn extended<'k>(given: &str, known: &[&'k str]) -> Option<&'k str> {
    let begins = |word: &&&'k str| {
        let word = spelt(word);
        let shorter = given.len().min(word.len());
        shorter >= 3 && (word.starts_with(given) || given.starts_with(word.as_str()))
    };
    let mut found = known.iter().filter(begins);
    match (found.next(), found.next()) {
        (Some(only), None) => Some(only),
        _ => None,
    }
}

/// The key that has the meaning of a word of the trade.
pub(super) fn same_meaning(given: &str) -> Option<&'static str> {
    let given = spelt(given);
    SAME_MEANING.iter().find(|(word, _)| *word == given).map(|(_, key)| *key)
}

/// Words as a sentence offers them: `a`, `b` or `c`.
pub(super) fn either(words: &[&str]) -> String {
    let all = listed(words, words.len());
    match all.rsplit_once(" and ") {
        Some((before, last)) => format!("{before} or {last}"),
        None => all,
    }
}

/// Words as a sentence lists them: `a`, `b` and `c`; cut after `most`.
pub(super) fn listed(words: &[&str], most: usize) -> String {
    let quoted: Vec<_> = words
        .iter()
        .take(most)
        .map(|word| format!("`{}`", super::text::printable(word, 60)))
        .collect();
    let more = words.len().saturating_sub(most);
    if more > 0 {
        return format!("{} and {more} more", quoted.join(", "));
    }
    match quoted.split_last() {
        Some((last, before)) if !before.is_empty() => format!("{} and {last}", before.join(", ")),
        Some((last, _)) => last.clone(),
        None => String::new(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_probable_word_is_found() {
        let known = ["alpha", "sides", "power", "multiplicity", "per-group", "parallel-groups"];
        let cases = [
            ("Alpha", Some("alpha")),
            ("per_group", Some("per-group")),
            ("powr", Some("power")),
            ("poewr", Some("power")),
            ("parallel", Some("parallel-groups")),
            ("parallel groups", Some("parallel-groups")),
            ("x", None),
            ("colour", None),
            ("", None),
        ];
        for (given, expected) in cases {
            assert_eq!(nearest(given, &known), expected, "{given}");
        }
        assert_eq!(same_meaning("Drop_out"), Some("losses"));
    }

    #[test]
    fn lists_read_as_sentences() {
        assert_eq!(listed(&["a"], 5), "`a`");
        assert_eq!(listed(&["a", "b", "c"], 5), "`a`, `b` and `c`");
        assert_eq!(either(&["a", "b", "c"]), "`a`, `b` or `c`");
        assert_eq!(listed(&["a", "b", "c"], 2), "`a`, `b` and 1 more");
    }
}
