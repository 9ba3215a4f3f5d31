//! A whole pass steered: table, channel, sweep or hold, oscillator, beside the independent reference.

mod reference;

use reference::{Tag, link, vectors};
use shiftkeel::frequency::{Frequency, PhaseStep};
use shiftkeel::nco::Nco;
use shiftkeel::pass::bake::{Request, bake_arc};
use shiftkeel::pass::{
    Arc, ArcModel, ArcSettings, Direction, Geometry, MAX_ARC_WORDS, PassTable, Site, TaggedAt,
};
use shiftkeel::time::GpsTime;
use shiftkeel::tuning::{Channel, Hold, Proven, RfPlan, Steering, Sweep};

const CARRIER: u64 = 437_000_000;

fn epoch() -> GpsTime {
    GpsTime::from_utc(2026, 6, 1, [12, 0, 0], 0).unwrap()
}

fn with_table(millihertz: f64, cycles: f64, test: impl FnOnce(&PassTable<'_>)) {
    let grid = vectors::positions(vectors::SYNTHETIC);
    let mut words = [0; MAX_ARC_WORDS];
    let settings = ArcSettings {
        start: epoch().plus_seconds(346.0),
        end: epoch().plus_seconds(1082.0),
        object: 90001,
        element_epoch: epoch(),
        model: ArcModel::Sgp4,
        velocity_tolerance: 0.4e-3,
    };
    let arc = Arc::fit(&mut words, &settings, |t| grid.at(t + 346.0)).unwrap();
    let ground = vectors::SYNTHETIC_SITE;
    let site = Site::geodetic(ground.latitude_deg, ground.longitude_deg, ground.height_m).unwrap();
    let geometry = Geometry::new(&arc, &site, Direction::Down, TaggedAt::Ground, 0.0).unwrap();
    let (rise, set) = geometry.above(0.0).unwrap();
    let mut words = [0; 512];
    let request = Request {
        start: rise,
        end: set,
        slope_tolerance: millihertz * 1e-3 / CARRIER as f64,
        delay_tolerance: cycles / CARRIER as f64,
        lateness_partial: false,
    };
    test(&bake_arc(&mut words, &arc, &geometry, &request).unwrap());
}

/// Instants `index` intervals of `clocks` at `clock` hertz after `start`: grid and rest in 2^-62 s.
fn instant(start: GpsTime, index: u64, clocks: u64, clock: u64) -> (GpsTime, u32) {
    let elapsed = (u128::from(index * clocks) << 62) / u128::from(clock);
    (GpsTime::from_bits(start.to_bits() + (elapsed >> 32) as i64), elapsed as u32)
}

#[test]
fn software_oscillator() {
    with_table(10.0, 0.015, |table| {
        let clock = 48_000;
        let clocks = 480;
        let channel = Channel::receive(
            &RfPlan::direct(Frequency::from_hertz(CARRIER).unwrap(), Frequency::from_hertz(clock).unwrap()),
            clocks,
        )
        .unwrap();
        let steering = Steering { carrier: CARRIER as f64, clock: clock as f64, clocks, time_error: 0.0 };
        let proven = Proven::of_sweep(&channel, table, &steering);
        println!("{proven:?} total {:?} extremes {:?}", proven.total(), table.extremes());
        let start = table.start();
        let link = link(|t| vectors::positions(vectors::SYNTHETIC).at(t), vectors::SYNTHETIC_SITE);
        let _ = link;
        let unit = 2f64.powi(-56);
        let (first, _) = instant(start, 0, clocks.into(), clock);
        let motion = table.at(first).unwrap();
        let origin = motion.delay.to_bits();
        let mut sweep = Sweep::begin(&channel, &motion).unwrap();
        let mut oscillator = Nco::at_phase(0);
        let ticks = (table.end().seconds_since(start) * clock as f64 / clocks as f64) as u64;
        let (mut worst_phase, mut worst_ends, mut worst_frequency) = (0.0_f64, 0, 0.0_f64);
        let mut last_end = None;
        for tick in 1..=ticks {
            let (time, fraction) = instant(start, tick, clocks.into(), clock);
            let motion = table.at_fine(time, fraction).unwrap();
            let swept = sweep.step(&channel, &motion).unwrap();
            if let Some(end) = last_end {
                worst_ends = worst_ends.max(swept.start().to_bits().abs_diff(end));
            }
            last_end = Some(sweep.end().to_bits());
            oscillator.retune(swept.first, swept.ramp);
            oscillator.advance(clocks.into());
            // The table's own phase: carrier times (time - delay).
            let cycles_of_time = (u128::from(tick * u64::from(clocks)) * u128::from(CARRIER)
                % u128::from(clock)) as f64
                / clock as f64;
            let delay = (motion.delay.to_bits() - origin) as f64 * unit * CARRIER as f64;
            let phase = oscillator.phase() as f64 / 2f64.powi(64);
            let error = phase - (cycles_of_time - delay);
            let error = error - error.round();
            worst_phase = worst_phase.max(error.abs());
            let offset = swept.start().to_bits().wrapping_sub(channel.nominal_step().to_bits()) as i64;
            let hertz = offset as f64 / 2f64.powi(64) * clock as f64;
            let _ = hertz;
            let end = PhaseStep::from_bits(sweep.end().to_bits());
            let own = channel.step(motion.rapidity).unwrap();
            worst_frequency = worst_frequency.max(
                (end.to_bits().wrapping_sub(own.to_bits()) as i64 as f64 / 2f64.powi(64) * clock as f64)
                    .abs(),
            );
        }
        println!(
            "ticks {ticks} phase {worst_phase:e} cycles, ends {worst_ends}, end step against own {worst_frequency:e} Hz"
        );
    });
}

#[test]
fn device() {
    with_table(1.0, 0.015, |table| {
        let clock = 100_000_000;
        let clocks = 100_000;
        let channel = Channel::receive(
            &RfPlan::direct(Frequency::from_hertz(CARRIER).unwrap(), Frequency::from_hertz(clock).unwrap()),
            clocks,
        )
        .unwrap();
        let steering = Steering { carrier: CARRIER as f64, clock: clock as f64, clocks, time_error: 0.0 };
        let proven = Proven::of_hold(&channel, table, &steering, 32, 0.0, 0.0);
        println!("{proven:?} total {:?}", proven.total());
        let start = table.start();
        let motion = table.at(start).unwrap();
        let origin = motion.delay.to_bits();
        let mut hold = Hold::<32>::begin(&channel, &motion, 0).unwrap();
        let mut phase = 0u64;
        let ticks = (table.end().seconds_since(start) * 1e3) as u64;
        let mut worst_phase = 0.0_f64;
        for tick in 1..=ticks {
            let (time, fraction) = instant(start, tick, clocks.into(), clock);
            let motion = table.at_fine(time, fraction).unwrap();
            let held = hold.step(&channel, &motion, false).unwrap();
            phase = phase.wrapping_add(held.step.to_bits().wrapping_mul(clocks.into()));
            let cycles_of_time = (u128::from(tick * u64::from(clocks)) * u128::from(CARRIER)
                % u128::from(clock)) as f64
                / clock as f64;
            let delay = (motion.delay.to_bits() - origin) as f64 * 2f64.powi(-56) * CARRIER as f64;
            let error = phase as f64 / 2f64.powi(64) - (cycles_of_time - delay);
            worst_phase = worst_phase.max((error - error.round()).abs());
        }
        println!("ticks {ticks} phase {worst_phase:e}");
    });
}
