//! From the free parameters of a hypothesis to the flat vector of quantities that a model reads.

use crate::error::StudyError;
use crate::resolve::Hypothesis;

/// One contribution of a free parameter to a slot: value\[slot\] += coefficient · θ\[parameter\].
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Term {
    /// Index into the model's vector.
    pub slot: usize,
    /// Index into θ.
    pub parameter: usize,
    /// Coefficient, not 0.
    pub coefficient: f64,
}

/// values = base + M θ, M sparse: held numbers, assignments, ties and systematics of a hypothesis in one affine map.
///
/// Built once with look-ups by name; [`ParameterMap::fill`] has none, and allocates nothing.
#[derive(Clone, Debug, PartialEq)]
pub struct ParameterMap {
    names: Vec<String>,
    base: Vec<f64>,
    terms: Vec<Term>,
}

/// Slots that a model always has and a study only sometimes; unused, they hold 0.
fn may_be_absent(slot: &str) -> bool {
    let last = slot.rsplit('.').next().unwrap_or_default();
    matches!(last, "growth_index" | "growth_rate" | "growth_slope")
}

/// Quantities of a study that no model reads: amplitudes, and what only says what to report.
fn beside_the_model(name: &str) -> bool {
    let of_template = || name.split('.').nth(1) == Some("template");
    name.starts_with("systematic.") || name == "prediction.clock_distance" || of_template()
}

impl ParameterMap {
    /// Maps a hypothesis to a model whose slots have these dotted names.
    ///
    /// # Errors
    /// [`StudyError::Mismatch`] for a slot that the study does not fill, and a quantity that has no slot.
    pub fn new<S: AsRef<str>>(hypothesis: &Hypothesis, slots: &[S]) -> Result<Self, StudyError> {
        let mismatch = |name: &str, has, lacks| StudyError::Mismatch { name: name.to_owned(), has, lacks };
        for quantity in hypothesis.quantities.iter().filter(|quantity| !beside_the_model(&quantity.name)) {
            if !slots.iter().any(|slot| slot.as_ref() == quantity.name) {
                return Err(mismatch(&quantity.name, "study", "model"));
            }
        }
        let mut base = vec![0.0; slots.len()];
        let mut terms = Vec::new();
        for (slot, name) in slots.iter().map(AsRef::as_ref).enumerate() {
            match hypothesis.quantity(name) {
                Some(quantity) => {
                    base[slot] = quantity.form.constant;
                    terms.extend(quantity.form.terms.iter().map(|&(parameter, coefficient)| Term {
                        slot,
                        parameter,
                        coefficient,
                    }));
                }
                None if may_be_absent(name) => {}
                None => return Err(mismatch(name, "model", "study")),
            }
        }
        let names = hypothesis.free.iter().map(|parameter| parameter.name.clone()).collect();
        Ok(Self { names, base, terms })
    }

    /// The names of θ, in order.
    pub fn names(&self) -> &[String] {
        &self.names
    }

    /// How many parameters there are.
    pub fn dimension(&self) -> usize {
        self.names.len()
    }

    /// How many slots the model has.
    pub fn slots(&self) -> usize {
        self.base.len()
    }

    /// The map's matrix M, by slots in rising order.
    pub fn terms(&self) -> &[Term] {
        &self.terms
    }

    /// Whether no parameter moves this slot.
    pub fn is_held(&self, slot: usize) -> bool {
        self.terms.iter().all(|term| term.slot != slot)
    }

    /// Writes the model's quantities for θ.
    ///
    /// # Panics
    /// Unless `theta` has [`ParameterMap::dimension`] numbers and `values` [`ParameterMap::slots`].
    pub fn fill(&self, theta: &[f64], values: &mut [f64]) {
        values.copy_from_slice(&self.base);
        for term in &self.terms {
            values[term.slot] += term.coefficient * theta[term.parameter];
        }
    }
}
