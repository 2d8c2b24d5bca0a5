//! Any prior cut to a window and renormalised: `within` of a study file.

use super::{Prior, PriorError, PriorShape, SharedPrior};

/// A prior restricted to [low, high] and divided by the mass it has there.
///
/// The mass comes from whichever tail keeps its digits; for a window so narrow that the difference of two
/// probabilities would lose them (below a thousandth of either), from 20-point Gauss–Legendre quadrature of the density.
/// Mean and standard deviation by the same rule over probability, on panels of a decade: to a relative 1e-9 for a window
/// with finite ends, or with an infinite one where the untruncated prior has moments of third order.
#[derive(Debug, Clone)]
pub struct Truncated {
    prior: SharedPrior,
    low: f64,
    high: f64,
    mass: f64,
    ln_mass: f64,
    mean: f64,
    standard_deviation: f64,
}

impl Truncated {
    /// Cuts `prior` to [low, high]; an end may be infinite.
    ///
    /// # Errors
    /// [`PriorError::InvertedWindow`] for [1, 0]; [`PriorError::EmptyWindow`] where less than 1e-280 of the mass remains,
    /// as for a standard normal within [40, 50].
    pub fn new(prior: SharedPrior, low: f64, high: f64) -> Result<Self, PriorError> {
        if low.is_nan() || high.is_nan() || low >= high {
            return Err(PriorError::InvertedWindow { family: prior.family(), low, high });
        }
        let support = prior.support();
        let (from, to) = (low.max(support.0), high.min(support.1));
        let mass = if from < to { interval_mass(&*prior, from, to) } else { 0.0 };
        if !(mass > 1e-280) {
            return Err(PriorError::EmptyWindow { family: prior.family(), low, high, mass, support });
        }
        let mut made =
            Self { prior, low, high, mass, ln_mass: mass.ln(), mean: f64::NAN, standard_deviation: f64::NAN };
        (made.mean, made.standard_deviation) = made.moments();
        Ok(made)
    }

    /// Mass of the untruncated prior inside the window.
    pub fn mass(&self) -> f64 {
        self.mass
    }

    /// The untruncated prior.
    pub fn untruncated(&self) -> &SharedPrior {
        &self.prior
    }

    /// Mean and standard deviation by quadrature.
    fn moments(&self) -> (f64, f64) {
        let (low, high) = self.support();
        let untruncated_sd = self.prior.standard_deviation();
        if (low.is_infinite() || high.is_infinite()) && untruncated_sd.is_infinite() {
            return (f64::NAN, f64::INFINITY);
        }
        // Over probability instead of x: a power-law tail, or a singular end, is a smooth power on panels of one decade.
        let centre = self.median();
        let (mut first, mut second) = (0.0, 0.0);
        let mut panel = |from: f64, to: f64| {
            legendre_panel(from, to, |p, weight| {
                for x in [self.quantile(p) - centre, self.upper_quantile(p) - centre] {
                    first += weight * x;
                    second += weight * x * x;
                }
            });
        };
        panel(0.0, 1e-30);
        (1..30).rev().for_each(|k| panel(10f64.powi(-k - 1), 10f64.powi(-k)));
        (1..5).for_each(|k| panel(0.1 * f64::from(k), 0.1 * f64::from(k + 1)));
        (centre + first, (second - first * first).max(0.0).sqrt())
    }
}

/// Mass of `prior` between `low` and `high`, both inside its support.
fn interval_mass(prior: &dyn Prior, low: f64, high: f64) -> f64 {
    let (below, above) = (prior.cdf(low), prior.survival(high));
    let (difference, scale) = if below > 0.5 {
        (prior.survival(low) - above, prior.survival(low))
    } else if above > 0.5 {
        (prior.cdf(high) - below, prior.cdf(high))
    } else {
        (1.0 - below - above, 1.0)
    };
    if difference >= 1e-3 * scale {
        return difference;
    }
    let mut mass = 0.0;
    legendre_panel(low, high, |x, weight| mass += weight * prior.log_density(x).exp());
    mass
}

/// Calls `visit(node, weight)` for the 20-point Gauss–Legendre rule on [low, high].
fn legendre_panel(low: f64, high: f64, mut visit: impl FnMut(f64, f64)) {
    // Nodes and weights on [-1, 1] (Abramowitz & Stegun 1964, table 25.4), mirrored.
    const NODES: [f64; 10] = [
        0.076_526_521_133_497_33,
        0.227_785_851_141_645_08,
        0.373_706_088_715_419_56,
        0.510_867_001_950_827_1,
        0.636_053_680_726_515,
        0.746_331_906_460_150_8,
        0.839_116_971_822_218_8,
        0.912_234_428_251_326,
        0.963_971_927_277_913_8,
        0.993_128_599_185_094_9,
    ];
    const WEIGHTS: [f64; 10] = [
        0.152_753_387_130_725_85,
        0.149_172_986_472_603_74,
        0.142_096_109_318_382_05,
        0.131_688_638_449_176_63,
        0.118_194_531_961_518_42,
        0.101_930_119_817_240_44,
        0.083_276_741_576_704_75,
        0.062_672_048_334_109_06,
        0.040_601_429_800_386_94,
        0.017_614_007_139_152_12,
    ];
    let (middle, half) = (0.5 * (low + high), 0.5 * (high - low));
    for (node, weight) in NODES.iter().zip(WEIGHTS) {
        visit(middle - half * node, half * weight);
        visit(middle + half * node, half * weight);
    }
}

impl Prior for Truncated {
    fn family(&self) -> &'static str {
        self.prior.family()
    }
    fn arguments(&self) -> Vec<f64> {
        self.prior.arguments()
    }
    fn within(&self) -> Option<(f64, f64)> {
        Some((self.low, self.high))
    }
    fn log_density(&self, x: f64) -> f64 {
        if x >= self.low && x <= self.high {
            self.prior.log_density(x) - self.ln_mass
        } else {
            f64::NEG_INFINITY
        }
    }
    fn cdf(&self, x: f64) -> f64 {
        let (low, high) = self.support();
        if x <= low {
            0.0
        } else if x >= high {
            1.0
        } else {
            (interval_mass(&*self.prior, low, x) / self.mass).min(1.0)
        }
    }
    fn survival(&self, x: f64) -> f64 {
        let (low, high) = self.support();
        if x <= low {
            1.0
        } else if x >= high {
            0.0
        } else {
            (interval_mass(&*self.prior, x, high) / self.mass).min(1.0)
        }
    }
    fn quantile(&self, p: f64) -> f64 {
        let (low, high) = self.support();
        let p = p.clamp(0.0, 1.0);
        let below = self.prior.cdf(low);
        let x = if below + p * self.mass <= 0.5 {
            self.prior.quantile(below + p * self.mass)
        } else {
            self.prior.upper_quantile(self.prior.survival(high) + (1.0 - p) * self.mass)
        };
        x.clamp(low, high)
    }
    fn upper_quantile(&self, q: f64) -> f64 {
        let (low, high) = self.support();
        let q = q.clamp(0.0, 1.0);
        let above = self.prior.survival(high);
        let x = if above + q * self.mass <= 0.5 {
            self.prior.upper_quantile(above + q * self.mass)
        } else {
            self.prior.quantile(self.prior.cdf(low) + (1.0 - q) * self.mass)
        };
        x.clamp(low, high)
    }
    fn support(&self) -> (f64, f64) {
        let (low, high) = self.prior.support();
        (low.max(self.low), high.min(self.high))
    }
    fn mean(&self) -> f64 {
        self.mean
    }
    fn standard_deviation(&self) -> f64 {
        self.standard_deviation
    }
    fn shape(&self) -> PriorShape {
        match self.prior.shape() {
            PriorShape::Flat { .. } => {
                let (low, high) = self.support();
                PriorShape::Flat { low, high }
            }
            _ => PriorShape::Other,
        }
    }
    fn curvature(&self, x: f64) -> f64 {
        self.prior.curvature(x)
    }
}
