//! The trait of estimators, and their registry.

use crate::closed_form::ClosedForm;
use crate::density_ratio::DensityRatio;
use crate::error::EvidenceError;
use crate::estimate::Estimate;
use crate::laplace::Laplace;
use crate::nested::Nested;
use crate::problem::{Problem, Watch};
use crate::stepping::SteppingStones;
use crate::{closed_form, density_ratio, laplace, nested, stepping};
use oddwell_sampler::Target;

/// A route to the evidence.
pub trait Estimator<T: Target>: Send + Sync {
    /// Its registry entry.
    fn family(&self) -> &'static EstimatorFamily;

    /// ln ∫ prior × likelihood, with a standard error.
    ///
    /// # Errors
    /// [`EvidenceError::NotApplicable`] where an assumption does not hold; otherwise what stopped it.
    fn estimate(&self, problem: &Problem<'_, T>, watch: &Watch) -> Result<Estimate, EvidenceError>;
}

/// One kind of estimator.
#[derive(Debug, Clone, Copy)]
pub struct EstimatorFamily {
    /// Key, as in `weigh.json`.
    pub name: &'static str,
    /// One line for help and tables.
    pub summary: &'static str,
    /// The page of the manual.
    pub manual: &'static str,
}

/// Every kind of estimator, in the order in which results list them.
pub fn estimator_families() -> &'static [EstimatorFamily] {
    const FAMILIES: &[EstimatorFamily] =
        &[nested::FAMILY, stepping::FAMILY, laplace::FAMILY, density_ratio::FAMILY, closed_form::FAMILY];
    FAMILIES
}

/// The estimator of a family, with its default settings.
pub fn estimator<T: Target>(name: &str) -> Option<Box<dyn Estimator<T>>> {
    let made: Box<dyn Estimator<T>> = match name {
        name if name == nested::FAMILY.name => Box::new(Nested::default()),
        name if name == stepping::FAMILY.name => Box::new(SteppingStones::default()),
        name if name == laplace::FAMILY.name => Box::new(Laplace::default()),
        name if name == density_ratio::FAMILY.name => Box::new(DensityRatio::default()),
        name if name == closed_form::FAMILY.name => Box::new(ClosedForm),
        _ => return None,
    };
    Some(made)
}
