use std::process::Command;

use proptest::prelude::*;
use sufficit::record::pdf_attachments::attachments;
use sufficit::record::{Attachment, RecordError};

use crate::made_pdf::{compact, deflate, file, small, stream, text};
use crate::sample::{SPEC, noise, sample_pdf};

fn attachment(name: &str, role: &str, bytes: &[u8]) -> Attachment {
    Attachment { name: name.to_owned(), role: role.to_owned(), bytes: bytes.to_vec() }
}

/// What the sample carries, in the order of a PDF's table of names.
fn of_the_sample() -> Vec<Attachment> {
    vec![
        attachment("Größe und Maß.csv", "data", &noise()),
        attachment("empty.bin", "supplement", b""),
        attachment("study.yaml", "source", SPEC.repeat(20).as_bytes()),
    ]
}

#[test]
fn the_sample_gives_its_inputs_back() {
    assert!(attachments(&sample_pdf()) == Ok(of_the_sample()));
}

#[test]
fn plain_packed_and_compact_files_are_read() {
    let content = b"hello\n";
    let expected = Ok(vec![attachment("a.txt", "unspecified", content)]);
    assert_eq!(attachments(&small("", content)), expected);
    assert_eq!(attachments(&small("/Filter[]", content)), expected);
    let packed = deflate(content);
    assert_eq!(attachments(&small("/Filter/FlateDecode", &packed)), expected);
    assert_eq!(attachments(&small("/Filter[/Flate#44ecode]", &packed)), expected);
    assert_eq!(attachments(&compact(content)), expected);
}

#[test]
fn a_file_saved_on_top_of_itself_shows_its_newest_state() {
    let mut pdf = small("", b"old\n");
    let older = pdf.windows(6).rposition(|w| w == b"\nxref\n").expect("a table") + 1;
    let place = pdf.len();
    let (_, body) = stream(3, "", b"new\n");
    pdf.extend(b"3 0 obj\n");
    pdf.extend(body);
    pdf.extend(b"\nendobj\n");
    let start = pdf.len();
    pdf.extend(
        format!(
            "xref\n3 1\n{place:010} 00000 n \ntrailer\n<</Size 4/Root 1 0 R/Prev {older}>>\n\
             startxref\n{start}\n%%EOF\n"
        )
        .bytes(),
    );
    assert_eq!(attachments(&pdf), Ok(vec![attachment("a.txt", "unspecified", b"new\n")]));
}

#[test]
fn files_only_associated_with_the_document_are_found_once() {
    let pdf = file(
        &[
            text(1, "<</Names<</EmbeddedFiles<</Kids[5 0 R]>>>>/AF[2 0 R 4 0 R]>>"),
            text(2, "<</UF<FEFF00E4>/EF<</F 3 0 R>>/AFRelationship/Source>>"),
            stream(3, "", b"x"),
            text(4, "<</F(b\\(1\\)\\101)/EF<</F 6 0 R>>/AFRelationship/Data>>"),
            text(5, "<</Names[(b)2 0 R]>>"),
            stream(6, "/Length 7 0 R", b"y"),
        ],
        "",
    );
    assert_eq!(
        attachments(&pdf),
        Ok(vec![attachment("ä", "source", b"x"), attachment("b(1)A", "data", b"y"),])
    );
}

#[test]
fn a_pdf_without_attachments_gives_none() {
    assert_eq!(attachments(&file(&[text(1, "<</Type/Catalog>>")], "")), Ok(Vec::new()));
}

#[test]
fn a_file_that_stops_early_is_refused() {
    let pdf = sample_pdf();
    for length in (0..pdf.len() - 1).step_by(1000) {
        let error = attachments(&pdf[..length]).expect_err("cut off");
        let expected = if length < 5 { RecordError::NotPdf } else { RecordError::Truncated };
        assert_eq!(error, expected, "{length}");
    }
}

/// A damaged byte may hit a page, which the attachments do not show; it may hit an
/// attachment that stands unpacked, which its hash shows. It never gives a panic,
/// and never a packed attachment that differs.
#[test]
fn a_damaged_byte_gives_an_error_or_leaves_packed_files_whole() {
    let pdf = sample_pdf();
    let whole = of_the_sample();
    let mut refused = 0;
    for at in (0..pdf.len()).step_by(1000).chain(pdf.len() - 3000..pdf.len()) {
        for change in [0x01, 0x80, 0xFF] {
            let mut damaged = pdf.clone();
            damaged[at] ^= change;
            match attachments(&damaged) {
                Err(_) => refused += 1,
                Ok(found) => {
                    for one in found.iter().filter(|one| one.name == "study.yaml") {
                        assert!(one.bytes == whole[2].bytes, "{at}");
                    }
                }
            }
        }
    }
    assert!(refused > 0, "no damage was noticed at all");
}

proptest! {
    #[test]
    fn random_bytes_give_an_error(
        bytes in prop::collection::vec(any::<u8>(), 0..3000),
    ) {
        prop_assert!(attachments(&bytes).is_err());
        let framed = [b"%PDF-1.7\n", &bytes[..], b"\nstartxref\n9\n%%EOF"].concat();
        prop_assert!(attachments(&framed).is_err());
    }

    #[test]
    fn damaged_small_files_never_panic(
        compactly in any::<bool>(),
        changes in prop::collection::vec((any::<prop::sample::Index>(), any::<u8>()), 1..6),
        pieces in prop::collection::vec(
            (any::<prop::sample::Index>(), prop::sample::select(vec![
                "<<", ">>", "[", "]", "(", ")", "<", "/", "1 0 R", "2 0 R", "3 0 R", "-1",
                "99999999999999999999", "stream\n", "endstream", "xref", "trailer", "%", "\\", "#",
                "/Prev 0", "/Length 1 0 R", "/Encrypt", "0000000000", "4294967295",
            ])), 0..4),
    ) {
        let mut pdf = if compactly { compact(b"hello") } else { small("", b"hello") };
        for (index, byte) in changes {
            let at = index.index(pdf.len());
            pdf[at] = byte;
        }
        for (index, piece) in pieces {
            let at = index.index(pdf.len());
            pdf.splice(at..at, piece.bytes());
        }
        let _ = attachments(&pdf);
    }
}

/// Needs qpdf and poppler-utils: other programs find the sample in order, and what
/// qpdf writes of it is read as well.
#[test]
fn other_programs_agree() {
    if !["qpdf", "pdfdetach", "pdfinfo"].iter().all(|name| crate::tools::available(name)) {
        return;
    }
    let folder = tempfile::tempdir().expect("a folder");
    let path = folder.path().join("sample.pdf");
    std::fs::write(&path, sample_pdf()).expect("written");
    let run = |program: &str, arguments: &[&str]| {
        let output = Command::new(program)
            .current_dir(folder.path())
            .args(arguments)
            .output()
            .unwrap_or_else(|problem| panic!("{program}: {problem}"));
        assert!(output.status.success(), "{program} {arguments:?}: {output:?}");
        String::from_utf8_lossy(&output.stdout).into_owned()
    };
    run("qpdf", &["--check", "sample.pdf"]);
    let list = run("pdfdetach", &["-list", "sample.pdf"]);
    assert!(list.starts_with("3 embedded files\n"), "{list}");
    assert!(list.contains("Größe und Maß.csv"), "{list}");
    let info = run("pdfinfo", &["sample.pdf"]);
    assert!(info.contains("Tagged:          yes"), "{info}");
    run("pdfdetach", &["-save", "3", "-o", "detached", "sample.pdf"]);
    let detached = std::fs::read(folder.path().join("detached")).expect("detached");
    assert!(detached == of_the_sample()[2].bytes);

    run("qpdf", &["--object-streams=generate", "sample.pdf", "compact.pdf"]);
    let rewritten = std::fs::read(folder.path().join("compact.pdf")).expect("rewritten");
    assert!(attachments(&rewritten) == Ok(of_the_sample()), "by qpdf");
    run("qpdf", &["--linearize", "sample.pdf", "linear.pdf"]);
    let rewritten = std::fs::read(folder.path().join("linear.pdf")).expect("rewritten");
    assert!(attachments(&rewritten) == Ok(of_the_sample()), "by qpdf");
    run("qpdf", &["--encrypt", "", "owner", "256", "--", "sample.pdf", "locked.pdf"]);
    let locked = std::fs::read(folder.path().join("locked.pdf")).expect("locked");
    assert_eq!(attachments(&locked), Err(RecordError::Encrypted));
}
