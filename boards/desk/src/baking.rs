//! Baking a pass: which one it is, its arc, its table, and how far the arc may be from the orbit.

use crate::SPEED_OF_LIGHT;
use crate::contacts::{self, Contact};
use crate::elements::ElementSet;
use crate::frames::{EARTH_ROTATION, Site};
use crate::geometric::{Direction, GeometricModel};
use crate::horizon::Horizon;
use crate::instant;
use crate::orbit::Orbit;
use anyhow::{Context, anyhow, ensure};
use chrono::{DateTime, Utc};
use shiftkeel::pass::bake::{Audit, Request, audit, bake_arc};
use shiftkeel::pass::{
    Arc, ArcError, ArcModel, ArcSettings, Direction as Signal, Geometry, MAX_ARC_WORDS, PassTable,
    Site as Ground, TaggedAt,
};
use shiftkeel::time::GpsTime;
use shiftkeel::tuning::Bound;

/// How far the arc reaches beyond the table at both ends, s.
const ARC_MARGIN: f64 = 5.0;
/// Largest velocity error of an arc that is tried first, mm/s.
const ARC_MILLIMETRES: f64 = 0.1;
/// Where trying looser ones ends, m/s.
const LOOSEST_ARC: f64 = 0.05;
/// How far a pass is searched for, days.
const SEARCH_DAYS: i64 = 14;
/// Words that the largest table takes.
const MOST_TABLE_WORDS: usize = 4096;
/// Places at which the arc is held against the orbit.
const ARC_LOOKS: u32 = 1024;
/// Factor on the largest of these: the residual is a polynomial of degree 27 at most beside the noise, so 1024
/// places leave out below 1 %. A jump of SGP4's own position shows in [`Orbit::derivative`] for 3 s, so at some place.
/// The rest is reserve.
const ARC_MARGIN_FACTOR: f64 = 1.25;
/// Least reserve: what f64 rounds positions and their rates to, m and m/s.
const ARC_FLOOR: f64 = 1e-6;

/// Which pass.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Which {
    /// The one in progress at this time.
    At(DateTime<Utc>),
    /// The first that is in view at this time or later.
    After(DateTime<Utc>),
}

/// What is to be baked.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Order {
    /// Carrier for which the tolerances hold, Hz.
    pub carrier: f64,
    /// Largest frequency error of the table, mHz.
    pub millihertz: f64,
    /// Largest phase error of the table, cycles.
    pub cycles: f64,
    /// Largest velocity error of the arc, mm/s on each axis; without it 0.1, or what the pass allows.
    pub arc_millimetres: Option<f64>,
    /// Which way the signal goes.
    pub direction: Direction,
    /// End at which time is read.
    pub tagged_at: TaggedAt,
    /// Whether the table shall answer for lateness.
    pub lateness_partial: bool,
    /// UT1 - UTC, s.
    pub dut1: f64,
}

/// One pass of one object over one site; times in seconds from a reference epoch in its middle.
#[derive(Clone, Debug)]
pub struct Pass {
    /// The orbit, from the reference epoch.
    pub orbit: Orbit,
    /// The site.
    pub site: Site,
    /// First instant in view.
    pub start: f64,
    /// Last instant in view.
    pub end: f64,
    /// Highest elevation, rad.
    pub highest: f64,
}

impl Pass {
    /// Finds it.
    ///
    /// # Errors
    /// When there is none, or the orbit cannot be followed there.
    pub fn find(
        set: &ElementSet,
        site: Site,
        dut1: f64,
        which: Which,
        horizon: &Horizon,
    ) -> anyhow::Result<Self> {
        let (time, found) = match which {
            Which::At(time) => (time, Self::search(set, site, dut1, horizon, time, (-0.5, 0.5))?),
            Which::After(time) => {
                let mut found = Vec::new();
                for day in 0..SEARCH_DAYS {
                    // Half a day more, so that a pass that begins in this day is whole.
                    let window = (day as f64, day as f64 + 1.5);
                    found = Self::search(set, site, dut1, horizon, time, window)?;
                    if !found.is_empty() {
                        break;
                    }
                }
                (time, found)
            }
        };
        let (name, text) = (set.label(), instant::write(time));
        let contact = match which {
            Which::At(_) => found.iter().find(|contact| (contact.start..=contact.end).contains(&0.0)).ok_or_else(|| {
                anyhow!("{name} is not in view at {text}; `shiftkeel contacts` lists its passes, or give --after")
            })?,
            Which::After(_) => found
                .first()
                .ok_or_else(|| anyhow!("{name} does not come into view within {SEARCH_DAYS} days of {text}"))?,
        };
        ensure!(
            contact.sets && (contact.rises || contact.start == 0.0),
            "{name} is in view for longer than half a day round {text}: too long for one arc"
        );
        Self::of(set, site, time, contact)
    }

    fn search(
        set: &ElementSet,
        site: Site,
        dut1: f64,
        horizon: &Horizon,
        time: DateTime<Utc>,
        days: (f64, f64),
    ) -> anyhow::Result<Vec<Contact>> {
        let model = GeometricModel::new(Orbit::new(set, time)?, site, dut1);
        let window = (days.0 * 86_400.0, days.1 * 86_400.0);
        let found = contacts::find(&model, horizon, Direction::Down, window);
        match found.ended {
            Some(error) if found.contacts.is_empty() => Err(error.into()),
            _ => Ok(found.contacts),
        }
    }

    fn of(set: &ElementSet, site: Site, time: DateTime<Utc>, contact: &Contact) -> anyhow::Result<Self> {
        // A whole second, so that UTC, GPS time and f64 seconds all hold it exactly.
        let middle = instant::after(time, (contact.start + contact.end) / 2.0)
            .context("the pass is beyond the calendar")?;
        let reference =
            DateTime::from_timestamp(middle.timestamp(), 0).context("the pass is beyond the calendar")?;
        let shift = instant::seconds_between(time, reference);
        Ok(Self {
            orbit: Orbit::new(set, reference)?,
            site,
            start: contact.start - shift,
            end: contact.end - shift,
            highest: contact.highest_elevation,
        })
    }

    /// The reference epoch.
    pub const fn reference(&self) -> DateTime<Utc> {
        self.orbit.reference()
    }

    /// The reference epoch as GPS time.
    ///
    /// # Errors
    /// Outside 1980 to 2252.
    pub fn reference_gps(&self) -> anyhow::Result<GpsTime> {
        gps(self.reference())
    }

    /// UTC of a time of the pass, to a millisecond.
    pub fn utc(&self, seconds: f64) -> String {
        let rounded = (seconds * 1e3).round() * 1e-3;
        instant::after(self.reference(), rounded).map_or_else(String::new, instant::write)
    }
}

/// GPS time of an instant.
///
/// # Errors
/// Outside 1980 to 2252.
pub fn gps(time: DateTime<Utc>) -> anyhow::Result<GpsTime> {
    Ok(GpsTime::from_unix(time.timestamp(), time.timestamp_subsec_nanos())?)
}

/// The crate's name for a direction.
pub const fn signal(direction: Direction) -> Signal {
    match direction {
        Direction::Down => Signal::Down,
        Direction::Up => Signal::Up,
        Direction::TwoWay => Signal::TwoWay,
    }
}

/// An arc and a table, and what is known of them.
#[derive(Clone, Debug)]
pub struct Baked {
    /// The pass.
    pub pass: Pass,
    /// What was asked for.
    pub order: Order,
    /// Words of the arc.
    pub arc: Vec<u32>,
    /// Words of the table.
    pub table: Vec<u32>,
    /// How far the arc, seen from the site, may be from the orbit.
    pub arc_bound: Bound,
}

impl Baked {
    /// Fits the arc and bakes the table.
    ///
    /// # Errors
    /// When the site, the span or the tolerances cannot be used.
    pub fn new(pass: Pass, set: &ElementSet, order: Order) -> anyhow::Result<Self> {
        let arc = fit(&pass, set, &order)?;
        let arc_bound = arc_bound(&pass, &Arc::new(&arc)?, &order)?;
        let mut baked = Self { pass, order, arc, table: Vec::new(), arc_bound };
        let geometry = baked.geometry(0.0)?;
        let reference = baked.pass.reference_gps()?;
        let request = Request {
            start: reference.plus_seconds(baked.pass.start),
            end: reference.plus_seconds(baked.pass.end),
            slope_tolerance: order.millihertz * 1e-3 / order.carrier,
            delay_tolerance: order.cycles / order.carrier,
            lateness_partial: order.lateness_partial,
        };
        let mut words = vec![0; MOST_TABLE_WORDS];
        let table = bake_arc(&mut words, &Arc::new(&baked.arc)?, &geometry, &request).with_context(|| {
            format!(
                "no table for {} mHz and {} cycles at {} MHz",
                order.millihertz,
                order.cycles,
                order.carrier * 1e-6
            )
        })?;
        baked.table = table.words().to_vec();
        Ok(baked)
    }

    /// The arc seen from the site, for a spacecraft that is `lateness` s late.
    ///
    /// # Errors
    /// When the site is outside what the crate takes.
    pub fn geometry(&self, lateness: f64) -> anyhow::Result<Geometry> {
        let site = &self.pass.site;
        let (latitude, longitude) = (site.latitude().to_degrees(), site.longitude().to_degrees());
        let ground = Ground::geodetic(latitude, longitude, site.height())?;
        let direction = signal(self.order.direction);
        Ok(Geometry::new(&Arc::new(&self.arc)?, &ground, direction, self.order.tagged_at, lateness)?)
    }

    /// Checks words that claim to be this table, without trusting how they were made: read, and held against the
    /// geometry every `step` s.
    ///
    /// # Errors
    /// When they are no table, or not this one within its proven errors.
    pub fn verify(&self, words: &[u32], step: f64) -> anyhow::Result<Audit> {
        let table = PassTable::new(words)?;
        let geometry = self.geometry(0.0)?;
        let origin = table.start().seconds_since(geometry.origin());
        let seen = audit(&table, step, |t| geometry.delay_and_rapidity(origin + t).0)?;
        let unit = (-60f64).exp2();
        let (delay, slope) = (f64::from(table.proven_delay()) * unit, f64::from(table.proven_slope()) * unit);
        let noise = f64::from(table.evaluation_noise()) * unit / step;
        ensure!(
            seen.worst_delay <= delay && seen.worst_slope <= slope + noise,
            "the table is off by {:.3e} s and {:.3e} of the carrier, more than the proven {delay:.3e} s and \
             {slope:.3e}: it belongs to another pass or site, or the bake is defective",
            seen.worst_delay,
            seen.worst_slope,
        );
        Ok(seen)
    }
}

fn fit(pass: &Pass, set: &ElementSet, order: &Order) -> anyhow::Result<Vec<u32>> {
    let half = (pass.end.max(-pass.start) + ARC_MARGIN).ceil();
    let reference = pass.reference_gps()?;
    let model = GeometricModel::new(pass.orbit.clone(), pass.site, order.dut1);
    // The propagator is asked for its ends first, so that its own message tells why there is no orbit.
    model.earth_fixed(-half)?;
    model.earth_fixed(half)?;
    let position = |t: f64| {
        let found = model.earth_fixed(t - half).map(|state| state.position);
        found.map_or([f64::NAN; 3], |place| [place.x, place.y, place.z])
    };
    let settings = ArcSettings {
        start: reference.plus_seconds(-half),
        end: reference.plus_seconds(half),
        object: set.number,
        element_epoch: gps(set.epoch)?,
        model: ArcModel::Sgp4,
        velocity_tolerance: 0.0,
    };
    let mut words = [0; MAX_ARC_WORDS];
    let mut tolerance = order.arc_millimetres.unwrap_or(ARC_MILLIMETRES) * 1e-3;
    loop {
        let settings = ArcSettings { velocity_tolerance: tolerance, ..settings };
        match Arc::fit(&mut words, &settings, position) {
            Ok(arc) => return Ok(arc.words().to_vec()),
            // A long pass is held less closely, unless it was said how closely.
            Err(ArcError::TooCurved) if order.arc_millimetres.is_none() && tolerance < LOOSEST_ARC => {
                tolerance *= 2.0
            }
            Err(error) => {
                return Err(error)
                    .with_context(|| format!("no arc over the {:.0} s of this pass", 2.0 * half));
            }
        }
    }
}

/// How far the arc may be from the orbit, along the line of sight of the site.
///
/// The residual of position and velocity against SGP4 is taken at 1024 places; an error of the velocity along the
/// line of sight counts in full, one of the position across it by the rate at which the line of sight turns. The
/// largest is raised by a quarter.
fn arc_bound(pass: &Pass, arc: &Arc<'_>, order: &Order) -> anyhow::Result<Bound> {
    let model = GeometricModel::new(pass.orbit.clone(), pass.site, order.dut1);
    let trajectory = arc.trajectory();
    let site = pass.site.earth_fixed();
    let (mut rate, mut range) = (0.0_f64, 0.0_f64);
    for look in 0..=ARC_LOOKS {
        let t = pass.start + (pass.end - pass.start) * f64::from(look) / f64::from(ARC_LOOKS);
        let mut true_state = model.rotation().to_earth_fixed(pass.orbit.derivative(t)?, t);
        // The derivative of the position, with the rate at which the frame really turns.
        let slower = EARTH_ROTATION - model.rotation().rate();
        true_state.velocity = true_state.velocity + true_state.position.swept_about_z(slower);
        let ([x, y, z], [u, v, w]) = trajectory.at(t);
        let off = crate::vector::Vector::new(x, y, z) - true_state.position;
        let off_rate = crate::vector::Vector::new(u, v, w) - true_state.velocity;
        let line = true_state.position - site;
        let unit = line * (1.0 / line.length());
        let across = true_state.velocity - unit * unit.dot(true_state.velocity);
        rate = rate.max((unit.dot(off_rate) + across.dot(off) / line.length()).abs());
        range = range.max(unit.dot(off).abs());
    }
    let legs = if order.direction == Direction::TwoWay { 2.0 } else { 1.0 };
    let wavelengths = legs * order.carrier / SPEED_OF_LIGHT;
    Ok(Bound {
        hertz: wavelengths * (ARC_MARGIN_FACTOR * rate + ARC_FLOOR),
        cycles: wavelengths * (ARC_MARGIN_FACTOR * range + ARC_FLOOR),
    })
}

/// Words as little-endian bytes.
pub fn bytes(words: &[u32]) -> Vec<u8> {
    words.iter().flat_map(|word| word.to_le_bytes()).collect()
}

/// Words from little-endian bytes.
///
/// # Errors
/// When their number is not a multiple of four.
pub fn words(bytes: &[u8]) -> anyhow::Result<Vec<u32>> {
    ensure!(
        bytes.len().is_multiple_of(4),
        "{} bytes are no whole number of 32-bit words: cut short",
        bytes.len()
    );
    Ok(bytes.chunks_exact(4).map(|four| u32::from_le_bytes([four[0], four[1], four[2], four[3]])).collect())
}
