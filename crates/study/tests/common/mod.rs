//! Studies that the tests start from.

#![allow(dead_code, reason = "a test file that shares this module uses a part of it")]

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
pub(crate) fn resolve(text: &str, set: &[&str]) -> Result<Study, String> {
    let overrides: Result<Vec<_>, _> = set.iter().map(|each| Override::parse(each)).collect();
    let overrides = overrides.map_err(|error| error.to_string())?;
    let file = StudyFile::parse("study.toml", text, "").map_err(|error| error.to_string())?;
    Study::resolve(file, &overrides).map_err(|error| error.to_string())
}

/// A study in a folder of its own, with files that the test writes.
pub(crate) struct Folder(pub(crate) tempfile::TempDir);

#[allow(clippy::unwrap_used, reason = "a test stops at the first surprise")]
impl Folder {
    pub(crate) fn new() -> Folder {
        Folder(tempfile::tempdir().unwrap())
    }

    pub(crate) fn write(&self, name: &str, text: impl AsRef<[u8]>) {
        std::fs::write(self.0.path().join(name), text).unwrap();
    }

    /// The study of a text whose paths begin in this folder.
    pub(crate) fn study(&self, text: &str) -> Study {
        let file = StudyFile::parse("study.toml", text, self.0.path()).map_err(|error| error.to_string());
        Study::resolve(file.unwrap(), &[]).map_err(|error| error.to_string()).unwrap()
    }

    /// A text without the folder's path.
    pub(crate) fn local(&self, text: &str) -> String {
        text.replace(&format!("{}/", self.0.path().display()), "")
    }
}

/// `[background]` of the studies with data.
pub(crate) const BACKGROUND: &str =
    "[background]\nomega_m = 0.31\nomega_b = 0.049\nh = 0.68\nn_s = 0.965\nsigma8 = 0.81\n";

/// A departure that light feels.
pub(crate) const CONSTANT: &str = "\n[[hypothesis]]\nname = \"constant\"\ndeparture = \"constant\"\nfelt_by = \"light\"\ntau = { normal = [0.0, 3.0] }\n";

/// A survey with one bin at this redshift, and more keys.
pub(crate) fn survey(name: &str, bin: &str, redshift: &str, keys: &str) -> String {
    format!(
        "\n[[survey]]\nname = \"{name}\"\nmultipoles = \"{name}.csv\"\n{keys}\n[[survey.bin]]\nname = \"{bin}\"\n{redshift}\noffset = {{ normal = [0.0, 10.0] }}\nfirst = {{ bias = {{ normal = [2.1, 0.05] }}, magnification = 0.5, evolution = {{ normal = [0.1, 0.3] }}, bias_slope = -0.4 }}\nsecond = {{ bias = 1.2, magnification = 0.2, evolution = 0.0, bias_slope = 0.2 }}\n"
    )
}
