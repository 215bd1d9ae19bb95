//! Lines and columns, counted by hand.

use super::{problems, with};

/// Line, column, length and path of each problem.
fn found(text: &str) -> Vec<(usize, usize, usize, String)> {
    let problems = problems(text, &[]);
    let places = problems.problems().iter();
    places.map(|p| (p.line, p.column, p.length, p.path.clone())).collect()
}

fn at(line: usize, column: usize, length: usize, path: &str) -> (usize, usize, usize, String) {
    (line, column, length, path.to_owned())
}

#[test]
fn a_negative_spread_points_at_its_number() {
    let text = with("spread: 0.8", "spread:\n      sd: -0.39   # from the pilot\n      n: 6");
    assert_eq!(found(&text), [at(15, 11, 5, "experiments[0].spread.sd")]);
}

#[test]
fn columns_count_characters_not_bytes() {
    let text = with("unit: mm², scale: continuous", "unit: µg/m³, scale: contínuo");
    assert_eq!(found(&text), [at(10, 55, 8, "experiments[0].outcome.scale")]);
}

#[test]
fn values_in_a_list_of_lines_and_in_brackets() {
    let text =
        with("spread: 0.8", "spread:\n      values:\n        - 2.9\n        - x\n        - 3.1");
    assert_eq!(found(&text), [at(17, 11, 1, "experiments[0].spread.values[1]")]);
    let text = with("spread: 0.8", "spread: {values: [2.9, x , 3.1]}");
    assert_eq!(found(&text), [at(14, 28, 1, "experiments[0].spread.values[1]")]);
}

#[test]
fn a_value_on_the_line_below_its_key() {
    let text = with("spread: 0.8", "spread:\n\n      -0.8");
    assert_eq!(found(&text), [at(16, 7, 4, "experiments[0].spread")]);
}

#[test]
fn keys_in_quotes_and_values_in_quotes() {
    let text = with("difference: 0.9", "'difference': \"0.9 \\\" x\"");
    assert_eq!(found(&text), [at(13, 28, 10, "experiments[0].effect.difference")]);
    let text = with("difference: 0.9", "difference: 0.9, \"diference\": 1");
    assert_eq!(found(&text), [at(13, 31, 11, "experiments[0].effect.diference")]);
}

#[test]
fn what_is_missing_points_at_what_should_hold_it() {
    let text = with("    question: Does warmth speed regrowth?\n", "");
    assert_eq!(found(&text), [at(7, 5, 2, "experiments[0]")]);
    let text = with("title: Regrowth at two temperatures\n", "");
    assert_eq!(found(&text), [at(1, 1, 8, "")]);
    let text =
        with(", plural: axolotls, kind: animal}", "}").replace("    unit", "    # who\n    unit");
    assert_eq!(found(&text), [at(10, 5, 4, "experiments[0].unit")]);
}

#[test]
fn every_kind_of_line_end_counts_alike() {
    let text = with("spread: 0.8", "spread: -1");
    let expected = [at(14, 13, 2, "experiments[0].spread")];
    for end in ["\n", "\r\n", "\r"] {
        assert_eq!(found(&text.replace('\n', end)), expected, "{end:?}");
        assert_eq!(found(&format!("\u{FEFF}{}", text.replace('\n', end))), expected, "{end:?}");
    }
}

#[test]
fn a_repeated_key_points_at_both() {
    let text = with("basis: realistic", "basis: realistic, why: one, why: two");
    assert_eq!(found(&text), [at(13, 59, 3, "experiments[0].effect.why")]);
    let problems = problems(&text, &[]);
    let first = problems.problems().iter().filter_map(|p| p.also.as_ref()).next();
    assert_eq!(first.map(|mark| (mark.line, mark.column, mark.length)), Some((13, 49, 3)));
}

#[test]
fn an_alias_points_at_what_it_stands_for() {
    let text = with("groups: [cool, warm]", "groups: [&g cool, *g]");
    let found = found(&text);
    assert_eq!(found, [at(11, 51, 7, "experiments[0].design.groups[1]")]);
}

#[test]
fn problems_come_in_the_order_of_the_file_whatever_found_them() {
    let text = with("spread: 0.8", "spread: 0")
        .replace("2031-03-14", "2031-02-30")
        .replace("id: warmth", "id: two words")
        .replace("basis: realistic", "basis: realstic")
        .replace("authors: [A. Example]", "authors: []");
    let lines: Vec<_> = found(&text).into_iter().map(|(line, ..)| line).collect();
    assert_eq!(lines, [3, 4, 7, 13, 14]);
}

#[test]
fn faults_of_later_experiments_are_found_at_their_own_place() {
    let one = with("spread: 0.8", "spread: 0");
    let two = one.find("  - id").and_then(|at| one.get(at..)).unwrap_or("");
    let text =
        format!("{one}{}", two.replace("warmth", "light").replace("spread: 0", "spread: 0,5"));
    let expected = [at(14, 13, 1, "experiments[0].spread"), at(22, 13, 3, "experiments[1].spread")];
    assert_eq!(found(&text), expected);
}
