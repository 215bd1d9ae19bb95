//! Values printed in published tables, to the digits printed there. All entries are quoted from memory.

use sufficit::numerics::{
    ChiSquared, Continuous, FisherF, NoncentralChiSquared, NoncentralF, NoncentralT, Normal,
    Result, StudentT,
};

fn printed(value: f64, expected: f64, digits_after_point: i32) {
    let half_unit = 0.5 * libm::pow(10.0, f64::from(-digits_after_point));
    assert!((value - expected).abs() <= half_unit * 1.0001, "{value}, printed {expected}");
}

/// Pearson, Hartley (1966), Biometrika Tables for Statisticians I, table 12: percentage points of the t distribution.
#[test]
fn student_t() -> Result<()> {
    for (df, upper, point) in [
        (1.0, 0.025, 12.706),
        (2.0, 0.025, 4.303),
        (5.0, 0.025, 2.571),
        (10.0, 0.025, 2.228),
        (10.0, 0.005, 3.169),
        (20.0, 0.05, 1.725),
        (30.0, 0.025, 2.042),
        (60.0, 0.005, 2.660),
        (120.0, 0.025, 1.980),
    ] {
        printed(StudentT::new(df)?.upper_quantile(upper)?, point, 3);
    }
    Ok(())
}

/// The same volume, table 8: percentage points of the chi-squared distribution.
#[test]
fn chi_squared() -> Result<()> {
    for (df, upper, point) in [
        (1.0, 0.05, 3.841),
        (2.0, 0.05, 5.991),
        (5.0, 0.01, 15.086),
        (10.0, 0.05, 18.307),
        (10.0, 0.95, 3.940),
        (20.0, 0.05, 31.410),
        (30.0, 0.05, 43.773),
    ] {
        printed(ChiSquared::new(df)?.upper_quantile(upper)?, point, 3);
    }
    Ok(())
}

/// The same volume, table 18: percentage points of the F distribution.
#[test]
fn fisher_f() -> Result<()> {
    for (df1, df2, upper, point) in [
        (1.0, 10.0, 0.05, 4.96),
        (2.0, 10.0, 0.05, 4.10),
        (3.0, 20.0, 0.05, 3.10),
        (4.0, 30.0, 0.01, 4.02),
        (5.0, 5.0, 0.05, 5.05),
        (10.0, 20.0, 0.01, 3.37),
    ] {
        printed(FisherF::new(df1, df2)?.upper_quantile(upper)?, point, 2);
    }
    Ok(())
}

/// The constants of every textbook on statistics.
#[test]
fn normal() -> Result<()> {
    for (upper, point) in [
        (0.025, 1.959_964),
        (0.05, 1.644_854),
        (0.005, 2.575_829),
        (0.2, 0.841_621),
        (0.1, 1.281_552),
    ] {
        printed(Normal.upper_quantile(upper)?, point, 6);
    }
    Ok(())
}

/// Noncentrality for a 5 % test and a power of 80 % and 90 %: Haynam, Govindarajulu, Leone (1970), Selected Tables in
/// Mathematical Statistics I, as commonly reprinted.
#[test]
fn noncentral_chi_squared() -> Result<()> {
    for (df, power, ncp) in [
        (1.0, 0.8, 7.849),
        (2.0, 0.8, 9.635),
        (3.0, 0.8, 10.903),
        (4.0, 0.8, 11.935),
        (5.0, 0.8, 12.828),
        (1.0, 0.9, 10.507),
        (2.0, 0.9, 12.654),
        (3.0, 0.9, 14.171),
    ] {
        let critical = ChiSquared::new(df)?.upper_quantile(0.05)?;
        printed(NoncentralChiSquared::ncp_for_sf(df, critical, power)?, ncp, 3);
    }
    Ok(())
}

/// Cohen (1988), Statistical Power Analysis for the Behavioral Sciences, tables 2.3.5 (two-sided t test, 5 %) and 8.3
/// (F test, 5 %): two printed digits.
#[test]
fn power_tables() -> Result<()> {
    for (n, d, power) in
        [(50.0, 0.5, 0.70), (20.0, 0.8, 0.69), (100.0, 0.2, 0.29), (64.0, 0.5, 0.80)]
    {
        let df = 2.0 * n - 2.0;
        let critical = StudentT::new(df)?.upper_quantile(0.025)?;
        let statistic = NoncentralT::new(df, d * (0.5_f64 * n).sqrt())?;
        printed(statistic.sf(critical)? + statistic.cdf(-critical)?, power, 2);
    }
    for (groups, n, effect, power) in
        [(3.0, 52.0, 0.25, 0.80), (4.0, 45.0, 0.25, 0.80), (4.0, 18.0, 0.4, 0.80)]
    {
        let (df1, df2) = (groups - 1.0, groups * (n - 1.0));
        let critical = FisherF::new(df1, df2)?.upper_quantile(0.05)?;
        let statistic = NoncentralF::new(df1, df2, groups * n * effect * effect)?;
        printed(statistic.sf(critical)?, power, 2);
    }
    Ok(())
}
