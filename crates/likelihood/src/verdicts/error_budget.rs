//! What each group of nuisance parameters costs.

use nalgebra::DMatrix;

use super::comparison::VerdictError;
use super::conditioning::conditioned;
use crate::information::posterior_covariance;

/// What a parameter's standard deviation would be with a group of others known.
#[derive(Clone, Debug, PartialEq)]
pub struct BudgetEntry {
    /// The standard deviation with the group held; at most that with nothing held.
    pub standard_deviation: f64,
    /// 1 − (this/that)²: the share of the variance that the group is to blame for. Shares need not add up to 1: groups
    /// that trade off against each other are to blame together.
    pub share: f64,
}

/// The expected standard deviation of `parameter`, and what it would be with each group of `groups` (positions of
/// parameters) known exactly: (I + ΣF)⁻¹Σ with Σ conditioned on the group, so that an error which others have in common with it is known too.
///
/// `fisher` is JᵀN⁻¹J of the data, `prior_covariance` Σ, both parameters × parameters. A group that holds `parameter`
/// itself gives 0.
///
/// # Errors
/// Matrices of different sizes or not finite.
pub fn error_budget(
    fisher: &DMatrix<f64>,
    prior_covariance: &DMatrix<f64>,
    parameter: usize,
    groups: &[Vec<usize>],
) -> Result<(f64, Vec<BudgetEntry>), VerdictError> {
    let size = fisher.nrows();
    for (what, of, found) in [
        ("the information", "columns", fisher.ncols()),
        ("the prior covariance", "rows", prior_covariance.nrows()),
        ("the prior covariance", "columns", prior_covariance.ncols()),
        ("the list of parameters", "entries", size.max(parameter + 1)),
    ] {
        if found != size {
            return Err(VerdictError::Shape { what, of, expected: size, found });
        }
    }
    let deviation = |held: &[usize]| {
        let prior = conditioned(prior_covariance, held);
        let variance =
            posterior_covariance(fisher, &prior).map(|covariance| covariance[(parameter, parameter)]);
        match variance {
            Some(variance) if variance.is_finite() => Ok(variance.max(0.0).sqrt()),
            other => {
                let value = other.unwrap_or(f64::NAN);
                Err(VerdictError::NotFinite { what: "information and prior covariance", value })
            }
        }
    };
    let whole = deviation(&[])?;
    let entry = |group: &Vec<usize>| {
        let standard_deviation = deviation(group)?;
        let share = if whole > 0.0 { 1.0 - (standard_deviation / whole).powi(2) } else { 0.0 };
        Ok(BudgetEntry { standard_deviation, share })
    };
    Ok((whole, groups.iter().map(entry).collect::<Result<_, VerdictError>>()?))
}
