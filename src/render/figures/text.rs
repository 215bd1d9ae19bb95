//! Lines of text that fit a given width.

use super::widths::width;

/// Text broken into lines.
#[derive(Clone, Debug)]
pub(super) struct Block {
    pub(super) lines: Vec<String>,
    pub(super) size: f64,
    pub(super) semibold: bool,
}

/// Distance of two baselines, as a multiple of the type size.
const LEADING: f64 = 1.18;
/// Text of this width, as a multiple of the type size, is not broken for want of room.
const SHORT: f64 = 6.0;
/// Height of capitals and figures, as a multiple of the type size.
pub(super) const CAPITALS: f64 = 0.66;
/// Depth of descenders, as a multiple of the type size.
const DESCENT: f64 = 0.24;

impl Block {
    /// Breaks `text` at spaces into lines of at most `room`, the fewest that hold it and of even length; words
    /// longer than a line are broken. From what does not fit on `most` lines the middle is left out.
    pub(super) fn new(text: &str, size: f64, semibold: bool, room: f64, most: usize) -> Self {
        // A line breaks at plain spaces alone, and never between a number and its per cent sign.
        let clean = text.split_ascii_whitespace().collect::<Vec<_>>().join(" ");
        let clean = clean.replace(" %", "\u{a0}%");
        let fits = |line: &str| width(line, size, semibold) <= room;
        let mut text = clean;
        let mut lines = break_lines(&text, &fits);
        if lines.len() > most {
            text = shortened(&text, most, &fits);
            lines = break_lines(&text, &fits);
        }
        if lines.len() > 1 {
            lines = evened(&text, lines, size, semibold, room);
        }
        Self { lines, size, semibold }
    }

    /// The text as [`new`](Self::new) sets it, then in narrower blocks of more lines, up to `most`, that hold all of it.
    pub(super) fn settings(
        text: &str,
        size: f64,
        semibold: bool,
        room: f64,
        most: usize,
    ) -> Vec<Self> {
        let widest = Self::new(text, size, semibold, room, most);
        let words = || widest.lines.iter().flat_map(|line| line.split(' '));
        let longest = words().map(|word| width(word, size, semibold)).fold(0.0, f64::max);
        let mut all = vec![widest.clone()];
        for part in (6..20).rev() {
            let narrower = widest.width() * f64::from(part) / 20.0;
            if narrower < longest.max(SHORT * size) {
                break;
            }
            let block = Self::new(text, size, semibold, narrower, most + 1);
            let known = all.last().map_or(0, |last| last.lines.len());
            if block.lines.len() > known && block.lines.len() <= most {
                all.push(block);
            }
        }
        all
    }

    pub(super) fn width(&self) -> f64 {
        self.lines.iter().map(|line| width(line, self.size, self.semibold)).fold(0.0, f64::max)
    }

    pub(super) fn leading(&self) -> f64 {
        self.size * LEADING
    }

    /// From the top of the capitals of the first line to the descenders of the last.
    pub(super) fn height(&self) -> f64 {
        let further = self.lines.len().saturating_sub(1) as f64;
        self.size * (CAPITALS + DESCENT) + further * self.leading()
    }
}

/// Fills lines from the left.
fn break_lines(text: &str, fits: &impl Fn(&str) -> bool) -> Vec<String> {
    let mut lines = Vec::new();
    let mut line = String::new();
    for word in text.split(' ') {
        let joined = if line.is_empty() { word.to_owned() } else { format!("{line} {word}") };
        if fits(&joined) {
            line = joined;
            continue;
        }
        if !line.is_empty() {
            lines.push(std::mem::take(&mut line));
        }
        // A word longer than a line is broken where it must.
        for character in word.chars() {
            line.push(character);
            if !fits(&line) && line.chars().count() > 1 {
                line.pop();
                lines.push(std::mem::take(&mut line));
                line.push(character);
            }
        }
    }
    if !line.is_empty() {
        lines.push(line);
    }
    lines
}

/// As much of both ends of the text as `most` lines hold, with an ellipsis for its middle: a label's first and last
/// words tell it from others.
fn shortened(text: &str, most: usize, fits: &impl Fn(&str) -> bool) -> String {
    let characters: Vec<char> = text.chars().collect();
    let (mut holds, mut beyond) = (0, characters.len());
    let mut best = ends(&characters, 0);
    while beyond - holds > 1 {
        let kept = holds + (beyond - holds) / 2;
        let attempt = ends(&characters, kept);
        if break_lines(&attempt, fits).len() <= most {
            holds = kept;
            best = attempt;
        } else {
            beyond = kept;
        }
    }
    best
}

/// Longest part of a word that is given up so that only whole words are kept.
const PART: usize = 14;

/// At most `kept` characters from both ends, whole words where they are not very long, and an ellipsis.
fn ends(characters: &[char], kept: usize) -> String {
    let last_word = characters.iter().rev().take_while(|c| **c != ' ').count();
    let tail = (kept / 2).max(last_word.min(kept * 2 / 3));
    let (before, after) = (kept.saturating_sub(tail), characters.len().saturating_sub(tail));
    let head: String = characters.iter().take(before).collect();
    let tail: String = characters.iter().skip(after).collect();
    let is_gap = |at: usize| characters.get(at).is_none_or(|c| *c == ' ');
    let near = |part: &str| part.chars().count() <= PART;
    let head = match head.rsplit_once(' ') {
        Some(_) if is_gap(before) => head,
        Some((whole, part)) if near(part) => whole.to_owned() + " ",
        _ => head,
    };
    let tail = match tail.split_once(' ') {
        Some(_) if after > 0 && is_gap(after - 1) => tail,
        Some((part, whole)) if near(part) => format!(" {whole}"),
        _ => tail,
    };
    let stop = [' ', '\u{a0}', ',', '(', '–'];
    let left = if head.ends_with(' ') || is_gap(before) { "\u{a0}" } else { "" };
    let right = if tail.starts_with(' ') || (after > 0 && is_gap(after - 1)) { " " } else { "" };
    let (head, tail) = (head.trim_end_matches(stop), tail.trim_start());
    format!("{head}{left}…{right}{tail}")
}

/// The same number of lines in the narrowest measure that holds them.
fn evened(text: &str, lines: Vec<String>, size: f64, semibold: bool, room: f64) -> Vec<String> {
    let count = lines.len();
    let mut best = lines;
    for part in (10..20).rev() {
        let measure = room * f64::from(part) / 20.0;
        let whole = text.split(' ').all(|word| width(word, size, semibold) <= measure);
        let narrower = break_lines(text, &|line: &str| width(line, size, semibold) <= measure);
        if !whole || narrower.len() > count {
            break;
        }
        best = narrower;
    }
    best
}

#[cfg(test)]
mod tests {
    use super::*;

    fn block(text: &str, room: f64, most: usize) -> Block {
        Block::new(text, 15.0, false, room, most)
    }

    #[test]
    fn short_text_stays_on_one_line() {
        assert_eq!(block("11 per group", 200.0, 3).lines, ["11 per group"]);
        assert!(block("", 200.0, 3).lines.is_empty());
    }

    #[test]
    fn lines_never_exceed_the_room_and_never_lose_words_unseen() {
        let texts = [
            "Differences in blastema area on day 14 between axolotls kept in water of 18 °C and of 22 °C (mm²)",
            "Donaudampfschifffahrtselektrizitätenhauptbetriebswerkbauunterbeamtengesellschaft",
            "a b c d e f g h i j k l m n o p q r s t u v w x y z",
            "水温がアホロートルの再生に及ぼす影響を調べる研究における一群あたりの個体数",
        ];
        for text in texts {
            for room in [40.0, 90.0, 150.0, 333.0, 700.0] {
                for most in 1..4 {
                    let block = block(text, room, most);
                    assert!(block.width() <= room, "{text} {room} {most}: {:?}", block.lines);
                    assert!(block.lines.len() <= most);
                    let kept: String = block.lines.concat().split([' ', '\u{a0}']).collect();
                    let whole: String = text.split(' ').collect();
                    match kept.split_once('…') {
                        Some((head, tail)) => assert!(
                            whole.starts_with(head) && whole.ends_with(tail),
                            "{:?}",
                            block.lines
                        ),
                        None => assert_eq!(kept, whole),
                    }
                }
            }
        }
    }

    #[test]
    fn the_middle_is_left_out_and_never_the_end() {
        let name =
            "freshly isolated hippocampal organotypic slice cultures from heterozygous littermates";
        for count in 1..20 {
            let text = format!("SD 1.9 {} (planned)", name.repeat(count));
            for most in 1..4 {
                let lines = block(&text, 158.0, most).lines;
                assert!(lines.last().is_some_and(|line| line.ends_with("(planned)")), "{lines:?}");
                assert!(lines.first().is_some_and(|line| line.starts_with("SD 1.9")), "{lines:?}");
                assert_eq!(lines.concat().matches('…').count(), 1);
            }
        }
        let text = format!("12 {name}: power 0.807");
        let lines = block(&text, 190.0, 3).lines;
        assert_eq!(
            lines,
            ["12 freshly isolated", "hippocampal\u{a0}… heterozygous", "littermates: power 0.807"]
        );
    }

    #[test]
    fn narrower_settings_hold_the_whole_text() {
        let text = "80 % confidence limits of the SD";
        let all = Block::settings(text, 14.0, false, 210.0, 3);
        assert_eq!(all.len(), 2);
        for (lines, block) in (1..).zip(all) {
            assert_eq!(block.lines.len(), lines);
            assert_eq!(block.lines.join(" ").replace('\u{a0}', " "), text);
        }
    }

    #[test]
    fn lines_are_of_even_length() {
        let block = block("SD 0.78 (upper 80 % confidence limit)", 200.0, 3);
        assert_eq!(block.lines, ["SD 0.78 (upper 80\u{a0}%", "confidence limit)"]);
    }
}
