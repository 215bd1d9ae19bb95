//! What may stand at a place of the file, compiled from its JSON Schema, so that checks and schema cannot differ.

use serde_json::{Map, Value};

/// What may stand at a place.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Shape {
    /// Anything; the meaning is checked elsewhere.
    Any,
    /// A truth value.
    Truth,
    /// A number, whole or not, with inclusive limits.
    Number { whole: bool, low: Option<f64>, high: Option<f64> },
    /// Text.
    Text,
    /// One of several words.
    Choice(Vec<String>),
    /// A list with limits on its length.
    List { item: Box<Shape>, least: usize, most: usize },
    /// A mapping.
    Map(Keys),
    /// Any of several.
    Either(Vec<Shape>),
}

/// The keys of a mapping.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Keys {
    /// The keys that have a meaning, in the order in which they are listed.
    pub known: Vec<KeyShape>,
    /// What any other key may hold, where the author names keys.
    pub others: Option<Box<Shape>>,
}

/// A key of a mapping.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct KeyShape {
    pub name: String,
    pub required: bool,
    /// The first sentence of what the key means.
    pub meaning: String,
    pub shape: Shape,
}

impl Keys {
    /// A key by its name.
    pub fn get(&self, name: &str) -> Option<&KeyShape> {
        self.known.iter().find(|key| key.name == name)
    }

    /// These keys and those of other mappings in the same place, each once.
    #[must_use]
    pub fn union(mut self, other: &Self) -> Self {
        for key in &other.known {
            match self.known.iter_mut().find(|known| known.name == key.name) {
                None => self.known.push(key.clone()),
                Some(known) => {
                    if let (Shape::Map(one), Shape::Map(two)) = (&mut known.shape, &key.shape) {
                        *one = std::mem::take(one).union(two);
                    }
                }
            }
        }
        self
    }

    /// The names of all keys.
    pub fn names(&self) -> Vec<&str> {
        self.known.iter().map(|key| key.name.as_str()).collect()
    }
}

impl Shape {
    /// Compiles a schema whose references are the given definitions.
    pub fn compile(schema: &Value, definitions: &Map<String, Value>) -> Self {
        let schema = resolved(schema, definitions);
        let Some(fields) = schema.as_object() else { return Self::Any };
        if let Some(options) = alternatives(fields) {
            return either(options, definitions);
        }
        if let Some(word) = fields.get("const").and_then(Value::as_str) {
            return Self::Choice(vec![word.to_owned()]);
        }
        if let Some(words) = fields.get("enum").and_then(Value::as_array) {
            return Self::Choice(
                words.iter().filter_map(Value::as_str).map(str::to_owned).collect(),
            );
        }
        let limit = |key: &str| fields.get(key).and_then(Value::as_f64);
        let length = |key: &str| {
            fields.get(key).and_then(Value::as_u64).and_then(|n| usize::try_from(n).ok())
        };
        match kind(fields) {
            "boolean" => Self::Truth,
            "integer" => {
                Self::Number { whole: true, low: limit("minimum"), high: limit("maximum") }
            }
            "number" => {
                Self::Number { whole: false, low: limit("minimum"), high: limit("maximum") }
            }
            "string" => Self::Text,
            "array" => Self::List {
                item: Box::new(
                    fields.get("items").map_or(Self::Any, |item| Self::compile(item, definitions)),
                ),
                least: length("minItems").unwrap_or(1),
                most: length("maxItems").unwrap_or(usize::MAX),
            },
            "object" => Self::Map(keys(fields, definitions)),
            _ => Self::Any,
        }
    }

    /// The mapping among the alternatives, if there is one.
    pub fn mapping(&self) -> Option<&Keys> {
        match self {
            Self::Map(keys) => Some(keys),
            Self::Either(options) => options.iter().find_map(Self::mapping),
            _ => None,
        }
    }
}

/// A schema with its own reference followed; what stands beside the reference is kept.
pub(super) fn resolved(schema: &Value, definitions: &Map<String, Value>) -> Value {
    let mut schema = schema.clone();
    // References lead to definitions, not in circles; the count only guards against a broken schema.
    for _ in 0..32 {
        let target = schema
            .get("$ref")
            .and_then(Value::as_str)
            .and_then(|name| definitions.get(name.rsplit('/').next().unwrap_or(name)));
        let (Some(target), Some(fields)) =
            (target.and_then(Value::as_object).cloned(), schema.as_object_mut())
        else {
            break;
        };
        fields.remove("$ref");
        for (key, value) in target {
            fields.entry(key).or_insert(value);
        }
    }
    schema
}

fn alternatives(fields: &Map<String, Value>) -> Option<&Vec<Value>> {
    ["anyOf", "oneOf"].iter().find_map(|key| fields.get(*key)).and_then(Value::as_array)
}

fn either(options: &[Value], definitions: &Map<String, Value>) -> Shape {
    let mut shapes = Vec::new();
    let mut words = Vec::new();
    for option in options.iter().filter(|option| !is_null(option)) {
        match Shape::compile(option, definitions) {
            Shape::Choice(more) => words.extend(more),
            Shape::Either(more) => shapes.extend(more),
            shape => shapes.push(shape),
        }
    }
    if !words.is_empty() {
        shapes.push(Shape::Choice(words));
    }
    match (shapes.pop(), shapes.is_empty()) {
        (Some(only), true) => only,
        (Some(last), false) => {
            shapes.push(last);
            Shape::Either(shapes)
        }
        (None, _) => Shape::Any,
    }
}

/// Whether a schema describes a value that is not there.
pub(super) fn is_null(schema: &Value) -> bool {
    schema.get("type").and_then(Value::as_str) == Some("null")
}

/// The kind of a schema, `null` beside it left out.
fn kind(fields: &Map<String, Value>) -> &str {
    match fields.get("type") {
        Some(Value::String(kind)) => kind,
        Some(Value::Array(kinds)) => {
            kinds.iter().filter_map(Value::as_str).find(|k| *k != "null").unwrap_or("")
        }
        _ if fields.contains_key("properties") => "object",
        _ => "",
    }
}

fn keys(fields: &Map<String, Value>, definitions: &Map<String, Value>) -> Keys {
    let required: Vec<&str> = fields
        .get("required")
        .and_then(Value::as_array)
        .map(|names| names.iter().filter_map(Value::as_str).collect())
        .unwrap_or_default();
    let known = fields
        .get("properties")
        .and_then(Value::as_object)
        .into_iter()
        .flatten()
        .map(|(name, schema)| KeyShape {
            name: name.clone(),
            required: required.contains(&name.as_str()),
            meaning: meaning(&resolved(schema, definitions)),
            shape: Shape::compile(schema, definitions),
        })
        .collect();
    let others = fields
        .get("additionalProperties")
        .filter(|schema| schema.is_object())
        .map(|schema| Box::new(Shape::compile(schema, definitions)));
    Keys { known, others }
}

/// The first sentence of a description, ready to stand inside another sentence.
fn meaning(schema: &Value) -> String {
    let whole = schema.get("description").and_then(Value::as_str).unwrap_or("");
    let sentence = super::text::collapse(whole);
    let first = sentence.split_once(". ").map_or(sentence.as_str(), |(first, _)| first);
    let first = first.trim_end_matches('.');
    let mut letters = first.chars();
    match letters.next() {
        // A second capital marks an abbreviation, which keeps its capitals.
        Some(initial) if !letters.as_str().starts_with(char::is_uppercase) => {
            initial.to_lowercase().chain(letters).collect()
        }
        _ => first.to_owned(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use serde_json::json;

    #[test]
    fn schemas_become_shapes() {
        let definitions = json!({
            "Told": {"type": "object", "properties": {"value": {"type": "number"}}, "required": ["value"]},
            "Side": {"oneOf": [{"const": "one", "type": "string"}, {"enum": ["two"]}]},
        });
        let definitions = definitions.as_object().cloned().unwrap_or_default();
        let schema = json!({"anyOf": [
            {"type": ["number", "null"], "minimum": 2},
            {"$ref": "#/$defs/Told"},
            {"type": "null"},
        ]});
        let value = KeyShape {
            name: "value".into(),
            required: true,
            meaning: String::new(),
            shape: Shape::Number { whole: false, low: None, high: None },
        };
        let told = Shape::Map(Keys { known: vec![value], others: None });
        let number = Shape::Number { whole: false, low: Some(2.0), high: None };
        assert_eq!(Shape::compile(&schema, &definitions), Shape::Either(vec![number, told]));
        let side = json!({"anyOf": [{"$ref": "#/$defs/Side"}, {"type": "null"}]});
        assert_eq!(
            Shape::compile(&side, &definitions),
            Shape::Choice(vec!["one".into(), "two".into()])
        );
    }

    #[test]
    fn meanings_are_first_sentences() {
        let of = |text: &str| meaning(&json!({"description": text}));
        assert_eq!(of("The groups,\nat least two. A control first."), "the groups, at least two");
        assert_eq!(of("CSV file beside the spec."), "CSV file beside the spec");
    }
}
