//! Receives an arc, bakes its tables, walks the pass tick by tick, and prints digests of all that an
//! oscillator is told: the same on every core and on the host.
#![cfg_attr(target_os = "none", no_std, no_main)]

use shiftkeel::pass::{Direction, PassTable};
use shiftkeel::time::GpsTime;
use shiftkeel_emulated::digest::Digest;
use shiftkeel_emulated::pass::{ArcFile, TABLE_WORDS, bake};
use shiftkeel_emulated::{console, program};

/// An eighth of a second.
const TICK: i64 = 1 << (GpsTime::FRACTION_BITS - 3);

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
    for (direction, name, file) in
        [(Direction::Down, "down", c"down.table"), (Direction::Up, "up", c"up.table")]
    {
        let table = bake(&mut buffer, &arc, direction);
        write_table(file, &table);
        show_table(name, &table);
        show("  motion", motion(&table));
    }
}

/// Delay, rapidity and rate at every tick.
fn motion(table: &PassTable<'_>) -> Digest {
    let mut digest = Digest::new();
    let mut time = table.start();
    while let Ok(motion) = table.at(time) {
        digest.word(motion.delay.to_bits() as u64);
        digest.word(motion.rapidity.to_bits() as u64);
        digest.word(motion.rate.to_bits() as u64);
        time = GpsTime::from_bits(time.to_bits() + TICK);
    }
    digest
}

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

fn show(what: &str, digest: Digest) {
    console::left(what, 24);
    console::hexadecimal(digest.value(), 16);
    console::text("\n");
}
