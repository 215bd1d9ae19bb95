//! Critical values of a family of comparisons, each protected in its own way.

use crate::designs::inputs::Multiplicity;
use crate::numerics::multivariate::{self, Dunnett, StudentizedRange};
use crate::numerics::{self, Continuous, StudentT};
use crate::quantities::Sides;

/// A family of comparisons of group means.
#[derive(Debug, Clone, Copy)]
pub(in crate::designs) struct Family<'a> {
    /// What protects it.
    pub(in crate::designs) multiplicity: Multiplicity,
    /// Level of the family.
    pub(in crate::designs) alpha: f64,
    /// Sides of each test.
    pub(in crate::designs) sides: Sides,
    /// Number of groups.
    pub(in crate::designs) groups: usize,
    /// The compared pairs.
    pub(in crate::designs) pairs: &'a [(usize, usize)],
}

impl Family<'_> {
    fn count(&self) -> f64 {
        self.pairs.len() as f64
    }

    /// Level of one comparison where the procedure works by levels: of the first step for Holm. `None` for the
    /// procedures of Tukey and Dunnett, which work by the joint distribution.
    pub(in crate::designs) fn level(&self) -> Option<f64> {
        match self.multiplicity {
            _ if self.pairs.len() == 1 => Some(self.alpha),
            Multiplicity::EachAtAlpha => Some(self.alpha),
            Multiplicity::Bonferroni | Multiplicity::Holm => Some(self.alpha / self.count()),
            Multiplicity::Sidak => Some(-libm::expm1(libm::log1p(-self.alpha) / self.count())),
            Multiplicity::Tukey | Multiplicity::Dunnett => None,
        }
    }

    /// Critical value of one comparison on the scale of t, for degrees of freedom that may be infinite; `sizes` are
    /// the sizes of the groups or numbers proportional to them. For Holm it is that of the first step, which every
    /// comparison with a larger statistic passes whatever the others do.
    ///
    /// Tukey with unequal groups is the Tukey-Kramer procedure, which is conservative (Hayter 1984).
    pub(in crate::designs) fn critical(&self, df: f64, sizes: &[f64]) -> numerics::Result<f64> {
        match (self.level(), self.multiplicity) {
            (Some(level), _) => quantile(df, level / self.sides.count()),
            (None, Multiplicity::Tukey) => {
                let range = StudentizedRange::new(self.groups as u64, df)?;
                Ok(range.upper_quantile(self.alpha)? / std::f64::consts::SQRT_2)
            }
            (None, _) => {
                let size = |g: usize| sizes.get(g).copied().unwrap_or(f64::NAN);
                let control = self.pairs.first().map_or(f64::NAN, |pair| size(pair.0));
                let treatments: Vec<f64> = self.pairs.iter().map(|pair| size(pair.1)).collect();
                let sides = joint_sides(self.sides);
                Dunnett::from_sizes(control, &treatments, sides, df)?.upper_quantile(self.alpha)
            }
        }
    }

    /// Critical values of all steps: one for the single-step procedures, a falling list for Holm.
    pub(in crate::designs) fn steps(&self, df: f64, sizes: &[f64]) -> numerics::Result<Vec<f64>> {
        if self.multiplicity != Multiplicity::Holm || self.pairs.len() == 1 {
            return Ok(vec![self.critical(df, sizes)?]);
        }
        let tail = self.alpha / self.sides.count();
        (1..=self.pairs.len()).rev().map(|left| quantile(df, tail / left as f64)).collect()
    }
}

/// The sides of the joint distributions.
pub(in crate::designs) fn joint_sides(sides: Sides) -> multivariate::Sides {
    match sides {
        Sides::One => multivariate::Sides::One,
        Sides::Two => multivariate::Sides::Two,
    }
}

fn quantile(df: f64, tail: f64) -> numerics::Result<f64> {
    if df.is_infinite() {
        return numerics::normal_upper_quantile(tail);
    }
    StudentT::new(df)?.upper_quantile(tail)
}
