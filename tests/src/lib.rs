//! Checks across crates.
