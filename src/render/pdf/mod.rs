//! Typst source to PDF bytes, in memory.
//!
//! A [`Job`] holds everything that a document is made of: its main source, the
//! files that the source reads, the fonts and the one date. Nothing else can
//! enter: no file system, no packages, no clock, no fonts of the machine. Equal
//! jobs give equal bytes.
//!
//! ```text
//! Job -> world (what Typst may see) -> compile -> Compiled -> export -> PDF/A-3a + PDF/UA-1
//! ```

mod compile;
mod error;
mod export;
mod fonts;
mod glyphs;
mod world;

pub use compile::{Compiled, compile};
pub use error::{Diagnostic, Place, Severity, TypstError};
pub use export::{export, pdf};
pub use fonts::{FontSet, UnreadableFont};
pub(crate) use glyphs::check_figure;
pub use glyphs::{forbidden_characters, missing_glyphs};

/// All that one document is made of.
#[derive(Debug, Clone)]
pub struct Job<'a> {
    /// The main Typst source.
    pub main: &'a str,
    /// Virtual path (such as `style.typ`, `figures/power.svg`) and content of
    /// every further file that the source reads.
    ///
    /// Typst remembers each distinct path for the life of the process and has
    /// room for about 65 000 of them: a run over many documents should give
    /// files numbered paths, not names taken from the user's input.
    pub files: Vec<(String, Vec<u8>)>,
    /// Year, month and day that stand in the metadata as the date of creation.
    pub date: (u16, u8, u8),
    /// The fonts that the document may use.
    pub fonts: &'a FontSet,
}
