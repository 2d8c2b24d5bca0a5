//! One evaluation of the log-likelihood, compressed against plain, for 26, 260 and 2600 measured numbers.
//!
//! Thirty coefficients in three bins of ten; a third of the rows in each bin. `plain` multiplies the kernels with the
//! coefficients and solves with the Cholesky factor; `compressed` is the same number from the triangle. Bins are
//! uncorrelated in `compressed/bins-apart` (three triangles of ten) and correlated in `compressed/bins-together` (one
//! triangle of thirty, or of 26 rows).

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{CompressedLikelihood, NoiseChoice, SurveyLikelihood};
use std::hint::black_box;

const BINS: usize = 3;
const COEFFICIENTS: usize = 10;

/// Smooth kernels, correlations that fall off with distance, and data off the mean by about one sd.
fn problem(rows: usize, together: bool) -> (SurveyLikelihood, DMatrix<f64>, Vec<f64>) {
    let bin = |row: usize| row * BINS / rows;
    let place = |row: usize| (row as f64 + 0.5) * BINS as f64 / rows as f64 - bin(row) as f64;
    let kernels = DMatrix::from_fn(rows, BINS * COEFFICIENTS, |i, j| match bin(i) == j / COEFFICIENTS {
        true => ((j % COEFFICIENTS + 1) as f64 * 1.3 * place(i)).cos() + 0.2 * place(i),
        false => 0.0,
    });
    let covariance = DMatrix::from_fn(rows, rows, |i, j| {
        let apart = (i as f64 - j as f64).abs() * 8.0 / rows as f64;
        let correlation = if i == j { 1.0 } else { 0.7 * (-apart).exp() };
        if together || bin(i) == bin(j) { correlation } else { 0.0 }
    });
    let coefficients: Vec<f64> = (0..BINS * COEFFICIENTS).map(|j| 1.0 + (j as f64).sin()).collect();
    let data = &kernels * DVector::from_column_slice(&coefficients)
        + DVector::from_fn(rows, |i, _| (37.0 * (i as f64 + 1.0)).sin());
    let survey = SurveyLikelihood::new(data, covariance, &NoiseChoice::gaussian()).expect("a sound problem");
    (survey, kernels, coefficients)
}

fn evaluation(criterion: &mut Criterion) {
    for rows in [26, 260, 2600] {
        let mut group = criterion.benchmark_group(format!("log-likelihood of {rows} numbers"));
        let (survey, kernels, coefficients) = problem(rows, true);
        let coefficient_vector = DVector::from_column_slice(&coefficients);
        let mut prediction = DVector::zeros(rows);
        let mut scratch = Vec::new();
        group.bench_function("plain", |bencher| {
            bencher.iter(|| {
                prediction.gemv(1.0, &kernels, black_box(&coefficient_vector), 0.0);
                survey.log_likelihood(prediction.as_slice(), &mut scratch)
            });
        });
        for (name, together) in [("bins-together", true), ("bins-apart", false)] {
            let (survey, kernels, _) = problem(rows, together);
            let compressed = CompressedLikelihood::new(&survey, &kernels).expect("sound kernels");
            group.bench_function(BenchmarkId::new("compressed", name), |bencher| {
                bencher.iter(|| compressed.log_likelihood(black_box(&coefficients)));
            });
        }
        group.finish();
    }
}

criterion_group!(benches, evaluation);
criterion_main!(benches);
