//! Checked values that every layer above shares: risks, sizes, shares, and where an assumption comes from.
//!
//! A value of one of these types is legal by construction, so deeper code need not ask again. May use `numerics`
//! and nothing else of ours.

mod assumption;
mod decimal;
mod losses;
mod ranges;
mod risk;
mod words;

pub use assumption::{Assumption, Grounds};
pub use decimal::Decimal;
pub use losses::Losses;
pub use ranges::{
    ALPHA, CORRELATION, CORRELATION_SIZE, COST, DIFFERENCE, Grouped, LOSS_FRACTION, OutOfRange,
    POWER, Range, SPREAD, WEIGHT, Written,
};
pub use risk::{Alpha, Power, Risk, Sides};
pub use words::{Kind, Outcome, Scale, Unit, UnitHolds};

/// The largest size per group that any search will try.
pub const LARGEST_SIZE: u64 = 1_000_000_000;
