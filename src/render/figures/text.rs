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
/// Height of capitals and figures, as a multiple of the type size.
pub(super) const CAPITALS: f64 = 0.66;
/// Depth of descenders, as a multiple of the type size.
const DESCENT: f64 = 0.24;

impl Block {
    /// Breaks `text` at spaces into lines of at most `room`, the fewest that hold it and of even length; words
    /// longer than a line are broken, and what does not fit on `most` lines is cut with an ellipsis.
    pub(super) fn new(text: &str, size: f64, semibold: bool, room: f64, most: usize) -> Self {
        // A line breaks at plain spaces alone, and never between a number and its per cent sign.
        let clean = text.split_ascii_whitespace().collect::<Vec<_>>().join(" ");
        let clean = clean.replace(" %", "\u{a0}%");
        let fits = |line: &str| width(line, size, semibold) <= room;
        let mut lines = break_lines(&clean, &fits);
        if lines.len() > most {
            lines = shortened(lines, most, &fits);
        } else if lines.len() > 1 {
            lines = evened(&clean, lines, size, semibold, room);
        }
        Self { lines, size, semibold }
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

/// The first `most` lines, the last of them ending in an ellipsis.
fn shortened(mut lines: Vec<String>, most: usize, fits: &impl Fn(&str) -> bool) -> Vec<String> {
    lines.truncate(most);
    if let Some(last) = lines.last_mut() {
        while !last.is_empty() && !fits(&format!("{last}…")) {
            last.pop();
        }
        *last = format!("{}…", last.trim_end_matches([' ', '\u{a0}', ',', '(', '–']));
    }
    lines
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
                    let kept: String = block.lines.concat().split(' ').collect();
                    let whole: String = text.split(' ').collect();
                    let cut = block.lines.last().is_some_and(|line| line.ends_with('…'));
                    assert!(cut || kept == whole, "{:?}", block.lines);
                    assert!(!cut || whole.starts_with(kept.trim_end_matches('…')));
                }
            }
        }
    }

    #[test]
    fn lines_are_of_even_length() {
        let block = block("SD 0.78 (upper 80 % confidence limit)", 200.0, 3);
        assert_eq!(block.lines, ["SD 0.78 (upper 80\u{a0}%", "confidence limit)"]);
    }
}
