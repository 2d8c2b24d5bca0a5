//! Verdicts: against closed forms and SciPy, and on measurements with one fault each.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

mod common;
#[path = "common/simulation.rs"]
mod simulation;

use common::{assert_relative, cases, covariance, generator, normal_matrix, normal_vector};
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::verdicts::{
    Comparison, Expectation, Swap, amplitude, amplitude_error, anderson_darling, covariance_scale, duplicate,
    error_budget, goodness, leakage_direction, mock_sufficiency, normality, orientation, parity_block,
    row_order, signal, spectrum, whitened_residuals,
};
use oddwell_likelihood::{
    AmplitudePrior, CompressedLikelihood, Covariance, NoiseChoice, SurveyLikelihood, SurveySet, Template,
};
use rand::RngExt;
use rand_distr::StudentT;
use simulation::World;

/// The statistic to rounding; p by Stephens' fit against 200 000 samples, which puts it within 10 % (and the least, of 117
/// samples, within 30 %).
#[test]
fn anderson_and_darling_as_scipy_has_it() {
    let cases = cases(include_str!("reference/normality.csv"));
    assert_eq!(cases.len(), 7);
    for (name, case) in &cases {
        let found = anderson_darling(&case["numbers"]).unwrap();
        // Sums of some ten logarithms of tail probabilities, each good to 10⁻¹¹.
        assert!((found.statistic - case["statistic"][0]).abs() < 1e-9, "{name}: {found:?}");
        let wanted = case["p_value"][0];
        let tolerance = if wanted < 0.005 { 0.3 } else { 0.1 };
        assert_relative(found.p_value, wanted, tolerance, name);
        assert_eq!(found.count, case["numbers"].len());
    }
    assert_eq!(anderson_darling(&[1.0; 20]), None);
    assert_eq!(anderson_darling(&[1.0, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0]), None);
    // Numbers so far out that their tail is 0 in doubles.
    let mut wild = vec![0.0; 2000];
    wild[0] = 1.0;
    let found = anderson_darling(&wild).unwrap();
    assert!(found.statistic.is_finite() && found.p_value < 1e-100);
}

#[test]
fn spectra() {
    // Correlation 0.6 of the first two rows, whatever their units; the third by itself.
    let matrix = DMatrix::from_row_slice(3, 3, &[4.0, 0.012, 0.0, 0.012, 1e-4, 0.0, 0.0, 0.0, 9.0]);
    let found = spectrum(&Covariance::new(matrix, "cov.csv").unwrap(), 2, 4);
    for (found, wanted) in found.eigenvalues.iter().zip([1.6, 1.0, 0.4]) {
        assert!((found - wanted).abs() < 1e-14);
    }
    assert!((found.condition - 4.0).abs() < 1e-13);
    assert_eq!(found.smallest.len(), 2);
    assert!((found.smallest[0].eigenvalue - 0.4).abs() < 1e-14);
    let mut rows: Vec<usize> = found.smallest[0].rows.iter().map(|(row, _)| *row).collect();
    rows.sort_unstable();
    assert_eq!(rows, [0, 1]);
    assert!(found.smallest[0].rows.iter().all(|(_, share)| (share - 0.5).abs() < 1e-14));
    assert_eq!(found.smallest[1].rows.len(), 1);
    assert_eq!(found.smallest[1].rows[0].0, 2);
    // Twice the same row: a mode of nothing.
    let singular = Covariance::new(DMatrix::from_element(2, 2, 1.0), "cov.csv").unwrap();
    let found = spectrum(&singular, 1, 4);
    assert!(found.smallest[0].eigenvalue.abs() < 1e-15 && found.condition > 1e14);
}

/// Parameters fitted with the inverse of an estimate scatter more than with the true covariance: measured over 4000 draws,
/// within 4.5 Monte Carlo errors (the variance of a variance, 2.2 % of it; t-like tails of 35 degrees of freedom add little).
#[test]
fn mocks_cost_what_they_are_said_to() {
    let (mocks, rows, determined, draws) = (50, 16, 2, 4000);
    let world = World::new(rows, 0.0, determined, 1.0, Some(mocks), &mut generator(200));
    let kernels = world.expectation.jacobian.clone();
    let mut random = generator(201);
    let mut scatter = 0.0;
    for _ in 0..draws {
        let noise = world.noise(&mut random);
        let survey = world.survey(noise, &mut random);
        let fit = CompressedLikelihood::new(&survey, &kernels).unwrap().least_squares().unwrap();
        scatter += fit.coefficients[0].powi(2) / f64::from(draws);
    }
    let known =
        SurveyLikelihood::new(DVector::zeros(rows), world.covariance.clone(), &NoiseChoice::gaussian())
            .unwrap();
    let known =
        CompressedLikelihood::new(&known, &kernels).unwrap().least_squares().unwrap().covariance[(0, 0)];
    let found = mock_sufficiency(mocks, rows, determined);
    assert_relative(found.error_growth.powi(2), scatter / known, 4.5 * 0.023, "growth");
    assert_relative(found.error_growth.powi(2), 48.0 / 34.0, 1e-14, "growth in closed form");
    assert!(found.invertible);
    // As physics has B: 32/(33·30) = 0.0323, times 14.
    assert_relative(
        found.width_of_hartlap,
        (1.0 + 14.0 * 32.0 / (33.0 * 30.0_f64)).sqrt().recip(),
        1e-14,
        "width",
    );
    for factor in [1.02, 1.1, 2.0] {
        let needed = found.mocks_for_growth(factor);
        assert!(mock_sufficiency(needed, rows, determined).error_growth <= factor);
        if needed > rows + 5 {
            assert!(mock_sufficiency(needed - 1, rows, determined).error_growth > factor);
        }
    }
    // 60 mocks for 75 numbers.
    let few = mock_sufficiency(60, 75, 5);
    assert!(!few.invertible && few.error_growth.is_infinite() && few.width_of_hartlap == 0.0);
    assert_eq!(few.mocks_for_growth(1.05), 2 + (70.0_f64 * 1.1025 / 0.1025).ceil() as usize);
}

/// By hand: one row measures a + b with unit noise, priors of variance 4 (a) and 1 (b): the variance of a is
/// (1/4 + 1/(1 + 1))⁻¹ = 4/3; with b known (1/4 + 1)⁻¹ = 4/5.
#[test]
fn an_error_budget() {
    let fisher = DMatrix::from_element(2, 2, 1.0);
    let prior = DMatrix::from_diagonal(&DVector::from_vec(vec![4.0, 1.0]));
    let (whole, entries) = error_budget(&fisher, &prior, 0, &[vec![1], vec![], vec![0]]).unwrap();
    assert_relative(whole, (4.0_f64 / 3.0).sqrt(), 1e-14, "all free");
    assert_relative(entries[0].standard_deviation, 0.8_f64.sqrt(), 1e-14, "b known");
    assert_relative(entries[0].share, 0.4, 1e-13, "share");
    assert_eq!(entries[1].standard_deviation, whole);
    // Priors with a covariance of 1: b known leaves a the variance 4 − 1, then (1/3 + 1)⁻¹.
    let common = DMatrix::from_row_slice(2, 2, &[4.0, 1.0, 1.0, 1.0]);
    let (_, tied) = error_budget(&fisher, &common, 0, &[vec![1]]).unwrap();
    assert_relative(tied[0].standard_deviation, 0.75_f64.sqrt(), 1e-14, "b known, and what is common");
    assert_eq!((entries[2].standard_deviation, entries[2].share), (0.0, 1.0));
    assert_eq!(
        error_budget(&fisher, &DMatrix::identity(3, 3), 0, &[]).unwrap_err().to_string(),
        "the prior covariance must have 2 of rows, found 3; build all of them from the same rows and parameters"
    );
    assert!(error_budget(&fisher, &prior, 2, &[]).is_err());
}

/// With wide priors the amplitude is that of least squares with the nuisances as further coefficients.
#[test]
fn amplitudes_are_least_squares() {
    let mut random = generator(202);
    let mut world = World::new(14, 1.0, 3, 1.0, None, &mut random);
    let data = world.data(&mut random);
    let direction = &world.expectation.prediction * 0.3;
    world.expectation.prior_covariance *= 1e8;
    let comparison = world.with(data.clone(), &mut random);
    let found = amplitude(&comparison, &direction).unwrap();
    let mut kernels = DMatrix::zeros(14, 4);
    kernels.set_column(0, &direction);
    kernels.columns_mut(1, 3).copy_from(&world.expectation.jacobian);
    let survey = SurveyLikelihood::new(
        &data - &world.expectation.prediction,
        world.covariance.clone(),
        &NoiseChoice::gaussian(),
    )
    .unwrap();
    let fit = CompressedLikelihood::new(&survey, &kernels).unwrap().least_squares().unwrap();
    // Priors of 10⁴ standard deviations are flat to 10⁻⁸ of their squares; rounding takes as much again.
    assert_relative(found.value, fit.coefficients[0], 1e-6, "value");
    assert_relative(found.standard_deviation, fit.covariance[(0, 0)].sqrt(), 1e-6, "sd");
    assert_eq!(found.degrees_of_freedom, None);
    assert_eq!(found.standard_deviation, amplitude_error(&comparison, &direction).unwrap());
    assert_relative(found.sigma_from(1.0), (found.value - 1.0) / found.standard_deviation, 1e-14, "sigma");
    // Held nuisances: the plain projection.
    let held = amplitude(&comparison.clone().holding(&[0, 1, 2]), &direction).unwrap();
    let plain = survey.projection(direction.as_slice(), survey.data().as_slice())
        / survey.projection(direction.as_slice(), direction.as_slice());
    assert_relative(held.value, plain, 1e-11, "held");
    // One row of several that the direction does not touch.
    assert_eq!(
        amplitude(&comparison, &DVector::zeros(14)).unwrap_err().to_string(),
        "the direction has no part in the 14 rows at hand; give rows that it moves"
    );
    assert_eq!(
        amplitude(&comparison, &DVector::zeros(3)).unwrap_err().to_string(),
        "the direction must have 14 of rows, found 3; build all of them from the same rows and parameters"
    );
}

/// The expected error of an amplitude from mocks is the scatter that is found, on average: 3000 draws, 4.5 errors of a
/// variance (2.6 %) and of the mean of the expectation.
#[test]
fn expected_errors_of_amplitudes_with_mocks() {
    let world = World::new(12, 0.0, 0, 0.0, Some(40), &mut generator(203));
    let direction =
        normal_vector(12, &mut generator(204)).component_mul(&world.covariance.diagonal().map(f64::sqrt));
    let mut random = generator(205);
    let (mut scatter, mut expected) = (0.0, 0.0);
    let draws = 3000;
    for _ in 0..draws {
        let comparison = world.comparison(&mut random);
        scatter += amplitude(&comparison, &direction).unwrap().value.powi(2) / f64::from(draws);
        expected += amplitude_error(&comparison, &direction).unwrap().powi(2) / f64::from(draws);
    }
    assert_relative(expected, scatter, 4.5 * 0.028, "variance");
}

#[test]
fn templates_are_part_of_what_is_expected() {
    let mut random = generator(206);
    let world = World::new(9, 1.0, 0, 0.0, None, &mut random);
    let data = world.data(&mut random);
    let [first, second] = [(); 2].map(|()| normal_vector(9, &mut random));
    let normal = AmplitudePrior::Normal { mean: 0.5, standard_deviation: 1.5 };
    let templates = [
        Template { name: "one".to_owned(), shape: first, prior: normal },
        Template { name: "other".to_owned(), shape: second, prior: AmplitudePrior::Flat },
    ];
    let survey = world.survey(data, &mut random).with_templates(&templates).unwrap();
    let comparison = Comparison::of_survey(&survey, &world.expectation).unwrap();
    let found = goodness(&comparison).unwrap();
    let wanted = survey.chi_squared(world.expectation.prediction.as_slice(), &mut Vec::new());
    assert_relative(found.chi_squared, wanted, 1e-11, "χ²");
    assert_eq!(found.degrees_of_freedom, 8.0);
    let rows = [2, 7, 3];
    let part = goodness(&comparison.select(&rows)).unwrap();
    let wanted = survey.subset_chi_squared(world.expectation.prediction.as_slice(), &rows).unwrap();
    assert_relative(part.chi_squared, wanted, 1e-11, "χ² of a part");
    assert_eq!(part.degrees_of_freedom, 2.0);
    assert_eq!(part.mocks, None);
    covariance_scale(&comparison).unwrap().unwrap();
}

/// Several surveys beside one expectation: parameters in common tie them, noise does not.
#[test]
fn surveys_in_a_set() {
    let mut random = generator(207);
    let world = World::new(10, 1.0, 2, 1.0, None, &mut random);
    let emptied = Covariance::new(world.covariance.clone(), "truth").unwrap();
    let emptied = emptied.with_empty_block(&[0, 1, 2, 3], &[4, 5, 6, 7, 8, 9]);
    let data = world.data(&mut random);
    let survey = |rows: &[usize], mocks: Option<usize>| {
        let noise = NoiseChoice::new("gaussian", mocks).unwrap();
        SurveyLikelihood::from_covariance(data.select_rows(rows), emptied.select(rows), &noise).unwrap()
    };
    let (left, right) = ([0, 1, 2, 3], [4, 5, 6, 7, 8, 9]);
    let set = SurveySet::new(vec![survey(&left, None), survey(&right, None)]);
    let comparison = Comparison::new(&set, &world.expectation).unwrap();
    let Expectation { prediction, jacobian, prior_covariance } = &world.expectation;
    let total = emptied.matrix() + jacobian * prior_covariance * jacobian.transpose();
    let residual = &data - prediction;
    let wanted = residual.dot(&total.cholesky().unwrap().solve(&residual));
    assert_relative(goodness(&comparison).unwrap().chi_squared, wanted, 1e-11, "joint");
    // Mocks of one survey alone count for its share: for the part without parameters, exactly; for all rows, more.
    let set = SurveySet::new(vec![survey(&left, Some(30)), survey(&right, None)]);
    let certain = Expectation::certain(prediction.clone());
    let comparison = Comparison::new(&set, &certain).unwrap();
    let mocks = |positions: &[usize]| goodness(&comparison.select(positions)).unwrap().mocks;
    assert_relative(mocks(&left).unwrap(), 30.0, 1e-11, "its own rows");
    assert_relative(mocks(&[1, 3]).unwrap(), 30.0, 1e-11, "some of them");
    assert_eq!(mocks(&right), None);
    // n − 1 = 29 (10 + 100)/(4 + 16).
    let all: Vec<usize> = (0..10).collect();
    assert_relative(mocks(&all).unwrap(), 1.0 + 29.0 * 110.0 / 20.0, 1e-11, "all rows");
    let message = |expectation: &Expectation| Comparison::new(&set, expectation).unwrap_err().to_string();
    let mut wrong = world.expectation.clone();
    wrong.prediction[4] = f64::NAN;
    assert_eq!(
        message(&wrong),
        "the expected prediction must hold finite numbers only, found NaN; look for what made it in the model's terms"
    );
    wrong = Expectation::certain(DVector::zeros(3));
    assert_eq!(
        message(&wrong),
        "the expected prediction must have 10 of rows, found 3; build all of them from the same rows and parameters"
    );
}

/// Rows 0 … 7 odd; a world in which they have this signal-to-noise.
fn odd_world(sigma: f64, parameters: usize) -> (World, Vec<usize>) {
    let mut world = World::new(20, 3.0, parameters, 0.5, None, &mut generator(300));
    let odd: Vec<usize> = (0..8).collect();
    let only_odd =
        DVector::from_fn(20, |row, _| if row < 8 { world.expectation.prediction[row] } else { 0.0 });
    let comparison =
        world.comparison(&mut generator(301)).about(only_odd.clone()).holding(&[0, 1, 2][..parameters]);
    let found = orientation(&comparison, &odd).unwrap().expected.sqrt() / 2.0;
    for row in 0..8 {
        world.expectation.prediction[row] *= sigma / found;
    }
    (world, odd)
}

#[test]
fn swapped_tracers_are_found() {
    // At 5σ: a difference of −100 ± 20 where nothing is free; parameters move odd rows too, and cost some of it.
    for (parameters, least) in [(0, 18.0), (3, 14.0)] {
        let (world, odd) = odd_world(5.0, parameters);
        let mut random = generator(302);
        for _ in 0..100 {
            let (mut signal, noise) = (world.signal(&mut random), world.noise(&mut random));
            let right = orientation(&world.with(&signal + &noise, &mut random), &odd).unwrap();
            assert!(right.difference > least && right.p_value == 1.0);
            odd.iter().for_each(|row| signal[*row] *= -1.0);
            let found = orientation(&world.with(signal + noise, &mut random), &odd).unwrap();
            assert!(found.difference < -least && found.p_value < 1e-3, "{parameters}: {found:?}");
            if parameters == 0 {
                assert_relative(found.expected, 100.0, 1e-9, "expected");
            }
        }
    }
}

#[test]
fn permuted_rows_are_found() {
    // Eight rows of a multipole with a signal-to-noise of 12 in all, like an even one's, in a random order.
    let (world, odd) = odd_world(12.0, 2);
    let mut random = generator(303);
    let mut found = 0;
    for _ in 0..50 {
        let clean = world.data(&mut random);
        let sound = row_order(&world.with(clean.clone(), &mut random).select(&odd)).unwrap();
        assert!(sound.p_value > 1e-3);
        // Values against their labels: a random order, of which no more than one row stays.
        let order = derangement(8, &mut random);
        let mut permuted = clean.clone();
        order.iter().enumerate().for_each(|(to, from)| permuted[to] = clean[*from]);
        let verdict = row_order(&world.with(permuted, &mut random).select(&odd)).unwrap();
        found += usize::from(verdict.p_value < 1e-3);
        // Labels against values and covariance: the prediction is in another order.
        let mut labels = world.expectation.prediction.clone();
        order.iter().enumerate().for_each(|(to, from)| labels[to] = world.expectation.prediction[*from]);
        let verdict = row_order(&world.with(clean, &mut random).about(labels).select(&odd)).unwrap();
        found += usize::from(verdict.p_value < 1e-3);
    }
    assert!(found >= 95, "{found} of 100");
    // A strong signal: the very order.
    let (world, odd) = odd_world(200.0, 0);
    let clean = world.data(&mut random);
    let mut permuted = clean.clone();
    permuted.swap_rows(1, 6);
    permuted.swap_rows(2, 3);
    let verdict = row_order(&world.with(permuted, &mut random).select(&odd)).unwrap();
    assert_eq!((verdict.swap, verdict.order), (Swap::Values, vec![0, 6, 3, 2, 4, 5, 1, 7]));
}

fn derangement(size: usize, random: &mut impl rand::Rng) -> Vec<usize> {
    loop {
        let mut order: Vec<usize> = (0..size).collect();
        for last in (1..size).rev() {
            order.swap(last, random.random_range(0..=last));
        }
        if order.iter().enumerate().filter(|(to, from)| to == *from).count() < 2 {
            return order;
        }
    }
}

#[test]
fn a_covariance_in_other_units_is_found() {
    for (parameters, mocks) in [(0, None), (3, None), (3, Some(60))] {
        let world = World::new(20, 1.5, parameters, 0.7, mocks, &mut generator(304));
        let mut random = generator(305);
        for wrong in [1e-4, 1e4] {
            for _ in 0..50 {
                let data = world.data(&mut random);
                let survey = SurveyLikelihood::new(
                    data,
                    world.estimate(&mut random) * wrong,
                    &NoiseChoice::new("gaussian", mocks).unwrap(),
                )
                .unwrap();
                let comparison = Comparison::of_survey(&survey, &world.expectation).unwrap();
                let found = covariance_scale(&comparison).unwrap().unwrap();
                assert!(found.p_value < 1e-6, "{wrong}: {found:?}");
                // With 60 mocks for 20 rows, χ² is too large by 1.55 on average.
                let bias = if mocks.is_some() { 1.55_f64.ln() } else { 0.0 };
                let off = found.log_factor + f64::ln(wrong) - bias;
                assert!(off.abs() < 5.0 * found.log_error, "{wrong}: {found:?}");
                assert!(found.factor() > 0.0 && found.log_error < 0.5);
            }
        }
    }
}

#[test]
fn a_leaked_even_multipole_is_found() {
    let (world, odd) = odd_world(5.0, 3);
    let leaks: Vec<(usize, usize)> = odd.iter().map(|row| (*row, row + 8)).collect();
    let direction = leakage_direction(&world.expectation.prediction, &leaks);
    assert_eq!(direction[3], world.expectation.prediction[11]);
    assert_eq!(direction[11], 0.0);
    let mut random = generator(306);
    let error = amplitude_error(&world.comparison(&mut random), &direction).unwrap();
    let planted = 6.0 * error;
    let mut mean = 0.0;
    for _ in 0..100 {
        let data = world.data(&mut random) + &direction * planted;
        let found = amplitude(&world.with(data, &mut random), &direction).unwrap();
        assert!(found.sigma_from(0.0) > 3.0);
        mean += found.value / 100.0;
    }
    // 4.5 errors of a mean of 100.
    assert!((mean - planted).abs() < 0.45 * error);
}

#[test]
fn a_duplicated_survey_is_found() {
    let mut random = generator(307);
    let world = World::new(12, 1.0, 2, 0.5, None, &mut random);
    let pairs: Vec<(usize, usize)> = (0..12).map(|row| (row, row)).collect();
    let data = world.data(&mut random);
    let survey = world.survey(data.clone(), &mut random);
    let copy = duplicate(&survey, &survey, &pairs).unwrap();
    assert_eq!((copy.rows, copy.identical, copy.chi_squared, copy.p_value), (12, 12, 0.0, 0.0));
    // Written with four digits, and with another covariance.
    let rounded = data.map(|value| format!("{value:.3e}").parse().unwrap());
    let other =
        SurveyLikelihood::new(rounded, covariance(12, &mut random), &NoiseChoice::gaussian()).unwrap();
    let found = duplicate(&survey, &other, &pairs).unwrap();
    assert!(found.p_value < 1e-10 && found.identical < 4, "{found:?}");
    let nothing = duplicate(&survey, &other, &[]).unwrap();
    assert_eq!((nothing.rows, nothing.p_value), (0, 1.0));
}

/// Noise of t₂ tails of the same variance scale, 60 rows: found in most draws at 1 %; a test of χ² would not see the shape.
#[test]
fn noise_with_heavy_tails_is_found() {
    let mut random = generator(308);
    let world = World::new(60, 0.5, 2, 0.5, None, &mut random);
    let root = world.covariance.clone().cholesky().unwrap().unpack();
    let heavy = StudentT::new(2.0).unwrap();
    let mut found = 0;
    for _ in 0..100 {
        let noise = DVector::from_fn(60, |_, _| random.sample(heavy));
        let data = &world.expectation.prediction + &root * noise;
        found += usize::from(normality(&world.with(data, &mut random)).unwrap().unwrap().p_value < 0.01);
    }
    assert!(found > 60, "{found}");
}

#[test]
fn a_block_of_the_covariance_that_should_not_be_there_is_found() {
    let mut random = generator(309);
    let (rows, mocks) = (10, 80);
    let truth = DMatrix::from_fn(rows, rows, |i, j| match (i, j) {
        (i, j) if i == j => 1.0,
        (i, j) if i + 5 == j || j + 5 == i => 0.5,
        _ => 0.0,
    });
    let root = truth.cholesky().unwrap().unpack();
    let sample = normal_matrix(mocks, rows, &mut random) * root.transpose();
    let estimate = oddwell_likelihood::MockSet::new(sample, "mocks").unwrap().covariance().unwrap();
    let (first, second): (Vec<usize>, Vec<usize>) = ((0..5).collect(), (5..10).collect());
    let found = parity_block(&estimate, None, &first, &second, Some(mocks)).unwrap();
    assert!(found.p_value.unwrap() < 1e-6);
    assert!(found.largest.0 > 0.4 && found.largest.1 + 5 == found.largest.2);
    assert_eq!(found.largest_difference, found.largest.0);
    // A covariance that is known has no p-value, and too few mocks have none.
    assert_eq!(parity_block(&estimate, None, &first, &second, None).unwrap().p_value, None);
    assert_eq!(parity_block(&estimate, None, &first, &second, Some(10)).unwrap().p_value, None);
    let small = estimate.select(&first);
    assert!(parity_block(&estimate, Some(&small), &first, &second, Some(mocks)).is_err());
}

#[test]
fn no_rows_at_all() {
    let mut random = generator(311);
    for mocks in [None, Some(30)] {
        let world = World::new(5, 1.0, 2, 0.5, mocks, &mut random);
        let nothing = world.comparison(&mut random).select(&[]);
        let found = goodness(&nothing).unwrap();
        assert_eq!((found.chi_squared, found.p_value), (0.0, None));
        assert_eq!(covariance_scale(&nothing).unwrap(), None);
        assert_eq!(normality(&nothing).unwrap(), None);
        assert_eq!(row_order(&nothing).unwrap().p_value, 1.0);
        assert_eq!(orientation(&nothing, &[]).unwrap().difference, 0.0);
        assert_eq!(signal(&nothing).unwrap().signal_to_noise, 0.0);
        let found = spectrum(nothing.noise(), 3, 3);
        assert_eq!((found.eigenvalues.len(), found.condition), (0, 1.0));
        assert!(amplitude(&nothing, &DVector::zeros(0)).is_err());
    }
}

#[test]
fn too_few_mocks_for_a_question() {
    let mut random = generator(310);
    let data = DVector::zeros(8);
    let noise = NoiseChoice::new("gaussian", Some(8)).unwrap();
    let survey = SurveyLikelihood::new(data, DMatrix::identity(8, 8), &noise).unwrap();
    let direction = normal_vector(8, &mut random);
    let comparison = Comparison::of_survey(&survey, &Expectation::certain(direction.clone())).unwrap();
    assert_eq!(goodness(&comparison).unwrap().p_value, None);
    assert_eq!(signal(&comparison).unwrap().sigma, None);
    assert_eq!(
        amplitude(&comparison, &direction).unwrap_err().to_string(),
        "an amplitude needs more than 8 mocks, found 8; ask about fewer rows or make more mocks"
    );
    assert_eq!(
        whitened_residuals(&comparison).unwrap_err().to_string(),
        "a test of residuals needs more than 8 mocks, found 8; ask about fewer rows or make more mocks"
    );
    assert!(amplitude_error(&comparison, &direction).unwrap().is_infinite());
}
