//! Holds the numerics against tables of one's own: a stream of function calls in, the same lines with values out.
//!
//! Every line of standard input is `function,arg1,arg2,…`; it is written back with the value appended at 17 significant
//! digits, or with the name of what went wrong. Empty lines and lines that begin with `#` pass unchanged.
//!
//! ```text
//! $ printf 't_quantile,10,0.975\nnoncentral_t_sf,38,2.5,2.02\n' | cargo run --release --example tabulate
//! ```
//!
//! With `--list` it prints each function with its arguments instead.

use std::io::{self, BufRead, BufWriter, Write};
use std::process::ExitCode;

use sufficit::numerics::{
    Beta, ChiSquared, Continuous, FisherF, NoncentralBeta, NoncentralChiSquared, NoncentralF,
    NoncentralT, Normal, NumericsError, Result, StudentT,
};

/// A function of the table: its name, its arguments, and what it computes.
struct Entry {
    name: &'static str,
    arguments: &'static [&'static str],
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
    let ncp = delta / (sd * (1.0 / n1 + 1.0 / n2).sqrt());
    let critical = StudentT::new(df)?.upper_quantile(alpha / sides)?;
    let statistic = NoncentralT::new(df, ncp)?;
    let upper = statistic.sf(critical)?;
    if sides == 2.0 { Ok(upper + statistic.cdf(-critical)?) } else { Ok(upper) }
}

/// All functions, in the order in which `--list` prints them.
fn entries() -> impl Iterator<Item = &'static Entry> {
    [TAILS, DENSITIES, QUANTILES, NONCENTRALITIES].into_iter().flatten()
}

/// What can be wrong with a line apart from the numerics.
fn evaluate(line: &str) -> std::result::Result<f64, &'static str> {
    let mut fields = line.split(',').map(str::trim);
    let name = fields.next().unwrap_or_default();
    let entry = entries().find(|entry| entry.name == name).ok_or("UnknownFunction")?;
    let mut arguments = [0.0; 8];
    let mut count = 0;
    for field in fields {
        let place = arguments.get_mut(count).ok_or("WrongNumberOfArguments")?;
        *place = field.parse().map_err(|_| "NotANumber")?;
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

/// Copies standard input to standard output, line by line, with the values.
fn tabulate(mut input: impl BufRead, mut output: impl Write) -> io::Result<()> {
    let mut line = String::new();
    while input.read_line(&mut line)? > 0 {
        let text = line.trim_end_matches(['\n', '\r']);
        if text.trim().is_empty() || text.starts_with('#') {
            writeln!(output, "{text}")?;
        } else {
            match evaluate(text) {
                Ok(value) => writeln!(output, "{text},{value:.16e}")?,
                Err(name) => writeln!(output, "{text},{name}")?,
            }
        }
        line.clear();
    }
    output.flush()
}

fn list(mut output: impl Write) -> io::Result<()> {
    for entry in entries() {
        writeln!(output, "{},{}", entry.name, entry.arguments.join(","))?;
    }
    output.flush()
}

fn main() -> ExitCode {
    let output = BufWriter::new(io::stdout().lock());
    let done = match std::env::args().nth(1).as_deref() {
        None => tabulate(io::stdin().lock(), output),
        Some("--list") => list(output),
        Some(other) => {
            eprintln!(
                "unknown argument {other}: lines come from standard input, --list names the functions"
            );
            return ExitCode::from(2);
        }
    };
    match done {
        Ok(()) => ExitCode::SUCCESS,
        // The reader has had enough: nothing to report.
        Err(error) if error.kind() == io::ErrorKind::BrokenPipe => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("{error}");
            ExitCode::FAILURE
        }
    }
}
