//! What a hypothesis departs by, and which other it contains.

use crate::assemble::Posterior;
use crate::fit::general_relativity_points;

/// The amplitudes of a hypothesis's departure, and where it becomes general relativity.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Departure {
    /// Inferred amplitudes, by parameter.
    pub(super) amplitudes: Vec<usize>,
    /// Their values in general relativity.
    pub(super) values: Vec<f64>,
}

impl Departure {
    /// None of general relativity itself, of a departure that is held, and of one that becomes general relativity only in a
    /// limit.
    pub(super) fn of(posterior: &Posterior) -> Departure {
        let points = general_relativity_points(posterior);
        Departure {
            amplitudes: points.iter().map(|point| point.parameter).collect(),
            values: points.iter().map(|point| point.value).collect(),
        }
    }

    /// The same amplitudes as places among some of the parameters, all of which must be there.
    pub(super) fn among(&self, parameters: &[usize]) -> Departure {
        let place = |at: &usize| parameters.iter().position(|parameter| parameter == at);
        let amplitudes: Vec<usize> = self.amplitudes.iter().filter_map(place).collect();
        debug_assert_eq!(amplitudes.len(), self.amplitudes.len(), "amplitudes are never integrated out");
        Departure { amplitudes, values: self.values.clone() }
    }

    /// Whether general relativity is a point of it.
    pub(super) fn contains_general_relativity(&self) -> bool {
        !self.amplitudes.is_empty()
    }
}

/// The hypothesis that odds are against: the first without a departure, else the first.
pub(super) fn reference(posteriors: &[Posterior]) -> usize {
    posteriors.iter().position(is_general_relativity).unwrap_or(0)
}

/// Whether there is no departure.
pub(super) fn is_general_relativity(posterior: &Posterior) -> bool {
    posterior.hypothesis.shape.name() == "none"
}
