//! Which design an experiment has: structure, scale and aim, and the analysis where one is named.

use super::language::scale_word;
use super::nearest::listed;
use super::node::Node;
use super::text;
use super::words;
use crate::designs::{Card, Fault, Path, REGISTRY, StudyDesign};

/// A design and whether its analysis was chosen because none was named.
#[derive(Clone, Copy)]
pub(super) struct Choice {
    pub design: &'static dyn StudyDesign,
    pub analysis_defaulted: bool,
}

/// The design of an experiment; `Ok(None)` when a choice is missing or is no text, which the structure check reports.
///
/// # Errors
///
/// A choice that does not exist, or a combination that no design serves; paths start at the experiment.
pub(super) fn choose(experiment: &Node) -> Result<Option<Choice>, Vec<Fault>> {
    let word =
        |dotted: &str| experiment.at(&Path::of(dotted)).and_then(Node::text).map(text::collapse);
    let structure = word("design.structure");
    let aim = word("aim");
    let analysis = word("analysis");
    let known = [
        ("design.structure", &structure, all(|card| card.structure.to_owned())),
        ("aim", &aim, all(|card| card.aim.to_owned())),
        ("analysis", &analysis, all(|card| card.analysis.to_owned())),
    ];
    let faults: Vec<_> = known
        .iter()
        .filter_map(|(path, given, words)| Some((path, given.as_ref()?, words)))
        .filter(|(_, given, words)| !given.is_empty() && !words.contains(given))
        .map(|(path, given, words)| words::no_choice(given, words, &Path::of(path)))
        .collect();
    if !faults.is_empty() {
        return Err(faults);
    }
    let named = experiment.get("analysis").is_some();
    match (structure, word("outcome.scale"), aim) {
        (Some(structure), Some(scale), Some(aim)) if named == analysis.is_some() => {
            combination(&structure, &scale, &aim, analysis.as_deref()).map_err(|fault| vec![fault])
        }
        _ => Ok(None),
    }
}

fn combination(
    structure: &str,
    scale: &str,
    aim: &str,
    analysis: Option<&str>,
) -> Result<Option<Choice>, Fault> {
    if !all(scale_word).iter().any(|known| known == scale) {
        return Ok(None);
    }
    let serving: Vec<_> = REGISTRY
        .iter()
        .filter(|design| {
            let card = design.card();
            card.structure == structure && card.aim == aim && scale_word(card) == scale
        })
        .collect();
    if serving.is_empty() {
        let here = all_of(
            |card| card.structure == structure && scale_word(card) == scale,
            |card| card.aim,
        );
        let (path, help) = if here.is_empty() {
            let scales = all_of(|card| card.structure == structure, |card| card.id);
            ("outcome.scale", format!("the designs with this structure are {}", list(&scales)))
        } else {
            ("aim", format!("with this structure and outcome the aims are {}", list(&here)))
        };
        let reason = format!(
            "there is no design with `{structure}`, a `{scale}` outcome and the aim `{aim}`"
        );
        return Err(Fault::value(Path::of(path), reason).help(help));
    }
    let chosen = match analysis {
        None => serving.first(),
        Some(name) => serving.iter().find(|design| design.card().analysis == name),
    };
    match chosen {
        Some(design) => {
            Ok(Some(Choice { design: **design, analysis_defaulted: analysis.is_none() }))
        }
        None => {
            let valid: Vec<_> = serving.iter().map(|design| design.card().analysis).collect();
            let reason = format!(
                "the analysis `{}` does not serve this structure, outcome and aim",
                analysis.unwrap_or("")
            );
            Err(Fault::value(Path::of("analysis"), reason)
                .help(format!("the analyses that do are {}", listed(&valid, 20))))
        }
    }
}

fn list(words: &[String]) -> String {
    let words: Vec<_> = words.iter().map(String::as_str).collect();
    listed(&words, 20)
}

fn all(of: impl Fn(&Card) -> String) -> Vec<String> {
    unique(REGISTRY.iter().map(|design| of(design.card())).collect())
}

fn all_of(keep: impl Fn(&Card) -> bool, of: impl Fn(&Card) -> &'static str) -> Vec<String> {
    unique(
        REGISTRY
            .iter()
            .map(|d| d.card())
            .filter(|card| keep(card))
            .map(|card| of(card).to_owned())
            .collect(),
    )
}

fn unique(mut words: Vec<String>) -> Vec<String> {
    words.sort_unstable();
    words.dedup();
    words
}
