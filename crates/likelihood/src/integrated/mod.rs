//! A compressed likelihood with linear quantities integrated out, exactly.

mod interval;
mod skyline;

use std::f64::consts::TAU;

use nalgebra::{Cholesky, DMatrix};

use crate::blocks::Block;
use crate::compressed::CompressedLikelihood;
use crate::surveys::CompressedSet;
use interval::Interval;
use skyline::Skyline;

/// What is known of linear quantities x before the data: a normal density N(0, P⁻¹), and for one quantity, if asked for, the
/// same density between two ends.
#[derive(Clone, Debug, PartialEq)]
pub struct LinearPrior {
    /// P. Row and column of the quantity with an interval are 0.
    pub precision: DMatrix<f64>,
    /// A quantity whose density is 1/(high − low) between two finite ends and 0 outside: its place, low and high.
    pub interval: Option<(usize, f64, f64)>,
}

/// Linear quantities that can't be integrated out.
#[derive(Clone, Debug, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum IntegrationError {
    /// Noise that is not normal.
    #[error(
        "noise `{name}` is not normal, so that linear quantities cannot be integrated out exactly; sample them, or choose noise \"gaussian\" or \"hartlap\""
    )]
    Noise {
        /// The noise model.
        name: &'static str,
    },
    /// A prior that is no density.
    #[error(
        "the precision of {quantities} linear quantities is not positive definite where it must be; give each a normal prior of finite width"
    )]
    Precision {
        /// How many there are.
        quantities: usize,
    },
}

/// ∫ L(c₀ + S x) p(x) dx for coefficients that are affine in x: c₀ and the slopes S = ∂c/∂x vary, which entries of S can
/// differ from 0 does not.
///
/// With r = R c₀ − t (all surveys' blocks, each scaled by √h, h the inflation of its noise model inverted) and A = R S,
///
/// ```text
/// ln ∫ = ln L(c₀) + ½ |w|² − Σ ln L_ii + ½ ln det P        Λ = P + AᵀA = L Lᵀ,  w = −L⁻¹ Aᵀr
/// ```
///
/// and x given the data is N(Λ⁻¹g, Λ⁻¹), g = −Aᵀr. A quantity with an interval stands last in L: given nothing but the data
/// it is N(w_n/L_nn, 1/L_nn²) before its ends are seen, so that they add the logarithm of √(2π)/(high − low) times the
/// probability between them. So the integral is exact for any ends, and for one such quantity only.
///
/// Quantities that one block of the data alone sees come first, so that L fills in nowhere between blocks: the cost is about
/// that of the pairs of slopes within each block. Accuracy: Λ is a sum of a positive definite and a semi-definite matrix;
/// rounding moves the result by about 1e-15 (|r|² + |w|²).
#[derive(Clone, Debug)]
pub struct IntegratedSet {
    blocks: Vec<Sight>,
    coefficients: usize,
    slopes: usize,
    /// Places of the quantities in L, by the caller's order; and the reverse.
    place: Vec<usize>,
    order: Vec<usize>,
    skyline: Skyline,
    prior: Vec<f64>,
    interval: Option<(f64, f64)>,
    constant: f64,
}

/// What one block of the data sees.
#[derive(Clone, Debug)]
struct Sight {
    columns: Vec<usize>,
    rank: usize,
    /// √h R by columns, column j down to row min(j, rank − 1).
    triangle: Vec<f64>,
    target: Vec<f64>,
    /// (slope, quantity's place, column): slope × (Rᵀr)_column is a part of the gradient.
    gradient: Vec<(u32, u32, u32)>,
    /// (entry of the skyline, slope, slope, (RᵀR) of their columns).
    pairs: Vec<(u32, u32, u32, f64)>,
}

/// Working memory of one thread; holds what [`IntegratedSet::draw`] needs of the last point.
#[derive(Clone, Debug)]
pub struct IntegratedScratch {
    residual: Vec<f64>,
    image: Vec<f64>,
    factor: Vec<f64>,
    whitened: Vec<f64>,
}

impl IntegratedSet {
    /// `pattern` holds for every quantity the coefficients that it moves, without repetition.
    ///
    /// # Errors
    /// [`IntegrationError`].
    ///
    /// # Panics
    /// Where `pattern` and `prior` disagree about the number of quantities.
    pub fn new(
        compressed: &CompressedSet,
        pattern: &[Vec<usize>],
        prior: &LinearPrior,
    ) -> Result<Self, IntegrationError> {
        let count = pattern.len();
        assert_eq!(prior.precision.shape(), (count, count), "a row of the precision for each quantity");
        let blocks: Vec<(f64, &Block)> = compressed
            .surveys()
            .iter()
            .map(|survey| Ok((normal_weight(survey)?, survey)))
            .collect::<Result<Vec<_>, _>>()?
            .into_iter()
            .flat_map(|(weight, survey)| survey.blocks().iter().map(move |block| (weight, block)))
            .collect();
        let order = order(&blocks, pattern, prior);
        let mut place = vec![0; count];
        order.iter().enumerate().for_each(|(at, quantity)| place[*quantity] = at);
        let starts: Vec<usize> = pattern
            .iter()
            .scan(0, |next, moved| Some(std::mem::replace(next, *next + moved.len())))
            .collect();
        let seen: Vec<Vec<Seen>> =
            blocks.iter().map(|(_, block)| seen(block, pattern, &starts, &place)).collect();
        let joined = (0..count).flat_map(|i| (0..i).map(move |j| (i, j)));
        let joined = joined.filter(|at| prior.precision[*at] != 0.0).map(|(i, j)| (place[i], place[j]));
        let together = seen
            .iter()
            .flat_map(|seen| seen.iter().flat_map(|one| seen.iter().map(|other| (one.place, other.place))));
        let skyline = Skyline::new(count, joined.chain(together));
        let mut values = vec![0.0; skyline.length()];
        for i in 0..count {
            for j in (0..=i).filter(|j| prior.precision[(i, *j)] != 0.0) {
                values[skyline.place(place[i], place[j])] = prior.precision[(i, j)];
            }
        }
        let interval = prior.interval.map(|(_, low, high)| (low, high));
        let of_interval = interval.map_or(0.0, |(low, high)| 0.5 * TAU.ln() - (high - low).ln());
        let at_floor =
            |survey: &CompressedLikelihood| survey.noise().log_likelihood(survey.smallest_chi_squared());
        let constant = compressed.surveys().iter().map(at_floor).sum::<f64>()
            + half_log_determinant(prior)?
            + of_interval;
        let blocks = blocks
            .iter()
            .zip(&seen)
            .map(|((weight, block), seen)| Sight::new(*weight, block, seen, &skyline))
            .collect();
        let coefficients = compressed.surveys().first().map_or(0, CompressedLikelihood::coefficients);
        let slopes = pattern.iter().map(Vec::len).sum();
        Ok(Self { blocks, coefficients, slopes, place, order, skyline, prior: values, interval, constant })
    }

    /// How many quantities are integrated out.
    pub fn quantities(&self) -> usize {
        self.order.len()
    }

    /// Working memory of one thread.
    pub fn scratch(&self) -> IntegratedScratch {
        let largest = |of: fn(&Sight) -> usize| self.blocks.iter().map(of).max().unwrap_or(0);
        IntegratedScratch {
            residual: vec![0.0; largest(|block| block.rank)],
            image: vec![0.0; largest(|block| block.columns.len())],
            factor: vec![0.0; self.skyline.length()],
            whitened: vec![0.0; self.order.len()],
        }
    }

    /// Logarithm of the likelihood, the quantities integrated out: `coefficients` at x = 0, and ∂coefficient/∂x of every
    /// quantity and every coefficient that it moves, one quantity after another. NaN where an input is; allocates nothing.
    pub fn log_likelihood(
        &self,
        coefficients: &[f64],
        slopes: &[f64],
        scratch: &mut IntegratedScratch,
    ) -> f64 {
        assert_eq!(coefficients.len(), self.coefficients, "a number for each coefficient");
        assert_eq!(slopes.len(), self.slopes, "a number for each slope");
        let IntegratedScratch { residual, image, factor, whitened } = scratch;
        factor.copy_from_slice(&self.prior);
        whitened.fill(0.0);
        let mut squares = 0.0;
        for block in &self.blocks {
            squares += block.reflect(coefficients, residual, image);
            for &(slope, quantity, column) in &block.gradient {
                whitened[quantity as usize] -= slopes[slope as usize] * image[column as usize];
            }
            for &(entry, one, other, product) in &block.pairs {
                factor[entry as usize] += product * slopes[one as usize] * slopes[other as usize];
            }
        }
        let log_determinant = self.skyline.factor_and_solve(factor, whitened);
        let gain: f64 = whitened.iter().map(|entry| entry * entry).sum();
        let inside = self.last(scratch).map_or(0.0, Interval::log_probability);
        self.constant - 0.5 * squares + 0.5 * gain - log_determinant + inside
    }

    /// The ends of the quantity with an interval, in standard deviations from its mean.
    fn last(&self, scratch: &IntegratedScratch) -> Option<Interval> {
        let (low, high) = self.interval?;
        let inverse = self.skyline.last_inverse_pivot(&scratch.factor);
        let shift = scratch.whitened.last()?;
        Some(Interval { low: low / inverse - shift, high: high / inverse - shift })
    }

    /// Draws the quantities given the point that `scratch` has last seen: from independent standard normal numbers, one a
    /// quantity, and one uniform number in (0, 1), which serves where an interval has an end in reach. `x` is in the caller's
    /// order.
    pub fn draw(&self, scratch: &mut IntegratedScratch, normals: &[f64], uniform: f64, x: &mut [f64]) {
        let last = self.last(scratch).filter(|interval| !interval.is_open());
        let inverse =
            if self.order.is_empty() { 1.0 } else { self.skyline.last_inverse_pivot(&scratch.factor) };
        let shift = scratch.whitened.last().copied().unwrap_or(0.0);
        let set_last = last.map(|interval| (interval.quantile(uniform) + shift) * inverse);
        self.solve(scratch, normals, set_last, x);
    }

    /// The most probable quantities given the point that `scratch` has last seen: their mean, unless an interval ends before.
    pub fn most_probable(&self, scratch: &mut IntegratedScratch, x: &mut [f64]) {
        let inverse =
            if self.order.is_empty() { 1.0 } else { self.skyline.last_inverse_pivot(&scratch.factor) };
        let mean = scratch.whitened.last().map_or(0.0, |shift| shift * inverse);
        let set_last = self.interval.map(|(low, high)| mean.clamp(low, high));
        self.solve(scratch, &vec![0.0; x.len()], set_last, x);
    }

    fn solve(&self, scratch: &mut IntegratedScratch, normals: &[f64], set_last: Option<f64>, x: &mut [f64]) {
        let solved = &mut scratch.residual;
        solved.clear();
        solved.extend(scratch.whitened.iter().zip(normals).map(|(mean, normal)| mean + normal));
        self.skyline.back_substitute(&scratch.factor, solved, set_last);
        for (quantity, place) in x.iter_mut().zip(&self.place) {
            *quantity = solved[*place];
        }
        let largest = self.blocks.iter().map(|block| block.rank).max().unwrap_or(0);
        solved.resize(largest, 0.0);
    }
}

/// Where a quantity's slopes meet a block.
#[derive(Clone, Debug)]
struct Seen {
    place: usize,
    /// (slope, column of the block).
    slopes: Vec<(usize, usize)>,
}

fn seen(block: &Block, pattern: &[Vec<usize>], starts: &[usize], place: &[usize]) -> Vec<Seen> {
    let sees = |(quantity, moved): (usize, &Vec<usize>)| {
        let within = |(at, coefficient): (usize, &usize)| {
            let column = block.columns().iter().position(|column| column == coefficient)?;
            Some((starts[quantity] + at, column))
        };
        let slopes: Vec<(usize, usize)> = moved.iter().enumerate().filter_map(within).collect();
        (!slopes.is_empty()).then_some(Seen { place: place[quantity], slopes })
    };
    pattern.iter().enumerate().filter_map(sees).collect()
}

/// Quantities of one block first, by block; those of several, or tied by the prior, then; the one with an interval last.
fn order(blocks: &[(f64, &Block)], pattern: &[Vec<usize>], prior: &LinearPrior) -> Vec<usize> {
    let key = |quantity: &usize| {
        let sees = |block: &&(f64, &Block)| {
            pattern[*quantity].iter().any(|coefficient| block.1.columns().contains(coefficient))
        };
        let first = blocks.iter().position(|block| sees(&block));
        let several = blocks.iter().filter(sees).count() > 1;
        let tied =
            (0..pattern.len()).any(|other| other != *quantity && prior.precision[(*quantity, other)] != 0.0);
        let last = prior.interval.is_some_and(|(at, ..)| at == *quantity);
        (last, several || tied, first)
    };
    let mut order: Vec<usize> = (0..pattern.len()).collect();
    order.sort_by_key(key);
    order
}

/// −2 ∂ ln L/∂χ² of normal noise.
fn normal_weight(survey: &CompressedLikelihood) -> Result<f64, IntegrationError> {
    let noise = survey.noise();
    match noise.weight(0.0) == noise.weight(1.0) {
        true => Ok(noise.weight(0.0)),
        false => Err(IntegrationError::Noise { name: noise.name() }),
    }
}

/// ½ ln det P over the normal quantities.
fn half_log_determinant(prior: &LinearPrior) -> Result<f64, IntegrationError> {
    let quantities = prior.precision.nrows();
    let flat = prior.interval.map(|(at, ..)| at);
    let normal: Vec<usize> = (0..quantities).filter(|at| Some(*at) != flat).collect();
    let precision = prior.precision.select_rows(&normal).select_columns(&normal);
    let factor = Cholesky::new(precision).ok_or(IntegrationError::Precision { quantities })?;
    Ok(factor.l_dirty().diagonal().iter().map(|pivot| pivot.ln()).sum())
}

impl Sight {
    fn new(weight: f64, block: &Block, seen: &[Seen], skyline: &Skyline) -> Self {
        let full = block.triangle() * weight.sqrt();
        let target = (block.target() * weight.sqrt()).as_slice().to_vec();
        let rank = block.rank();
        let columns = block.columns().to_vec();
        let triangle = (0..columns.len())
            .flat_map(|j| (0..rank.min(j + 1)).map(move |i| (i, j)))
            .map(|at| full[at])
            .collect();
        let products = full.tr_mul(&full);
        let gradient = seen.iter().flat_map(|seen| {
            seen.slopes.iter().map(|(slope, column)| (*slope as u32, seen.place as u32, *column as u32))
        });
        let mut pairs = Vec::new();
        for one in seen {
            for other in seen.iter().filter(|other| other.place <= one.place) {
                let entry = skyline.place(one.place, other.place) as u32;
                for (at, &(slope, column)) in one.slopes.iter().enumerate() {
                    for (beside, &(other_slope, other_column)) in other.slopes.iter().enumerate() {
                        // On the diagonal each pair comes twice: once with twice the product.
                        let same = one.place == other.place;
                        if same && beside > at {
                            continue;
                        }
                        let twice = if same && beside < at { 2.0 } else { 1.0 };
                        let product = twice * products[(column, other_column)];
                        pairs.push((entry, slope as u32, other_slope as u32, product));
                    }
                }
            }
        }
        Self { columns, rank, triangle, target, gradient: gradient.collect(), pairs }
    }

    /// Writes r = R c − t and Rᵀr; returns |r|².
    fn reflect(&self, coefficients: &[f64], residual: &mut [f64], image: &mut [f64]) -> f64 {
        let residual = &mut residual[..self.rank];
        residual.iter_mut().zip(&self.target).for_each(|(entry, target)| *entry = -target);
        let mut columns = self.triangle.as_slice();
        for (at, column) in self.columns.iter().enumerate() {
            let (entries, rest) = columns.split_at(self.rank.min(at + 1));
            columns = rest;
            let c = coefficients[*column];
            residual.iter_mut().zip(entries).for_each(|(sum, entry)| *sum += c * entry);
        }
        let mut columns = self.triangle.as_slice();
        for (at, image) in image[..self.columns.len()].iter_mut().enumerate() {
            let (entries, rest) = columns.split_at(self.rank.min(at + 1));
            columns = rest;
            *image = entries.iter().zip(&*residual).map(|(entry, r)| entry * r).sum();
        }
        residual.iter().map(|r| r * r).sum()
    }
}
