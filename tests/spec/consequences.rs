//! All faults come in one go, and none that is a mere consequence of another.

use super::{problems, with};

fn paths(text: &str) -> Vec<String> {
    problems(text, &[]).problems().iter().map(|problem| problem.path.clone()).collect()
}

#[test]
fn a_misspelt_key_is_not_missed_as_well() {
    let text = with("spread: 0.8", "spread: {std: 0.8}");
    assert_eq!(paths(&text), ["experiments[0].spread.std"]);
    let text = with("title:", "titel:");
    assert_eq!(paths(&text), ["titel"]);
}

#[test]
fn a_wrong_value_does_not_count_as_no_value() {
    let text = with("difference: 0.9", "difference: \"0,9\"");
    assert_eq!(paths(&text), ["experiments[0].effect.difference"]);
    let text = with("spread: 0.8", "spread: {sd: x, n: 6}");
    assert_eq!(paths(&text), ["experiments[0].spread.sd"]);
    let text = with("spread: 0.8", "spread: 0.8\n    ceiling: {per-group: x}");
    assert_eq!(paths(&text), ["experiments[0].ceiling.per-group"]);
}

#[test]
fn a_wrong_group_does_not_make_the_control_unknown() {
    let text = with("groups: [cool, warm]", "groups: [18, warm], control: '18'");
    assert_eq!(paths(&text), ["experiments[0].design.groups[0]"]);
    let text = with("groups: [cool, warm]", "groups: warm, control: cool");
    assert_eq!(paths(&text), ["experiments[0].design.groups"]);
}

#[test]
fn a_unit_that_is_wrong_is_not_blamed_for_holding_nobody() {
    let further = "further-units: [{purpose: spare, count: 1, count-of: individuals, why: x}]";
    let text = with("spread: 0.8", &format!("spread: 0.8\n    {further}"))
        .replace("kind: animal}", "kind: group, holds: newt}");
    assert_eq!(paths(&text), ["experiments[0].unit.holds"]);
}

#[test]
fn an_unreadable_list_of_sources_is_one_problem() {
    let text = with("experiments:", "references: none.yaml\nexperiments:")
        .replace("basis: realistic", "basis: realistic, cite: [pilot-2030]");
    assert_eq!(paths(&text), ["references"]);
}

#[test]
fn a_wrong_aim_does_not_hide_what_all_designs_share() {
    let text = with("aim: detect-difference", "aim: win")
        .replace("scale: continuous", "scale: smooth")
        .replace("spread: 0.8", "spread: 0.8\n    losses: 2\n    colour: red");
    let expected = [
        "experiments[0].outcome.scale",
        "experiments[0].aim",
        "experiments[0].losses",
        "experiments[0].colour",
    ];
    assert_eq!(paths(&text), expected);
}

#[test]
fn numbers_beside_a_fault_are_still_judged() {
    let text = with(
        "spread: 0.8",
        "spread: {sd: -0.39, n: 1, sorce: pilot}\n    risk: {alpha: 0.9, power: 80%}",
    )
    .replace("difference: 0.9, basis: realistic", "difference: 0, basis: perhaps");
    let expected = [
        "experiments[0].effect.difference",
        "experiments[0].effect.basis",
        "experiments[0].spread.sd",
        "experiments[0].spread.n",
        "experiments[0].spread.sorce",
        "experiments[0].risk.alpha",
        "experiments[0].risk.power",
    ];
    assert_eq!(paths(&text), expected);
}

#[test]
fn an_experiment_that_is_no_mapping_does_not_hide_the_next() {
    let text =
        with("  - id: warmth", "  - warmth\n  - id: warmth").replace("spread: 0.8", "spread: -1");
    assert_eq!(paths(&text), ["experiments[0]", "experiments[1].spread"]);
}

#[test]
fn no_problem_is_lost_between_structure_and_meaning() {
    let text = with("2031-03-14", "2031-02-30").replace("id: warmth", "id: two words");
    assert_eq!(paths(&text), ["date", "experiments[0].id"]);
    let text = text.replace("purpose: record", "purpose: none");
    assert_eq!(paths(&text), ["date", "purpose", "experiments[0].id"]);
}
