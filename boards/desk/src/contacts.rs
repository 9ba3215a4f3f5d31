//! Passes of a spacecraft over a site in a window of time.
//!
//! The search walks in steps of 8 s where the spacecraft could be in view, so that no pass longer than that is
//! missed, whatever the orbit and the mask; shorter ones are found where the elevation turns between two steps.
//! Far from the horizon the step is the time that the spacecraft's greatest possible speed needs to reach it, which
//! saves nearly all of the work. Rise and set are then found as roots to a microsecond.

use crate::geometric::{Direction, GeometricModel, Sight};
use crate::horizon::Horizon;
use crate::orbit::OrbitError;
use std::f64::consts::FRAC_PI_2;

/// Longest step where the spacecraft could be in view, s.
const STEP: f64 = 8.0;
/// A turning point farther from the horizon than this cannot reach it within a step, rad.
const TURN: f64 = 0.1;
/// How exactly rise, set and closest approach are found, s.
const ROOT: f64 = 1e-6;

/// One pass, or the part of it that lies in the window. Times in seconds from the reference epoch.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Contact {
    /// First instant in view.
    pub start: f64,
    /// Last instant in view.
    pub end: f64,
    /// Whether it rises at `start`; otherwise it was in view already when the window began.
    pub rises: bool,
    /// Whether it sets at `end`; otherwise it is still in view when the window ends.
    pub sets: bool,
    /// Azimuth at `start`, rad.
    pub start_azimuth: f64,
    /// Azimuth at `end`, rad.
    pub end_azimuth: f64,
    /// When it is closest.
    pub closest: f64,
    /// How close, m.
    pub closest_range: f64,
    /// When it is highest.
    pub highest: f64,
    /// How high, rad.
    pub highest_elevation: f64,
    /// Largest shift as a part of the carrier, with its sign.
    pub largest_offset: f64,
    /// Steepest rate of the shift as a part of the carrier per second, with its sign.
    pub steepest_rate: f64,
}

/// What a search has found.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Found {
    /// Passes in order of time.
    pub contacts: Vec<Contact>,
    /// The highest elevation above the horizon (below: negative) among the instants looked at, rad, and when.
    pub best: Option<(f64, f64)>,
    /// Why the search ended before the window did, if it did.
    pub ended: Option<OrbitError>,
}

/// Passes between `from` and `to` seconds from the reference epoch.
pub fn find(
    model: &GeometricModel,
    horizon: &Horizon,
    direction: Direction,
    (from, to): (f64, f64),
) -> Found {
    let search = Search { model, horizon, direction };
    let (looks, mut ended) = search.looks(from, to);
    let best =
        looks.iter().max_by(|a, b| a.clearance.total_cmp(&b.clearance)).map(|look| (look.clearance, look.t));
    let contacts = search.contacts(&looks).unwrap_or_else(|error| {
        ended = ended.take().or(Some(error));
        Vec::new()
    });
    Found { contacts, best, ended }
}

struct Search<'a> {
    model: &'a GeometricModel,
    horizon: &'a Horizon,
    direction: Direction,
}

/// The elevation above the horizon at one instant, rad; in view while positive.
#[derive(Clone, Copy)]
struct Look {
    t: f64,
    clearance: f64,
}

impl Search<'_> {
    /// All instants looked at, and why they end before `to` if they do.
    fn looks(&self, from: f64, to: f64) -> (Vec<Look>, Option<OrbitError>) {
        let mut looks: Vec<Look> = Vec::new();
        let mut t = from;
        loop {
            let sight = match self.sight(t) {
                Ok(sight) => sight,
                Err(error) => return (looks, Some(error)),
            };
            let clearance = self.above_horizon(&sight);
            looks.push(Look { t, clearance });
            if let [.., before, middle, after] = looks.as_slice() {
                match self.turn(*before, *middle, *after) {
                    Ok(Some(turn)) => looks.insert(looks.len() - if turn.t < middle.t { 2 } else { 1 }, turn),
                    Ok(None) => {}
                    Err(error) => return (looks, Some(error)),
                }
            }
            if t >= to {
                return (looks, None);
            }
            t = (t + self.stride(&sight)).min(to);
        }
    }

    /// The turning point between three looks, if it lies on the other side of the horizon than they do.
    ///
    /// It finds passes (and gaps) that are over between two looks.
    fn turn(&self, before: Look, middle: Look, after: Look) -> Result<Option<Look>, OrbitError> {
        let side = if middle.clearance > 0.0 { -1.0 } else { 1.0 };
        let turns = side * middle.clearance >= side * before.clearance
            && side * middle.clearance >= side * after.clearance;
        if !turns || middle.clearance.abs() > TURN {
            return Ok(None);
        }
        let value = |t: f64| Ok(side * self.clearance(t)?);
        let t = peak(&[before.t, middle.t, after.t], &value)?;
        let clearance = self.clearance(t)?;
        Ok((side * clearance > 0.0).then_some(Look { t, clearance }))
    }

    /// The runs of looks in view, with exact ends.
    fn contacts(&self, looks: &[Look]) -> Result<Vec<Contact>, OrbitError> {
        let (Some(first), Some(last)) = (looks.first(), looks.last()) else { return Ok(Vec::new()) };
        let mut contacts = Vec::new();
        let mut start = (first.clearance > 0.0).then_some((first.t, false));
        for pair in looks.windows(2) {
            match start {
                None if pair[1].clearance > 0.0 => start = Some((self.crossing(pair[0].t, pair[1].t)?, true)),
                Some(begun) if pair[1].clearance <= 0.0 => {
                    contacts.push(self.contact(begun, (self.crossing(pair[1].t, pair[0].t)?, true))?);
                    start = None;
                }
                _ => {}
            }
        }
        if let Some(begun) = start {
            contacts.push(self.contact(begun, (last.t, false))?);
        }
        Ok(contacts)
    }

    fn sight(&self, t: f64) -> Result<Sight, OrbitError> {
        self.model.sight(t, self.direction)
    }

    /// Elevation above the horizon, rad; in view while positive.
    fn clearance(&self, t: f64) -> Result<f64, OrbitError> {
        Ok(self.above_horizon(&self.sight(t)?))
    }

    fn above_horizon(&self, Sight { look, .. }: &Sight) -> f64 {
        look.elevation - self.horizon.elevation(look.azimuth)
    }

    /// How far the next look may be away.
    ///
    /// Seen from the site, an elevation is a cone; the spacecraft cannot cross it before it has covered its
    /// distance from it. Between the lowest and the highest elevation of a mask nothing is saved.
    fn stride(&self, sight: &Sight) -> f64 {
        let below = self.horizon.lowest() - sight.look.elevation;
        let above = sight.look.elevation - self.horizon.highest();
        let angle = below.max(above).clamp(0.0, FRAC_PI_2);
        STEP.max(sight.range * angle.sin() / self.model.orbit().fastest())
    }

    /// Where the clearance changes its sign, between a time out of view and one in view.
    fn crossing(&self, mut out: f64, mut within: f64) -> Result<f64, OrbitError> {
        while (within - out).abs() > ROOT {
            let middle = (within + out) / 2.0;
            if self.clearance(middle)? > 0.0 { within = middle } else { out = middle }
        }
        Ok(within)
    }

    /// The figures of a pass between two instants.
    fn contact(&self, (start, rises): (f64, bool), (end, sets): (f64, bool)) -> Result<Contact, OrbitError> {
        let step = STEP.max(self.model.orbit().period() / 720.0);
        let count = ((end - start) / step).ceil().max(16.0);
        let times: Vec<f64> =
            (0..=count as usize).map(|at| start + (end - start) * at as f64 / count).collect();
        let elevation = |t: f64| Ok(self.sight(t)?.look.elevation);
        let nearness = |t: f64| Ok(-self.sight(t)?.range);
        let offset = |t: f64| Ok(self.sight(t)?.rapidity.exp_m1());
        // A decaying orbit may end with the pass; then the last instant stands for what would follow.
        let rate = |t: f64| {
            let right = if self.sight(t + 0.5).is_ok() { t + 0.5 } else { t };
            Ok((offset(right)? - offset(t - 0.5)?) / (right - (t - 0.5)))
        };
        let size = |t: f64| Ok(offset(t)?.abs());
        let steepness = |t: f64| Ok(rate(t)?.abs());
        let closest = self.closest(peak(&times, &nearness)?, (start, end))?;
        let highest = peak(&times, &elevation)?;
        Ok(Contact {
            start,
            end,
            rises,
            sets,
            start_azimuth: self.sight(start)?.look.azimuth,
            end_azimuth: self.sight(end)?.look.azimuth,
            closest,
            closest_range: self.sight(closest)?.range,
            highest,
            highest_elevation: elevation(highest)?,
            largest_offset: offset(peak(&times, &size)?)?,
            steepest_rate: rate(peak(&times, &steepness)?)?,
        })
    }

    /// The root of the range rate beside a nearest point that was found by its range.
    fn closest(&self, near: f64, (start, end): (f64, f64)) -> Result<f64, OrbitError> {
        let rate = |t: f64| Ok::<_, OrbitError>(self.sight(t)?.range_rate);
        let (mut coming, mut going) = ((near - 1.0).max(start), (near + 1.0).min(end));
        if rate(coming)? > 0.0 || rate(going)? < 0.0 {
            return Ok(near);
        }
        while going - coming > ROOT {
            let middle = (coming + going) / 2.0;
            if rate(middle)? < 0.0 { coming = middle } else { going = middle }
        }
        Ok((coming + going) / 2.0)
    }
}

/// Where a function is largest: the best of the given times, refined between its neighbours.
fn peak(times: &[f64], value: &dyn Fn(f64) -> Result<f64, OrbitError>) -> Result<f64, OrbitError> {
    let mut best = (0, f64::NEG_INFINITY);
    for (at, &t) in times.iter().enumerate() {
        let here = value(t)?;
        if here > best.1 {
            best = (at, here);
        }
    }
    let (mut left, mut right) = (times[best.0.saturating_sub(1)], times[(best.0 + 1).min(times.len() - 1)]);
    let ratio = (5f64.sqrt() - 1.0) / 2.0;
    while right - left > 1e-3 {
        let (low, high) = (right - ratio * (right - left), left + ratio * (right - left));
        if value(low)? > value(high)? { right = high } else { left = low }
    }
    let refined = (left + right) / 2.0;
    Ok(if value(refined)? > best.1 { refined } else { times[best.0] })
}
