//! The list of families as JSON.

use serde_json::Value;

use super::object::{Object, lay_out};

/// A family as it is listed.
#[derive(Debug, Clone, PartialEq)]
pub struct Family<'a> {
    /// Name in a study.
    pub name: &'a str,
    /// The response in words.
    pub response: &'a str,
    /// Its parameters.
    pub parameters: Vec<Parameter<'a>>,
    /// The formula that is computed.
    pub formula: &'a str,
    /// Its expected information.
    pub information: &'a str,
    /// Where it is published.
    pub source: &'a str,
}

/// A parameter of a family as it is listed.
#[derive(Debug, Clone, PartialEq)]
pub struct Parameter<'a> {
    /// Its name.
    pub name: &'a str,
    /// Its natural range.
    pub range: &'a str,
    /// The link it has with terms unless told otherwise; `None` where it takes no terms.
    pub link: Option<&'a str>,
}

/// All of them in one document.
pub fn json(families: &[Family]) -> String {
    let parameter = |p: &Parameter| {
        let object = Object::new().put("name", p.name).put("range", p.range);
        object.maybe("link", p.link.ok_or("it takes no terms")).done()
    };
    let family = |f: &Family| {
        Object::new()
            .put("name", f.name)
            .put("response", f.response)
            .put("parameters", f.parameters.iter().map(parameter).collect::<Vec<Value>>())
            .put("formula", f.formula)
            .put("information", f.information)
            .put("source", f.source)
            .done()
    };
    lay_out(&Value::Array(families.iter().map(family).collect()), 100)
}

#[cfg(test)]
mod tests {
    use super::{Family, Parameter, json};

    #[test]
    fn a_parameter_without_terms_says_why_it_has_no_link() {
        let parameters = vec![Parameter { name: "share.LABEL", range: "[0, 1]", link: None }];
        let family = Family { name: "n", response: "r", parameters, formula: "f", information: "i", source: "s" };
        let value: serde_json::Value = serde_json::from_str(&json(&[family])).unwrap();
        assert!(value[0]["parameters"][0]["link"].is_null());
        assert_eq!(value[0]["parameters"][0]["reasons"]["link"], "it takes no terms");
        assert_eq!(value[0]["source"], "s");
    }
}
