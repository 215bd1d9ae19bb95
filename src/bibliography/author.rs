//! The author's reference file: checked before it is believed.

use std::cell::Cell;
use std::collections::{BTreeMap, BTreeSet};
use std::fmt;

use hayagriva::{Entry, io};
use serde::de::{DeserializeSeed, Deserializer, Error, IgnoredAny, MapAccess, SeqAccess, Visitor};

use super::{BibliographyError, builtin, names, runs};

/// Largest reference file read, in bytes.
pub const MAX_BYTES: usize = 1 << 18;
/// Largest product of opening brackets and separators: the YAML reader's time grows with the one times the other,
/// since it looks through all open brackets at every separator.
const MAX_BRACKET_WORK: usize = 200_000_000;
/// Largest number of values in the file after aliases are followed: stops nested aliases early.
const MAX_VALUES: usize = 100_000;
/// Longest text of one value, in characters.
const MAX_TEXT: usize = 5_000;
/// Longest key, in characters.
const MAX_KEY: usize = 80;

/// Fields of an entry in Hayagriva's format.
const FIELDS: [&str; 28] = [
    "type",
    "parent",
    "title",
    "author",
    "date",
    "editor",
    "affiliated",
    "publisher",
    "location",
    "organization",
    "issue",
    "chapter",
    "volume",
    "volume-total",
    "edition",
    "page-range",
    "page-total",
    "time-range",
    "runtime",
    "url",
    "serial-number",
    "language",
    "archive",
    "archive-location",
    "call-number",
    "note",
    "abstract",
    "genre",
];

/// Reads and checks the author's references.
pub(super) fn read(text: &str) -> Result<BTreeMap<String, Entry>, BibliographyError> {
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    if text.len() > MAX_BYTES {
        return Err(BibliographyError::plain(format!(
            "the file has {} bytes; at most {MAX_BYTES} are read",
            text.len()
        )));
    }
    refuse_characters(text)?;
    refuse_brackets(text)?;
    let values = Cell::new(0);
    let probe = Probe { values: &values, place: Place::File };
    probe
        .deserialize(serde_yaml::Deserializer::from_str(text))
        .map_err(|error| from_yaml(&error))?;
    let library = io::from_yaml_str(text).map_err(|error| from_yaml(&error))?;
    let mut entries = BTreeMap::new();
    for mut entry in library {
        if entry.title().is_none_or(|title| title.value.is_empty()) {
            return Err(BibliographyError::at(
                line_of_key(text, entry.key()),
                format!("the reference `{}` has no `title`", entry.key()),
            ));
        }
        names::join_particles(&mut entry);
        entries.insert(entry.key().to_owned(), entry);
    }
    Ok(entries)
}

/// Control characters, and those that reorder the text around them, have no place in a reference.
fn refuse_characters(text: &str) -> Result<(), BibliographyError> {
    for (index, line) in text.split('\n').enumerate() {
        let line = line.strip_suffix('\r').unwrap_or(line);
        if let Some(bad) = line.chars().find(|c| forbidden(*c)) {
            return Err(BibliographyError::at(
                Some(index + 1),
                format!("the character U+{:04X} is not allowed in text", u32::from(bad)),
            ));
        }
    }
    Ok(())
}

fn refuse_brackets(text: &str) -> Result<(), BibliographyError> {
    let count = |signs: &[u8]| text.bytes().filter(|byte| signs.contains(byte)).count();
    let brackets = count(b"[{");
    if brackets.saturating_mul(count(b"[]{},:?\n")) > MAX_BRACKET_WORK {
        return Err(BibliographyError::plain(format!(
            "the file has {brackets} opening brackets, too many for its length"
        )));
    }
    Ok(())
}

fn forbidden(character: char) -> bool {
    (character.is_control() && character != '\t')
        || matches!(
            character,
            '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' | '\u{2028}' | '\u{2029}' | '\u{feff}'
        )
}

/// The first line that opens the entry of this key.
fn line_of_key(text: &str, key: &str) -> Option<usize> {
    let opens = |line: &str| {
        let line = line.trim_start_matches(['"', '\'']);
        line.strip_prefix(key)
            .map(|rest| rest.trim_start_matches(['"', '\'']))
            .is_some_and(|rest| rest.trim_start().starts_with(':'))
    };
    text.lines().position(opens).map(|index| index + 1)
}

/// An error of the YAML reader in plain words, with its line apart.
fn from_yaml(error: &serde_yaml::Error) -> BibliographyError {
    let line = error.location().map(|location| location.line());
    let text = error.to_string();
    let text = text.split(" at line ").next().unwrap_or_default();
    let plain = if let Some((_, own)) = text.split_once(OWN) {
        own.to_owned()
    } else if text.contains("recursion limit") {
        "values are nested too deeply".to_owned()
    } else if text.contains("repetition limit") {
        "aliases repeat too much".to_owned()
    } else if text.contains("EOF") || text.contains("end of stream") {
        "the file holds no references; write one entry per key".to_owned()
    } else if let Some((name, rest)) =
        text.split_once("unknown variant `").and_then(|(_, rest)| rest.split_once("`, "))
    {
        // The engine lists each word twice, once with a capital.
        let words: Vec<&str> = rest
            .split(['`', ',', ' '])
            .filter(|word| {
                word.starts_with(|c: char| c.is_ascii_lowercase())
                    && !["expected", "one", "of"].contains(word)
            })
            .collect();
        format!("`{}` is not possible here; use one of {}", shorten(name), words.join(", "))
    } else if ["invalid ", "unknown ", "missing field"].iter().any(|start| text.contains(start)) {
        "a value here is of the wrong kind for its field of a reference".to_owned()
    } else {
        format!("this cannot be read as a list of references: {text}")
    };
    BibliographyError::at(line, plain)
}

/// Marks messages of this module among those of the YAML reader.
const OWN: &str = "\u{1}";

fn fault<E: Error>(reason: impl fmt::Display) -> E {
    E::custom(format_args!("{OWN}{reason}"))
}

/// What the value being walked is.
#[derive(Clone, Copy)]
enum Place {
    /// The whole file: entries by key.
    File,
    /// An entry, or a work that an entry is part of.
    Entry,
    /// One such work or a list of them.
    Parents,
    /// A link, or a link with the date of the visit.
    Link,
    /// Any other value.
    Value,
}

/// Walks a YAML value without keeping it; an error raised here carries its line.
#[derive(Clone, Copy)]
struct Probe<'a> {
    values: &'a Cell<usize>,
    place: Place,
}

impl Probe<'_> {
    fn at(self, place: Place) -> Self {
        Self { place, ..self }
    }

    fn text<E: Error>(self, text: &str) -> Result<(), E> {
        match self.place {
            Place::File => return Err(fault("the file must hold references by key")),
            Place::Entry | Place::Parents => {
                return Err(fault("a reference must hold fields such as `title: ...`"));
            }
            Place::Link if !runs::is_web_address(text) => {
                return Err(fault("a link must begin with `https://` or `http://`"));
            }
            Place::Link | Place::Value => {}
        }
        if text.chars().take(MAX_TEXT + 1).count() > MAX_TEXT {
            return Err(fault(format_args!("a text here is longer than {MAX_TEXT} characters")));
        }
        // An escape such as "\u0007" becomes a control character only here.
        match text.chars().find(|c| forbidden(*c) && *c != '\n') {
            Some(bad) => Err(fault(format_args!(
                "the character U+{:04X} is not allowed in text",
                u32::from(bad)
            ))),
            None => Ok(()),
        }
    }

    fn scalar<E: Error>(self) -> Result<(), E> {
        match self.place {
            Place::Value => Ok(()),
            _ => self.text(""),
        }
    }

    /// What the value under this key is.
    fn below<E: Error>(self, key: &str) -> Result<Place, E> {
        match self.place {
            Place::File => {
                check_key(key)?;
                Ok(Place::Entry)
            }
            Place::Entry | Place::Parents => match key {
                "parent" => Ok(Place::Parents),
                "url" => Ok(Place::Link),
                _ if FIELDS.contains(&key) => Ok(Place::Value),
                _ => Err(fault(format_args!(
                    "references have no field `{}`; the fields are {}",
                    shorten(key),
                    FIELDS.join(", ")
                ))),
            },
            Place::Link if key == "value" => Ok(Place::Link),
            Place::Link | Place::Value => Ok(Place::Value),
        }
    }
}

/// A key of the author must be printable, free of spaces and not one of the program's.
fn check_key<E: Error>(key: &str) -> Result<(), E> {
    let plain = |c: char| c.is_alphanumeric() || matches!(c, '-' | '_' | '.' | ':' | '+' | '/');
    if key.is_empty() || key.chars().count() > MAX_KEY || !key.chars().all(plain) {
        return Err(fault(format_args!(
            "`{}` is no key: a key has 1 to {MAX_KEY} letters, digits, or the signs - _ . : + /",
            shorten(key)
        )));
    }
    if builtin::contains(key) {
        return Err(fault(format_args!(
            "the key `{key}` belongs to a reference of the program; choose another one"
        )));
    }
    Ok(())
}

/// A text of the author as it may stand in a message.
fn shorten(text: &str) -> String {
    text.chars().take(40).map(|c| if c.is_control() { '\u{fffd}' } else { c }).collect()
}

impl<'de> DeserializeSeed<'de> for Probe<'_> {
    type Value = ();

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<(), D::Error> {
        self.values.set(self.values.get() + 1);
        if self.values.get() > MAX_VALUES {
            return Err(fault(format_args!(
                "the file holds more than {MAX_VALUES} values once its aliases are followed"
            )));
        }
        deserializer.deserialize_any(self)
    }
}

impl<'de> Visitor<'de> for Probe<'_> {
    type Value = ();

    fn expecting(&self, formatter: &mut fmt::Formatter) -> fmt::Result {
        formatter.write_str("references by key")
    }

    fn visit_str<E: Error>(self, text: &str) -> Result<(), E> {
        self.text(text)
    }

    fn visit_bool<E: Error>(self, _: bool) -> Result<(), E> {
        self.scalar()
    }

    fn visit_i64<E: Error>(self, _: i64) -> Result<(), E> {
        self.scalar()
    }

    fn visit_u64<E: Error>(self, _: u64) -> Result<(), E> {
        self.scalar()
    }

    fn visit_f64<E: Error>(self, _: f64) -> Result<(), E> {
        self.scalar()
    }

    fn visit_unit<E: Error>(self) -> Result<(), E> {
        self.scalar()
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut items: A) -> Result<(), A::Error> {
        let place = match self.place {
            Place::Parents => Place::Entry,
            Place::Value => Place::Value,
            other => return self.at(other).text(""),
        };
        while items.next_element_seed(self.at(place))?.is_some() {}
        Ok(())
    }

    fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<(), A::Error> {
        let mut seen = BTreeSet::new();
        while let Some((key, place)) = map.next_key_seed(Key { probe: self, seen: &seen })? {
            seen.insert(key);
            map.next_value_seed(self.at(place))?;
        }
        Ok(())
    }

    fn visit_enum<A: serde::de::EnumAccess<'de>>(self, data: A) -> Result<(), A::Error> {
        data.variant::<IgnoredAny>()?;
        Err(fault("YAML tags (`!name`) are not used in references"))
    }
}

/// Reads a key of a mapping; a fault raised here carries the line of the key.
struct Key<'a> {
    probe: Probe<'a>,
    seen: &'a BTreeSet<String>,
}

impl<'de> DeserializeSeed<'de> for Key<'_> {
    type Value = (String, Place);

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<Self::Value, D::Error> {
        deserializer.deserialize_str(self)
    }
}

impl<'de> Visitor<'de> for Key<'_> {
    type Value = (String, Place);

    fn expecting(&self, formatter: &mut fmt::Formatter) -> fmt::Result {
        formatter.write_str("a key")
    }

    fn visit_str<E: Error>(self, key: &str) -> Result<Self::Value, E> {
        let place = self.probe.below(key)?;
        if self.seen.contains(key) {
            return Err(fault(format_args!("`{}` is given more than once", shorten(key))));
        }
        Ok((key.to_owned(), place))
    }
}
