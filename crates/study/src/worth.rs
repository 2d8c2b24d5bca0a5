//! What nuisances are worth in units of the departure.

use crate::assemble::{Measurements, Posterior};
use crate::run_error::RunError;
use oddwell_model::{FeltBy, Model, ModelSetup, Pair, Row, Space, Workspace, departures};

/// What an offset is worth at the smallest separation of a bin.
#[derive(Clone, Debug, PartialEq)]
pub struct OffsetWorth {
    /// `SURVEY.BIN`.
    pub bin: String,
    /// The smallest separation of its dipole, Mpc/h.
    pub separation: f64,
    /// |∂ξ₁/∂v| over |∂ξ₁/∂τ| there, for τ felt by light: τ per km/s.
    pub tau_per_kilometre: f64,
}

/// For each bin with a dipole in separation space: what 1 km/s of redshift offset is worth in τ (felt by light) at its
/// smallest separation, for the model's quantities `values`.
///
/// # Errors
/// [`RunError::Model`] where there is no prediction.
pub fn offset_in_tau(
    posterior: &Posterior,
    measurements: &Measurements,
    values: &[f64],
) -> Result<Vec<OffsetWorth>, RunError> {
    let setup = posterior.model.setup();
    let mut rows: Vec<Row> = Vec::new();
    for bin in 0..setup.bins.len() {
        let dipoles = measurements.rows.iter().filter(|row| {
            row.bin == bin
                && row.multipole == 1
                && row.space == Space::Separation
                && row.pair == Pair::FirstSecond
        });
        rows.extend(dipoles.min_by(|one, other| one.at.total_cmp(&other.at)));
    }
    if rows.is_empty() {
        return Ok(Vec::new());
    }
    let Some(constant) = departures::find("constant") else { return Ok(Vec::new()) };
    let model = Model::new(ModelSetup {
        rows: rows.clone(),
        departure: constant,
        felt_by: FeltBy::Light,
        growth_index: setup.growth_index,
        ..setup.clone()
    })?;
    let names = model.layout().names();
    let carried = |name: &String| posterior.model.layout().index(name).map_or(0.0, |slot| values[slot]);
    let base: Vec<f64> = names.iter().map(carried).collect();
    let mut workspace = Workspace::new();
    let mut predict = |change: &dyn Fn(&str) -> bool| -> Result<Vec<f64>, RunError> {
        let moved: Vec<f64> =
            names.iter().zip(&base).map(|(name, value)| value + f64::from(u8::from(change(name)))).collect();
        let mut out = vec![0.0; rows.len()];
        model.predict(&moved, &mut workspace, &mut out)?;
        Ok(out)
    };
    let plain = predict(&|_| false)?;
    let by_offset = predict(&|name| name.ends_with(".offset"))?;
    let by_tau = predict(&|name| name == "departure.tau")?;
    let bins = rows.iter().enumerate();
    Ok(bins
        .map(|(index, row)| OffsetWorth {
            bin: setup.bins[row.bin].path(),
            separation: row.at,
            tau_per_kilometre: ((by_offset[index] - plain[index]) / (by_tau[index] - plain[index])).abs(),
        })
        .collect())
}
