//! The tile works: three kilns (north, middle, south) whose tiles, flaws and loads are all invented here.

use std::fmt::Write;

/// Splitmix64 (Steele, Lea and Flood, 2014): one word of state, the same numbers on every machine.
struct Source(u64);

impl Source {
    fn word(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// Uniform in the open interval from 0 to 1.
    fn uniform(&mut self) -> f64 {
        ((self.word() >> 11) as f64 + 0.5) / (1u64 << 53) as f64
    }

    /// Standard normal, by the polar angle and radius of two uniforms; libm gives the same bits everywhere.
    fn normal(&mut self) -> f64 {
        let (u, v) = (self.uniform(), self.uniform());
        libm::sqrt(-2.0 * libm::log(u)) * libm::cos(2.0 * std::f64::consts::PI * v)
    }

    /// Poisson count: how many exponential waits fit into the mean.
    fn count(&mut self, mean: f64) -> u32 {
        let (mut waited, mut n) = (0.0, 0);
        loop {
            waited -= libm::log(self.uniform());
            if waited > mean {
                return n;
            }
            n += 1;
        }
    }
}

/// Every file with its text.
pub fn files() -> [(&'static str, String); 4] {
    let tiles = thicknesses();
    [
        ("pallet.csv", pallet(&tiles)),
        ("pallet_bins.csv", bins(&tiles)),
        ("flaws.csv", flaws()),
        ("strength.csv", strength()),
    ]
}

/// Calibrated kilns: mean and standard deviation of thickness in mm, and the share of the pallet really drawn from each.
/// The delivery note claims twice as many tiles from north as from south; the truth here is short of that.
const KILNS: [(f64, f64, f64); 3] = [(9.6, 0.20, 0.42), (10.1, 0.18, 0.30), (10.6, 0.24, 0.28)];

/// 480 tiles in hundredths of a mm.
fn thicknesses() -> Vec<i64> {
    let mut source = Source(2026);
    (0..480)
        .map(|_| {
            let mut u = source.uniform();
            let &(mean, sd, _) = KILNS
                .iter()
                .find(|k| {
                    u -= k.2;
                    u < 0.0
                })
                .unwrap_or(&KILNS[2]);
            libm::round((mean + sd * source.normal()) * 100.0) as i64
        })
        .collect()
}

fn pallet(tiles: &[i64]) -> String {
    let mut out = String::from("tile,thickness\n");
    for (i, t) in tiles.iter().enumerate() {
        let _ = writeln!(out, "{},{}.{:02}", i + 1, t / 100, t % 100);
    }
    out
}

/// The same tiles through a gauge with slots 0.15 mm apart, from 9.255 mm on: half-way between two readings of the
/// micrometer, so no tile sticks in one.
fn bins(tiles: &[i64]) -> String {
    let slots: Vec<i64> = (0..12).map(|k| 9255 + 150 * k).collect();
    let mut out = String::from("from,to,tiles\n");
    for k in 0..=slots.len() {
        let (low, high) = (k.checked_sub(1).map(|j| slots[j]), slots.get(k).copied());
        let n = tiles.iter().filter(|&&t| low.is_none_or(|s| 10 * t > s) && high.is_none_or(|s| 10 * t < s)).count();
        let text = |slot: Option<i64>| slot.map_or(String::new(), |s| format!("{}.{:03}", s / 1000, s % 1000));
        let _ = writeln!(out, "{},{},{n}", text(low), text(high));
    }
    out
}

/// 45 inspections: flaws on an inspected area in square metres. The budget is 4 : 3 : 2 flaws a square metre, in that
/// order of kilns; the truth is near it.
fn flaws() -> String {
    let mut source = Source(7);
    let mut out = String::from("inspection,kiln,area,flaws\n");
    for i in 0..45 {
        let (kiln, rate) = [("north", 0.80), ("middle", 0.66), ("south", 0.40)][i % 3];
        let area = 30 + source.word() % 91;
        let n = source.count(rate * area as f64 / 10.0);
        let _ = writeln!(out, "{},{kiln},{}.{},{n}", i + 1, area / 10, area % 10);
    }
    out
}

/// 60 tiles broken across two supports: load in N; width, thickness and span in mm. Loads follow the powers 1, 2 and -1
/// nearly, so that a tile of twice the size bears nearly four times the load.
fn strength() -> String {
    let mut source = Source(41);
    let mut out = String::from("tile,width,thickness,span,load\n");
    for i in 1..=60 {
        let width = 80 + source.word() % 121;
        let tenths = 70 + source.word() % 61;
        let span = 100 + source.word() % 151;
        let (w, t, s) = (width as f64, tenths as f64 / 10.0, span as f64);
        let log_load =
            libm::log(18.0) + 0.98 * libm::log(w) + 2.03 * libm::log(t) - 0.97 * libm::log(s) + 0.09 * source.normal();
        let _ =
            writeln!(out, "{i},{width},{}.{},{span},{}", tenths / 10, tenths % 10, libm::round(libm::exp(log_load)));
    }
    out
}
