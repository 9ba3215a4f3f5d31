//! What is commonly done instead, on the same pass, against the same reference.

use super::Rehearsal;
use super::curve::Curve;
use crate::SPEED_OF_LIGHT;
use crate::geometric::{Direction, GeometricModel};
use crate::orbit::OrbitError;
use serde::Serialize;

/// Time between two looks, s: no multiple of it meets whole seconds every time.
const LOOK: f64 = 0.009_7;
/// Looks at most: a pass of hours is looked at less often.
const MOST_LOOKS: f64 = 200_000.0;

/// What an alternative would have been off by.
#[derive(Clone, Debug, Serialize)]
pub struct Alternative {
    /// What it does.
    pub name: &'static str,
    /// Worst error, Hz.
    pub worst_hz: f64,
    /// Root of the mean square, Hz.
    pub rms_hz: f64,
}

/// All of them.
///
/// # Errors
/// When the orbit cannot be followed.
pub fn all(rehearsal: &Rehearsal<'_>, span: (f64, f64)) -> Result<Vec<Alternative>, OrbitError> {
    let baked = rehearsal.baked;
    let truth = rehearsal.heard(&rehearsal.truth);
    let geometric = GeometricModel::new(baked.pass.orbit.clone(), baked.pass.site, baked.order.dut1);
    // Range rate of instantaneous geometry, with SGP4's own velocity, in place of the rapidity.
    let range_rate = Curve::hold(span.0, span.1, |t| {
        geometric.sight(t, Direction::Down).map(|sight| [sight.range, sight.range_rate])
    })?;
    let legs = if baked.order.direction == Direction::TwoWay { 2.0 } else { 1.0 };
    let factor = truth.sign * legs;
    let carrier = truth.carrier;
    let first_order = |t: f64| -factor * carrier * range_rate.at(t)[1] / SPEED_OF_LIGHT;
    let single = |t: f64| {
        let beta = (legs * range_rate.at(t)[1]) as f32 / SPEED_OF_LIGHT as f32;
        let tuned = carrier as f32 * (1.0 - truth.sign as f32 * beta);
        f64::from(tuned) - carrier
    };
    // A second of the list begins at a whole second of UTC, as lists do.
    let each_second = |t: f64| truth.shift(t.floor().max(span.0));
    let mid_second = |t: f64| truth.shift((t.floor() + 0.5).clamp(span.0, span.1));
    let between = |t: f64| {
        let (left, right) = (t.floor().max(span.0), (t.floor() + 1.0).min(span.1));
        let (from, to) = (truth.shift(left), truth.shift(right));
        if right > left { from + (to - from) * (t - left) / (right - left) } else { from }
    };
    let rows: [(&'static str, &dyn Fn(f64) -> f64); 5] = [
        ("first-order formula, no light time, no clocks", &first_order),
        ("the same with 32-bit floats", &single),
        ("one new frequency a second, for its start", &each_second),
        ("one new frequency a second, for its middle", &mid_second),
        ("straight lines between a list's seconds", &between),
    ];
    let step = LOOK.max((span.1 - span.0) / MOST_LOOKS);
    Ok(rows
        .map(|(name, shift)| {
            let looks = ((span.1 - span.0) / step) as u64;
            let (mut worst, mut squares) = (0.0_f64, 0.0);
            for look in 0..looks {
                let t = span.0 + look as f64 * step;
                let off = shift(t) - truth.shift(t);
                worst = worst.max(off.abs());
                squares += off * off;
            }
            Alternative { name, worst_hz: worst, rms_hz: (squares / looks.max(1) as f64).sqrt() }
        })
        .to_vec())
}
