//! n_θ of noise `percival`: how many quantities the data determine.

use super::measurements::Measurements;
use super::posterior::Posterior;
use crate::resolve::Study;
use crate::run_error::RunError;
use oddwell_likelihood::NoiseChoice;
use oddwell_sampler::{PeakSettings, Target, find_peak};

/// A quantity is determined where the Laplace approximation at the peak is narrower than this share of its prior.
const DETERMINED: f64 = 0.5;
/// n_θ moves the exponent of the noise, and that the peak, in turn: rounds until it stays, at most.
const ROUNDS: usize = 5;

/// For each group of surveys whose noise waits for it, the noise with n_θ: the free quantities that move its rows and whose
/// Laplace standard deviation at the peak is below half of their prior's. Starts from the noise that stands in its place.
///
/// # Errors
/// [`RunError`] where the posterior has no peak, or the noise can't be had with that many mocks.
pub(super) fn count_determined(
    posterior: &mut Posterior,
    measurements: &Measurements,
) -> Result<(), RunError> {
    let waiting: Vec<(usize, NoiseChoice)> = measurements
        .groups
        .iter()
        .enumerate()
        .filter_map(|(index, group)| Some((index, group.to_be_counted?)))
        .collect();
    let mut counted: Vec<usize> = Vec::new();
    for _ in 0..ROUNDS {
        let now = count(posterior, &waiting)?;
        if waiting.is_empty() || now == counted {
            break;
        }
        for ((group, noise), determined) in waiting.iter().zip(&now) {
            let noise = noise.with_determined(*determined);
            posterior.set_noise(*group, &noise).map_err(|source| {
                let surveys = &measurements.surveys[measurements.groups[*group].surveys.clone()];
                let names: Vec<&str> = surveys.iter().map(|survey| survey.name.as_str()).collect();
                RunError::Noise { survey: names.join("` with `"), source }
            })?;
        }
        posterior.compress()?;
        counted = now;
    }
    for ((group, _), determined) in waiting.iter().zip(counted) {
        posterior.set_determined(*group, determined);
    }
    Ok(())
}

/// Measurements with one noise for all hypotheses of the study: where n_θ is to be counted, the largest count of any, so that
/// their evidences compare.
///
/// # Errors
/// As [`Posterior::new`].
pub(crate) fn with_one_noise(
    study: &Study,
    mut measurements: Measurements,
) -> Result<Measurements, RunError> {
    if measurements.groups.iter().all(|group| group.to_be_counted.is_none()) {
        return Ok(measurements);
    }
    let mut largest = vec![0; measurements.groups.len()];
    for hypothesis in &study.hypotheses {
        let posterior = Posterior::new(study, hypothesis, &measurements)?;
        for (largest, counted) in largest.iter_mut().zip(posterior.determined()) {
            *largest = counted.unwrap_or(0).max(*largest);
        }
    }
    let surveys = &measurements.surveys;
    for (group, determined) in measurements.groups.iter_mut().zip(largest) {
        let Some(noise) = group.to_be_counted.take() else { continue };
        let survey = || surveys[group.surveys.start].name.clone();
        let noise = noise.with_determined(determined);
        let likelihood = group.likelihood.clone().with_noise(&noise);
        group.likelihood = likelihood.map_err(|source| RunError::Noise { survey: survey(), source })?;
    }
    Ok(measurements)
}

fn count(posterior: &Posterior, waiting: &[(usize, NoiseChoice)]) -> Result<Vec<usize>, RunError> {
    if posterior.dimension() == 0 || waiting.is_empty() {
        return Ok(vec![0; waiting.len()]);
    }
    let peak = find_peak(posterior, &posterior.priors, &PeakSettings::default())?;
    let sd = |parameter: usize| peak.covariance[(parameter, parameter)].sqrt();
    let determined = |parameter: &usize| {
        let prior = posterior.priors.standard_deviation(*parameter);
        let prior = if prior.is_finite() { prior } else { posterior.priors.spread(*parameter) };
        sd(*parameter) < DETERMINED * prior
    };
    let mut scratch = posterior.scratch();
    let plain = posterior.predict(&peak.point, &mut scratch)?;
    let mut counts = vec![0; waiting.len()];
    for parameter in (0..posterior.dimension()).filter(determined) {
        let (low, high) = posterior.priors.support(parameter);
        let mut moved = peak.point.clone();
        let step = 1e-3 * sd(parameter);
        moved[parameter] =
            if moved[parameter] + step < high { moved[parameter] + step } else { moved[parameter] - step };
        moved[parameter] = moved[parameter].max(low);
        let shifted = posterior.predict(&moved, &mut scratch)?;
        for ((first, survey), index) in posterior.data.with_offsets().zip(0..) {
            let rows = first..first + survey.rows();
            let Some(place) = waiting.iter().position(|(group, _)| *group == index) else { continue };
            if plain[rows.clone()] != shifted[rows] {
                counts[place] = (counts[place] + 1).min(survey.rows());
            }
        }
    }
    Ok(counts)
}
