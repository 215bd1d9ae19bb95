//! Data in CSV files beside the spec.

use super::{problems, sound, with};

fn values(file: &str, keys: &str) -> Vec<f64> {
    let text = with("spread: 0.8", &format!("spread: {{file: data.csv, {keys}}}"));
    let loaded = sound(&text, &[("data.csv", file)]);
    match &loaded.study.experiments[0].problem.spread().expect("a spread").origin {
        sufficit::designs::inputs::SpreadOrigin::Column { values, .. } => values.clone(),
        other => panic!("{other:?}"),
    }
}

fn refused(file: &str, keys: &str) -> String {
    let text = with("spread: 0.8", &format!("spread: {{file: data.csv, {keys}}}"));
    let problems = problems(&text, &[("data.csv", file)]);
    let [problem] = problems.problems() else { panic!("{problems}") };
    format!("{}: {}", problem.path, problem.reason)
}

#[test]
fn separators_are_found_by_the_headings() {
    for file in [
        "a,b\n1,2\n3,4\n",
        "a;b\n1;2\n3;4\n",
        "a\tb\n1\t2\n3\t4\n",
        "\"a\",\"b;c;d\"\n1,2\n3,4\n",
        "a\n1\n3\n",
    ] {
        assert_eq!(values(file, "column: a"), [1.0, 3.0], "{file:?}");
    }
}

#[test]
fn line_ends_marks_blanks_and_quotes_are_as_programs_write_them() {
    for file in [
        "\u{FEFF}a,b\r\n1,x\r\n3,y\r\n",
        "a,b\r1,x\r3,y",
        "\n\na,b\n\n1,x\n   \n,\n3,y\n\n",
        " a , b \n 1 , x\n\t3,y",
        "\"a\",\"b\"\n\"1\",\"x, \"\"z\"\"\nsecond line\"\n3,y\n",
        "a,b\n1e0,x\n+3.0,y\n",
    ] {
        assert_eq!(values(file, "column: a"), [1.0, 3.0], "{file:?}");
    }
}

#[test]
fn rows_are_kept_by_text_or_by_number() {
    let file = "x,group,batch,wild\n1,a b,01,true\n2,a b,2,false\n3,c,1,true\n4,a  b,1.0,true\n";
    assert_eq!(values(file, "column: x, where: {group: a b}"), [1.0, 2.0, 4.0]);
    assert_eq!(values(file, "column: x, where: {batch: 1}"), [1.0, 3.0, 4.0]);
    assert_eq!(values(file, "column: x, where: {wild: true, group: 'a b'}"), [1.0, 4.0]);
}

#[test]
fn only_rows_that_are_kept_need_a_number() {
    let file = "x,group\n1,a\nn/a,b\n2,a\n";
    assert_eq!(values(file, "column: x, where: {group: a}"), [1.0, 2.0]);
    let said = refused(file, "column: x");
    assert_eq!(
        said,
        "experiments[0].spread.column: line 3 of data.csv holds `n/a`, which is no number, in the column `x`"
    );
}

#[test]
fn no_cell_is_taken_for_a_number_that_is_none() {
    for cell in [
        "nan",
        "inf",
        "-Infinity",
        "1e999",
        "0x10",
        "1,5",
        "1 000",
        "",
        "-",
        "5%",
        "1_000",
        "\u{2212}1",
    ] {
        let said = refused(&format!("x;y\n1;1\n{cell};1\n2;1\n"), "column: x");
        assert!(said.contains("line 3 of data.csv"), "{cell}: {said}");
    }
}

#[test]
fn lines_are_those_of_the_file() {
    let said = refused("\n\"x\",\"y\"\n1,\"two\nlines\"\n\n2,1\nz,1\n", "column: x");
    assert!(said.contains("line 7 of"), "{said}");
}

#[test]
fn ragged_rows_are_refused_even_where_the_column_is_there() {
    assert!(refused("x,y\n1,2\n3\n", "column: x").contains("line 3 of data.csv has 1 cells"));
    assert!(refused("x,y\n1,2,9\n", "column: x").contains("line 2 of data.csv has 3 cells"));
}

#[test]
fn nothing_in_a_file_is_obeyed_by_a_terminal() {
    let said = refused("x\n\u{1b}[2J\u{202e}\n1\n", "column: x");
    assert!(!said.contains(['\u{1b}', '\u{202e}']), "{said:?}");
    assert!(refused("x\n1\n\0\n", "column: x").contains("no text file"));
}

#[test]
fn a_file_that_is_no_table_is_refused() {
    assert!(refused("", "column: x").contains("is empty"));
    assert!(refused(" \n\n", "column: x").contains("is empty"));
    assert!(refused("x\n", "column: x").contains("no rows"));
    assert!(refused("x\n\n", "column: x, where: {x: 1}").contains("no rows"));
}

#[test]
fn the_spec_itself_is_no_data() {
    let text = with("spread: 0.8", "spread: {file: study.yaml, column: a}");
    let problems = problems(&text, &[("study.yaml", "a\n1\n2\n")]);
    assert!(problems.to_string().contains("`study.yaml` is the spec itself"));
}
