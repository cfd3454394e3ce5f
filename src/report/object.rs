//! JSON objects that explain their nulls, and a layout of JSON that a person can read.

use serde_json::{Map, Number, Value};

/// An object under construction: keys keep their order, and every null leaves its reason in `reasons` at the end.
#[derive(Default)]
pub(super) struct Object {
    map: Map<String, Value>,
    reasons: Map<String, Value>,
}

impl Object {
    pub fn new() -> Self {
        Self::default()
    }

    /// Any value that is not null.
    pub fn put(mut self, key: &str, value: impl Into<Value>) -> Self {
        self.map.insert(key.to_string(), value.into());
        self
    }

    /// A value, or null with its reason.
    pub fn maybe<T: Into<Value>>(mut self, key: &str, value: Result<T, &str>) -> Self {
        let value = match value {
            Ok(value) => value.into(),
            Err(reason) => {
                self.reasons.insert(key.to_string(), reason.into());
                Value::Null
            }
        };
        self.map.insert(key.to_string(), value);
        self
    }

    /// A double; null with a reason where it is not finite.
    pub fn number(self, key: &str, value: f64) -> Self {
        let reason = if value.is_nan() { "undefined" } else { "infinite" };
        self.maybe(key, Number::from_f64(value).map(Value::Number).ok_or(reason))
    }

    /// A double that may be missing.
    pub fn figure(self, key: &str, value: Option<f64>, reason: &str) -> Self {
        match value {
            Some(value) => self.number(key, value),
            None => self.maybe(key, Err::<Value, _>(reason)),
        }
    }

    /// The object, with `reasons` at the end if there is a null.
    pub fn done(mut self) -> Value {
        if !self.reasons.is_empty() {
            self.map.insert("reasons".to_string(), Value::Object(self.reasons));
        }
        Value::Object(self.map)
    }
}

/// JSON with what fits in `width`, and any list of numbers, on one line, and everything else a member a line.
pub(super) fn lay_out(value: &Value, width: usize) -> String {
    let mut out = String::new();
    write(value, width, 0, 0, &mut out);
    out.push('\n');
    out
}

fn write(value: &Value, width: usize, indent: usize, before: usize, out: &mut String) {
    let flat = flat(value);
    let members = match value {
        Value::Array(items) if !items.is_empty() => items.len(),
        Value::Object(map) if !map.is_empty() => map.len(),
        _ => 0,
    };
    let numbers = value.as_array().is_some_and(|items| items.iter().all(Value::is_number));
    if members == 0 || numbers || (indent > 0 && indent + before + flat.len() < width) {
        out.push_str(&flat);
        return;
    }
    let pad = " ".repeat(indent + 2);
    let (open, close) = if value.is_array() { ('[', ']') } else { ('{', '}') };
    out.push(open);
    out.push('\n');
    let mut each = |key: Option<&String>, item: &Value, last: bool| {
        out.push_str(&pad);
        let key = key.map(|k| Value::String(k.clone()).to_string() + ": ").unwrap_or_default();
        out.push_str(&key);
        write(item, width, indent + 2, key.len(), out);
        out.push_str(if last { "\n" } else { ",\n" });
    };
    match value {
        Value::Array(items) => items.iter().enumerate().for_each(|(i, item)| each(None, item, i + 1 == members)),
        Value::Object(map) => map.iter().enumerate().for_each(|(i, (k, item))| each(Some(k), item, i + 1 == members)),
        _ => {}
    }
    out.push_str(&" ".repeat(indent));
    out.push(close);
}

/// On one line, with a space after each comma and colon.
fn flat(value: &Value) -> String {
    match value {
        Value::Array(items) => format!("[{}]", items.iter().map(flat).collect::<Vec<_>>().join(", ")),
        Value::Object(map) => {
            let member = |(key, item): (&String, &Value)| format!("{}: {}", Value::from(key.as_str()), flat(item));
            format!("{{{}}}", map.iter().map(member).collect::<Vec<_>>().join(", "))
        }
        plain => plain.to_string(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nulls_explain_themselves() {
        let value = Object::new().number("a", f64::NAN).put("b", 1).figure("c", None, "not made").done();
        assert_eq!(value.to_string(), r#"{"a":null,"b":1,"c":null,"reasons":{"a":"undefined","c":"not made"}}"#);
        assert_eq!(Object::new().put("b", 1).done().to_string(), r#"{"b":1}"#);
    }

    #[test]
    fn laid_out_json_is_the_same_json() {
        let value =
            serde_json::json!({"a": [1, 2, [3.5, {"k": "x\n\"y"}]], "long": vec!["word"; 40], "e": [], "o": {}});
        for width in [1, 20, 100] {
            assert_eq!(serde_json::from_str::<Value>(&lay_out(&value, width)).unwrap(), value);
        }
    }
}
