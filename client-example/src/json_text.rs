//! JSON for files and hands: what fits on a line stands on one line, and so does any list of plain values.

use serde_json::Value;

/// Width that a line should keep to.
const WIDTH: usize = 120;

/// The value as text, without a line end.
pub(crate) fn pretty(value: &Value) -> String {
    let mut text = String::new();
    write(value, 0, &mut text);
    text
}

fn write(value: &Value, indent: usize, text: &mut String) {
    let flat = flat(value);
    let plain_list =
        matches!(value, Value::Array(items) if items.iter().all(|item| !item.is_array() && !item.is_object()));
    if plain_list || indent + flat.len() <= WIDTH {
        text.push_str(&flat);
        return;
    }
    let inner = " ".repeat(indent + 2);
    match value {
        Value::Array(items) => {
            for (position, item) in items.iter().enumerate() {
                text.push_str(if position == 0 { "[\n" } else { ",\n" });
                text.push_str(&inner);
                write(item, indent + 2, text);
            }
            text.push_str(&format!("\n{}]", " ".repeat(indent)));
        }
        Value::Object(entries) => {
            for (position, (key, item)) in entries.iter().enumerate() {
                text.push_str(if position == 0 { "{\n" } else { ",\n" });
                text.push_str(&format!("{inner}{}: ", Value::from(key.as_str())));
                write(item, indent + 2, text);
            }
            text.push_str(&format!("\n{}}}", " ".repeat(indent)));
        }
        _ => text.push_str(&flat),
    }
}

/// The value on one line.
fn flat(value: &Value) -> String {
    match value {
        Value::Array(items) => format!("[{}]", items.iter().map(flat).collect::<Vec<_>>().join(", ")),
        Value::Object(entries) => {
            let entries = entries
                .iter()
                .map(|(key, item)| format!("{}: {}", Value::from(key.as_str()), flat(item)));
            format!("{{{}}}", entries.collect::<Vec<_>>().join(", "))
        }
        plain => plain.to_string(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn breaks_long_objects_and_keeps_lists_of_numbers_on_a_line() {
        let numbers: Vec<f64> = (0..60).map(|number| f64::from(number) / 4.0).collect();
        let value = serde_json::json!({"short": {"a": [1, 2]}, "long": numbers, "quote\"": null});
        let text = pretty(&value);
        assert_eq!(text.lines().count(), 5, "{text}");
        assert!(text.contains("\n  \"short\": {\"a\": [1, 2]},\n"));
        assert_eq!(serde_json::from_str::<Value>(&text).unwrap(), value);
    }
}
