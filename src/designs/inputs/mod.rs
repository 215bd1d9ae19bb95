//! Building blocks of the spec language that designs compose: each is a mapping with its schema, and a reader that
//! turns it into a checked value or into faults.

mod assumed;
mod difference;
mod group_spreads;
mod groups;
mod risk;
mod spread;

pub use assumed::Assumed;
pub use difference::{BasisKey, DifferenceKeys, PlanFor, out_of_proportion, read_difference};
pub use group_spreads::{GroupSpreadKeys, GroupSpreadTold, GroupSpreads, read_group_spreads};
pub use groups::{Compare, GroupKeys, Parallel, ParallelKeys, read_parallel};
pub use risk::{Multiplicity, RiskKeys, StatedRisk, read_risk};
pub use spread::{Cell, Spread, SpreadKeys, SpreadOrigin, SpreadTold, read_spread, read_spread_at};
