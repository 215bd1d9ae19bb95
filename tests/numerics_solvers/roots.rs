use proptest::prelude::*;
use std::cell::Cell;
use sufficit::numerics::NumericsError;
use sufficit::numerics::roots::{Tolerance, bracket_around, find_root, find_root_within, refine};

/// What a root must prove: a change of sign inside a narrow bracket that holds the value returned.
fn check_root(
    f: impl Fn(f64) -> f64,
    root: &sufficit::numerics::roots::Root,
) -> Result<(), String> {
    let (low, high) = root.bracket;
    let (at_low, at_high) = (f(low), f(high));
    if !(low <= root.at && root.at <= high) {
        return Err(format!("{} outside {low}..{high}", root.at));
    }
    if f(root.at) != root.residual {
        return Err("the residual is not the function's value".into());
    }
    if at_low * at_high > 0.0 && root.residual != 0.0 {
        return Err(format!("no change of sign between {low} and {high}"));
    }
    if root.residual != 0.0
        && high - low > 4.0 * f64::EPSILON * root.at.abs()
        && high > low.next_up()
    {
        return Err(format!("bracket {low}..{high} is wide"));
    }
    Ok(())
}

type Case = (&'static str, fn(f64) -> f64, f64, f64, f64);

/// Functions with known roots, among them those that punish plain interpolation.
const CASES: [Case; 9] = [
    ("line", |x| x - 0.25, -3.0, 5.0, 0.25),
    ("cube", |x| x * x * x - 2.0, 0.0, 1e6, 1.259_921_049_894_873_2),
    ("exponential", |x| libm::exp(x) - 1e-5, -1e3, 1e2, -11.512_925_464_970_229),
    ("flat", |x| (x - 1.0) * (x - 1.0) * (x - 1.0), -10.0, 8.0, 1.0),
    ("step", |x| if x < 0.3 { -1.0 } else { 1.0 }, 0.0, 1.0, 0.3),
    ("tiny root", |x| x - 1e-200, -1e300, 1e300, 1e-200),
    ("pole", |x| 1.0 / (x - 0.7), 0.0, 1.0, 0.7),
    ("saturated", |x| libm::erf(x - 6.0), -50.0, 51.0, 6.0),
    ("infinite ends", |x| if x < 2.0 { f64::NEG_INFINITY } else { x - 2.5 }, 0.0, 9.0, 2.5),
];

#[test]
fn roots_of_awkward_functions_are_found_with_evidence() {
    for (name, f, low, high, expected) in CASES {
        let root = find_root(name, low, high, |x| Ok(f(x))).expect(name);
        assert_eq!(check_root(f, &root), Ok(()), "{name}");
        let error = (root.at - expected).abs();
        // A triple root is only known to the cube root of rounding.
        let allowed = if name == "flat" { 1e-5 } else { 1e-15 * expected.abs() };
        assert!(error <= allowed, "{name}: {} is off by {error:e}", root.at);
        assert!(root.evaluations <= 128, "{name}: {}", root.evaluations);
    }
}

#[test]
fn smooth_functions_cost_few_evaluations() {
    let root = find_root("cosine", 0.0, 1.5, |x| Ok(libm::cos(x) - x)).expect("a root");
    assert!((root.at - 0.739_085_133_215_160_6).abs() < 1e-15);
    assert!(root.evaluations <= 12, "{}", root.evaluations);
}

#[test]
fn the_check_of_roots_catches_wrong_ones() {
    let f = |x: f64| x - 0.25;
    let right = find_root("line", -3.0, 5.0, |x| Ok(f(x))).expect("a root");
    assert_eq!(check_root(f, &right), Ok(()));
    for wrong in [
        sufficit::numerics::roots::Root { at: 0.5, ..right },
        sufficit::numerics::roots::Root { residual: 1e-3, ..right },
        sufficit::numerics::roots::Root { at: 0.5, residual: 0.25, bracket: (0.5, 0.5), ..right },
        sufficit::numerics::roots::Root {
            at: 0.2,
            residual: 0.2 - 0.25,
            bracket: (0.2, 0.3),
            ..right
        },
    ] {
        assert!(check_root(f, &wrong).is_err(), "{wrong:?}");
    }
}

#[test]
fn failures_are_typed() {
    let no_change = find_root("parabola", -1.0, 1.0, |x| Ok(x * x + 1.0));
    assert!(matches!(no_change, Err(NumericsError::NoBracket { .. })));
    let nan = find_root("hole", -1.0, 1.0, |x| Ok(if x.abs() < 0.5 { f64::NAN } else { x }));
    assert!(matches!(nan, Err(NumericsError::OutOfDomain { name: "function value", .. })));
    let endless = find_root("infinite", f64::NEG_INFINITY, 1.0, Ok);
    assert!(matches!(endless, Err(NumericsError::OutOfDomain { name: "low", .. })));
    let few = Tolerance { max_evaluations: 4, ..Tolerance::default() };
    let starved = find_root_within("cube", 0.0, 1e6, few, |x| Ok(x * x * x - 2.0));
    assert!(matches!(starved, Err(NumericsError::NoConvergence { evaluations: 4, .. })));
    let own = NumericsError::TargetOutOfReach { largest: 3, best: 0.5 };
    let passed_on = find_root("failing", 0.0, 1.0, |_| Err(own.clone()));
    assert_eq!(passed_on, Err(own));
}

#[test]
fn brackets_grow_towards_the_change_of_sign() {
    let count = Cell::new(0);
    let f = |x: f64| {
        count.set(count.get() + 1);
        Ok(x - 1000.0)
    };
    let bracket = bracket_around("line", 1.0, 0.5, (0.0, 1e9), f).expect("a bracket");
    assert!(bracket.low <= 1000.0 && bracket.high >= 1000.0);
    assert_eq!(bracket.evaluations, count.get());
    assert!(count.get() < 20);
    let root = refine("line", bracket, Tolerance::default(), f).expect("a root");
    assert_eq!(root.at, 1000.0);
    assert_eq!(root.evaluations, count.get());

    let none = bracket_around("positive", 1.0, 0.5, (0.0, 10.0), |x| Ok(x + 1.0));
    assert_eq!(none, Err(NumericsError::NoBracket { what: "positive", low: 0.0, high: 10.0 }));
    assert!(bracket_around("outside", 11.0, 0.5, (0.0, 10.0), Ok).is_err());
    assert!(bracket_around("step", 1.0, 0.0, (0.0, 10.0), Ok).is_err());
}

proptest! {
    #[test]
    fn any_monotone_change_of_sign_is_found(
        at in prop::num::f64::NORMAL,
        power in 1u32..8,
        scale in -200f64..200.0,
        ends in (prop::num::f64::NORMAL, prop::num::f64::NORMAL),
    ) {
        let (low, high) = (ends.0.min(ends.1).min(at), ends.0.max(ends.1).max(at));
        let factor = libm::exp(scale);
        let f = |x: f64| {
            let gap = 0.5 * x - 0.5 * at;
            gap.signum() * (factor * libm::pow(gap.abs(), f64::from(power))).max(f64::MIN_POSITIVE)
                * if gap == 0.0 { 0.0 } else { 1.0 }
        };
        let root = find_root("power", low, high, |x| Ok(f(x)));
        let root = root.expect("a root between two signs");
        prop_assert!(root.evaluations <= 128);
        let (from, to) = root.bracket;
        prop_assert!(from <= at.next_up() && to >= at.next_down(), "{root:?} for {at:e}");
    }

    #[test]
    fn every_pair_of_finite_ends_ends(low in prop::num::f64::ANY, high in prop::num::f64::ANY) {
        // Whatever comes in, an answer or a typed error comes out.
        let _ = find_root("identity", low, high, Ok);
        let _ = bracket_around("identity", low, high, (-1.0, 1.0), Ok);
    }
}
