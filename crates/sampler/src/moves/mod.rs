//! Moves of an ensemble's walkers: one file a move, a registry of them, and their mixture.
//!
//! A walker of one half of the ensemble proposes from the positions of the other half, which stands still meanwhile; so
//! every update leaves the target's density (the product over walkers) invariant (Goodman & Weare 2010, §2).
//!
//! To add a move: one file with one type that implements [`Move`], and one line in [`move_families`].

mod differential_evolution;
mod independence;
#[cfg(test)]
mod invariance;
mod quality;
mod snooker;
mod stretch;

pub use differential_evolution::DifferentialEvolution;
pub use independence::{Fit, Independence};
pub(crate) use quality::{Quality, quality};
pub use snooker::Snooker;
pub use stretch::Stretch;

use crate::error::SamplerError;
use rand::RngExt;
use rand_xoshiro::Xoshiro256PlusPlus;
use std::fmt::Debug;

/// The random stream of one walker.
pub type Random = Xoshiro256PlusPlus;

/// The half of an ensemble that stands still.
#[derive(Debug, Clone, Copy)]
pub struct Others<'a> {
    points: &'a [f64],
    dimension: usize,
    count: u32,
}

impl<'a> Others<'a> {
    /// Walkers whose coordinates follow each other in `points`, `dimension` a walker.
    pub fn new(points: &'a [f64], dimension: usize) -> Self {
        Self { points, dimension, count: (points.len() / dimension) as u32 }
    }

    /// Number of walkers.
    pub fn count(self) -> usize {
        self.count as usize
    }

    /// Position of one walker.
    pub fn point(self, walker: usize) -> &'a [f64] {
        &self.points[walker * self.dimension..(walker + 1) * self.dimension]
    }

    /// One walker at random.
    pub fn any(self, random: &mut Random) -> &'a [f64] {
        self.point(below(random, self.count) as usize)
    }

    /// Two different walkers at random, in random order; needs at least two.
    pub fn any_two(self, random: &mut Random) -> (&'a [f64], &'a [f64]) {
        let first = below(random, self.count);
        let second = (first + 1 + below(random, self.count - 1)) % self.count;
        (self.point(first as usize), self.point(second as usize))
    }

    /// Three different walkers at random, in random order; needs at least three.
    pub fn any_three(self, random: &mut Random) -> (&'a [f64], &'a [f64], &'a [f64]) {
        let first = below(random, self.count);
        let second = (first + 1 + below(random, self.count - 1)) % self.count;
        let (low, high) = if first < second { (first, second) } else { (second, first) };
        let mut third = below(random, self.count - 2);
        third += u32::from(third >= low);
        third += u32::from(third >= high);
        (self.point(first as usize), self.point(second as usize), self.point(third as usize))
    }
}

/// A whole number in [0, `bound`), by multiplication (bias below bound/2³², far under any Monte Carlo error).
fn below(random: &mut Random, bound: u32) -> u32 {
    ((u64::from(random.random::<u32>()) * u64::from(bound)) >> 32) as u32
}

/// A way to propose a new position of one walker.
pub trait Move: Send + Sync + Debug {
    /// Name, as in the registry.
    fn name(&self) -> &'static str;

    /// Writes a proposal for a walker at `current` and returns the logarithm of its Hastings factor: the walker moves
    /// with probability min(1, exp(factor) p(proposal)/p(current)). −∞ refuses without an evaluation.
    fn propose(&self, current: &[f64], others: Others<'_>, random: &mut Random, proposal: &mut [f64]) -> f64;
}

/// One kind of move.
#[derive(Debug, Clone, Copy)]
pub struct MoveFamily {
    /// Registry name.
    pub name: &'static str,
    /// What it does, in a few words, for help and manual.
    pub summary: &'static str,
    /// Weight in the default mixture.
    pub default_weight: f64,
    build: fn(&Fit) -> Box<dyn Move>,
}

impl MoveFamily {
    /// The move for a target that looks about like `fit`. Of the moves, only the independence move leans on it; a poor fit
    /// makes that one slow, and none of them wrong.
    pub fn build(&self, fit: &Fit) -> Box<dyn Move> {
        (self.build)(fit)
    }
}

/// Every move.
///
/// The default weights of the first three are a compromise, measured by `benches/efficiency.rs` in thousandths of an effective
/// sample an evaluation, on a 20-dimensional Gaussian | four edges | a Student t in three dimensions | a funnel in five:
/// stretch alone 2.7 | 11 | 21 | 4.2, differential evolution alone 10 | 43 | 52 | 0.1, snooker alone 1.7 | 17 | 50 | 3.5, the
/// three in the ratio 2:7:1 8.6 | 30 | 50 | 2.3, in the ratio 4:4:2 6.0 | 24 | 45 | 3.1. With the independence move at nine
/// tenths (a half where walkers get stuck) 290 | 55 | 260 | 2.6.
pub fn move_families() -> &'static [MoveFamily] {
    const FAMILIES: &[MoveFamily] = &[
        MoveFamily {
            name: Stretch::NAME,
            summary: "along the line to another walker (Goodman & Weare 2010)",
            default_weight: 0.25,
            build: |fit| Box::new(Stretch::new(fit.dimension())),
        },
        MoveFamily {
            name: DifferentialEvolution::NAME,
            summary: "by the difference of two other walkers (ter Braak 2006)",
            default_weight: 0.6,
            build: |fit| Box::new(DifferentialEvolution::new(fit.dimension())),
        },
        MoveFamily {
            name: Snooker::NAME,
            summary: "along the line to another walker, by the projected difference of two (ter Braak & Vrugt 2008)",
            default_weight: 0.15,
            build: |fit| Box::new(Snooker::new(&fit.widths())),
        },
        MoveFamily {
            name: Independence::NAME,
            summary: "anywhere, from a Student t fitted during warm-up (Hastings 1970)",
            default_weight: 9.0,
            build: |fit| Box::new(Independence::new(fit.clone())),
        },
    ];
    FAMILIES
}

/// Moves that are chosen at random with fixed weights, whatever the walker's position.
#[derive(Debug)]
pub struct Mixture {
    moves: Vec<Box<dyn Move>>,
    cumulative: Vec<f64>,
}

impl Mixture {
    /// The mixture of moves with these weights by registry name (as [`weights`] makes them) for a target like `fit`.
    pub fn new(fit: &Fit, weights: &[(String, f64)]) -> Result<Self, SamplerError> {
        let total: f64 = weights.iter().map(|(_, weight)| weight).sum();
        let mut made = Self { moves: vec![], cumulative: vec![] };
        let mut sum = 0.0;
        for (name, weight) in weights {
            sum += weight / total;
            made.moves.push(named(name)?.build(fit));
            made.cumulative.push(sum);
        }
        Ok(made)
    }

    /// A move at random, and its place in [`Mixture::names`].
    pub fn pick(&self, random: &mut Random) -> (usize, &dyn Move) {
        let last = self.moves.len() - 1;
        if last == 0 {
            return (0, &*self.moves[0]);
        }
        let uniform: f64 = random.random();
        let at = self.cumulative[..last].iter().position(|sum| uniform < *sum).unwrap_or(last);
        (at, &*self.moves[at])
    }

    /// Names of the moves, in order.
    pub fn names(&self) -> Vec<&'static str> {
        self.moves.iter().map(|chosen| chosen.name()).collect()
    }
}

/// The weights to use: the given ones without those of zero, or the defaults if none are given.
///
/// # Errors
/// [`SamplerError::Setting`] for an unknown name, a weight that is negative or not finite, or a sum of zero; and for a
/// mixture of the independence move alone, which could not correct a poor fit.
pub fn weights(given: &[(String, f64)]) -> Result<Vec<(String, f64)>, SamplerError> {
    let all: Vec<(String, f64)> = if given.is_empty() {
        move_families().iter().map(|family| (family.name.to_owned(), family.default_weight)).collect()
    } else {
        given.to_vec()
    };
    for (name, weight) in &all {
        named(name)?;
        if !(*weight >= 0.0 && weight.is_finite()) {
            return Err(weight_error("finite and not negative", weight.to_string()));
        }
    }
    let used: Vec<(String, f64)> = all.into_iter().filter(|(_, weight)| *weight > 0.0).collect();
    if used.iter().all(|(name, _)| name == Independence::NAME) {
        return Err(weight_error("above 0 for a move other than `independence`", "0".to_owned()));
    }
    Ok(used)
}

fn named(name: &str) -> Result<&'static MoveFamily, SamplerError> {
    move_families().iter().find(|family| family.name == name).ok_or_else(|| {
        let known: Vec<&str> = move_families().iter().map(|family| family.name).collect();
        SamplerError::Setting {
            setting: "move_weights",
            rule: format!("names out of {}", known.join(", ")),
            value: format!("`{name}`"),
            way_out: "correct the name, or leave the weights out for the defaults",
        }
    })
}

fn weight_error(rule: &str, value: String) -> SamplerError {
    SamplerError::Setting {
        setting: "move_weights",
        rule: rule.to_owned(),
        value,
        way_out: "leave the weights out for the defaults",
    }
}
