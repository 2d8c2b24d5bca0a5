//! `[[joint_prior]]`: a correlated normal prior of several quantities.

use oddwell_sampler::{JointNormal, PriorError};
use toml_edit::{Item, Value};

use super::section::{Section, numbers_of};
use super::source::Located;
use crate::fault::Fault;

/// `[[joint_prior]]`: the quantities in `of` are inferred, with a multivariate normal prior.
///
/// The number that each is given in its own place is where the search for the peak starts.
#[derive(Clone, Debug, PartialEq)]
pub struct JointPriorSection {
    /// Dotted names, none twice.
    pub of: Located<Vec<String>>,
    /// Their means.
    pub mean: Located<Vec<f64>>,
    /// Their covariance, symmetric and positive definite.
    pub covariance: Located<Vec<Vec<f64>>>,
}

impl JointPriorSection {
    pub(super) fn read(section: Section<'_>) -> Option<Self> {
        let of = read_names(&section);
        let mean = read_list(&section, "mean", "a list of numbers", "[0.0, 0.0]", numbers_of);
        let rows = read_list(
            &section,
            "covariance",
            "a list of rows of numbers",
            "[[1.0, 0.5], [0.5, 1.0]]",
            |item| {
                let rows = item.as_array()?.iter().map(|row| numbers_of(&Item::Value(row.clone())));
                rows.collect::<Option<Vec<Vec<f64>>>>()
            },
        );
        let read = match (of, mean, rows) {
            (Some(of), Some(mean), Some(rows)) => checked(&section, of, mean, rows),
            _ => None,
        };
        section.finish();
        read
    }
}

fn read_names(section: &Section<'_>) -> Option<Located<Vec<String>>> {
    let names =
        read_list(section, "of", "a list of names", "[\"SURVEY.BIN.first.evolution\", \"…\"]", |item| {
            item.as_array()?
                .iter()
                .map(Value::as_str)
                .map(|name| name.map(str::to_owned))
                .collect::<Option<Vec<_>>>()
        })?;
    for (index, name) in names.value.iter().enumerate() {
        if names.value[..index].contains(name) {
            let first_line = names.origin.line().unwrap_or(1);
            let fault = Fault::DuplicateName { what: "quantity", name: name.clone(), first_line };
            section.fault_at("of", fault);
            return None;
        }
    }
    Some(names)
}

fn read_list<T>(
    section: &Section<'_>,
    key: &'static str,
    expected: &'static str,
    example: &'static str,
    read: impl Fn(&Item) -> Option<T>,
) -> Option<Located<T>> {
    let Some((_, item)) = section.find(key) else {
        section.missing(key, &format!("{key} = {example}"));
        return None;
    };
    let Some(value) = read(item).filter(|_| item.as_array().is_some_and(|list| !list.is_empty())) else {
        section.wrong_type(key, expected, item, example);
        return None;
    };
    Some(Located { value, origin: section.origin(key, item) })
}

/// Sizes, symmetry and definiteness.
fn checked(
    section: &Section<'_>,
    of: Located<Vec<String>>,
    mean: Located<Vec<f64>>,
    rows: Located<Vec<Vec<f64>>>,
) -> Option<JointPriorSection> {
    match JointNormal::new((0..of.value.len()).collect(), &mean.value, &rows.value) {
        Ok(_) => Some(JointPriorSection { of, mean, covariance: rows }),
        Err(cause) => {
            let of_mean = matches!(cause, PriorError::JointShape { of, mean, .. } if of != mean);
            section.fault_at(if of_mean { "mean" } else { "covariance" }, Fault::JointPrior { cause });
            None
        }
    }
}
