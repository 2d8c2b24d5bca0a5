//! Where each quantity stands in the flat vector that a model reads.

use crate::departures::{Departure, Spread};
use crate::setup::BinSetup;
use std::collections::HashMap;

/// Slots of `[background]` and `[prediction]`, the same in every model.
pub(crate) mod slot {
    pub(crate) const OMEGA_M: usize = 0;
    pub(crate) const OMEGA_B: usize = 1;
    pub(crate) const H: usize = 2;
    pub(crate) const N_S: usize = 3;
    pub(crate) const SIGMA8: usize = 4;
    pub(crate) const OMEGA_K: usize = 5;
    pub(crate) const W0: usize = 6;
    pub(crate) const WA: usize = 7;
    pub(crate) const DAMPING: usize = 8;
    pub(crate) const GROWTH_INDEX: usize = 9;
    pub(crate) const SMEARING: usize = 10;
    pub(crate) const COMMON: [&str; 11] = [
        "background.omega_m",
        "background.omega_b",
        "background.h",
        "background.n_s",
        "background.sigma8",
        "background.omega_k",
        "background.w0",
        "background.wa",
        "prediction.damping",
        "prediction.growth_index",
        "prediction.smearing",
    ];

    // Relative to the first slot of a bin.
    pub(crate) const OFFSET: usize = 0;
    pub(crate) const GROWTH_RATE: usize = 1;
    pub(crate) const GROWTH_SLOPE: usize = 2;
    pub(crate) const FIRST: usize = 3;
    pub(crate) const SECOND: usize = 7;
    pub(crate) const BIN: [&str; 11] = [
        "offset",
        "growth_rate",
        "growth_slope",
        "first.bias",
        "first.magnification",
        "first.evolution",
        "first.bias_slope",
        "second.bias",
        "second.magnification",
        "second.evolution",
        "second.bias_slope",
    ];
}

/// The names of all quantities of a model, by slot.
///
/// | slots | names |
/// |---|---|
/// | 0–10 | `background.*` (8), `prediction.damping`, `prediction.growth_index`, `prediction.smearing` |
/// | 11 a bin | `SURVEY.BIN.offset`, `.growth_rate`, `.growth_slope`, then bias, magnification, evolution (or observed_density_slope) and bias_slope of `first` and of `second` |
/// | the rest | `departure.*`; with `.SURVEY.BIN` or `.SURVEY` behind the parameter's name where each has its own |
#[derive(Clone, Debug)]
pub struct Layout {
    names: Vec<String>,
    by_name: HashMap<String, usize>,
    departure_of_bin: Vec<usize>,
    /// Whether a bin is remapped: then the background's distances enter the kernels.
    remapped: bool,
}

impl Layout {
    pub(crate) fn new(bins: &[BinSetup], departure: &dyn Departure) -> Layout {
        let mut names: Vec<String> = slot::COMMON.iter().map(ToString::to_string).collect();
        for bin in bins {
            let renamed = |quantity: &str| match quantity {
                "first.evolution" if bin.observed_slopes[0] => "first.observed_density_slope".to_owned(),
                "second.evolution" if bin.observed_slopes[1] => "second.observed_density_slope".to_owned(),
                other => other.to_owned(),
            };
            names.extend(slot::BIN.iter().map(|quantity| format!("{}.{}", bin.path(), renamed(quantity))));
        }
        let mut departure_of_bin = Vec::with_capacity(bins.len());
        let mut groups: Vec<(String, usize)> = Vec::new();
        for bin in bins {
            let suffix = match departure.spread() {
                Spread::Shared => String::new(),
                Spread::PerSurvey => format!(".{}", bin.survey),
                Spread::PerBin => format!(".{}", bin.path()),
            };
            let start = match groups.iter().find(|(known, _)| *known == suffix) {
                Some((_, start)) => *start,
                None => {
                    let start = names.len();
                    let parameters = departure.parameters().iter();
                    names.extend(parameters.map(|parameter| format!("departure.{}{suffix}", parameter.name)));
                    groups.push((suffix, start));
                    start
                }
            };
            departure_of_bin.push(start);
        }
        let by_name = names.iter().cloned().enumerate().map(|(index, name)| (name, index)).collect();
        let remapped = bins.iter().any(|bin| bin.fiducial.is_some());
        Layout { names, by_name, departure_of_bin, remapped }
    }

    /// How many slots there are.
    #[must_use]
    pub fn len(&self) -> usize {
        self.names.len()
    }

    /// Whether there is no slot (never).
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.names.is_empty()
    }

    /// The dotted names, by slot.
    #[must_use]
    pub fn names(&self) -> &[String] {
        &self.names
    }

    /// The slot of a dotted name.
    #[must_use]
    pub fn index(&self, name: &str) -> Option<usize> {
        self.by_name.get(name).copied()
    }

    /// A zero for every slot, for the caller to fill.
    #[must_use]
    pub fn zeros(&self) -> Vec<f64> {
        vec![0.0; self.names.len()]
    }

    /// The slots of the departure, of all bins.
    #[must_use]
    pub fn departure_slots(&self) -> std::ops::Range<usize> {
        self.departure_of_bin.iter().copied().min().unwrap_or(self.names.len())..self.names.len()
    }

    /// Whether moving this quantity changes the k-shape of a kernel, so that fixed kernels can't serve. Curvature and
    /// dark energy do so only where a bin is remapped from a fiducial background.
    #[must_use]
    pub fn changes_kernels(&self, index: usize) -> bool {
        match index {
            slot::OMEGA_M | slot::OMEGA_B | slot::H | slot::N_S | slot::DAMPING | slot::SMEARING => true,
            slot::OMEGA_K | slot::W0 | slot::WA => self.remapped,
            _ => false,
        }
    }

    pub(crate) fn bin(&self, bin: usize) -> usize {
        slot::COMMON.len() + bin * slot::BIN.len()
    }

    pub(crate) fn departure(&self, bin: usize) -> usize {
        self.departure_of_bin[bin]
    }
}
