use super::tables::{Within, complaint, read, verify};
use proptest::prelude::*;
use sufficit::numerics::multivariate::{owen_q, two_one_sided_power};
use sufficit::numerics::{Continuous, NoncentralT, NumericsError, StudentT};

#[test]
fn power_matches_the_reference_table() {
    // The table is accurate to 1e-14 absolute.
    verify(&read("owen_q"), |row| {
        let (mut theta, mut lower, mut upper) =
            (row.number("theta0"), row.number("lower"), row.number("upper"));
        if row.text("design") == "crossover_2x2_log" {
            (theta, lower, upper) = (libm::log(theta), libm::log(lower), libm::log(upper));
        }
        let se = row.number("se");
        let power = two_one_sided_power(
            (lower - theta) / se,
            (upper - theta) / se,
            row.number("df"),
            row.number("alpha"),
        );
        vec![complaint(
            row,
            "power",
            power.expect("a power"),
            row.number("power"),
            Within::Absolute(1e-14),
        )]
    });
}

#[test]
fn an_endless_range_gives_the_noncentral_t() {
    for df in [0.5, 1.0, 2.5, 7.0, 40.0, 3000.0, 1e8, 1e12] {
        for (t, delta) in [
            (1.0, 0.5),
            (-2.0, 1.0),
            (3.0, 3.3),
            (0.0, 0.7),
            (30.0, 25.0),
            (1.96, -3.0),
            (50.0, 80.0),
        ] {
            let exact = NoncentralT::new(df, delta).and_then(|nct| nct.cdf(t)).expect("a tail");
            let whole = owen_q(df, t, delta, f64::INFINITY).expect("a value");
            assert!((whole - exact).abs() < 1e-13, "{df} {t} {delta}: {whole} against {exact}");
        }
    }
}

#[test]
fn the_power_is_a_difference_of_two_values_of_owens_q() {
    for (df, a, b) in [(4.0, -3.0, 2.5), (22.0, -4.0, 4.0), (398.0, -6.0, 3.0)] {
        let t = StudentT::new(df).and_then(|t| t.upper_quantile(0.05)).expect("a quantile");
        let range = f64::sqrt(df) * (b - a) / (2.0 * t);
        let lower = owen_q(df, -t, -b, range).expect("a value");
        let upper = owen_q(df, t, -a, range).expect("a value");
        let power = two_one_sided_power(a, b, df, 0.05).expect("a power");
        assert!((lower - upper - power).abs() < 1e-13, "{df}: {power} against {}", lower - upper);
    }
}

#[test]
fn one_infinite_limit_leaves_one_t_test() {
    for (df, a, alpha) in [(5.0, -2.0, 0.05), (60.0, -3.1, 0.025)] {
        let t = StudentT::new(df).and_then(|t| t.upper_quantile(alpha)).expect("a quantile");
        let exact = NoncentralT::new(df, -a).and_then(|nct| nct.sf(t)).expect("a tail");
        let power = two_one_sided_power(a, f64::INFINITY, df, alpha).expect("a power");
        assert!((power - exact).abs() < 1e-13, "{power} against {exact}");
        let turned = two_one_sided_power(f64::NEG_INFINITY, -a, df, alpha).expect("a power");
        assert!((turned - exact).abs() < 1e-13);
    }
}

#[test]
fn impossible_arguments_are_typed_errors() {
    let refused = [
        owen_q(0.0, 1.0, 1.0, 1.0),
        owen_q(2e12, 1.0, 1.0, 1.0),
        owen_q(5.0, f64::INFINITY, 1.0, 1.0),
        owen_q(5.0, 1.0, f64::NAN, 1.0),
        owen_q(5.0, 1.0, 1.0, -1.0),
        two_one_sided_power(1.0, 1.0, 5.0, 0.05),
        two_one_sided_power(f64::NAN, 1.0, 5.0, 0.05),
        two_one_sided_power(-1.0, 1.0, 5.0, 0.5),
        two_one_sided_power(-1.0, 1.0, 5.0, 0.0),
    ];
    for result in refused {
        assert!(matches!(result, Err(NumericsError::OutOfDomain { .. })), "{result:?}");
    }
}

proptest! {
    #[test]
    fn power_is_a_probability_that_falls_with_the_bias(
        half in 0.1f64..20.0,
        bias in 0f64..1.0,
        log_df in -0.6f64..20.0,
        log_alpha in -20f64..-0.8,
    ) {
        let (df, alpha) = (libm::exp(log_df), libm::exp(log_alpha));
        let power = |bias: f64| two_one_sided_power(-half - bias, half - bias, df, alpha).expect("a power");
        let (here, farther) = (power(bias), power(bias + 0.1));
        prop_assert!((0.0..=1.0).contains(&here));
        prop_assert!(farther <= here + 1e-14, "{farther} after {here}");
        prop_assert!((power(-bias) - here).abs() < 1e-13);
    }

    #[test]
    fn owens_q_rises_with_its_limit(
        t in -1e3f64..1e3,
        delta in -1e3f64..1e3,
        b in 0f64..100.0,
        log_df in -0.6f64..27.0,
    ) {
        let df = libm::exp(log_df);
        let value = owen_q(df, t, delta, b).expect("a value");
        prop_assert!((-1e-14..=1.0 + 1e-13).contains(&value), "{value}");
        let more = owen_q(df, t, delta, b * 1.1 + 0.1).expect("a value");
        prop_assert!(more >= value - 1e-13, "{more} after {value}");
    }
}
