//! A small study on disk, and the program to run on it.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use tempfile::TempDir;

/// Two hypotheses to fit and one that holds everything, on eight measured numbers.
const STUDY: &str = r#"title = "A small survey"

[background]
omega_m = 0.31
omega_b = 0.049
h = 0.68
n_s = 0.965
sigma8 = 0.81

[[survey]]
name = "larkfield"
multipoles = "multipoles.csv"

[[survey.bin]]
name = "near"
redshift = 0.35
first = { bias = 2.1, magnification = 0.5, evolution = EVOLUTION }
second = { bias = 1.2, magnification = 0.2, evolution = 0.0 }

[[hypothesis]]
name = "gr"
departure = "none"

[[hypothesis]]
name = "constant"
departure = "constant"
felt_by = "light"
tau = { normal = [0.0, 10.0] }

[sampling]
effective_samples = SAMPLES
seed = 3
"#;

const TABLE: &str = "\
bin,multipole,separation,low,high,value,error
near,1,28,24,32,0.0031,0.0005
near,1,36,32,40,0.0024,0.0004
near,1,44,40,48,0.0019,0.0003
near,1,52,48,56,0.0015,0.0003
near,3,28,24,32,0.0002,0.0005
near,3,36,32,40,0.0001,0.0004
near,3,44,40,48,0.0001,0.0003
near,3,52,48,56,0.0,0.0003
";

/// A folder with `study.toml` and its data; gone when dropped.
pub(crate) struct Folder {
    folder: TempDir,
}

impl Folder {
    /// A study that infers an evolution bias as well as the departure.
    #[allow(dead_code, reason = "not every test file uses it")]
    pub(crate) fn new() -> Self {
        Self::with("{ normal = [0.0, 0.3] }", 500)
    }

    /// The evolution bias as given, and effective samples to reach.
    pub(crate) fn with(evolution: &str, samples: u64) -> Self {
        let folder = tempfile::tempdir().expect("a temporary folder");
        let study = STUDY.replace("EVOLUTION", evolution).replace("SAMPLES", &samples.to_string());
        fs::write(folder.path().join("study.toml"), study).expect("a study file");
        fs::write(folder.path().join("multipoles.csv"), TABLE).expect("a table");
        Self { folder }
    }

    /// A path in the folder.
    pub(crate) fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    /// The program, in this folder.
    pub(crate) fn oddwell(&self, words: &[&str]) -> Command {
        let mut command = Command::new(env!("CARGO_BIN_EXE_oddwell"));
        command.args(words).current_dir(self.folder.path());
        command.env_remove("NO_COLOR").env_remove("RAYON_NUM_THREADS");
        command
    }

    /// Runs the program to its end.
    pub(crate) fn run(&self, words: &[&str]) -> Ran {
        Ran::of(self.oddwell(words).output().expect("the program starts"))
    }
}

/// A run of the program that has ended.
#[derive(Debug)]
pub(crate) struct Ran {
    /// Exit status.
    pub(crate) status: Option<i32>,
    /// Standard output.
    pub(crate) out: String,
    /// Standard error.
    pub(crate) err: String,
}

impl Ran {
    /// What `output` says.
    pub(crate) fn of(output: Output) -> Self {
        let text = |bytes| String::from_utf8(bytes).expect("UTF-8");
        Self { status: output.status.code(), out: text(output.stdout), err: text(output.stderr) }
    }

    /// Standard output as JSON.
    #[allow(dead_code, reason = "not every test file reads JSON")]
    pub(crate) fn json(&self) -> serde_json::Value {
        serde_json::from_str(&self.out).unwrap_or_else(|error| panic!("{error} in:\n{}", self.out))
    }
}

/// A JSON file.
#[allow(dead_code, reason = "not every test file reads JSON")]
pub(crate) fn json_file(path: &Path) -> serde_json::Value {
    let text = fs::read_to_string(path).unwrap_or_else(|error| panic!("{}: {error}", path.display()));
    serde_json::from_str(&text).unwrap_or_else(|error| panic!("{}: {error}", path.display()))
}

/// Names in a folder, hidden ones included, sorted.
#[allow(dead_code, reason = "not every test file looks into folders")]
pub(crate) fn names(folder: &Path) -> Vec<String> {
    let entries = fs::read_dir(folder).unwrap_or_else(|error| panic!("{}: {error}", folder.display()));
    let mut names: Vec<String> =
        entries.map(|entry| entry.expect("an entry").file_name().to_string_lossy().into_owned()).collect();
    names.sort();
    names
}
