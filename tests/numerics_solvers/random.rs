//! Every stream is fixed by its seed, so these tests either always pass or always fail. The limits are those that a
//! right generator would break once in a million seeds.

use sufficit::numerics::discrete::{Binomial, Poisson};
use sufficit::numerics::random::Stream;
use sufficit::numerics::{ChiSquared, Continuous, normal_cdf};

/// Chi-squared statistic of counts against expected counts, with its upper tail probability.
fn goodness_of_fit(counts: &[u64], probabilities: &[f64]) -> f64 {
    let total: u64 = counts.iter().sum();
    let mut statistic = 0.0;
    for (&count, probability) in counts.iter().zip(probabilities) {
        let expected = probability * total as f64;
        assert!(expected > 8.0, "cells must be well filled, not {expected}");
        statistic += (count as f64 - expected) * (count as f64 - expected) / expected;
    }
    let df = probabilities.len() as f64 - 1.0;
    ChiSquared::new(df).and_then(|chi| chi.sf(statistic)).expect("a probability")
}

/// Fills bins between the cut points and judges them by the distribution function.
fn judge(
    draws: usize,
    cuts: &[f64],
    cdf: impl Fn(f64) -> f64,
    mut draw: impl FnMut() -> f64,
) -> f64 {
    let mut counts = vec![0u64; cuts.len() + 1];
    for _ in 0..draws {
        let x = draw();
        counts[cuts.partition_point(|&cut| cut < x)] += 1;
    }
    let mut probabilities: Vec<f64> = cuts.iter().map(|&cut| cdf(cut)).collect();
    probabilities.push(1.0);
    for i in (1..probabilities.len()).rev() {
        probabilities[i] -= probabilities[i - 1];
    }
    goodness_of_fit(&counts, &probabilities)
}

const ONE_IN_A_MILLION: f64 = 1e-6;

fn stream(purpose: &str) -> Stream {
    Stream::new([42; 32], purpose, 0)
}

#[test]
fn normal_values_follow_the_normal_distribution() {
    let mut stream = stream("normal");
    let cuts: Vec<f64> = (-40..=40).map(|i| f64::from(i) * 0.1).collect();
    let p = judge(4_000_000, &cuts, normal_cdf, || stream.normal());
    assert!(p > ONE_IN_A_MILLION, "p = {p:e}");
}

#[test]
fn the_tail_beyond_the_ziggurat_is_normal_too() {
    let mut stream = stream("tail");
    let beyond = 3.654_152_885_361_009;
    let scale = 1.0 / (2.0 * sufficit::numerics::normal_sf(beyond));
    let mut values = vec![0.0; 1 << 16];
    let mut counts = [0u64; 6];
    let cuts = [3.7, 3.8, 3.9, 4.05, 4.3];
    for _ in 0..250 {
        stream.fill_normal(&mut values);
        for x in values.iter().map(|x: &f64| x.abs()).filter(|&x| x > beyond) {
            counts[cuts.partition_point(|&cut| cut < x)] += 1;
        }
    }
    let mut probabilities: Vec<f64> =
        cuts.iter().map(|&cut| 1.0 - scale * 2.0 * sufficit::numerics::normal_sf(cut)).collect();
    probabilities.push(1.0);
    for i in (1..probabilities.len()).rev() {
        probabilities[i] -= probabilities[i - 1];
    }
    let p = goodness_of_fit(&counts, &probabilities);
    assert!(p > ONE_IN_A_MILLION, "p = {p:e}, {counts:?}");
    // The share of values out there: 2.58e-4, its standard error here 4e-6.
    let total: u64 = counts.iter().sum();
    let share = total as f64 / (250.0 * 65_536.0);
    let expected = 1.0 / scale;
    assert!((share - expected).abs() < 4.9 * (expected / (250.0 * 65_536.0)).sqrt());
}

#[test]
fn neighbouring_normal_values_are_uncorrelated() {
    let mut stream = stream("pairs");
    let n = 1_000_000;
    let (mut products, mut squares) = (0.0, 0.0);
    let mut last = stream.normal();
    for _ in 0..n {
        let x = stream.normal();
        products += x * last;
        squares += (x * x - 1.0) * (last * last - 1.0);
        last = x;
    }
    // Standard errors sqrt(n) and 2 sqrt(n).
    let n = f64::from(n).sqrt();
    assert!((products / n).abs() < 4.9, "{}", products / n);
    assert!((squares / (2.0 * n)).abs() < 4.9, "{}", squares / (2.0 * n));
}

#[test]
fn the_judge_catches_a_wrong_generator() {
    let mut stream = stream("wrong");
    let cuts: Vec<f64> = (-30..=30).map(|i| f64::from(i) * 0.1).collect();
    let wide = judge(1_000_000, &cuts, normal_cdf, || 1.01 * stream.normal());
    assert!(wide < 1e-9, "a standard deviation off by 1 % passes with p = {wide:e}");
    let shifted = judge(1_000_000, &cuts, normal_cdf, || stream.normal() + 0.02);
    assert!(shifted < 1e-9, "a mean off by 0.02 passes with p = {shifted:e}");
    let cut_off = judge(4_000_000, &[-3.7, 3.7], normal_cdf, || stream.normal().clamp(-3.69, 3.69));
    assert!(cut_off < 1e-9, "a missing tail passes with p = {cut_off:e}");
}

#[test]
fn uniform_values_are_uniform_and_never_at_the_ends() {
    let mut stream = stream("uniform");
    let cuts: Vec<f64> = (1..100).map(|i| f64::from(i) / 100.0).collect();
    let p = judge(
        2_000_000,
        &cuts,
        |x| x,
        || {
            let x = stream.uniform();
            assert!(x > 0.0 && x < 1.0);
            x
        },
    );
    assert!(p > ONE_IN_A_MILLION, "p = {p:e}");
    let mut counts = [0u64; 7];
    for _ in 0..700_000 {
        counts[stream.below(7) as usize] += 1;
    }
    let p = goodness_of_fit(&counts, &[1.0 / 7.0; 7]);
    assert!(p > ONE_IN_A_MILLION, "p = {p:e}");
    assert_eq!(stream.below(0), 0);
    assert_eq!(stream.below(1), 0);
}

#[test]
fn exponential_and_gamma_values_follow_their_distributions() {
    let mut stream = stream("gamma");
    let cuts: Vec<f64> = (1..60).map(|i| f64::from(i) * 0.1).collect();
    let p = judge(1_000_000, &cuts, |x| -libm::expm1(-x), || stream.exponential());
    assert!(p > ONE_IN_A_MILLION, "exponential: p = {p:e}");
    for df in [0.3, 1.0, 2.0, 5.5, 40.0, 1e5] {
        let chi = ChiSquared::new(df).expect("a distribution");
        let cuts: Vec<f64> =
            (1..50).map(|i| chi.quantile(f64::from(i) / 50.0).expect("a quantile")).collect();
        let p = judge(
            400_000,
            &cuts,
            |x| chi.cdf(x).expect("a tail"),
            || stream.chi_squared(df).expect("a value"),
        );
        assert!(p > ONE_IN_A_MILLION, "chi-squared {df}: p = {p:e}");
    }
    assert!(stream.gamma(0.0).is_err() && stream.chi_squared(f64::NAN).is_err());
}

/// Judges counts by cells that each hold at least a hundredth of the probability.
fn judge_counts(
    draws: usize,
    cdf: impl Fn(u64) -> f64,
    highest: u64,
    mut draw: impl FnMut() -> u64,
) -> f64 {
    let (mut cuts, mut last, mut k) = (Vec::new(), 0.0, 0);
    while k < highest && cdf(k) < 0.985 {
        if cdf(k) - last > 0.01 {
            cuts.push(k as f64);
            last = cdf(k);
        }
        k += 1;
    }
    judge(draws, &cuts, |x| cdf(x as u64), || draw() as f64)
}

#[test]
fn counts_follow_the_binomial_and_poisson_distributions() {
    let mut stream = stream("counts");
    for (n, p) in [(5, 0.3), (40, 0.2), (40, 0.85), (60, 0.5), (1000, 0.013), (100_000, 0.4)] {
        let distribution = Binomial::new(n, p).expect("a distribution");
        let fit = judge_counts(
            400_000,
            |k| distribution.cdf(k),
            n,
            || stream.binomial(n, p).expect("a count"),
        );
        assert!(fit > ONE_IN_A_MILLION, "binomial {n}, {p}: p = {fit:e}");
    }
    for mean in [0.7, 6.0, 10.0, 25.5, 4000.0] {
        let distribution = Poisson::new(mean).expect("a distribution");
        let fit = judge_counts(
            400_000,
            |k| distribution.cdf(k),
            u64::MAX,
            || stream.poisson(mean).expect("a count"),
        );
        assert!(fit > ONE_IN_A_MILLION, "Poisson {mean}: p = {fit:e}");
    }
    for (n, p, sure) in [(0, 0.5, 0), (9, 0.0, 0), (9, 1.0, 9)] {
        assert_eq!(stream.binomial(n, p), Ok(sure));
    }
    assert_eq!(stream.poisson(0.0), Ok(0));
    assert!(stream.binomial(3, 1.5).is_err() && stream.poisson(-1.0).is_err());
    // Far out the mean is all that can be told, to its standard error.
    let huge = stream.binomial(1 << 52, 0.25).expect("a count") as f64;
    assert!((huge - 2f64.powf(50.0)).abs() < 6.0 * 2f64.powf(25.0));
    let huge = stream.poisson(1e15).expect("a count") as f64;
    assert!((huge - 1e15).abs() < 6.0 * 1e15f64.sqrt());
}

#[test]
fn streams_are_fixed_by_seed_purpose_and_chunk_alone() {
    let first = |seed: u8, purpose: &str, chunk| {
        let mut stream = Stream::new([seed; 32], purpose, chunk);
        [stream.bits(), stream.bits(), stream.bits()]
    };
    let mut seen = std::collections::BTreeSet::new();
    let purposes = [
        "",
        "a",
        "b",
        "ab",
        "a long purpose of many words",
        "a long purpose of many word",
        "a\0",
        "\0",
    ];
    for seed in [0, 1] {
        for purpose in purposes {
            for chunk in [0, 1, u64::MAX] {
                let values = first(seed, purpose, chunk);
                assert_eq!(values, first(seed, purpose, chunk));
                assert!(seen.insert(values), "{seed} {purpose:?} {chunk}");
            }
        }
    }
    // Written down once: the same on any machine and in any later version.
    assert_eq!(first(7, "power of the t test", 3), PINNED_BITS);
    let mut stream = Stream::new([7; 32], "power of the t test", 3);
    let values: Vec<u64> = (0..4).map(|_| stream.normal().to_bits()).collect();
    assert_eq!(values, PINNED_NORMALS);
}

const PINNED_BITS: [u64; 3] =
    [17_037_439_015_041_534_785, 13_954_239_051_147_340_616, 7_806_553_582_414_111_331];

const PINNED_NORMALS: [u64; 4] = [
    13_822_593_989_317_744_535,
    13_830_118_858_334_225_174,
    4_609_308_116_501_168_539,
    4_608_825_393_491_047_547,
];

#[test]
fn filling_gives_the_values_of_single_calls() {
    let mut one = stream("fill");
    let mut many = one.clone();
    let mut values = vec![0.0; 10_007];
    many.fill_normal(&mut values);
    assert!(values.iter().all(|value| value.to_bits() == one.normal().to_bits()));
    assert_eq!(one.bits(), many.bits());
}

#[test]
fn threads_change_nothing() {
    use rayon::prelude::*;
    let chunk_sum = |chunk: u64| -> f64 {
        let mut stream = Stream::new([9; 32], "threads", chunk);
        (0..1000).map(|_| stream.normal()).sum()
    };
    let one_by_one: Vec<u64> = (0..64).map(|chunk| chunk_sum(chunk).to_bits()).collect();
    let together: Vec<u64> =
        (0..64u64).into_par_iter().map(|chunk| chunk_sum(chunk).to_bits()).collect();
    assert_eq!(one_by_one, together);
}
