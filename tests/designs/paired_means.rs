//! Two measurements on the same unit or on matched pairs.
//!
//! Table: `paired_one_sample_power.csv` (mpmath, 30 digits); printed values name their source beside them.

use sufficit::designs::{Point, Problem, RivalAnswer};
use sufficit::solver::smallest_sizes;

use crate::support::{number, read, sizes, table};

const DESIGN: &str = "design: {structure: paired, conditions: [quiet, noise]}";

fn pairs(difference: f64, spread: &str, risk: &str) -> Box<dyn Problem> {
    let yaml =
        format!("{DESIGN}\neffect: {{difference: {difference}}}\nspread: {spread}\nrisk: {risk}");
    read("paired-means", &yaml).unwrap_or_else(|faults| panic!("{yaml}\n{faults:?}"))
}

#[test]
fn power_and_the_standard_deviation_of_differences_agree_with_thirty_digits() {
    let mut compared = 0;
    for row in table("paired_one_sample_power.csv") {
        if row["design"] != "paired" {
            continue;
        }
        let [sd1, sd2, rho] = ["sd1", "sd2", "rho"].map(|key| &row[key]);
        let sides = if row["sides"] == "1" { "one" } else { "two" };
        let spread = format!("{{sd: [{sd1}, {sd2}], correlation: {rho}}}");
        let risk = format!("{{alpha: {}, sides: {sides}, power: 0.99999}}", row["alpha"]);
        let problem = pairs(1.0, &spread, &risk);
        let nuisance = problem.planned().nuisance;
        let expected = number(&row, "sd_used");
        assert!((nuisance / expected - 1.0).abs() < 1e-14, "{row:?}: {nuisance}");
        // Rows without a difference, or with one in the other direction, are legal questions to the power function.
        let at = Point { effect: number(&row, "delta"), nuisance };
        let n = number(&row, "n") as u64;
        let power = problem.power(&sizes(&[n]), at).expect("the power exists");
        assert!((power - number(&row, "power")).abs() < 1e-12, "{row:?}: {power}");
        compared += 1;
    }
    assert!(compared > 30, "only {compared} rows were compared");
}

/// Brysbaert (2019), Journal of Cognition 2:16: a within-subject effect of 0.4 standard deviations of the differences
/// takes over 50 participants at 80 % power; noncentral t gives 52.
#[test]
fn brysbaerts_example_holds() {
    let problem = pairs(0.4, "1", "{alpha: 0.05, sides: two, power: 0.8}");
    let found = smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach");
    assert_eq!(found.sizes.per_group, [52]);
}

/// Values worked out beside the program with scipy.stats (1.17): `nct.sf` and `nct.cdf` on n − 1 degrees of freedom,
/// raising n until the target is reached.
#[test]
fn the_number_for_each_correlation_agrees_with_scipy() {
    let problem = pairs(-8.0, "{sd: [14, 13], correlation: 0.5}", "{power: 0.8}");
    let found = smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach");
    let facts = problem.facts(&found.sizes).expect("they exist");
    let rows = facts["correlations"].as_array().expect("a list");
    let shown: Vec<(f64, u64)> = rows
        .iter()
        .map(|r| (r["correlation"].as_f64().unwrap_or(0.0), r["size"].as_u64().unwrap_or(0)))
        .collect();
    let expected = [(0.0, 47), (0.3, 34), (0.4, 29), (0.5, 25), (0.6, 20)];
    assert_eq!(shown.len(), expected.len(), "{shown:?}");
    for ((correlation, size), (r, n)) in shown.iter().zip(expected) {
        assert!((correlation - r).abs() < 1e-12 && *size == n, "{shown:?}");
    }
    assert_eq!(rows.iter().filter(|r| r["stated"] == true).count(), 1);
}

#[test]
fn one_number_stands_for_both_conditions() {
    let one = pairs(1.0, "{sd: 3, correlation: 0.64}", "{}");
    let two = pairs(1.0, "{sd: [3, 3], correlation: 0.64}", "{}");
    assert_eq!(one.planned(), two.planned());
    // 2 · 9 · 0.36 = 6.48
    assert!((one.planned().nuisance - 6.48_f64.sqrt()).abs() < 1e-14);
    let direct = pairs(1.0, "{sd: 3}", "{}");
    assert_eq!(direct.planned().nuisance, 3.0);
    let differences = pairs(1.0, "{values: [1, 2, 4, 5]}", "{}");
    assert!((differences.planned().nuisance - (10.0_f64 / 3.0).sqrt()).abs() < 1e-14);
}

/// Nearly equal standard deviations with a correlation close to 1: the textbook form of the variance would lose all
/// digits. Value from Python's decimal module at 50 digits.
#[test]
fn close_correlations_lose_no_digits() {
    let problem = pairs(1.0, "{sd: [1, 1.000000001], correlation: 0.999999999999}", "{}");
    let expected = 1.414_213_916_633_548e-6;
    // 1 − 0.999999999999 is itself known to 16 decimals only.
    assert!((problem.planned().nuisance / expected - 1.0).abs() < 1e-4);
}

/// Without pairing, each group has the standard deviation of a single measurement; with no correlation, pairing only
/// costs degrees of freedom.
#[test]
fn the_unpaired_neighbour_is_the_two_sample_test() {
    let problem = pairs(8.0, "{sd: 13, correlation: 0.5}", "{power: 0.9}");
    let rivals = problem.rivals().expect("they exist");
    let unpaired = rivals.into_iter().find(|rival| rival.id == "unpaired").map(|r| r.answer);
    let Some(RivalAnswer::Exact(unpaired)) = unpaired else { panic!("{unpaired:?}") };
    let yaml = "design: {groups: [a, b]}\neffect: {difference: 8}\nspread: 13\nrisk: {power: 0.9}";
    let groups = read("parallel-means", yaml).expect("sound");
    let of = |p: &dyn Problem| smallest_sizes(p, p.planned()).expect("within reach");
    assert_eq!(of(unpaired.as_ref()), of(groups.as_ref()));
    let uncorrelated = pairs(8.0, "{sd: 13, correlation: 0}", "{power: 0.9}");
    assert!(of(uncorrelated.as_ref()).sizes.step >= of(groups.as_ref()).sizes.step);
    assert!(of(problem.as_ref()).sizes.total < of(groups.as_ref()).sizes.total);
    let known = pairs(8.0, "13", "{power: 0.9}");
    assert!(known.rivals().expect("they exist").iter().all(|rival| rival.id != "unpaired"));
}

/// No lever repeats what the design does already.
#[test]
fn pairing_is_no_lever_of_a_paired_design() {
    let problem = pairs(8.0, "{sd: 13, correlation: 0.5}", "{}");
    let ids: Vec<_> = problem.levers().iter().map(|lever| lever.id).collect();
    assert_eq!(ids, ["sharper-measurement", "one-sided"]);
}

#[test]
fn contradictions_are_faults_with_a_place() {
    let place = |yaml: &str| {
        let faults = read("paired-means", yaml).expect_err("the spec is wrong");
        faults.iter().map(|f| f.at.to_string()).collect::<Vec<_>>()
    };
    let with =
        |spread: &str| place(&format!("{DESIGN}\neffect: {{difference: 1}}\nspread: {spread}"));
    assert_eq!(with("0"), ["spread"]);
    assert_eq!(with("{sd: [3, 4]}"), ["spread.sd"]);
    assert_eq!(with("{correlation: 0.5}"), ["spread.correlation"]);
    assert_eq!(with("{values: [1, 2], correlation: 0.5}"), ["spread.correlation"]);
    assert_eq!(with("{file: a.csv, column: b, correlation: 0.5}"), ["spread.correlation"]);
    assert_eq!(with("{sd: 3, correlation: 1}"), ["spread.correlation"]);
    assert_eq!(with("{sd: 3, correlation: {value: -1.2}}"), ["spread.correlation.value"]);
    assert_eq!(with("{sd: [3, -4], correlation: 60}"), ["spread.sd[1]", "spread.correlation"]);
    assert_eq!(with("{sd: 3, correlation: 0.5, n: 1}"), ["spread.n"]);
    assert_eq!(with("{sd: 3, correlation: 0.5, values: [1, 2]}"), ["spread.values"]);
    let rest = "effect: {difference: 1}\nspread: 1";
    assert_eq!(place(&format!("design: {{conditions: [a, a]}}\n{rest}")), ["design.conditions[1]"]);
    let matched = format!("design: {{conditions: [a, b], pairing: matched-pairs}}\n{rest}");
    assert_eq!(place(&matched), ["design.pairing"]);
    let three = format!("{matched}\nunit: {{holds: {{each: 3}}}}");
    assert_eq!(place(&three), ["design.pairing"]);
    assert!(read("paired-means", &format!("{matched}\nunit: {{holds: {{each: 2}}}}")).is_ok());
    assert_eq!(
        place(&format!("{DESIGN}\n{rest}\nrisk: {{multiplicity: sidak}}")),
        ["risk.multiplicity"]
    );
}
