//! The departure against redshift: the band of a fitted shape, or a value a bin or survey.

use super::{Context, ReviewError};
use crate::record::{ParameterSummary, Summary};
use crate::run_error::RunError;
use oddwell_cosmology::Background;
use oddwell_model::Spread;
use oddwell_sampler::diagnostics::quantile;

/// Points of a curve.
const POINTS: usize = 41;

/// Shapes that depend on scale are shown at this wavenumber, h/Mpc.
pub const REFERENCE_WAVENUMBER: f64 = 0.1;

/// τ against redshift.
#[derive(Clone, Debug, PartialEq)]
pub struct DepartureCurve {
    /// Whether τ depends on scale, so that the curve holds at [`REFERENCE_WAVENUMBER`] only.
    pub scale_dependent: bool,
    /// Redshifts of the bins, with their names: `SURVEY.BIN`.
    pub bins: Vec<(String, f64)>,
    /// The band of a shape that all bins share; empty for one that has a value a bin or survey.
    pub band: Vec<CurvePoint>,
    /// Values of their own, by bin or survey: lowest and highest redshift that it stands for, and its summary.
    pub values: Vec<(String, [f64; 2], ParameterSummary)>,
}

/// The posterior of τ at one redshift.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CurvePoint {
    /// Redshift.
    pub redshift: f64,
    /// Median.
    pub median: f64,
    /// Central 68 %.
    pub band68: [f64; 2],
    /// Central 95 %.
    pub band95: [f64; 2],
}

/// None where the hypothesis has no departure, or where the measurements are blinded.
pub(super) fn curve(context: &Context<'_>, summary: &Summary) -> Result<Option<DepartureCurve>, ReviewError> {
    let posterior = context.posterior;
    let setup = posterior.model.setup();
    let shape = setup.departure;
    if shape.parameters().is_empty() || summary.blinded {
        return Ok(None);
    }
    let mean = |nodes: &[(f64, f64)]| {
        let weight: f64 = nodes.iter().map(|(_, weight)| weight).sum();
        nodes.iter().map(|(redshift, weight)| redshift * weight).sum::<f64>() / weight
    };
    let bins: Vec<(String, f64)> = setup.bins.iter().map(|bin| (bin.path(), mean(&bin.nodes))).collect();
    let mut curve = DepartureCurve {
        scale_dependent: shape.scale_dependent(),
        bins: bins.clone(),
        band: Vec::new(),
        values: Vec::new(),
    };
    if shape.spread() == Spread::Shared {
        curve.band = band(context, &bins)?;
        return Ok(Some(curve));
    }
    for (name, parameter) in &summary.parameters {
        let Some(place) = name.strip_prefix("departure.tau.") else { continue };
        let inside = |path: &str| path == place || path.starts_with(&format!("{place}."));
        let here: Vec<f64> =
            bins.iter().filter(|(path, _)| inside(path)).map(|(_, redshift)| *redshift).collect();
        let low = here.iter().copied().fold(f64::INFINITY, f64::min);
        let high = here.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        if low.is_finite() {
            curve.values.push((place.to_owned(), [low, high], parameter.clone()));
        }
    }
    Ok(Some(curve))
}

fn band(context: &Context<'_>, bins: &[(String, f64)]) -> Result<Vec<CurvePoint>, ReviewError> {
    let posterior = context.posterior;
    let (layout, shape) = (posterior.model.layout(), posterior.model.setup().departure);
    let highest = bins.iter().map(|(_, redshift)| *redshift).fold(0.0, f64::max) * 1.15;
    let redshifts: Vec<f64> =
        (0..POINTS).map(|index| highest * index as f64 / (POINTS as f64 - 1.0)).collect();
    let mut columns: Vec<Vec<f64>> = vec![Vec::new(); POINTS];
    for draw in context.draws {
        let values = posterior.values(draw);
        let value = |name: &str| layout.index(name).map_or(0.0, |slot| values[slot]);
        let background = Background::new(
            value("background.omega_m"),
            value("background.omega_k"),
            value("background.w0"),
            value("background.wa"),
        )
        .map_err(RunError::from)?;
        let parameters = &values[layout.departure_slots()];
        for (redshift, column) in redshifts.iter().zip(&mut columns) {
            column.push(shape.tau(parameters, &background, 1.0 / (1.0 + redshift), REFERENCE_WAVENUMBER));
        }
    }
    let point = |(redshift, column): (f64, Vec<f64>)| CurvePoint {
        redshift,
        median: quantile(&column, 0.5),
        band68: [quantile(&column, 0.16), quantile(&column, 0.84)],
        band95: [quantile(&column, 0.025), quantile(&column, 0.975)],
    };
    Ok(redshifts.into_iter().zip(columns).map(point).collect())
}
