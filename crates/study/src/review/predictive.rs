//! Posterior-predictive checks: would data drawn from the posterior lie as far from their prediction as the measured do?
//!
//! For each draw θ the probability that new data, drawn with the covariance about the prediction of θ, have a χ² at least
//! as large as the measured data have about the same prediction; averaged over the draws (Gelman, Meng & Stern 1996,
//! Statistica Sinica 6, 733, eq. 8). The probability for one draw is known in closed form, so no data are drawn. It uses
//! the data twice, and so errs towards 0.5: a small value is worth more than it says.

use super::{Context, Placed, ReviewError};
use crate::run_error::RunError;
use oddwell_sampler::Target;

/// One check.
#[derive(Clone, Debug, PartialEq)]
pub struct PredictiveCheck {
    /// `SURVEY` or `SURVEY.BIN`.
    pub place: String,
    /// Measured numbers.
    pub rows: usize,
    /// Mean χ² of the measurements over the draws.
    pub mean_chi_squared: f64,
    /// The probability; none where χ² has no known distribution.
    pub p_value: Option<f64>,
}

pub(super) fn predictive(context: &Context<'_>) -> Result<Vec<PredictiveCheck>, ReviewError> {
    let posterior = context.posterior;
    let mut places: Vec<(String, Placed<'_>, Vec<usize>)> = Vec::new();
    for placed in context.placed() {
        let in_group =
            |rows: Vec<usize>| rows.into_iter().map(|row| placed.within + row).collect::<Vec<usize>>();
        let all = (0..placed.survey.table.len()).collect();
        places.push((placed.survey.name.clone(), placed, in_group(all)));
        let bins = posterior.model.setup().bins.iter().enumerate();
        let own = bins.map(|(index, bin)| (bin.path(), placed, in_group(placed.survey.rows_of(index))));
        places.extend(own.filter(|(_, _, rows)| !rows.is_empty()));
    }
    let mut sums = vec![(0.0, Some(0.0)); places.len()];
    let mut scratch = posterior.scratch();
    for draw in context.draws {
        let prediction = posterior.predict(draw, &mut scratch).map_err(RunError::from)?;
        for ((_, placed, rows), (chi_squared, probability)) in places.iter().zip(&mut sums) {
            let Placed { survey, likelihood, first, .. } = *placed;
            let own = &prediction[first..first + likelihood.rows()];
            let name = || survey.name.clone();
            let found = likelihood
                .subset_chi_squared(own, rows)
                .map_err(|source| RunError::Likelihood { survey: name(), source })?;
            *chi_squared += found;
            let tail = likelihood.p_value(found, rows.len() as f64);
            *probability = probability.zip(tail).map(|(sum, tail)| sum + tail);
        }
    }
    let count = context.draws.len() as f64;
    let checks = places.into_iter().zip(sums).map(|((place, _, rows), (chi_squared, probability))| {
        let (mean_chi_squared, p_value) = (chi_squared / count, probability.map(|sum: f64| sum / count));
        PredictiveCheck { place, rows: rows.len(), mean_chi_squared, p_value }
    });
    Ok(checks.collect())
}
