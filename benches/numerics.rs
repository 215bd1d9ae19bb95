//! Speed of the noncentral distributions against Boost.Math and scipy, as ratios in one run.
//!
//! `cargo bench --bench numerics` writes one table of inputs a function, lets this crate, a small C++ program
//! (`numerics/boost.cpp`) and a script (`numerics/scipy_times.py`) evaluate it, and prints nanoseconds a call, the ratios,
//! and the largest relative difference of the values. A contender that is not installed is skipped with a message.
//! A difference above 1e-12 is an error of the contender: this crate's values are held to tables of 50 digits by
//! `tests/numerics`.

use std::fmt::Write as _;
use std::hint::black_box;
use std::path::{Path, PathBuf};
use std::process::Command;
use std::time::Instant;

use sufficit::numerics::{
    Continuous, NoncentralChiSquared, NoncentralF, NoncentralT, Result, StudentT,
};

/// Calls in a table.
const CALLS: usize = 4000;

/// Rounds of which the fastest counts: other work on the machine only ever slows a round down.
const ROUNDS: usize = 25;

/// One function with its inputs.
struct Contest {
    name: &'static str,
    inputs: Vec<Vec<f64>>,
    compute: fn(&[f64]) -> Result<f64>,
}

/// A table in which each argument runs through its own grid, out of step with the others.
fn grid(axes: &[(f64, f64, usize)]) -> Vec<Vec<f64>> {
    let value = |call: usize, (low, high, steps): (f64, f64, usize)| {
        low + (high - low) * ((call % steps) as f64) / ((steps - 1) as f64)
    };
    (0..CALLS).map(|call| axes.iter().map(|&axis| value(call, axis)).collect()).collect()
}

/// Arguments as they occur when the size of a study is sought; the last argument is the critical value.
fn contests() -> Vec<Contest> {
    vec![
        Contest {
            name: "noncentral_t_sf",
            inputs: grid(&[(4.0, 196.0, 97), (0.5, 4.1, 37), (1.7, 2.7, 11)]),
            compute: |v| NoncentralT::new(v[0], v[1])?.sf(v[2]),
        },
        Contest {
            name: "noncentral_t_cdf_far_side",
            inputs: grid(&[(4.0, 196.0, 97), (0.5, 4.1, 37), (-2.7, -1.7, 11)]),
            compute: |v| NoncentralT::new(v[0], v[1])?.cdf(v[2]),
        },
        Contest {
            name: "noncentral_f_sf",
            inputs: grid(&[(1.0, 7.0, 7), (4.0, 196.0, 97), (2.5, 20.5, 37), (2.7, 3.7, 11)]),
            compute: |v| NoncentralF::new(v[0], v[1], v[2])?.sf(v[3]),
        },
        Contest {
            name: "noncentral_chi2_sf",
            inputs: grid(&[(1.0, 7.0, 7), (2.5, 20.5, 37), (3.8, 10.8, 11)]),
            compute: |v| NoncentralChiSquared::new(v[0], v[1])?.sf(v[2]),
        },
        Contest {
            name: "noncentral_chi2_sf_large",
            inputs: grid(&[(1.0, 200.0, 7), (100.0, 2000.0, 37), (500.0, 2500.0, 11)]),
            compute: |v| NoncentralChiSquared::new(v[0], v[1])?.sf(v[2]),
        },
        Contest {
            name: "t_upper_quantile",
            inputs: grid(&[(4.0, 196.0, 97), (0.001, 0.3, 37)]),
            compute: |v| StudentT::new(v[0])?.upper_quantile(v[1]),
        },
    ]
}

/// What a contender reports for one function.
struct Outcome {
    nanoseconds: f64,
    values: Vec<f64>,
}

fn own(contest: &Contest) -> Result<Outcome> {
    let values: Vec<f64> =
        contest.inputs.iter().map(|v| (contest.compute)(v)).collect::<Result<_>>()?;
    let mut best = f64::INFINITY;
    for _ in 0..ROUNDS {
        let start = Instant::now();
        for input in &contest.inputs {
            black_box((contest.compute)(black_box(input))?);
        }
        best = best.min(start.elapsed().as_secs_f64());
    }
    Ok(Outcome { nanoseconds: best * 1e9 / CALLS as f64, values })
}

/// Runs a contender on a table: it prints nanoseconds a call, then one value a line, or nothing if it lacks the function.
fn run(command: &mut Command, contest: &Contest, table: &Path) -> Option<Outcome> {
    let output = command.arg(contest.name).arg(table).arg(ROUNDS.to_string()).output().ok()?;
    let text = String::from_utf8(output.stdout).ok()?;
    let mut numbers = text.lines().map(|line| line.parse::<f64>().unwrap_or(f64::NAN));
    let nanoseconds = numbers.next()?;
    Some(Outcome { nanoseconds, values: numbers.collect() })
}

/// Largest relative difference of the values, or none where the contender gave up on some.
fn difference(own: &Outcome, other: &Outcome) -> String {
    let pairs = own.values.iter().zip(&other.values);
    let worst = pairs.map(|(a, b)| ((a - b) / a).abs()).fold(0.0, f64::max);
    let missing = other.values.iter().filter(|value| value.is_nan()).count();
    if missing > 0 { format!("{worst:.0e}, {missing} NaN") } else { format!("{worst:.0e}") }
}

/// Compiles the C++ contender; an explanation when that is not possible.
fn boost(folder: &Path) -> std::result::Result<PathBuf, String> {
    let source = Path::new(env!("CARGO_MANIFEST_DIR")).join("benches/numerics/boost.cpp");
    let program = folder.join("boost_times");
    let compiled =
        Command::new("c++").args(["-O2", "-std=c++17", "-o"]).arg(&program).arg(source).output();
    match compiled {
        Ok(output) if output.status.success() => Ok(program),
        Ok(output) => Err(format!("Boost.Math does not compile: {}", first_line(&output.stderr))),
        Err(error) => Err(format!("no C++ compiler: {error}")),
    }
}

/// Whether the script can run at all.
fn scipy() -> std::result::Result<PathBuf, String> {
    let script = Path::new(env!("CARGO_MANIFEST_DIR")).join("benches/numerics/scipy_times.py");
    match Command::new("python3").args(["-c", "import scipy"]).output() {
        Ok(output) if output.status.success() => Ok(script),
        Ok(_) => Err("scipy is not installed".into()),
        Err(error) => Err(format!("no python3: {error}")),
    }
}

fn first_line(text: &[u8]) -> String {
    String::from_utf8_lossy(text).lines().next().unwrap_or_default().to_owned()
}

fn main() -> std::result::Result<(), Box<dyn std::error::Error>> {
    let folder = Path::new(env!("CARGO_TARGET_TMPDIR")).join("numerics");
    std::fs::create_dir_all(&folder)?;
    let (boost, scipy) = (boost(&folder), scipy());
    for reason in [boost.as_ref().err(), scipy.as_ref().err()].into_iter().flatten() {
        println!("skipped: {reason}");
    }
    println!(
        "function                    own ns   boost ns (ratio, difference)   scipy ns (ratio, difference)"
    );
    for contest in contests() {
        let mut table = String::new();
        for input in &contest.inputs {
            let fields: Vec<String> = input.iter().map(f64::to_string).collect();
            writeln!(table, "{}", fields.join(","))?;
        }
        let path = folder.join(format!("{}.csv", contest.name));
        std::fs::write(&path, table)?;
        let own = own(&contest)?;
        let mut line = format!("{:26} {:7.0}", contest.name, own.nanoseconds);
        let others = [
            boost.as_ref().ok().and_then(|p| run(&mut Command::new(p), &contest, &path)),
            scipy.as_ref().ok().and_then(|p| run(Command::new("python3").arg(p), &contest, &path)),
        ];
        for other in others {
            match other {
                Some(other) => {
                    let ratio = other.nanoseconds / own.nanoseconds;
                    let apart = difference(&own, &other);
                    write!(line, "   {:8.0} ({ratio:5.2}, {apart})", other.nanoseconds)?;
                }
                None => line.push_str("          -"),
            }
        }
        println!("{line}");
    }
    Ok(())
}
