//! Reading specs, and writing outputs whole or not at all.

use std::fs::File;
use std::io::{Read, Write};
use std::path::{Path, PathBuf};

use crate::error::Error;
use crate::spec::{self, DiskFolder, FolderError, InputFile, Loaded};

/// Name of a spec that comes from standard input.
const UNNAMED: &str = "study.yaml";

/// Loads a spec from a file, or from standard input when the path is `-`.
pub(super) fn load(path: &Path) -> Result<Loaded, Error> {
    let opened = if path == Path::new("-") {
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
    Error::file(path.display().to_string(), format!("{}{help}", error.reason))
}

/// Reads a whole file, refusing one that is larger than a limit.
pub(super) fn read_document(path: &Path, limit: u64) -> Result<Vec<u8>, Error> {
    let shown = path.display().to_string();
    let file = File::open(path).map_err(|e| Error::file(&shown, reading(&e)))?;
    let mut bytes = Vec::new();
    file.take(limit + 1).read_to_end(&mut bytes).map_err(|e| Error::file(&shown, reading(&e)))?;
    if bytes.len() as u64 > limit {
        return Err(Error::file(&shown, format!("the file is larger than {limit} bytes")));
    }
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

/// Refuses paths that exist, unless they may be replaced.
pub(super) fn refuse_existing<'a>(
    paths: impl Iterator<Item = &'a Path>,
    replace: bool,
) -> Result<(), Error> {
    for path in paths {
        if !replace && path.symlink_metadata().is_ok() {
            return Err(taken(path));
        }
    }
    Ok(())
}

fn taken(path: &Path) -> Error {
    let reason =
        "a file of this name exists and is left alone; add --replace, or name another file with -o";
    Error::file(path.display().to_string(), reason)
}

/// Writes each file under a temporary name beside its place and moves it there; all temporary files are complete
/// before the first one is moved, so a full disk leaves nothing behind.
pub(super) fn write_all(outputs: Vec<Output>, replace: bool) -> Result<(), Error> {
    let mut ready = Vec::new();
    for output in outputs {
        let shown = output.path.display().to_string();
        let fail = |e: std::io::Error| Error::file(&shown, format!("it cannot be written ({e})"));
        let folder = output.path.parent().filter(|p| !p.as_os_str().is_empty());
        let folder = folder.unwrap_or(Path::new("."));
        if !folder.is_dir() {
            let within = folder.parent().filter(|p| !p.as_os_str().is_empty());
            if within.is_some_and(|parent| !parent.is_dir()) {
                return Err(Error::file(&shown, "its folder does not exist; make it first"));
            }
            std::fs::create_dir(folder).map_err(fail)?;
        }
        let mut file =
            tempfile::Builder::new().prefix(".sufficit-").tempfile_in(folder).map_err(fail)?;
        file.write_all(&output.bytes).map_err(fail)?;
        open_to_readers(&file).map_err(fail)?;
        file.as_file().sync_all().map_err(fail)?;
        ready.push((file, output.path));
    }
    for (file, path) in ready {
        let shown = path.display().to_string();
        if replace {
            file.persist(&path)
                .map_err(|e| Error::file(shown, format!("it cannot be written ({})", e.error)))?;
        } else {
            file.persist_noclobber(&path).map_err(|e| match e.error.kind() {
                std::io::ErrorKind::AlreadyExists => taken(&path),
                _ => Error::file(shown, format!("it cannot be written ({})", e.error)),
            })?;
        }
    }
    Ok(())
}

/// Temporary files are private; a report is not.
#[cfg(unix)]
fn open_to_readers(file: &tempfile::NamedTempFile) -> std::io::Result<()> {
    use std::os::unix::fs::PermissionsExt;
    file.as_file().set_permissions(std::fs::Permissions::from_mode(0o644))
}

#[cfg(not(unix))]
fn open_to_readers(_file: &tempfile::NamedTempFile) -> std::io::Result<()> {
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
