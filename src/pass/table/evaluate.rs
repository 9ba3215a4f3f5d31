//! Fixed-point evaluation of a table: the same instructions at every instant, no division, no branch on data.
//!
//! The local argument u runs from -1/2 to 1/2 over a segment. Its top 16 bits u0 go through three nested
//! multiplications at once (value, slope, half the curvature); the rest d of the argument, below 2^-16, enters
//! by Taylor: P(u0 + d) = P + d (P' + d P''/2), the next term being below 2^-59 s. A product with 16 bits is
//! cheap on a core that has only a 32-bit multiplier, and one instruction on one with signal-processing ones.
//!
//! Units: orders 9 to 6 of the value in 2^-(Q+4) s (the fields' widths rule out overflow), orders 5 to 0 as a
//! head in 2^-(Q-2) s and a tail in 2^-(Q+12) s, slope and curvature in 2^-(Q-2) s, all in 32 bits.

use super::{CELL_BITS, HEADER_WORDS, RECORD_WORDS};
use crate::rapidity::{
    Delay, Motion, Rapidity, RapidityRate, narrow,
    wide_product::{SHORT_PRODUCTS, high_i32, shifted_left},
};

/// Bound on what truncation adds to one evaluation, in 2^-(Q+16) s.
///
/// Every truncation makes its term smaller by less than one unit, and enters the result times u^k, |u| <= 1/2:
///
/// | where | unit, in 2^-(Q+16) s | orders k | error for u > 0 | for u < 0 |
/// |---|---|---|---|---|
/// | products of the first part | 2^12 | 8 to 6 | -112 to 0 | -80 to 32 |
/// | tail (2 units an order) | 16 | 5 to 0 | -63 to 0 | -42 to 21 |
/// | slope (2 units an order, 3 in the bend) times d | 4 | | -28 to 2 | -22 to 8 |
/// | product with d, Taylor's next term | 18, 2 | | -20 to 2 | -20 to 2 |
///
/// So one evaluation is off by -223 to 63 units, and two of them differ by at most the sum.
pub(in crate::pass) const NOISE: u32 = 223;
/// Bound on the difference of two evaluations' errors, in the same unit; see [`NOISE`].
const DIFFERENCE_NOISE: u32 = 286;
/// Least and most Q of the format: the delay's units allow no other.
pub(in crate::pass) const LEAST_FRACTION: u32 = 27;
pub(in crate::pass) const MOST_FRACTION: u32 = 44;
/// Fraction bits of the tail below the head.
const TAIL: u32 = 14;
/// Log2 of the longest segment in cells.
pub(in crate::pass) const LONGEST: u32 = 12;

/// What the header says about units, unpacked once.
#[derive(Clone, Copy, Debug)]
pub(super) struct Layout {
    /// Q.
    fraction: u8,
    /// Shift that puts the cell number into the top 12 bits.
    align: u8,
    /// Directory entries, a power of two.
    entries: u16,
    /// -1 when time is read at the transmitting end, else 0: the sign of the slope in the logarithm.
    negate: i32,
    /// log2 of a cell in seconds.
    cell: i8,
}

/// Where an instant lies: segment, its log2 length in cells, top 16 bits of the argument and the rest.
#[derive(Clone, Copy)]
pub(super) struct Place {
    pub(super) segment: usize,
    pub(super) length: u32,
    pub(super) coarse: i32,
    pub(super) rest: u32,
}

impl Layout {
    /// `None` when a field is outside the format.
    #[allow(
        clippy::arithmetic_side_effects,
        clippy::cast_possible_truncation,
        reason = "set-up: the ranges tested in `sane`"
    )]
    pub(super) fn new(header: &[u32; HEADER_WORDS]) -> Option<Self> {
        let fraction = header[13] & 0xFF;
        let cell = header[13] >> 8 & 0xFF;
        let segments = header[13] >> 16;
        let sane = (LEAST_FRACTION..=MOST_FRACTION).contains(&fraction)
            && (21..=48).contains(&cell)
            && (1..=1024).contains(&segments);
        // Down tagged at the ground, up tagged at the spacecraft and two-way read the receiver's time.
        let at_transmitter = matches!(header[0] & 7, 1 | 4);
        sane.then(|| Self {
            fraction: fraction as u8,
            align: (64 - CELL_BITS - cell) as u8,
            entries: segments.next_power_of_two().max(2) as u16,
            negate: -i32::from(at_transmitter),
            cell: cell as i8 - 30,
        })
    }

    pub(super) fn directory_words(&self) -> usize {
        usize::from(self.entries / 2)
    }

    pub(super) fn fraction(&self) -> u32 {
        u32::from(self.fraction)
    }

    /// Bound on the difference of two evaluations' errors in 2^-60 s.
    #[allow(clippy::arithmetic_side_effects, reason = "set-up: shifts by 0 to 17 places")]
    pub(super) fn difference_noise(&self) -> u32 {
        DIFFERENCE_NOISE << (44 - u32::from(self.fraction).min(44))
    }

    /// Bound on what the evaluation adds to a rapidity in 2^-60: 7 units of the slope a segment (see [`NOISE`]),
    /// `shortest` being the log2 of the shortest segment in cells, and the kernel's rounding to 2^-44.
    #[allow(
        clippy::arithmetic_side_effects,
        reason = "set-up: exponents below 100, and 7 shifted by 28 places at most"
    )]
    pub(super) fn rapidity_noise(&self, shortest: u32) -> u32 {
        let seconds = self.log_seconds(shortest);
        let places = (60 + 2 - i32::from(self.fraction) - seconds).clamp(0, 28);
        (7 << places) + (3 << 15)
    }

    /// Finds the segment of a time since the epoch, in 2^-30 s, by a search of fixed depth.
    #[inline]
    #[allow(clippy::cast_possible_truncation, reason = "the middle half word is cut out on purpose")]
    pub(super) fn locate(&self, directory: &[u32], elapsed: i64, fraction: u32) -> Place {
        // The top 12 bits are the cell; the shift is below 32.
        let aligned =
            shifted_left(elapsed as u64, u32::from(self.align)) | (u64::from(fraction) << self.align) >> 32;
        let key = (aligned >> 32) as u32 | 0xF_FFFF;
        let mut segment = 0_u32;
        let mut step = u32::from(self.entries / 2);
        while step != 0 {
            segment =
                segment.wrapping_add(step & not_above(entry(directory, segment.wrapping_add(step)), key));
            step /= 2;
        }
        let found = entry(directory, segment);
        let length = found >> 16 & 0xF;
        let start = u64::from(found >> (32 - CELL_BITS)) << (64 - CELL_BITS);
        let local = shifted_left(aligned.wrapping_sub(start), CELL_BITS.wrapping_sub(length));
        let head = (local >> 32) as u32 ^ 1 << 31;
        Place {
            segment: segment as usize,
            length,
            coarse: head as i32 >> 16,
            rest: head << 16 | (local >> 16) as u16 as u32,
        }
    }

    /// Value, slope and curvature of a record at a place.
    #[inline]
    #[allow(
        clippy::cast_possible_truncation,
        reason = "the nodes' sum has 34 bits: its upper 32 and its lowest two"
    )]
    pub(super) fn motion(&self, record: &[u32; RECORD_WORDS + 1], place: &Place, base: i64) -> Motion {
        let [start, second, third, fourth, fifth, sixth, end] = *record;
        let u = place.coarse;
        let (c9, c8, c7) = ((fourth << 22) as i32, (fifth << 20) as i32, (sixth << 17) as i32);
        let (c6, c5, c4) = ((sixth as i32) >> 15, (fifth as i32) >> 12, (fourth as i32) >> 10);
        let (c3, c2) = (third as i32, second as i32);

        // Orders 9 to 6: value a, slope b, half curvature c.
        let mut a = c9 >> 3;
        let mut b = a >> 6;
        a = times(a, u).wrapping_add(c8 >> 3);
        let mut c = b;
        b = times(b, u).wrapping_add(a >> 6);
        for coefficient in [c7 >> 1, c6 << 14] {
            a = times(a, u).wrapping_add(coefficient);
            c = times(c, u).wrapping_add(b);
            b = times(b, u).wrapping_add(a >> 6);
        }
        // Orders 1 and 0 from the nodes, so that neighbours meet.
        let odd = c3.wrapping_add((c5.wrapping_add((c7 >> 17) << 3).wrapping_add((c9 >> 22) << 4)) << 2);
        let even = c2.wrapping_add((c4.wrapping_add(c6 << 2).wrapping_add((c8 >> 20) << 3)) << 2);
        let first = (end.wrapping_sub(start) as i32).wrapping_sub(odd);
        let zeroth =
            i64::from(end as i32).wrapping_add(i64::from(start as i32)).wrapping_sub(i64::from(even));
        // Orders 5 to 0 as head and tail.
        let mut long = Long { head: a >> 6, tail: (a & 63) << 8 };
        for coefficient in [c5 << 5, c4 << 4, c3 << 1, c2] {
            long = long.times(u);
            long.head = long.head.wrapping_add(coefficient);
            c = times(c, u).wrapping_add(b);
            b = times(b, u).wrapping_add(long.head);
        }
        long = long.times(u);
        long.head = long.head.wrapping_add(first >> 1);
        long.tail = long.tail.wrapping_add((first & 1) << (TAIL - 1));
        c = times(c, u).wrapping_add(b);
        b = times(b, u).wrapping_add(long.head);
        long = long.times(u);
        long.head = long.head.wrapping_add((zeroth >> 2) as i32);
        long.tail = long.tail.wrapping_add((zeroth as i32 & 3) << (TAIL - 2));

        // The rest of the argument, in 2^-48: below 2^-16.
        let half_rest = (place.rest >> 1) as i32;
        let bend = (c >> 16).wrapping_mul(half_rest >> 15) >> 16;
        let taylor = high_i32(b.wrapping_add(bend), half_rest) >> 1;
        long.tail = long.tail.wrapping_add(taylor);
        let slope = b.wrapping_add(bend << 1);
        self.scale(long, slope, c, place.length, base)
    }

    /// From the segment's units to seconds and pure numbers.
    #[inline]
    fn scale(&self, value: Long, slope: i32, bend: i32, length: u32, base: i64) -> Motion {
        let fraction = i32::from(self.fraction);
        let seconds = self.log_seconds(length);
        let joined = (i64::from(value.head) << TAIL).wrapping_add(i64::from(value.tail));
        let finer = (Delay::FRACTION_BITS - 12).wrapping_sub(u32::from(self.fraction));
        let delay = (shifted_left(joined as u64, finer) as i64).wrapping_add(base);
        // Slope in 2^-44, which is what the narrow logarithm takes.
        let narrow_slope = shifted(slope, (44_i32 + 2).wrapping_sub(fraction).wrapping_sub(seconds));
        let signed = (narrow_slope ^ self.negate).wrapping_sub(self.negate);
        let rapidity = narrow::rapidity_of_slope(signed);
        let rapidity = (rapidity ^ self.negate).wrapping_sub(self.negate);
        // Rate in 2^-48 per second: two for the whole curvature, and the segment's length squared.
        let rate =
            shifted(bend, (48_i32 + 1 + 2).wrapping_sub(fraction).wrapping_sub(seconds << 1)).wrapping_neg();
        Motion {
            delay: Delay::from_bits(delay),
            rapidity: Rapidity::from_bits(i64::from(rapidity) << 16),
            rate: RapidityRate::from_bits(i64::from(rate) << 12),
        }
    }

    /// A slope per segment, per second.
    pub(super) fn per_second(&self, slope: i64, length: u32) -> i64 {
        let seconds = self.log_seconds(length);
        if seconds < 0 { slope << seconds.wrapping_neg() } else { slope >> seconds }
    }

    /// Half of a segment's length in seconds.
    pub(super) fn half_length(&self, length: u32) -> f64 {
        libm::ldexp(0.5, self.log_seconds(length))
    }

    /// log2 in seconds of a segment's length, given in cells.
    #[inline]
    fn log_seconds(&self, length: u32) -> i32 {
        i32::from(self.cell).wrapping_add(length as i32)
    }
}

/// A number in two parts: head in 2^-(Q-2), tail in 2^-14 of that, not normalised (within 2^16 until the end).
#[derive(Clone, Copy)]
struct Long {
    head: i32,
    tail: i32,
}

impl Long {
    /// Times a 16-bit fraction.
    #[inline(always)]
    fn times(self, u: i32) -> Self {
        let (head, rest) = times_with_rest(self.head, u);
        Self { head, tail: (rest >> (16 - TAIL)).wrapping_add(self.tail.wrapping_mul(u) >> 16) }
    }
}

/// An entry of the directory in its upper half word; the lower half is whatever stands beside it.
#[inline(always)]
pub(in crate::pass) fn entry(directory: &[u32], index: u32) -> u32 {
    let word = directory.get((index >> 1) as usize).copied().unwrap_or(u32::MAX);
    word << ((!index & 1) << 4)
}

/// All ones when `entry` is not above `key`, else zero.
#[inline(always)]
fn not_above(entry: u32, key: u32) -> u32 {
    !((u64::from(key).wrapping_sub(u64::from(entry)) >> 32) as u32)
}

/// `value` times a 16-bit fraction: floor(value u / 2^16).
#[inline(always)]
fn times(value: i32, u: i32) -> i32 {
    times_with_rest(value, u).0
}

/// The same, and the 16 bits below.
#[inline(always)]
#[allow(clippy::cast_possible_truncation, reason = "48 bits less 16")]
fn times_with_rest(value: i32, u: i32) -> (i32, i32) {
    if SHORT_PRODUCTS {
        let low = (value & 0xFFFF).wrapping_mul(u);
        return ((value >> 16).wrapping_mul(u).wrapping_add(low >> 16), low & 0xFFFF);
    }
    ((i64::from(value).wrapping_mul(i64::from(u)) >> 16) as i32, value.wrapping_mul(u) & 0xFFFF)
}

/// `value` times a 16-bit fraction in 64 bits; |value| < 2^48.
#[inline(always)]
pub(super) fn times_long(value: i64, u: i32) -> i64 {
    value.wrapping_mul(i64::from(u)) >> 16
}

/// Shifted left by `places`, or right when negative; within +-31.
#[inline(always)]
fn shifted(value: i32, places: i32) -> i32 {
    let left = places & !(places >> 31);
    let right = places.wrapping_neg() & (places >> 31);
    (value << (left & 31)) >> (right & 31)
}
