//! A whole pass from an arc: the board receives it, bakes its own table, and flies it with its oscillator.
//!
//! The ground fits an arc (about 90 bytes, free of site and carrier) to positions of an invented orbit. The board
//! checks it, bakes a table for its site, and steers a 48 kHz software oscillator every 10 ms, exact in phase.
//! `Board` is what firmware would keep; `Board::tick` is its timer interrupt: it cannot panic, does not allocate,
//! reads no clock. Run with `cargo run --release --example fly_baked_pass`.

use shiftkeel::frequency::{Frequency, PhaseRamp};
use shiftkeel::nco::Nco;
use shiftkeel::pass::bake::{Request, bake_arc};
use shiftkeel::pass::{
    Arc, ArcModel, ArcSettings, Direction, Geometry, MAX_ARC_WORDS, PassTable, Site, TaggedAt,
};
use shiftkeel::time::GpsTime;
use shiftkeel::tuning::{Channel, Proven, RfPlan, Steering, Sweep};

const CARRIER: u64 = 437_000_000;
const CLOCK: u64 = 48_000;
const CLOCKS: u32 = 480;

type Failure = Box<dyn std::error::Error>;

/// Earth-fixed position in metres of a circular orbit, 550 km high, `t` seconds after it crosses 45 degrees north.
fn position(t: f64) -> [f64; 3] {
    let (radius, rate, earth): (f64, f64, f64) = (6_921e3, 1.0965e-3, 7.2921e-5);
    let (inclination, latitude): (f64, f64) = (97.6f64.to_radians(), 45f64.to_radians());
    let along = (latitude.sin() / inclination.sin()).asin() + rate * t;
    let (x, y, z) = (along.cos(), along.sin() * inclination.cos(), along.sin() * inclination.sin());
    let turned = 0.28 - earth * t;
    let (sine, cosine) = turned.sin_cos();
    [x * cosine - y * sine, x * sine + y * cosine, z].map(|part| radius * part)
}

/// What the firmware keeps while the pass lasts.
struct Board<'a> {
    table: PassTable<'a>,
    channel: Channel<false>,
    sweep: Option<Sweep>,
    oscillator: Nco,
}

impl Board<'_> {
    /// One tick: the coming interval ends at `next`. With no motion for it the oscillator goes on as it is.
    fn tick(&mut self, next: GpsTime) {
        let Ok(motion) = self.table.at(next) else { return self.sweep = None };
        if let Some(swept) = self.sweep.as_mut().and_then(|sweep| sweep.step(&self.channel, &motion).ok()) {
            self.oscillator.retune(swept.first, swept.ramp);
        } else if let Ok(sweep) = Sweep::begin(&self.channel, &motion) {
            // At first, or after a gap: steered from `next` on, until then at the step that it will start from.
            self.oscillator.retune(sweep.end(), PhaseRamp::ZERO);
            self.sweep = Some(sweep);
        }
    }
}

fn main() -> Result<(), Failure> {
    // On the ground.
    let start = GpsTime::from_utc(2026, 6, 1, [12, 0, 0], 0)?;
    let end = start.plus_seconds(720.0);
    let model = ArcModel::Unstated;
    let settings =
        ArcSettings { start, end, object: 90001, element_epoch: start, model, velocity_tolerance: 0.4e-3 };
    let mut sent = [0; MAX_ARC_WORDS];
    let sent = Arc::fit(&mut sent, &settings, |t| position(t - 360.0))?;

    // On the board.
    let arc = Arc::new(sent.words())?;
    let site = Site::geodetic(45.0, 7.5, 300.0)?;
    let geometry = Geometry::new(&arc, &site, Direction::Down, TaggedAt::Ground, 0.0)?;
    let (rise, set) = geometry.above(5f64.to_radians()).ok_or("the spacecraft does not rise here")?;
    let (slope_tolerance, delay_tolerance) = (0.010 / CARRIER as f64, 0.015 / CARRIER as f64);
    let request =
        Request { start: rise, end: set, slope_tolerance, delay_tolerance, lateness_partial: false };
    let mut buffer = [0; 256];
    let table = bake_arc(&mut buffer, &arc, &geometry, &request)?;
    println!("arc {} bytes, table {} bytes", 4 * arc.words().len(), 4 * table.words().len());

    let hertz = |whole| Frequency::from_hertz(whole).ok_or("a frequency below 1.09 THz");
    let channel = Channel::receive(&RfPlan::direct(hertz(CARRIER)?, hertz(CLOCK)?), CLOCKS)?;
    channel.suits(&table)?;
    let time_error = 0.5f64.powi(31);
    let steering = Steering { carrier: CARRIER as f64, clock: CLOCK as f64, clocks: CLOCKS, time_error };
    let proven = Proven::of_sweep(&channel, &table, &steering).total();
    println!("proven beside the arc: {:.1} mHz, {:.4} cycle", proven.hertz * 1e3, proven.cycles);

    let mut board = Board { table, channel, sweep: None, oscillator: Nco::at_phase(0) };
    board.tick(rise);
    for tick in 1..=(set.seconds_since(rise) * 100.0) as u32 {
        board.tick(rise.plus_seconds(f64::from(tick) * 0.01));
        let sample = board.oscillator.next_i16();
        board.oscillator.advance(u64::from(CLOCKS) - 1);
        if tick % 6000 == 0 {
            let end = board.sweep.map_or(channel.nominal_step(), |sweep| sweep.end());
            let shift = end.to_bits().wrapping_sub(channel.nominal_step().to_bits()) as i64;
            let hertz = shift as f64 / 2f64.powi(64) * CLOCK as f64;
            println!("{:5.0} s  shift {hertz:+10.3} Hz  sample {:6} {:6}", tick / 100, sample.re, sample.im);
        }
    }
    Ok(())
}
