//! `guyline check`: what would be fitted, in words.

use super::arguments::Check;
use super::columns::{made_from, uses};
use super::job::Job;
use super::mistakes;
use super::output::deliver;
use super::sentence::{list, sentence};
use super::status::{Status, Stop};
use crate::data::{Table, Values};
use crate::likelihood::{Information, LogLikelihood, Order};
use crate::math::Vector;
use crate::report::number::{count, short};
use crate::report::words::wrap;
use crate::restriction::Role;
use crate::study::Study;

/// Runs the command.
pub fn run(arguments: &Check) -> Result<Status, Stop> {
    let study = Study::read(arguments.study.study.as_deref(), &arguments.study.overlay())?;
    let job = Job::prepare(study)?;
    deliver(&words(&job), None)?;
    Ok(Status::Done)
}

fn words(job: &Job) -> String {
    let start = job.sample.starts(1, job.study.settings.seed).into_iter().next().unwrap_or_else(|| Vector::zeros(0));
    let mut parts = vec![fitted(job), columns(job), parameters(job, &start), restrictions(job)];
    parts.push(inference(job, &start));
    parts.push(mistakes(job, &start));
    parts.retain(|p| !p.is_empty());
    parts.join("\n")
}

fn fitted(job: &Job) -> String {
    let (study, table) = (&job.study, &job.table);
    let mut out = String::new();
    if !study.title.is_empty() {
        out += &wrap(&study.title, 0, false);
        out += "\n";
    }
    out += "What would be fitted?\n";
    out += &wrap(&format!("{}.", sentence(&study.model)), 2, true);
    out += &wrap(&rows(study, table, job.sample.weight_total()), 2, true);
    out
}

fn rows(study: &Study, table: &Table, weight: f64) -> String {
    let Some(source) = &study.data.source else { return "There are no data: one row of weight 1.".into() };
    let file = match source.shown() {
        "-" => "standard input",
        name => name,
    };
    let c = &table.counts;
    let mut out = format!("{} of {file}", count(c.used, "row"));
    let mut left = Vec::new();
    if c.dropped_only > 0 {
        left.push(format!("{} left out by only", c.dropped_only));
    }
    if c.dropped_missing > 0 {
        left.push(format!("{} left out for a missing cell", c.dropped_missing));
    }
    if c.weightless > 0 {
        left.push(format!("{} of weight 0", c.weightless));
    }
    if !left.is_empty() {
        out += &format!(" ({} read, {})", c.read, list(&left));
    }
    if weight != c.used as f64 {
        out += &format!(", total weight {}", short(weight, 7));
    }
    out + "."
}

fn columns(job: &Job) -> String {
    if job.table.columns.is_empty() {
        return String::new();
    }
    let mut out = String::from("Which columns does it use, and for what?\n");
    for column in &job.table.columns {
        let uses = uses(&job.study, &column.name);
        let mut line = format!("{}: {}", column.name, if uses.is_empty() { "in use".into() } else { list(&uses) });
        if let Some(text) = made_from(&job.study, &column.name) {
            line += &format!("; made as {}", text.trim());
        }
        line += &match &column.values {
            Values::Category { levels, .. } if levels.len() <= 12 => format!("; labels {}", list(levels)),
            Values::Category { levels, .. } => format!("; {} labels, the first being {}", levels.len(), levels[0]),
            Values::Number(values) => span(values),
        };
        out += &wrap(&line, 2, true);
    }
    out
}

fn span(values: &[f64]) -> String {
    let finite = || values.iter().copied().filter(|v| v.is_finite());
    let (low, high) = (finite().fold(f64::INFINITY, f64::min), finite().fold(f64::NEG_INFINITY, f64::max));
    let open = values.len() - finite().count();
    let open = if open > 0 { format!(", {} open", count(open, "end")) } else { String::new() };
    if low > high {
        format!("; no finite number{open}")
    } else {
        format!("; from {} to {}{open}", short(low, 6), short(high, 6))
    }
}

fn parameters(job: &Job, start: &Vector) -> String {
    let mut out = String::from("Which parameters are there?\n");
    for (i, p) in job.sample.parameters().iter().enumerate() {
        let start = start.get(i).map_or(String::new(), |v| format!(", starts at {}", short(*v, 5)));
        let meaning = if p.meaning.is_empty() { String::new() } else { format!(": {}", p.meaning) };
        out += &wrap(&format!("{}{meaning}; in {}{start}", p.name, p.range), 2, true);
    }
    for (name, value) in job.sample.known() {
        out += &wrap(&format!("{name} is known: {value}"), 2, true);
    }
    out
}

fn restrictions(job: &Job) -> String {
    let items = job.system.items();
    if items.is_empty() {
        return String::new();
    }
    let mut out = String::new();
    let held: Vec<_> = items.iter().filter(|r| r.role != Role::Tested).collect();
    let tested: Vec<_> = items.iter().filter(|r| r.role == Role::Tested).collect();
    if !held.is_empty() {
        out += "What would always be imposed?\n";
    }
    for r in held {
        let by = if r.role == Role::Family { " (brought by the family)" } else { "" };
        out += &wrap(&format!("{}: {}{by}", r.name, r.equation), 2, true);
    }
    if !tested.is_empty() {
        out += if out.is_empty() { "" } else { "\n" };
        out += "What would be put to the test?\n";
    }
    for r in tested {
        out += &wrap(&format!("{}: {}", r.name, r.equation), 2, true);
    }
    out
}

fn inference(job: &Job, start: &Vector) -> String {
    let phi = job.sample.coordinates().phi(start);
    let l = job.sample.evaluate(&phi, Order::Value).value;
    let expected = !job.sample.observed_by_default() && job.sample.information(Information::Expected, &phi).is_some();
    let default = if expected { Information::Expected } else { Information::Observed };
    let mut out = String::from("How would it be judged?\n");
    let information = match job.study.settings.information {
        Some(asked) => format!("Standard errors and tests would use {} information, as asked.", asked.text()),
        None => format!("Standard errors and tests would use {} information.", default.text()),
    };
    out += &wrap(&information, 2, true);
    let at = if l.is_finite() {
        format!("The log-likelihood at the start is {}.", short(l, 9))
    } else {
        "The log-likelihood cannot be computed at the start: give starting values at which it can.".into()
    };
    out += &wrap(&at, 2, true);
    out
}

fn mistakes(job: &Job, start: &Vector) -> String {
    let mut found = mistakes::of_data(&job.study, &job.table);
    found.extend(mistakes::of_restrictions(&job.system, &job.sample, start));
    let mut out = String::from("Is there anything to look at again?\n");
    if found.is_empty() {
        out += "  None of the usual mistakes was found.\n";
    }
    for sentence in found {
        out += &wrap(&format!("{sentence}."), 2, true);
    }
    out
}
