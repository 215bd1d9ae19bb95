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
