//! One target for each reader, and two for what comes after reading.

use oddwell_likelihood::{Covariance, CovarianceRows, MockSet, MultipoleTable, npy_bytes};
use oddwell_study::assemble::{Posterior, read_measurements};
use oddwell_study::check::check;
use oddwell_study::{Override, RunError, Study, StudyFile, template};
use std::collections::BTreeMap;
use std::fmt::Write;
use std::path::Path;

/// What a target says to an input made from the sound one of an index.
type Answer = dyn Fn(usize, &[u8]) -> Result<(), String>;

/// A reader, and sound inputs for it.
pub struct Target {
    /// What the command line calls it.
    pub name: &'static str,
    /// What it feeds.
    pub about: &'static str,
    sound: Vec<Vec<u8>>,
    answer: Box<Answer>,
}

impl Target {
    /// The sound input that an attempt damages.
    #[must_use]
    pub fn sound(&self, attempt: u64) -> &[u8] {
        &self.sound[self.index(attempt)]
    }

    /// The answer to an input made from that one: nothing, or why not.
    ///
    /// # Errors
    /// What the reader says.
    pub fn answer(&self, attempt: u64, input: &[u8]) -> Result<(), String> {
        (self.answer)(self.index(attempt), input)
    }

    fn index(&self, attempt: u64) -> usize {
        (attempt % self.sound.len() as u64) as usize
    }

    fn new(
        name: &'static str,
        about: &'static str,
        sound: Vec<Vec<u8>>,
        answer: impl Fn(usize, &[u8]) -> Result<(), String> + 'static,
    ) -> Target {
        Target { name, about, sound, answer: Box::new(answer) }
    }
}

fn said<T, E: ToString>(answer: Result<T, E>) -> Result<(), String> {
    answer.map(drop).map_err(|error| error.to_string())
}

const ROWS: &str = "bin,multipole,separation,low,high,value\nnear,1,28,24,32,3.1e-3\nnear,1,36,32,40,2.4e-3\nnear,3,28,24,32,-1e-4\n";
const COVARIANCE: &str = "4e-8,1e-8,0\n1e-8,3e-8,0\n0,0,2e-8\n";
const WINDOW: &str = "1,0.01,0\n0,0.99,0.01\n0.02,0,1\n";
const STUDY: &str = r#"title = "fuzzed"

[background]
omega_m = { normal = [0.31, 0.01] }
omega_b = 0.049
h = 0.68
n_s = 0.965
sigma8 = 0.81
power = "power.csv"

[prediction]
damping = 1.0

[[survey]]
name = "a"
multipoles = "rows.csv"
covariance = "covariance.csv"
window = "window.csv"
window_rows = "window-rows.csv"
fiducial = { omega_m = 0.3 }

[[survey.bin]]
name = "near"
nodes = [[0.30, 0.4], [0.38, 0.6]]
offset = { normal = [0.0, 10.0] }
first = { bias = { normal = [2.1, 0.05] }, magnification = 0.5, evolution = { normal = [0.0, 0.3] } }
second = { bias = 1.2, magnification = 0.2, evolution = 0.0 }

[[hypothesis]]
name = "constant"
departure = "constant"
felt_by = "light"
tau = { normal = [0.0, 3.0] }

[[hypothesis]]
name = "range"
departure = "finite-range"
felt_by = "everything"
tau = { uniform = [0.0, 0.3] }
range = 20.0
"#;

/// The files of a study that uses every reader.
const FILES: [&str; 6] =
    ["study.toml", "rows.csv", "covariance.csv", "window.csv", "window-rows.csv", "power.csv"];

fn power() -> String {
    let mut table = String::from("# a spectrum of about the right shape\nwavenumber,power\n");
    for step in 0..200 {
        let k = 1e-5 * 1.09_f64.powi(step);
        // Writing to a string can't fail.
        let _ = writeln!(table, "{k:.6e},{:.6e}", k / (1.0 + (k / 0.02).powi(2)).powf(1.3));
    }
    table
}

fn contents() -> Vec<Vec<u8>> {
    [STUDY.to_owned(), ROWS.into(), COVARIANCE.into(), WINDOW.into(), ROWS.into(), power()]
        .into_iter()
        .map(String::into_bytes)
        .collect()
}

/// Reads the study of a folder and evaluates each hypothesis at the centre of its priors.
fn evaluated(folder: &Path) -> Result<(), RunError> {
    use oddwell_sampler::Target as _;
    let study = Study::read(folder.join("study.toml"), &[])?;
    let measurements = read_measurements(&study)?;
    for hypothesis in &study.hypotheses {
        let posterior = Posterior::new(&study, hypothesis, &measurements)?;
        // A rejected point is an answer.
        let _ = posterior.log_likelihood(&hypothesis.start(), &mut posterior.scratch());
    }
    Ok(())
}

/// A study of which one file is damaged.
fn of_file(
    name: &'static str,
    about: &'static str,
    damaged: &'static [&'static str],
    answer: fn(&Path) -> Result<(), RunError>,
) -> std::io::Result<Target> {
    let folder = tempfile::tempdir()?;
    for (file, content) in FILES.iter().zip(contents()) {
        std::fs::write(folder.path().join(file), content)?;
    }
    let all = contents();
    let of = |name: &&str| FILES.iter().position(|known| known == name).map(|index| all[index].clone());
    let sound: Vec<Vec<u8>> = damaged.iter().filter_map(of).collect();
    let whole = sound.clone();
    Ok(Target::new(name, about, sound, move |index, input| {
        let path = folder.path().join(damaged[index]);
        let written = std::fs::write(&path, input).map_err(|error| error.to_string());
        let answer = written.and_then(|()| said(answer(folder.path())));
        // Whatever comes next finds this one whole.
        let restored = std::fs::write(&path, &whole[index]).map_err(|error| error.to_string());
        answer.and(restored)
    }))
}

/// Every target.
///
/// # Errors
/// Where no temporary folder can be written.
pub fn targets() -> std::io::Result<Vec<Target>> {
    let matrix = nalgebra::DMatrix::from_row_slice(3, 3, &[4.0, 1.0, -0.5, 1.0, 9.0, 0.25, -0.5, 0.25, 1.5]);
    let npy = npy_bytes(&matrix);
    let fits = fits();
    let columns = BTreeMap::new;
    Ok(vec![
        Target::new(
            "study",
            "the study file, resolved",
            vec![template::study_text().into_bytes(), STUDY.as_bytes().to_vec()],
            |_, input| {
                let text = String::from_utf8_lossy(input).into_owned();
                said(StudyFile::parse("study.toml", text, "").and_then(|file| Study::resolve(file, &[])))
            },
        ),
        Target::new(
            "set",
            "what stands behind --set",
            [
                "departure.tau=3",
                "a.near.offset={ normal = [0, 5], within = [-9.0, 9.0] }",
                "a.near.second.bias={ same_as = \"a.near.first.bias\" }",
            ]
            .map(|text| text.as_bytes().to_vec())
            .to_vec(),
            |_, input| {
                let text = String::from_utf8_lossy(input).into_owned();
                let set = Override::parse(&text).map_err(|error| error.to_string())?;
                said(StudyFile::parse("study.toml", STUDY, "").and_then(|file| Study::resolve(file, &[set])))
            },
        ),
        Target::new(
            "multipoles",
            "a table of measurements",
            vec![ROWS.into(), b"# n\nbin,pair,multipole,separation,wavenumber,low,high,value,error\nfar,first-first,2,,0.1,0.08,0.12,310,12\n".to_vec()],
            move |_, input| said(MultipoleTable::parse("rows.csv", input, &columns())),
        ),
        Target::new("covariance-rows", "the table that names a covariance's rows", vec![ROWS.into()], move |_, input| {
            said(CovarianceRows::parse("rows.csv", input, &columns()))
        }),
        Target::new("covariance-csv", "a covariance as text", vec![COVARIANCE.into()], |_, input| {
            said(Covariance::parse("covariance.csv", input, 3))
        }),
        Target::new("covariance-npy", "a covariance as a NumPy array", vec![npy.clone()], |_, input| {
            said(Covariance::parse("covariance.npy", input, 3))
        }),
        Target::new("covariance-fits", "a covariance as a FITS image", vec![fits], |_, input| {
            said(Covariance::parse("covariance.fits", input, 3))
        }),
        Target::new("mocks", "mock measurements", vec![npy, COVARIANCE.into()], |index, input| {
            let name = ["mocks.npy", "mocks.csv"][index];
            let mocks = MockSet::parse(name, input, 3).map_err(|error| error.to_string())?;
            said(mocks.covariance())
        }),
        of_file("power", "a table of the matter power spectrum", &["power.csv"], evaluated)?,
        of_file("window", "a window matrix and its rows", &["window.csv", "window-rows.csv"], evaluated)?,
        of_file("evaluate", "a study read, and its likelihoods evaluated", &["study.toml", "rows.csv"], evaluated)?,
        of_file("check", "a study checked", &["study.toml", "rows.csv", "covariance.csv"], |folder| {
            let study = Study::read(folder.join("study.toml"), &[])?;
            check(&study, study.hypothesis(None)?).map(drop)
        })?,
    ])
}

/// A FITS image of three by three `float64` numbers.
fn fits() -> Vec<u8> {
    let cards = [
        "SIMPLE  =                    T",
        "BITPIX  =                  -64",
        "NAXIS   =                    2",
        "NAXIS1  =                    3",
        "NAXIS2  =                    3",
        "END",
    ];
    let mut bytes: Vec<u8> = cards.iter().flat_map(|card| format!("{card:<80}").into_bytes()).collect();
    bytes.resize(2880, b' ');
    for number in [4.0, 1.0, -0.5, 1.0, 9.0, 0.25, -0.5, 0.25, 1.5_f64] {
        bytes.extend(number.to_be_bytes());
    }
    bytes.resize(5760, 0);
    bytes
}
