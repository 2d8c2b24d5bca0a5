//! JSON Schemas (draft 2020-12) of what a person types and of what a run leaves: for editors that complete a study file as
//! it is typed, and for programs that read results.
//!
//! Those of results are made from the types that write them. That of the study file is made from the registries of
//! departures, priors and noise models and a table of keys, which a test holds to the keys that are read.

mod keys;
mod study_file;

use crate::record::{Manifest, Stability, Summary, WeighRecord};
use schemars::schema_for;
use serde_json::Value;

/// What has a schema, with the file that it describes.
#[derive(Clone, Copy, Debug)]
pub struct SchemaTopic {
    /// What to call it.
    pub name: &'static str,
    /// The file.
    pub file: &'static str,
    make: fn() -> Value,
}

impl SchemaTopic {
    /// The schema.
    #[must_use]
    pub fn schema(&self) -> Value {
        (self.make)()
    }
}

/// Everything that has a schema.
#[must_use]
pub fn schemas() -> &'static [SchemaTopic] {
    const ALL: &[SchemaTopic] = &[
        SchemaTopic { name: "study", file: "study.toml", make: study_file::schema },
        SchemaTopic { name: "summary", file: "summary.json", make: || schema_for!(Summary).to_value() },
        SchemaTopic { name: "weigh", file: "weigh.json", make: || schema_for!(WeighRecord).to_value() },
        SchemaTopic { name: "manifest", file: "manifest.json", make: || schema_for!(Manifest).to_value() },
        SchemaTopic { name: "stability", file: "stability.json", make: || schema_for!(Stability).to_value() },
    ];
    ALL
}

#[cfg(test)]
pub(crate) use keys::study_keys;

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_schema_describes_an_object_with_properties() {
        for topic in schemas() {
            let schema = topic.schema();
            let properties = schema["properties"].as_object().map_or(0, serde_json::Map::len);
            assert!(properties > 3, "{}: {schema}", topic.name);
        }
    }

    /// Keys are a contract: renamed in a type, they are renamed in the schema.
    #[test]
    fn the_summary_has_its_keys() {
        let schema = schema_for!(Summary).to_value();
        let warning = &schema["$defs"]["WarningRecord"]["properties"];
        assert!(warning["where"].is_object() && warning["place"].is_null(), "{warning}");
        assert!(schema["properties"]["general_relativity"].is_object());
        let parameter = &schema["$defs"]["ParameterSummary"]["properties"];
        assert_eq!(parameter["rhat"]["type"], serde_json::json!(["number", "null"]));
    }
}
