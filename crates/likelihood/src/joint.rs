//! Surveys that share volume: one likelihood, one covariance, one mock count.

use nalgebra::DVector;

use crate::covariance::Covariance;
use crate::noise::NoiseChoice;
use crate::survey::{LikelihoodError, SurveyLikelihood};
use crate::table::MultipoleTable;

/// One of the surveys that share a covariance.
#[derive(Clone, Copy, Debug)]
pub struct JointSurvey<'a> {
    /// Its name, for messages.
    pub name: &'a str,
    /// All its rows, in the order in which the covariance has them.
    pub table: &'a MultipoleTable,
    /// Positions of the rows that are kept.
    pub kept: &'a [usize],
}

impl SurveyLikelihood {
    /// The likelihood of several surveys together. `covariance` has the rows of the first survey's whole table, then of
    /// the second's, and so on; predictions have the kept rows in the same order.
    ///
    /// n_d of the noise model counts the kept rows of all of them; the mock count is that of the joint covariance.
    ///
    /// # Errors
    /// A covariance of another size than all tables together; else as [`SurveyLikelihood::new`].
    pub fn joint(
        surveys: &[JointSurvey<'_>],
        covariance: &Covariance,
        noise: &NoiseChoice,
    ) -> Result<Self, LikelihoodError> {
        let expected: usize = surveys.iter().map(|survey| survey.table.len()).sum();
        if covariance.len() != expected {
            return Err(crate::CovarianceError::WrongSize {
                origin: covariance.origin().to_owned(),
                expected,
                found: covariance.len(),
            }
            .into());
        }
        let (mut values, mut positions, mut labels) = (Vec::new(), Vec::new(), Vec::new());
        let mut first = 0;
        for survey in surveys {
            for position in survey.kept {
                let row = &survey.table.rows[*position];
                values.push(row.value);
                positions.push(first + position);
                labels.push(format!("line {} of {} ({})", row.line, survey.name, row.description()));
            }
            first += survey.table.len();
        }
        let covariance = covariance.select(&positions).with_labels(labels);
        Self::from_covariance(DVector::from_vec(values), covariance, noise)
    }
}
