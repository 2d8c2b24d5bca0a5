//! Spherical Bessel functions and quadrature together, on Hankel integrals with a closed form.

// A panic is how a test fails; the lint's own exception covers the test functions, not their helpers.
#![allow(clippy::unwrap_used, clippy::panic)]

mod common;

use std::f64::consts::PI;

use common::{close, near};
use oddwell_cosmology::{composite, spherical_bessel};

/// Panels of half a period of jₗ(βx), or of one unit where that is shorter, up to where e^(−αx) is 1e-21.
fn half_line(alpha: f64, beta: f64, f: impl Fn(f64) -> f64) -> f64 {
    let width = (PI / beta).min(1.0 / alpha);
    let panels = (50.0 / alpha / width).ceil() as usize;
    let edges: Vec<f64> = (0..=panels).map(|i| i as f64 * width).collect();
    composite(&edges, 12).integrate(|x| (-alpha * x).exp() * f(x))
}

fn factorial(n: usize) -> f64 {
    (1..=n).map(|i| i as f64).product()
}

/// Gradshteyn & Ryzhik, 6.623.1 and 6.623.2, with ν = l + 1/2 and J = √(2βx/π) jₗ(βx):
///
/// ∫ e^(−αx) x^(l+1) jₗ(βx) dx = (2β)ˡ l!/(α²+β²)^(l+1),
/// ∫ e^(−αx) x^(l+2) jₗ(βx) dx = 2α (2β)ˡ (l+1)!/(α²+β²)^(l+2).
///
/// With β/α = 20 the result is about 20^(−l−1) of the integral of the modulus, so 1e-16 of that is 1e-10 of the
/// result for l = 4; the tolerance is 4e-15 of the modulus (nodes, weights and function are each off by a last digit or
/// two), ∫ e^(−αx) x^(l+1) dx/(βx) at most.
#[test]
fn gradshteyn_ryzhik_6_623() {
    for order in 0..=4 {
        let l = order as i32;
        for (alpha, beta) in [(1.0, 0.3), (1.0, 2.0), (0.5, 10.0), (3.0, 1.0)] {
            let square = alpha * alpha + beta * beta;
            let bessel = |x: f64| spherical_bessel(order, beta * x);
            let first = half_line(alpha, beta, |x| x.powi(l + 1) * bessel(x));
            let expected = f64::powi(2.0 * beta, l) * factorial(order) / square.powi(l + 1);
            let modulus = factorial(order) / (beta * alpha.powi(l + 1));
            near(first, expected, 4e-15 * modulus + 1e-13 * expected, ("6.623.1", order, alpha, beta));
            let second = half_line(alpha, beta, |x| x.powi(l + 2) * bessel(x));
            let expected = 2.0 * alpha * f64::powi(2.0 * beta, l) * factorial(order + 1) / square.powi(l + 2);
            let modulus = factorial(order + 1) / (beta * alpha.powi(l + 2));
            near(second, expected, 4e-15 * modulus + 1e-13 * expected, ("6.623.2", order, alpha, beta));
        }
    }
}

/// Gradshteyn & Ryzhik, 6.621.1: ∫ e^(−αx) J_ν(βx) x^(μ−1) dx = (β/2α)^ν Γ(ν+μ)/(α^μ Γ(ν+1)) ₂F₁((ν+μ)/2, (ν+μ+1)/2;
/// ν+1; −β²/α²). With ν = l + 1/2, μ = n + 3/2 and J = √(2βx/π) jₗ(βx) the left side is
/// √(2β/π) ∫ e^(−αx) x^(n+1) jₗ(βx) dx, and ν + μ = l + n + 2. The series converges for β < α.
#[test]
fn gradshteyn_ryzhik_6_621() {
    for order in 0..=4usize {
        for n in 0..=2usize {
            for (alpha, beta) in [(1.0f64, 0.6f64), (2.0, 0.5)] {
                let found =
                    half_line(alpha, beta, |x| x.powi(n as i32 + 1) * spherical_bessel(order, beta * x));
                let nu = order as f64 + 0.5;
                let sum = (order + n + 2) as f64;
                // Γ(l + 3/2) = (2l+1)!!/2^(l+1) √π.
                let gamma = (0..=order).map(|i| i as f64 + 0.5).product::<f64>() * PI.sqrt();
                let (first, second, third) = (0.5 * sum, 0.5 * (sum + 1.0), nu + 1.0);
                let argument = -(beta / alpha).powi(2);
                let (mut term, mut series) = (1.0, 1.0);
                for i in 0..400 {
                    let i = i as f64;
                    term *= (first + i) * (second + i) / ((third + i) * (1.0 + i)) * argument;
                    series += term;
                }
                let power = (beta / (2.0 * alpha)).powf(nu) * factorial(order + n + 1)
                    / gamma
                    / alpha.powf(n as f64 + 1.5)
                    * series;
                // The series alternates with terms up to 30 times its sum.
                close(found * (2.0 * beta / PI).sqrt(), power, 1e-12, (order, n, alpha, beta));
            }
        }
    }
}

/// ∫ k² e^(−k²d²) j₀(ks) dk = √π/(4d³) e^(−s²/4d²), and by the recurrence of Gaussian moments for l = 1 to 4
/// ∫ k^(2+l) e^(−k²d²) jₗ(ks) dk = √π/(4d³) (s/2d²)ˡ e^(−s²/4d²) (Gradshteyn & Ryzhik 6.631.4 with ν = l + 1/2).
///
/// The result is e^(−s²/4d²) of the integrand's size: the tolerance is 1e-15 of the integral of k^(2+l) e^(−k²d²)/(ks),
/// about half Γ((l+2)/2) d^(−l−2)/s, plus 1e-13 of the result.
#[test]
fn gaussian_transforms() {
    for order in 0..=4usize {
        for (d, s) in [(1.0f64, 0.1f64), (1.0, 2.0), (0.5, 4.0), (3.0, 20.0)] {
            let l = order as i32;
            let top = 8.0 / d;
            let panels = (top * s / PI).ceil().max(8.0) as usize;
            let edges: Vec<f64> = (0..=panels).map(|i| top * i as f64 / panels as f64).collect();
            let found = composite(&edges, 16)
                .integrate(|k| k.powi(l + 2) * (-(k * d).powi(2)).exp() * spherical_bessel(order, k * s));
            let expected =
                PI.sqrt() / (4.0 * d.powi(3)) * (s / (2.0 * d * d)).powi(l) * (-s * s / (4.0 * d * d)).exp();
            let modulus = 1.0 / (d.powi(l + 2) * s);
            near(found, expected, 1e-15 * modulus + 1e-13 * expected, (order, d, s));
        }
    }
}
