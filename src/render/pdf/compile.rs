//! Typst source to laid-out pages.

use typst_layout::PagedDocument;

use super::Job;
use super::error::{Diagnostic, TypstError};
use super::glyphs::{check_document, check_figure};
use super::world::MemoryWorld;

/// Laid-out pages, ready for [`export`](super::export).
pub struct Compiled {
    pub(super) document: PagedDocument,
    pub(super) world: MemoryWorld,
    /// What Typst found doubtful; empty for a template in good order.
    pub warnings: Vec<Diagnostic>,
}

impl Compiled {
    /// Number of pages.
    pub fn pages(&self) -> usize {
        self.document.pages().len()
    }

    /// The laid-out document.
    pub fn document(&self) -> &PagedDocument {
        &self.document
    }
}

/// Lays a job out as pages.
///
/// # Errors
///
/// * [`TypstError::MissingGlyphs`] when a printed character, or one in a figure,
///   is in no font.
/// * [`TypstError::ForbiddenCharacters`] when the pages, a figure or the metadata
///   hold a character that archival PDF forbids.
/// * [`TypstError::Refused`] when Typst refuses the source.
/// * [`TypstError::Path`], [`TypstError::SamePathTwice`] for a job whose files
///   are not in order.
pub fn compile(job: &Job<'_>) -> Result<Compiled, TypstError> {
    for (_, data) in job.files.iter().filter(|(path, _)| path.ends_with(".svg")) {
        if let Ok(svg) = std::str::from_utf8(data) {
            check_figure(job.fonts, svg)?;
        }
    }
    let world = MemoryWorld::new(job)?;
    let outcome = typst::compile::<PagedDocument>(&world);
    let warnings = Diagnostic::all(&world, &outcome.warnings);
    match outcome.output {
        Err(errors) => {
            Err(TypstError::Refused { diagnostics: Diagnostic::all(&world, &errors), warnings })
        }
        Ok(document) => {
            check_document(&document)?;
            Ok(Compiled { document, world, warnings })
        }
    }
}
