//! Drafts to a [`System`]: names, expansion, derivatives, and what always or never holds.

use std::sync::Arc;

use super::body::Body;
use super::draft::{self, Draft};
use super::expand::{Link, expand};
use super::system::{LeftOut, System};
use super::vocabulary::Vocabulary;
use super::{Restriction, RestrictionError};
use crate::expr::name::quoted;
use crate::expr::{ExprError, Graph, Scope, build};

/// A constant equation holds when |left - right| is at most this times 1 + |left| + |right|: the feasibility that every
/// answer is held to.
const FEASIBLE: f64 = 1e-9;

impl System {
    /// Reads the drafts and compiles them with their derivatives. `parameters` are the names of the free parameters in
    /// order, as input accepts them; `known` are names that stand for numbers. Family restrictions come first, then
    /// maintained, then tested ones, each in the order given. Restrictions that hold whatever the free parameters are
    /// are left out and listed in [`System::left_out`].
    ///
    /// # Errors
    /// A text that is no equation or names what there is not; two restrictions with one name; an equation that no
    /// values of the free parameters can make true.
    pub fn compile(
        drafts: &[Draft],
        parameters: &[String],
        known: &[(String, f64)],
    ) -> Result<System, RestrictionError> {
        let vocabulary = Vocabulary::new(parameters, known)?;
        let mut drafts: Vec<&Draft> = drafts.iter().collect();
        drafts.sort_by_key(|d| d.role);
        let names = draft::names(&drafts);
        for (i, name) in names.iter().enumerate() {
            if let Some(before) = names[..i].iter().position(|n| n == name) {
                let place = |i: usize| format!("{} ({})", drafts[i].place, drafts[i].text);
                return Err(RestrictionError::Twice { name: quoted(name), first: place(before), second: place(i) });
            }
        }
        let (mut graph, scope) = vocabulary.scope();
        let mut system = System { parameters: parameters.len(), ..System::default() };
        for (draft, name) in drafts.into_iter().zip(&names) {
            let fault = |error: ExprError| RestrictionError::Expression {
                place: draft.place.clone(),
                text: draft.text.clone(),
                error: Box::new(error),
            };
            system.wholes.push(quoted(name));
            for link in expand(&quoted(name), &draft.text, &vocabulary).map_err(fault)? {
                system.push(draft, link, &vocabulary, &mut graph, &scope)?;
            }
        }
        Ok(system)
    }

    fn push(
        &mut self,
        draft: &Draft,
        link: Link,
        vocabulary: &Vocabulary,
        graph: &mut Graph,
        scope: &Scope,
    ) -> Result<(), RestrictionError> {
        let Link { name, left, right } = link;
        let fault = |error: ExprError| RestrictionError::Expression {
            place: draft.place.clone(),
            text: draft.text.clone(),
            error: Box::new(error),
        };
        let equation = format!("{left} = {right}");
        let mut parameters = vocabulary.parameters_in(&left).map_err(fault)?;
        parameters.extend(vocabulary.parameters_in(&right).map_err(fault)?);
        parameters.sort_unstable();
        parameters.dedup();
        let left = build(graph, &left, scope).map_err(fault)?;
        let right = build(graph, &right, scope).map_err(fault)?;
        let gap = graph.subtract(left, right);
        if let Some(gap) = graph.as_constant(gap) {
            let size = |id| graph.as_constant(id).map_or(0.0, f64::abs);
            if gap.abs() <= FEASIBLE * (1.0 + size(left) + size(right)) {
                let why =
                    if parameters.is_empty() { "every value in it is known" } else { "its two sides are the same" };
                let reason = format!("{name} ({equation}) holds whatever the free parameters are: {why}");
                self.left_out.push(LeftOut { name, role: draft.role, equation, reason });
                return Ok(());
            }
            return Err(RestrictionError::Contradiction { place: draft.place.clone(), name, equation, gap });
        }
        let body = Body::compile(graph, left, right, &parameters);
        if body.parameters().is_empty() {
            return Err(RestrictionError::Jumps { place: draft.place.clone(), name, equation });
        }
        self.items.push(Restriction { name, role: draft.role, equation, linear: body.is_linear() });
        self.bodies.push(Arc::new(body));
        Ok(())
    }
}
