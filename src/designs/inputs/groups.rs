//! Independent groups, their allocation, and which of them are compared.

use std::collections::BTreeSet;

use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

use crate::designs::{Fault, Group, Path, Sizes};
use crate::quantities::{Decimal, LARGEST_SIZE, WEIGHT, Written};

/// Most groups one experiment may have; more comparisons than these make no readable report.
pub(super) const MOST_GROUPS: usize = 20;

/// A group: its name, or a mapping with its name and its weight in the allocation.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(untagged)]
pub enum GroupKeys {
    /// The name alone; the weight is 1.
    Name(String),
    /// The name and the weight.
    Weighted {
        /// The group's name.
        name: String,
        /// Units in this group for each unit in a group of weight 1.
        #[serde(default)]
        weight: Option<f64>,
    },
}

/// Which groups are compared.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum Compare {
    /// Each group with each other.
    AllPairs,
    /// Each group with the one named by `control`.
    AgainstControl,
}

/// Independent groups, each unit allocated to one of them.
#[derive(Debug, Clone, PartialEq, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub struct ParallelKeys {
    /// The groups, at least two; a control first where there is one.
    pub groups: Vec<GroupKeys>,
    /// Which groups are compared: `all-pairs` unless stated, or `against-control` when `control` is given.
    #[serde(default)]
    pub compare: Option<Compare>,
    /// Name of the control group.
    #[serde(default)]
    pub control: Option<String>,
    /// Why units are allocated unequally.
    #[serde(default)]
    pub allocation_why: Option<String>,
}

/// Checked groups and comparisons.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Parallel {
    /// The groups in the author's order.
    pub groups: Vec<Group>,
    /// Which are compared.
    pub compare: Compare,
    /// The compared pairs as positions; the second minus the first is the difference (control first).
    pub pairs: Vec<(usize, usize)>,
    /// Why units are allocated unequally.
    pub allocation_why: Option<String>,
}

impl Parallel {
    /// Whether all groups have the same weight.
    pub fn is_balanced(&self) -> bool {
        self.groups.iter().all(|g| g.weight == self.largest_weight())
    }

    /// The largest weight.
    pub fn largest_weight(&self) -> f64 {
        self.groups.iter().map(|g| g.weight).fold(0.0, f64::max)
    }

    /// The smallest step at which every group has at least two units.
    pub fn smallest_step(&self) -> u64 {
        let smallest = self.groups.iter().map(|g| g.weight).fold(f64::INFINITY, f64::min);
        let about = (self.largest_weight() / smallest) as u64;
        let enough = |step: &u64| {
            self.sizes(*step).is_some_and(|sizes| sizes.per_group.iter().all(|n| *n >= 2))
        };
        (about.saturating_sub(1).max(2)..=about + 2).find(enough).unwrap_or(about + 2)
    }

    /// Sizes when the group with the largest weight has `step` units: each `ceil(step * weight / largest weight)` in
    /// exact decimal arithmetic, so that no group falls below its share. `None` beyond [`LARGEST_SIZE`].
    pub fn sizes(&self, step: u64) -> Option<Sizes> {
        let largest = Decimal::from_written(self.largest_weight())?;
        let per_group = self
            .groups
            .iter()
            .map(|g| Decimal::from_written(g.weight)?.times_over_ceil(step, largest))
            .map(|n| n.filter(|n| *n <= LARGEST_SIZE))
            .collect::<Option<Vec<_>>>()?;
        let total = per_group.iter().sum();
        Some(Sizes { step, per_group, total })
    }

    /// The sizes that belong to an unrounded size of the largest group: each group rounded up on its own. `None` beyond
    /// [`LARGEST_SIZE`].
    pub fn rounded_up(&self, step: f64) -> Option<Sizes> {
        let step = step.max(self.smallest_step() as f64);
        if step > LARGEST_SIZE as f64 {
            return None;
        }
        let largest = self.largest_weight();
        let up =
            |g: &Group| (step * (g.weight / largest) * (1.0 - 4.0 * f64::EPSILON)).ceil() as u64;
        let per_group: Vec<_> = self.groups.iter().map(up).collect();
        let total = per_group.iter().sum();
        Some(Sizes { step: step.ceil() as u64, per_group, total })
    }
}

/// Reads groups; paths start at the key `design`.
///
/// # Errors
///
/// Fewer than two groups, too many, a name twice, a weight outside its range, a control that is no group.
pub fn read_parallel(keys: &ParallelKeys) -> Result<Parallel, Vec<Fault>> {
    let at = Path::of("design");
    let mut faults = Vec::new();
    let count = keys.groups.len();
    if !(2..=MOST_GROUPS).contains(&count) {
        let named = match count {
            1 => "only 1 group is named".to_owned(),
            _ => format!("{count} groups are named"),
        };
        faults.push(
            Fault::key(at.key("groups"), named)
                .help(format!("a comparison needs at least 2 groups, and at most {MOST_GROUPS}")),
        );
    }
    let groups = read_groups(&keys.groups, &at, &mut faults);
    let control = read_control(keys, &groups, &at, &mut faults);
    if !faults.is_empty() {
        return Err(faults);
    }
    let compare = keys.compare.unwrap_or(if control.is_some() && count > 2 {
        Compare::AgainstControl
    } else {
        Compare::AllPairs
    });
    let pairs = match (compare, control) {
        (Compare::AgainstControl, Some(c)) => {
            (0..count).filter(|i| *i != c).map(|i| (c, i)).collect()
        }
        _ => ordered_pairs(count, control),
    };
    let groups = groups
        .into_iter()
        .enumerate()
        .map(|(i, group)| Group { control: control == Some(i), ..group })
        .collect();
    Ok(Parallel { groups, compare, pairs, allocation_why: keys.allocation_why.clone() })
}

/// All pairs, the control first in each of its own.
pub(super) fn ordered_pairs(count: usize, control: Option<usize>) -> Vec<(usize, usize)> {
    (0..count)
        .flat_map(|i| (i + 1..count).map(move |j| (i, j)))
        .map(|(i, j)| if control == Some(j) { (j, i) } else { (i, j) })
        .collect()
}

fn read_groups(keys: &[GroupKeys], at: &Path, faults: &mut Vec<Fault>) -> Vec<Group> {
    let mut seen = BTreeSet::new();
    let mut groups = Vec::new();
    for (position, key) in keys.iter().enumerate() {
        let path = at.key("groups").item(position);
        let (name, weight, name_path) = match key {
            GroupKeys::Name(name) => (name, 1.0, path.clone()),
            GroupKeys::Weighted { name, weight } => {
                let weight = weight.unwrap_or(1.0);
                if WEIGHT.check(weight).is_err() {
                    let reason = format!("the weight is {}", Written(weight));
                    faults.push(
                        Fault::value(path.key("weight"), reason)
                            .help(format!("it {}", WEIGHT.advice)),
                    );
                }
                (name, weight, path.key("name"))
            }
        };
        if !seen.insert(name.as_str()) {
            faults.push(
                Fault::value(name_path, format!("two groups have the name `{name}`"))
                    .help("give each group a name of its own"),
            );
        }
        groups.push(Group { name: name.clone(), weight, control: false });
    }
    groups
}

fn read_control(
    keys: &ParallelKeys,
    groups: &[Group],
    at: &Path,
    faults: &mut Vec<Fault>,
) -> Option<usize> {
    match (&keys.control, keys.compare) {
        (Some(name), _) => {
            let found = groups.iter().position(|g| g.name == *name);
            if found.is_none() {
                let names: Vec<_> = groups.iter().map(|g| format!("`{}`", g.name)).collect();
                faults.push(
                    Fault::value(at.key("control"), format!("`{name}` is none of the groups"))
                        .help(format!("the groups are {}", names.join(", "))),
                );
            }
            found
        }
        (None, Some(Compare::AgainstControl)) => {
            faults.push(
                Fault::value(at.key("compare"), "no control group is named")
                    .help("add `control:` with the name of the control group"),
            );
            None
        }
        (None, _) => None,
    }
}
