//! What to look at before believing a fit.

use super::analysis::Analysis;
use crate::assemble::{Measurements, Posterior, PosteriorScratch};
use crate::evolution::large_evolution;
use crate::resolve::FreePrior;
use crate::run_error::RunError;
use crate::unaveraged::unaveraged_shells;
use crate::warnings::Warning;
use crate::worth::offset_in_tau;
use nalgebra::DMatrix;
use oddwell_likelihood::posterior_covariance;
use oddwell_model::FeltBy;
use oddwell_sampler::{Chain, FailedTest, Prior, Test};

/// A posterior density at a prior's edge above a tenth of a normal's peak is a pile-up: 0.1 × 0.399/sd.
const EDGE_DENSITY: f64 = 0.04;
/// … measured in a strip of this share of the standard deviation.
const EDGE_STRIP: f64 = 0.1;
/// A nuisance that the data leave alone fills its prior to the edge, which is no pile-up: it must have this many times the
/// prior's own probability in the strip.
const EDGE_EXCESS: f64 = 1.5;
/// A nuisance moved by more prior standard deviations than this.
const MOVED: f64 = 2.0;
/// A departure whose posterior is wider than this share of its prior was not tested.
const UNTESTED: f64 = 0.9;
/// 1 km/s of offset worth more than this in τ.
const OFFSET_WORTH: f64 = 0.3;

pub(super) fn suspicions(
    posterior: &Posterior,
    measurements: &Measurements,
    chain: &Chain,
    analysis: &Analysis,
    scratch: &mut PosteriorScratch,
) -> Result<Vec<Warning>, RunError> {
    let mut warnings = Vec::new();
    if !chain.outcome.converged {
        warnings.push(not_converged(posterior, chain));
    }
    warnings.extend(untested(posterior, chain));
    warnings.extend(edges(posterior, chain));
    warnings.extend(moved(posterior, chain));
    warnings.extend(unshared(posterior, analysis));
    let values = posterior.values(&analysis.best);
    if !posterior.hypothesis.watched().is_empty() {
        warnings.extend(small_separations(posterior, measurements, &values)?);
    }
    warnings.extend(large_evolution(posterior, &values)?);
    warnings.extend(growth_assumed(posterior));
    warnings.extend(unaveraged_shells(posterior, measurements, &values, scratch)?);
    Ok(warnings)
}

fn not_converged(posterior: &Posterior, chain: &Chain) -> Warning {
    let names = posterior.map.names();
    let Some(FailedTest { parameter, test, value, wanted, more_evaluations }) = chain.outcome.failing.first()
    else {
        let (parameter, failed) = ("all".to_owned(), "the end of warm-up could not be told".to_owned());
        return Warning::NotConverged { parameter, failed, longer: None };
    };
    Warning::NotConverged {
        parameter: names[*parameter].clone(),
        failed: match test {
            Test::WalkerRhat => format!("R̂ of single walkers = {value:.4}, which must be below {wanted}"),
            Test::Rhat => format!("R̂ = {value:.4}, which must be below {wanted}"),
            _ => format!("{value:.0} of {wanted:.0} {test}"),
        },
        longer: more_evaluations.map(|more| 1.0 + more / chain.evaluations as f64),
    }
}

fn untested(posterior: &Posterior, chain: &Chain) -> Vec<Warning> {
    let watched = posterior.hypothesis.watched().into_iter();
    watched
        .filter_map(|index| {
            let prior = posterior.priors.standard_deviation(index);
            let ratio = chain.diagnostics[index].sd / prior;
            (prior.is_finite() && ratio > UNTESTED)
                .then(|| Warning::Untested { parameter: posterior.map.names()[index].clone(), ratio })
        })
        .collect()
}

/// The ends of a prior at which its density stops short: of a flat family, or of a window.
fn hard_edges(prior: &dyn Prior) -> Vec<f64> {
    let (low, high) = match prior.within() {
        Some(window) => window,
        None if matches!(prior.family(), "uniform" | "log_uniform") => prior.support(),
        None => return Vec::new(),
    };
    [low, high].into_iter().filter(|edge| edge.is_finite()).collect()
}

fn edges(posterior: &Posterior, chain: &Chain) -> Vec<Warning> {
    let mut warnings = Vec::new();
    for &index in posterior.priors.independent() {
        let strip = EDGE_STRIP * chain.diagnostics[index].sd;
        let prior = posterior.priors.marginal(index);
        let edges = hard_edges(prior.as_ref());
        if edges.is_empty() || !(strip > 0.0) {
            continue;
        }
        let nuisance = !posterior.hypothesis.watched().contains(&index);
        let draws = chain.column(index);
        for edge in edges {
            let near = draws.iter().filter(|draw| (*draw - edge).abs() < strip).count();
            let share = near as f64 / draws.len() as f64;
            let before = prior.cdf(edge + strip) - prior.cdf(edge - strip);
            if share > EDGE_DENSITY * EDGE_STRIP && !(nuisance && share < EDGE_EXCESS * before) {
                warnings.push(Warning::PriorEdge { parameter: posterior.map.names()[index].clone(), edge });
            }
        }
    }
    warnings
}

fn moved(posterior: &Posterior, chain: &Chain) -> Vec<Warning> {
    let watched = posterior.hypothesis.watched();
    (0..posterior.map.dimension())
        .filter(|index| !watched.contains(index))
        .filter_map(|index| {
            let (mean, sd) = (posterior.priors.mean(index), posterior.priors.standard_deviation(index));
            let shift = (chain.diagnostics[index].mean - mean) / sd;
            (sd.is_finite() && shift.abs() > MOVED)
                .then(|| Warning::NuisanceMoved { parameter: posterior.map.names()[index].clone(), shift })
        })
        .collect()
}

/// Evolution or magnification biases of one tracer in several bins with the same prior, that nothing moves together: the
/// fit then averages their errors down, which a common cause would not allow. σ of the departure is computed both ways.
fn unshared(posterior: &Posterior, analysis: &Analysis) -> Vec<Warning> {
    let Some(&departure) = posterior.hypothesis.watched().first() else { return Vec::new() };
    let deviation = |prior: &DMatrix<f64>| {
        let covariance = posterior_covariance(&analysis.fisher, prior)?;
        Some(covariance[(departure, departure)].sqrt())
    };
    let mut warnings = Vec::new();
    for quantity in ["evolution", "observed_density_slope", "magnification"] {
        let mut groups: Vec<(FreePrior, Vec<usize>)> = Vec::new();
        for tracer in ["first", "second"] {
            let ending = format!(".{tracer}.{quantity}");
            // The same prior of the other tracer is another group: within a bin the two differ for good reason.
            let start = groups.len();
            for (index, free) in posterior.hypothesis.free.iter().enumerate() {
                if !free.name.ends_with(&ending) || has_shared_error(posterior, free.quantity) {
                    continue;
                }
                match groups[start..].iter_mut().find(|(prior, _)| *prior == free.prior) {
                    Some((_, members)) => members.push(index),
                    None if matches!(free.prior, FreePrior::Own(_)) => {
                        groups.push((free.prior.clone(), vec![index]));
                    }
                    None => {}
                }
            }
        }
        groups.retain(|(_, members)| members.len() > 1);
        if groups.is_empty() {
            continue;
        }
        let mut shared = analysis.prior_covariance.clone();
        for (_, members) in &groups {
            for &i in members {
                for &j in members {
                    let product: f64 = analysis.prior_covariance[(i, i)] * analysis.prior_covariance[(j, j)];
                    shared[(i, j)] = product.sqrt();
                }
            }
        }
        let names = posterior.map.names();
        let both = (deviation(&analysis.prior_covariance), deviation(&shared));
        if let (Some(independent), Some(shared)) = both {
            warnings.push(Warning::UnsharedError {
                quantity: quantity.to_owned(),
                parameters: groups
                    .iter()
                    .flat_map(|(_, members)| members)
                    .map(|&i| names[i].clone())
                    .collect(),
                departure: names[departure].clone(),
                independent,
                shared,
            });
        }
    }
    warnings
}

/// Whether a systematic moves the quantity: then its error is already partly shared.
fn has_shared_error(posterior: &Posterior, quantity: usize) -> bool {
    !posterior.hypothesis.quantities[quantity].moves.is_empty()
}

fn small_separations(
    posterior: &Posterior,
    measurements: &Measurements,
    values: &[f64],
) -> Result<Option<Warning>, RunError> {
    let mut bins = Vec::new();
    let mut held = Vec::new();
    for worth in offset_in_tau(posterior, measurements, values)? {
        if worth.tau_per_kilometre > OFFSET_WORTH {
            let offset = posterior.model.layout().index(&format!("{}.offset", worth.bin));
            if offset.is_some_and(|slot| posterior.map.is_held(slot)) {
                held.push(worth.bin.clone());
            }
            bins.push((worth.bin, worth.separation, worth.tau_per_kilometre));
        }
    }
    Ok((!bins.is_empty()).then_some(Warning::SmallSeparation { bins, held }))
}

fn growth_assumed(posterior: &Posterior) -> Option<Warning> {
    let setup = posterior.model.setup();
    let free = !posterior.hypothesis.watched().is_empty();
    let assumed = setup.felt_by == FeltBy::Light
        && !setup.growth_index
        && setup.bins.iter().any(|bin| !bin.growth_given);
    (free && assumed).then(|| Warning::GrowthAssumed { hypothesis: posterior.hypothesis.name.clone() })
}
