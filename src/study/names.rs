//! What can be said against a study before its data are read: families, grammar, names that stand for nothing or for two
//! things.

use super::Study;
use super::place::Places;
use super::source::Shown;
use crate::expr::{ExprError, nearest, parse_condition, parse_equation, parse_expression};
use crate::family::Family;
use crate::family::listing;
use crate::likelihood::Model;
use crate::likelihood::model::Form;

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

/// Refuses a name in an expression of the model that is no column of the file, made of none, and nothing of the model's
/// (a parameter misspelt is the study's fault, not the data's), or that is both.
///
/// # Errors
/// The first such name, with the nearest one that exists.
pub fn names(study: &Study, header: &[String]) -> Result<(), Shown> {
    let request = &study.data.request;
    let own = own_names(&study.model);
    let mut columns = header.to_vec();
    columns.extend(request.derive.iter().map(|d| d.0.clone()));
    columns.extend(request.unfold.iter().flat_map(|u| [u.label.clone(), u.value.clone()]));
    let known: Vec<&String> = own.iter().chain(&columns).collect();
    for (place, text) in texts(&study.model) {
        let Ok(ast) = parse_expression(&text) else { continue };
        for (name, span) in ast.names() {
            let Some(single) = name.as_single() else { continue };
            if known.iter().any(|k| *k == single) {
                if own.iter().any(|o| o == single) && columns.iter().any(|c| c == single) {
                    let message = format!("two things are called {single}: one of the model's and a column");
                    let advice = format!("rename the model's {single}, or the column");
                    return Err(study.places.show(&place, Some(span), &message, Some(&advice)));
                }
                continue;
            }
            let advice = match nearest(single, known.iter().map(|k| k.as_str())) {
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

    #[test]
    fn names_that_stand_for_nothing_are_the_studys_fault() {
        let s = study("[data]\nfile='a'\n[model]\nfamily='custom'\nlog_density='alpa*y'\nalpha={start=1}\n");
        assert!(names(&s, &["y".into(), "alpa".into()]).is_ok());
        let both = names(&s, &["y".into(), "alpa".into(), "alpha".into()]);
        assert!(both.is_ok(), "a column that no expression names is no matter");
        let s2 = study("[data]\nfile='a'\n[model]\nfamily='custom'\nlog_density='a*y'\na={start=1}\n");
        let both = names(&s2, &["y".into(), "a".into()]).unwrap_err().to_string();
        assert!(both.contains("two things are called a"), "{both}");
        let said = names(&s, &["y".into()]).unwrap_err().to_string();
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
