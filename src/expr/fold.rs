//! The folds of an expression: its `abs` nodes, and the same expression with other nodes in their place.

use std::collections::HashMap;

use super::Function;
use super::graph::{Graph, Id, Node};

impl Graph {
    /// Every `abs(u)` below a node that moves with what is estimated, as (abs(u), u); inner ones stand first.
    pub fn folds(&self, id: Id) -> Vec<(Id, Id)> {
        let (mut todo, mut seen, mut out) = (vec![id], vec![id], Vec::new());
        while let Some(id) = todo.pop() {
            if let Node::Call(Function::Abs, a) = self.node(id) {
                out.push((id, a[0]));
            }
            for b in self.below(id) {
                if !seen.contains(&b) && !self.class(b).is_fixed() {
                    seen.push(b);
                    todo.push(b);
                }
            }
        }
        out.retain(|&(node, _)| !self.class(node).is_fixed());
        // what a node is made of was made before it
        out.sort_unstable();
        out
    }

    /// The nodes that a node is made of.
    pub(super) fn below(&self, id: Id) -> Vec<Id> {
        match self.node(id) {
            Node::Sum(_, t) | Node::Product(t) => t.iter().map(|&(i, _)| i).collect(),
            Node::Call(_, a) | Node::Shift(a) => a.to_vec(),
            Node::Choice(a, b, c) => vec![*a, *b, *c],
            Node::Power(a, b) | Node::Compare(_, a, b) | Node::And(a, b) | Node::Or(a, b) => vec![*a, *b],
            Node::Not(a) => vec![*a],
            Node::Constant(_) | Node::Column(_) | Node::Parameter(_) | Node::Predictor(_) => Vec::new(),
        }
    }

    /// The node with the nodes named in `by` replaced wherever they stand below it. What was replaced on the way joins `by`.
    pub fn replaced(&mut self, id: Id, by: &mut HashMap<Id, Id>) -> Id {
        if let Some(&known) = by.get(&id) {
            return known;
        }
        let below = self.below(id);
        let new: Vec<Id> = below.iter().map(|&b| self.replaced(b, by)).collect();
        let out = if new == below {
            id
        } else {
            match self.node(id).clone() {
                Node::Sum(c, t) => {
                    let terms: Vec<(Id, f64)> = new.iter().zip(&t).map(|(&i, t)| (i, t.1.get())).collect();
                    self.sum(c.get(), &terms)
                }
                Node::Product(t) => {
                    let factors: Vec<(Id, f64)> = new.iter().zip(&t).map(|(&i, t)| (i, t.1.get())).collect();
                    self.product(&factors)
                }
                Node::Call(function, _) => self.call(function, &new),
                Node::Shift(_) => self.shift(&new),
                Node::Choice(..) => self.choice(new[0], new[1], new[2]),
                Node::Power(..) => self.power(new[0], new[1]),
                Node::Compare(relation, ..) => self.compare(relation, new[0], new[1]),
                Node::And(..) => self.and(new[0], new[1]),
                Node::Or(..) => self.or(new[0], new[1]),
                Node::Not(_) => self.not(new[0]),
                Node::Constant(_) | Node::Column(_) | Node::Parameter(_) | Node::Predictor(_) => id,
            }
        };
        by.insert(id, out);
        out
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::expr::Variable;

    #[test]
    fn folds_are_found_with_their_slopes_and_replaced() {
        // 3 log(b) - 2 abs(y - abs(a)) / b
        let mut g = Graph::new();
        g.set_parameter_sign(1, crate::expr::Sign::Positive);
        let (y, a, b) = (g.column(0), g.parameter(0), g.parameter(1));
        let inner = g.call(Function::Abs, &[a]);
        let u = g.subtract(y, inner);
        let outer = g.call(Function::Abs, &[u]);
        let ratio = g.divide(outer, b);
        let log = g.call(Function::Log, &[b]);
        let f = g.sum(0.0, &[(log, 3.0), (ratio, -2.0)]);
        assert_eq!(g.folds(f), vec![(inner, a), (outer, u)]);
        let slope = g.derivative(f, Variable::Node(outer));
        let wanted = g.product(&[(b, -1.0)]);
        let wanted = g.scale(-2.0, wanted);
        assert_eq!(slope, wanted);
        let mut by = HashMap::from([(inner, a)]);
        let plain = g.replaced(u, &mut by);
        assert_eq!(plain, g.subtract(y, a));
        by.insert(outer, plain);
        let new = g.replaced(f, &mut by);
        assert!(g.folds(new).is_empty());
        let ratio = g.divide(plain, b);
        assert_eq!(new, g.sum(0.0, &[(log, 3.0), (ratio, -2.0)]));
    }
}
