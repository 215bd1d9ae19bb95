//! Units that are lost on the way, and how many to ask for so that enough remain.

use serde::Serialize;

use super::assumption::Grounds;
use super::decimal::Decimal;
use super::ranges::{LOSS_FRACTION, OutOfRange};

/// The share of units expected to drop out of the analysis, the same in every group.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Losses {
    fraction: f64,
    /// Whether the author said anything about losses; if not, the fraction is 0 and the report marks an open point.
    pub stated: bool,
    /// What the fraction rests on.
    pub grounds: Grounds,
    #[serde(skip)]
    kept: Decimal,
}

impl Losses {
    /// Losses as the author stated them.
    ///
    /// # Errors
    ///
    /// [`OutOfRange`] outside [`LOSS_FRACTION`], or when the fraction has more than 20 decimal places.
    pub fn stated(fraction: f64, grounds: Grounds) -> Result<Self, OutOfRange> {
        let fraction = LOSS_FRACTION.check(fraction)?;
        let kept = Decimal::from_written(fraction)
            .and_then(Decimal::complement)
            .ok_or(OutOfRange { range: &LOSS_FRACTION, given: fraction })?;
        Ok(Self { fraction, stated: true, grounds, kept })
    }

    /// No word about losses: none are allowed for.
    ///
    /// # Errors
    ///
    /// None in practice; nought lies inside the range.
    pub fn unstated() -> Result<Self, OutOfRange> {
        Ok(Self { stated: false, ..Self::stated(0.0, Grounds::default())? })
    }

    /// The fraction lost.
    pub fn fraction(&self) -> f64 {
        self.fraction
    }

    /// Units to ask for so that `needed` remain: the ceiling of `needed / (1 - fraction)`, exact.
    pub fn ask_for(&self, needed: u64) -> Option<u64> {
        self.kept.divide_ceil(needed)
    }

    /// Units that remain of `asked`: the floor of `asked * (1 - fraction)`, exact.
    pub fn remain(&self, asked: u64) -> Option<u64> {
        self.kept.times_floor(asked)
    }
}
