//! Every term against a brute-force integral over the directions of one wavevector, with tracers at their places.
//!
//! For a spectrum that is a spike at k, ∫k²dk/2π² P(k) drops out and ξₗ is Σ weight × k^m s^p j(ks). The brute force
//! averages Δ₁Δ₂* e^(−ik·s) over the directions of k for each direction of s, and projects on Legendre polynomials;
//! nothing of the formulas of this module enters it.

use super::*;
use oddwell_cosmology::{gauss_legendre, legendre, spherical_bessel};

const K: f64 = 0.08;
const S: f64 = 37.0;

fn pair() -> PairState {
    PairState {
        bias: [2.1, 1.3],
        magnification_bias: [0.55, 0.2],
        response: [0.7, -1.9],
        bias_drift: [-3e-4, 2e-4],
        rate: 0.71,
        rate_drift: 1.1e-4,
        growth_drift: -2.3e-4,
        hubble: 4e-4,
        reduced_distance: 950.0,
        matter_fraction: 0.52,
        shift: 0.04,
        fraction: 0.3,
    }
}

const NOTHING: Effects = Effects {
    doppler: true,
    acceleration: true,
    gravitational_redshift: true,
    offset: true,
    wide_angle: false,
    light_cone: false,
    lensing: false,
};

/// What is displaced, and by how much of its true size: the brute force takes differences in these.
#[derive(Clone, Copy, Default)]
struct Switches {
    hubble: f64,
    shift: f64,
    inverse_distance: f64,
    drift: f64,
}

fn add(a: [f64; 3], b: [f64; 3], scale: f64) -> [f64; 3] {
    std::array::from_fn(|i| a[i] + scale * b[i])
}

fn inner(a: [f64; 3], b: [f64; 3]) -> f64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}

/// ξ(s, ν) of the spike: ¼π ∫dΩ Δ₁Δ₂* e^(−ik·s), real part.
fn correlation(pair: &PairState, switches: Switches, nu: f64) -> f64 {
    let sight = [0.0, 0.0, 1.0];
    // The second tracer's redshifts lie higher, so it is seen Δ farther along n than it is.
    let seen = [S * (1.0 - nu * nu).sqrt(), 0.0, S * nu];
    let separation = add(seen, sight, -switches.shift * pair.shift);
    let t = pair.fraction;
    let epsilon = switches.inverse_distance / pair.reduced_distance;
    // Directions to the tracers from an observer 1/ε away: n + ε(x − (x·n) n) and its length, all orders.
    let direction = |place: [f64; 3]| {
        let vector = add(sight, place, epsilon);
        let length = inner(vector, vector).sqrt();
        vector.map(|component| component / length)
    };
    let n1 = direction(separation.map(|x| -t * x));
    let n2 = direction(separation.map(|x| (1.0 - t) * x));
    let along = separation[2];
    let depth = [-t * along * switches.drift, (1.0 - t) * along * switches.drift];
    let bias: [f64; 2] = std::array::from_fn(|i| pair.bias[i] + pair.bias_drift[i] * depth[i]);
    let rate = depth.map(|depth| pair.rate + pair.rate_drift * depth);
    let growth = depth.map(|depth| 1.0 + pair.growth_drift * depth);
    let h = switches.hubble * pair.hubble / K;

    let rule = gauss_legendre(40);
    let turns = 64;
    let mut sum = 0.0;
    for (&cosine, &weight) in rule.nodes.iter().zip(&rule.weights) {
        let sine = (1.0 - cosine * cosine).sqrt();
        for turn in 0..turns {
            let angle = std::f64::consts::TAU * (f64::from(turn) + 0.5) / f64::from(turns);
            let k = [sine * angle.cos(), sine * angle.sin(), cosine];
            let (mu1, mu2) = (inner(k, n1), inner(k, n2));
            let (x1, y1) = (growth[0] * (bias[0] + rate[0] * mu1 * mu1), h * mu1 * pair.response[0]);
            let (x2, y2) = (growth[1] * (bias[1] + rate[1] * mu2 * mu2), h * mu2 * pair.response[1]);
            let (real, imaginary) = (x1 * x2 + y1 * y2, y1 * x2 - x1 * y2);
            let phase = -K * inner(k, separation);
            sum += weight / f64::from(turns) * 0.5 * (real * phase.cos() - imaginary * phase.sin());
        }
    }
    sum
}

fn multipole(order: u8, function: impl Fn(f64) -> f64) -> f64 {
    let rule = gauss_legendre(24);
    let values = rule.nodes.iter().zip(&rule.weights);
    let sum: f64 = values.map(|(&nu, weight)| weight * legendre(usize::from(order), nu) * function(nu)).sum();
    (2.0 * f64::from(order) + 1.0) / 2.0 * sum
}

/// The part of the brute-force multipole that is odd in `switches`: first order, with cubic corrections.
fn first_order(order: u8, pair: &PairState, plus: Switches, minus: Switches) -> f64 {
    multipole(order, |nu| 0.5 * (correlation(pair, plus, nu) - correlation(pair, minus, nu)))
}

fn spike(order: u8, pair: &PairState, effects: &Effects) -> f64 {
    let weights = Weights::new(pair, effects).of(Space::Separation, order);
    let components = components(Space::Separation, order).iter().zip(weights);
    components
        .map(|(component, weight)| match *component {
            Component::Transform { wavenumber, separation, order } => {
                weight * K.powi(wavenumber) * S.powi(separation as i32) * spherical_bessel(order, K * S)
            }
            _ => unreachable!("separations have transforms only"),
        })
        .sum()
}

fn plain() -> PairState {
    PairState { shift: 0.0, response: [0.0; 2], ..pair() }
}

fn close(got: f64, expected: f64, tolerance: f64, what: &str) {
    assert!(expected.abs() > 1e-9, "{what}: nothing to compare");
    let off = (got / expected - 1.0).abs();
    assert!(off < tolerance, "{what}: {got:e} against {expected:e}, off by {off:.1e}");
}

#[test]
fn even_multipoles() {
    for order in [0, 2, 4] {
        let brute = multipole(order, |nu| correlation(&plain(), Switches::default(), nu));
        // Quadrature is exact to rounding at this ks.
        close(spike(order, &plain(), &NOTHING), brute, 1e-11, "even multipole");
    }
}

#[test]
fn doppler_and_gravitational_redshift_terms() {
    let pair = PairState { shift: 0.0, ..pair() };
    let switch = |hubble| Switches { hubble, ..Switches::default() };
    for order in [1, 3] {
        let brute = first_order(order, &pair, switch(1.0), switch(-1.0));
        close(spike(order, &pair, &NOTHING), brute, 1e-10, "order H/k");
    }
}

#[test]
fn redshift_offset() {
    let pair = PairState { response: [0.0; 2], ..pair() };
    let switch = |shift| Switches { shift, ..Switches::default() };
    for order in [1, 3] {
        let brute = first_order(order, &pair, switch(1.0), switch(-1.0));
        // Cubic corrections: (kΔ)²/6 = 2e-6, with factors of a few.
        close(spike(order, &pair, &NOTHING), brute, 2e-5, "offset");
    }
}

#[test]
fn wide_angle_terms_for_every_sight_line() {
    let effects = Effects { wide_angle: true, ..NOTHING };
    for fraction in [0.0, 0.3, 0.5, 1.0] {
        let pair = PairState { fraction, ..plain() };
        // A hundredth of 1/r̃: cubic corrections of (0.01 s/r̃)² = 1.5e-7.
        let switch = |inverse_distance| Switches { inverse_distance, ..Switches::default() };
        for order in [1, 3] {
            let brute = 100.0 * first_order(order, &pair, switch(0.01), switch(-0.01));
            close(spike(order, &pair, &effects), brute, 2e-6, "wide angle");
        }
    }
}

#[test]
fn light_cone_terms_for_every_sight_line() {
    let effects = Effects { light_cone: true, ..NOTHING };
    for fraction in [0.0, 0.3, 0.5, 1.0] {
        let pair = PairState { fraction, ..plain() };
        // A hundredth of the drifts: cubic corrections of (0.01 s ḋ)² = 1e-8.
        let switch = |drift| Switches { drift, ..Switches::default() };
        for order in [1, 3] {
            let brute = 100.0 * first_order(order, &pair, switch(0.01), switch(-0.01));
            close(spike(order, &pair, &effects), brute, 1e-6, "light cone");
        }
    }
}

/// J₀ by its integral over an angle (DLMF 10.9.1): 64 points are exact to rounding for arguments below 20.
fn cylinder_bessel(x: f64) -> f64 {
    let angles = (0..64).map(|i| std::f64::consts::PI * (f64::from(i) + 0.5) / 64.0);
    angles.map(|angle| (x * angle.sin()).cos()).sum::<f64>() / 64.0
}

/// The farther tracer is magnified by the matter around the nearer one: κ = (3/2) Ωm H² × (distance behind the lens) ×
/// projected density, so that (5s−2)κ of one correlates with b δ of the other, on whichever side ν puts it. The projected
/// correlation of the spike is ∫dy ξ(√(y²+s⊥²)) = (π/k²)·J₀(ks⊥)·k²dk/2π²·P·… per unit of ∫k²dk/2π² P.
#[test]
fn lensing_terms() {
    let pair = PairState { response: [0.0; 2], shift: 0.0, ..pair() };
    let effects = Effects { lensing: true, ..NOTHING };
    let kappa = 1.5 * pair.matter_fraction * pair.hubble * pair.hubble;
    // ∫kdk/2π P J₀ = ∫k²dk/2π² P (π/k) J₀.
    let projected = |nu: f64| std::f64::consts::PI / K * cylinder_bessel(K * S * (1.0 - nu * nu).sqrt());
    let behind = |nu: f64| {
        let (lens, source) = if nu > 0.0 { (0, 1) } else { (1, 0) };
        pair.bias[lens] * (5.0 * pair.magnification_bias[source] - 2.0) * kappa * S * nu.abs() * projected(nu)
    };
    for order in [1, 3] {
        // The integrand has a kink at ν = 0: integrate each side.
        let rule = gauss_legendre(24).on(0.0, 1.0);
        let sides = rule
            .nodes
            .iter()
            .zip(&rule.weights)
            .map(|(&nu, weight)| weight * legendre(usize::from(order), nu) * (behind(nu) - behind(-nu)));
        let brute = (2.0 * f64::from(order) + 1.0) / 2.0 * sides.sum::<f64>();
        close(spike(order, &pair, &effects), brute, 1e-10, "lensing");
    }
}

/// The Fourier terms are the transforms of the terms in separation: −∂/∂k of s j₀ and so on, by parts. Checked on a
/// smooth spectrum P = k e^(−(k/κ)²) with ⟦·⟧ over both sides at one separation.
#[test]
fn fourier_and_separation_terms_are_transforms_of_each_other() {
    let effects = Effects { wide_angle: true, light_cone: true, lensing: true, ..NOTHING };
    let kappa = 0.1;
    let power = |k: f64| k * (-(k / kappa).powi(2)).exp();
    let slope = |k: f64| (1.0 - 2.0 * (k / kappa).powi(2)) * (-(k / kappa).powi(2)).exp();
    let panels: Vec<f64> = (0..=40).map(|i| 0.02 * f64::from(i)).collect();
    let rule = oddwell_cosmology::composite(&panels, 16);
    for order in [1_u8, 3] {
        let weights = Weights::new(&pair(), &effects);
        let separation = weights.of(Space::Separation, order);
        let fourier = weights.of(Space::Fourier, order);
        let (mut direct, mut transformed) = (0.0, 0.0);
        for (&k, weight) in rule.nodes.iter().zip(&rule.weights) {
            let measure = weight * k * k / (2.0 * std::f64::consts::PI.powi(2));
            for (component, weight) in components(Space::Separation, order).iter().zip(separation) {
                if let Component::Transform { wavenumber, separation, order } = *component {
                    let bessel = spherical_bessel(order, k * S);
                    direct +=
                        measure * weight * k.powi(wavenumber) * power(k) * S.powi(separation as i32) * bessel;
                }
            }
            let mut spectrum = 0.0;
            for (component, weight) in components(Space::Fourier, order).iter().zip(fourier) {
                spectrum += weight
                    * match *component {
                        Component::Power { wavenumber } => k.powi(wavenumber) * power(k),
                        _ => slope(k),
                    };
            }
            let sign = if order == 1 { 1.0 } else { -1.0 };
            transformed += sign * measure * spectrum * spherical_bessel(usize::from(order), k * S);
        }
        // Quadrature of smooth functions, exact to rounding but for the lower end, where the integrand starts as k.
        close(transformed, direct, 1e-9, "transform");
    }
}
