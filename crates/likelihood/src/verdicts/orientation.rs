//! Whether some rows would fit better with the opposite sign.

use super::comparison::{Comparison, VerdictError};

/// The expectation as given against the one with some rows of opposite sign.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Orientation {
    /// −2 ln L as given, constants left out that both share.
    pub as_given: f64,
    /// −2 ln L with the rows' sign turned.
    pub turned: f64,
    /// `turned` − `as_given`: below 0 where the data prefer the turned sign. For a known covariance and no free parameters
    /// a Δχ².
    pub difference: f64,
    /// A bound on the probability of a difference this far below 0 where the sign as given is right: min(1, e^(difference/2)).
    pub p_value: f64,
    /// What `difference` is expected to be where the sign as given is right (and minus which where it is wrong), covariance
    /// known and held: the squared distance of the two predictions in units of the noise. Near 0 the data cannot tell.
    pub expected: f64,
}

/// Compares the expectation with that in which the prediction, and what its parameters do to it, has the opposite sign in
/// the rows at `positions`: odd multipoles, when the two tracers are swapped.
///
/// The ratio of two probability densities of the data exceeds c with probability 1/c at most where the one below the line
/// is true, so p bounds the rate of false alarms, whatever the signal. It is cautious: for a signal-to-noise s of the rows,
/// swapped tracers give a difference of −4 s² ± 4 s.
///
/// # Errors
/// A covariance that is not definite.
pub fn orientation(comparison: &Comparison, positions: &[usize]) -> Result<Orientation, VerdictError> {
    let turned = comparison.clone().flipped(positions);
    let apart = comparison.prediction() - turned.prediction();
    let badness = |comparison: &Comparison| {
        let factored = comparison.factored()?;
        let chi_squared = factored.chi_squared(&comparison.residual());
        Ok::<_, VerdictError>((factored.badness(chi_squared) + factored.log_determinant(), factored))
    };
    let (as_given, factored) = badness(comparison)?;
    let (turned, _) = badness(&turned)?;
    let difference = turned - as_given;
    Ok(Orientation {
        as_given,
        turned,
        difference,
        p_value: (0.5 * difference).exp().min(1.0),
        expected: factored.chi_squared(&apart),
    })
}
