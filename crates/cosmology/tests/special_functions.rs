//! Spherical Bessel functions, Legendre polynomials and quadrature rules.

// A panic is how a test fails; the lint's own exception covers the test functions, not their helpers.
#![allow(clippy::unwrap_used, clippy::panic)]

mod common;

use common::{close, near, rows};
use oddwell_cosmology::quadrature::{even, geometric};
use oddwell_cosmology::{composite, gauss_legendre, legendre, spherical_bessel, spherical_bessel_all};
use proptest::prelude::*;

/// Source: mpmath 1.4.1 with 40 digits (tests/reference/README.md). 1e-13 relative is promised below x = 3; above,
/// 1e-13 away from zeros and 1e-15/x near one: the sum of both is what recurrences from sin and cos with errors of
/// 1e-16 can do.
#[test]
fn bessel_against_many_digits() {
    for row in rows(include_str!("reference/bessel.csv")) {
        let x = row[0];
        let all = spherical_bessel_all(x);
        for order in 0..=4 {
            let expected = row[order + 1];
            let slack = if x < 3.0 { 0.0 } else { 1e-15 / x };
            near(all[order], expected, 1e-13 * expected.abs() + slack, ("all", order, x));
            near(spherical_bessel(order, x), expected, 1e-13 * expected.abs() + slack, ("one", order, x));
        }
    }
}

/// Source: Abramowitz & Stegun 1964, table 10.1, digits quoted from memory; the frozen values above are the strict
/// check.
#[test]
fn bessel_against_abramowitz_and_stegun() {
    for (order, x, printed, digits) in [
        (0, 1.0, 0.841_470_98, 1e-8),
        (1, 1.0, 0.301_168_68, 1e-8),
        (2, 1.0, 0.062_035_052_0, 1e-10),
        (0, 5.0, -0.191_784_85, 1e-8),
        (1, 5.0, -0.095_089_408, 1e-9),
        (2, 5.0, 0.134_731_210, 1e-9),
    ] {
        near(spherical_bessel(order, x), printed, digits, (order, x));
    }
}

#[test]
fn bessel_at_zero_and_beyond_the_orders() {
    assert_eq!(spherical_bessel_all(0.0), [1.0, 0.0, 0.0, 0.0, 0.0]);
    for order in 0..=4 {
        assert_eq!(spherical_bessel(order, 0.0), if order == 0 { 1.0 } else { 0.0 });
    }
    assert!(spherical_bessel(5, 1.0).is_nan());
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    /// DLMF 10.51.1: j_(l−1) + j_(l+1) = (2l+1) jₗ/x. On each side of the change of method at 3 the terms are good to
    /// 1e-14 of the largest.
    #[test]
    fn bessel_recurrence(x in 0.01..60.0f64) {
        let j = spherical_bessel_all(x);
        for order in 1..=3 {
            let middle = (2 * order + 1) as f64 * j[order] / x;
            near(j[order - 1] + j[order + 1], middle, 1e-14 * (j[order - 1].abs() + middle.abs()), (order, x));
        }
    }

    /// DLMF 10.60.12: Σ (2l+1) jₗ² = 1; the five orders here miss what the next ones hold, below (2·5+1) j₅² and its
    /// followers: at x ≤ 1 under 11·(1/10395)²·1.1 = 1.2e-7.
    #[test]
    fn bessel_sum_rule(x in 0.0..1.0f64) {
        let sum: f64 = spherical_bessel_all(x).iter().enumerate().map(|(l, j)| (2 * l + 1) as f64 * j * j).sum();
        prop_assert!(sum <= 1.0 + 1e-15 && sum > 1.0 - 1.2e-7 * x.powi(10) - 1e-15, "{}", sum);
    }

    /// The method changes at x = 3: no step there beyond the slope's.
    #[test]
    fn bessel_is_continuous(step in 1e-14..1e-12f64) {
        let (below, above) = (spherical_bessel_all(3.0 - step), spherical_bessel_all(3.0 + step));
        for order in 0..=4 {
            near(below[order], above[order], step + 1e-15, order);
        }
    }

    /// Explicit polynomials (DLMF 18.5.16 and Abramowitz & Stegun 22.3.8, orders 0 to 4).
    #[test]
    fn legendre_polynomials(x in -1.0..1.0f64) {
        let square = x * x;
        let expected = [
            1.0,
            x,
            0.5 * (3.0 * square - 1.0),
            0.5 * (5.0 * square - 3.0) * x,
            0.125 * (35.0 * square * square - 30.0 * square + 3.0),
        ];
        for (order, expected) in expected.into_iter().enumerate() {
            near(legendre(order, x), expected, 4e-15, order);
        }
    }
}

/// ∫₋₁¹ PₗPₘ = 2/(2l+1) δ: both the polynomials and the rule, which is exact here.
#[test]
fn legendre_orthogonality() {
    let rule = gauss_legendre(12);
    for l in 0..=10 {
        for m in 0..=10 {
            let expected = if l == m { 2.0 / (2 * l + 1) as f64 } else { 0.0 };
            near(rule.integrate(|x| legendre(l, x) * legendre(m, x)), expected, 1e-15 * 4.0, (l, m));
        }
    }
    assert_eq!(legendre(7, 1.0), 1.0);
    assert_eq!(legendre(7, -1.0), -1.0);
}

/// Exact to degree 2n − 1, and not beyond: x^(2n) is off by (n!)⁴ 2^(2n+1)/((2n+1) (2n)!²), DLMF 3.5.
#[test]
fn degree_of_exactness() {
    for n in [1usize, 2, 5, 16] {
        let rule = gauss_legendre(n);
        assert_eq!(rule.len(), n);
        for degree in 0..2 * n {
            let expected = if degree % 2 == 0 { 2.0 / (degree + 1) as f64 } else { 0.0 };
            near(rule.integrate(|x| x.powi(degree as i32)), expected, 2e-15, (n, degree));
        }
        if n <= 5 {
            let factorial = |n: usize| (1..=n).map(|i| i as f64).product::<f64>();
            let missed = factorial(n).powi(4) * 2f64.powi(2 * n as i32 + 1)
                / ((2 * n + 1) as f64 * factorial(2 * n).powi(2));
            let found = 2.0 / (2 * n + 1) as f64 - rule.integrate(|x| x.powi(2 * n as i32));
            near(found, missed, 1e-14, ("first that is missed", n));
        }
    }
    assert!(gauss_legendre(0).is_empty());
    assert_eq!(gauss_legendre(0).integrate(|x| x), 0.0);
}

/// Abramowitz & Stegun 1964, table 25.4, n = 2 and 3 in closed form: ±1/√3 with weights 1; 0, ±√(3/5) with 8/9, 5/9.
#[test]
fn small_rules_in_closed_form() {
    let two = gauss_legendre(2);
    near(two.nodes[1], 1.0 / 3f64.sqrt(), 2e-16, "node");
    let three = gauss_legendre(3);
    near(three.nodes[2], 0.6f64.sqrt(), 2e-16, "node");
    near(three.nodes[1], 0.0, 2e-16, "node");
    near(three.weights[1], 8.0 / 9.0, 2e-16, "weight");
    near(three.weights[0], 5.0 / 9.0, 2e-16, "weight");
}

#[test]
fn panels() {
    let rule = composite(&[0.0, 0.5, 2.0], 6);
    assert_eq!(rule.len(), 12);
    assert!(rule.nodes.is_sorted());
    // |x − 0.5| has its kink at an edge, so the rule is exact.
    near(rule.integrate(|x| (x - 0.5).abs()), 0.125 + 1.125, 1e-15, "kink");
    close(gauss_legendre(20).on(0.0, 3.0).integrate(f64::exp), 3f64.exp() - 1.0, 1e-15, "exp");
    close(gauss_legendre(20).on(3.0, 0.0).integrate(f64::exp), 1.0 - 3f64.exp(), 1e-15, "backwards");
    assert!(composite(&[1.0], 6).is_empty());
    assert_eq!(even(1.0, 2.0, 4), [1.0, 1.25, 1.5, 1.75, 2.0]);
    let edges = geometric(1e-3, 10.0, 4);
    assert_eq!((edges.len(), edges[0], edges[4]), (5, 1e-3, 10.0));
    close(edges[2], 0.1, 1e-14, "middle");
}
