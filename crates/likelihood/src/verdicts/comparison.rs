//! Measurements beside what is expected of them.

use nalgebra::{DMatrix, DVector};

use super::conditioning::conditioned;
use super::factored::Factored;
use crate::covariance::{Covariance, CovarianceError};
use crate::survey::{LikelihoodError, SurveyLikelihood};
use crate::surveys::SurveySet;
use crate::templates::{AmplitudePrior, Template, orthonormal};

/// What is expected before a fit: the prediction at the parameters' prior means, and what their priors make of it.
#[derive(Clone, Debug, PartialEq)]
pub struct Expectation {
    /// The prediction, one number a row.
    pub prediction: DVector<f64>,
    /// J: ∂prediction/∂parameter, rows × parameters.
    pub jacobian: DMatrix<f64>,
    /// Σ: the parameters' prior covariance; may be singular (held parameters, errors in common).
    pub prior_covariance: DMatrix<f64>,
}

impl Expectation {
    /// A prediction without free parameters.
    pub fn certain(prediction: DVector<f64>) -> Self {
        let rows = prediction.len();
        Self { prediction, jacobian: DMatrix::zeros(rows, 0), prior_covariance: DMatrix::zeros(0, 0) }
    }
}

/// A verdict that cannot be had.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum VerdictError {
    /// The likelihood or its covariance is at fault.
    #[error(transparent)]
    Likelihood(#[from] LikelihoodError),
    /// Shapes that do not fit each other.
    #[error(
        "{what} must have {expected} of {of}, found {found}; build all of them from the same rows and parameters"
    )]
    Shape {
        /// What is at fault.
        what: &'static str,
        /// What is counted.
        of: &'static str,
        /// How many there should be.
        expected: usize,
        /// How many there are.
        found: usize,
    },
    /// A number that is not finite.
    #[error(
        "{what} must hold finite numbers only, found {value}; look for what made it in the model's terms"
    )]
    NotFinite {
        /// What is at fault.
        what: &'static str,
        /// The value.
        value: f64,
    },
    /// A direction that the rows at hand do not see.
    #[error("the direction has no part in the {rows} rows at hand; give rows that it moves")]
    NoDirection {
        /// Rows.
        rows: usize,
    },
    /// Too few mocks for the question.
    #[error("{what} needs more than {least} mocks, found {mocks}; ask about fewer rows or make more mocks")]
    TooFewMocks {
        /// The question.
        what: &'static str,
        /// Mocks needed, less one.
        least: usize,
        /// Mocks there are.
        mocks: usize,
    },
}

impl From<CovarianceError> for VerdictError {
    fn from(error: CovarianceError) -> Self {
        VerdictError::Likelihood(error.into())
    }
}

/// Rows whose covariance was estimated together.
#[derive(Clone, Debug)]
struct Block {
    rows: Vec<usize>,
    covariance: DMatrix<f64>,
    mocks: Option<usize>,
}

/// Measurements d, the covariance N of their noise, and an expectation p with parameters of prior covariance Σ: for sound
/// data, d − p is drawn from N(0, N + JΣJᵀ).
///
/// Surveys of a set follow each other and have no noise in common; through the parameters they may have much. Normal
/// templates that a survey has integrated out are parameters here, flat ones are projected out of everything.
#[derive(Clone, Debug)]
pub struct Comparison {
    data: DVector<f64>,
    prediction: DVector<f64>,
    noise: Covariance,
    jacobian: DMatrix<f64>,
    prior_covariance: DMatrix<f64>,
    blocks: Vec<Block>,
    flat: Vec<Template>,
}

impl Comparison {
    /// All rows of a set of surveys.
    ///
    /// # Errors
    /// An expectation for other rows, or with numbers that are not finite.
    pub fn new(surveys: &SurveySet, expectation: &Expectation) -> Result<Self, VerdictError> {
        let rows = surveys.rows();
        let Expectation { prediction, jacobian, prior_covariance } = expectation;
        let parameters = jacobian.ncols();
        for (what, of, expected, found) in [
            ("the expected prediction", "rows", rows, prediction.len()),
            ("the jacobian", "rows", rows, jacobian.nrows()),
            ("the prior covariance", "rows", parameters, prior_covariance.nrows()),
            ("the prior covariance", "columns", parameters, prior_covariance.ncols()),
        ] {
            if expected != found {
                return Err(VerdictError::Shape { what, of, expected, found });
            }
        }
        for (what, numbers) in [
            ("the expected prediction", prediction.as_slice()),
            ("the jacobian", jacobian.as_slice()),
            ("the prior covariance", prior_covariance.as_slice()),
        ] {
            if let Some(value) = numbers.iter().find(|value| !value.is_finite()) {
                return Err(VerdictError::NotFinite { what, value: *value });
            }
        }
        let mut comparison = Self {
            data: DVector::zeros(rows),
            prediction: prediction.clone(),
            noise: block_diagonal(surveys)?,
            jacobian: jacobian.clone(),
            prior_covariance: prior_covariance.clone(),
            blocks: Vec::new(),
            flat: Vec::new(),
        };
        for (first, survey) in surveys.with_offsets() {
            comparison.data.rows_mut(first, survey.rows()).copy_from(survey.data());
            comparison.blocks.push(Block {
                rows: (first..first + survey.rows()).collect(),
                covariance: survey.noise_covariance().matrix().clone(),
                mocks: survey.mock_count(),
            });
            for template in survey.templates() {
                comparison.add_template(template, first);
            }
        }
        Ok(comparison)
    }

    /// All rows of one survey.
    ///
    /// # Errors
    /// As [`Self::new`].
    pub fn of_survey(survey: &SurveyLikelihood, expectation: &Expectation) -> Result<Self, VerdictError> {
        Self::new(&SurveySet::new(vec![survey.clone()]), expectation)
    }

    fn add_template(&mut self, template: &Template, first: usize) {
        let mut shape = DVector::zeros(self.len());
        shape.rows_mut(first, template.shape.len()).copy_from(&template.shape);
        match template.prior {
            AmplitudePrior::Normal { mean, standard_deviation } => {
                self.prediction.axpy(mean, &shape, 1.0);
                let parameters = self.jacobian.ncols();
                self.jacobian = self.jacobian.clone().insert_column(parameters, 0.0);
                self.jacobian.set_column(parameters, &shape);
                let prior = self.prior_covariance.clone();
                self.prior_covariance = prior.insert_row(parameters, 0.0).insert_column(parameters, 0.0);
                self.prior_covariance[(parameters, parameters)] = standard_deviation.powi(2);
            }
            AmplitudePrior::Flat => self.flat.push(Template { shape, ..template.clone() }),
        }
    }

    /// Number of rows.
    pub fn len(&self) -> usize {
        self.data.len()
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// The measured numbers.
    pub fn data(&self) -> &DVector<f64> {
        &self.data
    }

    /// The expected ones.
    pub fn prediction(&self) -> &DVector<f64> {
        &self.prediction
    }

    /// The covariance of the noise.
    pub fn noise(&self) -> &Covariance {
        &self.noise
    }

    /// Some rows alone (positions below [`Self::len`], none twice), by their own block of the covariance.
    pub fn select(&self, positions: &[usize]) -> Self {
        let pick = |vector: &DVector<f64>| vector.select_rows(positions);
        let blocks = self.blocks.iter().map(|block| {
            let place = |row: &usize| positions.iter().position(|position| position == row);
            let (inside, rows): (Vec<usize>, Vec<usize>) =
                block.rows.iter().enumerate().filter_map(|(at, row)| Some((at, place(row)?))).unzip();
            let covariance = block.covariance.select_rows(&inside).select_columns(&inside);
            Block { rows, covariance, mocks: block.mocks }
        });
        let flat = self.flat.iter().map(|flat| Template { shape: pick(&flat.shape), ..flat.clone() });
        Self {
            data: pick(&self.data),
            prediction: pick(&self.prediction),
            noise: self.noise.select(positions),
            jacobian: self.jacobian.select_rows(positions),
            prior_covariance: self.prior_covariance.clone(),
            blocks: blocks.filter(|block| !block.rows.is_empty()).collect(),
            flat: flat.collect(),
        }
    }

    /// With some parameters (columns of the Jacobian) known exactly, and with them whatever errors others have in
    /// common with them.
    pub fn holding(mut self, parameters: &[usize]) -> Self {
        self.prior_covariance = conditioned(&self.prior_covariance, parameters);
        self
    }

    /// About another prediction, with the same uncertainty.
    pub fn about(mut self, prediction: DVector<f64>) -> Self {
        assert_eq!(prediction.len(), self.len(), "a predicted number for each row");
        self.prediction = prediction;
        self
    }

    /// About nothing at all: zero expected, without uncertainty.
    pub fn about_zero(mut self) -> Self {
        self.prediction.fill(0.0);
        self.prior_covariance.fill(0.0);
        self
    }

    /// With the prediction, and what its parameters do to it, of opposite sign in these rows.
    pub(super) fn flipped(mut self, positions: &[usize]) -> Self {
        for position in positions {
            self.prediction[*position] *= -1.0;
            self.jacobian.row_mut(*position).neg_mut();
        }
        self
    }

    /// The difference of as many independent measurements, about zero: d₁ − d₂ with noise N₁ + N₂ and nothing else.
    pub(super) fn minus(self, other: Self) -> Self {
        let rows = self.len();
        let matrix = self.noise.matrix() + other.noise.matrix();
        let mut blocks = self.blocks;
        blocks.extend(other.blocks);
        Self {
            data: self.data - other.data,
            prediction: DVector::zeros(rows),
            noise: self.noise.with_matrix(matrix),
            jacobian: DMatrix::zeros(rows, 0),
            prior_covariance: DMatrix::zeros(0, 0),
            blocks,
            flat: Vec::new(),
        }
    }

    /// Shapes of flat templates.
    pub(super) fn flat_shapes(&self) -> impl Iterator<Item = &DVector<f64>> {
        self.flat.iter().map(|template| &template.shape)
    }

    /// d − p.
    pub(super) fn residual(&self) -> DVector<f64> {
        &self.data - &self.prediction
    }

    /// JΣJᵀ.
    pub(super) fn spread(&self) -> DMatrix<f64> {
        &self.jacobian * &self.prior_covariance * self.jacobian.transpose()
    }

    /// Factors N + JΣJᵀ.
    pub(super) fn factored(&self) -> Result<Factored, VerdictError> {
        let total = self.noise.with_matrix(self.noise.matrix() + self.spread());
        let factor = total.factor()?;
        let all: Vec<usize> = (0..self.len()).collect();
        let (projected, _) = orthonormal(&factor, self.flat.iter(), self.len(), Some(&all))
            .map_err(LikelihoodError::Template)?;
        let noise_rows = (self.len() - projected.len()) as f64;
        let mut factored = Factored { factor, projected, mocks: None, noise_mocks: None, noise_rows };
        self.count_mocks(&mut factored);
        Ok(factored)
    }

    /// The number n of mocks that a covariance as uncertain as C = N + JΣJᵀ would have been estimated from, where anything
    /// was estimated at all:
    ///
    ///   n − 1 = (p + p²) / Σ_b { tr[(N_b C⁻¹)²] + [tr(N_b C⁻¹)]² } / (n_b − 1)
    ///
    /// for p rows and blocks N_b estimated from n_b mocks. Nel & van der Merwe 1986, Commun. Stat. Theory Methods 15, 3719,
    /// as Krishnamoorthy & Yu 2004, Stat. Probab. Lett. 66, 161, have it: the first two moments of C match. n = n_b where one
    /// block is everything. For the noise alone, tr[(N C⁻¹)²] + [tr(N C⁻¹)]² stands above the line.
    fn count_mocks(&self, factored: &mut Factored) {
        if self.blocks.iter().all(|block| block.mocks.is_none()) {
            return;
        }
        let whitened_identity = factored.whiten_matrix(&DMatrix::identity(self.len(), self.len()));
        let rank = factored.degrees_of_freedom();
        let moments = |rows: &[usize], covariance: &DMatrix<f64>| {
            let columns = whitened_identity.select_columns(rows);
            let whitened = &columns * covariance * columns.transpose();
            (whitened.norm_squared() + whitened.trace().powi(2), whitened.trace())
        };
        let mut uncertainty = 0.0;
        for block in &self.blocks {
            if let Some(mocks) = block.mocks {
                uncertainty += moments(&block.rows, &block.covariance).0 / (mocks as f64 - 1.0);
            }
        }
        if uncertainty > 0.0 {
            let all: Vec<usize> = (0..self.len()).collect();
            let (noise, trace) = moments(&all, self.noise.matrix());
            factored.mocks = Some((rank + rank * rank) / uncertainty + 1.0);
            factored.noise_mocks = Some(noise / uncertainty + 1.0);
            factored.noise_rows = trace;
        }
    }
}

fn block_diagonal(surveys: &SurveySet) -> Result<Covariance, VerdictError> {
    let mut matrix = DMatrix::zeros(surveys.rows(), surveys.rows());
    let mut labels = Vec::new();
    let mut origins = Vec::new();
    for (first, survey) in surveys.with_offsets() {
        let covariance = survey.noise_covariance();
        matrix.view_mut((first, first), (survey.rows(), survey.rows())).copy_from(covariance.matrix());
        labels.extend(covariance.labels().iter().cloned());
        origins.push(covariance.origin().to_owned());
    }
    Ok(Covariance::labelled(matrix, origins.join(" with "), labels)?)
}
