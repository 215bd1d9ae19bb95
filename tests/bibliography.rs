//! The reference list as a user meets it: numbering, layout, and what the author's own file may hold.

use std::time::{Duration, Instant};

use sufficit::bibliography::{Bibliography, BibliographyError, MAX_AUTHOR_BYTES, Reference};

fn list(author: Option<&str>, keys: &[&str]) -> Result<Vec<Reference>, BibliographyError> {
    let keys: Vec<String> = keys.iter().map(|key| (*key).to_owned()).collect();
    Bibliography::with_author(author)?.vancouver(&keys)
}

fn texts(author: Option<&str>, keys: &[&str]) -> Vec<String> {
    match list(author, keys) {
        Ok(list) => list.iter().map(Reference::text).collect(),
        Err(error) => panic!("{error}"),
    }
}

fn error(author: &str) -> BibliographyError {
    match Bibliography::with_author(Some(author)) {
        Ok(_) => panic!("accepted: {author:.60}"),
        Err(error) => error,
    }
}

/// Layouts after *Citing Medicine* (US National Library of Medicine, 2nd ed., 2007): journal article, book,
/// more than six authors, corporate author, particle of a name, chapter.
#[test]
fn references_read_as_vancouver_style_asks() {
    let keys = [
        "lenth-1989",
        "cohen-1988",
        "arrive-2020",
        "ich-e9-1998",
        "van-zwet-cator-2021",
        "lazic-2018",
        "directive-2010-63",
        "tukey-1953",
    ];
    let expected = [
        "Lenth RV. Algorithm AS 243: cumulative distribution function of the non-central t distribution. \
         Appl Stat. 1989;38(1):185–9. doi:10.2307/2347693",
        "Cohen J. Statistical Power Analysis for the Behavioral Sciences. 2nd ed. Lawrence Erlbaum Associates; 1988.",
        "Percie du Sert N, Hurst V, Ahluwalia A, Alam S, Avey MT, Baker M, et al. The ARRIVE guidelines 2.0: \
         updated guidelines for reporting animal research. PLoS Biol. 2020;18(7):e3000410. \
         doi:10.1371/journal.pbio.3000410",
        "International Conference on Harmonisation. Statistical Principles for Clinical Trials (ICH Harmonised \
         Tripartite Guideline E9). 1998.",
        "van Zwet EW, Cator EA. The significance filter, the winner’s curse and the need to shrink. Stat Neerl. \
         2021;75(4):437–52. doi:10.1111/stan.12241",
        "Lazic SE, Clarke-Williams CJ, Munafò MR. What exactly is ‘N’ in cell culture and animal experiments? \
         PLoS Biol. 2018;16(4):e2005282. doi:10.1371/journal.pbio.2005282",
        "European Parliament, Council of the European Union. Directive 2010/63/EU on the protection of animals \
         used for scientific purposes. Official Journal of the European Union. 2010;L 276:33–79.",
        "Tukey JW. The problem of multiple comparisons. In: Braun HI, editor. The Collected Works of John W. \
         Tukey. Volume VIII, Multiple Comparisons: 1948–1983. New York: Chapman & Hall; 1953. pp. 1–300.",
    ];
    assert_eq!(texts(None, &keys), expected);
}

#[test]
fn numbers_follow_the_order_of_citation_and_repeats_are_listed_once()
-> Result<(), BibliographyError> {
    let cited = ["lenth-1989", "cohen-1988", "lenth-1989", "button-2013"];
    let list = list(None, &cited)?;
    let got: Vec<(usize, &str)> = list.iter().map(|r| (r.number, r.key.as_str())).collect();
    assert_eq!(got, [(1, "lenth-1989"), (2, "cohen-1988"), (3, "button-2013")]);
    Ok(())
}

#[test]
fn every_reference_of_the_program_has_text_and_a_clean_link() -> Result<(), BibliographyError> {
    let bibliography = Bibliography::with_author(None)?;
    let keys: Vec<String> = bibliography.keys().map(str::to_owned).collect();
    assert!(keys.len() > 100);
    for reference in bibliography.vancouver(&keys)? {
        let text = reference.text();
        for slip in ["..", " .", " ;", " ,", "  ", "?.", ";;", ": ;", "None", "doi: "] {
            assert!(!text.contains(slip), "{}: {slip:?} in {text}", reference.key);
        }
        assert_eq!(text.trim(), text);
        for url in reference.runs.iter().filter_map(|run| run.url.as_deref()) {
            assert!(url.starts_with("https://"), "{url}");
            assert!(!url.contains(['<', '>', '"', ' ']), "{url}");
        }
    }
    Ok(())
}

#[test]
fn nothing_cited_gives_an_empty_list_and_an_unknown_key_an_error() -> Result<(), BibliographyError>
{
    assert!(list(None, &[])?.is_empty());
    let unknown = list(None, &["nobody-1900"]);
    assert!(
        unknown.is_err_and(|error| error.reason.contains("`nobody-1900`") && error.line.is_none())
    );
    Ok(())
}

const PILOT: &str = "\
pilot-2030:
  type: report
  title: 'Pilot <b>on</b> #regrowth *now* $x$ @y [a](b) {{ 7*7 }} \\'
  author: Example, A.
  date: 2030
  url: https://example.org/a?b=c
";

#[test]
fn the_author_s_references_join_the_program_s_and_stay_literal() -> Result<(), BibliographyError> {
    let bibliography = Bibliography::with_author(Some(PILOT))?;
    assert!(bibliography.contains("pilot-2030") && bibliography.contains("lenth-1989"));
    assert_eq!(bibliography.author_keys().collect::<Vec<_>>(), ["pilot-2030"]);
    let text = texts(Some(PILOT), &["pilot-2030"]).concat();
    for piece in ["<b>on</b>", "#regrowth", "*now*", "$x$", "@y", "[a](b)"] {
        assert!(text.contains(piece), "{piece} missing in {text}");
    }
    Ok(())
}

#[test]
fn what_is_wrong_in_the_author_s_file_is_located() {
    let cases = [
        (
            "a:\n  type: book\n  title: T\nlenth-1989:\n  type: book\n  title: T\n",
            4,
            "belongs to a reference of the program",
        ),
        ("a:\n  type: book\n  title: T\na:\n  type: book\n  title: U\n", 4, "more than once"),
        ("a:\n  type: book\n  titel: T\n", 3, "no field `titel`"),
        ("a:\n  type: book\nb:\n  type: book\n  title: T\n", 1, "has no `title`"),
        (
            "a:\n  type: book\n  title: T\n  url: javascript:alert(1)\n",
            4,
            "must begin with `https://`",
        ),
        ("a:\n  type: book\n  title: \"bell \\u0007\"\n", 3, "U+0007"),
        ("a:\n  type: book\n  title: \u{202e}T\n", 3, "U+202E"),
        ("a b:\n  type: book\n  title: T\n", 1, "is no key"),
        ("a:\n  type: book\n  title: T\n  volume: [1\n", 5, "cannot be read"),
        ("a:\n  type: poem\n  title: T\n", 2, "use one of article, chapter"),
        ("a:\n  type: book\n  title: T\n  date: yesterday\n", 4, ""),
        ("a:\n  type: book\n  title: !x T\n", 3, "tags"),
    ];
    for (yaml, line, reason) in cases {
        let found = error(yaml);
        assert!(found.reason.contains(reason), "{yaml}\n{found}");
        assert!(
            found.line.is_some_and(|l| l.abs_diff(line) <= 1),
            "{yaml}\nline {line} expected: {found}"
        );
        assert!(!found.reason.contains("invalid type"), "{found}");
    }
    for empty in ["", "\n", "# nothing\n", "- a\n", "text", "3", "a:\n"] {
        error(empty);
    }
}

#[test]
fn hostile_files_are_refused_at_once() {
    let mut bomb = String::from("a0: &a0 [x, x, x, x, x, x, x, x, x, x]\n");
    for level in 1..40 {
        let below = format!("*a{}, ", level - 1).repeat(10);
        bomb.push_str(&format!("a{level}: &a{level} [{below}]\n"));
    }
    let wide = format!(
        "a:\n  type: book\n  title: T\n  note: &n [{}]\n  genre: [{}]\n",
        "x,".repeat(50_000),
        "*n,".repeat(50_000)
    );
    let deep = format!("a: {}{}", "[".repeat(800), "x],".repeat(60_000));
    let parents =
        format!("a: {}title: T{}", "{type: book, parent: ".repeat(1_900), "}".repeat(1_900));
    let brackets = format!("a: {}", "[".repeat(200_000));
    let tokens = format!("a: {}{}", "[".repeat(800), "x,".repeat(120_000));
    let huge = format!("a:\n  title: {}\n", "x".repeat(MAX_AUTHOR_BYTES));
    let long = format!("a:\n  type: book\n  title: {}\n", "x".repeat(100_000));
    let nul = "a:\n  type: book\n  title: \0\n".to_owned();
    for text in [bomb, wide, deep, brackets, tokens, parents, huge, long, nul] {
        let start = Instant::now();
        let found = error(&text);
        assert!(start.elapsed() < Duration::from_secs(1), "{found}");
        assert!(found.reason.len() < 600, "{}", found.reason.len());
    }
}

/// Odd but legal values must render or be refused, never crash the engine.
#[test]
fn odd_values_do_not_crash_the_list() {
    let values = [
        "''",
        "' '",
        "-",
        "0",
        "-1",
        "99999999999999999999",
        "1e400",
        "'1-0'",
        "'–'",
        "'5-3, 9'",
        "[]",
        "{}",
        "null",
        "true",
        "2020-13-45",
        "'-0044'",
        "'12345-01'",
        "'~1900'",
        "'a, b, c, d'",
        "',,,'",
        "'{{{'",
        "'$'",
        "'$$$'",
        "'\\'",
        "'é̂́'",
        "'日本語, 山田'",
        "{value: '', short: ''}",
        "{name: ''}",
        "'. ; ? !'",
        "'???'",
    ];
    let fields = [
        "title",
        "author",
        "editor",
        "date",
        "volume",
        "issue",
        "edition",
        "page-range",
        "page-total",
        "publisher",
        "location",
        "chapter",
        "serial-number",
        "language",
        "note",
        "genre",
        "organization",
        "runtime",
    ];
    let kinds =
        ["article", "book", "web", "thesis", "legislation", "chapter", "misc", "conference"];
    let mut rendered = 0;
    for kind in kinds {
        for field in fields {
            for value in values {
                let title = if field == "title" { "" } else { "  title: T\n" };
                let yaml = format!(
                    "a:\n  type: {kind}\n{title}  {field}: {value}\n  parent:\n    type: periodical\n    title: J\n"
                );
                if let Ok(bibliography) = Bibliography::with_author(Some(&yaml)) {
                    rendered += usize::from(bibliography.vancouver(&["a".to_owned()]).is_ok());
                }
            }
        }
    }
    assert!(rendered > 1000, "{rendered}");
}

/// As many references as anybody cites, in the style with the most brackets, are no bomb.
#[test]
fn a_long_and_honest_file_is_read() {
    let entry = |i: u32| {
        format!(
            "ref-{i}: {{type: article, title: 'T {i}', author: ['A, B.', {{name: C}}], date: 2000,\n  \
             serial-number: {{doi: '10.1000/{i}'}}, parent: {{type: periodical, title: {{value: J, short: K}}}}}}\n"
        )
    };
    let text: String = (0..700).map(entry).collect();
    match Bibliography::with_author(Some(&text)) {
        Ok(bibliography) => assert_eq!(bibliography.author_keys().count(), 700),
        Err(error) => panic!("{error}"),
    }
}
