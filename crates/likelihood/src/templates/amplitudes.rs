//! Amplitudes of templates, given a prediction: to draw them back after they were integrated out.

use nalgebra::{Cholesky, DMatrix, DVector};

use super::AmplitudePrior;
use crate::survey::SurveyLikelihood;
use crate::triangle::dot;

/// The normal distribution of the amplitudes of templates, given a prediction.
#[derive(Clone, Debug, PartialEq)]
pub struct Amplitudes {
    /// Mean.
    pub mean: DVector<f64>,
    /// Covariance.
    pub covariance: DMatrix<f64>,
    root: DMatrix<f64>,
}

impl Amplitudes {
    /// Amplitudes drawn from it, given as many independent standard normal numbers.
    pub fn draw(&self, standard_normal: &[f64]) -> DVector<f64> {
        assert_eq!(standard_normal.len(), self.mean.len(), "a number for each template");
        &self.mean + &self.root * DVector::from_column_slice(standard_normal)
    }
}

impl SurveyLikelihood {
    /// What the data say of the amplitudes, in the order of [`Self::templates`], given a prediction without them: from
    /// these the amplitudes are drawn back after a fit that had them integrated out.
    ///
    /// With T the templates, Σ their prior covariance (Σ⁻¹ = 0 where flat), m its mean, h the noise model's inflation:
    /// covariance A⁻¹ and mean m + A⁻¹Tᵀ(hC)⁻¹(d − p − T m), A = Tᵀ(hC)⁻¹T + Σ⁻¹.
    pub fn amplitudes(&self, prediction: &[f64]) -> Amplitudes {
        assert_eq!(prediction.len(), self.rows(), "a predicted number for each row");
        let Some(marginal) = &self.marginal else {
            return Amplitudes {
                mean: DVector::zeros(0),
                covariance: DMatrix::zeros(0, 0),
                root: DMatrix::zeros(0, 0),
            };
        };
        let precision = marginal.base.noise().weight(0.0);
        let count = marginal.templates.len();
        let whitened: Vec<Vec<f64>> = marginal
            .templates
            .iter()
            .map(|template| marginal.base.whiten_slice(template.shape.as_slice()))
            .collect();
        let residual: Vec<f64> = self
            .centred_data()
            .iter()
            .zip(prediction)
            .map(|(measured, predicted)| measured - predicted)
            .collect();
        let residual = marginal.base.whiten_slice(&residual);
        // In units in which every prior (or, where flat, the data alone) has width 1.
        let widths: Vec<f64> = marginal
            .templates
            .iter()
            .zip(&whitened)
            .map(|(template, whitened)| match template.prior {
                AmplitudePrior::Normal { standard_deviation, .. } => standard_deviation,
                AmplitudePrior::Flat => (precision * dot(whitened, whitened)).sqrt().recip(),
            })
            .collect();
        let information = DMatrix::from_fn(count, count, |i, j| {
            let prior = match marginal.templates[i].prior {
                AmplitudePrior::Normal { .. } if i == j => 1.0,
                _ => 0.0,
            };
            precision * dot(&whitened[i], &whitened[j]) * widths[i] * widths[j] + prior
        });
        let gradient = DVector::from_fn(count, |i, _| precision * dot(&whitened[i], &residual) * widths[i]);
        let factor = Cholesky::new(information)
            .expect("flat templates were found independent, the others add a unit matrix");
        let mut mean = factor.solve(&gradient);
        for (i, template) in marginal.templates.iter().enumerate() {
            mean[i] *= widths[i];
            if let AmplitudePrior::Normal { mean: prior, .. } = template.prior {
                mean[i] += prior;
            }
        }
        // A⁻¹ = L⁻ᵀ L⁻¹ for A = L Lᵀ: L⁻ᵀ is a root of the covariance.
        let identity = DMatrix::identity(count, count);
        let mut root = factor.l().tr_solve_lower_triangular(&identity).unwrap_or(identity);
        for (i, mut row) in root.row_iter_mut().enumerate() {
            row *= widths[i];
        }
        Amplitudes { mean, covariance: &root * root.transpose(), root }
    }
}
