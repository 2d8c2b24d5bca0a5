//! What a step costs around a target that costs next to nothing: moves, random numbers, bookkeeping.
#![allow(
    clippy::unwrap_used,
    missing_docs,
    reason = "a bench may stop where it fails; criterion makes undocumented items"
)]

#[path = "../tests/common/mod.rs"]
mod common;

use common::{Simple, flat};
use criterion::{Criterion, Throughput, criterion_group, criterion_main};
use nalgebra::DMatrix;
use oddwell_sampler::moves::{Fit, Others, Random, move_families};
use oddwell_sampler::{Control, EnsembleSettings, sample};
use rand::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use std::hint::black_box;

const DIMENSION: usize = 20;

/// One proposal of each move.
fn proposals(criterion: &mut Criterion) {
    let mut random = Random::seed_from_u64(1);
    let points: Vec<f64> = (0..24 * DIMENSION).map(|_| StandardNormal.sample(&mut random)).collect();
    let current: Vec<f64> = (0..DIMENSION).map(|_| StandardNormal.sample(&mut random)).collect();
    let mut proposal = vec![0.0; DIMENSION];
    let fit = Fit::new(vec![0.0; DIMENSION], DMatrix::identity(DIMENSION, DIMENSION)).unwrap();
    let mut group = criterion.benchmark_group("proposal in 20 dimensions");
    for family in move_families() {
        let made = family.build(&fit);
        group.bench_function(family.name, |bencher| {
            bencher.iter(|| {
                made.propose(black_box(&current), Others::new(&points, DIMENSION), &mut random, &mut proposal)
            });
        });
    }
    group.finish();
}

/// A whole run of a fixed number of evaluations, checks included, per evaluation.
fn runs(criterion: &mut Criterion) {
    const EVALUATIONS: u64 = 200_000;
    let target = Simple {
        priors: flat(DIMENSION, -30.0, 30.0),
        likelihood: |x: &[f64]| -0.5 * x.iter().map(|x| x * x).sum::<f64>(),
    };
    let mut group = criterion.benchmark_group("run in 20 dimensions, per evaluation");
    group.throughput(Throughput::Elements(EVALUATIONS)).sample_size(10);
    for name in ["stretch", "differential_evolution", "default"] {
        let move_weights = if name == "default" { vec![] } else { vec![(name.to_owned(), 1.0)] };
        let settings = EnsembleSettings {
            effective_samples: 1e9,
            watched: vec![0],
            maximum_evaluations: Some(EVALUATIONS),
            maximum_draws: Some(1 << 16),
            move_weights,
            ..EnsembleSettings::default()
        };
        let one = rayon::ThreadPoolBuilder::new().num_threads(1).build().unwrap();
        group.bench_function(name, |bencher| {
            bencher.iter(|| {
                one.install(|| {
                    sample(&target, &target.priors, &settings, &mut |_| Control::Continue).unwrap()
                })
            });
        });
    }
    group.finish();
}

criterion_group!(benches, proposals, runs);
criterion_main!(benches);
