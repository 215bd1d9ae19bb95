//! Two independent groups with a standard deviation for each: Welch's test.
//!
//! Table: `welch_t_power.csv` (power by quadrature over the ratio of the variances, checked by direct two-dimensional
//! quadrature; the Satterthwaite approximation by mpmath).

use sufficit::designs::{Point, Problem, RivalAnswer};
use sufficit::solver::smallest_sizes;

use crate::support::{number, read, sizes, table};

fn welch(sds: [f64; 2], difference: f64, risk: &str) -> Box<dyn Problem> {
    let [first, second] = sds;
    let yaml = format!(
        "design: {{structure: parallel-groups, groups: [a, b]}}\neffect: {{difference: {difference}}}\n\
         spread: {{by-group: {{a: {first}, b: {second}}}}}\nrisk: {{{risk}}}"
    );
    read("welch-means", &yaml).unwrap_or_else(|faults| panic!("{yaml}\n{faults:?}"))
}

/// The problem of a row, its sizes and its point.
fn row_problem(
    row: &std::collections::HashMap<String, String>,
) -> (Box<dyn Problem>, sufficit::designs::Sizes, Point) {
    let [sd1, sd2, alpha, delta] = ["sd1", "sd2", "alpha", "delta"].map(|key| number(row, key));
    let sides = if row["sides"] == "1" { "one" } else { "two" };
    let risk = format!("alpha: {alpha}, sides: {sides}, power: 0.99999");
    let per_group = ["n1", "n2"].map(|key| number(row, key) as u64);
    let at = Point { effect: delta, nuisance: sd1.max(sd2) };
    (welch([sd1, sd2], 1.0, &risk), sizes(&per_group), at)
}

#[test]
fn power_agrees_with_two_dimensional_quadrature() {
    for row in table("welch_t_power.csv") {
        let (problem, sizes, at) = row_problem(&row);
        let power = problem.power(&sizes, at).expect("the power exists");
        let expected = number(&row, "power_exact");
        // The table is good to 1e-12 absolute.
        assert!((power - expected).abs() < 2e-12, "{row:?}: {power}");
    }
}

#[test]
fn the_rival_is_satterthwaites_approximation() {
    for row in table("welch_t_power.csv") {
        let (problem, sizes, at) = row_problem(&row);
        let rivals = problem.rivals().expect("they exist");
        let rival = rivals.iter().find(|rival| rival.id == "satterthwaite").expect("it is there");
        let RivalAnswer::Exact(rival) = &rival.answer else { panic!("it is searched for") };
        let power = rival.power(&sizes, at).expect("the power exists");
        let expected = number(&row, "power_satterthwaite_nct");
        assert!((power - expected).abs() < 1e-12, "{row:?}: {power}");
        let facts = problem.facts(&sizes).expect("the facts exist");
        let df = facts["satterthwaite_df"].as_f64().expect("a number");
        assert!((df / number(&row, "df_satterthwaite") - 1.0).abs() < 1e-13, "{row:?}: {df}");
    }
}

/// Every allocation below the answer is looked at one by one, also where the power falls back as the larger group alone
/// grows: with (3, 8), (3, 9) and the difference of 10 below the power is 0.4917 and 0.4896.
#[test]
fn no_smaller_allocation_in_the_ratio_reaches_the_target() {
    let mut fell_back = 0;
    for (sd, weight) in [(5.0, 3.0), (1.0, 10.0), (0.2, 3.0), (2.0, 1.5), (1.0, 1.0), (4.0, 1.0)] {
        for (difference, target) in
            [(10.0, 0.49), (10.0, 0.8), (3.0, 0.4), (2.0, 0.778), (2.0, 0.9)]
        {
            let yaml = format!(
                "design: {{groups: [a, {{name: b, weight: {weight}}}]}}\n\
                 effect: {{difference: {difference}}}\nspread: {{by-group: {{a: {sd}, b: 1}}}}\n\
                 risk: {{power: {target}}}"
            );
            let problem = read("welch-means", &yaml).expect("sound");
            let at = problem.planned();
            let found = smallest_sizes(problem.as_ref(), at).expect("within reach");
            let power =
                |step| problem.power(&problem.sizes(step).expect("small"), at).expect("it exists");
            for step in problem.smallest_step()..found.sizes.step {
                assert!(power(step) < target, "{yaml}: {step}");
            }
            assert!(found.power >= target);
            fell_back += (found.sizes.step..found.sizes.step + 40)
                .filter(|step| power(*step) < target)
                .count();
        }
    }
    assert!(fell_back > 0, "no case falls back, so nothing was tried");
}

/// The step from which the power is taken to rise: beyond it a power that has reached the target stays there.
#[test]
fn the_power_does_not_fall_back_beyond_the_step_that_is_named() {
    for (sd, weight) in [(5.0, 3.0), (1.0, 10.0), (20.0, 4.0), (2.0, 1.5), (20.0, 1.0)] {
        for (alpha, target) in [(0.05, 0.3), (0.05, 0.8), (0.001, 0.8), (0.2, 0.95)] {
            let yaml = format!(
                "design: {{groups: [a, {{name: b, weight: {weight}}}]}}\neffect: {{difference: 1}}\n\
                 spread: {{by-group: {{a: {sd}, b: 1}}}}\nrisk: {{alpha: {alpha}, power: {target}}}"
            );
            let problem = read("welch-means", &yaml).expect("sound");
            let first = problem.rising_from();
            for step in (first..first + 40).step_by(7) {
                let sizes = problem.sizes(step).expect("small");
                let nuisance = problem.planned().nuisance;
                let effect = problem.detectable(&sizes, nuisance, target).expect("it exists");
                for more in step + 1..step + 12 {
                    let sizes = problem.sizes(more).expect("small");
                    let power = problem.power(&sizes, Point { effect, nuisance }).expect("exists");
                    assert!(power > target - 1e-9, "{yaml}: {step}, {more}: {power}");
                }
            }
        }
    }
}

/// Neyman (1934) and Cochran (1977), equation 5.21: sizes in proportion to the standard deviation over the root of the
/// cost. Checked by the sums that they minimise.
#[test]
fn the_levers_are_the_best_allocations() {
    let yaml = |weight: f64| {
        format!(
            "design: {{groups: [a, {{name: b, weight: {weight}}}], costs: {{a: 4, b: 1}}}}\n\
             effect: {{difference: 0.3}}\nspread: {{by-group: {{a: 1, b: 1.5}}}}"
        )
    };
    let solved = |weight: f64| {
        let problem = read("welch-means", &yaml(weight)).expect("sound");
        smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach").sizes
    };
    let price = |sizes: &sufficit::designs::Sizes| 4 * sizes.per_group[0] + sizes.per_group[1];
    let problem = read("welch-means", &yaml(1.0)).expect("sound");
    let levers = problem.levers();
    for (id, ratio) in [("optimal-allocation", 1.5), ("cheapest-allocation", 3.0)] {
        let lever = levers.iter().find(|lever| lever.id == id).expect("it is there");
        assert_eq!(lever.value, Some(ratio), "{id}");
        let best = solved(ratio);
        let own = smallest_sizes(lever.problem.as_ref(), lever.problem.planned()).expect("exists");
        assert_eq!(own.sizes, best, "{id}");
        for other in [1.0, 1.2, 2.0, 2.5, 4.0, 5.0] {
            let sizes = solved(other);
            match id {
                "optimal-allocation" => assert!(sizes.total >= best.total, "{other}"),
                _ => assert!(price(&sizes) >= price(&best), "{other}"),
            }
        }
    }
    let problem = read("welch-means", &yaml(1.5)).expect("sound");
    assert!(problem.levers().iter().all(|lever| lever.id != "optimal-allocation"));
}

#[test]
fn one_standard_deviation_holds_for_both_groups_and_evidence_is_added_up() {
    let base = "design: {groups: [a, b]}\neffect: {difference: 1}\nspread: ";
    let spread = |text: &str| {
        let problem = read("welch-means", &format!("{base}{text}")).expect("sound");
        let spread = problem.spread().expect("it has one");
        (spread.sd, spread.df)
    };
    assert_eq!(spread("1.5"), (1.5, None));
    assert_eq!(spread("{sd: 1.5, n: 10}"), (1.5, Some(9.0)));
    assert_eq!(spread("{by-group: {a: {sd: 2, n: 10}, b: {sd: 3, df: 4}}}"), (3.0, Some(13.0)));
    assert_eq!(spread("{by-group: {a: {sd: 2, n: 10}, b: 1}}"), (2.0, None));
}

#[test]
fn contradictions_are_faults_with_a_place() {
    let place = |design: &str, rest: &str| {
        let yaml = format!("design: {{{design}}}\neffect: {{difference: 1}}\n{rest}");
        let faults = read("welch-means", &yaml).expect_err("the spec is wrong");
        faults.iter().map(|f| f.at.to_string()).collect::<Vec<_>>()
    };
    let two = "groups: [a, b]";
    assert_eq!(place("groups: [a, b, c]", "spread: 1"), ["design.groups"]);
    assert_eq!(place(two, "spread: {by-group: {a: 1}}"), ["spread.by-group"]);
    assert_eq!(place(two, "spread: {by-group: {a: 1, b: -2}}"), ["spread.by-group.b"]);
    assert_eq!(place(two, "spread: {by-group: {a: 1, b: 2, c: 3}}"), ["spread.by-group.c"]);
    assert_eq!(place(two, "spread: {sd: 1, by-group: {a: 1, b: 2}}"), ["spread.by-group"]);
    assert_eq!(place(two, "spread: 1\nrisk: {multiplicity: holm}"), ["risk.multiplicity"]);
    assert_eq!(place("groups: [a, b], costs: {a: 1}", "spread: 1"), ["design.costs"]);
    assert_eq!(
        place("groups: [a, b], costs: {a: 0, b: 1, c: 2}", "spread: 1"),
        ["design.costs.a", "design.costs.c"]
    );
}
