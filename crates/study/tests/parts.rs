//! Parts of a study: the departure from each of them beside the joint one, and fits to some of them alone.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{BACKGROUND, Folder};
use nalgebra::{DMatrix, DVector};
use oddwell_sampler::{Control, Target};
use oddwell_study::assemble::{Posterior, read_measurements};
use oddwell_study::record::{PartDeparture, Summary};
use oddwell_study::{FitOptions, Restriction, Study, fit};
use std::fmt::Write;

/// Bins, redshifts, and by how much their measurements are off.
const BINS: [(&str, &str, f64, f64); 3] =
    [("a", "near", 0.3, 1.0), ("a", "far", 0.6, -2.0), ("b", "wide", 0.45, 0.5)];

/// Two surveys that share volume, biases held: the prediction is linear in all that is inferred.
fn text(tau: &str) -> String {
    let bin = |index: usize| {
        let (_, name, redshift, _) = BINS[index];
        format!(
            "\n[[survey.bin]]\nname = \"{name}\"\nredshift = {redshift}\noffset = {{ normal = [0.0, 5.0] }}\nfirst = {{ bias = 2.1, magnification = {{ normal = [0.5, 0.1] }}, evolution = {{ normal = [0.1, 0.4] }} }}\nsecond = {{ bias = 1.2, magnification = 0.2, evolution = 0.0 }}\n"
        )
    };
    format!(
        "{BACKGROUND}\n[[survey]]\nname = \"a\"\nmultipoles = \"a.csv\"\n{}{}\n[[survey]]\nname = \"b\"\nmultipoles = \"b.csv\"\n{}\n[[joint_covariance]]\nsurveys = [\"a\", \"b\"]\nfile = \"joint.csv\"\n\n[[systematic]]\nname = \"counts\"\namplitude = {{ normal = [0.0, 1.0] }}\nmoves = [{{ quantity = \"*.*.first.evolution\", by = 0.5 }}]\n\n[[hypothesis]]\nname = \"h\"\n{tau}\n\n[sampling]\neffective_samples = 1000\n",
        bin(0),
        bin(1),
        bin(2)
    )
}

const CONSTANT: &str = "departure = \"constant\"\nfelt_by = \"light\"\ntau = { normal = [0.0, 200.0] }";

fn folder() -> Folder {
    let folder = Folder::new();
    let mut rows = 0;
    for survey in ["a", "b"] {
        let mut table = String::from("bin,multipole,separation,low,high,value\n");
        for (_, bin, _, off) in BINS.iter().filter(|(of, ..)| *of == survey) {
            for (step, at) in [30.0, 50.0, 80.0].into_iter().enumerate() {
                let value = 1.2e-3 * f64::powf(at / 30.0, -1.2) + off * 1e-4 * (1.0 - 0.3 * step as f64);
                writeln!(table, "{bin},1,{at},{},{},{value:e}", at - 4.0, at + 4.0).unwrap();
                rows += 1;
            }
        }
        folder.write(&format!("{survey}.csv"), table);
    }
    let mut joint = String::new();
    for i in 0..rows {
        let entry = |j: i32| if i == j { 1.0 } else { 0.3 * 0.7_f64.powi((i - j).abs()) };
        let line: Vec<String> = (0..rows).map(|j| format!("{:e}", 4e-9 * entry(j))).collect();
        joint.push_str(&(line.join(",") + "\n"));
    }
    folder.write("joint.csv", joint);
    folder
}

fn run(folder: &Folder, study: &Study, name: &str) -> Summary {
    let options = FitOptions {
        out: folder.0.path().join(name),
        existing: oddwell_study::Existing::Replace,
        seed: None,
        maximum_evaluations: None,
        command: Vec::new(),
        threads: 1,
    };
    fit(study, study.default_hypothesis(), &options, &mut |_, _| Control::Continue).unwrap().summary
}

/// Prediction at the priors' means without a departure, its derivatives, and the priors' variances.
struct Closed {
    residual: DVector<f64>,
    by_tau: DVector<f64>,
    noise: DMatrix<f64>,
}

/// d − p has covariance C + JΣJᵀ once all nuisances are integrated out.
fn closed(study: &Study) -> Closed {
    let measurements = read_measurements(study).unwrap();
    let posterior = Posterior::new(study, study.default_hypothesis(), &measurements).unwrap();
    let mut scratch = posterior.scratch();
    let taus = study.default_hypothesis().watched();
    let mut centre = study.default_hypothesis().start();
    taus.iter().for_each(|&tau| centre[tau] = 0.0);
    let plain = DVector::from_vec(posterior.predict(&centre, &mut scratch).unwrap());
    let mut noise = posterior.data.surveys()[0].covariance().matrix().clone();
    let mut by_tau = DVector::zeros(plain.len());
    for parameter in 0..centre.len() {
        let mut moved = centre.clone();
        moved[parameter] += 1.0;
        let change = DVector::from_vec(posterior.predict(&moved, &mut scratch).unwrap()) - &plain;
        if taus.contains(&parameter) {
            by_tau += change;
        } else {
            let sd = posterior.priors.standard_deviation(parameter);
            noise += &change * change.transpose() * (sd * sd);
        }
    }
    Closed { residual: posterior.data.surveys()[0].data() - plain, by_tau, noise }
}

impl Closed {
    /// Least squares for an amplitude in each part (rows of it), of some rows alone.
    fn estimates(&self, parts: &[Vec<usize>], of: &[usize]) -> (DVector<f64>, DMatrix<f64>) {
        let noise = self.noise.select_rows(of).select_columns(of).try_inverse().unwrap();
        let columns = DMatrix::from_fn(of.len(), parts.len(), |row, part| {
            if parts[part].contains(&of[row]) { self.by_tau[of[row]] } else { 0.0 }
        });
        let covariance = (columns.transpose() * &noise * &columns).try_inverse().unwrap();
        let values = &covariance * columns.transpose() * noise * self.residual.select_rows(of);
        (values, covariance)
    }
}

/// Derivatives by differences over a thousandth of an sd, of a prediction that is linear: nine digits, of which the
/// inversions of correlated matrices take a few.
fn same(found: Option<f64>, expected: f64, scale: f64) {
    let found = found.unwrap();
    assert!((found - expected).abs() < 1e-5 * scale, "{found} {expected}");
}

fn compare(found: &[PartDeparture], parts: &[Vec<usize>], closed: &Closed) {
    let all: Vec<usize> = (0..9).collect();
    let (values, covariance) = closed.estimates(parts, &all);
    assert_eq!(found.len(), parts.len());
    for (index, part) in found.iter().enumerate() {
        let sd = covariance[(index, index)].sqrt();
        same(part.together, values[index], sd);
        same(part.together_sd, sd, sd);
        let (alone, variance) = closed.estimates(&parts[index..=index], &parts[index]);
        let sd = variance[(0, 0)].sqrt();
        same(part.value, alone[0], sd);
        same(part.sd, sd, sd);
    }
}

#[test]
fn each_part_has_the_departure_of_least_squares() {
    let folder = folder();
    let bins: Vec<Vec<usize>> = vec![vec![0, 1, 2], vec![3, 4, 5], vec![6, 7, 8]];
    let surveys: Vec<Vec<usize>> = vec![(0..6).collect(), vec![6, 7, 8]];
    for tau in [CONSTANT, "departure = \"per-bin\"\ntau = { normal = [0.0, 200.0] }"] {
        let study = folder.study(&text(tau));
        let by_part = run(&folder, &study, "joint").by_part.unwrap();
        let closed = closed(&study);
        compare(&by_part.bins, &bins, &closed);
        compare(&by_part.surveys, &surveys, &closed);
        let names: Vec<(&str, Option<&str>)> =
            by_part.bins.iter().map(|part| (part.survey.as_str(), part.bin.as_deref())).collect();
        assert_eq!(names, [("a", Some("near")), ("a", Some("far")), ("b", Some("wide"))]);
        // χ² by hand: residuals of the estimates about their weighted mean.
        let (values, covariance) = closed.estimates(&bins, &(0..9).collect::<Vec<_>>());
        let inverse = covariance.try_inverse().unwrap();
        let ones = DVector::from_element(3, 1.0);
        let mean = (ones.transpose() * &inverse * &values)[0] / (ones.transpose() * &inverse * &ones)[0];
        let off = values - ones * mean;
        let chi2 = (off.transpose() * inverse * &off)[0];
        let found = by_part.bin_agreement.unwrap();
        assert!((found.chi2 / chi2 - 1.0).abs() < 1e-5, "{found:?} {chi2}");
        assert_eq!(found.degrees_of_freedom, 2);
        assert_eq!(by_part.survey_agreement.unwrap().degrees_of_freedom, 1);
    }
}

#[test]
fn blinded_parts_keep_their_errors_and_their_agreement() {
    let folder = folder();
    let study = folder.study(&text(CONSTANT));
    let mut summary = run(&folder, &study, "joint");
    let open = summary.by_part.clone().unwrap();
    oddwell_study::blinding::withhold(&mut summary);
    let blinded = summary.by_part.unwrap();
    assert_eq!(blinded.bin_agreement, open.bin_agreement);
    for (part, open) in blinded.bins.iter().zip(&open.bins) {
        assert_eq!((part.value, part.together), (None, None));
        assert_eq!((part.sd, part.together_sd), (open.sd, open.together_sd));
    }
}

fn restricted(study: &Study, only: &[&str], without: &[&str]) -> Result<Study, String> {
    let names = |list: &[&str]| list.iter().map(|name| (*name).to_owned()).collect();
    let restriction = Restriction { only: names(only), without: names(without) };
    study.restricted(&restriction).map_err(|error| error.to_string())
}

#[test]
fn a_part_is_the_study_without_the_rest() {
    let folder = folder();
    let study = folder.study(&text(CONSTANT));
    let names = |study: &Study| {
        let hypothesis = study.default_hypothesis();
        hypothesis.free.iter().map(|free| free.name.clone()).collect::<Vec<_>>()
    };
    let far = restricted(&study, &["a.far"], &[]).unwrap();
    let own = ["a.far.offset", "a.far.first.magnification", "a.far.first.evolution"];
    assert_eq!(names(&far), [&own[..], &["systematic.counts", "departure.tau"]].concat());
    assert_eq!(restricted(&study, &[], &["a.near", "b"]).map(|study| names(&study)), Ok(names(&far)));
    assert_eq!(restricted(&study, &["a"], &["a.near"]).map(|study| names(&study)), Ok(names(&far)));

    // Its rows and their block of the joint covariance, at any point.
    let whole = read_measurements(&study).unwrap();
    let part = read_measurements(&far).unwrap();
    let rows = [3, 4, 5];
    let joint = whole.groups[0].likelihood.covariance().matrix();
    assert_eq!(
        part.groups[0].likelihood.covariance().matrix(),
        &joint.select_rows(&rows).select_columns(&rows)
    );
    let posterior = Posterior::new(&far, far.default_hypothesis(), &part).unwrap();
    let all = Posterior::new(&study, study.default_hypothesis(), &whole).unwrap();
    let mut point = all.hypothesis.start();
    let own: Vec<f64> = (0..posterior.dimension()).map(|index| 0.3 + 0.1 * index as f64).collect();
    for (name, value) in posterior.map.names().iter().zip(&own) {
        point[all.hypothesis.free_index(name).unwrap()] = *value;
    }
    let found = posterior.predict(&own, &mut posterior.scratch()).unwrap();
    let expected = all.predict(&point, &mut all.scratch()).unwrap();
    for (found, expected) in found.iter().zip(&expected[3..6]) {
        assert!((found / expected - 1.0).abs() < 1e-13, "{found} {expected}");
    }

    // A fit to a part gives what the joint fit says of that part alone, to 4.5 Monte Carlo standard errors.
    let alone = run(&folder, &far, "far");
    assert_eq!((alone.only.as_slice(), alone.by_part.clone()), (&["a.far".to_owned()][..], None));
    let by_part = run(&folder, &study, "joint").by_part.unwrap();
    let (tau, expected) = (&alone.parameters["departure.tau"], &by_part.bins[1]);
    let sd = expected.sd.unwrap();
    let error = sd / tau.ess.unwrap().sqrt();
    assert!((tau.mean.unwrap() - expected.value.unwrap()).abs() < 4.5 * error, "{tau:?} {expected:?}");
    assert!((tau.sd.unwrap() / sd - 1.0).abs() < 4.5 / (2.0 * tau.ess.unwrap()).sqrt(), "{tau:?} {sd}");
}

#[test]
fn ties_joint_priors_and_departures_of_parts_reach_across() {
    let folder = folder();
    let tied = text("departure = \"per-survey\"\ntau = { normal = [0.0, 200.0] }")
        .replacen(
            "redshift = 0.6\noffset = { normal = [0.0, 5.0] }",
            "redshift = 0.6\noffset = { same_as = \"a.near.offset\" }",
            1,
        )
        .replacen("redshift = 0.45\noffset = { normal = [0.0, 5.0] }", "redshift = 0.45\noffset = 0.0", 1)
        .replacen("redshift = 0.3\noffset = { normal = [0.0, 5.0] }", "redshift = 0.3\noffset = 0.0", 1)
        + "\n[[joint_prior]]\nof = [\"a.near.offset\", \"b.wide.offset\"]\nmean = [1.0, 2.0]\ncovariance = [[4.0, 1.0], [1.0, 9.0]]\n";
    let study = folder.study(&tied);
    let far = restricted(&study, &["a.far"], &[]).unwrap();
    let hypothesis = far.default_hypothesis();
    let names: Vec<&str> = hypothesis.free.iter().map(|free| free.name.as_str()).collect();
    assert_eq!(
        names,
        [
            "a.near.offset",
            "a.far.first.magnification",
            "a.far.first.evolution",
            "systematic.counts",
            "departure.tau.a"
        ]
    );
    let priors = hypothesis.priors().unwrap();
    assert_eq!((priors.mean(0), priors.standard_deviation(0)), (1.0, 2.0));
    let posterior = Posterior::new(&far, hypothesis, &read_measurements(&far).unwrap()).unwrap();
    let values = posterior.values(&[7.0, 0.5, 0.1, 2.0, 0.0]);
    assert_eq!(values[posterior.slot("a.far.offset").unwrap()], 7.0);
    assert!((values[posterior.slot("a.far.first.evolution").unwrap()] - 1.1).abs() < 1e-15);

    // Held biases move nothing: a systematic of what is gone goes too.
    let b = restricted(&study, &[], &["a"]).unwrap();
    assert!(b.default_hypothesis().free_index("systematic.counts").is_some());
    let none = text(CONSTANT).replace("*.*.first.evolution", "a.near.first.evolution");
    let far = restricted(&folder.study(&none), &["a.far"], &[]).unwrap();
    assert!(far.default_hypothesis().quantity("systematic.counts").is_none());
}

#[test]
fn what_is_no_part_is_said() {
    let folder = folder();
    let study = folder.study(&text(CONSTANT));
    let said = |only: &[&str], without: &[&str]| restricted(&study, only, without).unwrap_err();
    assert_eq!(
        said(&["a.nera"], &[]),
        "--only a.nera: unknown survey or bin `a.nera`; did you mean `a.near`?"
    );
    assert_eq!(
        said(&[], &["c"]),
        "--without c: unknown survey or bin `c`; known: `a`, `a.near`, `a.far`, `b`, `b.wide`"
    );
    assert_eq!(said(&["b"], &["b.wide"]), "--without: leaves no bin of the study in; leave out less");
}
