//! Away from a stationary point that is no maximum, along negative curvature.

use super::frame::{Frame, Point};
use super::local::Local;
use super::restore::restore;
use crate::math::Vector;

/// Eigenvalues below minus this part of the largest are negative (the contract's threshold).
pub(super) const NEGATIVE: f64 = 1e-9;

/// A point with higher l, reached along the direction of most negative curvature that the edges leave free; with
/// the curvature met (0 if none is negative). `None`: no such direction, or none that leads up.
pub(super) fn escape(frame: &Frame, point: &Point, local: &Local) -> Option<Point> {
    let rows = local.rows(frame, &local.strong(frame));
    let (values, vectors) = local.spectrum(&rows.z)?;
    let low = *values.first()?;
    let largest = values.iter().fold(0.0, |a: f64, v| a.max(v.abs()));
    if low >= -NEGATIVE * largest {
        return None;
    }
    let direction = vectors.column(0).into_owned();
    let up = if local.g.dot(&direction) < 0.0 { -1.0 } else { 1.0 };
    [up, -up].into_iter().find_map(|sign| climb(frame, point, local, &(&direction * sign), -low))
}

/// Goes along a direction (by u) until l gains what the curvature promises, then on while that pays.
fn climb(frame: &Frame, point: &Point, local: &Local, direction: &Vector, curvature: f64) -> Option<Point> {
    let reach = |length: f64| {
        let mut phi = frame.moved(&point.phi, &(direction * length), &local.d);
        if !frame.contains(&frame.theta(&phi)) {
            return None;
        }
        if frame.m > 0 {
            let back = restore(frame, &phi, &local.d)?;
            if !back.feasible() || !frame.contains(&frame.theta(&back.phi)) {
                return None;
            }
            phi = back.phi;
        }
        let value = frame.value(&phi);
        value.is_finite().then_some((phi, value))
    };
    let mut length = 1.0;
    let (mut phi, mut value) = loop {
        let promised = 0.5 * curvature * length * length;
        if promised < 1e-13 * (1.0 + point.value.abs()) {
            return None;
        }
        match reach(length) {
            Some((phi, value)) if value >= point.value + 0.1 * promised => break (phi, value),
            _ => length *= 0.25,
        }
    };
    for _ in 0..20 {
        length *= 2.0;
        match reach(length) {
            Some((further, higher)) if higher > value + 0.5 * (value - point.value) => (phi, value) = (further, higher),
            _ => break,
        }
    }
    frame.point(&phi)
}
