use sufficit::render::pdf::{
    FontSet, Job, Severity, TypstError, UnreadableFont, compile, export, forbidden_characters,
    missing_glyphs, pdf,
};

use crate::sample::{FIGURE, MAIN, job, sample_pdf};

const HEAD: &str = "#set document(title: \"t\", author: \"a\")\n#set text(lang: \"en\")\n";

fn attempt(body: &str, figure: &str) -> Result<Vec<u8>, TypstError> {
    let fonts = FontSet::embedded();
    let main = format!("{HEAD}{body}");
    pdf(&Job {
        main: &main,
        files: vec![("f.svg".to_owned(), figure.as_bytes().to_vec())],
        date: (2031, 3, 14),
        fonts: &fonts,
    })
}

fn contains(pdf: &[u8], text: &str) -> bool {
    pdf.windows(text.len()).any(|word| word == text.as_bytes())
}

#[test]
fn the_sample_conforms_without_a_warning() {
    let fonts = FontSet::embedded();
    let job = job(MAIN, &fonts);
    let compiled = compile(&job).expect("the sample is in order");
    assert_eq!(compiled.warnings, []);
    assert_eq!(compiled.pages(), 1);
    let pdf = export(&job, &compiled).expect("the sample conforms");
    // The standards' own marks: ISO 19005-3, 6.6.4; ISO 14289-1, clause 5.
    for mark in [
        "<pdfaid:part>3</pdfaid:part>",
        "<pdfaid:conformance>A</pdfaid:conformance>",
        "<pdfuaid:part>1</pdfuaid:part>",
        "/Marked true",
        "/Lang(en)",
        "/AFRelationship/Source",
        "/AFRelationship/Data",
        "/CreationDate(D:20310314120000Z)",
    ] {
        assert!(contains(&pdf, mark), "{mark} is missing");
    }
}

#[test]
fn equal_jobs_give_equal_bytes_for_any_number_of_threads() {
    let here = sample_pdf();
    for threads in [1, 4] {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().expect("a pool");
        assert!(pool.install(sample_pdf) == here, "{threads} threads");
    }
}

#[test]
fn another_attachment_or_date_gives_another_file() {
    let fonts = FontSet::embedded();
    let here = sample_pdf();
    let mut other = job(MAIN, &fonts);
    other.files[2].1.push(b'\n');
    assert!(pdf(&other).expect("in order") != here);
    let mut other = job(MAIN, &fonts);
    other.date = (2031, 3, 15);
    assert!(pdf(&other).expect("in order") != here);
}

#[test]
fn a_character_without_a_font_is_named_with_the_way_out() {
    let in_figure = FIGURE.replace("Units", "一");
    let as_entity = FIGURE.replace("Units", "&#x4e00;");
    let figure = "#image(\"f.svg\", alt: \"f\")";
    for (body, svg) in [
        ("#text(\"a一b\")", FIGURE),
        ("= A heading 一", FIGURE),
        ("#raw(\"一\")", FIGURE),
        ("#math.equation(alt: \"x\", $ x = 一 $)", FIGURE),
        (figure, in_figure.as_str()),
        (figure, as_entity.as_str()),
    ] {
        let error = attempt(body, svg).expect_err(body);
        assert_eq!(
            error.to_string(),
            "no font has the character 一 (U+4E00); \
             name a folder with a font that has it by `--fonts FOLDER`",
            "{body}"
        );
    }
}

#[test]
fn many_missing_characters_are_counted_not_listed() {
    let text: String = ('一'..='三').collect();
    let missing = missing_glyphs(&FontSet::embedded(), &text);
    assert_eq!(missing, text.chars().collect::<Vec<char>>());
    let message = TypstError::MissingGlyphs { characters: ('\u{4E00}'..='\u{4E20}').collect() };
    assert!(message.to_string().contains(" and 21 more; name a folder"));
}

#[test]
fn what_needs_no_glyph_is_not_missing() {
    let fonts = FontSet::embedded();
    let text = "plain\ttext\n\u{ad}\u{200b}\u{200d}\u{2060}\u{202f} − × ² α Δ ≥ µ Å ψ q\u{302}";
    assert_eq!(missing_glyphs(&fonts, text), Vec::<char>::new());
    assert_eq!(forbidden_characters(text), Vec::<char>::new());
}

#[test]
fn characters_that_an_archive_forbids_are_named() {
    let figure = FIGURE.replace("Units", "\u{7f}");
    for (body, svg, code) in [
        ("#text(\"a\u{feff}b\")", FIGURE, "U+FEFF"),
        ("#text(\"\u{e000}\")", FIGURE, "U+E000"),
        ("#text(\"\u{fffe}\")", FIGURE, "U+FFFE"),
        ("#text(\"\\u{1}\")", FIGURE, "U+0001"),
        ("#set document(title: \"a\\u{0}b\")\nx", FIGURE, "U+0000"),
        ("#image(\"f.svg\", alt: \"f\")", figure.as_str(), "U+007F"),
    ] {
        let error = attempt(body, svg).expect_err(body);
        assert_eq!(
            error.to_string(),
            format!("an archival PDF may not hold the character {code}; take it out of the text")
        );
    }
}

#[test]
fn a_broken_template_is_shown_with_place_line_and_calls() {
    let error = attempt("#let f(x) = x + \"a\"\n#f(1)", FIGURE).expect_err("broken");
    assert_eq!(
        error.to_string(),
        "error: cannot add integer and string\n  \
         in main.typ at 3:13\n  \
         3 | #let f(x) = x + \"a\"\n  \
         while calling `f` (main.typ:4)"
    );
}

#[test]
fn what_breaks_a_standard_is_refused() {
    for (body, part) in [
        ("#image(\"f.svg\")", "missing alt text"),
        ("$ x $", "missing alt text"),
        ("#pdf.attach(\"a\", bytes(\"x\"))", "mime type is missing"),
        ("#pdf.attach(\"a\", bytes(\"x\"))", "description is missing"),
    ] {
        let TypstError::Refused { diagnostics, .. } = attempt(body, FIGURE).expect_err(body) else {
            panic!("{body}: another error");
        };
        let hit = diagnostics.iter().find(|d| d.message.contains(part));
        let hit = hit.unwrap_or_else(|| panic!("{body}: {diagnostics:?}"));
        assert_eq!(hit.severity, Severity::Error);
        assert_eq!(hit.place.as_ref().map(|place| place.line), Some(3));
    }
}

#[test]
fn the_world_outside_the_job_is_out_of_reach() {
    for (body, part) in [
        ("#read(\"/etc/passwd\")", "file not found"),
        ("#read(\"../../etc/passwd\")", "would escape"),
        ("#import \"@preview/abc:0.1.0\": *", "packages are not available"),
        ("#datetime.today()", "unable to get the current date"),
        ("#plugin(\"f.svg\")", "failed to load WebAssembly"),
    ] {
        let error = attempt(body, FIGURE).expect_err(body).to_string();
        assert!(error.contains(part), "{body}: {error}");
    }
}

#[test]
fn an_unknown_font_family_is_a_warning() {
    let fonts = FontSet::embedded();
    let compiled = compile(&Job {
        main: "#set text(font: \"Nowhere Sans\")\nx",
        files: Vec::new(),
        date: (2031, 3, 14),
        fonts: &fonts,
    })
    .expect("compiles");
    let messages: Vec<&str> = compiled.warnings.iter().map(|w| &*w.message).collect();
    assert_eq!(messages, ["unknown font family: nowhere sans"]);
    assert_eq!(compiled.warnings[0].severity, Severity::Warning);
}

#[test]
fn a_job_out_of_order_is_refused() {
    let fonts = FontSet::embedded();
    let error = |files: &[&str], date| {
        pdf(&Job {
            main: &format!("{HEAD}x"),
            files: files.iter().map(|f| (f.to_string(), vec![])).collect(),
            date,
            fonts: &fonts,
        })
        .expect_err("out of order")
        .to_string()
    };
    let day = (2031, 3, 14);
    assert_eq!(error(&["../a"], day), "`../a` is not a path inside the document");
    assert_eq!(error(&["a\\b"], day), "`a\\b` is not a path inside the document");
    assert_eq!(error(&["a", "./a"], day), "two files of the document share the path `./a`");
    assert_eq!(error(&["main.typ"], day), "two files of the document share the path `main.typ`");
    assert_eq!(error(&[], (2031, 2, 29)), "2031-02-29 is not a date");
}

#[test]
fn further_fonts_are_taken_and_other_files_refused() {
    let font = typst_assets::fonts().next().expect("a font").to_vec();
    assert!(FontSet::embedded_with(vec![font.clone()]).is_ok());
    let refused = FontSet::embedded_with(vec![font, b"no font".to_vec()]);
    assert_eq!(refused.err(), Some(UnreadableFont { index: 1 }));
}
