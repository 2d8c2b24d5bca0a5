//! Which amplitudes of templates can be integrated out exactly.

use super::Entry;
use super::systematics::Move;
use crate::file::{Quantity, StudyFile, template_name};

/// Noise models that are normal whatever χ² is.
const NORMAL: [&str; 2] = ["gaussian", "hartlap"];

/// Mean and standard deviation of a normal prior.
pub(super) type MeanAndDeviation = (f64, f64);

/// For each entry, the mean and standard deviation of an amplitude of a template that can be integrated out exactly: its
/// prior is normal without a window, the noise of its survey is normal, and neither a tie, a systematic nor a joint prior
/// connects it to anything else. Every other amplitude is sampled like any quantity.
pub(super) fn integrable(
    file: &StudyFile,
    entries: &[Entry],
    moves: &[Move],
) -> Vec<Option<MeanAndDeviation>> {
    let names: Vec<String> = file
        .surveys
        .iter()
        .filter(|survey| NORMAL.contains(&file.noise_of(survey)))
        .flat_map(|survey| {
            survey.templates.iter().map(|each| template_name(&survey.name.value, &each.name.value))
        })
        .collect();
    let connected = |index: usize, name: &str| {
        let tied = |entry: &Entry| matches!(&entry.given.value, Quantity::SameAs(source) if source == name);
        moves.iter().any(|each| each.quantity == index) || entries.iter().any(tied)
    };
    let of_entry = |(index, entry): (usize, &Entry)| {
        if !names.contains(&entry.name) || connected(index, &entry.name) {
            return None;
        }
        match &entry.given.value {
            Quantity::Prior(prior) if prior.family == "normal" && prior.within.is_none() => {
                match prior.numbers[..] {
                    [mean, sd] => Some((mean, sd)),
                    _ => None,
                }
            }
            _ => None,
        }
    };
    entries.iter().enumerate().map(of_entry).collect()
}
