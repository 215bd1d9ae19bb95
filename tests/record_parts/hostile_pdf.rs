use std::time::{Duration, Instant};

use sufficit::record::RecordError;
use sufficit::record::pdf_attachments::attachments;

use crate::made_pdf::{Made, bomb, catalogue, deflate, file, small, specification, stream, text};

/// Reads a hostile file: it must be refused, and within a moment.
fn refusal(pdf: &[u8]) -> String {
    let start = Instant::now();
    let error = attachments(pdf).expect_err("hostile");
    assert!(start.elapsed() < Duration::from_secs(10), "{error}");
    error.to_string()
}

#[test]
fn a_small_file_that_unpacks_to_a_large_one_is_refused() {
    let bomb = bomb(100);
    assert!(bomb.len() < 200 * 1024, "{}", bomb.len());
    assert_eq!(
        refusal(&small("/Filter/FlateDecode", &bomb)),
        "an unpacked file in the PDF exceeds the limit of 16 MiB"
    );
    let holder = "/Type/ObjStm/N 1/First 5/Filter/FlateDecode";
    let pdf = file(&[catalogue("[(a)2 0 R]"), stream(4, holder, &bomb)], "");
    let start = pdf.len();
    let table = "/Type/XRef/Size 5/Root 1 0 R/W[1 2 1]/Filter/FlateDecode";
    let (_, body) = stream(9, table, &bomb);
    let mut by_table = pdf;
    by_table.extend(b"9 0 obj\n");
    by_table.extend(body);
    by_table.extend(format!("\nendobj\nstartxref\n{start}\n%%EOF").bytes());
    assert_eq!(refusal(&by_table), "an unpacked file in the PDF exceeds the limit of 16 MiB");
}

#[test]
fn many_files_that_are_each_small_enough_are_refused_together() {
    let packed = bomb(15);
    let names: String = (0..10).map(|i| format!("({i}){} 0 R ", 10 + i)).collect();
    let mut objects = vec![catalogue(&format!("[{names}]"))];
    for i in 0..10 {
        objects.push(specification(10 + i, &format!("{i}"), 30 + i));
        objects.push(stream(30 + i, "/Filter/FlateDecode", &packed));
    }
    assert!(refusal(&file(&objects, "")).contains("exceeds the limit of"));
}

#[test]
fn circles_are_refused() {
    let cases: [&[Made]; 5] = [
        &[text(1, "1 0 R")],
        &[text(1, "2 0 R"), text(2, "1 0 R")],
        &[text(1, "<</Names<</EmbeddedFiles 2 0 R>>>>"), text(2, "<</Kids[2 0 R]>>")],
        &[
            text(1, "<</Names<</EmbeddedFiles 2 0 R>>>>"),
            text(2, "<</Kids[3 0 R]>>"),
            text(3, "<</Kids[2 0 R]>>"),
        ],
        &[
            catalogue("[(a)2 0 R]"),
            specification(2, "a", 3),
            text(3, "<</Length 3 0 R>>\nstream\nx\nendstream"),
        ],
    ];
    for objects in cases {
        refusal(&file(objects, ""));
    }
    let pdf = small("", b"x");
    let start = pdf.windows(6).rposition(|w| w == b"\nxref\n").expect("a table") + 1;
    let catalogue = [catalogue("[(a)2 0 R]")];
    assert!(refusal(&file(&catalogue, "/Prev 99999999")).contains("outside the file"));
    let circle =
        String::from_utf8_lossy(&pdf).replace("/Root 1 0 R", &format!("/Root 1 0 R/Prev {start}"));
    assert!(refusal(circle.as_bytes()).contains("circle"));
}

#[test]
fn deep_and_endless_values_are_refused() {
    for body in [
        "[".repeat(1_000_000),
        "<</a".repeat(1_000_000),
        "(".repeat(1_000_000),
        format!("[{}]", "1 ".repeat(200_000)),
        format!("({})", "x".repeat(100_000)),
        format!("/{}", "x".repeat(100_000)),
        "<</a 1".to_owned(),
        "<12".to_owned(),
        "<1x>".to_owned(),
        String::new(),
    ] {
        refusal(&file(&[text(1, &body)], ""));
    }
}

#[test]
fn endless_work_in_a_small_file_is_refused() {
    let names: String = (0..190).map(|i| format!("({i}) 2 0 R ")).collect();
    let (number, mut body) = specification(2, "a", 3);
    let blank = b" ".repeat(2_000_000);
    body.splice(0..0, blank);
    let objects = [catalogue(&format!("[{names}]")), (number, body), stream(3, "", b"x")];
    assert_eq!(
        refusal(&file(&objects, "")),
        "the work of reading the PDF exceeds the limit of 256 MiB"
    );
}

#[test]
fn too_many_files_and_double_names_are_refused() {
    let names: String = (0..201).map(|i| format!("({i}) 2 0 R ")).collect();
    let objects = [catalogue(&format!("[{names}]")), specification(2, "a", 3), stream(3, "", b"x")];
    assert_eq!(refusal(&file(&objects, "")), "the number of attachments exceeds the limit of 200");
    let objects = [
        catalogue("[(a)2 0 R(b)4 0 R]"),
        specification(2, "a", 3),
        stream(3, "", b"x"),
        specification(4, "a", 5),
        stream(5, "", b"y"),
    ];
    assert_eq!(
        refusal(&file(&objects, "")),
        "the document was altered: it holds two files named \"a\""
    );
}

#[test]
fn other_packings_are_refused_by_name() {
    for (entries, name) in [
        ("/Filter/LZWDecode", "\"LZWDecode\""),
        ("/Filter[/FlateDecode/FlateDecode]", "\"FlateDecode\", \"FlateDecode\""),
        ("/Filter/\u{1b}#5b31m", "\"\\u{1b}[31m\""),
    ] {
        assert_eq!(
            refusal(&small(entries, b"x")),
            format!("the PDF packs a stream by {name}, which is not read here")
        );
    }
}

#[test]
fn packed_streams_that_stop_early_or_are_changed_are_refused() {
    let packed = deflate(b"some text, some text, some more text");
    for end in 1..packed.len() {
        assert!(
            refusal(&small("/Filter/FlateDecode", &packed[..end])).contains("cannot be unpacked"),
            "{end}"
        );
    }
    let mut changed = packed.clone();
    *changed.last_mut().expect("bytes") ^= 1;
    assert!(refusal(&small("/Filter/FlateDecode", &changed)).contains("cannot be unpacked"));
    assert!(refusal(&small("/Params<</Size 2>>", b"x")).contains("not as long as it says"));
}

#[test]
fn what_is_no_whole_plain_pdf_is_named() {
    assert_eq!(attachments(b""), Err(RecordError::NotPdf));
    assert_eq!(attachments(b"PK\x03\x04"), Err(RecordError::NotPdf));
    assert_eq!(attachments(b"%PDF-1.7\n"), Err(RecordError::Truncated));
    let locked = file(&[catalogue("[]")], "/Encrypt 9 0 R");
    assert_eq!(attachments(&locked), Err(RecordError::Encrypted));
    let mut large = b"%PDF-1.7\n".to_vec();
    large.resize(65 * 1024 * 1024, b' ');
    assert_eq!(refusal(&large), "the PDF exceeds the limit of 64 MiB");
}

#[test]
fn names_stay_data() {
    let objects = [
        catalogue("[(a)2 0 R]"),
        specification(2, "../../etc/passwd\\000", 3),
        stream(3, "", b"x"),
    ];
    let found = attachments(&file(&objects, "")).expect("a name is no path");
    assert_eq!(found[0].name, "../../etc/passwd\0");
}
