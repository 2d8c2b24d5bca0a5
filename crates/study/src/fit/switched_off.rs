//! The largest effect that a study leaves out of its predictions.

use super::analysis::Analysis;
use super::mimics::{difference, projection};
use crate::assemble::{Posterior, PosteriorScratch, predict_elsewhere};
use crate::record::SwitchedOff;
use crate::run_error::RunError;
use oddwell_model::{Effects, FeltBy, ModelSetup, departures};

/// An offset that is held at 0 is none that is known: this is the width of its usual prior, km/s.
const USUAL_OFFSET: f64 = 10.0;

/// A switch of an effect.
type Switch = fn(&mut Effects) -> &mut bool;

/// The effects that a study can switch off, and what switches each on.
const SWITCHES: [(&str, Switch); 3] = [
    ("wide_angle", |effects| &mut effects.wide_angle),
    ("light_cone", |effects| &mut effects.light_cone),
    ("lensing", |effects| &mut effects.lensing),
];

/// Of the effects that are switched off, and an offset of 10 km/s in all bins where it is held at 0: the one that changes
/// the best prediction most in the direction in which a departure felt by light changes it, both in units of the noise,
/// with the departure it would be taken for. None where nothing is left out, or where the data see no departure.
pub(super) fn switched_off(
    posterior: &Posterior,
    analysis: &Analysis,
    scratch: &mut PosteriorScratch,
) -> Result<Option<SwitchedOff>, RunError> {
    let setup = posterior.model.setup();
    let values = posterior.values(&analysis.best);
    let mut changes: Vec<(&str, Vec<f64>)> = Vec::new();
    for (effect, switch) in SWITCHES {
        let mut effects = setup.effects;
        if std::mem::replace(switch(&mut effects), true) {
            continue;
        }
        let with = predict_elsewhere(posterior, ModelSetup { effects, ..setup.clone() }, &|name| {
            posterior.slot(name).map_or(0.0, |slot| values[slot])
        })?;
        changes.push((effect, difference(&with, &analysis.prediction)));
    }
    let unheard: Vec<usize> = (0..posterior.model.layout().len())
        .filter(|&slot| posterior.model.layout().names()[slot].ends_with(".offset"))
        .filter(|&slot| posterior.map.is_held(slot) && values[slot] == 0.0)
        .collect();
    if !unheard.is_empty() {
        let mut shifted = values.clone();
        unheard.iter().for_each(|&slot| shifted[slot] = USUAL_OFFSET);
        let with = posterior.predict_values(&shifted, scratch)?;
        changes.push(("offset", difference(&with, &analysis.prediction)));
    }
    let Some(constant) = departures::find("constant").filter(|_| !changes.is_empty()) else {
        return Ok(None);
    };
    let light = ModelSetup { departure: constant, felt_by: FeltBy::Light, ..setup.clone() };
    let of_tau = |tau: f64| {
        predict_elsewhere(posterior, light.clone(), &|name| match name {
            "departure.tau" => tau,
            name => posterior.slot(name).map_or(0.0, |slot| values[slot]),
        })
    };
    // Felt by light, a departure enters linearly.
    let by_tau = difference(&of_tau(1.0)?, &of_tau(0.0)?);
    let own = projection(posterior, &by_tau, &by_tau);
    if !(own > 0.0) {
        return Ok(None);
    }
    let sizes =
        changes.into_iter().map(|(effect, change)| (effect, projection(posterior, &change, &by_tau) / own));
    let largest = sizes.max_by(|(_, one), (_, other)| one.abs().total_cmp(&other.abs()));
    Ok(largest.map(|(effect, tau)| SwitchedOff { effect: effect.to_owned(), tau }))
}
