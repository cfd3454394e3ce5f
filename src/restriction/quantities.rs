//! Named expressions of the parameters, with exact gradients.

use super::RestrictionError;
use super::body::Body;
use super::vocabulary::Vocabulary;
use crate::expr::{ExprError, Name, build, parse_expression};
use crate::math::{Matrix, Vector};

/// Derived quantities, in the order given.
#[derive(Debug, Default)]
pub struct Quantities {
    names: Vec<String>,
    texts: Vec<String>,
    bodies: Vec<Body>,
    parameters: usize,
}

impl Quantities {
    /// Compiles `(name, text, place)`: the name without quotes, the expression, and the dotted key of the study or the
    /// option for messages. A text may use parameters, known values and the quantities before it.
    ///
    /// # Errors
    /// A text that is no expression or names what there is not; two things with one name.
    pub fn compile(
        definitions: &[(String, String, String)],
        parameters: &[String],
        known: &[(String, f64)],
    ) -> Result<Quantities, RestrictionError> {
        let vocabulary = Vocabulary::new(parameters, known)?;
        let (mut graph, mut scope) = vocabulary.scope();
        let mut out = Quantities { parameters: parameters.len(), ..Quantities::default() };
        // The parameters each quantity so far depends on, since later ones may use it.
        let mut used: Vec<Vec<usize>> = Vec::new();
        for (i, (raw, text, place)) in definitions.iter().enumerate() {
            let name = Name::single(raw);
            let twice =
                |first: String| RestrictionError::Twice { name: name.to_string(), first, second: place.clone() };
            if vocabulary.has(&name) {
                let kind = if vocabulary.is_free(&name) { "a parameter" } else { "a known value" };
                return Err(twice(kind.to_string()));
            }
            if let Some(before) = definitions[..i].iter().find(|d| d.0 == *raw) {
                return Err(twice(before.2.clone()));
            }
            let fault = |error: ExprError| RestrictionError::Expression {
                place: place.clone(),
                text: text.clone(),
                error: Box::new(error),
            };
            let ast = parse_expression(text).map_err(fault)?;
            let mut indices = vocabulary.parameters_in(&ast).map_err(fault)?;
            for (used_name, span) in ast.names() {
                let single = used_name.as_single();
                if let Some(at) = definitions[..i].iter().position(|d| Some(d.0.as_str()) == single) {
                    indices.extend_from_slice(&used[at]);
                } else if definitions[i..].iter().any(|d| Some(d.0.as_str()) == single) {
                    let message = format!("{used_name} is not yet defined here");
                    return Err(fault(ExprError::sort(span, message).advise("a quantity may use those before it")));
                }
            }
            indices.sort_unstable();
            indices.dedup();
            let node = build(&mut graph, &ast, &scope).map_err(fault)?;
            let zero = graph.constant(0.0);
            out.bodies.push(Body::compile(&mut graph, node, zero, &indices));
            scope.insert(name.to_string(), node);
            out.names.push(name.to_string());
            out.texts.push(text.clone());
            used.push(indices);
        }
        Ok(out)
    }

    /// Their names, as input accepts them.
    pub fn names(&self) -> &[String] {
        &self.names
    }

    /// Their expressions as written.
    pub fn texts(&self) -> &[String] {
        &self.texts
    }

    /// How many there are.
    pub fn len(&self) -> usize {
        self.names.len()
    }

    /// Whether there is none.
    pub fn is_empty(&self) -> bool {
        self.names.is_empty()
    }

    /// Their values at theta, length k.
    pub fn values(&self, theta: &Vector) -> Vector {
        Vector::from_iterator(self.len(), self.bodies.iter().map(|b| b.sides(theta.as_slice()).left))
    }

    /// Their gradients by theta, k by n.
    pub fn gradient(&self, theta: &Vector) -> Matrix {
        let mut out = Matrix::zeros(self.len(), self.parameters);
        for (row, body) in self.bodies.iter().enumerate() {
            body.gradient(theta.as_slice(), &mut out, row);
        }
        out
    }
}

#[cfg(test)]
mod tests {
    use super::Quantities;
    use crate::math::{Matrix, Vector};
    use crate::restriction::RestrictionError;

    fn compiled(texts: &[(&str, &str)]) -> Result<Quantities, RestrictionError> {
        let definitions: Vec<(String, String, String)> =
            texts.iter().map(|(n, t)| ((*n).to_string(), (*t).to_string(), format!("quantities.{n}"))).collect();
        let parameters = ["rate.x", "rate.y", "b"].map(str::to_string);
        Quantities::compile(&definitions, &parameters, &[("k".to_string(), 2.0)])
    }

    #[test]
    fn values_and_gradients_by_hand() {
        let quantities = compiled(&[
            ("ratio", "rate.x / rate.y"),
            ("twice", "k * ratio + b"),
            ("all", "sum(rate.*)"),
            ("soak time", "3"),
            ("more", "\"soak time\" * twice"),
        ])
        .unwrap();
        assert_eq!(quantities.names(), ["ratio", "twice", "all", "\"soak time\"", "more"]);
        let theta = Vector::from_vec(vec![3.0, 4.0, 5.0]);
        assert_eq!(quantities.values(&theta), Vector::from_vec(vec![0.75, 6.5, 7.0, 3.0, 19.5]));
        let wanted = Matrix::from_row_slice(
            5,
            3,
            &[0.25, -0.1875, 0.0, 0.5, -0.375, 1.0, 1.0, 1.0, 0.0, 0.0, 0.0, 0.0, 1.5, -1.125, 3.0],
        );
        assert_eq!(quantities.gradient(&theta), wanted);
    }

    #[test]
    fn faults() {
        let expression = |texts: &[(&str, &str)]| match compiled(texts).unwrap_err() {
            RestrictionError::Expression { place, error, .. } => (place, *error),
            other => panic!("{other:?}"),
        };
        let (place, error) = expression(&[("a", "rate.x"), ("c", "rate.z")]);
        assert_eq!(place, "quantities.c");
        assert_eq!(error.advice.as_deref(), Some("nearest name: rate.x"));
        let (_, error) = expression(&[("a", "c + 1"), ("c", "rate.x")]);
        assert!(error.to_string().contains("not yet defined"), "{error}");
        let (_, error) = expression(&[("a", "a + 1")]);
        assert!(error.to_string().contains("not yet defined"), "{error}");
        for texts in [vec![("b", "1")], vec![("k", "1")], vec![("a", "1"), ("a", "2")]] {
            assert!(matches!(compiled(&texts), Err(RestrictionError::Twice { .. })), "{texts:?}");
        }
    }
}
