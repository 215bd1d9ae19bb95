//! Several groups, omnibus F test.
//!
//! Table: `anova_f_power.csv` (mpmath, 40 digits, noncentral F as a Poisson mixture); printed values name their source
//! beside them.

use sufficit::designs::{Point, Problem};
use sufficit::solver::smallest_sizes;

use crate::support::{number, read, sizes, table};

fn list(text: &str) -> Vec<f64> {
    text.split(';').map(|x| x.parse().expect("a number")).collect()
}

fn anova(means: &str, sd: f64, alpha: f64, power: f64) -> Box<dyn Problem> {
    let names: Vec<_> = (0..means.split(',').count()).map(|g| format!("g{g}")).collect();
    let yaml = format!(
        "design: {{structure: parallel-groups, groups: [{}]}}\neffect: {{means: [{means}]}}\n\
         spread: {sd}\nrisk: {{alpha: {alpha}, power: {power}}}",
        names.join(", ")
    );
    read("omnibus-f", &yaml).unwrap_or_else(|faults| panic!("{yaml}\n{faults:?}"))
}

#[test]
fn power_agrees_with_forty_digits() {
    let mut compared = 0;
    for row in table("anova_f_power.csv") {
        let means = list(&row["means"]);
        if means.len() < 3 {
            continue;
        }
        let equal = means.iter().all(|mean| *mean == means[0]);
        // Rows without a difference are legal questions to the power function, but no effect to plan for.
        let text = if equal {
            vec!["0"; means.len() - 1].join(", ") + ", 1"
        } else {
            row["means"].replace(';', ", ")
        };
        let (sd, alpha) = (number(&row, "sd"), number(&row, "alpha"));
        let problem = anova(&text, sd, alpha, 0.999_99);
        let per_group: Vec<u64> = list(&row["n_per_group"]).iter().map(|n| *n as u64).collect();
        let planned = problem.planned();
        let at = if equal { Point { effect: 0.0, ..planned } } else { planned };
        let power = problem.power(&sizes(&per_group), at).expect("the power exists");
        let expected = number(&row, "power");
        // Means of five digits differ by a few units of the fourth; their range keeps twelve digits.
        assert!((power - expected).abs() < 1e-11, "{row:?}: {power}");
        let facts = problem.facts(&sizes(&per_group)).expect("the facts exist");
        let fact = |key: &str| facts[key].as_f64().expect("a number");
        assert!((fact("critical") / number(&row, "critical_f") - 1.0).abs() < 1e-12, "{row:?}");
        if !equal {
            assert!((fact("noncentrality") / number(&row, "ncp") - 1.0).abs() < 1e-9, "{row:?}");
            assert!((fact("cohens_f") / number(&row, "f") - 1.0).abs() < 1e-9, "{row:?}");
        }
        compared += 1;
    }
    assert!(compared > 40, "only {compared} rows were compared");
}

/// Cohen (1992), Psychological Bulletin 112, table 2, from memory: n per group to the nearest integer, 5 %, 80 %. The
/// smallest n that reaches the target may be one more. Two groups at the ends and the others in the middle have
/// `f = R/(σ √(2k))`.
#[test]
fn cohens_table_holds() {
    let printed = [
        (3, 0.1, 322),
        (3, 0.25, 52),
        (4, 0.1, 274),
        (5, 0.1, 240),
        (5, 0.25, 39),
        (5, 0.4, 16),
        (6, 0.25, 35),
    ];
    for (groups, f, n) in printed {
        let range = f * (2.0 * groups as f64).sqrt();
        let mut means = vec![format!("{}", range / 2.0); groups];
        means[0] = "0".into();
        means[groups - 1] = format!("{range}");
        let problem = anova(&means.join(", "), 1.0, 0.05, 0.8);
        let found = smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach");
        let step = found.sizes.step;
        assert!(step == n || step == n + 1, "{groups} groups, f = {f}: {step}");
        let fact = problem.facts(&found.sizes).expect("they exist")["cohens_f"].as_f64();
        assert!((fact.expect("a number") - f).abs() < 1e-9);
    }
}

/// The textbook size turned round gives back the target and the effect.
#[test]
fn the_textbook_formula_turns_round() {
    let problem = anova("3, 1, 4, 1.5", 2.5, 0.05, 0.85);
    let at = problem.planned();
    assert_eq!(at.effect, 3.0);
    let textbook = problem.textbook(at).expect("it exists").expect("within reach");
    // As if the unrounded size could be had: the noncentrality is proportional to it.
    let sizes = sizes(&[1000; 4]);
    let scale = (textbook.step / 1000.0).sqrt();
    let power = problem
        .textbook_power(&sizes, Point { effect: at.effect * scale, ..at })
        .expect("it exists");
    assert!((power - 0.85).abs() < 1e-10, "{power}");
    let effect = problem.textbook_detectable(&sizes, at.nuisance).expect("it exists");
    assert!((effect / (at.effect * scale) - 1.0).abs() < 1e-10, "{effect}");
}

/// A planned contrast in the pattern of the means is a two-sided t test, F(1, ν) = t(ν)²: with the middle group halfway
/// it is the comparison of the two extreme groups.
#[test]
fn the_planned_contrast_is_a_t_test_and_needs_no_more() {
    let problem = anova("0, 1, 2", 1.5, 0.05, 0.8);
    let levers = problem.levers();
    let contrast = levers.iter().find(|lever| lever.id == "planned-contrast").expect("it is there");
    let sizes = sizes(&[9, 9, 9]);
    let at = problem.planned();
    let power = contrast.problem.power(&sizes, at).expect("it exists");
    // λ = R √(n/2)/σ on 24 degrees of freedom, by the t tests of all pairs of the same three groups, each at 5 %.
    let yaml = "design: {groups: [a, b, c]}\neffect: {difference: 2}\nspread: 1.5\n\
                risk: {multiplicity: each-at-alpha}";
    let pairs = read("parallel-means", yaml).expect("sound");
    let expected = pairs.power(&sizes, at).expect("it exists");
    assert!((power - expected).abs() < 1e-12, "{power} {expected}");
    assert!(power > problem.power(&sizes, at).expect("it exists"));
}

#[test]
fn unequal_groups_weigh_the_means() {
    let yaml =
        "design: {groups: [{name: a, weight: 2}, b, c]}\neffect: {means: [0, 1, 1]}\nspread: 1";
    let problem = read("omnibus-f", yaml).expect("sound");
    let facts = problem.facts(&sizes(&[20, 10, 10])).expect("they exist");
    // Half of the units at 0, half at 1: 40 times a quarter.
    assert!((facts["noncentrality"].as_f64().expect("a number") - 10.0).abs() < 1e-12);
    assert_eq!(problem.sizes(7).expect("small").per_group, [7, 4, 4]);
    assert!(problem.levers().iter().any(|lever| lever.id == "equal-groups"));
}

#[test]
fn contradictions_are_faults_with_a_place() {
    let place = |groups: &str, means: &str, risk: &str| {
        let yaml = format!(
            "design: {{groups: [{groups}]}}\neffect: {{means: [{means}]}}\nspread: 1\nrisk: {{{risk}}}"
        );
        let faults = read("omnibus-f", &yaml).expect_err("the spec is wrong");
        faults.iter().map(|f| f.at.to_string()).collect::<Vec<_>>()
    };
    assert_eq!(place("a, b", "1, 2", ""), ["design.groups"]);
    assert_eq!(place("a, b, c", "1, 2", ""), ["effect.means"]);
    assert_eq!(place("a, b, c", "1, 1, 1", ""), ["effect.means"]);
    assert_eq!(place("a, b, c", "1, .nan, 1", ""), ["effect.means[1]"]);
    assert_eq!(place("a, b, c", "1, 2, 3", "sides: one"), ["risk.sides"]);
    assert_eq!(place("a, b, c", "1, 2, 3", "multiplicity: tukey"), ["risk.multiplicity"]);
}
