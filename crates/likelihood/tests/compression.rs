//! The compressed likelihood is the plain one.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

mod common;

use common::{covariance, generator, normal_matrix, normal_vector};
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{CompressedLikelihood, LikelihoodError, NoiseChoice, SurveyLikelihood, SurveySet};
use proptest::prelude::*;
use rand::RngExt;

/// A random problem: kernels of a given rank (below rows and columns: dependent columns, or more coefficients than
/// rows), some columns of zeros, columns in units that differ by up to e^±6, bins without correlation.
struct Problem {
    survey: SurveyLikelihood,
    kernels: DMatrix<f64>,
    rank: usize,
}

impl Problem {
    fn draw(rows: usize, columns: usize, rank: usize, bins: usize, noise: f64, seed: u64) -> Self {
        let mut random = generator(seed);
        let rank = rank.min(rows).min(columns);
        let mut kernels = normal_matrix(rows, rank, &mut random) * normal_matrix(rank, columns, &mut random);
        for mut column in kernels.column_iter_mut() {
            let unit: f64 = random.random_range(-6.0..6.0);
            let zero = random.random_bool(0.1);
            column *= if zero { 0.0 } else { unit.exp() };
        }
        let mut covariance = covariance(rows, &mut random);
        if bins > 1 {
            for (i, j) in (0..rows).flat_map(|i| (0..rows).map(move |j| (i, j))) {
                covariance[(i, j)] *= f64::from(u8::from(i % bins == j % bins));
            }
            for (i, j) in (0..rows).flat_map(|i| (0..columns).map(move |j| (i, j))) {
                kernels[(i, j)] *= f64::from(u8::from(i % bins == j % bins));
            }
        }
        let truth = Self::coefficients(&kernels, &mut random);
        let scatter = normal_vector(rows, &mut random);
        let data =
            DVector::from_fn(rows, |i, _| noise * scatter[i] * covariance[(i, i)].sqrt()) + &kernels * truth;
        let survey = SurveyLikelihood::new(data, covariance, &NoiseChoice::gaussian()).unwrap();
        Self { survey, kernels, rank }
    }

    /// Coefficients whose contributions to the prediction are of like size.
    fn coefficients(kernels: &DMatrix<f64>, random: &mut impl rand::Rng) -> DVector<f64> {
        let numbers = normal_vector(kernels.ncols(), random);
        DVector::from_fn(kernels.ncols(), |j, _| match kernels.column(j).norm() {
            0.0 => numbers[j],
            norm => numbers[j] / norm,
        })
    }

    /// Where rounding sets the limit: |L⁻¹d| + Σ|c_j||L⁻¹K_j|.
    fn size(&self, coefficients: &DVector<f64>) -> f64 {
        let whitened = self.survey.whiten(&self.kernels);
        let data = self.survey.whiten(&DMatrix::from_column_slice(
            self.survey.rows(),
            1,
            self.survey.data().as_slice(),
        ));
        data.norm()
            + (0..coefficients.len()).map(|j| coefficients[j].abs() * whitened.column(j).norm()).sum::<f64>()
    }
}

/// χ² is the square of a length that is known to `rounding` of `size`: so 10⁻¹¹ of χ², unless the fit is so good that
/// the length itself is a small difference.
fn allowed(chi_squared: f64, size: f64) -> f64 {
    let rounding = 2e-13 * size;
    1e-11 * chi_squared + 2.0 * rounding * chi_squared.sqrt() + rounding * rounding
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, ..ProptestConfig::default() })]

    #[test]
    fn compressed_is_plain(
        rows in 1usize..45, columns in 1usize..60, rank in 1usize..45, bins in 1usize..4,
        noise in prop::sample::select(vec![1.0, 1e-3, 0.0]), seed: u64,
    ) {
        let problem = Problem::draw(rows, columns, rank, bins, noise, seed);
        let compressed = CompressedLikelihood::new(&problem.survey, &problem.kernels).unwrap();
        if bins == 1 {
            prop_assert!(compressed.rank() <= problem.rank);
        }
        let mut random = generator(!seed);
        let mut scratch = Vec::new();
        for _ in 0..3 {
            let coefficients = Problem::coefficients(&problem.kernels, &mut random);
            let prediction = &problem.kernels * &coefficients;
            let plain = problem.survey.chi_squared(prediction.as_slice(), &mut scratch);
            let found = compressed.chi_squared(coefficients.as_slice());
            let allowed = allowed(plain, problem.size(&coefficients));
            prop_assert!((found - plain).abs() <= allowed, "plain {plain:e}, compressed {found:e}, allowed {allowed:e}");
            prop_assert!(found >= compressed.smallest_chi_squared());
            let log_likelihoods = (
                problem.survey.log_likelihood(prediction.as_slice(), &mut scratch),
                compressed.log_likelihood(coefficients.as_slice()),
            );
            // Half of χ²'s error, and the rounding of a sum with the constant.
            let allowed = allowed + 1e-14 * (log_likelihoods.0.abs() + plain + problem.survey.log_determinant().abs());
            prop_assert!((log_likelihoods.0 - log_likelihoods.1).abs() <= allowed);
        }
    }

    /// With as much noise as the covariance says and no cancellation in the prediction, 10⁻¹¹ of χ² flat.
    #[test]
    fn compressed_is_plain_to_eleven_digits(rows in 5usize..45, columns in 1usize..30, seed: u64) {
        let problem = Problem::draw(rows, columns, columns, 1, 1.0, seed);
        let compressed = CompressedLikelihood::new(&problem.survey, &problem.kernels).unwrap();
        let coefficients = Problem::coefficients(&problem.kernels, &mut generator(!seed));
        let prediction = &problem.kernels * &coefficients;
        let plain = problem.survey.chi_squared(prediction.as_slice(), &mut Vec::new());
        let found = compressed.chi_squared(coefficients.as_slice());
        prop_assert!((found - plain).abs() <= 1e-11 * plain, "plain {plain:e}, compressed {found:e}");
    }

    #[test]
    fn order_of_rows_and_of_coefficients_does_not_matter(rows in 1usize..30, columns in 1usize..30, seed: u64) {
        let problem = Problem::draw(rows, columns, columns, 1, 1.0, seed);
        let mut random = generator(!seed);
        let mut shuffled = |count: usize| {
            let mut order: Vec<usize> = (0..count).collect();
            for i in (1..count).rev() {
                order.swap(i, random.random_range(0..=i));
            }
            order
        };
        let (row_order, column_order) = (shuffled(rows), shuffled(columns));
        let coefficients = Problem::coefficients(&problem.kernels, &mut random);
        let kernels = problem.kernels.select_rows(&row_order).select_columns(&column_order);
        let data = DVector::from_fn(rows, |i, _| problem.survey.data()[row_order[i]]);
        let covariance = problem.survey.covariance().select(&row_order);
        let permuted = SurveyLikelihood::from_covariance(data, covariance, &NoiseChoice::gaussian()).unwrap();
        let permuted_coefficients = DVector::from_fn(columns, |j, _| coefficients[column_order[j]]);

        let plain = problem.survey.chi_squared((&problem.kernels * &coefficients).as_slice(), &mut Vec::new());
        let allowed = allowed(plain, problem.size(&coefficients));
        let found = permuted.chi_squared((&kernels * &permuted_coefficients).as_slice(), &mut Vec::new());
        prop_assert!((found - plain).abs() <= allowed, "plain {plain:e}, permuted {found:e}");
        let compressed = CompressedLikelihood::new(&permuted, &kernels).unwrap();
        let found = compressed.chi_squared(permuted_coefficients.as_slice());
        prop_assert!((found - plain).abs() <= allowed, "plain {plain:e}, permuted and compressed {found:e}");
        // Each determinant is known to the condition number (10³) times some hundred roundings.
        prop_assert!((permuted.log_determinant() - problem.survey.log_determinant()).abs() < 1e-10);
    }

    #[test]
    fn information_of_the_compressed_is_that_of_the_plain(rows in 1usize..30, columns in 1usize..20, seed: u64) {
        let problem = Problem::draw(rows, columns, columns, 1, 1.0, seed);
        let compressed = CompressedLikelihood::new(&problem.survey, &problem.kernels).unwrap();
        let jacobian = normal_matrix(columns, 4, &mut generator(!seed));
        let plain = problem.survey.fisher_information(&(&problem.kernels * &jacobian));
        let found = compressed.fisher_information(&jacobian);
        for (i, j) in (0..4).flat_map(|i| (0..4).map(move |j| (i, j))) {
            // Relative to the two directions' own information; sums over up to 20 columns of like size.
            let scale = (plain[(i, i)] * plain[(j, j)]).sqrt();
            prop_assert!((found[(i, j)] - plain[(i, j)]).abs() <= 1e-10 * scale);
        }
    }
}

/// The case that breaks the textbook form: a signal-to-noise of 10⁷ whose χ² is of order one.
#[test]
fn a_strong_signal_costs_no_digits() {
    let mut random = generator(11);
    let kernels = normal_matrix(20, 6, &mut random) * 1e7;
    let truth = normal_vector(6, &mut random);
    let data = &kernels * &truth + normal_vector(20, &mut random);
    let survey =
        SurveyLikelihood::new(data.clone(), DMatrix::identity(20, 20), &NoiseChoice::gaussian()).unwrap();
    let compressed = CompressedLikelihood::new(&survey, &kernels).unwrap();
    let plain = survey.chi_squared((&kernels * &truth).as_slice(), &mut Vec::new());
    let found = compressed.chi_squared(truth.as_slice());
    // Rounding of predictions of 10⁷ is 10⁻⁹, of χ² twice that: what the plain form has, too.
    assert!((found - plain).abs() < 1e-7, "plain {plain}, compressed {found}");
    // The textbook form, for comparison, is off by more than a hundred times as much.
    let (projected, normal) = (kernels.tr_mul(&data), kernels.tr_mul(&kernels));
    let textbook = data.norm_squared() - 2.0 * truth.dot(&projected) + truth.dot(&(normal * &truth));
    assert!((textbook - plain).abs() > 1e-5, "textbook {textbook}, plain {plain}");
}

/// Kernels that differ by 10⁻⁹ of their length are two, not one: cutting R there would move χ² by what their difference
/// times a large coefficient makes. Kernels that differ by rounding are one.
#[test]
fn nearly_dependent_kernels_are_kept_and_dependent_ones_cut() {
    let mut random = generator(12);
    let (first, other) = (normal_vector(20, &mut random), normal_vector(20, &mut random));
    let data = normal_vector(20, &mut random);
    let survey = SurveyLikelihood::new(data, DMatrix::identity(20, 20), &NoiseChoice::gaussian()).unwrap();
    for (difference, rank) in [(1e-9, 2), (0.0, 1)] {
        let kernels = DMatrix::from_columns(&[first.clone(), &first / 3.0 + &other * difference]);
        let compressed = CompressedLikelihood::new(&survey, &kernels).unwrap();
        assert_eq!(compressed.rank(), rank);
        let coefficients = DVector::from_vec(vec![-1e9, 3e9]);
        let plain = survey.chi_squared((&kernels * &coefficients).as_slice(), &mut Vec::new());
        let found = compressed.chi_squared(coefficients.as_slice());
        // The prediction is the difference of two of 10⁹, so known to 10⁻⁶ at best; it is 3 times `other`, or nothing.
        assert!((found - plain).abs() < 1e-5 * plain, "{difference}: plain {plain}, compressed {found}");
    }
}

#[test]
fn surveys_add_up_and_touch_only_their_own_coefficients() {
    let first = Problem::draw(9, 5, 5, 1, 1.0, 1);
    let second = Problem::draw(14, 7, 7, 1, 1.0, 2);
    // The surveys share the third coefficient of the first (as a common departure would be).
    let place = |j: usize| if j == 0 { 2 } else { 4 + j };
    let mut kernels = DMatrix::zeros(23, 11);
    kernels.view_mut((0, 0), (9, 5)).copy_from(&first.kernels);
    for j in 0..7 {
        kernels.view_mut((9, place(j)), (14, 1)).copy_from(&second.kernels.column(j));
    }
    let hartlap = NoiseChoice::new("hartlap", Some(80)).unwrap();
    let surveys =
        SurveySet::new(vec![first.survey.clone(), second.survey.clone().with_noise(&hartlap).unwrap()]);
    let compressed = surveys.compress(&kernels).unwrap();
    let coefficients = normal_vector(11, &mut generator(3));
    let prediction = &kernels * &coefficients;
    let mut scratch = Vec::new();
    let [plain, found] = [
        surveys.log_likelihood(prediction.as_slice(), &mut scratch),
        compressed.log_likelihood(coefficients.as_slice()),
    ];
    assert!((plain - found).abs() < 1e-11 * plain.abs(), "plain {plain}, compressed {found}");
    let plain = surveys.chi_squared(prediction.as_slice(), &mut scratch);
    assert!((plain - compressed.chi_squared(coefficients.as_slice())).abs() < 1e-11 * plain);
    let parts = [
        first.survey.chi_squared(&prediction.as_slice()[..9], &mut scratch),
        second.survey.chi_squared(&prediction.as_slice()[9..], &mut scratch),
    ];
    assert!((plain - parts[0] - parts[1]).abs() < 1e-13 * plain);
    // A coefficient that a survey has no kernel for may be anything, even no number.
    let mut foreign = coefficients.clone();
    foreign[10] = f64::NAN;
    assert!(compressed.surveys()[0].chi_squared(foreign.as_slice()).is_finite());
    assert!(compressed.surveys()[1].chi_squared(foreign.as_slice()).is_nan());
    // Information adds up as well.
    let jacobian = normal_matrix(11, 3, &mut generator(4));
    let difference =
        surveys.fisher_information(&(&kernels * &jacobian)) - compressed.fisher_information(&jacobian);
    assert!(difference.amax() < 1e-11 * surveys.fisher_information(&(&kernels * &jacobian)).amax());
}

#[test]
fn blocks_of_every_size_are_summed_alike() {
    // Capacities of the stack array (32, 128, 512), their neighbours, and beyond the largest.
    for columns in [1, 2, 3, 4, 5, 31, 32, 33, 127, 128, 129, 512, 513] {
        let problem = Problem::draw(20, columns, 20, 1, 1.0, columns as u64);
        let compressed = CompressedLikelihood::new(&problem.survey, &problem.kernels).unwrap();
        let coefficients = Problem::coefficients(&problem.kernels, &mut generator(5));
        let plain =
            problem.survey.chi_squared((&problem.kernels * &coefficients).as_slice(), &mut Vec::new());
        let found = compressed.chi_squared(coefficients.as_slice());
        assert!(
            (plain - found).abs() < allowed(plain, problem.size(&coefficients)),
            "{columns}: {plain} {found}"
        );
    }
}

#[test]
fn kernels_that_cannot_be_used() {
    let survey = Problem::draw(4, 2, 2, 1, 1.0, 6).survey;
    let message =
        |kernels: DMatrix<f64>| CompressedLikelihood::new(&survey, &kernels).unwrap_err().to_string();
    assert_eq!(
        message(DMatrix::zeros(5, 2)),
        "kernels must have a row for each of the 4 measured numbers, found 5; build both from the same rows"
    );
    let mut kernels = DMatrix::zeros(4, 2);
    kernels[(2, 1)] = f64::NAN;
    assert_eq!(
        message(kernels),
        "the kernel of coefficient 2 at row 3 must be a finite number, found NaN; look for what made it in the model's terms"
    );
    let singular =
        DMatrix::from_fn(4, 3, |i, j| if j == 2 { 3.0 * i as f64 } else { (i as f64).powi(j as i32) });
    let error = CompressedLikelihood::new(&survey, &singular).unwrap().least_squares().unwrap_err();
    assert_eq!(error, LikelihoodError::Undetermined { coefficients: 3, rank: 2 });
    assert_eq!(
        error.to_string(),
        "3 coefficients cannot be solved for: the data determine 2 of their combinations; hold some, or give priors"
    );
    // No kernels at all, or only zeros: χ² is that of the data.
    for columns in [0, 3] {
        let compressed = CompressedLikelihood::new(&survey, &DMatrix::zeros(4, columns)).unwrap();
        let plain = survey.chi_squared(&[0.0; 4], &mut Vec::new());
        assert!((compressed.chi_squared(&vec![1.0; columns]) - plain).abs() < 1e-13 * plain);
        assert_eq!(compressed.rank(), 0);
    }
}
