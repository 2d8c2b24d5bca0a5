//! Redshifts of bins: one, or nodes; and the background that turned them into distances.

#![allow(clippy::unwrap_used, clippy::panic, reason = "a test stops at the first surprise")]

mod common;

use common::{BACKGROUND, CONSTANT, Folder, survey};
use oddwell_study::predict;

const TABLE: &str = "bin,multipole,separation,value,error\nnear,0,30,0.1,0.01\nnear,1,30,0.002,1e-4\nnear,1,60,0.001,1e-4\nnear,3,90,0.0001,1e-4\n";

fn predicted(folder: &Folder, redshift: &str, keys: &str) -> Vec<f64> {
    let study = folder.study(
        &["title = \"z\"\n", BACKGROUND, &survey("larkfield", "near", redshift, keys), CONSTANT].concat(),
    );
    predict(&study, study.default_hypothesis()).unwrap().iter().map(|row| row.predicted).collect()
}

fn folder() -> Folder {
    let folder = Folder::new();
    folder.write("larkfield.csv", TABLE);
    folder
}

/// The largest relative difference.
fn difference(one: &[f64], other: &[f64]) -> f64 {
    one.iter().zip(other).fold(0.0_f64, |worst, (one, other)| worst.max((one / other - 1.0).abs()))
}

#[test]
fn nodes_average_the_prediction() {
    let folder = folder();
    let near = predicted(&folder, "redshift = 0.30", "");
    let far = predicted(&folder, "redshift = 0.38", "");
    let nodes = predicted(&folder, "nodes = [[0.30, 0.4], [0.38, 0.6]]", "");
    let mean: Vec<f64> = near.iter().zip(&far).map(|(near, far)| 0.4 * near + 0.6 * far).collect();
    // Sums over some thousand wavenumbers that partly cancel, taken in another order.
    assert!(difference(&nodes, &mean) < 1e-12, "{nodes:?} {mean:?}");
    assert!(difference(&nodes, &predicted(&folder, "redshift = 0.348", "")) > 1e-3);
    let one = predicted(&folder, "nodes = [[0.30, 1]]", "");
    assert_eq!(one, near);
}

#[test]
fn rounded_weights_are_divided_by_their_sum() {
    let folder = folder();
    let rounded = predicted(&folder, "nodes = [[0.30, 0.333333], [0.34, 0.333333], [0.38, 0.333333]]", "");
    let thirds = [0.30, 0.34, 0.38].map(|z| predicted(&folder, &format!("redshift = {z}"), ""));
    let mean: Vec<f64> =
        (0..4).map(|row| thirds.iter().map(|values| values[row]).sum::<f64>() / 3.0).collect();
    assert!(difference(&rounded, &mean) < 1e-12, "{rounded:?} {mean:?}");
}
