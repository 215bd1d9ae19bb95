//! The JSON Schema of the spec.

use std::collections::BTreeSet;

use serde_json::Value;
use sufficit::designs::REGISTRY;
use sufficit::spec::json_schema;

use super::{SOUND, problems, with};

/// Every mapping in a schema, with the way to it.
fn mappings<'v>(value: &'v Value, way: &str, found: &mut Vec<(String, &'v Value)>) {
    match value {
        Value::Object(fields) => {
            if fields.get("type").and_then(Value::as_str) == Some("object") {
                found.push((way.to_owned(), value));
            }
            for (key, below) in fields {
                mappings(below, &format!("{way}/{key}"), found);
            }
        }
        Value::Array(items) => {
            for (index, below) in items.iter().enumerate() {
                mappings(below, &format!("{way}/{index}"), found);
            }
        }
        _ => {}
    }
}

#[test]
fn every_key_is_explained_and_no_other_is_allowed() {
    let schema = json_schema();
    let mut found = Vec::new();
    mappings(&schema, "", &mut found);
    assert!(found.len() > 10);
    for (way, mapping) in found {
        // The frame of an experiment leaves the last word to the case of its design.
        let frame = way.starts_with("/$defs/experiment");
        let others = mapping.get("additionalProperties");
        assert!(
            frame || others == Some(&Value::Bool(false)) || others.is_some_and(Value::is_object),
            "{way}"
        );
        for (key, value) in
            mapping.get("properties").and_then(Value::as_object).into_iter().flatten()
        {
            let words = value.get("description").and_then(Value::as_str).unwrap_or("");
            assert!(words.ends_with('.') && !words.contains('\n'), "{way}/{key}: {words:?}");
            let kebab =
                key.chars().all(|c| c.is_ascii_lowercase() || c.is_ascii_digit() || c == '-');
            assert!(kebab, "{way}/{key}");
        }
    }
}

#[test]
fn nothing_is_null_and_every_reference_leads_somewhere() {
    let schema = json_schema();
    let text = schema.to_string();
    assert!(!text.contains("null"), "a value may not be left out after its key");
    let defined: BTreeSet<String> =
        schema["$defs"].as_object().into_iter().flatten().map(|(name, _)| name.clone()).collect();
    let used: BTreeSet<String> = text
        .split("#/$defs/")
        .skip(1)
        .filter_map(|rest| rest.split('"').next())
        .map(str::to_owned)
        .collect();
    assert_eq!(defined, used);
}

#[test]
fn every_design_has_a_case_with_its_own_keys() {
    let schema = json_schema();
    let cases = schema["$defs"]["experiment"]["allOf"].as_array().map_or(0, Vec::len);
    assert_eq!(cases, REGISTRY.len());
    for design in REGISTRY {
        let card = design.card();
        let own = &schema["$defs"][format!("{}-experiment", card.id)];
        assert_eq!(own["properties"]["aim"]["const"], card.aim);
        assert_eq!(own["properties"]["design"]["properties"]["structure"]["const"], card.structure);
        for shared in [
            "id",
            "question",
            "unit",
            "outcome",
            "losses",
            "ceiling",
            "further-units",
            "safeguards",
        ] {
            assert!(own["properties"].get(shared).is_some(), "{}: {shared}", card.id);
        }
    }
}

#[test]
fn it_is_the_same_each_time() {
    assert_eq!(json_schema().to_string(), json_schema().to_string());
}

/// Limits that the schema states are the limits that are checked.
#[test]
fn limits_are_checked_as_stated() {
    let schema = json_schema();
    let title = schema["properties"]["title"]["maxLength"].as_u64().unwrap_or(0) as usize;
    let with_title = |length: usize| {
        with("title: Regrowth at two temperatures", &format!("title: {}", "x".repeat(length)))
    };
    super::sound(&with_title(title), &[]);
    assert_eq!(problems(&with_title(title + 1), &[]).problems().len(), 1);
    let most = schema["properties"]["authors"]["maxItems"].as_u64().unwrap_or(0) as usize;
    let with_authors =
        |count: usize| with("[A. Example]", &format!("[{}]", vec!["A. Example"; count].join(", ")));
    super::sound(&with_authors(most), &[]);
    assert_eq!(problems(&with_authors(most + 1), &[]).problems().len(), 1);
    assert!(SOUND.contains("A. Example"));
}
