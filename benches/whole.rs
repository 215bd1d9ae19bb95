//! The whole way from YAML to PDF and Markdown, as a ratio to what the typesetter alone needs for the same pages.
//!
//! `cargo bench --bench whole`. All times are medians of one run on one machine; only the ratios mean anything.

use std::path::Path;
use std::time::{Duration, Instant};

use sufficit::designs::Point;
use sufficit::record::documents;
use sufficit::render::FigureStore;
use sufficit::render::pdf::{self, FontSet, Job};
use sufficit::solver::{Silent, size_grid, smallest_sizes};
use sufficit::spec::{self, InputFile};

const ROUNDS: usize = 25;

/// Median time of a piece of work. `fresh` keeps rounds from finding each other's results in a cache.
fn median(mut work: impl FnMut(usize)) -> Duration {
    let mut times: Vec<Duration> = (0..ROUNDS)
        .map(|round| {
            let start = Instant::now();
            work(round);
            start.elapsed()
        })
        .collect();
    times.sort();
    times[ROUNDS / 2]
}

/// The example, with a date of its own so that no two rounds typeset the same text.
fn variant(path: &Path, round: usize) -> InputFile {
    let (spec, _) = InputFile::open_spec(path).expect("the example exists");
    let text = String::from_utf8(spec.bytes).expect("text");
    let title = format!("title: Round {round}.{}, ", std::process::id());
    InputFile { name: spec.name, bytes: text.replacen("title: ", &title, 1).into_bytes() }
}

fn main() {
    let fonts = FontSet::embedded();
    for example in ["axolotl.yaml", "seedlings.yaml"] {
        let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("examples").join(example);
        let (_, folder) = InputFile::open_spec(&path).expect("the example exists");
        let mut round_of_all = 0;
        let mut load = || {
            round_of_all += 1;
            let mut loaded = spec::load(variant(&path, round_of_all), &folder).expect("valid");
            loaded.study.replicates = 0;
            loaded
        };
        let mut pages = 0;
        let mut sources = Vec::new();
        for _ in 0..ROUNDS {
            let loaded = load();
            let plan = documents::solve(&loaded, &Silent).expect("solvable");
            sources
                .push(documents::press(&loaded, &plan).and_then(|p| p.typst()).expect("renders"));
        }
        let typeset = median(|round| {
            let source = &sources[round];
            let date = (2031, 1, 1);
            let job = Job { main: &source.main, files: source.files.clone(), date, fonts: &fonts };
            let compiled = pdf::compile(&job).expect("compiles");
            pages = compiled.pages();
            pdf::export(&job, &compiled).expect("exports");
        });
        let whole = median(|_| {
            let loaded = load();
            let plan = documents::solve(&loaded, &Silent).expect("solvable");
            let press = documents::press(&loaded, &plan).expect("renders");
            let store = FigureStore { folder: Some("figures".into()), pixels: false };
            press.pdf(&fonts).expect("a PDF");
            press.markdown(&store).expect("a Markdown");
        });
        let simulated = median(|_| {
            let mut loaded = load();
            loaded.study.replicates = 100_000;
            documents::solve(&loaded, &Silent).expect("solvable");
        });
        let solved = median(|_| {
            documents::solve(&load(), &Silent).expect("solvable");
        });
        let loaded = load();
        let plan = documents::solve(&loaded, &Silent).expect("solvable");
        let pressed = median(|_| drop(documents::press(&loaded, &plan).expect("renders")));
        let press = documents::press(&loaded, &plan).expect("renders");
        let sourced = median(|_| drop(press.typst().expect("renders")));
        let store = FigureStore { folder: Some("figures".into()), pixels: false };
        let marked = median(|_| drop(press.markdown(&store).expect("renders")));
        println!("{example}: {pages} pages");
        println!("  sentences and figures        {pressed:>12.2?}");
        println!("  Typst source                 {sourced:>12.2?}");
        println!("  Markdown                     {marked:>12.2?}");
        println!("  typesetting alone            {typeset:>12.2?}");
        println!("  YAML to PDF and Markdown     {whole:>12.2?}");
        println!(
            "  ratio (at most 1.5)          {:>10.2}",
            whole.as_secs_f64() / typeset.as_secs_f64()
        );
        println!("  solving alone                {solved:>12.2?}");
        println!(
            "  100 000 simulated studies add {:>11.2?} (at most 150 ms)",
            simulated.saturating_sub(solved)
        );
    }
    grid();
    println!("peak memory of this process: {} MB (at most 200)", peak_memory());
}

/// A grid of exact two-sample sizes on one core, and the same cells solved one by one.
fn grid() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("examples/axolotl.yaml");
    let (spec, folder) = InputFile::open_spec(&path).expect("the example exists");
    let loaded = spec::load(spec, &folder).expect("valid");
    let problem = loaded.study.experiments[0].problem.as_ref();
    let planned = problem.planned();
    let steps = |at: f64| (0..100).map(|i| at * (0.5 + f64::from(i) / 100.0)).collect::<Vec<_>>();
    let (effects, spreads) = (steps(planned.effect), steps(planned.nuisance));
    let together = median(|_| drop(size_grid(problem, &effects, &spreads).expect("solvable")));
    let apart = median(|_| {
        for effect in &effects {
            for nuisance in &spreads {
                let at = Point { effect: *effect, nuisance: *nuisance };
                smallest_sizes(problem, at).expect("solvable");
            }
        }
    });
    println!("100 x 100 grid of exact sizes    {together:>10.2?} (at most 50 ms)");
    println!("  the same one by one            {apart:>10.2?}");
}

/// Peak resident memory in megabytes, where the system tells.
fn peak_memory() -> String {
    std::fs::read_to_string("/proc/self/status")
        .ok()
        .and_then(|status| {
            let line = status.lines().find(|line| line.starts_with("VmHWM"))?.to_owned();
            let kilobytes: u64 = line.split_whitespace().nth(1)?.parse().ok()?;
            Some((kilobytes / 1024).to_string())
        })
        .unwrap_or_else(|| "unknown".to_owned())
}
