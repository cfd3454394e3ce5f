//! Which columns a model uses, what they must hold, and whether the names in its expressions stand for anything.

use super::Study;
use super::place::Places;
use super::source::Shown;
use crate::data::{Pair, Sort, Wanted};
use crate::expr::{ExprError, nearest, parse_condition, parse_equation, parse_expression};
use crate::family::listing;
use crate::family::{Family, Support};
use crate::likelihood::Model;
use crate::likelihood::model::{Amount, Form, Response};

/// The columns a model uses, and what must hold between them.
pub fn wanted(study: &Study) -> (Vec<Wanted>, Vec<Pair>) {
    let model = &study.model;
    let (mut out, mut pairs) = (Vec::new(), Vec::new());
    let mut want = |name: &str, sort| out.push(Wanted::new(name, sort));
    match &model.response {
        Response::None => {}
        Response::Column(name) => want(name, response_sort(model)),
        Response::Ends { lower, upper } => {
            want(lower, Sort::LowerEnd);
            want(upper, Sort::UpperEnd);
            pairs.push(Pair::Ends { lower: lower.clone(), upper: upper.clone() });
        }
        Response::Labels(names) => names.iter().for_each(|n| want(n, Sort::Category)),
    }
    let trials = std::iter::once(&model.trials).chain(model.components.iter().map(|c| &c.trials));
    for amount in trials.flatten() {
        match (amount, &model.response) {
            (Amount::Column(name), response) => {
                want(name, Sort::Count);
                if let Response::Column(count) = response {
                    pairs.push(Pair::AtMost { count: count.clone(), trials: name.clone() });
                }
            }
            (Amount::Number(n), Response::Column(count)) if model.components.is_empty() => {
                want(count, Sort::CountUpTo(*n));
            }
            (Amount::Number(_), _) => {}
        }
    }
    if let (Some(Support::CountOfTrials), None, Response::Column(name)) =
        (Family::named(&model.family).map(|f| f.support), &model.trials, &model.response)
    {
        want(name, Sort::ZeroOne);
    }
    let exposures = std::iter::once(&model.exposure).chain(model.components.iter().map(|c| &c.exposure));
    exposures.flatten().for_each(|name| want(name, Sort::Positive));
    if let Some(event) = &model.event {
        want(&event.column, if event.seen.is_some() { Sort::Category } else { Sort::ZeroOne });
    }
    if let Some(name) = &model.per {
        want(name, Sort::Category);
    }
    for setting in &model.parameters {
        let Form::Terms(terms) = &setting.form else { continue };
        terms.terms.iter().flatten().for_each(|name| want(name, Sort::Either));
        if let Some(text) = terms.offset.as_deref().filter(|t| parse_expression(t).is_err()) {
            want(text, Sort::Number);
        }
    }
    let own = own_names(model);
    for (_, text) in texts(model) {
        let Ok(ast) = parse_expression(&text) else { continue };
        for (name, _) in ast.names() {
            if let Some(column) = name.as_single().filter(|c| !own.iter().any(|o| o == c)) {
                want(column, Sort::Either);
            }
        }
    }
    (out, pairs)
}

fn response_sort(model: &Model) -> Sort {
    let of = |family: &str| match Family::named(family).map(|f| f.support) {
        Some(Support::Nonnegative) => Sort::Nonnegative,
        Some(Support::Count | Support::CountOfTrials) => Sort::Count,
        Some(Support::Real) | None => Sort::Number,
    };
    match model.family.as_str() {
        "categorical" => Sort::Category,
        "mixture" => {
            // What one component cannot give another may.
            let mut sorts = model.components.iter().map(|c| of(&c.family));
            let first = sorts.next().unwrap_or(Sort::Number);
            if sorts.all(|s| s == first) { first } else { Sort::Number }
        }
        family => of(family),
    }
}

/// Names in expressions that are no columns: parameters, pieces of `[model.let]`, row parameters of the family.
fn own_names(model: &Model) -> Vec<String> {
    let mut own: Vec<String> = model.parameters.iter().map(|s| s.name.trim_matches('"').to_owned()).collect();
    own.extend(model.lets.iter().map(|l| l.0.clone()));
    if let Some(family) = Family::named(&model.family) {
        own.extend(family.parameters.iter().map(|p| p.name.to_owned()));
    }
    own
}

/// All expressions of a model over columns, with their places.
fn texts(model: &Model) -> Vec<(String, String)> {
    let mut out = Vec::new();
    if let Some(text) = &model.log_density {
        out.push(("model.log_density".to_owned(), text.clone()));
    }
    out.extend(model.lets.iter().map(|(name, text)| (format!("model.let.{name}"), text.clone())));
    for setting in &model.parameters {
        let place = format!("model.{}", setting.name.replace(['"', '\''], ""));
        match &setting.form {
            Form::Curve(text) => out.push((format!("{place}.curve"), text.clone())),
            Form::Terms(terms) => {
                if let Some(text) = terms.offset.as_ref().filter(|t| parse_expression(t).is_ok()) {
                    out.push((format!("{place}.offset"), text.clone()));
                }
            }
            Form::Plain => {}
        }
    }
    out
}

/// What can be said against a study before its data are read: families, and texts that break the grammar.
///
/// # Errors
/// The first fault, as a reader sees it.
pub fn grammar(study: &Study) -> Result<(), Shown> {
    let (places, model) = (&study.places, &study.model);
    let families: Vec<String> = listing::all().into_iter().map(|f| f.name).collect();
    family(places, "model.family", &model.family, &families)?;
    for (i, component) in model.components.iter().enumerate() {
        let univariate: Vec<String> = families.iter().filter(|f| Family::named(f).is_some()).cloned().collect();
        family(places, &format!("model.component.{i}.family"), &component.family, &univariate)?;
    }
    let wrong =
        |place: &str, e: ExprError| Err(places.show(place, Some(e.span), &e.fault.to_string(), e.advice.as_deref()));
    for (place, text) in texts(model) {
        parse_expression(&text).map(|_| ()).or_else(|e| wrong(&place, e))?;
    }
    for (name, text) in &study.data.request.derive {
        parse_expression(text).map(|_| ()).or_else(|e| wrong(&format!("data.derive.{name}"), e))?;
    }
    if let Some(text) = &study.data.request.only {
        parse_condition(text).map(|_| ()).or_else(|e| wrong("data.only", e))?;
    }
    for draft in &study.restrictions {
        parse_equation(&draft.text).map(|_| ()).or_else(|e| wrong(&draft.place, e))?;
    }
    for quantity in &study.quantities {
        parse_expression(&quantity.text).map(|_| ()).or_else(|e| wrong(&quantity.place, e))?;
    }
    Ok(())
}

fn family(places: &Places, place: &str, name: &str, families: &[String]) -> Result<(), Shown> {
    if families.iter().any(|f| f == name) {
        return Ok(());
    }
    let advice = match nearest(name, families.iter().map(String::as_str)) {
        Some(near) => format!("nearest name: {near}"),
        None => format!("this version has {}", families.join(", ")),
    };
    Err(places.show(place, None, &format!("no family is called {name}"), Some(&advice)))
}

/// Refuses a name in an expression of the model that is no column of the file, made of none, and nothing of the model's:
/// a parameter misspelt is the study's fault, not the data's.
///
/// # Errors
/// The first such name, with the nearest one that exists.
pub fn stray_names(study: &Study, header: &[String]) -> Result<(), Shown> {
    let request = &study.data.request;
    let mut known = own_names(&study.model);
    known.extend(header.iter().cloned());
    known.extend(request.derive.iter().map(|d| d.0.clone()));
    known.extend(request.unfold.iter().flat_map(|u| [u.label.clone(), u.value.clone()]));
    for (place, text) in texts(&study.model) {
        let Ok(ast) = parse_expression(&text) else { continue };
        for (name, span) in ast.names() {
            let Some(single) = name.as_single().filter(|s| !known.iter().any(|k| k == s)) else { continue };
            let advice = match nearest(single, known.iter().map(String::as_str)) {
                Some(near) => format!("nearest name: {near}"),
                None => format!("a new parameter needs a table, such as {single} = {{ start = 1 }} under [model]"),
            };
            let message = format!("no column, parameter or piece is called {single}");
            return Err(study.places.show(&place, Some(span), &message, Some(&advice)));
        }
    }
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::study::Overlay;

    fn study(text: &str) -> Study {
        Study::from_text(text, "s", Default::default(), &Overlay::default()).unwrap()
    }

    fn sorts(text: &str) -> Vec<(String, Sort)> {
        wanted(&study(text)).0.into_iter().map(|w| (w.name, w.sort)).collect()
    }

    #[test]
    fn each_use_has_its_demand() {
        let all = sorts(
            "[data]\nfile='a'\n[model]\nfamily='poisson'\nresponse='n'\nexposure='area'\nper='kiln'\n[model.rate]\nterms=['x',['x','k']]\noffset='log(z)'\n",
        );
        let want = |name: &str, sort: Sort| assert!(all.contains(&(name.to_owned(), sort)), "{name} {all:?}");
        want("n", Sort::Count);
        want("area", Sort::Positive);
        want("kiln", Sort::Category);
        want("k", Sort::Either);
        want("z", Sort::Either);
        let binary = sorts("[data]\nfile='a'\n[model]\nfamily='binomial'\nresponse='y'\n");
        assert!(binary.contains(&("y".to_owned(), Sort::ZeroOne)));
        let custom = sorts(
            "[data]\nfile='a'\n[model]\nfamily='custom'\nlog_density='k*a+y'\na={start=1}\n[model.let]\nk='2*u'\n",
        );
        assert_eq!(custom.iter().map(|c| c.0.as_str()).collect::<Vec<_>>(), ["y", "u"]);
        let (_, pairs) = wanted(&study("[data]\nfile='a'\n[model]\nfamily='binomial'\nresponse='y'\ntrials='n'\n"));
        assert_eq!(pairs, [Pair::AtMost { count: "y".into(), trials: "n".into() }]);
    }

    #[test]
    fn names_that_stand_for_nothing_are_the_studys_fault() {
        let s = study("[data]\nfile='a'\n[model]\nfamily='custom'\nlog_density='alpa*y'\nalpha={start=1}\n");
        assert!(stray_names(&s, &["y".into(), "alpa".into()]).is_ok());
        let said = stray_names(&s, &["y".into()]).unwrap_err().to_string();
        assert_eq!(
            said,
            "s, line 5: no column, parameter or piece is called alpa\n    log_density='alpa*y'\n                 ^^^^\n    nearest name: alpha"
        );
    }

    #[test]
    fn the_grammar_is_checked_without_data() {
        let s = |more: &str| study(&format!("[data]\nfile='a'\n[model]\nfamily='normal'\nresponse='y'\n{more}"));
        assert!(grammar(&s("")).is_ok());
        for (more, place) in [
            ("[tested]\na='mean ='\n", "line 7"),
            ("[quantities]\na='mean +'\n", "line 7"),
            ("[data.derive]\nb='1 +'\n", "line 7"),
            ("[model.mean]\ncurve='(a'\n", "line 7"),
        ] {
            let said = grammar(&s(more)).unwrap_err().to_string();
            assert!(said.contains(place) && said.contains('^'), "{said}");
        }
        let s = study("[data]\nfile='a'\n[model]\nfamily='normall'\nresponse='y'\n");
        assert!(grammar(&s).unwrap_err().to_string().contains("nearest name: normal"));
    }
}
