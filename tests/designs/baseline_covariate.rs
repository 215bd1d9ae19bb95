//! Independent groups, difference between means adjusted for a baseline covariate.
//!
//! Tables: `ancova.csv` (the averaged power by quadrature over F(1, N − 2), 1e-11, checked there by simulated
//! regressions; the plain power with mpmath, 30 digits), `repeated_measures.csv` (the factor from the full covariance
//! matrix), `adjusted_pairs.csv` (several groups: trapezoidal sums
//! over the covariate's means and both sums of squares, double precision).

use sufficit::designs::{Point, Problem, RivalAnswer};
use sufficit::numerics::random::Stream;
use sufficit::solver::smallest_sizes;

use crate::support::{number, read, sizes, table};

fn two_groups(
    (difference, sd, rho): (f64, f64, f64),
    alpha: f64,
    sides: &str,
    power: f64,
) -> Box<dyn Problem> {
    let yaml = format!(
        "design: {{structure: parallel-groups, groups: [a, b], baseline: {{correlation: {rho}}}}}\n\
         effect: {{difference: {difference}}}\nspread: {sd}\n\
         risk: {{alpha: {alpha}, sides: {sides}, power: {power}}}"
    );
    read("baseline-covariate", &yaml).unwrap_or_else(|faults| panic!("{yaml}\n{faults:?}"))
}

fn words(sides: &str) -> &'static str {
    if sides == "1" { "one" } else { "two" }
}

/// The problem of another method that the design names.
fn rival(problem: &dyn Problem, id: &str) -> Box<dyn Problem> {
    let rivals = problem.rivals().expect("they exist");
    match rivals.into_iter().find(|rival| rival.id == id).expect("it is named").answer {
        RivalAnswer::Exact(problem) => problem,
        RivalAnswer::Formula { .. } => panic!("{id} is a formula"),
    }
}

#[test]
fn both_powers_agree_with_the_table() {
    for row in table("ancova.csv") {
        let [delta, sd, rho, alpha] = ["delta", "sd", "rho", "alpha"].map(|k| number(&row, k));
        let per_group = sizes(&[number(&row, "n1") as u64, number(&row, "n2") as u64]);
        let problem = two_groups((1.0, sd, rho), alpha, words(&row["sides"]), 0.999_99);
        let at = Point { effect: delta, nuisance: sd };
        let averaged = problem.power(&per_group, at).expect("the power exists");
        let expected = number(&row, "power_random_covariate");
        // The table gives this column to 1e-11.
        assert!((averaged - expected).abs() < 2e-11, "{row:?}: {averaged}");
        let plain = rival(problem.as_ref(), "plain").power(&per_group, at).expect("it exists");
        assert!((plain - number(&row, "power")).abs() < 1e-12, "{row:?}: {plain}");
    }
}

/// Several groups, one of whose pairs is compared. The average is over the covariate's means and its sum of squares
/// within groups, two independent variables, not over the angle to which the design reduces them.
#[test]
fn the_average_over_several_groups_agrees() {
    for row in table("adjusted_pairs.csv") {
        let per_group: Vec<u64> =
            row["n_per_group"].split(';').map(|n| n.parse().expect("a size")).collect();
        let names: Vec<_> = (0..per_group.len()).map(|g| format!("g{g}")).collect();
        let [delta, sd, rho, alpha] = ["delta", "sd", "rho", "alpha"].map(|k| number(&row, k));
        let yaml = format!(
            "design: {{groups: [{}], control: g0, compare: against-control, \
             baseline: {{name: age, correlation: {rho}}}}}\n\
             effect: {{difference: {delta}}}\nspread: {sd}\n\
             risk: {{alpha: {alpha}, sides: {}, power: 0.9999, multiplicity: each-at-alpha}}",
            names.join(", "),
            words(&row["sides"])
        );
        let problem = read("baseline-covariate", &yaml).expect("sound");
        let facts = problem.facts(&sizes(&per_group)).expect("they exist");
        let first = facts["comparisons"].as_array().and_then(|all| all.first()).expect("one");
        let power = first["power"].as_f64().expect("a number");
        assert!((power - number(&row, "power")).abs() < 1e-12, "{row:?}: {power}");
    }
}

/// One baseline and one later measurement: the factor is 1 − ρ², the plain t power has 2n − 3 degrees of freedom; the
/// change from the baseline has the factor 2(1 − ρ) and 2n − 2.
#[test]
fn factors_and_sizes_agree_with_the_repeated_measures_table() {
    let mut compared = 0;
    for row in table("repeated_measures.csv") {
        let id = match row["method"].as_str() {
            "ancova" => "plain",
            "change" => "change",
            _ => continue,
        };
        if row["baseline_measures"] != "1" || row["followup_measures"] != "1" {
            continue;
        }
        let [rho, sd, delta, alpha, power] =
            ["rho", "sd", "delta", "alpha", "power_target"].map(|k| number(&row, k));
        let problem = two_groups((delta, sd, rho), alpha, words(&row["sides"]), power);
        let method = rival(problem.as_ref(), id);
        let textbook = method.textbook(method.planned()).expect("it exists").expect("in reach");
        let expected = number(&row, "n_per_group_normal");
        assert!((textbook.step / expected - 1.0).abs() < 1e-12, "{row:?}: {}", textbook.step);
        let found = smallest_sizes(method.as_ref(), method.planned()).expect("within reach");
        assert_eq!(found.sizes.step, number(&row, "n_per_group_t") as u64, "{row:?}");
        compared += 1;
    }
    assert!(compared >= 2, "only {compared} rows were compared");
}

/// Borm, Fransen and Lemmens (2007), from memory: with a correlation of 0.7 the size is 0.51 times that of the t test.
#[test]
fn the_published_factor_holds() {
    let with = two_groups((0.5, 1.0, 0.7), 0.05, "two", 0.8);
    let without = two_groups((0.5, 1.0, 0.0), 0.05, "two", 0.8);
    let step = |p: &dyn Problem| p.textbook(p.planned()).expect("exists").expect("in reach").step;
    assert!((step(with.as_ref()) / step(without.as_ref()) - 0.51).abs() < 1e-12);
    // The size of the two-sample t test is 64 (Cohen 1988, table 2.4.1), so the rule gives 32.64 per group.
    let rivals = with.rivals().expect("they exist");
    let rule = rivals.iter().find(|rival| rival.id == "shrunk-t").expect("it is named");
    let RivalAnswer::Formula { step, sizes } = &rule.answer else { panic!("it is a formula") };
    assert!((step - 32.64).abs() < 1e-9, "{step}");
    assert_eq!(sizes.per_group, [33, 33]);
}

#[test]
fn a_covariate_without_correlation_costs_power_and_never_more_than_it_can() {
    for n in [3, 5, 12, 40, 1000] {
        let problem = two_groups((1.0, 1.0, 0.0), 0.05, "two", 0.8);
        let at =
            Point { effect: 2.9 / (n as f64).sqrt() * std::f64::consts::SQRT_2, nuisance: 1.0 };
        let [averaged, plain, unadjusted] = [
            problem.power(&sizes(&[n, n]), at).expect("it exists"),
            rival(problem.as_ref(), "plain").power(&sizes(&[n, n]), at).expect("it exists"),
            rival(problem.as_ref(), "unadjusted").power(&sizes(&[n, n]), at).expect("it exists"),
        ];
        assert!(averaged < plain && plain < unadjusted, "{n}: {averaged} {plain} {unadjusted}");
        let lost = unadjusted - averaged;
        assert!(lost < 1.5 / n as f64, "{n}: {lost}");
    }
}

/// Three groups of unequal size, the regression computed from raw data: the share of rejections lies within 4 standard
/// errors of the power, a false alarm in one of 16 000 seeds.
#[test]
fn the_simulated_regression_has_the_power() {
    let yaml = "design: {groups: [a, {name: b, weight: 2}, b2], compare: against-control, control: a, \
                baseline: {correlation: -0.6}}\neffect: {difference: 1.6}\nspread: 1.1\n\
                risk: {multiplicity: each-at-alpha}";
    let problem = read("baseline-covariate", yaml).expect("sound");
    let sizes = sizes(&[4, 7, 4]);
    let trial = problem.trial(&sizes, problem.planned()).expect("it exists");
    let (mut scratch, mut planned, mut null) = (Vec::new(), [false; 2], [false; 2]);
    let (mut hits, mut alarms) = (0.0, 0.0);
    let studies = 40_000;
    let mut stream = Stream::new([7; 32], "test", 0);
    for _ in 0..studies {
        trial.run(&mut stream, &mut scratch, &mut planned, &mut null);
        hits += f64::from(planned[trial.weakest()]);
        alarms += f64::from(null[trial.weakest()]);
    }
    let power = problem.power(&sizes, problem.planned()).expect("it exists");
    for (count, expected) in [(hits, power), (alarms, 0.05)] {
        let share = count / f64::from(studies);
        let error = (expected * (1.0 - expected) / f64::from(studies)).sqrt();
        assert!((share - expected).abs() < 4.0 * error, "{share} for {expected}");
    }
}

#[test]
fn contradictions_are_faults_with_a_place() {
    let place = |baseline: &str| {
        let yaml = format!(
            "design: {{groups: [a, b], baseline: {baseline}}}\neffect: {{difference: 1}}\nspread: 1"
        );
        let faults = read("baseline-covariate", &yaml).expect_err("the spec is wrong");
        faults.iter().map(|f| f.at.to_string()).collect::<Vec<_>>()
    };
    let yaml = "design: {groups: [a, b, c], baseline: {correlation: 0.5}}\neffect: {difference: 1}\nspread: 1\n\
                risk: {multiplicity: tukey}";
    let faults = read("baseline-covariate", yaml).expect_err("the spec is wrong");
    assert_eq!(faults.iter().map(|f| f.at.to_string()).collect::<Vec<_>>(), ["risk.multiplicity"]);
    assert_eq!(place("{correlation: 1}"), ["design.baseline.correlation"]);
    assert_eq!(
        place("{correlation: {value: -1.2, why: x}}"),
        ["design.baseline.correlation.value"]
    );
}
