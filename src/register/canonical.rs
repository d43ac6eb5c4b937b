//! One way to write a value as text, so that equal entries have equal bytes.
//!
//! # Source    RFC 8785 (JSON Canonicalization Scheme), restricted to what entries hold: text, whole numbers, lists
//! and mappings with keys in ASCII.

use serde_json::Value;

/// A value on one line: keys in order, no spaces.
pub fn canonical(value: &Value) -> String {
    let mut text = String::new();
    write(value, &mut text);
    text
}

fn write(value: &Value, text: &mut String) {
    match value {
        Value::Object(fields) => {
            let mut sorted: Vec<(&String, &Value)> = fields.iter().collect();
            sorted.sort_by(|a, b| a.0.cmp(b.0));
            text.push('{');
            for (index, (key, value)) in sorted.into_iter().enumerate() {
                if index > 0 {
                    text.push(',');
                }
                text.push_str(&Value::from(key.as_str()).to_string());
                text.push(':');
                write(value, text);
            }
            text.push('}');
        }
        Value::Array(items) => {
            text.push('[');
            for (index, item) in items.iter().enumerate() {
                if index > 0 {
                    text.push(',');
                }
                write(item, text);
            }
            text.push(']');
        }
        plain => text.push_str(&plain.to_string()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use serde_json::json;

    #[test]
    fn keys_are_in_order_and_nothing_is_spaced() {
        let value = json!({"b": [1, "µ\n\"", null], "a": {"z": true, "k": 2}});
        assert_eq!(canonical(&value), r#"{"a":{"k":2,"z":true},"b":[1,"µ\n\"",null]}"#);
    }
}
