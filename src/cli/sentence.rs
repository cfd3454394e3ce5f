//! The model in one sentence.

use crate::family::Composite;
use crate::family::composite::Reads;
use crate::likelihood::Model;
use crate::likelihood::model::{Amount, Component, Form, Response, Setting};

/// `flaws: poisson with rate by kiln, soak and kiln x soak, exposure area`.
pub fn sentence(model: &Model) -> String {
    let mut out = match &model.response {
        Response::None => format!("a {} density", model.family),
        Response::Column(column) => format!("{column}: {}", model.family),
        Response::Ends { lower, upper } => format!("a response between {lower} and {upper}: {}", model.family),
        Response::Several(columns) => match Composite::named(&model.family).map(|f| f.reads) {
            Some(Reads::Labels) => format!("{}: {}", columns.join(" x "), model.family),
            Some(Reads::Contest) => format!("{}: {}", columns.join(" against "), model.family),
            _ => format!("{}: {}", list(columns), model.family),
        },
    };
    if !model.components.is_empty() {
        let parts: Vec<String> = model.components.iter().map(component).collect();
        out += &format!(" of {}", list(&parts));
    }
    let parts: Vec<String> = model.parameters.iter().filter_map(setting).collect();
    if !parts.is_empty() {
        out += &format!(" with {}", list(&parts));
    }
    let amount = |amount: &Option<Amount>, what: &str| match amount {
        Some(Amount::Column(column)) => format!(", {what} {column}"),
        Some(Amount::Number(n)) => format!(", {what} {n}"),
        None => String::new(),
    };
    out += &amount(&model.trials, "trials");
    out += &amount(&model.successes, "successes");
    out += &amount(&model.failures, "failures");
    if model.above.is_some() || model.below.is_some() {
        out += ", conditioned on being recorded";
        out += &amount(&model.above, "above");
        out += &amount(&model.below, "below");
    }
    if let Some(column) = &model.exposure {
        out += &format!(", exposure {column}");
    }
    if let Some(event) = &model.event {
        out += &match &event.seen {
            Some(label) => format!(", right-censored unless {} is {label}", event.column),
            None => format!(", right-censored unless {} is 1", event.column),
        };
    }
    if let Some(column) = &model.per {
        out += &format!(", one set of parameters for each {column}");
    }
    out
}

fn component(component: &Component) -> String {
    let parts: Vec<String> = component.parameters.iter().filter_map(setting).collect();
    let with = if parts.is_empty() { String::new() } else { format!(" with {}", list(&parts)) };
    format!("{} ({}{with})", component.name, component.family)
}

fn setting(setting: &Setting) -> Option<String> {
    match &setting.form {
        Form::Plain => None,
        Form::Curve(text) => Some(format!("{} = {}", setting.name, text.trim())),
        Form::Terms(terms) if terms.terms.is_empty() => Some(format!("{} the same in every row", setting.name)),
        Form::Terms(terms) => {
            let names: Vec<String> = terms.terms.iter().map(|t| t.join(" x ")).collect();
            let mut out = format!("{} by {}", setting.name, list(&names));
            if let Some(offset) = &terms.offset {
                out += &format!(" plus the offset {offset}");
            }
            Some(out)
        }
    }
}

/// `a, b and c`.
pub fn list<T: AsRef<str>>(words: &[T]) -> String {
    let words: Vec<&str> = words.iter().map(AsRef::as_ref).collect();
    match words.as_slice() {
        [] => String::new(),
        [one] => (*one).to_owned(),
        [first @ .., last] => format!("{} and {last}", first.join(", ")),
    }
}

#[cfg(test)]
mod tests {
    use super::sentence;
    use crate::study::{Overlay, Study};

    #[test]
    fn models_read_as_sentences() {
        let said = |text: &str| {
            let study = Study::from_text(text, "s", Default::default(), &Overlay::default()).unwrap();
            sentence(&study.model)
        };
        assert_eq!(
            said(
                "[model]\nfamily='poisson'\nresponse='flaws'\nexposure='area'\n[model.rate]\nterms=['kiln','soak',['kiln','soak']]"
            ),
            "flaws: poisson with rate by kiln, soak and kiln x soak, exposure area"
        );
        assert_eq!(
            said(
                "[model]\nfamily='mixture'\nresponse_lower='a'\nresponse_upper='b'\n[[model.component]]\nname='n'\nfamily='normal'\n\
                 [[model.component]]\nname='m'\nfamily='normal'"
            ),
            "a response between a and b: mixture of n (normal) and m (normal)"
        );
        assert_eq!(said("[model]\nfamily='custom'\nlog_density='-a^2'\na={start=1}"), "a custom density");
    }
}
