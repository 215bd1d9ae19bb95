//! What `report` writes, and where: all that is wrong with it is said before anything is computed.

use std::collections::BTreeMap;
use std::ffi::OsStr;
use std::path::{Path, PathBuf};

use clap::ValueEnum;

use super::files;
use crate::error::Error;

/// Format of a document.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum Format {
    Pdf,
    Md,
    Txt,
    Json,
    Typ,
}

/// A document to be written.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Target {
    /// The file; `-` is standard output.
    pub path: PathBuf,
    pub format: Format,
}

impl Target {
    pub fn is_stdout(&self) -> bool {
        files::is_stream(&self.path)
    }

    /// The folder beside a Markdown file that holds its figures.
    pub fn figure_folder(&self) -> Option<String> {
        let stem = self.path.file_stem().unwrap_or(OsStr::new("report")).to_string_lossy();
        (self.format == Format::Md && !self.is_stdout()).then(|| format!("{stem}-figures"))
    }
}

/// The documents that were asked for; without any, the PDF and the Markdown in the current folder.
///
/// # Errors
///
/// A format that does not exist or that nothing has, or two documents in one place.
pub(super) fn targets(
    spec: &Path,
    outputs: &[PathBuf],
    format: Option<Format>,
) -> Result<Vec<Target>, Error> {
    if format.is_some() && !outputs.iter().any(|path| files::is_stream(path)) {
        let reason = "`--format` is the format of standard output, so it needs `-o -`; the format of a file follows \
                      from its extension";
        return Err(Error::Request(reason.to_owned()));
    }
    if outputs.is_empty() {
        return Ok(defaults(spec));
    }
    let named = outputs.iter().map(|path| {
        let format = match files::is_stream(path) {
            true => format.unwrap_or(Format::Md),
            false => format_of(path)?,
        };
        Ok(Target { path: path.clone(), format })
    });
    let targets = named.collect::<Result<Vec<_>, Error>>()?;
    distinct(spec, &targets)?;
    Ok(targets)
}

fn defaults(spec: &Path) -> Vec<Target> {
    let stem = match files::is_stream(spec) {
        true => OsStr::new("study"),
        false => spec.file_stem().unwrap_or(OsStr::new("study")),
    };
    let target = |extension: &str, format| {
        let mut name = stem.to_owned();
        name.push(extension);
        Target { path: PathBuf::from(name), format }
    };
    vec![target(".pdf", Format::Pdf), target(".md", Format::Md)]
}

fn format_of(path: &Path) -> Result<Format, Error> {
    let extension = path.extension().unwrap_or_default().to_string_lossy().to_ascii_lowercase();
    match extension.as_str() {
        "pdf" => Ok(Format::Pdf),
        "md" | "markdown" => Ok(Format::Md),
        "txt" => Ok(Format::Txt),
        "json" => Ok(Format::Json),
        "typ" => Ok(Format::Typ),
        _ => Err(Error::Request(format!(
            "`{}`: the extension chooses the format, and must be .pdf, .md, .txt, .json or .typ",
            path.display()
        ))),
    }
}

/// Refuses two documents in one place, two sets of figures in one folder, and a document in the place of the spec.
fn distinct(spec: &Path, targets: &[Target]) -> Result<(), Error> {
    let mut places: BTreeMap<PathBuf, String> = BTreeMap::new();
    let mut folders: BTreeMap<PathBuf, String> = BTreeMap::new();
    let spec = (!files::is_stream(spec)).then(|| place(spec));
    for target in targets {
        let shown = format!("`{}`", target.path.display());
        let here = if target.is_stdout() { PathBuf::from("-") } else { place(&target.path) };
        if spec.as_ref() == Some(&here) {
            let reason = format!("{shown} is the spec itself; name another file with -o");
            return Err(Error::Request(reason));
        }
        if let Some(before) = places.insert(here, shown.clone()) {
            return Err(Error::Request(if target.is_stdout() {
                "standard output (`-o -`) takes one document, and two are asked for".to_owned()
            } else if before == shown {
                format!("{shown} is named twice; name every file once")
            } else {
                format!("{before} and {shown} are the same file; name every file once")
            }));
        }
        let Some(folder) = target.figure_folder() else { continue };
        let beside = place(&files::parent(&target.path).join(&folder));
        if let Some(before) = folders.insert(beside, shown.clone()) {
            let reason = format!(
                "{before} and {shown} would keep their figures in the same folder, `{folder}`; give one of them \
                 another name"
            );
            return Err(Error::Request(reason));
        }
    }
    Ok(())
}

/// A path that is the same for all spellings of one place, as far as its folder exists.
fn place(path: &Path) -> PathBuf {
    let folder = files::parent(path);
    let name = path.file_name().unwrap_or(path.as_os_str());
    folder.canonicalize().unwrap_or_else(|_| folder.components().collect()).join(name)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn said(outputs: &[&str], format: Option<Format>) -> String {
        let outputs: Vec<_> = outputs.iter().map(PathBuf::from).collect();
        let made = targets(Path::new("none/s.txt"), &outputs, format);
        made.map_or_else(|error| error.to_string(), |targets| format!("{} targets", targets.len()))
    }

    #[test]
    fn every_document_has_a_place_of_its_own() {
        let cases = [
            (vec!["q.md", "q.md"], "`q.md` is named twice"),
            (vec!["q.md", "./q.md"], "`q.md` and `./q.md` are the same file"),
            (vec!["none/q.md", "none/./q.md"], "are the same file"),
            (vec!["-", "q.md", "-"], "takes one document"),
            (vec!["q.md", "q.markdown"], "in the same folder, `q-figures`"),
            (vec!["none/s.txt"], "is the spec itself"),
            (vec!["q.odt"], "the extension chooses the format"),
            (vec!["q.md", "none/q.md", "q.pdf", "-"], "4 targets"),
            (vec![], "2 targets"),
        ];
        for (outputs, expected) in cases {
            let said = said(&outputs, None);
            assert!(said.contains(expected), "{outputs:?}: {said}");
        }
    }

    #[test]
    fn a_format_needs_standard_output() {
        assert!(said(&["q.md"], Some(Format::Txt)).contains("needs `-o -`"));
        assert!(said(&[], Some(Format::Md)).contains("needs `-o -`"));
        assert_eq!(said(&["q.md", "-"], Some(Format::Txt)), "2 targets");
    }
}
