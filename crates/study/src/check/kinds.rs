//! The kinds of warnings that the verdicts make, with how often each arises where nothing is wrong.

use super::ALARM;

/// How often a kind of warning arises in sound studies.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Rate {
    /// As often as the threshold says: its p-value is uniform (shared out over the places looked at, so at most that).
    Threshold,
    /// More rarely: its p-value is a bound.
    Below,
    /// Never: it looks at what is given, not at noise.
    Never,
}

/// One kind of warning.
#[derive(Clone, Copy, Debug)]
pub struct Kind {
    /// Its code.
    pub code: &'static str,
    /// How often it arises in sound studies.
    pub rate: Rate,
    /// What it looks at, and where it draws the line.
    pub meaning: &'static str,
}

const fn kind(code: &'static str, rate: Rate, meaning: &'static str) -> Kind {
    Kind { code, rate, meaning }
}

/// Every kind of warning that a verdict can make, in the order of the report.
pub const KINDS: &[Kind] = &[
    kind(
        "covariance-scale",
        Rate::Threshold,
        "the covariance is in other units: the factor that the residuals ask for has p below the threshold, shared out over \
         surveys",
    ),
    kind("few-mocks", Rate::Never, "so few mocks that errors grow by more than 1.2 times"),
    kind(
        "poor-fit",
        Rate::Threshold,
        "χ² about general relativity at the centre of the priors, their spread allowed for, has p below the threshold, shared \
         out over all, surveys, bins and multipoles",
    ),
    kind("not-normal", Rate::Threshold, "whitened residuals have an Anderson–Darling p below the threshold"),
    kind(
        "orientation",
        Rate::Below,
        "the odd multipoles fit better with the tracers swapped, by more than −2 ln of the threshold in −2 ln L",
    ),
    kind(
        "leakage",
        Rate::Threshold,
        "the share of the predicted monopole or quadrupole in an odd multipole differs from 0 with a two-sided p below the \
         threshold, shared out over all of them",
    ),
    kind(
        "parity",
        Rate::Threshold,
        "correlations between odd and even multipoles differ from those of Gaussian fields for the survey's design: from mocks, \
         p below the threshold, shared out over bins; of a covariance that was not estimated, by more than 0.2",
    ),
    kind(
        "scale-factor",
        Rate::Below,
        "a bin, or all bins of a survey, would fit better at the redshift 1/z − 1, by more than −2 ln of the threshold, shared \
         out over them, in −2 ln L",
    ),
    kind(
        "row-order",
        Rate::Below,
        "the rows of a bin would fit better in another order, by so much that no order of as many would by chance, at the \
         threshold shared out over bins",
    ),
    kind(
        "duplicated-survey",
        Rate::Below,
        "two surveys' numbers are closer to each other than independent noise leaves them, at the threshold shared out over \
         pairs of surveys",
    ),
    kind(
        "wide-bin",
        Rate::Never,
        "the average of the dipole over a bin's redshift edges differs from its value at the mean by more than 2 %",
    ),
    kind(
        "large-evolution",
        Rate::Never,
        "an evolution bias beyond ±5, as the slopes that catalogues show have it",
    ),
];

/// What the thresholds are, in words.
#[must_use]
pub fn thresholds() -> String {
    format!(
        "Each kind of warning has a threshold of {ALARM} on its p-value: of a thousand sound studies one gets such a warning, or \
         fewer where p is a bound. Where a kind looks at several places, the threshold is shared out over them."
    )
}
