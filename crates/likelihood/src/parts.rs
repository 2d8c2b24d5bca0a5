//! One amplitude estimated from several parts of the data, and whether the estimates agree.

use nalgebra::{Cholesky, DMatrix, DVector};

use crate::goodness::chi_squared_p_value;

/// Linear estimates of some amplitudes, everything else marginalised.
#[derive(Clone, Debug, PartialEq)]
pub struct PartEstimates {
    /// The estimates, from where the linearisation was made.
    pub values: DVector<f64>,
    /// Their covariance.
    pub covariance: DMatrix<f64>,
}

/// δ = A⁻¹ g and its covariance A⁻¹, of the first `amplitudes` of n quantities, for the information A (n × n: of the data, and
/// of the priors of what has one) and the gradient g (n) of the log posterior at the point of linearisation.
///
/// Exact for a prediction that is linear in all of them, noise that is normal and priors that are normal or flat.
/// Quantities without any information (a row of zeros) are left out. `None` where an amplitude has none, or where A is not
/// definite otherwise: the data then leave an amplitude open.
#[must_use]
pub fn part_estimates(
    information: &DMatrix<f64>,
    gradient: &DVector<f64>,
    amplitudes: usize,
) -> Option<PartEstimates> {
    let size = information.nrows();
    let used: Vec<usize> = (0..size).filter(|&index| information[(index, index)] > 0.0).collect();
    if used.len() < amplitudes || used.iter().take(amplitudes).enumerate().any(|(at, &of)| at != of) {
        return None;
    }
    // Of unit diagonal: quantities come in all units.
    let scale: Vec<f64> = used.iter().map(|&index| information[(index, index)].sqrt().recip()).collect();
    let count = used.len();
    let scaled = DMatrix::from_fn(count, count, |i, j| information[(used[i], used[j])] * scale[i] * scale[j]);
    let factor = Cholesky::new(scaled)?;
    // Directions that only rounding holds up: pivots of a unit diagonal at 10⁻¹².
    if factor.l_dirty().diagonal().iter().take(count).any(|pivot| pivot * pivot < 1e-12) {
        return None;
    }
    let inverse = factor.inverse();
    let solution = &inverse * DVector::from_fn(count, |i, _| gradient[used[i]] * scale[i]);
    Some(PartEstimates {
        values: DVector::from_fn(amplitudes, |i, _| solution[i] * scale[i]),
        covariance: DMatrix::from_fn(amplitudes, amplitudes, |i, j| inverse[(i, j)] * scale[i] * scale[j]),
    })
}

/// Whether several estimates of one number agree.
#[derive(Clone, Debug, PartialEq)]
pub struct Agreement {
    /// Their mean, weighted by the inverse of their covariance.
    pub mean: f64,
    /// Its standard deviation.
    pub standard_deviation: f64,
    /// χ² = (x − x̄)ᵀ V⁻¹ (x − x̄).
    pub chi_squared: f64,
    /// One less than there are estimates.
    pub degrees_of_freedom: usize,
    /// The probability of a χ² at least this large where they measure the same.
    pub p_value: Option<f64>,
}

/// χ² of estimates x (n ≥ 2) with covariance V about their weighted mean x̄ = 1ᵀV⁻¹x/1ᵀV⁻¹1: of n − 1 degrees of freedom where
/// all are estimates of one number. What the estimates have in common (shared nuisances) stands in V and does not count as
/// agreement. `None` for fewer than two, or a V that is not definite.
#[must_use]
pub fn agreement(values: &DVector<f64>, covariance: &DMatrix<f64>) -> Option<Agreement> {
    if values.len() < 2 {
        return None;
    }
    let factor = Cholesky::new(covariance.clone())?;
    let whiten = |vector: &DVector<f64>| factor.l().solve_lower_triangular(vector);
    let (ones, whitened) = (whiten(&DVector::from_element(values.len(), 1.0))?, whiten(values)?);
    let weight = ones.norm_squared();
    let mean = ones.dot(&whitened) / weight;
    let chi_squared = (whitened - ones * mean).norm_squared();
    let degrees_of_freedom = values.len() - 1;
    let p_value = chi_squared_p_value(chi_squared, degrees_of_freedom as f64, None);
    Some(Agreement {
        mean,
        standard_deviation: weight.sqrt().recip(),
        chi_squared,
        degrees_of_freedom,
        p_value,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Two parts that measure τ + n with unit variance, n a nuisance in common with a prior of variance σ².
    fn shared(sigma: f64, data: [f64; 2]) -> PartEstimates {
        let precision = sigma.powi(-2);
        let information =
            DMatrix::from_row_slice(3, 3, &[1.0, 0.0, 1.0, 0.0, 1.0, 1.0, 1.0, 1.0, 2.0 + precision]);
        let gradient = DVector::from_vec(vec![data[0], data[1], data[0] + data[1]]);
        part_estimates(&information, &gradient, 2).unwrap()
    }

    #[test]
    fn what_estimates_share_is_no_disagreement() {
        let found = shared(3.0, [4.0, 1.0]);
        // τ₁ = d₁ − n: variance 1 + σ², covariance σ².
        let expected = DMatrix::from_row_slice(2, 2, &[10.0, 9.0, 9.0, 10.0]);
        assert!((found.covariance - expected).amax() < 1e-12);
        assert!((found.values - DVector::from_vec(vec![4.0, 1.0])).amax() < 1e-12);
        // The difference of the two has variance 2 whatever n does: χ² = 3²/2.
        for sigma in [0.1, 3.0, 100.0] {
            let PartEstimates { values, covariance } = shared(sigma, [4.0, 1.0]);
            let found = agreement(&values, &covariance).unwrap();
            assert!((found.chi_squared / 4.5 - 1.0).abs() < 1e-9, "{sigma}: {found:?}");
            assert_eq!(found.degrees_of_freedom, 1);
            // SciPy 1.17.1: chi2.sf(4.5, 1).
            assert!((found.p_value.unwrap() / 0.033894853524689295 - 1.0).abs() < 1e-8);
            assert!((found.mean - 2.5).abs() < 1e-9);
            let sd = (0.5 + sigma * sigma).sqrt();
            assert!((found.standard_deviation / sd - 1.0).abs() < 1e-9);
        }
    }

    #[test]
    fn what_the_data_leave_open_is_not_estimated() {
        let open = DMatrix::from_row_slice(2, 2, &[1.0, 1.0, 1.0, 1.0]);
        let gradient = DVector::from_vec(vec![1.0, 1.0]);
        assert_eq!(part_estimates(&open, &gradient, 1), None);
        let none = DMatrix::from_row_slice(2, 2, &[0.0, 0.0, 0.0, 1.0]);
        assert_eq!(part_estimates(&none, &gradient, 1), None);
        // A nuisance that nothing is known of, and that matters to nothing.
        let idle = DMatrix::from_row_slice(2, 2, &[4.0, 0.0, 0.0, 0.0]);
        let found = part_estimates(&idle, &gradient, 1).unwrap();
        assert_eq!((found.values[0], found.covariance[(0, 0)]), (0.25, 0.25));
        assert_eq!(agreement(&DVector::from_vec(vec![1.0]), &DMatrix::identity(1, 1)), None);
    }
}
