//! The density ratio at the point where one hypothesis becomes another.

mod conditional;
mod quadratic;

pub use conditional::{ConditionalDensities, Ratio, conditional_densities};

use crate::error::EvidenceError;
use crate::estimate::Estimate;
use crate::estimator::{Estimator, EstimatorFamily};
use crate::problem::{Problem, Watch};
use oddwell_sampler::Target;

/// Registry entry.
pub(crate) const FAMILY: EstimatorFamily = EstimatorFamily {
    name: "density_ratio",
    summary: "posterior over prior density where one hypothesis becomes another (Dickey 1971; Verdinelli & Wasserman 1995)",
    manual: "\
General relativity is the point τ = 0 of a departure. With equal priors on everything else, the ratio of the evidences of the two is
the departure's posterior density there over its prior density (Dickey 1971, Ann. Math. Stat. 42, 204; Verdinelli & Wasserman 1995, J.
Am. Stat. Assoc. 90, 614).

The posterior density is the mean, over draws of all other quantities, of the departure's density given those: likelihood × prior at
the point over its integral (Gelfand & Smith 1990, J. Am. Stat. Assoc. 85, 398); the integral by quadrature for one departure
quantity, by a normal approximation corrected with weighted draws for several. The error bar is that of the mean.

The evidence of the hypothesis is that of general relativity over the ratio, so both errors enter. Where hardly any draw reaches the
point, the mean hangs on a few of them, and the estimate does not vote.",
};

/// Draws that the mean must rest on, at least: (Σr)²/Σr².
const LEAST_DRAWS: f64 = 20.0;

/// The density ratio.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DensityRatio {
    /// Draws of the posterior to average over.
    pub draws: usize,
}

impl Default for DensityRatio {
    fn default() -> Self {
        Self { draws: 4000 }
    }
}

impl<T: Target> Estimator<T> for DensityRatio {
    fn family(&self) -> &'static EstimatorFamily {
        &FAMILY
    }

    fn estimate(&self, problem: &Problem<'_, T>, watch: &Watch) -> Result<Estimate, EvidenceError> {
        let not =
            |reason: &str| EvidenceError::NotApplicable { estimator: FAMILY.name, reason: reason.into() };
        let contained =
            problem.contained.ok_or_else(|| not("it contains no hypothesis of known evidence"))?;
        let densities = conditional_densities(problem, contained, self.draws, watch)?;
        Ok(densities.ratio().estimate(contained.log_evidence, contained.error))
    }
}
