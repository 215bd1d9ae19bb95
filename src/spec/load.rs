//! The way from a file to a checked study.

use std::collections::BTreeSet;

use super::check;
use super::choose::{self, Choice};
use super::commas;
use super::files::{Folder, InputFile, Inputs, LARGEST_SPEC};
use super::finding::Finding;
use super::keys::Homes;
use super::language::Language;
use super::locate::{self, Locator, Place};
use super::node::Node;
use super::notation;
use super::problems::{Located, MOST_SHOWN, Mark, Note, SpecProblems, most_shown};
use super::repair;
use super::source_files::SourceFiles;
use super::structure::Structure;
use super::syntax::{self, TextFault};
use super::text::{Position, Text, printable};
use super::words;
use crate::bibliography::Bibliography;
use crate::designs::{Aspect, Fault, Path};
use crate::study::Study;

/// A checked study with everything that it rests on.
#[derive(Debug)]
pub struct Loaded {
    /// The study.
    pub study: Study,
    /// The files that it was read from.
    pub inputs: Inputs,
    /// The program's sources and the author's.
    pub bibliography: Bibliography,
    /// Remarks that are no errors, in the order of the file.
    pub notes: Vec<Note>,
}

/// Reads a spec and the files that it names.
///
/// # Errors
///
/// All problems of the file, at most 50 of them located.
pub fn load(spec: InputFile, folder: &dyn Folder) -> Result<Loaded, SpecProblems> {
    let text = decode(&spec)?;
    let root = tree(&spec.name, &text)?;
    let (mut structure, choices) = structure(&root);
    for fault in notation::foreign(&text, &root) {
        if !structure.spoiled.contains(&fault.at) {
            structure.add(fault);
        }
    }
    if structure.is_full() {
        return Err(problems(&spec.name, text, &root, structure.findings, false));
    }
    let sound = mend(&root, &choices, &structure.spoiled);
    let files = SourceFiles::new(folder, &spec.name);
    let meaning = check::study(&sound, &choices, &files);
    let locator = Locator::new(&text, &root);
    let mut findings = all(&root, structure, meaning.findings);
    findings.extend(commas::decimal_commas(&root, &locator));
    match (meaning.study, meaning.bibliography) {
        (Some(study), Some(bibliography)) if findings.is_empty() => {
            let remarks = meaning.remarks.into_iter();
            let notes = remarks.map(|(path, words)| note(&locator, &root, &path, words)).collect();
            let inputs = Inputs { files: files.into_files(), spec };
            Ok(Loaded { study, inputs, bibliography, notes })
        }
        _ => Err(problems(&spec.name, text, &root, findings, true)),
    }
}

fn decode(spec: &InputFile) -> Result<Text, SpecProblems> {
    let start = Position { line: 1, column: 1 };
    if spec.bytes.len() as u64 > LARGEST_SPEC {
        let fault = TextFault::new(
            start,
            format!("the spec is larger than {} MiB", LARGEST_SPEC >> 20),
            "a spec takes a few kilobytes; put measurements into a CSV file beside it",
        );
        return Err(unreadable(&spec.name, Text::decode(b"").0, vec![fault]));
    }
    let (text, wrong) = Text::decode(&spec.bytes);
    let mut faults = Vec::new();
    if let Some(wrong) = wrong {
        faults.push(TextFault::new(wrong.at, wrong.reason, wrong.help));
    } else if text.as_str().trim().is_empty() {
        let help = "begin with `sufficit: 1`, then `title`, `authors`, `date`, `purpose` and `experiments`";
        faults.push(TextFault::new(start, "the file is empty", help));
    } else {
        let help = "delete the character, and type the text around it again";
        let hidden = text.refused(MOST_SHOWN);
        faults.extend(hidden.into_iter().map(|(at, reason)| TextFault::new(at, reason, help)));
    }
    if faults.is_empty() { Ok(text) } else { Err(unreadable(&spec.name, text, faults)) }
}

fn tree(name: &str, text: &Text) -> Result<Node, SpecProblems> {
    if let Some(fault) = syntax::brackets(text) {
        return Err(unreadable(name, text.clone(), vec![fault]));
    }
    let root = Node::parse(text.as_str())
        .map_err(|error| unreadable(name, text.clone(), vec![syntax::explain(&error, text)]))?;
    if matches!(root, Node::Map(_)) {
        return Ok(root);
    }
    let start = Position { line: 1, column: 1 };
    let help = "a spec begins with `sufficit: 1`, then `title`, `authors`, `date`, `purpose` and `experiments`";
    let fault = TextFault::new(start, "the file holds no keys with values, so it is no spec", help);
    Err(unreadable(name, text.clone(), vec![fault]))
}

fn unreadable(name: &str, text: Text, faults: Vec<TextFault>) -> SpecProblems {
    let found = faults.len();
    let located = faults.into_iter().map(|fault| Located {
        line: fault.at.line,
        column: fault.at.column,
        length: 1,
        path: String::new(),
        place: String::new(),
        offending: text.rest_of_line(fault.at).chars().take(1).collect(),
        reason: fault.reason,
        help: fault.help,
        also: None,
    });
    let located = located.collect();
    SpecProblems::new(name, text, located, found, true)
}

/// Checks all keys, and finds the design of each experiment.
fn structure(root: &Node) -> (Structure, Vec<Option<Choice>>) {
    let language = Language::get();
    let mut found = Structure::default();
    let anywhere = Homes { study: &language.study, experiment: language.any() };
    found.mapping(root, &language.study, &Path::default(), &anywhere);
    let at = Path::of("experiments");
    let mut choices = Vec::new();
    let experiments = root.get("experiments").map_or(&[][..], Node::items);
    let most = if found.spoiled.contains(&at) { 0 } else { experiments.len() };
    for (index, experiment) in experiments.iter().enumerate().take(most) {
        let at = at.item(index);
        let choice = choose::choose(experiment).unwrap_or_else(|faults| {
            faults.into_iter().for_each(|fault| found.add(fault.below(&at)));
            None
        });
        let keys = choice.map_or(&language.common, |choice| language.of(choice.design));
        let homes = Homes { experiment: choice.map_or(language.any(), |_| keys), ..anywhere };
        found.experiment(experiment, keys, &at, &homes);
        choices.push(choice);
    }
    (found, choices)
}

/// The tree made whole, so that the meaning of its sound parts can be checked.
fn mend(root: &Node, choices: &[Option<Choice>], spoiled: &BTreeSet<Path>) -> Node {
    let language = Language::get();
    let mut sound = repair::mapping(root, &language.study, &Path::default(), spoiled);
    if let Node::Map(entries) = &mut sound
        && let Some((_, experiments)) = entries.iter_mut().find(|(name, _)| name == "experiments")
    {
        let given = root.get("experiments").map_or(&[][..], Node::items);
        let mended = choices.iter().zip(given).enumerate().map(|(index, (choice, experiment))| {
            let keys = choice.map_or(&language.common, |choice| language.of(choice.design));
            repair::mapping(experiment, keys, &Path::of("experiments").item(index), spoiled)
        });
        *experiments = Node::List(mended.collect());
    }
    sound
}

/// All findings: of the structure, and those of the meaning that do not merely follow from them.
fn all(root: &Node, structure: Structure, meaning: Vec<Finding>) -> Vec<Finding> {
    let mut findings = structure.findings;
    let certain = |finding: &Finding| repair::is_certain(finding, root, &structure.spoiled);
    findings.extend(meaning.into_iter().filter(certain));
    findings
}

/// The findings with their positions, the first ones in the order of the file.
fn problems(
    name: &str,
    text: Text,
    root: &Node,
    findings: Vec<Finding>,
    all: bool,
) -> SpecProblems {
    let found = findings.len();
    let place = |f: &Finding| locate::place(root, &f.fault.at, f.fault.aspect, f.occurrence);
    let placed = findings.into_iter().map(|finding| (place(&finding), finding));
    let mut placed: Vec<(Place, Finding)> = placed.collect();
    placed.sort_by(|(one, _), (other, _)| one.steps.cmp(&other.steps));
    placed.truncate(most_shown(text.as_str().len()));
    let locator = Locator::new(&text, root);
    let located =
        placed.into_iter().map(|(place, finding)| located(&place, finding, &locator, root));
    let located = located.collect();
    SpecProblems::new(name, text, located, found, all)
}

fn located(place: &Place, finding: Finding, locator: &Locator<'_>, root: &Node) -> Located {
    let found = locator.stretch(place);
    let also = finding.also.map(|(path, aspect, words)| {
        let other = locator.stretch(&locate::place(root, &path, aspect, 0));
        let Position { line, column } = other.at;
        Mark { line, column, length: other.length, words: words.to_owned() }
    });
    let Fault { at, reason, help, .. } = finding.fault;
    Located {
        line: found.at.line,
        column: found.at.column,
        length: found.length,
        path: at.to_string(),
        place: words::place(&at, root),
        offending: printable(&locator.token(found), 120),
        reason,
        help,
        also,
    }
}

fn note(locator: &Locator<'_>, root: &Node, path: &Path, words: String) -> Note {
    let found = locator.stretch(&locate::place(root, path, Aspect::Value, 0));
    Note { line: found.at.line, column: found.at.column, path: path.to_string(), words }
}
