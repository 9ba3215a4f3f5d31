//! A second reader of the table format, written from its description: exact to 2^-20 of a stored unit, slow.

use shiftkeel::pass::PassTable;
use shiftkeel::time::GpsTime;

/// Fraction bits below a unit of 2^-Q s.
const FINER: i32 = 20;
/// Fraction bits of the argument.
const ARGUMENT: i32 = 60;
/// Powers of two by which the coefficients' units are coarser than 2^-Q s.
const COARSER: [i32; 10] = [0, 0, 0, 0, 2, 2, 4, 5, 5, 6];

#[derive(Clone, Debug)]
pub struct Segment {
    /// Start after the epoch and length, 2^-30 s.
    pub start: i64,
    pub length: i64,
    /// Of the polynomial in v = -1..1, in 2^-(Q + FINER) s.
    coefficients: [i128; 10],
}

#[derive(Clone, Debug)]
pub struct Stored {
    pub segments: Vec<Segment>,
    pub fraction: i32,
    base: i128,
    epoch: i64,
}

/// Bits `low..low + width` of a word as a signed number.
fn field(word: u32, low: u32, width: u32) -> i128 {
    i128::from((word << (32 - low - width)) as i32 >> (32 - width))
}

impl Stored {
    pub fn new(table: &PassTable<'_>) -> Self {
        let words = table.words();
        let (fraction, cell, count) =
            ((words[13] & 0xFF) as i32, words[13] >> 8 & 0xFF, (words[13] >> 16) as usize);
        let directory = 15;
        let records = directory + count.next_power_of_two().max(2) / 2;
        let node = |segment: usize| i128::from(words[records + 6 * segment] as i32) << (1 + FINER);
        let segments = (0..count).map(|segment| {
            let entry = words[directory + segment / 2] >> (16 * (segment % 2)) & 0xFFFF;
            let record = &words[records + 6 * segment..];
            let stored = [
                0,
                0,
                field(record[1], 0, 32),
                field(record[2], 0, 32),
                field(record[3], 10, 22),
                field(record[4], 12, 20),
                field(record[5], 15, 17),
                field(record[5], 0, 15),
                field(record[4], 0, 12),
                field(record[3], 0, 10),
            ];
            let mut coefficients: [i128; 10] =
                core::array::from_fn(|order| stored[order] << (COARSER[order] + FINER));
            let (start, end) = (node(segment), node(segment + 1));
            let [_, _, c2, c3, c4, c5, c6, c7, c8, c9] = coefficients;
            coefficients[0] = (end + start) / 2 - c2 - c4 - c6 - c8;
            coefficients[1] = (end - start) / 2 - c3 - c5 - c7 - c9;
            let length = 1 << ((entry & 0xF) + cell);
            Segment { start: i64::from(entry >> 4) << cell, length, coefficients }
        });
        Self {
            segments: segments.collect(),
            fraction,
            base: i128::from(words[12] as i32),
            epoch: table.start().to_bits(),
        }
    }

    /// Delay in 2^-(Q + FINER) s from the base, and its slope as a pure number; `fraction` in 2^-62 s.
    fn raw(&self, time: GpsTime, fraction: u32) -> (i128, f64) {
        let elapsed = time.to_bits() - self.epoch;
        let segment = self.segments.iter().rev().find(|segment| segment.start <= elapsed).expect("inside");
        // Lengths are powers of two, so that nothing is lost here.
        let local = i128::from(elapsed - segment.start) << 32 | i128::from(fraction);
        let length = i128::from(segment.length) << 32;
        assert!(local <= length);
        let places = ARGUMENT - (length.trailing_zeros() as i32);
        let argument = 2 * local - length;
        let argument = if places >= 0 { argument << places } else { argument >> -places };
        let (mut value, mut slope) = (0i128, 0i128);
        for coefficient in segment.coefficients.iter().rev() {
            slope = ((slope * argument) >> ARGUMENT) + value;
            value = ((value * argument) >> ARGUMENT) + coefficient;
        }
        let half = segment.length as f64 / 2.0 / (1u64 << 30) as f64;
        (value, slope as f64 * 2.0_f64.powi(-self.fraction - FINER) / half)
    }

    /// Delay in 2^-60 s.
    pub fn delay(&self, time: GpsTime) -> i128 {
        self.delay_fine(time, 0)
    }

    /// The same `fraction` (2^-62 s) later.
    pub fn delay_fine(&self, time: GpsTime, fraction: u32) -> i128 {
        let (value, _) = self.raw(time, fraction);
        let places = 60 - self.fraction - FINER;
        let value = if places >= 0 { value << places } else { value >> -places };
        value + (self.base << (60 - 24))
    }

    /// Slope of the delay.
    pub fn slope(&self, time: GpsTime) -> f64 {
        self.raw(time, 0).1
    }
}
