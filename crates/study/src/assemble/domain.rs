//! Where quantities make sense: a prior may reach farther, and there is no prediction beyond.

use crate::parameter_map::ParameterMap;
use crate::resolve::{QuantityRule, rule_of};
use oddwell_cosmology::CosmologyError;
use oddwell_model::{Layout, ModelError};

/// The rules of the quantities that are inferred.
#[derive(Clone, Debug)]
pub(super) struct Domain {
    rules: Vec<(usize, QuantityRule)>,
    /// The slots of Ωm and Ωb, where one of them moves.
    densities: Option<(usize, usize)>,
}

impl Domain {
    pub(super) fn new(map: &ParameterMap, layout: &Layout) -> Domain {
        let moves = |slot: &usize| !map.is_held(*slot);
        let inferred = (0..layout.len()).filter(moves);
        let rules = inferred.filter_map(|slot| Some((slot, rule_of(&layout.names()[slot])?))).collect();
        let densities = layout.index("background.omega_m").zip(layout.index("background.omega_b"));
        let densities = densities.filter(|(matter, baryons)| moves(matter) || moves(baryons));
        Domain { rules, densities }
    }

    /// # Errors
    /// A recoverable [`ModelError`] for the first quantity that is outside.
    pub(super) fn check(&self, values: &[f64]) -> Result<(), ModelError> {
        let fail = |name, value, rule, way_out| {
            Err(CosmologyError::OutOfRange { name, value, rule, way_out }.into())
        };
        for (slot, rule) in &self.rules {
            if !(rule.holds)(values[*slot]) {
                return fail(rule.name, values[*slot], rule.rule, rule.way_out);
            }
        }
        match self.densities {
            Some((matter, baryons)) if values[baryons] >= values[matter] => {
                let (rule, way_out) = ("below background.omega_m", "baryons are part of matter");
                fail("background.omega_b", values[baryons], rule, way_out)
            }
            _ => Ok(()),
        }
    }
}
