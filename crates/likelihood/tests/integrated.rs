//! Linear quantities integrated out of a compressed likelihood: against the likelihood of the data with their variance in
//! the covariance, against quadrature between two ends, and draws against their distribution.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

mod common;

use common::{covariance, generator, normal_matrix, normal_vector};
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{
    IntegratedSet, IntegrationError, LinearPrior, NoiseChoice, SurveyLikelihood, SurveySet,
};
use rand::RngExt;

const ROWS: usize = 14;
const COEFFICIENTS: usize = 9;

/// Two surveys that see coefficients 0–5 and 3–8, and five quantities that move some of them.
struct Problem {
    surveys: SurveySet,
    kernels: DMatrix<f64>,
    coefficients: DVector<f64>,
    pattern: Vec<Vec<usize>>,
    slopes: Vec<f64>,
    precision: DMatrix<f64>,
}

impl Problem {
    fn draw(noise: &str, seed: u64) -> Self {
        let mut random = generator(seed);
        let mut kernels = normal_matrix(2 * ROWS, COEFFICIENTS, &mut random);
        kernels.view_mut((0, 6), (ROWS, 3)).fill(0.0);
        kernels.view_mut((ROWS, 0), (ROWS, 3)).fill(0.0);
        let coefficients = normal_vector(COEFFICIENTS, &mut random);
        let choice = NoiseChoice::new(noise, Some(40)).unwrap();
        let surveys = (0..2).map(|survey| {
            let covariance = covariance(ROWS, &mut random);
            let scatter = normal_vector(ROWS, &mut random);
            let data = kernels.rows(survey * ROWS, ROWS) * &coefficients
                + DVector::from_fn(ROWS, |i, _| 2.0 * scatter[i] * covariance[(i, i)].sqrt());
            SurveyLikelihood::new(data, covariance, &choice).unwrap()
        });
        let surveys = SurveySet::new(surveys.collect());
        let pattern = vec![vec![0, 2], vec![7], vec![1, 4, 8], vec![3], vec![5, 6]];
        let slopes = pattern.iter().flatten().map(|_| random.random_range(-2.0..2.0)).collect();
        let mut precision = DMatrix::from_diagonal(&normal_vector(5, &mut random).map(|z| (2.0 * z).exp()));
        let correlation = 0.5 * (precision[(1, 1)] * precision[(3, 3)]).sqrt();
        precision[(1, 3)] = correlation;
        precision[(3, 1)] = correlation;
        Self { surveys, kernels, coefficients, pattern, slopes, precision }
    }

    fn slope_matrix(&self) -> DMatrix<f64> {
        let mut matrix = DMatrix::zeros(COEFFICIENTS, self.pattern.len());
        let mut slopes = self.slopes.iter();
        for (quantity, moved) in self.pattern.iter().enumerate() {
            for coefficient in moved {
                matrix[(*coefficient, quantity)] = *slopes.next().unwrap();
            }
        }
        matrix
    }

    fn integrated(&self, interval: Option<(usize, f64, f64)>) -> IntegratedSet {
        let mut precision = self.precision.clone();
        if let Some((at, ..)) = interval {
            precision.row_mut(at).fill(0.0);
            precision.column_mut(at).fill(0.0);
        }
        let compressed = self.surveys.compress(&self.kernels).unwrap();
        IntegratedSet::new(&compressed, &self.pattern, &LinearPrior { precision, interval }).unwrap()
    }

    /// All rows' covariance as the noise model inflates it, and C + A P⁻¹ Aᵀ with it.
    fn log_normal(&self, quantities: &DMatrix<f64>, spread: &DMatrix<f64>, shift: &DVector<f64>) -> f64 {
        let mut full = DMatrix::zeros(2 * ROWS, 2 * ROWS);
        let mut data = DVector::zeros(2 * ROWS);
        for (first, survey) in self.surveys.with_offsets() {
            let inflation = survey.noise().weight(0.0).recip();
            let block = survey.covariance().matrix() * inflation;
            full.view_mut((first, first), (ROWS, ROWS)).copy_from(&block);
            data.rows_mut(first, ROWS).copy_from(survey.data());
        }
        let moved = &self.kernels * quantities;
        full += &moved * spread * moved.transpose();
        let residual = data - &self.kernels * (&self.coefficients + shift);
        let factor = full.cholesky().unwrap();
        let log_determinant: f64 = factor.l_dirty().diagonal().iter().map(|pivot| 2.0 * pivot.ln()).sum();
        -0.5 * (residual.dot(&factor.solve(&residual))
            + log_determinant
            + 2.0 * ROWS as f64 * std::f64::consts::TAU.ln())
    }

    fn log_likelihood(&self, integrated: &IntegratedSet) -> f64 {
        integrated.log_likelihood(self.coefficients.as_slice(), &self.slopes, &mut integrated.scratch())
    }
}

/// ∫ N(d; K(c + S x), C) N(x; 0, P⁻¹) dx = N(d; K c, C + K S P⁻¹ (K S)ᵀ). Two Cholesky factors of 28 rows apart, of condition
/// 1e6 at most: 1e-9 of numbers near 100.
#[test]
fn normal_quantities_widen_the_covariance() {
    for (noise, seed) in [("gaussian", 1), ("hartlap", 2), ("gaussian", 3), ("hartlap", 4)] {
        let problem = Problem::draw(noise, seed);
        let inverse = problem.precision.clone().try_inverse().unwrap();
        let nothing = DVector::zeros(COEFFICIENTS);
        let expected = problem.log_normal(&problem.slope_matrix(), &inverse, &nothing);
        let found = problem.log_likelihood(&problem.integrated(None));
        assert!((found - expected).abs() < 1e-9 * expected.abs(), "{noise}: {found} {expected}");
        // The check can fail: without the quantities it is another number.
        let without = problem.log_normal(&DMatrix::zeros(COEFFICIENTS, 5), &inverse, &nothing);
        assert!((found - without).abs() > 1e-3 * expected.abs());
    }
}

/// One quantity between two ends: 4000 panels of Simpson's rule over it, the others widening the covariance. The ends are
/// chosen to cut the posterior in its middle, in its tail, beside it and not at all.
#[test]
fn a_quantity_between_two_ends_is_integrated_between_them() {
    for (seed, at, low, high) in
        [(5, 2, -0.3, 0.2), (6, 0, -4.0, 40.0), (7, 4, 0.5, 3.0), (8, 1, -60.0, 60.0)]
    {
        let problem = Problem::draw("gaussian", seed);
        let others: Vec<usize> = (0..5).filter(|other| *other != at).collect();
        let slopes = problem.slope_matrix();
        let spread = problem.precision.select_rows(&others).select_columns(&others).try_inverse().unwrap();
        let of_others = slopes.select_columns(&others);
        let panels = 4000;
        let value = |i: usize| {
            let x = low + (high - low) * i as f64 / panels as f64;
            let shift: DVector<f64> = slopes.column(at) * x;
            problem.log_normal(&of_others, &spread, &shift)
        };
        let values: Vec<f64> = (0..=panels).map(value).collect();
        let largest = values.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let weight = |i: usize| if i == 0 || i == panels { 1.0 } else { 2.0 + 2.0 * (i % 2) as f64 };
        let sum: f64 = values.iter().enumerate().map(|(i, v)| weight(i) * (v - largest).exp()).sum();
        // The density is 1/(high − low), so the panel's width over the interval's is left.
        let expected = largest + (sum / (3.0 * panels as f64)).ln();
        let found = problem.log_likelihood(&problem.integrated(Some((at, low, high))));
        assert!((found - expected).abs() < 1e-7, "{seed}: {found} {expected}");
    }
}

/// Draws have the mean and covariance of N(Λ⁻¹g, Λ⁻¹); of 40,000 of them, means lie within 4.5 errors (thirty comparisons)
/// and variances, whose relative error is √(2/N) = 0.7 %, within 3 %.
#[test]
fn draws_follow_their_distribution() {
    let problem = Problem::draw("gaussian", 9);
    let integrated = problem.integrated(None);
    let mut scratch = integrated.scratch();
    integrated.log_likelihood(problem.coefficients.as_slice(), &problem.slopes, &mut scratch);
    let moved = &problem.kernels * problem.slope_matrix();
    let information = problem.surveys.fisher_information(&moved) + &problem.precision;
    let covariance = information.clone().try_inverse().unwrap();
    let mut gradient = DVector::zeros(5);
    for (first, survey) in problem.surveys.with_offsets() {
        let residual = survey.data() - problem.kernels.rows(first, ROWS) * &problem.coefficients;
        let inverse = survey.covariance().matrix().clone().try_inverse().unwrap();
        gradient += moved.rows(first, ROWS).transpose() * inverse * residual;
    }
    let mean = &covariance * gradient;
    let mut random = generator(10);
    let (mut x, count) = (vec![0.0; 5], 40_000);
    let (mut sum, mut squares) = (DVector::zeros(5), DVector::<f64>::zeros(5));
    for _ in 0..count {
        let normals = normal_vector(5, &mut random);
        integrated.draw(&mut scratch, normals.as_slice(), 0.5, &mut x);
        let drawn = DVector::from_column_slice(&x) - &mean;
        squares += drawn.component_mul(&drawn);
        sum += drawn;
    }
    for quantity in 0..5 {
        let sd = covariance[(quantity, quantity)].sqrt();
        let off = sum[quantity] / f64::from(count) / (sd / f64::from(count).sqrt());
        assert!(off.abs() < 4.5, "{quantity}: {off}");
        let ratio = squares[quantity] / f64::from(count) / (sd * sd);
        assert!((ratio - 1.0).abs() < 0.03, "{quantity}: {ratio}");
    }
    integrated.most_probable(&mut scratch, &mut x);
    assert!(x.iter().zip(mean.iter()).all(|(x, mean)| (x - mean).abs() < 1e-9 * (1.0 + mean.abs())));
}

#[test]
fn draws_stay_between_the_ends() {
    let problem = Problem::draw("gaussian", 11);
    let integrated = problem.integrated(Some((2, 0.4, 0.9)));
    let mut scratch = integrated.scratch();
    integrated.log_likelihood(problem.coefficients.as_slice(), &problem.slopes, &mut scratch);
    let mut random = generator(12);
    let mut x = vec![0.0; 5];
    for _ in 0..1000 {
        let normals = normal_vector(5, &mut random);
        integrated.draw(&mut scratch, normals.as_slice(), random.random(), &mut x);
        assert!((0.4..=0.9).contains(&x[2]), "{}", x[2]);
    }
}

#[test]
fn noise_that_is_not_normal_is_refused() {
    let problem = Problem::draw("t", 13);
    let compressed = problem.surveys.compress(&problem.kernels).unwrap();
    let prior = LinearPrior { precision: problem.precision.clone(), interval: None };
    let error = IntegratedSet::new(&compressed, &problem.pattern, &prior).unwrap_err();
    assert_eq!(error, IntegrationError::Noise { name: "t" });
}
