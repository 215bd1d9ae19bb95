//! The commands, their exit codes, and what they leave on the disk.

use std::io::Write;
use std::process::Stdio;

use crate::support::{fail, folder, repository, run, small_spec, succeed, sufficit, text, write};

#[test]
fn without_a_target_the_pdf_and_the_markdown_appear_here() {
    let place = folder();
    succeed(
        sufficit().arg("report").arg(repository("examples/axolotl.yaml")).current_dir(place.path()),
    );
    let mut names: Vec<_> = std::fs::read_dir(place.path())
        .expect("readable")
        .map(|e| e.expect("readable").file_name().to_string_lossy().into_owned())
        .collect();
    names.sort();
    assert_eq!(names, ["axolotl-figures", "axolotl.md", "axolotl.pdf"]);
}

#[test]
fn nothing_is_replaced_unasked() {
    let place = folder();
    let spec = write(place.path(), "s.yaml", &small_spec());
    write(place.path(), "r.txt", "mine");
    let said = fail(
        sufficit()
            .arg("report")
            .arg(&spec)
            .args(["-o", "r.md", "-o", "r.txt"])
            .current_dir(place.path()),
        5,
    );
    assert!(said.contains("--replace"), "{said}");
    assert_eq!(std::fs::read_to_string(place.path().join("r.txt")).expect("readable"), "mine");
    assert!(!place.path().join("r.md").exists(), "nothing half-written is left behind");
    succeed(
        sufficit()
            .arg("report")
            .arg(&spec)
            .args(["-o", "r.txt", "--replace"])
            .current_dir(place.path()),
    );
    assert_ne!(std::fs::read_to_string(place.path().join("r.txt")).expect("readable"), "mine");
}

#[test]
fn a_wrong_spec_leaves_no_file() {
    let place = folder();
    let spec = write(place.path(), "s.yaml", &small_spec().replace("spread: 0.39", "spread: -1"));
    fail(sufficit().arg("report").arg(&spec).current_dir(place.path()), 3);
    assert_eq!(std::fs::read_dir(place.path()).expect("readable").count(), 1);
}

#[test]
fn standard_input_and_output_serve() {
    let place = folder();
    for (format, start) in [
        ("md", "---\n"),
        ("txt", "The primary"),
        ("json", "{"),
        ("typ", "#import"),
        ("pdf", "%PDF"),
    ] {
        let mut child = sufficit()
            .args(["report", "-", "-o", "-", "--format", format])
            .current_dir(place.path())
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("it starts");
        child.stdin.take().expect("piped").write_all(small_spec().as_bytes()).expect("written");
        let output = child.wait_with_output().expect("it ends");
        assert!(output.status.success(), "{}", text(&output.stderr));
        assert!(output.stdout.starts_with(start.as_bytes()), "{format}");
        if format == "md" || format == "pdf" {
            let path = place.path().join(format!("from-stdout.{format}"));
            std::fs::write(&path, &output.stdout).expect("written");
            let said = succeed(sufficit().arg("verify").arg(&path));
            assert!(!said.contains("figures"), "they are inside: {said}");
        }
    }
}

#[test]
fn two_documents_in_one_place_are_refused_before_anything_is_written() {
    let place = folder();
    let spec = write(place.path(), "s.yaml", &small_spec());
    for (outputs, word) in [
        (&["-o", "q.md", "-o", "q.md"][..], "named twice"),
        (&["-o", "q.md", "-o", "./q.md"], "the same file"),
        (&["-o", "-", "-o", "-"], "one document"),
        (&["-o", "q.md", "-o", "q.markdown"], "`q-figures`"),
        (&["-o", "q.txt", "--format", "txt"], "`-o -`"),
        (&["--format", "md"], "`-o -`"),
        (&["-o", "q.pdf", "--figures", "png"], "`--figures`"),
    ] {
        let mut command = sufficit();
        command.arg("report").arg(&spec).args(outputs).current_dir(place.path());
        let output = run(&mut command);
        assert_eq!(output.status.code(), Some(2), "{outputs:?}");
        assert!(output.stdout.is_empty(), "{outputs:?}");
        let said = text(&output.stderr);
        assert!(said.contains(word), "{outputs:?}: {said}");
        assert_eq!(std::fs::read_dir(place.path()).expect("readable").count(), 1, "{outputs:?}");
    }
}

#[test]
fn a_folder_is_never_replaced() {
    let place = folder();
    let spec = write(place.path(), "s.yaml", &small_spec());
    std::fs::create_dir(place.path().join("r.md")).expect("made");
    let mut command = sufficit();
    command.arg("report").arg(&spec).args(["-o", "r.txt", "-o", "r.md", "--replace"]);
    let said = fail(command.current_dir(place.path()), 5);
    assert!(said.contains("r.md: a folder of this name exists"), "{said}");
    assert!(!place.path().join("r.txt").exists());
}

#[test]
fn solve_gives_the_answer_first() {
    let place = folder();
    let spec = write(place.path(), "s.yaml", &small_spec());
    let said = succeed(sufficit().arg("solve").arg(&spec));
    assert!(said.contains("22 plots: 11 plots per group"), "{said}");
    assert!(!said.contains('\u{1b}'), "no colour outside a terminal");
    let plan = succeed(sufficit().arg("solve").arg(&spec).arg("--json"));
    let plan: serde_json::Value = serde_json::from_str(&plan).expect("JSON");
    assert_eq!(plan["experiments"][0]["exact"]["sizes"]["per_group"], serde_json::json!([11, 11]));
    assert_eq!(plan["plan_format"], 1);
}

#[test]
fn check_and_statement_speak_plainly() {
    let place = folder();
    let spec = write(place.path(), "s.yaml", &small_spec());
    assert_eq!(succeed(sufficit().arg("check").arg(&spec)), "s.yaml: valid, 1 experiment\n");
    let statement = succeed(sufficit().arg("statement").arg(&spec));
    assert_eq!(statement.lines().count(), 1);
    assert!(statement.contains("11 plots per group"), "{statement}");
}

#[test]
fn losses_divide_and_further_units_count() {
    let place = folder();
    let spec = small_spec()
        + "    losses: 0.1\n    further-units:\n      - {purpose: training, count: 3, why: new staff}\n";
    let spec = write(place.path(), "s.yaml", &spec);
    let plan = succeed(sufficit().arg("solve").arg(&spec).arg("--json"));
    let plan: serde_json::Value = serde_json::from_str(&plan).expect("JSON");
    let request = &plan["experiments"][0]["request"];
    // 11 / 0.9 = 12.2, rounded up.
    assert_eq!(request["per_group"], serde_json::json!([13, 13]));
    assert_eq!(request["units"], 29);
}

#[test]
fn every_command_shows_an_example_in_its_help() {
    for command in ["report", "solve", "check", "statement", "verify", "schema"] {
        let said = succeed(sufficit().args([command, "--help"]));
        assert!(said.contains("Example"), "{command}");
    }
}

#[test]
fn wrong_command_lines_and_missing_files_have_their_exit_codes() {
    let place = folder();
    fail(sufficit().arg("nonsense"), 2);
    let said = fail(sufficit().args(["check", "nofile.yaml"]).current_dir(place.path()), 5);
    assert_eq!(said, "error: nofile.yaml: there is no such file\n");
    fail(sufficit().args(["report", "no-such-file.yaml"]).current_dir(place.path()), 5);
    let spec = write(place.path(), "s.yaml", &small_spec());
    fail(sufficit().arg("report").arg(&spec).args(["-o", "r.odt"]), 2);
    fail(
        sufficit()
            .arg("report")
            .arg(&spec)
            .args(["-o", "no/such/folder/r.md"])
            .current_dir(place.path()),
        5,
    );
}

#[test]
fn pictures_of_pixels_on_demand() {
    let place = folder();
    let spec = write(place.path(), "s.yaml", &small_spec());
    let arguments = ["-o", "r.md", "--figures", "png"];
    succeed(sufficit().arg("report").arg(&spec).args(arguments).current_dir(place.path()));
    let bytes = std::fs::read(place.path().join("r-figures/1-power.png")).expect("readable");
    assert!(bytes.starts_with(b"\x89PNG"));
    succeed(sufficit().arg("verify").arg(place.path().join("r.md")));
}

#[test]
fn colour_is_never_forced_on_a_pipe() {
    let place = folder();
    let spec = write(place.path(), "s.yaml", "sufficit: 2\n");
    let output = run(sufficit().arg("check").arg(&spec).env("TERM", "xterm-256color"));
    assert!(!text(&output.stderr).contains('\u{1b}'));
}
