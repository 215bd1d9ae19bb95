//! The numbered reference list.

use std::sync::OnceLock;

use hayagriva::archive::ArchivedStyle;
use hayagriva::citationberg::{
    IndependentStyle, LayoutRenderingElement, Locale, LocaleFile, Name, NamesChild, Style,
};
use hayagriva::{BibliographyDriver, BibliographyRequest, CitationItem, CitationRequest, Entry};

use super::{BibliographyError, Reference, runs};

/// English words of the reference list ("et al.", "2nd ed.", "pp."). The archive holds them too, but can only
/// hand out all its languages at once, which takes longer than a whole report.
const TERMS: &str = include_str!("terms.en.xml");

/// Style and words, decoded once.
struct Vancouver {
    style: IndependentStyle,
    locales: [Locale; 1],
}

/// Numbers and lays out the entries in the order given.
pub(super) fn list(entries: &[&Entry]) -> Result<Vec<Reference>, BibliographyError> {
    let vancouver = vancouver()?;
    list_with(entries, &vancouver.style, &vancouver.locales)
}

fn list_with(
    entries: &[&Entry],
    style: &IndependentStyle,
    locales: &[Locale],
) -> Result<Vec<Reference>, BibliographyError> {
    if entries.is_empty() {
        return Ok(Vec::new());
    }
    let mut driver = BibliographyDriver::new();
    let items = entries.iter().map(|entry| CitationItem::with_entry(*entry)).collect();
    driver.citation(CitationRequest::from_items(items, style, locales));
    let request = BibliographyRequest::new(style, None, locales);
    let Some(list) = driver.finish(request).bibliography else {
        return Err(BibliographyError::plain("the Vancouver style gave no reference list"));
    };
    Ok(list
        .items
        .into_iter()
        .enumerate()
        .map(|(index, item)| Reference {
            number: index + 1,
            key: item.key,
            runs: runs::flatten(&item.content),
        })
        .collect())
}

fn vancouver() -> Result<&'static Vancouver, BibliographyError> {
    static VANCOUVER: OnceLock<Result<Vancouver, BibliographyError>> = OnceLock::new();
    VANCOUVER.get_or_init(decode).as_ref().map_err(Clone::clone)
}

fn decode() -> Result<Vancouver, BibliographyError> {
    let terms = LocaleFile::from_xml(TERMS).map_err(|error| {
        BibliographyError::plain(format!("the words of the reference list are damaged: {error}"))
    })?;
    Ok(Vancouver { style: style()?, locales: [terms.into()] })
}

/// The archived style, with a name element put into each `names` element that has none.
///
/// Without one, version 0.10 of `hayagriva` takes the group around the names for empty and drops the authors.
fn style() -> Result<IndependentStyle, BibliographyError> {
    let Style::Independent(mut style) = ArchivedStyle::NlmCitationSequence.get() else {
        return Err(BibliographyError::plain("the Vancouver style refers to another style"));
    };
    for element in style.macros.iter_mut().flat_map(|item| &mut item.children) {
        if let LayoutRenderingElement::Names(names) = element
            && names.name().is_none()
        {
            names.children.insert(0, NamesChild::Name(Name::default()));
        }
    }
    Ok(style)
}

#[cfg(test)]
mod tests {
    use hayagriva::{Library, archive, io};

    use super::*;

    const UNUSUAL: &str = "
thesis:
  type: thesis
  title: A thesis
  author: ['Older, Ann', 'Younger, Bo']
  date: 2001-05-03
  organization: University of Nowhere
talk:
  type: article
  title: A talk
  author: {name: Working Group}
  editor: Solo, Eda
  date: 2011-11
  page-range: 5
  parent:
    type: proceedings
    title: Proceedings of the Tenth Meeting
    editor: ['First, Edit', 'van Second, Edit']
    edition: 3
    volume: 4
    publisher: {name: Press, location: Town}
site:
  type: web
  title: A site
  author: Web, Master
  date: 2020-01-09
  url: {value: 'https://example.org/a', date: 2021-02-03}
chapter:
  type: chapter
  title: A chapter
  author: Single, Cora
  page-range: 10-19
  parent: {type: anthology, title: Whole, editor: ['A, B.', 'C, D.'], date: 1999, edition: 11, volume: 2, publisher: House}
translated:
  type: book
  title: A translation
  date: 1901
  edition: 21
  page-total: 300
  affiliated: [{role: translator, names: ['Trans, Lator']}]
  publisher: House
";

    /// The words of this file against the archive's own, over every built-in entry and some unusual ones.
    #[test]
    fn the_words_agree_with_the_archived_english_ones() -> Result<(), Box<dyn std::error::Error>> {
        let english: Vec<Locale> = archive::locales()
            .into_iter()
            .filter(|locale| locale.lang.as_ref().is_some_and(|code| code.0 == "en-US"))
            .collect();
        assert_eq!(english.len(), 1);
        let own = super::super::builtin::entries(super::super::builtin::keys())?;
        let unusual: Library = io::from_yaml_str(UNUSUAL)?;
        let entries: Vec<&Entry> = own.iter().chain(unusual.iter()).collect();
        let style = style()?;
        let expected = list_with(&entries, &style, &english)?;
        assert_eq!(list(&entries)?, expected);
        assert_ne!(list_with(&entries, &style, &[])?, expected);
        Ok(())
    }

    #[test]
    fn authors_are_not_dropped() -> Result<(), Box<dyn std::error::Error>> {
        let own = super::super::builtin::entries(["cohen-1988"].into_iter())?;
        let entries: Vec<&Entry> = own.iter().collect();
        let list = list(&entries)?;
        let first = list.first().ok_or("empty list")?;
        assert!(first.text().starts_with("Cohen J. "), "{}", first.text());
        Ok(())
    }
}
