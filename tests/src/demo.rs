//! The demo data: two invented surveys drawn by `oddwell simulate` from a recorded truth with a recorded seed.

use oddwell_study::{Draw, Override, RunError, Study, Truth, simulate_study};
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

/// The files that go beside the demo's study file.
pub const FILES: [&str; 5] = [
    "larkfield-multipoles.csv",
    "larkfield-covariance.csv",
    "northmoor-multipoles.csv",
    "northmoor-covariance.csv",
    "truth.csv",
];

/// Name and content of each of them, drawn for `study`, the demo's study file.
///
/// # Errors
/// [`RunError`] where the study can't be read or predicted.
pub fn files(study: &Path) -> Result<Vec<(String, String)>, RunError> {
    let overrides: Vec<Override> = TRUTH
        .iter()
        .map(|(name, value)| Override::parse(&format!("{name}={value}")))
        .collect::<Result<_, _>>()?;
    let study = Study::read(study, &overrides)?;
    let unreadable = |path: &Path, error: std::io::Error| RunError::UnreadableRun {
        path: path.to_owned(),
        reason: error.to_string(),
    };
    let temporary = std::env::temp_dir();
    let folder = tempfile::tempdir_in(&temporary).map_err(|error| unreadable(&temporary, error))?;
    let drawn = folder.path().join("demo");
    let draw = Draw { truth: Truth::Centre, seed: SEED, mocks: 0 };
    simulate_study(&study, study.hypothesis(Some(HYPOTHESIS))?, draw, &drawn)?;
    FILES
        .iter()
        .map(|name| {
            let path = drawn.join(name);
            let text = std::fs::read_to_string(&path).map_err(|error| unreadable(&path, error))?;
            Ok(((*name).to_owned(), text))
        })
        .collect()
}
