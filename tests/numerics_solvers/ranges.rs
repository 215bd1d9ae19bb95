use super::batteries::{Unit, check_round_trips, check_tails};
use super::tables::{Within, complaint, read, verify};
use proptest::prelude::*;
use sufficit::numerics::multivariate::{ShiftedRange, StudentizedRange};
use sufficit::numerics::{Continuous, NumericsError, StudentT};

fn range(means: u64, df: f64) -> StudentizedRange {
    StudentizedRange::new(means, df).expect("legal arguments")
}

#[test]
fn both_tails_match_the_reference_table() {
    // The table is accurate to 2e-14 absolute.
    verify(&read("studentized_range"), |row| {
        let unit = range(row.whole("k"), row.number("df"));
        let (q, cdf) = (row.number("q"), row.number("cdf"));
        let lower = unit.cdf(q).expect("a tail");
        let upper = unit.sf(q).expect("a tail");
        vec![
            complaint(row, "cdf", lower, cdf, Within::Absolute(4e-14)),
            complaint(row, "sf", upper, 1.0 - cdf, Within::Absolute(4e-14)),
        ]
    });
}

#[test]
fn critical_values_match_the_reference_table() {
    // The table is accurate to 5e-12 relative.
    verify(&read("studentized_range_critical"), |row| {
        let unit = range(row.whole("k"), row.number("df"));
        let (prob, q) = (row.number("prob"), row.number("q"));
        let lower = unit.quantile(prob).expect("a quantile");
        let upper = unit.upper_quantile(1.0 - prob).expect("a quantile");
        vec![
            complaint(row, "quantile", lower, q, Within::Relative(6e-12)),
            complaint(row, "upper quantile", upper, q, Within::Relative(6e-12)),
        ]
    });
}

#[test]
fn rare_shapes_match_panels_over_the_spread() {
    verify(&read("multivariate"), |row| {
        if row.text("kind") != "range" {
            return vec![];
        }
        let unit = range(row.whole("k_or_sides"), row.number("df"));
        let cdf = unit.cdf(row.number("critical")).expect("a tail");
        vec![complaint(row, "cdf", cdf, row.number("cdf"), Within::Relative(2e-13))]
    });
}

#[test]
fn critical_values_match_published_tables() {
    // Pearson, Hartley (1966), Biometrika Tables for Statisticians I, table 29, upper 5 % and 1 %; from memory.
    let published = [
        (3, 10.0, 0.05, 3.88),
        (4, 20.0, 0.05, 3.96),
        (5, 12.0, 0.05, 4.51),
        (10, 60.0, 0.05, 4.65),
        (3, 10.0, 0.01, 5.27),
        (6, 30.0, 0.01, 5.24),
        (4, f64::INFINITY, 0.05, 3.63),
    ];
    for (k, df, alpha, q) in published {
        let critical = range(k, df).upper_quantile(alpha).expect("a quantile");
        assert!((critical - q).abs() <= 0.0051, "{k} {df} {alpha}: {critical}");
    }
}

#[test]
fn two_means_are_a_t_test() {
    for df in [0.5, 1.0, 3.0, 17.5, 400.0, 1e6] {
        let t = StudentT::new(df).expect("a distribution");
        for q in [0.01, 0.7, 2.0, 5.0, 40.0] {
            let sf = 2.0 * t.sf(q * std::f64::consts::FRAC_1_SQRT_2).expect("a tail");
            let ours = range(2, df).sf(q).expect("a tail");
            assert!((ours / sf - 1.0).abs() < 1e-12, "{df} {q}: {ours:e} {sf:e}");
        }
    }
}

#[test]
fn the_battery_holds_over_the_domain() {
    let points = [1e-300, 1e-12, 0.01, 0.3, 1.0, 2.0, 3.5, 6.0, 12.0, 50.0, 1e4, 1e300];
    for (k, df) in
        [(2, 0.5), (3, 1.0), (3, 1e12), (7, 4.5), (50, 30.0), (1000, 2.0), (1000, f64::INFINITY)]
    {
        let unit = range(k, df);
        let unit = Unit {
            cdf: &|x| unit.cdf(x),
            sf: &|x| unit.sf(x),
            quantile: &|p| unit.quantile(p),
            upper_quantile: &|p| unit.upper_quantile(p),
        };
        assert_eq!(check_tails(&unit, &points), Ok(()), "{k} {df}");
        let probabilities = [1e-100, 1e-10, 0.01, 0.4, 0.9, 1.0 - 1e-9];
        assert_eq!(check_round_trips(&unit, &probabilities, 1e-11), Ok(()), "{k} {df}");
    }
}

#[test]
fn impossible_arguments_are_typed_errors() {
    for (k, df) in [(1, 5.0), (1001, 5.0), (3, 0.0), (3, f64::NAN), (3, -1.0)] {
        let refused = StudentizedRange::new(k, df);
        assert!(matches!(refused, Err(NumericsError::OutOfDomain { .. })), "{k} {df}");
    }
    let unit = range(3, 5.0);
    assert!(
        unit.cdf(f64::NAN).is_err() && unit.quantile(0.0).is_err() && unit.quantile(1.0).is_err()
    );
    assert_eq!((unit.cdf(-1.0), unit.sf(-1.0)), (Ok(0.0), Ok(1.0)));
    assert_eq!((unit.cdf(f64::INFINITY), unit.sf(f64::INFINITY)), (Ok(1.0), Ok(0.0)));
}

#[test]
fn power_to_find_any_pair_matches_the_reference_table() {
    verify(&read("all_pairs_any_each"), |row| {
        if row.text("family") != "all_pairs" || !row.has("any_power") {
            return vec![];
        }
        let n = row.list("n_per_group");
        let scale = n[0].sqrt() / row.number("sd");
        let means: Vec<f64> = row.list("means").iter().map(|mean| mean * scale).collect();
        let q = row.number("critical_t") * std::f64::consts::SQRT_2;
        let any = ShiftedRange::new(&means, row.number("df")).and_then(|range| range.sf(q));
        let any = any.expect("a power");
        vec![complaint(row, "any", any, row.number("any_power"), Within::Absolute(1e-12))]
    });
}

#[test]
fn equal_means_have_the_ordinary_range() {
    for (k, df, q) in [(3, 12.0, 3.0), (6, 2.0, 0.4), (4, f64::INFINITY, 5.5)] {
        let shifted = ShiftedRange::new(&vec![1.5; k], df).and_then(|range| range.sf(q));
        let ordinary = range(k as u64, df).sf(q).expect("a tail");
        assert!((shifted.expect("a tail") / ordinary - 1.0).abs() < 1e-12, "{k} {df} {q}");
    }
    assert!(ShiftedRange::new(&[1.0], 5.0).is_err());
    assert!(ShiftedRange::new(&[1.0, f64::NAN], 5.0).is_err());
    assert!(ShiftedRange::new(&[1.0, 2.0], 5.0).and_then(|range| range.sf(0.0)).is_err());
    let far = ShiftedRange::new(&[0.0, 1e6], 5.0).and_then(|range| range.sf(3.0));
    assert!(far.expect("a tail") > 1.0 - 1e-12);
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]
    #[test]
    fn tails_add_up_and_quantiles_invert(k in 2u64..60, log_df in -0.6f64..14.0, p in 1e-12f64..1.0) {
        let unit = range(k, libm::exp(log_df));
        let q = unit.upper_quantile(p).expect("a quantile");
        let (lower, upper) = (unit.cdf(q).expect("a tail"), unit.sf(q).expect("a tail"));
        prop_assert!((lower + upper - 1.0).abs() < 1e-12);
        prop_assert!((upper / p - 1.0).abs() < 1e-11, "{upper:e} for {p:e}");
        let wider = unit.sf(q * 1.01).expect("a tail");
        prop_assert!(wider <= upper);
    }
}
