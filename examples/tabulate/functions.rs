//! The table of functions that `tabulate` offers; the reference tests call them by the same names.

use sufficit::numerics::discrete::{
    Alternative, Binomial, Hypergeometric, Poisson, ProportionTest, TwoBinomialRegion,
};
use sufficit::numerics::multivariate::{
    BivariateNormal, Dunnett, Sides, StudentizedRange, owen_q, two_one_sided_power,
};
use sufficit::numerics::{
    Beta, ChiSquared, Continuous, FisherF, NoncentralBeta, NoncentralChiSquared, NoncentralF,
    NoncentralT, Normal, NumericsError, Result, StudentT,
};

/// A function of the table: its name, its arguments, and what it computes.
pub struct Entry {
    /// Name in the first field of a line.
    pub name: &'static str,
    /// Names of the arguments, in their order.
    pub arguments: &'static [&'static str],
    compute: fn(&[f64]) -> Result<f64>,
}

/// Shorthand for an entry: the pattern takes the arguments apart, in their order.
macro_rules! entry {
    ($name:literal, $($argument:ident),+ => $value:expr) => {
        Entry {
            name: $name,
            arguments: &[$(stringify!($argument)),+],
            compute: |arguments| match *arguments {
                [$($argument),+] => $value,
                _ => Err(NumericsError::OutOfDomain {
                    name: "number of arguments",
                    given: arguments.len() as f64,
                    allowed: "as listed by --list",
                }),
            },
        }
    };
}

/// Cumulative probabilities and upper tails.
const TAILS: &[Entry] = &[
    entry!("normal_cdf", x => Normal.cdf(x)),
    entry!("normal_sf", x => Normal.sf(x)),
    entry!("normal_ln_cdf", x => Normal.ln_cdf(x)),
    entry!("normal_ln_sf", x => Normal.ln_sf(x)),
    entry!("t_cdf", df, x => StudentT::new(df)?.cdf(x)),
    entry!("t_sf", df, x => StudentT::new(df)?.sf(x)),
    entry!("t_ln_sf", df, x => StudentT::new(df)?.ln_sf(x)),
    entry!("chi2_cdf", df, x => ChiSquared::new(df)?.cdf(x)),
    entry!("chi2_sf", df, x => ChiSquared::new(df)?.sf(x)),
    entry!("chi2_ln_cdf", df, x => ChiSquared::new(df)?.ln_cdf(x)),
    entry!("chi2_ln_sf", df, x => ChiSquared::new(df)?.ln_sf(x)),
    entry!("f_cdf", df1, df2, x => FisherF::new(df1, df2)?.cdf(x)),
    entry!("f_sf", df1, df2, x => FisherF::new(df1, df2)?.sf(x)),
    entry!("f_ln_sf", df1, df2, x => FisherF::new(df1, df2)?.ln_sf(x)),
    entry!("beta_cdf", a, b, x => Beta::new(a, b)?.cdf(x)),
    entry!("beta_sf", a, b, x => Beta::new(a, b)?.sf(x)),
    entry!("noncentral_t_cdf", df, ncp, x => NoncentralT::new(df, ncp)?.cdf(x)),
    entry!("noncentral_t_sf", df, ncp, x => NoncentralT::new(df, ncp)?.sf(x)),
    entry!("noncentral_t_ln_cdf", df, ncp, x => NoncentralT::new(df, ncp)?.ln_cdf(x)),
    entry!("noncentral_t_ln_sf", df, ncp, x => NoncentralT::new(df, ncp)?.ln_sf(x)),
    entry!("noncentral_f_cdf", df1, df2, ncp, x => NoncentralF::new(df1, df2, ncp)?.cdf(x)),
    entry!("noncentral_f_sf", df1, df2, ncp, x => NoncentralF::new(df1, df2, ncp)?.sf(x)),
    entry!("noncentral_f_ln_cdf", df1, df2, ncp, x => NoncentralF::new(df1, df2, ncp)?.ln_cdf(x)),
    entry!("noncentral_f_ln_sf", df1, df2, ncp, x => NoncentralF::new(df1, df2, ncp)?.ln_sf(x)),
    entry!("noncentral_chi2_cdf", df, ncp, x => NoncentralChiSquared::new(df, ncp)?.cdf(x)),
    entry!("noncentral_chi2_sf", df, ncp, x => NoncentralChiSquared::new(df, ncp)?.sf(x)),
    entry!("noncentral_chi2_ln_cdf", df, ncp, x => NoncentralChiSquared::new(df, ncp)?.ln_cdf(x)),
    entry!("noncentral_chi2_ln_sf", df, ncp, x => NoncentralChiSquared::new(df, ncp)?.ln_sf(x)),
    entry!("noncentral_beta_cdf", a, b, ncp, x => NoncentralBeta::new(a, b, ncp)?.cdf(x)),
    entry!("noncentral_beta_sf", a, b, ncp, x => NoncentralBeta::new(a, b, ncp)?.sf(x)),
];

/// Densities.
const DENSITIES: &[Entry] = &[
    entry!("normal_density", x => Normal.density(x)),
    entry!("t_density", df, x => StudentT::new(df)?.density(x)),
    entry!("chi2_density", df, x => ChiSquared::new(df)?.density(x)),
    entry!("f_density", df1, df2, x => FisherF::new(df1, df2)?.density(x)),
    entry!("beta_density", a, b, x => Beta::new(a, b)?.density(x)),
    entry!("noncentral_t_density", df, ncp, x => NoncentralT::new(df, ncp)?.density(x)),
    entry!("noncentral_t_ln_density", df, ncp, x => NoncentralT::new(df, ncp)?.ln_density(x)),
    entry!("noncentral_f_density", df1, df2, ncp, x => NoncentralF::new(df1, df2, ncp)?.density(x)),
    entry!("noncentral_chi2_density", df, ncp, x => NoncentralChiSquared::new(df, ncp)?.density(x)),
    entry!("noncentral_beta_density", a, b, ncp, x => NoncentralBeta::new(a, b, ncp)?.density(x)),
];

/// Quantiles, `p` being the probability of the lower tail, or of the upper tail where the name says so.
const QUANTILES: &[Entry] = &[
    entry!("normal_quantile", p => Normal.quantile(p)),
    entry!("normal_upper_quantile", p => Normal.upper_quantile(p)),
    entry!("t_quantile", df, p => StudentT::new(df)?.quantile(p)),
    entry!("t_upper_quantile", df, p => StudentT::new(df)?.upper_quantile(p)),
    entry!("chi2_quantile", df, p => ChiSquared::new(df)?.quantile(p)),
    entry!("chi2_upper_quantile", df, p => ChiSquared::new(df)?.upper_quantile(p)),
    entry!("f_quantile", df1, df2, p => FisherF::new(df1, df2)?.quantile(p)),
    entry!("f_upper_quantile", df1, df2, p => FisherF::new(df1, df2)?.upper_quantile(p)),
    entry!("beta_quantile", a, b, p => Beta::new(a, b)?.quantile(p)),
    entry!("beta_upper_quantile", a, b, p => Beta::new(a, b)?.upper_quantile(p)),
    entry!("noncentral_t_quantile", df, ncp, p => NoncentralT::new(df, ncp)?.quantile(p)),
    entry!("noncentral_t_upper_quantile", df, ncp, p => {
        NoncentralT::new(df, ncp)?.upper_quantile(p)
    }),
    entry!("noncentral_f_quantile", df1, df2, ncp, p => {
        NoncentralF::new(df1, df2, ncp)?.quantile(p)
    }),
    entry!("noncentral_f_upper_quantile", df1, df2, ncp, p => {
        NoncentralF::new(df1, df2, ncp)?.upper_quantile(p)
    }),
    entry!("noncentral_chi2_quantile", df, ncp, p => {
        NoncentralChiSquared::new(df, ncp)?.quantile(p)
    }),
    entry!("noncentral_chi2_upper_quantile", df, ncp, p => {
        NoncentralChiSquared::new(df, ncp)?.upper_quantile(p)
    }),
    entry!("noncentral_beta_quantile", a, b, ncp, p => {
        NoncentralBeta::new(a, b, ncp)?.quantile(p)
    }),
    entry!("noncentral_beta_upper_quantile", a, b, ncp, p => {
        NoncentralBeta::new(a, b, ncp)?.upper_quantile(p)
    }),
];

/// The noncentrality at which a tail at `x` has the probability `p`, and the power of tests.
const NONCENTRALITIES: &[Entry] = &[
    entry!("noncentral_t_ncp_for_cdf", df, x, p => NoncentralT::ncp_for_cdf(df, x, p)),
    entry!("noncentral_t_ncp_for_sf", df, x, p => NoncentralT::ncp_for_sf(df, x, p)),
    entry!("noncentral_f_ncp_for_cdf", df1, df2, x, p => NoncentralF::ncp_for_cdf(df1, df2, x, p)),
    entry!("noncentral_f_ncp_for_sf", df1, df2, x, p => NoncentralF::ncp_for_sf(df1, df2, x, p)),
    entry!("noncentral_chi2_ncp_for_cdf", df, x, p => NoncentralChiSquared::ncp_for_cdf(df, x, p)),
    entry!("noncentral_chi2_ncp_for_sf", df, x, p => NoncentralChiSquared::ncp_for_sf(df, x, p)),
    entry!("noncentral_beta_ncp_for_cdf", a, b, x, p => NoncentralBeta::ncp_for_cdf(a, b, x, p)),
    entry!("noncentral_beta_ncp_for_sf", a, b, x, p => NoncentralBeta::ncp_for_sf(a, b, x, p)),
    entry!("two_sample_t_power", n1, n2, delta, sd, alpha, sides => {
        two_sample_t_power(n1, n2, delta, sd, alpha, sides)
    }),
];

/// Several statistics at once. `df` may be `inf`; `sides` is 1 or 2.
const MULTIVARIATE: &[Entry] = &[
    entry!("studentized_range_cdf", k, df, q => StudentizedRange::new(whole("k", k)?, df)?.cdf(q)),
    entry!("studentized_range_sf", k, df, q => StudentizedRange::new(whole("k", k)?, df)?.sf(q)),
    entry!("studentized_range_quantile", k, df, p => {
        StudentizedRange::new(whole("k", k)?, df)?.quantile(p)
    }),
    entry!("studentized_range_upper_quantile", k, df, p => {
        StudentizedRange::new(whole("k", k)?, df)?.upper_quantile(p)
    }),
    entry!("dunnett_cdf", k, df, rho, sides, c => dunnett(k, df, rho, sides)?.cdf(c)),
    entry!("dunnett_sf", k, df, rho, sides, c => dunnett(k, df, rho, sides)?.sf(c)),
    entry!("dunnett_quantile", k, df, rho, sides, p => dunnett(k, df, rho, sides)?.quantile(p)),
    entry!("dunnett_upper_quantile", k, df, rho, sides, p => {
        dunnett(k, df, rho, sides)?.upper_quantile(p)
    }),
    entry!("owen_q", df, t, delta, b => owen_q(df, t, delta, b)),
    entry!("two_one_sided_power", lower, upper, df, alpha => {
        two_one_sided_power(lower, upper, df, alpha)
    }),
    entry!("bivariate_normal_cdf", rho, x, y => BivariateNormal::new(rho)?.cdf(x, y)),
];

/// Counts, and the power of tests of two proportions (`sides` 1: the first proportion is the larger one).
const DISCRETE: &[Entry] = &[
    entry!("binomial_pmf", n, p, k => Ok(binomial(n, p)?.pmf(whole("k", k)?))),
    entry!("binomial_cdf", n, p, k => Ok(binomial(n, p)?.cdf(whole("k", k)?))),
    entry!("binomial_sf", n, p, k => Ok(binomial(n, p)?.sf(whole("k", k)?))),
    entry!("poisson_pmf", mean, k => Ok(Poisson::new(mean)?.pmf(whole("k", k)?))),
    entry!("poisson_cdf", mean, k => Ok(Poisson::new(mean)?.cdf(whole("k", k)?))),
    entry!("poisson_sf", mean, k => Ok(Poisson::new(mean)?.sf(whole("k", k)?))),
    entry!("hypergeometric_pmf", n1, n2, m, odds_ratio, x => {
        Ok(hypergeometric(n1, n2, m, odds_ratio)?.pmf(whole("x", x)?))
    }),
    entry!("hypergeometric_cdf", n1, n2, m, odds_ratio, x => {
        Ok(hypergeometric(n1, n2, m, odds_ratio)?.cdf(whole("x", x)?))
    }),
    entry!("hypergeometric_sf", n1, n2, m, odds_ratio, x => {
        Ok(hypergeometric(n1, n2, m, odds_ratio)?.sf(whole("x", x)?))
    }),
    entry!("pooled_z_power", n1, n2, p1, p2, alpha, sides => {
        two_proportions(ProportionTest::PooledZ, [n1, n2], alpha, sides)?.power(p1, p2)
    }),
    entry!("unpooled_z_power", n1, n2, p1, p2, alpha, sides => {
        two_proportions(ProportionTest::UnpooledZ, [n1, n2], alpha, sides)?.power(p1, p2)
    }),
    entry!("yates_power", n1, n2, p1, p2, alpha, sides => {
        two_proportions(ProportionTest::Yates, [n1, n2], alpha, sides)?.power(p1, p2)
    }),
    entry!("fisher_power", n1, n2, p1, p2, alpha, sides => {
        two_proportions(ProportionTest::Fisher, [n1, n2], alpha, sides)?.power(p1, p2)
    }),
    entry!("barnard_power", n1, n2, p1, p2, alpha, sides => {
        two_proportions(ProportionTest::Barnard, [n1, n2], alpha, sides)?.power(p1, p2)
    }),
    entry!("boschloo_power", n1, n2, p1, p2, alpha, sides => {
        two_proportions(ProportionTest::Boschloo, [n1, n2], alpha, sides)?.power(p1, p2)
    }),
];

fn binomial(n: f64, p: f64) -> Result<Binomial> {
    Binomial::new(whole("n", n)?, p)
}

fn hypergeometric(n1: f64, n2: f64, m: f64, odds_ratio: f64) -> Result<Hypergeometric> {
    let (n1, n2, m) = (whole("n1", n1)?, whole("n2", n2)?, whole("m", m)?);
    Hypergeometric::with_odds_ratio(n1, n2, m, odds_ratio)
}

fn two_proportions(
    test: ProportionTest,
    sizes: [f64; 2],
    alpha: f64,
    sides: f64,
) -> Result<TwoBinomialRegion> {
    let alternative = match tested_sides(sides)? {
        Sides::One => Alternative::FirstLarger,
        Sides::Two => Alternative::TwoSided,
    };
    let [n1, n2] = sizes;
    TwoBinomialRegion::new(test, whole("n1", n1)?, whole("n2", n2)?, alpha, alternative)
}

/// A count.
fn whole(name: &'static str, value: f64) -> Result<u64> {
    if (0.0..=1e15).contains(&value) && value.floor() == value {
        Ok(value as u64)
    } else {
        Err(NumericsError::OutOfDomain { name, given: value, allowed: "a whole number" })
    }
}

/// `k` comparisons with one control that all correlate by `rho`.
fn dunnett(k: f64, df: f64, rho: f64, sides: f64) -> Result<Dunnett> {
    let comparisons = usize::try_from(whole("k", k)?).unwrap_or(usize::MAX);
    Dunnett::equal(comparisons, rho, tested_sides(sides)?, df)
}

/// One- or two-sided.
fn tested_sides(sides: f64) -> Result<Sides> {
    match sides {
        1.0 => Ok(Sides::One),
        2.0 => Ok(Sides::Two),
        _ => Err(NumericsError::OutOfDomain { name: "sides", given: sides, allowed: "1 or 2" }),
    }
}

/// Power of the two-sample t test with common variance; two-sided power counts both rejection tails.
fn two_sample_t_power(
    n1: f64,
    n2: f64,
    delta: f64,
    sd: f64,
    alpha: f64,
    sides: f64,
) -> Result<f64> {
    let df = n1 + n2 - 2.0;
    let two_sided = tested_sides(sides)? == Sides::Two;
    let ncp = delta / (sd * (1.0 / n1 + 1.0 / n2).sqrt());
    let critical = StudentT::new(df)?.upper_quantile(alpha / sides)?;
    let statistic = NoncentralT::new(df, ncp)?;
    let upper = statistic.sf(critical)?;
    if two_sided { Ok(upper + statistic.cdf(-critical)?) } else { Ok(upper) }
}

/// All functions, in the order in which `--list` prints them.
pub fn entries() -> impl Iterator<Item = &'static Entry> {
    [TAILS, DENSITIES, QUANTILES, NONCENTRALITIES, MULTIVARIATE, DISCRETE].into_iter().flatten()
}

/// The value of a function for arguments as they stand in a table, or the name of what is wrong with the call.
pub fn evaluate<'a>(
    name: &str,
    fields: impl Iterator<Item = &'a str>,
) -> std::result::Result<f64, &'static str> {
    let entry = entries().find(|entry| entry.name == name).ok_or("UnknownFunction")?;
    let mut arguments = [0.0; 8];
    let mut count = 0;
    for field in fields {
        let place = arguments.get_mut(count).ok_or("WrongNumberOfArguments")?;
        *place = field.trim().parse().map_err(|_| "NotANumber")?;
        count += 1;
    }
    match arguments.get(..count) {
        Some(given) if count == entry.arguments.len() => {
            (entry.compute)(given).map_err(|error| error_name(&error))
        }
        _ => Err("WrongNumberOfArguments"),
    }
}

/// The name of a numerical error, as it stands in the output.
fn error_name(error: &NumericsError) -> &'static str {
    match error {
        NumericsError::OutOfDomain { .. } => "OutOfDomain",
        NumericsError::NoConvergence { .. } => "NoConvergence",
        NumericsError::NoBracket { .. } => "NoBracket",
        NumericsError::TargetOutOfReach { .. } => "TargetOutOfReach",
    }
}
