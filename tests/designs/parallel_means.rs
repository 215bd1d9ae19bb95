//! Independent groups, difference between means.
//!
//! Tables: `two_sample_t_power.csv`, `two_sample_t_smallest_n.csv` (mpmath, 30 digits) and `all_pairs_any_each.csv`
//! (mpmath noncentral t for the power of a pair); printed values name their source beside them.

use sufficit::designs::{Point, Problem};
use sufficit::solver::smallest_sizes;

use crate::support::{number, read, sizes, table};

fn two_groups(difference: f64, sd: f64, alpha: f64, sides: &str, power: f64) -> Box<dyn Problem> {
    let yaml = format!(
        "design: {{structure: parallel-groups, groups: [a, b]}}\n\
         effect: {{difference: {difference}}}\nspread: {sd}\n\
         risk: {{alpha: {alpha}, sides: {sides}, power: {power}}}"
    );
    read("parallel-means", &yaml).unwrap_or_else(|faults| panic!("{yaml}\n{faults:?}"))
}

fn words(sides: &str) -> &'static str {
    if sides == "1" { "one" } else { "two" }
}

#[test]
fn power_agrees_with_thirty_digits() {
    for row in table("two_sample_t_power.csv") {
        let [delta, sd, alpha] = ["delta", "sd", "alpha"].map(|key| number(&row, key));
        let per_group = [number(&row, "n1") as u64, number(&row, "n2") as u64];
        // Rows without a difference, or with one in the other direction, are legal questions to the power function.
        let problem = two_groups(1.0, sd, alpha, words(&row["sides"]), 0.999_99);
        let power = problem
            .power(&sizes(&per_group), Point { effect: delta, nuisance: sd })
            .expect("the power exists");
        let expected = number(&row, "power");
        assert!((power - expected).abs() < 1e-12, "{row:?}: {power}");
    }
}

#[test]
fn smallest_size_agrees_with_the_table_and_one_fewer_misses() {
    for row in table("two_sample_t_smallest_n.csv") {
        let [effect, alpha, target] = ["effect", "alpha", "power_target"].map(|k| number(&row, k));
        let problem = two_groups(effect, 1.0, alpha, words(&row["sides"]), target);
        let found = smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach");
        assert_eq!(found.sizes.step, number(&row, "n_per_group") as u64, "{row:?}");
        assert!(
            (found.power - number(&row, "power_at_n")).abs() < 1e-11,
            "{row:?} {}",
            found.power
        );
        match found.power_one_fewer {
            None => assert!(row["power_at_n_minus_1"].is_empty(), "{row:?}"),
            Some(fewer) => {
                assert!(fewer < target);
                assert!((fewer - number(&row, "power_at_n_minus_1")).abs() < 1e-11, "{row:?}");
            }
        }
    }
}

#[test]
fn each_pair_of_several_groups_agrees() {
    let mut compared = 0;
    for row in table("all_pairs_any_each.csv") {
        let method = row["method"].as_str();
        let method = if method == "tukey_kramer" { "tukey" } else { method };
        let list = |key: &str| -> Vec<f64> {
            row[key].split(';').map(|x| x.parse().expect("a number")).collect()
        };
        let means = list("means");
        let (i, j) = (number(&row, "group_i") as usize - 1, number(&row, "group_j") as usize - 1);
        let difference = means[j] - means[i];
        // One-sided rows against the planned direction, and pairs without a difference, are no plans of ours.
        if difference == 0.0 || (row["sides"] == "1" && difference < 0.0) {
            continue;
        }
        let names: Vec<_> = (0..means.len()).map(|g| format!("g{g}")).collect();
        let compare = match row["family"].as_str() {
            "all_pairs" => "compare: all-pairs",
            _ => "compare: against-control, control: g0",
        };
        let multiplicity =
            if means.len() > 2 { format!(", multiplicity: {method}") } else { String::new() };
        let yaml = format!(
            "design: {{structure: parallel-groups, groups: [{}], {compare}}}\n\
             effect: {{difference: {difference}}}\nspread: {}\n\
             risk: {{alpha: {}, sides: {}, power: 0.9999{multiplicity}}}",
            names.join(", "),
            row["sd"],
            row["alpha"],
            words(&row["sides"]),
        );
        let problem = read("parallel-means", &yaml).expect("the spec is sound");
        let per_group: Vec<u64> = list("n_per_group").iter().map(|n| *n as u64).collect();
        let facts = problem.facts(&sizes(&per_group)).expect("the facts exist");
        let critical = facts["critical"].as_f64().expect("a number");
        assert!((critical - number(&row, "critical_t")).abs() < 1e-10, "{row:?}: {critical}");
        let pair = facts["comparisons"]
            .as_array()
            .and_then(|all| all.iter().find(|c| c["first"] == i && c["second"] == j))
            .unwrap_or_else(|| panic!("the pair is compared: {row:?}"));
        let power = pair["power"].as_f64().expect("a number");
        assert!((power - number(&row, "power_pair")).abs() < 1e-10, "{row:?}: {power}");
        compared += 1;
    }
    assert!(compared > 80, "only {compared} rows were compared");
}

/// Cohen (1988), tables 2.3.5 and 2.4.1, and Cohen (1992), table 2, from memory: n per group to the nearest integer.
/// The smallest n that reaches the target may be one more than the printed, nearest, integer.
#[test]
fn cohens_tables_hold() {
    let printed = [
        (0.2, 0.05, 0.8, 393),
        (0.5, 0.05, 0.8, 64),
        (0.8, 0.05, 0.8, 26),
        (0.2, 0.05, 0.9, 526),
        (0.5, 0.05, 0.9, 85),
        (0.8, 0.05, 0.9, 34),
        (0.2, 0.01, 0.8, 586),
        (0.8, 0.01, 0.8, 38),
    ];
    for (d, alpha, power, n) in printed {
        let problem = two_groups(d, 1.0, alpha, "two", power);
        let found = smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach");
        assert!(
            found.sizes.step == n || found.sizes.step == n + 1,
            "d = {d}: {}",
            found.sizes.step
        );
    }
    for (n, d, power) in [(50, 0.5, 0.70), (20, 0.8, 0.69), (100, 0.2, 0.29)] {
        let problem = two_groups(d, 1.0, 0.05, "two", 0.8);
        let exact = problem.power(&sizes(&[n, n]), problem.planned()).expect("the power exists");
        assert!((exact - power).abs() < 0.005, "n = {n}, d = {d}: {exact}");
    }
}

/// Julious (2004), Statistics in Medicine 23, superiority table, from memory: n per group, two-sided 5 %, 90 %.
#[test]
fn julious_table_holds() {
    for (d, n) in [(0.05, 8407), (0.1, 2103), (0.25, 338), (0.75, 39)] {
        let problem = two_groups(d, 1.0, 0.05, "two", 0.9);
        let found = smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach");
        assert_eq!(found.sizes.step, n, "d = {d}");
    }
}

/// Button et al. (2013), Nature Reviews Neuroscience 14, table 2: sizes and detectable differences.
#[test]
fn button_table_holds() {
    for (d, power, total) in [(0.49, 0.8, 134), (0.49, 0.95, 220), (0.69, 0.95, 112)] {
        let problem = two_groups(d, 1.0, 0.05, "two", power);
        let found = smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach");
        assert_eq!(found.sizes.total, total, "d = {d}");
    }
    for (power, d) in [(0.8, 1.26), (0.95, 1.62)] {
        let problem = two_groups(d, 1.0, 0.05, "two", power);
        let detectable = problem.detectable(&sizes(&[11, 11]), 1.0, power).expect("it exists");
        assert!((detectable - d).abs() < 0.005, "{detectable}");
    }
}

/// Common practice: SD 0.39, difference 0.5, two-sided 5 %, 80 % power.
#[test]
fn the_worked_example_of_the_trade() {
    let problem = two_groups(0.5, 0.39, 0.05, "two", 0.8);
    let at = problem.planned();
    let textbook = problem.textbook(at).expect("it exists").expect("within reach");
    assert!((textbook.step - 9.55).abs() < 0.005, "{}", textbook.step);
    assert!((textbook.step_with_table_quantiles - 9.54).abs() < 0.005);
    assert_eq!(textbook.sizes.per_group, [10, 10]);
    let found = smallest_sizes(problem.as_ref(), at).expect("within reach");
    assert_eq!(found.sizes.per_group, [11, 11]);
    assert!((found.power - 0.816).abs() < 0.0005, "{}", found.power);
    assert!((found.power_one_fewer.expect("10 exists") - 0.774).abs() < 0.0005);
    let six = sizes(&[6, 6]);
    assert!((problem.textbook_detectable(&six, 0.39).expect("it exists") - 0.63).abs() < 0.005);
    assert!((problem.textbook_power(&six, at).expect("it exists") - 0.60).abs() < 0.005);
    assert!((problem.power(&six, at).expect("it exists") - 0.518).abs() < 0.0005);
}

#[test]
fn three_groups_in_pairs_take_ten_each_by_the_textbook_never_the_total_of_two_divided() {
    let yaml = "design: {structure: parallel-groups, groups: [a, b, c]}\neffect: {difference: 0.5}\n\
                spread: 0.39\nrisk: {multiplicity: each-at-alpha}";
    let problem = read("parallel-means", yaml).expect("sound");
    let textbook = problem.textbook(problem.planned()).expect("it exists").expect("within reach");
    assert_eq!(textbook.sizes.per_group, [10, 10, 10]);
    let found = smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach");
    // 27 and 30 degrees of freedom instead of 18 and 20 help a little; scipy.stats.nct gives 0.7892 and 0.8287.
    assert_eq!(found.sizes.per_group, [11, 11, 11]);
}

#[test]
fn unequal_groups_grow_by_the_largest_and_round_up() {
    let read_groups = |groups: &str| {
        let yaml = format!("design: {{groups: {groups}}}\neffect: {{difference: 1}}\nspread: 1");
        read("parallel-means", &yaml).expect("sound")
    };
    let problem = read_groups("[a, {name: b, weight: 1.1}]");
    assert_eq!(problem.sizes(11).expect("small").per_group, [10, 11]);
    assert_eq!(problem.sizes(13).expect("small").per_group, [12, 13]);
    let problem = read_groups("[{name: a, weight: 3}, {name: b, weight: 2}]");
    assert_eq!(problem.sizes(3).expect("small").per_group, [3, 2]);
    assert_eq!(problem.sizes(5).expect("small").per_group, [5, 4]);
    for (weight, smallest) in [(1.0, 2), (2.0, 3), (2.5, 3), (3.0, 4), (1000.0, 1001)] {
        let problem = read_groups(&format!("[a, {{name: b, weight: {weight}}}]"));
        assert_eq!(problem.smallest_step(), smallest, "weight {weight}");
        let sizes = problem.sizes(smallest).expect("small");
        assert!(sizes.per_group.iter().all(|n| *n >= 2));
        assert!(problem.sizes(smallest - 1).is_none_or(|s| s.per_group.iter().any(|n| *n < 2)));
    }
}

/// A study in the ratio 3 : 1, every allocation below the answer looked at one by one.
#[test]
fn no_smaller_allocation_in_the_ratio_reaches_the_target() {
    let yaml = "design: {groups: [{name: a, weight: 3}, b]}\neffect: {difference: 0.56}\nspread: 1";
    let problem = read("parallel-means", yaml).expect("sound");
    let at = problem.planned();
    let found = smallest_sizes(problem.as_ref(), at).expect("within reach");
    for n in 4..found.sizes.per_group[0] {
        let power = problem.power(&sizes(&[n, n.div_ceil(3)]), at).expect("it exists");
        assert!(power < 0.8, "{n}: {power}");
    }
    assert!(found.power >= 0.8);
}

#[test]
fn contradictions_are_faults_with_a_place() {
    let place = |yaml: &str| {
        let faults = read("parallel-means", yaml).expect_err("the spec is wrong");
        faults.iter().map(|f| f.at.to_string()).collect::<Vec<_>>()
    };
    let base = "design: {groups: [a, b]}\neffect: {difference: 1}\n";
    assert_eq!(place(&format!("{base}spread: -1")), ["spread"]);
    assert_eq!(place(&format!("{base}spread: {{values: [2, 2, 2]}}")), ["spread.values"]);
    assert_eq!(place(&format!("{base}spread: 1\nrisk: {{alpha: 1}}")), ["risk.alpha"]);
    assert_eq!(place(&format!("{base}spread: 1\nrisk: {{power: 1}}")), ["risk.power"]);
    assert_eq!(place(&format!("{base}spread: 1\nrisk: {{power: 0.04}}")), ["risk.power"]);
    assert_eq!(
        place("design: {groups: [a, a]}\neffect: {difference: 0}\nspread: 0"),
        ["design.groups[1]", "effect.difference", "spread"]
    );
    assert_eq!(
        place(
            "design: {groups: [a, b, c]}\neffect: {difference: 1}\nspread: 1\nrisk: {sides: one}"
        ),
        ["risk.sides"]
    );
}

/// Any and all of the comparisons with a control: `any_power` and `all_power` of `all_pairs_any_each.csv`, by
/// quadrature, where every group differs from the control by the same amount, as our plans suppose.
#[test]
fn joint_power_against_a_control_agrees() {
    let mut compared = 0;
    for row in table("all_pairs_any_each.csv") {
        let means: Vec<f64> =
            row["means"].split(';').map(|x| x.parse().expect("a number")).collect();
        let shift = means[1] - means[0];
        let all_alike = means[1..].iter().all(|m| *m == means[1]) && shift > 0.0;
        let known = !row["any_power"].is_empty() && !row["all_power"].is_empty();
        if row["family"] != "vs_control" || !all_alike || !known || means.len() < 3 {
            continue;
        }
        let names: Vec<_> = (0..means.len()).map(|g| format!("g{g}")).collect();
        let yaml = format!(
            "design: {{groups: [{}], compare: against-control, control: g0}}\neffect: {{difference: {shift}}}\n\
             spread: {}\nrisk: {{alpha: {}, sides: {}, power: 0.9999, multiplicity: {}}}",
            names.join(", "),
            row["sd"],
            row["alpha"],
            words(&row["sides"]),
            row["method"],
        );
        let problem = read("parallel-means", &yaml).expect("sound");
        let per_group: Vec<u64> =
            row["n_per_group"].split(';').map(|n| n.parse().expect("a number")).collect();
        let facts = problem.facts(&sizes(&per_group)).expect("they exist");
        for key in ["any_power", "all_power"] {
            let power = facts[key].as_f64().expect("a number");
            assert!((power - number(&row, key)).abs() < 1e-9, "{row:?}: {key} {power}");
        }
        compared += 1;
    }
    assert!(compared >= 3, "only {compared} rows were compared");
}

/// Holm's first step is Bonferroni's, and joint distributions never ask for more than inequalities.
#[test]
fn holm_has_the_number_of_bonferroni_and_tukey_needs_no_more() {
    let step = |multiplicity: &str| {
        let yaml = format!(
            "design: {{groups: [a, b, c, d]}}\neffect: {{difference: 1}}\nspread: 1\n\
             risk: {{multiplicity: {multiplicity}}}"
        );
        let problem = read("parallel-means", &yaml).expect("sound");
        smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach").sizes.step
    };
    assert_eq!(step("holm"), step("bonferroni"));
    assert!(step("tukey") <= step("sidak") && step("sidak") <= step("bonferroni"));
    assert!(step("each-at-alpha") < step("tukey"));
}
