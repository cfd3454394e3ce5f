//! Squares in a sum: what is squared, and the second derivatives of the sum with it taken at its tangent, so that minus a
//! square stays concave however its inside bends (the model of Gauss and Newton for sums of squares).

use super::graph::{Graph, Id, Node, Variable};

/// A term `coefficient * inside^2 * rest` of a sum.
#[derive(Debug, Clone, PartialEq)]
pub struct Square {
    coefficient: f64,
    /// What is squared.
    pub inside: Id,
    rest: Vec<(Id, f64)>,
}

impl Graph {
    /// The terms of a sum (or the one term that the node is) in which something is squared with a negative coefficient.
    pub fn squares(&self, id: Id) -> Vec<Square> {
        let terms: Vec<(Id, f64)> = match self.node(id) {
            Node::Sum(_, terms) => terms.iter().map(|&(i, k)| (i, k.get())).collect(),
            _ => vec![(id, 1.0)],
        };
        let square = |&(term, coefficient): &(Id, f64)| {
            let Node::Product(factors) = self.node(term) else { return None };
            let squared = |f: &&(Id, super::graph::Number)| f.1.get() == 2.0 && matches!(self.node(f.0), Node::Sum(..));
            let inside = factors.iter().find(squared)?.0;
            let rest = factors.iter().filter(|f| f.0 != inside).map(|&(i, e)| (i, e.get())).collect();
            (coefficient < 0.0).then_some(Square { coefficient, inside, rest })
        };
        terms.iter().filter_map(square).collect()
    }

    /// What the curvature of the insides by `u` and `v` adds to the second derivative of the sum; the constant 0 where
    /// they are straight.
    pub fn bend(&mut self, squares: &[Square], u: Variable, v: Variable) -> Id {
        let mut parts = Vec::new();
        for square in squares {
            let first = self.derivative(square.inside, u);
            let second = self.derivative(first, v);
            if self.as_constant(second) == Some(0.0) {
                continue;
            }
            let mut factors = square.rest.clone();
            factors.extend([(square.inside, 1.0), (second, 1.0)]);
            parts.push((self.product(&factors), 2.0 * square.coefficient));
        }
        self.sum(0.0, &parts)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::expr::{Scope, build, parse_expression};

    #[test]
    fn the_curvature_inside_a_square_is_told_apart() {
        let mut graph = Graph::new();
        let mut scope = Scope::new("name");
        for (i, name) in ["a", "s"].into_iter().enumerate() {
            let id = graph.parameter(i as u32);
            scope.insert(name, id);
        }
        let text = "-log(s) - ((3 - exp(2 * a)) / s)^2 / 2";
        let id = build(&mut graph, &parse_expression(text).unwrap(), &scope).unwrap();
        let squares = graph.squares(id);
        assert_eq!(squares.len(), 1);
        let (a, s) = (Variable::Parameter(0), Variable::Parameter(1));
        let bend = graph.bend(&squares, a, a);
        let straight = graph.bend(&squares, a, s);
        assert_eq!(graph.as_constant(straight), Some(0.0));
        // d2/da2 of -(3 - e^2a)^2 / (2 s^2) is -(2 e^2a)^2 / s^2 + (3 - e^2a) 4 e^2a / s^2: the second part is the bend
        let value = crate::expr::Scalars::compile(&graph, &[bend]).evaluate(&[0.25, 1.5])[0];
        let e = 0.5f64.exp();
        assert!((value - (3.0 - e) * 4.0 * e / 2.25).abs() < 1e-14, "{value}");
    }
}
