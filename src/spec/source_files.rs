//! The files that a spec names, each read once and kept for the record.

use std::cell::RefCell;
use std::collections::BTreeMap;
use std::rc::Rc;

use super::files::{Folder, FolderError, InputFile, relative_name};
use super::table;
use crate::designs::{Fault, Path, Tables};

/// The files beside a spec.
pub(super) struct SourceFiles<'f> {
    folder: &'f dyn Folder,
    spec: &'f str,
    read: RefCell<BTreeMap<String, Rc<Vec<u8>>>>,
}

impl<'f> SourceFiles<'f> {
    /// Files of a folder; the spec's own name cannot be one of them.
    pub fn new(folder: &'f dyn Folder, spec: &'f str) -> Self {
        Self { folder, spec, read: RefCell::default() }
    }

    /// The content of a file.
    ///
    /// # Errors
    ///
    /// It cannot be had, or is the spec itself.
    pub fn get(&self, name: &str) -> Result<Rc<Vec<u8>>, FolderError> {
        let name = relative_name(name)?;
        if name == self.spec {
            let reason = format!("`{name}` is the spec itself");
            return Err(FolderError { reason, help: Some("name a file beside it".to_owned()) });
        }
        if let Some(known) = self.read.borrow().get(&name) {
            return Ok(Rc::clone(known));
        }
        let bytes = Rc::new(self.folder.read(&name)?);
        self.read.borrow_mut().insert(name, Rc::clone(&bytes));
        Ok(bytes)
    }

    /// All files that were read, sorted by name.
    pub fn into_files(self) -> Vec<InputFile> {
        let files = self.read.into_inner().into_iter();
        files.map(|(name, bytes)| InputFile { name, bytes: Rc::unwrap_or_clone(bytes) }).collect()
    }
}

impl Tables for SourceFiles<'_> {
    fn column(
        &self,
        file: &str,
        column: &str,
        filter: &[(String, String)],
    ) -> Result<Vec<f64>, Fault> {
        let bytes = self.get(file).map_err(|error| {
            let fault = Fault::value(Path::of("file"), error.reason);
            error.help.into_iter().fold(fault, Fault::help)
        })?;
        table::column(file, &bytes, column, filter)
    }
}
