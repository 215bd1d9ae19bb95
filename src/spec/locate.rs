//! From a path of keys to a line and a column.
//!
//! The parser tells no positions of values, but an error raised while it reads one carries the position. So a place
//! is found by reading the file again up to that place and failing there on purpose.

use std::cell::RefCell;
use std::collections::HashMap;
use std::fmt;
use std::hash::{Hash, Hasher};

use serde::de::{DeserializeSeed, Deserializer, Error, IgnoredAny, MapAccess, SeqAccess, Visitor};

use super::node::Node;
use super::text::{Position, Text};
use crate::designs::{Aspect, Path, Step};

/// A stretch of one line.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Stretch {
    pub at: Position,
    /// In characters, at least 1.
    pub length: usize,
}

/// A place in the tree: for each step down, the position among the entries or items; then the key or the value.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Place {
    pub steps: Vec<usize>,
    pub aspect: Aspect,
}

impl Hash for Place {
    fn hash<H: Hasher>(&self, state: &mut H) {
        self.steps.hash(state);
        (self.aspect == Aspect::Key).hash(state);
    }
}

/// The place of a path, or of the deepest part of it that exists. `occurrence` counts the repetitions of the last
/// key, from 0.
pub(super) fn place(root: &Node, path: &Path, aspect: Aspect, occurrence: usize) -> Place {
    let mut node = root;
    let mut steps = Vec::new();
    for (depth, step) in path.0.iter().enumerate() {
        let skip = if depth + 1 == path.0.len() { occurrence } else { 0 };
        let found = match step {
            Step::Index(index) => node.items().get(*index).map(|item| (*index, item)),
            Step::Key(key) => node
                .entries()
                .iter()
                .enumerate()
                .filter(|(_, (name, _))| name == key)
                .nth(skip)
                .map(|(position, (_, value))| (position, value)),
        };
        let Some((position, below)) = found else {
            return settle(steps, Aspect::Key, root);
        };
        steps.push(position);
        node = below;
    }
    settle(steps, aspect, root)
}

/// An item of a list and the whole file have no key of their own, so their value stands for it.
fn settle(steps: Vec<usize>, aspect: Aspect, root: &Node) -> Place {
    let above = steps.split_last().map(|(_, above)| descend(root, above));
    let keyed = matches!(above, Some(Some(Node::Map(_))));
    Place { aspect: if keyed { aspect } else { Aspect::Value }, steps }
}

fn descend<'n>(root: &'n Node, steps: &[usize]) -> Option<&'n Node> {
    steps.iter().try_fold(root, |node, step| match node {
        Node::Map(entries) => entries.get(*step).map(|(_, value)| value),
        Node::List(items) => items.get(*step),
        _ => None,
    })
}

/// Finds the positions of places in a file.
pub(super) struct Locator<'t> {
    text: &'t Text,
    root: &'t Node,
    /// Places that were found before, such as the list that holds several of them.
    known: RefCell<HashMap<Place, Position>>,
}

impl<'t> Locator<'t> {
    /// A locator for a file and its tree.
    pub fn new(text: &'t Text, root: &'t Node) -> Self {
        Self { text, root, known: RefCell::default() }
    }

    /// The stretch of text at a place. A block of lines is shown by its key, since its value begins only below.
    pub fn stretch(&self, place: &Place) -> Stretch {
        let mut aspect = place.aspect;
        let mut at = self.position(place);
        let many = matches!(descend(self.root, &place.steps), Some(Node::Map(_) | Node::List(_)));
        if aspect == Aspect::Value && many && !self.opens_bracket(at) {
            let key = settle(place.steps.clone(), Aspect::Key, self.root);
            aspect = Aspect::Key;
            at = self.position(&key);
        }
        let within_flow = place.steps.split_last().is_some_and(|(_, above)| {
            let above = Place { steps: above.to_vec(), aspect: Aspect::Value };
            self.opens_bracket(self.position(&above))
        });
        let rest = self.text.rest_of_line(at);
        let length = match rest.chars().next() {
            Some('[' | '{') if aspect == Aspect::Value => flow_length(rest),
            Some(quote @ ('"' | '\'')) => quoted_length(rest, quote),
            _ => plain_length(rest, within_flow),
        };
        Stretch { at, length: length.max(1) }
    }

    /// Whether any line of the file has a property.
    pub fn any_line(&self, holds: impl Fn(&str) -> bool) -> bool {
        (1..=self.text.lines()).any(|line| holds(self.text.line(line)))
    }

    /// The text of a stretch.
    pub fn token(&self, stretch: Stretch) -> String {
        self.text.rest_of_line(stretch.at).chars().take(stretch.length).collect()
    }

    fn opens_bracket(&self, at: Position) -> bool {
        self.text.rest_of_line(at).starts_with(['[', '{'])
    }

    fn position(&self, place: &Place) -> Position {
        if let Some(known) = self.known.borrow().get(place) {
            return *known;
        }
        let probe = Probe { steps: &place.steps, aspect: place.aspect };
        let found = probe.deserialize(serde_yaml::Deserializer::from_str(self.text.as_str()));
        let location = found.err().and_then(|error| error.location());
        let start = Position { line: 1, column: 1 };
        let at = location.map_or(start, |l| Position { line: l.line(), column: l.column() });
        self.known.borrow_mut().insert(place.clone(), at);
        at
    }
}

/// Characters of a scalar without quotes, to the end of the line at most.
fn plain_length(rest: &str, within_flow: bool) -> usize {
    let chars: Vec<char> = rest.chars().collect();
    let ends = |i: usize, c: char| {
        let next = chars.get(i + 1).copied().unwrap_or(' ');
        let flow_end = within_flow && matches!(c, ',' | '[' | ']' | '{' | '}');
        let key_end =
            c == ':' && (next.is_whitespace() || (within_flow && matches!(next, ',' | ']' | '}')));
        let comment =
            c == '#' && i > 0 && chars.get(i - 1).is_some_and(|before| before.is_whitespace());
        flow_end || key_end || comment
    };
    let end = chars.iter().enumerate().find(|(i, c)| ends(*i, **c)).map_or(chars.len(), |(i, _)| i);
    chars.iter().take(end).collect::<String>().trim_end().chars().count()
}

/// Characters of a scalar in quotes, to the end of the line at most.
pub(super) fn quoted_length(rest: &str, quote: char) -> usize {
    let mut escaped = false;
    for (i, c) in rest.chars().enumerate().skip(1) {
        if escaped {
            escaped = false;
        } else if c == '\\' && quote == '"' {
            escaped = true;
        } else if c == quote {
            return i + 1;
        }
    }
    rest.trim_end().chars().count()
}

/// Characters of a list or mapping in brackets, to the end of the line at most.
pub(super) fn flow_length(rest: &str) -> usize {
    let mut depth = 0usize;
    let mut quote = None;
    for (i, c) in rest.chars().enumerate() {
        match (quote, c) {
            (Some(q), c) if q == c => quote = None,
            (Some(_), _) => {}
            (None, '"' | '\'') => quote = Some(c),
            (None, '[' | '{') => depth += 1,
            (None, ']' | '}') => {
                depth = depth.saturating_sub(1);
                if depth == 0 {
                    return i + 1;
                }
            }
            (None, _) => {}
        }
    }
    rest.trim_end().chars().count()
}

/// Walks down to a place and fails there.
#[derive(Clone, Copy)]
struct Probe<'p> {
    steps: &'p [usize],
    aspect: Aspect,
}

impl<'p> Probe<'p> {
    /// What to do with the entry or item at a position.
    fn step(self, position: usize) -> Option<Self> {
        match self.steps.split_first() {
            Some((first, rest)) if *first == position => Some(Self { steps: rest, ..self }),
            _ => None,
        }
    }

    fn here<T, E: Error>(self) -> Result<T, E> {
        Err(E::custom("here"))
    }
}

impl<'de> DeserializeSeed<'de> for Probe<'_> {
    type Value = ();

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<(), D::Error> {
        deserializer.deserialize_any(self)
    }
}

impl<'de> Visitor<'de> for Probe<'_> {
    type Value = ();

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("the value that is looked for")
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut seq: A) -> Result<(), A::Error> {
        if self.steps.is_empty() {
            return self.here();
        }
        for position in 0.. {
            let more = match self.step(position) {
                Some(below) => seq.next_element_seed(below)?.is_some(),
                None => seq.next_element::<IgnoredAny>()?.is_some(),
            };
            if !more {
                break;
            }
        }
        Ok(())
    }

    fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<(), A::Error> {
        if self.steps.is_empty() {
            return self.here();
        }
        for position in 0.. {
            let below = self.step(position);
            let key_wanted = self.aspect == Aspect::Key && self.steps.len() == 1;
            let more = match below {
                Some(below) if key_wanted => map.next_key_seed(below)?.is_some(),
                _ => map.next_key::<IgnoredAny>()?.is_some(),
            };
            if !more {
                break;
            }
            match below {
                Some(below) => map.next_value_seed(below)?,
                None => {
                    map.next_value::<IgnoredAny>()?;
                }
            }
        }
        Ok(())
    }

    fn visit_bool<E: Error>(self, _: bool) -> Result<(), E> {
        self.here()
    }

    fn visit_i64<E: Error>(self, _: i64) -> Result<(), E> {
        self.here()
    }

    fn visit_u64<E: Error>(self, _: u64) -> Result<(), E> {
        self.here()
    }

    fn visit_i128<E: Error>(self, _: i128) -> Result<(), E> {
        self.here()
    }

    fn visit_u128<E: Error>(self, _: u128) -> Result<(), E> {
        self.here()
    }

    fn visit_f64<E: Error>(self, _: f64) -> Result<(), E> {
        self.here()
    }

    fn visit_str<E: Error>(self, _: &str) -> Result<(), E> {
        self.here()
    }

    fn visit_unit<E: Error>(self) -> Result<(), E> {
        self.here()
    }

    fn visit_none<E: Error>(self) -> Result<(), E> {
        self.here()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const SAMPLE: &str = "\
title: Über \"uns\" # note
list:
- name: a
  risk: {alpha: 0.05, 'power': \"0,8\", sides: two}
  values: [1, [2, 3] , -4]
-   name: b
    deep:
      x: 1
      x: 2
empty:
";

    fn found(dotted: &[Step], aspect: Aspect, occurrence: usize) -> (usize, usize, usize) {
        let (text, _) = Text::decode(SAMPLE.as_bytes());
        let root = Node::parse(SAMPLE).unwrap_or(Node::Null);
        let place = place(&root, &Path(dotted.to_vec()), aspect, occurrence);
        let found = Locator::new(&text, &root).stretch(&place);
        (found.at.line, found.at.column, found.length)
    }

    fn key(name: &str) -> Step {
        Step::Key(name.to_owned())
    }

    #[test]
    fn keys_and_values_are_found() {
        use Aspect::{Key, Value};
        let first = [key("list"), Step::Index(0)];
        let below = |steps: &[Step]| first.iter().chain(steps).cloned().collect::<Vec<_>>();
        assert_eq!(found(&[key("title")], Key, 0), (1, 1, 5));
        assert_eq!(found(&[key("title")], Value, 0), (1, 8, 10));
        assert_eq!(found(&below(&[]), Value, 0), (3, 3, 4));
        assert_eq!(found(&below(&[key("risk"), key("alpha")]), Value, 0), (4, 17, 4));
        assert_eq!(found(&below(&[key("risk"), key("power")]), Key, 0), (4, 23, 7));
        assert_eq!(found(&below(&[key("risk"), key("power")]), Value, 0), (4, 32, 5));
        assert_eq!(found(&below(&[key("risk")]), Value, 0), (4, 9, 41));
        assert_eq!(found(&below(&[key("risk")]), Key, 0), (4, 3, 4));
        assert_eq!(found(&below(&[key("values"), Step::Index(1)]), Value, 0), (5, 15, 6));
        assert_eq!(found(&below(&[key("values"), Step::Index(2)]), Value, 0), (5, 24, 2));
    }

    #[test]
    fn blocks_are_shown_by_their_key_and_missing_parts_by_what_holds_them() {
        let second = [key("list"), Step::Index(1)];
        let below = |steps: &[Step]| second.iter().chain(steps).cloned().collect::<Vec<_>>();
        assert_eq!(found(&below(&[key("deep")]), Aspect::Value, 0), (7, 5, 4));
        assert_eq!(found(&below(&[key("deep"), key("x")]), Aspect::Key, 1), (9, 7, 1));
        assert_eq!(found(&below(&[key("deep"), key("y")]), Aspect::Value, 0), (7, 5, 4));
        assert_eq!(found(&[key("none")], Aspect::Value, 0), (1, 1, 5));
        assert_eq!(found(&[], Aspect::Key, 0), (1, 1, 5));
        assert_eq!(found(&[key("empty")], Aspect::Value, 0).0, 10);
    }
}
