//! A hypothesis as a table: what `oddwell show` prints.

use serde::Serialize;

use crate::resolve::{FreePrior, Hypothesis, ResolvedQuantity, State};

/// What a quantity is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Kind {
    /// A number.
    Held,
    /// A free parameter.
    Inferred,
    /// Follows another quantity.
    Tied,
}

impl Kind {
    /// The word for a table.
    pub fn word(self) -> &'static str {
        match self {
            Self::Held => "held",
            Self::Inferred => "inferred",
            Self::Tied => "tied",
        }
    }
}

/// One quantity of the resolved study.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct DescribedQuantity {
    /// Dotted name.
    pub name: String,
    /// Held, inferred or tied.
    pub kind: Kind,
    /// Value, prior or source, with what systematics add.
    pub value: String,
    /// Line of the study file; none for a default or `--set`.
    pub line: Option<usize>,
    /// Where it comes from, in words: `line 12`, `default`, `--set`.
    pub origin: String,
}

/// Every quantity of a hypothesis, in the order of the study.
pub fn describe(hypothesis: &Hypothesis) -> Vec<DescribedQuantity> {
    hypothesis
        .quantities
        .iter()
        .map(|quantity| {
            let (kind, mut value) = state_of(hypothesis, quantity);
            for each in &quantity.moves {
                let amplitude = &hypothesis.quantities[each.amplitude].name;
                let sign = if each.by < 0.0 { '-' } else { '+' };
                value.push_str(&format!(" {sign} {:?} * {amplitude}", each.by.abs()));
            }
            DescribedQuantity {
                name: quantity.name.clone(),
                kind,
                value,
                line: quantity.given.origin.line(),
                origin: quantity.given.origin.to_string(),
            }
        })
        .collect()
}

fn state_of(hypothesis: &Hypothesis, quantity: &ResolvedQuantity) -> (Kind, String) {
    match &quantity.state {
        State::Held(value) => (Kind::Held, format!("{value:?}")),
        State::Tied(source) => (Kind::Tied, format!("same as {}", hypothesis.quantities[*source].name)),
        State::Free(index) => match &hypothesis.free[*index].prior {
            FreePrior::Own(spec) => (Kind::Inferred, spec.to_string()),
            FreePrior::Joint { block, position, .. } => {
                let block = &hypothesis.joint[*block];
                let (mean, variance) = (block.mean[*position], block.covariance[*position][*position]);
                let sd = variance.sqrt();
                (Kind::Inferred, format!("joint normal on {}, mean {mean:?}, sd {sd:?}", block.origin))
            }
        },
    }
}
