//! `[[survey.template]]`: a shape of the measurements that comes with an amplitude of its own.

use super::quantity::Quantity;
use super::section::Section;
use super::source::Located;

/// `[[survey.template]]`: amplitude × shape is added to the prediction of the survey's rows.
#[derive(Clone, Debug, PartialEq)]
pub struct TemplateSection {
    /// Its amplitude is the parameter `SURVEY.template.NAME`.
    pub name: Located<String>,
    /// Path of the shape, as written: one number for each row of the table, in the unit of its values.
    pub file: Located<String>,
    /// The amplitude.
    pub amplitude: Located<Quantity>,
}

impl TemplateSection {
    pub(super) fn read(section: Section<'_>) -> Option<Self> {
        let name = section.required_text("name", "\"stray-light\"");
        let file = section.required_text("file", "\"stray-light.csv\"");
        let amplitude = section.required_quantity("amplitude", "1.0");
        section.finish();
        Some(Self { name: name?, file: file?, amplitude: amplitude? })
    }
}
