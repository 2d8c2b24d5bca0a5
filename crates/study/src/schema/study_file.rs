//! The study file's schema, from the table of keys.

use super::keys::{Form, Keys, study_keys};
use serde_json::{Map, Value, json};

pub(super) fn schema() -> Value {
    let sections = study_keys();
    let mut definitions: Map<String, Value> = sections
        .iter()
        .filter(|section| section.section != "study")
        .map(|section| (section.section.to_owned(), object(section)))
        .collect();
    definitions.insert(
        "quantity".to_owned(),
        json!({
            "description": "a number (held), a prior (inferred), or another quantity that it follows",
            "anyOf": [{ "type": "number" }, { "$ref": "#/$defs/prior" }],
        }),
    );
    let mut root = match sections.iter().find(|section| section.section == "study").map(object) {
        Some(Value::Object(root)) => root,
        _ => Map::new(),
    };
    root.insert("$schema".to_owned(), "https://json-schema.org/draft/2020-12/schema".into());
    root.insert("title".to_owned(), "A study".into());
    root.insert("$defs".to_owned(), Value::Object(definitions));
    Value::Object(root)
}

fn object(section: &Keys) -> Value {
    let properties: Map<String, Value> = section
        .keys
        .iter()
        .map(|key| {
            let mut value = form(&key.form);
            if let Value::Object(fields) = &mut value {
                fields.insert("description".to_owned(), key.meaning.into());
            }
            (key.name.to_owned(), value)
        })
        .collect();
    let required: Vec<&str> = section.keys.iter().filter(|key| key.required).map(|key| key.name).collect();
    json!({ "type": "object", "properties": properties, "required": required, "additionalProperties": false })
}

fn form(form: &Form) -> Value {
    let list = |of: Value| json!({ "type": "array", "items": of });
    let pair = || json!({ "type": "array", "items": { "type": "number" }, "minItems": 2, "maxItems": 2 });
    match form {
        Form::Text => json!({ "type": "string" }),
        Form::Number => json!({ "type": "number" }),
        Form::Count => json!({ "type": "integer", "minimum": 0 }),
        Form::Flag => json!({ "type": "boolean" }),
        Form::Quantity => reference("quantity"),
        Form::OneOf(words) => json!({ "enum": words }),
        Form::Texts => list(json!({ "type": "string" })),
        Form::Counts => list(json!({ "type": "integer", "minimum": 0, "maximum": 4 })),
        Form::Numbers => list(json!({ "type": "number" })),
        Form::Rows => list(list(json!({ "type": "number" }))),
        Form::TextRows => list(list(json!({ "type": "string" }))),
        Form::Range => pair(),
        Form::Nodes => list(pair()),
        Form::Shells => json!({ "anyOf": [list(json!({ "type": "number" })), reference("shells")] }),
        Form::One(section) => reference(section),
        Form::Many(section) => list(reference(section)),
    }
}

fn reference(section: &str) -> Value {
    json!({ "$ref": format!("#/$defs/{section}") })
}
