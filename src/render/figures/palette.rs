//! Colours and sizes of the figures.
//!
//! One accent, one warm colour for the ceiling alone, greys for all else. Lightness alone tells everything apart
//! that colour tells apart, so that figures can be read in grey and by the colour-blind.

use plotters::style::RGBColor;

/// Accent: the plan.
pub(super) const ACCENT: RGBColor = RGBColor(0x1f, 0x5a, 0x7a);
/// The accent deepened, for small text on the shades of the contour.
pub(super) const DEEP: RGBColor = RGBColor(0x12, 0x3c, 0x52);
/// The ceiling, and nothing else.
pub(super) const WARM: RGBColor = RGBColor(0xb5, 0x54, 0x1c);
/// Its dash, which no other line has: known in grey, too.
pub(super) const CEILING_DASH: &str = " stroke-dasharray=\"90 35 20 35\"";
/// Text.
pub(super) const INK: RGBColor = RGBColor(0x26, 0x26, 0x26);
/// Secondary text and rules that carry meaning.
pub(super) const GREY: RGBColor = RGBColor(0x66, 0x66, 0x66);
/// Axes.
pub(super) const RULE: RGBColor = RGBColor(0x9a, 0x9a, 0x9a);
/// Grid.
pub(super) const FAINT: RGBColor = RGBColor(0xe4, 0xe4, 0xe4);
/// Curves beside the planned one.
pub(super) const BESIDE: RGBColor = RGBColor(0x4f, 0x7b, 0x93);
/// The band between them.
pub(super) const BAND: RGBColor = RGBColor(0xea, 0xf1, 0xf5);
/// Paper.
pub(super) const PAPER: RGBColor = RGBColor(0xff, 0xff, 0xff);

/// Lightest and darkest shade of the contour bands, one hue.
const SHADES: (RGBColor, RGBColor) = (RGBColor(0xf6, 0xf9, 0xfb), RGBColor(0x8d, 0xb3, 0xc6));

/// Type size of labels.
pub(super) const LABEL: f64 = 15.0;
/// Type size of ticks and of labels at the ends of curves.
pub(super) const SMALL: f64 = 14.0;

/// Shade `index` of `count`, from light to dark.
pub(super) fn shade(index: usize, count: usize) -> RGBColor {
    let part = if count > 1 { index as f64 / (count - 1) as f64 } else { 0.0 };
    let mix = |light: u8, dark: u8| {
        let value = f64::from(light) + part * (f64::from(dark) - f64::from(light));
        // Between two bytes, so within a byte.
        value.round() as u8
    };
    let (light, dark) = SHADES;
    RGBColor(mix(light.0, dark.0), mix(light.1, dark.1), mix(light.2, dark.2))
}

/// The colour as SVG writes it.
pub(super) fn hex(colour: RGBColor) -> String {
    format!("#{:02x}{:02x}{:02x}", colour.0, colour.1, colour.2)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Luma after Rec. 601.
    fn grey(colour: RGBColor) -> f64 {
        0.299 * f64::from(colour.0) + 0.587 * f64::from(colour.1) + 0.114 * f64::from(colour.2)
    }

    #[test]
    fn shades_darken_by_steps_that_grey_shows() {
        for count in 2..=15 {
            let greys: Vec<f64> = (0..count).map(|index| grey(shade(index, count))).collect();
            assert!(greys.windows(2).all(|pair| pair[0] - pair[1] > 3.0), "{greys:?}");
        }
    }

    #[test]
    fn text_stands_out_from_every_ground() {
        for index in 0..15 {
            for text in [DEEP, INK] {
                assert!(grey(shade(index, 15)) - grey(text) > 100.0);
            }
            assert!(grey(shade(index, 15)) - grey(WARM) > 60.0);
        }
    }
}
