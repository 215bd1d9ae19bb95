use super::batteries::{Unit, check_round_trips, check_tails};
use super::tables::{Row, Within, complaint, read, verify};
use proptest::prelude::*;
use sufficit::numerics::multivariate::{Dunnett, ShiftedComparisons, Sides};
use sufficit::numerics::{Continuous, NumericsError, StudentT, normal_cdf};

fn sides(row: &Row, column: &str) -> Sides {
    match row.text(column) {
        "1" => Sides::One,
        "2" => Sides::Two,
        other => panic!("{other} sides"),
    }
}

#[test]
fn critical_values_match_the_reference_table() {
    // The table is accurate to 5e-12 absolute.
    verify(&read("dunnett"), |row| {
        let (k, df) = (row.whole("k") as usize, row.number("df"));
        let ratio = row.number("ratio_treat_to_control");
        let unit = Dunnett::from_sizes(1.0, &vec![ratio; k], sides(row, "sides"), df);
        let critical =
            unit.and_then(|unit| unit.upper_quantile(row.number("alpha"))).expect("a quantile");
        let same = Dunnett::equal(k, row.number("rho"), sides(row, "sides"), df);
        let same =
            same.and_then(|unit| unit.quantile(1.0 - row.number("alpha"))).expect("a quantile");
        let expected = row.number("critical");
        vec![
            complaint(row, "critical", critical, expected, Within::Absolute(6e-12)),
            complaint(row, "by correlation", same, expected, Within::Absolute(6e-12)),
        ]
    });
}

#[test]
fn unequal_loadings_match_panels_over_the_common_normal() {
    // The table is accurate to 1e-14 absolute.
    verify(&read("multivariate"), |row| {
        if row.text("kind") != "control" {
            return vec![];
        }
        let loadings = row.list("loadings");
        let unit =
            Dunnett::new(&loadings, sides(row, "k_or_sides"), row.number("df")).expect("legal");
        let (c, cdf) = (row.number("critical"), row.number("cdf"));
        vec![
            complaint(row, "cdf", unit.cdf(c).expect("a tail"), cdf, Within::Absolute(3e-14)),
            complaint(row, "sf", unit.sf(c).expect("a tail"), 1.0 - cdf, Within::Absolute(3e-14)),
        ]
    });
}

#[test]
fn critical_values_match_published_tables() {
    // Dunnett (1955, 1964), upper 5 % points for groups of equal size; two places, from memory.
    let published = [
        (Sides::One, 2, 10.0, 2.15),
        (Sides::One, 3, 20.0, 2.19),
        (Sides::Two, 2, 10.0, 2.57),
        (Sides::Two, 3, 20.0, 2.54),
        (Sides::Two, 4, 60.0, 2.51),
        (Sides::Two, 6, f64::INFINITY, 2.57),
    ];
    for (sides, k, df, c) in published {
        let unit = Dunnett::equal(k, 0.5, sides, df).expect("legal");
        let critical = unit.upper_quantile(0.05).expect("a quantile");
        assert!((critical - c).abs() <= 0.0051, "{sides:?} {k} {df}: {critical}");
    }
}

#[test]
fn one_comparison_is_a_t_test_and_independent_ones_multiply() {
    for df in [0.5, 1.0, 4.0, 33.3, 1e6] {
        let t = StudentT::new(df).expect("a distribution");
        for c in [-3.0, -0.2, 0.4, 2.0, 9.0, 300.0] {
            for rho in [0.0, 0.5, 0.97] {
                let one = Dunnett::equal(1, rho, Sides::One, df).and_then(|unit| unit.sf(c));
                let exact = t.sf(c).expect("a tail");
                if exact < 1e-250 {
                    continue;
                }
                let error = one.expect("a tail") / exact - 1.0;
                assert!(error.abs() < 1e-11, "{df} {c} {rho}: {error:e}");
            }
        }
    }
    for c in [0.3, 2.0] {
        let free = Dunnett::equal(4, 0.0, Sides::One, f64::INFINITY).and_then(|unit| unit.cdf(c));
        assert!((free.expect("a tail") - libm::pow(normal_cdf(c), 4.0)).abs() < 1e-14);
    }
}

#[test]
fn steep_loadings_agree_with_gentle_ones_where_both_apply() {
    // Correlation 1 leaves one comparison; next to 1 the quadrature changes its method.
    let one =
        Dunnett::equal(1, 0.5, Sides::Two, 12.0).and_then(|unit| unit.sf(2.0)).expect("a tail");
    let mut last =
        Dunnett::equal(5, 0.9, Sides::Two, 12.0).and_then(|unit| unit.sf(2.0)).expect("a tail");
    for rho in [0.99, 0.993, 0.9932, 0.99999, 1.0 - 1e-12] {
        let here =
            Dunnett::equal(5, rho, Sides::Two, 12.0).and_then(|unit| unit.sf(2.0)).expect("a tail");
        assert!(here < last && here > one, "{rho}: {here} after {last}, limit {one}");
        last = here;
    }
    assert!((last - one).abs() < 1e-6);
}

#[test]
fn the_battery_holds_over_the_domain() {
    let positive = [1e-300, 1e-12, 0.01, 0.3, 1.0, 2.0, 3.5, 6.0, 12.0, 50.0, 1e4, 1e300];
    let mut points: Vec<f64> = positive.iter().rev().map(|x| -x).collect();
    points.push(0.0);
    points.extend(positive);
    for (k, rho, df) in [
        (1, 0.5, 0.5),
        (3, 0.0, 1e12),
        (3, 0.5, 5.0),
        (100, 0.1, 1.0),
        (7, 0.999, 30.0),
        (2, 1.0 - 1e-9, 3.0),
    ] {
        for sides in [Sides::One, Sides::Two] {
            let unit = Dunnett::equal(k, rho, sides, df).expect("legal");
            let unit = Unit {
                cdf: &|x| unit.cdf(x),
                sf: &|x| unit.sf(x),
                quantile: &|p| unit.quantile(p),
                upper_quantile: &|p| unit.upper_quantile(p),
            };
            assert_eq!(check_tails(&unit, &points), Ok(()), "{k} {rho} {df} {sides:?}");
            let probabilities = [1e-100, 1e-10, 0.01, 0.4, 0.9, 1.0 - 1e-9];
            assert_eq!(
                check_round_trips(&unit, &probabilities, 1e-10),
                Ok(()),
                "{k} {rho} {df} {sides:?}"
            );
        }
    }
}

#[test]
fn impossible_arguments_are_typed_errors() {
    let refused = [
        Dunnett::new(&[], Sides::Two, 5.0),
        Dunnett::new(&[0.5, 1.0], Sides::Two, 5.0),
        Dunnett::new(&[f64::NAN], Sides::Two, 5.0),
        Dunnett::equal(0, 0.5, Sides::Two, 5.0),
        Dunnett::equal(usize::MAX, 0.5, Sides::Two, 5.0),
        Dunnett::equal(3, -0.1, Sides::Two, 5.0),
        Dunnett::equal(3, 0.5, Sides::Two, 0.0),
        Dunnett::from_sizes(0.0, &[3.0], Sides::Two, 5.0),
        Dunnett::from_sizes(4.0, &[3.0, f64::INFINITY], Sides::Two, 5.0),
    ];
    for result in refused {
        assert!(matches!(result, Err(NumericsError::OutOfDomain { .. })), "{result:?}");
    }
    let unit = Dunnett::equal(3, 0.5, Sides::Two, 5.0).expect("legal");
    assert!(
        unit.cdf(f64::NAN).is_err()
            && unit.quantile(0.0).is_err()
            && unit.upper_quantile(1.0).is_err()
    );
    assert!(ShiftedComparisons::new(&[(0.5, f64::NAN)], Sides::Two, 5.0).is_err());
    let shifted = ShiftedComparisons::new(&[(0.5, 1.0)], Sides::Two, 5.0).expect("legal");
    assert!(shifted.any_exceeds(0.0).is_err());
}

#[test]
fn power_against_a_control_matches_the_reference_table() {
    verify(&read("all_pairs_any_each"), |row| {
        if row.text("family") != "vs_control" || !row.has("any_power") {
            return vec![];
        }
        let (n, means, sd) = (row.list("n_per_group"), row.list("means"), row.number("sd"));
        let statistics: Vec<(f64, f64)> = (1..n.len())
            .map(|i| {
                let spread = sd * (1.0 / n[i] + 1.0 / n[0]).sqrt();
                ((n[i] / (n[i] + n[0])).sqrt(), (means[i] - means[0]) / spread)
            })
            .collect();
        let (df, c) = (row.number("df"), row.number("critical_t"));
        let power = |statistics: &[(f64, f64)]| {
            ShiftedComparisons::new(statistics, sides(row, "sides"), df).expect("legal")
        };
        let any = power(&statistics).any_exceeds(c).expect("a power");
        let mut complaints =
            vec![complaint(row, "any", any, row.number("any_power"), Within::Absolute(1e-12))];
        if row.has("all_power") {
            let different: Vec<_> =
                statistics.into_iter().filter(|&(_, shift)| shift != 0.0).collect();
            let all = power(&different).all_exceed(c).expect("a power");
            complaints.push(complaint(
                row,
                "all",
                all,
                row.number("all_power"),
                Within::Absolute(1e-12),
            ));
        }
        complaints
    });
}

#[test]
fn a_single_shifted_comparison_is_a_noncentral_t() {
    for (df, shift, c) in
        [(3.0, 2.0, 2.5), (20.0, -1.0, 2.1), (500.0, 40.0, 38.0), (8.0, 300.0, 250.0)]
    {
        let t = sufficit::numerics::NoncentralT::new(df, shift).expect("a distribution");
        let exact = t.sf(c).expect("a tail");
        let one = ShiftedComparisons::new(&[(0.6, shift)], Sides::One, df)
            .and_then(|unit| unit.any_exceeds(c));
        let one = one.expect("a power");
        assert!((one - exact).abs() < 1e-12, "{df} {shift} {c}: {one} {exact}");
        let both = ShiftedComparisons::new(&[(0.6, shift)], Sides::Two, df)
            .and_then(|unit| unit.all_exceed(c));
        let exact = exact + t.cdf(-c).expect("a tail");
        assert!((both.expect("a power") - exact).abs() < 1e-12, "{df} {shift} {c}");
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]
    #[test]
    fn tails_add_up_and_quantiles_invert(
        loadings in prop::collection::vec(-0.99f64..0.99, 1..6),
        log_df in -0.6f64..14.0,
        p in 1e-9f64..1.0,
        two in any::<bool>(),
    ) {
        let sides = if two { Sides::Two } else { Sides::One };
        let unit = Dunnett::new(&loadings, sides, libm::exp(log_df)).expect("legal");
        let c = unit.upper_quantile(p).expect("a quantile");
        let (lower, upper) = (unit.cdf(c).expect("a tail"), unit.sf(c).expect("a tail"));
        prop_assert!((lower + upper - 1.0).abs() < 1e-12);
        prop_assert!((upper / p - 1.0).abs() < 1e-10, "{upper:e} for {p:e}");
        prop_assert!(unit.sf(c + 0.01).expect("a tail") <= upper);
    }
}
