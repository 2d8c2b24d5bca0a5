//! A departure that switches on at a redshift.

use super::{Departure, DepartureParameter, FeltBy, TAU};
use crate::error::ModelError;
use oddwell_cosmology::Background;

/// A departure that switches on at a redshift.
#[derive(Debug)]
pub(super) struct Step;

impl Departure for Step {
    fn name(&self) -> &'static str {
        "step"
    }

    fn formula(&self) -> &'static str {
        "τ = τ0 ½[1 − tanh((z − z_s)/w)]"
    }

    fn manual(&self) -> &'static str {
        "Switches from 0 at high redshift to τ0 at low redshift around z_s = redshift, over width w > 0. Bins on one side of the step only can not tell redshift and width. Felt by everything, Ψ and the acceleration cancel in the odd multipoles and only growth is left: then they hardly test it."
    }

    fn parameters(&self) -> &'static [DepartureParameter] {
        &[
            TAU,
            DepartureParameter {
                name: "redshift",
                meaning: "redshift z_s of the step",
                general_relativity: None,
            },
            DepartureParameter {
                name: "width",
                meaning: "width w of the step in redshift, above 0",
                general_relativity: None,
            },
        ]
    }

    fn allowed(&self) -> &'static [FeltBy] {
        &FeltBy::ALL
    }

    fn check(&self, parameters: &[f64]) -> Result<(), ModelError> {
        if parameters[2] > 0.0 {
            return Ok(());
        }
        Err(ModelError::Departure {
            parameter: "width",
            value: parameters[2],
            rule: "the width of a step must be above 0; give a small width for a sharp step",
        })
    }

    fn tau(&self, parameters: &[f64], background: &Background, a: f64, k: f64) -> f64 {
        let _ = (background, k);
        let redshift = 1.0 / a - 1.0;
        parameters[0] * 0.5 * (1.0 - ((redshift - parameters[1]) / parameters[2]).tanh())
    }
}
