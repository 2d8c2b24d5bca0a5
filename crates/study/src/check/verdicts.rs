//! The verdicts as data: what `oddwell check --json` prints.

use super::budget;
use super::expectation::{Expected, in_all, in_survey};
use super::parity::{LeakageVerdict, ParityVerdict, leakage_verdicts, parity_verdicts};
use super::redshifts::{ScaleFactorVerdict, WidthVerdict, scale_factor_verdicts, width_verdicts};
use crate::assemble::{Measurements, SurveyMeasurements};
use crate::resolve::Study;
use crate::run_error::RunError;
use nalgebra::DVector;
use oddwell_likelihood::verdicts::{
    Comparison, Goodness, VerdictError, amplitude, covariance_scale, goodness, mock_sufficiency, normality,
    orientation, signal, spectrum,
};
use serde::Serialize;

/// Everything that the data say before a fit. What would tell where the departure lies is null while they are blinded.
#[derive(Clone, Debug, Serialize)]
pub struct Verdicts {
    /// The hypothesis whose free parameters were marginalised.
    pub hypothesis: String,
    /// Whether the measurements are blinded.
    pub blinded: bool,
    /// By survey.
    pub surveys: Vec<SurveyVerdict>,
    /// Whether there is any odd signal at all, whatever it is, in all odd multipoles together.
    pub any_odd_signal: Option<SignalVerdict>,
    /// By survey, bin and multipole.
    pub signals: Vec<SignalVerdict>,
    /// Gravitational redshift against none: an amplitude that is 1 in general relativity and 0 without.
    pub gravitational_redshift: Option<AmplitudeVerdict>,
    /// The departure, from a linear estimate about general relativity.
    pub departure: Option<AmplitudeVerdict>,
    /// χ² of the measurements about the expectation in general relativity: all, by survey, by bin, by multipole.
    pub goodness: Vec<GoodnessVerdict>,
    /// Anderson–Darling test of the whitened residuals: p-value.
    pub normality: Option<f64>,
    /// Whether the odd multipoles would fit better with the tracers swapped.
    pub orientation: Option<OrientationVerdict>,
    /// Correlations between odd and even multipoles, by bin.
    pub parity: Vec<ParityVerdict>,
    /// Even multipoles in odd ones, by bin.
    pub leakage: Vec<LeakageVerdict>,
    /// Redshifts against scale factors, by bin and survey; empty while blinded.
    pub scale_factors: Vec<ScaleFactorVerdict>,
    /// The widths that bins may have, by bin.
    pub widths: Vec<WidthVerdict>,
    /// The standard deviation of the departure that is expected from covariances and priors alone.
    pub expected_sd: Option<f64>,
    /// What it would be with each group of nuisances known.
    pub error_budget: Vec<BudgetLine>,
    /// What nuisances and switched-off effects are worth in units of the departure (felt by light), by bin.
    pub tau_equivalents: Vec<TauEquivalent>,
}

/// One survey's rows and covariance.
#[derive(Clone, Debug, Serialize)]
pub struct SurveyVerdict {
    /// The survey.
    pub name: String,
    /// Rows kept.
    pub rows_kept: usize,
    /// Rows cut by `keep`.
    pub rows_cut: usize,
    /// The noise model.
    pub noise: String,
    /// Its covariance.
    pub covariance: CovarianceVerdict,
}

/// A covariance's spectrum, its mocks and its size.
#[derive(Clone, Debug, Serialize)]
pub struct CovarianceVerdict {
    /// Largest over smallest eigenvalue of the correlations.
    pub condition: Option<f64>,
    /// The smallest modes.
    pub smallest_modes: Vec<ModeVerdict>,
    /// Mocks behind it; null for a covariance that is known.
    pub mocks: Option<usize>,
    /// How much larger the parameters' errors are for the finite number of mocks.
    pub error_growth: Option<f64>,
    /// The factor by which it should be multiplied for the residuals to be as large as they are; null while blinded.
    pub scale: Option<f64>,
    /// The probability of a factor at least as far from 1.
    pub scale_p_value: Option<f64>,
}

/// One mode of a covariance.
#[derive(Clone, Debug, Serialize)]
pub struct ModeVerdict {
    /// Eigenvalue of the correlations: 1 for uncorrelated rows.
    pub eigenvalue: f64,
    /// The rows that make it up, with their shares.
    pub rows: Vec<(String, f64)>,
}

/// How much signal there is in some rows, whatever it is.
#[derive(Clone, Debug, Serialize)]
pub struct SignalVerdict {
    /// `all`, or survey, bin, pair and multipole.
    pub place: String,
    /// Rows.
    pub rows: usize,
    /// Estimated signal-to-noise.
    pub signal_to_noise: f64,
    /// How surely there is anything, in standard deviations.
    pub sigma: Option<f64>,
    /// Gravitational redshift in these rows alone, 1 in general relativity and 0 without; null where they do not see it.
    pub gravitational_redshift: Option<AmplitudeVerdict>,
    /// The departure in these rows alone, linear about general relativity; null where they do not see it.
    pub departure: Option<AmplitudeVerdict>,
}

/// An amplitude with its error.
#[derive(Clone, Debug, Serialize)]
pub struct AmplitudeVerdict {
    /// The amplitude; null while blinded.
    pub value: Option<f64>,
    /// Its standard deviation, nuisances marginalised.
    pub sd: f64,
    /// Standard deviations from none; null while blinded.
    pub sigma: Option<f64>,
}

/// χ² of some rows.
#[derive(Clone, Debug, Serialize)]
pub struct GoodnessVerdict {
    /// `all`, or a survey, `SURVEY.BIN`, or `SURVEY.BIN multipole ℓ`.
    pub place: String,
    /// χ².
    pub chi2: f64,
    /// Rows.
    pub rows: usize,
    /// The probability of a χ² at least this large.
    pub p_value: Option<f64>,
}

/// The orientation test.
#[derive(Clone, Debug, Serialize)]
pub struct OrientationVerdict {
    /// By how much −2 ln L changes if the tracers are swapped: below 0 where that fits better.
    pub difference: f64,
    /// What it is expected to be where the tracers stand as they should.
    pub expected: f64,
    /// A bound on the probability of a difference this far below 0 where they do.
    pub p_value: f64,
}

/// The departure's error with one group of nuisances known.
#[derive(Clone, Debug, Serialize)]
pub struct BudgetLine {
    /// The group.
    pub group: String,
    /// The standard deviation of the departure with it known.
    pub sd: f64,
    /// The share of the variance that it is to blame for.
    pub share: f64,
}

/// What a nuisance of a bin is worth in units of the departure.
#[derive(Clone, Debug, Serialize)]
pub struct TauEquivalent {
    /// `SURVEY.BIN`.
    pub bin: String,
    /// The quantity, or the effect that is switched off.
    pub quantity: String,
    /// What a unit of it is worth in τ; for an effect, the whole of it.
    pub per_unit: f64,
    /// What a standard deviation of its prior is worth; null where it is held.
    pub per_prior_sd: Option<f64>,
}

pub(super) fn verdicts(
    study: &Study,
    measurements: &Measurements,
    expected: &Expected,
) -> Result<Verdicts, RunError> {
    let blinded = study.file.blinding.is_some();
    let comparison = &expected.comparison;
    let places = places(measurements);
    let odd: Vec<usize> =
        (0..measurements.len()).filter(|&row| measurements.rows[row].multipole % 2 == 1).collect();
    let sees_redshift = expected.redshift.iter().any(|change| *change != 0.0);
    let without = comparison.clone().about(&expected.expectation.prediction - &expected.redshift);
    let of_departure =
        expected.watched.first().map(|&tau| expected.expectation.jacobian.column(tau).into_owned());
    let signal_of = |place: &str, rows: &[usize]| -> Result<SignalVerdict, RunError> {
        let selected = comparison.select(rows);
        let found = signal(&selected).map_err(in_all)?;
        // Rounding is no direction.
        let part = |whole: &DVector<f64>| {
            let part = whole.select_rows(rows);
            (part.amax() > 1e-9 * whole.amax()).then_some(part)
        };
        let gravitational_redshift = match part(&expected.redshift) {
            Some(direction) => amplitude_of(&without.select(rows), &direction, blinded)?,
            None => None,
        };
        let departure = match of_departure.as_ref().and_then(part) {
            Some(direction) => amplitude_of(&selected, &direction, blinded)?,
            None => None,
        };
        Ok(SignalVerdict {
            place: place.to_owned(),
            rows: rows.len(),
            signal_to_noise: found.signal_to_noise,
            sigma: found.sigma,
            gravitational_redshift,
            departure,
        })
    };
    let mut signals = Vec::new();
    for (place, rows) in places.iter().filter(|(place, _)| place.contains(" multipole ")) {
        signals.push(signal_of(place, rows)?);
    }
    let mut goodness_list = Vec::new();
    if !blinded {
        for (place, rows) in &places {
            let Goodness { chi_squared, p_value, .. } = goodness(&comparison.select(rows)).map_err(in_all)?;
            let place = place.clone();
            goodness_list.push(GoodnessVerdict { place, chi2: chi_squared, rows: rows.len(), p_value });
        }
    }
    let redshift = if sees_redshift { amplitude_of(&without, &expected.redshift, blinded)? } else { None };
    let departure = match &of_departure {
        Some(direction) => amplitude_of(comparison, direction, blinded)?,
        None => None,
    };
    let turned = if odd.is_empty() || blinded {
        None
    } else {
        let found = orientation(comparison, &odd).map_err(in_all)?;
        let (difference, p_value) = (found.difference, found.p_value);
        Some(OrientationVerdict { difference, expected: found.expected, p_value })
    };
    let normal = if blinded { None } else { normality(comparison).map_err(in_all)? };
    let (expected_sd, error_budget) = budget::error_budget_of(expected)?;
    Ok(Verdicts {
        hypothesis: expected.posterior.hypothesis.name.clone(),
        blinded,
        surveys: survey_verdicts(measurements, expected, blinded)?,
        any_odd_signal: if odd.is_empty() { None } else { Some(signal_of("all odd multipoles", &odd)?) },
        signals,
        gravitational_redshift: redshift,
        departure,
        goodness: goodness_list,
        normality: normal.map(|normal| normal.p_value),
        orientation: turned,
        parity: parity_verdicts(study, measurements, expected)?,
        leakage: leakage_verdicts(measurements, expected, blinded)?,
        scale_factors: if blinded { Vec::new() } else { scale_factor_verdicts(measurements, expected)? },
        widths: width_verdicts(study, measurements, expected)?,
        expected_sd,
        error_budget,
        tau_equivalents: budget::tau_equivalents(measurements, expected)?,
    })
}

/// Rows of all, of each survey, of each bin, and of each multipole of each bin, with what to call them.
pub(super) fn places(measurements: &Measurements) -> Vec<(String, Vec<usize>)> {
    let mut places = vec![("all".to_owned(), (0..measurements.len()).collect::<Vec<_>>())];
    let mut add = |place: String, row: usize| match places.iter_mut().find(|(known, _)| *known == place) {
        Some((_, rows)) => rows.push(row),
        None => places.push((place, vec![row])),
    };
    let surveys = measurements.surveys.iter();
    let rows = surveys.flat_map(|survey| survey.table.rows.iter().map(|row| (survey.name.clone(), row)));
    for (index, (survey, row)) in rows.enumerate() {
        let bin = format!("{survey}.{}", row.bin);
        add(survey, index);
        add(bin.clone(), index);
        let pair = if row.pair == "first-second" { String::new() } else { format!(" {}", row.pair) };
        add(format!("{bin}{pair} multipole {}", row.multipole), index);
    }
    places
}

/// The amplitude of a direction, its value withheld while blinded; none for a direction that these rows do not see, or where
/// there are too few mocks for it.
pub(super) fn amplitude_of(
    comparison: &Comparison,
    direction: &DVector<f64>,
    blinded: bool,
) -> Result<Option<AmplitudeVerdict>, RunError> {
    if direction.iter().all(|change| *change == 0.0) {
        return Ok(None);
    }
    let found = match amplitude(comparison, direction) {
        Ok(found) => found,
        Err(VerdictError::TooFewMocks { .. } | VerdictError::NoDirection { .. }) => return Ok(None),
        Err(error) => return Err(in_all(error)),
    };
    let shown = |value: f64| (!blinded).then_some(value);
    let sd = found.standard_deviation;
    Ok(Some(AmplitudeVerdict { value: shown(found.value), sd, sigma: shown(found.sigma_from(0.0)) }))
}

fn survey_verdicts(
    measurements: &Measurements,
    expected: &Expected,
    blinded: bool,
) -> Result<Vec<SurveyVerdict>, RunError> {
    // The departure's own prior stays in: a departure is no reason to doubt a covariance.
    let all = Comparison::new(&expected.posterior.data, &expected.expectation).map_err(in_all)?;
    let mut surveys = Vec::new();
    for (index, (first, survey)) in measurements.with_offsets().enumerate() {
        let rows: Vec<usize> = (first..first + survey.table.len()).collect();
        let noise = measurements.noise_name(index);
        surveys.push(survey_verdict((survey, noise), &all.select(&rows), expected, blinded)?);
    }
    Ok(surveys)
}

fn survey_verdict(
    (survey, noise): (&SurveyMeasurements, &str),
    comparison: &Comparison,
    expected: &Expected,
    blinded: bool,
) -> Result<SurveyVerdict, RunError> {
    let likelihood = &survey.likelihood;
    let modes = spectrum(likelihood.covariance(), 3, 3);
    let mocks = likelihood.mock_count();
    let determined = expected.posterior.map.dimension().min(survey.table.len());
    let error_growth =
        mocks.map(|mocks| mock_sufficiency(mocks, survey.table.len(), determined).error_growth);
    let scale = if blinded { None } else { covariance_scale(comparison).map_err(in_all)? };
    let labels = survey.table.row_labels();
    let named = |(row, share): (usize, f64)| (labels[row].clone(), share);
    likelihood.covariance().check_definite().map_err(|error| in_survey(&survey.name, error.into()))?;
    Ok(SurveyVerdict {
        name: survey.name.clone(),
        rows_kept: survey.table.len(),
        rows_cut: survey.cut,
        noise: noise.to_owned(),
        covariance: CovarianceVerdict {
            condition: Some(modes.condition).filter(|condition| condition.is_finite()),
            smallest_modes: modes
                .smallest
                .into_iter()
                .map(|mode| ModeVerdict {
                    eigenvalue: mode.eigenvalue,
                    rows: mode.rows.into_iter().map(named).collect(),
                })
                .collect(),
            mocks,
            error_growth: error_growth.filter(|growth| growth.is_finite()),
            scale: scale.as_ref().map(|scale| scale.factor()),
            scale_p_value: scale.as_ref().map(|scale| scale.p_value),
        },
    })
}
