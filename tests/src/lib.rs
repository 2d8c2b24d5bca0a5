//! Checks across crates, and the program that makes the demo data.

pub mod browser;
pub mod demo;
