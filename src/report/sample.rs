//! Documents to render in tests: invented, not fitted.

use super::{DataFacts, Document, ModelFacts, Named};
use crate::infer::{Block, Estimate, Information, Multiplier, Outcome, Role, Test, Warning};
use crate::math::{Matrix, Vector};
use crate::solve::{Certificate, Direction, Edge, End, Fit, Verdict};

fn certificate(verdict: Verdict) -> Certificate {
    Certificate {
        verdict,
        reason: None,
        feasibility: 2.2e-16,
        stationarity: 3.4e-12,
        rank: 2,
        restrictions: 2,
        condition: Some(1.7),
        curvature_min: Some(0.41),
        curvature_max: Some(1.62),
        derivatives: 2.1e-9,
        second_opinion: None,
        iterations: 6,
        passes: 9,
        starts: 1,
        starts_at_best: 1,
        maxima: vec![-77.3655441898635],
        collapsed: 0,
        flat: Vec::new(),
        identified: Vec::new(),
        notes: Vec::new(),
    }
}

fn estimate(name: &str, value: f64, se: f64) -> Estimate {
    let reach = 1.959963984540054 * se;
    Estimate {
        name: name.into(),
        value,
        se: Some(se),
        lower: Some(value - reach),
        upper: Some(value + reach),
        edge: None,
    }
}

/// `parameters` names with a tested and a maintained restriction.
pub(super) fn good(names: &[&str]) -> Document {
    let n = names.len();
    let value = |j: usize| 0.52 + 1.75 * j as f64;
    let mut estimates: Vec<Estimate> =
        (0..n).map(|j| estimate(names[j], value(j), 0.0451 * (1.0 + j as f64))).collect();
    estimates[n - 1] = Estimate { edge: Some(End::Lower), ..estimate(names[n - 1], 0.0, 0.0) };
    let tested = Multiplier {
        name: "same_slope.1".into(),
        role: Role::Tested,
        equation: format!("{} = 2 * {}", names[0], names[1]),
        value: Some(-41.23),
        se: Some(13.07),
        z: Some(-41.23 / 13.07),
        p: Some(0.0016),
        gap: Some(0.03125),
        reason: None,
        gap_reason: None,
    };
    let family = Multiplier {
        name: "shares".into(),
        role: Role::Family,
        equation: "sum(share.*) = 1".into(),
        value: Some(240.0),
        se: None,
        z: None,
        p: None,
        gap: Some(0.0),
        reason: Some("always imposed, not tested".into()),
        gap_reason: None,
    };
    let theta = Vector::from_iterator(n, (0..n).map(value));
    let fit = Fit {
        phi: theta.clone(),
        theta,
        log_likelihood: -77.3655441898635,
        multipliers: Vector::from_vec(vec![240.0, -41.23]),
        slope: None,
        edges: vec![Edge { parameter: n - 1, end: End::Lower, multiplier: -3.5 }],
        redundant: Vec::new(),
        certificate: certificate(Verdict::StrictMaximum),
        trace: Vec::new(),
    };
    let restricted = Block {
        fit,
        estimates,
        covariance: Some(Matrix::identity(n, n)),
        quantities: vec![estimate("ratio", 2.125, 0.25)],
        multipliers: vec![family, tested],
        reason: None,
    };
    Document {
        group: None,
        data: DataFacts {
            file: Some("flaws.csv".into()),
            sha256: Some("0123456789abcdef".repeat(4)),
            rows_read: 243,
            rows_used: 240,
            rows_dropped: 3,
            weight_total: 1152.5,
        },
        model: ModelFacts {
            title: "Flaws in three kilns".into(),
            family: "poisson".into(),
            parameters: names.iter().map(|n| Named { name: (*n).into(), meaning: String::new() }).collect(),
            sentence: "flaws: poisson with rate by kiln, exposure area".into(),
        },
        outcome: Outcome {
            information: Information::Expected,
            confidence: 0.95,
            unrestricted: Ok(restricted.clone()),
            restricted,
            score: Ok(Test::new(9.95, 1)),
            lr: Ok(Test::new(9.37, 1)),
            wald: Err("the unrestricted estimate is on an edge of a range".into()),
            warnings: vec![Warning::new(
                "few-rows",
                "there are 12 rows (total weight) for 2 free parameters, under ten each",
            )],
        },
    }
}

/// A fit that found no trustworthy maximum.
pub(super) fn failed() -> Document {
    let mut document = good(&["depth", "spread"]);
    let why = "the restricted fit has no trustworthy maximum (flat)";
    let block = &mut document.outcome.restricted;
    block.fit.certificate = Certificate {
        reason: Some("the likelihood does not change when depth and spread move together".into()),
        flat: vec![Direction { weights: vec![(0, 0.6), (1, -0.8)], se: None, value: 1.5 }],
        identified: vec![Direction { weights: vec![(0, 1.0), (1, 1.0)], se: Some(0.31), value: 2.79 }],
        curvature_min: Some(f64::NAN),
        ..certificate(Verdict::Flat)
    };
    block.fit.theta[0] = f64::INFINITY;
    block.fit.edges.clear();
    block.estimates.clear();
    block.quantities.clear();
    block.covariance = None;
    block.reason = Some(why.into());
    for m in &mut block.multipliers {
        *m = Multiplier {
            value: None,
            se: None,
            z: None,
            p: None,
            gap: None,
            reason: Some(why.into()),
            gap_reason: Some(why.into()),
            ..m.clone()
        };
    }
    let no = || Err::<Test, _>(why.to_string());
    document.outcome.unrestricted = Err(why.into());
    (document.outcome.score, document.outcome.lr, document.outcome.wald) = (no(), no(), no());
    document
}
