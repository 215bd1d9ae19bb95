//! Numbers that YAML reads but a reader of the spec would not: `0x8` and `0o10` are 8.
//!
//! The tree holds values, not how they are written, so the file is read a second time along the tree.

use std::cell::RefCell;
use std::fmt;

use serde::Deserialize;
use serde::de::{DeserializeSeed, Deserializer, Error, IgnoredAny, MapAccess, SeqAccess, Visitor};

use super::hints;
use super::node::Node;
use super::text::{Text, printable};
use super::words;
use crate::designs::{Fault, Path};

/// The numbers of a file that are not written with decimal digits.
pub(super) fn foreign(text: &Text, root: &Node) -> Vec<Fault> {
    if !["0x", "0o", "0b"].iter().any(|prefix| text.as_str().contains(prefix)) {
        return Vec::new();
    }
    let found = RefCell::default();
    let walk = Walk { node: root, at: Path::default(), found: &found };
    // The tree came from the same text, so this reading ends as the first one did.
    let _ = walk.deserialize(serde_yaml::Deserializer::from_str(text.as_str()));
    found.into_inner()
}

/// Goes through the file along its tree and looks at every number as text.
struct Walk<'w> {
    node: &'w Node,
    at: Path,
    found: &'w RefCell<Vec<Fault>>,
}

impl<'de> DeserializeSeed<'de> for Walk<'_> {
    type Value = ();

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<(), D::Error> {
        match self.node {
            node if node.is_number() => deserializer.deserialize_str(self),
            Node::List(_) => deserializer.deserialize_seq(self),
            Node::Map(_) => deserializer.deserialize_map(self),
            _ => IgnoredAny::deserialize(deserializer).map(|_| ()),
        }
    }
}

impl<'de> Visitor<'de> for Walk<'_> {
    type Value = ();

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("the value that was read before")
    }

    fn visit_str<E: Error>(self, written: &str) -> Result<(), E> {
        if let Some((notation, value)) = hints::other_base(written) {
            let subject = words::subject(&self.at);
            let shown = printable(written, 60);
            let reason = format!("{subject} is `{shown}`, a number in {notation} notation");
            let fault = Fault::value(self.at, reason).help(hints::decimal(&value));
            self.found.borrow_mut().push(fault);
        }
        Ok(())
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut seq: A) -> Result<(), A::Error> {
        for (index, node) in self.node.items().iter().enumerate() {
            seq.next_element_seed(Walk { node, at: self.at.item(index), found: self.found })?;
        }
        while seq.next_element::<IgnoredAny>()?.is_some() {}
        Ok(())
    }

    fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<(), A::Error> {
        for (key, node) in self.node.entries() {
            if map.next_key::<IgnoredAny>()?.is_some() {
                map.next_value_seed(Walk { node, at: self.at.key(key), found: self.found })?;
            }
        }
        while map.next_entry::<IgnoredAny, IgnoredAny>()?.is_some() {}
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_looked_at_wherever_they_stand() {
        let file = "a: 0x8\nb: [1, {c: 0o17}, *d]\nt: '0x9'\ne: [0b11, -0x2, 10]\n";
        let file = format!("d: &d 0x5\n{file}");
        let (text, _) = Text::decode(file.as_bytes());
        let root = Node::parse(&file).unwrap_or(Node::Null);
        let found: Vec<_> =
            foreign(&text, &root).into_iter().map(|f| (f.at.to_string(), f.help)).collect();
        let expected = [
            ("d", "5"),
            ("a", "8"),
            ("b[1].c", "15"),
            ("b[2]", "5"),
            ("e[0]", "3"),
            ("e[1]", "-2"),
        ];
        let expected = expected.map(|(at, value)| (at.to_owned(), Some(hints::decimal(value))));
        assert_eq!(found, expected);
    }

    #[test]
    fn a_file_without_such_numbers_has_no_fault() {
        for file in ["title: 0x8 units\nn: 8\n", "a: '0x8'\n", "n: 8\n", "0x8: 1\n"] {
            let (text, _) = Text::decode(file.as_bytes());
            let root = Node::parse(file).unwrap_or(Node::Null);
            assert_eq!(foreign(&text, &root), [], "{file}");
        }
    }
}
