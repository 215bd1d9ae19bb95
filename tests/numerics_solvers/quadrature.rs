use proptest::prelude::*;
use std::f64::consts::PI;
use sufficit::numerics::NumericsError;
use sufficit::numerics::quadrature::{GaussLegendre, Goal, Integral, integrate, trapezoid};

/// An integral is right when its own error estimate, or rounding, covers the true error.
fn check_integral(integral: &Integral, exact: f64) -> Result<(), String> {
    let error = (integral.value - exact).abs();
    let covered = integral.error + 4.0 * f64::EPSILON * exact.abs();
    if error.is_nan() || error > covered {
        return Err(format!("{integral:?} against {exact}: off by {error:e}"));
    }
    Ok(())
}

type Case = (&'static str, fn(f64) -> f64, f64, f64, f64);

/// Integrals with closed forms (elementary calculus): smooth, peaked, singular at an end, oscillating, infinite.
const CASES: [Case; 12] = [
    ("polynomial", |x| x * x * x - x, -1.0, 3.0, 16.0),
    ("exponential", |x| libm::exp(x), 0.0, 1.0, std::f64::consts::E - 1.0),
    ("peak", |x| 1e-3 / (x * x + 1e-6), -1.0, 2.0, 3.140_092_653_964_793),
    ("root", |x| x.sqrt(), 0.0, 1.0, 2.0 / 3.0),
    ("inverse root", |x| 1.0 / x.sqrt(), 0.0, 1.0, 2.0),
    ("logarithm", |x| libm::log(x), 0.0, 1.0, -1.0),
    ("oscillation", |x| libm::cos(50.0 * x), 0.0, 1.0, -0.005_247_497_074_078_575),
    ("kink", |x| (x - 0.3).abs(), 0.0, 1.0, 0.29),
    (
        "normal",
        |x| libm::exp(-0.5 * x * x),
        f64::NEG_INFINITY,
        f64::INFINITY,
        2.506_628_274_631_000_5,
    ),
    ("heavy tail", |x| 1.0 / (1.0 + x * x), 0.0, f64::INFINITY, 0.5 * PI),
    ("lower half", |x| libm::exp(x), f64::NEG_INFINITY, 0.0, 1.0),
    ("zero", |_| 0.0, f64::NEG_INFINITY, f64::INFINITY, 0.0),
];

#[test]
fn error_estimates_cover_the_errors() {
    for relative in [1e-4, 1e-8, 1e-12] {
        let goal = Goal { relative, absolute: 1e-15, ..Goal::default() };
        for (name, f, low, high, exact) in CASES {
            let integral = integrate(name, low, high, goal, |x| Ok(f(x))).expect(name);
            assert_eq!(check_integral(&integral, exact), Ok(()), "{name}");
            assert!(integral.error <= 1e-15 + 1.1 * relative * exact.abs(), "{name}: {integral:?}");
            let turned = integrate(name, high, low, goal, |x| Ok(f(x))).expect(name);
            assert_eq!(turned.value, -integral.value, "{name}");
        }
    }
}

#[test]
fn the_check_catches_a_wrong_integral() {
    let right = integrate("line", 0.0, 1.0, Goal::default(), Ok).expect("an integral");
    assert_eq!(check_integral(&right, 0.5), Ok(()));
    assert!(check_integral(&right, 0.5 + 1e-13).is_err());
    assert!(check_integral(&Integral { value: f64::NAN, ..right }, 0.5).is_err());
}

#[test]
fn what_cannot_be_integrated_is_a_typed_error() {
    let goal = Goal::default();
    let nan = integrate("hole", 0.0, 1.0, goal, |_| Ok(f64::NAN));
    assert!(matches!(nan, Err(NumericsError::OutOfDomain { name: "integrand", .. })));
    let end = integrate("end", f64::NAN, 1.0, goal, Ok);
    assert!(matches!(end, Err(NumericsError::OutOfDomain { name: "low", .. })));
    let few = Goal { max_evaluations: 60, ..goal };
    let starved = integrate("peak", -1.0, 1.0, few, |x| Ok(1e-6 / (x * x + 1e-12)));
    assert!(matches!(starved, Err(NumericsError::NoConvergence { .. })));
    let unbounded = integrate("diverging", 0.0, 1.0, goal, |x| Ok(1.0 / x));
    assert!(matches!(unbounded, Err(NumericsError::NoConvergence { .. })));
    let empty = integrate("empty", 2.0, 2.0, goal, |_| Ok(f64::NAN)).expect("nothing to evaluate");
    assert_eq!((empty.value, empty.evaluations), (0.0, 0));
}

#[test]
fn gauss_legendre_is_exact_for_its_degree() {
    for count in [1, 2, 3, 5, 20, 64, 301] {
        let rule = GaussLegendre::new(count).expect("a rule");
        for power in 0..(2 * count).min(40) as i32 {
            let integral = rule.integrate(-1.0, 1.0, |x| libm::pow(x, f64::from(power)));
            let exact = if power % 2 == 0 { 2.0 / f64::from(power + 1) } else { 0.0 };
            assert!((integral - exact).abs() < 1e-13, "{count} nodes, power {power}: {integral}");
        }
        assert!(rule.nodes().windows(2).all(|pair| pair[0].0 < pair[1].0));
    }
    // Abramowitz, Stegun (1964), table 25.4, n = 5.
    let five = GaussLegendre::new(5).expect("a rule");
    assert!((five.nodes()[4].0 - 0.906_179_845_938_664).abs() < 1e-15);
    assert!((five.nodes()[4].1 - 0.236_926_885_056_189).abs() < 1e-15);
    assert!(GaussLegendre::new(0).is_err());
}

#[test]
fn the_trapezoidal_rule_reaches_rounding_on_the_line() {
    let value = trapezoid("bell", -9.0, 9.0, 20, |x| libm::exp(-0.5 * x * x)).expect("settled");
    assert!((value - 2.506_628_274_631_000_5).abs() < 1e-15);
    let jump = trapezoid("jump", 0.0, 1.0, 4, |x| if x < 0.3 { 0.0 } else { 1.0 });
    assert!(matches!(jump, Err(NumericsError::NoConvergence { .. })));
    let nan = trapezoid("hole", 0.0, 1.0, 4, |_| f64::NAN);
    assert!(matches!(nan, Err(NumericsError::NoConvergence { .. })));
}

proptest! {
    #[test]
    fn integrals_add_up(a in -5f64..5.0, b in -5f64..5.0, c in -5f64..5.0, rate in -3f64..3.0) {
        let goal = Goal { absolute: 1e-12, ..Goal::default() };
        let f = |x: f64| Ok(libm::exp(rate * x) * libm::cos(3.0 * x));
        let part = |low, high| integrate("part", low, high, goal, f).expect("smooth").value;
        let whole = part(a, c);
        prop_assert!((part(a, b) + part(b, c) - whole).abs() <= 1e-12 + 1e-11 * (1.0 + libm::exp(15.0 * rate.abs() / 3.0)));
    }
}
