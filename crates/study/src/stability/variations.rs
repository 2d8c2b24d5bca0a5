//! What is changed: cuts in separation, bins and surveys, noise models, growth.

use crate::assemble::Measurements;
use crate::file::{KeepSection, Located, Override, StudyFile, SurveySection};
use crate::resolve::{Hypothesis, Restriction, Study};
use crate::run_error::RunError;
use oddwell_likelihood::{Axis, noise_families};
use oddwell_model::FeltBy;

/// How many of the distinct ends of shells are cut away, in turn.
const CUTS: [usize; 4] = [1, 2, 4, 6];

/// The prior that growth is set free with: about the value in general relativity, as wide as growth is measured by others.
const FREE_GROWTH: &str = "prediction.growth_index={ normal = [0.55, 0.1] }";

/// A change of a study.
pub(super) struct Change {
    pub(super) kind: &'static str,
    pub(super) text: String,
    pub(super) place: Option<String>,
    /// Whether what it leaves is a subset of the same data with the same noise and priors.
    pub(super) nested: bool,
    what: What,
}

enum What {
    /// Keep only shells within these ends, of one axis.
    Within(Axis, (f64, f64)),
    /// Noise of every survey whose covariance is from mocks.
    Noise(&'static str),
    /// As if given with `--set`.
    Set(&'static str),
    /// As if given with `--only` or `--without`.
    Restrict(Restriction),
}

impl Change {
    pub(super) fn apply(&self, study: &Study) -> Result<Study, RunError> {
        let mut file: StudyFile = study.whole_file().clone();
        let mut overrides = study.overrides().to_vec();
        let mut restriction = study.restriction().clone();
        match &self.what {
            What::Within(axis, ends) => {
                for survey in &mut file.surveys {
                    survey.keep = narrowed(&survey.keep, *axis, *ends);
                }
            }
            What::Noise(name) => {
                for survey in file.surveys.iter_mut().filter(|survey| from_mocks(survey)) {
                    survey.noise.value = name;
                }
            }
            What::Set(text) => overrides.push(Override::parse(text)?),
            What::Restrict(more) => {
                restriction.without.extend(more.without.iter().cloned());
                if !more.only.is_empty() {
                    restriction.only.clone_from(&more.only);
                }
            }
        }
        Ok(Study::resolve(file, &overrides)?.restricted(&restriction)?)
    }
}

/// The same entries, each within the ends along one axis; what it keeps of the other axis stays.
fn narrowed(keep: &[KeepSection], axis: Axis, (low, high): (f64, f64)) -> Vec<KeepSection> {
    let everything =
        [KeepSection { separation: None, wavenumber: None, multipoles: None, bins: None, pairs: None }];
    let keep = if keep.is_empty() { &everything[..] } else { keep };
    let mut out = Vec::new();
    for entry in keep {
        let mut own = entry.clone();
        let mut other = entry.clone();
        let (narrow, rest) = match axis {
            Axis::Separation => (&mut own.separation, &mut other.wavenumber),
            Axis::Wavenumber => (&mut own.wavenumber, &mut other.separation),
        };
        // An entry about the other axis alone has no row of this one.
        if narrow.is_some() || rest.is_none() {
            let before = narrow.as_ref().map_or((0.0, f64::INFINITY), |range| range.value);
            let range = (before.0.max(low), before.1.min(high));
            if range.0 < range.1 {
                *narrow = Some(Located::default_of(range));
                match axis {
                    Axis::Separation => own.wavenumber = None,
                    Axis::Wavenumber => own.separation = None,
                }
                out.push(own);
            }
        }
        let about_other = match axis {
            Axis::Separation => entry.wavenumber.is_some(),
            Axis::Wavenumber => entry.separation.is_some(),
        };
        let about_neither = entry.separation.is_none() && entry.wavenumber.is_none();
        if about_other || about_neither {
            if about_neither {
                match axis {
                    Axis::Separation => other.wavenumber = Some(Located::default_of((0.0, f64::INFINITY))),
                    Axis::Wavenumber => other.separation = Some(Located::default_of((0.0, f64::INFINITY))),
                }
            }
            match axis {
                Axis::Separation => other.separation = None,
                Axis::Wavenumber => other.wavenumber = None,
            }
            out.push(other);
        }
    }
    if out.is_empty() {
        // No entry at all would keep every row.
        let nowhere = Located::default_of((f64::INFINITY, f64::INFINITY));
        let [mut nothing] = everything;
        nothing.separation = Some(nowhere);
        out.push(nothing);
    }
    out
}

/// Every change that makes sense for a study.
pub(super) fn changes(study: &Study, hypothesis: &Hypothesis, measurements: &Measurements) -> Vec<Change> {
    let mut changes = Vec::new();
    for axis in [Axis::Separation, Axis::Wavenumber] {
        changes.extend(cuts(axis, measurements));
    }
    changes.extend(parts(study));
    changes.extend(noises(study));
    changes.extend(growth(study, hypothesis));
    changes
}

fn cuts(axis: Axis, measurements: &Measurements) -> Vec<Change> {
    let rows = measurements.surveys.iter().flat_map(|survey| &survey.table.rows);
    let ends: Vec<(f64, f64)> =
        rows.filter(|row| row.axis == axis).map(|row| row.edges.unwrap_or((row.at, row.at))).collect();
    let distinct = |mut values: Vec<f64>| {
        values.sort_unstable_by(f64::total_cmp);
        values.dedup();
        values
    };
    let lows = distinct(ends.iter().map(|(low, _)| *low).collect());
    let highs = distinct(ends.iter().map(|(_, high)| *high).collect());
    let (Some(&lowest), Some(&highest)) = (lows.first(), highs.last()) else { return Vec::new() };
    let (name, unit) = match axis {
        Axis::Separation => ("separations", "Mpc/h"),
        Axis::Wavenumber => ("wavenumbers", "h/Mpc"),
    };
    // At least a third of the shells stays.
    let fits = |cut: &&usize| 3 * **cut < 2 * lows.len();
    let change =
        |kind, text, ends| Change { kind, text, place: None, nested: true, what: What::Within(axis, ends) };
    let smallest = CUTS.iter().filter(fits).map(|&cut| {
        let low = lows[cut];
        change("smallest", format!("{name} from {low} {unit}"), (low, highest))
    });
    let largest = CUTS.iter().filter(fits).filter(|cut| **cut < highs.len()).map(|&cut| {
        let high = highs[highs.len() - 1 - cut];
        change("largest", format!("{name} up to {high} {unit}"), (lowest, high))
    });
    smallest.chain(largest).collect()
}

/// Each survey and each bin left out, and each alone; where there are two or more.
fn parts(study: &Study) -> Vec<Change> {
    let surveys = &study.file.surveys;
    let mut names: Vec<String> = Vec::new();
    if surveys.len() > 1 {
        names.extend(surveys.iter().map(|survey| survey.name.value.clone()));
    }
    let bins: Vec<String> = surveys
        .iter()
        .flat_map(|survey| survey.bins.iter().map(|bin| format!("{}.{}", survey.name.value, bin.name.value)))
        .collect();
    if bins.len() > 1 {
        names.extend(bins);
    }
    let change = |kind, name: &String, restriction| Change {
        kind,
        text: if kind == "only" { format!("{name} alone") } else { format!("without {name}") },
        place: Some(name.clone()),
        nested: true,
        what: What::Restrict(restriction),
    };
    let without = names.iter().map(|name| {
        change("without", name, Restriction { without: vec![name.clone()], ..Restriction::default() })
    });
    let only = names
        .iter()
        .map(|name| change("only", name, Restriction { only: vec![name.clone()], ..Restriction::default() }));
    without.chain(only).collect()
}

/// Whether a survey's own covariance is an estimate, so that its noise is a matter of choice.
fn from_mocks(survey: &SurveySection) -> bool {
    survey.mock_count.is_some() || survey.mocks.is_some()
}

fn noises(study: &Study) -> Vec<Change> {
    let from_mocks = || study.file.surveys.iter().filter(|survey| from_mocks(survey));
    let others = noise_families().iter().filter(|family| {
        from_mocks().next().is_some() && from_mocks().any(|survey| survey.noise.value != family.name)
    });
    others
        .map(|family| Change {
            kind: "noise",
            text: format!("noise {}", family.name),
            place: None,
            nested: false,
            what: What::Noise(family.name),
        })
        .collect()
}

fn growth(study: &Study, hypothesis: &Hypothesis) -> Option<Change> {
    let given = study.file.prediction.growth_index.is_some()
        || study.file.surveys.iter().flat_map(|survey| &survey.bins).any(|bin| bin.growth_rate.is_some());
    (hypothesis.felt_by == FeltBy::Light && !given).then(|| Change {
        kind: "growth",
        text: "growth index free, 0.55 ± 0.1".to_owned(),
        place: None,
        nested: false,
        what: What::Set(FREE_GROWTH),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn entry(separation: Option<(f64, f64)>, wavenumber: Option<(f64, f64)>) -> KeepSection {
        KeepSection {
            separation: separation.map(Located::default_of),
            wavenumber: wavenumber.map(Located::default_of),
            multipoles: None,
            bins: None,
            pairs: None,
        }
    }

    #[test]
    fn what_is_kept_is_narrowed_and_the_other_axis_stays() {
        let far = (0.0, f64::INFINITY);
        for (before, after) in [
            (vec![], vec![entry(Some((30.0, 100.0)), None), entry(None, Some(far))]),
            (vec![entry(Some((24.0, 144.0)), None)], vec![entry(Some((30.0, 100.0)), None)]),
            (vec![entry(Some((24.0, 28.0)), None)], vec![entry(Some((f64::INFINITY, f64::INFINITY)), None)]),
            (vec![entry(None, Some((0.01, 0.2)))], vec![entry(None, Some((0.01, 0.2)))]),
            (
                vec![entry(Some((40.0, 60.0)), Some((0.01, 0.2)))],
                vec![entry(Some((40.0, 60.0)), None), entry(None, Some((0.01, 0.2)))],
            ),
        ] {
            assert_eq!(narrowed(&before, Axis::Separation, (30.0, 100.0)), after);
        }
    }
}
