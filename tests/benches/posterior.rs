//! One posterior evaluation: with the background held, compressed against plain, by how many numbers were measured; and
//! with the background free, for three bins × five multipoles × fifteen shells.

#![allow(missing_docs, clippy::unwrap_used, reason = "a benchmark stops at the first surprise")]

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use oddwell_sampler::Target;
use oddwell_study::assemble::{Posterior, read_measurements};
use oddwell_study::{Override, Study};
use std::fmt::Write;
use std::hint::black_box;

/// A study of one bin with a dipole and an octupole in `numbers / 2` shells from 24 to 144 Mpc/h.
fn posterior(numbers: usize) -> Posterior {
    let folder = tempfile::tempdir().unwrap();
    let mut table = String::from("bin,multipole,separation,low,high,value,error\n");
    let shells = numbers / 2;
    for multipole in [1, 3] {
        for shell in 0..shells {
            let edge = |i: usize| 24.0 + 120.0 * i as f64 / shells as f64;
            let (low, high) = (edge(shell), edge(shell + 1));
            let (middle, value, error) = (0.5 * (low + high), 1e-3, 1e-4);
            writeln!(table, "near,{multipole},{middle},{low},{high},{value},{error}").unwrap();
        }
    }
    std::fs::write(folder.path().join("multipoles.csv"), table).unwrap();
    let text = r#"
title = "benchmark"
[background]
omega_m = 0.31
omega_b = 0.049
h = 0.68
n_s = 0.965
sigma8 = 0.81
[[survey]]
name = "windmere"
multipoles = "multipoles.csv"
[[survey.bin]]
name = "near"
redshift = 0.35
offset = { normal = [0.0, 10.0] }
first = { bias = { normal = [2.1, 0.05] }, magnification = { normal = [0.5, 0.05] }, evolution = { normal = [0.0, 0.3] } }
second = { bias = { normal = [1.2, 0.05] }, magnification = { normal = [0.2, 0.05] }, evolution = { normal = [0.0, 0.3] } }
[[hypothesis]]
name = "constant"
departure = "constant"
felt_by = "light"
tau = { normal = [0.0, 3.0] }
"#;
    let path = folder.path().join("study.toml");
    std::fs::write(&path, text).unwrap();
    let overrides: [Override; 0] = [];
    let study = Study::read(&path, &overrides).unwrap();
    let measurements = read_measurements(&study).unwrap();
    Posterior::new(&study, study.hypothesis(None).unwrap(), &measurements).unwrap()
}

fn evaluation(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("posterior evaluation, background held");
    for numbers in [26, 260, 2600] {
        let posterior = posterior(numbers);
        let mut scratch = posterior.scratch();
        let point = posterior.hypothesis.start();
        let compressed = posterior.log_likelihood(&point, &mut scratch).unwrap();
        let plain = posterior.plain_log_likelihood(&point, &mut scratch).unwrap();
        assert!((compressed - plain).abs() < 1e-9 * plain.abs(), "{compressed} {plain}");
        group.bench_with_input(BenchmarkId::new("compressed", numbers), &point, |bencher, point| {
            bencher.iter(|| {
                let point = black_box(point);
                posterior.log_prior(point) + posterior.log_likelihood(point, &mut scratch).unwrap()
            });
        });
        group.bench_with_input(BenchmarkId::new("plain", numbers), &point, |bencher, point| {
            bencher.iter(|| {
                let point = black_box(point);
                posterior.log_prior(point) + posterior.plain_log_likelihood(point, &mut scratch).unwrap()
            });
        });
    }
    group.finish();
}

/// Three bins, five multipoles, fifteen shells; Ωm, h, n_s, σ8 and w0 free beside biases, offsets and the departure.
fn free_background(departure: &str) -> Posterior {
    let folder = tempfile::tempdir().unwrap();
    let mut table = String::from("bin,multipole,separation,low,high,value,error\n");
    let mut bins = String::new();
    for (bin, redshift) in [("near", 0.35), ("middle", 0.7), ("far", 1.1)] {
        for multipole in 0..=4 {
            for shell in 0..15 {
                let low = 24.0 + 8.0 * f64::from(shell);
                let (middle, high) = (low + 4.0, low + 8.0);
                writeln!(table, "{bin},{multipole},{middle},{low},{high},1e-3,1e-3").unwrap();
            }
        }
        write!(
            bins,
            "[[survey.bin]]\nname = \"{bin}\"\nredshift = {redshift}\noffset = {{ normal = [0.0, 10.0] }}\n\
             first = {{ bias = {{ normal = [2.1, 0.05] }}, magnification = 0.5, evolution = 0.0 }}\n\
             second = {{ bias = {{ normal = [1.2, 0.05] }}, magnification = 0.2, evolution = 0.0 }}\n"
        )
        .unwrap();
    }
    std::fs::write(folder.path().join("multipoles.csv"), table).unwrap();
    let w0 = if departure.contains("f-of-r") { "-1.0" } else { "{ normal = [-1.0, 0.1] }" };
    let text = format!(
        "title = \"benchmark\"\n[background]\nomega_m = {{ normal = [0.31, 0.01] }}\nomega_b = 0.049\n\
         h = {{ normal = [0.68, 0.01] }}\nn_s = {{ normal = [0.965, 0.01] }}\nsigma8 = {{ normal = [0.81, 0.01] }}\n\
         w0 = {w0}\n[[survey]]\nname = \"windmere\"\nmultipoles = \"multipoles.csv\"\n{bins}\
         [[hypothesis]]\nname = \"free\"\n{departure}\n"
    );
    let path = folder.path().join("study.toml");
    std::fs::write(&path, text).unwrap();
    let study = Study::read(&path, &[]).unwrap();
    let measurements = read_measurements(&study).unwrap();
    Posterior::new(&study, study.hypothesis(None).unwrap(), &measurements).unwrap()
}

fn evaluation_with_a_free_background(criterion: &mut Criterion) {
    let mut group = criterion.benchmark_group("posterior evaluation, background free, 225 numbers");
    for (name, departure) in [
        (
            "scale-independent growth",
            "departure = \"constant\"\nfelt_by = \"light\"\ntau = { normal = [0.0, 3.0] }",
        ),
        (
            "finite range felt by matter",
            "departure = \"finite-range\"\nfelt_by = \"matter\"\ntau = { normal = [0.0, 0.3] }\nrange = { uniform = [5.0, 50.0] }",
        ),
        ("f-of-r", "departure = \"f-of-r\"\nlog10_f_r0 = { uniform = [-7.0, -4.0] }"),
    ] {
        let posterior = free_background(departure);
        let mut scratch = posterior.scratch();
        let start = posterior.hypothesis.start();
        let mut point = start.clone();
        let mut step = 0_u32;
        group.bench_function(name, |bencher| {
            bencher.iter(|| {
                // Every quantity moves, so that nothing of the last evaluation can be kept.
                step = (step + 1) % 64;
                for (value, start) in point.iter_mut().zip(&start) {
                    *value = start * (1.0 + 1e-4 * f64::from(step));
                }
                let point = black_box(&point);
                posterior.log_prior(point) + posterior.log_likelihood(point, &mut scratch).unwrap()
            });
        });
    }
    group.finish();
}

criterion_group!(benches, evaluation, evaluation_with_a_free_background);
criterion_main!(benches);
