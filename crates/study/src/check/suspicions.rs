//! What the verdicts make suspicious, with what to do about it.

use super::ALARM;
use super::expectation::{Expected, in_all};
use super::verdicts::{Verdicts, places};
use crate::assemble::{Measurements, SurveyMeasurements};
use crate::record::WarningRecord;
use crate::resolve::Study;
use crate::run_error::RunError;
use oddwell_likelihood::verdicts::{Swap, duplicate, row_order};

/// An evolution bias beyond this is more likely a slope of observed counts.
const LARGE_EVOLUTION: f64 = 5.0;
/// A redshift this close to 1 and below, with several bins so, may be a scale factor.
const ERROR_GROWTH: f64 = 1.2;

fn warning(code: &str, place: &str, text: String) -> WarningRecord {
    WarningRecord { code: code.to_owned(), text, place: place.to_owned() }
}

pub(super) fn suspicions(
    study: &Study,
    measurements: &Measurements,
    expected: &Expected,
    verdicts: &Verdicts,
) -> Result<Vec<WarningRecord>, RunError> {
    let mut warnings = Vec::new();
    for survey in &verdicts.surveys {
        let covariance = &survey.covariance;
        if let (Some(scale), Some(p_value)) = (covariance.scale, covariance.scale_p_value)
            && p_value < ALARM / verdicts.surveys.len() as f64
        {
            warnings.push(warning("covariance-scale", &survey.name, format!(
                "the residuals of `{}` are those of a covariance {scale:.3e} times the one given (p = {p_value:.1e}); check its units, and that measurements and covariance belong together",
                survey.name
            )));
        }
        if let (Some(mocks), growth) = (covariance.mocks, covariance.error_growth) {
            let short = growth.is_none_or(|growth| growth > ERROR_GROWTH);
            if short {
                let growth =
                    growth.map_or_else(|| "beyond measure".to_owned(), |growth| format!("{growth:.2} times"));
                warnings.push(warning("few-mocks", &survey.name, format!(
                    "{mocks} mocks for {} rows of `{}` make errors larger by {growth}; make more mocks, or keep fewer rows",
                    survey.rows_kept, survey.name
                )));
            }
        }
    }
    warnings.extend(poor_fit(verdicts));
    if let Some(p_value) = verdicts.normality.filter(|p_value| *p_value < ALARM) {
        warnings.push(warning("not-normal", "all", format!(
            "the whitened residuals are not normal (Anderson–Darling p = {p_value:.1e}); look for outliers and for rows that do not belong to their covariance"
        )));
    }
    if let Some(turned) = verdicts.orientation.as_ref().filter(|turned| turned.p_value < ALARM) {
        warnings.push(warning("orientation", "all", format!(
            "the odd multipoles fit better with the two tracers swapped, by {:.1} in −2 ln L: the first tracer of each bin is {}, and separations must run from the first to the second; check the order, nothing was swapped",
            -turned.difference,
            first_labels(study)
        )));
    }
    if !verdicts.blinded {
        warnings.extend(disorder(measurements, expected)?);
    }
    warnings.extend(duplicates(measurements)?);
    warnings.extend(large_evolution(expected));
    Ok(warnings)
}

/// The parts that fit worst, where any does: the threshold is shared out over the places looked at.
fn poor_fit(verdicts: &Verdicts) -> Option<WarningRecord> {
    let threshold = ALARM / verdicts.goodness.len().max(1) as f64;
    let poor: Vec<String> = verdicts
        .goodness
        .iter()
        .filter_map(|place| {
            let p_value = place.p_value.filter(|p_value| *p_value < threshold)?;
            Some(format!("{} (χ² {:.1} for {} rows, p = {p_value:.1e})", place.place, place.chi2, place.rows))
        })
        .collect();
    (!poor.is_empty()).then(|| {
        warning("poor-fit", "all", format!(
            "far from what is expected in general relativity with these priors: {}; check those measurements, redshifts and priors before anything is read into them",
            poor.join(", ")
        ))
    })
}

fn first_labels(study: &Study) -> String {
    let bins = study.file.surveys.iter().flat_map(|survey| survey.bins.iter());
    let mut labels: Vec<String> = bins.map(|bin| format!("`{}`", bin.first.label.value)).collect();
    labels.dedup();
    labels.join(", ")
}

/// Rows of one multipole of one bin that the data would rather have in another order.
fn disorder(measurements: &Measurements, expected: &Expected) -> Result<Vec<WarningRecord>, RunError> {
    let bins: Vec<(String, Vec<usize>)> = places(measurements)
        .into_iter()
        .filter(|(place, _)| place.contains('.') && !place.contains(" multipole "))
        .collect();
    let mut warnings = Vec::new();
    for (place, rows) in &bins {
        let found = row_order(&expected.comparison.select(rows)).map_err(in_all)?;
        if found.p_value < ALARM / bins.len() as f64 {
            let what = match found.swap {
                Swap::Values => "values",
                Swap::Labels => "labels",
            };
            warnings.push(warning("row-order", place, format!(
                "the {what} of `{place}` fit far better in another order (by {:.1} in −2 ln L, p below {:.1e}); check that the table and the covariance have their rows in one order",
                found.improvement, found.p_value
            )));
        }
    }
    Ok(warnings)
}

/// Surveys that measured the same numbers.
fn duplicates(measurements: &Measurements) -> Result<Vec<WarningRecord>, RunError> {
    let surveys = &measurements.surveys;
    let mut warnings = Vec::new();
    let pairs: Vec<(usize, usize)> =
        (0..surveys.len()).flat_map(|second| (0..second).map(move |first| (first, second))).collect();
    for &(first, second) in &pairs {
        let (one, other) = (&surveys[first], &surveys[second]);
        let found = duplicate(&one.likelihood, &other.likelihood, &matched(one, other)).map_err(in_all)?;
        let same = found.rows > 0 && found.identical == found.rows;
        if same || found.p_value < ALARM / pairs.len() as f64 {
            warnings.push(warning("duplicated-survey", &other.name, format!(
                "`{}` and `{}` measured nearly the same numbers ({} of {} identical, p below {:.1e}): independent surveys would not; remove one, or give their joint covariance",
                one.name, other.name, found.identical, found.rows, found.p_value
            )));
        }
    }
    Ok(warnings)
}

fn matched(one: &SurveyMeasurements, other: &SurveyMeasurements) -> Vec<(usize, usize)> {
    let key = |survey: &SurveyMeasurements, row: usize| {
        let measured = &survey.table.rows[row];
        let bin = survey.bins[row] - survey.bins.iter().min().copied().unwrap_or(0);
        (bin, measured.pair.clone(), measured.multipole, measured.axis, measured.at.to_bits())
    };
    let mut pairs = Vec::new();
    for row in 0..one.table.len() {
        let wanted = key(one, row);
        pairs.extend(
            (0..other.table.len()).find(|&beside| key(other, beside) == wanted).map(|beside| (row, beside)),
        );
    }
    pairs
}

fn large_evolution(expected: &Expected) -> Vec<WarningRecord> {
    let names = expected.posterior.model.layout().names().iter();
    names
        .zip(&expected.values)
        .filter(|(name, value)| name.ends_with(".evolution") && value.abs() > LARGE_EVOLUTION)
        .map(|(name, value)| {
            warning("large-evolution", name, format!(
                "`{name}` is {value}: evolution is at fixed luminosity threshold, e = slope observed − 5 s (1 + 1/(r H)); the slope that a catalogue shows is not it"
            ))
        })
        .collect()
}
