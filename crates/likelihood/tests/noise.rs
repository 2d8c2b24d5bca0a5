//! Noise models as densities, and p-values as probabilities.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

mod common;

use common::{generator, normal_matrix, normal_vector};
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{
    CompressedLikelihood, LikelihoodError, NoiseChoice, NoiseError, NoiseInputs, SurveyLikelihood,
    noise_families,
};

#[test]
fn every_family_of_the_registry_builds_and_says_what_it_needs() {
    let inputs = NoiseInputs { rows: 5, log_determinant: 0.7, mock_count: Some(50), determined: Some(2) };
    let mut names = Vec::new();
    for family in noise_families() {
        let model = family.build(&inputs).unwrap();
        assert_eq!(model.name(), family.name);
        assert!(!family.summary.is_empty());
        let without = family.build(&NoiseInputs { mock_count: None, ..inputs });
        match family.needs_mocks {
            true => assert_eq!(without.unwrap_err(), NoiseError::NeedsMockCount { name: family.name }),
            false => assert_eq!(without.unwrap().log_likelihood(3.0), model.log_likelihood(3.0)),
        }
        assert_eq!(NoiseChoice::new(family.name, Some(50)).unwrap().family.name, family.name);
        assert!(!names.contains(&family.name));
        names.push(family.name);
    }
}

#[test]
fn weights_are_slopes() {
    let inputs = NoiseInputs { rows: 5, log_determinant: 0.7, mock_count: Some(50), determined: Some(2) };
    for family in noise_families() {
        let model = family.build(&inputs).unwrap();
        for chi_squared in [0.5, 5.0, 40.0] {
            // Central difference: truncation h²/6·f‴ below 1e-9, rounding 1e-16·|ln L|/h about 1e-12.
            let step = 1e-3;
            let slope =
                (model.log_likelihood(chi_squared + step) - model.log_likelihood(chi_squared - step)) / step;
            assert!((model.weight(chi_squared) + slope).abs() < 1e-8, "{} at {chi_squared}", family.name);
        }
        assert!(model.log_likelihood(f64::NAN).is_nan());
    }
}

/// A density of n_d numbers depends on them by χ² = |L⁻¹d|², so its integral is one over radii:
/// √det C · S_n ∫ r^(n−1) exp(ln L(r²)) dr, with the surface S_n of the unit sphere. Simpson's rule in t, r = t/(1 − t),
/// with 20 000 steps: off by less than 10⁻¹⁰ for densities as smooth as these.
#[test]
fn normalised_models_integrate_to_one() {
    let log_determinant = 0.7_f64;
    for (rows, surface) in [(1, 2.0), (2, std::f64::consts::TAU), (3, 2.0 * std::f64::consts::TAU)] {
        for mocks in [12, 60] {
            let inputs = NoiseInputs { rows, log_determinant, mock_count: Some(mocks), determined: Some(1) };
            for family in noise_families() {
                let model = family.build(&inputs).unwrap();
                assert!(model.is_normalised());
                let steps = 20_000;
                let integrand = |step: i32| {
                    let t = f64::from(step) / f64::from(steps);
                    let radius = t / (1.0 - t);
                    let density = model.log_likelihood(radius * radius).exp();
                    radius.powi(rows as i32 - 1) * density / (1.0 - t).powi(2)
                };
                let inner: f64 = (1..steps).map(|step| f64::from(2 + 2 * (step % 2)) * integrand(step)).sum();
                let integral = (integrand(0) + inner) / f64::from(3 * steps);
                let total = (0.5 * log_determinant).exp() * surface * integral;
                assert!((total - 1.0).abs() < 1e-9, "{}, {rows} rows, {mocks} mocks: {total}", family.name);
            }
        }
    }
}

#[test]
fn many_mocks_are_a_known_covariance() {
    // Corrections are of order (n_d + χ²)²/n_s: 10⁻⁵ for 10⁸ mocks.
    let inputs =
        NoiseInputs { rows: 20, log_determinant: -3.0, mock_count: Some(100_000_000), determined: Some(4) };
    let gaussian = noise_families()[0].build(&inputs).unwrap();
    for family in noise_families() {
        let model = family.build(&inputs).unwrap();
        for chi_squared in [0.0, 21.0, 30.0] {
            assert!((model.log_likelihood(chi_squared) - gaussian.log_likelihood(chi_squared)).abs() < 3e-5);
            assert!((model.weight(chi_squared) - 1.0).abs() < 1e-6);
        }
    }
}

/// χ² of data against a covariance from mocks, after a fit of linear parameters: the p-value is uniform, exactly, with
/// n_d − p degrees of freedom. Kolmogorov–Smirnov over 2000 draws; a threshold of 1.95/√N is passed by all but 1 in
/// 1000 seeds. Taking the covariance as known, or n_d degrees of freedom, fails by far.
#[test]
fn p_values_with_mocks_are_uniform() {
    let (rows, mocks, draws) = (6, 14, 2000);
    for parameters in [0, 2] {
        let mut random = generator(40 + parameters as u64);
        let kernels = normal_matrix(rows, parameters, &mut random);
        let [mut right, mut known, mut wrong] = [(); 3].map(|()| Vec::with_capacity(draws));
        for _ in 0..draws {
            let sample = normal_matrix(mocks, rows, &mut random);
            let centred = DMatrix::from_fn(mocks, rows, |i, j| sample[(i, j)] - sample.column(j).mean());
            let covariance = centred.tr_mul(&centred) / (mocks - 1) as f64;
            let truth = &kernels * normal_vector(parameters, &mut random);
            let data = truth + normal_vector(rows, &mut random);
            let noise = NoiseChoice::new("t", Some(mocks)).unwrap();
            let survey = SurveyLikelihood::new(data, covariance, &noise).unwrap();
            let chi_squared = CompressedLikelihood::new(&survey, &kernels).unwrap().smallest_chi_squared();
            let degrees = (rows - parameters) as f64;
            right.push(survey.p_value(chi_squared, degrees).unwrap());
            wrong.push(survey.p_value(chi_squared, degrees + 1.0).unwrap());
            let gaussian = survey.with_noise(&NoiseChoice::gaussian()).unwrap();
            known.push(gaussian.p_value(chi_squared, degrees).unwrap());
        }
        let threshold = 1.95 / (draws as f64).sqrt();
        assert!(distance_from_uniform(right) < threshold);
        assert!(distance_from_uniform(known) > 2.0 * threshold);
        assert!(distance_from_uniform(wrong) > 2.0 * threshold);
    }
}

/// Kolmogorov and Smirnov's largest distance of the empirical distribution from the uniform.
fn distance_from_uniform(mut sample: Vec<f64>) -> f64 {
    sample.sort_unstable_by(f64::total_cmp);
    let count = sample.len() as f64;
    let distance = |(i, p): (usize, &f64)| (p - i as f64 / count).max((i as f64 + 1.0) / count - p);
    sample.iter().enumerate().map(distance).fold(0.0, f64::max)
}

#[test]
fn questions_without_an_answer() {
    use oddwell_likelihood::chi_squared_p_value;
    assert_eq!(chi_squared_p_value(3.0, 0.0, None), None);
    assert_eq!(chi_squared_p_value(3.0, -2.0, None), None);
    assert_eq!(chi_squared_p_value(f64::NAN, 2.0, None), None);
    assert_eq!(chi_squared_p_value(-1.0, 2.0, None), None);
    assert_eq!(chi_squared_p_value(3.0, 20.0, Some(20)), None);
    // Two degrees of freedom: e^(−χ²/2).
    assert!((chi_squared_p_value(3.0, 2.0, None).unwrap() - (-1.5_f64).exp()).abs() < 1e-14);
}

/// A part's χ² is that of its marginal: by hand for two of three rows.
#[test]
fn parts_of_a_survey() {
    let covariance = DMatrix::from_row_slice(3, 3, &[4.0, 1.0, 1.0, 1.0, 1.0, 0.2, 1.0, 0.2, 9.0]);
    let data = DVector::from_vec(vec![3.0, -1.0, 2.0]);
    let survey = SurveyLikelihood::new(data, covariance.clone(), &NoiseChoice::gaussian()).unwrap();
    let prediction = [1.0, 0.0, 0.5];
    // Residuals 2, −1 with [[4, 1], [1, 1]]: (1·4 + 2·2 + 4·1)/3 = 4; alone 2²/4 and 1.5²/9.
    let part = |positions: &[usize]| survey.subset_chi_squared(&prediction, positions).unwrap();
    for (found, wanted) in
        [(part(&[0, 1]), 4.0), (part(&[1, 0]), 4.0), (part(&[0]), 1.0), (part(&[2]), 0.25), (part(&[]), 0.0)]
    {
        assert!((found - wanted).abs() < 1e-14, "found {found}, wanted {wanted}");
    }
    let mut scratch = Vec::new();
    let whole = survey.chi_squared(&prediction, &mut scratch);
    assert!((part(&[2, 0, 1]) - whole).abs() < 1e-14 * whole);
    assert_eq!(scratch.len(), 3);
    // NaN goes through to whoever asked, rather than into a number.
    assert!(survey.log_likelihood(&[1.0, f64::NAN, 0.0], &mut scratch).is_nan());
    // Other data, same covariance.
    let moved = survey.clone().with_data(DVector::from_vec(vec![1.0, 0.0, 0.5]));
    assert_eq!(moved.chi_squared(&prediction, &mut scratch), 0.0);
    let short = SurveyLikelihood::new(DVector::zeros(2), covariance, &NoiseChoice::gaussian());
    assert!(matches!(short, Err(LikelihoodError::Covariance(_))));
}
