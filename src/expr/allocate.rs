//! Registers: which operation writes where, and when each sum over rows runs.

use std::collections::HashMap;

use super::program::{Op, Program, Source, Step};

/// Gives virtual registers physical ones, each free again after its last use; each gather runs as soon as its operands are
/// there, so that few registers are alive at once.
pub(super) fn allocate(program: &mut Program, ops: Vec<Op>, predictors: usize) {
    let total = predictors + ops.len();
    let register = |s: Source| match s {
        Source::Register(r) => Some(r as usize),
        _ => None,
    };
    // time runs in half steps: operation `at` at 2 at, the gathers after it at 2 at + 1
    let mut last: Vec<usize> = vec![0; total];
    let mut gathers: Vec<Vec<usize>> = vec![Vec::new(); ops.len() + 1];
    for (at, op) in ops.iter().enumerate() {
        op.sources().into_iter().filter_map(register).for_each(|r| last[r] = last[r].max(2 * at));
        last[predictors + at] = last[predictors + at].max(2 * at + 1);
    }
    for (i, g) in program.gathers.iter().enumerate() {
        let sources = g.sources();
        // after operation n - 1 is place n; place 0 is before all of them
        let place = sources.iter().filter_map(|&s| register(s)).map(|r| (r + 1).saturating_sub(predictors)).max();
        let place = place.unwrap_or(0);
        gathers[place].push(i);
        for r in sources.into_iter().filter_map(register) {
            last[r] = last[r].max((2 * place).saturating_sub(1));
        }
    }
    program.rows.iter().filter_map(|r| r.source).filter_map(register).for_each(|r| last[r] = usize::MAX);
    let mut ends: HashMap<usize, Vec<usize>> = HashMap::new();
    for (r, &at) in last.iter().enumerate().skip(predictors) {
        ends.entry(at).or_default().push(r);
    }
    let mut place: Vec<u16> = (0..total as u16).collect();
    let mut free: Vec<u16> = Vec::new();
    let mut next = predictors as u16;
    let moved = |place: &[u16], s: Source| match s {
        Source::Register(r) => Source::Register(place[r as usize]),
        other => other,
    };
    let list = std::mem::take(&mut program.gathers);
    let emit = |steps: &mut Vec<Step>, place: &[u16], which: &[usize]| {
        steps.extend(which.iter().map(|&i| Step::Gather(i as u32, list[i].map(|s| moved(place, s)))));
    };
    let mut steps = Vec::with_capacity(ops.len() + list.len());
    emit(&mut steps, &place, &gathers[0]);
    for (at, mut op) in ops.into_iter().enumerate() {
        // the target is taken before this operation's sources are given back: a target is never its own source
        let target = free.pop().unwrap_or_else(|| {
            next += 1;
            next - 1
        });
        op.map(&|s| moved(&place, s));
        place[predictors + at] = target;
        steps.push(Step::Op(target, op));
        emit(&mut steps, &place, &gathers[at + 1]);
        for time in [2 * at, 2 * at + 1] {
            free.extend(ends.get(&time).into_iter().flatten().map(|&r| place[r]));
        }
    }
    for r in &mut program.rows {
        r.source = r.source.map(|s| moved(&place, s));
    }
    program.gathered = list.len();
    program.steps = steps;
    program.registers = next as usize;
}
