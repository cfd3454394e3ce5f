//! The certificate of a point where a search ended, and the verdict.

use super::confirm::{Fall, falls_as_said, suspects};
use super::degenerate::{Regularity, regularity};
use super::differences::derivatives;
use super::escape::NEGATIVE;
use super::flat::Split;
use super::frame::{Frame, Point, infeasibility};
use super::local::{Local, scale, stack};
use super::manifold::Manifold;
use super::newton::{Ended, Newton};
use super::rank::{Rows, eigen};
use super::{Certificate, Edge, End, Fit, Verdict};
use crate::math::linear::singular_values;
use crate::math::{Matrix, Vector};

/// The contract's gates.
const FEASIBILITY: f64 = 1e-9;
const STATIONARITY: f64 = 1e-7;
const FLAT: f64 = 1e-9;
const DERIVATIVES: f64 = 1e-5;
/// Eigenvalues of the tangent model below this part of its largest are not told from rounding.
const SINGULAR: f64 = 1e-12;

/// d_j = I_jj^-1/2 with I minus the Hessian, 1 where unavailable.
fn contract_scale(newton: &Newton) -> Vector {
    let d = scale(&newton.point);
    Vector::from_fn(d.len(), |j, _| if newton.point.hessian[(j, j)] < 0.0 { d[j] } else { 1.0 })
}

/// Certificate and fit at the point where a search ended. What all starts found is filled in by the caller.
pub(super) fn fit(frame: &Frame, newton: &Newton) -> Fit {
    let d = contract_scale(newton);
    let edges = newton.local.edges();
    // Looks are made at lengths that meant something where the search began, if the scale has run off since.
    let near = Vector::from_fn(frame.n, |j, _| d[j].min(newton.first_scale[j]));
    let regular = regularity(frame, &newton.point, &near, &edges);
    // Redundant rows leave the Jacobian: their multipliers are 0, those of the others solved for.
    let mut point = newton.point.clone();
    for &i in &regular.redundant {
        point.jacobian.row_mut(i).fill(0.0);
    }
    let local = Local::at(frame, &point, d.clone());
    let rows = local.rows(frame, &local.edges());
    let restrictions = Rows::of(&local.j);
    let mut redundant = regular.redundant.clone();
    redundant.extend(
        restrictions.dropped.iter().filter(|i| !regular.redundant.contains(i) && !regular.irregular.contains(i)),
    );
    redundant.sort_unstable();
    let spectrum = local.spectrum(&rows.z);
    // Where curves make parameters nearly exchangeable, as where design columns do: by coordinates in which their tangents
    // are orthogonal.
    let flat = |s: &(Vec<f64>, Matrix)| s.0.first().zip(s.0.last()).is_some_and(|(low, high)| *low <= FLAT * high);
    let turned = spectrum.as_ref().filter(|s| flat(s)).and_then(|_| by_tangents(frame, &newton.point, &local));
    let by_tangents = turned.is_some();
    let spectrum = turned.or(spectrum);
    let on = Manifold {
        frame,
        d: &d,
        kept: rows.kept.iter().copied().filter(|&i| i < frame.m).collect(),
        edges: local.edges(),
    };
    let judged = judge(newton, &local, &regular, spectrum.as_ref(), &on);
    let values = spectrum.as_ref().map(|s| s.0.as_slice()).unwrap_or_default();
    let checked = derivatives(frame, &newton.point, &near);
    let mut notes = judged.notes;
    let mut verdict = judged.verdict;
    let mut reason = judged.reason;
    match checked {
        None => notes.push("the derivatives could not be checked against differences at the answer".into()),
        Some(x) if x > DERIVATIVES && verdict == Verdict::StrictMaximum => {
            verdict = Verdict::Stopped;
            reason = Some(format!("the exact derivatives differ from differences of the log-likelihood by {x:.1e}"));
        }
        Some(_) => {}
    }
    if by_tangents {
        notes.push(
            "the parameters can nearly stand in for one another: the curvature is that in coordinates in which the tangents \
             of the curve are orthogonal"
                .into(),
        );
    }
    if frame.likelihood.kink(&newton.point.phi) {
        notes.push("a kink (a tie of abs, min or max) lies at the answer".into());
    }
    let (flat, identified) = match (&judged.flat, &spectrum) {
        (Some(flat), Some((values, vectors))) => split(frame, &d, &newton.point.theta, flat, values, vectors),
        _ => Default::default(),
    };
    Fit {
        phi: newton.point.phi.clone(),
        theta: newton.point.theta.clone(),
        log_likelihood: newton.point.value,
        multipliers: local.lambda.clone(),
        slope: None,
        edges: named_edges(frame, &local),
        redundant,
        certificate: Certificate {
            verdict,
            reason,
            feasibility: local.infeasibility,
            stationarity: local.stationarity,
            rank: restrictions.kept.len(),
            restrictions: frame.m,
            condition: condition(&stack(frame, &local.j, &d, &local.edges()), &rows),
            curvature_min: values.first().copied(),
            curvature_max: values.last().copied(),
            derivatives: checked.unwrap_or(f64::NAN),
            second_opinion: None,
            iterations: newton.trace.len().saturating_sub(1),
            passes: frame.passes(),
            starts: 1,
            starts_at_best: 1,
            maxima: Vec::new(),
            collapsed: 0,
            flat,
            identified,
            notes,
        },
        trace: newton.trace.clone(),
    }
}

/// Curvatures and their directions (by u) in coordinates in which the tangent model is the identity; `None` where l has
/// none, or it is itself singular to rounding.
fn by_tangents(frame: &Frame, point: &Point, local: &Local) -> Option<(Vec<f64>, Matrix)> {
    if frame.map.is_some() {
        return None;
    }
    let tangent = frame.tangent(&point.phi)?;
    let n = frame.n;
    // What no square contains keeps its own curvature; so little depends on it that coupling is left out.
    let model = Matrix::from_fn(n, n, |a, b| {
        if tangent.inside[a] && tangent.inside[b] {
            -tangent.hessian[(a, b)] * local.d[a] * local.d[b]
        } else if a == b {
            local.w[(a, a)].abs()
        } else {
            0.0
        }
    });
    let (values, vectors) = eigen(&model)?;
    let (low, high) = (*values.first()?, *values.last()?);
    if low <= SINGULAR * high {
        return None;
    }
    let basis = Matrix::from_fn(n, n, |i, k| vectors[(i, k)] / values[k].sqrt());
    let rows = stack(frame, &local.j, &local.d, &local.edges()) * &basis;
    local.spectrum(&(&basis * Rows::of(&rows).z))
}

/// Verdict with what goes with it.
#[derive(Default)]
struct Judged {
    verdict: Verdict,
    reason: Option<String>,
    /// Which eigenvalues are flat.
    flat: Option<Vec<usize>>,
    notes: Vec<String>,
}

impl Judged {
    fn of(verdict: Verdict, reason: String) -> Judged {
        Judged { verdict, reason: Some(reason), ..Judged::default() }
    }
}

/// Next to a closed end that the restrictions lead to, and on which the data have probability zero.
fn impossible(newton: &Newton, frame: &Frame) -> Option<String> {
    let point = &newton.point;
    let at = frame.bounds.iter().find(|b| {
        let room = b.room(&point.theta);
        let near = (1e-9 * newton.first_scale[b.parameter]).max(1e-12 * (b.at.abs() + point.theta.amax()));
        if !b.closed || room == 0.0 || room > near {
            return false;
        }
        let mut theta = point.theta.clone();
        theta[b.parameter] = b.at;
        let met = infeasibility(&frame.equations.sides(&theta)) <= FEASIBILITY;
        met && frame.value(&frame.likelihood.coordinates().phi(&theta)) == f64::NEG_INFINITY
    })?;
    Some(format!(
        "the restrictions lead to `{}` = {}, where the data have probability zero: they contradict the restrictions outright",
        frame.name(at.parameter),
        at.at
    ))
}

fn judge(
    newton: &Newton,
    local: &Local,
    regular: &Regularity,
    spectrum: Option<&(Vec<f64>, Matrix)>,
    on: &Manifold,
) -> Judged {
    let frame = on.frame;
    if let Some(Ended::RanOff(j, end)) = newton.ended {
        return runs_off(newton, frame, j, end);
    }
    if let Some(reason) = impossible(newton, frame) {
        return Judged::of(Verdict::Stopped, reason);
    }
    if let Some(&i) = regular.irregular.first()
        && local.infeasibility <= FEASIBILITY
    {
        let name = frame.equations.name(i);
        return Judged::of(
            Verdict::Irregular,
            format!(
                "the gradient of `{name}` vanishes at this point or depends on the other restrictions', but not nearby, so that \
             multipliers need not exist: write it so that its gradient stays (x = 0 rather than x^2 = 0; two equations \
             rather than curves that touch)"
            ),
        );
    }
    if local.infeasibility > FEASIBILITY && newton.ended == Some(Ended::Limit) {
        return Judged::of(
            Verdict::Stopped,
            format!("the most iterations allowed were made, and {}", missed(frame, newton)),
        );
    }
    if local.infeasibility > FEASIBILITY {
        return Judged::of(
            Verdict::Infeasible,
            format!("the restrictions cannot be met from here: {}", missed(frame, newton)),
        );
    }
    let still = newton.strides_shrink();
    if local.stationarity > STATIONARITY {
        if !still && newton.still_rises() {
            return runs_off(newton, frame, newton.swiftest(), None);
        }
        return Judged::of(
            Verdict::Stopped,
            match newton.ended {
                Some(Ended::Limit) => {
                    "the most iterations allowed were made before the first-order conditions held".into()
                }
                _ => "no step raises the log-likelihood further, yet the first-order conditions do not hold".into(),
            },
        );
    }
    let Some((values, vectors)) = spectrum else {
        return Judged::of(Verdict::Stopped, "the curvature is not finite here".into());
    };
    let largest = values.iter().fold(0.0, |a: f64, v| a.max(v.abs()));
    let Some(&low) = values.first() else {
        return Judged { verdict: Verdict::StrictMaximum, ..Judged::default() };
    };
    if low < -NEGATIVE * largest {
        // far out, where l has all but stopped rising, the curvature that is left is rounding
        if !still {
            return runs_off(newton, frame, newton.swiftest(), None);
        }
        return Judged::of(
            Verdict::Saddle,
            "the log-likelihood curves upwards along a free direction, and following it led nowhere".into(),
        );
    }
    let flat: Vec<usize> = (0..values.len()).filter(|&i| values[i] <= FLAT * largest).collect();
    if !flat.is_empty() {
        if !still && newton.still_rises() {
            return runs_off(newton, frame, newton.swiftest(), None);
        }
        return Judged {
            flat: Some(flat),
            ..Judged::of(Verdict::Flat, "the log-likelihood does not change along a free direction".into())
        };
    }
    match falls_as_said(on, &newton.point, values, vectors) {
        Fall::AsSaid => Judged { verdict: Verdict::StrictMaximum, ..Judged::default() },
        _ if !still => runs_off(newton, frame, newton.swiftest(), None),
        Fall::Untried => Judged {
            verdict: Verdict::StrictMaximum,
            notes: vec![
                "the answer lies so near an end of its range that the fall round it could not be looked at".into(),
            ],
            ..Judged::default()
        },
        Fall::Otherwise => {
            let flat = suspects(on, &newton.point, values, vectors);
            if flat.is_empty() {
                Judged { verdict: Verdict::StrictMaximum, ..Judged::default() }
            } else {
                Judged {
                    flat: Some(flat),
                    ..Judged::of(
                        Verdict::Flat,
                        "the curvature vanishes at the answer along a free direction: no standard error exists there"
                            .into(),
                    )
                }
            }
        }
    }
}

fn runs_off(newton: &Newton, frame: &Frame, j: usize, end: Option<End>) -> Judged {
    let name = frame.name(j);
    let where_to = match end {
        Some(End::Lower) => {
            format!("falls to the open end {} of its range", frame.likelihood.parameters()[j].range.low)
        }
        Some(End::Upper) => {
            format!("rises to the open end {} of its range", frame.likelihood.parameters()[j].range.high)
        }
        None if newton.heading(j) < 0.0 => "falls without end".into(),
        None => "grows without end".into(),
    };
    Judged::of(
        Verdict::Unbounded,
        format!(
            "the log-likelihood keeps rising while `{name}` {where_to}: it has no maximum, or its supremum lies there"
        ),
    )
}

/// The restrictions that are missed, and by how much.
pub(super) fn missed_at(frame: &Frame, theta: &Vector) -> String {
    let Some(sides) = frame.sides(theta) else { return "they are undefined".into() };
    let parts: Vec<String> = sides
        .iter()
        .enumerate()
        .filter(|(_, s)| (s.left - s.right).abs() > FEASIBILITY * (1.0 + s.left.abs() + s.right.abs()))
        .map(|(i, s)| format!("`{}` is missed by {:.6}", frame.equations.name(i), s.left - s.right))
        .collect();
    parts.join(", ")
}

fn missed(frame: &Frame, newton: &Newton) -> String {
    missed_at(frame, &newton.point.theta)
}

fn named_edges(frame: &Frame, local: &Local) -> Vec<Edge> {
    let edge = |&(b, outward): &(usize, f64)| {
        let bound = &frame.bounds[b];
        Edge { parameter: bound.parameter, end: bound.end, multiplier: bound.sign() * outward }
    };
    local.face.iter().map(edge).collect()
}

/// Condition number of the independent rows, each of length one.
pub(super) fn condition(a: &Matrix, rows: &Rows) -> Option<f64> {
    if rows.kept.is_empty() {
        return None;
    }
    let unit = Matrix::from_fn(rows.kept.len(), a.ncols(), |i, k| a[(rows.kept[i], k)] / a.row(rows.kept[i]).norm());
    let values = singular_values(&unit).ok()?;
    Some(values.max() / values.min())
}

fn split(
    frame: &Frame,
    d: &Vector,
    theta: &Vector,
    flat: &[usize],
    values: &[f64],
    vectors: &Matrix,
) -> (Vec<super::Direction>, Vec<super::Direction>) {
    let curved: Vec<usize> = (0..values.len()).filter(|i| !flat.contains(i)).collect();
    let split = Split {
        frame,
        d,
        theta,
        flat: vectors.select_columns(flat),
        curved: vectors.select_columns(&curved),
        values: curved.iter().map(|&i| values[i]).collect(),
    };
    (split.directions(), split.identified())
}

/// The fit where no search could begin: the restrictions are missed at this point, or l is undefined.
pub(super) fn nowhere(frame: &Frame, phi: &Vector, infeasible: bool) -> Fit {
    let theta = frame.theta(phi);
    let (verdict, reason) = if infeasible {
        (
            Verdict::Infeasible,
            format!(
                "the restrictions contradict each other; where they are missed least, {}",
                missed_at(frame, &theta)
            ),
        )
    } else {
        (Verdict::Stopped, "the log-likelihood or a restriction is undefined at every starting point and round it: give a start where it is defined".into())
    };
    let sides = frame.sides(&theta).unwrap_or_default();
    Fit {
        phi: phi.clone(),
        log_likelihood: frame.value(phi),
        multipliers: Vector::zeros(frame.m),
        slope: None,
        edges: Vec::new(),
        redundant: Vec::new(),
        certificate: Certificate {
            verdict,
            reason: Some(reason),
            feasibility: infeasibility(&sides),
            stationarity: f64::NAN,
            rank: 0,
            restrictions: frame.m,
            condition: None,
            curvature_min: None,
            curvature_max: None,
            derivatives: f64::NAN,
            second_opinion: None,
            iterations: 0,
            passes: frame.passes(),
            starts: 0,
            starts_at_best: 0,
            maxima: Vec::new(),
            collapsed: 0,
            flat: Vec::new(),
            identified: Vec::new(),
            notes: Vec::new(),
        },
        theta,
        trace: Vec::new(),
    }
}
