//! Figures as SVG text, drawn by plotters.
//!
//! Curves, bands and rules go through plotters; text is placed here, measured by a table of the font's widths, so
//! that no font of the machine is asked and the same data give the same bytes. Labels stand beside what they
//! name: there is no legend.

mod axes;
mod canvas;
mod checks;
mod clip;
mod labels;
mod palette;
mod place;
mod power_curve;
mod size_contour;
mod text;
mod widths;

pub use power_curve::power_curve;
pub use size_contour::size_contour;

/// Why a figure cannot be drawn.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
pub enum FigureError {
    /// A value is infinite or not a number.
    #[error("a figure's {what} is not a finite number")]
    NotFinite {
        /// Which value.
        what: &'static str,
    },
    /// An axis has no length.
    #[error("the {axis} axis of a figure is empty or reversed")]
    EmptyAxis {
        /// Which axis.
        axis: &'static str,
    },
    /// The axis of the difference crosses zero.
    #[error("the axis of the difference crosses zero, where no number of units is enough")]
    CrossesZero,
    /// Something lies outside the axes.
    #[error("a figure's {what} lies outside its axes")]
    Outside {
        /// What lies outside.
        what: &'static str,
    },
    /// Values that must rise do not.
    #[error("the values of a figure's {what} do not rise")]
    NotRising {
        /// Which values.
        what: &'static str,
    },
    /// There are too few or too many parts.
    #[error("a figure cannot have {given} {what}; {least} to {most} are drawn")]
    Count {
        /// Which parts.
        what: &'static str,
        /// How many were given.
        given: usize,
        /// How few there may be.
        least: usize,
        /// How many there may be.
        most: usize,
    },
    /// The drawing itself failed.
    #[error("a figure cannot be drawn: {0}")]
    Drawing(String),
}
