//! The words of messages: what a value is called, what was expected, what stands there.

use super::node::Node;
use super::shape::{Keys, Shape};
use super::structure::suited;
use super::text::printable;
use super::{hints, nearest};
use crate::designs::{Fault, Path, Step};

/// A key in a sentence.
pub(super) fn key(name: &str) -> String {
    format!("`{}`", printable(name, 60))
}

/// What a message calls the value at a path.
pub(super) fn subject(at: &Path) -> String {
    match at.0.as_slice() {
        [] => "the file".to_owned(),
        [.., Step::Key(name)] => key(name),
        [.., Step::Key(name), Step::Index(index)] => format!("item {} of {}", index + 1, key(name)),
        [.., Step::Index(index)] => format!("item {}", index + 1),
    }
}

/// Where something is missing, ready to follow a sentence.
pub(super) fn inside(at: &Path) -> String {
    match at.0.as_slice() {
        [] => String::new(),
        [Step::Key(list), Step::Index(index)] if list == "experiments" => {
            format!(" in experiment {}", index + 1)
        }
        _ => format!(" in {}", subject(at)),
    }
}

/// The place of a path in words: the experiment by its id, items counted from 1.
pub(super) fn place(at: &Path, root: &Node) -> String {
    let mut parts: Vec<String> = Vec::new();
    let mut steps = at.0.iter();
    if let [Step::Key(list), Step::Index(index), ..] = at.0.as_slice()
        && list == "experiments"
    {
        let id = root.at(&Path(vec![Step::Key(list.clone()), Step::Index(*index)]));
        let id = id.and_then(|experiment| experiment.get("id")).and_then(Node::text);
        parts.push(match id.map(str::trim).filter(|id| !id.is_empty()) {
            Some(id) => format!("experiment {}", key(id)),
            None => format!("experiment {}", index + 1),
        });
        steps.next();
        steps.next();
    }
    let mut joined = false;
    for step in steps {
        match (step, parts.last_mut()) {
            (Step::Key(name), Some(last)) if joined => {
                last.push('.');
                last.push_str(&printable(name, 60));
            }
            (Step::Key(name), _) => parts.push(printable(name, 60)),
            (Step::Index(index), _) => parts.push(format!("item {}", index + 1)),
        }
        joined = matches!(step, Step::Key(_));
    }
    parts.join(", ")
}

/// The last key of a path.
pub(super) fn last_key(at: &Path) -> &str {
    let key = at.0.iter().rev().find_map(|step| match step {
        Step::Key(key) => Some(key.as_str()),
        Step::Index(_) => None,
    });
    key.unwrap_or("")
}

/// A number as a reader would write it.
pub(super) fn number(node: &Node) -> String {
    match node {
        Node::Whole(value) => value.to_string(),
        Node::Large(value) => value.to_string(),
        Node::Number(value) => format!("{value:?}"),
        _ => String::new(),
    }
}

/// What may stand at a place.
pub(super) fn expected(shape: &Shape) -> String {
    match shape {
        Shape::Any => "a value".to_owned(),
        Shape::Truth => "`true` or `false`".to_owned(),
        Shape::Number { whole: true, .. } => "a whole number".to_owned(),
        Shape::Number { whole: false, .. } => "a number".to_owned(),
        Shape::Text => "text".to_owned(),
        Shape::Choice(words) => {
            let words: Vec<_> = words.iter().map(String::as_str).collect();
            match words.as_slice() {
                [only] => format!("`{only}`"),
                words => nearest::either(words),
            }
        }
        Shape::List { .. } => "a list".to_owned(),
        Shape::Map(keys) => mapping(keys),
        Shape::Either(options) => {
            let plain = options.iter().filter(|option| !matches!(option, Shape::Map(_)));
            let mut names: Vec<_> = plain.map(expected).collect();
            if names.iter().any(|name| name == "a number") {
                names.retain(|name| name != "a whole number");
            }
            names.join(" or ")
        }
    }
}

fn mapping(keys: &Keys) -> String {
    let required = keys.known.iter().filter(|key| key.required);
    let names: Vec<_> = required.map(|key| key.name.as_str()).collect();
    match names.as_slice() {
        [] => "keys with their values".to_owned(),
        [only] => format!("the key `{only}` with its value"),
        names => format!("the keys {}", nearest::listed(names, 6)),
    }
}

fn found(node: &Node) -> String {
    match node {
        Node::Null => "nothing".to_owned(),
        Node::Truth(value) => format!("`{value}`, which means yes or no"),
        Node::Whole(_) | Node::Large(_) | Node::Number(_) => format!("the number {}", number(node)),
        Node::Text(text) => format!("the text `{}`", printable(text, 60)),
        Node::List(_) => "a list".to_owned(),
        Node::Map(_) => "keys with values".to_owned(),
    }
}

/// Reason and way out when a value is of another kind than the language has there.
pub(super) fn wrong_kind(node: &Node, shape: &Shape, at: &Path) -> (String, String) {
    let reason = format!("{} needs {}, but holds {}", subject(at), expected(shape), found(node));
    (reason, way_out(node, shape, at))
}

fn way_out(node: &Node, shape: &Shape, at: &Path) -> String {
    let takes = |wanted: fn(&Shape) -> bool| match shape {
        Shape::Either(options) => options.iter().any(wanted),
        shape => wanted(shape),
    };
    let numeric = takes(|shape| matches!(shape, Shape::Number { .. }));
    let textual = takes(|shape| matches!(shape, Shape::Text));
    match (shape, node) {
        (_, Node::Text(text)) if numeric => hints::for_number(text),
        (Shape::Choice(words), Node::Whole(value)) => {
            let word = match value {
                1 => "one",
                2 => "two",
                _ => "",
            };
            if words.iter().any(|known| known == word) {
                format!("write it as a word: {word}")
            } else {
                format!("write {}", expected(shape))
            }
        }
        (_, Node::Whole(_) | Node::Large(_) | Node::Number(_) | Node::Truth(_)) if textual => {
            "put it in quotes, so that it is read as text".to_owned()
        }
        (Shape::Text, Node::Map(entries)) if matches!(entries.as_slice(), [(_, Node::Text(_))]) => {
            "write the text alone; put it in quotes when it holds a colon".to_owned()
        }
        (Shape::Text, Node::List(_) | Node::Map(_)) => {
            "put text in quotes when it begins with a bracket or a brace, or holds a colon"
                .to_owned()
        }
        (Shape::List { .. }, Node::Map(_)) => {
            let key = last_key(at);
            format!("begin each item on a line below `{key}:` with a hyphen and a space")
        }
        (Shape::List { .. }, Node::Text(text)) => {
            format!("put it in square brackets: [{}]", printable(text, 80))
        }
        (Shape::List { .. }, _) => "write a list, even of one, in square brackets".to_owned(),
        (_, Node::List(_)) => "drop the hyphen or the brackets that make it a list".to_owned(),
        _ => match shape.mapping() {
            Some(keys) => below(node, keys, at),
            None => format!("write {}", expected(shape)),
        },
    }
}

/// How to write a bare value under the key that it was probably meant for.
fn below(node: &Node, keys: &Keys, at: &Path) -> String {
    let takes = |shape: &Shape| match shape {
        Shape::Either(options) => suited(options, node).is_some(),
        Shape::Number { .. } => node.is_number(),
        Shape::Text | Shape::Choice(_) => node.text().is_some(),
        _ => false,
    };
    let required: Vec<_> = keys.known.iter().filter(|key| key.required).collect();
    let meant = match required.as_slice() {
        [] => keys.known.iter().find(|key| takes(&key.shape)),
        [only] if takes(&only.shape) => Some(*only),
        _ => None,
    };
    let value = node.text().map_or_else(|| number(node), |text| printable(text, 60));
    match (meant, last_key(at)) {
        (Some(key), above) if !above.is_empty() => {
            format!("write it under a key, as in `{above}: {{{}: {value}}}`", key.name)
        }
        _ => format!("write {} on lines below it, or in braces", mapping(keys)),
    }
}

/// The fault of a word that is not among those that a key may hold.
pub(super) fn no_choice(given: &str, words: &[String], at: &Path) -> Fault {
    let words: Vec<_> = words.iter().map(String::as_str).collect();
    let reason = format!("`{}` is no value of {}", printable(given, 60), subject(at));
    let all = format!("the values are {}", nearest::listed(&words, 20));
    let help = match nearest::nearest(given, &words) {
        Some(word) if words.len() > 1 => format!("did you mean `{word}`? {all}"),
        _ if words.len() == 1 => format!("the only value is {}", nearest::listed(&words, 1)),
        _ => all,
    };
    Fault::value(at.clone(), reason).help(help)
}
