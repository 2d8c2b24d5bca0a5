//! What each physical effect contributes to a prediction.

use crate::error::ModelError;
use crate::model::Model;
use crate::setup::Effects;
use crate::workspace::Workspace;
use std::fmt;

/// One part of a prediction.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum EffectName {
    /// Galaxy bias and redshift-space distortions at zeroth order: all of the even multipoles, none of the odd.
    Standard,
    /// Doppler terms of R.
    Doppler,
    /// Acceleration terms of R.
    Acceleration,
    /// The gravitational redshift.
    GravitationalRedshift,
    /// The redshift offset between the tracers.
    Offset,
    /// Wide-angle terms (those beyond the 1/(r̃H) of R).
    WideAngle,
    /// Evolution along the light cone.
    LightCone,
    /// Lensing of the farther tracer by matter around the nearer one.
    Lensing,
}

impl EffectName {
    /// Every part, in the order of the documentation.
    pub const ALL: [EffectName; 8] = [
        EffectName::Standard,
        EffectName::Doppler,
        EffectName::Acceleration,
        EffectName::GravitationalRedshift,
        EffectName::Offset,
        EffectName::WideAngle,
        EffectName::LightCone,
        EffectName::Lensing,
    ];

    /// The name of its column in a table.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            EffectName::Standard => "standard",
            EffectName::Doppler => "doppler",
            EffectName::Acceleration => "acceleration",
            EffectName::GravitationalRedshift => "gravitational_redshift",
            EffectName::Offset => "offset",
            EffectName::WideAngle => "wide_angle",
            EffectName::LightCone => "light_cone",
            EffectName::Lensing => "lensing",
        }
    }

    /// Whether `effects` has it; the standard part is always there.
    #[must_use]
    pub fn is_in(self, effects: &Effects) -> bool {
        match self {
            EffectName::Standard => true,
            EffectName::Doppler => effects.doppler,
            EffectName::Acceleration => effects.acceleration,
            EffectName::GravitationalRedshift => effects.gravitational_redshift,
            EffectName::Offset => effects.offset,
            EffectName::WideAngle => effects.wide_angle,
            EffectName::LightCone => effects.light_cone,
            EffectName::Lensing => effects.lensing,
        }
    }

    /// The effects with this one alone switched on.
    #[must_use]
    pub fn alone(self) -> Effects {
        let mut effects = Effects::NONE;
        match self {
            EffectName::Standard => {}
            EffectName::Doppler => effects.doppler = true,
            EffectName::Acceleration => effects.acceleration = true,
            EffectName::GravitationalRedshift => effects.gravitational_redshift = true,
            EffectName::Offset => effects.offset = true,
            EffectName::WideAngle => effects.wide_angle = true,
            EffectName::LightCone => effects.light_cone = true,
            EffectName::Lensing => effects.lensing = true,
        }
        effects
    }
}

impl fmt::Display for EffectName {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        formatter.write_str(self.name())
    }
}

impl Model {
    /// What each effect contributes to each row, in the order of [`EffectName::ALL`]: the columns add up to
    /// [`Model::predict`]. An effect that the setup leaves out is a column of zeros.
    ///
    /// Every term of an odd multipole is linear in exactly one effect, so the parts need no order in which they are
    /// switched on. Remapping is applied to each.
    ///
    /// # Errors
    /// As [`Model::predict`].
    pub fn by_effect(
        &self,
        values: &[f64],
        workspace: &mut Workspace,
    ) -> Result<Vec<(EffectName, Vec<f64>)>, ModelError> {
        let column = |effect: EffectName| {
            let mut out = vec![0.0; self.setup().rows.len()];
            if effect.is_in(&self.setup().effects) {
                self.contribution(effect, values, workspace, &mut out)?;
            }
            Ok((effect, out))
        };
        EffectName::ALL.into_iter().map(column).collect()
    }

    /// What one effect contributes to each row, whether or not the setup includes it: how large is what was left out?
    ///
    /// # Errors
    /// As [`Model::predict`].
    pub fn contribution(
        &self,
        effect: EffectName,
        values: &[f64],
        workspace: &mut Workspace,
        out: &mut [f64],
    ) -> Result<(), ModelError> {
        self.predict_effects(values, workspace, &effect.alone(), out)?;
        if effect != EffectName::Standard {
            for (value, row) in out.iter_mut().zip(&self.setup().rows) {
                if row.multipole % 2 == 0 {
                    *value = 0.0;
                }
            }
        }
        Ok(())
    }
}
