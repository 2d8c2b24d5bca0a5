//! Distances and fractions against a general-purpose astronomy library, closed forms, and each other.

// A panic is how a test fails; the lint's own exception covers the test functions, not their helpers.
#![allow(clippy::unwrap_used, clippy::panic)]

mod common;

use common::{close, near, rows};
use oddwell_cosmology::{Background, CosmologyError, HUBBLE_DISTANCE, SPEED_OF_LIGHT};
use proptest::prelude::*;

fn background(omega_m: f64, omega_k: f64, w0: f64, wa: f64) -> Background {
    Background::new(omega_m, omega_k, w0, wa).unwrap()
}

/// Source: astropy 8.0.2, w0waCDM (tests/reference/README.md). Both sides are good to about 1e-14 here (adaptive
/// quadrature there, a converged rule here), and 1e-12 is what the documentation promises up to z = 10.
#[test]
fn distances_agree_with_astropy() {
    for row in rows(include_str!("reference/distances.csv")) {
        let [omega_m, omega_k, w0, wa, z, comoving, transverse, expansion, matter, dark_energy] = row[..]
        else {
            panic!("ten columns");
        };
        let universe = background(omega_m, omega_k, w0, wa);
        let epoch = universe.epoch(z).unwrap();
        let a = 1.0 / (1.0 + z);
        close(universe.comoving_distance(z), comoving, 1e-12, ("comoving", &row));
        close(universe.transverse_distance(z), transverse, 1e-12, ("transverse", &row));
        close(epoch.comoving_distance, comoving, 1e-12, ("comoving", &row));
        close(epoch.transverse_distance, transverse, 1e-12, ("transverse", &row));
        close(universe.expansion(a), expansion, 1e-13, ("expansion", &row));
        close(universe.matter_fraction(a), matter, 1e-13, ("matter", &row));
        near(universe.dark_energy_fraction(a), dark_energy, 1e-13, ("dark energy", &row));
    }
}

/// Matter alone: χ = 2c/H0 (1 − 1/√(1+z)); E = (1+z)^1.5.
#[test]
fn matter_alone_in_closed_form() {
    let universe = background(1.0, 0.0, -1.0, 0.0);
    for z in [1e-6, 0.01, 0.5, 3.0, 10.0] {
        let expected = -2.0 * HUBBLE_DISTANCE * (-0.5 * f64::ln_1p(z)).exp_m1();
        close(universe.comoving_distance(z), expected, 1e-14, z);
        close(universe.expansion_slope(1.0 / (1.0 + z)), -1.5, 1e-15, z);
    }
    // The error bound of the documentation at the surface of last scattering.
    close(
        universe.comoving_distance(1100.0),
        2.0 * HUBBLE_DISTANCE * (1.0 - 1.0 / 1101f64.sqrt()),
        1e-13,
        1100,
    );
}

/// Matter and curvature: Mattig's formula r = 2c/H0 [Ωz + (Ω−2)(√(1+Ωz) − 1)]/[Ω²(1+z)] (Mattig 1958, Astron. Nachr.
/// 284, 109), written here with a positive curvature, which tests sinh, and a negative one, which tests sin.
#[test]
fn matter_and_curvature_follow_mattig() {
    for omega_m in [0.3, 0.8, 1.4, 2.0] {
        let universe = background(omega_m, 1.0 - omega_m, -1.0, 0.0);
        for z in [0.3, 1.0, 4.0] {
            let expected =
                2.0 * HUBBLE_DISTANCE * (omega_m * z + (omega_m - 2.0) * ((1.0 + omega_m * z).sqrt() - 1.0))
                    / (omega_m * omega_m * (1.0 + z));
            // The formula subtracts numbers about 10 times its value.
            close(universe.transverse_distance(z), expected, 1e-13, (omega_m, z));
        }
    }
}

/// An empty universe would have χ = c/H0 ln(1+z); with 1e-9 of matter that holds to about 1e-9 times z.
#[test]
fn nearly_empty_universe() {
    let universe = background(1e-9, 1.0 - 1e-9, -1.0, 0.0);
    close(universe.comoving_distance(1.0), HUBBLE_DISTANCE * 2f64.ln(), 2e-9, "empty");
}

#[test]
fn constants_are_the_speed_of_light() {
    assert_eq!(SPEED_OF_LIGHT, 299_792.458);
    close(HUBBLE_DISTANCE, SPEED_OF_LIGHT / 100.0, 1e-15, "Mpc/h");
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    /// Slopes are derivatives: a central difference of step h is off by h²/6 times the third derivative, here below
    /// 100, and by rounding 1e-15/h. With h = 1e-5 both are below 2e-9.
    #[test]
    fn slopes_are_derivatives(
        omega_m in 0.1..0.9f64, omega_k in -0.1..0.3f64, w0 in -1.3..-0.6f64, wa in -0.5..0.4f64, z in 0.01..5.0f64
    ) {
        let universe = background(omega_m, omega_k, w0, wa);
        prop_assume!(universe.epoch(z * 1.001).is_ok());
        let epoch = universe.epoch(z).unwrap();
        let (a, step) = (epoch.scale_factor, 1e-5f64);
        let derivative = |f: &dyn Fn(f64) -> f64| {
            (f(a * step.exp()) - f(a * (-step).exp())) / (2.0 * step)
        };
        near(epoch.expansion_slope, derivative(&|a| universe.expansion(a).ln()), 1e-8, "E");
        near(epoch.conformal_hubble_slope, derivative(&|a| universe.conformal_hubble(a).ln()), 1e-8, "H");
        near(epoch.matter_fraction_slope, derivative(&|a| universe.matter_fraction(a).ln()), 1e-8, "matter");
        // dχ/d ln a = −1/H and dr/dχ = C. Distances are thousands, so their rounding is 1e-12/h.
        let distance = derivative(&|a| universe.comoving_distance(1.0 / a - 1.0));
        close(-1.0 / epoch.conformal_hubble, distance, 1e-7, "distance");
        let transverse = derivative(&|a| universe.transverse_distance(1.0 / a - 1.0));
        near(epoch.distance_slope, transverse / distance, 1e-7, "C");
        let curved = 1.0 + omega_k * (epoch.transverse_distance / HUBBLE_DISTANCE).powi(2);
        close(epoch.distance_slope.powi(2), curved, 1e-12, "C²");
        close(epoch.reduced_distance * epoch.distance_slope, epoch.transverse_distance, 1e-14, "reduced");
        // The densities' fractions add up, with curvature's.
        let curvature = omega_k / (a * epoch.expansion).powi(2);
        near(epoch.matter_fraction + epoch.dark_energy_fraction + curvature, 1.0, 1e-13, "sum");
    }
}

/// Matter alone with Ωm = 10: a ∝ 1 − cos η with cos η = (2 − Ωm)/Ωm = −0.8 today, and the angle to a source is the
/// difference in η. At z = 3.5, cos η = 0.6: the angle is a right one, there is the equator. Beyond, r falls again
/// and C, its slope, is the negative root.
#[test]
fn the_equator_of_a_closed_universe() {
    let universe = Background::new(10.0, -9.0, -1.0, 0.0).unwrap();
    for z in [0.5, 3.4, 3.6, 20.0] {
        let cosine: f64 = 1.0 - 1.8 / (1.0 + z);
        let angle = (-0.8f64).acos() - cosine.acos();
        let epoch = universe.epoch(z).unwrap();
        close(epoch.comoving_distance, angle * HUBBLE_DISTANCE / 3.0, 1e-13, z);
        near(epoch.distance_slope, angle.cos(), 1e-13, z);
        close(epoch.transverse_distance, angle.sin() * HUBBLE_DISTANCE / 3.0, 1e-13, z);
        assert_eq!(epoch.distance_slope > 0.0, z < 3.5);
    }
}

#[test]
fn bad_numbers_are_named() {
    let message =
        |omega_m, omega_k, w0, wa| Background::new(omega_m, omega_k, w0, wa).unwrap_err().to_string();
    assert_eq!(
        message(-0.1, 0.0, -1.0, 0.0),
        "omega_m = -0.1: must be above 0 and finite; give the share of matter in the critical density today, such as 0.31"
    );
    assert!(message(f64::NAN, 0.0, -1.0, 0.0).starts_with("omega_m = NaN: must be above 0"));
    assert_eq!(
        message(0.3, f64::INFINITY, -1.0, 0.0),
        "omega_k = inf: must be finite; give 0 for a flat universe"
    );
    assert_eq!(
        message(0.3, 0.0, f64::NAN, 0.0),
        "w0 = NaN: must be finite; give -1 for a cosmological constant"
    );
    assert_eq!(
        message(0.3, 0.0, -1.0, f64::NAN),
        "wa = NaN: must be finite; give 0 for a constant equation of state"
    );
    for z in [0.0, -0.5, f64::NAN, f64::INFINITY] {
        let error = background(0.3, 0.0, -1.0, 0.0).epoch(z).unwrap_err();
        assert!(matches!(error, CosmologyError::OutOfRange { name: "redshift", .. }), "{error}");
    }
}

/// Ωm = 0.05, Ωk = −1 and a cosmological constant of 1.95: E²a³ = 0.05 − a + 1.95a³ is 0 at a = 0.0502 and 0.690,
/// negative between.
#[test]
fn a_universe_that_bounced() {
    let universe = background(0.05, -1.0, -1.0, 0.0);
    assert!(universe.epoch(0.44).is_ok());
    let error = universe.epoch(0.46).unwrap_err();
    assert!(matches!(error, CosmologyError::NoExpansion { asked: 0.46, .. }), "{error}");
    // At z = 30 E² is positive again, but the way there is barred.
    assert!(universe.expansion_squared(1.0 / 31.0) > 0.0);
    let CosmologyError::NoExpansion { redshift, value, .. } = universe.epoch(30.0).unwrap_err() else {
        panic!("another error");
    };
    assert!(value <= 0.0 && redshift > 0.44 && redshift < 19.0);
}

/// A dip of E² below 0 so narrow that it lies between two points of any grid: the discriminant of Ωm + Ωk a + Ωde a³
/// is just past the double root at a*, where Ωk = −3Ωde a*² and Ωm = 2Ωde a*³.
#[test]
fn a_narrow_dip_is_found() {
    for turn in [0.31, 0.4321, 0.5555] {
        // Ωde (1 + 2a*³ − 3a*²) = 1.
        let omega_de = 1.0 / (1.0 + 2.0 * turn * turn * turn - 3.0 * turn * turn);
        let (omega_m, omega_k) = (2.0 * omega_de * f64::powi(turn, 3), -3.0 * omega_de * turn * turn);
        // Depth 1e-9: |a − a*| < 1e-5 or so.
        let through = background(omega_m - 1e-9, omega_k, -1.0, 0.0).epoch(4.0);
        assert!(matches!(through, Err(CosmologyError::NoExpansion { .. })), "{turn}: {through:?}");
        let above = background(omega_m + 1e-9, omega_k, -1.0, 0.0);
        let above = above.epoch(4.0);
        assert!(!matches!(above, Err(CosmologyError::NoExpansion { .. })), "{turn}: {above:?}");
    }
}

/// A universe that loitered at a = 0.4, where E² came within 0.1 % of matter's share of 0: light had so much time
/// there that it passed the antipode.
#[test]
fn beyond_the_antipode() {
    let turn: f64 = 0.4;
    let omega_de = 1.0 / (1.0 + 2.0 * turn.powi(3) - 3.0 * turn * turn);
    let (omega_m, omega_k) = (2.0 * omega_de * turn.powi(3) * 1.001, -3.0 * omega_de * turn * turn);
    let universe = background(omega_m, omega_k, -1.0, 0.0);
    let error = universe.epoch(4.0).unwrap_err();
    let CosmologyError::BeyondAntipode { distance, antipode, .. } = error else { panic!("{error}") };
    assert!(distance > antipode);
    assert!(universe.epoch(1.0).is_ok());
}

/// Flat: (r₂³ − r₁³)/3. Curved, D the Hubble distance and k = √|Ωk|: D³/(2|Ωk|) [x√(1 ± x²) − arcsinh or arcsin x, over k, of
/// x = k r/D] up to sign (Hogg 1999, eq. 29): good to ten digits here, where the two terms cancel to one part in a hundred.
#[test]
fn volumes_agree_with_closed_forms() {
    let flat = background(0.31, 0.0, -1.0, 0.0);
    let radius = |z: f64| flat.transverse_distance(z);
    let expected = (radius(0.9).powi(3) - radius(0.4).powi(3)) / 3.0;
    assert!((flat.comoving_volume(0.4, 0.9) / expected - 1.0).abs() < 1e-13);
    for omega_k in [-0.2, 0.15] {
        let universe = background(0.31, omega_k, -1.0, 0.0);
        let root = f64::abs(omega_k).sqrt();
        let up_to = |z: f64| {
            let x = root * universe.transverse_distance(z) / HUBBLE_DISTANCE;
            let difference = match omega_k > 0.0 {
                true => x * (1.0 + x * x).sqrt() - x.asinh(),
                false => x.asin() - x * (1.0 - x * x).sqrt(),
            };
            HUBBLE_DISTANCE.powi(3) / (2.0 * root.powi(3)) * difference
        };
        let expected = up_to(0.9) - up_to(0.4);
        assert!((universe.comoving_volume(0.4, 0.9) / expected - 1.0).abs() < 1e-10, "{omega_k}");
        assert!((flat.comoving_volume(0.4, 0.9) / expected - 1.0).abs() > 1e-3, "curvature is seen");
    }
}
