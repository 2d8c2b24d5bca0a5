//! Effective samples per evaluation, peak search and warm-up counted, on targets of known moments.
//!
//! `cargo bench -p oddwell-sampler --bench efficiency -- [target …] [walkers=N] [seed=N] [samples=N] [move=weight …]`, a target
//! being gaussian2, gaussian20 …, rosenbrock, edge, heavy, funnel, modes; all of them by default.
#![allow(clippy::print_stdout, clippy::unwrap_used, reason = "a bench prints, and may stop where it fails")]

#[path = "../tests/common/mod.rs"]
mod common;

use common::{Gaussian, Simple, flat, rosenbrock};
use oddwell_sampler::{Chain, Control, EnsembleSettings, PriorSet, build_prior, sample};

fn report(name: &str, chain: &Chain, wanted: &[(f64, f64)]) {
    let least = chain.diagnostics.iter().map(|found| found.ess_bulk).fold(f64::INFINITY, f64::min);
    let acceptance: Vec<String> = chain
        .acceptance
        .iter()
        .map(|tried| format!("{} {:.2} of {}", tried.name, tried.rate().unwrap_or(f64::NAN), tried.proposed))
        .collect();
    println!(
        "{name:12} ess/eval {:.4} (least {:.4})  evaluations {} (peak {})  steps {} warm-up {} thin {} walkers {}  {:.2} s  converged {}  rhat {:.4} | {}",
        chain.diagnostics[0].ess_bulk / chain.evaluations as f64,
        least / chain.evaluations as f64,
        chain.evaluations,
        chain.peak_evaluations,
        chain.steps,
        chain.warm_up,
        chain.thinning,
        chain.walkers,
        chain.wall_seconds,
        chain.outcome.converged,
        chain.diagnostics.iter().map(|found| found.rhat).fold(0.0, f64::max),
        acceptance.join(", "),
    );
    for (found, (mean, sd)) in chain.diagnostics.iter().zip(wanted) {
        println!(
            "             mean {:.4} wanted {mean:.4} ({:+.1} errors)  sd {:.4} wanted {sd:.4}  tail {:.0}",
            found.mean,
            (found.mean - mean) / found.mcse,
            found.sd,
            found.ess_tail
        );
    }
}

fn run<F: Fn(&[f64]) -> f64 + Sync>(
    name: &str,
    settings: &EnsembleSettings,
    priors: PriorSet,
    likelihood: F,
    wanted: &[(f64, f64)],
) {
    let target = Simple { priors, likelihood };
    let chain = sample(&target, &target.priors, settings, &mut |_| Control::Continue).unwrap();
    report(name, &chain, wanted);
}

fn main() {
    let mut settings = EnsembleSettings {
        watched: vec![0],
        maximum_evaluations: Some(100_000_000),
        ..EnsembleSettings::default()
    };
    let mut names = vec![];
    for argument in std::env::args().skip(1).filter(|argument| !argument.starts_with("--")) {
        match argument.split_once('=') {
            Some(("walkers", number)) => settings.walkers = Some(number.parse().unwrap()),
            Some(("seed", number)) => settings.seed = number.parse().unwrap(),
            Some(("samples", number)) => settings.effective_samples = number.parse().unwrap(),
            Some((name, weight)) => settings.move_weights.push((name.to_owned(), weight.parse().unwrap())),
            None => names.push(argument),
        }
    }
    if names.is_empty() {
        let all = [
            "gaussian2",
            "gaussian10",
            "gaussian20",
            "gaussian30",
            "rosenbrock",
            "edge",
            "heavy",
            "funnel",
            "modes",
        ];
        names.extend(all.map(str::to_owned));
    }
    let gauss = |z: f64| -0.5 * z * z;
    for name in &names {
        match name.as_str() {
            "rosenbrock" => {
                let wanted = [(1.0, 10f64.sqrt()), (11.0, 240.1f64.sqrt())];
                run(name, &settings, flat(2, -200.0, 400.0), rosenbrock, &wanted);
            }
            "edge" => {
                let wanted = [(0.002, 0.002); 4];
                run(name, &settings, flat(4, 0.0, 1.0), |x| x.iter().map(|x| -x / 0.002).sum(), &wanted);
            }
            "heavy" => {
                let prior = build_prior("student_t", &[0.0, 1.0, 3.0], None).unwrap();
                let wanted = [(0.0, 3f64.sqrt()); 3];
                run(name, &settings, PriorSet::from_independent(vec![prior; 3]), |_| 0.0, &wanted);
            }
            "funnel" => {
                let likelihood = |x: &[f64]| {
                    gauss(x[0] / 2.0)
                        + x[1..].iter().map(|y| gauss(y * (-0.5 * x[0]).exp()) - 0.5 * x[0]).sum::<f64>()
                };
                run(name, &settings, flat(5, -100.0, 100.0), likelihood, &[(0.0, 2.0)]);
            }
            "modes" => {
                let likelihood = |x: &[f64]| {
                    let at = |centre: f64| gauss((x[0] - centre) / 0.5) + gauss(x[1]) + gauss(x[2]);
                    ((at(-3.0)).exp() * 2.0 + at(3.0).exp()).max(1e-300).ln()
                };
                run(name, &settings, flat(3, -20.0, 20.0), likelihood, &[(-1.0, 8.25f64.sqrt())]);
            }
            gaussian => {
                let dimension = gaussian.trim_start_matches("gaussian").parse().unwrap();
                let target = Gaussian::new(dimension, 1e4, 3);
                run(name, &settings, flat(dimension, -30.0, 30.0), |x| target.log_density(x), &[]);
            }
        }
    }
}
