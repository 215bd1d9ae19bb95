//! Reading specs, and writing outputs whole or not at all.

use std::fs::File;
use std::io::{Read, Write};
use std::path::{Path, PathBuf};

use tempfile::NamedTempFile;

use crate::error::Error;
use crate::spec::{self, DiskFolder, FolderError, InputFile, Loaded};

/// Name of a spec that comes from standard input.
const UNNAMED: &str = "study.yaml";

/// Loads a spec from a file, or from standard input when the path is `-`.
pub(super) fn load(path: &Path) -> Result<Loaded, Error> {
    let opened = if is_stream(path) {
        InputFile::from_reader(UNNAMED, std::io::stdin().lock())
            .and_then(|spec| Ok((spec, DiskFolder::new(Path::new("."))?)))
    } else {
        InputFile::open_spec(path)
    };
    let (spec, folder) = opened.map_err(|error| unreadable(path, &error))?;
    Ok(spec::load(spec, &folder)?)
}

fn unreadable(path: &Path, error: &FolderError) -> Error {
    let help = error.help.iter().map(|help| format!("; {help}")).collect::<String>();
    Error::file(shown(path), format!("{}{help}", error.reason))
}

/// Whether a path stands for standard input or output.
pub(super) fn is_stream(path: &Path) -> bool {
    path == Path::new("-")
}

/// What a message calls a file that is read.
pub(super) fn shown(path: &Path) -> String {
    if is_stream(path) { "standard input".to_owned() } else { path.display().to_string() }
}

/// Reads a whole file, or standard input when the path is `-`, refusing more than a limit.
pub(super) fn read_document(path: &Path, limit: u64) -> Result<Vec<u8>, Error> {
    let shown = shown(path);
    let read = |source: &mut dyn Read| {
        let mut bytes = Vec::new();
        source.take(limit + 1).read_to_end(&mut bytes).map(|_| bytes)
    };
    let bytes = if is_stream(path) {
        read(&mut std::io::stdin().lock())
    } else {
        File::open(path).and_then(|mut file| read(&mut file))
    };
    let bytes = bytes.map_err(|e| Error::file(&shown, reading(&e)))?;
    if bytes.len() as u64 > limit {
        return Err(Error::file(&shown, format!("it is larger than {} MiB", limit >> 20)));
    }
    Ok(bytes)
}

/// Reads a file beside a document, by a name that cannot lead elsewhere; no pipe is waited for.
pub(super) fn read_beside(document: &Path, name: &str, limit: u64) -> std::io::Result<Vec<u8>> {
    let path = document.parent().unwrap_or(Path::new("")).join(name);
    if !std::fs::metadata(&path)?.is_file() {
        return Err(std::io::Error::other("it is no file"));
    }
    let mut bytes = Vec::new();
    // What is cut off here is larger than any figure, so it differs all the same.
    File::open(&path)?.take(limit).read_to_end(&mut bytes)?;
    Ok(bytes)
}

fn reading(error: &std::io::Error) -> String {
    match error.kind() {
        std::io::ErrorKind::NotFound => "there is no such file".to_owned(),
        std::io::ErrorKind::PermissionDenied => "reading it is not permitted".to_owned(),
        _ => format!("it cannot be read ({error})"),
    }
}

/// A file to be written.
#[derive(Debug)]
pub(super) struct Output {
    pub(super) path: PathBuf,
    pub(super) bytes: Vec<u8>,
}

/// Refuses paths that exist, unless they are files that may be replaced.
pub(super) fn refuse_existing<'a>(
    paths: impl Iterator<Item = &'a Path>,
    replace: bool,
) -> Result<(), Error> {
    for path in paths {
        let reason = match path.symlink_metadata() {
            Ok(facts) if facts.is_dir() => {
                "a folder of this name exists; name another file with -o"
            }
            Ok(_) if !replace => TAKEN,
            _ => continue,
        };
        return Err(Error::file(path.display().to_string(), reason));
    }
    Ok(())
}

const TAKEN: &str =
    "a file of this name exists and is left alone; add --replace, or name another file with -o";

/// Writes each file under a temporary name beside its place and moves it there; all temporary files are complete
/// before the first one is moved, so a full disk leaves nothing behind. Should a move fail all the same, the message
/// names what was written before.
pub(super) fn write_all(outputs: Vec<Output>, replace: bool) -> Result<(), Error> {
    let mut made = Vec::new();
    let written = prepare(outputs, &mut made).and_then(|ready| move_all(ready, replace));
    if written.is_err() {
        for folder in made.iter().rev() {
            // A folder that holds something is left, as it should be.
            let _ = std::fs::remove_dir(folder);
        }
    }
    written
}

/// The files under temporary names, with the places where they belong; folders that had to be made are noted.
fn prepare(
    outputs: Vec<Output>,
    made: &mut Vec<PathBuf>,
) -> Result<Vec<(NamedTempFile, PathBuf)>, Error> {
    let mut ready = Vec::new();
    for output in outputs {
        let shown = output.path.display().to_string();
        let fail = |e: std::io::Error| Error::file(&shown, unwritable(&e));
        let folder = parent(&output.path);
        if !folder.is_dir() {
            if !parent(folder).is_dir() {
                return Err(Error::file(&shown, "its folder does not exist; make it first"));
            }
            std::fs::create_dir(folder).map_err(fail)?;
            made.push(folder.to_owned());
        }
        let mut file =
            tempfile::Builder::new().prefix(".sufficit-").tempfile_in(folder).map_err(fail)?;
        file.write_all(&output.bytes).map_err(fail)?;
        open_to_readers(&file).map_err(fail)?;
        file.as_file().sync_all().map_err(fail)?;
        ready.push((file, output.path));
    }
    Ok(ready)
}

fn move_all(ready: Vec<(NamedTempFile, PathBuf)>, replace: bool) -> Result<(), Error> {
    let mut written: Vec<String> = Vec::new();
    for (file, path) in ready {
        let shown = path.display().to_string();
        let moved = if replace { file.persist(&path) } else { file.persist_noclobber(&path) };
        if let Err(failed) = moved {
            let reason = match failed.error.kind() {
                std::io::ErrorKind::AlreadyExists if !replace => TAKEN.to_owned(),
                _ => unwritable(&failed.error),
            };
            let before = match written.as_slice() {
                [] => String::new(),
                written => format!("; written before it: {}", written.join(", ")),
            };
            return Err(Error::file(shown, reason + &before));
        }
        written.push(shown);
    }
    Ok(())
}

fn unwritable(error: &std::io::Error) -> String {
    format!("it cannot be written ({error})")
}

/// The folder of a path; of a bare name, the current one.
pub(super) fn parent(path: &Path) -> &Path {
    path.parent().filter(|p| !p.as_os_str().is_empty()).unwrap_or(Path::new("."))
}

/// Temporary files are private; a report is not.
#[cfg(unix)]
fn open_to_readers(file: &NamedTempFile) -> std::io::Result<()> {
    use std::os::unix::fs::PermissionsExt;
    file.as_file().set_permissions(std::fs::Permissions::from_mode(0o644))
}

#[cfg(not(unix))]
fn open_to_readers(_file: &NamedTempFile) -> std::io::Result<()> {
    Ok(())
}

/// Writes to standard output; a reader that has gone away is no error.
pub(super) fn print(bytes: &[u8]) -> Result<(), Error> {
    let mut out = std::io::stdout().lock();
    match out.write_all(bytes).and_then(|()| out.flush()) {
        Err(e) if e.kind() == std::io::ErrorKind::BrokenPipe => Ok(()),
        Err(e) => Err(Error::file("standard output", e)),
        Ok(()) => Ok(()),
    }
}

/// The fonts of a folder, by file name, for characters that the built-in ones lack.
pub(super) fn fonts_in(folder: &Path) -> Result<Vec<Vec<u8>>, Error> {
    let shown = folder.display().to_string();
    let entries = std::fs::read_dir(folder).map_err(|e| Error::file(&shown, reading(&e)))?;
    let mut paths: Vec<PathBuf> = entries.filter_map(|e| e.ok().map(|e| e.path())).collect();
    paths.retain(|p| {
        let extension = p.extension().map(|e| e.to_string_lossy().to_ascii_lowercase());
        matches!(extension.as_deref(), Some("ttf" | "otf" | "ttc" | "otc"))
    });
    paths.sort();
    if paths.is_empty() {
        return Err(Error::file(shown, "the folder holds no font (.ttf, .otf, .ttc, .otc)"));
    }
    paths.iter().map(|path| read_document(path, 64 << 20)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A folder in the place of the last file makes its move fail after all others.
    #[test]
    fn a_failed_move_names_what_was_written() -> std::io::Result<()> {
        let place = tempfile::tempdir()?;
        std::fs::create_dir(place.path().join("b.md"))?;
        let output = |name: &str| Output { path: place.path().join(name), bytes: b"x".to_vec() };
        for replace in [true, false] {
            let outputs = vec![output("a.md"), output("b.md")];
            let said = write_all(outputs, replace).err().map(|e| e.to_string()).unwrap_or_default();
            let written = place.path().join("a.md");
            let note = format!("; written before it: {}", written.display());
            assert!(said.contains("b.md: ") && said.ends_with(&note), "{said}");
            std::fs::remove_file(written)?;
            assert_eq!(std::fs::read_dir(place.path())?.count(), 1, "no temporary file is left");
        }
        Ok(())
    }

    #[test]
    fn a_file_that_cannot_be_prepared_leaves_no_folder() -> std::io::Result<()> {
        let place = tempfile::tempdir()?;
        let output = |name: &str| Output { path: place.path().join(name), bytes: Vec::new() };
        assert!(write_all(vec![output("new/a.svg"), output("no/such/b.md")], false).is_err());
        assert_eq!(std::fs::read_dir(place.path())?.count(), 0);
        Ok(())
    }
}
