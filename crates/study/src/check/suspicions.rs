//! What the verdicts make suspicious, with what to do about it.

use super::expectation::{Expected, in_all};
use super::verdicts::{Verdicts, places};
use crate::assemble::{Measurements, SurveyMeasurements};
use crate::evolution::large_evolution;
use crate::record::WarningRecord;
use crate::resolve::Study;
use crate::run_error::RunError;
use oddwell_likelihood::verdicts::{Swap, duplicate, row_order, upper_tail};

/// A correlation between odd and even multipoles that is off by more than this is no matter of how it was computed.
const LARGEST_CORRELATION: f64 = 0.2;
/// Mocks that make errors larger than this are too few.
const ERROR_GROWTH: f64 = 1.2;

fn warning(code: &str, place: &str, text: String) -> WarningRecord {
    WarningRecord { code: code.to_owned(), text, place: place.to_owned() }
}

pub(super) fn suspicions(
    study: &Study,
    measurements: &Measurements,
    expected: &Expected,
    verdicts: &Verdicts,
    alarm: f64,
) -> Result<Vec<WarningRecord>, RunError> {
    let mut warnings = Vec::new();
    for survey in &verdicts.surveys {
        let covariance = &survey.covariance;
        if let (Some(scale), Some(p_value)) = (covariance.scale, covariance.scale_p_value)
            && p_value < alarm / verdicts.surveys.len() as f64
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
    warnings.extend(poor_fit(verdicts, alarm));
    if let Some(p_value) = verdicts.normality.filter(|p_value| *p_value < alarm) {
        warnings.push(warning("not-normal", "all", format!(
            "the whitened residuals are not normal (Anderson–Darling p = {p_value:.1e}); look for outliers and for rows that do not belong to their covariance"
        )));
    }
    if let Some(turned) = verdicts.orientation.as_ref().filter(|turned| turned.p_value < alarm) {
        warnings.push(warning("orientation", "all", format!(
            "the odd multipoles fit better with the two tracers swapped, by {:.1} in −2 ln L: the first tracer of each bin is {}, and separations must run from the first to the second; check the order, nothing was swapped",
            -turned.difference,
            first_labels(study)
        )));
    }
    warnings.extend(leaks(verdicts, alarm));
    warnings.extend(parity(verdicts, alarm));
    warnings.extend(scale_factors(verdicts, alarm));
    warnings.extend(wide_bins(verdicts));
    if !verdicts.blinded {
        warnings.extend(disorder(measurements, expected, alarm)?);
    }
    warnings.extend(duplicates(measurements, alarm)?);
    let large = large_evolution(&expected.posterior, &expected.values)?;
    warnings.extend(large.iter().map(|each| warning(each.code(), each.place(), each.text())));
    Ok(warnings)
}

/// The parts that fit worst, where any does: the threshold is shared out over the places looked at.
fn poor_fit(verdicts: &Verdicts, alarm: f64) -> Option<WarningRecord> {
    let threshold = alarm / verdicts.goodness.len().max(1) as f64;
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

/// Even multipoles in odd ones.
fn leaks(verdicts: &Verdicts, alarm: f64) -> Vec<WarningRecord> {
    let threshold = alarm / verdicts.leakage.len().max(1) as f64;
    let mut warnings = Vec::new();
    for leak in &verdicts.leakage {
        let (Some(value), Some(sigma)) = (leak.share.value, leak.share.sigma) else { continue };
        let p_value = 2.0 * upper_tail(sigma.abs());
        if p_value < threshold {
            let (source, target) = (leak.from, leak.into);
            warnings.push(warning("leakage", &leak.bin, format!(
                "multipole {target} of `{}` holds {value:.2e} ± {:.1e} of multipole {source} (p = {p_value:.1e}), which no parameter explains; check the sight-line, the weights and the window of the measurement",
                leak.bin, leak.share.sd
            )));
        }
    }
    warnings
}

/// Correlations of odd with even multipoles.
fn parity(verdicts: &Verdicts, alarm: f64) -> Vec<WarningRecord> {
    let threshold = alarm / verdicts.parity.len().max(1) as f64;
    let mut warnings = Vec::new();
    for block in &verdicts.parity {
        let Some(difference) = block.largest_difference else { continue };
        let wrong = match block.p_value {
            Some(p_value) => p_value < threshold,
            None => difference.abs() > LARGEST_CORRELATION,
        };
        if wrong {
            let p_value = block.p_value.map_or_else(String::new, |p_value| format!(" (p = {p_value:.1e})"));
            warnings.push(warning("parity", &block.bin, format!(
                "odd and even multipoles of `{}` are correlated otherwise than Gaussian fields would have it, by {difference:+.2} at most{p_value}; check the sign of the odd rows in the covariance, and that its rows are in the order of the table",
                block.bin
            )));
        }
    }
    warnings
}

/// Scale factors in place of redshifts: of a survey as a whole where it is more than one bin's, else of bins.
fn scale_factors(verdicts: &Verdicts, alarm: f64) -> Vec<WarningRecord> {
    let threshold = alarm / verdicts.scale_factors.len().max(1) as f64;
    let found = verdicts.scale_factors.iter().filter(|verdict| verdict.p_value < threshold);
    found
        .map(|verdict| {
            let place = &verdict.place;
            let what = if place.contains('.') { "the redshift" } else { "the redshifts" };
            warning("scale-factor", place, format!(
                "{what} of `{place}` would fit better as scale factors, z = 1/a − 1, by {:.1} in −2 ln L (p below {:.1e}); check that `redshift` is a redshift",
                -verdict.difference, verdict.p_value
            ))
        })
        .collect()
}

/// Bins that one redshift does not stand for.
fn wide_bins(verdicts: &Verdicts) -> Vec<WarningRecord> {
    let mut warnings = Vec::new();
    for width in &verdicts.widths {
        let (Some(excess), Some(nodes)) = (width.excess, &width.nodes) else { continue };
        let nodes: Vec<String> = nodes.iter().map(|(z, weight)| format!("[{z}, {weight}]")).collect();
        warnings.push(warning("wide-bin", &width.bin, format!(
            "the dipole averaged over `{}` differs by {:+.1} % from that at its mean redshift; give `nodes = [{}]` in place of `redshift`",
            width.bin, 100.0 * excess, nodes.join(", ")
        )));
    }
    warnings
}

fn first_labels(study: &Study) -> String {
    let bins = study.file.surveys.iter().flat_map(|survey| survey.bins.iter());
    let mut labels: Vec<String> = bins.map(|bin| format!("`{}`", bin.first.label.value)).collect();
    labels.dedup();
    labels.join(", ")
}

/// Rows of one multipole of one bin that the data would rather have in another order.
fn disorder(
    measurements: &Measurements,
    expected: &Expected,
    alarm: f64,
) -> Result<Vec<WarningRecord>, RunError> {
    let bins: Vec<(String, Vec<usize>)> = places(measurements)
        .into_iter()
        .filter(|(place, _)| place.contains('.') && !place.contains(" multipole "))
        .collect();
    let mut warnings = Vec::new();
    for (place, rows) in &bins {
        let found = row_order(&expected.comparison.select(rows)).map_err(in_all)?;
        if found.p_value < alarm / bins.len() as f64 {
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
fn duplicates(measurements: &Measurements, alarm: f64) -> Result<Vec<WarningRecord>, RunError> {
    let surveys = &measurements.surveys;
    let mut warnings = Vec::new();
    let pairs: Vec<(usize, usize)> =
        (0..surveys.len()).flat_map(|second| (0..second).map(move |first| (first, second))).collect();
    let together =
        |survey: usize| measurements.groups.iter().position(|group| group.surveys.contains(&survey));
    for &(first, second) in &pairs {
        // Surveys with a joint covariance are known to have measured much the same.
        if together(first) == together(second) {
            continue;
        }
        let (one, other) = (&surveys[first], &surveys[second]);
        let found = duplicate(&one.likelihood, &other.likelihood, &matched(one, other)).map_err(in_all)?;
        let same = found.rows > 0 && found.identical == found.rows;
        if same || found.p_value < alarm / pairs.len() as f64 {
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
