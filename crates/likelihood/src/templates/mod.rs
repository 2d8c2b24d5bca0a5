//! Linear templates: shapes that add to every prediction with an amplitude of their own, integrated out exactly.

mod amplitudes;
mod error;

use std::fmt;
use std::path::Path;
use std::sync::Arc;

use nalgebra::DVector;

pub use amplitudes::Amplitudes;
pub use error::TemplateError;

use crate::arrays::{ArrayError, file_bytes, format_of, parse_array};
use crate::error::DataError;
use crate::noise::{NoiseError, NoiseModel};
use crate::survey::{LikelihoodError, SurveyLikelihood};
use crate::triangle::{LowerTriangle, dot};

/// What is known of a template's amplitude before the data.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum AmplitudePrior {
    /// Normal, with a finite mean and a standard deviation above 0.
    Normal {
        /// Mean.
        mean: f64,
        /// Standard deviation.
        standard_deviation: f64,
    },
    /// Density 1 per unit of the amplitude, everywhere. Not normalised: evidences hold against each other for the same
    /// templates in the same units, and mean nothing by themselves.
    Flat,
}

/// A shape t that is added to the prediction: prediction + a t.
#[derive(Clone, Debug, PartialEq)]
pub struct Template {
    /// Its name, for messages.
    pub name: String,
    /// One number a row, in the units of the measurements for an amplitude of 1.
    pub shape: DVector<f64>,
    /// The prior of a.
    pub prior: AmplitudePrior,
}

/// Reads a template's shape: one number for each of `rows` rows of the table, one a line, in any of
/// [`array_formats`](crate::array_formats).
///
/// # Errors
/// No such file; a file that is not of its format; another number of lines or more than one column; a number that is not
/// finite.
pub fn read_template(path: impl AsRef<Path>, rows: usize) -> Result<DVector<f64>, DataError> {
    let path = path.as_ref();
    let fits = |file: &str, lines: usize, columns: usize| match (lines, columns) == (rows, 1) {
        true => Ok(()),
        false => {
            Err(ArrayError::VectorLength { file: file.to_owned(), expected: rows, rows: lines, columns }
                .into())
        }
    };
    let array = parse_array(format_of(path)?, &path.display().to_string(), &file_bytes(path)?, &fits)?;
    array.check_finite()?;
    Ok(array.numbers.column(0).into_owned())
}

/// A survey's templates, prepared.
#[derive(Clone)]
pub(crate) struct Marginal {
    /// The survey without them.
    pub(crate) base: Box<SurveyLikelihood>,
    pub(crate) templates: Vec<Template>,
    /// Σ (prior mean) t, added to every prediction.
    pub(crate) shift: Vec<f64>,
    /// Orthonormal columns that span the whitened flat templates: directions of no information.
    pub(crate) projected: Vec<Vec<f64>>,
}

impl fmt::Debug for Marginal {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.debug_list().entries(self.templates.iter().map(|template| &template.name)).finish()
    }
}

/// A noise model with a constant added: what flat amplitudes leave behind.
#[derive(Debug)]
struct Offset {
    inner: Arc<dyn NoiseModel>,
    offset: f64,
}

impl NoiseModel for Offset {
    fn name(&self) -> &'static str {
        self.inner.name()
    }

    fn log_likelihood(&self, chi_squared: f64) -> f64 {
        self.inner.log_likelihood(chi_squared) + self.offset
    }

    fn weight(&self, chi_squared: f64) -> f64 {
        self.inner.weight(chi_squared)
    }

    fn is_normalised(&self) -> bool {
        false
    }
}

impl SurveyLikelihood {
    /// The same survey with the amplitudes of templates integrated out, exactly: for normal noise of covariance C and
    /// amplitudes a of prior N(m, σ²),
    ///
    ///   ∫ N(d; p + a t, C) N(a; m, σ²) da = N(d; p + m t, C + σ² t tᵀ),
    ///
    /// one template after another. With a flat prior of density 1 it is the limit of σ√(2π) times this: the direction of t
    /// is projected out of χ² (with T = L⁻¹t, C = L Lᵀ: T's part of the whitened residual is dropped), and
    ///
    ///   ln L = −½ χ²⊥ − ½ ln det(2πC) + (k/2) ln 2π − ½ ln det(TᵀT)
    ///
    /// for k flat templates. [`Self::covariance`] is then that with the normal templates in it; flat ones appear only in
    /// χ², whitened directions and information, and take a degree of freedom each ([`Self::flat_templates`]).
    ///
    /// `hartlap` is normal with C inflated by h: σ²/h is added, so that h (C + σ² t tᵀ/h) = h C + σ² t tᵀ. `t` and
    /// `percival` are not normal, and no likelihood of theirs results: they are refused; infer the amplitude as a
    /// parameter of the model instead.
    ///
    /// Further templates can be added later; a change of noise keeps them where it can.
    ///
    /// # Errors
    /// A shape of another length or not finite, a standard deviation of 0 or below, flat templates that depend on each
    /// other over the rows at hand; noise `t` or `percival`.
    pub fn with_templates(self, templates: &[Template]) -> Result<Self, LikelihoodError> {
        let (base, mut all) = match self.marginal {
            Some(marginal) => (marginal.base.as_ref().clone(), marginal.templates.clone()),
            None => (self, Vec::new()),
        };
        if templates.is_empty() && all.is_empty() {
            return Ok(base);
        }
        for template in templates {
            check(template, base.rows())?;
        }
        all.extend_from_slice(templates);
        base.marginalised(all)
    }

    /// `self` has no templates yet.
    fn marginalised(self, templates: Vec<Template>) -> Result<Self, LikelihoodError> {
        let inflation = self.normal_inflation()?;
        let mut matrix = self.covariance().matrix().clone();
        let mut shift = vec![0.0; self.rows()];
        for template in &templates {
            if let AmplitudePrior::Normal { mean, standard_deviation } = template.prior {
                let scaled = &template.shape * standard_deviation;
                matrix.ger(inflation.recip(), &scaled, &scaled, 1.0);
                shift.iter_mut().zip(template.shape.iter()).for_each(|(sum, entry)| *sum += mean * entry);
            }
        }
        // Rounding of the sum is symmetric: entry (i, j) and entry (j, i) are the same products.
        let covariance = self.covariance().with_matrix(matrix);
        let mut survey = Self::from_covariance(self.data().clone(), covariance, self.choice())?;
        let flat = templates.iter().filter(|template| template.prior == AmplitudePrior::Flat);
        let (projected, log_determinant) = orthonormal(survey.factor(), flat, self.rows(), None)?;
        if !projected.is_empty() {
            // Each integral brings √(2πh/TᵀT), T whitened with C: the inflated covariance's information is TᵀT/h.
            let each = (std::f64::consts::TAU * inflation).ln();
            let offset = 0.5 * (projected.len() as f64 * each - log_determinant);
            survey.set_noise(Arc::new(Offset { inner: survey.shared_noise(), offset }));
        }
        survey.marginal = Some(Arc::new(Marginal { base: Box::new(self), templates, shift, projected }));
        Ok(survey)
    }

    /// The factor by which the noise model inflates the covariance; refused where the noise is not normal.
    fn normal_inflation(&self) -> Result<f64, NoiseError> {
        let weight = self.noise().weight(0.0);
        // Normal noise has one weight whatever χ² is.
        match self.noise().weight(1.0) == weight {
            true => Ok(weight.recip()),
            false => Err(NoiseError::Templates { name: self.noise().name() }),
        }
    }

    /// The same templates over a survey with other noise.
    pub(crate) fn with_templates_of(self, marginal: &Marginal) -> Result<Self, NoiseError> {
        self.normal_inflation()?;
        // All else was checked when the templates were first integrated out.
        self.marginalised(marginal.templates.clone()).map_err(|error| match error {
            LikelihoodError::Noise(error) => error,
            _ => NoiseError::Templates { name: "gaussian" },
        })
    }

    /// The templates that are integrated out.
    pub fn templates(&self) -> &[Template] {
        self.marginal.as_ref().map_or(&[], |marginal| marginal.templates.as_slice())
    }

    /// How many of them have a flat prior: degrees of freedom that the data lose to them.
    pub fn flat_templates(&self) -> usize {
        self.marginal.as_ref().map_or(0, |marginal| marginal.projected.len())
    }
}

fn check(template: &Template, rows: usize) -> Result<(), TemplateError> {
    let name = || template.name.clone();
    if template.shape.len() != rows {
        return Err(TemplateError::Length { name: name(), expected: rows, found: template.shape.len() });
    }
    let not_finite = |what, value| Err(TemplateError::NotFinite { name: name(), what, value });
    if let Some(value) = template.shape.iter().find(|value| !value.is_finite()) {
        return not_finite("each entry", *value);
    }
    match template.prior {
        AmplitudePrior::Normal { mean, .. } if !mean.is_finite() => {
            not_finite("the mean of the amplitude", mean)
        }
        AmplitudePrior::Normal { standard_deviation: value, .. } if !value.is_finite() => {
            not_finite("the standard deviation of the amplitude", value)
        }
        AmplitudePrior::Normal { standard_deviation: value, .. } if value <= 0.0 => {
            Err(TemplateError::NoWidth { name: name(), value })
        }
        _ => Ok(()),
    }
}

/// Orthonormal columns that span whitened templates, and ln det(TᵀT). Of some rows only where `positions` are given, and
/// then templates that those rows do not tell apart count once.
pub(crate) fn orthonormal<'a>(
    factor: &LowerTriangle,
    templates: impl Iterator<Item = &'a Template>,
    rows: usize,
    positions: Option<&[usize]>,
) -> Result<(Vec<Vec<f64>>, f64), TemplateError> {
    let mut columns: Vec<Vec<f64>> = Vec::new();
    let mut log_determinant = 0.0;
    for template in templates {
        let mut column: Vec<f64> = match positions {
            Some(positions) => positions.iter().map(|position| template.shape[*position]).collect(),
            None => template.shape.as_slice().to_vec(),
        };
        factor.solve_in_place(&mut column);
        let length = dot(&column, &column).sqrt();
        // Twice: the first pass leaves rounding of the size of what it takes away.
        project_out(&columns, &mut column);
        project_out(&columns, &mut column);
        let rest = dot(&column, &column).sqrt();
        if rest.is_nan() || rest <= rows as f64 * f64::EPSILON * length {
            match positions {
                Some(_) => continue,
                None => return Err(TemplateError::Undetermined { name: template.name.clone() }),
            }
        }
        log_determinant += 2.0 * rest.ln();
        column.iter_mut().for_each(|entry| *entry /= rest);
        columns.push(column);
    }
    Ok((columns, log_determinant))
}

/// x less its parts along orthonormal columns, one after another.
pub(crate) fn project_out(columns: &[Vec<f64>], x: &mut [f64]) {
    for column in columns {
        let along = dot(column, x);
        x.iter_mut().zip(column).for_each(|(entry, direction)| *entry -= along * direction);
    }
}
