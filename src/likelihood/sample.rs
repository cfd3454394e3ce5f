//! A model joined to its data, ready to be evaluated.

use rayon::prelude::{IntoParallelIterator, ParallelIterator};

use super::coordinates::Coordinates;
use super::formula::{Formula, Which};
use super::part::{Part, pairwise};
use super::plan::Bound;
use super::start;
use super::{Evaluation, Information, LogLikelihood, Order, Parameter, Tangent};
use crate::family::{Amounts, Family};
use crate::math::{Matrix, Random, Vector};

/// A log-likelihood over the rows of a table.
#[derive(Debug, Clone)]
pub struct Sample {
    pub(super) parameters: Vec<Parameter>,
    pub(super) known: Vec<(String, f64)>,
    pub(super) coordinates: Coordinates,
    pub(super) formulas: Vec<Formula>,
    pub(super) parts: Vec<Part>,
    pub(super) weight_total: f64,
    pub(super) start: Vector,
    pub(super) concave: bool,
    pub(super) equations: Vec<String>,
    pub(super) mixture: Option<Mixture>,
    pub(super) expected: bool,
    pub(super) observed_by_default: bool,
    /// Whether the density is the user's own.
    pub(super) custom: bool,
    /// Cells of labels: for each level of `per` its total weight and what each share is bound to.
    pub(super) cells: Vec<(f64, Vec<Bound>)>,
    /// For each part: the total weight of its level of `per` if its rows are bins.
    pub(super) bins: Vec<Option<f64>>,
}

/// What a mixture needs for its own dangers: collapse and exchange of components.
#[derive(Debug, Clone, Default)]
pub(super) struct Mixture {
    levels: Vec<(Vec<Component>, f64)>,
}

#[derive(Debug, Clone)]
struct Component {
    name: String,
    family: &'static Family,
    share: Option<Bound>,
    /// Its plain parameters.
    own: Vec<Bound>,
    /// Standard deviation or scale, if it is a plain parameter.
    spread: Option<Bound>,
}

/// Draws from which the spread of a component is judged.
const SPREAD_DRAWS: usize = 201;
/// Quartiles of a normal distribution lie this many standard deviations apart.
const QUARTILE_RANGE: f64 = 1.349;

impl Component {
    /// Whether anything but its place is estimated.
    fn is_free(&self) -> bool {
        let place = matches!(self.family.parameters[0].name, "mean" | "location");
        self.own.iter().skip(usize::from(place)).any(|b| matches!(b, Bound::Free(_)))
    }

    /// How far apart the values of the component lie, as a standard deviation; `None` for counts, which cannot collapse, and
    /// where its parameters differ between rows and it has no plain spread.
    fn spread(&self, value: &dyn Fn(&Bound) -> f64) -> Option<f64> {
        if self.family.support.is_count() || self.own.is_empty() {
            return None;
        }
        if self.own.len() < self.family.parameters.len() {
            return self.spread.as_ref().map(value);
        }
        let parameters: Vec<f64> = self.own.iter().map(value).collect();
        let amounts = Amounts { exposure: 1.0, trials: 1.0, successes: 0.0, failures: 0.0 };
        // the same stream each time: only the parameters matter
        let mut random = Random::new(1, 0);
        let mut y: Vec<f64> =
            (0..SPREAD_DRAWS).map(|_| (self.family.sample)(&parameters, &amounts, &mut random)).collect();
        y.sort_by(f64::total_cmp);
        Some((y[3 * SPREAD_DRAWS / 4] - y[SPREAD_DRAWS / 4]) / QUARTILE_RANGE)
    }
}

/// Rows that starts are tried on; a likelihood is thinned when it has several times as many.
const THIN_ROWS: usize = 4_096;
/// Rows whose total mass is looked at.
const MASS_ROWS: usize = 100;
/// Fewest rows that a part may keep.
const THIN_PART: usize = 500;

/// Spread below which a component counts as collapsed, as a part of the response's.
const COLLAPSED_SPREAD: f64 = 1e-3;
/// Total responsibility below which it does.
const COLLAPSED_WEIGHT: f64 = 2.0;

impl Mixture {
    #[allow(clippy::type_complexity, reason = "handed over once, by the one caller")]
    pub(super) fn push(
        &mut self,
        components: Vec<(String, &'static Family, Option<Bound>, Vec<Bound>, Option<Bound>)>,
        sd: f64,
    ) {
        let list = components
            .into_iter()
            .map(|(name, family, share, own, spread)| Component { name, family, share, own, spread })
            .collect();
        self.levels.push((list, sd));
    }
}

impl Sample {
    /// Restrictions that the family brings, such as `sum(share.*) = 1`.
    pub fn family_restrictions(&self) -> &[String] {
        &self.equations
    }

    /// Names with known values.
    pub fn known(&self) -> &[(String, f64)] {
        &self.known
    }

    /// The starting point computed from the data and the study.
    pub fn start(&self) -> &Vector {
        &self.start
    }

    /// Expected information by sums and integrals over the responses that could have been.
    fn computed(&self, theta: &[f64]) -> Option<Matrix> {
        let n = self.parameters.len();
        let mut matrix = Matrix::zeros(n, n);
        for part in &self.parts {
            let (e, inputs) = (self.formulas[part.formula].expectation.as_ref()?, part.inputs.as_ref()?);
            if !e.add(part, inputs, theta, &mut matrix) {
                return None;
            }
        }
        Some(matrix)
    }

    /// Operations on blocks and sums of one pass with Hessian, by formula.
    pub fn operations(&self) -> Vec<usize> {
        self.formulas.iter().map(|f| f.hessian.program.operations()).collect()
    }

    fn run(&self, which: Which, theta: &[f64]) -> (f64, Vector, Matrix) {
        let n = self.parameters.len();
        let mut value = 0.0;
        let mut gradient = Vector::zeros(if matches!(which, Which::Value | Which::Ties) { 0 } else { n });
        let second = !matches!(which, Which::Value | Which::Gradient | Which::Ties);
        let mut matrix = if second { Matrix::zeros(n, n) } else { Matrix::zeros(0, 0) };
        let mut tasks = Vec::new();
        for (p, part) in self.parts.iter().enumerate() {
            if let Some(pass) = self.formulas[part.formula].which(which) {
                tasks.extend(part.chunks(pass).into_iter().map(|c| (p, c)));
            }
        }
        let one = |(p, chunk): (usize, std::ops::Range<usize>)| {
            let part = &self.parts[p];
            let sums = self.formulas[part.formula]
                .which(which)
                .map(|pass| part.chunk(pass, theta, chunk, part.knows_kept(which)))
                .unwrap_or_default();
            (p, sums)
        };
        let done: Vec<(usize, Vec<f64>)> = if tasks.len() > 1 {
            tasks.into_par_iter().map(one).collect()
        } else {
            tasks.into_iter().map(one).collect()
        };
        let mut by_part: Vec<Vec<Vec<f64>>> = vec![Vec::new(); self.parts.len()];
        for (p, sums) in done {
            by_part[p].push(sums);
        }
        for (part, sums) in self.parts.iter().zip(by_part) {
            let Some(pass) = self.formulas[part.formula].which(which) else { continue };
            let sums = pairwise(sums, 0);
            part.finish(which, pass, theta, sums, &mut value, gradient.as_mut_slice(), &mut |i, j, x| {
                matrix[(i, j)] += x;
            });
        }
        (value, gradient, matrix)
    }
}

impl LogLikelihood for Sample {
    fn parameters(&self) -> &[Parameter] {
        &self.parameters
    }

    fn coordinates(&self) -> &Coordinates {
        &self.coordinates
    }

    fn evaluate(&self, phi: &Vector, order: Order) -> Evaluation {
        let which = match order {
            Order::Value => Which::Value,
            Order::Gradient => Which::Gradient,
            Order::Hessian => Which::Hessian,
        };
        let (value, gradient, hessian) = self.run(which, phi.as_slice());
        Evaluation { value, gradient, hessian }
    }

    fn information(&self, kind: Information, phi: &Vector) -> Option<Matrix> {
        match kind {
            Information::Expected if !self.expected => None,
            Information::Expected if self.formulas.iter().all(|f| f.expected.is_some()) => {
                Some(self.run(Which::Expected, phi.as_slice()).2)
            }
            Information::Expected => self.computed(phi.as_slice()),
            Information::Outer => Some(self.run(Which::Outer, phi.as_slice()).2),
            _ => None,
        }
    }

    fn tangent(&self, phi: &Vector) -> Option<Tangent> {
        if self.formulas.iter().all(|f| f.tangent.is_none()) {
            return None;
        }
        let mut inside = vec![false; self.parameters.len()];
        for part in &self.parts {
            if let Some((_, variables)) = &self.formulas[part.formula].tangent {
                part.mark(variables, &mut inside);
            }
        }
        Some(Tangent { hessian: self.run(Which::Tangent, phi.as_slice()).2, inside })
    }

    fn weight_total(&self) -> f64 {
        self.weight_total
    }

    fn starts(&self, count: usize, seed: u64) -> Vec<Vector> {
        start::spread(&self.start, &self.parameters, count, seed)
    }

    fn concave(&self) -> bool {
        self.concave
    }

    fn thinned(&self) -> Option<Box<dyn LogLikelihood>> {
        let rows: usize = self.parts.iter().map(Part::rows_count).sum();
        let step = rows / THIN_ROWS;
        if step < 4 || self.parts.iter().any(|p| p.rows_count() / step < THIN_PART) {
            return None;
        }
        Some(Box::new(Sample {
            parameters: self.parameters.clone(),
            known: self.known.clone(),
            coordinates: self.coordinates.clone(),
            formulas: self.formulas.clone(),
            parts: self.parts.iter().map(|p| p.thinned(step)).collect(),
            weight_total: self.weight_total / step as f64,
            start: self.start.clone(),
            concave: self.concave,
            equations: self.equations.clone(),
            mixture: self.mixture.clone(),
            expected: self.expected,
            observed_by_default: self.observed_by_default,
            custom: self.custom,
            cells: self.cells.clone(),
            bins: self.bins.clone(),
        }))
    }

    fn collapsed(&self, phi: &Vector) -> Option<String> {
        let mixture = self.mixture.as_ref()?;
        let at = |b: &Bound| match *b {
            Bound::Free(i) => phi[i],
            Bound::Known(x) => x,
        };
        let mut gradient = None;
        for (components, sd) in &mixture.levels {
            for c in components {
                if !c.own.iter().any(|b| matches!(b, Bound::Free(_))) {
                    continue;
                }
                let spread = c.spread(&at);
                if spread.is_some_and(|s| s < COLLAPSED_SPREAD * sd) {
                    return Some(c.name.clone());
                }
                if let Some(Bound::Free(i)) = c.share {
                    // the responsibilities of a component sum to share * dl / dshare
                    let g = gradient.get_or_insert_with(|| self.run(Which::Gradient, phi.as_slice()).1);
                    if spread.is_some() && c.is_free() && phi[i] * g[i] < COLLAPSED_WEIGHT {
                        return Some(c.name.clone());
                    }
                }
            }
        }
        None
    }

    fn observed_by_default(&self) -> bool {
        self.observed_by_default
    }

    fn mass_error(&self, phi: &Vector) -> Option<f64> {
        if !self.custom {
            return None;
        }
        let mut worst: Option<f64> = None;
        for part in &self.parts {
            let (e, inputs) = (self.formulas[part.formula].expectation.as_ref()?, part.inputs.as_ref()?);
            let found = e.mass(part, inputs, phi.as_slice(), MASS_ROWS);
            worst = Some(worst.map_or(found, |w| if found > w || found.is_nan() { found } else { w }));
        }
        worst
    }

    fn kinked(&self) -> Option<&Sample> {
        self.parts.iter().any(|p| p.raw.is_some()).then_some(self)
    }

    fn kink(&self, phi: &Vector) -> bool {
        self.formulas.iter().any(|f| f.ties.is_some()) && self.run(Which::Ties, phi.as_slice()).0 > 0.0
    }

    fn small_counts(&self, phi: &Vector) -> Option<(usize, usize)> {
        let mut counts: Vec<f64> = Vec::new();
        for (total, shares) in &self.cells {
            counts.extend(shares.iter().map(|b| match *b {
                Bound::Free(i) => total * phi[i],
                Bound::Known(x) => total * x,
            }));
        }
        for (part, total) in self.parts.iter().zip(&self.bins) {
            if let Some(total) = total {
                let log = part.rows(&self.formulas[part.formula].rows, phi.as_slice());
                counts.extend(log.into_iter().map(|l| total * libm::exp(l)));
            }
        }
        (!counts.is_empty()).then(|| (counts.iter().filter(|&&c| c < 5.0).count(), counts.len()))
    }

    fn relabellings(&self) -> Vec<Vec<usize>> {
        let Some(mixture) = &self.mixture else { return Vec::new() };
        let n = self.parameters.len();
        let mut out: Vec<Vec<usize>> = vec![(0..n).collect()];
        for (components, _) in &mixture.levels {
            let index = |b: &Option<Bound>| match b {
                Some(Bound::Free(i)) => Some(*i),
                _ => None,
            };
            // only components of one family with everything free may change places
            let alike: Vec<Vec<usize>> = components
                .iter()
                .filter_map(|c| {
                    let mut all = vec![index(&c.share)?];
                    for b in &c.own {
                        all.push(index(&Some(*b))?);
                    }
                    Some((c.family.name, all))
                })
                .filter(|(family, _)| components.iter().filter(|c| c.family.name == *family).count() > 1)
                .map(|(_, all)| all)
                .collect();
            if alike.len() < 2 || alike.len() > 5 || alike.iter().any(|a| a.len() != alike[0].len()) {
                continue;
            }
            let mut next = Vec::new();
            for order in permutations(alike.len()) {
                let ranges_fit = order.iter().enumerate().all(|(to, &from)| {
                    alike[to]
                        .iter()
                        .zip(&alike[from])
                        .all(|(&a, &b)| self.parameters[a].range == self.parameters[b].range)
                });
                if !ranges_fit {
                    continue;
                }
                for base in &out {
                    let mut p = base.clone();
                    for (to, &from) in order.iter().enumerate() {
                        for (&a, &b) in alike[to].iter().zip(&alike[from]) {
                            p[a] = b;
                        }
                    }
                    next.push(p);
                }
            }
            out = next;
        }
        out.retain(|p| p.iter().enumerate().any(|(i, &j)| i != j));
        out
    }
}

fn permutations(n: usize) -> Vec<Vec<usize>> {
    if n == 0 {
        return vec![Vec::new()];
    }
    let mut out = Vec::new();
    for rest in permutations(n - 1) {
        for at in 0..=rest.len() {
            let mut p = rest.clone();
            p.insert(at, n - 1);
            out.push(p);
        }
    }
    out.sort();
    out
}
