//! The spec language: what is read, what is refused, and in which words.

mod consequences;
mod csv_files;
mod files;
mod good;
mod hostile;
mod positions;
mod schema;
mod wrong;

use sufficit::spec::{InputFile, Loaded, MemoryFolder, SpecProblems, load};

/// A small spec without a fault.
pub const SOUND: &str = "\
sufficit: 1
title: Regrowth at two temperatures
authors: [A. Example]
date: 2031-03-14
purpose: record
experiments:
  - id: warmth
    question: Does warmth speed regrowth?
    unit: {name: axolotl, plural: axolotls, kind: animal}
    outcome: {name: regrown area, unit: mm², scale: continuous}
    design: {structure: parallel-groups, groups: [cool, warm]}
    aim: detect-difference
    effect: {difference: 0.9, basis: realistic}
    spread: 0.8
";

/// Reads a spec with the given files beside it.
pub fn read(text: &str, files: &[(&str, &str)]) -> Result<Loaded, SpecProblems> {
    let files = files.iter().map(|(name, body)| ((*name).to_owned(), body.as_bytes().to_vec()));
    let spec = InputFile { name: "study.yaml".to_owned(), bytes: text.as_bytes().to_vec() };
    load(spec, &MemoryFolder(files.collect()))
}

/// Reads a spec that must be sound.
pub fn sound(text: &str, files: &[(&str, &str)]) -> Loaded {
    read(text, files).unwrap_or_else(|problems| panic!("{problems}"))
}

/// The problems of a spec that must have some.
pub fn problems(text: &str, files: &[(&str, &str)]) -> SpecProblems {
    match read(text, files) {
        Ok(_) => panic!("no problem was found in\n{text}"),
        Err(problems) => problems,
    }
}

/// The sound spec with one part exchanged; the part must be there.
pub fn with(part: &str, other: &str) -> String {
    assert!(SOUND.contains(part), "{part:?} is not in the sound spec");
    SOUND.replacen(part, other, 1)
}
