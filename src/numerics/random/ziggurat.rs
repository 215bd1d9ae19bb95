//! The ziggurat of the standard normal density: 256 layers of equal area, the lowest one with the tail.

use super::Stream;
use libm::{erfc, exp, log};
use std::sync::OnceLock;

/// How many layers; the layer number is the low byte of a random word.
const LAYERS: usize = 256;

/// Where the tail begins (Marsaglia, Tsang 2000, section 4, for 256 layers).
const TAIL: f64 = 3.654_152_885_361_009;

/// The right edges of the layers and the density `exp(-x²/2)` there.
pub(super) struct Tables {
    /// Pairs of a layer's width and the width of the layer above it, which lies wholly under the density.
    edges: [(f64, f64); LAYERS],
    /// Densities at the lower and the upper edge of each layer.
    heights: [(f64, f64); LAYERS],
}

impl Tables {
    /// The tables, computed once with portable functions, so that they hold the same bits everywhere.
    pub(super) fn shared() -> &'static Tables {
        static TABLES: OnceLock<Tables> = OnceLock::new();
        TABLES.get_or_init(Tables::new)
    }

    fn new() -> Self {
        let mut edges = [(0.0, 0.0); LAYERS];
        let mut heights = [(0.0, 0.0); LAYERS];
        let area = layer_area();
        let mut edge = area / density(TAIL);
        let mut above = TAIL;
        for (edge_pair, height_pair) in edges.iter_mut().zip(&mut heights) {
            *edge_pair = (edge, above);
            // The lowest layer is as wide as its area demands; its strip starts at density 0.
            let lower = if edge > TAIL { 0.0 } else { density(edge) };
            let upper = density(above);
            *height_pair = (lower, upper);
            edge = above;
            above = edge_above(edge, upper, area);
        }
        Tables { edges, heights }
    }

    #[inline]
    pub(super) fn normal(&self, stream: &mut Stream) -> f64 {
        const STEP: f64 = 1.0 / (1u64 << 52) as f64;
        loop {
            let word = stream.bits();
            let layer = (word & 0xff) as usize;
            // The upper 53 bits as a signed share of the layer's width.
            let share = ((word as i64) >> 11) as f64 * STEP;
            let (edge, above) = self.edges.get(layer).copied().unwrap_or_default();
            let x = share * edge;
            if x.abs() < above {
                return x;
            }
            if let Some(x) = self.outside(stream, layer, x) {
                return x;
            }
        }
    }

    /// The rare part: the tail for the lowest layer, the strip between rectangle and density for the others.
    #[cold]
    fn outside(&self, stream: &mut Stream, layer: usize, x: f64) -> Option<f64> {
        if layer == 0 {
            let beyond = tail(stream);
            return Some(if x < 0.0 { -beyond } else { beyond });
        }
        let (lower, upper) = self.heights.get(layer).copied().unwrap_or_default();
        let height = lower + (upper - lower) * stream.uniform();
        (height < density(x)).then_some(x)
    }
}

/// A value beyond the tail's beginning, exactly (Marsaglia 1964, Technometrics 6(1), 101-102).
fn tail(stream: &mut Stream) -> f64 {
    loop {
        let x = -log(stream.uniform()) / TAIL;
        let y = -log(stream.uniform());
        if y + y > x * x {
            return TAIL + x;
        }
    }
}

fn density(x: f64) -> f64 {
    exp(-0.5 * x * x)
}

/// Area of every layer: the rectangle below the tail's beginning plus the tail.
fn layer_area() -> f64 {
    let root_half_pi = std::f64::consts::FRAC_PI_2.sqrt();
    TAIL * density(TAIL) + root_half_pi * erfc(TAIL * std::f64::consts::FRAC_1_SQRT_2)
}

/// Edge of the next layer up; 0 for the layer that closes the ziggurat.
fn edge_above(edge: f64, height: f64, area: f64) -> f64 {
    let height = height + area / edge;
    if height < 1.0 { (-2.0 * log(height)).sqrt() } else { 0.0 }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn layers_have_equal_areas_and_close_at_the_top() {
        let tables = Tables::new();
        let area = layer_area();
        // From the equation that closes 256 layers, solved in 40 digits; Marsaglia, Tsang (2000), section 4, print
        // 0.00492867323399 (from memory).
        assert!((area / 0.004_928_673_233_974_655 - 1.0).abs() < 1e-13, "area {area}");
        for (edge, height) in tables.edges.iter().zip(&tables.heights).skip(1) {
            let strip = edge.0 * (height.1 - height.0);
            assert!((strip - area).abs() < 1e-14, "strip {strip}, area {area}");
        }
        let (last, _) = tables.edges[LAYERS - 1];
        assert_eq!(tables.edges[LAYERS - 1].1, 0.0);
        assert!((density(last) + area / last - 1.0).abs() < 1e-13);
    }
}
