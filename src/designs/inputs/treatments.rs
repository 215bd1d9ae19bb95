//! Treatments that every block or every unit receives, and which of them are compared.

use std::collections::BTreeSet;

use super::groups::{Compare, MOST_GROUPS, Parallel, ordered_pairs};
use crate::designs::{Fault, Group, Path};

/// Reads treatments, each given to as many units as the others; paths start at the key `design`, with the names under
/// `treatments`.
///
/// # Errors
///
/// Fewer than two treatments, more than `most`, a name twice, a control that is no treatment.
pub fn read_treatments(
    names: &[String],
    compare: Option<Compare>,
    control: Option<&str>,
    most: usize,
) -> Result<Parallel, Vec<Fault>> {
    let at = Path::of("design");
    let most = most.min(MOST_GROUPS);
    let mut faults = Vec::new();
    let count = names.len();
    if !(2..=most).contains(&count) {
        let noun = if count == 1 { "treatment is" } else { "treatments are" };
        let needed = match most {
            2 => "this design compares exactly 2 treatments".to_owned(),
            _ => format!("a comparison needs at least 2 treatments, and at most {most}"),
        };
        let reason = format!("{count} {noun} named");
        faults.push(Fault::key(at.key("treatments"), reason).help(needed));
    }
    let mut seen = BTreeSet::new();
    for (position, name) in names.iter().enumerate() {
        if !seen.insert(name.as_str()) {
            let place = at.key("treatments").item(position);
            let reason = format!("two treatments have the name `{name}`");
            faults.push(Fault::value(place, reason).help("give each treatment a name of its own"));
        }
    }
    let position = control.and_then(|control| names.iter().position(|name| name == control));
    if let (Some(control), None) = (control, position) {
        let known: Vec<_> = names.iter().map(|name| format!("`{name}`")).collect();
        let reason = format!("`{control}` is none of the treatments");
        let help = format!("the treatments are {}", known.join(", "));
        faults.push(Fault::value(at.key("control"), reason).help(help));
    }
    if compare == Some(Compare::AgainstControl) && control.is_none() {
        faults.push(
            Fault::value(at.key("compare"), "no control treatment is named")
                .help("add `control:` with the name of the control treatment"),
        );
    }
    if !faults.is_empty() {
        return Err(faults);
    }
    let against = position.filter(|_| count > 2 && compare != Some(Compare::AllPairs));
    let named = position.filter(|_| compare == Some(Compare::AgainstControl));
    let (compare, pairs) = match against.or(named) {
        Some(c) => {
            (Compare::AgainstControl, (0..count).filter(|i| *i != c).map(|i| (c, i)).collect())
        }
        None => (Compare::AllPairs, ordered_pairs(count, position)),
    };
    let group = |(i, name): (usize, &String)| Group {
        name: name.clone(),
        weight: 1.0,
        control: position == Some(i),
    };
    let groups = names.iter().enumerate().map(group).collect();
    Ok(Parallel { groups, compare, pairs, allocation_why: None })
}
