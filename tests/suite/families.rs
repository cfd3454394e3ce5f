//! Families against each other: what is a special case, a limit or another writing of a second family has the same answer.
//! Agreement is to 1e-9 as in `equivalence`; where one side is computed by sums or integrals, to their stated 1e-8.

use crate::harness::{Fit, Folder, Source, csv, near};

impl Source {
    fn logistic(&mut self) -> f64 {
        let u = self.next();
        (u / (1.0 - u)).ln()
    }

    fn normal(&mut self) -> f64 {
        (-2.0 * self.next().ln()).sqrt() * (2.0 * std::f64::consts::PI * self.next()).cos()
    }

    fn poisson(&mut self, mean: f64) -> f64 {
        let (mut k, mut p) = (0.0, self.next());
        while p > (-mean).exp() {
            k += 1.0;
            p *= self.next();
        }
        k
    }
}

fn text(values: Vec<f64>) -> Vec<String> {
    values.into_iter().map(|v| v.to_string()).collect()
}

/// Runs two studies in one folder and holds log-likelihoods and tests together.
fn alike(what: &str, folder: &Folder, one: &str, other: &str, tolerance: f64) -> (Fit, Fit) {
    let (a, b) = (folder.fit(one, &[]), folder.fit(other, &[]));
    for fit in [&a, &b] {
        assert_eq!((fit.status, fit.verdict()), (0, "strict maximum"), "{what}: {}", fit.err);
    }
    for pointer in [
        "/restricted/log_likelihood",
        "/unrestricted/log_likelihood",
        "/tests/score/chi_square",
        "/tests/lr/chi_square",
        "/tests/wald/chi_square",
    ] {
        let (x, y) = (a.number(pointer), b.number(pointer));
        let (Some(x), Some(y)) = (x, y) else {
            panic!("{what}: {pointer} {x:?} and {y:?}\n{}{}", a.warnings(), b.warnings())
        };
        assert!(near(x, y, tolerance, tolerance), "{what}: {pointer} {x} and {y}");
    }
    (a, b)
}

fn close(what: &str, a: Option<f64>, b: f64) {
    let Some(a) = a else { panic!("{what}: nothing, not {b}") };
    assert!(near(a, b, 1e-9, 1e-9), "{what}: {a} not {b}");
}

#[test]
fn two_labels_are_a_binomial_whatever_the_family_of_labels() {
    let mut s = Source(1);
    let x: Vec<f64> = (0..200).map(|_| 3.0 * s.next()).collect();
    let up: Vec<bool> = x.iter().map(|x| s.logistic() + x > 1.5).collect();
    let folder = Folder::new();
    let grade = up.iter().map(|u| if *u { "pass" } else { "fail" }.to_string()).collect();
    let y = up.iter().map(|u| u8::from(*u).to_string()).collect();
    folder.write("d.csv", csv(&[("x", text(x)), ("grade", grade), ("y", y)]));
    let binomial = "[data]\nfile='d.csv'\n[model]\nfamily='binomial'\nresponse='y'\n[model.probability]\nterms=['x']\n[tested]\nt='probability.x=0.5'\n";
    let of = |family: &str, group: &str, tested: &str| {
        format!(
            "[data]\nfile='d.csv'\n[data.category]\ngrade=['fail','pass']\n[model]\nfamily='{family}'\nresponse='grade'\n\
             [model.{group}]\nterms=['x']\n[tested]\nt='{tested}=0.5'\n"
        )
    };
    let (a, b) = alike("categorical", &folder, binomial, &of("categorical", "share", "share.pass.x"), 1e-9);
    close(
        "x",
        b.estimate("restricted", "share.pass.intercept", "se"),
        a.estimate("restricted", "probability.intercept", "se").unwrap(),
    );
    let (a, b) = alike("ordered", &folder, binomial, &of("ordered_logit", "location", "location.x"), 1e-9);
    // P(fail) = logistic(cut - location): the cut is minus the intercept
    close(
        "cut",
        b.estimate("restricted", "cut.fail", "value"),
        -a.estimate("restricted", "probability.intercept", "value").unwrap(),
    );
    let probit = binomial.replace("terms=['x']", "terms=['x']\nlink='probit'");
    alike("ordered probit", &folder, &probit, &of("ordered_probit", "location", "location.x"), 1e-9);
}

#[test]
fn contests_are_a_binomial_on_differences() {
    let mut s = Source(2);
    let items = ["north", "middle", "south"];
    let strength = [0.6, 0.0, -0.6];
    let (mut won, mut lost, mut y, mut n, mut m) = (vec![], vec![], vec![], vec![], vec![]);
    for i in 0..240 {
        let (a, b) = (i % 3, (i + 1 + i / 3 % 2) % 3);
        let first = s.logistic() < strength[a] - strength[b];
        let (w, l) = if first { (a, b) } else { (b, a) };
        won.push(items[w].to_string());
        lost.push(items[l].to_string());
        // each contest as a success, in columns of the strengths beside that of south
        y.push(1.0);
        n.push(f64::from(u8::from(w == 0)) - f64::from(u8::from(l == 0)));
        m.push(f64::from(u8::from(w == 1)) - f64::from(u8::from(l == 1)));
    }
    let folder = Folder::new();
    folder.write("d.csv", csv(&[("won", won), ("lost", lost), ("y", text(y)), ("n", text(n)), ("m", text(m))]));
    let (a, b) = alike(
        "contests",
        &folder,
        "[data]\nfile='d.csv'\n[model]\nfamily='paired_comparison'\nresponse=['won','lost']\n[tested]\nt='strength.north=strength.middle'\n",
        "[data]\nfile='d.csv'\n[model]\nfamily='binomial'\nresponse='y'\n[model.probability]\nterms=['n','m']\nintercept=false\n[tested]\nt='probability.n=probability.m'\n",
        1e-9,
    );
    let beside = |name: &str| {
        a.estimate("unrestricted", &format!("strength.{name}"), "value").unwrap()
            - a.estimate("unrestricted", "strength.south", "value").unwrap()
    };
    close("north", b.estimate("unrestricted", "probability.n", "value"), beside("north"));
    close("middle", b.estimate("unrestricted", "probability.m", "value"), beside("middle"));
}

#[test]
fn two_shares_are_a_beta_and_independent_columns_are_normals() {
    let mut s = Source(3);
    let y: Vec<f64> = (0..80).map(|_| 0.05 + 0.9 * s.next() * s.next().sqrt()).collect();
    let folder = Folder::new();
    let rest = y.iter().map(|y| 1.0 - y).collect();
    folder.write("d.csv", csv(&[("a", text(y)), ("b", text(rest))]));
    alike(
        "dirichlet",
        &folder,
        "[data]\nfile='d.csv'\n[model]\nfamily='dirichlet'\nresponse=['a','b']\n[tested]\nt='alpha.a/(alpha.a+alpha.b)=0.4'\n",
        "[data]\nfile='d.csv'\n[model]\nfamily='beta'\nresponse='a'\n[tested]\nt='mean=0.4'\n",
        1e-9,
    );
    let (u, v): (Vec<f64>, Vec<f64>) = (0..150)
        .map(|_| {
            let a = s.normal();
            (2.0 + a, 0.5 * a + s.normal())
        })
        .unzip();
    let mean = |x: &[f64]| x.iter().sum::<f64>() / x.len() as f64;
    let (mu, mv) = (mean(&u), mean(&v));
    let cross =
        |x: &[f64], a: f64, y: &[f64], b: f64| x.iter().zip(y).map(|(x, y)| (x - a) * (y - b)).sum::<f64>() / 150.0;
    let (suu, svv, suv) = (cross(&u, mu, &u, mu), cross(&v, mv, &v, mv), cross(&u, mu, &v, mv));
    folder.write("d.csv", csv(&[("u", text(u)), ("v", text(v))]));
    let f = folder.fit(
        "[data]\nfile='d.csv'\n[model]\nfamily='multivariate_normal'\nresponse=['u','v']\n[tested]\nt='corr.u.v=0'\n",
        &[],
    );
    // closed forms (Anderson, An Introduction to Multivariate Statistical Analysis, ch. 4): score n r^2, ratio -n log(1 - r^2)
    let r2 = suv * suv / (suu * svv);
    close("score", f.number("/tests/score/chi_square"), 150.0 * r2);
    close("ratio", f.number("/tests/lr/chi_square"), -150.0 * (1.0 - r2).ln());
    close("sd", f.estimate("restricted", "sd.u", "value"), suu.sqrt());
    close("corr", f.estimate("unrestricted", "corr.u.v", "value"), suv / (suu * svv).sqrt());
}

#[test]
fn cells_as_curves_and_as_restricted_shares() {
    let folder = Folder::new();
    folder.write("d.csv", "type,n\nAA,31\nAB,52\nBB,37\n");
    let head = "[data]\nfile='d.csv'\nweight='n'\n[model]\nfamily='categorical'\nresponse='type'\n";
    let a = folder.fit(&format!("{head}[tested]\nt='share.AB^2 = 4*share.AA*share.BB'\n"), &[]);
    let b = folder.fit(
        &format!(
            "{head}[model.share.AA]\ncurve='p^2'\n[model.share.AB]\ncurve='2*p*(1-p)'\n[model.share.BB]\ncurve='(1-p)^2'\n\
             [model.p]\nstart=0.3\nrange='[0,1]'\n"
        ),
        &[],
    );
    // closed form: p is the share of A among all
    close("p", b.estimate("restricted", "p", "value"), (62.0 + 52.0) / 240.0);
    close("l", b.number("/restricted/log_likelihood"), a.number("/restricted/log_likelihood").unwrap());
    let refused = folder.run(&["check", "study.toml", "--with", "model.share.BB.curve=1"]);
    assert_eq!(refused.status, 0, "a curve may be a number: {}", refused.err);
    folder.write("half.toml", format!("{head}[model.share.AA]\ncurve='p^2'\n[model.p]\nstart=0.3\n"));
    let refused = folder.run(&["fit", "half.toml"]);
    assert_eq!(refused.status, 2);
    assert!(refused.err.contains("1 of 3 parameters are curves"), "{}", refused.err);
}

#[test]
fn what_could_not_be_recorded_is_conditioned_on() {
    let mut s = Source(5);
    let y: Vec<f64> = (0..400).map(|_| s.poisson(2.0)).filter(|y| *y > 0.0).collect();
    let folder = Folder::new();
    folder.write("d.csv", csv(&[("y", text(y.clone()))]));
    let (a, b) = alike(
        "zero truncated",
        &folder,
        "[data]\nfile='d.csv'\n[model]\nfamily='poisson'\nresponse='y'\nabove=0\n[tested]\nt='rate=1.9'\n",
        "[data]\nfile='d.csv'\n[model]\nfamily='zero_truncated_poisson'\nresponse='y'\n[tested]\nt='rate=1.9'\n",
        1e-8,
    );
    let se = |f: &Fit| f.estimate("unrestricted", "rate", "se").unwrap();
    assert!(near(se(&a), se(&b), 1e-8, 0.0), "standard errors {} and {}", se(&a), se(&b));
    let y: Vec<f64> = (0..300).map(|_| s.normal()).filter(|y| *y > -1.5 && *y < 2.5).collect();
    folder.write("d.csv", csv(&[("y", text(y))]));
    alike(
        "normal between two ends",
        &folder,
        "[data]\nfile='d.csv'\n[model]\nfamily='normal'\nresponse='y'\nabove=-1.5\nbelow=2.5\n[tested]\nt='mean=0.1'\n[options]\ninformation='observed'\n",
        "[data]\nfile='d.csv'\n[model]\nfamily='custom'\nlog_density='-log(s) - ((y-m)/s)^2/2 - log(2*pi)/2 - normal_log_interval((-1.5-m)/s, (2.5-m)/s)'\n\
         m={start=0}\ns={start=1,range='(0,inf)'}\n[tested]\nt='m=0.1'\n",
        1e-8,
    );
    let outside =
        folder.run(&["fit", "--data", "d.csv", "--family", "normal", "--response", "y", "--with", "model.above=0"]);
    assert_eq!(outside.status, 3);
    assert!(
        outside.err.contains("d.csv, line ")
            && outside.err.contains("expected a value that could be recorded: above 0"),
        "{}",
        outside.err
    );
}

#[test]
fn bins_of_one_value_are_values() {
    let mut s = Source(6);
    let y: Vec<f64> = (0..150).map(|_| s.poisson(3.0)).collect();
    let folder = Folder::new();
    folder.write("d.csv", csv(&[("y", text(y.clone())), ("z", text(y.clone()))]));
    alike(
        "exact",
        &folder,
        "[data]\nfile='d.csv'\n[model]\nfamily='poisson'\nresponse='y'\n[tested]\nt='rate=3'\n",
        "[data]\nfile='d.csv'\n[model]\nfamily='poisson'\nresponse_lower='y'\nresponse_upper='z'\n[tested]\nt='rate=3'\n",
        1e-9,
    );
    // counts in bins (both ends belong) are cells with shares from the distribution function
    let count = |a: f64, b: f64| y.iter().filter(|v| **v >= a && **v <= b).count();
    let rows = format!(
        "lo,hi,n\n,1,{}\n2,3,{}\n4,5,{}\n6,,{}\n",
        count(0.0, 1.0),
        count(2.0, 3.0),
        count(4.0, 5.0),
        count(6.0, 99.0)
    );
    folder.write("b.csv", rows);
    let f = folder.fit(
        "[data]\nfile='b.csv'\nweight='n'\n[model]\nfamily='poisson'\nresponse_lower='lo'\nresponse_upper='hi'\n[tested]\nt='rate=3'\n",
        &[],
    );
    let p = |k: i32| (-3.0f64).exp() * 3f64.powi(k) / (1..=k).map(f64::from).product::<f64>();
    let chances = [p(0) + p(1), p(2) + p(3), p(4) + p(5), 1.0 - (0..6).map(p).sum::<f64>()];
    let counts = [count(0.0, 1.0), count(2.0, 3.0), count(4.0, 5.0), count(6.0, 99.0)];
    let l: f64 = counts.iter().zip(chances).map(|(n, p)| *n as f64 * p.ln()).sum();
    close("binned counts", f.number("/restricted/log_likelihood"), l);
}

#[test]
fn many_levels_share_and_compare_their_parameters() {
    let mut s = Source(7);
    let (mut maker, mut y) = (vec![], vec![]);
    for i in 0..360 {
        maker.push(format!("m{:02}", i % 12));
        y.push((1.0 + (i % 12) as f64) * (-s.next().ln()).powf(0.5));
    }
    let folder = Folder::new();
    folder.write("d.csv", csv(&[("maker", maker), ("y", text(y))]));
    let head = "[data]\nfile='d.csv'\n[model]\nfamily='weibull'\nresponse='y'\nper='maker'\n";
    let equal = folder.fit(&format!("{head}[tested]\nt='equal(*.shape)'\n"), &[]);
    assert_eq!((equal.verdict(), equal.number("/tests/score/df")), ("strict maximum", Some(11.0)), "{}", equal.err);
    let shared = folder.fit(&format!("{head}[model.shape]\nshared=true\n"), &[]);
    close("shared", shared.number("/restricted/log_likelihood"), equal.number("/restricted/log_likelihood").unwrap());
    assert_eq!(shared.number("/model/parameters"), Some(13.0));
    let ones = folder.fit(&format!("{head}[tested]\nt='*.shape = 2'\n"), &[]);
    assert_eq!(ones.number("/tests/score/df"), Some(12.0));
}

#[test]
fn custom_densities_are_held_to_be_densities() {
    let mut s = Source(8);
    let y: Vec<f64> = (0..120).map(|_| s.poisson(4.0)).collect();
    let folder = Folder::new();
    folder.write("d.csv", csv(&[("y", text(y))]));
    let custom = |density: &str, rest: &str| {
        format!(
            "[data]\nfile='d.csv'\n[model]\nfamily='custom'\nresponse='y'\nlog_density='{density}'\nm={{start=3,range='(0,inf)'}}\n{rest}\
             [model.support]\ny='0..'\n[tested]\nt='m=4'\n[options]\ninformation='expected'\n"
        )
    };
    let poisson = "[data]\nfile='d.csv'\n[model]\nfamily='poisson'\nresponse='y'\n[tested]\nt='rate=4'\n";
    let right = custom("y*u - m - lgamma(y+1)", "[model.let]\nu='log(m)'\n");
    let (_, b) = alike("poisson written out", &folder, poisson, &right, 1e-8);
    assert!(!b.warned("mass-not-one"), "{}", b.warnings());
    assert_eq!(b.value.pointer("/model/information").unwrap(), "expected");
    let wrong = folder.fit(&custom("y*log(m) - 1.1*m - lgamma(y+1)", ""), &[]);
    assert!(wrong.warned("mass-not-one"), "{}", wrong.warnings());
    let none = folder.run(&["fit", "study.toml", "--with", "model.support.z=[0, 1]"]);
    assert_eq!(none.status, 2, "{}", none.err);
    assert!(none.err.contains("z is no column that log_density names"), "{}", none.err);
}

#[test]
fn components_have_terms_and_points_take_the_zeros() {
    let mut s = Source(9);
    let x: Vec<f64> = (0..300).map(|_| s.next()).collect();
    let y: Vec<f64> = x.iter().map(|x| if s.next() < 0.3 { 0.0 } else { s.poisson((0.4 + x).exp()) }).collect();
    let folder = Folder::new();
    folder.write("d.csv", csv(&[("x", text(x)), ("y", text(y))]));
    let mixture = "[data]\nfile='d.csv'\n[model]\nfamily='mixture'\nresponse='y'\n[[model.component]]\nname='never'\nfamily='point'\nknown={at=0}\n\
         [[model.component]]\nname='some'\nfamily='poisson'\n[model.component.rate]\nterms=['x']\n[tested]\nt='some.rate.x=1'\n";
    let custom = "[data]\nfile='d.csv'\n[model]\nfamily='custom'\n\
         log_density='if(y = 0, log(q + (1-q)*exp(-m)), log1p(-q) + y*log(m) - m - lgamma(y+1))'\nq={start=0.3,range='[0,1]'}\na={start=0.5}\nb={start=1}\n\
         [model.let]\nm='exp(a+b*x)'\n[tested]\nt='b=1'\n";
    let (a, b) = alike("zero inflation", &folder, mixture, custom, 1e-9);
    close("q", a.estimate("restricted", "share.never", "value"), b.estimate("restricted", "q", "value").unwrap());
    let alone = folder.run(&["fit", "--data", "d.csv", "--family", "point", "--response", "y"]);
    assert_eq!(alone.status, 2);
    assert!(alone.err.contains("point has nothing to estimate by itself"), "{}", alone.err);
    let unknown = folder.run(&["fit", "study.toml", "--data", "d.csv", "--family", "pareto", "--response", "y"]);
    assert_eq!(unknown.status, 2, "{}", unknown.err);
}

#[test]
fn edges_and_ends_are_said_to_be_that() {
    let folder = Folder::new();
    let warns = |study: &str, code: &str| {
        let f = folder.fit(study, &[]);
        assert!(f.warned(code), "{study}\n{}{}", f.warnings(), f.err);
        f
    };
    // counts that vary less than Poisson ones: the dispersion is at its edge, zero
    folder.write(
        "d.csv",
        csv(&[("y", text((0..60).map(|i| 4.0 + f64::from(i % 3)).collect())), ("n", text(vec![10.0; 60]))]),
    );
    let head = "[data]\nfile='d.csv'\n[model]\nresponse='y'\n";
    let f = warns(&format!("{head}family='negative_binomial'\n[tested]\nt='mean=5.5'\n"), "nuisance-on-edge");
    assert_eq!(f.verdict(), "strict maximum");
    assert!(f.list("/restricted/certificate/edges")[0].to_string().contains("dispersion"), "{}", f.value);
    let f = warns(&format!("{head}family='negative_binomial'\n[tested]\nt='dispersion=0'\n"), "tested-on-edge");
    // pull at the edge: sum((y - m)^2 - y) / 2 (Dean and Lawless 1989, Journal of the American Statistical Association 84)
    let pull: f64 = (0..60).map(|i| (f64::from(i % 3) - 1.0).powi(2) - 4.0 - f64::from(i % 3)).sum::<f64>() / 2.0;
    close("pull", f.tested("value")[0], pull);
    let f =
        warns(&format!("{head}family='beta_binomial'\ntrials='n'\n[tested]\nt='overdispersion=0'\n"), "tested-on-edge");
    // its binomial limit: sum of ((y - n p)^2 - n p q - (1 - 2p)(y - n p)) / (2 p q) at p = 1/2 (Tarone 1979, Biometrika 66)
    let pull: f64 = (0..60).map(|i| (f64::from(i % 3) - 1.0).powi(2) - 2.5).sum::<f64>() / 0.5;
    close("beta-binomial pull", f.tested("value")[0], pull);
    // a share of zero
    folder.write("d.csv", "g,n\na,0\nb,12\nc,30\n");
    let f = warns(
        "[data]\nfile='d.csv'\nweight='n'\n[data.category]\ng=['a','b','c']\n[model]\nfamily='categorical'\nresponse='g'\n[tested]\nt='share.b=0.3'\n",
        "nuisance-on-edge",
    );
    assert_eq!(f.estimate("restricted", "share.a", "value"), Some(0.0));
    // perfect correlation and complete separation have no maximum
    folder.write("d.csv", "a,b,g\n1,2,low\n2,4,low\n3,6,mid\n4,8,mid\n7,14,high\n9,18,high\n");
    for model in [
        "family='multivariate_normal'\nresponse=['a','b']\n",
        "family='ordered_probit'\nresponse='g'\n[model.location]\nterms=['a']\n",
        "family='categorical'\nresponse='g'\n[model.share]\nterms=['a']\n",
    ] {
        let study = format!("[data]\nfile='d.csv'\n[data.category]\ng=['low','mid','high']\n[model]\n{model}");
        let f = folder.fit(&study, &[]);
        assert_eq!((f.status, f.verdict()), (4, "unbounded"), "{model}");
        assert!(f.list("/restricted/estimates").is_empty());
    }
}

#[test]
fn blends_are_terms_without_intercept() {
    // three parts that sum to one: the blend polynomial of second degree (Scheffe 1958, Journal of the Royal Statistical
    // Society B 20) at its design points has coefficients in closed form: y_i, and 4 y_ij - 2 y_i - 2 y_j
    let folder = Folder::new();
    folder.write(
        "d.csv",
        "a,b,c,y\n1,0,0,10\n0,1,0,12\n0,0,1,7\n0.5,0.5,0,13\n0.5,0,0.5,9\n0,0.5,0.5,9.25\n1,0,0,10.5\n0,1,0,12.5\n0,0,1,7.5\n0.5,0.5,0,13.5\n0.5,0,0.5,9.5\n0,0.5,0.5,9.75\n",
    );
    let f = folder.fit(
        "[data]\nfile='d.csv'\n[model]\nfamily='normal'\nresponse='y'\n[model.mean]\nterms=['a','b','c',['a','b'],['a','c'],['b','c']]\nintercept=false\n[tested]\nt='mean.a = mean.b'\n",
        &[],
    );
    close("a", f.estimate("unrestricted", "mean.a", "value"), 10.25);
    close("a:b", f.estimate("unrestricted", "mean.a:b", "value"), 4.0 * 13.25 - 2.0 * 10.25 - 2.0 * 12.25);
}
