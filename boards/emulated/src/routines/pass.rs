//! The library's pass: the table at an instant, and once the whole bake.

use super::{Bytes, Report, channel, line, sample};
use crate::count::{INPUTS, in_memory, once};
use crate::pass::{ArcFile, TABLE_WORDS, bake};
use crate::stack::depth;
use shiftkeel::pass::{Direction, PassTable};
use shiftkeel::rapidity::Motion;
use shiftkeel::time::GpsTime;

/// Bakes a table from the arc in `pass.arc`, and asks it.
pub fn table(report: Report, bytes: Bytes) {
    let file = ArcFile::read(c"pass.arc");
    let arc = file.arc();
    let mut buffer = [0; TABLE_WORDS];
    let digest = |table: &PassTable<'_>| table.digest().into();
    let (cost, _) = once(|| bake(&mut buffer, &arc, Direction::Up), digest);
    report("pass::bake_arc,thousands", &cost);
    let (stack, (cost, table)) = depth(|| once(|| bake(&mut buffer, &arc, Direction::Down), digest));
    report("pass::bake_arc-with-lateness,thousands", &cost);
    bytes("stack:bake_arc", stack);
    let instant = |index| instant(&table, index);
    line(report, "PassTable::at", instant, |time| {
        let mut table = &table;
        words(in_memory(&mut table).at(GpsTime::from_bits(time)).unwrap_or_default())
    });
    let late = |index| (instant(index), sample::signed(index, 5.0e7) as i32);
    line(report, "PassTable::at_late", late, |(time, lateness)| {
        let mut table = &table;
        words(in_memory(&mut table).at_late(GpsTime::from_bits(time), lateness).unwrap_or_default())
    });
    channel::steering(report, &table);
}

/// Instants spread over a table, bits scrambled, away from the ends by more than the lateness that is asked.
pub fn instant(table: &PassTable<'_>, index: u32) -> i64 {
    let (from, to) = (table.start().to_bits(), table.end().to_bits());
    let step = (to - from) / i64::from(INPUTS + 8);
    from + step * i64::from(index + 4) + i64::from(sample::scrambled(index) >> 4)
}

fn words(motion: Motion) -> (i64, (i64, i64)) {
    (motion.delay.to_bits(), (motion.rapidity.to_bits(), motion.rate.to_bits()))
}
