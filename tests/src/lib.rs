//! What the checks across crates share: the demo data and the fuzz targets.

pub mod browser;
pub mod demo;
pub mod fuzz;
