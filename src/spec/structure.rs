//! Whether the file has the keys and kinds of values of the language; what it means is checked later.

use std::collections::BTreeSet;

use super::commas;
use super::finding::Finding;
use super::keys::{self, Homes};
use super::language::longest;
use super::nearest;
use super::node::Node;
use super::shape::{Keys, Shape};
use super::text;
use super::words;
use crate::designs::{Aspect, Fault, Path, Step};
use crate::quantities::Written;

/// Most findings that are kept; a file with more is not read on.
pub(super) const MOST_FINDINGS: usize = 500;

/// Most keys of one mapping.
const MOST_KEYS: usize = 200;

/// What a check of the structure found.
#[derive(Debug, Default)]
pub(super) struct Structure {
    pub findings: Vec<Finding>,
    /// Paths whose values are missing, unknown or of the wrong kind, so that nothing may be concluded from them.
    pub spoiled: BTreeSet<Path>,
}

impl Structure {
    /// Notes a fault; what stands at its path is not to be trusted.
    pub fn add(&mut self, fault: Fault) {
        if !self.is_full() {
            self.spoiled.insert(fault.at.clone());
            self.findings.push(fault.into());
        }
    }

    /// Whether so much is wrong that looking further helps nobody.
    pub fn is_full(&self) -> bool {
        self.findings.len() >= MOST_FINDINGS
    }

    /// Checks an experiment, which must be a mapping.
    pub fn experiment(&mut self, node: &Node, keys: &Keys, at: &Path, homes: &Homes<'_>) {
        match node {
            Node::Map(_) => self.mapping(node, keys, at, homes),
            _ => self.value(node, &Shape::Map(keys.clone()), at, homes),
        }
    }

    /// Checks a mapping.
    pub fn mapping(&mut self, node: &Node, keys: &Keys, at: &Path, homes: &Homes<'_>) {
        let count = node.entries().len();
        if count > MOST_KEYS {
            let reason = format!("{} has {count} keys", words::subject(at));
            self.add(Fault::key(at.clone(), reason).help(format!("at most {MOST_KEYS} are read")));
            return;
        }
        let mut meant = BTreeSet::new();
        for (position, (name, value)) in node.entries().iter().enumerate() {
            if self.is_full() {
                return;
            }
            let path = at.key(name);
            let before = node.entries().iter().take(position);
            let repetition = before.filter(|(other, _)| other == name).count();
            if keys.get(name).is_none()
                && let Some((before, number)) = commas::cut_number(node.entries(), position)
            {
                self.cut(&at.key(before), &number, path, repetition);
                continue;
            }
            if repetition > 0 {
                self.repeated(path, repetition);
                continue;
            }
            match (keys.get(name), &keys.others) {
                (Some(known), _) => {
                    let before = self.findings.len();
                    self.value(value, &known.shape, &path, homes);
                    if !known.required && is_void(value) {
                        self.or_drop(before);
                    }
                }
                (None, Some(others)) => {
                    self.key_text(name, &path);
                    self.value(value, others, &path, homes);
                }
                (None, None) => {
                    let (fault, suggestion) = keys::unknown(name, keys, at, homes);
                    meant.extend(suggestion);
                    self.add(fault);
                }
            }
        }
        self.missing(node, keys, at, &meant);
    }

    /// A key that may be left out need not be filled.
    fn or_drop(&mut self, finding: usize) {
        let finding = self.findings.get_mut(finding);
        if let Some(help) = finding.and_then(|finding| finding.fault.help.as_mut()) {
            help.push_str(", or drop the key");
        }
    }

    /// A decimal comma inside braces, which ends the number before it and makes its decimals a key.
    fn cut(&mut self, before: &Path, number: &str, decimals: Path, repetition: usize) {
        let shown = words::subject(&decimals);
        let reason =
            format!("the comma before {shown} ends the number, so {shown} is read as a key");
        let help = format!(
            "if a decimal comma is meant, write a point: `{}: {number}`",
            words::last_key(before)
        );
        self.spoiled.insert(before.clone());
        self.spoiled.insert(decimals.clone());
        let fault = Fault::key(decimals, reason).help(help);
        self.findings.push(Finding::from(fault).repeated(repetition));
    }

    fn repeated(&mut self, path: Path, repetition: usize) {
        let reason = format!("{} stands here a second time", words::subject(&path));
        let fault = Fault::key(path.clone(), reason).help("keep one of them");
        let finding = Finding::from(fault).repeated(repetition);
        self.findings.push(finding.also(path, Aspect::Key, "first here"));
    }

    /// Keys that must be there; one that was only misspelt is not reported twice.
    fn missing(&mut self, node: &Node, keys: &Keys, at: &Path, meant: &BTreeSet<String>) {
        let missing: Vec<_> =
            keys.known.iter().filter(|key| key.required && node.get(&key.name).is_none()).collect();
        for key in &missing {
            self.spoiled.insert(at.key(&key.name));
        }
        let told: Vec<_> = missing.into_iter().filter(|key| !meant.contains(&key.name)).collect();
        if told.is_empty() {
            return;
        }
        let names: Vec<_> = told.iter().map(|key| key.name.as_str()).collect();
        let verb = if names.len() == 1 { "is" } else { "are" };
        let reason = format!("{} {verb} missing{}", nearest::listed(&names, 20), words::inside(at));
        let lines: Vec<_> =
            told.iter().map(|key| format!("add `{}:` ({})", key.name, key.meaning)).collect();
        self.findings.push(Fault::key(at.clone(), reason).help(lines.join("\n")).into());
    }

    fn key_text(&mut self, name: &str, path: &Path) {
        if let Some(wrong) = name.chars().find(|c| text::is_refused(*c)) {
            self.add(Fault::key(path.clone(), text::refusal(wrong)));
        } else if text::collapse(name).is_empty() {
            self.add(
                Fault::key(path.clone(), "a key is empty").help("write a word before the colon"),
            );
        }
    }

    /// Checks a value.
    pub fn value(&mut self, node: &Node, shape: &Shape, at: &Path, homes: &Homes<'_>) {
        if *node == Node::Null && *shape != Shape::Any {
            let reason = format!("{} has no value", words::subject(at));
            let way_out = format!("write {} after the colon", words::expected(shape));
            return self.add(Fault::key(at.clone(), reason).help(way_out));
        }
        match (shape, node) {
            (Shape::Any, _) | (Shape::Truth, Node::Truth(_)) => {}
            (Shape::Either(options), _) => match suited(options, node) {
                Some(option) => self.value(node, option, at, homes),
                None => self.wrong_kind(node, shape, at),
            },
            (Shape::Number { whole, low, high }, _) if node.is_number() => {
                self.number(node, *whole, (*low, *high), at);
            }
            (Shape::Text, Node::Text(content)) => self.text(content, at),
            (Shape::Choice(words), Node::Text(content)) => self.choice(content, words, at),
            (Shape::List { item, least, most }, Node::List(items)) => {
                self.list(items, (*least, *most), at);
                for (index, value) in items.iter().enumerate().take(*most) {
                    if self.is_full() {
                        return;
                    }
                    self.value(value, item, &at.item(index), homes);
                }
            }
            (Shape::Map(keys), Node::Map(_)) => self.mapping(node, keys, at, homes),
            _ => self.wrong_kind(node, shape, at),
        }
    }

    fn wrong_kind(&mut self, node: &Node, shape: &Shape, at: &Path) {
        let (reason, help) = words::wrong_kind(node, shape, at);
        self.add(Fault::value(at.clone(), reason).help(help));
    }

    fn number(
        &mut self,
        node: &Node,
        whole: bool,
        (low, high): (Option<f64>, Option<f64>),
        at: &Path,
    ) {
        let value = match node {
            Node::Whole(value) => *value as f64,
            Node::Large(value) => *value as f64,
            Node::Number(value) => *value,
            _ => return,
        };
        let subject = words::subject(at);
        let shown = words::number(node);
        if !value.is_finite() {
            let reason = format!("{subject} is not a finite number");
            return self.add(Fault::value(at.clone(), reason).help("write a number such as 0.8"));
        }
        if whole && matches!(node, Node::Number(_)) {
            let reason = format!("{subject} is {shown}, but must be a whole number");
            let way_out = if value.fract() == 0.0 && value.abs() < 1e15 {
                format!("write {value:.0}")
            } else {
                "write it without decimals".to_owned()
            };
            return self.add(Fault::value(at.clone(), reason).help(way_out));
        }
        if low.is_none_or(|low| value >= low) && high.is_none_or(|high| value <= high) {
            return;
        }
        let fault = if matches!(at.0.as_slice(), [Step::Key(key)] if key == "sufficit") {
            let reason = format!("the spec is written in version {shown} of the format");
            Fault::value(at.clone(), reason).help("this program reads version 1")
        } else {
            let help = match (low, high) {
                (Some(low), Some(high)) => {
                    format!("it must lie between {} and {}", Written(low), Written(high))
                }
                (Some(low), None) => format!("it must be at least {}", Written(low)),
                (None, high) => format!("it must be at most {}", Written(high.unwrap_or(f64::MAX))),
            };
            Fault::value(at.clone(), format!("{subject} is {shown}")).help(help)
        };
        self.add(fault);
    }

    fn text(&mut self, content: &str, at: &Path) {
        let subject = words::subject(at);
        let length = text::collapse(content).chars().count();
        let most = longest(words::last_key(at));
        let (reason, help) = if let Some(wrong) = content.chars().find(|c| text::is_refused(*c)) {
            let reason = format!("{subject} holds a hidden character: {}", text::refusal(wrong));
            (reason, "drop it, or write it in words".to_owned())
        } else if length == 0 {
            let help = "write the text";
            (format!("{subject} is empty"), help.to_owned())
        } else if length > most {
            let reason = format!("{subject} has {length} characters");
            (reason, format!("at most {most} are allowed"))
        } else {
            return;
        };
        self.add(Fault::value(at.clone(), reason).help(help));
    }

    fn choice(&mut self, content: &str, words: &[String], at: &Path) {
        let given = text::collapse(content);
        if words.contains(&given) {
            return;
        }
        self.add(words::no_choice(&given, words, at));
    }

    fn list(&mut self, items: &[Node], (least, most): (usize, usize), at: &Path) {
        let subject = words::subject(at);
        let count = items.len();
        let (reason, help) = if count == 0 && least > 0 {
            let help = "name at least one";
            (format!("{subject} is an empty list"), help.to_owned())
        } else if count < least {
            (format!("{subject} has {count} items"), format!("at least {least} are needed"))
        } else if count > most {
            (format!("{subject} has {count} items"), format!("at most {most} are allowed"))
        } else {
            return;
        };
        self.add(Fault::key(at.clone(), reason).help(help));
    }
}

/// Whether there is nothing behind a key.
fn is_void(node: &Node) -> bool {
    match node {
        Node::Null => true,
        Node::Text(text) => text::collapse(text).is_empty(),
        Node::List(items) => items.is_empty(),
        _ => false,
    }
}

/// The alternative that is meant by the kind of a value.
pub(super) fn suited<'s>(options: &'s [Shape], node: &Node) -> Option<&'s Shape> {
    let fits = |shape: &&Shape| match (shape, node) {
        (Shape::Number { whole, .. }, Node::Number(_)) => !whole,
        (Shape::Number { .. }, Node::Whole(_) | Node::Large(_))
        | (Shape::Truth, Node::Truth(_))
        | (Shape::Text | Shape::Choice(_), Node::Text(_))
        | (Shape::List { .. }, Node::List(_))
        | (Shape::Map(_), Node::Map(_))
        | (Shape::Any, _) => true,
        _ => false,
    };
    let whole_only = |shape: &&Shape| matches!(shape, Shape::Number { .. }) && node.is_number();
    options.iter().find(fits).or_else(|| options.iter().find(whole_only))
}
