//! How odds depend on the width of the departure's prior.

use crate::density_ratio::ConditionalDensities;
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// Where the width that turns the odds lies within this factor of the one used, the prior decides.
pub const DECISIVE_FACTOR: f64 = 3.0;

/// Log odds smaller than this are none: a curve that only grazes 0 does not turn there.
const NONE: f64 = 0.01;

/// The odds for a hypothesis against the one it contains, over widths of the prior of its departure.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct WidthCurve {
    /// Widths in units of the one used, rising.
    pub factors: Vec<f64>,
    /// ln of the ratio of evidences at each.
    pub log_odds: Vec<f64>,
}

/// A width at which the odds turn.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize, JsonSchema)]
pub struct Turning {
    /// In units of the width used.
    pub factor: f64,
    /// Whether wider priors than this favour the contained hypothesis.
    pub wider_favours_contained: bool,
}

/// What a ratio of evidences comes to.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(rename_all = "kebab-case")]
pub enum Verdict {
    /// The width that turns the odds lies too close to the one used.
    ThePriorDecides,
    /// The larger hypothesis, at the width used and at any within the factor.
    Departure,
    /// The hypothesis that it contains, likewise.
    Contained,
}

/// The curve from a thousandth to a thousand times the width used, from densities that are known already.
pub fn width_curve(densities: &ConditionalDensities) -> WidthCurve {
    const EACH_SIDE: i32 = 60;
    let factors: Vec<f64> = (-EACH_SIDE..=EACH_SIDE).map(|step| 10f64.powf(f64::from(step) / 20.0)).collect();
    let log_odds = factors.iter().map(|factor| densities.log_odds_at(*factor)).collect();
    WidthCurve { factors, log_odds }
}

impl WidthCurve {
    /// Where the log odds, raised by `shift`, change sign closest to the width used; `None` where they never do.
    ///
    /// `shift` is the logarithm of the prior odds, where they are not even.
    pub fn turning(&self, shift: f64) -> Option<Turning> {
        let mut found: Option<Turning> = None;
        let mut last: Option<(f64, f64)> = None;
        for (factor, log_odds) in self.factors.iter().zip(&self.log_odds) {
            let value = log_odds + shift;
            if !value.is_finite() || value.abs() < NONE {
                continue;
            }
            if let Some((before, at_before)) = last.filter(|(_, other)| other.signum() != value.signum()) {
                let share = at_before / (at_before - value);
                let log = before.ln() + share * (factor.ln() - before.ln());
                let turning = Turning { factor: log.exp(), wider_favours_contained: value < 0.0 };
                if found.is_none_or(|known: Turning| log.abs() < known.factor.ln().abs()) {
                    found = Some(turning);
                }
            }
            last = Some((*factor, value));
        }
        found
    }

    /// The width of largest odds, and their logarithm.
    pub fn largest(&self) -> Option<(f64, f64)> {
        let points = self.factors.iter().copied().zip(self.log_odds.iter().copied());
        points.filter(|(_, value)| value.is_finite()).max_by(|a, b| a.1.total_cmp(&b.1))
    }

    /// What the odds come to, with prior odds as in [`WidthCurve::turning`]. `log_odds` are those at the width used.
    pub fn verdict(&self, log_odds: f64, shift: f64) -> Verdict {
        let close = |turning: Turning| turning.factor.ln().abs() <= DECISIVE_FACTOR.ln();
        if self.turning(shift).is_some_and(close) || (log_odds + shift).abs() < NONE {
            Verdict::ThePriorDecides
        } else if log_odds + shift > 0.0 {
            Verdict::Departure
        } else {
            Verdict::Contained
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// One measurement at z standard deviations from the point, prior wider by w: odds √(1/(1 + w²)) exp(½ z² w²/(1 + w²)).
    fn curve(z: f64, used: f64) -> WidthCurve {
        let factors: Vec<f64> = (-60..=60).map(|step| 10f64.powf(f64::from(step) / 20.0)).collect();
        let log_odds = factors
            .iter()
            .map(|factor| {
                let w2 = (used * factor).powi(2);
                -0.5 * w2.ln_1p() + 0.5 * z * z * w2 / (1.0 + w2)
            })
            .collect();
        WidthCurve { factors, log_odds }
    }

    /// 3 standard deviations: the odds turn where ln(1 + w²) = 9 w²/(1 + w²), w = 89.5.
    #[test]
    fn odds_turn_where_they_should() {
        let turning = curve(3.0, 1.0).turning(0.0).unwrap();
        let w2 = turning.factor.powi(2);
        // The curve is interpolated over steps of 12 %.
        assert!((w2.ln_1p() / (9.0 * w2 / (1.0 + w2)) - 1.0).abs() < 1e-3);
        assert!(turning.wider_favours_contained);
        assert_eq!(curve(3.0, 1.0).verdict(curve(3.0, 1.0).log_odds[60], 0.0), Verdict::Departure);
        assert_eq!(curve(3.0, 60.0).verdict(curve(3.0, 60.0).log_odds[60], 0.0), Verdict::ThePriorDecides);
        // Below one standard deviation no width favours the departure.
        assert!(curve(0.5, 1.0).turning(0.0).is_none());
        assert_eq!(curve(0.5, 5.0).verdict(curve(0.5, 5.0).log_odds[60], 0.0), Verdict::Contained);
        // The largest odds are at w² = z² − 1: exp((z² − 1)/2)/z.
        let (factor, largest) = curve(3.0, 1.0).largest().unwrap();
        assert!((factor - 8f64.sqrt()).abs() < 0.2 && (largest - (4.0 - 3f64.ln())).abs() < 1e-3);
    }

    /// Prior odds move the width that turns.
    #[test]
    fn prior_odds_shift_the_turning() {
        let fair = curve(3.0, 10.0).turning(0.0).unwrap().factor;
        let wary = curve(3.0, 10.0).turning(-(3f64.ln())).unwrap().factor;
        assert!((fair / wary - 3.0).abs() < 0.05, "{fair} {wary}");
    }
}
