//! Times the simulation, the enumeration and the multivariate quantiles, and prints ratios and limits.
//!
//! `cargo bench --bench solvers`

use rayon::prelude::*;
use std::hint::black_box;
use std::path::Path;
use std::process::Command;
use std::time::Instant;
use sufficit::numerics::discrete::{Alternative, ProportionTest, TwoBinomialRegion};
use sufficit::numerics::integer_search::first_reaching;
use sufficit::numerics::multivariate::{Dunnett, Sides, StudentizedRange};
use sufficit::numerics::random::Stream;
use sufficit::numerics::{Continuous, NoncentralT, Result};

/// Seconds of the fastest of three runs.
fn seconds(mut run: impl FnMut()) -> f64 {
    let time = |run: &mut dyn FnMut()| {
        let start = Instant::now();
        run();
        start.elapsed().as_secs_f64()
    };
    (0..3).map(|_| time(&mut run)).fold(f64::INFINITY, f64::min)
}

const TESTS: u64 = 1_000_000;
const GROUP: usize = 12;
const CHUNK: u64 = 1000;
const SHIFT: f64 = 0.9;
/// Upper 2.5 % point of t with 22 degrees of freedom.
const CRITICAL: f64 = 2.073_873_067_904_015;

/// Share of rejections among simulated two-sample t tests on raw values.
fn simulated_power() -> f64 {
    let rejections: u64 = (0..TESTS / CHUNK)
        .into_par_iter()
        .map(|chunk| {
            let mut stream = Stream::new([1; 32], "benchmark of the t test", chunk);
            let mut values = [0.0; 2 * GROUP];
            let mut rejections = 0;
            for _ in 0..CHUNK {
                stream.fill_normal(&mut values);
                let (first, second) = values.split_at(GROUP);
                rejections += u64::from(t_statistic(first, second).abs() >= CRITICAL);
            }
            rejections
        })
        .sum();
    rejections as f64 / TESTS as f64
}

fn t_statistic(first: &[f64], second: &[f64]) -> f64 {
    let n = GROUP as f64;
    let mean = |values: &[f64]| values.iter().sum::<f64>() / n;
    let (m1, m2) = (mean(first), mean(second));
    let squares =
        |values: &[f64], mean: f64| -> f64 { values.iter().map(|x| (x - mean) * (x - mean)).sum() };
    let variance = (squares(first, m1) + squares(second, m2)) / (2.0 * n - 2.0);
    (m1 + SHIFT - m2) / (variance * 2.0 / n).sqrt()
}

/// The same by numpy and scipy: seconds and share of rejections of each way, where they are to be had.
fn vectorised_seconds() -> Vec<(f64, f64)> {
    let script = Path::new(env!("CARGO_MANIFEST_DIR")).join("benches/solvers/two_sample_t.py");
    let Ok(output) = Command::new("python3").arg(script).output() else {
        return Vec::new();
    };
    String::from_utf8_lossy(&output.stdout)
        .lines()
        .filter_map(|line| {
            let (seconds, share) = line.split_once(' ')?;
            Some((seconds.parse().ok()?, share.parse().ok()?))
        })
        .collect()
}

fn simulation() -> Result<()> {
    let mut share = 0.0;
    let ours = seconds(|| share = black_box(simulated_power()));
    let exact = NoncentralT::new(22.0, SHIFT * (GROUP as f64 / 2.0).sqrt())?.sf(CRITICAL)?;
    println!(
        "10^6 simulated t tests on 2 x 12 values: {ours:.3} s on {} threads",
        rayon::current_num_threads()
    );
    println!("  share of rejections {share:.4}, upper tail of the exact power {exact:.4}");
    let others = vectorised_seconds();
    if others.is_empty() {
        println!("  numpy and scipy are not to be had here: comparison skipped");
    }
    for (name, (theirs, share)) in
        ["array arithmetic of numpy", "ready-made test of scipy"].iter().zip(others)
    {
        println!("  {name}: {theirs:.3} s (share {share:.4}); ratio {:.1}", theirs / ours);
    }
    println!("  aim: ratio 10 to the 2.5 s that whole arrays take");
    let mut stream = Stream::new([1; 32], "benchmark of normal values", 0);
    let mut values = vec![0.0; 24_000];
    let fill = seconds(|| {
        for _ in 0..100 {
            stream.fill_normal(black_box(&mut values));
        }
    });
    println!("  one normal value: {:.2} ns, aim 8", fill / 2.4e6 * 1e9);
    Ok(())
}

fn enumeration() -> Result<()> {
    let power = |n: u64| {
        TwoBinomialRegion::new(ProportionTest::Fisher, n, n, 0.05, Alternative::TwoSided)?
            .power(0.3, 0.4)
    };
    let mut value = 0.0;
    let once = seconds(|| value = power(black_box(500)).unwrap_or(f64::NAN));
    println!("Fisher's test, 500 a group: power {value:.6} in {:.2} ms, limit 50", once * 1e3);
    let start = Instant::now();
    let smallest = first_reaching(2, 2000, 0.9, power)?;
    println!(
        "  first n with power 0.9: {} after {} sizes in {:.3} s, limit 2",
        smallest.n,
        smallest.evaluations,
        start.elapsed().as_secs_f64()
    );
    Ok(())
}

fn quantiles() -> Result<()> {
    for (k, df) in [(3, 10.0), (5, 40.0), (20, 200.0), (4, f64::INFINITY)] {
        let range = StudentizedRange::new(k, df)?;
        let dunnett = Dunnett::equal(k as usize, 0.5, Sides::Two, df)?;
        let range_time = seconds(|| {
            black_box(range.upper_quantile(0.05)).ok();
        });
        let dunnett_time = seconds(|| {
            black_box(dunnett.upper_quantile(0.05)).ok();
        });
        println!(
            "{k} means or comparisons, {df} df: studentised range {:.2} ms, Dunnett {:.2} ms",
            range_time * 1e3,
            dunnett_time * 1e3
        );
    }
    Ok(())
}

fn main() -> Result<()> {
    simulation()?;
    enumeration()?;
    quantiles()
}
