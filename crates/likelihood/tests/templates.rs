//! Templates integrated out: against numerical integration over their amplitudes, and drawn back.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

mod common;

use common::{covariance, generator, normal_matrix, normal_vector};
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{
    AmplitudePrior, CompressedLikelihood, NoiseChoice, SurveyLikelihood, SurveySet, Template, read_template,
};

const ROWS: usize = 7;

fn normal(mean: f64, standard_deviation: f64) -> AmplitudePrior {
    AmplitudePrior::Normal { mean, standard_deviation }
}

fn template(name: &str, shape: &DVector<f64>, prior: AmplitudePrior) -> Template {
    Template { name: name.to_owned(), shape: shape.clone(), prior }
}

/// A survey of seven rows, a prediction and two shapes, with signals of some standard deviations.
struct Problem {
    survey: SurveyLikelihood,
    prediction: DVector<f64>,
    shapes: [DVector<f64>; 2],
}

fn problem(noise: &str) -> Problem {
    let mut random = generator(21);
    let matrix = covariance(ROWS, &mut random);
    let scales = matrix.diagonal().map(f64::sqrt);
    let [data, prediction, first, second] =
        [(); 4].map(|()| normal_vector(ROWS, &mut random).component_mul(&scales));
    let noise = NoiseChoice::new(noise, Some(40)).unwrap();
    let survey = SurveyLikelihood::new(data, matrix, &noise).unwrap();
    Problem { survey, prediction, shapes: [first, second] }
}

/// ln ∫ L(d − p − a t) π(a) da by Simpson's rule, over 16 posterior standard deviations either way of the peak in
/// 4000 steps: what is left out is e^(−128), and the rule's error h⁴ of a smooth integrand below 10⁻¹².
fn integrated(
    log_likelihood: impl Fn(f64) -> f64,
    log_prior: impl Fn(f64) -> f64,
    centre: f64,
    width: f64,
) -> f64 {
    let steps = 4000;
    let step = 32.0 * width / f64::from(steps);
    let value = |index: i32| {
        let amplitude = centre + (f64::from(index) - f64::from(steps / 2)) * step;
        log_likelihood(amplitude) + log_prior(amplitude)
    };
    let peak = (0..=steps).map(value).fold(f64::NEG_INFINITY, f64::max);
    let weight = |index: i32| match index {
        0 => 1.0,
        last if last == steps => 1.0,
        odd if odd % 2 == 1 => 4.0,
        _ => 2.0,
    };
    let sum: f64 = (0..=steps).map(|index| weight(index) * (value(index) - peak).exp()).sum();
    peak + (sum * step / 3.0).ln()
}

fn log_normal(x: f64, mean: f64, sd: f64) -> f64 {
    -0.5 * ((x - mean) / sd).powi(2) - 0.5 * (std::f64::consts::TAU * sd * sd).ln()
}

/// The rule and the closed form are each good to about 10⁻¹² of a logarithm of order 10.
const EXACT: f64 = 1e-10;

#[test]
fn one_template_is_its_integral() {
    for noise in ["gaussian", "hartlap"] {
        let Problem { survey, prediction, shapes: [shape, _] } = problem(noise);
        let mut scratch = Vec::new();
        let mut at = |amplitude: f64| {
            survey.log_likelihood((&prediction + &shape * amplitude).as_slice(), &mut scratch)
        };
        let values: Vec<f64> = (-2..=2).map(|index| at(f64::from(index))).collect();
        // ln L is a parabola in the amplitude.
        let curvature = 2.0 * values[2] - values[1] - values[3];
        let peak = 0.5 * (values[3] - values[1]) / curvature;
        let log_likelihood = |amplitude: f64| {
            survey.log_likelihood((&prediction + &shape * amplitude).as_slice(), &mut Vec::new())
        };
        let mut scratch = Vec::new();
        for (mean, sd) in [(0.0, 0.3), (0.7, 2.0), (-5.0, 0.01), (0.2, 50.0)] {
            let marginal =
                survey.clone().with_templates(&[template("ramp", &shape, normal(mean, sd))]).unwrap();
            let found = marginal.log_likelihood(prediction.as_slice(), &mut scratch);
            let posterior_variance = (curvature + sd.powi(-2)).recip();
            let centre = posterior_variance * (peak * curvature + mean * sd.powi(-2));
            let wanted =
                integrated(log_likelihood, |a| log_normal(a, mean, sd), centre, posterior_variance.sqrt());
            assert!((found - wanted).abs() < EXACT, "{noise}, {mean} ± {sd}: {found} {wanted}");
            // Drawn back: the same posterior.
            let amplitudes = marginal.amplitudes(prediction.as_slice());
            assert!((amplitudes.mean[0] - centre).abs() < 1e-9 * centre.abs().max(posterior_variance.sqrt()));
            assert!((amplitudes.covariance[(0, 0)] / posterior_variance - 1.0).abs() < 1e-9);
            assert!(marginal.noise().is_normalised());
        }
        let flat = survey.clone().with_templates(&[template("ramp", &shape, AmplitudePrior::Flat)]).unwrap();
        let found = flat.log_likelihood(prediction.as_slice(), &mut scratch);
        let wanted = integrated(log_likelihood, |_| 0.0, peak, curvature.sqrt().recip());
        assert!((found - wanted).abs() < EXACT, "{noise}, flat: {found} {wanted}");
        let amplitudes = flat.amplitudes(prediction.as_slice());
        assert!(
            (amplitudes.mean[0] - peak).abs() < 1e-9
                && (amplitudes.covariance[(0, 0)] * curvature - 1.0).abs() < 1e-9
        );
        assert!(!flat.noise().is_normalised() && flat.flat_templates() == 1);
        // The limit of wide priors: σ√(2π) times the normal one's. What is left is of order (a/σ)² and (width/σ)², 10⁻⁸.
        let wide = 1e4_f64;
        let limit = survey.clone().with_templates(&[template("ramp", &shape, normal(0.0, wide))]).unwrap();
        let limit = limit.log_likelihood(prediction.as_slice(), &mut scratch)
            + (std::f64::consts::TAU.sqrt() * wide).ln();
        assert!((found - limit).abs() < 1e-6, "{found} {limit}");
    }
}

/// Two templates, one after the other: the second integral is over a likelihood that has the first in it.
#[test]
fn several_templates_are_integrals_in_turn() {
    for noise in ["gaussian", "hartlap"] {
        let Problem { survey, prediction, shapes: [first, second] } = problem(noise);
        for (one, other) in [
            (normal(0.3, 0.8), normal(-0.5, 1.5)),
            (AmplitudePrior::Flat, normal(-0.5, 1.5)),
            (normal(0.3, 0.8), AmplitudePrior::Flat),
            (AmplitudePrior::Flat, AmplitudePrior::Flat),
        ] {
            let half = survey.clone().with_templates(&[template("one", &first, one)]).unwrap();
            let both = half.clone().with_templates(&[template("other", &second, other)]).unwrap();
            let at_once = survey
                .clone()
                .with_templates(&[template("one", &first, one), template("other", &second, other)]);
            let mut scratch = Vec::new();
            let found = both.log_likelihood(prediction.as_slice(), &mut scratch);
            assert_eq!(found, at_once.unwrap().log_likelihood(prediction.as_slice(), &mut scratch));
            let prior = |a: f64| match other {
                AmplitudePrior::Normal { mean, standard_deviation } => {
                    log_normal(a, mean, standard_deviation)
                }
                AmplitudePrior::Flat => 0.0,
            };
            let amplitudes = both.amplitudes(prediction.as_slice());
            let (centre, width) = (amplitudes.mean[1], amplitudes.covariance[(1, 1)].sqrt());
            let log_likelihood =
                |a: f64| half.log_likelihood((&prediction + &second * a).as_slice(), &mut Vec::new());
            let wanted = integrated(log_likelihood, prior, centre, width);
            assert!((found - wanted).abs() < EXACT, "{noise}: {found} {wanted}");
        }
    }
}

/// Every other way to ask for χ² knows the templates as well.
#[test]
fn compressed_subsets_and_sets_agree() {
    let Problem { survey, prediction, shapes: [first, second] } = problem("hartlap");
    let mut random = generator(22);
    let kernels =
        DMatrix::from_fn(ROWS, 3, |i, j| normal_matrix(1, 1, &mut random)[0] * first[i] * (j + 1) as f64);
    let templates =
        [template("one", &first, normal(0.4, 1.3)), template("other", &second, AmplitudePrior::Flat)];
    let marginal = survey.clone().with_templates(&templates).unwrap();
    let compressed = CompressedLikelihood::new(&marginal, &kernels).unwrap();
    let coefficients = [0.3, -0.8, 0.5];
    let predicted = &kernels * DVector::from_column_slice(&coefficients);
    let mut scratch = Vec::new();
    let plain = marginal.log_likelihood(predicted.as_slice(), &mut scratch);
    assert!((compressed.log_likelihood(&coefficients) - plain).abs() < 1e-11 * (1.0 + plain.abs()));
    let information = marginal.fisher_information(&kernels);
    let identity = DMatrix::identity(3, 3);
    assert!((compressed.fisher_information(&identity) - &information).amax() < 1e-11 * information.amax());
    let set = SurveySet::new(vec![marginal.clone()]);
    assert_eq!(
        set.chi_squared(predicted.as_slice(), &mut scratch),
        marginal.chi_squared(predicted.as_slice(), &mut scratch)
    );
    // A flat template's direction carries no information, and moves χ² by nothing.
    assert!(marginal.whiten(&DMatrix::from_column_slice(ROWS, 1, second.as_slice())).amax() < 1e-12);
    let moved = &prediction + &second * 10.0;
    let [here, there] = [&prediction, &moved].map(|p| marginal.chi_squared(p.as_slice(), &mut Vec::new()));
    assert!((here - there).abs() < 1e-10 * here);
    let all: Vec<usize> = (0..ROWS).collect();
    let whole = marginal.subset_chi_squared(prediction.as_slice(), &all).unwrap();
    assert!((whole - here).abs() < 1e-11 * here);
    // Some rows: as a survey of these rows alone.
    let some = [4, 1, 5];
    let pick = |shape: &DVector<f64>| DVector::from_iterator(3, some.iter().map(|row| shape[*row]));
    let alone = SurveyLikelihood::from_covariance(
        pick(survey.data()),
        survey.covariance().select(&some),
        &NoiseChoice::new("hartlap", Some(44)).unwrap(),
    )
    .unwrap();
    // The inflation depends on the number of rows: 39/(40 − 9) of seven rows, 43/(44 − 5) of three.
    let inflation = (39.0_f64 / 31.0) / (43.0 / 39.0);
    let templates = [
        template("one", &pick(&first), normal(0.4, 1.3 / inflation.sqrt())),
        template("other", &pick(&second), AmplitudePrior::Flat),
    ];
    let alone = alone.with_templates(&templates).unwrap();
    let wanted = alone.chi_squared(pick(&prediction).as_slice(), &mut scratch);
    let found = marginal.subset_chi_squared(prediction.as_slice(), &some).unwrap();
    assert!((found - wanted).abs() < 1e-11 * wanted, "{found} {wanted}");
    // Rows that the template does not touch.
    let mut touched = second.clone();
    touched[2] = 0.0;
    let local = survey.clone().with_templates(&[template("local", &touched, AmplitudePrior::Flat)]).unwrap();
    let single = local.subset_chi_squared(prediction.as_slice(), &[2]).unwrap();
    assert_eq!(single, survey.subset_chi_squared(prediction.as_slice(), &[2]).unwrap());
}

/// Bins without correlation fall apart in the compressed form unless a template ties them.
#[test]
fn a_template_ties_independent_rows() {
    let data = DVector::from_vec(vec![1.0, 2.0, -1.0, 0.5]);
    let survey = SurveyLikelihood::new(data, DMatrix::identity(4, 4), &NoiseChoice::gaussian()).unwrap();
    let kernels = DMatrix::from_row_slice(4, 2, &[1.0, 0.0, 1.0, 0.0, 0.0, 1.0, 0.0, 1.0]);
    for prior in [AmplitudePrior::Flat, normal(0.1, 3.0)] {
        let shape = DVector::from_vec(vec![1.0, 0.2, 2.0, 0.0]);
        let marginal = survey.clone().with_templates(&[template("tie", &shape, prior)]).unwrap();
        let compressed = CompressedLikelihood::new(&marginal, &kernels).unwrap();
        let coefficients = [0.4, -0.9];
        let predicted = &kernels * DVector::from_column_slice(&coefficients);
        let plain = marginal.chi_squared(predicted.as_slice(), &mut Vec::new());
        assert!((compressed.chi_squared(&coefficients) - plain).abs() < 1e-13);
    }
}

/// Mean and covariance of 20 000 draws: entries within 4.5 Monte Carlo errors.
#[test]
fn amplitudes_are_drawn_from_their_distribution() {
    let Problem { survey, prediction, shapes: [first, second] } = problem("gaussian");
    let templates =
        [template("one", &first, normal(0.4, 1.3)), template("other", &second, AmplitudePrior::Flat)];
    let amplitudes = survey.with_templates(&templates).unwrap().amplitudes(prediction.as_slice());
    let mut random = generator(23);
    let draws = 20_000;
    let mut sample = DMatrix::zeros(draws, 2);
    for mut row in sample.row_iter_mut() {
        row.copy_from(&amplitudes.draw(normal_vector(2, &mut random).as_slice()).transpose());
    }
    let error = |variance: f64| (variance / draws as f64).sqrt();
    for i in 0..2 {
        let variance = amplitudes.covariance[(i, i)];
        assert!((sample.column(i).mean() - amplitudes.mean[i]).abs() < 4.5 * error(variance));
    }
    let centred = DMatrix::from_fn(draws, 2, |i, j| sample[(i, j)] - amplitudes.mean[j]);
    let spread = centred.tr_mul(&centred) / draws as f64;
    for (i, j) in [(0, 0), (0, 1), (1, 1)] {
        let (a, b, c) =
            (amplitudes.covariance[(i, i)], amplitudes.covariance[(j, j)], amplitudes.covariance[(i, j)]);
        assert!((spread[(i, j)] - c).abs() < 4.5 * error(a * b + c * c));
    }
}

#[test]
fn other_data_and_other_noise() {
    let Problem { survey, prediction, shapes: [first, second] } = problem("gaussian");
    let templates =
        [template("one", &first, normal(0.4, 1.3)), template("other", &second, AmplitudePrior::Flat)];
    let marginal = survey.clone().with_templates(&templates).unwrap();
    let mut scratch = Vec::new();
    let moved = survey.clone().with_data(prediction.clone());
    let wanted = moved.with_templates(&templates).unwrap();
    let found = marginal.clone().with_data(prediction.clone());
    let log_likelihood = |survey: &SurveyLikelihood| survey.log_likelihood(first.as_slice(), &mut Vec::new());
    assert_eq!(log_likelihood(&found), log_likelihood(&wanted));
    assert_eq!(found.amplitudes(first.as_slice()), wanted.amplitudes(first.as_slice()));
    // Residuals about the prior mean: the data less the prediction and the mean template.
    let at_mean = survey.data() - &first * 0.4;
    assert!(marginal.chi_squared(at_mean.as_slice(), &mut scratch) < 1e-20);
    let hartlap = NoiseChoice::new("hartlap", Some(40)).unwrap();
    let found = marginal.clone().with_noise(&hartlap).unwrap();
    let wanted = survey.clone().with_noise(&hartlap).unwrap().with_templates(&templates).unwrap();
    assert_eq!(log_likelihood(&found), log_likelihood(&wanted));
    assert_eq!(found.templates().len(), 2);
    for name in ["t", "percival"] {
        let choice = NoiseChoice::new(name, Some(40)).unwrap().with_determined(2);
        let message = format!(
            "noise `{name}` is not normal, so that the amplitudes of templates cannot be integrated out exactly; choose \
             noise \"gaussian\" or \"hartlap\", or infer the amplitudes as parameters"
        );
        assert_eq!(marginal.clone().with_noise(&choice).unwrap_err().to_string(), message);
        let refused = survey.clone().with_noise(&choice).unwrap().with_templates(&templates);
        assert_eq!(refused.unwrap_err().to_string(), message);
    }
    assert_eq!(survey.clone().with_templates(&[]).unwrap().flat_templates(), 0);
    assert_eq!(survey.amplitudes(prediction.as_slice()).mean.len(), 0);
}

#[test]
fn templates_that_cannot_be() {
    let Problem { survey, shapes: [first, second], .. } = problem("gaussian");
    let message = |templates: &[Template]| survey.clone().with_templates(templates).unwrap_err().to_string();
    let mut holed = first.clone();
    holed[3] = f64::NAN;
    for (template, text) in [
        (
            template("ramp", &DVector::zeros(3), normal(0.0, 1.0)),
            "template `ramp` must have a number for each of the 7 measured rows, found 3; give it for the rows that are \
             kept",
        ),
        (
            template("ramp", &holed, normal(0.0, 1.0)),
            "template `ramp`: each entry must be a finite number, found NaN",
        ),
        (
            template("ramp", &first, normal(f64::INFINITY, 1.0)),
            "template `ramp`: the mean of the amplitude must be a finite number, found inf",
        ),
        (
            template("ramp", &first, normal(0.0, 0.0)),
            "template `ramp`: the standard deviation of the amplitude must be above 0, found 0; add a held template to \
             the model instead",
        ),
        (
            template("ramp", &(&first * 0.0), AmplitudePrior::Flat),
            "template `ramp` is zero, or a combination of the other templates, in the rows that are kept; give its \
             amplitude a normal prior, or leave it out",
        ),
    ] {
        assert_eq!(message(&[template]), text);
    }
    let flat = AmplitudePrior::Flat;
    let dependent = [
        template("a", &first, flat),
        template("b", &second, flat),
        template("c", &(&first * 2.0 - &second * 0.3), flat),
    ];
    assert_eq!(
        message(&dependent),
        "template `c` is zero, or a combination of the other templates, in the rows that are kept; give its amplitude a \
         normal prior, or leave it out"
    );
    // A normal prior makes it well posed.
    let mut mended = dependent;
    mended[2].prior = normal(0.0, 1.0);
    survey.clone().with_templates(&mended).unwrap();
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/reference/arrays");
    assert_eq!(read_template(folder.join("list.npy"), 3).unwrap(), DVector::from_vec(vec![0.5, -1.0, 2.0]));
    let path = folder.join("mocks.npy");
    assert_eq!(
        read_template(&path, 4).unwrap_err().to_string(),
        format!(
            "{}: must have one number for each of the 4 measured rows, found 4 × 3; give it for all rows of the table, in \
             its order",
            path.display()
        )
    );
}
