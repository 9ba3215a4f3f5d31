//! What a second of lateness changes, beyond sliding the curve: the Earth turns on meanwhile.
//!
//! The partial section: one word with Qp (8 bits), the coefficients' coarseness k (8) and Qb (8), then four words
//! a segment and, after the last, four for its end. A record is a node (change of delay per second of lateness,
//! after sliding, at the segment's start, in 2^-Qp), the coefficients 2 to 5, 16 bits each, in 2^(k-Qp) (orders 0
//! and 1 follow from the nodes as in the main records), and the bend: what a second of lateness changes in that
//! change, as a node and a coefficient 2 of 16 bits each in 2^-Qb per second. The site's way is a circle seen from
//! nearby: without its bend 3 s leave 7 mHz and 1.3 cycles at 437 MHz.

use super::evaluate::{Place, times_long};
use super::{PassTable, RECORD_WORDS, TableError};
use crate::rapidity::{Delay, Motion, Rapidity};
use crate::time::GpsTime;

/// Words of one partial record.
pub(in crate::pass) const PARTIAL_RECORD_WORDS: usize = 4;
/// Largest lateness that [`PassTable::at_late`] takes, in 2^-24 s: 8 s.
const LARGEST: i32 = 8 << 24;
/// Fraction bits of the evaluation.
const FRACTION: u32 = 60;

/// A partial record's numbers before packing.
#[derive(Clone, Copy, Debug, Default)]
pub(in crate::pass) struct PartialRecord {
    /// Node in 2^-Qp.
    pub(in crate::pass) node: i32,
    /// Orders 2 to 5 in 2^(k-Qp).
    pub(in crate::pass) coefficients: [i16; 4],
    /// Node and order 2 of the bend in 2^-Qb.
    pub(in crate::pass) bend: [i16; 2],
}

impl PartialRecord {
    pub(in crate::pass) fn to_words(self) -> [u32; PARTIAL_RECORD_WORDS] {
        let [c2, c3, c4, c5] = self.coefficients.map(|value| u32::from(value as u16));
        let [node, second] = self.bend.map(|value| u32::from(value as u16));
        [self.node as u32, c2 | c3 << 16, c4 | c5 << 16, node | second << 16]
    }
}

impl PassTable<'_> {
    /// Delay, rapidity and rate when the spacecraft is late in its orbit by `lateness` (2^-24 s, within +-8 s;
    /// positive = later than its elements say).
    ///
    /// # Accuracy
    /// 10 mHz and 0.05 cycle at 437 MHz at 3 s of lateness on a pass at 550 km, the errors of a table of 10 mHz
    /// included; 3 mHz from one of 1 mHz; 40 mHz overhead at 320 km (`tests/lateness.rs`).
    ///
    /// # Errors
    /// As [`Self::at`], with the span shifted by the lateness; [`TableError::NoLateness`].
    pub fn at_late(&self, time: GpsTime, lateness: i32) -> Result<Motion, TableError> {
        if !self.has_lateness() || !(-LARGEST..=LARGEST).contains(&lateness) {
            return Err(TableError::NoLateness);
        }
        let slid = GpsTime::from_bits(time.to_bits().wrapping_sub(i64::from(lateness) << 6));
        let motion = self.at(slid)?;
        let place = self.layout.locate(self.directory, slid.to_bits().wrapping_sub(self.epoch), 0);
        let late = i64::from(lateness);
        let partial = self.partial(&place);
        let bend = self.bend(&place);
        // Half a bend times the lateness, beside the change itself: 2^-60.
        let mean =
            |change: i64, bend: i64| change.wrapping_add((bend >> 8).wrapping_mul(late) >> (24 - 8 + 1));
        let (value, slope) = (mean(partial.0, bend.0), mean(partial.1, bend.1));
        // Value in 2^-60, lateness in 2^-24 s, delay in 2^-56 s.
        let delay = ((value >> 8).wrapping_mul(late)) >> (FRACTION - 8 + 24 - Delay::FRACTION_BITS);
        // The slope of the logarithm is one to 3e-5 here.
        let rapidity = ((slope >> 8).wrapping_mul(late)) >> (24 - 8);
        Ok(Motion {
            delay: Delay::from_bits(motion.delay.to_bits().wrapping_add(delay)),
            rapidity: Rapidity::from_bits(motion.rapidity.to_bits().wrapping_sub(rapidity)),
            rate: motion.rate,
        })
    }

    /// Bend of the partial per second of lateness in 2^-60, and its slope in 2^-60 per second.
    #[allow(clippy::cast_possible_truncation, reason = "half words are cut out on purpose")]
    fn bend(&self, place: &Place) -> (i64, i64) {
        let section = self.segments().wrapping_mul(RECORD_WORDS).wrapping_add(1);
        let word = |index: usize| self.records.get(section.wrapping_add(index)).copied().unwrap_or(0);
        let shift = FRACTION.saturating_sub(word(0) >> 16 & 0xFF);
        let record = place.segment.wrapping_add(1).wrapping_mul(PARTIAL_RECORD_WORDS);
        let (first, last) = (word(record), word(record.wrapping_add(PARTIAL_RECORD_WORDS)));
        let (start, end) = (i64::from(first as i16) << shift, i64::from(last as i16) << shift);
        let second = i64::from((first >> 16) as i16) << shift;
        let rise = end.wrapping_sub(start);
        let bow = second << 2;
        let zeroth = (start.wrapping_add(end) >> 1).wrapping_sub(second);
        let tilt = times_long(bow, place.coarse);
        let value = times_long(rise.wrapping_add(tilt), place.coarse).wrapping_add(zeroth);
        (value, self.layout.per_second(rise.wrapping_add(tilt << 1), place.length))
    }

    /// Change of the delay per second of lateness in 2^-60, and its slope in 2^-60 per second.
    #[allow(clippy::cast_possible_truncation, reason = "half words are cut out on purpose")]
    fn partial(&self, place: &Place) -> (i64, i64) {
        let section = self.segments().wrapping_mul(RECORD_WORDS).wrapping_add(1);
        let word = |index: usize| self.records.get(section.wrapping_add(index)).copied().unwrap_or(0);
        let units = word(0);
        let node_shift = FRACTION.saturating_sub(units & 0xFF);
        let fine_shift = node_shift.saturating_add(units >> 8 & 0xFF).min(40);
        let record = place.segment.wrapping_mul(PARTIAL_RECORD_WORDS).wrapping_add(1);
        let node = |index| i64::from(word(index) as i32) << node_shift;
        let (start, end) = (node(record), node(record.wrapping_add(PARTIAL_RECORD_WORDS)));
        let pair = |index: usize| {
            let both = word(record.wrapping_add(index));
            [both as i16, (both >> 16) as i16].map(|half| i64::from(half) << fine_shift)
        };
        let ([c2, c3], [c4, c5]) = (pair(1), pair(2));
        let first = (end.wrapping_sub(start) >> 1).wrapping_sub(c3).wrapping_sub(c5);
        let zeroth = (end.wrapping_add(start) >> 1).wrapping_sub(c2).wrapping_sub(c4);
        let mut value = c5 << 5;
        let mut slope = 0i64;
        for term in [c4 << 4, c3 << 3, c2 << 2, first << 1, zeroth] {
            slope = times_long(slope, place.coarse).wrapping_add(value);
            value = times_long(value, place.coarse).wrapping_add(term);
        }
        value = value.wrapping_add((slope.wrapping_mul(i64::from(place.rest >> 16))) >> 32);
        (value, self.layout.per_second(slope, place.length))
    }
}
