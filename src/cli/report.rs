//! `report`: the main job.

use std::ffi::OsStr;
use std::path::{Path, PathBuf};

use clap::{Args, ValueEnum};

use super::Outcome;
use super::files::{self, Output};
use super::progress::Bar;
use crate::error::Error;
use crate::record::documents;
use crate::render::pdf::FontSet;
use crate::render::{FigureStore, Press, RenderError};

#[derive(Debug, Args)]
#[command(
    after_help = "Examples:\n  sufficit report study.yaml\n  sufficit report study.yaml -o appendix.pdf -o \
                        statement.txt\n  cat study.yaml | sufficit report - -o - --format md"
)]
pub(super) struct Arguments {
    /// The spec, or `-` for standard input.
    spec: PathBuf,
    /// File to write; its extension chooses the format: .pdf, .md, .txt (the statement), .json (the plan), .typ (the
    /// Typst source). May be repeated. Without it: the PDF and the Markdown, in the current folder. `-` is standard
    /// output.
    #[arg(short, long = "output", value_name = "FILE")]
    output: Vec<PathBuf>,
    /// Format for standard output.
    #[arg(long, value_enum, default_value = "md")]
    format: Format,
    /// Replace files that exist.
    #[arg(long)]
    replace: bool,
    /// Format of the figures beside the Markdown.
    #[arg(long, value_enum, default_value = "svg")]
    figures: FigureFormat,
    /// Folder with fonts for characters that the built-in fonts lack.
    #[arg(long, value_name = "FOLDER")]
    fonts: Option<PathBuf>,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum Format {
    Pdf,
    Md,
    Txt,
    Json,
    Typ,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum FigureFormat {
    Svg,
    Png,
}

pub(super) fn execute(arguments: &Arguments) -> Result<Outcome, Error> {
    let targets = targets(arguments)?;
    let named =
        targets.iter().filter(|(path, _)| path.as_os_str() != "-").map(|(p, _)| p.as_path());
    files::refuse_existing(named, arguments.replace)?;
    let loaded = files::load(&arguments.spec)?;
    let fonts = font_set(arguments.fonts.as_deref())?;
    let plan = documents::solve(&loaded, &Bar::new())?;
    let press = documents::press(&loaded, &plan)?;
    let json = || documents::plan_json(&plan).map_err(RenderError::Plan);
    let mut outputs = Vec::new();
    let mut printed = Vec::new();
    for (path, format) in &targets {
        let to_stdout = path.as_os_str() == "-";
        let bytes = match format {
            Format::Pdf => press.pdf(&fonts)?,
            Format::Txt => statements(&press).into_bytes(),
            Format::Json => json()?.into_bytes(),
            Format::Typ => press.typst()?.main.into_bytes(),
            Format::Md => {
                let folder = if to_stdout { None } else { Some(figure_folder(path)) };
                let store = FigureStore { folder, pixels: arguments.figures == FigureFormat::Png };
                let document = press.markdown(&store)?;
                let beside = path.parent().unwrap_or(Path::new(""));
                outputs.extend(
                    document
                        .figures
                        .into_iter()
                        .map(|(p, bytes)| Output { path: beside.join(p), bytes }),
                );
                document.text.into_bytes()
            }
        };
        if to_stdout {
            printed.extend(bytes);
        } else {
            outputs.push(Output { path: path.clone(), bytes });
        }
    }
    files::refuse_existing(outputs.iter().map(|o| o.path.as_path()), arguments.replace)?;
    let written: Vec<String> = outputs.iter().map(|o| o.path.display().to_string()).collect();
    files::write_all(outputs, arguments.replace)?;
    files::print(&printed)?;
    for path in written {
        eprintln!("wrote {path}");
    }
    Ok(Outcome::Good)
}

/// The statements, each a paragraph of its own.
pub(super) fn statements(press: &Press<'_>) -> String {
    press.statements().join("\n\n") + "\n"
}

fn figure_folder(path: &Path) -> String {
    let stem = path.file_stem().unwrap_or(OsStr::new("report")).to_string_lossy();
    format!("{stem}-figures")
}

pub(super) fn font_set(folder: Option<&Path>) -> Result<FontSet, Error> {
    let Some(folder) = folder else { return Ok(FontSet::embedded()) };
    FontSet::embedded_with(files::fonts_in(folder)?)
        .map_err(|error| Error::file(folder.display().to_string(), error))
}

fn targets(arguments: &Arguments) -> Result<Vec<(PathBuf, Format)>, Error> {
    if arguments.output.is_empty() {
        let stem = if arguments.spec.as_os_str() == "-" {
            PathBuf::from("study")
        } else {
            PathBuf::from(arguments.spec.file_stem().unwrap_or(OsStr::new("study")))
        };
        let with = |extension: &str| {
            let mut name = stem.clone().into_os_string();
            name.push(extension);
            PathBuf::from(name)
        };
        return Ok(vec![(with(".pdf"), Format::Pdf), (with(".md"), Format::Md)]);
    }
    arguments
        .output
        .iter()
        .map(|path| {
            if path.as_os_str() == "-" {
                return Ok((path.clone(), arguments.format));
            }
            let extension = path.extension().unwrap_or_default().to_string_lossy().to_ascii_lowercase();
            let format = match extension.as_str() {
                "pdf" => Format::Pdf,
                "md" | "markdown" => Format::Md,
                "txt" => Format::Txt,
                "json" => Format::Json,
                "typ" => Format::Typ,
                _ => {
                    return Err(Error::Request(format!(
                        "`{}`: the extension chooses the format, and must be .pdf, .md, .txt, .json or .typ",
                        path.display()
                    )));
                }
            };
            Ok((path.clone(), format))
        })
        .collect()
}
