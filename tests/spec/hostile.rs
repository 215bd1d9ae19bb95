//! Files that are made to hurt: each is answered in words within a second, and none is obeyed.

use std::time::{Duration, Instant};

use super::{SOUND, problems, read, with};

/// A build for tests is slower than the program, and the machine may be busy; the program itself answers each of
/// these in less than half a second.
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
                assert!(problems.to_string().contains("problem"), "{text}");
            }
        }
    }
}
