//! Reading of the frozen tables, and comparison with a tolerance that names where it failed.

#![allow(dead_code)] // each test program uses a part

/// The rows of a CSV table as numbers (a first column of words counts as NaN), header left out.
pub(crate) fn rows(table: &str) -> Vec<Vec<f64>> {
    let rows: Vec<Vec<f64>> = (table.lines().skip(1))
        .map(|line| line.split(',').map(|cell| cell.parse().unwrap_or(f64::NAN)).collect())
        .collect();
    assert!(!rows.is_empty());
    rows
}

/// The first cell of each row.
pub(crate) fn words(table: &str) -> Vec<&str> {
    table.lines().skip(1).map(|line| line.split(',').next().unwrap()).collect()
}

/// |found/expected − 1| within the tolerance. NaN fails.
#[track_caller]
pub(crate) fn close(found: f64, expected: f64, relative: f64, place: impl std::fmt::Debug) {
    let error = (found - expected).abs() / expected.abs();
    assert!(
        error <= relative,
        "{place:?}: {found:e} is not {expected:e}: off by {error:.2e}, allowed {relative:.0e}"
    );
}

/// |found − expected| within the tolerance. NaN fails.
#[track_caller]
pub(crate) fn near(found: f64, expected: f64, absolute: f64, place: impl std::fmt::Debug) {
    let error = (found - expected).abs();
    assert!(
        error <= absolute,
        "{place:?}: {found:e} is not {expected:e}: off by {error:.2e}, allowed {absolute:.0e}"
    );
}
