//! `guyline fit`.

use std::time::Instant;

use super::arguments::Fit;
use super::job::Job;
use super::output::{deliver, say, whole, writable};
use super::sentence::sentence;
use super::status::{Status, Stop};
use crate::infer::{self, Outcome};
use crate::likelihood::{self, LogLikelihood};
use crate::report::number::exact;
use crate::report::{self, DataFacts, Document, ModelFacts, Named};
use crate::restriction::Role;
use crate::solve::{Search, Step, Verdict};
use crate::study::{Format, Settings, Study};

/// Runs the command.
pub fn run(arguments: &Fit) -> Result<Status, Stop> {
    let study = Study::read(arguments.study.study.as_deref(), &arguments.overlay())?;
    let settings = study.settings.clone();
    gate_can_be_read(&study)?;
    threads(&settings);
    let job = Job::prepare(study)?;
    gate_has_a_hypothesis(&settings, &job)?;
    for path in [&settings.output, &settings.trace].into_iter().flatten() {
        writable(path)?;
    }
    let started = Instant::now();
    let options = infer::Options {
        information: settings.information,
        tests: settings.tests,
        confidence: settings.confidence,
        search: Search { starts: settings.starts, seed: settings.seed, ..Search::default() },
        ..infer::Options::default()
    };
    let outcome = infer::run(&job.sample, &job.system, &job.quantities, &options).map_err(Stop::study)?;
    let fitting = started.elapsed();
    if let Some(path) = &settings.trace {
        whole(path, &trace(&outcome.restricted.fit.trace))?;
    }
    if settings.timings {
        let passes = outcome.restricted.fit.certificate.passes
            + outcome.unrestricted.as_ref().map_or(0, |b| b.fit.certificate.passes);
        say(&format!(
            "reading {:.3} s, preparing {:.3} s, fitting {:.3} s, {passes} passes over the data",
            job.reading.as_secs_f64(),
            job.preparing.as_secs_f64(),
            fitting.as_secs_f64()
        ));
    }
    let document = document(&job, outcome);
    let answer = match settings.format {
        Format::Text => report::text::render(&document),
        Format::Json => report::json::render(&document),
        Format::Csv => report::csv::render(std::slice::from_ref(&document)),
    };
    deliver(&answer, settings.output.as_deref())?;
    let (status, why) = verdict(&document.outcome, settings.gate);
    if let (Some(why), false) = (why, settings.quiet) {
        say(&why);
    }
    Ok(status)
}

/// A gate without anything to read is refused before the data are.
fn gate_can_be_read(study: &Study) -> Result<(), Stop> {
    if study.settings.gate.is_some() && study.count(Role::Tested) == 0 {
        let shown = study.places.show(
            "options.gate",
            None,
            "the gate reads the test of the restrictions, and no tested restriction is left",
            Some("add one under [tested] or by --tested, or take the gate out"),
        );
        return Err(Stop::study(shown));
    }
    Ok(())
}

/// The same once links of chains are dropped.
fn gate_has_a_hypothesis(settings: &Settings, job: &Job) -> Result<(), Stop> {
    if settings.gate.is_some() && !job.system.items().iter().any(|r| r.role == Role::Tested) {
        return Err(Stop::study("command line, --drop: no tested restriction is left for the gate to read"));
    }
    Ok(())
}

/// Sets the number of threads; the answer does not depend on it, so that failing to is no fault.
fn threads(settings: &Settings) {
    if let Some(n) = settings.threads {
        likelihood::threads(n);
    }
}

fn document(job: &Job, outcome: Outcome) -> Document {
    let (table, study) = (&job.table, &job.study);
    let some = |text: &str| (!text.is_empty()).then(|| text.to_owned());
    Document {
        group: None,
        data: DataFacts {
            file: some(&table.file),
            sha256: some(&table.sha256),
            rows_read: table.counts.read,
            rows_used: table.counts.used,
            rows_dropped: table.counts.dropped_missing + table.counts.dropped_only,
            weight_total: job.sample.weight_total(),
        },
        model: ModelFacts {
            title: study.title.clone(),
            family: study.model.family.clone(),
            parameters: job
                .sample
                .parameters()
                .iter()
                .map(|p| Named { name: p.name.clone(), meaning: p.meaning.clone() })
                .collect(),
            sentence: sentence(&study.model),
        },
        outcome,
    }
}

fn trace(steps: &[Step]) -> String {
    let mut out = String::from("iteration,log_likelihood,feasibility,stationarity,length,shift\n");
    for s in steps {
        let figures = [s.log_likelihood, s.feasibility, s.stationarity, s.length, s.shift].map(exact);
        out += &format!("{},{}\n", s.iteration, figures.join(","));
    }
    out
}

/// The status a fit ends with, and what is said about it.
fn verdict(outcome: &Outcome, gate: Option<f64>) -> (Status, Option<String>) {
    let certificate = &outcome.restricted.fit.certificate;
    if certificate.verdict != Verdict::StrictMaximum {
        let reason = certificate.reason.as_deref().unwrap_or("the certificate says more");
        return (
            Status::NoMaximum,
            Some(format!("no trustworthy restricted maximum: {}: {reason}", certificate.verdict.text())),
        );
    }
    match (gate, &outcome.score) {
        (None, _) => (Status::Done, None),
        (Some(_), Err(reason)) => (Status::NoMaximum, Some(format!("the gate has no p to read: {reason}"))),
        (Some(alpha), Ok(test)) if test.p < alpha => {
            (Status::Closed, Some(format!("the gate is closed: score p {:.3e} is below {alpha}", test.p)))
        }
        (Some(_), Ok(_)) => (Status::Done, None),
    }
}
