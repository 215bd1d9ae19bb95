//! What every distribution has to satisfy, over its whole domain and at random.

use proptest::prelude::*;
use sufficit::numerics::{
    Beta, ChiSquared, Continuous, FisherF, NoncentralBeta, NoncentralChiSquared, NoncentralF,
    NoncentralT, Normal, Result, StudentT,
};

/// Degrees of freedom and shapes from 0.5 to 1e12, evenly in the logarithm, with the edges.
fn degrees() -> impl Strategy<Value = f64> {
    prop_oneof![
        6 => (-0.3..12.0_f64).prop_map(|e| 10.0_f64.powf(e)),
        2 => (1..200_u32).prop_map(f64::from),
        1 => Just(1.0),
        1 => Just(1e12),
    ]
}

/// Noncentralities from 0 to 1e6.
fn noncentrality() -> impl Strategy<Value = f64> {
    prop_oneof![
        6 => (-9.0..6.0_f64).prop_map(|e| 10.0_f64.powf(e)),
        1 => Just(0.0),
        1 => Just(1e6),
    ]
}

/// Any finite number, with the edges.
fn point() -> impl Strategy<Value = f64> {
    let size = prop_oneof![
        3 => (-300.0..300.0_f64).prop_map(|e| 10.0_f64.powf(e)),
        6 => (-3.0..7.0_f64).prop_map(|e| 10.0_f64.powf(e)),
        1 => Just(0.0),
        1 => Just(1e300),
    ];
    (size, any::<bool>()).prop_map(|(x, negative)| if negative { -x } else { x })
}

/// Probabilities of either side, small and large.
fn probability() -> impl Strategy<Value = f64> {
    prop_oneof![0.0..1.0_f64, (-300.0..0.0_f64).prop_map(|e| 10.0_f64.powf(e))]
}

/// One of the nine families with its parameters.
#[derive(Clone, Copy, Debug)]
struct Family {
    which: u8,
    first: f64,
    second: f64,
    ncp: f64,
}

impl Family {
    fn build(self) -> Box<dyn Continuous> {
        build(self.which, self.first, self.second, self.ncp).expect("legal parameters")
    }
}

fn family() -> impl Strategy<Value = Family> {
    (0..9_u8, degrees(), degrees(), noncentrality(), any::<bool>()).prop_map(
        |(which, first, second, ncp, negative)| Family {
            which,
            first,
            second,
            ncp: if negative { -ncp } else { ncp },
        },
    )
}

fn build(family: u8, first: f64, second: f64, ncp: f64) -> Result<Box<dyn Continuous>> {
    let size = ncp.abs();
    Ok(match family {
        0 => Box::new(Normal),
        1 => Box::new(StudentT::new(first)?),
        2 => Box::new(ChiSquared::new(first)?),
        3 => Box::new(FisherF::new(first, second)?),
        4 => Box::new(Beta::new(first, second)?),
        5 => Box::new(NoncentralT::new(first, ncp)?),
        6 => Box::new(NoncentralChiSquared::new(first, size)?),
        7 => Box::new(NoncentralF::new(first, second, size)?),
        _ => Box::new(NoncentralBeta::new(first, second, size)?),
    })
}

/// The checks at one point; a description of the first that fails.
fn check_at(d: &dyn Continuous, x: f64) -> std::result::Result<(), String> {
    let text = |what: &str| Err(format!("{what} at {x:e}"));
    let all = || -> Result<[f64; 6]> {
        Ok([d.cdf(x)?, d.sf(x)?, d.ln_cdf(x)?, d.ln_sf(x)?, d.density(x)?, d.ln_density(x)?])
    };
    let values = all().map_err(|error| error.to_string())?;
    let [cdf, sf, ln_cdf, ln_sf, density, ln_density] = values;
    if values.iter().any(|value| value.is_nan()) {
        return text("not a number");
    }
    if !(0.0..=1.0).contains(&cdf) || !(0.0..=1.0).contains(&sf) || density < 0.0 {
        return text("not a probability");
    }
    if (cdf + sf - 1.0).abs() > 4e-16 {
        return text("tails do not add up to one");
    }
    for (plain, ln) in [(cdf, ln_cdf), (sf, ln_sf), (density, ln_density)] {
        // The exponential turns an error of the logarithm's last digit into one of `|ln|` last digits; terms of size
        // 100 may have cancelled in the logarithm.
        let allowed = 1e-15 * (100.0 + ln.abs());
        if plain > 1e-290 && plain < 1e290 && (libm::exp(ln) / plain - 1.0).abs() > allowed {
            return text("logarithm and value disagree");
        }
    }
    Ok(())
}

/// Tails at two ordered points: monotone up to rounding.
fn check_order(d: &dyn Continuous, x: f64, y: f64) -> std::result::Result<(), String> {
    let (low, high) = if x <= y { (x, y) } else { (y, x) };
    let tails = || -> Result<[f64; 4]> { Ok([d.cdf(low)?, d.cdf(high)?, d.sf(low)?, d.sf(high)?]) };
    let [a, b, c, e] = tails().map_err(|error| error.to_string())?;
    if a > b * (1.0 + ROUNDING) || e > c * (1.0 + ROUNDING) {
        return Err(format!("not monotone between {low:e} and {high:e}: {a:e} {b:e} {c:e} {e:e}"));
    }
    Ok(())
}

/// Noise of two evaluations against each other: twice the accuracy of the tables.
const ROUNDING: f64 = 2e-12;

/// The quantile of `p` has the tail `p` again, up to one unit in the last place of the quantile.
fn check_round_trip(d: &dyn Continuous, p: f64, upper: bool) -> std::result::Result<(), String> {
    let there_and_back = || -> Result<(f64, f64, f64)> {
        let x = if upper { d.upper_quantile(p)? } else { d.quantile(p)? };
        let back = if upper { d.sf(x)? } else { d.cdf(x)? };
        Ok((x, back, d.density(x)?))
    };
    let (x, back, density) = there_and_back().map_err(|error| error.to_string())?;
    if x.is_nan() {
        return Err("quantile is not a number".into());
    }
    // Beyond the range of f64, and where neighbouring doubles are further apart than the answer, there is no trip back.
    if x.abs() < 1e-300 || x.abs() > 1e300 || x >= 1.0 - 1e-12 && d.sf(1.0) == Ok(0.0) {
        return Ok(());
    }
    let own_rounding = 2.3e-16 * (x * density).abs() / p;
    if (back / p - 1.0).abs() > 1e-12 + 2.0 * own_rounding {
        return Err(format!("{p:e} -> {x:e} -> {back:e}"));
    }
    Ok(())
}

/// The density is the slope of the distribution function, to the accuracy of a central difference.
fn check_slope(d: &dyn Continuous, x: f64) -> std::result::Result<(), String> {
    let slope = || -> Result<(f64, f64, f64)> {
        let (lower, h) = (d.cdf(x)? < 0.5, 1e-5 * x.abs());
        let (a, b) = (x - h, x + h);
        let rise = if lower { d.cdf(b)? - d.cdf(a)? } else { d.sf(a)? - d.sf(b)? };
        Ok((rise / (2.0 * h), d.density(x)?, d.cdf(x)?.min(d.sf(x)?)))
    };
    let (difference, density, tail) = slope().map_err(|error| error.to_string())?;
    // Where the tail changes by less than a thousandth or more than a third over x/10, differences say nothing.
    let change = density * x.abs() / tail;
    if !(1e-3..30.0).contains(&change) || tail < 1e-250 {
        return Ok(());
    }
    if (difference / density - 1.0).abs() > 1e-5 {
        return Err(format!("slope {difference:e}, density {density:e} at {x:e}"));
    }
    Ok(())
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(2000))]

    #[test]
    fn values_are_consistent(family in family(), x in point()) {
        prop_assert_eq!(check_at(family.build().as_ref(), x), Ok(()));
    }

    #[test]
    fn values_are_consistent_in_the_bulk(family in family(), p in probability()) {
        let x = family.build().quantile(p).expect("a quantile");
        prop_assert_eq!(check_at(family.build().as_ref(), x), Ok(()));
    }

    #[test]
    fn tails_are_monotone(family in family(), p in probability(), q in probability()) {
        let d = family.build();
        let (x, y) = (d.quantile(p).expect("a quantile"), d.upper_quantile(q).expect("a quantile"));
        prop_assert_eq!(check_order(family.build().as_ref(), x, y), Ok(()));
        prop_assert_eq!(check_order(family.build().as_ref(), x, x * (1.0 + 1e-9)), Ok(()));
    }

    #[test]
    fn quantiles_invert(family in family(), p in probability(), upper in any::<bool>()) {
        prop_assert_eq!(check_round_trip(family.build().as_ref(), p, upper), Ok(()));
    }

    #[test]
    fn densities_are_slopes(family in family(), p in 0.001..0.999_f64) {
        let x = family.build().quantile(p).expect("a quantile");
        prop_assert_eq!(check_slope(family.build().as_ref(), x), Ok(()));
    }

    #[test]
    fn tails_are_monotone_in_the_noncentrality(
        family in 5..9_u8, first in degrees(), second in degrees(),
        ncp in noncentrality(), more in 1e-9..1.0_f64, p in probability(),
    ) {
        let near = build(family, first, second, ncp).expect("legal parameters");
        let far = build(family, first, second, ncp * (1.0 + more)).expect("legal parameters");
        let x = near.quantile(p).expect("a quantile");
        let (a, b) = (near.sf(x).expect("a tail"), far.sf(x).expect("a tail"));
        prop_assert!(a <= b * (1.0 + ROUNDING), "{} {} {} {} at {}: {} {}", family, first, second, ncp, x, a, b);
        let (a, b) = (near.cdf(x).expect("a tail"), far.cdf(x).expect("a tail"));
        prop_assert!(b <= a * (1.0 + ROUNDING), "{} {} {} {} at {}: {} {}", family, first, second, ncp, x, a, b);
    }
}

/// A normal distribution with deliberate faults, to show that the checks above can fail.
struct Faulty {
    tail: f64,
    density: f64,
    shift: f64,
}

impl Continuous for Faulty {
    fn ln_density(&self, x: f64) -> Result<f64> {
        Ok(Normal.ln_density(x)? + libm::log(self.density))
    }
    fn cdf(&self, x: f64) -> Result<f64> {
        Ok(Normal.cdf(x)? * self.tail)
    }
    fn sf(&self, x: f64) -> Result<f64> {
        Normal.sf(x)
    }
    fn ln_cdf(&self, x: f64) -> Result<f64> {
        Normal.ln_cdf(x)
    }
    fn ln_sf(&self, x: f64) -> Result<f64> {
        Normal.ln_sf(x)
    }
    fn quantile(&self, p: f64) -> Result<f64> {
        Ok(Normal.quantile(p)? + self.shift)
    }
    fn upper_quantile(&self, p: f64) -> Result<f64> {
        Ok(Normal.upper_quantile(p)? + self.shift)
    }
}

#[test]
fn the_checks_can_fail() {
    let sound = Faulty { tail: 1.0, density: 1.0, shift: 0.0 };
    assert_eq!(check_at(&sound, 1.0), Ok(()));
    assert_eq!(check_slope(&sound, 1.0), Ok(()));
    assert_eq!(check_round_trip(&sound, 0.01, true), Ok(()));

    let wrong_tail = Faulty { tail: 1.0 + 1e-14, ..sound };
    assert!(check_at(&wrong_tail, 1.0).is_err());
    assert!(check_order(&Falling, 1.0, 1.1).is_err());
    let doubled_density = Faulty { tail: 1.0, density: 2.0, shift: 0.0 };
    assert!(check_slope(&doubled_density, 1.0).is_err());
    let slightly_wrong_density = Faulty { tail: 1.0, density: 1.0001, shift: 0.0 };
    assert!(check_slope(&slightly_wrong_density, 1.0).is_err());
    let shifted_quantile = Faulty { tail: 1.0, density: 1.0, shift: 1e-12 };
    assert!(check_round_trip(&shifted_quantile, 0.01, true).is_err());
}

/// A distribution function that falls.
struct Falling;

impl Continuous for Falling {
    fn ln_density(&self, x: f64) -> Result<f64> {
        Normal.ln_density(x)
    }
    fn cdf(&self, x: f64) -> Result<f64> {
        Normal.sf(x)
    }
    fn sf(&self, x: f64) -> Result<f64> {
        Normal.cdf(x)
    }
    fn ln_cdf(&self, x: f64) -> Result<f64> {
        Normal.ln_sf(x)
    }
    fn ln_sf(&self, x: f64) -> Result<f64> {
        Normal.ln_cdf(x)
    }
    fn quantile(&self, p: f64) -> Result<f64> {
        Normal.quantile(p)
    }
    fn upper_quantile(&self, p: f64) -> Result<f64> {
        Normal.upper_quantile(p)
    }
}
