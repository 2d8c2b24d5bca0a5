#![allow(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use super::*;
use crate::assemble::read_measurements;
use crate::file::StudyFile;
use crate::resolve::Study;
use oddwell_sampler::Target;

const MEASURED: &str = "bin,multipole,separation,low,high,value,error\nnear,1,30,26,34,0.002,2e-4\nnear,3,90,86,94,0.0001,2e-4\n";

/// A posterior over one survey with one bin, in a folder that is gone once it is made.
fn posterior(background: &str, hypothesis: &str) -> (Posterior, Measurements) {
    let folder = tempfile::tempdir().unwrap();
    std::fs::write(folder.path().join("s.csv"), MEASURED).unwrap();
    let text = format!(
        "[background]\nomega_m = 0.31\nomega_b = 0.049\nn_s = 0.965\n{background}\n\n[[survey]]\nname = \"s\"\nmultipoles = \"s.csv\"\n\n[[survey.bin]]\nname = \"near\"\nnodes = [[0.4, 0.5], [0.6, 0.5]]\nfirst = {{ bias = 2.1, magnification = 0.5, evolution = 0.1 }}\nsecond = {{ bias = 1.2, magnification = 0.2, evolution = 0.0 }}\n\n[[hypothesis]]\nname = \"h\"\n{hypothesis}\n"
    );
    let study = Study::resolve(StudyFile::parse("study.toml", text, folder.path()).unwrap(), &[]).unwrap();
    let measurements = read_measurements(&study).unwrap();
    (Posterior::new(&study, study.default_hypothesis(), &measurements).unwrap(), measurements)
}

const HELD: &str = "h = 0.68\nsigma8 = { normal = [0.81, 0.05] }";
const FREE: &str = "h = { normal = [0.68, 0.05] }\nsigma8 = { normal = [0.81, 0.05] }";

/// Seconds a year by the method that suits, and by the integral with T and D asked for at each of its wavenumbers.
fn both(posterior: &Posterior, measurements: &Measurements, point: &[f64]) -> (f64, f64) {
    let start = posterior.values(&posterior.hypothesis.start());
    let contrasts = ClockContrasts::new(posterior, measurements, &start).unwrap();
    let values = posterior.values(point);
    let mut scratch = ClockScratch::default();
    let mut seconds = [0.0];
    contrasts.seconds_per_year(&values, &mut scratch, &mut seconds).unwrap();
    let full = contrasts.full(&values, &mut scratch, 0).unwrap().seconds_per_year();
    assert!((seconds[0] / full - 1.0).abs() < 1e-9, "{} {full}", seconds[0]);
    let power = contrasts.power(&values, contrasts.value(&values, "background.sigma8")).unwrap();
    let workspace = std::cell::RefCell::new(Workspace::new());
    let state = |k: f64| {
        contrasts.model.bin_state(&values, &mut workspace.borrow_mut(), 0, 0, k.clamp(LOWEST, 20.0)).unwrap()
    };
    let (distortion, growth) = (|k| state(k).time_distortion, |k| state(k).growth.growth);
    let setting = contrasts.setting(&values, 0);
    let background = contrasts.background(&values).unwrap();
    let direct = clock_contrast(&background, &power, &setting, &distortion, &growth).unwrap();
    (seconds[0], direct.seconds_per_year())
}

#[test]
fn general_relativity_gives_the_worked_value() {
    // Ωm 0.31, Ωb 0.049, h 0.68, n_s 0.965, σ8 0.81, damping 0.5, 50 Mpc/h at redshift 0.5: c = 1.281150e-5.
    let (posterior, measurements) = posterior(HELD, "departure = \"none\"");
    let (scaled, full) = both(&posterior, &measurements, &[0.81]);
    for seconds in [scaled, full] {
        assert!((seconds / (1.281150e-5 * 365.25 * 86_400.0) - 1.0).abs() < 4e-7, "{seconds}");
    }
}

#[test]
fn every_method_gives_what_the_integral_gives() {
    let light = "departure = \"constant\"\nfelt_by = \"light\"\ntau = { normal = [0.0, 3.0] }";
    let everything = light.replace("light", "everything").replace("[0.0, 3.0]", "[0.0, 0.1]");
    let force = "departure = \"finite-range\"\nfelt_by = \"matter\"\ntau = { normal = [0.3, 0.1] }\nrange = { uniform = [1.0, 60.0] }";
    let finite = "departure = \"finite-range\"\nfelt_by = \"light\"\ntau = { normal = [0.0, 3.0] }\nrange = { uniform = [1.0, 60.0] }";
    let chameleon = "departure = \"f-of-r\"\nlog10_f_r0 = { uniform = [-7.0, -4.0] }";
    // σ8 first. The tolerance is rounding where T and D are the same at every k; else that of the polynomial, 1e-6 of c²
    // where T D is of order one, and more where it passes through 0.
    let cases: [(&str, &str, &[f64], f64); 9] = [
        (HELD, light, &[0.7, 2.0], 1e-12),
        (HELD, light, &[0.7, -4.0], 1e-12),
        (HELD, &everything, &[0.9, 0.3], 1e-12),
        (HELD, finite, &[0.8, -1.9, 20.0], 1e-5),
        (HELD, finite, &[0.8, 5.0, 60.0], 1e-5),
        (HELD, force, &[0.8, 0.4, 8.0], 1e-5),
        (HELD, chameleon, &[0.75, -4.5], 1e-5),
        (FREE, light, &[0.72, 0.7, 2.0], 1e-12),
        (FREE, finite, &[0.72, 0.7, 2.0, 20.0], 1e-5),
    ];
    for (background, hypothesis, point, tolerance) in cases {
        let (posterior, measurements) = posterior(background, hypothesis);
        assert_eq!(posterior.dimension(), point.len());
        let (seconds, full) = both(&posterior, &measurements, point);
        assert!((seconds / full - 1.0).abs() < tolerance, "{hypothesis} at {point:?}: {seconds} {full}");
    }
}

#[test]
fn a_departure_scales_what_general_relativity_gives() {
    let light = "departure = \"constant\"\nfelt_by = \"light\"\ntau = { normal = [0.0, 3.0] }";
    let (posterior, measurements) = posterior(HELD, light);
    let values = posterior.values(&[0.81, 2.0]);
    let contrasts = ClockContrasts::new(&posterior, &measurements, &values).unwrap();
    let layout = posterior.model.layout();
    let relativity = contrasts.in_general_relativity(posterior.model.setup(), layout, &values).unwrap();
    let mut scratch = ClockScratch::default();
    let full = contrasts.full(&values, &mut scratch, 0).unwrap();
    assert!((full.seconds_per_year() / relativity[0] - 3.0).abs() < 1e-12);
    let mut none = [1.0];
    contrasts.seconds_per_year(&posterior.values(&[0.81, -1.0]), &mut scratch, &mut none).unwrap();
    assert_eq!(none, [0.0]);
    // The measurements reach from π/94 to π/26; what is left lies at lower wavenumbers for the most part.
    assert_eq!(contrasts.bins[0].reached, (PI / 94.0, PI / 26.0));
    assert!(full.share > 0.1 && full.share < 0.6, "{}", full.share);
}

#[test]
fn what_is_reached_is_the_hull_of_all_rows() {
    let row = |space, at, edges| Row {
        bin: 0,
        pair: oddwell_model::Pair::FirstSecond,
        multipole: 1,
        space,
        at,
        edges,
    };
    let rows = [
        row(Space::Separation, 40.0, None),
        row(Space::Separation, 5.0, Some((0.0, 8.0))),
        row(Space::Fourier, 0.02, Some((0.01, 0.03))),
    ];
    assert_eq!(reached(rows.iter()), (0.01, PI / 5.0));
    assert_eq!(reached(rows[..2].iter()), (PI / 40.0, PI / 5.0));
    assert_eq!(reached([].iter()), (0.0, 0.0));
}
