//! Problems built from YAML, and reference tables.

use std::collections::HashMap;
use std::path::Path;

use sufficit::designs::{Fault, Problem, REGISTRY, Sizes, StudyDesign, Tables};
use sufficit::quantities::{Outcome, Scale};

/// A spec without data files.
pub struct NoTables;

impl Tables for NoTables {
    fn column(&self, _: &str, _: &str, _: &[(String, String)]) -> Result<Vec<f64>, Fault> {
        Err(Fault::value(sufficit::designs::Path::of("file"), "there are no files here"))
    }
}

/// The registered design of an id.
pub fn design(id: &str) -> &'static dyn StudyDesign {
    *REGISTRY.iter().find(|d| d.card().id == id).expect("the design is registered")
}

/// Reads the keys of a design.
pub fn read(id: &str, yaml: &str) -> Result<Box<dyn Problem>, Vec<Fault>> {
    let value = serde_yaml::from_str(yaml).expect("the test's YAML is sound");
    let outcome = Outcome { name: "x".into(), unit: None, scale: Scale::Continuous };
    design(id).read(&value, &outcome, &NoTables)
}

/// Sizes of groups stated one by one.
pub fn sizes(per_group: &[u64]) -> Sizes {
    Sizes {
        step: per_group.iter().copied().min().unwrap_or(0),
        per_group: per_group.to_vec(),
        total: per_group.iter().sum(),
    }
}

/// The rows of a reference table, each a map from heading to text.
pub fn table(name: &str) -> Vec<HashMap<String, String>> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference").join(name);
    let mut reader = csv::Reader::from_path(path).expect("the table exists");
    let rows: Vec<HashMap<String, String>> =
        reader.deserialize().map(|row| row.expect("the row is sound")).collect();
    assert!(!rows.is_empty(), "{name} is empty");
    rows
}

/// A number of a row.
pub fn number(row: &HashMap<String, String>, key: &str) -> f64 {
    row[key].parse().unwrap_or_else(|_| panic!("{key} = {:?} is no number", row[key]))
}
