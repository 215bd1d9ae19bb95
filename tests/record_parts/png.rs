use sufficit::render::pdf::FontSet;
use sufficit::render::png::{PngError, png};

use crate::sample::FIGURE;

/// Width and height as the file's first chunk gives them (ISO/IEC 15948, 11.2.2).
fn size(png: &[u8]) -> (u32, u32) {
    assert_eq!(&png[..8], b"\x89PNG\r\n\x1a\n");
    let number = |at: usize| u32::from_be_bytes(png[at..at + 4].try_into().expect("four bytes"));
    (number(16), number(20))
}

#[test]
fn the_scale_is_pixels_to_a_unit_and_equal_input_gives_equal_bytes() {
    let fonts = FontSet::embedded();
    for (scale, expected) in [(1.0, (760, 420)), (2.0, (1520, 840)), (0.5, (380, 210))] {
        let first = png(FIGURE, scale, &fonts).expect("drawn");
        assert_eq!(size(&first), expected);
        assert!(first == png(FIGURE, scale, &fonts).expect("drawn"));
    }
}

#[test]
fn text_is_drawn_with_the_embedded_font_whatever_family_is_named() {
    let fonts = FontSet::embedded();
    let draw = |svg: &str| png(svg, 1.0, &fonts).expect("drawn");
    let without = FIGURE.replace("Units in each group − n", "");
    let generic = FIGURE.replace("Libertinus Serif, serif", "sans-serif");
    assert!(draw(FIGURE) != draw(&without));
    assert!(draw(FIGURE) == draw(&generic));
}

#[test]
fn a_character_without_a_font_is_an_error() {
    let svg = FIGURE.replace("Units", "&#x4e00;");
    let error = png(&svg, 1.0, &FontSet::embedded()).expect_err("no font");
    assert!(error.to_string().contains("一 (U+4E00)"), "{error}");
}

#[test]
fn pictures_that_an_svg_refers_to_are_not_loaded() {
    let fonts = FontSet::embedded();
    let with = |link: &str| {
        let image = format!("<image href=\"{link}\" width=\"9\" height=\"9\"/></svg>");
        png(&FIGURE.replace("</svg>", &image), 1.0, &fonts).expect("drawn")
    };
    let inner = "data:image/svg+xml;utf8,&lt;svg xmlns='http://www.w3.org/2000/svg' \
                 width='9' height='9'&gt;&lt;rect width='9' height='9'/&gt;&lt;/svg&gt;";
    let plain = png(FIGURE, 1.0, &fonts).expect("drawn");
    let file = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/record_parts/dot.svg");
    assert!(with(inner) == plain);
    assert!(with(file) == plain);
}

#[test]
fn what_cannot_be_drawn_is_refused() {
    let fonts = FontSet::embedded();
    for scale in [0.0, -1.0, f32::NAN, f32::INFINITY, 1e9, 100.0] {
        let error = png(FIGURE, scale, &fonts).expect_err("size");
        assert!(matches!(error, PngError::Size { .. }), "{scale}: {error}");
    }
    for svg in ["", "<svg", "no picture", "<html/>"] {
        assert!(matches!(png(svg, 1.0, &fonts), Err(PngError::Svg(_))), "{svg}");
    }
}
