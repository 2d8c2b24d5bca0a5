//! The prior over all dimensions: independent priors and joint normal blocks.

use super::{JointNormal, Normal, PriorError, PriorShape, SharedPrior, normal_quantile};
use nalgebra::DMatrix;
use rand::Rng;
use std::sync::Arc;

/// A normalised prior density over `dimension()` numbers: a product of independent priors and joint normal blocks.
///
/// Normal and flat priors are evaluated in two plain loops, everything else through its trait; nothing allocates.
#[derive(Debug, Clone)]
pub struct PriorSet {
    marginals: Vec<SharedPrior>,
    independent: Vec<usize>,
    joint: Vec<JointNormal>,
    normals: Vec<NormalTerm>,
    flats: Vec<FlatTerm>,
    others: Vec<usize>,
    constant: f64,
}

#[derive(Debug, Clone, Copy)]
struct NormalTerm {
    dimension: usize,
    mean: f64,
    inverse_sd: f64,
}

#[derive(Debug, Clone, Copy)]
struct FlatTerm {
    dimension: usize,
    low: f64,
    high: f64,
}

impl PriorSet {
    /// A prior over `dimension` numbers; every dimension in exactly one of `independent` and `joint`.
    ///
    /// # Errors
    /// [`PriorError::TwoPriors`], [`PriorError::NoPrior`] or [`PriorError::NoDimension`], each with the dimension.
    pub fn new(
        dimension: usize,
        independent: Vec<(usize, SharedPrior)>,
        joint: Vec<JointNormal>,
    ) -> Result<Self, PriorError> {
        let mut marginals: Vec<Option<SharedPrior>> = vec![None; dimension];
        let mut place = |at: usize, prior: SharedPrior| -> Result<(), PriorError> {
            let slot =
                marginals.get_mut(at).ok_or(PriorError::NoDimension { dimension: at, count: dimension })?;
            if slot.replace(prior).is_some() {
                return Err(PriorError::TwoPriors { dimension: at });
            }
            Ok(())
        };
        let mut independent_at = Vec::with_capacity(independent.len());
        for (at, prior) in independent {
            place(at, prior)?;
            independent_at.push(at);
        }
        for block in &joint {
            for (position, at) in block.of().iter().enumerate() {
                let sd = block.covariance()[(position, position)].sqrt();
                place(*at, Arc::new(Normal::new(block.mean()[position], sd)?))?;
            }
        }
        let marginals = marginals
            .into_iter()
            .enumerate()
            .map(|(dimension, prior)| prior.ok_or(PriorError::NoPrior { dimension }))
            .collect::<Result<Vec<_>, _>>()?;
        independent_at.sort_unstable();
        let mut made = Self {
            marginals,
            independent: independent_at,
            joint,
            normals: vec![],
            flats: vec![],
            others: vec![],
            constant: 0.0,
        };
        made.sort_by_shape();
        Ok(made)
    }

    /// Independent priors, one a dimension, in order.
    pub fn from_independent(priors: Vec<SharedPrior>) -> Self {
        let mut made = Self {
            independent: (0..priors.len()).collect(),
            marginals: priors,
            joint: vec![],
            normals: vec![],
            flats: vec![],
            others: vec![],
            constant: 0.0,
        };
        made.sort_by_shape();
        made
    }

    fn sort_by_shape(&mut self) {
        for &dimension in &self.independent {
            let prior = &self.marginals[dimension];
            match prior.shape() {
                PriorShape::Normal { mean, sd } => {
                    self.normals.push(NormalTerm { dimension, mean, inverse_sd: sd.recip() });
                    self.constant += prior.log_density(mean);
                }
                PriorShape::Flat { low, high } => {
                    self.flats.push(FlatTerm { dimension, low, high });
                    self.constant += prior.log_density(low);
                }
                PriorShape::Other => self.others.push(dimension),
            }
        }
    }

    /// Number of dimensions.
    pub fn dimension(&self) -> usize {
        self.marginals.len()
    }

    /// Normalised log density; −∞ outside the support, and for a NaN coordinate.
    ///
    /// `point` has [`PriorSet::dimension`] entries.
    pub fn log_density(&self, point: &[f64]) -> f64 {
        for term in &self.flats {
            let x = point[term.dimension];
            if !(x >= term.low && x <= term.high) {
                return f64::NEG_INFINITY;
            }
        }
        let mut squares = 0.0;
        for term in &self.normals {
            let z = (point[term.dimension] - term.mean) * term.inverse_sd;
            squares += z * z;
        }
        let mut sum = self.constant - 0.5 * squares;
        for &dimension in &self.others {
            sum += self.marginals[dimension].log_density(point[dimension]);
        }
        for block in &self.joint {
            sum += block.log_density(point);
        }
        if sum.is_nan() { f64::NEG_INFINITY } else { sum }
    }

    /// Draws a point.
    pub fn sample(&self, rng: &mut dyn Rng, point: &mut [f64]) {
        for &dimension in &self.independent {
            point[dimension] = self.marginals[dimension].sample(rng);
        }
        for block in &self.joint {
            block.sample(rng, point);
        }
    }

    /// Maps a point of the open unit cube to the prior: uniform numbers in, draws of the prior out.
    pub fn from_unit_cube(&self, unit: &[f64], point: &mut [f64]) {
        for &dimension in &self.independent {
            point[dimension] = self.marginals[dimension].quantile(unit[dimension]);
        }
        for block in &self.joint {
            let normals: Vec<f64> = block.of().iter().map(|at| normal_quantile(unit[*at])).collect();
            block.colour(&normals, point);
        }
    }

    /// The prior of one dimension on its own (of a joint block: its marginal normal).
    pub fn marginal(&self, dimension: usize) -> &SharedPrior {
        &self.marginals[dimension]
    }

    /// Marginal mean; NaN where it does not exist.
    pub fn mean(&self, dimension: usize) -> f64 {
        self.marginals[dimension].mean()
    }

    /// Marginal standard deviation; +∞ where it diverges.
    pub fn standard_deviation(&self, dimension: usize) -> f64 {
        self.marginals[dimension].standard_deviation()
    }

    /// Half the width of the marginal's central 68.27 % interval: finite for every prior.
    pub fn spread(&self, dimension: usize) -> f64 {
        self.marginals[dimension].spread()
    }

    /// Marginal median: finite for every prior.
    pub fn median(&self, dimension: usize) -> f64 {
        self.marginals[dimension].median()
    }

    /// Marginal support.
    pub fn support(&self, dimension: usize) -> (f64, f64) {
        self.marginals[dimension].support()
    }

    /// Whether `point` lies where the density is above zero.
    pub fn contains(&self, point: &[f64]) -> bool {
        self.log_density(point) > f64::NEG_INFINITY
    }

    /// Dimensions with a prior of their own, in rising order.
    pub fn independent(&self) -> &[usize] {
        &self.independent
    }

    /// The joint normal blocks.
    pub fn joint(&self) -> &[JointNormal] {
        &self.joint
    }

    /// −∂² ln p / ∂xᵢ∂xⱼ at `point`: what the prior adds to a Fisher matrix. Diagonal but for the joint blocks.
    pub fn precision(&self, point: &[f64]) -> DMatrix<f64> {
        let n = self.dimension();
        let mut matrix = DMatrix::zeros(n, n);
        for &dimension in &self.independent {
            matrix[(dimension, dimension)] = self.marginals[dimension].curvature(point[dimension]);
        }
        for block in &self.joint {
            for (row, &i) in block.of().iter().enumerate() {
                for (column, &j) in block.of().iter().enumerate() {
                    matrix[(i, j)] = block.precision()[(row, column)];
                }
            }
        }
        matrix
    }
}
