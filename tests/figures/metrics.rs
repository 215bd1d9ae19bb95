//! Widths of characters, read from the font files that reports embed (OpenType 1.9: `cmap` format 12, `hmtx`).

use std::collections::BTreeMap;
use std::sync::OnceLock;

/// Advance widths of one font in thousandths of the type size, by character.
type Widths = BTreeMap<u32, f64>;

fn number(bytes: &[u8], at: usize, length: usize) -> usize {
    bytes[at..at + length].iter().fold(0, |value, byte| value << 8 | usize::from(*byte))
}

fn table(font: &[u8], tag: &[u8; 4]) -> usize {
    let count = number(font, 4, 2);
    let record = (0..count).map(|i| 12 + 16 * i).find(|at| &font[*at..at + 4] == tag);
    number(font, record.unwrap_or_else(|| panic!("the font has no table {tag:?}")) + 8, 4)
}

fn read(font: &[u8]) -> Widths {
    let units = number(font, table(font, b"head") + 18, 2) as f64;
    let (advances, known) = (table(font, b"hmtx"), number(font, table(font, b"hhea") + 34, 2));
    let width =
        |glyph: usize| number(font, advances + 4 * glyph.min(known - 1), 2) as f64 * 1000.0 / units;
    let cmap = table(font, b"cmap");
    let subtable = (0..number(font, cmap + 2, 2))
        .map(|i| cmap + number(font, cmap + 8 + 8 * i, 4))
        .find(|at| number(font, *at, 2) == 12)
        .unwrap_or_else(|| panic!("the font has no character map of format 12"));
    let mut widths = Widths::new();
    for group in 0..number(font, subtable + 12, 4) {
        let at = subtable + 16 + 12 * group;
        let [first, last, glyph] = [0, 4, 8].map(|offset| number(font, at + offset, 4));
        for character in first..=last {
            widths.insert(character as u32, width(glyph + character - first));
        }
    }
    widths
}

fn face(name: &str) -> Widths {
    let holds = |font: &&[u8]| font.windows(name.len()).any(|window| window == name.as_bytes());
    let font = typst_assets::fonts().find(holds);
    read(font.unwrap_or_else(|| panic!("{name} is not among the fonts")))
}

/// Width of a text in Libertinus Serif; a character that the font lacks counts as a square.
pub fn width(text: &str, size: f64, semibold: bool) -> f64 {
    static FACES: OnceLock<[Widths; 2]> = OnceLock::new();
    let [regular, bold] =
        FACES.get_or_init(|| [face("LibertinusSerif-Regular"), face("LibertinusSerif-Semibold")]);
    let widths = if semibold { bold } else { regular };
    text.chars().map(|c| widths.get(&u32::from(c)).copied().unwrap_or(1000.0)).sum::<f64>() * size
        / 1000.0
}
