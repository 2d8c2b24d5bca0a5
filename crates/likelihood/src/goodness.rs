//! How surprising a χ² is.

use statrs::distribution::{ChiSquared, Continuous, ContinuousCDF, FisherSnedecor};

/// The probability of a χ² at least this large.
///
/// With a known covariance, χ² of ν degrees of freedom. With one estimated from n_s mocks (divisor n_s − 1),
/// χ² (n_s − ν)/[ν (n_s − 1)] follows F(ν, n_s − ν): Hotelling 1931, Ann. Math. Stat. 2, 360. After a fit of p linear
/// parameters by least squares the remaining χ² is exactly that of n_d − p contrasts of the data, so ν = n_d − p in
/// both; where priors hold some of the parameters, ν is n_d less the effective number
/// ([`effective_parameters`](crate::effective_parameters)), and the distribution is approximate.
///
/// `None` where the question has no answer: ν ≤ 0, n_s ≤ ν, χ² negative or not finite.
pub fn chi_squared_p_value(
    chi_squared: f64,
    degrees_of_freedom: f64,
    mock_count: Option<usize>,
) -> Option<f64> {
    tails(chi_squared, degrees_of_freedom, mock_count.map(|mocks| mocks as f64)).map(|(_, upper)| upper)
}

/// The probabilities of a χ² at most and at least this large; the number of mocks need not be whole.
pub(crate) fn tails(chi_squared: f64, degrees_of_freedom: f64, mocks: Option<f64>) -> Option<(f64, f64)> {
    if !(chi_squared.is_finite() && chi_squared >= 0.0 && degrees_of_freedom > 0.0) {
        return None;
    }
    match mocks {
        None => {
            let distribution = ChiSquared::new(degrees_of_freedom).ok()?;
            Some((distribution.cdf(chi_squared), distribution.sf(chi_squared)))
        }
        Some(mocks) => {
            let spare = mocks - degrees_of_freedom;
            let ratio = chi_squared * spare / (degrees_of_freedom * (mocks - 1.0));
            let distribution = FisherSnedecor::new(degrees_of_freedom, spare).ok()?;
            Some((distribution.cdf(ratio), distribution.sf(ratio)))
        }
    }
}

/// Plain rows below which [`upper_tail_of_sum`] interpolates.
const FEWEST: f64 = 0.1;

/// The probability of a sum at least this large of two independent parts: χ² of `noise_rows` degrees of freedom with a
/// covariance from `mocks` mocks (as [`tails`] has it), and plain χ² of `other_rows`. Neither number need be whole.
///
/// By Simpson's rule over the plain part, 400 steps, good to 10⁻⁵ of itself (10⁻³ for less than a tenth of a row);
/// `None` as [`tails`].
pub(crate) fn upper_tail_of_sum(sum: f64, noise_rows: f64, mocks: f64, other_rows: f64) -> Option<f64> {
    // The plain part's density is then too steep at 0 for any rule; but the tail is smooth in its number of rows.
    if other_rows < FEWEST {
        let (_, none) = tails(sum, noise_rows, Some(mocks))?;
        let some = upper_tail_of_sum(sum, noise_rows, mocks, FEWEST)?;
        return Some(none + (some - none) * other_rows.max(0.0) / FEWEST);
    }
    if noise_rows < 1e-3 {
        return tails(sum, other_rows, None).map(|(_, upper)| upper);
    }
    let (_, beyond) = tails(sum, other_rows, None)?;
    tails(sum, noise_rows, Some(mocks))?;
    if sum == 0.0 {
        return Some(1.0);
    }
    let plain = ChiSquared::new(other_rows).ok()?;
    // ∫ f(y) P(X > sum − y) dy over y in [0, sum], y = sum (sin φ)^2β. At the lower end f ∝ y^(k/2 − 1) makes the integrand go
    // as φ^(βk − 1), at the upper end P(X > x) goes as x^(q/2), x as the square of the distance: with βk of 4 or more, smooth
    // enough.
    let steps = 400;
    let width = std::f64::consts::FRAC_PI_2 / f64::from(steps);
    let power = (4.0 / other_rows).max(1.0);
    let integrand = |step: u32| {
        let (sin, cos) = (f64::from(step) * width).sin_cos();
        let y = sum * sin.powf(2.0 * power);
        if step == 0 || step == steps || y == 0.0 {
            return 0.0;
        }
        let above = tails((sum - y).max(0.0), noise_rows, Some(mocks)).map_or(1.0, |(_, upper)| upper);
        // f(y) dy/dφ, y f(y) by itself finite.
        plain.pdf(y) * y * above * 2.0 * power * cos / sin
    };
    let inner: f64 = (1..steps).map(|step| f64::from(2 + 2 * (step % 2)) * integrand(step)).sum();
    Some((beyond + inner * width / 3.0).min(1.0))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Of two parts with a known covariance the sum is χ² of all rows; with mocks, a part that vanishes leaves the other.
    #[test]
    fn tails_of_sums() {
        for (noise, other) in [(3.0, 2.0), (0.7, 12.0), (10.0, 0.6), (25.0, 40.0), (4.0, 1.0), (1.0, 1.0)] {
            for quantile in [0.3, 1.0, 1.7, 2.5] {
                let sum = (noise + other) * quantile;
                let (_, wanted) = tails(sum, noise + other, None).unwrap();
                let found = upper_tail_of_sum(sum, noise, 1e9, other).unwrap();
                // 1e9 mocks: the F is off by 10⁻⁸ or so.
                assert!((found / wanted - 1.0).abs() < 1e-5, "{noise}, {other}, {sum}: {found} {wanted}");
            }
        }
        // SciPy 1.17.1: chi2.sf + quad of f.sf(·) over chi2's quantiles.
        for (sum, noise, mocks, other, wanted) in [
            (20.0, 8.0, 30.0, 2.0, 0.16111995844932556),
            (35.0, 12.0, 24.0, 4.0, 0.31142076361303045),
            (15.0, 3.3, 40.0, 5.7, 0.11435904030488098),
        ] {
            let found = upper_tail_of_sum(sum, noise, mocks, other).unwrap();
            assert!((found / wanted - 1.0).abs() < 1e-5, "{sum}: {found} {wanted}");
        }
        let alone = tails(20.0, 8.0, Some(30.0)).unwrap().1;
        for (little, wanted) in
            [(0.0, 1.0), (2e-3, 1.0003681851794093), (0.05, 1.009243183099054), (0.1, 1.018566992797861)]
        {
            let ratio = upper_tail_of_sum(20.0, 8.0, 30.0, little).unwrap() / alone;
            assert!((ratio - wanted).abs() < 1e-4, "{little}: {ratio}");
        }
        assert_eq!(upper_tail_of_sum(20.0, 31.0, 30.0, 2.0), None);
        assert_eq!(upper_tail_of_sum(0.0, 4.0, 30.0, 2.0), Some(1.0));
    }
}
