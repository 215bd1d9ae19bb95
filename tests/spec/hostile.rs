//! Files that are made to hurt: each is answered in words within a second, and none is obeyed.

use std::time::{Duration, Instant};

use serde_yaml::Value;

use super::{SOUND, problems, read, with};

/// The program answers each of these within a second; a build for tests is slower, and shares its machine with other
/// tests, so it is given three.
const PATIENCE: Duration = Duration::from_secs(3);

fn refused(name: &str, text: &str) {
    let start = Instant::now();
    let problems = problems(text, &[]);
    let drawn = problems.render(false);
    assert!(start.elapsed() < PATIENCE, "{name} took {:?}", start.elapsed());
    assert!(drawn.len() < 200_000, "{name} gave {} bytes", drawn.len());
    assert!(problems.problems().iter().all(|p| p.help.is_some()), "{name}: {drawn}");
}

#[test]
fn alias_bombs_do_not_go_off() {
    let mut bomb = "a: &a [x, x, x, x, x, x, x, x, x]\n".to_owned();
    for (last, next) in ('a'..='y').zip('b'..='z') {
        bomb.push_str(&format!("{next}: &{next} [{}]\n", vec![format!("*{last}"); 9].join(", ")));
    }
    refused("lists of lists", &bomb);
    let long = "x".repeat(100_000);
    refused("long text", &format!("a: &a {long}\nb: [{}]\n", vec!["*a"; 100_000].join(",")));
    refused("itself", "a: &a [*a, *a]\n");
    refused("many anchors", &format!("a:{}", " &a".repeat(300_000)));
}

#[test]
fn depth_and_breadth_are_limited() {
    refused("open brackets", &"[".repeat(1_000_000));
    refused("brackets in quotes", &format!("a: {}", "[ \"]\" , ".repeat(4_900)));
    refused("hyphens", &"- ".repeat(500_000));
    refused("question marks", &"? ".repeat(500_000));
    refused("colons", &": ".repeat(500_000));
    refused("items", &"-\n".repeat(500_000));
    refused("keys", &(0..90_000).map(|i| format!("k{i}: 1\n")).collect::<String>());
    refused("the same key", &"a: 1\n".repeat(200_000));
    refused("commas", &format!("[{}", ",".repeat(1_000_000)));
    refused("quotes", &"\"".repeat(1_000_000));
    refused("a long line", &format!("title: {}", "x".repeat(1_000_000)));
    refused("nothing", &"\n".repeat(1_000_000));
    refused("too much", &"#".repeat((1 << 20) + 1));
}

#[test]
fn many_problems_are_counted_and_some_shown() {
    let values = vec!["x"; 190_000].join(",");
    let text = with("spread: 0.8", &format!("spread: {{values: [{values}]}}"));
    refused("many wrong values", &text);
    let few = with("spread: 0.8", &format!("spread: {{values: [{}]}}", vec!["x"; 120].join(",")));
    let problems = problems(&few, &[]);
    assert_eq!(problems.problems().len(), 50);
    assert!(problems.to_string().ends_with("50 of 120 problems in study.yaml\n"));
}

#[test]
fn experiments_are_limited_in_number() {
    let one = SOUND.find("  - id").and_then(|at| SOUND.get(at..)).unwrap_or("");
    let more = |count: usize| {
        let others = (1..count).map(|i| one.replace("warmth", &format!("e{i}")));
        format!("{SOUND}{}", others.collect::<String>())
    };
    let start = Instant::now();
    assert!(read(&more(200), &[]).is_ok());
    assert!(start.elapsed() < PATIENCE, "{:?}", start.elapsed());
    refused("201 experiments", &more(201));
}

#[test]
fn a_large_table_is_read_in_time() {
    let rows: String = (0..1_000_000).map(|i| format!("{},{}\n", i % 7, i)).collect();
    let text = with("spread: 0.8", "spread: {file: d.csv, column: b, where: {a: 3}}");
    let start = Instant::now();
    assert!(read(&text, &[("d.csv", &format!("a,b\n{rows}"))]).is_ok());
    assert!(start.elapsed() < PATIENCE, "{:?}", start.elapsed());
    let problems = problems(&text, &[("d.csv", &format!("a,b\n{rows}3,1\n"))]);
    assert!(problems.to_string().contains("more than 1000000 rows"));
}

/// Whatever is damaged, the answer is a study or a list of problems with places, and never a panic.
#[test]
fn damaged_specs_are_answered() {
    let marks = [
        "", ":", "-", "\t", "\"", "'", "[", "}", "&a ", "*a ", "!x ", "|", "#", "\n", "  ",
        "\u{0}", "é", "%",
    ];
    let offsets: Vec<usize> = SOUND.char_indices().map(|(offset, _)| offset).collect();
    for (turn, offset) in offsets.iter().enumerate() {
        let (before, after) = SOUND.split_at(*offset);
        let mark = marks[turn % marks.len()];
        let skip = after.chars().next().map_or(0, char::len_utf8);
        for text in [
            format!("{before}{mark}{}", &after[skip..]),
            format!("{before}{mark}{after}"),
            before.to_owned(),
        ] {
            if let Err(problems) = read(&text, &[]) {
                assert!(!problems.problems().is_empty(), "{text}");
                assert!(problems.problems().iter().all(|p| p.line > 0 && p.column > 0), "{text}");
                let said = problems.to_string();
                assert!(said.contains("problem"), "{text}");
                // The check of the keys leaves nothing for the reader of values to stumble over.
                for leak in
                    ["although its keys are right", "invalid type", "missing field", "untagged"]
                {
                    assert!(!said.contains(leak), "{text}\n{said}");
                }
            }
        }
    }
}

/// Every place of a value below another, as the steps to it.
fn places(value: &Value, way: &[Value], found: &mut Vec<Vec<Value>>) {
    found.push(way.to_vec());
    let below = |step: Value| way.iter().cloned().chain([step]).collect::<Vec<_>>();
    match value {
        Value::Mapping(entries) => {
            entries.iter().for_each(|(key, value)| places(value, &below(key.clone()), found));
        }
        Value::Sequence(items) => {
            for (index, item) in items.iter().enumerate() {
                places(item, &below(Value::from(index)), found);
            }
        }
        _ => {}
    }
}

fn put(root: &mut Value, way: &[Value], other: Value) {
    let place = way.iter().try_fold(root, |value, step| match (value, step) {
        (Value::Sequence(items), Value::Number(index)) => {
            items.get_mut(index.as_u64().unwrap_or(0) as usize)
        }
        (value, step) => value.get_mut(step),
    });
    *place.expect("the place exists") = other;
}

/// A value of any kind at any place is either read or refused in the words of the language.
#[test]
fn values_of_any_kind_are_answered_anywhere() {
    let root: Value = serde_yaml::from_str(super::good::FULL).expect("the full spec is YAML");
    let mut ways = Vec::new();
    places(&root, &[], &mut ways);
    assert!(ways.len() > 60);
    let others = [
        "~",
        "true",
        "0",
        "-1",
        "1.5",
        ".nan",
        "1e300",
        "18446744073709551615",
        "-9223372036854775808",
        "x",
        "''",
        "'\u{202E}'",
        "[]",
        "[~]",
        "[[1]]",
        "{}",
        "{a: 1}",
        "{value: x}",
        "{1: {2: 3}}",
        "2031-03-14",
    ];
    for way in &ways {
        for other in others {
            let mut changed = root.clone();
            put(&mut changed, way, serde_yaml::from_str(other).unwrap_or(Value::Null));
            let text = serde_yaml::to_string(&changed).expect("YAML is written");
            let files = [
                ("references.yaml", super::good::REFERENCES),
                ("data/pilot.csv", super::good::PILOT),
            ];
            let Err(problems) = read(&text, &files) else { continue };
            let said = problems.to_string();
            for leak in [
                "although its keys are right",
                "invalid type",
                "missing field",
                "untagged",
                "did not match",
            ] {
                assert!(!said.contains(leak), "{way:?} {other}\n{said}");
            }
        }
    }
}
