//! What a simulation was drawn from.

use crate::file::Quantity;
use crate::resolve::{Hypothesis, Study};
use crate::run_error::RunError;

/// Names and values of what the hypothesis infers in the study as written, and of what the command line set besides: a draw,
/// or the number that was set.
pub(super) fn truth_values(
    as_written: &Study,
    study: &Study,
    hypothesis: &Hypothesis,
    point: &[f64],
) -> Result<Vec<(String, f64)>, RunError> {
    let inferred = as_written.hypothesis(Some(&hypothesis.name))?.free.iter();
    let mut names: Vec<&str> = inferred.map(|parameter| parameter.name.as_str()).collect();
    for each in study.overrides() {
        let covered = |name: &&str| *name == each.name || name.starts_with(&format!("{}.", each.name));
        if !names.iter().any(covered) {
            names.push(&each.name);
        }
    }
    let values = names.into_iter().filter_map(|name| {
        let value = match hypothesis.free_index(name) {
            Some(index) => point[index],
            None => {
                let quantity = hypothesis.quantity(name)?;
                match quantity.given.value {
                    // Without what systematics add to it.
                    Quantity::Held(value) => value,
                    _ => quantity.form.value(point),
                }
            }
        };
        Some((name.to_owned(), value))
    });
    Ok(values.collect())
}

/// As CSV: parameter,value.
pub(super) fn truth_table(truth: &[(String, f64)]) -> String {
    let lines = truth.iter().map(|(name, value)| format!("{name},{value:e}\n"));
    std::iter::once("parameter,value\n".to_owned()).chain(lines).collect()
}
