//! Keys that the language does not have where they stand: what was probably meant, and where it belongs.

use super::nearest::{listed, nearest, same_meaning};
use super::shape::{Keys, Shape};
use super::words;
use crate::designs::{Fault, Path, Step};

/// The keys of the whole language, to find where a misplaced one belongs.
#[derive(Clone, Copy)]
pub(super) struct Homes<'k> {
    pub study: &'k Keys,
    /// Keys of the experiment at hand, or of any experiment.
    pub experiment: &'k Keys,
}

/// Keys that stand beside many values, so that none of their places is the right one.
const COMMON: &[&str] = &["why", "source", "cite", "value", "name", "plural", "kind"];

impl Homes<'_> {
    /// Every key with the words for its place.
    fn all(&self) -> Vec<(&str, String)> {
        let mut found = Vec::new();
        for key in &self.study.known {
            found.push((key.name.as_str(), "at the top of the file".to_owned()));
        }
        for key in &self.experiment.known {
            found.push((key.name.as_str(), "in an experiment, beside its `id`".to_owned()));
        }
        for keys in [self.study, self.experiment] {
            for key in &keys.known {
                below(&key.shape, &key.name, &mut found);
            }
        }
        found.retain(|(name, _)| !COMMON.contains(name));
        found
    }

    /// The words for the places of a key, when there are few.
    fn of(&self, name: &str) -> Option<String> {
        let mut places: Vec<_> = self
            .all()
            .into_iter()
            .filter(|(key, _)| *key == name)
            .map(|(_, place)| place)
            .collect();
        places.dedup();
        match places.as_slice() {
            [one] => Some(one.clone()),
            [one, other] => Some(format!("{one}, or {other}")),
            [one, two, three] => Some(format!("{one}, {two}, or {three}")),
            _ => None,
        }
    }
}

fn below<'k>(shape: &'k Shape, trail: &str, found: &mut Vec<(&'k str, String)>) {
    match shape {
        Shape::Map(keys) => {
            for key in &keys.known {
                found.push((&key.name, format!("under `{trail}`")));
                below(&key.shape, &format!("{trail}.{}", key.name), found);
            }
        }
        Shape::Either(options) => options.iter().for_each(|option| below(option, trail, found)),
        Shape::List { item, .. } => below(item, trail, found),
        _ => {}
    }
}

/// The fault of a key that has no meaning where it stands, and the key beside it that was probably meant.
pub(super) fn unknown(
    name: &str,
    keys: &Keys,
    at: &Path,
    homes: &Homes<'_>,
) -> (Fault, Option<String>) {
    let shown =
        if name.is_empty() { "nothing before the colon".to_owned() } else { words::key(name) };
    let fault = Fault::key(at.key(name), format!("{shown} is no key {}", place(at)));
    let beside = keys.names();
    let guess = nearest(name, &beside);
    let same =
        guess.filter(|word| word.eq_ignore_ascii_case(&name.trim().replace(['_', ' '], "-")));
    if let Some(word) = same {
        return (fault.help(format!("write `{word}`")), Some(word.to_owned()));
    }
    if let Some(place) = homes.of(name) {
        return (fault.help(format!("it belongs {place}")), None);
    }
    if let Some(word) = same_meaning(name) {
        if beside.contains(&word) {
            return (fault.help(format!("the key for it is `{word}`")), Some(word.to_owned()));
        }
        if let Some(place) = homes.of(word) {
            return (fault.help(format!("the key for it is `{word}`, {place}")), None);
        }
    }
    if let Some(word) = guess {
        return (fault.help(format!("did you mean `{word}`?")), Some(word.to_owned()));
    }
    let everywhere: Vec<_> = homes.all().into_iter().map(|(key, _)| key).collect();
    if let Some((word, place)) =
        nearest(name, &everywhere).and_then(|word| Some((word, homes.of(word)?)))
    {
        return (fault.help(format!("did you mean `{word}`, which belongs {place}?")), None);
    }
    let help = match beside.as_slice() {
        [] => "it takes no keys".to_owned(),
        names => format!("the keys here are {}", listed(names, 20)),
    };
    (fault.help(help), None)
}

fn place(at: &Path) -> String {
    match at.0.as_slice() {
        [] => "of a spec".to_owned(),
        [Step::Key(list), Step::Index(_)] if list == "experiments" => "of an experiment".to_owned(),
        _ => format!("of {}", words::subject(at)),
    }
}
