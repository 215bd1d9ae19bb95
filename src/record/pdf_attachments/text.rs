//! Text strings of PDF.
//!
//! # Sources
//!
//! ISO 32000-1:2008, 7.9.2.2 and annex D.3 (PDFDocEncoding, from memory); ISO
//! 32000-2:2020, 7.9.2.2 (UTF-8).

/// The characters of bytes 0x18 to 0x1F and 0x80 to 0xA0, where PDFDocEncoding
/// departs from Latin-1.
const LOW: [char; 8] = ['˘', 'ˇ', 'ˆ', '˙', '˝', '˛', '˚', '˜'];
const HIGH: [char; 33] = [
    '•', '†', '‡', '…', '—', '–', 'ƒ', '⁄', '‹', '›', '−', '‰', '„', '“', '”', '‘', '’', '‚', '™',
    'ﬁ', 'ﬂ', 'Ł', 'Œ', 'Š', 'Ÿ', 'Ž', 'ı', 'ł', 'œ', 'š', 'ž', '\u{FFFD}', '€',
];

/// A text string: UTF-16 or UTF-8 with its mark, PDFDocEncoding without one.
pub(super) fn decode(bytes: &[u8]) -> String {
    match bytes {
        [0xFE, 0xFF, rest @ ..] => {
            let units = rest.chunks(2).map(|pair| match pair {
                [high, low] => u16::from_be_bytes([*high, *low]),
                _ => 0xFFFD,
            });
            char::decode_utf16(units).map(|c| c.unwrap_or(char::REPLACEMENT_CHARACTER)).collect()
        }
        [0xEF, 0xBB, 0xBF, rest @ ..] => String::from_utf8_lossy(rest).into_owned(),
        _ => bytes.iter().map(|&byte| pdf_doc(byte)).collect(),
    }
}

/// A name without a Unicode form: UTF-8 where it is valid, as common writers use
/// it, else a text string.
pub(super) fn decode_plain(bytes: &[u8]) -> String {
    match std::str::from_utf8(bytes) {
        Ok(text) => text.to_owned(),
        Err(_) => decode(bytes),
    }
}

fn pdf_doc(byte: u8) -> char {
    let special = match byte {
        0x18..=0x1F => LOW.get(usize::from(byte - 0x18)),
        0x80..=0xA0 => HIGH.get(usize::from(byte - 0x80)),
        _ => None,
    };
    special.copied().unwrap_or(char::from(byte))
}
