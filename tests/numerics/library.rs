//! What `src/numerics/mod.rs` says of `statrs`: which of its central functions reach 1e-12, counted on the same tables.

use statrs::distribution::{Beta, ChiSquared, ContinuousCDF, FisherSnedecor, Normal, StudentsT};

/// The accuracy that this crate's own functions are held to.
const WANTED: f64 = 1e-12;

/// Values of the library for one function, some possibly a panic, beside what they ought to be.
#[derive(Default)]
struct Tally {
    rows: usize,
    worse: usize,
}

impl Tally {
    fn add(&mut self, compute: impl FnOnce() -> f64 + std::panic::UnwindSafe, expected: f64) {
        let value = std::panic::catch_unwind(compute).unwrap_or(f64::NAN);
        self.rows += 1;
        // Negated, so that not a number counts as wrong.
        if !(value == expected || ((value - expected) / expected).abs() <= WANTED) {
            self.worse += 1;
        }
    }

    fn counts(&self) -> (usize, usize) {
        (self.worse, self.rows)
    }
}

fn number(text: &str) -> f64 {
    text.parse().expect("a number in a table")
}

fn tail(d: &impl ContinuousCDF<f64, f64>, upper: bool, x: f64) -> f64 {
    if upper { d.sf(x) } else { d.cdf(x) }
}

fn library_tail(family: &str, upper: bool, a: &[f64]) -> f64 {
    let x = a[a.len() - 1];
    match family {
        "t" => tail(&StudentsT::new(0.0, 1.0, a[0]).expect("legal"), upper, x),
        "chi2" => tail(&ChiSquared::new(a[0]).expect("legal"), upper, x),
        "f" => tail(&FisherSnedecor::new(a[0], a[1]).expect("legal"), upper, x),
        _ => tail(&Beta::new(a[0], a[1]).expect("legal"), upper, x),
    }
}

#[test]
fn central_tails_fall_short() {
    let text = include_str!("../reference/central_tails.tsv");
    let counts = ["t", "chi2", "f", "beta"].map(|family| {
        let mut tally = Tally::default();
        for line in text.lines().filter(|line| !line.starts_with('#')).skip(1) {
            let fields: Vec<&str> = line.split('\t').collect();
            let (name, side) = fields[0].rsplit_once('_').expect("a function and its tail");
            if name == family {
                let arguments: Vec<f64> = fields[1].split(',').map(number).collect();
                tally.add(|| library_tail(family, side == "sf", &arguments), number(fields[2]));
            }
        }
        tally.counts()
    });
    assert_eq!(counts, [(7, 22), (10, 23), (123, 229), (65, 142)]);
}

#[test]
fn only_the_normal_quantile_is_accurate() {
    let text = include_str!("../reference/quantiles.csv");
    let counts = ["normal", "t", "chi2"].map(|family| {
        let mut tally = Tally::default();
        for line in text.lines().skip(1) {
            let fields: Vec<&str> = line.split(',').collect();
            let p = number(fields[4]);
            if fields[0] != family || fields[3] != "lower" || p < 1e-20 {
                continue;
            }
            let df = fields[1].parse().unwrap_or(f64::NAN);
            let compute = || match family {
                "normal" => Normal::standard().inverse_cdf(p),
                "t" => StudentsT::new(0.0, 1.0, df).expect("legal").inverse_cdf(p),
                _ => ChiSquared::new(df).expect("legal").inverse_cdf(p),
            };
            tally.add(compute, number(fields[5]));
        }
        tally.counts()
    });
    let [normal, others @ ..] = counts;
    assert_eq!(normal.0, 0, "of {} rows", normal.1);
    assert_eq!(others, [(14, 58), (13, 47)]);
}
