//! One hypothesis with every quantity of the study resolved: held, inferred or tied.

use oddwell_model::FeltBy;
use oddwell_sampler::{JointNormal, PriorError, PriorSet};

use super::affine::AffineForm;
use super::systematics::Move;
use crate::file::{Located, Origin, PriorSpec, Quantity, Shape};

/// A hypothesis, resolved.
#[derive(Clone, Debug)]
pub struct Hypothesis {
    /// What `--hypothesis` calls it.
    pub name: String,
    /// The departure's shape.
    pub shape: Shape,
    /// Who feels it; light where there is no departure.
    pub felt_by: FeltBy,
    /// Every quantity in the order of the study: background, prediction, surveys, systematics, departure.
    pub quantities: Vec<ResolvedQuantity>,
    /// The inferred ones, in the same order: the coordinates θ of the posterior.
    pub free: Vec<FreeParameter>,
    /// Joint priors.
    pub joint: Vec<JointBlock>,
}

/// A quantity of the study in one hypothesis.
#[derive(Clone, Debug, PartialEq)]
pub struct ResolvedQuantity {
    /// Dotted name.
    pub name: String,
    /// As given, and where.
    pub given: Located<Quantity>,
    /// What it is in this hypothesis.
    pub state: State,
    /// What systematics add to it.
    pub moves: Vec<Move>,
    /// Its value as a function of θ, ties and systematics included.
    pub form: AffineForm,
}

/// What a quantity is in a hypothesis.
#[derive(Clone, Debug, PartialEq)]
pub enum State {
    /// Held at this number (systematics may still move it).
    Held(f64),
    /// Inferred: the index into [`Hypothesis::free`].
    Free(usize),
    /// Inferred, with a normal prior, and integrated out exactly: no coordinate of θ.
    IntegratedOut {
        /// Prior mean, which the prediction is made for.
        mean: f64,
        /// Prior standard deviation.
        standard_deviation: f64,
    },
    /// Follows the quantity with this index in [`Hypothesis::quantities`].
    Tied(usize),
}

/// An inferred quantity.
#[derive(Clone, Debug, PartialEq)]
pub struct FreeParameter {
    /// Dotted name.
    pub name: String,
    /// Its prior.
    pub prior: FreePrior,
    /// Where it was given.
    pub origin: Origin,
    /// Index into [`Hypothesis::quantities`].
    pub quantity: usize,
}

/// Where the prior of a free parameter stands.
#[derive(Clone, Debug, PartialEq)]
pub enum FreePrior {
    /// Its own.
    Own(PriorSpec),
    /// One dimension of a joint prior.
    Joint {
        /// Index into [`Hypothesis::joint`].
        block: usize,
        /// Position in the block.
        position: usize,
        /// The number given in its own place: where the search starts.
        start: f64,
    },
}

/// A joint normal prior over some free parameters.
#[derive(Clone, Debug, PartialEq)]
pub struct JointBlock {
    /// Indices into [`Hypothesis::free`].
    pub of: Vec<usize>,
    /// Means.
    pub mean: Vec<f64>,
    /// Covariance.
    pub covariance: Vec<Vec<f64>>,
    /// Where it was given.
    pub origin: Origin,
}

impl Hypothesis {
    /// The quantity of this dotted name.
    pub fn quantity(&self, name: &str) -> Option<&ResolvedQuantity> {
        self.quantities.iter().find(|quantity| quantity.name == name)
    }

    /// The index of the free parameter of this dotted name.
    pub fn free_index(&self, name: &str) -> Option<usize> {
        self.free.iter().position(|parameter| parameter.name == name)
    }

    /// The indices of the departure's free parameters: what the stop rule watches.
    pub fn watched(&self) -> Vec<usize> {
        (0..self.free.len()).filter(|index| self.free[*index].name.starts_with("departure.")).collect()
    }

    /// A point to start from: the number beside a joint prior, else the prior's mean, or its median where there is no mean.
    pub fn start(&self) -> Vec<f64> {
        self.free
            .iter()
            .map(|parameter| match &parameter.prior {
                FreePrior::Joint { start, .. } => *start,
                FreePrior::Own(spec) => spec.build().map_or(0.0, |prior| {
                    Some(prior.mean()).filter(|mean| mean.is_finite()).unwrap_or_else(|| prior.median())
                }),
            })
            .collect()
    }

    /// The prior of θ.
    ///
    /// # Errors
    /// None for a hypothesis of a resolved study: its priors have been checked one by one.
    pub fn priors(&self) -> Result<PriorSet, PriorError> {
        let mut independent = Vec::new();
        for (index, parameter) in self.free.iter().enumerate() {
            if let FreePrior::Own(spec) = &parameter.prior {
                independent.push((index, spec.build()?));
            }
        }
        let joint: Result<Vec<_>, _> = self
            .joint
            .iter()
            .map(|block| JointNormal::new(block.of.clone(), &block.mean, &block.covariance))
            .collect();
        PriorSet::new(self.free.len(), independent, joint?)
    }
}
