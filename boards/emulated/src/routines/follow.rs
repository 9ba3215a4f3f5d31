//! The library's filter for range-rate estimates.

use super::{Report, line, sample};
use crate::console::{self, must};
use crate::count::in_memory;
use shiftkeel::follow::velocity::{Dynamics, Estimate, Gains, Tick, VelocityFilter, VelocitySettings};
use shiftkeel::time::GpsTime;

/// A tick of a tenth of a second with and without an estimate, and a prediction.
pub fn velocity(report: Report) {
    let settings = VelocitySettings::new(0.1, 0.1, Dynamics::AlphaBeta, Gains::TrackingIndex(0.05))
        .and_then(|settings| settings.with_longest_coast(600.0));
    let settings = must(settings, "the filter");
    let mut filter = VelocityFilter::new();
    let mut now = 1i64 << 50;
    let mut after = |fraction: i64| {
        now += (1 << GpsTime::FRACTION_BITS) / fraction;
        GpsTime::from_bits(now)
    };
    let noise = |index| sample::signed(index, 0.1) as f32;
    for index in 0..64 {
        let time = after(10);
        let estimate = must(Estimate::from_metres_per_second(time, 5000.0 + noise(index)), "an estimate");
        must(filter.step(&settings, Tick::with_estimate(time, estimate)), "a step of the filter");
    }
    // First, since what counting leaves behind in the filter depends on the core.
    let start = filter;
    let later = |index: u32| i64::from(index) << 20;
    let last = after(10).to_bits();
    line(report, "VelocityFilter::predict", later, |later| {
        let mut filter = &start;
        let motion = in_memory(&mut filter).predict(&settings, GpsTime::from_bits(last + later));
        motion.map_or((0, 0), |motion| (motion.delay.to_bits(), motion.rapidity.to_bits()))
    });
    line(report, "VelocityFilter::step,estimate", noise, |noise| {
        let time = after(10);
        let estimate = Estimate::from_metres_per_second(time, 5000.0 + noise);
        let tick = estimate.map_or(Tick::without_estimate(time), |rate| Tick::with_estimate(time, rate));
        in_memory(&mut filter).step(&settings, tick).map_or(u32::MAX, |outcome| outcome as u32)
    });
    line(
        report,
        "VelocityFilter::step,none",
        |_| (),
        |()| {
            // So short that all repeats stay within the longest coast.
            let tick = Tick::without_estimate(after(1000));
            in_memory(&mut filter).step(&settings, tick).map_or(u32::MAX, |outcome| outcome as u32)
        },
    );
    if filter.predict(&settings, GpsTime::from_bits(now)).is_none() {
        console::fail("the repeats outlasted the longest coast: shorten their interval");
    }
}
