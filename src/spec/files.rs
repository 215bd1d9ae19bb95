//! Where a spec and the files that it names come from: a folder on disk that nothing may leave, or memory.

use std::collections::BTreeMap;
use std::io::Read;
use std::path::{Path, PathBuf};

/// Largest spec, in bytes.
pub const LARGEST_SPEC: u64 = 1 << 20;

/// Largest data or references file, in bytes.
pub const LARGEST_FILE: u64 = 16 << 20;

/// A file as raw bytes.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct InputFile {
    /// Its name: of a spec, without its folder; of the others, as a path with `/` relative to the spec.
    pub name: String,
    /// Its content.
    pub bytes: Vec<u8>,
}

impl InputFile {
    /// Reads a spec from a stream, such as standard input.
    ///
    /// # Errors
    ///
    /// The stream fails, or holds more than [`LARGEST_SPEC`] bytes (no more than that is read).
    pub fn from_reader(name: &str, reader: impl Read) -> Result<Self, FolderError> {
        let bytes = read_at_most("it", reader, LARGEST_SPEC)?;
        Ok(Self { name: name.to_owned(), bytes })
    }

    /// Reads a spec from disk and opens its folder for the files that it names.
    ///
    /// # Errors
    ///
    /// There is no such file, it is no regular file, it cannot be read, or it exceeds [`LARGEST_SPEC`] bytes (its
    /// size is known before it is read).
    pub fn open_spec(path: &Path) -> Result<(Self, DiskFolder), FolderError> {
        let name = path
            .file_name()
            .map(|name| name.to_string_lossy().into_owned())
            .ok_or_else(|| FolderError::new("it names no file"))?;
        let bytes = read_regular("it", path, LARGEST_SPEC)?;
        let parent = match path.parent() {
            Some(parent) if !parent.as_os_str().is_empty() => parent,
            _ => Path::new("."),
        };
        Ok((Self { name, bytes }, DiskFolder::new(parent)?))
    }
}

/// All files that a study rests on.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Inputs {
    /// The spec.
    pub spec: InputFile,
    /// Data and references beside it, sorted by name, each once.
    pub files: Vec<InputFile>,
}

/// Why a file cannot be had.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{reason}")]
pub struct FolderError {
    /// What is wrong, in words.
    pub reason: String,
    /// The way out.
    pub help: Option<String>,
}

impl FolderError {
    fn new(reason: impl Into<String>) -> Self {
        Self { reason: reason.into(), help: None }
    }

    fn help(mut self, help: impl Into<String>) -> Self {
        self.help = Some(help.into());
        self
    }
}

/// The files beside a spec.
pub trait Folder {
    /// The content of a file.
    ///
    /// # Errors
    ///
    /// The name leaves the folder or is no plain relative path, there is no such file, or it cannot or may not be
    /// read.
    fn read(&self, name: &str) -> Result<Vec<u8>, FolderError>;
}

/// The folder of a spec on disk; nothing outside it is read, whatever the name or the links say.
#[derive(Debug, Clone)]
pub struct DiskFolder {
    root: PathBuf,
}

impl DiskFolder {
    /// Opens a folder.
    ///
    /// # Errors
    ///
    /// There is no such folder.
    pub fn new(folder: &Path) -> Result<Self, FolderError> {
        let root = folder.canonicalize().map_err(|error| {
            FolderError::new(format!(
                "the folder `{}` cannot be opened: {}",
                folder.display(),
                plain(&error)
            ))
        })?;
        Ok(Self { root })
    }
}

impl Folder for DiskFolder {
    fn read(&self, name: &str) -> Result<Vec<u8>, FolderError> {
        let name = relative_name(name)?;
        let path = self.root.join(&name);
        let real = path.canonicalize().map_err(|error| match error.kind() {
            std::io::ErrorKind::NotFound => FolderError::new(format!(
                "there is no file `{name}` beside the spec"
            ))
            .help(
                "names are relative to the folder of the spec, and large and small letters differ",
            ),
            _ => FolderError::new(format!("`{name}` cannot be opened: {}", plain(&error))),
        })?;
        if !real.starts_with(&self.root) {
            return Err(FolderError::new(format!(
                "`{name}` is a link that leaves the folder of the spec"
            ))
            .help("copy the file into the folder of the spec"));
        }
        read_regular(&format!("`{name}`"), &real, LARGEST_FILE)
    }
}

/// Files in memory, such as the attachments of a document.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct MemoryFolder(pub BTreeMap<String, Vec<u8>>);

impl Folder for MemoryFolder {
    fn read(&self, name: &str) -> Result<Vec<u8>, FolderError> {
        let name = relative_name(name)?;
        let bytes = self.0.get(&name).ok_or_else(|| {
            FolderError::new(format!("there is no file `{name}` beside the spec"))
        })?;
        if bytes.len() as u64 > LARGEST_FILE {
            return Err(too_large(&format!("`{name}`"), LARGEST_FILE));
        }
        Ok(bytes.clone())
    }
}

/// The name without idle steps, if it is a plain path that stays inside its folder on any system.
///
/// # Errors
///
/// An absolute path, a step upwards, a drive or a backslash, an empty or overlong name, or a control character.
pub(super) fn relative_name(name: &str) -> Result<String, FolderError> {
    let shown = super::text::printable(name, 80);
    let refuse = |why: &str| {
        Err(FolderError::new(format!("`{shown}` {why}"))
            .help("put the file into the folder of the spec, and give its name, with `/` before a subfolder's files"))
    };
    if name.chars().any(|c| c.is_control() || super::text::is_refused(c)) {
        return refuse("holds a character that a file name cannot have");
    }
    if name.len() > 250 {
        return refuse("is too long for a file name");
    }
    if name.contains('\\') || name.contains(':') {
        return refuse(
            "holds a backslash or a colon, which mean different things on different systems",
        );
    }
    if name.starts_with('/') || name.starts_with('~') {
        return refuse("is an absolute path");
    }
    let steps: Vec<_> = name.split('/').filter(|step| !step.is_empty() && *step != ".").collect();
    if steps.contains(&"..") {
        return refuse("leaves the folder of the spec");
    }
    if steps.is_empty() || name.ends_with('/') {
        return refuse("names no file");
    }
    Ok(steps.join("/"))
}

/// Reads a file that messages call `called`: a spec is `it`, since its path stands before the message.
fn read_regular(called: &str, path: &Path, limit: u64) -> Result<Vec<u8>, FolderError> {
    let failed = |error: std::io::Error| match error.kind() {
        std::io::ErrorKind::NotFound => FolderError::new("there is no such file"),
        _ => FolderError::new(format!("{called} cannot be read: {}", plain(&error))),
    };
    let no_file =
        || FolderError::new(format!("{called} is a folder, a pipe or a device, not a file"));
    // Asked before opening, because to open a pipe is to wait for its other end.
    if !std::fs::metadata(path).map_err(failed)?.is_file() {
        return Err(no_file());
    }
    let file = std::fs::File::open(path).map_err(failed)?;
    let facts = file.metadata().map_err(failed)?;
    if !facts.is_file() {
        return Err(no_file());
    }
    if facts.len() > limit {
        return Err(too_large(called, limit));
    }
    read_at_most(called, file, limit)
}

fn read_at_most(called: &str, reader: impl Read, limit: u64) -> Result<Vec<u8>, FolderError> {
    let mut bytes = Vec::new();
    reader
        .take(limit + 1)
        .read_to_end(&mut bytes)
        .map_err(|error| FolderError::new(format!("{called} cannot be read: {}", plain(&error))))?;
    if bytes.len() as u64 > limit {
        return Err(too_large(called, limit));
    }
    Ok(bytes)
}

fn too_large(called: &str, limit: u64) -> FolderError {
    FolderError::new(format!("{called} is larger than {} MiB", limit >> 20)).help(
        if limit == LARGEST_SPEC {
            "a spec takes a few kilobytes; put measurements into a CSV file beside it"
        } else {
            "keep only the columns and rows that the plan rests on"
        },
    )
}

/// The reason of the system without its number, which differs between systems.
fn plain(error: &std::io::Error) -> String {
    match error.kind() {
        std::io::ErrorKind::PermissionDenied => "permission is denied".to_owned(),
        std::io::ErrorKind::NotFound => "there is no such file or folder".to_owned(),
        kind => kind.to_string(),
    }
}

#[cfg(test)]
mod tests {
    use super::relative_name;

    #[test]
    fn idle_steps_vanish() {
        assert_eq!(relative_name("./data//pilot.csv").as_deref(), Ok("data/pilot.csv"));
    }

    #[test]
    fn nothing_leaves_the_folder() {
        let wrong = [
            "",
            ".",
            "/",
            "/etc/passwd",
            "../x",
            "a/../../x",
            "a/..",
            "C:\\x",
            "c:x",
            "a\\b",
            "~/x",
            "x\0",
            "data/",
        ];
        for name in wrong {
            assert!(relative_name(name).is_err(), "{name:?}");
        }
        assert!(relative_name(&"x".repeat(251)).is_err());
    }
}
