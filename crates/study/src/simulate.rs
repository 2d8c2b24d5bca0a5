//! Draws synthetic measurements from a study's model, with the Gaussian covariance of a survey's design.

use crate::assemble::model_setup;
use crate::parameter_map::ParameterMap;
use crate::resolve::{Hypothesis, Study};
use crate::run_error::RunError;
use nalgebra::{DMatrix, DVector};
use oddwell_model::covariance::{Sampling, gaussian_covariance};
use oddwell_model::{Model, Pair, Row, Space, Workspace};
use rand::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use rand_xoshiro::Xoshiro256PlusPlus;
use std::fmt::Write;

/// How a survey's bins were sampled and binned.
#[derive(Clone, Debug, PartialEq)]
pub struct Design {
    /// Multipoles measured, 0 to 4.
    pub multipoles: Vec<u8>,
    /// Edges of the shells, Mpc/h, rising.
    pub edges: Vec<f64>,
    /// Volume and densities of each bin of the study, in the study's order.
    pub bins: Vec<Sampling>,
}

/// The two files of one simulated survey.
#[derive(Clone, Debug, PartialEq)]
pub struct SimulatedSurvey {
    /// The survey's name.
    pub name: String,
    /// The measurements, as `multipoles` of a survey.
    pub multipoles: String,
    /// Their covariance, as `covariance` of a survey.
    pub covariance: String,
}

/// Draws one measurement of each survey of `truth` (a hypothesis whose every quantity stands at its prior's centre or is
/// held). The covariance is that of Gaussian fields for `design`, evaluated at the centre of `fiducial`, as an analyst
/// would who does not know the truth. Bins share no volume.
///
/// The same study, design and seed give the same bytes; values carry seven digits, covariances nine.
///
/// # Errors
/// [`RunError`] where the model has no prediction or the design can't be covered.
pub fn simulate(
    study: &Study,
    truth: &Hypothesis,
    fiducial: (&Study, &Hypothesis),
    design: &Design,
    seed: u64,
) -> Result<Vec<SimulatedSurvey>, RunError> {
    let rows = rows_of(study, design);
    let (model, values) = at_centre(study, truth, rows.clone())?;
    let mut measured = vec![0.0; rows.len()];
    model.predict(&values, &mut Workspace::new(), &mut measured)?;
    let (model, values) = at_centre(fiducial.0, fiducial.1, rows.clone())?;
    let mut random = Xoshiro256PlusPlus::seed_from_u64(seed);
    let mut surveys = Vec::new();
    let mut bin = 0;
    for survey in &study.file.surveys {
        let mut table = String::from("bin,multipole,separation,low,high,value\n");
        let mut blocks = Vec::new();
        for section in &survey.bins {
            let covariance =
                gaussian_covariance(&model, &values, &mut Workspace::new(), bin, &design.bins[bin])?;
            let factor = covariance.clone().cholesky().map(|cholesky| cholesky.unpack());
            let draws = DVector::from_fn(covariance.nrows(), |_, _| StandardNormal.sample(&mut random));
            let noise = factor.map_or_else(|| draws.clone() * 0.0, |factor| factor * &draws);
            let of_bin = rows.iter().zip(&measured).filter(|(row, _)| row.bin == bin);
            for ((row, value), noise) in of_bin.zip(noise.iter()) {
                let Row { multipole, at, edges, .. } = row;
                let (low, high) = edges.unwrap_or((*at, *at));
                let name = &section.name.value;
                // Writing to a string can't fail.
                let _ = writeln!(table, "{name},{multipole},{at},{low},{high},{:.6e}", value + noise);
            }
            blocks.push(covariance);
            bin += 1;
        }
        let covariance = square_table(&blocks);
        surveys.push(SimulatedSurvey { name: survey.name.value.clone(), multipoles: table, covariance });
    }
    Ok(surveys)
}

fn rows_of(study: &Study, design: &Design) -> Vec<Row> {
    let bins = study.file.surveys.iter().map(|survey| survey.bins.len()).sum();
    let mut rows = Vec::new();
    for bin in 0..bins {
        for &multipole in &design.multipoles {
            rows.extend(design.edges.windows(2).map(|edges| Row {
                bin,
                pair: Pair::FirstSecond,
                multipole,
                space: Space::Separation,
                at: 0.5 * (edges[0] + edges[1]),
                edges: Some((edges[0], edges[1])),
            }));
        }
    }
    rows
}

fn at_centre(study: &Study, hypothesis: &Hypothesis, rows: Vec<Row>) -> Result<(Model, Vec<f64>), RunError> {
    let model = Model::new(model_setup(study, hypothesis, rows)?)?;
    let map = ParameterMap::new(hypothesis, model.layout().names())?;
    let mut values = vec![0.0; map.slots()];
    map.fill(&hypothesis.start(), &mut values);
    Ok((model, values))
}

/// A block-diagonal matrix as a square CSV table.
fn square_table(blocks: &[DMatrix<f64>]) -> String {
    let size: usize = blocks.iter().map(DMatrix::nrows).sum();
    let mut table = String::new();
    let mut first = 0;
    for block in blocks {
        for row in 0..block.nrows() {
            for column in 0..size {
                let inside = (first..first + block.ncols()).contains(&column);
                let value = if inside { block[(row, column - first)] } else { 0.0 };
                let separator = if column == 0 { "" } else { "," };
                let _ = if value == 0.0 {
                    write!(table, "{separator}0")
                } else {
                    write!(table, "{separator}{value:.8e}")
                };
            }
            table.push('\n');
        }
        first += block.nrows();
    }
    table
}
