//! Studies that the tests start from.

use oddwell_study::{Override, Study, StudyFile};

/// A study with one of everything that matters to resolution.
pub(crate) const BASE: &str = r#"title = "Two invented surveys"

[background]
omega_m = 0.31
omega_b = 0.049
h = 0.68
n_s = 0.965
sigma8 = { normal = [0.81, 0.01] }

[prediction]
damping = 0.5

[[survey]]
name = "larkfield"
multipoles = "larkfield.csv"
covariance = "larkfield-covariance.csv"
keep = [{ separation = [24.0, 144.0], multipoles = [1, 3] }]

[[survey.bin]]
name = "near"
redshift = 0.35
offset = { normal = [0.0, 10.0] }
first = { label = "bright", bias = 2.1, magnification = 0.5, evolution = { normal = [0.0, 0.3] } }
second = { label = "faint", bias = 1.2, magnification = 0.2, evolution = 0.0 }

[[survey.bin]]
name = "far"
redshift = 0.6
first = { bias = 2.2, magnification = 0.5, evolution = { same_as = "larkfield.near.first.evolution" } }
second = { bias = 1.3, magnification = 0.2, evolution = 0.0 }

[[systematic]]
name = "luminosity-function"
amplitude = { normal = [0.0, 1.0] }
moves = [{ quantity = "larkfield.*.second.evolution", by = 0.3 }]

[[hypothesis]]
name = "gr"
departure = "none"

[[hypothesis]]
name = "constant"
departure = "constant"
felt_by = "light"
tau = { uniform = [-30.0, 30.0] }

[sampling]
effective_samples = 4000
seed = 1
"#;

/// The base study with one piece of text put in the place of another.
pub(crate) fn changed(from: &str, to: &str) -> String {
    assert_eq!(BASE.matches(from).count(), 1, "`{from}` must stand in the base study exactly once");
    BASE.replacen(from, to, 1)
}

/// Reads and resolves.
#[allow(dead_code, reason = "not every test file that shares this module resolves")]
pub(crate) fn resolve(text: &str, set: &[&str]) -> Result<Study, String> {
    let overrides: Result<Vec<_>, _> = set.iter().map(|each| Override::parse(each)).collect();
    let overrides = overrides.map_err(|error| error.to_string())?;
    let file = StudyFile::parse("study.toml", text, "").map_err(|error| error.to_string())?;
    Study::resolve(file, &overrides).map_err(|error| error.to_string())
}
