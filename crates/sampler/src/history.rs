//! What is remembered of a run: every step at first, every second, fourth, … once memory runs short.

use crate::diagnostics::Shape;
use crate::ensemble::{Ensemble, Fatal};
use crate::moves::Random;
use crate::target::{EvaluationFailure, Target};
use rand::SeedableRng;
use rayon::prelude::*;
use serde::{Deserialize, Serialize};

/// The remembered steps of all ensembles.
///
/// Kept are the steps after `dropped` that `thinning` divides. When the draws exceed the limit, `thinning` doubles and
/// half of them go: so memory is bounded, and what is kept depends on nothing but the number of steps.
#[derive(Debug, Clone, Serialize, Deserialize)]
pub(crate) struct History {
    dimension: usize,
    /// Numbers of a completed draw, where quantities were integrated out.
    completed_dimension: Option<usize>,
    walkers: usize,
    maximum_draws: usize,
    pub(crate) thinning: u64,
    pub(crate) kept_steps: Vec<u64>,
    pub(crate) records: Vec<Record>,
}

/// The remembered steps of one ensemble, step after step, walker after walker.
#[derive(Debug, Clone, Default, Serialize, Deserialize)]
pub(crate) struct Record {
    pub(crate) points: Vec<f64>,
    pub(crate) log_prior: Vec<f64>,
    pub(crate) log_likelihood: Vec<f64>,
    /// The first steps' draws with the quantities that were integrated out drawn back.
    pub(crate) completed: Completed,
}

/// Completed draws, row by row.
#[derive(Debug, Clone, Default, Serialize, Deserialize)]
pub(crate) struct Completed {
    pub(crate) points: Vec<f64>,
    pub(crate) log_prior: Vec<f64>,
    pub(crate) log_likelihood: Vec<f64>,
}

impl Record {
    /// Appends the walkers as they stand.
    pub(crate) fn push(&mut self, ensemble: &Ensemble) {
        self.points.extend_from_slice(&ensemble.points);
        self.log_prior.extend_from_slice(&ensemble.log_prior);
        self.log_likelihood.extend_from_slice(&ensemble.log_likelihood);
    }

    /// Keeps the steps whose index `keep` accepts; a step is `walkers` rows of `dimension` coordinates.
    fn retain(
        &mut self,
        steps: usize,
        walkers: usize,
        (dimension, completed_dimension): (usize, usize),
        keep: impl Fn(usize) -> bool,
    ) {
        retain_blocks(&mut self.points, steps, walkers * dimension, &keep);
        retain_blocks(&mut self.log_prior, steps, walkers, &keep);
        retain_blocks(&mut self.log_likelihood, steps, walkers, &keep);
        let completed = &mut self.completed;
        let steps = completed.log_prior.len() / walkers;
        retain_blocks(&mut completed.points, steps, walkers * completed_dimension, &keep);
        retain_blocks(&mut completed.log_prior, steps, walkers, &keep);
        retain_blocks(&mut completed.log_likelihood, steps, walkers, &keep);
    }

    /// Completes the steps that are not yet. A draw depends on the point, seed, ensemble, walker and step alone.
    fn complete<T: Target>(
        &mut self,
        target: &T,
        kept_steps: &[u64],
        (walkers, dimension, completed_dimension): (usize, usize, usize),
        (seed, ensemble): (u64, usize),
        scratch: &mut T::Scratch,
    ) -> Result<(), Fatal> {
        let completed = &mut self.completed;
        let done = completed.log_prior.len();
        completed.points.resize(self.log_prior.len() * completed_dimension, 0.0);
        let points = self.points.chunks_exact(dimension).skip(done);
        let draws = completed.points.chunks_exact_mut(completed_dimension).skip(done);
        for (row, (point, draw)) in (done..).zip(points.zip(draws)) {
            let mut random = stream_of_draw(seed, ensemble, row % walkers, kept_steps[row / walkers]);
            let (log_prior, log_likelihood) =
                target.complete(point, &mut random, scratch, draw).map_err(|failure| match failure {
                    EvaluationFailure::Rejected { reason } | EvaluationFailure::Fatal { reason } => {
                        Fatal { reason, point: point.to_vec() }
                    }
                })?;
            completed.log_prior.push(log_prior);
            completed.log_likelihood.push(log_likelihood);
        }
        Ok(())
    }
}

/// The random stream of one draw: so it does not matter when, nor whether others, are completed.
pub(crate) fn stream_of_draw(seed: u64, ensemble: usize, walker: usize, step: u64) -> Random {
    // Steele, Lea & Flood 2014 (OOPSLA): each stage is a bijection that spreads every bit.
    let mix = |state: u64| {
        let state = (state ^ (state >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        let state = (state ^ (state >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        state ^ (state >> 31)
    };
    let parts = [seed, ensemble as u64, walker as u64, step];
    let key = parts.iter().fold(0x9e37_79b9_7f4a_7c15, |key: u64, part| {
        mix(key.wrapping_add(*part).wrapping_add(0x9e37_79b9_7f4a_7c15))
    });
    Random::seed_from_u64(key)
}

fn retain_blocks(values: &mut Vec<f64>, blocks: usize, size: usize, keep: &impl Fn(usize) -> bool) {
    let mut filled = 0;
    for block in 0..blocks {
        if keep(block) {
            values.copy_within(block * size..(block + 1) * size, filled * size);
            filled += 1;
        }
    }
    values.truncate(filled * size);
}

impl History {
    /// An empty history.
    pub(crate) fn new(
        ensembles: usize,
        walkers: usize,
        (dimension, completed_dimension): (usize, Option<usize>),
        maximum_draws: usize,
    ) -> Self {
        Self {
            dimension,
            completed_dimension,
            walkers,
            maximum_draws,
            thinning: 1,
            kept_steps: vec![],
            records: vec![Record::default(); ensembles],
        }
    }

    /// Numbers a row: of a point, and of a completed draw.
    fn sizes(&self) -> (usize, usize) {
        (self.dimension, self.completed_dimension.unwrap_or(0))
    }

    /// Completes every draw that is not yet, where quantities were integrated out.
    pub(crate) fn complete<T: Target>(
        &mut self,
        target: &T,
        seed: u64,
        scratches: &mut [T::Scratch],
    ) -> Result<(), Fatal> {
        let Some(completed_dimension) = self.completed_dimension else { return Ok(()) };
        let sizes = (self.walkers, self.dimension, completed_dimension);
        let kept_steps = &self.kept_steps;
        let results: Vec<Result<(), Fatal>> = self
            .records
            .par_iter_mut()
            .zip(scratches.par_iter_mut())
            .enumerate()
            .map(|(ensemble, (record, scratch))| {
                record.complete(target, kept_steps, sizes, (seed, ensemble), scratch)
            })
            .collect();
        results.into_iter().collect()
    }

    /// Number of remembered steps.
    pub(crate) fn steps(&self) -> usize {
        self.kept_steps.len()
    }

    /// How rows are laid out.
    pub(crate) fn shape(&self) -> Shape {
        Shape { ensembles: self.records.len(), walkers: self.walkers, steps: self.steps() }
    }

    /// Notes that the records have grown to step `to`, and thins them if they are too long.
    pub(crate) fn extend_to(&mut self, from: u64, to: u64) {
        self.kept_steps.extend((from + 1..=to).filter(|step| step.is_multiple_of(self.thinning)));
        while self.steps() * self.walkers * self.records.len() > self.maximum_draws && self.steps() > 8 {
            let sizes = self.sizes();
            self.thinning *= 2;
            let (kept, thinning) = (std::mem::take(&mut self.kept_steps), self.thinning);
            for record in &mut self.records {
                let keep = |index: usize| kept[index].is_multiple_of(thinning);
                record.retain(kept.len(), self.walkers, sizes, keep);
            }
            self.kept_steps = kept.into_iter().filter(|step| step.is_multiple_of(thinning)).collect();
        }
    }

    /// Forgets the first `count` remembered steps.
    pub(crate) fn drop_first(&mut self, count: usize) {
        let sizes = self.sizes();
        for record in &mut self.records {
            record.retain(self.kept_steps.len(), self.walkers, sizes, |index| index >= count);
        }
        self.kept_steps.drain(..count);
    }

    /// Points and log posteriors of all draws but those of the first `dropped` steps.
    pub(crate) fn draws(&self, dropped: usize) -> Draws<'_> {
        Draws {
            history: self,
            next: 0,
            from: dropped * self.walkers,
            each: (self.steps() - dropped) * self.walkers,
        }
    }

    /// Every parameter's values, and the log posterior's: of the points, or where all of them are completed, of these draws.
    pub(crate) fn columns(&self) -> Columns {
        let shape = self.shape();
        let completed = |record: &Record| record.completed.log_prior.len() == record.log_prior.len();
        let completed = self.completed_dimension.filter(|_| self.records.iter().all(completed));
        let dimension = completed.unwrap_or(self.dimension);
        let mut parameters: Vec<Vec<f64>> =
            (0..dimension).map(|_| Vec::with_capacity(shape.rows())).collect();
        for record in &self.records {
            let points = if completed.is_some() { &record.completed.points } else { &record.points };
            // Row by row in blocks that stay in the fastest cache, rather than column by column across all memory.
            for block in points.chunks(dimension * 64) {
                for (at, values) in parameters.iter_mut().enumerate() {
                    values.extend(block[at..].iter().step_by(dimension));
                }
            }
        }
        let heights =
            self.records.iter().flat_map(|record| record.log_prior.iter().zip(&record.log_likelihood));
        let log_posterior = heights.map(|(prior, likelihood)| prior + likelihood).collect();
        Columns { shape, parameters, log_posterior }
    }
}

/// Draws by parameter, each ordered by ensemble, step, walker.
#[derive(Debug, Clone)]
pub(crate) struct Columns {
    pub(crate) shape: Shape,
    pub(crate) parameters: Vec<Vec<f64>>,
    pub(crate) log_posterior: Vec<f64>,
}

/// Iterator over draws with their log posteriors.
#[derive(Debug, Clone)]
pub(crate) struct Draws<'a> {
    history: &'a History,
    next: usize,
    from: usize,
    each: usize,
}

impl<'a> Iterator for Draws<'a> {
    type Item = (&'a [f64], f64);

    fn next(&mut self) -> Option<Self::Item> {
        self.nth(0)
    }

    fn nth(&mut self, skipped: usize) -> Option<Self::Item> {
        self.next += skipped;
        if self.next >= self.each * self.history.records.len() {
            return None;
        }
        let record = &self.history.records[self.next / self.each];
        let row = self.from + self.next % self.each;
        self.next += 1;
        let dimension = self.history.dimension;
        let point = &record.points[row * dimension..(row + 1) * dimension];
        Some((point, record.log_prior[row] + record.log_likelihood[row]))
    }

    fn size_hint(&self) -> (usize, Option<usize>) {
        let left = (self.each * self.history.records.len()).saturating_sub(self.next);
        (left, Some(left))
    }
}

impl ExactSizeIterator for Draws<'_> {}
