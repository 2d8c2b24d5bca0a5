//! The densities that estimators draw from, between prior and posterior.

/// How high a point lies.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Height {
    pub(crate) log_prior: f64,
    pub(crate) log_likelihood: f64,
    /// A uniform number that orders points of equal likelihood (Skilling 2006, §5.4): a plateau then has an inside.
    pub(crate) label: f64,
}

impl Height {
    /// By likelihood, ties by label.
    pub(crate) fn order(&self, other: &Self) -> std::cmp::Ordering {
        self.log_likelihood.total_cmp(&other.log_likelihood).then(self.label.total_cmp(&other.label))
    }
}

/// A density on the way from prior to posterior.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Level {
    /// Prior × likelihood to a power in [0, 1].
    Tempered(f64),
    /// The prior where the likelihood lies above that of a point.
    Above(Height),
}

impl Level {
    /// Whether the likelihood only says yes or no, so that prior and proposal can be asked first.
    pub(crate) fn is_bound(self) -> bool {
        matches!(self, Level::Above(_))
    }

    /// Log density without its constant.
    pub(crate) fn log_density(self, height: &Height) -> f64 {
        match self {
            Level::Tempered(0.0) => height.log_prior,
            Level::Tempered(power) => height.log_prior + power * height.log_likelihood,
            Level::Above(bound) if height.order(&bound).is_gt() => height.log_prior,
            Level::Above(_) => f64::NEG_INFINITY,
        }
    }
}
