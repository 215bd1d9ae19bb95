//! The noncentrality from a tail: the inverse that a detectable effect needs.

use proptest::prelude::*;
use sufficit::numerics::{
    Continuous, NoncentralBeta, NoncentralChiSquared, NoncentralF, NoncentralT, NumericsError,
    Result,
};

/// `sf` and `cdf` at the noncentrality found for them, relative to what was asked.
fn round_trip(
    ncp: Result<f64>,
    p: f64,
    tail: impl Fn(f64) -> Result<f64>,
) -> std::result::Result<f64, NumericsError> {
    Ok((tail(ncp?)? / p - 1.0).abs())
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(1000))]

    #[test]
    fn of_t(df in 1.0..2000.0_f64, x in -30.0..30.0_f64, p in 1e-12..1.0_f64) {
        let sf = round_trip(NoncentralT::ncp_for_sf(df, x, p), p, |ncp| NoncentralT::new(df, ncp)?.sf(x));
        prop_assert!(sf.clone()? < 1e-12, "{:?}", sf);
        let cdf = round_trip(NoncentralT::ncp_for_cdf(df, x, p), p, |ncp| NoncentralT::new(df, ncp)?.cdf(x));
        prop_assert!(cdf.clone()? < 1e-12, "{:?}", cdf);
    }

    #[test]
    fn of_chi_squared(df in 0.5..2000.0_f64, tail in 1e-6..0.5_f64, share in 0.001..0.999_f64) {
        let x = NoncentralChiSquared::new(df, 0.0)?.upper_quantile(tail)?;
        let p = tail + share * (1.0 - tail);
        let sf = round_trip(NoncentralChiSquared::ncp_for_sf(df, x, p), p, |ncp| {
            NoncentralChiSquared::new(df, ncp)?.sf(x)
        });
        prop_assert!(sf.clone()? < 1e-12, "{:?}", sf);
        let beta = (1.0 - tail) * share;
        let cdf = round_trip(NoncentralChiSquared::ncp_for_cdf(df, x, beta), beta, |ncp| {
            NoncentralChiSquared::new(df, ncp)?.cdf(x)
        });
        prop_assert!(cdf.clone()? < 1e-12, "{:?}", cdf);
    }

    #[test]
    fn of_f_and_beta(
        df1 in 0.5..100.0_f64, df2 in 0.5..1e5_f64, tail in 1e-6..0.5_f64, share in 0.001..0.99_f64,
    ) {
        let x = NoncentralF::new(df1, df2, 0.0)?.upper_quantile(tail)?;
        let p = tail + share * (1.0 - tail);
        let sf = round_trip(NoncentralF::ncp_for_sf(df1, df2, x, p), p, |ncp| {
            NoncentralF::new(df1, df2, ncp)?.sf(x)
        });
        prop_assert!(sf.clone()? < 1e-12, "{:?}", sf);
        let (a, b) = (0.5 * df1, 0.5 * df2);
        let fraction = NoncentralBeta::new(a, b, 0.0)?.upper_quantile(tail)?;
        prop_assume!(fraction < 0.999);
        let sf = round_trip(NoncentralBeta::ncp_for_sf(a, b, fraction, p), p, |ncp| {
            NoncentralBeta::new(a, b, ncp)?.sf(fraction)
        });
        prop_assert!(sf.clone()? < 1e-12, "{:?}", sf);
    }
}

#[test]
fn power_of_eighty_per_cent() -> Result<()> {
    // Two-sided 5 % test with one degree of freedom: (1.959964 + 0.841621)² = 7.849, the constant of every textbook.
    let ncp = NoncentralChiSquared::ncp_for_sf(1.0, 3.841_458_820_694_124, 0.8)?;
    assert!((ncp - 7.848_861).abs() < 2e-6, "{ncp}");
    Ok(())
}

#[test]
fn a_tail_out_of_reach_is_refused() {
    // The upper tail of the central distribution is 0.05 already: no noncentrality makes it smaller.
    let refused = NoncentralChiSquared::ncp_for_sf(1.0, 3.841_458_820_694_124, 0.01);
    assert!(matches!(refused, Err(NumericsError::OutOfDomain { name: "p", .. })), "{refused:?}");
    let refused = NoncentralF::ncp_for_cdf(2.0, 20.0, 3.5, 0.99);
    assert!(matches!(refused, Err(NumericsError::OutOfDomain { name: "p", .. })), "{refused:?}");
    for p in [0.0, 1.0, -0.1, f64::NAN] {
        assert!(NoncentralT::ncp_for_sf(10.0, 2.0, p).is_err(), "{p}");
    }
    assert!(NoncentralBeta::ncp_for_sf(1.0, 2.0, 1.0, 0.5).is_err());
}
