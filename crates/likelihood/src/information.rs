//! What a part of the data contributes, and what priors allow, in the normal approximation.

use nalgebra::{DMatrix, DVector};

/// (I + ΣF)⁻¹ Σ: the posterior covariance for data of Fisher information F (n × n) and a prior of covariance Σ (n × n).
///
/// Unlike (F + Σ⁻¹)⁻¹ it needs no inverse of Σ, so that parameters may be held (a zero row) or move together (a singular
/// Σ). `None` where I + ΣF is singular, which needs a negative eigenvalue in one of the two.
#[must_use]
pub fn posterior_covariance(fisher: &DMatrix<f64>, prior_covariance: &DMatrix<f64>) -> Option<DMatrix<f64>> {
    let size = fisher.nrows();
    let system = DMatrix::identity(size, size) + prior_covariance * fisher;
    let covariance = system.lu().solve(prior_covariance)?;
    // Symmetric up to rounding.
    Some((&covariance + covariance.transpose()) * 0.5)
}

/// The inverse of an information matrix (n × n, symmetric, without a negative eigenvalue), scaled to a unit diagonal first.
/// Directions without information (eigenvalues below n · 4e-15 of the scaled matrix) are left out: they have no part in a
/// trace with the information of the data.
#[must_use]
pub fn inverse_information(information: &DMatrix<f64>) -> DMatrix<f64> {
    let size = information.nrows();
    let scale = information.diagonal().map(|entry| if entry > 0.0 { entry.sqrt().recip() } else { 0.0 });
    let scaled = DMatrix::from_fn(size, size, |i, j| information[(i, j)] * scale[i] * scale[j]);
    let eigen = scaled.symmetric_eigen();
    let smallest = size as f64 * 4e-15;
    let inverse = eigen.eigenvalues.map(|value| if value > smallest { value.recip() } else { 0.0 });
    let middle = &eigen.eigenvectors * DMatrix::from_diagonal(&inverse) * eigen.eigenvectors.transpose();
    DMatrix::from_fn(size, size, |i, j| middle[(i, j)] * scale[i] * scale[j])
}

/// tr[F_part · covariance]: how many of the effective parameters a part of the data determines, for the Fisher
/// information of the part (n × n) and the posterior covariance of all data and priors (n × n). Parts that are
/// independent add up to the whole.
#[must_use]
pub fn share_of_effective_parameters(part: &DMatrix<f64>, covariance: &DMatrix<f64>) -> f64 {
    (part * covariance).trace()
}

/// 1/√(uᵀ Σ⁻¹ u): how far a prior of covariance Σ (n × n) lets all quantities move together along `direction` u (n): the
/// standard deviation of the amplitude of that one pattern. For n independent quantities of equal standard deviation σ and
/// u = 1 it is σ/√n; for one error shared by all it is σ. `None` where Σ is not definite: where a quantity of the
/// pattern is held, nothing may move, and where all move as one the caller knows the amplitude.
///
/// Directions in which Σ vanishes against its largest variance (below 1e-12) but u does too are left out.
#[must_use]
pub fn allowed_shift(prior_covariance: &DMatrix<f64>, direction: &DVector<f64>) -> Option<f64> {
    let eigen = prior_covariance.clone().symmetric_eigen();
    let largest = eigen.eigenvalues.max();
    if largest.is_nan() || largest <= 0.0 {
        return None;
    }
    let mut cost = 0.0;
    for (index, &variance) in eigen.eigenvalues.iter().enumerate() {
        let along = eigen.eigenvectors.column(index).dot(direction);
        if variance > 1e-12 * largest {
            cost += along * along / variance;
        } else if along.abs() > 1e-9 * direction.norm() {
            return None;
        }
    }
    Some(1.0 / cost.sqrt())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn posterior_covariance_is_the_inverse_of_the_sum_where_that_exists() {
        let fisher = DMatrix::from_row_slice(2, 2, &[4.0, 1.0, 1.0, 3.0]);
        let prior = DMatrix::from_row_slice(2, 2, &[0.5, 0.2, 0.2, 0.8]);
        let direct = (&fisher + prior.clone().try_inverse().unwrap()).try_inverse().unwrap();
        let covariance = posterior_covariance(&fisher, &prior).unwrap();
        assert!((covariance - direct).amax() < 1e-14);
    }

    #[test]
    fn a_shared_error_is_a_singular_prior() {
        // Two measurements of unit variance, each of its own offset; offsets of unit variance, one and the same.
        let fisher = DMatrix::identity(2, 2);
        let shared = DMatrix::from_element(2, 2, 1.0);
        let covariance = posterior_covariance(&fisher, &shared).unwrap();
        // The shared offset has prior variance 1 and data variance ½: posterior 1/3, in every entry.
        assert!((covariance - DMatrix::from_element(2, 2, 1.0 / 3.0)).amax() < 1e-14);
    }

    #[test]
    fn shares_add_up_to_the_effective_parameters() {
        let parts = [
            DMatrix::from_row_slice(2, 2, &[4.0, 1.0, 1.0, 3.0]),
            DMatrix::from_row_slice(2, 2, &[1.0, -0.5, -0.5, 2.0]),
        ];
        let prior = DMatrix::from_diagonal(&DVector::from_vec(vec![2.0, 0.5]));
        let fisher = &parts[0] + &parts[1];
        let covariance = posterior_covariance(&fisher, &prior.clone().try_inverse().unwrap()).unwrap();
        let shares: f64 = parts.iter().map(|part| share_of_effective_parameters(part, &covariance)).sum();
        let whole = crate::effective_parameters(&fisher, &prior).unwrap();
        assert!((shares - whole).abs() < 1e-13, "{shares} {whole}");
    }

    #[test]
    fn what_priors_allow_of_a_common_shift() {
        let ones = DVector::from_element(4, 1.0);
        let independent = DMatrix::identity(4, 4) * 0.09;
        assert!((allowed_shift(&independent, &ones).unwrap() - 0.15).abs() < 1e-14);
        let shared = DMatrix::from_element(4, 4, 0.09);
        assert!((allowed_shift(&shared, &ones).unwrap() - 0.3).abs() < 1e-12);
        let mut held = independent;
        held[(2, 2)] = 0.0;
        assert_eq!(allowed_shift(&held, &ones), None);
        assert_eq!(allowed_shift(&DMatrix::zeros(4, 4), &ones), None);
    }
}
