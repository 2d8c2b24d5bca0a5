//! How far the departure moves when the data are cut or the assumptions changed.
//!
//! Each variation is fitted anew. Where its data are a subset of the whole run's, the two estimates share data, and their
//! difference scatters by √(var(subset) − var(whole)) alone (Gratton & Challinor 2020, MNRAS 499, 3410, for maximum
//! likelihood). Of posterior means with the same priors it holds too, averaged over what the priors and the noise may
//! bring: E\[θ|subset\] is the mean of E\[θ|whole\] given the subset, so the variance of their difference is the mean
//! of var(θ|subset) less that of var(θ|whole).

mod variations;

use crate::assemble::{Posterior, read_measurements};
use crate::record::{Stability, StabilityPoint, Summary, Variation};
use crate::resolve::{Hypothesis, Study};
use crate::run_error::RunError;
use oddwell_sampler::diagnostics::ParameterDiagnostics;
use oddwell_sampler::{Control, EnsembleSettings, Progress, sample};
use variations::{Change, changes};

/// Effective samples that the departure must reach in a variation: its mean is then known to 0.03 of its standard
/// deviation, which is little beside the scatter that is looked for.
const EFFECTIVE_SAMPLES: f64 = 1000.0;

/// Fits every variation of a run. `progress` is told, before each, how many there are, which is next, and what it is;
/// and it may stop the whole.
///
/// # Errors
/// [`RunError::NoStability`] for a hypothesis that does not infer exactly one departure parameter; what stops a single
/// variation is its `reason`. [`RunError::Sampler`] where the caller stopped it.
pub fn stability(
    study: &Study,
    hypothesis: &Hypothesis,
    summary: &Summary,
    seed: u64,
    progress: &mut dyn FnMut(Step<'_>) -> Control,
) -> Result<Stability, RunError> {
    let parameter = match &summary.departure_parameters[..] {
        [only] => only.clone(),
        several => {
            let (hypothesis, found) = (hypothesis.name.clone(), several.len());
            return Err(RunError::NoStability { hypothesis, found });
        }
    };
    let measurements = read_measurements(study)?;
    let blinded = study.file.blinding.is_some();
    let changes = changes(study, hypothesis, &measurements);
    // The summary does not tell the mean while blinded: the whole is then sampled once more.
    let whole = match summary.parameters.get(&parameter) {
        Some(known) if known.mean.is_some() => StabilityPoint {
            mean: known.mean,
            sd: known.sd,
            mcse: known.mcse,
            converged: summary.converged,
            data_points: summary.best.data_points,
        },
        _ => {
            progress(Step::Begun { index: 0, count: changes.len() + 1, text: "everything" });
            fitted(study, hypothesis, &parameter, seed, progress)?
        }
    };
    let mut variations = Vec::with_capacity(changes.len());
    for (index, change) in changes.iter().enumerate() {
        if progress(Step::Begun { index, count: changes.len(), text: &change.text }) == Control::Stop {
            return Err(oddwell_sampler::SamplerError::Stopped.into());
        }
        variations.push(vary(study, hypothesis, (&parameter, &whole), change, seed, progress)?);
    }
    let mut found = Stability { parameter, blinded, whole, variations };
    if blinded {
        found.whole.mean = None;
        found
            .variations
            .iter_mut()
            .filter_map(|variation| variation.found.as_mut())
            .for_each(|point| point.mean = None);
    }
    Ok(found)
}

/// Where a run of variations stands.
#[derive(Clone, Copy, Debug)]
pub enum Step<'a> {
    /// A variation begins.
    Begun {
        /// Which, from 0.
        index: usize,
        /// Of how many.
        count: usize,
        /// What is changed.
        text: &'a str,
    },
    /// It is being sampled.
    Sampling(&'a Progress),
}

fn vary(
    study: &Study,
    hypothesis: &Hypothesis,
    (parameter, whole): (&str, &StabilityPoint),
    change: &Change,
    seed: u64,
    progress: &mut dyn FnMut(Step<'_>) -> Control,
) -> Result<Variation, RunError> {
    let mut variation = Variation {
        kind: change.kind.to_owned(),
        text: change.text.clone(),
        place: change.place.clone(),
        found: None,
        reason: None,
        difference: None,
        expected_scatter: None,
    };
    let changed = change.apply(study).and_then(|changed| {
        let own = changed.hypothesis(Some(&hypothesis.name))?.clone();
        fitted(&changed, &own, parameter, seed, progress)
    });
    match changed {
        Ok(point) => {
            variation.difference = point.mean.zip(whole.mean).map(|(one, other)| one - other);
            if change.nested {
                variation.expected_scatter = scatter(&point, whole);
            }
            variation.found = Some(point);
        }
        Err(error) if error.is_interruption() => return Err(error),
        Err(error) => variation.reason = Some(error.to_string()),
    }
    Ok(variation)
}

/// √(var(subset) − var(whole) + Monte Carlo variances of both means).
fn scatter(subset: &StabilityPoint, whole: &StabilityPoint) -> Option<f64> {
    let squared = |value: Option<f64>| value.map(|value| value * value);
    let more = squared(subset.sd)? - squared(whole.sd)?;
    let noise = squared(subset.mcse)? + squared(whole.mcse)?;
    // The variances are themselves estimates, and may come out the wrong way round where next to nothing was cut.
    Some((more.max(0.0) + noise).sqrt())
}

fn fitted(
    study: &Study,
    hypothesis: &Hypothesis,
    parameter: &str,
    seed: u64,
    progress: &mut dyn FnMut(Step<'_>) -> Control,
) -> Result<StabilityPoint, RunError> {
    let measurements = read_measurements(study)?;
    let posterior = Posterior::new(study, hypothesis, &measurements)?;
    let watched: Vec<usize> = hypothesis.free_index(parameter).into_iter().collect();
    let sampling = &study.file.sampling;
    let settings = EnsembleSettings {
        seed,
        effective_samples: EFFECTIVE_SAMPLES.min(sampling.effective_samples.value as f64),
        watched: watched.clone(),
        ensembles: sampling.ensembles.value as usize,
        ..EnsembleSettings::default()
    };
    let chain =
        sample(&posterior, &posterior.priors, &settings, &mut |state| progress(Step::Sampling(state)))?;
    let known: Option<&ParameterDiagnostics> =
        watched.first().and_then(|&index| chain.diagnostics.get(index));
    let number = |value: fn(&ParameterDiagnostics) -> f64| known.map(value).filter(|value| value.is_finite());
    Ok(StabilityPoint {
        mean: number(|known| known.mean),
        sd: number(|known| known.sd),
        mcse: number(|known| known.mcse),
        converged: chain.outcome.converged,
        data_points: measurements.len(),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn point(sd: f64, mcse: f64) -> StabilityPoint {
        StabilityPoint { mean: Some(0.0), sd: Some(sd), mcse: Some(mcse), converged: true, data_points: 1 }
    }

    #[test]
    fn nested_subsets_scatter_by_what_they_lack() {
        assert_eq!(scatter(&point(5.0, 0.0), &point(4.0, 0.0)), Some(3.0));
        // Nothing was cut: only the noise of the draws is left.
        assert_eq!(scatter(&point(3.9, 0.3), &point(4.0, 0.4)), Some(0.5));
        assert_eq!(scatter(&StabilityPoint { sd: None, ..point(1.0, 0.1) }, &point(1.0, 0.1)), None);
    }
}
