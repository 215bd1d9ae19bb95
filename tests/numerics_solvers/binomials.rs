use super::tables::{Within, complaint, read, verify};
use proptest::prelude::*;
use sufficit::numerics::NumericsError;
use sufficit::numerics::discrete::{Binomial, Hypergeometric, Poisson};

#[test]
fn binomial_probabilities_match_the_reference_table() {
    verify(&read("binomial"), |row| {
        let unit = Binomial::new(row.whole("n"), row.number("p")).expect("legal");
        let k = row.whole("k");
        vec![
            complaint(row, "pmf", unit.pmf(k), row.number("pmf"), Within::Relative(1e-12)),
            complaint(row, "cdf", unit.cdf(k), row.number("cdf"), Within::Relative(1e-12)),
            complaint(row, "sf", unit.sf(k), row.number("sf"), Within::Relative(1e-12)),
        ]
    });
}

#[test]
fn poisson_probabilities_match_the_reference_table() {
    verify(&read("poisson"), |row| {
        let unit = Poisson::new(row.number("mean")).expect("legal");
        let k = row.whole("k");
        vec![
            complaint(row, "pmf", unit.pmf(k), row.number("pmf"), Within::Relative(1e-12)),
            complaint(row, "cdf", unit.cdf(k), row.number("cdf"), Within::Relative(1e-12)),
            complaint(row, "sf", unit.sf(k), row.number("sf"), Within::Relative(1e-12)),
        ]
    });
}

#[test]
fn hypergeometric_probabilities_match_the_reference_table() {
    verify(&read("hypergeometric"), |row| {
        let (n1, n2, m) = (row.whole("n1"), row.whole("n2"), row.whole("m"));
        let unit =
            Hypergeometric::with_odds_ratio(n1, n2, m, row.number("odds_ratio")).expect("legal");
        let x = row.whole("x");
        vec![
            complaint(row, "pmf", unit.pmf(x), row.number("pmf"), Within::Relative(1e-12)),
            complaint(row, "cdf", unit.cdf(x), row.number("cdf"), Within::Relative(1e-12)),
            complaint(row, "sf", unit.sf(x), row.number("sf"), Within::Relative(1e-12)),
            complaint(row, "mean", unit.mean(), row.number("mean"), Within::Relative(1e-12)),
        ]
    });
}

/// What a count distribution must do, for every value of a small one.
fn check_small(
    highest: u64,
    pmf: impl Fn(u64) -> f64,
    cdf: impl Fn(u64) -> f64,
    sf: impl Fn(u64) -> f64,
) -> Result<(), String> {
    let mut sum = 0.0;
    for k in 0..=highest {
        sum += pmf(k);
        if (cdf(k) - sum).abs() > 1e-13 {
            return Err(format!("cdf({k}) is {} and not {sum}", cdf(k)));
        }
        if (cdf(k) + sf(k) - 1.0).abs() > 1e-14 {
            return Err(format!("tails at {k} do not add up to 1"));
        }
    }
    if (sum - 1.0).abs() > 1e-13 {
        return Err(format!("the probabilities add up to {sum}"));
    }
    Ok(())
}

#[test]
fn small_distributions_are_whole() {
    for n in 0..60 {
        for p in [0.0, 1e-12, 0.2, 0.5, 0.93, 1.0] {
            let unit = Binomial::new(n, p).expect("legal");
            assert_eq!(
                check_small(n, |k| unit.pmf(k), |k| unit.cdf(k), |k| unit.sf(k)),
                Ok(()),
                "{n} {p}"
            );
        }
    }
    for n1 in 0..12 {
        for n2 in 0..12 {
            for m in 0..=n1 + n2 {
                for odds in [1e-30, 0.3, 1.0, 7.0, 1e30] {
                    let unit = Hypergeometric::with_odds_ratio(n1, n2, m, odds).expect("legal");
                    let whole = check_small(n1, |k| unit.pmf(k), |k| unit.cdf(k), |k| unit.sf(k));
                    assert_eq!(whole, Ok(()), "{n1} {n2} {m} {odds}");
                }
            }
        }
    }
    let unit = Poisson::new(3.2).expect("legal");
    assert_eq!(check_small(60, |k| unit.pmf(k), |k| unit.cdf(k), |k| unit.sf(k)), Ok(()));
}

#[test]
fn the_check_of_small_distributions_catches_wrong_ones() {
    let unit = Binomial::new(10, 0.3).expect("legal");
    assert!(check_small(10, |k| 2.0 * unit.pmf(k), |k| unit.cdf(k), |k| unit.sf(k)).is_err());
    assert!(check_small(10, |k| unit.pmf(k), |k| unit.cdf(k + 1), |k| unit.sf(k + 1)).is_err());
    assert!(check_small(10, |k| unit.pmf(k), |k| unit.cdf(k), |k| unit.sf(k) + 1e-12).is_err());
    assert!(check_small(9, |k| unit.pmf(k), |k| unit.cdf(k), |k| unit.sf(k)).is_err());
}

#[test]
fn quantiles_are_the_first_counts_that_reach_a_probability() {
    let unit = Binomial::new(30, 0.4).expect("legal");
    for k in 0..30 {
        assert_eq!(unit.quantile(unit.cdf(k)), Ok(k));
        assert_eq!(unit.upper_quantile(unit.sf(k)), Ok(k));
    }
    assert_eq!(
        (unit.quantile(0.0), unit.quantile(1.0), unit.upper_quantile(0.0)),
        (Ok(0), Ok(30), Ok(30))
    );
    let unit = Poisson::new(1e6).expect("legal");
    let k = unit.upper_quantile(1e-200).expect("a count");
    assert!(unit.sf(k) <= 1e-200 && unit.sf(k - 1) > 1e-200);
    let unit = Hypergeometric::new(30, 20, 25).expect("legal");
    for k in unit.lowest()..unit.highest() {
        assert_eq!(unit.quantile(unit.cdf(k)), Ok(k));
    }
}

#[test]
fn impossible_arguments_are_typed_errors() {
    let refused = [
        Binomial::new(3, -0.1).err(),
        Binomial::new(u64::MAX, 0.1).err(),
        Poisson::new(f64::NAN).err(),
        Poisson::new(-1.0).err(),
        Hypergeometric::new(3, 3, 7).err(),
        Hypergeometric::new(u64::MAX, 3, 7).err(),
        Hypergeometric::with_odds_ratio(3, 3, 3, 0.0).err(),
        Binomial::new(3, 0.5).and_then(|unit| unit.quantile(1.5)).err(),
        Poisson::new(3.0).and_then(|unit| unit.quantile(1.0)).err(),
        Poisson::new(3.0).and_then(|unit| unit.upper_quantile(0.0)).err(),
    ];
    for error in refused {
        assert!(matches!(error, Some(NumericsError::OutOfDomain { .. })), "{error:?}");
    }
}

proptest! {
    #[test]
    fn binomial_tails_of_any_size(n in 0u64..=1 << 53, p in 0f64..=1.0, share in 0f64..=1.0) {
        let unit = Binomial::new(n, p).expect("legal");
        let k = (n as f64 * share) as u64;
        let (pmf, cdf, sf) = (unit.pmf(k), unit.cdf(k), unit.sf(k));
        prop_assert!((0.0..=1.0).contains(&pmf) && (0.0..=1.0).contains(&cdf) && (0.0..=1.0).contains(&sf));
        prop_assert!((cdf + sf - 1.0).abs() < 1e-12);
        prop_assert!(pmf <= cdf * (1.0 + 1e-9));
        prop_assert!((unit.at_least(k) - (sf + pmf)).abs() < 1e-9);
    }

    #[test]
    fn poisson_tails_of_any_size(log_mean in -300f64..36.0, spread in -40f64..40.0) {
        let mean = libm::exp(log_mean);
        let unit = Poisson::new(mean).expect("legal");
        let k = (mean + spread * mean.sqrt()).max(0.0) as u64;
        let (pmf, cdf, sf) = (unit.pmf(k), unit.cdf(k), unit.sf(k));
        prop_assert!((0.0..=1.0).contains(&pmf) && (0.0..=1.0).contains(&cdf) && (0.0..=1.0).contains(&sf));
        prop_assert!((cdf + sf - 1.0).abs() < 1e-12);
    }

    #[test]
    fn hypergeometric_tails_of_any_size(n1 in 0u64..100_000, n2 in 0u64..100_000, share in 0f64..=1.0, log_odds in -700f64..700.0, at in 0f64..=1.0) {
        let m = ((n1 + n2) as f64 * share) as u64;
        let unit = Hypergeometric::with_odds_ratio(n1, n2, m, libm::exp(log_odds)).expect("legal");
        let x = unit.lowest() + ((unit.highest() - unit.lowest()) as f64 * at) as u64;
        let (pmf, cdf, sf) = (unit.pmf(x), unit.cdf(x), unit.sf(x));
        prop_assert!((0.0..=1.0 + 1e-12).contains(&pmf) && (0.0..=1.0 + 1e-12).contains(&cdf) && (0.0..=1.0 + 1e-12).contains(&sf), "{pmf} {cdf} {sf}");
        prop_assert!((cdf + sf - 1.0).abs() < 1e-12);
        let mean = unit.mean();
        prop_assert!(mean >= unit.lowest() as f64 - 1e-6 && mean <= unit.highest() as f64 + 1e-6);
    }
}
