//! What must hold for every design: read from its own example, so a new design inherits it.

use std::path::Path;

use sufficit::designs::{Card, Point, Problem, REGISTRY};
use sufficit::numerics::random::Stream;
use sufficit::solver::{size_grid, smallest_sizes};

use crate::support::read;

/// The experiments of all shipped examples that belong to a design and need no data file.
fn problems() -> Vec<(String, Box<dyn Problem>)> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("examples");
    let mut found = Vec::new();
    let mut entries: Vec<_> = std::fs::read_dir(&folder)
        .expect("the folder exists")
        .flat_map(|entry| {
            let path = entry.expect("readable").path();
            if path.is_dir() { vec![path.join("study.yaml")] } else { vec![path] }
        })
        .filter(|path| path.extension().is_some_and(|e| e == "yaml") && path.is_file())
        .collect();
    entries.sort();
    for path in entries {
        let text = std::fs::read_to_string(&path).expect("readable");
        let file: serde_yaml::Value = serde_yaml::from_str(&text).expect("sound");
        for experiment in file["experiments"].as_sequence().expect("a list") {
            if experiment["spread"].get("file").is_some() {
                continue;
            }
            let key = |value: &serde_yaml::Value| value.as_str().map(str::to_owned);
            let (structure, aim) =
                (key(&experiment["design"]["structure"]), key(&experiment["aim"]));
            let analysis = experiment.get("analysis").and_then(key);
            let serves = |card: &Card| {
                Some(card.structure) == structure.as_deref()
                    && Some(card.aim) == aim.as_deref()
                    && analysis.as_deref().is_none_or(|name| name == card.analysis)
            };
            let design = REGISTRY.iter().find(|d| serves(d.card())).expect("known");
            let yaml = serde_yaml::to_string(experiment).expect("text");
            let name =
                format!("{} in {}", experiment["id"].as_str().unwrap_or("?"), path.display());
            found.push((name, read(design.card().id, &yaml).expect("an example is valid")));
        }
    }
    found
}

#[test]
fn every_design_has_an_example() {
    let problems = problems();
    for design in REGISTRY {
        let id = design.card().id;
        assert!(problems.iter().any(|(_, p)| p.card().id == id), "{id} has no example");
    }
}

#[test]
fn power_rises_with_size_and_effect_and_falls_with_spread() {
    for (name, problem) in problems() {
        let at = problem.planned();
        let mut last = 0.0;
        for step in problem.smallest_step()..80 {
            let sizes = problem.sizes(step).expect("small");
            let power = problem.power(&sizes, at).expect("it exists");
            assert!(power >= last, "{name}: power falls at {step}");
            last = power;
            let more = (at.effect * 1.01).min(problem.effect_limit());
            let more = Point { effect: more, ..at };
            let wider = Point { nuisance: at.nuisance * 1.01, ..at };
            assert!(problem.power(&sizes, more).expect("it exists") >= power, "{name}");
            assert!(problem.power(&sizes, wider).expect("it exists") <= power, "{name}");
        }
    }
}

#[test]
fn smallest_is_smallest_for_every_small_size() {
    for (name, problem) in problems() {
        for tenths in 4..40 {
            let at = Point {
                effect: problem.planned().nuisance * f64::from(tenths) / 10.0,
                ..problem.planned()
            };
            if at.effect >= problem.effect_limit() {
                continue;
            }
            let target = problem.risk().power.get();
            let found = smallest_sizes(problem.as_ref(), at).expect("within reach");
            let reaches = |step| {
                problem.power(&problem.sizes(step).expect("small"), at).expect("it exists")
                    >= target
            };
            let first = (problem.smallest_step()..).find(|step| reaches(*step));
            assert_eq!(first, Some(found.sizes.step), "{name}, effect {}", at.effect);
        }
    }
}

#[test]
fn the_detectable_effect_has_the_wanted_power() {
    for (name, problem) in problems() {
        for step in [problem.smallest_step(), 5, 12, 40, 1000] {
            let sizes = problem.sizes(step).expect("small");
            let nuisance = problem.planned().nuisance;
            for power in [0.5, 0.8, 0.99] {
                let effect = problem.detectable(&sizes, nuisance, power).expect("it exists");
                let back = problem.power(&sizes, Point { effect, nuisance }).expect("it exists");
                assert!((back - power).abs() < 1e-10, "{name}, {step}: {back}");
            }
        }
    }
}

#[test]
fn a_grid_gives_what_single_searches_give() {
    for (name, problem) in problems() {
        let planned = problem.planned();
        let mut effects: Vec<_> = (3..14).map(|i| planned.effect * f64::from(i) / 7.0).collect();
        effects.retain(|effect| *effect < problem.effect_limit());
        let spreads: Vec<_> = (4..13).map(|i| planned.nuisance * f64::from(i) / 8.0).collect();
        let grid = size_grid(problem.as_ref(), &effects, &spreads).expect("solvable");
        for (row, effect) in grid.iter().zip(&effects) {
            for (cell, nuisance) in row.iter().zip(&spreads) {
                let at = Point { effect: *effect, nuisance: *nuisance };
                let found = smallest_sizes(problem.as_ref(), at).expect("within reach");
                assert_eq!(*cell, Some(found.sizes.step), "{name}");
            }
        }
    }
}

/// The simulated analysis against the exact power and the wanted error rate, for every example: 20 000 studies each
/// with a fixed seed, so the outcome never changes; a distance beyond 4 standard errors would have a chance of
/// 6 in 100 000.
#[test]
fn simulated_power_and_false_alarms_are_the_exact_ones() {
    for (name, problem) in problems() {
        let found = smallest_sizes(problem.as_ref(), problem.planned()).expect("within reach");
        let trial = problem.trial(&found.sizes, problem.planned()).expect("prepared");
        let count = trial.comparisons();
        let (mut planned, mut null) = (vec![false; count], vec![false; count]);
        let mut stream = Stream::new([7; 32], "test of simulated studies", 0);
        let (studies, mut hits, mut alarms) = (20_000, 0, 0);
        let mut scratch = Vec::new();
        for _ in 0..studies {
            trial.run(&mut stream, &mut scratch, &mut planned, &mut null);
            hits += u32::from(planned[trial.weakest()]);
            alarms += u32::from(null.iter().any(|rejected| *rejected));
        }
        let share = |count: u32| f64::from(count) / f64::from(studies);
        let error = |p: f64| (p * (1.0 - p) / f64::from(studies)).sqrt();
        let distance = (share(hits) - found.power) / error(found.power);
        assert!(distance.abs() < 4.0, "{name}: {distance}");
        let alpha = problem.risk().alpha.get();
        assert!(share(alarms) < alpha + 4.0 * error(alpha), "{name}: {}", share(alarms));
        assert!(share(alarms) > 0.5 * alpha, "{name}: {}", share(alarms));
    }
}
