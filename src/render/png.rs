//! Figures as pixels, for readers that show no SVG.

use std::sync::Arc;

use resvg::tiny_skia::{Pixmap, Transform};
use resvg::usvg::{ImageHrefResolver, Options, Tree};

use super::pdf::{FontSet, TypstError, check_figure};

/// Largest number of pixels in a picture.
const PIXELS: u64 = 100_000_000;

/// Why a figure gave no picture.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum PngError {
    /// The figure's text cannot be printed.
    #[error(transparent)]
    Unprintable(#[from] TypstError),
    /// The figure is not an SVG that can be drawn.
    #[error("the figure cannot be drawn: {0}")]
    Svg(String),
    /// The scale makes no picture of a usable size.
    #[error("a scale of {scale} gives {width} × {height} pixels; at most 100 million are drawn")]
    Size {
        /// The scale that was asked for.
        scale: f32,
        /// Pixels across.
        width: f32,
        /// Pixels down.
        height: f32,
    },
    /// The picture could not be written as PNG.
    #[error("the picture cannot be written: {0}")]
    Encoding(String),
}

/// Draws an SVG with the fonts of the set, `scale` pixels to one SVG unit, and
/// returns it as a PNG on a transparent ground. Equal input gives equal bytes.
///
/// Pictures and files that the SVG refers to are not loaded.
///
/// # Errors
///
/// * [`PngError::Unprintable`] when a character of the figure is in no font.
/// * [`PngError::Svg`] for anything but a well-formed SVG with a size.
/// * [`PngError::Size`] when the scale is not above 0 or the picture too large.
pub fn png(svg: &str, scale: f32, fonts: &FontSet) -> Result<Vec<u8>, PngError> {
    check_figure(fonts, svg)?;
    let options = Options {
        resources_dir: None,
        font_family: FontSet::TEXT_FAMILY.to_owned(),
        fontdb: Arc::clone(fonts.database()),
        image_href_resolver: ImageHrefResolver {
            resolve_data: Box::new(|_, _, _| None),
            resolve_string: Box::new(|_, _| None),
        },
        ..Options::default()
    };
    let tree =
        Tree::from_str(svg, &options).map_err(|problem| PngError::Svg(problem.to_string()))?;
    let width = (tree.size().width() * scale).ceil();
    let height = (tree.size().height() * scale).ceil();
    let refuse = || PngError::Size { scale, width, height };
    let usable = |side: f32| (1.0..=PIXELS as f32).contains(&side);
    if !(scale > 0.0 && usable(width) && usable(height)) {
        return Err(refuse());
    }
    let (across, down) = (width as u32, height as u32);
    if u64::from(across) * u64::from(down) > PIXELS {
        return Err(refuse());
    }
    let mut picture = Pixmap::new(across, down).ok_or_else(refuse)?;
    resvg::render(&tree, Transform::from_scale(scale, scale), &mut picture.as_mut());
    picture.encode_png().map_err(|problem| PngError::Encoding(problem.to_string()))
}
