//! Two treatments, two periods, two sequences.
//!
//! Tables: `crossover_mean.csv`, `crossover_mean_smallest_n.csv` (mpmath, 30 digits).

use sufficit::designs::{Point, Problem, RivalAnswer};
use sufficit::numerics::random::Stream;
use sufficit::solver::smallest_sizes;

use crate::support::{number, read, sizes, table};

fn crossover(
    difference: f64,
    spread: &str,
    alpha: f64,
    sides: &str,
    power: f64,
) -> Box<dyn Problem> {
    let yaml = format!(
        "design: {{structure: crossover, treatments: [placebo, drug]}}\n\
         effect: {{difference: {difference}}}\nspread: {{{spread}}}\n\
         risk: {{alpha: {alpha}, sides: {sides}, power: {power}}}"
    );
    read("crossover-means", &yaml).unwrap_or_else(|faults| panic!("{yaml}\n{faults:?}"))
}

fn words(sides: &str) -> &'static str {
    if sides == "1" { "one" } else { "two" }
}

#[test]
fn power_agrees_with_thirty_digits() {
    for row in table("crossover_mean.csv") {
        let [delta, sd, alpha] = ["delta", "sd_within", "alpha"].map(|key| number(&row, key));
        let per_sequence = sizes(&["n_seq1", "n_seq2"].map(|key| number(&row, key) as u64));
        let spread = format!("kind: within, sd: {sd}");
        let problem = crossover(1.0, &spread, alpha, words(&row["sides"]), 0.999_99);
        let at = Point { effect: delta, nuisance: sd };
        let power = problem.power(&per_sequence, at).expect("the power exists");
        assert!((power - number(&row, "power")).abs() < 1e-12, "{row:?}: {power}");
    }
}

#[test]
fn smallest_size_agrees_with_the_table_and_one_fewer_misses() {
    for row in table("crossover_mean_smallest_n.csv") {
        let [effect, alpha, target] =
            ["effect_within", "alpha", "power_target"].map(|k| number(&row, k));
        let problem = crossover(effect, "kind: within, sd: 1", alpha, words(&row["sides"]), target);
        let found = smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach");
        assert_eq!(found.sizes.step, number(&row, "n_per_sequence") as u64, "{row:?}");
        assert_eq!(found.sizes.total, number(&row, "n_total") as u64, "{row:?}");
        assert!((found.power - number(&row, "power_at_n")).abs() < 1e-11, "{row:?}");
        let fewer = &row["power_at_n_per_sequence_minus_1"];
        match found.power_one_fewer {
            None => assert!(fewer.is_empty(), "{row:?}"),
            Some(power) => {
                let expected: f64 = fewer.parse().expect("a number");
                assert!(power < target && (power - expected).abs() < 1e-11, "{row:?}");
            }
        }
    }
}

/// The variance of a difference of two measurements of one unit is `2 σ_w² = 2 σ² (1 − ρ)`.
#[test]
fn the_three_standard_deviations_say_the_same() {
    let power = |spread: &str| {
        let problem = crossover(1.3, spread, 0.05, "two", 0.8);
        problem.power(&sizes(&[6, 6]), problem.planned()).expect("it exists")
    };
    let within = power("kind: within, sd: 1.5");
    // √(2 × 2.25) and √(2.25 / 0.25).
    assert!((power("kind: differences, sd: 2.1213203435596424") - within).abs() < 1e-13);
    assert!((power("kind: between, sd: 3, correlation: 0.75") - within).abs() < 1e-13);
}

/// The paired t test of the table `paired_one_sample_power.csv` is the crossover analysed without the period effect.
#[test]
fn without_the_period_effect_it_is_the_paired_t_test() {
    let mut compared = 0;
    for row in table("paired_one_sample_power.csv") {
        let n = number(&row, "n") as u64;
        if !n.is_multiple_of(2) || n < 4 {
            continue;
        }
        let [delta, sd, alpha] = ["delta", "sd_used", "alpha"].map(|key| number(&row, key));
        let spread = format!("kind: differences, sd: {sd}");
        let problem = crossover(1.0, &spread, alpha, words(&row["sides"]), 0.999_99);
        let rivals = problem.rivals().expect("they exist");
        let paired = rivals.into_iter().find(|rival| rival.id == "paired").expect("it is named");
        let RivalAnswer::Exact(paired) = paired.answer else { panic!("it is solved exactly") };
        let at = Point { effect: delta, nuisance: sd };
        let power = paired.power(&sizes(&[n / 2, n / 2]), at).expect("it exists");
        assert!((power - number(&row, "power")).abs() < 1e-12, "{row:?}: {power}");
        compared += 1;
    }
    assert!(compared > 20, "only {compared} rows were compared");
}

/// Unequal sequences, raw data with a period effect: the share of rejections lies within 4 standard errors of the power,
/// a false alarm in one of 16 000 seeds.
#[test]
fn the_simulated_crossover_has_the_power() {
    for spread in ["kind: between, sd: 2, correlation: 0.7", "kind: differences, sd: 1.6"] {
        let problem = crossover(1.4, spread, 0.05, "two", 0.8);
        let sizes = sizes(&[4, 7]);
        let trial = problem.trial(&sizes, problem.planned()).expect("it exists");
        let (mut scratch, mut planned, mut null) = (Vec::new(), [false], [false]);
        let (mut hits, mut alarms) = (0.0, 0.0);
        let studies = 40_000;
        let mut stream = Stream::new([3; 32], "test", 0);
        for _ in 0..studies {
            trial.run(&mut stream, &mut scratch, &mut planned, &mut null);
            hits += f64::from(planned[0]);
            alarms += f64::from(null[0]);
        }
        let power = problem.power(&sizes, problem.planned()).expect("it exists");
        for (count, expected) in [(hits, power), (alarms, 0.05)] {
            let share = count / f64::from(studies);
            let error = (expected * (1.0 - expected) / f64::from(studies)).sqrt();
            assert!((share - expected).abs() < 4.0 * error, "{spread}: {share} for {expected}");
        }
    }
}

#[test]
fn contradictions_are_faults_with_a_place() {
    let place = |treatments: &str, spread: &str, risk: &str| {
        let yaml = format!(
            "design: {{treatments: {treatments}}}\neffect: {{difference: 1}}\nspread: {spread}\nrisk: {risk}"
        );
        let faults = read("crossover-means", &yaml).expect_err("the spec is wrong");
        faults.iter().map(|f| f.at.to_string()).collect::<Vec<_>>()
    };
    let (two, sound) = ("[a, b]", "{kind: within, sd: 1}");
    assert_eq!(place("[a, b, c]", sound, "{}"), ["design.treatments"]);
    assert_eq!(place("[a, a]", sound, "{}"), ["design.treatments[1]"]);
    assert_eq!(place(two, "{kind: between, sd: 1}", "{}"), ["spread.kind"]);
    assert_eq!(place(two, "{kind: within, sd: 1, correlation: 0.5}", "{}"), ["spread.correlation"]);
    assert_eq!(place(two, "{kind: between, sd: 1, correlation: 1}", "{}"), ["spread.correlation"]);
    assert_eq!(place(two, "{kind: within, values: [1, 2, 4]}", "{}"), ["spread.values"]);
    assert_eq!(place(two, "{kind: within, sd: 1, n: 9}", "{}"), ["spread.n"]);
    assert_eq!(place(two, sound, "{multiplicity: sidak}"), ["risk.multiplicity"]);
}
