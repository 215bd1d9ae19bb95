//! What Typst may see: the files of one job, a set of fonts, no clock.

use std::collections::HashMap;
use std::sync::OnceLock;

use typst::diag::{FileError, FileResult};
use typst::foundations::{Bytes, Datetime, Duration};
use typst::syntax::{FileId, RootedPath, Source, VirtualPath, VirtualRoot};
use typst::text::{Font, FontBook};
use typst::utils::LazyHash;
use typst::{Library, LibraryExt, World};

use super::error::TypstError;
use super::{FontSet, Job};

/// The main source's virtual path.
pub(super) const MAIN: &str = "main.typ";

/// A world that lives in memory only.
pub(super) struct MemoryWorld {
    main: FileId,
    sources: HashMap<FileId, Source>,
    files: HashMap<FileId, Bytes>,
    fonts: FontSet,
}

impl MemoryWorld {
    /// Takes the job's files in, refusing paths that are no plain virtual paths.
    pub(super) fn new(job: &Job<'_>) -> Result<Self, TypstError> {
        let main = file_id(MAIN)?;
        let mut sources = HashMap::new();
        let mut files = HashMap::new();
        sources.insert(main, Source::new(main, job.main.to_owned()));
        for (path, data) in &job.files {
            let id = file_id(path)?;
            if sources.contains_key(&id) || files.contains_key(&id) {
                return Err(TypstError::SamePathTwice { path: path.clone() });
            }
            match std::str::from_utf8(data) {
                Ok(text) if path.ends_with(".typ") => {
                    sources.insert(id, Source::new(id, text.to_owned()));
                }
                _ => {
                    files.insert(id, Bytes::new(data.clone()));
                }
            }
        }
        Ok(Self { main, sources, files, fonts: job.fonts.clone() })
    }
}

fn file_id(path: &str) -> Result<FileId, TypstError> {
    let path = VirtualPath::new(path).map_err(|_| TypstError::Path { path: path.to_owned() })?;
    Ok(RootedPath::new(VirtualRoot::Project, path).intern())
}

impl World for MemoryWorld {
    fn library(&self) -> &LazyHash<Library> {
        static LIBRARY: OnceLock<LazyHash<Library>> = OnceLock::new();
        LIBRARY.get_or_init(|| LazyHash::new(Library::default()))
    }

    fn book(&self) -> &LazyHash<FontBook> {
        self.fonts.book()
    }

    fn main(&self) -> FileId {
        self.main
    }

    fn source(&self, id: FileId) -> FileResult<Source> {
        if let Some(source) = self.sources.get(&id) {
            return Ok(source.clone());
        }
        let data = self.files.get(&id).ok_or_else(|| absent(id))?;
        let text = std::str::from_utf8(data).map_err(|_| FileError::InvalidUtf8)?;
        Ok(Source::new(id, text.to_owned()))
    }

    fn file(&self, id: FileId) -> FileResult<Bytes> {
        if let Some(data) = self.files.get(&id) {
            return Ok(data.clone());
        }
        self.source(id).map(|source| Bytes::from_string(source.text().to_owned()))
    }

    fn font(&self, index: usize) -> Option<Font> {
        self.fonts.font(index)
    }

    /// A document's only date is the one that its author wrote.
    fn today(&self, _offset: Option<Duration>) -> Option<Datetime> {
        None
    }
}

fn absent(id: FileId) -> FileError {
    match id.root() {
        VirtualRoot::Project => FileError::NotFound(id.vpath().get_without_slash().into()),
        VirtualRoot::Package(_) => FileError::Other(Some("packages are not available".into())),
    }
}
