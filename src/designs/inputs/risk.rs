//! Error rates and multiplicity.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

use super::assumed::Assumed;
use crate::designs::{Fault, Path};
use crate::quantities::{ALPHA, Alpha, Assumption, Grounds, POWER, Power, Risk, Sides, Written};

/// What protects the family when several comparisons are made.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum Multiplicity {
    /// Each comparison is tested at `alpha`; the chance of any false finding in the family is higher.
    EachAtAlpha,
    /// Each comparison is tested at `alpha` divided by the number of comparisons; `alpha` holds for the family.
    Bonferroni,
    /// Each comparison is tested at `1 - (1 - alpha)^(1/m)` for `m` comparisons; `alpha` holds for the family.
    Sidak,
    /// Step-down: the largest statistic is tested as by Bonferroni, the next ones less strictly; `alpha` holds for
    /// the family, and the size is the one that the first step guarantees.
    Holm,
    /// All pairs by the studentised range (Tukey, or Tukey-Kramer for unequal groups); `alpha` holds for the family.
    Tukey,
    /// Each group against the control by the joint distribution (Dunnett); `alpha` holds for the family.
    Dunnett,
}

/// Error rates.
#[derive(Debug, Clone, Default, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub struct RiskKeys {
    /// Significance level; 0.05 unless stated.
    #[serde(default)]
    pub alpha: Option<Assumed>,
    /// `one` or `two`; `two` unless stated.
    #[serde(default)]
    pub sides: Option<Sides>,
    /// Power to aim for; 0.8 unless stated.
    #[serde(default)]
    pub power: Option<Assumed>,
    /// What protects the family of comparisons when there is more than one; `bonferroni` unless stated.
    #[serde(default)]
    pub multiplicity: Option<Multiplicity>,
    /// Why these error rates, and above all why one side.
    #[serde(flatten)]
    pub grounds: Grounds,
}

/// Error rates with what they rest on.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct StatedRisk {
    /// The checked rates.
    pub risk: Risk,
    /// The significance level with its grounds.
    pub alpha: Assumption,
    /// The power with its grounds.
    pub power: Assumption,
    /// Whether `sides` is the program's default.
    pub sides_defaulted: bool,
    /// What protects the family.
    pub multiplicity: Multiplicity,
    /// Whether the multiplicity is the program's default.
    pub multiplicity_defaulted: bool,
    /// Why these error rates.
    pub grounds: Grounds,
}

/// Reads the error rates; paths start at the key `risk`.
///
/// # Errors
///
/// A level or a power outside its range, or a power not above the level.
pub fn read_risk(keys: &RiskKeys) -> Result<StatedRisk, Vec<Fault>> {
    let at = Path::of("risk");
    let mut faults = Vec::new();
    let alpha = take(&keys.alpha, 0.05);
    let power = take(&keys.power, 0.8);
    let mut refuse = |key: &str, assumed: &Option<Assumed>, reason: String, help: &str| {
        let step = assumed.as_ref().map_or("", Assumed::step);
        faults.push(Fault::value(at.key(key).join(&Path::of(step)), reason).help(help));
    };
    let checked_alpha = Alpha::new(alpha.value);
    if checked_alpha.is_err() {
        let reason = format!("the significance level is {}", Written(alpha.value));
        refuse("alpha", &keys.alpha, reason, &format!("it {}", ALPHA.advice));
    }
    let checked_power = Power::new(power.value);
    if checked_power.is_err() || (checked_alpha.is_ok() && power.value <= alpha.value) {
        let key =
            if keys.power.is_some() { ("power", &keys.power) } else { ("alpha", &keys.alpha) };
        let reason = format!("the power is {}", Written(power.value));
        refuse(key.0, key.1, reason, &format!("it {}", POWER.advice));
    }
    match (checked_alpha, checked_power, faults.is_empty()) {
        (Ok(a), Ok(p), true) => Ok(StatedRisk {
            risk: Risk { alpha: a, sides: keys.sides.unwrap_or(Sides::Two), power: p },
            alpha,
            power,
            sides_defaulted: keys.sides.is_none(),
            multiplicity: keys.multiplicity.unwrap_or(Multiplicity::Bonferroni),
            multiplicity_defaulted: keys.multiplicity.is_none(),
            grounds: keys.grounds.clone(),
        }),
        _ => Err(faults),
    }
}

fn take(assumed: &Option<Assumed>, default: f64) -> Assumption {
    match assumed {
        Some(assumed) => assumed.assumption(&Grounds::default()),
        None => Assumption { value: default, grounds: Grounds::default(), defaulted: true },
    }
}
