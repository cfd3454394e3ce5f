//! Noncentral hypergeometric distribution: a two-by-two table given its margins.

use super::{Amounts, Distribution, Family, Information, Link, Moments, RowParameter, Support};
use crate::math::{Random, Range, special};

/// The family.
pub const HYPERGEOMETRIC: Family = Family {
    name: "hypergeometric",
    response: "successes among `trials` draws without replacement from `successes` and `failures`",
    support: Support::Draws,
    parameters: &[RowParameter::new(
        "odds_ratio",
        Range::NONNEGATIVE,
        &[Link::Log, Link::Identity],
        "odds of drawing a success over those of drawing a failure; 1: all alike",
    )],
    amounts: &["trials", "successes", "failures"],
    // y log(odds_ratio) + log C(successes, y) + log C(failures, trials - y) less the log of the sum of its exponentials over y
    log_density: "hypergeometric_log_mass(0, y, odds_ratio, successes, failures, trials)",
    distribution: Some(Distribution {
        below: "hypergeometric_log_tail(0, 0, at, odds_ratio, successes, failures, trials)",
        above: "hypergeometric_log_tail(1, 0, at, odds_ratio, successes, failures, trials)",
        between: None,
    }),
    information: Information::Closed(&[(
        "odds_ratio",
        "odds_ratio",
        "if(odds_ratio > 0, hypergeometric_log_sum(2, log(odds_ratio), successes, failures, trials) / odds_ratio^2, 1 / odds_ratio)",
    )]),
    information_note: "variance by exact sum",
    source: "Fisher (1935), Journal of the Royal Statistical Society 98; Fog (2008), Communications in Statistics 37",
    start,
    sample,
    concave: false,
};

fn start(_: &Moments, _: &[Option<f64>]) -> Vec<f64> {
    vec![1.0]
}

/// By inversion, from the middle outwards.
fn sample(p: &[f64], amounts: &Amounts, random: &mut Random) -> f64 {
    let (w, s, f, n) = (p[0], amounts.successes, amounts.failures, amounts.trials);
    let (low, high) = ((n - f).max(0.0), s.min(n));
    let mean = special::hypergeometric_log_sum(1.0, libm::log(w), s, f, n);
    if w == 0.0 || !mean.is_finite() {
        return low;
    }
    let ratio = |u: f64| w * (s - u) / (u + 1.0) * ((n - u) / (f - n + u + 1.0));
    let (mut down, mut left) = (mean.round().clamp(low, high), random.uniform());
    let mut f_down = libm::exp(special::hypergeometric_log_mass(0.0, down, w, s, f, n));
    let (mut up, mut f_up) = (down, f_down);
    left -= f_down;
    let mut last = down;
    while left > 0.0 && (f_down > 0.0 || f_up > 0.0) {
        f_up = if up < high { f_up * ratio(up) } else { 0.0 };
        up += 1.0;
        if f_up > 0.0 {
            last = up;
            left -= f_up;
            if left <= 0.0 {
                break;
            }
        }
        down -= 1.0;
        f_down = if down >= low { f_down / ratio(down) } else { 0.0 };
        if f_down > 0.0 {
            last = down;
            left -= f_down;
        }
    }
    last
}
