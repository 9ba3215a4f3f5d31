//! Receives an arc, bakes its tables, walks the pass tick by tick, and prints digests of all that an
//! oscillator is told: the same on every core and on the host.
#![cfg_attr(target_os = "none", no_std, no_main)]

use shiftkeel::follow::velocity::{Dynamics, Estimate, Gains, Tick, VelocityFilter, VelocitySettings};
use shiftkeel::nco::Nco;
use shiftkeel::pass::{Direction, PassTable};
use shiftkeel::rapidity::{Motion, Rapidity};
use shiftkeel::time::GpsTime;
use shiftkeel::tuning::{Hold, Sweep};
use shiftkeel_emulated::console::must;
use shiftkeel_emulated::digest::Digest;
use shiftkeel_emulated::pass::{ArcFile, TABLE_WORDS, bake};
use shiftkeel_emulated::{console, plans, program};

program!(walk);

fn walk() {
    let file = ArcFile::read(c"pass.arc");
    let arc = file.arc();
    console::text("arc ");
    console::decimal(4 * arc.words().len() as u64, 1);
    console::text(" bytes, CRC-32 ");
    console::hexadecimal(arc.digest().into(), 8);
    console::text("\n");
    let mut buffer = [0; TABLE_WORDS];
    let down = bake(&mut buffer, &arc, Direction::Down);
    write_table(c"down.table", &down);
    show_table("down", &down);
    motions(&down);
    receive(&down);
    follow(&down);
    let up = bake(&mut buffer, &arc, Direction::Up);
    write_table(c"up.table", &up);
    show_table("up", &up);
    motions(&up);
    transmit(&up);
}

/// The motion at every tick of the table, the first tick at its start.
fn ticks(table: &PassTable<'_>) -> impl Iterator<Item = Motion> {
    /// A tick in 2^-62 s, rounded down.
    const TICK: u128 = (1 << 62) / plans::RATE as u128;
    let start = table.start().to_bits();
    (0u32..).map_while(move |tick| {
        let elapsed = u128::from(tick) * TICK;
        table.at_fine(GpsTime::from_bits(start + (elapsed >> 32) as i64), elapsed as u32).ok()
    })
}

/// Delay, rapidity and rate at every tick.
fn motions(table: &PassTable<'_>) {
    let mut digest = Digest::new();
    let mut count = 0;
    for motion in ticks(table) {
        digest_motion(&mut digest, &motion);
        count += 1;
    }
    show("motion", count, digest);
}

fn digest_motion(digest: &mut Digest, motion: &Motion) {
    digest.word(motion.delay.to_bits() as u64);
    digest.word(motion.rapidity.to_bits() as u64);
    digest.word(motion.rate.to_bits() as u64);
}

/// A receiver whose software oscillator sweeps: steps, ramps and phases.
fn receive(table: &PassTable<'_>) {
    let crystal = Rapidity::from_bits(1_700_000_000_000);
    let channel = must(plans::receiver(crystal), "the receiver");
    let mut ticks = ticks(table);
    let first = ticks.next().unwrap_or_default();
    let mut sweep = must(Sweep::begin(&channel, &first), "the first sweep");
    let mut oscillator = Nco::at_phase(0);
    let (mut steps, mut phases) = (Digest::new(), Digest::new());
    let mut count = 0;
    for motion in ticks {
        let swept = must(sweep.step(&channel, &motion), "a sweep");
        steps.word(swept.first.to_bits());
        steps.word(swept.ramp.to_bits() as u64);
        oscillator.retune(swept.first, swept.ramp);
        oscillator.advance((plans::RECEIVER_CLOCK / plans::RATE).into());
        phases.word(oscillator.phase());
        let output = oscillator.next_i32();
        phases.word(u64::from(output.re as u32) << 32 | u64::from(output.im as u32));
        count += 1;
    }
    show("steps and ramps", count, steps);
    show("phases and outputs", count, phases);
}

/// A filter that is given noisy estimates of the range rate at 10 Hz, with gaps and wild ones, and steers.
fn follow(table: &PassTable<'_>) {
    let settings = VelocitySettings::new(0.1, 0.1, Dynamics::AlphaBetaGamma, Gains::TrackingIndex(0.05))
        .and_then(|settings| settings.with_gate(5.0));
    let settings = must(settings, "the filter");
    let channel = must(plans::receiver(Rapidity::ZERO), "the receiver");
    let mut filter = VelocityFilter::new();
    let (mut motions, mut steps) = (Digest::new(), Digest::new());
    let (mut count, mut noise) = (0u64, 1u32);
    let mut time = table.start();
    while let Ok(truth) = table.at(time) {
        noise = noise.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
        // Rapidity of up to 0.1 m/s either way; one estimate in 128 is off by up to 20 times that.
        let error = i64::from(noise as i32 >> 4) * if noise & 0x7f000 == 0 { 20 } else { 1 };
        let estimate = Estimate::from_rapidity(time, Rapidity::from_bits(truth.rapidity.to_bits() + error));
        // Missing now and then for two seconds.
        let tick =
            if count % 500 < 20 { Tick::without_estimate(time) } else { Tick::with_estimate(time, estimate) };
        let outcome = must(filter.step(&settings, tick), "a step of the filter");
        motions.word(outcome as u64);
        if let Some(motion) = filter.predict(&settings, GpsTime::from_bits(time.to_bits() + (1 << 26))) {
            digest_motion(&mut motions, &motion);
            steps.word(channel.step(motion.rapidity).unwrap_or_default().to_bits());
        }
        time = GpsTime::from_bits(time.to_bits() + (1 << GpsTime::FRACTION_BITS) / 10);
        count += 1;
    }
    show("filtered motion", count, motions);
    show("its steps", count, steps);
}

/// A transmitter whose synthesiser holds a word of 32 bits: words and phases.
fn transmit(table: &PassTable<'_>) {
    let crystal = Rapidity::from_bits(-900_000_000_000);
    let channel = must(plans::transmitter(crystal), "the transmitter");
    let mut ticks = ticks(table);
    let first = ticks.next().unwrap_or_default();
    let mut hold = must(Hold::<32>::begin(&channel, &first, 0), "the first word");
    let (mut words, mut phases) = (Digest::new(), Digest::new());
    let (mut phase, mut count) = (0u64, 0);
    for motion in ticks {
        let held = must(hold.step(&channel, &motion, false), "a word");
        words.word(held.word);
        let clocks = plans::TRANSMITTER_CLOCK / plans::RATE;
        phase = phase.wrapping_add(held.step.to_bits().wrapping_mul(clocks.into()));
        phases.word(phase);
        count += 1;
    }
    show("words", count, words);
    show("phases", count, phases);
}

#[inline(never)]
fn write_table(file: &core::ffi::CStr, table: &PassTable<'_>) {
    let mut bytes = [0; 4 * TABLE_WORDS];
    for (bytes, word) in bytes.chunks_exact_mut(4).zip(table.words()) {
        bytes.copy_from_slice(&word.to_le_bytes());
    }
    console::write(file, &bytes[..4 * table.words().len()]);
}

fn show_table(name: &str, table: &PassTable<'_>) {
    console::text(name);
    console::text(" table ");
    console::decimal(4 * table.words().len() as u64, 1);
    console::text(" bytes, ");
    console::decimal(table.segment_count() as u64, 1);
    console::text(" segments, CRC-32 ");
    console::hexadecimal(table.digest().into(), 8);
    console::text("\n");
}

fn show(what: &str, count: u64, digest: Digest) {
    console::text("  ");
    console::decimal(count, 6);
    console::text(" ");
    console::left(what, 24);
    console::hexadecimal(digest.value(), 16);
    console::text("\n");
}
