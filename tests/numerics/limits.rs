//! Edges: infinities, ends of the support, special cases with closed forms, parameters out of range.

use sufficit::numerics::{
    Beta, ChiSquared, Continuous, FisherF, NoncentralBeta, NoncentralChiSquared, NoncentralF,
    NoncentralT, Normal, NumericsError, Result, StudentT,
};

fn close(value: f64, expected: f64, tolerance: f64) {
    assert!((value / expected - 1.0).abs() <= tolerance, "{value:e}, expected {expected:e}");
}

fn every_family() -> Result<Vec<Box<dyn Continuous>>> {
    Ok(vec![
        Box::new(Normal),
        Box::new(StudentT::new(3.0)?),
        Box::new(ChiSquared::new(3.0)?),
        Box::new(FisherF::new(3.0, 7.0)?),
        Box::new(Beta::new(1.5, 2.5)?),
        Box::new(NoncentralT::new(3.0, 1.5)?),
        Box::new(NoncentralT::new(3.0, -20.0)?),
        Box::new(NoncentralChiSquared::new(3.0, 2.0)?),
        Box::new(NoncentralF::new(3.0, 7.0, 2.0)?),
        Box::new(NoncentralBeta::new(1.5, 2.5, 2.0)?),
    ])
}

#[test]
fn infinities_and_not_a_number() -> Result<()> {
    for d in every_family()? {
        assert_eq!((d.cdf(f64::INFINITY)?, d.sf(f64::INFINITY)?), (1.0, 0.0));
        assert_eq!((d.cdf(f64::NEG_INFINITY)?, d.sf(f64::NEG_INFINITY)?), (0.0, 1.0));
        assert_eq!((d.density(f64::INFINITY)?, d.density(f64::NEG_INFINITY)?), (0.0, 0.0));
        assert_eq!(d.ln_sf(f64::INFINITY)?, f64::NEG_INFINITY);
        assert_eq!(d.ln_cdf(f64::INFINITY)?, 0.0);
        for refused in [d.cdf(f64::NAN), d.sf(f64::NAN), d.ln_cdf(f64::NAN), d.ln_density(f64::NAN)]
        {
            assert!(matches!(refused, Err(NumericsError::OutOfDomain { .. })), "{refused:?}");
        }
        for p in [f64::NAN, -1e-300, 1.0 + f64::EPSILON] {
            assert!(matches!(d.quantile(p), Err(NumericsError::OutOfDomain { name: "p", .. })));
            assert!(matches!(
                d.upper_quantile(p),
                Err(NumericsError::OutOfDomain { name: "p", .. })
            ));
        }
        assert_eq!(d.quantile(0.0)?, d.upper_quantile(1.0)?);
        assert_eq!(d.quantile(1.0)?, d.upper_quantile(0.0)?);
        assert_eq!(d.cdf(d.quantile(0.0)?)?, 0.0);
        assert_eq!(d.sf(d.quantile(1.0)?)?, 0.0);
    }
    Ok(())
}

#[test]
fn ends_of_the_support() -> Result<()> {
    for d in
        [&ChiSquared::new(3.0)? as &dyn Continuous, &FisherF::new(3.0, 7.0)?, &Beta::new(2.0, 3.0)?]
    {
        assert_eq!(
            (d.cdf(0.0)?, d.cdf(-1.0)?, d.density(-1.0)?, d.density(0.0)?),
            (0.0, 0.0, 0.0, 0.0)
        );
    }
    assert_eq!(Beta::new(2.0, 3.0)?.sf(1.0)?, 0.0);
    // Densities that start at a finite value: exp(-x/2)/2, the F with two numerator degrees, 3 (1 - x)².
    close(ChiSquared::new(2.0)?.density(0.0)?, 0.5, 1e-15);
    close(FisherF::new(2.0, 9.0)?.density(0.0)?, 1.0, 1e-15);
    close(Beta::new(1.0, 3.0)?.density(0.0)?, 3.0, 1e-15);
    close(NoncentralChiSquared::new(2.0, 3.0)?.density(0.0)?, 0.5 * libm::exp(-1.5), 1e-14);
    assert_eq!(ChiSquared::new(1.0)?.density(0.0)?, f64::INFINITY);
    Ok(())
}

#[test]
fn densities_join_their_ends() -> Result<()> {
    let families: [&dyn Continuous; 4] = [
        &FisherF::new(2.0, 9.0)?,
        &Beta::new(1.0, 3.0)?,
        &NoncentralF::new(2.0, 9.0, 3.0)?,
        &NoncentralBeta::new(1.0, 3.0, 3.0)?,
    ];
    for d in families {
        close(d.density(1e-14)?, d.density(0.0)?, 1e-12);
    }
    let at_one: [&dyn Continuous; 2] =
        [&Beta::new(3.0, 1.0)?, &NoncentralBeta::new(3.0, 1.0, 4.0)?];
    for d in at_one {
        close(d.density(1.0 - 1e-14)?, d.density(1.0)?, 1e-12);
    }
    Ok(())
}

#[test]
fn closed_forms() -> Result<()> {
    // Cauchy, exponential, and the t distribution with two degrees of freedom.
    close(StudentT::new(1.0)?.sf(1e200)?, 1e-200 / core::f64::consts::PI, 1e-12);
    close(StudentT::new(1.0)?.cdf(-1.0)?, 0.25, 1e-15);
    close(ChiSquared::new(2.0)?.sf(1400.0)?, libm::exp(-700.0), 1e-13);
    close(StudentT::new(2.0)?.upper_quantile(0.05)?, 0.9 / (2.0_f64 * 0.0475).sqrt(), 1e-14);
    close(Beta::new(1.0, 7.0)?.sf(0.9)?, libm::pow(1.0 - 0.9, 7.0), 1e-14);
    // With two numerator degrees of freedom the F tail is (1 + 2x/ν)^(-ν/2).
    close(FisherF::new(2.0, 6.0)?.sf(1e50)?, libm::pow(1e50 / 3.0, -3.0), 1e-12);
    Ok(())
}

#[test]
fn families_that_coincide() -> Result<()> {
    for t in [0.3, 2.0, 17.0] {
        for (df, ncp) in [(3.0, 0.7), (40.0, 2.5), (200.0, 11.0), (6.0, 14.0), (900.0, 40.0)] {
            let (two_sided, f) =
                (NoncentralT::new(df, ncp)?, NoncentralF::new(1.0, df, ncp * ncp)?);
            let (outside, inside) = (two_sided.sf(t)? + two_sided.cdf(-t)?, f.sf(t * t)?);
            close(outside, inside, 1e-12);
            // The odds of an F variable, over one plus the odds, are a beta variable.
            let fraction = t * t / (t * t + df);
            close(NoncentralBeta::new(0.5, 0.5 * df, ncp * ncp)?.sf(fraction)?, inside, 1e-12);
        }
    }
    // Known variance: the chi-squared statistic is the square of a shifted normal variable.
    for ncp in [0.5, 3.0, 30.0] {
        let direct = Normal.sf(4.0 - ncp)? + Normal.cdf(-4.0 - ncp)?;
        close(NoncentralChiSquared::new(1.0, ncp * ncp)?.sf(16.0)?, direct, 1e-12);
    }
    Ok(())
}

#[test]
fn degrees_of_freedom_without_end() -> Result<()> {
    for z in [-30.0, -2.0, 0.5, 2.0, 30.0] {
        close(StudentT::new(1e18)?.sf(z)?, Normal.sf(z)?, 1e-12);
        close(NoncentralT::new(1e18, 1.5)?.sf(z + 1.5)?, Normal.sf(z)?, 1e-11);
    }
    Ok(())
}

#[test]
fn tails_beyond_the_range_of_numbers() -> Result<()> {
    assert_eq!(Normal.sf(1e6)?, 0.0);
    close(Normal.ln_sf(1e6)?, -5e11, 1e-9);
    let t = NoncentralT::new(1e6, 40.0)?;
    assert_eq!(t.sf(300.0)?, 0.0);
    assert!(t.ln_sf(300.0)? < -3e4 && t.ln_sf(300.0)? > -4e4);
    let chi = NoncentralChiSquared::new(5.0, 10.0)?;
    assert_eq!(chi.sf(1e5)?, 0.0);
    // Leading term: -(sqrt(x) - sqrt(ncp))² / 2.
    close(chi.ln_sf(1e8)?, -0.5 * (1e4 - 10.0_f64.sqrt()) * (1e4 - 10.0_f64.sqrt()), 1e-6);
    close(chi.ln_sf(1e200)?, -5e199, 1e-12);
    Ok(())
}

#[test]
fn parameters_out_of_range() {
    for df in [0.0, -1.0, f64::NAN, f64::INFINITY, 1e19] {
        assert!(StudentT::new(df).is_err());
        assert!(ChiSquared::new(df).is_err());
        assert!(FisherF::new(df, 1.0).is_err() && FisherF::new(1.0, df).is_err());
        assert!(Beta::new(df, 1.0).is_err() && Beta::new(1.0, df).is_err());
        assert!(NoncentralT::new(df, 1.0).is_err());
        assert!(NoncentralF::new(df, 1.0, 1.0).is_err());
    }
    for ncp in [-1e-9, f64::NAN, f64::INFINITY, 1e13] {
        assert!(NoncentralChiSquared::new(1.0, ncp).is_err());
        assert!(NoncentralF::new(1.0, 1.0, ncp).is_err());
        assert!(NoncentralBeta::new(1.0, 1.0, ncp).is_err());
    }
    assert!(NoncentralT::new(1.0, 1e9).is_err());
}

/// Where the ways to the tail of Student's t meet: 16 and 24 degrees of freedom, `ln(1 + t²/df)` of 0.6 and 1. Values of
/// the incomplete beta function of mpmath 1.3.0 in 50 digits.
#[test]
fn student_tails_across_their_seams() -> Result<()> {
    let rows = [
        (0.5, 0.4, 0.399556243019837),
        (3.0, 1.5, 0.11529193262241153),
        (3.0, 1.6, 0.10395238170966165),
        (15.9, 3.6, 0.0012100435554004543),
        (16.0, 3.6, 0.0011996065105223952),
        (16.1, 3.7, 0.0009622969254358073),
        (23.9, 4.4, 9.62890716209921e-5),
        (24.0, 4.5, 7.40543981491647e-5),
        (24.0, 6.2, 1.0439850774752766e-6),
        (24.0, 6.4, 6.425131234652254e-7),
        (500.0, 25.0, 2.150429759761466e-90),
        (1e6, 0.001, 0.49960105788582454),
    ];
    for (df, t, tail) in rows {
        let d = StudentT::new(df)?;
        // Rounding the exponent costs half a unit in its last place.
        close(d.sf(t)?, tail, 4e-15 + 1.2e-16 * libm::log(tail).abs());
        let quantile = d.upper_quantile(tail)?;
        // Near the centre the quantile has only the digits that 1/2 minus the tail has.
        close(quantile, t, if t < 0.01 { 1e-12 } else { 2e-14 });
    }
    Ok(())
}
