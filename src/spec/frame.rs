//! A problem drawn under the line of the file that it is about.

use std::collections::BTreeMap;
use std::ops::Range;

use ariadne::{Color, Config, Label, Report, ReportKind, Source};

use super::problems::Located;
use super::text::{self, Text};

/// Longest line that is shown whole, in characters.
const WIDEST: usize = 110;

/// Longest line of a way out, in characters.
const WIDEST_HELP: usize = 90;

/// Characters kept before the fault when a longer line is cut.
const KEPT_BEFORE: usize = 40;

/// Draws a problem, ending with a line end.
pub(super) fn draw(name: &str, text: &Text, problem: &Located, colour: bool) -> String {
    let name = text::printable(name, 200);
    let mut canvas = Canvas::default();
    canvas.show(text, problem.line, problem.column);
    if let Some(also) = &problem.also {
        canvas.show(text, also.line, also.column);
    }
    canvas.widen(problem.line, problem.column);
    let label = |line: usize, column: usize, length: usize, words: &str, tint: Color| {
        let words = if words.is_empty() { "here".to_owned() } else { text::printable(words, 300) };
        let label = Label::new((name.clone(), canvas.span(line, column, length)));
        (line, label.with_message(words).with_color(tint))
    };
    let mut labels =
        vec![label(problem.line, problem.column, problem.length, &problem.place, Color::Red)];
    if let Some(also) = &problem.also {
        labels.push(label(also.line, also.column, also.length, &also.words, Color::Cyan));
    }
    // Labels in the order of lines share one frame.
    labels.sort_by_key(|(line, _)| *line);
    let head = canvas.head(problem.line, problem.column);
    let mut report = Report::build(ReportKind::Error, (name.clone(), head..head + 1))
        .with_config(Config::default().with_color(colour))
        .with_message(text::printable(&problem.reason, 2000))
        .with_labels(labels.into_iter().map(|(_, label)| label));
    if let Some(help) = &problem.help {
        let lines: Vec<_> =
            help.lines().map(|line| wrapped(&text::printable(line, 2000))).collect();
        report = report.with_help(lines.join("\n"));
    }
    let mut bytes = Vec::new();
    match report.finish().write((name, Source::from(canvas.text())), &mut bytes) {
        Ok(()) => without_trailing_spaces(&String::from_utf8_lossy(&bytes)),
        Err(error) => format!("Error: {} ({error})\n", text::printable(&problem.reason, 2000)),
    }
}

/// A line broken between words so that it fits beside the margin.
fn wrapped(line: &str) -> String {
    let mut broken = String::new();
    let mut width = 0;
    for word in line.split(' ') {
        let length = word.chars().count();
        if width > 0 && width + 1 + length > WIDEST_HELP {
            broken.push('\n');
            width = 0;
        } else if !broken.is_empty() {
            broken.push(' ');
            width += 1;
        }
        broken.push_str(word);
        width += length;
    }
    broken
}

fn without_trailing_spaces(drawn: &str) -> String {
    drawn.lines().flat_map(|line| [line.trim_end(), "\n"]).collect()
}

/// The lines that are shown, at their numbers; all others are empty.
#[derive(Default)]
struct Canvas {
    lines: BTreeMap<usize, Cut>,
}

/// A line, safe for a terminal, cut around a fault when it is long.
struct Cut {
    shown: String,
    /// Characters of the line that are cut away at its beginning.
    before: usize,
    /// Characters that stand for what was cut away.
    ellipsis: usize,
    /// Characters that are shown, without the padding.
    width: usize,
}

impl Cut {
    fn around(line: &str, column: usize) -> Self {
        let total = line.chars().count();
        if total <= WIDEST {
            let shown: String = line.chars().map(text::visible).collect();
            return Self { shown, before: 0, ellipsis: 0, width: total };
        }
        let before = column.saturating_sub(KEPT_BEFORE).min(total.saturating_sub(WIDEST));
        let middle: String = line.chars().map(text::visible).skip(before).take(WIDEST).collect();
        let lead = if before > 0 { "…" } else { "" };
        let tail = if before + WIDEST < total { "…" } else { "" };
        let ellipsis = lead.chars().count();
        let width = ellipsis + middle.chars().count();
        Self { shown: format!("{lead}{middle}{tail}"), before, ellipsis, width }
    }

    /// Where a column of the line stands in what is shown.
    fn place(&self, column: usize) -> usize {
        (column.saturating_sub(1).saturating_sub(self.before) + self.ellipsis).min(self.width)
    }
}

impl Canvas {
    fn show(&mut self, text: &Text, line: usize, column: usize) {
        self.lines.entry(line).or_insert_with(|| Cut::around(text.line(line), column));
    }

    /// The frame's head tells the column by counting characters of the line as it is shown. Spaces at its end, which
    /// are not drawn, make room for the true column of a line that was cut, and for a place at the end of a line.
    fn widen(&mut self, line: usize, column: usize) {
        if let Some(cut) = self.lines.get_mut(&line) {
            let missing = (column + 1).saturating_sub(cut.shown.chars().count());
            cut.shown.push_str(&" ".repeat(missing));
        }
    }

    fn offset(&self, line: usize) -> usize {
        let shown: usize = self.lines.range(..line).map(|(_, cut)| cut.shown.chars().count()).sum();
        shown + line.saturating_sub(1)
    }

    fn head(&self, line: usize, column: usize) -> usize {
        self.offset(line) + column.saturating_sub(1)
    }

    fn span(&self, line: usize, column: usize, length: usize) -> Range<usize> {
        let start = self.lines.get(&line).map_or(0, |cut| cut.place(column));
        let end = self.lines.get(&line).map_or(0, |cut| cut.place(column + length)).max(start + 1);
        let offset = self.offset(line);
        offset + start..offset + end
    }

    fn text(&self) -> String {
        let last = self.lines.keys().next_back().copied().unwrap_or(1);
        let line = |number: usize| self.lines.get(&number).map_or("", |cut| cut.shown.as_str());
        (1..=last).flat_map(|number| [line(number), "\n"]).collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::spec::problems::Mark;

    fn problem(line: usize, column: usize, length: usize) -> Located {
        Located {
            line,
            column,
            length,
            path: "risk.power".to_owned(),
            place: "risk.power".to_owned(),
            offending: String::new(),
            reason: "the power is 80".to_owned(),
            help: Some("write 0.8".to_owned()),
            also: None,
        }
    }

    #[test]
    fn a_frame_shows_line_column_and_way_out() {
        let (text, _) = Text::decode(b"a: 1\nrisk: {power: 80}\n");
        let drawn = draw("study.yaml", &text, &problem(2, 15, 2), false);
        let expected = "\
Error: the power is 80
   ╭─[ study.yaml:2:15 ]
   │
 2 │ risk: {power: 80}
   │               ─┬
   │                ╰── risk.power
   │
   │ Help: write 0.8
───╯
";
        assert_eq!(drawn, expected);
    }

    #[test]
    fn long_lines_are_cut_and_keep_their_true_column() {
        let line = format!("a: [{}, x, {}]", "1, ".repeat(5000), "2, ".repeat(5000));
        let (text, _) = Text::decode(line.as_bytes());
        let column = line.find('x').map_or(0, |at| at + 1);
        let drawn = draw("study.yaml", &text, &problem(1, column, 1), false);
        assert!(drawn.contains(&format!("study.yaml:1:{column} ]")), "{drawn}");
        assert!(drawn.lines().all(|l| l.chars().count() < 130), "{drawn}");
        let above = drawn.lines().position(|l| l.contains('┬')).unwrap_or(1);
        let lines: Vec<Vec<char>> = drawn.lines().map(|l| l.chars().collect()).collect();
        let mark = lines[above].iter().position(|c| *c == '┬').unwrap_or(0);
        assert_eq!(lines[above - 1][mark], 'x', "{drawn}");
    }

    #[test]
    fn two_places_share_a_frame_in_either_order() {
        let (text, _) = Text::decode(b"a: 1\nb: 2\na: 3");
        let also = |line| Some(Mark { line, column: 1, length: 1, words: "first here".to_owned() });
        let drawn = draw("s", &text, &Located { also: also(1), ..problem(3, 1, 1) }, false);
        assert_eq!(drawn.matches("s:3:1").count(), 1, "{drawn}");
        assert!(drawn.contains("first here") && drawn.contains("1 │ a: 1"), "{drawn}");
        let drawn = draw("s", &text, &Located { also: also(3), ..problem(1, 1, 1) }, false);
        assert_eq!(drawn.matches("╭─[ s:1:1 ]").count(), 1, "{drawn}");
    }

    #[test]
    fn a_terminal_obeys_nothing_in_a_frame() {
        let (text, _) = Text::decode("a: \u{1b}[2J\u{202e}x\n".as_bytes());
        let drawn = draw(
            "x\u{7}.yaml",
            &text,
            &Located { reason: "\u{1b}[1m".into(), ..problem(1, 9, 1) },
            false,
        );
        assert!(!drawn.contains(['\u{1b}', '\u{7}', '\u{202e}']), "{drawn:?}");
        assert!(draw("x", &text, &problem(1, 1, 1), true).contains('\u{1b}'));
    }

    #[test]
    fn places_beyond_the_text_are_drawn_all_the_same() {
        let (text, _) = Text::decode(b"");
        assert!(draw("x", &text, &problem(1, 1, 1), false).contains("x:1:1"));
        assert!(draw("x", &text, &problem(7, 9, 3), false).contains("x:7:9"));
    }
}
