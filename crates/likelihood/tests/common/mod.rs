//! What several tests need: frozen tables and random problems.

#![allow(dead_code, reason = "each test binary uses a part")]

use std::collections::BTreeMap;

use nalgebra::{DMatrix, DVector};
use rand::{Rng, RngExt, SeedableRng};
use rand_distr::StandardNormal;
use rand_xoshiro::Xoshiro256PlusPlus;

/// Lines of a table below its header and its notes, split at commas.
pub(crate) fn lines(table: &str) -> impl Iterator<Item = Vec<&str>> {
    let content = table.lines().filter(|line| !line.starts_with('#') && !line.trim().is_empty());
    content.skip(1).map(|line| line.split(',').collect())
}

/// Numbers separated by blanks.
pub(crate) fn numbers(text: &str) -> Vec<f64> {
    text.split_whitespace().map(|number| number.parse().unwrap()).collect()
}

/// Quantities of each case of a table `case,quantity,numbers`.
pub(crate) fn cases(table: &str) -> BTreeMap<String, BTreeMap<String, Vec<f64>>> {
    let mut cases: BTreeMap<String, BTreeMap<String, Vec<f64>>> = BTreeMap::new();
    for line in lines(table) {
        cases.entry(line[0].to_owned()).or_default().insert(line[1].to_owned(), numbers(line[2]));
    }
    cases
}

/// A random-number generator of a fixed stream.
pub(crate) fn generator(seed: u64) -> Xoshiro256PlusPlus {
    Xoshiro256PlusPlus::seed_from_u64(seed)
}

/// Independent standard normal entries.
pub(crate) fn normal_matrix(rows: usize, columns: usize, generator: &mut impl Rng) -> DMatrix<f64> {
    DMatrix::from_fn(rows, columns, |_, _| generator.sample(StandardNormal))
}

/// As many standard normal numbers.
pub(crate) fn normal_vector(rows: usize, generator: &mut impl Rng) -> DVector<f64> {
    DVector::from_fn(rows, |_, _| generator.sample(StandardNormal))
}

/// A covariance with standard deviations between about 0.1 and 10 and correlations of condition number below about
/// 10³: a Wishart matrix of n + 20 degrees of freedom, rescaled.
pub(crate) fn covariance(rows: usize, generator: &mut impl Rng) -> DMatrix<f64> {
    let factor = normal_matrix(rows, rows + 20, generator);
    let scales = normal_vector(rows, generator).map(f64::exp);
    let wishart = &factor * factor.transpose() / (rows + 20) as f64;
    DMatrix::from_fn(rows, rows, |i, j| wishart[(i, j)] * scales[i] * scales[j])
}

/// Asserts |found − wanted| ≤ tolerance · |wanted|.
pub(crate) fn assert_relative(found: f64, wanted: f64, tolerance: f64, what: &str) {
    assert!(
        (found - wanted).abs() <= tolerance * wanted.abs(),
        "{what}: found {found:e}, wanted {wanted:e}, off by {:e} of it",
        (found / wanted - 1.0).abs()
    );
}
