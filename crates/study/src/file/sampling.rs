//! `[sampling]`: when to stop, and from which seed.

use super::section::Section;
use super::source::Located;

/// `[sampling]`, all of it optional.
#[derive(Clone, Debug, PartialEq)]
pub struct SamplingSection {
    /// Stop once the departure has this many effective samples and every parameter passes; default 4000.
    pub effective_samples: Located<u64>,
    /// Seed of every random stream; default 1.
    pub seed: Located<u64>,
    /// Independent ensembles; default 4.
    pub ensembles: Located<u64>,
    /// Walkers of each ensemble; none: chosen from the number of parameters.
    pub walkers: Option<Located<u64>>,
    /// Stop after this many evaluations whether converged or not; none: no limit.
    pub maximum_evaluations: Option<Located<u64>>,
}

/// What holds without a line in `[sampling]`.
const EFFECTIVE_SAMPLES: u64 = 4000;
const SEED: u64 = 1;
const ENSEMBLES: u64 = 4;

impl SamplingSection {
    /// Everything as it is without the section.
    pub(super) fn defaults() -> Self {
        Self {
            effective_samples: Located::default_of(EFFECTIVE_SAMPLES),
            seed: Located::default_of(SEED),
            ensembles: Located::default_of(ENSEMBLES),
            walkers: None,
            maximum_evaluations: None,
        }
    }

    pub(super) fn read(section: Section<'_>) -> Option<Self> {
        let or = |key: &str, default: u64, range, rule, example| match section.find(key) {
            Some(_) => section.count(key, range, rule, example),
            None => Some(Located::default_of(default)),
        };
        let effective_samples =
            or("effective_samples", EFFECTIVE_SAMPLES, (1, 1_000_000_000), "from 1 to 1000000000", "4000");
        let seed = or("seed", SEED, (0, i64::MAX as u64), "0 or above", "1");
        let ensembles = or("ensembles", ENSEMBLES, (2, 64), "from 2 (convergence compares them) to 64", "4");
        let walkers = section.count("walkers", (4, 100_000), "from 4 to 100000", "64");
        let maximum_evaluations =
            section.count("maximum_evaluations", (1, i64::MAX as u64), "at least 1", "1000000");
        section.finish();
        Some(Self {
            effective_samples: effective_samples?,
            seed: seed?,
            ensembles: ensembles?,
            walkers,
            maximum_evaluations,
        })
    }
}
