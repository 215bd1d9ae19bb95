//! `report`: the main job.

use std::path::{Path, PathBuf};

use clap::{Args, ValueEnum};

use super::Outcome;
use super::files::{self, Output};
use super::progress::Bar;
use super::targets::{Format, Target, targets};
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
    /// main Typst source, to read). May be repeated. Without it: the PDF and the Markdown, in the current folder. `-` is standard
    /// output.
    #[arg(short, long = "output", value_name = "FILE")]
    output: Vec<PathBuf>,
    /// Format for standard output; `md` unless given.
    #[arg(long, value_enum)]
    format: Option<Format>,
    /// Replace files that exist.
    #[arg(long)]
    replace: bool,
    /// Format of the figures of the Markdown; `svg` unless given.
    #[arg(long, value_enum)]
    figures: Option<FigureFormat>,
    /// Folder with fonts for characters that the built-in fonts lack.
    #[arg(long, value_name = "FOLDER")]
    fonts: Option<PathBuf>,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum FigureFormat {
    Svg,
    Png,
}

pub(super) fn execute(arguments: &Arguments) -> Result<Outcome, Error> {
    let targets = targets(&arguments.spec, &arguments.output, arguments.format)?;
    let store = figure_store(arguments, &targets)?;
    let named = targets.iter().filter(|target| !target.is_stdout()).map(|t| t.path.as_path());
    files::refuse_existing(named, arguments.replace)?;
    let loaded = files::load(&arguments.spec)?;
    let fonts = font_set(arguments.fonts.as_deref())?;
    let plan = documents::solve(&loaded, &Bar::new())?;
    let press = documents::press(&loaded, &plan)?;
    let json = || documents::plan_json(&plan).map_err(RenderError::Plan);
    let mut outputs = Vec::new();
    let mut printed = Vec::new();
    for target in &targets {
        let bytes = match target.format {
            Format::Pdf => press.pdf(&fonts)?,
            Format::Txt => statements(&press).into_bytes(),
            Format::Json => json()?.into_bytes(),
            Format::Typ => press.typst()?.main.into_bytes(),
            Format::Md => {
                let store = FigureStore { folder: target.figure_folder(), ..store };
                let document = press.markdown(&store)?;
                let beside = target.path.parent().unwrap_or(Path::new(""));
                let figures = document.figures.into_iter();
                outputs.extend(figures.map(|(p, bytes)| Output { path: beside.join(p), bytes }));
                document.text.into_bytes()
            }
        };
        if target.is_stdout() {
            printed.extend(bytes);
        } else {
            outputs.push(Output { path: target.path.clone(), bytes });
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

/// How figures are stored, before their folder is known.
fn figure_store(arguments: &Arguments, targets: &[Target]) -> Result<FigureStore, Error> {
    if arguments.figures.is_some() && !targets.iter().any(|target| target.format == Format::Md) {
        let reason =
            "`--figures` is the format of the figures of a Markdown, and none is asked for";
        return Err(Error::Request(reason.to_owned()));
    }
    Ok(FigureStore { folder: None, pixels: arguments.figures == Some(FigureFormat::Png) })
}

/// The statements, each a paragraph of its own.
pub(super) fn statements(press: &Press<'_>) -> String {
    press.statements().join("\n\n") + "\n"
}

pub(super) fn font_set(folder: Option<&Path>) -> Result<FontSet, Error> {
    let Some(folder) = folder else { return Ok(FontSet::embedded()) };
    FontSet::embedded_with(files::fonts_in(folder)?)
        .map_err(|error| Error::file(folder.display().to_string(), error))
}
