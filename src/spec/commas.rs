//! Decimal commas inside brackets and braces, where YAML reads them as separators: `[2,9, 3,8]` means four numbers,
//! not two, and `{difference: 8,5}` holds a key `5`.

use super::finding::Finding;
use super::locate::{self, Locator};
use super::node::Node;
use crate::designs::{Aspect, Fault, Path};

/// Most lists that are looked at; finding each takes a reading of the file.
const MOST_LISTS: usize = 10;

/// The key before an entry and the number that was probably meant, when the entry is nothing but the decimals that a
/// decimal comma cut off.
pub(super) fn cut_number(entries: &[(String, Node)], position: usize) -> Option<(&str, String)> {
    let (decimals, Node::Null) = entries.get(position)? else { return None };
    let (before, Node::Whole(whole)) = entries.get(position.checked_sub(1)?)? else { return None };
    let digits = !decimals.is_empty() && decimals.chars().all(|c| c.is_ascii_digit());
    digits.then(|| (before.as_str(), format!("{whole}.{decimals}")))
}

/// The lists of whole numbers in which commas with and without a space alternate as decimal commas would.
pub(super) fn decimal_commas(root: &Node, locator: &Locator<'_>) -> Vec<Finding> {
    if !locator.any_line(|line| line.contains('[') && has_decimal_commas(line)) {
        return Vec::new();
    }
    let mut lists = Vec::new();
    whole_lists(root, &Path::default(), &mut lists);
    let suspect = lists.into_iter().take(MOST_LISTS).filter_map(|at| {
        let place = locate::place(root, &at, Aspect::Value, 0);
        let written = locator.token(locator.stretch(&place));
        has_decimal_commas(&written).then(|| {
            let reason = "some commas of this list have a space after them and some have none";
            let help = "write decimals after a point, and a space after each comma: [2.9, 3.8]";
            Finding::from(Fault::value(at, reason).help(help))
        })
    });
    suspect.collect()
}

fn whole_lists(node: &Node, at: &Path, found: &mut Vec<Path>) {
    let items = node.items();
    if items.len() > 2 && items.iter().all(|item| matches!(item, Node::Whole(_))) {
        found.push(at.clone());
    }
    for (index, item) in items.iter().enumerate().filter(|(_, item)| !item.is_number()) {
        whole_lists(item, &at.item(index), found);
    }
    for (key, value) in node.entries() {
        whole_lists(value, &at.key(key), found);
    }
}

/// Whether the parts between commas with a space are pairs of digits around one comma, at least one of them.
fn has_decimal_commas(written: &str) -> bool {
    let inside = written.split_once('[').map_or(written, |(_, rest)| rest);
    let inside = inside.split_once(']').map_or(inside, |(inside, _)| inside);
    // A list that goes on in the next line ends with a comma here.
    let inside = inside.trim_end().trim_end_matches(',');
    let digits = |part: &str| !part.is_empty() && part.chars().all(|c| c.is_ascii_digit());
    let parts: Vec<Vec<&str>> = inside
        .split(", ")
        .map(|part| part.trim().trim_start_matches('-').split(',').collect())
        .collect();
    let pairs = parts.iter().filter(|part| part.len() == 2).count();
    let sound = parts.iter().all(|part| part.len() <= 2 && part.iter().all(|p| digits(p)));
    sound && pairs > 0 && parts.len() > 1
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_digits_without_a_value_after_a_whole_number_are_decimals() {
        let cut = |text: &str| {
            let node = Node::parse(text).unwrap_or(Node::Null);
            cut_number(node.entries(), 1).map(|(key, number)| (key.to_owned(), number))
        };
        let found = |key: &str, number: &str| Some((key.to_owned(), number.to_owned()));
        assert_eq!(cut("{difference: 8,5}"), found("difference", "8.5"));
        assert_eq!(cut("{sd: -12,05, n: 3}"), found("sd", "-12.05"));
        for other in ["{a: 8, 5: 6}", "{a: b, 5}", "{a: 8, x}", "{a: 8.5, 5}", "{a: 8}"] {
            assert_eq!(cut(other), None, "{other}");
        }
    }

    #[test]
    fn only_mixed_commas_are_suspect() {
        for suspect in ["[2,9, 3,8, 3,1]", "[2,9, 3, 4,5]", "[-2,9, 10,25]", "[2,9, 3,8,"] {
            assert!(has_decimal_commas(suspect), "{suspect}");
        }
        for sound in
            ["[2, 9, 3, 8]", "[2,9,3,8]", "[2]", "[2,9]", "[1,2,3, 4,5,6]", "[a,b, c,d]", "[]"]
        {
            assert!(!has_decimal_commas(sound), "{sound}");
        }
    }
}
