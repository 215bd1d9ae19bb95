//! Error rates: the significance level, its sides, and the power to aim for.

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

use super::ranges::{ALPHA, OutOfRange, POWER};

/// A significance level inside its legal range.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd, Serialize)]
pub struct Alpha(f64);

impl Alpha {
    /// Checks a level.
    ///
    /// # Errors
    ///
    /// [`OutOfRange`] outside [`ALPHA`].
    pub fn new(value: f64) -> Result<Self, OutOfRange> {
        ALPHA.check(value).map(Self)
    }

    /// The level as a probability.
    pub fn get(self) -> f64 {
        self.0
    }
}

/// A power to aim for inside its legal range.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd, Serialize)]
pub struct Power(f64);

impl Power {
    /// Checks a power.
    ///
    /// # Errors
    ///
    /// [`OutOfRange`] outside [`POWER`].
    pub fn new(value: f64) -> Result<Self, OutOfRange> {
        POWER.check(value).map(Self)
    }

    /// The power as a probability.
    pub fn get(self) -> f64 {
        self.0
    }
}

/// One-sided or two-sided.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum Sides {
    /// Only a difference in the planned direction counts.
    One,
    /// A difference in either direction counts.
    Two,
}

impl Sides {
    /// 1 or 2, the divisor of the significance level.
    pub fn count(self) -> f64 {
        match self {
            Self::One => 1.0,
            Self::Two => 2.0,
        }
    }
}

/// The error rates of a study.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Risk {
    /// Significance level of the family of comparisons, all sides together.
    pub alpha: Alpha,
    /// Sides of the test.
    pub sides: Sides,
    /// Power to aim for.
    pub power: Power,
}
