//! The standard deviation of a design that compares treatments inside a unit or a block, where three different ones are
//! in use: the author says which.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

use super::assumed::Assumed;
use super::correlation::read_correlation;
use super::spread::{Spread, SpreadKeys, SpreadTold, read_spread};
use crate::designs::{Fault, Path, Tables};
use crate::quantities::Assumption;

/// Which standard deviation is given.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum SpreadKind {
    /// Of repeated measurements of one unit, or of alike treated units inside one block: the residual standard
    /// deviation of the analysis.
    Within,
    /// Of the differences between two treatments in the same unit or block: √2 times that within.
    Differences,
    /// Of alike treated units that have nothing in common; needs `correlation`.
    Between,
}

/// The standard deviation, of which `kind` says whether it is that within units or blocks, that of differences, or that
/// between units.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub struct PairedSpreadKeys {
    /// Which standard deviation is given: `within` units or blocks, of `differences` between two treatments in the same
    /// unit or block, or `between` units.
    pub kind: SpreadKind,
    /// Correlation between two measurements of the same unit, or between two units of the same block; needed with
    /// `between`.
    #[serde(default)]
    pub correlation: Option<Assumed>,
    /// The value and its evidence.
    #[serde(flatten)]
    pub told: SpreadTold,
}

/// A standard deviation and how it leads to the residual one.
#[derive(Debug, Clone, PartialEq)]
pub struct PairedSpread {
    /// The value as the author gives it.
    pub spread: Spread,
    /// Which one it is.
    pub kind: SpreadKind,
    /// The correlation, with `between`.
    pub correlation: Option<Assumption>,
}

impl PairedSpread {
    /// Residual standard deviation in units of the given one: 1 for `within`, `1/√2` for `differences` and `√(1 − ρ)`
    /// for `between`, since a shared part of variance `ρ σ²` cancels in a difference.
    pub fn to_residual(&self) -> f64 {
        match (self.kind, &self.correlation) {
            (SpreadKind::Differences, _) => std::f64::consts::FRAC_1_SQRT_2,
            (SpreadKind::Between, Some(correlation)) => (1.0 - correlation.value).sqrt(),
            (SpreadKind::Within | SpreadKind::Between, _) => 1.0,
        }
    }
}

/// Reads the standard deviation; paths start at the key `spread`.
///
/// # Errors
///
/// Those of [`read_spread`]; a correlation without `between`, or none with it; raw values, of which no standard deviation
/// within units can be computed.
pub fn read_paired_spread(
    keys: &PairedSpreadKeys,
    tables: &dyn Tables,
) -> Result<PairedSpread, Vec<Fault>> {
    let at = Path::of("spread");
    let mut faults = Vec::new();
    let spread = read_spread(&SpreadKeys::Told(Box::new(keys.told.clone())), tables);
    let correlation = match (keys.kind, &keys.correlation) {
        (SpreadKind::Between, Some(assumed)) => {
            read_correlation(assumed, &at.key("correlation")).map(Some)
        }
        (SpreadKind::Between, None) => Err(Fault::value(
            at.key("kind"),
            "no correlation is stated beside this standard deviation",
        )
        .help("add `correlation:`, or give the standard deviation `within` or of `differences`")),
        (_, Some(_)) => Err(Fault::key(
            at.key("correlation"),
            "the correlation has no meaning beside this kind of standard deviation",
        )
        .help("drop it, or say `kind: between`")),
        (_, None) => Ok(None),
    };
    if keys.kind == SpreadKind::Within {
        let raw = [("values", keys.told.values.is_some()), ("file", keys.told.file.is_some())];
        let raw = raw.iter().find(|(_, given)| *given);
        faults.extend(raw.map(|(key, _)| {
            Fault::key(
                at.key(key),
                "one value per unit shows no standard deviation within units or blocks",
            )
            .help("give it as `sd`, or give values and say `kind: differences` or `kind: between`")
        }));
        faults.extend(keys.told.n.map(|_| {
            Fault::key(at.key("n"), "a number of units does not tell the degrees of freedom here")
                .help("give the residual degrees of freedom as `df`, that is in a study with complete units or blocks one less than their number times one less than the number of treatments")
        }));
    }
    match (spread, correlation) {
        (Ok(spread), Ok(correlation)) if faults.is_empty() => {
            Ok(PairedSpread { spread, kind: keys.kind, correlation })
        }
        (spread, correlation) => {
            faults.extend(spread.err().into_iter().flatten());
            faults.extend(correlation.err());
            Err(faults)
        }
    }
}
