//! Numbers from a column of a CSV file.
//!
//! The first line holds the headings. Cells are separated by whichever of comma, semicolon and tab occurs most in it;
//! they may stand in double quotes (RFC 4180), and white space around them does not count. Numbers have a decimal
//! point. Rows without any content are passed over; every other row must have a cell for each heading.

use super::hints;
use super::nearest::{listed, nearest};
use super::text::{Text, collapse, printable};
use crate::designs::{Fault, Path};

/// Most rows of one file.
const MOST_ROWS: usize = 1_000_000;

/// Most values of a filter column that a message lists.
const MOST_LISTED: usize = 8;

/// The numbers of a column, of the rows in which each filter column holds the given text (or the same number).
///
/// # Errors
///
/// A fault at `file`, `column` or `where`: the file is no text or has no rows, a column does not exist or twice, a row has
/// too few or too many cells, a cell is no finite number, or no row is left.
pub(super) fn column(
    file: &str,
    bytes: &[u8],
    name: &str,
    filter: &[(String, String)],
) -> Result<Vec<f64>, Fault> {
    let mut reader = open(file, bytes)?;
    let headings = reader.headings()?;
    let wanted = find(file, &headings, name, &Path::of("column"))?;
    let mut conditions = Vec::new();
    for (heading, value) in filter {
        let at = Path::of("where").key(heading);
        conditions.push(Condition {
            cell: find(file, &headings, heading, &at)?,
            heading,
            value,
            seen: Vec::new(),
        });
    }
    let mut values = Vec::new();
    while let Some(row) = reader.row(headings.len())? {
        let mut kept = true;
        for condition in &mut conditions {
            kept = condition.holds(row.cell(condition.cell)) && kept;
        }
        if kept {
            values.push(number(file, name, row.line, row.cell(wanted))?);
        }
    }
    if values.is_empty() {
        return Err(nothing_left(file, &conditions));
    }
    Ok(values)
}

/// A column and the text that it must hold.
struct Condition<'f> {
    cell: usize,
    heading: &'f str,
    value: &'f str,
    /// The first few texts that the column holds.
    seen: Vec<String>,
}

impl Condition<'_> {
    fn holds(&mut self, cell: &str) -> bool {
        // Most cells repeat a text that was seen before, without white space to collapse.
        if self.seen.len() <= MOST_LISTED && !self.seen.iter().any(|seen| seen == cell) {
            let text = collapse(cell);
            if !self.seen.contains(&text) {
                self.seen.push(text);
            }
        }
        cell == self.value || collapse(cell) == self.value || same_number(cell, self.value)
    }
}

fn same_number(one: &str, other: &str) -> bool {
    match (one.parse::<f64>(), other.parse::<f64>()) {
        (Ok(one), Ok(other)) => one == other,
        _ => false,
    }
}

fn nothing_left(file: &str, conditions: &[Condition<'_>]) -> Fault {
    let shown = printable(file, 80);
    let Some(condition) = conditions
        .iter()
        .find(|c| !c.seen.iter().any(|seen| seen == c.value))
        .or(conditions.first())
    else {
        return Fault::value(Path::of("file"), format!("{shown} has headings but no rows"))
            .help("one row for each experimental unit is needed");
    };
    let seen: Vec<_> = condition.seen.iter().map(String::as_str).collect();
    let at = Path::of("where").key(condition.heading);
    if seen.is_empty() {
        return Fault::value(Path::of("file"), format!("{shown} has headings but no rows"));
    }
    let values = listed(&seen, MOST_LISTED);
    let help = match nearest(condition.value, &seen) {
        Some(near) if near != condition.value => {
            format!("did you mean `{}`? the column holds {values}", printable(near, 60))
        }
        _ => format!("the column holds {values}"),
    };
    let reason = format!(
        "no row of {shown} is left with `{}` in the column `{}`",
        printable(condition.value, 60),
        printable(condition.heading, 60)
    );
    Fault::value(at, reason).help(help)
}

/// The position of a heading.
fn find(file: &str, headings: &[String], name: &str, at: &Path) -> Result<usize, Fault> {
    let shown = printable(file, 80);
    let name = collapse(name);
    let mut found = headings.iter().enumerate().filter(|(_, heading)| **heading == name);
    match (found.next(), found.next()) {
        (Some((position, _)), None) => Ok(position),
        (Some(_), Some(_)) => Err(Fault::value(
            at.clone(),
            format!("{shown} has two columns `{}`", printable(&name, 60)),
        )
        .help("give each column a heading of its own")),
        (None, _) => {
            let known: Vec<_> = headings.iter().map(String::as_str).collect();
            let all = format!("its columns are {}", listed(&known, 20));
            let help = match nearest(&name, &known) {
                Some(near) => format!("did you mean `{}`? {all}", printable(near, 60)),
                None => all,
            };
            let reason = format!("{shown} has no column `{}`", printable(&name, 60));
            let fault = if at.0.len() > 1 {
                Fault::key(at.clone(), reason)
            } else {
                Fault::value(at.clone(), reason)
            };
            Err(fault.help(help))
        }
    }
}

fn number(file: &str, column: &str, line: u64, cell: &str) -> Result<f64, Fault> {
    let refuse = |what: String, help: String| {
        let reason = format!(
            "line {line} of {} holds {what} in the column `{}`",
            printable(file, 80),
            printable(column, 60)
        );
        Err(Fault::value(Path::of("column"), reason).help(help))
    };
    match cell.parse::<f64>() {
        Ok(value) if value.is_finite() => Ok(value),
        Ok(_) => refuse(
            format!("`{}`, which is not a finite number,", printable(cell, 40)),
            "drop the row, or select rows with `where`".to_owned(),
        ),
        Err(_) if cell.is_empty() => refuse(
            "nothing".to_owned(),
            "fill the cell, drop the row, or select rows with `where`".to_owned(),
        ),
        Err(_) => {
            let help = if cell.contains(|c: char| c.is_ascii_digit()) {
                hints::for_number(cell)
            } else {
                "name a column of numbers, or select rows with `where`".to_owned()
            };
            refuse(format!("`{}`, which is no number,", printable(cell, 40)), help)
        }
    }
}

/// A CSV file that is read row by row.
struct Rows<'b> {
    file: String,
    inner: csv::Reader<&'b [u8]>,
    record: csv::StringRecord,
    count: usize,
}

/// One row with its line.
struct Row<'r> {
    line: u64,
    record: &'r csv::StringRecord,
}

impl Row<'_> {
    fn cell(&self, position: usize) -> &str {
        self.record.get(position).unwrap_or("")
    }
}

fn open<'b>(file: &str, bytes: &'b [u8]) -> Result<Rows<'b>, Fault> {
    let shown = printable(file, 80);
    let refuse = |reason: String| Fault::value(Path::of("file"), reason);
    if std::str::from_utf8(bytes).is_err()
        && let (_, Some(wrong)) = Text::decode(bytes)
    {
        let place = format!("line {} of {shown}", wrong.at.line);
        return Err(refuse(format!("{place}: {}", wrong.reason)).help(wrong.help));
    }
    let body = bytes.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(bytes);
    if body.contains(&0) {
        return Err(refuse(format!("{shown} is no text file"))
            .help("save the table as CSV with the encoding UTF-8"));
    }
    if body.trim_ascii().is_empty() {
        return Err(refuse(format!("{shown} is empty"))
            .help("the first line names the columns, each other line holds one unit"));
    }
    let inner = csv::ReaderBuilder::new()
        .has_headers(false)
        .flexible(true)
        .delimiter(separator(body))
        .trim(csv::Trim::All)
        .from_reader(body);
    Ok(Rows { file: shown, inner, record: csv::StringRecord::new(), count: 0 })
}

/// The separator that occurs most in the first line with content, outside quotes.
fn separator(body: &[u8]) -> u8 {
    let first =
        body.split(|byte| matches!(byte, b'\n' | b'\r')).find(|line| !line.trim_ascii().is_empty());
    let mut counts = [(b',', 0usize), (b';', 0), (b'\t', 0)];
    let mut quoted = false;
    for byte in first.unwrap_or_default() {
        quoted ^= *byte == b'"';
        if !quoted && let Some((_, count)) = counts.iter_mut().find(|(mark, _)| mark == byte) {
            *count += 1;
        }
    }
    // The first of equals wins: a comma, when there is no separator at all.
    counts.iter().rev().max_by_key(|(_, count)| *count).map_or(b',', |(mark, _)| *mark)
}

impl Rows<'_> {
    fn headings(&mut self) -> Result<Vec<String>, Fault> {
        self.next_record()?;
        Ok(self.record.iter().map(collapse).collect())
    }

    /// The next row with content; it must have as many cells as there are headings.
    fn row(&mut self, cells: usize) -> Result<Option<Row<'_>>, Fault> {
        loop {
            if !self.next_record()? {
                return Ok(None);
            }
            if self.record.iter().any(|cell| !cell.is_empty()) {
                break;
            }
        }
        let line = self.record.position().map_or(0, csv::Position::line);
        self.count += 1;
        if self.count > MOST_ROWS {
            let reason = format!("{} has more than {MOST_ROWS} rows", self.file);
            return Err(Fault::value(Path::of("file"), reason)
                .help("keep only the rows that the plan rests on"));
        }
        if self.record.len() != cells {
            let reason = format!(
                "line {line} of {} has {} cells, but there are {cells} headings",
                self.file,
                self.record.len()
            );
            let help = if self.record.len() > cells {
                "put cells that hold the separator in double quotes, and write decimals after a point, not a comma"
            } else {
                "give every row a cell for each heading, empty where nothing was measured"
            };
            return Err(Fault::value(Path::of("file"), reason).help(help));
        }
        Ok(Some(Row { line, record: &self.record }))
    }

    fn next_record(&mut self) -> Result<bool, Fault> {
        self.inner.read_record(&mut self.record).map_err(|error| {
            let line = error.position().map_or(0, csv::Position::line);
            Fault::value(Path::of("file"), format!("line {line} of {} cannot be read", self.file))
                .help("save the table again as CSV with the encoding UTF-8")
        })
    }
}
