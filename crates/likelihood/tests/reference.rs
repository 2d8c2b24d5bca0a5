//! Against SciPy, NumPy and mpmath, frozen in `reference/` (its README says how).

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

mod common;

use common::{assert_relative, cases, lines, numbers};
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{
    NoiseChoice, SurveyLikelihood, chi_squared_p_value, effective_parameters, expected_standard_deviations,
};
use std::collections::BTreeMap;

/// χ² loses to rounding about the condition number of the correlations (up to 10⁴) times 2⁻⁵² times a modest power of
/// the size; ln det as much absolutely. The log-densities are sums of such, compared relative to 1 + their size;
/// SciPy's own, by eigenvalues, are no better.
const DENSITY: f64 = 1e-11;

#[test]
fn log_densities_are_those_of_scipy() {
    let cases = cases(include_str!("reference/densities.csv"));
    assert_eq!(cases.len(), 7);
    let mut compared = 0;
    for (name, case) in &cases {
        let size = case["data"].len();
        let mocks = case["mocks"][0] as usize;
        let survey = SurveyLikelihood::new(
            DVector::from_vec(case["data"].clone()),
            DMatrix::from_row_slice(size, size, &case["covariance"]),
            &NoiseChoice::gaussian(),
        )
        .unwrap();
        let mut scratch = Vec::new();
        let chi_squared = survey.chi_squared(&case["prediction"], &mut scratch);
        assert_relative(chi_squared, case["chi_squared"][0], DENSITY, &format!("{name}, χ²"));
        let log_determinant = case["log_determinant"][0];
        assert!((survey.log_determinant() - log_determinant).abs() < DENSITY * (1.0 + log_determinant.abs()));
        for model in ["gaussian", "hartlap", "t", "percival"] {
            let noise =
                NoiseChoice::new(model, Some(mocks)).unwrap().with_determined(case["determined"][0] as usize);
            let survey = survey.clone().with_noise(&noise).unwrap();
            let quantity = match survey.noise().is_normalised() {
                true => model.to_owned(),
                false => format!("{model}_without_constant"),
            };
            let (found, wanted) =
                (survey.log_likelihood(&case["prediction"], &mut scratch), case[&quantity][0]);
            assert!(
                (found - wanted).abs() < DENSITY * (1.0 + wanted.abs()),
                "{name}, {quantity}: found {found}, wanted {wanted}"
            );
            compared += 1;
        }
    }
    assert_eq!(compared, 28);
}

/// Incomplete gamma and beta functions to about 10⁻¹³ on both sides; the argument of the far tail (p of 10⁻¹⁵⁰) is
/// known to 2⁻⁵², which moves p by some hundred times that.
#[test]
fn p_values_are_those_of_scipy() {
    let mut compared = 0;
    for line in lines(include_str!("reference/p_values.csv")) {
        let number = |field: usize| line[field].parse::<f64>().unwrap();
        let mocks = (!line[2].is_empty()).then(|| number(2) as usize);
        let found = chi_squared_p_value(number(0), number(1), mocks).unwrap();
        assert_relative(found, number(3), 1e-10, &line.join(","));
        compared += 1;
    }
    assert_eq!(compared, 152);
}

#[test]
fn information_is_that_of_numpy() {
    let table: BTreeMap<String, Vec<f64>> = lines(include_str!("reference/fisher.csv"))
        .map(|line| (line[0].to_owned(), numbers(line[1])))
        .collect();
    let (rows, parameters) = (14, 5);
    let square = |name: &str, size: usize| DMatrix::from_row_slice(size, size, &table[name]);
    let jacobian = DMatrix::from_row_slice(rows, parameters, &table["jacobian"]);
    let survey =
        SurveyLikelihood::new(DVector::zeros(rows), square("covariance", rows), &NoiseChoice::gaussian())
            .unwrap();
    let information = survey.fisher_information(&jacobian);
    let wanted = square("information", parameters);
    // Condition number 50 of the covariance: both are good to 10⁻¹³ of the two parameters' own information.
    for (i, j) in (0..parameters).flat_map(|i| (0..parameters).map(move |j| (i, j))) {
        let scale = (wanted[(i, i)] * wanted[(j, j)]).sqrt();
        assert!((information[(i, j)] - wanted[(i, j)]).abs() < 1e-12 * scale, "entry {i}, {j}");
    }
    // The problem has modest condition numbers once scaled; the priors (rank 3 of 5) leave it well posed.
    let prior = square("prior", parameters);
    let effective = effective_parameters(&information, &prior).unwrap();
    assert_relative(effective, table["effective_parameters"][0], 1e-11, "effective parameters");
    let deviations = expected_standard_deviations(&information, &prior).unwrap();
    for (found, wanted) in deviations.iter().zip(&table["standard_deviations"]) {
        assert_relative(*found, *wanted, 1e-11, "expected sd");
    }
    let column = |j: usize| jacobian.column(j).iter().copied().collect::<Vec<f64>>();
    let projection = survey.projection(&column(0), &column(3));
    assert_relative(projection, table["projection"][0], 1e-11, "projection");
}
