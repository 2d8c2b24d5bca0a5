//! Two surveys that are one.

use nalgebra::DVector;

use super::comparison::{Comparison, Expectation, VerdictError};
use crate::goodness::tails;
use crate::survey::SurveyLikelihood;

/// How much closer two surveys' numbers are than independent ones would be.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Duplicate {
    /// Rows compared.
    pub rows: usize,
    /// Rows whose numbers agree to one part in 10⁹, zeros aside.
    pub identical: usize,
    /// δᵀ(N₁ + N₂)⁻¹δ of the differences δ: about the number of rows or more for independent noise.
    pub chi_squared: f64,
    /// A bound on the probability of differences this small, were the noises independent.
    pub p_value: f64,
}

/// Compares rows of one survey with the same rows of another: `pairs` of positions in the first and the second, matched by
/// multipole, pair and place.
///
/// Independent noise makes differences of covariance N₁ + N₂; whatever the two surveys are expected to measure, at their own
/// redshifts and for their own tracers, can only make them larger (Anderson 1955, Proc. Am. Math. Soc. 6, 170), so the
/// probability of a smaller χ² than this is at most that of one with expectation zero. The expectations are not needed.
///
/// # Errors
/// A covariance that is not definite.
pub fn duplicate(
    first: &SurveyLikelihood,
    second: &SurveyLikelihood,
    pairs: &[(usize, usize)],
) -> Result<Duplicate, VerdictError> {
    let (left, right): (Vec<usize>, Vec<usize>) = pairs.iter().copied().unzip();
    let rows = pairs.len();
    let identical = pairs.iter().filter(|(a, b)| same(first.data()[*a], second.data()[*b])).count();
    if rows == 0 {
        return Ok(Duplicate { rows, identical, chi_squared: 0.0, p_value: 1.0 });
    }
    let nothing = |survey: &SurveyLikelihood| {
        Comparison::of_survey(survey, &Expectation::certain(DVector::zeros(survey.rows())))
    };
    let difference = nothing(first)?.select(&left).minus(nothing(second)?.select(&right));
    let factored = difference.factored()?;
    let chi_squared = factored.chi_squared(difference.data());
    let lower = tails(chi_squared, factored.degrees_of_freedom(), factored.noise_mocks)
        .map_or(1.0, |(lower, _)| lower);
    Ok(Duplicate { rows, identical, chi_squared, p_value: lower })
}

fn same(a: f64, b: f64) -> bool {
    a != 0.0 && (a - b).abs() <= 1e-9 * a.abs().max(b.abs())
}
