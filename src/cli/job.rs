//! From a study to everything a fit needs: data, likelihood, restrictions, quantities.

use std::time::{Duration, Instant};

use super::status::Stop;
use crate::data::{self, Counts, DataError, Table};
use crate::expr::{ExprError, picture};
use crate::likelihood::{self, LikelihoodError, LogLikelihood, Sample};
use crate::restriction::{Draft, Quantities, RestrictionError, Role, System};
use crate::study::{Places, Shown, Study, names};

/// A study met with its data.
pub struct Job {
    /// The study.
    pub study: Study,
    /// The rows.
    pub table: Table,
    /// The likelihood.
    pub sample: Sample,
    /// All restrictions.
    pub system: System,
    /// What else is wanted.
    pub quantities: Quantities,
    /// Seconds spent reading.
    pub reading: Duration,
    /// Seconds spent preparing.
    pub preparing: Duration,
}

impl Job {
    /// Reads the data and prepares the likelihood and its restrictions. What can be said of the study without its data is
    /// said first.
    pub fn prepare(study: Study) -> Result<Job, Stop> {
        names::grammar(&study).map_err(Stop::study)?;
        let places = &study.places;
        let started = Instant::now();
        let mut request = study.data.request.clone();
        (request.wanted, request.pairs) = likelihood::wanted(&study.model).map_err(|e| of_likelihood(places, &e))?;
        let table = match &study.data.source {
            Some(source) => {
                // Standard input can be read once only.
                let source = source.load()?;
                names::names(&study, &data::names(&source, &request)?).map_err(Stop::study)?;
                data::read(&source, &request).map_err(|e| of_data(places, e))?
            }
            None => {
                names::names(&study, &[]).map_err(Stop::study)?;
                nothing()
            }
        };
        let reading = started.elapsed();
        let started = Instant::now();
        let sample = likelihood::prepare_for(&study.model, &table, study.settings.information)
            .map_err(|e| of_likelihood(places, &e))?;
        if sample.parameters().is_empty() {
            return Err(Stop::study(places.show(
                "model",
                None,
                "every parameter is known, so there is nothing to fit",
                Some("take a known value out; to test it, write it as a restriction under [tested]"),
            )));
        }
        let family = sample.family_restrictions().iter().map(|text| Draft {
            name: None,
            role: Role::Family,
            text: text.clone(),
            place: "model.family".into(),
        });
        let drafts: Vec<Draft> = family.chain(study.restrictions.iter().cloned()).collect();
        let names: Vec<String> = sample.parameters().iter().map(|p| p.name.clone()).collect();
        let mut system = System::compile(&drafts, &names, sample.known()).map_err(|e| of_restriction(&study, &e))?;
        for name in &study.drop {
            system = system.drop(name).map_err(|e| Stop::study(format!("command line, --drop: {e}")))?;
        }
        let wanted: Vec<(String, String, String)> =
            study.quantities.iter().map(|q| (q.name.clone(), q.text.clone(), q.place.clone())).collect();
        let quantities =
            Quantities::compile(&wanted, &names, sample.known()).map_err(|e| of_restriction(&study, &e))?;
        let preparing = started.elapsed();
        Ok(Job { study, table, sample, system, quantities, reading, preparing })
    }
}

/// What a study without data is fitted to: one row of weight 1 without columns.
fn nothing() -> Table {
    Table { rows: 1, counts: Counts { used: 1, ..Counts::default() }, ..Table::default() }
}

fn shown(places: &Places, place: &str, error: &ExprError) -> String {
    places.show(place, Some(error.span), &error.fault.to_string(), error.advice.as_deref()).to_string()
}

/// An expression's fault, in the file where the text stands as it was parsed, else in the text by itself.
fn pointed(places: &Places, place: &str, text: Option<&str>, error: &ExprError) -> String {
    match text {
        None => shown(places, place, error),
        Some(text) => {
            let head = places.show(place, None, &error.fault.to_string(), None);
            let head = Shown { picture: None, ..head };
            format!("{head}\n{}", picture(text, error))
        }
    }
}

fn of_data(places: &Places, error: DataError) -> Stop {
    match &error {
        DataError::Expression { place, error, .. } => Stop::study(shown(places, place, error)),
        _ => error.into(),
    }
}

fn of_likelihood(places: &Places, error: &LikelihoodError) -> Stop {
    match error {
        LikelihoodError::Statement { place, message, advice } => {
            Stop::study(places.show(place, None, message, advice.as_deref()))
        }
        LikelihoodError::Expression { place, error } => Stop::study(shown(places, place, error)),
        LikelihoodError::Data(message) => Stop::data(message),
    }
}

fn of_restriction(study: &Study, error: &RestrictionError) -> Stop {
    let places = &study.places;
    match error {
        RestrictionError::Expression { place, text, error } => {
            let same = study.restrictions.iter().any(|d| d.place == *place && d.text == *text)
                || study.quantities.iter().any(|q| q.place == *place && q.text == *text);
            Stop::study(pointed(places, place, (!same).then_some(text), error))
        }
        RestrictionError::Contradiction { place, name, equation, gap } => Stop::study(places.show(
            place,
            None,
            &format!(
                "{name} contradicts itself: in {equation} left minus right is {gap} whatever the free parameters are"
            ),
            Some("correct it, or leave it out"),
        )),
        RestrictionError::Jumps { place, name, equation } => Stop::study(places.show(
            place,
            None,
            &format!("{name} changes in jumps only ({equation}), and a restriction must change smoothly"),
            Some("write what is compared as an equation"),
        )),
        other => Stop::study(other),
    }
}
