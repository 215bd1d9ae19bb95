//! Reference tables: every row of every table against the function of the same name.
//!
//! The `.csv` tables hold values of 17 digits from 50-digit arithmetic (the column `source` of each row names the
//! method and its check). The `.tsv` tables are written by `tests/reference/generate.py`, which covers what they leave
//! out: central tails, degrees of freedom up to 1e12, noncentralities up to 1e6, densities.

use crate::functions::evaluate;

/// Every tail and density, both tails down to 1e-290: one tolerance for the whole domain of the tables.
///
/// The condition of the problem itself reaches 3e-13 at the ends of the domain (an exponent of -690, or a standard
/// deviation of a thousandth of an argument that is known to 1e-16).
const TAIL_TOLERANCE: f64 = 1e-12;

/// Quantiles, relative.
const QUANTILE_TOLERANCE: f64 = 1e-13;

/// Relative difference; two zeros agree.
fn relative_error(value: f64, expected: f64) -> f64 {
    if value == expected { 0.0 } else { ((value - expected) / expected).abs() }
}

/// One comparison, as it is reported when it fails.
struct Comparison {
    call: String,
    value: f64,
    expected: f64,
}

fn compare(name: &str, arguments: &[&str], expected: &str) -> Comparison {
    let call = format!("{name}({})", arguments.join(", "));
    let value =
        evaluate(name, arguments.iter().copied()).unwrap_or_else(|error| panic!("{call}: {error}"));
    let expected = expected.parse().unwrap_or_else(|_| panic!("{call}: bad expected value"));
    Comparison { call, value, expected }
}

/// Asserts a whole table at once, so that a failure shows how much of it is wrong.
fn assert_table(comparisons: &[Comparison], at_least: usize, tolerance: f64) {
    assert!(comparisons.len() >= at_least, "only {} comparisons", comparisons.len());
    let failures: Vec<String> = comparisons
        .iter()
        .filter(|row| {
            let error = relative_error(row.value, row.expected);
            error.is_nan() || error > tolerance
        })
        .map(|row| {
            let error = relative_error(row.value, row.expected);
            format!("{}: {:e}, expected {:e}, error {error:e}", row.call, row.value, row.expected)
        })
        .collect();
    assert!(failures.is_empty(), "{} rows:\n{}", failures.len(), failures.join("\n"));
}

/// Rows of a comma-separated table without its header.
fn csv_rows(text: &str) -> Vec<Vec<&str>> {
    text.lines().skip(1).map(|line| line.split(',').collect()).collect()
}

/// Both tails of a table whose columns are the arguments, `cdf`, `sf`.
fn tail_comparisons(text: &str, name: &str, arguments: usize) -> Vec<Comparison> {
    let mut comparisons = Vec::new();
    for row in csv_rows(text) {
        let (given, values) = row.split_at(arguments);
        comparisons.push(compare(&format!("{name}_cdf"), given, values[0]));
        comparisons.push(compare(&format!("{name}_sf"), given, values[1]));
    }
    comparisons
}

/// A table of `generate.py`: function, arguments, expected.
fn generated_comparisons(text: &str) -> Vec<Comparison> {
    text.lines()
        .filter(|line| !line.starts_with('#'))
        .skip(1)
        .map(|line| {
            let fields: Vec<&str> = line.split('\t').collect();
            let arguments: Vec<&str> = fields[1].split(',').collect();
            compare(fields[0], &arguments, fields[2])
        })
        .collect()
}

#[test]
fn noncentral_t_tails() {
    let text = include_str!("../reference/noncentral_t_cdf.csv");
    assert_table(&tail_comparisons(text, "noncentral_t", 3), 600, TAIL_TOLERANCE);
}

#[test]
fn noncentral_f_tails() {
    let text = include_str!("../reference/noncentral_f_cdf.csv");
    assert_table(&tail_comparisons(text, "noncentral_f", 4), 400, TAIL_TOLERANCE);
}

#[test]
fn noncentral_chi_squared_tails() {
    let text = include_str!("../reference/noncentral_chi2_cdf.csv");
    assert_table(&tail_comparisons(text, "noncentral_chi2", 3), 300, TAIL_TOLERANCE);
}

#[test]
fn quantiles() {
    let comparisons: Vec<Comparison> = csv_rows(include_str!("../reference/quantiles.csv"))
        .iter()
        .map(|row| {
            let name =
                format!("{}_{}quantile", row[0], if row[3] == "upper" { "upper_" } else { "" });
            let mut arguments = Vec::new();
            if row[0] != "normal" {
                arguments.extend(row[1..3].iter().copied().filter(|field| !field.is_empty()));
            }
            arguments.push(row[4]);
            compare(&name, &arguments, row[5])
        })
        .collect();
    assert_table(&comparisons, 300, QUANTILE_TOLERANCE);
}

#[test]
fn generated_central_tails() {
    let text = include_str!("../reference/central_tails.tsv");
    assert_table(&generated_comparisons(text), 300, TAIL_TOLERANCE);
}

#[test]
fn generated_noncentral_tails() {
    let text = include_str!("../reference/noncentral_tails.tsv");
    assert_table(&generated_comparisons(text), 400, TAIL_TOLERANCE);
}

#[test]
fn generated_densities() {
    let text = include_str!("../reference/densities.tsv");
    assert_table(&generated_comparisons(text), 80, TAIL_TOLERANCE);
}

#[test]
#[should_panic(expected = "1 rows")]
fn a_wrong_digit_is_caught() {
    // The twelfth digit of a tail of 1e-13 altered.
    assert_table(
        &[compare("noncentral_t_sf", &["1e12", "2.8", "10"], "3.01062798518e-13")],
        1,
        TAIL_TOLERANCE,
    );
}

#[test]
fn a_right_value_passes() {
    assert_table(
        &[compare("noncentral_t_sf", &["1e12", "2.8", "10"], "3.0106279851470152502e-13")],
        1,
        TAIL_TOLERANCE,
    );
}
