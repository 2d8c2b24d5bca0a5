//! Effective samples per evaluation, warm-up counted, on targets known in closed form.
//!
//! `cargo bench -p oddwell-sampler --bench efficiency -- [dimension] [walkers] [move=weight …]`
#![allow(clippy::print_stdout, clippy::unwrap_used, reason = "a bench prints, and may stop where it fails")]

#[path = "../tests/common/mod.rs"]
mod common;

use common::{Gaussian, Simple, flat};
use oddwell_sampler::{Chain, Control, EnsembleSettings, sample};

fn report(name: &str, chain: &Chain) {
    let least = chain.diagnostics.iter().map(|found| found.ess_bulk).fold(f64::INFINITY, f64::min);
    let acceptance: Vec<String> = chain
        .acceptance
        .iter()
        .map(|tried| format!("{} {:.2}", tried.name, tried.rate().unwrap_or(f64::NAN)))
        .collect();
    println!(
        "{name:24} ess/eval {:.5}  watched {:.0} least {least:.0}  evaluations {} (peak {})  steps {} warm-up {} thin {} walkers {}  {:.2}s  {:.0} eval/s  converged {}  rhat {:.4} | {}",
        chain.diagnostics[0].ess_bulk / chain.evaluations as f64,
        chain.diagnostics[0].ess_bulk,
        chain.evaluations,
        chain.peak_evaluations,
        chain.steps,
        chain.warm_up,
        chain.thinning,
        chain.walkers,
        chain.wall_seconds,
        chain.evaluations as f64 / chain.wall_seconds,
        chain.outcome.converged,
        chain.diagnostics.iter().map(|found| found.rhat).fold(0.0, f64::max),
        acceptance.join(", "),
    );
}

fn main() {
    let mut settings = EnsembleSettings { watched: vec![0], ..EnsembleSettings::default() };
    let mut numbers = vec![];
    for argument in std::env::args().skip(1).filter(|argument| !argument.starts_with("--")) {
        match argument.split_once('=') {
            Some((name, weight)) => settings.move_weights.push((name.to_owned(), weight.parse().unwrap())),
            None => numbers.push(argument.parse::<usize>().unwrap()),
        }
    }
    let dimension = numbers.first().copied().unwrap_or(20);
    settings.walkers = numbers.get(1).copied();
    let gaussian = Gaussian::new(dimension, 1e4, 3);
    let target =
        Simple { priors: flat(dimension, -30.0, 30.0), likelihood: |x: &[f64]| gaussian.log_density(x) };
    let chain = sample(&target, &target.priors, &settings, &mut |_| Control::Continue).unwrap();
    report(&format!("gaussian {dimension}"), &chain);
}
