//! The result as JSON: fixed order of keys, full precision, every null with its reason.

use super::Document;
use super::object::{Object, lay_out};
use crate::infer::{Block, Estimate, Multiplier, Outcome, Role, Test};
use crate::solve::{Direction, End, Verdict};
use serde_json::{Map, Value};

/// Wide enough for an estimate, with all its digits, to stand on one line.
const WIDTH: usize = 260;

/// One document, laid out over several lines.
pub fn render(document: &Document) -> String {
    lay_out(&value(document), WIDTH)
}

/// One document on one line, for many fits by group.
pub fn line(document: &Document) -> String {
    value(document).to_string() + "\n"
}

/// The document as a JSON value; its schema is [`super::FIT_SCHEMA`].
pub fn value(document: &Document) -> Value {
    let Document { group, data, model, outcome } = document;
    let text = |x: &Option<String>| x.clone().ok_or("there are no data");
    let data = Object::new()
        .maybe("file", text(&data.file))
        .maybe("sha256", text(&data.sha256))
        .put("rows_read", data.rows_read)
        .put("rows_used", data.rows_used)
        .put("rows_dropped", data.rows_dropped)
        .number("weight_total", data.weight_total)
        .done();
    let names: Vec<&str> = model.parameters.iter().map(|p| p.name.as_str()).collect();
    let model_object = Object::new()
        .put("family", model.family.as_str())
        .put("parameters", names.len())
        .put("information", outcome.information.text())
        .done();
    let of_group = group.as_ref().ok_or("one fit to all rows").map(|pairs| {
        let pairs = pairs.iter().map(|(column, label)| (column.clone(), Value::from(label.as_str())));
        Value::Object(pairs.collect::<Map<_, _>>())
    });
    let warning =
        |w: &crate::infer::Warning| Object::new().put("code", w.code).put("message", w.message.as_str()).done();
    Object::new()
        .put("schema", "guyline.fit/1")
        .put("version", env!("CARGO_PKG_VERSION"))
        .put("title", model.title.as_str())
        .maybe("group", of_group)
        .put("data", data)
        .put("model", model_object)
        .put("restricted", block(&outcome.restricted, &names))
        .maybe("unrestricted", outcome.unrestricted.as_ref().map(|b| block(b, &names)).map_err(String::as_str))
        .put("tests", tests(outcome))
        .put("warnings", outcome.warnings.iter().map(warning).collect::<Vec<_>>())
        .done()
}

fn tests(outcome: &Outcome) -> Value {
    let plain = |test: &Test| {
        let log = if test.log10_p == 0.0 { 0.0 } else { test.log10_p };
        Object::new()
            .number("chi_square", test.chi_square)
            .put("df", test.df)
            .number("p", test.p)
            .number("log10_p", log)
    };
    let score = |test: &Test| plain(test).put("information", outcome.information.text()).done();
    Object::new()
        .maybe("score", outcome.score.as_ref().map(score).map_err(String::as_str))
        .maybe("lr", outcome.lr.as_ref().map(|t| plain(t).done()).map_err(String::as_str))
        .maybe("wald", outcome.wald.as_ref().map(|t| plain(t).done()).map_err(String::as_str))
        .maybe("bootstrap", Err::<Value, _>("this version makes none"))
        .done()
}

fn block(block: &Block, names: &[&str]) -> Value {
    let reason = block.reason.as_deref().unwrap_or("not available");
    let covariance = block.covariance.as_ref().ok_or(reason).map(|matrix| {
        let row = |i: usize| matrix.row(i).iter().copied().collect::<Vec<f64>>();
        (0..matrix.nrows()).map(row).collect::<Vec<_>>()
    });
    Object::new()
        .number("log_likelihood", block.fit.log_likelihood)
        .put("estimates", block.estimates.iter().map(|e| estimate(e, reason, true)).collect::<Vec<_>>())
        .maybe("covariance", covariance)
        .put("quantities", block.quantities.iter().map(|e| estimate(e, reason, false)).collect::<Vec<_>>())
        .put("multipliers", block.multipliers.iter().map(|m| multiplier(m, reason)).collect::<Vec<_>>())
        .put("certificate", certificate(block, names))
        .done()
}

fn estimate(e: &Estimate, reason: &str, edge: bool) -> Value {
    let object = Object::new()
        .put("name", e.name.as_str())
        .number("value", e.value)
        .figure("se", e.se, reason)
        .figure("lower", e.lower, reason)
        .figure("upper", e.upper, reason);
    let object = if edge { object.maybe("edge", e.edge.map(end).ok_or("inside its range")) } else { object };
    object.done()
}

fn end(end: End) -> &'static str {
    match end {
        End::Lower => "lower",
        End::Upper => "upper",
    }
}

fn multiplier(m: &Multiplier, block_reason: &str) -> Value {
    let role = match m.role {
        Role::Family => "family",
        Role::Maintained => "maintained",
        Role::Tested => "tested",
    };
    let reason = m.reason.as_deref().unwrap_or(block_reason);
    let z_reason = if m.se == Some(0.0) { "the standard error is 0" } else { reason };
    Object::new()
        .put("name", m.name.as_str())
        .put("role", role)
        .put("equation", m.equation.as_str())
        .figure("value", m.value, reason)
        .figure("se", m.se, reason)
        .figure("z", m.z, z_reason)
        .figure("p", m.p, z_reason)
        .figure("gap", m.gap, m.gap_reason.as_deref().unwrap_or("no unrestricted estimate"))
        .done()
}

fn direction(d: &Direction, names: &[&str]) -> Value {
    let name = |j: usize| names.get(j).copied().unwrap_or("?").to_string();
    let weights: Map<String, Value> = d.weights.iter().map(|&(j, w)| (name(j), Value::from(w))).collect();
    Object::new().put("weights", weights).number("value", d.value).figure("se", d.se, "not identified").done()
}

fn certificate(block: &Block, names: &[&str]) -> Value {
    let c = &block.fit.certificate;
    let edges = block.fit.edges.iter().map(|e| {
        let name = names.get(e.parameter).copied().unwrap_or("?");
        Object::new().put("name", name).put("edge", end(e.end)).number("multiplier", e.multiplier).done()
    });
    let point = if c.verdict == Verdict::StrictMaximum {
        Err("the verdict is a strict maximum: see the estimates")
    } else {
        let point = names.iter().zip(block.fit.theta.iter());
        Ok(point.fold(Object::new(), |object, (name, &x)| object.number(name, x)).done())
    };
    let mut notes: Vec<&str> = c.reason.iter().map(String::as_str).collect();
    notes.extend(c.notes.iter().map(String::as_str));
    let no_direction = "no direction is left free, or curvature could not be computed";
    Object::new()
        .put("verdict", c.verdict.text())
        .number("feasibility", c.feasibility)
        .number("stationarity", c.stationarity)
        .put("rank", c.rank)
        .put("restrictions", c.restrictions)
        .figure("condition", c.condition, "there are no restrictions")
        .figure("curvature_min", c.curvature_min, no_direction)
        .figure("curvature_max", c.curvature_max, no_direction)
        .put("edges", edges.collect::<Vec<_>>())
        .number("derivatives", c.derivatives)
        .maybe("second_opinion", c.second_opinion.ok_or("not asked for"))
        .put("iterations", c.iterations)
        .put("passes", c.passes)
        .put("starts", c.starts)
        .put("starts_at_best", c.starts_at_best)
        .put("maxima", c.maxima.iter().copied().filter(|x| x.is_finite()).collect::<Vec<_>>())
        .maybe("point", point)
        .put("flat", c.flat.iter().map(|d| direction(d, names)).collect::<Vec<_>>())
        .put("identified", c.identified.iter().map(|d| direction(d, names)).collect::<Vec<_>>())
        .put("notes", notes)
        .done()
}
