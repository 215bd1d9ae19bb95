//! Advance widths of Libertinus Serif, in thousandths of the type size.
//!
//! Read from the `hmtx` table of `LibertinusSerif-Regular.otf` (the font that reports are set in), so that labels
//! can be laid out without opening a font.

/// U+0020 to U+007E.
const ASCII: [u16; 95] = [
    250, 288, 336, 465, 465, 637, 705, 190, 298, 298, 369, 550, 220, 338, 220, 323, 465, 465, 465,
    465, 465, 465, 465, 465, 465, 465, 236, 236, 550, 550, 550, 435, 895, 695, 588, 646, 701, 557,
    485, 685, 730, 297, 322, 637, 528, 839, 699, 702, 541, 702, 587, 485, 597, 661, 652, 951, 660,
    575, 604, 356, 287, 356, 518, 486, 392, 457, 493, 428, 506, 447, 310, 500, 538, 271, 272, 512,
    264, 790, 542, 504, 519, 503, 372, 390, 316, 531, 497, 747, 490, 515, 424, 277, 205, 277, 449,
];

/// U+00A0 to U+017F.
const LATIN: [u16; 224] = [
    250, 288, 465, 465, 465, 465, 211, 473, 379, 695, 307, 543, 599, 338, 695, 397, 267, 550, 307,
    307, 341, 515, 602, 250, 541, 307, 349, 543, 660, 660, 660, 435, 695, 695, 695, 695, 695, 695,
    865, 646, 557, 557, 557, 557, 297, 297, 297, 297, 701, 699, 702, 702, 702, 702, 702, 550, 702,
    661, 661, 661, 661, 575, 527, 541, 457, 457, 457, 457, 457, 457, 687, 428, 447, 447, 447, 447,
    271, 271, 271, 271, 486, 542, 504, 504, 504, 504, 504, 550, 504, 531, 531, 531, 531, 515, 502,
    515, 695, 457, 695, 457, 695, 457, 646, 428, 646, 428, 646, 428, 646, 428, 701, 528, 701, 506,
    557, 447, 557, 447, 557, 447, 557, 447, 557, 447, 685, 500, 685, 500, 685, 500, 685, 500, 730,
    538, 730, 538, 297, 271, 297, 271, 297, 271, 297, 271, 297, 271, 598, 542, 322, 272, 637, 512,
    519, 528, 264, 528, 264, 528, 290, 528, 264, 528, 264, 699, 542, 699, 542, 699, 542, 542, 668,
    528, 702, 504, 702, 504, 702, 504, 869, 778, 587, 372, 587, 372, 587, 372, 485, 390, 485, 390,
    485, 390, 485, 390, 597, 316, 597, 374, 597, 316, 661, 531, 661, 531, 661, 531, 661, 531, 661,
    531, 661, 531, 951, 747, 575, 515, 575, 604, 424, 604, 424, 604, 424, 291,
];

/// U+0391 to U+03C9.
const GREEK: [u16; 57] = [
    695, 588, 497, 636, 557, 604, 730, 702, 297, 637, 658, 839, 699, 648, 702, 667, 541, 600, 574,
    597, 575, 643, 660, 679, 697, 297, 575, 566, 397, 528, 281, 490, 566, 517, 505, 491, 397, 441,
    528, 489, 281, 506, 531, 490, 474, 426, 504, 566, 525, 441, 570, 441, 490, 589, 505, 628, 658,
];

/// The semibold weight is wider by no more than this, over any run of text.
const SEMIBOLD: f64 = 1.06;

/// Width of a text at a type size, in the unit of the size; a little generous, never short.
pub(super) fn width(text: &str, size: f64, semibold: bool) -> f64 {
    let thousandths: u32 = text.chars().map(|c| u32::from(advance(c))).sum();
    let weight = if semibold { SEMIBOLD } else { 1.0 };
    f64::from(thousandths) * size * weight * 1.01 / 1000.0
}

fn advance(character: char) -> u16 {
    let code = u32::from(character);
    let from = |table: &[u16], first: u32| {
        usize::try_from(code.checked_sub(first)?).ok().and_then(|index| table.get(index)).copied()
    };
    if let Some(width) =
        from(&ASCII, 0x20).or_else(|| from(&LATIN, 0xa0)).or_else(|| from(&GREEK, 0x391))
    {
        return width;
    }
    match code {
        // Combining marks, joiners and variation selectors take no room of their own.
        0x300..=0x36f | 0x200b..=0x200d | 0xfe00..=0xfe0f => 0,
        // Thin and hair spaces.
        0x2009 | 0x200a | 0x202f => 125,
        // Superscript and subscript figures.
        0x2070..=0x209c => 310,
        0x2018 | 0x2019 => 270,
        0x2010..=0x2013 | 0x201a..=0x2022 | 0x2212 | 0x2264 | 0x2265 => 560,
        // Cyrillic is at most this wide.
        0x400..=0x52f => 800,
        // Anything else, ideographs and symbols among them, is given a full square.
        _ => 1000,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Widths read from the font by hand: n 542, M 839, 0 465, minus sign 548.
    #[test]
    fn widths_are_those_of_the_font() {
        assert_eq!(advance('n'), 542);
        assert_eq!(advance('M'), 839);
        assert_eq!(advance('0'), 465);
        assert!(advance('\u{2212}') >= 548);
        assert_eq!(advance('é'), 447);
        assert_eq!(advance('µ'), 515);
        assert_eq!(advance('\u{301}'), 0);
    }
}
