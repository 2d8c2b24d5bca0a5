//! A log likelihood that is a quadratic in a few parameters, integrated over priors of any width.

use crate::numbers::log_sum_exp;
use nalgebra::{Cholesky, DMatrix, DVector};
use oddwell_sampler::{PriorShape, SharedPrior};
use std::f64::consts::TAU;

/// value + gᵀ(x − centre) − ½ (x − centre)ᵀ P (x − centre).
#[derive(Debug, Clone)]
pub(super) struct LogQuadratic {
    pub(super) value: f64,
    pub(super) gradient: DVector<f64>,
    pub(super) precision: DMatrix<f64>,
    pub(super) centre: DVector<f64>,
}

/// A prior stretched by a factor about its median, or about its end where it has exactly one.
#[derive(Debug, Clone, Copy)]
pub(super) struct Widened<'a> {
    prior: &'a SharedPrior,
    factor: f64,
    about: f64,
}

impl<'a> Widened<'a> {
    pub(super) fn new(prior: &'a SharedPrior, factor: f64) -> Self {
        let about = match prior.support() {
            (low, high) if low.is_finite() && !high.is_finite() => low,
            (low, high) if high.is_finite() && !low.is_finite() => high,
            _ => prior.median(),
        };
        Self { prior, factor, about }
    }

    fn quantile(&self, p: f64) -> f64 {
        let x = if p < 0.5 { self.prior.quantile(p) } else { self.prior.upper_quantile(1.0 - p) };
        self.about + self.factor * (x - self.about)
    }

    fn log_density(&self, x: f64) -> f64 {
        self.prior.log_density(self.about + (x - self.about) / self.factor) - self.factor.ln()
    }

    fn normal(&self) -> Option<(f64, f64)> {
        match self.prior.shape() {
            PriorShape::Normal { mean, sd } => Some((mean, sd * self.factor)),
            _ => None,
        }
    }
}

/// Points of a rule over the unit cube: enough for integrands as smooth as these to 1e-3.
const POINTS: usize = 256;

impl LogQuadratic {
    fn at(&self, x: &DVector<f64>) -> f64 {
        let shift = x - &self.centre;
        self.value + self.gradient.dot(&shift) - 0.5 * (&self.precision * &shift).dot(&shift)
    }

    /// ln ∫ exp(this) π: in closed form for normal priors; for others over the prior's quantiles where it is narrower than
    /// the likelihood, over the likelihood's where that is.
    pub(super) fn log_integral(&self, priors: &[Widened<'_>]) -> f64 {
        let normals: Option<Vec<(f64, f64)>> = priors.iter().map(Widened::normal).collect();
        if let Some(normals) = normals {
            return self.over_normals(&normals);
        }
        let narrow = |(at, prior): (usize, &Widened<'_>)| {
            let spread = prior.factor * prior.prior.spread();
            spread * spread * self.precision[(at, at)] < 1.0
        };
        if priors.iter().enumerate().all(narrow) {
            self.over_quantiles(priors)
        } else {
            self.over_likelihood(priors).unwrap_or_else(|| self.over_quantiles(priors))
        }
    }

    /// ∫ over normal priors of precision Λ and mean m: with P + Λ = L Lᵀ and shifts from the centre.
    fn over_normals(&self, normals: &[(f64, f64)]) -> f64 {
        let mut precision = self.precision.clone();
        let mut pull = self.gradient.clone();
        let mut log_prior = 0.0;
        for (at, (mean, sd)) in normals.iter().enumerate() {
            let weight = sd.powi(-2);
            let shift = mean - self.centre[at];
            precision[(at, at)] += weight;
            pull[at] += weight * shift;
            log_prior -= 0.5 * weight * shift * shift + sd.ln();
        }
        let Some(factor) = Cholesky::new(precision) else { return f64::NAN };
        let half_log_determinant: f64 = factor.l_dirty().diagonal().iter().map(|entry| entry.ln()).sum();
        self.value + log_prior - half_log_determinant + 0.5 * pull.dot(&factor.solve(&pull))
    }

    fn over_quantiles(&self, priors: &[Widened<'_>]) -> f64 {
        let terms: Vec<f64> = cube(priors.len())
            .map(|unit| self.at(&DVector::from_fn(priors.len(), |at, _| priors[at].quantile(unit[at]))))
            .collect();
        log_sum_exp(&terms) - (POINTS as f64).ln()
    }

    fn over_likelihood(&self, priors: &[Widened<'_>]) -> Option<f64> {
        let n = priors.len();
        let factor = Cholesky::new(self.precision.clone())?;
        let mean = &self.centre + factor.solve(&self.gradient);
        let upper = factor.l().transpose();
        let half_log_determinant: f64 = factor.l_dirty().diagonal().iter().map(|entry| entry.ln()).sum();
        let normal = oddwell_sampler::build_prior("normal", &[0.0, 1.0], None).ok()?;
        let mut terms = Vec::with_capacity(POINTS);
        for unit in cube(n) {
            let normals = DVector::from_fn(n, |at, _| normal.quantile(unit[at]));
            let x = &mean + upper.solve_upper_triangular(&normals)?;
            terms.push(priors.iter().zip(x.iter()).map(|(prior, x)| prior.log_density(*x)).sum());
        }
        let peak = self.at(&mean);
        Some(
            peak + 0.5 * n as f64 * TAU.ln() - half_log_determinant + log_sum_exp(&terms)
                - (POINTS as f64).ln(),
        )
    }
}

/// Evenly spread points of the unit cube (Kronecker's sequence; in one dimension the midpoints of equal parts).
fn cube(dimension: usize) -> impl Iterator<Item = Vec<f64>> {
    let root = (0..60).fold(1.5f64, |x, _| (1.0 + x).powf(1.0 / (dimension as f64 + 1.0)));
    (0..POINTS).map(move |index| {
        (0..dimension)
            .map(|at| match at {
                0 => (index as f64 + 0.5) / POINTS as f64,
                _ => (0.5 + index as f64 * root.powi(-(at as i32))).fract().clamp(1e-9, 1.0 - 1e-9),
            })
            .collect()
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use oddwell_sampler::build_prior;

    fn bell(mean: f64, sd: f64) -> LogQuadratic {
        LogQuadratic {
            value: 0.0,
            gradient: DVector::zeros(1),
            precision: DMatrix::from_element(1, 1, sd.powi(-2)),
            centre: DVector::from_element(1, mean),
        }
    }

    /// Normal likelihood of width s over a normal prior of width w: ln of √(s²/(s² + w²)) exp(−m²/2(s² + w²)).
    #[test]
    fn over_a_normal_prior_of_any_width() {
        let prior = build_prior("normal", &[0.0, 2.0], None).unwrap();
        for factor in [1e-3, 0.1, 1.0, 30.0] {
            let (m, s, w) = (1.5f64, 0.7f64, 2.0 * factor);
            let expected = 0.5 * (s * s / (s * s + w * w)).ln() - 0.5 * m * m / (s * s + w * w);
            let got = bell(m, s).log_integral(&[Widened::new(&prior, factor)]);
            // At a thousandth, terms of 1e5 cancel.
            assert!((got - expected).abs() < 1e-9, "{factor}: {got} {expected}");
        }
    }

    /// Over a flat prior of half-width h about 0: ln of √(2π) s [Φ((h−m)/s) − Φ((−h−m)/s)]/(2h). The rule has 256 points,
    /// whose steps in the cut density leave 1/256 of it.
    #[test]
    fn over_a_flat_prior_of_any_width() {
        let prior = build_prior("uniform", &[-3.0, 3.0], None).unwrap();
        let cdf = |x: f64| 0.5 * statrs::function::erf::erfc(-x / std::f64::consts::SQRT_2);
        for factor in [1e-3, 0.1, 0.3, 1.0, 30.0] {
            let (m, s, h) = (1.5f64, 0.7f64, 3.0 * factor);
            let share: f64 = cdf((h - m) / s) - cdf((-h - m) / s);
            let expected = (TAU.sqrt() * s * share / (2.0 * h)).ln();
            let got = bell(m, s).log_integral(&[Widened::new(&prior, factor)]);
            assert!((got - expected).abs() < 0.02, "{factor}: {got} {expected}");
        }
    }
}
