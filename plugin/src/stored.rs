//! What the stored forms of a session have in common: how one is opened, and how its fields are told from damaged ones.

use serde_json::{Map, Value};

/// Opens a stored form; `what` it holds is said where it cannot be used. The field `key` has the number of its format, of which
/// those up to `newest` are known; a newer one is read as far as it is understood.
pub(crate) fn open(
    text: &str,
    what: &str,
    (key, newest): (&str, u64),
    findings: &mut Vec<String>,
) -> Option<Map<String, Value>> {
    let Ok(Value::Object(fields)) = serde_json::from_str(text) else {
        findings.push(format!("{what} could not be read"));
        return None;
    };
    match fields.get(key).and_then(Value::as_u64) {
        Some(format) if (1..=newest).contains(&format) => {}
        Some(format) => findings.push(format!(
            "a newer version stored {what} (format {format}); what this one does not know was left out"
        )),
        None => findings.push(format!("the format of {what} has no number")),
    }
    Some(fields)
}

/// A list among the fields; empty, and said where there is something else.
pub(crate) fn list<'a>(
    fields: &'a Map<String, Value>,
    name: &str,
    findings: &mut Vec<String>,
) -> &'a [Value] {
    match fields.get(name) {
        Some(Value::Array(values)) => values,
        None => &[],
        Some(_) => {
            findings.push(format!("the stored {name} cannot be used"));
            &[]
        }
    }
}

/// A setting that is on or off, `of` something; `None` where it is missing, and said where it is something else.
pub(crate) fn boolean(
    fields: &Map<String, Value>,
    (name, of): (&str, &str),
    findings: &mut Vec<String>,
) -> Option<bool> {
    match fields.get(name) {
        Some(Value::Bool(value)) => Some(*value),
        None => None,
        Some(_) => {
            findings.push(format!("the stored setting {name} of {of} cannot be used"));
            None
        }
    }
}
