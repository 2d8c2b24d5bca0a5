//! Whether the Monte Carlo errors are honest: the scatter of posterior means over repeated runs, in units of the error that
//! each run quotes, for both routes to it. 1 is honest, above 1 too bold.
//!
//! `cargo bench -p oddwell-sampler --bench honesty -- [dimension] [runs] [move=weight …]`
#![allow(clippy::print_stdout, clippy::unwrap_used, reason = "a bench prints, and may stop where it fails")]

#[path = "../tests/common/mod.rs"]
mod common;

use common::{Gaussian, Simple, flat};
use oddwell_sampler::diagnostics::ess_mean;
use oddwell_sampler::{Control, EnsembleSettings, sample};

fn main() {
    let mut settings =
        EnsembleSettings { effective_samples: 400.0, maximum_rhat: 1.02, ..EnsembleSettings::default() };
    let mut numbers = vec![];
    for argument in std::env::args().skip(1).filter(|argument| !argument.starts_with("--")) {
        match argument.split_once('=') {
            Some(("samples", number)) => {
                settings.effective_samples = number.parse().unwrap();
                settings.watched = vec![0];
            }
            Some(("rhat", number)) => settings.maximum_rhat = number.parse().unwrap(),
            Some((name, weight)) => settings.move_weights.push((name.to_owned(), weight.parse().unwrap())),
            None => numbers.push(argument.parse::<usize>().unwrap()),
        }
    }
    let dimension = numbers.first().copied().unwrap_or(10);
    let runs = numbers.get(1).copied().unwrap_or(40);
    // Of condition 1, so that the means of its coordinates are independent of each other.
    let gaussian = Gaussian::new(dimension, 1.0, 3);
    let target =
        Simple { priors: flat(dimension, -30.0, 30.0), likelihood: |x: &[f64]| gaussian.log_density(x) };
    let (mut quoted, mut walkers, mut ensembles, mut count) = (0.0, 0.0, 0.0, 0.0);
    let (mut sum_walkers, mut sum_ensembles, mut draws) = (0.0, 0.0, 0.0);
    for seed in 0..runs {
        settings.seed = 1000 + seed as u64;
        let chain = sample(&target, &target.priors, &settings, &mut |_| Control::Continue).unwrap();
        for parameter in 0..dimension {
            let column = chain.column(parameter);
            let steps = chain.kept_steps.len();
            let width = chain.walkers;
            let by_walker: Vec<Vec<f64>> = column
                .chunks_exact(steps * width)
                .flat_map(|ensemble| {
                    (0..width).map(|walker| ensemble.iter().skip(walker).step_by(width).copied().collect())
                })
                .collect();
            let means: Vec<Vec<f64>> = column
                .chunks_exact(steps * width)
                .map(|ensemble| {
                    ensemble.chunks_exact(width).map(|step| step.iter().sum::<f64>() / width as f64).collect()
                })
                .collect();
            let variance = |values: &[f64]| {
                let mean = values.iter().sum::<f64>() / values.len() as f64;
                values.iter().map(|value| (value - mean).powi(2)).sum::<f64>() / values.len() as f64
            };
            let walker_route = ess_mean(&by_walker);
            let ensemble_route = ess_mean(&means) * variance(&column) / variance(&means.concat());
            let found = chain.diagnostics[parameter];
            let miss =
                (found.mean - gaussian.mean[parameter]).powi(2) / gaussian.covariance[(parameter, parameter)];
            quoted += (found.mean - gaussian.mean[parameter]).powi(2) / found.mcse.powi(2);
            walkers += miss * walker_route;
            ensembles += miss * ensemble_route;
            sum_walkers += walker_route;
            sum_ensembles += ensemble_route;
            draws += column.len() as f64;
            count += 1.0;
        }
    }
    let root = |sum: f64| (sum / count).sqrt();
    println!(
        "{dimension} dimensions, {runs} runs: quoted {:.3}, walkers {:.3}, ensembles {:.3} (each ± {:.3}); draws {:.0}, ess by walkers {:.0}, by ensembles {:.0}",
        root(quoted),
        root(walkers),
        root(ensembles),
        (0.5 / count).sqrt(),
        draws / count,
        sum_walkers / count,
        sum_ensembles / count
    );
}
