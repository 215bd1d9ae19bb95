//! Randomised complete blocks.
//!
//! Tables: `paired_one_sample_power.csv`, `paired_one_sample_smallest_n.csv` (two treatments are the paired t test;
//! mpmath, 30 digits) and `blocks.csv` (mpmath, 30 digits: the integral over the residual chi variable, for several
//! treatments).

use sufficit::designs::{Point, Problem, RivalAnswer};
use sufficit::numerics::random::Stream;
use sufficit::solver::smallest_sizes;

use crate::support::{number, read, sizes, table};

fn blocks(design: &str, difference: f64, spread: &str, risk: &str) -> Box<dyn Problem> {
    let yaml = format!(
        "design: {{structure: randomised-blocks, {design}}}\n\
         effect: {{difference: {difference}}}\nspread: {{{spread}}}\nrisk: {{{risk}}}"
    );
    read("randomised-blocks", &yaml).unwrap_or_else(|faults| panic!("{yaml}\n{faults:?}"))
}

fn words(sides: &str) -> &'static str {
    if sides == "1" { "one" } else { "two" }
}

#[test]
fn two_treatments_are_the_paired_t_test() {
    let mut compared = 0;
    for row in table("paired_one_sample_power.csv") {
        let [delta, sd, alpha] = ["delta", "sd_used", "alpha"].map(|key| number(&row, key));
        let spread = format!("kind: differences, sd: {sd}");
        let risk = format!("alpha: {alpha}, sides: {}, power: 0.99999", words(&row["sides"]));
        let problem = blocks("treatments: [a, b]", 1.0, &spread, &risk);
        let n = number(&row, "n") as u64;
        let at = Point { effect: delta, nuisance: sd };
        let power = problem.power(&sizes(&[n, n]), at).expect("the power exists");
        assert!((power - number(&row, "power")).abs() < 1e-12, "{row:?}: {power}");
        compared += 1;
    }
    assert!(compared > 50, "only {compared} rows were compared");
    for row in table("paired_one_sample_smallest_n.csv") {
        let [effect, alpha] = ["effect", "alpha"].map(|key| number(&row, key));
        let risk = format!(
            "alpha: {alpha}, sides: {}, power: {}",
            words(&row["sides"]),
            row["power_target"]
        );
        let problem = blocks("treatments: [a, b]", effect, "kind: differences, sd: 1", &risk);
        let found = smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach");
        assert_eq!(found.sizes.step, number(&row, "n") as u64, "{row:?}");
    }
}

#[test]
fn several_treatments_agree_with_thirty_digits() {
    for row in table("blocks.csv") {
        let names: Vec<_> =
            (0..number(&row, "treatments") as usize).map(|i| format!("t{i}")).collect();
        let compare = match row["family"].as_str() {
            "all_pairs" => "compare: all-pairs".to_owned(),
            _ => "compare: against-control, control: t0".to_owned(),
        };
        let design = format!("treatments: [{}], {compare}", names.join(", "));
        let spread = format!("kind: within, sd: {}", row["sd_within"]);
        let risk = format!(
            "alpha: {}, sides: {}, power: 0.99999, multiplicity: {}",
            row["alpha"],
            words(&row["sides"]),
            row["method"]
        );
        let problem = blocks(&design, number(&row, "delta"), &spread, &risk);
        let sizes = problem.sizes(number(&row, "blocks") as u64).expect("small");
        let facts = problem.facts(&sizes).expect("they exist");
        assert_eq!(facts["degrees_of_freedom"].as_f64(), Some(number(&row, "df")), "{row:?}");
        let critical = facts["critical"].as_f64().expect("a number");
        let expected = number(&row, "critical_t");
        assert!((critical / expected - 1.0).abs() < 1e-12, "{row:?}: {critical}");
        let power = problem.power(&sizes, problem.planned()).expect("it exists");
        assert!((power - number(&row, "power")).abs() < 1e-12, "{row:?}: {power}");
    }
}

/// Critical values of the joint procedures: `studentized_range_critical.csv` and `dunnett.csv` at the degrees of freedom
/// that complete blocks can have.
#[test]
fn the_joint_procedures_have_the_critical_values_of_their_tables() {
    let mut compared = (0, 0);
    let critical = |treatments: u64, compare: &str, risk: &str, df: f64| -> Option<f64> {
        let blocks = df / (treatments - 1) as f64 + 1.0;
        if blocks.fract() != 0.0 || blocks < 2.0 || treatments > 20 {
            return None;
        }
        let names: Vec<_> = (0..treatments).map(|i| format!("t{i}")).collect();
        let design = format!("treatments: [{}]{compare}", names.join(", "));
        let problem = self::blocks(&design, 1.0, "kind: within, sd: 1", risk);
        let sizes = problem.sizes(blocks as u64).expect("small");
        problem.facts(&sizes).expect("they exist")["critical"].as_f64()
    };
    for row in table("studentized_range_critical.csv") {
        let (k, df) = (number(&row, "k") as u64, number(&row, "df"));
        let alpha = 1.0 - number(&row, "prob");
        if k < 3 || !df.is_finite() || !(1e-6..0.4).contains(&alpha) {
            continue;
        }
        let risk = format!("alpha: {alpha}, power: 0.99, multiplicity: tukey");
        if let Some(critical) = critical(k, "", &risk, df) {
            let expected = number(&row, "q") / std::f64::consts::SQRT_2;
            // The table gives q to a relative 5e-12, and 1 - prob has lost digits.
            assert!((critical / expected - 1.0).abs() < 1e-9, "{row:?}: {critical}");
            compared.0 += 1;
        }
    }
    for row in table("dunnett.csv") {
        let (k, df) = (number(&row, "k") as u64, number(&row, "df"));
        if k < 2 || !df.is_finite() || number(&row, "ratio_treat_to_control") != 1.0 {
            continue;
        }
        let risk = format!(
            "alpha: {}, sides: {}, power: 0.99, multiplicity: dunnett",
            row["alpha"],
            words(&row["sides"])
        );
        if let Some(critical) = critical(k + 1, ", control: t0", &risk, df) {
            assert!((critical - number(&row, "critical")).abs() < 1e-11, "{row:?}: {critical}");
            compared.1 += 1;
        }
    }
    assert!(compared.0 > 10 && compared.1 > 10, "{compared:?} rows were compared");
}

/// Without blocks the test is that of independent groups, whose table is `all_pairs_any_each.csv`.
#[test]
fn without_blocks_it_is_the_design_of_independent_groups() {
    let design = "treatments: [a, b, c, d], control: a";
    let spread = "kind: between, sd: 1.9, correlation: 0.4";
    let problem = blocks(design, 2.0, spread, "power: 0.9, multiplicity: sidak");
    let rivals = problem.rivals().expect("they exist");
    let found = rivals.into_iter().find(|rival| rival.id == "unblocked").expect("it is named");
    let RivalAnswer::Exact(unblocked) = found.answer else { panic!("it is solved exactly") };
    let yaml = "design: {groups: [a, b, c, d], control: a}\neffect: {difference: 2}\nspread: 1.9\n\
                risk: {power: 0.9, multiplicity: sidak}";
    let groups = read("parallel-means", yaml).expect("sound");
    for n in [2, 3, 8, 30] {
        let [here, there] = [&unblocked, &groups]
            .map(|p| p.power(&p.sizes(n).expect("small"), p.planned()).expect("it exists"));
        assert!((here - there).abs() < 1e-14, "{n}: {here} {there}");
    }
    let here = problem.power(&problem.sizes(8).expect("small"), problem.planned());
    assert!(
        here.expect("it exists")
            > unblocked.power(&sizes(&[8; 4]), problem.planned()).expect("exists")
    );
}

/// Raw data with block levels, the analysis of variance computed: shares of rejections lie within 4 standard errors of
/// the power and of the level, a false alarm in one of 16 000 seeds.
#[test]
fn the_simulated_analysis_of_variance_has_the_power() {
    let spread = "kind: between, sd: 2, correlation: 0.6";
    let problem = blocks("treatments: [a, b, c]", 2.0, spread, "multiplicity: each-at-alpha");
    let sizes = problem.sizes(5).expect("small");
    let trial = problem.trial(&sizes, problem.planned()).expect("it exists");
    let (mut scratch, mut planned, mut null) = (Vec::new(), [false; 3], [false; 3]);
    let (mut hits, mut alarms) = (0.0, 0.0);
    let studies = 40_000;
    let mut stream = Stream::new([5; 32], "test", 0);
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
    let place = |design: &str, rest: &str| {
        let yaml = format!(
            "design: {{{design}}}\neffect: {{difference: 1}}\nspread: {{kind: within, sd: 1}}\n{rest}"
        );
        let faults = read("randomised-blocks", &yaml).expect_err("the spec is wrong");
        faults.iter().map(|f| f.at.to_string()).collect::<Vec<_>>()
    };
    assert_eq!(place("treatments: [a]", ""), ["design.treatments"]);
    assert_eq!(place("treatments: [a, b, c], control: d", ""), ["design.control"]);
    assert_eq!(place("treatments: [a, b, c], compare: against-control", ""), ["design.compare"]);
    assert_eq!(place("treatments: [a, b, c]", "risk: {sides: one}"), ["risk.sides"]);
    assert_eq!(place("treatments: [a, b]", "risk: {multiplicity: sidak}"), ["risk.multiplicity"]);
}
