//! Characters that cannot be printed: in a text, in figures and in a finished
//! layout.

use std::collections::BTreeSet;

use resvg::usvg::roxmltree;
use typst::layout::{Frame, FrameItem};
use typst::model::Document;
use typst::text::is_default_ignorable;
use typst_layout::PagedDocument;

use super::FontSet;
use super::error::TypstError;

/// Characters of `text` that no font of the set has, in order of code point,
/// each once.
///
/// White space, control characters and characters that Unicode declares
/// ignorable by default (such as soft hyphens and joiners) need no glyph.
pub fn missing_glyphs(fonts: &FontSet, text: &str) -> Vec<char> {
    let distinct: BTreeSet<char> = text.chars().filter(|&c| needs_glyph(c)).collect();
    distinct.into_iter().filter(|&c| !fonts.covers(c)).collect()
}

/// Characters of `text` that an archival PDF may not hold, in order of code
/// point, each once: control characters other than tab and line ends, the byte
/// order mark, noncharacters and private-use characters.
///
/// # Sources
///
/// ISO 19005-3:2012, 6.2.11.7.2 and 6.2.11.7.3 (no code points 0, FEFF, FFFE; no
/// private use without replacement text); XML 1.0, section 2.2, for the
/// metadata. Both as remembered, the first two confirmed by what krilla refuses.
pub fn forbidden_characters(text: &str) -> Vec<char> {
    let distinct: BTreeSet<char> = text.chars().filter(|&c| is_forbidden(c)).collect();
    distinct.into_iter().collect()
}

fn needs_glyph(c: char) -> bool {
    !c.is_whitespace() && !c.is_control() && !is_default_ignorable(c)
}

fn is_forbidden(c: char) -> bool {
    let code = u32::from(c);
    let control = c.is_control() && !matches!(c, '\t' | '\n' | '\r');
    let nonchar = (0xFDD0..=0xFDEF).contains(&code) || code & 0xFFFE == 0xFFFE;
    let private = matches!(code, 0xE000..=0xF8FF | 0xF_0000..);
    control || nonchar || private || code == 0xFEFF
}

/// Refuses an SVG figure whose text cannot be printed: a document and a picture
/// keep it as a drawing, in which a missing character would show up as nothing. A
/// text that is no XML is left for others to refuse.
pub(crate) fn check_figure(fonts: &FontSet, svg: &str) -> Result<(), TypstError> {
    let Ok(figure) = roxmltree::Document::parse(svg) else {
        return Ok(());
    };
    let mut text = String::new();
    text.extend(figure.descendants().filter_map(|node| node.text()));
    Findings {
        missing: missing_glyphs(fonts, &text).into_iter().collect(),
        forbidden: forbidden_characters(&text).into_iter().collect(),
    }
    .verdict()
}

/// Refuses a layout that prints a character as an empty box because no suitable
/// font has it, or that holds a character which archival PDF forbids.
pub(super) fn check_document(document: &PagedDocument) -> Result<(), TypstError> {
    let mut findings = Findings::default();
    for page in document.pages() {
        findings.look_at(&page.frame);
    }
    let info = document.info();
    let metadata = info.title.iter().chain(&info.description);
    for text in metadata.chain(&info.author).chain(&info.keywords) {
        findings.add_forbidden(text);
    }
    findings.verdict()
}

#[derive(Default)]
struct Findings {
    missing: BTreeSet<char>,
    forbidden: BTreeSet<char>,
}

impl Findings {
    /// Nesting is bounded: Typst itself refuses layouts that nest too deeply.
    fn look_at(&mut self, frame: &Frame) {
        for (_, item) in frame.items() {
            match item {
                FrameItem::Group(group) => self.look_at(&group.frame),
                FrameItem::Text(text) => {
                    self.add_forbidden(&text.text);
                    let boxes = text.glyphs.iter().filter(|glyph| glyph.id == 0);
                    for cluster in boxes.filter_map(|glyph| text.text.get(glyph.range())) {
                        self.missing.extend(cluster.chars().filter(|&c| !is_default_ignorable(c)));
                    }
                }
                _ => {}
            }
        }
    }

    fn add_forbidden(&mut self, text: &str) {
        self.forbidden.extend(text.chars().filter(|&c| is_forbidden(c)));
    }

    /// A forbidden character has no glyph either, but a font would not help it.
    fn verdict(self) -> Result<(), TypstError> {
        if !self.forbidden.is_empty() {
            return Err(TypstError::ForbiddenCharacters {
                characters: self.forbidden.into_iter().collect(),
            });
        }
        if !self.missing.is_empty() {
            return Err(TypstError::MissingGlyphs {
                characters: self.missing.into_iter().collect(),
            });
        }
        Ok(())
    }
}
