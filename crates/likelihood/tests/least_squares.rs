//! Linear least squares through the likelihood, against certified values of NIST's Statistical Reference Datasets.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

mod common;

use common::lines;
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{CompressedLikelihood, NoiseChoice, SurveyLikelihood};

/// Decimal digits that agree: −log10 of the relative error, as NIST's StRD counts them; 15 for equality.
fn digits(found: f64, certified: f64) -> f64 {
    (-((found - certified) / certified).abs().log10()).min(15.0)
}

/// Fewest digits that agree over coefficients, standard deviations and the residual's, each.
fn fit(dataset: &str, table: &str, unit: f64) -> [f64; 3] {
    let rows: Vec<Vec<f64>> =
        lines(table).map(|line| line.iter().map(|field| field.parse().unwrap()).collect()).collect();
    let (count, coefficients) = (rows.len(), rows[0].len());
    let design = DMatrix::from_fn(count, coefficients, |i, j| if j == 0 { 1.0 } else { rows[i][j] });
    let data = DVector::from_fn(count, |i, _| rows[i][0]);
    // Least squares weighs every row alike; any common variance gives the same fit.
    let covariance = DMatrix::identity(count, count) * unit.powi(2);
    let survey = SurveyLikelihood::new(data, covariance, &NoiseChoice::gaussian()).unwrap();
    let compressed = CompressedLikelihood::new(&survey, &design).unwrap();
    assert_eq!(compressed.rank(), coefficients, "{dataset} is ill-conditioned, not rank-deficient");
    let solution = compressed.least_squares().unwrap();
    // Variance per unit of the assumed one, from the χ² that is left.
    let variance = compressed.smallest_chi_squared() / (count - coefficients) as f64;
    let mut agreement = [15.0_f64; 3];
    let mut compared = 0;
    for line in lines(include_str!("reference/strd/certified.csv")).filter(|line| line[0] == dataset) {
        let estimate: f64 = line[2].parse().unwrap();
        match line[1].parse::<usize>() {
            Ok(j) => {
                let deviation = (solution.covariance[(j, j)] * variance).sqrt();
                agreement[0] = agreement[0].min(digits(solution.coefficients[j], estimate));
                agreement[1] = agreement[1].min(digits(deviation, line[3].parse().unwrap()));
            }
            Err(_) => agreement[2] = agreement[2].min(digits(unit * variance.sqrt(), estimate)),
        }
        compared += 1;
    }
    assert_eq!(compared, coefficients + 1);
    agreement
}

/// The columns' condition number is 3, scaled to unit length; the intercept is a small difference of numbers a thousand
/// times as large, which costs three of sixteen digits.
#[test]
fn norris() {
    for unit in [1.0, 0.03] {
        let agreement = fit("norris", include_str!("reference/strd/norris.csv"), unit);
        assert!(agreement[0] > 12.4 && agreement[1] > 13.4 && agreement[2] > 13.4, "{agreement:?}");
    }
}

/// The columns' condition number is 4·10⁴ scaled to unit length (5·10⁹ as they stand): an orthogonal factorisation loses
/// up to as much of sixteen digits, so five, normal equations nine, and all of them with the columns as they stand.
#[test]
fn longley() {
    for unit in [1.0, 250.0] {
        let agreement = fit("longley", include_str!("reference/strd/longley.csv"), unit);
        assert!(agreement[0] > 10.8 && agreement[1] > 11.4 && agreement[2] > 11.4, "{agreement:?}");
    }
}
