//! A hypothesis as a table: what `oddwell show` prints.

use serde::Serialize;

use crate::evolution::derived_evolutions;
use crate::resolve::{FreePrior, Hypothesis, ResolvedQuantity, State, Study};

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
    /// What the slope of a catalogue comes to.
    Derived,
}

impl Kind {
    /// The word for a table.
    pub fn word(self) -> &'static str {
        match self {
            Self::Held => "held",
            Self::Inferred => "inferred",
            Self::Tied => "tied",
            Self::Derived => "derived",
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

/// Every quantity of a hypothesis, in the order of the study; behind a slope that a catalogue shows, the evolution bias that
/// it comes to at the centre of the priors.
pub fn describe(study: &Study, hypothesis: &Hypothesis) -> Vec<DescribedQuantity> {
    let evolutions = derived_evolutions(study, hypothesis);
    let mut described = Vec::new();
    for quantity in &hypothesis.quantities {
        let (kind, mut value) = state_of(hypothesis, quantity);
        for each in &quantity.moves {
            let amplitude = &hypothesis.quantities[each.amplitude].name;
            let sign = if each.by < 0.0 { '-' } else { '+' };
            value.push_str(&format!(" {sign} {:?} * {amplitude}", each.by.abs()));
        }
        let origin = quantity.given.origin;
        let row = DescribedQuantity {
            name: quantity.name.clone(),
            kind,
            value,
            line: origin.line(),
            origin: origin.to_string(),
        };
        let tracer = row.name.strip_suffix(".observed_density_slope");
        let evolution = evolutions.iter().find(|(path, _)| tracer == Some(path));
        let derived = evolution.map(|(path, evolution)| DescribedQuantity {
            name: format!("{path}.evolution"),
            kind: Kind::Derived,
            value: format!("{evolution:.4}, slope - 5 magnification (1 + 1/(r H))"),
            ..row.clone()
        });
        described.push(row);
        described.extend(derived);
    }
    described
}

fn state_of(hypothesis: &Hypothesis, quantity: &ResolvedQuantity) -> (Kind, String) {
    match &quantity.state {
        State::Held(value) => (Kind::Held, format!("{value:?}")),
        State::IntegratedOut { mean, standard_deviation } => (
            Kind::Inferred,
            format!("{{ normal = [{mean:?}, {standard_deviation:?}] }}, integrated out exactly"),
        ),
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
