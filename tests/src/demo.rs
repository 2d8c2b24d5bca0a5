//! The demo data: two invented surveys drawn from a recorded truth with a recorded seed.

use oddwell_model::covariance::Sampling;
use oddwell_study::simulate::{Design, simulate};
use oddwell_study::{Override, RunError, Study};
use std::path::Path;

/// The seed of the noise.
pub const SEED: u64 = 4_711;

/// The hypothesis that the data are drawn from.
pub const HYPOTHESIS: &str = "constant";

/// The truth: what is not named stands at the centre of its prior.
pub const TRUTH: &[(&str, f64)] = &[
    ("departure.tau", 2.7),
    ("larkfield.near.offset", 4.0),
    ("larkfield.near.first.bias", 2.03),
    ("larkfield.near.first.evolution", 0.55),
    ("larkfield.middle.offset", -6.0),
    ("larkfield.middle.second.bias", 1.23),
    ("larkfield.middle.second.evolution", -0.4),
    ("larkfield.far.first.magnification", 0.68),
    ("larkfield.far.first.evolution", 0.45),
    ("northmoor.early.offset", 9.0),
    ("northmoor.early.second.magnification", 0.27),
    ("northmoor.earliest.offset", -3.0),
    ("northmoor.earliest.first.bias", 2.46),
    ("northmoor.earliest.second.evolution", 0.4),
    ("systematic.bright-luminosity-function", 0.4),
    ("systematic.faint-luminosity-function", -0.6),
];

/// Volume in (Mpc/h)³ and densities in (h/Mpc)³, by bin.
pub const SAMPLINGS: [(f64, f64, f64); 5] = [
    (1.5e9, 1.0e-3, 4.0e-3),
    (3.5e9, 9.0e-4, 3.6e-3),
    (6.0e9, 8.0e-4, 3.2e-3),
    (1.2e10, 6.0e-4, 2.4e-3),
    (1.6e10, 4.0e-4, 1.6e-3),
];

/// How the surveys are binned: shells of 8 Mpc/h from 24 to 144, dipole and octupole.
#[must_use]
pub fn design() -> Design {
    Design {
        multipoles: vec![1, 3],
        edges: (0..=15).map(|i| 24.0 + 8.0 * f64::from(i)).collect(),
        bins: SAMPLINGS
            .map(|(volume, first_density, second_density)| Sampling { volume, first_density, second_density })
            .to_vec(),
    }
}

/// Name and content of each file that goes beside `study`, the demo's study file.
///
/// # Errors
/// [`RunError`] where the study can't be read or predicted.
pub fn files(study: &Path) -> Result<Vec<(String, String)>, RunError> {
    let overrides: Vec<Override> = TRUTH
        .iter()
        .map(|(name, value)| Override::parse(&format!("{name}={value}")))
        .collect::<Result<_, _>>()?;
    let truth = Study::read(study, &overrides)?;
    let fiducial = Study::read(study, &[])?;
    let surveys = simulate(
        &truth,
        truth.hypothesis(Some(HYPOTHESIS))?,
        (&fiducial, fiducial.hypothesis(Some("gr"))?),
        &design(),
        SEED,
    )?;
    let mut files = vec![("truth.toml".to_owned(), truth_text())];
    for survey in surveys {
        files.push((format!("{}-multipoles.csv", survey.name), survey.multipoles));
        files.push((format!("{}-covariance.csv", survey.name), survey.covariance));
    }
    Ok(files)
}

/// The truth as a file.
fn truth_text() -> String {
    let mut text = format!(
        "# What the invented measurements of this folder were drawn from. What is not named stands at the centre of its prior.\n\
         hypothesis = \"{HYPOTHESIS}\"\nseed = {SEED}\n\n[values]\n"
    );
    for (name, value) in TRUTH {
        text.push_str(&format!("\"{name}\" = {value:?}\n"));
    }
    text.push_str("\n# volume in (Mpc/h)^3, densities of the first and the second tracer in (h/Mpc)^3, by bin\n[design]\n");
    for (index, (volume, first, second)) in SAMPLINGS.iter().enumerate() {
        text.push_str(&format!("bin{} = [{volume:e}, {first:e}, {second:e}]\n", index + 1));
    }
    text
}
