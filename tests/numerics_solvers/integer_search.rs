use proptest::prelude::*;
use sufficit::numerics::NumericsError;
use sufficit::numerics::integer_search::{
    Question, Smallest, first_reaching, never_below_from, smallest_monotone, smallest_rising,
};

/// Whether a monotone answer is the smallest, checked by looking at every size.
fn check_smallest(answer: &Smallest, lo: u64, hi: u64, meets: impl Fn(u64) -> bool) -> bool {
    (lo..=hi).find(|&n| meets(n)) == Some(answer.n) && answer.question == Question::Monotone
}

#[test]
fn every_threshold_is_found_from_every_hint() {
    for lo in 0..4u64 {
        for threshold in lo..40 {
            for hint in [None, Some(0), Some(threshold), Some(threshold + 1), Some(20), Some(99)] {
                let answer = smallest_monotone(lo, 60, hint, |n| Ok(n >= threshold)).expect("met");
                assert!(check_smallest(&answer, lo, 60, |n| n >= threshold), "{answer:?}");
                assert_eq!(answer.value_before.is_none(), threshold == lo);
            }
        }
    }
}

#[test]
fn an_off_by_one_answer_is_caught() {
    let right = smallest_monotone(2, 60, None, |n| Ok(n >= 17)).expect("met");
    assert!(check_smallest(&right, 2, 60, |n| n >= 17));
    for n in [16, 18] {
        assert!(!check_smallest(&Smallest { n, ..right }, 2, 60, |n| n >= 17));
    }
}

#[test]
fn an_exact_hint_costs_two_evaluations_and_a_wide_range_few() {
    let hinted = smallest_monotone(2, 1 << 60, Some(5_000), |n| Ok(n >= 5_000)).expect("met");
    assert_eq!((hinted.n, hinted.evaluations), (5_000, 2));
    let wide = smallest_monotone(2, u64::MAX, None, |n| Ok(n >= 1 << 50)).expect("met");
    assert_eq!(wide.n, 1 << 50);
    assert!(wide.evaluations <= 105, "{}", wide.evaluations);
    let last = smallest_monotone(0, u64::MAX, Some(3), |n| Ok(n == u64::MAX)).expect("met");
    assert_eq!(last.n, u64::MAX);
}

#[test]
fn values_come_with_the_answer_and_with_the_failure() {
    let answer = smallest_rising(2, 100, None, 0.8, |n| Ok(n as f64 / 50.0)).expect("met");
    assert_eq!((answer.n, answer.value, answer.value_before), (40, 0.8, Some(0.78)));
    let short = smallest_rising(2, 30, None, 0.8, |n| Ok(n as f64 / 50.0));
    assert_eq!(short, Err(NumericsError::TargetOutOfReach { largest: 30, best: 0.6 }));
    assert_eq!(
        short.expect_err("short").to_string(),
        "no size up to 30 meets the target (best value 0.6)"
    );
    assert!(smallest_rising(5, 4, None, 0.8, |_| Ok(1.0)).is_err());
    assert!(smallest_rising(2, 9, None, 0.8, |_| Ok(f64::NAN)).is_err());
    assert!(smallest_rising(2, 9, None, f64::NAN, |_| Ok(1.0)).is_err());
}

/// Rises with teeth: the value falls back at every fifth size.
fn saw_tooth(n: u64) -> f64 {
    n as f64 / 100.0 - if n.is_multiple_of(5) { 0.07 } else { 0.0 }
}

#[test]
fn saw_teeth_get_two_different_answers_that_say_which_they_are() {
    let first = first_reaching(2, 100, 0.43, |n| Ok(saw_tooth(n))).expect("reached");
    assert_eq!((first.n, first.question), (43, Question::FirstReaching));
    assert_eq!((first.value_before, first.evaluations), (Some(0.42), 42));
    let stable = never_below_from(2, 100, 0.43, |n| Ok(saw_tooth(n))).expect("held");
    assert_eq!((stable.n, stable.question), (46, Question::NeverBelowFrom { scanned_to: 100 }));
    assert_eq!(stable.evaluations, 56);

    let always = never_below_from(2, 100, -1.0, |n| Ok(saw_tooth(n))).expect("held");
    assert_eq!((always.n, always.value_before), (2, None));
    let missed = never_below_from(2, 100, 0.95, |n| Ok(saw_tooth(n)));
    assert_eq!(missed, Err(NumericsError::TargetOutOfReach { largest: 100, best: saw_tooth(100) }));
    let never = first_reaching(2, 100, 2.0, |n| Ok(saw_tooth(n)));
    assert_eq!(never, Err(NumericsError::TargetOutOfReach { largest: 100, best: 0.99 }));
    let whole_range = first_reaching(u64::MAX, u64::MAX, 0.0, |_| Ok(1.0)).expect("reached");
    assert_eq!(whole_range.n, u64::MAX);
}

proptest! {
    #[test]
    fn any_threshold_in_any_range(lo: u64, width: u64, share in 0f64..=1.0, hint: Option<u64>) {
        let hi = lo.saturating_add(width);
        let threshold = lo + ((hi - lo) as f64 * share) as u64;
        let threshold = threshold.clamp(lo, hi);
        let answer = smallest_monotone(lo, hi, hint, |n| Ok(n >= threshold)).expect("met");
        prop_assert_eq!(answer.n, threshold);
        prop_assert!(answer.evaluations <= 131);
    }
}
