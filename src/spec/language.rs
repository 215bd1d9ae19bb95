//! The spec language as a whole: the shared keys, each design's own merged into them, and the JSON Schema of it all.

use std::sync::OnceLock;

use schemars::JsonSchema;
use schemars::generate::SchemaSettings;
use serde_json::{Map, Value, json};

use super::raw::{CommonExperiment, StudyFile};
use super::shape::{Keys, Shape, is_null, resolved};
use super::text;
use crate::designs::{Card, REGISTRY, StudyDesign};

/// What may be written.
pub(super) struct Language {
    /// The keys of the file; `experiments` holds anything, since its items depend on their design.
    pub study: Keys,
    /// The keys of an experiment whose design is not known.
    pub common: Keys,
    /// The keys of an experiment of each design.
    designs: Vec<(&'static dyn StudyDesign, Keys)>,
    /// The keys of an experiment of all designs together.
    any: Keys,
}

impl Language {
    /// The language of this version of the program.
    pub fn get() -> &'static Self {
        static LANGUAGE: OnceLock<Language> = OnceLock::new();
        LANGUAGE.get_or_init(|| Raw::generate().compile())
    }

    /// The keys of an experiment of any design, to find where a misplaced key belongs.
    pub fn any(&self) -> &Keys {
        &self.any
    }

    /// The keys of an experiment of a design.
    pub fn of(&self, design: &'static dyn StudyDesign) -> &Keys {
        let found = self.designs.iter().find(|(other, _)| other.card() == design.card());
        found.map_or(&self.common, |(_, keys)| keys)
    }
}

/// Longest text that a key may hold, in characters.
pub(super) fn longest(key: &str) -> usize {
    match key {
        "title" => 300,
        "question" => 1000,
        "why" | "source" | "advice" | "allocation-why" => 2000,
        "randomisation" | "blinding" | "exclusions" | "missing-data" | "stopping" => 2000,
        "file" | "references" => 250,
        _ => 120,
    }
}

/// The JSON Schema of a spec, draft 2020-12. Every key carries its meaning, and no other key is allowed.
pub fn json_schema() -> Value {
    Raw::generate().document()
}

/// The schemas as they are generated.
struct Raw {
    study: Value,
    common: Value,
    designs: Vec<(&'static dyn StudyDesign, Value)>,
    definitions: Map<String, Value>,
}

impl Raw {
    fn generate() -> Self {
        let mut generator = SchemaSettings::draft2020_12().into_generator();
        let study = StudyFile::json_schema(&mut generator).to_value();
        let common = CommonExperiment::json_schema(&mut generator).to_value();
        let own: Vec<_> =
            REGISTRY.iter().map(|d| (*d, d.keys(&mut generator).to_value())).collect();
        let definitions = generator.take_definitions(true);
        let designs = own
            .into_iter()
            .map(|(design, own)| {
                let mut merged = merge(&common, &own, &definitions);
                fix(&mut merged, design.card());
                (design, merged)
            })
            .collect();
        Self { study, common, designs, definitions }
    }

    fn compile(&self) -> Language {
        let keys = |schema: &Value| match Shape::compile(schema, &self.definitions) {
            Shape::Map(keys) => keys,
            _ => Keys::default(),
        };
        let mut study = keys(&self.study);
        if let Some(experiments) = study.known.iter_mut().find(|key| key.name == "experiments")
            && let Shape::List { item, .. } = &mut experiments.shape
        {
            **item = Shape::Any;
        }
        let designs: Vec<_> =
            self.designs.iter().map(|(design, schema)| (*design, keys(schema))).collect();
        let common = loosen(keys(&self.common), designs.iter().map(|(_, keys)| keys));
        let any = designs.iter().fold(Keys::default(), |all, (_, keys)| all.union(keys));
        Language { study, common, designs, any }
    }

    fn document(mut self) -> Value {
        let name = |card: &Card| format!("{}-experiment", card.id);
        let mut cases = Vec::new();
        for (design, schema) in std::mem::take(&mut self.designs) {
            let card = design.card();
            let then = json!({"$ref": format!("#/$defs/{}", name(card))});
            cases.push(json!({"if": condition(card), "then": then}));
            let mut schema = schema;
            if let Some(fields) = schema.as_object_mut() {
                fields.insert("title".to_owned(), json!(card.title));
            }
            self.definitions.insert(name(card), schema);
        }
        let mut experiment = base(&self.common, &self.definitions);
        experiment.insert("allOf".to_owned(), Value::Array(cases));
        let mut study = self.study;
        if let Some(experiments) = study.pointer_mut("/properties/experiments/items") {
            *experiments = json!({"$ref": "#/$defs/experiment"});
        }
        tidy(&mut study, "");
        for schema in self.definitions.values_mut() {
            tidy(schema, "");
        }
        let mut experiment = Value::Object(experiment);
        tidy(&mut experiment, "");
        // The cases state the keys; the frame around them must leave room for every case.
        if let Some(fields) = experiment.as_object_mut() {
            fields.remove("additionalProperties");
        }
        self.definitions.insert("experiment".to_owned(), experiment);
        let used = used(&study, &self.definitions);
        self.definitions.retain(|name, _| used.contains(name));
        self.definitions.sort_keys();
        let mut document = Map::new();
        document
            .insert("$schema".to_owned(), json!("https://json-schema.org/draft/2020-12/schema"));
        document.insert("title".to_owned(), json!("Sufficit study specification"));
        document.extend(
            study
                .as_object()
                .cloned()
                .unwrap_or_default()
                .into_iter()
                .filter(|(k, _)| k != "title"),
        );
        document.insert("$defs".to_owned(), Value::Object(self.definitions));
        Value::Object(document)
    }
}

/// Both mappings in one: keys that both know are merged in their turn.
fn merge(one: &Value, other: &Value, definitions: &Map<String, Value>) -> Value {
    let (one, other) = (resolved(one, definitions), resolved(other, definitions));
    let (Some(first), Some(second)) = (one.get("properties"), other.get("properties")) else {
        return other;
    };
    let mut properties = first.as_object().cloned().unwrap_or_default();
    for (key, schema) in second.as_object().into_iter().flatten() {
        let merged = properties
            .get(key)
            .map_or_else(|| schema.clone(), |known| merge(known, schema, definitions));
        properties.insert(key.clone(), merged);
    }
    let names = |schema: &Value| {
        schema.get("required").and_then(Value::as_array).cloned().unwrap_or_default()
    };
    let mut required = names(&one);
    required.extend(names(&other).into_iter().filter(|name| !names(&one).contains(name)));
    let description = one.get("description").or_else(|| other.get("description"));
    json!({
        "type": "object",
        "description": description,
        "properties": properties,
        "required": required,
    })
}

/// Writes the four choices of a design into its schema.
fn fix(schema: &mut Value, card: &Card) {
    let scale = scale_word(card);
    let choices = [
        ("/properties/design/properties/structure", card.structure),
        ("/properties/aim", card.aim),
        ("/properties/analysis", card.analysis),
    ];
    for (pointer, word) in choices {
        if let Some(Value::Object(fields)) = schema.pointer_mut(pointer) {
            fields.remove("type");
            fields.insert("const".to_owned(), json!(word));
        }
    }
    if let Some(outcome) = schema.pointer_mut("/properties/outcome") {
        let beside = json!({"properties": {"scale": {"const": scale}}});
        if let Some(fields) = outcome.as_object_mut() {
            fields.insert("allOf".to_owned(), json!([beside]));
        }
    }
}

/// The scale of a design as the spec writes it.
pub(super) fn scale_word(card: &Card) -> String {
    serde_json::to_value(card.scale)
        .ok()
        .and_then(|word| word.as_str().map(str::to_owned))
        .unwrap_or_default()
}

/// When the schema of a design applies: its structure, scale and aim are given, and its analysis, which need not be
/// named when it is the first of its combination.
fn condition(card: &Card) -> Value {
    let same = |other: &&&dyn StudyDesign| {
        let other = other.card();
        (other.structure, other.scale, other.aim) == (card.structure, card.scale, card.aim)
    };
    let first = REGISTRY.iter().find(same).is_some_and(|design| design.card() == card);
    let mut required = vec!["design", "outcome", "aim"];
    if !first {
        required.push("analysis");
    }
    json!({
        "properties": {
            "design": {"properties": {"structure": {"const": card.structure}}, "required": ["structure"]},
            "outcome": {"properties": {"scale": {"const": scale_word(card)}}, "required": ["scale"]},
            "aim": {"const": card.aim},
            "analysis": {"const": card.analysis},
        },
        "required": required,
    })
}

/// The frame around the cases: the shared keys with the words that any design knows.
fn base(common: &Value, definitions: &Map<String, Value>) -> Map<String, Value> {
    let mut base = resolved(common, definitions);
    let words = |of: fn(&Card) -> &'static str| {
        let mut words: Vec<_> = REGISTRY.iter().map(|design| of(design.card())).collect();
        words.sort_unstable();
        words.dedup();
        words
    };
    let known = [("aim", words(|card| card.aim)), ("analysis", words(|card| card.analysis))];
    for (key, words) in known {
        if let Some(Value::Object(fields)) = base.pointer_mut(&format!("/properties/{key}")) {
            fields.remove("type");
            fields.insert("enum".to_owned(), json!(words));
        }
    }
    if let Some(design) = base.pointer_mut("/properties/design") {
        *design = resolved(design, definitions);
        if let Some(Value::Object(fields)) = design.pointer_mut("/properties/structure") {
            fields.remove("type");
            fields.insert("enum".to_owned(), json!(words(|card| card.structure)));
        }
        if let Some(fields) = design.as_object_mut() {
            fields.insert("additionalProperties".to_owned(), json!(true));
        }
    }
    base.as_object().cloned().unwrap_or_default()
}

/// The shared keys, with whatever any design adds left unchecked.
fn loosen<'k>(mut common: Keys, designs: impl Iterator<Item = &'k Keys>) -> Keys {
    for key in designs.flat_map(|keys| &keys.known) {
        if common.get(&key.name).is_none() {
            let mut key = key.clone();
            key.shape = Shape::Any;
            common.known.push(key);
        }
    }
    for key in &mut common.known {
        match (key.name.as_str(), &mut key.shape) {
            ("design", Shape::Map(keys)) => keys.others = Some(Box::new(Shape::Any)),
            ("aim" | "analysis", shape) => *shape = Shape::Text,
            _ => {}
        }
    }
    common
}

/// Makes a schema say what is checked: no value may be left out after its key, no key but the listed ones is allowed,
/// and texts and lists have limits.
fn tidy(schema: &mut Value, key: &str) {
    let Some(fields) = schema.as_object_mut() else { return };
    without_null(fields);
    fields.remove("format");
    // Defaults are told in the descriptions; the generated ones only say that a key may be left out.
    fields.remove("default");
    if let Some(Value::String(words)) = fields.get_mut("description") {
        *words = text::collapse(words);
    }
    match fields.get("type").and_then(Value::as_str) {
        Some("string") if !fields.contains_key("const") && !fields.contains_key("enum") => {
            fields.entry("minLength").or_insert(json!(1));
            fields.entry("maxLength").or_insert(json!(longest(key)));
        }
        Some("array") => {
            fields.entry("minItems").or_insert(json!(1));
        }
        _ => {}
    }
    if fields.contains_key("properties") && fields.contains_key("type") {
        fields.entry("additionalProperties").or_insert(json!(false));
    }
    for (name, below) in fields.iter_mut() {
        match (name.as_str(), below) {
            ("properties", Value::Object(properties)) => {
                properties.iter_mut().for_each(|(name, below)| tidy(below, name));
            }
            ("anyOf" | "oneOf", Value::Array(options)) => {
                options.iter_mut().for_each(|below| tidy(below, key))
            }
            ("items" | "additionalProperties", below) => tidy(below, key),
            _ => {}
        }
    }
}

/// A schema without the alternative that nothing is there; a single alternative that is left takes its place.
fn without_null(fields: &mut Map<String, Value>) {
    if let Some(Value::Array(kinds)) = fields.get_mut("type") {
        kinds.retain(|kind| kind.as_str() != Some("null"));
        if let [only] = kinds.as_slice() {
            let only = only.clone();
            fields.insert("type".to_owned(), only);
        }
    }
    let Some(Value::Array(options)) = fields.get_mut("anyOf") else { return };
    options.retain(|option| !is_null(option));
    if let [Value::Object(only)] = options.as_slice() {
        let only = only.clone();
        fields.remove("anyOf");
        for (key, value) in only {
            fields.entry(key).or_insert(value);
        }
    }
}

/// The definitions that a schema refers to, directly or through others.
fn used(schema: &Value, definitions: &Map<String, Value>) -> Vec<String> {
    let mut found = Vec::new();
    let mut waiting = vec![schema];
    while let Some(value) = waiting.pop() {
        match value {
            Value::Object(fields) => waiting.extend(fields.values()),
            Value::Array(items) => waiting.extend(items),
            Value::String(text) => {
                if let Some(name) = text.strip_prefix("#/$defs/")
                    && !found.iter().any(|known| known == name)
                {
                    found.push(name.to_owned());
                    waiting.extend(definitions.get(name));
                }
            }
            _ => {}
        }
    }
    found
}
