//! Prior densities: one file a family, a registry of them, truncation, and sets over all dimensions.
//!
//! To add a family: one file with one type that implements [`Prior`], and one line in [`prior_families`].

mod beta;
mod error;
mod gamma;
mod half_normal;
mod joint_normal;
mod log_uniform;
mod normal;
mod set;
mod special;
mod student_t;
mod truncated;
mod uniform;

pub use beta::Beta;
pub use error::PriorError;
pub use gamma::Gamma;
pub use half_normal::HalfNormal;
pub use joint_normal::JointNormal;
pub use log_uniform::LogUniform;
pub use normal::Normal;
pub use set::PriorSet;
pub use student_t::StudentT;
pub use truncated::Truncated;
pub use uniform::Uniform;

pub(crate) use special::normal_quantile;

use rand::{Rng, RngExt};
use std::fmt::Debug;
use std::sync::Arc;

/// A normalised density of one real quantity.
///
/// Probabilities come from both ends ([`Prior::cdf`], [`Prior::survival`]; [`Prior::quantile`],
/// [`Prior::upper_quantile`]), because 1 − p has no digits left where p is close to 1, and truncation needs them.
pub trait Prior: Send + Sync + Debug {
    /// The key of the family, as in the registry.
    fn family(&self) -> &'static str;

    /// The numbers that define it, in the order of the registry's argument names.
    fn arguments(&self) -> Vec<f64>;

    /// Window of a truncated prior, as typed.
    fn within(&self) -> Option<(f64, f64)> {
        None
    }

    /// Natural logarithm of the normalised density; −∞ outside the support, and at an end of it where the density is
    /// infinite (a single point, of no probability).
    fn log_density(&self, x: f64) -> f64;

    /// Probability of a value ≤ `x`.
    fn cdf(&self, x: f64) -> f64;

    /// Probability of a value > `x`.
    fn survival(&self, x: f64) -> f64;

    /// The value below which lies the probability `p`; `p` is clamped to [0, 1].
    fn quantile(&self, p: f64) -> f64;

    /// The value above which lies the probability `q`; `q` is clamped to [0, 1].
    fn upper_quantile(&self, q: f64) -> f64;

    /// Smallest and largest possible value; may be infinite.
    fn support(&self) -> (f64, f64);

    /// Mean; NaN where it does not exist (Student t with dof ≤ 1).
    fn mean(&self) -> f64;

    /// Standard deviation; +∞ where the variance diverges (Student t with dof ≤ 2).
    fn standard_deviation(&self) -> f64;

    /// −d² ln p / dx² at `x`: what this prior adds to a Fisher matrix. Negative where the density is not log-concave.
    fn curvature(&self, x: f64) -> f64;

    /// One draw.
    fn sample(&self, rng: &mut dyn Rng) -> f64 {
        let u: f64 = rng.random();
        if u < 0.5 { self.quantile(u) } else { self.upper_quantile(1.0 - u) }
    }

    /// What kind of log density it is, for code that integrates or evaluates the simple kinds faster.
    fn shape(&self) -> PriorShape {
        PriorShape::Other
    }

    /// The value with half of the probability on each side.
    fn median(&self) -> f64 {
        self.quantile(0.5)
    }

    /// Half the width of the central 68.27 % interval: finite for every prior, equal to the standard deviation of a
    /// normal one. The natural unit of length of this dimension.
    fn spread(&self) -> f64 {
        const TAIL: f64 = 0.158_655_253_931_457_05;
        0.5 * (self.upper_quantile(TAIL) - self.quantile(TAIL))
    }
}

/// The kinds of log density that are a polynomial of low order: those that linear algebra can integrate over.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum PriorShape {
    /// An untruncated normal.
    Normal {
        /// Mean.
        mean: f64,
        /// Standard deviation, above 0.
        sd: f64,
    },
    /// The same density between two finite bounds.
    Flat {
        /// Lower bound.
        low: f64,
        /// Upper bound.
        high: f64,
    },
    /// Anything else.
    Other,
}

/// A prior that can be shared between threads and cloned at no cost.
pub type SharedPrior = Arc<dyn Prior>;

/// One family of priors, as a study file names it.
#[derive(Debug, Clone, Copy)]
pub struct PriorFamily {
    /// The key, such as `log_uniform`.
    pub key: &'static str,
    /// Names of its numbers, in order; their count is what the key takes (one number may stand without brackets).
    pub arguments: &'static [&'static str],
    /// What it is, in a few words, for help and manual.
    pub summary: &'static str,
    build: fn(&[f64]) -> Result<SharedPrior, PriorError>,
}

impl PriorFamily {
    /// Builds the prior from its numbers.
    ///
    /// # Errors
    /// [`PriorError::ArgumentCount`] for `normal = [1.0]`, and what the family's own constructor refuses.
    pub fn build(&self, arguments: &[f64]) -> Result<SharedPrior, PriorError> {
        if arguments.len() != self.arguments.len() {
            return Err(PriorError::ArgumentCount {
                family: self.key,
                names: self.arguments,
                got: arguments.len(),
            });
        }
        (self.build)(arguments)
    }
}

/// Makes a registry line from a family's constants and its constructor.
macro_rules! family {
    ($type:ident, $($index:literal),+) => {
        PriorFamily {
            key: $type::KEY,
            arguments: $type::ARGUMENTS,
            summary: $type::SUMMARY,
            build: |numbers| Ok(Arc::new($type::new($(numbers[$index]),+)?)),
        }
    };
}

/// Every family of priors: the one list that parsing, help and manual are made from.
pub fn prior_families() -> &'static [PriorFamily] {
    const FAMILIES: &[PriorFamily] = &[
        family!(Normal, 0, 1),
        family!(Uniform, 0, 1),
        family!(LogUniform, 0, 1),
        family!(HalfNormal, 0),
        family!(Beta, 0, 1),
        family!(Gamma, 0, 1),
        family!(StudentT, 0, 1, 2),
    ];
    FAMILIES
}

/// The family of that key, if there is one.
pub fn prior_family(key: &str) -> Option<&'static PriorFamily> {
    prior_families().iter().find(|family| family.key == key)
}

/// Builds a prior from a family's key, its numbers and an optional window (`within`).
///
/// # Errors
/// [`PriorError::UnknownFamily`] names the nearest key; otherwise what [`PriorFamily::build`] and [`Truncated::new`] refuse.
pub fn build_prior(
    key: &str,
    arguments: &[f64],
    within: Option<(f64, f64)>,
) -> Result<SharedPrior, PriorError> {
    let family = prior_family(key).ok_or_else(|| unknown_family(key))?;
    let prior = family.build(arguments)?;
    match within {
        None => Ok(prior),
        Some((low, high)) => Ok(Arc::new(Truncated::new(prior, low, high)?)),
    }
}

fn unknown_family(key: &str) -> PriorError {
    let known: Vec<&'static str> = prior_families().iter().map(|family| family.key).collect();
    let nearest = known
        .iter()
        .copied()
        .map(|name| (strsim::damerau_levenshtein(name, key), name))
        .min()
        .filter(|(distance, name)| *distance <= name.len() / 2)
        .map(|(_, name)| name);
    PriorError::UnknownFamily { family: key.to_owned(), nearest, known }
}
