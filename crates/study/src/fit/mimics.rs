//! What it would take for general relativity to give the same data.

use super::analysis::Analysis;
use super::general_relativity::points;
use crate::assemble::{Posterior, PosteriorScratch};
use crate::record::{GeneralRelativity, Mimic};
use crate::run_error::RunError;
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::allowed_shift;
use oddwell_sampler::Chain;

/// Beyond this share of the posterior a departure is above one standard deviation.
const ONE_SIGMA: f64 = 0.3173;

/// Groups of nuisances, by the end of their names, and what a unit shift of all of them is.
const GROUPS: [(&str, &[&str]); 3] = [
    // Where the slope of the catalogue is given, an error of it is one of the evolution bias.
    ("evolution", &[".evolution", ".observed_density_slope"]),
    ("magnification", &[".magnification"]),
    ("offset", &[".offset"]),
];

/// For each group of nuisances: the common shift of all its members with which general relativity comes closest to the
/// best prediction, in units of the noise; what the priors allow of it; and how close it comes. Empty where the departure
/// is below one standard deviation, or has no amplitude that general relativity sets to zero.
pub(super) fn mimics(
    posterior: &Posterior,
    chain: &Chain,
    analysis: &Analysis,
    verdict: &GeneralRelativity,
    scratch: &mut PosteriorScratch,
) -> Result<Vec<Mimic>, RunError> {
    let amplitudes = points(posterior);
    let clear = match &amplitudes[..] {
        [only] => {
            let diagnostics = &chain.diagnostics[only.parameter];
            (diagnostics.mean - only.value).abs() > diagnostics.sd
        }
        _ => verdict.tail_probability.is_some_and(|tail| tail < ONE_SIGMA),
    };
    if amplitudes.is_empty() || !clear {
        return Ok(Vec::new());
    }
    let mut relativity = analysis.best.clone();
    for point in &amplitudes {
        relativity[point.parameter] = point.value;
    }
    let values = posterior.values(&relativity);
    let plain = posterior.predict_values(&values, scratch)?;
    let departure = difference(&analysis.prediction, &plain);
    let mut mimics = Vec::new();
    for (nuisance, endings) in GROUPS {
        let names = posterior.model.layout().names().iter().enumerate();
        let slots: Vec<usize> = names
            .filter(|(_, name)| endings.iter().any(|ending| name.ends_with(ending)))
            .map(|(slot, _)| slot)
            .collect();
        let mut shifted = values.clone();
        for &slot in &slots {
            shifted[slot] += 1.0;
        }
        let shifted = posterior.predict_values(&shifted, scratch)?;
        let change = difference(&shifted, &plain);
        let overlap = projection(posterior, &departure, &change);
        let (own, of_departure) =
            (projection(posterior, &change, &change), projection(posterior, &departure, &departure));
        if !(own > 0.0 && of_departure > 0.0) {
            continue;
        }
        mimics.push(Mimic {
            nuisance: nuisance.to_owned(),
            shift: overlap / own,
            allowed: allowed(posterior, analysis, &slots),
            likeness: overlap.abs() / (own * of_departure).sqrt(),
        });
    }
    Ok(mimics)
}

/// Number by number.
pub(super) fn difference(one: &[f64], other: &[f64]) -> Vec<f64> {
    one.iter().zip(other).map(|(one, other)| one - other).collect()
}

/// oneᵀ C⁻¹ other, summed over surveys.
pub(super) fn projection(posterior: &Posterior, one: &[f64], other: &[f64]) -> f64 {
    let surveys = posterior.data.with_offsets();
    surveys
        .map(|(first, survey)| {
            let rows = first..first + survey.rows();
            survey.projection(&one[rows.clone()], &other[rows])
        })
        .sum()
}

/// The prior's standard deviation of a common shift of these slots; none where one of them is held.
fn allowed(posterior: &Posterior, analysis: &Analysis, slots: &[usize]) -> Option<f64> {
    let mut map = DMatrix::zeros(slots.len(), posterior.map.dimension());
    for term in posterior.map.terms() {
        if let Some(row) = slots.iter().position(|&slot| slot == term.slot) {
            map[(row, term.parameter)] += term.coefficient;
        }
    }
    let covariance = &map * &analysis.prior_covariance * map.transpose();
    allowed_shift(&covariance, &DVector::from_element(slots.len(), 1.0))
}
