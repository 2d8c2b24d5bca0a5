//! From numbers to places on a canvas, and the round numbers between.

/// A linear or logarithmic scale.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Scale {
    low: f64,
    high: f64,
    start: f64,
    end: f64,
    logarithmic: bool,
}

impl Scale {
    /// `low` is drawn at `start`, `high` at `end`. A range without width is widened.
    pub(crate) fn linear((low, high): (f64, f64), (start, end): (f64, f64)) -> Scale {
        let (low, high) = if high > low { (low, high) } else { (low - 0.5, low + 0.5) };
        Scale { low, high, start, end, logarithmic: false }
    }

    /// The same with the logarithm of what is above 0.
    pub(crate) fn logarithmic((low, high): (f64, f64), ends: (f64, f64)) -> Scale {
        let (low, high) = if high > low { (low, high) } else { (low / 2.0, low * 2.0) };
        Scale { logarithmic: true, ..Scale::linear((low, high), ends) }
    }

    pub(crate) fn at(&self, value: f64) -> f64 {
        let part = if self.logarithmic {
            (value / self.low).ln() / (self.high / self.low).ln()
        } else {
            (value - self.low) / (self.high - self.low)
        };
        self.start + part * (self.end - self.start)
    }

    /// The place, moved to the nearer end where it lies beyond.
    pub(crate) fn clamped(&self, value: f64) -> f64 {
        self.at(value.clamp(self.low, self.high))
    }

    pub(crate) fn covers(&self, value: f64) -> bool {
        (self.low..=self.high).contains(&value)
    }

    pub(crate) fn ends(&self) -> (f64, f64) {
        (self.start, self.end)
    }

    /// Round numbers within the range, about `count` of them, with their labels.
    pub(crate) fn ticks(&self, count: usize) -> Vec<(f64, String)> {
        if self.logarithmic {
            return self.powers();
        }
        let step = step((self.high - self.low) / count.max(1) as f64);
        let decimals = (-step.log10().floor()).max(0.0) as usize;
        let first = (self.low / step - 1e-9).ceil() as i64;
        let last = (self.high / step + 1e-9).floor() as i64;
        (first..=last)
            .map(|index| {
                let value = index as f64 * step;
                let text = if step.abs() < 1e-3 || step.abs() >= 1e5 {
                    format!("{value:.0e}")
                } else {
                    format!("{value:.decimals$}")
                };
                (value, text.replace('-', "−"))
            })
            .collect()
    }

    fn powers(&self) -> Vec<(f64, String)> {
        let first = self.low.log10().floor() as i32;
        let last = self.high.log10().ceil() as i32;
        // Three labels a decade have no room over many.
        let digits: &[f64] = if self.high / self.low < 2e3 { &[1.0, 2.0, 5.0] } else { &[1.0] };
        let all = (first..=last).flat_map(|power| digits.iter().map(move |digit| digit * 10f64.powi(power)));
        let inside: Vec<f64> = all.filter(|value| self.covers(*value)).collect();
        inside.into_iter().map(|value| (value, format!("{value}"))).collect()
    }
}

/// The nearest of 1, 2, 5 times a power of ten that is not below.
fn step(rough: f64) -> f64 {
    let power = 10f64.powf(rough.log10().floor());
    let digit = [1.0, 2.0, 5.0, 10.0].into_iter().find(|digit| digit * power >= rough * (1.0 - 1e-9));
    digit.unwrap_or(10.0) * power
}

/// The range of finite numbers with a margin on both sides, as a share of its width.
pub(crate) fn range(values: impl IntoIterator<Item = f64>, margin: f64) -> (f64, f64) {
    let finite = values.into_iter().filter(|value| value.is_finite());
    let (low, high) = finite
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), value| (value.min(low), value.max(high)));
    if low > high {
        return (0.0, 1.0);
    }
    let width = if high > low { high - low } else { low.abs().max(1.0) };
    (low - margin * width, high + margin * width)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_inside() {
        let scale = Scale::linear((-0.23, 1.07), (0.0, 100.0));
        let labels: Vec<String> = scale.ticks(5).into_iter().map(|(_, label)| label).collect();
        assert_eq!(labels, ["0.0", "0.5", "1.0"]);
        let fine = Scale::linear((0.0, 0.04), (0.0, 1.0)).ticks(4);
        assert_eq!(fine.last().map(|(_, label)| label.as_str()), Some("0.04"));
        let powers: Vec<String> = Scale::logarithmic((0.5, 12.0), (0.0, 1.0))
            .ticks(0)
            .into_iter()
            .map(|(_, label)| label)
            .collect();
        assert_eq!(powers, ["0.5", "1", "2", "5", "10"]);
        assert_eq!(Scale::logarithmic((0.01, 100.0), (0.0, 1.0)).ticks(0).len(), 5);
        assert_eq!(Scale::linear((-2.0, -1.0), (0.0, 1.0)).ticks(1)[0].1, "−2");
    }

    #[test]
    fn a_scale_meets_its_ends() {
        let scale = Scale::linear((2.0, 4.0), (100.0, 0.0));
        assert_eq!((scale.at(2.0), scale.at(4.0), scale.clamped(9.0)), (100.0, 0.0, 0.0));
        let log = Scale::logarithmic((1.0, 100.0), (0.0, 10.0));
        assert!((log.at(10.0) - 5.0).abs() < 1e-12);
        assert!(Scale::linear((1.0, 1.0), (0.0, 1.0)).at(1.0).is_finite());
    }

    #[test]
    fn ranges_ignore_what_is_no_number() {
        assert_eq!(range([f64::NAN, 1.0, 3.0], 0.5), (0.0, 4.0));
        assert_eq!(range([], 0.1), (0.0, 1.0));
    }
}
