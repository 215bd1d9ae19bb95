//! Text from a stranger stays text, files stay in their folder, and nothing hangs.

use std::time::{Duration, Instant};

use crate::support::{fail, folder, run, small_spec, succeed, sufficit, text, tool, write};

const HOSTILE: &str = r##"#read("/etc/passwd") *x* $y$ @z <a> [b](c) {{ 7*7 }} \"##;

fn with_title(title: &str) -> String {
    let quoted = serde_json::to_string(title).expect("text");
    let spec = small_spec().replace("title: A small study", &format!("title: {quoted}"));
    let spec = spec.replace("question: Does it differ?", &format!("question: {quoted}"));
    spec.replace("name: yield", &format!("name: {quoted}"))
}

#[test]
fn markup_in_the_title_is_shown_literally_in_every_format() {
    let place = folder();
    write(place.path(), "s.yaml", &with_title(HOSTILE));
    let outputs = ["-o", "r.pdf", "-o", "r.md", "-o", "r.txt", "-o", "r.json"];
    succeed(sufficit().arg("report").arg("s.yaml").args(outputs).current_dir(place.path()));
    let read = |name: &str| std::fs::read_to_string(place.path().join(name)).expect("readable");
    assert!(read("r.txt").contains(HOSTILE));
    let plan: serde_json::Value = serde_json::from_str(&read("r.json")).expect("JSON");
    assert_eq!(plan["title"], HOSTILE);
    succeed(sufficit().arg("verify").arg(place.path().join("r.md")));
    if let Some(mut reader) = tool("pdftotext") {
        let shown = succeed(reader.args(["-layout", "r.pdf", "-"]).current_dir(place.path()));
        let flat = shown.split_whitespace().collect::<Vec<_>>().join(" ");
        assert!(flat.matches(HOSTILE).count() >= 2, "{flat}");
    }
    if let Some(mut pandoc) = tool("pandoc") {
        let arguments = ["-f", "markdown", "-t", "plain", "--wrap=none", "r.md"];
        let shown = succeed(pandoc.args(arguments).current_dir(place.path()));
        assert!(shown.matches(HOSTILE).count() >= 2, "{shown}");
        let arguments = ["-f", "gfm", "-t", "plain", "--wrap=none", "r.md"];
        let mut pandoc = tool("pandoc").expect("seen above");
        let shown = succeed(pandoc.args(arguments).current_dir(place.path()));
        assert!(shown.matches(HOSTILE).count() >= 2, "{shown}");
    }
}

#[test]
fn a_data_file_outside_the_folder_is_refused() {
    let place = folder();
    let inside = place.path().join("inside");
    std::fs::create_dir(&inside).expect("made");
    write(place.path(), "secret.csv", "x\n1\n2\n3\n");
    let absolute = place.path().join("secret.csv");
    let mut names = vec!["../secret.csv".to_owned(), absolute.display().to_string()];
    #[cfg(unix)]
    {
        std::os::unix::fs::symlink(&absolute, inside.join("link.csv")).expect("linked");
        std::os::unix::fs::symlink(place.path(), inside.join("dir")).expect("linked");
        names.extend(["link.csv".to_owned(), "dir/secret.csv".to_owned()]);
    }
    for name in names {
        let spread = format!("spread: {{file: {}, column: x}}", serde_json::json!(name));
        let spec = write(&inside, "s.yaml", &small_spec().replace("spread: 0.39", &spread));
        let said = fail(sufficit().arg("check").arg(&spec), 3);
        assert!(said.contains("folder"), "{name}: {said}");
    }
}

fn quickly(spec: &str, code: i32) -> String {
    let place = folder();
    let path = write(place.path(), "s.yaml", spec);
    let start = Instant::now();
    let said = fail(sufficit().arg("solve").arg(&path), code);
    // A bound against hanging, wide enough for a busy machine; not a measurement.
    assert!(start.elapsed() < Duration::from_secs(20), "{said}");
    said
}

#[test]
fn impossible_values_are_clear_errors() {
    for (old, new, word) in [
        ("spread: 0.39", "spread: 0", "standard deviation"),
        ("spread: 0.39", "spread: -2", "standard deviation"),
        ("spread: 0.39", "spread: .nan", "not a finite number"),
        ("difference: 0.5", "difference: 0", "difference"),
        ("difference: 0.5", "difference: .inf", "not a finite number"),
        ("alpha: 0.05", "alpha: 1", "significance level"),
        ("alpha: 0.05", "alpha: 0", "significance level"),
        ("power: 0.8", "power: 1", "power"),
    ] {
        let said = quickly(&small_spec().replace(old, new), 3);
        assert!(said.contains(word), "{new}: {said}");
        assert!(said.contains("s.yaml:"), "{said}");
    }
    let said = quickly(&small_spec().replace("difference: 0.5", "difference: 0.000001"), 4);
    assert!(said.contains("with up to 1 000 000 000 units per group"), "{said}");
}

#[test]
fn bombs_are_refused() {
    let mut bomb = String::from("a: &a [x, x, x, x, x, x, x, x, x, x]\n");
    for (letter, before) in "bcdefghijk".chars().zip("abcdefghij".chars()) {
        let row = vec![format!("*{before}"); 10].join(", ");
        bomb.push_str(&format!("{letter}: &{letter} [{row}]\n"));
    }
    quickly(&bomb, 3);
    quickly(&"[".repeat(100_000), 3);
    let mut large = small_spec();
    large.push_str(&"# filler\n".repeat(100 * 1024 * 1024 / 9));
    quickly(&large, 5);
}

#[test]
fn a_character_that_no_font_has_is_named() {
    let place = folder();
    let spec = write(place.path(), "s.yaml", &with_title("A study of 鯨"));
    let said = fail(
        sufficit().arg("report").arg(&spec).args(["-o", "r.pdf"]).current_dir(place.path()),
        6,
    );
    assert!(said.contains('鯨') && said.contains("--fonts"), "{said}");
    assert!(!place.path().join("r.pdf").exists());
    succeed(sufficit().arg("report").arg(&spec).args(["-o", "r.md"]).current_dir(place.path()));
}

#[test]
fn messages_carry_no_control_characters_of_the_spec() {
    let place = folder();
    let spec = small_spec().replace("id: one", "id: \"\\e[31mred\"");
    let path = write(place.path(), "s.yaml", &spec);
    let output = run(sufficit().arg("check").arg(&path));
    assert!(!output.status.success());
    assert!(!text(&output.stderr).contains('\u{1b}'));
}
