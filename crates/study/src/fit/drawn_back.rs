//! Amplitudes of templates that were integrated out, drawn back: a column each beside the chain.

use super::clocks::Derived;
use super::summary::parameter;
use crate::assemble::Posterior;
use crate::resolve::State;
use oddwell_sampler::{Chain, Target};
use rand::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use rand_xoshiro::Xoshiro256PlusPlus;
use rayon::prelude::*;

/// Apart from the streams of the ensembles.
const STREAM: u64 = 0x74656d_706c617465;

/// An amplitude that was integrated out: its name and its prior.
struct Amplitude {
    name: String,
    mean: f64,
    standard_deviation: f64,
}

/// Every amplitude that was integrated out, group of surveys after group, as their likelihoods have them.
fn amplitudes(posterior: &Posterior) -> Vec<Amplitude> {
    let templates = posterior.data.surveys().iter().flat_map(|survey| survey.templates());
    templates
        .filter_map(|template| {
            let quantity = posterior.hypothesis.quantity(&template.name)?;
            let State::IntegratedOut { mean, standard_deviation } = quantity.state else { return None };
            Some(Amplitude { name: template.name.clone(), mean, standard_deviation })
        })
        .collect()
}

/// The expected amplitudes at a point of the chain, by name.
pub(super) fn expected_amplitudes(posterior: &Posterior, prediction: &[f64]) -> Vec<(String, f64)> {
    let expected = posterior.data.with_offsets().flat_map(|(first, survey)| {
        let found = survey.amplitudes(&prediction[first..first + survey.rows()]);
        found.mean.iter().copied().collect::<Vec<f64>>()
    });
    let amplitudes = amplitudes(posterior).into_iter();
    amplitudes.zip(expected).map(|(amplitude, shift)| (amplitude.name, amplitude.mean + shift)).collect()
}

/// Draws each amplitude from its normal distribution given the parameters, for every draw of the chain: together they are
/// draws from the posterior of both. The same chain and seed give the same numbers on any number of threads.
pub(super) fn drawn_back(posterior: &Posterior, chain: &Chain, seed: u64) -> Derived {
    let amplitudes = amplitudes(posterior);
    let mut derived = Derived::default();
    if amplitudes.is_empty() {
        return derived;
    }
    let steps = chain.kept_steps.len();
    let of_walkers: Vec<Vec<Vec<f64>>> = (0..chain.ensembles * chain.walkers)
        .into_par_iter()
        .map(|lane| {
            let (ensemble, walker) = (lane / chain.walkers, lane % chain.walkers);
            let mut random = Xoshiro256PlusPlus::seed_from_u64(seed ^ STREAM.wrapping_mul(lane as u64 + 1));
            let mut scratch = posterior.scratch();
            let rows = (0..steps).map(|step| (ensemble * steps + step) * chain.walkers + walker);
            rows.map(|row| {
                let point = &chain.points[row * chain.dimension..(row + 1) * chain.dimension];
                match posterior.predict(point, &mut scratch) {
                    Ok(prediction) => draw(posterior, &prediction, &mut random),
                    // A point of the chain has a prediction.
                    Err(_) => vec![f64::NAN; amplitudes.len()],
                }
            })
            .collect()
        })
        .collect();
    for (index, amplitude) in amplitudes.iter().enumerate() {
        let mut column = vec![f64::NAN; chain.len()];
        for (lane, draws) in of_walkers.iter().enumerate() {
            let (ensemble, walker) = (lane / chain.walkers, lane % chain.walkers);
            for (step, draw) in draws.iter().enumerate() {
                column[(ensemble * steps + step) * chain.walkers + walker] = amplitude.mean + draw[index];
            }
        }
        let prior = Some((amplitude.mean, amplitude.standard_deviation));
        derived.parameters.insert(amplitude.name.clone(), parameter(&chain.diagnose(&column), prior));
        derived.names.push(amplitude.name.clone());
        derived.columns.push(column);
    }
    derived
}

/// One draw of all amplitudes, about their prior means.
fn draw(posterior: &Posterior, prediction: &[f64], random: &mut Xoshiro256PlusPlus) -> Vec<f64> {
    let draws = posterior.data.with_offsets().flat_map(|(first, survey)| {
        let normals: Vec<f64> = survey.templates().iter().map(|_| StandardNormal.sample(random)).collect();
        let found = survey.amplitudes(&prediction[first..first + survey.rows()]).draw(&normals);
        found.iter().copied().collect::<Vec<f64>>()
    });
    draws.collect()
}
