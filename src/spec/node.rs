//! The YAML file as a small tree that keeps the order and repetition of keys, within a budget.

use std::cell::Cell;
use std::fmt;

use serde::de::{DeserializeSeed, Deserializer, EnumAccess, Error, MapAccess, SeqAccess, Visitor};

use super::text;
use crate::designs::{Path, Step};

/// Most values in one file; more than a person writes, and few enough to stay fast.
const MOST_VALUES: usize = 200_000;

/// A value of the file.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Node {
    Null,
    Truth(bool),
    Whole(i64),
    Large(u64),
    Number(f64),
    Text(String),
    List(Vec<Node>),
    Map(Vec<(String, Node)>),
}

/// Something that is legal YAML and no spec.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Refusal {
    TooManyValues,
    Repetition,
    Tag,
    KeyOfManyParts,
}

/// Why no tree came about.
#[derive(Debug)]
pub(super) enum NoTree {
    /// The parser's own error.
    Syntax(serde_yaml::Error),
    /// A refusal, with the parser's error for its place.
    Refused(Refusal, serde_yaml::Error),
}

impl Node {
    /// Reads a file.
    ///
    /// # Errors
    ///
    /// The text is no YAML, or holds what no spec may hold.
    pub fn parse(text: &str) -> Result<Self, NoTree> {
        let budget = Budget {
            values: Cell::new(MOST_VALUES),
            // An escape such as `\L` may become longer than it was written, but never twice as long.
            characters: Cell::new(2 * text.len()),
            refusal: Cell::new(None),
        };
        Seed { budget: &budget }.deserialize(serde_yaml::Deserializer::from_str(text)).map_err(
            |error| match budget.refusal.get() {
                Some(refusal) => NoTree::Refused(refusal, error),
                None => NoTree::Syntax(error),
            },
        )
    }

    /// The entries of a mapping; none for any other value.
    pub fn entries(&self) -> &[(String, Self)] {
        match self {
            Self::Map(entries) => entries,
            _ => &[],
        }
    }

    /// The items of a list; none for any other value.
    pub fn items(&self) -> &[Self] {
        match self {
            Self::List(items) => items,
            _ => &[],
        }
    }

    /// The first value of a key.
    pub fn get(&self, key: &str) -> Option<&Self> {
        self.entries().iter().find(|(name, _)| name == key).map(|(_, value)| value)
    }

    /// The value at a path.
    pub fn at(&self, path: &Path) -> Option<&Self> {
        path.0.iter().try_fold(self, |node, step| match step {
            Step::Key(key) => node.get(key),
            Step::Index(index) => node.items().get(*index),
        })
    }

    /// The text, if it is one.
    pub fn text(&self) -> Option<&str> {
        match self {
            Self::Text(text) => Some(text),
            _ => None,
        }
    }

    /// Whether it is a number of any kind.
    pub fn is_number(&self) -> bool {
        matches!(self, Self::Whole(_) | Self::Large(_) | Self::Number(_))
    }

    /// The tree as the general value from which typed ones are read; white space in text is collapsed, but not in
    /// the names of files.
    pub fn to_value(&self) -> serde_yaml::Value {
        self.value_of("")
    }

    fn value_of(&self, key: &str) -> serde_yaml::Value {
        use serde_yaml::Value;
        match self {
            Self::Null => Value::Null,
            Self::Truth(value) => Value::Bool(*value),
            Self::Whole(value) => Value::Number((*value).into()),
            Self::Large(value) => Value::Number((*value).into()),
            Self::Number(value) => Value::Number((*value).into()),
            Self::Text(text) if matches!(key, "file" | "references") => Value::String(text.clone()),
            Self::Text(text) => Value::String(text::collapse(text)),
            Self::List(items) => {
                Value::Sequence(items.iter().map(|item| item.value_of(key)).collect())
            }
            Self::Map(entries) => Value::Mapping(
                entries
                    .iter()
                    .map(|(key, value)| (Value::String(key.clone()), value.value_of(key)))
                    .collect(),
            ),
        }
    }
}

/// What may still be read.
struct Budget {
    values: Cell<usize>,
    characters: Cell<usize>,
    refusal: Cell<Option<Refusal>>,
}

impl Budget {
    fn refuse<E: Error>(&self, refusal: Refusal) -> E {
        self.refusal.set(Some(refusal));
        E::custom("refused")
    }

    fn take<E: Error>(&self, characters: usize) -> Result<(), E> {
        let values =
            self.values.get().checked_sub(1).ok_or_else(|| self.refuse(Refusal::TooManyValues))?;
        // Honest text cannot run out of characters; what repeats itself through aliases does.
        let characters = self
            .characters
            .get()
            .checked_sub(characters)
            .ok_or_else(|| self.refuse(Refusal::Repetition))?;
        self.values.set(values);
        self.characters.set(characters);
        Ok(())
    }
}

#[derive(Clone, Copy)]
struct Seed<'b> {
    budget: &'b Budget,
}

impl<'de> DeserializeSeed<'de> for Seed<'_> {
    type Value = Node;

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<Node, D::Error> {
        deserializer.deserialize_any(self)
    }
}

impl<'de> Visitor<'de> for Seed<'_> {
    type Value = Node;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a value")
    }

    fn visit_bool<E: Error>(self, value: bool) -> Result<Node, E> {
        self.budget.take(0)?;
        Ok(Node::Truth(value))
    }

    fn visit_i64<E: Error>(self, value: i64) -> Result<Node, E> {
        self.budget.take(0)?;
        Ok(Node::Whole(value))
    }

    fn visit_u64<E: Error>(self, value: u64) -> Result<Node, E> {
        self.budget.take(0)?;
        Ok(i64::try_from(value).map_or(Node::Large(value), Node::Whole))
    }

    fn visit_i128<E: Error>(self, value: i128) -> Result<Node, E> {
        self.visit_f64(value as f64)
    }

    fn visit_u128<E: Error>(self, value: u128) -> Result<Node, E> {
        self.visit_f64(value as f64)
    }

    fn visit_f64<E: Error>(self, value: f64) -> Result<Node, E> {
        self.budget.take(0)?;
        Ok(Node::Number(value))
    }

    fn visit_str<E: Error>(self, value: &str) -> Result<Node, E> {
        self.budget.take(value.len())?;
        Ok(Node::Text(value.to_owned()))
    }

    fn visit_unit<E: Error>(self) -> Result<Node, E> {
        self.budget.take(0)?;
        Ok(Node::Null)
    }

    fn visit_none<E: Error>(self) -> Result<Node, E> {
        self.visit_unit()
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut seq: A) -> Result<Node, A::Error> {
        self.budget.take(0)?;
        let mut items = Vec::new();
        while let Some(item) = seq.next_element_seed(self)? {
            items.push(item);
        }
        Ok(Node::List(items))
    }

    fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<Node, A::Error> {
        self.budget.take(0)?;
        let mut entries = Vec::new();
        while let Some(key) = map.next_key_seed(KeySeed(self))? {
            entries.push((key, map.next_value_seed(self)?));
        }
        Ok(Node::Map(entries))
    }

    fn visit_enum<A: EnumAccess<'de>>(self, _data: A) -> Result<Node, A::Error> {
        Err(self.budget.refuse(Refusal::Tag))
    }
}

/// A key: a word, or a number or truth value that is taken as the word it is written with.
struct KeySeed<'b>(Seed<'b>);

impl<'de> DeserializeSeed<'de> for KeySeed<'_> {
    type Value = String;

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<String, D::Error> {
        let budget = self.0.budget;
        match deserializer.deserialize_any(self.0)? {
            Node::Text(text) => Ok(text::collapse(&text)),
            Node::Truth(value) => Ok(value.to_string()),
            Node::Whole(value) => Ok(value.to_string()),
            Node::Large(value) => Ok(value.to_string()),
            Node::Number(value) => Ok(value.to_string()),
            Node::Null => Ok(String::new()),
            Node::List(_) | Node::Map(_) => Err(budget.refuse(Refusal::KeyOfManyParts)),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn order_kinds_and_repetition_are_kept() {
        let node = Node::parse("b: [1, 2.5, yes, 'x', true]\na: ~\nb: 18446744073709551615\n").ok();
        let list = vec![
            Node::Whole(1),
            Node::Number(2.5),
            Node::Text("yes".into()),
            Node::Text("x".into()),
            Node::Truth(true),
        ];
        let expected = Node::Map(vec![
            ("b".into(), Node::List(list)),
            ("a".into(), Node::Null),
            ("b".into(), Node::Large(u64::MAX)),
        ]);
        assert_eq!(node, Some(expected));
    }

    #[test]
    fn repetition_through_aliases_runs_out_of_budget() {
        let long = "x".repeat(10_000);
        let text = format!("a: &a {long}\nb: [{}]\n", vec!["*a"; 500].join(", "));
        assert!(matches!(Node::parse(&text), Err(NoTree::Refused(Refusal::Repetition, _))));
        let lists = format!(
            "a: &a [{}]\nb: [{}]\n",
            vec!["1"; 2000].join(","),
            vec!["*a"; 2000].join(", ")
        );
        assert!(matches!(Node::parse(&lists), Err(NoTree::Refused(Refusal::TooManyValues, _))));
    }

    #[test]
    fn tags_and_compound_keys_are_refused() {
        assert!(matches!(Node::parse("a: !date 2031"), Err(NoTree::Refused(Refusal::Tag, _))));
        assert!(matches!(
            Node::parse("? [a, b]\n: 1"),
            Err(NoTree::Refused(Refusal::KeyOfManyParts, _))
        ));
    }

    #[test]
    fn white_space_is_collapsed_but_not_in_file_names() {
        let node = Node::parse("a: 'x   y'\nfile: 'p  q.csv'\n").ok();
        let value = node.map(|n| n.to_value());
        let text = |key: &str| {
            value.as_ref().and_then(|v| v.get(key)).and_then(|v| v.as_str()).map(str::to_owned)
        };
        assert_eq!(
            (text("a").as_deref(), text("file").as_deref()),
            (Some("x y"), Some("p  q.csv"))
        );
    }
}
