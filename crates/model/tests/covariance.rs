//! The Gaussian covariance against limits in closed form and against a plain transform of the Fourier covariance.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    clippy::print_stdout,
    reason = "a test stops at the first surprise"
)]

use nalgebra::DMatrix;
use oddwell_cosmology::{PowerShape, composite, spherical_bessel};
use oddwell_model::covariance::{Sampling, gaussian_covariance};
use oddwell_model::{
    BinSetup, Effects, FeltBy, Model, ModelSetup, Pair, Row, SightLine, Space, Workspace, departures,
};
use std::f64::consts::PI;

const SHELLS: [(f64, f64); 3] = [(24.0, 32.0), (32.0, 40.0), (96.0, 104.0)];

fn model(space: Space, edges: &[(f64, f64)], effects: Effects) -> (Model, Vec<f64>) {
    model_of(space, 0..=4, edges, effects)
}

fn model_of(
    space: Space,
    multipoles: std::ops::RangeInclusive<u8>,
    edges: &[(f64, f64)],
    effects: Effects,
) -> (Model, Vec<f64>) {
    let rows = multipoles
        .flat_map(|multipole| {
            edges.iter().map(move |&(low, high)| Row {
                bin: 0,
                pair: Pair::FirstSecond,
                multipole,
                space,
                at: 0.5 * (low + high),
                edges: Some((low, high)),
            })
        })
        .collect();
    let setup = ModelSetup {
        bins: vec![BinSetup {
            survey: "s".into(),
            name: "q".into(),
            nodes: vec![(0.15, 1.0)],
            sight_line: SightLine::Midpoint,
            growth_given: false,
            observed_slopes: [false; 2],
            fiducial: None,
        }],
        rows,
        power: PowerShape::EisensteinHu,
        effects,
        growth_index: false,
        smallest_damping: 1.0,
        departure: departures::find("none").unwrap(),
        felt_by: FeltBy::Light,
    };
    let model = Model::new(setup).unwrap();
    let mut values = model.layout().zeros();
    for (name, value) in [
        ("background.omega_m", 0.31),
        ("background.omega_b", 0.049),
        ("background.h", 0.68),
        ("background.n_s", 0.965),
        ("background.sigma8", 0.81),
        ("background.w0", -1.0),
        ("prediction.damping", 1.0),
        ("s.q.first.bias", 2.1),
        ("s.q.first.magnification", 0.9),
        ("s.q.first.evolution", -2.0),
        ("s.q.second.bias", 1.2),
        ("s.q.second.magnification", 0.1),
        ("s.q.second.evolution", 3.0),
    ] {
        values[model.layout().index(name).unwrap()] = value;
    }
    (model, values)
}

fn covariance(model: &Model, values: &[f64], sampling: &Sampling) -> DMatrix<f64> {
    gaussian_covariance(model, values, &mut Workspace::new(), 0, sampling).unwrap()
}

const NO_RESPONSE: Effects = Effects {
    doppler: false,
    acceleration: false,
    gravitational_redshift: false,
    offset: true,
    wide_angle: true,
    light_cone: true,
    lensing: true,
};

#[test]
fn where_galaxies_are_few_only_pairs_count() {
    let (model, values) = model(Space::Separation, &SHELLS, Effects::default());
    // n P = 1e-9 at most: everything but the pair count is below 1e-6 of it.
    let sampling = Sampling { volume: 1e9, first_density: 1e-13, second_density: 1e-13 };
    let covariance = covariance(&model, &values, &sampling);
    for (i, row) in model.setup().rows.iter().enumerate() {
        let (low, high) = row.edges.unwrap();
        let pairs = sampling.volume * 1e-26 * 4.0 * PI / 3.0 * (high.powi(3) - low.powi(3));
        let expected = (2.0 * f64::from(row.multipole) + 1.0) / pairs;
        assert!((covariance[(i, i)] / expected - 1.0).abs() < 1e-6, "{row:?}");
    }
}

#[test]
fn without_shot_noise_the_cosmic_variance_of_odd_multipoles_cancels_at_zeroth_order() {
    let sampling = Sampling { volume: 1e9, first_density: 1e12, second_density: 1e12 };
    let (plain, values) = model(Space::Separation, &SHELLS, NO_RESPONSE);
    let without = covariance(&plain, &values, &sampling);
    let (full, values) = model(Space::Separation, &SHELLS, Effects::default());
    let with = covariance(&full, &values, &sampling);
    for (i, row) in plain.setup().rows.iter().enumerate() {
        if row.multipole % 2 == 1 {
            assert!(without[(i, i)].abs() < 1e-9 * without[(0, 0)], "{row:?}");
            // … and the (H/k)² part, which is kept, is all there is.
            assert!(with[(i, i)] > 0.0, "{row:?}");
        }
    }
    // The odd–even blocks are first order in H/k: absent without a response.
    let (monopole, dipole) = (0, SHELLS.len());
    assert_eq!(without[(monopole, dipole)], 0.0);
    assert!(with[(monopole, dipole)].abs() > 0.0);
}

#[test]
fn it_is_symmetric_and_definite_in_both_spaces() {
    let sampling = Sampling { volume: 1e9, first_density: 3e-4, second_density: 6e-4 };
    for (space, edges) in
        [(Space::Separation, SHELLS), (Space::Fourier, [(0.02, 0.04), (0.04, 0.06), (0.1, 0.12)])]
    {
        let (model, values) = model(space, &edges, Effects::default());
        let covariance = covariance(&model, &values, &sampling);
        assert_eq!(covariance, covariance.transpose());
        assert!(covariance.clone().cholesky().is_some());
        let reversed = -covariance;
        assert!(reversed.cholesky().is_none(), "the check of definiteness can fail");
    }
}

/// Cov[ξₗ(s_i), ξₗ(s_j)] is the double transform of Cov[Pₗ, Pₗ], which is diagonal in k: with thin Fourier bins of N_k
/// modes, Σ_bins (k²Δk/2π²)² j̄ j̄ Cov[Pₗ]. Bins of 0.002 h/Mpc: the midpoint of a bin stands for a product of two Bessel
/// functions that turns by φ = Δk (sᵢ + sⱼ) within it, an error of φ²/24.
#[test]
fn the_separation_covariance_is_the_transform_of_the_fourier_covariance() {
    let sampling = Sampling { volume: 1e9, first_density: 3e-4, second_density: 6e-4 };
    let densities = sampling.volume * sampling.first_density * sampling.second_density;
    let (separation, values) = model(Space::Separation, &SHELLS, Effects::default());
    let in_separation = covariance(&separation, &values, &sampling);
    let step = 0.002;
    // Damping of 1 Mpc/h ends the spectrum; the product of shot noises does not end, and is left out of both.
    let bins: Vec<(f64, f64)> =
        (0..1000).map(|i| (1e-4 + step * f64::from(i), 1e-4 + step * f64::from(i + 1))).collect();
    for multipole in 0..=4_u8 {
        let l = usize::from(multipole);
        let (fourier, values) = model_of(Space::Fourier, multipole..=multipole, &bins, Effects::default());
        let in_fourier = covariance(&fourier, &values, &sampling).diagonal();
        for (i, one) in SHELLS.iter().enumerate() {
            for (j, other) in SHELLS.iter().enumerate() {
                let mut sum = 0.0;
                for (&(low, high), covariance) in bins.iter().zip(in_fourier.iter()) {
                    let cube = high.powi(3) - low.powi(3);
                    let measure = cube / (6.0 * PI * PI);
                    let modes = densities * 4.0 * PI / 3.0 * cube / (2.0 * PI).powi(3);
                    let shot = (2 * l + 1) as f64 / modes;
                    let k = 0.5 * (low + high);
                    sum +=
                        measure * measure * bessel(l, k, *one) * bessel(l, k, *other) * (covariance - shot);
                }
                let (a, b) = (l * SHELLS.len() + i, l * SHELLS.len() + j);
                let mut expected = in_separation[(a, b)];
                if i == j {
                    let pairs = densities * 4.0 * PI / 3.0 * (one.1.powi(3) - one.0.powi(3));
                    expected -= (2 * l + 1) as f64 / pairs;
                }
                let scale = (in_separation[(a, a)] * in_separation[(b, b)]).sqrt();
                let phase = step * (one.1 + other.1);
                let tolerance = phase * phase / 24.0 * scale;
                assert!(
                    (sum - expected).abs() < tolerance,
                    "l {l}, {i} {j}: {sum:e} {expected:e} of {scale:e}"
                );
            }
        }
    }
}

fn bessel(order: usize, k: f64, (low, high): (f64, f64)) -> f64 {
    let rule = composite(&[low, high], 24);
    let sum: f64 = rule
        .nodes
        .iter()
        .zip(&rule.weights)
        .map(|(s, weight)| weight * s * s * spherical_bessel(order, k * s))
        .sum();
    3.0 * sum / (high.powi(3) - low.powi(3))
}
