//! Building blocks of the spec language that designs compose: each is a mapping with its schema, and a reader that
//! turns it into a checked value or into faults.

mod assumed;
mod correlation;
mod difference;
mod group_spreads;
mod groups;
mod paired_spread;
mod risk;
mod spread;
mod treatments;

pub use assumed::Assumed;
pub use correlation::read_correlation;
pub use difference::{BasisKey, DifferenceKeys, PlanFor, out_of_proportion, read_difference};
pub use group_spreads::{GroupSpreadKeys, GroupSpreadTold, GroupSpreads, read_group_spreads};
pub use groups::{Compare, GroupKeys, Parallel, ParallelKeys, read_parallel};
pub use paired_spread::{PairedSpread, PairedSpreadKeys, SpreadKind, read_paired_spread};
pub use risk::{Multiplicity, RiskKeys, StatedRisk, read_risk};
pub use spread::{Cell, Spread, SpreadKeys, SpreadOrigin, SpreadTold, read_spread, read_spread_at};
pub use treatments::read_treatments;
