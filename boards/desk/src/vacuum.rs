//! The full model in vacuum: light time, time dilation and potential, velocity as the derivative of position.
//!
//! TEME is the inertial frame; the site turns in it. Left out, each below 1e-13 of the frequency over a pass:
//! the signal's own delay in the Earth's potential, the tide of Sun and Moon, precession of the equinox. The
//! atmosphere is not part of it (see the excluded block of a rehearsal).
//!
//! Conventions, with tau the light time and y the rate of the spacecraft's clock against the site's:
//!
//! | direction | tagged at | light time | delay | received / transmitted |
//! |---|---|---|---|---|
//! | down | ground reception | s = t - tau | tau - Y(s) | (1 - tau')(1 + y(s)) |
//! | up | ground transmission | s = t + tau | tau + Y(s) | 1 / ((1 + tau')(1 + y(s))) |
//! | two-way | ground reception | down and up legs meet at the spacecraft | their sum | 1 - sum' |
//!
//! Y is the integral of y from the reference epoch, a prime the derivative by the tagged time. So the
//! received factor is `1 - delay'` down and two-way, and `1 / (1 + delay')` up.

use crate::SPEED_OF_LIGHT as C;
use crate::frames::{EARTH_RADIUS_WGS84, EarthRotation, Site};
use crate::geometric::{Direction, Sight};
use crate::orbit::{GRAVITATIONAL_PARAMETER, Orbit, OrbitError};
use crate::vector::{State, Vector};

/// Second zonal harmonic of the Earth's potential (EGM96, from memory).
pub const SECOND_ZONAL_HARMONIC: f64 = 1.082_626_7e-3;
/// Rate of geocentric coordinate time against terrestrial time (IAU 2000 resolution B1.9).
pub const GEOID_RATE: f64 = 6.969_290_134e-10;
/// Standard gravity, m/s^2.
const STANDARD_GRAVITY: f64 = 9.806_65;

/// Longest panel of the clock integral, s.
const CLOCK_PANEL: f64 = 30.0;

/// Rate of a clock in an inertial state against one on the geoid.
///
/// `L_G - (v^2/2 + U)/c^2` with `U = GM/r (1 - J2 (a/r)^2 (3 sin^2(latitude) - 1)/2)`.
///
/// # Source
/// IAU 2000 resolutions B1.4 and B1.9, terms to 1/c^2.
pub fn clock_rate(state: State) -> f64 {
    let radius = state.position.length();
    let sine = state.position.z / radius;
    let flat = EARTH_RADIUS_WGS84 / radius;
    let oblate = 1.0 - SECOND_ZONAL_HARMONIC * flat * flat * 1.5f64.mul_add(sine * sine, -0.5);
    let potential = GRAVITATIONAL_PARAMETER / radius * oblate;
    GEOID_RATE - (state.velocity.dot(state.velocity) / 2.0 + potential) / (C * C)
}

/// One way of the signal between spacecraft and site.
#[derive(Clone, Copy, Debug)]
struct Leg {
    /// Light time, s.
    time: f64,
    /// Its derivative by the tagged time.
    slope: f64,
    /// From site to spacecraft in TEME, m.
    line: Vector,
}

/// The reference model of one pass.
#[derive(Clone, Debug)]
pub struct VacuumModel {
    orbit: Orbit,
    site: Site,
    rotation: EarthRotation,
    direction: Direction,
    fixed: Vector,
    /// Y at multiples of [`CLOCK_PANEL`] from `first_panel` on.
    clock: Vec<f64>,
    first_panel: f64,
}

impl VacuumModel {
    /// For times from `from` to `to` s from the orbit's reference epoch, with `dut1` = UT1 - UTC in seconds.
    ///
    /// Keep the reference epoch within a few hours of the pass: the clock integral is 1e-10 of the time since.
    /// Other times work too, but slower.
    ///
    /// # Errors
    /// When the orbit gives no position somewhere in that span.
    pub fn new(
        orbit: Orbit,
        site: Site,
        dut1: f64,
        direction: Direction,
        (from, to): (f64, f64),
    ) -> Result<Self, OrbitError> {
        let rotation = EarthRotation::new(orbit.reference(), dut1);
        let first_panel = (from / CLOCK_PANEL).floor().min(0.0);
        let count = ((to / CLOCK_PANEL).ceil().max(0.0) - first_panel) as usize;
        let fixed = site.earth_fixed();
        let mut model = Self { orbit, site, rotation, direction, fixed, clock: vec![0.0], first_panel };
        let mut sum = 0.0;
        let mut nodes = Vec::with_capacity(count + 1);
        nodes.push(0.0);
        for panel in 0..count {
            let start = (first_panel + panel as f64) * CLOCK_PANEL;
            sum += model.clock_panel(start, CLOCK_PANEL)?;
            nodes.push(sum);
        }
        // Y is counted from the reference epoch, wherever the panels begin.
        let zero = nodes.get((-first_panel) as usize).copied().unwrap_or(0.0);
        model.clock = nodes.into_iter().map(|node| node - zero).collect();
        Ok(model)
    }

    /// The direction it was made for.
    pub const fn direction(&self) -> Direction {
        self.direction
    }

    /// The orbit.
    pub const fn orbit(&self) -> &Orbit {
        &self.orbit
    }

    /// The site.
    pub const fn site(&self) -> &Site {
        &self.site
    }

    /// Apparent delay, s, clocks included, at tagged time `t` s from the reference epoch.
    ///
    /// # Accuracy
    /// 1e-15 s near the element epoch, 1e-14 s ten days from it (noise of the position over c).
    ///
    /// # Errors
    /// When the orbit gives no position.
    pub fn delay(&self, t: f64) -> Result<f64, OrbitError> {
        match self.direction {
            Direction::Down => {
                let leg = self.downlink(t, Self::position)?;
                Ok(leg.time - self.clock_offset(t - leg.time)?)
            }
            Direction::Up => {
                let leg = self.uplink(t, Self::position)?;
                Ok(leg.time + self.clock_offset(t + leg.time)?)
            }
            Direction::TwoWay => {
                let down = self.downlink(t, Self::position)?;
                let up = self.uplink_received(t - down.time, Self::position)?;
                Ok(down.time + up.time)
            }
        }
    }

    /// ln(received / transmitted frequency) at tagged time `t`, positive = approaching.
    ///
    /// The slope of the light time is exact for the velocity of [`Orbit::derivative`]: no difference of delays
    /// is taken.
    ///
    /// # Accuracy
    /// 1e-15 near the element epoch, 1e-14 ten days from it (noise of the velocity over c); shown against an
    /// independent model in `tests/vacuum_model.rs`.
    ///
    /// # Errors
    /// When the orbit gives no position.
    pub fn rapidity(&self, t: f64) -> Result<f64, OrbitError> {
        Ok(self.sight(t)?.rapidity)
    }

    /// All that is seen at tagged time `t`; range and its rate are light time times c, one way (two-way: half).
    ///
    /// # Errors
    /// When the orbit gives no position.
    pub fn sight(&self, t: f64) -> Result<Sight, OrbitError> {
        let (leg, time, slope, rapidity) = match self.direction {
            Direction::Down => {
                let leg = self.downlink(t, Orbit::derivative)?;
                let clock = self.clock_rate(t - leg.time)?;
                (leg, leg.time, leg.slope, (-leg.slope).ln_1p() + clock.ln_1p())
            }
            Direction::Up => {
                let leg = self.uplink(t, Orbit::derivative)?;
                let clock = self.clock_rate(t + leg.time)?;
                (leg, leg.time, leg.slope, -leg.slope.ln_1p() - clock.ln_1p())
            }
            Direction::TwoWay => {
                let down = self.downlink(t, Orbit::derivative)?;
                let up = self.uplink_received(t - down.time, Orbit::derivative)?;
                let rapidity = (-down.slope).ln_1p() + (-up.slope).ln_1p();
                let slope = down.slope + up.slope * (1.0 - down.slope);
                (down, (down.time + up.time) / 2.0, slope / 2.0, rapidity)
            }
        };
        // Elevation and azimuth at the site at the tagged time, towards where the signal came from or goes.
        let look = self.site.look(leg.line.turned_about_z(-self.rotation.angle(t)));
        Ok(Sight { look, range: time * C, range_rate: slope * C, rapidity })
    }

    /// Where the spacecraft is, without a velocity.
    fn position(orbit: &Orbit, t: f64) -> Result<State, OrbitError> {
        orbit.state(t)
    }

    /// From the spacecraft to a site that receives at `t`: the spacecraft's time is sought.
    ///
    /// tau' = u.(v (1 - tau') - w)/c, u from site to spacecraft, v the spacecraft's velocity, w the site's.
    fn downlink(&self, t: f64, state: Propagation) -> Result<Leg, OrbitError> {
        let site = self.rotation.to_inertial(self.fixed, t);
        let time = self.light_time(t, -1.0)?;
        let spacecraft = state(&self.orbit, t - time)?;
        let line = spacecraft.position - site.position;
        let unit = line * (1.0 / line.length());
        let closing = unit.dot(spacecraft.velocity - site.velocity) / C;
        let slope = closing / (1.0 + unit.dot(spacecraft.velocity) / C);
        Ok(Leg { time: line.length() / C, slope, line })
    }

    /// From a site that transmits at `t` to the spacecraft: the spacecraft's time is sought.
    ///
    /// tau' = u.(v (1 + tau') - w)/c.
    fn uplink(&self, t: f64, state: Propagation) -> Result<Leg, OrbitError> {
        let site = self.rotation.to_inertial(self.fixed, t);
        let time = self.light_time(t, 1.0)?;
        let spacecraft = state(&self.orbit, t + time)?;
        let line = spacecraft.position - site.position;
        let unit = line * (1.0 / line.length());
        let closing = unit.dot(spacecraft.velocity - site.velocity) / C;
        let slope = closing / (1.0 - unit.dot(spacecraft.velocity) / C);
        Ok(Leg { time: line.length() / C, slope, line })
    }

    /// From a site to the spacecraft that receives at `s`: the site's time is sought.
    ///
    /// tau' = u.(v - w (1 - tau'))/c.
    fn uplink_received(&self, s: f64, state: Propagation) -> Result<Leg, OrbitError> {
        let spacecraft = state(&self.orbit, s)?;
        let mut time = 0.0;
        let mut site = self.rotation.to_inertial(self.fixed, s);
        // Each round gains a factor of c over the site's speed: three rounds are exact.
        for _ in 0..4 {
            time = (spacecraft.position - site.position).length() / C;
            site = self.rotation.to_inertial(self.fixed, s - time);
        }
        let line = spacecraft.position - site.position;
        let unit = line * (1.0 / line.length());
        let closing = unit.dot(spacecraft.velocity - site.velocity) / C;
        let slope = closing / (1.0 - unit.dot(site.velocity) / C);
        Ok(Leg { time, slope, line })
    }

    /// Light time between the site at `t` and the spacecraft that much later (`sign` 1) or earlier (-1).
    fn light_time(&self, t: f64, sign: f64) -> Result<f64, OrbitError> {
        let site = self.rotation.to_inertial(self.fixed, t).position;
        let mut time = 0.0;
        // Each round gains a factor of c over the spacecraft's speed, at least 2.5e4: four rounds pass f64.
        for _ in 0..4 {
            time = (self.orbit.state(t + sign * time)?.position - site).length() / C;
        }
        Ok(time)
    }

    /// Rate of the spacecraft's clock against the site's, which runs fast by g h / c^2.
    fn clock_rate(&self, s: f64) -> Result<f64, OrbitError> {
        Ok(clock_rate(self.orbit.state(s)?) - STANDARD_GRAVITY * self.site.height() / (C * C))
    }

    /// Y(s): what the spacecraft's clock has gained on the site's since the reference epoch.
    fn clock_offset(&self, s: f64) -> Result<f64, OrbitError> {
        let last = self.clock.len() - 1;
        let node = (s / CLOCK_PANEL - self.first_panel).floor().clamp(0.0, last as f64);
        let mut sum = self.clock.get(node as usize).copied().unwrap_or(0.0);
        let mut at = (node + self.first_panel) * CLOCK_PANEL;
        while at != s {
            let step = (s - at).clamp(-CLOCK_PANEL, CLOCK_PANEL);
            sum += self.clock_panel(at, step)?;
            at = if step.abs() < CLOCK_PANEL { s } else { at + step };
        }
        Ok(sum)
    }

    /// Integral of the clock rate over one panel: three-point Gauss-Legendre (exact for degree 5).
    fn clock_panel(&self, start: f64, length: f64) -> Result<f64, OrbitError> {
        let middle = start + length / 2.0;
        let reach = 0.6f64.sqrt() * length / 2.0;
        let outer = self.clock_rate(middle - reach)? + self.clock_rate(middle + reach)?;
        Ok((outer * 5.0 + self.clock_rate(middle)? * 8.0) * length / 18.0)
    }
}

/// How a leg gets the spacecraft's state.
type Propagation = fn(&Orbit, f64) -> Result<State, OrbitError>;
