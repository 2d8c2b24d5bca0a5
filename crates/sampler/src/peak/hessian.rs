//! Gradient and curvature of a function by central differences, with steps that fit its curvature.

use nalgebra::{DMatrix, DVector};

/// Step in units of the conditional standard deviation 1/√(−f″): the log density falls by 0.005, far above rounding
/// (1e-12 for |f| near 1e4) and above the noise of a numerical model (1e-6), while the next term of the expansion,
/// step² f⁗/12, stays near 0.1 % for a moderately skewed density.
const STEP: f64 = 0.1;

/// Steps of the gradient, in units of those of the curvature: its truncation error h² f‴/6 moves the peak, so it has to be
/// much smaller, while a first difference loses fewer digits to rounding.
const GRADIENT_SHARE: f64 = 0.2;

/// Finds, for each coordinate, a step of about a tenth of the conditional standard deviation.
///
/// Starts from `steps`; a few rounds of two evaluations each suffice. Where the function is flat or rises on both sides
/// the step grows to at most 0.5 (coordinates are scaled by the prior).
pub(super) fn fit_steps(f: &mut dyn FnMut(&[f64]) -> f64, at: &[f64], value: f64, steps: &mut [f64]) {
    const LARGEST: f64 = 0.5;
    const SMALLEST: f64 = 1e-9;
    let mut u = at.to_vec();
    for i in 0..at.len() {
        for _ in 0..12 {
            let h = steps[i];
            u[i] = at[i] + h;
            let up = f(&u);
            u[i] = at[i] - h;
            let down = f(&u);
            let curvature = -(up + down - 2.0 * value) / (h * h);
            let next = if !curvature.is_finite() {
                h * 0.1
            } else if curvature <= 1e-10 * value.abs().max(1.0) / (h * h) {
                h * 10.0
            } else {
                STEP / curvature.sqrt()
            };
            let next = next.clamp(SMALLEST, LARGEST);
            steps[i] = next;
            if next > 0.5 * h && next < 2.0 * h {
                break;
            }
        }
        u[i] = at[i];
    }
}

/// Gradient by central differences over a fifth of `steps`: 2n evaluations.
pub(super) fn gradient(f: &mut dyn FnMut(&[f64]) -> f64, at: &[f64], steps: &[f64]) -> DVector<f64> {
    let mut u = at.to_vec();
    DVector::from_fn(at.len(), |i, _| {
        let h = GRADIENT_SHARE * steps[i];
        u[i] = at[i] + h;
        let up = f(&u);
        u[i] = at[i] - h;
        let down = f(&u);
        u[i] = at[i];
        (up - down) / (2.0 * h)
    })
}

/// Negative second derivatives by central differences: n² + n evaluations.
///
/// Mixed derivatives from [f(+,+) + f(−,−) − f(+i) − f(−i) − f(+j) − f(−j) + 2f] / (2 hᵢ hⱼ) (Abramowitz & Stegun 1964,
/// 25.3.27).
pub(super) fn curvature(
    f: &mut dyn FnMut(&[f64]) -> f64,
    at: &[f64],
    value: f64,
    steps: &[f64],
) -> DMatrix<f64> {
    let n = at.len();
    let mut u = at.to_vec();
    let (mut up, mut down) = (vec![0.0; n], vec![0.0; n]);
    for i in 0..n {
        u[i] = at[i] + steps[i];
        up[i] = f(&u);
        u[i] = at[i] - steps[i];
        down[i] = f(&u);
        u[i] = at[i];
    }
    let mut curvature = DMatrix::zeros(n, n);
    for i in 0..n {
        curvature[(i, i)] = -(up[i] + down[i] - 2.0 * value) / (steps[i] * steps[i]);
        for j in 0..i {
            u[i] = at[i] + steps[i];
            u[j] = at[j] + steps[j];
            let both_up = f(&u);
            u[i] = at[i] - steps[i];
            u[j] = at[j] - steps[j];
            let both_down = f(&u);
            u[i] = at[i];
            u[j] = at[j];
            let sum = both_up + both_down - up[i] - down[i] - up[j] - down[j] + 2.0 * value;
            let mixed = -sum / (2.0 * steps[i] * steps[j]);
            curvature[(i, j)] = mixed;
            curvature[(j, i)] = mixed;
        }
    }
    curvature
}
