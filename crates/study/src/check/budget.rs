//! What limits the departure: the error budget, and nuisances in units of the departure.

use super::expectation::{Expected, in_all, predict_with};
use super::verdicts::{BudgetLine, TauEquivalent};
use crate::assemble::Measurements;
use crate::run_error::RunError;
use nalgebra::DMatrix;
use oddwell_likelihood::verdicts::error_budget;
use oddwell_model::{Effects, ModelSetup};

/// The groups of nuisances, by what their parameters' names end in or begin with.
const GROUPS: [(&str, &[&str]); 7] = [
    ("bias", &[".bias", ".bias_slope"]),
    ("magnification", &[".magnification"]),
    ("evolution", &[".evolution", ".observed_density_slope"]),
    ("offset", &[".offset"]),
    ("systematics", &["systematic."]),
    ("growth", &[".growth_rate", ".growth_slope", "prediction.growth_index"]),
    ("background", &["background.", "prediction.damping", "prediction.smearing"]),
];

fn belongs(name: &str, patterns: &[&str]) -> bool {
    patterns.iter().any(|pattern| {
        if pattern.starts_with('.') { name.ends_with(pattern) } else { name.starts_with(pattern) }
    })
}

/// The departure's expected standard deviation, and what it would be with each group known.
pub(super) fn error_budget_of(expected: &Expected) -> Result<(Option<f64>, Vec<BudgetLine>), RunError> {
    let Some(&tau) = expected.watched.first() else { return Ok((None, Vec::new())) };
    let posterior = &expected.posterior;
    let fisher = posterior.data.fisher_information(&expected.expectation.jacobian);
    let names = posterior.map.names();
    let mut groups: Vec<(String, Vec<usize>)> = GROUPS
        .iter()
        .map(|(group, patterns)| {
            let members = (0..names.len()).filter(|&index| belongs(&names[index], patterns)).collect();
            ((*group).to_owned(), members)
        })
        .collect();
    let all: Vec<usize> = (0..names.len()).filter(|index| !expected.watched.contains(index)).collect();
    groups.push(("everything but the noise".to_owned(), all));
    groups.retain(|(_, members)| !members.is_empty());
    let members: Vec<Vec<usize>> = groups.iter().map(|(_, members)| members.clone()).collect();
    let prior = &expected.expectation.prior_covariance;
    let (whole, entries) = error_budget(&fisher, prior, tau, &members).map_err(in_all)?;
    let lines = groups.into_iter().zip(entries).map(|((group, _), entry)| BudgetLine {
        group,
        sd: entry.standard_deviation,
        share: entry.share,
    });
    Ok((Some(whole), lines.collect()))
}

/// A switch of an effect.
type Switch = fn(&mut Effects) -> &mut bool;

/// The effects that a study can switch off.
const EFFECTS: [(&str, Switch); 3] = [
    ("wide_angle (switched off)", |effects| &mut effects.wide_angle),
    ("light_cone (switched off)", |effects| &mut effects.light_cone),
    ("lensing (switched off)", |effects| &mut effects.lensing),
];

/// For each bin: what a unit, and a prior's standard deviation, of each nuisance (errors in common too) and of each effect that
/// is switched off is worth in τ felt by light: the projection of its change of the bin's rows on that of τ, in units of the noise.
pub(super) fn tau_equivalents(
    measurements: &Measurements,
    expected: &Expected,
) -> Result<Vec<TauEquivalent>, RunError> {
    let posterior = &expected.posterior;
    let size = posterior.map.dimension();
    let mut covariance = DMatrix::zeros(posterior.map.slots(), size);
    for term in posterior.map.terms() {
        covariance[(term.slot, term.parameter)] += term.coefficient;
    }
    let spread = &covariance * &expected.expectation.prior_covariance * covariance.transpose();
    let setup = posterior.model.setup();
    let mut worths = Vec::new();
    let plain = &expected.expectation.prediction;
    for (index, bin) in setup.bins.iter().enumerate() {
        let path = bin.path();
        let worth = |change: &[f64]| -> Option<f64> {
            let (mut overlap, mut own) = (0.0, 0.0);
            for (first, survey) in posterior.data.with_offsets() {
                let rows: Vec<usize> =
                    (0..survey.rows()).filter(|row| measurements.rows[first + row].bin == index).collect();
                if rows.is_empty() {
                    continue;
                }
                // Rows of other bins are left out by leaving their changes at zero.
                let mut parts = [vec![0.0; survey.rows()], vec![0.0; survey.rows()]];
                for &row in &rows {
                    parts[0][row] = change[first + row];
                    parts[1][row] = expected.redshift[first + row];
                }
                overlap += survey.projection(&parts[0], &parts[1]);
                own += survey.projection(&parts[1], &parts[1]);
            }
            (own > 0.0).then(|| overlap / own)
        };
        let names = posterior.model.layout().names();
        let prefix = format!("{path}.");
        for slot in 0..names.len() {
            let Some(quantity) = names[slot].strip_prefix(&prefix) else { continue };
            if quantity.starts_with("growth") && !bin.growth_given {
                continue;
            }
            let mut moved = expected.values.clone();
            // Small enough for the terms that are quadratic in biases, and exact where the quantity enters linearly.
            const STEP: f64 = 1e-3;
            moved[slot] += STEP;
            let shifted =
                posterior.predict_values(&moved, &mut oddwell_sampler::Target::scratch(posterior))?;
            let change: Vec<f64> =
                shifted.iter().zip(plain.iter()).map(|(one, other)| (one - other) / STEP).collect();
            let Some(per_unit) = worth(&change) else { continue };
            let sd = spread[(slot, slot)].sqrt();
            worths.push(TauEquivalent {
                bin: path.clone(),
                quantity: quantity.to_owned(),
                per_unit,
                per_prior_sd: (sd > 0.0).then_some(per_unit.abs() * sd),
            });
        }
        // What is inferred and belongs to no bin: errors in common, background, growth.
        for (parameter, name) in posterior.map.names().iter().enumerate() {
            let of_a_bin = setup.bins.iter().any(|bin| name.starts_with(&format!("{}.", bin.path())));
            if of_a_bin || expected.watched.contains(&parameter) {
                continue;
            }
            let change: Vec<f64> = expected.expectation.jacobian.column(parameter).iter().copied().collect();
            let Some(per_unit) = worth(&change) else { continue };
            let sd = expected.expectation.prior_covariance[(parameter, parameter)].sqrt();
            worths.push(TauEquivalent {
                bin: path.clone(),
                quantity: name.clone(),
                per_unit,
                per_prior_sd: (sd > 0.0).then_some(per_unit.abs() * sd),
            });
        }
        for (effect, switch) in EFFECTS {
            let mut effects = setup.effects;
            if std::mem::replace(switch(&mut effects), true) {
                continue;
            }
            let with = predict_with(
                posterior,
                ModelSetup { effects, ..setup.clone() },
                &|_, value| value,
                &expected.values,
            )?;
            let change: Vec<f64> = with.iter().zip(plain.iter()).map(|(one, other)| one - other).collect();
            if let Some(per_unit) = worth(&change) {
                worths.push(TauEquivalent {
                    bin: path.clone(),
                    quantity: effect.to_owned(),
                    per_unit,
                    per_prior_sd: None,
                });
            }
        }
    }
    Ok(worths)
}
