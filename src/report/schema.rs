//! The committed schema against what is really written. The checker below knows the keywords the schema uses and
//! refuses any other, so that nothing in the schema goes unchecked.

use serde_json::Value;

/// Faults of `value` under `schema`, each with its place.
fn check(root: &Value, schema: &Value, value: &Value, place: &str, faults: &mut Vec<String>) {
    let keywords = schema.as_object().expect("a schema is an object");
    let kind = match value {
        Value::Null => "null",
        Value::Bool(_) => "boolean",
        Value::Number(n) if n.is_u64() || n.is_i64() => "integer",
        Value::Number(_) => "number",
        Value::String(_) => "string",
        Value::Array(_) => "array",
        Value::Object(_) => "object",
    };
    let mut fault = |ok: bool, what: String| {
        if !ok {
            faults.push(format!("{place}: {what}"));
        }
    };
    for (keyword, rule) in keywords {
        match keyword.as_str() {
            "$schema" | "$id" | "title" | "$defs" | "properties" => {}
            "type" => {
                let wanted: Vec<&str> = match rule {
                    Value::Array(list) => list.iter().filter_map(Value::as_str).collect(),
                    one => one.as_str().into_iter().collect(),
                };
                let fits = wanted.contains(&kind) || (kind == "integer" && wanted.contains(&"number"));
                fault(fits, format!("{kind} where {wanted:?} belongs"));
            }
            "const" => fault(rule == value, format!("{value} is not {rule}")),
            "enum" => fault(rule.as_array().unwrap().contains(value), format!("{value} is not among {rule}")),
            "minimum" => {
                fault(value.as_f64().is_none_or(|x| x >= rule.as_f64().unwrap()), format!("{value} under {rule}"))
            }
            "maximum" => {
                fault(value.as_f64().is_none_or(|x| x <= rule.as_f64().unwrap()), format!("{value} over {rule}"))
            }
            "pattern" => {
                let text = value.as_str().unwrap_or_default();
                let fits = value.is_null()
                    || match rule.as_str().unwrap() {
                        "^[0-9a-f]{64}$" => text.len() == 64 && text.chars().all(|c| "0123456789abcdef".contains(c)),
                        "^[a-z]+(-[a-z]+)*$" => {
                            text.split('-').all(|w| !w.is_empty() && w.chars().all(|c| c.is_ascii_lowercase()))
                        }
                        other => panic!("unknown pattern {other}"),
                    };
                fault(fits, format!("{value} does not match {rule}"));
            }
            "required" => {
                for key in rule.as_array().unwrap().iter().filter_map(Value::as_str) {
                    fault(value.get(key).is_some(), format!("{key} is missing"));
                }
            }
            "additionalProperties" | "items" | "anyOf" | "$ref" => {}
            other => panic!("unknown keyword {other}"),
        }
    }
    if let Some(Value::String(target)) = keywords.get("$ref") {
        let target = root.pointer(target.trim_start_matches('#')).expect("the reference exists");
        check(root, target, value, place, faults);
    }
    if let Some(Value::Array(choices)) = keywords.get("anyOf") {
        let tries = choices.iter().map(|choice| {
            let mut inner = Vec::new();
            check(root, choice, value, place, &mut inner);
            inner
        });
        let best = tries.min_by_key(Vec::len).unwrap();
        faults.extend(best);
    }
    if let (Some(items), Value::Array(values)) = (keywords.get("items"), value) {
        for (i, item) in values.iter().enumerate() {
            check(root, items, item, &format!("{place}[{i}]"), faults);
        }
    }
    if let Value::Object(map) = value {
        for (key, item) in map {
            let place = format!("{place}.{key}");
            match (keywords.get("properties").and_then(|p| p.get(key)), keywords.get("additionalProperties")) {
                (Some(rule), _) => check(root, rule, item, &place, faults),
                (None, Some(Value::Bool(false))) => faults.push(format!("{place}: not in the schema")),
                (None, Some(rule)) if rule.is_object() => check(root, rule, item, &place, faults),
                _ => {}
            }
        }
    }
}

/// Objects with a null whose reason is not given, or with a reason for something that is not null.
fn unexplained(value: &Value, place: &str, out: &mut Vec<String>) {
    match value {
        Value::Object(map) => {
            let reasons = map.get("reasons").and_then(Value::as_object);
            for (key, item) in map.iter().filter(|(key, _)| *key != "reasons") {
                if item.is_null() != reasons.is_some_and(|r| r.contains_key(key)) {
                    out.push(format!("{place}.{key}"));
                }
                unexplained(item, &format!("{place}.{key}"), out);
            }
            if map.contains_key("reasons") && map.keys().next_back().map(String::as_str) != Some("reasons") {
                out.push(format!("{place}: reasons are not last"));
            }
        }
        Value::Array(items) => items.iter().for_each(|item| unexplained(item, place, out)),
        _ => {}
    }
}

fn faults(value: &Value) -> Vec<String> {
    let schema: Value = serde_json::from_str(super::FIT_SCHEMA).expect("the schema is JSON");
    let mut out = Vec::new();
    check(&schema, &schema, value, "$", &mut out);
    unexplained(value, "$", &mut out);
    out
}

#[test]
fn documents_follow_the_schema() {
    for document in [super::sample::good(&["rate.a", "rate.b", "rate.c"]), super::sample::failed()] {
        let text = super::json::render(&document);
        let value: Value = serde_json::from_str(&text).unwrap();
        assert_eq!(faults(&value), Vec::<String>::new(), "{text}");
        assert_eq!(super::json::line(&document).lines().count(), 1);
        assert_eq!(serde_json::from_str::<Value>(&super::json::line(&document)).unwrap(), value);
    }
}

#[test]
fn the_checker_finds_what_is_wrong() {
    let good = super::json::value(&super::sample::good(&["a", "b"]));
    let spoil = |change: &dyn Fn(&mut Value)| {
        let mut value = good.clone();
        change(&mut value);
        faults(&value).len()
    };
    assert_eq!(spoil(&|_| {}), 0);
    assert_eq!(spoil(&|v| v["data"]["rows_used"] = (-1).into()), 1);
    assert_eq!(spoil(&|v| v["data"]["more"] = 1.into()), 1);
    assert_eq!(spoil(&|v| drop(v.as_object_mut().unwrap().shift_remove("tests"))), 1);
    assert_eq!(spoil(&|v| v["restricted"]["estimates"][0]["value"] = Value::Null), 1);
    assert_eq!(spoil(&|v| v["restricted"]["certificate"]["verdict"] = "fine".into()), 1);
    assert_eq!(spoil(&|v| v["tests"]["score"]["p"] = 1.5.into()), 1);
}

#[test]
fn keys_stand_in_the_documented_order() {
    let keys = |v: &Value| v.as_object().unwrap().keys().cloned().collect::<Vec<_>>().join(" ");
    let value = super::json::value(&super::sample::good(&["a", "b"]));
    assert_eq!(keys(&value), "schema version title group data model restricted unrestricted tests warnings reasons");
    assert_eq!(keys(&value["restricted"]), "log_likelihood estimates covariance quantities multipliers certificate");
    assert_eq!(keys(&value["restricted"]["estimates"][0]), "name value se lower upper edge reasons");
    assert_eq!(keys(&value["restricted"]["multipliers"][1]), "name role equation value se z p gap");
    assert_eq!(keys(&value["tests"]["score"]), "chi_square df p log10_p information");
    assert_eq!(
        keys(&value["restricted"]["certificate"]),
        "verdict feasibility stationarity rank restrictions condition curvature_min curvature_max edges derivatives \
         second_opinion iterations passes starts starts_at_best maxima point flat identified notes reasons"
    );
}
