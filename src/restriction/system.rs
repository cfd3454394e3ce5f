//! All restrictions of a problem together.

use std::sync::Arc;

use super::body::Body;
use super::{Restriction, RestrictionError, Role, Sides};
use crate::expr::name::quoted;
use crate::expr::nearest;
use crate::math::{Matrix, Vector};

/// All restrictions of a problem, in the order family, maintained, tested.
#[derive(Debug, Clone, Default)]
pub struct System {
    pub(super) items: Vec<Restriction>,
    pub(super) bodies: Vec<Arc<Body>>,
    pub(super) parameters: usize,
    pub(super) left_out: Vec<LeftOut>,
    /// Names of whole restrictions, before links and levels.
    pub(super) wholes: Vec<String>,
}

/// A restriction that holds whatever the free parameters are, and was left out.
#[derive(Debug, Clone, PartialEq)]
pub struct LeftOut {
    /// Its name.
    pub name: String,
    /// Its role.
    pub role: Role,
    /// Its equation.
    pub equation: String,
    /// Why, in a sentence.
    pub reason: String,
}

impl System {
    /// The restrictions, in order.
    pub fn items(&self) -> &[Restriction] {
        &self.items
    }

    /// Restrictions that hold whatever the free parameters are.
    pub fn left_out(&self) -> &[LeftOut] {
        &self.left_out
    }

    /// How many free parameters there are.
    pub fn parameters(&self) -> usize {
        self.parameters
    }

    /// Indices of the parameters that restriction `index` depends on, ascending.
    pub fn parameters_of(&self, index: usize) -> &[usize] {
        self.bodies[index].parameters()
    }

    /// Whether every restriction is linear.
    pub fn is_linear(&self) -> bool {
        self.items.iter().all(|r| r.linear)
    }

    /// Both sides of each at theta.
    pub fn sides(&self, theta: &Vector) -> Vec<Sides> {
        self.bodies.iter().map(|b| b.sides(theta.as_slice())).collect()
    }

    /// left - right of each at theta.
    pub fn gaps(&self, theta: &Vector) -> Vector {
        Vector::from_iterator(self.items.len(), self.sides(theta).iter().map(|s| s.left - s.right))
    }

    /// Jacobian of left - right by theta, m by n.
    pub fn jacobian(&self, theta: &Vector) -> Matrix {
        let mut out = Matrix::zeros(self.items.len(), self.parameters);
        for (row, body) in self.bodies.iter().enumerate() {
            body.gradient(theta.as_slice(), &mut out, row);
        }
        out
    }

    /// Sum of multiplier times Hessian of left - right, n by n.
    pub fn curvature(&self, theta: &Vector, multipliers: &Vector) -> Matrix {
        let mut out = Matrix::zeros(self.parameters, self.parameters);
        for (body, &multiplier) in self.bodies.iter().zip(multipliers.iter()) {
            body.curvature(theta.as_slice(), multiplier, &mut out);
        }
        out
    }

    /// The system of those restrictions only for which `keep` holds.
    pub fn only(&self, keep: impl Fn(&Restriction) -> bool) -> System {
        let kept = || self.items.iter().zip(&self.bodies).filter(|(r, _)| keep(r));
        System {
            items: kept().map(|(r, _)| r.clone()).collect(),
            bodies: kept().map(|(_, b)| b.clone()).collect(),
            parameters: self.parameters,
            left_out: self.left_out.clone(),
            wholes: self.wholes.clone(),
        }
    }

    /// The system without the restriction of this name, or without all its links and levels.
    ///
    /// # Errors
    /// There is none of the name, or the family brings it.
    pub fn drop(&self, name: &str) -> Result<System, RestrictionError> {
        let name = name.trim();
        let within = |whole: &str, item: &str| {
            item == whole || item.strip_prefix(whole).is_some_and(|rest| rest.starts_with('.'))
        };
        let all = || {
            let items = self.items.iter().map(|r| (r.name.as_str(), r.role));
            items.chain(self.left_out.iter().map(|l| (l.name.as_str(), l.role)))
        };
        let written = [name.to_string(), quoted(name)];
        let Some(whole) = written.iter().find(|w| all().any(|(item, _)| within(w, item))) else {
            let items = all().filter(|(_, role)| *role != Role::Family).map(|(item, _)| item);
            let near = nearest(name, self.wholes.iter().map(String::as_str).chain(items));
            let advice = near.map(|n| format!("nearest name: {n}"));
            return Err(RestrictionError::Unknown { name: name.to_string(), advice });
        };
        if all().any(|(item, role)| role == Role::Family && within(whole, item)) {
            return Err(RestrictionError::Family { name: whole.clone() });
        }
        let mut out = self.only(|r| !within(whole, &r.name));
        out.left_out.retain(|l| !within(whole, &l.name));
        out.wholes.retain(|w| w != whole);
        Ok(out)
    }
}

#[cfg(test)]
mod tests {
    use super::System;
    use crate::math::{Matrix, Vector};
    use crate::restriction::{Draft, RestrictionError, Role};

    const PARAMETERS: [&str; 6] = ["a", "b", "rate.x", "rate.y", "share.'2'", "share.north"];

    fn parameters() -> Vec<String> {
        PARAMETERS.iter().map(|p| (*p).to_string()).collect()
    }

    fn known() -> Vec<(String, f64)> {
        vec![("rate.z".to_string(), 2.0), ("k".to_string(), 0.25)]
    }

    fn draft(role: Role, name: &str, text: &str) -> Draft {
        let name = (!name.is_empty()).then(|| name.to_string());
        Draft { name, role, text: text.to_string(), place: format!("place.{text}") }
    }

    fn compiled(drafts: &[Draft]) -> Result<System, RestrictionError> {
        System::compile(drafts, &parameters(), &known())
    }

    fn system(texts: &[&str]) -> System {
        let drafts: Vec<Draft> = texts.iter().map(|t| draft(Role::Tested, "", t)).collect();
        compiled(&drafts).unwrap()
    }

    fn names(system: &System) -> Vec<&str> {
        system.items().iter().map(|r| r.name.as_str()).collect()
    }

    #[test]
    fn roles_in_order_and_names() {
        let system = compiled(&[
            draft(Role::Tested, "late", "a = b = 0"),
            draft(Role::Maintained, "", "a = 1"),
            draft(Role::Family, "shares", "sum(share.*) = 1"),
            draft(Role::Tested, "", "rate.x = rate.y"),
            draft(Role::Maintained, "two words", "rate.* = 2 * k + 1.5"),
            draft(Role::Tested, "", "b = rate.z"),
        ]);
        let system = system.unwrap();
        assert_eq!(
            names(&system),
            ["shares", "maintained_1", "'two words'.x", "'two words'.y", "late.1", "late.2", "tested_1", "tested_2"]
        );
        let equations: Vec<&str> = system.items().iter().map(|r| r.equation.as_str()).collect();
        assert_eq!(equations[0], "sum(share.*) = 1");
        assert_eq!(equations[2], "rate.x = 2 * k + 1.5");
        assert_eq!(equations[4], "a = b");
        assert_eq!(system.left_out().len(), 1, "rate.z = 2 holds already");
        assert_eq!(system.left_out()[0].name, "'two words'.z");
        assert!(system.left_out()[0].reason.contains("every value in it is known"));
        assert!(system.items().iter().map(|r| r.role).is_sorted());
    }

    #[test]
    fn values_and_slopes_by_hand() {
        let system = system(&["2 * a + 1 = b - k", "a * b = rate.z", "sum(rate.*) = 0"]);
        let theta = Vector::from_vec(vec![3.0, 5.0, 7.0, 11.0, 0.5, 0.25]);
        let sides: Vec<(f64, f64)> = system.sides(&theta).iter().map(|s| (s.left, s.right)).collect();
        assert_eq!(sides, [(7.0, 4.75), (15.0, 2.0), (20.0, 0.0)]);
        assert_eq!(system.gaps(&theta), Vector::from_vec(vec![2.25, 13.0, 20.0]));
        let jacobian = Matrix::from_row_slice(
            3,
            6,
            &[2.0, -1.0, 0.0, 0.0, 0.0, 0.0, 5.0, 3.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 1.0, 1.0, 0.0, 0.0],
        );
        assert_eq!(system.jacobian(&theta), jacobian);
        let curvature = system.curvature(&theta, &Vector::from_vec(vec![1.0, -2.0, 1.0]));
        let mut wanted = Matrix::zeros(6, 6);
        wanted[(0, 1)] = -2.0;
        wanted[(1, 0)] = -2.0;
        assert_eq!(curvature, wanted);
        assert_eq!(system.items().iter().map(|r| r.linear).collect::<Vec<_>>(), [true, false, true]);
        assert_eq!(system.parameters_of(2), [2, 3]);
    }

    /// Derivatives against central differences, over every form of expression. With h = 1e-4 a difference is off by
    /// h^2 f'''/6 and by eps f/h, both below 1e-7 of the derivatives here; 1e-6 leaves room for third derivatives of a
    /// hundred times their size. Second derivatives are held against differences of the exact first ones.
    #[test]
    fn derivatives_against_differences() {
        let texts = [
            "a = b",
            "a / b = rate.x / rate.y",
            "log(a) = 2 * log(b) + 1",
            "a^2 + b^2 = 1",
            "a^b = rate.x",
            "b^-1 = -rate.y^2",
            "exp(a - b) = sqrt(rate.x)",
            "sum(rate.*)^2 = sum(share.*)",
            "sin(a) * cos(b) = tan(rate.x)",
            "asin(share.north) + acos(share.'2') = atan(a)",
            "sinh(a) - cosh(b) = tanh(rate.x)",
            "logistic(a) = logit(share.north)",
            "lgamma(a) = digamma(b)",
            "log1p(a) = expm1(b)",
            "erf(a) = erfc(b)",
            "normal_cdf(a) = exp(normal_log_cdf(b))",
            "log_sum_exp(a, b, rate.x) = log_mix(share.north, a, share.'2', b)",
            "log_logistic(a) = log1mexp(b)",
            "normal_log_interval(a, a + b) = 0",
            "bessel_i(0, a) = bessel_i(1, b)",
            "polygamma(1, a) = polygamma(2, b)",
            "abs(a - b) = min(a, rate.x) + max(b, rate.y)",
            "if(a > b, a^2, b^3) = if(a < b and not b = 1, rate.x^2, 1)",
            "a * b * rate.x / (rate.y - k) = rate.z",
        ];
        let system = system(&texts);
        assert_eq!(system.items().len(), texts.len());
        let theta = Vector::from_vec(vec![0.7, 0.9, 1.3, 1.9, 0.3, 0.6]);
        let jacobian = system.jacobian(&theta);
        let h = 1e-4;
        let close = |exact: f64, difference: f64| (exact - difference).abs() <= 1e-6 * (1.0 + exact.abs());
        for j in 0..PARAMETERS.len() {
            let at = |step: f64| {
                let mut t = theta.clone();
                t[j] += step;
                t
            };
            let slopes = (system.gaps(&at(h)) - system.gaps(&at(-h))) / (2.0 * h);
            let seconds = (system.jacobian(&at(h)) - system.jacobian(&at(-h))) / (2.0 * h);
            for (i, text) in texts.iter().enumerate() {
                assert!(system.gaps(&theta)[i].is_finite(), "{text}");
                let exact = jacobian[(i, j)];
                assert!(close(exact, slopes[i]), "{text} by {}: {exact} {}", PARAMETERS[j], slopes[i]);
                let mut multipliers = Vector::zeros(texts.len());
                multipliers[i] = 1.0;
                let curvature = system.curvature(&theta, &multipliers);
                for k in 0..PARAMETERS.len() {
                    let (exact, difference) = (curvature[(k, j)], seconds[(i, k)]);
                    assert!(close(exact, difference), "{text} by {j} and {k}: {exact} {difference}");
                }
            }
        }
    }

    #[test]
    fn linear_ones_are_known_as_such() {
        for (text, linear) in [
            ("a = 2 * b + 3", true),
            ("(a - b) / 4 = k * rate.x", true),
            ("sum(share.*) = 1", true),
            ("a + log(rate.z) = b^1", true),
            ("a / rate.z = 0", true),
            ("a / b = 2", false),
            ("a * b = 0", false),
            ("abs(a) = 1", false),
            ("min(a, b) = 1", false),
            ("if(a > 0, a, 2 * a) = 1", false),
        ] {
            assert_eq!(system(&[text]).items()[0].linear, linear, "{text}");
        }
    }

    #[test]
    fn only_keeps_what_is_asked_for() {
        let all = compiled(&[
            draft(Role::Tested, "t", "a = b"),
            draft(Role::Maintained, "m", "a * b = 6"),
            draft(Role::Family, "f", "sum(share.*) = 1"),
        ])
        .unwrap();
        let maintained = all.only(|r| r.role != Role::Tested);
        assert_eq!(names(&maintained), ["f", "m"]);
        let theta = Vector::from_vec(vec![2.0, 3.0, 0.0, 0.0, 0.5, 0.5]);
        assert_eq!(maintained.jacobian(&theta), all.jacobian(&theta).rows(0, 2).into_owned());
        assert_eq!(maintained.sides(&theta), all.sides(&theta)[..2]);
    }

    #[test]
    fn dropping_takes_links_and_levels() {
        let all = compiled(&[
            draft(Role::Family, "shares", "sum(share.*) = 1"),
            draft(Role::Tested, "same", "a = b = 0"),
            draft(Role::Tested, "same_too", "a = 3"),
            draft(Role::Tested, "two words", "rate.* = 2"),
            draft(Role::Tested, "a.b", "b = 1"),
        ])
        .unwrap();
        let left = |name: &str| all.drop(name).unwrap().items().len();
        assert_eq!(all.items().len(), 7);
        assert_eq!(left("same"), 5);
        assert_eq!(left("same.1"), 6);
        assert_eq!(left("two words"), 5);
        assert_eq!(left("'two words'"), 5);
        assert_eq!(left("'two words'.x"), 6);
        assert_eq!(left("'two words'.z"), 7, "it was left out already");
        assert_eq!(left("a.b"), 6);
        match all.drop("smae") {
            Err(RestrictionError::Unknown { name, advice }) => {
                assert_eq!(name, "smae");
                assert_eq!(advice.as_deref(), Some("nearest name: same"));
            }
            other => panic!("{other:?}"),
        }
        assert!(matches!(all.drop("shares"), Err(RestrictionError::Family { .. })));
    }

    #[test]
    fn faults_say_where() {
        match compiled(&[draft(Role::Tested, "t", "rate.q = 1")]).unwrap_err() {
            RestrictionError::Expression { place, text, error } => {
                assert_eq!(place, "place.rate.q = 1");
                assert_eq!(&text[error.span.start..error.span.end], "rate.q");
                assert_eq!(error.advice.as_deref(), Some("nearest name: rate.x"));
                let picture = RestrictionError::Expression { place, text, error }.picture();
                assert_eq!(picture.as_deref(), Some("    rate.q = 1\n    ^^^^^^\n    nearest name: rate.x"));
            }
            other => panic!("{other:?}"),
        }
        let twice = compiled(&[draft(Role::Tested, "t", "a = 1"), draft(Role::Maintained, "t", "b = 1")]);
        let message = twice.unwrap_err().to_string();
        assert!(message.contains("two things are called t") && message.contains("a = 1") && message.contains("b = 1"));
        let both = System::compile(&[], &["k".to_string()], &known()).unwrap_err();
        assert!(matches!(both, RestrictionError::Twice { .. }), "{both:?}");
        for (text, gap) in [("rate.z = 3", -1.0), ("1 = 2", -1.0), ("a = a + 1", -1.0), ("b = 1 = 2", -1.0)] {
            match compiled(&[draft(Role::Tested, "t", text)]).unwrap_err() {
                RestrictionError::Contradiction { gap: found, .. } => assert_eq!(found, gap, "{text}"),
                other => panic!("{text}: {other:?}"),
            }
        }
        let impossible = compiled(&[draft(Role::Tested, "t", "log(-k) = 0")]).unwrap_err();
        assert!(matches!(impossible, RestrictionError::Contradiction { .. }), "{impossible:?}");
        let jumps = compiled(&[draft(Role::Tested, "t", "if(a > b, 1, 0) = 1")]).unwrap_err();
        assert!(matches!(jumps, RestrictionError::Jumps { .. }), "{jumps:?}");
    }

    #[test]
    fn what_always_holds_is_left_out() {
        let system = system(&["a = a", "rate.z = 2", "0.1 + 0.2 = 0.3", "a = 1"]);
        assert_eq!(names(&system), ["tested_4"]);
        assert_eq!(system.left_out().len(), 3);
        assert!(system.left_out()[0].reason.contains("the same"));
    }

    /// The longest texts the grammar takes must not overflow the stack on their way through the graph, also in a thread
    /// of 2 MB such as this one.
    #[test]
    fn long_and_deep_texts_compile() {
        let long = format!("{} = 0", vec!["a * b"; 900].join(" + "));
        let product = format!("{} = 0", vec!["a"; 900].join(" * "));
        let deep = format!("{}a{} = 0", "log(1 + ".repeat(95), ")".repeat(95));
        let either = format!("if({}, a, b) = 0", vec!["a < b"; 900].join(" or "));
        let system = system(&[&long, &product, &deep, &either]);
        let theta = Vector::from_vec(vec![1.0, 2.0, 0.0, 0.0, 0.0, 0.0]);
        let gaps = system.gaps(&theta);
        assert_eq!((gaps[0], gaps[1], gaps[3]), (1800.0, 1.0, 1.0));
        assert_eq!(system.jacobian(&theta)[(0, 0)], 1800.0);
        assert_eq!(system.jacobian(&theta)[(1, 0)], 900.0);
    }

    #[test]
    fn no_restrictions_at_all() {
        let system = compiled(&[]).unwrap();
        let theta = Vector::zeros(6);
        assert_eq!(system.jacobian(&theta).shape(), (0, 6));
        assert_eq!(system.curvature(&theta, &Vector::zeros(0)), Matrix::zeros(6, 6));
        assert!(system.is_linear());
    }
}
