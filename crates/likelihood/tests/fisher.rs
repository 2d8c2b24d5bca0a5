//! Effective parameters and expected errors where priors are flat or the data are silent.

#![allow(clippy::unwrap_used, reason = "in a helper of a test as in a test")]

mod common;

use common::{assert_relative, generator, normal_matrix};
use nalgebra::{DMatrix, DVector};
use oddwell_likelihood::{FisherError, effective_parameters, expected_standard_deviations};
use proptest::prelude::*;

fn diagonal(entries: &[f64]) -> DMatrix<f64> {
    DMatrix::from_diagonal(&DVector::from_column_slice(entries))
}

#[test]
fn uncorrelated_parameters_by_hand() {
    // Flat prior: counts 1. As much from either: ½. Only the prior: 0. Neither: 0, with an infinite error.
    let fisher = diagonal(&[4.0, 1e-12, 0.0, 0.0]);
    let prior = diagonal(&[0.0, 1e-12, 25.0, 0.0]);
    assert_relative(effective_parameters(&fisher, &prior).unwrap(), 1.5, 1e-14, "effective parameters");
    let deviations = expected_standard_deviations(&fisher, &prior).unwrap();
    for (found, wanted) in deviations.iter().zip([0.5, 0.5e6 * 2.0_f64.sqrt(), 0.2]) {
        assert_relative(*found, wanted, 1e-14, "expected sd");
    }
    assert_eq!(deviations[3], f64::INFINITY);
}

#[test]
fn a_direction_that_nothing_informs() {
    // Data see only the sum of the first two parameters, in units a million apart; flat priors on both.
    let jacobian = DMatrix::from_row_slice(2, 3, &[1.0, 1e6, 0.0, 0.0, 0.0, 3.0]);
    let fisher = jacobian.tr_mul(&jacobian);
    let flat = DMatrix::zeros(3, 3);
    assert_relative(effective_parameters(&fisher, &flat).unwrap(), 2.0, 1e-12, "effective parameters");
    let deviations = expected_standard_deviations(&fisher, &flat).unwrap();
    assert_eq!(deviations[..2], [f64::INFINITY; 2]);
    assert_relative(deviations[2], 1.0 / 3.0, 1e-12, "expected sd");
    // A prior of sd 10⁻⁶ on the second pins the sum's other part: variances 1 + (10⁶·10⁻⁶)² and 10⁻¹².
    let prior = diagonal(&[0.0, 1e12, 0.0]);
    assert_relative(effective_parameters(&fisher, &prior).unwrap(), 2.0, 1e-12, "effective parameters");
    let deviations = expected_standard_deviations(&fisher, &prior).unwrap();
    for (found, wanted) in deviations.iter().zip([2.0_f64.sqrt(), 1e-6, 1.0 / 3.0]) {
        assert_relative(*found, wanted, 1e-12, "expected sd");
    }
    assert_eq!(effective_parameters(&flat, &flat).unwrap(), 0.0);
}

#[test]
fn information_that_is_none() {
    let one = diagonal(&[1.0, 1.0]);
    let message = |fisher: &DMatrix<f64>, prior: &DMatrix<f64>| {
        effective_parameters(fisher, prior).unwrap_err().to_string()
    };
    assert_eq!(
        message(&one, &diagonal(&[1.0])),
        "the data's information is 2 × 2 and the priors' 1 × 1; both need a row and a column for each parameter"
    );
    assert_eq!(
        message(&diagonal(&[1.0, f64::NAN]), &one),
        "the data's information about parameter 2 must be finite, found NaN"
    );
    assert_eq!(
        message(&one, &DMatrix::from_row_slice(2, 2, &[1.0, 2.0, 2.0, 1.0])),
        "the priors' information must have no negative eigenvalue, found -1.000e0 of the largest"
    );
    assert!(matches!(
        effective_parameters(&one, &diagonal(&[1.0, -1.0])),
        Err(FisherError::Negative { of: "priors'", .. })
    ));
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 200, ..ProptestConfig::default() })]

    /// Rescaling a parameter (km/s for m/s) changes its error and nothing else; with flat priors, the data determine
    /// as many as they see; stronger data determine more.
    #[test]
    fn units_do_not_matter(rows in 1usize..8, parameters in 1usize..8, with_prior in 0usize..8, seed: u64) {
        let mut random = generator(seed);
        let jacobian = normal_matrix(rows, parameters, &mut random);
        let root = normal_matrix(with_prior.min(parameters), parameters, &mut random);
        let units: Vec<f64> = normal_matrix(parameters, 1, &mut random).iter().map(|x| (4.0 * x).exp()).collect();
        let unit = diagonal(&units);
        let information = |jacobian: &DMatrix<f64>| jacobian.tr_mul(jacobian);
        let effective = |data: DMatrix<f64>, prior: DMatrix<f64>| {
            effective_parameters(&information(&data), &information(&prior)).unwrap()
        };
        let plain = effective(jacobian.clone(), root.clone());
        // Random directions of up to 8 × 8 entries: condition numbers reach 10⁴, their squares 10⁸.
        prop_assert!((effective(&jacobian * &unit, &root * &unit) - plain).abs() < 1e-6);
        prop_assert!(plain >= 0.0 && plain <= rows.min(parameters) as f64 + 1e-6);
        prop_assert!(effective(&jacobian * 2.0, root.clone()) >= plain - 1e-6);
        let flat = effective(jacobian.clone(), DMatrix::zeros(1, parameters));
        prop_assert!((flat - rows.min(parameters) as f64).abs() < 1e-6);
    }
}
