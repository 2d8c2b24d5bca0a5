//! What a fit says besides its parameters: clocks, and what is switched off.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::Folder;
use oddwell_sampler::{Control, Target};
use oddwell_study::assemble::{Posterior, read_measurements};
use oddwell_study::record::Summary;
use oddwell_study::{Existing, FitOptions, Fitted, Study, fit, read_summary};

/// Two bins; the measurements are those of general relativity, or nearly.
const TABLE: &str = "bin,multipole,separation,low,high,value,error\nnear,1,30,26,34,0.0010,2e-4\nnear,1,60,56,64,0.0005,1e-4\nnear,3,90,86,94,0.00005,5e-5\nfar,1,30,26,34,0.0007,2e-4\nfar,1,60,56,64,0.0003,1e-4\n";

fn text(prediction: &str, offset: &str, sigma8: &str) -> String {
    format!(
        "[background]\nomega_m = 0.31\nomega_b = 0.049\nh = 0.68\nn_s = 0.965\nsigma8 = {sigma8}\n\n[prediction]\n{prediction}\n\n[[survey]]\nname = \"s\"\nmultipoles = \"s.csv\"\n\n[[survey.bin]]\nname = \"near\"\nredshift = 0.3\n{offset}\nfirst = {{ bias = 2.1, magnification = 0.5, evolution = 0.1, bias_slope = -0.4 }}\nsecond = {{ bias = 1.2, magnification = 0.2, evolution = 0.0, bias_slope = 0.2 }}\n\n[[survey.bin]]\nname = \"far\"\nredshift = 0.6\n{offset}\nfirst = {{ bias = 2.2, magnification = 0.5, evolution = 0.1 }}\nsecond = {{ bias = 1.3, magnification = 0.2, evolution = 0.0 }}\n\n[[hypothesis]]\nname = \"h\"\ndeparture = \"per-bin\"\ntau = {{ normal = [0.0, 3.0] }}\n\n[sampling]\neffective_samples = 1000\n"
    )
}

const FREE_OFFSET: &str = "offset = { normal = [0.0, 10.0] }";
const FREE_SIGMA8: &str = "{ normal = [0.81, 0.02] }";

fn run(folder: &Folder, study: &Study) -> Fitted {
    let options = FitOptions {
        out: folder.0.path().join("run"),
        existing: Existing::Replace,
        seed: None,
        maximum_evaluations: None,
        command: Vec::new(),
        threads: 1,
    };
    let hypothesis = study.default_hypothesis();
    fit(study, hypothesis, &options, &mut |_, _| Control::Continue).unwrap()
}

#[test]
fn clocks_are_columns_of_the_chain_and_part_of_the_summary() {
    let folder = Folder::new();
    folder.write("s.csv", TABLE);
    let study = folder.study(&text("clock_distance = 34.0", FREE_OFFSET, FREE_SIGMA8));
    let fitted = run(&folder, &study);
    let summary: Summary = read_summary(&fitted.directory).unwrap();
    assert!(summary.converged);
    let chain = std::fs::read_to_string(fitted.directory.join("chain.csv")).unwrap();
    let mut lines = chain.lines();
    let header: Vec<&str> = lines.next().unwrap().split(',').collect();
    let names = ["derived.clock_contrast.s.near", "derived.clock_contrast.s.far"];
    assert_eq!(header[header.len() - 2..], names);
    let column = |name: &str| header.iter().position(|each| *each == name).unwrap();
    let rows: Vec<Vec<f64>> =
        lines.map(|line| line.split(',').map(|field| field.parse().unwrap()).collect()).collect();
    // Felt by light, the contrast is |1 + τ| σ8 times one number a bin.
    for (bin, name) in ["near", "far"].into_iter().zip(names) {
        let (tau, sigma8) = (column(&format!("departure.tau.s.{bin}")), column("background.sigma8"));
        let unit = |row: &Vec<f64>| row[column(name)] / ((1.0 + row[tau]).abs() * row[sigma8]);
        let first = unit(&rows[0]);
        assert!(rows.iter().all(|row| (unit(row) / first - 1.0).abs() < 1e-11));
        let clock = summary.clocks.iter().find(|clock| clock.bin == bin).unwrap();
        assert_eq!((clock.survey.as_str(), clock.distance), ("s", 34.0));
        let relativity = clock.general_relativity.unwrap();
        let best = summary.best.parameters["background.sigma8"];
        assert!((relativity / (first * best) - 1.0).abs() < 1e-11, "{relativity}");
        let mean = rows.iter().map(|row| row[column(name)]).sum::<f64>() / rows.len() as f64;
        assert!((clock.seconds_per_year.mean.unwrap() / mean - 1.0).abs() < 1e-12);
        let parameter = &summary.parameters[name];
        assert_eq!((parameter.mean, parameter.sd), (clock.seconds_per_year.mean, clock.seconds_per_year.sd));
        assert_eq!(parameter.interval68, clock.seconds_per_year.interval68);
        assert_eq!((parameter.prior_mean, parameter.prior_sd), (None, None));
        assert!(parameter.ess.unwrap() > 100.0 && parameter.rhat.unwrap() < 1.1);
        assert!((0.05..0.95).contains(&clock.share_reached.unwrap()), "{:?}", clock.share_reached);
        assert_eq!(fitted.manifest.units[name], "s/yr");
    }
    let json = std::fs::read_to_string(fitted.directory.join("summary.json")).unwrap();
    assert!(json.contains("\"clocks\": [\n    {\n      \"survey\": \"s\",\n      \"bin\": \"near\",\n      \"distance\": 34.0,"), "{json}");
    // Nothing is switched off.
    assert_eq!(summary.switched_off, None);
    assert!(json.contains("\"switched_off\": null"));
}

#[test]
fn the_largest_effect_that_is_switched_off_is_named_with_its_size() {
    let folder = Folder::new();
    folder.write("s.csv", TABLE);
    let summary = |prediction: &str, offset: &str| {
        run(&folder, &folder.study(&text(prediction, offset, "0.81"))).summary
    };
    let wide = summary("wide_angle = false\nlensing = false", FREE_OFFSET).switched_off.unwrap();
    assert_eq!(wide.effect, "wide_angle");
    let lensing = summary("lensing = false", FREE_OFFSET).switched_off.unwrap();
    assert_eq!(lensing.effect, "lensing");
    assert!(lensing.tau.abs() < wide.tau.abs());
    let cone = summary("light_cone = false", FREE_OFFSET).switched_off.unwrap();
    assert_eq!(cone.effect, "light_cone");

    // An offset that is held at 0 counts with 10 km/s, one that is held elsewhere does not.
    let offset = summary("", "").switched_off.unwrap();
    assert_eq!(offset.effect, "offset");
    assert_eq!(summary("", "offset = 1.0").switched_off, None);
    // The projection with errors of the table, by hand: Σ effect · ∂/∂τ / σ² over Σ (∂/∂τ)² / σ².
    let study = folder.study(&text("", "", "0.81"));
    let posterior =
        Posterior::new(&study, study.default_hypothesis(), &read_measurements(&study).unwrap()).unwrap();
    let mut scratch = posterior.scratch();
    let mut at = |offset: f64, tau: f64| {
        let mut values = posterior.values(&[tau, tau]);
        for bin in ["near", "far"] {
            values[posterior.model.layout().index(&format!("s.{bin}.offset")).unwrap()] = offset;
        }
        posterior.predict_values(&values, &mut scratch).unwrap()
    };
    let (plain, shifted, departed) = (at(0.0, 0.0), at(10.0, 0.0), at(0.0, 1.0));
    let errors = [2e-4, 1e-4, 5e-5, 2e-4, 1e-4];
    let product = |one: &[f64], other: &[f64]| -> f64 {
        (0..5).map(|i| (one[i] - plain[i]) * (other[i] - plain[i]) / (errors[i] * errors[i])).sum()
    };
    let expected = product(&shifted, &departed) / product(&departed, &departed);
    assert!((offset.tau / expected - 1.0).abs() < 1e-9, "{} {expected}", offset.tau);
}

/// A nuisance that the data leave alone fills its flat prior to both ends, which says nothing; one that the data push
/// against an end does. σ8 = 0.81 gives a dipole at 30 Mpc/h near the measured one of `near`, half of it needs less.
#[test]
fn a_pile_up_is_told_from_a_prior_left_alone() {
    let edges = |sigma8: &str| {
        let folder = Folder::new();
        folder.write("s.csv", TABLE.replace("0.0010,2e-4", "0.0010,2e-5"));
        let per_bin = "departure = \"per-bin\"\ntau = { normal = [0.0, 3.0] }";
        let text = text("", FREE_OFFSET, sigma8).replace(per_bin, "departure = \"none\"");
        let study = folder.study(&text);
        let warnings = run(&folder, &study).summary.warnings;
        warnings
            .into_iter()
            .filter(|warning| warning.code == "prior-edge")
            .map(|warning| warning.place)
            .collect::<Vec<_>>()
    };
    assert!(edges("{ uniform = [0.809, 0.811] }").is_empty());
    let pushed = edges("{ uniform = [0.2, 0.5] }");
    assert_eq!(pushed, ["background.sigma8"]);
}
