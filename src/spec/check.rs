//! What a spec means: dates, names, limits and sources, and the meaning of each experiment.

use std::collections::BTreeMap;

use super::choose::Choice;
use super::experiment;
use super::finding::Finding;
use super::nearest::nearest;
use super::node::Node;
use super::problems::MOST_SHOWN;
use super::raw::{Language, StudyFile};
use super::source_files::SourceFiles;
use super::text::printable;
use crate::bibliography::Bibliography;
use crate::designs::{Aspect, Fault, Path, Step};
use crate::quantities::Kind;
use crate::study::{Date, Purpose, Study};

/// Studies that the independent check simulates unless the spec says otherwise.
const REPLICATES: u64 = 100_000;

/// Fewest simulated studies that show a power with a standard error below 0.016.
const FEWEST_REPLICATES: u64 = 1000;

/// What a spec means, as far as it could be read.
pub(super) struct Meaning {
    pub study: Option<Study>,
    pub bibliography: Option<Bibliography>,
    pub findings: Vec<Finding>,
    /// Remarks that are no errors.
    pub remarks: Vec<(Path, String)>,
}

/// Reads the meaning of a tree whose keys agree with the language; `choices` are the designs of its experiments.
pub(super) fn study(root: &Node, choices: &[Option<Choice>], files: &SourceFiles<'_>) -> Meaning {
    let mut findings = Vec::new();
    let raw: StudyFile = match serde_yaml::from_value(root.to_value()) {
        Ok(raw) => raw,
        Err(error) => {
            let reason = format!("the spec cannot be read although its keys are right: {error}");
            findings.push(Fault::key(Path::default(), reason).into());
            return Meaning { study: None, bibliography: None, findings, remarks: Vec::new() };
        }
    };
    let bibliography = bibliography(root, raw.references.as_deref(), files, &mut findings);
    let date = date(&raw.date).map_err(|fault| findings.push(fault.into())).ok();
    let replicates = replicates(&raw, &mut findings);
    identities(&raw, &mut findings);
    let mut experiments = Vec::new();
    for (index, keys) in raw.experiments.iter().enumerate() {
        let at = Path::of("experiments").item(index);
        let value = root.at(&at).unwrap_or(&Node::Null).to_value();
        let choice = choices.get(index).copied().flatten();
        match experiment::read(keys, &value, choice, files) {
            Ok(Some(experiment)) => experiments.push(experiment),
            // Whatever hides the design was found before, and then this is only its consequence.
            Ok(None) => findings.push(Fault::key(at, "the design is not known").into()),
            Err(found) => findings.extend(found.into_iter().map(|finding| finding.below(&at))),
        }
    }
    let remarks = remarks(&raw);
    let study = date.map(|date| Study {
        title: raw.title,
        authors: raw.authors,
        date,
        purpose: raw.purpose,
        language: raw.language.unwrap_or(Language::En).code().to_owned(),
        advice: raw.advice,
        replicates,
        experiments,
    });
    Meaning { study, bibliography, findings, remarks }
}

/// The bibliography with the author's own entries, and faults for citations that it does not hold.
fn bibliography(
    root: &Node,
    name: Option<&str>,
    files: &SourceFiles<'_>,
    findings: &mut Vec<Finding>,
) -> Option<Bibliography> {
    let at = Path::of("references");
    let text = match name.map(|name| files.get(name)).transpose() {
        Ok(bytes) => bytes,
        Err(error) => {
            let fault = Fault::value(at, error.reason);
            findings.push(error.help.into_iter().fold(fault, Fault::help).into());
            return None;
        }
    };
    let shown = printable(name.unwrap_or(""), 80);
    let decoded = match text.as_ref().map(|bytes| std::str::from_utf8(bytes)).transpose() {
        Ok(text) => text.map(|text| text.trim_start_matches('\u{FEFF}')),
        Err(_) => {
            let fault = Fault::value(at, format!("{shown} is not UTF-8 text"));
            findings.push(fault.help("save the file again with the encoding UTF-8").into());
            return None;
        }
    };
    match Bibliography::with_author(decoded) {
        Ok(bibliography) => {
            citations(root, &Path::default(), &bibliography, name.is_some(), findings);
            Some(bibliography)
        }
        Err(error) => {
            let place = error.line.map_or(shown.clone(), |line| format!("line {line} of {shown}"));
            let (reason, help) = error
                .reason
                .split_once("; ")
                .unwrap_or((&error.reason, "correct the entry in that file"));
            findings.push(Fault::value(at, format!("{place}: {reason}")).help(help).into());
            None
        }
    }
}

/// Looks up every key under `cite`, wherever it stands.
fn citations(node: &Node, at: &Path, known: &Bibliography, own: bool, findings: &mut Vec<Finding>) {
    for (name, value) in node.entries() {
        let path = at.key(name);
        if name == "cite" {
            for (index, item) in value.items().iter().enumerate() {
                let key = item.text().map(str::trim).unwrap_or("");
                if !known.contains(key) && findings.len() < MOST_SHOWN {
                    findings.push(uncited(key, path.item(index), known, own).into());
                }
            }
        } else {
            citations(value, &path, known, own, findings);
        }
    }
    for (index, item) in node.items().iter().enumerate() {
        citations(item, &at.item(index), known, own, findings);
    }
}

fn uncited(key: &str, at: Path, known: &Bibliography, own: bool) -> Fault {
    let keys: Vec<String> = known.keys().map(|key| key.to_string()).collect();
    let keys: Vec<&str> = keys.iter().map(String::as_str).collect();
    let help = match (nearest(key, &keys), own) {
        (Some(near), _) => format!("did you mean `{}`?", printable(near, 60)),
        (None, true) => "add an entry with this key to the file named by `references`".to_owned(),
        (None, false) => {
            "name a file with your own sources: `references: references.yaml`".to_owned()
        }
    };
    Fault::value(at, format!("no source has the key `{}`", printable(key, 60))).help(help)
}

/// Names of experiments: of plain letters, and unique also where large and small letters are the same.
fn identities(raw: &StudyFile, findings: &mut Vec<Finding>) {
    let mut seen: BTreeMap<String, usize> = BTreeMap::new();
    for (index, experiment) in raw.experiments.iter().enumerate() {
        let at = Path(vec![
            Step::Key("experiments".to_owned()),
            Step::Index(index),
            Step::Key("id".to_owned()),
        ]);
        let id = experiment.id.as_str();
        let plain = id.chars().all(|c| c.is_ascii_alphanumeric() || c == '-');
        if !plain || id.starts_with('-') || id.len() > 40 {
            let fault =
                Fault::value(at, format!("`{}` cannot name an experiment", printable(id, 60)));
            findings.push(fault.help(plain_name(id)).into());
        } else if let Some(first) = seen.get(&id.to_ascii_lowercase()) {
            let fault = Fault::value(at.clone(), format!("two experiments have the id `{id}`"))
                .help("give each experiment an id of its own; large and small letters count as the same");
            let first = Path::of("experiments").item(*first).key("id");
            findings.push(Finding::from(fault).also(first, Aspect::Value, "first here"));
        } else {
            seen.insert(id.to_ascii_lowercase(), index);
        }
    }
}

fn plain_name(id: &str) -> String {
    let rule =
        "use letters a to z, digits and hyphens, at most 40, beginning with a letter or digit";
    let spelt: String =
        id.chars().map(|c| if c.is_ascii_alphanumeric() { c } else { '-' }).collect();
    let parts: Vec<_> = spelt.split('-').filter(|part| !part.is_empty()).collect();
    let name = parts.join("-");
    if name.is_empty() || name.len() > 40 || !id.is_ascii() {
        rule.to_owned()
    } else {
        format!("{rule}: `{name}`")
    }
}

fn replicates(raw: &StudyFile, findings: &mut Vec<Finding>) -> u64 {
    let Some(simulation) = &raw.simulation else { return REPLICATES };
    let count = simulation.replicates;
    if (1..FEWEST_REPLICATES).contains(&count) {
        let fault = Fault::value(
            Path::of("simulation.replicates"),
            format!("{count} simulated studies show too little"),
        );
        let help = format!(
            "take at least {FEWEST_REPLICATES} ({REPLICATES} is usual), or 0 for no simulation"
        );
        findings.push(fault.help(help).into());
    }
    count
}

/// The day of a date written as year-month-day.
///
/// # Errors
///
/// Another way of writing, or a day that no calendar has.
fn date(text: &str) -> Result<Date, Fault> {
    let at = Path::of("date");
    let parts: Vec<&str> = text.split('-').collect();
    let digits =
        |part: &&str, count: usize| part.len() == count && part.chars().all(|c| c.is_ascii_digit());
    let written = match parts.as_slice() {
        [year, month, day] if digits(year, 4) && digits(month, 2) && digits(day, 2) => {
            year.parse().ok().zip(month.parse().ok()).zip(day.parse().ok())
        }
        _ => None,
    };
    let Some(((year, month), day)) = written else {
        let shown = printable(text, 40);
        let help = rewritten(text).map_or_else(
            || "write year-month-day, such as 2031-03-14".to_owned(),
            |date| format!("write {date}, if that is the day"),
        );
        return Err(
            Fault::value(at, format!("`{shown}` is not a date as year-month-day")).help(help)
        );
    };
    match days(year, month) {
        Some(days) if (1..=days).contains(&day) && year > 0 => Ok(Date { year, month, day }),
        Some(days) if year > 0 => {
            let name = MONTHS.get(usize::from(month).saturating_sub(1)).copied().unwrap_or("");
            Err(Fault::value(at, format!("{name} {year} has no day {day}"))
                .help(format!("it has {days} days")))
        }
        _ => Err(Fault::value(at, format!("there is no month {month} in the year {year}"))
            .help("write year-month-day, such as 2031-03-14")),
    }
}

const MONTHS: [&str; 12] = [
    "January",
    "February",
    "March",
    "April",
    "May",
    "June",
    "July",
    "August",
    "September",
    "October",
    "November",
    "December",
];

/// Days of a month in the Gregorian calendar.
fn days(year: u16, month: u8) -> Option<u8> {
    let leap = year.is_multiple_of(4) && (!year.is_multiple_of(100) || year.is_multiple_of(400));
    match month {
        1 | 3 | 5 | 7 | 8 | 10 | 12 => Some(31),
        4 | 6 | 9 | 11 => Some(30),
        2 => Some(if leap { 29 } else { 28 }),
        _ => None,
    }
}

/// A date in another notation as year-month-day, when it has but one reading.
fn rewritten(text: &str) -> Option<String> {
    let parts: Vec<&str> =
        text.split(['.', '/', '-', ' ']).filter(|part| !part.is_empty()).collect();
    let [one, two, three] = parts.as_slice() else { return None };
    let number = |part: &&str| part.parse::<u16>().ok();
    let (year, month, day) = match (one.len(), three.len()) {
        (4, 1 | 2) => (number(one)?, number(two)?, number(three)?),
        (1 | 2, 4) if text.contains('.') => (number(three)?, number(two)?, number(one)?),
        (1 | 2, 4) if number(one)? > 12 => (number(three)?, number(two)?, number(one)?),
        (1 | 2, 4) if number(two)? > 12 => (number(three)?, number(one)?, number(two)?),
        _ => return None,
    };
    let (month, day) = (u8::try_from(month).ok()?, u8::try_from(day).ok()?);
    (1..=days(year, month)?).contains(&day).then(|| format!("{year:04}-{month:02}-{day:02}"))
}

/// What may be right but deserves a second look.
fn remarks(raw: &StudyFile) -> Vec<(Path, String)> {
    let kind = match raw.purpose {
        Purpose::AnimalEthics => {
            (Kind::Animal, "`purpose` is `animal-ethics`, but no unit is, or holds, an animal")
        }
        Purpose::HumanEthics => (
            Kind::Participant,
            "`purpose` is `human-ethics`, but no unit is, or holds, a participant",
        ),
        Purpose::Grant | Purpose::Record => return Vec::new(),
    };
    let concerned = raw.experiments.iter().any(|experiment| {
        let held = experiment.unit.holds.as_ref().map(|holds| holds.kind);
        experiment.unit.kind == kind.0 || held == Some(kind.0)
    });
    if concerned { Vec::new() } else { vec![(Path::of("purpose"), kind.1.to_owned())] }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_days_of_the_calendar_are_dates() {
        assert_eq!(date("2032-02-29"), Ok(Date { year: 2032, month: 2, day: 29 }));
        assert!(date("2000-02-29").is_ok());
        for wrong in [
            "2031-02-29",
            "1900-02-29",
            "2031-04-31",
            "2031-13-01",
            "2031-00-10",
            "2031-01-00",
            "0000-01-01",
        ] {
            assert!(date(wrong).is_err(), "{wrong}");
        }
    }

    #[test]
    fn other_notations_are_rewritten_when_they_have_one_reading() {
        let cases = [
            ("14.3.2031", Some("2031-03-14")),
            ("3/14/2031", Some("2031-03-14")),
            ("14/03/2031", Some("2031-03-14")),
            ("2031/3/4", Some("2031-03-04")),
            ("2031-3-4", Some("2031-03-04")),
            ("03/04/2031", None),
            ("14 March 2031", None),
            ("31.02.2031", None),
            ("soon", None),
        ];
        for (given, expected) in cases {
            assert_eq!(rewritten(given).as_deref(), expected, "{given}");
        }
    }

    #[test]
    fn names_are_respelt() {
        assert!(plain_name("first experiment").ends_with("`first-experiment`"));
        assert!(!plain_name("größe").contains('`'));
    }
}
