//! Makes a faulty file whole enough to be read on, so that one run finds its other faults too. What is put in is
//! never used for anything but that: a file that was repaired is refused.

use std::collections::BTreeSet;

use super::finding::{Finding, RestsOn};
use super::node::Node;
use super::shape::{Keys, Shape};
use super::structure::suited;
use crate::designs::{Aspect, Path, Step};

/// The mapping without what is spoiled; what must be there is filled in.
pub(super) fn mapping(node: &Node, keys: &Keys, at: &Path, spoiled: &BTreeSet<Path>) -> Node {
    let mut entries: Vec<(String, Node)> = Vec::new();
    for (name, value) in node.entries() {
        let repeated = entries.iter().any(|(before, _)| before == name);
        let shape = keys.get(name).map(|key| &key.shape).or(keys.others.as_deref());
        if let (Some(shape), false) = (shape, repeated)
            && let Some(sound) = repair(value, shape, &at.key(name), spoiled)
        {
            entries.push((name.clone(), sound));
        }
    }
    for key in keys.known.iter().filter(|key| key.required) {
        if !entries.iter().any(|(name, _)| *name == key.name) {
            entries.push((key.name.clone(), stand_in(&key.shape)));
        }
    }
    Node::Map(entries)
}

fn repair(node: &Node, shape: &Shape, at: &Path, spoiled: &BTreeSet<Path>) -> Option<Node> {
    if spoiled.contains(at) {
        return None;
    }
    match (shape, node) {
        (Shape::Either(options), _) => repair(node, suited(options, node)?, at, spoiled),
        (Shape::Map(keys), Node::Map(_)) => Some(mapping(node, keys, at, spoiled)),
        (Shape::List { item, least, .. }, Node::List(items)) => {
            // Every item keeps its position, so that paths stay true.
            let sound =
                |(i, n)| repair(n, item, &at.item(i), spoiled).unwrap_or_else(|| stand_in(item));
            let mut sound: Vec<_> = items.iter().enumerate().map(sound).collect();
            while sound.len() < *least {
                sound.push(stand_in(item));
            }
            Some(Node::List(sound))
        }
        _ => Some(node.clone()),
    }
}

/// The plainest value of a shape.
fn stand_in(shape: &Shape) -> Node {
    match shape {
        Shape::Any => Node::Null,
        Shape::Truth => Node::Truth(false),
        Shape::Number { whole, low, high } => {
            let value = 1.0_f64.max(low.unwrap_or(1.0)).min(high.unwrap_or(f64::MAX));
            if *whole { Node::Whole(value as i64) } else { Node::Number(value) }
        }
        // No author writes this character, so it is equal to nothing.
        Shape::Text => Node::Text("\u{FFFD}".to_owned()),
        Shape::Choice(words) => words.first().map_or(Node::Null, |word| Node::Text(word.clone())),
        Shape::List { item, least, .. } => Node::List(vec![stand_in(item); *least]),
        Shape::Map(keys) => {
            let required = keys.known.iter().filter(|key| key.required);
            Node::Map(required.map(|key| (key.name.clone(), stand_in(&key.shape))).collect())
        }
        Shape::Either(options) => options.first().map_or(Node::Null, stand_in),
    }
}

/// Whether a finding of meaning stands on sound ground, and is no mere consequence of a repair.
///
/// Beside a repair in what a finding rests on, only a fault of a number that the author wrote is certain: that a key
/// lacks its companion, or that a name is none of the groups, may be due to the repair.
pub(super) fn is_certain(finding: &Finding, root: &Node, spoiled: &BTreeSet<Path>) -> bool {
    let fault = &finding.fault;
    if touched(&fault.at, spoiled) {
        return false;
    }
    match &finding.rests_on {
        RestsOn::Value => true,
        RestsOn::Values(paths) => !paths.iter().any(|path| touched(path, spoiled)),
        RestsOn::Part => {
            let own_number =
                fault.aspect == Aspect::Value && root.at(&fault.at).is_some_and(Node::is_number);
            let part = part(&fault.at);
            let sound = |part: &Path| !spoiled.iter().any(|path| path.0.starts_with(&part.0));
            own_number || (sound(&part) && design_of(&fault.at).is_none_or(|design| sound(&design)))
        }
    }
}

/// Whether something was repaired at a path, above it or below it.
fn touched(path: &Path, spoiled: &BTreeSet<Path>) -> bool {
    spoiled
        .iter()
        .any(|repaired| repaired.0.starts_with(&path.0) || path.0.starts_with(&repaired.0))
}

/// The part of the file that a path lies in: a key of the file or of an experiment.
fn part(at: &Path) -> Path {
    let depth = if is_experiment(at) { 3 } else { 1 };
    Path(at.0.iter().take(depth).cloned().collect())
}

fn design_of(at: &Path) -> Option<Path> {
    is_experiment(at).then(|| Path(at.0.iter().take(2).cloned().collect()).key("design"))
}

fn is_experiment(at: &Path) -> bool {
    matches!(at.0.as_slice(), [Step::Key(list), Step::Index(_), ..] if list == "experiments")
}
