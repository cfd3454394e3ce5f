//! Whole studies, and what is said of wrong ones.

use super::*;
use crate::likelihood::model::{Amount, Event, Form, Response};
use crate::restriction::Role;

fn read(text: &str) -> Result<Study, StudyError> {
    with(text, &Overlay::default())
}

fn with(text: &str, overlay: &Overlay) -> Result<Study, StudyError> {
    Study::from_text(text, "dir/s.toml", PathBuf::from("dir"), overlay)
}

fn fault(text: &str) -> String {
    read(text).unwrap_err().to_string()
}

const FULL: &str = r#"
title = "Flaws in three kilns"
[data]
file = "flaws.csv"
weight = "tiles"
only = "area > 0"
on_missing = "drop"
missing = ["", "NA"]
delimiter = ";"
decimal = ","
[data.derive]
log_area = "log(area)"
[data.category]
kiln = ["north", "middle", "south"]
[model]
family = "poisson"
response = "flaws"
exposure = "area"
[model.rate]
terms = ["kiln", "soak", ["kiln", "soak"]]
link = "log"
start = { soak = 0.1, 'kiln.middle:soak' = 0.2, kiln.'2' = 1, 'so ak' = 3 }
range = { soak = "[0, inf)" }
[quantities]
top = "exp(rate.intercept)"
[maintained]
held = "rate.kiln.middle = 0.1"
[tested]
same_slope = "rate.kiln.middle:soak = rate.kiln.south:soak = 0"
[options]
tests = ["score", "lr"]
confidence = 0.9
trace = "t.csv"
"#;

#[test]
fn a_whole_study() {
    let s = read(FULL).unwrap();
    assert_eq!(s.title, "Flaws in three kilns");
    let r = &s.data.request;
    assert_eq!((r.delimiter, r.decimal, r.missing.len()), (';', ',', 2));
    assert_eq!(r.derive, [("log_area".to_owned(), "log(area)".to_owned())]);
    assert_eq!(r.categories[0].1, ["north", "middle", "south"]);
    assert!(matches!(&s.data.source, Some(crate::data::Source::File { path, shown })
        if path == Path::new("dir/flaws.csv") && shown == "flaws.csv"));
    let rate = &s.model.parameters[0];
    let Form::Terms(terms) = &rate.form else { panic!() };
    assert_eq!(terms.terms, [vec!["kiln"], vec!["soak"], vec!["kiln", "soak"]]);
    let keys: Vec<_> = rate.start.iter().map(|k| k.0.clone().unwrap()).collect();
    assert_eq!(keys, ["soak", "kiln.middle:soak", "kiln.'2'", "\"so ak\""]);
    assert_eq!(rate.range[0].1, crate::math::Range::NONNEGATIVE);
    assert_eq!((s.count(Role::Maintained), s.count(Role::Tested)), (1, 1));
    assert_eq!(s.restrictions[1].place, "tested.same_slope");
    assert!(!s.settings.tests.wald && s.settings.confidence == 0.9);
    assert_eq!(s.settings.trace, Some(PathBuf::from("dir/t.csv")));
}

#[test]
fn a_fault_of_another_floor_is_shown_in_the_file() {
    let s = read(FULL).unwrap();
    let span = crate::expr::Span { start: 24, end: 44 };
    let shown = s.places.show("tested.same_slope", Some(span), "no parameter is called rate.kiln.south:soak", None);
    assert!(shown.to_string().starts_with("dir/s.toml, line 29: no parameter"), "{shown}");
    assert!(shown.to_string().ends_with("^^^^^^^^^^^^^^^^^^^^"), "{shown}");
}

#[test]
fn mixtures_curves_and_custom() {
    let s = read(
        "[data]\nfile='a'\n[model]\nfamily='mixture'\nresponse_lower='a'\nresponse_upper='b'\n[[model.component]]\nname='n'\nfamily='normal'\n\
         known={mean=1}\nstart={sd=2}\nrange={sd='(0,inf)'}\n[[model.component]]\nname='m'\nfamily='poisson'\nexposure='e'\n",
    )
    .unwrap();
    assert_eq!(s.model.response, Response::Ends { lower: "a".into(), upper: "b".into() });
    let c = &s.model.components;
    assert_eq!((c.len(), c[0].parameters.len(), c[0].parameters[1].start[0].1), (2, 2, 2.0));
    assert_eq!(s.places.find("model.component.0.sd.start"), s.places.find("model.component.0.start.sd"));
    let s = read(
        "[model]\nfamily='custom'\nlog_density='k*log(a)'\na={start=1,range='(0, inf)'}\n[model.let]\nk='2'\nj=3\n[model.b]\ncurve='a+1'\n",
    )
    .unwrap();
    assert_eq!(s.model.lets, [("k".to_owned(), "2".to_owned()), ("j".to_owned(), "3".to_owned())]);
    assert_eq!(s.model.parameters[1].form, Form::Curve("a+1".into()));
    assert!(s.data.source.is_none());
    let s = read("[data]\nfile='-'\n[model]\nfamily='binomial'\nresponse='y'\ntrials=3\nper='kiln'\n[model.north.probability]\nstart=0.5\n[model.probability]\nshared=true\n").unwrap();
    assert_eq!(s.model.trials, Some(Amount::Number(3.0)));
    assert_eq!(s.model.parameters[0].name, "north.probability");
    assert!(s.model.parameters[1].shared);
    let s = read("[data]\nfile='a'\n[model]\nfamily='exponential'\nresponse='t'\nevent={column='s',seen='failed'}\n")
        .unwrap();
    assert_eq!(s.model.event, Some(Event { column: "s".into(), seen: Some("failed".into()) }));
}

#[test]
fn a_study_by_options_alone() {
    let given = |option, key, value: &str| Given { option, key, value: value.into() };
    let overlay = Overlay {
        keys: vec![
            given("--data", "data.file", "x.csv"),
            given("--family", "model.family", "normal"),
            given("--response", "model.response", "y"),
            given("--starts", "options.starts", "5"),
        ],
        with: vec!["model.mean.terms=[\"x\"]".into(), "options.starts=3".into(), "options.seed=7".into()],
        tested: vec!["mean.x = 0".into(), "two: sd = 2".into(), "mean.intercept = 1".into()],
        ..Overlay::default()
    };
    let s = Study::from_text("", "", PathBuf::new(), &overlay).unwrap();
    assert_eq!((s.settings.starts, s.settings.seed), (Some(5), 7));
    let names: Vec<_> = s.restrictions.iter().map(|d| d.name.clone().unwrap()).collect();
    assert_eq!(names, ["tested_1", "two", "tested_2"]);
    let span = crate::expr::Span { start: 0, end: 2 };
    let shown = s.places.show(&s.restrictions[1].place, Some(span), "m", None).to_string();
    assert_eq!(shown, "command line, --tested: m\n    two: sd = 2\n         ^^");
    assert!(Study::from_text("", "", PathBuf::new(), &Overlay::default()).is_err());
}

#[test]
fn restrictions_are_dropped_by_name() {
    let drop = |names: &[&str]| Overlay { drop: names.iter().map(|s| s.to_string()).collect(), ..Overlay::default() };
    assert_eq!(with(FULL, &drop(&["same_slope"])).unwrap().count(Role::Tested), 0);
    assert_eq!(with(FULL, &drop(&["same_slope.2"])).unwrap().drop, ["same_slope.2"]);
    let text = with(FULL, &drop(&["same_slop"])).unwrap_err().to_string();
    assert!(text.contains("command line, --drop") && text.contains("nearest name: same_slope"), "{text}");
    let mut again = drop(&["same_slope"]);
    again.tested.push("same_slope: rate.soak = 0".into());
    assert_eq!(with(FULL, &again).unwrap().count(Role::Tested), 1);
    again.drop.clear();
    let text = with(FULL, &again).unwrap_err().to_string();
    assert!(text.contains("two restrictions are called same_slope") && text.contains("dir/s.toml, line 29"), "{text}");
}

#[test]
fn wrong_studies_say_where_and_what_to_do() {
    let data = "[data]\nfile='a'\n";
    let normal = "[data]\nfile='a'\n[model]\nfamily='normal'\nresponse='y'\n";
    for (text, says) in [
        (format!("{normal}[tset]\na='b'\n"), vec!["line 6", "a study has no key tset"]),
        (format!("{normal}respnse='y'\n"), vec!["line 6", "[model] has no key respnse", "nearest name: response"]),
        (format!("family='normal'\n{data}"), vec!["line 1", "it belongs under [model]"]),
        (format!("{normal}[model.mean]\nterm=['a']\n"), vec!["line 7", "nearest name: terms"]),
        (format!("{normal}[model.mean]\nlink='log'\n"), vec!["link goes with terms"]),
        (format!("{normal}[model.mean]\nterms=['a']\nlink='lg'\n"), vec!["no link is called lg", "nearest name: log"]),
        (format!("{normal}[model.mean]\nterms=['a']\nstart=1\n"), vec!["one value a coefficient"]),
        (format!("{normal}[model.mean]\nterms=['a',['b','c'],['c','b']]\n"), vec!["c:b is there twice"]),
        (format!("{normal}[model.mean]\ncurve='a'\nstart=1\n"), vec!["is a curve and has no start"]),
        (format!("{normal}[model.mean]\nshared=true\n"), vec!["no per"]),
        (format!("{normal}[model.north.mean]\nstart=1\n"), vec!["needs per"]),
        (format!("{normal}mean=3\n"), vec!["mean = { known = 3 }"]),
        (format!("{normal}[model.sd]\nrange='(0, 1'\n"), vec!["line 7", "(0, 1", "write \"[0, 1]\""]),
        (format!("{normal}[model.sd]\nstart='a'\n"), vec!["start must be a number, not a text"]),
        (format!("{normal}[model.sd]\nstart=inf\n"), vec!["finite"]),
        (format!("{normal}response_lower='l'\n"), vec!["not response and response_lower"]),
        (format!("{data}[model]\nfamily='normal'\nresponse_lower='l'\n"), vec!["needs response_upper beside it"]),
        (format!("{data}[model]\nresponse='y'\n"), vec!["dir/s.toml: the study names no family"]),
        (format!("{normal}support={{y='0..'}}\n"), vec!["support belongs to the family custom"]),
        (format!("{normal}[[model.component]]\nname='a'\nfamily='normal'\n"), vec!["belong to the family mixture"]),
        (format!("{normal}[options]\nstarts=0\n"), vec!["starts must be a whole number of at least 1, not 0"]),
        (format!("{normal}[options]\nstrats=3\n"), vec!["nearest name: starts"]),
        (format!("{normal}[options]\nfamily='x'\n"), vec!["the key model.family"]),
        (format!("{normal}[options]\ngate=0.05\ntests='lr'\n"), vec!["the gate reads the score test"]),
        (format!("{normal}[options]\ninformation='observd'\n"), vec!["nearest name: observed"]),
        (format!("{normal}[options]\ngate=1.5\n"), vec!["between 0 and 1"]),
        (
            format!("{normal}[maintained]\na='mean=1'\n[tested]\na='sd=1'\n"),
            vec!["line 9", "other is at dir/s.toml, line 7"],
        ),
        (format!("{normal}sd={{start=1}}\n[quantities]\nsd='1'\n"), vec!["a quantity and a parameter"]),
        (format!("{normal}[tested]\na=3\n"), vec!["line 7: a must be an equation"]),
        (format!("{normal}[tested]\na=''\n"), vec!["a is empty"]),
        ("[data]\nfile='a'\ndecimal=','\n[model]\nfamily='normal'\nresponse='y'\n".into(), vec!["delimiter = \";\""]),
        (
            "[data]\nfile='a'\n[data.category]\nk=['a','a']\n[model]\nfamily='normal'\nresponse='y'\n".into(),
            vec!["two levels of k"],
        ),
        ("[data]\nweight='w'\n[model]\nfamily='normal'\nresponse='y'\n".into(), vec!["no file"]),
        (format!("{data}[model]\nfamily='normal'\n"), vec!["normal needs a response", "--response"]),
        ("[data]\nfile='a'\n[model]\nfamily='norm".into(), vec!["line 4", "a text is not closed"]),
        (String::new(), vec!["the study is empty"]),
    ] {
        let shown = fault(&text);
        for part in says {
            assert!(shown.contains(part), "{text}\n--\n{shown}\n-- lacks {part}");
        }
    }
}

/// Every prefix of a study is read or refused; none panics.
#[test]
fn truncated_studies_do_not_panic() {
    for end in (0..FULL.len()).filter(|i| FULL.is_char_boundary(*i)) {
        if let Err(e) = read(&FULL[..end]) {
            assert!(!e.to_string().is_empty());
        }
    }
}
