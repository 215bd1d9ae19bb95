use proptest::prelude::*;
use sufficit::record::markdown::{embed, extract};
use sufficit::record::{Attachment, RecordError};

const SPEC: &str =
    "sufficit: 1\ntitle: a `plan` with ```` fences\n```yaml\nx: 1\n```\n~~~\n\tend\n";

fn one(name: &str, role: &str, bytes: &[u8]) -> Vec<Attachment> {
    vec![Attachment { name: name.to_owned(), role: role.to_owned(), bytes: bytes.to_vec() }]
}

#[test]
fn text_stands_as_it_is_behind_a_longer_fence() {
    let block = embed("study.yaml", "spec", SPEC.as_bytes());
    assert_eq!(
        block,
        format!(
            "````` {{.yaml .sufficit-input file=\"study.yaml\" holds=\"spec\" encoding=\"text\"}}\n\
             {SPEC}`````\n"
        )
    );
    assert_eq!(extract(&block), Ok(one("study.yaml", "spec", SPEC.as_bytes())));
}

#[test]
fn other_bytes_stand_in_base64() {
    let cases: [&[u8]; 8] = [
        b"",
        b"no line end",
        b"dos\r\n",
        b"bare\rcr\n",
        "\u{feff}bom\n".as_bytes(),
        b"nul\0\n",
        b"\xff\xfe\n",
        "line\u{2028}separator\n".as_bytes(),
    ];
    for bytes in cases {
        let block = embed("data.bin", "data", bytes);
        assert!(block.starts_with("``` {.text .sufficit-input "), "{block}");
        assert!(block.contains("encoding=\"base64\""), "{block}");
        assert_eq!(extract(&block), Ok(one("data.bin", "data", bytes)));
    }
    let long = embed("data.bin", "data", &[0xAB; 1000]);
    assert!(long.lines().skip(1).all(|line| line.len() <= 76));
}

#[test]
fn names_cannot_leave_the_opening_line() {
    let name = "a\"b`c}\n```\n<x> & é 一 \\ %41 ../../etc/passwd \u{202e}";
    let block = embed(name, "spec", b"x\n");
    assert_eq!(block.lines().count(), 3);
    assert_eq!(extract(&block), Ok(one(name, "spec", b"x\n")));
}

#[test]
fn blocks_are_found_among_other_text_and_line_ends() {
    let document = format!(
        "# Title\n\n```sh\nsufficit report study.yaml\n```\n\n{}\ntext\n\n{}\n",
        embed("study.yaml", "spec", SPEC.as_bytes()),
        embed("pilot.csv", "data", b"a,b\n1,2\n"),
    );
    let expected =
        [one("study.yaml", "spec", SPEC.as_bytes()), one("pilot.csv", "data", b"a,b\n1,2\n")]
            .concat();
    assert_eq!(extract(&document).as_ref(), Ok(&expected));
    assert_eq!(extract(&document.replace('\n', "\r\n")), Ok(expected));
    assert_eq!(extract("no block\n"), Ok(Vec::new()));
}

#[test]
fn a_block_inside_another_block_does_not_count() {
    let inner = embed("study.yaml", "spec", b"x\n");
    for (open, close) in [("~~~", "~~~"), ("````text", "````"), ("  `````", " `````")] {
        let document = format!("{open}\n{inner}{close}\n");
        assert_eq!(extract(&document), Ok(Vec::new()), "{document}");
    }
    let holder = embed("outer.md", "data", inner.as_bytes());
    assert_eq!(extract(&holder), Ok(one("outer.md", "data", inner.as_bytes())));
}

#[test]
fn hostile_markdown_gives_an_error() {
    let good = embed("study.yaml", "spec", b"x: 1\n");
    let packed = embed("study.yaml", "spec", b"\0\0\0\0");
    let changed = [
        good.replace("```\n", ""),
        good.replace("encoding=\"text\"", "encoding=\"rot13\""),
        good.replace(" holds=\"spec\"", ""),
        good.replace("study.yaml", "study%2.yaml"),
        good.replace("study.yaml", "study%zz.yaml"),
        good.replace("study.yaml", "study%ff.yaml"),
        good.replace("study.yaml", "study%61.yaml"),
        good.replace("study.yaml", "study plan.yaml"),
        good.replace("study.yaml", "%é"),
        good.replace("study.yaml", "%a一"),
        good.replace("study.yaml", "a%"),
        good.replace("``` {", " ``` {"),
        good.replace("{.yaml ", "{"),
        good.replace("{.yaml ", "{.YAML "),
        good.replace("``` {", "```{"),
        good.replace("```", "~~~"),
        good.replace("x: 1\n", ""),
        packed.replace("AAA", "A!A"),
        packed.replace("==", "="),
        packed.replace("==", ""),
        format!("{good}{good}"),
        format!("{good}{}", good.replace("x: 1", "x: 2")),
    ];
    for document in changed {
        assert!(document != good && document != packed, "nothing was changed");
        assert!(extract(&document).is_err(), "{document}");
    }
    let many: String = (0..201).map(|i| embed(&format!("{i}"), "data", b"x\n")).collect();
    assert!(matches!(extract(&many), Err(RecordError::TooLarge { .. })));
    let large = embed("large", "data", &vec![0; 17 * 1024 * 1024]);
    assert!(matches!(extract(&large), Err(RecordError::TooLarge { .. })));
}

#[test]
fn an_error_points_at_the_opening_line() {
    let document = format!("a\n\n{}", embed("a", "spec", b"\0").replace("AA==", "?"));
    assert_eq!(
        extract(&document).expect_err("damaged").to_string(),
        "line 3 of the Markdown: the base64 of an input file is damaged"
    );
}

/// Needs pandoc: the block converts without a warning, and its code is whole.
#[test]
fn pandoc_shows_the_block_as_code() {
    if !crate::tools::available("pandoc") {
        return;
    }
    let path = std::env::temp_dir().join(format!("sufficit-block-{}.md", std::process::id()));
    std::fs::write(&path, embed("study plan.yaml", "spec", SPEC.as_bytes())).expect("written");
    let run = std::process::Command::new("pandoc")
        .args(["--from", "markdown", "--to", "json", "--fail-if-warnings"])
        .arg(&path)
        .output()
        .expect("pandoc runs");
    std::fs::remove_file(&path).expect("removed");
    assert!(run.status.success(), "{}", String::from_utf8_lossy(&run.stderr));
    let tree: serde_json::Value = serde_json::from_slice(&run.stdout).expect("JSON");
    let block = &tree["blocks"][0];
    assert_eq!(block["t"], "CodeBlock");
    assert_eq!(
        block["c"][0],
        serde_json::json!([
            "",
            ["yaml", "sufficit-input"],
            [["file", "study%20plan.yaml"], ["holds", "spec"], ["encoding", "text"]]
        ])
    );
}

proptest! {
    #[test]
    fn any_bytes_survive(
        bytes in prop::collection::vec(any::<u8>(), 0..400),
        name in any::<String>(),
        role in any::<String>(),
    ) {
        let block = embed(&name, &role, &bytes);
        prop_assert_eq!(extract(&block), Ok(one(&name, &role, &bytes)));
    }

    #[test]
    fn any_text_survives_among_other_text(
        lines in prop::collection::vec("[`~ \t]{0,9}[a-z{}\"=.%\r]{0,6}|.{0,20}", 0..12),
        before in "[a-z ]{0,20}",
    ) {
        let text = lines.join("\n") + "\n";
        let document = format!("{before}\n{}\nafter\n", embed("a.yaml", "spec", text.as_bytes()));
        prop_assert_eq!(extract(&document), Ok(one("a.yaml", "spec", text.as_bytes())));
    }

    #[test]
    fn any_text_is_read_without_a_panic(
        text in "(```|~~~|[a-z {}\"=%\n]|\\.sufficit-input file=\"|\" holds=\"|\" encoding=\"text\"\\}|.){0,80}",
    ) {
        let _ = extract(&text);
    }

    #[test]
    fn a_changed_byte_never_passes_for_another_name_twice(
        at in 0_usize..80, byte in 0_u8..128,
    ) {
        let mut block = embed("study.yaml", "spec", b"x: 1\n").into_bytes();
        if let Some(place) = block.get_mut(at) {
            *place = byte;
        }
        let text = String::from_utf8(block).expect("ASCII");
        if let Ok(found) = extract(&text) {
            prop_assert!(found.len() <= 1);
        }
    }
}
