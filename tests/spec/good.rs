//! Specs that are read, and what is read from them.

use super::{SOUND, problems, sound, with};
use sufficit::quantities::Kind;
use sufficit::study::{CeilingLimit, Date, FurtherPurpose, Purpose};

pub const FULL: &str = "\
sufficit: 1
title: >
  Limb regeneration in axolotls
  at two   water temperatures
authors: [A. Example, B. Example]
date: 2031-03-14
purpose: animal-ethics
language: en
references: references.yaml
advice: C. Example, statistician
simulation: {replicates: 0}
experiments:
  - id: temperature-2
    question: |
      Does warmer water change how much
      tissue has regrown?
    unit: {name: tank, plural: tanks, kind: group, holds: {name: axolotl, plural: axolotls, kind: animal, each: 3}}
    outcome: {name: blastema area, unit: mm², scale: continuous}
    design:
      structure: parallel-groups
      groups:
        - {name: 18 °C, weight: 2}
        - 22 °C
        - 26 °C
      control: 18 °C
    aim: detect-difference
    analysis: two-sample-t
    effect:
      smallest-that-matters: {value: 0.9, why: husbandry, cite: [pilot-2030]}
      realistic: 1.2
    spread:
      file: data/pilot.csv
      column: blastema area
      where: {group: control, batch: 1}
    risk: {alpha: 0.05, sides: two, power: 0.9, multiplicity: sidak, cite: [cohen-1988]}
    losses: {fraction: 0.1, why: infection}
    ceiling: {total: 60, why: tank space}
    further-units:
      - {purpose: training, count: 4, count-of: individuals, why: new staff}
      - {purpose: spare, count: 1, why: leaks}
    safeguards:
      randomisation: random numbers from a sealed list
      missing-data: complete cases
";

pub const REFERENCES: &str = "\
pilot-2030:
  type: report
  title: Pilot on regrowth
  author: Example, A.
  date: 2030
";

pub const PILOT: &str = "\
batch,group, blastema   area
1,control,2.9
1.0,control,3.8

2,control,9
1,warm,9
1,\"control\", 3.1
,,
";

#[test]
fn a_full_spec_is_read_whole() {
    let loaded = sound(FULL, &[("references.yaml", REFERENCES), ("data/pilot.csv", PILOT)]);
    let study = &loaded.study;
    assert_eq!(study.title, "Limb regeneration in axolotls at two water temperatures");
    assert_eq!(study.authors, ["A. Example", "B. Example"]);
    assert_eq!(study.date, Date { year: 2031, month: 3, day: 14 });
    assert_eq!((study.purpose, study.language.as_str()), (Purpose::AnimalEthics, "en"));
    assert_eq!(study.advice.as_deref(), Some("C. Example, statistician"));
    assert_eq!(study.replicates, 0);
    let experiment = &study.experiments[0];
    assert_eq!(experiment.question, "Does warmer water change how much tissue has regrown?");
    assert_eq!(experiment.unit.holds.as_ref().map(|h| (h.kind, h.each)), Some((Kind::Animal, 3)));
    assert!(!experiment.analysis_defaulted);
    assert_eq!(experiment.losses.fraction(), 0.1);
    assert_eq!(experiment.ceiling.as_ref().map(|c| c.limit), Some(CeilingLimit::Total(60)));
    let further: Vec<_> =
        experiment.further_units.iter().map(|f| (f.purpose, f.count, f.individuals)).collect();
    assert_eq!(further, [(FurtherPurpose::Training, 4, true), (FurtherPurpose::Spare, 1, false)]);
    assert_eq!(experiment.safeguards.missing_data.as_deref(), Some("complete cases"));
    let spread = experiment.problem.spread().expect("a spread");
    // Mean and standard deviation of 2.9, 3.8 and 3.1, by hand: 9.8/3 and the root of 0.67/3.
    let expected = (0.67_f64 / 3.0).sqrt();
    assert!((spread.sd / expected - 1.0).abs() < 1e-14, "{}", spread.sd);
    assert_eq!(spread.df, Some(2.0));
    assert!(loaded.bibliography.contains("pilot-2030"));
    assert_eq!(loaded.notes, []);
}

#[test]
fn inputs_are_the_raw_bytes_each_once_and_sorted() {
    let spec = FULL.replace("where: {group: control, batch: 1}", "where: {group: control}");
    let again = spec.find("  - id").and_then(|at| spec.get(at..)).unwrap_or("");
    let again =
        again.replace("temperature-2", "again").replace("data/pilot.csv", "./data/pilot.csv");
    let text = format!("\u{FEFF}{spec}{again}").replace('\n', "\r\n");
    let loaded = sound(&text, &[("references.yaml", REFERENCES), ("data/pilot.csv", PILOT)]);
    assert_eq!(loaded.inputs.spec.bytes, text.as_bytes());
    let names: Vec<_> = loaded.inputs.files.iter().map(|file| file.name.as_str()).collect();
    assert_eq!(names, ["data/pilot.csv", "references.yaml"]);
    assert_eq!(loaded.inputs.files[0].bytes, PILOT.as_bytes());
}

#[test]
fn what_is_left_out_is_marked_as_such() {
    let loaded = sound(SOUND, &[]);
    let experiment = &loaded.study.experiments[0];
    assert_eq!(loaded.study.replicates, 100_000);
    assert!(experiment.analysis_defaulted);
    assert!(!experiment.losses.stated);
    assert_eq!(experiment.losses.fraction(), 0.0);
    assert!(experiment.ceiling.is_none() && experiment.further_units.is_empty());
    assert_eq!(loaded.inputs.files, []);
    assert_eq!(experiment.problem.spread().expect("a spread").df, None);
}

#[test]
fn the_order_of_keys_does_not_matter() {
    let (head, experiment) = SOUND.split_once("experiments:\n").unwrap_or((SOUND, ""));
    let text = format!("experiments:\n{experiment}{head}");
    assert_eq!(sound(&text, &[]).study.title, sound(SOUND, &[]).study.title);
}

#[test]
fn text_of_the_author_is_kept_as_it_is() {
    let hostile = r##"#read("/etc/passwd") *x* $y$ @z <a> [b](c) {{ 7*7 }} \"##;
    let text = with("title: Regrowth at two temperatures", &format!("title: '{hostile}'"));
    assert_eq!(sound(&text, &[]).study.title, hostile);
}

#[test]
fn scripts_of_all_directions_are_text() {
    let text = with("A. Example", "أ. مثال, 山田 太郎, Å. Ångström");
    assert_eq!(sound(&text, &[]).study.authors, ["أ. مثال", "山田 太郎", "Å. Ångström"]);
}

#[test]
fn numbers_may_be_written_in_any_yaml_notation() {
    for (written, expected) in
        [("8e-1", 0.8), (".8", 0.8), ("1", 1.0), ("+0.8", 0.8), ("0.80", 0.8)]
    {
        let text = with("spread: 0.8", &format!("spread: {written}"));
        assert_eq!(
            sound(&text, &[]).study.experiments[0].problem.spread().expect("a spread").sd,
            expected,
            "{written}"
        );
    }
}

#[test]
fn a_purpose_without_its_subject_is_remarked_upon() {
    let text = with("purpose: record", "purpose: human-ethics");
    let notes = sound(&text, &[]).notes;
    assert_eq!(notes.len(), 1);
    assert_eq!((notes[0].line, notes[0].column, notes[0].path.as_str()), (5, 10, "purpose"));
    assert!(notes[0].words.contains("participant"));
    assert_eq!(sound(&with("purpose: record", "purpose: animal-ethics"), &[]).notes, []);
}

#[test]
fn aliases_in_moderation_are_read() {
    let text = with("spread: 0.8", "spread: &sd 0.8")
        .replace("difference: 0.9", "difference: *sd")
        .replace("effect:", "zz:");
    // Order matters to YAML: an anchor comes before its alias.
    let effect = "    zz: {difference: *sd, basis: realistic}\n";
    let text = text.replace(effect, "") + &effect.replace("zz", "effect");
    assert_eq!(sound(&text, &[]).study.experiments[0].problem.effect().planned.value, 0.8);
}

#[test]
fn limits_of_numbers_are_legal_themselves() {
    for (part, other) in [
        ("spread: 0.8", "spread: 0.8\n    losses: 0"),
        ("spread: 0.8", "spread: 0.8\n    losses: 0.95"),
        ("spread: 0.8", "spread: 0.8\n    ceiling: {per-group: 2}"),
        ("spread: 0.8", "spread: 0.8\n    ceiling: {total: 4}"),
        ("spread: 0.8", "spread: 0.8\n    ceiling: {per-group: 1000000000}"),
        ("spread: 0.8", "spread: {sd: 0.8, n: 2}"),
        ("experiments:", "simulation: {replicates: 1000}\nexperiments:"),
        ("experiments:", "simulation: {replicates: 10000000}\nexperiments:"),
    ] {
        sound(&with(part, other), &[]);
    }
    for (part, other) in [
        ("spread: 0.8", "spread: 0.8\n    losses: 0.951"),
        ("spread: 0.8", "spread: 0.8\n    losses: -0.1"),
        ("spread: 0.8", "spread: 0.8\n    ceiling: {per-group: 1}"),
        ("spread: 0.8", "spread: 0.8\n    ceiling: {per-group: 1000000001}"),
        ("spread: 0.8", "spread: 0.8\n    ceiling: {per-group: -3}"),
        ("spread: 0.8", "spread: {sd: 0.8, n: 1}"),
        ("spread: 0.8", "spread: 1e-101"),
        ("spread: 0.8", "spread: 1e101"),
        ("experiments:", "simulation: {replicates: 999}\nexperiments:"),
        ("experiments:", "simulation: {replicates: 10000001}\nexperiments:"),
    ] {
        assert_eq!(problems(&with(part, other), &[]).problems().len(), 1, "{other}");
    }
}
