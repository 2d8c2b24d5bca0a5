//! The departure's own quantities in a hypothesis, and what its shape asks of the rest of the study.

use oddwell_model::{FeltBy, ModelError, Spread};

use super::Entry;
use super::checker::{Checker, name_covers};
use super::hypothesis::Hypothesis;
use crate::fault::Fault;
use crate::file::{HypothesisSection, Located, Origin, Override, Quantity, Shape, StudyFile};

/// The quantities `departure.*` of a hypothesis, with what `--set` says of them.
pub(super) fn entries(file: &StudyFile, section: &HypothesisSection, overrides: &[Override]) -> Vec<Entry> {
    let shape = section.departure.value;
    let suffixes: Vec<String> = match shape.spread() {
        Spread::Shared => vec![String::new()],
        Spread::PerSurvey => file.surveys.iter().map(|survey| format!(".{}", survey.name.value)).collect(),
        Spread::PerBin => file
            .surveys
            .iter()
            .flat_map(|survey| {
                survey.bins.iter().map(|bin| format!(".{}.{}", survey.name.value, bin.name.value))
            })
            .collect(),
    };
    let entry = |suffix: &String, key: &str, given: &Located<Quantity>| {
        let name = format!("departure.{key}{suffix}");
        let set = overrides.iter().rev().find(|each| name_covers(&each.name, &name));
        let given = set.map_or_else(|| given.clone(), |each| each.quantity.clone());
        Entry { name, given }
    };
    suffixes
        .iter()
        .flat_map(|suffix| section.parameters.iter().map(move |(key, given)| entry(suffix, key, given)))
        .collect()
}

/// Departures that hold in one background only: shape, quantity, value.
const NEEDED_BACKGROUND: [(&str, &str, f64); 5] = [
    ("braneworld", "background.w0", -1.0),
    ("braneworld", "background.wa", 0.0),
    ("f-of-r", "background.w0", -1.0),
    ("f-of-r", "background.wa", 0.0),
    ("f-of-r", "background.omega_k", 0.0),
];

/// Checks a resolved hypothesis against the rules of its shape.
pub(super) fn check(
    file: &StudyFile,
    section: &HypothesisSection,
    hypothesis: &Hypothesis,
    checker: &mut Checker<'_>,
) {
    check_growth(file, section, hypothesis, checker);
    let shape = hypothesis.shape;
    for (_, name, needed) in NEEDED_BACKGROUND.iter().filter(|(name, ..)| *name == shape.name()) {
        let Some(quantity) = hypothesis.quantity(name) else {
            continue;
        };
        if quantity.form.is_held() && quantity.form.constant == *needed {
            continue;
        }
        let fault = Fault::NeedsBackground {
            departure: shape.name(),
            hypothesis: hypothesis.name.clone(),
            name,
            needed: *needed,
            found: quantity.given.value.to_string(),
        };
        checker.fault(section.departure.origin, name, fault);
    }
    check_values(shape, hypothesis, checker);
}

/// Growth that is given leaves a departure no growth to change.
fn check_growth(
    file: &StudyFile,
    section: &HypothesisSection,
    hypothesis: &Hypothesis,
    checker: &mut Checker<'_>,
) {
    if hypothesis.felt_by == FeltBy::Light {
        return;
    }
    let index = file
        .prediction
        .growth_index
        .as_ref()
        .map(|given| ("prediction.growth_index".to_owned(), given.origin));
    let rates = file.surveys.iter().flat_map(|survey| {
        survey.bins.iter().filter_map(|bin| {
            let given = bin.growth_rate.as_ref()?;
            Some((format!("{}.{}.growth_rate", survey.name.value, bin.name.value), given.origin))
        })
    });
    for (key, _) in index.into_iter().chain(rates) {
        let felt_by = hypothesis.felt_by.name();
        let origin = match section.felt_by.origin {
            Origin::Default => section.departure.origin,
            given => given,
        };
        checker.fault(
            origin,
            "felt_by",
            Fault::GrowthGiven { key, hypothesis: hypothesis.name.clone(), felt_by },
        );
    }
}

/// Lets the shape judge its held parameters, with the centre of the prior in place of those that are inferred.
fn check_values(shape: Shape, hypothesis: &Hypothesis, checker: &mut Checker<'_>) {
    let start = hypothesis.start();
    let own: Vec<_> =
        hypothesis.quantities.iter().filter(|quantity| quantity.name.starts_with("departure.")).collect();
    for set in own.chunks(shape.parameters().len().max(1)) {
        let values: Vec<f64> = set.iter().map(|quantity| quantity.form.value(&start)).collect();
        let Err(ModelError::Departure { parameter, value, rule }) = shape.check(&values) else {
            continue;
        };
        let guilty = shape.parameters().iter().position(|each| each.name == parameter);
        let Some(quantity) = guilty.and_then(|index| set.get(index)) else {
            continue;
        };
        if quantity.form.is_held() {
            let name = quantity.name.clone();
            checker.fault(quantity.given.origin, &quantity.name, Fault::DepartureValue { name, value, rule });
        }
    }
}
