//! Where general relativity lies in the posterior of the departure.

use crate::assemble::Posterior;
use crate::record::GeneralRelativity;
use nalgebra::{DMatrix, DVector};
use oddwell_sampler::Chain;
use oddwell_sampler::diagnostics::{TailSource, tail_of, tail_of_distance};

/// A free departure parameter and its value in general relativity.
pub(crate) struct GeneralRelativityPoint {
    /// Its index among the free parameters.
    pub(crate) parameter: usize,
    /// Its value in general relativity.
    pub(crate) value: f64,
}

/// The free parameters of the departure that have a value in general relativity.
pub(crate) fn points(posterior: &Posterior) -> Vec<GeneralRelativityPoint> {
    let shape = posterior.hypothesis.shape.0;
    let value_of = |name: &str| {
        let key = name.strip_prefix("departure.")?.split('.').next()?.to_owned();
        let parameter = shape.parameters().iter().find(|parameter| parameter.name == key)?;
        // A range of 0 is general relativity only as a limit.
        parameter.general_relativity.filter(|_| key == "tau")
    };
    posterior
        .hypothesis
        .watched()
        .into_iter()
        .filter_map(|parameter| {
            let value = value_of(&posterior.map.names()[parameter])?;
            Some(GeneralRelativityPoint { parameter, value })
        })
        .collect()
}

/// One amplitude: counted in the chain. Several: from their means and covariance, as if the posterior were normal. Null
/// where general relativity lies at the end of a prior, outside it, or nowhere.
pub(super) fn general_relativity(posterior: &Posterior, chain: &Chain) -> GeneralRelativity {
    let points = points(posterior);
    let inside = |point: &GeneralRelativityPoint| {
        let (low, high) = posterior.priors.support(point.parameter);
        low < point.value && point.value < high
    };
    if points.is_empty() || !points.iter().all(inside) {
        return GeneralRelativity::default();
    }
    if let [GeneralRelativityPoint { parameter, value }] = points[..] {
        let diagnostics = &chain.diagnostics[parameter];
        let draws = chain.column(parameter);
        let tail = tail_of(&draws, value, diagnostics.ess_mean, diagnostics.mean, diagnostics.sd);
        let from = match tail.source {
            TailSource::Counted => "chain",
            TailSource::Normal => "normal",
        };
        return GeneralRelativity {
            tail_probability: finite(tail.probability),
            sigma: finite(tail.sigma),
            from: Some(from.to_owned()),
        };
    }
    let Some(distance) = distance_squared(chain, &points) else { return GeneralRelativity::default() };
    GeneralRelativity {
        tail_probability: tail_of_distance(distance, points.len()),
        sigma: None,
        from: Some("normal".to_owned()),
    }
}

fn finite(value: f64) -> Option<f64> {
    Some(value).filter(|value| value.is_finite())
}

/// (x − μ)ᵀ Σ⁻¹ (x − μ) of general relativity, with mean and covariance of the draws.
fn distance_squared(chain: &Chain, points: &[GeneralRelativityPoint]) -> Option<f64> {
    let columns: Vec<Vec<f64>> = points.iter().map(|point| chain.column(point.parameter)).collect();
    let means: Vec<f64> = points.iter().map(|point| chain.diagnostics[point.parameter].mean).collect();
    let covariance = DMatrix::from_fn(points.len(), points.len(), |i, j| {
        let products = columns[i].iter().zip(&columns[j]).map(|(x, y)| (x - means[i]) * (y - means[j]));
        products.sum::<f64>() / (chain.len() as f64 - 1.0)
    });
    let offset = DVector::from_fn(points.len(), |i, _| means[i] - points[i].value);
    Some(covariance.cholesky()?.solve(&offset).dot(&offset))
}
