//! The library's channel, and the whole tick of a firmware.

use super::pass::instant;
use super::{Report, line, sample};
use crate::console::{self, must};
use crate::count::in_memory;
use crate::plans;
use fixed::types::I16F16;
use shiftkeel::nco::Nco;
use shiftkeel::pass::PassTable;
use shiftkeel::rapidity::{Delay, Motion, Rapidity, RapidityRate};
use shiftkeel::time::GpsTime;
use shiftkeel::tuning::{Hold, Stretch, Stride, Sweep};

/// From a motion to a step.
pub fn channel(report: Report) {
    let receiver = must(plans::receiver(Rapidity::from_bits(1_700_000_000_000)), "the receiver");
    let transmitter = must(plans::transmitter(Rapidity::ZERO), "the transmitter");
    let rapidity = |index| (sample::signed(index, 2.7e-5) * (1u64 << 60) as f64) as i64;
    line(report, "Channel::step", rapidity, |rapidity| {
        let mut channel = &receiver;
        in_memory(&mut channel).step(Rapidity::from_bits(rapidity)).unwrap_or_default().to_bits()
    });
    line(report, "Channel::step,transmitting", rapidity, |rapidity| {
        let mut channel = &transmitter;
        in_memory(&mut channel).step(Rapidity::from_bits(rapidity)).unwrap_or_default().to_bits()
    });
    let rate = |index| (sample::range_rate(index) * 65536.0) as i32;
    line(report, "Channel::step_for_range_rate", rate, |rate| {
        let mut channel = &receiver;
        in_memory(&mut channel).step_for_range_rate(I16F16::from_bits(rate)).unwrap_or_default().to_bits()
    });
}

/// Steering from one motion to the next, and the tick of a firmware: table, channel, oscillator.
pub fn steering(report: Report, table: &PassTable<'_>) {
    let receiver = must(plans::receiver(Rapidity::from_bits(1_700_000_000_000)), "the receiver");
    let transmitter = must(plans::transmitter(Rapidity::ZERO), "the transmitter");
    // A spacecraft that comes nearer at an even pace: the delay falls by what the rapidity says.
    const PACE: i64 = -(1 << 34);
    let start = Motion {
        delay: Delay::from_bits(0),
        rapidity: Rapidity::from_bits(-PACE * (plans::RATE as i64) << (60 - Delay::FRACTION_BITS)),
        rate: RapidityRate::from_bits(0),
    };
    let mut motion = start;
    let mut sweep = must(Sweep::begin(&receiver, &motion), "the first sweep");
    let mut refused = 0u32;
    line(
        report,
        "Sweep::step",
        |_| (),
        |()| {
            let motion = in_memory(&mut motion);
            motion.delay = Delay::from_bits(motion.delay.to_bits() + PACE);
            let mut channel = &receiver;
            let swept = in_memory(&mut sweep).step(in_memory(&mut channel), motion);
            refused += u32::from(swept.is_err());
            swept.map_or((0, 0), |swept| (swept.first.to_bits(), swept.ramp.to_bits()))
        },
    );
    motion = start;
    let mut hold = must(Hold::<32>::begin(&transmitter, &motion, 0), "the first word");
    line(
        report,
        "Hold::step",
        |_| (),
        |()| {
            let motion = in_memory(&mut motion);
            motion.delay = Delay::from_bits(motion.delay.to_bits() + PACE);
            let mut channel = &transmitter;
            let held = in_memory(&mut hold).step(in_memory(&mut channel), motion, false);
            refused += u32::from(held.is_err());
            held.map_or(0, |held| held.word as u32)
        },
    );

    // Repeats follow each other by one tick, as in a firmware, which also keeps the time.
    const TICK: i64 = (1 << GpsTime::FRACTION_BITS) / plans::RATE as i64;
    let mut time = instant(table, 0);
    let first = table.at(GpsTime::from_bits(time)).unwrap_or_default();
    let mut sweep = must(Sweep::begin(&receiver, &first), "the first sweep");
    let mut oscillator = Nco::at_phase(0);
    line(
        report,
        "tick=PassTable::at+Sweep::step+retune",
        |_| (),
        |()| {
            let time = in_memory(&mut time);
            *time += TICK;
            let (mut table, mut channel) = (table, &receiver);
            let swept = in_memory(&mut table)
                .at(GpsTime::from_bits(*time))
                .ok()
                .and_then(|next| in_memory(&mut sweep).step(in_memory(&mut channel), &next).ok());
            match swept {
                Some(swept) => in_memory(&mut oscillator).retune(swept.first, swept.ramp),
                None => refused += 1,
            }
        },
    );
    if refused != 0 {
        console::fail("a step was refused, or the ticks ran out of the pass: not every call was a full step");
    }
    stretch(report, table);
}

/// The tick of a firmware that lays its stretches ahead, and the laying. When its ticks
/// are used up the same stretch is taken again, and its sweep.
fn stretch(report: Report, table: &PassTable<'_>) {
    let receiver = must(plans::receiver(Rapidity::from_bits(1_700_000_000_000)), "the receiver");
    let stride = must(Stride::new((1 << 58) / u64::from(plans::RATE), 7), "the stride");
    let ends = |from| {
        let to = from + ((i64::from(stride.ticks()) << GpsTime::FRACTION_BITS) / i64::from(plans::RATE));
        [from, to].map(|time| (GpsTime::from_bits(time), 0))
    };
    let first = Stretch::lay(table, &receiver, &stride, ends(instant(table, 7)));
    let first = must(first, "the first stretch");
    line(
        report,
        "Stretch::lay",
        |index| instant(table, index),
        |time| {
            let (mut table, mut channel, mut stride) = (table, &receiver, &stride);
            let (table, channel) = (in_memory(&mut table), in_memory(&mut channel));
            let laid = Stretch::lay(table, channel, in_memory(&mut stride), ends(time));
            laid.map_or((0, 0), |mut laid| {
                let motion = in_memory(&mut laid).motion();
                (motion.delay.to_bits(), motion.rapidity.to_bits())
            })
        },
    );
    let begun = must(Sweep::begin(&receiver, &first.motion()), "the sweep of a stretch");
    let (mut stretch, mut sweep) = (first, begun);
    let none = |_| ();
    line(report, "Stretch::tick", none, |()| {
        let (mut channel, stretch, sweep) = (&receiver, in_memory(&mut stretch), in_memory(&mut sweep));
        if stretch.left() == 0 {
            (*stretch, *sweep) = (first, begun);
        }
        let steered = stretch.tick(sweep, in_memory(&mut channel));
        steered.map_or(((0, 0), (0, (0, 0))), |(motion, swept)| {
            let motion = (motion.delay.to_bits(), (motion.rapidity.to_bits(), motion.rate.to_bits()));
            ((swept.first.to_bits(), swept.ramp.to_bits()), motion)
        })
    });
    (stretch, sweep) = (first, begun);
    let mut oscillator = Nco::at_phase(0);
    let mut motion = Motion::default();
    let mut missed = 0u32;
    line(report, "tick=Stretch::tick+retune", none, |()| {
        let (mut channel, stretch, sweep) = (&receiver, in_memory(&mut stretch), in_memory(&mut sweep));
        if stretch.left() == 0 {
            (*stretch, *sweep) = (first, begun);
        }
        match stretch.tick(sweep, in_memory(&mut channel)) {
            Ok((at_end, swept)) => {
                *in_memory(&mut motion) = at_end;
                in_memory(&mut oscillator).retune(swept.first, swept.ramp);
            }
            Err(_) => missed += 1,
        }
    });
    if missed != 0 {
        console::fail("a tick of the stretch was refused");
    }
}
