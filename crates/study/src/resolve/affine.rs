//! A quantity as a function of the free parameters.

/// value = constant + Σ coefficient · θ\[parameter\].
///
/// Everything that a study can say of a quantity has this form: a held number has no terms, a free one has itself, a tied
/// one has the form of its source, and every systematic adds by · amplitude.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct AffineForm {
    /// The value where all parameters are 0.
    pub constant: f64,
    /// (index of the free parameter, coefficient); no index twice, no coefficient of 0.
    pub terms: Vec<(usize, f64)>,
}

impl AffineForm {
    /// A number.
    pub fn held(value: f64) -> Self {
        Self { constant: value, terms: Vec::new() }
    }

    /// A free parameter.
    pub fn free(parameter: usize) -> Self {
        Self { constant: 0.0, terms: vec![(parameter, 1.0)] }
    }

    /// Whether no parameter moves it.
    pub fn is_held(&self) -> bool {
        self.terms.is_empty()
    }

    /// The value at a point.
    pub fn value(&self, theta: &[f64]) -> f64 {
        self.terms
            .iter()
            .fold(self.constant, |sum, (parameter, coefficient)| sum + coefficient * theta[*parameter])
    }

    /// How fast it moves with one parameter.
    pub fn coefficient(&self, parameter: usize) -> f64 {
        self.terms.iter().find(|(index, _)| *index == parameter).map_or(0.0, |(_, coefficient)| *coefficient)
    }

    /// Adds `by` times another form.
    pub(crate) fn add(&mut self, by: f64, other: &AffineForm) {
        self.constant += by * other.constant;
        for (parameter, coefficient) in &other.terms {
            match self.terms.iter_mut().find(|(index, _)| index == parameter) {
                Some((_, own)) => *own += by * coefficient,
                None => self.terms.push((*parameter, by * coefficient)),
            }
        }
        self.terms.retain(|(_, coefficient)| *coefficient != 0.0);
    }
}
