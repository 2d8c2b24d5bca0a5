//! Evolution biases: what the slope of a catalogue makes of them, and whether they can be right.

use crate::assemble::Posterior;
use crate::file::TracerSection;
use crate::resolve::{Hypothesis, Study};
use crate::run_error::RunError;
use crate::warnings::Warning;
use oddwell_cosmology::Background;
use oddwell_model::{Workspace, evolution_bias_of_slope};

/// An evolution bias beyond this is more likely a slope of observed counts, or a slope that is none.
const LARGE: f64 = 5.0;

/// A warning for each tracer whose evolution bias is beyond 5 at these quantities, given as such or as a slope.
///
/// # Errors
/// [`RunError::Model`] where the background, growth or departure has no value.
pub(crate) fn large_evolution(posterior: &Posterior, values: &[f64]) -> Result<Vec<Warning>, RunError> {
    let mut warnings = Vec::new();
    let mut workspace = Workspace::new();
    for (index, bin) in posterior.model.setup().bins.iter().enumerate() {
        // Any wavenumber: the tracers do not depend on it.
        let state = posterior.model.bin_state(values, &mut workspace, index, 0, 0.1)?;
        let tracers = [("first", state.first), ("second", state.second)];
        for ((which, tracer), slope) in tracers.into_iter().zip(bin.observed_slopes) {
            let evolution = tracer.evolution_bias;
            if evolution.abs() > LARGE {
                let quantity = if slope { "observed_density_slope" } else { "evolution" };
                let quantity = format!("{}.{which}.{quantity}", bin.path());
                warnings.push(Warning::LargeEvolution { quantity, evolution, slope });
            }
        }
    }
    Ok(warnings)
}

/// The evolution bias that a tracer's slope comes to at the centre of the priors, at the mean redshift of its bin. None
/// where the slope is not given, or the background has no distance there.
pub(crate) fn derived_evolution(
    hypothesis: &Hypothesis,
    (path, redshift): (&str, f64),
    tracer: &TracerSection,
) -> Option<f64> {
    tracer.observed_density_slope.as_ref()?;
    let start = hypothesis.start();
    let value = |name: &str| Some(hypothesis.quantity(name)?.form.value(&start));
    let background = Background::new(
        value("background.omega_m")?,
        value("background.omega_k")?,
        value("background.w0")?,
        value("background.wa")?,
    );
    let epoch = background.ok()?.epoch(redshift).ok()?;
    let slope = value(&format!("{path}.observed_density_slope"))?;
    Some(evolution_bias_of_slope(slope, value(&format!("{path}.magnification"))?, &epoch))
}

/// `SURVEY.BIN.first.evolution` and the like with what it comes to, for every tracer whose slope is given.
pub(crate) fn derived_evolutions(study: &Study, hypothesis: &Hypothesis) -> Vec<(String, f64)> {
    let mut derived = Vec::new();
    for survey in &study.file.surveys {
        for bin in &survey.bins {
            for (which, tracer) in [("first", &bin.first), ("second", &bin.second)] {
                let path = format!("{}.{}.{which}", survey.name.value, bin.name.value);
                let evolution = derived_evolution(hypothesis, (&path, bin.redshift()), tracer);
                derived.extend(evolution.map(|evolution| (path, evolution)));
            }
        }
    }
    derived
}
