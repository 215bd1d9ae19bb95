//! A correlation that is an assumption.

use super::assumed::Assumed;
use crate::designs::{Fault, Path};
use crate::quantities::{Assumption, CORRELATION, Grounds, Written};

/// Reads a correlation at a path.
///
/// # Errors
///
/// A value outside -1 to 1, or one of these ends.
pub fn read_correlation(assumed: &Assumed, at: &Path) -> Result<Assumption, Fault> {
    match CORRELATION.check(assumed.value()) {
        Ok(_) => Ok(assumed.assumption(&Grounds::default())),
        Err(out) => {
            let place = at.join(&Path::of(assumed.step()));
            let reason = format!("the correlation is {}", Written(assumed.value()));
            Err(Fault::value(place, reason).help(format!("it {}", out.range.advice)))
        }
    }
}
