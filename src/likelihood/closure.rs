//! A log-likelihood given as Rust functions, for users of the library.

use super::{Coordinates, Evaluation, Information, LogLikelihood, Order, Parameter};
use crate::math::{Matrix, Vector};

type Scalar = Box<dyn Fn(&Vector) -> f64 + Send + Sync>;
type Gradient = Box<dyn Fn(&Vector) -> Vector + Send + Sync>;
type Hessian = Box<dyn Fn(&Vector) -> Matrix + Send + Sync>;
type Informed = Box<dyn Fn(Information, &Vector) -> Option<Matrix> + Send + Sync>;

/// l, its gradient (length n) and its Hessian (n by n) as functions of theta; working coordinates are theta itself.
pub struct FromFunctions {
    parameters: Vec<Parameter>,
    coordinates: Coordinates,
    value: Scalar,
    gradient: Gradient,
    hessian: Hessian,
    information: Option<Informed>,
    starts: Vec<Vector>,
    weight: f64,
    concave: bool,
}

impl FromFunctions {
    /// A log-likelihood from its functions and at least one starting point. The value may be NaN or minus infinity
    /// where l is undefined; derivatives are then not asked for.
    pub fn new(
        parameters: Vec<Parameter>,
        starts: Vec<Vector>,
        value: impl Fn(&Vector) -> f64 + Send + Sync + 'static,
        gradient: impl Fn(&Vector) -> Vector + Send + Sync + 'static,
        hessian: impl Fn(&Vector) -> Matrix + Send + Sync + 'static,
    ) -> Self {
        FromFunctions {
            parameters,
            coordinates: Coordinates::identity(),
            value: Box::new(value),
            gradient: Box::new(gradient),
            hessian: Box::new(hessian),
            information: None,
            starts,
            weight: 1.0,
            concave: false,
        }
    }

    /// Declares l concave, so that one start suffices where the restrictions are linear.
    pub fn concave(mut self) -> Self {
        self.concave = true;
        self
    }

    /// States the sum of the weights of the rows behind l (default 1).
    pub fn weight_total(mut self, weight: f64) -> Self {
        self.weight = weight;
        self
    }

    /// Gives the expected and the outer-product information (n by n); without it there is none.
    pub fn information(
        mut self,
        information: impl Fn(Information, &Vector) -> Option<Matrix> + Send + Sync + 'static,
    ) -> Self {
        self.information = Some(Box::new(information));
        self
    }

    /// States how phi, in which the functions are written, maps to theta, of which the restrictions speak.
    pub fn coordinates(mut self, coordinates: Coordinates) -> Self {
        self.coordinates = coordinates;
        self
    }
}

impl LogLikelihood for FromFunctions {
    fn parameters(&self) -> &[Parameter] {
        &self.parameters
    }

    fn coordinates(&self) -> &Coordinates {
        &self.coordinates
    }

    fn evaluate(&self, phi: &Vector, order: Order) -> Evaluation {
        let value = (self.value)(phi);
        let defined = value.is_finite();
        Evaluation {
            value,
            gradient: if defined && order >= Order::Gradient { (self.gradient)(phi) } else { Vector::zeros(0) },
            hessian: if defined && order >= Order::Hessian { (self.hessian)(phi) } else { Matrix::zeros(0, 0) },
        }
    }

    fn information(&self, kind: Information, phi: &Vector) -> Option<Matrix> {
        self.information.as_ref().and_then(|f| f(kind, phi))
    }

    fn weight_total(&self) -> f64 {
        self.weight
    }

    /// The points given, then the first of them moved by a low-discrepancy sequence (additive recurrence with the
    /// fractional parts of square roots of primes), by up to 1 + |start| in each parameter.
    fn starts(&self, count: usize, seed: u64) -> Vec<Vector> {
        let mut all: Vec<Vector> = self.starts.iter().take(count.max(1)).cloned().collect();
        let Some(first) = self.starts.first() else { return all };
        for k in all.len()..count {
            let moved = first.iter().enumerate().map(|(j, &x)| {
                let at = (k as f64 + seed as f64) * root_of_prime(j);
                x + (2.0 * at.fract() - 1.0) * (1.0 + x.abs())
            });
            all.push(Vector::from_iterator(first.len(), moved));
        }
        all
    }

    fn concave(&self) -> bool {
        self.concave
    }
}

/// Square root of the j-th prime.
fn root_of_prime(j: usize) -> f64 {
    let is_prime = |k: &u32| (2..*k).take_while(|d| d * d <= *k).all(|d| !k.is_multiple_of(d));
    f64::from((2u32..).filter(is_prime).nth(j).unwrap_or(2)).sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::Range;

    #[test]
    fn starts_are_as_many_as_asked_and_the_same_every_time() {
        let parameters = vec![Parameter { name: "a".into(), range: Range::ALL, meaning: String::new() }];
        let l = FromFunctions::new(
            parameters,
            vec![Vector::from_element(1, 3.0)],
            |x| -x[0] * x[0],
            |x| x * -2.0,
            |_| Matrix::from_element(1, 1, -2.0),
        );
        let (a, b) = (l.starts(5, 7), l.starts(5, 7));
        assert_eq!(a, b);
        assert_eq!(a.len(), 5);
        assert_eq!(a[0][0], 3.0);
        assert!(a[1][0] != a[2][0] && (a[1][0] - 3.0).abs() <= 4.0);
        assert_eq!(l.evaluate(&a[0], Order::Gradient).gradient[0], -6.0);
    }
}
