//! A physical quantity as the user gives it: a number, a prior, or the name of another quantity.

use std::fmt;

use oddwell_sampler::{PriorError, PriorFamily, SharedPrior, build_prior, prior_families, prior_family};
use toml_edit::Item;

use super::section::{Section, number_of, numbers_of};
use super::source::Located;
use crate::fault::Fault;
use crate::nearest::Nearest;

/// A physical quantity as given.
#[derive(Clone, Debug, PartialEq)]
pub enum Quantity {
    /// A number: held.
    Held(f64),
    /// A prior: inferred.
    Prior(PriorSpec),
    /// `same_as = "NAME"`: follows the quantity of that dotted name.
    SameAs(String),
}

impl fmt::Display for Quantity {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Held(value) => write!(out, "{value:?}"),
            Self::Prior(prior) => write!(out, "{prior}"),
            Self::SameAs(name) => write!(out, "{{ same_as = {name:?} }}"),
        }
    }
}

/// A prior as given; its numbers have been checked against its family.
#[derive(Clone, Debug, PartialEq)]
pub struct PriorSpec {
    /// The family's name, one of [`oddwell_sampler::prior_families`].
    pub family: &'static str,
    /// The family's numbers, in its order.
    pub numbers: Vec<f64>,
    /// The bounds that `within` sets, low and high.
    pub within: Option<(f64, f64)>,
}

impl PriorSpec {
    /// The prior itself.
    ///
    /// # Errors
    /// Numbers that the family refuses; never for a specification that was read from a study.
    pub fn build(&self) -> Result<SharedPrior, PriorError> {
        build_prior(self.family, &self.numbers, self.within)
    }
}

impl fmt::Display for PriorSpec {
    /// As in the study file: `{ normal = [0.0, 10.0], within = [-5.0, 5.0] }`.
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.numbers.as_slice() {
            [one] => write!(out, "{{ {} = {one:?}", self.family)?,
            numbers => write!(out, "{{ {} = {numbers:?}", self.family)?,
        }
        if let Some((low, high)) = self.within {
            write!(out, ", within = [{low:?}, {high:?}]")?;
        }
        write!(out, " }}")
    }
}

impl Section<'_> {
    /// A quantity, if it is given.
    pub(crate) fn quantity(&self, key: &str) -> Option<Located<Quantity>> {
        let (_, item) = self.find(key)?;
        let value = self.read_quantity(key, item)?;
        Some(Located { value, origin: self.origin(key, item) })
    }

    /// A quantity that must be given.
    pub(crate) fn required_quantity(&self, key: &str, example: &'static str) -> Option<Located<Quantity>> {
        if self.find(key).is_none() {
            let way =
                format!("{key} = {example}`, or a prior, as in `{key} = {{ normal = [{example}, SD] }}");
            self.missing(key, &way);
            return None;
        }
        self.quantity(key)
    }

    /// A quantity with a default.
    pub(crate) fn quantity_or(&self, key: &str, default: f64) -> Option<Located<Quantity>> {
        match self.find(key) {
            Some(_) => self.quantity(key),
            None => Some(Located::default_of(Quantity::Held(default))),
        }
    }

    fn read_quantity(&self, key: &str, item: &Item) -> Option<Quantity> {
        if let Some(value) = number_of(item) {
            if value.is_finite() {
                return Some(Quantity::Held(value));
            }
            self.fault_at(key, Fault::NotFinite { name: key.to_owned(), value });
            return None;
        }
        let Some(table) = item.as_table_like() else {
            let found = self.reader.found(item);
            self.fault_at(key, Fault::NotAQuantity { name: key.to_owned(), found });
            return None;
        };
        let inner = Section::new(self.reader, table, item.span().or_else(|| self.span()), "prior", "a prior");
        let quantity = inner.read_prior(key);
        if quantity.is_some() {
            inner.finish();
        }
        quantity
    }

    /// Reads this table as the prior (or the tie) of the quantity `name`.
    fn read_prior(&self, name: &str) -> Option<Quantity> {
        let owned = || name.to_owned();
        let given: Vec<(&toml_edit::Key, &Item)> =
            self.keys().into_iter().filter(|(key, _)| key.get() != "within").collect();
        for (key, _) in &given {
            if key.get() != "same_as" && prior_family(key.get()).is_none() {
                let value = key.get().to_owned();
                let nearest = Nearest::find(&value, family_keys().chain(["same_as", "within"]));
                let fault = Fault::UnknownChoice { what: "prior family", value, nearest };
                self.reader.fault(key.span().or_else(|| self.span()), fault);
                return None;
            }
        }
        let (key, item) = match given.as_slice() {
            [] => {
                let families = family_keys().map(str::to_owned).collect();
                self.reader.fault(self.span(), Fault::NoFamily { name: owned(), families });
                return None;
            }
            [one] => (one.0.get(), one.1),
            [first, second, ..] => {
                let (first, second) = (first.0.get().to_owned(), second.0.get().to_owned());
                self.fault_at(&second.clone(), Fault::TwoPriors { name: owned(), first, second });
                return None;
            }
        };
        if key == "same_as" {
            let source = self.text("same_as", "\"SURVEY.BIN.first.bias\"")?;
            if self.find("within").is_some() {
                self.fault_at("within", Fault::WithinTie { name: owned(), source_name: source.value });
                return None;
            }
            return Some(Quantity::SameAs(source.value));
        }
        let family = prior_family(key)?;
        self.find(key);
        let form = |key: &str, takes: String, item: &Item| Fault::PriorForm {
            name: name.to_owned(),
            key: key.to_owned(),
            takes,
            found: self.reader.found(item),
        };
        let Some(numbers) = number_of(item).map(|one| vec![one]).or_else(|| numbers_of(item)) else {
            self.fault_at(key, form(key, takes(family), item));
            return None;
        };
        let within = match self.find("within") {
            None => None,
            Some((_, bounds)) => match numbers_of(bounds).as_deref() {
                Some(&[low, high]) => Some((low, high)),
                _ => {
                    self.fault_at("within", form("within", "[low, high]".to_owned(), bounds));
                    return None;
                }
            },
        };
        let spec = PriorSpec { family: family.key, numbers, within };
        let Err(cause) = spec.build() else {
            return Some(Quantity::Prior(spec));
        };
        let of_window = matches!(cause, PriorError::InvertedWindow { .. } | PriorError::EmptyWindow { .. });
        self.fault_at(if of_window { "within" } else { key }, Fault::Prior { name: owned(), cause });
        None
    }
}

fn family_keys() -> impl Iterator<Item = &'static str> {
    prior_families().iter().map(|family| family.key)
}

/// `[mean, sd]`, or `sd` for a single number.
fn takes(family: &PriorFamily) -> String {
    match family.arguments {
        [one] => format!("a number, its {one}"),
        several => format!("[{}]", several.join(", ")),
    }
}
