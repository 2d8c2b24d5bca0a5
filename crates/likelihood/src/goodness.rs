//! How surprising a χ² is.

use statrs::distribution::{ChiSquared, ContinuousCDF, FisherSnedecor};

/// The probability of a χ² at least this large.
///
/// With a known covariance, χ² of ν degrees of freedom. With one estimated from n_s mocks (divisor n_s − 1),
/// χ² (n_s − ν)/[ν (n_s − 1)] follows F(ν, n_s − ν): Hotelling 1931, Ann. Math. Stat. 2, 360. After a fit of p linear
/// parameters by least squares the remaining χ² is exactly that of n_d − p contrasts of the data, so ν = n_d − p in
/// both; where priors hold some of the parameters, ν is n_d less the effective number
/// ([`effective_parameters`](crate::effective_parameters)), and the distribution is approximate.
///
/// `None` where the question has no answer: ν ≤ 0, n_s ≤ ν, χ² negative or not finite.
pub fn chi_squared_p_value(
    chi_squared: f64,
    degrees_of_freedom: f64,
    mock_count: Option<usize>,
) -> Option<f64> {
    tails(chi_squared, degrees_of_freedom, mock_count.map(|mocks| mocks as f64)).map(|(_, upper)| upper)
}

/// The probabilities of a χ² at most and at least this large; the number of mocks need not be whole.
pub(crate) fn tails(chi_squared: f64, degrees_of_freedom: f64, mocks: Option<f64>) -> Option<(f64, f64)> {
    if !(chi_squared.is_finite() && chi_squared >= 0.0 && degrees_of_freedom > 0.0) {
        return None;
    }
    match mocks {
        None => {
            let distribution = ChiSquared::new(degrees_of_freedom).ok()?;
            Some((distribution.cdf(chi_squared), distribution.sf(chi_squared)))
        }
        Some(mocks) => {
            let spare = mocks - degrees_of_freedom;
            let ratio = chi_squared * spare / (degrees_of_freedom * (mocks - 1.0));
            let distribution = FisherSnedecor::new(degrees_of_freedom, spare).ok()?;
            Some((distribution.cdf(ratio), distribution.sf(ratio)))
        }
    }
}
