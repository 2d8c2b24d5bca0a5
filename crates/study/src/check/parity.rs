//! Odd against even: the block of the covariance between them, and even multipoles that leak into odd ones.

use super::expectation::{Expected, in_all, predict_rows};
use super::verdicts::{AmplitudeVerdict, amplitude_of};
use crate::assemble::Measurements;
use crate::file::SurveySection;
use crate::resolve::Study;
use crate::run_error::RunError;
use crate::simulate::sampling;
use nalgebra::DVector;
use oddwell_likelihood::Covariance;
use oddwell_likelihood::verdicts::{leakage_direction, parity_block};
use oddwell_model::covariance::gaussian_covariance;
use oddwell_model::{Model, ModelSetup, Pair, Row, Space, Workspace};
use serde::Serialize;

/// Even multipoles that a wrong sight-line or a lost weight mixes into odd ones.
const SOURCES: [u8; 2] = [0, 2];

/// The correlations between odd and even multipoles of one bin.
#[derive(Clone, Debug, Serialize)]
pub struct ParityVerdict {
    /// `SURVEY.BIN`.
    pub bin: String,
    /// The correlation largest in size.
    pub largest: f64,
    /// Its rows: the odd one and the even one.
    pub rows: [String; 2],
    /// The difference largest in size from the correlations of Gaussian fields for the survey's design; null where there is no
    /// design.
    pub largest_difference: Option<f64>,
    /// The probability that an estimate from mocks differs from those at least this much; null where it was not estimated.
    pub p_value: Option<f64>,
}

/// The share of an even multipole that is mixed into an odd one.
#[derive(Clone, Debug, Serialize)]
pub struct LeakageVerdict {
    /// `SURVEY.BIN`.
    pub bin: String,
    /// The even multipole, as predicted.
    pub from: u8,
    /// The odd multipole.
    pub into: u8,
    /// The share, with everything else marginalised, the departure included.
    pub share: AmplitudeVerdict,
}

/// One verdict for each bin whose cross pair has odd and even multipoles.
pub(super) fn parity_verdicts(
    study: &Study,
    measurements: &Measurements,
    expected: &Expected,
) -> Result<Vec<ParityVerdict>, RunError> {
    let mut verdicts = Vec::new();
    let mut first = 0;
    for (section, survey) in study.file.surveys.iter().zip(&measurements.surveys) {
        let own = &measurements.rows[first..first + survey.table.len()];
        first += own.len();
        let covariance = survey.likelihood.covariance();
        let labels = survey.table.row_labels();
        let mut bins: Vec<usize> = survey.bins.clone();
        bins.dedup();
        bins.sort_unstable();
        bins.dedup();
        for bin in bins {
            let of_bin = |odd: bool, space: Space| -> Vec<usize> {
                (0..own.len())
                    .filter(|&row| {
                        let Row { bin: its, pair, multipole, space: its_space, .. } = own[row];
                        its == bin
                            && pair == Pair::FirstSecond
                            && its_space == space
                            && (multipole % 2 == 1) == odd
                    })
                    .collect()
            };
            for space in [Space::Separation, Space::Fourier] {
                let (odd, even) = (of_bin(true, space), of_bin(false, space));
                if odd.is_empty() || even.is_empty() {
                    continue;
                }
                let rows: Vec<usize> = odd.iter().chain(&even).copied().collect();
                let block = covariance.select(&rows);
                let expectation = gaussian(section, own, &rows, bin, expected)?;
                let (left, right): (Vec<usize>, Vec<usize>) =
                    ((0..odd.len()).collect(), (odd.len()..rows.len()).collect());
                let mocks = survey.likelihood.mock_count();
                let found =
                    parity_block(&block, expectation.as_ref(), &left, &right, mocks).map_err(in_all)?;
                let (largest, one, other) = found.largest;
                verdicts.push(ParityVerdict {
                    bin: expected.posterior.model.setup().bins[bin].path(),
                    largest,
                    rows: [labels[rows[one]].clone(), labels[rows[other]].clone()],
                    largest_difference: expectation.is_some().then_some(found.largest_difference),
                    p_value: found.p_value.filter(|_| expectation.is_some()),
                });
            }
        }
    }
    Ok(verdicts)
}

/// The covariance of some rows of a bin (of `own`, a survey's) for Gaussian fields, where the survey's design says how many
/// galaxies there were, and the rows are such that it is known.
fn gaussian(
    section: &SurveySection,
    own: &[Row],
    rows: &[usize],
    bin: usize,
    expected: &Expected,
) -> Result<Option<Covariance>, RunError> {
    let name = &expected.posterior.model.setup().bins[bin].name;
    let within = section.bins.iter().find(|within| within.name.value == *name);
    let design = section.design.as_ref().filter(|_| section.window.is_none());
    let (Some(design), Some(within)) = (design, within) else { return Ok(None) };
    let rows: Vec<Row> = rows.iter().map(|&row| own[row]).collect();
    if rows.iter().any(|row| row.edges.is_none()) {
        return Ok(None);
    }
    let hypothesis = &expected.posterior.hypothesis;
    let Some(sampling) = sampling(hypothesis, design, within.design.as_ref())? else { return Ok(None) };
    let model = Model::new(ModelSetup { rows, ..expected.posterior.model.setup().clone() })?;
    let covariance = gaussian_covariance(&model, &expected.values, &mut Workspace::new(), bin, &sampling)?;
    Ok(Covariance::new(covariance, "Gaussian fields").ok())
}

/// For each odd multipole of each bin's cross pair, the shares of the predicted monopole and quadrupole in it. Surveys with a
/// window are left out: what a window mixes is in it.
pub(super) fn leakage_verdicts(
    measurements: &Measurements,
    expected: &Expected,
    blinded: bool,
) -> Result<Vec<LeakageVerdict>, RunError> {
    let mut windowed = Vec::new();
    for survey in &measurements.surveys {
        windowed.extend(std::iter::repeat_n(survey.window.is_some(), survey.table.len()));
    }
    let targets: Vec<usize> = (0..measurements.len())
        .filter(|&row| {
            let Row { pair, multipole, .. } = measurements.rows[row];
            multipole % 2 == 1 && pair == Pair::FirstSecond && !windowed[row]
        })
        .collect();
    if targets.is_empty() {
        return Ok(Vec::new());
    }
    let mut places: Vec<(usize, u8)> = Vec::new();
    for &row in &targets {
        let place = (measurements.rows[row].bin, measurements.rows[row].multipole);
        if !places.contains(&place) {
            places.push(place);
        }
    }
    let mut verdicts = Vec::new();
    for from in SOURCES {
        let sources: Vec<Row> =
            targets.iter().map(|&row| Row { multipole: from, ..measurements.rows[row] }).collect();
        let predicted = predict_rows(&expected.posterior, sources, &expected.values)?;
        let mut values = DVector::zeros(measurements.len());
        targets.iter().zip(&predicted).for_each(|(&row, value)| values[row] = *value);
        for &(bin, into) in &places {
            let leaks: Vec<(usize, usize)> = targets
                .iter()
                .filter(|&&row| (measurements.rows[row].bin, measurements.rows[row].multipole) == (bin, into))
                .map(|&row| (row, row))
                .collect();
            let direction = leakage_direction(&values, &leaks);
            let Some(share) = amplitude_of(&expected.open, &direction, blinded)? else { continue };
            let bin = expected.posterior.model.setup().bins[bin].path();
            verdicts.push(LeakageVerdict { bin, from, into, share });
        }
    }
    Ok(verdicts)
}
