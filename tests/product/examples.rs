//! Every shipped example becomes documents that other programs accept.

use crate::support::{examples, folder, repository, run, succeed, sufficit, text, tool};

#[test]
fn every_example_becomes_documents_that_verify() {
    for spec in examples() {
        let place = folder();
        succeed(sufficit().arg("report").arg(&spec).current_dir(place.path()));
        let stem = spec.file_stem().expect("a name").to_string_lossy().into_owned();
        for extension in ["pdf", "md"] {
            let document = place.path().join(format!("{stem}.{extension}"));
            let said = succeed(sufficit().arg("verify").arg(&document));
            assert!(said.contains(": verified"), "{said}");
            assert!(!said.contains("DIFFERS"), "{said}");
        }
    }
}

#[test]
fn other_programs_accept_the_pdf() {
    for spec in examples() {
        let place = folder();
        let pdf = place.path().join("report.pdf");
        succeed(sufficit().arg("report").arg(&spec).arg("-o").arg(&pdf));
        if let Some(mut qpdf) = tool("qpdf") {
            let said = succeed(qpdf.arg("--check").arg(&pdf));
            assert!(!said.contains("WARNING"), "{said}");
        }
        if let Some(mut list) = tool("pdfdetach") {
            let said = succeed(list.arg("-list").arg(&pdf));
            let name = spec.file_name().expect("a name").to_string_lossy().into_owned();
            assert!(said.contains(&name) && said.contains("plan.json"), "{said}");
        }
        if let Some(mut reader) = tool("pdftotext") {
            let said = succeed(reader.arg(&pdf).arg("-"));
            let bytes = std::fs::read(&spec).expect("readable");
            let hash = sufficit::record::sha256_hex(&bytes);
            assert!(said.contains(&hash), "the full hash stands in the record");
            let pages = said.matches('\u{c}').count();
            assert!(
                said.matches(&hash[..12]).count() > pages,
                "the short hash stands on every page"
            );
        }
    }
}

#[test]
fn pandoc_converts_the_markdown_without_a_warning() {
    for spec in examples() {
        let place = folder();
        succeed(sufficit().arg("report").arg(&spec).args(["-o", "r.md"]).current_dir(place.path()));
        for target in ["r.docx", "r.html"] {
            let Some(mut pandoc) = tool("pandoc") else { return };
            let output = run(pandoc
                .args(["--standalone", "--fail-if-warnings", "r.md", "-o", target])
                .current_dir(place.path()));
            assert!(output.status.success(), "{}: {}", spec.display(), text(&output.stderr));
            assert!(output.stderr.is_empty(), "{}", text(&output.stderr));
        }
    }
}

/// The Markdown and the statement of every example, word for word. `SUFFICIT_REWRITE=1` rewrites them; read them then.
#[test]
fn the_words_of_every_example_are_as_expected() {
    let expected = repository("tests/product/expected");
    let rewrite = std::env::var("SUFFICIT_REWRITE").is_ok_and(|v| v == "1");
    let mut known = Vec::new();
    for spec in examples() {
        let place = folder();
        let name = match spec.parent().and_then(|p| p.file_name()) {
            Some(parent) if parent != "examples" => parent.to_string_lossy().into_owned(),
            _ => spec.file_stem().expect("a name").to_string_lossy().into_owned(),
        };
        succeed(
            sufficit()
                .arg("report")
                .arg(&spec)
                .args(["-o", "r.md", "-o", "r.txt"])
                .current_dir(place.path()),
        );
        for extension in ["md", "txt"] {
            let made = std::fs::read_to_string(place.path().join(format!("r.{extension}")));
            let made = made.expect("readable").replace(env!("CARGO_PKG_VERSION"), "VERSION");
            let file = expected.join(format!("{name}.{extension}"));
            known.push(file.clone());
            if rewrite {
                std::fs::create_dir_all(&expected).expect("the folder can be made");
                std::fs::write(&file, &made).expect("the file can be written");
            }
            let wanted = std::fs::read_to_string(&file).unwrap_or_default();
            for (line, (a, b)) in wanted.lines().zip(made.lines()).enumerate() {
                // The plan's hash changes with the version; the numbers below it do not.
                if !a.contains("plan-sha256") {
                    assert_eq!(a, b, "{} line {}", file.display(), line + 1);
                }
            }
            assert_eq!(wanted.lines().count(), made.lines().count(), "{}", file.display());
        }
    }
    for entry in std::fs::read_dir(&expected).expect("the folder exists") {
        let path = entry.expect("readable").path();
        assert!(known.contains(&path), "{} belongs to no example", path.display());
    }
}
