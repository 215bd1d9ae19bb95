//! One byte changed anywhere, and `verify` says so.

use std::path::{Path, PathBuf};

use crate::support::{fail, folder, repository, run, succeed, sufficit, text, tool};

fn made(place: &Path) -> (PathBuf, PathBuf) {
    let spec = repository("examples/two-experiments/study.yaml");
    succeed(sufficit().arg("report").arg(spec).current_dir(place));
    (place.join("study.pdf"), place.join("study.md"))
}

fn refused(document: &Path) -> String {
    let output = run(sufficit().arg("verify").arg(document));
    let code = output.status.code();
    assert!(matches!(code, Some(1 | 5)), "{code:?}: {}", text(&output.stdout));
    text(&output.stdout) + &text(&output.stderr)
}

#[test]
fn a_changed_spec_in_the_markdown_is_seen() {
    let place = folder();
    let (_, markdown) = made(place.path());
    let original = std::fs::read_to_string(&markdown).expect("readable");
    // The last mention of each stands in the embedded spec or data.
    for (old, new) in [
        ("difference: 18", "difference: 19"),
        ("P01,usual,", "P01,usual,9"),
        ("cannot be analysed}", "cannot be analyzed}"),
    ] {
        let at = original.rfind(old).unwrap_or_else(|| panic!("{old} stands in the document"));
        let mut altered = original.clone();
        altered.replace_range(at..at + old.len(), new);
        std::fs::write(&markdown, altered).expect("written");
        let said = refused(&markdown);
        assert!(said.contains("DIFFERS"), "{said}");
        assert!(said.contains("was altered"), "{said}");
    }
}

#[test]
fn a_changed_word_or_number_of_the_text_is_seen() {
    let place = folder();
    let (_, markdown) = made(place.path());
    let original = std::fs::read_to_string(&markdown).expect("readable");
    let altered = original.replacen("38 participants", "36 participants", 1);
    assert_ne!(original, altered);
    std::fs::write(&markdown, altered).expect("written");
    let said = refused(&markdown);
    assert!(said.contains("DIFFERS   document"), "{said}");
    let number = original.lines().position(|line| line.contains("38 participants"));
    let number = number.expect("it stands in a line") + 1;
    let told = format!("rendered again by this program: it differs from line {number}, column ");
    assert!(said.contains(&told), "{said}");
    let versions: Vec<_> =
        said.lines().filter(|line| line.contains("participants")).map(str::trim).collect();
    assert!(versions[0].starts_with("the document  ") && versions[0].contains("36 p"), "{said}");
    assert!(versions[1].starts_with("made again    ") && versions[1].contains("38 p"), "{said}");
}

#[test]
fn control_characters_of_a_document_do_not_reach_the_terminal() {
    let place = folder();
    let (_, markdown) = made(place.path());
    let original = std::fs::read_to_string(&markdown).expect("readable");
    for (old, new) in [
        ("38 participants", "\u{1b}[31m38 participants"),
        ("  version: \"", "  version: \"\\e[31m"),
        ("file=\"study.yaml\"", "file=\"%1B%5B31mstudy.yaml\""),
        ("  figures: \"", "  figures: \"\\e[31m"),
    ] {
        let altered = original.replacen(old, new, 1);
        assert_ne!(original, altered, "{old}");
        std::fs::write(&markdown, altered).expect("written");
        let said = refused(&markdown);
        assert!(!said.contains('\u{1b}'), "{said:?}");
    }
}

#[test]
fn changed_line_ends_are_told_from_other_changes() {
    let place = folder();
    let (_, markdown) = made(place.path());
    let original = std::fs::read_to_string(&markdown).expect("readable");
    let returned = original.replace('\n', "\r\n");
    std::fs::write(&markdown, &returned).expect("written");
    let said = refused(&markdown);
    assert!(said.contains("the line ends were changed; every other byte agrees"), "{said}");
    for step in ["hashes", "plan", "figures"] {
        assert!(said.contains(&format!("agrees    {step}")), "{said}");
    }
    std::fs::write(&markdown, returned.replacen("38 participants", "36 participants", 1))
        .expect("written");
    let said = refused(&markdown);
    assert!(said.contains("the line ends were changed, and it differs from line "), "{said}");
}

/// The figures lie beside the Markdown, and belong to it.
#[test]
fn an_altered_or_missing_figure_is_seen() {
    let place = folder();
    let (_, markdown) = made(place.path());
    let said = succeed(sufficit().arg("verify").arg(&markdown));
    assert!(said.contains("agrees    figures"), "{said}");
    let figure = place.path().join("study-figures/1-power.svg");
    let original = std::fs::read_to_string(&figure).expect("readable");
    std::fs::write(&figure, original.replacen("<svg", "<svg ", 1)).expect("written");
    let said = refused(&markdown);
    assert!(said.contains("DIFFERS   figures"), "{said}");
    assert!(said.contains("study-figures/1-power.svg was altered"), "{said}");
    assert!(said.contains("agrees    document"), "{said}");
    std::fs::write(&figure, original.replace('\n', "\r\n")).expect("written");
    assert!(refused(&markdown).contains("the line ends of study-figures/1-power.svg were changed"));
    std::fs::remove_file(&figure).expect("removed");
    assert!(refused(&markdown).contains("study-figures/1-power.svg is missing"));
    std::fs::create_dir(&figure).expect("made");
    assert!(refused(&markdown).contains("study-figures/1-power.svg cannot be read"));
    std::fs::remove_dir_all(place.path().join("study-figures")).expect("removed");
    assert!(refused(&markdown).contains("1-power.svg is missing"));
}

/// The front matter tells the hash of each figure to whoever has no program at hand.
#[test]
fn the_front_matter_holds_the_hash_of_every_figure() {
    let place = folder();
    let (_, markdown) = made(place.path());
    let text = std::fs::read_to_string(&markdown).expect("readable");
    let matter = text.split("\n---\n").next().expect("front matter");
    let mut files: Vec<_> = std::fs::read_dir(place.path().join("study-figures"))
        .expect("readable")
        .map(|entry| entry.expect("readable").path())
        .collect();
    files.sort();
    assert_eq!(matter.matches("  figure-").count(), 1 + 2 * files.len(), "{matter}");
    for file in files {
        let name = file.file_name().expect("a name").to_string_lossy().into_owned();
        let hash = sufficit::record::sha256_hex(&std::fs::read(&file).expect("readable"));
        let line = matter.lines().find(|line| line.ends_with(&format!(": \"{name}\"")));
        let key = line.and_then(|line| line.split(':').next()).expect("the figure is named");
        assert!(matter.contains(&format!("{key}-sha256: \"{hash}\"")), "{matter}");
    }
}

/// A document names its figures folder, but leads nowhere else.
#[test]
fn figures_are_read_only_beside_the_document() {
    let place = folder();
    let (_, markdown) = made(place.path());
    let original = std::fs::read_to_string(&markdown).expect("readable");
    let inner = place.path().join("inner");
    std::fs::create_dir(&inner).expect("made");
    let moved = inner.join("study.md");
    std::fs::write(&moved, original.replace("study-figures", "../study-figures")).expect("written");
    let said = refused(&moved);
    assert!(said.contains("is no name of a folder beside the document"), "{said}");
}

#[test]
fn a_document_may_come_through_standard_input() {
    let place = folder();
    let (pdf, markdown) = made(place.path());
    let verify = |document: &Path, beside: &Path| {
        let file = std::fs::File::open(document).expect("readable");
        let mut command = sufficit();
        command.args(["verify", "-"]).current_dir(beside).stdin(file);
        let output = command.output().expect("it runs");
        (output.status.code(), text(&output.stdout))
    };
    for document in [&pdf, &markdown] {
        let (code, said) = verify(document, place.path());
        assert_eq!(code, Some(0), "{said}");
        assert!(said.ends_with("standard input: verified\n"), "{said}");
    }
    let elsewhere = folder();
    let (code, said) = verify(&markdown, elsewhere.path());
    assert_eq!(code, Some(1), "{said}");
    assert!(said.contains("study-figures/1-power.svg is missing"), "{said}");
}

#[test]
fn a_changed_attachment_of_the_pdf_is_seen() {
    let place = folder();
    let (pdf, _) = made(place.path());
    let Some(mut qpdf) = tool("qpdf") else { return };
    let plain = place.path().join("plain.pdf");
    succeed(qpdf.args(["--qdf", "--object-streams=disable"]).arg(&pdf).arg(&plain));
    let bytes = std::fs::read(&plain).expect("readable");
    for (old, new) in
        [(&b"difference: 18"[..], &b"difference: 19"[..]), (b"P01,usual", b"P02,usual")]
    {
        let at = bytes.windows(old.len()).position(|w| w == old).expect("stands in the attachment");
        let mut altered = bytes.clone();
        altered[at..at + old.len()].copy_from_slice(new);
        let path = place.path().join("altered.pdf");
        std::fs::write(&path, altered).expect("written");
        let said = refused(&path);
        assert!(said.contains("DIFFERS   hashes") && said.contains("was altered"), "{said}");
    }
}

#[test]
fn a_replaced_attachment_of_the_pdf_is_seen() {
    let place = folder();
    let (pdf, _) = made(place.path());
    let Some(mut qpdf) = tool("qpdf") else { return };
    let changed = place.path().join("study.yaml");
    std::fs::write(&changed, "sufficit: 1\n").expect("written");
    let altered = place.path().join("altered.pdf");
    let key = ["--key=study.yaml", "--replace", "--"];
    succeed(qpdf.arg(&pdf).arg("--add-attachment").arg(&changed).args(key).arg(&altered));
    let said = refused(&altered);
    assert!(said.contains("altered"), "{said}");
}

#[test]
fn any_changed_byte_of_the_pdf_is_seen() {
    let place = folder();
    let (pdf, _) = made(place.path());
    let original = std::fs::read(&pdf).expect("readable");
    for position in (0..original.len()).step_by(original.len() / 25) {
        let mut altered = original.clone();
        altered[position] ^= 1;
        std::fs::write(&pdf, altered).expect("written");
        refused(&pdf);
    }
}

#[test]
fn what_is_no_document_of_ours_is_an_error() {
    let place = folder();
    for (name, content) in
        [("a.md", "# Nothing\n"), ("b.pdf", "%PDF-1.7\n"), ("c.md", "---\nx: 1\n---\n"), ("d", "")]
    {
        let path = place.path().join(name);
        std::fs::write(&path, content).expect("written");
        fail(sufficit().arg("verify").arg(&path), 5);
    }
}
