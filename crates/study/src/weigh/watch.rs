//! What a caller can see of a weighing while it runs, and how it stops one.

use crate::resolve::Study;
use oddwell_evidence::Watch;
use std::sync::atomic::{AtomicUsize, Ordering};

/// One watch a hypothesis.
#[derive(Debug)]
pub struct WeighWatch {
    /// In the order of the study.
    pub hypotheses: Vec<HypothesisWatch>,
}

/// What a hypothesis has cost, and how much of its work is done.
#[derive(Debug)]
pub struct HypothesisWatch {
    /// The hypothesis.
    pub name: String,
    /// Counts evaluations and passes the end on.
    pub watch: Watch,
    done: AtomicUsize,
    parts: usize,
}

impl WeighWatch {
    /// For the hypotheses of a study.
    pub fn new(study: &Study) -> Self {
        let watch_of = |name: &String| HypothesisWatch {
            name: name.clone(),
            watch: Watch::new(),
            done: AtomicUsize::new(0),
            parts: super::pieces::PARTS,
        };
        Self { hypotheses: study.hypotheses.iter().map(|hypothesis| watch_of(&hypothesis.name)).collect() }
    }

    /// Ends the weighing as soon as may be; what is finished stays.
    pub fn stop(&self) {
        self.hypotheses.iter().for_each(|hypothesis| hypothesis.watch.stop());
    }
}

impl HypothesisWatch {
    /// Parts done, and parts in all.
    pub fn parts(&self) -> (usize, usize) {
        (self.done.load(Ordering::Relaxed), self.parts)
    }

    pub(super) fn one_more(&self) {
        self.done.fetch_add(1, Ordering::Relaxed);
    }
}
