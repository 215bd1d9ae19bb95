//! Reads the reference tables and holds functions against them.

use std::collections::HashMap;
use std::path::Path;

/// One line of a table, by the names in its header.
pub struct Row {
    cells: HashMap<String, String>,
    line: usize,
}

impl Row {
    pub fn text(&self, name: &str) -> &str {
        match self.cells.get(name) {
            Some(cell) => cell,
            None => panic!("no column {name}"),
        }
    }

    pub fn number(&self, name: &str) -> f64 {
        match self.text(name) {
            "inf" => f64::INFINITY,
            text => {
                text.parse().unwrap_or_else(|_| panic!("line {}: {name} is {text:?}", self.line))
            }
        }
    }

    pub fn whole(&self, name: &str) -> u64 {
        self.text(name)
            .parse()
            .unwrap_or_else(|_| panic!("line {}: {name} is no whole number", self.line))
    }

    /// Numbers separated by semicolons.
    pub fn list(&self, name: &str) -> Vec<f64> {
        self.text(name)
            .split(';')
            .map(|part| part.parse().unwrap_or_else(|_| panic!("line {}: {name}", self.line)))
            .collect()
    }

    pub fn has(&self, name: &str) -> bool {
        !self.text(name).is_empty()
    }
}

/// All lines of `tests/reference/<name>.csv`; an empty table is an error, since it would prove nothing.
pub fn read(name: &str) -> Vec<Row> {
    let path =
        Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference").join(format!("{name}.csv"));
    let text = std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    let mut lines = text.lines();
    let header = split(lines.next().expect("a header"));
    let rows: Vec<Row> = lines
        .enumerate()
        .map(|(i, line)| Row {
            cells: header.iter().cloned().zip(split(line)).collect(),
            line: i + 2,
        })
        .collect();
    assert!(rows.len() > 9, "{name} holds {} rows", rows.len());
    rows
}

/// Cells of a line; a quoted cell may hold commas.
fn split(line: &str) -> Vec<String> {
    let mut cells = vec![String::new()];
    let mut quoted = false;
    for c in line.chars() {
        match c {
            '"' => quoted = !quoted,
            ',' if !quoted => cells.push(String::new()),
            _ => {
                if let Some(cell) = cells.last_mut() {
                    cell.push(c);
                }
            }
        }
    }
    cells
}

/// How far a value may be from the table's.
#[derive(Clone, Copy)]
pub enum Within {
    Absolute(f64),
    Relative(f64),
}

/// The complaint about a value, if there is one.
pub fn complaint(row: &Row, what: &str, got: f64, expected: f64, within: Within) -> Option<String> {
    let error = match within {
        Within::Absolute(_) => (got - expected).abs(),
        Within::Relative(_) if got == expected => 0.0,
        Within::Relative(_) => ((got - expected) / expected).abs(),
    };
    let (Within::Absolute(limit) | Within::Relative(limit)) = within;
    // Written so that NaN complains.
    if error <= limit {
        return None;
    }
    Some(format!(
        "line {}: {what} is {got:e} instead of {expected:e} (off by {error:e}, allowed {limit:e})",
        row.line
    ))
}

/// Fails with every complaint that the check has about the rows.
pub fn verify(rows: &[Row], check: impl Fn(&Row) -> Vec<Option<String>>) {
    let complaints = complaints(rows, check);
    assert!(complaints.is_empty(), "{}", complaints.join("\n"));
}

/// Every complaint that the check has about the rows.
pub fn complaints(rows: &[Row], check: impl Fn(&Row) -> Vec<Option<String>>) -> Vec<String> {
    rows.iter().flat_map(check).flatten().collect()
}

#[test]
fn a_wrong_value_in_any_row_is_caught() {
    let rows = read("owen_q");
    let exact = complaints(&rows, |row| {
        let power = row.number("power");
        vec![complaint(row, "power", power, power, Within::Relative(1e-14))]
    });
    assert_eq!(exact.len(), 0);
    for wrong in [1.0 + 1e-12, 2.0, 0.0, f64::NAN] {
        let caught = complaints(&rows, |row| {
            let power = row.number("power");
            vec![complaint(row, "power", power * wrong, power, Within::Relative(1e-13))]
        });
        // A power of 0 stays 0 when multiplied, but for NaN.
        let zeros = rows.iter().filter(|row| row.number("power") == 0.0).count();
        let expected = if wrong.is_nan() { rows.len() } else { rows.len() - zeros };
        assert_eq!(caught.len(), expected, "factor {wrong}");
    }
}
