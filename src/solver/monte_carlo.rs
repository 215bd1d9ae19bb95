//! The independent check: the very analysis run on simulated raw data.
//!
//! Studies are simulated in chunks, each from a stream of its own, so the result does not depend on the number of
//! threads. The streams derive from the hash of the spec.

use rayon::prelude::*;
use sha2::{Digest, Sha256};

use super::error::SolverError;
use crate::designs::{Problem, Trial};
use crate::numerics::random::Stream;
use crate::plan::{Check, CheckOutcome, Estimate, Exact};

/// Studies simulated from one stream.
const CHUNK: u64 = 500;

/// Most random values that a check may draw; larger studies are simulated fewer times.
const BUDGET: u64 = 400_000_000;

/// Fewest studies that make a check worth printing.
const FEWEST: u64 = 1_000;

/// Hears how many simulated studies are finished.
pub trait Progress: Sync {
    /// A check of so many studies begins.
    fn begin(&self, total: u64);
    /// So many more are finished.
    fn advance(&self, finished: u64);
    /// The check is over.
    fn end(&self);
}

/// A progress that nobody sees.
#[derive(Debug, Clone, Copy)]
pub struct Silent;

impl Progress for Silent {
    fn begin(&self, _total: u64) {}
    fn advance(&self, _finished: u64) {}
    fn end(&self) {}
}

/// The seed of an experiment's check: SHA-256 of the spec's hash, a line feed and the experiment's id.
pub fn seed_from(spec_sha256: &str, id: &str) -> [u8; 32] {
    Sha256::digest(format!("{spec_sha256}\n{id}")).into()
}

/// Rejections counted over simulated studies.
#[derive(Debug, Clone, Copy, Default)]
struct Tally {
    weakest: u64,
    any: u64,
    all: u64,
    false_alarm: u64,
}

impl Tally {
    fn plus(self, other: Self) -> Self {
        Self {
            weakest: self.weakest + other.weakest,
            any: self.any + other.any,
            all: self.all + other.all,
            false_alarm: self.false_alarm + other.false_alarm,
        }
    }
}

/// Runs the check, or says why there is none.
pub(super) fn check(
    problem: &dyn Problem,
    exact: &Exact,
    replicates: u64,
    seed: [u8; 32],
    progress: &dyn Progress,
) -> Result<CheckOutcome, SolverError> {
    if replicates == 0 {
        return Ok(CheckOutcome::SwitchedOff);
    }
    let asked = replicates;
    let replicates = asked.min(BUDGET / exact.sizes.total.max(1));
    if replicates < FEWEST {
        return Ok(CheckOutcome::TooLarge);
    }
    let trial = problem.trial(&exact.sizes, problem.planned())?;
    progress.begin(replicates);
    let tally = simulate(trial.as_ref(), replicates, seed, progress);
    progress.end();
    let estimate = |count: u64| {
        let value = count as f64 / replicates as f64;
        let standard_error = (value * (1.0 - value) / replicates as f64).sqrt();
        Estimate { value, standard_error }
    };
    let power = estimate(tally.weakest);
    let expected_error = (exact.power * (1.0 - exact.power) / replicates as f64).sqrt();
    let distance =
        if expected_error > 0.0 { (power.value - exact.power) / expected_error } else { 0.0 };
    Ok(CheckOutcome::Run(Check {
        replicates,
        asked,
        seed: seed.iter().map(|byte| format!("{byte:02x}")).collect(),
        power,
        any: estimate(tally.any),
        all: estimate(tally.all),
        differing: trial.differing().iter().filter(|d| **d).count() as u64,
        false_alarm: estimate(tally.false_alarm),
        distance,
    }))
}

fn simulate(trial: &dyn Trial, replicates: u64, seed: [u8; 32], progress: &dyn Progress) -> Tally {
    let chunks = replicates.div_ceil(CHUNK);
    let differing = trial.differing();
    (0..chunks)
        .into_par_iter()
        .map_init(
            || {
                let fresh = vec![false; trial.comparisons()];
                (Vec::new(), fresh.clone(), fresh)
            },
            |(scratch, planned, null), chunk| {
                let mut stream = Stream::new(seed, "independent check", chunk);
                let studies = CHUNK.min(replicates - chunk * CHUNK);
                let mut tally = Tally::default();
                for _ in 0..studies {
                    trial.run(&mut stream, scratch, planned, null);
                    let mut hits =
                        planned.iter().zip(&differing).filter(|(_, d)| **d).map(|(p, _)| *p);
                    tally.all += u64::from(hits.clone().all(|hit| hit));
                    tally.any += u64::from(hits.any(|hit| hit));
                    tally.weakest +=
                        u64::from(planned.get(trial.weakest()).is_some_and(|hit| *hit));
                    tally.false_alarm += u64::from(null.iter().any(|hit| *hit));
                }
                progress.advance(studies);
                tally
            },
        )
        .reduce(Tally::default, Tally::plus)
}
