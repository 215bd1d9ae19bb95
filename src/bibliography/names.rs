//! Names whose surname begins with a particle.

use hayagriva::Entry;
use hayagriva::types::Person;

/// Makes particles such as "van" or "du" part of the surname, in the entry and in the works it is part of.
///
/// Vancouver style prints "van Zwet EW" (*Citing Medicine*, chapter 2: particles stay with the surname); the
/// engine would print "Zwet EW van".
pub(super) fn join_particles(entry: &mut Entry) {
    if let Some(authors) = entry.authors() {
        entry.set_authors(authors.iter().map(joined).collect());
    }
    if let Some(editors) = entry.editors() {
        entry.set_editors(editors.iter().map(joined).collect());
    }
    let mut parents = entry.parents().to_vec();
    parents.iter_mut().for_each(join_particles);
    entry.set_parents(parents);
}

fn joined(person: &Person) -> Person {
    let mut person = person.clone();
    if let Some(prefix) = person.prefix.take() {
        person.name = format!("{prefix} {}", person.name);
    }
    person
}
