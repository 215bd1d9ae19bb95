//! A standard deviation for each group, with its evidence.

use std::collections::BTreeMap;

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

use super::spread::{Spread, SpreadKeys, SpreadTold, read_spread_at};
use crate::designs::{Fault, Group, Path, Tables};

/// The standard deviations between experimental units within each group: a number or a mapping that holds for every
/// group, or `by-group`.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(untagged)]
pub enum GroupSpreadKeys {
    /// One standard deviation for every group.
    Bare(f64),
    /// One for every group with its evidence, or one for each.
    Told(Box<GroupSpreadTold>),
}

/// Either `by-group`, or the keys of one standard deviation that holds for every group.
#[derive(Debug, Clone, Default, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub struct GroupSpreadTold {
    /// The standard deviation of each group, by its name.
    #[serde(default)]
    pub by_group: BTreeMap<String, SpreadKeys>,
    /// The standard deviation of every group, or the grounds of those under `by-group`.
    #[serde(flatten)]
    pub common: SpreadTold,
}

/// The standard deviations of all groups.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct GroupSpreads {
    /// Each with its evidence, in the order of the groups.
    pub each: Vec<Spread>,
    /// Position of the largest, the first of equals.
    pub largest: usize,
    /// Whether the author gave one value for all groups.
    pub common: bool,
}

impl GroupSpreads {
    /// Each standard deviation relative to the largest.
    pub fn relative(&self) -> Vec<f64> {
        let largest = self.each.get(self.largest).map_or(1.0, |spread| spread.sd);
        self.each.iter().map(|spread| spread.sd / largest).collect()
    }

    /// The largest standard deviation as the scale of all, with the evidence of all.
    ///
    /// If the ratios hold, `Σ df_i s_i² / σ_i²` is chi-squared with `Σ df_i` degrees of freedom, so the common scale is
    /// known with the degrees of freedom of all together; they are unknown if those of one are.
    pub fn joint(&self) -> Option<Spread> {
        let largest = self.each.get(self.largest)?;
        if self.common {
            return Some(largest.clone());
        }
        let df = self.each.iter().try_fold(0.0, |sum, spread| Some(sum + spread.df?));
        let open = self.each.iter().find(|spread| spread.grounds.is_open());
        let grounds = open.unwrap_or(largest).grounds.clone();
        Some(Spread { df, grounds, ..largest.clone() })
    }
}

/// Reads the standard deviations; paths start at the key `spread`.
///
/// # Errors
///
/// As for one standard deviation; a group without one, a name that is no group, or `by-group` beside a common value.
pub fn read_group_spreads(
    keys: &GroupSpreadKeys,
    groups: &[Group],
    tables: &dyn Tables,
) -> Result<GroupSpreads, Vec<Fault>> {
    let at = Path::of("spread");
    let told = match keys {
        GroupSpreadKeys::Told(told) if !told.by_group.is_empty() => told,
        GroupSpreadKeys::Told(told) => {
            let common = SpreadKeys::Told(Box::new(told.common.clone()));
            return for_all(&common, groups, &at, tables);
        }
        GroupSpreadKeys::Bare(sd) => return for_all(&SpreadKeys::Bare(*sd), groups, &at, tables),
    };
    let mut faults = contradictions(told, groups, &at);
    let mut each = Vec::new();
    for group in groups {
        let Some(keys) = told.by_group.get(&group.name) else {
            let reason = format!("`{}` has no standard deviation", group.name);
            faults.push(
                Fault::key(at.key("by-group"), reason).help("give each group one, by its name"),
            );
            continue;
        };
        match read_spread_at(keys, &at.key("by-group").key(&group.name), tables) {
            Ok(spread) => {
                let grounds = spread.grounds.clone().or(&told.common.grounds);
                each.push(Spread { grounds, ..spread });
            }
            Err(wrong) => faults.extend(wrong),
        }
    }
    if faults.is_empty() { Ok(gathered(each, false)) } else { Err(faults) }
}

fn for_all(
    keys: &SpreadKeys,
    groups: &[Group],
    at: &Path,
    tables: &dyn Tables,
) -> Result<GroupSpreads, Vec<Fault>> {
    let spread = read_spread_at(keys, at, tables)?;
    Ok(gathered(vec![spread; groups.len()], true))
}

fn gathered(each: Vec<Spread>, common: bool) -> GroupSpreads {
    let mut largest = (0, 0.0);
    for (position, spread) in each.iter().enumerate() {
        if spread.sd > largest.1 {
            largest = (position, spread.sd);
        }
    }
    GroupSpreads { each, largest: largest.0, common }
}

fn contradictions(told: &GroupSpreadTold, groups: &[Group], at: &Path) -> Vec<Fault> {
    let common = SpreadTold { grounds: told.common.grounds.clone(), ..SpreadTold::default() };
    let mut faults = Vec::new();
    if told.common != common {
        let reason = "standard deviations are given for each group and for all";
        faults.push(
            Fault::key(at.key("by-group"), reason).help("keep `by-group`, or the one for all"),
        );
    }
    let named = |name: &&String| !groups.iter().any(|group| group.name == **name);
    for stranger in told.by_group.keys().filter(named) {
        let names: Vec<_> = groups.iter().map(|group| format!("`{}`", group.name)).collect();
        faults.push(
            Fault::key(
                at.key("by-group").key(stranger),
                format!("`{stranger}` is none of the groups"),
            )
            .help(format!("the groups are {}", names.join(", "))),
        );
    }
    faults
}
