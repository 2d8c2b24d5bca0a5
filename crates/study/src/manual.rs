//! The pages of the manual, made from the registries that the program itself uses.

use oddwell_model::departures::{self, Departure};
use oddwell_model::{FeltBy, Spread};
use serde::Serialize;

use crate::data_manual::data_pages;
use crate::nearest::Nearest;

/// One page: a departure.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ManualPage {
    /// The topic, and the word in a study file.
    pub name: &'static str,
    /// τ as a formula.
    pub formula: &'static str,
    /// Keys of `[[hypothesis]]` and what they mean.
    pub parameters: Vec<ManualParameter>,
    /// Who may feel it, the default first.
    pub felt_by: Vec<&'static str>,
    /// Which bins share its parameters: `all`, `survey` (those of one survey) or `bin` (none).
    pub shared_by: &'static str,
    /// Whether it depends on scale.
    pub scale_dependent: bool,
    /// What it is, and what an odd multipole can and cannot tell about it.
    pub text: &'static str,
}

/// A parameter of a departure.
#[derive(Clone, Debug, PartialEq, Serialize)]
pub struct ManualParameter {
    /// The key, and the name behind `departure.`.
    pub name: &'static str,
    /// What it is, with its unit and range.
    pub meaning: &'static str,
}

/// Every page, in the order of the registry.
pub fn manual_pages() -> Vec<ManualPage> {
    departures::registry().iter().map(|shape| page(*shape)).collect()
}

/// The page of a topic; without one, what may have been meant.
///
/// # Errors
/// The nearest topic.
pub fn manual_page(topic: &str) -> Result<ManualPage, Nearest> {
    departures::find(topic).map(page).ok_or_else(|| {
        let departures = departures::registry().iter().map(|shape| shape.name());
        Nearest::find(topic, departures.chain(data_pages().iter().map(|page| page.name)).chain(["check"]))
    })
}

fn page(shape: &'static dyn Departure) -> ManualPage {
    let parameters = shape.parameters().iter();
    ManualPage {
        name: shape.name(),
        formula: shape.formula(),
        parameters: parameters
            .map(|parameter| ManualParameter { name: parameter.name, meaning: parameter.meaning })
            .collect(),
        felt_by: shape.allowed().iter().copied().map(FeltBy::name).collect(),
        shared_by: match shape.spread() {
            Spread::Shared => "all",
            Spread::PerSurvey => "survey",
            Spread::PerBin => "bin",
        },
        scale_dependent: shape.scale_dependent(),
        text: shape.manual(),
    }
}
