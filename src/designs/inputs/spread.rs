//! The standard deviation and its evidence: stated, stated with what it was estimated from, or from raw values.

use std::collections::BTreeMap;

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

use crate::designs::{Fault, Path, Tables};
use crate::numerics::{self, ChiSquared, Continuous};
use crate::quantities::{Grounds, SPREAD, Written};

/// The standard deviation between experimental units within a group: a bare number, or a mapping.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(untagged)]
pub enum SpreadKeys {
    /// The standard deviation alone.
    Bare(f64),
    /// The standard deviation with its evidence.
    Told(Box<SpreadTold>),
}

/// Exactly one of `sd`, `values` or `file` with `column`.
#[derive(Debug, Clone, Default, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub struct SpreadTold {
    /// The standard deviation, in the unit of the outcome.
    #[serde(default)]
    pub sd: Option<f64>,
    /// Degrees of freedom of `sd` (the number of units minus the number of groups it was pooled over).
    #[serde(default)]
    pub df: Option<f64>,
    /// Number of units from which `sd` was estimated in one group; gives `n - 1` degrees of freedom.
    #[serde(default)]
    pub n: Option<u64>,
    /// Raw values of one homogeneous group, one per experimental unit.
    #[serde(default)]
    pub values: Option<Vec<f64>>,
    /// CSV file beside the spec.
    #[serde(default)]
    pub file: Option<String>,
    /// Column of the CSV file that holds the outcome, one row per experimental unit.
    #[serde(default)]
    pub column: Option<String>,
    /// Rows to keep: a column and the text it must hold.
    #[serde(default, rename = "where")]
    pub filter: BTreeMap<String, Cell>,
    /// What the value rests on.
    #[serde(flatten)]
    pub grounds: Grounds,
}

/// Text or number that a cell of a CSV file must hold.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(untagged)]
pub enum Cell {
    /// A truth value, compared as `true` or `false`.
    Truth(bool),
    /// A whole number.
    Whole(i64),
    /// A number.
    Number(f64),
    /// Text.
    Text(String),
}

impl std::fmt::Display for Cell {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Truth(value) => write!(f, "{value}"),
            Self::Whole(value) => write!(f, "{value}"),
            Self::Number(value) => write!(f, "{value}"),
            Self::Text(value) => f.write_str(value),
        }
    }
}

/// How the standard deviation came about.
#[derive(Debug, Clone, PartialEq, Serialize)]
#[serde(rename_all = "kebab-case", tag = "form")]
pub enum SpreadOrigin {
    /// Stated without saying how well it is known.
    Stated,
    /// Stated with the number of units it was estimated from, or its degrees of freedom alone.
    Estimated {
        /// Number of units, where given.
        n: Option<u64>,
    },
    /// Computed by the design from other numbers that the author stated.
    Derived {
        /// Number of units from which all of them were estimated, where given.
        n: Option<u64>,
    },
    /// Computed from values in the spec.
    Values {
        /// The values.
        values: Vec<f64>,
        /// Their mean.
        mean: f64,
    },
    /// Computed from a column of a CSV file.
    Column {
        /// The file, as the spec names it.
        file: String,
        /// The column.
        column: String,
        /// Rows kept: column and text.
        filter: Vec<(String, String)>,
        /// The values.
        values: Vec<f64>,
        /// Their mean.
        mean: f64,
    },
}

/// The standard deviation with its evidence.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Spread {
    /// The planning value.
    pub sd: f64,
    /// Degrees of freedom of the estimate, where known.
    pub df: Option<f64>,
    /// How it came about.
    pub origin: SpreadOrigin,
    /// What it rests on.
    pub grounds: Grounds,
}

impl Spread {
    /// Confidence limits of the standard deviation at a two-sided level, from the chi-squared distribution of
    /// `df * sd² / sigma²` for normal data; `None` when the degrees of freedom are unknown.
    ///
    /// # Errors
    ///
    /// A numerical failure.
    pub fn limits(&self, level: f64) -> numerics::Result<Option<(f64, f64)>> {
        let Some(df) = self.df else { return Ok(None) };
        let chi = ChiSquared::new(df)?;
        let tail = (1.0 - level) / 2.0;
        let low = self.sd * (df / chi.upper_quantile(tail)?).sqrt();
        let high = self.sd * (df / chi.quantile(tail)?).sqrt();
        Ok(Some((low, high)))
    }
}

/// Reads the standard deviation; paths start at the key `spread`.
///
/// # Errors
///
/// No value or more than one way of giving it, a standard deviation that is not positive, too few values, values that
/// do not vary, or a fault of the CSV file.
pub fn read_spread(keys: &SpreadKeys, tables: &dyn Tables) -> Result<Spread, Vec<Fault>> {
    read_spread_at(keys, &Path::of("spread"), tables)
}

/// The same for a standard deviation that stands at another path.
///
/// # Errors
///
/// As [`read_spread`].
pub fn read_spread_at(
    keys: &SpreadKeys,
    at: &Path,
    tables: &dyn Tables,
) -> Result<Spread, Vec<Fault>> {
    match keys {
        SpreadKeys::Bare(sd) => {
            let sd = checked_sd(*sd, at)?;
            Ok(Spread { sd, df: None, origin: SpreadOrigin::Stated, grounds: Grounds::default() })
        }
        SpreadKeys::Told(told) => read_told(told, at, tables),
    }
}

fn read_told(told: &SpreadTold, at: &Path, tables: &dyn Tables) -> Result<Spread, Vec<Fault>> {
    let forms = [
        ("sd", told.sd.is_some()),
        ("values", told.values.is_some()),
        ("file", told.file.is_some()),
    ];
    let given: Vec<_> = forms.iter().filter(|(_, there)| *there).map(|(name, _)| *name).collect();
    let way_out = "give one of `sd`, `values`, or `file` with `column`";
    match given.as_slice() {
        [] => Err(vec![Fault::key(at.clone(), "no standard deviation is stated").help(way_out)]),
        ["sd"] => read_stated(told, at),
        ["values"] => {
            strangers(told, at, &["df", "n", "column", "where"], "values")?;
            let values = told.values.clone().unwrap_or_default();
            let (mean, sd) = mean_and_sd(&values, &at.key("values"))?;
            let df = Some((values.len() - 1) as f64);
            let origin = SpreadOrigin::Values { values, mean };
            Ok(Spread { sd, df, origin, grounds: told.grounds.clone() })
        }
        ["file"] => {
            strangers(told, at, &["df", "n"], "file")?;
            read_column(told, at, tables)
        }
        [_, second, ..] => Err(vec![
            Fault::key(at.key(second), "the standard deviation is given in more than one way")
                .help(way_out),
        ]),
        [_] => Err(vec![Fault::key(at.clone(), "no standard deviation is stated").help(way_out)]),
    }
}

fn read_stated(told: &SpreadTold, at: &Path) -> Result<Spread, Vec<Fault>> {
    strangers(told, at, &["column", "where"], "sd")?;
    match (checked_sd(told.sd.unwrap_or(f64::NAN), &at.key("sd")), stated_df(told, at)) {
        (Ok(sd), Ok(df)) => {
            let origin = match df {
                Some(_) => SpreadOrigin::Estimated { n: told.n },
                None => SpreadOrigin::Stated,
            };
            Ok(Spread { sd, df, origin, grounds: told.grounds.clone() })
        }
        (sd, df) => Err(sd.err().into_iter().flatten().chain(df.err()).collect()),
    }
}

/// The degrees of freedom that a stated standard deviation was estimated with, where the author says so.
fn stated_df(told: &SpreadTold, at: &Path) -> Result<Option<f64>, Fault> {
    match (told.df, told.n) {
        (Some(_), Some(_)) => Err(Fault::key(at.key("n"), "both `df` and `n` are given")
            .help("keep `n` for one group, or `df` for a value pooled over groups")),
        (Some(df), None) if !(df.is_finite() && (1.0..=1e9).contains(&df)) => {
            Err(Fault::value(at.key("df"), format!("the degrees of freedom are {}", Written(df)))
                .help("they must be at least 1: units minus groups"))
        }
        (None, Some(n)) if !(2..=1_000_000_000).contains(&n) => {
            let noun = if n == 1 { "unit" } else { "units" };
            let reason = format!("the standard deviation comes from {n} {noun}");
            Err(Fault::value(at.key("n"), reason).help(
                "it takes at least 2 units to see any spread, and no more than 1 000 000 000 are read",
            ))
        }
        (df, n) => Ok(df.or(n.map(|n| n as f64 - 1.0))),
    }
}

fn read_column(told: &SpreadTold, at: &Path, tables: &dyn Tables) -> Result<Spread, Vec<Fault>> {
    let (Some(file), Some(column)) = (&told.file, &told.column) else {
        return Err(vec![
            Fault::key(at.key("file"), "no column of the file is named")
                .help("add `column:` with the heading of the column that holds the outcome"),
        ]);
    };
    let filter: Vec<_> = told.filter.iter().map(|(k, v)| (k.clone(), v.to_string())).collect();
    let values = tables.column(file, column, &filter).map_err(|f| vec![f.below(at)])?;
    let (mean, sd) = mean_and_sd(&values, &at.key("column"))?;
    let df = Some((values.len() - 1) as f64);
    let origin =
        SpreadOrigin::Column { file: file.clone(), column: column.clone(), filter, values, mean };
    Ok(Spread { sd, df, origin, grounds: told.grounds.clone() })
}

/// Refuses keys that have no meaning beside the chosen form.
fn strangers(told: &SpreadTold, at: &Path, refused: &[&str], form: &str) -> Result<(), Vec<Fault>> {
    let there = |key: &str| match key {
        "df" => told.df.is_some(),
        "n" => told.n.is_some(),
        "column" => told.column.is_some(),
        _ => !told.filter.is_empty(),
    };
    let faults: Vec<_> = refused
        .iter()
        .filter(|key| there(key))
        .map(|key| {
            Fault::key(at.key(key), format!("`{key}` has no meaning beside `{form}`"))
                .help("drop it, or give the standard deviation in the way it belongs to")
        })
        .collect();
    if faults.is_empty() { Ok(()) } else { Err(faults) }
}

fn checked_sd(sd: f64, at: &Path) -> Result<f64, Vec<Fault>> {
    SPREAD.check(sd).map_err(|out| {
        vec![
            Fault::value(at.clone(), format!("the standard deviation is {}", Written(sd)))
                .help(format!("it {}", out.range.advice)),
        ]
    })
}

/// Mean and standard deviation (divisor n − 1) in two passes with a correction for the rounding of the mean.
///
/// Source: Chan, Golub and LeVeque (1983), The American Statistician 37, 242-247, equation 1.7 (corrected two-pass).
fn mean_and_sd(values: &[f64], at: &Path) -> Result<(f64, f64), Vec<Fault>> {
    let refuse =
        |reason: String, help: &str| Err(vec![Fault::value(at.clone(), reason).help(help)]);
    if values.len() < 2 {
        return refuse(
            format!("{} value gives no standard deviation", values.len()),
            "at least 2 values are needed, and 10 or more make it worth something",
        );
    }
    if let Some(wrong) = values.iter().find(|v| !v.is_finite()) {
        return refuse(format!("one of the values is {wrong}"), "every value must be a number");
    }
    let count = values.len() as f64;
    let rough = values.iter().sum::<f64>() / count;
    let (mut squares, mut rest) = (0.0, 0.0);
    for value in values {
        let off = value - rough;
        squares += off * off;
        rest += off;
    }
    let mean = rough + rest / count;
    let variance = (squares - rest * rest / count) / (count - 1.0);
    let sd = variance.max(0.0).sqrt();
    if SPREAD.check(sd).is_err() {
        return refuse(
            format!("the values have a standard deviation of {}", Written(sd)),
            "values that never vary give no planning value; are these raw measurements of different units?",
        );
    }
    Ok((mean, sd))
}
