//! `[[hypothesis]]`: a departure from general relativity, who feels it, and its parameters.

use std::ops::Deref;

use oddwell_model::FeltBy;
use oddwell_model::departures::{self, Departure};

use super::quantity::Quantity;
use super::section::Section;
use super::source::Located;
use crate::fault::Fault;
use crate::nearest::{Nearest, listed};

/// A departure's shape out of the model's registry; equal if the names are.
#[derive(Clone, Copy, Debug)]
pub struct Shape(pub &'static dyn Departure);

impl Deref for Shape {
    type Target = dyn Departure;

    fn deref(&self) -> &Self::Target {
        self.0
    }
}

impl PartialEq for Shape {
    fn eq(&self, other: &Self) -> bool {
        self.name() == other.name()
    }
}

/// `[[hypothesis]]`.
#[derive(Clone, Debug, PartialEq)]
pub struct HypothesisSection {
    /// What `--hypothesis` calls it.
    pub name: Located<String>,
    /// The departure's shape.
    pub departure: Located<Shape>,
    /// Who feels it; where only one answer is possible, that one by default.
    pub felt_by: Located<FeltBy>,
    /// The shape's parameters by key, in the shape's order.
    pub parameters: Vec<(&'static str, Located<Quantity>)>,
    /// How probable the hypothesis is before the data, relative to the others; default 1.
    pub weight: Located<f64>,
}

impl HypothesisSection {
    pub(super) fn read(section: Section<'_>) -> Option<Self> {
        let name = section.required_text("name", "\"constant\"");
        let departure = read_departure(&section);
        let felt_by = departure.as_ref().and_then(|departure| read_felt_by(&section, departure.value));
        let weight = read_weight(&section);
        let Some(departure) = departure else {
            // Which other keys belong here depends on the shape.
            section.find("felt_by");
            let any: Vec<&str> = departures::registry()
                .iter()
                .flat_map(|shape| shape.parameters())
                .map(|each| each.name)
                .collect();
            section.finish_knowing(&any);
            return None;
        };
        let shape = departure.value;
        let parameters: Vec<_> = shape
            .parameters()
            .iter()
            .map(|parameter| {
                let quantity = section.required_quantity(parameter.name, "1.0")?;
                Some((parameter.name, quantity))
            })
            .collect();
        let foreign = foreign_parameters(&section, shape);
        section.finish_knowing(&foreign);
        Some(Self {
            name: name?,
            departure,
            felt_by: felt_by?,
            parameters: parameters.into_iter().collect::<Option<_>>()?,
            weight: weight?,
        })
    }
}

fn read_weight(section: &Section<'_>) -> Option<Located<f64>> {
    if section.find("weight").is_none() {
        return Some(Located::default_of(1.0));
    }
    let weight = section.number("weight", "1.0")?;
    if weight.value > 0.0 {
        return Some(weight);
    }
    let fault = Fault::OutOfRange {
        name: "weight".to_owned(),
        rule: "above 0",
        value: weight.value.to_string(),
        way_out: "give how probable the hypothesis is relative to the others, or remove it",
    };
    section.fault_at("weight", fault);
    None
}

fn read_departure(section: &Section<'_>) -> Option<Located<Shape>> {
    let text = section.required_text("departure", "\"constant\"")?;
    if let Some(shape) = departures::find(&text.value) {
        return Some(text.map(|_| Shape(shape)));
    }
    let nearest = Nearest::find(&text.value, departures::registry().iter().map(|shape| shape.name()));
    section.fault_at("departure", Fault::UnknownChoice { what: "departure", value: text.value, nearest });
    None
}

fn read_felt_by(section: &Section<'_>, shape: Shape) -> Option<Located<FeltBy>> {
    let allowed = shape.allowed();
    let words: Vec<&str> = allowed.iter().map(|felt_by| felt_by.name()).collect();
    if section.find("felt_by").is_none() {
        return match allowed {
            [only] => Some(Located::default_of(*only)),
            _ if shape.parameters().is_empty() => Some(Located::default_of(FeltBy::Light)),
            _ => {
                let example = format!(
                    "felt_by = \"{}\"` (or {}), after `departure = \"{}\"",
                    words[0],
                    listed(&words[1..]),
                    shape.name()
                );
                section.missing("felt_by", &example);
                None
            }
        };
    }
    let choices = FeltBy::ALL.map(|felt_by| (felt_by.name(), felt_by));
    let felt_by = section.choice("felt_by", "felt_by", &choices, "\"light\"")?;
    if allowed.contains(&felt_by.value) {
        return Some(felt_by);
    }
    let fault =
        Fault::FeltBy { departure: shape.name(), felt_by: felt_by.value.name(), allowed: words.join(" or ") };
    section.fault_at("felt_by", fault);
    None
}

/// Complains of parameters that another shape has and this one has not, and returns them.
fn foreign_parameters(section: &Section<'_>, shape: Shape) -> Vec<&'static str> {
    let mut foreign = Vec::new();
    for (key, _) in section.keys() {
        if shape.parameters().iter().any(|parameter| parameter.name == key.get()) {
            continue;
        }
        let owners: Vec<_> = departures::registry()
            .iter()
            .filter_map(|other| {
                let parameter = other.parameters().iter().find(|parameter| parameter.name == key.get())?;
                Some((other.name(), parameter.name))
            })
            .collect();
        let Some(&(_, name)) = owners.first() else {
            continue;
        };
        foreign.push(name);
        let fault = Fault::ForeignParameter {
            key: name.to_owned(),
            departure: shape.name(),
            others: owners.into_iter().map(|(owner, _)| owner).collect(),
        };
        section.fault_at_key(name, fault);
    }
    foreign
}
