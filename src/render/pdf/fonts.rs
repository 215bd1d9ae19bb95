//! The fonts that a document may use: those in the program, and further ones
//! handed in as bytes.

use std::sync::{Arc, OnceLock};

use rayon::prelude::*;
use resvg::usvg::fontdb::{Database, Source};
use typst::foundations::Bytes;
use typst::text::{Font, FontBook};
use typst::utils::LazyHash;

/// An immutable set of fonts, cheap to clone.
///
/// The set decides which characters can be printed and, where two fonts share a
/// family name, which comes first: the embedded ones, then the further ones in
/// the order given.
#[derive(Clone)]
pub struct FontSet(Arc<Fonts>);

struct Fonts {
    book: LazyHash<FontBook>,
    list: Vec<Font>,
    database: OnceLock<Arc<Database>>,
}

/// A file handed in as a font that is not one.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[error("file {} of the font folder is not a readable OpenType or TrueType font", .index + 1)]
pub struct UnreadableFont {
    /// Position in the list of files that was given, from 0.
    pub index: usize,
}

impl FontSet {
    /// The embedded family for running text.
    pub const TEXT_FAMILY: &str = "Libertinus Serif";

    /// The embedded family for code.
    pub const FIXED_WIDTH_FAMILY: &str = "DejaVu Sans Mono";

    /// The fonts in the program: Libertinus Serif, New Computer Modern (text and
    /// mathematics) and DejaVu Sans Mono. Parsed once in the life of the process.
    pub fn embedded() -> Self {
        static EMBEDDED: OnceLock<FontSet> = OnceLock::new();
        EMBEDDED.get_or_init(|| Self::from_list(embedded_fonts())).clone()
    }

    /// The fonts in the program followed by `extra`, each the bytes of a font
    /// file or of a font collection.
    ///
    /// # Errors
    ///
    /// * [`UnreadableFont`] names the first file that holds no font.
    pub fn embedded_with(extra: Vec<Vec<u8>>) -> Result<Self, UnreadableFont> {
        let mut list = Self::embedded().0.list.clone();
        for (index, data) in extra.into_iter().enumerate() {
            let before = list.len();
            list.extend(Font::iter(Bytes::new(data)));
            if list.len() == before {
                return Err(UnreadableFont { index });
            }
        }
        Ok(Self::from_list(list))
    }

    fn from_list(list: Vec<Font>) -> Self {
        let book = LazyHash::new(FontBook::from_fonts(&list));
        Self(Arc::new(Fonts { book, list, database: OnceLock::new() }))
    }

    pub(super) fn book(&self) -> &LazyHash<FontBook> {
        &self.0.book
    }

    pub(super) fn font(&self, index: usize) -> Option<Font> {
        self.0.list.get(index).cloned()
    }

    /// The same fonts for drawing figures as pixels, indexed when first asked for.
    ///
    /// The generic families serif and sans-serif lead to the family for running
    /// text.
    pub(crate) fn database(&self) -> &Arc<Database> {
        self.0.database.get_or_init(|| {
            let mut database = Database::new();
            database.set_serif_family(Self::TEXT_FAMILY);
            database.set_sans_serif_family(Self::TEXT_FAMILY);
            database.set_monospace_family(Self::FIXED_WIDTH_FAMILY);
            for font in self.0.list.iter().filter(|font| font.index() == 0) {
                database.load_font_source(Source::Binary(Arc::new(font.data().clone())));
            }
            Arc::new(database)
        })
    }

    /// Whether any font of the set can print `c`.
    pub(super) fn covers(&self, c: char) -> bool {
        let code = u32::from(c);
        self.0.list.iter().any(|font| font.info().coverage.contains(code))
    }
}

impl std::fmt::Debug for FontSet {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_list().entries(self.0.list.iter().map(|font| &font.info().family)).finish()
    }
}

/// Parsing reads each font's whole character map, so the files share the cores;
/// `collect` keeps their order.
fn embedded_fonts() -> Vec<Font> {
    let files: Vec<&'static [u8]> = typst_assets::fonts().collect();
    files.into_par_iter().flat_map_iter(|data| Font::iter(Bytes::new(data))).collect()
}
